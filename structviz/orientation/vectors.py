"""Vectors in the frame (easting, northing, up) and the angles between them."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite, check_vectors
from structviz.errors import ArgumentError

Array = NDArray[np.float64]

UP = np.array([0.0, 0.0, 1.0])


def check_matrices(name: str, values: ArrayLike) -> Array:
    """Return finite float64 matrices of shape (..., 3, 3), such as frames of unit rows or tensors; raise ArgumentError otherwise."""
    array = check_finite(name, values)
    if array.shape[-2:] != (3, 3):
        raise ArgumentError(
            f"{name}: found shape {array.shape}; wanted (..., 3, 3)", hint="give 3 by 3 arrays: three rows of three components"
        )
    return array


def unit(vectors: ArrayLike) -> Array:
    """Return the vectors at length one, shape (..., 3); a zero vector stays zero.

    >>> unit([0.0, 3.0, 4.0])
    array([0. , 0.6, 0.8])
    """
    v = check_vectors("vectors", vectors)
    length = np.sqrt(np.einsum("...k,...k->...", v, v))[..., None]
    return np.divide(v, length, out=np.zeros_like(v), where=length > 0)


def dot(a: ArrayLike, b: ArrayLike) -> Array:
    """Return the scalar products along the last axis, shape (...)."""
    return np.einsum("...k,...k->...", np.asarray(a, float), np.asarray(b, float))


def angle_deg(a: ArrayLike, b: ArrayLike) -> Array:
    """Return the angle between directed vectors, degrees in [0, 180], shape (...).

    The arctangent form keeps full accuracy near 0 and 180, where the arccosine loses half the digits.

    >>> float(angle_deg([1, 0, 0], [1, 1, 0]).round(9))
    45.0
    """
    a, b = np.asarray(a, float), np.asarray(b, float)
    cross = np.cross(a, b)
    return np.degrees(np.arctan2(np.sqrt(dot(cross, cross)), dot(a, b)))


def axial_angle_deg(a: ArrayLike, b: ArrayLike) -> Array:
    """Return the angle between undirected axes, degrees in [0, 90], shape (...)."""
    angle = angle_deg(a, b)
    return np.minimum(angle, 180.0 - angle)


def rotation(axis: ArrayLike, angle_deg: float) -> Array:
    """Return the right-handed rotation about an axis (Rodrigues), shape (3, 3).

    >>> (rotation([0, 0, 1], 90.0) @ [1.0, 0.0, 0.0]).round(12) + 0.0
    array([0., 1., 0.])
    """
    k = unit(axis)
    a = np.radians(angle_deg)
    cross = np.array([[0, -k[2], k[1]], [k[2], 0, -k[0]], [-k[1], k[0], 0]])
    return np.eye(3) + np.sin(a) * cross + (1 - np.cos(a)) * cross @ cross


def rotation_vectors_to_matrices(vectors_rad: ArrayLike) -> Array:
    """Return rotations for rotation vectors (axis times angle, radians), shape (..., 3, 3)."""
    w = np.asarray(vectors_rad, float)
    angle = np.sqrt(dot(w, w))[..., None, None]
    zero = np.zeros(w.shape[:-1])
    x, y, z = w[..., 0], w[..., 1], w[..., 2]
    cross = np.stack([np.stack([zero, -z, y], -1), np.stack([z, zero, -x], -1), np.stack([-y, x, zero], -1)], -2)
    with np.errstate(invalid="ignore", divide="ignore"):
        first = np.where(angle > 1e-8, np.sin(angle) / angle, 1.0)
        second = np.where(angle > 1e-8, (1 - np.cos(angle)) / angle**2, 0.5)
    return np.eye(3) + first * cross + second * cross @ cross
