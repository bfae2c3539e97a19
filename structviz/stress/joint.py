"""The stress that all faults together speak for: search over all frames, then a fine grid, then a bootstrap over faults."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.evidence import EvidenceModel, FaultEvidence, geometry_term, sense_term
from structviz.stress.frames import all_frames, ball, turn_between, turned

Floats = NDArray[np.float64]

COARSE_FRAMES = 9000  # about 7 degrees apart, less than the scatter of the likelihood
COARSE_RATIOS = np.array([0.15, 0.5, 0.85])
FINE_RATIOS = (np.arange(7) + 0.5) / 7
SCATTERS_DEG = (7.5, 12.0)
OBTUSE_SHARES = (0.1, 0.85)  # ordinary, and a model of rotated or reactivated blocks
OBTUSE_PRIOR = 0.1  # how often a model is of the second kind
LABEL_TRUST = ((0.08, 0.35), (0.2, 0.5))  # share of wrong labels, softness of the sector's edge
MODES = 2
CHUNK_FAULTS = 64  # bounds memory: faults taken at a time over the coarse grid
MODE_APART_RAD = np.radians(35.0)
WIDEST_RAD = np.radians(18.0)  # a broader posterior is truncated here: beyond, the frames of one mode wrap onto another


@dataclass(frozen=True, eq=False)
class Posterior:
    """Replicated estimates of the stress, each from faults drawn with replacement."""

    frame: Floats  # (3, 3) the estimate from all faults, rows sigma1, sigma2, sigma3
    frames: Floats  # (B, 3, 3) estimate of each replicate
    ratios: Floats  # (B, R) probability of each shape ratio in each replicate
    ratio_grid: Floats  # (R,)
    counts: NDArray[np.int64]  # (B, F) how often each fault was drawn
    fault_terms: Floats  # (F,) log-likelihood of each fault at the estimate: what it says for it
    odds: EvidenceModel  # the odds that the model's own evidence chose
    loose: bool = False  # True where the evidence does not single out one narrow range of frames


@dataclass(frozen=True)
class Terms:
    """Which parts of the evidence are heard."""

    geometry: bool = True
    senses: bool = True


def log_likelihood(evidence: FaultEvidence, frames: Floats, ratios: Floats, odds: EvidenceModel, terms: Terms) -> Floats:
    """Return the log-likelihood of each fault, shape (F, G, R)."""
    total = np.zeros((len(evidence), len(frames), len(ratios)))
    if terms.geometry:
        total += geometry_term(evidence, frames, odds)[..., None]
    if terms.senses:
        total += sense_term(evidence, frames, ratios, odds)
    return total


def _part(evidence: FaultEvidence, rows: slice) -> FaultEvidence:
    return FaultEvidence(
        evidence.normals[rows], evidence.shares[rows], evidence.edges[rows], evidence.partnered[rows], evidence.geometry_known[rows]
    )


def _sums(evidence: FaultEvidence, frames: Floats, term: Callable[[FaultEvidence, Floats], Floats]) -> Floats:
    """Return a term of the likelihood summed over the faults, taken in chunks so that memory stays bounded."""
    chunks = range(0, len(evidence), CHUNK_FAULTS)
    return sum((term(_part(evidence, slice(start, start + CHUNK_FAULTS)), frames).sum(0) for start in chunks), np.zeros(1))


def survey(evidence: FaultEvidence, frames: Floats, odds: EvidenceModel, terms: Terms) -> tuple[Floats, EvidenceModel]:
    """Return the log-likelihood over all frames and coarse ratios, shape (G, R), with the odds that explain the model best.

    The candidates differ in how tightly new faults cluster, how many stand at the obtuse angle, and how far labels can be
    trusted. Each is weighed by its likelihood averaged over all stresses, so that none wins by fitting one stress alone.
    """
    geometry: dict[EvidenceModel, Floats] = {odds: np.zeros(1)}
    if terms.geometry:
        shapes = [replace(odds, plane_scatter_deg=s, obtuse_share=o) for s in SCATTERS_DEG for o in OBTUSE_SHARES]
        geometry = {o: _sums(evidence, frames, lambda e, f, o=o: geometry_term(e, f, o)) for o in shapes}  # type: ignore[misc]
    senses: dict[EvidenceModel, Floats] = {odds: np.zeros((1, len(COARSE_RATIOS)))}
    if terms.senses and evidence.declared.any():
        trust = [replace(odds, wrong_label_share=w, shear_softness=s) for w, s in LABEL_TRUST]
        senses = {o: _sums(evidence, frames, lambda e, f, o=o: sense_term(e, f, COARSE_RATIOS, o)) for o in trust}  # type: ignore[misc]
    best, best_odds, best_total = -np.inf, odds, np.zeros((len(frames), len(COARSE_RATIOS)))
    for shape, on_axes in geometry.items():
        for label, on_senses in senses.items():
            total = on_axes[:, None] + on_senses
            support = np.logaddexp.reduce(total, axis=None) + (np.log(OBTUSE_PRIOR) if shape.obtuse_share > 0.5 else 0.0)
            if support > best:
                best, best_total = support, total
                best_odds = replace(shape, wrong_label_share=label.wrong_label_share, shear_softness=label.shear_softness)
    return np.broadcast_to(best_total, (len(frames), len(COARSE_RATIOS))), best_odds


def distinct_modes(frames: Floats, log_values: Floats, most: int) -> Floats:
    """Return up to `most` frames of high likelihood that are well apart, shape (K, 3, 3), best first."""
    chosen: list[int] = []
    open_frames = np.ones(len(frames), bool)
    while len(chosen) < most and open_frames.any():
        best = int(np.where(open_frames, log_values, -np.inf).argmax())
        chosen.append(best)
        turn = turn_between(frames[best], frames)
        open_frames &= np.sqrt((turn**2).sum(-1)) > MODE_APART_RAD
    return frames[chosen]


def _moments(weights: Floats, turns: Floats) -> tuple[Floats, Floats]:
    mean = weights @ turns
    offset = turns - mean
    return mean, (offset * weights[:, None]).T @ offset


def _weights(log_values: Floats) -> Floats:
    p = np.exp(log_values - log_values.max())
    return p / p.sum()


def centre_and_spread(frame: Floats, evidence: FaultEvidence, odds: EvidenceModel, terms: Terms) -> tuple[Floats, Floats]:
    """Return the posterior mean frame near a mode and the covariance of its turns (radians squared), found by narrowing grids."""
    radius, spacing = np.radians(24.0), np.radians(6.0)
    covariance = np.eye(3)
    for _ in range(3):
        turns = ball(radius, spacing)
        values = log_likelihood(evidence, turned(frame, turns), COARSE_RATIOS, odds, terms).sum(0)
        mean, covariance = _moments(_weights(np.logaddexp.reduce(values, axis=1)), turns)
        frame = turned(frame, mean[None])[0]
        widest = np.sqrt(np.linalg.eigvalsh(covariance)[-1])
        radius = min(max(4 * widest, np.radians(6.0)), np.radians(40.0))
        spacing = radius / 4.5
    return frame, covariance


def bootstrap_counts(faults: int, replicates: int, random_state: int) -> NDArray[np.int64]:
    """Return how often each fault is drawn in each replicate, shape (B, F)."""
    return np.random.default_rng(random_state).multinomial(faults, np.full(faults, 1 / faults), size=replicates)


def infer(evidence: FaultEvidence, odds: EvidenceModel, terms: Terms, counts: NDArray[np.int64]) -> Posterior:
    """Return the stress and its replicates. Cost is linear in the faults; memory is bounded by the grids.

    A well-determined stress is found on a fine grid about its best modes. Where the evidence is loose (few faults, senses
    alone) the likelihood is averaged over all frames instead, as a reduced tensor, which has no favourite mode.
    """
    frames = all_frames(COARSE_FRAMES)
    values, odds = survey(evidence, frames, odds, terms)
    over_frames = np.logaddexp.reduce(values, axis=1)
    centres, grids, logs = [], [], []
    for mode in distinct_modes(frames, over_frames, MODES):
        frame, covariance = centre_and_spread(mode, evidence, odds, terms)
        if not centres and np.sqrt(np.linalg.eigvalsh(covariance)[-1]) > WIDEST_RAD:
            return _replicate_broadly(frames, evidence, odds, terms, counts)
        turns = _fine_turns(covariance)
        centres.append(frame)
        grids.append(turns)
        logs.append(log_likelihood(evidence, turned(frame, turns), FINE_RATIOS, odds, terms))
    return _replicate(centres, grids, logs, counts, odds)


def _replicate_broadly(frames: Floats, evidence: FaultEvidence, odds: EvidenceModel, terms: Terms, counts: NDArray[np.int64]) -> Posterior:
    every = np.concatenate([np.ones((1, counts.shape[1])), counts]).astype(np.float32)
    sums = np.zeros((len(every), len(frames) * len(COARSE_RATIOS)), np.float32)
    for start in range(0, len(evidence), CHUNK_FAULTS):
        rows = slice(start, start + CHUNK_FAULTS)
        part = log_likelihood(_part(evidence, rows), frames, COARSE_RATIOS, odds, terms)
        sums += every[:, rows] @ part.reshape(len(part), -1).astype(np.float32)
    p = np.exp(sums - sums.max(1, keepdims=True)).reshape(len(every), len(frames), -1)
    p /= p.sum((1, 2), keepdims=True)
    outer1 = np.einsum("gi,gj->gij", frames[:, 0], frames[:, 0]).reshape(len(frames), 9)
    outer2 = np.einsum("gi,gj->gij", frames[:, 1], frames[:, 1]).reshape(len(frames), 9)
    tensors = (p.sum(2) @ outer1 + (p @ COARSE_RATIOS) @ outer2).reshape(-1, 3, 3)
    axes = np.swapaxes(np.linalg.eigh(tensors.astype(float))[1], -1, -2)[:, ::-1]
    axes[:, 2] *= np.sign(np.linalg.det(axes))[:, None]
    nearest = int(np.argmax((np.einsum("gij,ij->gi", frames, axes[0]) ** 2).sum(-1)))
    at_estimate = log_likelihood(evidence, frames[nearest][None], COARSE_RATIOS, odds, terms)[:, 0].mean(-1)
    return Posterior(axes[0], axes[1:], p.sum(1)[1:].astype(float), COARSE_RATIOS, counts, at_estimate, odds, loose=True)


def _fine_turns(covariance: Floats) -> Floats:
    values, vectors = np.linalg.eigh(covariance)
    scale = np.clip(np.sqrt(np.maximum(values, 0)), np.radians(0.7), WIDEST_RAD)
    return ball(4.0, 0.95) * scale @ vectors.T


def _replicate(centres: list[Floats], grids: list[Floats], logs: list[Floats], counts: NDArray[np.int64], odds: EvidenceModel) -> Posterior:
    every = np.concatenate([np.ones((1, counts.shape[1])), counts])
    mass, frames, ratios = [], [], []
    for centre, turns, values in zip(centres, grids, logs, strict=True):
        count_faults, count_turns, count_ratios = values.shape
        flat = values.reshape(count_faults, -1).astype(np.float32)
        sums = (every.astype(np.float32) @ flat).reshape(len(every), count_turns, count_ratios)
        top = sums.max((1, 2), keepdims=True)
        p = np.exp(sums - top)
        total = p.sum((1, 2), dtype=float)
        over_turns = p.sum(2, dtype=float) / total[:, None]
        frames.append(turned(centre, over_turns @ turns))
        ratios.append(p.sum(1, dtype=float) / total[:, None])
        cell = np.ptp(turns, axis=0).prod() / len(turns)  # grids of two modes may differ in fineness
        mass.append(top[:, 0, 0].astype(float) + np.log(total * cell))
    best = np.argmax(np.stack(mass), axis=0)
    pick = np.arange(len(every))
    chosen = np.stack(frames)[best, pick]
    at = int(best[0])
    nearest = int(np.argmin((grids[at] ** 2).sum(-1)))
    return Posterior(chosen[0], chosen[1:], np.stack(ratios)[best, pick][1:], FINE_RATIOS, counts, logs[at][:, nearest].mean(-1), odds)


def cones_deg(frame: Floats, frames: Floats, confidence: float = 0.95) -> tuple[float, float, float]:
    """Return for each axis the half-angle, degrees, of the cone that holds the stated share of the replicates."""
    angles = axial_angle_deg(frames, frame[None])
    return tuple(float(v) for v in np.quantile(angles, confidence, axis=0))  # type: ignore[return-value]
