"""OMF 1, one file of header, packed arrays and JSON; OMF 2 as a zip archive with project.json. That with Parquet arrays is told apart.

OMF 1 has a header of 60 bytes: a mark, a version, the identifier of the project, where the JSON begins. The JSON holds every object by its
identifier, and places of arrays, which are zlib packed float64 or int64. Places are the origin of the project plus that of the surface
plus the vertices.
"""

from __future__ import annotations

import json
import re
import uuid
import zlib
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, SurfaceError
from structviz.io.cells import check_indices, counted
from structviz.io.format import Format, Piece
from structviz.io.omf_grids import NotRead, grid_surface
from structviz.io.omf_writing import HEADER, MARK, VERSION, write, write_all
from structviz.io.zip_parts import Parts, part, parts_of

PROJECT, PARQUET_INDEX = "project.json", "index.json.gz"
SPARE = 2**25  # bytes that arrays may unpack to beyond ten times the file
SPARE_JSON = 2**23  # the same of JSON, which takes twenty times its bytes at worst
METRES = {"m": 1.0, "metre": 1.0, "meter": 1.0, "km": 1000.0, "ft": 0.3048, "foot": 0.3048, "feet": 0.3048, "us-ft": 1200.0 / 3937.0}
KINDS = {
    "Int8Array": "i1", "Int16Array": "i2", "Int32Array": "i4", "Int64Array": "i8", "Uint8Array": "u1", "Uint16Array": "u2",
    "Uint32Array": "u4", "Float32Array": "f4", "Float64Array": "f8",
}  # fmt: skip
DAMAGED = "the file is damaged or cut short: export it again"


@dataclass(frozen=True, eq=False)
class Source:
    """What reading needs of either version: how an array named in the JSON is got, and how many bytes may still be unpacked."""

    file: str
    array: Callable[[Any, int], NDArray]  # (what names it, numbers a row)
    left: list[int] = field(default_factory=list)


def sniff(content: bytes) -> bool:
    """Return True for OMF 1, and for a zip archive with the index of OMF 2."""
    if content.startswith(MARK):
        return True
    if not content.startswith(b"PK") or (PROJECT.encode() not in content and PARQUET_INDEX.encode() not in content):
        return False
    try:
        parts = parts_of(content, "")
        return PARQUET_INDEX in parts.entries or (PROJECT in parts.entries and b"org.omf.v2" in part(parts, PROJECT))
    except FormatError:
        return False


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of an OMF file, named by their elements."""
    if content.startswith(MARK):
        return read_first(content, file)
    parts = parts_of(content, file)
    if PROJECT not in parts.entries:
        hint = "export OMF 1, or one of the formats of structviz formats"
        raise FormatError(file, "OMF 2 with Parquet arrays", "OMF 1, or OMF 2 with project.json", hint=hint)
    return read_second(parts, content, file)


def read_first(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of OMF 1."""
    if not content[4:36].startswith(VERSION) or len(content) < HEADER:
        found = content[4:36].rstrip(b"\0").decode("ascii", "replace")
        raise FormatError(file, f"OMF of version {found!r}", VERSION.decode(), hint=DAMAGED)
    start = int.from_bytes(content[52:60], "little")
    held = parsed(content[start:] if HEADER <= start < len(content) else b"", file)
    project = entry(held, str(uuid.UUID(bytes=content[36:52])), "Project", file)
    source = Source(
        file, lambda named, row: packed(content, entry(held, named, "", file).get("array"), row, file), [10 * len(content) + SPARE]
    )
    elements = []
    for named in listed(project.get("elements"), file):
        element = entry(held, named, "", file)
        body = entry(held, element.get("geometry"), "", file) if element.get("__class__") == "SurfaceElement" else {}
        elements.append((element, body, str(body.get("__class__") or element.get("__class__"))))
    return pieces(source, project, elements, str(project.get("units") or ""), "")


def read_second(parts: Parts, content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of OMF 2 with project.json."""
    project = parsed(part(parts, PROJECT, 10 * len(content) + SPARE_JSON), file)
    stated = project.get("metadata")
    about = stated if isinstance(stated, dict) else {}
    source = Source(file, lambda named, row: plain(parts, named, row, file), [10 * len(content) + SPARE])
    elements = [(element, element, str(element.get("schema", "")).rpartition(".")[2]) for element in flattened(project, file)]
    crs = str(about.get("coordinate_reference_system") or "")
    code = re.fullmatch(r"\s*epsg[\s:]*(\d{3,7})\s*", crs, re.IGNORECASE)
    return pieces(source, project, elements, str(about.get("units") or ""), f"EPSG:{code[1]}" if code else " ".join(crs.split())[:120])


def flattened(project: dict, file: str) -> list[dict]:
    """Return the elements of a project with those inside composites, in their order."""
    found, waiting = [], listed(project.get("elements"), file)[::-1]
    while waiting:
        element = waiting.pop()
        if not isinstance(element, dict):
            raise FormatError(file, "an element that is no object", "elements", hint=DAMAGED)
        if isinstance(element.get("elements"), list):
            waiting += element["elements"][::-1]
        else:
            found.append(element)
    return found


def pieces(source: Source, project: dict, elements: list[tuple[dict, dict, str]], unit: str, crs: str) -> tuple[Piece, ...]:
    """Return the surfaces among elements (element, geometry, kind) in metres where the unit is known; the others are told."""
    scale = METRES.get(unit.strip().lower().removesuffix("s"), METRES.get(unit.strip().lower()))
    start = vector(project.get("origin"), source.file)
    found, told, missed = [], [], []
    others: Counter[str] = Counter()
    for element, body, kind in elements:
        name = str(element.get("name") or "")
        try:
            made = surface_of(source, body, kind)
        except NotRead as error:
            missed.append(f"{name[:80]!r} is not read: {error}")
            continue
        if made is None:
            others[kind[:60]] += 1
            continue
        vertices, triangles, words = made
        vertices = (vertices + start) * (scale or 1.0)
        history = (*words, *((f"coordinates converted from {unit.strip()} to m",) if scale not in (None, 1.0) else ()))
        found.append(Piece(name, vertices, triangles, history, framed=scale is not None, crs=crs))
    if unit.strip() and scale is None:
        told.append(f"unit {unit.strip()[:40]!r} is not known: coordinates are taken as they stand")
    told += [f"{counted(count, kind)} not read" for kind, count in sorted(others.items())]
    if not found:
        raise SurfaceError(
            source.file, "; ".join([*missed, *told][:3]) or "no elements", "a surface of triangles", hint="export the fault surfaces"
        )
    return tuple(replace(piece, told=tuple(told), missed=tuple(missed)) for piece in found)


def surface_of(source: Source, body: dict, kind: str) -> tuple[NDArray[np.float64], NDArray[np.int64], tuple[str, ...]] | None:
    """Return vertices, triangles and what was done in words, None for what is no surface; NotRead for a grid that is not certain."""
    if kind in ("SurfaceGeometry", "surface"):
        vertices, triangles = taken(source, body.get("vertices"), 3).reshape(-1, 3), taken(source, body.get("triangles"), 3)
        if triangles.dtype.kind == "f":
            raise FormatError(source.file, "corner numbers with fractions", "whole numbers", hint=DAMAGED)
        triangles = triangles.astype(np.int64).reshape(-1, 3)
        check_indices(triangles, len(vertices), source.file)
        return vertices + vector(body.get("origin"), source.file), triangles, ()
    if kind in ("SurfaceGridGeometry", "surfacetensorgrid"):
        axes = vector(body.get("axis_u", [1, 0, 0]), source.file), vector(body.get("axis_v", [0, 1, 0]), source.file)
        widths = tuple(reals(body.get(key), source.file) for key in ("tensor_u", "tensor_v"))
        offsets = None if body.get("offset_w") is None else taken(source, body["offset_w"], 1)
        count = (len(widths[0]) + 1) * (len(widths[1]) + 1)
        source.left[0] -= 200 * count  # what its nodes and triangles take
        if source.left[0] < 0 or (offsets is not None and len(offsets) != count):
            raise FormatError(source.file, f"a grid of {count:,} nodes", "one offset a node, and a grid its file can hold", hint=DAMAGED)
        corner = vector(body.get("origin", body.get("corner")), source.file)
        made = grid_surface(corner, axes, (widths[0], widths[1]), offsets)
        return made[0], made[1], (made[2],)
    return None


def taken(source: Source, named: Any, row: int) -> NDArray:
    """Return a flat array and count it against what may be unpacked; FormatError beyond that."""
    found = source.array(named, row)
    source.left[0] -= found.nbytes
    if source.left[0] < 0:
        raise FormatError(source.file, "arrays that unpack to more than ten times the file", "less", hint=DAMAGED)
    return found.astype(np.float64) if found.dtype.kind == "f" else found


def packed(content: bytes, place: Any, row: int, file: str) -> NDArray:
    """Return a flat zlib packed array of OMF 1, its numbers in rows of `row`; FormatError where it is damaged."""
    place = place if isinstance(place, dict) else {}
    start, length, kind = place.get("start"), place.get("length"), place.get("dtype")
    if not (isinstance(start, int) and isinstance(length, int) and HEADER <= start <= start + length <= len(content)):
        raise FormatError(file, f"an array at {str(start)[:20]} of {str(length)[:20]} bytes", f"one within {len(content):,}", hint=DAMAGED)
    if kind not in ("<f8", "<i8"):
        raise FormatError(file, f"an array of type {str(kind)[:40]!r}", "<f8 or <i8", hint=DAMAGED)
    most = 10 * len(content) + SPARE
    try:
        unpack = zlib.decompressobj()
        found = unpack.decompress(memoryview(content)[start : start + length], most)
    except zlib.error as error:
        raise FormatError(file, f"an array that cannot be unpacked ({error})", "whole arrays", hint=DAMAGED) from None
    if not unpack.eof or len(found) % (8 * row):
        raise FormatError(file, f"an array of {len(found):,} bytes or more", f"whole rows of {row} numbers", hint=DAMAGED)
    return np.frombuffer(found, kind)


def plain(parts: Parts, named: Any, row: int, file: str) -> NDArray:
    """Return a flat array of OMF 2, a part of the archive; FormatError where its size is not as stated."""
    named = named if isinstance(named, dict) else {}
    kind, shape = KINDS.get(str(named.get("data_type"))), named.get("shape")
    if kind is None:
        raise FormatError(file, f"an array of type {str(named.get('data_type'))[:40]!r}", ", ".join(KINDS), hint=DAMAGED)
    content = part(parts, str(named.get("array")), 2**31)
    width = np.dtype(kind).itemsize
    stated = (
        isinstance(shape, list) and all(isinstance(n, int) and 0 <= n < 2**40 for n in shape) and shape[1:] == ([row] if row > 1 else [])
    )
    if not stated or len(content) != shape[0] * row * width:
        raise FormatError(
            file, f"{len(content):,} bytes of shape {str(shape)[:40]}", f"rows of {row} numbers of {width} bytes", hint=DAMAGED
        )
    return np.frombuffer(content, f"<{kind}")


def parsed(content: bytes, file: str) -> dict:
    """Return the JSON object of a content; FormatError where it is none."""
    try:
        found = json.loads(content.decode("utf-8"))
    except (ValueError, RecursionError) as error:
        raise FormatError(file, f"JSON that breaks off or is damaged ({str(error)[:120]})", "whole JSON", hint=DAMAGED) from None
    if not isinstance(found, dict):
        raise FormatError(file, "JSON that is no object", "the objects of a project", hint=DAMAGED)
    return found


def entry(held: dict, named: Any, kind: str, file: str) -> dict:
    """Return the object of an identifier; FormatError where there is none, or one of another class."""
    found = held.get(named) if isinstance(named, str) else None
    if not isinstance(found, dict) or (kind and found.get("__class__") != kind):
        raise FormatError(file, f"no {kind or 'object'} {str(named)[:40]!r}", "every object that is named", hint=DAMAGED)
    return found


def listed(value: Any, file: str) -> list:
    """Return a list; FormatError for anything else."""
    if not isinstance(value, list):
        raise FormatError(file, "no list of elements", "a list", hint=DAMAGED)
    return value


def reals(value: Any, file: str) -> NDArray[np.float64]:
    """Return a list of finite numbers as an array; FormatError for anything else."""
    try:
        if not isinstance(value, list) or not all(isinstance(one, (int, float)) for one in value):
            raise ValueError
        found = np.array(value, dtype=np.float64)
    except (ValueError, OverflowError):
        raise FormatError(file, f"{str(value)[:40]} for numbers", "a list of numbers", hint=DAMAGED) from None
    if not np.isfinite(found).all():
        raise FormatError(file, "numbers that are not finite", "a list of numbers", hint=DAMAGED)
    return found


def vector(value: Any, file: str) -> NDArray[np.float64]:
    """Return three numbers, zeros where there is nothing."""
    found = np.zeros(3) if value is None else reals(value, file)
    if len(found) != 3:
        raise FormatError(file, f"{len(found)} numbers of a point", "three", hint=DAMAGED)
    return found


FORMATS = (Format("omf", "OMF 1, 2", (".omf",), sniff, read, write, (), write_all=write_all),)
