"""The files of a field come back from a VTK reader as they were."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.report.field_files import Grid, grid_about, grid_file, points_file, trajectories_file
from structviz.stress.field import StressField

pyvista = pytest.importorskip("pyvista")


def field_at(points: np.ndarray) -> StressField:
    count = len(points)
    axes = np.broadcast_to(np.array([[0.0, 0, 1], [0, 1, 0], [-1, 0, 0]]), (count, 3, 3)).copy()
    azimuth, seen = np.zeros(count), np.ones(count, bool)
    axes[0], azimuth[0], seen[0] = np.nan, np.nan, False
    return StressField(points, axes, axes[:, :, 0] * 0 + 5.0, np.arange(count), seen, azimuth, 1000.0)


def check_arrays(mesh: object, field: StressField) -> None:
    data = mesh.point_data  # type: ignore[attr-defined]
    np.testing.assert_allclose(data["reduced_stress"][1].reshape(3, 3), np.diag([0.0, 0.5, 1.0]))
    assert np.isnan(data["reduced_stress"][0]).all()
    np.testing.assert_array_equal(data["sigma1"], field.axes[:, 0])
    np.testing.assert_array_equal(data["faults"], field.count)
    assert data["vtkGhostType"][0] == 2
    assert (data["vtkGhostType"][1:] == 0).all()


def test_a_grid_comes_back(tmp_path: Path) -> None:
    grid = Grid((400_000.25, 6_500_000.5, -5000.0), (1000.0, 500.0, 250.0), (4, 3, 2))
    field = field_at(grid.points())
    (tmp_path / "field.vti").write_bytes(grid_file(field, grid))
    mesh = pyvista.read(tmp_path / "field.vti")
    np.testing.assert_allclose(mesh.points, grid.points(), rtol=0, atol=1e-6)
    check_arrays(mesh, field)


def test_points_come_back(tmp_path: Path) -> None:
    field = field_at(np.random.default_rng(1).normal(6e6, 1000.0, (7, 3)))
    (tmp_path / "field.vtu").write_bytes(points_file(field))
    mesh = pyvista.read(tmp_path / "field.vtu")
    np.testing.assert_array_equal(mesh.points, field.points)
    check_arrays(mesh, field)


def test_trajectories_come_back(tmp_path: Path) -> None:
    lines = [np.arange(9.0).reshape(3, 3), np.arange(6.0).reshape(2, 3) + 100]
    (tmp_path / "lines.vtp").write_bytes(trajectories_file(lines))
    mesh = pyvista.read(tmp_path / "lines.vtp")
    assert mesh.n_lines == 2
    np.testing.assert_array_equal(mesh.points, np.concatenate(lines))


def test_a_grid_covers_its_places_by_cubes() -> None:
    places = np.array([[0.0, 0, -3000], [24_000, 6000, -1000]])
    points = grid_about(places).points()
    assert (points.min(0) <= places.min(0) + 1e-6).all()
    assert (points.max(0) >= places.max(0) - 1e-6).all()


def test_a_field_at_other_points_is_refused() -> None:
    grid = Grid((0.0, 0.0, 0.0), (1.0, 1.0, 1.0), (2, 2, 2))
    with pytest.raises(ArgumentError, match="other points than those of the grid"):
        grid_file(field_at(grid.points() + 1), grid)
