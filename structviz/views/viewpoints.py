"""Named places to look at a model from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from structviz.analysis import FaultResult
from structviz.views.scene import ELEVATION_DEG, best_azimuth_deg

SET_DEG = 15.0  # half-width of a set of strikes


@dataclass(frozen=True)
class Viewpoint:
    """Where the eye stands."""

    key: str
    title: str  # as in "the model ..."
    azimuth_deg: float  # from the model to the eye, clockwise from north
    elevation_deg: float  # of the eye over the horizon


VIEWPOINTS = ("best", "map", "strike", "north", "east", "south", "west")
SIDES = {"north": 0.0, "east": 90.0, "south": 180.0, "west": 270.0}
SIDE_ELEVATION_DEG, STRIKE_ELEVATION_DEG = 30.0, 14.0


def viewpoint(key: str, results: Sequence[FaultResult]) -> Viewpoint:
    """Return a viewpoint by its key, one of VIEWPOINTS, for the faults of a model."""
    if key in SIDES:
        return Viewpoint(key, f"seen from the {key}", SIDES[key], SIDE_ELEVATION_DEG)
    if key == "map":
        return Viewpoint(key, "seen from above, north up", 180.0, 90.0)
    if key == "strike":
        strike = main_strike_deg(results)
        azimuth = (strike + 180.0) if strike < 90.0 else strike  # from the southern side, so that north is at the back
        return Viewpoint(key, f"seen along the strike of its main set, {round(strike) % 180:03d}\u00b0", azimuth, STRIKE_ELEVATION_DEG)
    if key == "best":
        return Viewpoint(key, "seen from where its faults show most of their area", best_azimuth_deg(results), ELEVATION_DEG)
    raise KeyError(key)


def main_strike_deg(results: Sequence[FaultResult]) -> float:
    """Return the strike of the set with most area, [0, 180): the mean of strikes within 15 degrees of the fullest direction.

    Faults without a meaningful mean plane have no strike; where none has one it is 0.
    """
    shown = [result.measured for result in results if result.measured.meaningful]
    if not shown:
        return 0.0
    strikes, areas = np.array([m.strike_deg % 180.0 for m in shown]), np.array([m.area_m2 for m in shown])
    centres = np.arange(0.0, 180.0, 1.0)
    near = np.abs((strikes - centres[:, None] + 90.0) % 180.0 - 90.0)
    fullest = int(np.argmax(np.round(((near <= SET_DEG) * (1 - near / (2 * SET_DEG)) * areas).sum(1), 3)))
    inside = near[fullest] <= SET_DEG
    doubled = np.radians(2 * strikes[inside])
    return float(np.rad2deg(np.arctan2(areas[inside] @ np.sin(doubled), areas[inside] @ np.cos(doubled))) / 2 % 180.0)
