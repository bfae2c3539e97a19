"""Lines: trend and plunge, plunge positive down; axes are undirected and shown on the lower hemisphere."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_finite, check_vectors
from structviz.orientation.vectors import Array, unit


def vectors(trend_deg: ArrayLike, plunge_deg: ArrayLike) -> Array:
    """Return unit vectors of directed lines, shape (..., 3); a negative plunge points up.

    >>> vectors(90.0, 0.0).round(9) + 0.0
    array([1., 0., 0.])
    """
    trend, plunge = np.radians(check_finite("trend_deg", trend_deg)), np.radians(check_finite("plunge_deg", plunge_deg))
    flat = np.cos(plunge)
    return np.stack(np.broadcast_arrays(flat * np.sin(trend), flat * np.cos(trend), -np.sin(plunge)), -1)


def trend_plunge_deg(axes: ArrayLike) -> tuple[Array, Array]:
    """Return trend [0, 360) and plunge [0, 90] of undirected axes on the lower hemisphere, degrees, shape (...) each.

    >>> trend, plunge = trend_plunge_deg([0.0, -1.0, 1.0])
    >>> round(float(trend), 9), round(float(plunge), 9)
    (0.0, 45.0)
    """
    v = unit(check_vectors("axes", axes))
    v = np.where(v[..., 2:] > 0, -v, v)
    flat = np.hypot(v[..., 0], v[..., 1])
    trend = np.degrees(np.arctan2(v[..., 0], v[..., 1])) % 360.0
    trend = np.where((flat < 1e-12) | (trend >= 360.0), 0.0, trend)
    return trend, np.degrees(np.arctan2(-v[..., 2], flat)) + 0.0
