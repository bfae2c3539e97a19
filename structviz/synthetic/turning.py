"""Fault models whose stress turns about the vertical from west to east, with the axes at every place known."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.model import FaultModel
from structviz.orientation.vectors import rotation
from structviz.synthetic.models import CORNER, declaration, random_model

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class KnownTurning:
    """A model under a stress that turns with easting, and the truth about it; rows follow model.faults."""

    model: FaultModel
    middle_axes: Floats  # (3, 3) unit rows sigma1, sigma2, sigma3 in the middle of the box
    shape_ratio: float
    turn_deg: float  # clockwise, from the western edge of the box to the eastern one
    box_m: float
    places: Floats  # (F, 3) middle of each fault, m
    flipped: tuple[str, ...]  # faults that declare the opposite of what they did

    def axes_at(self, places: ArrayLike) -> Floats:
        """Return the true axes at places (P, 3), m, as unit rows, shape (P, 3, 3)."""
        return np.stack([self.middle_axes @ _turn(angle).T for angle in _turns_deg(np.asarray(places, float), self.turn_deg, self.box_m)])


def turning_model(
    turn_deg: float = 60.0,
    faults: int = 60,
    *,
    regime: str = "normal",
    planted: int = 0,
    scatter_deg: float = 6.0,
    triangles: int = 60,
    random_state: int,
) -> KnownTurning:
    """Return a random model whose stress turns clockwise by `turn_deg` across the box, two thirds of its faults conjugate.

    Each fault of a `random_model` is turned about the vertical through its own middle, as the stress there is. The box grows with
    the number of faults, so that they lie equally dense. Raises ArgumentError as `random_model` does.
    """
    box = 15_000.0 * float(np.sqrt(faults / 24.0))
    known = random_model(
        regime,
        faults=faults,
        conjugate=2 * faults // 3,
        planted=planted,
        scatter_deg=scatter_deg,
        triangles=triangles,
        box_m=box,
        random_state=random_state,
    )
    middles = np.stack([(fault.surface.vertices.min(0) + fault.surface.vertices.max(0)) / 2 for fault in known.model.faults])
    rows = []
    angles = _turns_deg(middles, turn_deg, box)
    for fault, middle, normal, rake, angle in zip(known.model.faults, middles, known.normals, known.true_rakes_deg, angles, strict=True):
        turn = _turn(float(angle))
        sector, side = declaration(turn @ normal, float(rake), wrong=fault.name in known.flipped)
        surface = replace(fault.surface, vertices=(fault.surface.vertices - middle) @ turn.T + middle)
        rows.append(replace(fault, surface=surface, declared=sector, down_side=side))
    model = FaultModel(f"{regime} model turning by {turn_deg:g} deg {random_state}", tuple(rows))
    return KnownTurning(model, known.axes, known.shape_ratio, turn_deg, box, middles, known.flipped)


def _turns_deg(places: Floats, turn_deg: float, box_m: float) -> Floats:
    return turn_deg * ((places[:, 0] - CORNER[0]) / box_m - 0.5)


def _turn(clockwise_deg: float) -> Floats:
    return rotation([0.0, 0.0, 1.0], -clockwise_deg)
