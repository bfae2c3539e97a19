"""Surfaces made small for the page: vertices snapped to a grid where there are too many triangles, and places as whole steps.

Only the drawing is made small. Every value shown for a triangle is that of one triangle of the model, and no number of the result
is touched.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

STEPS = 8_191  # of a place along each side of the box of its surface: 0.6 m on a fault of 5 km, less than is seen


@dataclass(frozen=True, eq=False)
class Drawn:
    """A surface as the page draws it."""

    vertices: Floats  # (V, 3) m
    triangles: Integers  # (T, 3)
    source: Integers  # (T,) triangle of the model that each drawn one stands for
    tolerance_m: float  # no vertex moved by more; 0 where none moved


def drawn_surfaces(surfaces: Sequence[Surface], most: int) -> tuple[Drawn, ...]:
    """Return the surfaces with about `most` triangles altogether, each in proportion; as they are where there are no more."""
    total = sum(len(surface.triangles) for surface in surfaces)
    if total <= most:
        return tuple(_whole(surface) for surface in surfaces)
    return tuple(_to_share(surface, most / total) for surface in surfaces)


def _whole(surface: Surface) -> Drawn:
    used, renumbered = np.unique(surface.triangles, return_inverse=True)
    return Drawn(surface.vertices[used], renumbered.reshape(-1, 3), np.arange(len(surface.triangles)), 0.0)


def _to_share(surface: Surface, share: float) -> Drawn:
    """Return a surface with about a share of its triangles: a grid of cells whose faces are that much larger."""
    corners = surface.vertices[surface.triangles]
    areas = np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1) / 2
    cell = np.sqrt(2.4 * areas.sum() / max(share * len(areas), 1))  # 2 for a level surface; cells are cut aslant by others
    found = clustered(surface, cell)
    return found if len(found.triangles) else _whole(surface)


def clustered(surface: Surface, cell_m: float) -> Drawn:
    """Return the surface with all vertices of a cubic cell drawn to the one nearest their mean; triangles that collapse are left out."""
    cells = np.floor((surface.vertices - surface.vertices.min(0)) / cell_m).astype(np.int64)
    size = cells.max(0) + 1
    keys = (cells[:, 0] * size[1] + cells[:, 1]) * size[2] + cells[:, 2]
    _, member, counts = np.unique(keys, return_inverse=True, return_counts=True)
    means = np.stack([np.bincount(member, surface.vertices[:, k]) for k in range(3)], 1) / counts[:, None]
    away = np.linalg.norm(surface.vertices - means[member], axis=1)
    order = np.lexsort((away, member))
    chosen = order[np.concatenate([[0], np.cumsum(counts)[:-1]])]
    triangles = member[surface.triangles]
    a, b, c = triangles.T
    kept = np.flatnonzero((a != b) & (b != c) & (c != a))
    low, middle, high = np.sort(triangles[kept], 1).T
    _, first = np.unique((low * len(counts) + middle) * len(counts) + high, return_index=True)  # below 2**63 up to two million places
    kept = kept[np.sort(first)]
    moved = np.linalg.norm(surface.vertices - surface.vertices[chosen][member], axis=1)
    used, renumbered = np.unique(triangles[kept], return_inverse=True)
    return Drawn(surface.vertices[chosen[used]], renumbered.reshape(-1, 3), kept, float(moved.max(initial=0.0)))


def quantised(vertices: Floats) -> tuple[NDArray[np.uint16], Floats, Floats]:
    """Return places as steps (V, 3), the corner of their box (3,) m and the length of a step along each axis (3,) m."""
    low = vertices.min(0)
    step = (vertices.max(0) - low) / STEPS
    steps = np.divide(vertices - low, step, out=np.zeros_like(vertices), where=step > 0)
    return np.rint(steps).astype(np.uint16), low, step
