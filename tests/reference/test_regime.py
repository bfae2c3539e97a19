"""Class, SHmax, A_phi and axis averages against outside values."""

from __future__ import annotations

import numpy as np

from structviz.orientation.lines import vectors
from structviz.orientation.statistics import axial_mean_azimuth_deg
from structviz.stress.classify import a_phi, kinds, kinds_of_plunges, shmax_deg
from structviz.stress.mechanisms import pbt_axes
from structviz.stress.tensor import principal, reduced_tensor

WORDS = {"NF": "normal", "NS": "normal-oblique", "SS": "strike-slip", "TS": "reverse-oblique", "TF": "reverse", "U": "undefined"}
NED = np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, -1.0]])


def test_reg_01_table_of_classes(case):
    """Every whole-degree triple of plunges, against the printed rules read from their own words."""
    p, t = (values.ravel() for values in np.meshgrid(np.arange(0.0, 91.0), np.arange(0.0, 91.0)))
    left = 1 - np.sin(np.radians(p)) ** 2 - np.sin(np.radians(t)) ** 2
    possible = left >= -1e-12
    p, t = p[possible], t[possible]
    b = np.degrees(np.arcsin(np.sqrt(np.clip(left[possible], 0, 1))))
    b = np.round(b, 9)
    wanted = np.full(p.shape, "undefined", dtype="<U20")
    for row in reversed(case.expected["table"]):
        if row["P"] != "else":
            hits = np.ones(p.shape, bool)
            for rule, value in ((row["P"], p), (row["B"], b), (row["T"], t)):
                hits &= _obeys(rule, value)
            wanted[hits] = WORDS[row["regime"]]
    assert (kinds_of_plunges(p, b, t) == wanted).all(), case.about
    assert set(wanted) == set(WORDS.values())


def _obeys(rule, value):
    if not rule:
        return np.ones(value.shape, bool)
    if rule.startswith("pl"):
        number = float(rule.lstrip("pl<>="))
        return {"pl>=": value >= number, "pl<=": value <= number, "pl<": value < number}[rule.rstrip("0123456789.")]
    low, high = rule.split("<=pl<")
    return (value >= float(low)) & (value < float(high))


def test_reg_02_edges_of_the_classes(case):
    found = kinds_of_plunges(*np.array(case.input["plunges_P_B_T"]).T)
    case.same(found.tolist(), [WORDS[word] for word in case.expected["regime"]])


def test_reg_03_squared_vertical_parts_of_the_axes(case):
    axes = pbt_axes(*np.array(case.input["strike_dip_rake"], float).T)
    case.near(axes[:, ::-1, 2] ** 2, case.expected["fT_fB_fP"], 1e-9)


def test_reg_04_a_phi(case):
    sv, greater, lesser = np.array(case.input["Sv_SH_Sh"], float).T
    axes, _, ratio = principal(np.stack([np.diag(row) for row in np.stack([lesser, greater, sv], -1)]))
    case.near(ratio, case.expected["phi"], 1e-10)
    case.near(a_phi(axes, ratio), case.expected["A_phi"], 1e-10)


def test_reg_05_shmax_of_inclined_axes(case):
    for given, wanted in zip(case.input["axes_trend_plunge"], case.expected["SHmax_azimuth"]):
        axes = np.stack([vectors(*given[key]) for key in ("s1", "s2", "s3")])
        ratio = 1 - np.array(case.input["R"], float)  # the source counts R from the other end
        case.near(shmax_deg(axes, ratio), np.array(wanted), 1e-6, 180)
        tensors = reduced_tensor(axes, ratio)
        slow = [np.linalg.eigh(tensor[:2, :2])[1][:, 1] for tensor in tensors]
        case.near([np.degrees(np.arctan2(*axis)) for axis in slow], wanted, 1e-6, 180)


def test_reg_07_strike_slip_tensor(case):
    given, wanted = case.input, case.expected
    azimuth = given["SHmax_azimuth"]
    axes = np.stack([vectors(azimuth, 0.0), vectors(0.0, 90.0), vectors(azimuth + 90, 0.0)])
    span = given["SHmax"] - given["Shmin"]
    tensor = reduced_tensor(axes, (given["Sv"] - given["Shmin"]) / span) * span + given["Shmin"] * np.eye(3)
    case.near(NED @ tensor @ NED.T, wanted["SG_NED"], 1e-9)
    found, _, ratio = principal(tensor)
    case.near(ratio, wanted["phi"], 1e-9)
    case.near(shmax_deg(found, ratio), wanted["SHmax_azimuth_recovered"], 1e-9, 180)
    case.near(a_phi(found, ratio), wanted["A_phi"], 1e-9)
    case.same(str(kinds(found)), wanted["regime"])


def test_reg_08_tensors_of_the_three_regimes(case):
    down, north, east = np.array([0.0, 0.0, -1.0]), np.array([0.0, 1.0, 0.0]), np.array([1.0, 0.0, 0.0])
    frames = {"SS": (north, down, east), "NF": (down, east, north), "RF": (east, north, down)}
    words = {"SS": "strike-slip", "NF": "normal", "RF": "reverse"}
    for given, wanted in zip(case.input, case.expected):
        s1, s2, s3 = given["S"]
        axes = np.stack(frames[given["regime"]])
        tensor = reduced_tensor(axes, (s2 - s3) / (s1 - s3)) * (s1 - s3) + s3 * np.eye(3)
        case.near(NED @ tensor @ NED.T, wanted, 1e-12)
        case.same(str(kinds(principal(tensor)[0])), words[given["regime"]])


def test_ten_05_axes_across_north(case):
    mean, length = axial_mean_azimuth_deg(case.input["SHmax"])
    case.near(mean, case.expected["mean"][0], 1e-9, 180)
    assert length > 0.9
    mean, length = axial_mean_azimuth_deg(case.input["alternative"])
    assert np.isnan(mean), case.about
    case.near(length, 0.0, 1e-9)
