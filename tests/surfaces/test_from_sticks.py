"""Lofts between sticks: laws (order and direction of the sticks change nothing), a planted bent fault, and what is told."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial import cKDTree

from structviz.errors import SurfaceError
from structviz.surfaces.from_sticks import resampled, surface_from_sticks
from structviz.surfaces.measure import measure

RADIUS_M, LENGTH_M, DEPTH_M = 4000.0, 12_000.0, 6000.0


def bent(along, down):
    """A fault that turns by 172 degrees about an upright axis and flattens downwards: (N, 3) at way along and way down, m."""
    angle, reach = along / RADIUS_M, 0.5 * down + 3e-5 * down**2
    return np.stack([(RADIUS_M + reach) * np.cos(angle), (RADIUS_M + reach) * np.sin(angle), -down], -1)


def down_dip(count=13, points=9):
    return [bent(np.full(points, x), np.linspace(0, DEPTH_M, points)) for x in np.linspace(0, LENGTH_M, count)]


def at_depths(count=7, points=25):
    return [bent(np.linspace(0, LENGTH_M, points), np.full(points, z)) for z in np.linspace(0, DEPTH_M, count)]


@pytest.mark.parametrize("sticks", [down_dip(), at_depths()], ids=["down dip", "at depths"])
@pytest.mark.parametrize("seed", range(4))
def test_order_and_direction_of_the_sticks_change_nothing(sticks, seed):
    draw = np.random.default_rng(seed)
    plain = surface_from_sticks(sticks)
    shuffled = [sticks[k][::-1] if draw.random() < 0.5 else sticks[k] for k in draw.permutation(len(sticks))]
    other = surface_from_sticks(shuffled)
    assert other.surface.vertices.tobytes() == plain.surface.vertices.tobytes()
    assert other.surface.triangles.tobytes() == plain.surface.triangles.tobytes()


@pytest.mark.parametrize("sticks", [down_dip(), at_depths()], ids=["down dip", "at depths"])
def test_a_bent_fault_cut_into_sticks_comes_back(sticks):
    """Straight rows between sticks leave the bend by its height over a chord, s^2 / 8 r: 31 m for 1000 m on the 4 km bend."""
    loft = surface_from_sticks(sticks)
    true = bent(*(grid.ravel() for grid in np.meshgrid(np.linspace(0, LENGTH_M, 1201), np.linspace(0, DEPTH_M, 601))))
    made = loft.surface.vertices[loft.surface.triangles].mean(1)
    assert cKDTree(true).query(made)[0].max() < 75.0  # the bend is 4 to 8 km in radius; true points lie 10 m apart
    assert cKDTree(made).query(true)[0].max() < 0.75 * np.sqrt(measure(loft.surface).areas_m2.max() * 4)  # nothing is left uncovered
    assert not loft.crossing
    assert not loft.out_of_order
    assert loft.side_by_side
    found = measure(loft.surface).condition
    assert not len(found.zero_area)
    assert not len(found.flipped)
    assert found.rims == 1


def test_more_sticks_lie_closer_to_the_fault():
    true = cKDTree(bent(*(grid.ravel() for grid in np.meshgrid(np.linspace(0, LENGTH_M, 1201), np.linspace(0, DEPTH_M, 601)))))
    off = []
    for count in (4, 7, 13, 25):
        surface = surface_from_sticks(down_dip(count)).surface
        off.append(true.query(surface.vertices[surface.triangles].mean(1))[0].max())
    assert off == sorted(off, reverse=True)
    assert off[-1] < off[0] / 10


def test_what_lies_oddly_is_told():
    sticks = down_dip()
    sticks[4] = sticks[4][::-1]
    sticks[2], sticks[9] = sticks[9], sticks[2]
    loft = surface_from_sticks([*sticks, sticks[5], sticks[6][:1]])
    assert loft.reversed == (4,)
    assert loft.out_of_order == (2, 9)
    assert loft.repeated == (13,)
    assert loft.too_short == (14,)
    assert loft.gaps == ()
    del sticks[5:8]
    assert {frozenset(pair) for pair in surface_from_sticks(sticks).gaps} == {frozenset((4, 5))}


def test_sticks_that_cross_are_told():
    sticks = [np.array([[x, 0, 0], [x, 500, -1000], [x, 1000, -2000.0]]) for x in np.arange(0, 5000, 500.0)]
    assert not surface_from_sticks(sticks).crossing
    sticks[5] = sticks[5] + [[-400, 0, 0], [0, 0, 0], [900, 0, 0]]
    assert (5, 6) in surface_from_sticks(sticks).crossing


def test_resampling_keeps_ends_and_equal_steps_along_a_straight_line():
    line = np.array([[0.0, 0, 0], [1, 0, 0], [10, 0, 0]])
    assert resampled(line, 6)[:, 0] == pytest.approx([0, 2, 4, 6, 8, 10])


@pytest.mark.parametrize(
    ("sticks", "told"),
    [
        ([], "0 sticks that can be used"),
        ([[[0, 0, 0], [0, 0, -1]]], "1 stick that can be used"),
        ([[[0, 0, 0], [0, 0, -1]], [[0, 0, -1], [0, 0, 0]]], "1 stick that can be used"),
        ([[[0, 0], [0, 1]], [[1, 0], [1, 1]]], r"a stick of shape \(2, 2\)"),
        ([[[0, 0, np.nan], [0, 1, 0]], [[1, 0, 0], [1, 1, 0]]], "not finite"),
        ([[[0, 0, 1e300], [0, 1, 0]], [[1, 0, 0], [1, 1, 0]]], r"a coordinate of 1e\+300; wanted places within 1e\+09 m"),
        ([["a"], [[1, 0, 0], [1, 1, 0]]], "no table of numbers"),
    ],
)
def test_sticks_that_make_no_surface_are_refused(sticks, told):
    with pytest.raises(SurfaceError, match=told):
        surface_from_sticks(sticks)
