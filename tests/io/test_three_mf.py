"""3MF packages: placings by hand-computed numbers, units, names, trimesh as a second opinion, and packages made to do harm."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path

import numpy as np
import pytest
import trimesh

from structviz.errors import InputError
from structviz.io import read_model, read_surfaces, write_surface
from structviz.io.formats.three_mf import write_all
from structviz.io.ledger import read_pieces
from structviz.surfaces.surface import Surface
from structviz.synthetic.damage import sound_surface

TRIANGLE = '<vertices><vertex x="1" y="2" z="3"/><vertex x="2" y="2" z="3"/><vertex x="1" y="4" z="3"/></vertices>'
MESH = f'<mesh>{TRIANGLE}<triangles><triangle v1="0" v2="1" v3="2"/></triangles></mesh>'


def package(model: str, unit: str = ' unit="meter"', **more: bytes) -> bytes:
    """Return a package with a model as its core specification lays it out."""
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w") as archive:
        kind = "http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel"
        archive.writestr("_rels/.rels", f'<Relationships><Relationship Target="/3D/a.model" Type="{kind}"/></Relationships>')
        archive.writestr("3D/a.model", f'<model{unit} xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02">{model}</model>')
        for name, content in more.items():
            archive.writestr(name, content)
    return out.getvalue()


def objects(*bodies: str, items: str = '<item objectid="1"/>') -> str:
    listed = "".join(f'<object id="{k}" name="F{k}">{body}</object>' for k, body in enumerate(bodies, 1))
    return f"<resources>{listed}</resources><build>{items}</build>"


def test_an_item_is_placed_by_its_transform() -> None:
    # Rows x, y, z turned a quarter about the vertical (x to y, y to -x), then moved by (10, 20, 30): by hand.
    (piece,) = read_pieces(package(objects(MESH, items='<item objectid="1" transform="0 1 0 -1 0 0 0 0 1 10 20 30"/>')), "a.3mf")
    assert piece.vertices.tolist() == [[8, 21, 33], [8, 22, 33], [6, 21, 33]]
    assert (piece.name, piece.framed, piece.history) == ("F1", True, ())


def test_a_mirror_turns_the_triangles_so_that_they_face_as_before() -> None:
    (piece,) = read_pieces(package(objects(MESH, items='<item objectid="1" transform="-1 0 0 0 1 0 0 0 1 0 0 0"/>')), "a.3mf")
    assert piece.triangles.tolist() == [[0, 2, 1]]


def test_components_are_placed_in_their_object_and_items_apart() -> None:
    inner = '<components><component objectid="1" transform="1 0 0 0 1 0 0 0 1 100 0 0"/><component objectid="1"/></components>'
    items = '<item objectid="2" transform="2 0 0 0 2 0 0 0 2 0 0 0"/><item objectid="1"/>'
    pieces = read_pieces(package(objects(MESH, inner, items=items)), "a.3mf")
    assert [piece.name for piece in pieces] == ["F2", "F1"]
    assert pieces[0].vertices[:, 0].tolist() == [202, 204, 202, 2, 4, 2]
    assert pieces[0].triangles.tolist() == [[0, 1, 2], [3, 4, 5]]


@pytest.mark.parametrize(("unit", "metres"), [("foot", 0.3048), ("meter", 1.0)])
def test_units_are_converted_and_told(unit: str, metres: float) -> None:
    (piece,) = read_pieces(package(objects(MESH), unit=f' unit="{unit}"'), "a.3mf")
    assert np.allclose(piece.vertices, np.array([[1, 2, 3], [2, 2, 3], [1, 4, 3]]) * metres, rtol=1e-15)
    assert piece.history == (() if unit == "meter" else (f"coordinates converted from {unit} to m",))


@pytest.mark.parametrize("unit", ["", ' unit="millimeter"'])
def test_in_units_of_printed_parts_numbers_stand_and_a_model_file_may_say_what_they_are(unit: str, tmp_path: Path) -> None:
    (tmp_path / "a.3mf").write_bytes(package(objects(MESH), unit=unit))
    (tmp_path / "model.toml").write_text('title = "t"\nlength_unit = "km"\n[[fault]]\nname = "F"\nsurface = "a.3mf"\n', encoding="utf-8")
    surface = read_model(tmp_path).faults[0].surface
    assert surface.vertices[0].tolist() == [1000, 2000, 3000]
    assert "the file says millimeter, in which no fault is drawn: its numbers are taken as they stand" in surface.history


def test_trimesh_reads_what_is_written_and_the_other_way_round(tmp_path: Path) -> None:
    surfaces = [sound_surface("one"), Surface("two <&>", sound_surface().vertices + [100.0, 0, 0], sound_surface().triangles)]
    (tmp_path / "ours.3mf").write_bytes(write_all([(surface, {}) for surface in surfaces]))
    scene = trimesh.load(tmp_path / "ours.3mf", process=False)
    for mesh, surface in zip(sorted(scene.geometry.values(), key=lambda mesh: mesh.vertices[0, 0]), surfaces, strict=True):
        assert np.allclose(mesh.triangles, surface.vertices[surface.triangles], atol=1e-6)
    theirs = trimesh.Trimesh(surfaces[0].vertices, surfaces[0].triangles, process=False)
    (tmp_path / "theirs.3mf").write_bytes(theirs.export(file_type="3mf"))
    (back,) = read_surfaces(tmp_path / "theirs.3mf")
    assert np.allclose(back.vertices[back.triangles], surfaces[0].vertices[surfaces[0].triangles], atol=1e-4)


@pytest.mark.parametrize(
    ("model", "said"),
    [
        (objects(MESH, items='<item objectid="7"/>'), "object '7', which is not in the file"),
        (objects('<components><component objectid="1"/></components>'), "objects that hold each other without end"),
        (objects(MESH.replace('v3="2"', 'v3="9"')), "corner number 9 in a triangle"),
        (objects(MESH.replace('v3="2"', 'v3="x"')), "'x' among the corners of triangles"),
        (objects(MESH.replace('x="1"', 'x="one"')), "vertices that are no numbers"),
        (objects(MESH, items='<item objectid="1" transform="1 0 0"/>'), "a transform of 3 numbers"),
        (objects(""), "no triangles"),
    ],
)
def test_models_that_do_not_hold_together_are_refused(model: str, said: str) -> None:
    with pytest.raises(InputError, match=f"a.3mf: found {said}"):
        read_pieces(package(model), "a.3mf")


def test_many_objects_within_objects_end_in_an_error_and_not_in_hours() -> None:
    doubled = ["<components>" + f'<component objectid="{k + 2}"/>' * 60 + "</components>" for k in range(6)]
    with pytest.raises(InputError, match="objects that hold each other without end"):
        read_pieces(package(objects(*doubled, MESH)), "a.3mf")


def test_entities_bombs_and_unknown_units_are_refused() -> None:
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(package(objects(MESH)))) as old, zipfile.ZipFile(out, "w") as new:
        for name in old.namelist():
            new.writestr(name, old.read(name).replace(b"<model", b"<!DOCTYPE a><model"))
    with pytest.raises(InputError, match="a document type or entities"):
        read_pieces(out.getvalue(), "a.3mf")
    with pytest.raises(InputError, match="unit 'furlong'"):
        read_pieces(package(objects(MESH), unit=' unit="furlong"'), "a.3mf")
    bomb = io.BytesIO()
    with zipfile.ZipFile(bomb, "w", zipfile.ZIP_DEFLATED) as archive:
        with zipfile.ZipFile(io.BytesIO(package(objects(MESH)))) as old:
            archive.writestr("_rels/.rels", old.read("_rels/.rels"))
        archive.writestr("3D/a.model", b"<model>" + b" " * 30_000_000 + b"</model>")
    with pytest.raises(InputError, match="that unpacks to 30,000,015"):
        read_pieces(bomb.getvalue(), "a.3mf")


def test_the_suffix_writes_it(tmp_path: Path) -> None:
    write_surface(tmp_path / "a.3mf", sound_surface("one"))
    assert read_surfaces(tmp_path / "a.3mf")[0].name == "one"


def test_copies_of_copies_are_refused_before_they_fill_the_memory() -> None:
    doubled = ["<components>" + f'<component objectid="{k}"/>' * 10 + "</components>" for k in range(1, 5)]
    rows = "".join(f'<vertex x="{k}" y="{k * k}" z="0"/>' for k in range(500))
    mesh = f'<mesh><vertices>{rows}</vertices><triangles><triangle v1="0" v2="1" v3="2"/></triangles></mesh>'
    with pytest.raises(InputError, match="objects that are placed again and again; wanted at most 2,000,000"):
        read_pieces(package(objects(mesh, *doubled, items='<item objectid="5"/>')), "a.3mf")
    (piece,) = read_pieces(package(objects(mesh, *doubled, items='<item objectid="3"/>')), "a.3mf")
    assert len(piece.triangles) == 100


def test_a_mirrored_component_turns_its_own_triangles_only() -> None:
    mirror = 'transform="-1 0 0 0 1 0 0 0 1 0 0 0"'
    inner = f'<components><component objectid="1" {mirror}/><component objectid="1"/></components>'
    plain, turned = (
        read_pieces(package(objects(MESH, inner, items=f'<item objectid="2" {placing}/>')), "a.3mf")[0] for placing in ("", mirror)
    )
    assert plain.triangles.tolist() == [[0, 2, 1], [3, 4, 5]]
    assert turned.triangles.tolist() == [[0, 1, 2], [3, 5, 4]]
