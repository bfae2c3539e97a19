"""The blocks of Gmsh MSH 2 and 4.1 files, text and binary, by the published file format."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.text import EXPORT_AGAIN
from structviz.surfaces.surface import Floats, Integers

NODES_OF = {
    1: 2, 2: 3, 3: 4, 4: 4, 5: 8, 6: 6, 7: 5, 8: 3, 9: 6, 10: 9, 11: 10, 12: 27, 13: 18, 14: 14, 15: 1, 16: 8, 17: 20, 18: 15, 19: 13,
    20: 9, 21: 10, 22: 12, 23: 15, 24: 15, 25: 21, 26: 4, 27: 5, 28: 6, 29: 20, 30: 35, 31: 56, 36: 16, 37: 25, 38: 36, 92: 64, 93: 125,
}  # fmt: skip


@dataclass(frozen=True, eq=False)
class Mesh:
    """Points, names of the physical groups by (dimension, tag), and blocks of elements: type, rows of points, group of each row."""

    points: Floats
    names: dict[tuple[int, int], str]
    blocks: tuple[tuple[int, Integers, Integers], ...]


class Cursor:
    """Numbers taken one after another from a section, text or binary."""

    def __init__(self, content: bytes, binary: bool, order: str, file: str, section: str) -> None:
        self.binary, self.order, self.file, self.section = binary, order, file, section
        self.content: bytes | list[bytes] = content if binary else content.split()
        self.at = 0

    def take(self, count: int, kind: str) -> NDArray:
        """Return `count` numbers of a kind such as "i4", "u8", "f8"; FormatError where the section ends before."""
        width = np.dtype(kind).itemsize if self.binary else 1
        if count < 0 or self.at + count * width > len(self.content):
            raise FormatError(self.file, f"section ${self.section} that ends too early", "whole sections", hint=EXPORT_AGAIN)
        start, self.at = self.at, self.at + count * width
        if isinstance(self.content, bytes):
            return np.frombuffer(self.content, self.order + kind, count, start)
        try:
            return np.array(self.content[start : self.at], dtype=kind[0].replace("u", "i") + "8")
        except (ValueError, OverflowError) as error:
            raise FormatError(self.file, f"{error} in section ${self.section}", "numbers", hint=EXPORT_AGAIN) from None

    def one(self, kind: str) -> int:
        """Return one whole number."""
        return int(self.take(1, kind)[0])


def section(content: bytes, name: str, *, last: bool = False) -> bytes | None:
    """Return the bytes of a section, None where there is none; a section without its end runs to the end of the file."""
    start = content.find(b"$" + name.encode())
    if start < 0:
        return None
    start = content.find(b"\n", start) + 1
    marker = b"$End" + name.encode()
    end = content.rfind(marker) if last else content.find(marker, start)
    return content[start : end if end >= start else len(content)]


def parsed(content: bytes, file: str) -> Mesh:
    """Return the mesh of an MSH file; FormatError for other versions and for damaged files."""
    words = (section(content, "MeshFormat") or b"").split(None, 3)
    version, binary = words[0].decode("latin-1") if words else "", words[1:2] == [b"1"]
    if not (version.startswith("2") or version == "4.1"):
        raise FormatError(file, f"MSH version {version or 'unknown'}", "MSH 2.2 or 4.1", hint="save the mesh again as MSH 4.1 or 2.2")
    if binary and (words[2:3] != [b"8"] or len(words) < 4):
        raise FormatError(file, "a binary header with another size of numbers than 8", "MSH with numbers of 8 bytes", hint=EXPORT_AGAIN)
    order = "<" if not binary or words[3][:4] == b"\x01\0\0\0" else ">"
    return (version_two if version.startswith("2") else version_four)(content, binary, order, file)


def cursor(content: bytes, name: str, binary: bool, order: str, file: str) -> Cursor:
    """Return a cursor over a section that must be there."""
    body = section(content, name, last=binary)
    if body is None:
        raise FormatError(file, f"no section ${name}", "nodes and elements", hint=EXPORT_AGAIN)
    return Cursor(body, binary, order, file, name)


def names_of(content: bytes) -> dict[tuple[int, int], str]:
    """Return the names of the physical groups."""
    body = (section(content, "PhysicalNames") or b"").decode("utf-8", "replace")
    return {(int(d), int(tag)): name for d, tag, name in re.findall(r'^\s*(\d+)\s+(-?\d+)\s+"([^"\n]*)"', body, re.MULTILINE)}


def rows_of(tags: NDArray, wanted: NDArray, file: str) -> Integers:
    """Return the row of each wanted node tag; FormatError where a tag is not among the nodes."""
    order = np.argsort(tags, kind="stable")
    place = np.minimum(np.searchsorted(tags, wanted, sorter=order), max(len(tags) - 1, 0))
    if len(wanted.ravel()) and (not len(tags) or (tags[order[place]] != wanted).any()):
        raise FormatError(file, "elements on nodes that are not in the file", "every node an element uses", hint=EXPORT_AGAIN)
    return order[place] if len(wanted.ravel()) else np.zeros(wanted.shape, np.int64)


def nodes_of(kind: int, file: str) -> int:
    """Return the number of nodes of an element type."""
    if kind not in NODES_OF:
        raise FormatError(file, f"element type {kind}", "a type of element that Gmsh documents", hint=EXPORT_AGAIN)
    return NODES_OF[kind]


def joined(found: dict[int, list[tuple[NDArray, NDArray]]], tags: NDArray, file: str) -> tuple[tuple[int, Integers, Integers], ...]:
    """Return blocks of one type each, with the node tags turned into rows."""
    return tuple(
        (
            kind,
            rows_of(tags, np.concatenate([rows for rows, _ in parts]).astype(np.int64), file),
            np.concatenate([group for _, group in parts]),
        )
        for kind, parts in found.items()
    )


def version_two(content: bytes, binary: bool, order: str, file: str) -> Mesh:
    """Return the mesh of an MSH 2 file."""
    tags, points = nodes_two(content, binary, order, file)
    body = section(content, "Elements", last=binary)
    found = (elements_two_binary if binary else elements_two_text)(first_line(body, "Elements", file), order, file)
    return Mesh(points, names_of(content), joined(found, tags, file))


def first_line(body: bytes | None, name: str, file: str) -> tuple[int, bytes]:
    """Return the count in the first line of a section of MSH 2, and what follows it."""
    head, _, rest = (body or b"").partition(b"\n")
    if not head.strip().isdigit():
        raise FormatError(file, f"no count in section ${name}", "nodes and elements", hint=EXPORT_AGAIN)
    return int(head), rest


def nodes_two(content: bytes, binary: bool, order: str, file: str) -> tuple[NDArray, Floats]:
    """Return node tags and points of an MSH 2 file."""
    count, rest = first_line(section(content, "Nodes"), "Nodes", file)
    if not binary:
        table = Cursor(rest, False, order, file, "Nodes").take(4 * count, "f8").reshape(-1, 4)
        if not (np.abs(table[:, 0]) < 2**53).all():
            raise FormatError(file, "node numbers that are no numbers", "whole numbers", hint=EXPORT_AGAIN)
        return table[:, 0].astype(np.int64), np.ascontiguousarray(table[:, 1:])
    start = content.find(b"\n", content.find(b"\n", content.find(b"$Nodes")) + 1) + 1
    row = np.dtype([("tag", order + "i4"), ("point", order + "f8", 3)])
    if start + count * row.itemsize > len(content):
        raise FormatError(file, "section $Nodes that ends too early", "whole sections", hint=EXPORT_AGAIN)
    table = np.frombuffer(content, row, count, start)
    return table["tag"].astype(np.int64), table["point"].astype(np.float64)


def elements_two_text(counted_body: tuple[int, bytes], order: str, file: str) -> dict[int, list[tuple[NDArray, NDArray]]]:
    """Return node tags and groups by element type, from text."""
    count, body = counted_body
    lines = [line.split() for line in body.splitlines() if line.strip()]
    if len(lines) < count:
        raise FormatError(file, f"{len(lines)} elements", f"{count}", hint=EXPORT_AGAIN)
    found: dict[int, list[tuple[NDArray, NDArray]]] = {}
    by_shape: dict[tuple[bytes, ...], list[list[bytes]]] = {}
    for line in lines[:count]:
        by_shape.setdefault(tuple(line[1:3]), []).append(line)
    for shape, rows in by_shape.items():
        try:
            kind, tags = int(shape[0]), int(shape[1])
            table = np.array(rows, dtype=np.int64)
        except (ValueError, IndexError, OverflowError):
            raise FormatError(
                file, "an element row of the wrong length or with no numbers", "rows of whole numbers", hint=EXPORT_AGAIN
            ) from None
        if table.shape[1] != 3 + tags + nodes_of(kind, file):
            raise FormatError(file, "an element row of the wrong length", f"{3 + tags + nodes_of(kind, file)} numbers", hint=EXPORT_AGAIN)
        found.setdefault(kind, []).append((table[:, 3 + tags :], np.abs(table[:, 3]) if tags else np.zeros(len(table), np.int64)))
    return found


def elements_two_binary(counted_body: tuple[int, bytes], order: str, file: str) -> dict[int, list[tuple[NDArray, NDArray]]]:
    """Return node tags and groups by element type, from binary blocks."""
    count, body = counted_body
    take = Cursor(body, True, order, file, "Elements")
    found: dict[int, list[tuple[NDArray, NDArray]]] = {}
    while count > 0:
        kind, many, tags = (int(v) for v in take.take(3, "i4"))
        if many < 1 or tags < 0:
            raise FormatError(file, f"a block of {many} elements", "one or more", hint=EXPORT_AGAIN)
        width = 1 + tags + nodes_of(kind, file)
        table = take.take(many * width, "i4").reshape(many, width).astype(np.int64)
        found.setdefault(kind, []).append((table[:, 1 + tags :], np.abs(table[:, 1]) if tags else np.zeros(many, np.int64)))
        count -= many
    return found


def version_four(content: bytes, binary: bool, order: str, file: str) -> Mesh:
    """Return the mesh of an MSH 4.1 file."""
    groups = entities(content, binary, order, file) if b"$Entities" in content else {}
    tags, points = nodes_four(cursor(content, "Nodes", binary, order, file))
    take = cursor(content, "Elements", binary, order, file)
    found: dict[int, list[tuple[NDArray, NDArray]]] = {}
    blocks, _, _, _ = (int(v) for v in take.take(4, "u8"))
    for _ in range(blocks):
        dimension, entity, kind = (int(v) for v in take.take(3, "i4"))
        many, width = take.one("u8"), 1 + nodes_of(kind, file)
        rows = take.take(many * width, "u8").reshape(many, width)[:, 1:].astype(np.int64)
        for group in groups.get((dimension, entity)) or [0]:
            found.setdefault(kind, []).append((rows, np.full(many, group)))
    return Mesh(points, names_of(content), joined(found, tags, file))


def nodes_four(take: Cursor) -> tuple[NDArray, Floats]:
    """Return node tags and points of an MSH 4.1 file."""
    blocks, count, _, _ = (int(v) for v in take.take(4, "u8"))
    tags, points = [np.zeros(0, np.int64)], [np.zeros((0, 3))]
    for _ in range(blocks):
        dimension, _, parametric = (int(v) for v in take.take(3, "i4"))
        many = take.one("u8")
        tags.append(take.take(many, "u8").astype(np.int64))
        width = 3 + (max(dimension, 0) if parametric else 0)
        points.append(take.take(many * width, "f8").reshape(many, width)[:, :3].astype(np.float64))
    found = np.concatenate(tags)
    if len(found) != count:
        raise FormatError(take.file, f"{len(found)} nodes", f"{count}", hint=EXPORT_AGAIN)
    return found, np.concatenate(points)


def entities(content: bytes, binary: bool, order: str, file: str) -> dict[tuple[int, int], list[int]]:
    """Return the physical groups of each (dimension, entity)."""
    take = cursor(content, "Entities", binary, order, file)
    counts = [int(v) for v in take.take(4, "u8")]
    found: dict[tuple[int, int], list[int]] = {}
    for dimension, count in enumerate(counts):
        for _ in range(count):
            tag = take.one("i4")
            take.take(3 if dimension == 0 else 6, "f8")
            found[dimension, tag] = [abs(int(v)) for v in take.take(take.one("u8"), "i4")]
            if dimension:
                take.take(take.one("u8"), "i4")
    return found
