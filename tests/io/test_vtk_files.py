"""VTP, VTU and legacy VTK against VTK itself, the reference implementation of the file formats."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io import read_surfaces, write_surface
from structviz.io.ledger import read_pieces
from structviz.surfaces.surface import Surface

CORNERS = np.array([[500000.125, 4e6, -10.0], [500100.1, 4e6 + 1 / 3, -20.0], [500100.0, 4000100.0, -30.7], [500000.0, 4000100.0, -40.0]])
TRIANGLES = np.array([[0, 1, 2], [0, 2, 3]])


def polydata(cells=(("Polys", TRIANGLES),)):
    """Return VTK poly data of the four corners with the given cells."""
    from vtkmodules.util.numpy_support import numpy_to_vtk
    from vtkmodules.vtkCommonCore import vtkPoints
    from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData

    mesh, points = vtkPolyData(), vtkPoints()
    points.SetData(numpy_to_vtk(CORNERS, deep=True))
    mesh.SetPoints(points)
    for kind, rows in cells:
        array = vtkCellArray()
        for row in rows:
            array.InsertNextCell(len(row), [int(corner) for corner in row])
        getattr(mesh, f"Set{kind}")(array)
    return mesh


def grid(kind, row):
    """Return a VTK grid of the four corners with one cell."""
    from vtkmodules.vtkCommonDataModel import vtkUnstructuredGrid

    mesh = vtkUnstructuredGrid()
    mesh.SetPoints(polydata().GetPoints())
    mesh.InsertNextCell(kind, len(row), row)
    return mesh


def as_grid(mesh):
    from vtkmodules.vtkFiltersCore import vtkAppendFilter

    append = vtkAppendFilter()
    append.AddInputData(mesh)
    append.Update()
    return append.GetOutput()


def saved(writer, mesh, path):
    writer.SetFileName(str(path))
    writer.SetInputData(mesh)
    assert writer.Write()
    return path


@pytest.mark.parametrize("mode", ["Ascii", "Binary", "Appended"])
@pytest.mark.parametrize("base64", [0, 1])
@pytest.mark.parametrize("packing", [0, 1, 3])  # none, zlib, LZMA
@pytest.mark.parametrize("wide_and_big_endian", [False, True])
@pytest.mark.parametrize("suffix", [".vtp", ".vtu"])
def test_every_way_vtk_writes_is_read(tmp_path, mode, base64, packing, wide_and_big_endian, suffix):
    from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter, vtkXMLUnstructuredGridWriter

    writer = vtkXMLPolyDataWriter() if suffix == ".vtp" else vtkXMLUnstructuredGridWriter()
    getattr(writer, f"SetDataModeTo{mode}")()
    writer.SetEncodeAppendedData(base64)
    writer.SetCompressorType(packing)
    if wide_and_big_endian:
        writer.SetHeaderTypeToUInt64()
        writer.SetByteOrderToBigEndian()
    path = saved(writer, polydata() if suffix == ".vtp" else as_grid(polydata()), tmp_path / f"a{suffix}")
    (surface,) = read_surfaces(path)
    assert surface.triangles.tolist() == TRIANGLES.tolist()
    assert np.abs(surface.vertices - CORNERS).max() <= (1e-3 if mode == "Ascii" else 0.0)


def test_lz4_packing_is_refused_with_what_to_do(tmp_path):
    from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter

    writer = vtkXMLPolyDataWriter()
    writer.SetCompressorTypeToLZ4()
    with pytest.raises(FormatError, match=r"vtkLZ4DataCompressor.*\n  next: save it again with zlib or without packing"):
        read_surfaces(saved(writer, polydata(), tmp_path / "a.vtp"))


@pytest.mark.parametrize("text", [True, False])
@pytest.mark.parametrize("version", [42, 51])
@pytest.mark.parametrize("of_grid", [True, False])
def test_legacy_files_of_both_layouts_are_read(tmp_path, text, version, of_grid):
    from vtkmodules.vtkIOLegacy import vtkPolyDataWriter, vtkUnstructuredGridWriter

    writer = vtkUnstructuredGridWriter() if of_grid else vtkPolyDataWriter()
    writer.SetFileType(1 if text else 2)
    writer.SetFileVersion(version)
    (surface,) = read_surfaces(saved(writer, as_grid(polydata()) if of_grid else polydata(), tmp_path / "a.vtk"))
    assert surface.triangles.tolist() == TRIANGLES.tolist()
    assert np.abs(surface.vertices - CORNERS).max() <= (1.0 if text else 0.0)  # VTK writes text to six digits


@pytest.mark.parametrize("suffix", [".vtp", ".vtk"])
def test_quadrilaterals_strips_and_lines_are_split_or_left_out_and_told(tmp_path, suffix):
    from vtkmodules.vtkIOLegacy import vtkPolyDataWriter
    from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter

    mesh = polydata((("Polys", [[0, 1, 2, 3]]), ("Strips", [[0, 1, 3, 2]]), ("Lines", [[0, 1]]), ("Verts", [[2]])))
    (surface,) = read_surfaces(saved(vtkXMLPolyDataWriter() if suffix == ".vtp" else vtkPolyDataWriter(), mesh, tmp_path / f"a{suffix}"))
    made = {tuple(row) for row in surface.triangles.tolist()}
    assert made == {(0, 1, 2), (0, 2, 3), (0, 1, 3), (1, 2, 3)}
    assert set(surface.history) == {
        "1 polygon split into triangles",
        "1 triangle strip split into triangles",
        "1 line or point cell left out",
    }


@pytest.mark.parametrize("suffix", [".vtp", ".vtu"])
def test_vtk_reads_what_is_written_with_its_arrays(tmp_path, suffix, capfd):
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkIOXML import vtkXMLPolyDataReader, vtkXMLUnstructuredGridReader

    arrays = {
        "dip_deg": np.array([30.5, 60.25], "f4"),
        "slip": np.arange(6.0).reshape(2, 3),
        "flag": np.array([True, False]),
        "half": np.array([0.5, 1.5], "f2"),
        'a "b" <c>': np.array([1, 2]),
        "verdict": np.array(["consistent", "conflicting"]),
    }
    write_surface(tmp_path / f"a{suffix}", Surface("Nördlich & Süd", CORNERS, TRIANGLES), arrays)
    reader = vtkXMLPolyDataReader() if suffix == ".vtp" else vtkXMLUnstructuredGridReader()
    reader.SetFileName(str(tmp_path / f"a{suffix}"))
    reader.Update()
    mesh = reader.GetOutput()
    found = {
        mesh.GetCellData().GetArrayName(k): vtk_to_numpy(mesh.GetCellData().GetArray(k))
        for k in range(mesh.GetCellData().GetNumberOfArrays())
    }
    assert mesh.GetPoints().GetDataType() == 11  # double
    assert np.array_equal(vtk_to_numpy(mesh.GetPoints().GetData()), CORNERS)
    assert [[mesh.GetCell(c).GetPointId(k) for k in range(3)] for c in range(mesh.GetNumberOfCells())] == TRIANGLES.tolist()
    assert found.keys() == arrays.keys()
    assert found["dip_deg"].dtype == np.float32
    for name in ("dip_deg", "slip", "half", 'a "b" <c>'):
        assert np.array_equal(found[name], arrays[name])
    legend = mesh.GetFieldData().GetAbstractArray("verdict_legend")
    assert [legend.GetValue(int(code)) for code in found["verdict"]] == ["consistent", "conflicting"]
    assert mesh.GetFieldData().GetAbstractArray("name").GetValue(0) == "Nördlich & Süd"
    assert capfd.readouterr().err == ""


def test_several_pieces_are_joined():
    def piece(count, points, corners):
        return (
            f'<Piece NumberOfPoints="{count}" NumberOfPolys="1"><Points><DataArray type="Float64" NumberOfComponents="3" format="ascii">'
            f"{points}</DataArray></Points><Polys>"
            f'<DataArray type="Int32" Name="connectivity" format="ascii">{corners}</DataArray>'
            '<DataArray type="Int32" Name="offsets" format="ascii">3</DataArray></Polys></Piece>'
        )

    text = '<VTKFile type="PolyData" version="0.1"><PolyData>' + piece(3, "0 0 0 1 0 0 0 1 0", "0 1 2") + piece(4, "9 9 9 " * 4, "1 2 3")
    (surface,) = read_pieces((text + "</PolyData></VTKFile>").encode(), "a.vtp")
    assert surface.triangles.tolist() == [[0, 1, 2], [4, 5, 6]]
    assert len(surface.vertices) == 7


def test_a_volume_without_triangles_says_so(tmp_path):
    from vtkmodules.vtkIOLegacy import vtkUnstructuredGridWriter
    from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridWriter

    for writer, suffix in ((vtkXMLUnstructuredGridWriter(), ".vtu"), (vtkUnstructuredGridWriter(), ".vtk")):
        path = saved(writer, grid(10, [0, 1, 2, 3]), tmp_path / f"a{suffix}")
        with pytest.raises(SurfaceError, match="1 volume cell and no triangles"):
            read_surfaces(path)


def test_other_vtk_data_sets_are_refused():
    legacy = b"# vtk DataFile Version 3.0\nt\nASCII\nDATASET STRUCTURED_POINTS\nDIMENSIONS 2 2 2\n"
    with pytest.raises(FormatError, match="a data set STRUCTURED_POINTS; wanted POLYDATA or UNSTRUCTURED_GRID"):
        read_pieces(legacy, "a.vtk")
    with pytest.raises(FormatError, match="XML of another kind"):
        read_pieces(b'<?xml version="1.0"?><VTKFile type="ImageData"></VTKFile>', "a.vti")


def test_entities_are_refused():
    bomb = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa">]><VTKFile type="PolyData"><PolyData>&a;</PolyData></VTKFile>'
    with pytest.raises(FormatError, match="document type or entities"):
        read_pieces(bomb, "a.vtp")


@pytest.mark.parametrize("count", ["999999999999", "-4", "four"])
def test_counts_that_cannot_be_are_refused_at_once(count):
    legacy = f"# vtk DataFile Version 3.0\nt\nBINARY\nDATASET POLYDATA\nPOINTS {count} double\n".encode() + bytes(100)
    with pytest.raises(InputError, match=r"a\.vtk: found"):
        read_pieces(legacy, "a.vtk")
    text = f'<VTKFile type="PolyData"><PolyData><Piece NumberOfPoints="{count}" NumberOfPolys="{count}"/></PolyData></VTKFile>'
    with pytest.raises(InputError, match=r"a\.vtp: found"):
        read_pieces(text.encode(), "a.vtp")
