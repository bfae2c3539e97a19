"""Stations: local orientations of a surface at a scale, spread evenly by area."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz._validate import check_range
from structviz.errors import ArgumentError
from structviz.surfaces.geometry import blocks, middles, moments, pieces, planes_of_moments
from structviz.surfaces.surface import MeasuredSurface, Stations

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

DEFAULT_RADIUS = 0.15  # of the square root of the area of the largest part
PIECES = 4  # pieces a block should have at least: a triangle is cut where it is larger than that
CHUNK = 65_536  # entries of a table of stations by triangles held at once: what stays in the cache
# A block's middle may lie as near to one triangle as to another; a nudge in an odd direction settles which, whatever their order.
NUDGE = 1e-6 * np.array([0.61, 0.35, 0.71])


def sample_stations(measured: MeasuredSurface, count: int, radius_m: float | None = None) -> Stations:
    """Return `count` stations, one in each block of equal area, with the plane fitted within a radius (m).

    Normals point to the hanging wall. The fit is by the exact second moments of all triangles of the same part whose
    centroid lies within the radius, so that small triangles weigh little and noise at corners averages out. Triangles larger
    than a quarter of a block are cut first, so that one triangle has stations all over it. The default radius is
    0.15 of the square root of the area of the largest part. Raises ArgumentError for a count below 1 or a radius not above 0.
    """
    radius = _radius(measured, radius_m)
    corners, areas, row, origin = _cut(measured, count)
    centroids = middles(corners)
    chosen = _spread(centroids, areas, count)
    part = measured.part_of[row]
    facing = areas[:, None] * measured.normals[row]
    sums = _sums_within(corners, centroids, areas, facing, part if len(measured.parts) > 1 else None, chosen, radius)
    planes = planes_of_moments(sums[:, :10])
    sign = np.where(np.einsum("sk,sk->s", planes, sums[:, 10:]) < 0, -1.0, 1.0)
    return Stations(centroids[chosen] + origin, planes * sign[:, None], part[chosen], radius)


def sample_points(measured: MeasuredSurface, count: int) -> Floats:
    """Return `count` points (count, 3), m, on the surface, one in each block of equal area. ArgumentError for a count below 1."""
    corners, areas, _, origin = _cut(measured, count)
    centroids = middles(corners)
    return centroids[_spread(centroids, areas, count)] + origin


def _radius(measured: MeasuredSurface, radius_m: float | None) -> float:
    if radius_m is None:
        return DEFAULT_RADIUS * float(np.sqrt(max(part.area_m2 for part in measured.parts)))
    check_range("radius_m", radius_m, 1e-9, 1e12, "m")
    return float(radius_m)


def _cut(measured: MeasuredSurface, count: int) -> tuple[Floats, Floats, Integers, Floats]:
    """Return corners about an origin (Q, 3, 3), areas (Q,) and rows (Q,) of the pieces to choose from, and the origin (3,)."""
    if count < 1:
        raise ArgumentError(f"count: found {count}; wanted 1 or more", hint="24 stations suit most faults")
    origin = measured.surface.vertices[measured.surface.triangles[0, 0]]
    corners = np.take(measured.surface.vertices - origin, measured.surface.triangles, axis=0)
    return *pieces(corners, measured.areas_m2, PIECES * count), origin


def _spread(places: Floats, areas: Floats, count: int) -> Integers:
    """Return one triangle in each of `count` blocks of equal area, in order of block: that nearest to the middle of its block."""
    block = blocks(places, areas, count)
    size = np.bincount(block, areas, minlength=count)
    middle = np.stack([np.bincount(block, areas * places[:, k], minlength=count) for k in range(3)], 1)
    middle = middle / np.maximum(size, 1e-300)[:, None] + NUDGE * np.sqrt(areas.sum())
    away = places - middle[block]
    away = np.where(areas > 0, away[:, 0] ** 2 + away[:, 1] ** 2 + away[:, 2] ** 2, np.inf)
    least = np.full(count, np.inf)
    np.minimum.at(least, block, away)
    nearest = np.flatnonzero((away == least[block]) & (areas > 0))[::-1]
    chosen = np.full(count, -1, np.int64)
    chosen[block[nearest]] = nearest
    return chosen[chosen >= 0]


def _sums_within(
    corners: Floats, places: Floats, areas: Floats, facing: Floats, part: Integers | None, chosen: Integers, radius: float
) -> Floats:
    """Return the moments and the facing summed over all triangles of the same part within a radius of each chosen one, shape (S, 13)."""
    centres = places[chosen]
    limit = (radius**2 - np.einsum("sk,sk->s", centres, centres))[:, None]
    # |p|^2 - 2 c.p <= r^2 - |c|^2 as one matrix product, the squares being one more coordinate.
    centre = np.concatenate([-2.0 * centres, np.ones((len(chosen), 1))], 1)
    sums = np.zeros((len(chosen), 13))
    step = max(256, CHUNK // len(chosen))
    for begin in range(0, len(places), step):
        here = slice(begin, begin + step)
        columns = np.concatenate([moments(corners[here], areas[here]), facing[here].T])
        place = np.concatenate([places[here].T, np.einsum("qk,qk->q", places[here], places[here])[None]])
        within = centre @ place <= limit
        own = np.flatnonzero((chosen >= begin) & (chosen < begin + step))
        within[own, chosen[own] - begin] = True  # its own triangle counts whatever the rounding
        if part is not None:
            within &= part[chosen][:, None] == part[here]
        sums += within.astype(float) @ columns.T
    return sums
