"""Fault traces from GeoJSON (RFC 7946): lines with dip, dip direction, rake and depth range, made into surfaces.

Properties are taken by the names in PROPERTIES and no others; which ones were used is told. Longitude and latitude are projected to
a plane about the middle of the data, and that is told too.
"""

from __future__ import annotations

import json
import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError, FormatError, StructvizError, TableError
from structviz.io.format import start_of
from structviz.io.ledger import Ledger
from structviz.kinematics.senses import COMPASS_DEG, Sector, sector_of_rake, sector_of_words
from structviz.model import Fault
from structviz.surfaces.from_traces import mean_dip_direction_deg, surface_from_trace
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]

SUFFIXES = (".geojson",)
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
WIDE_DEG = 6.0  # of longitude: a wider model gets a projection of its own instead of a UTM zone


@dataclass(frozen=True)
class Traces:
    """Faults made from traces, and the reference system of their coordinates."""

    faults: tuple[Fault, ...]
    crs: str


def looks_like_traces(content: bytes) -> bool:
    """Return whether a content is a GeoJSON collection."""
    return start_of(content).startswith(b"{") and b'"FeatureCollection"' in content[:100_000]


def read_traces(content: bytes, file: str, ledger: Ledger, where: Mapping[str, str]) -> Traces:
    """Return the faults of the lines of a GeoJSON collection; notes go into the ledger.

    `where` keeps the lines whose properties have one of the values given, parted by commas.
    Raises FormatError where it is no such collection or no line can be used, TableError where a property is out of range.
    """
    tree = _parsed(content, file)
    features = list(_lines(tree, file, where, ledger))
    if not features:
        chosen = " with " + ", ".join(f"{k}={v}" for k, v in where.items()) if where else ""
        raise FormatError(file, f"no lines{chosen}", "LineString or MultiLineString features", hint="check the file and --where")
    _tell_properties(features, file, ledger)
    project, crs, told = _projection(tree, np.concatenate([line for _, _, lines in features for line in lines]), file)
    ledger.note("model", f"{file}: {told}")
    faults, names, left_out = [], set[str](), []
    for number, properties, lines in features:
        place = f"{file}, feature {number}"
        fault = _fault(place, properties, [project(line) for line in lines], f"{file}#{number}", ledger)
        if isinstance(fault, str):
            left_out.append((fault, _text(properties, "name") or f"feature {number}"))
            continue
        name = fault.name if fault.name not in names else f"{fault.name} ({number})"
        names.add(name)
        faults.append(replace(fault, name=name, surface=replace(fault.surface, name=name)))
    _tell_left_out(left_out, file, ledger)
    if not faults:
        raise FormatError(file, "no line with a dip and a side to dip to", "a dip and dip direction for each", hint="add these properties")
    return Traces(tuple(faults), crs)


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
    """Yield number, properties and lines, (N, 2) each, of every feature asked for; others than lines are counted."""
    other = 0
    for number, feature in enumerate(tree["features"], 1):
        properties = feature.get("properties") if isinstance(feature, dict) else None
        geometry = feature.get("geometry") if isinstance(feature, dict) else None
        if not isinstance(properties, dict) or not isinstance(geometry, dict):
            other += 1
            continue
        if any(str(properties.get(key, "")) not in value.split(",") for key, value in where.items()):
            continue
        kind, places = geometry.get("type"), geometry.get("coordinates")
        if kind not in ("LineString", "MultiLineString") or not isinstance(places, list):
            other += 1
            continue
        yield number, properties, [_line(line, f"{file}, feature {number}") for line in (places if kind == "MultiLineString" else [places])]
    if other:
        ledger.note("model", f"{file}: {other} features are no lines with properties and were left out")


def _line(places: Any, where: str) -> Floats:
    try:
        line = np.array([[float(p[0]), float(p[1])] for p in places], float)
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
        found = float(value) * factor
    except (TypeError, ValueError):
        raise TableError(where, f"{wanted} {value!r}", "a number", hint="write a number without unit") from None
    if not (math.isfinite(found) and low <= found <= high):
        raise TableError(where, f"{wanted} {found:g}", f"{low:g} to {high:g}", hint=f"correct {wanted} of that feature")
    return found


def _fault(where: str, properties: Mapping[str, Any], lines: Sequence[Floats], source: str, ledger: Ledger) -> Fault | str:
    """Return the fault of one feature, or in words why it has to be left out."""
    name = _text(properties, "name") or where.rpartition(", ")[2]
    dip = _number(properties, "dip_deg", where, 0.0, 90.0)
    if not dip:
        return "without a dip"
    side = _side_deg(properties, where)
    if side is None and dip < 90.0:
        return "without a dip direction"
    upper, lower = (_number(properties, key, where, 0.0, 1e5) for key in ("upper_depth_m", "lower_depth_m"))
    range_m = (upper or 0.0, lower if lower is not None else (upper or 0.0) + LOWER_DEPTH_M)
    try:
        made = [
            surface_from_trace(line, dip, mean_dip_direction_deg(line, 90.0 if side is None else side), *range_m, name=name)
            for line in lines
            if len(np.unique(line, axis=0)) > 1
        ]
    except StructvizError as error:
        return error.message.partition("found ")[2].partition("; wanted")[0]
    if not made:
        return "of one point"
    starts = np.cumsum([0] + [len(piece.vertices) for piece in made[:-1]])
    vertices = np.concatenate([piece.vertices for piece in made])
    triangles = np.concatenate([piece.triangles + start for piece, start in zip(made, starts, strict=True)])
    surface = Surface(name, vertices, triangles, source)
    return Fault(name, surface, _movement(properties, where), _text(properties, "phase"))


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


def _movement(properties: Mapping[str, Any], where: str) -> Sector | None:
    """Return the declared movement: a rake, else a word; a word of several slips joined otherwise than ours is not taken."""
    rake = _number(properties, "rake_deg", where, -360.0, 360.0)
    if rake is not None:
        return sector_of_rake((rake + 180.0) % 360.0 - 180.0 if rake != 180.0 else 180.0)
    word = re.sub(r"\s*[-_/ ]\s*", "-", _text(properties, "sense").lower())
    try:
        return sector_of_words(word) if word else None
    except ArgumentError as error:
        raise TableError(where, f"sense {word!r}", error.message.partition("; wanted ")[2], hint=error.hint) from None


def _tell_properties(features: Sequence[tuple[int, dict[str, Any], list[Floats]]], file: str, ledger: Ledger) -> None:
    """Note which properties were taken for what, and what was assumed where there was none."""
    used = []
    for wanted, names in PROPERTIES.items():
        found = [key for key in names if any(properties.get(key) not in (None, "") for _, properties, _ in features)]
        if found:
            unit = " (km)" if names[found[0]] == 1000 else ""
            used.append(f"{wanted} from {found[0]}{unit}")
    ledger.note("model", f"{file}: {'; '.join(used)}")
    lacking = sum(_value(properties, "lower_depth_m")[0] is None for _, properties, _ in features)
    if lacking:
        ledger.note("model", f"{file}: {lacking} traces give no lower depth and were drawn down to {LOWER_DEPTH_M / 1000:g} km")


def _tell_left_out(left_out: Sequence[tuple[str, str]], file: str, ledger: Ledger) -> None:
    for reason in dict.fromkeys(reason for reason, _ in left_out):
        names = [name for why, name in left_out if why == reason]
        shown = ", ".join(names[:8]) + (f" and {len(names) - 8} more" if len(names) > 8 else "")
        ledger.note("model", f"{file}: {len(names)} traces {reason} were left out: {shown}", "add what is missing", "warning")


def _projection(tree: dict[str, Any], places: Floats, file: str) -> tuple[Any, str, str]:
    """Return a function from the file's coordinates to metres, the reference system of these, and what to tell of it."""
    crs = tree.get("crs")
    named = str(crs.get("properties", {}).get("name", "")) if isinstance(crs, dict) and isinstance(crs.get("properties"), dict) else ""
    code = re.search(r"EPSG:{1,2}(\d+)$", named)
    if code and code.group(1) != "4326":
        return (lambda line: line), f"EPSG:{code.group(1)}", f"coordinates taken as metres in EPSG:{code.group(1)}, as the file says"
    (west, south), (east, north) = places.min(0), places.max(0)
    if west < -180.0 or east > 180.0 or south < -90.0 or north > 90.0:
        found = f"coordinates up to {np.abs(places).max():g} without a reference system"
        hint = "GeoJSON holds longitude and latitude; name a projected system in a 'crs' member, or export it as it should be"
        raise FormatError(file, found, "longitude and latitude in degrees", hint=hint)
    from pyproj import CRS, Transformer

    if east - west <= WIDE_DEG and south > -80.0 and north < 84.0:
        middle, zone = (south + north) / 2, int(((west + east) / 2 + 180.0) // 6) + 1
        target = f"EPSG:{(32600 if middle >= 0 else 32700) + min(zone, 60)}"
        told, meridian = f"longitude and latitude projected to UTM zone {min(zone, 60)} ({target})", min(zone, 60) * 6 - 183.0
    else:
        meridian = (west + east) / 2
        target = f"+proj=tmerc +lat_0={(south + north) / 2:.4f} +lon_0={(west + east) / 2:.4f} +k=0.9996 +datum=WGS84 +units=m"
        told = f"longitude and latitude projected to a transverse Mercator about the middle of the data ({target})"
    turn = max(east - meridian, meridian - west) * math.sin(math.radians(max(abs(south), abs(north))))
    transformer = Transformer.from_crs(CRS("EPSG:4326"), CRS(target), always_xy=True)

    def project(line: Floats) -> Floats:
        return np.stack(transformer.transform(line[:, 0], line[:, 1]), 1)

    return project, target, f"{told}; azimuths are from grid north, up to {turn:.1f} deg from true north at its edges"
