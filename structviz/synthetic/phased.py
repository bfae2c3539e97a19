"""Fault models that moved in several phases, each under a stress of its own, with the phase of every fault known."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.model import Fault, FaultModel
from structviz.orientation.vectors import rotation
from structviz.synthetic.models import CORNER, Known, declaration, random_model

Floats = NDArray[np.float64]

HORIZONTAL_MAX = {"normal": 1, "strike-slip": 0, "reverse": 0}  # row of the axis that is the greatest horizontal stress


@dataclass(frozen=True, eq=False)
class KnownPhases:
    """A model of several phases and the truth about it; rows follow model.faults."""

    model: FaultModel  # declares no phase
    axes: Floats  # (K, 3, 3) unit rows sigma1, sigma2, sigma3 of each phase
    shape_ratios: Floats  # (K,)
    phase_of: NDArray[np.int64]  # (F,) the phase in which each fault moved
    flipped: tuple[str, ...]  # faults that declare the opposite of what they did
    true_rakes_deg: Floats  # (F,) hanging-wall slip, (-180, 180]
    kinds: tuple[str, ...]  # "conjugate" | "inherited"
    normals: Floats  # (F, 3) unit normals of the mean planes, hanging-wall side

    def declaring(self, names: Sequence[str]) -> FaultModel:
        """Return the model with the true phase of every fault declared by name, one name a phase."""
        faults = (replace(fault, phase=names[k]) for fault, k in zip(self.model.faults, self.phase_of, strict=True))
        return replace(self.model, faults=tuple(faults))


def phased_model(
    regimes: Sequence[str],
    turns_deg: Sequence[float],
    *,
    faults: Sequence[int] = (18, 12),
    conjugate_share: float = 2 / 3,
    planted: Sequence[int] = (0, 0),
    triangles: int = 300,
    random_state: int,
    **choices: float,
) -> KnownPhases:
    """Return a random model whose faults moved in phases, mixed in one box, and the truth about it.

    Parameters
    ----------
    regimes : "normal", "strike-slip" or "reverse" for each phase, oldest or youngest first as you like: nothing depends on age.
    turns_deg : azimuth of the greatest horizontal stress of each phase, clockwise from that of the first, which is random.
    faults : how many moved in each phase; the share `conjugate_share` of them, rounded, broke anew in it, the others were there.
    planted : wrong labels in each phase.
    choices : further keywords of `random_model`, the same for all phases.
    random_state : the same number gives the same model.
    """
    count = len(regimes)
    if not count or any(len(given) != count for given in (turns_deg, faults, planted)):
        raise ArgumentError(
            f"turns_deg, faults, planted: found {len(turns_deg)}, {len(faults)}, {len(planted)} values; wanted {count}, as many as regimes",
            hint="give one value for each phase",
        )
    seeds = np.random.default_rng(random_state).integers(0, 2**31, count + 1)
    made = [
        random_model(
            regime,
            faults=n,
            conjugate=round(n * conjugate_share),
            planted=wrong,
            triangles=triangles,
            random_state=int(seed),
            **choices,  # type: ignore[arg-type]
        )
        for regime, n, wrong, seed in zip(regimes, faults, planted, seeds, strict=False)
    ]
    first = _azimuth_deg(made[0], regimes[0])
    turned = [
        _turned(known, first + turn - _azimuth_deg(known, regime)) for known, regime, turn in zip(made, regimes, turns_deg, strict=True)
    ]
    return _mixed(turned, np.random.default_rng(seeds[-1]).permutation(sum(faults)), random_state)


def _azimuth_deg(known: Known, regime: str) -> float:
    axis = known.axes[HORIZONTAL_MAX[regime]]
    return float(np.degrees(np.arctan2(axis[0], axis[1])))


def _turned(known: Known, clockwise_deg: float) -> Known:
    """Return a model and its truth turned about the vertical through the corner of its box; its labels are given anew."""
    turn = rotation([0.0, 0.0, 1.0], -clockwise_deg)
    pivot = np.array([*CORNER, 0.0])
    normals = known.normals @ turn.T
    rows = []
    for fault, normal, rake in zip(known.model.faults, normals, known.true_rakes_deg, strict=True):
        sector, side = declaration(normal, float(rake), wrong=fault.name in known.flipped)
        surface = replace(fault.surface, vertices=(fault.surface.vertices - pivot) @ turn.T + pivot)
        rows.append(replace(fault, surface=surface, declared=sector, down_side=side))
    return replace(known, model=replace(known.model, faults=tuple(rows)), axes=known.axes @ turn.T, normals=normals)


def _mixed(parts: Sequence[Known], order: NDArray[np.int64], number: int) -> KnownPhases:
    """Return the faults of all parts in a new order under new names, brought back into one box."""
    phase_of = np.repeat(np.arange(len(parts)), [len(part.model.faults) for part in parts])[order]
    together: list[tuple[Fault, bool, str]] = []
    for part in parts:
        shift = _to_middle(part)
        for fault, kind in zip(part.model.faults, part.kinds, strict=True):
            moved = replace(fault, surface=replace(fault.surface, vertices=fault.surface.vertices + shift))
            together.append((moved, fault.name in part.flipped, kind))
    digits = len(str(len(order)))
    names = [f"F{place + 1:0{digits}d}" for place in range(len(order))]
    rows = [together[i] for i in order]
    faults = tuple(
        replace(fault, name=name, surface=replace(fault.surface, name=name)) for name, (fault, _, _) in zip(names, rows, strict=True)
    )
    return KnownPhases(
        FaultModel(f"random model of {len(parts)} phases {number}", faults),
        np.stack([part.axes for part in parts]),
        np.array([part.shape_ratio for part in parts]),
        phase_of,
        tuple(name for name, (_, wrong, _) in zip(names, rows, strict=True) if wrong),
        np.concatenate([part.true_rakes_deg for part in parts])[order],
        tuple(kind for _, _, kind in rows),
        np.concatenate([part.normals for part in parts])[order],
    )


def _to_middle(part: Known) -> Floats:
    """Return the horizontal shift that brings the mean place of a part's faults to the corner of the box."""
    middle = np.mean([fault.surface.vertices.mean(0) for fault in part.model.faults], axis=0)
    return np.array([*(np.array(CORNER) - middle[:2]), 0.0])
