"""Fault traces from GeoJSON (RFC 7946): lines with dip, dip direction, rake and depth range, made into surfaces.

Properties are taken by the names in PROPERTIES and no others; which ones were used is told. Longitude and latitude are projected to
a plane about the middle of the data, and that is told too.
"""

from __future__ import annotations

import json
import math
import re
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError, FormatError, SurfaceError, TableError
from structviz.io.geographic import projection
from structviz.io.ledger import Ledger
from structviz.kinematics.senses import COMPASS_DEG, DIP_SLIP, RAKE_OF_WORD, Sector, describe_rake, sector_of_rake, sector_of_words
from structviz.model import Fault
from structviz.surfaces.from_traces import mean_dip_direction_deg, surface_from_trace
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]

SUFFIXES = (".geojson", ".json")
# What is needed of a trace, and the names under which it is taken, with the factor to our unit. Nothing else is guessed.
PROPERTIES: Mapping[str, Mapping[str, float]] = {
    "name": {"name": 1, "Name": 1, "fault_name": 1, "FaultName": 1},
    "dip_deg": {"dip_deg": 1, "dip": 1, "DipDeg": 1, "dip_int": 1},
    "dip_direction": {"dip_direction_deg": 1, "dip_direction": 1, "dip_dir": 1, "DipDir": 1},
    "rake_deg": {"rake_deg": 1, "rake": 1, "Rake": 1},
    "sense": {"sense": 1, "slip_type": 1},
    "upper_depth_m": {"upper_depth_m": 1, "upper_depth_km": 1000, "UpDepth": 1000},
    "lower_depth_m": {"lower_depth_m": 1, "lower_depth_km": 1000, "LowDepth": 1000},
    "phase": {"phase": 1},
}
LOWER_DEPTH_M = 15_000.0  # where none is given: about the base of brittle faulting in continents (common practice)
VAGUE_DEG = 45.0  # a dip direction further than this from across the trace is told
ALONG_DEG = 75.0  # one further than this does not say to which side


@dataclass(frozen=True)
class Traces:
    """Faults made from traces, and the reference system of their coordinates."""

    faults: tuple[Fault, ...]
    crs: str


def read_traces(content: bytes, file: str, ledger: Ledger, where: Mapping[str, str]) -> Traces:
    """Return the faults of the lines of a GeoJSON collection; notes go into the ledger.

    `where` keeps the lines whose properties have one of the values given, parted by commas.
    Raises FormatError where it is no such collection or no line can be used, TableError where a property is out of range.
    """
    tree = _parsed(content, file)
    features = list(_lines(tree, file, where, ledger))
    if not any(lines for _, _, lines in features):
        chosen = " with " + ", ".join(f"{k}={v}" for k, v in where.items()) if where else ""
        raise FormatError(file, f"no lines{chosen}", "LineString or MultiLineString features", hint="check the file and --where")
    _tell_properties(features, file, ledger)
    placed = projection(tree, np.concatenate([line for _, _, lines in features for line in lines])[:, :2], file)
    ledger.note("model", f"{file}: {placed.told}")
    faults, names, told = [], set[str](), Remarks()
    for number, properties, lines in features:
        own = [np.column_stack([placed.metres(line[:, :2]), line[:, 2]]) for line in lines]
        fault = _fault(f"{file}, feature {number}", properties, own, f"{file}#{number}", told)
        if fault is None:
            continue
        name = _free_name(fault.name, number, names)
        names.add(name)
        faults.append(replace(fault, name=name, surface=replace(fault.surface, name=name)))
    told.tell(file, ledger)
    if not faults:
        reasons = [f"{len(who)} {reason}" for reason, who in told.left_out.items()]
        shown = ", ".join(reasons[:3]) + (" and other reasons" if len(reasons) > 3 else "")
        wanted = "a dip, a dip direction across the trace, and a lower depth below the upper"
        raise FormatError(file, f"no trace that can be used ({shown})", wanted, hint="add or correct these properties")
    return Traces(tuple(faults), placed.crs)


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


def _free_name(name: str, number: int, taken: set[str]) -> str:
    """Return a name that no trace before has: its own, else with the number of the feature."""
    candidates = (name, f"{name} ({number})", *(f"{name} ({number}, {k})" for k in range(2, len(taken) + 3)))
    return next(candidate for candidate in candidates if candidate not in taken)


def _parsed(content: bytes, file: str) -> dict[str, Any]:
    def refuse(word: str) -> float:
        raise ValueError(f"{word}, which is no JSON")

    try:
        tree = json.loads(content.decode("utf-8-sig"), parse_constant=refuse)
    except (ValueError, RecursionError) as error:
        raise FormatError(file, f"text that is not JSON ({error})"[:200], "a GeoJSON FeatureCollection", hint="export it again") from None
    if not isinstance(tree, dict) or tree.get("type") != "FeatureCollection" or not isinstance(tree.get("features"), list):
        raise FormatError(file, "JSON of another kind", "a GeoJSON FeatureCollection", hint="export the traces as a FeatureCollection")
    return tree


def _lines(tree: dict[str, Any], file: str, where: Mapping[str, str], ledger: Ledger) -> Iterator[tuple[int, dict[str, Any], list[Floats]]]:
    """Yield number, properties and lines, (N, 3) each, of every feature asked for; others than lines are counted."""
    other, high = 0, 0
    for number, feature in enumerate(tree["features"], 1):
        properties = feature.get("properties") if isinstance(feature, dict) else None
        geometry = feature.get("geometry") if isinstance(feature, dict) else None
        if not isinstance(properties, dict) or not isinstance(geometry, dict):
            other += 1
            continue
        if not _chosen(properties, where):
            continue
        kind, places = geometry.get("type"), geometry.get("coordinates")
        if kind not in ("LineString", "MultiLineString") or not isinstance(places, list):
            other += 1
            continue
        lines = [_line(line, f"{file}, feature {number}") for line in (places if kind == "MultiLineString" else [places])]
        high += any(line[:, 2].any() for line in lines)
        yield number, properties, lines
    if other:
        ledger.note("model", f"{file}: {other} features left out, no lines with properties")
    if high:
        ledger.note("model", f"{file}: heights, which {high} features have, are taken as metres; depths count from there")


def _chosen(properties: Mapping[str, Any], where: Mapping[str, str]) -> bool:
    """Return whether every property asked for has the value given, or one of several parted by commas."""
    for key, wanted in where.items():
        found = properties.get(key)
        if ("" if found is None else str(found)) not in (wanted, *(value.strip() for value in wanted.split(","))):
            return False
    return True


def _line(places: Any, where: str) -> Floats:
    """Return longitude, latitude (or easting, northing) and height, 0 where there is none, of each point of a line."""
    try:
        line = np.array([[float(p[0]), float(p[1]), float(p[2]) if len(p) > 2 else 0.0] for p in places], float)
    except (TypeError, ValueError, IndexError, KeyError, OverflowError):
        raise FormatError(where, "coordinates that are not pairs of numbers", "pairs of numbers", hint="export the trace again") from None
    if line.ndim != 2 or not np.isfinite(line).all():
        raise FormatError(where, "a line without points, or with numbers that are not finite", "finite points", hint="export it again")
    return line


def _value(properties: Mapping[str, Any], wanted: str) -> tuple[Any, float]:
    """Return what a feature says of one thing, None where nothing, and the factor to our unit."""
    for key, factor in PROPERTIES[wanted].items():
        if properties.get(key) not in (None, ""):
            return properties[key], factor
    return None, 1.0


def _text(properties: Mapping[str, Any], wanted: str) -> str:
    value, _ = _value(properties, wanted)
    return "" if value is None else str(value).strip()


def _number(properties: Mapping[str, Any], wanted: str, where: str, low: float, high: float) -> float | None:
    value, factor = _value(properties, wanted)
    if value is None:
        return None
    try:
        found = float(value if not isinstance(value, bool) else "") * factor
    except (TypeError, ValueError):
        raise TableError(where, f"{wanted} {value!r}", "a number", hint="write a number without unit") from None
    if not (math.isfinite(found) and low <= found <= high):
        raise TableError(where, f"{wanted} {found:g}", f"{low:g} to {high:g}", hint=f"correct {wanted} of that feature")
    return found


def _fault(where: str, properties: Mapping[str, Any], lines: Sequence[Floats], source: str, told: Remarks) -> Fault | None:
    """Return the fault of one feature; None where it has to be left out, and why among the remarks."""
    name = _text(properties, "name") or where.rpartition(", ")[2]
    dip, side = _number(properties, "dip_deg", where, 0.0, 90.0), _side_deg(properties, where)
    lines = [line for line in lines if len(np.unique(line[:, :2], axis=0)) > 1]
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
        surface = _surface(lines, dip, across, _depths_m(properties, where), name, source)
    except SurfaceError as error:
        told.leave_out(f"with {error.found}", name)
        return None
    declared, down_side = _movement(properties, where, name, told), ""
    if dip == 90.0:
        declared, down_side = _on_vertical(declared, across if told_side else None)
    return Fault(name, surface, declared, _text(properties, "phase"), down_side)


def _depths_m(properties: Mapping[str, Any], where: str) -> tuple[float, float]:
    upper, lower = (_number(properties, key, where, 0.0, 1e5) for key in ("upper_depth_m", "lower_depth_m"))
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
    text = _text(properties, "dip_direction")
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
    rake = _number(properties, "rake_deg", where, -360.0, 360.0)
    word = re.sub(r"\s*[-_/ ]\s*", "-", _text(properties, "sense").lower())
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


def _tell_properties(features: Sequence[tuple[int, dict[str, Any], list[Floats]]], file: str, ledger: Ledger) -> None:
    """Note which properties were taken for what, and what was assumed where there was none."""
    used: list[str] = []
    for wanted, names in PROPERTIES.items():
        given = [[key for key in names if properties.get(key) not in (None, "")] for _, properties, _ in features]
        taken = Counter(keys[0] for keys in given if keys)
        words = [f"{key}{' (km)' * (names[key] == 1000)}{f' ({count})' * (len(taken) > 1)}" for key, count in taken.items()]
        used += [f"{wanted} from {' and '.join(words)}"] if words else []
        passed_over = [keys for keys in given if len(keys) > 1]
        if passed_over:
            first, *others = passed_over[0]
            ledger.note(
                "model",
                f"{file}: {len(passed_over)} of {len(given)} traces give {wanted} as {first} and {', '.join(others)}; {first} is used",
            )
    ledger.note("model", f"{file}: {'; '.join(used) or 'no property that is known'}")
    lacking = sum(_value(properties, "lower_depth_m")[0] is None for _, properties, _ in features)
    if lacking:
        told = f"{lacking} of {len(features)} traces give no lower depth and are drawn {LOWER_DEPTH_M / 1000:g} km down"
        ledger.note("model", f"{file}: {told}")
