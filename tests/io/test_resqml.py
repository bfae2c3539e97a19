"""RESQML 2.0.1 and 2.2: small packages written by the standard, reference systems by hand, and sample files of another writer."""

from __future__ import annotations

import re

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io import read_model

from .resqml_builder import CORNERS, CRS, FLAT, NODES, Builder, plain, uuid

pytest.importorskip("h5py")

both = pytest.mark.parametrize("version", ["2.0", "2.2"])


@both
class TestReading:
    def test_a_fault_interpretation_names_its_triangulated_set(self, version):
        (piece,) = plain(version).pieces()
        assert (piece.name, piece.kind, piece.framed, piece.crs, piece.aside) == ("Fault A", "fault", True, "EPSG:25831", "")
        assert piece.vertices.dtype == np.float64
        assert np.array_equal(piece.vertices, NODES * [1, 1, -1])
        assert np.array_equal(piece.triangles, CORNERS[:, [0, 2, 1]])  # depth turned into elevation mirrors a surface
        assert piece.history == ("local reference system 'local': depth to elevation",)

    def test_elevations_in_metres_are_left_alone(self, version):
        (piece,) = plain(version, down=False).pieces()
        assert np.array_equal(piece.vertices, NODES)
        assert np.array_equal(piece.triangles, CORNERS)
        assert piece.history == ()

    def test_corner_numbers_count_through_all_patches(self, version):
        patches = ((NODES, CORNERS), (NODES + [500, 0, 0], CORNERS + 4))
        (piece,) = Builder(version).depth_crs(down=False).interpretation(1).triangles(2, 1, patches).pieces()
        assert np.array_equal(piece.vertices, np.concatenate([NODES, NODES + [500, 0, 0]]))
        assert np.array_equal(piece.triangles, np.concatenate([CORNERS, CORNERS + 4]))
        assert piece.history == ()

    def test_patches_that_count_from_zero_each_are_told(self, version):
        patches = ((NODES, CORNERS), (NODES + [500, 0, 0], CORNERS))
        (piece,) = Builder(version).depth_crs(down=False).interpretation(1).triangles(2, 1, patches).pieces()
        assert np.array_equal(piece.triangles, np.concatenate([CORNERS, CORNERS + 4]))
        assert piece.history == ("corner numbers of 2 patches each counted from zero",)

    def test_packed_arrays_give_the_same(self, version):
        made = plain(version)
        (piece,) = made.pieces(made.h5(compression="gzip", shuffle=True, chunks=True))
        assert np.array_equal(piece.vertices, NODES * [1, 1, -1])

    def test_horizons_are_known_and_what_is_neither_is_set_aside(self, version):
        made = plain(version).interpretation(3, "Top", "HorizonInterpretation").triangles(4, 3, kind="HorizonInterpretation")
        made.interpretation(5, "Edge", "GenericFeatureInterpretation").triangles(6, 5, kind="GenericFeatureInterpretation")
        made.triangles(7, 0, title="loose").triangles(8, 1, title="second of A")
        found = {piece.name: (piece.kind, piece.aside) for piece in made.pieces()}
        assert found == {
            "Fault A": ("fault", ""),
            "Top": ("horizon", ""),
            "Edge": ("", "the file says it is neither fault nor horizon (GenericFeatureInterpretation)"),
            "loose": ("", "no interpretation says that it is a fault"),
            "second of A": ("fault", "another representation of the same interpretation"),
        }

    def test_without_interpretations_every_surface_counts(self, version):
        made = Builder(version).depth_crs().triangles(2, 0, title="A").triangles(3, 0, title="A")
        assert [(piece.name, piece.aside) for piece in made.pieces()] == [("A", ""), ("A (2)", "")]

    def test_explicit_grids(self, version):
        east, north = np.meshgrid([0.0, 10, 20], [0.0, 5])
        nodes = np.stack([east, north, 100 + east], axis=-1)
        made = plain(version).interpretation(3, "Top", "HorizonInterpretation")
        made.grid(4, 3, (2, 3), made.array("r:Points", "Point3d", "/g/points", nodes))
        top = next(piece for piece in made.pieces() if piece.name == "Top")
        assert np.array_equal(top.vertices, nodes.reshape(-1, 3) * [1, 1, -1])
        assert len(top.triangles) == 4
        assert "grid of 2 x 3 nodes split into triangles" in top.history

    def test_heights_on_a_lattice_with_holes(self, version):
        made = plain(version).interpretation(3, "Top", "HorizonInterpretation")
        heights = np.array([[100.0, 110, 120], [100, 111, np.nan], [100, 112, 125]])
        below = made.lattice("r:SupportingGeometry", (1000, 2000, 0), ((0, 1, 0), 25, 2), ((1, 0, 0), 10, 2))
        points = f'<r:Points xsi:type="r:Point3dZValueArray">{below}{made.array("r:ZValues", "Double", "/g/z", heights)}</r:Points>'
        top = next(piece for piece in made.grid(4, 3, (3, 3), points).pieces() if piece.name == "Top")
        assert len(top.triangles) == 4
        assert np.array_equal(top.vertices, [(1000 + 10 * k, 2000 + 25 * row, -heights[row, k]) for row in range(3) for k in range(2)])
        assert "2 cells without heights left out" in top.history

    def test_points_borrowed_from_the_lattice_of_another_grid(self, version):
        made = plain(version).interpretation(3, "Top", "HorizonInterpretation").interpretation(5, "Survey", "GenericFeatureInterpretation")
        made.grid(
            6, 5, (3, 4), made.lattice("r:Points", (0, 0, 0), ((0, 1, 0), 100, 2), ((1, 0, 0), 50, 3)), "GenericFeatureInterpretation"
        )
        space = "r" if version == "2.0" else "e"
        steps = "".join(
            f"<{space}:Offset><{space}:Value>{value}</{space}:Value><{space}:Count>1</{space}:Count></{space}:Offset>" for value in (4, 2)
        )
        nodes = f"<r:NodeIndicesOnSupportingRepresentation><{space}:StartValue>1</{space}:StartValue>{steps}"
        nodes += "</r:NodeIndicesOnSupportingRepresentation>" + made.ref("r:SupportingRepresentation", "Grid2dRepresentation", uuid(6))
        below = f'<r:SupportingGeometry xsi:type="r:Point3dFromRepresentationLatticeArray">{nodes}</r:SupportingGeometry>'
        heights = made.array("r:ZValues", "Double", "/g/z", [[1.0, 2], [3, 4]])
        made.grid(4, 3, (2, 2), f'<r:Points xsi:type="r:Point3dZValueArray">{below}{heights}</r:Points>')
        top = next(piece for piece in made.pieces() if piece.name == "Top")
        assert np.array_equal(top.vertices, [[50, 0, -1], [150, 0, -2], [50, 100, -3], [150, 100, -4]])

    def test_other_shapes_are_told(self, version):
        made = plain(version).add("PolylineSetRepresentation", uuid(9), "sticks", "").add("PointSetRepresentation", uuid(8), "picks", "")
        (piece,) = made.pieces()
        assert piece.told == ("1 PointSetRepresentation not read", "1 PolylineSetRepresentation not read")

    def test_model_of_a_package(self, version, tmp_path):
        made = plain(version).interpretation(3, "Top", "HorizonInterpretation").triangles(4, 3, kind="HorizonInterpretation")
        made.add("PointSetRepresentation", uuid(8), "picks", "")
        (tmp_path / "m.epc").write_bytes(made.epc())
        (tmp_path / "m.h5").write_bytes(made.h5())
        model = read_model(tmp_path / "m.epc")
        assert ([fault.name for fault in model.faults], [horizon.name for horizon in model.horizons]) == (["Fault A"], ["Top"])
        assert model.crs == "EPSG:25831"
        assert [entry.path for entry in model.inputs] == ["m.epc", "m.h5"]
        assert "m.epc: 1 PointSetRepresentation not read" in [finding.message for finding in model.findings]


class TestReferenceSystems:
    """One local place, (1000, 0, 250), by hand in each reference system."""

    def place(self, version, nodes=(1000.0, 0.0, 250.0), **crs):
        nodes = np.array([nodes, (0.0, 0.0, 0.0), (0.0, 1000.0, 0.0)])
        made = Builder(version).depth_crs(**crs).interpretation(1).triangles(2, 1, ((nodes, np.array([[0, 1, 2]])),))
        (piece,) = made.pieces()
        return piece

    @both
    def test_offsets_and_depth(self, version):
        piece = self.place(version, offsets=(500000, 4000000, 50))
        assert np.array_equal(piece.vertices[0], [501000, 4000000, -300])

    @both
    def test_clockwise_rotation(self, version):
        # axes turned clockwise by 30 degrees: local first axis towards azimuth 120, so 1000 along it is 866.0254 east, 500 south
        piece = self.place(version, offsets=(500000, 4000000, 0), rotation=(30, "dega"))
        assert piece.vertices[0] == pytest.approx([500866.0254037844, 3999500.0, -250], abs=1e-9)
        assert "turned clockwise by 30 degrees" in piece.history[0]
        assert self.place(version, rotation=(np.pi / 6, "rad")).vertices[0] == pytest.approx([866.0254037844, -500, -250], abs=1e-9)

    @both
    def test_northing_first(self, version):
        # first axis north: 1000 along it is north, and the first offset is a northing
        piece = self.place(version, offsets=(4000000, 500000, 0), order="northing easting")
        assert np.array_equal(piece.vertices[0], [500000, 4001000, -250])
        assert "axes towards north and east" in piece.history[0]
        assert np.array_equal(piece.triangles, [[0, 1, 2]])  # swapped axes and depth mirror twice

    @both
    def test_northing_first_and_turned(self, version):
        # north turned clockwise by 90 degrees is east
        piece = self.place(version, offsets=(4000000, 500000, 0), order="northing easting", rotation=(90, "dega"))
        assert piece.vertices[0] == pytest.approx([501000, 4000000, -250], abs=1e-9)

    @both
    def test_westing_southing(self, version):
        piece = self.place(version, offsets=(10, 20, 0), order="westing southing")
        assert np.array_equal(piece.vertices[0], [-1010, -20, -250])

    @both
    def test_feet(self, version):
        piece = self.place(version, offsets=(1000, 0, 10), units=("ft", "ft[US]"))
        assert piece.vertices[0] == pytest.approx([2000 * 0.3048, 0, -260 * 1200 / 3937], abs=1e-12)
        assert "from ft (heights ft[US]) to m" in piece.history[0]

    def test_version_2_2_may_count_heights_down_from_a_level_counted_up(self):
        made = plain("2.2", offsets=(0, 0, 400))
        made.objects = [
            (
                *entry[:4],
                entry[4].replace("<e:Direction>down</e:Direction></e:VerticalCrs>", "<e:Direction>up</e:Direction></e:VerticalCrs>"),
            )
            for entry in made.objects
        ]
        (piece,) = made.pieces()
        assert np.array_equal(piece.vertices[:, 2], 400 - NODES[:, 2])

    @both
    @pytest.mark.parametrize(
        ("crs", "told"),
        [
            ({"units": ("link", "m")}, "in 'link'"),
            ({"rotation": (3, "seca")}, "a rotation of '3' 'seca'"),
            ({"rotation": ("x", "rad")}, "a rotation of 'x'"),
        ],
    )
    def test_what_cannot_be_turned_into_metres_is_refused(self, version, crs, told):
        with pytest.raises(SurfaceError, match=told):
            plain(version, **crs).pieces()

    @pytest.mark.parametrize(
        ("version", "was", "now", "told"),
        [
            ("2.0", "Downward>true", "Downward>perhaps", "ZIncreasingDownward 'perhaps'"),
            ("2.0", "easting northing", "easting westing", "axes towards 'east and west'"),
            ("2.0", "<r:XOffset>0", "<r:XOffset>none", "XOffset 'none'"),
            ("2.0", f'<r:LocalDepth3dCrs(.*)uuid="{CRS}', r'<r:LocalDepth3dCrs\1uuid="other', "that is not in the package"),
            ("2.2", "grid north", "true north", "axes counted from true north"),
            ("2.2", "<e:IsTime>false</e:IsTime></e:VerticalAxis>", "<e:IsTime>true</e:IsTime></e:VerticalAxis>", "heights in time"),
            ("2.2", "<e:Direction2>north", "<e:Direction2>up", "axes towards 'east and up'"),
            ("2.2", "<e:VerticalAxis><e:Direction>down", "<e:VerticalAxis><e:Direction>west", "an upright axis towards 'west'"),
            ("2.2", f'<e:LocalEngineering2dCrs(.*)uuid="{FLAT}', r'<e:LocalEngineering2dCrs\1uuid="other', "without its plane"),
        ],
    )
    def test_systems_that_cannot_be_followed(self, version, was, now, told):
        made = plain(version)
        made.objects = [(*entry[:4], re.sub(was, now, entry[4])) for entry in made.objects]
        with pytest.raises(InputError, match=told):
            made.pieces()

    @pytest.mark.parametrize("definition", ['PROJCRS["Some grid, zone 3", BASEGEODCRS[]]', 'PROJCS["Some grid, zone 3"]'])
    def test_a_system_defined_in_words_gives_its_name(self, definition):
        made = plain("2.2")
        made.objects = [
            (*entry[:4], re.sub("<e:EpsgCode>.*</e:EpsgCode>", f"<e:WellKnownText>{definition}</e:WellKnownText>", entry[4]))
            for entry in made.objects
        ]
        assert made.pieces()[0].crs == "Some grid, zone 3"

    def test_times_cannot_be_judged(self):
        made = Builder().depth_crs().interpretation(1).triangles(2, 1, crs_kind="LocalTime3dCrs")
        with pytest.raises(SurfaceError, match="heights in time, not in length: dips cannot be judged"):
            made.pieces()
        made.triangles(3, 1, title="in depth")
        (piece,) = made.pieces()
        words = "'rep' is not read: heights in time, not in length: dips cannot be judged"
        assert (piece.told, piece.missed) == ((words,), ())

    def test_a_fault_that_is_missed_is_a_warning(self, tmp_path):
        made = plain().interpretation(4, "Fault B").triangles(5, 4, title="B in time", crs_kind="LocalTime3dCrs")
        made.interpretation(6, "Top", "HorizonInterpretation")
        made.triangles(7, 6, title="Top in time", kind="HorizonInterpretation", crs_kind="LocalTime3dCrs")
        made.triangles(8, 0, title="loose in time", crs_kind="LocalTime3dCrs")
        (tmp_path / "m.epc").write_bytes(made.epc())
        (tmp_path / "m.h5").write_bytes(made.h5())
        found = [finding for finding in read_model(tmp_path / "m.epc").findings if "in time" in finding.message]
        assert {finding.message.split("'")[1]: finding.severity for finding in found} == {
            "B in time": "warning",
            "Top in time": "note",
            "loose in time": "note",
        }


class TestArrays:
    """Arrays that are not simply one dataset."""

    def changed(self, version, was, now, **crs):
        made = plain(version, **crs)
        made.objects = [(*entry[:4], re.sub(was, now, entry[4], flags=re.S)) for entry in made.objects]
        return made

    def test_numbers_written_out(self):
        now = '<r:Triangles xsi:type="e:IntegerXmlArray"><e:NullValue>-1</e:NullValue><e:Values>0 1 2 0 2 3</e:Values></r:Triangles>'
        (piece,) = self.changed("2.2", "<r:Triangles.*</r:Triangles>", now, down=False).pieces()
        assert np.array_equal(piece.triangles, CORNERS)

    @pytest.mark.parametrize(
        ("array", "told"),
        [
            ('"e:IntegerXmlArray"><e:Values>0 1 2 0 2</e:Values>', "5 corner numbers of triangles"),
            ('"e:IntegerXmlArray"><e:Values>0 1 x 0 2 3</e:Values>', "triangles that are not numbers"),
            ('"e:IntegerXmlArray"><e:Values>0 1 2.5 0 2 3</e:Values>', "triangles with fractions"),
            ('"e:IntegerXmlArray"><e:Values>0 1 1e300 0 2 3</e:Values>', "triangles out of range"),
            ('"e:IntegerXmlArray"><e:Values>0 1 2 0 2 -1</e:Values>', "corner number -1"),
            ('"e:IntegerExternalArray"><e:Values/>', "0 corner numbers"),
        ],
    )
    def test_numbers_written_out_wrongly(self, array, told):
        made = self.changed("2.2", "<r:Triangles.*</r:Triangles>", f"<r:Triangles xsi:type={array}</r:Triangles>")
        with pytest.raises(FormatError, match=told):
            made.pieces()

    @pytest.mark.parametrize(
        ("array", "told"),
        [
            ('"r:IntegerLatticeArray">', "triangles as IntegerLatticeArray"),
            ('"r:BooleanHdf5Array"><r:Values/>', "no place for triangles"),
            ('"r:IntegerConstantArray"><r:Value>0</r:Value><r:Count>5</r:Count>', "5 numbers of triangles"),
        ],
    )
    def test_other_kinds_are_refused(self, array, told):
        made = self.changed("2.0", "<r:Triangles.*</r:Triangles>", f"<r:Triangles xsi:type={array}</r:Triangles>")
        with pytest.raises(InputError, match=told):
            made.pieces()

    def test_a_range_and_a_constant(self):
        nodes = NODES[:3]
        made = Builder().depth_crs(down=False).interpretation(1).triangles(2, 1, ((nodes, CORNERS[:1]),))
        text = made.objects[-1][4]
        now = '<r:Triangles xsi:type="r:IntegerRangeArray"><r:Value>0</r:Value><r:Count>3</r:Count></r:Triangles>'
        made.objects[-1] = (*made.objects[-1][:4], re.sub("<r:Triangles.*</r:Triangles>", now, text))
        made.interpretation(3, "Top", "HorizonInterpretation")
        below = made.lattice("r:SupportingGeometry", (0, 0, 7), ((0, 1, 0), 25, 1), ((1, 0, 0), 10, 1))
        flat = '<r:ZValues xsi:type="r:DoubleConstantArray"><r:Value>-80</r:Value><r:Count>4</r:Count></r:ZValues>'
        made.grid(4, 3, (2, 2), f'<r:Points xsi:type="r:Point3dZValueArray">{below}{flat}</r:Points>')
        found = {piece.name: piece for piece in made.pieces()}
        assert np.array_equal(found["Fault A"].triangles, [[0, 1, 2]])
        assert np.array_equal(found["Top"].vertices, [[0, 0, -80], [10, 0, -80], [0, 25, -80], [10, 25, -80]])

    @both
    def test_single_precision_is_told_where_it_steps(self, version):
        near = Builder(version).depth_crs().interpretation(1).triangles(2, 1, ((NODES.astype("f4"), CORNERS),))
        assert near.pieces()[0].told == ()
        far = Builder(version).depth_crs().interpretation(1).triangles(2, 1, (((NODES + [0, 4e6, 0]).astype("f4"), CORNERS),))
        assert far.pieces()[0].told == ("points in single precision: coordinates are stepped by up to 0.25",)

    def test_roots_with_the_prefix_of_their_class(self):
        (piece,) = self.changed("2.0", "r:TriangulatedSetRepresentation", "r:obj_TriangulatedSetRepresentation").pieces()
        assert piece.kind == "fault"

    def test_an_array_in_several_parts(self):
        made = plain("2.2", down=False)
        path = f"/RESQML/{uuid(2)}/points_patch0"
        made.arrays |= {f"{path}a": NODES[:1], f"{path}b": NODES[1:]}
        kind, key, version, name, text = made.objects[-1]
        (part,) = re.findall(r"<e:ExternalDataArrayPart><e:Count>12.*?</e:ExternalDataArrayPart>", text)
        parts = "".join(part.replace("<e:Count>12", f"<e:Count>{count}").replace(path, path + end) for count, end in ((3, "a"), (9, "b")))
        made.objects[-1] = (kind, key, version, name, text.replace(part, parts))
        (piece,) = made.pieces()
        assert np.array_equal(piece.vertices, NODES)

    def test_a_part_from_the_middle_of_a_dataset_is_told(self):
        with pytest.raises(SurfaceError, match="points from the middle of a dataset"):
            self.changed("2.2", r"(<e:Count>12.*?<e:StartIndex>)0", r"\g<1>3").pieces()

    @both
    def test_what_is_missing(self, version):
        for tag in ("Geometry", "Points", "Triangles"):
            with pytest.raises(InputError, match=r"no points|no triangles|0 corner numbers|local reference system"):
                self.changed(version, f"<r:{tag}.*</r:{tag}>", "").pieces()
        with pytest.raises(InputError, match="no patches"):
            self.changed(version, "<r:TrianglePatch>.*</r:TrianglePatch>", "").pieces()

    def test_grids_that_are_no_surface(self):
        made = plain().interpretation(3, "Top", "HorizonInterpretation").interpretation(5, "Hole", "HorizonInterpretation")
        made.grid(4, 3, (1, 3), made.array("r:Points", "Point3d", "/g/points", np.zeros((3, 3))), title="line")
        made.grid(6, 5, (2, 2), made.array("r:Points", "Point3d", "/h/points", np.full((4, 3), np.nan)), title="hole")
        (piece,) = made.pieces()
        assert piece.told == ("'line' is not read: a grid of 1 x 3 nodes", "'hole' is not read: a grid without a whole cell")

    @pytest.mark.parametrize(
        ("count", "start", "lender", "told"),
        [
            (1, 5, 6, "points taken from outside a grid"),
            (2, 0, 6, "a lattice of indices of 2 axes"),
            (1, 0, 7, "no grid 't' to take points from"),
            (1, 0, 4, "no plain lattice"),
        ],
    )
    def test_points_borrowed_wrongly(self, count, start, lender, told):
        made = plain().interpretation(3, "Top", "HorizonInterpretation")
        made.grid(6, 0, (2, 2), made.lattice("r:Points", (0, 0, 0), ((0, 1, 0), 100, 1), ((1, 0, 0), 50, 1)))
        steps = f"<r:Offset><r:Value>1</r:Value><r:Count>{count}</r:Count></r:Offset>" * 2
        nodes = f"<r:StartValue>{start}</r:StartValue>{steps}"
        nodes = f"<r:NodeIndicesOnSupportingRepresentation>{nodes}</r:NodeIndicesOnSupportingRepresentation>"
        nodes += made.ref("r:SupportingRepresentation", "Grid2dRepresentation", uuid(lender))
        made.grid(4, 3, (2, 2), f'<r:Points xsi:type="r:Point3dFromRepresentationLatticeArray">{nodes}</r:Points>')
        if "plain" in told:
            assert any(told in words for words in made.pieces()[0].told)
        else:
            with pytest.raises(FormatError, match=told):
                made.pieces()


class TestDeclarations:
    def declared(self, inner):
        (piece,) = Builder().depth_crs(down=False).interpretation(1, inner=inner).triangles(2, 1).pieces()
        return piece.declared, piece.history

    @pytest.mark.parametrize(("throw", "sense"), [("normal", "normal"), ("reverse", "reverse"), ("thrust", "reverse")])
    def test_throws_in_the_table_are_senses(self, throw, sense):
        assert self.declared(f"<r:ThrowInterpretation><r:Throw>{throw}</r:Throw></r:ThrowInterpretation>") == ({"sense": sense}, ())

    @pytest.mark.parametrize("throw", ["strike-slip", "scissor", "variable"])
    def test_other_throws_are_only_told(self, throw):
        taken, history = self.declared(f"<r:ThrowInterpretation><r:Throw>{throw}</r:Throw></r:ThrowInterpretation>")
        assert taken == {}
        assert history == (f"the file also says, and it is not used: throw {throw}: no sense taken from it",)

    def test_two_throws_are_no_sense(self):
        taken, history = self.declared("<r:ThrowInterpretation><r:Throw>normal</r:Throw><r:Throw>reverse</r:Throw></r:ThrowInterpretation>")
        assert taken == {}
        assert "throw normal, reverse: no sense taken from it" in history[0]

    def test_sizes_and_times_are_told(self):
        inner = '<r:IsListric>true</r:IsListric><r:MaximumThrow uom="m">120</r:MaximumThrow>'
        inner += "<r:ThrowInterpretation><r:Throw>normal</r:Throw><r:HasOccuredDuring/></r:ThrowInterpretation>"
        taken, history = self.declared(inner)
        assert taken == {"sense": "normal"}
        assert history == ("the file also says, and it is not used: greatest throw 120 m; listric true; time of movement",)

    def test_our_own_columns_go_first(self):
        pairs = {"structviz:rake_deg": "-85", "structviz:phase": "older", "other": "x"}
        inner = "".join(f"<r:ExtraMetadata><r:Name>{k}</r:Name><r:Value>{v}</r:Value></r:ExtraMetadata>" for k, v in pairs.items())
        inner += "<r:ThrowInterpretation><r:Throw>normal</r:Throw></r:ThrowInterpretation>"
        assert self.declared(inner)[0] == {"rake_deg": "-85", "phase": "older"}


@pytest.mark.parametrize("name", ["resqml_2_0_1_testingPackageCpp.epc", "resqml_2_2_testingPackageCpp22.epc"])
def test_sample_packages_of_another_writer(shared_data, name):
    model = read_model(shared_data / "open_standard_samples" / name)
    (fault,) = model.faults
    assert (fault.name, len(fault.surface.triangles), model.crs) == ("Fault1 Interp1", 20, "EPSG:23031")
    assert fault.surface.vertices[:, 2].min() == -650
    assert sorted(horizon.name for horizon in model.horizons) == [
        "Horizon interpretation for continuous color map",
        "Horizon1 Interp1",
        "Horizon2 Interp1",
    ]
    told = " ".join(finding.message for finding in model.findings)
    assert "'Horizon1 Interp1 Grid2dRep' is not read: heights in time" in told
    assert "3 PointSetRepresentations not read" in told
    assert "another representation of the same interpretation" in told
