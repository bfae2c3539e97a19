"""What verdicts depend on, and what carries the stress: against plain runs without each fault."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.orientation.vectors import axial_angle_deg
from structviz.report.results_json import results_text
from structviz.report.tables import csv_text, sensitivity_table
from structviz.scenarios import SHAPE_RATIOS, sensitivity
from structviz.stress.influence import influence, pair_influence_deg
from structviz.stress.tensor import frame_angle_deg
from structviz.synthetic import random_model


@pytest.fixture(scope="module")
def model():
    return random_model("normal", faults=12, conjugate=9, planted=2, triangles=60, random_state=5).model


@pytest.fixture(scope="module")
def analysis(model):
    return run(model, Settings(replicates=400))


@pytest.fixture(scope="module")
def found(analysis):
    return sensitivity(analysis)


def test_influence_is_that_of_leaving_the_fault_out(model, analysis):
    """The plain way: run the model again without each of the three faults that turn it most, and without the three that turn it least."""
    told = influence(analysis.answer.single).turn_deg.max(1)
    order = np.argsort(told)
    plain = []
    for number in [*order[-3:], *order[:3]]:
        less = replace(model, faults=tuple(f for k, f in enumerate(model.faults) if k != number))
        axes = run(less, Settings(replicates=50)).answer.single.frame
        plain.append(axial_angle_deg(axes, analysis.answer.single.frame).max())
    assert np.mean(plain[:3]) > np.mean(plain[3:]), "what is told to carry most does"
    assert np.abs(np.array(plain) - told[[*order[-3:], *order[:3]]]).max() < 4.0


def test_pairs_draw_by_weight_and_angle(analysis):
    axes = analysis.regimes[0].axes
    drawn = pair_influence_deg(analysis.pairs, axes)
    weight = analysis.pairs.weight / analysis.pairs.weight.sum()
    plain = [w * float(frame_angle_deg(frame, axes)) for w, frame in zip(weight, analysis.pairs.axes)]
    np.testing.assert_allclose(drawn, plain)


def test_scenarios_hold_every_fault_and_name_what_changes(model, found):
    names = {fault.name for fault in model.faults}
    for scenario in found.scenarios:
        missing = names - set(scenario.words)
        assert len(missing) == (scenario.key == "without")
    keys = [scenario.key for scenario in found.scenarios]
    assert keys.count("shape_ratio") == len(SHAPE_RATIOS)
    changed = {n for s in found.scenarios for n, word in s.words.items() if word != found.base.words[n]}
    assert {each.fault for each in found.dependences} == changed
    for each in found.dependences:
        assert found.base.words[each.fault] in each.text


def test_a_fault_that_hangs_on_r_says_so():
    """Sigma1 and sigma2 level and alike in all but R: an oblique plane slips up or along as R decides."""
    model = random_model("strike-slip", faults=12, conjugate=8, planted=0, triangles=60, random_state=1).model
    found = sensitivity(run(model, Settings(replicates=60)))
    assert "shape_ratio" in {key for each in found.dependences for key in each.on}


def test_the_same_analysis_gives_the_same_words_and_files(analysis, found):
    again = sensitivity(analysis)
    assert csv_text(sensitivity_table(again)) == csv_text(sensitivity_table(found))
    assert results_text(analysis, depends=again) == results_text(analysis, depends=found)
    told = json.loads(results_text(analysis, depends=found))["sensitivity"]
    assert len(told["influence"]) == len(analysis.faults)


def test_without_a_stress_there_is_nothing_to_depend_on(model):
    lone = replace(model, faults=model.faults[:1])
    assert sensitivity(run(lone, Settings(replicates=50))) is None
