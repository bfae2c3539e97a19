"""Paper to print on: a matplotlib figure measured in millimetres, its key, and one way to write it as PNG, SVG or PDF.

Letters are DejaVu Sans, which has the Greek ones: embedded in PDF, as outlines in SVG, since a reader of SVG may lack the font.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties
from matplotlib.patches import Rectangle
from matplotlib.textpath import text_to_path

from structviz.views.palette import INK, VERDICTS

FONT = "DejaVu Sans"
MM = 25.4  # in an inch
POINT_MM = MM / 72
SMALL_PT, TEXT_PT, LARGE_PT = 6.5, 7.5, 9.0  # nothing is set smaller than six points
ROW_MM, SYMBOL_MM, GAP_MM, EDGE_MM = 4.6, 7.0, 5.0, 2.0
STYLE = {"svg.hashsalt": "structviz", "svg.fonttype": "path", "pdf.fonttype": 42, "pdf.compression": 9, "image.composite_image": False}
MARKS = {"consistent": "o", "undetermined": "s", "conflicting": "^"}  # of single points, where neither line nor dash can tell


@dataclass(frozen=True)
class Symbol:
    """What stands before the words of a key: a line, a mark, a patch, or a line with a mark on it."""

    kind: str  # "line" | "mark" | "patch"
    colour: str
    marker: str = ""
    face: str = ""  # empty for the colour itself
    width_pt: float = 1.0
    dash: tuple[float, ...] = ()
    size_pt: float = 5.0


@dataclass(frozen=True)
class Entry:
    """One row of a key."""

    text: str
    symbol: Symbol | None = None


@dataclass(frozen=True)
class Group:
    """Rows of a key under a heading."""

    heading: str
    entries: tuple[Entry, ...]


def sheet(width_mm: float, height_mm: float) -> Figure:
    """Return an empty white figure of that size."""
    figure = Figure(figsize=(width_mm / MM, height_mm / MM), dpi=72, facecolor="white")
    FigureCanvasAgg(figure)
    return figure


def axes_mm(figure: Figure, left: float, bottom: float, width: float, height: float) -> Axes:
    """Return axes without a frame on that part of a figure, all in mm from its lower left corner."""
    w, h = figure.get_size_inches() * MM
    axes = figure.add_axes((left / w, bottom / h, width / w, height / h))
    axes.axis("off")
    return axes


def paper(figure: Figure) -> Axes:
    """Return axes over a whole figure whose units are millimetres."""
    w, h = figure.get_size_inches() * MM
    axes = axes_mm(figure, 0, 0, w, h)
    axes.set(xlim=(0, w), ylim=(0, h))
    return axes


def words(axes: Axes, x: float, y: float, text: str, size_pt: float = TEXT_PT, **style: Any) -> Any:
    """Write words as they are, dollar signs and all; return the artist."""
    given = {"color": INK, "va": "center", "family": FONT, "parse_math": False, **style}
    return axes.text(x, y, text, fontsize=max(size_pt, 6.0), **given)


def width_of(text: str, size_pt: float = TEXT_PT, weight: str = "normal") -> float:
    """Return how wide a line of words is, mm."""
    font = FontProperties(family=FONT, size=size_pt, weight=weight)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # letters the font lacks are measured as the box that stands for them
        return float(text_to_path.get_text_width_height_descent(text, font, False)[0]) * POINT_MM


def verdict_symbol(word: str, kind: str) -> Symbol:
    """Return how a verdict looks in a key: width and dash carry it where colour cannot, and the shape of a mark."""
    look = VERDICTS[word]
    if kind == "mark":
        edge = INK if word == "conflicting" else look.colour
        return Symbol("mark", edge, MARKS[word], "white" if word == "undetermined" else look.colour, 0.8, (), MARK_PT[word])
    return Symbol(kind, look.colour, width_pt=look.width, dash=look.dash)


MARK_PT = {"consistent": 2.6, "undetermined": 3.2, "conflicting": 5.0}


def patch_style(word: str) -> dict[str, Any]:
    """Return how an area of a verdict is filled and edged: dark with a heavy edge, middling with none, light with a dashed one."""
    edges = {"conflicting": (INK, 1.1, "-"), "consistent": ("white", 0.4, "-"), "undetermined": (INK, 0.5, (0, (2.5, 1.8)))}
    edge, width, dash = edges[word]
    return {"facecolor": VERDICTS[word].colour, "edgecolor": edge, "linewidth": width, "linestyle": dash}


def key_height(groups: Sequence[Group], width_mm: float) -> float:
    """Return how high a key is that runs in rows across a width, mm."""
    return ROW_MM * (1 + max((row for _, row, _ in _flow(groups, width_mm)), default=-1))


def key_below(axes: Axes, groups: Sequence[Group], left: float, top: float, width: float) -> None:
    """Write a key in rows across a width; axes in mm."""
    for x, row, entry in _flow(groups, width):
        _entry(axes, entry, left + x, top - (row + 0.5) * ROW_MM)


def _flow(groups: Sequence[Group], width: float) -> Iterator[tuple[float, int, Entry | str]]:
    """Give where each heading and entry starts: mm from the left, and row; every group starts a row of its own."""
    row = -1
    for group in groups:
        row, x = row + 1, 0.0
        for entry in _fitting(group, width):
            wide = _wide(entry)
            if x > 0 and x + wide > width:
                row, x = row + 1, 0.0
            yield x, row, entry
            x += wide + GAP_MM


def _fitting(group: Group, width: float) -> Iterator[Entry | str]:
    """Give the heading and the entries of a group; words alone that are too long for the width are broken into lines."""
    if group.heading:
        yield group.heading
    for entry in group.entries:
        if entry.symbol or _wide(entry) <= width:
            yield entry
            continue
        line = ""
        for word in entry.text.split():
            if line and width_of(f"{line} {word}") > width:
                yield Entry(line)
                line = ""
            line = f"{line} {word}".strip()
        yield Entry(line)


def _wide(entry: Entry | str) -> float:
    if isinstance(entry, str):
        return width_of(entry, TEXT_PT, "bold")
    return width_of(entry.text) + (SYMBOL_MM + 1.5 if entry.symbol else 0.0)


def key_beside(axes: Axes, groups: Sequence[Group], left: float, top: float) -> float:
    """Write a key as a column and return where it ends; axes in mm."""
    y = top
    for group in groups:
        if group.heading:
            _entry(axes, group.heading, left, y)
            y -= ROW_MM * 1.1
        for entry in group.entries:
            _entry(axes, entry, left, y)
            y -= ROW_MM
        y -= ROW_MM * 0.5
    return y


def beside_width(groups: Sequence[Group]) -> float:
    """Return how wide a key is as a column, mm."""
    headings = [_wide(group.heading) for group in groups]
    return max([*headings, *(_wide(entry) for group in groups for entry in group.entries)])


def column_height(groups: Sequence[Group]) -> float:
    """Return how high a key is as a column, mm."""
    return sum(ROW_MM * ((1.1 if group.heading else 0.0) + len(group.entries) + 0.5) for group in groups)


def _entry(axes: Axes, entry: Entry | str, x: float, y: float) -> None:
    if isinstance(entry, str):
        words(axes, x, y, entry, weight="bold")
        return
    if entry.symbol:
        _symbol(axes, entry.symbol, x, y)
    words(axes, x + (SYMBOL_MM + 1.5 if entry.symbol else 0.0), y, entry.text)


def _symbol(axes: Axes, symbol: Symbol, x: float, y: float) -> None:
    if symbol.kind == "patch":
        word = next(word for word, look in VERDICTS.items() if look.colour == symbol.colour)
        axes.add_patch(Rectangle((x, y - 1.4), SYMBOL_MM, 2.8, **patch_style(word)))
        return
    if symbol.kind == "line":
        dash = (0, symbol.dash) if symbol.dash else "-"
        axes.plot([x, x + SYMBOL_MM], [y, y], color=symbol.colour, linewidth=symbol.width_pt, linestyle=dash, solid_capstyle="butt")
    if symbol.marker:
        axes.plot(
            x + SYMBOL_MM / 2, y, marker=symbol.marker, markersize=symbol.size_pt, color=symbol.colour,
            markerfacecolor=symbol.face or symbol.colour, markeredgecolor=symbol.colour, markeredgewidth=symbol.width_pt,
        )  # fmt: skip


def verdict_group(counts: Sequence[tuple[str, int]], kind: str, heading: str = "Faults, as judged by the others") -> Group:
    """Return the key of the verdicts; a word that no fault has is left out."""
    return Group(heading, tuple(Entry(f"{word} ({count})", verdict_symbol(word, kind)) for word, count in counts if count))


def save(figure: Figure, path: Path, dpi: int, title: str) -> None:
    """Write a figure in the format its suffix names, in its true size; the same figure gives the same bytes."""
    kind, (wide, high) = path.suffix[1:], map(float, figure.get_size_inches())
    metadata = {"png": {"Software": None}, "svg": {"Date": None, "Creator": "structviz", "Title": title}}
    metadata["pdf"] = {"CreationDate": None, "Creator": "structviz", "Producer": None, "Title": title}
    with mpl.rc_context(STYLE), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing")  # a letter the font lacks is drawn as a box
        if kind == "png":  # whole pixels, so that a picture in it is not resampled
            figure.set_size_inches((round(wide * dpi) + 1e-6) / dpi, (round(high * dpi) + 1e-6) / dpi)
        try:
            figure.savefig(path, format=kind, dpi=dpi, metadata=metadata[kind])
        finally:
            figure.set_size_inches(wide, high)
