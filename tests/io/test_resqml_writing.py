"""RESQML packages written: read back to the last bit, looked at without our reader, the same bytes each time, all files or none."""

from __future__ import annotations

import hashlib
import io
import re
import zipfile
from pathlib import Path, PurePosixPath
from xml.etree import ElementTree

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.cli.main import entry
from structviz.errors import ArgumentError
from structviz.io import read_model
from structviz.io.formats.epc import FORMATS, read_beside
from structviz.io.resqml_writing import package_of_model
from structviz.kinematics.senses import sector_of_rake, sector_of_words
from structviz.model import Fault, FaultModel, Horizon
from structviz.orientation.vectors import axial_angle_deg
from structviz.report.annotated import triangle_values
from structviz.report.converted import convert_to_file
from structviz.report.write import write_outputs
from structviz.surfaces.surface import Surface
from structviz.synthetic import random_model

h5py = pytest.importorskip("h5py")

NAME = "Fault A/é <&> \"q\" 'q'"
NODES = np.array([[500000.125, 4e6, -10.0], [500100.1, 4e6 + 1 / 3, -20.0], [500100.0, 4000100.0, -30.7], [500000.0, 4000100.0, -40.0]])
CORNERS = np.array([[0, 1, 2], [0, 2, 3]])
E = "{http://www.energistics.org/energyml/data/commonv2}"
R = "{http://www.energistics.org/energyml/data/resqmlv2}"
PACKAGE = "{http://schemas.openxmlformats.org/package/2006/relationships}"


def model(crs="EPSG:25831"):
    faults = (
        Fault(NAME, Surface(NAME, NODES, CORNERS), sector_of_words("normal"), "older"),
        Fault("B", Surface("B", NODES + [500, 0, 0], CORNERS), sector_of_words("sinistral"), down_side="NE"),
        Fault("C", Surface("C", NODES + [900, 0, 0], CORNERS), sector_of_rake(-72.5)),
        Fault("D", Surface("D", NODES + [1300, 0, 0], CORNERS)),
    )
    return FaultModel("a model", faults, (Horizon("Top", Surface("Top", NODES - [0, 0, 500], CORNERS)),), crs=crs)


def put(folder: Path, files) -> Path:
    for name, content in files.items():
        (folder / name).write_bytes(content)
    return folder / next(iter(files))


class TestRoundTrip:
    def test_everything_declared_comes_back(self, tmp_path):
        before, after = model(), read_model(put(tmp_path, package_of_model(model(), "m")))
        assert sorted(fault.name for fault in after.faults) == sorted(fault.name for fault in before.faults)
        back = {fault.name: fault for fault in after.faults}
        for fault in before.faults:
            same = back[fault.name]
            assert (same.declared, same.phase, same.down_side) == (fault.declared, fault.phase, fault.down_side)
            assert np.array_equal(same.surface.vertices, fault.surface.vertices)
            assert np.array_equal(same.surface.triangles, fault.surface.triangles)
            assert same.surface.history == ()
        assert [horizon.name for horizon in after.horizons] == ["Top"]
        assert after.crs == "EPSG:25831"

    def test_the_same_input_gives_the_same_bytes(self):
        assert package_of_model(model(), "m") == package_of_model(model(), "m")
        assert package_of_model(model(), "m")["m.h5"] != package_of_model(FaultModel("t", model().faults[:1]), "m")["m.h5"]

    def test_names_xml_cannot_hold_and_long_ones(self, tmp_path):
        names = ["a\x00\x1bb", "c" * 500, "\ud800", ""]
        faults = tuple(Fault(name, Surface(name, NODES + [k * 500, 0, 0], CORNERS)) for k, name in enumerate(names))
        back = read_model(put(tmp_path, package_of_model(FaultModel("\x01", faults, crs="a <b> & \x02"), "m")))
        assert sorted(fault.name for fault in back.faults) == ["a b", "c" * 256, "unknown", "unknown (2)"]

    @pytest.mark.parametrize("stem", ["50%41 é", "a b", "a.b", "&<"])
    def test_any_plain_name_of_the_files(self, stem, tmp_path):
        assert len(read_model(put(tmp_path, package_of_model(model(), stem))).faults) == 4

    @pytest.mark.parametrize("stem", ["a:b", "a\\b", "a\x07"])
    def test_names_a_package_cannot_hold(self, stem):
        with pytest.raises(ArgumentError, match="wanted a plain name"):
            package_of_model(model(), stem)

    def test_the_same_answer_through_a_package(self, tmp_path):
        known = random_model("normal", faults=14, conjugate=11, planted=2, triangles=80, random_state=8).model
        settings = Settings(replicates=100)
        done = convert_to_file(known, str(tmp_path / "new.epc"), FORMATS[0])
        assert (done.files, done.losses) == (("new.epc", "new.h5"), ())
        plain, other = run(known, settings), run(read_model(tmp_path / "new.epc"), settings)
        words = [{result.fault.name: result.verdict.word for result in found.faults} for found in (plain, other)]
        assert words[0] == words[1]
        assert axial_angle_deg(other.regimes[0].axes, plain.regimes[0].axes).max() <= 0.01


class TestPackage:
    """The package by the open packaging conventions, looked at with zipfile, ElementTree and h5py alone."""

    @pytest.fixture
    def files(self):
        return package_of_model(model(), "m")

    def test_every_part_has_a_content_type_and_every_relationship_a_target(self, files):
        with zipfile.ZipFile(io.BytesIO(files["m.epc"])) as archive:
            assert archive.testzip() is None
            names = set(archive.namelist())
            listed = {
                entry.get("PartName")[1:] for entry in ElementTree.fromstring(archive.read("[Content_Types].xml")) if entry.get("PartName")
            }
            assert listed == {name for name in names if not name.endswith(".rels") and name != "[Content_Types].xml"}
            external = []
            for name in (name for name in names if name.endswith(".rels")):
                links = ElementTree.fromstring(archive.read(name)).findall(f"{PACKAGE}Relationship")
                assert len({link.get("Id") for link in links}) == len(links)
                source = PurePosixPath(name).parent.parent / PurePosixPath(name).stem
                assert str(source) in names or name == "_rels/.rels"
                for link in links:
                    if link.get("TargetMode") == "External":
                        external.append(link.get("Target"))
                    else:
                        assert link.get("Target") in names
            assert external == ["m.h5"]

    def test_every_reference_finds_its_object_and_every_path_its_array(self, files):
        roots = {}
        with zipfile.ZipFile(io.BytesIO(files["m.epc"])) as archive:
            for name in archive.namelist():
                if name.startswith("obj_"):
                    root = ElementTree.fromstring(archive.read(name))
                    roots[root.get("uuid")] = root
                    assert f"obj_{root.tag.rpartition('}')[2]}_{root.get('uuid')}.xml" == name
        assert len(roots) == 2 + 3 * 5
        with h5py.File(io.BytesIO(files["m.h5"])) as store:
            for root in roots.values():
                assert {element.text for element in root.iter(f"{E}UUID")} <= set(roots)
                for patch in root.iter(f"{R}TrianglePatch"):
                    paths = [element.text for element in patch.iter(f"{E}PathInHdfFile")]
                    assert [store[path].shape for path in paths] == [(2, 3), (4, 3)]
                    assert (patch.find(f"{R}Count").text, patch.find(f"{R}NodeCount").text) == ("2", "4")
            proxy = next(root for root in roots.values() if root.tag.endswith("EpcExternalPartReference"))
            assert store.attrs["uuid"].decode() == proxy.get("uuid")

    def test_a_known_sense_is_also_a_throw(self, files):
        with zipfile.ZipFile(io.BytesIO(files["m.epc"])) as archive:
            texts = [
                archive.read(name).decode() for name in archive.namelist() if "FaultInterpretation" in name and name.startswith("obj_")
            ]
        assert sum("<r:Throw>normal</r:Throw>" in text for text in texts) == 1
        assert sum("<r:Throw>" in text for text in texts) == 1  # the standard has no word for the others
        assert sum("<r:Name>structviz:sense</r:Name><r:Value>sinistral</r:Value>" in text for text in texts) == 1


class TestConvert:
    def test_files_that_exist_are_not_overwritten(self, tmp_path, capsys):
        put(tmp_path, package_of_model(model(), "m"))
        (tmp_path / "new.h5").write_bytes(b"mine")
        assert entry(["convert", str(tmp_path / "m.epc"), "--out", str(tmp_path / "new.epc")]) == 2
        assert "new.h5: exists already" in capsys.readouterr().err
        assert (tmp_path / "new.h5").read_bytes() == b"mine"
        assert sorted(path.name for path in tmp_path.iterdir()) == ["m.epc", "m.h5", "new.h5"]

    def test_a_folder_of_packages_is_refused(self, tmp_path, capsys):
        put(tmp_path, package_of_model(model(), "m"))
        assert entry(["convert", str(tmp_path / "m.epc"), "--out", str(tmp_path / "new"), "--to", "epc"]) == 2
        assert "--out model.epc" in capsys.readouterr().err

    def test_what_is_written_and_kept_is_told(self, tmp_path, capsys):
        put(tmp_path, package_of_model(model(), "m"))
        assert entry(["convert", str(tmp_path / "m.epc"), "--out", str(tmp_path / "new.epc")]) == 0
        assert "4 faults and 1 horizon written" in capsys.readouterr().out
        assert len(read_model(tmp_path / "new.epc").faults) == 4


@pytest.fixture(scope="module")
def judged(tmp_path_factory):
    folder = tmp_path_factory.mktemp("judged")
    known = random_model("normal", faults=8, conjugate=7, planted=1, triangles=60, random_state=8).model
    path = put(folder, package_of_model(known, "m"))
    analysis = run(read_model(path), Settings(replicates=100))
    return path, analysis, write_outputs(analysis, folder / "out", pictures=False, page=False, inputs_in=path.parent)


class TestResults:
    def test_files(self, judged):
        path, _, written = judged
        assert written.skipped == ()
        assert {"results.epc", "results.h5", "m.h5"} <= set(written.files)
        assert (written.folder / "m.h5").read_bytes() == path.with_name("m.h5").read_bytes()

    def test_the_parts_that_were_there_are_the_same_bytes(self, judged):
        path, _, written = judged
        with zipfile.ZipFile(path) as old, zipfile.ZipFile(written.folder / "results.epc") as new:
            for name in old.namelist():
                if name == "[Content_Types].xml":
                    assert new.read(name).startswith(old.read(name)[: -len("</Types>")])
                else:
                    assert new.read(name) == old.read(name)
            assert set(new.namelist()) > set(old.namelist())

    def test_values_on_each_representation(self, judged):
        _, analysis, written = judged
        by_title = {}
        with zipfile.ZipFile(written.folder / "results.epc") as archive, h5py.File(written.folder / "results.h5") as store:
            shapes = {}
            for name in archive.namelist():
                if name.startswith("obj_TriangulatedSet"):
                    root = ElementTree.fromstring(archive.read(name))
                    shapes[root.get("uuid")] = root.find(f"{E}Citation/{E}Title").text
            for name in archive.namelist():
                if re.match(r"obj_\w+Property_", name):
                    root = ElementTree.fromstring(archive.read(name))
                    assert root.find(f"{R}IndexableElement").text == "faces"
                    host = shapes[root.find(f"{R}SupportingRepresentation/{E}UUID").text]
                    values = store[root.find(f".//{E}PathInHdfFile").text][()]
                    by_title[host, root.find(f"{E}Citation/{E}Title").text] = values, root
        for result in analysis.faults:
            held = triangle_values(result, analysis.regimes[result.phase])
            for key, title in (("dip_deg", "dip"), ("predicted_rake_deg", "predicted rake"), ("slip_tendency", "slip tendency")):
                values, root = by_title[result.fault.name, title]
                assert np.array_equal(values, held[key], equal_nan=True)
                assert root.tag == f"{R}ContinuousProperty"
                assert root.find(f"{R}UOM").text == ("Euc" if title == "slip tendency" else "dega")
            values, root = by_title[result.fault.name, "verdict"]
            assert root.tag == f"{R}CategoricalProperty"
            assert np.array_equal(values, held["verdict"])

    def test_words_of_the_verdicts(self, judged):
        with zipfile.ZipFile(judged[2].folder / "results.epc") as archive:
            (name,) = [name for name in archive.namelist() if name.startswith("obj_StringTableLookup")]
            root = ElementTree.fromstring(archive.read(name))
        rows = {row.find(f"{R}Key").text: row.find(f"{R}Value").text for row in root.findall(f"{R}Value")}
        assert rows == {"0": "consistent", "1": "conflicting", "2": "undetermined"}

    def test_the_new_package_is_read_as_the_old_one(self, judged):
        path, _, written = judged
        old, new = read_model(path), read_model(written.folder / "results.epc")
        assert [fault.name for fault in new.faults] == [fault.name for fault in old.faults]
        assert all(np.array_equal(a.surface.vertices, b.surface.vertices) for a, b in zip(old.faults, new.faults, strict=True))

    def test_the_same_bytes_again_and_results_of_results(self, judged, tmp_path):
        path, analysis, written = judged
        again = write_outputs(analysis, tmp_path / "out", pictures=False, page=False, inputs_in=path.parent)
        for name in ("results.epc", "results.h5"):
            assert (again.folder / name).read_bytes() == (written.folder / name).read_bytes()
        second = run(read_model(again.folder / "results.epc"), Settings(replicates=100))
        more = write_outputs(second, tmp_path / "more", pictures=False, page=False, inputs_in=again.folder)
        assert {"results.epc", "results-2.h5", "m.h5"} <= set(more.files)
        assert more.skipped == ("results.epc also names arrays in results.h5, which holds no surface: see to it yourself if you need them",)

    def test_a_file_that_changed_meanwhile_is_told(self, tmp_path):
        path = put(tmp_path, package_of_model(model(), "m"))
        analysis = run(read_model(path), Settings(replicates=100))
        path.with_name("m.h5").write_bytes(b"other")
        written = write_outputs(analysis, tmp_path / "out", pictures=False, page=False, inputs_in=path.parent)
        assert "results.epc" not in written.files
        assert written.skipped == (
            "no results.epc was written: m.h5: found a file that has changed since it was judged; wanted the same file",
        )

    def test_a_table_of_faults_of_a_package(self, tmp_path):
        (tmp_path / "sub").mkdir()
        put(tmp_path / "sub", package_of_model(model(), "m"))
        rows = "name,surface,sense\none,sub/m.epc#B,normal\ntwo,sub/m.epc#C,reverse\nthree,sub/m.epc#B,normal\n"
        (tmp_path / "faults.csv").write_text(rows)
        analysis = run(read_model(tmp_path / "faults.csv"), Settings(replicates=100))
        written = write_outputs(analysis, tmp_path / "out", pictures=False, page=False, inputs_in=tmp_path)
        assert written.skipped == ("results.epc has no values on three: not triangulated sets of their own in it",)
        with zipfile.ZipFile(written.folder / "results.epc") as archive:
            added = [archive.read(name).decode() for name in archive.namelist() if name.startswith("obj_CategoricalProperty")]
        assert sorted(re.search(r"<r:SupportingRepresentation>.*?<e:Title>(\w)</e:Title>", text)[1] for text in added) == ["B", "C"]
        assert (written.folder / "m.h5").read_bytes() == (tmp_path / "sub" / "m.h5").read_bytes()

    def test_a_table_takes_the_reference_system_of_its_files(self, tmp_path):
        put(tmp_path, package_of_model(model(), "m"))
        put(tmp_path, package_of_model(model("EPSG:23031"), "n"))
        table = tmp_path / "faults.csv"
        table.write_text("name,surface\none,m.epc#B\n")
        assert read_model(table).crs == "EPSG:25831"
        (tmp_path / "model.toml").write_text('crs = "epsg:25831"\nfaults = "faults.csv"')
        assert read_model(tmp_path).crs == "epsg:25831"
        assert not any("its files say" in finding.message for finding in read_model(tmp_path).findings)
        (tmp_path / "model.toml").write_text('crs = "EPSG:32631"\nfaults = "faults.csv"')
        told = [finding for finding in read_model(tmp_path).findings if finding.severity == "warning"]
        assert [finding.message for finding in told] == ["the model says EPSG:32631, its files say EPSG:25831"]
        table.write_text("name,surface\none,m.epc#B\ntwo,n.epc#C\n")
        different = read_model(table)
        assert different.crs == ""
        assert "the files name different reference systems: EPSG:23031, EPSG:25831" in [entry.message for entry in different.findings]

    def test_two_packages_are_told(self, tmp_path):
        for stem in "ab":
            put(tmp_path, package_of_model(model(), stem))
        analysis = run(read_model(tmp_path), Settings(replicates=100))
        written = write_outputs(analysis, tmp_path / "out", pictures=False, page=False, inputs_in=tmp_path)
        assert written.skipped == ("no results.epc was written: the model is of 2 packages",)

    def test_check_does_it_for_packages_only(self, tmp_path, capsys):
        path = put(tmp_path, package_of_model(model(), "m"))
        entry(["check", str(path), "--out", str(tmp_path / "out"), "--no-pictures", "--no-page", "--replicates", "100"])
        assert "results.epc" in capsys.readouterr().out
        entry(["convert", str(path), "--out", str(tmp_path / "plain")])
        entry(["check", str(tmp_path / "plain"), "--out", str(tmp_path / "out2"), "--no-pictures", "--no-page", "--replicates", "100"])
        assert "results.epc" not in capsys.readouterr().out

    @pytest.mark.parametrize(
        ("name", "kind"),
        [("resqml_2_0_1_testingPackageCpp", "obj_ContinuousProperty"), ("resqml_2_2_testingPackageCpp22", "ContinuousProperty")],
    )
    def test_packages_of_another_writer_keep_every_part(self, shared_data, tmp_path, name, kind):
        for suffix in (".epc", ".h5"):
            (tmp_path / f"{name}{suffix}").write_bytes((shared_data / "open_standard_samples" / f"{name}{suffix}").read_bytes())
        path = tmp_path / f"{name}.epc"
        written = write_outputs(
            run(read_model(path), Settings(replicates=100)), tmp_path / "out", pictures=False, page=False, inputs_in=path.parent
        )
        assert written.skipped == ()
        with zipfile.ZipFile(path) as old, zipfile.ZipFile(written.folder / "results.epc") as new:
            digests = [{part: hashlib.sha256(archive.read(part)).digest() for part in old.namelist()} for archive in (old, new)]
            assert {part for part in digests[0] if digests[0][part] != digests[1][part]} == {"[Content_Types].xml"}
            added = [part for part in set(new.namelist()) - set(old.namelist()) if part.startswith(kind)]
            titles = sorted(re.search(r"<e:Title>(\w+)</e:Title>", new.read(part).decode())[1] for part in added)
        assert titles == ["dip", "strike"]
        original = {"resqml_2_0_1_testingPackageCpp": "testingPackageCpp.h5", "resqml_2_2_testingPackageCpp22": "testingPackageCpp22.h5"}
        assert original[name] in written.files
        assert [fault.name for fault in read_model(written.folder / "results.epc").faults] == ["Fault1 Interp1"]


def test_patches_carry_their_own_values(tmp_path):
    from structviz.io.resqml_properties import Host, Values, with_properties

    files = package_of_model(FaultModel("t", model().faults[:1]), "m")
    (piece,) = read_beside(files["m.epc"], "m.epc", files.__getitem__)
    assert len(piece.triangles) == 2
    for version, tag in (("2.0", "RepresentationPatchIndex"), ("2.2", "ValuesForPatch ")):
        host = Host("TriangulatedSetRepresentation", "u", "p.xml", "t", version, (1, 1))
        epc, h5 = with_properties(files["m.epc"], "m.epc", [(host, [Values("dip", np.array([60.0, np.nan]), "dega", "dip")])], "r.h5")
        with zipfile.ZipFile(io.BytesIO(epc)) as archive:
            (name,) = [name for name in archive.namelist() if re.match(r"(obj_)?ContinuousProperty", name)]
            text = archive.read(name).decode()
        paths = re.findall(r"/RESQML/[^<]*", text)
        assert text.count(f"<r:{tag}") == 2
        with h5py.File(io.BytesIO(h5)) as store:
            values = [store[path][()] for path in paths]
        assert np.array_equal(np.concatenate(values), [60, np.nan], equal_nan=True)
