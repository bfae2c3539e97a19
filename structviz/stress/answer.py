"""The stress answer of a model: one posterior for each phase, and the verdict on a fault by the phase it moved in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import Sector
from structviz.stress.by_place import ByPlace
from structviz.stress.evidence import EvidenceModel, FaultEvidence
from structviz.stress.joint import Terms, infer
from structviz.stress.phases import Phases, find_phases
from structviz.stress.readings import LOOSEST_CONE_DEG, regime_of_frames, shape_ratio_of
from structviz.stress.regime import Regime
from structviz.stress.replicates import Posterior, bootstrap_counts
from structviz.stress.verdict import Prediction, Verdict, VerdictLimits, judge

Floats = NDArray[np.float64]

SURE_OF_PHASE = 0.8  # membership from which a fault is judged by its phase alone


@dataclass(frozen=True, eq=False)
class Answer:
    """What all faults together say: the stress as if there were one, and the stresses that the verdicts follow."""

    single: Posterior  # all faults under one stress
    phases: Phases
    posteriors: tuple[Posterior, ...]  # of each phase, with counts over all faults: those of other phases are never drawn
    regimes: tuple[Regime, ...]  # of each phase, most faults first; empty where the evidence is too loose to claim one
    homes: NDArray[np.int64]  # (F,) phase by which each fault is judged
    by: str = "phase"  # "phase", or "place" where the parts of the model take the place of phases


def answer(
    evidence: FaultEvidence,
    odds: EvidenceModel,
    single: Posterior,
    declared_phases: Sequence[str],
    random_state: int,
    *,
    faults: int,
    place: ByPlace | None = None,
) -> Answer:
    """Return the stress of the faults as so many phases, or as so many parts of the model, as they call for.

    single is the posterior of all of them. Rows after the first `faults` are earthquakes: heard like faults, but not counted as
    such. A fault belongs to the phase it is declared to be of, where that phase was found; else to the likeliest one. The phases
    are then inferred each from its own faults, so that leaving a fault out leaves it out of its phase. A stress that turns from place to
    place looks like several phases too: whichever explains the faults better is followed.
    """
    phases = find_phases(evidence, odds, declared_phases=declared_phases)
    gain = (phases.criterion[0] - phases.criterion[phases.count - 1]) / 2
    turning = place is not None and place.domains is not None and place.bandwidth.gain > gain and not any(declared_phases)
    if place and place.domains and turning:
        homes = np.concatenate([place.domains.membership, np.full(len(evidence) - faults, -1)])
        one = find_phases(evidence, odds, declared_phases=declared_phases, most=1)
        made = _inferred(evidence, odds, homes, faults, single, random_state)
        if made:
            return Answer(single, one, made[0], tuple(replace(r, name=f"part {k + 1}") for k, r in enumerate(made[1])), homes, "place")
    elif phases.count > 1:
        homes = _homes(phases, declared_phases)
        made = _inferred(evidence, odds, homes, faults, single, random_state)
        if made:
            return Answer(single, phases, made[0], _named(made[1], phases), homes)
    if phases.count > 1:
        phases = find_phases(evidence, odds, declared_phases=declared_phases, most=1)
    regime = _regime(single, 1.0, faults)
    return Answer(single, phases, (single,), (regime,) if is_tight(regime) else (), np.zeros(len(evidence), np.int64))


def _inferred(
    evidence: FaultEvidence, odds: EvidenceModel, homes: NDArray[np.int64], faults: int, single: Posterior, random_state: int
) -> tuple[tuple[Posterior, ...], tuple[Regime, ...]] | None:
    """Return posterior and regime of each group of faults; None where there is but one, or one of them is too loose."""
    count = int(homes.max()) + 1
    if count < 2:
        return None
    posteriors = tuple(_of_group(evidence, odds, homes == k, len(single.counts), random_state + k) for k in range(count))
    members = [int((homes[:faults] == k).sum()) for k in range(count)]
    regimes = tuple(_regime(posterior, mine / faults, mine) for posterior, mine in zip(posteriors, members))
    return (posteriors, regimes) if all(is_tight(regime) for regime in regimes) else None


def in_order(found: Answer, rows: NDArray[np.int64]) -> Answer:
    """Return the answer with its faults in another order: row i of the new one is row rows[i] of the old."""
    place = np.argsort(rows)
    against = tuple(replace(each, fault=int(place[each.fault])) for each in found.phases.contradictions)
    phases = replace(found.phases, membership=found.phases.membership[rows], terms=found.phases.terms[rows], contradictions=against)
    single, posteriors = _in_order(found.single, rows), tuple(_in_order(posterior, rows) for posterior in found.posteriors)
    return Answer(single, phases, posteriors, found.regimes, found.homes[rows], found.by)


def _in_order(posterior: Posterior, rows: NDArray[np.int64]) -> Posterior:
    return replace(posterior, counts=posterior.counts[:, rows], fault_terms=posterior.fault_terms[rows])


def is_tight(regime: Regime) -> bool:
    """Return whether the cones of sigma1 and sigma3 are narrow enough for a regime to be claimed."""
    return min(regime.cones_deg[0], regime.cones_deg[2]) <= LOOSEST_CONE_DEG


def _homes(phases: Phases, declared_phases: Sequence[str]) -> NDArray[np.int64]:
    rows = dict(phases.declared)
    likeliest = phases.membership.argmax(1)
    return np.array([rows.get(name, int(found)) for name, found in zip(declared_phases, likeliest)], np.int64)


def _of_group(evidence: FaultEvidence, odds: EvidenceModel, mine: NDArray[np.bool_], replicates: int, random_state: int) -> Posterior:
    """Return the posterior of the faults of one group, its counts and terms spread over all faults."""
    rows = np.flatnonzero(mine)
    found = infer(evidence.part(rows), odds, Terms(), bootstrap_counts(len(rows), replicates, random_state))
    counts, terms = np.zeros((replicates, len(mine)), np.int64), np.zeros(len(mine))
    counts[:, rows], terms[rows] = found.counts, found.fault_terms
    return replace(found, counts=counts, fault_terms=terms)


def _regime(posterior: Posterior, weight: float, faults: int) -> Regime:
    return replace(regime_of_frames(posterior.frame, posterior.frames, shape_ratio_of(posterior), weight), faults=faults)


def _named(regimes: Sequence[Regime], phases: Phases) -> tuple[Regime, ...]:
    """Return the regimes under the name their faults declare where there is just one, else by number."""
    declared = [[name for name, row in phases.declared if row == k] for k in range(len(regimes))]
    return tuple(
        replace(regime, name=names[0] if len(names) == 1 else f"phase {k + 1}") for k, (regime, names) in enumerate(zip(regimes, declared))
    )


def judge_in_phases(
    found: Answer, fault: int, normals: Floats, shares: Floats, sector: Sector | None, why_no_sector: str, limits: VerdictLimits
) -> tuple[Verdict, Prediction | None]:
    """Return the verdict on a fault by the other faults of its phase, and what the other phases would say of it.

    Where its phase is in doubt and the phases differ in their verdict, it is undetermined: its age would decide.
    """
    home = int(found.homes[fault])
    each = [judge(posterior, fault, normals, shares, sector, why_no_sector, limits) for posterior in found.posteriors]
    own, prediction = each[home]
    if len(each) == 1 or found.by == "place" or sector is None or own.word == "undetermined":
        return own, prediction
    member = found.phases.membership[fault]
    told = [(k, verdict) for k, (verdict, _) in enumerate(each) if verdict.word in ("consistent", "conflicting")]
    differ = [(k, verdict) for k, verdict in told if verdict.word != own.word]
    if not differ:
        return own, prediction
    fits = [k for k, verdict in told if verdict.word == "consistent"]
    against = [k for k, verdict in told if verdict.word == "conflicting"]
    reason = f"conflicts with {_listed(found, against)}, fits {_listed(found, fits)}"
    if member[home] >= SURE_OF_PHASE:
        return replace(own, reasons=(*own.reasons, f"{reason}; membership of {_name(found, home)} {member[home]:.2f}")), prediction
    decides = f"its phase decides: {reason}; {_name(found, home)} is likelier only at {member[home]:.2f}"
    return replace(own, word="undetermined", reasons=(decides, *own.reasons)), prediction


def _name(found: Answer, phase: int) -> str:
    return f"{found.regimes[phase].name} ({found.regimes[phase].kind})"


def _listed(found: Answer, phases: Sequence[int]) -> str:
    return " and ".join(_name(found, phase) for phase in phases)
