"""The regime against wells and earthquakes: who is compared with whom, and on real data."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import run as analyse
from structviz.checks import CHECKS, Examined, samples
from structviz.checks.independent import comparisons
from structviz.io import read_model
from structviz.io.shmax import read_azimuths
from structviz.io.units import Frame
from structviz.model import Mechanism, WellAzimuth
from structviz.orientation.vectors import rotation

NOWHERE = (float("nan"),) * 3


def wells(*azimuths: float) -> tuple[WellAzimuth, ...]:
    return tuple(WellAzimuth(f"W{k}", azimuth, 10.0, NOWHERE) for k, azimuth in enumerate(azimuths))


def found(examined: Examined, key: str, limit: float = 15.0) -> list:
    return list(CHECKS[key].examine(examined, limit))


def judged(model_changes: dict, *regimes: object) -> Examined:
    these = samples.judged("consistent", "consistent", regimes=regimes or (samples.regime(),))
    model = replace(these.model, **model_changes)
    return replace(these, model=model, comparisons=comparisons(model, these.regimes))


def test_nothing_is_compared_where_there_is_nothing() -> None:
    assert judged({}).comparisons == ()
    these = samples.judged("undetermined", regimes=())
    assert comparisons(replace(these.model, azimuths=wells(0.0)), these.regimes) == ()


def test_one_phase_that_agrees_is_enough() -> None:
    turned = samples.regime(samples.NORMAL_AXES @ rotation([0, 0, 1], -90.0).T, "normal", 90.0, name="phase 2")
    both = judged({"azimuths": wells(88.0, 90.0, 92.0)}, samples.regime(name="phase 1"), turned)
    assert [(each.regime, each.word) for each in both.comparisons] == [("phase 1", "differs"), ("phase 2", "agrees")]
    assert not found(both, "wells-differ")
    neither = judged({"azimuths": wells(40.0, 41.0, 42.0)}, samples.regime(name="phase 1"), turned)
    (only,) = found(neither, "wells-differ")
    assert only.message.startswith("Nearest is phase 1. SHmax is 041 +/- ")
    assert only.message.endswith("they differ by 41 deg, 26 more than would pass")


def test_the_limit_is_that_of_the_check() -> None:
    close = judged({"azimuths": wells(18.0, 20.0, 22.0)})
    assert found(close, "wells-differ")
    assert not found(close, "wells-differ", 25.0)


def test_mechanisms_that_are_evidence_are_not_compared_with_themselves() -> None:
    sample = CHECKS["mechanisms-differ"].fails()
    assert found(sample, "mechanisms-differ")
    model = replace(sample.model, mechanisms_are="evidence")
    assert comparisons(model, sample.regimes) == ()


def test_too_few_earthquakes_leave_it_undecided_with_the_reason() -> None:
    quakes = tuple(Mechanism(f"E{k}", NOWHERE, ((0.0, 60.0, -90.0),)) for k in range(3))
    few = judged({"mechanisms": quakes})
    (only,) = few.comparisons
    assert (only.word, only.count) == ("undecided", 3)
    assert only.text == (
        "The earthquakes are too few, or too much alike, to tell of a stress "
        "(mechanisms: found 3, 3 of a weight above zero; wanted 4 or more, and one weight for each)."
    )
    assert not found(few, "mechanisms-differ")
    alike = judged({"mechanisms": quakes * 4})
    assert "determine" in alike.comparisons[0].text
    assert alike.comparisons[0].word == "undecided"


@pytest.mark.parametrize(("region", "within_deg"), [("mojave", 15.0), ("transverse_ranges", 10.0)])
def test_california_agrees_with_its_wells(shared_data, region, within_deg) -> None:
    # Wells of southern California (Luttrell and Hardebeck 2021, table 1); those near basement average 015 by their authors.
    path = next((shared_data / "shmax_boreholes").glob("*.csv"))
    every, _ = read_azimuths(path.read_bytes(), path.name, Frame())
    near = every[19:26]  # "breakouts near basement"
    model = read_model(shared_data / "california_fault_meshes" / region / "faults.csv")
    regimes = analyse(model).regimes
    (basement,) = comparisons(replace(model, azimuths=near), regimes)
    assert basement.word == "agrees"
    assert basement.difference_deg < within_deg
    assert abs(basement.shmax_deg - 15.0) < 3.0
    (whole,) = comparisons(replace(model, azimuths=every), regimes)
    assert whole.word == "agrees"
    assert whole.uncertainty_deg > basement.uncertainty_deg  # 57 wells of many settings scatter by 41 degrees
    assert np.isfinite(whole.shmax_deg)
