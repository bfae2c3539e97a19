"""RESQML packages made to do harm, and damaged ones: each is an error with a reason, or still a surface."""

from __future__ import annotations

import io
import random
import re
import sys
import time
import zipfile

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, StructvizError
from structviz.io import read_model
from structviz.io.formats.epc import alone
from structviz.io.ledger import read_pieces

from .resqml_builder import CORNERS, CRS, NODES, PROXY, SECOND_CRS, Builder, plain, uuid

h5py = pytest.importorskip("h5py")

both = pytest.mark.parametrize("version", ["2.0", "2.2"])


class TestHostile:
    def refused(self, content, match, h5=b"", file="m.epc"):
        with pytest.raises(InputError, match=match):
            read_pieces(content, file, lambda name: {"m.h5": h5}[name] if name == "m.h5" else alone(name))

    @pytest.mark.parametrize("name", ["../x.xml", "/x.xml", "a/../../x", "C:/x", "x\x1b[31m"])
    def test_names_that_leave_the_archive(self, name):
        self.refused(plain().epc(extra=[(name, b"x")]), "found a part named")

    def test_backslashes(self):
        self.refused(plain().epc(extra=[("a_b", b"x")]).replace(b"a_b", b"a\\b"), "found a part named")

    def test_the_same_part_twice(self):
        with pytest.warns(UserWarning, match="Duplicate name"):
            content = plain().epc(extra=[("x", b"1"), ("x", b"2")])
        self.refused(content, "two parts named 'x'")

    def test_a_part_that_unpacks_to_far_more(self):
        made = plain()
        made.objects[-1] = (*made.objects[-1][:4], made.objects[-1][4] + " " * 30_000_000)
        self.refused(made.epc(), "that unpacks to 30,0", made.h5())

    def test_many_parts_that_each_unpack_to_a_little_less_than_is_noticed(self):
        made = plain()
        for number in range(100, 120):
            made.add("FaultInterpretation", uuid(number), "x", "<a/>" * 200_000)
        self.refused(made.epc(), "XML that unpack to far more than the files", made.h5())

    def test_one_large_array_used_very_often(self):
        nodes = np.random.default_rng(1).normal(size=(30_000, 3))
        made = Builder().depth_crs().triangles(2, 0, ((nodes, CORNERS),))
        kind, _, version, name, text = made.objects[-1]
        made.objects += [(kind, uuid(k), version, name, text.replace(f'uuid="{uuid(2)}', f'uuid="{uuid(k)}')) for k in range(3, 600)]
        self.refused(made.epc(), "arrays that unpack to far more than the files", made.h5())

    def test_many_lattices_of_a_few_words(self):
        made = plain()
        for number in range(10, 40):
            below = made.lattice("r:Points", (0, 0, 0), ((0, 1, 0), 1, 999), ((1, 0, 0), 1, 999))
            made.grid(number, 0, (1000, 1000), below)
        self.refused(made.epc(), "arrays that unpack to far more than the files", made.h5())

    def test_a_million_parts(self):
        self.refused(plain().epc() + b"PK\x01\x02" * 100_001, "more than 100,000 parts")

    @pytest.mark.parametrize("coding", ["utf-8", "utf-16"])
    def test_document_types_and_entities(self, coding):
        made = plain()
        text = f'<?xml version="1.0" encoding="{coding}"?><!DOCTYPE a [<!ENTITY b SYSTEM "file:///etc/passwd">]><a>&b;</a>'
        content = made.epc()
        out = io.BytesIO()
        with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(out, "w") as new:
            for name in old.namelist():
                new.writestr(name, text.encode(coding) if "TriangulatedSet" in name else old.read(name))
        self.refused(out.getvalue(), "XML with a document type or entities", made.h5())

    def test_deep_nesting(self):
        made = plain()
        made.add("FaultInterpretation", uuid(7), "deep", "<r:a>" * 5000 + "</r:a>" * 5000)
        self.refused(made.epc(), "nested more than 200 deep", made.h5())

    @pytest.mark.parametrize(
        "target", ["../m.h5", "/etc/passwd", "file:///etc/passwd", "http://example.org/m.h5", "a\\m.h5", "%2e%2e/m.h5", ""]
    )
    @both
    def test_arrays_outside_the_folder(self, target, version):
        made = Builder(version)
        made.h5_name = target
        made.depth_crs().interpretation(1).triangles(2, 1)
        other = made.h5().replace(PROXY.encode(), b"7" * len(PROXY))
        self.refused(made.epc(), "found arrays in|the identifier '7777|no file for the arrays", other)
        self.refused(made.epc(), "found arrays in|the identifier '7777|no file for the arrays", other, "n.epc")

    @pytest.mark.parametrize("target", ["C:\\models\\m.h5", "/far/away.h5"])
    def test_whole_paths_are_never_followed_but_the_file_beside_may_be_the_one(self, target):
        made = Builder()
        made.h5_name = target
        (piece,) = made.depth_crs().interpretation(1).triangles(2, 1).pieces()
        assert piece.told == (f"{target} is not there: arrays are taken from m.h5, which carries its identifier",)

    def test_another_identifier_is_told(self):
        made = plain()
        (piece,) = made.pieces(made.h5().replace(PROXY.encode(), b"7" * len(PROXY)))
        assert piece.told == (f"m.h5 carries the identifier {'7' * len(PROXY)}, where the package says {PROXY}",)

    def test_the_hdf5_file_is_missing(self, tmp_path):
        (tmp_path / "a.epc").write_bytes(plain().epc())
        with pytest.raises(InputError, match=r"m\.h5: found no such file"):
            read_model(tmp_path / "a.epc")

    def test_a_renamed_pair_is_read_and_told_if_the_identifiers_agree(self, tmp_path):
        made = plain()
        (tmp_path / "a.epc").write_bytes(made.epc())
        (tmp_path / "a.h5").write_bytes(made.h5())
        model = read_model(tmp_path / "a.epc")
        assert "a.epc: m.h5 is not there: arrays are taken from a.h5, which carries its identifier" in [
            finding.message for finding in model.findings
        ]
        (tmp_path / "a.h5").write_bytes(made.h5().replace(PROXY.encode(), b"9" * len(PROXY)))
        with pytest.raises(InputError, match="the identifier '9999"):
            read_model(tmp_path / "a.epc")

    def test_a_link_out_of_the_folder(self, tmp_path):
        made = plain()
        (tmp_path / "in").mkdir()
        (tmp_path / "secret.h5").write_bytes(made.h5())
        (tmp_path / "in" / "m.epc").write_bytes(made.epc())
        (tmp_path / "in" / "m.h5").symlink_to(tmp_path / "secret.h5")
        with pytest.raises(InputError, match="which leaves the folder of the model"):
            read_model(tmp_path / "in" / "m.epc")

    def stored(self, change):
        """Return a package's HDF5 after a change to the open store."""
        made, out = plain(), io.BytesIO()
        with h5py.File(out, "w") as store:
            for path, values in made.arrays.items():
                store[path] = values
            change(store, f"/RESQML/{uuid(2)}/points_patch0")
        return made.epc(), out.getvalue()

    @pytest.mark.parametrize("link", ["external", "soft"])
    def test_links(self, link):
        def change(store, path):
            del store[path]
            store[path] = h5py.ExternalLink("other.h5", path) if link == "external" else h5py.SoftLink("/elsewhere")

        epc, h5 = self.stored(change)
        self.refused(epc, "a link in place of", h5)

    def test_virtual_and_external_storage(self, tmp_path):
        def virtual(store, path):
            del store[path]
            layout = h5py.VirtualLayout((4, 3), "f8")
            layout[:] = h5py.VirtualSource(str(tmp_path / "other.h5"), "x", (4, 3))
            store.create_virtual_dataset(path, layout)

        def outside(store, path):
            del store[path]
            store.create_dataset(path, (4, 3), "f8", external=[(str(tmp_path / "raw"), 0, 96)])

        for change in (virtual, outside):
            epc, h5 = self.stored(change)
            self.refused(epc, "whose values lie in another file", h5)

    @pytest.mark.parametrize(
        ("shape", "kind", "told"),
        [
            ((5, 3), "f8", r"an array of shape \(5, 3\)"),
            ((4, 3), "S5", "values of type"),
            ((10**9, 3), "f8", "an array of shape"),
            ((4, 3), "c16", "values of type"),
        ],
    )
    def test_arrays_that_do_not_fit(self, shape, kind, told):
        def change(store, path):
            del store[path]
            store.create_dataset(path, shape, kind, chunks=(1, 3))

        epc, h5 = self.stored(change)
        self.refused(epc, told, h5)

    def test_arrays_that_are_not_there_and_never_written(self):
        def gone(store, path):
            del store[path]

        def empty(store, path):
            del store[path]
            store.create_dataset(path, (4, 3), "f8", chunks=(4, 3))

        for change, told in ((gone, "that cannot be read"), (empty, "never written")):
            epc, h5 = self.stored(change)
            self.refused(epc, told, h5)

    def test_a_bomb_of_an_array(self):
        made = Builder().depth_crs().interpretation(1)
        made.triangles(2, 1, ((np.zeros((6_000_000, 3)), CORNERS),))
        path = f"/RESQML/{uuid(2)}/points_patch0"
        large, out = made.arrays.pop(path), io.BytesIO(made.h5())
        with h5py.File(out, "a") as store:
            store.create_dataset(path, data=large, compression="gzip", chunks=(1_000_000, 3))
        self.refused(made.epc(), "144,000,000 bytes unpacked from", out.getvalue())

    def test_a_huge_grid_of_a_few_words(self):
        made = plain().interpretation(3, "Top", "HorizonInterpretation")
        made.grid(4, 3, (20_000, 20_000), made.lattice("r:Points", (0, 0, 0), ((0, 1, 0), 1, 19_999), ((1, 0, 0), 1, 19_999)))
        self.refused(made.epc(), "that are not stored", made.h5())

    @pytest.mark.parametrize(
        ("was", "now", "told"),
        [
            ("<r:Count>2</r:Count>", "<r:Count>-2</r:Count>", "Count '-2'"),
            ("<r:Count>2</r:Count>", "<r:Count>2000000000</r:Count>", "an array of shape"),
            ("<r:NodeCount>4</r:NodeCount>", "<r:NodeCount>3</r:NodeCount>", "an array of shape"),
            ("<r:NodeCount>4</r:NodeCount>", "", "NodeCount ''"),
            ("triangles_patch0", "points_patch0", "an array of shape"),
        ],
    )
    def test_words_that_belie_the_arrays(self, was, now, told):
        made = plain()
        made.objects = [(*entry[:4], entry[4].replace(was, now)) for entry in made.objects]
        self.refused(made.epc(), told, made.h5())

    def test_the_same_object_twice(self):
        made = plain()
        kind, _, version, name, text = made.objects[2]
        made.objects.append((kind, uuid(8), version, name, text))
        self.refused(made.epc(), f"two objects with the UUID {uuid(1)}", made.h5())

    def test_points_borrowed_from_another_reference_system(self):
        made = plain().depth_crs(SECOND_CRS, offsets=(9, 9, 9)).interpretation(3, "Top", "HorizonInterpretation")
        made.grid(6, 0, (2, 2), made.lattice("r:Points", (0, 0, 0), ((0, 1, 0), 100, 1), ((1, 0, 0), 50, 1)))
        made.objects[-1] = (*made.objects[-1][:4], made.objects[-1][4].replace(CRS, SECOND_CRS))
        steps = "<r:Offset><r:Value>1</r:Value><r:Count>1</r:Count></r:Offset>" * 2
        nodes = f"<r:NodeIndicesOnSupportingRepresentation><r:StartValue>0</r:StartValue>{steps}</r:NodeIndicesOnSupportingRepresentation>"
        nodes += made.ref("r:SupportingRepresentation", "Grid2dRepresentation", uuid(6))
        made.grid(4, 3, (2, 2), f'<r:Points xsi:type="r:Point3dFromRepresentationLatticeArray">{nodes}</r:Points>')
        told = next(piece for piece in made.pieces() if piece.name == "Fault A").told
        assert told == ("'grid' is not read: points taken from a grid in another reference system",)

    def test_corner_numbers_outside_the_nodes(self):
        made = Builder().depth_crs().interpretation(1).triangles(2, 1, ((NODES, CORNERS + 1),))
        self.refused(made.epc(), "corner number 4 in a triangle", made.h5())

    def test_names_keep_no_line_breaks(self):
        (piece,) = Builder().depth_crs().interpretation(1, "Fault\n\tA  &lt;b&gt;").triangles(2, 1).pieces()
        assert piece.name == "Fault A <b>"

    def test_other_archives_are_not_packages(self):
        out = io.BytesIO()
        with zipfile.ZipFile(out, "w") as archive:
            archive.writestr("word/document.xml", "<a/>")
        self.refused(out.getvalue(), r"found a ZIP archive without \[Content_Types\]\.xml; wanted RESQML")
        self.refused(plain().epc()[:-30], "found a ZIP archive that cannot be read")

    def test_without_h5py(self, monkeypatch):
        made = plain()
        content, held = made.epc(), made.h5()
        monkeypatch.setitem(sys.modules, "h5py", None)
        with pytest.raises(StructvizError, match=r"pip install 'structviz\[formats\]'"):
            read_pieces(content, "m.epc", lambda name: held)


@both
def test_damage_is_an_error_or_still_a_surface(version):
    """Text of variable length among the arrays: the library goes round in circles where its heap is damaged, if it is read."""
    made = plain(version).interpretation(3, "Top", "HorizonInterpretation")
    made.grid(4, 3, (2, 3), made.array("r:Points", "Point3d", "/g/points", np.arange(18.0)))
    good, chance = (made.epc(compression=zipfile.ZIP_STORED), made.h5(mark=PROXY)), random.Random(11)
    began, errors = time.perf_counter(), 0
    for turn in range(1500):
        damaged = [bytearray(content) for content in good]
        which = damaged[turn % 2]
        for _ in range(chance.choice([1, 1, 3, 10])):
            at = chance.randrange(len(which))
            which[at : at + chance.randrange(3)] = chance.choice([b"\xff", b"\0", b"-", b"9", b"<", bytes([chance.randrange(256)])])
        if chance.random() < 0.1:
            del which[chance.randrange(len(which)) :]
        try:
            pieces = read_pieces(bytes(damaged[0]), "m.epc", lambda name: bytes(damaged[1]))  # noqa: B023
        except StructvizError:
            errors += 1
            continue
        for piece in pieces:
            assert np.isfinite(piece.vertices).all()
            assert 0 <= piece.triangles.min() <= piece.triangles.max() < len(piece.vertices)
    assert errors > 300
    assert time.perf_counter() - began < 60


@both
def test_damaged_words_within_a_whole_archive_are_an_error_or_still_a_surface(version):
    made = plain(version).interpretation(3, "Top", "HorizonInterpretation")
    below = made.lattice("r:SupportingGeometry", (1000, 2000, 0), ((0, 1, 0), 25, 2), ((1, 0, 0), 10, 2))
    heights = made.array("r:ZValues", "Double", "/g/z", np.arange(9.0))
    made.grid(4, 3, (3, 3), f'<r:Points xsi:type="r:Point3dZValueArray">{below}{heights}</r:Points>')
    good, held, chance = list(made.objects), made.h5(), random.Random(12)
    words = ["", "-1", "0", "9999999999", "nan", "1e400", "x", "true", "\u00e9", "<a/>", "</", "..", "3"]
    errors = 0
    for _ in range(600):
        made.objects = list(good)
        for _ in range(chance.choice([1, 1, 2])):
            place = chance.randrange(len(good))
            text = made.objects[place][4]
            values = list(re.finditer(r"(?<=>)[^<>]*(?=<)|(?<=\")[^\"]*(?=\")|</?[a-z]:\w+", text))
            found = chance.choice(values)
            made.objects[place] = (*made.objects[place][:4], text[: found.start()] + chance.choice(words) + text[found.end() :])
        content = made.epc(compression=zipfile.ZIP_STORED)
        try:
            pieces = read_pieces(content, "m.epc", lambda name: held)
        except StructvizError:
            errors += 1
            continue
        for piece in pieces:
            assert np.isfinite(piece.vertices).all()
            assert 0 <= piece.triangles.min() <= piece.triangles.max() < len(piece.vertices)
    assert 150 < errors < 560


def test_a_format_error_names_the_part():
    made = plain()
    made.objects[-1] = (*made.objects[-1][:4], made.objects[-1][4][:-5])
    with pytest.raises(FormatError, match=rf"m\.epc, obj_TriangulatedSetRepresentation_{uuid(2)}\.xml: found XML that breaks off"):
        made.pieces()
