"""Faults from lines: traces with dip, dip direction, rake and depth range; lines without a dip that share a fault are sticks of it.

Properties are taken by the names of one table (`trace_properties`) and no others; which ones were used is told. Longitude and latitude
are projected to a plane about the middle of the data, and that is told too.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError, FormatError, SurfaceError, TableError
from structviz.io.geographic import projection
from structviz.io.ledger import Ledger
from structviz.io.lines import LineFeature, LineSet, chosen, in_one_system
from structviz.io.sticks import Stick, sticks_by_fault, tell_lofts
from structviz.io.tables import nearest
from structviz.io.trace_properties import LOWER_DEPTH_M, number_of, tell_cut_names, tell_properties, text_of, value_of
from structviz.kinematics.senses import COMPASS_DEG, DIP_SLIP, RAKE_OF_WORD, Sector, describe_rake, sector_of_rake, sector_of_words
from structviz.model import Fault
from structviz.surfaces.from_sticks import Loft, surface_from_sticks
from structviz.surfaces.from_traces import mean_dip_direction_deg, surface_from_trace
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]

VAGUE_DEG = 45.0  # a dip direction further than this from across the trace is told
ALONG_DEG = 75.0  # one further than this does not say to which side


@dataclass(frozen=True)
class Traces:
    """Faults made from lines, and the reference system of their coordinates."""

    faults: tuple[Fault, ...]
    crs: str


def faults_of_lines(sets: Sequence[LineSet], ledger: Ledger, where: Mapping[str, str]) -> Traces:
    """Return the faults of all lines; notes go into the ledger.

    `where` keeps the lines whose properties have one of the values given, parted by commas.
    Raises FormatError where no line can be used, TableError where a property is out of range.
    """
    sets, crs = in_one_system(chosen(sets, where, ledger), ledger)
    files = ", ".join(dict.fromkeys(each.file for each in sets))
    placed = projection(crs, np.concatenate([line for each in sets for f in each.features for line in f.lines])[:, :2], files)
    ledger.note("model", f"{files}: {placed.told}")
    told = Remarks()
    made = [fault for each in sets for fault in _faults_of_set(in_metres(each, placed.metres), ledger, told)]
    told.tell(files, ledger)
    if not made:
        reasons = [f"{len(who)} {reason}" for reason, who in told.left_out.items()]
        shown = ", ".join(reasons[:3]) + (" and other reasons" if len(reasons) > 3 else "")
        wanted = "a dip, a dip direction across the trace, and a lower depth below the upper"
        raise FormatError(files, f"no trace that can be used ({shown})", wanted, hint="add or correct these properties")
    return Traces(_apart(made, files, ledger), placed.crs)


def in_metres(each: LineSet, metres: Callable[[Floats], Floats]) -> LineSet:
    """Return the set with its lines projected."""

    def placed(line: Floats) -> Floats:
        return np.column_stack([metres(line[:, :2]), line[:, 2]])

    return replace(each, features=tuple(replace(f, lines=tuple(placed(line) for line in f.lines)) for f in each.features))


def _faults_of_set(each: LineSet, ledger: Ledger, told: Remarks) -> Iterator[tuple[Fault, str]]:
    """Yield the faults of one file or layer, each with the mark that keeps it apart from others of its name."""
    groups, single = _sticks_and_traces(each.features)
    tell_properties(single, each.file, ledger)
    tell_cut_names(each.features, each.file, ledger)
    for feature in single:
        fault = _fault(feature, told)
        if fault is not None:
            yield fault, feature.source.rpartition("#")[2]
    lofts: list[tuple[Loft, list[Stick]]] = []
    for name, features in groups.items():
        fault = _fault_of_sticks(name, features, lofts, told)
        if fault is not None:
            yield fault, features[0].source.rpartition("#")[2]
    tell_lofts(lofts, each.file, ledger)


def _sticks_and_traces(features: Sequence[LineFeature]) -> tuple[dict[str, list[LineFeature]], list[LineFeature]]:
    """Return the features that are sticks, by fault, and all others: sticks share a fault, have heights that differ and no dip."""
    groups = sticks_by_fault(features, _stick_fault, lambda feature: value_of(feature.properties, "dip_deg")[0] is not None)
    sticks = {id(feature) for group in groups.values() for feature in group}
    return groups, [feature for feature in features if id(feature) not in sticks]


def _stick_fault(feature: LineFeature) -> str:
    """Return the fault a stick belongs to: its property fault, else its name."""
    given = {key.lower(): value for key, value in feature.properties.items()}
    return str(given.get("fault") or "").strip() or text_of(feature.properties, "name")


def _fault_of_sticks(name: str, features: Sequence[LineFeature], lofts: list[tuple[Loft, list[Stick]]], told: Remarks) -> Fault | None:
    """Return the fault lofted between the sticks of all its features; its movement is that of the first feature that gives one."""
    sticks = [Stick(feature.where.rpartition(", ")[2], line) for feature in features for line in feature.lines]
    try:
        lofts.append((surface_from_sticks([stick.points for stick in sticks], name=name, source=features[0].source), sticks))
    except SurfaceError as error:
        told.leave_out(f"with {error.found}", name)
        return None
    said = {key: [f for f in features if text_of(f.properties, key)] for key in ("rake_deg", "sense", "down_side", "phase")}
    for key, givers in said.items():
        if len({text_of(f.properties, key) for f in givers}) > 1:
            told.remark(f"with sticks that differ in {key}, that of the first used", "make them the same", "warning", name)
    properties = {key: text_of(givers[0].properties, key) for key, givers in said.items() if givers}
    where = features[0].where
    declared = _movement(properties, where, name, told)
    return Fault(name, lofts[-1][0].surface, declared, properties.get("phase", ""), _down_side(properties, where))


def _apart(made: Sequence[tuple[Fault, str]], files: str, ledger: Ledger) -> tuple[Fault, ...]:
    """Return the faults with distinct names; those that had to be renamed are told."""
    names, renamed, faults = set[str](), [], []
    for fault, mark in made:
        name = _free_name(fault.name, mark, names)
        names.add(name)
        renamed += [name] if name != fault.name else []
        faults.append(replace(fault, name=name, surface=replace(fault.surface, name=name)))
    if renamed:
        message = f"{files}: {_counted(renamed)} with the name of another, told apart as {_listed(renamed)}"
        ledger.note("model", message, "give each fault a name of its own", "warning")
    return tuple(faults)


@dataclass
class Remarks:
    """What there is to tell of the traces: each remark with the names it is about, told once for all of them."""

    left_out: dict[str, list[str]] = field(default_factory=dict)
    used: dict[tuple[str, str, str], list[str]] = field(default_factory=dict)

    def leave_out(self, reason: str, name: str) -> None:
        """Add a trace that is no fault of the model, and why."""
        self.left_out.setdefault(reason, []).append(name)

    def remark(self, message: str, hint: str, severity: str, name: str) -> None:
        """Add a trace that is used, though not quite as it stands."""
        self.used.setdefault((message, hint, severity), []).append(name)

    def tell(self, file: str, ledger: Ledger) -> None:
        """Note every remark."""
        for reason, names in self.left_out.items():
            ledger.note("model", f"{file}: {_counted(names)} left out, {reason}: {_listed(names)}", "add what is missing", "warning")
        for (message, hint, severity), names in self.used.items():
            ledger.note("model", f"{file}: {_counted(names)} {message}: {_listed(names)}", hint, severity)


def _counted(names: Sequence[str]) -> str:
    return f"{len(names)} trace{'s' * (len(names) > 1)}"


def _listed(names: Sequence[str]) -> str:
    return ", ".join(names[:8]) + (f" and {len(names) - 8} more" if len(names) > 8 else "")


def _free_name(name: str, mark: str, taken: set[str]) -> str:
    """Return a name that no fault before has: its own, else with the mark of the feature."""
    candidates = (name, f"{name} ({mark})", *(f"{name} ({mark}, {k})" for k in range(2, len(taken) + 3)))
    return next(candidate for candidate in candidates if candidate not in taken)


def _fault(feature: LineFeature, told: Remarks) -> Fault | None:
    """Return the fault of one feature; None where it has to be left out, and why among the remarks."""
    where, properties = feature.where, feature.properties
    name = text_of(properties, "name") or where.rpartition(", ")[2]
    dip, side = number_of(properties, "dip_deg", where, 0.0, 90.0), _side_deg(properties, where)
    lines = [line for line in feature.lines if len(np.unique(line[:, :2], axis=0)) > 1]
    if not dip or not lines:
        told.leave_out("of one point" if dip else "without a dip", name)
        return None
    across, off = _across_deg(lines, 90.0 if side is None else side)
    told_side = side is not None and off <= ALONG_DEG
    if dip < 90.0 and not told_side:
        told.leave_out("without a dip direction" if side is None else "with a dip direction along the trace", name)
        return None
    if told_side and off > VAGUE_DEG:
        told.remark(f"with a dip direction over {VAGUE_DEG:g} deg off, drawn across the chord", "check the direction", "note", name)
    try:
        surface = _surface(lines, dip, across, _depths_m(properties, where), name, feature.source)
    except SurfaceError as error:
        told.leave_out(f"with {error.found}", name)
        return None
    declared, down_side = _movement(properties, where, name, told), ""
    if dip == 90.0:
        declared, down_side = _on_vertical(declared, across if told_side else None)
    return Fault(name, surface, declared, text_of(properties, "phase"), _down_side(properties, where) or down_side)


def _down_side(properties: Mapping[str, Any], where: str) -> str:
    """Return the compass word of the side that went down, "" where none is given."""
    word = text_of(properties, "down_side").upper()
    if word and word not in COMPASS_DEG:
        hint = f"{nearest(word, COMPASS_DEG)}give the side that went down as a compass word"
        raise TableError(where, f"down_side {word!r}", f"one of {', '.join(COMPASS_DEG)}", hint=hint)
    return word


def _depths_m(properties: Mapping[str, Any], where: str) -> tuple[float, float]:
    upper, lower = (number_of(properties, key, where, 0.0, 1e5) for key in ("upper_depth_m", "lower_depth_m"))
    return upper or 0.0, lower if lower is not None else (upper or 0.0) + LOWER_DEPTH_M


def _surface(lines: Sequence[Floats], dip: float, side: float, depths_m: tuple[float, float], name: str, source: str) -> Surface:
    """Return the surface of all lines of a feature, each dipping across itself on the side named."""
    made = [surface_from_trace(line, dip, mean_dip_direction_deg(line, side), *depths_m, name=name) for line in lines]
    starts = np.cumsum([0] + [len(piece.vertices) for piece in made[:-1]])
    triangles = np.concatenate([piece.triangles + start for piece, start in zip(made, starts, strict=True)])
    return Surface(name, np.concatenate([piece.vertices for piece in made]), triangles, source)


def _across_deg(lines: Sequence[Floats], side_deg: float) -> tuple[float, float]:
    """Return the azimuth across all lines together, on the side named, and how far off that side is, degrees [0, 90]."""
    chords = np.array([line[-1, :2] - line[0, :2] for line in lines])
    longest = chords[np.linalg.norm(chords, axis=1).argmax()]
    whole = (chords * np.where(chords @ longest < 0, -1.0, 1.0)[:, None]).sum(0)
    across = mean_dip_direction_deg(np.array([0 * whole, whole]) if whole.any() else lines[0], side_deg)
    return across, abs((across - side_deg + 180.0) % 360.0 - 180.0)


def _side_deg(properties: Mapping[str, Any], where: str) -> float | None:
    """Return the azimuth of the dip, from a compass word or a number; None where none is given or the word says vertical."""
    text = text_of(properties, "dip_direction")
    if text.upper() in COMPASS_DEG:
        return float(COMPASS_DEG[text.upper()])
    if not text or text.lower() in ("vertical", "v"):
        return None
    try:
        azimuth = float(text)
    except ValueError:
        wanted = f"degrees, or one of {', '.join(COMPASS_DEG)}, Vertical"
        raise TableError(where, f"dip direction {text!r}", wanted, hint="give the side to which the fault dips") from None
    if not (math.isfinite(azimuth) and -360.0 <= azimuth <= 360.0):
        raise TableError(where, f"dip direction {azimuth:g}", "0 to 360 degrees", hint="correct the dip direction")
    return azimuth % 360.0


def _movement(properties: Mapping[str, Any], where: str, name: str, told: Remarks) -> Sector | None:
    """Return the declared movement: a rake, else a word. Where both are given and differ, that is told."""
    rake = number_of(properties, "rake_deg", where, -360.0, 360.0)
    word = re.sub(r"\s*[-_/ ]\s*", "-", text_of(properties, "sense").lower())
    try:
        said = sector_of_words(word) if word else None
    except ArgumentError as error:
        raise TableError(where, f"sense {word!r}", error.message.partition("; wanted ")[2], hint=error.hint) from None
    if rake is None:
        return said
    exact = sector_of_rake(180.0 - (180.0 - rake) % 360.0)
    if said and abs((exact.rake_deg - said.rake_deg + 180.0) % 360.0 - 180.0) > said.half_width_deg:
        told.remark("with a rake that belies the sense, the rake used", "correct one of the two", "warning", name)
    return exact


def _on_vertical(declared: Sector | None, hanging_deg: float | None) -> tuple[Sector | None, str]:
    """Return a movement that does not hang on which wall of a vertical plane is called the hanging one, and the side that went down.

    A rake with some dip-slip in it becomes the words it is nearest to: they are tested with the side that went down, and without a
    side only what is strike-slip in them is.
    """
    if declared is None:
        return None, ""
    words = declared.words or tuple(describe_rake(declared.rake_deg).split("-"))
    slip = next((word for word in words if word in DIP_SLIP), "")
    if not slip:
        return declared if declared.words else sector_of_rake(RAKE_OF_WORD[words[0]]), ""
    down = "" if hanging_deg is None else _compass(hanging_deg if slip == "normal" else hanging_deg + 180.0)
    return sector_of_words("-".join(words)), down


def _compass(azimuth_deg: float) -> str:
    return list(COMPASS_DEG)[round(azimuth_deg / 22.5) % 16]
