"""What is wrong with a surface: defects counted and located. Nothing is repaired here."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from structviz.surfaces.surface import Condition
from structviz.surfaces.topology import Topology

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def examine(vertices: Floats, triangles: Integers, areas_m2: Floats, topology: Topology) -> Condition:
    """Return the condition of a surface: rows of defective triangles, edges by vertex, and counts of the rest."""
    used = np.zeros(len(vertices), bool)
    used[triangles.ravel()] = True
    rims, holes = _rims(topology)
    return Condition(
        duplicate_vertices=len(vertices) - topology.places,
        unused_vertices=int((~used).sum()),
        zero_area=np.flatnonzero((areas_m2 == 0) | ~topology.good),
        flipped=np.flatnonzero(topology.turned),
        repeated=_repeated(topology),
        nonmanifold_edges=_edges_by_vertex(topology, topology.edges[topology.edge_uses > 2]),
        not_orientable=not topology.orientable,
        rims=rims,
        holes=holes,
        pinched_vertices=_pinched(topology),
    )


def _edges_by_vertex(topology: Topology, edges: Integers) -> Integers:
    """Return edges given by place as edges given by the first vertex at each place."""
    first = np.full(topology.places, -1, np.int64)
    first[topology.welded[::-1]] = np.arange(len(topology.welded))[::-1]
    return first[edges].reshape(-1, 2)


def _repeated(topology: Topology) -> Integers:
    """Return the triangles that stand on the same three places as an earlier one."""
    rows = np.flatnonzero(topology.good)
    corners = np.sort(topology.corners[rows], axis=1)
    # Most surfaces repeat none: a hash that may collide, but never tells equal triangles apart, spares the full sort.
    low, middle, high = corners.astype(np.uint64).T
    mixed = (low * np.uint64(0x9E3779B97F4A7C15) + middle) * np.uint64(0xC2B2AE3D27D4EB4F) + high
    if (np.diff(np.sort(mixed)) != 0).all():
        return rows[:0]
    order = np.lexsort(corners.T)
    same = np.zeros(len(rows), bool)
    same[order[1:]] = (corners[order[1:]] == corners[order[:-1]]).all(1)
    return rows[same]


def _rims(topology: Topology) -> tuple[int, int]:
    """Return how many boundary loops there are and how many of them are holes: all but one of each part that has any."""
    rim = topology.edges[topology.edge_uses == 1]
    if not len(rim):
        return 0, 0
    place, at = np.unique(rim, return_inverse=True)
    at = at.reshape(-1, 2)
    loops, loop_of = connected_components(coo_matrix((np.ones(len(at)), at.T), shape=(len(place),) * 2), directed=False)
    part_at = np.full(topology.places, -1, np.int64)
    rows = topology.good
    part_at[topology.corners[rows].ravel()] = np.repeat(topology.part_of[rows], 3)
    part_of_loop = np.empty(loops, np.int64)
    part_of_loop[loop_of] = part_at[place]
    return int(loops), int(loops - len(np.unique(part_of_loop)))


def _pinched(topology: Topology) -> int:
    """Return at how many places the surface touches itself in a point: triangles meet there without a chain of shared edges.

    Corners of triangles at one place are joined where their triangles share an edge that ends there; a place whose corners
    fall into more than one chain is pinched. Open fans at rims are one chain and do not count.
    """
    corners = topology.corners[topology.good]
    count = corners.size
    place = corners.ravel()
    after = np.arange(count).reshape(-1, 3)[:, [1, 2, 0]].ravel()  # corner at the end of the side that begins at each corner
    rising = place < place[after]
    low_corner, high_corner = np.where(rising, np.arange(count), after), np.where(rising, after, np.arange(count))
    meets = np.ones(count, bool)
    meets[topology.edge_start] = False  # every side but the first of its edge meets the one before it
    two = np.flatnonzero(meets)
    one, two = topology.sides[two - 1], topology.sides[two]
    links = np.concatenate([np.stack([low_corner[one], low_corner[two]], 1), np.stack([high_corner[one], high_corner[two]], 1)])
    chains, chain_of = connected_components(coo_matrix((np.ones(len(links), np.int8), links.T), shape=(count, count)), directed=False)
    place_of_chain = np.empty(chains, np.int64)
    place_of_chain[chain_of] = place
    return int((np.bincount(place_of_chain, minlength=1) > 1).sum())
