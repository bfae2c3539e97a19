"""The model in 3D as data: surfaces by verdict, stress glyphs where the evidence lies, names, frame and legend.

Everything is relative to a float64 origin, so that it survives float32; the origin comes back in the frame's numbers.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.views.captions import count_line, model_line, regime_line, shortened
from structviz.views.registry import view

Floats = NDArray[np.float64]

MOST_GLYPHS = 9
MOST_NAMES = 24
ELEVATION_DEG = 38.0
VIEW_AZIMUTHS_DEG = (150.0, 165.0, 180.0, 195.0, 210.0)  # from the south, so that north is at the back


@dataclass(frozen=True, eq=False)
class SceneSurface:
    """One surface, relative to the origin of the scene."""

    name: str
    kind: str  # a verdict, or "horizon"
    vertices: Floats  # (V, 3) m from the origin
    triangles: NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class StressGlyph:
    """Three axes at a place."""

    place: Floats  # (3,) m from the origin
    axes: Floats  # (3, 3) rows sigma1, sigma2, sigma3
    size_m: float


@dataclass(frozen=True, eq=False)
class Label:
    """A name at a place."""

    text: str
    place: Floats  # (3,) m from the origin
    kind: str


@dataclass(frozen=True, eq=False)
class Scene:
    """The whole picture, without a camera library."""

    title: str
    subtitle: str
    origin: Floats  # (3,) easting, northing, up, m
    surfaces: tuple[SceneSurface, ...]
    glyphs: tuple[StressGlyph, ...]
    labels: tuple[Label, ...]  # most wanted first
    low: Floats  # (3,) corner of the frame, m from the origin
    high: Floats
    view_from_deg: float  # azimuth from which the scene is seen
    counts: tuple[tuple[str, int], ...]
    elevation_deg: float = ELEVATION_DEG  # of the eye over the horizon; 90 is a map
    meetings: Floats = field(default_factory=lambda: np.zeros((0, 2, 3)))  # (N, 2, 3) lines where faults meet, m from the origin


@view("scene", title="Faults by verdict, with the stress they speak for", file_name="scene.png", needs_gl=True, renderer="render_scene")
def build_scene(analysis: Analysis, *, azimuth_deg: float | None = None, elevation_deg: float = ELEVATION_DEG) -> Scene:
    """Return the scene of an analysis, seen from an azimuth; without one, from where the faults show most of their area."""
    everything = np.concatenate([result.fault.surface.vertices for result in analysis.faults])
    origin = np.round((everything.min(0) + everything.max(0)) / 2)
    low, high = everything.min(0) - origin, everything.max(0) - origin
    size = float(np.linalg.norm((high - low)[:2]))
    azimuth = best_azimuth_deg(analysis.faults) if azimuth_deg is None else azimuth_deg
    beside = _beside(azimuth, size, low, high)
    return Scene(
        title=regime_line(analysis),
        subtitle=model_line(analysis),
        origin=origin,
        surfaces=tuple(_surface(result, origin) for result in analysis.faults),
        glyphs=_glyphs(analysis, origin, beside, size),
        labels=_phase_labels(analysis, beside, size) + _labels(analysis.faults, origin),
        low=low,
        high=high,
        view_from_deg=azimuth,
        counts=count_line(analysis),
        elevation_deg=elevation_deg,
        meetings=np.concatenate([np.zeros((0, 2, 3)), *(meeting.segments - origin for meeting in analysis.meetings)]),
    )


def _surface(result: FaultResult, origin: Floats) -> SceneSurface:
    surface = result.fault.surface
    return SceneSurface(result.fault.name, result.verdict.word, surface.vertices - origin, surface.triangles)


def _glyphs(analysis: Analysis, origin: Floats, beside: tuple[Floats, Floats], size: float) -> tuple[StressGlyph, ...]:
    """Return a glyph for each regime, beside the model at the near left, and small ones where the heaviest pairs meet, well apart."""
    if not analysis.regimes:
        return ()
    glyphs = [StressGlyph(beside[0] + k * beside[1], regime.axes, 0.075 * size) for k, regime in enumerate(analysis.regimes)]
    large = len(glyphs)
    apart = 0.13 * size
    for axes, place in zip(analysis.pairs.axes, analysis.pairs.places - origin, strict=True):
        if len(glyphs) >= MOST_GLYPHS + large:
            break
        if all(np.linalg.norm(place - other.place) > apart for other in glyphs[large:]):
            glyphs.append(StressGlyph(place, axes, 0.033 * size))
    return tuple(glyphs)


def _beside(azimuth_deg: float, size: float, low: Floats, high: Floats) -> tuple[Floats, Floats]:
    """Return a place at the near left of the model as seen from an azimuth, (3,) m from the origin, and a step to its right."""
    a = np.radians(azimuth_deg)
    towards, right = np.array([np.sin(a), np.cos(a), 0.0]), np.array([-np.cos(a), np.sin(a), 0.0])
    corners = np.array([[x, y, 0.0] for x in (low[0], high[0]) for y in (low[1], high[1])])
    return (0.85 * (corners @ towards).max() + 0.14 * size) * towards + 0.74 * (corners @ right).min() * right, 0.2 * size * right


def _phase_labels(analysis: Analysis, beside: tuple[Floats, Floats], size: float) -> tuple[Label, ...]:
    """Return which phase each large glyph stands for, where there are several."""
    if len(analysis.regimes) < 2:
        return ()
    over = np.array([0.0, 0.0, 0.09 * size])
    return tuple(Label(f"({k + 1}) {r.name}, {r.kind}", beside[0] + k * beside[1] + over, "phase") for k, r in enumerate(analysis.regimes))


def _labels(results: Sequence[FaultResult], origin: Floats) -> tuple[Label, ...]:
    """Return the names of the faults at their highest stations: conflicting ones first, then the largest."""
    rank = {"conflicting": 0, "undetermined": 1, "consistent": 2}
    ordered = sorted(results, key=lambda r: (rank[r.verdict.word], -r.measured.area_m2, r.fault.name))
    return tuple(Label(shortened(r.fault.name), _top(r) - origin, r.verdict.word) for r in ordered[:MOST_NAMES])


def _top(result: FaultResult) -> Floats:
    """Return the middle of the upper edge of a fault, (3,) m."""
    places = result.stations.places
    upper = places[places[:, 2] >= np.quantile(places[:, 2], 0.75)]
    middle = upper.mean(0)
    return upper[((upper - middle) ** 2).sum(1).argmin()]


def best_azimuth_deg(results: Sequence[FaultResult]) -> float:
    """Return the azimuth, degrees, from which the faults show most of their area."""
    normals = np.array([r.measured.normal for r in results])
    areas = np.array([r.measured.area_m2 for r in results])
    shown = []
    for azimuth in VIEW_AZIMUTHS_DEG:
        a = np.radians(azimuth)
        shown.append(areas @ np.abs(normals @ [np.sin(a), np.cos(a), 0.6]))
    return VIEW_AZIMUTHS_DEG[int(np.argmax(np.round(shown, 3)))]
