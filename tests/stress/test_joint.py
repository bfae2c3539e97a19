"""The joint stress: found from labels and planes, linear in faults, true to a slow bootstrap."""

import numpy as np
import pytest

from structviz.orientation.vectors import axial_angle_deg, rotation
from structviz.stress.evidence import EvidenceModel
from structviz.stress.frames import all_frames, ball, turned
from structviz.stress.joint import COARSE_RATIOS, FINE_RATIOS, Terms, infer, log_likelihood, survey
from structviz.stress.readings import regime_of_frames, shape_ratio_of
from structviz.stress.replicates import Posterior, bootstrap_counts, cones_deg, estimates
from tests.stress.planes import conjugate_normals, evidence_of, labels_of


def solve(normal_vectors, words, terms=None, replicates=100):
    counts = bootstrap_counts(len(normal_vectors), replicates, 0)
    return infer(evidence_of(normal_vectors, words), EvidenceModel(), terms or Terms(), counts)


def worst_deg(frame, axes):
    return axial_angle_deg(frame, axes).max()


def test_joint_finds_the_stress_and_resists_a_third_of_wrong_labels(strike_slip_axes):
    planes = conjugate_normals(strike_slip_axes, 18, 5.0, np.random.default_rng(3))
    words = labels_of(strike_slip_axes, 0.5, planes)
    swapped = [{"dextral": "sinistral", "sinistral": "dextral"}[word] if number < 6 else word for number, word in enumerate(words)]
    assert worst_deg(solve(planes, words).frame, strike_slip_axes) < 6
    assert worst_deg(solve(planes, swapped).frame, strike_slip_axes) < 8


def test_senses_overrule_the_acute_rule_when_they_agree(strike_slip_axes):
    # Planes 60 deg from sigma1, as in blocks turned after they broke: the acute bisector is sigma3, and every label says so.
    planes = conjugate_normals(strike_slip_axes, 16, 5.0, np.random.default_rng(5), half_angle_deg=60.0)
    words = labels_of(strike_slip_axes, 0.5, planes)
    joint = solve(planes, words)
    assert worst_deg(joint.frame, strike_slip_axes) < 8
    assert joint.odds.obtuse_share > 0.5
    by_geometry = solve(planes, words, Terms(senses=False))
    assert worst_deg(by_geometry.frame, strike_slip_axes[::-1]) < 8


def test_the_axes_turn_with_the_model(strike_slip_axes):
    planes = conjugate_normals(strike_slip_axes, 14, 6.0, np.random.default_rng(8))
    words = labels_of(strike_slip_axes, 0.5, planes)
    turn = rotation([0.0, 0, 1], 77.0)
    first, second = solve(planes, words), solve(planes @ turn.T, words)
    assert worst_deg(second.frame, first.frame @ turn.T) < 0.05
    assert np.allclose(cones_deg(second.frame, second.frames), cones_deg(first.frame, first.frames), atol=0.2)


def test_mirror_turns_sinistral_into_dextral(strike_slip_axes):
    planes = conjugate_normals(strike_slip_axes, 14, 6.0, np.random.default_rng(8))
    words = labels_of(strike_slip_axes, 0.5, planes)
    other = [{"dextral": "sinistral", "sinistral": "dextral"}.get(word, word) for word in words]
    mirror = np.diag([-1.0, 1, 1])
    first, second = solve(planes, words), solve(planes @ mirror, other)
    assert worst_deg(second.frame, first.frame @ mirror) < 0.05


def test_a_bootstrap_replicate_is_the_answer_of_the_faults_drawn(strike_slip_axes):
    # Slow and plain: infer anew from a list in which each fault stands as often as it was drawn.
    planes = conjugate_normals(strike_slip_axes, 16, 5.0, np.random.default_rng(2))
    words = labels_of(strike_slip_axes, 0.5, planes)
    counts = bootstrap_counts(16, 4, 7)
    first = solve(planes, words)
    grid = turned(first.frame, ball(np.radians(20), np.radians(2.0)))
    values = log_likelihood(evidence_of(planes, words), grid, FINE_RATIOS, first.odds, Terms()).astype(np.float32)
    _, fast, _ = estimates(grid, values, FINE_RATIOS, counts.astype(np.float32))
    for drawn, frame in zip(counts, fast, strict=True):
        rows = np.repeat(np.arange(16), drawn)
        slow = solve(planes[rows], [words[row] for row in rows])
        assert worst_deg(frame, slow.frame) < 0.5


def test_two_faults_do_not_think_themselves_sure(strike_slip_axes):
    planes = conjugate_normals(strike_slip_axes, 2, 0.0, np.random.default_rng(0))
    pair = solve(planes, labels_of(strike_slip_axes, 0.5, planes), replicates=300)
    assert max(cones_deg(pair.frame, pair.frames)) > 15


def test_faults_add_up_and_chunks_do_not_matter(strike_slip_axes):
    planes = conjugate_normals(strike_slip_axes, 150, 8.0, np.random.default_rng(2))
    evidence = evidence_of(planes, labels_of(strike_slip_axes, 0.5, planes))
    frames = all_frames(200)
    values, odds = survey(evidence, frames, EvidenceModel(), Terms())
    assert np.allclose(
        values, log_likelihood(evidence, frames, COARSE_RATIOS, odds, Terms()).sum(0), atol=1e-3
    )  # surveyed in single precision


def test_few_loose_labels_give_wide_cones_not_false_precision():
    planes = np.array([[0.6, 0.0, 0.8], [0.0, 0.6, 0.8]])
    loose = solve(planes, ["normal", "normal"], Terms(geometry=False))
    assert loose.loose
    flat = conjugate_normals(np.eye(3)[::-1], 20, 5.0, np.random.default_rng(1))
    assert not solve(flat, ["normal"] * 20).loose


def test_shape_ratio_is_reported_only_where_resolved():
    def posterior(share):
        grid = (np.arange(7) + 0.5) / 7
        return Posterior(np.eye(3), np.eye(3)[None], np.array([share]), grid, np.ones((1, 3), int), np.zeros(3), EvidenceModel())

    assert shape_ratio_of(posterior(np.full(7, 1 / 7))) is None
    resolved = shape_ratio_of(posterior(np.array([0, 0.05, 0.9, 0.05, 0, 0, 0])))
    assert resolved is not None
    assert resolved.low < resolved.value < resolved.high
    assert resolved.value == pytest.approx(2.5 / 7, abs=0.02)


def test_shmax_interval_wraps_at_north():
    frames = np.stack([rotation([0, 0, 1], angle) for angle in (-4.0, -2.0, 0.0, 2.0, 4.0)])
    north = np.array([[0.0, 1, 0], [0, 0, 1], [1, 0, 0]])
    regime = regime_of_frames(north, north @ np.swapaxes(frames, 1, 2))
    assert regime.kind == "strike-slip"
    assert regime.shmax_deg % 180 == pytest.approx(0.0, abs=1e-9)
    assert regime.shmax_half_width_deg <= 4.0 + 1e-9
