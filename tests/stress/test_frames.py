"""Grids of frames: they cover everything evenly, and turns come back as they went."""

import numpy as np
from scipy.spatial.transform import Rotation

from structviz.stress.frames import all_frames, ball, turn_between, turned
from structviz.stress.tensor import frame_angle_deg


def test_all_frames_are_rotations_and_leave_no_gap():
    frames = all_frames(9000)
    assert np.allclose(frames @ np.swapaxes(frames, 1, 2), np.eye(3))
    assert np.allclose(np.linalg.det(frames), 1.0)
    anywhere = Rotation.random(200, random_state=4).as_matrix()
    nearest = np.array([frame_angle_deg(frames, frame).min() for frame in anywhere])
    assert nearest.max() < 9.0  # less than the narrowest kernel of the likelihood over its flanks
    assert nearest.mean() < 5.0


def test_turn_between_is_the_inverse_of_turned_and_agrees_with_frame_angle():
    frames = all_frames(50)
    turns = np.random.default_rng(1).normal(size=(40, 3)) * 0.3
    there = turned(frames[7], turns)
    assert np.allclose(turn_between(frames[7], there), turns, atol=1e-12)
    angles = np.degrees(np.linalg.norm(turn_between(frames[7], frames), axis=1))
    assert np.allclose(angles, frame_angle_deg(frames[7], frames), atol=1e-5)


def test_turn_between_takes_axes_for_lines():
    frame = all_frames(50)[11]
    for signs in ([-1, 1, 1], [1, -1, -1], [-1, -1, -1]):
        assert np.allclose(turn_between(frame, np.array(signs)[:, None] * frame), 0.0, atol=1e-12)


def test_ball_is_even_and_centred():
    points = ball(4.0, 0.9)
    assert np.allclose(points.mean(0), 0.0)
    assert np.linalg.norm(points, axis=1).max() <= 4.0 + 1e-9
    moment = points.T @ points / len(points)
    assert np.allclose(moment, np.eye(3) * moment[0, 0], atol=1e-9)
