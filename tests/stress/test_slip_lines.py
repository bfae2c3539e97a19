"""Slip lines as evidence: the plain formula, R resolved by them, a third of them wrong, lines without sense."""

import numpy as np
import pytest

from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import slip_vectors
from structviz.orientation.vectors import angle_deg, axial_angle_deg, rotation
from structviz.stress.evidence import EvidenceModel, gather
from structviz.stress.frames import all_frames
from structviz.stress.joint import Terms, infer
from structviz.stress.readings import shape_ratio_of
from structviz.stress.replicates import bootstrap_counts
from structviz.stress.slip_lines import MOST_HEARD, gather_lines, off_plane_deg, slip_term
from structviz.stress.tensor import reduced_tensor

ODDS = EvidenceModel()


def planes(count, rng):
    n = rng.normal(size=(count, 3))
    n /= np.linalg.norm(n, axis=1)[:, None]
    return n * np.where(n[:, 2:] < 0, -1.0, 1.0)


def lines_of(normals, slips, signed=True):
    return gather_lines(
        [n[None] for n in normals], [s[None] for s in slips], [np.array([signed])] * len(normals), [np.ones(1)] * len(normals)
    )


def solve(normals, slips, signed=True):
    evidence = gather([n[None] for n in normals], [np.ones(1)] * len(normals), [None] * len(normals), np.zeros(len(normals)),
                      np.ones(len(normals), bool), lines_of(normals, slips, signed))  # fmt: skip
    return infer(evidence, ODDS, Terms(), bootstrap_counts(len(normals), 100, 0))


@pytest.fixture
def known():
    rng = np.random.default_rng(7)
    axes = rotation(rng.normal(size=3), 140.0)
    normals = planes(30, rng)
    return axes, normals, resolved_slip(reduced_tensor(axes, 0.7), normals)


def test_term_is_the_plain_formula(known):
    _, normals, slips = known
    frames, ratios = all_frames(40), np.array([0.2, 0.9])
    fast = slip_term(lines_of(normals[:3], slips[:3]), frames, ratios, 15.0, 0.25)
    k = 1 / np.radians(15.0) ** 2
    circle = np.linspace(0, 2 * np.pi, 20001)[:-1]
    mean = np.exp(k * (np.cos(circle) - 1)).mean()  # of the von Mises density over all directions, by quadrature
    for fault in range(3):
        for g, frame in enumerate(frames):
            for r, ratio in enumerate(ratios):
                off = np.radians(angle_deg(resolved_slip(reduced_tensor(frame, ratio), normals[fault]), slips[fault]))
                plain = np.log(0.75 * np.exp(k * (np.cos(off) - 1)) / mean + 0.25)
                assert fast[fault, g, r] == pytest.approx(plain, abs=1e-6)


def test_lines_give_axes_and_resolve_the_shape_ratio(known):
    axes, normals, slips = known
    found = solve(normals, slips)
    ratio = shape_ratio_of(found)
    assert axial_angle_deg(found.frame, axes).max() < 4
    assert ratio is not None
    assert ratio.low < 0.7 < ratio.high


def test_a_third_of_wrong_lines_is_outvoted(known):
    axes, normals, slips = known
    rng = np.random.default_rng(3)
    wrong = slips.copy()
    wrong[:10] = slip_vectors(normals[:10], rng.uniform(-180, 180, 10))
    assert axial_angle_deg(solve(normals, wrong).frame, axes).max() < 6


def test_lines_without_sense_leave_sigma1_and_sigma3_open(known):
    axes, normals, slips = known
    found = solve(normals, np.where(np.arange(30)[:, None] % 2, slips, -slips), signed=False)
    either = min(axial_angle_deg(found.frame, axes).max(), axial_angle_deg(found.frame, axes[::-1]).max())
    assert either < 6


def test_many_striae_of_one_fault_are_not_heard_as_many_faults(known):
    _, normals, slips = known
    crowd = gather_lines([np.repeat(normals[:1], 40, 0)], [np.repeat(slips[:1], 40, 0)], [np.ones(40, bool)], [np.ones(40)])
    assert crowd.weights.sum() == pytest.approx(MOST_HEARD)


def test_angle_off_the_plane():
    assert off_plane_deg(np.array([[1.0, 0, 0], [0, 0, 1.0]]), np.array([[0, 0, 1.0], [0, 0, 1.0]])) == pytest.approx([0.0, 90.0])


def test_lines_on_one_fault_add_up_and_weigh_what_they_weigh(known):
    _, normals, slips = known
    frames, ratios = all_frames(40), np.array([0.2, 0.9])
    one = [slip_term(lines_of(normals[k : k + 1], slips[k : k + 1]), frames, ratios, 15.0, 0.25) for k in (0, 1)]
    both = gather_lines([normals[:2]], [slips[:2]], [np.array([True, True])], [np.array([1.0, 0.5])])
    assert np.allclose(slip_term(both, frames, ratios, 15.0, 0.25), one[0] + 0.5 * one[1], atol=1e-9)


def test_a_line_without_sense_is_the_mean_of_both_ways_round(known):
    _, normals, slips = known
    frames, ratios = all_frames(40), np.array([0.3])

    def odds(signed, turn):
        return np.exp(slip_term(lines_of(normals[:1], turn * slips[:1], signed), frames, ratios, 15.0, 0.25))

    assert np.allclose(odds(False, 1), (odds(True, 1) + odds(True, -1)) / 2, rtol=1e-9)
    assert np.allclose(odds(False, 1), odds(False, -1), rtol=1e-9)
