"""Conjugate pairs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Pairs:
    """Pairs of faults that may be conjugate, heaviest first; one row each."""

    faults: Integers  # (P, 2) numbers of the faults, first < second
    acute_deg: Floats  # (P,) angle between the planes, (0, 90]
    obtuse: NDArray[np.bool_]  # (P,) True where the declared senses put sigma1 in the obtuse angle
    weight: Floats  # (P,) 0 to 1
    axes: Floats  # (P, 3, 3) unit rows sigma1, sigma2, sigma3
    distance_m: Floats  # (P,) least distance between the surfaces, to within the spacing of their samples
    places: Floats  # (P, 3) m, midpoint of the nearest approach

    def __len__(self) -> int:
        return len(self.weight)
