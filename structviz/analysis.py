"""The use cases: run(model, settings) -> Analysis."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from structviz import checks
from structviz._version import __version__
from structviz.checks.independent import comparisons
from structviz.checks.registry import Examined
from structviz.examination import Examination, Progress, evidence_of, examine, for_each, friction_of, pair, with_earthquakes
from structviz.kinematics.senses import Sector
from structviz.model import Fault, FaultModel, Finding
from structviz.settings import Settings
from structviz.stress.answer import Answer, answer, in_order, is_tight, judge_in_phases
from structviz.stress.by_place import ByPlace, by_place
from structviz.stress.by_place import in_order as place_in_order
from structviz.stress.causes import causes_of
from structviz.stress.compare import Comparison
from structviz.stress.conjugate import Pairs
from structviz.stress.evidence import EvidenceModel, FaultEvidence
from structviz.stress.joint import Terms, infer
from structviz.stress.readings import pair_frames, regime_of_frames, shape_ratio_of
from structviz.stress.regime import Reading, Regime
from structviz.stress.replicates import Posterior, bootstrap_counts
from structviz.stress.shared_causes import with_shared_stress
from structviz.stress.verdict import Verdict, VerdictLimits, undetermined
from structviz.surfaces.intersections import Meeting, meetings
from structviz.surfaces.surface import MeasuredSurface, Stations

__all__ = ["CAUTIONS", "Analysis", "ByPlace", "FaultResult", "Progress", "Settings", "run"]

CAUTIONS = (
    "A screening aid: it tests geometry against declared movement. It does not measure stress magnitude, fault stability or hazard.",
    "It does not replace local codes, site investigation or the judgement of a licensed professional.",
    "Conjugate inference assumes new faults in isotropic rock (Anderson); reactivated, low-angle and salt- or shale-detached faults "
    "break it by nature, not by error.",
    "Directions only: the shape ratio R is reported where the data resolve it, stress magnitudes never are.",
)
PAIR_REPLICATES = 200


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
    by_place: ByPlace | None = None  # the stress as a field; None where phases are mixed or the stress is loose
    meetings: tuple[Meeting, ...] = ()  # lines where faults meet, faults by their place in the model

    @property
    def conflicting(self) -> tuple[FaultResult, ...]:
        """The faults whose declared movement the others contradict."""
        return tuple(result for result in self.faults if result.verdict.word == "conflicting")


def run(
    model: FaultModel, settings: Settings | None = None, *, limits: Mapping[str, float] | None = None, progress: Progress | None = None
) -> Analysis:
    """Return the analysis of a model: its surfaces measured, its stress inferred, every fault judged by the others.

    Neither the order of the faults nor their names change anything: work is done in an order of their own (by area), and the
    results are put back in the order of the model.
    """
    settings = settings or Settings()
    tell = progress or (lambda text, done, total: None)
    examined, order = examine(model, settings, tell)
    with ThreadPoolExecutor(1) as beside:  # nothing waits for the lines where faults meet
        met = beside.submit(meetings, [(fault.surface.vertices, fault.surface.triangles) for fault in model.faults])
        return _run(model, settings, limits, tell, examined, order, met)


def _run(
    model: FaultModel,
    settings: Settings,
    limits: Mapping[str, float] | None,
    tell: Progress,
    examined: Examination,
    order: NDArray[np.int64],
    met: Future[tuple[Meeting, ...]],
) -> Analysis:
    tell("pairing faults", 0, 1)
    subjects, geometric, pairs = pair(examined, settings)
    tell("inferring stress", 0, 1)
    evidence, told = with_earthquakes(evidence_of(examined, model.striae, subjects, geometric), model, settings)
    counts = bootstrap_counts(len(evidence), settings.replicates, settings.random_state)
    readings, place, found = _read(examined, evidence, geometric, pairs, counts, settings)
    verdicts = _judge_all(examined, found, settings, tell)
    back = np.argsort(order)
    found = in_order(found, np.append(back, np.arange(len(back), len(evidence)))) if found else None
    results = tuple(_result(examined, found, verdicts[i], int(i), place) for place, i in enumerate(back))
    pairs = _renumber(pairs, order)
    regimes, contradictions = (found.regimes, found.phases.contradictions) if found else ((), ())
    tell("checking", 0, 1)
    measured, judged = tuple(r.measured for r in results), tuple(r.verdict for r in results)
    compared = comparisons(model, regimes, friction_of(settings), settings.random_state)
    evidence_for_checks = Examined(
        model, measured, pairs, readings, regimes, judged, contradictions, compared, place.turn if place else None
    )
    used = checks.checked_limits(limits or {})
    findings = model.findings + told + checks.run(evidence_for_checks, used)
    return Analysis(
        model,
        settings,
        results,
        pairs,
        readings,
        regimes,
        findings,
        CAUTIONS,
        __version__,
        used,
        found,
        compared,
        place_in_order(place, back) if place else None,
        met.result(),
    )


def _result(examined: Examination, found: Answer | None, verdict: Verdict, i: int, place: int) -> FaultResult:
    several = found is not None and len(found.regimes) > 1
    phase, membership = (int(found.homes[place]), tuple(map(float, found.phases.membership[place]))) if found and several else (0, ())
    if found and found.by == "place":
        membership = ()
    return FaultResult(examined.faults[i], examined.measured[i], examined.stations[i], verdict, examined.sectors[i], phase, membership)


def _renumber(pairs: Pairs, order: NDArray[np.int64]) -> Pairs:
    """Return the pairs numbered as in the model, heaviest first."""
    faults = np.sort(order[pairs.faults], axis=1).reshape(-1, 2)
    rows = np.lexsort((faults[:, 1], faults[:, 0], -pairs.weight))
    return Pairs(faults, pairs.acute_deg, pairs.obtuse, pairs.weight, pairs.axes, pairs.distance_m, pairs.places).rows(rows)


def _read(
    examined: Examination, evidence: FaultEvidence, geometric: Pairs, pairs: Pairs, counts: NDArray[np.int64], settings: Settings
) -> tuple[tuple[Reading, ...], ByPlace | None, Answer | None]:
    """Return the three readings of the evidence and the joint one, how it changes with place, and the answer that the verdicts follow."""
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
    joint = infer(evidence, odds, Terms(), counts) if speaking >= 2 else None
    why_not = "no admissible pair and fewer than two declared movements"
    readings.append(_posterior_reading("joint", "all evidence together", joint, speaking, why_not))
    if joint is None:
        return tuple(readings), None, None
    faults = len(examined.faults)
    place = by_place(evidence.part(slice(0, faults)), np.stack([s.places.mean(0) for s in examined.stations]), joint)
    phases = [fault.phase for fault in examined.faults] + [""] * (len(evidence) - faults)
    found = answer(evidence, odds, joint, phases, settings.random_state, faults=faults, place=place)
    return tuple(readings), place, found


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


def _judge_all(examined: Examination, found: Answer | None, settings: Settings, tell: Progress) -> Sequence[Verdict]:
    limits = VerdictLimits(conflicting_from=settings.conflict_probability, least_shear=settings.least_shear)
    if found is None:
        return [undetermined("no stress could be inferred")] * len(examined.faults)
    cases = list(enumerate(zip(examined.stations, examined.sectors, examined.why_no_sector, strict=True)))
    judged = for_each(lambda case: _judge_one(found, case[0], case[1][0], case[1][1], case[1][2], limits), cases, "judging faults", tell)
    normals = np.stack([measured.normal for measured in examined.measured])
    return with_shared_stress(judged, normals, examined.sectors, found.single.odds)


def _judge_one(found: Answer, number: int, stations: Stations, sector: Sector | None, why: str, limits: VerdictLimits) -> Verdict:
    shares = np.full(len(stations.normals), 1 / len(stations.normals))
    verdict, prediction = judge_in_phases(found, number, stations.normals, shares, sector, why, limits)
    if prediction is None or sector is None:
        return verdict
    home = int(found.homes[number])
    others = [posterior for k, posterior in enumerate(found.posteriors) if k != home]
    causes = causes_of(verdict, found.posteriors[home], number, prediction, stations.normals, shares, sector, limits, others)
    return Verdict(**{**verdict.__dict__, "causes": causes})
