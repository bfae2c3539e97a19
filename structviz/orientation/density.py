"""How much denser axes lie about a direction than chance would make them."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_vectors
from structviz.orientation.vectors import unit

Floats = NDArray[np.float64]

EXPECTED_DEVIATIONS = 3.0  # the count expected by chance is so many of its standard deviations, as is usual [kamb1959]
CHUNK = 4096  # directions at once, which bounds memory


def axis_density(axes: ArrayLike, at: ArrayLike) -> Floats:
    """Return by how many standard deviations axes (N, 3) lie denser about directions (M, 3) than the same number at random, (M,).

    Neither the signs of the axes nor those of the directions change anything. Raises ArgumentError for arrays of another shape.

    Notes
    -----
    Every axis counts by exp(k (|cos| - 1)) instead of as in or out of a circle [robin1986]. Under chance |cos| is uniform on 0 to
    1, so that a count has the mean N/k and the variance N (1/(2k) - 1/k^2); k = 2 (1 + N/9) makes the mean three standard
    deviations, which fits the width of the kernel to the number of axes [kamb1959]. Terms of exp(-k) are left out: k is at least 2.

    >>> level = np.array([[1.0, 0, 0]] * 9)
    >>> axis_density(level, [[1.0, 0, 0], [0, 0, 1.0]]).round(1)
    array([ 9. , -2.8])
    """
    lines, directions = unit(check_vectors("axes", axes)).reshape(-1, 3), unit(check_vectors("at", at)).reshape(-1, 3)
    count = len(lines)
    if not count:
        return np.zeros(len(directions))
    k = 2 * (1 + count / EXPECTED_DEVIATIONS**2)
    pieces = [
        np.exp(k * (np.abs(directions[i : i + CHUNK] @ lines.T) - 1)).sum(1) for i in range(0, len(directions), CHUNK)
    ]  # fmt: skip
    total = np.concatenate([np.zeros(0), *pieces])
    return np.asarray((total - count / k) / np.sqrt(count * (1 / (2 * k) - 1 / k**2)))
