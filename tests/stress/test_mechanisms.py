"""Nodal planes and P, B, T axes, against ObsPy and a catalogue of earthquakes."""

from __future__ import annotations

import csv
import importlib
import warnings

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from structviz.errors import ArgumentError
from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.mechanisms import (
    auxiliary_plane_deg,
    less_stable_plane,
    moment_tensor,
    nodal_planes_deg,
    normals_and_slips,
    pbt_axes,
    pbt_of_moment,
    tensor_of_up_south_east,
)
from structviz.stress.tensor import frame_angle_deg, reduced_tensor


@pytest.fixture(scope="module")
def beachball():
    """Return ObsPy's module of mechanisms; its own warnings are not ours."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return importlib.import_module("obspy.imaging.beachball")


def random_mechanisms(count, seed=0):
    rng = np.random.default_rng(seed)
    return rng.uniform(0, 360, count), rng.uniform(1, 89, count), rng.uniform(-180, 180, count)


def test_auxiliary_planes_agree_with_obspy(beachball):
    angles = random_mechanisms(2000)
    found = np.stack(auxiliary_plane_deg(*angles), -1)
    wanted = np.array([beachball.aux_plane(*one) for one in zip(*angles)])
    np.testing.assert_allclose((found - wanted + 180) % 360 - 180, 0.0, atol=1e-6)


def test_axes_of_moment_tensors_agree_with_obspy(beachball):
    components = np.random.default_rng(1).normal(size=(500, 6))
    axes, values = pbt_of_moment(tensor_of_up_south_east(components))
    trend, plunge = trend_plunge_deg(axes)
    for i, one in enumerate(components):
        t, b, p = beachball.mt2axes(beachball.MomentTensor(*one, 0))
        for row, axis in enumerate((p, b, t)):
            np.testing.assert_allclose([plunge[i, row], values[i, row]], [axis.dip, axis.val], atol=1e-6)
            assert axial_angle_deg(vectors(trend[i, row], plunge[i, row]), vectors(axis.strike, axis.dip)) < 1e-5


def test_axes_of_planes_agree_with_obspy(beachball):
    angles = random_mechanisms(500, 2)
    found = pbt_axes(*angles)
    tensors = moment_tensor(*angles)
    for axes, m in zip(found, tensors):
        # r up, t south, p east
        use = (m[2, 2], m[1, 1], m[0, 0], -m[1, 2], m[0, 2], -m[0, 1])
        t, b, p = beachball.mt2axes(beachball.MomentTensor(*use, 0))
        for row, axis in enumerate((p, b, t)):
            assert axial_angle_deg(axes[row], vectors(axis.strike, axis.dip)) < 1e-4


def test_the_auxiliary_plane_of_the_auxiliary_plane_is_the_first():
    angles = random_mechanisms(2000, 3)
    back = np.stack(auxiliary_plane_deg(*auxiliary_plane_deg(*angles)), -1)
    np.testing.assert_allclose((back - np.stack(angles, -1) + 180) % 360 - 180, 0.0, atol=1e-6)


def test_both_planes_are_one_mechanism():
    angles = random_mechanisms(500, 4)
    axes, other = pbt_axes(*angles), pbt_axes(*auxiliary_plane_deg(*angles))
    assert frame_angle_deg(axes, other).max() < 1e-5
    np.testing.assert_allclose(np.linalg.det(axes), 1.0)
    np.testing.assert_allclose(moment_tensor(*angles), moment_tensor(*auxiliary_plane_deg(*angles)), atol=1e-12)


def test_planes_axes_and_moments_go_round():
    angles = random_mechanisms(300, 5)
    axes = pbt_axes(*angles)
    planes = np.stack(nodal_planes_deg(axes), -1)
    first = np.abs((planes - np.stack(angles, -1)[:, None] + 180) % 360 - 180).max(-1).min(-1)
    assert first.max() < 1e-6
    assert frame_angle_deg(pbt_of_moment(moment_tensor(*angles))[0], axes).max() < 1e-5


@pytest.mark.parametrize("table, count", [("himalaya_tibet.csv", 168), ("makran_se_iran.csv", 273)])
def test_a_catalogue_of_earthquakes(shared_data, table, count):
    """Planes and axes are given redundantly: both planes must yield the P and T printed, and each other."""
    with (shared_data / "focal_mechanisms" / table).open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    column = {key: np.array([float(row[key]) for row in rows]) for key in ("S1", "D1", "R1", "S2", "D2", "R2", "Paz", "Ppl", "Taz", "Tpl")}
    assert len(rows) == count
    planes = [[column[f"{key}{i}"] for key in "SDR"] for i in (1, 2)]
    for plane, other in (planes, planes[::-1]):
        axes = pbt_axes(*plane)
        off = np.maximum(
            axial_angle_deg(axes[:, 0], vectors(column["Paz"], column["Ppl"])),
            axial_angle_deg(axes[:, 2], vectors(column["Taz"], column["Tpl"])),
        )
        assert (off < 0.01).all(), f"{(off >= 0.01).sum()} of {count} events are off"
        assert frame_angle_deg(pbt_axes(*auxiliary_plane_deg(*plane)), pbt_axes(*other)).max() < 0.01


def test_the_plane_nearer_to_slip_is_chosen():
    """Slip on planes made by a stress: the plane well oriented for friction 0.6 wins over its auxiliary plane."""
    frame = Rotation.random(random_state=6).as_matrix()
    tensor, theta = reduced_tensor(frame, 0.5), np.arctan(1 / 0.6) / 2
    fault = np.sin(theta) * frame[0] + np.cos(theta) * frame[2]
    other = np.cos(theta) * frame[0] + np.sin(theta) * frame[2]  # the trace of its auxiliary plane lies nearer to sigma3
    assert int(less_stable_plane(tensor, np.stack([fault, other]))) == 0
    assert less_stable_plane(tensor, np.stack([[other, fault], [fault, other]])).tolist() == [1, 0]


def test_angles_broadcast_and_bad_ones_are_refused():
    n, s = normals_and_slips(np.zeros((3, 1)), 45.0, [0.0, 90.0])
    assert n.shape == s.shape == (3, 2, 3)
    with pytest.raises(ArgumentError, match="dip_deg: found 120 deg"):
        pbt_axes(0.0, 120.0, 0.0)
    with pytest.raises(ArgumentError, match="components: found shape"):
        tensor_of_up_south_east([1.0, 2.0])
    with pytest.raises(ArgumentError, match="axes: found shape"):
        nodal_planes_deg([1.0, 2.0])
