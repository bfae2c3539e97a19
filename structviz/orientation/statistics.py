"""Means and spreads of axes, vectors and azimuths.

Planes and lines without direction are *axes*: they are averaged with the orientation tensor, for which v and -v are the same.
Slip and other directed lines are *vectors*: they are averaged as such, and never folded to the lower hemisphere first.
Where a mean or a measure does not exist the answer is None or NaN as stated, never a number by accident.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from structviz._validate import check_finite, check_vectors
from structviz.errors import ArgumentError
from structviz.orientation.vectors import Array, dot, unit

# Eigenvalues of an orientation tensor (they add to 1) nearer than this are equal, and their axes arbitrary.
EQUAL = 1e-9
CHI2_95_2 = 5.991464547107979  # -2 ln 0.05, the 95 % point of chi-square with two degrees of freedom


@dataclass(frozen=True, eq=False)
class Fabric:
    """Orientation tensor of axes, taken apart."""

    axes: Array  # (3, 3) unit rows, right-handed, densest direction first
    eigenvalues: Array  # (3,) descending, adding to 1
    shape: float | None  # Woodcock's K, 0 girdle to large cluster; None where the axes are too even or too perfect to say
    strength: float | None  # Woodcock's C = ln(S1/S3), 0 uniform; None where S3 = 0 (all axes in one plane)
    mean_defined: bool  # False where S1 = S2, so that there is no mean axis
    pole_defined: bool  # False where S2 = S3, so that there is no girdle pole


@dataclass(frozen=True, eq=False)
class FisherMean:
    """Mean of directed unit vectors and its spread."""

    mean: Array  # (3,) unit; zero where the vectors cancel
    count: int
    resultant: float  # length of the vector sum, 0 to count
    kappa: float | None  # concentration (N - 1)/(N - R); None for one vector or where all agree
    alpha95_deg: float | None  # half-angle of the 95 % cone about the mean; 180 where the mean could be anywhere; None for one vector
    angular_deviation_deg: float | None  # 81/sqrt(kappa); None where kappa is


def orientation_tensor(axes: ArrayLike, weights: ArrayLike | None = None) -> Array:
    """Return sum(w v v^T)/sum(w) of unit axes (..., N, 3), shape (..., 3, 3), trace 1; weights (..., N) default to one each.

    >>> orientation_tensor([[1, 0, 0], [0, 1, 0]]).diagonal()
    array([0.5, 0.5, 0. ])
    """
    v = unit(check_vectors("axes", axes))
    w = _check_weights(weights, v.shape[:-1])
    return np.swapaxes(v * w[..., None], -1, -2) @ v / w.sum(-1)[..., None, None]


def fabric(axes: ArrayLike, weights: ArrayLike | None = None) -> Fabric:
    """Return the principal axes, eigenvalues and Woodcock measures of axes (N, 3) with weights (N,) [woodcock1977].

    Notes
    -----
    K = ln(S1/S2)/ln(S2/S3), C = ln(S1/S3), S1 >= S2 >= S3. K has no value for a uniform fabric (0/0) nor where S2 = S3 with
    S1 larger (a perfect cluster) or S3 = 0.

    >>> found = fabric([[1, 0, 0], [0, 1, 0], [0, 0, 1]])
    >>> found.mean_defined, found.shape, round(found.strength, 9)
    (False, None, 0.0)
    """
    ascending, columns = np.linalg.eigh(orientation_tensor(axes, weights))
    values = np.clip(ascending[::-1], 0.0, 1.0)
    rows = columns.T[::-1].copy()
    rows[2] = np.cross(rows[0], rows[1])
    flat, round_ = values[2] < EQUAL, values[1] - values[2] < EQUAL
    strength = None if flat else float(np.log(values[0] / values[2]))
    shape = None if flat or round_ else float(np.log(values[0] / values[1]) / np.log(values[1] / values[2]))
    return Fabric(rows, values, shape, strength, bool(values[0] - values[1] >= EQUAL), not round_)


def axial_mean(axes: ArrayLike, weights: ArrayLike | None = None) -> Array:
    """Return the mean of undirected axes (..., N, 3) as unit axes on the lower hemisphere, shape (..., 3); NaN where S1 = S2.

    The mean is the axis of the greatest eigenvalue of the orientation tensor.

    >>> axial_mean([[0, 0, 1], [0, 0, -1]])
    array([ 0.,  0., -1.])
    """
    values, columns = np.linalg.eigh(orientation_tensor(axes, weights))
    mean = columns[..., :, 2]
    mean = np.where(mean[..., 2:] > 0, -mean, mean) + 0.0
    return np.where((values[..., 2] - values[..., 1] < EQUAL)[..., None], np.nan, mean)


def axial_cone_deg(axes: ArrayLike, weights: ArrayLike | None = None) -> float | None:
    """Return the half-angle of a 95 % cone about the axial mean of axes (N, 3), degrees to 90; None for fewer than three.

    Notes
    -----
    Large-sample theory of the principal axis: across it, towards e_j, the variance is mean((v.e1)^2 (v.ej)^2)/(n (S1 - Sj)^2);
    the wider of the two directions gives the cone [fisher1987]. With weights, n is (sum w)^2/sum(w^2). 90 where S1 = S2.
    """
    v = unit(check_vectors("axes", axes))
    if len(v) < 3:
        return None
    w = _check_weights(weights, v.shape[:-1])
    values, columns = np.linalg.eigh(orientation_tensor(v, w))
    along, across = v @ columns[:, 2], v @ columns[:, :2]
    gap = values[2] - values[:2]
    if gap[1] < EQUAL:
        return 90.0
    count = w.sum() ** 2 / (w**2).sum()
    variance = (w / w.sum()) @ (along[:, None] ** 2 * across**2) / (count * gap**2)
    return float(np.degrees(min(np.sqrt(CHI2_95_2 * variance.max()), np.pi / 2)))


def fisher_mean(vectors: ArrayLike) -> FisherMean:
    """Return the mean of directed vectors (N, 3) with concentration, exact 95 % cone and angular deviation [fisher1953].

    Notes
    -----
    k = (N - 1)/(N - R); cos(alpha95) = 1 - (N - R)/R (20^(1/(N - 1)) - 1). The common 140/sqrt(kN) is too small for few data.
    """
    v = unit(check_vectors("vectors", vectors))
    if v.ndim != 2 or not len(v):
        raise ArgumentError(f"vectors: found shape {v.shape}; wanted (N, 3) with N of 1 or more", hint="give the directions as rows")
    total = v.sum(0)
    count, resultant = len(v), float(np.sqrt(dot(total, total)))
    mean = total / resultant if resultant > 1e-12 * count else np.zeros(3)
    kappa = fisher_kappa(count, resultant)
    spread = None if kappa is None else 81.0 / float(np.sqrt(kappa))
    return FisherMean(mean, count, resultant, kappa, alpha95_deg(count, resultant), spread)


def fisher_kappa(count: int, resultant: float) -> float | None:
    """Return (N - 1)/(N - R), the concentration for a resultant length R of N vectors; None for one, or where all agree [fisher1953]."""
    lack = count - resultant
    return None if count < 2 or lack < 1e-12 * count else (count - 1) / lack


def alpha95_deg(count: int, resultant: float) -> float | None:
    """Return the exact half-angle of the 95 % cone about a Fisher mean, degrees; None for one vector, 180 where nothing is known.

    >>> round(alpha95_deg(5, 4.9), 6)
    12.244856
    """
    if count < 2:
        return None
    if resultant <= 1e-12 * count:
        return 180.0
    cosine = 1.0 - max(count - resultant, 0.0) / resultant * (20.0 ** (1.0 / (count - 1)) - 1.0)
    return float(np.degrees(np.arccos(max(cosine, -1.0))))


def mean_resultant(kappa: ArrayLike) -> Array:
    """Return the expected mean resultant length coth(kappa) - 1/kappa of a Fisher distribution, 0 to 1, shape (...) [fisher1953]."""
    k = check_finite("kappa", kappa)
    small = np.abs(k) < 1e-3  # the two terms cancel there: series instead
    safe = np.where(small, 1.0, k)
    return np.where(small, k / 3.0 - k**3 / 45.0, 1.0 / np.tanh(safe) - 1.0 / safe)


def likely_kappa(resultant_share: float) -> float | None:
    """Return the maximum-likelihood concentration for a mean resultant length R/N in [0, 1); None at 1.

    It solves coth(k) - 1/k = R/N by bisection and is somewhat larger than (N - 1)/(N - R), which corrects for N [mardia2000].
    """
    share = float(check_finite("resultant_share", resultant_share))
    if not 0.0 <= share <= 1.0:
        raise ArgumentError(f"resultant_share: found {share:g}; wanted 0 to 1", hint="divide the resultant length by the number of vectors")
    if share > 1.0 - 1e-12:
        return None
    low, high = 0.0, 1.0 / (1.0 - share) + 3.0 * share
    for _ in range(80):
        middle = (low + high) / 2
        low, high = (middle, high) if mean_resultant(middle) < share else (low, middle)
    return (low + high) / 2


def spherical_median(vectors: ArrayLike, weights: ArrayLike | None = None) -> Array:
    """Return the unit vector (3,) with the least sum of angles to directed vectors (N, 3); zero where they cancel [fisher1987].

    Weiszfeld's iteration along great circles from the vector mean, until it moves less than 1e-12 radians.
    """
    v = unit(check_vectors("vectors", vectors))
    w = _check_weights(weights, v.shape[:-1])
    total = w @ v
    median = unit(total) if dot(total, total) > 1e-24 * w.sum() ** 2 else np.zeros(3)
    if not median.any():
        return median
    for _ in range(2000):
        tangent = v - (v @ median)[:, None] * median
        sine = np.sqrt(dot(tangent, tangent))
        angle = np.arctan2(sine, v @ median)
        near = np.maximum(angle, 1e-12)  # a datum under the median pulls finitely
        step = (w @ np.divide(tangent, sine[:, None], out=np.zeros_like(v), where=sine[:, None] > 1e-15)) / (w / near).sum()
        length = float(np.sqrt(dot(step, step)))
        if length < 1e-12:
            break
        median = unit(np.cos(length) * median + np.sin(length) * step / length)
    return median


def circular_mean_deg(azimuths_deg: ArrayLike, weights: ArrayLike | None = None) -> tuple[float, float]:
    """Return the mean of directed azimuths (N,), degrees [0, 360), and the mean resultant length 0 to 1; NaN where they cancel.

    >>> mean, length = circular_mean_deg([350.0, 20.0])
    >>> round(mean, 9), round(length, 6)
    (5.0, 0.965926)
    """
    return _circular(azimuths_deg, weights, 1.0)


def axial_mean_azimuth_deg(azimuths_deg: ArrayLike, weights: ArrayLike | None = None) -> tuple[float, float]:
    """Return the mean of undirected azimuths (N,), degrees [0, 180), and the resultant of doubled angles; NaN if they cancel [mardia2000].

    >>> mean, length = axial_mean_azimuth_deg([10.0, 200.0])
    >>> round(mean, 9), round(length, 6)
    (15.0, 0.984808)
    """
    return _circular(azimuths_deg, weights, 2.0)


def _circular(azimuths_deg: ArrayLike, weights: ArrayLike | None, times: float) -> tuple[float, float]:
    azimuth = np.radians(check_finite("azimuths_deg", azimuths_deg)) * times
    w = _check_weights(weights, azimuth.shape)
    total = complex((w * np.exp(1j * azimuth)).sum() / w.sum())
    period = 360.0 / times
    mean = float(np.degrees(np.angle(total)) / times % period)
    return (np.nan if abs(total) < 1e-12 else 0.0 if mean >= period else mean), abs(total)


def _check_weights(weights: ArrayLike | None, shape: tuple[int, ...]) -> Array:
    """Return weights of that shape, not negative, each set with a positive sum."""
    w = np.ones(shape) if weights is None else np.broadcast_to(check_finite("weights", weights), shape)
    if not shape or not shape[-1]:
        raise ArgumentError("axes: found none; wanted one or more to average", hint="check what was selected")
    if (w < 0).any() or not (w.sum(-1) > 0).all():
        raise ArgumentError("weights: found negative or all-zero weights; wanted a positive sum", hint="areas or counts make good weights")
    return w
