"""How the stress changes with place: whether it does, by how much, and in which parts of the model it is another."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.stress.domains import Domains, find_domains
from structviz.stress.evidence import FaultEvidence
from structviz.stress.field import Bandwidth, FieldSummary, LocalData, choose_bandwidth, field_summary, local_data
from structviz.stress.replicates import Posterior

Floats = NDArray[np.float64]

FEWEST_FAULTS = 12  # of fewer, where each lies tells nothing


@dataclass(frozen=True, eq=False)
class ByPlace:
    """How the stress changes with place; rows follow the faults."""

    data: LocalData  # what each fault says, and where
    bandwidth: Bandwidth  # infinite where one stress serves the whole model
    turn: FieldSummary | None  # by how much it turns; None where it does not
    domains: Domains | None  # parts of the model with a stress of their own, where it turns


def by_place(evidence: FaultEvidence, places: Floats, single: Posterior) -> ByPlace | None:
    """Return how the stress of faults at places (F, 3), m, changes about their single one; None where that is loose or faults are few."""
    if single.loose or len(places) < FEWEST_FAULTS:
        return None
    data = local_data(evidence, places, single.frame, single.odds)
    chosen = choose_bandwidth(data)
    return ByPlace(data, chosen, field_summary(data, chosen), find_domains(data) if np.isfinite(chosen.radius_m) else None)


def in_order(place: ByPlace, rows: NDArray[np.int64]) -> ByPlace:
    """Return the same with its faults in another order: row i of the new one is row rows[i] of the old."""
    data = replace(place.data, places=place.data.places[rows], logs=place.data.logs[rows])
    domains = replace(place.domains, membership=place.domains.membership[rows]) if place.domains else None
    return replace(place, data=data, domains=domains)
