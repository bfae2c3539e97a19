"""From paths of files of lines to faults: which files hold lines, which parts belong to them, and several read together."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from pathlib import Path

from structviz.errors import FormatError
from structviz.io.geojson_lines import read_geojson
from structviz.io.ledger import Ledger, content_of, inside
from structviz.io.lines import LineSet
from structviz.io.traces import Traces, faults_of_lines

IN_FOLDERS = (".geojson", ".gpkg", ".shp")  # taken from a folder; .json and .zip are more often something else
SUFFIXES = (*IN_FOLDERS, ".json", ".zip")
SHOWN = "GeoJSON (.geojson, .json), GeoPackage (.gpkg) or Shapefile (.shp, or zipped as .zip)"


def faults_of_files(paths: Sequence[Path], ledger: Ledger, where: Mapping[str, str], layer: str = "") -> Traces:
    """Return the faults of the lines in all files, read together; `layer` names one layer of a GeoPackage."""
    return faults_of_lines([each for path in paths for each in line_sets(ledger, path, layer)], ledger, where)


def files_of_lines(folder: Path) -> list[Path]:
    """Return the files of lines in a folder, sorted by name."""
    return sorted(
        (path for path in folder.iterdir() if path.suffix.lower() in IN_FOLDERS and path.is_file() and not path.name.startswith(".")),
        key=lambda path: path.name,
    )


def with_layer(path: Path) -> tuple[Path, str]:
    """Return the file and the layer of a path written as file.gpkg#layer; the path itself where a file of that name is there.

    >>> with_layer(Path("faults.gpkg#north"))[1]
    'north'
    """
    before, mark, layer = str(path).partition(".gpkg#")
    return (path, "") if not mark or os.path.exists(path) else (Path(f"{before}.gpkg"), layer)


def line_sets(ledger: Ledger, path: Path, layer: str = "") -> tuple[LineSet, ...]:
    """Return the lines of one file, by layer where it has several; every file that belongs to it is hashed."""
    suffix, file = path.suffix.lower(), ledger.shown(path)
    content = content_of(ledger, path)
    if suffix in (".geojson", ".json"):
        return (read_geojson(content, file),)
    from structviz.io import gis_lines

    if suffix == ".gpkg":
        _tell_unwritten(ledger, path)
        return gis_lines.read_geopackage(content, file, layer)
    if suffix == ".zip":
        return gis_lines.read_zipped_shapefiles(content, file)
    if suffix == ".shp":
        return (gis_lines.read_shapefile({".shp": content, **_parts_beside(ledger, path)}, file),)
    raise FormatError(file, f"the suffix {suffix!r}", SHOWN, hint="rename the file, or export it again")


def _parts_beside(ledger: Ledger, path: Path) -> dict[str, bytes]:
    """Return the other parts of a Shapefile by suffix: files of its name with another suffix, in small letters or capitals."""
    found: dict[str, bytes] = {}
    for name in sorted(os.listdir(path.parent)):
        stem, suffix = os.path.splitext(name)
        if stem == path.stem and suffix.lower() in (".shx", ".dbf", ".prj", ".cpg"):
            found.setdefault(suffix.lower(), content_of(ledger, inside(ledger, name, ledger.shown(path), path.parent)))
    return found


def _tell_unwritten(ledger: Ledger, path: Path) -> None:
    """Warn where another program keeps changes of a GeoPackage in a file beside it."""
    beside = path.with_name(path.name + "-wal")
    if beside.is_file() and beside.stat().st_size:
        hint = "close the program that has it open, then run again"
        ledger.note("model", f"{ledger.shown(path)}: changes in {beside.name}, not yet written into it, are not read", hint, "warning")
