"""The scene for slides: every fault by name and colour, glyphs and arrows, places that lead back to the map."""

from __future__ import annotations

import io

import numpy as np
import pytest
import trimesh

from structviz.analysis import Analysis
from structviz.io.ledger import read_pieces
from structviz.report.names import printable
from structviz.report.scene_glb import colour_of, scene_glb
from structviz.report.write import write_outputs
from structviz.views.palette import VERDICTS


@pytest.fixture(scope="module")
def content(analysis: Analysis) -> bytes:
    return scene_glb(analysis)


def test_the_same_analysis_gives_the_same_bytes(analysis: Analysis, content: bytes) -> None:
    assert scene_glb(analysis) == content


def test_every_fault_comes_back_where_it_lies(analysis: Analysis, content: bytes) -> None:
    pieces = {piece.name: piece for piece in read_pieces(content, "scene.glb")}
    for result in analysis.faults:
        piece, surface = pieces[printable(result.fault.name, 200)], result.fault.surface
        assert np.array_equal(piece.triangles, surface.triangles)
        assert np.abs(piece.vertices - surface.vertices).max() < 0.01


def test_colours_are_those_of_the_verdicts(analysis: Analysis, content: bytes) -> None:
    scene = trimesh.load(io.BytesIO(content), file_type="glb", process=False)
    for result in analysis.faults:
        _, mesh = scene.graph[printable(result.fault.name, 200)]
        wanted = colour_of(VERDICTS[result.verdict.word].colour)
        found = np.asarray(scene.geometry[mesh].visual.material.baseColorFactor) / 255
        assert np.allclose(found, wanted, atol=0.01)


def test_arrows_point_along_the_slip(analysis: Analysis, content: bytes) -> None:
    pieces = {piece.name: piece for piece in read_pieces(content, "scene.glb")}
    for result in analysis.faults:
        arrow = pieces.get(f"{printable(result.fault.name, 200)}, predicted slip")
        assert (arrow is not None) == (result.verdict.predicted_rake_deg is not None)
        if arrow is not None:
            along = arrow.vertices[3] - arrow.vertices[[0, 6]].mean(0)
            assert abs(along @ result.measured.normal) < 1e-3 * np.linalg.norm(along)


def test_it_is_written_when_asked_for(analysis: Analysis, tmp_path) -> None:
    write_outputs(analysis, tmp_path / "out", pictures=False, page=False, slides=True)
    assert (tmp_path / "out" / "scene.glb").read_bytes() == scene_glb(analysis)
