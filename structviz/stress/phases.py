"""How many stresses the faults answer to: one, two or three, each fault with its membership of each.

The best mixture of each number (`mixture`) is weighed by the Bayesian information criterion [schwarz1978]. What a fault can say is
bounded (a wrong label, an inherited plane), so a handful of faults that fit nothing do not pay for a stress of their own; nor does
a fabric of parallel planes (`fabric`).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.conjugate import swap_extremes
from structviz.stress.evidence import EvidenceModel, FaultEvidence, sense_term
from structviz.stress.joint import FINE_RATIOS
from structviz.stress.mixture import Mixture, homes_of, over_all, refined, search

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

PARAMETERS = 5  # of a phase: three angles, R and its share; the shares add up to one, so the last is free of charge
LEAST_FAULTS = 4.0  # a phase carried by fewer (sum of memberships) is not told from chance
DECLARED_NATS = 4.0  # what declaring two or three phases is worth, before the data are heard, to that number of them
EXCHANGED_DEG = 20.0  # two phases this near to sharing their axes with sigma1 and sigma3 exchanged look like wrong labels
EXCHANGED_NATS = 5.0  # and must be better supported by this much
CONTRADICTS = 0.8  # probability of another phase from which the data contradict the declared one
MOST_SEARCHED = 80  # faults; of more, every second, third, ... is searched, and all are then told apart


@dataclass(frozen=True)
class Contradiction:
    """A fault that the data put into another phase than the one declared."""

    fault: int  # row of the evidence
    declared: str
    phase: int  # row of Phases.frames it answers to instead
    probability: float


@dataclass(frozen=True, eq=False)
class Phases:
    """The stresses that faults answer to, the one with most faults first."""

    count: int
    frames: Floats  # (K, 3, 3) rows sigma1, sigma2, sigma3
    ratios: Floats  # (K,) mean R
    shares: Floats  # (K,) of the faults, sum 1
    membership: Floats  # (F, K) probability that each fault moved in each phase
    terms: Floats  # (F, K) log-likelihood of each fault under each phase; a difference below one says little
    criterion: tuple[float, ...]  # for 1, 2, ... phases, lower is better; infinite where a phase would have too few faults
    why: str  # one sentence: what decided
    declared: tuple[tuple[str, int], ...] = ()  # each declared phase and the row of the phase that most of its faults answer to
    contradictions: tuple[Contradiction, ...] = ()
    odds: EvidenceModel = field(default_factory=EvidenceModel)  # that explained the faults best

    def ambiguous(self, nats: float = 1.0) -> NDArray[np.bool_]:
        """Return the faults that two phases explain about equally well, (F,): their best two log-likelihoods differ by less."""
        if self.count == 1:
            return np.zeros(len(self.terms), bool)
        best = np.sort(self.terms, axis=1)
        return best[:, -1] - best[:, -2] < nats

    @property
    def belongs(self) -> Integers:
        """Return the phase that each fault most probably moved in, (F,), rows of frames."""
        return self.membership.argmax(1)


def find_phases(evidence: FaultEvidence, odds: EvidenceModel, *, declared_phases: Sequence[str], most: int = 3) -> Phases:
    """Return the one to `most` stresses that explain the faults best, and the probability that each fault moved under each.

    Parameters
    ----------
    evidence : of F faults. Those that say nothing get the shares of the phases as their memberships.
    odds : friction angle and the odds that are not chosen here; scatter, obtuse share and trust in labels are.
    declared_phases : F names, empty where none is declared. They are where the search begins and what is believed of each fault
        before its data are heard; the data may contradict them, fault by fault or altogether.

    Raises
    ------
    ArgumentError : names and faults differ in number, there are no faults, or `most` is not positive.
    """
    if not len(evidence) or len(declared_phases) != len(evidence) or most < 1:
        raise ArgumentError(
            f"declared_phases, most: found {len(declared_phases)} names for {len(evidence)} faults, most {most}; "
            "wanted a name (or an empty one) for each of at least one fault, and at least one phase",
            hint="give '' for faults without a declared phase",
        )
    names, belongs = _named(declared_phases)
    some = slice(None, None, -(-len(evidence) // MOST_SEARCHED))
    part = evidence.part(some)
    found = (refined(part, fit, belongs[some]) for fit in search(part, odds, belongs[some], len(names), most))
    fits = [over_all(evidence, fit, belongs) for fit in found]
    heard = int((evidence.declared | evidence.measured | (evidence.geometry_known & (evidence.partnered > 0))).sum())
    criterion = [_criterion(fit, heard, len(names)) for fit in fits]
    count = int(np.argmin(criterion)) + 1
    return _told(fits, count, tuple(criterion), names, belongs)


def _named(declared: Sequence[str]) -> tuple[list[str], Integers]:
    """Return the declared phases by name, and for each fault which of them it is, -1 for none."""
    names = sorted({name for name in declared if name})
    return names, np.array([names.index(name) if name else -1 for name in declared], np.int64)


def _criterion(fit: Mixture, heard: int, names: int) -> float:
    """Return the information criterion of a mixture of faults of which some were heard, with what is known beforehand."""
    count = len(fit.shares)
    if count > 1 and fit.membership.sum(0).min() < LEAST_FAULTS:
        return float("inf")
    beforehand = DECLARED_NATS * (count == names > 1) - EXCHANGED_NATS * len(exchanged_phases(fit.frames))
    return float(-2 * (fit.support + beforehand) + (PARAMETERS * count - 1) * np.log(max(heard, 2)))


def exchanged_phases(frames: Floats) -> list[tuple[int, int]]:
    """Return the pairs of frames (K, 3, 3) that share their axes with sigma1 and sigma3 exchanged, as wrong labels would have it."""
    pairs = [(i, j) for i in range(len(frames)) for j in range(i + 1, len(frames))]
    return [(i, j) for i, j in pairs if axial_angle_deg(swap_extremes(frames[i]), frames[j]).max() <= EXCHANGED_DEG]


def _told(fits: Sequence[Mixture], count: int, criterion: tuple[float, ...], names: Sequence[str], belongs: Integers) -> Phases:
    """Return the chosen mixture, its largest phase first, with what the declared phases have to do with it."""
    fit = fits[count - 1]
    order = np.argsort(-fit.membership.sum(0), kind="stable")
    membership, terms = fit.membership[:, order], fit.terms[:, order]
    homes = homes_of(terms, belongs)
    against = tuple(
        Contradiction(int(f), names[belongs[f]], int(membership[f].argmax()), float(membership[f].max()))
        for f in np.flatnonzero(belongs >= 0)
        if membership[f].argmax() != homes[belongs[f]] and membership[f].max() >= CONTRADICTS
    )
    why = _why(fits, count, criterion, membership, names, homes, against)
    declared = tuple(zip(names, homes, strict=True))
    ratios = fit.ratios[order] @ FINE_RATIOS
    return Phases(count, fit.frames[order], ratios, membership.mean(0), membership, terms, criterion, why, declared, against, fit.odds)


def _why(
    fits: Sequence[Mixture],
    count: int,
    criterion: Sequence[float],
    membership: Floats,
    names: Sequence[str],
    homes: Sequence[int],
    against: Sequence[Contradiction],
) -> str:
    """Return one sentence on what decided the number of phases, and what became of the declared ones."""
    parts = [_why_this_many(count, criterion, membership)]
    if count == 1 and len(fits) > 1 and exchanged_phases(fits[1].frames):
        parts.append("what fits it badly fits the same axes with sigma1 and sigma3 exchanged, as wrong labels do")
    together = {home: [name for name, of in zip(names, homes, strict=True) if of == home] for home in homes}
    parts += [f"the declared phases {' and '.join(alike)} answer to the same stress" for alike in together.values() if len(alike) > 1]
    if against:
        plural = "faults answer" if len(against) > 1 else "fault answers"
        parts.append(f"{len(against)} {plural} to another stress than the declared phase")
    return "; ".join(parts)


def _why_this_many(count: int, criterion: Sequence[float], membership: Floats) -> str:
    words = ("one stress explains", "two stresses explain", "three stresses explain")
    first = words[count - 1] if count <= len(words) else f"{count} stresses explain"
    if len(criterion) == 1:
        return "one stress was asked for"
    rivals = [(value - criterion[count - 1], number) for number, value in enumerate(criterion, 1) if number != count]
    margin, rival = min(rivals)
    by = f"criterion better by {margin:.0f} than with {rival}" if np.isfinite(margin) else "another would have fewer than four faults"
    carried = " and ".join(f"{share:.0f}" for share in membership.sum(0))
    return f"{first} the faults best ({by})" + (f", carried by {carried} faults" if count > 1 else "")


def phase_texts(phases: Phases, evidence: FaultEvidence, names: Sequence[str] = ()) -> tuple[str, ...]:
    """Return one sentence for each fault on the phase it belongs to, empty where there is one phase or the fault says nothing.

    evidence is that of which the phases were found, in the same order; names are those of the phases, "phase 1" and so on where none
    are given. Only a declared movement conflicts: a plane that is no new fault of a phase may be inherited.

    Raises
    ------
    ArgumentError : evidence or names do not go with the phases.
    """
    called = tuple(names) or tuple(f"phase {k + 1}" for k in range(phases.count))
    if len(called) != phases.count or len(evidence) != len(phases.terms):
        raise ArgumentError(
            f"evidence, names: found {len(evidence)} faults and {len(called)} names; "
            f"wanted the {len(phases.terms)} faults and {phases.count} names of the phases"
        )
    if phases.count == 1:
        return ("",) * len(evidence)
    opposed, unsure = opposed_phases(phases, evidence), phases.ambiguous()
    return tuple(_text(phases, f, opposed[f], bool(unsure[f]), called) for f in range(len(evidence)))


def opposed_phases(phases: Phases, evidence: FaultEvidence) -> NDArray[np.bool_]:
    """Return whether the declared movement of each fault is likelier wrong than right under each phase, (F, K)."""
    of_ratio = [
        sense_term(evidence, f[None], np.array([r]), phases.odds)[:, 0, 0] for f, r in zip(phases.frames, phases.ratios, strict=True)
    ]
    half_spaces = (np.abs(evidence.edges).sum(3) > 0).any(1).sum(1)
    return evidence.declared[:, None] & (np.stack(of_ratio, 1) < half_spaces[:, None] * np.log(0.5))


def _text(phases: Phases, fault: int, opposed: NDArray[np.bool_], unsure: bool, names: Sequence[str]) -> str:
    terms, membership = phases.terms[fault], phases.membership[fault]
    if np.ptp(terms) < 1e-6:
        return ""
    best = int(membership.argmax())
    others = [k for k in range(phases.count) if k != best]
    against = " and ".join(names[k] for k in others if opposed[k])
    probability = f"probability {membership[best]:.2f}"
    if opposed[best]:
        return f"conflicts with {names[best]}, its likeliest phase ({probability})" + (f", and with {against}" if against else "")
    if against:
        return f"conflicts with {against} but fits {names[best]}, {probability}"
    if unsure:
        return f"fits {' and '.join(names)} about equally well; {names[best]} is likeliest, {probability}"
    return f"fits {names[best]} better than {' and '.join(names[k] for k in others)}, {probability}"
