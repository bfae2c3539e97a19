"""A regime: three principal axes, how sure each is, and the class read from their plunges."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class ShapeRatio:
    """R = (sigma2 - sigma3)/(sigma1 - sigma3) with its interval."""

    value: float
    low: float
    high: float


@dataclass(frozen=True, eq=False)
class Regime:
    """Principal axes of one stress with their uncertainty."""

    axes: Floats  # (3, 3) unit rows sigma1, sigma2, sigma3 in easting, northing, up
    cones_deg: tuple[float, float, float]  # half-angle of the confidence cone of each axis
    kind: str  # normal | normal-oblique | strike-slip | reverse-oblique | reverse | undefined
    shmax_deg: float  # azimuth of the greatest horizontal compression, [0, 180)
    shmax_half_width_deg: float  # half-width of its confidence interval
    shape_ratio: ShapeRatio | None  # None where the data leave it open
    weight: float = 1.0  # share of the faults' evidence
    name: str = ""  # of its phase, where there are several
    faults: int = 0  # that belong to it


@dataclass(frozen=True, eq=False)
class Reading:
    """One way of reading the evidence: geometry only, pairs with senses, senses of all faults, or all together."""

    key: str  # "geometry" | "pairs" | "senses" | "joint"
    title: str
    regime: Regime | None
    count: int  # pairs or faults that carry it
    why_not: str = ""  # reason in words where there is no regime
