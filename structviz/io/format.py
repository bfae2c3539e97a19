"""What a format is: how a file is known, read and written, and what the format cannot hold."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from structviz.model import FaultModel
from structviz.surfaces.surface import Floats, Integers, Surface

CellData = Mapping[str, NDArray]
Beside = Callable[[str], bytes]  # the content of a file named relative to the one being read; InputError where it may not be read

# What a format may be unable to store; the round-trip test and the table of formats read the same words.
NAMES, SEVERAL, CELL_ARRAYS, FLOAT64, SHARED_VERTICES = "names", "several surfaces", "cell arrays", "float64", "shared vertices"
OWN_LENGTH = "its own length"  # so a file cut short between two rows cannot be told from a whole one


@dataclass(frozen=True, eq=False)
class Piece:
    """One surface as a file holds it, in the file's own units unless `framed`; `aside` says why it is used only when it is named."""

    name: str  # "" where the file gives none
    vertices: Floats  # (V, 3)
    triangles: Integers  # (T, 3) rows of vertices
    history: tuple[str, ...] = ()  # what reading did to it, in words
    aside: str = ""
    kind: str = ""  # "fault" | "horizon", "" where the file does not say
    declared: Mapping[str, str] = field(default_factory=dict)  # what the file says of its movement, by our columns of a table of faults
    framed: bool = False  # True where the file states its units and datum: the vertices are then metres with up positive
    crs: str = ""  # the reference system the file names
    told: tuple[str, ...] = ()  # what the file holds besides and was not read, the same on every piece of it
    missed: tuple[str, ...] = ()  # surfaces of the file that may be faults and could not be read, the same on every piece of it


@dataclass(frozen=True)
class Format:
    """One file format. Reading and writing work on bytes, so that a file is opened, hashed and parsed once."""

    key: str
    title: str
    suffixes: tuple[str, ...]  # lower case, with the dot
    sniff: Callable[[bytes], bool]  # True where the whole content looks like this format
    read: Callable[[bytes, str], tuple[Piece, ...]]  # (content, file named in messages)
    write: Callable[[Surface, CellData], bytes] | None
    cannot_store: tuple[str, ...] = ()
    explain: Callable[[bytes], str] = lambda content: ""  # what is wrong with a content of this suffix that no sniff knows
    read_beside: Callable[[bytes, str, Beside], tuple[Piece, ...]] | None = None  # used instead of `read` where other files belong to it
    write_all: Callable[[Sequence[tuple[Surface, CellData]]], bytes] | None = None  # several named surfaces in one file
    write_model: Callable[[FaultModel, str], Mapping[str, bytes]] | None = None  # a whole model: files by name, (model, stem of them)


def start_of(content: bytes, length: int = 512) -> bytes:
    """Return the first bytes without a byte-order mark and leading blanks, for sniffing."""
    return content[:length].removeprefix(b"\xef\xbb\xbf").lstrip()


def encoded(values: NDArray) -> tuple[NDArray, tuple[str, ...]]:
    """Return a numeric array and its legend: words become their rank in the sorted legend; numbers pass with an empty legend."""
    array = np.asarray(values)
    if array.dtype.kind in "OUS":
        legend, codes = np.unique(array.astype(str), return_inverse=True)
        return codes.reshape(array.shape).astype(np.int32), tuple(str(word) for word in legend)
    return (array.astype(np.uint8) if array.dtype.kind == "b" else array), ()
