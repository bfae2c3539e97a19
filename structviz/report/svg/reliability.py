"""What the probabilities mean as SVG: observed over given share on synthetic models, this model's faults hanging below."""

from __future__ import annotations

from collections.abc import Iterator

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, path, text
from structviz.views.palette import VERDICTS
from structviz.views.reliability import BIN, ReliabilityFault, ReliabilityPoint, build_reliability

LEFT, RIGHT, TOP, BASE, WIDTH = 46.0, 342.0, 32.0, 176.0, 360.0
HANG, BLOCK = 60.0, 9.0  # room below the axis, and the tallest block
SHARES = (0.0, 0.25, 0.5, 0.75, 1.0)


def reliability_svg(analysis: Analysis) -> str:
    """Return the plot; "" where no fault has a probability."""
    shown = build_reliability(analysis)
    if not shown.faults:
        return ""
    deepest = max(fault.level for fault in shown.faults) + 1
    tall = min(BLOCK, HANG / deepest)
    blocks = [_block(fault, tall) for fault in shown.faults]
    foot = BASE + 2 + tall * deepest
    parts = [*_frame(foot), *(_point(point) for point in shown.points), *blocks]
    return drawing(WIDTH, foot + 40, parts, title="What the probabilities mean: observed over given share of slips outside the sector")


def _across(share: float) -> float:
    return LEFT + share * (RIGHT - LEFT)


def _up(share: float) -> float:
    return BASE - share * (BASE - TOP)


def _frame(foot: float) -> Iterator[str]:
    for share in SHARES:
        yield path([(LEFT, _up(share)), (RIGHT, _up(share))], stroke=colour("ink" if share == 0 else "hair"), stroke_width=0.9)
        yield text(LEFT - 6, _up(share) + 4, f"{100 * share:.0f}", text_anchor="end")
        yield text(_across(share), foot + 14, f"{100 * share:.0f}")
    yield path([(LEFT, BASE), (RIGHT, TOP)], stroke=colour("faint"), stroke_dasharray="4 3", stroke_width=0.9)
    yield text(8, 14, "observed, %", text_anchor="start", fill=colour("faint"))
    yield text(RIGHT, foot + 32, "probability given, %; blocks: this model's faults", text_anchor="end", fill=colour("faint"))


def _point(point: ReliabilityPoint) -> str:
    x = _across(point.given)
    bar = path([(x, _up(point.low)), (x, _up(point.high))], stroke=colour("ink"), stroke_width=1.1)
    dot = circle(x, _up(point.observed), 2.8, fill=colour("paper"), stroke=colour("ink"), stroke_width=1.3)
    told = f"{100 * point.observed:.1f} % of {point.faults:,} synthetic faults where {100 * point.given:.1f} % was given"
    return group([bar, dot], title=told, class_="measured")


def _block(fault: ReliabilityFault, tall: float) -> str:
    wide, gap = BIN * (RIGHT - LEFT), min(1.0, tall / 4)
    x, y = LEFT + fault.column * wide, BASE + 2 + fault.level * tall
    corners = [(x + 0.7, y), (x + wide - 0.7, y), (x + wide - 0.7, y + tall - gap), (x + 0.7, y + tall - gap)]
    edge = {"stroke": colour("ink"), "stroke_width": VERDICTS[fault.verdict].width / 3} if fault.verdict == "conflicting" else {}
    block = path(corners, closed=True, digits=1, fill=colour(fault.verdict), **edge)
    told = f"{fault.verdict}, {100 * fault.probability:.0f} %: {fault.name}"
    return group([block], title=told, data_fault=fault.row, class_=f"fault {fault.verdict}")
