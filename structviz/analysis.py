"""The use cases: run(model, settings) -> Analysis."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import Field, dataclass, field, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz import checks
from structviz._version import __version__
from structviz.checks.independent import comparisons, inversion_of
from structviz.checks.registry import Examined
from structviz.errors import ArgumentError
from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import Sector
from structviz.model import Fault, FaultModel, Finding, Stria
from structviz.orientation.planes import normals as plane_normals
from structviz.orientation.planes import slip_vectors
from structviz.stress.answer import Answer, answer, in_order, is_tight, judge_in_phases
from structviz.stress.causes import causes_of
from structviz.stress.compare import Comparison
from structviz.stress.conjugate import PairLimits, Pairs
from structviz.stress.evidence import EvidenceModel, FaultEvidence, gather, sector_edges
from structviz.stress.joint import Terms, infer
from structviz.stress.mechanism_evidence import evidence_of_mechanisms, joined
from structviz.stress.pairing import CURVED_DEG, PairSubjects, admissible_pairs, partner_support, with_senses
from structviz.stress.readings import pair_frames, regime_of_frames, shape_ratio_of
from structviz.stress.regime import Reading, Regime
from structviz.stress.replicates import Posterior, bootstrap_counts
from structviz.stress.slip_lines import OFF_PLANE_DEG, SlipLines, gather_lines, off_plane_deg
from structviz.stress.verdict import Verdict, VerdictLimits, undetermined
from structviz.surfaces.measure import measure
from structviz.surfaces.proximity import candidate_pairs, nearest_approach
from structviz.surfaces.stations import sample_stations
from structviz.surfaces.surface import MeasuredSurface, Stations

Floats = NDArray[np.float64]
Progress = Callable[[str, int, int], None]  # what is being done, how many are done, of how many

CAUTIONS = (
    "A screening aid: it tests geometry against declared movement. It does not measure stress magnitude, fault stability or hazard.",
    "It does not replace local codes, site investigation or the judgement of a licensed professional.",
    "Conjugate inference assumes new faults in isotropic rock (Anderson); reactivated, low-angle and salt- or shale-detached faults "
    "break it by nature, not by error.",
    "Directions only: the shape ratio R is reported where the data resolve it, stress magnitudes never are.",
)
FACETS = 6  # a curved fault speaks for this many of its stations
PAIR_REPLICATES = 200


def setting(default: object, unit: str, low: float, high: float, text: str) -> Any:
    """Return a dataclass field of Settings with its unit, range and help."""
    return field(default=default, metadata={"unit": unit, "low": low, "high": high, "help": text})


def bounds(item: Field[Any]) -> str:
    """Return the range of a setting in words, with its unit."""
    low, high = (f"{item.metadata[end]:{'d' if isinstance(item.default, int) else 'g'}}" for end in ("low", "high"))
    return f"{low} to {high} {item.metadata['unit']}".rstrip()


@dataclass(frozen=True)
class Settings:
    """Every choice a user may change; each field is a command-line option, a key of results.json and a row of the README."""

    friction_angle_deg: float = setting(30.0, "deg", 5.0, 60.0, "friction angle; conjugate faults are expected 90 minus this apart")
    pair_reach: float = setting(
        1.0, "fault sizes", 0.01, 100.0, "how far apart two surfaces may lie and still pair, in units of their summed sizes"
    )
    stations: int = setting(24, "", 4, 1000, "stations for local orientation on each fault")
    station_radius: float = setting(0.15, "fault sizes", 0.01, 2.0, "radius of the plane fitted at a station, in units of the fault's size")
    replicates: int = setting(500, "", 50, 100000, "bootstrap replicates over faults")
    random_state: int = setting(0, "", 0, 2**31 - 1, "seed; the same seed gives the same result")
    conflict_probability: float = setting(
        0.9, "", 0.5, 1.0, "probability of slip outside the declared sector from which a fault is conflicting"
    )
    least_shear: float = setting(0.15, "of greatest", 0.0, 0.9, "shear below which no direction of slip is predicted")

    def __post_init__(self) -> None:
        """Raise ArgumentError where a value is outside its range."""
        for item in fields(self):
            value, low, high = getattr(self, item.name), item.metadata["low"], item.metadata["high"]
            if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
                wanted = bounds(item)
                raise ArgumentError(f"{item.name}: found {value!r}; wanted {wanted}", hint=f"{item.metadata['help']}")


@dataclass(frozen=True, eq=False)
class FaultResult:
    """One fault: as declared, as measured, as judged."""

    fault: Fault
    measured: MeasuredSurface
    stations: Stations
    verdict: Verdict
    sector: Sector | None = None  # the declaration as it could be tested on this surface; None where it could not
    phase: int = 0  # row of Analysis.regimes by which it is judged
    membership: tuple[float, ...] = ()  # probability of each phase, where there are several


@dataclass(frozen=True, eq=False)
class Analysis:
    """The whole result, with what is needed to make it again."""

    model: FaultModel
    settings: Settings
    faults: tuple[FaultResult, ...]
    pairs: Pairs
    readings: tuple[Reading, ...]  # geometry, pairs, senses, joint
    regimes: tuple[Regime, ...]  # those the verdicts follow, heaviest first; empty where none could be inferred
    findings: tuple[Finding, ...]
    cautions: tuple[str, ...]
    version: str
    limits: Mapping[str, float] = field(default_factory=dict)  # of every check that was run
    answer: Answer | None = None  # the stress with its replicates, faults in the order of the model; None where nothing speaks
    comparisons: tuple[Comparison, ...] = ()  # of each regime with wells and earthquakes

    @property
    def conflicting(self) -> tuple[FaultResult, ...]:
        """The faults whose declared movement the others contradict."""
        return tuple(result for result in self.faults if result.verdict.word == "conflicting")


@dataclass(frozen=True, eq=False)
class _Examination:
    """Faults in canonical order with all that was measured of them."""

    faults: tuple[Fault, ...]
    measured: tuple[MeasuredSurface, ...]
    stations: tuple[Stations, ...]
    sectors: tuple[Sector | None, ...]
    why_no_sector: tuple[str, ...]


def run(
    model: FaultModel, settings: Settings | None = None, *, limits: Mapping[str, float] | None = None, progress: Progress | None = None
) -> Analysis:
    """Return the analysis of a model: its surfaces measured, its stress inferred, every fault judged by the others.

    Neither the order of the faults nor their names change anything: work is done in an order of their own (by area), and the
    results are put back in the order of the model.
    """
    settings = settings or Settings()
    tell = progress or (lambda text, done, total: None)
    examined, order = _examine(model, settings, tell)
    tell("pairing faults", 0, 1)
    subjects, geometric, pairs = _pair(examined, settings)
    tell("inferring stress", 0, 1)
    evidence, told = _with_earthquakes(_evidence(examined, model.striae, subjects, geometric), model, settings)
    counts = bootstrap_counts(len(evidence), settings.replicates, settings.random_state)
    readings, found = _read(evidence, geometric, pairs, counts, [fault.phase for fault in examined.faults], settings)
    verdicts = _judge_all(examined, found, settings, tell)
    back = np.argsort(order)
    found = in_order(found, np.append(back, np.arange(len(back), len(evidence)))) if found else None
    results = tuple(_result(examined, found, verdicts[i], int(i), place) for place, i in enumerate(back))
    pairs = _renumber(pairs, order)
    regimes, contradictions = (found.regimes, found.phases.contradictions) if found else ((), ())
    tell("checking", 0, 1)
    measured, judged = tuple(r.measured for r in results), tuple(r.verdict for r in results)
    compared = comparisons(model, regimes, _friction(settings), settings.random_state)
    evidence_for_checks = Examined(model, measured, pairs, readings, regimes, judged, contradictions, compared)
    used = checks.checked_limits(limits or {})
    findings = model.findings + told + checks.run(evidence_for_checks, used)
    return Analysis(model, settings, results, pairs, readings, regimes, findings, CAUTIONS, __version__, used, found, compared)


def _result(examined: _Examination, found: Answer | None, verdict: Verdict, i: int, place: int) -> FaultResult:
    several = found is not None and len(found.regimes) > 1
    phase, membership = (int(found.homes[place]), tuple(map(float, found.phases.membership[place]))) if found and several else (0, ())
    return FaultResult(examined.faults[i], examined.measured[i], examined.stations[i], verdict, examined.sectors[i], phase, membership)


def _examine(model: FaultModel, settings: Settings, tell: Progress) -> tuple[_Examination, NDArray[np.int64]]:
    """Return the measured faults by decreasing area, and the place in the model of each."""
    measured = _for_each(measure, [fault.surface for fault in model.faults], "measuring surfaces", tell)
    keys = [(-float(f"{m.area_m2:.9e}"), *np.round(m.centroids.mean(0), 3)) for m in measured]
    order = np.array(sorted(range(len(keys)), key=keys.__getitem__), dtype=np.int64)
    faults, surfaces = tuple(model.faults[i] for i in order), tuple(measured[i] for i in order)
    stations = _for_each(lambda surface: _stations(surface, settings), surfaces, "fitting local planes", tell)
    usable = [usable_sector(f.declared, f.down_side, s.normal, s.dip_deg) for f, s in zip(faults, surfaces, strict=True)]
    return _Examination(faults, surfaces, tuple(stations), tuple(u[0] for u in usable), tuple(u[1] for u in usable)), order


def _stations(surface: MeasuredSurface, settings: Settings) -> Stations:
    size = float(np.sqrt(max(part.area_m2 for part in surface.parts)))
    return sample_stations(surface, settings.stations, settings.station_radius * size)


def _for_each(work: Callable[[Any], Any], items: Sequence[Any], text: str, tell: Progress) -> list[Any]:
    """Return work done on each item, in order, on as many threads as there are cores: array code lets go of the interpreter."""
    done = []
    with ThreadPoolExecutor(max_workers=min(len(items), os.cpu_count() or 1)) as pool:
        for number, result in enumerate(pool.map(work, items)):
            tell(text, number + 1, len(items))
            done.append(result)
    return done


def _pair(examined: _Examination, settings: Settings) -> tuple[PairSubjects, Pairs, Pairs]:
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


def _renumber(pairs: Pairs, order: NDArray[np.int64]) -> Pairs:
    """Return the pairs numbered as in the model, heaviest first."""
    faults = np.sort(order[pairs.faults], axis=1).reshape(-1, 2)
    rows = np.lexsort((faults[:, 1], faults[:, 0], -pairs.weight))
    return Pairs(faults, pairs.acute_deg, pairs.obtuse, pairs.weight, pairs.axes, pairs.distance_m, pairs.places).rows(rows)


def _facets(measured: MeasuredSurface, stations: Stations) -> tuple[Floats, Floats]:
    """Return the normals that speak for a fault, (M, 3), and their shares: its mean, or some stations where it is curved."""
    off = np.degrees(np.arccos(np.clip(np.abs(stations.normals @ measured.normal), 0, 1)))
    if measured.meaningful and np.sqrt(np.mean(off**2)) <= CURVED_DEG:
        return measured.normal[None], np.ones(1)
    rows = np.unique(np.linspace(0, len(stations.normals) - 1, FACETS).round().astype(int))
    return stations.normals[rows], np.ones(len(rows))


def _evidence(examined: _Examination, striae: Sequence[Stria], subjects: PairSubjects, geometric: Pairs) -> FaultEvidence:
    facets = [_facets(m, s) for m, s in zip(examined.measured, examined.stations, strict=True)]
    support = partner_support(geometric, len(examined.faults))
    slips = _slip_lines(examined, striae)
    return gather([f[0] for f in facets], [f[1] for f in facets], examined.sectors, support, subjects.known, slips)


def _with_earthquakes(evidence: FaultEvidence, model: FaultModel, settings: Settings) -> tuple[FaultEvidence, tuple[Finding, ...]]:
    """Return the evidence of the faults, joined by that of earthquakes where the model asks for it, and what to tell where it cannot be.

    However many the earthquakes are, together they weigh no more than the faults: a catalogue is longer than any model.
    """
    if not model.mechanisms or model.mechanisms_are != "evidence":
        return evidence, ()
    quakes = inversion_of(model.mechanisms, _friction(settings), settings.random_state)
    if isinstance(quakes, str):
        hint = "give more earthquakes, of more kinds, or none"
        return evidence, (Finding("import", "warning", "model", f"the mechanisms were not used as evidence: {quakes}", (), hint),)
    weights = np.array([each.weight for each in model.mechanisms])
    return joined(evidence, evidence_of_mechanisms(quakes, weights * min(1.0, len(evidence) / max(weights.sum(), 1e-12)))), ()


def _friction(settings: Settings) -> float:
    return float(np.tan(np.radians(settings.friction_angle_deg)))


def _slip_lines(examined: _Examination, striae: Sequence[Stria]) -> SlipLines:
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


def _read(
    evidence: FaultEvidence, geometric: Pairs, pairs: Pairs, counts: NDArray[np.int64], phases: Sequence[str], settings: Settings
) -> tuple[tuple[Reading, ...], Answer | None]:
    """Return the three readings of the evidence and the joint one, and the answer that the verdicts follow."""
    odds = EvidenceModel(friction_angle_deg=settings.friction_angle_deg)
    some = counts[:PAIR_REPLICATES]
    readings = [
        _pair_reading(
            "geometry", "geometry only", geometric, some, "no two faults stand at an admissible angle within reach of each other"
        ),
        _pair_reading("pairs", "pairs with senses", pairs, some, "no admissible pair has senses that agree on one stress"),
    ]
    declared = int(evidence.declared.sum())
    senses = infer(evidence, odds, Terms(geometry=False, lines=False), some) if declared >= 2 else None
    readings.append(
        _posterior_reading(
            "senses", "senses of all faults", senses, declared, "fewer than two faults declare a movement that can be tested"
        )
    )
    speaking = int((evidence.declared | evidence.measured | (evidence.partnered > 0)).sum())
    events = [""] * (len(evidence) - len(phases))
    found = answer(evidence, odds, counts, [*phases, *events], settings.random_state, events=len(events)) if speaking >= 2 else None
    joint, why_not = found.single if found else None, "no admissible pair and fewer than two declared movements"
    readings.append(_posterior_reading("joint", "all evidence together", joint, speaking, why_not))
    return tuple(readings), found


def _pair_reading(key: str, title: str, pairs: Pairs, counts: NDArray[np.int64], why_not: str) -> Reading:
    if not len(pairs):
        return Reading(key, title, None, 0, why_not)
    return Reading(key, title, regime_of_frames(*pair_frames(pairs, counts)), len(pairs))


def _posterior_reading(key: str, title: str, posterior: Posterior | None, count: int, why_not: str) -> Reading:
    if posterior is None:
        return Reading(key, title, None, count, why_not)
    regime = regime_of_frames(posterior.frame, posterior.frames, shape_ratio_of(posterior))
    if not is_tight(regime):
        return Reading(
            key, title, None, count, f"the evidence is too loose: sigma1 and sigma3 are known only to {regime.cones_deg[0]:.0f} deg"
        )
    return Reading(key, title, regime, count)


def _judge_all(examined: _Examination, found: Answer | None, settings: Settings, tell: Progress) -> Sequence[Verdict]:
    limits = VerdictLimits(conflicting_from=settings.conflict_probability, least_shear=settings.least_shear)
    if found is None:
        return [undetermined("no stress could be inferred")] * len(examined.faults)
    cases = list(enumerate(zip(examined.stations, examined.sectors, examined.why_no_sector, strict=True)))
    return _for_each(lambda case: _judge_one(found, case[0], case[1][0], case[1][1], case[1][2], limits), cases, "judging faults", tell)


def _judge_one(found: Answer, number: int, stations: Stations, sector: Sector | None, why: str, limits: VerdictLimits) -> Verdict:
    shares = np.full(len(stations.normals), 1 / len(stations.normals))
    verdict, prediction = judge_in_phases(found, number, stations.normals, shares, sector, why, limits)
    if prediction is None or sector is None:
        return verdict
    home = int(found.homes[number])
    others = [posterior for k, posterior in enumerate(found.posteriors) if k != home]
    causes = causes_of(verdict, found.posteriors[home], number, prediction, stations.normals, shares, sector, limits, others)
    return Verdict(**{**verdict.__dict__, "causes": causes})
