"""Where poles crowd on the equal-area net, as outlines to be shaded."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.density import axis_density
from structviz.views.contours import outlines

Floats = NDArray[np.float64]

FEWEST = 8  # axes; fewer crowd nowhere
STEP, MOST_LEVELS = 2.0, 5  # standard deviations, as is usual on such nets
CELLS, BEYOND = 60, 1.12  # of the grid across the net, and how far it reaches, in radii: outlines are cut at the rim


@dataclass(frozen=True, eq=False)
class NetDensity:
    """Outlines of where axes lie denser than chance would make them; to be filled by the even-odd rule and cut at the rim of the net."""

    levels: tuple[float, ...]  # standard deviations above chance, ascending
    outlines: tuple[tuple[Floats, ...], ...]  # of each level, (K, 2) on the net, closed


def net_density(axes: Floats) -> NetDensity | None:
    """Return the density of axes (N, 3) on the net of the lower hemisphere; None for fewer than eight, or where none crowd."""
    if len(axes) < FEWEST:
        return None
    side = np.linspace(-BEYOND, BEYOND, CELLS + 1)
    east, north = np.meshgrid(side, side)
    values = axis_density(axes, directions_on_net(east, north)).reshape(east.shape)
    inside = values[np.hypot(east, north) <= 1.0]
    top = float(inside.max())
    step = STEP * max(1, int(np.ceil(top / (STEP * (MOST_LEVELS + 1)))))
    levels = tuple(float(level) for level in np.arange(step, top, step))
    if not levels:
        return None
    scale = 2 * BEYOND / CELLS
    placed = [[line * scale - BEYOND for line in outlines(values, level)] for level in levels]
    return NetDensity(levels, tuple(tuple(line for line in lines if np.hypot(*line.T).min() < 1.0) for lines in placed))


def directions_on_net(east: Floats, north: Floats) -> Floats:
    """Return the directions (..., 3) shown at places of the equal-area net; beyond its rim they point up.

    The inverse of `orientation.projection.equal_area`: with r^2 = east^2 + north^2 the direction is (east, north) sqrt(2 - r^2)
    level and r^2 - 1 up.
    """
    squares = east**2 + north**2
    level = np.sqrt(np.maximum(2.0 - squares, 0.0))
    return np.stack([east * level, north * level, squares - 1.0], -1)
