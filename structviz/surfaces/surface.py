"""A surface as it was read, and the same surface measured."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Surface:
    """One triangulated surface as it was read, in metres, up positive."""

    name: str
    vertices: Floats  # (V, 3) easting, northing, up, m
    triangles: Integers  # (T, 3) rows of vertices
    source: str = ""  # the file (and part) it came from, for messages
    history: tuple[str, ...] = ()  # what reading did to it, in words: units, datum, mixed cells split


@dataclass(frozen=True)
class Part:
    """One connected piece of a surface and its mean orientation."""

    triangles: int
    area_m2: float
    normal: tuple[float, float, float]  # unit mean, hanging-wall side
    strike_deg: float
    dip_deg: float
    spread_deg: float  # area-weighted root mean square angle of the triangles from the mean


@dataclass(frozen=True, eq=False)
class Condition:
    """Defects of a surface, counted and located (rows of triangles or vertices); nothing is repaired here."""

    duplicate_vertices: int = 0  # vertices at the place of another
    unused_vertices: int = 0
    zero_area: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # triangles
    flipped: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # triangles wound against their part
    repeated: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # triangles that repeat another
    nonmanifold_edges: Integers = field(default_factory=lambda: np.zeros((0, 2), np.int64))  # edges of three or more triangles
    not_orientable: bool = False  # no consistent winding exists (a Moebius strip)
    rims: int = 0  # closed boundary loops
    holes: int = 0  # boundary loops beyond the outer one of each part
    pinched_vertices: int = 0  # places where the surface touches itself in a point
    pinched: Integers = field(default_factory=lambda: np.zeros(0, np.int64))  # the first vertex at each of them
    unorientable_parts: tuple[int, ...] = ()  # parts without a consistent winding


@dataclass(frozen=True, eq=False)
class MeasuredSurface:
    """A surface with the geometry that every later step needs. Triangles keep the order of the surface."""

    surface: Surface
    areas_m2: Floats  # (T,)
    centroids: Floats  # (T, 3) m
    normals: Floats  # (T, 3) unit, one winding a part, hanging-wall side; zero where the area is zero
    part_of: Integers  # (T,) part number
    parts: tuple[Part, ...]  # largest first
    normal: Floats  # (3,) unit mean normal of the surface, hanging-wall side
    strike_deg: float
    dip_deg: float
    cone_deg: float  # 95 % cone of confidence about the mean normal
    meaningful: bool  # False where parts dip opposite ways, so that a mean plane says nothing
    why_not: str  # reason in words where not meaningful
    condition: Condition

    @property
    def area_m2(self) -> float:
        """Total area, m2."""
        return float(self.areas_m2.sum())


@dataclass(frozen=True, eq=False)
class Stations:
    """Local orientations of one surface, spread evenly by area, each fitted within a radius."""

    places: Floats  # (S, 3) m, on the surface
    normals: Floats  # (S, 3) unit, hanging-wall side
    part_of: Integers  # (S,)
    radius_m: float
