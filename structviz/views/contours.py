"""Closed outlines of where values on a square grid exceed a level."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

# For each of sixteen cells (bits: south-west, south-east, north-east, north-west above the level), the sides between which the
# outline runs, the higher values to its left. Sides: 0 south, 1 east, 2 north, 3 west.
RUNS: dict[int, tuple[tuple[int, int], ...]] = {
    1: ((0, 3),), 2: ((1, 0),), 3: ((1, 3),), 4: ((2, 1),), 6: ((2, 0),), 7: ((2, 3),), 8: ((3, 2),), 9: ((0, 2),),
    11: ((1, 2),), 12: ((3, 1),), 13: ((0, 1),), 14: ((3, 0),), 5: ((0, 3), (2, 1)), 10: ((1, 0), (3, 2)),
}  # fmt: skip
JOINED = {5: ((0, 1), (2, 3)), 10: ((1, 2), (3, 0))}  # saddles whose middle is above the level


def outlines(values: Floats, level: float) -> tuple[Floats, ...]:
    """Return closed outlines (K, 2), first point last again, in steps of the grid (column, row), around values (R, C) above a level.

    Beyond the grid everything is below the level, so that every outline closes; filled by the even-odd rule they cover what is above.
    """
    padded = np.pad(np.asarray(values, float), 1, constant_values=-np.inf)
    above = padded > level
    kind = above[:-1, :-1] + 2 * above[:-1, 1:] + 4 * above[1:, 1:] + 8 * above[1:, :-1]
    follows: dict[int, int] = {}
    for code, runs in RUNS.items():
        cells = np.argwhere(kind == code)
        for row, column in cells:
            here = JOINED[code] if code in JOINED and _middle(padded, row, column) > level else runs
            for start, end in here:
                follows[_edge(row, column, start, padded.shape[1])] = _edge(row, column, end, padded.shape[1])
    return tuple(_points(ring, padded, level) - 1.0 for ring in _rings(follows))


def _middle(padded: Floats, row: int, column: int) -> float:
    return float(padded[row : row + 2, column : column + 2].mean())


def _edge(row: int, column: int, side: int, width: int) -> int:
    """Return the number of a side of a cell: even for those along a row, odd for those along a column."""
    row, column = row + (side == 2), column + (side == 1)
    return 2 * (int(row) * width + int(column)) + (side in (1, 3))


def _rings(follows: dict[int, int]) -> list[list[int]]:
    """Return closed rings of sides, in order of their lowest side."""
    rings, left = [], dict(follows)
    for start in sorted(follows):
        if start not in left:
            continue
        ring = [start]
        while ring[-1] in left:
            ring.append(left.pop(ring[-1]))
        rings.append(ring)
    return rings


def _points(ring: list[int], padded: Floats, level: float) -> Floats:
    """Return where an outline crosses its sides, (K, 2): by proportion, or at the grid's own point where the other lies beyond it."""
    sides = np.array(ring)
    rows, columns = np.divmod(sides // 2, padded.shape[1])
    upward = sides % 2
    one, other = padded[rows, columns], padded[rows + upward, columns + 1 - upward]
    with np.errstate(invalid="ignore"):
        share = np.clip((level - one) / (other - one), 0.0, 1.0)
    share = np.where(np.isinf(one), 1.0, np.where(np.isinf(other), 0.0, share))
    return np.stack([columns + share * (1 - upward), rows + share * upward], 1)
