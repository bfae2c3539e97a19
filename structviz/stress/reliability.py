"""How often the probabilities of conflict come true, as measured on synthetic models whose slip is known. One table, with where it is from.

Measured by `python tests/benchmarks/calibration.py --models 300` (seed 5000): 300 models of known stress, 12 to 36 faults each, a third
inherited, 0 to 30 % of the labels wrong, in the three regimes in turn. For every fault a sector of half the directions was drawn at
random and the model asked how probable it is that the fault slipped outside it. Run it again when the evidence model, the verdicts or
`SHARPENING` change, and put its table here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

Z95 = 1.959963984540054  # of the normal distribution


@dataclass(frozen=True)
class Band:
    """Faults whose probability lay in a band."""

    low: float
    high: float
    faults: int
    outside: int  # of them slipped outside the sector
    mean: float  # of their probabilities


@dataclass(frozen=True)
class ReliabilityTable:
    """A measured table."""

    models: int
    seed: int
    bands: tuple[Band, ...]


RANDOM_SECTORS = ReliabilityTable(
    models=300,
    seed=5000,
    bands=(
        Band(0.0, 0.01, 3150, 0, 0.000),
        Band(0.01, 0.1, 258, 6, 0.040),
        Band(0.1, 0.2, 89, 11, 0.147),
        Band(0.2, 0.3, 61, 10, 0.251),
        Band(0.3, 0.4, 51, 16, 0.350),
        Band(0.4, 0.5, 49, 20, 0.453),
        Band(0.5, 0.6, 63, 38, 0.552),
        Band(0.6, 0.7, 65, 55, 0.644),
        Band(0.7, 0.8, 67, 56, 0.752),
        Band(0.8, 0.9, 105, 97, 0.857),
        Band(0.9, 0.99, 236, 226, 0.959),
        Band(0.99, 1.0, 3138, 3132, 1.000),
    ),
)


def wilson_interval(count: int, total: int) -> tuple[float, float]:
    """Return the 95 % interval of a share of which `count` in `total` were seen [wilson1927].

    >>> wilson_interval(0, 0)
    (0.0, 1.0)
    >>> [round(end, 3) for end in wilson_interval(5, 10)]
    [0.237, 0.763]
    """
    if not total:
        return 0.0, 1.0
    share, squared = count / total, Z95**2
    middle = (share + squared / (2 * total)) / (1 + squared / total)
    half = Z95 / (1 + squared / total) * float(np.sqrt(share * (1 - share) / total + squared / (4 * total**2)))
    return max(0.0, middle - half), min(1.0, middle + half)
