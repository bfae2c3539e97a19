"""What the 3D view of the page draws, as plain data and arrays.

Places travel as whole steps in the box of their surface, relative to a float64 origin; values of triangles as steps of a stated
size. The arrays stand one after another, little-endian, in one zlib stream.
"""

from __future__ import annotations

import zlib
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.orientation.planes import slip_vectors
from structviz.report import page_words as words
from structviz.report.names import printable
from structviz.report.page_fields import coded_fields
from structviz.report.page_geometry import STEPS, Drawn, drawn_surfaces, quantised
from structviz.views import palette
from structviz.views.captions import shortened
from structviz.views.glyph_layers import GlyphLayer, glyph_layers, middle_station
from structviz.views.glyphs import stress_glyph
from structviz.views.scene import Scene, StressGlyph, build_scene

MOST_TRIANGLES = 1_000_000  # drawn by the page: 9 MB of file; beyond, surfaces are simplified
MOST_OF_HORIZONS = 40_000
MOST_SQUEEZED = 8_000_000  # bytes; of more, the last 2 % of size would take three times as long
CAUTION = "structviz: a screening aid. It tests geometry against declared movement, not stress magnitude, stability or hazard."


class _Store:
    """Arrays one after another, with where each begins."""

    def __init__(self) -> None:
        self.index: dict[str, dict[str, Any]] = {}
        self._pieces: list[bytes] = []
        self._end = 0

    def add(self, name: str, array: NDArray) -> None:
        held = np.ascontiguousarray(array, array.dtype.newbyteorder("<"))
        data = held.tobytes() + bytes(-held.nbytes % 4)
        self.index[name] = {"type": array.dtype.name, "shape": list(array.shape), "offset": self._end}
        self._pieces.append(data)
        self._end += len(data)

    def deflated(self) -> bytes:
        return zlib.compress(b"".join(self._pieces), 6 if self._end < MOST_SQUEEZED else 4)


def page_data(analysis: Analysis, *, triangles: int | None = None) -> tuple[dict[str, Any], bytes]:
    """Return the description of the scene and its arrays, deflated; faults of more than `triangles` altogether are simplified."""
    scene, store = build_scene(analysis), _Store()
    drawn = drawn_surfaces([result.fault.surface for result in analysis.faults], triangles or MOST_TRIANGLES)
    boxes = _add_surfaces(store, "faults", drawn, scene.origin)
    fields = _add_fields(store, analysis, drawn)
    horizons = _add_horizons(store, analysis, scene.origin)
    tolerance = max((each.tolerance_m for each in drawn), default=0.0)
    data: dict[str, Any] = {
        "title": printable(analysis.model.title or "model", 200),
        "headline": words.headline(analysis),
        "caution": CAUTION,
        "origin": _numbers(scene.origin),
        "low": _numbers(scene.low),
        "high": _numbers(scene.high),
        "azimuth": scene.view_from_deg,
        "faults": [_fault(result, box, scene.origin) for result, box in zip(analysis.faults, boxes)],
        "fields": fields,
        "horizons": horizons,
        "glyphs": [_layer(layer, analysis) for layer in glyph_layers(analysis, scene)],
        "glyphParts": _glyph_parts(store),
        "striae": _striae(analysis, scene.origin),
        "meetings": _add_meetings(store, scene),
        "steps": STEPS,
        "tolerance": round(tolerance, 2),
        "triangles": [sum(len(r.fault.surface.triangles) for r in analysis.faults), sum(len(each.triangles) for each in drawn)],
        "colours": {word: look.colour for word, look in palette.VERDICTS.items()},
    }
    data["arrays"] = store.index
    return data, store.deflated()


def viewer_script() -> str | None:
    """Return the bundled 3D view, or None in an installation made without it."""
    file = files("structviz.report").joinpath("viewer", "dist", "viewer.js")
    return file.read_text(encoding="utf-8") if file.is_file() else None


def _add_surfaces(store: _Store, name: str, drawn: tuple[Drawn, ...], origin: NDArray) -> list[dict[str, Any]]:
    """Put surfaces into the store; return the box of each and how many vertices and triangles are its own."""
    boxes, places, corners = [], [], []
    for each in drawn:
        steps, low, step = quantised(each.vertices)
        places.append(_step_differences(steps))
        corners.append(_differences(each.triangles))
        boxes.append({"low": _numbers(low - origin), "step": step.tolist(), "vertices": len(steps), "triangles": len(each.triangles)})
    store.add(f"{name}.places", np.concatenate(places) if places else np.zeros(0, np.uint16))
    store.add(f"{name}.corners", np.concatenate(corners) if corners else np.zeros(0, np.int32))
    return boxes


def _add_meetings(store: _Store, scene: Scene) -> dict[str, Any] | None:
    """Put the lines where faults meet into the store, both ends of each piece; return their box, None where no faults meet."""
    if not len(scene.meetings):
        return None
    steps, low, step = quantised(scene.meetings.reshape(-1, 3))
    store.add("meetings", _step_differences(steps))
    return {"low": _numbers(low), "step": step.tolist(), "vertices": len(steps)}


def _step_differences(steps: NDArray[np.uint16]) -> NDArray[np.uint16]:
    """Return steps (V, 3) axis by axis as differences from the one before; they wrap round, and back when they are added up."""
    return np.diff(steps, axis=0, prepend=np.zeros((1, 3), np.uint16)).T.ravel()


def _differences(triangles: NDArray[np.int64]) -> NDArray[np.int32]:
    """Return corners as differences from the corner before, which deflate to a fraction of the numbers themselves."""
    return np.diff(triangles.ravel(), prepend=0).astype(np.int32)


def _add_fields(store: _Store, analysis: Analysis, drawn: tuple[Drawn, ...]) -> list[dict[str, Any]]:
    """Put the values of drawn triangles into the store; return those fields that have any."""
    kept = []
    for shown, codes in coded_fields(analysis, drawn):
        store.add(f"field.{shown.key}", codes)
        about = {"key": shown.key, "title": shown.title, "unit": shown.unit, "cyclic": shown.cyclic}
        kept.append(about | {"low": shown.low, "high": shown.high, "step": shown.step})
    return kept


def _fault(result: FaultResult, box: dict[str, Any], origin: NDArray) -> dict[str, Any]:
    """Return one fault: its words, its box, and an arrow of slip declared and predicted at its middle station."""
    places = result.stations.places
    predicted = result.verdict.predicted_rake_deg
    return {
        **box,
        "name": printable(result.fault.name, 500),
        "short": shortened(result.fault.name),
        "verdict": result.verdict.word,
        "strike": round(result.measured.strike_deg, 1),
        "size": round(float(np.sqrt(result.measured.area_m2)), 1),
        "place": _numbers(middle_station(result) - origin),
        "top": _numbers(_top(places) - origin),
        "normal": _numbers(result.measured.normal, 5),
        "declared": _slip(result, result.sector.rake_deg) if result.sector else None,
        "predicted": _slip(result, predicted) if predicted is not None else None,
        "says": {"declared": f"declared {words.declared(result)}", "predicted": f"predicted {words.predicted(result)}"},
    }


def _top(places: NDArray) -> NDArray:
    """Return the middle of the upper edge, (3,) m, of a fault with stations at places (S, 3)."""
    upper = places[places[:, 2] >= np.quantile(places[:, 2], 0.75)]
    return upper[((upper - upper.mean(0)) ** 2).sum(1).argmin()]


def _slip(result: FaultResult, rake_deg: float) -> list[float]:
    return _numbers(slip_vectors(result.measured.normal, rake_deg), 5)


def _add_horizons(store: _Store, analysis: Analysis, origin: NDArray) -> list[dict[str, Any]]:
    drawn = drawn_surfaces([horizon.surface for horizon in analysis.model.horizons], MOST_OF_HORIZONS)
    boxes = _add_surfaces(store, "horizons", drawn, origin)
    return [{**box, "name": printable(horizon.name, 200)} for horizon, box in zip(analysis.model.horizons, boxes)]


def _layer(layer: GlyphLayer, analysis: Analysis) -> dict[str, Any]:
    """Return a layer of glyphs; where there are several stresses, the large ones say which each is."""
    glyphs = [_glyph(glyph) for glyph in layer.glyphs]
    if layer.key == "whole" and len(glyphs) > 1:
        glyphs = [{**glyph, "label": shortened(printable(words.regime_name(analysis, k)), 18)} for k, glyph in enumerate(glyphs)]
    return {"key": layer.key, "title": layer.title, "shown": layer.shown, "glyphs": glyphs}


def _glyph(glyph: StressGlyph) -> dict[str, Any]:
    return {"place": _numbers(glyph.place), "axes": [_numbers(axis, 5) for axis in glyph.axes], "size": round(glyph.size_m, 1)}


def _glyph_parts(store: _Store) -> list[dict[str, str]]:
    """Put the shape of a glyph into the store; return the role of each of its parts."""
    parts = stress_glyph()
    for number, part in enumerate(parts):
        store.add(f"glyph.{number}.vertices", part.vertices.astype(np.float32))
        store.add(f"glyph.{number}.triangles", part.triangles.astype(np.uint16))
    return [{"role": part.role} for part in parts]


def _striae(analysis: Analysis, origin: NDArray) -> list[dict[str, Any]]:
    """Return each slip line that was measured, as a place and a direction."""
    from structviz.orientation.planes import normals

    rows = {result.fault.name: row for row, result in enumerate(analysis.faults)}
    return [
        {
            "fault": rows.get(stria.fault),
            "place": _numbers(np.asarray(stria.place) - origin),
            "along": _numbers(slip_vectors(normals(stria.strike_deg, stria.dip_deg), stria.rake_deg), 5),
        }
        for stria in analysis.model.striae
        if np.isfinite(stria.place).all()
    ]


def _numbers(values: NDArray, digits: int = 2) -> list[float]:
    return [round(float(value), digits) for value in values]
