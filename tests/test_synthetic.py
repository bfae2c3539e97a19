"""Is what the synthetic models claim to be true, true of their meshes and labels?"""

from __future__ import annotations

import hashlib

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.kinematics.senses import COMPASS_DEG, nearest_word
from structviz.orientation.planes import normals, slip_vectors, strike_dip_deg
from structviz.orientation.vectors import axial_angle_deg
from structviz.surfaces.surface import Surface
from structviz.synthetic import (
    DAMAGE,
    Known,
    bent_surface,
    damaged_surface,
    large_model,
    overturning_surface,
    plane_surface,
    random_model,
    sound_surface,
)

REGIMES = ("normal", "strike-slip", "reverse")


def area_vectors(surface: Surface) -> np.ndarray:
    corners = surface.vertices[surface.triangles]
    return np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2


def fingerprint(known: Known) -> str:
    digest = hashlib.sha256()
    for fault in known.model.faults:
        digest.update(fault.surface.vertices.tobytes() + fault.surface.triangles.tobytes())
        digest.update(f"{fault.name} {fault.declared} {fault.down_side}".encode())
    return digest.hexdigest()


def slow_slip(axes: np.ndarray, ratio: float, normal: np.ndarray) -> np.ndarray:
    """Shear of the traction written out, sign by hand: the hanging wall presses down on the foot wall and moves along."""
    stress = axes.T @ np.diag([1.0, ratio, 0.0]) @ axes
    traction_on_hanging_wall = -stress @ normal
    shear = traction_on_hanging_wall - (traction_on_hanging_wall @ normal) * normal
    return shear / np.linalg.norm(shear)


@pytest.mark.parametrize("regime", REGIMES)
def test_stress_is_a_right_handed_frame_that_leans_by_the_tilt(regime):
    vertical = {"normal": 0, "strike-slip": 1, "reverse": 2}[regime]
    for state in range(5):
        known = random_model(regime, tilt_deg=5.0, faults=4, conjugate=4, planted=1, random_state=state)
        np.testing.assert_allclose(known.axes @ known.axes.T, np.eye(3), atol=1e-12)
        assert np.linalg.det(known.axes) == pytest.approx(1.0)
        assert axial_angle_deg(known.axes[vertical], [0, 0, 1]) == pytest.approx(5.0)
        assert 0.25 <= known.shape_ratio <= 0.75


def test_directions_of_tilt_and_azimuth_are_spread_all_round():
    leaning = np.array([random_model("normal", faults=0, conjugate=0, planted=0, random_state=state).axes[0] for state in range(200)])
    leaning = leaning * np.sign(leaning[:, 2:])
    assert np.linalg.norm(leaning[:, :2].mean(0)) < 0.25 * np.sin(np.radians(5.0))


@pytest.mark.parametrize("regime", REGIMES)
def test_mean_plane_of_every_mesh_is_the_plane_that_was_drawn(regime):
    known = random_model(regime, random_state=3)
    for fault, normal in zip(known.model.faults, known.normals):
        vectors = area_vectors(fault.surface)
        areas = np.linalg.norm(vectors, axis=1)
        assert (areas > 0).all()
        assert axial_angle_deg(vectors.sum(0), normal) < 1e-6
        mean_axis = np.linalg.eigh(np.einsum("t,ti,tj->ij", 1 / areas, vectors, vectors))[1][:, -1]
        assert axial_angle_deg(mean_axis, normal) < 0.1
        assert (vectors @ normal > 0).all() or (vectors @ normal < 0).all(), "wound one way throughout"
        spread = np.sqrt(np.average(axial_angle_deg(vectors, normal) ** 2, weights=areas))
        assert 2.0 < spread < 12.0, "rough, but a surface still"


def test_windings_of_both_kinds_occur():
    known = random_model("reverse", random_state=4)
    up = [area_vectors(fault.surface).sum(0)[2] > 0 for fault in known.model.faults]
    assert any(up)
    assert not all(up)


@pytest.mark.parametrize("regime", REGIMES)
def test_rakes_and_labels_follow_the_true_stress_but_for_the_planted_ones(regime):
    known = random_model(regime, planted=8, random_state=5)
    assert len(known.flipped) == 8
    for fault, normal, rake in zip(known.model.faults, known.normals, known.true_rakes_deg):
        np.testing.assert_allclose(slip_vectors(normal, rake), slow_slip(known.axes, known.shape_ratio, normal), atol=1e-9)
        opposite = {"normal": "reverse", "reverse": "normal", "sinistral": "dextral", "dextral": "sinistral"}
        word = nearest_word(rake)
        assert fault.declared.text == (opposite[word] if fault.name in known.flipped else word)


def test_regimes_give_the_conjugate_faults_their_ordinary_dips():
    for regime, low, high in (("normal", 45, 75), ("strike-slip", 70, 90), ("reverse", 15, 45)):
        known = random_model(regime, faults=60, conjugate=60, planted=0, random_state=6)
        dips = strike_dip_deg(known.normals)[1]
        assert low < np.median(dips) < high


@pytest.mark.parametrize("per_axis, wanted_deg", [(True, 6.0 * np.sqrt(2)), (False, 6.0)])
def test_scatter_of_conjugate_planes_has_the_size_stated(per_axis, wanted_deg):
    known = random_model(
        "normal", faults=600, conjugate=600, planted=0, scatter_per_axis=per_axis, triangles=2, tilt_deg=0.0, random_state=7
    )
    ideal = [np.sin(np.radians(30)) * known.axes[0] + side * np.cos(np.radians(30)) * known.axes[2] for side in (1, -1)]
    off = np.min([axial_angle_deg(known.normals, plane) for plane in ideal], axis=0)
    assert np.sqrt(np.mean(off**2)) == pytest.approx(wanted_deg, rel=0.08)


def test_inherited_planes_had_reason_to_move():
    known = random_model("strike-slip", faults=200, conjugate=0, planted=0, triangles=2, random_state=8)
    stress = known.axes.T @ np.diag([1.0, known.shape_ratio, 0.0]) @ known.axes
    for normal in known.normals:
        traction = stress @ normal
        shear = np.linalg.norm(traction - (traction @ normal) * normal)
        assert shear >= 0.3 * 0.5
    assert strike_dip_deg(known.normals)[1].min() >= 15.0
    assert set(known.kinds) == {"inherited"}


def test_side_that_went_down_is_named_on_steep_dip_slip_faults_only_and_lies_with_the_label():
    seen = 0
    for state in range(12):
        known = random_model(
            "normal", faults=40, conjugate=0, planted=20, least_shear=0.1, shape_ratio=(0, 0.1), triangles=2, random_state=state
        )
        for fault, normal in zip(known.model.faults, known.normals):
            strike, dip = strike_dip_deg(normal)
            word = fault.declared.words[0]
            if dip < 80 or word in ("sinistral", "dextral"):
                assert fault.down_side == ""
                continue
            seen += 1
            towards = (strike + (90 if word == "normal" else 270)) % 360
            assert abs((COMPASS_DEG[fault.down_side] - towards + 180) % 360 - 180) <= 11.25 + 1e-9
    assert seen >= 5


def test_same_state_same_model_and_other_state_another():
    first, again = (fingerprint(random_model("normal", random_state=9)) for _ in range(2))
    assert first == again
    assert fingerprint(random_model("normal", random_state=10)) != first


def test_planting_and_finer_triangles_leave_the_planes_alone():
    few, many = random_model("normal", planted=4, random_state=11), random_model("normal", planted=8, triangles=900, random_state=11)
    np.testing.assert_array_equal(few.normals, many.normals)
    np.testing.assert_array_equal(few.true_rakes_deg, many.true_rakes_deg)
    plain = random_model("normal", planted=8, random_state=11)
    for a, b in zip(few.model.faults, plain.model.faults):
        np.testing.assert_array_equal(a.surface.vertices, b.surface.vertices)


def test_surfaces_have_the_size_and_place_of_a_real_model():
    known = random_model("normal", random_state=12)
    vertices = np.concatenate([fault.surface.vertices for fault in known.model.faults])
    assert vertices[:, 2].max() < 0
    assert vertices[:, 2].min() > -6500
    assert 380_000 < vertices[:, 0].min() < vertices[:, 0].max() < 430_000
    assert [abs(len(fault.surface.triangles) - 300) < 45 for fault in known.model.faults] == [True] * 24


def test_two_words_tell_the_oblique_slip():
    known = random_model("normal", two_words=True, planted=0, random_state=13)
    words = [len(fault.declared.words) for fault in known.model.faults]
    assert set(words) == {1, 2}
    for fault, rake in zip(known.model.faults, known.true_rakes_deg):
        assert abs((fault.declared.rake_deg - rake + 180) % 360 - 180) <= 45.0


def test_large_model_has_the_triangles_asked_for():
    known = large_model(faults=6, triangles_each=5000, random_state=0)
    assert sum(len(fault.surface.triangles) for fault in known.model.faults) == pytest.approx(30_000, rel=0.02)


@pytest.mark.parametrize(
    "arguments, message",
    [
        ({"regime": "normall"}, r"regime: found 'normall'; wanted one of normal, strike-slip, reverse"),
        ({"regime": "normal", "conjugate": 25}, r"found 25, 4; wanted 0 to 24"),
        ({"regime": "normal", "planted": -1}, r"found 16, -1; wanted 0 to 24"),
    ],
)
def test_models_that_cannot_be_are_refused_in_words(arguments, message):
    with pytest.raises(ArgumentError, match=message):
        random_model(**arguments, random_state=0)


def test_plane_has_the_strike_dip_size_and_facing_asked_for():
    surface = plane_surface("p", 200.0, 35.0, 1000.0, 500.0, (4e5, 6.5e6, -1000.0))
    total = area_vectors(surface).sum(0)
    np.testing.assert_allclose(total / np.linalg.norm(total), normals(200.0, 35.0), atol=1e-9)
    assert np.linalg.norm(total) == pytest.approx(500_000.0)
    np.testing.assert_allclose(surface.vertices.mean(0), (4e5, 6.5e6, -1000.0))


def test_bent_surface_turns_to_the_right_by_the_angle_stated():
    surface = bent_surface("b", 20.0, 60.0, 4000.0, 500.0, (0, 0, 0), bend_deg=16.0, cells=(200, 4))
    strikes = strike_dip_deg(area_vectors(surface))[0].reshape(200, -1).mean(1)
    assert strikes[-1] - strikes[0] == pytest.approx(16.0, abs=0.3)


def test_overturning_surface_passes_through_vertical_with_one_winding():
    surface = overturning_surface("o", 0.0, 2000.0, 1000.0, (0, 0, -1000.0))
    vectors = area_vectors(surface)
    assert (vectors[:, 0] > 0).all(), "the hanging wall is east of it all the way"
    rows = vectors.reshape(-1, 12, 2, 3).sum((0, 2))
    assert rows[0, 2] > 0 > rows[-1, 2]
    assert axial_angle_deg(vectors.sum(0), normals(0.0, 88.0)) < 1e-6


def test_surfaces_without_size_are_refused_in_words():
    with pytest.raises(ArgumentError, match=r"found 0, 500, \(8, 5\); wanted positive numbers"):
        plane_surface("p", 0.0, 60.0, 0.0, 500.0, (0, 0, 0))


def edge_counts(surface: Surface) -> np.ndarray:
    edges = np.sort(surface.triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    return np.bincount(np.unique(edges, axis=0, return_counts=True)[1], minlength=5)


def directed_edges_used_twice(surface: Surface) -> int:
    edges = surface.triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    return int((np.unique(edges, axis=0, return_counts=True)[1] > 1).sum())


def parts(surface: Surface) -> int:
    """Connected by shared edges, found the slow way."""
    owners: dict[frozenset[int], list[int]] = {}
    for row, (a, b, c) in enumerate(surface.triangles.tolist()):
        for edge in ((a, b), (b, c), (c, a)):
            owners.setdefault(frozenset(edge), []).append(row)
    label = list(range(len(surface.triangles)))
    for rows in list(owners.values()) * len(label):
        least = min(label[row] for row in rows)
        if any(label[row] != least for row in rows):
            old = {label[row] for row in rows}
            label = [least if value in old else value for value in label]
        if len(set(label)) == 1:
            break
    return len(set(label))


def test_sound_surface_is_sound():
    surface = sound_surface()
    assert edge_counts(surface).tolist() == [0, 26, 107, 0, 0]
    assert directed_edges_used_twice(surface) == 0
    assert len(np.unique(surface.vertices, axis=0)) == len(surface.vertices)


def test_each_damaged_surface_has_its_defect():
    sound = edge_counts(sound_surface())
    made = {kind: damaged_surface(kind) for kind in DAMAGE}
    doubled = made["duplicate_vertices"]
    assert len(doubled.vertices) - len(np.unique(doubled.vertices, axis=0)) == 6
    areas = np.linalg.norm(area_vectors(made["zero_area"]), axis=1)
    assert (areas < 1e-6).sum() == 1
    assert edge_counts(made["zero_area"])[3] == 0
    assert directed_edges_used_twice(made["flipped_winding"]) > 0
    assert edge_counts(made["nonmanifold"])[3] == 1
    assert edge_counts(made["hole"]).tolist() == [0, sound[1] + 4, sound[2] - 5, 0, 0]
    assert edge_counts(made["repeated_triangles"])[3:].sum() > 0
    assert (np.unique(np.sort(made["repeated_triangles"].triangles, axis=1), axis=0, return_counts=True)[1] == 2).sum() == 4
    assert [parts(made[kind]) for kind in ("stray_part", "opposite_parts", "pinched")] == [2, 2, 1]


def test_opposite_parts_cancel_across_strike():
    vectors = area_vectors(damaged_surface("opposite_parts"))
    total = vectors.sum(0)
    assert abs(total[:2]).max() < 1e-6 * np.linalg.norm(vectors, axis=1).sum()


def test_pinched_surface_touches_itself_in_one_vertex():
    surface = damaged_surface("pinched")
    fans = 0
    for vertex in range(len(surface.vertices)):
        around = surface.triangles[(surface.triangles == vertex).any(1)]
        if len(around) and parts(Surface("fan", surface.vertices, around)) > 1:
            fans += 1
    assert fans == 1


def test_unknown_damage_is_refused_in_words():
    with pytest.raises(ArgumentError, match=r"kind: found 'rust'; wanted one of duplicate_vertices, zero_area"):
        damaged_surface("rust")
