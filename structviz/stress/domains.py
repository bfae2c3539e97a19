"""Domains: parts of a model, apart from each other, each under a stress of its own, where that explains the faults better than one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.stress.field import LocalData

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

DIRECTIONS = 12  # level directions along which a domain may be cut
LEAST_FAULTS = 6  # in a domain
NUMBERS = 5  # told of a domain beyond the first: three of its axes, one of its shape ratio, one of its boundary
BOUNDARIES = np.log(2.0 * DIRECTIONS)  # nats that the choice of a direction costs


@dataclass(frozen=True, eq=False)
class Domains:
    """How many stresses the model calls for by place, and which faults lie in which."""

    count: int
    membership: Integers  # (F,) domain of each fault; domain 0 holds the most faults
    frames: Floats  # (K, 3, 3) unit rows sigma1, sigma2, sigma3, best of the frames of the data
    middles: Floats  # (K, 3) m, mean place of its faults
    criterion: tuple[float, ...]  # Bayesian information criterion for 1, 2 ... domains, less is better
    why: str


def find_domains(data: LocalData, most: int = 4) -> Domains:
    """Return the domains of a model, at most `most`, each bounded by upright planes [schwarz1978].

    The model is cut in two by the upright plane that gains the most likelihood, and its parts in turn; the number of domains is that
    of the least Bayesian information criterion. Raises ArgumentError for `most` below 1.
    """
    if most < 1:
        raise ArgumentError(f"most: found {most}; wanted 1 or more", hint="4 domains suit most models")
    count = len(data.places)
    homes = [np.zeros(count, np.int64)]
    fits = [_best(data, np.arange(count))]
    while len(fits) < most:
        cuts = [_best_cut(data, np.flatnonzero(homes[-1] == k)) for k in range(len(fits))]
        gain, rows = max(cuts, key=lambda cut: cut[0])
        if not len(rows):
            break
        made = homes[-1].copy()
        made[rows] = len(fits)
        homes.append(made)
        fits.append(fits[-1] + gain)
    numbers = np.arange(len(fits))
    criterion = tuple(float(v) for v in -2 * np.array(fits) + numbers * (NUMBERS * np.log(max(count, 1)) + 2 * BOUNDARIES))
    return _told(data, homes[int(np.argmin(criterion))], criterion)


def _best(data: LocalData, rows: Integers) -> float:
    return float(data.logs[rows].sum(0, dtype=float).max())


def _best_cut(data: LocalData, rows: Integers) -> tuple[float, Integers]:
    """Return the gain of the best cut of some faults and the faults beyond it; none where they are too few."""
    best: tuple[float, Integers] = (-np.inf, np.zeros(0, np.int64))
    if len(rows) < 2 * LEAST_FAULTS:
        return best
    whole = _best(data, rows)
    for angle in np.pi * np.arange(DIRECTIONS) / DIRECTIONS:
        along = (data.places[rows] - data.places[rows].mean(0))[:, :2] @ [np.sin(angle), np.cos(angle)]
        order = rows[np.argsort(along, kind="stable")]
        ahead, behind = _running(data, order), _running(data, order[::-1])[::-1]
        gains = ahead[LEAST_FAULTS - 1 : -LEAST_FAULTS] + behind[LEAST_FAULTS : len(rows) - LEAST_FAULTS + 1] - whole
        at = int(gains.argmax())
        if gains[at] > best[0] + 1e-9:
            best = (float(gains[at]), order[at + LEAST_FAULTS :])
    return best


def _running(data: LocalData, order: Integers) -> Floats:
    """Return the greatest log-likelihood of the first fault, the first two, and so on, shape (F,)."""
    total, found = np.zeros(data.logs.shape[1]), np.zeros(len(order))
    for place, row in enumerate(order):
        total += data.logs[row]
        found[place] = total.max()
    return found


def _told(data: LocalData, homes: Integers, criterion: tuple[float, ...]) -> Domains:
    sizes = np.bincount(homes)
    order = np.argsort(-sizes, kind="stable")
    homes = np.argsort(order)[homes]
    at = [int(data.logs[homes == k].sum(0, dtype=float).argmax()) // len(data.ratios) for k in range(len(sizes))]
    middles = np.stack([data.places[homes == k].mean(0) for k in range(len(sizes))])
    count = len(sizes)
    one, chosen = criterion[0], criterion[count - 1]
    why = "one stress serves the whole model" if count == 1 else f"{count} stresses explain the faults better than one"
    best_other = f"; criterion {chosen:.0f}, one domain {one:.0f}" if count > 1 else f"; criterion {one:.0f}"
    return Domains(count, homes, data.frames[at], middles, criterion, why + best_other)
