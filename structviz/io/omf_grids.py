"""Surfaces of OMF that are grids: a corner, two axes with widths of cells, and offsets square to both."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

CLEARLY = 2.0  # times rougher, for the order of offsets to be certain


class NotRead(Exception):
    """A surface is not read; the words say why."""


def grid_surface(
    origin: NDArray[np.float64],
    axes: tuple[NDArray[np.float64], NDArray[np.float64]],
    widths: tuple[NDArray[np.float64], NDArray[np.float64]],
    offsets: NDArray[np.float64] | None,
) -> tuple[NDArray[np.float64], NDArray[np.int64], str]:
    """Return vertices (V, 3) and triangles (T, 3) of a grid, and in words how its offsets run; NotRead where that cannot be known."""
    along_u, along_v = (np.concatenate([[0.0], np.cumsum(width)]) for width in widths)
    shape = (len(along_u), len(along_v))
    nodes = along_u[:, None, None] * axes[0] + along_v[None, :, None] * axes[1]
    words = f"grid of {shape[0]} x {shape[1]} nodes split into triangles"
    if offsets is not None:
        laid, order = laid_out(offsets, shape)
        nodes = nodes + laid[:, :, None] * np.cross(*axes)
        words += order
    number = np.arange(shape[0] * shape[1]).reshape(shape)
    a, b, c, d = (block.ravel() for block in (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]))
    return nodes.reshape(-1, 3) + origin, np.stack([a, b, c, a, c, d], axis=1).reshape(-1, 3), words


def laid_out(offsets: NDArray[np.float64], shape: tuple[int, int]) -> tuple[NDArray[np.float64], str]:
    """Return offsets by node (U, V), and in words the order they were in.

    The format does not state which axis runs fastest. In the wrong order a smooth surface becomes ragged, so the smoother is taken
    where it is clearly so; NotRead where it is not, as on a square grid.
    """
    first, second = offsets.reshape(shape), offsets.reshape(shape[::-1]).T
    if np.array_equal(first, second, equal_nan=True):
        return first, ""
    rounding = 1e-28 * float((offsets**2).sum())  # of second differences of a plane
    rough = [roughness(laid) + rounding for laid in (first, second)]
    if not max(rough) >= CLEARLY * min(rough):
        raise NotRead("the order of its offsets is not stated and cannot be known")
    return (first, ", offsets along v first") if rough[0] < rough[1] else (second, ", offsets along u first")


def roughness(offsets: NDArray[np.float64]) -> float:
    """Return the sum of squared second differences along both axes, NaN where it is not finite."""
    return float(sum((np.diff(offsets, n=2, axis=axis) ** 2).sum() for axis in (0, 1)))
