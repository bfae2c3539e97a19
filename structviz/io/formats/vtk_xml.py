"""VTK XML files of surfaces (VTP) and of mixed cells (VTU), read and written by the published file format.

Read here rather than by a library because a damaged file must be an error with a reason, and because 200 files are to be read
in a fraction of a second.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from xml.etree import ElementTree
from xml.sax.saxutils import quoteattr

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, SurfaceError
from structviz.io.cells import POLYGON, STRIP, TRIANGLE, check_indices, check_runs, counted, no_triangles, triangles_of_cells
from structviz.io.declared_names import declared_of
from structviz.io.format import SEVERAL, CellData, Format, Piece, encoded, start_of
from structviz.io.vtk_xml import DAMAGED, NAME_OF, TYPES, Source, texts_of, values
from structviz.surfaces.surface import Surface


def named(parent: ElementTree.Element | None, name: str) -> ElementTree.Element | None:
    """Return the DataArray of a name within a parent, or None."""
    return None if parent is None else next((child for child in parent if child.get("Name", "").lower() == name), None)


def whole_number(piece: ElementTree.Element, key: str, file: str) -> int:
    """Return a count attribute of a Piece; FormatError where it is no whole number of zero or more."""
    text = piece.get(key, "0") or "0"
    if not text.strip().isdigit():
        raise FormatError(file, f"{key}={text!r}", "a whole number", hint=DAMAGED)
    return int(text)


def whole(source: Source, element: ElementTree.Element | None, what: str) -> NDArray[np.int64]:
    """Return the whole numbers of a DataArray; FormatError where it holds numbers with fractions."""
    array = values(source, element, what)
    if array.dtype.kind == "f":
        raise FormatError(source.file, f"{what} of type {array.dtype}", "whole numbers", hint=DAMAGED)
    return array.astype(np.int64)


def runs(source: Source, parent: ElementTree.Element | None, count: int, what: str) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return corner numbers and the end of each cell; both empty where there are no cells."""
    if not count:
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    ids = whole(source, named(parent, "connectivity"), f"{what} corners")
    ends = whole(source, named(parent, "offsets"), f"{what} ends")
    if len(ends) != count:
        raise FormatError(
            source.file, f"{counted(len(ends), 'cell end')} for {counted(count, 'cell')} of {what}", "one end a cell", hint=DAMAGED
        )
    check_runs(ids, ends, source.file)
    return ids, ends


def points_of(source: Source, piece: ElementTree.Element) -> NDArray[np.float64]:
    """Return the points of a Piece, (V, 3) float64."""
    count = whole_number(piece, "NumberOfPoints", source.file)
    if not count:
        return np.zeros((0, 3))
    parent = piece.find("Points")
    flat = values(source, None if parent is None else parent.find("DataArray"), "points")
    if len(flat) != 3 * count:
        raise FormatError(source.file, f"{len(flat)} coordinates", f"{3 * count} for {counted(count, 'point')}", hint=DAMAGED)
    return flat.astype(np.float64).reshape(-1, 3)


def polydata_cells(source: Source, piece: ElementTree.Element) -> tuple[NDArray, NDArray, NDArray]:
    """Return corner numbers, ends and VTK cell types of a PolyData piece."""
    found, types, at = [], [], 0
    for tag, kind in (("Polys", POLYGON), ("Strips", STRIP), ("Lines", 4), ("Verts", 2)):
        ids, ends = runs(source, piece.find(tag), whole_number(piece, f"NumberOf{tag}", source.file), tag.lower())
        kind_of = np.where((np.diff(ends, prepend=0) == 3) & (kind == POLYGON), TRIANGLE, kind)
        used = int(ends[-1]) if len(ends) else 0
        found.append((ids[:used], ends + at))
        types.append(kind_of)
        at += used
    return np.concatenate([f[0] for f in found]), np.concatenate([f[1] for f in found]), np.concatenate(types)


def grid_cells(source: Source, piece: ElementTree.Element) -> tuple[NDArray, NDArray, NDArray]:
    """Return corner numbers, ends and VTK cell types of an UnstructuredGrid piece."""
    count = whole_number(piece, "NumberOfCells", source.file)
    ids, ends = runs(source, piece.find("Cells"), count, "cells")
    types = whole(source, named(piece.find("Cells"), "types"), "cell types") if count else np.zeros(0, np.int64)
    if len(types) != len(ends):
        raise FormatError(source.file, f"{len(types)} cell types", f"{len(ends)}, one a cell", hint=DAMAGED)
    return ids, ends, types


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the one surface of a VTP or VTU file, all its pieces joined."""
    source = Source(content, file)
    kind = source.root.get("type", "")
    parent = source.root.find(kind)
    pieces = [] if parent is None else parent.findall("Piece")
    cells_of = polydata_cells if kind == "PolyData" else grid_cells
    vertices, triangles, types, base = [], [], [], 0
    history: list[str] = []
    for piece in pieces:
        points = points_of(source, piece)
        ids, ends, kinds = cells_of(source, piece)
        types.append(kinds)
        if len(kinds) and ((kinds == TRIANGLE).any() or (kinds >= STRIP).any()):
            made, words = triangles_or_none(ids, ends, kinds, file)
            check_indices(made, len(points), file)
            triangles.append(made + base)
            history += words
        vertices.append(points)
        base += len(points)
    if not any(len(made) for made in triangles):
        raise no_triangles(np.concatenate(types) if types else [], file)
    fields = fields_of(source)
    body = np.concatenate(vertices), np.concatenate(triangles)
    return (Piece(fields.get("name", ""), *body, tuple(history), declared=declared_of(fields)),)


def triangles_or_none(ids: NDArray, ends: NDArray, kinds: NDArray, file: str) -> tuple[NDArray, tuple[str, ...]]:
    """Return the triangles of one piece; none where it holds no face (another piece may)."""
    try:
        return triangles_of_cells(ids, ends, kinds, file)
    except SurfaceError:
        return np.zeros((0, 3), np.int64), ()


def fields_of(source: Source) -> dict[str, str]:
    """Return the field data that are one text or one number by name, as text."""
    found = {}
    parent = source.root.find(source.root.get("type", ""))
    for element in () if parent is None else parent.findall("FieldData/*"):
        name, kind = element.get("Name", ""), element.get("type", "")
        if kind == "String":
            texts = texts_of(source, element, f"field {name}")
            found[name] = texts[0] if len(texts) == 1 else ""
        elif kind in TYPES and element.get("NumberOfTuples") == "1":
            number = values(source, element, f"field {name}")
            found[name] = repr(float(number[0])) if len(number) == 1 else ""
    return found


def sniffer(kind: str) -> Callable[[bytes], bool]:
    """Return a sniff for VTK XML of one type."""
    pattern = re.compile(rb"<VTKFile[^>]*type\s*=\s*[\"']" + kind.encode() + rb"[\"']")
    return lambda content: start_of(content, 2048).startswith((b"<?xml", b"<VTKFile", b"<!--")) and bool(pattern.search(content[:2048]))


def write_polydata(surface: Surface, cell_data: CellData) -> bytes:
    """Return a VTP file: points float64, one array a triangle for each entry of `cell_data`, the name and legends as field data."""
    corners, ends = surface.triangles.astype(np.int32).ravel(), np.arange(3, 3 * len(surface.triangles) + 1, 3, dtype=np.int32)
    return written("PolyData", f'NumberOfPolys="{len(ends)}"', "Polys", {"connectivity": corners, "offsets": ends}, surface, cell_data)


def write_grid(surface: Surface, cell_data: CellData) -> bytes:
    """Return a VTU file with the same content as the VTP one."""
    corners, ends = surface.triangles.astype(np.int32).ravel(), np.arange(3, 3 * len(surface.triangles) + 1, 3, dtype=np.int32)
    cells: dict[str, NDArray] = {"connectivity": corners, "offsets": ends, "types": np.full(len(ends), TRIANGLE, np.uint8)}
    return written("UnstructuredGrid", f'NumberOfCells="{len(ends)}"', "Cells", cells, surface, cell_data)


def written(kind: str, count: str, tag: str, cells: dict[str, NDArray], surface: Surface, cell_data: CellData) -> bytes:
    """Return a VTK XML file with its arrays appended raw, little-endian."""
    blocks: list[bytes] = []
    fields: dict[str, tuple[str, ...]] = {"name": (surface.name,)} if surface.name else {}
    data = []
    for name, array in cell_data.items():
        numbers, legend = encoded(array)
        if legend:
            fields[f"{name}_legend"] = legend
        data.append(appended(name, numbers, blocks))
    points = appended("Points", np.asarray(surface.vertices, np.float64), blocks)
    corners = "".join(appended(name, array, blocks) for name, array in cells.items())
    head = (
        f'<?xml version="1.0"?>\n<VTKFile type="{kind}" version="1.0" byte_order="LittleEndian" header_type="UInt64">\n<{kind}>\n'
        f'{field_text(fields)}<Piece NumberOfPoints="{len(surface.vertices)}" {count}>\n'
        f"<CellData>\n{''.join(data)}</CellData>\n<Points>\n{points}</Points>\n<{tag}>\n{corners}</{tag}>\n"
        f'</Piece>\n</{kind}>\n<AppendedData encoding="raw">\n_'
    )
    return b"".join([head.encode(errors="replace"), *blocks, b"\n</AppendedData>\n</VTKFile>\n"])


def appended(name: str, array: NDArray, blocks: list[bytes]) -> str:
    """Return the DataArray element of an array whose bytes are put behind the blocks."""
    array = np.ascontiguousarray(array)
    kind = NAME_OF.get(f"{array.dtype.kind}{array.dtype.itemsize}")
    if kind is None:
        array, kind = array.astype(np.float64), "Float64"
    raw = array.astype(array.dtype.newbyteorder("<"), copy=False).tobytes()
    offset = sum(map(len, blocks))
    blocks += [len(raw).to_bytes(8, "little"), raw]
    parts = 1 if array.ndim == 1 else array.shape[1]
    return f'<DataArray type="{kind}" Name={quoted(name)} NumberOfComponents="{parts}" format="appended" offset="{offset}"/>\n'


def field_text(fields: dict[str, tuple[str, ...]]) -> str:
    """Return the FieldData element of words: each a run of UTF-8 codes closed by zero, as VTK stores strings in text."""
    if not fields:
        return ""
    arrays = "".join(
        f'<Array type="String" Name={quoted(name)} NumberOfTuples="{len(words)}" format="ascii">\n'
        f"{' '.join(' '.join(map(str, [*word.replace(chr(0), '').encode(errors='replace'), 0])) for word in words)}\n</Array>\n"
        for name, words in fields.items()
    )
    return f"<FieldData>\n{arrays}</FieldData>\n"


def quoted(text: str) -> str:
    """Return a text as an XML attribute value with its quotes; control characters, which XML cannot hold, become blanks."""
    return quoteattr("".join(" " if ord(letter) < 32 or ord(letter) == 127 else letter for letter in text))


FORMATS = (
    Format("vtp", "VTK XML surface", (".vtp",), sniffer("PolyData"), read, write_polydata, (SEVERAL,)),
    Format("vtu", "VTK XML grid", (".vtu",), sniffer("UnstructuredGrid"), read, write_grid, (SEVERAL,)),
)
