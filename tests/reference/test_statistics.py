"""Means and spreads of directions against outside values."""

from __future__ import annotations

import numpy as np

from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals
from structviz.orientation.statistics import (
    alpha95_deg,
    axial_mean,
    axial_mean_azimuth_deg,
    circular_mean_deg,
    fabric,
    fisher_kappa,
    fisher_mean,
    likely_kappa,
    mean_resultant,
    orientation_tensor,
    spherical_median,
)
from structviz.orientation.vectors import angle_deg, axial_angle_deg


def directed(vector):
    """Return azimuth and inclination of a directed line, inclination positive down."""
    return np.degrees(np.arctan2(vector[0], vector[1])) % 360, np.degrees(np.arcsin(-vector[2]))


def check_fisher(case, declination, inclination, wanted=None):
    wanted = case.expected if wanted is None else wanted
    found = fisher_mean(vectors(declination, inclination))
    case.same(found.count, wanted["N"])
    case.near(found.resultant, wanted["R"], 1e-5)
    case.near(directed(found.mean), [wanted["dec"], wanted["inc"]], 1e-3)
    case.near([found.kappa, likely_kappa(found.resultant / found.count)], [wanted["k_fisher"], wanted["kappa_ml"]], 1e-2)
    case.near([found.alpha95_deg, found.angular_deviation_deg], [wanted["alpha95"], wanted["csd_81"]], 1e-3)
    case.near(np.degrees(np.arccos(found.resultant / found.count)), wanted["delta_arccos_Rbar"], 1e-3)
    return found


def check_fabric(case, axes):
    wanted, found = case.expected, fabric(axes)
    case.near(found.eigenvalues, wanted["eigenvalues"], 1e-6)
    table = np.array(wanted["axes_trend_plunge"])
    assert axial_angle_deg(found.axes, vectors(*table.T)).max() <= 1e-3, case.about
    case.near([found.shape, found.strength], [wanted["woodcock_K"], wanted["woodcock_C"]], 1e-4)
    assert axial_angle_deg(axial_mean(axes), vectors(*table[0])) <= 1e-3, case.about


def poles_of(case):
    dip, towards = np.array(case.input["dip_dipdir"], float).T
    return normals(towards - 90, dip)


def test_sta_01_fisher_mean(case):
    check_fisher(case, *np.array(case.input["dec_inc"]).T)


def test_sta_02_fisher_mean_of_upward_lines(case):
    check_fisher(case, *np.array(case.input["dec_inc"]).T)


def test_sta_03_fisher_mean_across_the_horizontal(case):
    check_fisher(case, *np.array(case.input["dec_inc"]).T)


def test_sta_04_tensor_of_lines_across_the_horizontal(case):
    check_fabric(case, vectors(*np.array(case.input["dec_inc"]).T))


def test_sta_05_tensor_of_folded_bedding(case):
    check_fabric(case, poles_of(case))


def test_sta_06_tensor_of_steep_planes(case):
    check_fabric(case, poles_of(case))


def test_sta_07_tensor_of_scattered_planes(case):
    check_fabric(case, poles_of(case))


def test_sta_08_mean_and_median(case):
    lat, lon = np.array(case.input["lat_lon"]).T
    v = vectors(90 - lon, -lat)  # longitude counts from the first axis anticlockwise, latitude up
    found = fisher_mean(v)
    case.near(found.resultant, case.expected["R"], 1e-4)
    wanted = {key: vectors(90 - case.expected[f"{key}_lon"], -case.expected[f"{key}_lat"]) for key in ("mean", "median")}
    assert angle_deg(found.mean, wanted["mean"]) <= 1e-3, case.about
    assert angle_deg(spherical_median(v), wanted["median"]) <= 0.05, case.about
    assert angle_deg(spherical_median(v), v).sum() < angle_deg(found.mean, v).sum()


def test_sta_09_worked_example(case):
    found = check_fisher(case, case.input["dec"], case.input["inc"])
    printed = case.expected["printed"]
    case.near(directed(found.mean)[0], printed["dec"], 0.1)  # the printed inclination and cone are not normalised and approximate
    case.near(angle_deg(found.mean, vectors(*case.input["test_direction"])), printed["angle"], 0.01)


def test_sta_10_second_site_and_pooled_resultant(case, cases):
    found = check_fisher(case, case.input["dec"], case.input["inc"])
    first = cases["STA-09"].input
    both = fisher_mean(vectors([*first["dec"], *case.input["dec"]], [*first["inc"], *case.input["inc"]]))
    case.near(both.resultant, case.expected["R_pooled"], 1e-4)
    other = fisher_mean(vectors(first["dec"], first["inc"])).resultant
    f = (12 - 2) * (other + found.resultant - both.resultant) / (12 - other - found.resultant)
    case.near(f, case.expected["F"], 1e-3)


def test_sta_11_concentration_and_cone(case):
    for (count, resultant), k, cone in zip(case.input["N_R"], case.expected["k"], case.expected["alpha95_deg"]):
        case.near(fisher_kappa(count, resultant), k, 1e-6)
        case.near(alpha95_deg(count, resultant), cone, 1e-6)


def test_sta_12_mean_resultant_of_a_fisher_distribution(case):
    case.near(mean_resultant(case.input["kappa"]), case.expected["Rbar"], 1e-8)
    case.near([likely_kappa(share) for share in case.expected["Rbar"]], case.input["kappa"], 1e-5)


def test_sta_13_exact_tensors(case):
    wanted = case.expected
    cube = fabric(np.eye(3))
    case.near(cube.eigenvalues, wanted[0]["eigs"], 1e-12)
    assert (cube.shape, cube.mean_defined) == (None, False), case.about
    case.near(cube.strength, 0.0, 1e-12)
    golden = (1 + 5**0.5) / 2
    corners = np.array([[0, a, b * golden] for a in (1, -1) for b in (1, -1)])
    icosahedron = np.concatenate([np.roll(corners, shift, axis=1) for shift in range(3)])
    case.near(fabric(icosahedron).eigenvalues, wanted[1]["eigs"], 1e-12)
    line = np.tile(vectors(45.0, 30.0), (10, 1))
    same = fabric(line)
    case.near(same.eigenvalues, wanted[2]["eigs"], 1e-12)
    case.near(trend_plunge_deg(same.axes[0]), wanted[2]["mean"], 1e-9)
    assert (same.shape, same.strength, same.mean_defined, same.pole_defined) == (None, None, True, False), case.about
    girdle = fabric(vectors([0.0, 60.0, 120.0], 0.0))
    case.near(girdle.eigenvalues, wanted[3]["eigs"], 1e-12)
    assert axial_angle_deg(girdle.axes[2], vectors(*wanted[3]["girdle_pole"])) < 1e-6, case.about
    crossed = vectors([0.0] * 5 + [90.0] * 5, 0.0)
    case.near(fabric(crossed).eigenvalues, wanted[4]["eigs"], 1e-12)
    assert not fabric(crossed).mean_defined, case.about
    assert np.isnan(axial_mean(crossed)).all(), case.about
    v = vectors([10.0, 50.0, 200.0], [20.0, 70.0, -10.0])
    both = np.concatenate([v, -v])
    case.near(orientation_tensor(both), orientation_tensor(v), 1e-12)
    cancelled = fisher_mean(both)
    case.near(cancelled.resultant, 0.0, 1e-12)
    assert cancelled.alpha95_deg == 180.0, case.about
    assert not cancelled.mean.any(), case.about


def pixel_centres(nside):
    """Return the centres of equal-area pixels on iso-latitude rings."""
    rings = []
    for i in range(1, 4 * nside):
        cap = min(i, 4 * nside - i)
        if cap < nside:
            height, count, shift = 1 - cap**2 / (3 * nside**2), 4 * cap, 0.5
            height = height if i < 2 * nside else -height
        else:
            height, count, shift = 4 / 3 - 2 * i / (3 * nside), 4 * nside, 0.5 * ((i - nside + 1) % 2)
        turn = 2 * np.pi * (np.arange(count) + shift) / count
        flat = np.sqrt(1 - height**2)
        rings.append(np.stack([flat * np.cos(turn), flat * np.sin(turn), np.full(count, height)], -1))
    return np.concatenate(rings)


def test_sta_14_even_directions(case):
    for nside, count in zip(case.input["nside"], case.input["npix"]):
        v = pixel_centres(nside)
        case.same(len(v), count)
        case.near(fabric(v).eigenvalues[::-1], case.expected[f"nside{nside}_eigs"], 1e-9)
        case.near(fisher_mean(v).resultant, case.expected["R"], 1e-9)
    assert fabric(v).strength < 0.01, case.about


def test_sta_16_circular_and_axial_means(case):
    mean, _ = circular_mean_deg(case.input["directions"])
    case.near(mean, case.expected["circular_mean"], 1e-3)
    case.near(mean, case.expected["printed_circular_mean"], 0.1)
    mean, length = axial_mean_azimuth_deg(case.input["joint_azimuths"])
    case.near([mean, length], [case.expected["axial_mean"], case.expected["axial_Rbar"]], 1e-3)
