"""VTK XML collections: written beside results, read by PyVista and by us; names, nested blocks, what is refused."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import pyvista

from structviz.errors import InputError
from structviz.io import read_model, write_surface
from structviz.io.formats.vtm import collection
from structviz.synthetic.damage import sound_surface

HEAD = '<VTKFile type="vtkMultiBlockDataSet" version="1.0"><vtkMultiBlockDataSet>'
TAIL = "</vtkMultiBlockDataSet></VTKFile>"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "parts").mkdir()
    for name in ("a", "b"):
        write_surface(tmp_path / "parts" / f"{name}.vtp", sound_surface(f"inside {name}"))
    return tmp_path


def test_what_is_written_is_read_by_vtk_and_by_us(folder: Path) -> None:
    names = {'West <&> "East"': "parts/a.vtp", "b": "parts/b.vtp"}
    (folder / "all.vtm").write_bytes(collection(names))
    blocks = pyvista.read(folder / "all.vtm")
    assert list(blocks.keys()) == list(names)
    assert all(block.n_cells == len(sound_surface().triangles) for block in blocks)
    model = read_model(folder / "all.vtm")
    assert [fault.name for fault in model.faults] == list(names)
    assert {entry.path for entry in model.inputs} == {"all.vtm", "parts/a.vtp", "parts/b.vtp"}
    assert np.array_equal(model.faults[0].surface.vertices, sound_surface().vertices)


def test_what_vtk_writes_is_read(folder: Path) -> None:
    blocks = pyvista.MultiBlock()
    inner = pyvista.MultiBlock()
    mesh = pyvista.read(folder / "parts" / "a.vtp")
    mesh.clear_field_data()
    inner["deep"] = mesh
    blocks["group"], blocks["flat"] = inner, mesh.copy()
    blocks.save(folder / "theirs.vtm")
    assert [fault.name for fault in read_model(folder / "theirs.vtm").faults] == ["deep", "flat"]


def test_names_come_from_the_entry_then_the_block_then_the_file(folder: Path) -> None:
    entries = '<DataSet name="N" file="parts/a.vtp"/><Block name="B"><DataSet file="parts/a.vtp"/></Block><DataSet file="parts/b.vtp"/>'
    (folder / "all.vtm").write_text(HEAD + entries + TAIL, encoding="utf-8")
    assert [fault.name for fault in read_model(folder / "all.vtm").faults] == ["N", "B", "inside b"]


def test_a_collection_and_its_parts_in_one_folder_are_read_once(folder: Path) -> None:
    (folder / "parts" / "all.vtm").write_bytes(collection({"First": "a.vtp"}))
    model = read_model(folder / "parts")
    assert sorted(fault.name for fault in model.faults) == ["First", "inside b"]


def test_other_data_sets_are_told(folder: Path) -> None:
    (folder / "all.vtm").write_text(
        HEAD + '<DataSet file="x.vti"/><DataSet file="parts/a.vtp"/><DataSet file="y.vti"/>' + TAIL, encoding="utf-8"
    )
    assert any("2 data set .vtis not read" in f.message or "data set" in f.message for f in read_model(folder / "all.vtm").findings)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (HEAD + TAIL, r"no surfaces \(an empty collection\)"),
        (HEAD + '<DataSet file="../x.vtp"/>' + TAIL, "which leaves the folder"),
        (HEAD + '<DataSet file="/etc/x.vtp"/>' + TAIL, "which leaves the folder"),
        (HEAD + '<DataSet file="gone.vtp"/>' + TAIL, "no such file"),
        (HEAD + '<DataSet file="all.vtm"/>' + TAIL, r"no surfaces \(1 data set \.vtm not read\)"),
        (HEAD + "<Block>" * 30 + "</Block>" * 30 + TAIL, "nested more than 16 deep"),
        (HEAD + '<DataSet file="parts/a.vtp"/>', "XML that breaks off"),
        ("<?xml version='1.0'?><!DOCTYPE a [<!ENTITY b 'c'>]>" + HEAD + TAIL, "a document type or entities"),
    ],
)
def test_what_cannot_be_used_is_refused(text: str, said: str, folder: Path) -> None:
    (folder / "all.vtm").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match=said):
        read_model(folder / "all.vtm")
