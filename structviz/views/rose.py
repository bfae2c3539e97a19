"""The rose of strikes as data: undirected, petals whose areas are shares of the faults' area, by verdict."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from structviz.analysis import Analysis, FaultResult
from structviz.views.captions import DEPTH

PETAL_DEG = 10.0


@dataclass(frozen=True)
class RosePart:
    """One fault's part of a petal, between two radii; the same stands opposite."""

    row: int  # of Analysis.faults
    name: str
    verdict: str
    start_deg: float  # azimuth at which the petal starts, clockwise from north, 0 to 170
    inner: float  # radii in units of the longest petal
    outer: float


@dataclass(frozen=True)
class Rose:
    """The whole rose; empty where no fault has a meaningful mean plane."""

    parts: tuple[RosePart, ...]  # by petal, from the middle outwards
    longest_share: float  # of the faults' area in the longest petal
    faults: int


def build_rose(analysis: Analysis) -> Rose:
    """Return the rose of the faults that have a meaningful mean plane."""
    petals: list[list[tuple[int, FaultResult]]] = [[] for _ in range(int(180 / PETAL_DEG))]
    for row, result in enumerate(analysis.faults):
        if result.measured.meaningful:
            petals[int(result.measured.strike_deg % 180.0 // PETAL_DEG)].append((row, result))
    areas = [sum(result.measured.area_m2 for _, result in petal) for petal in petals]
    if not any(areas):
        return Rose((), 0.0, 0)
    parts = tuple(part for k, petal in enumerate(petals) for part in _petal(petal, k * PETAL_DEG, max(areas)))
    return Rose(parts, max(areas) / sum(areas), len(parts))


def _petal(petal: list[tuple[int, FaultResult]], start_deg: float, longest_m2: float) -> list[RosePart]:
    inside, parts = 0.0, []
    for row, result in sorted(petal, key=lambda pair: DEPTH[pair[1].verdict.word]):
        outside = inside + result.measured.area_m2
        radii = np.sqrt(inside / longest_m2), np.sqrt(outside / longest_m2)
        parts.append(RosePart(row, result.fault.name, result.verdict.word, start_deg, *map(float, radii)))
        inside = outside
    return parts
