"""How triangles hang together: welding by place, edges, parts, one winding a part. The geometry itself is never changed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import breadth_first_order, connected_components

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Topology:
    """The adjacency of the triangles of one surface, by vertices welded where they share a place."""

    welded: Integers  # (V,) number of the place of each vertex
    places: int
    corners: Integers  # (T, 3) triangles by place
    good: NDArray[np.bool_]  # (T,) three different places
    edges: Integers  # (E, 2) undirected edges by place, first < second
    edge_uses: Integers  # (E,) triangles at each edge
    edge_start: Integers  # (E,) where the sides of each edge begin in `sides`
    sides: Integers  # (3 T_good,) sides of the good triangles, numbered triangle by triangle, sorted by edge
    part_of: Integers  # (T,) part number, parts numbered by falling count of triangles
    parts: int
    sheet_of: Integers  # (T,) sheet number: a part falls into sheets where three or more triangles share an edge
    sheets: int
    turned: NDArray[np.bool_]  # (T,) True where the triangle is wound against the rest of its sheet
    orientable: bool


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


def _same_as_before(rows: Floats) -> NDArray[np.bool_]:
    return (rows[1:, 0] == rows[:-1, 0]) & (rows[1:, 1] == rows[:-1, 1]) & (rows[1:, 2] == rows[:-1, 2])


def topology(vertices: Floats, triangles: Integers) -> Topology:
    """Return the adjacency of triangles: edges, parts by shared edges, and which triangles are wound against their part."""
    welded, places = weld(vertices)
    corners = welded[triangles]
    good = (corners[:, 0] != corners[:, 1]) & (corners[:, 1] != corners[:, 2]) & (corners[:, 2] != corners[:, 0])
    owner = np.repeat(np.flatnonzero(good), 3)
    start = corners[good].ravel()
    end = corners[good][:, [1, 2, 0]].ravel()
    low, high = np.minimum(start, end), np.maximum(start, end)
    key = low * places + high
    order = np.argsort(key, kind="stable")
    first = np.ones(len(key), bool)
    first[1:] = key[order][1:] != key[order][:-1]
    at = np.flatnonzero(first)
    uses = np.diff(np.append(at, len(key)))
    edges = np.stack([low[order][at], high[order][at]], 1)
    owner, forward = owner[order], (start < end)[order]
    links, against = _neighbours(at, uses, owner, forward)
    branches = _branches(at, uses, owner)
    sheet_of, sheets = _numbered(len(triangles), links)
    part_of, parts = _numbered(len(triangles), np.concatenate([links, branches])) if len(branches) else (sheet_of, sheets)
    turned, orientable = _winding(len(triangles), links, against)
    return Topology(welded, places, corners, good, edges, uses, at, order, part_of, parts, sheet_of, sheets, turned, orientable)


def _neighbours(at: Integers, uses: Integers, owner: Integers, forward: NDArray[np.bool_]) -> tuple[Integers, NDArray[np.bool_]]:
    """Return the pairs of triangles that alone share an edge (L, 2), and whether the two are wound against each other.

    Two neighbours are wound alike when they run along their edge in opposite directions.
    """
    two = at[uses == 2]
    return np.stack([owner[two], owner[two + 1]], 1), forward[two] == forward[two + 1]


def _branches(at: Integers, uses: Integers, owner: Integers) -> Integers:
    """Return pairs of triangles that share an edge with yet others (L, 2): they are one part, but their winding is not comparable."""
    many = at[uses > 2]
    if not many.size:
        return np.zeros((0, 2), np.int64)
    after = np.concatenate([start + np.arange(1, count) for start, count in zip(many, uses[uses > 2], strict=True)])
    first = np.repeat(many, uses[uses > 2] - 1)
    return np.stack([owner[first], owner[after]], 1)


def _numbered(count: int, links: Integers) -> tuple[Integers, int]:
    """Return the group of each triangle (T,) joined by links, largest group first, and how many there are."""
    graph = coo_matrix((np.ones(len(links), np.int8), links.T), shape=(count, count))
    parts, label = connected_components(graph, directed=False)
    sizes = np.bincount(label, minlength=parts)
    # Largest first; ties by the first triangle, which is the order the labels are given in.
    rank = np.empty(parts, np.int64)
    rank[np.argsort(-sizes, kind="stable")] = np.arange(parts)
    return rank[label], int(parts)


def _winding(count: int, links: Integers, against: NDArray[np.bool_]) -> tuple[NDArray[np.bool_], bool]:
    """Return which triangles are wound against the majority of their part, and whether every part can be wound one way.

    Each triangle has two copies, as wound and turned. Neighbours wound alike join like copies, others join unlike ones; the
    copies of an orientable part fall into two halves, and either half is one consistent winding.
    """
    if not against.any():
        return np.zeros(count, bool), True
    plus, minus = links, links + count
    same, other = ~against, against
    ends = np.concatenate(
        [
            plus[same],
            minus[same],
            np.stack([plus[other, 0], minus[other, 1]], 1),
            np.stack([minus[other, 0], plus[other, 1]], 1),
        ]
    )
    graph = coo_matrix((np.ones(len(ends), np.int8), ends.T), shape=(2 * count, 2 * count))
    halves, label = connected_components(graph, directed=False)
    alike = label[:count] == label[count:]
    if alike.any():
        return _winding_by_tree(count, links, against), False
    size = np.bincount(label[:count], minlength=halves)  # triangles that are as wound, in each half
    return size[label[:count]] < size[label[count:]], True


def _winding_by_tree(count: int, links: Integers, against: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return one winding of a surface that has none without a seam (a Moebius strip), along a tree of neighbours."""
    turned = np.zeros(count, bool)
    sign = np.where(against, 2.0, 1.0)
    graph = coo_matrix((np.tile(sign, 2), np.concatenate([links, links[:, ::-1]]).T), shape=(count, count)).tocsr()
    seen = np.zeros(count, bool)
    for root in range(count):
        if seen[root]:
            continue
        order, parent = breadth_first_order(graph, root, directed=False)
        seen[order] = True
        step = np.asarray(graph[parent[order[1:]], order[1:]]).ravel() if len(order) > 1 else np.zeros(0)
        for child, weight in zip(order[1:], step, strict=True):
            turned[child] = turned[parent[child]] ^ (weight == 2.0)
    return turned
