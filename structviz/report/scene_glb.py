"""The scene as a GLB file for slides: faults by name in the colours of their verdicts, horizons, stress glyphs, lines of slip.

Places are relative to an origin that the file carries (`asset.extras.origin_m`), since single precision would step map coordinates.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.io.formats.gltf import ORIGIN
from structviz.io.gltf import Body, glb
from structviz.orientation.planes import slip_vectors
from structviz.report.names import printable
from structviz.views.glyphs import placed, stress_glyph
from structviz.views.palette import GLYPH, INK, SIGMA, VERDICTS
from structviz.views.scene import Scene, build_scene

Floats = NDArray[np.float64]
Colour = tuple[float, float, float, float]

HORIZON = "#c9cdd0"
HORIZON_OPACITY = 0.2  # faults are left opaque: what shows slides seldom sorts translucent surfaces behind each other
ARROW_LENGTH, ARROW_WIDTH, ARROW_HEAD = 0.35, 0.03, 0.3  # of the fault's size; the head of the arrow's length


def scene_glb(analysis: Analysis) -> bytes:
    """Return the scene of an analysis as a GLB file, metres, Y up; the same analysis gives the same bytes."""
    scene = build_scene(analysis)
    extras = {ORIGIN: scene.origin.tolist(), "crs": analysis.model.crs, "title": printable(scene.title, 200)}
    extras["caution"] = "screening aid: directions, not magnitudes"
    bodies = [*_faults(scene), *_horizons(analysis, scene), *_glyphs(scene)]
    for which, colour in (("declared slip", INK), ("predicted slip", SIGMA[2])):
        bodies += [arrow for result in analysis.faults if (arrow := _arrow(result, scene.origin, which, colour)) is not None]
    return glb(bodies, extras=extras)


def colour_of(text: str, opacity: float = 1.0) -> Colour:
    """Return a colour such as "#a33a1c" in the linear red, green, blue that glTF asks for, with an opacity.

    >>> [round(part, 3) for part in colour_of("#ff8000")]
    [1.0, 0.216, 0.0, 1.0]
    """
    parts = [int(text[at : at + 2], 16) / 255 for at in (1, 3, 5)]
    red, green, blue = (part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts)
    return (round(red, 6), round(green, 6), round(blue, 6), opacity)


def _faults(scene: Scene) -> list[Body]:
    bodies = []
    for surface in scene.surfaces:
        colour = colour_of(VERDICTS[surface.kind].colour)
        bodies.append(Body(printable(surface.name, 200), surface.vertices, surface.triangles, colour, f"faults, {surface.kind}"))
    return bodies


def _horizons(analysis: Analysis, scene: Scene) -> list[Body]:
    colour = colour_of(HORIZON, HORIZON_OPACITY)
    return [
        Body(printable(horizon.name, 200), horizon.surface.vertices - scene.origin, horizon.surface.triangles, colour, "horizons")
        for horizon in analysis.model.horizons
    ]


def _glyphs(scene: Scene) -> list[Body]:
    """Return the parts of every stress glyph: the lens is long along sigma3, the cones press along sigma1."""
    bodies = []
    for number, glyph in enumerate(scene.glyphs, 1):
        for part in stress_glyph():
            vertices = placed(part, glyph.axes, glyph.place, glyph.size_m)
            bodies.append(Body(f"stress {number}, {part.role}", vertices, part.triangles, colour_of(GLYPH[part.role]), "stress"))
    return bodies


def _arrow(result: FaultResult, origin: Floats, which: str, colour: str) -> Body | None:
    """Return a flat arrow of the hanging wall's slip at the middle of a fault, a little off its surface; None where there is none."""
    declared = result.sector.rake_deg if result.sector else None
    rake = declared if which == "declared slip" else result.verdict.predicted_rake_deg
    if rake is None:
        return None
    normal, size = result.measured.normal, float(np.sqrt(result.measured.area_m2))
    places = result.stations.places
    middle = places[((places - places.mean(0)) ** 2).sum(1).argmin()] - origin + (0.02 + 0.01 * (which == "predicted slip")) * size * normal
    along = slip_vectors(normal, rake)
    across, length, width = np.cross(along, normal), ARROW_LENGTH * size, ARROW_WIDTH * size
    neck = (1 - ARROW_HEAD) * length
    outline = [(0, -1), (neck, -1), (neck, -2.5), (length, 0), (neck, 2.5), (neck, 1), (0, 1)]
    vertices = middle + np.array([ahead * along + side * width * across for ahead, side in outline])
    triangles = np.array([[0, 1, 5], [0, 5, 6], [2, 3, 4]])
    return Body(f"{printable(result.fault.name, 200)}, {which}", vertices, triangles, colour_of(colour), which)
