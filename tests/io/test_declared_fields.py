"""Movement that a mesh file declares in its own fields: taken by a stated table, told, and never guessed."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import pyvista

from structviz.io import read_model
from structviz.model import FaultModel

CORNERS = np.array([[0, 0, 0], [1000, 0, 0], [1000, 300, -900], [0, 300, -900.0]]) + [5e5, 4e6, 0]


def written(folder: Path, name: str, **fields: object) -> Path:
    """Write a plane with field data as a general library does; return its path."""
    mesh = pyvista.PolyData(CORNERS, np.array([3, 0, 1, 2, 3, 0, 2, 3]))
    for key, value in fields.items():
        mesh.add_field_data([value], key)
    mesh.save(folder / name)
    return folder / name


def notes(model: FaultModel) -> str:
    return "\n".join(f"{f.severity}: {f.subject}: {f.message}" for f in model.findings)


@pytest.mark.parametrize("suffix", [".vtp", ".vtu"])
def test_fields_of_the_table_are_taken_and_told(suffix: str, tmp_path: Path) -> None:
    path = written(tmp_path, "a.vtp", sense="normal-dextral", phase="Jurassic", colour=7)
    if suffix == ".vtu":
        pyvista.read(path).cast_to_unstructured_grid().save(tmp_path / "a.vtu")
    (fault,) = read_model(tmp_path / f"a{suffix}").faults
    assert fault.declared is not None
    assert (fault.declared.text, fault.phase) == ("normal-dextral", "Jurassic")
    assert f"note: a: taken from a{suffix}: sense normal-dextral, phase Jurassic" in notes(read_model(tmp_path / f"a{suffix}"))


def test_a_rake_may_be_a_number(tmp_path: Path) -> None:
    (fault,) = read_model(written(tmp_path, "a.vtp", rake_deg=-85.25)).faults
    assert fault.declared is not None
    assert fault.declared.rake_deg == -85.25


@pytest.mark.parametrize(("field", "value"), [("sense", "N"), ("sense", "left lateral"), ("rake_deg", 400.0), ("sense", "normal-reverse")])
def test_words_of_others_are_told_and_not_guessed(field: str, value: object, tmp_path: Path) -> None:
    model = read_model(written(tmp_path, "a.vtp", **{field: value}))
    assert model.faults[0].declared is None
    assert "warning: a: what a.vtp says of its movement is not used: found " in notes(model)


def test_both_sense_and_rake_are_one_too_many(tmp_path: Path) -> None:
    model = read_model(written(tmp_path, "a.vtp", sense="normal", rake_deg=-90.0))
    assert model.faults[0].declared is None
    assert "found both sense 'normal' and rake_deg -90; wanted one of the two" in notes(model)


def test_other_fields_are_passed_over(tmp_path: Path) -> None:
    model = read_model(written(tmp_path, "a.vtp", movement="normal", kind="fault"))
    assert model.faults[0].declared is None
    assert "taken from" not in notes(model)


def test_a_table_of_faults_decides_and_what_it_leaves_open_is_told(tmp_path: Path) -> None:
    written(tmp_path, "a.vtp", sense="normal")
    (tmp_path / "faults.csv").write_text("name,surface,sense\na,a.vtp,\nb,a.vtp,reverse\n", encoding="utf-8")
    model = read_model(tmp_path)
    assert [fault.declared.text if fault.declared else None for fault in model.faults] == [None, "reverse"]
    assert "note: a: its file says sense normal; the table of faults says nothing, which is followed" in notes(model)
    assert "b: its file says" not in notes(model)
