"""What is measured of a model, and what it says of the stress: surfaces, stations, pairs, striae and earthquakes as evidence."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.checks.independent import inversion_of
from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import Sector
from structviz.model import Fault, FaultModel, Finding, Stria
from structviz.orientation.planes import normals as plane_normals
from structviz.orientation.planes import slip_vectors
from structviz.settings import Settings
from structviz.stress.conjugate import PairLimits, Pairs
from structviz.stress.evidence import FaultEvidence, gather, sector_edges
from structviz.stress.mechanism_evidence import evidence_of_mechanisms, joined
from structviz.stress.pairing import CURVED_DEG, PairSubjects, admissible_pairs, partner_support, with_senses
from structviz.stress.slip_lines import OFF_PLANE_DEG, SlipLines, gather_lines, off_plane_deg
from structviz.surfaces.measure import measure
from structviz.surfaces.proximity import candidate_pairs, nearest_approach
from structviz.surfaces.stations import sample_stations
from structviz.surfaces.surface import MeasuredSurface, Stations

Floats = NDArray[np.float64]
Progress = Callable[[str, int, int], None]  # what is being done, how many are done, of how many

FACETS = 6  # a curved fault speaks for this many of its stations


@dataclass(frozen=True, eq=False)
class Examination:
    """Faults in canonical order with all that was measured of them."""

    faults: tuple[Fault, ...]
    measured: tuple[MeasuredSurface, ...]
    stations: tuple[Stations, ...]
    sectors: tuple[Sector | None, ...]
    why_no_sector: tuple[str, ...]


def examine(model: FaultModel, settings: Settings, tell: Progress) -> tuple[Examination, NDArray[np.int64]]:
    """Return the measured faults by decreasing area, and the place in the model of each."""
    measured = for_each(measure, [fault.surface for fault in model.faults], "measuring surfaces", tell)
    keys = [(-float(f"{m.area_m2:.9e}"), *np.round(m.centroids.mean(0), 3)) for m in measured]
    order = np.array(sorted(range(len(keys)), key=keys.__getitem__), dtype=np.int64)
    faults, surfaces = tuple(model.faults[i] for i in order), tuple(measured[i] for i in order)
    stations = for_each(lambda surface: _stations(surface, settings), surfaces, "fitting local planes", tell)
    usable = [usable_sector(f.declared, f.down_side, s.normal, s.dip_deg) for f, s in zip(faults, surfaces, strict=True)]
    return Examination(faults, surfaces, tuple(stations), tuple(u[0] for u in usable), tuple(u[1] for u in usable)), order


def _stations(surface: MeasuredSurface, settings: Settings) -> Stations:
    size = float(np.sqrt(max(part.area_m2 for part in surface.parts)))
    return sample_stations(surface, settings.stations, settings.station_radius * size)


def for_each(work: Callable[[Any], Any], items: Sequence[Any], text: str, tell: Progress) -> list[Any]:
    """Return work done on each item, in order, on as many threads as there are cores: array code lets go of the interpreter."""
    done = []
    with ThreadPoolExecutor(max_workers=min(len(items), os.cpu_count() or 1)) as pool:
        for number, result in enumerate(pool.map(work, items)):
            tell(text, number + 1, len(items))
            done.append(result)
    return done


def pair(examined: Examination, settings: Settings) -> tuple[PairSubjects, Pairs, Pairs]:
    """Return what pairing needs of the faults, the pairs by geometry alone, and the pairs weighed by their senses."""
    limits = PairLimits(friction_angle_deg=settings.friction_angle_deg, reach=settings.pair_reach)
    most = max(len(s.places) for s in examined.stations)
    samples = np.stack([_filled(s.places, most) for s in examined.stations])
    origin = samples.mean((0, 1))
    samples = samples - origin
    centres = samples.mean(1)
    sizes = np.sqrt([m.area_m2 for m in examined.measured])
    normals = np.stack([m.normal for m in examined.measured])
    subjects = PairSubjects(
        normals=normals,
        known=np.array([m.meaningful for m in examined.measured]),
        cones_deg=np.array([min(m.cone_deg, 90.0) if np.isfinite(m.cone_deg) else 20.0 for m in examined.measured]),
        centres=centres,
        sizes_m=sizes,
        edges=np.stack([sector_edges(n[None], s)[0] for n, s in zip(normals, examined.sectors, strict=True)]),
        phases=[fault.phase for fault in examined.faults],
        station_places=samples,
        station_normals=np.stack([_filled(s.normals, most) for s in examined.stations]),
    )
    radii = np.sqrt(((samples - centres[:, None]) ** 2).sum(-1).max(1))
    candidates = candidate_pairs(centres, radii, limits.reach * sizes)
    distance, places = nearest_approach(samples, candidates)
    geometric = admissible_pairs(subjects, candidates, distance, places, limits)
    pairs = with_senses(geometric, subjects, limits)
    return subjects, _moved(geometric, origin), _moved(pairs, origin)


def _filled(rows: Floats, count: int) -> Floats:
    """Return exactly `count` rows by repeating those there are in turn."""
    return rows[np.arange(count) % len(rows)]


def _moved(pairs: Pairs, origin: Floats) -> Pairs:
    return Pairs(pairs.faults, pairs.acute_deg, pairs.obtuse, pairs.weight, pairs.axes, pairs.distance_m, pairs.places + origin)


def _facets(measured: MeasuredSurface, stations: Stations) -> tuple[Floats, Floats]:
    """Return the normals that speak for a fault, (M, 3), and their shares: its mean, or some stations where it is curved."""
    off = np.degrees(np.arccos(np.clip(np.abs(stations.normals @ measured.normal), 0, 1)))
    if measured.meaningful and np.sqrt(np.mean(off**2)) <= CURVED_DEG:
        return measured.normal[None], np.ones(1)
    rows = np.unique(np.linspace(0, len(stations.normals) - 1, FACETS).round().astype(int))
    return stations.normals[rows], np.ones(len(rows))


def evidence_of(examined: Examination, striae: Sequence[Stria], subjects: PairSubjects, geometric: Pairs) -> FaultEvidence:
    facets = [_facets(m, s) for m, s in zip(examined.measured, examined.stations, strict=True)]
    support = partner_support(geometric, len(examined.faults))
    slips = _slip_lines(examined, striae)
    return gather([f[0] for f in facets], [f[1] for f in facets], examined.sectors, support, subjects.known, slips)


def with_earthquakes(evidence: FaultEvidence, model: FaultModel, settings: Settings) -> tuple[FaultEvidence, tuple[Finding, ...]]:
    """Return the evidence of the faults, joined by that of earthquakes where the model asks for it, and what to tell where it cannot be.

    However many the earthquakes are, together they weigh no more than the faults: a catalogue is longer than any model.
    """
    if not model.mechanisms or model.mechanisms_are != "evidence":
        return evidence, ()
    quakes = inversion_of(model.mechanisms, friction_of(settings), settings.random_state)
    if isinstance(quakes, str):
        hint = "give more earthquakes, of more kinds, or none"
        return evidence, (Finding("import", "warning", "model", f"the mechanisms were not used as evidence: {quakes}", (), hint),)
    weights = np.array([each.weight for each in model.mechanisms])
    return joined(evidence, evidence_of_mechanisms(quakes, weights * min(1.0, len(evidence) / max(weights.sum(), 1e-12)))), ()


def friction_of(settings: Settings) -> float:
    return float(np.tan(np.radians(settings.friction_angle_deg)))


def _slip_lines(examined: Examination, striae: Sequence[Stria]) -> SlipLines:
    """Return the striae of each fault that lie on its surface; those farther off it are told by a check and not used.

    The plane of a stria is the one it was measured on; where its sense is known the line points with the hanging wall.
    """
    rows = []
    for fault, stations in zip(examined.faults, examined.stations, strict=True):
        mine = [stria for stria in striae if stria.fault == fault.name]
        normals = plane_normals([s.strike_deg for s in mine], [s.dip_deg for s in mine]).reshape(-1, 3)
        lines = slip_vectors(normals, np.array([s.rake_deg for s in mine], float)).reshape(-1, 3)
        here = np.array([_nearest_normal(stations, stria.place) for stria in mine]).reshape(-1, 3)
        on = off_plane_deg(lines, here) <= OFF_PLANE_DEG
        signed, weights = np.array([s.declared is not None for s in mine], bool), np.array([s.weight for s in mine], float)
        rows.append((normals[on], lines[on], signed[on], weights[on]))
    return gather_lines(*zip(*rows, strict=True))


def _nearest_normal(stations: Stations, place: Sequence[float]) -> Floats:
    if not np.isfinite(place).all():
        return stations.normals.mean(0)
    return stations.normals[((stations.places - np.asarray(place)) ** 2).sum(1).argmin()]
