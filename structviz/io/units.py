"""Units and vertical datum: converted once, here, and remembered in the history of the surface."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.io.format import Piece
from structviz.surfaces.surface import Surface

METRES = {"m": 1.0, "km": 1000.0, "ft": 0.3048, "us-ft": 1200.0 / 3937.0}  # international foot; US survey foot
VERTICAL = ("elevation", "depth")


@dataclass(frozen=True)
class Frame:
    """The unit of all coordinates of a model and what its third one means."""

    length_unit: str = "m"
    vertical: str = "elevation"

    @property
    def history(self) -> tuple[str, ...]:
        """What conversion does, in words; empty where there is nothing to convert."""
        words = [] if self.length_unit == "m" else [f"coordinates converted from {self.length_unit} to m"]
        if self.vertical == "depth":
            words.append("depth (down positive) turned into elevation (up positive), triangles wound the other way round")
        return tuple(words)


def places_m(frame: Frame, places: ArrayLike) -> NDArray[np.float64]:
    """Return places (..., 3) of easting, northing, up or depth as easting, northing, up in metres."""
    converted = np.asarray(places, dtype=np.float64) * METRES[frame.length_unit]
    if frame.vertical == "depth":
        converted = converted * [1.0, 1.0, -1.0] + 0.0  # adding zero turns -0.0 into 0.0
    return converted


def surface_m(frame: Frame, piece: Piece, name: str, source: str) -> Surface:
    """Return a surface in metres, up positive. Negating depth mirrors it, so its triangles are turned to keep their side.

    A piece whose file states its own units and datum is already so and is left alone.
    """
    vertices, triangles = piece.vertices, piece.triangles
    if piece.framed:
        return Surface(name, vertices, triangles, source, piece.history)
    if frame.history:
        vertices = places_m(frame, vertices)
    if frame.vertical == "depth":
        triangles = np.ascontiguousarray(triangles[:, [0, 2, 1]])
    return Surface(name, vertices, triangles, source, (*piece.history, *frame.history))
