"""Laws of orientation and slip that hold for any numbers: turn, mirror, go and come back, turn a normal round."""

from __future__ import annotations

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from structviz.kinematics.slip import resolved_slip, shear_and_normal
from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_dip_deg
from structviz.orientation.projection import axes_of_points, equal_area
from structviz.orientation.statistics import axial_mean, fabric, fisher_mean, orientation_tensor, spherical_median
from structviz.orientation.vectors import axial_angle_deg, rotation_vectors_to_matrices
from structviz.stress.classify import a_phi, kinds, shmax_deg
from structviz.stress.mechanisms import auxiliary_plane_deg, pbt_axes
from structviz.stress.tensor import dilation_tendency, frame_angle_deg, instability, principal, reduced_tensor, slip_tendency

law = settings(derandomize=True, database=None, deadline=None, max_examples=60)

strikes = st.floats(0, 359.999)
dips = st.floats(0.5, 89.5)
rakes = st.floats(-179.99, 180)
shapes = st.floats(0.02, 0.98)
turns = st.tuples(*[st.floats(-3, 3)] * 3).map(np.array)
frames = turns.map(rotation_vectors_to_matrices)
seeds = st.integers(0, 10_000)
MIRROR = np.diag([-1.0, 1.0, 1.0])  # east becomes west


def some_vectors(seed, count=20):
    v = np.random.default_rng(seed).normal(size=(count, 3)) + np.array([0.4, 0.2, -0.3])
    return v / np.linalg.norm(v, axis=1)[:, None]


def off_deg(found, wanted, period=360.0):
    """Return how far angles are apart around the circle."""
    return np.abs((np.asarray(found) - wanted + period / 2) % period - period / 2)


@law
@given(strikes, dips)
def test_strike_and_dip_come_back_from_either_normal(strike, dip):
    for sign in (1, -1):
        found = strike_dip_deg(sign * normals(strike, dip))
        assert off_deg(found[0], strike) < 1e-7
        assert abs(found[1] - dip) < 1e-7


@law
@given(strikes, dips, rakes)
def test_rake_comes_back(strike, dip, rake):
    n = normals(strike, dip)
    assert off_deg(rakes_deg(n, slip_vectors(n, rake)), rake) < 1e-7


@law
@given(strikes, st.floats(0.01, 89.99))
def test_trend_and_plunge_come_back_from_either_end(trend, plunge):
    for sign in (1, -1):
        found = trend_plunge_deg(sign * vectors(trend, plunge))
        assert off_deg(found[0], trend) < 1e-7
        assert abs(found[1] - plunge) < 1e-7


@law
@given(strikes, st.floats(0, 90))
def test_a_point_of_the_net_comes_back(trend, plunge):
    axis = vectors(trend, plunge)
    np.testing.assert_allclose(axes_of_points(equal_area(axis)), axis, atol=1e-12)


@law
@given(strikes, dips, rakes, st.floats(0, 360))
def test_turning_the_map_turns_strikes_and_keeps_dips_and_rakes(strike, dip, rake, by):
    turn = rotation_vectors_to_matrices([0.0, 0.0, -np.radians(by)])  # clockwise, as azimuths count
    n = normals(strike, dip)
    turned_n, turned_s = turn @ n, turn @ slip_vectors(n, rake)
    found = strike_dip_deg(turned_n)
    assert off_deg(found[0], strike + by) < 1e-6
    assert abs(found[1] - dip) < 1e-7
    assert off_deg(rakes_deg(turned_n, turned_s), rake) < 1e-6


@law
@given(strikes, dips, rakes)
def test_a_mirror_turns_sinistral_into_dextral(strike, dip, rake):
    n = normals(strike, dip)
    mirrored_n, mirrored_s = MIRROR @ n, MIRROR @ slip_vectors(n, rake)
    assert off_deg(rakes_deg(mirrored_n, mirrored_s), 180 - rake) < 1e-6
    assert off_deg(strike_dip_deg(mirrored_n)[0], 180 - strike) < 1e-6


@law
@given(strikes, dips, rakes)
def test_the_other_block_tells_the_same_strike_slip(strike, dip, rake):
    """On a vertical plane the rake seen from the other side keeps its horizontal part and turns its vertical one."""
    del dip
    n = normals(strike, 90.0)
    assert off_deg(rakes_deg(-n, -slip_vectors(n, rake)), -rake) < 1e-6


@law
@given(frames, shapes, turns, seeds)
def test_slip_turns_with_stress_and_plane(frame, shape, by, seed):
    turn, n = rotation_vectors_to_matrices(by), some_vectors(seed)
    tensor = reduced_tensor(frame, shape)
    turned_tensor, turned_n = turn @ tensor @ turn.T, n @ turn.T
    assume(shear_and_normal(tensor, n)[0].min() > 1e-6)
    np.testing.assert_allclose(resolved_slip(turned_tensor, turned_n), resolved_slip(tensor, n) @ turn.T, atol=1e-8)
    for measure in (slip_tendency, dilation_tendency, instability):
        np.testing.assert_allclose(measure(turned_tensor, turned_n), measure(tensor, n), atol=1e-9)


@law
@given(frames, shapes, seeds)
def test_slip_mirrors_with_stress_and_plane(frame, shape, seed):
    n = some_vectors(seed)
    tensor = reduced_tensor(frame, shape)
    assume(shear_and_normal(tensor, n)[0].min() > 1e-6)
    slips = resolved_slip(MIRROR @ tensor @ MIRROR, n @ MIRROR)
    np.testing.assert_allclose(slips, resolved_slip(tensor, n) @ MIRROR, atol=1e-8)
    assert off_deg(rakes_deg(n @ MIRROR, slips), 180 - rakes_deg(n, resolved_slip(tensor, n))).max() < 1e-5


@law
@given(frames, shapes, st.floats(0.01, 1e4), st.floats(-100, 100), seeds)
def test_slip_knows_neither_size_nor_pressure(frame, shape, size, pressure, seed):
    n = some_vectors(seed)
    tensor = reduced_tensor(frame, shape)
    moved = size * tensor + pressure * np.eye(3)
    assume(shear_and_normal(tensor, n)[0].min() > 1e-4)
    np.testing.assert_allclose(resolved_slip(moved, n), resolved_slip(tensor, n), atol=1e-6)


@law
@given(frames, shapes, turns)
def test_principal_axes_turn_with_the_tensor(frame, shape, by):
    turn = rotation_vectors_to_matrices(by)
    axes, _, ratio = principal(turn @ reduced_tensor(frame, shape) @ turn.T)
    assert abs(ratio - shape) < 1e-9
    assert frame_angle_deg(axes, frame @ turn.T) < 1e-4


@law
@given(frames, frames, turns)
def test_the_distance_of_frames_does_not_see_a_common_turn(first, second, by):
    turn = rotation_vectors_to_matrices(by)
    apart = frame_angle_deg(first, second)
    assert abs(frame_angle_deg(first @ turn.T, second @ turn.T) - apart) < 1e-4
    assert abs(frame_angle_deg(second, first) - apart) < 1e-4
    assert 0 <= apart <= 120.0001


@law
@given(frames, frames, frames)
def test_the_distance_of_frames_obeys_the_triangle(first, second, third):
    around = frame_angle_deg(first, second) + frame_angle_deg(second, third)
    assert frame_angle_deg(first, third) <= around + 1e-4


@law
@given(frames, shapes, st.floats(0, 360))
def test_shmax_turns_with_the_map_and_the_class_stays(frame, shape, by):
    turn = rotation_vectors_to_matrices([0.0, 0.0, -np.radians(by)])
    turned = frame @ turn.T
    horizontal = reduced_tensor(frame, shape)[:2, :2]
    assume(np.ptp(np.linalg.eigvalsh(horizontal)) > 1e-3)
    assert off_deg(shmax_deg(turned, shape), shmax_deg(frame, shape) + by, 180) < 1e-6
    assert off_deg(shmax_deg(frame @ MIRROR, shape), -shmax_deg(frame, shape), 180) < 1e-6
    assert abs(a_phi(turned, shape) - a_phi(frame, shape)) < 1e-9
    edges = np.abs(np.degrees(np.arcsin(np.abs(frame[:, 2])))[:, None] - [20, 35, 40, 45, 52])
    assume(edges.min() > 1e-6)
    assert str(kinds(turned)) == str(kinds(frame))


@law
@given(seeds, turns)
def test_means_turn_with_the_data(seed, by):
    v, turn = some_vectors(seed, 30), rotation_vectors_to_matrices(by)
    np.testing.assert_allclose(orientation_tensor(v @ turn.T), turn @ orientation_tensor(v) @ turn.T, atol=1e-12)
    assert axial_angle_deg(axial_mean(v @ turn.T), axial_mean(v) @ turn.T) < 1e-5
    np.testing.assert_allclose(fisher_mean(v @ turn.T).mean, turn @ fisher_mean(v).mean, atol=1e-12)
    np.testing.assert_allclose(spherical_median(v @ turn.T), turn @ spherical_median(v), atol=1e-6)
    np.testing.assert_allclose(fabric(v @ turn.T).eigenvalues, fabric(v).eigenvalues, atol=1e-12)


@law
@given(seeds, st.integers(0, 2**20 - 1))
def test_axes_know_no_signs_and_no_order(seed, flips):
    v = some_vectors(seed)
    signs = np.array([1.0 if flips >> i & 1 else -1.0 for i in range(20)])
    order = np.random.default_rng(flips).permutation(20)
    np.testing.assert_allclose(orientation_tensor((v * signs[:, None])[order]), orientation_tensor(v), atol=1e-13)


@law
@given(strikes, dips, rakes)
def test_both_nodal_planes_have_the_same_axes(strike, dip, rake):
    assert frame_angle_deg(pbt_axes(strike, dip, rake), pbt_axes(*auxiliary_plane_deg(strike, dip, rake))) < 1e-4


@law
@given(strikes, dips, rakes)
def test_a_mirror_keeps_p_and_t_of_the_mirrored_mechanism(strike, dip, rake):
    mirrored = pbt_axes((180 - strike) % 360, dip, 180 - rake)
    for row in (0, 2):
        assert axial_angle_deg(mirrored[row], MIRROR @ pbt_axes(strike, dip, rake)[row]) < 1e-4
