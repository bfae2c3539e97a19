"""Writing surfaces in the format of the file's suffix."""

from __future__ import annotations

import os
import secrets
from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError, OutputError
from structviz.io.format import CELL_ARRAYS, Format
from structviz.io.registry import FORMATS, suffixes
from structviz.surfaces.surface import Surface


def write_surface(path: str | Path, surface: Surface, cell_data: Mapping[str, NDArray] | None = None) -> None:
    """Write a surface, in metres with up positive, with one value (or row of values) a triangle for each name in `cell_data`.

    The suffix chooses the format. Words are stored as whole numbers with a legend. The same input gives the same bytes.
    Raises ArgumentError for arrays of the wrong length or a format that cannot hold them, OutputError where the file cannot be written.
    """
    path, cell_data = Path(path), cell_data or {}
    known = _format_of(path)
    if cell_data and CELL_ARRAYS in known.cannot_store:
        raise ArgumentError(
            f"{path.name}: {known.title} cannot hold values on triangles", hint="write .vtp, .vtu or .ply, or leave the values out"
        )
    for name, values in cell_data.items():
        if np.shape(values)[:1] != (len(surface.triangles),) or np.ndim(values) > 2:
            found = f"{name}: found shape {np.shape(values)}"
            raise ArgumentError(f"{found}; wanted {len(surface.triangles)} values, one a triangle", hint="give one value for each triangle")
    assert known.write is not None
    _put(path, known.write(surface, cell_data))


def write_surfaces(path: str | Path, surfaces: Sequence[Surface]) -> None:
    """Write several named surfaces, in metres with up positive, into one file; the suffix chooses the format.

    Raises ArgumentError where there are several and the format holds only one, OutputError where the file cannot be written.
    """
    path = Path(path)
    known = _format_of(path)
    if len(surfaces) == 1:
        write_surface(path, surfaces[0])
        return
    if known.write_all is None:
        several = " ".join(sorted(suffix for entry in FORMATS if entry.write_all for suffix in entry.suffixes))
        found = f"{path.name}: {known.title} holds one surface, and there are {len(surfaces)}"
        raise ArgumentError(found, hint=f"name a folder for one file each, or a file that ends in one of {several}")
    _put(path, known.write_all([(surface, {}) for surface in surfaces]))


def write_new_files(folder: Path, files: Mapping[str, bytes]) -> None:
    """Write files that belong together, all of them or none; the first is put in place last.

    Raises OutputError where one exists already or cannot be written.
    """
    for name in files:
        if os.path.lexists(folder / name):
            raise OutputError(f"{folder / name}: exists already; wanted a new file", hint="name another, or remove that one")
    put: list[Path] = []
    try:
        for name in reversed(list(files)):
            _put(folder / name, files[name])
            put.append(folder / name)
    except BaseException:
        for path in put:
            path.unlink(missing_ok=True)
        raise


def _format_of(path: Path) -> Format:
    """Return the format that writes a suffix; ArgumentError where there is none."""
    for entry in FORMATS:
        if entry.write and path.suffix.lower() in entry.suffixes:
            return entry
    found = f"{path.name}: found suffix {path.suffix!r}"
    raise ArgumentError(f"{found}; wanted one of {' '.join(suffixes(writable=True))}", hint="choose one of them")


def _put(path: Path, content: bytes) -> None:
    """Write a file whole or not at all: it takes its name only when it is complete."""
    new = path.with_name(f".{path.name[:30]}.{secrets.token_hex(4)}.partial")
    try:
        new.write_bytes(content)
        new.replace(path)
    except OSError as error:
        new.unlink(missing_ok=True)
        raise OutputError(
            f"{path}: cannot be written ({error.strerror})", hint="check that the folder exists and may be written to"
        ) from None
    except BaseException:
        new.unlink(missing_ok=True)
        raise
