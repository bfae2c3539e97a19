"""Areas, centroids, normals and second moments of triangles, and blocks of equal area; coordinates relative to any origin."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def areas_and_normals(corners: Floats, rounding: float = 0.0) -> tuple[Floats, Floats]:
    """Return areas (T,) and unit normals (T, 3) by the winding of corners (T, 3, 3), in their unit; zero where the area is zero.

    A sliver whose height is within `rounding`, the last digit of the coordinates as they were read, has no area.
    """
    a = (corners[:, 1] - corners[:, 0]).T
    b = (corners[:, 2] - corners[:, 0]).T
    vector = np.stack([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])
    twice = np.sqrt(vector[0] ** 2 + vector[1] ** 2 + vector[2] ** 2)
    square = np.maximum(a[0] ** 2 + a[1] ** 2 + a[2] ** 2, b[0] ** 2 + b[1] ** 2 + b[2] ** 2)
    real = twice > np.maximum(1e-12 * square, rounding * np.sqrt(square))
    normal = np.divide(vector, twice, out=np.zeros_like(vector), where=real)
    return np.where(real, twice / 2, 0.0), np.ascontiguousarray(normal.T)


def middles(corners: Floats) -> Floats:
    """Return the centroids (T, 3) of triangles (T, 3, 3); three sums are faster than a mean over a short axis."""
    return (corners[:, 0] + corners[:, 1] + corners[:, 2]) / 3.0


def moments(corners: Floats, areas: Floats) -> Floats:
    """Return the exact integrals over each triangle of 1, x and x x^T, shape (10, T): area, first moments, xx xy xz yy yz zz.

    Over a triangle of area A with corners p the integral of x x^T is A/12 (sum of p p^T + s s^T), s the sum of the corners.
    """
    p = np.ascontiguousarray(corners.reshape(-1, 9).T).reshape(3, 3, -1)  # corner, coordinate, triangle
    total = p[0] + p[1] + p[2]
    out = np.empty((10, len(areas)))
    out[0] = areas
    out[1:4] = areas / 3 * total
    twelfth = areas / 12
    for row, (i, j) in enumerate(zip(*np.triu_indices(3), strict=True)):
        out[4 + row] = twelfth * (p[0, i] * p[0, j] + p[1, i] * p[1, j] + p[2, i] * p[2, j] + total[i] * total[j])
    return out


def planes_of_moments(sums: Floats) -> Floats:
    """Return the unit normals (S, 3), of either sign, of the planes that fit summed moments (S, 10) best in least squares."""
    total = sums[:, 0]
    centre = sums[:, 1:4] / total[:, None]
    rows, columns = np.triu_indices(3)
    tensor = np.empty((len(sums), 3, 3))
    tensor[:, rows, columns] = sums[:, 4:] / total[:, None] - centre[:, rows] * centre[:, columns]
    tensor[:, columns, rows] = tensor[:, rows, columns]
    return np.linalg.eigh(tensor)[1][:, :, 0]


def pieces(corners: Floats, areas: Floats, count: int) -> tuple[Floats, Floats, Integers]:
    """Return triangles none larger than a `count`-th of the whole: corners (Q, 3, 3), areas (Q,), and the row each was cut from (Q,).

    Large triangles are cut into n x n of their own shape, so that a fault drawn with two triangles has as many places to
    stand on as the same fault drawn with thousands. At most 2 (T + count) pieces come out.
    """
    times = np.ceil(np.sqrt(areas * (count / areas.sum())) - 1e-6).clip(1).astype(np.int64)
    large = np.unique(times[times > 1])
    if not large.size:
        return corners, areas, np.arange(len(areas))
    whole = np.flatnonzero(times == 1)
    cut, rows = [corners[whole]], [whole]
    for n in large.tolist():
        parents = np.flatnonzero(times == n)
        cut.append(np.einsum("qkc,tcx->tqkx", _cuts(n), corners[parents]).reshape(-1, 3, 3))
        rows.append(np.repeat(parents, n * n))
    row = np.concatenate(rows)
    return np.concatenate(cut), areas[row] / times[row] ** 2, row


def _cuts(n: int) -> Floats:
    """Return the corners of n x n congruent pieces of a triangle as shares of its corners, shape (n n, 3, 3)."""
    i, j = (grid.ravel() for grid in np.meshgrid(np.arange(n), np.arange(n), indexing="ij"))
    upright, inverted = i + j < n, i + j < n - 1
    one = [np.stack([(i + di)[upright], (j + dj)[upright]], 1) for di, dj in ((0, 0), (1, 0), (0, 1))]
    two = [np.stack([(i + di)[inverted], (j + dj)[inverted]], 1) for di, dj in ((1, 0), (1, 1), (0, 1))]
    share = np.concatenate([np.stack(one, 1), np.stack(two, 1)]) / n
    return np.concatenate([1.0 - share.sum(2, keepdims=True), share], 2)


def surface_coordinates(places: Floats, areas: Floats) -> tuple[Floats, Floats, float]:
    """Return coordinates along the longest and the second extent of a surface, (T,) each, and the ratio of the two extents.

    The extents are found from the points themselves, so that neither the order of the triangles nor the frame matters.
    """
    share = areas / areas.sum()
    offset = places - share @ places
    spread, axes = np.linalg.eigh((offset * share[:, None]).T @ offset)
    lead = np.abs(axes).argmax(0)
    axes = axes * np.sign(axes[lead, np.arange(3)])
    return offset @ axes[:, 2], offset @ axes[:, 1], float(np.sqrt(spread[2] / max(spread[1], spread[2] * 1e-4, 1e-300)))


def blocks(places: Floats, areas: Floats, count: int) -> Integers:
    """Return the block of each triangle (T,), 0 to count - 1: blocks of equal area in slabs along the surface and rows across them.

    Slabs hold whole rows, so some are one row wider than others. A block may be empty where triangles are larger than a
    third of it.
    """
    along, across, aspect = surface_coordinates(places, areas)
    slabs = int(np.clip(round(np.sqrt(count * aspect)), 1, count))
    bounds = np.arange(slabs + 1) * count // slabs  # blocks before each slab
    # The small part of the other coordinate settles ties on regular meshes.
    rank = _passed(np.argsort(along + 1e-6 * across, kind="stable"), areas) / areas.sum()
    slab = np.searchsorted(bounds, rank * count, side="right").clip(1, slabs) - 1
    inner_key = across + 1e-6 * along
    # One key for both sorts the rows within each slab, at half the price.
    order = np.argsort(slab * (2.0 * np.ptp(inner_key) + 1e-300) + inner_key, kind="stable")
    size = np.bincount(slab, areas, minlength=slabs)
    before = np.concatenate([[0.0], np.cumsum(size)[:-1]])
    inner = (_passed(order, areas) - before[slab]) / np.maximum(size, 1e-300)[slab]
    rows = np.diff(bounds)[slab]
    return bounds[slab] + np.clip((inner * rows).astype(np.int64), 0, rows - 1)


def _passed(order: Integers, areas: Floats) -> Floats:
    """Return the area that lies before the middle of each triangle in an order."""
    ranked = areas[order]
    middle = np.empty(len(order))
    middle[order] = np.cumsum(ranked) - ranked / 2
    return middle


def panels(places: Floats, areas: Floats, count: int) -> Integers:
    """Return the panel of each triangle (T,): about `count` panels of equal extent, some of which may be empty. Faster than blocks."""
    along, across, aspect = surface_coordinates(places, areas)
    slabs = int(np.clip(round(np.sqrt(count * aspect)), 1, count))
    rows = max(1, round(count / slabs))
    return _bins(along, slabs) * rows + _bins(across, rows)


def _bins(values: Floats, count: int) -> Integers:
    low, high = values.min(), values.max()
    return np.clip(((values - low) / max(high - low, 1e-300) * count).astype(np.int64), 0, count - 1)
