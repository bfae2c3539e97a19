"""The regime of the faults against what was measured apart from them: azimuths from wells, mechanisms of earthquakes.

The regime rests on the faults alone here, so that agreement means something. Two directions agree where they stand no further
apart than their uncertainties allow, and than 15 degrees, which is what one mean of borehole or earthquake data is worth.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz._validate import check_finite, check_range
from structviz.errors import ArgumentError
from structviz.orientation.statistics import axial_mean_azimuth_deg
from structviz.stress.mechanism_inversion import MechanismInversion
from structviz.stress.regime import Regime
from structviz.stress.tensor import frame_angle_deg

Floats = NDArray[np.float64]

TOLERANCE_DEG = 15.0
LEAST_UNCERTAINTY_DEG = 5.0  # of one well: what compass and tool are good for, however well its breakouts agree
FAR = 2.5  # times the spread: wells further from the middle than this are left out of the mean
SD_OF_MEDIAN = 1.4826  # standard deviation of a normal distribution over the median of its absolute deviations
SD_OF_WIDTH = 1.959964  # standard deviations in the half-width of an interval of 95 %
SD_OF_CONE = 2.447747  # standard deviations about each of two axes in the half-angle of a cone of 95 %
VAGUE_DEG = 45.0  # where two standard deviations reach this, agreement would be no news
ONE_STRESS_DEG = 25.0  # mean misfit of earthquakes from which one stress does not explain them
FEW = 3  # wells, of which no test can tell whether they agree by chance
NO_MEAN = 0.05  # chance from which a mean azimuth is taken for none: wells all round the compass have it too


@dataclass(frozen=True)
class Comparison:
    """The regime of the faults against one independent measurement of the stress."""

    key: str  # "wells" | "mechanisms"
    title: str
    count: int  # wells or earthquakes used
    difference_deg: float  # of SHmax for wells, 0 to 90; between the axes for mechanisms, 0 to 120; NaN where there is none
    uncertainty_deg: float  # one standard deviation of the difference, NaN where there is none
    word: str  # "agrees" | "differs" | "undecided"
    text: str  # the same in a sentence
    regime: str = ""  # name of the phase compared with, where there are several
    left_out: int = 0  # wells that stand apart from the rest
    shmax_deg: float = float("nan")  # measured
    shmax_uncertainty_deg: float = float("nan")  # one standard deviation


@dataclass(frozen=True)
class MeanAzimuth:
    """The mean of azimuths from wells."""

    azimuth_deg: float  # [0, 180); NaN where the wells have no common azimuth
    standard_error_deg: float  # NaN with it
    spread_deg: float  # standard deviation of the wells used
    count: int  # used
    left_out: int  # stand apart from the rest


def mean_of_wells(azimuths_deg: ArrayLike, uncertainties_deg: ArrayLike) -> MeanAzimuth:
    """Return the weighted mean of azimuths from wells, those far from the rest left out.

    azimuths_deg, uncertainties_deg : (N,) one standard deviation each; raised to 5 degrees where it is less.

    Notes
    -----
    Angles are doubled to average them [mardia2000]; weights are one over the variance. The middle is the whole degree with the least
    sum of weighted distances; wells further from it than 2.5 times the median distance (as a standard deviation) or 2.5
    times their own uncertainty, whichever is more, are left out. The standard error is the larger of what the
    uncertainties give and what the scatter gives (circular dispersion over the effective number of wells). There
    is no mean where azimuths at random would agree as well in one of twenty cases.
    """
    azimuth = check_finite("azimuths_deg", azimuths_deg) % 180.0
    error = np.maximum(check_range("uncertainties_deg", uncertainties_deg, 0.0, 90.0, "deg"), LEAST_UNCERTAINTY_DEG)
    if azimuth.ndim != 1 or not len(azimuth) or error.shape != azimuth.shape:
        found = f"azimuths_deg: found shapes {azimuth.shape} and {error.shape}; wanted (N,) twice, N of 1 or more"
        raise ArgumentError(found, hint="give one uncertainty for each azimuth")
    away = np.abs(_apart(azimuth, _middle(azimuth, 1 / error)))
    kept = away <= FAR * np.maximum(SD_OF_MEDIAN * np.median(away), error)
    azimuth, weight = azimuth[kept], 1 / error[kept] ** 2
    mean, length = axial_mean_azimuth_deg(azimuth, weight)
    off, left_out = _apart(azimuth, mean), int((~kept).sum())
    spread = float(np.sqrt((weight @ off**2) / weight.sum()))
    if not np.isfinite(mean) or (len(azimuth) > FEW and np.exp(-len(azimuth) * length**2) > NO_MEAN):
        return MeanAzimuth(np.nan, np.nan, spread, len(azimuth), left_out)
    error_deg = max(_scatter_deg(off, weight, length), float(1 / np.sqrt(weight.sum())))
    return MeanAzimuth(mean, error_deg, spread, len(azimuth), left_out)


def _scatter_deg(off: Floats, weight: Floats, length: float) -> float:
    """Return the standard error of a mean azimuth from the scatter about it, degrees [mardia2000]."""
    effective = weight.sum() ** 2 / (weight**2).sum()
    second = float(weight @ np.cos(np.radians(4 * off)) / weight.sum())
    dispersion = max(1 - second, 0.0) / (2 * length**2)
    return float(np.degrees(np.sqrt(dispersion / max(effective - 1, 1))) / 2)


def compare_azimuths(regime: Regime, azimuths_deg: ArrayLike, uncertainties_deg: ArrayLike) -> Comparison:
    """Return how the SHmax of a regime stands to azimuths from wells (N,) with standard deviations (N,)."""
    wells = mean_of_wells(azimuths_deg, uncertainties_deg)
    own = regime.shmax_half_width_deg / SD_OF_WIDTH
    difference = float(abs(_apart(wells.azimuth_deg, regime.shmax_deg)))
    both = float(np.hypot(wells.standard_error_deg, own))
    word = _word(difference, both)
    left = f", {wells.left_out} more left out as far from the rest" if wells.left_out else ""
    source = "1 well" if wells.count == 1 else f"{wells.count} wells (scatter {wells.spread_deg:.0f} deg){left}"
    if not np.isfinite(wells.azimuth_deg):
        told = f"Azimuths from {source} have no common direction, so they decide nothing."
    else:
        measured = f"SHmax is {_degrees(wells.azimuth_deg)} +/- {2 * wells.standard_error_deg:.0f} from {source}"
        inferred = f"and {_degrees(regime.shmax_deg)} +/- {2 * own:.0f} from the faults"
        told = f"{measured}, {inferred}: {_verdict(word, difference, both)}."
    return Comparison(
        "wells", "SHmax from wells", wells.count, difference, both, word, told, regime.name, wells.left_out,
        wells.azimuth_deg, wells.standard_error_deg,
    )  # fmt: skip


def compare_mechanisms(regime: Regime, found: MechanismInversion) -> Comparison:
    """Return how the axes of a regime stand to those of an inversion of earthquake mechanisms."""
    quakes = found.regime
    difference = float(frame_angle_deg(regime.axes, quakes.axes))
    both = float(np.hypot(max(regime.cones_deg), max(quakes.cones_deg))) / SD_OF_CONE
    word = _word(difference, both)
    azimuths = abs(_apart(regime.shmax_deg, quakes.shmax_deg))
    told = f"{quakes.faults} earthquakes tell of {_described(quakes)}; the faults of {_described(regime)}: "
    told += f"as axes {_verdict(word, difference, both)}, in SHmax {azimuths:.0f} deg apart."
    if (misfit := found.inversion.mean_misfit_deg) > ONE_STRESS_DEG:
        told += f" Slip of the earthquakes stands {misfit:.0f} deg off their one stress on average: they hold more than one."
    own = quakes.shmax_half_width_deg / SD_OF_WIDTH
    return Comparison(
        "mechanisms", "earthquake mechanisms", quakes.faults, difference, both, word, told, regime.name, 0, quakes.shmax_deg, own
    )


def _middle(azimuth: Floats, weight: Floats) -> float:
    """Return the whole degree with the least sum of weighted distances to azimuths: a median on the half circle."""
    candidates = np.arange(180.0)
    return float(candidates[(np.abs(_apart(candidates[:, None], azimuth)) @ weight).argmin()])


def _apart(first: ArrayLike, second: ArrayLike) -> Floats:
    """Return first minus second as undirected azimuths, degrees [-90, 90)."""
    return (np.asarray(first, float) - np.asarray(second, float) + 90.0) % 180.0 - 90.0


def _word(difference_deg: float, uncertainty_deg: float) -> str:
    if not np.isfinite(difference_deg) or 2 * uncertainty_deg >= VAGUE_DEG:
        return "undecided"
    return "agrees" if difference_deg <= max(TOLERANCE_DEG, 2 * uncertainty_deg) else "differs"


def _verdict(word: str, difference_deg: float, uncertainty_deg: float) -> str:
    allowed = max(TOLERANCE_DEG, 2 * uncertainty_deg)
    if word == "agrees":
        return f"they agree, {difference_deg:.0f} deg apart where {allowed:.0f} would pass"
    if word == "differs":
        return f"they differ by {difference_deg:.0f} deg, {difference_deg - allowed:.0f} more than would pass"
    return f"{difference_deg:.0f} deg apart, too loose to decide (+/- {2 * uncertainty_deg:.0f})"


def _described(regime: Regime) -> str:
    """Return a regime in words: its class and SHmax with the half-width of its interval."""
    kind = "a stress tilted out of every class" if regime.kind == "undefined" else f"{regime.kind} faulting"
    return f"{kind}, SHmax {_degrees(regime.shmax_deg)} +/- {regime.shmax_half_width_deg:.0f}"


def _degrees(azimuth_deg: float) -> str:
    """Return an azimuth as geologists write it; 179.8 is 000.

    >>> _degrees(7.2), _degrees(179.8)
    ('007', '000')
    """
    return f"{round(azimuth_deg) % 180:03d}"
