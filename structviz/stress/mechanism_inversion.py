"""Stress from earthquake mechanisms, of which it is not known which nodal plane slipped [vavrycuk2014].

The planes are chosen and the stress is inferred in turn: the linear solution [michael1984] from the planes chosen so far, then of
each event the plane nearer to slip in that stress, until no choice changes. The linear solution takes the shear to be
equally large on every plane. That is nearly so on planes well oriented for slip, which are the ones that this chooses; where the
planes are not, the axes stay good and R does not.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite, check_vectors
from structviz.errors import ArgumentError
from structviz.orientation.vectors import Array, rotation_vectors_to_matrices
from structviz.stress.inversion import SlipInversion, linear_inversion, shear_design
from structviz.stress.mechanisms import auxiliary_plane_deg, choose_planes, normals_and_slips
from structviz.stress.readings import regime_of_frames
from structviz.stress.regime import Regime, ShapeRatio
from structviz.stress.replicates import bootstrap_counts
from structviz.stress.slip_lines import SlipLines, slip_term
from structviz.stress.tensor import FRICTION, principal

FEWEST = 4  # events; fewer cannot fix three angles and a shape ratio with anything to spare
STARTS = 24  # random choices of planes that are tried beside that of taking both
ROUNDS = 40  # of choosing planes; most starts settle in fewer than ten
WORK = 4_000_000  # planes x replicates judged at once, which bounds the memory
MARGIN = 0.01  # of instability by which the other plane must lead before it is taken instead; without it, choices go in circles
REPLICATE_ROUNDS = 6  # they begin near their end
MEASURED_DEG = 8.0  # root mean square turn by which a good mechanism is uncertain; it is added in full up to
FEW = 10  # events, and less the more there are: their scatter then shows it, and cones cover the truth without
COPIES = 40  # sets of turned mechanisms among the replicates
STABLE = 0.9  # share of replicates that must agree on a plane


@dataclass(frozen=True, eq=False)
class MechanismInversion:
    """The stress that earthquake mechanisms tell of, and the plane taken to have slipped in each."""

    regime: Regime  # axes with their cones, class, SHmax; its `faults` is the number of events
    inversion: SlipInversion  # axes, R and the misfit of each event on its chosen plane
    chosen: NDArray[np.intp]  # (N,) 0 for the first plane given, 1 for the second
    instability: Array  # (N, 2) of both planes, 0 to 1
    planes_deg: Array  # (N, 2, 3) strike, dip and rake of both planes
    settled: bool  # False where choices still changed at the end
    stable_share: float  # of events whose chosen plane is the same in nine of ten replicates


def both_planes_deg(planes_deg: ArrayLike) -> Array:
    """Return strike, dip and rake of both nodal planes, (N, 2, 3); where the second is NaN it is found from the first.

    planes_deg : (N, 2, 3), or (N, 3) where only one plane of each event is given.
    """
    angles = np.array(planes_deg, float)
    if angles.ndim == 2:
        angles = np.stack([angles, np.full_like(angles, np.nan)], 1)
    if angles.ndim != 3 or angles.shape[1:] != (2, 3):
        found = f"planes_deg: found shape {angles.shape}; wanted (N, 2, 3) or (N, 3)"
        raise ArgumentError(found, hint="give strike, dip and rake of each nodal plane")
    check_vectors("planes_deg", angles[:, 0])
    lacks = np.isnan(angles[:, 1]).any(-1)
    angles[lacks, 1] = np.stack(auxiliary_plane_deg(*angles[lacks, 0].T), -1)
    return angles


def invert_mechanisms(
    planes_deg: ArrayLike, weights: ArrayLike | None = None, *, friction: float = FRICTION, replicates: int = 400, random_state: int = 0
) -> MechanismInversion:
    """Return the stress of earthquake mechanisms, with cones of 95 % from a bootstrap over events.

    Parameters
    ----------
    planes_deg : (N, 2, 3) strike, dip and rake of both nodal planes, the second NaN where not known; or (N, 3) of one plane.
    weights : (N,) not negative.
    friction : of the fault planes, which decides what "nearer to slip" means.

    Raises
    ------
    ArgumentError
        For fewer than four events of some weight, and where the planes do not determine the stress; the message says how far.

    Notes
    -----
    Starts are both planes of each event at half weight, and random choices of planes; the end with the greatest mean instability
    is kept. Every replicate chooses its planes anew, beginning with those of all events.
    """
    angles = both_planes_deg(planes_deg)
    w = _checked_weights(weights, len(angles))
    vectors = normals_and_slips(*np.moveaxis(angles, -1, 0))
    planes = _planes(*vectors)
    first = _first_choices(len(angles), random_state)
    ends, tensors, settled = _settled(planes, np.broadcast_to(w, first.shape), first, friction)
    best = int((_mean_instability(planes, ends, tensors, w, friction)).argmax())
    n, s = normals_and_slips(*angles[np.arange(len(angles)), ends[best].astype(int)].T)
    inversion = linear_inversion(n, s, w)
    _, instability = choose_planes(angles, inversion.axes, inversion.shape_ratio, friction)
    counts = bootstrap_counts(len(angles), replicates, random_state)
    again, others = _replicates(vectors, counts * w, ends[best], friction, random_state)
    same = float(((again == ends[best]).mean(0) >= STABLE).mean())
    regime = _regime(inversion, others, len(angles))
    return MechanismInversion(regime, inversion, ends[best].astype(np.intp), instability, angles, bool(settled[best]), same)


@dataclass(frozen=True, eq=False)
class _Planes:
    """Both planes of each event, ready for many solutions at once."""

    squares: Array  # (2, N, 25) normal equations of the linear solution
    sides: Array  # (2, N, 5)
    products: Array  # (2, N, 6) of the components of the normal: six numbers times these are a quadratic form of it


def _checked_weights(weights: ArrayLike | None, count: int) -> Array:
    w = np.ones(count) if weights is None else check_finite("weights", weights)
    if w.shape != (count,) or (w < 0).any() or (w > 0).sum() < FEWEST:
        found = f"mechanisms: found {count}, {int((w > 0).sum())} of a weight above zero; wanted {FEWEST} or more, and one weight for each"
        raise ArgumentError(found, hint="add mechanisms, or leave the weights out for one each")
    return w


def _planes(normals: Array, slips: Array) -> _Planes:
    """Return what is needed of normals and slips (N, 2, 3); a normal may point either way, as long as its slip turns with it."""
    n, s = np.swapaxes(normals, 0, 1), np.swapaxes(slips, 0, 1)
    design = shear_design(n.reshape(-1, 3)).reshape(2, -1, 3, 5)
    x, y, z = np.moveaxis(n, -1, 0)
    products = np.stack([x * x, y * y, z * z, 2 * x * y, 2 * x * z, 2 * y * z], -1)
    squares = np.einsum("pnij,pnik->pnjk", design, design).reshape(2, -1, 25)
    return _Planes(squares, -np.einsum("pnij,pni->pnj", design, s), products)


def _first_choices(count: int, random_state: int) -> Array:
    """Return the share of the second plane at each start, (K, N): both planes alike, then one of them at random."""
    drawn = np.random.default_rng(random_state).integers(0, 2, (STARTS, count))
    return np.concatenate([np.full((1, count), 0.5), drawn])


def _tensors(planes: _Planes, weights: Array, shares: Array) -> Array:
    """Return the linear solutions (K, 3, 3) with weights (K, N) and shares of the second plane (K, N)."""
    parts = (weights * (1 - shares), weights * shares)
    square = sum(part @ each for part, each in zip(parts, planes.squares)).reshape(-1, 5, 5)
    side = sum(part @ each for part, each in zip(parts, planes.sides))
    ridge = 1e-9 * np.trace(square, axis1=1, axis2=2)[:, None, None] * np.eye(5)  # a replicate of too few events must not stop the rest
    a, b, c, d, e = np.linalg.solve(square + ridge, side[..., None])[..., 0].T
    return np.moveaxis(np.array([[a, b, c], [b, d, e], [c, e, -a - d]]), -1, 0)


def _instability(planes: _Planes, tensors: Array, friction: float) -> Array:
    """Return the instability of all planes in tensors (K, 3, 3), (2, K, N): `tensor.instability` as products of matrices."""
    values = np.linalg.eigvalsh(tensors)
    high, half = values[:, 2], np.maximum(values[:, 2] - values[:, 0], 1e-300) / 2
    pressure = _forms(tensors) @ np.swapaxes(planes.products, 1, 2)
    squared = _forms(tensors @ tensors) @ np.swapaxes(planes.products, 1, 2)
    shear = np.sqrt(np.maximum(squared - pressure**2, 0.0))
    best = np.sqrt(1 + friction**2) + friction
    return (shear + friction * (high[:, None] - pressure)) / (best * half[:, None])


def _forms(tensors: Array) -> Array:
    """Return the six numbers (K, 6) of symmetric tensors."""
    return np.stack([tensors[:, i, j] for i, j in ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))], -1)


def _settled(
    planes: _Planes, weights: Array, shares: Array, friction: float, rounds: int = ROUNDS
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Return the choices (K, N) and stresses (K, 3, 3) when no choice changes any more, and whether that was reached (K,)."""
    tensors = _tensors(planes, weights, shares)
    changed = np.ones(len(shares), bool)
    for done in range(rounds):
        lead = np.subtract(*_instability(planes, tensors, friction)[::-1])
        chosen = np.where(np.abs(lead) > (MARGIN if done else 0.0), lead > 0, shares)
        changed = (chosen != shares).any(1)
        shares = chosen
        if not changed.any():
            break
        tensors = _tensors(planes, weights, shares)
    return shares, tensors, ~changed


def _mean_instability(planes: _Planes, shares: Array, tensors: Array, weights: Array, friction: float) -> Array:
    near = _instability(planes, tensors, friction)
    return np.where(shares == 1, near[1], near[0]) @ weights


def _replicates(vectors: tuple[Array, Array], weights: Array, shares: Array, friction: float, random_state: int) -> tuple[Array, Array]:
    """Return choices (B, N) and stresses (B, 3, 3) of each row of weights (B, N), some rows at a time.

    Every few rows have the mechanisms turned by what they are uncertain by: a bootstrap of few and like earthquakes is too sure.
    """
    rng, own = np.random.default_rng(random_state), np.radians(MEASURED_DEG) * min(1.0, FEW / len(shares))
    step = max(1, min(-(-len(weights) // COPIES), WORK // (2 * len(shares))))
    ends = []
    for part in (weights[k : k + step] for k in range(0, len(weights), step)):
        turns = rotation_vectors_to_matrices(rng.normal(0.0, own / np.sqrt(3), (len(shares), 3)))
        turned = _planes(*(np.einsum("nij,npj->npi", turns, each) for each in vectors))
        ends.append(_settled(turned, part, np.broadcast_to(shares, part.shape), friction, REPLICATE_ROUNDS))
    return np.concatenate([end[0] for end in ends]), np.concatenate([end[1] for end in ends])


def _regime(inversion: SlipInversion, tensors: Array, events: int) -> Regime:
    """Return the regime; without R, which the linear solution misses by 0.2 where planes are less than well oriented."""
    frames, _, ratios = principal(tensors)
    regime = regime_of_frames(inversion.axes, frames, ShapeRatio(inversion.shape_ratio, *map(float, np.quantile(ratios, [0.05, 0.95]))))
    return replace(regime, shape_ratio=None, name="mechanisms", faults=events)


def mechanism_term(
    planes_deg: ArrayLike, weights: ArrayLike, frames: NDArray[Any], ratios: Array, scatter_deg: float, wrong_share: float
) -> NDArray[Any]:
    """Return the log-likelihood ratio of each mechanism as evidence, (N, G, R): that of slip on either plane, at even odds.

    Planes as in `invert_mechanisms`; scatter and wrong share as in `slip_term`. Which plane slipped is left open at every stress, so
    that a choice made once cannot feed on itself.
    """
    angles, w = both_planes_deg(planes_deg), check_finite("weights", weights)
    n, s = normals_and_slips(*np.moveaxis(angles, -1, 0))
    signed, heard = np.ones((len(w), 1), bool), np.ones((len(w), 1))
    each = [SlipLines(n[:, [k]], s[:, [k]], signed, heard) for k in (0, 1)]
    first, second = (slip_term(lines, frames, ratios, scatter_deg, wrong_share) for lines in each)
    return w[:, None, None].astype(frames.dtype) * (np.logaddexp(first, second) - np.log(2.0).astype(frames.dtype))
