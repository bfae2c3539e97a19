"""Data arrays of VTK XML files, decoded by the published file format: text, base64 or appended; plain, zlib or LZMA packed."""

from __future__ import annotations

import base64
import binascii
import lzma
import zlib
from collections.abc import Callable
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError

TYPES = {
    "Int8": "i1", "UInt8": "u1", "Int16": "i2", "UInt16": "u2", "Int32": "i4", "UInt32": "u4", "Int64": "i8", "UInt64": "u8",
    "Float32": "f4", "Float64": "f8",
}  # fmt: skip
NAME_OF = {code: name for name, code in TYPES.items()}
UNPACK: dict[str, Callable] = {"vtkZLibDataCompressor": zlib.decompressobj, "vtkLZMADataCompressor": lzma.LZMADecompressor}
DAMAGED = "the file is damaged or cut short: export it again"


class Source:
    """The parts of one VTK XML file that decoding needs: tree, appended bytes, byte order, header type, packing."""

    def __init__(self, content: bytes, file: str) -> None:
        self.file = file
        head, self.appended, self.encoding = split_appended(content)
        self.root = parsed(head, file)
        order = "<" if self.root.get("byte_order", "LittleEndian") == "LittleEndian" else ">"
        self.order = order
        self.header = np.dtype(order + TYPES.get(self.root.get("header_type", "UInt32"), "u4"))
        self.packing = self.root.get("compressor", "")
        if self.packing and self.packing not in UNPACK:
            raise FormatError(
                file, f"data packed with {self.packing}", "plain, zlib or LZMA data", hint="save it again with zlib or without packing"
            )


def split_appended(content: bytes) -> tuple[bytes, memoryview, str]:
    """Return the XML without its appended data, the appended data after the underscore, and how they are encoded."""
    at = content.find(b"<AppendedData")
    if at < 0:
        return content, memoryview(b""), ""
    opened = content.find(b">", at)
    encoding = "base64" if b"base64" in content[at:opened] else "raw"
    start = content.find(b"_", opened) + 1
    return content[:at] + b"</VTKFile>", memoryview(content)[start:] if start else memoryview(b""), encoding


def parsed(head: bytes, file: str) -> ElementTree.Element:
    """Return the root of the XML; FormatError where it cannot be parsed or declares entities (which could be made to explode)."""
    if b"<!DOCTYPE" in head or b"<!ENTITY" in head:
        raise FormatError(file, "XML with a document type or entities", "a plain VTK XML file", hint="export the surface again")
    try:
        return ElementTree.fromstring(head)
    except (ElementTree.ParseError, ValueError, LookupError) as error:
        raise FormatError(file, f"XML that breaks off or is not well formed ({error})", "a whole VTK XML file", hint=DAMAGED) from None


def values(source: Source, element: ElementTree.Element | None, what: str) -> NDArray:
    """Return the flat values of one DataArray element; FormatError where it is missing, damaged or of an unknown type."""
    if element is None:
        raise FormatError(source.file, f"no array for {what}", f"a DataArray for {what}", hint=DAMAGED)
    kind = TYPES.get(element.get("type", ""))
    if kind is None:
        raise FormatError(source.file, f"{what} of type {element.get('type')!r}", "numbers", hint="export the surface again")
    form = element.get("format", "ascii")
    try:
        if form == "ascii":
            return np.array((element.text or "").split(), dtype=kind)
        return unpacked(source, element, form).view(np.dtype(source.order + kind)).astype(kind, copy=False)
    except (ValueError, OverflowError, IndexError, zlib.error, lzma.LZMAError, binascii.Error, MemoryError) as error:
        raise FormatError(source.file, f"{what} that cannot be decoded ({error})", "whole data arrays", hint=DAMAGED) from None


def texts_of(source: Source, element: ElementTree.Element, what: str) -> list[str]:
    """Return the texts of one Array element of strings, which are stored as runs of UTF-8 codes closed by zero."""
    form = element.get("format", "ascii")
    try:
        plain = form == "ascii"
        codes = bytes(map(int, (element.text or "").split())) if plain else unpacked(source, element, form).tobytes()
    except (ValueError, OverflowError, IndexError, zlib.error, lzma.LZMAError, binascii.Error, MemoryError) as error:
        raise FormatError(source.file, f"{what} that cannot be decoded ({error})", "whole data arrays", hint=DAMAGED) from None
    return [text.decode("utf-8", "replace") for text in codes.removesuffix(b"\0").split(b"\0")]


def unpacked(source: Source, element: ElementTree.Element, form: str) -> NDArray[np.uint8]:
    """Return the bytes of a binary or appended array, decoded and unpacked."""
    if form == "appended":
        offset = int(element.get("offset", "-1"))
        if not 0 <= offset < len(source.appended):
            raise ValueError(f"offset {offset} lies outside the {len(source.appended)} appended bytes")
        block, encoding = source.appended[offset:], source.encoding
    elif form == "binary":
        block, encoding = memoryview("".join((element.text or "").split()).encode()), "base64"
    else:
        raise ValueError(f"format {form!r} is not known")
    return unpacked_blocks(source, block, encoding) if source.packing else plain_block(source, block, encoding)


def taken(block: memoryview, start: int, size: int, encoding: str) -> tuple[bytes | memoryview, int]:
    """Return `size` bytes that begin at `start` of a raw or base64 block, and where what follows begins."""
    length = size if encoding == "raw" else -(-size // 3) * 4
    if size < 0 or start + length > len(block):
        raise ValueError(f"{size} bytes are promised, {len(block) - start} are left")
    piece = block[start : start + length]
    return (piece if encoding == "raw" else base64.b64decode(piece, validate=True)[:size]), start + length


def plain_block(source: Source, block: memoryview, encoding: str) -> NDArray[np.uint8]:
    """Return an array that follows its byte count (count and data are one run, also in base64)."""
    width = source.header.itemsize
    size = int(np.frombuffer(taken(block, 0, width, encoding)[0], source.header)[0])
    return np.frombuffer(taken(block, 0, width + size, encoding)[0], np.uint8)[width:]


def unpacked_blocks(source: Source, block: memoryview, encoding: str) -> NDArray[np.uint8]:
    """Return an array stored as packed blocks: number of blocks, block size, last size, packed sizes, then the blocks."""
    width = source.header.itemsize
    count, size, last = (int(v) for v in np.frombuffer(taken(block, 0, 3 * width, encoding)[0], source.header))
    if count > len(block):
        raise ValueError(f"{count} packed blocks are promised in {len(block)} bytes")
    header, at = taken(block, 0, (3 + count) * width, encoding)
    sizes = np.frombuffer(header, source.header)[3:].astype(np.int64)
    data, _ = taken(block, at, int(sizes.sum()), encoding)
    ends = np.cumsum(sizes)
    whole = b"".join(UNPACK[source.packing]().decompress(data[end - length : end], max(size, last)) for end, length in zip(ends, sizes))
    wanted = (count - 1) * size + (last or size) if count else 0
    if len(whole) != wanted:
        raise ValueError(f"{len(whole)} bytes unpacked, {wanted} promised")
    return np.frombuffer(whole, np.uint8)
