"""Real surfaces against what their authors published of them. Sources: SCEC Community Fault Model 7.0 (doi:10.5281/zenodo.13685611),
western Nepal fault triangles (R. Styron, CC0). They lie beside the project; see DEVELOPERS."""

import csv
import json

import numpy as np
import pytest

from structviz.io import read_model
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
    without = [name for name, m in several.items() if not m.meaningful]
    assert any("Ridgecrest" in name for name in without)
    assert any("Palos_Verdes" in name for name in without)
    assert any(len(m.condition.nonmanifold_edges) for m in found.values())


@pytest.mark.parametrize("name", ["gurla_tri_stresses.geojson", "tib_dog_tri_stresses.geojson"])
def test_strike_dip_and_area_of_every_published_triangle(shared_data, name):
    features = json.loads((shared_data / "western_nepal" / name).read_text())["features"]
    corners = np.array([feature["geometry"]["coordinates"][0][:3] for feature in features], float)
    wanted = np.array([[feature["properties"][key] for key in ("strike", "dip", "area_sq_km")] for feature in features])
    found = np.array(
        [(m.strike_deg, m.dip_deg, m.area_m2 / 1e6) for m in (measure(Surface("t", c, np.array([[0, 1, 2]]))) for c in corners)]
    )
    assert np.abs((found[:, 0] - wanted[:, 0] + 180) % 360 - 180).max() < 1e-6
    assert np.abs(found[:, 1] - wanted[:, 1]).max() < 1e-6
    assert np.allclose(found[:, 2], wanted[:, 2], rtol=1e-6)
