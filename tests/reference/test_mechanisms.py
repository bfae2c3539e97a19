"""Focal mechanisms against outside values."""

from __future__ import annotations

import numpy as np

from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.mechanisms import (
    auxiliary_plane_deg,
    moment_tensor,
    nodal_planes_deg,
    pbt_axes,
    pbt_of_moment,
    tensor_of_up_south_east,
)
from structviz.stress.tensor import frame_angle_deg

# rr tt pp rt rp tp: r up, t south, p east
USE = np.array([[0.0, 0.0, 1.0], [0.0, -1.0, 0.0], [1.0, 0.0, 0.0]])


def kagan_deg(a, b):
    return float(frame_angle_deg(pbt_axes(*a), pbt_axes(*b)))


def test_fm_01_auxiliary_plane(case):
    found = auxiliary_plane_deg(*(case.input[key] for key in ("strike", "dip", "rake")))
    case.near(found, [case.expected[key] for key in ("strike", "dip", "rake")], 1e-7)


def test_fm_02_auxiliary_plane_near_vertical(case):
    for given, wanted in zip(case.input, case.expected):
        strike, dip, rake = auxiliary_plane_deg(given["strike"], given["dip"], given["rake"])
        case.near([strike, dip], [wanted["strike"], wanted["dip"]], 1e-7)
        case.near(rake, wanted["rake"], 1e-7, 360)


def test_fm_03_axes_and_plane_of_a_moment_tensor(case):
    axes, values = pbt_of_moment(tensor_of_up_south_east(case.input["mt_use_rr_tt_pp_rt_rp_tp"]))
    trend, plunge = trend_plunge_deg(axes)
    for row, key in enumerate(("P", "N", "T")):
        wanted = case.expected[key]
        case.near([values[row], trend[row], plunge[row]], [wanted["val"], wanted["azimuth"], wanted["plunge"]], 1e-7)
    planes = np.stack(nodal_planes_deg(axes), -1)
    nearest = planes[np.abs(planes - case.expected["nodal_plane"]).sum(-1).argmin()]
    case.near(nearest, case.expected["nodal_plane"], 1e-7)


def test_fm_04_strike_and_dip_of_a_normal(case):
    north, east, up = case.input["strike_dip_n_e_u"]
    case.near(strike_dip_deg([east, north, up]), case.expected["strike_dip"], 1e-7)


def test_fm_05_events_of_a_catalogue(case):
    for given, wanted in zip(case.input, case.expected):
        axes, values = pbt_of_moment(tensor_of_up_south_east(given["mt_use_rr_tt_pp_rt_rp_tp"]))
        for kind, off in (("computed", 1e-4), ("catalogue", 1.0)):
            table = np.array(wanted[f"{kind}_axes_T_N_P_val_plunge_az"])[::-1]
            assert (axial_angle_deg(axes, vectors(table[:, 2], table[:, 1])) <= off).all(), case.about
        case.near(values, np.array(wanted["computed_axes_T_N_P_val_plunge_az"])[::-1, 0], 1e-5)
        case.near(kagan_deg(wanted["catalogue_np1"], wanted["computed_planes"][0]), wanted["kagan_catalogue_vs_computed"], 1e-3)
        planes = np.stack(nodal_planes_deg(axes), -1)
        order = planes[:, 0].argsort()
        ranked = sorted(wanted["computed_planes"])
        case.near(planes[order], ranked, 1e-4)


def test_fm_07_axes_auxiliary_plane_and_moment(case):
    for given, wanted in zip(case.input["strike_dip_rake"], case.expected):
        axes = pbt_axes(*given)
        for row, key in enumerate("PBT"):
            trend, plunge = wanted[key]
            assert axial_angle_deg(axes[row], vectors(trend, plunge)) <= 1e-5, case.about
        # The tensor says both planes are one mechanism; a vertical auxiliary plane has two legal strikes.
        strike, dip, rake = auxiliary_plane_deg(*given)
        same = frame_angle_deg(pbt_axes(strike, dip, rake), pbt_axes(*wanted["aux_plane_obspy"]))
        case.near(same, 0.0, 1e-4)
        case.near(dip, wanted["aux_plane_obspy"][1], 1e-6)
        case.near(strike, wanted["aux_plane_obspy"][0], 1e-6, 360)
        case.near(rake, wanted["aux_plane_obspy"][2], 1e-6, 360)
        local = USE @ moment_tensor(*given) @ USE.T
        case.near([local[0, 0], local[1, 1], local[2, 2], local[0, 1], local[0, 2], local[1, 2]], wanted["mt_use"], 1e-9)
        case.near(tensor_of_up_south_east(wanted["mt_use"]), moment_tensor(*given), 1e-9)


def test_fm_09_least_rotation_between_mechanisms(case):
    case.near([kagan_deg(pair["a"], pair["b"]) for pair in case.input], case.expected, 1e-4)


def test_fm_10_published_planes_are_one_mechanism(case):
    case.near(auxiliary_plane_deg(*case.input["np1"]), case.expected["aux_of_np1"], 1e-4)
    case.near(kagan_deg(case.input["np1"], case.input["np2"]), case.expected["kagan_np1_np2"], 1e-4)


def test_the_rake_of_a_slip_is_the_rake_that_made_it():
    strike, dip, rake = (angle.ravel() for angle in np.meshgrid([0.0, 77.0, 301.0], [5.0, 45.0, 90.0], [-179.0, -90.0, 0.0, 33.0, 180.0]))
    axes = pbt_axes(strike, dip, rake)
    slip, normal = (axes[:, 2] - axes[:, 0]) / np.sqrt(2), (axes[:, 2] + axes[:, 0]) / np.sqrt(2)
    np.testing.assert_allclose((rakes_deg(normal, slip) - rake + 180) % 360 - 180, 0, atol=1e-9)
