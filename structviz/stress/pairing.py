"""Which pairs of a model are admissible as conjugate, and how much each weighs, before and after the senses are heard."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from structviz.orientation.vectors import dot, unit
from structviz.stress.conjugate import Floats, Integers, PairLimits, Pairs, conjugate_slips, pair_axes, swap_extremes

SENSE_SOFTNESS = 0.35  # cosine scale over which a slip at the edge of its sector goes from wrong to right
CONTRADICTS = 0.35  # fit below which a slip is on the wrong side of its sector, some 12 deg beyond the edge
CURVED_DEG = 12.0  # station spread from which a fault pairs by its local, not its mean, orientation


@dataclass(frozen=True, eq=False)
class PairSubjects:
    """What pairing needs of F faults."""

    normals: Floats  # (F, 3) unit mean normals, hanging-wall side
    known: np.ndarray  # (F,) bool, False where a mean plane says nothing
    cones_deg: Floats  # (F,) cone of confidence of each mean
    centres: Floats  # (F, 3) m
    sizes_m: Floats  # (F,) square root of area
    edges: Floats  # (F, 2, 3) directions of the declared sector on the mean plane, zero where not declared
    phases: Sequence[str]
    station_places: Floats  # (F, S, 3) m
    station_normals: Floats  # (F, S, 3)


def normals_at(subjects: PairSubjects, faults: Integers, places: Floats) -> Floats:
    """Return the normals with which faults (P,) pair at places (P, 3): the mean, or for curved faults the local one, shape (P, 3)."""
    normals = subjects.normals[faults].copy()
    cosine = np.clip(np.abs(dot(subjects.station_normals, subjects.normals[:, None])), 0, 1)
    curved = np.degrees(np.sqrt(np.mean(np.arccos(cosine) ** 2, axis=1)))[faults] > CURVED_DEG
    if curved.any():
        who = faults[curved]
        away = subjects.station_places[who] - places[curved][:, None]
        share = np.exp(-2 * dot(away, away) / subjects.sizes_m[who][:, None] ** 2) + 1e-9
        local = unit(np.einsum("ps,psk->pk", share, subjects.station_normals[who]))
        normals[curved] = np.where(dot(local, local)[:, None] > 0, local, normals[curved])
    return normals


def admissible_pairs(subjects: PairSubjects, candidates: Integers, distance_m: Floats, places: Floats, limits: PairLimits) -> Pairs:
    """Return the admissible pairs by geometry alone, all read at the acute angle, heaviest first.

    The weight is the product of how near the angle is to the expected one, how near the surfaces are to each other and
    to the line where their planes meet, and how well each plane is determined (common practice, weights of our own).
    """
    first, second = candidates[:, 0], candidates[:, 1]
    n1, n2 = normals_at(subjects, first, places), normals_at(subjects, second, places)
    axes, acute = pair_axes(n1, n2)
    sizes = subjects.sizes_m[first] + subjects.sizes_m[second]
    phases = np.asarray(subjects.phases, dtype=object)
    same_phase = (phases[first] == phases[second]) | (phases[first] == "") | (phases[second] == "")
    keep = same_phase & subjects.known[first] & subjects.known[second] & (distance_m <= limits.reach * sizes)
    keep &= (acute >= limits.narrowest_deg) & (acute <= limits.widest_deg)
    expected = 90.0 - limits.friction_angle_deg
    by_angle = np.exp(-(((acute - expected) / limits.angle_scatter_deg) ** 2) / 2)
    by_distance = np.exp(-((distance_m / (limits.reach * sizes)) ** 2))
    by_planes = np.exp(-(subjects.cones_deg[first] ** 2 + subjects.cones_deg[second] ** 2) / (2 * 20.0**2))
    weight = np.where(keep, by_angle * by_distance * by_planes / (1 + _meeting(subjects, candidates, n1, n2) ** 2), 0.0)
    rows = np.flatnonzero(weight >= limits.least_weight)
    rows = rows[np.lexsort((second[rows], first[rows], -weight[rows]))]
    nothing = np.zeros(len(candidates), bool)
    return Pairs(candidates, acute, nothing, weight, axes, distance_m, places).rows(rows)


def _meeting(subjects: PairSubjects, candidates: Integers, n1: Floats, n2: Floats) -> Floats:
    """Return how far the line where two planes meet lies outside the surfaces, in units of their sizes, shape (P,)."""
    first, second = candidates[:, 0], candidates[:, 1]
    apart = subjects.centres[second] - subjects.centres[first]
    sine = np.sqrt(np.maximum(1 - dot(n1, n2) ** 2, 1e-12))
    out1 = np.abs(dot(apart, n2)) / (sine * subjects.sizes_m[first])
    out2 = np.abs(dot(apart, n1)) / (sine * subjects.sizes_m[second])
    return np.maximum(0.0, np.minimum(out1, out2) - 1.0) / 3.0


def with_senses(pairs: Pairs, subjects: PairSubjects, limits: PairLimits) -> Pairs:
    """Return the pairs weighed by their declared senses, each at the acute or the obtuse angle as its senses decide, heaviest first.

    Pairs whose two senses contradict each other at either angle fall out; those with no sense at all fall out too, since
    they add nothing to the geometry.
    """
    first, second = pairs.faults.T
    slips1 = conjugate_slips(pairs.axes, normals_at(subjects, first, pairs.places))
    slips2 = conjugate_slips(pairs.axes, normals_at(subjects, second, pairs.places))
    declared = np.abs(subjects.edges).sum((1, 2)) > 0
    acute = _fit_of_both(slips1, slips2, subjects.edges[first], subjects.edges[second])
    obtuse = _fit_of_both(-slips1, -slips2, subjects.edges[first], subjects.edges[second])
    swapped = obtuse > acute
    axes = np.where(swapped[:, None, None], swap_extremes(pairs.axes), pairs.axes)
    weight = pairs.weight * np.where(swapped, limits.obtuse_weight * obtuse, acute)
    weight = np.where(declared[first] | declared[second], weight, 0.0)
    rows = np.flatnonzero(weight >= limits.least_weight)
    rows = rows[np.lexsort((second[rows], first[rows], -weight[rows]))]
    return Pairs(pairs.faults, pairs.acute_deg, swapped, weight, axes, pairs.distance_m, pairs.places).rows(rows)


def _fit_of_both(slips1: Floats, slips2: Floats, edges1: Floats, edges2: Floats) -> Floats:
    """Return how well both slips lie in their declared sectors, 0 to 1, shape (P,); 0 where one clearly does not."""
    fits = _fit(slips1, edges1), _fit(slips2, edges2)
    return np.where(np.minimum(*fits) < CONTRADICTS, 0.0, fits[0] * fits[1])


def _fit(slips: Floats, edges: Floats) -> Floats:
    """Return how well slip lies in its declared sector, 0 to 1, shape (P,); 1 where nothing is declared."""
    used = np.abs(edges).sum(-1) > 0
    inside = 1 / (1 + np.exp(-np.einsum("pk,pek->pe", slips, edges) / SENSE_SOFTNESS))
    return np.where(used, inside, 1.0).min(-1)


def partner_support(pairs: Pairs, faults: int) -> Floats:
    """Return how good a partner each fault has, 0 to 1, shape (F,): one minus the chance that none of its pairs is a real one."""
    none = np.ones(faults)
    for column in (0, 1):
        np.multiply.at(none, pairs.faults[:, column], 1 - np.clip(pairs.weight, 0, 0.99))
    return 1 - none
