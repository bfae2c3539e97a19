"""What is wrong with a surface: defects counted and located. Nothing is repaired here."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from structviz.surfaces.surface import Condition
from structviz.surfaces.topology import Topology, connected_rows

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def examine(vertices: Floats, triangles: Integers, areas_m2: Floats, topology: Topology) -> Condition:
    """Return the condition of a surface: rows of defective triangles and vertices, edges by vertex, and counts of the rest."""
    used = np.zeros(len(vertices), bool)
    used[triangles.ravel()] = True
    rims, holes = _rims(topology)
    pinched = _pinched(topology)
    return Condition(
        duplicate_vertices=len(vertices) - topology.places,
        unused_vertices=int((~used).sum()),
        zero_area=np.flatnonzero(areas_m2 == 0),
        flipped=np.flatnonzero(topology.turned),
        repeated=topology.repeated,
        nonmanifold_edges=_nonmanifold(topology),
        not_orientable=bool(topology.unorientable.size),
        rims=rims,
        holes=holes,
        pinched_vertices=len(pinched),
        pinched=_vertices_at(topology, pinched),
        unorientable_parts=tuple(topology.unorientable.tolist()),
    )


def _vertices_at(topology: Topology, places: Integers) -> Integers:
    """Return the first vertex at each place, in the shape given."""
    if not places.size:
        return places
    first = np.empty(topology.places, np.int64)
    first[topology.welded[::-1]] = np.arange(len(topology.welded))[::-1]
    return first[places]


def _nonmanifold(topology: Topology) -> Integers:
    """Return the edges of three or more triangles as pairs of vertices (N, 2), in order of place."""
    many = np.flatnonzero(topology.uses > 2)
    ends = np.sort(np.stack([topology.start[many], topology.start[topology.onward[many]]], 1), axis=1)
    edges = np.unique(ends[:, 0] * topology.places + ends[:, 1]) if many.size else many
    return _vertices_at(topology, np.stack([edges // topology.places, edges % topology.places], 1))


def _rims(topology: Topology) -> tuple[int, int]:
    """Return how many boundary loops there are and how many of them are holes: all but one of each part that has any.

    Loops that touch in a point count as one.
    """
    rim = np.flatnonzero(topology.uses == 1)
    if not rim.size:
        return 0, 0
    ends = np.stack([topology.start[rim], topology.start[topology.onward[rim]]])
    place, at = np.unique(ends, return_inverse=True)
    at = at.reshape(2, -1)
    loops, loop_of = connected_components(coo_matrix((np.ones(len(rim), np.int8), at), shape=(len(place),) * 2), directed=False)
    part_of_loop = np.empty(loops, np.int64)
    part_of_loop[loop_of[at[0]]] = topology.part_of[topology.rows[rim // 3]]
    return int(loops), int(loops - len(np.unique(part_of_loop)))


def _pinched(topology: Topology) -> Integers:
    """Return the places where the surface touches itself in a point: triangles meet there without a chain of shared edges.

    Corners of triangles at one place are joined where their triangles share an edge that ends there; a place whose corners
    fall into more than one chain is pinched. Open fans at rims are one chain and do not count.
    """
    partner, onward = topology.partner, topology.onward
    beyond = onward[partner]
    # Corner c begins side c. A partner that runs the other way has its own beginning at the far end.
    at_start = np.where(topology.against, partner, beyond)
    at_end = np.empty_like(at_start)
    at_end[onward] = np.where(topology.against, beyond, partner)
    chain_of, chains = connected_rows(np.stack([at_start, at_end], 1))
    place_of_chain = np.empty(chains, np.int64)
    place_of_chain[chain_of] = topology.start
    return np.flatnonzero(np.bincount(place_of_chain, minlength=1) > 1)
