"""How triangles hang together: welding by place, edges, parts, one winding a part. The geometry itself is never changed.

A side is one of the three sides of a triangle; the sides of all triangles that lie on the same edge are partners. Side 3g + k
runs from corner k to the next corner of the g-th sound triangle: one of three different places that repeats no other.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import breadth_first_order, connected_components

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Booleans = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Topology:
    """The adjacency of the triangles of one surface, by vertices welded where they share a place."""

    welded: Integers  # (V,) number of the place of each vertex
    places: int
    corners: Integers  # (T, 3) triangles by place
    rows: Integers  # (G,) sound triangles: three different places, no repeats; sides belong to these
    repeated: Integers  # (R,) triangles on the same three places as an earlier one
    start: Integers  # (3G,) place where each side begins
    onward: Integers  # (3G,) the side after each side in its triangle
    partner: Integers  # (3G,) the next side on the same edge, going round; itself at a rim
    uses: Integers  # (3G,) sides on the edge of each side
    against: Booleans  # (3G,) True where a side runs the same way along the edge as its partner
    part_of: Integers  # (T,) part number, parts numbered by falling area
    parts: int
    sheet_of: Integers  # (T,) sheet number: a part falls into sheets where three or more triangles share an edge
    sheets: int
    turned: Booleans  # (T,) True where the triangle is wound against the rest of its sheet
    unorientable: Integers  # numbers of the parts that have no consistent winding (a Moebius strip)


def weld(vertices: Floats) -> tuple[Integers, int]:
    """Return the number of the place of each vertex (V,) and how many places there are; only identical places are one.

    STL repeats every vertex for every triangle, and careless exports double the rims of patches: adjacency by number alone
    would fall to pieces there.
    """
    # One sort of a mixed key instead of three: equal places have equal keys. Should different places share one, sort in full.
    key = vertices[:, 0] * 0.7548776662466927 + vertices[:, 1] * 0.5698402909980532 + vertices[:, 2] * 0.8566748838545029
    order = np.argsort(key, kind="stable")
    same, tied = _same_as_before(vertices[order]), np.diff(key[order]) == 0
    if (tied & ~same).any():
        order = np.lexsort(vertices.T)
        same = _same_as_before(vertices[order])
    new = np.concatenate([np.ones(min(1, len(vertices)), bool), ~same])
    number = np.empty(len(vertices), np.int64)
    number[order] = np.cumsum(new) - 1
    return number, int(new.sum())


def _same_as_before(rows: Floats) -> Booleans:
    return (rows[1:, 0] == rows[:-1, 0]) & (rows[1:, 1] == rows[:-1, 1]) & (rows[1:, 2] == rows[:-1, 2])


def topology(vertices: Floats, triangles: Integers, areas_m2: Floats) -> Topology:
    """Return the adjacency of triangles (T, 3) with areas (T,): partners, parts by shared edges, and who is wound against whom.

    Triangles without three different places, and pieces without any area, found no part of their own: they are counted
    with the part they touch, or else with the largest. A triangle that repeats another goes wherever that one goes.
    """
    welded, places = weld(vertices)
    corners = welded[triangles]
    rows = np.flatnonzero((corners[:, 0] != corners[:, 1]) & (corners[:, 1] != corners[:, 2]) & (corners[:, 2] != corners[:, 0]))
    start, onward, partner, uses, against = _sides(corners, rows, places)
    twins = _twins(corners, rows, partner, uses)
    if len(twins):
        rows = np.setdiff1d(rows, twins[:, 0])
        areas_m2 = areas_m2 + np.bincount(twins[:, 1], areas_m2[twins[:, 0]], minlength=len(areas_m2))
        start, onward, partner, uses, against = _sides(corners, rows, places)
    beside = partner.reshape(-1, 3) // 3
    alone = uses.reshape(-1, 3) == 2  # two triangles alone on an edge: their windings can be compared
    group, groups = connected_rows(beside)
    branched = not alone.all() and bool((uses > 2).any())
    sheet, sheets = connected_rows(np.where(alone, beside, np.arange(len(rows))[:, None])) if branched else (group, groups)
    turned, crooked = _winding(beside, against.reshape(-1, 3) & alone, alone, sheet, sheets)
    part_of, parts = _parts(group, groups, corners, rows, areas_m2)
    unorientable = np.unique(part_of[rows[crooked]])
    sheet_of, turned = _on_all(sheet, rows, len(triangles)), _on_all(turned, rows, len(triangles))
    again, first = twins.T
    part_of[again], sheet_of[again] = part_of[first], sheet_of[first]
    turned[again] = turned[first] ^ _wound_apart(corners[again], corners[first])
    return Topology(
        welded, places, corners, rows, again, start, onward, partner, uses, against,
        part_of, parts, sheet_of, sheets, turned, unorientable,
    )  # fmt: skip


def _sides(corners: Integers, rows: Integers, places: int) -> tuple[Integers, Integers, Integers, Integers, Booleans]:
    """Return of each side of some triangles: its start, the side after it, its partner, the sides there, and `against`."""
    start = (corners if len(rows) == len(corners) else corners[rows]).ravel()
    onward = np.arange(1, len(start) + 1)
    onward[2::3] -= 3
    return start, onward, *_partners(start, start[onward], places)


def _twins(corners: Integers, rows: Integers, partner: Integers, uses: Integers) -> Integers:
    """Return the triangles that stand on the same three places as an earlier one, and that one, shape (R, 2), in order."""
    # A twin shares all three edges: with the same neighbour on each, or with a crowd on one.
    beside, uses = partner.reshape(-1, 3) // 3, uses.reshape(-1, 3)
    crowd = (uses[:, 0] > 2) | (uses[:, 1] > 2) | (uses[:, 2] > 2)
    twin = (beside[:, 0] == beside[:, 1]) & (beside[:, 1] == beside[:, 2])
    rows = rows[(uses[:, 0] > 1) & (uses[:, 1] > 1) & (uses[:, 2] > 1) & (twin | crowd)]
    sorted_corners = np.sort(corners[rows], axis=1)
    order = np.lexsort(sorted_corners.T)
    new = np.ones(len(rows), bool)
    new[1:] = (sorted_corners[order[1:]] != sorted_corners[order[:-1]]).any(1)
    first = order[np.maximum.accumulate(np.where(new, np.arange(len(rows)), 0))] if len(rows) else order
    pairs = np.stack([rows[order], rows[first]], 1)[~new]
    return pairs[np.argsort(pairs[:, 0], kind="stable")]


def _wound_apart(one: Integers, two: Integers) -> Booleans:
    """Return whether triangles on the same places (R, 3) run round them in opposite directions."""
    at = np.arange(len(one))
    after_one = one[at, (one.argmin(1) + 1) % 3]
    after_two = two[at, (two.argmin(1) + 1) % 3]
    return after_one != after_two


def _on_all(values: NDArray, rows: Integers, count: int) -> NDArray:
    """Return values of some rows as values of all, zero elsewhere."""
    full = np.zeros(count, values.dtype)
    full[rows] = values
    return full


def _partners(start: Integers, end: Integers, places: int) -> tuple[Integers, Integers, Booleans]:
    """Return the next side round the edge of each side, the number of sides there, and whether the two run the same way."""
    forward = start < end
    key = np.where(forward, start * places + end, end * places + start)
    order = np.argsort(key, kind="stable")
    ranked = key[order]
    at = np.flatnonzero(np.concatenate([[True], ranked[1:] != ranked[:-1]]))
    many = np.diff(at, append=len(key))
    step = np.arange(1, len(key) + 1)
    step[at + many - 1] = at
    partner, uses = np.empty_like(order), np.empty_like(order)
    partner[order] = order[step]
    uses[order] = np.repeat(many, many)
    return partner, uses, forward == forward[partner]


def connected_rows(neighbours: Integers) -> tuple[Integers, int]:
    """Return the group of each row (N,) of a table of neighbours (N, K), and how many there are, numbered by their first row.

    A row without a K-th neighbour names itself. Each neighbour must name back, or pass the link on round a circle.
    """
    count, each = neighbours.shape
    flat = neighbours.astype(np.int32).ravel()
    graph = csr_matrix((np.ones(flat.size, np.int8), flat, np.arange(0, flat.size + 1, each, dtype=np.int32)), shape=(count, count))
    # Links run round in circles, so strong connection is connection; it spares the transpose.
    groups, label = connected_components(graph, directed=True, connection="strong")
    first = np.empty(groups, np.int64)
    first[label[::-1]] = np.arange(count)[::-1]
    number = np.empty(groups, np.int64)
    number[np.argsort(first)] = np.arange(groups)
    return number[label], int(groups)


def _parts(group: Integers, groups: int, corners: Integers, rows: Integers, areas_m2: Floats) -> tuple[Integers, int]:
    """Return the part of each triangle (T,), parts numbered by falling area, then by first triangle, and how many there are."""
    if groups == 1 and len(rows) == len(corners):
        return group, 1
    size = np.bincount(group, areas_m2[rows], minlength=groups)
    number = np.empty(groups, np.int64)
    number[np.argsort(-size, kind="stable")] = np.arange(groups)
    parts = int((size > 0).sum())
    part_of = np.full(len(corners), -1, np.int64)
    part_of[rows] = np.where(size > 0, number, -1)[group]
    homeless = np.flatnonzero(part_of < 0)
    if homeless.size:
        part_at = np.full(corners.max() + 1, -1, np.int64)
        housed = part_of >= 0
        part_at[corners[housed].ravel()] = np.repeat(part_of[housed], 3)
        part_of[homeless] = np.maximum(part_at[corners[homeless]].max(1), 0)
    return part_of, parts


def _winding(beside: Integers, against: Booleans, alone: Booleans, sheet: Integers, sheets: int) -> tuple[Booleans, Booleans]:
    """Return which triangles (G,) are wound against the majority of their sheet, and which lie on a sheet that has no winding.

    Each triangle has two copies, as wound and turned. Neighbours wound alike join like copies, others join unlike ones; the
    copies of an orientable sheet fall into two halves, and either half is one consistent winding.
    """
    count = len(beside)
    if not against.any():
        return np.zeros(count, bool), np.zeros(count, bool)
    linked = np.where(alone, beside, np.arange(count)[:, None])
    half, halves = connected_rows(np.concatenate([linked + count * against, linked + count * ~against]))
    here, there = half[:count], half[count:]
    size = np.bincount(here, minlength=halves)  # triangles that are as wound, in each half
    # Where as many are wound one way as the other, the half of the first triangle stands.
    turned = (size[here] < size[there]) | ((size[here] == size[there]) & (here > there))
    crooked = here == there
    if crooked.any():
        crooked = np.isin(sheet, sheet[crooked])
        turned = np.where(crooked, _winding_by_tree(linked, against, sheet, sheets), turned)
    return turned, crooked


def _winding_by_tree(linked: Integers, against: Booleans, sheet: Integers, sheets: int) -> Booleans:
    """Return a winding (G,) along a tree of neighbours: all that can be had on a sheet that has none without a seam."""
    count = len(linked)
    roots = np.empty(sheets, np.int64)
    roots[sheet[::-1]] = np.arange(count)[::-1]
    # One more row is the neighbour of every root, so that one walk reaches all sheets.
    ends = np.concatenate([linked.ravel(), roots]).astype(np.int32)
    starts = np.append(np.arange(0, 3 * count + 1, 3), 3 * count + sheets)
    graph = csr_matrix((np.ones(len(ends), np.int8), ends, starts.astype(np.int32)), shape=(count + 1, count + 1))
    parent = breadth_first_order(graph, count)[1][:count].astype(np.int64)
    parent[roots] = roots
    side = (linked == parent[:, None]).argmax(1)
    turned = against[np.arange(count), side]
    turned[roots] = False
    while (parent[parent] != parent).any():  # each round doubles the length of tree that is added up
        turned = turned ^ turned[parent]
        parent = parent[parent]
    return turned
