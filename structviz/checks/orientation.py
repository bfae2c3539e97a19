"""How well one plane stands for a surface: parts, curvature, roughness, cones."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, many
from structviz.orientation.planes import slip_vectors
from structviz.surfaces.surface import Floats, MeasuredSurface, Surface

CELLS = (6, 3)  # along strike and up dip, into which a surface is cut to tell bending from roughness


@check(
    "parts-opposed",
    title="surfaces whose parts have no common mean plane",
    why="parts that dip opposite ways average to a plane that exists nowhere",
    unit="surfaces",
    limit=0.0,
    source="",
    hint="give each part a row of its own in the model file (file#part), with its own sense",
    passes=samples.one,
    fails=lambda: samples.one(meaningful=False, why_not="two parts dip opposite ways"),
    low=0.0,
    high=1e6,
)
def parts_opposed(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault without a meaningful mean plane, where there are more of them than the limit."""
    found = [(fault.name, piece) for fault, piece in examined.faults() if not piece.meaningful]
    for name, piece in found if len(found) > limit else ():
        reason = piece.why_not or "its parts do not share a mean plane"
        text = f"the mean strike and dip mean nothing: {reason}"
        yield Found(name, "warning", text, (("parts", len(piece.parts)), ("largest_share", _largest_share(piece))))


@check(
    "stray-pieces",
    title="small pieces beside the main surface",
    why="scraps left by gridding or clipping count as parts, and those that are wrongly turned disturb the mean",
    unit="% of area",
    limit=2.0,
    source="",
    hint="drop them on export if they are scraps; name them apart if they are splays",
    passes=samples.one,
    fails=lambda: samples.one(parts=(samples.part(1.6e7), samples.part(1e5))),
    low=0.0,
    high=50.0,
)
def stray_pieces(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault of several parts some of which hold less than the limit of its area."""
    for fault, piece in examined.faults():
        areas = _part_areas(piece)
        small = areas < limit / 100 * areas.sum()
        if len(areas) > 1 and small.any():
            share = 100 * areas[small].sum() / areas.sum()
            text = f"{int(small.sum())} of {len(areas)} parts are scraps, together {share:.2g} % of the area"
            yield Found(
                fault.name, "note", text, (("parts", len(areas)), ("small_parts", int(small.sum())), ("share_pct", round(float(share), 3)))
            )


@check(
    "curved",
    title="strongly curved surfaces",
    why="one strike and dip stand for no place on the fault; its slip and its partners change along it",
    unit="deg",
    limit=20.0,
    source="",
    hint="read the per-triangle maps rather than the mean; the verdict weighs stations, not the mean plane",
    passes=samples.one,
    fails=lambda: samples.one(samples.folded(70.0)),
    low=0.0,
    high=90.0,
)
def curved(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault whose cells stand off the mean plane by more than the limit, root mean square."""
    for fault, piece in examined.faults():
        between, _ = _bending_and_roughness_deg(piece) if piece.meaningful and _may_exceed(piece, limit) else (0.0, 0.0)
        if between > limit:
            text = f"strongly curved: its stretches stand {between:.0f} deg off the mean plane ({_plane(piece)})"
            yield Found(fault.name, "note", text, (("bending_deg", round(between, 2)), ("stretches", CELLS[0] * CELLS[1])))


@check(
    "rough",
    title="rough surfaces",
    why="steps, picks and gridding tilt single triangles, so per-triangle maps show the mesh more than the fault",
    unit="deg",
    limit=25.0,
    source="",
    hint="trust the stations, or smooth the surface before export; look at a larger station radius",
    passes=samples.one,
    fails=lambda: samples.one(samples.rough(250.0)),
    low=0.0,
    high=90.0,
)
def rough(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault whose triangles stand off the mean of their cell by more than the limit, root mean square."""
    for fault, piece in examined.faults():
        _, within = _bending_and_roughness_deg(piece) if piece.meaningful and _may_exceed(piece, limit) else (0.0, 0.0)
        if within > limit:
            text = f"rough: triangles stand {within:.0f} deg off their own stretch of the fault"
            yield Found(fault.name, "note", text, (("roughness_deg", round(within, 2)), ("triangles", len(piece.areas_m2))))


@check(
    "wide-cone",
    title="mean planes that are poorly determined",
    why="a wide cone of confidence leaves the predicted slip, and so the verdict, wide open",
    unit="deg",
    limit=15.0,
    source="fisher1953",
    hint="map more of the surface, or split it where its orientation changes",
    passes=samples.one,
    fails=lambda: samples.one(cone_deg=30.0),
    low=0.0,
    high=180.0,
)
def wide_cone(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault whose 95 % cone about the mean normal is wider than the limit."""
    for fault, piece in examined.faults():
        if piece.meaningful and np.isfinite(piece.cone_deg) and piece.cone_deg > limit:
            text = f"mean plane {_plane(piece)} known only to {piece.cone_deg:.0f} deg (95 % cone)"
            yield Found(fault.name, "note", text, (("cone_deg", round(float(piece.cone_deg), 2)),))


@check(
    "no-strike",
    title="surfaces that lie nearly level",
    why="the strike of a level plane is a matter of rounding, and so is the rake measured from it",
    unit="deg",
    limit=3.0,
    source="",
    hint="read movement on it as a trend, not as a rake",
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(dip_deg=1.0)),
    low=0.0,
    high=30.0,
)
def no_strike(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault that dips less than the limit."""
    for fault, piece in examined.faults():
        if piece.meaningful and piece.dip_deg < limit:
            text = f"dips {piece.dip_deg:.1f} deg: its strike is not determined"
            yield Found(fault.name, "note", text, (("dip_deg", round(piece.dip_deg, 3)),))


@check(
    "few-triangles",
    title="surfaces of very few triangles",
    why="one or two triangles carry no measure of their own error",
    unit="triangles",
    limit=3.0,
    source="",
    hint="treat strike and dip as a single reading, not as a mapped surface",
    passes=samples.one,
    fails=lambda: samples.one(_first_triangles(samples.plane(), 2)),
    low=0.0,
    high=1000.0,
)
def few_triangles(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault of fewer triangles with area than the limit."""
    for fault, piece in examined.faults():
        count = int((piece.areas_m2 > 0).sum())
        if count < limit:
            yield Found(fault.name, "note", f"the surface has only {many(count, 'triangle')}", (("triangles", count),))


def _may_exceed(piece: MeasuredSurface, limit: float) -> bool:
    """Return False where the spread of all triangles, which bounds both measures, is within the limit (a cheap first look)."""
    return max(part.spread_deg for part in piece.parts) > limit or len(piece.parts) > 1


def _bending_and_roughness_deg(piece: MeasuredSurface) -> tuple[float, float]:
    """Return how far cells stand off the mean plane and triangles off their cell, area-weighted root mean squares, degrees."""
    cell = _cells(piece)
    count = CELLS[0] * CELLS[1]
    sums = np.stack([np.bincount(cell, piece.areas_m2 * piece.normals[:, k], count) for k in range(3)], -1)
    areas: Floats = np.bincount(cell, piece.areas_m2, count).astype(float)
    means = sums / np.maximum(np.sqrt((sums**2).sum(-1)), 1e-300)[:, None]
    between = _rms_deg(means @ piece.normal, areas)
    within = _rms_deg((piece.normals * means[cell]).sum(-1), piece.areas_m2)
    return between, within


def _cells(piece: MeasuredSurface) -> np.ndarray:
    """Return the number of the cell each triangle lies in, shape (T,)."""
    directions = np.stack([slip_vectors(piece.normal, 0.0), slip_vectors(piece.normal, 90.0)], -1)
    flat = (piece.centroids - piece.centroids.mean(0)) @ directions
    low, span = flat.min(0), np.maximum(np.ptp(flat, axis=0), 1e-9)
    step = np.minimum(((flat - low) / span * CELLS).astype(int), np.array(CELLS) - 1)
    return np.asarray(step[:, 0] * CELLS[1] + step[:, 1])


def _rms_deg(cosines: Floats, weights: Floats) -> float:
    return float(np.sqrt(np.average(np.degrees(np.arccos(np.clip(cosines, -1.0, 1.0))) ** 2, weights=weights)))


def _plane(piece: MeasuredSurface) -> str:
    return f"{piece.strike_deg:03.0f}/{piece.dip_deg:.0f}"


def _part_areas(piece: MeasuredSurface) -> Floats:
    return np.array([part.area_m2 for part in piece.parts])


def _largest_share(piece: MeasuredSurface) -> float:
    areas = _part_areas(piece)
    return round(float(areas.max(initial=0.0) / max(areas.sum(), 1e-300)), 3)


def _first_triangles(surface: Surface, count: int) -> Surface:
    return replace(surface, triangles=surface.triangles[:count])
