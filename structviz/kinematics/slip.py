"""Slip resolved from a stress: where the shear on a plane points, and how large it is [wallace1951] [bott1959].

Stress is compression-positive, in (easting, northing, up). A normal points from foot wall to hanging wall. The hanging
wall presses on the foot wall with the traction S n, so it moves along minus the shear part of S n.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_vectors
from structviz.orientation.vectors import Array, check_matrices, dot

# Shear below this share of the stress itself is rounding, and its direction is noise.
NIL_SHEAR = 1e-12


def resolved_slip(tensor: ArrayLike, normals: ArrayLike) -> Array:
    """Return the unit hanging-wall slip on each plane, shape (..., 3), zero where the shear is nil.

    Parameters
    ----------
    tensor : (..., 3, 3) symmetric stress, compression positive, any unit; a reduced tensor does as well.
    normals : (..., 3) unit normals on the hanging-wall side; leading axes broadcast against those of the tensor.

    Notes
    -----
    slip = -(S n - (n.S n) n), normalised [wallace1951] [bott1959]. Turning the normal round turns the slip round too,
    which is the same relative movement told from the other block.

    Examples
    --------
    A vertical greatest stress moves the hanging wall of a fault that dips 60 degrees east down its dip:

    >>> resolved_slip([[0, 0, 0], [0, 0.5, 0], [0, 0, 1]], [0.866025403784, 0.0, 0.5]).round(6) + 0.0
    array([ 0.5     ,  0.      , -0.866025])
    """
    shear, size, scale = _shear_vectors(tensor, normals)[1:]
    slips = np.zeros(shear.shape)
    moving = size > NIL_SHEAR * scale
    np.divide(-shear, size[..., None], out=slips, where=moving[..., None])
    return slips


def shear_and_normal(tensor: ArrayLike, normals: ArrayLike) -> tuple[Array, Array]:
    """Return the size of the shear and the normal stress on each plane, in the unit of the tensor, shape (...) each.

    Shapes broadcast as in `resolved_slip`; the normal stress is positive in compression.

    >>> shear, normal = shear_and_normal(np.diag([30.0, 20.0, 10.0]), np.full(3, 3**-0.5))
    >>> round(float(shear), 6), round(float(normal), 6)
    (8.164966, 20.0)
    """
    pressure, _, size, _ = _shear_vectors(tensor, normals)
    return size, pressure


def _shear_vectors(tensor: ArrayLike, normals: ArrayLike) -> tuple[Array, Array, Array, Array]:
    """Return normal stress, shear part of S n, its size, and the size of the tensor."""
    stress, n = check_matrices("tensor", tensor), check_vectors("normals", normals)
    traction = _tractions(stress, n)
    pressure = dot(traction, n)
    shear = traction - pressure[..., None] * n
    return pressure, shear, np.sqrt(dot(shear, shear)), np.sqrt(np.einsum("...ij,...ij->...", stress, stress))


def _tractions(stress: Array, n: Array) -> Array:
    """Return S n; one stress for many planes goes through a matrix product, several times faster than a general sum."""
    if n.ndim > 1 and stress.ndim == 2:
        return n @ stress
    if n.ndim > 1 and stress.shape[-3] == 1:
        return np.matmul(n, stress[..., 0, :, :])
    return np.einsum("...ij,...j->...i", stress, n)
