"""Write the demo model: python meshes/make.py [FOLDER], by default the folder of this script.

The surfaces, labels and striae come from `structviz.synthetic.demo_model`; the same version writes the same bytes.
"""

from __future__ import annotations

import csv
import io
import sys
from collections.abc import Iterable
from pathlib import Path

from structviz.io.writing import write_surface
from structviz.model import Fault, FaultModel
from structviz.orientation.lines import trend_plunge_deg
from structviz.orientation.planes import strike_dip_deg
from structviz.surfaces.surface import Surface
from structviz.synthetic import Demo, demo_model
from structviz.synthetic.demo import STRIAE_ON, TRANSFERS

TOGETHER = "faults/transfers.obj"
SUFFIX = {"Westrakk": ".ply"}  # the rest are .vtp
MODEL = """\
title = "{title}"
crs = "{crs}"
length_unit = "m"
vertical = "elevation"
faults = "faults.csv"
striae = "striae.csv"
"""
HORIZON = """
[[horizon]]
name = "{name}"
surface = "{path}"
"""
README = """\
# The Ostravell Terrace, an invented fault model

A rift shoulder that does not exist. In the story, a sand under a seal is screened for storing carbon dioxide, and an interpreter hands over
{count} faults with the senses he gave them. Place, names and coordinates are made up; any likeness to a real place is chance.

- Frame: EPSG:25831 (easting, northing; metres), up positive. The reference system is stated so that files carry one; it locates nothing.
- `model.toml` the model; `faults.csv` names, surfaces, senses; `striae.csv` slip lines on {striae_faults} faults,
  as an image log would give them.
- `faults/` surfaces: bent, corrugated along the slip, with pick noise, wound either way as picked. VTP; one PLY; `transfers.obj`
  holds six named objects.
- `horizons/` three surfaces that the faults displace, cut at the faults. The three deep old faults displace only the basement.
- Made by `python meshes/make.py` from `structviz.synthetic.demo_model()` (random state fixed); coordinates are kept to the centimetre.

## Truth

| | trend | plunge |
|---|---|---|
{axes}

Shape ratio R = (sigma2 - sigma3)/(sigma1 - sigma3) = {ratio}; normal faulting that leans by 6 degrees. Every slip is the shear of
this stress on the mean plane, but for the three old faults. Conjugate faults scatter 5 degrees about planes 30 degrees from sigma1.

Planted, as real models have it:
- **{flipped}**: the label is swapped. It moved as a normal fault and is declared reverse (the horizons show it).
- **{mirrored}**: the surface is mirrored from east to west through its own middle, so that its strike is wrong; the label and the
  horizons are right.
- **{older}**: moved under an older strike-slip stress (sigma1 level, trend {older_trend:03.0f}) and handed over without
  a phase. Dextral then; the present stress would move them the other way.

Strike, dip and rake are those of the true mean plane (for {mirrored} before mirroring).

| fault | kind | strike | dip | true rake | declared |
|---|---|---|---|---|---|
{rows}
"""


def write_demo(folder: Path) -> None:
    """Write the whole demo model into a folder."""
    demo = demo_model()
    model = demo.known.model
    for name in ("faults", "horizons"):
        (folder / name).mkdir(parents=True, exist_ok=True)
    together = {name for name, *_ in TRANSFERS}
    for fault in model.faults:
        if fault.name not in together:
            write_surface(folder / path_of(fault), fault.surface)
    for horizon in model.horizons:
        write_surface(folder / horizon_path(horizon.name), horizon.surface)
    text = {
        TOGETHER: objects_text(fault.surface for fault in model.faults if fault.name in together),
        "faults.csv": faults_text(model.faults),
        "striae.csv": striae_text(model),
        "model.toml": model_text(model),
        "README.md": readme_text(demo),
    }
    for name, content in text.items():
        (folder / name).write_bytes(content.encode())


def path_of(fault: Fault) -> str:
    """Return the path of a fault's surface, relative to the folder."""
    if fault.name in {name for name, *_ in TRANSFERS}:
        return f"{TOGETHER}#{fault.name}"
    return f"faults/{fault.name.lower()}{SUFFIX.get(fault.name, '.vtp')}"


def horizon_path(name: str) -> str:
    """Return the path of a horizon's surface, relative to the folder."""
    return f"horizons/{name.lower().replace(' ', '_')}.vtp"


def objects_text(surfaces: Iterable[Surface]) -> str:
    """Return a Wavefront OBJ file with one named object for each surface; vertices are numbered through the file."""
    lines, first = ["# Ostravell Terrace, invented: transfer faults; easting, northing, up in metres"], 1
    for surface in surfaces:
        lines.append(f"o {surface.name}")
        lines += [f"v {east:.2f} {north:.2f} {up:.2f}" for east, north, up in surface.vertices.tolist()]
        lines += [f"f {a} {b} {c}" for a, b, c in (surface.triangles + first).tolist()]
        first += len(surface.vertices)
    return "\n".join(lines) + "\n"


def table_text(header: tuple[str, ...], rows: Iterable[tuple[object, ...]]) -> str:
    """Return a CSV table."""
    stream = io.StringIO()
    csv.writer(stream, lineterminator="\n").writerows([header, *rows])
    return stream.getvalue()


def faults_text(faults: tuple[Fault, ...]) -> str:
    """Return the table of faults."""
    rows = ((fault.name, path_of(fault), fault.declared.text if fault.declared else "", fault.phase, fault.down_side) for fault in faults)
    return table_text(("name", "surface", "sense", "phase", "down_side"), rows)


def striae_text(model: FaultModel) -> str:
    """Return the table of striae."""
    header = ("fault", "easting", "northing", "up", "strike_deg", "dip_deg", "rake_deg", "sense", "weight")
    rows = (
        (s.fault, *(f"{v:.2f}" for v in s.place), *(f"{v:.0f}" for v in (s.strike_deg, s.dip_deg, s.rake_deg)), sense, f"{s.weight:g}")
        for s in model.striae
        for sense in [s.declared.text if s.declared else ""]
    )
    return table_text(header, rows)


def model_text(model: FaultModel) -> str:
    """Return the model file."""
    horizons = (HORIZON.format(name=horizon.name, path=horizon_path(horizon.name)) for horizon in model.horizons)
    return MODEL.format(title=model.title, crs=model.crs) + "".join(horizons)


def readme_text(demo: Demo) -> str:
    """Return the description of the model with its truth."""
    known = demo.known
    trend, plunge = trend_plunge_deg(known.axes)
    axes = "\n".join(f"| sigma{i + 1} | {trend[i]:05.1f} | {plunge[i]:.1f} |" for i in range(3))
    strike, dip = strike_dip_deg(known.normals)
    rows = "\n".join(
        f"| {fault.name} | {known.kinds[i]} | {strike[i]:03.0f} | {dip[i]:.0f} | {known.true_rakes_deg[i]:.0f} | {fault.declared.text} |"
        for i, fault in enumerate(known.model.faults)
        if fault.declared
    )
    return README.format(
        count=len(known.model.faults),
        striae_faults=len(STRIAE_ON),
        axes=axes,
        ratio=known.shape_ratio,
        flipped=", ".join(known.flipped),
        mirrored=", ".join(demo.mirrored),
        older=", ".join(demo.older),
        older_trend=float(trend_plunge_deg(demo.older_axes[0])[0]),
        rows=rows,
    )


if __name__ == "__main__":
    write_demo(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent)
