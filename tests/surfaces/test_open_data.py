"""Real surfaces against what their authors published of them. Sources: SCEC Community Fault Model 7.0 (doi:10.5281/zenodo.13685611),
western Nepal fault triangles (R. Styron, CC0). They lie beside the project; see DEVELOPERS."""

import csv
import json

import numpy as np
import pytest
from scipy.spatial import cKDTree

from structviz.io import read_model
from structviz.orientation.planes import strike_dip_deg
from structviz.surfaces.geometry import areas_and_normals, middles
from structviz.surfaces.measure import measure
from structviz.surfaces.surface import Surface


def apart(first_deg, second_deg):
    """Angle between strikes taken as axes, degrees."""
    return np.abs((first_deg - second_deg + 90.0) % 180.0 - 90.0)


@pytest.mark.parametrize("region", ["mojave", "transverse_ranges"])
def test_published_strike_dip_and_area(shared_data, region):
    folder = shared_data / "california_fault_meshes" / region
    with open(folder / "faults.csv", encoding="utf-8") as file:
        published = {row["name"]: row for row in csv.DictReader(file)}
    close, single = 0, 0
    for fault in read_model(folder / "faults.csv").faults:
        found, row = measure(fault.surface), published[fault.name]
        assert found.area_m2 / 1e6 == pytest.approx(float(row["published_area_km2"]), rel=1e-3)
        if len(found.parts) > 1:
            continue
        single += 1
        # Published to whole degrees: half a degree of each difference is their rounding.
        dip_off = abs(found.dip_deg - float(row["published_dip_deg"]))
        strike_off = apart(found.strike_deg, float(row["published_strike_deg"]))
        close += dip_off <= 1.0 and strike_off <= 1.0
    assert single >= 35
    assert close >= 0.95 * single


def test_faults_of_parts_that_face_apart_have_no_mean_plane(shared_data):
    folder = shared_data / "california_fault_meshes" / "hard_cases"
    found = {fault.name: measure(fault.surface) for fault in read_model(folder / "faults.csv").faults}
    several = {name: m for name, m in found.items() if len(m.parts) > 1}
    assert len(several) >= 3
    why = {name.split("-")[3]: m.why_not for name, m in several.items()}
    assert why["Ridgecrest_ruptures"].startswith("its parts")
    assert why["Palos_Verdes_fault"].startswith("its parts")
    assert why["Rose_Canyon_fault"].startswith("its parts")
    assert why["Contra_Costa"] == ""  # nine parts of one steep plane
    crowded = {name.split("-")[3] for name, m in found.items() if len(m.condition.nonmanifold_edges)}
    assert crowded == {"Contra_Costa"}


def test_the_mean_published_is_the_vector_mean(shared_data):
    """Of the means one could take, the vector area agrees best: it is the plane that fits the rim."""
    off = {"vector": [], "tensor": [], "every triangle upwards": []}
    for region in ("mojave", "transverse_ranges"):
        folder = shared_data / "california_fault_meshes" / region
        with open(folder / "faults.csv", encoding="utf-8") as file:
            published = {row["name"]: row for row in csv.DictReader(file)}
        for fault in read_model(folder / "faults.csv").faults:
            m, row = measure(fault.surface), published[fault.name]
            if len(m.parts) > 1:
                continue
            tensor = np.einsum("t,ti,tj->ij", m.areas_m2, m.normals, m.normals)
            upwards = m.normals * np.where(m.normals[:, 2:] < 0, -1.0, 1.0)
            for key, mean in (
                ("vector", m.normal),
                ("tensor", np.linalg.eigh(tensor)[1][:, 2]),
                ("every triangle upwards", m.areas_m2 @ upwards),
            ):
                strike, dip = strike_dip_deg(mean)
                strike_off = apart(float(strike), float(row["published_strike_deg"]))
                off[key].append(max(strike_off, abs(float(dip) - float(row["published_dip_deg"]))))
    within = {key: int((np.array(values) <= 1.0).sum()) for key, values in off.items()}
    assert len(off["vector"]) == 76
    assert within["vector"] == 75
    assert within["vector"] > within["tensor"] > within["every triangle upwards"]
    assert max(off["vector"]) < 1.1
    assert max(off["every triangle upwards"]) > 60  # the trap of steep faults, met on real ones


def triangles_of(path):
    """Corners (T, 3, 3) of the triangles of a file, and what is published of them."""
    features = json.loads(path.read_text(encoding="utf-8"))["features"]
    rings = np.array([feature["geometry"]["coordinates"][0] for feature in features], float)
    assert (rings[:, 0] == rings[:, 3]).all()  # closed rings of three corners, easting first
    return rings[:, :3], [feature["properties"] for feature in features]


@pytest.mark.parametrize("name, count", [("gurla_tri_stresses.geojson", 342), ("tib_dog_tri_stresses.geojson", 392)])
def test_strike_dip_and_area_of_every_published_triangle(shared_data, name, count):
    corners, published = triangles_of(shared_data / "western_nepal" / name)
    found = measure(Surface(name, corners.reshape(-1, 3), np.arange(3 * len(corners)).reshape(-1, 3)))
    assert len(published) == count
    strike, dip = strike_dip_deg(found.normals)
    wanted = np.array([[row[key] for key in ("strike", "dip", "area_sq_km")] for row in published])
    assert np.abs((strike - wanted[:, 0] + 180) % 360 - 180).max() < 1e-6
    assert np.abs(dip - wanted[:, 1]).max() < 1e-6
    assert found.areas_m2 / 1e6 == pytest.approx(wanted[:, 2], rel=1e-6)
    assert np.allclose(found.centroids, [row["center"] for row in published], atol=1e-3)


def test_the_published_table_of_triangles_is_that_of_their_corners(shared_data):
    folder = shared_data / "western_nepal"
    with open(folder / "wnfs_tris.csv", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    corners = np.concatenate([triangles_of(folder / f"{name}_tri_stresses.geojson")[0] for name in ("gurla", "tib_dog")])
    areas, normals = areas_and_normals(corners - corners.mean((0, 1)))
    places = middles(corners)
    table = np.array([[float(row[key]) for key in ("east", "north", "depth", "strike", "dip", "area_sq_km")] for row in rows])
    away, at = cKDTree(places).query(table[:, :3])
    assert len(rows) == len(set(at.tolist())) == 610  # of the 734 triangles with corners
    assert away.max() < 0.01  # its "depth" is elevation: negative below the sea
    strike, dip = strike_dip_deg(normals[at])
    assert np.abs((strike - table[:, 3] + 180) % 360 - 180).max() < 1e-6
    assert np.abs(dip - table[:, 4]).max() < 1e-6
    assert areas[at] / 1e6 == pytest.approx(table[:, 5], rel=1e-6)
