"""What the 3D view is given: places that come back, surfaces made small within the tolerance that is told, values of real triangles."""

from __future__ import annotations

import json
import math
import re
import zlib
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from structviz.analysis import Analysis, Settings, run
from structviz.report.annotated import triangle_values
from structviz.report.page_data import page_data, viewer_script
from structviz.report.page_fields import FIELDS, NOTHING, round_above
from structviz.report.page_geometry import STEPS, clustered, drawn_surfaces, quantised
from structviz.surfaces.surface import Surface
from structviz.synthetic import random_model
from tests.conftest import skip_or_fail

UTM = np.array([512_345.0, 6_201_234.0, -1500.0])


@pytest.fixture(scope="module")
def analysis() -> Analysis:
    return run(
        random_model("normal", faults=14, conjugate=10, planted=2, triangles=200, random_state=3).model, Settings(replicates=50, stations=6)
    )


def sheet(side: int, size_m: float = 100.0) -> Surface:
    """Return a wavy sheet of 2 side^2 triangles, far from the origin."""
    i, j = np.meshgrid(np.arange(side + 1), np.arange(side + 1), indexing="ij")
    places = np.stack([i, j, 0.4 * np.sin(i / 3) + 0.3 * np.cos(j / 4)], -1).reshape(-1, 3) * size_m + UTM
    a = (i * (side + 1) + j)[:-1, :-1].ravel()
    b, c, d = a + 1, a + side + 1, a + side + 2
    return Surface("sheet", places, np.concatenate([np.stack([a, c, d], 1), np.stack([a, d, b], 1)]))


def arrays_of(data: dict[str, Any], packed: bytes) -> dict[str, NDArray]:
    whole = zlib.decompress(packed)
    return {
        name: np.frombuffer(whole, np.dtype(at["type"]).newbyteorder("<"), math.prod(at["shape"]), at["offset"])
        for name, at in data["arrays"].items()
    }


def unpacked(boxes: list[dict[str, Any]], places: NDArray, corners: NDArray) -> list[NDArray]:
    """Return the corners (T, 3, 3) of the triangles of each surface, m from the origin: the plain reading of what was packed."""
    found, place, corner = [], 0, 0
    for box in boxes:
        count, many = box["vertices"], 3 * box["triangles"]
        codes = np.cumsum(places[place : place + 3 * count].reshape(3, count).astype(np.int64), 1) % (STEPS + 1)
        vertices = np.array(box["low"]) + np.array(box["step"]) * codes.T
        found.append(vertices[np.cumsum(corners[corner : corner + many])].reshape(-1, 3, 3))
        place, corner = place + 3 * count, corner + many
    return found


def test_every_corner_comes_back_where_it_was(analysis: Analysis) -> None:
    data, packed = page_data(analysis)
    arrays = arrays_of(data, packed)
    drawn = unpacked(data["faults"], arrays["faults.places"], arrays["faults.corners"])
    assert data["tolerance"] == 0
    for result, corners, box in zip(analysis.faults, drawn, data["faults"], strict=True):
        surface = result.fault.surface
        off = np.abs(corners + np.array(data["origin"]) - surface.vertices[surface.triangles])
        assert (off <= np.array(box["step"]) / 2 + 0.006).all()  # corners of boxes are told in centimetres


def test_values_are_those_of_the_meshes_written_beside(analysis: Analysis) -> None:
    data, packed = page_data(analysis)
    arrays, first = arrays_of(data, packed), analysis.faults[0]
    told = triangle_values(first, analysis.regimes[first.phase])
    for shown in FIELDS[:4]:
        codes = arrays[f"field.{shown.key}"][: len(first.measured.areas_m2)]
        known = np.isfinite(told[shown.key])
        assert ((codes != NOTHING) == known).all()
        np.testing.assert_allclose((shown.low + shown.step * codes)[known], told[shown.key][known], atol=0.501 * shown.step)


def test_distance_to_the_nearest_pair_is_that_of_the_nearest(analysis: Analysis) -> None:
    data, packed = page_data(analysis)
    told = next(field for field in data["fields"] if field["key"] == "pair_distance_m")
    codes, at = arrays_of(data, packed)["field.pair_distance_m"], 0
    assert told["unit"] == "m"
    for result in analysis.faults:
        surface = result.fault.surface
        middles = surface.vertices[surface.triangles].mean(1)
        plain = np.array([min(math.dist(middle, place) for place in analysis.pairs.places) for middle in middles])
        here = codes[at : at + len(middles)]
        np.testing.assert_allclose(told["low"] + told["step"] * here, plain, atol=0.51 * told["step"])
        at += len(middles)
    assert plain.max() <= told["high"] == round_above(told["high"])


def test_every_field_that_is_asked_for_is_there_with_a_unit(analysis: Analysis) -> None:
    units = {field["key"]: field["unit"] for field in page_data(analysis)[0]["fields"]}
    wanted = ("dip_deg", "predicted_rake_deg", "slip_tendency", "misfit_deg", "dilation_tendency", "pair_distance_m")
    assert set(wanted) == set(units)
    assert all(units.values())


def test_a_field_without_any_value_is_left_out() -> None:
    bare = random_model("normal", faults=3, conjugate=0, planted=0, triangles=60, random_state=1).model
    from dataclasses import replace

    unheard = replace(bare, faults=tuple(replace(fault, declared=None) for fault in bare.faults))
    data, packed = page_data(run(unheard, Settings(replicates=50, stations=4)))
    assert "misfit_deg" not in {field["key"] for field in data["fields"]}
    assert "field.misfit_deg" not in arrays_of(data, packed)


def test_the_same_analysis_gives_the_same_bytes(analysis: Analysis) -> None:
    first, second = page_data(analysis, triangles=900), page_data(analysis, triangles=900)
    assert json.dumps(first[0], allow_nan=False) == json.dumps(second[0], allow_nan=False)
    assert first[1] == second[1]


def test_a_large_model_is_made_small_and_says_by_how_much(analysis: Analysis) -> None:
    data, packed = page_data(analysis, triangles=900)
    total, shown = data["triangles"]
    assert total > 2000
    assert shown < 1300
    assert data["tolerance"] > 0
    assert len(arrays_of(data, packed)["field.dip_deg"]) == shown


@pytest.mark.parametrize("cell_m", [150.0, 260.0, 700.0])
def test_no_point_moves_by_more_than_is_told(cell_m: float) -> None:
    surface = sheet(40)
    drawn = clustered(surface, cell_m)
    assert 0 < drawn.tolerance_m <= cell_m * 3**0.5
    corners = surface.vertices[surface.triangles[drawn.source]]
    moved = np.linalg.norm(drawn.vertices[drawn.triangles] - corners, axis=2)
    assert moved.max() <= drawn.tolerance_m + 1e-9
    assert {tuple(v) for v in drawn.vertices} <= {tuple(v) for v in surface.vertices}  # drawn points are points of the model


def test_no_triangle_collapses_or_is_drawn_twice() -> None:
    drawn = clustered(sheet(40), 260.0)
    assert (np.diff(np.sort(drawn.triangles, 1)) > 0).all()
    assert len(np.unique(np.sort(drawn.triangles, 1), axis=0)) == len(drawn.triangles)


def test_shares_are_about_kept() -> None:
    drawn = drawn_surfaces([sheet(60), sheet(20)], 2000)
    counts = [len(each.triangles) for each in drawn]
    assert 1200 < sum(counts) < 2800
    assert 5 < counts[0] / counts[1] < 14  # nine times as many before


def test_a_surface_smaller_than_a_cell_is_kept_whole() -> None:
    one = Surface("one", UTM + np.eye(3), np.array([[0, 1, 2]]))
    drawn = drawn_surfaces([sheet(60), one], 500)
    assert len(drawn[1].triangles) == 1


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(1e-3, 1e6))
def test_steps_are_fine_enough(seed: int, size_m: float) -> None:
    places = UTM + np.random.default_rng(seed).random((50, 3)) * [size_m, size_m / 3, 0]
    steps, low, step = quantised(places)
    assert (np.abs(low + step * steps - places) <= step / 2 + 1e-9 * np.abs(places)).all()


def test_the_bundle_names_no_place_to_load_from() -> None:
    script = viewer_script()
    if script is None:
        skip_or_fail("the 3D view was not bundled when structviz was installed (see the warning of pip install)")
    found = set(re.findall(r"(?:https?:)?//[a-z0-9-]+(?:\.[a-z0-9-]+)+", script or ""))
    assert {address for address in found if not address.endswith("www.w3.org")} == set()  # names of XML, never fetched
    assert "three.js authors" in (script or "")
    assert "Garrett Johnson" in (script or "")
