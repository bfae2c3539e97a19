"""The equal-area net as SVG: the same description as net.png, each fault a group."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis
from structviz.report.svg.drawing import circle, colour, drawing, group, mark, path, rings, text
from structviz.views.net_density import NetDensity
from structviz.views.palette import PHASE_LOOKS, VERDICTS
from structviz.views.stereonet import Net, NetAxis, NetPlane, NetSlip, build_net

Floats = NDArray[np.float64]

SIZE, MARGIN = 360.0, 22.0
RADIUS = SIZE / 2 - MARGIN
DASHES = {"-": None, "--": "5 3", ":": "1.5 2.5"}
EVERY = 5  # points of a great circle that are drawn: half a unit of 360 from itself at most
MARKS = ("round", "diamond", "square")
ORDER = {"consistent": 0, "undetermined": 1, "conflicting": 2}  # what matters most is drawn last


def net_svg(analysis: Analysis) -> str:
    """Return the net of an analysis, lower hemisphere, north up."""
    net = build_net(analysis)
    rows = {result.fault.name: number for number, result in enumerate(analysis.faults)}
    planes = sorted(net.planes, key=lambda plane: ORDER[plane.verdict])
    faults = [_fault(plane, [slip for slip in net.slips if slip.name == plane.name], rows[plane.name]) for plane in planes]
    parts = [*_density(net.density), *_frame(), *faults, *(_axis(axis) for axis in net.axes)]
    return drawing(SIZE, SIZE, parts, title=_title(net))


def _title(net: Net) -> str:
    return f"Equal-area net, lower hemisphere: {net.title}"


def _at(points: Floats) -> Floats:
    """Return net points (..., 2) as places of the drawing: the ordinate of SVG runs down."""
    return np.asarray(points) * [RADIUS, -RADIUS] + SIZE / 2


def _density(density: NetDensity | None) -> Iterator[str]:
    """Return where poles crowd, a shade darker with each level, cut at the rim."""
    if density is None:
        return
    yield f'<clipPath id="net-rim">{circle(SIZE / 2, SIZE / 2, RADIUS)}</clipPath>'
    shades = [
        rings([_at(line) for line in level], fill=colour("ink"), fill_opacity=0.07, fill_rule="evenodd") for level in density.outlines
    ]
    told = f"poles are denser than chance by {', '.join(f'{level:g}' for level in density.levels)} standard deviations"
    yield group(shades, title=told, class_="density", clip_path="url(#net-rim)")


def _frame() -> Iterator[str]:
    yield circle(SIZE / 2, SIZE / 2, RADIUS, fill="none", stroke=colour("ink"), stroke_width=1.2)
    for azimuth in range(0, 360, 10):
        out = np.array([np.sin(np.radians(azimuth)), np.cos(np.radians(azimuth))])
        yield path(_at(np.stack([out, out * (1.03 if azimuth % 30 == 0 else 1.015)])), stroke=colour("ink"), stroke_width=0.7)
    for word, (x, y) in {"N": (0, 1.09), "E": (1.09, -0.025), "S": (0, -1.13), "W": (-1.09, -0.025)}.items():
        place = _at(np.array([x, y], float))
        yield text(place[0], place[1], word)
    yield mark(SIZE / 2, SIZE / 2, "cross", 4, stroke=colour("faint"), stroke_width=0.8)


def _fault(plane: NetPlane, slips: list[NetSlip], row: int) -> str:
    look = VERDICTS[plane.verdict]
    dash = " ".join(map(str, look.dash)) or None
    style: dict[str, Any] = {"fill": "none", "stroke": colour(plane.verdict), "stroke_width": look.width, "stroke_dasharray": dash}
    line = path(_at(plane.circle[::EVERY]), digits=1, class_="line", **style)  # the page lays a wider one over it, easier to hit
    pole = _at(plane.pole)
    pole_mark = mark(pole[0], pole[1], "cross", 3.2, stroke=colour(plane.verdict), stroke_width=max(0.9, look.width / 1.6))
    marks = [_slip(slip) for slip in slips]
    return group([line, pole_mark, *marks], title=f"{plane.verdict}: {plane.name}", data_fault=row, class_=f"fault {plane.verdict}")


def _slip(slip: NetSlip) -> str:
    x, y = _at(slip.point)
    face = colour("paper") if slip.declared else colour(slip.verdict)
    size = 5.0 if slip.verdict == "conflicting" else 3.2
    return mark(x, y, "up" if slip.upward else "down", size, fill=face, stroke=colour(slip.verdict), stroke_width=1.1)


def _axis(axis: NetAxis) -> str:
    look, ink = PHASE_LOOKS[min(axis.phase, len(PHASE_LOOKS) - 1)], colour(f"sigma{axis.number + 1}")
    cones = [
        path(_at(line), fill=ink, fill_opacity=0.12 if look.filled else 0, stroke=ink, stroke_dasharray=DASHES[look.line])
        for line in axis.cone
    ]
    x, y = _at(axis.point)
    point = mark(x, y, MARKS[axis.number], 5, fill=ink if look.filled else colour("paper"), stroke=colour("paper") if look.filled else ink)
    side = 1 if x < SIZE * 0.8 else -1
    label = text(
        x + 9 * side, y - 7, axis.label, font_size=12, font_weight="bold", text_anchor="start" if side > 0 else "end",
        stroke=colour("paper"), stroke_width=3, paint_order="stroke",
    )  # fmt: skip
    return group([*cones, point, label], title=f"{axis.label} {axis.text}", class_="axis", pointer_events="none")
