"""Mohr's diagram as data: shear over normal stress of the stations of every fault, in reduced stress."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.kinematics.slip import shear_and_normal
from structviz.stress.regime import Regime
from structviz.stress.tensor import reduced_tensor
from structviz.views.captions import DEPTH

Floats = NDArray[np.float64]

OPEN_RATIO = 0.5  # drawn where the data leave R open, and that said


@dataclass(frozen=True, eq=False)
class MohrFault:
    """The stations of one fault."""

    row: int  # of Analysis.faults
    name: str
    verdict: str
    points: Floats  # (K, 2) normal stress and shear, 0 at sigma3 and 1 at sigma1


@dataclass(frozen=True, eq=False)
class Mohr:
    """One stress: its circles stand on 0, R and 1."""

    name: str  # of its phase, where there are several; else its class
    ratio: float  # R
    ratio_known: bool
    faults: tuple[MohrFault, ...]  # what matters most is last

    @property
    def note(self) -> str:
        """R in words."""
        return f"R = {self.ratio:.2f}" if self.ratio_known else f"R is open: drawn for R = {OPEN_RATIO:.2f}"


def build_mohr(analysis: Analysis, *, stations: int | None = None) -> tuple[Mohr, ...]:
    """Return a diagram for each regime, heaviest first, each with the faults judged by it; at most so many stations of a fault."""
    return tuple(_mohr(analysis, phase, regime, stations) for phase, regime in enumerate(analysis.regimes))


def _mohr(analysis: Analysis, phase: int, regime: Regime, most: int | None) -> Mohr:
    ratio = regime.shape_ratio.value if regime.shape_ratio else OPEN_RATIO
    tensor = reduced_tensor(regime.axes, ratio)
    rows = [(row, result) for row, result in enumerate(analysis.faults) if result.phase == phase]
    rows.sort(key=lambda pair: DEPTH[pair[1].verdict.word])
    faults = tuple(_fault(row, result, tensor, most) for row, result in rows)
    return Mohr(regime.name or regime.kind, ratio, regime.shape_ratio is not None, faults)


def _fault(row: int, result: FaultResult, tensor: Floats, most: int | None) -> MohrFault:
    normals = result.stations.normals
    if most is not None:
        normals = normals[np.linspace(0, len(normals) - 1, min(most, len(normals))).round().astype(int)]
    shear, normal = shear_and_normal(tensor, normals)
    return MohrFault(row, result.fault.name, result.verdict.word, np.stack([normal, shear], -1))
