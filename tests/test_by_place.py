"""A stress that turns across the model: told, written as a field, and followed by the verdicts part by part."""

from __future__ import annotations

import json

import numpy as np
import pytest
import pyvista as pv

from structviz.analysis import Settings, run
from structviz.report.write import write_outputs
from structviz.synthetic import phased_model, random_model
from structviz.synthetic.turning import turning_model

QUICK = Settings(replicates=200)


@pytest.fixture(scope="module")
def turning():
    return run(turning_model(60.0, 80, planted=2, random_state=5).model, QUICK)


def test_a_turning_stress_is_told_and_judged_by_parts(turning):
    assert turning.answer.by == "place"
    assert len(turning.regimes) == 2
    assert [regime.name for regime in turning.regimes] == ["part 1", "part 2"]
    assert "regime-not-uniform" in {finding.check for finding in turning.findings}
    assert turning.by_place.turn.turn_deg > 30.0
    known = turning_model(60.0, 80, planted=2, random_state=5)
    assert {result.fault.name for result in turning.conflicting} == set(known.flipped)


def test_one_stress_is_left_whole_and_phases_are_phases():
    one = run(random_model("normal", planted=2, triangles=60, random_state=4).model, QUICK)
    assert one.by_place is not None
    assert np.isinf(one.by_place.bandwidth.radius_m)
    assert "regime-not-uniform" not in {finding.check for finding in one.findings}
    two = run(phased_model(("normal", "strike-slip"), (0.0, 60.0), triangles=60, random_state=11).model, QUICK)
    assert (two.answer.by, len(two.regimes)) == ("phase", 2)


def test_the_field_is_written_with_tensors_that_other_readers_open(turning, tmp_path):
    written = write_outputs(turning, tmp_path / "out", pictures=False, page=False, field=True)
    assert {"field.vti", "trajectories.vtp"} <= set(written.files)
    grid = pv.read(tmp_path / "out" / "field.vti")
    tensors = np.asarray(grid["reduced_stress"]).reshape(-1, 3, 3)
    known = np.asarray(grid["supported"]).astype(bool)
    np.testing.assert_allclose(np.trace(tensors[known], axis1=1, axis2=2), 1.5)
    assert np.isnan(tensors[~known]).all()
    assert pv.read(tmp_path / "out" / "trajectories.vtp").n_lines > 3
    told = json.loads((tmp_path / "out" / "results.json").read_text())["by_place"]
    assert len(told["domains"]) == 2
    assert len(told["domain_of_fault"]) == 80


def test_few_faults_have_no_field_and_the_reason_is_told(tmp_path):
    few = run(random_model("normal", faults=8, conjugate=6, planted=0, triangles=60, random_state=4).model, QUICK)
    written = write_outputs(few, tmp_path / "out", pictures=False, page=False, field=True)
    assert any("no field was written" in reason for reason in written.skipped)
