"""DXF text made by ezdxf: faces, meshes, blocks; damage and what is not read."""

from __future__ import annotations

import io
import sys
from pathlib import Path

import ezdxf
import numpy as np
import pytest
from ezdxf.render import MeshBuilder

from structviz.errors import InputError, StructvizError
from structviz.io import read_model, read_surfaces
from structviz.io.ledger import read_pieces

SQUARE = [(0, 0, 0), (10, 0, 0), (10, 10, -5), (0, 10, -5)]


def text_of(document) -> bytes:
    out = io.StringIO()
    document.write(out)
    return out.getvalue().encode()


def drawing(**layers: list) -> bytes:
    """Return DXF with 3D faces by layer."""
    document = ezdxf.new()
    for layer, faces in layers.items():
        for face in faces:
            document.modelspace().add_3dface(face, dxfattribs={"layer": layer})
    return text_of(document)


def corners(piece) -> set[tuple]:
    return {tuple(sorted(map(tuple, triangle))) for triangle in piece.vertices[piece.triangles].tolist()}


def test_faces_become_one_surface_a_layer_with_corners_joined() -> None:
    pieces = read_pieces(drawing(West=[SQUARE, [(10, 0, 0), (20, 0, 0), (10, 10, -5)]], East=[SQUARE]), "a.dxf")
    assert [(piece.name, len(piece.vertices), len(piece.triangles)) for piece in pieces] == [("West", 5, 3), ("East", 4, 2)]
    assert pieces[1].vertices.dtype == np.float64


@pytest.mark.parametrize("kind", ["polyface", "mesh"])
def test_meshes_hold_the_same_triangles_as_faces(kind: str) -> None:
    built = MeshBuilder()
    built.vertices, built.faces = [ezdxf.math.Vec3(place) for place in SQUARE], [(0, 1, 2), (0, 2, 3)]
    document = ezdxf.new()
    if kind == "polyface":
        built.render_polyface(document.modelspace(), dxfattribs={"layer": "F"})
    else:
        built.render_mesh(document.modelspace(), dxfattribs={"layer": "F"})
    (piece,) = read_pieces(text_of(document), "a.dxf")
    (plain,) = read_pieces(drawing(F=[[SQUARE[0], SQUARE[1], SQUARE[2]], [SQUARE[0], SQUARE[2], SQUARE[3]]]), "a.dxf")
    assert corners(piece) == corners(plain)


def test_a_polygon_mesh_is_read() -> None:
    document = ezdxf.new()
    mesh = document.modelspace().add_polymesh((3, 2), dxfattribs={"layer": "F"})
    for m in range(3):
        for n in range(2):
            mesh.set_mesh_vertex((m, n), (10 * m, 10 * n, -m))
    (piece,) = read_pieces(text_of(document), "a.dxf")
    assert (len(piece.vertices), len(piece.triangles)) == (6, 4)


def test_blocks_are_placed_where_they_are_inserted() -> None:
    document = ezdxf.new()
    document.blocks.new("B").add_3dface(SQUARE, dxfattribs={"layer": "F"})
    document.modelspace().add_blockref("B", (100, 200, 0), dxfattribs={"rotation": 90})
    (piece,) = read_pieces(text_of(document), "a.dxf")
    # Turned a quarter: (x, y) to (-y, x), then moved.
    assert np.allclose(sorted(piece.vertices.tolist()), sorted([[100, 200, 0], [100, 210, 0], [90, 210, -5], [90, 200, -5]]))


def test_blocks_that_hold_themselves_are_refused() -> None:
    document = ezdxf.new()
    block = document.blocks.new("B")
    block.add_3dface(SQUARE)
    block.add_blockref("B", (1, 0, 0))
    document.modelspace().add_blockref("B", (0, 0, 0))
    with pytest.raises(InputError, match=r"a\.dxf: found (blocks within blocks without end|.*error)"):
        read_pieces(text_of(document), "a.dxf")


def test_unit_and_what_is_not_read_are_told(tmp_path: Path) -> None:
    document = ezdxf.new()
    document.header["$INSUNITS"] = 2
    document.modelspace().add_3dface(SQUARE, dxfattribs={"layer": "F"})
    document.modelspace().add_line((0, 0), (1, 1))
    (tmp_path / "a.dxf").write_bytes(text_of(document))
    told = " ".join(finding.message for finding in read_model(tmp_path / "a.dxf").findings)
    assert "1 LINE not read" in told
    assert "its header says feet: coordinates are taken as they stand, so give length_unit in a model file" in told


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (drawing(F=[SQUARE])[:-200], "text that breaks off"),
        (drawing(), r"no faces \(no entities\)"),
        (b"AutoCAD Binary DXF\r\n\x1a\x00" + bytes(50), "binary DXF"),
    ],
)
def test_what_cannot_be_used_is_refused(content: bytes, said: str) -> None:
    with pytest.raises(InputError, match=rf"a\.dxf: found {said}"):
        read_pieces(content, "a.dxf")


def test_without_the_library_the_next_step_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "ezdxf", None)
    with pytest.raises(
        StructvizError, match=r"a\.dxf: DXF is read through ezdxf, which is not installed\n  next: pip install 'structviz\[formats\]'"
    ):
        read_pieces(b"0\nSECTION\n2\nENTITIES\n0\nENDSEC\n0\nEOF\n", "a.dxf")


def test_the_name_of_the_layer_is_the_name_of_the_fault(tmp_path: Path) -> None:
    (tmp_path / "a.dxf").write_bytes(drawing(**{"North Boundary": [SQUARE]}))
    assert [surface.name for surface in read_surfaces(tmp_path / "a.dxf")] == ["North Boundary"]


def test_rows_and_columns_of_one_insert_are_placed() -> None:
    document = ezdxf.new()
    document.blocks.new("B").add_3dface(SQUARE, dxfattribs={"layer": "F"})
    rows = {"row_count": 2, "column_count": 3, "row_spacing": 100, "column_spacing": 200}
    document.modelspace().add_blockref("B", (0, 0, 0), dxfattribs=rows)
    (piece,) = read_pieces(text_of(document), "a.dxf")
    assert len(piece.triangles) == 12
    assert piece.vertices[:, :2].max(0).tolist() == [410, 110]


@pytest.mark.parametrize("side", [200, 30_000])
def test_blocks_inserted_again_and_again_are_refused_in_bounded_time(side: int) -> None:
    document = ezdxf.new()
    document.blocks.new("B").add_point((0, 0, 0))
    rows = {"row_count": side, "column_count": side, "row_spacing": 1, "column_spacing": 1}
    document.modelspace().add_blockref("B", (0, 0, 0), dxfattribs=rows)
    with pytest.raises(InputError, match="blocks within blocks without end"):
        read_pieces(text_of(document), "a.dxf")
