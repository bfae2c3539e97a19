"""Real meshes, read whole: counts, names, places, and nothing loaded that is not needed."""

from __future__ import annotations

import csv
import subprocess
import sys

import numpy as np
import pytest

from structviz.io import read_model, read_surfaces

SETS = [("mojave", 44), ("transverse_ranges", 40), ("hard_cases", 6)]


@pytest.mark.parametrize(("name", "count"), SETS)
def test_california_meshes_have_the_published_triangles_and_areas(shared_data, name, count):
    folder = shared_data / "california_fault_meshes" / name
    model = read_model(folder)
    with open(folder / "faults.csv", newline="") as table:
        rows = list(csv.DictReader(table))
    assert [fault.name for fault in model.faults] == [row["name"] for row in rows]
    assert len(model.faults) == count == len(model.inputs) - 1
    for fault, row in zip(model.faults, rows):
        surface = fault.surface
        assert len(surface.triangles) == int(row["triangles"])
        a, b, c = np.moveaxis(surface.vertices[surface.triangles], 1, 0)
        area_km2 = np.linalg.norm(np.cross(b - a, c - a), axis=1).sum() / 2e6
        assert area_km2 == pytest.approx(float(row["published_area_km2"]), rel=1e-3)
        assert (fault.declared.text if fault.declared else "") == row["sense"]
        assert surface.history == ()


def test_a_table_given_directly_is_its_folder(shared_data):
    folder = shared_data / "california_fault_meshes" / "mojave"
    assert read_model(folder / "faults.csv").inputs == read_model(folder).inputs


def test_ridgecrest_gives_the_three_faults_of_its_volume(shared_data):
    model = read_model(shared_data / "ridgecrest_volume_mesh" / "mesh_tet.msh")
    assert [(fault.name, len(fault.surface.triangles)) for fault in model.faults] == [
        ("fault_main", 220),
        ("fault_west", 76),
        ("fault_east", 44),
    ]
    assert any("boundary_south, boundary_east" in finding.message for finding in model.findings)
    assert len(read_surfaces(shared_data / "ridgecrest_volume_mesh" / "mesh_tet.msh")) == 9


def test_ridgecrest_is_read_as_another_library_reads_it(shared_data):
    meshio = pytest.importorskip("meshio")
    path = shared_data / "ridgecrest_volume_mesh" / "mesh_tet.msh"
    mesh = meshio.read(path)
    for surface in read_surfaces(path):
        blocks = [block.data[rows] for block, rows in zip(mesh.cells, mesh.cell_sets[surface.name]) if len(rows)]
        assert np.array_equal(surface.vertices[surface.triangles], mesh.points[np.concatenate(blocks)])


def test_reading_and_writing_load_no_heavy_library(shared_data, tmp_path, project):
    folder = shared_data / "california_fault_meshes"
    code = (
        "import sys; from structviz.io import read_model, write_surface;"
        f"fault = read_model({str(folder / 'mojave')!r}).faults[0]; read_model({str(folder / 'hard_cases')!r});"
        f"write_surface({str(tmp_path / 'a.vtp')!r}, fault.surface, {{}});"
        "print([name for name in ('meshio', 'trimesh', 'vtkmodules', 'pyvista', 'scipy', 'matplotlib') if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=project)
    assert done.stdout.strip() == "[]"
