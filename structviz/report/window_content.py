"""What a window shows, from an analysis or from a folder of results: both through the same description, so that they show the same."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis
from structviz.errors import FormatError, InputError
from structviz.io import read_surfaces
from structviz.io.vtk_xml import Source, values
from structviz.orientation.lines import vectors
from structviz.report.annotated import triangle_values
from structviz.report.results_json import results
from structviz.report.write import RESULTS
from structviz.surfaces.intersections import meetings
from structviz.surfaces.surface import Surface
from structviz.views.captions import WORDS, shortened
from structviz.views.scene import MOST_GLYPHS, VIEW_AZIMUTHS_DEG, Label, Scene, SceneSurface, StressGlyph
from structviz.views.window import WindowContent, WindowField

Floats = NDArray[np.float64]
Values = Mapping[str, NDArray]

FIELDS = (
    ("dip_deg", "Dip", "\u00b0", 0.0, 90.0),
    ("predicted_rake_deg", "Predicted rake", "\u00b0", -180.0, 180.0),
    ("misfit_deg", "Misfit of declared slip", "\u00b0", 0.0, 180.0),
    ("slip_tendency", "Slip tendency", "of the greatest", 0.0, 1.0),
)
MOST_NAMES = 24


def content_of_analysis(analysis: Analysis) -> WindowContent:
    """Return what a window shows of an analysis."""
    held = results(analysis)
    surfaces = [result.fault.surface for result in analysis.faults]
    shown = [triangle_values(r, analysis.regimes[r.phase] if analysis.regimes else None) for r in analysis.faults]
    lines = [meeting.segments for meeting in analysis.meetings]
    return _content(json.loads(json.dumps(held)), surfaces, shown, lines)


def content_of_results(folder: Path) -> WindowContent:
    """Return what a window shows of a folder that `check` wrote; InputError where it is no such folder or no longer whole."""
    file = folder / RESULTS
    try:
        held = json.loads(file.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(
            file, f"no results ({error.strerror})", "a folder written by structviz check --out", hint="check the path"
        ) from None
    except (ValueError, RecursionError) as error:
        raise FormatError(
            file, f"JSON that cannot be read ({error})"[:200], "results.json of structviz", hint="run the check again"
        ) from None
    if not isinstance(held, dict) or held.get("schema") != 1 or not isinstance(held.get("faults"), list) or not held["faults"]:
        raise FormatError(file, "JSON of another kind", "results.json of structviz, schema 1", hint="run the check again")
    surfaces, shown = [], []
    try:
        for fault in held["faults"]:
            mesh = folder / str(fault["mesh"])
            surfaces.append(replace(read_surfaces(mesh)[0], name=str(fault["name"])))
            shown.append(_values_in(mesh))
        lines = [meeting.segments for meeting in meetings([(s.vertices, s.triangles) for s in surfaces])]
        return _content(held, surfaces, shown, lines)
    except (KeyError, TypeError, AttributeError, IndexError) as error:
        found = f"results without {error}" if isinstance(error, KeyError) else f"results that do not hold together ({error})"
        raise FormatError(file, found[:200], "results.json of this version", hint="run the check again") from None


def _values_in(mesh: Path) -> Values:
    """Return the values on the triangles of an annotated mesh by name."""
    source = Source(mesh.read_bytes(), mesh.name)
    arrays = source.root.findall("PolyData/Piece/CellData/DataArray")
    wanted = {key for key, *_ in FIELDS}
    return {name: values(source, array, name) for array in arrays if (name := array.get("Name", "")) in wanted}


def _content(held: dict[str, Any], surfaces: Sequence[Surface], shown: Sequence[Values], lines: Sequence[Floats]) -> WindowContent:
    order = sorted(range(len(surfaces)), key=lambda k: (WORDS.index(held["faults"][k]["verdict"]), -held["faults"][k]["area_m2"]))
    faults, surfaces = [held["faults"][k] for k in order], [surfaces[k] for k in order]
    fields = []
    for key, title, unit, low, high in FIELDS:
        found = tuple(np.asarray(shown[k].get(key, np.full(len(surfaces[at].triangles), np.nan)), float) for at, k in enumerate(order))
        if any(np.isfinite(each).any() for each in found):
            fields.append(WindowField(title, unit, low, high, found))
    return WindowContent(_scene(held, faults, surfaces, lines), tuple(fields), tuple(record(fault) for fault in faults))


def _scene(held: dict[str, Any], faults: Sequence[dict[str, Any]], surfaces: Sequence[Surface], lines: Sequence[Floats]) -> Scene:
    everything = np.concatenate([surface.vertices for surface in surfaces])
    origin = np.round((everything.min(0) + everything.max(0)) / 2)
    low, high = everything.min(0) - origin, everything.max(0) - origin
    azimuth = _azimuth_deg(surfaces)
    drawn = tuple(SceneSurface(f["name"], f["verdict"], s.vertices - origin, s.triangles) for f, s in zip(faults, surfaces))
    words = [fault["verdict"] for fault in faults]
    return Scene(
        title=headline(held),
        subtitle=str(held["model"]["title"]),
        origin=origin,
        surfaces=drawn,
        glyphs=_glyphs(held, origin, low, high, azimuth),
        labels=tuple(Label(shortened(f["name"]), _top(s) - origin, f["verdict"]) for f, s in zip(faults[:MOST_NAMES], surfaces)),
        low=low,
        high=high,
        view_from_deg=azimuth,
        counts=tuple((word, words.count(word)) for word in WORDS if word in words),
        meetings=np.concatenate([np.zeros((0, 2, 3)), *(each - origin for each in lines)]),
    )


def headline(held: dict[str, Any]) -> str:
    """Return the regimes of results in a line."""
    told = [
        f"{r['class']} stress" + (f", SHmax {r['shmax_deg']:03.0f}\u00b0" if r.get("shmax_deg") is not None else "")
        for r in held["regimes"]
    ]
    return "; ".join(told) or "no stress could be inferred"


def _azimuth_deg(surfaces: Sequence[Surface]) -> float:
    """Return the azimuth from which the surfaces show most of their area."""
    areas = np.concatenate([_area_vectors(surface) for surface in surfaces])
    eyes = [(np.sin(np.radians(a)), np.cos(np.radians(a)), 0.6) for a in VIEW_AZIMUTHS_DEG]
    return VIEW_AZIMUTHS_DEG[int(np.argmax([np.round(np.abs(areas @ eye).sum(), 3) for eye in eyes]))]


def _area_vectors(surface: Surface) -> Floats:
    a, b, c = (surface.vertices[surface.triangles[:, k]] for k in range(3))
    return np.cross(b - a, c - a) / 2


def _top(surface: Surface) -> Floats:
    upper = surface.vertices[surface.vertices[:, 2] >= np.quantile(surface.vertices[:, 2], 0.75)]
    return np.asarray(upper[((upper - upper.mean(0)) ** 2).sum(1).argmin()])


def _glyphs(held: dict[str, Any], origin: Floats, low: Floats, high: Floats, azimuth_deg: float) -> tuple[StressGlyph, ...]:
    """Return a large glyph for each regime beside the model, and small ones where the heaviest pairs meet, well apart."""
    size, a = float(np.linalg.norm((high - low)[:2])), np.radians(azimuth_deg)
    towards, right = np.array([np.sin(a), np.cos(a), 0.0]), np.array([-np.cos(a), np.sin(a), 0.0])
    corners = np.array([[x, y, 0.0] for x in (low[0], high[0]) for y in (low[1], high[1])])
    beside = (0.85 * (corners @ towards).max() + 0.14 * size) * towards + 0.74 * (corners @ right).min() * right
    large = [StressGlyph(beside + k * 0.2 * size * right, _axes(regime), 0.075 * size) for k, regime in enumerate(held["regimes"])]
    small: list[StressGlyph] = []
    for pair in held["pairs"] if large else ():
        place = np.array(pair["place"], float) - origin
        if len(small) < MOST_GLYPHS and all(np.linalg.norm(place - other.place) > 0.13 * size for other in small):
            small.append(StressGlyph(place, _axes(pair), 0.033 * size))
    return (*large, *small)


def _axes(row: dict[str, Any]) -> Floats:
    return np.stack([vectors(row[name]["trend_deg"], row[name]["plunge_deg"]) for name in ("sigma1", "sigma2", "sigma3")])


def record(fault: dict[str, Any]) -> str:
    """Return what results say of one fault, in lines."""
    said = fault["declared"] or {}
    lines = [f"{fault['name']}: {fault['verdict']}"]
    declared = said.get("sense") or (f"rake {said['rake_deg']:g}\u00b0" if said.get("rake_deg") is not None else "nothing")
    rake = fault.get("predicted_rake_deg")
    lines.append(f"declared {declared}; predicted rake " + (f"{rake:.0f}\u00b0" if rake is not None else "none"))
    if fault.get("conflict_probability") is not None:
        lines.append(
            f"conflict {100 * fault['conflict_probability']:.0f} %"
            + (f", {fault['misfit_deg']:.0f}\u00b0 apart" if fault.get("misfit_deg") is not None else "")
        )
    if fault.get("strike_deg") is not None:
        lines.append(f"plane {fault['strike_deg']:03.0f}/{fault['dip_deg']:02.0f}")
    lines += [str(reason) for reason in fault["reasons"][:3]]
    lines += [f"{100 * cause['score']:.0f} % {cause['text']}" for cause in fault["causes"][:3]]
    return "\n".join(line if len(line) < 110 else line[:109] + "\u2026" for line in lines)
