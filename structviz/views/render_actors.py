"""The actors of a scene in any PyVista plotter, and the camera that looks at it: what picture, figure and window share."""

from __future__ import annotations

from itertools import product
from typing import Any

import numpy as np
import pyvista as pv
from numpy.typing import NDArray

from structviz.views.captions import WORDS
from structviz.views.glyphs import placed, stress_glyph
from structviz.views.palette import FAINT, GLYPH, INK, PAPER, VERDICTS
from structviz.views.scene import Scene

Floats = NDArray[np.float64]

CONTEXT_OPACITY = 0.55  # faults that nobody doubts step back, so that the others and the glyphs are seen
DASH, DASH_STEPS = 0.008, 4  # length in diagonals of the frame, and into how many straight pieces it is cut
ROW = "fault"  # cell array of a surface actor's mesh: which of scene.surfaces a triangle belongs to
FILL_ACROSS, FILL_UP, LIFT = 0.84, 0.78, 0.09  # shares of the picture that the scene takes, and how far it is moved from the middle


def add_actors(plotter: Any, scene: Scene, *, widths: float = 1.0, dashed: bool = False) -> dict[str, list[Any]]:
    """Add everything of a scene that is not words to a plotter; return its actors by what they show.

    Keys are the verdicts ("conflicting", "undetermined", "consistent"), "glyphs", "meetings" and "frame"; a key without actors has
    an empty list. Line widths, in pixels, are multiplied by `widths`. With `dashed` the undetermined have a dark dashed rim, so that
    they stay apart without colour. The mesh of a verdict has the cell array `ROW`, so that a picked
    triangle leads to its surface: `actor.mapper.dataset.cell_data[ROW]`; rims have none.
    """
    plotter.set_background(PAPER)
    actors: dict[str, list[Any]] = {word: _surfaces(plotter, scene, word, widths, dashed) for word in reversed(WORDS)}
    actors["glyphs"] = glyph_actors(plotter, scene)
    actors["meetings"] = _meetings(plotter, scene, widths)
    actors["frame"] = [plotter.add_mesh(pv.Line(*line), color=FAINT, line_width=1.5 * widths) for line in frame_lines(scene)]
    return actors


def _surfaces(plotter: Any, scene: Scene, word: str, widths: float, dashed: bool) -> list[Any]:
    """Add the surfaces of one verdict, with their rims, as two actors: two hundred are slow to draw."""
    rows = [row for row, surface in enumerate(scene.surfaces) if surface.kind == word]
    mesh = merged([(scene.surfaces[row].vertices, scene.surfaces[row].triangles) for row in rows])
    if mesh is None:
        return []
    rims = mesh.extract_feature_edges(boundary_edges=True, feature_edges=False, manifold_edges=False, non_manifold_edges=False)
    mesh.cell_data[ROW] = np.repeat(rows, [len(scene.surfaces[row].triangles) for row in rows]).astype(np.int32)
    look, wide = VERDICTS[word], 3.5 if word == "conflicting" else 1.5
    opacity = CONTEXT_OPACITY if word == "consistent" else 0.95
    actors = [plotter.add_mesh(mesh, color=look.colour, opacity=opacity, smooth_shading=False, specular=0.0, ambient=0.35, diffuse=0.7)]
    if rims.n_cells:
        dark = word == "conflicting"
        if dashed and word == "undetermined":
            rims, dark, wide = _dashes(rims, DASH * float(np.linalg.norm(scene.high - scene.low))), True, 2.5
        actors.append(plotter.add_mesh(rims, color=INK if dark else look.colour, line_width=wide * widths))
    return actors


def _dashes(lines: Any, length_m: float) -> Any:
    """Return lines cut into dashes and gaps of one length: OpenGL has none of its own."""
    joined, pieces = lines.strip(join=True), []
    points, cells = np.asarray(joined.points, float), np.asarray(joined.lines)
    at = 0
    while at < len(cells):  # one turn for every rim, not for every triangle
        rim = points[cells[at + 1 : at + 1 + cells[at]]]
        at += 1 + cells[at]
        along = np.concatenate([[0.0], np.cumsum(np.linalg.norm(np.diff(rim, axis=0), axis=1))])
        steps = np.arange(0.0, along[-1], length_m / DASH_STEPS)
        ends = np.stack([steps, np.minimum(steps + length_m / DASH_STEPS, along[-1])], 1)[(steps // length_m) % 2 == 0]
        pieces.append(np.stack([np.interp(ends, along, rim[:, k]) for k in range(3)], -1).reshape(-1, 3))
    ends = np.concatenate(pieces)
    segments = np.insert(np.arange(len(ends)).reshape(-1, 2), 0, 2, axis=1)
    return pv.PolyData(ends.astype(np.float32), lines=segments.ravel())


def glyph_actors(plotter: Any, scene: Scene) -> list[Any]:
    """Add the stress glyphs of a scene to a plotter; return their actors."""
    actors, parts = [], stress_glyph()
    for role, colour in GLYPH.items():
        mesh = merged([(placed(p, g.axes, g.place, g.size_m), p.triangles) for g in scene.glyphs for p in parts if p.role == role])
        if mesh is not None:
            actors.append(plotter.add_mesh(mesh, color=colour, smooth_shading=True, split_sharp_edges=True, specular=0.1, ambient=0.3))
    return actors


def _meetings(plotter: Any, scene: Scene, widths: float) -> list[Any]:
    """Add the lines where faults meet as one actor."""
    count = len(scene.meetings)
    if not count:
        return []
    lines = pv.PolyData(scene.meetings.reshape(-1, 3).astype(np.float32))
    lines.lines = np.column_stack([np.full(count, 2), np.arange(2 * count).reshape(-1, 2)]).ravel()
    lines.verts = np.zeros(0, np.int64)
    return [plotter.add_mesh(lines, color=INK, line_width=2.0 * widths, lighting=False)]


def merged(pieces: list[tuple[Floats, NDArray[np.int64]]]) -> Any:
    """Return many triangle meshes, (V, 3) m and (T, 3), as one, or None where there is none."""
    if not pieces:
        return None
    starts = np.cumsum([0] + [len(vertices) for vertices, _ in pieces[:-1]])
    vertices = np.concatenate([vertices for vertices, _ in pieces]).astype(np.float32)
    triangles = np.concatenate([triangles + start for (_, triangles), start in zip(pieces, starts, strict=True)])
    faces = np.concatenate([np.full((len(triangles), 1), 3), triangles], 1)
    return pv.PolyData(vertices, faces.ravel())


def frame_lines(scene: Scene) -> list[tuple[Floats, Floats]]:
    """Return the edges of the floor of the frame and its four posts, as pairs of corners, (3,) m from the origin."""
    (w, s, b), (e, n, t) = scene.low, scene.high
    floor = [np.array(corner) for corner in ((w, s, b), (e, s, b), (e, n, b), (w, n, b))]
    posts = [(corner, np.array([corner[0], corner[1], t])) for corner in floor]
    return [(floor[k], floor[(k + 1) % 4]) for k in range(4)] + posts


def aim(plotter: Any, scene: Scene, aspect: float, *, fill: tuple[float, float] = (FILL_ACROSS, FILL_UP), lift: float = LIFT) -> None:
    """Look at the middle of a scene from its azimuth and elevation, in parallel projection so that lengths compare.

    `aspect` is the width of the picture over its height, `fill` the shares of both that the scene takes at most, `lift` how far
    its middle stands above that of the picture, in half heights.
    """
    centre, (towards, right, below) = (scene.low + scene.high) / 2, _eye(scene)
    size = float(np.linalg.norm(scene.high - scene.low))
    camera = plotter.camera
    upright = (0.0, 0.0, 1.0) if scene.elevation_deg < 89.0 else tuple(-below)
    camera.focal_point, camera.position, camera.up = centre, centre + 3 * size * towards, upright
    camera.enable_parallel_projection()
    across, high = _spans(scene)
    camera.parallel_scale = max(np.ptp(high) / fill[1], np.ptp(across) / fill[0] / aspect) / 2
    shift = below * ((high.max() + high.min()) / 2 + lift * camera.parallel_scale) + right * (across.max() + across.min()) / 2
    camera.focal_point, camera.position = centre + shift, centre + shift + 3 * size * towards
    plotter.reset_camera_clipping_range()


def seen_size(scene: Scene) -> tuple[float, float]:
    """Return how wide and how high a scene is as seen from its viewpoint, m."""
    across, high = _spans(scene)
    return float(np.ptp(across)), float(np.ptp(high))


def _eye(scene: Scene) -> tuple[Floats, Floats, Floats]:
    """Return the unit vectors towards the eye, to its right, and downwards in the picture."""
    a, up = np.radians(scene.view_from_deg), np.radians(scene.elevation_deg)
    towards = np.array([np.cos(up) * np.sin(a), np.cos(up) * np.cos(a), np.sin(up)])
    right = np.array([-np.cos(a), np.sin(a), 0.0])
    return towards, right, np.cross(towards, -right)


def _spans(scene: Scene) -> tuple[Floats, Floats]:
    """Return where the corners of the frame and the ends of the glyphs are seen, to the right and downwards of the middle, m."""
    _, right, below = _eye(scene)
    corners = np.array(list(product(*zip(scene.low, scene.high, strict=True))))
    ends = [g.place + g.size_m * np.concatenate([g.axes, -g.axes]) for g in scene.glyphs]
    seen = np.concatenate([corners, *ends]) - (scene.low + scene.high) / 2
    return seen @ right, seen @ below
