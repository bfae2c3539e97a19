"""The likelihood of one fault: a slow, plain writing of the same formulas, and what the terms must prefer."""

import numpy as np
import pytest

from structviz.kinematics.senses import sector_of_rake, sector_of_words
from structviz.kinematics.slip import shear_and_normal
from structviz.orientation.planes import normals, slip_vectors
from structviz.stress.evidence import EvidenceModel, gather, geometry_term, sector_edges, sense_term
from structviz.stress.frames import all_frames
from structviz.stress.tensor import reduced_tensor

ODDS = EvidenceModel()


def evidence_of(plane, sector, partnered=1.0):
    n = normals(*plane)[None]
    return gather([n], [np.ones(1)], [sector], np.array([partnered]), np.array([True]))


def slow_sense(plane, sector, frame, ratio):
    tensor, n = reduced_tensor(frame, ratio), normals(*plane)
    total = 0.0
    for edge in sector_edges(n[None], sector)[0]:
        if np.any(edge):
            traction = tensor @ n
            towards = float(-(traction - (traction @ n) * n) @ edge) / 0.5
            total += np.log(ODDS.wrong_label_share + (1 - 2 * ODDS.wrong_label_share) / (1 + np.exp(-towards / ODDS.shear_softness)))
    return total


@pytest.mark.parametrize("text", ["normal", "dextral", "sinistral-reverse", "rake"])
def test_sense_term_equals_the_plain_formula(text):
    sector = sector_of_rake(-40.0) if text == "rake" else sector_of_words(text)
    frames, ratios, plane = all_frames(60), np.array([0.0, 0.4, 1.0]), (35.0, 62.0)
    fast = sense_term(evidence_of(plane, sector), frames, ratios, ODDS)[0]
    slow = [[slow_sense(plane, sector, frame, ratio) for ratio in ratios] for frame in frames]
    assert np.allclose(fast, slow, atol=1e-12)


def test_greatest_shear_of_the_reduced_tensor_is_one_half():
    anywhere = np.random.default_rng(0).normal(size=(20000, 3))
    shear, _ = shear_and_normal(reduced_tensor(np.eye(3), 0.3), anywhere / np.linalg.norm(anywhere, axis=1)[:, None])
    assert shear.max() == pytest.approx(0.5, abs=1e-3)


def test_geometry_term_integrates_to_one_over_all_orientations():
    # A likelihood ratio against "any orientation": its mean over all planes must be one.
    n = np.random.default_rng(0).normal(size=(200000, 1, 3))
    n /= np.linalg.norm(n, axis=-1, keepdims=True)
    many = gather(list(n), [np.ones(1)] * len(n), [None] * len(n), np.ones(len(n)), np.ones(len(n), bool))
    ratio = np.exp(geometry_term(many, np.eye(3)[None], ODDS))
    assert ratio.mean() == pytest.approx(1.0, abs=0.02)


def test_geometry_prefers_the_acute_angle_and_needs_a_partner():
    upright = np.array([[0.0, 0, 1], [0, 1, 0], [1, 0, 0]])
    swapped = upright[::-1]
    both = np.stack([upright, swapped])
    acute, obtuse = geometry_term(evidence_of((0.0, 60.0), None), both, ODDS)[0]
    assert acute > obtuse
    assert np.all(geometry_term(evidence_of((0.0, 60.0), None, partnered=0.0), both, ODDS) == 0.0)


def test_a_wrong_label_costs_no_more_than_its_stated_odds():
    frames = all_frames(500)
    values = sense_term(evidence_of((10.0, 50.0), sector_of_words("reverse")), frames, np.array([0.5]), ODDS)
    assert values.min() >= np.log(ODDS.wrong_label_share)
    assert values.max() <= np.log(1 - ODDS.wrong_label_share)


def test_a_declared_rake_is_a_sector_about_it():
    n = normals(20.0, 60.0)[None]
    edges = sector_edges(n, sector_of_rake(-60.0))[0]
    inside = [rake for rake in range(-180, 181, 5) if (edges @ slip_vectors(n[0], rake) > 1e-9).all()]
    assert (min(inside), max(inside)) == (-90, -30)
