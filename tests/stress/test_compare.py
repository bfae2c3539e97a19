"""The regime against wells and earthquakes: means on the half circle, the words, and the sentences."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from structviz.errors import ArgumentError
from structviz.orientation.vectors import rotation
from structviz.stress.compare import Comparison, compare_azimuths, compare_mechanisms, mean_of_wells
from structviz.stress.inversion import SlipInversion
from structviz.stress.mechanism_inversion import MechanismInversion
from structviz.stress.regime import Regime

AXES = np.array([[0.0, 1.0, 0.0], [0.0, 0.0, -1.0], [-1.0, 0.0, 0.0]])  # sigma1 north, sigma2 vertical


def regime(axes=AXES, kind="strike-slip", shmax_deg=0.0, half_width_deg=4.0, cone_deg=5.0, **more):
    return Regime(axes, (cone_deg,) * 3, kind, shmax_deg, half_width_deg, None, **more)


def inverted(found, misfit_deg=10.0):
    slip = SlipInversion(found.axes, 0.5, np.full(9, misfit_deg), True)
    nothing = np.zeros((9, 2))
    return MechanismInversion(replace(found, faults=9), slip, np.zeros(9, np.intp), nothing, np.zeros((9, 2, 3)), True, 1.0)


def plain_mean(azimuths, errors):
    """Return the mean direction as the best of many candidates: the greatest sum of weighted cosines of twice the distance."""
    candidates = np.arange(0, 180, 0.01)
    weights = [1 / max(error, 5.0) ** 2 for error in errors]
    score = sum(w * np.cos(2 * np.radians(candidates - azimuth)) for azimuth, w in zip(azimuths, weights))
    return float(candidates[np.argmax(score)])


def apart(first, second):
    return abs((first - second + 90.0) % 180.0 - 90.0)


@given(st.lists(st.tuples(st.floats(-15, 15), st.floats(6, 30)), min_size=1, max_size=20), st.floats(0, 179.9))
def test_the_mean_of_wells_is_the_best_of_all_azimuths(rows, middle):
    azimuths, errors = [(middle + off) % 180 for off, _ in rows], [error for _, error in rows]
    found = mean_of_wells(azimuths, errors)
    assert found.left_out + found.count == len(rows)
    if not found.left_out:
        assert apart(found.azimuth_deg, plain_mean(azimuths, errors)) < 0.02


@given(st.lists(st.floats(0, 180), min_size=1, max_size=20), st.floats(0, 180))
def test_turning_north_turns_the_mean(azimuths, turn):
    # The middle is a whole degree, so whole turns leave the same wells out.
    first, second = (
        mean_of_wells(azimuths, 10.0 * np.ones(len(azimuths))),
        mean_of_wells(np.array(azimuths) + round(turn), 10.0 * np.ones(len(azimuths))),
    )
    if first.count == second.count and np.isfinite(first.azimuth_deg) and np.isfinite(second.azimuth_deg):
        assert apart(second.azimuth_deg, first.azimuth_deg + round(turn)) < 1e-3


def test_wells_about_north_do_not_average_to_east():
    found = mean_of_wells([170.0, 10.0, 175.0, 5.0], [10.0] * 4)
    assert apart(found.azimuth_deg, 0.0) < 1e-9
    assert (found.count, found.left_out) == (4, 0)
    assert found.spread_deg == pytest.approx(np.sqrt((100 + 25) / 2), abs=0.1)


def test_one_well_out_of_line_is_left_out_and_counted():
    found = mean_of_wells([10.0, 12.0, 14.0, 16.0, 18.0, 95.0], [10.0] * 6)
    assert (found.count, found.left_out) == (5, 1)
    assert found.azimuth_deg == pytest.approx(14.0, abs=1e-6)
    assert mean_of_wells([10.0, 12.0, 14.0, 16.0, 18.0, 95.0], [10.0] * 5 + [40.0]).left_out == 0  # far, but it says how uncertain it is


def test_a_sure_well_weighs_more_but_no_well_is_certain():
    assert apart(mean_of_wells([0.0, 20.0], [5.0, 20.0]).azimuth_deg, 1.1) < 0.1  # weights 16 to 1
    assert apart(mean_of_wells([0.0, 20.0], [0.0, 5.0]).azimuth_deg, 10.0) < 1e-6


@pytest.mark.parametrize("beyond", [1.0, 1.7], ids=["as uncertain as told", "scattered far beyond it"])
def test_the_standard_error_is_that_of_simulated_wells(beyond):
    rng = np.random.default_rng(0)
    means, told = [], []
    for _ in range(400):
        errors = rng.uniform(15, 25, 30)
        found = mean_of_wells(30.0 + beyond * errors * rng.normal(size=30), errors)
        means.append(found.azimuth_deg)
        told.append(found.standard_error_deg)
    assert np.nanmean(told) == pytest.approx(np.nanstd(means), rel=0.15)
    assert abs(np.nanmean(means) - 30.0) < 1.0


def test_wells_all_round_the_compass_have_no_mean():
    found = mean_of_wells(np.arange(0.0, 180.0, 15.0), np.full(12, 10.0))
    assert np.isnan(found.azimuth_deg)
    rng = np.random.default_rng(1)
    claimed = sum(np.isfinite(mean_of_wells(rng.uniform(0, 180, 20), np.full(20, 10.0)).azimuth_deg) for _ in range(400))
    assert claimed < 0.12 * 400


@pytest.mark.parametrize(
    ("azimuth_deg", "error_deg", "word"),
    [(14.0, 5.0, "agrees"), (16.0, 5.0, "differs"), (28.0, 15.0, "agrees"), (33.0, 15.0, "differs"), (5.0, 30.0, "undecided")],
)
def test_the_word_follows_from_difference_and_uncertainty(azimuth_deg, error_deg, word):
    found = compare_azimuths(regime(), [azimuth_deg], [error_deg])
    assert found.word == word
    assert found.difference_deg == pytest.approx(azimuth_deg)
    assert found.uncertainty_deg == pytest.approx(np.hypot(error_deg, 4.0 / 1.96), abs=0.01)


def test_what_is_said_of_wells():
    wells = [10.0, 12.0, 14.0, 16.0, 18.0, 95.0]
    agrees = compare_azimuths(regime(), wells, [10.0] * 6)
    assert agrees.text == (
        "SHmax is 014 +/- 9 from 5 wells (scatter 3 deg), 1 more left out as far from the rest, and 000 +/- 4 from the faults: "
        "they agree, 14 deg apart where 15 would pass."
    )
    assert (agrees.key, agrees.count, agrees.left_out) == ("wells", 5, 1)
    differs = compare_azimuths(regime(shmax_deg=100.0), wells[:5], [10.0] * 5)
    assert differs.text.endswith("100 +/- 4 from the faults: they differ by 86 deg, 71 more than would pass.")
    vague = compare_azimuths(regime(), [179.9], [30.0])
    assert vague.text == "SHmax is 000 +/- 60 from 1 well, and 000 +/- 4 from the faults: 0 deg apart, too loose to decide (+/- 60)."
    none = compare_azimuths(regime(), np.arange(0.0, 180.0, 15.0), np.full(12, 10.0))
    assert none.text.startswith("Azimuths from 12 wells (scatter ")
    assert none.text.endswith(" deg) have no common direction, so they decide nothing.")
    assert none.word == "undecided"
    assert np.isnan(none.difference_deg)


def test_what_is_said_of_earthquakes():
    same = compare_mechanisms(regime(), inverted(regime(axes=AXES @ rotation([0, 0, 1], 8.0).T, shmax_deg=172.0)))
    assert (same.key, same.word, same.count) == ("mechanisms", "agrees", 9)
    assert same.difference_deg == pytest.approx(8.0, abs=1e-5)
    assert same.text == (
        "9 earthquakes tell of strike-slip faulting, SHmax 172 +/- 4; the faults of strike-slip faulting, SHmax 000 +/- 4: "
        "as axes they agree, 8 deg apart where 15 would pass, in SHmax 8 deg apart."
    )


def test_the_same_azimuth_under_another_class_is_no_agreement():
    reverse = regime(axes=AXES[[0, 2, 1]], kind="reverse")  # sigma1 north, sigma3 vertical
    found: Comparison = compare_mechanisms(regime(name="phase 1"), inverted(reverse, 40.0))
    assert (found.word, found.regime) == ("differs", "phase 1")
    assert found.difference_deg == pytest.approx(90.0)
    assert "they differ by 90 deg, 75 more than would pass, in SHmax 0 deg apart." in found.text
    assert found.text.endswith("Slip of the earthquakes stands 40 deg off their one stress on average: they hold more than one.")
    tilted = compare_mechanisms(regime(kind="undefined"), inverted(reverse))
    assert "the faults of a stress tilted out of every class, SHmax" in tilted.text


def test_loose_axes_decide_nothing():
    assert compare_mechanisms(regime(cone_deg=60.0), inverted(regime())).word == "undecided"
    wide = compare_mechanisms(regime(cone_deg=30.0), inverted(regime(axes=AXES @ rotation([0, 0, 1], 24.0).T)))
    assert wide.word == "agrees"  # 2 x hypot(30, 5)/2.45 = 24.8


@pytest.mark.parametrize(
    ("azimuths", "errors", "message"),
    [
        ([], [], r"azimuths_deg: found shapes \(0,\) and \(0,\); wanted \(N,\) twice, N of 1 or more"),
        ([1.0, 2.0], [5.0], r"found shapes \(2,\) and \(1,\)"),
        ([np.nan], [5.0], "azimuths_deg: found NaN"),
        ([1.0], [-5.0], "uncertainties_deg: found -5 deg; wanted 0 to 90 deg"),
    ],
)
def test_bad_arrays_are_refused(azimuths, errors, message):
    with pytest.raises(ArgumentError, match=message):
        mean_of_wells(azimuths, errors)
