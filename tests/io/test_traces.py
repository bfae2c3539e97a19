"""Traces from GeoJSON: what is taken, what is told, what is refused; and two published catalogues."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.cli.main import entry
from structviz.errors import FormatError, InputError, TableError
from structviz.io import read_model
from structviz.kinematics.senses import sector_of_words
from structviz.orientation.lines import trend_plunge_deg
from structviz.surfaces.measure import measure


def collection(*properties, lines=None, **extra):
    lines = lines or [[[15.0 + 0.1 * k, 47.0], [15.0 + 0.1 * k, 47.1]] for k in range(len(properties))]
    features = [
        {"type": "Feature", "properties": own, "geometry": {"type": "LineString", "coordinates": line}}
        for own, line in zip(properties, lines)
    ]
    return {"type": "FeatureCollection", "features": features, **extra}


def written(tmp_path, tree):
    path = tmp_path / "traces.geojson"
    path.write_text(tree if isinstance(tree, str) else json.dumps(tree))
    return path


A = {"name": "A", "dip_deg": 60, "dip_direction": "E", "sense": "normal", "upper_depth_km": 1, "lower_depth_km": 9, "state": "X"}
B = {"FaultName": "B", "DipDeg": 55, "DipDir": 270, "Rake": -90, "UpDepth": 0, "LowDepth": 12.0, "state": "Y"}


def test_traces_become_faults_and_what_was_taken_is_told(tmp_path):
    model = read_model(written(tmp_path, collection(A, B)))
    assert [fault.name for fault in model.faults] == ["A", "B"]
    assert model.crs == "EPSG:32633"
    first, second = (measure(fault.surface) for fault in model.faults)
    assert (first.dip_deg, second.dip_deg) == (pytest.approx(60.0), pytest.approx(55.0))
    assert abs((first.strike_deg + 180.0) % 360.0 - 180.0) < 1.0
    assert second.strike_deg == pytest.approx(180.0, abs=1.0)
    assert model.faults[0].surface.vertices[:, 2].max() == pytest.approx(-1000.0)
    assert model.faults[1].surface.vertices[:, 2].min() == pytest.approx(-12_000.0)
    assert [fault.declared.rake_deg for fault in model.faults] == [-90.0, -90.0]
    told = " ".join(finding.message for finding in model.findings)
    assert "dip_deg from dip_deg" in told
    assert "UTM zone 33" in told
    assert "grid north" in told


def test_properties_choose_traces(tmp_path):
    path = written(tmp_path, collection(A, B))
    assert [fault.name for fault in read_model(path, where={"state": "Y"}).faults] == ["B"]
    assert len(read_model(path, where={"state": "X,Y"}).faults) == 2
    with pytest.raises(FormatError, match="found no lines with state=Z"):
        read_model(path, where={"state": "Z"})
    with pytest.raises(InputError, match=r"for an input without any; wanted GeoJSON traces"):
        read_model(tmp_path, where={"state": "Z"})


def test_traces_without_a_dip_or_a_side_are_left_out_and_named(tmp_path):
    lame = [{**A, "name": "C", "dip_deg": None}, {**A, "name": "D", "dip_direction": ""}]
    model = read_model(written(tmp_path, collection(A, *lame)))
    assert [fault.name for fault in model.faults] == ["A"]
    told = [finding.message for finding in model.findings if finding.severity == "warning"]
    assert any("without a dip were left out: C" in text for text in told)
    assert any("without a dip direction were left out: D" in text for text in told)


def test_projected_coordinates_are_taken_where_the_file_names_their_system(tmp_path):
    lines = [[[5e5, 5e6], [5e5, 5.01e6]]]
    crs = {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::25833"}}
    model = read_model(written(tmp_path, collection(A, lines=lines, crs=crs)))
    assert model.crs == "EPSG:25833"
    assert model.faults[0].surface.vertices[:, 0].min() == pytest.approx(5e5 + 1000 / np.tan(np.radians(60)))
    with pytest.raises(FormatError, match="without a reference system; wanted longitude and latitude"):
        read_model(written(tmp_path, collection(A, lines=lines)))


@pytest.mark.parametrize(
    ("tree", "error", "told"),
    [
        ("{", FormatError, "not JSON"),
        ('{"type": "FeatureCollection", "features": [NaN]}', FormatError, "NaN, which is no JSON"),
        ("[" * 100_000, FormatError, "not JSON"),
        ({"type": "Feature"}, FormatError, "JSON of another kind"),
        ({"type": "FeatureCollection", "features": []}, FormatError, "no lines"),
        (collection({**A, "dip_deg": "steep"}), TableError, "dip_deg 'steep'; wanted a number"),
        (collection({**A, "dip_deg": 95}), TableError, "dip_deg 95; wanted 0 to 90"),
        (collection({**A, "dip_direction": "up"}), TableError, "dip direction 'up'"),
        (collection({**A, "sense": "nromal"}), TableError, "sense 'nromal'"),
        (collection(A, lines=[[[15, 47], ["x", 48]]]), FormatError, "not pairs of numbers"),
    ],
)
def test_bad_files_are_refused_with_what_was_wanted(tmp_path, tree, error, told):
    with pytest.raises(error, match=told):
        read_model(written(tmp_path, tree))


def test_check_takes_traces_and_chooses(tmp_path, capsys):
    path = str(written(tmp_path, collection(A, B)))
    assert entry(["check", path, "--where", "state=Y"]) == 0
    assert "1 fault" in capsys.readouterr().out
    assert entry(["check", path, "--where", "state"]) == 2
    assert "wanted NAME=VALUE" in capsys.readouterr().err


def sigma3_trend(regime):
    return float(trend_plunge_deg(regime.axes)[0][2]) % 180.0


@pytest.mark.parametrize("state", ["NV", "UT"])
def test_basin_and_range_extends_west_north_west(shared_data, state):
    """Zoback and Zoback (1980): extension WNW-ESE, 30 degrees allowed, since most dips and rakes of the catalogue are defaults."""
    model = read_model(shared_data / "nshm23_sections" / "NSHM23_FSD_v3.geojson", where={"PrimState": state})
    analysis = run(model, Settings(replicates=100))
    assert analysis.regimes[0].kind == "normal"
    assert abs(sigma3_trend(analysis.regimes[0]) - 112.5) <= 30.0
    lateral = [r for r in analysis.faults if r.fault.declared and abs(abs(r.fault.declared.rake_deg) - 90.0) > 60.0]
    if state == "NV":  # strike-slip sections of the west: most have too little shear, or conflict, under the normal-faulting stress
        assert sum(result.verdict.word != "consistent" for result in lateral) >= len(lateral) / 2


def test_malawi_extends_east_north_east_from_geometry_alone_and_with_senses(shared_data):
    """Williams et al. (2019): sigma3 ENE-WSW to E-W, 25 degrees allowed."""
    model = read_model(shared_data / "malawi_rift" / "MSSM_faults.geojson")
    normal = replace(model, faults=tuple(replace(fault, declared=sector_of_words("normal")) for fault in model.faults))
    for each in (model, normal):
        analysis = run(each, Settings(replicates=100))
        joint = next(reading.regime for reading in analysis.readings if reading.key == "joint")
        assert joint.kind == "normal"
        assert 67.5 - 25.0 <= sigma3_trend(joint) <= 90.0 + 25.0
    assert next(reading.regime for reading in analysis.readings if reading.key == "geometry").kind == "normal"
