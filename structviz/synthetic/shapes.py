"""Surfaces of known shape: plane, bent, overturning, and rough ones whose mean plane is the plane asked for.

Every surface is built in its own frame: u along strike, v up the dip, w along the hanging-wall normal, metres from its
centre. A relief w(u, v) is bent or corrugated without turning the mean plane, because its mean slope is taken out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import ArgumentError
from structviz.orientation.planes import normals, strike_vectors
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True)
class Relief:
    """How a surface departs from its mean plane. Angles are slopes against that plane, degrees."""

    bend_deg: float = 0.0  # turn to the right from one end to the other, in the plane; the strike turns by this over the sine of the dip
    curve_deg: float = 0.0  # change of dip from bottom to top
    twist_deg: float = 0.0  # change of dip from one end to the other
    corrugation_deg: float = 0.0  # steepest slope of the corrugations
    corrugation_rake_deg: float = 90.0  # the ridges run along this rake
    wavelength_m: float = 1000.0  # of the corrugations
    phase_rad: float = 0.0
    noise_deg: float = 0.0  # pick noise: standard height error of a vertex over the spacing of vertices, as a slope
    jitter: float = 0.0  # in-plane scatter of the vertices, share of their spacing
    taper: float = 0.0  # share of its width that the surface loses towards its ends


def plane_surface(
    name: str, strike_deg: float, dip_deg: float, length_m: float, width_m: float, centre: ArrayLike, *, cells: tuple[int, int] = (8, 5)
) -> Surface:
    """Return a plane rectangle, length along strike and width along dip, wound so that its triangles face the hanging wall.

    Parameters
    ----------
    centre : (3,) easting, northing, up, m.
    cells : rectangles along strike and along dip; each is cut into two triangles.
    """
    normal = normals(strike_deg, dip_deg)
    return relief_surface(name, normal, centre, length_m, width_m, Relief(), cells=cells)


def bent_surface(
    name: str,
    strike_deg: float,
    dip_deg: float,
    length_m: float,
    width_m: float,
    centre: ArrayLike,
    *,
    bend_deg: float,
    cells: tuple[int, int] = (24, 10),
) -> Surface:
    """Return a surface whose strike changes by bend_deg from end to end (to the right if positive) about the mean plane given."""
    in_plane_deg = bend_deg * float(np.sin(np.radians(dip_deg)))
    return relief_surface(name, normals(strike_deg, dip_deg), centre, length_m, width_m, Relief(bend_deg=in_plane_deg), cells=cells)


def overturning_surface(
    name: str,
    strike_deg: float,
    length_m: float,
    width_m: float,
    centre: ArrayLike,
    *,
    dip_deg: float = 88.0,
    change_deg: float = 24.0,
    cells: tuple[int, int] = (16, 12),
) -> Surface:
    """Return a steep surface whose dip passes through vertical: one block stays the hanging wall all the way down.

    The mean plane has the strike and dip given; the dip grows by change_deg from bottom to top, so that with the values
    preset the top dips the other way by 10 degrees.
    """
    relief = Relief(curve_deg=change_deg)
    return relief_surface(name, normals(strike_deg, dip_deg), centre, length_m, width_m, relief, cells=cells)


def relief_surface(
    name: str,
    normal: ArrayLike,
    centre: ArrayLike,
    length_m: float,
    width_m: float,
    relief: Relief,
    *,
    cells: tuple[int, int],
    rng: np.random.Generator | None = None,
    wound_to_hanging_wall: bool = True,
) -> Surface:
    """Return a surface of the relief given whose area-weighted mean normal is exactly the unit normal (3,) given.

    Noise and jitter need a random generator. With wound_to_hanging_wall False every triangle faces the foot wall.
    """
    if length_m <= 0 or width_m <= 0 or min(cells) < 1:
        raise ArgumentError(
            f"length_m, width_m, cells: found {length_m:g}, {width_m:g}, {cells}; wanted positive numbers",
            hint="give the size in metres and at least one cell each way",
        )
    u, v = _nodes(length_m, width_m, cells, relief, rng)
    triangles = _grid_triangles(u, v)
    w = _heights(u, v, length_m, width_m, relief)
    if relief.noise_deg and rng is not None:
        spacing = np.sqrt(length_m * width_m / (cells[0] * cells[1]))
        w = w + rng.normal(0.0, spacing * np.tan(np.radians(relief.noise_deg)), w.shape)
    vertices = _place(normal, centre, u.ravel(), v.ravel(), _level(u.ravel(), v.ravel(), w.ravel(), triangles))
    return Surface(name, vertices, triangles if wound_to_hanging_wall else np.ascontiguousarray(triangles[:, ::-1]), f"synthetic {name}")


def _nodes(
    length_m: float, width_m: float, cells: tuple[int, int], relief: Relief, rng: np.random.Generator | None
) -> tuple[Floats, Floats]:
    """Return u and v of the vertices, shape (cells[0] + 1, cells[1] + 1) each."""
    u, v = np.meshgrid(np.linspace(-0.5, 0.5, cells[0] + 1), np.linspace(-0.5, 0.5, cells[1] + 1), indexing="ij")
    if relief.jitter and rng is not None:
        u = u + rng.uniform(-relief.jitter, relief.jitter, u.shape) / cells[0]
        v = v + rng.uniform(-relief.jitter, relief.jitter, v.shape) / cells[1]
    return u * length_m, v * width_m * (1.0 - relief.taper * np.abs(2.0 * u) ** 3)


def _heights(u: Floats, v: Floats, length_m: float, width_m: float, relief: Relief) -> Floats:
    """Return the departure w of the relief from its plane, noise left out; all terms are even or odd about the centre."""
    bend, curve, twist, slope = np.radians([relief.bend_deg, relief.curve_deg, relief.twist_deg, relief.corrugation_deg])
    w = bend * u**2 / (2 * length_m) + curve * v**2 / (2 * width_m) + twist * u * v / length_m
    if slope:
        rake = np.radians(relief.corrugation_rake_deg)
        across = v * np.cos(rake) - u * np.sin(rake)
        wave = 2 * np.pi / relief.wavelength_m
        w = w + np.tan(slope) / wave * np.cos(wave * across + relief.phase_rad)
    return np.asarray(w, float)


def _grid_triangles(u: Floats, v: Floats) -> Integers:
    """Return the triangles of a bent grid, each cell cut along its shorter diagonal, facing +w, shape (T, 3)."""
    number = np.arange(u.size).reshape(u.shape)
    a, b, c, d = number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]
    ac = np.hypot(u[:-1, :-1] - u[1:, 1:], v[:-1, :-1] - v[1:, 1:])
    bd = np.hypot(u[1:, :-1] - u[:-1, 1:], v[1:, :-1] - v[:-1, 1:])
    first = np.where((ac <= bd)[..., None], np.stack([a, b, c], -1), np.stack([a, b, d], -1))
    second = np.where((ac <= bd)[..., None], np.stack([a, c, d], -1), np.stack([b, c, d], -1))
    return np.stack([first, second], 2).reshape(-1, 3)


def _level(u: Floats, v: Floats, w: Floats, triangles: Integers) -> Floats:
    """Return w with its mean slope taken out, so that the summed area vectors of the triangles point along w."""
    p = np.stack([u, v, w], -1)[triangles]
    total = np.cross(p[:, 1] - p[:, 0], p[:, 2] - p[:, 0]).sum(0)
    return np.asarray(w + (total[0] * u + total[1] * v) / total[2], float)


def _place(normal: ArrayLike, centre: ArrayLike, u: Floats, v: Floats, w: Floats) -> Floats:
    """Return vertices (V, 3) in easting, northing, up of points in the frame of a plane."""
    n = np.asarray(normal, float)
    along = strike_vectors(n)
    frame = np.stack([along, np.cross(n, along), n])
    return np.stack([u, v, w], -1) @ frame + np.asarray(centre, float)
