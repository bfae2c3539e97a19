"""Stations and distances: spread by area, fitted by area, the same whatever the order of the triangles."""

import numpy as np
import pytest

from structviz.orientation.vectors import angle_deg, rotation
from structviz.surfaces.geometry import areas_and_normals, blocks, moments, planes_of_moments
from structviz.surfaces.measure import measure
from structviz.surfaces.proximity import candidate_pairs, nearest_approach
from structviz.surfaces.stations import sample_stations
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
    filled = areas[areas > 0]
    assert 18 <= len(filled) <= 30
    assert filled.max() < 1.35 * filled.min()


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
