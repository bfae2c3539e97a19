"""Surfaces lofted between sticks: lines picked on a fault, each in a section or at a depth of its own.

Which stick comes first in the file and which way each was picked change nothing: sticks are put in order by their distances and
turned to run alike.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import SurfaceError
from structviz.surfaces.from_traces import grid_cells
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

COMPARED = 17  # points of each stick by which distances between sticks are taken
FEWEST, MOST = 9, 400  # points along a stick after resampling
MOST_CELLS = 50_000  # of one surface; more only where the sticks themselves have more points
FARTHEST_M = 1e9  # no map is so wide, and squares of far larger numbers overflow
MOST_STICKS = 2000  # distances are taken between all pairs
WIDE = 3.0  # times the median spacing: a gap that is told


@dataclass(frozen=True, eq=False)
class Loft:
    """A surface lofted between sticks and how they lay. Numbers of sticks count from 0, in the order given."""

    surface: Surface
    order: tuple[int, ...]  # of the sticks used, from one end of the fault to the other
    reversed: tuple[int, ...]  # sticks picked the other way round than most
    out_of_order: tuple[int, ...]  # sticks given at another place than they lie
    crossing: tuple[tuple[int, int], ...]  # neighbours that cross, so that the surface folds back between them
    repeated: tuple[int, ...]  # sticks at the place of another, passed over
    too_short: tuple[int, ...]  # sticks of one point, passed over
    spacing_m: Floats  # mean distance between each stick used and the next
    side_by_side: bool  # False where the sticks do not follow one another in one row, and the order is that along the trend

    @property
    def gaps(self) -> tuple[tuple[int, int], ...]:
        """Return neighbours that lie far further apart than the others."""
        wide = np.flatnonzero(self.spacing_m > WIDE * np.median(self.spacing_m))
        return tuple((self.order[k], self.order[k + 1]) for k in wide)


def surface_from_sticks(sticks: Sequence[ArrayLike], *, name: str = "", source: str = "") -> Loft:
    """Return the surface lofted between sticks, each (N, 3) easting, northing, up, m, and how they lay.

    Every stick is resampled to equal lengths of arc, as many for all; points of equal rank are joined from stick to stick, and wide
    spaces are filled with rows in straight lines between. Any order and direction of the sticks gives the same surface.

    Raises SurfaceError for sticks that are no finite points, and for fewer than two that can be used.
    """
    given = [_points(stick, name) for stick in sticks]
    too_short = tuple(k for k, points in enumerate(given) if len(points) < 2)
    usable, repeated = _canonical(given)
    if not 2 <= len(usable) <= MOST_STICKS:
        found = f"{len(usable)} stick{'s' * (len(usable) != 1)} that can be used"
        raise SurfaceError(name, found, f"2 to {MOST_STICKS:,}", hint="give two or more sticks, each of two points or more")
    numbers, flips, lines = [k for k, _, _ in usable], np.array([f for _, f, _ in usable]), [line for _, _, line in usable]
    compared = np.array([resampled(line, COMPARED) for line in lines])
    ranks, side_by_side = _in_order(compared)
    turned = _alike(compared, ranks)
    spacing = np.linalg.norm(np.diff(_turned(compared, turned)[ranks], axis=0), axis=2).mean(1)
    rows = [lines[k][::-1] if turned[k] else lines[k] for k in ranks]
    order = tuple(numbers[k] for k in ranks)
    ways = flips ^ turned
    odd = ways if ways.sum() * 2 < len(ways) or (ways.sum() * 2 == len(ways) and not ways[int(np.argmin(numbers))]) else ~ways
    return Loft(
        surface=_lofted(rows, spacing, name, source),
        order=order,
        reversed=tuple(sorted(numbers[k] for k in np.flatnonzero(odd))),
        out_of_order=_out_of_order(order),
        crossing=tuple((order[k], order[k + 1]) for k in _crossings(np.array([resampled(row, COMPARED) for row in rows]))),
        repeated=repeated,
        too_short=too_short,
        spacing_m=spacing,
        side_by_side=side_by_side,
    )


def resampled(line: Floats, count: int) -> Floats:
    """Return `count` points (count, 3) at equal lengths of arc along a line (N, 3), its ends among them."""
    way = np.concatenate([[0.0], np.cumsum(np.linalg.norm(np.diff(line, axis=0), axis=1))])
    at = np.linspace(0.0, way[-1], count)
    return np.stack([np.interp(at, way, line[:, k]) for k in range(3)], 1)


def _points(stick: ArrayLike, name: str) -> Floats:
    """Return the points (N, 3) of a stick that differ from the one before."""
    try:
        points = np.asarray(stick, float)
    except (TypeError, ValueError):
        raise SurfaceError(name, "a stick that is no table of numbers", "points of easting, northing, up", hint="correct it") from None
    if points.ndim != 2 or points.shape[1] != 3 or not np.isfinite(points).all():
        found = f"a stick of shape {points.shape}" + ("" if np.isfinite(points).all() else " with numbers that are not finite")
        raise SurfaceError(name, found, "finite points of easting, northing and up", hint="correct the stick")
    if points.size and np.abs(points).max() > FARTHEST_M:
        found = f"a stick with a coordinate of {np.abs(points).max():g}"
        raise SurfaceError(name, found, f"places within {FARTHEST_M:g} m", hint="correct the stick; coordinates are metres")
    return points[np.concatenate([[True], (np.diff(points, axis=0) != 0).any(1)])[: len(points)]] + 0.0


def _canonical(given: Sequence[Floats]) -> tuple[list[tuple[int, bool, Floats]], tuple[int, ...]]:
    """Return number, whether turned round, and points of each stick in an order of its own, and the numbers of repeated ones."""
    found, repeated = [], []
    for number, points in enumerate(given):
        if len(points) < 2:
            continue
        back = points[::-1].tolist() < points.tolist()
        found.append((number, back, points[::-1] if back else points))
    found.sort(key=lambda entry: (entry[2].tolist(), entry[0]))
    usable: list[tuple[int, bool, Floats]] = []
    for entry in found:
        if usable and np.array_equal(usable[-1][2], entry[2]):
            repeated.append(entry[0])
        else:
            usable.append(entry)
    return usable, tuple(sorted(repeated))


def _in_order(compared: Floats) -> tuple[Integers, bool]:
    """Return the rows of (S, P, 3) from one end of the fault to the other, and whether they follow one another in one row.

    Each stick is tied to its nearest (the shortest tree); where that tree is a single path it is the order, else the order is that of
    the middles along their longest axis.
    """
    from scipy.sparse.csgraph import minimum_spanning_tree  # here, so that reading meshes does not load it
    from scipy.spatial.distance import cdist

    flat, back = compared.reshape(len(compared), -1), compared[:, ::-1].reshape(len(compared), -1)
    tree = minimum_spanning_tree(np.minimum(cdist(flat, flat), cdist(flat, back))).tocoo()
    ends, others = np.concatenate([tree.row, tree.col]), np.concatenate([tree.col, tree.row])
    degree = np.bincount(ends, minlength=len(compared))
    middles = compared.mean(1)
    if len(tree.row) != len(compared) - 1 or degree.max() > 2:
        away = middles - middles.mean(0)
        axis = np.linalg.svd(away, full_matrices=False)[2][0]
        return np.argsort(away @ (axis if tuple(axis) > (0.0, 0.0, 0.0) else -axis), kind="stable"), False
    beside: dict[int, list[int]] = {}
    for one, other in zip(ends.tolist(), others.tolist()):
        beside.setdefault(one, []).append(other)
    path = [min(np.flatnonzero(degree == 1).tolist(), key=lambda k: tuple(middles[k]))]
    while len(path) < len(compared):
        path.append(next(k for k in beside[path[-1]] if len(path) < 2 or k != path[-2]))
    return np.array(path), True


def _alike(compared: Floats, ranks: Integers) -> NDArray[np.bool_]:
    """Return which sticks have to be turned round to run as the one before does, the first one left as it is."""
    turned = np.zeros(len(compared), bool)
    before = compared[ranks[0]]
    for k in ranks[1:]:
        turned[k] = np.linalg.norm(compared[k][::-1] - before) < np.linalg.norm(compared[k] - before)
        before = compared[k][::-1] if turned[k] else compared[k]
    return turned


def _turned(compared: Floats, turned: NDArray[np.bool_]) -> Floats:
    return np.where(turned[:, None, None], compared[:, ::-1], compared)


def _out_of_order(order: tuple[int, ...]) -> tuple[int, ...]:
    """Return the fewest numbers to leave out so that the others rise, or fall, from end to end."""
    kept = max((_rising(order), _rising(order[::-1])), key=len)
    return tuple(sorted(set(order) - set(kept)))


def _rising(numbers: Sequence[int]) -> list[int]:
    """Return a longest rising run of numbers, others between them left out."""
    best: list[list[int]] = []  # best[k] is the run of k + 1 numbers that ends lowest
    for number in numbers:
        place = int(np.searchsorted([run[-1] for run in best], number))
        run = [*(best[place - 1] if place else []), number]
        best[place : place + 1] = [run]
    return best[-1]


def _crossings(rows: Floats) -> list[int]:
    """Return k where row k and the next of (S, P, 3) cross: the cells between them face both ways."""
    along, across = rows[:-1, 1:] - rows[:-1, :-1], rows[1:] - rows[:-1]
    faces = np.cross(along, (across[:, 1:] + across[:, :-1]) / 2)
    mean = faces.sum(1, keepdims=True)
    against = (faces * mean).sum(2) < 0
    return [int(k) for k in np.flatnonzero(against.any(1))]


def _lofted(rows: Sequence[Floats], spacing: Floats, name: str, source: str) -> Surface:
    """Return the grid of cells through the rows, with as many rows between them as make the cells about square."""
    length = max(float(np.linalg.norm(np.diff(row, axis=0), axis=1).sum()) for row in rows)
    bends = 2 * max(len(row) for row in rows)
    square = min(np.ceil(length / np.median(spacing)), MOST_CELLS / (2 * len(rows)))
    count = int(np.clip(max(bends, square), FEWEST, MOST))
    cell = length / (count - 1)
    between = np.clip(np.round(spacing / cell), 1, max(1, MOST_CELLS // (2 * count * len(spacing)))).astype(int)
    points = [resampled(row, count) for row in rows]
    parts = [a + (b - a) * (np.arange(n) / n)[:, None, None] for a, b, n in zip(points[:-1], points[1:], between)]
    grid = np.concatenate([*parts, points[-1][None]]) + 0.0
    return Surface(name, grid.reshape(-1, 3), grid_cells(len(grid), count, True), source)
