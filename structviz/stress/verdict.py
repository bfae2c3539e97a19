"""The verdict on each fault by the stress inferred from the others.

A bootstrap over faults leaves each fault out of about one replicate in e; those replicates are a bootstrap of the other
faults, so leaving one out costs nothing more [efron1992].
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import Sector, describe_rake
from structviz.orientation.planes import strike_vectors
from structviz.stress.replicates import Posterior
from structviz.stress.tensor import reduced_tensor, slip_tendency

Floats = NDArray[np.float64]

MOST_REPLICATES = 64  # for one fault; more change the probability by less than its meaning
FEWEST_REPLICATES = 10
SHARPENING = 1.8  # of the odds of predicted slips; from other synthetic models than tests/benchmarks/calibration.py is run on by default
LOOSE_RAKE_DEG = 75.0  # a prediction spread wider than this is none


@dataclass(frozen=True)
class Cause:
    """One possible explanation of a misfit, with its probability among all of them, and what to do next (see `causes`)."""

    key: str
    text: str
    score: float
    next_step: str = ""


@dataclass(frozen=True)
class Verdict:
    """What the stress of the other faults says of one fault."""

    word: str  # "consistent" | "conflicting" | "undetermined"
    conflict_probability: float | None  # None where nothing was declared or nothing could be predicted
    misfit_deg: float | None  # angle from declared to predicted slip, median
    predicted_rake_deg: float | None
    predicted_rake_spread_deg: float | None
    slip_tendency: float | None  # shear over normal stress, as a share of the greatest, 0 to 1
    reasons: tuple[str, ...] = ()
    causes: tuple[Cause, ...] = ()


@dataclass(frozen=True)
class VerdictLimits:
    """Where the words begin."""

    conflicting_from: float = 0.9  # probability that the slip is outside the declared sector
    consistent_to: float = 0.2
    margin_deg: float = 10.0  # words have no sharp edge: slip this little beyond it is no conflict, and may be consistent
    least_shear: float = 0.15  # in shares of the greatest; below it the direction of slip is anybody's guess


@dataclass(frozen=True, eq=False)
class Prediction:
    """Slip predicted on the stations of one fault, over replicates and shape ratios."""

    rakes_deg: Floats  # (N,)
    shear: Floats  # (N,) in shares of the greatest
    weights: Floats  # (N,) sum 1
    ratio_of: NDArray[np.int64]  # (N,) column of the shape ratio

    def share(self, values: NDArray) -> float:
        """Return the weighted sum of values (N,). Not a BLAS product: on vectors this short its threads cost more than they save."""
        return float(np.einsum("n,n->", self.weights, values.astype(float)))


def predict(frames: Floats, ratios: Floats, ratio_grid: Floats, normals: Floats, shares: Floats) -> Prediction:
    """Return the slip predicted on facets (S, 3) of area shares (S,) by frames (B, 3, 3) with shape-ratio weights (B, R)."""
    along = strike_vectors(normals)
    upward = np.cross(normals, along)
    n1, n2 = normals @ frames[:, 0].T, normals @ frames[:, 1].T
    pulls = []
    for direction in (along, upward):
        p1, p2 = -n1 * (direction @ frames[:, 0].T), -n2 * (direction @ frames[:, 1].T)
        pulls.append(p1[..., None] + p2[..., None] * ratio_grid)
    rakes = np.degrees(np.arctan2(pulls[1], pulls[0]))
    weights = shares[:, None, None] * ratios[None] / len(frames)
    column = np.broadcast_to(np.arange(len(ratio_grid)), rakes.shape)
    return Prediction(rakes.ravel(), 2 * np.hypot(*pulls).ravel(), weights.ravel() / weights.sum(), column.ravel())


def off_sector_deg(rakes_deg: Floats, sector: Sector) -> Floats:
    """Return the angle between rakes and the centre of a sector, degrees [0, 180]."""
    return np.abs((rakes_deg - sector.rake_deg + 180.0) % 360.0 - 180.0)


def share_inside(prediction: Prediction, sector: Sector) -> float:
    """Return the probability that the predicted slip lies in a sector."""
    return prediction.share(off_sector_deg(prediction.rakes_deg, sector) <= sector.half_width_deg)


def weighted_quantile(values: Floats, weights: Floats, q: float) -> float:
    """Return the value below which a share q of the weight lies."""
    order = np.argsort(values, kind="stable")
    steps = np.cumsum(weights[order])
    return float(values[order][min(np.searchsorted(steps, q * steps[-1]), len(values) - 1)])


def mean_rake_deg(prediction: Prediction) -> tuple[float, float]:
    """Return the mean predicted rake, degrees (-180, 180], and the half-width that holds 90 % of the predictions."""
    angle = np.radians(prediction.rakes_deg)
    up, along = prediction.share(prediction.shear * np.sin(angle)), prediction.share(prediction.shear * np.cos(angle))
    mean = float(np.degrees(np.arctan2(up, along)))
    off = np.abs((prediction.rakes_deg - mean + 180.0) % 360.0 - 180.0)
    return mean, weighted_quantile(off, prediction.weights, 0.9)


def replicates_without(posterior: Posterior, fault: int) -> tuple[Floats, Floats]:
    """Return the frames and shape-ratio weights of the replicates in which a fault was not drawn."""
    rows = np.flatnonzero(posterior.counts[:, fault] == 0)[:MOST_REPLICATES]
    return posterior.frames[rows], posterior.ratios[rows]


def judge(
    posterior: Posterior, fault: int, normals: Floats, shares: Floats, sector: Sector | None, why_no_sector: str, limits: VerdictLimits
) -> tuple[Verdict, Prediction | None]:
    """Return the verdict on one fault given by its facets, and the prediction it rests on."""
    frames, ratios = replicates_without(posterior, fault)
    if len(frames) < FEWEST_REPLICATES:
        return undetermined("too few other faults to predict its slip from"), None
    prediction = predict(frames, ratios, posterior.ratio_grid, normals, shares)
    rake, spread = mean_rake_deg(prediction)
    mean_ratio = float(ratios.mean(0) @ posterior.ratio_grid)
    tendency = float(shares @ slip_tendency(reduced_tensor(frames[:20], mean_ratio)[:, None], normals[None]).mean(0) / shares.sum())
    shown = (rake, spread, tendency)
    predicted = f"the other faults predict {describe_rake(rake)} slip (rake {rake:.0f} +/- {spread:.0f})"
    if spread > LOOSE_RAKE_DEG:
        predicted = f"the other faults leave its slip open (rake {rake:.0f} +/- {spread:.0f})"
    if sector is None:
        return Verdict("undetermined", None, None, *shown, (why_no_sector or "no movement is declared", predicted)), prediction
    off = off_sector_deg(prediction.rakes_deg, sector)
    outside = off > sector.half_width_deg
    probability, misfit = calibrated(prediction.share(outside)), weighted_quantile(off, prediction.weights, 0.5)
    clearly = calibrated(prediction.share(off > sector.half_width_deg + limits.margin_deg))
    word, reason = _word(prediction, outside, probability, clearly, misfit, spread, sector, limits)
    return Verdict(word, probability, misfit, *shown, (reason, predicted) if reason else (predicted,)), prediction


def calibrated(share: float) -> float:
    """Return the probability that a fault slips outside a sector, from the share of its predicted slips that do [platt1999].

    The predictions spread more widely than the slip of a whole fault does: they cover every R the data leave open, and every
    local orientation, of which a fault follows the mean. SHARPENING is the one number that makes them true on synthetic models.
    """
    odds = (min(max(share, 0.0), 1.0)) ** SHARPENING
    return odds / (odds + (1.0 - min(max(share, 0.0), 1.0)) ** SHARPENING)


def undetermined(reason: str) -> Verdict:
    """Return the verdict on a fault of which nothing can be predicted."""
    return Verdict("undetermined", None, None, None, None, None, (reason,))


def _word(
    prediction: Prediction,
    outside: NDArray[np.bool_],
    probability: float,
    clearly: float,
    misfit: float,
    spread: float,
    sector: Sector,
    limits: VerdictLimits,
) -> tuple[str, str]:
    """Return the verdict and its reason, from the probabilities of slip outside the sector and clearly (by the margin) outside it."""
    shear = weighted_quantile(prediction.shear, prediction.weights, 0.5)
    beyond = misfit - sector.half_width_deg
    if shear < limits.least_shear:
        return "undetermined", f"too little shear to say which way it slips ({100 * shear:.0f} % of the greatest)"
    if probability >= limits.conflicting_from and beyond >= limits.margin_deg:
        return "conflicting", f"declared {sector.text}, {misfit:.0f} deg from the predicted slip"
    if clearly <= limits.consistent_to and probability < limits.conflicting_from:
        return "consistent", ""
    return "undetermined", _why_open(_by_ratio(prediction, outside), probability, beyond, spread, limits)


def _why_open(by_ratio: Floats, probability: float, beyond: float, spread: float, limits: VerdictLimits) -> str:
    low, high = 100 * by_ratio.min(), 100 * by_ratio.max()
    if probability >= limits.conflicting_from:
        return f"the predicted slip lies only {beyond:.0f} deg outside the declared sector"
    if low < 30 and high > 70:
        return f"R decides: {low:.0f} to {high:.0f} % of slips conflict as R goes over its range"
    if spread > LOOSE_RAKE_DEG:
        return "the stress of the other faults is too loose to predict its slip"
    return f"the slip is near the edge of the declared sector ({100 * probability:.0f} % outside it)"


def _by_ratio(prediction: Prediction, outside: NDArray[np.bool_]) -> Floats:
    held = np.bincount(prediction.ratio_of, prediction.weights)
    wrong = np.bincount(prediction.ratio_of, prediction.weights * outside)
    return wrong[held > 0] / held[held > 0]
