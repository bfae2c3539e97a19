"""How near surfaces come to each other: candidates by bounding spheres, then samples, at a constant cost a pair."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

CHUNK_PAIRS = 2000  # bounds memory: 2000 pairs of 32 by 32 samples are 16 MB


def candidate_pairs(centres: Floats, radii: Floats, reach: Floats) -> Integers:
    """Return pairs (P, 2), first < second, whose bounding spheres come within the sum of their reaches, in order of number.

    centres (F, 3) and radii (F,) of spheres about the surfaces, reach (F,), all m. A tree over the centres keeps far pairs
    from being looked at.
    """
    grasp = radii + reach
    rank = np.empty(len(grasp), np.int64)
    rank[np.argsort(-grasp, kind="stable")] = np.arange(len(grasp))
    # Of two that reach each other the larger finds the smaller within twice its own grasp: one giant costs one long list, not all.
    near = cKDTree(centres).query_ball_point(centres, 2.0 * grasp * (1.0 + 1e-12), return_sorted=False)
    found = [np.zeros((0, 2), np.int64)]
    for number, others in enumerate(near):
        other = np.asarray(others, np.int64)
        other = other[rank[other] > rank[number]]
        apart = np.sqrt(((centres[other] - centres[number]) ** 2).sum(1))
        other = other[apart <= grasp[other] + grasp[number]]
        found.append(np.stack([np.minimum(other, number), np.maximum(other, number)], 1))
    pairs = np.concatenate(found)
    return pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))]


def nearest_approach(samples: Floats, pairs: Integers) -> tuple[Floats, Floats]:
    """Return the least distance (P,) between the samples (F, N, 3) of each pair of surfaces, m, and the midpoint there (P, 3)."""
    distance, places = np.zeros(len(pairs)), np.zeros((len(pairs), 3))
    squares = (samples**2).sum(-1)
    count = samples.shape[1]
    for start in range(0, len(pairs), CHUNK_PAIRS):
        one, two = pairs[start : start + CHUNK_PAIRS].T
        apart = squares[one][:, :, None] + squares[two][:, None, :] - 2 * samples[one] @ np.swapaxes(samples[two], 1, 2)
        best = apart.reshape(len(one), -1).argmin(1)
        here, there = samples[one, best // count], samples[two, best % count]
        distance[start : start + CHUNK_PAIRS] = np.sqrt(((here - there) ** 2).sum(1))
        places[start : start + CHUNK_PAIRS] = (here + there) / 2
    return distance, places


def point_triangle_distance(points: Floats, triangles: Floats) -> tuple[Floats, Floats]:
    """Return the distance (...) from points (..., 3) to triangles (..., 3, 3), and the nearest point on each (..., 3); shapes broadcast.

    The foot of the perpendicular where it falls inside, else the nearest point of the nearest side. A triangle without
    area is its sides.
    """
    a, b, c = triangles[..., 0, :], triangles[..., 1, :], triangles[..., 2, :]
    normal = np.cross(b - a, c - a)
    square = np.einsum("...k,...k->...", normal, normal)
    height = np.einsum("...k,...k->...", points - a, normal) / np.where(square > 0, square, 1.0)
    best = points - height[..., None] * normal
    sides = ((a, b), (b, c), (c, a))
    inner = [np.einsum("...k,...k->...", np.cross(q - p, best - p), normal) >= 0 for p, q in sides]
    inside = inner[0] & inner[1] & inner[2] & (square > 0)
    least = np.where(inside, np.einsum("...k,...k->...", points - best, points - best), np.inf)
    for p, q in sides:
        foot = _foot(points, p, q)
        away = np.einsum("...k,...k->...", points - foot, points - foot)
        best = np.where((away < least)[..., None], foot, best)
        least = np.minimum(least, away)
    return np.sqrt(least), best


def _foot(points: Floats, start: Floats, end: Floats) -> Floats:
    """Return the nearest points of segments, shape (..., 3)."""
    along = end - start
    square = np.einsum("...k,...k->...", along, along)
    share = np.einsum("...k,...k->...", points - start, along) / np.where(square > 0, square, 1.0)
    return start + np.clip(share, 0.0, 1.0)[..., None] * along
