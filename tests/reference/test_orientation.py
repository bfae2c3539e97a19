"""Planes and lines against outside values."""

from __future__ import annotations

import numpy as np

from structviz.orientation.lines import trend_plunge_deg
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_dip_deg, strike_vectors

NED = np.array([[0, 1, 0], [1, 0, 0], [0, 0, -1]])  # easting, northing, up <-> north, east, down


def test_ori_01_strike_and_dip_of_normals(case):
    planes = np.array(case.expected["planes"])
    for sign in (1, -1):
        strike, dip = strike_dip_deg(sign * np.array(case.input["normals"]))
        case.near(strike, planes[:, 0], 1e-6, 360)
        case.near(dip, planes[:, 1], 1e-6)
        case.near(strike + 90, case.expected["dip_directions"], 1e-6, 360)
    level = strike_dip_deg([0.0, 0.0, 1.0])
    case.near(level, [0.0, 0.0], 0)


def test_ori_02_plane_of_three_points(case):
    p = np.array(case.input["points_enu"], float)
    cross = np.cross(p[1] - p[0], p[2] - p[0])
    strike, dip = strike_dip_deg(cross)
    case.near([strike, dip], [case.expected["strike"], case.expected["dip"]], 1e-6)
    case.near(np.linalg.norm(cross) / 2, case.expected["area"], 1e-6)


def test_ori_03_poles(case):
    planes, poles = np.array(case.input["planes"], float), np.array(case.expected["poles_trend_plunge"], float)
    trend, plunge = trend_plunge_deg(normals(*planes.T))
    case.near(plunge, poles[:, 1], 1e-6)
    sloping = poles[:, 1] > 0
    case.near(trend[sloping], poles[sloping, 0], 1e-6, 360)
    case.near(trend[~sloping], poles[~sloping, 0], 1e-6, 180)


def test_ori_10_rake_to_slip_and_back(case):
    for given, wanted in zip(case.input, case.expected):
        n = normals(given["strike"], given["dip"])
        slip = slip_vectors(n, given["rake"])
        case.near(slip, wanted["vector_enu"], 1e-9)
        case.near(rakes_deg(n, slip), given["rake"], 1e-9, 360)
        trend, plunge = trend_plunge_deg(slip)
        case.near(plunge, wanted["axis_plunge"], 1e-6)
        case.near(trend, wanted["axis_trend"], 1e-6, 360 if plunge > 1e-6 else 180)
        up = -1 if slip[2] > 1e-9 else 1
        case.near(plunge * up, wanted["directed_plunge"], 1e-6)


def test_ori_11_unit_vectors_of_a_plane(case):
    n = normals(case.input["strike"], case.input["dip"])
    along = strike_vectors(n)
    case.near(NED @ n, case.expected["n"], 1e-6)
    case.near(NED @ along, case.expected["strike_vec"], 1e-6)
    case.near(NED @ slip_vectors(n, -90.0), case.expected["down_dip"], 1e-6)
    case.near(NED @ -np.cross(n, along), case.expected["down_dip"], 1e-6)
