"""Stress from slip against outside values."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals, slip_vectors
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.inversion import angular_inversion, linear_inversion, linear_rank
from structviz.stress.mechanisms import normals_and_slips


def slip_data(case):
    return normals_and_slips(*np.array(case.input["strike_dip_rake"], float).T)


def worst_axis_deg(axes, trend_plunge):
    return axial_angle_deg(axes, vectors(*np.array(trend_plunge, float).T)).max()


def test_inv_01_exact_recovery_and_the_bias_of_the_linear_solution(case):
    wanted = case.expected
    exact = angular_inversion(*slip_data(case))
    assert worst_axis_deg(exact.axes, wanted["true_axes_s1_s2_s3"]) < 1e-5, case.about
    case.near(exact.shape_ratio, wanted["phi"], 1e-7)
    assert exact.mean_misfit_deg < 1e-5, case.about
    linear, biased = linear_inversion(*slip_data(case)), wanted["linear_unit_shear_LSQ"]
    assert worst_axis_deg(linear.axes, biased["axes"]) < 1e-3, case.about
    case.near(linear.shape_ratio, biased["phi"], 1e-6)
    case.near([linear.mean_misfit_deg, linear.misfits_deg.max()], [biased["mean_misfit_deg"], biased["max_misfit_deg"]], 1e-3)


def test_inv_04_rakes_with_errors(case):
    linear, wanted = linear_inversion(*slip_data(case)), case.expected["linear_unit_shear_LSQ"]
    assert worst_axis_deg(linear.axes, wanted["axes"]) < 1e-3, case.about
    case.near([linear.shape_ratio, linear.mean_misfit_deg], [wanted["phi"], wanted["mean_misfit"]], 1e-3)
    least, wanted = angular_inversion(*slip_data(case)), case.expected["min_rms_angle"]
    assert worst_axis_deg(least.axes, wanted["axes"]) < 0.05, case.about
    case.near(least.shape_ratio, wanted["phi"], 2e-3)
    rms = np.sqrt((least.misfits_deg**2).mean())
    case.near([rms, least.mean_misfit_deg], [wanted["rms_misfit"], wanted["mean_misfit"]], 1e-3)


def test_inv_05_how_much_the_planes_determine(case):
    sets = [
        [(10, 65)],
        [(10, 65), (80, 50)],
        [(10, 65), (80, 50), (150, 30)],
        [(10, 65)] * 12,
        [(0, 60), (180, 60)],
        [(strike, dip) for strike in (0, 180) for dip in (20, 35, 50, 60, 75, 85)],
    ]
    for planes, text, rank in zip(sets, case.input, case.expected):
        n = normals(*np.array(planes, float).T)
        assert linear_rank(n) == rank, f"{text}{case.about}"
        if rank < 5:
            with pytest.raises(ArgumentError, match=f"found {len(n)} planes that determine {rank} of 5 parameters"):
                linear_inversion(n, slip_vectors(n, -90.0))


def test_inv_06_every_sense_reversed(case, cases):
    n, s = slip_data(cases["INV-01"])
    straight, turned = angular_inversion(n, s), angular_inversion(n, -s)
    assert axial_angle_deg(turned.axes, straight.axes[::-1]).max() < 1e-5, case.about
    case.near(turned.shape_ratio, 1 - straight.shape_ratio, 1e-6)
    mixed = s * np.where(np.arange(len(s)) % 2, 1.0, -1.0)[:, None]
    unknown = angular_inversion(n, mixed, senses_known=False)
    other = unknown.reversed()
    assert not unknown.senses_known, case.about
    near = [axial_angle_deg(found.axes, straight.axes).max() for found in (unknown, other)]
    assert min(near) < 1e-5, case.about
    case.near(unknown.shape_ratio + other.shape_ratio, 1.0, 1e-12)
    case.near(other.misfits_deg, unknown.misfits_deg, 0)


def test_inv_08_turned_data(case, cases):
    angles = np.array(cases["INV-01"].input["strike_dip_rake"], float)
    turned = angles + np.array([37.0, 0.0, 0.0])
    for invert in (linear_inversion, angular_inversion):
        first, second = invert(*normals_and_slips(*angles.T)), invert(*normals_and_slips(*turned.T))
        trend, plunge = trend_plunge_deg(first.axes)
        assert axial_angle_deg(second.axes, vectors(trend + 37, plunge)).max() < 1e-5, case.about
        case.near(second.shape_ratio, first.shape_ratio, 1e-6)
        case.near(second.misfits_deg, first.misfits_deg, 1e-5)
