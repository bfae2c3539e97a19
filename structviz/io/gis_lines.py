"""Lines from GeoPackages and Shapefiles, through GDAL (pyogrio), from bytes that were read and hashed by us.

Only these two formats, known by their content, are handed over, and nothing but their own bytes: no path, link or address in a file
can be followed. What GDAL would pass over in silence (files cut short) is looked for first.
"""

from __future__ import annotations

import io
import math
import sqlite3
import struct
import warnings
import zipfile
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, StructvizError
from structviz.io.lines import LineFeature, LineSet
from structviz.io.zip_parts import part, parts_of

Floats = NDArray[np.float64]

PARTS = (".shp", ".shx", ".dbf", ".prj", ".cpg")
NEEDED_PARTS = PARTS[:3]
MOST_UNPACKED = 2**30  # bytes of one part of a zipped Shapefile
LINES = ("LineString", "Curve", "Unknown", "Geometry")  # of a layer: kinds that may hold lines
DAMAGED = "the file is damaged or cut short: export it again"
BROKEN = (RuntimeError, ValueError, TypeError, KeyError, IndexError, AttributeError, OverflowError, MemoryError, NameError)
BROKEN_DATABASE = (sqlite3.Error, OverflowError, ValueError)


def read_geopackage(content: bytes, file: str, layer: str = "") -> tuple[LineSet, ...]:
    """Return the lines of every layer of lines of a GeoPackage, or of the one named; FormatError where it cannot be used."""
    content = _checked_geopackage(content, file)
    pyogrio = _library()
    layers = _guarded(lambda: pyogrio.list_layers(content).tolist(), file)
    known = [name for name, kind in layers if kind and any(word in str(kind) for word in LINES)]
    if layer and layer not in known:
        listed = ", ".join(map(repr, known[:10])) or "a layer of lines"
        raise FormatError(file, f"no layer of lines {layer!r}", listed, hint="name one of its layers, or the file alone")
    if not known:
        kinds = ", ".join(f"{name} ({kind})" for name, kind in layers[:10]) or "no layers"
        raise FormatError(file, kinds, "a layer of lines", hint="export the traces or sticks as lines")
    several = len(known) > 1
    return tuple(_layer(content, name, f"{file}#{name}" if several else file, file) for name in ([layer] if layer else known))


def read_shapefile(parts: Mapping[str, bytes], file: str) -> LineSet:
    """Return the lines of a Shapefile, its parts given by suffix (.shp, .shx, .dbf, and .prj, .cpg if any)."""
    _check_shapefile(parts, file)
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_STORED) as archive:  # in memory: the one way to hand over several parts as bytes
        for suffix in PARTS:
            if suffix in parts:
                archive.writestr(zipfile.ZipInfo(f"lines{suffix}"), parts[suffix])
    return _layer(packed.getvalue(), "lines", file, file)


def read_zipped_shapefiles(content: bytes, file: str) -> tuple[LineSet, ...]:
    """Return the lines of every Shapefile in a ZIP archive; FormatError where there is none."""
    archive = parts_of(content, file)
    found: dict[str, dict[str, str]] = {}
    for name in archive.entries:
        stem, dot, suffix = name.rpartition(".")
        if f"{dot}{suffix}".lower() in PARTS and not name.startswith("__MACOSX/"):
            found.setdefault(stem, {}).setdefault(f".{suffix.lower()}", name)
    stems = sorted(stem for stem, parts in found.items() if ".shp" in parts)
    if not stems:
        raise FormatError(file, "a ZIP archive without a .shp", "a zipped Shapefile", hint="zip .shp, .shx, .dbf and .prj together")
    sets = []
    for stem in stems:
        shown = f"{file}#{stem.rpartition('/')[2]}" if len(stems) > 1 else file
        sets.append(read_shapefile({suffix: part(archive, name, MOST_UNPACKED) for suffix, name in found[stem].items()}, shown))
    return tuple(sets)


def _library() -> Any:
    """Return pyogrio; StructvizError says how to install it."""
    try:
        import pyogrio
        import shapely  # noqa: F401
    except ImportError:
        hint = "pip install 'structviz[formats]', or export the lines as GeoJSON"
        raise StructvizError("GeoPackages and Shapefiles need pyogrio and shapely, which are not installed", hint=hint) from None
    return pyogrio


def _guarded(read: Callable[[], Any], file: str) -> Any:
    """Return what `read` returns; FormatError where the library fails, or warns that it read less than the whole."""
    try:
        with warnings.catch_warnings(record=True):
            warnings.simplefilter("always")
            return read()
    except BROKEN as error:
        found = f"content that cannot be read ({' '.join(str(error).split())[:120]})"
        raise FormatError(file, found, "a whole GeoPackage or Shapefile", hint=DAMAGED) from None


def _layer(content: bytes, layer: str, shown: str, file: str) -> LineSet:
    """Return the features of one layer; those without a line are counted."""
    pyogrio = _library()
    meta, numbers, shapes, columns = _guarded(
        lambda: pyogrio.raw.read(content, layer=layer, return_fids=True, datetime_as_string=True), file
    )
    if shapes is None:
        raise FormatError(shown, "a table without geometry", "a layer of lines", hint="export the traces or sticks as lines")
    values = [_plain(column) for column in columns]
    found, other = [], 0
    for row, (number, shape) in enumerate(zip(numbers.tolist(), shapes)):
        where = f"{shown}, feature {number}"
        lines = _lines(shape, where)
        if lines:
            properties = {str(key): column[row] for key, column in zip(meta["fields"], values)}
            found.append(LineFeature(where, f"{shown}{'/' if '#' in shown else '#'}{number}", properties, lines))
        else:
            other += 1
    return LineSet(shown, tuple(found), str(meta.get("crs") or ""), other)


def _plain(column: NDArray) -> list[Any]:
    """Return the values of a field as plain numbers and texts, None where there is none."""
    return [None if value is None or (isinstance(value, float) and math.isnan(value)) else value for value in column.tolist()]


def _lines(shape: bytes | None, where: str) -> tuple[Floats, ...]:
    """Return the lines (N, 3) of a geometry in WKB: coordinates and height, 0 where there is none; () where it holds none."""
    if shape is None:
        return ()
    import shapely

    geometry = _guarded(lambda: shapely.from_wkb(bytes(shape)), where)
    lines = []
    for each in shapely.get_parts(geometry):
        if each.geom_type == "LineString" and not each.is_empty:
            points = shapely.get_coordinates(each, include_z=True)
            lines.append(np.column_stack([points[:, :2], np.where(np.isnan(points[:, 2]), 0.0, points[:, 2])]))
    if not all(np.isfinite(line).all() for line in lines):
        raise FormatError(where, "a line with numbers that are not finite", "finite points", hint="export it again")
    return tuple(lines)


def _checked_geopackage(content: bytes, file: str) -> bytes:
    """Return the bytes of a GeoPackage, out of the mode in which changes lie in a file beside; FormatError where it is none or damaged."""
    if content[:16] != b"SQLite format 3\0" or content[68:72] not in (b"GPKG", b"GP10", b"GP11"):
        raise FormatError(file, "content of another kind", "a GeoPackage", hint="export the lines as GeoPackage, Shapefile or GeoJSON")
    content = content[:18] + b"\1\1" + content[20:]
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            base = sqlite3.connect(":memory:")
        try:
            base.deserialize(content)
            base.execute("PRAGMA trusted_schema=OFF")
            state = base.execute("PRAGMA quick_check(1)").fetchone()[0]
            schema = base.execute("SELECT name, sql FROM sqlite_master WHERE sql LIKE 'create virtual%'").fetchall()
        finally:
            base.close()
    except BROKEN_DATABASE as error:
        raise FormatError(file, f"a database that cannot be read ({error})", "a whole GeoPackage", hint=DAMAGED) from None
    if state != "ok":
        raise FormatError(file, f"a damaged database ({' '.join(str(state).split())[:120]})", "a whole GeoPackage", hint=DAMAGED)
    strange = [name for name, sql in schema if " using rtree" not in " ".join(sql.lower().split())]
    if strange:
        hint = "such a table may lead to other files; export the lines alone"
        raise FormatError(file, f"a table {strange[0]!r} that is made up elsewhere", "tables and their indices", hint=hint)
    return content


def _check_shapefile(parts: Mapping[str, bytes], file: str) -> None:
    """Raise FormatError where a part is missing, or the parts are not as long as they say or as each other."""
    for suffix in NEEDED_PARTS:
        if suffix not in parts:
            hint = "keep .shp, .shx, .dbf and .prj together"
            raise FormatError(file, f"no {suffix} beside it", f"a Shapefile with {', '.join(NEEDED_PARTS)}", hint=hint)
    for suffix in NEEDED_PARTS[:2]:
        content = parts[suffix]
        code, size = struct.unpack(">i20xi", content[:28]) if len(content) >= 100 else (0, 0)
        if code != 9994 or 2 * size != len(content):
            found = "content of another kind" if code != 9994 else f"{len(content):,} bytes where its header says {2 * size:,}"
            raise FormatError(file, f"{found} in the {suffix}", "a whole Shapefile", hint=DAMAGED)
    kind, table = struct.unpack("<i", parts[".shp"][32:36])[0], parts[".dbf"]
    if kind not in (0, 3, 13, 23):
        raise FormatError(file, f"shapes of type {kind}", "lines (types 3, 13, 23)", hint="export the traces or sticks as lines")
    rows, head, width = struct.unpack("<4xIHH", table[:12]) if len(table) >= 32 else (0, 0, 0)
    shapes = (len(parts[".shx"]) - 100) // 8
    if len(table) < head + rows * width or not head or rows != shapes:
        found = f"a table of {rows:,} rows in {len(table):,} bytes, for {shapes:,} shapes"
        raise FormatError(file, found, "a .dbf with a row for each shape", hint=DAMAGED)
