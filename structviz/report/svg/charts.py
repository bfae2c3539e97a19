"""Two charts of all faults: a rose of strikes by area, and declared against predicted slip."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.report.svg.drawing import circle, colour, drawing, group, path, text
from structviz.views.palette import VERDICTS

Floats = NDArray[np.float64]

WORDS = ("consistent", "undetermined", "conflicting")  # from the middle outwards, from the bottom up
ROSE, PETAL_DEG = 130.0, 10.0
BIN_DEG, LEFT, BASE, TOP, WIDTH = 15.0, 34.0, 190.0, 24.0, 360.0


def rose_svg(analysis: Analysis) -> str:
    """Return the rose of strikes, undirected, petals of 10 degrees whose areas are shares of the faults' area, by verdict."""
    shown = [(number, result) for number, result in enumerate(analysis.faults) if result.measured.meaningful]
    if not shown:
        return ""
    bins: list[list[tuple[int, FaultResult]]] = [[] for _ in range(int(180 / PETAL_DEG))]
    for number, result in shown:
        bins[int(result.measured.strike_deg % 180.0 // PETAL_DEG)].append((number, result))
    areas = [sum(result.measured.area_m2 for _, result in petal) for petal in bins]
    scale = ROSE / np.sqrt(max(areas))
    parts = [
        circle(180, 155, ROSE, fill="none", stroke=colour("hair")),
        circle(180, 155, ROSE / np.sqrt(2), fill="none", stroke=colour("hair")),
    ]
    parts += [part for k, petal in enumerate(bins) for part in _petal(petal, k * PETAL_DEG, scale)]
    parts += [text(180, 18, "N"), text(320, 159, "E"), text(180, 300, "S"), text(40, 159, "W")]
    return drawing(360, 310, parts, title="Rose of strikes, petals by area")


def _petal(petal: list[tuple[int, FaultResult]], start_deg: float, scale: float) -> list[str]:
    inside, parts = 0.0, []
    for number, result in sorted(petal, key=lambda row: WORDS.index(row[1].verdict.word)):
        outside = inside + result.measured.area_m2
        low, high = np.sqrt(inside) * scale, np.sqrt(outside) * scale
        both = [_sector(start_deg + turn, low, high, result.verdict.word) for turn in (0.0, 180.0)]
        parts.append(
            group(both, title=f"{result.verdict.word}: {result.fault.name}", data_fault=number, class_=f"fault {result.verdict.word}")
        )
        inside = outside
    return parts


def _sector(start_deg: float, low: float, high: float, word: str) -> str:
    turn = np.radians(np.linspace(start_deg, start_deg + PETAL_DEG, 5))
    rim = np.stack([np.sin(turn), -np.cos(turn)], 1)
    points = np.concatenate([rim * high, rim[::-1] * low]) + [180, 155]
    return path(points, closed=True, fill=colour(word), stroke=colour("paper"), stroke_width=0.6)


def misfits_svg(analysis: Analysis) -> str:
    """Return a histogram of the angles from declared to predicted slip, each fault a block, by verdict."""
    judged = [(number, result) for number, result in enumerate(analysis.faults) if result.verdict.misfit_deg is not None]
    if not judged:
        return ""
    columns: list[list[tuple[int, FaultResult]]] = [[] for _ in range(int(180 / BIN_DEG))]
    for number, result in judged:
        columns[min(int((result.verdict.misfit_deg or 0.0) // BIN_DEG), len(columns) - 1)].append((number, result))
    tall, wide = (BASE - TOP) / max(map(len, columns)), (WIDTH - LEFT - 10) / len(columns)
    parts = [path([(LEFT, BASE), (WIDTH - 10, BASE)], stroke=colour("ink"), stroke_width=0.9)]
    for k, column in enumerate(columns):
        for level, (number, result) in enumerate(sorted(column, key=lambda row: WORDS.index(row[1].verdict.word))):
            parts.append(_block(LEFT + k * wide, BASE - (level + 1) * tall, wide - 1.5, tall, number, result))
    parts += [text(LEFT + angle / BIN_DEG * wide, BASE + 15, f"{angle}\u00b0") for angle in (0, 45, 90, 135)]
    parts.append(text(WIDTH - 4, BASE + 15, "180\u00b0", text_anchor="end"))
    parts += [text(LEFT - 6, BASE + 4, "0", text_anchor="end"), text(LEFT - 6, TOP + 8, str(max(map(len, columns))), text_anchor="end")]
    parts.append(text(WIDTH - 10, 14, "angle from declared to predicted slip; faults", text_anchor="end", fill=colour("faint")))
    return drawing(WIDTH, 212, parts, title="Angles from declared to predicted slip")


def _block(x: float, y: float, wide: float, tall: float, number: int, result: FaultResult) -> str:
    word, gap = result.verdict.word, min(1.0, tall / 4)
    corners = [(x, y + gap), (x + wide, y + gap), (x + wide, y + tall), (x, y + tall)]
    look = VERDICTS[word]
    block = path(
        corners, closed=True, fill=colour(word), stroke=colour("ink") if word == "conflicting" else "none", stroke_width=look.width / 3
    )
    told = f"{word}, {result.verdict.misfit_deg:.0f}\u00b0: {result.fault.name}"
    return group([block], title=told, data_fault=number, class_=f"fault {word}")
