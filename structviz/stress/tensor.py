"""Reduced stress: three axes and the shape ratio R = (sigma2 - sigma3)/(sigma1 - sigma3), values (1, R, 0).

Compression is positive and axes are unit rows sigma1, sigma2, sigma3 in (easting, northing, up). Geometry and slip tell
nothing of the size of a stress nor of its mean; every function here gives the same answer for a tensor scaled by a
positive number and shifted by a pressure.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_range
from structviz.errors import ArgumentError
from structviz.kinematics.slip import shear_and_normal
from structviz.orientation.vectors import Array, check_matrices

FRICTION = 0.6  # of ordinary rock [byerlee1978]


def reduced_tensor(axes: ArrayLike, shape_ratio: ArrayLike) -> Array:
    """Return reduced tensors with principal values (1, R, 0), compression positive, shape (..., 3, 3).

    Parameters
    ----------
    axes : (..., 3, 3) unit rows sigma1, sigma2, sigma3; sigma3 is not read.
    shape_ratio : (...) R in [0, 1]; broadcasts against the leading axes.

    >>> reduced_tensor(np.eye(3), 0.25).diagonal()
    array([1.  , 0.25, 0.  ])
    """
    frame = check_matrices("axes", axes)
    ratio = check_range("shape_ratio", shape_ratio, 0.0, 1.0, "(no unit)")[..., None, None]
    s1, s2 = frame[..., 0, :], frame[..., 1, :]
    return s1[..., :, None] * s1[..., None, :] + ratio * (s2[..., :, None] * s2[..., None, :])


def principal(tensor: ArrayLike) -> tuple[Array, Array, Array]:
    """Return axes (..., 3, 3) as right-handed unit rows, principal values (..., 3) descending, and shape ratio (...).

    The shape ratio of an isotropic tensor is NaN: it has none. Where two values are equal their axes are any pair
    in the plane of the two.

    >>> axes, values, ratio = principal(np.diag([30.0, 20.0, 25.0]))
    >>> values, float(ratio), np.abs(axes[0])
    (array([30., 25., 20.]), 0.5, array([1., 0., 0.]))
    """
    stress = check_matrices("tensor", tensor)
    ascending, columns = np.linalg.eigh(stress)
    values = ascending[..., ::-1]
    axes = np.swapaxes(columns, -1, -2)[..., ::-1, :].copy()
    axes[..., 2, :] = np.cross(axes[..., 0, :], axes[..., 1, :])
    span = values[..., 0] - values[..., 2]
    resolved = span > 1e-12 * np.abs(values).max(-1)
    ratio = np.divide(values[..., 1] - values[..., 2], span, out=np.full(span.shape, np.nan), where=resolved)
    return axes, values, ratio


def slip_tendency(tensor: ArrayLike, normals: ArrayLike, friction: float = FRICTION) -> Array:
    """Return the slip tendency of planes as a share of the greatest on any plane, 0 to 1, shape (...) [morris1996].

    Notes
    -----
    Slip tendency is shear over normal stress, and a reduced tensor has no normal stress of its own. The pressure that
    is missing is set by the critical state: the best oriented plane is just about to slip, sigma1/sigma3 =
    (sqrt(mu^2 + 1) + mu)^2. The tendency is then divided by mu, its maximum. Tensors and normals broadcast as in
    `resolved_slip`; an isotropic stress gives 0.

    >>> bool(slip_tendency(reduced_tensor(np.eye(3), 0.5), [1.0, 0.0, 0.0]) < 1e-12)
    True
    """
    mu = _check_friction(friction)
    shear, pressure, high, low = _scaled(tensor, normals)
    span = high - low
    least = span / ((np.sqrt(mu**2 + 1) + mu) ** 2 - 1)  # sigma3 in the critical state
    effective = pressure - low + least
    share = np.divide(shear, mu * effective, out=np.zeros(shear.shape), where=(span > 0) & (effective > 0))
    return np.clip(share, 0.0, 1.0)


def dilation_tendency(tensor: ArrayLike, normals: ArrayLike) -> Array:
    """Return (sigma1 - normal stress)/(sigma1 - sigma3) of planes, 0 to 1, shape (...); 0 for an isotropic stress [ferrill1999]."""
    shear, pressure, high, low = _scaled(tensor, normals)
    return np.clip(np.divide(high - pressure, high - low, out=np.zeros(shear.shape), where=high > low), 0.0, 1.0)


def instability(tensor: ArrayLike, normals: ArrayLike, friction: float = FRICTION) -> Array:
    """Return how near each plane is to slip on a scale from 0 (worst oriented) to 1 (best), shape (...) [vavrycuk2014].

    Notes
    -----
    I = (tau - mu (sigma_n - sigma1)) / (tau_c - mu (sigma_c - sigma1)) with stress scaled to sigma1 = 1, sigma3 = -1,
    and c the best oriented plane: tau_c = 1/sqrt(1 + mu^2), sigma_c = -mu tau_c.
    """
    mu = _check_friction(friction)
    shear, pressure, high, low = _scaled(tensor, normals)
    best = np.sqrt(1 + mu**2) + mu  # tau_c - mu (sigma_c - 1) simplified
    half = (high - low) / 2
    return np.clip(np.divide(shear + mu * (high - pressure), best * half, out=np.zeros(shear.shape), where=half > 0), 0.0, 1.0)


def frame_angle_deg(a: ArrayLike, b: ArrayLike) -> Array:
    """Return the least rotation that brings the axes of one frame onto those of another, degrees in [0, 120], shape (...).

    Axes are lines without direction, so each frame (..., 3, 3) stands for four right-handed copies (twofold turns about its
    axes) and the nearest counts [kagan1991]. Frames broadcast; accuracy near zero is about 1e-6 degrees.

    Notes
    -----
    The rotation angle follows from the trace of the turn, sum(d_i a_i.b_i) with signs d_i whose product keeps the
    handedness. Taking the signs of the products is best; if that breaks the handedness, the smallest one is given up.

    >>> float(frame_angle_deg(np.eye(3), [[0, 1, 0], [1, 0, 0], [0, 0, 1]]).round(4))
    90.0
    """
    first, second = check_matrices("a", a), check_matrices("b", b)
    p1, p2, p3 = (np.einsum("...k,...k->...", first[..., i, :], second[..., i, :]) for i in range(3))
    turned = (p1 < 0) ^ (p2 < 0) ^ (p3 < 0) ^ (np.linalg.det(first) < 0) ^ (np.linalg.det(second) < 0)
    p1, p2, p3 = np.abs(p1), np.abs(p2), np.abs(p3)
    trace = p1 + p2 + p3 - np.where(turned, 2 * np.minimum(np.minimum(p1, p2), p3), 0.0)
    return np.degrees(np.arccos(np.clip((trace - 1) / 2, -1.0, 1.0)))


def _scaled(tensor: ArrayLike, normals: ArrayLike) -> tuple[Array, Array, Array, Array]:
    """Return shear and normal stress on planes and the greatest and least principal stress, all of one shape."""
    shear, pressure = shear_and_normal(tensor, normals)
    values = np.linalg.eigvalsh(np.asarray(tensor, float))
    return shear, pressure, np.broadcast_to(values[..., 2], shear.shape), np.broadcast_to(values[..., 0], shear.shape)


def _check_friction(friction: float) -> float:
    if not 0 < friction < np.inf:
        raise ArgumentError(f"friction: found {friction:g}; wanted a positive number", hint="0.6 to 0.85 is ordinary for rock")
    return float(friction)
