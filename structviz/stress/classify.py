"""What a stress is called: class by plunges, azimuth of the greatest horizontal compression, A_phi."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_range
from structviz.orientation.vectors import Array, check_matrices

KINDS = ("normal", "normal-oblique", "strike-slip", "reverse-oblique", "reverse", "undefined")


def kinds_of_plunges(s1_plunge_deg: ArrayLike, s2_plunge_deg: ArrayLike, s3_plunge_deg: ArrayLike) -> NDArray[np.str_]:
    """Return the class word of each set of plunges, degrees [0, 90], shape (...); the words are KINDS [zoback1992].

    Plunges on an edge of the table belong to the named class. They are rounded to 1e-9 degrees first, so that an edge
    reached through sines and cosines is still an edge.

    >>> str(kinds_of_plunges(52.0, 12.9, 35.0)), str(kinds_of_plunges(45.0, 0.0, 45.0))
    ('normal', 'undefined')
    """
    plunges = (s1_plunge_deg, s2_plunge_deg, s3_plunge_deg)
    s1, s2, s3 = (np.round(check_range(f"s{i + 1}_plunge_deg", p, 0.0, 90.0, "deg"), 9) for i, p in enumerate(plunges))
    rules = [
        (s1 >= 52) & (s3 <= 35),
        (s1 >= 40) & (s1 < 52) & (s3 <= 20),
        (s2 >= 45) & (((s1 < 40) & (s3 <= 20)) | ((s1 <= 20) & (s3 < 40))),
        (s1 <= 20) & (s3 >= 40) & (s3 < 52),
        (s1 <= 35) & (s3 >= 52),
    ]
    return np.select(rules, [np.array(word) for word in KINDS[:5]], default=KINDS[5])


def kinds(axes: ArrayLike) -> NDArray[np.str_]:
    """Return the class word of each frame of unit rows sigma1, sigma2, sigma3 (..., 3, 3), shape (...) [zoback1992].

    >>> str(kinds([[0, 0, 1], [0, 1, 0], [1, 0, 0]])), str(kinds([[0, 1, 0], [0, 0, 1], [1, 0, 0]]))
    ('normal', 'strike-slip')
    """
    frame = check_matrices("axes", axes)
    plunges = np.degrees(np.arctan2(np.abs(frame[..., 2]), np.hypot(frame[..., 0], frame[..., 1])))
    return kinds_of_plunges(plunges[..., 0], plunges[..., 1], plunges[..., 2])


def shmax_deg(axes: ArrayLike, shape_ratio: ArrayLike) -> Array:
    """Return the azimuth of the greatest horizontal compression, degrees in [0, 180), shape (...) [lund2007].

    It is the greater axis of the horizontal part of the whole tensor, not the trend of sigma1. NaN where every horizontal
    direction carries the same stress (sigma1 vertical and R = 0, or sigma3 vertical and R = 1).

    Notes
    -----
    tan 2a = 2 (s1N s1E + R s2N s2E) / (s1N^2 - s1E^2 + R (s2N^2 - s2E^2)), R = (sigma2 - sigma3)/(sigma1 - sigma3); the source
    writes 1 - R for this R.

    >>> float(shmax_deg([[0, 1, 0], [0, 0, 1], [1, 0, 0]], 0.5))
    0.0
    """
    frame = check_matrices("axes", axes)
    ratio = check_range("shape_ratio", shape_ratio, 0.0, 1.0, "(no unit)")
    east, north = frame[..., :2, 0], frame[..., :2, 1]
    product, difference = 2 * east * north, north**2 - east**2
    up = product[..., 0] + ratio * product[..., 1]
    across = difference[..., 0] + ratio * difference[..., 1]
    azimuth = np.degrees(np.arctan2(up, across)) / 2 % 180.0
    azimuth = np.where(azimuth >= 180.0, 0.0, azimuth)
    return np.where(np.hypot(up, across) < 1e-12, np.nan, azimuth)


def a_phi(axes: ArrayLike, shape_ratio: ArrayLike) -> Array:
    """Return A_phi in [0, 3], shape (...): 0-1 normal, 1-2 strike-slip, 2-3 reverse, continuous between [simpson1997].

    The axis nearest to vertical counts as the vertical one: n = 0 where it is sigma1, 1 where sigma2, 2 where sigma3;
    A_phi = n + 0.5 + (-1)^n (R - 0.5).

    >>> float(a_phi([[0, 1, 0], [0, 0, 1], [1, 0, 0]], 0.75))
    1.25
    """
    ratio = check_range("shape_ratio", shape_ratio, 0.0, 1.0, "(no unit)")
    n = np.abs(check_matrices("axes", axes)[..., 2]).argmax(-1)
    return n + 0.5 + np.where(n == 1, -1.0, 1.0) * (ratio - 0.5)
