"""Small RESQML packages written by the standard, for tests of our reader: with nothing of our writer, and able to be wrong."""

from __future__ import annotations

import io
import zipfile

import numpy as np

from structviz.io.ledger import read_pieces

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
        import h5py

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
