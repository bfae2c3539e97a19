"""Plots made short for the page: what many marks have in common is said once."""

from __future__ import annotations

import re
from itertools import groupby

FALLBACK = re.compile(r"var\(--([\w-]+), #[0-9a-f]{6}\)")  # for plots that stand alone; the page has all colours as variables
DOTS = re.compile(r'(?:<circle cx="[^"]+" cy="[^"]+" r="[^"]+" fill="[^"]+" fill-opacity="[^"]+"/>){3,}')
DOT = re.compile(r'<circle cx="([^"]+)" cy="([^"]+)" r="([^"]+)" fill="([^"]+)" fill-opacity="([^"]+)"/>')
LINE = re.compile(r' d="([^"]+)"')
LONG = re.compile(r"\d+\.\d\d+")


def compact(svg: str) -> str:
    """Return a plot that looks the same: dots that are alike as one path of round points, lines to a tenth of a unit.

    >>> compact('<circle cx="1" cy="2" r="1.7" fill="var(--ink, #22303c)" fill-opacity="0.8"/>' * 3)
    '<path d="M1,2h0M1,2h0M1,2h0" fill="none" stroke="var(--ink)" stroke-opacity="0.8" stroke-width="3.4" stroke-linecap="round"/>'
    """
    shorter = LINE.sub(lambda found: f' d="{LONG.sub(_to_a_tenth, found[1])}"', FALLBACK.sub(r"var(--\1)", svg))
    return DOTS.sub(lambda found: "".join(_as_path(found[0])), shorter)


def _to_a_tenth(found: re.Match[str]) -> str:
    return f"{round(float(found[0]), 1):g}"


def _as_path(circles: str) -> list[str]:
    """Return runs of circles of one size and colour, each as one path."""
    paths = []
    for (radius, fill, opacity), run in groupby(DOT.findall(circles), key=lambda dot: dot[2:]):
        steps = "".join(f"M{LONG.sub(_to_a_tenth, x)},{LONG.sub(_to_a_tenth, y)}h0" for x, y, *_ in run)
        style = f'stroke="{fill}" stroke-opacity="{opacity}" stroke-width="{2 * float(radius):g}" stroke-linecap="round"'
        paths.append(f'<path d="{steps}" fill="none" {style}/>')
    return paths
