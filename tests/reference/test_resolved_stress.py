"""Shear, slip and tendencies on planes against outside values."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.kinematics.senses import nearest_word
from structviz.kinematics.slip import resolved_slip, shear_and_normal
from structviz.orientation.lines import vectors
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_vectors
from structviz.orientation.vectors import axial_angle_deg, dot
from structviz.stress.conjugate import pair_axes
from structviz.stress.tensor import dilation_tendency, instability, principal, reduced_tensor, slip_tendency

NED = np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, -1.0]])


def check_plane(case, tensor, n, wanted, off):
    """Compare stresses, rake and tendencies on one plane."""
    shear, pressure = shear_and_normal(tensor, n)
    case.near([pressure, shear], [wanted["sigma_n"], wanted["tau"]], off)
    case.near(dilation_tendency(tensor, n), wanted["Td"], 1e-7)
    if pressure > 0:
        case.near(shear / pressure, wanted["Ts"], 1e-7)
    slip = resolved_slip(tensor, n)
    if wanted["rake"] is None:
        case.same(slip.tolist(), [0.0, 0.0, 0.0])
        assert np.isnan(rakes_deg(n, slip)), case.about
    else:
        case.near(rakes_deg(n, slip), wanted["rake"], 1e-4, 360)


def test_wb_01_sense_of_slip_in_a_worked_exercise(case):
    tensor = NED @ np.array(case.input["SG_NED"], float) @ NED.T
    for plane, wanted, word in zip(case.input["strike_dip"], case.expected["results"], case.expected["correct_sense"]):
        n = normals(*plane)
        check_plane(case, tensor, n, wanted, 1e-8)
        case.same(nearest_word(float(rakes_deg(n, resolved_slip(tensor, n)))), word)
    published = shear_and_normal(tensor, normals(*np.array(case.input["strike_dip"], float).T))
    case.near(published[1], case.expected["published_sigma_n"], 1e-9)
    case.near(published[0], case.expected["published_abs_tau_dip"], 1e-9)


def test_wb_02_four_full_tensors(case):
    for given, wanted in zip(case.input, case.expected):
        tensor = NED @ np.array(given["SG_NED"], float) @ NED.T
        n = normals(given["strike"], given["dip"])
        check_plane(case, tensor, n, wanted, 1e-6)
        traction = tensor @ n
        along = strike_vectors(n)
        case.near([dot(traction, along), dot(traction, np.cross(along, n))], [wanted["tau_strike"], wanted["tau_downdip"]], 1e-6)
        case.near(shear_and_normal(tensor, n)[1], wanted["published"]["Sn"], 1.0)


def test_wb_04_tension_positive_example(case):
    flat = -np.array(case.input["cauchy_tension_positive_xy_EN"], float)
    tensor = np.zeros((3, 3))
    tensor[:2, :2] = flat
    tensor[2, 2] = 50.0
    n = np.array([*case.input["fault_normal_EN"], 0.0])
    shear, pressure = shear_and_normal(tensor, n / np.linalg.norm(n))
    case.near([-pressure, shear], [case.expected["t_N"], case.expected["t_S_abs"]], 1e-6)
    case.near(-(tensor @ n)[:2], case.expected["t"], 1e-6)
    axes, values, _ = principal(tensor)
    case.near([-values[2], -values[0]], case.expected["principal"], 1e-6)
    case.near(np.degrees(np.arctan2(axes[0, 0], axes[0, 1])), case.expected["max_compression_azimuth"], 1e-6, 180)
    vertical = normals(135.0, 90.0)
    for moving in (vertical, -vertical):
        case.near(rakes_deg(moving, resolved_slip(tensor, moving)), 180.0, 1e-4, 360)  # right-lateral from either side


def test_wb_06_inclined_tensors_and_planes(case):
    for given, row in zip(case.input, case.expected):
        tensor = np.array(given["tensor_ENU"])
        s1, s2, s3 = given["values"]
        axes = np.stack([vectors(*axis) for axis in given["axes_s1_s2_s3_trend_plunge"]])
        reduced = reduced_tensor(axes, (s2 - s3) / (s1 - s3))
        case.near(reduced * (s1 - s3) + s3 * np.eye(3), tensor, 1e-7)
        for plane, wanted in zip(given["planes"], row):
            n = normals(*plane)
            if wanted["rake"] is not None:  # the tensor is printed to ten digits, so nil shear is judged on the exact one
                check_plane(case, tensor, n, wanted, 1e-6)
            check_plane(case, reduced * (s1 - s3) + s3 * np.eye(3), n, wanted, 1e-6)


def test_wb_08_exact_special_cases(case):
    rng = np.random.default_rng(8)
    n = rng.normal(size=(50, 3))
    n /= np.linalg.norm(n, axis=1)[:, None]
    frame = np.linalg.qr(rng.normal(size=(3, 3)))[0].T
    tensor = reduced_tensor(frame, 0.3)
    assert not resolved_slip(tensor, frame).any(), case.about
    assert not resolved_slip(5 * np.eye(3), n).any(), case.about
    around = np.cos(np.linspace(0.1, 1.4, 20))[:, None]
    across = around * frame[0] + np.sqrt(1 - around**2) * frame[2]
    for ratio in (0.0, 0.4, 1.0):
        case.near(dot(resolved_slip(reduced_tensor(frame, ratio), across), frame[1]), np.zeros(20), 1e-10)
    towards_s3 = frame[2] - (n @ frame[2])[:, None] * n
    equal = resolved_slip(reduced_tensor(frame, 1.0), n)
    assert axial_angle_deg(equal, towards_s3).max() < 1e-5, case.about
    moved = 7.0 * tensor + 3.0 * np.eye(3)
    case.near(resolved_slip(moved, n), resolved_slip(tensor, n), 1e-10)
    case.near(dilation_tendency(moved, n), dilation_tendency(tensor, n), 1e-10)
    case.near(slip_tendency(moved, n), slip_tendency(tensor, n), 1e-10)
    octahedral = case.expected[5]
    shear, pressure = shear_and_normal(np.diag([30.0, 20.0, 10.0]), np.full(3, 3**-0.5))
    case.near([pressure, shear, shear / pressure], [octahedral["sigma_n"], octahedral["tau"], octahedral["Ts"]], 1e-10)
    case.near(dilation_tendency(np.diag([30.0, 20.0, 10.0]), np.full(3, 3**-0.5)), octahedral["Td"], 1e-10)


def test_wb_09_greatest_slip_tendency(case):
    for values, greatest, angle in zip(case.input["s1_s2_s3"], case.expected["Ts_max"], case.expected["angle_of_plane_to_s1"]):
        tensor = np.diag(np.array(values, float))
        best = np.array([np.sin(np.radians(angle)), 0.0, np.cos(np.radians(angle))])
        shear, pressure = shear_and_normal(tensor, best)
        case.near(shear / pressure, greatest, 1e-9)
        n = np.random.default_rng(9).normal(size=(5000, 3))
        n /= np.linalg.norm(n, axis=1)[:, None]
        shear, pressure = shear_and_normal(tensor, n)
        assert (shear / pressure).max() <= greatest + 1e-9, case.about
        # With that friction the critical state is this very stress, so the normalised tendency is the plain one over its maximum.
        case.near(slip_tendency(tensor, n, friction=greatest), shear / pressure / greatest, 1e-8)


def test_wb_10_instability(case):
    mu, theta = case.input["mu"], np.arctan(1 / case.input["mu"]) / 2
    planes = np.array([[np.sin(theta), 0.0, np.cos(theta)], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])
    case.near(instability(reduced_tensor(np.eye(3), case.input["R"]), planes, mu), case.expected["I"], 1e-8)


def test_mc_01_friction_and_the_angles_it_sets(case):
    for row in case.expected:
        mu, theta = row["mu"], np.radians(row["theta_from_s1"])
        reduced = reduced_tensor([[0, 0, 1], [0, 1, 0], [1, 0, 0]], 0.5)  # sigma1 vertical
        dip = 45 + np.degrees(np.arctan(mu)) / 2  # the printed dip has only eight decimals, and the pair doubles its rounding
        case.near(dip, row["normal_fault_dip"], 1e-8)
        pair = normals([0.0, 180.0], dip)
        case.near(slip_tendency(reduced, pair, mu), [1.0, 1.0], 1e-8)
        case.near(instability(reduced, pair, mu), [1.0, 1.0], 1e-8)
        assert (slip_tendency(reduced, normals(0.0, dip + np.array([-1.0, 1.0])), mu) < 1).all()
        axes, acute = pair_axes(*pair)
        case.near(acute, row["conjugate_angle_2theta"], 1e-8)
        case.near(90 - acute, row["phi"], 1e-8)
        assert axial_angle_deg(axes[0], [0, 0, 1]) < 1e-6
        critical = reduced * (row["ratio_s1_s3"] - 1) + np.eye(3)
        shear, pressure = shear_and_normal(critical, pair[0])
        case.near(shear / pressure, mu, 1e-8)
        case.near(pair[0] @ [0, 0, 1], np.sin(theta), 1e-8)
        locked = np.radians(row["lockup_angle_from_s1"])
        shear, pressure = shear_and_normal(np.diag([1.0, 0.5, 0.0]), [np.sin(locked), 0.0, np.cos(locked)])
        case.near(shear, mu * pressure, 1e-8)  # at the lock-up angle even sigma3 = 0 only just moves it


@pytest.mark.parametrize("rake", [-120.0, 0.0, 75.0, 180.0])
def test_a_stress_made_to_slip_a_plane_does_so(rake):
    n = normals(40.0, 55.0)
    slip = slip_vectors(n, rake)
    axes = np.stack([(n - slip) / np.sqrt(2), np.cross(n, slip), (n + slip) / np.sqrt(2)])
    np.testing.assert_allclose(resolved_slip(reduced_tensor(axes, 0.5), n), slip, atol=1e-12)
