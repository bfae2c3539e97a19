"""Small valid files of every kind that structviz reads: what fuzzing starts from."""

from __future__ import annotations

import io
import tempfile
import warnings
from importlib.util import find_spec
from pathlib import Path

import numpy as np

from structviz.io import FORMATS
from structviz.model import Fault, FaultModel, Horizon
from structviz.surfaces.surface import Surface

Files = dict[str, bytes]  # the first is the one that is read; the others lie beside it

MODEL = b"""title = "small"
crs = "EPSG:25831"
length_unit = "m"
vertical = "depth"
faults = "faults.csv"
striae = "striae.csv"
mechanisms = "quakes.csv"
well_azimuths = "wells.csv"

[[fault]]
name = "B"
surface = "a.ply"
rake_deg = -80

[[horizon]]
name = "top"
surface = "a.ply"
"""
FAULTS = b"name,surface,sense,rake_deg,phase,down_side\nA,a.ply,normal,,,E\n"
STRIAE = b"fault,easting,northing,up,strike_deg,dip_deg,rake_deg,sense,weight\nA,500100,4000100,-50,10,60,-85,normal,1\n"
QUAKES = b"name,strike_deg,dip_deg,rake_deg,easting,northing,up,weight\nq1,10,60,-90,500000,4000000,-5000,1\nq2,20,50,-80,,,,2\n"
WELLS = b"name,shmax_deg,uncertainty_deg,easting,northing,up\nw1,15,10,500000,4000000,-2000\n"
TRACES = b"""{"type": "FeatureCollection", "features": [
{"type": "Feature", "properties": {"name": "T1", "dip_deg": 60, "dip_direction": "E", "rake_deg": -90,
  "upper_depth_km": 0, "lower_depth_km": 10},
 "geometry": {"type": "LineString", "coordinates": [[-118.0, 38.0], [-118.02, 38.1], [-118.0, 38.2]]}},
{"type": "Feature", "properties": {"name": "T2", "dip_deg": 60, "dip_direction": 270, "sense": "normal",
  "upper_depth_km": 0, "lower_depth_km": 10},
 "geometry": {"type": "MultiLineString", "coordinates": [[[-117.9, 38.0], [-117.9, 38.1]], [[-117.9, 38.1], [-117.88, 38.2]]]}}]}
"""
STICKS = b"fault,stick,easting,northing,up,sense\n" + b"".join(
    b"A,%d,%d,%d,%d,normal\n" % (k, 500000 + 50 * k + 400 * j, 4000000 + 900 * k, -700 * j) for k in range(4) for j in range(4)
)


def sheet() -> Surface:
    """Return a bent sheet of 12 triangles at map coordinates."""
    east, north = np.meshgrid(np.arange(4.0), np.arange(3.0))
    up = -100 * north.ravel() - 5 * east.ravel() ** 2
    vertices = np.stack([5e5 + 100 * east.ravel(), 4e6 + 60 * north.ravel(), up], 1)
    corner = np.arange(east.size).reshape(east.shape)
    a, b, c, d = corner[:-1, :-1].ravel(), corner[:-1, 1:].ravel(), corner[1:, 1:].ravel(), corner[1:, :-1].ravel()
    return Surface("Fault A", vertices, np.concatenate([np.stack([a, b, c], 1), np.stack([a, c, d], 1)]))


def samples() -> dict[str, Files]:
    """Return the files of every kind of input by a name of the kind."""
    found: dict[str, Files] = {}
    for entry in FORMATS:
        if entry.write:
            found[entry.key] = {f"a{entry.suffixes[0]}": entry.write(sheet(), {})}
        if entry.write_all:
            other = Surface("Fault B", sheet().vertices + [300.0, 50.0, 0.0], sheet().triangles)
            found[f"{entry.key}, several"] = {f"a{entry.suffixes[0]}": entry.write_all([(sheet(), {}), (other, {})])}
        if entry.write_model:
            found[entry.key] = dict(entry.write_model(FaultModel("small", (Fault("Fault A", sheet()),), (Horizon("Top", sheet()),)), "a"))
    mesh = {"a.ply": found["ply"]["a.ply"]}
    tables = {"faults.csv": FAULTS, "striae.csv": STRIAE, "quakes.csv": QUAKES, "wells.csv": WELLS}
    for name, content in ({"model.toml": MODEL} | tables).items():
        # The table under test is the first, which is damaged; the model file that names it is what is read.
        found[name] = {name: content} | {"model.toml": MODEL} | tables | mesh
    found["traces"] = {"a.geojson": TRACES}
    found["dxf"] = {"a.dxf": faces_in_dxf()}
    found["sticks"] = {"sticks.csv": STICKS}
    if find_spec("pyogrio") and find_spec("shapely"):
        found |= lines()
    return found


def lines() -> dict[str, Files]:
    """Return two traces as a GeoPackage and as a Shapefile, written by GDAL."""
    import pyogrio
    import shapely

    shapes = shapely.to_wkb(np.array([shapely.LineString([[x, 38.0], [x + 0.01, 38.1], [x, 38.2]]) for x in (-118.0, -117.9)], object))
    names = ["name", "dip_deg", "dip_dir", "rake_deg", "lower_km"]
    columns = [np.array(["T1", "T2"], object), np.array([60.0, 55.0]), np.array([90.0, 270.0]), np.array([-90, -80]), np.array([10.0, 9.0])]
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": "2026-01-01T00:00:00Z"})
    with tempfile.TemporaryDirectory() as folder, warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for name in ("a.gpkg", "a.shp"):
            pyogrio.raw.write(Path(folder, name), shapes, columns, names, geometry_type="LineString", crs="EPSG:4326")
        found = {path.name: path.read_bytes() for path in Path(folder).iterdir()}
    whole = {name: found[name] for name in ("a.shp", "a.shx", "a.dbf", "a.prj", "a.cpg")}
    return {"lines, GeoPackage": {"a.gpkg": found["a.gpkg"]}, "lines, Shapefile": whole}


def faces_in_dxf() -> bytes:
    """Return DXF text with the triangles of the sheet as 3D faces, on two layers, one of them in a block."""
    import ezdxf

    document = ezdxf.new()
    block = document.blocks.new("B")
    for corners in sheet().vertices[sheet().triangles].tolist():
        document.modelspace().add_3dface(corners, dxfattribs={"layer": "Fault A"})
        block.add_3dface(corners, dxfattribs={"layer": "Fault B"})
    document.modelspace().add_blockref("B", (300, 50, 0))
    document.layers.add("Fault A")
    out = io.StringIO()
    document.write(out)
    return out.getvalue().encode()
