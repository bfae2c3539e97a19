"""Gmsh MSH: groups of triangles, with and without a volume around them, in all four encodings."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import FormatError, SurfaceError
from structviz.io import read_model, read_surfaces
from structviz.io.ledger import read_pieces

TWO = """$MeshFormat
2.2 0 8
$EndMeshFormat
{names}$Nodes
5
10 0 0 0
20 1 0 0
30 0 1 0
40 0.25 0.25 1
50 0.25 0.25 -1
$EndNodes
$Elements
{count}
{elements}
$EndElements
"""
NAMES = '$PhysicalNames\n2\n2 7 "main fault"\n2 8 "top"\n$EndPhysicalNames\n'
TETRAHEDRA = ["1 4 2 1 1 10 20 30 40", "2 4 2 1 1 10 20 30 50"]  # they share the triangle 10 20 30


def msh(*elements, names=NAMES):
    return TWO.format(names=names, count=len(elements), elements="\n".join(elements)).encode()


def test_named_groups_are_surfaces_and_other_triangles_are_not():
    found = read_pieces(msh("1 2 2 7 1 10 20 30", "2 2 2 0 1 10 20 40", "3 2 2 8 1 20 30 40", "4 15 2 9 1 10"), "a.msh")
    assert [(piece.name, len(piece.triangles), len(piece.vertices)) for piece in found] == [("main fault", 1, 3), ("top", 1, 3)]
    assert found[1].vertices[found[1].triangles[0]].tolist() == [[1, 0, 0], [0, 1, 0], [0.25, 0.25, 1]]


def test_groups_without_name_take_their_tag():
    assert [piece.name for piece in read_pieces(msh("1 2 2 12 1 10 20 30", names=""), "a.msh")] == ["group 12"]


def test_without_groups_all_triangles_are_one_surface():
    (piece,) = read_pieces(msh("1 2 2 0 1 10 20 30", "2 2 2 0 1 10 20 40", names=""), "a.msh")
    assert (piece.name, len(piece.triangles)) == ("", 2)


def test_quadrilaterals_and_curved_triangles_are_told():
    (piece,) = read_pieces(msh("1 3 2 7 1 10 20 30 40", "2 9 2 7 1 10 20 30 40 50 40"), "a.msh")
    assert len(piece.triangles) == 3
    assert piece.history == ("quadrilaterals split into triangles", "curved faces read by the corners only")


def test_a_group_on_the_outside_of_the_volume_bounds_the_model(tmp_path):
    (tmp_path / "a.msh").write_bytes(msh(*TETRAHEDRA, "3 2 2 7 1 30 10 20", "4 2 2 8 1 20 30 40"))
    model = read_model(tmp_path)
    assert [fault.name for fault in model.faults] == ["main fault"]
    assert any("top left out: it lies on the outside of the volume mesh" in finding.message for finding in model.findings)
    assert [surface.name for surface in read_surfaces(tmp_path / "a.msh")] == ["main fault", "top"]


def test_a_boundary_can_be_used_by_its_name(tmp_path):
    (tmp_path / "a.msh").write_bytes(msh(*TETRAHEDRA, "3 2 2 7 1 10 20 30", "4 2 2 8 1 20 30 40"))
    (tmp_path / "faults.csv").write_text("name,surface\nT,a.msh#top\n")
    assert len(read_model(tmp_path).faults[0].surface.triangles) == 1


def test_where_all_groups_lie_outside_they_are_all_used(tmp_path):
    (tmp_path / "a.msh").write_bytes(msh(*TETRAHEDRA, "4 2 2 8 1 20 30 40"))
    assert [fault.name for fault in read_model(tmp_path).faults] == ["top"]


def test_a_volume_alone_says_what_to_do():
    with pytest.raises(SurfaceError, match=r"volume cell.* and no triangles.*\n.*in Gmsh name a physical group of triangles"):
        read_pieces(msh(*TETRAHEDRA), "a.msh")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("2.2 0 8", "4.0 0 8", "MSH version 4.0; wanted MSH 2.2 or 4.1"),
        ("2.2 0 8", "1 0 8", "MSH version 1"),
        ("10 20 30\n", "10 20 60\n", "elements on nodes that are not in the file"),
        ("10 20 30\n", "10 20\n", "an element row of the wrong length"),
        ("1 2 2 7", "1 77 2 7", "element type 77"),
        ("$Nodes\n5", "$Nodes\n6", r"section \$Nodes that ends too early"),
        ("$Elements\n2", "$Elements\n9", "2 elements; wanted 9"),
        ("0.25 0.25 1\n", "0.25 0.25 up\n", r"section \$Nodes; wanted numbers"),
        ("$Nodes", "$Knots", r"no count in section \$Nodes"),
    ],
)
def test_damaged_files_are_told(old, new, message):
    content = msh("1 2 2 7 1 10 20 30", "2 2 2 8 1 10 20 40")
    with pytest.raises(FormatError, match=message):
        read_pieces(content.replace(old.encode(), new.encode(), 1), "a.msh")


@pytest.mark.parametrize("kind", ["gmsh", "gmsh22"])
@pytest.mark.parametrize("binary", [True, False])
def test_what_another_library_writes_is_read(tmp_path, kind, binary):
    meshio = pytest.importorskip("meshio")
    places = np.random.default_rng(1).normal(0, 1e6, (6, 3))
    triangles, groups = np.array([[0, 1, 2], [2, 3, 4], [3, 4, 5]]), np.array([4, 9, 9])
    cell_data = {"gmsh:physical": [groups], "gmsh:geometrical": [groups]}
    mesh = meshio.Mesh(
        places, [("triangle", triangles)], cell_data=cell_data if kind == "gmsh22" else {}, field_data={"F": np.array([9, 2])}
    )
    meshio.write(tmp_path / "a.msh", mesh, file_format=kind, binary=binary)
    found = read_surfaces(tmp_path / "a.msh")
    assert [surface.name for surface in found] == (["group 4", "F"] if kind == "gmsh22" else ["a"])
    assert np.array_equal(found[-1].vertices[found[-1].triangles], places[triangles[groups == 9] if kind == "gmsh22" else triangles])
