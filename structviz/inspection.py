"""What files hold, before anything is declared: every surface with its size, orientation and condition. No stress is inferred."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz import checks
from structviz.checks.registry import Examined
from structviz.examination import for_each
from structviz.model import FaultModel, Finding
from structviz.surfaces.measure import measure
from structviz.surfaces.surface import MeasuredSurface

Floats = NDArray[np.float64]
Progress = Callable[[str, int, int], None]


@dataclass(frozen=True, eq=False)
class Inspected:
    """One surface of the input, in metres with up positive."""

    name: str
    kind: str  # "fault" | "horizon"
    source: str  # the file, with #part where it holds several
    measured: MeasuredSurface
    low: Floats  # (3,) lowest easting, northing, up, m
    high: Floats  # (3,)
    along_m: float  # extent along the strike of the mean plane; of a horizon, and where there is no mean plane, west to east
    down_dip_m: float  # extent along its dip; else south to north
    declared: Mapping[str, str]  # by our columns of a table of faults, "" where nothing is declared


@dataclass(frozen=True, eq=False)
class Inspection:
    """Every surface of the input in its order, and what a reader should know of them."""

    model: FaultModel
    surfaces: tuple[Inspected, ...]
    findings: tuple[Finding, ...]

    @property
    def low(self) -> Floats:
        """The lowest easting, northing, up of all surfaces, (3,) m."""
        return np.min([each.low for each in self.surfaces], axis=0)

    @property
    def high(self) -> Floats:
        """The highest easting, northing, up of all surfaces, (3,) m."""
        return np.max([each.high for each in self.surfaces], axis=0)


def inspect(model: FaultModel, progress: Progress | None = None) -> Inspection:
    """Return every fault and horizon of a model measured, with the findings of reading and of the checks of surfaces."""
    tell = progress or (lambda text, done, total: None)
    bodies = [fault.surface for fault in model.faults] + [horizon.surface for horizon in model.horizons]
    measured = for_each(measure, bodies, "measuring surfaces", tell)
    tell("checking", 0, 1)
    found = checks.run(Examined(model, tuple(measured[: len(model.faults)])))
    rows: list[tuple[str, str, Mapping[str, str]]] = [
        (fault.name, "fault", _declared(fault.declared.text if fault.declared else "", fault.down_side, fault.phase))
        for fault in model.faults
    ]
    rows += [(horizon.name, "horizon", _declared("", "", "")) for horizon in model.horizons]
    return Inspection(model, tuple(_inspected(*row, each) for row, each in zip(rows, measured, strict=True)), model.findings + found)


def _declared(text: str, down_side: str, phase: str) -> dict[str, str]:
    rake = text.removeprefix("rake ")
    return {"sense": "" if rake != text else text, "rake_deg": rake if rake != text else "", "phase": phase, "down_side": down_side}


def _inspected(name: str, kind: str, declared: Mapping[str, str], measured: MeasuredSurface) -> Inspected:
    vertices = measured.surface.vertices[np.unique(measured.surface.triangles)]
    strike = np.radians(measured.strike_deg)
    along = np.array([np.sin(strike), np.cos(strike), 0.0])
    down = np.cross(along, measured.normal)  # down the dip or up it: only its extent is asked
    if kind == "horizon" or not measured.meaningful:
        along, down = np.array([1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0])
    from_middle = vertices - vertices.mean(0)
    length, width = (float(np.ptp(from_middle @ direction)) for direction in (along, down))
    return Inspected(name, kind, measured.surface.source, measured, vertices.min(0), vertices.max(0), length, width, declared)
