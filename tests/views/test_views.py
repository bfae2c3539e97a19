"""What the pictures say: descriptions checked as data, glyphs as shapes, missing OpenGL as words."""

import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest

from structviz.orientation.projection import equal_area
from structviz.views import gl as gl_module
from structviz.views import render, views
from structviz.views.captions import regime_line, shortened
from structviz.views.glyphs import placed, stress_glyph
from structviz.views.palette import SIGMA, VERDICTS
from structviz.views.scene import MOST_NAMES, build_scene
from structviz.views.stereonet import build_net


def lightness(colour):
    """CIE L* of a hex colour (IEC 61966-2-1 and CIE 15 formulas)."""
    c = np.array([int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)])
    linear = np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)
    y = linear @ [0.2126, 0.7152, 0.0722]
    return 116 * np.cbrt(y) - 16


def test_verdicts_and_axes_stay_apart_in_grey():
    for colours in ([look.colour for look in VERDICTS.values()], SIGMA):
        steps = np.diff(np.sort([lightness(colour) for colour in colours]))
        assert steps.min() > 12


def test_verdicts_differ_in_line_as_well_as_in_colour():
    assert len({(look.width, look.dash) for look in VERDICTS.values()}) == len(VERDICTS)


def test_the_net_shows_every_plane_and_the_axes_where_they_are(analysis):
    net = build_net(analysis)
    assert len(net.planes) == sum(r.measured.meaningful for r in analysis.faults)
    for axis, row in zip(net.axes, analysis.regimes[0].axes, strict=True):
        assert np.allclose(axis.point, equal_area(row))
    for plane in net.planes:
        assert np.linalg.norm(plane.circle, axis=-1).max() <= 1 + 1e-9


def test_declared_slip_is_shown_where_it_conflicts(analysis):
    declared = [slip for slip in build_net(analysis).slips if slip.declared]
    assert {slip.name for slip in declared} == {r.fault.name for r in analysis.conflicting}
    assert analysis.conflicting


def test_conflicting_faults_are_named_first(analysis):
    labels = build_scene(analysis).labels
    wanted = len(analysis.conflicting)
    assert all(label.kind == "conflicting" for label in labels[:wanted])
    assert len(labels) <= MOST_NAMES


def test_the_scene_is_small_numbers_about_a_round_origin(analysis):
    scene = build_scene(analysis)
    assert np.abs(np.concatenate([s.vertices for s in scene.surfaces])).max() < 50_000
    back = scene.surfaces[0].vertices + scene.origin
    assert np.allclose(back, analysis.faults[0].fault.surface.vertices, atol=1e-9)


def test_glyph_is_flat_along_sigma1_and_long_along_sigma3():
    lens, *thumbs = stress_glyph()
    extent = np.ptp(lens.vertices, axis=0)
    assert extent[0] < extent[1] < extent[2]
    for thumb in thumbs:
        assert np.abs(thumb.vertices[:, 0]).min() >= extent[0] / 2  # they press from outside
    axes = np.array([[0.0, 0, 1], [0, 1, 0], [-1, 0, 0]])
    turned = placed(lens, axes, np.array([10.0, 0, 0]), 2.0)
    assert np.ptp(turned, axis=0) == pytest.approx([2 * extent[2], 2 * extent[1], 2 * extent[0]])


@pytest.mark.parametrize("part", stress_glyph(), ids=lambda part: part.role)
def test_glyph_parts_are_closed_and_face_outwards(part):
    corners = part.vertices[part.triangles]
    volume = np.einsum("tk,tk->", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])) / 6
    sides = np.sort(part.triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    _, uses = np.unique(sides[sides[:, 0] != sides[:, 1]], axis=0, return_counts=True)
    assert abs(volume) > 0
    assert (uses == 2).mean() > 0.9  # the poles of the lens repeat their point


def test_captions_say_what_is_known(analysis):
    regime = replace(analysis.regimes[0], kind="strike-slip", shmax_deg=179.7, shmax_half_width_deg=6.4)
    assert regime_line(replace(analysis, regimes=(regime,))) == "Strike-slip faulting, SHmax 000 \u00b1 6\u00b0"
    assert regime_line(replace(analysis, regimes=())) == "No stress regime could be inferred"
    assert "\x1b" not in shortened("a\x1b[31mred")


def test_without_opengl_the_net_is_drawn_and_the_reason_told(analysis, tmp_path, monkeypatch):
    monkeypatch.setattr(gl_module, "working_window", lambda: None)
    written, skipped = render(analysis, tmp_path)
    assert written == ("net.png",)
    assert len(skipped) == 1
    assert "libegl1 libgl1-mesa-dri" in skipped[0]
    assert "scene.png was skipped" in skipped[0]


def test_the_probe_takes_a_crash_for_a_no(monkeypatch):
    monkeypatch.setattr(gl_module, "PROBE", "import os; os.kill(os.getpid(), 11)")
    assert gl_module._asked_window.__wrapped__() is None


def test_importing_views_loads_no_graphics():
    code = "import sys, structviz.views as v; v.views(); print(sorted({'pyvista', 'vtk', 'vtkmodules', 'matplotlib'} & set(sys.modules)))"
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip() == "[]"


def test_views_are_in_order_of_their_keys():
    assert list(views()) == sorted(views())
