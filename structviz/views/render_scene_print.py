"""Draws the scene for print: a raster of surfaces and glyphs in its place on the paper, and over it words and lines as vectors."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pyvista as pv
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import FancyArrowPatch, Rectangle
from matplotlib.patheffects import Stroke
from numpy.typing import NDArray

from structviz.views.captions import DEPTH
from structviz.views.palette import INK, VERDICTS
from structviz.views.render_actors import add_actors, aim, seen_size
from structviz.views.render_pixels import Pixels, mosaic, projector, smooth, tiles_of
from structviz.views.render_sheet import (
    EDGE_MM,
    MM,
    POINT_MM,
    SMALL_PT,
    TEXT_PT,
    Entry,
    Group,
    axes_mm,
    key_below,
    key_height,
    paper,
    sheet,
    verdict_symbol,
    width_of,
    words,
)
from structviz.views.scene import Scene

Floats = NDArray[np.float64]
Project = Callable[[Floats], Floats]
Box = tuple[float, float, float, float]  # left, bottom, right, top, mm

WHITE = "#ffffff"
FLATTEST, TALLEST = 0.42, 1.05  # height of the picture over its width
ROOM_MM = 11.0  # around the model, for coordinates
GREY = "#66727b"
DOTS, HEAVIER = 200, 1.8  # an inch, for which line widths in pixels are meant; and how much more paper asks for


def scene_figure(scene: Scene, width: float, dpi: int) -> Figure:
    """Return a figure of a scene, `width` mm wide, with its raster at that many dots an inch."""
    groups = _key(scene)
    key = np.ceil((key_height(groups, width - 2 * EDGE_MM) + EDGE_MM) / MM * dpi) / dpi * MM  # whole pixels: the raster is not resampled
    size, fill = _pixels(scene, width, dpi)
    raster, project = photograph(scene, size, dpi, fill)
    high = size[1] / dpi * MM
    figure = sheet(width, high + key)
    _lay(figure, raster, (0.0, key, width, high))
    axes = paper(figure)
    key_below(axes, groups, EDGE_MM, key, width - 2 * EDGE_MM)

    def on_paper(places: Floats) -> Floats:
        return project(places) / size * [width, high] + [0.0, key]

    page = (0.0, key, width, key + high)
    taken = [_compass(axes, scene, page), _scale_bar(axes, scene, on_paper, page)]
    _coordinates(axes, scene, on_paper, page, taken)
    _names(axes, scene, on_paper, page, taken)
    return figure


def _pixels(scene: Scene, width: float, dpi: int) -> tuple[tuple[int, int], tuple[float, float]]:
    """Return the size of the raster, and the shares of it that the model fills at most."""
    across, high = seen_size(scene)
    room = ROOM_MM if scene.elevation_deg < 60 else 3.5 + max(width_of(_number(v), SMALL_PT) for v in (scene.low + scene.origin)[:2])
    model = max(width - 2 * room, 0.7 * width)
    tall = float(np.clip(model * high / across + 2 * ROOM_MM, FLATTEST * width, TALLEST * width))
    size = (round(width / MM * dpi), round(tall / MM * dpi))
    return size, (model / width, 1 - 2 * ROOM_MM / tall)


def photograph(scene: Scene, size: tuple[int, int], dpi: int, fill: tuple[float, float]) -> tuple[Pixels, Project]:
    """Return the pixels (H, W, 3) of a scene on white, and the function from its places to places in them."""
    plotter = pv.Plotter(off_screen=True, window_size=list(tiles_of(size)[1]), lighting="light kit")
    try:
        add_actors(plotter, scene, widths=HEAVIER * dpi / DOTS, dashed=True)
        plotter.set_background(WHITE)
        aim(plotter, scene, size[0] / size[1], fill=fill, lift=0.0)
        smooth(plotter)
        return mosaic(plotter, size), projector(plotter, size)
    finally:
        plotter.close()


def _lay(figure: Figure, raster: Pixels, place: tuple[float, float, float, float]) -> None:
    """Put a raster on a figure, pixel for pixel where the density is the raster's own."""
    axes = axes_mm(figure, *place)
    axes.imshow(raster, interpolation="none", aspect="auto", extent=(0, 1, 0, 1))


def _key(scene: Scene) -> list[Group]:
    faults = tuple(Entry(f"{word} ({count})", verdict_symbol(word, "patch")) for word, count in scene.counts if count)
    groups = [Group("Verdict on the fault", faults)]
    if scene.glyphs:
        several = len({round(glyph.size_m, 3) for glyph in scene.glyphs}) > 1
        text = [Entry("dark cones press along \u03c31, the lens is long along \u03c33")]
        text += [Entry("large: all faults together"), Entry("small: pairs, where they meet")] if several else []
        groups.append(Group("Stress", tuple(text)))
    return groups


def _coordinates(axes: Axes, scene: Scene, project: Project, page: Box, taken: list[Box]) -> None:
    """Write eastings and northings along the near edges of the floor and heights along a post, and note what they take."""
    (w, s, b), (e, n, t) = scene.low, scene.high
    a = np.radians(scene.view_from_deg)
    near_n, near_e = (s if np.cos(a) < 1e-9 else n), (e if np.sin(a) > -1e-9 else w)
    middle = project((scene.low + scene.high)[None] / 2)[0]
    glyphs = _large_glyphs(scene, project)
    edges = [(0, (w, near_n, b), (e, near_n, b), "easting, m"), (1, (near_e, s, b), (near_e, n, b), "northing, m")]
    if scene.elevation_deg < 60:
        posts = [((x, y, b), (x, y, t)) for x in (w, e) for y in (s, n)]
        edges.append((2, *min(posts, key=lambda post: project(np.array([post[0]]))[0, 0]), "up, m"))
    for axis, start, end, word in edges:
        own = [*taken, *glyphs]
        _edge(axes, scene, project, (axis, np.array(start), np.array(end), word), middle, page, own)
        taken += own[len(taken) + len(glyphs) :]


def _large_glyphs(scene: Scene, project: Project) -> list[Box]:
    """Return the boxes of the glyphs beside the model."""
    largest = max((glyph.size_m for glyph in scene.glyphs), default=0.0)
    boxes = []
    for glyph in scene.glyphs:
        if glyph.size_m > 0.99 * largest:
            ends = project(glyph.place + glyph.size_m * np.concatenate([glyph.axes, -glyph.axes]))
            boxes.append((*ends.min(0), *ends.max(0)))
    return boxes


def _edge(
    axes: Axes,
    scene: Scene,
    project: Project,
    edge: tuple[int, Floats, Floats, str],
    middle: Floats,
    page: Box,
    taken: list[Box],
) -> None:
    """Write round coordinates along one edge, outside the model, and what they are."""
    axis, start, end, word = edge
    ends = project(np.stack([start, end]))
    long = float(np.linalg.norm(ends[1] - ends[0]))
    if long < (5.0 if axis == 2 else 14.0):
        return
    along = (ends[1] - ends[0]) / long
    out = np.array([-along[1], along[0]])
    out = out if out @ (ends.mean(0) - middle) >= 0 else -out
    low, high = start[axis] + scene.origin[axis], end[axis] + scene.origin[axis]
    widest = max(width_of(_number(v), SMALL_PT) for v in (low, high))
    apart = (abs(along[0]) * (widest + 4.0) + abs(along[1]) * 4.0) if axis != 2 else 4.5
    step = _round_step((high - low) * apart / long)
    values = np.arange(np.ceil(low / step - 1e-9), np.floor(high / step + 1e-9) + 1) * step
    if len(values) > 6:
        values = values[:: -(-len(values) // 6)]
    for value in values:
        point = ends[0] + (value - low) / (high - low) * (ends[1] - ends[0])
        if _outside(axes, point, out, 1.9, _number(value), page, taken):
            axes.plot(*np.stack([point, point + 1.2 * out]).T, color=GREY, linewidth=0.6)
    beyond = 2.8 + abs(out[0]) * (widest if len(values) else 0.0) + abs(out[1]) * (3.0 if len(values) else 0.0)
    if axis != 2 and _outside(axes, ends.mean(0), out, beyond, word, page, taken):
        return
    top, aside = int(np.argmax(ends[:, 1])), (0.0 if axis == 2 else 4.0) * out
    if not _outside(axes, ends[top] + aside, np.array([0.0, 1.0]), 1.5, word, page, taken):
        _outside(axes, ends[1 - top] + aside, np.array([0.0, -1.0]), 2.5, word, page, taken)


def _outside(axes: Axes, point: Floats, out: Floats, gap: float, text: str, page: Box, taken: list[Box]) -> bool:
    """Write words beside a point in a direction, unless they would cover others or leave the page; return whether."""
    half = np.array([width_of(text, SMALL_PT), 1.1 * SMALL_PT * POINT_MM]) / 2
    centre = point + out * (gap + np.abs(out) @ half)
    box = (*(centre - half), *(centre + half))
    if not (_free(box, taken) and _within(box, page)):
        return False
    taken.append(box)
    words(axes, centre[0], centre[1], text, SMALL_PT, color=GREY, ha="center")
    return True


def _free(box: Box, taken: list[Box]) -> bool:
    return not any(box[0] < b[2] and b[0] < box[2] and box[1] < b[3] and b[1] < box[3] for b in taken)


def _within(box: Box, page: Box) -> bool:
    return box[0] > page[0] and box[1] > page[1] and box[2] < page[2] and box[3] < page[3]


def _number(value: float) -> str:
    return f"{value + 0.0:,.0f}".replace(",", "\u2009")


def _round_step(length: float) -> float:
    """Return the round number (1, 2 or 5 times a power of ten) at or above a length."""
    power = 10.0 ** np.floor(np.log10(max(length, 1e-9)))
    return float(next(m * power for m in (1, 2, 5, 10) if m * power >= length * 0.999))


def _compass(axes: Axes, scene: Scene, page: Box) -> Box:
    """Draw a level circle as it is seen from the viewpoint, with an arrow to the north, in the upper right corner."""
    radius = float(np.clip((page[2] - page[0]) * 0.035, 3.5, 6.0))
    a, up = np.radians(scene.view_from_deg), np.sin(np.radians(scene.elevation_deg))
    centre = np.array([page[2] - radius - 7.0, page[3] - radius - 5.0])

    def level(azimuth: Floats | float) -> Floats:
        east, north = np.sin(np.asarray(azimuth)), np.cos(np.asarray(azimuth))
        return np.stack([-np.cos(a) * east + np.sin(a) * north, -up * (np.sin(a) * east + np.cos(a) * north)], -1) * radius + centre

    axes.plot(*level(np.linspace(0, 2 * np.pi, 73)).T, color=GREY, linewidth=0.6)
    for azimuth in np.radians([90, 180, 270]):
        axes.plot(*np.stack([level(azimuth), centre + 0.8 * (level(azimuth) - centre)]).T, color=GREY, linewidth=0.6)
    tip = level(0.0)
    tail = 2 * centre - tip
    axes.add_patch(
        FancyArrowPatch(
            (tail[0], tail[1]), (tip[0], tip[1]), arrowstyle="-|>", mutation_scale=7, color=INK, linewidth=1.1, shrinkA=0, shrinkB=0
        )
    )
    away = (tip - centre) / max(float(np.linalg.norm(tip - centre)), 1e-9)
    words(axes, tip[0] + away[0] * 2.4, tip[1] + away[1] * 2.4, "N", TEXT_PT, ha="center", weight="bold")
    reach = radius + 4.5
    return (centre[0] - reach, centre[1] - reach, centre[0] + reach, centre[1] + reach)


def _scale_bar(axes: Axes, scene: Scene, project: Project, page: Box) -> Box:
    """Draw a bar of a round length in the lower right corner; lengths across the view are true in parallel projection."""
    across = seen_size(scene)[0]
    a = np.radians(scene.view_from_deg)
    ends = project(np.array([[0.0, 0, 0], [-np.cos(a), np.sin(a), 0.0]]) * across)
    per_m = float(np.linalg.norm(ends[1] - ends[0])) / across
    length = _round_step((page[2] - page[0]) * 0.09 / per_m)
    long = length * per_m
    right, bottom = page[2] - 5.0, page[1] + 3.0
    axes.plot([right - long, right], [bottom, bottom], color=INK, linewidth=1.4, solid_capstyle="butt")
    for x in (right - long, right):
        axes.plot([x, x], [bottom - 0.7, bottom + 0.7], color=INK, linewidth=0.8)
    text = f"{length / 1000:g} km" if length >= 1000 else f"{length:g} m"
    words(axes, right - long / 2, bottom + 2.2, text, SMALL_PT, ha="center")
    return (right - long - 2, bottom - 1, right + 2, bottom + 4)


def _names(axes: Axes, scene: Scene, project: Project, page: Box, taken: list[Box]) -> None:
    """Write names over their faults; one that would cover a more wanted one, or leave the page, is left out."""
    for label in scene.labels:
        strong = label.kind in ("conflicting", "phase")
        size = TEXT_PT if strong else SMALL_PT
        half = np.array([width_of(label.text, size, "bold" if strong else "normal") + 1.4, 1.25 * size * POINT_MM + 0.6]) / 2
        place = project(label.place[None])[0]
        for up in (2.6, -2.6):
            centre = place + [0.0, up]
            box = (*(centre - half), *(centre + half))
            if _free(box, taken) and _within(box, page):
                taken.append(box)
                _name(axes, place, centre, half, label.text, size, label.kind)
                break


def _name(axes: Axes, place: Floats, centre: Floats, half: Floats, text: str, size: float, kind: str) -> None:
    edge, weight = VERDICTS["conflicting"].colour, "bold" if kind in ("conflicting", "phase") else "normal"
    foot = centre[1] - half[1] if centre[1] > place[1] else centre[1] + half[1]
    axes.plot([place[0], place[0]], [place[1], foot], color=INK, linewidth=0.6, zorder=4)
    zorder = 5 + DEPTH.get(kind, 0)
    if kind == "conflicting":
        axes.add_patch(
            Rectangle(
                (centre[0] - half[0], centre[1] - half[1]),
                2 * half[0],
                2 * half[1],
                facecolor="white",
                edgecolor=edge,
                linewidth=0.8,
                alpha=0.85,
                zorder=zorder,
            )
        )
    else:  # a halo hides less than a box; the words lie over it once more, to remain words in PDF
        halo = words(axes, centre[0], centre[1], text, size, ha="center", weight=weight, zorder=zorder, color="white")
        halo.set_path_effects([Stroke(linewidth=2.6, foreground="white", alpha=0.85)])
    words(axes, centre[0], centre[1], text, size, ha="center", weight=weight, zorder=zorder + 0.5)
