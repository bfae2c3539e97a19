"""Reading the stress from pairs: the densest mode of their frames first, then a robust mean, then a bootstrap over faults."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import rotation_vectors_to_matrices
from structviz.stress.classify import kinds, shmax_deg
from structviz.stress.conjugate import Pairs
from structviz.stress.evidence import EvidenceModel
from structviz.stress.regime import Regime, ShapeRatio
from structviz.stress.replicates import FEW_FAULTS, Posterior, cones_deg

Floats = NDArray[np.float64]

SEEDS = 48
HEAVIEST = 3000  # pairs that are heard; the rest weigh next to nothing
ROUNDS = 12
KERNEL = np.radians(20.0) ** 2  # squared angle over which a frame counts as near
PLANE_SCATTER_DEG = EvidenceModel().plane_scatter_deg
LOOSEST_CONE_DEG = 55.0  # beyond this on sigma1 and sigma3 both, no regime is claimed
RESOLVED = 0.5  # R is reported where its interval is narrower than this


def _deviators(axes: Floats) -> Floats:
    """Return each frame as the tensor with values (1, 0, -1), flattened, shape (P, 9); their products measure likeness."""
    return (axes[:, 0, :, None] * axes[:, 0, None, :] - axes[:, 2, :, None] * axes[:, 2, None, :]).reshape(-1, 9)


def _kernel(likeness: Floats) -> Floats:
    # Two frames turned by a small angle a about any axis differ in likeness by at least a squared.
    return np.exp((likeness - 2) / KERNEL)


def pair_frames(pairs: Pairs, counts: NDArray[np.int64]) -> tuple[Floats, Floats]:
    """Return the frame the pairs agree on, rows sigma1, sigma2, sigma3, (3, 3), and that of each bootstrap replicate, (B, 3, 3).

    Pairs share faults, so replicates draw faults: a pair counts as often as both of its faults together are drawn.
    """
    pairs = pairs.rows(np.arange(min(len(pairs), HEAVIEST)))
    tensors = _deviators(pairs.axes)
    drawn = counts[:, pairs.faults[:, 0]] * counts[:, pairs.faults[:, 1]]
    weight = pairs.weight * np.concatenate([np.ones((1, len(pairs))), drawn])
    weight[weight.sum(1) == 0] = pairs.weight  # a replicate without any pair says nothing new
    seeds = tensors[:SEEDS]
    density = weight @ _kernel(tensors @ seeds.T)
    current = seeds[density.argmax(1)]
    for _ in range(ROUNDS):
        near = weight * _kernel(current @ tensors.T)
        frames = _frames((near @ tensors).reshape(-1, 3, 3))
        current = _deviators(frames)
    faults = len(np.unique(pairs.faults))
    if faults < FEW_FAULTS:  # drawing two or three planes again and again says nothing of how well each was drawn
        own = np.radians(PLANE_SCATTER_DEG) * np.sqrt(2 / faults)
        turns = np.random.default_rng(faults).normal(0, own, (len(frames) - 1, 3))
        frames[1:] = rotation_vectors_to_matrices(turns) @ frames[1:]
    return frames[0], frames[1:]


def _frames(tensors: Floats) -> Floats:
    axes = np.swapaxes(np.linalg.eigh(tensors)[1], -1, -2)[..., ::-1, :].copy()
    axes[..., 2, :] = np.cross(axes[..., 0, :], axes[..., 1, :])
    return axes


def regime_of_frames(frame: Floats, frames: Floats, shape_ratio: ShapeRatio | None = None, weight: float = 1.0) -> Regime:
    """Return the regime of a frame and its replicates: cones, class and azimuth of greatest horizontal compression."""
    ratio = shape_ratio.value if shape_ratio else 0.5
    azimuth = _azimuth(frame, ratio)
    spread = np.abs((_azimuths(frames, ratio) - azimuth + 90.0) % 180.0 - 90.0)
    return Regime(frame, cones_deg(frame, frames), str(kinds(frame)), azimuth, float(np.quantile(spread, 0.95)), shape_ratio, weight)


def _azimuth(frame: Floats, ratio: float) -> float:
    return float(_azimuths(frame[None], ratio)[0])


def _azimuths(frames: Floats, ratio: float) -> Floats:
    azimuth = shmax_deg(frames, ratio)
    return np.where(np.isnan(azimuth), 0.0, azimuth)  # every horizontal direction alike: R = 0.5 never gives this


def shape_ratio_of(posterior: Posterior) -> ShapeRatio | None:
    """Return R with its 90 % interval where that is narrower than half of its range, else None: the data leave it open."""
    share = posterior.ratios.mean(0)
    steps = np.concatenate([[0.0], np.cumsum(share)])
    edges = np.linspace(0.0, 1.0, len(share) + 1)
    low, middle, high = np.interp([0.05, 0.5, 0.95], steps, edges)
    return ShapeRatio(float(middle), float(low), float(high)) if high - low < RESOLVED else None
