"""Verdicts: by the others alone, with the reason in words, and the likely cause named first."""

import numpy as np
import pytest

from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import sector_of_words
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import normals, rakes_deg
from structviz.stress.evidence import EvidenceModel
from structviz.stress.joint import Terms, infer
from structviz.stress.replicates import Posterior, bootstrap_counts
from structviz.stress.tensor import reduced_tensor
from structviz.stress.verdict import (
    VerdictLimits,
    calibrated,
    judge,
    mean_rake_deg,
    predict,
    replicates_without,
    weighted_quantile,
)
from tests.stress.planes import conjugate_normals, evidence_of, labels_of

UPRIGHT = np.array([[0.0, 0, 1], [0, 1, 0], [-1, 0, 0]])  # normal faulting, sigma2 north
GRID = (np.arange(7) + 0.5) / 7


def known_stress(axes=UPRIGHT, faults=3, replicates=60):
    """A posterior that knows the stress exactly and leaves R open."""
    counts = np.zeros((replicates, faults), int)
    return Posterior(
        axes, np.repeat(axes[None], replicates, 0), np.full((replicates, 7), 1 / 7), GRID, counts, np.zeros(faults), EvidenceModel()
    )


def verdict_on(plane, word, axes=UPRIGHT):
    n = normals(*plane)[None]
    sector = sector_of_words(word) if word else None
    return judge(known_stress(axes), 0, n, np.ones(1), sector, "", VerdictLimits())


def test_prediction_equals_resolved_slip():
    n = normals([30.0, 200.0], [55.0, 70.0])
    prediction = predict(UPRIGHT[None], np.full((1, 7), 1 / 7), GRID, n, np.full(2, 0.5))
    slow = np.array([[rakes_deg(row, resolved_slip(reduced_tensor(UPRIGHT, ratio), row)) for ratio in GRID] for row in n])
    assert np.allclose(prediction.rakes_deg.reshape(slow.shape), slow)
    assert prediction.weights.sum() == pytest.approx(1.0)


@pytest.mark.parametrize("word, wanted", [("normal", "consistent"), ("reverse", "conflicting"), ("", "undetermined")])
def test_words_on_a_plane_that_must_slip_straight_down(word, wanted):
    assert verdict_on((0.0, 60.0), word)[0].word == wanted


def test_oblique_is_not_wrong():
    verdict, _ = verdict_on((40.0, 60.0), "normal")
    assert verdict.word == "consistent"
    assert abs(abs(verdict.predicted_rake_deg) - 90) > 10


def test_too_little_shear_is_said():
    verdict, _ = verdict_on((0.0, 2.0), "normal")
    assert verdict.word == "undetermined"
    assert "too little shear" in verdict.reasons[0]


def test_a_verdict_that_changes_with_the_shape_ratio_says_so():
    tilted = np.array([[0.0, 1, 0], [0, 0, 1], [1, 0, 0]])  # strike-slip, R moves slip between up and down
    verdict, _ = verdict_on((45.0, 45.0), "sinistral", tilted)
    assert verdict.word != "conflicting"
    found = [verdict_on((strike, 40.0), "reverse", tilted)[0] for strike in range(0, 180, 15)]
    assert any("R decides" in v.reasons[0] for v in found if v.word == "undetermined")


def test_a_fault_is_judged_by_the_others_alone():
    rng = np.random.default_rng(4)
    planes = conjugate_normals(UPRIGHT, 12, 5.0, rng)
    words = labels_of(UPRIGHT, 0.5, planes)
    words[3] = "reverse"
    counts = bootstrap_counts(12, 400, 0)
    posterior = infer(evidence_of(planes, words), EvidenceModel(), Terms(), counts)
    verdicts = [judge(posterior, k, planes[k][None], np.ones(1), sector_of_words(words[k]), "", VerdictLimits())[0].word for k in range(12)]
    assert [k for k, word in enumerate(verdicts) if word == "conflicting"] == [3]
    frames, _ = replicates_without(posterior, 3)
    assert len(frames) == min(64, (counts[:, 3] == 0).sum())


def test_too_few_others_is_said():
    posterior = known_stress(faults=1)
    nobody = Posterior(*[*posterior.__dict__.values()][:4], np.ones((60, 1), int), np.zeros(1), EvidenceModel())
    verdict, prediction = judge(nobody, 0, normals(0.0, 60.0)[None], np.ones(1), sector_of_words("normal"), "", VerdictLimits())
    assert prediction is None
    assert "too few other faults" in verdict.reasons[0]


def test_down_side_decides_a_steep_fault():
    n = normals(0.0, 88.0)  # normal points east
    normal, reverse = sector_of_words("normal"), sector_of_words("reverse")
    assert usable_sector(normal, "", n, 88.0)[0] is None
    assert usable_sector(reverse, "E", n, 88.0)[0].words == ("normal",)
    assert usable_sector(normal, "W", n, 88.0)[0].words == ("reverse",)
    assert usable_sector(sector_of_words("dextral-normal"), "", n, 88.0)[0].words == ("dextral",)
    assert usable_sector(normal, "", n, 60.0) == (normal, "")


def test_quantile_and_mean_rake_are_those_of_repeated_values():
    values, weights = np.array([3.0, 1.0, 2.0]), np.array([0.5, 0.25, 0.25])
    assert weighted_quantile(values, weights, 0.5) == 2.0
    assert weighted_quantile(values, weights, 0.51) == 3.0
    n = normals(0.0, 60.0)[None]
    rake, spread = mean_rake_deg(predict(UPRIGHT[None], np.full((1, 7), 1 / 7), GRID, n, np.ones(1)))
    assert (rake, spread) == (pytest.approx(-90.0), pytest.approx(0.0, abs=1e-6))


def test_calibration_keeps_certainty_and_evenness_and_treats_both_sides_alike():
    shares = np.linspace(0.0, 1.0, 101)
    told = np.array([calibrated(float(share)) for share in shares])
    assert told[[0, 50, 100]].tolist() == [0.0, 0.5, 1.0]
    assert (np.diff(told) > 0).all()
    np.testing.assert_allclose(told + told[::-1], 1.0)
    assert told[80] > 0.8, "a share of predicted slips understates what it is worth"
