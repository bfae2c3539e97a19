"""Draws the plots for print, in true size: each takes a description and a width, and returns a figure with its key."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Arc, Circle, Polygon, Rectangle
from numpy.typing import NDArray

from structviz.views.captions import DEPTH, shortened
from structviz.views.misfits import BIN_DEG, COLUMNS, Misfits
from structviz.views.mohr import Mohr, MohrFault
from structviz.views.palette import FAINT, HAIR, INK, PHASE_LOOKS, SIGMA, VERDICTS
from structviz.views.plunges import Plunges, PlungesRegime
from structviz.views.render_net import SIGMA_MARKS
from structviz.views.render_net import paint as paint_net
from structviz.views.render_sheet import (
    EDGE_MM,
    LARGE_PT,
    MARK_PT,
    MARKS,
    POINT_MM,
    SMALL_PT,
    TEXT_PT,
    Entry,
    Group,
    Symbol,
    axes_mm,
    beside_width,
    column_height,
    key_below,
    key_beside,
    key_height,
    paper,
    patch_style,
    sheet,
    verdict_symbol,
    width_of,
    words,
)
from structviz.views.rose import PETAL_DEG, Rose, RosePart
from structviz.views.stereonet import Net

Floats = NDArray[np.float64]

NARROW_MM = 110.0  # below it the key stands under the drawing
GREY = "#66727b"  # of words that step back: dark enough to be read in print


def beside_or_below(
    width: float, height: Callable[[float], float], groups: Sequence[Group], draw: Callable[[Axes, float], None], most: float = 0.7
) -> Figure:
    """Return a figure with a drawing and its key, beside it where there is room: there the drawing takes at most a share `most`.

    `height` gives how high a drawing of a width is, and `draw` draws it into axes in mm with 0 at its lower left.
    """
    if width >= NARROW_MM:
        wide = min(width - beside_width(groups) - 3 * EDGE_MM - 4.0, most * width)
        high = max(height(wide), column_height(groups))
        figure = sheet(width, high + 2 * EDGE_MM)
        key_beside(paper(figure), groups, wide + EDGE_MM + 6.0, high + EDGE_MM - 3.0)
        bottom = EDGE_MM + (high - height(wide)) / 2
    else:
        wide, below = width - 2 * EDGE_MM, key_height(groups, width - 2 * EDGE_MM)
        figure = sheet(width, height(wide) + below + 3 * EDGE_MM)
        key_below(paper(figure), groups, EDGE_MM, below + EDGE_MM, wide)
        bottom = below + 2 * EDGE_MM
    axes = axes_mm(figure, EDGE_MM, bottom, wide, height(wide))
    axes.set(xlim=(0, wide), ylim=(0, height(wide)))
    draw(axes, wide)
    return figure


def _square(wide: float) -> float:
    return wide


def _verdicts(found: Sequence[str], kind: str) -> Group:
    """Return the key of the verdicts that are drawn, worst first."""
    present = sorted(set(found), key=lambda word: -DEPTH[word])
    return Group(
        "Verdict on the fault", tuple(Entry(f"{word} ({list(found).count(word)})", verdict_symbol(word, kind)) for word in present)
    )


SLIP_KEY = (
    ("predicted, down", Symbol("mark", INK, "v", size_pt=6), {(False, False)}),
    ("predicted, up", Symbol("mark", INK, "^", size_pt=6), {(False, True)}),
    ("declared, where it conflicts", Symbol("mark", INK, "v", "white", 1.2, size_pt=6), {(True, False), (True, True)}),
)


def net(described: Net, width: float, dpi: int = 300) -> Figure:
    """Return the equal-area net."""
    shown = {(slip.declared, slip.upward) for slip in described.slips}
    slips = [Entry(text, symbol) for text, symbol, needs in SLIP_KEY if shown & needs]
    groups = [
        Group("Principal axes, 95 % cones", _axes_entries(described) or (Entry("none could be inferred"),)),
        _verdicts([plane.verdict for plane in described.planes], "line"),
        Group("Slip of the hanging wall", tuple(slips)) if slips else Group("Marks", ()),
    ]
    groups[-1] = Group(groups[-1].heading, (*groups[-1].entries, Entry("pole of a mean plane", Symbol("mark", INK, "x", size_pt=5))))

    def draw(axes: Axes, wide: float) -> None:
        named = _names_at_rim(described, wide)
        extent = 1.13 if not named else 1.13 + 0.02
        axes.set(xlim=(-extent, extent), ylim=(-extent, extent))
        paint_net(axes, described, scale=float(np.clip(wide / 110, 0.55, 1.15)), paper="white")
        _write_rim_names(axes, named, 2 * extent / wide)

    return beside_or_below(width, _square, groups, draw)


def _axes_entries(described: Net) -> tuple[Entry, ...]:
    entries = []
    for axis in described.axes:
        colour, filled = SIGMA[axis.number], PHASE_LOOKS[min(axis.phase, len(PHASE_LOOKS) - 1)].filled
        symbol = Symbol("mark", colour, SIGMA_MARKS[axis.number], colour if filled else "white", 1.1, (), 6.0)
        entries.append(Entry(f"{axis.label}  {axis.text}", symbol))
    return tuple(entries)


def _names_at_rim(described: Net, wide: float) -> list[tuple[str, Floats]]:
    """Return the names of conflicting faults and the ends of their great circles, (2, 2), where names would stand."""
    return [(shortened(p.name, 16), p.circle[[0, -1]]) for p in described.planes if p.verdict == "conflicting"] if wide >= 70 else []


def _write_rim_names(axes: Axes, named: list[tuple[str, Floats]], unit: float) -> None:
    """Write names inside the corners of the net's square, beyond its rim; a name with no room at either end is left out."""
    taken: list[tuple[float, float, float, float]] = [(-0.05, 1.04, 0.05, 1.13), (-0.05, -1.13, 0.05, -1.04), (1.04, -0.05, 1.13, 0.05)]
    taken.append((-1.13, -0.05, -1.04, 0.05))
    limit = axes.get_xlim()[1]
    for name, ends in named:
        long, high = width_of(name, SMALL_PT) * unit, 1.15 * SMALL_PT * POINT_MM * unit
        for x, y in ends * 1.06:
            left = x if x >= 0 else x - long
            box = (left, y - high / 2, left + long, y + high / 2)
            free = not any(box[0] < b[2] and b[0] < box[2] and box[1] < b[3] and b[1] < box[3] for b in taken)
            if free and box[0] > -limit and box[2] < limit and abs(y) < limit:
                taken.append(box)
                words(axes, left, y, name, SMALL_PT, color=VERDICTS["conflicting"].colour)
                break


def mohr(described: Sequence[Mohr], width: float, dpi: int = 300) -> Figure:
    """Return Mohr's diagrams of reduced stress, one under the other where there are several stresses."""
    notes = [each.note if len(described) == 1 else f"({number}) {each.note}" for number, each in enumerate(described, 1)]
    groups = [_verdicts([fault.verdict for each in described for fault in each.faults], "mark")]
    groups.append(Group("Shape ratio", tuple(map(Entry, notes))))
    wide = width - 2 * EDGE_MM
    key, each_mm = key_height(groups, wide), wide * 0.5 + 13.0
    figure = sheet(width, len(described) * each_mm + key + 2 * EDGE_MM)
    axes = paper(figure)
    key_below(axes, groups, EDGE_MM, key + EDGE_MM, wide)
    for number, diagram in enumerate(described):
        bottom = EDGE_MM + key + (len(described) - 1 - number) * each_mm
        _mohr_diagram(
            axes, diagram, EDGE_MM + 5.0, bottom + 9.0, wide - 9.0, f"({number + 1}) {diagram.name}" if len(described) > 1 else ""
        )
    return figure


def _mohr_diagram(axes: Axes, mohr: Mohr, left: float, base: float, scale: float, name: str) -> None:
    """Draw one diagram whose sigma3 stands at (left, base) and sigma1 `scale` mm to its right."""
    for low, high, width in ((0.0, 1.0, 1.1), (mohr.ratio, 1.0, 0.8), (0.0, mohr.ratio, 0.8)):
        size, middle = scale * (high - low), left + scale * (low + high) / 2
        axes.add_patch(
            Arc((middle, base), size, size, theta1=0, theta2=180, edgecolor=INK if width > 1 else GREY, linewidth=width, zorder=2)
        )
    axes.plot([left - 3, left + scale + 3], [base, base], color=INK, linewidth=0.8, zorder=2)
    axes.plot([left, left], [base, base + scale / 2 + 2], color=INK, linewidth=0.8, zorder=2)
    for fault in mohr.faults:
        _mohr_fault(axes, fault, left, base, scale)
    for value, label in ((0.0, "\u03c33"), (mohr.ratio, "\u03c32"), (1.0, "\u03c31")):
        axes.plot([left + scale * value] * 2, [base, base - 1.2], color=INK, linewidth=0.8)
        words(axes, left + scale * value, base - 3.4, label, LARGE_PT, ha="center")
    words(axes, left + scale, base - 7.2, "normal stress, reduced", SMALL_PT, ha="right", color=GREY)
    words(axes, left - 3.0, base + scale / 4, "shear, reduced", SMALL_PT, ha="center", rotation=90, color=GREY)
    if name:
        words(axes, left + 2.0, base + scale / 2, name, TEXT_PT, weight="bold")
    _mohr_names(axes, mohr, left, base, scale)


def _mohr_fault(axes: Axes, fault: MohrFault, left: float, base: float, scale: float) -> None:
    word, look = fault.verdict, verdict_symbol(fault.verdict, "mark")
    x, y = fault.points.T * scale + [[left], [base]]
    axes.plot(
        x, y, linestyle="", marker=MARKS[word], markersize=MARK_PT[word], markerfacecolor=look.face, markeredgecolor=look.colour,
        markeredgewidth={"conflicting": 0.6, "undetermined": 0.8, "consistent": 0.0}[word], alpha=0.9, zorder=3 + DEPTH[word],
    )  # fmt: skip


def _mohr_names(axes: Axes, mohr: Mohr, left: float, base: float, scale: float) -> None:
    """Name the conflicting faults beside their stations, where there is room."""
    taken: list[tuple[float, float, float, float]] = []
    for fault in mohr.faults:
        if fault.verdict != "conflicting":
            continue
        middle = _typical(fault.points) * scale + [left, base]
        name, high = shortened(fault.name, 18), 1.3 * SMALL_PT * POINT_MM
        long = width_of(name, SMALL_PT)
        spread = max(2.0, float(np.percentile(np.abs(fault.points[:, 1] * scale + base - middle[1]), 90)))
        for up in (spread + 2.0, -spread - 2.0, spread + 5.5, -spread - 5.5):
            x, y = float(np.clip(middle[0], left + long / 2, left + scale - long / 2)), float(middle[1] + up)
            box = (x - long / 2, y - high / 2, x + long / 2, y + high / 2)
            if y > base + 2 and not any(box[0] < b[2] and b[0] < box[2] and box[1] < b[3] and b[1] < box[3] for b in taken):
                taken.append(box)
                edge = y - high / 2 if up > 0 else y + high / 2
                axes.plot([x, middle[0]], [edge, middle[1]], color=INK, linewidth=0.6, zorder=8)
                box_style = {"boxstyle": "square,pad=0.1", "fc": "white", "ec": "none", "alpha": 0.8}
                words(axes, x, y, name, SMALL_PT, ha="center", zorder=9, bbox=box_style)
                break


def _typical(points: Floats) -> Floats:
    """Return the point nearest to the median of all, since a median alone may lie between two clusters."""
    return points[((points - np.median(points, axis=0)) ** 2).sum(1).argmin()]


CORNERS = np.array([(0.5, 0.75**0.5), (1.0, 0.0), (0.0, 0.0)])  # of sigma1, sigma2, sigma3 upright; the sides are one long
SIDE_MM = 5.0  # beside the triangle
CORNER_WORDS = (("\u03c31 upright:", "normal"), ("\u03c32 upright:", "strike-slip"), ("\u03c33 upright:", "reverse"))


def plunges(described: Plunges, width: float, dpi: int = 300) -> Figure:
    """Return the triangle of plunges."""
    entries = tuple(_plunge_entry(regime, number) for number, regime in enumerate(described.regimes))
    groups = [Group("Stress", entries), Group("", (Entry("its bootstrap replicates", Symbol("mark", GREY, ".", size_pt=3.5)),))]

    def draw(axes: Axes, wide: float) -> None:
        side = wide - 2 * SIDE_MM
        start = np.array([SIDE_MM, 9.5])
        corners = CORNERS * side + start
        axes.add_patch(Polygon(corners, closed=True, fill=False, edgecolor=INK, linewidth=1.1))
        for share in (0.25, 0.5, 0.75):
            for k in range(3):
                ends = share * corners[k] + (1 - share) * corners[[(k + 1) % 3, (k + 2) % 3]]
                axes.plot(*ends.T, color=FAINT, linewidth=0.5, linestyle=(0, (1.5, 2)), zorder=1)
        for k, (x, y) in enumerate(corners):
            align = ("center", "right", "left")[k]
            shift = (0.0, SIDE_MM, -SIDE_MM)[k]
            for line, text in enumerate(CORNER_WORDS[k]):
                words(
                    axes,
                    x + shift,
                    y + (7.0 if k == 0 else -3.2) - 3.6 * line,
                    text,
                    TEXT_PT,
                    ha=align,
                    weight="bold" if line else "normal",
                )
        for number, regime in enumerate(described.regimes):
            _plunge(axes, regime, number, corners)

    return beside_or_below(width, lambda wide: 0.866 * (wide - 2 * SIDE_MM) + 21.5, groups, draw, 0.6)


def _plunge_entry(regime: PlungesRegime, number: int) -> Entry:
    s1, s2, s3 = np.rad2deg(np.arcsin(np.sqrt(np.clip(regime.shares, 0, 1))))
    text = f"{regime.name}: plunges {s1:.0f}\u00b0, {s2:.0f}\u00b0, {s3:.0f}\u00b0"
    return Entry(text, _plunge_symbol(number))


def _plunge_symbol(number: int) -> Symbol:
    return Symbol("mark", SIGMA[0], ("o", "D", "s")[min(number, 2)], SIGMA[0] if number == 0 else "white", 1.3, (), 7.0)


def _plunge(axes: Axes, regime: PlungesRegime, number: int, corners: Floats) -> None:
    symbol = _plunge_symbol(number)
    axes.plot(*(regime.cloud @ corners).T, linestyle="", marker=".", markersize=2.6, color=GREY, alpha=0.6, markeredgewidth=0, zorder=3)
    axes.plot(
        *(regime.shares @ corners), marker=symbol.marker, markersize=symbol.size_pt, markerfacecolor=symbol.face,
        markeredgecolor="white" if number == 0 else symbol.colour, markeredgewidth=symbol.width_pt, zorder=5,
    )  # fmt: skip


def rose(described: Rose, width: float, dpi: int = 300) -> Figure:
    """Return the rose of strikes."""
    note = f"outer circle: {100 * described.longest_share:.0f} % of the faults' area"
    groups = [
        _verdicts([part.verdict for part in described.parts], "patch"),
        Group("Petals of 10\u00b0, by area", (Entry(note), Entry("inner circle: half of that"))),
    ]

    def draw(axes: Axes, wide: float) -> None:
        middle, radius = wide / 2, wide / 2 - 6.0
        for share in (1.0, 0.5**0.5):
            axes.add_patch(Circle((middle, middle), radius * share, fill=False, edgecolor=FAINT, linewidth=0.7))
        for part in described.parts:
            _petal(axes, part, middle, radius)
        for azimuth in range(0, 360, 30):
            out = np.array([np.sin(np.radians(azimuth)), np.cos(np.radians(azimuth))])
            axes.plot(*(middle + np.outer([radius, radius + 1.2], out)).T, color=INK, linewidth=0.7)
            named = {0: "N", 90: "E", 180: "S", 270: "W"}.get(azimuth)
            if named:
                words(axes, middle + out[0] * (radius + 3.6), middle + out[1] * (radius + 3.6), named, LARGE_PT, ha="center")

    return beside_or_below(width, _square, groups, draw, 0.6)


def _petal(axes: Axes, part: RosePart, middle: float, radius: float) -> None:
    for turned in (0.0, 180.0):
        turn = np.radians(np.linspace(part.start_deg, part.start_deg + PETAL_DEG, 9) + turned)
        rim = np.stack([np.sin(turn), np.cos(turn)], 1) * radius
        points = np.concatenate([rim * part.outer, rim[::-1] * part.inner]) + middle
        axes.add_patch(Polygon(points, closed=True, zorder=2 + DEPTH[part.verdict], joinstyle="miter", **patch_style(part.verdict)))


def misfits(described: Misfits, width: float, dpi: int = 300) -> Figure:
    """Return the histogram of misfits."""
    groups = [_verdicts([block.verdict for block in described.blocks], "patch")]
    wide = width - 2 * EDGE_MM
    key, high = key_height(groups, wide), max(30.0, 0.36 * wide)
    figure = sheet(width, high + key + 15.0 + 2 * EDGE_MM)
    axes = paper(figure)
    key_below(axes, groups, EDGE_MM, key + EDGE_MM, wide)
    left, base = EDGE_MM + 10.0, EDGE_MM + key + 11.0
    column, level = (wide - 12.0) / COLUMNS, high / described.highest
    for block in described.blocks:
        _block(axes, block, (left + block.column * column, base + block.level * level), (column, level))
    _misfit_axes(axes, described, (left, base), (column, level), high)
    return figure


def _block(axes: Axes, block: Any, corner: tuple[float, float], size: tuple[float, float]) -> None:
    (x, y), (wide, high) = corner, size
    gap = min(0.35, high / 8)
    style = patch_style(block.verdict)
    axes.add_patch(Rectangle((x + 0.5, y + gap), wide - 1.0, high - 2 * gap, zorder=2, **style))
    name = shortened(block.name, 14)
    if block.verdict == "conflicting" and high > 1.5 * SMALL_PT * POINT_MM and width_of(name, 6.0) < wide - 1.6:
        words(axes, x + wide / 2, y + high / 2, name, 6.0, ha="center", color="white", zorder=4)


def _misfit_axes(axes: Axes, described: Misfits, start: tuple[float, float], cell: tuple[float, float], high: float) -> None:
    (left, base), (column, level) = start, cell
    axes.plot([left, left + COLUMNS * column], [base, base], color=INK, linewidth=0.9, zorder=5)
    for angle in range(0, 181, 45):
        x = left + angle / BIN_DEG * column
        axes.plot([x, x], [base, base - 1.2], color=INK, linewidth=0.8)
        words(axes, x, base - 3.4, f"{angle}\u00b0", TEXT_PT, ha="center")
    step = next(s for s in (1, 2, 5, 10, 20, 50, 100, 200, 500, 10**9) if described.highest / s <= 5)
    for count in range(0, described.highest + 1, step):
        y = base + count * level
        axes.plot([left, left + COLUMNS * column], [y, y], color=HAIR, linewidth=0.5, zorder=1)
        words(axes, left - 1.5, y, str(count), TEXT_PT, ha="right")
    words(axes, left + COLUMNS * column / 2, base - 7.5, "angle from declared to predicted slip", TEXT_PT, ha="center")
    words(axes, left - 8.0, base + high / 2, "faults", TEXT_PT, ha="center", rotation=90)
