"""results.json: keys, schema, rounding, the same bytes twice."""

from __future__ import annotations

import json
from dataclasses import asdict, replace

import jsonschema
import numpy as np
import pytest

from structviz.analysis import Analysis, run
from structviz.model import FaultModel, Finding
from structviz.report.results_json import azimuth, origin_m, rake, results, results_text, rounded, schema
from structviz.stress.verdict import Verdict

from .conftest import QUICK

KEYS = {
    "": "schema structviz model settings cautions faults pairs regimes findings",
    "model": "title crs origin inputs",
    "fault": "name parts triangles area_m2 strike_deg dip_deg declared verdict conflict_probability misfit_deg predicted_rake_deg "
    "slip_tendency reasons causes",
    "pair": "faults acute_deg kind weight sigma1 sigma2 sigma3",
    "regime": "sigma1 sigma2 sigma3 class shmax_deg shape_ratio weight",
    "finding": "check severity subject message evidence hint",
}


def validated(text: str) -> dict:
    """Return the parsed text after the schema has passed it; NaN and Infinity, which JSON lacks, are refused."""
    held = json.loads(text, parse_constant=lambda word: pytest.fail(f"{word} is no JSON"))
    jsonschema.Draft202012Validator(schema()).validate(held)
    return held


def test_the_schema_itself_is_valid() -> None:
    jsonschema.Draft202012Validator.check_schema(schema())


def test_results_pass_the_schema_and_keep_the_agreed_keys(analysis: Analysis) -> None:
    held = validated(results_text(analysis))
    assert held["schema"] == 1
    samples = {"": held, "model": held["model"]}
    samples |= {name: held[f"{name}s"][0] for name in ("fault", "pair", "regime", "finding")}
    for place, keys in KEYS.items():
        assert set(keys.split()) <= set(samples[place]), place
    assert {"trend_deg", "plunge_deg", "cone_deg"} <= set(held["regimes"][0]["sigma1"])


def test_the_schema_refuses_what_it_should(analysis: Analysis) -> None:
    for change in ({"schema": 2}, {"cautions": []}, {"faults": [{}]}, {"regimes": [{"class": "fast"}]}):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate({**results(analysis), **change}, schema())


def test_a_model_without_stress_has_results_too(no_stress: Analysis) -> None:
    held = validated(results_text(no_stress))
    assert held["regimes"] == []
    assert {fault["verdict"] for fault in held["faults"]} == {"undetermined"}
    assert held["faults"][0]["conflict_probability"] is None


def test_the_same_analysis_gives_the_same_bytes(analysis: Analysis, model: FaultModel) -> None:
    assert results_text(analysis) == results_text(run(model, QUICK))


def test_names_and_settings_come_back_as_given(analysis: Analysis) -> None:
    held = json.loads(results_text(analysis))
    assert [fault["name"] for fault in held["faults"]] == [result.fault.name for result in analysis.faults]
    assert held["settings"] == asdict(analysis.settings)
    assert held["model"]["crs"] == "EPSG:25831"
    assert sum(held["summary"].values()) == len(held["faults"])


def test_values_are_those_of_the_analysis(analysis: Analysis) -> None:
    held = json.loads(results_text(analysis))
    for row, result in zip(held["faults"], analysis.faults):
        assert row["area_m2"] == pytest.approx(result.measured.area_m2, rel=1e-6)
        assert row["misfit_deg"] == (None if result.verdict.misfit_deg is None else pytest.approx(result.verdict.misfit_deg, abs=0.01))
    for row, axes in zip(held["pairs"], analysis.pairs.axes):
        trend, plunge = np.radians(row["sigma1"]["trend_deg"]), np.radians(row["sigma1"]["plunge_deg"])
        vector = np.array([np.sin(trend) * np.cos(plunge), np.cos(trend) * np.cos(plunge), -np.sin(plunge)])
        assert abs(vector @ axes[0]) == pytest.approx(1, abs=1e-6)


def test_what_is_not_finite_becomes_null(analysis: Analysis) -> None:
    strange = Verdict("undetermined", float("nan"), float("inf"), float("nan"), None, float("nan"), ("?",))
    finding = Finding("import", "note", "model", "text", (("ratio", float("inf")), ("count", 3), ("word", "x")))
    changed = replace(analysis, faults=(replace(analysis.faults[0], verdict=strange), *analysis.faults[1:]), findings=(finding,))
    held = validated(results_text(changed))
    assert held["faults"][0]["misfit_deg"] is None
    assert held["findings"][0]["evidence"] == {"ratio": None, "count": 3, "word": "x"}


@pytest.mark.parametrize(("value", "want"), [(359.999, 0.0), (-0.001, 0.0), (12.345, 12.35), (None, None), (float("nan"), None)])
def test_azimuths_stay_below_a_full_turn(value: float | None, want: float | None) -> None:
    assert azimuth(value) == (want if want != 12.35 else pytest.approx(want, abs=0.011))


def test_rounding_gives_no_minus_zero_and_no_minus_180() -> None:
    assert str(rounded(-0.0001, 2)) == "0.0"
    assert rake(-179.999) == 180.0


def test_the_origin_is_the_middle_in_whole_metres(model: FaultModel) -> None:
    corners = np.concatenate([fault.surface.vertices for fault in model.faults])
    assert np.abs(np.array(origin_m(model)) - (corners.min(0) + corners.max(0)) / 2).max() <= 0.5
