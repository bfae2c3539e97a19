"""Surfaces against each other: one fault given twice, and one that lies where no other does."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check
from structviz.surfaces.twins import twin_shares

TOLERANCE = 0.02  # of the square root of the area: how far apart two sheets may lie and be one
FEET = 0.3048
SPREADS = 3.0  # of the others: a correction that brings a stray fault this near explains it


def _beside(offset_m: float) -> Examined:
    """Return a model whose second fault is its first, drawn again some way off."""
    return samples.examined(samples.measured(samples.plane()), samples.measured(samples.plane(centre=(offset_m, 0.0, -3000.0))))


@check(
    "fault-twice",
    title="one fault under two names",
    why="it is heard twice, pairs with others twice, and its two labels vouch for each other",
    unit="of the area",
    limit=0.8,
    source="",
    hint="keep one of the two; where they are two strands, draw them apart",
    passes=lambda: _beside(2000.0),
    fails=lambda: _beside(10.0),
    low=0.3,
    high=1.0,
)
def fault_twice(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each pair of faults that cover each other over more than the limit."""
    names = [fault.name for fault, _ in examined.faults()]
    for i, j, share in twin_shares(examined.measured, examined.boxes, TOLERANCE):
        if share >= limit:
            text = f"lies on {names[j]} over {100 * share:.0f} % of its area: one fault under two names?"
            yield Found(names[i], "warning", text, (("share_of_area", round(share, 3)), ("other", names[j])))


def _scattered(shift_m: float) -> Examined:
    """Return a model of seven faults near each other and one far away to the east."""
    near = [samples.plane(centre=(500_000.0 + 3000.0 * k, 4_000_000.0 + 1000.0 * (k % 3), -3000.0)) for k in range(7)]
    far = samples.plane(centre=(500_000.0 + shift_m, 4_000_000.0, -3000.0))
    return samples.examined(*(samples.measured(surface) for surface in (*near, far)))


@check(
    "stray-fault",
    title="faults far from all the others",
    why="a surface in another unit or system, or with exchanged axes, pairs with nothing and is tested by a stress from elsewhere",
    unit="spreads",
    limit=30.0,
    source="",
    hint="check the file it came from: its unit, its reference system, the order of its columns; or leave it out",
    passes=lambda: _scattered(30_000.0),
    fails=lambda: _scattered(900_000.0),
    low=3.0,
    high=1e6,
)
def stray_fault(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault farther from the middle of the others than the limit, in units of their spread."""
    middles = examined.boxes.mean(1)
    if len(middles) < 5:
        return
    centre = np.median(middles, 0)
    away = np.sqrt(((middles - centre) ** 2).sum(1))
    spread = max(float(np.median(away)), 1.0)
    for (fault, _), middle, distance in zip(examined.faults(), middles, away):
        if distance > limit * spread:
            guess = _explained(middle, centre, spread)
            text = f"lies {distance / 1000:,.0f} km from the middle of the others, {distance / spread:,.0f} times their spread{guess}"
            yield Found(
                fault.name, "warning", text, (("distance_m", round(float(distance))), ("spreads", round(float(distance / spread), 1)))
            )


def _explained(middle: np.ndarray, centre: np.ndarray, spread: float) -> str:
    """Return which one correction would bring a stray fault among the others, in words, "" where none does."""
    corrections = (
        ("with easting and northing exchanged", middle[[1, 0, 2]]),
        ("with depth taken for elevation", middle * [1, 1, -1]),
        ("if its coordinates are feet", middle * FEET),
        ("if those of the others are feet", middle / FEET),
        ("if its coordinates are kilometres", middle * 1000.0),
    )
    for words, corrected in corrections:
        if np.sqrt(((corrected - centre) ** 2).sum()) < SPREADS * spread:
            return f"; {words} it would lie among them"
    return ""
