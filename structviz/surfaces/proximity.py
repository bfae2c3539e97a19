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
    order = np.argsort(-grasp, kind="stable")
    tree = cKDTree(centres)
    found = [np.zeros((0, 2), np.int64)]
    # Each fault looks as far as itself plus the largest grasp; what is not mutual is dropped after.
    near = tree.query_ball_point(centres, grasp + grasp[order[0]] if len(order) else grasp)
    for number, others in enumerate(near):
        later = np.array([other for other in others if other > number], np.int64)
        later.sort()
        found.append(np.stack([np.full(len(later), number), later], 1))
    pairs = np.concatenate(found)
    apart = np.sqrt(((centres[pairs[:, 0]] - centres[pairs[:, 1]]) ** 2).sum(1))
    return pairs[apart <= grasp[pairs[:, 0]] + grasp[pairs[:, 1]]]


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
