"""A surface mended: only what can be mended without moving anything seen, each change counted and located.

Nothing here is done by measuring or judging; it is asked for. Branching edges, pinches and one-sided surfaces are decisions of
whoever drew the fault and are left.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from structviz._validate import check_range
from structviz.surfaces.geometry import areas_and_normals
from structviz.surfaces.surface import Surface
from structviz.surfaces.topology import Topology, topology, weld

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

LONGEST_RIM = 40  # edges; a larger hole is no tear, and what belongs into it is not known


@dataclass(frozen=True)
class RepairChoices:
    """What may be mended beyond what changes no place at all."""

    weld_m: float = 0.0  # vertices this near each other become one; 0 joins only those at the same place
    largest_hole_m: float = 0.0  # holes with a rim no longer than this are filled
    least_part: float = 0.0  # parts under this share of the area are dropped

    def __post_init__(self) -> None:
        """Raise ArgumentError where a value is outside its range."""
        check_range("weld_m", self.weld_m, 0.0, 1e4, "m")
        check_range("largest_hole_m", self.largest_hole_m, 0.0, 1e6, "m")
        check_range("least_part", self.least_part, 0.0, 0.5, "of the area")


@dataclass(frozen=True, eq=False)
class Change:
    """One kind of change to one surface."""

    key: str
    text: str  # what was done, in words
    rows: Integers  # of the surface as it was: the triangles, or the vertices, it was done to
    of: str  # "triangles" | "vertices"
    place: tuple[float, float, float]  # where the first of them lies, m


Step = tuple[Floats, Integers, Integers]  # vertices, triangles, and the row each triangle had at the start (-1 for a new one)


def repaired(surface: Surface, choices: RepairChoices | None = None) -> tuple[Surface, tuple[Change, ...]]:
    """Return the surface mended and what was changed, in order; an unchanged surface comes back as it was.

    Vertices at one place become one, triangles that collapse or repeat another go, winding is made alike in each part, vertices
    no triangle uses go; further changes as chosen. The shape that is left is the shape that was there.
    """
    choices = choices or RepairChoices()
    changes: list[Change] = []
    step: Step = (surface.vertices, surface.triangles, np.arange(len(surface.triangles)))
    step = _welded(step, choices.weld_m, changes)
    step = _without_collapsed(step, changes)
    step = _without_repeats_and_scraps(step, choices.least_part, changes)
    step = _wound_alike(step, changes)
    if choices.largest_hole_m > 0:
        step = _filled(step, choices.largest_hole_m, changes)
    vertices, triangles = _used(step, surface, changes)
    if not changes:
        return surface, ()
    told = tuple(f"repaired: {change.text}" for change in changes)
    return replace(surface, vertices=vertices, triangles=triangles, history=(*surface.history, *told)), tuple(changes)


def _note(changes: list[Change], key: str, text: str, rows: Integers, of: str, places: Floats) -> None:
    first = places[0] if len(places) else np.full(3, np.nan)
    changes.append(Change(key, text, rows, of, (float(first[0]), float(first[1]), float(first[2]))))


def _count(number: int, one: str, more: str = "") -> str:
    return f"{number:,} {one if number == 1 else more or one + 's'}"


def _topology(vertices: Floats, triangles: Integers) -> tuple[Topology, Floats]:
    corners = (vertices - vertices.mean(0))[triangles]
    areas, _ = areas_and_normals(corners, rounding=4 * np.finfo(float).eps * float(np.abs(vertices).max()))
    return topology(vertices, triangles, areas), areas


def _welded(step: Step, tolerance_m: float, changes: list[Change]) -> Step:
    vertices, triangles, rows = step
    number, places = weld(vertices)
    if tolerance_m > 0:
        pairs = cKDTree(vertices).query_pairs(tolerance_m, output_type="ndarray")
        graph = coo_matrix((np.ones(len(pairs), np.int8), pairs.T), shape=(len(vertices),) * 2)
        places, number = connected_components(graph, directed=False)
    first = np.empty(places, np.int64)
    first[number[::-1]] = np.arange(len(vertices))[::-1]
    joined = first[number]
    moved = np.flatnonzero(joined != np.arange(len(vertices)))
    if not len(moved):
        return step
    used = np.isin(moved, triangles)
    if used.any():
        far = float(np.sqrt(((vertices[joined] - vertices)[moved] ** 2).sum(1).max()))
        how = f", moved by up to {far:.3g} m" if far > 0 else " at the same place"
        text = f"{_count(len(moved), 'vertex', 'vertices')} joined to another{how}"
        _note(changes, "welded", text, moved, "vertices", vertices[moved])
    return vertices, joined[triangles], rows


def _without_collapsed(step: Step, changes: list[Change]) -> Step:
    vertices, triangles, rows = step
    a, b, c = triangles.T
    flat = (a == b) | (b == c) | (c == a)
    if flat.any():
        text = f"{_count(int(flat.sum()), 'triangle')} with two corners at one place dropped"
        _note(changes, "collapsed", text, rows[flat], "triangles", vertices[triangles[flat]].mean(1))
    return vertices, triangles[~flat], rows[~flat]


def _without_repeats_and_scraps(step: Step, least_part: float, changes: list[Change]) -> Step:
    vertices, triangles, rows = step
    held, areas = _topology(vertices, triangles)
    drop = np.zeros(len(triangles), bool)
    if len(held.repeated):
        drop[held.repeated] = True
        text = f"{_count(len(held.repeated), 'triangle')} that repeat another dropped"
        _note(changes, "repeated", text, rows[held.repeated], "triangles", vertices[triangles[held.repeated]].mean(1))
    share = np.bincount(held.part_of, np.where(drop, 0.0, areas), minlength=held.parts) / areas.sum()
    small = (share < least_part) & (np.arange(held.parts) > 0)  # the largest part stays whatever its share
    scraps = small[held.part_of] & ~drop
    if scraps.any():
        what = f"{_count(int(small.sum()), 'part')} under {100 * least_part:g} % of the area dropped"
        text = f"{what}, together {100 * float(areas[scraps].sum() / areas.sum()):.2g} %"
        _note(changes, "scraps", text, rows[scraps], "triangles", vertices[triangles[scraps]].mean(1))
        drop |= scraps
    return vertices, triangles[~drop], rows[~drop]


def _wound_alike(step: Step, changes: list[Change]) -> Step:
    vertices, triangles, rows = step
    held, _ = _topology(vertices, triangles)
    turned = held.turned & ~np.isin(held.part_of, held.unorientable)  # a one-sided part has no winding to give
    if turned.any():
        text = f"{_count(int(turned.sum()), 'triangle')} turned to the winding of its part" if turned.sum() == 1 else ""
        text = text or f"{int(turned.sum()):,} triangles turned to the winding of their parts"
        _note(changes, "turned", text, rows[turned], "triangles", vertices[triangles[turned]].mean(1))
        triangles = np.where(turned[:, None], triangles[:, [0, 2, 1]], triangles)
    return vertices, triangles, rows


def _filled(step: Step, largest_m: float, changes: list[Change]) -> Step:
    """Return the surface with small holes closed by the triangles of least area over their rims; no vertex is added."""
    vertices, triangles, rows = step
    patches, filled = [], []
    for loop in hole_rims(vertices, triangles):
        around = vertices[loop]
        if len(loop) <= LONGEST_RIM and np.sqrt(((around - np.roll(around, -1, 0)) ** 2).sum(1)).sum() <= largest_m:
            patches.append(loop[least_area_patch(around)])
            filled.append(loop[0])
    if not patches:
        return step
    new = np.concatenate(patches)
    text = f"{_count(len(filled), 'hole')} with a rim of {largest_m:g} m or less filled with {_count(len(new), 'triangle')}"
    _note(changes, "filled", text, np.array(filled), "vertices", vertices[filled])
    return vertices, np.concatenate([triangles, new]), np.concatenate([rows, np.full(len(new), -1)])


def hole_rims(vertices: Floats, triangles: Integers) -> list[Integers]:
    """Return the rims of holes as runs of vertices (K,), wound so that triangles along them join the surface.

    Of each part the longest rim is its outline and no hole. Rims that touch themselves are left out. Vertices must be joined.
    """
    sides = np.concatenate([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]])
    key = np.sort(sides, axis=1) @ np.array([len(vertices), 1])
    _, where, times = np.unique(key, return_inverse=True, return_counts=True)
    rim = sides[times[where] == 1]
    _, part = connected_components(coo_matrix((np.ones(len(sides), np.int8), sides.T), shape=(len(vertices),) * 2), directed=False)
    begins, counts = np.unique(rim[:, 1], return_counts=True)
    after = {int(b): int(a) for a, b in rim}  # against the winding of the surface, so that a patch continues it
    forked = set(begins[counts > 1].tolist()) | set(after) ^ set(after.values())
    loops, seen = list[Integers](), set[int]()
    for start in after:
        run, at = list[int](), start
        while at in after and at not in seen:
            seen.add(at)
            run.append(at)
            at = after[at]
        if len(run) > 2 and at == start and not forked.intersection(run):
            loops.append(np.array(run))
    lengths = [float(np.sqrt(((vertices[loop] - vertices[np.roll(loop, -1)]) ** 2).sum(1)).sum()) for loop in loops]
    longest: dict[int, float] = {}
    for loop, length in zip(loops, lengths):
        longest[int(part[loop[0]])] = max(longest.get(int(part[loop[0]]), 0.0), length)
    return [loop for loop, length in zip(loops, lengths) if length < longest[int(part[loop[0]])]]


def least_area_patch(around: Floats) -> Integers:
    """Return the triangles (K - 2, 3), as rows of a closed line of places (K, 3), that span it with the least total area.

    Dynamic programming over spans, as for the triangulation of a polygon; wound as the line runs.
    """
    count = len(around)
    cost, cut = np.zeros((count, count)), np.zeros((count, count), np.int64)
    for span in range(2, count):
        for i in range(count - span):
            j, middle = i + span, np.arange(i + 1, i + span)
            area = np.linalg.norm(np.cross(around[middle] - around[i], around[j] - around[i]), axis=1) / 2
            total = cost[i, middle] + cost[middle, j] + area
            best = int(total.argmin())
            cost[i, j], cut[i, j] = total[best], middle[best]
    made, spans = [], [(0, count - 1)]
    while spans:
        i, j = spans.pop()
        if j - i > 1:
            made.append((i, int(cut[i, j]), j))
            spans += [(i, int(cut[i, j])), (int(cut[i, j]), j)]
    return np.array(made, np.int64)


def _used(step: Step, surface: Surface, changes: list[Change]) -> tuple[Floats, Integers]:
    """Return the vertices that are used and the triangles renumbered to them; vertices that nothing ever used are told."""
    vertices, triangles, _ = step
    kept = np.zeros(len(vertices), bool)
    kept[triangles.ravel()] = True
    before = np.zeros(len(vertices), bool)
    before[surface.triangles.ravel()] = True
    idle = np.flatnonzero(~before)
    if len(idle):
        text = f"{_count(len(idle), 'vertex', 'vertices')} that no triangle uses dropped"
        _note(changes, "unused", text, idle, "vertices", vertices[idle])
    return vertices[kept], (np.cumsum(kept) - 1)[triangles]
