"""Mixtures of one, two, three stresses that explain the faults best: the search on a grid of frames, and the way off it.

A fault's log-likelihood under a stress does not depend on the other faults, so on a grid of frames and shape ratios a mixture is
fitted by expectation and maximisation [dempster1977] with one matrix product a round: memberships from the likelihoods of each fault
under the stresses at hand, then for each stress the best place of the grid for the faults that belong to it. Each mixture begins
from the best of those with one stress less. How many are called for is chosen in `phases`.
"""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.stress.evidence import EvidenceModel, FaultEvidence, geometry_term, sense_term
from structviz.stress.fabric import on_one_plane
from structviz.stress.frames import all_frames, ball, turned
from structviz.stress.joint import (
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

TRUST_IN_DECLARED = 0.9  # probability that a fault belongs where the others of its declared phase do
SEARCH_FRAMES = 5000  # about 9 degrees apart; what is found is refined off the grid
FIRST_STARTS, NEXT_STARTS = 3, 3  # of the search: best single stresses, and what best explains the faults they leave
NEW_SHARES = (0.7, 0.35)  # of faults thought to be new: many inherited planes must not look like a second stress
SHORT_ROUNDS, LONG_ROUNDS = 4, 40
REFINED_WITHIN_DEG = (14.0, 10.0, 10.0)  # of where a stress was, in one step after the other


@dataclass(frozen=True, eq=False)
class Mixture:
    """A mixture of stresses. While it is searched for, `places` are columns of a table of the grid."""

    support: float  # log-likelihood of all faults
    membership: Floats  # (F, K)
    shares: Floats  # (K,)
    terms: Floats  # (F, K)
    places: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # (K,)
    odds: EvidenceModel = field(default_factory=EvidenceModel)
    frames: Floats = field(default_factory=lambda: np.zeros((0, 3, 3)))  # (K, 3, 3)
    ratios: Floats = field(default_factory=lambda: np.zeros((0, len(FINE_RATIOS))))  # (K, R) probability of each shape ratio


def search(evidence: FaultEvidence, odds: EvidenceModel, belongs: Integers, names: int, most: int) -> list[Mixture]:
    """Return the best mixture of one, two, ... stresses on the grid, each under the odds that suit it best."""
    frames = all_frames(SEARCH_FRAMES)
    best: list[Mixture] = []
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
    labels = [replace(odds, wrong_label_share=w, shear_softness=s) for w, s in trust]
    with ThreadPoolExecutor(max_workers=len(labels)) as pool:
        others = list(pool.map(lambda each: lines + sense_term(evidence, single, COARSE_RATIOS, each), labels))
    tops = [max(float((on_axes.sum(0)[:, None] + other.sum(0)).max()) for other in others) for on_axes in axes.values()]
    alone = shapes[int(np.argmax(tops))]
    tight = replace(alone, plane_scatter_deg=SCATTERS_DEG[0])
    tries = [alone, tight, replace(tight, obtuse_share=OBTUSE_SHARES[0])]
    for shape in dict.fromkeys(replace(shape, new_fault_share=n) for shape in tries for n in NEW_SHARES):
        for (wrong, softness), other in zip(trust, others, strict=True):
            table = axes[shape][..., None] + other
            yield replace(shape, wrong_label_share=wrong, shear_softness=softness), table.reshape(len(table), -1)


def _mixtures(table: NDArray[Any], frames: Floats, belongs: Integers, names: int, most: int) -> list[Mixture]:
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


def _climbed(table: NDArray[Any], places: Integers, belongs: Integers, rounds: int) -> Mixture:
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


def _expected(terms: Floats, shares: Floats, belongs: Integers) -> Mixture:
    """Return support, memberships and new shares of a mixture from the log-likelihoods (F, K) of its stresses."""
    joint = terms + _log_prior(terms, shares, belongs)
    of_fault = np.logaddexp.reduce(joint, axis=1)
    membership = np.exp(joint - of_fault[:, None])
    after = np.maximum(membership.mean(0), 1e-3)
    return Mixture(float(of_fault.sum()), membership, after / after.sum(), terms)


def _log_prior(terms: Floats, shares: Floats, belongs: Integers) -> Floats:
    """Return the log-probability of each phase for each fault before its own data are heard, (F, K)."""
    prior = np.broadcast_to(np.log(shares), terms.shape).copy()
    count = len(shares)
    if count > 1 and (belongs >= 0).any():
        for name, home in enumerate(homes_of(terms, belongs)):
            prior[belongs == name] = np.log((1 - TRUST_IN_DECLARED) / (count - 1))
            prior[belongs == name, home] = np.log(TRUST_IN_DECLARED)
    return prior


def homes_of(terms: Floats, belongs: Integers) -> list[int]:
    """Return for each declared phase the stress that explains its faults best."""
    return [int(terms[belongs == name].sum(0).argmax()) for name in range(belongs.max(initial=-1) + 1)]


def refined(evidence: FaultEvidence, fit: Mixture, belongs: Integers) -> Mixture:
    """Return a mixture whose stresses have left the grid: each the mean of its posterior, ever closer about it."""
    for radius_deg in REFINED_WITHIN_DEG:
        turns = ball(np.radians(radius_deg), np.radians(radius_deg / 4.5))
        moved = [_centred(evidence, fit, k, turns) for k in range(len(fit.shares))]
        fit = replace(fit, frames=np.stack([m[0] for m in moved]), ratios=np.stack([m[1] for m in moved]))
        fit = over_all(evidence, fit, belongs)
    return fit


def over_all(evidence: FaultEvidence, fit: Mixture, belongs: Integers) -> Mixture:
    """Return the mixture of the same stresses with support, memberships and shares of the faults given."""
    terms = np.stack([_terms_at(evidence, f, r, fit.odds) for f, r in zip(fit.frames, fit.ratios, strict=True)], 1)
    after = _settled(terms, fit.shares, belongs)
    lone = on_one_plane(evidence, after.membership, fit.frames, fit.odds) if len(fit.shares) > 1 else np.zeros(1, bool)
    if lone.any():
        after = _settled(terms - lone * geometry_term(evidence, fit.frames, fit.odds), after.shares, belongs)
    prior = np.log(OBTUSE_PRIOR) if fit.odds.obtuse_share > 0.5 else 0.0
    return replace(after, support=after.support + prior, odds=fit.odds, frames=fit.frames, ratios=fit.ratios)


def _settled(terms: Floats, shares: Floats, belongs: Integers) -> Mixture:
    fit = _expected(terms, shares, belongs)
    for _ in range(SHORT_ROUNDS):
        fit = _expected(terms, fit.shares, belongs)
    return fit


def _centred(evidence: FaultEvidence, fit: Mixture, phase: int, turns: Floats) -> tuple[Floats, Floats]:
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
