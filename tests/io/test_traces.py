"""Traces from GeoJSON: what is taken, what is told, what is refused; and two published catalogues."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.cli.main import entry
from structviz.errors import FormatError, InputError, TableError
from structviz.io import read_model
from structviz.kinematics.declared import usable_sector
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
    with pytest.raises(InputError, match=r"for an input without any; wanted traces: GeoJSON"):
        read_model(Path(__file__).parents[2] / "meshes" / "faults.csv", where={"state": "Z"})


def test_traces_without_a_dip_or_a_side_are_left_out_and_named(tmp_path):
    lame = [{**A, "name": "C", "dip_deg": None}, {**A, "name": "D", "dip_direction": ""}]
    model = read_model(written(tmp_path, collection(A, *lame)))
    assert [fault.name for fault in model.faults] == ["A"]
    told = [finding.message for finding in model.findings if finding.severity == "warning"]
    assert any("1 trace left out, without a dip: C" in text for text in told)
    assert any("1 trace left out, without a dip direction: D" in text for text in told)


def test_projected_coordinates_are_taken_where_the_file_names_their_system(tmp_path):
    lines = [[[5e5, 5e6], [5e5, 5.01e6]]]
    crs = {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::25833"}}
    model = read_model(written(tmp_path, collection(A, lines=lines, crs=crs)))
    assert model.crs == "EPSG:25833"
    assert model.faults[0].surface.vertices[:, 0].min() == pytest.approx(5e5 + 1000 / np.tan(np.radians(60)))
    with pytest.raises(FormatError, match="without a reference system; wanted longitude and latitude"):
        read_model(written(tmp_path, collection(A, lines=lines)))


NORTH = [[15.0, 47.0], [15.0, 47.1]]


def told_of(model):
    return " | ".join(finding.message for finding in model.findings)


def in_system(name):
    return {"type": "name", "properties": {"name": name}}


def test_degrees_of_another_datum_are_degrees(tmp_path):
    model = read_model(written(tmp_path, collection(A, lines=[NORTH], crs=in_system("urn:ogc:def:crs:EPSG::4269"))))
    plain = read_model(written(tmp_path, collection(A, lines=[NORTH])))
    assert "longitude and latitude of EPSG:4269 projected to UTM zone 33" in told_of(model)
    assert np.abs(model.faults[0].surface.vertices - plain.faults[0].surface.vertices).max() < 5.0


def test_feet_become_metres_and_it_is_told(tmp_path):
    model = read_model(written(tmp_path, collection(A, lines=[[[6e6, 2e6], [6e6, 2.1e6]]], crs=in_system("EPSG:2227"))))
    assert np.ptp(model.faults[0].surface.vertices[:, 1]) == pytest.approx(1e5 * 1200 / 3937, rel=1e-9)
    assert "from US survey foot into metres" in told_of(model)
    assert model.crs == "EPSG:2227, in metres"


def test_traces_either_side_of_the_antimeridian_lie_together(tmp_path):
    lines = [[[179.95, -40.0], [179.95, -40.1]], [[-179.95, -40.0], [-179.95, -40.1]], [[179.99, -40.0], [-179.99, -40.1]]]
    model = read_model(written(tmp_path, collection(A, {**A, "name": "B"}, {**A, "name": "C"}, lines=lines)))
    first, second, crossing = (fault.surface.vertices[:, 0] for fault in model.faults)
    assert second.min() - first.min() == pytest.approx(8532.0, abs=15.0)  # 0.1 deg of longitude at 40 deg south, on the ellipsoid
    assert first.min() < crossing.min() < second.min()
    assert "across the antimeridian" in told_of(model)


@pytest.mark.parametrize(
    ("extra", "lines", "told"),
    [
        ({"crs": in_system("EPSG:999999")}, [NORTH], "EPSG:999999, which is not known"),
        ({"crs": in_system("my own grid")}, [NORTH], "a reference system named 'my own grid'; wanted EPSG:code"),
        ({"crs": in_system("EPSG:4978")}, [NORTH], "no map projection"),
        ({}, [[[-60.0, 10.0], [-60.0, 11.0]], [[60.0, 10.0], [60.0, 11.0]]], "120 deg of longitude; wanted 40 deg at most"),
    ],
)
def test_places_that_no_plane_holds_are_refused(tmp_path, extra, lines, told):
    with pytest.raises(FormatError, match=told):
        read_model(written(tmp_path, collection(*[A] * len(lines), lines=lines, **extra)))


def test_a_side_along_the_trace_is_no_side(tmp_path):
    """Which of the two sides would be drawn lots for: a dip to the north of a trace that runs north."""
    model = read_model(written(tmp_path, collection(A, {**A, "name": "B", "dip_direction": "N"}, lines=[NORTH, NORTH])))
    assert [fault.name for fault in model.faults] == ["A"]
    assert "1 trace left out, with a dip direction along the trace: B" in told_of(model)
    model = read_model(written(tmp_path, collection({**A, "dip_direction": 30}, lines=[NORTH])))
    assert "1 trace with a dip direction over 45 deg off, drawn across the chord: A" in told_of(model)
    with pytest.raises(FormatError, match=r"no trace that can be used \(1 with a dip direction along the trace\)"):
        read_model(written(tmp_path, collection({**A, "dip_direction": 355}, lines=[NORTH])))


def test_parts_of_a_trace_dip_to_one_side(tmp_path):
    """A part that runs the way the whole dips would be drawn to either side, by its own."""
    tree = collection({**A, "dip_direction": "E"}, lines=[[[[15.0, 47.0], [15.0, 47.2]], [[15.01, 47.21], [15.06, 47.208]]]])
    tree["features"][0]["geometry"]["type"] = "MultiLineString"
    vertices = read_model(written(tmp_path, tree)).faults[0].surface.vertices
    ends = vertices[vertices[:, 2] == -9000.0]
    starts = vertices[vertices[:, 2] == -1000.0]
    assert ends[:, 0].max() > starts[:, 0].max()
    assert ends[:, 1].min() < starts[:, 1].max()


@pytest.mark.parametrize(
    ("side", "rake", "word", "down"),
    [("E", -90, "normal", "E"), ("W", -90, "normal", "W"), ("W", 90, "reverse", "E"), ("E", -135, "dextral-normal", "E")],
)
def test_the_side_named_of_a_vertical_trace_is_kept(tmp_path, side, rake, word, down):
    own = {"name": "V", "dip": 90, "dip_dir": side, "rake": rake}
    fault = read_model(written(tmp_path, collection(own, lines=[NORTH]))).faults[0]
    assert set(fault.declared.words) == set(word.split("-"))
    assert fault.down_side == down
    found = measure(fault.surface)
    # Whichever wall the surface calls the hanging one: the side named went down, or the other one for a reverse fault.
    usable, _ = usable_sector(fault.declared, fault.down_side, found.normal, found.dip_deg)
    east_hangs = found.normal[0] > 0
    assert ("normal" in usable.words) == ((down == "E") == east_hangs)


def test_dip_slip_on_a_vertical_trace_without_a_side_is_not_guessed(tmp_path):
    for rake, left in ((-90, None), (-135, "dextral"), (20, "rake 0"), (180, "rake 180")):
        own = {"name": "V", "dip": 90, "dip_dir": "Vertical", "rake": rake}
        fault = read_model(written(tmp_path, collection(own, lines=[NORTH]))).faults[0]
        found = measure(fault.surface)
        usable, _ = usable_sector(fault.declared, fault.down_side, found.normal, found.dip_deg)
        assert (usable.text if usable else None) == left


def test_what_was_taken_is_told_for_every_name_and_doubt(tmp_path):
    both = {**A, "name": "C", "dip": 30, "upper_depth_m": 500, "rake": 90}
    told = told_of(read_model(written(tmp_path, collection(A, B, both))))
    assert "dip_deg from dip_deg (2) and DipDeg (1)" in told
    assert "upper_depth_m from upper_depth_km (km) (1) and UpDepth (km) (1) and upper_depth_m (1)" in told
    assert "1 of 3 traces give dip_deg as dip_deg and dip; dip_deg is used" in told
    assert "1 trace with a rake that belies the sense, the rake used: C" in told


def test_names_stay_apart(tmp_path):
    names = ["A", "A (3)", "A", "A"]
    model = read_model(written(tmp_path, collection(*[{**A, "name": name} for name in names])))
    assert len({fault.name for fault in model.faults}) == 4
    assert all(fault.name == fault.surface.name for fault in model.faults)


def test_heights_lift_the_surface(tmp_path):
    model = read_model(written(tmp_path, collection(A, lines=[[[15.0, 47.0, 800.0], [15.0, 47.1, 800.0]]])))
    assert model.faults[0].surface.vertices[:, 2].max() == pytest.approx(-200.0)
    assert "heights, which 1 features have, are taken as metres" in told_of(model)


def test_a_value_with_a_comma_can_be_chosen(tmp_path):
    path = written(tmp_path, collection({**A, "name": "Low (south, old)"}, B))
    assert [fault.name for fault in read_model(path, where={"name": "Low (south, old)"}).faults] == ["Low (south, old)"]


def test_a_plain_json_suffix_will_do(tmp_path):
    path = tmp_path / "traces.json"
    path.write_text(json.dumps(collection(A)))
    assert len(read_model(path).faults) == 1


PIECES = [None, True, "", "x", -1, 0, 1e308, 90, [], {}, "NaN", [[]], "Vertical", [[1e308, 1], [1, 2]], [[5, 5], [5, 5]]]


@pytest.mark.parametrize("seed", range(6))
def test_damaged_features_are_refused_or_left_out_never_a_traceback(tmp_path, seed):
    draw = np.random.default_rng(seed)
    outcomes = set()
    for _ in range(60):
        tree = json.loads(json.dumps(collection(A, B, {**A, "name": "C"})))
        feature = tree["features"][draw.integers(3)]
        part = [feature, feature["properties"], feature["geometry"]][draw.integers(3)]
        part[list(part)[draw.integers(len(part))]] = PIECES[draw.integers(len(PIECES))]
        try:
            model = read_model(written(tmp_path, tree))
        except InputError as error:
            outcomes.add("refused" if error.hint else "refused without a hint")
        else:
            finite = all(np.isfinite(fault.surface.vertices).all() for fault in model.faults)
            outcomes.add("read" if finite else "read, not finite")
    assert outcomes == {"read", "refused"}


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
