"""Mohr's diagram as SVG: shear over normal stress of stations of every fault, in reduced stress."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, path, text
from structviz.views.mohr import MohrFault, build_mohr

WIDTH, HEIGHT, LEFT, BASE, SCALE = 360.0, 220.0, 24.0, 190.0, 312.0
STATIONS = 12  # of a fault that are drawn


def mohr_svg(analysis: Analysis) -> str:
    """Return the diagram for the heaviest regime, values 1, R, 0; with R = 1/2 where the data leave it open, and that said."""
    diagrams = build_mohr(analysis, stations=STATIONS)
    if not diagrams:
        return ""
    mohr = diagrams[0]
    parts = [*_circles(mohr.ratio), *map(_fault, mohr.faults), *_words(mohr.ratio, mohr.note)]
    return drawing(WIDTH, HEIGHT, parts, title=f"Mohr diagram of reduced stress, {mohr.note}")


def _circles(ratio: float) -> Iterator[str]:
    for low, high, wide in ((0.0, 1.0, 1.2), (ratio, 1.0, 0.8), (0.0, ratio, 0.8)):
        turn = np.radians(np.linspace(0, 180, 61))
        middle, radius = (low + high) / 2, (high - low) / 2
        arc = np.stack([LEFT + SCALE * (middle + radius * np.cos(turn)), BASE - SCALE * radius * np.sin(turn)], 1)
        yield path(arc, fill="none", stroke=colour("ink" if wide > 1 else "faint"), stroke_width=wide)
    yield path([(LEFT - 10, BASE), (LEFT + SCALE + 14, BASE)], stroke=colour("ink"), stroke_width=0.8)


def _fault(fault: MohrFault) -> str:
    word = fault.verdict
    size = 2.6 if word == "conflicting" else 1.7
    dots = [circle(LEFT + SCALE * n, BASE - SCALE * s, size, fill=colour(word), fill_opacity=0.8) for n, s in fault.points]
    return group(dots, title=f"{word}: {fault.name}", data_fault=fault.row, class_=f"fault {word}")


def _words(ratio: float, note: str) -> Iterator[str]:
    for value, label in ((0.0, "\u03c33"), (ratio, "\u03c32"), (1.0, "\u03c31")):
        yield text(LEFT + SCALE * value, BASE + 16, label, font_size=12)
    yield text(WIDTH - 4, 14, note, text_anchor="end", fill=colour("faint"))
    yield text(8, 14, "shear", text_anchor="start", fill=colour("faint"))
    yield text(WIDTH - 4, BASE + 28, "normal stress, reduced", text_anchor="end", fill=colour("faint"), font_size=10)
