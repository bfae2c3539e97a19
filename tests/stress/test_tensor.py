"""Reduced tensors, tendencies and the distance between frames."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from structviz.errors import ArgumentError
from structviz.kinematics.slip import shear_and_normal
from structviz.stress.tensor import dilation_tendency, frame_angle_deg, instability, principal, reduced_tensor, slip_tendency


def random_frames(count, seed=0):
    return Rotation.random(count, random_state=seed).as_matrix()


def random_normals(count, seed=0):
    v = np.random.default_rng(seed).normal(size=(count, 3))
    return v / np.linalg.norm(v, axis=1)[:, None]


def test_axes_and_shape_ratio_come_back():
    frames, ratios = random_frames(200), np.random.default_rng(1).uniform(0.05, 0.95, 200)
    axes, values, found = principal(reduced_tensor(frames, ratios))
    np.testing.assert_allclose(found, ratios, atol=1e-12)
    np.testing.assert_allclose(values, np.stack([np.ones(200), ratios, np.zeros(200)], -1), atol=1e-12)
    assert frame_angle_deg(axes, frames).max() < 1e-5
    np.testing.assert_allclose(np.linalg.det(axes), 1.0)


def test_scale_and_pressure_change_nothing_but_the_values():
    tensor = reduced_tensor(random_frames(1)[0], 0.4)
    moved = 250.0 * tensor + 40.0 * np.eye(3)
    n = random_normals(300)
    assert principal(moved)[2] == pytest.approx(0.4)
    for measure in (slip_tendency, dilation_tendency, instability):
        np.testing.assert_allclose(measure(moved, n), measure(tensor, n), atol=1e-10)


def test_an_isotropic_stress_has_no_shape_and_moves_nothing():
    axes, values, ratio = principal(3.0 * np.eye(3))
    assert np.isnan(ratio)
    np.testing.assert_allclose(values, 3.0)
    np.testing.assert_allclose(axes @ axes.T, np.eye(3), atol=1e-12)
    for measure in (slip_tendency, dilation_tendency, instability):
        assert not measure(3.0 * np.eye(3), random_normals(20)).any()


@pytest.mark.parametrize("friction", [0.2, 0.6, 0.85])
@pytest.mark.parametrize("ratio", [0.0, 0.3, 1.0])
def test_tendencies_reach_one_at_the_best_plane_and_never_pass_it(friction, ratio):
    frame = random_frames(1)[0]
    tensor = reduced_tensor(frame, ratio)
    theta = np.arctan(1 / friction) / 2  # between the plane and sigma1
    best = np.sin(theta) * frame[0] + np.cos(theta) * frame[2]
    n = random_normals(20_000)
    for measure in (slip_tendency, instability):
        assert measure(tensor, best, friction) == pytest.approx(1.0, abs=1e-12)
        share = measure(tensor, n, friction)
        assert ((share >= 0) & (share <= 1)).all()
        assert share.max() > 0.99
    assert slip_tendency(tensor, frame, friction).max() < 1e-12
    assert instability(tensor, frame[0], friction) == pytest.approx(0.0, abs=1e-12)


def test_slip_tendency_is_shear_over_normal_stress_in_the_critical_state():
    tensor, mu, n = reduced_tensor(random_frames(1)[0], 0.35), 0.6, random_normals(500)
    steps = np.linspace(0.01, 2.0, 40_001)  # search for the pressure that brings the best plane to slip
    angle = np.linspace(0, np.pi, 2001)
    circle_shear, circle_normal = np.sin(angle) / 2, 0.5 + np.cos(angle) / 2
    least = next(step for step in steps if (circle_shear / (circle_normal + step)).max() <= mu)
    shear, pressure = shear_and_normal(tensor + least * np.eye(3), n)
    np.testing.assert_allclose(slip_tendency(tensor, n, mu), shear / pressure / mu, atol=2e-4)


def test_dilation_runs_from_sigma1_to_sigma3():
    frame = random_frames(1)[0]
    np.testing.assert_allclose(dilation_tendency(reduced_tensor(frame, 0.25), frame), [0.0, 0.75, 1.0], atol=1e-12)


def plain_angle(a, b):
    """Return the least rotation angle by trying all sign changes that keep the handedness."""
    angles = []
    for signs in itertools.product((1, -1), repeat=3):
        turn = (np.array(signs)[:, None] * b).T @ a
        if np.linalg.det(turn) > 0:
            angles.append(np.degrees(Rotation.from_matrix(turn).magnitude()))
    return min(angles)


def test_frame_angle_agrees_with_all_symmetric_copies():
    a, b = random_frames(300, 1), random_frames(300, 2)
    b[::3] *= np.array([1.0, -1.0, 1.0])[:, None]  # left-handed rows mean the same axes
    wanted = [plain_angle(x, y) for x, y in zip(a, b)]
    np.testing.assert_allclose(frame_angle_deg(a, b), wanted, atol=1e-5)
    assert max(wanted) <= 120.0


def test_frame_angle_broadcasts_and_ignores_signs():
    a = random_frames(6)
    table = frame_angle_deg(a[:, None], a)
    assert table.shape == (6, 6)
    np.testing.assert_allclose(table, table.T, atol=1e-6)
    np.testing.assert_allclose(np.diag(table), 0.0, atol=3e-6)
    flipped = a * np.array([[1.0], [-1.0], [-1.0]])
    np.testing.assert_allclose(frame_angle_deg(flipped[:, None], a), table, atol=3e-6)
    turned = a @ Rotation.from_rotvec([0.0, 0.0, np.radians(10.0)]).as_matrix()
    np.testing.assert_allclose(frame_angle_deg(a, turned), 10.0, atol=1e-6)


def test_bad_arguments_are_refused():
    with pytest.raises(ArgumentError, match=r"shape_ratio: found 1\.2 \(no unit\); wanted 0 to 1"):
        reduced_tensor(np.eye(3), 1.2)
    with pytest.raises(ArgumentError, match="friction: found 0; wanted a positive number"):
        slip_tendency(np.eye(3), [0, 0, 1], 0.0)
    with pytest.raises(ArgumentError, match=r"axes: found shape \(2, 3\)"):
        reduced_tensor(np.eye(3)[:2], 0.5)
    with pytest.raises(ArgumentError, match=r"tensor: found shape \(6,\)"):
        principal(np.ones(6))
