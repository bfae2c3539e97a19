"""Vectors and the angles between them."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from structviz.errors import ArgumentError
from structviz.orientation.vectors import angle_deg, axial_angle_deg, dot, rotation, rotation_vectors_to_matrices, unit


def test_unit_keeps_direction_and_leaves_zero():
    v = np.array([[3.0, 0.0, 4.0], [0.0, 0.0, 0.0], [0.0, 0.0, -1e-200]])
    found = unit(v)
    np.testing.assert_allclose(found[0], [0.6, 0.0, 0.8])
    assert not found[1].any()
    assert np.isfinite(found).all()


def test_bad_vectors_are_refused_by_name():
    with pytest.raises(ArgumentError, match=r"vectors: found shape \(2,\); wanted \(\.\.\., 3\)"):
        unit([1.0, 2.0])
    with pytest.raises(ArgumentError, match="vectors: found NaN"):
        unit([np.nan, 0.0, 1.0])


@pytest.mark.parametrize("small_deg", [1e-7, 1e-4, 1.0])
def test_small_angles_keep_their_digits(small_deg):
    """The arccosine gives 0 here for the smallest."""
    a = np.array([0.0, 1.0, 0.0])
    b = rotation([1.0, 2.0, 2.0], 0.0) @ np.array([np.sin(np.radians(small_deg)), np.cos(np.radians(small_deg)), 0.0])
    np.testing.assert_allclose(angle_deg(a, b), small_deg, rtol=1e-8)
    np.testing.assert_allclose(angle_deg(a, -b), 180 - small_deg, rtol=1e-12)
    np.testing.assert_allclose(axial_angle_deg(a, -b), small_deg, rtol=1e-6)


def test_rotations_agree_with_scipy():
    turns = np.random.default_rng(0).normal(size=(200, 3)) * 2
    turns[0], turns[1] = 0.0, 1e-12
    wanted = Rotation.from_rotvec(turns).as_matrix()
    np.testing.assert_allclose(rotation_vectors_to_matrices(turns), wanted, atol=1e-14)
    for turn, matrix in zip(turns[2:10], wanted[2:10]):
        np.testing.assert_allclose(rotation(turn, np.degrees(np.linalg.norm(turn))), matrix, atol=1e-14)


def test_dot_runs_along_the_last_axis():
    np.testing.assert_allclose(dot([[1.0, 2.0, 3.0], [0.0, 1.0, 0.0]], [1.0, 1.0, 2.0]), [9.0, 1.0])
