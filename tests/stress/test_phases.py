"""Phases: the number found, their axes and members, what is declared of them, and the verdicts that follow."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.errors import ArgumentError
from structviz.kinematics.declared import usable_sector
from structviz.orientation.vectors import axial_angle_deg, rotation
from structviz.stress.evidence import EvidenceModel, FaultEvidence, gather, geometry_term
from structviz.stress.fabric import on_one_plane
from structviz.stress.phases import find_phases, opposed_phases, phase_texts
from structviz.surfaces.measure import measure
from structviz.synthetic import phased_model, random_model

UNTURNED = np.eye(3)
QUICK = Settings(replicates=200)


@pytest.fixture(scope="module")
def known():
    return phased_model(("normal", "strike-slip"), (0.0, 60.0), triangles=60, random_state=11)


def evidence_of(model, turn=UNTURNED) -> FaultEvidence:
    measured = [measure(fault.surface) for fault in model.faults]
    sectors = [usable_sector(f.declared, f.down_side, m.normal, m.dip_deg)[0] for f, m in zip(model.faults, measured)]
    count = len(measured)
    found = gather([m.normal[None] for m in measured], [np.ones(1)] * count, sectors, np.ones(count), np.ones(count, bool))
    return FaultEvidence(found.normals @ turn.T, found.shares, found.edges @ turn.T, found.partnered, found.geometry_known, found.slips)


def phases_of(evidence, names=None):
    return find_phases(evidence, EvidenceModel(), declared_phases=names or [""] * len(evidence))


def best_order(frames, axes):
    return min(itertools.permutations(range(len(axes))), key=lambda o: axial_angle_deg(frames[list(o)], axes).max(1).sum())


def test_two_phases_are_found_with_their_axes_and_members(known):
    found = phases_of(evidence_of(known.model))
    assert found.count == 2
    order = list(best_order(found.frames, known.axes))
    assert axial_angle_deg(found.frames[order], known.axes).max() < 10.0
    right = found.membership[:, order].argmax(1) == known.phase_of
    assert right[~found.ambiguous()].mean() >= 0.9
    np.testing.assert_allclose(found.membership.sum(1), 1.0)


@pytest.mark.parametrize("regime", ["normal", "strike-slip", "reverse"])
def test_one_phase_stays_one(regime):
    assert phases_of(evidence_of(random_model(regime, faults=11, conjugate=7, planted=2, triangles=60, random_state=4).model)).count == 1
    assert phases_of(evidence_of(random_model(regime, planted=6, triangles=60, random_state=3).model)).count == 1


def test_a_fabric_is_no_phase():
    """Eight inherited planes of one fabric look like the new faults of another stress, but stand on one of its planes only."""
    models = [random_model("normal", planted=2, triangles=60, fabric_deg=8.0, random_state=state).model for state in range(4)]
    assert [phases_of(evidence_of(model)).count for model in models] == [1, 1, 1, 1]


def test_turning_the_model_turns_the_phases(known):
    turn = rotation([0.3, -0.5, 0.8], 50.0)
    first, second = phases_of(evidence_of(known.model)), phases_of(evidence_of(known.model, turn))
    assert second.count == first.count
    assert axial_angle_deg(second.frames, first.frames @ turn.T).max() < 3.0


def test_reordering_the_faults_reorders_the_memberships(known):
    evidence = evidence_of(known.model)
    order = np.random.default_rng(0).permutation(len(evidence))
    first, second = phases_of(evidence), phases_of(evidence.part(order))
    np.testing.assert_allclose(second.membership, first.membership[order], atol=1e-3)


def test_a_declared_phase_that_the_data_contradict_is_told(known):
    names = [f"P{k}" for k in known.phase_of]
    clear = phases_of(evidence_of(known.model), names)
    stray = int(np.flatnonzero(~clear.ambiguous(4.0) & (known.phase_of == 0))[0])
    names[stray] = "P1"
    told = phases_of(evidence_of(known.model), names).contradictions
    assert [(each.fault, each.declared) for each in told if each.fault == stray] == [(stray, "P1")]


def test_names_must_be_as_many_as_faults(known):
    with pytest.raises(ArgumentError, match=r"found 1 names for 30 faults.*wanted a name \(or an empty one\) for each"):
        find_phases(evidence_of(known.model), EvidenceModel(), declared_phases=["a"])


def test_each_fault_is_told_its_phase(known):
    evidence = evidence_of(known.model)
    found = phases_of(evidence)
    texts = phase_texts(found, evidence, ("the old one", "the young one"))
    opposed, best = opposed_phases(found, evidence), found.belongs
    own = np.take_along_axis(opposed, best[:, None], 1)[:, 0]
    other = np.take_along_axis(opposed, 1 - best[:, None], 1)[:, 0]
    crossed = other & ~own
    assert crossed.any(), "some faults must move against one phase only"
    names = np.array(["the old one", "the young one"])
    for fault in np.flatnonzero(crossed):
        share = found.membership[fault, best[fault]]
        wanted = f"conflicts with {names[1 - best[fault]]} but fits {names[best[fault]]}, probability {share:.2f}"
        assert texts[fault] == wanted
    assert all("but fits" not in text for text, is_crossed in zip(texts, crossed) if not is_crossed)
    order = np.random.default_rng(1).permutation(len(evidence))
    assert phase_texts(phases_of(evidence.part(order)), evidence.part(order)) == tuple(np.array(phase_texts(found, evidence))[order])


def test_opposed_is_the_side_the_resolved_shear_points_away_from(known):
    """The plain way: resolve the traction of the reduced tensor on the plane and look at where it points."""
    evidence = evidence_of(known.model)
    found = phases_of(evidence)
    opposed = opposed_phases(found, evidence)
    for (frame, ratio), column in zip(zip(found.frames, found.ratios), opposed.T):
        tensor = frame.T @ np.diag([1.0, ratio, 0.0]) @ frame
        for normal, edges, against in zip(evidence.normals[:, 0], evidence.edges[:, 0], column):
            used = [edge for edge in edges if np.abs(edge).sum() > 0]
            if len(used) == 1:
                assert against == (-(tensor @ normal) @ used[0] < 0)


def test_one_phase_or_a_fault_that_says_nothing_has_no_text(known):
    evidence = evidence_of(known.model)
    assert set(phase_texts(find_phases(evidence, EvidenceModel(), declared_phases=[""] * len(evidence), most=1), evidence)) == {""}
    with pytest.raises(ArgumentError, match="found 30 faults and 1 names; wanted the 30 faults and 2 names"):
        phase_texts(phases_of(evidence), evidence, ("only one",))


def planes_about(axes, signs):
    odds = EvidenceModel()
    inner = np.radians(90.0 - odds.friction_angle_deg) / 2
    normals = np.array([np.sin(inner) * axes[0] + sign * np.cos(inner) * axes[2] for sign in signs])
    count = len(normals)
    return gather(list(normals[:, None]), [np.ones(1)] * count, [None] * count, np.ones(count), np.ones(count, bool))


def test_parallel_planes_stand_on_one_plane_and_conjugate_ones_on_both():
    axes, odds = rotation([1.0, 2.0, 0.5], 70.0), EvidenceModel()
    frames = np.stack([axes, axes])
    member = np.tile([1.0, 0.0], (6, 1))
    assert on_one_plane(planes_about(axes, [1] * 6), member, frames, odds).tolist() == [True, True]
    assert on_one_plane(planes_about(axes, [1, 1, 1, -1, -1, 1]), member, frames, odds).tolist() == [False, True]
    assert geometry_term(planes_about(axes, [1, -1]), axes[None], odds).min() > 1.0, "the planes are those of new faults"


def test_faults_are_judged_by_the_stress_of_their_own_phase(known):
    analysis = run(known.model, QUICK)
    assert [regime.faults for regime in analysis.regimes] == [sum(r.phase == k for r in analysis.faults) for k in (0, 1)]
    assert sum(regime.weight for regime in analysis.regimes) == pytest.approx(1.0)
    assert not analysis.conflicting
    told = [result for result in analysis.faults if any("conflicts with phase" in reason for reason in result.verdict.reasons)]
    assert told, "faults of the smaller phase contradict the larger one and say so"
    assert all("fits phase" in " ".join(result.verdict.reasons) for result in told)
    one = run(random_model("normal", planted=0, triangles=60, random_state=3).model, QUICK)
    assert len(one.regimes) == 1
    assert all(result.membership == () for result in one.faults)


def test_declared_names_stand_at_the_regimes(known):
    analysis = run(known.declaring(["old", "young"]), QUICK)
    assert {regime.name for regime in analysis.regimes} == {"old", "young"}
    for result in analysis.faults:
        assert analysis.regimes[result.phase].name == result.fault.phase
