"""Conjugate pairs: the frame of principal axes that two planes make, and which pairs of a model deserve a hearing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.orientation.vectors import dot, unit

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

SAME_PLANE = 1e-6  # sine of the angle under which two planes have no line of intersection worth the name


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

    def rows(self, keep: NDArray) -> Pairs:
        """Return the pairs of the rows named by an index or mask, in that order."""
        fields = (self.faults, self.acute_deg, self.obtuse, self.weight, self.axes, self.distance_m, self.places)
        return Pairs(*(values[keep] for values in fields))


@dataclass(frozen=True)
class PairLimits:
    """What makes a pair admissible and how its weight falls off; common practice where no source is named."""

    friction_angle_deg: float = 30.0  # expected acute angle = 90 - friction angle [anderson1951]
    narrowest_deg: float = 35.0  # below, the planes belong to one set
    widest_deg: float = 85.0  # above, geometry cannot choose the bisector
    angle_scatter_deg: float = 12.0
    obtuse_weight: float = 0.4  # an obtuse pair is evidence too, at less weight
    reach: float = 1.0  # greatest distance between surfaces, in units of their summed sizes
    least_weight: float = 0.02


def pair_axes(first_normals: Floats, second_normals: Floats) -> tuple[Floats, Floats]:
    """Return the axes of planes read as conjugate, rows sigma1, sigma2, sigma3, shape (..., 3, 3), and the acute angle, degrees (...).

    sigma2 is the line of intersection, sigma1 bisects the acute angle between the planes [anderson1951]. The signs of the
    normals do not matter. Planes that coincide have no line of intersection: their axes are NaN and their angle is 0.
    """
    n1, n2 = np.broadcast_arrays(unit(first_normals), unit(second_normals))
    line = np.cross(n1, n2)
    sine = np.sqrt(dot(line, line))
    s2 = unit(line)
    first, second = np.cross(s2, n1), np.cross(s2, n2)
    second = np.where(dot(first, second)[..., None] < 0, -second, second)
    s1, s3 = unit(first + second), unit(first - second)
    axes = np.stack([s1, s2, s3], -2)
    axes = np.where((sine < SAME_PLANE)[..., None, None], np.nan, axes)
    return axes, np.degrees(np.arctan2(sine, np.abs(dot(n1, n2))))


def swap_extremes(axes: Floats) -> Floats:
    """Return the frames with sigma1 and sigma3 exchanged, shape (..., 3, 3)."""
    return axes[..., ::-1, :]


def conjugate_slips(axes: Floats, normals: Floats) -> Floats:
    """Return unit hanging-wall slip on planes that contain sigma2 of their frame, shape (..., 3); it does not depend on R."""
    s1, s3 = axes[..., 0, :], axes[..., 2, :]
    along1, along3 = dot(normals, s1)[..., None], dot(normals, s3)[..., None]
    # For the reduced tensor (1, R, 0) the traction in the s1-s3 plane is along1 * s1; take out its normal part.
    return unit(-(along1 * s1 - along1**2 * (along1 * s1 + along3 * s3)))
