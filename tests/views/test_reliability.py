"""The measured table of reliability: it adds up, the probabilities hold to it, and faults hang where they belong."""

from __future__ import annotations

import itertools

import pytest
from scipy.stats import binomtest

from structviz.analysis import Analysis, Settings, run
from structviz.stress.reliability import RANDOM_SECTORS, wilson_interval
from structviz.synthetic import random_model
from structviz.views.reliability import BIN, build_reliability


@pytest.fixture(scope="module")
def analysis() -> Analysis:
    model = random_model("normal", faults=14, conjugate=10, planted=2, triangles=60, random_state=3).model
    return run(model, Settings(replicates=60, stations=6))


def test_bands_follow_each_other_and_hold_their_means() -> None:
    bands = RANDOM_SECTORS.bands
    assert bands[0].low == 0
    assert bands[-1].high == 1
    assert all(one.high == other.low for one, other in itertools.pairwise(bands))
    assert all(band.low <= band.mean <= band.high and 0 <= band.outside <= band.faults for band in bands)


def test_probabilities_came_true() -> None:
    """Observed shares rise with what was given, and over all faults lie within a point of it."""
    bands = RANDOM_SECTORS.bands
    observed = [band.outside / band.faults for band in bands]
    off = sum(abs(seen - band.mean) * band.faults for seen, band in zip(observed, bands, strict=True)) / sum(band.faults for band in bands)
    assert off < 0.01
    assert all(one <= other + 0.02 for one, other in itertools.pairwise(observed))


@pytest.mark.parametrize(("count", "total"), [(0, 7), (3, 11), (50, 60), (9, 9)])
def test_the_interval_is_that_of_scipy(count: int, total: int) -> None:
    other = binomtest(count, total).proportion_ci(method="wilson")
    assert wilson_interval(count, total) == pytest.approx((other.low, other.high), abs=1e-12)


def test_every_fault_hangs_once_at_its_probability(analysis: Analysis) -> None:
    shown = build_reliability(analysis)
    told = {k: r.verdict.conflict_probability for k, r in enumerate(analysis.faults) if r.verdict.conflict_probability is not None}
    assert {fault.row: fault.probability for fault in shown.faults} == told
    assert len({(fault.column, fault.level) for fault in shown.faults}) == len(told)
    for fault in shown.faults:
        assert BIN * fault.column <= fault.probability + 1e-9 <= BIN * (fault.column + 1) + 2e-9
