"""Figures for print: true sizes, letters large enough and on the page, the Greek ones embedded, verdicts apart in grey, the same bytes."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.font_manager import findfont, get_font
from matplotlib.text import Text
from PIL import Image

from structviz.analysis import Settings, run
from structviz.errors import ArgumentError, RenderingUnavailable
from structviz.synthetic import random_model
from structviz.views import figures as table
from structviz.views import gl as gl_module
from structviz.views import render_pixels, render_plots
from structviz.views.figures import FIGURES, FORMATS, PLOTS, FigureOf, PrintChoice, chosen, draw_figure, figures_of
from structviz.views.palette import VERDICTS
from structviz.views.scene import build_scene
from structviz.views.viewpoints import VIEWPOINTS
from tests.views.test_views import lightness

MM = 25.4
KEYS = pytest.mark.parametrize("key", ["scene", *PLOTS])
WIDTHS = pytest.mark.parametrize("width", [60.0, 85.0, 170.0, 420.0])
HOSTILE = ("$\\frac{a}$ $x", "a_b^c", "\u202eright to left", "x" * 300, "\x1b[31mred", "<&>\"'", "\u65ad\u5c64")


@pytest.fixture(scope="module")
def trouble():
    """A model whose names are hostile and whose verdicts are of all three kinds."""
    model = random_model("normal", faults=12, conjugate=9, planted=2, triangles=60, random_state=5).model
    faults = tuple(replace(fault, name=name) for fault, name in zip(model.faults, [*HOSTILE, *(f"F{k}" for k in range(5))]))
    found = run(replace(model, faults=faults, title="$\\frac$ & <title>"), Settings(replicates=100))
    words = ["undetermined", "conflicting", "consistent"] * 4
    return replace(found, faults=tuple(replace(r, verdict=replace(r.verdict, word=w)) for r, w in zip(found.faults, words)))


def figure_of(analysis, key, viewpoints=("best",)):
    (found,) = figures_of(analysis, PrintChoice(only=(key,), viewpoints=viewpoints))
    assert isinstance(found, FigureOf)
    return found


def painted(analysis, key, width, dpi=72, viewpoint="best"):
    from importlib import import_module

    figure = figure_of(analysis, key, (viewpoint,))
    if figure.needs_gl:
        gl_module.require_gl()
    module, function = figure.paint
    return getattr(import_module(f"structviz.views.{module}"), function)(figure.description, width, dpi)


def test_the_table_is_whole():
    assert set(FIGURES) == {"scene", *PLOTS}
    assert all(callable(getattr(render_plots, key)) for key in PLOTS)


@KEYS
def test_sizes_are_true_in_every_format(key, trouble, tmp_path, gl):
    choice = PrintChoice(formats=FORMATS, width_mm=85, dpi=150)
    drawn = draw_figure(figure_of(trouble, key), choice, tmp_path)
    stem = tmp_path / drawn.name
    with Image.open(stem.with_suffix(".png")) as picture:
        assert picture.size == pytest.approx((85 / MM * 150, drawn.height_mm / MM * 150), abs=0.51)
        assert picture.info["dpi"] == pytest.approx((150, 150), abs=0.02)  # kept as whole dots a metre
    box = re.search(rb"/MediaBox \[ ?0 0 ([\d.]+) ([\d.]+) ?\]", stem.with_suffix(".pdf").read_bytes())
    assert [float(v) / 72 * MM for v in box.groups()] == pytest.approx([85, drawn.height_mm], abs=0.06)
    root = ET.fromstring(stem.with_suffix(".svg").read_text("utf-8"))
    assert float(root.get("width").removesuffix("pt")) / 72 * MM == pytest.approx(85, abs=0.01)
    assert float(root.get("height").removesuffix("pt")) / 72 * MM == pytest.approx(drawn.height_mm, abs=0.06)


@KEYS
def test_letters_are_embedded_or_outlines_and_nothing_is_fetched(key, trouble, tmp_path, gl):
    draw_figure(figure_of(trouble, key), PrintChoice(formats=("svg", "pdf"), width_mm=85, dpi=100), tmp_path)
    (pdf,), (svg,) = tmp_path.glob("*.pdf"), tmp_path.glob("*.svg")
    assert b"DejaVuSans" in pdf.read_bytes()
    assert b"/FontFile2" in pdf.read_bytes()
    root = ET.fromstring(svg.read_text("utf-8"))
    assert not root.findall(".//{http://www.w3.org/2000/svg}text")
    links = re.findall(r'href="([^"]*)"', svg.read_text("utf-8"))
    assert all(link.startswith(("#", "data:image/png;base64,")) for link in links)
    assert b"\x00" not in svg.read_bytes()


def test_sigma_and_degree_are_letters_of_the_font_in_svg(trouble, tmp_path):
    draw_figure(figure_of(trouble, "net"), PrintChoice(formats=("svg",), width_mm=85), tmp_path)
    text = (tmp_path / "net.svg").read_text("utf-8")
    glyphs = set(re.findall(r'id="DejaVuSans-([0-9a-f]+)"', text))
    assert {f"{get_font(findfont('DejaVu Sans')).get_char_index(ord(letter)):x}" for letter in "\u03c3\u00b0\u00b1"} <= glyphs


@pytest.mark.filterwarnings("ignore:Glyph .* missing")
@WIDTHS
@KEYS
def test_words_are_readable_and_on_the_page(key, width, trouble, gl):
    figure = painted(trouble, key, width)
    figure.set_dpi(300)  # at fewer dots hinting makes letters wider than they are printed
    figure.canvas.draw()
    page = figure.bbox
    told = [text for text in figure.findobj(Text) if text.get_text() and text.get_visible() and text.axes.axison is False]
    assert len(told) >= 3
    for text in told:
        assert text.get_fontsize() >= 6
        box = text.get_window_extent()
        outside = max(page.x0 - box.x0, page.y0 - box.y0, box.x1 - page.x1, box.y1 - page.y1)
        assert outside <= 1.0, f"{text.get_text()!r} leaves the page by {outside:.1f} pixels"


@KEYS
def test_the_same_analysis_gives_the_same_bytes(key, trouble, tmp_path, gl):
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        draw_figure(figure_of(trouble, key), PrintChoice(formats=FORMATS, width_mm=60, dpi=100), tmp_path / name)
    for file in (tmp_path / "a").iterdir():
        assert file.read_bytes() == (tmp_path / "b" / file.name).read_bytes(), file.name


def test_verdicts_look_different_without_colour():
    from structviz.views.render_sheet import MARK_PT, MARKS, patch_style

    assert len(set(MARKS.values())) == len(VERDICTS)
    assert MARK_PT["conflicting"] > MARK_PT["undetermined"] > MARK_PT["consistent"]
    edges = {(patch_style(word)["edgecolor"], str(patch_style(word)["linestyle"])) for word in VERDICTS}
    assert len(edges) == len(VERDICTS)
    shades = sorted(lightness(patch_style(word)["facecolor"]) for word in VERDICTS)
    assert min(np.diff(shades)) > 12


def test_verdicts_stay_apart_in_a_grey_print_of_the_scene(trouble, gl):
    """Three squares side by side, alike but for their verdict: the median grey of each, and how dark its rim is."""
    from structviz.views.render_scene_print import photograph
    from structviz.views.scene import SceneSurface

    gl_module.require_gl()
    square = np.array([[0.0, 0, 0], [100, 0, 0], [100, 0, 100], [0, 0, 100]])
    words = ("conflicting", "consistent", "undetermined")
    surfaces = tuple(SceneSurface(w, w, square + [150.0 * k, 0, 0], np.array([[0, 1, 2], [0, 2, 3]])) for k, w in enumerate(words))
    low, high = np.array([-40.0, -10, -20]), np.array([440.0, 10, 120])
    scene = replace(
        build_scene(trouble), surfaces=surfaces, glyphs=(), labels=(), low=low, high=high, view_from_deg=180.0, elevation_deg=0.0
    )
    pixels, project = photograph(scene, (800, 300), 200, (0.9, 0.9))
    grey = np.asarray(Image.fromarray(pixels).convert("L"), float)
    shades, rims = [], []
    for surface in surfaces:
        (left, bottom), (right, top) = project(surface.vertices[[0, 2]])
        rows, columns = slice(int(300 - top), int(300 - bottom)), slice(int(left), int(right))
        inside = grey[rows, columns][15:-15, 15:-15]
        shades.append(np.median(inside))
        around = np.concatenate(
            [grey[rows.start - 3 : rows.start + 4, columns].min(0), grey[rows, columns.start - 3 : columns.start + 4].min(1)]
        )
        rims.append((around < 120).mean())
    assert shades[0] < min(shades[1:]) - 50  # conflicting is by far the darkest
    assert rims[0] > 0.9  # all round
    assert rims[1] < 0.05  # none
    assert 0.3 < rims[2] < 0.7  # in dashes


def test_a_picture_in_tiles_is_the_picture(trouble, gl, monkeypatch):
    from structviz.views.render_scene_print import photograph

    gl_module.require_gl()
    scene = build_scene(trouble)
    whole, at = photograph(scene, (401, 301), 100, (0.8, 0.8))
    monkeypatch.setattr(render_pixels, "TILE", 150)
    tiled, at_too = photograph(scene, (401, 301), 100, (0.8, 0.8))
    assert np.allclose(at(scene.low[None]), at_too(scene.low[None]))
    assert whole.shape == tiled.shape == (301, 401, 3)
    assert np.abs(whole.astype(float) - tiled).mean() < 1.5


@pytest.mark.parametrize("viewpoint", VIEWPOINTS)
def test_every_viewpoint_is_drawn(viewpoint, trouble, gl):
    figure = painted(trouble, "scene", 85.0, viewpoint=viewpoint)
    assert {"N", "F4"} & {text.get_text() for text in figure.findobj(Text)}


@KEYS
def test_captions_say_what_whose_and_how_far_to_trust_it(key, trouble, analysis):
    caption = figure_of(analysis, key).caption
    assert "Model: " in caption
    assert "SHmax" in caption
    assert "screening aid" in caption
    assert all(letter.isprintable() for letter in figure_of(trouble, key).caption)
    if key != "plunges":
        assert all(result.fault.name in caption for result in analysis.conflicting)


def test_what_has_nothing_to_show_says_so():
    lone = run(random_model("normal", faults=1, conjugate=1, planted=0, random_state=1).model, Settings(replicates=50))
    told = dict(each for each in figures_of(lone, PrintChoice(only=("mohr", "plunges", "misfits"))))
    assert set(told) == {"mohr", "plunges", "misfits"}
    assert told["mohr"] == "no stress could be inferred"


@pytest.mark.parametrize(
    "given, match",
    [
        ({"formats": ("tiff",)}, "formats: found 'tiff'; wanted some of png, svg, pdf"),
        ({"only": ("nets", "mohr")}, "only: found 'nets'; wanted some of scene, net, mohr, plunges, rose, misfits"),
        ({"viewpoints": ()}, "viewpoints: found none; wanted some of best, map, strike"),
        ({"width_mm": 59}, "width_mm: found 59; wanted 60 to 420 mm"),
        ({"width_mm": float("nan")}, "width_mm: found nan"),
        ({"dpi": 30}, "dpi: found 30; wanted 72 to 1200"),
        ({"width_mm": 420, "dpi": 600}, "9,921 pixels; wanted at most 6,000"),
    ],
)
def test_choices_that_cannot_be_are_refused(given, match):
    with pytest.raises(ArgumentError, match=re.escape(match)):
        PrintChoice(**given)


def test_words_of_a_list_are_taken_once():
    assert chosen(" PDF,svg,,pdf ", ()) == ("pdf", "svg")
    assert chosen(None, ("a",)) == ("a",)
    assert chosen(" , ", ("a",)) == ()


def test_without_opengl_a_scene_is_refused(trouble, tmp_path, monkeypatch):
    monkeypatch.setattr(gl_module, "working_window", lambda: None)
    with pytest.raises(RenderingUnavailable):
        draw_figure(figure_of(trouble, "scene"), PrintChoice(), tmp_path)
    assert table.draw_figure(figure_of(trouble, "net"), PrintChoice(formats=("pdf",)), tmp_path).files == ("net.pdf",)
