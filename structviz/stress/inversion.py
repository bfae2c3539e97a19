"""Stress from measured slip: what direction of shear fits all the striae.

Two solutions. The linear one [michael1984] takes the shear to be equally large on every plane; that is not so in any one
stress, and biases the axes by a few degrees even on perfect data. The angular one minimises the angles between predicted
and measured slip over all axes and shape ratios, has no such bias, and starts from the linear one among others.

How much the data can determine is counted first, and too little is refused with the count.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_finite, check_vectors
from structviz.errors import ArgumentError
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.vectors import Array, angle_deg, dot, rotation_vectors_to_matrices, unit
from structviz.stress.tensor import principal, reduced_tensor

# A direction of the unknowns that the data fix a thousand times less firmly than the best is not fixed.
RANK_TOLERANCE = 1e-3
STARTS = 6  # of the coarse search that are refined
SCANNED = 200  # planes used in the coarse search


@dataclass(frozen=True, eq=False)
class SlipInversion:
    """A reduced stress fitted to slip."""

    axes: Array  # (3, 3) unit rows sigma1, sigma2, sigma3
    shape_ratio: float  # R = (sigma2 - sigma3)/(sigma1 - sigma3)
    misfits_deg: Array  # (N,) angle between measured and predicted slip, 0 to 180 (0 to 90 where senses are not known)
    senses_known: bool  # False: `reversed()` fits exactly as well, and nothing in the data tells the two apart

    @property
    def mean_misfit_deg(self) -> float:
        """Mean angle between measured and predicted slip, degrees."""
        return float(self.misfits_deg.mean())

    def reversed(self) -> SlipInversion:
        """Return the stress for which every sense is the opposite: sigma1 and sigma3 change places, R becomes 1 - R."""
        axes = self.axes[::-1] * np.array([1.0, -1.0, 1.0])[:, None]
        misfits = 180.0 - self.misfits_deg if self.senses_known else self.misfits_deg
        return SlipInversion(axes, 1.0 - self.shape_ratio, misfits, self.senses_known)


def linear_rank(normals: ArrayLike) -> int:
    """Return how many of the five unknowns of the linear solution planes (N, 3) determine: 2 for one plane, 5 at most.

    The unknowns are the five components of a stress without its mean: three angles of the axes, the shape ratio, the size.

    >>> linear_rank([[0.6, 0.0, 0.8]])
    2
    """
    return _rank(shear_design(unit(check_vectors("normals", normals))).reshape(-1, 5))


def angular_rank(normals: ArrayLike, slips: ArrayLike) -> int:
    """Return how many of the four unknowns (three angles of the axes, the shape ratio) directions of slip determine."""
    n, s = _check_data(normals, slips)
    return min(_rank(_direction_design(n, s)), 4)


def linear_inversion(normals: ArrayLike, slips: ArrayLike, weights: ArrayLike | None = None) -> SlipInversion:
    """Return the stress whose shear is nearest, by least squares, to unit length along each slip [michael1984].

    Parameters
    ----------
    normals, slips : (N, 3) hanging-wall normals and hanging-wall slips; senses must be known.
    weights : (N,) not negative.

    Raises
    ------
    ArgumentError
        Where the planes determine fewer than the five unknowns; the message says how many.

    Notes
    -----
    The five components without the mean follow from (S n)_shear = -slip. Biased even on perfect data, see the module text.
    """
    n, s = _check_data(normals, slips)
    w = np.sqrt(_check_weights(weights, len(n)))
    design = shear_design(n)
    rank = _rank(design[w > 0].reshape(-1, 5))
    if rank < 5:
        raise ArgumentError(
            f"normals: found {len(n)} planes that determine {rank} of 5 parameters (three angles, shape ratio, size); wanted all",
            hint="add slip on planes of other strikes and dips; copies of a plane, or planes that share a line, add little",
        )
    solved = np.linalg.lstsq((design * w[:, None, None]).reshape(-1, 5), (-s * w[:, None]).reshape(-1), rcond=None)[0]
    return _result(_tensor(np.asarray(solved, float)), n, s, True)


def angular_inversion(
    normals: ArrayLike, slips: ArrayLike, weights: ArrayLike | None = None, *, senses_known: bool = True
) -> SlipInversion:
    """Return the stress with the least weighted sum of squared angles between predicted and measured slip.

    Parameters
    ----------
    normals, slips : (N, 3) hanging-wall normals and hanging-wall slips.
    weights : (N,) not negative.
    senses_known : False where the slips are striae without a sense; the result's `reversed()` is then just as good.

    Raises
    ------
    ArgumentError
        Where the directions determine fewer than the four unknowns; the message says how many.

    Notes
    -----
    A fixed set of frames and shape ratios is searched, the best of them and the algebraic solutions are refined together by
    Levenberg-Marquardt steps over rotations and R, and the least is kept. The same data give the same bytes.
    """
    n, s = _check_data(normals, slips)
    w = _check_weights(weights, len(n))
    rank = min(_rank(_direction_design(n[w > 0], s[w > 0])), 4)
    if rank < 4:
        raise ArgumentError(
            f"slips: found {len(n)} directions of slip that determine {rank} of 4 parameters (three angles, shape ratio); wanted all",
            hint="add slip on planes of other strikes and dips, or state the regime from conjugate pairs alone",
        )
    frames, ratios = _starts(n, s, w, senses_known)
    frames, ratios, costs = _refine(frames, ratios, n, s, w, senses_known)
    best = int(np.argmin(costs))
    return _result(reduced_tensor(frames[best], ratios[best]), n, s, senses_known)


def _result(tensor: Array, n: Array, s: Array, senses_known: bool) -> SlipInversion:
    axes, _, ratio = principal(tensor)
    predicted = resolved_slip(tensor, n)
    misfits = np.where(dot(predicted, predicted) > 0, angle_deg(predicted, s), 90.0)
    misfits = misfits if senses_known else np.minimum(misfits, 180.0 - misfits)
    return SlipInversion(axes, float(ratio), misfits, senses_known)


def shear_design(n: Array) -> Array:
    """Return d(shear part of S n)/d(S11, S12, S13, S22, S23) with S33 = -S11 - S22, shape (N, 3, 5)."""
    x, y, z = n.T
    zero = np.zeros_like(x)
    traction = np.stack([
        np.stack([x, y, z, zero, zero], -1),
        np.stack([zero, x, zero, y, z], -1),
        np.stack([-z, zero, x, -z, y], -1),
    ], 1)  # fmt: skip
    return traction - n[:, :, None] * np.einsum("ni,nij->nj", n, traction)[:, None, :]


def _direction_design(n: Array, s: Array) -> Array:
    """Return rows for which a stress with its shear along each slip gives zero: (n x s).S n = 0, shape (N, 5)."""
    return np.einsum("ni,nij->nj", np.cross(n, s), shear_design(n))


def _tensor(components: Array) -> Array:
    a, b, c, d, e = components
    return np.array([[a, b, c], [b, d, e], [c, e, -a - d]])


def _rank(design: Array) -> int:
    singular = np.linalg.svd(design, compute_uv=False)
    return int((singular > RANK_TOLERANCE * singular.max(initial=0.0)).sum())


def _starts(n: Array, s: Array, w: Array, senses_known: bool) -> tuple[Array, Array]:
    """Return frames (K, 3, 3) and shape ratios (K,): both signs of the algebraic solution and the best of a coarse search."""
    algebraic = _tensor(np.linalg.svd(_direction_design(n, s) * np.sqrt(w)[:, None], full_matrices=True)[2][-1])
    axes, _, ratio = principal(np.stack([algebraic, -algebraic]))
    quaternions = np.random.default_rng(1984).normal(size=(240, 4))  # fixed, even over rotations
    half = np.arctan2(np.linalg.norm(quaternions[:, 1:], axis=1), quaternions[:, 0])
    scan = rotation_vectors_to_matrices(unit(quaternions[:, 1:]) * 2 * half[:, None])
    frames = np.repeat(scan, 3, axis=0)
    ratios = np.tile([0.2, 0.5, 0.8], len(scan))
    some = np.unique(np.linspace(0, len(n) - 1, min(len(n), SCANNED)).astype(int))
    costs = (w[some] * _residuals(frames, ratios, n[some], s[some], senses_known) ** 2).sum(-1)
    best = np.argsort(costs, kind="stable")[:STARTS]
    return np.concatenate([axes, frames[best]]), np.concatenate([np.clip(np.nan_to_num(ratio, nan=0.5), 0.05, 0.95), ratios[best]])


def _residuals(frames: Array, ratios: Array, n: Array, s: Array, senses_known: bool) -> Array:
    """Return the signed angles from measured to predicted slip about each normal, radians, shape (K, N)."""
    predicted = resolved_slip(reduced_tensor(frames, ratios)[:, None], n)
    along, across = dot(predicted, s), dot(predicted, np.cross(n, s))
    across = np.where(senses_known | (along >= 0), across, -across)
    angle = np.arctan2(across, along if senses_known else np.abs(along))
    return np.where((along == 0) & (across == 0), np.pi / 2, angle)  # no shear: as bad as it can be without a sense


def _refine(frames: Array, ratios: Array, n: Array, s: Array, w: Array, senses_known: bool) -> tuple[Array, Array, Array]:
    """Return frames, shape ratios and costs (K,) after damped Gauss-Newton steps; R = sin^2 of the fourth unknown keeps to [0, 1]."""
    fourth = np.arcsin(np.sqrt(ratios))
    damping = np.full(len(frames), 1e-3)

    def moved(step: Array) -> tuple[Array, Array]:
        return frames @ rotation_vectors_to_matrices(step[..., :3]), fourth + step[..., 3]

    def residuals(step: Array) -> Array:
        turned, angle = moved(step)
        return _residuals(turned, np.sin(angle) ** 2, n, s, senses_known)

    here = residuals(np.zeros((len(frames), 4)))
    cost = (w * here**2).sum(-1)
    for _ in range(100):
        step = _damped_step(_slopes(residuals, len(frames)), here, w, damping)
        there = residuals(step)
        better = (w * there**2).sum(-1) < cost
        step = np.where(better[:, None], step, 0.0)
        frames, fourth = moved(step)
        here = np.where(better[:, None], there, here)
        cost = (w * here**2).sum(-1)
        damping = np.clip(np.where(better, damping / 5, damping * 5), 1e-12, 1e9)
        if not better.any() and damping.min() > 1e3:
            break
    return frames, np.sin(fourth) ** 2, cost


def _damped_step(slope: Array, here: Array, w: Array, damping: Array) -> Array:
    """Return Levenberg-Marquardt steps (K, 4), none longer than half a radian, from slopes (K, N, 4) and residuals (K, N)."""
    normal = np.einsum("kni,n,knj->kij", slope, w, slope)
    downhill = -np.einsum("kni,n,kn->ki", slope, w, here)
    ridge = damping[:, None] * (np.einsum("kii->ki", normal) + 1e-12 * w.sum())
    step = np.linalg.solve(normal + ridge[:, :, None] * np.eye(4), downhill[..., None])[..., 0]
    return step * np.minimum(1.0, 0.5 / np.maximum(np.sqrt(dot(step, step)), 1e-300))[:, None]


def _slopes(residuals: Callable[[Array], Array], count: int) -> Array:
    """Return central differences of the residuals by the four unknowns, shape (K, N, 4)."""
    columns = []
    for unknown in range(4):
        step = np.zeros((count, 4))
        step[:, unknown] = 1e-6
        change = residuals(step) - residuals(-step)
        columns.append((change + np.pi) % (2 * np.pi) - np.pi)
    return np.stack(columns, -1) / 2e-6


def _check_data(normals: ArrayLike, slips: ArrayLike) -> tuple[Array, Array]:
    """Return unit normals (N, 3) and unit slips laid into their planes."""
    n, s = unit(check_vectors("normals", normals)), check_vectors("slips", slips)
    if n.ndim != 2 or n.shape != s.shape or not len(n):
        raise ArgumentError(f"slips: found shapes {n.shape} and {s.shape}; wanted (N, 3) twice", hint="give one slip for each plane")
    s = unit(s - dot(s, n)[:, None] * n)
    if not dot(s, s).all() or not dot(n, n).all():
        raise ArgumentError(
            "slips: found a slip with no part in its plane; wanted slips along the planes", hint="check the rake of each stria"
        )
    return n, s


def _check_weights(weights: ArrayLike | None, count: int) -> Array:
    w = np.ones(count) if weights is None else check_finite("weights", weights)
    if w.shape != (count,) or (w < 0).any() or not w.any():
        raise ArgumentError(
            f"weights: found shape {w.shape}; wanted {count} weights, none negative, not all zero", hint="leave them out for one each"
        )
    return w
