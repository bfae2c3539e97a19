"""The stress that all faults together speak for: a survey of all frames, then a fine grid about the best of them."""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.stress.evidence import EvidenceModel, FaultEvidence, geometry_term, sense_term
from structviz.stress.frames import all_frames, ball, turn_between, turned
from structviz.stress.replicates import Posterior, replicate
from structviz.stress.slip_lines import slip_term

Floats = NDArray[np.float64]

COARSE_FRAMES = 9000  # about 7 degrees apart, less than the scatter of the likelihood
COARSE_RATIOS = np.array([0.15, 0.5, 0.85])
FINE_RATIOS = (np.arange(7) + 0.5) / 7
SCATTERS_DEG = (7.5, 12.0)
OBTUSE_SHARES = (0.1, 0.85)  # ordinary, and a model of rotated or reactivated blocks
OBTUSE_PRIOR = 0.1  # how often a model is of the second kind
LABEL_TRUST = ((0.08, 0.35), (0.2, 0.5))  # share of wrong labels, softness of the sector's edge
MODES = 2
CHUNK_FAULTS = 16  # bounds memory: faults taken at a time over the coarse grid
MODE_APART_RAD = np.radians(35.0)
WIDEST_RAD = np.radians(18.0)  # a broader posterior is truncated here: beyond, the frames of one mode wrap onto another


@dataclass(frozen=True)
class Terms:
    """Which parts of the evidence are heard."""

    geometry: bool = True
    senses: bool = True
    lines: bool = True


def log_likelihood(evidence: FaultEvidence, frames: NDArray[Any], ratios: Floats, odds: EvidenceModel, terms: Terms) -> Floats:
    """Return the log-likelihood of each fault, shape (F, G, R)."""
    total = np.zeros((len(evidence), len(frames), len(ratios)), frames.dtype)
    if terms.geometry:
        total += geometry_term(evidence, frames, odds)[..., None]
    if terms.senses:
        total += sense_term(evidence, frames, ratios, odds)
    if terms.lines and evidence.measured.any():
        total += slip_term(evidence.slips, frames, ratios, odds.line_scatter_deg, odds.wrong_line_share)
    return total


def _sums(evidence: FaultEvidence, frames: NDArray[Any], term: Callable[[FaultEvidence, NDArray[Any]], NDArray[Any]]) -> Floats:
    """Return a term of the likelihood summed over the faults, taken in chunks so that memory stays bounded."""
    chunks = [evidence.part(slice(start, start + CHUNK_FAULTS)) for start in range(0, len(evidence), CHUNK_FAULTS)]
    with ThreadPoolExecutor(max_workers=min(len(chunks), os.cpu_count() or 1) or 1) as pool:  # arrays let go of the interpreter
        return sum(pool.map(lambda chunk: term(chunk, frames).sum(0, dtype=float), chunks), np.zeros(1))


def survey(evidence: FaultEvidence, frames: Floats, odds: EvidenceModel, terms: Terms) -> tuple[Floats, EvidenceModel]:
    """Return the log-likelihood over all frames and coarse ratios, shape (G, R), with the odds that explain the model best.

    The candidates differ in how tightly new faults cluster, how many stand at the obtuse angle, and how far labels can be
    trusted. Each is weighed by its likelihood averaged over all stresses, so that none wins by fitting one stress alone.
    """
    single: NDArray[Any] = frames.astype(np.float32)
    geometry: dict[EvidenceModel, Floats] = {odds: np.zeros(1)}
    if terms.geometry:
        shapes = [replace(odds, plane_scatter_deg=s, obtuse_share=o) for s in SCATTERS_DEG for o in OBTUSE_SHARES]
        geometry = {o: _sums(evidence, single, lambda e, f, o=o: geometry_term(e, f, o)) for o in shapes}  # type: ignore[misc]
    senses: dict[EvidenceModel, Floats] = {odds: np.zeros((1, len(COARSE_RATIOS)))}
    if terms.senses and evidence.declared.any():
        trust = [replace(odds, wrong_label_share=w, shear_softness=s) for w, s in LABEL_TRUST]
        senses = {o: _sums(evidence, single, lambda e, f, o=o: sense_term(e, f, COARSE_RATIOS, o)) for o in trust}  # type: ignore[misc]
    lines = np.zeros((1, len(COARSE_RATIOS)))
    if terms.lines and evidence.measured.any():
        lines = _sums(evidence, single, lambda e, f: slip_term(e.slips, f, COARSE_RATIOS, odds.line_scatter_deg, odds.wrong_line_share))
    best, best_odds, best_total = -np.inf, odds, np.zeros((len(frames), len(COARSE_RATIOS)))
    for shape, on_axes in geometry.items():
        for label, on_senses in senses.items():
            total = on_axes[:, None] + on_senses + lines
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


def infer(evidence: FaultEvidence, odds: EvidenceModel, terms: Terms, counts: NDArray[np.int64]) -> Posterior:
    """Return the stress and its replicates. Cost is linear in the faults; memory is bounded by the grids.

    A well-determined stress is found on a fine grid about its best modes. Where the evidence is loose (few faults, senses
    alone) the likelihood is averaged over all frames instead, as a reduced tensor, which has no favourite mode.
    """
    frames = all_frames(COARSE_FRAMES)
    values, odds = survey(evidence, frames, odds, terms)
    over_frames = np.logaddexp.reduce(values, axis=1)
    grids: list[Floats] = []
    logs: list[NDArray[np.float32]] = []
    for mode in distinct_modes(frames, over_frames, MODES):
        frame, covariance = centre_and_spread(mode, evidence, odds, terms)
        if not grids and np.sqrt(np.linalg.eigvalsh(covariance)[-1]) > WIDEST_RAD:
            logs = [_in_chunks(evidence, frames, odds, terms)]
            return replicate([frames], logs, COARSE_RATIOS, counts, odds, loose=True)
        grid = turned(frame, _fine_turns(covariance))
        grids.append(grid)
        logs.append(log_likelihood(evidence, grid.astype(np.float32), FINE_RATIOS, odds, terms).astype(np.float32))
    return replicate(grids, logs, FINE_RATIOS, counts, odds, loose=False)


def _in_chunks(evidence: FaultEvidence, frames: Floats, odds: EvidenceModel, terms: Terms) -> NDArray[np.float32]:
    chunks = [evidence.part(slice(at, at + CHUNK_FAULTS)) for at in range(0, len(evidence), CHUNK_FAULTS)]
    return np.concatenate(
        [log_likelihood(chunk, frames.astype(np.float32), COARSE_RATIOS, odds, terms).astype(np.float32) for chunk in chunks]
    )


def _fine_turns(covariance: Floats) -> Floats:
    values, vectors = np.linalg.eigh(covariance)
    scale = np.clip(np.sqrt(np.maximum(values, 0)), np.radians(0.7), WIDEST_RAD)
    return ball(4.0, 0.95) * scale @ vectors.T
