"""The equal-area net, against PROJ and by its own laws."""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Proj

from structviz.errors import ArgumentError
from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals
from structviz.orientation.projection import axes_of_points, equal_area, equal_area_directed, great_circles, small_circle
from structviz.orientation.vectors import axial_angle_deg


def random_axes(count, seed=0):
    v = np.random.default_rng(seed).normal(size=(count, 3))
    return v / np.linalg.norm(v, axis=1)[:, None]


def test_points_agree_with_proj():
    """PROJ's azimuthal equal-area map of a sphere, seen from the pole: longitude is trend, latitude is plunge."""
    axes = random_axes(5000)
    trend, plunge = trend_plunge_deg(axes)
    lon = (trend + 180) % 360 - 180
    x, y = Proj("+proj=laea +lat_0=90 +R=1")(lon, plunge)
    np.testing.assert_allclose(equal_area(axes), np.stack([x, -y], -1) / np.sqrt(2), atol=1e-9)


def test_points_come_back():
    axes = random_axes(2000)
    points = equal_area(axes)
    assert (np.hypot(*points.T) <= 1 + 1e-15).all()
    assert axial_angle_deg(axes_of_points(points), axes).max() < 1e-6
    assert (axes_of_points(points)[:, 2] <= 0).all()


def test_even_axes_fill_the_net_evenly():
    radius = np.hypot(*equal_area(random_axes(40_000)).T)
    inside = [(radius < r).mean() for r in (0.25, 0.5, 0.75)]
    np.testing.assert_allclose(inside, [0.0625, 0.25, 0.5625], atol=0.01)


def test_an_axis_and_its_opposite_share_a_point():
    axes = random_axes(100)
    np.testing.assert_allclose(equal_area(axes), equal_area(-axes), atol=1e-15)


def test_directed_lines_tell_which_point_up():
    points, upward = equal_area_directed(vectors([40.0, 40.0], [25.0, -25.0]))
    assert upward.tolist() == [False, True]
    np.testing.assert_allclose(points[1], -equal_area(vectors(40.0, 25.0)), atol=1e-12)


def test_great_circles_lie_in_their_planes_and_end_on_the_primitive():
    n = np.concatenate([random_axes(50), normals([0.0, 77.0], [90.0, 90.0]), [[0.0, 0.0, 1.0]]])
    lines = great_circles(n, 31)
    assert lines.shape == (53, 31, 2)
    assert np.abs(axial_angle_deg(axes_of_points(lines), n[:, None, :]) - 90).max() < 1e-5
    np.testing.assert_allclose(np.hypot(*np.moveaxis(lines[:, [0, -1]], -1, 0)), 1.0, atol=1e-12)
    np.testing.assert_allclose(lines[:, 0], -lines[:, -1], atol=1e-9)


@pytest.mark.parametrize("plunge", [0.0, 5.0, 45.0, 60.0, 90.0])
@pytest.mark.parametrize("half_angle", [1.0, 20.0, 45.0, 89.0])
def test_small_circles_keep_their_angle_and_break_only_at_the_primitive(plunge, half_angle):
    axis = vectors(33.0, plunge)
    pieces = small_circle(axis, half_angle, 201)
    lines = np.concatenate([axes_of_points(piece) for piece in pieces])
    np.testing.assert_allclose(axial_angle_deg(lines, axis), half_angle, atol=2e-6)
    for piece in pieces:
        steps = np.linalg.norm(np.diff(piece, axis=0), axis=1)
        assert steps.max() < 0.06, "a jump across the net"
        ends = np.hypot(*piece[[0, -1]].T)
        closed = np.allclose(piece[0], piece[-1], atol=1e-9)
        assert closed or np.allclose(ends, 1.0, atol=1e-9)
    assert len(pieces) == (2 if half_angle > plunge else 1)


def test_small_circle_of_an_axis_and_its_opposite_is_the_same_set():
    axis = vectors(120.0, 30.0)
    one, other = (np.concatenate([axes_of_points(p) for p in small_circle(a, 50.0, 400)]) for a in (axis, -axis))
    gaps = [axial_angle_deg(line, other).min() for line in one]
    assert max(gaps) < 1.0


def test_bad_points_and_counts_are_refused():
    with pytest.raises(ArgumentError, match=r"points: found radius 1\.5; wanted at most 1"):
        axes_of_points([1.5, 0.0])
    with pytest.raises(ArgumentError, match="count: found 2; wanted 3 or more"):
        great_circles([0.0, 0.0, 1.0], 2)
    with pytest.raises(ArgumentError, match="half_angle_deg: found 91 deg"):
        small_circle([0.0, 0.0, 1.0], 91.0)


def test_points_outside_the_net_say_how_far_and_what_to_do():
    with pytest.raises(ArgumentError, match=r"points: found radius 1\.1; wanted at most 1\n  next: scale so that"):
        axes_of_points([[0.0, 0.5], [1.1, 0.0]])
    with pytest.raises(ArgumentError, match=r"points: found shape \(3,\); wanted \(\.\.\., 2\) as east, north.*\n  next: give two coord"):
        axes_of_points([0.0, 0.5, 0.1])
    with pytest.raises(ArgumentError, match=r"points: found shape \(\)"):
        axes_of_points(0.5)
    on_the_rim = axes_of_points([np.sin(0.3) * (1 + 4e-10), np.cos(0.3) * (1 + 4e-10)])  # rounding is forgiven
    assert on_the_rim[2] == 0.0
    assert np.allclose(on_the_rim, [np.sin(0.3), np.cos(0.3), 0.0], atol=1e-8)


def test_a_great_circle_does_not_care_which_way_its_normal_points():
    for normal in random_axes(20, seed=3):
        there, back = great_circles(normal, 31), great_circles(-normal, 31)
        assert np.allclose(there, back, atol=1e-9) or np.allclose(there, back[::-1], atol=1e-9)
    assert len(great_circles([0.3, 0.1, 0.9])) == 91


def test_the_smallest_cones_are_drawn_too():
    (dot,) = small_circle([0.0, 0.6, -0.8], 0.0)
    assert np.ptp(dot, axis=0).max() < 1e-12
    (ring,) = small_circle([0.0, 0.6, -0.8], 0.5, 61)
    angles = np.degrees(np.arccos(np.clip(axes_of_points(ring) @ [0.0, 0.6, -0.8], -1, 1)))
    assert np.allclose(angles, 0.5, atol=1e-6)
    with pytest.raises(ArgumentError, match="half_angle_deg"):
        small_circle([0.0, 0.6, -0.8], 90.5)
