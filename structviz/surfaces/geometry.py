"""Areas, centroids, normals and second moments of triangles, and blocks of equal area; coordinates relative to any origin."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def areas_and_normals(corners: Floats) -> tuple[Floats, Floats]:
    """Return areas (T,) and unit normals (T, 3) by the winding of corners (T, 3, 3), in their unit; zero where the area is zero."""
    vector = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    twice = np.sqrt(np.einsum("tk,tk->t", vector, vector))
    # Below the rounding of its own coordinates a sliver has no normal.
    longest = np.abs(corners - corners[:, [1, 2, 0]]).max((1, 2))
    real = twice > 1e-12 * longest**2
    normal = np.divide(vector, twice[:, None], out=np.zeros_like(vector), where=real[:, None])
    return np.where(real, twice / 2, 0.0), normal


def moments(corners: Floats, areas: Floats) -> Floats:
    """Return the exact integrals over each triangle of 1, x and x x^T, shape (T, 10): area, first moments, xx xy xz yy yz zz.

    The second moment of a triangle about its centroid c is A/12 times the sum over its corners of (p - c)(p - c)^T.
    """
    centre = corners.mean(1)
    away = corners - centre[:, None]
    second = np.einsum("tik,til->tkl", away, away) / 12 + centre[:, :, None] * centre[:, None, :]
    rows, columns = np.triu_indices(3)
    return areas[:, None] * np.concatenate([np.ones((len(areas), 1)), centre, second[:, rows, columns]], 1)


def planes_of_moments(sums: Floats) -> Floats:
    """Return the unit normals (S, 3), of either sign, of the planes that fit summed moments (S, 10) best in least squares."""
    total = sums[:, 0]
    centre = sums[:, 1:4] / total[:, None]
    rows, columns = np.triu_indices(3)
    tensor = np.empty((len(sums), 3, 3))
    tensor[:, rows, columns] = sums[:, 4:] / total[:, None] - centre[:, rows] * centre[:, columns]
    tensor[:, columns, rows] = tensor[:, rows, columns]
    return np.linalg.eigh(tensor)[1][:, :, 0]


def blocks(places: Floats, areas: Floats, count: int) -> Integers:
    """Return the block of each triangle (T,), about `count` blocks of equal area in rows and columns along the surface.

    The rows follow the longest extent, found from the points themselves, so that neither the order of the triangles nor the
    frame matters. Blocks may be empty where there are fewer triangles than blocks.
    """
    total = areas.sum()
    middle = areas @ places / total
    offset = places - middle
    spread, axes = np.linalg.eigh(np.einsum("t,tk,tl->kl", areas / total, offset, offset))
    lead = np.abs(axes).argmax(0)
    axes = axes * np.sign(axes[lead, np.arange(3)])
    along, across = offset @ axes[:, 2], offset @ axes[:, 1]
    aspect = np.sqrt(max(spread[2], 1e-300) / max(spread[1], spread[2] * 1e-4, 1e-300))
    slabs = int(np.clip(round(np.sqrt(count * aspect)), 1, count))
    rows = max(1, round(count / slabs))
    slab = _equal_shares(np.lexsort((across, along)), areas, slabs)
    return slab * rows + _shares_within(slab, across, along, areas, rows)


def _equal_shares(order: Integers, areas: Floats, count: int) -> Integers:
    ranked = areas[order]
    middle = np.cumsum(ranked) - ranked / 2
    share = np.empty(len(order), np.int64)
    share[order] = np.clip((middle / ranked.sum() * count).astype(np.int64), 0, count - 1)
    return share


def _shares_within(slab: Integers, across: Floats, along: Floats, areas: Floats, rows: int) -> Integers:
    order = np.lexsort((along, across, slab))
    ranked, slab_ranked = areas[order], slab[order]
    sums = np.bincount(slab_ranked, ranked)
    before = np.concatenate([[0.0], np.cumsum(sums)[:-1]])
    middle = np.cumsum(ranked) - ranked / 2 - before[slab_ranked]
    row = np.empty(len(order), np.int64)
    row[order] = np.clip((middle / np.maximum(sums[slab_ranked], 1e-300) * rows).astype(np.int64), 0, rows - 1)
    return row
