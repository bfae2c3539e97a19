"""STL, text (each named solid is one surface) and binary.

Corners are kept as read: triangles of a soup share no vertices, and measuring joins them. A binary file is known by its length,
80 + 4 + 50 bytes a triangle, because many begin with the word `solid` all the same.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, SurfaceError
from structviz.io.format import CELL_ARRAYS, SHARED_VERTICES, CellData, Format, Piece, start_of
from structviz.io.text import EXPORT_AGAIN, floats, text_of
from structviz.surfaces.surface import Surface

FACET = np.dtype([("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("extra", "<u2")])
HEADER = 84
PER_FACET = 21  # words of one facet of a text file; those that are always the same, and where its coordinates stand
KEYWORDS = {
    0: b"facet", 1: b"normal", 5: b"outer", 6: b"loop", 7: b"vertex", 11: b"vertex", 15: b"vertex", 19: b"endloop", 20: b"endfacet",
}  # fmt: skip
COORDINATES = (8, 9, 10, 12, 13, 14, 16, 17, 18)


def promised(content: bytes) -> int:
    """Return the number of triangles a binary file would hold by its header, or -1 where it is too short to have one."""
    return int.from_bytes(content[80:84], "little") if len(content) >= HEADER else -1


def is_text(content: bytes) -> bool:
    """Return True for STL text: it begins with `solid`, has facets or is closed, and its length is not that of a binary file."""
    if is_binary(content):
        return False
    begins = start_of(content, 512)[:5].lower() == b"solid"
    return begins and b"\0" not in content[:HEADER] and re.search(rb"\b(facet|endsolid)\b", content[:4096].lower()) is not None


def is_binary(content: bytes) -> bool:
    """Return True where the length is that of a binary STL file."""
    return promised(content) >= 0 and len(content) == HEADER + FACET.itemsize * promised(content)


def sniff(content: bytes) -> bool:
    """Return True for STL text and for binary content of the right length."""
    return is_text(content) or is_binary(content)


def explain(content: bytes) -> str:
    """Return in words how the length of a binary content differs from what its header promises, "" for text."""
    if promised(content) < 0 or b"\0" not in content[:HEADER]:
        return ""
    wanted = HEADER + FACET.itemsize * promised(content)
    return f"{len(content):,} bytes, where its header promises {promised(content):,} triangles in {wanted:,}"


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of an STL file: one for each solid of a text file, one of a binary file."""
    return read_text(content, file) if is_text(content) else read_binary(content, file)


def read_text(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return one surface for each solid that holds a facet."""
    lowered = content.lower()  # of bytes, so that every place stays where it is
    starts = [mark.end() for mark in re.finditer(rb"(?:\A(?:\xef\xbb\xbf)?|[\r\n])\s*solid(?!\S)", lowered)]
    pieces = []
    for start, following in zip(starts, [*starts[1:], len(content)]):
        closing = lowered.rfind(b"endsolid", start, following)
        if closing < 0:
            raise FormatError(file, "a solid that is not closed", "a line 'endsolid' at the end", hint=EXPORT_AGAIN)
        name, *body = re.split(rb"[\r\n]", content[start:closing], maxsplit=1)
        pieces.append(solid(text_of(name, file).strip(), b"".join(body).split(), file))
    kept = tuple(piece for piece in pieces if len(piece.triangles))
    if not kept:
        raise SurfaceError(file, "no facets", "a surface of triangles", hint="export the fault surface itself, then try again")
    return kept


def solid(name: str, words: list[bytes], file: str) -> Piece:
    """Return the surface of the words between the name of a solid and its end."""
    columns = [words[place::PER_FACET] for place in range(PER_FACET)]
    fits = len(words) % PER_FACET == 0 and all({w.lower() for w in set(columns[place])} <= {word} for place, word in KEYWORDS.items())
    if not fits:
        found = sum(word.lower() == b"facet" for word in words)
        wanted = "'facet normal', three numbers, 'outer loop', three times 'vertex' and three numbers, 'endloop', 'endfacet'"
        raise FormatError(file, f"facets of another shape among the {found} of solid {name!r}", wanted, hint=EXPORT_AGAIN)
    corners = np.stack([floats(columns[place], "vertices", file) for place in COORDINATES], axis=1)
    return soup(name, corners.reshape(-1, 3), ())


def read_binary(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the one surface of a binary file, whose length has been found right."""
    count = promised(content)
    if not count:
        raise SurfaceError(file, "no triangles", "a surface of triangles", hint="export the fault surface itself, then try again")
    corners = np.frombuffer(content, FACET, count, HEADER)["corners"].reshape(-1, 3).astype(np.float64)
    return (soup("", corners, coarse(corners)),)


def soup(name: str, corners: NDArray[np.float64], history: tuple[str, ...]) -> Piece:
    """Return triangles that share no vertices."""
    return Piece(name, corners, np.arange(len(corners), dtype=np.int64).reshape(-1, 3), history)


def coarse(corners: NDArray[np.float64]) -> tuple[str, ...]:
    """Return words where float32 coordinates are so far from the origin that their steps exceed a hundredth of a unit."""
    largest = np.abs(corners).max() if np.isfinite(corners).all() else 0.0
    step = float(np.spacing(np.float32(largest)))
    return (f"binary STL holds float32: coordinates are stepped by {step:g} this far from the origin",) if step > 0.01 else ()


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return STL text at full float64 precision (binary STL would step a UTM northing by half a metre)."""
    corners = np.asarray(surface.vertices, float)[surface.triangles]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    length = np.linalg.norm(normal, axis=1, keepdims=True)
    normal = np.divide(normal, length, out=np.zeros_like(normal), where=length > 0)
    rows = np.concatenate([normal[:, None], corners], axis=1).reshape(-1, 12).tolist()
    name = " ".join(surface.name.split())
    facet = "facet normal %r %r %r\nouter loop\nvertex %r %r %r\nvertex %r %r %r\nvertex %r %r %r\nendloop\nendfacet\n"
    return (f"solid {name}\n" + "".join(facet % tuple(row) for row in rows) + f"endsolid {name}\n").encode(errors="replace")


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return STL text with one named solid a surface."""
    return b"".join(write(surface, cell_data) for surface, cell_data in surfaces)


FORMATS = (Format("stl", "STL", (".stl",), sniff, read, write, (CELL_ARRAYS, SHARED_VERTICES), explain, write_all=write_all),)
