"""glTF 2.0: trimesh as a second opinion, transforms by hand, every way to store corners, the standard's rules, hostile documents."""

from __future__ import annotations

import base64
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import trimesh

from structviz.errors import InputError
from structviz.io import read_model, read_surfaces
from structviz.io.formats.gltf import write_all
from structviz.io.ledger import read_pieces
from structviz.surfaces.surface import Surface
from structviz.synthetic.damage import sound_surface

PLACES = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [1, 1, 0]], "<f4")
HALF = np.sqrt(0.5)


def document(places: np.ndarray = PLACES, corners: np.ndarray | None = None, mode: int = 4, **node: Any) -> dict[str, Any]:
    """Return a document with one mesh on one node, its buffer a data URI, as the standard lays it out."""
    raw = places.astype("<f4").tobytes()
    tree: dict[str, Any] = {"asset": {"version": "2.0"}, "scene": 0, "scenes": [{"nodes": [0]}], "nodes": [{"mesh": 0, "name": "F"} | node]}
    primitive: dict[str, Any] = {"attributes": {"POSITION": 0}, "mode": mode}
    tree["bufferViews"] = [{"buffer": 0, "byteOffset": 0, "byteLength": len(raw)}]
    tree["accessors"] = [{"bufferView": 0, "componentType": 5126, "count": len(places), "type": "VEC3"}]
    if corners is not None:
        kind = {"uint8": 5121, "uint16": 5123, "uint32": 5125}[corners.dtype.name]
        tree["bufferViews"].append({"buffer": 0, "byteOffset": len(raw), "byteLength": corners.nbytes})
        tree["accessors"].append({"bufferView": 1, "componentType": kind, "count": len(corners), "type": "SCALAR"})
        primitive["indices"] = 1
        raw += corners.tobytes()
    tree["meshes"] = [{"name": "M", "primitives": [primitive]}]
    tree["buffers"] = [{"byteLength": len(raw), "uri": "data:application/octet-stream;base64," + base64.b64encode(raw).decode()}]
    return tree


def read(tree: dict[str, Any]):
    return read_pieces(json.dumps(tree).encode(), "a.gltf")


def triangles(piece) -> list[list[list[float]]]:
    return np.round(piece.vertices[piece.triangles], 6).tolist()


@pytest.mark.parametrize("kind", ["uint8", "uint16", "uint32"])
def test_lists_strips_fans_and_bare_places_hold_the_same_triangles(kind: str) -> None:
    listed = read(document(corners=np.array([0, 1, 2, 1, 3, 2], kind)))[0]
    strip = read(document(corners=np.array([0, 1, 2, 3], kind), mode=5))[0]
    fan = read(document(corners=np.array([2, 0, 1, 3], kind), mode=6))[0]
    bare = read(document(PLACES[[0, 1, 2, 1, 3, 2]]))[0]
    assert len(listed.triangles) == 2
    same = {tuple(sorted(map(tuple, t))) for t in triangles(listed)}
    for other in (strip, fan, bare):
        assert {tuple(sorted(map(tuple, t))) for t in triangles(other)} == same or other is fan
    normals = [np.cross(*(np.diff(np.array(t), axis=0))) for piece in (listed, strip, fan, bare) for t in triangles(piece)]
    assert all(np.allclose(normal, normals[0]) for normal in normals)  # a strip turns every second triangle


def test_y_is_up_and_z_is_south() -> None:
    (piece,) = read(document(np.array([[1, 2, 3], [4, 5, 6], [7, 8, 10]], "<f4")))
    assert piece.vertices.tolist() == [[1, -3, 2], [4, -6, 5], [7, -10, 8]]
    assert piece.name == "F"


def test_transforms_of_nodes_are_applied_one_after_the_other() -> None:
    tree = document(PLACES[:3], rotation=[0, 0, HALF, HALF], scale=[2, 2, 2], translation=[10, 0, 0])
    tree["nodes"] = [{"children": [1], "translation": [0, 100, 0]}, tree["nodes"][0]]
    (piece,) = read(tree)
    # A quarter turn about z carries x to y: (1, 0, 0) doubled is (0, 2, 0), then moved by (10, 100, 0); easting x, up y.
    assert np.allclose(piece.vertices, [[10, 0, 100], [10, 0, 102], [8, 0, 100]])
    matrix = [0, 2, 0, 0, -2, 0, 0, 0, 0, 0, 2, 0, 10, 0, 0, 1]
    tree["nodes"][1] = {"mesh": 0, "matrix": matrix}
    assert np.allclose(read(tree)[0].vertices, piece.vertices)


def test_a_mirror_keeps_the_side_that_faced_outwards() -> None:
    plain, mirrored = read(document(PLACES[:3]))[0], read(document(PLACES[:3], scale=[-1, 1, 1]))[0]
    assert mirrored.triangles.tolist() == [[0, 2, 1]]
    assert plain.triangles.tolist() == [[0, 1, 2]]


def test_strides_and_sparse_values_are_read() -> None:
    wide = np.zeros((3, 5), "<f4")
    wide[:, :3] = PLACES[:3]
    tree = document(PLACES[:3])
    tree["buffers"][0] = {"byteLength": 60, "uri": "data:;base64," + base64.b64encode(wide.tobytes()).decode()}
    tree["bufferViews"][0] |= {"byteLength": 60, "byteStride": 20}
    assert triangles(read(tree)[0]) == triangles(read(document(PLACES[:3]))[0])
    raw = np.array([2], "<u2").tobytes() + b"\0\0" + np.array([5, 6, 7], "<f4").tobytes()
    tree = document(PLACES[:3])
    tree["buffers"].append({"byteLength": 16, "uri": "data:;base64," + base64.b64encode(raw).decode()})
    tree["bufferViews"] += [{"buffer": 1, "byteLength": 2}, {"buffer": 1, "byteOffset": 4, "byteLength": 12}]
    tree["accessors"][0]["sparse"] = {"count": 1, "indices": {"bufferView": 1, "componentType": 5123}, "values": {"bufferView": 2}}
    assert read(tree)[0].vertices[2].tolist() == [5, -7, 6]


def test_a_buffer_beside_is_read_and_counted_among_the_inputs(tmp_path: Path) -> None:
    tree = document(PLACES[:3])
    (tmp_path / "a.bin").write_bytes(PLACES[:3].tobytes())
    tree["buffers"][0]["uri"] = "a.bin"
    (tmp_path / "a.gltf").write_text(json.dumps(tree), encoding="utf-8")
    assert {entry.path for entry in read_model(tmp_path / "a.gltf").inputs} == {"a.gltf", "a.bin"}
    for uri in ("../a.bin", "/etc/passwd"):
        tree["buffers"][0]["uri"] = uri
        (tmp_path / "a.gltf").write_text(json.dumps(tree), encoding="utf-8")
        with pytest.raises(InputError, match="which leaves the folder"):
            read_model(tmp_path / "a.gltf")


def test_trimesh_reads_what_is_written_and_the_other_way_round(tmp_path: Path) -> None:
    surfaces = [sound_surface("one"), Surface("two <&>", sound_surface().vertices + [100.0, 5e5, 0], sound_surface().triangles)]
    (tmp_path / "ours.glb").write_bytes(write_all([(surface, {}) for surface in surfaces]))
    scene = trimesh.load(tmp_path / "ours.glb", process=False)
    for surface in surfaces:
        placing, mesh = scene.graph[surface.name]
        found = trimesh.transform_points(scene.geometry[mesh].vertices, placing)[:, [0, 2, 1]] * [1, -1, 1]
        assert np.abs(found - surface.vertices).max() < 0.01
    theirs = trimesh.Trimesh(surfaces[0].vertices - surfaces[0].vertices.mean(0), surfaces[0].triangles, process=False)
    (tmp_path / "theirs.glb").write_bytes(theirs.export(file_type="glb"))
    (back,) = read_surfaces(tmp_path / "theirs.glb")
    assert np.allclose(back.vertices, theirs.vertices[:, [0, 2, 1]] * [1, -1, 1], atol=1e-3)


def test_what_is_written_keeps_the_rules_of_the_standard() -> None:
    content = write_all([(sound_surface("one"), {}), (sound_surface("two"), {})])
    assert (content[:4], int.from_bytes(content[4:8], "little"), int.from_bytes(content[8:12], "little")) == (b"glTF", 2, len(content))
    length = int.from_bytes(content[12:16], "little")
    assert length % 4 == 0
    tree = json.loads(content[20 : 20 + length])
    assert len(content) == 28 + length + int.from_bytes(content[20 + length : 24 + length], "little")
    for entry in tree["accessors"]:
        view = tree["bufferViews"][entry["bufferView"]]
        assert view["byteOffset"] % 4 == 0
        assert view["byteOffset"] + view["byteLength"] <= tree["buffers"][0]["byteLength"]
        if entry["type"] == "VEC3":
            places = np.frombuffer(content, "<f4", 3 * entry["count"], 28 + length + view["byteOffset"]).reshape(-1, 3)
            assert entry["min"] == places.min(0).tolist()
            assert entry["max"] == places.max(0).tolist()


def changed(change) -> dict[str, Any]:
    tree = document(corners=np.array([0, 1, 2], "uint16"))
    change(tree)
    return tree


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (lambda t: t["nodes"][0].update(children=[0]), "nodes that hold each other without end"),
        (lambda t: t["nodes"][0].update(mesh=7), "meshes 7, which is not in the file"),
        (lambda t: t["accessors"][0].update(count=10**12), "positions of 12,000,000,000,000 bytes in a view of 48"),
        (lambda t: t["accessors"][0].update(count=-1), "positions of type"),
        (lambda t: t["bufferViews"][0].update(byteOffset=-4), "positions at no place"),
        (lambda t: t["buffers"][0].update(byteLength=10**9), "a buffer of 54 bytes"),
        (lambda t: t["buffers"][0].update(uri="https://x.org/a.bin"), "a buffer at 'https://x.org/a.bin'"),
        (lambda t: t["buffers"][0].update(uri="data:,%%%"), "a data URI that cannot be decoded"),
        (lambda t: t["meshes"][0]["primitives"][0].update(mode=9), "corners of mode 9"),
        (lambda t: t["meshes"][0]["primitives"][0].update(mode=1), "no triangles"),
        (lambda t: t["nodes"][0].update(scale=[1, 2]), r"a scale \[1, 2\]"),
        (lambda t: t.update(extensionsRequired=["KHR_draco_mesh_compression"]), "meshes packed with KHR_draco_mesh_compression"),
        (lambda t: t["asset"].update(version="1.0"), "glTF version '1.0'"),
        (lambda t: t["accessors"][1].update(componentType=5126), "corners of 12 bytes|corners of mode 4"),
        (lambda t: t["accessors"][0].pop("bufferView"), "positions without data"),
    ],
)
def test_documents_that_do_not_hold_together_are_refused(change, said: str) -> None:
    with pytest.raises(InputError, match=f"a.gltf: found {said}"):
        read(changed(change))


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (b"glTF" + bytes(20), "GLB version 0"),
        (b'{"asset": {"version": "2.0"}, "nodes": [NaN]}', "JSON that cannot be read"),
        (b'{"asset": 3, "nodes": []}', "JSON without an asset"),
        (b'{"asset": {"version": "2.0"}, "nodes": ' + b"[" * 100_000, "JSON that cannot be read"),
    ],
)
def test_broken_containers_are_refused(content: bytes, said: str) -> None:
    with pytest.raises(InputError, match=f"a.gltf: found {said}"):
        read_pieces(content, "a.gltf")


def test_one_array_of_places_that_serves_many_meshes_is_cut_to_what_each_uses() -> None:
    places = np.random.default_rng(1).random((300, 3))
    tree = document(places, np.array([7, 8, 9], "uint16"))
    (piece,) = read(tree)
    assert piece.vertices.shape == (3, 3)
    assert np.allclose(piece.vertices[:, 0], places[7:10, 0], atol=1e-6)


@pytest.mark.parametrize("what", ["nodes", "primitives"])
def test_data_used_again_and_again_are_refused_before_they_fill_the_memory(what: str) -> None:
    tree = document(np.random.default_rng(1).random((30_000, 3)))
    if what == "nodes":
        tree |= {"nodes": [{"mesh": 0}] * 5_000, "scenes": [{"nodes": list(range(5_000))}]}
    else:
        tree["meshes"][0]["primitives"] *= 5_000
    with pytest.raises(InputError, match="data that are used again and again; wanted at most 2,000,000"):
        read(tree)


@pytest.mark.parametrize("wrong", [[], {}, [[0]], None, True, 1.5, "x"])
@pytest.mark.parametrize(("listed", "key"), [("accessors", "componentType"), ("accessors", "type"), ("bufferViews", "buffer")])
def test_a_list_where_a_number_belongs_is_refused(listed: str, key: str, wrong: Any) -> None:
    tree = document()
    tree[listed][0][key] = wrong
    with pytest.raises(InputError, match=r"a\.gltf: found"):
        read(tree)


def test_the_name_of_a_buffer_beside_may_hold_coded_letters(tmp_path: Path) -> None:
    tree = document(PLACES[:3])
    raw = base64.b64decode(tree["buffers"][0]["uri"].partition(",")[2])
    (tmp_path / "two words.bin").write_bytes(raw)
    tree["buffers"][0]["uri"] = "two%20words.bin"
    (tmp_path / "a.gltf").write_text(json.dumps(tree), encoding="utf-8")
    assert len(read_surfaces(tmp_path / "a.gltf")[0].triangles) == 1
    tree["buffers"][0]["uri"] = "..%2F..%2Fsecret.bin"
    (tmp_path / "a.gltf").write_text(json.dumps(tree), encoding="utf-8")
    with pytest.raises(InputError, match="leaves the folder"):
        read_surfaces(tmp_path / "a.gltf")
