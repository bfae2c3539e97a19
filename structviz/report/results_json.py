"""results.json, schema 1: the whole analysis as text. The same analysis gives the same bytes."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import asdict
from importlib.resources import files
from typing import Any

import numpy as np

from structviz.analysis import Analysis, ByPlace, FaultResult
from structviz.kinematics.senses import Sector, describe_rake
from structviz.model import FaultModel, Finding
from structviz.orientation.lines import trend_plunge_deg
from structviz.scenarios import Sensitivity
from structviz.stress.compare import Comparison
from structviz.stress.regime import Reading, Regime
from structviz.surfaces.surface import Floats

SCHEMA = 1
AXES = ("sigma1", "sigma2", "sigma3")
Row = dict[str, Any]


def results_text(
    analysis: Analysis, *, meshes: Mapping[str, str] | None = None, outputs: Sequence[str] = (), depends: Sensitivity | None = None
) -> str:
    """Return results.json as text: metres and degrees, UTF-8, null where a number is not known.

    `meshes` gives the annotated mesh of each fault by name; `outputs` the files written beside it; `depends` what the
    verdicts depend on, where that was asked.
    """
    whole = results(analysis, meshes=meshes, outputs=outputs, depends=depends)
    return "{\n" + ",\n".join(f"{_json(key)}: {_laid_out(value)}" for key, value in whole.items()) + "\n}\n"


def results(
    analysis: Analysis, *, meshes: Mapping[str, str] | None = None, outputs: Sequence[str] = (), depends: Sensitivity | None = None
) -> Row:
    """Return the same as plain dicts and lists, in the order of the file."""
    words = [result.verdict.word for result in analysis.faults]
    return {
        "schema": SCHEMA,
        "structviz": analysis.version,
        "model": _model(analysis.model),
        "settings": asdict(analysis.settings),
        "limits": dict(analysis.limits),
        "cautions": list(analysis.cautions),
        "summary": {word: words.count(word) for word in ("consistent", "conflicting", "undetermined")},
        "faults": [_fault(result, (meshes or {}).get(result.fault.name)) for result in analysis.faults],
        "pairs": _pairs(analysis),
        "meetings": _meetings(analysis),
        "regimes": [_regime(regime) for regime in analysis.regimes],
        "by_place": _by_place(analysis.by_place),
        "readings": [_reading(reading) for reading in analysis.readings],
        "comparisons": [_comparison(each) for each in analysis.comparisons],
        "sensitivity": _sensitivity(analysis, depends),
        "findings": [_finding(finding) for finding in analysis.findings],
        "outputs": list(outputs),
    }


def schema() -> Row:
    """Return the JSON Schema (2020-12) of results.json."""
    text = files("structviz.report").joinpath("templates/results.schema.json").read_text(encoding="utf-8")
    return dict(json.loads(text))


def _json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def _laid_out(value: object) -> str:
    """Return a value as text with one line for each item of a list: read easily, and written fast by the encoder in C."""
    if not isinstance(value, list) or not value:
        return _json(value)
    return "[\n " + ",\n ".join(map(_json, value)) + "\n]"


def rounded(value: float | None, digits: int) -> float | None:
    """Return the value to so many decimals, or None where there is none or it is not finite; never minus zero."""
    return None if value is None or not math.isfinite(value) else round(float(value), digits) + 0.0


def azimuth(value: float | None, turn: float = 360.0) -> float | None:
    """Return an azimuth to two decimals within [0, turn), so that 359.999 is 0."""
    short = rounded(value, 2)
    return None if short is None else short % turn


def rake(value: float | None) -> float | None:
    """Return a rake to two decimals within (-180, 180]."""
    short = rounded(value, 2)
    return 180.0 if short == -180.0 else short


def origin_m(model: FaultModel) -> list[float]:
    """Return the middle of the model to whole metres, easting, northing, up: what to subtract before going to float32."""
    low = np.min([fault.surface.vertices.min(0) for fault in model.faults], axis=0)
    high = np.max([fault.surface.vertices.max(0) for fault in model.faults], axis=0)
    return [float(value) + 0.0 for value in np.round((low + high) / 2)]


def _model(model: FaultModel) -> Row:
    return {
        "title": model.title,
        "crs": model.crs or None,
        "origin": origin_m(model) if model.faults else [0.0, 0.0, 0.0],
        "inputs": [{"path": each.path, "sha256": each.sha256} for each in model.inputs],
        "horizons": [horizon.name for horizon in model.horizons],
        "striae": len(model.striae),
    }


def _declared(sector: Sector | None) -> Row:
    if sector is None:
        return {"sense": None, "rake_deg": None}
    return {"sense": "-".join(sector.words) or None, "rake_deg": rake(sector.rake_deg)}


def _fault(result: FaultResult, mesh: str | None) -> Row:
    measured, verdict = result.measured, result.verdict
    predicted = verdict.predicted_rake_deg
    return {
        "name": result.fault.name,
        "mesh": mesh,
        "parts": len(measured.parts),
        "triangles": len(measured.areas_m2),
        "area_m2": rounded(measured.area_m2, 1),
        "strike_deg": azimuth(measured.strike_deg) if measured.meaningful else None,
        "dip_deg": rounded(measured.dip_deg, 2) if measured.meaningful else None,
        "cone_deg": rounded(measured.cone_deg, 2) if measured.meaningful else None,
        "why_no_mean_plane": measured.why_not or None,
        "phase": result.fault.phase or None,
        "regime": result.phase,
        "membership": [rounded(value, 4) for value in result.membership],
        "down_side": result.fault.down_side or None,
        "declared": _declared(result.fault.declared),
        "tested": _declared(result.sector),
        "verdict": verdict.word,
        "conflict_probability": rounded(verdict.conflict_probability, 4),
        "misfit_deg": rounded(verdict.misfit_deg, 2),
        "predicted_rake_deg": rake(predicted),
        "predicted_rake_spread_deg": rounded(verdict.predicted_rake_spread_deg, 2),
        "predicted_sense": None if predicted is None else describe_rake(predicted),
        "slip_tendency": rounded(verdict.slip_tendency, 4),
        "reasons": list(verdict.reasons),
        "causes": [
            {"key": cause.key, "text": cause.text, "score": rounded(cause.score, 3), "next_step": cause.next_step}
            for cause in verdict.causes
        ],
    }


def _axes(axes: Floats, cones_deg: Sequence[float] = ()) -> Row:
    """Return trend and plunge of each axis, with its cone where there is one."""
    trends, plunges = trend_plunge_deg(axes)
    rows: Row = {name: {"trend_deg": azimuth(float(trends[k])), "plunge_deg": rounded(float(plunges[k]), 2)} for k, name in enumerate(AXES)}
    for name, cone in zip(AXES, cones_deg):
        rows[name]["cone_deg"] = rounded(cone, 2)
    return rows


def _meetings(analysis: Analysis) -> list[Row]:
    """Return which faults meet; where one ends on another, that one stands first."""
    names = [result.fault.name for result in analysis.faults]
    return [
        {"faults": [names[number] for number in each.surfaces], "kind": each.kind, "length_m": rounded(each.length_m, 1)}
        for each in analysis.meetings
    ]


def _pairs(analysis: Analysis) -> list[Row]:
    pairs, names = analysis.pairs, [result.fault.name for result in analysis.faults]
    trends, plunges = trend_plunge_deg(pairs.axes) if len(pairs) else (np.zeros((0, 3)), np.zeros((0, 3)))
    rows = []
    for k in range(len(pairs)):
        axes = {name: {"trend_deg": azimuth(trends[k, j]), "plunge_deg": rounded(plunges[k, j], 2)} for j, name in enumerate(AXES)}
        rows.append(
            {
                "faults": [names[number] for number in pairs.faults[k]],
                "acute_deg": rounded(pairs.acute_deg[k], 2),
                "kind": "obtuse" if pairs.obtuse[k] else "acute",
                "weight": rounded(pairs.weight[k], 4),
                **axes,
                "distance_m": rounded(pairs.distance_m[k], 1),
                "place": [rounded(value, 1) for value in pairs.places[k]],
            }
        )
    return rows


def _regime(regime: Regime) -> Row:
    ratio = regime.shape_ratio
    shown = None if ratio is None else {key: rounded(value, 3) for key, value in asdict(ratio).items()}
    return {
        **_axes(regime.axes, regime.cones_deg),
        "class": regime.kind,
        "shmax_deg": azimuth(regime.shmax_deg, 180.0),
        "shmax_half_width_deg": rounded(regime.shmax_half_width_deg, 2),
        "shape_ratio": shown,
        "weight": rounded(regime.weight, 4),
        "phase": regime.name or None,
        "faults": regime.faults,
    }


def _reading(reading: Reading) -> Row:
    return {
        "key": reading.key,
        "title": reading.title,
        "count": int(reading.count),
        "regime": None if reading.regime is None else _regime(reading.regime),
        "why_not": reading.why_not or None,
    }


def _by_place(place: ByPlace | None) -> Row | None:
    if place is None:
        return None
    turn, domains = place.turn, place.domains
    found = {
        "bandwidth_m": rounded(place.bandwidth.radius_m, 0),
        "gain_nats": rounded(place.bandwidth.gain, 2),
        "turn_deg": rounded(turn.turn_deg, 1) if turn else None,
    }
    if domains is None or domains.count < 2:
        return {**found, "domains": []}
    told = zip(domains.frames, domains.middles, np.bincount(domains.membership, minlength=domains.count))
    rows = [{**_axes(axes), "middle": [rounded(v, 0) for v in middle], "faults": int(count)} for axes, middle, count in told]
    return {**found, "domains": rows, "domain_of_fault": [int(k) for k in domains.membership]}


def _sensitivity(analysis: Analysis, depends: Sensitivity | None) -> Row | None:
    if depends is None:
        return None
    names = [result.fault.name for result in analysis.faults]
    carried = []
    for number, name in enumerate(names):
        mine = depends.influence[analysis.faults[number].phase]
        row = {"fault": name, "turn_deg": rounded(mine.turn_deg[number].max(), 2)}
        carried.append(
            {**row, "shmax_turn_deg": rounded(mine.shmax_turn_deg[number], 2), "support_nats": rounded(mine.support_nats[number], 2)}
        )
    runs = [
        {
            "key": each.key,
            "text": each.text,
            "class": each.kind or None,
            "shmax_deg": azimuth(each.shmax_deg, 180.0),
            "changed": {name: word for name, word in each.words.items() if word != depends.base.words.get(name, word)},
        }
        for each in depends.scenarios
    ]
    told = [{"fault": each.fault, "on": list(each.on), "text": each.text} for each in depends.dependences]
    return {"scenarios": runs, "dependences": told, "influence": carried, "pair_influence_deg": [rounded(v, 3) for v in depends.pair_deg]}


def _comparison(each: Comparison) -> Row:
    return {
        "with": each.key,
        "title": each.title,
        "regime": each.regime,
        "count": each.count,
        "left_out": each.left_out,
        "shmax_deg": azimuth(each.shmax_deg, 180.0),
        "shmax_uncertainty_deg": rounded(each.shmax_uncertainty_deg, 2),
        "difference_deg": rounded(each.difference_deg, 2),
        "uncertainty_deg": rounded(each.uncertainty_deg, 2),
        "word": each.word,
        "text": each.text,
    }


def _finding(finding: Finding) -> Row:
    evidence = {key: rounded(value, 6) if isinstance(value, float) else value for key, value in finding.evidence}
    return {
        "check": finding.check,
        "severity": finding.severity,
        "subject": finding.subject,
        "message": finding.message,
        "evidence": evidence,
        "hint": finding.hint,
    }
