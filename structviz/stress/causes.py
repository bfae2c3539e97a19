"""Why a declared movement does not fit: the possible causes of one fault's misfit, as probabilities.

Each cause says two things: what slip it would have made the fault declare, and where it puts the true plane. The score of a cause is
its prior belief times the probability of the declared word times the density of the true plane (`evidence.geometry_term`), over the
sum of all causes and of "none of these", so scores add up to one at most.

What symmetry forbids to tell:

- A surface that dips the other way (mirrored across its strike, or depth read as elevation) is turned by 180 degrees about the
  vertical. Where a principal axis is vertical the stress is the same after that turn and so is the rake: nothing in plane and word
  shows it. Only leaning axes, striae, the side that went down, or horizons do.
- A movement under exchanged sigma1 and sigma3 is the opposite movement: an obtuse or inverted fault and a swapped label differ in
  where the plane stands, not in its slip.
- A swapped label on an inherited plane and one fault of an older phase look alike, unless other faults share that phase or the
  declared slip is at a high angle to the predicted one.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import Sector
from structviz.orientation.vectors import dot
from structviz.stress.evidence import EvidenceModel, gather, geometry_term
from structviz.stress.replicates import Posterior
from structviz.stress.verdict import (
    Cause,
    Prediction,
    Verdict,
    VerdictLimits,
    off_sector_deg,
    predict,
    replicates_without,
    weighted_quantile,
)

Floats = NDArray[np.float64]

LEAST_SCORE = 0.1  # a less likely cause is not told
NONE_BELIEF = 0.04  # of anything else
EDGE_FIT = 0.1  # how readily a word is written for a slip at the very edge of its sector, against one in its middle
OBLIQUE_DEG = 15.0  # scatter of a slip, written down by its lesser component, beyond the edge of the sector
ALIKE = 0.6  # a cause this near the first in score cannot be told from it
NOISE_DEG = 18.0  # local orientations scattered more than this about the mean make noise more likely than not
LOW_SHEAR = 1.3  # times the least shear that is judged: to there the direction of slip is still doubtful
UNFLAGGED = 0.35  # belief in a mistake where no conflict is claimed, against belief in it where one is
MISTAKES = ("label_swapped", "mirrored", "dips_other_way", "older_phase", "obtuse_pair")


@dataclass(frozen=True, eq=False)
class Case:
    """All that is known of one fault when its causes are weighed."""

    frames: Floats  # (B, 3, 3) of the replicates without this fault
    ratios: Floats  # (B, R)
    ratio_grid: Floats  # (R,)
    odds: EvidenceModel
    normals: Floats  # (S, 3) local orientations, hanging-wall side
    shares: Floats  # (S,) sum 1
    sector: Sector
    prediction: Prediction
    limits: VerdictLimits
    others: tuple[Posterior, ...] = ()  # stresses of other phases
    conflicting: bool = True


def graded_fit(rakes_deg: Floats, sector: Sector) -> Floats:
    """Return how readily a sector is declared for slips of the rakes given, 0 to 1.

    One in the inner half of the sector is declared so for sure, one near its edge seldom: the other word is the greater component.
    """
    off, half = off_sector_deg(rakes_deg, sector), sector.half_width_deg
    inside = 1.0 - (1.0 - EDGE_FIT) * np.clip((off - half / 2) / (half / 2), 0.0, 1.0)
    return np.where(off <= half, inside, 0.0)


def by_chance(sector: Sector) -> float:
    """Return the probability that a slip of any direction is declared so: a quarter for one word, an eighth for two."""
    return sector.half_width_deg / 360.0


def standing(normals: Floats, shares: Floats, frames: Floats, odds: EvidenceModel) -> float:
    """Return the density of the mean plane among those a stress makes and those it inherits, as a ratio to all orientations alike.

    The mean of a rough surface says little: its ratio is drawn towards one.
    """
    mean = shares @ normals
    evidence = gather([mean[None] / max(float(np.sqrt(dot(mean, mean))), 1e-12)], [np.ones(1)], [None], np.ones(1), np.ones(1, bool))
    rough = roughness(normals, shares)
    return rough + (1 - rough) * float(np.exp(geometry_term(evidence, frames, odds)).mean())


def mirrored(normals: Floats, signs: Sequence[float]) -> Floats:
    """Return the normals of a surface mirrored by signs on easting, northing, up, still on the hanging-wall side."""
    return _upward(normals * np.asarray(signs, float), normals)


def exchanged(normals: Floats) -> Floats:
    """Return the normals of a surface whose easting and northing were exchanged, on the hanging-wall side."""
    return _upward(normals[:, [1, 0, 2]], normals)


def _upward(flipped: Floats, drawn: Floats) -> Floats:
    up = flipped[:, 2].sum()
    return flipped if up > 0 or (up == 0 and dot(flipped, drawn).sum() >= 0) else -flipped


def _drawn(case: Case) -> float:
    return standing(case.normals, case.shares, case.frames, case.odds)


def _label_swapped(case: Case) -> float:
    return _drawn(case) * case.prediction.share(graded_fit(case.prediction.rakes_deg, case.sector.opposite()))


def _on_other(case: Case, normals: Floats) -> float:
    """Return the likelihood that the true surface is another one, correctly labelled."""
    there = predict(case.frames, case.ratios, case.ratio_grid, normals, case.shares)
    return standing(normals, case.shares, case.frames, case.odds) * there.share(graded_fit(there.rakes_deg, case.sector))


def _dips_other_way(case: Case) -> float:
    return _on_other(case, mirrored(case.normals, (-1.0, -1.0, 1.0)))


def _mirrored(case: Case) -> float:
    return (_on_other(case, mirrored(case.normals, (-1.0, 1.0, 1.0))) + _on_other(case, exchanged(case.normals))) / 2


def _older_phase(case: Case) -> float:
    """The stresses of other phases where they are known, else any stress at all: any plane, any slip."""
    found = by_chance(case.sector)
    for other in case.others:
        frames, ratios = other.frames[:64], other.ratios[:64]
        there = predict(frames, ratios, other.ratio_grid, case.normals, case.shares)
        fit = there.share(graded_fit(there.rakes_deg, case.sector))
        found = max(found, standing(case.normals, case.shares, frames, other.odds) * fit)
    return found


def _obtuse_pair(case: Case) -> float:
    """Exchanged extremes with R as 1 - R turn the shear about; the plane must then stand at the obtuse angle."""
    odds = replace(case.odds, obtuse_share=1.0, new_fault_share=0.95)
    there = predict(case.frames[:, [2, 1, 0]], case.ratios[:, ::-1], 1 - case.ratio_grid[::-1], case.normals, case.shares)
    return standing(case.normals, case.shares, case.frames, odds) * there.share(graded_fit(there.rakes_deg, case.sector))


def _oblique_boundary(case: Case) -> float:
    """The slip lies near the edge of the sector, on either side of it."""
    beyond = off_sector_deg(case.prediction.rakes_deg, case.sector) - case.sector.half_width_deg
    return _drawn(case) * case.prediction.share(np.exp(-0.5 * (beyond / OBLIQUE_DEG) ** 2))


def scatter_deg(normals: Floats, shares: Floats) -> float:
    """Return the root mean square angle between local orientations and their mean, degrees."""
    mean = shares @ normals
    cosine = np.clip(normals @ mean / max(float(np.sqrt(dot(mean, mean))), 1e-12), -1.0, 1.0)
    return float(np.degrees(np.sqrt(shares @ np.arccos(cosine) ** 2)))


def roughness(normals: Floats, shares: Floats) -> float:
    """Return how surely local orientations scatter more than those of an ordinary surface, 0 to 1."""
    return float(1 / (1 + np.exp(-(scatter_deg(normals, shares) - NOISE_DEG) / 2)))


def _orientation_noise(case: Case) -> float:
    """The surface is rough, and the declared word fits on some of its local planes."""
    rough = roughness(case.normals, case.shares)
    rakes = case.prediction.rakes_deg.reshape(len(case.shares), -1)
    weights = case.prediction.weights.reshape(rakes.shape)
    inside = (weights * (off_sector_deg(rakes, case.sector) <= case.sector.half_width_deg)).sum(1) / weights.sum(1)
    fits = float(case.shares @ (inside > 0.5))
    return _drawn(case) * rough * min(1.0, 4 * fits)


def _too_little_shear(case: Case) -> float:
    shear = weighted_quantile(case.prediction.shear, case.prediction.weights, 0.5)
    return float(_drawn(case) / (1 + (shear / max(LOW_SHEAR * case.limits.least_shear, 1e-9)) ** 6))


def _shape_ratio_open(case: Case) -> float:
    """R turns the slip in and out of the sector."""
    outside = off_sector_deg(case.prediction.rakes_deg, case.sector) > case.sector.half_width_deg
    held = np.bincount(case.prediction.ratio_of, case.prediction.weights)
    wrong = np.bincount(case.prediction.ratio_of, case.prediction.weights * outside)
    each = (wrong / np.maximum(held, 1e-300))[held > 1e-3 * held.max()]
    return _drawn(case) * float(max(0.0, each.max() - each.min() - 0.4) / 0.6)


@dataclass(frozen=True)
class CauseRow:
    """One row of the table of causes."""

    key: str
    belief: float  # before the evidence
    text: str  # may name {opposite}, the declaration reversed
    next_step: str
    likelihood: Callable[[Case], float]


CAUSES: tuple[CauseRow, ...] = (
    CauseRow(
        "label_swapped",
        0.35,
        "the label may be swapped: as {opposite} it would fit",
        "go back to the section or field note the sense came from: which side went down, which way the markers are offset",
        _label_swapped,
    ),
    CauseRow(
        "mirrored",
        0.20,
        "the surface may be mirrored in plan (easting reversed, or easting and northing exchanged)",
        "lay the surface over the mapped trace: does it strike as the trace does; then look at the axes of the export",
        _mirrored,
    ),
    CauseRow(
        "dips_other_way",
        0.10,
        "the surface may dip the other way (mirrored across its strike, or depth read as elevation)",
        "check the dip on a section or in a well that cuts the fault, and whether z is elevation or depth in the export",
        _dips_other_way,
    ),
    CauseRow(
        "older_phase",
        0.28,
        "the fault may have moved in an older phase, under another stress",
        "look for what dates it: which horizons it cuts, which faults cut it or stop at it, growth strata, overprinted striae",
        _older_phase,
    ),
    CauseRow(
        "obtuse_pair",
        0.10,
        "the fault stands at the obtuse angle of a pair: rotated blocks or a plane reused with the extremes of stress exchanged",
        "look for rotated bedding between the faults, or for inversion: reverse slip on old normal faults or the other way about",
        _obtuse_pair,
    ),
    CauseRow(
        "oblique_boundary",
        0.60,
        "the slip may be oblique, and the declared word its lesser component",
        "look for striae, or a piercing point that gives both components, and declare two words or a rake",
        _oblique_boundary,
    ),
    CauseRow(
        "orientation_noise",
        0.90,
        "the orientation is too uncertain: the surface is rough or bent, and the declared sense fits on part of it only",
        "smooth or re-pick the surface, or split it where its strike changes, and test the sense where it was observed",
        _orientation_noise,
    ),
    CauseRow(
        "too_little_shear",
        1.00,
        "the plane carries little shear in this stress, so that its direction of slip is open",
        "leave this fault out of the argument; if it moved for certain, look for an older phase or a local stress",
        _too_little_shear,
    ),
    CauseRow(
        "shape_ratio_open",
        0.25,
        "the shape ratio R, which the data leave open, decides which way it slips",
        "measure striae on this fault or on oblique faults nearby: they tell R",
        _shape_ratio_open,
    ),
)


def scores(case: Case) -> dict[str, float]:
    """Return the probability of every cause by key; what they lack of one is that of none of these."""
    doubt = 1.0 if case.conflicting else UNFLAGGED
    weight = {row.key: row.belief * row.likelihood(case) * (doubt if row.key in MISTAKES else 1.0) for row in CAUSES}
    total = sum(weight.values()) + NONE_BELIEF * by_chance(case.sector)
    return {key: value / total for key, value in weight.items()}


def causes_of(
    verdict: Verdict,
    posterior: Posterior,
    fault: int,
    prediction: Prediction,
    normals: Floats,
    shares: Floats,
    sector: Sector,
    limits: VerdictLimits | None = None,
    other_phases: Sequence[Posterior] = (),
) -> tuple[Cause, ...]:
    """Return the likely causes of a conflicting or undetermined verdict, best first; none for a consistent one.

    normals are local orientations (S, 3) of area shares (S,); scores add up to one at most. A cause that cannot be told from the first
    by the evidence says so in its text.
    """
    if verdict.word == "consistent":
        return ()
    frames, ratios = replicates_without(posterior, fault)
    part = shares / shares.sum()
    case = Case(
        frames,
        ratios,
        posterior.ratio_grid,
        posterior.odds,
        normals,
        part,
        sector,
        prediction,
        limits or VerdictLimits(),
        tuple(other_phases),
        verdict.word == "conflicting",
    )
    return ranked(scores(case), sector)


def ranked(found: dict[str, float], sector: Sector) -> tuple[Cause, ...]:
    """Return scores by key as causes in words, best first, the unlikely ones left out."""
    rows = sorted((row for row in CAUSES if found[row.key] >= LEAST_SCORE), key=lambda row: -found[row.key])
    best = found[rows[0].key] if rows else 0.0
    told = []
    for place, row in enumerate(rows):
        tied = place > 0 and found[row.key] >= ALIKE * best
        text = row.text.format(opposite=sector.opposite().text) + ("; the evidence hardly tells it from the first" if tied else "")
        told.append(Cause(row.key, text, found[row.key], row.next_step))
    return tuple(told)
