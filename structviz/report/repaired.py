"""A repaired model as files: its surfaces in a new folder, with a log of every change. What was there is left alone."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from structviz.io.format import Format
from structviz.model import FaultModel
from structviz.report.converted import Converted, convert_to_folder
from structviz.surfaces.repair import Change, RepairChoices, repaired
from structviz.surfaces.surface import Surface

Progress = Callable[[str, int, int], None]
LOG = "repair_log.csv"
MOST_ROWS = 1000  # numbers of triangles or vertices written out for one change


@dataclass(frozen=True, eq=False)
class Repaired:
    """A model mended, and what was changed by the name of the surface."""

    model: FaultModel
    changes: tuple[tuple[str, Change], ...]


def repair_model(model: FaultModel, choices: RepairChoices, progress: Progress | None = None) -> Repaired:
    """Return a model with every fault and horizon mended."""
    tell = progress or (lambda text, done, total: None)
    total, changes = len(model.faults) + len(model.horizons), []
    bodies: list[Surface] = []
    named = [(fault.name, fault.surface) for fault in model.faults] + [(horizon.name, horizon.surface) for horizon in model.horizons]
    for number, (name, surface) in enumerate(named):
        tell("repairing surfaces", number, total)
        body, found = repaired(surface, choices)
        bodies.append(body)
        changes += [(name, change) for change in found]
    faults = tuple(replace(fault, surface=body) for fault, body in zip(model.faults, bodies))
    horizons = tuple(replace(horizon, surface=body) for horizon, body in zip(model.horizons, bodies[len(faults) :]))
    return Repaired(replace(model, faults=faults, horizons=horizons), tuple(changes))


def write_repaired(done: Repaired, folder: str, entry: Format, progress: Progress | None = None) -> Converted:
    """Write a repaired model and its log into a new folder, whole or not at all."""
    return convert_to_folder(done.model, folder, entry, progress, more={LOG: log_text(done.changes)})


def log_text(changes: Sequence[tuple[str, Change]]) -> str:
    """Return the changes as CSV text, one a row; rows are numbers of triangles or vertices of the surface as it was, from 0."""
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow(("surface", "change", "count", "of", "what", "easting_m", "northing_m", "up_m", "rows"))
    for name, change in changes:
        places = ["" if np.isnan(value) else f"{value:.3f}" for value in change.place]
        shown = " ".join(map(str, change.rows[:MOST_ROWS].tolist())) + (" ..." if len(change.rows) > MOST_ROWS else "")
        safe = f"'{name}" if name.startswith(("=", "+", "-", "@", "\t", "\r", "\n")) else name
        writer.writerow((safe, change.key, len(change.rows), change.of, change.text, *places, shown))
    return written.getvalue()
