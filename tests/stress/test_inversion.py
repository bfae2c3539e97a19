"""Stress from slip: recovery, robustness to starts, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import optimize
from scipy.spatial.transform import Rotation

from structviz.errors import ArgumentError
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import normals, rakes_deg, slip_vectors
from structviz.orientation.vectors import angle_deg
from structviz.stress.inversion import SlipInversion, angular_inversion, angular_rank, linear_inversion, linear_rank
from structviz.stress.tensor import frame_angle_deg, reduced_tensor


def made_up(seed, count=25, scatter_deg=0.0):
    """Return a stress and the slip it makes, with scattered rakes."""
    rng = np.random.default_rng(seed)
    frame, ratio = Rotation.random(random_state=seed).as_matrix(), rng.uniform(0.1, 0.9)
    n = normals(rng.uniform(0, 360, count), rng.uniform(20, 90, count))
    slips = resolved_slip(reduced_tensor(frame, ratio), n)
    slips = slip_vectors(n, rakes_deg(n, slips) + rng.normal(0, 1, count) * scatter_deg)
    return frame, ratio, n, slips


@pytest.mark.parametrize("seed", range(12))
def test_perfect_data_give_the_stress_back(seed):
    frame, ratio, n, slips = made_up(seed)
    found = angular_inversion(n, slips)
    assert frame_angle_deg(found.axes, frame) < 1e-3
    assert found.shape_ratio == pytest.approx(ratio, abs=1e-5)
    assert found.misfits_deg.max() < 1e-3


@pytest.mark.parametrize("ratio", [0.0, 1.0])
def test_perfect_data_of_a_degenerate_stress(ratio):
    frame, _, n, _ = made_up(3)
    found = angular_inversion(n, resolved_slip(reduced_tensor(frame, ratio), n))
    assert found.misfits_deg.max() < 0.05
    assert found.shape_ratio == pytest.approx(ratio, abs=1e-3)
    row = 0 if ratio == 0 else 2
    assert angle_deg(found.axes[row], frame[row]) % 180 == pytest.approx(0.0, abs=0.05) or angle_deg(found.axes[row], -frame[row]) < 0.05


@pytest.mark.parametrize("seed", range(5))
def test_no_other_stress_fits_better(seed):
    """Against SciPy's simplex search started at the truth and at the answer."""
    frame, ratio, n, slips = made_up(seed, scatter_deg=12.0)
    found = angular_inversion(n, slips)

    def cost(start, unknowns):
        axes = start @ Rotation.from_rotvec(unknowns[:3]).as_matrix()
        predicted = resolved_slip(reduced_tensor(axes, np.clip(unknowns[3], 0, 1)), n)
        return (angle_deg(predicted, slips) ** 2).sum()

    here = (found.misfits_deg**2).sum()
    for start, shape in ((frame, ratio), (found.axes, found.shape_ratio)):
        options = {"maxiter": 4000, "xatol": 1e-9, "fatol": 1e-9}
        slow = optimize.minimize(lambda u, s=start: cost(s, u), [0.01, 0.01, 0.01, shape], method="Nelder-Mead", options=options)
        assert here <= slow.fun + 1e-6


def test_both_solutions_are_near_the_truth_with_scatter():
    for invert, limit in ((linear_inversion, 10.0), (angular_inversion, 8.0)):
        off = [frame_angle_deg(invert(n, s).axes, frame) for frame, _, n, s in (made_up(seed, 60, 10.0) for seed in range(8))]
        assert np.median(off) < limit


def test_zero_weight_takes_a_datum_out():
    _, _, n, slips = made_up(1, scatter_deg=5.0)
    weights = np.ones(len(n))
    weights[:6] = 0.0
    for invert in (linear_inversion, angular_inversion):
        wanted, found = invert(n[6:], slips[6:]), invert(n, slips, weights)
        assert frame_angle_deg(found.axes, wanted.axes) < 1e-3
        assert len(found.misfits_deg) == len(n)


def test_the_same_data_give_the_same_bytes_and_are_left_alone():
    _, _, n, slips = made_up(2, scatter_deg=5.0)
    before = (n.tobytes(), slips.tobytes())
    one, two = angular_inversion(n, slips), angular_inversion(n, slips)
    assert one.axes.tobytes() == two.axes.tobytes()
    assert (n.tobytes(), slips.tobytes()) == before


def test_order_of_the_data_does_not_matter():
    _, _, n, slips = made_up(4, scatter_deg=8.0)
    order = np.random.default_rng(0).permutation(len(n))
    assert frame_angle_deg(angular_inversion(n[order], slips[order]).axes, angular_inversion(n, slips).axes) < 1e-3


def test_striae_without_senses_are_said_to_be_ambiguous():
    frame, ratio, n, slips = made_up(5)
    lines = slips * np.where(np.arange(len(n)) % 3, 1.0, -1.0)[:, None]
    found = angular_inversion(n, lines, senses_known=False)
    assert not found.senses_known
    assert found.misfits_deg.max() < 1e-3
    both = [(found.axes, found.shape_ratio), (found.reversed().axes, found.reversed().shape_ratio)]
    assert min(frame_angle_deg(axes, frame) + abs(shape - ratio) for axes, shape in both) < 1e-3
    np.testing.assert_allclose(np.linalg.det(found.reversed().axes), 1.0)


def test_too_little_is_refused_with_the_count():
    _, _, n, slips = made_up(6)
    assert linear_rank(n) == 5
    assert angular_rank(n, slips) == 4
    with pytest.raises(ArgumentError, match="found 3 directions of slip that determine 3 of 4 parameters"):
        angular_inversion(n[:3], slips[:3])
    copies = np.tile(n[:1], (20, 1)), np.tile(slips[:1], (20, 1))
    with pytest.raises(ArgumentError, match="found 20 directions of slip that determine 1 of 4 parameters"):
        angular_inversion(*copies)
    with pytest.raises(ArgumentError, match="found 20 planes that determine 2 of 5 parameters"):
        linear_inversion(*copies)


def test_bad_data_are_refused():
    _, _, n, slips = made_up(7)
    with pytest.raises(ArgumentError, match="found a slip with no part in its plane"):
        linear_inversion(n, n)
    with pytest.raises(ArgumentError, match=r"found shapes \(25, 3\) and \(24, 3\)"):
        angular_inversion(n, slips[1:])
    with pytest.raises(ArgumentError, match="wanted 25 weights, none negative"):
        linear_inversion(n, slips, -np.ones(25))


@pytest.mark.parametrize("known", [True, False])
def test_reversed_twice_is_the_same_and_once_turns_the_misfits_of_known_senses(known):
    axes, misfits = np.eye(3), np.array([0.0, 20.0, 70.0])
    found = SlipInversion(axes, 0.3, misfits, known)
    other = found.reversed()
    assert other.senses_known is known
    assert other.shape_ratio == pytest.approx(0.7)
    assert np.allclose(other.misfits_deg, 180.0 - misfits if known else misfits)
    again = other.reversed()
    assert np.allclose(np.abs(again.axes), np.abs(axes))
    assert again.shape_ratio == pytest.approx(0.3)
    assert np.allclose(again.misfits_deg, misfits)
