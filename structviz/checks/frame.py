"""Units and datum: signs that coordinates are not metres, not projected, or that depth was taken for elevation."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, listed, many
from structviz.surfaces.surface import Floats, MeasuredSurface, Surface

HIGHEST_GROUND_M = 9000.0
UNIT_HINT = "compare with a known distance on the map, then set length_unit and vertical in the model file"


@check(
    "span-small",
    title="models too small to be one",
    why="metres read where kilometres or degrees were meant change no angle, but every distance between faults and so the pairs",
    unit="m",
    limit=10.0,
    source="",
    hint=UNIT_HINT,
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(centre=(0, 0, -2.0), side_m=3.0)),
    low=0.0,
    high=1e6,
)
def span_small(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the whole model spans less than the limit."""
    span = _extent(examined).max(initial=0.0)
    if examined.measured and span < limit:
        yield Found("model", "warning", f"the whole model spans {span:.3g} m, too little for a fault model in metres", _span(span))


@check(
    "span-large",
    title="models too large to be one",
    why="a projected frame does not reach that far: angles are false, or the unit is not the one declared",
    unit="m",
    limit=2e6,
    source="",
    hint=UNIT_HINT,
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(side_m=9e6)),
    low=1e3,
    high=1e9,
)
def span_large(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the whole model spans more than the limit."""
    span = _extent(examined).max(initial=0.0)
    if span > limit:
        text = f"the whole model spans {span / 1000:,.0f} km; a projected frame in metres holds true over far less"
        yield Found("model", "warning", text, _span(span))


@check(
    "vertical-unit",
    title="vertical extent out of proportion",
    why="degrees or kilometres in plan with metres in depth make every fault look vertical, so no dip is true",
    unit="times",
    limit=20.0,
    source="",
    hint="project degrees to metres before reading, or give plan and depth the same unit",
    passes=samples.one,
    fails=lambda: samples.one(_squeezed(1e-3)),
    low=1.0,
    high=1e6,
)
def vertical_unit(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the model is taller than wide by more than the limit."""
    east, north, up = _extent(examined)
    wide = float(max(east, north))
    if examined.measured and up > limit * wide:
        text = f"the model is {up:,.0f} m tall but only {wide:.3g} m wide: plan and depth seem to be in different units"
        yield Found("model", "warning", text, (("height_m", float(up)), ("width_m", wide)))


@check(
    "all-flat",
    title="models whose faults all lie flat",
    why="depth in kilometres beside metres in plan flattens every fault, so no dip is true",
    unit="deg",
    limit=10.0,
    source="",
    hint="check the unit of the vertical; where the model really holds only thrusts that lie flat, raise no eyebrow",
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(dip_deg=0.1)),
    low=0.0,
    high=45.0,
)
def all_flat(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where even the steepest part of any fault dips less than the limit."""
    steepest = max((part.dip_deg for piece in examined.measured for part in piece.parts), default=90.0)
    if steepest < limit:
        yield Found("model", "warning", f"the steepest fault dips {steepest:.1f} deg", (("steepest_dip_deg", round(steepest, 3)),))


@check(
    "datum",
    title="depth that may have been read as elevation",
    why="with the vertical upside down every fault dips the other way, and normal looks reverse",
    unit="m",
    limit=0.0,
    source="",
    hint='if the third coordinate is depth, positive down, write vertical = "depth" in the model file',
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(centre=(0, 0, 3000.0))),
    low=-1e5,
    high=1e5,
)
def datum(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a finding where every fault lies wholly above the limit: a note, or a warning where it stands higher than any ground."""
    if not examined.measured:
        return
    lowest, highest = float(examined.boxes[:, 0, 2].min()), float(examined.boxes[:, 1, 2].max())
    if lowest >= limit:
        severity = "warning" if highest > HIGHEST_GROUND_M else "note"
        beyond = ", higher than any ground" if highest > HIGHEST_GROUND_M else ""
        text = f"the model lies between elevations {lowest:,.0f} and {highest:,.0f} m{beyond}; most fault models reach below sea level"
        yield Found("model", severity, text, (("lowest_m", round(lowest, 1)), ("highest_m", round(highest, 1))))


@check(
    "far-fault",
    title="faults far outside the model",
    why="a surface in another frame or unit pairs with nothing, or with the wrong faults",
    unit="times",
    limit=50.0,
    source="",
    hint="check the frame, the unit and false origin of that file against the others",
    passes=lambda: samples.examined(*_row(4)),
    fails=lambda: samples.examined(*_row(4), samples.measured(samples.plane(centre=(6e6, 5e6, 0.0)))),
    low=5.0,
    high=1e6,
)
def far_fault(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for faults whose distance from the middle of the model is more than limit times the usual one."""
    if len(examined.measured) < 3:
        return
    centres = examined.boxes.mean(1)
    away = np.sqrt(((centres - np.median(centres, 0)) ** 2).sum(-1))
    usual = max(float(np.median(away)), float(np.median([np.sqrt(piece.area_m2) for piece in examined.measured])))
    far = np.flatnonzero(away > limit * usual)
    names = listed(examined.model.faults[i].name for i in far)
    if len(far):
        text = f"{many(len(far), 'fault lies', 'faults lie')} up to {away.max() / 1000:,.0f} km from the rest: {names}"
        yield Found("model", "warning", text, (("farthest_m", round(float(away.max()))), ("usual_m", round(usual))))


def _extent(examined: Examined) -> Floats:
    """Return the size of the box about all faults, easting, northing, up, m, shape (3,); zero where there is none."""
    if not examined.measured:
        return np.zeros(3)
    return np.asarray(examined.boxes[:, 1].max(0) - examined.boxes[:, 0].min(0), float)


def _span(span: float) -> tuple[tuple[str, float], ...]:
    return (("span_m", float(f"{span:.4g}")),)


def _squeezed(factor: float) -> Surface:
    """Return the sample plane with its plan shrunk by a factor."""
    flat = samples.plane()
    return replace(flat, vertices=flat.vertices * [factor, factor, 1.0])


def _row(count: int) -> list[MeasuredSurface]:
    """Return sample planes side by side."""
    return [samples.measured(samples.plane(centre=(5000.0 * k, 0.0, -3000.0))) for k in range(count)]
