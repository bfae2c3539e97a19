"""Stations and distances: spread by area, fitted by area, the same whatever the order of the triangles."""

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.orientation.vectors import angle_deg, rotation
from structviz.surfaces.geometry import areas_and_normals, blocks, moments, pieces, planes_of_moments
from structviz.surfaces.measure import measure
from structviz.surfaces.proximity import candidate_pairs, nearest_approach, point_triangle_distance
from structviz.surfaces.stations import sample_points, sample_stations
from structviz.surfaces.surface import Surface
from structviz.synthetic import plane_surface, random_model

FAULT = random_model("strike-slip", random_state=6, triangles=1500).model.faults[0].surface


def test_moments_are_the_integrals_over_the_triangles():
    corners = np.random.default_rng(0).normal(size=(6, 3, 3))
    areas, _ = areas_and_normals(corners)
    # Plain quadrature, exact for second degree: the midpoints of the sides, a third of the area each.
    slow = []
    for triangle, area in zip(corners, areas, strict=True):
        middles = [(triangle[k] + triangle[(k + 1) % 3]) / 2 for k in range(3)]
        first = sum(area / 3 * m for m in middles)
        second = sum(area / 3 * np.outer(m, m) for m in middles)
        slow.append([area, *first, *second[np.triu_indices(3)]])
    assert np.allclose(moments(corners, areas).T, slow)


def test_fit_weighs_area_not_corners():
    # A large flat sheet and a crowd of tiny tilted triangles: corners would let the crowd win.
    big = np.array([[[0.0, 0, 0], [100, 0, 0], [0, 100, 0]], [[100.0, 100, 0], [0, 100, 0], [100, 0, 0]]])
    tiny = np.tile(np.array([[[50.0, 50, 0], [50.1, 50, 0.1], [50, 50.1, 0.1]]]), (200, 1, 1))
    corners = np.concatenate([big, tiny])
    areas, _ = areas_and_normals(corners)
    normal = planes_of_moments(moments(corners, areas).sum(1)[None])[0]
    assert abs(normal[2]) == pytest.approx(1.0, abs=1e-6)


def test_blocks_hold_equal_areas():
    found = measure(FAULT)
    areas = np.bincount(blocks(found.centroids - found.centroids[0], found.areas_m2, 24), found.areas_m2)
    assert len(areas) == 24
    assert areas.max() < 1.35 * areas.min()


def test_stations_do_not_depend_on_order_or_frame():
    here = sample_stations(measure(FAULT), 24)
    order = np.random.default_rng(1).permutation(len(FAULT.triangles))
    shuffled = sample_stations(measure(Surface("s", FAULT.vertices, FAULT.triangles[order])), 24)
    assert np.allclose(shuffled.places, here.places)
    assert np.allclose(shuffled.normals, here.normals, atol=1e-9)
    turn = rotation([0, 0, 1.0], 33.0)
    middle = FAULT.vertices.mean(0)
    turned = sample_stations(measure(Surface("s", (FAULT.vertices - middle) @ turn.T, FAULT.triangles)), 24)
    back = np.sort(turned.normals @ turn, axis=0)
    assert np.abs(back - np.sort(here.normals, axis=0)).max() < 0.05


@pytest.mark.parametrize("seed", range(4))
def test_ties_on_a_regular_mesh_do_not_follow_the_order_of_triangles(seed):
    regular = plane_surface("r", 90.0, 40.0, 3000.0, 3000.0, (5e5, 6e6, -2000.0), cells=(12, 12))
    order = np.random.default_rng(seed).permutation(len(regular.triangles))
    here = sample_stations(measure(regular), 24)
    there = sample_stations(measure(Surface("s", regular.vertices, regular.triangles[order])), 24)
    assert np.allclose(there.places, here.places, atol=1e-6)


def quartered(surface):
    """The same surface with each triangle cut into four by the middles of its sides."""
    a, b, c = (surface.vertices[surface.triangles[:, k]] for k in range(3))
    ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
    corners = np.concatenate([np.stack(t, 1) for t in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))])
    return Surface("fine", corners.reshape(-1, 3), np.arange(3 * len(corners)).reshape(-1, 3))


def test_refining_moves_stations_by_less_than_a_triangle_and_keeps_their_planes():
    here, there = sample_stations(measure(FAULT), 24), sample_stations(measure(quartered(FAULT)), 24)
    block = np.sqrt(measure(FAULT).area_m2 / 24)
    apart = np.linalg.norm(here.places[:, None] - there.places[None], axis=-1).min(1)
    assert np.median(apart) < 0.15 * block
    nearest = np.linalg.norm(here.places[:, None] - there.places[None], axis=-1).argmin(1)
    assert np.median(angle_deg(here.normals, there.normals[nearest])) < 1.0


def slow_station(found, place, part, radius):
    """The plane of a station by plain sums over triangles, with the integrals by midpoints of sides."""
    total, first, second, facing = 0.0, np.zeros(3), np.zeros((3, 3)), np.zeros(3)
    for t, corners in enumerate(found.surface.vertices[found.surface.triangles]):
        if found.part_of[t] == part and np.linalg.norm(corners.mean(0) - place) <= radius:
            for k in range(3):
                middle = (corners[k] + corners[(k + 1) % 3]) / 2 - place
                total += found.areas_m2[t] / 3
                first += found.areas_m2[t] / 3 * middle
                second += found.areas_m2[t] / 3 * np.outer(middle, middle)
            facing += found.areas_m2[t] * found.normals[t]
    normal = np.linalg.eigh(second / total - np.outer(first, first) / total**2)[1][:, 0]
    return normal if normal @ facing >= 0 else -normal


@pytest.mark.parametrize("radius", [200.0, 900.0])
def test_planes_of_stations_are_those_of_plain_sums(radius):
    other = plane_surface("other", 100.0, 30.0, 1500.0, 1500.0, tuple(FAULT.vertices.mean(0)), cells=(20, 20))
    both = Surface(
        "both", np.concatenate([FAULT.vertices, other.vertices]),
        np.concatenate([FAULT.triangles, other.triangles + len(FAULT.vertices)]),
    )  # fmt: skip
    found = measure(both)
    stations = sample_stations(found, 16, radius)
    assert len(set(stations.part_of.tolist())) == 2  # two parts that cross: neither may lend the other its triangles
    for place, normal, part in zip(stations.places, stations.normals, stations.part_of, strict=True):
        assert angle_deg(normal, slow_station(found, place, part, radius)) < 1e-4


def test_a_radius_smaller_than_any_triangle_gives_the_triangles():
    found = measure(FAULT)
    stations = sample_stations(found, 24, 0.001)
    nearest = np.linalg.norm(found.centroids[None] - stations.places[:, None], axis=-1).argmin(1)
    assert angle_deg(stations.normals, found.normals[nearest]).max() < 1e-4


@pytest.mark.parametrize("count", [1, 2, 3, 7, 24, 100])
def test_stations_and_points_come_in_the_number_asked(count):
    found = measure(FAULT)
    assert len(sample_stations(found, count).places) == count
    points = sample_points(found, count)
    assert points.shape == (count, 3)
    assert point_triangle_distance(points[:, None], found.surface.vertices[found.surface.triangles][None])[0].min(1).max() < 1e-6


def test_stations_share_the_surface_by_area_not_by_triangles():
    fine = plane_surface("fine", 20.0, 60.0, 1000.0, 1000.0, (60_000.0, 0, 0), cells=(20, 20))
    coarse = plane_surface("coarse", 20.0, 60.0, 3000.0, 1000.0, (0.0, 0, 0), cells=(1, 1))
    both = Surface(
        "both", np.concatenate([coarse.vertices, fine.vertices]), np.concatenate([coarse.triangles, fine.triangles + len(coarse.vertices)])
    )
    share = (sample_stations(measure(both), 24).part_of == 0).mean()
    assert share == pytest.approx(0.75, abs=0.05)


def test_pieces_are_the_triangles_cut_small():
    corners = np.random.default_rng(0).normal(size=(5, 3, 3)) * np.array([1, 1, 3, 10, 0.1])[:, None, None]
    areas, normals = areas_and_normals(corners)
    cut, size, row = pieces(corners, areas, 50)
    again, facing = areas_and_normals(cut)
    assert np.allclose(again, size)
    assert np.allclose(np.bincount(row, size), areas)
    assert size.max() <= areas.sum() / 50 * 1.001
    assert len(cut) <= 2 * (5 + 50)
    assert np.allclose(facing, normals[row])
    whole, parts = moments(corners, areas), moments(cut, size)
    assert np.allclose([np.bincount(row, line) for line in parts], whole)


@pytest.mark.parametrize("count, radius, wanted", [(0, None, "count: found 0"), (5, 0.0, "radius_m: found 0"), (5, np.nan, "radius_m")])
def test_stations_that_cannot_be_are_refused(count, radius, wanted):
    with pytest.raises(ArgumentError, match=wanted):
        sample_stations(measure(FAULT), count, radius)


def test_stations_of_a_plane_are_the_plane():
    found = sample_stations(measure(plane_surface("p", 120.0, 35.0, 3000.0, 1500.0, (4e5, 6e6, -3000.0))), 12)
    assert angle_deg(found.normals, measure(plane_surface("p", 120.0, 35.0, 3000.0, 1500.0, (0.0, 0, 0))).normal).max() < 1e-5


def test_a_wider_radius_smooths():
    found = measure(FAULT)
    spread = [np.sqrt((angle_deg(sample_stations(found, 24, radius).normals, found.normal) ** 2).mean()) for radius in (150.0, 2500.0)]
    assert spread[0] > spread[1]


@pytest.mark.parametrize("triangles", [1, 2])
def test_a_surface_of_few_triangles_has_stations_all_over_it(triangles):
    vertices = np.array([[0.0, 0, 0], [1000, 0, 0], [0, 1000, 700], [1000, 1000, 700]])
    few = measure(Surface("few", vertices, np.array([[0, 1, 2], [1, 3, 2]])[:triangles]))
    found = sample_stations(few, 24)
    assert len(found.places) == 24
    assert angle_deg(found.normals, few.normal).max() < 1e-5
    assert np.abs((found.places @ few.normal) - vertices[0] @ few.normal).max() < 1e-6  # on the surface
    gaps = np.linalg.norm(found.places[:, None] - found.places[None], axis=-1) + 1e9 * np.eye(24)
    assert gaps.min(1).max() < 2.5 * np.sqrt(few.area_m2 / 24)
    assert gaps.min() > 0.2 * np.sqrt(few.area_m2 / 24)


def test_nearest_approach_is_that_of_all_samples_against_all():
    rng = np.random.default_rng(0)
    samples = rng.normal(size=(5, 9, 3)) + 4 * rng.normal(size=(5, 1, 3))
    pairs = np.array([(i, j) for i in range(5) for j in range(i + 1, 5)])
    distance, places = nearest_approach(samples, pairs)
    for (i, j), found, place in zip(pairs, distance, places, strict=True):
        gaps = np.linalg.norm(samples[i][:, None] - samples[j][None], axis=-1)
        a, b = np.unravel_index(gaps.argmin(), gaps.shape)
        assert found == pytest.approx(gaps.min())
        assert np.allclose(place, (samples[i][a] + samples[j][b]) / 2)


def test_candidates_are_all_pairs_whose_spheres_reach_each_other():
    rng = np.random.default_rng(3)
    centres, radii, reach = rng.uniform(0, 50, (40, 3)), rng.uniform(0, 4, 40), rng.uniform(0, 4, 40)
    slow = [
        (i, j) for i in range(40) for j in range(i + 1, 40)
        if np.linalg.norm(centres[i] - centres[j]) <= radii[i] + radii[j] + reach[i] + reach[j]
    ]  # fmt: skip
    assert [tuple(row) for row in candidate_pairs(centres, radii, reach).tolist()] == slow
    assert candidate_pairs(centres[:1], radii[:1], reach[:1]).shape == (0, 2)


def test_one_giant_among_many_does_not_make_all_of_them_neighbours():
    rng = np.random.default_rng(5)
    centres, radii = np.column_stack([rng.uniform(0, 1e6, (600, 2)), np.zeros(600)]), np.full(600, 3000.0)
    radii[17] = 4e5
    apart = np.linalg.norm(centres[:, None] - centres[None], axis=-1)
    slow = np.argwhere(np.triu(apart <= 2 * (radii[:, None] + radii[None]), 1))
    assert np.array_equal(candidate_pairs(centres, radii, radii), slow)


def test_distance_to_triangles_is_the_least_over_a_fine_net_of_their_points():
    rng = np.random.default_rng(1)
    triangles, points = rng.normal(size=(40, 3, 3)), 2 * rng.normal(size=(40, 3))
    distance, nearest = point_triangle_distance(points, triangles)
    u, v = np.meshgrid(np.linspace(0, 1, 121), np.linspace(0, 1, 121))
    share = np.stack([u[u + v <= 1], v[u + v <= 1]], 1)
    share = np.concatenate([1 - share.sum(1, keepdims=True), share], 1)
    for point, triangle, away, place in zip(points, triangles, distance, nearest, strict=True):
        slow = np.linalg.norm(share @ triangle - point, axis=1).min()
        assert slow - 0.05 < away <= slow + 1e-12
        assert np.linalg.norm(point - place) == pytest.approx(away)
        fan = np.stack([[place, triangle[k], triangle[(k + 1) % 3]] for k in range(3)])
        assert areas_and_normals(fan)[0].sum() == pytest.approx(areas_and_normals(triangle[None])[0][0])  # the place lies on it


def test_distance_to_a_triangle_without_area_is_that_to_its_sides():
    distance, nearest = point_triangle_distance(np.array([2.0, 3.0, 0.0]), np.array([[0.0, 0, 0], [1, 0, 0], [5, 0, 0]]))
    assert float(distance) == 3.0
    assert nearest.tolist() == [2.0, 0.0, 0.0]


def test_samples_tell_how_near_surfaces_come_to_within_their_spacing():
    here = measure(FAULT)
    there = measure(Surface("beside", FAULT.vertices + [2500.0, 900.0, 0.0], FAULT.triangles))
    samples = np.stack([sample_points(here, 32), sample_points(there, 32)])
    found = nearest_approach(samples - samples.mean((0, 1)), np.array([[0, 1]]))[0][0]
    true = point_triangle_distance(there.surface.vertices[:, None], FAULT.vertices[FAULT.triangles][None])[0].min()
    assert true <= found <= true + np.sqrt(here.area_m2 / 32) * 1.5
