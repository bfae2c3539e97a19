"""Slip resolved from a stress."""

from __future__ import annotations

import math

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.kinematics.slip import resolved_slip, shear_and_normal
from structviz.orientation.planes import normals, rakes_deg


def random_normals(count, seed=0):
    v = np.random.default_rng(seed).normal(size=(count, 3))
    return v / np.linalg.norm(v, axis=1)[:, None]


def random_stress(seed=0, count=None):
    a = np.random.default_rng(seed).normal(size=(3, 3) if count is None else (count, 3, 3))
    return a + np.swapaxes(a, -1, -2)


def plain_slip(stress, n):
    """Return slip by loops over components: the direction in the plane that shear drags the hanging wall."""
    traction = [sum(stress[i][j] * n[j] for j in range(3)) for i in range(3)]
    across = sum(traction[i] * n[i] for i in range(3))
    shear = [-(traction[i] - across * n[i]) for i in range(3)]
    size = math.sqrt(sum(part**2 for part in shear))
    return [part / size for part in shear], size, across


def test_agrees_with_a_plain_loop():
    stress, n = random_stress(), random_normals(200)
    slips, (shear, pressure) = resolved_slip(stress, n), shear_and_normal(stress, n)
    for i in range(len(n)):
        slip, size, across = plain_slip(stress.tolist(), n[i].tolist())
        np.testing.assert_allclose(slips[i], slip, atol=1e-12)
        np.testing.assert_allclose([shear[i], pressure[i]], [size, across], atol=1e-12)


def test_every_way_of_broadcasting_gives_the_same():
    stresses, n = random_stress(1, 7), random_normals(11, 1)
    table = np.array([[plain_slip(stress, one)[0] for one in n] for stress in stresses])
    np.testing.assert_allclose(resolved_slip(stresses[:, None], n), table, atol=1e-10)
    np.testing.assert_allclose(resolved_slip(stresses[:, None], np.broadcast_to(n, (7, 11, 3))), table, atol=1e-10)
    np.testing.assert_allclose(resolved_slip(stresses[:, None], n[0]), table[:, :1], atol=1e-10)
    np.testing.assert_allclose(resolved_slip(stresses, n[:7]), table[range(7), range(7)], atol=1e-10)
    np.testing.assert_allclose(resolved_slip(stresses, n[0]), table[:, 0], atol=1e-10)
    np.testing.assert_allclose(resolved_slip(stresses[0], n), table[0], atol=1e-10)
    assert resolved_slip(stresses[0], n[0]).shape == (3,)


def test_slip_is_a_unit_vector_in_the_plane():
    n = random_normals(500)
    slips = resolved_slip(random_stress(), n)
    np.testing.assert_allclose(np.linalg.norm(slips, axis=1), 1.0)
    np.testing.assert_allclose((slips * n).sum(1), 0.0, atol=1e-12)


@pytest.mark.parametrize("pressure", [0.0, 1.0, 1e3])
def test_no_shear_gives_zero_and_never_nan(pressure):
    frame = np.linalg.qr(np.random.default_rng(4).normal(size=(3, 3)))[0].T
    stress = frame.T @ np.diag([1.0, 0.3, 0.0]) @ frame + pressure * np.eye(3)
    assert not resolved_slip(stress, frame).any()
    assert not resolved_slip(np.zeros((3, 3)), frame).any()
    assert not resolved_slip(pressure * np.eye(3), random_normals(50)).any()
    assert not resolved_slip(stress, np.zeros((4, 3))).any()  # the normal of a triangle without area


@pytest.mark.parametrize(
    "horizontal, plane, rake",
    [
        ((0.0, 0.5, 1.0), (0.0, 60.0), -90.0),  # sigma1 vertical, sigma3 east
        ((1.0, 0.5, 0.0), (0.0, 30.0), 90.0),  # sigma1 east, sigma3 vertical
        ((0.0, 1.0, 0.5), (330.0, 90.0), 180.0),  # sigma1 north, 30 degrees clockwise of the strike
        ((0.0, 1.0, 0.5), (30.0, 90.0), 0.0),
    ],
)
def test_the_four_senses(horizontal, plane, rake):
    n = normals(*plane)
    found = float(rakes_deg(n, resolved_slip(np.diag(horizontal), n)))
    assert (found - rake + 180) % 360 - 180 == pytest.approx(0.0, abs=1e-9)


def test_the_other_block_moves_the_other_way():
    stress, n = random_stress(), random_normals(50)
    np.testing.assert_allclose(resolved_slip(stress, -n), -resolved_slip(stress, n), atol=1e-14)


def test_bad_shapes_are_refused():
    with pytest.raises(ArgumentError, match=r"tensor: found shape \(3,\); wanted \(\.\.\., 3, 3\)"):
        resolved_slip([1.0, 0.5, 0.0], [0.0, 0.0, 1.0])
    with pytest.raises(ArgumentError, match="normals: found NaN"):
        resolved_slip(np.eye(3), [np.nan, 0.0, 1.0])
