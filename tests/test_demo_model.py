"""Is the demo model what its README says, and do its files follow from the code?"""

from __future__ import annotations

import runpy
from pathlib import Path

import numpy as np
import pytest

from structviz.orientation.planes import slip_vectors
from structviz.orientation.vectors import axial_angle_deg
from structviz.surfaces.surface import Surface
from structviz.synthetic import demo_model

LIMIT_BYTES = 3_000_000


def area_vectors(surface: Surface) -> np.ndarray:
    corners = surface.vertices[surface.triangles]
    return np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2


@pytest.fixture(scope="module")
def demo():
    return demo_model()


def test_demo_plants_what_it_says(demo):
    known = demo.known
    stress = known.axes.T @ np.diag([1.0, known.shape_ratio, 0.0]) @ known.axes
    older = demo.older_axes.T @ np.diag([1.0, 0.5, 0.0]) @ demo.older_axes
    assert len(known.model.faults) == 24
    for fault, normal, kind in zip(known.model.faults, known.normals, known.kinds):
        traction = -(older if kind == "older" else stress) @ normal
        slip = traction - (traction @ normal) * normal
        declared = slip_vectors(normal, fault.declared.rake_deg)
        agreement = declared @ slip / np.linalg.norm(slip)
        assert (agreement < -0.7) if fault.name in known.flipped else (agreement > 0.7), fault.name
        if kind == "older":
            now = -stress @ normal
            now -= (now @ normal) * normal
            assert declared @ now / np.linalg.norm(now) < -0.3, "its slip is not that of the stress to be found"
        off = axial_angle_deg(area_vectors(fault.surface).sum(0), normal)
        assert (off > 45) if fault.name in demo.mirrored else (off < 0.05), fault.name


def test_demo_horizons_step_down_into_the_hanging_wall(demo):
    horizon = demo.known.model.horizons[1].surface
    checked = 0
    for moved, kind in zip(demo.slips, demo.known.kinds):
        if kind != "conjugate":
            continue
        centre = (moved.surface.vertices.min(0) + moved.surface.vertices.max(0)) / 2
        level = np.linalg.norm(moved.normal[:2])
        toward = moved.normal[:2] / level
        place = horizon.vertices - centre
        near = place[np.abs(place[:, :2] @ [-toward[1], toward[0]]) < 600]
        # Horizontal distance from the fault, which lies further towards its dip the deeper it is.
        across = near[:, :2] @ toward + near[:, 2] * moved.normal[2] / level
        hanging, foot = near[(across > 100) & (across < 600), 2].mean(), near[(across < -100) & (across > -600), 2].mean()
        throw = -moved.slip[2]
        checked += 1
        assert 0.15 * throw < foot - hanging < 1.3 * throw, moved.surface.name
    assert checked == 15


def test_demo_is_tight_in_its_frame(demo):
    vertices = np.concatenate([fault.surface.vertices for fault in demo.known.model.faults])
    assert vertices[:, 2].min() >= -4000.0
    assert vertices[:, 2].max() <= -1200.0
    np.testing.assert_array_equal(vertices, vertices.round(2))
    names = {fault.name for fault in demo.known.model.faults}
    assert {stria.fault for stria in demo.known.model.striae} <= names


def contents(folder: Path) -> dict[str, bytes]:
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


def test_files_of_the_demo_are_those_the_script_writes(project, tmp_path):
    runpy.run_path(str(project / "meshes" / "make.py"))["write_demo"](tmp_path)
    made, kept = contents(tmp_path), contents(project / "meshes")
    kept.pop("make.py")
    kept = {name: content for name, content in kept.items() if "__pycache__" not in name}
    assert sorted(made) == sorted(kept)
    assert [name for name in made if made[name] != kept[name]] == []
    assert sum(map(len, kept.values())) < LIMIT_BYTES


def test_surfaces_come_back_from_the_files_as_they_were_made(project, demo):
    from structviz.io.registry import format_of

    pieces = {}
    for path in sorted((project / "meshes" / "faults").iterdir()):
        content = path.read_bytes()
        for piece in format_of(content, path.name)[0].read(content, path.name):
            pieces[(piece.name if path.suffix == ".obj" else path.stem).lower()] = piece
    for fault in demo.known.model.faults:
        piece = pieces.pop(fault.name.lower())
        np.testing.assert_array_equal(piece.vertices[piece.triangles], fault.surface.vertices[fault.surface.triangles])
    assert pieces == {}


def test_readme_tells_the_truth_planted(project, demo):
    text = (project / "meshes" / "README.md").read_text()
    for name in (*demo.known.flipped, *demo.mirrored, *demo.older):
        assert f"{name}" in text
    assert "EPSG:25831" in text
    assert f"= {demo.known.shape_ratio}" in text
