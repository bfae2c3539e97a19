"""What was read in one go: each file once, with its hash, its surfaces, and what was noticed."""

from __future__ import annotations

import difflib
import hashlib
import os
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np

from structviz.errors import FormatError, InputError, SurfaceError, TableError
from structviz.io.format import Beside, Piece
from structviz.io.registry import format_of, suffixes, table_text
from structviz.model import Finding, InputFile

MOST_SURFACES = 20_000  # in one file: more are the cells of something else, and would be judged for hours
Progress = Callable[[str, int, int], None]  # what is being done, how many are done, of how many


@dataclass
class Ledger:
    """Files read so far under one folder, the surfaces in them, and the findings."""

    folder: Path
    allow_outside: bool = False
    inputs: dict[Path, str] = field(default_factory=dict)
    pieces: dict[Path, tuple[Piece, ...]] = field(default_factory=dict)
    findings: list[Finding] = field(default_factory=list)
    parts: set[Path] = field(default_factory=set)  # files that were read as part of another one

    def shown(self, path: Path) -> str:
        """Return a path as messages and results show it: relative to the folder, with forward slashes."""
        return Path(os.path.relpath(path, self.folder)).as_posix()

    def note(self, subject: str, message: str, hint: str = "", severity: str = "note") -> None:
        """Add a finding of the import."""
        self.findings.append(Finding("import", severity, subject, message, (), hint))

    def input_files(self) -> tuple[InputFile, ...]:
        """Return what was read, sorted by path."""
        return tuple(sorted((InputFile(self.shown(path), digest) for path, digest in self.inputs.items()), key=lambda entry: entry.path))


def content_of(ledger: Ledger, path: Path) -> bytes:
    """Return the bytes of a file and enter its hash; InputError where it cannot be read."""
    try:
        with path.open("rb") as file:
            before = os.fstat(file.fileno())
            content = file.read()
            after = os.fstat(file.fileno())
    except FileNotFoundError:
        raise missing(path, ledger.shown(path)) from None
    except (OSError, ValueError) as error:
        found = f"a path that cannot be read ({getattr(error, 'strerror', None) or error})"
        raise InputError(ledger.shown(path), found, "a readable file", hint="check the path and its permissions") from None
    if (before.st_size, before.st_mtime_ns) != (after.st_size, after.st_mtime_ns) or len(content) != after.st_size:
        found = f"a file that changed while it was read (from {before.st_size:,} to {after.st_size:,} bytes)"
        raise InputError(ledger.shown(path), found, "a file that is finished", hint="wait until it is written, then try again")
    ledger.inputs[path] = hashlib.sha256(content).hexdigest()
    return content


def missing(path: Path, shown: str) -> InputError:
    """Return the error for a file that is not there, with the nearest name in its folder."""
    there = sorted(os.listdir(path.parent)) if os.path.isdir(path.parent) else []
    if "\\" in shown and os.sep != "\\":
        return InputError(shown, "no such file", "an existing file", hint="write the path with forward slashes (/)")
    near = difflib.get_close_matches(path.name, there, n=1, cutoff=0.6)
    hint = f"did you mean {near[0]!r}?" if near else "check the spelling and the folder"
    return InputError(shown, "no such file", "an existing file", hint=hint)


def pieces_of(ledger: Ledger, path: Path) -> tuple[Piece, ...]:
    """Return the surfaces of a file, read once and checked; what reading noticed is kept for the findings."""
    if path not in ledger.pieces:
        ledger.pieces[path] = read_pieces(content_of(ledger, path), ledger.shown(path), files_beside(ledger, path))
        for words in dict.fromkeys(words for piece in ledger.pieces[path] for words in piece.told):
            ledger.note("model", f"{ledger.shown(path)}: {words}")
        for words in dict.fromkeys(words for piece in ledger.pieces[path] for words in piece.missed):
            hint = "export that surface in another way if it belongs to the model"
            ledger.note("model", f"{ledger.shown(path)}: {words}", hint, "warning")
    return ledger.pieces[path]


def files_beside(ledger: Ledger, path: Path) -> Beside:
    """Return a function that gives the content of a file named in another one; InputError where it leaves the folder of the model."""

    def content(name: str) -> bytes:
        other = inside(ledger, name, ledger.shown(path), path.parent)
        ledger.parts.add(other.resolve())
        return content_of(ledger, other)

    return content


def inside(ledger: Ledger, text: str, named_in: str, base: Path | None = None) -> Path:
    """Return a path relative to `base`, the folder of the model by default.

    InputError where it leaves the folder of the model, links followed, and may not.
    """
    if "\0" in text:
        raise TableError(named_in, f"path {text!r}", "a path", hint="correct the path")
    path = (ledger.folder if base is None else base) / text
    try:
        leaves = not path.resolve().is_relative_to(ledger.folder.resolve())
    except (OSError, RuntimeError):
        raise InputError(named_in, f"path {text!r}, a link that leads round in a circle", "a path", hint="mend the link") from None
    if leaves and not ledger.allow_outside:
        hint = "move the file into that folder, or allow it with --allow-outside"
        raise InputError(named_in, f"path {text!r}, which leaves the folder of the model", "a path inside it", hint=hint)
    return path


def nothing_beside(name: str) -> bytes:
    """Raise InputError: a content without a place has no files beside it."""
    raise InputError(name, "a file that belongs to another one", "the two in one folder", hint="read it from its folder")


def read_pieces(content: bytes, file: str, beside: Beside = nothing_beside) -> tuple[Piece, ...]:
    """Return the checked surfaces of a content; FormatError or SurfaceError where it cannot be used."""
    known, note = format_of(content, file)
    try:
        with np.errstate(all="ignore"):  # numbers of a damaged file; what is not finite or out of range is refused below
            found = known.read_beside(content, file, beside) if known.read_beside else known.read(content, file)
    except MemoryError:
        hint = "the counts in the file may be damaged: export it again"
        raise FormatError(file, "more data than there is memory for", "a file that fits into memory", hint=hint) from None
    if len(found) > MOST_SURFACES:
        hint = "a surface for each fault is wanted: merge the pieces of each before export"
        raise FormatError(file, f"{len(found):,} surfaces", f"{MOST_SURFACES:,} or fewer", hint=hint)
    for piece in found:
        check_piece(piece, file)
    return tuple(replace(piece, history=(*piece.history, note)) for piece in found) if note else found


def check_piece(piece: Piece, file: str) -> None:
    """Raise SurfaceError for coordinates that are not finite and for a surface without triangles."""
    where = f"{file}#{piece.name}" if piece.name else file
    if not len(piece.triangles):
        raise SurfaceError(where, "no triangles", "a surface of triangles", hint="export the fault surface itself, then try again")
    if not np.isfinite(piece.vertices).all():
        row = int(np.flatnonzero(~np.isfinite(piece.vertices).all(axis=1))[0])
        values = ", ".join(f"{value:g}" for value in piece.vertices[row])
        raise SurfaceError(
            where, f"coordinates ({values}) at vertex {row}", "finite numbers", hint="remove or mend that vertex and export again"
        )


def mesh_files(folder: Path) -> list[Path]:
    """Return the files of a folder whose suffix a reader knows, sorted by name; InputError where there is none."""
    known = suffixes()
    found = sorted(
        (entry for entry in folder.iterdir() if entry.is_file() and not entry.name.startswith(".")), key=lambda entry: entry.name
    )
    meshes = [entry for entry in found if entry.suffix.lower() in known]
    if not meshes:
        others = "traces (.geojson, .gpkg, .shp), or a model.toml or faults.csv"
        hint = f"name a folder that holds surfaces in one of these formats, {others}:\n{table_text()}"
        what = f"{len(found)} files, none of them a mesh" if found else "no files"
        raise InputError(folder, what, "mesh files, model.toml or faults.csv", hint=hint)
    return meshes
