"""Laws of the field of axes, and a slow second way to the same numbers."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.vectors import axial_angle_deg, rotation
from structviz.stress.classify import shmax_deg
from structviz.stress.evidence import EvidenceModel, FaultEvidence, gather
from structviz.stress.field import LocalData, choose_bandwidth, field_summary, kernel, local_data, smoothed, stress_field
from structviz.surfaces.measure import measure
from structviz.synthetic.turning import KnownTurning, turning_model


def evidence_of(known: KnownTurning, turn: np.ndarray | None = None) -> FaultEvidence:
    normals = [measure(fault.surface).normal for fault in known.model.faults]
    count = len(normals)
    found = gather(
        [n[None] for n in normals], [np.ones(1)] * count, [f.declared for f in known.model.faults], np.ones(count), np.ones(count)
    )
    if turn is None:
        return found
    return FaultEvidence(found.normals @ turn.T, found.shares, found.edges @ turn.T, found.partnered, found.geometry_known, found.slips)


@pytest.fixture(scope="module")
def known() -> KnownTurning:
    return turning_model(60.0, 60, random_state=11)


@pytest.fixture(scope="module")
def data(known: KnownTurning) -> LocalData:
    return local_data(evidence_of(known), known.places, known.middle_axes, EvidenceModel())


def test_a_stress_that_turns_is_followed(known: KnownTurning, data: LocalData) -> None:
    chosen = choose_bandwidth(data)
    assert np.isfinite(chosen.radius_m)
    field = stress_field(data, known.places, chosen.radius_m)
    off = np.abs((field.shmax_deg - shmax_deg(known.axes_at(known.places), 0.5) + 90) % 180 - 90)
    assert np.median(off[field.supported]) < 8.0
    summary = field_summary(data, chosen)
    assert summary is not None
    assert 35.0 < summary.turn_deg < 80.0


def test_one_stress_is_found_uniform() -> None:
    known = turning_model(0.0, 60, random_state=12)
    data = local_data(evidence_of(known), known.places, known.middle_axes, EvidenceModel())
    chosen = choose_bandwidth(data)
    assert np.isinf(chosen.radius_m)
    assert field_summary(data, chosen) is None


def test_the_field_moves_with_the_model(known: KnownTurning, data: LocalData) -> None:
    shift = np.array([1e5, -2e5, 300.0])
    moved = LocalData(data.places + shift, data.frames, data.ratios, data.logs)
    here, there = stress_field(data, known.places, 5000.0), stress_field(moved, known.places + shift, 5000.0)
    np.testing.assert_array_equal(here.supported, there.supported)
    assert axial_angle_deg(here.axes[here.supported], there.axes[here.supported]).max() < 1e-3


def test_the_field_turns_with_the_model(known: KnownTurning, data: LocalData) -> None:
    turn = rotation([0.0, 0.0, 1.0], 37.0)
    places = known.places @ turn.T
    turned = local_data(evidence_of(known, turn), places, known.middle_axes @ turn.T, EvidenceModel())
    here, there = stress_field(data, known.places, 5000.0), stress_field(turned, places, 5000.0)
    assert axial_angle_deg((here.axes @ turn.T)[here.supported], there.axes[here.supported]).max() < 0.5


def test_far_from_every_fault_the_field_is_blank(known: KnownTurning, data: LocalData) -> None:
    field = stress_field(data, known.places[:1] + np.array([[1e6, 0, 0]]), 5000.0)
    assert not field.supported[0]
    assert np.isnan(field.axes).all()
    assert field.count[0] == 0


def test_the_plain_sum_over_faults_gives_the_same(known: KnownTurning, data: LocalData) -> None:
    point, radius = known.places[5], 6000.0
    total = np.zeros(data.logs.shape[1])
    for place, row in zip(data.places, data.logs, strict=True):
        away = np.linalg.norm(point - place)
        if away <= 2 * radius:
            total += np.exp(-(away**2) / (2 * radius**2)) * row.astype(float)
    share = np.exp(total - total.max()).reshape(len(data.frames), -1).sum(1)
    mean = sum(p * (np.outer(f[0], f[0]) + 0.5 * np.outer(f[1], f[1])) for p, f in zip(share / share.sum(), data.frames, strict=True))
    sigma1 = np.linalg.eigh(mean)[1][:, -1]
    assert axial_angle_deg(smoothed(data, point[None], radius)[0][0, 0], sigma1) < 1e-2


def test_what_smoothing_holds_back_is_given_again(known: KnownTurning, data: LocalData) -> None:
    """Of a stress that turns evenly, the field follows more of the turn than the mean over neighbours does."""
    radius = 9000.0
    plain = shmax_deg(smoothed(data, known.places, radius)[0], 0.5)
    field, truth = stress_field(data, known.places, radius).shmax_deg, shmax_deg(known.axes_at(known.places), 0.5)
    off = [np.abs((azimuth - truth + 90) % 180 - 90) for azimuth in (field, plain)]
    assert np.nanquantile(off[0], 0.95) < 0.8 * np.nanquantile(off[1], 0.95)


def test_the_kernel_falls_with_distance_and_ends() -> None:
    weights = kernel(np.zeros((1, 3)), np.array([[0.0, 0, 0], [1, 0, 0], [1.99, 0, 0], [2.01, 0, 0]]), 1.0)[0]
    np.testing.assert_allclose(weights, [1.0, np.exp(-0.5), np.exp(-(1.99**2) / 2), 0.0])


def test_places_must_match_the_faults(known: KnownTurning) -> None:
    with pytest.raises(ArgumentError, match="wanted 60 finite places"):
        local_data(evidence_of(known), known.places[:3], known.middle_axes, EvidenceModel())
