"""Planes as unit normals; strike and dip by the right-hand rule; rake after [aki1980]."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_finite, check_range, check_vectors
from structviz.orientation.vectors import Array, dot, unit

# Below this horizontal part of a unit normal the plane is level and its strike a matter of rounding; below this upward part it is vertical.
LEVEL = 1e-12


def normals(strike_deg: ArrayLike, dip_deg: ArrayLike) -> Array:
    """Return unit normals on the hanging-wall side (up for dips under 90), shape (..., 3).

    >>> normals(0.0, 60.0).round(6) + 0.0
    array([0.866025, 0.      , 0.5     ])
    """
    strike = np.radians(check_finite("strike_deg", strike_deg))
    dip = np.radians(check_range("dip_deg", dip_deg, 0.0, 90.0, "deg"))
    horizontal = np.sin(dip)
    return np.stack(np.broadcast_arrays(horizontal * np.cos(strike), -horizontal * np.sin(strike), np.cos(dip)), -1)


def strike_dip_deg(normal_vectors: ArrayLike) -> tuple[Array, Array]:
    """Return strike [0, 360) and dip [0, 90] of planes, degrees, shape (...) each; the sign of a normal does not matter.

    A vertical plane takes the strike whose right side the normal given points to. A level plane has strike 0 by convention.

    >>> strike, dip = strike_dip_deg([0.866025403784, 0.0, 0.5])
    >>> round(float(strike), 6), round(float(dip), 6)
    (0.0, 60.0)
    """
    n = unit(check_vectors("normal_vectors", normal_vectors))
    n = np.where(n[..., 2:] < -LEVEL, -n, n)  # a plane vertical to rounding keeps the side it was given
    horizontal = np.hypot(n[..., 0], n[..., 1])
    strike = np.degrees(np.arctan2(-n[..., 1], n[..., 0])) % 360.0
    strike = np.where((horizontal < LEVEL) | (strike >= 360.0), 0.0, strike)
    return strike, np.degrees(np.arctan2(horizontal, np.maximum(n[..., 2], 0.0)))


def strike_vectors(normal_vectors: ArrayLike) -> Array:
    """Return horizontal unit vectors along strike, for which up x normal is the direction, shape (..., 3).

    They belong to the normal given: an overturned normal (pointing down) keeps its own hanging wall, so the rake
    stays that of the same moving block. A level plane takes north.
    """
    n = check_vectors("normal_vectors", normal_vectors)
    along = np.stack([-n[..., 1], n[..., 0], np.zeros(n.shape[:-1])], -1)
    level = dot(along, along)[..., None] < LEVEL**2
    return unit(np.where(level, [0.0, 1.0, 0.0], along))


def slip_vectors(normal_vectors: ArrayLike, rake_deg: ArrayLike) -> Array:
    """Return unit hanging-wall slip of a rake in (-180, 180] on the plane of each normal, shape (..., 3) [aki1980].

    >>> slip_vectors([0.866025403784, 0.0, 0.5], -90.0).round(6) + 0.0
    array([ 0.5     ,  0.      , -0.866025])
    """
    n = unit(normal_vectors)
    along = strike_vectors(n)
    up_dip = np.cross(n, along)
    rake = np.radians(check_finite("rake_deg", rake_deg))[..., None]
    return np.cos(rake) * along + np.sin(rake) * up_dip


def rakes_deg(normal_vectors: ArrayLike, slips: ArrayLike) -> Array:
    """Return the rake of hanging-wall slip, degrees in (-180, 180], shape (...); NaN where the slip has no part in the plane."""
    n = unit(normal_vectors)
    s = check_vectors("slips", slips)
    along = strike_vectors(n)
    forward, upward = dot(s, along), dot(s, np.cross(n, along))
    rake = np.degrees(np.arctan2(upward, forward))
    rake = np.where(rake <= -180.0, 180.0, rake)
    return np.where(np.hypot(forward, upward) < LEVEL, np.nan, rake)
