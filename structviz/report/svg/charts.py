"""Two charts of all faults as SVG: a rose of strikes by area, and declared against predicted slip."""

from __future__ import annotations

import numpy as np

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, path, text
from structviz.views.misfits import BIN_DEG, COLUMNS, MisfitBlock, build_misfits
from structviz.views.palette import VERDICTS
from structviz.views.rose import PETAL_DEG, RosePart, build_rose

ROSE = 130.0
LEFT, BASE, TOP, WIDTH = 34.0, 190.0, 24.0, 360.0


def rose_svg(analysis: Analysis) -> str:
    """Return the rose of strikes, undirected, petals of 10 degrees whose areas are shares of the faults' area, by verdict."""
    rose = build_rose(analysis)
    if not rose.parts:
        return ""
    parts = [
        circle(180, 155, ROSE, fill="none", stroke=colour("hair")),
        circle(180, 155, ROSE / np.sqrt(2), fill="none", stroke=colour("hair")),
    ]
    parts += map(_fault, rose.parts)
    parts += [text(180, 18, "N"), text(320, 159, "E"), text(180, 300, "S"), text(40, 159, "W")]
    return drawing(360, 310, parts, title="Rose of strikes, petals by area")


def _fault(part: RosePart) -> str:
    both = [_sector(part.start_deg + turn, part.inner * ROSE, part.outer * ROSE, part.verdict) for turn in (0.0, 180.0)]
    return group(both, title=f"{part.verdict}: {part.name}", data_fault=part.row, class_=f"fault {part.verdict}")


def _sector(start_deg: float, low: float, high: float, word: str) -> str:
    turn = np.radians(np.linspace(start_deg, start_deg + PETAL_DEG, 5))
    rim = np.stack([np.sin(turn), -np.cos(turn)], 1)
    points = np.concatenate([rim * high, rim[::-1] * low]) + [180, 155]
    return path(points, closed=True, fill=colour(word), stroke=colour("paper"), stroke_width=0.6)


def misfits_svg(analysis: Analysis) -> str:
    """Return a histogram of the angles from declared to predicted slip, each fault a block, by verdict."""
    misfits = build_misfits(analysis)
    if not misfits.blocks:
        return ""
    tall, wide = (BASE - TOP) / misfits.highest, (WIDTH - LEFT - 10) / COLUMNS
    parts = [path([(LEFT, BASE), (WIDTH - 10, BASE)], stroke=colour("ink"), stroke_width=0.9)]
    parts += [_block(LEFT + b.column * wide, BASE - (b.level + 1) * tall, wide - 1.5, tall, b) for b in misfits.blocks]
    parts += [text(LEFT + angle / BIN_DEG * wide, BASE + 15, f"{angle}\u00b0") for angle in (0, 45, 90, 135)]
    parts.append(text(WIDTH - 4, BASE + 15, "180\u00b0", text_anchor="end"))
    parts += [text(LEFT - 6, BASE + 4, "0", text_anchor="end"), text(LEFT - 6, TOP + 8, str(misfits.highest), text_anchor="end")]
    parts.append(text(WIDTH - 10, 14, "angle from declared to predicted slip; faults", text_anchor="end", fill=colour("faint")))
    return drawing(WIDTH, 212, parts, title="Angles from declared to predicted slip")


def _block(x: float, y: float, wide: float, tall: float, block: MisfitBlock) -> str:
    word, gap = block.verdict, min(1.0, tall / 4)
    corners = [(x, y + gap), (x + wide, y + gap), (x + wide, y + tall), (x, y + tall)]
    edge, width = colour("ink") if word == "conflicting" else "none", VERDICTS[word].width / 3
    shape = path(corners, closed=True, fill=colour(word), stroke=edge, stroke_width=width)
    told = f"{word}, {block.misfit_deg:.0f}\u00b0: {block.name}"
    return group([shape], title=told, data_fault=block.row, class_=f"fault {word}")
