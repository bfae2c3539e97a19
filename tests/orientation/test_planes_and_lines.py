"""Strike, dip, rake, trend and plunge: the special cases."""

from __future__ import annotations

import math

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_dip_deg, strike_vectors


def plain_normal(strike, dip):
    """Return the hanging-wall normal from the dip line alone: turn the dip line up by a right angle."""
    towards = math.radians(strike + 90)
    d = math.radians(dip)
    down = (math.cos(d) * math.sin(towards), math.cos(d) * math.cos(towards), -math.sin(d))
    ahead = (math.sin(math.radians(strike)), math.cos(math.radians(strike)), 0.0)
    return np.cross(down, ahead)


def test_normals_agree_with_a_plain_reckoning():
    for strike in range(0, 360, 23):
        for dip in (0, 1, 30, 45, 89, 90):
            np.testing.assert_allclose(normals(strike, dip), plain_normal(strike, dip), atol=1e-15)


def test_shapes_broadcast():
    assert normals(np.zeros((4, 1)), np.full(3, 30.0)).shape == (4, 3, 3)
    assert vectors([0.0, 90.0], 10.0).shape == (2, 3)


def test_vertical_plane_keeps_the_side_of_its_normal():
    n = normals(70.0, 90.0)
    for tilt in (0.0, 1e-16, -1e-16, -1e-13):
        near = n + np.array([0, 0, tilt])
        np.testing.assert_allclose(strike_dip_deg(near), [70.0, 90.0], atol=1e-9)
        np.testing.assert_allclose(strike_dip_deg(-near), [250.0, 90.0], atol=1e-9)
        assert strike_dip_deg(near)[1] <= 90.0


def test_level_plane_strikes_north_and_rakes_from_there():
    strike, dip = strike_dip_deg([[0.0, 0.0, 1.0], [0.0, 0.0, -1.0], [1e-14, 0.0, 1.0]])
    assert strike.tolist() == [0.0, 0.0, 0.0]
    np.testing.assert_allclose(dip, 0.0, atol=1e-9)
    np.testing.assert_allclose(strike_vectors([0.0, 0.0, 1.0]), [0.0, 1.0, 0.0])
    np.testing.assert_allclose(rakes_deg([0.0, 0.0, 1.0], slip_vectors([0.0, 0.0, 1.0], 35.0)), 35.0)


def test_angles_stay_within_their_ranges():
    rng = np.random.default_rng(3)
    n = np.concatenate([rng.normal(size=(2000, 3)), [[1e-17, 1.0, 0.5], [-1e-17, 1.0, 0.5], [1.0, 1e-17, 0.2], [1.0, -1e-17, 0.2]]])
    strike, dip = strike_dip_deg(n)
    assert ((strike >= 0) & (strike < 360)).all()
    assert ((dip >= 0) & (dip <= 90)).all()
    trend, plunge = trend_plunge_deg(n)
    assert ((trend >= 0) & (trend < 360)).all()
    assert ((plunge >= 0) & (plunge <= 90)).all()


def test_rake_of_opposite_ends_and_of_nothing():
    n = normals(10.0, 50.0)
    assert rakes_deg(n, slip_vectors(n, -180.0)) == pytest.approx(180.0)
    assert rakes_deg(n, slip_vectors(n, 180.0)) == pytest.approx(180.0)
    assert np.isnan(rakes_deg(n, n))
    assert np.isnan(rakes_deg(n, np.zeros(3)))


def test_an_overturned_fault_keeps_its_moving_block():
    """A fault that steepens through vertical while its eastern block goes down."""
    dips = np.array([80.0, 89.0, 91.0, 100.0])
    n = np.stack([np.sin(np.radians(dips)), np.zeros(4), np.cos(np.radians(dips))], -1)  # always to the eastern block
    down = np.array([0.0, 0.0, -1.0])
    rakes = rakes_deg(n, down - (n @ down)[:, None] * n)
    np.testing.assert_allclose(rakes, -90.0, atol=1e-9)  # for the same block all the way


def test_a_vertical_line_has_trend_zero():
    np.testing.assert_allclose(trend_plunge_deg([0.0, 0.0, 2.0]), [0.0, 90.0])


def test_bad_angles_are_refused():
    with pytest.raises(ArgumentError, match="dip_deg: found 91 deg; wanted 0 to 90 deg"):
        normals(0.0, 91.0)
    with pytest.raises(ArgumentError, match="strike_deg: found NaN or infinite"):
        normals(np.inf, 10.0)
