"""Measured slip on faults, striae and chosen nodal planes, as evidence: how well resolved shear points along each line."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import i0e

from structviz.orientation.vectors import dot

Floats = NDArray[np.float64]

OFF_PLANE_DEG = 15.0  # a line farther off the surface it is said to lie on is not used (common practice)
MOST_HEARD = 4.0  # striae of one fault repeat each other: together they count for no more than this many


@dataclass(frozen=True, eq=False)
class SlipLines:
    """Slip lines of F faults, padded to one shape; lines of no weight fill up."""

    normals: Floats  # (F, N, 3) unit normals of the planes they were measured on, hanging-wall side
    lines: Floats  # (F, N, 3) unit, in the plane; hanging-wall slip where signed
    signed: NDArray[np.bool_]  # (F, N) whether the sense along the line is known
    weights: Floats  # (F, N) 0 for padding

    def part(self, rows: slice | NDArray[np.int64]) -> SlipLines:
        """Return the lines of some of the faults."""
        return SlipLines(self.normals[rows], self.lines[rows], self.signed[rows], self.weights[rows])


def no_lines(faults: int) -> SlipLines:
    """Return the slip lines of faults on which nothing was measured."""
    return SlipLines(np.zeros((faults, 0, 3)), np.zeros((faults, 0, 3)), np.zeros((faults, 0), bool), np.zeros((faults, 0)))


def gather_lines(
    normals: Sequence[Floats], lines: Sequence[Floats], signed: Sequence[NDArray[np.bool_]], weights: Sequence[Floats]
) -> SlipLines:
    """Return lines given fault by fault, (N_f, 3) each, padded; their weights are cut so that no fault is heard too loudly."""
    count, most = len(normals), max((len(rows) for rows in normals), default=0)
    padded = SlipLines(np.zeros((count, most, 3)), np.zeros((count, most, 3)), np.zeros((count, most), bool), np.zeros((count, most)))
    for number, rows in enumerate(normals):
        n = len(rows)
        padded.normals[number, :n], padded.lines[number, :n], padded.signed[number, :n] = rows, lines[number], signed[number]
        heard = weights[number].sum()
        padded.weights[number, :n] = weights[number] * (min(1.0, MOST_HEARD / heard) if heard > 0 else 0.0)
    return padded


def slip_term(lines: SlipLines, frames: NDArray[Any], ratios: Floats, scatter_deg: float, wrong_share: float) -> NDArray[Any]:
    """Return the log-likelihood ratio of the lines of each fault against lines of any direction, shape (F, G, R).

    The angle between line and resolved shear follows a von Mises distribution of the given scatter, against the share of lines
    that tell of something else; that share bounds what one line can say. A line without sense is heard either way round.
    """
    total = np.zeros((len(lines.weights), len(frames), len(ratios)), frames.dtype)
    used = np.argwhere(lines.weights > 0)
    concentration = float(1 / np.radians(scatter_deg) ** 2)
    spread = float(i0e(concentration))
    for fault, number in used:
        n, u = lines.normals[fault, number].astype(frames.dtype), lines.lines[fault, number].astype(frames.dtype)
        n_on, u_on = frames @ n, frames[:, :2] @ u
        pull1, pull2 = -n_on[:, 0] * u_on[:, 0], -n_on[:, 1] * u_on[:, 1]
        for column, ratio in enumerate(ratios):
            r = float(ratio)
            pressure = n_on[:, 0] ** 2 + r * n_on[:, 1] ** 2
            shear = np.sqrt(np.maximum(n_on[:, 0] ** 2 + (r * n_on[:, 1]) ** 2 - pressure**2, 1e-12))
            cosine = np.clip((pull1 + r * pull2) / shear, -1, 1)
            along = np.exp(concentration * (cosine - 1))
            if not lines.signed[fault, number]:
                along = (along + np.exp(concentration * (-cosine - 1))) / 2
            ratio_to_any = (1 - wrong_share) * along / spread + wrong_share
            total[fault, :, column] += float(lines.weights[fault, number]) * np.log(ratio_to_any)
    return total


def off_plane_deg(lines: Floats, normals: Floats) -> Floats:
    """Return the angle between lines (N, 3) and the planes of normals (N, 3), degrees [0, 90]."""
    return np.degrees(np.arcsin(np.clip(np.abs(dot(lines, normals)), 0, 1)))
