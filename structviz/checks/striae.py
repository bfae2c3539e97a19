"""Striae against the surfaces they are said to lie on."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, many
from structviz.model import Stria
from structviz.orientation.planes import normals
from structviz.orientation.vectors import axial_angle_deg, unit
from structviz.surfaces.surface import Floats, MeasuredSurface

NEIGHBOURS = 16  # triangles that give the local plane at a stria


@check(
    "striae-plane",
    title="striae off the plane of their fault",
    why="a stria measured on another plane tells of another slip: a splay, a joint, or a swapped strike",
    unit="deg",
    limit=15.0,
    source="",
    hint="look at the field note: strike by right-hand rule, declination, and whether the plane was the main one",
    passes=lambda: samples.with_stria(0.0, 60.0),
    fails=lambda: samples.with_stria(180.0, 60.0),
    low=0.0,
    high=90.0,
)
def striae_plane(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault with striae whose planes stand off the local surface by more than the limit."""
    for name, striae, piece in _striae(examined):
        planes = normals([s.strike_deg for s in striae], [s.dip_deg for s in striae])
        off = axial_angle_deg(planes, _local_normals(piece, _places(striae)))
        beyond = int((off > limit).sum())
        if beyond:
            text = f"{beyond} of {many(len(striae), 'stria', 'striae')} on planes that stand up to {off.max():.0f} deg off the surface"
            yield Found(name, "warning", text, (("striae", len(striae)), ("off", beyond), ("worst_deg", round(float(off.max()), 1))))


@check(
    "striae-far",
    title="striae far from their fault",
    why="a stria away from the surface belongs to another fault, or to a point in another frame",
    unit="% of fault size",
    limit=10.0,
    source="",
    hint="check the fault named and the frame of the coordinates",
    passes=lambda: samples.with_stria(0.0, 60.0, 100.0),
    fails=lambda: samples.with_stria(0.0, 60.0, 2500.0),
    low=0.0,
    high=1000.0,
)
def striae_far(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault with striae farther from its surface than the limit, in per cent of the root of its area."""
    for name, striae, piece in _striae(examined):
        places = _places(striae)
        places = places[np.isfinite(places).all(1)]
        reach = np.sqrt(piece.areas_m2)  # a point on a triangle is this far from its middle at most, slivers apart
        away = np.array([np.maximum(_distances(piece, place) - reach, 0.0).min() for place in places])
        beyond = int((away > limit / 100 * np.sqrt(piece.area_m2)).sum())
        if beyond:
            text = f"{beyond} of {many(len(striae), 'stria', 'striae')} up to {away.max():,.0f} m from the surface"
            yield Found(name, "warning", text, (("striae", len(striae)), ("far", beyond), ("farthest_m", round(float(away.max()), 1))))


def _striae(examined: Examined) -> Iterator[tuple[str, list[Stria], MeasuredSurface]]:
    """Return name, striae and surface of each fault that has striae."""
    for fault, piece in examined.faults():
        mine = [stria for stria in examined.model.striae if stria.fault == fault.name]
        if mine:
            yield fault.name, mine, piece


def _places(striae: list[Stria]) -> Floats:
    return np.array([stria.place for stria in striae], float)


def _distances(piece: MeasuredSurface, place: Floats) -> Floats:
    return np.sqrt(((piece.centroids - place) ** 2).sum(-1))


def _local_normals(piece: MeasuredSurface, places: Floats) -> Floats:
    """Return the area-weighted normal of the triangles nearest to each place, (N, 3); the mean plane where the place is not known."""
    weighted = piece.normals * piece.areas_m2[:, None]
    found = []
    for place in places:
        if not np.isfinite(place).all():
            found.append(piece.normal)
            continue
        away = _distances(piece, place)
        nearest = np.argpartition(away, NEIGHBOURS - 1)[:NEIGHBOURS] if len(away) > NEIGHBOURS else slice(None)
        found.append(unit(weighted[nearest].sum(0)))
    return np.array(found)
