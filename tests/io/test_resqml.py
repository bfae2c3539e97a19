"""RESQML 2.0.1 and 2.2: small packages written here by the standard, reference systems by hand, hostile archives, and sample files."""

from __future__ import annotations

import io
import random
import re
import sys
import time
import zipfile

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, StructvizError, SurfaceError
from structviz.io import read_model
from structviz.io.formats.epc import alone
from structviz.io.ledger import read_pieces

h5py = pytest.importorskip("h5py")

NODES = np.array([[0.0, 0.0, 100.0], [100.0, 0.0, 110.0], [100.0, 200.0, 300.0], [0.0, 200.0, 310.0]])
CORNERS = np.array([[0, 1, 2], [0, 2, 3]])
XSI = 'xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance"'
SPACES = {
    "2.0": 'xmlns:r="http://www.energistics.org/energyml/data/resqmlv2" xmlns:e="http://www.energistics.org/energyml/data/commonv2"',
    "2.2": 'xmlns:r="http://www.energistics.org/energyml/data/resqmlv2" xmlns:e="http://www.energistics.org/energyml/data/commonv2"',
}
CRS, SECOND_CRS, PROXY, FLAT, LEVEL = (f"{k:08d}-0000-4000-8000-000000000000" for k in (1, 2, 3, 4, 5))


def uuid(number):
    return f"{number:08d}-1111-4000-8000-000000000000"


class Builder:
    """A package in the making: objects, arrays, and what is to be wrong with it."""

    def __init__(self, version="2.0"):
        self.version, self.objects, self.arrays, self.h5_name = version, [], {}, "m.h5"
        if version == "2.0":
            self.add("EpcExternalPartReference", PROXY, "Hdf Proxy", "<e:MimeType>application/x-hdf5</e:MimeType>", space="e")

    def add(self, kind, key, title, inner, space="r", attributes=""):
        version = self.version if space == "r" else {"2.0": "2.0", "2.2": "2.3"}[self.version]
        text = f'<{space}:{kind} {SPACES[self.version]} {XSI} uuid="{key}" schemaVersion="{version}" {attributes}>'
        text += f"<e:Citation><e:Title>{title}</e:Title></e:Citation>{inner}</{space}:{kind}>"
        self.objects.append((kind, key, version, "eml" if space == "e" else "resqml", text))
        return self

    def ref(self, tag, kind, key, title="t"):
        if self.version == "2.0":
            name = "eml" if kind == "EpcExternalPartReference" else "resqml"
            inner = f"<e:ContentType>application/x-{name}+xml;version=2.0;type=obj_{kind}</e:ContentType><e:Title>{title}</e:Title>"
            return f"<{tag}>{inner}<e:UUID>{key}</e:UUID></{tag}>"
        return f"<{tag}><e:Uuid>{key}</e:Uuid><e:QualifiedType>resqml22.{kind}</e:QualifiedType><e:Title>{title}</e:Title></{tag}>"

    def array(self, tag, kind, path, values):
        """Return an element for values kept in HDF5; `kind` is Integer, Double or Point3d."""
        if values is not None:
            self.arrays[path] = np.asarray(values)
        inner = "r:Coordinates" if kind == "Point3d" else "r:Values" if self.version == "2.0" else "e:Values"
        if self.version == "2.0":
            place = f"<e:PathInHdfFile>{path}</e:PathInHdfFile>{self.ref('e:HdfProxy', 'EpcExternalPartReference', PROXY)}"
            null = "<r:NullValue>-1</r:NullValue>" if kind == "Integer" else ""
            return f'<{tag} xsi:type="r:{kind}Hdf5Array">{null}<{inner}>{place}</{inner}></{tag}>'
        name = {"Integer": "e:Integer", "Double": "e:FloatingPoint", "Point3d": "r:Point3d"}[kind]
        place = f"<e:Count>{np.size(self.arrays[path])}</e:Count><e:PathInExternalFile>{path}</e:PathInExternalFile>"
        place += f"<e:StartIndex>0</e:StartIndex><e:URI>{self.h5_name}</e:URI><e:MimeType>application/x-hdf5</e:MimeType>"
        part = f"<e:ExternalDataArrayPart>{place}</e:ExternalDataArrayPart>"
        return f'<{tag} xsi:type="{name}ExternalArray"><{inner}>{part}</{inner}></{tag}>'

    def depth_crs(self, key=CRS, offsets=(0, 0, 0), rotation=(0, "rad"), order="easting northing", units=("m", "m"), down=True, epsg=25831):
        x, y, z = offsets
        if self.version == "2.0":
            projected = f'<r:ProjectedCrs xsi:type="e:ProjectedCrsEpsgCode"><e:EpsgCode>{epsg}</e:EpsgCode></r:ProjectedCrs>'
            inner = (
                f"<r:YOffset>{y}</r:YOffset><r:ZOffset>{z}</r:ZOffset><r:ArealRotation uom='{rotation[1]}'>{rotation[0]}</r:ArealRotation>"
            )
            inner += f"<r:ProjectedAxisOrder>{order}</r:ProjectedAxisOrder><r:ProjectedUom>{units[0]}</r:ProjectedUom>"
            inner += f"<r:VerticalUom>{units[1]}</r:VerticalUom><r:XOffset>{x}</r:XOffset>"
            inner += f"<r:ZIncreasingDownward>{str(down).lower()}</r:ZIncreasingDownward>{projected}"
            return self.add("LocalDepth3dCrs", key, "local", inner)
        first, second = [{"easting": "east", "northing": "north", "westing": "west", "southing": "south"}[word] for word in order.split()]
        projected = f"<e:Citation><e:Title>p</e:Title></e:Citation><e:AxisOrder>{order}</e:AxisOrder>"
        projected += f'<e:AbstractProjectedCrs xsi:type="e:ProjectedEpsgCrs"><e:EpsgCode>{epsg}</e:EpsgCode></e:AbstractProjectedCrs>'
        inner = f"<e:Azimuth uom='{rotation[1]}'>{rotation[0]}</e:Azimuth><e:AzimuthReference>grid north</e:AzimuthReference>"
        inner += f"<e:OriginProjectedCoordinate1>{x}</e:OriginProjectedCoordinate1>"
        inner += f"<e:OriginProjectedCoordinate2>{y}</e:OriginProjectedCoordinate2><e:HorizontalAxes><e:Direction1>{first}</e:Direction1>"
        inner += f"<e:Direction2>{second}</e:Direction2><e:Uom>{units[0]}</e:Uom><e:IsTime>false</e:IsTime></e:HorizontalAxes>"
        inner += f'<e:OriginProjectedCrs uom="{units[0]}">{projected}</e:OriginProjectedCrs>'
        self.add("LocalEngineering2dCrs", FLAT, "flat", inner, "e")
        way = "down" if down else "up"
        self.add("VerticalCrs", LEVEL, "level", f"<e:Direction>{way}</e:Direction>", "e", f'uom="{units[1]}"')
        inner = self.ref("e:VerticalCrs", "VerticalCrs", LEVEL) + f"<e:OriginVerticalCoordinate>{z}</e:OriginVerticalCoordinate>"
        inner += f"<e:VerticalAxis><e:Direction>{way}</e:Direction><e:Uom>{units[1]}</e:Uom><e:IsTime>false</e:IsTime></e:VerticalAxis>"
        inner += self.ref("e:LocalEngineering2dCrs", "LocalEngineering2dCrs", FLAT)
        return self.add("LocalEngineeringCompoundCrs", key, "local", inner, "e")

    def geometry(self, points, crs=CRS, kind=None):
        kind = kind or ("LocalDepth3dCrs" if self.version == "2.0" else "LocalEngineeringCompoundCrs")
        return f"<r:Geometry>{self.ref('r:LocalCrs', kind, crs)}{points}</r:Geometry>"

    def interpretation(self, number, title="Fault A", kind="FaultInterpretation", inner=""):
        return self.add(kind, uuid(number), title, f"<r:Domain>depth</r:Domain>{inner}")

    def represented(self, number, kind="FaultInterpretation"):
        return self.ref("r:RepresentedInterpretation" if self.version == "2.0" else "r:RepresentedObject", kind, uuid(number))

    def triangles(self, number, of, patches=((NODES, CORNERS),), title="rep", kind="FaultInterpretation", crs=CRS, crs_kind=None):
        inner = self.represented(of, kind) if of else ""
        for place, (nodes, corners) in enumerate(patches):
            path = f"/RESQML/{uuid(number)}"
            head = f"<r:PatchIndex>{place}</r:PatchIndex><r:Count>{len(corners)}</r:Count>" if self.version == "2.0" else ""
            held = self.array("r:Triangles", "Integer", f"{path}/triangles_patch{place}", corners)
            spread = self.geometry(self.array("r:Points", "Point3d", f"{path}/points_patch{place}", nodes), crs, crs_kind)
            inner += f"<r:TrianglePatch>{head}<r:NodeCount>{len(nodes)}</r:NodeCount>{held}{spread}</r:TrianglePatch>"
        return self.add("TriangulatedSetRepresentation", uuid(number), title, inner)

    def grid(self, number, of, shape, points, kind="HorizonInterpretation", title="grid"):
        body = f"<r:FastestAxisCount>{shape[1]}</r:FastestAxisCount><r:SlowestAxisCount>{shape[0]}</r:SlowestAxisCount>"
        body += self.geometry(points)
        if self.version == "2.0":
            body = f"<r:Grid2dPatch><r:PatchIndex>0</r:PatchIndex>{body}</r:Grid2dPatch>"
        return self.add("Grid2dRepresentation", uuid(number), title, (self.represented(of, kind) if of else "") + body)

    def lattice(self, tag, origin, slow, fast):
        """Return a lattice element; slow and fast are (vector, spacing, count of steps)."""
        outer, inner = ("r:Offset", "r:Offset") if self.version == "2.0" else ("r:Dimension", "r:Direction")
        constant = "r:Double" if self.version == "2.0" else "e:FloatingPoint"
        space = constant[0]
        text = point("r:Origin", origin)
        for vector, spacing, count in (slow, fast):
            steps = f"<{space}:Value>{spacing}</{space}:Value><{space}:Count>{count}</{space}:Count>"
            steps = f'<r:Spacing xsi:type="{constant}ConstantArray">{steps}</r:Spacing>'
            text += f"<{outer}>{point(inner, vector)}{steps}</{outer}>"
        return f'<{tag} xsi:type="r:Point3dLatticeArray">{text}</{tag}>'

    def epc(self, extra=(), compression=zipfile.ZIP_DEFLATED):
        out = io.BytesIO()
        types = '<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">'
        with zipfile.ZipFile(out, "w", compression) as archive:
            for kind, key, version, name, text in self.objects:
                prefix = "obj_" if self.version == "2.0" else ""
                part = f"{prefix}{kind}_{key}.xml"
                types += f'<Override ContentType="application/x-{name}+xml;version={version};type={prefix}{kind}" PartName="/{part}"/>'
                archive.writestr(part, '<?xml version="1.0" encoding="UTF-8"?>' + text)
            links = '<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">'
            where = "http://schemas.energistics.org/package/2012/relationships/externalResource"
            links += f'<Relationship Id="Hdf5File" TargetMode="External" Target="{self.h5_name}" Type="{where}"/></Relationships>'
            archive.writestr(f"_rels/obj_EpcExternalPartReference_{PROXY}.xml.rels", links)
            archive.writestr("[Content_Types].xml", types + "</Types>")
            for name, content in extra:
                archive.writestr(name, content)
        return out.getvalue()

    def h5(self, mark=np.bytes_(PROXY), **options):  # noqa: B008
        out = io.BytesIO()
        with h5py.File(out, "w") as store:
            store.attrs["uuid"] = mark
            for path, values in self.arrays.items():
                store.create_dataset(path, data=values, **options)
        return out.getvalue()

    def pieces(self, h5=None):
        held = self.h5() if h5 is None else h5
        return read_pieces(self.epc(), "m.epc", lambda name: {"m.h5": held}[name])


def point(tag, values):
    return f"<{tag}>" + "".join(f"<r:Coordinate{k}>{value}</r:Coordinate{k}>" for k, value in enumerate(values, 1)) + f"</{tag}>"


def plain(version="2.0", **crs):
    return Builder(version).depth_crs(**crs).interpretation(1).triangles(2, 1)


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


def test_a_format_error_names_the_part():
    made = plain()
    made.objects[-1] = (*made.objects[-1][:4], made.objects[-1][4][:-5])
    with pytest.raises(FormatError, match=rf"m\.epc, obj_TriangulatedSetRepresentation_{uuid(2)}\.xml: found XML that breaks off"):
        made.pieces()
