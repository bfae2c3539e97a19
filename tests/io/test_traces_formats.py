"""Traces and sticks in GeoPackages and Shapefiles: the same network through each gives the same answer; what is damaged is refused.

GDAL (through pyogrio) writes the files, as a second opinion on what they should hold.
"""

from __future__ import annotations

import json
import shutil
import sqlite3
import sys
import warnings
import zipfile

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.errors import FormatError, InputError, StructvizError
from structviz.io import read_model
from structviz.orientation.vectors import axial_angle_deg

pyogrio = pytest.importorskip("pyogrio")
shapely = pytest.importorskip("shapely")

SHORT = {"upper_depth_km": "upper_km", "lower_depth_km": "lower_km", "dip_direction": "dip_direct"}
NAMES = ("name", "dip_deg", "dip_direction", "rake_deg", "upper_depth_km", "lower_depth_km")


def network(count=12):
    """Traces of a small conjugate network, as (properties, line)."""
    draw = np.random.default_rng(5)
    found = []
    for k in range(count):
        east, azimuth = k % 2, 10.0 + draw.normal(0, 6)
        middle = np.array([15.0 + 0.05 * (k % 4), 47.0 + 0.06 * (k // 4)])
        along = 0.02 * np.array([np.sin(np.radians(azimuth)) * 1.46, np.cos(np.radians(azimuth))])
        line = middle + np.array([-1, 0.1, 1])[:, None] * along
        own = (f"Störung {k}", 58.0 + draw.integers(8), (azimuth + (90 if east else 270)) % 360, -90.0 if k != 3 else 90.0, 0.5, 9.0)
        found.append((dict(zip(NAMES, own)), line))
    return found


def as_geojson(path, rows):
    features = [
        {"type": "Feature", "properties": own, "geometry": {"type": "LineString", "coordinates": line.tolist()}} for own, line in rows
    ]
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}))
    return path


def as_gdal(path, rows, crs="EPSG:4326", layer=None, kind=None, **options):
    """The rows written by GDAL, in its own words for fields of ten letters."""
    cut = path.suffix == ".shp"
    keys = list(dict.fromkeys(key for own, _ in rows for key in own))
    columns = [np.array([own.get(key) for own, _ in rows]) for key in keys]
    shapes = shapely.to_wkb(np.array([line if line is None else shapely.LineString(line) for _, line in rows], object))
    kind = kind or ("LineString Z" if any(line is not None and np.shape(line)[1] == 3 for _, line in rows) else "LineString")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        pyogrio.raw.write(
            path,
            shapes,
            columns,
            [SHORT.get(key, key) if cut else key for key in keys],
            geometry_type=kind,
            crs=crs,
            layer=layer,
            **options,
        )
    return path


def zipped(path):
    with zipfile.ZipFile(path.with_suffix(".zip"), "w", zipfile.ZIP_DEFLATED) as archive:
        for part in sorted(path.parent.glob(f"{path.stem}.*")):
            if part.suffix != ".zip":
                archive.write(part, f"folder/{part.name}")
    return path.with_suffix(".zip")


def told_of(model):
    return " | ".join(f"{finding.subject}: {finding.message}" for finding in model.findings)


@pytest.fixture(scope="module")
def files(tmp_path_factory):
    folder = tmp_path_factory.mktemp("network")
    rows = network()
    found = {"geojson": as_geojson(folder / "n.geojson", rows), "gpkg": as_gdal(folder / "n.gpkg", rows)}
    found["shp"] = as_gdal(folder / "n.shp", rows, encoding="UTF-8")
    found["zip"] = zipped(found["shp"])
    return found


def test_the_same_network_gives_the_same_answer(files):
    analyses = {key: run(read_model(path), Settings(replicates=100)) for key, path in files.items()}
    plain = analyses.pop("geojson")
    assert len(plain.regimes) == 1
    for other in analyses.values():
        assert [r.fault.name for r in other.faults] == [r.fault.name for r in plain.faults]
        assert [r.verdict.word for r in other.faults] == [r.verdict.word for r in plain.faults]
        assert axial_angle_deg(other.regimes[0].axes, plain.regimes[0].axes).max() < 0.01


def test_every_part_is_hashed_and_what_was_taken_is_told(files):
    model = read_model(files["shp"])
    assert [entry.path for entry in model.inputs] == ["n.cpg", "n.dbf", "n.prj", "n.shp", "n.shx"]
    assert "dip_direction from dip_direct" in told_of(model)
    assert "upper_depth_m from upper_km (km)" in told_of(model)
    assert "projected to UTM zone 33" in told_of(model)
    assert [entry.path for entry in read_model(files["zip"]).inputs] == ["n.zip"]


def test_other_systems_are_honoured(tmp_path, files):
    from pyproj import Transformer

    plain = read_model(files["geojson"])
    turned = Transformer.from_crs("EPSG:4326", "EPSG:32633", always_xy=True)
    rows = [(own, np.stack(turned.transform(*line.T), 1)) for own, line in network()]
    for name in ("p.gpkg", "p.shp"):
        model = read_model(as_gdal(tmp_path / name, rows, crs="EPSG:32633"))
        assert model.crs == "EPSG:32633"
        for one, other in zip(model.faults, plain.faults):
            assert one.surface.vertices == pytest.approx(other.surface.vertices, abs=1e-5)
    (tmp_path / "p.prj").unlink()
    with pytest.raises(FormatError, match=r"(?s)without a reference system.*Shapefile: \.prj"):
        read_model(tmp_path / "p.shp")


def test_degrees_without_a_system_are_taken_as_such_and_told(tmp_path):
    path = as_gdal(tmp_path / "n.shp", network())
    (tmp_path / "n.prj").unlink()
    assert "no reference system is named: coordinates taken as longitude and latitude" in told_of(read_model(path))


def test_layers_of_a_geopackage_are_read_together_or_by_name(tmp_path):
    rows, path = network(), tmp_path / "two.gpkg"
    as_gdal(path, rows[:5], layer="north")
    as_gdal(path, rows[5:], layer="south", crs="EPSG:4258", append=True)
    as_gdal(path, [({"name": "X"}, None)], layer="nothing", kind="Point", append=True)
    model = read_model(path)
    assert len(model.faults) == 12
    assert model.faults[0].surface.source == "two.gpkg#north/1"
    assert "in different reference systems (longitude and latitude, EPSG:4258)" in told_of(model)
    part = read_model(f"{path}#south")
    assert (part.title, len(part.faults)) == ("south", 7)
    with pytest.raises(FormatError, match="no layer of lines 'west'; wanted 'north', 'south'"):
        read_model(f"{path}#west")


def test_properties_choose_and_empty_shapes_are_passed_over(tmp_path):
    rows = [({**own, "zone": float(k % 3)}, None if k == 5 else line) for k, (own, line) in enumerate(network())]
    for name in ("n.gpkg", "n.shp"):
        path = as_gdal(tmp_path / name, rows)
        model = read_model(path, where={"zone": "2"})
        assert len(model.faults) == 3
        assert "1 features left out, no lines with properties" in told_of(model)


def test_names_cut_short_by_the_table_are_not_guessed(tmp_path):
    rows = [({"name": own["name"], "DIP": 60, "dip_dir": 90, "upper_dept": 0.5, "lower_dept": 9.0}, line) for own, line in network()]
    model = read_model(as_gdal(tmp_path / "n.shp", rows))
    assert "upper_dept is cut short, so that its unit is lost: not used" in told_of(model)
    assert "dip_deg from DIP" in told_of(model)
    assert model.faults[0].surface.vertices[:, 2].min() == pytest.approx(-15_000.0)


def test_faults_of_one_name_are_made_distinct_and_told(tmp_path):
    rows = [({**own, "name": "A"}, line) for own, line in network(3)]
    model = read_model(as_gdal(tmp_path / "n.gpkg", rows))
    assert [fault.name for fault in model.faults] == ["A", "A (2)", "A (3)"]
    assert "2 traces with the name of another, told apart as A (2), A (3)" in told_of(model)


def test_a_folder_of_lines_is_one_model(tmp_path):
    rows = network()
    as_geojson(tmp_path / "a.geojson", rows[:4])
    as_gdal(tmp_path / "b.gpkg", rows[4:8])
    as_gdal(tmp_path / "c.shp", rows[8:])
    assert len(read_model(tmp_path).faults) == 12
    assert len(read_model(tmp_path, where={"name": rows[9][0]["name"]}).faults) == 1
    (tmp_path / "mesh.off").write_text("OFF\n3 1 0\n0 0 0\n1 0 -1\n0 1 0\n3 0 1 2\n")
    assert "traces beside the meshes are not read: a.geojson, b.gpkg, c.shp" in told_of(read_model(tmp_path))


def sticks(count=7):
    """Sticks down a fault that dips 60 degrees to the east, 2 km apart."""
    down = np.linspace(0, 4000, 6)
    return [np.stack([5e5 + down / np.tan(np.radians(60)), np.full(6, 5e6 + 2000.0 * k), -down], 1) for k in range(count)]


@pytest.mark.parametrize("name", ["s.geojson", "s.gpkg", "s.shp", "s.csv"])
def test_sticks_that_share_a_fault_are_lofted(tmp_path, name):
    own = {"fault": "Long Fault", "sense": "normal"}
    lines = sticks()
    lines[3] = lines[3][::-1]
    rows, path = [({**own, "name": f"pick {k}"}, line) for k, line in enumerate(lines)], tmp_path / name
    if name == "s.geojson":
        as_geojson(path, rows)
        crs = {"type": "name", "properties": {"name": "EPSG:32633"}}
        path.write_text(json.dumps({**json.loads(path.read_text()), "crs": crs}))
    elif name == "s.csv":
        body = [f"Long Fault,{k},{e!r},{n!r},{u!r},normal" for k, line in enumerate(lines) for e, n, u in line.tolist()]
        path.write_text("\n".join(["fault,stick,easting,northing,up,sense", *body]))
    else:
        as_gdal(path, rows, crs="EPSG:32633")
    model = read_model(path)
    fault = model.faults[0]
    assert (fault.name, len(model.faults), fault.declared.rake_deg) == ("Long Fault", 1, -90.0)
    measured = run(model, Settings(replicates=100)).faults[0].measured
    assert (measured.dip_deg, measured.strike_deg % 360) == (pytest.approx(60.0), pytest.approx(0.0, abs=1e-3))
    assert "lofted between sticks: 7 for each, 2,000 m apart" in told_of(model)
    assert "Long Fault: 1 of its sticks run against the others and were turned" in told_of(model)


def test_depths_among_heights_are_suspected(tmp_path):
    rows = [({"fault": "A"}, line * [1, 1, -1]) for line in sticks()]
    assert "no stick lies below zero" in told_of(read_model(as_gdal(tmp_path / "s.gpkg", rows, crs="EPSG:32633")))


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("fault,stick,easting,northing,up\nA,1,0,0,x\n", "up 'x'; wanted a number"),
        ("fault,stick,easting,northing\nA,1,0,0\n", "found no up"),
        ("fault,stick,easting,northing,up\nA,,0,0,0\n", "found no stick"),
        ("fault,stick,easting,northing,up,sense\nA,1,0,0,0,normal\nA,1,0,0,1,reverse\n", "sense 'reverse'; wanted 'normal'"),
        ("fault,stick,easting,up\nA,1,0,0\n", "column 'northing'"),
        ("fault,stick,easting,northing,up\nA,1,0,0,0\nA,1,0,0,1\n", "1 stick that can be used"),
    ],
)
def test_tables_of_sticks_that_cannot_be_used_are_refused(tmp_path, text, told):
    (tmp_path / "s.csv").write_text(text)
    with pytest.raises(InputError, match=told):
        read_model(tmp_path / "s.csv")


def test_what_is_not_whole_or_of_another_kind_is_refused(tmp_path, files):
    def damaged(suffix, change, told):
        folder = tmp_path / "damaged"
        shutil.rmtree(folder, ignore_errors=True)
        folder.mkdir()
        for part in files["shp"].parent.glob("n.*"):
            shutil.copy(part, folder)
        victim = folder / f"n{suffix}"
        content = change(victim.read_bytes())
        victim.unlink() if content is None else victim.write_bytes(content)
        main = folder / ("n.shp" if suffix in (".shp", ".shx", ".dbf", ".cpg") else f"n{suffix}")
        with pytest.raises(FormatError, match=told):
            read_model(main)

    damaged(".shp", lambda content: content[:-40], "bytes where its header says")
    damaged(".shx", lambda content: None, "no .shx beside it")
    damaged(".dbf", lambda content: content[:-200], "a table of 12 rows")
    damaged(".dbf", lambda content: b"", "a table of 0 rows")
    damaged(".shp", lambda content: content[:32] + b"\5" + content[33:], "shapes of type 5")
    damaged(".gpkg", lambda content: content[: len(content) // 2], "database")
    damaged(".gpkg", lambda content: b"<OGRVRTDataSource/>", "content of another kind; wanted a GeoPackage")
    damaged(".zip", lambda content: content[:-100], "ZIP archive that cannot be read")


def test_a_table_made_up_elsewhere_is_refused(tmp_path):
    path = as_gdal(tmp_path / "n.gpkg", network())
    with sqlite3.connect(path) as base:
        base.execute("PRAGMA writable_schema=ON")
        base.execute("INSERT INTO sqlite_master VALUES('table', 'x', 'x', 0, 'CREATE VIRTUAL TABLE x USING VirtualOGR(''/etc/passwd'')')")
    base.close()
    with pytest.raises(FormatError, match=r"a table 'x' that is made up elsewhere|cannot be read"):
        read_model(path)


@pytest.mark.parametrize("key", ["gpkg", "shp", "zip"])
def test_mutated_files_are_read_or_refused(tmp_path, files, key):
    draw = np.random.default_rng(8)
    parts = [part for part in files["shp"].parent.glob("n.*") if part.suffix in {"shp": (".shp", ".shx", ".dbf")}.get(key, (f".{key}",))]
    outcomes = {"read": 0, "refused": 0}
    for part in files["shp"].parent.glob("n.*"):
        shutil.copy(part, tmp_path)
    for _ in range(40):
        victim = parts[draw.integers(len(parts))]
        content = bytearray(victim.read_bytes())
        for _ in range(draw.integers(1, 5)):
            content[draw.integers(len(content))] = draw.integers(256)
        (tmp_path / victim.name).write_bytes(content)
        try:
            model = read_model(tmp_path / f"n.{key}")
        except InputError as error:
            outcomes["refused" if error.hint else "refused without a hint"] += 1
        else:
            outcomes["read"] += all(np.isfinite(fault.surface.vertices).all() for fault in model.faults)
        shutil.copy(victim, tmp_path)
    assert sum(outcomes.values()) == 40


def test_a_missing_library_is_named(files, monkeypatch):
    monkeypatch.setitem(sys.modules, "pyogrio", None)
    with pytest.raises(StructvizError, match=r"(?s)need pyogrio.*pip install 'structviz\[formats\]'"):
        read_model(files["gpkg"])


@pytest.mark.parametrize("source", ["nshm23_sections/NSHM23_FSD_v3.geojson", "malawi_rift/MSSM_faults.geojson"])
def test_published_catalogues_come_through_unchanged(shared_data, tmp_path, source):
    where = {"PrimState": "NV"} if "nshm" in source else {}
    plain = read_model(shared_data / source, where=where)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        meta, _, shapes, columns = pyogrio.raw.read(shared_data / source)
        for suffix in ("gpkg", "shp"):
            path = tmp_path / f"n.{suffix}"
            pyogrio.raw.write(path, shapes, columns, meta["fields"], geometry_type=meta["geometry_type"], crs=meta["crs"])
            model = read_model(path, where=where)
            assert [fault.name for fault in model.faults] == [fault.name for fault in plain.faults]
            assert [fault.declared for fault in model.faults] == [fault.declared for fault in plain.faults]
            for one, other in zip(model.faults, plain.faults):
                assert one.surface.vertices == pytest.approx(other.surface.vertices, abs=1e-6)
