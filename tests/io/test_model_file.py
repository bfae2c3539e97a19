"""Model files, tables of faults and folders: what is read, what is told, what is refused."""

from __future__ import annotations

import hashlib

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, TableError
from structviz.io import read_model, read_surfaces

OBJ = "o North\nv 0 0 -10\nv 100 0 -10\nv 0 0 -60\no South\nv 0 500 -10\nv 100 500 -10\nv 0 500 -60\no North\nf 1 2 3\no South\nf 4 5 6\n"


@pytest.fixture
def folder(tmp_path):
    """Return a folder with one file of two surfaces and one file of one."""
    (tmp_path / "two.obj").write_text(OBJ)
    (tmp_path / "a.off").write_text("OFF\n3 1 0\n0 0 -10\n100 0 -10\n0 0 -60\n3 0 1 2\n")
    return tmp_path


def csv(folder, text, name="faults.csv"):
    (folder / name).write_bytes(text.encode())
    return folder / name


def toml(folder, text, name="model.toml"):
    (folder / name).write_text(text, encoding="utf-8")
    return folder / name


def messages(model):
    return [f"{finding.subject}: {finding.message}" for finding in model.findings]


class TestTable:
    def test_every_column_arrives(self, folder):
        path = csv(
            folder,
            "name,surface,sense,rake_deg,phase,down_side\nA,a.off,Normal-Sinistral,,old,sw\nB,two.obj#South,,-120.5,,\nC,two.obj#North,,,,\n",
        )
        a, b, c = read_model(path).faults
        assert (a.declared.words, a.phase, a.down_side) == (("normal", "sinistral"), "old", "SW")
        assert (b.declared.rake_deg, b.surface.vertices[0].tolist(), b.surface.source) == (-120.5, [0, 500, -10], "two.obj#South")
        assert (c.declared, c.phase, c.down_side) == (None, "", "")

    def test_marks_dos_ends_semicolons_quotes_and_blank_rows_are_passed_over(self, folder):
        path = csv(folder, '\ufeffname;surface;sense\r\n\r\n "Fault; one";a.off ; dextral\r\n;;\r\n')
        (fault,) = read_model(path).faults
        assert (fault.name, fault.declared.words) == ("Fault; one", ("dextral",))

    def test_unknown_columns_are_ignored_and_told(self, folder):
        model = read_model(csv(folder, "name,surface,author\nA,a.off,me\n"))
        assert "model: faults.csv: columns author are not used" in messages(model)

    def test_inputs_carry_relative_paths_and_hashes(self, folder):
        model = read_model(csv(folder, "name,surface\nA,a.off\nB,two.obj#South\nC,two.obj#North\n"))
        assert [entry.path for entry in model.inputs] == ["a.off", "faults.csv", "two.obj"]
        assert all(entry.sha256 == hashlib.sha256((folder / entry.path).read_bytes()).hexdigest() for entry in model.inputs)

    def test_a_file_of_several_surfaces_is_used_whole_and_told(self, folder):
        model = read_model(csv(folder, "name,surface\nA,two.obj\n"))
        assert len(model.faults[0].surface.triangles) == 2
        assert model.faults[0].surface.triangles.max() == 5
        assert "A: two.obj holds 2 named surfaces; together they are used as one" in messages(model)

    def test_two_faults_on_one_surface_are_a_warning(self, folder):
        model = read_model(csv(folder, "name,surface\nA,a.off\nB,a.off\n"))
        assert [(f.subject, f.severity) for f in model.findings] == [("B", "warning")]
        assert "uses the same surface as A: a.off" in model.findings[0].message

    def test_names_with_odd_characters_are_only_names(self, folder):
        model = read_model(csv(folder, 'name,surface\n"../../etc/x\tand\u0007",a.off\n'))
        assert model.faults[0].name == "../../etc/x\tand\u0007"

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            ("", r"faults\.csv: found an empty table"),
            ("name,surface\n", r"faults\.csv: found a header and no rows"),
            ("name,sense\nA,normal\n", r"found columns name, sense; wanted a column 'surface'\n  next: add a column 'surface'"),
            ("name,surfaces\nA,a.off\n", r"\n  next: rename the column 'surfaces' to 'surface'"),
            ("name,surface,name\nA,a.off,B\n", "two columns 'name'; wanted each column once"),
            (
                "name,surface\nA,a.off\n\nA,two.obj\n",
                r"faults\.csv, row 4: found name 'A', as in faults\.csv, row 2; wanted every name once",
            ),
            ("name,surface\n,a.off\n", r"faults\.csv, row 2: found no name"),
            ("name,surface\nA,\n", r"faults\.csv, row 2: found no surface"),
            (
                "name,surface,sense\nA,a.off,norml\n",
                r"row 2: found sense 'norml'; wanted one of normal, reverse.*\n.*did you mean 'normal'\?",
            ),
            ("name,surface,sense\nA,a.off,normal-reverse\n", "wanted one dip-slip and one strike-slip word"),
            ("name,surface,sense,rake_deg\nA,a.off,normal,-90\n", "both sense 'normal' and rake_deg -90; wanted one of the two"),
            ("name,surface,rake_deg\nA,a.off,steep\n", "row 2: found rake_deg 'steep'; wanted a number"),
            ("name,surface,rake_deg\nA,a.off,1_0\n", "found rake_deg '1_0'; wanted a number"),
            ("name,surface,rake_deg\nA,a.off,-200\n", "found rake_deg -200; wanted -180 to 180"),
            ("name,surface,rake_deg\nA,a.off,nan\n", "found rake_deg nan; wanted -180 to 180"),
            ("name,surface,down_side\nA,a.off,NNN\n", r"found down_side 'NNN'; wanted one of N, NNE.*\n  next: did you mean 'N"),
            ("name,surface\nA,a.off,x\n", "row 2: found 3 cells; wanted 2, as in the header"),
            ('name,surface\nA,"a.off\n', "row 2: found a row that cannot be parted"),
            (
                "name,surface\nA,b.off\n",
                r"b\.off \(named in faults\.csv, row 2\): found no such file; wanted an existing file\n  next: did you mean 'a\.off'\?",
            ),
            ("name,surface\nA,x\\a.off\n", "write the path with forward slashes"),
            ("name,surface\nA,two.obj#East\n", r"row 2: found part 'East' of two\.obj; wanted 'North', 'South'"),
            ("name,surface\nA,a.off#East\n", "wanted a file with named parts"),
            ("name,surface\nA,.\n", r"\.: found a path that cannot be read \(Is a directory\)"),
            ("name,surface\nA," + "x" * 5000 + "\n", r"x \(named in faults\.csv, row 2\): found no such file"),
        ],
    )
    def test_bad_rows_are_refused_with_file_row_and_next_step(self, folder, text, message):
        with pytest.raises(InputError, match=message) as caught:
            read_model(csv(folder, text))
        assert caught.value.hint

    def test_text_that_is_not_utf8_is_refused(self, folder):
        (folder / "faults.csv").write_bytes("name,surface\nÄ,a.off\n".encode("latin-1"))
        with pytest.raises(TableError, match=r"faults\.csv: found a byte that is not UTF-8 \(at 13\)"):
            read_model(folder)

    def test_only_ten_parts_are_listed(self, folder):
        (folder / "many.obj").write_text("v 0 0 0\nv 1 0 0\nv 0 1 0\n" + "".join(f"o p{k}\nf 1 2 3\n" for k in range(14)))
        with pytest.raises(TableError, match=r"wanted 'p0', .*'p9' and 4 more"):
            read_model(csv(folder, "name,surface\nA,many.obj#q\n"))

    def test_a_file_name_may_hold_a_hash(self, folder):
        (folder / "a#1.off").write_bytes((folder / "a.off").read_bytes())
        (folder / "b#1.obj").write_text(OBJ)
        model = read_model(csv(folder, "name,surface\nA,a#1.off\nB,b#1.obj#South\n"))
        assert [fault.surface.source for fault in model.faults] == ["a#1.off", "b#1.obj#South"]


class TestModelFile:
    def test_everything_it_may_hold_arrives(self, folder):
        csv(folder, "name,surface,sense\nA,a.off,dextral\n")
        csv(folder, "fault,easting,northing,up,strike_deg,dip_deg,rake_deg\nA,1,2,3,90,60,170\n", "striae.csv")
        path = toml(
            folder,
            'title = "Vale"\ncrs = "EPSG:25831"\nlength_unit = "km"\nvertical = "elevation"\nfaults = "faults.csv"\nstriae = "striae.csv"\n'
            '[[fault]]\nname = "B"\nsurface = "two.obj#North"\nrake_deg = -85\nphase = "young"\ndown_side = "N"\n'
            '[[horizon]]\nname = "top"\nsurface = "two.obj#South"\n',
        )
        model = read_model(path)
        assert (model.title, model.crs) == ("Vale", "EPSG:25831")
        assert sorted((fault.name, fault.declared.text, fault.phase) for fault in model.faults) == [
            ("A", "dextral", ""),
            ("B", "rake -85", "young"),
        ]
        assert [horizon.name for horizon in model.horizons] == ["top"]
        assert model.horizons[0].surface.vertices[0].tolist() == [0, 500_000, -10_000]
        assert model.striae[0].place == (1000.0, 2000.0, 3000.0)
        assert [entry.path for entry in model.inputs] == ["a.off", "faults.csv", "model.toml", "striae.csv", "two.obj"]
        assert read_model(folder).title == "Vale"  # the folder finds its model.toml

    @pytest.mark.parametrize(("unit", "metres"), [("m", 1.0), ("km", 1000.0), ("ft", 0.3048), ("us-ft", 1200 / 3937)])
    def test_units_become_metres_once_and_are_remembered(self, folder, unit, metres):
        path = toml(folder, f'length_unit = "{unit}"\n[[fault]]\nname = "A"\nsurface = "a.off"\n')
        surface = read_model(path).faults[0].surface
        assert np.array_equal(surface.vertices, np.array([[0, 0, -10], [100, 0, -10], [0, 0, -60]]) * metres)
        assert surface.history == (() if unit == "m" else (f"coordinates converted from {unit} to m",))

    def test_depth_becomes_elevation_and_the_surface_keeps_its_side(self, folder):
        (folder / "depth.off").write_text("OFF\n3 1 0\n0 0 10\n100 0 10\n0 0 60\n3 0 2 1\n")
        path = toml(folder, 'vertical = "depth"\n[[fault]]\nname = "A"\nsurface = "depth.off"\n')
        model = read_model(path)
        elevation = read_surfaces(folder / "a.off")[0]
        assert np.array_equal(model.faults[0].surface.vertices, elevation.vertices)
        assert np.array_equal(model.faults[0].surface.triangles, elevation.triangles)
        assert "A: depth (down positive) turned into elevation (up positive), triangles wound the other way round" in messages(model)

    def test_the_same_remark_about_many_faults_is_told_once(self, folder):
        for k in range(5):
            (folder / f"f{k}.off").write_bytes((folder / "a.off").read_bytes())
        rows = "".join(f'[[fault]]\nname = "F{k}"\nsurface = "f{k}.off"\n' for k in range(5))
        assert messages(read_model(toml(folder, 'length_unit = "ft"\n' + rows))) == [
            "model: 5 surfaces: coordinates converted from ft to m"
        ]

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            ("", "model.toml: found no faults; wanted faults = "),
            ("title = ", "found text that is not TOML"),
            ('lenght_unit = "m"', r"found key 'lenght_unit'.*\n  next: did you mean 'length_unit'\?"),
            (
                'length_unit = "feet"\nfaults = "faults.csv"',
                r"length_unit 'feet'; wanted one of m, km, ft, us-ft\n  next: did you mean 'ft'\?",
            ),
            ('vertical = "down"\nfaults = "faults.csv"', "vertical 'down'; wanted one of elevation, depth"),
            ("title = 7", "title = 7; wanted text in quotes"),
            ('fault = "A"', r"wanted \[\[fault\]\] entries"),
            (
                '[[fault]]\nname = "A"\nsurfaces = "a.off"',
                r"model\.toml, fault 1: found key 'surfaces'.*\n  next: did you mean 'surface'\?",
            ),
            ('[[fault]]\nname = "A"\nsurface = "a.off"\nrake_deg = "steep"', "rake_deg = 'steep'; wanted a number"),
            ('[[fault]]\nname = "A"\nsurface = "a.off"\nrake_deg = true', "rake_deg = True; wanted a number"),
            ('[[fault]]\nname = "A"\nsurface = "a.off"\nrake_deg = -181', r"model\.toml, fault 1: found rake_deg -181; wanted -180 to 180"),
            ('[[fault]]\nname = "A"\nsurface = "a.off"\nrake_deg = inf', "found rake_deg inf"),
            ('[[fault]]\nname = 7\nsurface = "a.off"', "name = 7; wanted text in quotes"),
            ('[[fault]]\nsurface = "a.off"', "fault 1: found no name"),
            ('[[fault]]\nname = "A"\nsurface = "a\\u0000.off"', "wanted a path"),
            ('[[fault]]\nname = "A"\nsurface = "a.off"\n[[horizon]]\nname = "h"\nsense = "normal"', "horizon 1: found key 'sense'"),
            ('faults = "fault.csv"', r"fault\.csv: found no such file"),
        ],
    )
    def test_bad_files_are_refused(self, folder, text, message):
        with pytest.raises(InputError, match=message) as caught:
            read_model(toml(folder, text))
        assert caught.value.hint

    def test_a_fault_in_the_table_and_in_the_file_may_not_share_a_name(self, folder):
        csv(folder, "name,surface\nA,a.off\n")
        with pytest.raises(TableError, match=r"faults\.csv, row 2: found name 'A', as in model\.toml, fault 1"):
            read_model(toml(folder, 'faults = "faults.csv"\n[[fault]]\nname = "A"\nsurface = "a.off"\n'))

    def test_a_table_in_a_subfolder_names_files_beside_itself(self, folder):
        (folder / "inner").mkdir()
        (folder / "inner" / "b.obj").write_text(OBJ)
        csv(folder / "inner", "name,surface\nA,b.obj#South\nB,../a.off\n")
        model = read_model(toml(folder, 'faults = "inner/faults.csv"\n'))
        assert [fault.surface.source for fault in model.faults] == ["inner/b.obj#South", "a.off"]


class TestOutside:
    @pytest.mark.parametrize("where", ["../a.off", "deep/../../a.off", "ABSOLUTE", "link.off"])
    def test_paths_may_not_leave_the_folder_unless_allowed(self, folder, where):
        inner = folder / "inner"
        (inner / "deep").mkdir(parents=True)
        (inner / "link.off").symlink_to(folder / "a.off")
        path = csv(inner, f"name,surface\nA,{str(folder / 'a.off') if where == 'ABSOLUTE' else where}\n")
        with pytest.raises(InputError, match=r"which leaves the folder of the model; wanted a path inside it\n.*--allow-outside"):
            read_model(path)
        assert len(read_model(path, allow_outside=True).faults) == 1

    def test_tables_named_in_a_model_file_may_not_either(self, folder):
        csv(folder, "name,surface\nA,a.off\n")
        (folder / "inner").mkdir()
        with pytest.raises(InputError, match="--allow-outside"):
            read_model(toml(folder / "inner", 'faults = "../faults.csv"\n'))

    def test_a_link_to_a_folder_is_a_folder(self, folder):
        csv(folder, "name,surface\nA,a.off\n")
        (folder / "link").symlink_to(folder)
        assert len(read_model(folder / "link").faults) == 1

    def test_links_in_a_circle_are_refused(self, folder):
        (folder / "x.off").symlink_to(folder / "y.off")
        (folder / "y.off").symlink_to(folder / "x.off")
        with pytest.raises(InputError, match=r"x\.off"):
            read_model(csv(folder, "name,surface\nA,x.off\n"))


class TestMeshes:
    def test_a_folder_gives_every_mesh_sorted_named_by_stem_or_part(self, folder):
        (folder / "notes.txt").write_text("not a mesh")
        (folder / ".hidden.obj").write_text("not a mesh")
        model = read_model(folder)
        assert [fault.name for fault in model.faults] == ["a", "North", "South"]
        assert all(fault.declared is None for fault in model.faults)
        assert model.title == folder.name
        assert any("no senses are declared" in message for message in messages(model))

    def test_names_that_come_twice_carry_their_file(self, folder):
        (folder / "three.obj").write_text(OBJ)
        names = [fault.name for fault in read_model(folder).faults]
        assert names == ["a", "three.obj:North", "three.obj:South", "two.obj:North", "two.obj:South"]

    def test_one_file_gives_its_surfaces(self, folder):
        assert [fault.name for fault in read_model(folder / "two.obj").faults] == ["North", "South"]
        assert [surface.source for surface in read_surfaces(folder / "two.obj")] == ["two.obj#North", "two.obj#South"]

    def test_progress_is_told_up_to_the_end(self, folder):
        told = []
        read_model(folder, progress=lambda text, done, total: told.append((text, done, total)))
        assert told == [("reading surfaces", k, 2) for k in range(3)]

    def test_a_folder_without_meshes_shows_the_formats(self, tmp_path):
        with pytest.raises(InputError, match=r"found no files; wanted mesh files, model\.toml or faults\.csv") as caught:
            read_model(tmp_path)
        assert ".vtp" in str(caught.value)
        (tmp_path / "notes.txt").write_text("x")
        with pytest.raises(InputError, match="found 1 files, none of them a mesh"):
            read_model(tmp_path)

    @pytest.mark.parametrize("name", ["nowhere.vtp", "no/where/at/all.toml", "x" * 5000, "a\0b"])
    def test_a_path_that_is_not_there(self, tmp_path, name):
        with pytest.raises(InputError, match="no such file"):
            read_model(tmp_path / name)

    def test_a_web_page_saved_as_a_mesh_is_told(self, tmp_path):
        (tmp_path / "a.vtp").write_text("<!DOCTYPE html><html></html>")
        with pytest.raises(FormatError, match=r"a\.vtp: found a web page \(HTML\)"):
            read_model(tmp_path)
