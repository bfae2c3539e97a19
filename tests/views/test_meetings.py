"""Lines where faults meet: in the analysis, the scene, the results and the page."""

from __future__ import annotations

import json
import zlib

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.kinematics.senses import sector_of_words
from structviz.model import Fault, FaultModel
from structviz.report.page_data import page_data
from structviz.report.results_json import results_text
from structviz.surfaces.surface import Surface
from structviz.views.scene import build_scene

ORIGIN = np.array([500_000.0, 4_000_000.0, -1000.0])
CORNERS = np.array([[0, 0, 0], [4000, 0, 0], [4000, 0, -2000], [0, 0, -2000.0]])
TURNED = CORNERS[:, [1, 0, 2]] * [1, 1, 1] + [2000, -1500, 0]
TRIANGLES = np.array([[0, 1, 2], [0, 2, 3]])


@pytest.fixture(scope="module")
def analysis():
    rows = [("east", CORNERS, "dextral"), ("north", TURNED, "sinistral"), ("far", CORNERS + [0, 9000, 0], "dextral")]
    faults = tuple(Fault(name, Surface(name, corners + ORIGIN, TRIANGLES), sector_of_words(word)) for name, corners, word in rows)
    return run(FaultModel("crossing", faults), Settings(replicates=60))


def test_they_are_found_with_their_length(analysis) -> None:
    (found,) = analysis.meetings
    assert (found.surfaces, found.kind) == ((0, 1), "crosses")
    assert found.length_m == pytest.approx(2000.0)


def test_the_scene_holds_them_about_its_origin(analysis) -> None:
    scene = build_scene(analysis)
    assert np.allclose(scene.meetings[..., :2] + scene.origin[:2], ORIGIN[:2] + [2000.0, 0.0])


def test_results_name_the_faults(analysis) -> None:
    assert json.loads(results_text(analysis))["meetings"] == [{"faults": ["east", "north"], "kind": "crosses", "length_m": 2000.0}]


def test_the_page_carries_them(analysis) -> None:
    data, packed = page_data(analysis)
    box, at = data["meetings"], data["arrays"]["meetings"]
    differences = np.frombuffer(zlib.decompress(packed), "<u2", 3 * box["vertices"], at["offset"]).reshape(3, -1)
    ends = box["low"] + np.array(box["step"]) * (np.cumsum(differences, axis=1, dtype=np.uint16).T)
    scene = build_scene(analysis)
    np.testing.assert_allclose(ends, scene.meetings.reshape(-1, 3), atol=max(box["step"]) / 2 + 0.006)


def test_where_no_faults_meet_the_page_says_nothing() -> None:
    rows = [("near", CORNERS, "dextral"), ("far", CORNERS + [0, 9000, 0], "dextral")]
    faults = tuple(Fault(name, Surface(name, corners + ORIGIN, TRIANGLES), sector_of_words(word)) for name, corners, word in rows)
    assert page_data(run(FaultModel("apart", faults), Settings(replicates=60)))[0]["meetings"] is None
