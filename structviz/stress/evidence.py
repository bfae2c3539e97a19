"""What one fault says about a stress: log-likelihoods of frames of axes and shape ratios, one row a fault.

The geometry term asks whether the plane stands where a new fault would, at the acute (or, less likely, the obtuse) angle to
sigma1, against the chance that it was inherited at any orientation. The sense term asks whether the resolved shear points
into the declared sector, against the chance that the label is wrong. Both are bounded, so that no single fault can carry
the answer, and faults add up: leaving one out is a subtraction, a bootstrap over faults is a product of counts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import RAKE_OF_WORD, Sector
from structviz.orientation.planes import slip_vectors
from structviz.stress.slip_lines import SlipLines, no_lines

Floats = NDArray[np.float64]

RAKE_HALF_SPACE_DEG = 55.0  # a declared rake is the overlap of two half-spaces turned this far either way


@dataclass(frozen=True)
class EvidenceModel:
    """The odds of the likelihood. What a model cannot be asked in advance (scatter, obtuse share, wrong labels) is chosen by its
    own marginal likelihood from the short tables in `joint`; the rest is stated here."""

    friction_angle_deg: float = 30.0
    plane_scatter_deg: float = 7.5  # scatter of new faults about their ideal orientation
    new_fault_share: float = 0.7  # of faults that have an admissible partner, the share thought to be new
    obtuse_share: float = 0.1  # of those, the share at the obtuse angle
    wrong_label_share: float = 0.2
    shear_softness: float = 0.5  # in shares of the greatest shear: how blurred the edge of a sector is
    line_scatter_deg: float = 15.0  # of measured slip about the resolved shear
    wrong_line_share: float = 0.25  # of slip lines that tell of something else; a third is still outvoted
    obtuse_scatter: float = 1.5  # scatter at the obtuse angle, in units of plane_scatter_deg


@dataclass(frozen=True, eq=False)
class FaultEvidence:
    """The orientations and declarations of F faults, each by M facets (one for a flat fault, several for a curved one)."""

    normals: Floats  # (F, M, 3) unit, hanging-wall side
    shares: Floats  # (F, M) of the fault's area, sum 1
    edges: Floats  # (F, M, 2, 3) unit in-plane directions towards which the slip must point; zero where not declared
    partnered: Floats  # (F,) 0 to 1, how good a conjugate partner the fault has
    geometry_known: NDArray[np.bool_]  # (F,) False where a mean plane says nothing
    slips: SlipLines  # measured slip lines of each fault

    def __len__(self) -> int:
        return len(self.normals)

    @property
    def declared(self) -> NDArray[np.bool_]:
        """Whether a movement is declared, (F,)."""
        return np.abs(self.edges).sum((1, 2, 3)) > 0

    @property
    def measured(self) -> NDArray[np.bool_]:
        """Whether slip was measured, (F,)."""
        return self.slips.weights.sum(1) > 0

    def part(self, rows: slice | NDArray[np.int64]) -> FaultEvidence:
        """Return the evidence of some of the faults."""
        return FaultEvidence(
            self.normals[rows], self.shares[rows], self.edges[rows], self.partnered[rows], self.geometry_known[rows], self.slips.part(rows)
        )


def sector_edges(normals: Floats, sector: Sector | None) -> Floats:
    """Return the in-plane directions whose half-spaces make up a declared sector, shape (M, 2, 3); zeros pad or mean no declaration.

    One word is one half-space, two words are two, a rake is the overlap of two half-spaces turned to either side of it.
    """
    edges = np.zeros((len(normals), 2, 3))
    if sector is None:
        return edges
    if sector.words:
        rakes = [RAKE_OF_WORD[word] for word in sector.words]
    else:
        rakes = [sector.rake_deg - RAKE_HALF_SPACE_DEG, sector.rake_deg + RAKE_HALF_SPACE_DEG]
    for place, rake in enumerate(rakes):
        edges[:, place] = slip_vectors(normals, rake)
    return edges


def gather(
    normals: Sequence[Floats],
    shares: Sequence[Floats],
    sectors: Sequence[Sector | None],
    partnered: Floats,
    geometry_known: NDArray[np.bool_],
    slips: SlipLines | None = None,
) -> FaultEvidence:
    """Return the evidence of faults given by their facets, padded to one shape with facets of no weight."""
    most = max((len(rows) for rows in normals), default=1)
    count = len(normals)
    padded, weight, edges = np.zeros((count, most, 3)), np.zeros((count, most)), np.zeros((count, most, 2, 3))
    for number, (rows, share, sector) in enumerate(zip(normals, shares, sectors, strict=True)):
        padded[number, : len(rows)] = rows
        weight[number, : len(rows)] = share / share.sum()
        edges[number, : len(rows)] = sector_edges(rows, sector)
    known = np.asarray(geometry_known, bool)
    return FaultEvidence(padded, weight, edges, np.asarray(partnered, float), known, slips or no_lines(count))


def geometry_term(evidence: FaultEvidence, frames: NDArray[Any], odds: EvidenceModel) -> Floats:
    """Return the log-likelihood ratio of each fault's orientation against an inherited one, shape (F, G), for frames (G, 3, 3)."""
    inner = np.radians(90.0 - odds.friction_angle_deg) / 2
    normals = evidence.normals.astype(frames.dtype)
    across1 = np.abs(normals @ frames[:, 0].T)
    across3 = np.abs(normals @ frames[:, 2].T)
    acute = _cap(float(np.sin(inner)) * across1 + float(np.cos(inner)) * across3, odds.plane_scatter_deg)
    obtuse = _cap(float(np.cos(inner)) * across1 + float(np.sin(inner)) * across3, odds.plane_scatter_deg * odds.obtuse_scatter)
    new = (odds.new_fault_share * evidence.partnered * evidence.geometry_known)[:, None, None].astype(frames.dtype)
    ratio = 1 - new + new * ((1 - odds.obtuse_share) * acute + odds.obtuse_share * obtuse)
    return np.einsum("fm,fmg->fg", evidence.shares.astype(frames.dtype), np.log(ratio))


def _cap(cosine: NDArray[Any], scatter_deg: float) -> Floats:
    """Return the density of a plane near one of two ideal ones, as a ratio to all orientations being alike (Fisher [fisher1953])."""
    concentration = float(1 / np.radians(scatter_deg) ** 2)
    return concentration / 2 * np.exp(concentration * (np.minimum(cosine, 1.0) - 1))


def sense_term(evidence: FaultEvidence, frames: NDArray[Any], shape_ratios: Floats, odds: EvidenceModel) -> Floats:
    """Return the log-likelihood of each fault's declared movement, shape (F, G, R), zero where nothing was declared.

    With d in the plane the resolved shear of the reduced tensor (1, R, 0) on it is -(n1 d1 + R n2 d2), components on the axes:
    no square root and no tensor is needed. A fault under little shear pulls little, whichever way it points. The work is done
    in the precision of the frames: single is enough for the survey of all of them, and three times as fast.
    """
    total = np.zeros((len(evidence), len(frames), len(shape_ratios)), frames.dtype)
    used = np.flatnonzero(evidence.declared)
    if used.size == 0:
        return total
    n, d, share = (values[used].astype(frames.dtype) for values in (evidence.normals, evidence.edges, evidence.shares))
    first = n @ frames[:, 0].T, n @ frames[:, 1].T
    for edge in range(d.shape[2]):
        active = (np.abs(d[:, :, edge]).sum(-1) > 0)[..., None]
        if not active.any():
            continue
        pull1 = -first[0] * (d[:, :, edge] @ frames[:, 0].T)
        pull2 = -first[1] * (d[:, :, edge] @ frames[:, 1].T)
        for column, ratio in enumerate(shape_ratios):
            towards = 2 * (pull1 + float(ratio) * pull2)  # the greatest shear of (1, R, 0) is one half
            right = odds.wrong_label_share + (1 - 2 * odds.wrong_label_share) / (1 + np.exp(-towards / odds.shear_softness))
            total[used, :, column] += np.einsum("fm,fmg->fg", share, np.log(right) if active.all() else np.where(active, np.log(right), 0))
    return total
