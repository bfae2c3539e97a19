"""Condition of the surfaces as meshes: what is wrong with them and what that does to an orientation or an area."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, many
from structviz.surfaces.surface import Condition

MANY = 1e9  # no practical bound on a count


@check(
    "duplicate-vertices",
    title="vertices at the place of another",
    why="triangles that only look joined are separate to every step that follows neighbours, unless they are joined first",
    unit="vertices",
    limit=0.0,
    source="",
    hint="harmless here: they are joined for measuring and the file is left alone; export with shared vertices to be rid of them",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(duplicate_vertices=4),
    low=0.0,
    high=MANY,
)
def duplicate_vertices(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault with more duplicate vertices than the limit."""
    for name, condition, total in _conditions(examined):
        count = condition.duplicate_vertices
        if count > limit:
            text = f"{many(count, 'vertex lies', 'vertices lie')} at the place of another; they count as one in measuring"
            yield Found(name, "note", text, (("duplicate_vertices", count), ("triangles", total)))


@check(
    "zero-area",
    title="triangles without area",
    why="a triangle without area has no orientation; it is left out of every mean",
    unit="triangles",
    limit=0.0,
    source="",
    hint="remesh the surface, or drop slivers on export",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(zero_area=np.array([3])),
    low=0.0,
    high=MANY,
)
def zero_area(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault with more zero-area triangles than the limit."""
    for name, condition, total in _conditions(examined):
        count = len(condition.zero_area)
        if count > limit:
            text = f"{many(count, 'triangle has', 'triangles have')} no area, of {total:,}; left out of orientations"
            yield Found(name, "note", text, (("zero_area_triangles", count), *_first(condition.zero_area)))


@check(
    "winding",
    title="triangles wound against their part",
    why="hanging wall and foot wall trade places on a triangle that is wound the other way round",
    unit="triangles",
    limit=0.0,
    source="",
    hint="harmless here: the winding is made consistent by adjacency before measuring; other programs that trust the file may not do so",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(flipped=np.array([1, 2])),
    low=0.0,
    high=MANY,
)
def winding(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault with more inconsistently wound triangles than the limit."""
    for name, condition, total in _conditions(examined):
        count = len(condition.flipped)
        if count > limit:
            text = (
                f"{many(count, 'triangle is', 'triangles are')} wound against the rest of the part, of {total:,}; turned round in measuring"
            )
            yield Found(name, "note", text, (("flipped_triangles", count), *_first(condition.flipped)))


@check(
    "non-manifold-edges",
    title="edges shared by three or more triangles",
    why="the surface branches there, so it is two faults in one, and which side is the hanging wall cannot be followed across",
    unit="edges",
    limit=0.0,
    source="",
    hint="split the surface along the branch line into one surface a fault, the splay apart from the main fault",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(nonmanifold_edges=np.array([[0, 1]])),
    low=0.0,
    high=MANY,
)
def nonmanifold_edges(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault with more branching edges than the limit."""
    for name, condition, _ in _conditions(examined):
        count = len(condition.nonmanifold_edges)
        if count > limit:
            text = f"{many(count, 'edge is', 'edges are')} shared by three or more triangles: the surface branches or overlaps itself"
            yield Found(name, "warning", text, (("nonmanifold_edges", count), *_place(examined, name, condition.nonmanifold_edges[0])))


@check(
    "not-orientable",
    title="surfaces without two sides",
    why="a surface that closes with a twist has no hanging wall, so no sense of movement can be told on it",
    unit="surfaces",
    limit=0.0,
    source="",
    hint="look for a strip that joins the surface to itself upside down and cut it; no verdict on this fault can be trusted before",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(not_orientable=True),
    low=0.0,
    high=MANY,
)
def not_orientable(examined: Examined, limit: float) -> Iterator[Found]:
    """Return an error for each fault whose surface has one side only, where more of them than the limit are found."""
    names = [name for name, condition, _ in _conditions(examined) if condition.not_orientable]
    for name in names if len(names) > limit else ():
        yield Found(name, "error", "no consistent winding exists: the surface has one side only, so no hanging wall")


@check(
    "holes",
    title="holes within a surface",
    why="the missing part carries no weight in the mean orientation, and a hole is often a tear left by gridding",
    unit="holes",
    limit=0.0,
    source="",
    hint="fill the holes if they are tears; leave them where the fault was not seen, knowing that the mean does not cover them",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(holes=2, rims=3),
    low=0.0,
    high=MANY,
)
def holes(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault with more holes than the limit."""
    for name, condition, _ in _conditions(examined):
        if condition.holes > limit:
            text = f"{many(condition.holes, 'hole')} within the surface"
            yield Found(name, "note", text, (("holes", condition.holes), ("boundary_loops", condition.rims)))


@check(
    "pinched",
    title="vertices where a surface touches itself",
    why="two sheets that meet in a point are joined for no step that follows edges, although the picture shows one surface",
    unit="vertices",
    limit=0.0,
    source="",
    hint="look at the place named: sheets that should be joined want an edge there, sheets that should not want a gap",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(pinched_vertices=1),
    low=0.0,
    high=MANY,
)
def pinched(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault with more pinched vertices than the limit."""
    for name, condition, _ in _conditions(examined):
        count = condition.pinched_vertices
        if count > limit:
            yield Found(name, "note", f"the surface touches itself in {many(count, 'point')}", (("pinched_vertices", count),))


@check(
    "repeated-triangles",
    title="triangles given more than once",
    why="their area counts twice, in the total and as weight in the mean orientation",
    unit="triangles",
    limit=0.0,
    source="",
    hint="a surface was probably merged with a copy of itself: export it anew",
    passes=samples.with_condition,
    fails=lambda: samples.with_condition(repeated=np.array([7])),
    low=0.0,
    high=MANY,
)
def repeated_triangles(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault with more repeated triangles than the limit."""
    for name, condition, total in _conditions(examined):
        count = len(condition.repeated)
        if count > limit:
            text = f"{many(count, 'triangle repeats', 'triangles repeat')} another of the same surface, of {total:,}"
            yield Found(name, "warning", text, (("repeated_triangles", count), *_first(condition.repeated)))


def _conditions(examined: Examined) -> Iterator[tuple[str, Condition, int]]:
    """Return name, condition and number of triangles of each fault."""
    for fault, piece in examined.faults():
        yield fault.name, piece.condition, len(piece.areas_m2)


def _first(rows: object) -> tuple[tuple[str, int], ...]:
    """Return the first row as evidence, so that the place can be found in the file."""
    return (("first_triangle", int(np.asarray(rows)[0])),)


def _place(examined: Examined, name: str, edge: object) -> tuple[tuple[str, float], ...]:
    """Return where the middle of an edge lies, metres to the decimetre."""
    surface = next(fault.surface for fault in examined.model.faults if fault.name == name)
    east, north, up = (float(v) for v in surface.vertices[np.asarray(edge)].mean(0).round(1))
    return (("first_easting_m", east), ("first_northing_m", north), ("first_up_m", up))
