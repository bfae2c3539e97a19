"""How many stresses the faults answer to: a mixture of one, two or three, each fault with its membership of each.

A fault's log-likelihood under a stress does not depend on the other faults, so on a grid of frames and shape ratios a mixture is
fitted by expectation and maximisation [dempster1977] with one matrix product a round: memberships from the likelihoods of each fault
under the stresses at hand, then for each stress the best place of the grid for the faults that belong to it. The number is
chosen by the Bayesian information criterion [schwarz1978]. What a fault can say is bounded (a wrong label, an inherited plane),
so a handful of faults that fit nothing do not pay for a stress of their own; nor does a fabric of parallel planes (`fabric`).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.conjugate import swap_extremes
from structviz.stress.evidence import EvidenceModel, FaultEvidence, geometry_term, sense_term
from structviz.stress.fabric import on_one_plane
from structviz.stress.frames import all_frames, ball, turned
from structviz.stress.joint import (
    COARSE_FRAMES,
    COARSE_RATIOS,
    FINE_RATIOS,
    LABEL_TRUST,
    MODE_APART_RAD,
    OBTUSE_PRIOR,
    OBTUSE_SHARES,
    SCATTERS_DEG,
    Terms,
    log_likelihood,
)
from structviz.stress.slip_lines import slip_term

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

PARAMETERS = 5  # of a phase: three angles, R and its share; the shares add up to one, so the last is free of charge
LEAST_FAULTS = 4.0  # a phase carried by fewer (sum of memberships) is not told from chance
TRUST_IN_DECLARED = 0.9  # probability that a fault belongs where the others of its declared phase do
DECLARED_NATS = 4.0  # what declaring two or three phases is worth, before the data are heard, to that number of them
EXCHANGED_DEG = 20.0  # two phases this near to sharing their axes with sigma1 and sigma3 exchanged look like wrong labels
EXCHANGED_NATS = 5.0  # and must be better supported by this much
CONTRADICTS = 0.8  # probability of another phase from which the data contradict the declared one
MOST_SEARCHED = 80  # faults; of more, every second, third, ... is searched, and all are then told apart
FIRST_STARTS, NEXT_STARTS = 3, 3  # of the search: best single stresses, and what best explains the faults they leave
NEW_SHARES = (0.7, 0.35)  # of faults thought to be new: many inherited planes must not look like a second stress
SHORT_ROUNDS, LONG_ROUNDS = 4, 40
REFINED_WITHIN_DEG = (14.0, 10.0, 10.0)  # of where a stress was, in one step after the other


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


@dataclass(frozen=True, eq=False)
class _Fit:
    """A mixture of stresses. While it is searched for, `places` are columns of a table of the grid."""

    support: float  # log-likelihood of all faults
    membership: Floats  # (F, K)
    shares: Floats  # (K,)
    terms: Floats  # (F, K)
    places: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # (K,)
    odds: EvidenceModel = field(default_factory=EvidenceModel)
    frames: Floats = field(default_factory=lambda: np.zeros((0, 3, 3)))  # (K, 3, 3)
    ratios: Floats = field(default_factory=lambda: np.zeros((0, len(FINE_RATIOS))))  # (K, R) probability of each shape ratio


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
    found = (_refined(part, fit, belongs[some]) for fit in _search(part, odds, belongs[some], len(names), most))
    fits = [_over_all(evidence, fit, belongs) for fit in found]
    heard = int((evidence.declared | evidence.measured | (evidence.geometry_known & (evidence.partnered > 0))).sum())
    criterion = [_criterion(fit, heard, len(names)) for fit in fits]
    count = int(np.argmin(criterion)) + 1
    return _told(fits, count, tuple(criterion), names, belongs)


def _named(declared: Sequence[str]) -> tuple[list[str], Integers]:
    """Return the declared phases by name, and for each fault which of them it is, -1 for none."""
    names = sorted({name for name in declared if name})
    return names, np.array([names.index(name) if name else -1 for name in declared], np.int64)


def _search(evidence: FaultEvidence, odds: EvidenceModel, belongs: Integers, names: int, most: int) -> list[_Fit]:
    """Return the best mixture of one, two, ... stresses on the grid, each under the odds that suit it best."""
    frames = all_frames(COARSE_FRAMES)
    best: list[_Fit] = []
    for number, (candidate, table) in enumerate(_tables(evidence, frames, odds)):
        fits = _mixtures(table, frames, belongs, names, most)
        prior = np.log(OBTUSE_PRIOR) if candidate.obtuse_share > 0.5 else 0.0
        fits = [replace(fit, support=fit.support + prior, odds=candidate, frames=frames[fit.places // len(COARSE_RATIOS)]) for fit in fits]
        best = fits if not number else [max(pair, key=lambda fit: fit.support) for pair in zip(best, fits, strict=True)]
    return best


def _tables(evidence: FaultEvidence, frames: Floats, odds: EvidenceModel) -> Iterator[tuple[EvidenceModel, NDArray[Any]]]:
    """Yield the log-likelihood of every fault over the grid, (F, G * R), for the odds worth trying.

    Two stresses taken for one look like wide scatter, obtuse pairs and untrustworthy labels. So a tight scatter and the acute
    angle are always tried beside what suits a single stress best, each with many and with few new faults.
    """
    single: NDArray[Any] = frames.astype(np.float32)
    every = [(s, o, n) for s in SCATTERS_DEG for o in OBTUSE_SHARES for n in NEW_SHARES]
    shapes = [replace(odds, plane_scatter_deg=s, obtuse_share=o, new_fault_share=n) for s, o, n in every]
    axes = {shape: geometry_term(evidence, single, shape) for shape in shapes}
    trust = LABEL_TRUST if evidence.declared.any() else LABEL_TRUST[:1]
    lines: NDArray[Any] = np.zeros((1, 1, 1), np.float32)
    if evidence.measured.any():
        lines = slip_term(evidence.slips, single, COARSE_RATIOS, odds.line_scatter_deg, odds.wrong_line_share)
    others = [lines + sense_term(evidence, single, COARSE_RATIOS, replace(odds, wrong_label_share=w, shear_softness=s)) for w, s in trust]
    tops = [max(float((on_axes.sum(0)[:, None] + other.sum(0)).max()) for other in others) for on_axes in axes.values()]
    alone = shapes[int(np.argmax(tops))]
    tight = replace(alone, plane_scatter_deg=SCATTERS_DEG[0])
    tries = [alone, tight, replace(tight, obtuse_share=OBTUSE_SHARES[0])]
    for shape in dict.fromkeys(replace(shape, new_fault_share=n) for shape in tries for n in NEW_SHARES):
        for (wrong, softness), other in zip(trust, others, strict=True):
            table = axes[shape][..., None] + other
            yield replace(shape, wrong_label_share=wrong, shear_softness=softness), table.reshape(len(table), -1)


def _mixtures(table: NDArray[Any], frames: Floats, belongs: Integers, names: int, most: int) -> list[_Fit]:
    """Return the best mixture of 1, 2, ... stresses of one table, each begun from the best of those with one less."""
    alone = _peaks(frames, table.sum(0), FIRST_STARTS)
    likelihood = np.exp(table)
    starts = [np.array([place]) for place in alone]
    fits = [_climbed(table, np.array([alone[0]]), belongs, 1)]
    for count in range(2, most + 1):
        grown = [np.append(start, place) for start in starts for place in _unexplained(likelihood, start, frames)]
        if names == count:
            grown.append(np.array([int(table[belongs == name].sum(0).argmax()) for name in range(names)]))
        short = sorted((_climbed(table, start, belongs, SHORT_ROUNDS) for start in grown), key=lambda fit: -fit.support)
        full = sorted((_climbed(table, fit.places, belongs, LONG_ROUNDS) for fit in short[:2]), key=lambda fit: -fit.support)
        fits.append(full[0])
        starts = [fit.places for fit in full]
    return fits


def _unexplained(likelihood: NDArray[Any], places: Integers, frames: Floats) -> list[int]:
    """Return the places of the grid that, added to the stresses at some places, explain most more."""
    share = 1 / (len(places) + 2)
    before = likelihood[:, places].mean(1) * (1 - share)
    return _peaks(frames, np.log(before[:, None] + share * likelihood).sum(0), NEXT_STARTS)


def _peaks(frames: Floats, values: NDArray[Any], most: int) -> list[int]:
    """Return the columns of up to `most` high values, (G * R,), whose frames are well apart, highest first."""
    by_frame = values.reshape(len(frames), -1)
    height = by_frame.max(1).astype(float)
    chosen: list[int] = []
    while len(chosen) < most and np.isfinite(height).any():
        best = int(height.argmax())
        chosen.append(best * by_frame.shape[1] + int(by_frame[best].argmax()))
        cosines = (frames * frames[best]).sum(2)
        trace = np.max(cosines @ np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]]).T, axis=1)
        height[trace >= 1 + 2 * np.cos(MODE_APART_RAD)] = -np.inf
    return chosen


def _climbed(table: NDArray[Any], places: Integers, belongs: Integers, rounds: int) -> _Fit:
    """Return the mixture that rounds of expectation and maximisation reach from places of the grid."""
    fit = _expected(table[:, places].astype(float), np.full(len(places), 1 / len(places)), belongs)
    fit = replace(fit, places=places)
    for _ in range(rounds):
        moved = (fit.membership.T.astype(table.dtype) @ table).argmax(1)
        after = replace(_expected(table[:, moved].astype(float), fit.shares, belongs), places=moved)
        if after.support <= fit.support + 1e-3:
            return fit if fit.support >= after.support else after
        fit = after
    return fit


def _expected(terms: Floats, shares: Floats, belongs: Integers) -> _Fit:
    """Return support, memberships and new shares of a mixture from the log-likelihoods (F, K) of its stresses."""
    joint = terms + _log_prior(terms, shares, belongs)
    of_fault = np.logaddexp.reduce(joint, axis=1)
    membership = np.exp(joint - of_fault[:, None])
    after = np.maximum(membership.mean(0), 1e-3)
    return _Fit(float(of_fault.sum()), membership, after / after.sum(), terms)


def _log_prior(terms: Floats, shares: Floats, belongs: Integers) -> Floats:
    """Return the log-probability of each phase for each fault before its own data are heard, (F, K)."""
    prior = np.broadcast_to(np.log(shares), terms.shape).copy()
    count = len(shares)
    if count > 1 and (belongs >= 0).any():
        for name, home in enumerate(_homes(terms, belongs)):
            prior[belongs == name] = np.log((1 - TRUST_IN_DECLARED) / (count - 1))
            prior[belongs == name, home] = np.log(TRUST_IN_DECLARED)
    return prior


def _homes(terms: Floats, belongs: Integers) -> list[int]:
    """Return for each declared phase the stress that explains its faults best."""
    return [int(terms[belongs == name].sum(0).argmax()) for name in range(belongs.max(initial=-1) + 1)]


def _refined(evidence: FaultEvidence, fit: _Fit, belongs: Integers) -> _Fit:
    """Return a mixture whose stresses have left the grid: each the mean of its posterior, ever closer about it."""
    for radius_deg in REFINED_WITHIN_DEG:
        turns = ball(np.radians(radius_deg), np.radians(radius_deg / 4.5))
        moved = [_centred(evidence, fit, k, turns) for k in range(len(fit.shares))]
        fit = replace(fit, frames=np.stack([m[0] for m in moved]), ratios=np.stack([m[1] for m in moved]))
        fit = _over_all(evidence, fit, belongs)
    return fit


def _over_all(evidence: FaultEvidence, fit: _Fit, belongs: Integers) -> _Fit:
    """Return the mixture of the same stresses with support, memberships and shares of the faults given."""
    terms = np.stack([_terms_at(evidence, f, r, fit.odds) for f, r in zip(fit.frames, fit.ratios, strict=True)], 1)
    after = _settled(terms, fit.shares, belongs)
    lone = on_one_plane(evidence, after.membership, fit.frames, fit.odds) if len(fit.shares) > 1 else np.zeros(1, bool)
    if lone.any():
        after = _settled(terms - lone * geometry_term(evidence, fit.frames, fit.odds), after.shares, belongs)
    prior = np.log(OBTUSE_PRIOR) if fit.odds.obtuse_share > 0.5 else 0.0
    return replace(after, support=after.support + prior, odds=fit.odds, frames=fit.frames, ratios=fit.ratios)


def _settled(terms: Floats, shares: Floats, belongs: Integers) -> _Fit:
    fit = _expected(terms, shares, belongs)
    for _ in range(SHORT_ROUNDS):
        fit = _expected(terms, fit.shares, belongs)
    return fit


def _centred(evidence: FaultEvidence, fit: _Fit, phase: int, turns: Floats) -> tuple[Floats, Floats]:
    """Return the mean frame of one phase near where it was, and the probability of each fine shape ratio."""
    frame = fit.frames[phase]
    grid: NDArray[Any] = turned(frame, turns).astype(np.float32)
    values = np.tensordot(fit.membership[:, phase], log_likelihood(evidence, grid, FINE_RATIOS, fit.odds, Terms()), 1)
    mass = np.exp(values - values.max())
    mass /= mass.sum()
    return turned(frame, (mass.sum(1) @ turns)[None])[0], mass.sum(0)


def _terms_at(evidence: FaultEvidence, frame: Floats, ratios: Floats, odds: EvidenceModel) -> Floats:
    """Return the log-likelihood of each fault under one frame, averaged over the shape ratios, (F,)."""
    terms = log_likelihood(evidence, frame[None], FINE_RATIOS, odds, Terms())[:, 0]
    return np.asarray(np.logaddexp.reduce(terms + np.log(np.maximum(ratios, 1e-12)), axis=1))


def _criterion(fit: _Fit, heard: int, names: int) -> float:
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


def _told(fits: Sequence[_Fit], count: int, criterion: tuple[float, ...], names: Sequence[str], belongs: Integers) -> Phases:
    """Return the chosen mixture, its largest phase first, with what the declared phases have to do with it."""
    fit = fits[count - 1]
    order = np.argsort(-fit.membership.sum(0), kind="stable")
    membership, terms = fit.membership[:, order], fit.terms[:, order]
    homes = _homes(terms, belongs)
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
    fits: Sequence[_Fit],
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
