"""The plunges of the three axes in a triangle as data: which class of faulting, and how sure.

A corner is an upright axis. The squared sines of the plunges of three perpendicular axes add up to one, so they are the shares
of the corners.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis

Floats = NDArray[np.float64]

CLOUD = 150  # replicates shown


@dataclass(frozen=True, eq=False)
class PlungesRegime:
    """One stress in the triangle."""

    name: str  # of its phase, where there are several; else its class
    shares: Floats  # (3,) of the corners where sigma1, sigma2, sigma3 stand upright; they add up to one
    cloud: Floats  # (K, 3) the same of its replicates


@dataclass(frozen=True, eq=False)
class Plunges:
    """The whole triangle."""

    regimes: tuple[PlungesRegime, ...]  # heaviest first


def build_plunges(analysis: Analysis, *, cloud: int = CLOUD) -> Plunges:
    """Return the triangle of an analysis, empty where no regime could be inferred; at most so many replicates of each."""
    if analysis.answer is None:
        return Plunges(())
    both = zip(analysis.regimes, analysis.answer.posteriors, strict=False)  # posteriors without a regime are too loose to show
    return Plunges(tuple(PlungesRegime(r.name or r.kind, upright_shares(r.axes), upright_shares(p.frames[:cloud])) for r, p in both))


def upright_shares(axes: Floats) -> Floats:
    """Return the squared sines of the plunges, (..., 3), of frames (..., 3, 3) with rows sigma1, sigma2, sigma3.

    >>> upright_shares(np.eye(3)[[2, 1, 0]])
    array([1., 0., 0.])
    """
    return np.asarray(axes)[..., 2] ** 2
