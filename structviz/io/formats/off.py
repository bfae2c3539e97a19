"""OFF text: counts, vertices, faces; colours after a vertex or a face are passed over."""

from __future__ import annotations

import numpy as np

from structviz.errors import FormatError
from structviz.io.cells import check_indices, counted, fan, no_triangles
from structviz.io.format import CELL_ARRAYS, NAMES, SEVERAL, CellData, Format, Piece, start_of
from structviz.io.text import EXPORT_AGAIN, integers, points, text_of
from structviz.surfaces.surface import Surface

HEADS = (b"OFF", b"COFF")


def sniff(content: bytes) -> bool:
    """Return True where the first word is OFF or COFF."""
    return start_of(content, 64).split(None, 1)[:1] in [[head] for head in HEADS]


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the one surface of an OFF file."""
    lines = [line.split("#", 1)[0].split() for line in text_of(content, file).split("\n")]
    rows = [line for line in lines if line]
    head = rows[0][1:] if rows and len(rows[0]) > 1 else (rows[1] if len(rows) > 1 else [])
    body = rows[1 if rows and len(rows[0]) > 1 else 2 :]
    if head[:1] == ["BINARY"]:
        raise FormatError(file, "binary OFF", "OFF text", hint="export it as text, or as VTP or PLY")
    counts = integers(head[:2], "counts", file)
    if len(counts) < 2 or (counts < 0).any():
        raise FormatError(file, "no counts of vertices and faces", "two counts after the word OFF", hint=EXPORT_AGAIN)
    many, faces = int(counts[0]), int(counts[1])
    if len(body) < many + faces:
        raise FormatError(file, f"{counted(len(body), 'row')}", f"{many:,} vertices and {faces:,} faces", hint=EXPORT_AGAIN)
    return (surface_of(body[:many], body[many : many + faces], file),)


def surface_of(vertex_rows: list[list[str]], face_rows: list[list[str]], file: str) -> Piece:
    """Return the surface of the rows of vertices and of faces."""
    if not face_rows:
        raise no_triangles([], file)
    vertices = points(vertex_rows, "vertices", file)
    sizes = integers([row[0] for row in face_rows], "face sizes", file)
    if any(len(row) <= size for row, size in zip(face_rows, sizes)) or (sizes < 0).any():
        raise FormatError(file, "a face with fewer corners than it says", "its number of corners, then the corners", hint=EXPORT_AGAIN)
    ids = integers([word for row, size in zip(face_rows, sizes) for word in row[1 : size + 1]], "face corners", file)
    check_indices(ids.reshape(-1, 1), len(vertices), file)
    triangles = fan(ids, np.cumsum(sizes))
    if not len(triangles):
        raise no_triangles([3], file)
    split = int((sizes > 3).sum())
    return Piece("", vertices, triangles, (f"{counted(split, 'polygon')} split into triangles",) if split else ())


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return OFF text with every coordinate at full float64 precision."""
    vertices = "".join(f"{east!r} {north!r} {up!r}\n" for east, north, up in np.asarray(surface.vertices, float).tolist())
    faces = "".join(f"3 {a} {b} {c}\n" for a, b, c in surface.triangles.tolist())
    return (f"OFF\n{len(surface.vertices)} {len(surface.triangles)} 0\n" + vertices + faces).encode()


FORMATS = (Format("off", "OFF", (".off",), sniff, read, write, (NAMES, SEVERAL, CELL_ARRAYS)),)
