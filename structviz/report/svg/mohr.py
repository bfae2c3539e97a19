"""Mohr's diagram in reduced stress: shear over normal stress of every station of every fault."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from structviz.analysis import Analysis, FaultResult
from structviz.kinematics.slip import shear_and_normal
from structviz.report.svg.drawing import circle, colour, drawing, group, path, text
from structviz.stress.regime import Regime
from structviz.stress.tensor import reduced_tensor

WIDTH, HEIGHT, LEFT, BASE, SCALE = 360.0, 220.0, 24.0, 190.0, 312.0
OPEN_RATIO = 0.5
STATIONS = 12  # of a fault that are drawn
ORDER = {"consistent": 0, "undetermined": 1, "conflicting": 2}


def mohr_svg(analysis: Analysis) -> str:
    """Return the diagram for the heaviest regime, values 1, R, 0; with R = 1/2 where the data leave it open, and that said."""
    if not analysis.regimes:
        return ""
    regime = analysis.regimes[0]
    ratio = regime.shape_ratio.value if regime.shape_ratio else OPEN_RATIO
    rows = sorted(
        ((number, result) for number, result in enumerate(analysis.faults) if result.phase == 0),
        key=lambda row: ORDER[row[1].verdict.word],
    )
    points = [_fault(number, result, regime, ratio) for number, result in rows]
    note = f"R = {ratio:.2f}" if regime.shape_ratio else "R is open: drawn for R = 0.50"
    return drawing(WIDTH, HEIGHT, [*_circles(ratio), *points, *_words(ratio, note)], title=f"Mohr diagram of reduced stress, {note}")


def _circles(ratio: float) -> Iterator[str]:
    for low, high, wide in ((0.0, 1.0, 1.2), (ratio, 1.0, 0.8), (0.0, ratio, 0.8)):
        turn = np.radians(np.linspace(0, 180, 61))
        middle, radius = (low + high) / 2, (high - low) / 2
        arc = np.stack([LEFT + SCALE * (middle + radius * np.cos(turn)), BASE - SCALE * radius * np.sin(turn)], 1)
        yield path(arc, fill="none", stroke=colour("ink" if wide > 1 else "faint"), stroke_width=wide)
    yield path([(LEFT - 10, BASE), (LEFT + SCALE + 14, BASE)], stroke=colour("ink"), stroke_width=0.8)


def _fault(number: int, result: FaultResult, regime: Regime, ratio: float) -> str:
    stations = result.stations.normals
    normals = stations[np.linspace(0, len(stations) - 1, min(STATIONS, len(stations))).round().astype(int)]
    shear, normal = shear_and_normal(reduced_tensor(regime.axes, ratio), normals)
    word = result.verdict.word
    size = 2.6 if word == "conflicting" else 1.7
    dots = [
        circle(LEFT + SCALE * n, BASE - SCALE * s, size, fill=colour(word), fill_opacity=0.8) for s, n in zip(shear, normal, strict=True)
    ]
    return group(dots, title=f"{word}: {result.fault.name}", data_fault=number, class_=f"fault {word}")


def _words(ratio: float, note: str) -> Iterator[str]:
    for value, label in ((0.0, "\u03c33"), (ratio, "\u03c32"), (1.0, "\u03c31")):
        yield text(LEFT + SCALE * value, BASE + 16, label, font_size=12)
    yield text(WIDTH - 4, 14, note, text_anchor="end", fill=colour("faint"))
    yield text(8, 14, "shear", text_anchor="start", fill=colour("faint"))
    yield text(WIDTH - 4, BASE + 28, "normal stress, reduced", text_anchor="end", fill=colour("faint"), font_size=10)
