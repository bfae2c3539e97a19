"""Horizons that faults displace: the slip dies out towards the tip of each fault and away from it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.orientation.planes import strike_vectors
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

REACH = 0.25  # of the fault length: distance in which the displacement falls to 1/e
GAP_M = 4.0  # a triangle across a jump of more than this is left out, as in a horizon cut at its faults


@dataclass(frozen=True, eq=False)
class Slipped:
    """A fault that moved: its surface, the frame of its mean plane, and its greatest slip."""

    surface: Surface
    normal: Floats  # (3,) unit, hanging-wall side
    slip: Floats  # (3,) of the hanging wall against the foot wall at the centre, m


@dataclass(frozen=True, eq=False)
class Moved:
    """What one fault does to places: displacement (K, 3) m, side (K,) +1 in the hanging wall, and jump (K,) of up there, m."""

    displacement_m: Floats
    side: Floats
    jump_m: Floats


def displaced_horizon(
    name: str, shape: tuple[float, float, float], box: ArrayLike, spacing_m: float, faults: tuple[Slipped, ...]
) -> Surface:
    """Return a gently folded horizon after the slip of the faults, with gaps where it is cut.

    Parameters
    ----------
    shape : up at the middle of the box, m; dip to the east, degrees; height of the folds, m.
    box : ((west, east), (south, north)), m.
    """
    (west, east), (south, north) = np.asarray(box, float)
    grid = np.meshgrid(np.arange(west, east + 1, spacing_m), np.arange(south, north + 1, spacing_m), indexing="ij")
    east_m, north_m = grid[0].ravel(), grid[1].ravel()
    middle = ((west + east) / 2, (south + north) / 2)
    places = np.stack([east_m, north_m, _undisturbed(east_m, north_m, middle, shape)], -1)
    moves = [moved(fault, places) for fault in faults]
    total = sum((move.displacement_m for move in moves), np.zeros_like(places))
    # What lies at a place now came from where its displacement started.
    up = _undisturbed(east_m - total[:, 0], north_m - total[:, 1], middle, shape) + total[:, 2]
    triangles = _cut(_triangles(grid[0].shape), moves)
    used, rows = np.unique(triangles, return_inverse=True)
    vertices = np.stack([east_m, north_m, up], -1)[used].round(2)
    return Surface(name, vertices, rows.reshape(-1, 3), f"synthetic {name}")


def moved(fault: Slipped, places: Floats) -> Moved:
    """Return what one fault does to the places (K, 3): half of the slip on either side, fading to the tip and with distance.

    The profile is the ellipse-like (1 - r^2) of the distance r from the centre to the tip, in shares of the half axes.
    """
    vertices = fault.surface.vertices
    along = strike_vectors(fault.normal)
    frame = np.stack([along, np.cross(fault.normal, along), fault.normal])
    centre = (vertices.min(0) + vertices.max(0)) / 2
    own, local = (vertices - centre) @ frame.T, (places - centre) @ frame.T
    half = np.abs(own[:, :2]).max(0)
    w = local[:, 2] - _height(own, local[:, :2])
    side = np.where(w >= 0, 1.0, -1.0)
    profile = np.clip(1.0 - ((local[:, :2] / half) ** 2).sum(-1), 0.0, None)
    amount = 0.5 * profile * np.exp(-np.abs(w) / (REACH * 2 * half[0]))
    return Moved((side * amount)[:, None] * fault.slip, side, profile * abs(fault.slip[2]))


def _height(own: Floats, at: Floats) -> Floats:
    """Return the height of a surface over its mean plane at points of that plane, from its three nearest vertices."""
    from scipy.spatial import cKDTree

    distance, near = cKDTree(own[:, :2]).query(at, k=3)
    weight = 1.0 / np.maximum(distance, 1.0)
    return np.asarray((weight * own[near, 2]).sum(-1) / weight.sum(-1))


def _undisturbed(east_m: Floats, north_m: Floats, middle: tuple[float, float], shape: tuple[float, float, float]) -> Floats:
    """Return up of the horizon before faulting, m."""
    up, dip_deg, fold_m = shape
    x, y = east_m - middle[0], north_m - middle[1]
    folds = np.sin(2 * np.pi * (x + 0.4 * y) / 17_000.0) * np.cos(2 * np.pi * y / 23_000.0)
    return np.asarray(up - np.tan(np.radians(dip_deg)) * x + fold_m * folds)


def _triangles(shape: tuple[int, int]) -> Integers:
    """Return the triangles of a grid, facing up, shape (T, 3)."""
    number = np.arange(shape[0] * shape[1]).reshape(shape)
    a, b, c, d = (part.ravel() for part in (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]))
    return np.concatenate([np.stack([a, b, c], -1), np.stack([a, c, d], -1)])


def _cut(triangles: Integers, moves: list[Moved]) -> Integers:
    """Return the triangles but for those that span a fault where it throws the horizon."""
    keep = np.ones(len(triangles), bool)
    for move in moves:
        side = move.side[triangles]
        keep &= (side == side[:, :1]).all(1) | (move.jump_m[triangles].min(1) < GAP_M)
    return triangles[keep]
