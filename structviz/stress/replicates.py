"""Replicates of the stress: a bootstrap over faults, made on grids of frames where the likelihood of every fault is known."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.evidence import EvidenceModel
from structviz.stress.frames import turn_between, turned

Floats = NDArray[np.float64]
Floats32 = NDArray[np.float32]

FEW_FAULTS = (
    8  # with fewer, the bootstrap alone is too sure of itself; with more it covers the truth as it says (tests/benchmarks/accuracy)
)
CHUNK_REPLICATES = 250  # bounds memory whatever the number of replicates


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


def bootstrap_counts(faults: int, replicates: int, random_state: int) -> NDArray[np.int64]:
    """Return how often each fault is drawn in each replicate, shape (B, F)."""
    return np.random.default_rng(random_state).multinomial(faults, np.full(faults, 1 / faults), size=replicates)


def replicate(
    grids: Sequence[Floats],
    logs: Sequence[Floats32],
    ratio_grid: Floats,
    counts: NDArray[np.int64],
    odds: EvidenceModel,
    *,
    loose: bool,
) -> Posterior:
    """Return the estimate from all faults and from each bootstrap draw of them.

    grids are frames (G, 3, 3), one array a mode, and logs the log-likelihoods (F, G, R) on them. A draw is a row of counts, its
    log-likelihood a product; its estimate is the mean reduced tensor over the grid of its best mode.
    """
    every = np.concatenate([np.ones((1, counts.shape[1])), counts]).astype(np.float32)
    chunks = [every[at : at + CHUNK_REPLICATES] for at in range(0, len(every), CHUNK_REPLICATES)]
    mass: list[Floats] = []
    axes: list[Floats] = []
    shares: list[Floats] = []
    for grid, values in zip(grids, logs, strict=True):
        found = [estimates(grid, values, ratio_grid, rows) for rows in chunks]
        for collected, column in zip((mass, axes, shares), zip(*found, strict=True), strict=True):
            collected.append(np.concatenate(column))
    best = np.argmax(np.stack(mass), axis=0)
    pick = np.arange(len(every))
    frames, ratios = np.stack(axes)[best, pick], np.stack(shares)[best, pick]
    at = int(best[0])
    if counts.shape[1] < FEW_FAULTS:
        frames[1:] = _widened(frames[0], frames[1:], grids[at], logs[at])
    nearest = int(np.argmin((turn_between(frames[0], grids[at]) ** 2).sum(-1)))
    return Posterior(frames[0], frames[1:], ratios[1:], ratio_grid, counts, logs[at][:, nearest].mean(-1), odds, loose)


def estimates(grid: Floats, values: Floats32, ratio_grid: Floats, rows: Floats32) -> tuple[Floats, Floats, Floats]:
    """Return the log of the mass (B,), the mean frame (B, 3, 3) and the share of each shape ratio (B, R) for rows of counts."""
    sums = (rows @ values.reshape(len(values), -1)).reshape(len(rows), len(grid), -1)
    top = sums.max((1, 2), keepdims=True)
    p = np.exp(sums - top)
    total = p.sum((1, 2), dtype=float)
    first = np.einsum("gi,gj->gij", grid[:, 0], grid[:, 0]).reshape(-1, 9)
    second = np.einsum("gi,gj->gij", grid[:, 1], grid[:, 1]).reshape(-1, 9)
    # R = 1/2 for the mean frame: with it no axis is favoured, and the axes of the mean are the mean of the axes.
    tensors = (p.sum(2) @ (first + second / 2)).reshape(-1, 3, 3) / total[:, None, None]
    axes = np.swapaxes(np.linalg.eigh(tensors)[1], -1, -2)[:, ::-1].copy()
    axes[:, 2] = np.cross(axes[:, 0], axes[:, 1])
    cell = _volume(grid) / len(grid)  # grids of two modes may differ in fineness
    return top[:, 0, 0].astype(float) + np.log(total * cell), axes, p.sum(1, dtype=float) / total[:, None]


def _volume(grid: Floats) -> float:
    turns = turn_between(grid[0], grid)
    return float(np.sqrt(max(np.linalg.det(np.cov(turns.T)), 1e-300)))


def _widened(frame: Floats, frames: Floats, grid: Floats, values: Floats32) -> Floats:
    """Return the replicates, spread further where they spread less than the likelihood itself does.

    A bootstrap of two or three faults draws the same faults again and again and thinks itself sure; the likelihood knows
    better. What is missing of its variance is added by draws from it.
    """
    sums = values.sum(0, dtype=float)
    p = np.exp(sums - sums.max()).sum(1)
    own, boot = turn_between(frame, grid), turn_between(frame, frames)
    missing = 1 - float((boot**2).sum(1).mean()) / max(float(p @ (own**2).sum(1) / p.sum()), 1e-300)
    if missing <= 0:
        return frames
    draws = np.random.default_rng(len(values)).choice(len(grid), size=len(frames), p=p / p.sum())
    return turned(frame, boot + np.sqrt(missing) * own[draws])


def cones_deg(frame: Floats, frames: Floats, confidence: float = 0.95) -> tuple[float, float, float]:
    """Return for each axis the half-angle, degrees, of the cone that holds the stated share of the replicates."""
    angles = axial_angle_deg(frames, frame[None])
    return tuple(float(v) for v in np.quantile(angles, confidence, axis=0))  # type: ignore[return-value]
