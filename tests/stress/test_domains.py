"""Domains by place: none in a uniform model, two where two stresses lie side by side."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.vectors import axial_angle_deg, rotation
from structviz.stress.domains import find_domains
from structviz.stress.evidence import EvidenceModel, gather
from structviz.stress.field import LocalData, local_data
from structviz.surfaces.measure import measure
from structviz.synthetic.turning import KnownTurning, turning_model


def data_of(known: KnownTurning) -> LocalData:
    normals = [measure(fault.surface).normal for fault in known.model.faults]
    count = len(normals)
    sectors = [fault.declared for fault in known.model.faults]
    evidence = gather([n[None] for n in normals], [np.ones(1)] * count, sectors, np.ones(count), np.ones(count))
    return local_data(evidence, known.places, known.middle_axes, EvidenceModel())


@pytest.mark.parametrize("state", [21, 22])
def test_a_uniform_model_is_one_domain(state: int) -> None:
    found = find_domains(data_of(turning_model(0.0, 40, random_state=state)))
    assert found.count == 1
    assert "one stress" in found.why


def test_two_stresses_side_by_side_are_two_domains() -> None:
    known = turning_model(0.0, 24, random_state=23)
    turn = rotation([0.0, 0.0, 1.0], 60.0)
    west = data_of(known)
    normals = [measure(fault.surface).normal for fault in known.model.faults]
    sectors = [fault.declared for fault in known.model.faults]
    evidence = gather([n[None] for n in normals], [np.ones(1)] * 24, sectors, np.ones(24), np.ones(24))
    east = local_data(evidence, known.places, known.middle_axes, EvidenceModel())
    turned = local_data(
        type(evidence)(
            evidence.normals @ turn.T,
            evidence.shares,
            evidence.edges @ turn.T,
            evidence.partnered,
            evidence.geometry_known,
            evidence.slips,
        ),
        known.places + np.array([40_000.0, 0, 0]),
        known.middle_axes,
        EvidenceModel(),
    )
    both = LocalData(np.concatenate([west.places, turned.places]), east.frames, east.ratios, np.concatenate([west.logs, turned.logs]))
    found = find_domains(both)
    assert found.count == 2
    assert len(set(found.membership[:24])) == len(set(found.membership[24:])) == 1
    truth = np.stack([known.middle_axes, known.middle_axes @ turn.T])[[found.membership[0], found.membership[24]]]
    assert axial_angle_deg(found.frames, truth).max() < 20.0


def test_at_least_one_domain_is_asked_for() -> None:
    with pytest.raises(ArgumentError, match="wanted 1 or more"):
        find_domains(data_of(turning_model(0.0, 8, random_state=24)), most=0)
