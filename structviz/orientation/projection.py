"""Equal-area net: Lambert azimuthal projection of the lower hemisphere on a circle of radius 1 [snyder1987].

Points are (east, north) on the net, shape (..., 2). The primitive circle holds the horizontal lines.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite, check_range, check_vectors
from structviz.errors import ArgumentError
from structviz.orientation.planes import strike_vectors
from structviz.orientation.vectors import Array, unit


def equal_area(axes: ArrayLike) -> Array:
    """Return the net points of undirected axes (..., 3), shape (..., 2); an axis that points up shows its lower end.

    Notes
    -----
    The radius is sqrt(2) sin((90 - plunge)/2), so a share of the hemisphere covers the same share of the net. Written with
    components it is (east, north)/sqrt(1 - up), which has no singular point.

    >>> equal_area([1.0, 0.0, 0.0]), equal_area([0.0, 0.0, 1.0]) + 0.0
    (array([1., 0.]), array([0., 0.]))
    """
    v = unit(check_vectors("axes", axes))
    v = np.where(v[..., 2:] > 0, -v, v)
    return v[..., :2] / np.sqrt(1.0 - v[..., 2:])


def equal_area_directed(lines: ArrayLike) -> tuple[Array, NDArray[np.bool_]]:
    """Return the net points (..., 2) of directed lines (..., 3), and which of them point up (drawn at their lower end), shape (...).

    >>> point, upward = equal_area_directed([0.0, 0.6, 0.8])
    >>> bool(upward), bool(point[1] < 0)
    (True, True)
    """
    v = check_vectors("lines", lines)
    return equal_area(v), np.asarray(v[..., 2] > 0)


def axes_of_points(points: ArrayLike) -> Array:
    """Return the unit axes on the lower hemisphere of net points (..., 2), shape (..., 3); ArgumentError outside the net.

    >>> axes_of_points([0.0, 1.0])
    array([0., 1., 0.])
    """
    p = check_finite("points", points)
    if p.ndim == 0 or p.shape[-1] != 2:
        raise ArgumentError(
            f"points: found shape {p.shape}; wanted (..., 2) as east, north on the net", hint="give two coordinates a point"
        )
    square = np.einsum("...k,...k->...", p, p)
    if (square > 1.0 + 1e-9).any():
        raise ArgumentError(
            f"points: found radius {np.sqrt(square.max()):g}; wanted at most 1", hint="scale so that the primitive has radius 1"
        )
    square = np.minimum(square, 1.0)[..., None]
    return np.concatenate([p * np.sqrt(2.0 - square), square - 1.0], -1)


def great_circles(normals: ArrayLike, count: int = 91) -> Array:
    """Return each plane's trace on the net as a polyline, shape (..., count, 2).

    It runs from the strike end of the normal given, through the dip line in the middle, to the other end; a level plane
    gives the primitive's eastern half, a vertical one a straight line.

    >>> great_circles([1.0, 0.0, 0.0], 3).round(12) + 0.0
    array([[ 0.,  1.],
           [ 0.,  0.],
           [ 0., -1.]])
    """
    n = unit(check_vectors("normals", normals))
    n = np.where(n[..., 2:] < 0, -n, n)
    along = strike_vectors(n)
    down = np.cross(along, n)
    pitch = np.linspace(0.0, np.pi, _check_count(count))[:, None]
    lines = np.cos(pitch) * along[..., None, :] + np.sin(pitch) * down[..., None, :]
    lines[..., 2] = np.minimum(lines[..., 2], 0.0)  # rounding must not lift an end over the primitive
    return equal_area(lines)


def small_circle(axis: ArrayLike, half_angle_deg: float, count: int = 121) -> list[Array]:
    """Return the cone about an axis (3,) as polylines on the net, each (K, 2), split where it crosses the primitive.

    A cone wholly below the horizontal, or wholly above it, is one closed line. Otherwise the second piece is the part above
    the horizontal, shown by its opposite lines on the other side of the net.

    >>> [len(line) for line in small_circle([0.0, 0.0, -1.0], 20.0, 61)]
    [61]
    >>> len(small_circle([0.0, 1.0, 0.0], 20.0))
    2
    """
    k = unit(check_vectors("axis", axis))
    angle = float(np.radians(check_range("half_angle_deg", half_angle_deg, 0.0, 90.0, "deg")))
    level = strike_vectors(k)  # horizontal and normal to the axis, so height depends on the sine of the turn alone
    steep = np.cross(k, level)
    reach = np.sin(angle) * steep[2]
    pieces = [(0.0, 2 * np.pi)]
    if abs(reach) > abs(np.cos(angle) * k[2]) > 0 or (k[2] == 0 and reach != 0):
        crossing = float(np.arcsin(-np.cos(angle) * k[2] / reach))
        pieces = [(crossing, np.pi - crossing), (np.pi - crossing, 2 * np.pi + crossing)]
    return [_arc(k, level, steep, angle, start, end, _check_count(count)) for start, end in pieces]


def _arc(k: Array, level: Array, steep: Array, angle: float, start: float, end: float, count: int) -> Array:
    """Return one piece of a cone on the net; all of it lies on one side of the horizontal."""
    turn = np.linspace(start, end, count)[:, None]
    lines = np.cos(angle) * k + np.sin(angle) * (np.cos(turn) * level + np.sin(turn) * steep)
    middle = lines[count // 2, 2]
    lines = -lines if middle > 0 else lines
    lines[:, 2] = np.minimum(lines[:, 2], 0.0)
    return equal_area(lines)


def _check_count(count: int) -> int:
    if count < 3:
        raise ArgumentError(f"count: found {count}; wanted 3 or more points", hint="90 points make a smooth curve")
    return int(count)
