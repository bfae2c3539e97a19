"""Striae: rakes given or found from trend and plunge, places in the unit of the model, bad rows named."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from structviz.errors import TableError
from structviz.io.striae import read_striae
from structviz.io.units import Frame
from structviz.orientation import lines, planes

HEAD = "fault,easting,northing,up,strike_deg,dip_deg,rake_deg,trend_deg,plunge_deg,sense,weight\n"


def striae(rows, frame=Frame(), head=HEAD):  # noqa: B008
    return read_striae((head + rows).encode(), "striae.csv", ("Alpha", "Beta"), frame)


def test_a_rake_arrives_with_its_sense_and_weight():
    (stria,), told = striae("Alpha,1,2,-3,-350,60,-180,,,dextral,0.5\n")
    assert (stria.fault, stria.place, stria.strike_deg, stria.dip_deg, stria.rake_deg) == ("Alpha", (1.0, 2.0, -3.0), 10.0, 60.0, 180.0)
    assert (stria.declared.words, stria.weight, told) == (("dextral",), 0.5, ())


@given(st.floats(0, 359), st.floats(1, 89), st.floats(-179, 180))
def test_trend_and_plunge_give_the_rake_back(strike, dip, rake):
    slip = planes.slip_vectors(planes.normals(strike, dip), rake)
    assume(abs(rake) > 1e-6)
    trend, plunge = lines.trend_plunge_deg(slip)
    (stria,), told = striae(f"Alpha,0,0,0,{strike!r},{dip!r},,{float(trend)!r},{float(plunge)!r},,\n")
    assert abs((stria.rake_deg - rake + 90.0) % 180.0 - 90.0) < 1e-6  # the same line, either way along it
    assert told == ()


@pytest.mark.parametrize(("sense", "rake"), [("normal", -60.0), ("reverse", 120.0), ("reverse-dextral", 120.0), ("sinistral", -60.0)])
def test_a_line_is_turned_to_agree_with_the_sense(sense, rake):
    trend, plunge = lines.trend_plunge_deg(planes.slip_vectors(planes.normals(30.0, 50.0), 120.0))
    (stria,), _ = striae(f"Alpha,0,0,0,30,50,,{float(trend)!r},{float(plunge)!r},{sense},\n")
    assert stria.rake_deg == pytest.approx(rake, abs=1e-6)


def test_places_are_in_the_unit_of_the_model_and_up_is_up():
    (stria,), _ = striae("Alpha,1,2,-3,0,60,0,,,,\n", Frame("km", "depth"))
    assert stria.place == (1000.0, 2000.0, -3000.0)
    (stria,), _ = striae("Alpha,1,2,3,0,60,0\n", Frame("ft"), "fault,easting,northing,depth,strike_deg,dip_deg,rake_deg\n")
    assert np.allclose(stria.place, (0.3048, 0.6096, -0.9144))


def test_a_line_off_its_plane_is_told():
    _, told = striae("Alpha,0,0,0,0,45,,90,80,normal,\n")
    assert told == ("striae.csv, row 2: the line lies 35 degrees off its plane and is projected onto it",)


@pytest.mark.parametrize(
    ("row", "message"),
    [
        ("Alfa,0,0,0,0,60,0,,,,", r"striae\.csv, row 2: found fault 'Alfa'; wanted the name of a fault.*\n  next: did you mean 'Alpha'\?"),
        ("Alpha,0,0,,0,60,0,,,,", "found no up; wanted a number"),
        ("Alpha,here,0,0,0,60,0,,,,", "found easting 'here'"),
        ("Alpha,0,0,0,0,91,0,,,,", "found dip_deg 91; wanted 0 to 90"),
        ("Alpha,0,0,0,0,60,181,,,,", "found rake_deg 181; wanted -180 to 180"),
        ("Alpha,0,0,0,0,60,,,,,", "neither rake_deg nor trend_deg"),
        ("Alpha,0,0,0,0,60,0,10,20,,", "both rake_deg and trend_deg"),
        ("Alpha,0,0,0,0,60,,10,,,", "found no plunge_deg"),
        ("Alpha,0,0,0,0,60,,10,95,,", "found plunge_deg 95; wanted -90 to 90"),
        ("Alpha,0,0,0,0,0,,10,90,,", "a line at right angles to its plane"),
        ("Alpha,0,0,0,0,60,0,,,left,", "found sense 'left'; wanted one of normal, reverse, sinistral, dextral"),
        ("Alpha,0,0,0,0,60,0,,,,-1", "found weight -1; wanted 0 or more"),
    ],
)
def test_bad_rows_are_named(row, message):
    with pytest.raises(TableError, match=message):
        striae(row + "\n")


def test_unknown_columns_are_told():
    _, told = striae("Beta,0,0,0,0,60,0,me\n", head="fault,easting,northing,up,strike_deg,dip_deg,rake_deg,author\n")
    assert told == ("striae.csv: columns author are not used",)
