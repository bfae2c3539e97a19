"""What verdicts depend on, and what carries the stress: against plain runs without each fault."""

from __future__ import annotations

import io
import json
import re
from dataclasses import replace

import numpy as np
import pytest
from rich.console import Console

from structviz.analysis import Settings, run
from structviz.kinematics.senses import Sector
from structviz.kinematics.slip import resolved_slip
from structviz.model import Mechanism
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.orientation.vectors import axial_angle_deg
from structviz.report.results_json import results_text
from structviz.report.summary import show
from structviz.report.tables import csv_text, sensitivity_table
from structviz.scenarios import FINE_RATIOS, SHAPE_RATIOS, Scenario, Sensitivity, _by_ratio, sensitivity
from structviz.stress.influence import influence, pair_influence_deg
from structviz.stress.tensor import frame_angle_deg, reduced_tensor
from structviz.synthetic import plane_surface, random_model
from structviz.synthetic.phased import phased_model


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
    assert np.abs(np.array(plain) - told[[*order[-3:], *order[:3]]]).max() < 1.0


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


def test_a_fault_that_hangs_on_r_says_so_and_where():
    """On a steep plane oblique to sigma2 and sigma3 the slip is down the dip where R is 0, and along it where R is 1."""
    known = random_model("normal", faults=14, conjugate=13, planted=0, triangles=60, scatter_deg=3.0, random_state=4)
    model, name = _with_a_fault_that_hangs_on_r(known)
    found = sensitivity(run(model, Settings(replicates=200)))
    mine = {each.fault: each for each in found.dependences}[name]
    assert mine.on == ("shape_ratio",), "nothing else decides"
    at = [scenario.words[name] for scenario in found.scenarios if scenario.key == "shape_ratio"]
    assert (at[0], at[-1]) == ("conflicting", "consistent")
    assert re.search(r"; conflicting at R 0 to 0\.\d+, .*consistent at R 0\.\d+ to 1$", mine.text)


def _with_a_fault_that_hangs_on_r(known):
    """Return the model, its last fault put on a steep plane oblique to sigma2 and sigma3, and its name.

    It declares the slip it has where R is 1, less what it has where R is 0.
    """
    s1, s2, s3 = known.axes
    normal = np.sin(np.radians(20.0)) * s1 + np.cos(np.radians(20.0)) * (s2 + s3) / np.sqrt(2.0)
    normal = normal * np.sign(normal[2])
    low, high = (rakes_deg(normal[None], resolved_slip(reduced_tensor(known.axes, r), normal[None]))[0] for r in (0.0, 1.0))
    middle = high + 25.0 * np.sign((high - low + 180.0) % 360.0 - 180.0)
    last = known.model.faults[-1]
    strike, dip = (float(v) for v in strike_dip_deg(normal))
    surface = plane_surface(last.name, strike, dip, 3000.0, 2000.0, last.surface.vertices.mean(0))
    planted = replace(last, surface=surface, declared=Sector(float((middle + 180.0) % 360.0 - 180.0), 45.0), down_side="")
    return replace(known.model, faults=(*known.model.faults[:-1], planted)), last.name


def test_what_is_well_determined_depends_on_nothing():
    """Conjugate faults of little scatter, every label right: their slip is along sigma1 and sigma3 whatever R and friction are."""
    model = random_model("normal", faults=16, conjugate=16, planted=0, triangles=60, scatter_deg=2.0, random_state=2).model
    found = sensitivity(run(model, Settings(replicates=200)))
    assert set(found.base.words.values()) == {"consistent"}
    assert found.dependences == ()


def test_stretches_of_r_cover_all_of_it():
    words = ["consistent"] * 2 + ["undetermined"] + ["conflicting"] * 18
    assert _by_ratio(words) == "consistent at R 0 to 0.05, undetermined at R 0.1, conflicting at R 0.15 to 1"
    assert set(SHAPE_RATIOS) <= set(FINE_RATIOS)


def test_each_phase_is_told_what_carries_it():
    known = phased_model(("normal", "strike-slip"), (0, 40), faults=(18, 12), triangles=60, random_state=3)
    analysis = run(known.model, Settings(replicates=200))
    assert len(analysis.regimes) == 2
    printed = io.StringIO()
    carried = tuple(influence(posterior) for posterior in analysis.answer.posteriors)
    base = Scenario("base", "as chosen", {}, "", float("nan"))
    show(Console(file=printed, width=100), analysis, None, Sensitivity(base, (), (), carried, np.zeros(0)))
    for regime in analysis.regimes:
        assert f"{regime.name}: the axes turn most without F" in printed.getvalue()


def test_the_same_analysis_gives_the_same_words_and_files(analysis, found):
    again = sensitivity(analysis)
    assert csv_text(sensitivity_table(again)) == csv_text(sensitivity_table(found))
    assert results_text(analysis, depends=again) == results_text(analysis, depends=found)
    told = json.loads(results_text(analysis, depends=found))["sensitivity"]
    assert len(told["influence"]) == len(analysis.faults)


def test_without_a_stress_there_is_nothing_to_depend_on(model):
    lone = replace(model, faults=model.faults[:1])
    assert sensitivity(run(lone, Settings(replicates=50))) is None


def test_earthquakes_as_evidence_are_not_named_among_the_faults():
    """Six earthquakes beside eight faults: one of them turns the axes most of all rows but for two."""
    known = random_model("strike-slip", faults=8, conjugate=5, planted=1, triangles=60, random_state=24)
    model = replace(known.model, mechanisms=_earthquakes(known.axes, 24), mechanisms_are="evidence")
    analysis = run(model, Settings(replicates=200))
    turns = influence(analysis.answer.single).turn_deg.max(1)
    assert len(turns) == 14
    assert (np.argsort(-turns)[:3] >= 8).any(), "the case is what it says"
    depends = sensitivity(analysis)
    assert {len(each.turn_deg) for each in depends.influence} == {8}
    printed = io.StringIO()
    show(Console(file=printed, width=100), analysis, None, depends)
    assert "the axes turn most without F" in printed.getvalue()


def _earthquakes(axes, seed):
    rng = np.random.default_rng(seed)
    side = np.where(rng.random(6) < 0.5, 1.0, -1.0)[:, None]
    normals = 0.5 * axes[0] + side * np.sqrt(0.75) * axes[2] + 0.15 * rng.normal(size=(6, 3))
    normals /= np.linalg.norm(normals, axis=1)[:, None] * np.where(normals[:, 2:] < 0, -1, 1)
    strikes, dips = strike_dip_deg(normals)
    rakes = rakes_deg(normals, resolved_slip(reduced_tensor(axes, 0.5), normals))
    return tuple(Mechanism(f"Q{k}", (np.nan,) * 3, (tuple(map(float, row)),)) for k, row in enumerate(zip(strikes, dips, rakes)))
