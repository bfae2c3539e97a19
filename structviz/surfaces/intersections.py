"""Where triangulated surfaces meet: the lines along which they cross, or along which one ends on another.

A rim rarely ends exactly on the surface it was drawn to: it is taken to reach half an edge beyond itself, so that small gaps
count as meeting. All surfaces are searched at once through a grid, so that the work grows with the triangles near others.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Rims = dict[int, tuple[cKDTree, Floats] | None]  # by surface: the middles of its rim edges, and how near to each is along it

REACH = 0.5  # of an edge: how far a rim is taken to reach beyond itself
ENDS_SHARE = 0.5  # of a line: where more of it lies along the rim of one surface, that one ends on the other
DRAWN_SHARE = 0.5  # of a line: where the surfaces themselves meet along more of it, that alone is the line
MOST_PLACES = 50  # along one edge of a rim
SAMPLES = 200  # places of a line looked at to decide that
REACH_OF_SIZE = 0.02  # of the square root of a surface's area, and no further: edges of coarse surfaces are kilometres long
WIDE_QUANTILE = 0.99
MOST_CELLS = 8_000_000  # of the coarse grid
FINER, LEVELS = 3.0, 9  # grids of cells, each so many times finer than the one before
MOST_PAIRS = 4_000_000  # pairs of triangles tested at a time


@dataclass(frozen=True, eq=False)
class Meeting:
    """Two surfaces that meet, by their numbers, and along which line."""

    surfaces: tuple[int, int]  # where one ends on the other, that one first
    kind: str  # "crosses" | "ends on"
    segments: Floats  # (N, 2, 3) m, in no order
    length_m: float


def meetings(surfaces: Sequence[tuple[Floats, Integers]]) -> tuple[Meeting, ...]:
    """Return where surfaces, each vertices (V, 3) m and triangles (T, 3), meet; by the numbers of the surfaces."""
    if len(surfaces) < 2:
        return ()
    corners, owner, kept = _near_others([vertices[triangles] for vertices, triangles in surfaces])
    if not len(owner):
        return ()
    strips, strip_owner = _rim_strips(surfaces, kept)
    everything, owners = np.concatenate([corners, strips]), np.concatenate([owner, strip_owner])
    origin = everything.mean((0, 1))
    first, second = _candidates(everything - origin, owners)
    segments, rows = _segments(everything - origin, first, second)
    pairs = np.sort(np.stack([owners[first[rows]], owners[second[rows]]], 1), axis=1)
    drawn = np.maximum(first[rows], second[rows]) < len(corners)  # between triangles that are there, not their strips
    return tuple(_meetings(segments + origin, pairs, drawn, surfaces))


def _near_others(corners: Sequence[Floats]) -> tuple[Floats, Integers, list[Integers]]:
    """Return the triangles (N, 3, 3) that have another surface near them, their surfaces, and the kept rows of each surface.

    Middles of triangles mark the cells of a coarse grid, wide as nearly all triangles; a cell is busy where two surfaces mark it
    or cells beside it. The few triangles wider than a cell are always kept, and mark every cell of their boxes.
    """
    whole = np.concatenate(list(corners))
    owner = np.repeat(np.arange(len(corners)), [len(each) for each in corners])
    low, high = _boxes(whole)
    size = (high - low).max(1)
    start = low.min(0)
    extent = np.maximum(high.max(0) - start, 1e-9)
    cell = max(min(float(size.max()), 4 * float(np.quantile(size, WIDE_QUANTILE))), 1e-9)
    cell = max(cell, float((extent.prod() / MOST_CELLS) ** (1 / 3)), float(extent.max()) / 1000)
    shape = (extent // cell).astype(np.int64) + 1
    wide = size > cell
    keys = _keyed((((low + high) / 2 - start) / cell).astype(np.int64), shape)
    least, most = np.full(int(shape.prod()), len(corners), np.int32), np.full(int(shape.prod()), -1, np.int32)
    least[keys[::-1]], most[keys] = owner[::-1], owner  # of marks in one cell the last one written stays: the lowest, the highest number
    least, most = least.reshape(shape), most.reshape(shape)
    for row in np.flatnonzero(wide):
        first, last = (((corner[row] - start) / cell).astype(np.int64) for corner in (low, high))
        box = tuple(slice(f, to + 1) for f, to in zip(first, last))
        least[box], most[box] = np.minimum(least[box], owner[row]), np.maximum(most[box], owner[row])
    busy = (_spread(least, np.minimum) < _spread(most, np.maximum)).ravel()
    keep = busy[keys] | wide
    starts = np.cumsum([0] + [len(each) for each in corners])
    return whole[keep], owner[keep], [np.flatnonzero(keep[a:b]) for a, b in pairwise(starts)]


def _boxes(corners: Floats) -> tuple[Floats, Floats]:
    """Return the lowest and highest corner of the box about each triangle (T, 3, 3), (T, 3) each."""
    a, b, c = corners[:, 0], corners[:, 1], corners[:, 2]
    return np.minimum(np.minimum(a, b), c), np.maximum(np.maximum(a, b), c)


def _keyed(places: Integers, shape: Integers) -> Integers:
    return (places[..., 0] * shape[1] + places[..., 1]) * shape[2] + places[..., 2]


def _spread(marks: NDArray[np.int32], of: np.ufunc) -> NDArray[np.int32]:
    """Return for each cell of a grid (X, Y, Z) the least or greatest mark of it and the cells beside, corners included."""
    for axis in range(3):
        held = np.moveaxis(marks, axis, 0)
        found = held.copy()
        of(found[1:], held[:-1], out=found[1:])
        of(found[:-1], held[1:], out=found[:-1])
        marks = np.moveaxis(found, 0, axis)
    return marks


def _rim_strips(surfaces: Sequence[tuple[Floats, Integers]], kept: Sequence[Integers]) -> tuple[Floats, Integers]:
    """Return strips of triangles (N, 3, 3) that carry the rims half an edge on, in the planes of their triangles, and their surfaces."""
    strips, owners = [np.zeros((0, 3, 3))], [np.zeros(0, np.int64)]
    for number, (vertices, triangles) in enumerate(surfaces):
        if not len(kept[number]):
            continue
        ends, inner = rim_edges(triangles, len(vertices))
        ends, inner = ends[chosen := np.isin(inner[:, 1], kept[number])], inner[chosen, 0]
        a, b, c = vertices[ends[:, 0]], vertices[ends[:, 1]], vertices[inner]
        along = b - a
        length = np.sqrt((along**2).sum(1, keepdims=True))
        out = (a + b) / 2 - c
        out -= along * ((out * along).sum(1, keepdims=True) / np.maximum(length, 1e-12) ** 2)
        wide = np.sqrt((out**2).sum(1, keepdims=True))
        out = out / np.maximum(wide, 1e-12) * reach_m(vertices, triangles, length)
        strips.append(np.concatenate([np.stack([a, b, b + out], 1), np.stack([a, b + out, a + out], 1)]))
        owners.append(np.full(2 * len(a), number))
    return np.concatenate(strips), np.concatenate(owners)


def reach_m(vertices: Floats, triangles: Integers, edges_m: Floats) -> Floats:
    """Return how far rims with edges of these lengths are taken to reach beyond themselves, m."""
    area = 0.5 * float(np.sqrt((_normals(vertices[triangles]) ** 2).sum(1)).sum())
    return np.minimum(REACH * edges_m, REACH_OF_SIZE * np.sqrt(area))


def rim_edges(triangles: Integers, vertices: int) -> tuple[Integers, Integers]:
    """Return the edges of one triangle alone (N, 2) by vertex, and the vertex across from each with the triangle's row (N, 2)."""
    ends = np.concatenate([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]])
    across = np.concatenate([triangles[:, 2], triangles[:, 0], triangles[:, 1]])
    row = np.tile(np.arange(len(triangles)), 3)
    key = np.where(ends[:, 0] < ends[:, 1], ends[:, 0] * vertices + ends[:, 1], ends[:, 1] * vertices + ends[:, 0])
    order = np.argsort(key, kind="stable")
    ranked = key[order]
    same = ranked[1:] == ranked[:-1]
    alone = order[~(np.append(same, False) | np.append(False, same))]
    return ends[alone], np.stack([across[alone], row[alone]], 1)


def _candidates(corners: Floats, owner: Integers) -> tuple[Integers, Integers]:
    """Return pairs of triangles of different surfaces whose boxes overlap, each pair once.

    Found through grids of several widths: a triangle lives in the grid whose cells are just wider than it is, and is looked for
    there by itself and all smaller ones, so that triangles a thousand times larger than others cost no more than others.
    """
    low, high = _boxes(corners)
    size = np.maximum((high - low).max(1), 1e-9)
    widest = float(size.max()) * 1.001
    level = np.clip(np.floor(np.log(widest / size) / np.log(FINER)), 0, LEVELS - 1).astype(np.int64)  # 0 is the widest grid
    found = [np.zeros(0, np.int64)]
    for number in np.unique(level).tolist():
        rows = np.flatnonzero(level >= number)
        cell = widest / FINER**number
        found += _within(low, high, owner, rows, level[rows] == number, cell)
    pairs = np.unique(np.concatenate(found))
    return pairs // max(len(corners), 1), pairs % max(len(corners), 1)


def _within(low: Floats, high: Floats, owner: Integers, rows: Integers, lives: NDArray[np.bool_], cell: float) -> list[Integers]:
    """Return keys of pairs of one grid: a triangle that lives in it, and any that lives there or is smaller."""
    start = low[rows].min(0)
    first, last = ((low[rows] - start) / cell).astype(np.int64), ((high[rows] - start) / cell).astype(np.int64)
    count = last - first + 1
    total = count.prod(1)
    at = np.repeat(np.arange(len(rows)), total)
    step = np.arange(total.sum()) - np.repeat(np.cumsum(total) - total, total)
    ny, nz = count[at, 1], count[at, 2]
    key = _keyed(np.stack([step // (ny * nz), step // nz % ny, step % nz], 1) + first[at], last.max(0) + 1)
    order = np.lexsort((~lives[at], key))  # those that live in a cell stand first in it
    key, at = key[order], at[order]
    begin = np.flatnonzero(np.concatenate([[True], key[1:] != key[:-1]]))
    held = np.add.reduceat(lives[at], begin, dtype=np.int64)
    mine = owner[rows[at]]
    useful = (held > 0) & (np.minimum.reduceat(mine, begin) != np.maximum.reduceat(mine, begin))
    size = np.diff(begin, append=len(key))
    rank = np.arange(len(key)) - np.repeat(begin, size)
    partners = np.where(np.repeat(useful, size), np.minimum(rank, np.repeat(held, size)), 0)
    where, found = np.repeat(begin, size), []
    for part in np.array_split(np.flatnonzero(partners), max(1, int(partners.sum() // MOST_PAIRS) + 1)):
        many = partners[part]
        one = np.repeat(part, many)
        other = np.repeat(where[part] - (np.cumsum(many) - many), many) + np.arange(len(one))
        a, b = rows[at[one]], rows[at[other]]
        apart = owner[a] != owner[b]
        a, b = a[apart], b[apart]
        overlap = ((low[a] <= high[b]) & (low[b] <= high[a])).all(1)
        found.append(np.unique(np.minimum(a, b)[overlap] * len(low) + np.maximum(a, b)[overlap]))
    return found


def _segments(corners: Floats, first: Integers, second: Integers) -> tuple[Floats, Integers]:
    """Return the segments (N, 2, 3) that pairs of triangles have in common, and the pair of each; triangles in one plane have none."""
    a, b = corners[first], corners[second]
    normal_a, normal_b = _normals(a), _normals(b)
    from_b = np.einsum("pkc,pc->pk", a - b[:, :1], normal_b)  # distances of the corners of a from the plane of b, times its size
    from_a = np.einsum("pkc,pc->pk", b - a[:, :1], normal_a)
    cut = _both_sides(from_a) & _both_sides(from_b)
    rows = np.flatnonzero(cut)
    a, b, from_a, from_b = a[rows], b[rows], from_a[rows], from_b[rows]
    direction = np.cross(normal_a[rows], normal_b[rows])
    ends_a, ends_b = _crossing(a, from_b), _crossing(b, from_a)  # (P, 2, 3): where each triangle meets the other's plane
    reach_a, reach_b = (np.einsum("pkc,pc->pk", ends, direction) for ends in (ends_a, ends_b))
    starts, stops = _picked(ends_a, ends_b, reach_a, reach_b)
    length = np.sqrt(((stops[0] - starts[0]) ** 2).sum(1))
    size = np.abs(a - a[:, :1]).max((1, 2))
    real = (stops[1] > starts[1]) & (length > 1e-9 * np.maximum(size, 1e-30))
    return np.stack([starts[0][real], stops[0][real]], 1), rows[real]


def _normals(corners: Floats) -> Floats:
    return np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])


def _both_sides(distances: Floats) -> NDArray[np.bool_]:
    above = distances >= 0
    return np.asarray(above.any(1) & ~above.all(1))


def _crossing(corners: Floats, distances: Floats) -> Floats:
    """Return the two places (P, 2, 3) where the sides of triangles cross a plane; corners on the plane count as above it."""
    above = distances >= 0
    alone = np.where(above.sum(1) == 1, above.argmax(1), (~above).argmax(1))
    at = np.arange(len(corners))
    tip, height = corners[at, alone], distances[at, alone]
    ends = []
    for step in (1, 2):
        other = (alone + step) % 3
        share = height / (height - distances[at, other])
        ends.append(tip + (corners[at, other] - tip) * share[:, None])
    return np.stack(ends, 1)


def _picked(ends_a: Floats, ends_b: Floats, reach_a: Floats, reach_b: Floats) -> tuple[tuple[Floats, Floats], tuple[Floats, Floats]]:
    """Return where the common part of two stretches of one line begins and stops: places (P, 3) and their reach (P,) along it."""
    at = np.arange(len(ends_a))
    low_a, low_b = reach_a.argmin(1), reach_b.argmin(1)
    begin_a, begin_b = reach_a[at, low_a], reach_b[at, low_b]
    stop_a, stop_b = reach_a[at, 1 - low_a], reach_b[at, 1 - low_b]
    start = np.where((begin_a >= begin_b)[:, None], ends_a[at, low_a], ends_b[at, low_b])
    stop = np.where((stop_a <= stop_b)[:, None], ends_a[at, 1 - low_a], ends_b[at, 1 - low_b])
    return (start, np.maximum(begin_a, begin_b)), (stop, np.minimum(stop_a, stop_b))


def _meetings(segments: Floats, pairs: Integers, drawn: NDArray[np.bool_], surfaces: Sequence[tuple[Floats, Integers]]) -> list[Meeting]:
    """Return the segments gathered by pair of surfaces, each with what it is.

    Strips count only where the surfaces themselves hardly touch: else they would carry a line beyond its end.
    """
    if not len(segments):
        return []
    key = pairs[:, 0] * len(surfaces) + pairs[:, 1]
    order = np.argsort(key, kind="stable")
    rims: Rims = {}
    found = []
    for rows in np.split(order, np.flatnonzero(np.diff(key[order])) + 1):
        one, other = (int(number) for number in pairs[rows[0]])
        length = np.sqrt(((segments[rows, 1] - segments[rows, 0]) ** 2).sum(1))
        counts = drawn[rows] | (length[drawn[rows]].sum() < DRAWN_SHARE * length.sum())
        mine, length = segments[rows[counts]], length[counts]
        along = [_along_rim(mine, length, number, surfaces, rims) for number in (one, other)]
        kind = "ends on" if max(along) > ENDS_SHARE else "crosses"
        ordered = (other, one) if kind == "ends on" and along[1] > along[0] else (one, other)
        found.append(Meeting(ordered, kind, mine, float(length.sum())))
    return found


def _along_rim(segments: Floats, length: Floats, number: int, surfaces: Sequence[tuple[Floats, Integers]], rims: Rims) -> float:
    """Return the share of a line that lies along the rim of a surface: no further from it than twice what the rim may reach."""
    if number not in rims:
        rims[number] = _rim_places(*surfaces[number])
    rim = rims[number]
    if rim is None:
        return 0.0
    some = np.unique(np.linspace(0, len(segments) - 1, SAMPLES).astype(np.int64))
    distance, nearest = rim[0].query(segments[some].mean(1))
    along = distance <= rim[1][nearest]
    return float(length[some][along].sum() / max(length[some].sum(), 1e-300))


def _rim_places(vertices: Floats, triangles: Integers) -> tuple[cKDTree, Floats] | None:
    """Return places along the rim of a surface, as a tree, and how near to each is along the rim; None where it has no rim."""
    ends, _ = rim_edges(triangles, len(vertices))
    if not len(ends):
        return None
    begin, along = vertices[ends[:, 0]], vertices[ends[:, 1]] - vertices[ends[:, 0]]
    edge = np.sqrt((along**2).sum(1))
    reach = reach_m(vertices, triangles, edge)
    times = np.clip(np.ceil(edge / np.maximum(2 * reach, 1e-12)), 1, MOST_PLACES).astype(np.int64)
    row = np.repeat(np.arange(len(ends)), times)
    share = (np.arange(len(row)) - np.repeat(np.cumsum(times) - times, times) + 0.5) / times[row]
    return cKDTree(begin[row] + along[row] * share[:, None]), (edge / times / 2 + reach)[row]
