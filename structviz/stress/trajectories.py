"""Trajectories of the greatest horizontal compression: lines that follow its azimuth as far as it is known."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError

Floats = NDArray[np.float64]
Azimuths = Callable[[Floats], Floats]  # places (P, 3), m -> azimuths, degrees; NaN where not known

MOST_STEPS = 2000  # on either side of a seed


def shmax_trajectories(azimuths: Azimuths, seeds: Floats, step_m: float, separation_m: float) -> list[Floats]:
    """Return polylines (M, 3), m, through seeds (S, 3) along the azimuths that a function gives for places.

    Lines are level, follow the direction without a sense by the fourth-order Runge-Kutta rule, end where the azimuth is not known,
    and keep at least `separation_m` apart: a seed nearer than that to an earlier line starts none, and a line stops at half of it. Seeds
    are taken in the order given. Raises ArgumentError for a step or separation not above zero, or a separation below two steps.
    """
    seeds = np.asarray(seeds, float)
    if seeds.ndim != 2 or seeds.shape[1] != 3 or not np.isfinite(seeds).all():
        raise ArgumentError(f"seeds: found shape {seeds.shape}; wanted finite places (S, 3)", hint="give easting, northing and up, m")
    if not (np.isfinite(step_m) and step_m > 0 and np.isfinite(separation_m) and separation_m >= 2 * step_m):
        found = f"step_m, separation_m: found {step_m:g}, {separation_m:g}"
        raise ArgumentError(f"{found}; wanted a step above 0 m and a separation of two steps or more", hint="make the step smaller")
    lines: list[Floats] = []
    for seed in seeds:
        if _nearest_m(seed, lines) < separation_m or np.isnan(azimuths(seed[None])[0]):
            continue
        start = _direction(azimuths, seed, None)
        halves = [_followed(azimuths, seed, sign * start, step_m, lines, separation_m / 2) for sign in (-1.0, 1.0)]
        line = np.array([*halves[0][::-1], seed, *halves[1]])
        if len(line) > 1:
            lines.append(line)
    return lines


def azimuths_on_grid(origin: tuple[float, float], step_m: float, shmax_deg: Floats) -> Azimuths:
    """Return the function of places that interpolates azimuths (N, E), degrees, of a level grid, northing by easting.

    It is linear in twice the angle, so that 179 and 1 deg meet at 0; NaN outside and where one of the four corners is NaN. The grid
    begins at `origin` (easting, northing, m). Quick, where a field asked at every step would be slow.
    """
    doubled = np.exp(2j * np.radians(shmax_deg))
    most = np.array(shmax_deg.shape)[::-1] - 1

    def azimuths(places: Floats) -> Floats:
        at = (places[:, :2] - np.array(origin)) / step_m
        inside = (at >= 0).all(1) & (at <= most).all(1) & (most > 0).all()
        cell = np.clip(np.where(inside[:, None], at, 0.0).astype(int), 0, np.maximum(most - 1, 0))
        (i, j), (u, v) = cell.T, np.where(inside[:, None], at - cell, 0.0).T
        n, e = np.minimum(j + 1, most[1]), np.minimum(i + 1, most[0])
        low = (1 - u) * doubled[j, i] + u * doubled[j, e]
        high = (1 - u) * doubled[n, i] + u * doubled[n, e]
        return np.where(inside, np.degrees(np.angle((1 - v) * low + v * high)) / 2 % 180.0, np.nan)

    return azimuths


def _nearest_m(place: Floats, lines: list[Floats]) -> float:
    return min((float(np.sqrt(((line - place) ** 2).sum(1).min())) for line in lines), default=np.inf)


def _direction(azimuths: Azimuths, place: Floats, along: Floats | None) -> Floats:
    """Return the level unit vector of the azimuth at a place, on the side of `along`; NaN where not known."""
    angle = np.radians(azimuths(place[None])[0])
    found = np.array([np.sin(angle), np.cos(angle), 0.0])
    return -found if along is not None and found @ along < 0 else found


def _followed(azimuths: Azimuths, seed: Floats, along: Floats, step_m: float, lines: list[Floats], apart_m: float) -> list[Floats]:
    """Return the places after the seed, one a step."""
    place, found = seed, []
    away = False
    for _ in range(MOST_STEPS):
        k1 = _direction(azimuths, place, along)
        k2 = _direction(azimuths, place + step_m / 2 * k1, k1)
        k3 = _direction(azimuths, place + step_m / 2 * k2, k1)
        k4 = _direction(azimuths, place + step_m * k3, k1)
        move = (k1 + 2 * k2 + 2 * k3 + k4) / 6
        place = place + step_m * move
        if np.isnan(place).any() or np.isnan(azimuths(place[None])[0]) or _nearest_m(place, lines) < apart_m:
            break
        back = float(np.linalg.norm(place - seed))
        if away and back < step_m:  # the line has closed
            break
        away |= back > 2 * step_m
        along = move
        found.append(place)
    return found
