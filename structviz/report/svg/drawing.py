"""The few marks that plots are made of, as SVG text."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from structviz.report.names import printable
from structviz.views.palette import FAINT, HAIR, INK, SIGMA, VERDICTS

VARIABLES = {"ink": INK, "faint": FAINT, "hair": HAIR, "paper": "#fbfaf7"}
VARIABLES |= {word: look.colour for word, look in VERDICTS.items()} | {f"sigma{k + 1}": colour for k, colour in enumerate(SIGMA)}


def colour(name: str) -> str:
    """Return a colour of the page, with its value in the palette to fall back on."""
    return f"var(--{name}, {VARIABLES[name]})"


def attributes(**values: object) -> str:
    """Return attributes as text; underscores are hyphens, None is left out, values are escaped."""
    return "".join(f' {key.rstrip("_").replace("_", "-")}="{escape(str(value))}"' for key, value in values.items() if value is not None)


def number(value: float, digits: int = 2) -> str:
    """Return a coordinate with so many decimals at most, never minus zero."""
    return f"{round(float(value), digits) + 0.0:g}"


def path(points: ArrayLike, *, closed: bool = False, digits: int = 2, **style: Any) -> str:
    """Return a polyline through points (K, 2)."""
    rows = np.asarray(points, float)
    steps = "L".join(f"{number(x, digits)},{number(y, digits)}" for x, y in rows)
    return f'<path d="M{steps}{"Z" if closed else ""}"{attributes(**style)}/>'


def rings(lines: Iterable[ArrayLike], **style: Any) -> str:
    """Return closed lines through points (K, 2) as one path, so that a rule of filling may leave holes in it."""
    steps = ("L".join(f"{number(x, 1)},{number(y, 1)}" for x, y in np.asarray(line, float)) for line in lines)
    return f'<path d="{"".join(f"M{each}Z" for each in steps)}"{attributes(**style)}/>'


def circle(x: float, y: float, radius: float, **style: Any) -> str:
    """Return a circle."""
    return f'<circle cx="{number(x)}" cy="{number(y)}" r="{number(radius)}"{attributes(**style)}/>'


def text(x: float, y: float, words: str, **style: Any) -> str:
    """Return words at a place; what comes from users' files is made printable and escaped."""
    given = {"fill": colour("ink"), "font_size": 11, "text_anchor": "middle", **style}
    return f'<text x="{number(x)}" y="{number(y)}"{attributes(**given)}>{escape(printable(words, 60))}</text>'


def group(parts: Iterable[str], *, title: str | None = None, **style: Any) -> str:
    """Return parts as one group, with a title that shows under the pointer."""
    told = f"<title>{escape(printable(title, 120))}</title>" if title is not None else ""
    return f"<g{attributes(**style)}>{told}{''.join(parts)}</g>"


def mark(x: float, y: float, kind: str, size: float, **style: Any) -> str:
    """Return a mark: "down" or "up" (triangles), "square", "diamond", "round" or "cross"."""
    if kind == "round":
        return circle(x, y, size * 0.9, **style)
    shapes = {
        "down": [(-1, -0.7), (1, -0.7), (0, 1.1)],
        "up": [(-1, 0.7), (1, 0.7), (0, -1.1)],
        "square": [(-0.8, -0.8), (0.8, -0.8), (0.8, 0.8), (-0.8, 0.8)],
        "diamond": [(0, -1.1), (1.1, 0), (0, 1.1), (-1.1, 0)],
    }
    if kind == "cross":
        s = size * 0.7
        left, right, top, low = (number(v) for v in (x - s, x + s, y - s, y + s))
        return f'<path d="M{left},{top}L{right},{low}M{left},{low}L{right},{top}"{attributes(**style)}/>'
    return path(np.array(shapes[kind]) * size + [x, y], closed=True, **style)


def drawing(width: float, height: float, parts: Iterable[str], *, title: str) -> str:
    """Return a whole SVG with a title for those who hear the page."""
    head = f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {number(width)} {number(height)}" role="img"'
    return f'{head} font-family="inherit"{attributes(aria_label=title)}>{"".join(parts)}</svg>'
