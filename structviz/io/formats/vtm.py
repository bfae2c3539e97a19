"""VTK XML collections (VTM): named surfaces in VTP and VTU files beside, read by the published file format.

The names of the collection win over those in the files. Written by the report as a list of what it wrote.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from pathlib import PurePosixPath
from xml.etree.ElementTree import Element
from xml.sax.saxutils import quoteattr

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io.cells import counted
from structviz.io.format import Beside, Format, Piece
from structviz.io.formats import vtk_xml
from structviz.io.vtk_xml import parsed

KIND = "vtkMultiBlockDataSet"
READ = (".vtp", ".vtu")
DEEPEST, MOST = 16, 20_000
HINT = "export the collection again, with its surfaces as VTP files"


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Raise InputError: a collection alone holds no surface."""
    raise InputError(file, "a collection without its files", "the files it names beside it", hint="read it from its folder")


def read_beside(content: bytes, file: str, beside: Beside) -> tuple[Piece, ...]:
    """Return the surfaces of every file the collection names, in its order; data sets of other kinds are told and left out."""
    pieces: list[Piece] = []
    others: dict[str, int] = {}
    for name, named in _entries(parsed(content, file).find(KIND), "", file, 0):
        suffix = PurePosixPath(named).suffix.lower()
        if suffix not in READ:
            others[suffix or "without suffix"] = others.get(suffix or "without suffix", 0) + 1
            continue
        if len(pieces) >= MOST:
            raise FormatError(file, f"more than {MOST:,} files", "a surface for each fault", hint=HINT)
        for piece in vtk_xml.read(beside(named), f"{file}: {named}"):
            pieces.append(replace(piece, name=name or piece.name or PurePosixPath(named).stem))
    told = tuple(f"{counted(count, f'data set {suffix}')} not read" for suffix, count in sorted(others.items()))
    if not pieces:
        raise SurfaceError(file, f"no surfaces ({', '.join(told) or 'an empty collection'})", "VTP or VTU files", hint=HINT)
    return tuple(replace(piece, told=told) for piece in pieces)


def _entries(parent: Element | None, above: str, file: str, depth: int) -> Iterator[tuple[str, str]]:
    """Yield the name and the file of every data set; one without a name takes that of its block."""
    if depth > DEEPEST:
        raise FormatError(file, f"blocks nested more than {DEEPEST} deep", "a collection", hint=HINT)
    for child in () if parent is None else parent:
        name = child.get("name", "").strip()
        if child.tag == "DataSet" and child.get("file"):
            yield name or above, child.get("file", "")
        elif child.tag in ("Block", "Piece", "DataSet"):
            yield from _entries(child, name or above, file, depth + 1)


def collection(files: Mapping[str, str]) -> bytes:
    """Return a collection of named files, the paths relative to it with forward slashes."""
    rows = "".join(f'    <DataSet index="{k}" name={_quoted(name)} file={_quoted(files[name])}/>\n' for k, name in enumerate(files))
    head = f'<?xml version="1.0"?>\n<VTKFile type="{KIND}" version="1.0" byte_order="LittleEndian">\n  <{KIND}>\n'
    return f"{head}{rows}  </{KIND}>\n</VTKFile>\n".encode(errors="replace")


def _quoted(text: str) -> str:
    return quoteattr("".join(" " if ord(letter) < 32 or ord(letter) == 127 else letter for letter in text))


FORMATS = (Format("vtm", "VTK XML collection", (".vtm",), vtk_xml.sniffer(KIND), read, None, read_beside=read_beside),)
