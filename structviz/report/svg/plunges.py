"""The plunges of the three axes in a triangle as SVG: which class of faulting, and how sure."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, mark, path, text
from structviz.views.plunges import PlungesRegime, build_plunges

Floats = NDArray[np.float64]

WIDTH, HEIGHT = 360.0, 300.0
CORNERS = np.array([(180.0, 34.0), (60.0, 250.0), (300.0, 250.0)])  # sigma1, sigma3, sigma2 upright


def plunges_svg(analysis: Analysis) -> str:
    """Return the triangle with each regime and the cloud of its replicates; a corner is an upright axis."""
    regimes = build_plunges(analysis).regimes
    if not regimes:
        return ""
    clouds = [_cloud(regime.cloud) for regime in regimes]
    marks = [_regime(regime, number) for number, regime in enumerate(regimes)]
    return drawing(WIDTH, HEIGHT, [*_frame(), *clouds, *marks], title="Plunges of the axes: which of them stands upright")


def _place(shares: Floats) -> Floats:
    """Return the places (..., 2) of shares (..., 3) of the corners of sigma1, sigma2, sigma3."""
    return shares[..., [0, 2, 1]] @ CORNERS


def _frame() -> Iterator[str]:
    yield path(CORNERS, closed=True, fill="none", stroke=colour("ink"), stroke_width=1.1)
    for share in (0.25, 0.5, 0.75):
        for k in range(3):
            one, two = CORNERS[(k + 1) % 3], CORNERS[(k + 2) % 3]
            ends = np.stack([share * CORNERS[k] + (1 - share) * one, share * CORNERS[k] + (1 - share) * two])
            yield path(ends, stroke=colour("hair"), stroke_width=0.7)
    yield text(180, 20, "\u03c31 upright: normal", font_size=12)
    yield text(8, 272, "\u03c33 upright: reverse", font_size=12, text_anchor="start")
    yield text(352, 272, "\u03c32 upright: strike-slip", font_size=12, text_anchor="end")


def _cloud(shares: Floats) -> str:
    return group([circle(x, y, 1.6, fill=colour("faint"), fill_opacity=0.5) for x, y in _place(shares)], class_="cloud")


def _regime(regime: PlungesRegime, number: int) -> str:
    (x, y), name = _place(regime.shares), regime.name
    filled = number == 0
    dot = mark(x, y, "round", 5.5, fill=colour("sigma1") if filled else colour("paper"), stroke=colour("sigma1"), stroke_width=1.6)
    return group(
        [dot, text(x + 10, y + 4, name, text_anchor="start", stroke=colour("paper"), stroke_width=3, paint_order="stroke")], title=name
    )
