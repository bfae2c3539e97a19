"""Earthquake mechanisms as evidence beside the faults: one row each, with the slip on its chosen plane and nothing else."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite
from structviz.stress.evidence import FaultEvidence
from structviz.stress.mechanism_inversion import MechanismInversion
from structviz.stress.mechanisms import normals_and_slips
from structviz.stress.slip_lines import SlipLines


def evidence_of_mechanisms(found: MechanismInversion, weights: ArrayLike | None = None) -> FaultEvidence:
    """Return one row of evidence for each earthquake, (N,): a signed slip line on its chosen plane, and no geometry.

    The plane of an earthquake is not a fault that was mapped, so it is not asked for a conjugate partner. Weights above one
    count as one: no earthquake is heard louder than a stria. A wrongly chosen plane falls under the share of wrong lines.
    """
    events = np.arange(len(found.chosen))
    n, s = normals_and_slips(*found.planes_deg[events, found.chosen].T)
    w = np.ones(len(events)) if weights is None else np.minimum(check_finite("weights", weights), 1.0)
    lines = SlipLines(n[:, None], s[:, None], np.ones((len(events), 1), bool), w[:, None])
    nothing = np.zeros((len(events), 1, 2, 3))
    return FaultEvidence(n[:, None], np.ones((len(events), 1)), nothing, np.zeros(len(events)), np.zeros(len(events), bool), lines)


def joined(first: FaultEvidence, second: FaultEvidence) -> FaultEvidence:
    """Return the rows of two evidences one after the other; the one with fewer facets or lines is filled up with such of no weight."""
    a, b = first.slips, second.slips
    lines = SlipLines(
        _stacked(a.normals, b.normals), _stacked(a.lines, b.lines), _stacked(a.signed, b.signed), _stacked(a.weights, b.weights)
    )
    return FaultEvidence(
        _stacked(first.normals, second.normals),
        _stacked(first.shares, second.shares),
        _stacked(first.edges, second.edges),
        np.concatenate([first.partnered, second.partnered]),
        np.concatenate([first.geometry_known, second.geometry_known]),
        lines,
    )


def _stacked(first: NDArray[Any], second: NDArray[Any]) -> NDArray[Any]:
    """Return arrays (F, M, ...) and (G, L, ...) as one, (F + G, max(M, L), ...), filled up with zeros."""
    most = max(first.shape[1], second.shape[1])
    parts = [np.pad(part, [(0, 0), (0, most - part.shape[1])] + [(0, 0)] * (part.ndim - 2)) for part in (first, second)]
    return np.concatenate(parts)
