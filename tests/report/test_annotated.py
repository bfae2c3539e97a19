"""The annotated meshes: what each triangle carries, against slower ways to the same numbers."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from structviz.analysis import Analysis
from structviz.report.annotated import mesh_files, triangle_values, write_annotated
from structviz.stress.tensor import reduced_tensor

from .conftest import HOSTILE


def test_every_fault_has_a_mesh_of_its_own_within_the_folder(analysis: Analysis) -> None:
    files = mesh_files(analysis)
    assert list(files) == [result.fault.name for result in analysis.faults]
    assert len(set(files.values())) == len(files)
    assert all(Path(file).parent == Path("faults") and Path(file).suffix == ".vtp" for file in files.values())
    assert files[HOSTILE[1]] == "faults/outside.vtp"


def test_values_equal_those_of_a_plain_loop(analysis: Analysis) -> None:
    result, regime = analysis.faults[0], analysis.regimes[0]
    values = triangle_values(result, regime)
    tensor = reduced_tensor(regime.axes, regime.shape_ratio.value if regime.shape_ratio else 0.5)
    for k in range(0, len(result.measured.normals), 7):
        n = result.measured.normals[k]
        strike = np.array([-n[1], n[0], 0.0]) / np.hypot(n[0], n[1])
        slip = -(tensor @ n - (n @ tensor @ n) * n)
        rake = np.degrees(np.arctan2(slip @ np.cross(n, strike), slip @ strike))
        assert abs((values["predicted_rake_deg"][k] - rake + 180) % 360 - 180) < 1e-3
        assert values["dip_deg"][k] == pytest.approx(np.degrees(np.arccos(abs(n[2]))), abs=1e-3)
        azimuth = np.degrees(np.arctan2(strike[0], strike[1]))
        assert abs((values["strike_deg"][k] - azimuth + 180) % 360 - 180) < 1e-3 or n[2] < 0
        assert result.sector is not None
        assert values["misfit_deg"][k] == pytest.approx(abs((rake - result.sector.rake_deg + 180) % 360 - 180), abs=1e-3)


def test_what_is_not_known_is_nan_and_the_codes_are_fixed(analysis: Analysis) -> None:
    undeclared = analysis.faults[-1]
    assert np.isnan(triangle_values(undeclared, analysis.regimes[0])["misfit_deg"]).all()
    nothing = triangle_values(undeclared, None)
    assert np.isnan(nothing["predicted_rake_deg"]).all()
    assert np.isnan(nothing["slip_tendency"]).all()
    assert np.isfinite(nothing["dip_deg"]).all()
    for code, word in enumerate(("consistent", "conflicting", "undetermined")):
        given = replace(undeclared, verdict=replace(undeclared.verdict, word=word))
        assert set(triangle_values(given, None)["verdict"]) == {code}


def test_a_triangle_without_area_has_no_orientation(analysis: Analysis) -> None:
    result = analysis.faults[0]
    areas, normals = result.measured.areas_m2.copy(), result.measured.normals.copy()
    areas[3], normals[3] = 0.0, 0.0
    values = triangle_values(replace(result, measured=replace(result.measured, areas_m2=areas, normals=normals)), analysis.regimes[0])
    assert all(np.isnan(values[name][3]) for name in ("dip_deg", "strike_deg", "predicted_rake_deg", "slip_tendency", "misfit_deg"))
    assert np.isfinite(values["dip_deg"][4])


def test_files_hold_float64_points_and_float32_values(analysis: Analysis, tmp_path: Path) -> None:
    pyvista = pytest.importorskip("pyvista")
    result = analysis.faults[5]
    write_annotated(result, analysis.regimes[0], tmp_path / "f.vtp")
    mesh = pyvista.read(tmp_path / "f.vtp")
    assert mesh.points.dtype == np.float64
    assert (mesh.points == result.fault.surface.vertices).all()
    assert (mesh.faces.reshape(-1, 4)[:, 1:] == result.fault.surface.triangles).all()
    for name, array in triangle_values(result, analysis.regimes[0]).items():
        assert mesh.cell_data[name].dtype == array.dtype
        assert np.array_equal(mesh.cell_data[name], array, equal_nan=True)
