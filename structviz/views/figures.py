"""The table of figures for print: what each shows of an analysis, in words, and what draws it on paper of a given width.

`check` draws none of them; they are for the report that is written about a result.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from importlib import import_module
from pathlib import Path
from typing import Any

import numpy as np

from structviz.analysis import Analysis
from structviz.errors import ArgumentError
from structviz.views import figure_captions as captions
from structviz.views.gl import require_gl
from structviz.views.misfits import build_misfits
from structviz.views.mohr import build_mohr
from structviz.views.plunges import build_plunges
from structviz.views.rose import build_rose
from structviz.views.scene import build_scene
from structviz.views.stereonet import build_net
from structviz.views.viewpoints import VIEWPOINTS, viewpoint

FIGURES = ("scene", "net", "mohr", "plunges", "rose", "misfits")
FORMATS = ("png", "svg", "pdf")
NARROWEST_MM, WIDEST_MM = 60.0, 420.0
COARSEST_DPI, FINEST_DPI, MOST_PIXELS = 72, 1200, 6000


@dataclass(frozen=True)
class PrintChoice:
    """What is printed, and how."""

    formats: tuple[str, ...] = ("png", "pdf")
    width_mm: float = 170.0
    dpi: int = 300
    only: tuple[str, ...] = FIGURES
    viewpoints: tuple[str, ...] = VIEWPOINTS

    def __post_init__(self) -> None:
        """Raise ArgumentError for a name or a number that cannot be."""
        for name, given, known in (
            ("formats", self.formats, FORMATS),
            ("only", self.only, FIGURES),
            ("viewpoints", self.viewpoints, VIEWPOINTS),
        ):
            wrong = [word for word in given if word not in known]
            if wrong or not given:
                raise ArgumentError(
                    f"{name}: found {', '.join(map(repr, wrong)) or 'none'}; wanted some of {', '.join(known)}", hint="part them by commas"
                )
        if not NARROWEST_MM <= self.width_mm <= WIDEST_MM:
            raise ArgumentError(
                f"width_mm: found {self.width_mm:g}; wanted {NARROWEST_MM:g} to {WIDEST_MM:g} mm", hint="85 is a column, 170 a page of A4"
            )
        if not COARSEST_DPI <= self.dpi <= FINEST_DPI:
            raise ArgumentError(
                f"dpi: found {self.dpi}; wanted {COARSEST_DPI} to {FINEST_DPI} dots an inch", hint="300 is enough for print"
            )
        pixels = round(self.width_mm / 25.4 * self.dpi)
        if pixels > MOST_PIXELS:
            raise ArgumentError(
                f"width_mm and dpi: found {self.width_mm:g} mm at {self.dpi} dots an inch, "
                f"{pixels:,} pixels; wanted at most {MOST_PIXELS:,}",
                hint="take fewer dots an inch: lines and words of SVG and PDF do not depend on them",
            )


@dataclass(frozen=True, eq=False)
class FigureOf:
    """One figure of an analysis, ready to be drawn."""

    name: str  # of its files, without suffix
    title: str
    caption: str
    needs_gl: bool
    description: Any
    paint: tuple[str, str]  # module of this package, and its function


@dataclass(frozen=True)
class DrawnFigure:
    """One figure as it was drawn."""

    name: str
    files: tuple[str, ...]
    title: str
    caption: str
    width_mm: float
    height_mm: float


def figures_of(analysis: Analysis, choice: PrintChoice) -> Iterator[FigureOf | tuple[str, str]]:
    """Give the figures chosen, in the order of the table; for one that has nothing to show its name and why."""
    for key in (key for key in FIGURES if key in choice.only):
        if key == "scene":
            yield from (_scene(analysis, name) for name in VIEWPOINTS if name in choice.viewpoints)
        else:
            yield PLOTS[key](analysis)


def draw_figure(figure: FigureOf, choice: PrintChoice, folder: Path) -> DrawnFigure:
    """Write a figure in every format chosen; RenderingUnavailable where it needs OpenGL and there is none."""
    if figure.needs_gl:
        require_gl()
    module, function = figure.paint
    paint = getattr(import_module(f"{__package__}.{module}"), function)
    drawn = paint(figure.description, choice.width_mm, choice.dpi)
    save = import_module(f"{__package__}.render_sheet").save
    files = tuple(f"{figure.name}.{kind}" for kind in FORMATS if kind in choice.formats)
    for name in files:
        save(drawn, folder / name, choice.dpi, figure.title)
    width, height = np.round(drawn.get_size_inches() * 25.4, 1)
    return DrawnFigure(figure.name, files, figure.title, figure.caption, float(width), float(height))


def _scene(analysis: Analysis, key: str) -> FigureOf:
    place = viewpoint(key, analysis.faults)
    scene = build_scene(analysis, azimuth_deg=place.azimuth_deg, elevation_deg=place.elevation_deg)
    return FigureOf(
        f"scene_{key}",
        f"The model {place.title}",
        captions.scene_caption(analysis, scene, place),
        True,
        scene,
        ("render_scene_print", "scene_figure"),
    )


def _plot(key: str, title: str, build: Callable[[Analysis], Any], shown: Callable[[Any], Any], caption: Any, why_not: str) -> Any:
    """Return a function that gives the figure of an analysis, or its name and why there is none."""

    def figure(analysis: Analysis) -> FigureOf | tuple[str, str]:
        description = build(analysis)
        if not shown(description):
            return key, why_not
        return FigureOf(key, title, caption(analysis, description), False, description, ("render_plots", key))

    return figure


NO_STRESS, NO_PLANE = "no stress could be inferred", "no fault has a meaningful mean plane"
PLOTS: dict[str, Callable[[Analysis], FigureOf | tuple[str, str]]] = {
    "net": _plot("net", "Equal-area net", build_net, lambda net: net.planes, captions.net_caption, NO_PLANE),
    "mohr": _plot("mohr", "Mohr diagram of reduced stress", build_mohr, bool, captions.mohr_caption, NO_STRESS),
    "plunges": _plot("plunges", "Plunges of the principal axes", build_plunges, lambda p: p.regimes, captions.plunges_caption, NO_STRESS),
    "rose": _plot("rose", "Rose of strikes", build_rose, lambda rose: rose.parts, captions.rose_caption, NO_PLANE),
    "misfits": _plot(
        "misfits", "Angles from declared to predicted slip", build_misfits, lambda m: m.blocks, captions.misfits_caption,
        "no declared movement could be compared with a predicted one",
    ),
}  # fmt: skip


def chosen(text: str | None, default: Sequence[str]) -> tuple[str, ...]:
    """Return the words of a text parted by commas, each once; the default for none.

    >>> chosen("pdf, svg,pdf", ())
    ('pdf', 'svg')
    """
    if text is None:
        return tuple(default)
    return tuple(dict.fromkeys(word.strip().lower() for word in text.split(",") if word.strip()))
