"""Legacy VTK files of surfaces and of mixed cells, text and binary, of versions before and after 5.

Parsed here because a general reader gives no cells and no error for a file that is cut short, and trusts the counts in a damaged one.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.cells import POLYGON, STRIP, TRIANGLE, check_indices, check_runs, no_triangles, triangles_of_cells
from structviz.io.format import CELL_ARRAYS, NAMES, SEVERAL, CellData, Format, Piece, start_of
from structviz.io.text import EXPORT_AGAIN
from structviz.surfaces.surface import Floats, Surface

TYPES = {
    "bit": "u1", "char": "i1", "unsigned_char": "u1", "short": "i2", "unsigned_short": "u2", "int": "i4", "unsigned_int": "u4",
    "long": "i8", "unsigned_long": "u8", "float": "f4", "double": "f8", "vtkidtype": "i8", "vtktypeint64": "i8", "vtktypeint32": "i4",
    "vtktypeuint64": "u8", "vtktypeuint32": "u4",
}  # fmt: skip
CELLS = {"POLYGONS": POLYGON, "TRIANGLE_STRIPS": STRIP, "LINES": 4, "VERTICES": 2}
HEAD = re.compile(rb"#\s*vtk\s+DataFile\s+Version\s+(\d+)\.\d+[^\n]*\n[^\n]*\n\s*(ASCII|BINARY)\b[^\n]*\n", re.IGNORECASE)

Runs = tuple[NDArray[np.int64], NDArray[np.int64]]  # corner numbers end to end, and the end of each cell


@dataclass
class Walk:
    """A walk through the file: where it stands, and what it has met."""

    content: bytes
    file: str
    version: int
    binary: bool
    at: int
    points: Floats = field(default_factory=lambda: np.zeros((0, 3)))
    runs: list[tuple[Runs, NDArray]] = field(default_factory=list)  # with the VTK type of each cell
    cells: Runs | None = None  # cells of a grid, before their types are known

    def line(self) -> list[str]:
        """Return the words of the next line that is not blank; empty at the end of the file."""
        while self.at < len(self.content):
            end = self.content.find(b"\n", self.at)
            end = len(self.content) if end < 0 else end
            words = self.content[self.at : end].decode("latin-1").split()
            self.at = end + 1
            if words:
                return words
        return []

    def numbers(self, count: int, kind: str) -> NDArray:
        """Return the next `count` numbers of a type of the file format; FormatError where the file ends before."""
        code = TYPES.get(kind.lower())
        if code is None:
            raise FormatError(self.file, f"numbers of type {kind!r}", "a type of VTK", hint=EXPORT_AGAIN)
        if self.binary:
            size = count * np.dtype(code).itemsize
            if count < 0 or self.at + size > len(self.content):
                raise self.short(count)
            start, self.at = self.at, self.at + size
            return np.frombuffer(self.content, ">" + code, count, start)
        return self.text_numbers(count, code)

    def text_numbers(self, count: int, code: str) -> NDArray:
        """Return the next `count` numbers of a text file."""
        if not 0 <= count <= len(self.content):
            raise self.short(count)
        words = self.content[self.at :].split(None, count)
        rest = len(words[count]) if len(words) > count else 0
        if len(words) < count:
            raise self.short(count)
        self.at = len(self.content) - rest
        try:
            return np.array(words[:count], dtype="f8" if code.startswith("f") else "i8")
        except (ValueError, OverflowError) as error:
            raise FormatError(self.file, f"{error}", f"{count} numbers", hint=EXPORT_AGAIN) from None

    def short(self, count: int) -> FormatError:
        """Return the error for a file that ends before its numbers do."""
        return FormatError(self.file, "a file that ends too early", f"{count} more numbers", hint=EXPORT_AGAIN)


def sniff(content: bytes) -> bool:
    """Return True where the first line names a VTK data file."""
    return re.match(rb"#\s*vtk\s+DataFile", start_of(content, 256), re.IGNORECASE) is not None


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the one surface of a legacy VTK file."""
    head = HEAD.search(content[:2048])
    if head is None:
        raise FormatError(file, "a header that breaks off", "version, title, and ASCII or BINARY", hint=EXPORT_AGAIN)
    walk = Walk(content, file, int(head[1]), head[2].upper() == b"BINARY", head.end())
    while (words := walk.line()) and words[0].upper() not in ("POINT_DATA", "CELL_DATA"):
        try:
            step(walk, words)
        except (IndexError, ValueError):
            raise FormatError(file, f"line {' '.join(words)[:60]!r}", "a section of VTK data", hint=EXPORT_AGAIN) from None
    return (surface_of(walk),)


def step(walk: Walk, words: list[str]) -> None:
    """Read one section into the walk."""
    key = words[0].upper()
    if key == "DATASET" and words[1].upper() not in ("POLYDATA", "UNSTRUCTURED_GRID"):
        raise FormatError(
            walk.file, f"a data set {words[1]}", "POLYDATA or UNSTRUCTURED_GRID", hint="export the fault surface as triangles"
        )
    if key == "POINTS":
        walk.points = walk.numbers(3 * int(words[1]), words[2]).astype(np.float64).reshape(-1, 3)
    elif key in CELLS:
        found = runs(walk, int(words[1]), int(words[2]))
        kinds = np.full(len(found[1]), CELLS[key])
        kinds[(np.diff(found[1], prepend=0) == 3) & (kinds == POLYGON)] = TRIANGLE
        walk.runs.append((found, kinds))
    elif key == "CELLS":
        walk.cells = runs(walk, int(words[1]), int(words[2]))
    elif key == "CELL_TYPES":
        kinds = walk.numbers(int(words[1]), "int").astype(np.int64)
        if walk.cells is None or len(kinds) != len(walk.cells[1]):
            raise FormatError(walk.file, f"{len(kinds)} cell types", "one a cell, after the cells", hint=EXPORT_AGAIN)
        walk.runs.append((walk.cells, kinds))
    elif key == "METADATA":
        skip_metadata(walk)
    elif key == "FIELD":
        skip_field(walk, int(words[2]))
    elif key != "DATASET":
        raise ValueError


def runs(walk: Walk, count: int, size: int) -> Runs:
    """Return the cells of one section: since version 5 as offsets and corners, before as a count before each cell's corners."""
    if walk.version >= 5:
        ends = walk.numbers(count, walk.line()[1]).astype(np.int64)[1:]
        return walk.numbers(size, walk.line()[1]).astype(np.int64), ends
    return unrolled(walk.numbers(size, "int").astype(np.int64), count, walk.file)


def unrolled(flat: NDArray[np.int64], count: int, file: str) -> Runs:
    """Return cells that are stored as their size and then their corners, (4-number rows at once where all are triangles)."""
    if len(flat) == 4 * count and (flat[::4] == 3).all():
        return flat.reshape(-1, 4)[:, 1:].ravel(), np.arange(3, 3 * count + 1, 3)
    values, heads, at = flat.tolist(), [], 0
    for _ in range(count):
        if at >= len(values) or values[at] < 0 or at + values[at] >= len(values):
            raise FormatError(file, "cells that run past their section", f"{count} cells in {len(values)} numbers", hint=EXPORT_AGAIN)
        heads.append(at)
        at += values[at] + 1
    sizes = flat[heads]
    keep = np.ones(at, bool)
    keep[heads] = False
    return flat[:at][keep], np.cumsum(sizes)


def skip_metadata(walk: Walk) -> None:
    """Pass over a METADATA section, which a blank line ends."""
    end = re.compile(rb"\n[ \t\r]*\n").search(walk.content, walk.at - 1)
    walk.at = end.end() if end else len(walk.content)


def skip_field(walk: Walk, arrays: int) -> None:
    """Pass over the arrays of a FIELD section."""
    for _ in range(arrays):
        words = walk.line()
        if words and words[0].upper() == "METADATA":
            skip_metadata(walk)
            words = walk.line()
        if words[3].lower() in ("string", "variant"):
            raise FormatError(walk.file, "words in a field before the surface", "numbers", hint="export without field data, or as VTP")
        walk.numbers(int(words[1]) * int(words[2]), words[3])


def surface_of(walk: Walk) -> Piece:
    """Return the surface of what the walk has met."""
    at, ids, ends, types = 0, [np.zeros(0, np.int64)], [np.zeros(0, np.int64)], [np.zeros(0, np.int64)]
    for (corners, closes), kinds in walk.runs:
        check_runs(corners, closes, walk.file)
        used = int(closes[-1]) if len(closes) else 0
        ids.append(corners[:used])
        ends.append(closes + at)
        types.append(kinds)
        at += used
    kinds = np.concatenate(types)
    if not len(kinds):
        raise no_triangles(kinds, walk.file)
    triangles, history = triangles_of_cells(np.concatenate(ids), np.concatenate(ends), kinds, walk.file)
    check_indices(triangles, len(walk.points), walk.file)
    return Piece("", walk.points, triangles, history)


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return a binary legacy file of version 3, points as double."""
    rows = np.empty((len(surface.triangles), 4), ">i4")
    rows[:, 0], rows[:, 1:] = 3, surface.triangles
    points = np.ascontiguousarray(surface.vertices, ">f8").tobytes()
    head = f"# vtk DataFile Version 3.0\nsurface in metres, up positive\nBINARY\nDATASET POLYDATA\nPOINTS {len(surface.vertices)} double\n"
    return head.encode() + points + f"\nPOLYGONS {len(rows)} {rows.size}\n".encode() + rows.tobytes() + b"\n"


FORMATS = (Format("vtk", "VTK legacy", (".vtk",), sniff, read, write, (NAMES, SEVERAL, CELL_ARRAYS)),)
