"""Mechanisms as rows of evidence beside faults."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from structviz.kinematics.senses import sector_of_words
from structviz.stress.evidence import EvidenceModel, gather
from structviz.stress.joint import Terms, infer, log_likelihood
from structviz.stress.mechanism_evidence import evidence_of_mechanisms, joined
from structviz.stress.mechanism_inversion import invert_mechanisms
from structviz.stress.replicates import bootstrap_counts
from structviz.stress.tensor import frame_angle_deg

from .test_mechanism_inversion import earthquakes

RATIOS = np.array([0.25, 0.75])


@pytest.fixture(scope="module")
def known():
    frame = Rotation.random(random_state=11).as_matrix()
    planes, _ = earthquakes(frame, 0.5, 30, 6.0, 11)
    return frame, invert_mechanisms(planes)


def faults(facets=3):
    normals = [np.tile([[0.0, np.sin(a), np.cos(a)]], (facets, 1)) for a in (0.5, 1.0)]
    sectors = [sector_of_words("normal"), None]
    return gather(normals, [np.ones(facets)] * 2, sectors, np.ones(2), np.ones(2, bool))


def test_rows_keep_what_they_say_when_joined(known):
    frame, found = known
    mine, theirs = faults(), evidence_of_mechanisms(found)
    both = joined(mine, theirs)
    frames = np.stack([frame, Rotation.random(random_state=1).as_matrix()])
    odds = EvidenceModel()
    each = [log_likelihood(part, frames, RATIOS, odds, Terms()) for part in (mine, theirs, both)]
    assert len(both) == 32
    np.testing.assert_allclose(each[2], np.concatenate(each[:2]), atol=1e-12)
    assert (both.declared == [True, False] + [False] * 30).all()
    assert (both.measured == [False] * 2 + [True] * 30).all()


def test_earthquakes_alone_give_their_stress_in_the_joint_answer(known):
    frame, found = known
    theirs = evidence_of_mechanisms(found)
    posterior = infer(theirs, EvidenceModel(), Terms(), bootstrap_counts(len(theirs), 50, 0))
    assert frame_angle_deg(posterior.frame, frame) < 8.0


def test_weights_silence_and_do_not_shout(known):
    frame, found = known
    term = [
        log_likelihood(evidence_of_mechanisms(found, w * np.ones(30)), frame[None], RATIOS, EvidenceModel(), Terms())
        for w in (0, 0.5, 1, 9)
    ]
    assert not term[0].any()
    np.testing.assert_allclose(2 * term[1], term[2])
    np.testing.assert_allclose(term[3], term[2])
