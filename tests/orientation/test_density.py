"""Density of axes: what chance makes has no excess; signs and turns change nothing; a plain second way agrees."""

from __future__ import annotations

import math

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.density import axis_density
from structviz.orientation.vectors import rotation


def random_axes(count: int, seed: int) -> np.ndarray:
    v = np.random.default_rng(seed).normal(size=(count, 3))
    return v / np.linalg.norm(v, axis=1, keepdims=True)


def plain(axes: np.ndarray, at: np.ndarray) -> list[float]:
    """Return the same axis by axis, the moments of the kernel by adding up small steps."""
    k = 2 * (1 + len(axes) / 9)
    steps = [(i + 0.5) / 20_000 for i in range(20_000)]
    mean = sum(math.exp(k * (c - 1)) for c in steps) / 20_000
    square = sum(math.exp(2 * k * (c - 1)) for c in steps) / 20_000
    spread = math.sqrt(len(axes) * (square - mean**2))
    return [(sum(math.exp(k * (abs(float(a @ d)) - 1)) for a in axes) - len(axes) * mean) / spread for d in at]


def test_it_agrees_with_the_plain_way() -> None:
    axes, at = random_axes(40, 1), random_axes(6, 2)
    np.testing.assert_allclose(axis_density(axes, at), plain(axes, at), atol=0.05)


def test_chance_has_no_excess_and_a_spread_of_one() -> None:
    values = np.array([axis_density(random_axes(100, seed), [[0.0, 0.0, 1.0]])[0] for seed in range(400)])
    assert abs(values.mean()) < 0.2
    assert 0.8 < values.std() < 1.2


def test_signs_and_turns_change_nothing() -> None:
    axes, at, turn = random_axes(30, 3), random_axes(8, 4), rotation([1.0, 2.0, 0.5], 70.0)
    signs = np.where(np.arange(30) % 2, 1.0, -1.0)[:, None]
    np.testing.assert_allclose(axis_density(axes * signs, -at), axis_density(axes, at))
    np.testing.assert_allclose(axis_density(axes @ turn.T, at @ turn.T), axis_density(axes, at))


def test_no_axes_are_dense_nowhere() -> None:
    assert axis_density(np.zeros((0, 3)), random_axes(3, 5)).tolist() == [0.0, 0.0, 0.0]


def test_wrong_shapes_are_told() -> None:
    with pytest.raises(ArgumentError, match="axes"):
        axis_density([[1.0, 0.0]], [[0.0, 0.0, 1.0]])
