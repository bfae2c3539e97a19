"""The stress glyphs of the page and the window in layers: of the whole model, at pairs, at faults, of parts, and as a smoothed field."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.stress.by_place import ByPlace
from structviz.stress.field import StressField, stress_field
from structviz.views.scene import Scene, StressGlyph

Floats = NDArray[np.float64]

MOST_STATIONS = 80  # faults that carry a glyph of their own
FIELD_CELLS = 9  # along the longer side of the faults
PART_SIZE, STATION_SIZE = 0.05, 0.02  # of the width of the model


@dataclass(frozen=True, eq=False)
class GlyphLayer:
    """Glyphs that are shown and hidden together."""

    key: str  # "whole" | "pairs" | "stations" | "domains" | "field"
    title: str
    glyphs: tuple[StressGlyph, ...]
    shown: bool  # at first


def glyph_layers(analysis: Analysis, scene: Scene) -> tuple[GlyphLayer, ...]:
    """Return the layers of an analysis that have any glyph, places relative to the origin of its scene."""
    if not analysis.regimes:
        return ()
    whole, pairs = scene.glyphs[: len(analysis.regimes)], scene.glyphs[len(analysis.regimes) :]
    size = float(np.linalg.norm((scene.high - scene.low)[:2]))
    turns = analysis.by_place is not None and analysis.by_place.turn is not None
    layers = (
        GlyphLayer("whole", "of the whole model" if len(whole) == 1 else "of each stress", whole, True),
        GlyphLayer("pairs", "at pairs", pairs, not turns),
        GlyphLayer("stations", "at faults", _at_stations(analysis, scene.origin, size), False),
        GlyphLayer("domains", "of parts", _of_parts(analysis, scene.origin, size), True),
        GlyphLayer("field", "smoothed field", _of_field(analysis, scene.origin), turns),
    )
    return tuple(layer for layer in layers if layer.glyphs)


def _at_stations(analysis: Analysis, origin: Floats, size: float) -> tuple[StressGlyph, ...]:
    """Return the stress by which each of the largest faults is judged, at its middle station; the field's where the stress turns."""
    order = np.argsort([-result.measured.area_m2 for result in analysis.faults], kind="stable")[:MOST_STATIONS]
    chosen = [analysis.faults[k] for k in order]
    places = np.stack([middle_station(result) for result in chosen])
    axes = np.stack([analysis.regimes[result.phase].axes for result in chosen])
    if analysis.by_place is not None and analysis.by_place.turn is not None:
        local = stress_field(analysis.by_place.data, places, analysis.by_place.bandwidth.radius_m)
        axes[local.supported] = local.axes[local.supported]
    return tuple(StressGlyph(place - origin, frame, STATION_SIZE * size) for place, frame in zip(places, axes, strict=True))


def middle_station(result: FaultResult) -> Floats:
    """Return the station of a fault nearest to the middle of them all, (3,) m."""
    places = result.stations.places
    return places[((places - places.mean(0)) ** 2).sum(1).argmin()]


def _of_parts(analysis: Analysis, origin: Floats, size: float) -> tuple[StressGlyph, ...]:
    """Return the stress of each part of the model that has one of its own, over the middle of its faults."""
    domains = analysis.by_place.domains if analysis.by_place else None
    if domains is None or domains.count < 2:
        return ()
    return tuple(StressGlyph(place - origin, axes, PART_SIZE * size) for place, axes in zip(domains.middles, domains.frames, strict=True))


def _of_field(analysis: Analysis, origin: Floats) -> tuple[StressGlyph, ...]:
    """Return the smoothed field on a level grid at the middle depth of the faults, where enough of them are near."""
    if analysis.by_place is None:
        return ()
    field, step = level_field(analysis.by_place)
    rows = np.flatnonzero(field.supported)
    return tuple(StressGlyph(field.points[k] - origin, field.axes[k], 0.26 * step) for k in rows)


def level_field(place: ByPlace, cells: int = FIELD_CELLS) -> tuple[StressField, float]:
    """Return the field on a level grid about the faults, and the spacing of its points, m.

    Where one stress serves the whole model it is made with the longest bandwidth that was tried, so that it ends where the faults do.
    """
    low, high = place.data.places.min(0), place.data.places.max(0)
    step = max(float((high - low)[:2].max()), 1.0) / cells
    counts = np.ceil((high - low)[:2] / step - 1e-9).astype(int) + 1
    first = (low + high)[:2] / 2 - step * (counts - 1) / 2
    east, north = (first[k] + step * np.arange(counts[k]) for k in range(2))
    y, x = np.meshgrid(north, east, indexing="ij")
    points = np.stack([x, y, np.full_like(x, place.data.places[:, 2].mean())], -1).reshape(-1, 3)
    chosen = place.bandwidth
    radius = chosen.radius_m if np.isfinite(chosen.radius_m) else float(chosen.candidates_m[-2])
    return stress_field(place.data, points, radius), step
