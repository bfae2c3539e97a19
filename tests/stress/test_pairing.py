"""Pairs: what makes one admissible, what it weighs, and what its senses decide."""

import numpy as np
import pytest

from structviz.kinematics.senses import sector_of_words
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import normals
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.conjugate import PairLimits, conjugate_slips, pair_axes
from structviz.stress.evidence import sector_edges
from structviz.stress.pairing import PairSubjects, admissible_pairs, partner_support, with_senses
from structviz.stress.readings import pair_frames
from structviz.stress.tensor import reduced_tensor


def subjects_of(planes, words=None, phases=None, centres=None, known=None):
    n = np.array([normals(*plane) for plane in planes])
    count = len(n)
    words = words or [""] * count
    centres = np.zeros((count, 3)) if centres is None else np.asarray(centres, float)
    edges = np.stack([sector_edges(row[None], sector_of_words(w) if w else None)[0] for row, w in zip(n, words, strict=True)])
    return PairSubjects(
        n, np.ones(count, bool) if known is None else np.array(known), np.full(count, 3.0), centres, np.full(count, 1000.0), edges,
        phases or [""] * count, centres[:, None], n[:, None],
    )  # fmt: skip


def pairs_of(subjects, distance=0.0, limits=None):
    count = len(subjects.normals)
    candidates = np.array([(i, j) for i in range(count) for j in range(i + 1, count)])
    gaps = np.full(len(candidates), float(distance))
    return admissible_pairs(subjects, candidates, gaps, np.zeros((len(candidates), 3)), limits or PairLimits())


def test_a_normal_pair_gives_vertical_sigma1_and_slips_down_dip():
    n = normals([0.0, 180.0], [60.0, 60.0])
    axes, acute = pair_axes(n[0], n[1])
    assert acute == pytest.approx(60.0)
    assert abs(axes[0, 2]) == pytest.approx(1.0)
    assert np.allclose(conjugate_slips(axes[None], n), resolved_slip(reduced_tensor(axes, 0.7), n), atol=1e-9)


def test_axes_do_not_depend_on_the_signs_of_the_normals():
    n1, n2 = normals(20.0, 70.0), normals(150.0, 40.0)
    first, acute = pair_axes(n1, n2)
    for a, b in ((-1, 1), (1, -1), (-1, -1)):
        other, again = pair_axes(a * n1, b * n2)
        assert np.allclose(axial_angle_deg(first, other), 0, atol=1e-6)
        assert again == pytest.approx(acute)


def test_one_plane_twice_is_no_pair():
    axes, acute = pair_axes(normals(30.0, 60.0), -normals(30.0, 60.0))
    assert acute == pytest.approx(0.0, abs=1e-6)
    assert np.isnan(axes).all()


@pytest.mark.parametrize(
    "planes, admissible",
    [([(0, 60), (180, 60)], True), ([(0, 60), (10, 60)], False), ([(0, 45), (180, 45)], False), ([(0, 75), (180, 75)], False)],
)
def test_only_angles_between_the_limits_are_admissible(planes, admissible):
    assert (len(pairs_of(subjects_of(planes))) == 1) is admissible


def test_phase_distance_and_meaning_rule_pairs_out():
    planes = [(0, 60), (180, 60)]
    assert len(pairs_of(subjects_of(planes, phases=["old", "young"]))) == 0
    assert len(pairs_of(subjects_of(planes, phases=["old", ""]))) == 1
    assert len(pairs_of(subjects_of(planes), distance=2500.0)) == 0
    assert len(pairs_of(subjects_of(planes, known=[True, False]))) == 0
    near, far = pairs_of(subjects_of(planes), distance=10.0), pairs_of(subjects_of(planes), distance=1500.0)
    assert near.weight[0] > far.weight[0]


def test_planes_that_meet_far_outside_both_surfaces_weigh_less():
    planes = [(0, 60), (180, 60)]
    near = pairs_of(subjects_of(planes, centres=[[0, 0, 0], [500, 0, 0]]))
    far = pairs_of(subjects_of(planes, centres=[[0, 0, 0], [9000, 0, 0]]))
    assert near.weight[0] > 1.5 * far.weight[0]


def test_senses_choose_the_bisector_and_drop_contradictions():
    limits = PairLimits()
    for words, kept, obtuse in ((["normal", "normal"], 1, False), (["reverse", "reverse"], 1, True), (["normal", "reverse"], 0, None)):
        subjects = subjects_of([(0, 60), (180, 60)], words)
        pairs = with_senses(pairs_of(subjects), subjects, limits)
        assert len(pairs) == kept
        if kept:
            assert bool(pairs.obtuse[0]) is obtuse
            assert abs(pairs.axes[0, 2 if obtuse else 0, 2]) == pytest.approx(1.0)


def test_pairs_without_any_sense_carry_no_sense():
    subjects = subjects_of([(0, 60), (180, 60)])
    assert len(with_senses(pairs_of(subjects), subjects, PairLimits())) == 0


def test_partner_support_is_one_minus_the_chance_of_none():
    subjects = subjects_of([(0, 60), (180, 60), (5, 62), (90, 10)])
    pairs = pairs_of(subjects)
    support = partner_support(pairs, 4)
    slow = [1 - np.prod([1 - w for pair, w in zip(pairs.faults, pairs.weight, strict=True) if fault in pair]) for fault in range(4)]
    assert np.allclose(support, slow)
    assert support[1] > support[0]  # two partners against one


def test_the_densest_mode_wins_over_a_diffuse_background():
    rng = np.random.default_rng(0)
    ordinary = [((0 if k % 2 else 180) + rng.normal() * 4, 60 + rng.normal() * 3) for k in range(12)]
    strays = [(rng.uniform(0, 360), rng.uniform(20, 85)) for _ in range(8)]
    pairs = pairs_of(subjects_of(ordinary + strays))
    frame, frames = pair_frames(pairs, np.ones((3, 20), int))
    assert axial_angle_deg(frame[0], [0, 0, 1.0]) < 6
    assert axial_angle_deg(frame[1], [0, 1.0, 0]) < 6
    assert np.allclose(frames, frame)  # every fault drawn once: each replicate is the estimate itself
