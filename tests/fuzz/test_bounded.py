"""Damaged inputs are read or refused with a next step, in a process with limits on time and memory. `run.py` does the long run."""

from __future__ import annotations

import sys

import pytest

from .driving import drive


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="limits on memory are set as Linux has them")
def test_damaged_inputs_are_read_or_refused() -> None:
    report = drive(count=1500, seed=20261201)
    assert report.faults == []
    assert report.cases == 1500
    assert all(counts["refused"] for counts in report.outcomes.values()), "damage that no reader notices is no damage"
