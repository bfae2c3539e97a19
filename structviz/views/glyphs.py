"""The stress glyph: a lens pressed between two dark thumbs, as plain triangle meshes.

sigma1 presses the lens flat from both sides, sigma3 is its long axis, sigma2 the one between. Shape alone carries the order of
the axes, so that it reads from any angle, in grey, and without a legend of arrows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

LENS = (0.25, 0.47, 1.0)  # half-lengths along sigma1, sigma2, sigma3, in units of the size; about 1 : 2 : 4 tells the last two best
THUMB_GAP, THUMB_LENGTH, THUMB_RADIUS = 0.30, 0.75, 0.26
SIDES = 32


@dataclass(frozen=True, eq=False)
class GlyphPart:
    """One mesh of a glyph in the frame of its axes: columns along sigma1, sigma2, sigma3."""

    role: str  # "lens" | "thumb"
    vertices: Floats  # (V, 3)
    triangles: NDArray[np.int64]


def stress_glyph() -> tuple[GlyphPart, ...]:
    """Return the parts of a glyph of size one, in the frame of its axes."""
    return (_lens(), _thumb(1.0), _thumb(-1.0))


def placed(part: GlyphPart, axes: Floats, place: Floats, size_m: float) -> Floats:
    """Return the vertices of a part at a place, (V, 3) m, turned into axes (3, 3) with rows sigma1, sigma2, sigma3."""
    return size_m * part.vertices @ axes + place


def _lens(rings: int = 16) -> GlyphPart:
    latitude = np.linspace(-np.pi / 2, np.pi / 2, rings + 1)
    longitude = np.linspace(0, 2 * np.pi, SIDES, endpoint=False)
    lat, lon = np.meshgrid(latitude, longitude, indexing="ij")
    sphere = np.stack([np.sin(lat), np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon)], -1).reshape(-1, 3)
    return GlyphPart("lens", sphere * LENS, _quads(rings, SIDES))


def _thumb(side: float) -> GlyphPart:
    """Return a cone on the sigma1 axis whose tip presses the lens from one side."""
    angle = np.linspace(0, 2 * np.pi, SIDES, endpoint=False)
    circle = np.stack([np.full(SIDES, THUMB_GAP + THUMB_LENGTH), THUMB_RADIUS * np.cos(angle), THUMB_RADIUS * np.sin(angle)], 1)
    vertices = np.concatenate([[[THUMB_GAP, 0, 0]], circle, [[THUMB_GAP + THUMB_LENGTH, 0, 0]]]) * [side, 1, 1]
    here, there = 1 + np.arange(SIDES), 1 + (np.arange(SIDES) + 1) % SIDES
    tip, base = np.zeros(SIDES, int), np.full(SIDES, SIDES + 1)
    return GlyphPart("thumb", vertices, np.concatenate([np.stack([tip, there, here], 1), np.stack([base, here, there], 1)]))


def _quads(rows: int, columns: int) -> NDArray[np.int64]:
    """Return two triangles for every cell of a grid that closes on itself along its columns."""
    i, j = np.meshgrid(np.arange(rows), np.arange(columns), indexing="ij")
    a, b = i * columns + j, i * columns + (j + 1) % columns
    c, d = a + columns, b + columns
    return np.concatenate([np.stack([a, b, d], -1).reshape(-1, 3), np.stack([a, d, c], -1).reshape(-1, 3)])
