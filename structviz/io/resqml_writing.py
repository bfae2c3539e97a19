"""A fault model as a RESQML 2.0.1 package: interpretations with triangulated sets, in metres, elevations, at full precision.

A package is two files, the EPC archive and the HDF5 file of its arrays. Declared movements go into extra metadata by the names of our
table of faults, and into the kind of throw where that has a word for them.
"""

from __future__ import annotations

import hashlib
import re

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.io.epc_writing import Made, hdf5_bytes, identifier, package_bytes, plain, proxy_of, reference, stored
from structviz.io.zip_parts import unsafe
from structviz.model import Fault, FaultModel
from structviz.surfaces.surface import Surface

VERSION = "2.0"
THROWS = {"normal": "normal", "reverse": "reverse"}


def package_of_model(model: FaultModel, stem: str) -> dict[str, bytes]:
    """Return the two files of a package by name, STEM.epc and STEM.h5: every fault and horizon of a model.

    ArgumentError for a stem that a package cannot name its arrays by.
    """
    if unsafe(f"{stem}.h5"):
        found = f"a package named {stem[:80]!r}"
        raise ArgumentError(f"{found}: wanted a plain name, without colons, backslashes or control characters", hint="choose another name")
    proxy = proxy_of(identifier("proxy", model.title, stem), f"{stem}.h5")
    system = _reference_system(model.crs)
    objects = [proxy, system]
    arrays: dict[str, NDArray] = {}
    bodies = [("Fault", fault.name, fault.surface, _declared(fault)) for fault in model.faults]
    bodies += [("Horizon", horizon.name, horizon.surface, ("", "")) for horizon in model.horizons]
    for place, (what, name, surface, declared) in enumerate(bodies):
        made, held = _surface_objects(what, name, surface, declared, (place, proxy, system))
        objects += made
        arrays |= held
    return {f"{stem}.epc": package_bytes(objects, model.title), f"{stem}.h5": hdf5_bytes(arrays, proxy.uuid)}


def _reference_system(crs: str) -> Made:
    """Return the local system of all surfaces: no offset, no rotation, metres, heights up."""
    code = re.fullmatch(r"EPSG:(\d{1,7})", crs)
    known = f'xsi:type="e:ProjectedCrsEpsgCode"><e:EpsgCode>{code[1]}</e:EpsgCode>' if code else ""
    known = known or f'xsi:type="e:ProjectedUnknownCrs"><e:Unknown>{plain(crs) or "Unknown"}</e:Unknown>'
    body = (
        '<r:YOffset>0</r:YOffset><r:ZOffset>0</r:ZOffset><r:ArealRotation uom="rad">0</r:ArealRotation>'
        "<r:ProjectedAxisOrder>easting northing</r:ProjectedAxisOrder><r:ProjectedUom>m</r:ProjectedUom><r:VerticalUom>m</r:VerticalUom>"
        "<r:XOffset>0</r:XOffset><r:ZIncreasingDownward>false</r:ZIncreasingDownward>"
        '<r:VerticalCrs xsi:type="e:VerticalUnknownCrs"><e:Unknown>Unknown</e:Unknown></r:VerticalCrs>'
        f"<r:ProjectedCrs {known}</r:ProjectedCrs>"
    )
    return Made("LocalDepth3dCrs", identifier("crs", crs), "metres, elevations", body)


def _declared(fault: Fault) -> tuple[str, str]:
    """Return extra metadata and throw of what is declared of a fault."""
    sector = fault.declared
    told = {
        "sense": sector.text if sector and sector.words else "",
        "rake_deg": repr(sector.rake_deg) if sector and not sector.words else "",
        "phase": fault.phase,
        "down_side": fault.down_side,
    }
    pairs = [(f"structviz:{name}", plain(value)) for name, value in told.items() if value]
    extra = "".join(f"<r:ExtraMetadata><r:Name>{name}</r:Name><r:Value>{value}</r:Value></r:ExtraMetadata>" for name, value in pairs)
    throw = THROWS.get(told["sense"], "")
    return extra, f"<r:ThrowInterpretation><r:Throw>{throw}</r:Throw></r:ThrowInterpretation>" if throw else ""


def _surface_objects(
    what: str, name: str, surface: Surface, declared: tuple[str, str], shared: tuple[int, Made, Made]
) -> tuple[list[Made], dict[str, NDArray]]:
    """Return feature, interpretation and representation of one surface, and its arrays by their paths."""
    place, proxy, system = shared
    vertices, triangles = np.asarray(surface.vertices, "<f8"), np.asarray(surface.triangles)
    digest = hashlib.sha256(vertices.tobytes() + triangles.astype("<i8").tobytes()).hexdigest()
    keys = [identifier(role, place, name, digest) for role in ("feature", "interpretation", "representation")]
    kind = "<r:TectonicBoundaryKind>fault</r:TectonicBoundaryKind>"
    feature_kind = "TectonicBoundaryFeature"
    if what == "Horizon":
        kind, feature_kind = "<r:GeneticBoundaryKind>horizon</r:GeneticBoundaryKind>", "GeneticBoundaryFeature"
    feature = Made(feature_kind, keys[0], name, kind)
    meant = reference("r:InterpretedFeature", feature_kind, keys[0], name, VERSION)
    inner = f"{declared[0]}<r:Domain>depth</r:Domain>{meant}{declared[1]}"
    interpretation = Made(f"{what}Interpretation", keys[1], name, inner, (feature.link,))
    path = f"/RESQML/{keys[2]}"
    at = (proxy.uuid, proxy.external)
    held = stored("r:Triangles", "Integer", f"{path}/triangles_patch0", triangles.size, VERSION, at)
    nodes = stored("r:Points", "Point3d", f"{path}/points_patch0", vertices.size, VERSION, at)
    local = reference("r:LocalCrs", system.kind, system.uuid, system.title, VERSION)
    patch = (
        f"<r:PatchIndex>0</r:PatchIndex><r:Count>{len(triangles)}</r:Count><r:NodeCount>{len(vertices)}</r:NodeCount>"
        f'{held}<r:Geometry xsi:type="r:PointGeometry">{local}{nodes}</r:Geometry>'
    )
    of = reference("r:RepresentedInterpretation", interpretation.kind, keys[1], name, VERSION)
    body = f"{of}<r:SurfaceRole>map</r:SurfaceRole><r:TrianglePatch>{patch}</r:TrianglePatch>"
    shape = Made("TriangulatedSetRepresentation", keys[2], name, body, (interpretation.link, system.link, proxy.link))
    corners = triangles.astype("<u4" if triangles.size and triangles.max() < 2**32 else "<i8")
    return [feature, interpretation, shape], {f"{path}/points_patch0": vertices, f"{path}/triangles_patch0": corners}
