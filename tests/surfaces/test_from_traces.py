"""Surfaces from traces: planes are planes, areas are length by width, and what cannot hang is refused."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from structviz.errors import SurfaceError
from structviz.surfaces.from_traces import mean_dip_direction_deg, surface_from_trace
from structviz.surfaces.measure import measure


def straight(strike_deg, length=9000.0, points=4):
    along = np.array([np.sin(np.radians(strike_deg)), np.cos(np.radians(strike_deg))])
    return np.linspace(0, length, points)[:, None] * along + [5e5, 4e6]


@pytest.mark.parametrize("strike", [0.0, 37.0, 145.0, 300.0])
@pytest.mark.parametrize("dip", [15.0, 50.0, 89.0])
def test_a_straight_trace_is_a_plane_whichever_way_it_was_drawn(strike, dip):
    for trace in (straight(strike), straight(strike)[::-1]):
        found = measure(surface_from_trace(trace, dip, (strike + 90.0) % 360.0, 1000.0, 12_000.0))
        assert found.strike_deg == pytest.approx(strike, abs=1e-6)
        assert found.dip_deg == pytest.approx(dip, abs=1e-6)
        assert found.area_m2 == pytest.approx(9000.0 * 11_000.0 / np.sin(np.radians(dip)), rel=1e-9)
        assert not len(found.condition.flipped)


def test_triangles_are_wound_towards_the_hanging_wall():
    for trace in (straight(20.0), straight(20.0)[::-1]):
        surface = surface_from_trace(trace, 60.0, 110.0, 0.0, 9000.0)
        corners = surface.vertices[surface.triangles]
        across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        assert (across[:, 2] > 0).all()


def test_a_bent_trace_keeps_its_bends_and_finer_cells_change_no_area():
    trace = np.array([[0.0, 0.0], [3000.0, 4000.0], [2500.0, 9000.0]])
    coarse, fine = (surface_from_trace(trace, 45.0, 90.0, 0.0, 8000.0, spacing_m=s) for s in (4000.0, 300.0))
    for point in trace:
        assert np.linalg.norm(fine.vertices[:, :2] - point, axis=1).min() == 0.0
    assert measure(coarse).area_m2 == pytest.approx(measure(fine).area_m2, rel=1e-12)
    # The plain way: two parallelograms, spanned by a leg of the trace and the way down dip.
    down = np.array([8000.0, 0.0, -8000.0])
    plain = sum(np.linalg.norm(np.cross([*(b - a), 0.0], down)) for a, b in itertools.pairwise(trace))
    assert measure(fine).area_m2 == pytest.approx(plain, rel=1e-12)


def test_the_mean_direction_is_across_the_chord_on_the_side_named():
    assert mean_dip_direction_deg(straight(30.0), 90.0) == pytest.approx(120.0)
    assert mean_dip_direction_deg(straight(30.0)[::-1], 90.0) == pytest.approx(120.0)
    assert mean_dip_direction_deg(straight(30.0), 315.0) == pytest.approx(300.0)


@pytest.mark.parametrize(
    ("trace", "dip", "side", "depths", "told"),
    [
        ([[0, 0], [0, 0]], 60, 90, (0, 9), "a trace of one point"),
        ([[0, 0], [0, np.nan]], 60, 90, (0, 9), "finite points"),
        ([[0, 0], [0, 5]], 0, 90, (0, 9), "a dip of 1 to 90 deg"),
        ([[0, 0], [0, 5]], 91, 90, (0, 9), "a dip of 1 to 90 deg"),
        ([[0, 0], [0, 5]], 60, 90, (9, 9), "a lower depth below the upper one"),
        ([[0, 0], [0, 5]], 60, 5, (0, 9), "along the trace; wanted one across it"),
    ],
)
def test_what_cannot_hang_is_refused_with_the_reason(trace, dip, side, depths, told):
    with pytest.raises(SurfaceError, match=told):
        surface_from_trace(trace, dip, side, *depths, name="F")
