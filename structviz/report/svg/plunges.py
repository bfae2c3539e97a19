"""The plunges of the three axes in a triangle: which class of faulting, and how sure."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, mark, path, text

Floats = NDArray[np.float64]

WIDTH, HEIGHT = 360.0, 300.0
CORNERS = np.array([(180.0, 34.0), (60.0, 250.0), (300.0, 250.0)])  # sigma1, sigma3, sigma2 upright
CLOUD = 150  # replicates drawn


def plunges_svg(analysis: Analysis) -> str:
    """Return the triangle with each regime and the cloud of its replicates; a corner is an upright axis.

    The squared sines of the plunges of three perpendicular axes add up to one, so they are shares of the corners.
    """
    if not analysis.regimes or analysis.answer is None:
        return ""
    clouds = [_cloud(posterior.frames[:CLOUD]) for posterior in analysis.answer.posteriors]
    marks = [_regime(regime.axes, regime.name or regime.kind, k) for k, regime in enumerate(analysis.regimes)]
    return drawing(WIDTH, HEIGHT, [*_frame(), *clouds, *marks], title="Plunges of the axes: which of them stands upright")


def _place(axes: Floats) -> Floats:
    """Return the places (..., 2) of frames (..., 3, 3)."""
    shares = axes[..., 2] ** 2
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


def _cloud(frames: Floats) -> str:
    return group([circle(x, y, 1.6, fill=colour("faint"), fill_opacity=0.5) for x, y in _place(frames)], class_="cloud")


def _regime(axes: Floats, name: str, number: int) -> str:
    x, y = _place(axes)
    filled = number == 0
    dot = mark(x, y, "round", 5.5, fill=colour("sigma1") if filled else colour("paper"), stroke=colour("sigma1"), stroke_width=1.6)
    return group(
        [dot, text(x + 10, y + 4, name, text_anchor="start", stroke=colour("paper"), stroke_width=3, paint_order="stroke")], title=name
    )
