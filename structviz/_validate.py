"""Checks of arguments: each names the argument it refuses and returns the clean array."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import ArgumentError


def check_vectors(name: str, values: ArrayLike) -> NDArray[np.float64]:
    """Return finite float64 vectors of shape (..., 3); raise ArgumentError otherwise."""
    array = np.asarray(values, dtype=float)
    if array.ndim == 0 or array.shape[-1] != 3:
        raise ArgumentError(
            f"{name}: found shape {array.shape}; wanted (..., 3) as easting, northing, up", hint="give three components a vector"
        )
    return check_finite(name, array)


def check_finite(name: str, values: ArrayLike) -> NDArray[np.float64]:
    """Return the values as float64; raise ArgumentError where any is NaN or infinite."""
    array = np.asarray(values, dtype=float)
    if not np.isfinite(array).all():
        raise ArgumentError(f"{name}: found NaN or infinite values; wanted finite numbers", hint=f"drop or mend those entries of {name}")
    return array


def check_range(name: str, values: ArrayLike, low: float, high: float, unit: str) -> NDArray[np.float64]:
    """Return finite float64 values within [low, high]; raise ArgumentError otherwise."""
    array = check_finite(name, values)
    outside = (array < low) | (array > high)
    if outside.any():
        worst = np.extract(outside, array)[0]
        raise ArgumentError(
            f"{name}: found {worst:g} {unit}; wanted {low:g} to {high:g} {unit}", hint=f"give {name} in {unit} within that range"
        )
    return array
