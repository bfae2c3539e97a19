"""Actors of the scene: each stands for what it says, a triangle leads back to its surface, and the camera keeps everything in view."""

from dataclasses import replace
from itertools import product

import numpy as np
import pytest

from structviz.views.scene import build_scene


@pytest.fixture
def plotter(gl):
    from structviz.views.gl import require_gl

    require_gl()
    import pyvista as pv

    made = pv.Plotter(off_screen=True, window_size=[200, 140])
    yield made
    made.close()


def test_actors_hold_every_triangle_and_lead_back_to_its_surface(analysis, plotter):
    from structviz.views.render_actors import ROW, add_actors

    scene = build_scene(analysis)
    actors = add_actors(plotter, scene)
    assert list(actors) == ["consistent", "undetermined", "conflicting", "glyphs", "meetings", "frame"]
    for word in ("consistent", "undetermined", "conflicting"):
        wanted = {row: len(s.triangles) for row, s in enumerate(scene.surfaces) if s.kind == word}
        rows = actors[word][0].mapper.dataset.cell_data[ROW] if actors[word] else []
        assert {int(row): int((rows == row).sum()) for row in np.unique(rows)} == wanted
    assert len(actors["glyphs"]) == 2
    assert len(actors["frame"]) == 8


@pytest.mark.parametrize("azimuth, elevation", [(0, 20), (90, 38), (210, 38), (180, 90)])
def test_the_whole_scene_is_in_view_from_anywhere(analysis, plotter, azimuth, elevation):
    from structviz.views.render_actors import aim

    scene = replace(build_scene(analysis), view_from_deg=azimuth, elevation_deg=elevation)
    aim(plotter, scene, 200 / 140)
    matrix = plotter.camera.GetCompositeProjectionTransformMatrix(200 / 140, -1, 1)
    m = np.array([[matrix.GetElement(i, j) for j in range(4)] for i in range(4)])
    corners = np.array(list(product(*zip(scene.low, scene.high, strict=True))))
    seen = np.concatenate([corners, np.ones((8, 1))], 1) @ m.T
    assert np.abs(seen[:, :2]).max() < 1
    if elevation == 90:
        north = (np.array([[0, 1000.0, 0, 0]]) @ m.T)[0]
        assert north[1] > 0
        assert north[0] == pytest.approx(0, abs=1e-9)
