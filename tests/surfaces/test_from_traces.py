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


def test_the_surface_moves_with_its_trace_and_rises_with_its_heights():
    trace = np.array([[0.0, 0.0], [3000.0, 4000.0], [2500.0, 9000.0]])
    here = surface_from_trace(trace, 45.0, 90.0, 500.0, 8000.0)
    there = surface_from_trace(trace + [4096.0, -2048.0], 45.0, 90.0, 500.0, 8000.0)
    lifted = surface_from_trace(np.column_stack([trace, np.full(3, 256.0)]), 45.0, 90.0, 500.0, 8000.0)
    assert np.allclose(there.vertices, here.vertices + [4096.0, -2048.0, 0.0], rtol=0, atol=1e-9)
    assert np.allclose(lifted.vertices, here.vertices + [0.0, 0.0, 256.0], rtol=0, atol=1e-9)
    assert (there.triangles == here.triangles).all()


@pytest.mark.parametrize("dip", [20.0, 70.0, 90.0])
def test_every_vertex_is_where_a_plain_loop_puts_it(dip):
    trace = [(0.0, 0.0, 100.0), (2000.0, 1000.0, 300.0), (2500.0, 6000.0, -50.0)]
    rows, down = 5, 6000.0
    found = surface_from_trace(trace, dip, 100.0, 0.0, down, spacing_m=down / np.sin(np.radians(dip)) / (rows - 1) * 1.0001)
    columns = len(found.vertices) // rows
    heads = [tuple(vertex) for vertex in found.vertices[:columns]]
    plain = []
    for row in range(rows):
        depth = down * row / (rows - 1)
        across = depth / np.tan(np.radians(dip)) if dip < 90 else 0.0
        for east, north, up in heads:
            plain.append((east + across * np.sin(np.radians(100.0)), north + across * np.cos(np.radians(100.0)), up - depth))
    assert np.abs(found.vertices - plain).max() < 1e-9
    for point in trace:  # every point of the trace is one of the heads
        assert min(np.linalg.norm(np.subtract(head, point)) for head in heads) == 0.0


@pytest.mark.parametrize("sides", [(90.0, 270.0), (60.0, 240.0)])
def test_a_vertical_surface_is_wound_towards_the_side_named(sides):
    for side in sides:
        surface = surface_from_trace(straight(0.0), 90.0, side, 0.0, 5000.0)
        corners = surface.vertices[surface.triangles]
        across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        assert (np.sign(across[:, 0]) == np.sign(np.sin(np.radians(side)))).all()


@pytest.mark.parametrize(("spacing", "told"), [(0.0, "more than 0 m"), (-5.0, "more than 0 m"), (np.nan, "more than 0 m"), (1e-3, "cells")])
def test_a_spacing_that_makes_no_cells_or_too_many_is_refused(spacing, told):
    with pytest.raises(SurfaceError, match=told):
        surface_from_trace(straight(0.0), 60.0, 90.0, 0.0, 5000.0, spacing_m=spacing)


def test_a_closed_trace_with_a_repeated_start_goes_by_its_first_leg():
    ring = [[0, 0], [0, 0], [0, 5000], [4000, 5000], [0, 0]]
    assert mean_dip_direction_deg(ring, 80.0) == pytest.approx(90.0)


def test_the_mean_direction_is_across_the_chord_on_the_side_named():
    assert mean_dip_direction_deg(straight(30.0), 90.0) == pytest.approx(120.0)
    assert mean_dip_direction_deg(straight(30.0)[::-1], 90.0) == pytest.approx(120.0)
    assert mean_dip_direction_deg(straight(30.0), 315.0) == pytest.approx(300.0)


@pytest.mark.parametrize(
    ("trace", "dip", "side", "depths", "told"),
    [
        ([[0, 0], [0, 0]], 60, 90, (0, 9), "a trace of one point"),
        ([[0, 0], [0, np.nan]], 60, 90, (0, 9), "finite points"),
        ([["a", 0], [0, 5]], 60, 90, (0, 9), "no table of numbers"),
        ([[0, 0], [0, 5, 6]], 60, 90, (0, 9), "no table of numbers"),
        ([[0, 0, 0, 0], [0, 5, 0, 0]], 60, 90, (0, 9), r"shape \(2, 4\)"),
        ([], 60, 90, (0, 9), r"shape \(0,\)"),
        ([[0, 0], [0, 5]], 0, 90, (0, 9), "a dip of 1 to 90 deg"),
        ([[0, 0], [0, 5]], 91, 90, (0, 9), "a dip of 1 to 90 deg"),
        ([[0, 0], [0, 5]], 60, 90, (9, 9), "a lower depth below the upper one"),
        ([[0, 0], [0, 5]], 60, 5, (0, 9), "along the trace; wanted one across it"),
    ],
)
def test_what_cannot_hang_is_refused_with_the_reason(trace, dip, side, depths, told):
    with pytest.raises(SurfaceError, match=told):
        surface_from_trace(trace, dip, side, *depths, name="F")
