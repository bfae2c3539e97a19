"""Means and spreads, against SciPy, plain loops and simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import optimize, stats

from structviz.errors import ArgumentError
from structviz.orientation.lines import vectors
from structviz.orientation.statistics import (
    axial_cone_deg,
    axial_mean,
    axial_mean_azimuth_deg,
    circular_mean_deg,
    fabric,
    fisher_mean,
    likely_kappa,
    mean_resultant,
    orientation_tensor,
    spherical_median,
)
from structviz.orientation.vectors import angle_deg, axial_angle_deg


def cluster(count, kappa=20.0, seed=0, mean=(0.6, 0.0, 0.8)):
    return stats.vonmises_fisher(list(mean), kappa).rvs(count, random_state=seed)


def test_tensor_agrees_with_a_plain_loop_and_in_batches():
    v, w = cluster(30), np.random.default_rng(1).uniform(0.1, 2, 30)
    plain = np.zeros((3, 3))
    for line, weight in zip(v, w):
        for i in range(3):
            for j in range(3):
                plain[i, j] += weight * line[i] * line[j] / w.sum()
    np.testing.assert_allclose(orientation_tensor(v, w), plain, atol=1e-14)
    batch = orientation_tensor(np.stack([v, -v]), np.stack([w, w]))
    np.testing.assert_allclose(batch, [plain, plain], atol=1e-14)
    np.testing.assert_allclose(np.trace(plain), 1.0)


def test_a_weight_of_two_is_two_equal_axes():
    v = cluster(10)
    np.testing.assert_allclose(orientation_tensor(v, [2.0] + [1.0] * 9), orientation_tensor(np.concatenate([v[:1], v])), atol=1e-15)


def test_axial_mean_ignores_signs_where_the_vector_mean_does_not():
    v = cluster(200)
    signs = np.where(np.arange(200) % 2, 1.0, -1.0)[:, None]
    np.testing.assert_allclose(axial_mean(v * signs), axial_mean(v), atol=1e-12)
    assert axial_angle_deg(axial_mean(v), fisher_mean(v).mean) < 1.0
    assert fisher_mean(v * signs).resultant < 0.1 * fisher_mean(v).resultant


def test_fabric_axes_are_right_handed_and_diagonal():
    v = np.random.default_rng(5).normal(size=(40, 3)) * [3.0, 1.5, 0.5]
    found = fabric(v)
    np.testing.assert_allclose(np.linalg.det(found.axes), 1.0)
    np.testing.assert_allclose(found.axes @ orientation_tensor(v) @ found.axes.T, np.diag(found.eigenvalues), atol=1e-14)
    assert found.mean_defined
    assert found.pole_defined


def test_maximum_likelihood_agrees_with_scipy():
    v = cluster(300, kappa=12.0, seed=4)
    mean, kappa = stats.vonmises_fisher.fit(v)
    found = fisher_mean(v)
    np.testing.assert_allclose(found.mean, mean, atol=1e-10)
    np.testing.assert_allclose(likely_kappa(found.resultant / found.count), kappa, rtol=1e-6)


def test_circular_means_agree_with_scipy():
    azimuths = np.random.default_rng(2).normal(350, 30, 50) % 360
    np.testing.assert_allclose(circular_mean_deg(azimuths)[0], stats.circmean(azimuths, high=360), atol=1e-9)
    np.testing.assert_allclose(axial_mean_azimuth_deg(azimuths)[0], stats.circmean(azimuths, high=180), atol=1e-9)
    np.testing.assert_allclose(
        axial_mean_azimuth_deg(azimuths + 180.0 * (azimuths > 50))[0], axial_mean_azimuth_deg(azimuths)[0], atol=1e-9
    )


def test_median_agrees_with_a_minimiser_and_shrugs_off_outliers():
    clean = cluster(40)
    v = np.concatenate([clean, vectors([200.0, 210.0, 190.0], [-5.0, 0.0, 5.0])])

    def total(angles):
        return angle_deg(vectors(*angles), v).sum()

    found = spherical_median(v)
    slow = optimize.minimize(total, [90.0, -50.0], method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-11, "maxiter": 4000})
    assert angle_deg(found, vectors(*slow.x)) < 1e-4
    assert angle_deg(found, v).sum() <= slow.fun + 1e-9
    assert angle_deg(found, spherical_median(clean)) < 0.5 * angle_deg(fisher_mean(v).mean, fisher_mean(clean).mean)


def test_median_of_copies_and_of_opposites():
    line = vectors(30.0, 20.0)
    np.testing.assert_allclose(spherical_median(np.tile(line, (5, 1))), line, atol=1e-12)
    assert not spherical_median([line, -line]).any()


@pytest.mark.parametrize("count", [8, 30])
def test_the_fisher_cone_covers_the_mean_in_95_of_100_trials(count):
    truth = np.array([0.6, 0.0, 0.8])
    sample = cluster(count * 1500, kappa=25.0, seed=6).reshape(1500, count, 3)
    found = [fisher_mean(v) for v in sample]
    covered = np.mean([angle_deg(f.mean, truth) <= f.alpha95_deg for f in found])
    assert 0.93 <= covered <= 0.97


def test_the_axial_cone_covers_the_mean_axis():
    """Of large samples; the wider of two directions is taken, so slightly more than 95 of 100."""
    truth = np.array([0.6, 0.0, 0.8])
    sample = cluster(60 * 1000, kappa=10.0, seed=7).reshape(1000, 60, 3)
    signs = np.where(np.random.default_rng(8).random((1000, 60, 1)) < 0.5, -1.0, 1.0)
    covered = np.mean([axial_angle_deg(axial_mean(v), truth) <= axial_cone_deg(v) for v in sample * signs])
    assert 0.94 <= covered <= 0.985


def test_cones_where_there_is_little_to_say():
    assert axial_cone_deg([[0, 0, 1], [0, 1, 1]]) is None
    assert axial_cone_deg([[1, 0, 0], [0, 1, 0], [1, 1, 0], [1, -1, 0]]) == 90.0
    alone = fisher_mean([[0.0, 0.0, 2.0]])
    assert (alone.kappa, alone.alpha95_deg, alone.angular_deviation_deg) == (None, None, None)
    same = fisher_mean(np.tile([0.0, 0.6, 0.8], (4, 1)))
    assert same.kappa is None
    assert same.alpha95_deg == pytest.approx(0.0, abs=1e-5)
    assert likely_kappa(1.0) is None
    assert likely_kappa(0.0) == pytest.approx(0.0, abs=1e-9)


def test_nothing_to_average_is_refused():
    with pytest.raises(ArgumentError, match="axes: found none"):
        orientation_tensor(np.zeros((0, 3)))
    with pytest.raises(ArgumentError, match="weights: found negative or all-zero"):
        orientation_tensor(np.eye(3), [1.0, -1.0, 1.0])
    with pytest.raises(ArgumentError, match="weights: found negative or all-zero"):
        circular_mean_deg([1.0, 2.0], [0.0, 0.0])
    with pytest.raises(ArgumentError, match=r"resultant_share: found 1\.2; wanted 0 to 1"):
        likely_kappa(1.2)


@pytest.mark.parametrize(
    "measure",
    [
        axial_mean,
        lambda v, w: fabric(v, w).eigenvalues,
        spherical_median,
        orientation_tensor,
        lambda v, w: np.array(axial_mean_azimuth_deg(np.degrees(np.arctan2(v[:, 0], v[:, 1])), w)),
        lambda v, w: np.array(circular_mean_deg(np.degrees(np.arctan2(v[:, 0], v[:, 1])), w)),
    ],
)
def test_a_whole_weight_is_the_same_as_so_many_copies(measure):
    v, w = cluster(12, kappa=6.0, seed=4), np.array([1, 3, 1, 2, 5, 1, 1, 4, 1, 1, 2, 1])
    assert np.allclose(measure(v, w), measure(np.repeat(v, w, axis=0), np.ones(w.sum())), atol=1e-9)
    assert not np.allclose(measure(v, w), measure(v, np.ones(12)), atol=1e-3)


def test_weights_scale_out_of_the_axial_cone_and_count_as_fewer_data():
    v, w = cluster(40, seed=5), np.random.default_rng(2).uniform(0.2, 3, 40)
    assert axial_cone_deg(v, 7 * w) == pytest.approx(axial_cone_deg(v, w), rel=1e-12)
    # The plain formula beside its name in the docstring, one axis at a time.
    values, columns = np.linalg.eigh(np.einsum("n,ni,nj->ij", w, v, v) / w.sum())
    count = w.sum() ** 2 / (w**2).sum()
    widths = []
    for j in (0, 1):
        spread = sum(wk * (vk @ columns[:, 2]) ** 2 * (vk @ columns[:, j]) ** 2 for vk, wk in zip(v, w)) / w.sum()
        widths.append(np.sqrt(5.991464547 * spread / (count * (values[2] - values[j]) ** 2)))
    assert axial_cone_deg(v, w) == pytest.approx(np.degrees(max(widths)), rel=1e-6)
    assert axial_cone_deg(v[:2]) is None
    assert axial_cone_deg(v[:3]) is not None


def test_a_cone_is_never_wider_than_ninety():
    assert axial_cone_deg(np.random.default_rng(3).normal(size=(9, 3))) <= 90.0
    assert axial_cone_deg(np.concatenate([np.eye(3), -np.eye(3)])) == 90.0


def test_expected_resultant_is_smooth_where_the_series_takes_over():
    kappa = np.array([1e-6, 5e-4, 9.99e-4, 1.001e-3, 2e-3, 0.1, 1.0, 30.0])
    # The same by quadrature of the cosine over the sphere.
    cosine = np.linspace(-1, 1, 200_001)
    for each, found in zip(kappa, mean_resultant(kappa)):
        density = np.exp(each * (cosine - 1))
        assert found == pytest.approx(np.trapezoid(density * cosine, cosine) / np.trapezoid(density, cosine), rel=2e-6, abs=1e-9)


def test_likely_kappa_solves_its_own_equation_over_the_whole_range():
    for share in (0.0, 0.001, 0.3, 0.9, 0.9999):
        assert float(mean_resultant(likely_kappa(share))) == pytest.approx(share, abs=1e-9)
    assert likely_kappa(1.0) is None


def test_two_vectors_are_enough_for_a_concentration_and_one_is_not():
    one, two = fisher_mean([[0, 0, 1.0]]), fisher_mean([[0, 0, 1.0], [0, 0.1, 1.0]])
    assert (one.kappa, one.alpha95_deg, one.angular_deviation_deg) == (None, None, None)
    assert two.kappa == pytest.approx(1 / (2 - two.resultant))
    assert two.alpha95_deg == pytest.approx(np.degrees(np.arccos(1 - (2 - two.resultant) / two.resultant * 19)))
    with pytest.raises(ArgumentError, match=r"vectors: found shape \(0, 3\); wanted \(N, 3\).*\n  next: give the directions as rows"):
        fisher_mean(np.zeros((0, 3)))


def test_vectors_that_cancel_have_no_median_and_a_zero_mean():
    assert not spherical_median([[0, 0, 1.0], [0, 0, -1.0]]).any()
    assert fisher_mean([[0, 0, 1.0], [0, 0, -1.0]]).alpha95_deg == 180.0
    assert np.isnan(circular_mean_deg([0.0, 180.0])[0])


def test_errors_of_weights_say_what_to_do():
    with pytest.raises(ArgumentError, match="weights: found negative or all-zero weights; wanted a positive sum\n  next: areas or counts"):
        axial_mean(np.eye(3), [1, -1, 3])
    with pytest.raises(ArgumentError, match="wanted a positive sum"):
        axial_mean(np.stack([np.eye(3), np.eye(3)]), [[1, 1, 1], [0, 0, 0]])
    with pytest.raises(ArgumentError, match="axes: found none; wanted one or more to average\n  next: check what was selected"):
        axial_mean(np.zeros((0, 3)))
    assert np.isfinite(axial_mean([[1, 0.1, 0.2], [1, 0, 0]], [0.2, 0.3])).all()  # a sum below one is a sum
