"""PLY, text and binary of either byte order, with coordinates of any number type (float64 is kept)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.cells import check_indices, counted, fan, no_triangles, strips
from structviz.io.format import NAMES, SEVERAL, CellData, Format, Piece, encoded, start_of
from structviz.io.text import EXPORT_AGAIN, floats
from structviz.surfaces.surface import Surface

TYPES = {
    "char": "i1", "uchar": "u1", "short": "i2", "ushort": "u2", "int": "i4", "uint": "u4", "float": "f4", "double": "f8",
    "int8": "i1", "uint8": "u1", "int16": "i2", "uint16": "u2", "int32": "i4", "uint32": "u4", "float32": "f4", "float64": "f8",
    "int64": "i8", "uint64": "u8",
}  # fmt: skip
CORNERS = ("vertex_indices", "vertex_index")
ORDER = {"ascii": "", "binary_little_endian": "<", "binary_big_endian": ">"}


@dataclass(frozen=True)
class Element:
    """One element of the header: its name, how many, and its properties as (name, type, type of the count or "")."""

    name: str
    count: int
    properties: tuple[tuple[str, str, str], ...]


def sniff(content: bytes) -> bool:
    """Return True where the first line is the word ply."""
    return start_of(content, 64).split(None, 1)[:1] == [b"ply"]


def header(content: bytes, file: str) -> tuple[str, list[Element], int]:
    """Return the byte order ("" for text), the elements, and where the data begin."""
    at = content.find(b"end_header")
    if at < 0:
        raise FormatError(file, "a header without end", "a line 'end_header'", hint=EXPORT_AGAIN)
    elements: list[Element] = []
    order = None
    for words in (line.split() for line in content[:at].decode("latin-1").splitlines()):
        try:
            if words[:1] == ["format"]:
                order = ORDER[words[1]]
            elif words[:1] == ["element"]:
                elements.append(Element(words[1], int(words[2]), ()))
            elif words[:1] == ["property"]:
                last = elements.pop()
                entry = (words[4], TYPES[words[3]], TYPES[words[2]]) if words[1] == "list" else (words[2], TYPES[words[1]], "")
                elements.append(Element(last.name, last.count, (*last.properties, entry)))
        except (IndexError, KeyError, ValueError):
            raise FormatError(file, f"header line {' '.join(words)!r}", "a format, element or property of PLY", hint=EXPORT_AGAIN) from None
    if order is None or not all(sound(element) for element in elements):
        raise FormatError(file, "a header whose format, counts or properties make no sense", "a PLY header", hint=EXPORT_AGAIN)
    line_end = content.find(b"\n", at)
    return order, elements, (line_end if line_end >= 0 else len(content) - 1) + 1


def sound(element: Element) -> bool:
    """Return True where an element has a count of zero or more, each property once, and whole numbers for the lengths of lists."""
    names = [name for name, _, _ in element.properties]
    return element.count >= 0 and len(set(names)) == len(names) and not any(counter.startswith("f") for _, _, counter in element.properties)


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the one surface of a PLY file."""
    order, elements, at = header(content, file)
    words = content[at:].split() if not order else []
    at = at if order else 0
    columns: dict[str, dict[str, NDArray | tuple[NDArray, NDArray]]] = {}
    for element in elements:
        columns[element.name], at = binary_element(content, at, order, element, file) if order else text_element(words, at, element, file)
    return (surface_of(columns, file),)


def cut_short(element: Element, file: str) -> FormatError:
    """Return the error for data that end before an element does."""
    return FormatError(file, f"data that end within the {element.name} rows", f"{counted(element.count, 'row')} of them", hint=EXPORT_AGAIN)


def binary_element(content: bytes, at: int, order: str, element: Element, file: str) -> tuple[dict, int]:
    """Return the columns of one element and where the next begins; rows whose lists are all as long as the first are read at once."""
    if not element.count or not element.properties:
        return {name: np.zeros(0) for name, _, _ in element.properties}, at
    lengths = first_lengths(content, at, order, element)
    row = np.dtype(
        [part for name, kind, counter in element.properties for part in fields(name, kind, counter, order, lengths.get(name, 0))]
    )
    if lengths is not None and at + row.itemsize * element.count <= len(content):
        rows = np.frombuffer(content, row, element.count, at)
        if all((rows[f"count of {name}"] == length).all() for name, length in lengths.items()):
            return {name: column(rows, name, lengths) for name, _, _ in element.properties}, at + row.itemsize * element.count
    return walked(content, at, order, element, file)


def fields(name: str, kind: str, counter: str, order: str, length: int) -> list[tuple]:
    """Return the record fields of one property."""
    return [(f"count of {name}", order + counter), (name, order + kind, (length,))] if counter else [(name, order + kind)]


def first_lengths(content: bytes, at: int, order: str, element: Element) -> dict[str, int]:
    """Return the lengths of the lists of the first row."""
    lengths: dict[str, int] = {}
    for name, kind, counter in element.properties:
        if counter:
            width = np.dtype(counter).itemsize
            found = np.frombuffer(content[at : at + width], order + counter) if at + width <= len(content) else np.zeros(1)
            lengths[name] = int(np.clip(found[0], 0, 100_000))
            at += width + lengths[name] * np.dtype(kind).itemsize
        else:
            at += np.dtype(kind).itemsize
    return lengths


def column(rows: NDArray, name: str, lengths: dict[str, int]) -> NDArray | tuple[NDArray, NDArray]:
    """Return the values of a property, or the flat values and run ends of a list property."""
    if name not in lengths:
        return rows[name]
    return rows[name].reshape(-1), np.arange(1, len(rows) + 1) * lengths[name]


def walked(content: bytes, at: int, order: str, element: Element, file: str) -> tuple[dict, int]:
    """Return the columns of an element whose lists differ in length, row by row."""
    found: dict[str, list] = {name: [] for name, _, _ in element.properties}
    readers = [(name, np.dtype(order + kind), np.dtype(order + counter) if counter else None) for name, kind, counter in element.properties]
    for _ in range(element.count):
        for name, kind, counter in readers:
            length = 1
            if counter is not None:
                if at + counter.itemsize > len(content):
                    raise cut_short(element, file)
                length = int(np.frombuffer(content, counter, 1, at)[0])
                at += counter.itemsize
            if length < 0 or at + length * kind.itemsize > len(content):
                raise cut_short(element, file)
            found[name].append(np.frombuffer(content, kind, length, at))
            at += length * kind.itemsize
    return {name: joined(found[name], bool(counter)) for name, _, counter in element.properties}, at


def joined(parts: list[NDArray], is_list: bool) -> NDArray | tuple[NDArray, NDArray]:
    """Return parts end to end, with the run ends for a list property."""
    flat = np.concatenate(parts)
    return (flat, np.cumsum([len(part) for part in parts])) if is_list else flat


def text_element(words: list[bytes], at: int, element: Element, file: str) -> tuple[dict, int]:
    """Return the columns of one element of a text file and where the next begins, counted in words."""
    if all(not counter for _, _, counter in element.properties):
        width = len(element.properties)
        if at + width * element.count > len(words):
            raise cut_short(element, file)
        table = numbers(words[at : at + width * element.count], element, file).reshape(element.count, width)
        return {name: table[:, place] for place, (name, _, _) in enumerate(element.properties)}, at + width * element.count
    found: dict[str, list] = {name: [] for name, _, _ in element.properties}
    ends: dict[str, list[int]] = {name: [] for name, _, _ in element.properties}
    for _ in range(element.count):
        for name, _, counter in element.properties:
            length = 1
            if counter:
                length = int(words[at]) if at < len(words) and words[at].isdigit() else len(words)
                at += 1
            if at + length > len(words):
                raise cut_short(element, file)
            found[name] += words[at : at + length]
            ends[name].append(len(found[name]))
            at += length
    flat = {name: numbers(found[name], element, file) for name in found}
    return {name: (flat[name], np.array(ends[name], np.int64)) if counter else flat[name] for name, _, counter in element.properties}, at


def numbers(words: list[bytes], element: Element, file: str) -> NDArray[np.float64]:
    """Return words of a text file as numbers."""
    return floats(words, f"the {element.name} rows", file)


def surface_of(columns: dict[str, dict], file: str) -> Piece:
    """Return the surface of the columns of all elements."""
    vertex = columns.get("vertex", {})
    if not {"x", "y", "z"} <= {name for name, values in vertex.items() if not isinstance(values, tuple)}:
        raise FormatError(
            file, f"vertex properties {', '.join(vertex) or 'none'}", "x, y and z", hint="export the surface with coordinates"
        )
    vertices = np.stack([vertex[name].astype(np.float64) for name in "xyz"], axis=1)
    ids, ends = listed(columns.get("face", {}), file)
    triangles = fan(ids, ends)
    check_indices(triangles, len(vertices), file)
    split = int((np.diff(ends, prepend=0) > 3).sum())
    history = (f"{counted(split, 'polygon')} split into triangles",) if split else ()
    if "tristrips" in columns:
        stripped = strip_triangles(*listed(columns["tristrips"], file))
        check_indices(stripped, len(vertices), file)
        triangles, history = np.concatenate([triangles, stripped]), (*history, "triangle strips split into triangles")
    if not len(triangles):
        raise no_triangles([1] if len(vertices) else [], file)
    return Piece("", vertices, triangles, history)


def listed(face: dict, file: str) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the corner numbers and run ends of faces or strips."""
    name = next((name for name in CORNERS if name in face), "")
    if not name:
        if face:
            raise FormatError(file, f"face properties {', '.join(face)}", f"a list {CORNERS[0]}", hint=EXPORT_AGAIN)
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    if not isinstance(face[name], tuple):
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    values, ends = face[name]
    if values.dtype.kind == "f" and not (np.isfinite(values) & (values == np.rint(values)) & (np.abs(values) < 2**53)).all():
        raise FormatError(file, f"{name} that are no whole numbers", "vertex numbers", hint=EXPORT_AGAIN)
    return values.astype(np.int64), ends.astype(np.int64)


def strip_triangles(ids: NDArray[np.int64], ends: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return the triangles of strips that are parted by -1 within one list."""
    breaks = np.union1d(np.flatnonzero(ids == -1), ends[ends < len(ids)])
    runs = [run[run >= 0] for run in np.split(ids, breaks)]
    return strips(np.concatenate(runs), np.cumsum([len(run) for run in runs]))


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return binary PLY: coordinates float64, one face property for each column of the cell arrays, legends as comments."""
    columns, comments = [], []
    for name, values in cell_data.items():
        array, legend = encoded(values)
        key = "_".join(name.split())
        comments += [f"comment {key} {code} is {' '.join(word.split())}" for code, word in enumerate(legend)]
        parts = [array] if array.ndim == 1 else list(array.T)
        columns += [(key if len(parts) == 1 else f"{key}_{place}", part.astype(np.float64)) for place, part in enumerate(parts)]
    face = np.zeros(len(surface.triangles), [("count", "u1"), ("corners", "<i4", 3), *((name, "<f8") for name, _ in columns)])
    face["count"], face["corners"] = 3, surface.triangles
    for name, part in columns:
        face[name] = part
    head = ["ply", "format binary_little_endian 1.0", *comments, f"element vertex {len(surface.vertices)}"]
    head += [f"property double {axis}" for axis in "xyz"]
    head += [f"element face {len(face)}", "property list uchar int vertex_indices", *(f"property double {name}" for name, _ in columns)]
    text = ("\n".join([*head, "end_header"]) + "\n").encode(errors="replace")
    return text + np.ascontiguousarray(surface.vertices, "<f8").tobytes() + face.tobytes()


FORMATS = (Format("ply", "PLY", (".ply",), sniff, read, write, (NAMES, SEVERAL)),)
