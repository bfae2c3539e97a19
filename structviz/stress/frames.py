"""Frames of principal axes as points of the rotation group: grids over all of them, and around one of them."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import dot, rotation_vectors_to_matrices

Floats = NDArray[np.float64]


def frames_of_quaternions(quaternions: Floats) -> Floats:
    """Return rotation matrices of unit quaternions (x, y, z, w), shape (..., 3, 3)."""
    x, y, z, w = np.moveaxis(quaternions, -1, 0)
    rows = [
        [1 - 2 * (y * y + z * z), 2 * (x * y - z * w), 2 * (x * z + y * w)],
        [2 * (x * y + z * w), 1 - 2 * (x * x + z * z), 2 * (y * z - x * w)],
        [2 * (x * z - y * w), 2 * (y * z + x * w), 1 - 2 * (x * x + y * y)],
    ]
    return np.stack([np.stack(row, -1) for row in rows], -2)


def all_frames(count: int) -> Floats:
    """Return about `count` frames spread evenly over all orientations of three undirected axes, shape (G, 3, 3) [alexa2022].

    Points of the spiral cover every rotation; half-turns about the axes leave undirected axes in place, so one rotation in
    four is kept: that whose scalar part is the largest component of its quaternion.
    """
    total = 4 * count
    step = np.arange(total) + 0.5
    share, turn = step / total, 2 * np.pi * step
    alpha, beta = turn / np.sqrt(2.0), turn / 1.533751168755204288118041
    inner, outer = np.sqrt(share), np.sqrt(1 - share)
    q = np.stack([inner * np.sin(alpha), inner * np.cos(alpha), outer * np.sin(beta), outer * np.cos(beta)], -1)
    return frames_of_quaternions(q[np.abs(q[:, 3]) >= np.abs(q[:, :3]).max(1)])


def ball(radius: float, spacing: float) -> Floats:
    """Return points of a body-centred grid within a ball, shape (N, 3), nearest to the centre first."""
    reach = np.arange(-np.ceil(radius / spacing), np.ceil(radius / spacing) + 1) * spacing
    corners = np.stack(np.meshgrid(reach, reach, reach, indexing="ij"), -1).reshape(-1, 3)
    points = np.concatenate([corners, corners + spacing / 2])
    length = dot(points, points)
    points = points[length <= radius**2 * (1 + 1e-9)]
    return points[np.argsort(dot(points, points), kind="stable")]


def turned(frame: Floats, vectors_rad: Floats) -> Floats:
    """Return frames turned from one frame by rotation vectors given in its own axes, shape (..., 3, 3)."""
    return rotation_vectors_to_matrices(vectors_rad) @ frame


def turn_between(frame: Floats, others: Floats) -> Floats:
    """Return the least rotation vectors (radians, in the axes of `frame`) that take a frame to others, shape (..., 3).

    The inverse of `turned`; of the four symmetric copies of each frame the nearest is taken.
    """
    relative = others @ np.swapaxes(frame, -1, -2)
    flips = np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]], float)
    handed = np.where(np.linalg.det(relative)[..., None, None] < 0, -relative, relative)
    copies = flips[:, :, None] * handed[..., None, :, :]
    trace = np.trace(copies, axis1=-2, axis2=-1)
    best = np.take_along_axis(copies, trace.argmax(-1)[..., None, None, None], -3)[..., 0, :, :]
    skew = np.stack([best[..., 2, 1] - best[..., 1, 2], best[..., 0, 2] - best[..., 2, 0], best[..., 1, 0] - best[..., 0, 1]], -1)
    sine = np.sqrt(dot(skew, skew)) / 2
    angle = np.arctan2(sine, (trace.max(-1) - 1) / 2)
    scale = np.divide(angle, 2 * sine, out=np.full_like(angle, 0.5), where=sine > 1e-12)
    return skew * scale[..., None]
