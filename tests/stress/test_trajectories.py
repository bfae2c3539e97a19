"""Trajectories follow the azimuth, end where it is not known, and keep apart."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.stress.trajectories import azimuths_on_grid, shmax_trajectories


def circles(places: np.ndarray) -> np.ndarray:
    """Return the azimuth across the direction from the origin, known between 500 and 3000 m from it."""
    radius = np.hypot(places[:, 0], places[:, 1])
    azimuth = (np.degrees(np.arctan2(places[:, 0], places[:, 1])) + 90.0) % 180.0
    return np.where((radius > 500) & (radius < 3000), azimuth, np.nan)


def test_a_circle_is_followed_to_its_own_beginning() -> None:
    (line,) = shmax_trajectories(circles, np.array([[1000.0, 0.0, -50.0]]), 50.0, 400.0)
    np.testing.assert_allclose(np.hypot(line[:, 0], line[:, 1]), 1000.0, atol=0.1)
    assert (line[:, 2] == -50.0).all()
    assert np.ptp(line[:, 0]) == pytest.approx(2000.0, abs=10.0)


def test_a_line_ends_where_the_azimuth_does() -> None:
    def box(places: np.ndarray) -> np.ndarray:
        return np.where(np.abs(places).max(1) <= 1000.0, 90.0, np.nan)

    (line,) = shmax_trajectories(box, np.zeros((1, 3)), 100.0, 300.0)
    assert np.abs(line).max() <= 1000.0
    assert line[-1, 0] - line[0, 0] >= 1700.0


def test_a_seed_near_a_line_starts_none() -> None:
    seeds = np.array([[1000.0, 0, 0], [0, 1100.0, 0], [0, 1500.0, 0]])
    assert len(shmax_trajectories(circles, seeds, 50.0, 300.0)) == 2


def test_steps_must_be_shorter_than_the_separation() -> None:
    with pytest.raises(ArgumentError, match="two steps or more"):
        shmax_trajectories(circles, np.zeros((1, 3)), 100.0, 150.0)


def test_a_grid_is_read_between_its_points_across_north() -> None:
    grid = azimuths_on_grid((100.0, 200.0), 10.0, np.array([[178.0, 2.0, 40.0], [178.0, 2.0, np.nan]]))
    found = grid(np.array([[100.0, 200, 0], [105.0, 205, 0], [112.0, 200, 0], [99.0, 205, 0], [110.0, 210.0, 5]]))
    np.testing.assert_allclose(found[0], 178.0)
    assert min(found[1], 180 - found[1]) < 1e-9
    assert np.isnan(found[2:4]).all()


def test_lines_on_a_grid_are_those_of_the_azimuths_themselves() -> None:
    north, east = np.meshgrid(np.arange(-3500.0, 3501, 50), np.arange(-3500.0, 3501, 50), indexing="ij")
    values = circles(np.stack([east.ravel(), north.ravel()], 1)).reshape(north.shape)
    (line,) = shmax_trajectories(azimuths_on_grid((-3500.0, -3500.0), 50.0, values), np.array([[1500.0, 0.0, 0.0]]), 50.0, 400.0)
    np.testing.assert_allclose(np.hypot(line[:, 0], line[:, 1]), 1500.0, atol=5.0)
