"""OMF: surfaces, origins, units and grids of files written here, the reference implementation as second opinion, and damage."""

from __future__ import annotations

import io
import json
import random
import time
import uuid
import zipfile
import zlib

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io import read_model, write_surface
from structviz.io.ledger import read_pieces
from structviz.io.omf_writing import write_all
from structviz.surfaces.surface import Surface

NODES = np.array([[500000.125, 4e6, -10.0], [500100.1, 4e6 + 1 / 3, -20.0], [500100.0, 4000100.0, -30.7], [500000.0, 4000100.0, -40.0]])
CORNERS = np.array([[0, 1, 2], [0, 2, 3]])


def first(elements, **project):
    """Return an OMF 1 file; `elements` are dictionaries in which arrays stand as they are and objects nested."""
    blob, held = bytearray(), {}

    def put(value):
        if isinstance(value, np.ndarray):
            kind = "<f8" if value.dtype.kind == "f" else "<i8"
            packed = zlib.compress(value.astype(kind).tobytes())
            place = {"start": 60 + len(blob), "dtype": kind, "length": len(packed)}
            blob.extend(packed)
            value = {"__class__": "Array", "array": place}
        elif isinstance(value, dict) and "__class__" in value:
            value = {key: put(inner) for key, inner in value.items()}
        elif isinstance(value, list) and value and isinstance(value[0], dict):
            return [put(inner) for inner in value]
        else:
            return value
        key = str(uuid.UUID(int=len(held) + 1))
        held[key] = value
        return key

    key = put({"__class__": "Project", "elements": elements} | project)
    head = b"\x84\x83\x82\x81" + b"OMF-v0.9.0".ljust(32, b"\0") + uuid.UUID(key).bytes + (60 + len(blob)).to_bytes(8, "little")
    return head + bytes(blob) + json.dumps(held).encode()


def sheet(name="Fault A", **geometry):
    inner = {"__class__": "SurfaceGeometry", "vertices": NODES, "triangles": CORNERS} | geometry
    return {"__class__": "SurfaceElement", "name": name, "geometry": inner}


def grid(offsets=None, u=(10.0, 10.0, 20.0), v=(5.0, 5.0), **more):
    inner = {"__class__": "SurfaceGridGeometry", "tensor_u": list(u), "tensor_v": list(v), "axis_u": [0, 1, 0], "axis_v": [0, 0, -1]}
    return {"__class__": "SurfaceElement", "name": "grid", "geometry": inner | ({} if offsets is None else {"offset_w": offsets}) | more}


def second(elements, arrays, metadata=()):
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as archive:
        project = {"schema": "org.omf.v2.project", "version": "2.0", "elements": elements, "metadata": dict(metadata)}
        archive.writestr("project.json", json.dumps(project))
        for name, content in arrays.items():
            archive.writestr(name, content)
    return out.getvalue()


def array(name, values, kind):
    return {"array": name, "data_type": kind, "shape": list(values.shape), "size": values.nbytes, "schema": "org.omf.v2.array.numeric"}


def sheet2():
    held = {"aa": NODES.tobytes(), "bb": CORNERS.astype("<i4").tobytes()}
    parts = {"vertices": array("aa", NODES, "Float64Array"), "triangles": array("bb", CORNERS, "Int32Array")}
    return {"schema": "org.omf.v2.element.surface", "name": "Fault A"} | parts, held


class TestFirst:
    def test_surfaces_with_names(self):
        a, b = read_pieces(first([sheet(), sheet("B")]), "m.omf")
        assert (a.name, b.name, a.framed, a.history) == ("Fault A", "B", False, ())
        assert np.array_equal(a.vertices, NODES)
        assert np.array_equal(a.triangles, CORNERS)

    def test_origins_of_project_and_surface_add_up(self):
        (piece,) = read_pieces(first([sheet(origin=[1.0, 2, 3])], origin=[100.0, 200, 300]), "m.omf")
        assert np.array_equal(piece.vertices, NODES + [1, 2, 3] + np.array([100, 200, 300]))

    @pytest.mark.parametrize(("unit", "factor"), [("ft", 0.3048), ("feet", 0.3048), ("km", 1000), ("Metres", 1), ("m", 1)])
    def test_units_that_are_known_become_metres(self, unit, factor):
        (piece,) = read_pieces(first([sheet()], units=unit), "m.omf")
        assert np.array_equal(piece.vertices, NODES * factor)
        assert piece.framed
        assert piece.history == (() if factor == 1 else (f"coordinates converted from {unit} to m",))

    def test_units_that_are_not_known_are_told(self):
        (piece,) = read_pieces(first([sheet()], units="cubits"), "m.omf")
        assert not piece.framed
        assert piece.told == ("unit 'cubits' is not known: coordinates are taken as they stand",)

    def test_what_is_no_surface_is_told(self):
        other = {"__class__": "LineSetElement", "name": "sticks"}
        assert read_pieces(first([sheet(), other, other]), "m.omf")[0].told == ("2 LineSetElements not read",)
        with pytest.raises(SurfaceError, match="1 LineSetElement not read"):
            read_pieces(first([other]), "m.omf")

    def test_flat_grids(self):
        (piece,) = read_pieces(first([grid(origin=[100.0, 0, 0])]), "m.omf")
        assert piece.vertices[:, 0].tolist() == [100.0] * 12
        assert sorted(set(piece.vertices[:, 1])) == [0, 10, 20, 40]
        assert sorted(set(piece.vertices[:, 2])) == [-10, -5, 0]
        assert len(piece.triangles) == 12
        corner = piece.vertices[piece.triangles]
        assert np.linalg.norm(np.cross(corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]), axis=1).sum() / 2 == 40 * 10

    def test_offsets_are_laid_in_the_smoother_order(self):
        u, v = np.arange(9.0), np.arange(6.0)
        offsets = u[:, None] ** 2 + 0.5 * v[None, :]
        wide = {"u": np.ones(8), "v": np.ones(5)}
        along_v, along_u = (read_pieces(first([grid(offsets.ravel(order=order), **wide)]), "m.omf")[0] for order in "CF")
        assert along_v.history == ("grid of 9 x 6 nodes split into triangles, offsets along v first",)
        assert along_u.history == ("grid of 9 x 6 nodes split into triangles, offsets along u first",)
        assert np.array_equal(along_v.vertices, along_u.vertices)
        # axis u is north and axis v is down, so offsets go along u x v, which is west
        assert np.array_equal(along_v.vertices[:, 0], -offsets.ravel())

    def test_offsets_whose_order_cannot_be_known_are_not_guessed(self):
        offsets = (np.arange(3.0)[:, None] + np.zeros(3)).ravel()
        content = first([sheet(), grid(offsets, u=(1.0, 1.0), v=(1.0, 1.0))])
        (piece,) = read_pieces(content, "m.omf")
        assert piece.missed == ("'grid' is not read: the order of its offsets is not stated and cannot be known",)


class TestSecond:
    def test_surfaces_and_reference_system(self):
        element, held = sheet2()
        (piece,) = read_pieces(second([element], held, {"coordinate_reference_system": "epsg 25831"}), "m.omf")
        assert (piece.name, piece.crs) == ("Fault A", "EPSG:25831")
        assert np.array_equal(piece.vertices, NODES)
        assert np.array_equal(piece.triangles, CORNERS)

    def test_composites_are_opened(self):
        element, held = sheet2()
        inside = {"schema": "org.omf.v2.composite", "name": "all", "elements": [element, element | {"name": "B"}]}
        assert [piece.name for piece in read_pieces(second([inside], held), "m.omf")] == ["Fault A", "B"]

    def test_parquet_is_told(self):
        out = io.BytesIO()
        with zipfile.ZipFile(out, "w") as archive:
            archive.writestr("index.json.gz", b"\x1f\x8b")
        with pytest.raises(FormatError, match=r"OMF 2 with Parquet arrays; wanted OMF 1, or OMF 2 with project\.json"):
            read_pieces(out.getvalue(), "m.omf")

    @pytest.mark.parametrize(
        ("change", "told"),
        [
            ({"shape": [5, 3]}, "96 bytes of shape"),
            ({"shape": [4, 3, 1]}, "96 bytes of shape"),
            ({"shape": [2**50, 3]}, "96 bytes of shape"),
            ({"data_type": "Float128Array"}, "an array of type"),
            ({"array": "../aa"}, "no part"),
            ({"array": 5}, "no part"),
        ],
    )
    def test_arrays_that_belie_their_description(self, change, told):
        element, held = sheet2()
        element["vertices"] |= change
        with pytest.raises(FormatError, match=told):
            read_pieces(second([element], held), "m.omf")


def test_several_surfaces_in_one_file_come_back(tmp_path):
    a, b = Surface("A", NODES, CORNERS), Surface("A", NODES + [300, 0, 0], CORNERS)
    content = write_all([(a, {}), (b, {})])
    assert content == write_all([(a, {}), (b, {})])
    (tmp_path / "m.omf").write_bytes(content)
    model = read_model(tmp_path / "m.omf")
    assert [fault.name for fault in model.faults] == ["m.omf:A", "m.omf:A (2)"]
    assert np.array_equal(model.faults[1].surface.vertices, b.vertices)


@pytest.mark.filterwarnings("ignore::DeprecationWarning")
class TestSecondOpinion:
    """The reference implementation (PyPI omf 1.0.1), where it is installed; it is no part of the extras."""

    def test_it_reads_what_is_written(self, tmp_path):
        omf = pytest.importorskip("omf")
        cell_data = {
            "dip": np.array([60.5, 70]),
            "verdict": np.array(["consistent", "conflicting"]),
            "n": np.eye(3)[:2],
            "ok": np.array([True, False]),
        }
        write_surface(tmp_path / "m.omf", Surface("Fault A/é <&>", NODES, CORNERS), cell_data)
        reader = omf.OMFReader(str(tmp_path / "m.omf"))
        project = reader.get_project()
        assert project.validate()
        (element,) = project.elements
        assert element.name == "Fault A/é <&>"
        assert np.array_equal(element.geometry.vertices.array, NODES)
        assert np.array_equal(element.geometry.triangles.array, CORNERS)
        held = {data.name: data for data in element.data}
        assert all(data.location == "faces" for data in element.data)
        assert np.array_equal(held["dip"].array.array, [60.5, 70])
        assert np.array_equal(held["n"].array.array, np.eye(3)[:2])
        assert [held["verdict"].legends[0].values.array[k] for k in held["verdict"].array.array] == ["consistent", "conflicting"]

    def test_what_it_writes_is_read(self, tmp_path):
        omf = pytest.importorskip("omf")
        inner = omf.SurfaceGeometry(vertices=omf.Vector3Array(NODES), triangles=omf.Int3Array(CORNERS), origin=[1.0, 2, 3])
        project = omf.Project(name="p", origin=[10.0, 20, 30], elements=[omf.SurfaceElement(name="Fault A", geometry=inner)])
        omf.OMFWriter(project, str(tmp_path / "m.omf"))
        (piece,) = read_pieces((tmp_path / "m.omf").read_bytes(), "m.omf")
        assert piece.name == "Fault A"
        assert np.array_equal(piece.vertices, NODES + [1, 2, 3] + np.array([10, 20, 30]))


class TestDamage:
    def changed(self, change):
        content = first([sheet()])
        start = int.from_bytes(content[52:60], "little")
        return content[:start] + change(content[start:].decode()).encode()

    @pytest.mark.parametrize(
        ("was", "now", "told"),
        [
            ('"start": 60', '"start": 6', "an array at 6"),
            ('"start": 60', '"start": 99999', "an array at 99999"),
            ('"start": 60', '"start": "60"', "an array at 60"),
            ('"length": ', '"length": -', "an array at 60 of -"),
            ('"<f8"', '"<c16"', "an array of type '<c16'"),
            ('"<i8"', '"<f8"', "corner numbers with fractions"),
            ('"elements": [', '"elements": ["nothing", ', "no object 'nothing'"),
            ('"elements": [', '"element": [', "no list of elements"),
            ('"Project"', '"Other"', "no Project"),
            ("{", "[" * 100_000 + "{", "JSON that breaks off or is damaged"),
        ],
    )
    def test_words_that_belie_the_arrays(self, was, now, told):
        with pytest.raises(FormatError, match=told):
            read_pieces(self.changed(lambda text: text.replace(was, now, 1 if was != '"length": ' else -1)), "m.omf")

    def test_a_bomb(self):
        content = first([sheet(vertices=np.zeros((3_000_000, 3)))])
        with pytest.raises(FormatError, match=r"an array of 3\d,\d+,\d+ bytes or more"):
            read_pieces(content, "m.omf")

    def test_many_surfaces_of_one_large_array(self):
        held = first([sheet(vertices=np.zeros((400_000, 3)))])
        start = int.from_bytes(held[52:60], "little")
        objects = json.loads(held[start:])
        project = next(value for value in objects.values() if value["__class__"] == "Project")
        project["elements"] *= 100
        with pytest.raises(FormatError, match="more than ten times the file"):
            read_pieces(held[:start] + json.dumps(objects).encode(), "m.omf")

    def test_a_grid_of_many_nodes_from_few_words(self):
        with pytest.raises(FormatError, match="a grid of 100,020,001 nodes"):
            read_pieces(first([grid(u=np.ones(10_000), v=np.ones(10_000))]), "m.omf")

    def test_another_version(self):
        with pytest.raises(FormatError, match=r"OMF of version 'OMF-v7\.9\.0'"):
            read_pieces(first([sheet()]).replace(b"v0.9", b"v7.9"), "m.omf")

    def test_thousands_of_damaged_files(self):
        element, held = sheet2()
        bases, chance = [first([sheet(), grid()], units="ft"), second([element], held)], random.Random(5)
        began, errors = time.perf_counter(), 0
        for turn in range(3000):
            damaged = bytearray(bases[turn % 2])
            for _ in range(chance.choice([1, 1, 4])):
                at = chance.randrange(len(damaged))
                damaged[at : at + chance.randrange(3)] = chance.choice([b"\xff", b"0", b"-", b"e9", b'"', bytes([chance.randrange(256)])])
            try:
                pieces = read_pieces(bytes(damaged), "m.omf")
            except InputError:
                errors += 1
                continue
            for piece in pieces:
                assert np.isfinite(piece.vertices).all()
                assert 0 <= piece.triangles.min() <= piece.triangles.max() < len(piece.vertices)
        assert errors > 1000
        assert time.perf_counter() - began < 60


@pytest.mark.parametrize("name", ["omf_v1_test_file.omf", "omf_v2_test_file.omf"])
def test_sample_files_of_another_writer(shared_data, name):
    model = read_model(shared_data / "open_standard_samples" / name)
    (fault,) = model.faults
    assert (fault.name, fault.surface.triangles.shape, fault.surface.vertices.shape) == ("trisurf", (50, 3), (100, 3))
    told = [finding.message for finding in model.findings]
    assert f"{name}: 'gridsurf' is not read: the order of its offsets is not stated and cannot be known" in told
    assert any(finding.severity == "warning" and "gridsurf" in finding.message for finding in model.findings)
    assert model.crs == ("EPSG:3857" if "v2" in name else "")
