"""Surfaces that are one fault twice: the same sheet under two names, perhaps meshed anew."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from structviz.surfaces.surface import MeasuredSurface

Floats = NDArray[np.float64]

SAMPLES = 300  # triangles of a surface looked at
AREA_RATIO = 2.0  # surfaces that differ more in area are not one fault twice, but perhaps one in the other
PLANES_DEG = 20.0
COMMON_SIDE = 0.4  # boxes of one fault given twice have at least this share of each side in common


def covered_share(one: MeasuredSurface, other: MeasuredSurface, tolerance_m: float, tree: cKDTree | None = None) -> float:
    """Return the share of one surface's area, 0 to 1, that lies within a distance of another surface.

    Distances are taken from middles of triangles to the planes of the nearest triangles of the other, and across them no
    further than these reach. `tree` holds the middles of the other's triangles.
    """
    tree = tree or cKDTree(other.centroids)
    rows = np.unique(np.linspace(0, len(one.centroids) - 1, SAMPLES).astype(np.int64))
    _, nearest = tree.query(one.centroids[rows])
    away = one.centroids[rows] - other.centroids[nearest]
    off = np.abs((away * other.normals[nearest]).sum(1))
    along = np.sqrt(np.maximum((away**2).sum(1) - off**2, 0.0))
    reach = 2.0 * np.sqrt(other.areas_m2[nearest]) + tolerance_m
    near = (off <= tolerance_m) & (along <= reach)
    areas = one.areas_m2[rows]
    return float(areas[near].sum() / max(areas.sum(), 1e-300))


def twin_shares(surfaces: Sequence[MeasuredSurface], boxes: Floats, tolerance: float) -> list[tuple[int, int, float]]:
    """Return pairs of surfaces that may be one fault twice, each with the share of area that both have in common.

    `boxes` (F, 2, 3) are their lowest and highest corners, m; `tolerance` is in units of the square root of the smaller area.
    Only surfaces of like area whose planes are near each other are compared.
    """
    if len(surfaces) < 2:
        return []
    areas = np.array([each.area_m2 for each in surfaces])
    normals = np.array([each.normal for each in surfaces])
    first, second = np.triu_indices(len(surfaces), 1)
    reach = tolerance * np.sqrt(np.minimum(areas[first], areas[second]))[:, None]
    sides = boxes[:, 1] - boxes[:, 0]
    common = np.minimum(boxes[first, 1], boxes[second, 1]) - np.maximum(boxes[first, 0], boxes[second, 0])
    touch = (common + reach >= COMMON_SIDE * np.maximum(sides[first], sides[second])).all(1)
    alike = np.maximum(areas[first], areas[second]) <= AREA_RATIO * np.minimum(areas[first], areas[second])
    near = np.abs((normals[first] * normals[second]).sum(1)) >= np.cos(np.radians(PLANES_DEG))
    trees: dict[int, cKDTree] = {}
    found = []
    for i, j in zip(first[touch & alike & near].tolist(), second[touch & alike & near].tolist()):
        for k in (i, j):
            if k not in trees:
                trees[k] = cKDTree(surfaces[k].centroids)
        distance = tolerance * float(np.sqrt(min(areas[i], areas[j])))
        shares = covered_share(surfaces[i], surfaces[j], distance, trees[j]), covered_share(surfaces[j], surfaces[i], distance, trees[i])
        found.append((i, j, min(shares)))
    return found
