"""Stations: local orientations of a surface at a scale, spread evenly by area."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from scipy.spatial import cKDTree

from structviz.surfaces.geometry import blocks, moments, planes_of_moments
from structviz.surfaces.surface import MeasuredSurface, Stations

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

DEFAULT_RADIUS = 0.15  # of the square root of the area of the largest part


def sample_stations(measured: MeasuredSurface, count: int, radius_m: float | None = None) -> Stations:
    """Return up to `count` stations, one in each block of equal area, with the plane fitted within a radius (m).

    The fit is by the exact second moments of all triangles of the same part whose centroid lies within the radius, so that
    small triangles weigh little and noise at corners averages out. A mesh with fewer triangles than stations has one at each.
    """
    rows = _spread(measured, count)
    radius = radius_m if radius_m is not None else DEFAULT_RADIUS * float(np.sqrt(max(part.area_m2 for part in measured.parts)))
    origin = measured.centroids[rows[0]]
    centroids = measured.centroids - origin
    near = cKDTree(centroids).query_ball_point(centroids[rows], radius)
    lengths = np.array([len(found) for found in near])
    station = np.repeat(np.arange(len(rows)), lengths)
    triangle = np.concatenate([np.asarray(found, np.int64) for found in near])
    own = measured.part_of[triangle] == measured.part_of[rows[station]]
    station, triangle = station[own], triangle[own]
    corners = (measured.surface.vertices - origin)[measured.surface.triangles]
    pick = csr_matrix((np.ones(len(station)), (station, triangle)), shape=(len(rows), len(centroids)))
    planes = planes_of_moments(pick @ moments(corners, measured.areas_m2))
    facing = pick @ (measured.areas_m2[:, None] * measured.normals)
    sign = np.where(np.einsum("sk,sk->s", planes, facing) < 0, -1.0, 1.0)
    return Stations(measured.centroids[rows], planes * sign[:, None], measured.part_of[rows], radius)


def sample_points(measured: MeasuredSurface, count: int) -> Floats:
    """Return up to `count` points (N, 3), m, on the surface, one in each block of equal area."""
    return measured.centroids[_spread(measured, count)]


def _spread(measured: MeasuredSurface, count: int) -> Integers:
    """Return one triangle in each of about `count` blocks of equal area: that nearest to the middle of its block."""
    areas, origin = measured.areas_m2, measured.centroids[0]
    places = measured.centroids - origin
    block = blocks(places, areas, count)
    size = np.bincount(block, areas)
    middle = np.stack([np.bincount(block, areas * places[:, k]) for k in range(3)], 1) / np.maximum(size, 1e-300)[:, None]
    away = ((places - middle[block]) ** 2).sum(1)
    away[areas == 0] = np.inf
    order = np.lexsort((away, block))
    first = np.ones(len(order), bool)
    first[1:] = block[order][1:] != block[order][:-1]
    rows = order[first]
    return rows[areas[rows] > 0]
