"""Writing one surface in the format of the file's suffix."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError, OutputError
from structviz.io.format import CELL_ARRAYS
from structviz.io.registry import FORMATS, suffixes
from structviz.surfaces.surface import Surface


def write_surface(path: str | Path, surface: Surface, cell_data: Mapping[str, NDArray] | None = None) -> None:
    """Write a surface, in metres with up positive, with one value (or row of values) a triangle for each name in `cell_data`.

    The suffix chooses the format. Words are stored as whole numbers with a legend. The same input gives the same bytes.
    Raises ArgumentError for arrays of the wrong length or a format that cannot hold them, OutputError where the file cannot be written.
    """
    path, cell_data = Path(path), cell_data or {}
    known = next((entry for entry in FORMATS if entry.write and path.suffix.lower() in entry.suffixes), None)
    if known is None or known.write is None:
        raise ArgumentError(
            f"{path.name}: found suffix {path.suffix!r}; wanted one of {' '.join(suffixes(writable=True))}", hint="choose one of them"
        )
    if cell_data and CELL_ARRAYS in known.cannot_store:
        raise ArgumentError(
            f"{path.name}: {known.title} cannot hold values on triangles", hint="write .vtp, .vtu or .ply, or leave the values out"
        )
    for name, values in cell_data.items():
        if np.shape(values)[:1] != (len(surface.triangles),) or np.ndim(values) > 2:
            found = f"{name}: found shape {np.shape(values)}"
            raise ArgumentError(f"{found}; wanted {len(surface.triangles)} values, one a triangle", hint="give one value for each triangle")
    try:
        path.write_bytes(known.write(surface, cell_data))
    except OSError as error:
        raise OutputError(
            f"{path}: cannot be written ({error.strerror})", hint="check that the folder exists and may be written to"
        ) from None
