"""Areas, centroids, normals and second moments of triangles, and blocks of equal area; coordinates relative to any origin."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def areas_and_normals(corners: Floats) -> tuple[Floats, Floats]:
    """Return areas (T,) and unit normals (T, 3) by the winding of corners (T, 3, 3), in their unit; zero where the area is zero."""
    a = (corners[:, 1] - corners[:, 0]).T
    b = (corners[:, 2] - corners[:, 0]).T
    vector = np.stack([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])
    twice = np.sqrt(vector[0] ** 2 + vector[1] ** 2 + vector[2] ** 2)
    # Below the rounding of its own coordinates a sliver has no normal.
    real = twice > 1e-12 * np.maximum(a[0] ** 2 + a[1] ** 2 + a[2] ** 2, b[0] ** 2 + b[1] ** 2 + b[2] ** 2)
    normal = np.divide(vector, twice, out=np.zeros_like(vector), where=real)
    return np.where(real, twice / 2, 0.0), np.ascontiguousarray(normal.T)


def moments(corners: Floats, areas: Floats) -> Floats:
    """Return the exact integrals over each triangle of 1, x and x x^T, shape (T, 10): area, first moments, xx xy xz yy yz zz.

    Over a triangle of area A with corners p the integral of x x^T is A/12 (sum of p p^T + s s^T), s the sum of the corners.
    """
    p = np.ascontiguousarray(corners.transpose(1, 2, 0))  # corner, coordinate, triangle
    total = p.sum(0)
    out = np.empty((10, len(areas)))
    out[0] = areas
    out[1:4] = areas / 3 * total
    for column, (i, j) in enumerate(zip(*np.triu_indices(3), strict=True)):
        out[4 + column] = areas / 12 * (p[0, i] * p[0, j] + p[1, i] * p[1, j] + p[2, i] * p[2, j] + total[i] * total[j])
    return np.ascontiguousarray(out.T)


def planes_of_moments(sums: Floats) -> Floats:
    """Return the unit normals (S, 3), of either sign, of the planes that fit summed moments (S, 10) best in least squares."""
    total = sums[:, 0]
    centre = sums[:, 1:4] / total[:, None]
    rows, columns = np.triu_indices(3)
    tensor = np.empty((len(sums), 3, 3))
    tensor[:, rows, columns] = sums[:, 4:] / total[:, None] - centre[:, rows] * centre[:, columns]
    tensor[:, columns, rows] = tensor[:, rows, columns]
    return np.linalg.eigh(tensor)[1][:, :, 0]


def surface_coordinates(places: Floats, areas: Floats) -> tuple[Floats, Floats, float]:
    """Return coordinates along the longest and the second extent of a surface, (T,) each, and the ratio of the two extents.

    The extents are found from the points themselves, so that neither the order of the triangles nor the frame matters.
    """
    share = areas / areas.sum()
    offset = places - np.einsum("t,tk->k", share, places)
    spread, axes = np.linalg.eigh(np.einsum("t,tk,tl->kl", share, offset, offset, optimize=True))
    lead = np.abs(axes).argmax(0)
    axes = axes * np.sign(axes[lead, np.arange(3)])
    along, across = np.einsum("tk,k->t", offset, axes[:, 2]), np.einsum("tk,k->t", offset, axes[:, 1])
    return along, across, float(np.sqrt(spread[2] / max(spread[1], spread[2] * 1e-4, 1e-300)))


def blocks(places: Floats, areas: Floats, count: int) -> Integers:
    """Return the block of each triangle (T,), about `count` blocks of equal area in rows and columns along the surface.

    Blocks may be empty where there are fewer triangles than blocks.
    """
    along, across, aspect = surface_coordinates(places, areas)
    slabs = int(np.clip(round(np.sqrt(count * aspect)), 1, count))
    rows = max(1, round(count / slabs))
    # One key a sort is faster than two; the small part of the other coordinate settles ties on regular meshes.
    slab = _equal_shares(np.argsort(along + 1e-6 * across), areas, slabs)
    width = 4 * (np.abs(across).max() + 1e-6 * np.abs(along).max()) + 1e-300
    order = np.argsort(slab * width + across + 1e-6 * along)
    return slab * rows + _shares_within(slab, order, areas, rows)


def _equal_shares(order: Integers, areas: Floats, count: int) -> Integers:
    ranked = areas[order]
    middle = np.cumsum(ranked) - ranked / 2
    share = np.empty(len(order), np.int64)
    share[order] = np.clip((middle / ranked.sum() * count).astype(np.int64), 0, count - 1)
    return share


def _shares_within(slab: Integers, order: Integers, areas: Floats, rows: int) -> Integers:
    ranked, slab_ranked = areas[order], slab[order]
    sums = np.bincount(slab_ranked, ranked)
    before = np.concatenate([[0.0], np.cumsum(sums)[:-1]])
    middle = np.cumsum(ranked) - ranked / 2 - before[slab_ranked]
    row = np.empty(len(order), np.int64)
    row[order] = np.clip((middle / np.maximum(sums[slab_ranked], 1e-300) * rows).astype(np.int64), 0, rows - 1)
    return row


def panels(places: Floats, areas: Floats, count: int) -> Integers:
    """Return the panel of each triangle (T,): about `count` panels of equal extent, some of which may be empty. Faster than blocks."""
    along, across, aspect = surface_coordinates(places, areas)
    slabs = int(np.clip(round(np.sqrt(count * aspect)), 1, count))
    rows = max(1, round(count / slabs))
    return _bins(along, slabs) * rows + _bins(across, rows)


def _bins(values: Floats, count: int) -> Integers:
    low, high = values.min(), values.max()
    return np.clip(((values - low) / max(high - low, 1e-300) * count).astype(np.int64), 0, count - 1)
