"""Small surfaces with one known defect each, for the checks of condition."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.surfaces.surface import Surface
from structviz.synthetic.shapes import plane_surface

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Mesh = tuple[Floats, Integers]

CENTRE = (400_000.0, 6_500_000.0, -2000.0)
CELLS = (8, 5)  # rectangles of the sound surface; its vertices are numbered up the dip first
UP = CELLS[1] + 1  # step of the vertex number along strike
INNER_EDGE = (3 * UP + 2, 4 * UP + 2)  # an edge along strike in the middle


def sound_surface(name: str = "sound") -> Surface:
    """Return the plane of 80 triangles, strike 030 and dip 60, on which every defect is made."""
    return plane_surface(name, 30.0, 60.0, 2000.0, 1000.0, CENTRE, cells=CELLS)


def damaged_surface(kind: str) -> Surface:
    """Return a small surface with one defect of the kind named (a key of DAMAGE); its name is the kind.

    >>> len(damaged_surface("hole").triangles) - len(sound_surface().triangles)
    -2
    """
    if kind not in DAMAGE:
        raise ArgumentError(f"kind: found {kind!r}; wanted one of {', '.join(DAMAGE)}", hint="choose one of these words")
    whole = sound_surface(kind)
    vertices, triangles = DAMAGE[kind](whole.vertices, whole.triangles)
    return Surface(kind, vertices, triangles, f"synthetic {kind}")


def _duplicate_vertices(vertices: Floats, triangles: Integers) -> Mesh:
    """The line of 6 vertices half way along is doubled: the two halves touch but share nothing."""
    line = 4 * UP + np.arange(UP)
    copy = np.arange(len(vertices))
    copy[line] = len(vertices) + np.arange(UP)
    beyond = triangles.max(1) >= 5 * UP
    return np.concatenate([vertices, vertices[line]]), np.where(beyond[:, None], copy[triangles], triangles)


def _zero_area(vertices: Floats, triangles: Integers) -> Mesh:
    """A vertex half way along an inner edge splits one neighbour, and a triangle without area fills the seam."""
    rows = np.flatnonzero((triangles[:, :, None] == np.array(INNER_EDGE)).any(1).all(1))
    a, b, c = _edge_first(triangles[rows[0]], INNER_EDGE)
    middle = len(vertices)
    pieces = np.array([[a, middle, c], [middle, b, c], [a, b, middle]])
    kept = np.delete(triangles, rows[0], axis=0)
    return np.concatenate([vertices, [(vertices[a] + vertices[b]) / 2]]), np.concatenate([kept, pieces])


def _flipped_winding(vertices: Floats, triangles: Integers) -> Mesh:
    """Five triangles are wound against the rest."""
    turned = triangles.copy()
    turned[10:60:10] = turned[10:60:10, ::-1]
    return vertices, turned


def _nonmanifold(vertices: Floats, triangles: Integers) -> Mesh:
    """A fin stands on one inner edge, which so belongs to three triangles."""
    a, b = INNER_EDGE
    tip = (vertices[a] + vertices[b]) / 2 + np.array([150.0, -90.0, 100.0])
    return np.concatenate([vertices, [tip]]), np.concatenate([triangles, [[a, b, len(vertices)]]])


def _hole(vertices: Floats, triangles: Integers) -> Mesh:
    """One rectangle well inside is missing."""
    return vertices, _without_cells(triangles, [(4, 2)])


def _pinched(vertices: Floats, triangles: Integers) -> Mesh:
    """A notch in the rim and a missing rectangle meet in one vertex, where the surface only touches itself."""
    return vertices, _without_cells(triangles, [(3, 0), (4, 1)])


def _stray_part(vertices: Floats, triangles: Integers) -> Mesh:
    """A scrap of two triangles floats 5 km away."""
    scrap = plane_surface("scrap", 30.0, 60.0, 60.0, 40.0, np.add(CENTRE, [5000.0, 0.0, 0.0]), cells=(1, 1))
    return _joined(vertices, triangles, scrap)


def _opposite_parts(vertices: Floats, triangles: Integers) -> Mesh:
    """A second part of the same size strikes alike and dips 60 degrees the other way."""
    other = plane_surface("other", 210.0, 60.0, 2000.0, 1000.0, np.add(CENTRE, [3000.0, 0.0, 0.0]), cells=CELLS)
    return _joined(vertices, triangles, other)


def _repeated_triangles(vertices: Floats, triangles: Integers) -> Mesh:
    """Four triangles are there twice, the copies numbered from another corner."""
    return vertices, np.concatenate([triangles, np.roll(triangles[20:60:10], 1, axis=1)])


DAMAGE: dict[str, Callable[[Floats, Integers], Mesh]] = {
    "duplicate_vertices": _duplicate_vertices,
    "zero_area": _zero_area,
    "flipped_winding": _flipped_winding,
    "nonmanifold": _nonmanifold,
    "hole": _hole,
    "pinched": _pinched,
    "stray_part": _stray_part,
    "opposite_parts": _opposite_parts,
    "repeated_triangles": _repeated_triangles,
}


def _edge_first(triangle: Integers, edge: tuple[int, int]) -> Integers:
    """Return the triangle turned so that its first two corners are the edge, in its own winding."""
    start = next(i for i in range(3) if triangle[i] in edge and triangle[(i + 1) % 3] in edge)
    return np.roll(triangle, -start)


def _without_cells(triangles: Integers, cells: list[tuple[int, int]]) -> Integers:
    """Return the triangles but for both halves of the rectangles named by their place along strike and dip."""
    rows = [2 * (i * CELLS[1] + j) + half for i, j in cells for half in (0, 1)]
    return np.delete(triangles, rows, axis=0)


def _joined(vertices: Floats, triangles: Integers, other: Surface) -> Mesh:
    return np.concatenate([vertices, other.vertices]), np.concatenate([triangles, other.triangles + len(vertices)])
