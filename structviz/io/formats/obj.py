"""Wavefront OBJ text: every named object (`o`) and group (`g`) is one surface.

Parsed here because general readers merge the objects or lose their names. A face may count its corners from the start (1, 2, ...)
or back from the last vertex read (-1, -2, ...); texture and normal numbers after a slash are passed over.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.cells import check_indices, counted, fan, no_triangles, parted
from structviz.io.format import CELL_ARRAYS, OWN_LENGTH, CellData, Format, Piece, start_of
from structviz.io.text import EXPORT_AGAIN, integers, points, text_of
from structviz.surfaces.surface import Integers, Surface

KEYWORDS = (b"v ", b"v\t", b"vn ", b"vt ", b"o ", b"g ", b"mtllib ", b"usemtl ", b"f ", b"s ")
NO_GROUP = ("", "default", "off", "(null)")


def sniff(content: bytes) -> bool:
    """Return True where the first line that is no comment starts with a keyword of OBJ and a vertex line follows."""
    lines = (line.strip() for line in start_of(content, 4096).splitlines())
    first = next((line for line in lines if line and not line.startswith(b"#")), b"")
    return (first + b" ").startswith(KEYWORDS) and re.search(rb"(^|[\r\n])[ \t]*v[ \t]+[-+.\d]", content[:1_000_000]) is not None


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return one surface for each named object or group, in the order in which they first hold a face."""
    lines = [line.strip() for line in text_of(content, file).replace("\\\n", " ").replace("\t", " ").split("\n")]
    kind = np.array([line.split(" ", 1)[0][:8] for line in lines])
    vertices = points([lines[row].split()[1:] for row in np.flatnonzero(kind == "v")], "vertices", file)
    faces = np.flatnonzero(kind == "f")
    if not len(faces):
        raise no_triangles([3] if np.isin(kind, ["l", "p"]).any() else [], file)
    ids, ends, history = corners([lines[row] for row in faces], np.cumsum(kind == "v")[faces], file)
    check_indices(ids.reshape(-1, 1), len(vertices), file, base=1)
    names, owner = sections(lines, kind, faces)
    return pieces_of(names, vertices, ids, ends, owner, history)


def corners(lines: list[str], read_before: Integers, file: str) -> tuple[Integers, Integers, tuple[str, ...]]:
    """Return corner numbers from zero, the end of each face, and words; negative numbers count back from the vertices read so far."""
    if any("/" in line for line in lines):
        lines = re.sub(r"/[^ \n]*", "", "\n".join(lines)).split("\n")
    rows = [line.split()[1:] for line in lines]
    sizes = np.array([len(row) for row in rows])
    if (sizes < 3).any():
        raise FormatError(file, f"a face of {sizes.min()} corners", "three corners or more", hint=EXPORT_AGAIN)
    ids = integers([word for row in rows for word in row], "face corners", file)
    ids = np.where(ids < 0, ids + np.repeat(read_before, sizes), ids - 1)
    split = int((sizes > 3).sum())
    return ids, np.cumsum(sizes), ((f"{counted(split, 'polygon')} split into triangles",) if split else ())


def sections(lines: list[str], kind: NDArray, faces: Integers) -> tuple[list[str], Integers]:
    """Return the names of the sections and the section of each face; a new object ends the group before it."""
    keys: dict[tuple[str, str], int] = {("", ""): 0}
    starts, owners, named, group = [-1], [0], "", ""
    for row in np.flatnonzero((kind == "o") | (kind == "g")):
        text = lines[row][1:].strip()
        named, group = (text, "") if kind[row] == "o" else (named, text)
        starts.append(int(row))
        owners.append(keys.setdefault((named, "" if group in NO_GROUP else group), len(keys)))
    names = [f"{one}:{two}" if one and two and one != two else one or two for one, two in keys]
    return names, np.array(owners)[np.searchsorted(starts, faces) - 1]


def first_seen(owner: Integers) -> list[int]:
    """Return the distinct owners in the order in which they first occur."""
    found, first = np.unique(owner, return_index=True)
    return [int(key) for key in found[np.argsort(first)]]


def pieces_of(
    names: list[str], vertices: NDArray, ids: Integers, ends: Integers, owner: Integers, history: tuple[str, ...]
) -> tuple[Piece, ...]:
    """Return the surface of each section, with only its own vertices where the file holds several sections."""
    if len(names) == 1 or (owner == owner[0]).all():
        return (Piece(names[owner[0]], vertices, fan(ids, ends), history),)
    sizes = np.diff(ends, prepend=0)
    split = np.bincount(owner[sizes > 3], minlength=len(names))
    parts = parted(vertices, fan(ids, ends), np.repeat(owner, np.maximum(sizes - 2, 0)), len(names))
    return tuple(
        Piece(names[key], *parts[key], (f"{counted(int(split[key]), 'polygon')} split into triangles",) if split[key] else ())
        for key in first_seen(owner)
    )


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return OBJ text with every coordinate at full float64 precision."""
    return write_all([(surface, cell_data)])


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return OBJ text with one named object a surface."""
    text, first = [], 1
    for surface, _ in surfaces:
        name = " ".join(surface.name.split())
        text.append(f"o {name}\n" if name else "")
        text += [f"v {east!r} {north!r} {up!r}\n" for east, north, up in np.asarray(surface.vertices, float).tolist()]
        text += [f"f {a} {b} {c}\n" for a, b, c in (surface.triangles + first).tolist()]
        first += len(surface.vertices)
    return "".join(text).encode(errors="replace")


FORMATS = (Format("obj", "Wavefront OBJ", (".obj",), sniff, read, write, (CELL_ARRAYS, OWN_LENGTH), write_all=write_all),)
