"""Outlines of density on the net: they close, lie on their level, and hold what is above it."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.path import Path
from scipy.ndimage import map_coordinates

from structviz.orientation.density import axis_density
from structviz.orientation.projection import equal_area
from structviz.views.contours import outlines
from structviz.views.net_density import directions_on_net, net_density


def hills(seed: int, side: int = 25) -> np.ndarray:
    x, y = np.meshgrid(np.arange(side), np.arange(side))
    rng = np.random.default_rng(seed)
    return sum(rng.uniform(-1, 1.5) * np.exp(-((x - a) ** 2 + (y - b) ** 2) / rng.uniform(4, 30)) for a, b in rng.uniform(0, side, (9, 2)))


@pytest.mark.parametrize("seed", range(6))
def test_outlines_hold_what_is_above_and_nothing_else(seed: int) -> None:
    values = hills(seed)
    rings = outlines(values, 0.3)
    places = np.argwhere(np.ones_like(values))[:, ::-1].astype(float)
    inside = np.zeros(len(places), bool)
    for ring in rings:
        assert (ring[0] == ring[-1]).all()
        inside ^= Path(ring).contains_points(places, radius=1e-9) & (np.abs(ring[None] - places[:, None]).sum(2).min(1) > 1e-9)
    clear = np.abs(values.ravel() - 0.3) > 0.02
    edge = (places.min(1) == 0) | (places.max(1) == len(values) - 1)
    assert (inside == (values.ravel() > 0.3))[clear & ~edge].all()


def test_outlines_lie_on_their_level() -> None:
    values = hills(3)
    for ring in outlines(values, 0.3):
        within = ring[((ring > 0) & (ring < len(values) - 1)).all(1)]
        np.testing.assert_allclose(map_coordinates(values, within[:, ::-1].T, order=1), 0.3, atol=1e-6)


def test_nothing_above_has_no_outline() -> None:
    assert outlines(np.zeros((5, 5)), 1.0) == ()
    assert len(outlines(np.full((5, 5), 2.0), 1.0)) == 1


def test_places_of_the_net_and_directions_belong_to_each_other() -> None:
    east, north = np.random.default_rng(1).uniform(-0.7, 0.7, (2, 40))
    np.testing.assert_allclose(equal_area(directions_on_net(east, north)), np.stack([east, north], 1), atol=1e-12)


def test_a_cluster_is_where_the_outline_is() -> None:
    rng = np.random.default_rng(2)
    axes = np.array([0.5, 0.5, -0.7]) + 0.08 * rng.normal(size=(30, 3))
    found = net_density(axes / np.linalg.norm(axes, axis=1, keepdims=True))
    assert found is not None
    assert list(found.levels) == sorted(found.levels)
    assert len(found.levels) <= 5
    (ring,) = found.outlines[-1]
    assert np.linalg.norm(ring.mean(0) - equal_area([0.5, 0.5, -0.7])) < 0.05
    for level, rings in zip(found.levels, found.outlines, strict=True):
        at = np.concatenate(rings)
        at = at[np.hypot(*at.T) < 1.0]
        values = axis_density(axes, directions_on_net(*at.T))
        np.testing.assert_allclose(values, level, atol=0.06 * found.levels[-1])


def test_few_axes_crowd_nowhere() -> None:
    assert net_density(np.eye(3)) is None
