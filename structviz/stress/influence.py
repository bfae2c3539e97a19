"""What carries a stress: how far it turns without each fault and each pair."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.classify import shmax_deg
from structviz.stress.conjugate import Pairs
from structviz.stress.replicates import Posterior
from structviz.stress.tensor import frame_angle_deg

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Influence:
    """What the stress owes to each fault; rows follow the faults of the posterior."""

    turn_deg: Floats  # (F, 3) of each axis without the fault; 0 for faults that were never drawn, those of other phases
    shmax_turn_deg: Floats  # (F,) of the azimuth of the greatest horizontal compression, clockwise positive
    support_nats: Floats  # (F,) log-likelihood of the fault under the estimate against a fault that says nothing: below 0 it pulls away

    @property
    def strongest(self) -> int:
        """The fault without which the axes turn most."""
        return int(self.turn_deg.max(1).argmax())


def influence(posterior: Posterior) -> Influence:
    """Return the influence of each fault: the mean stress of the replicates in which it was not drawn, against that of all [efron1992].

    It costs nothing beyond the replicates. A mean over a third of them is off by a tenth of a cone or so, and less is not told.
    """
    tensors = _tensors(posterior.frames)
    drawn = posterior.counts > 0
    absent = (~drawn).astype(float)
    lacking = absent.sum(0)
    usable = (lacking > 0) & drawn.any(0)
    without = np.einsum("bf,bij->fij", absent[:, usable], tensors) / lacking[usable, None, None]
    everywhere = _axes(tensors.mean(0)[None])[0]
    turn, azimuth = np.zeros((len(usable), 3)), np.zeros(len(usable))
    axes = _axes(without)
    turn[usable] = axial_angle_deg(axes, everywhere[None])
    azimuth[usable] = (shmax_deg(axes, 0.5) - float(shmax_deg(everywhere[None], 0.5)[0]) + 90.0) % 180.0 - 90.0
    return Influence(turn, azimuth, posterior.fault_terms)


def pair_influence_deg(pairs: Pairs, axes: Floats) -> Floats:
    """Return how far each pair draws the mean of all pairs, (P,): its share of the weight times its angle to axes (3, 3), degrees."""
    if not len(pairs):
        return np.zeros(0)
    return np.asarray(pairs.weight / max(pairs.weight.sum(), 1e-300) * frame_angle_deg(pairs.axes, axes[None]))


def _tensors(frames: Floats) -> Floats:
    return np.einsum("bi,bj->bij", frames[:, 0], frames[:, 0]) - np.einsum("bi,bj->bij", frames[:, 2], frames[:, 2])


def _axes(tensors: Floats) -> Floats:
    axes = np.swapaxes(np.linalg.eigh(tensors)[1], -1, -2)[:, ::-1].copy()
    axes[:, 2] = np.cross(axes[:, 0], axes[:, 1])
    return axes
