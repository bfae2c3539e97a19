"""Draws the scene: surfaces and glyphs off-screen with PyVista, words and frame over it with matplotlib.

Words are set by matplotlib because VTK's fonts lack the Greek letters and its labels cannot give way to each other.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from numpy.typing import NDArray
from PIL import Image

from structviz.views.palette import FAINT, HAIR, INK, PAPER, VERDICTS
from structviz.views.render_actors import add_actors, aim
from structviz.views.render_pixels import picture, projector, smooth
from structviz.views.scene import Label, Scene

Floats = NDArray[np.float64]

PIXELS = (2000, 1400)
FONT = "DejaVu Sans"
TITLE_FROM, TICKS_APART = 1240, 26  # pixels


def draw(scene: Scene, path: Path) -> None:
    """Write the scene as a PNG of 2000 by 1400 pixels; the same scene gives the same bytes."""
    plotter = pv.Plotter(off_screen=True, window_size=list(PIXELS), lighting="light kit")
    try:
        add_actors(plotter, scene)
        aim(plotter, scene, PIXELS[0] / PIXELS[1])
        smooth(plotter)
        image, project = picture(plotter), projector(plotter, PIXELS)
    finally:
        plotter.close()
    figure = Figure(figsize=(PIXELS[0] / 200, PIXELS[1] / 200), dpi=200, facecolor="none")
    canvas = FigureCanvasAgg(figure)
    axes = figure.add_axes((0.0, 0.0, 1.0, 1.0))
    axes.set_xlim(0, PIXELS[0])
    axes.set_ylim(0, PIXELS[1])
    axes.axis("off")
    _frame(axes, scene, project)
    _names(axes, scene, project)
    _words(axes, scene)
    canvas.draw()
    Image.fromarray(_over(image, np.asarray(canvas.buffer_rgba()))).save(path, dpi=(200, 200), compress_level=4)


def _over(picture: NDArray[np.uint8], words: NDArray[np.uint8]) -> NDArray[np.uint8]:
    """Return the words (H, W, 4) over the picture (H, W, 3), pixel for pixel: matplotlib would resample it, slower and softer."""
    inked = np.flatnonzero(words[..., 3].ravel())
    pixels, ink = picture.reshape(-1, 3).copy(), words.reshape(-1, 4)[inked].astype(np.uint16)
    pixels[inked] = (pixels[inked] * (255 - ink[:, 3:]) + ink[:, :3] * ink[:, 3:] + 127) // 255
    return pixels.reshape(picture.shape)


def _frame(axes: Axes, scene: Scene, project: Any) -> None:
    """Write eastings and northings along the two near edges of the floor, heights along a post, and a north arrow."""
    (w, s, b), (e, n, t) = scene.low, scene.high
    side = e if scene.view_from_deg <= 180 else w
    _ticks(axes, project, scene.origin, 0, np.array([w, s, b]), np.array([e, s, b]), (0, -26), "easting")
    _ticks(axes, project, scene.origin, 1, np.array([side, s, b]), np.array([side, n, b]), (26 if side == e else -26, -12), "northing")
    other = w if side == e else e
    _ticks(axes, project, scene.origin, 2, np.array([other, s, b]), np.array([other, s, t]), (-14 if other == w else 14, 0), "up")
    start = np.array([other, n, b])
    length = 0.09 * float(np.linalg.norm((scene.high - scene.low)[:2]))
    tail, tip = project(np.stack([start + [0, 0.02 * length, 0], start + [0, length, 0]]))
    if tip[1] > TITLE_FROM:  # a long model reaches up to the words: the arrow stands in the near corner instead
        shift = np.array([PIXELS[0] - 200.0, 150.0]) - tail
        tail, tip = tail + shift, tip + shift
    axes.annotate("", tip, tail, arrowprops={"arrowstyle": "-|>", "color": INK, "linewidth": 1.6, "shrinkA": 0, "shrinkB": 0})
    axes.text(tip[0], tip[1] + 20, "N", fontsize=10, color=INK, ha="center", weight="bold", family=FONT)


def _ticks(axes: Axes, project: Any, origin: Floats, axis: int, start: Floats, end: Floats, off: tuple[float, float], word: str) -> None:
    low, high = start[axis] + origin[axis], end[axis] + origin[axis]
    step = _round_step(abs(high - low) / 3.5)
    values = np.arange(np.ceil(low / step), np.floor(high / step) + 1) * step
    if axis != 2 and np.ptp(project(np.stack([start, end])), axis=0).max() < 200:
        values = values[:1]
    if axis == 2 and len(values) > 1:  # a flat model seen from above: heights that would cover each other are left out
        apart = abs(float(np.diff(project(np.stack([start, end])), axis=0)[0, 1])) * step / max(abs(high - low), 1e-9)
        values = values[:: max(1, int(np.ceil(TICKS_APART / max(apart, 1e-9))))]
    places = np.repeat(start[None], len(values), 0)
    places[:, axis] = values - origin[axis]
    align = "center" if off[0] == 0 else ("left" if off[0] > 0 else "right")
    for value, (x, y) in zip(values, project(places) if len(values) else [], strict=True):
        axes.plot([x, x + off[0] * 0.4], [y, y + off[1] * 0.4], color=FAINT, linewidth=0.8)
        axes.text(
            x + off[0], y + off[1], f"{value:,.0f}".replace(",", "\u2009"), fontsize=6.5, color=FAINT, ha=align, va="center", family=FONT
        )
    x, y = project(np.stack([start, end])).mean(0)
    push = 4.2 if axis == 1 else 2.6
    if axis == 2:
        x, y = project(end[None])[0]
        axes.text(x + off[0], y + 26, f"{word}, m", fontsize=6.5, color=FAINT, ha="center", family=FONT)
    else:
        x, y = np.clip(x + push * off[0], 80, PIXELS[0] - 80), y + push * off[1]
        axes.text(x, y, f"{word}, m", fontsize=7, color=FAINT, ha="center", va="center", family=FONT)


def _round_step(length: float) -> float:
    """Return the round number (1, 2 or 5 times a power of ten) at or above a length."""
    power = 10.0 ** np.floor(np.log10(max(length, 1e-9)))
    return float(next(m * power for m in (1, 2, 5, 10) if m * power >= length * 0.999))


def _names(axes: Axes, scene: Scene, project: Any) -> None:
    """Write names at their faults; one that would cover an earlier, more wanted one is left out."""
    taken: list[tuple[float, float, float, float]] = []
    for label in scene.labels:
        x, y = project(label.place[None])[0]
        half, tall = 6.4 * len(label.text) + 10, 15.0
        box = (x - half, y + 22 - tall, x + half, y + 22 + tall)
        if any(box[0] < b[2] and b[0] < box[2] and box[1] < b[3] and b[1] < box[3] for b in taken):
            continue
        taken.append(box)
        _name(axes, label, float(x), float(y))


def _name(axes: Axes, label: Label, x: float, y: float) -> None:
    strong = label.kind == "conflicting"
    axes.plot([x, x], [y, y + 8], color=INK, linewidth=0.7)
    edge = VERDICTS["conflicting"].colour if strong else "none"
    axes.text(
        x,
        y + 22,
        label.text,
        parse_math=False,
        fontsize=8 if strong else 6.5,
        weight="bold" if strong else "normal",
        color=INK,
        ha="center",
        va="center",
        family=FONT,
        bbox={"boxstyle": "round,pad=0.15", "facecolor": PAPER, "edgecolor": edge, "linewidth": 0.9, "alpha": 0.85},
    )


def _words(axes: Axes, scene: Scene) -> None:
    axes.text(50, PIXELS[1] - 62, scene.title, fontsize=17, weight="bold", color=INK, va="center", family=FONT, parse_math=False)
    axes.text(50, PIXELS[1] - 118, scene.subtitle, fontsize=9.5, color=INK, va="center", family=FONT, parse_math=False)
    x, y = PIXELS[0] - 470, PIXELS[1] - 60
    for word, count in scene.counts:
        look = VERDICTS[word]
        edge = INK if word == "conflicting" else look.colour
        axes.add_patch(
            Rectangle((x, y - 12), 40, 24, facecolor=look.colour, edgecolor=edge, linewidth=1.6 if word == "conflicting" else 0.8)
        )
        axes.text(x + 58, y, f"{count} {word}", fontsize=9, color=INK, va="center", family=FONT)
        y -= 42
    axes.plot([x, PIXELS[0] - 50], [y + 14, y + 14], color=HAIR, linewidth=0.8)
    if scene.glyphs:
        text = (
            "stress: dark cones press along \u03c31, the lens\nis long along \u03c33; large: all faults together,\n"
            "small: pairs of faults, where they meet"
        )
        axes.text(x, y - 2, text, fontsize=7, color=INK, va="top", family=FONT, linespacing=1.4)
    axes.text(
        50,
        34,
        "Screening aid: directions, not magnitudes. Parallel projection, no vertical exaggeration.",
        fontsize=7,
        color=FAINT,
        family=FONT,
    )
