"""Draws the net with matplotlib, without a screen and without the state of pyplot."""

from __future__ import annotations

from pathlib import Path as FilePath

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import Circle, PathPatch, Rectangle
from matplotlib.path import Path

from structviz.views.net_density import NetDensity
from structviz.views.palette import FAINT, HAIR, INK, PAPER, PHASE_LOOKS, SIGMA, VERDICTS
from structviz.views.stereonet import Net, NetAxis, NetPlane, NetSlip

FONT = "DejaVu Sans"
SIGMA_MARKS = ("o", "D", "s")
SHADE = 0.07  # of each level of density
EXTENT = 1.13  # of the axes, in radii of the net


def draw(net: Net, path: FilePath) -> None:
    """Write the net as a PNG of 1800 by 1300 pixels; the same net gives the same bytes."""
    figure = Figure(figsize=(9.0, 6.5), dpi=200, facecolor=PAPER)
    FigureCanvasAgg(figure)
    axes = figure.add_axes((0.02, 0.03, 0.64, 0.86))
    axes.set_xlim(-EXTENT, EXTENT)
    axes.set_ylim(-EXTENT, EXTENT)
    paint(axes, net)
    figure.text(0.03, 0.955, net.title, fontsize=15, color=INK, va="center", weight="bold", family=FONT, parse_math=False)
    figure.text(0.03, 0.912, net.subtitle, fontsize=9, color=INK, va="center", family=FONT, parse_math=False)
    _key(figure, net)
    figure.savefig(path, metadata={"Software": None})


def paint(axes: Axes, net: Net, scale: float = 1.0, paper: str = PAPER) -> None:
    """Draw a net about the origin, of radius one, into axes with limits; marks and lines are multiplied by `scale`."""
    _frame(axes)
    _density(axes, net.density)
    for plane in sorted(net.planes, key=lambda p: p.verdict == "conflicting"):
        _plane(axes, plane, scale)
    for slip in net.slips:
        _slip(axes, slip, scale, paper)
    for axis in net.axes:
        _axis(axes, axis, scale)


def _frame(axes: Axes) -> None:
    axes.set_aspect("equal")
    axes.axis("off")
    axes.add_patch(Circle((0, 0), 1.0, facecolor="white", edgecolor=INK, linewidth=1.2, zorder=0))
    for azimuth in range(0, 360, 10):
        a = np.radians(azimuth)
        length = 0.035 if azimuth % 30 == 0 else 0.018
        axes.plot([np.sin(a), np.sin(a) * (1 + length)], [np.cos(a), np.cos(a) * (1 + length)], color=INK, linewidth=0.7)
    axes.plot([-0.02, 0.02], [0, 0], color=FAINT, linewidth=0.7)
    axes.plot([0, 0], [-0.02, 0.02], color=FAINT, linewidth=0.7)
    for azimuth, word in ((0, "N"), (90, "E"), (180, "S"), (270, "W")):
        a = np.radians(azimuth)
        axes.text(1.085 * np.sin(a), 1.085 * np.cos(a), word, ha="center", va="center", fontsize=10, color=INK, family=FONT)


def _density(axes: Axes, density: NetDensity | None) -> None:
    """Shade where poles crowd, a shade darker with each level, cut at the rim; rings within rings run the other way and stay open."""
    rim = Circle((0, 0), 1.0, transform=axes.transData)
    for rings in density.outlines if density else ():
        whole = Path.make_compound_path(*(Path(ring, closed=True) for ring in rings))
        axes.add_patch(PathPatch(whole, facecolor=INK, alpha=SHADE, linewidth=0, zorder=0.5, clip_path=rim))


def _plane(axes: Axes, plane: NetPlane, scale: float) -> None:
    look = VERDICTS[plane.verdict]
    style = (0, look.dash) if look.dash else "solid"
    depth = 4 if plane.verdict == "conflicting" else 2
    axes.plot(*plane.circle.T, color=look.colour, linewidth=look.width * scale, linestyle=style, zorder=depth, alpha=0.95)
    axes.plot(
        *plane.pole, marker="x", markersize=4.5 * scale, color=look.colour, markeredgewidth=max(0.9, look.width / 1.6) * scale, zorder=depth
    )


def _slip(axes: Axes, slip: NetSlip, scale: float, paper: str) -> None:
    """A triangle at the slip line: point down where the hanging wall goes down; hollow for what is declared."""
    look = VERDICTS[slip.verdict]
    big = slip.verdict == "conflicting"
    axes.plot(
        *slip.point, marker="^" if slip.upward else "v", markersize=(8 if big else 4.5) * scale, color=look.colour, zorder=6 if big else 3,
        markerfacecolor=paper if slip.declared else look.colour, markeredgewidth=(1.5 if big else 0.6) * scale,
    )  # fmt: skip


def _axis(axes: Axes, axis: NetAxis, scale: float) -> None:
    """One principal axis with its cone; those of a second phase are hollow and their cones dashed."""
    number, look = axis.number, PHASE_LOOKS[min(axis.phase, len(PHASE_LOOKS) - 1)]
    for line in axis.cone:
        axes.plot(*line.T, color=SIGMA[number], linewidth=1.4 * scale, zorder=7, linestyle=look.line)
        if look.filled:
            axes.fill(*line.T, color=SIGMA[number], alpha=0.13, zorder=1, linewidth=0)
    face, edge = (SIGMA[number], "white") if look.filled else ("white", SIGMA[number])
    axes.plot(
        *axis.point, marker=SIGMA_MARKS[number], markersize=10 * scale, markerfacecolor=face, markeredgecolor=edge,
        markeredgewidth=1.2 * scale, zorder=8,
    )  # fmt: skip
    east, north = map(float, axis.point)
    off = 0.075 if east < 0.85 else -0.075
    axes.annotate(
        axis.label, (east, north), (east + off, north + 0.045),
        fontsize=max(7.0, (10 if axis.phase else 13) * scale), color=INK, weight="bold", family=FONT,
        zorder=9, ha="center", bbox={"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": "none", "alpha": 0.75},
    )  # fmt: skip


def _key(figure: Figure, net: Net) -> None:
    axes = figure.add_axes((0.68, 0.03, 0.30, 0.86))
    axes.set_xlim(0, 1)
    axes.set_ylim(0, 1)
    axes.axis("off")
    at = 0.96
    at = _heading(axes, "Principal axes, 95 % cones", at)
    step = 0.052 if len(net.axes) <= 3 else 0.036
    for axis in net.axes:
        filled, colour = PHASE_LOOKS[min(axis.phase, len(PHASE_LOOKS) - 1)].filled, SIGMA[axis.number]
        axes.plot(0.05, at, marker=SIGMA_MARKS[axis.number], markersize=8, color=colour, markerfacecolor=colour if filled else PAPER)
        axes.text(0.14, at, f"{axis.label}   {axis.text}", fontsize=9.5 if step > 0.05 else 8.5, va="center", color=INK, family=FONT)
        at -= step
    if not net.axes:
        axes.text(0.02, at, "none could be inferred", fontsize=9.5, va="center", color=INK, family=FONT)
        at -= 0.052
    at = _heading(axes, "Faults, as judged by the others", at - 0.035)
    for word, count in net.counts:
        look = VERDICTS[word]
        axes.plot([0.0, 0.1], [at, at], color=look.colour, linewidth=look.width + 0.8, linestyle=(0, look.dash) if look.dash else "solid")
        axes.text(0.14, at, f"{count} {word}", fontsize=9.5, va="center", color=INK, family=FONT)
        at -= 0.052
    at = _heading(axes, "Slip of the hanging wall", at - 0.035)
    for marker, filled, text in (
        ("v", True, "predicted, down"),
        ("^", True, "predicted, up"),
        ("v", False, "declared, where it conflicts"),
    ):
        axes.plot(0.05, at, marker=marker, markersize=7, color=INK, markerfacecolor=INK if filled else PAPER)
        axes.text(0.14, at, text, fontsize=9.5, va="center", color=INK, family=FONT)
        at -= 0.052
    axes.plot(0.05, at, marker="x", markersize=6, color=INK)
    axes.text(0.14, at, "pole of the mean plane", fontsize=9.5, va="center", color=INK, family=FONT)
    if net.density:
        levels = ", ".join(f"{level:g}" for level in net.density.levels)
        axes.add_patch(Rectangle((0.0, at - 0.07), 0.1, 0.035, facecolor=INK, alpha=2 * SHADE, linewidth=0))
        axes.text(0.14, at - 0.052, f"poles crowd: {levels} s.d. above chance", fontsize=8, va="center", color=INK, family=FONT)
    axes.text(0.0, 0.0, "Equal-area, lower hemisphere.\nScreening aid; directions, not magnitudes.", fontsize=7.5, color=FAINT, family=FONT)


def _heading(axes: Axes, text: str, at: float) -> float:
    axes.text(0.0, at, text, fontsize=9.5, va="center", color=INK, weight="bold", family=FONT)
    axes.plot([0, 0.95], [at - 0.028, at - 0.028], color=HAIR, linewidth=0.8)
    return at - 0.065
