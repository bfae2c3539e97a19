"""What the probabilities of conflict mean, as data: how often they came true where the truth is known, and those of this model."""

from __future__ import annotations

from dataclasses import dataclass

from structviz.analysis import Analysis
from structviz.stress.reliability import RANDOM_SECTORS, Band, wilson_interval
from structviz.views.captions import WORDS

BIN = 0.05  # of probability; faults of one bin stand on each other


@dataclass(frozen=True)
class ReliabilityPoint:
    """Faults of synthetic models that were given about one probability, and the share that did slip outside their sector."""

    given: float  # mean of the probabilities
    observed: float
    low: float  # 95 % interval of the share
    high: float
    faults: int


@dataclass(frozen=True)
class ReliabilityFault:
    """One fault of this model by its probability."""

    row: int  # of Analysis.faults
    name: str
    verdict: str
    probability: float
    column: int  # bin of its probability
    level: int  # place within its bin, conflicting ones nearest the axis


@dataclass(frozen=True, eq=False)
class Reliability:
    """The whole plot."""

    points: tuple[ReliabilityPoint, ...]
    faults: tuple[ReliabilityFault, ...]


def build_reliability(analysis: Analysis) -> Reliability:
    """Return the measured reliability beside the faults of an analysis that have a probability."""
    return Reliability(tuple(_point(band) for band in RANDOM_SECTORS.bands), _stacked(analysis))


def _point(band: Band) -> ReliabilityPoint:
    low, high = wilson_interval(band.outside, band.faults)
    return ReliabilityPoint(band.mean, band.outside / band.faults, low, high, band.faults)


def _stacked(analysis: Analysis) -> tuple[ReliabilityFault, ...]:
    held = [(k, result, result.verdict.conflict_probability) for k, result in enumerate(analysis.faults)]
    told = [(k, result, share) for k, result, share in held if share is not None]
    levels = [0] * round(1 / BIN)
    found = []
    for k, result, share in sorted(told, key=lambda row: (WORDS.index(row[1].verdict.word), row[0])):
        column = min(int(share / BIN), len(levels) - 1)
        found.append(ReliabilityFault(k, result.fault.name, result.verdict.word, share, column, levels[column]))
        levels[column] += 1
    return tuple(found)
