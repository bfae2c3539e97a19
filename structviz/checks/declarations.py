"""What is declared of the faults, against their own surfaces: missing or ambiguous senses, steep and gentle dips, names, striae."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Callable, Iterator

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, listed, many
from structviz.kinematics.declared import STEEP_DEG
from structviz.kinematics.senses import COMPASS_DEG, DIP_SLIP, Sector
from structviz.model import Fault
from structviz.surfaces.surface import MeasuredSurface

ALONG_STRIKE_DEG = 15.0  # a side named within this of the strike says nothing of which block went down


@check(
    "no-sense",
    title="faults without a declared movement",
    why="they carry geometry only: nothing on them can conflict, and they cannot say which stress moved the model",
    unit="faults",
    limit=0.0,
    source="",
    hint="give sense or rake_deg where offsets, drag or striae show it; leave it empty rather than guess",
    passes=samples.one,
    fails=lambda: samples.examined(samples.measured(samples.plane()), samples.measured(samples.plane(180)), senses="normal -"),
    low=0.0,
    high=1e6,
)
def no_sense(examined: Examined, limit: float) -> Iterator[Found]:
    """Return one finding where more faults than the limit declare nothing: a note, or a warning where none of them does."""
    bare = [fault.name for fault in examined.model.faults if fault.declared is None] if examined.measured else []
    total = len(examined.model.faults)
    if len(bare) > limit:
        everyone = len(bare) == total
        verb = "declares" if len(bare) == 1 else "declare"
        text = f"{len(bare)} of {many(total, 'fault')} {verb} no movement: {listed(bare)}"
        text = "no fault declares a movement, so nothing can be contradicted" if everyone else text
        yield Found("model", "warning" if everyone else "note", text, (("without_sense", len(bare)), ("faults", total)))


@check(
    "down-side-missing",
    title="dip-slip words on near-vertical faults",
    why="near vertical, which block is the hanging wall is a convention, so normal and reverse say nothing until the fallen side is named",
    unit="deg",
    limit=STEEP_DEG,
    source="",
    hint="give down_side (N, NE, ...), the side that went down",
    passes=lambda: samples.with_down_side(samples.one(samples.plane(dip_deg=88)), "E"),
    fails=lambda: samples.one(samples.plane(dip_deg=88)),
    low=45.0,
    high=90.0,
)
def down_side_missing(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault as steep as the limit or steeper that declares dip-slip but no fallen side."""
    for fault, piece in examined.faults():
        if fault.declared and _dip_slip(fault.declared) and not fault.down_side and piece.meaningful and piece.dip_deg >= limit:
            text = f"declared {fault.declared.text}, but it dips {piece.dip_deg:.0f} deg and the side that went down is not named"
            yield Found(fault.name, "warning", text, (("dip_deg", round(piece.dip_deg, 2)),))


@check(
    "down-side",
    title="a fallen side that contradicts the sense",
    why="one of three is wrong: the sense, the side, or the dip of the surface",
    unit="deg",
    limit=STEEP_DEG,
    source="",
    hint="on a normal fault the side it dips towards went down, on a reverse fault the other; find which of the three is in error",
    passes=lambda: samples.with_down_side(samples.one(), "E"),
    fails=lambda: samples.with_down_side(samples.one(), "W"),
    low=0.0,
    high=90.0,
)
def down_side(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a finding for each fault whose fallen side lies along strike, or belies its word where it dips less than the limit."""
    for fault, piece in examined.faults():
        if not (fault.declared and fault.down_side in COMPASS_DEG and piece.meaningful and _dip_slip(fault.declared)):
            continue
        off = _from_dip_direction_deg(piece, COMPASS_DEG[fault.down_side])
        evidence = (("dip_deg", round(piece.dip_deg, 2)), ("dip_direction_deg", round((piece.strike_deg + 90) % 360, 1)))
        if abs(off - 90.0) < ALONG_STRIKE_DEG:
            text = f"the side that went down ({fault.down_side}) lies along strike ({piece.strike_deg:03.0f}), so it says nothing"
            yield Found(fault.name, "warning", text, evidence)
        elif piece.dip_deg < limit and (off < 90) != (fault.declared.rake_deg < 0):
            text = f"declared {fault.declared.text} with the {fault.down_side} side down, but the surface {_dips(piece)}"
            yield Found(fault.name, "error", text, evidence)


@check(
    "gentle-normal",
    title="normal faults that dip gently",
    why="new normal faults dip near 60 deg; one that lies flat was rotated, reactivated or is a detachment, and pairs badly",
    unit="deg",
    limit=30.0,
    source="anderson1951",
    hint="expect such a fault to stand apart from one stress by nature; check the dip, and consider a phase of its own",
    passes=samples.one,
    fails=lambda: samples.one(samples.plane(dip_deg=20)),
    low=0.0,
    high=90.0,
)
def gentle_normal(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault declared normal that dips less than the limit."""
    yield from _by_dip(examined, "normal", lambda dip: dip < limit, "low for a normal fault")


@check(
    "steep-reverse",
    title="reverse faults that dip steeply",
    why="new reverse faults dip near 30 deg; a steep one is often an inverted normal fault, or a wrong label",
    unit="deg",
    limit=70.0,
    source="anderson1951",
    hint="look for growth strata or an older normal offset; where inversion is likely, the conjugate rule does not hold for this fault",
    passes=lambda: samples.examined(samples.measured(samples.plane(dip_deg=30)), senses="reverse"),
    fails=lambda: samples.examined(samples.measured(samples.plane(dip_deg=75)), senses="reverse"),
    low=0.0,
    high=90.0,
)
def steep_reverse(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault declared reverse that dips more than the limit (near-vertical ones with a fallen side left out)."""
    yield from _by_dip(examined, "reverse", lambda dip: limit < dip < STEEP_DEG, "steep for a reverse fault")


@check(
    "like-names",
    title="names that differ only in case, spaces or marks",
    why="one fault under two spellings is judged twice, and striae go to only one of them",
    unit="names",
    limit=0.0,
    source="",
    hint="settle on one spelling, or tell the faults apart in their names",
    passes=lambda: samples.renamed(_two(0, 90), "Great Western", "Little Western"),
    fails=lambda: samples.renamed(_two(0, 90), "Great Western", "great_western"),
    low=0.0,
    high=1e6,
)
def like_names(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note where more groups of names than the limit differ only in case, spaces or punctuation."""
    groups: dict[str, list[str]] = defaultdict(list)
    for fault in examined.model.faults if examined.measured else ():
        groups[re.sub(r"[\W_]+", "", fault.name.casefold()) or fault.name].append(fault.name)
    alike = [names for names in groups.values() if len(names) > 1]
    if len(alike) > limit:
        text = "; ".join(" and ".join(repr(name) for name in sorted(names)) for names in sorted(alike)[:4])
        yield Found("model", "note", f"{many(len(alike), 'name')} spelt in more than one way: {text}", (("names", len(alike)),))


@check(
    "same-surface",
    title="one surface under two names",
    why="a fault that counts twice votes twice for the stress, and for itself when it should be left out",
    unit="m",
    limit=1.0,
    source="",
    hint="keep one of the two; if both senses are in dispute, keep one fault and leave its sense empty",
    passes=lambda: _two(0, 90),
    fails=lambda: _two(0, 0),
    low=0.0,
    high=1e5,
)
def same_surface(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault whose surface coincides with that of an earlier one to within the limit."""
    if len(examined.measured) < 2:
        return
    boxes = examined.boxes.reshape(-1, 6)
    areas, normals = np.array([p.area_m2 for p in examined.measured]), np.array([p.normal for p in examined.measured])
    names = [fault.name for fault in examined.model.faults]
    for row in range(1, len(boxes)):
        near = np.abs(boxes[:row] - boxes[row]).max(1) <= limit
        twins = near & (np.abs(areas[:row] - areas[row]) <= 1e-3 * areas[row]) & (np.abs(normals[:row] @ normals[row]) > 0.999)
        if twins.any():
            other = names[int(np.flatnonzero(twins)[0])]
            yield Found(names[row], "warning", f"its surface is the same as that of {other}", (("other", other),))


def _two(first_strike_deg: float, second_strike_deg: float) -> Examined:
    """Return two sample planes about one centre."""
    return samples.examined(samples.measured(samples.plane(first_strike_deg)), samples.measured(samples.plane(second_strike_deg)))


def _dip_slip(declared: Sector) -> bool:
    """Return True where dip-slip was declared by word, or by a rake within 45 degrees of it."""
    return any(word in DIP_SLIP for word in declared.words) if declared.words else 45.0 <= abs(declared.rake_deg) <= 135.0


def _from_dip_direction_deg(piece: MeasuredSurface, azimuth_deg: float) -> float:
    """Return the angle between an azimuth and the dip direction, degrees [0, 180]."""
    return float(abs((azimuth_deg - piece.strike_deg - 90.0 + 180.0) % 360.0 - 180.0))


def _dips(piece: MeasuredSurface) -> str:
    """Return strike and dip in words, by the right-hand rule."""
    direction = (piece.strike_deg + 90.0) % 360.0
    word = min(COMPASS_DEG, key=lambda name: abs((direction - COMPASS_DEG[name] + 180.0) % 360.0 - 180.0))
    return f"dips {piece.dip_deg:.0f} deg to the {word}"


def _by_dip(examined: Examined, word: str, beyond: Callable[[float], bool], words: str) -> Iterator[Found]:
    """Return a note for each fault whose dominant declared word is given and whose dip is beyond what is usual for it."""
    for fault, piece in examined.faults():
        if _dominant(fault) == word and piece.meaningful and beyond(piece.dip_deg):
            yield Found(fault.name, "note", f"dips {piece.dip_deg:.1f} deg, {words}", (("dip_deg", round(piece.dip_deg, 2)),))


def _dominant(fault: Fault) -> str:
    """Return the dip-slip word that dominates a declaration, or an empty word."""
    if fault.declared is None or not _dip_slip(fault.declared):
        return ""
    words = fault.declared.words
    return words[0] if words else "normal" if fault.declared.rake_deg < 0 else "reverse"
