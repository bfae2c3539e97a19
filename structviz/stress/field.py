"""The stress as a field: axes at any place from the faults near it, blank where there are too few."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.orientation.vectors import rotation_vectors_to_matrices
from structviz.stress.classify import shmax_deg
from structviz.stress.evidence import EvidenceModel, FaultEvidence
from structviz.stress.frames import all_frames, turn_between
from structviz.stress.joint import COARSE_RATIOS, Terms, log_likelihood

Floats = NDArray[np.float64]

FRAMES = 16_000  # about 6 degrees apart
TABLE_BYTES = 64_000_000  # of the table of faults by frames; many faults are heard on fewer frames
CHUNK_POINTS = 64  # bounds memory whatever the number of points
LEAST_FAULTS = 4.0  # effective number below which a point stays blank
CUT = 2.0  # bandwidths from a point beyond which a fault is not heard there
REACHES = (0.1, 0.13, 0.18, 0.25, 0.33)
MOST_ASKED = 100  # faults that are foretold from the others; of more, every second, third, ...
ABOUT_AS_GOOD_NATS = 2.0  # of bandwidths that foretell about as well the shortest is taken, since it lags least
GAIN_NATS = 3.0  # a field must foretell the faults better than one stress by this much


@dataclass(frozen=True, eq=False)
class LocalData:
    """What each fault says of every frame and shape ratio, and where it lies."""

    places: Floats  # (F, 3) m
    frames: Floats  # (G, 3, 3) unit rows sigma1, sigma2, sigma3
    ratios: Floats  # (R,)
    logs: NDArray[np.float32]  # (F, G * R) log-likelihood


@dataclass(frozen=True, eq=False)
class StressField:
    """Axes at points; NaN where not supported."""

    points: Floats  # (P, 3) m
    axes: Floats  # (P, 3, 3) unit rows sigma1, sigma2, sigma3
    spread_deg: Floats  # (P, 3) angle of each axis (root mean square sine) under what the faults near by say
    count: NDArray[np.int64]  # (P,) faults within two bandwidths
    supported: NDArray[np.bool_]  # (P,)
    shmax_deg: Floats  # (P,) azimuth of the greatest horizontal compression, [0, 180), for R = 1/2
    radius_m: float  # bandwidth; infinite where one stress serves the whole model


@dataclass(frozen=True, eq=False)
class Bandwidth:
    """The bandwidth that foretells each fault best from the others, and how well every candidate did."""

    radius_m: float  # infinite: one stress
    candidates_m: Floats  # (C,) the last one infinite
    foretold: Floats  # (C,) log-likelihood of all faults, each by the others, in nats

    @property
    def gain(self) -> float:
        """How many nats the best field foretells better than one stress."""
        return float(self.foretold[:-1].max() - self.foretold[-1])


def local_data(evidence: FaultEvidence, places: Floats, frame: Floats, odds: EvidenceModel) -> LocalData:
    """Return the log-likelihoods of faults at places (F, 3), m, on frames laid out about one frame (3, 3), so that they turn with it."""
    if np.shape(places) != (len(evidence), 3) or not np.isfinite(places).all():
        raise ArgumentError(f"places: found shape {np.shape(places)}; wanted {len(evidence)} finite places", hint="give one for each fault")
    most = TABLE_BYTES // (4 * len(COARSE_RATIOS) * max(len(evidence), 1))
    frames = all_frames(int(np.clip(most, 2000, FRAMES))) @ frame
    single = frames.astype(np.float32)
    rows = [
        log_likelihood(evidence.part(slice(i, i + 16)), single, COARSE_RATIOS, odds, Terms()).astype(np.float32)
        for i in range(0, len(evidence), 16)
    ]
    return LocalData(np.asarray(places, float), frames, COARSE_RATIOS, np.concatenate(rows).reshape(len(evidence), -1))


def kernel(points: Floats, places: Floats, radius_m: float) -> Floats:
    """Return the weight of each fault at each point, shape (P, F): Gaussian in the distance, zero beyond two bandwidths."""
    if np.isinf(radius_m):
        return np.ones((len(points), len(places)))
    origin = places.mean(0)
    p, q = points - origin, places - origin
    squares = np.maximum((p**2).sum(1)[:, None] + (q**2).sum(1)[None] - 2 * p @ q.T, 0.0) / radius_m**2
    return np.where(squares <= CUT**2, np.exp(-squares / 2), 0.0)


def stress_field(data: LocalData, points: Floats, radius_m: float) -> StressField:
    """Return the axes at points (P, 3), m. A point is blank with fewer than about four faults near it.

    The log-likelihoods of the faults, each weighed by its distance, add up to that of the stress at the point; its axes are
    those of the mean reduced tensor.
    """
    points = np.asarray(points, float)
    if points.ndim != 2 or points.shape[1] != 3 or not np.isfinite(points).all() or not radius_m > 0:
        raise ArgumentError(f"points, radius_m: found shape {points.shape}, {radius_m}; wanted finite (P, 3) and a positive radius, m")
    axes, spread, supported = smoothed(data, points, radius_m)
    if np.isfinite(radius_m) and supported.any():
        axes[supported] = _sharpened(data, points[supported], axes[supported], radius_m)
    azimuth = np.full(len(points), np.nan)
    azimuth[supported] = shmax_deg(axes[supported], 0.5)
    count = (kernel(points, data.places, radius_m) > 0).sum(1)
    return StressField(points, axes, spread, count, supported, azimuth, float(radius_m))


def smoothed(data: LocalData, points: Floats, radius_m: float) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Return mean axes (P, 3, 3), their spread (P, 3), degrees, and whether enough faults are near, (P,)."""
    axes, spread = np.full((len(points), 3, 3), np.nan), np.full((len(points), 3), np.nan)
    weights = kernel(points, data.places, radius_m)
    effective = weights.sum(1) ** 2 / np.maximum((weights**2).sum(1), 1e-300)
    supported = effective >= LEAST_FAULTS
    rows = np.flatnonzero(supported)
    for at in range(0, len(rows), CHUNK_POINTS):
        here = rows[at : at + CHUNK_POINTS]
        axes[here], spread[here] = _estimated(data, weights[here])
    return axes, spread, supported


def _sharpened(data: LocalData, points: Floats, axes: Floats, radius_m: float) -> Floats:
    """Return axes turned back by what smoothing turned them: a mean over neighbours lags behind a stress that turns, most at the edges.

    What smoothing does is seen by smoothing what is smooth already; it is undone once (twicing [tukey1977]).
    """
    at_faults, _, known = smoothed(data, data.places, radius_m)
    first, third = at_faults[known, 0], at_faults[known, 2]
    tensors = np.einsum("fi,fj->fij", first, first) - np.einsum("fi,fj->fij", third, third)
    weights = kernel(points, data.places[known], radius_m)
    twice = np.swapaxes(np.linalg.eigh(np.tensordot(weights, tensors, 1))[1], -1, -2)[:, ::-1].copy()
    twice[:, 2] = np.cross(twice[:, 0], twice[:, 1])
    # The signs of axes are arbitrary, so the turn is told in easting, northing, up, not in the axes of either frame.
    turns = -np.einsum("pk,pki->pi", turn_between(twice, axes), twice)
    return axes @ np.swapaxes(rotation_vectors_to_matrices(turns), -1, -2)


def _estimated(data: LocalData, weights: Floats) -> tuple[Floats, Floats]:
    """Return mean axes (P, 3, 3) and the spread of each (P, 3), degrees."""
    p = _posterior(data, weights).reshape(len(weights), len(data.frames), -1).sum(2)
    squares = np.einsum("gki,gkj->gkij", data.frames, data.frames).reshape(len(data.frames), 27)
    mean = (p @ squares).reshape(-1, 3, 3, 3)
    axes = np.swapaxes(np.linalg.eigh(mean[:, 0] + mean[:, 1] / 2)[1], -1, -2)[:, ::-1].copy()
    axes[:, 2] = np.cross(axes[:, 0], axes[:, 1])
    held = np.einsum("pki,pkij,pkj->pk", axes, mean, axes)  # mean squared cosine between each axis and that of the mean
    return axes, np.degrees(np.arcsin(np.sqrt(np.clip(1 - held, 0.0, 1.0))))


def _posterior(data: LocalData, weights: Floats) -> NDArray[np.float32]:
    p: NDArray[np.float32] = weights.astype(np.float32) @ data.logs  # single precision throughout: this is most of the work
    p -= p.max(1, keepdims=True)
    np.exp(p, out=p)
    p /= p.sum(1, keepdims=True, dtype=float).astype(np.float32)
    return p


def choose_bandwidth(data: LocalData) -> Bandwidth:
    """Return the bandwidth by which the others foretell each fault best; infinite unless a field gains `GAIN_NATS` over one stress."""
    size = float(np.linalg.norm(np.ptp(data.places, axis=0)))
    candidates = np.array([*(size * reach for reach in REACHES), np.inf])
    likelihood = np.exp(data.logs)
    foretold = np.array([_foretold(data, likelihood, radius) for radius in candidates])
    near = int(np.flatnonzero(foretold >= foretold[:-1].max() - ABOUT_AS_GOOD_NATS)[0])
    chosen = candidates[near] if foretold[:-1].max() - foretold[-1] >= GAIN_NATS else np.inf
    return Bandwidth(float(chosen), candidates, foretold)


def _foretold(data: LocalData, likelihood: NDArray[np.float32], radius_m: float) -> float:
    asked = np.arange(0, len(data.places), -(-len(data.places) // MOST_ASKED))
    weights = kernel(data.places[asked], data.places, radius_m)
    weights[np.arange(len(asked)), asked] = 0.0  # each is foretold by the others
    total = 0.0
    for at in range(0, len(asked), CHUNK_POINTS):
        p = _posterior(data, weights[at : at + CHUNK_POINTS])
        p *= likelihood[asked[at : at + CHUNK_POINTS]]
        total += float(np.log(p.sum(1, dtype=float)).sum())
    return total


@dataclass(frozen=True)
class FieldSummary:
    """The two supported faults between which the azimuth of the greatest horizontal compression differs most."""

    turn_deg: float  # 0 to 90
    first: tuple[float, float, float]  # m
    second: tuple[float, float, float]  # m
    first_shmax_deg: float
    second_shmax_deg: float
    radius_m: float
    gain_nats: float  # over one stress


def field_summary(data: LocalData, chosen: Bandwidth) -> FieldSummary | None:
    """Return by how much the azimuth turns between the places of the faults; None where one stress serves the whole model."""
    if np.isinf(chosen.radius_m):
        return None
    field = stress_field(data, data.places, chosen.radius_m)
    rows = np.flatnonzero(field.supported)
    if len(rows) < 2:
        return None
    azimuth = field.shmax_deg[rows]
    apart = np.abs((azimuth[:, None] - azimuth[None] + 90) % 180 - 90)
    pair = rows[list(np.unravel_index(int(np.nanargmax(apart)), apart.shape))]
    one, two = sorted(pair, key=lambda row: tuple(data.places[row]))  # from west to east
    first, second = ((float(p[0]), float(p[1]), float(p[2])) for p in data.places[[one, two]])
    turn, azimuths = float(np.nanmax(apart)), (float(field.shmax_deg[one]), float(field.shmax_deg[two]))
    return FieldSummary(turn, first, second, *azimuths, chosen.radius_m, chosen.gain)
