"""Focal mechanisms: nodal planes, P, B and T axes and moment tensors, in (easting, northing, up) [aki1980].

Angles of a mechanism are strike, dip and rake of one nodal plane, broadcast against each other. P takes the place of sigma1
and T that of sigma3, so frames of P, B, T rows work wherever frames of axes do (`frame_angle_deg` is then Kagan's angle).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite, check_vectors
from structviz.errors import ArgumentError
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_dip_deg
from structviz.orientation.vectors import Array, check_matrices
from structviz.stress.tensor import FRICTION, instability, reduced_tensor


def normals_and_slips(strike_deg: ArrayLike, dip_deg: ArrayLike, rake_deg: ArrayLike) -> tuple[Array, Array]:
    """Return hanging-wall unit normals and unit hanging-wall slips of nodal planes, shape (..., 3) each."""
    strike, dip, rake = np.broadcast_arrays(*(np.asarray(value, float) for value in (strike_deg, dip_deg, rake_deg)))
    n = normals(strike, dip)
    return n, slip_vectors(n, rake)


def auxiliary_plane_deg(strike_deg: ArrayLike, dip_deg: ArrayLike, rake_deg: ArrayLike) -> tuple[Array, Array, Array]:
    """Return strike [0, 360), dip [0, 90] and rake (-180, 180] of the other nodal plane, degrees, shape (...) each.

    >>> [round(float(angle), 6) for angle in auxiliary_plane_deg(0.0, 60.0, -90.0)]
    [180.0, 30.0, -90.0]
    """
    n, s = normals_and_slips(strike_deg, dip_deg, rake_deg)
    return _angles(s, n)


def pbt_axes(strike_deg: ArrayLike, dip_deg: ArrayLike, rake_deg: ArrayLike) -> Array:
    """Return unit rows P, B, T of mechanisms, shape (..., 3, 3), right-handed.

    P = (n - s)/sqrt 2 and T = (n + s)/sqrt 2 for the normal n and the slip s of either plane.

    >>> pbt_axes(0.0, 45.0, -90.0)[0].round(9) + 0.0
    array([0., 0., 1.])
    """
    n, s = normals_and_slips(strike_deg, dip_deg, rake_deg)
    p, t = (n - s) / np.sqrt(2), (n + s) / np.sqrt(2)
    return np.stack([p, np.cross(t, p), t], -2)


def nodal_planes_deg(axes: ArrayLike) -> tuple[Array, Array, Array]:
    """Return strike, dip and rake of both nodal planes of frames P, B, T (..., 3, 3), degrees, shape (..., 2) each."""
    frame = check_matrices("axes", axes)
    p, t = frame[..., 0, :], frame[..., 2, :]
    first, second = (t + p) / np.sqrt(2), (t - p) / np.sqrt(2)
    return _angles(np.stack([first, second], -2), np.stack([second, first], -2))


def moment_tensor(strike_deg: ArrayLike, dip_deg: ArrayLike, rake_deg: ArrayLike) -> Array:
    """Return the unit double-couple moment tensor n s + s n, tension positive, shape (..., 3, 3)."""
    n, s = normals_and_slips(strike_deg, dip_deg, rake_deg)
    return n[..., :, None] * s[..., None, :] + s[..., :, None] * n[..., None, :]


def tensor_of_up_south_east(components: ArrayLike) -> Array:
    """Return moment tensors (..., 3, 3) in (easting, northing, up) from rr, tt, pp, rt, rp, tp, shape (..., 6).

    Catalogues of moment tensors count r up, t south and p east.
    """
    m = check_finite("components", components)
    if m.ndim == 0 or m.shape[-1] != 6:
        raise ArgumentError(
            f"components: found shape {m.shape}; wanted (..., 6) as rr, tt, pp, rt, rp, tp", hint="give six numbers a tensor"
        )
    rr, tt, pp, rt, rp, tp = np.moveaxis(m, -1, 0)
    return np.stack([np.stack([pp, -tp, rp], -1), np.stack([-tp, tt, -rt], -1), np.stack([rp, -rt, rr], -1)], -2)


def pbt_of_moment(tensor: ArrayLike) -> tuple[Array, Array]:
    """Return unit rows P, B, T (..., 3, 3), right-handed, and their moments ascending (..., 3)."""
    values, columns = np.linalg.eigh(check_matrices("tensor", tensor))
    axes = np.swapaxes(columns, -1, -2).copy()
    axes[..., 1, :] = np.cross(axes[..., 2, :], axes[..., 0, :])
    return axes, values


def less_stable_plane(tensor: ArrayLike, plane_normals: ArrayLike, friction: float = FRICTION) -> NDArray[np.intp]:
    """Return which of two nodal planes (..., 2, 3) is nearer to slip in a stress (3, 3): 0 or 1, shape (...) [vavrycuk2014]."""
    return np.asarray(instability(tensor, plane_normals, friction).argmax(-1))


def choose_planes(planes_deg: ArrayLike, axes: ArrayLike, shape_ratio: float, friction: float = FRICTION) -> tuple[NDArray[np.intp], Array]:
    """Return which nodal plane of each event is nearer to slip in a stress, (N,), and the instability of both, (N, 2) [vavrycuk2014].

    planes_deg holds strike, dip and rake of both planes, (N, 2, 3); axes are unit rows sigma1, sigma2, sigma3. Of planes equally
    near to slip the first is taken.
    """
    angles = check_vectors("planes_deg", planes_deg)
    if angles.ndim != 3 or angles.shape[1] != 2:
        raise ArgumentError(
            f"planes_deg: found shape {angles.shape}; wanted (N, 2, 3)", hint="give strike, dip and rake of both nodal planes"
        )
    found = instability(reduced_tensor(axes, shape_ratio), normals(angles[..., 0], angles[..., 1]), friction)
    return np.asarray(found.argmax(-1)), found


def _angles(n: Array, s: Array) -> tuple[Array, Array, Array]:
    """Return strike, dip, rake for normals and slips; a normal that points down stands for the other block, so both turn."""
    up = n[..., 2:] < 0
    n, s = np.where(up, -n, n), np.where(up, -s, s)
    strike, dip = strike_dip_deg(n)
    return strike, dip, rakes_deg(n, s)
