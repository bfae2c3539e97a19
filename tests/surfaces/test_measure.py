"""Measuring: one winding and one hanging wall a surface, means that depend on what they should, and laws of the frame."""

import numpy as np
import pytest

from structviz.errors import SurfaceError
from structviz.orientation.planes import normals, strike_dip_deg
from structviz.orientation.vectors import angle_deg, axial_angle_deg, rotation
from structviz.surfaces.measure import measure
from structviz.surfaces.surface import Surface
from structviz.synthetic import overturning_surface, plane_surface, random_model

PLANE = plane_surface("plane", 35.0, 62.0, 4000.0, 2500.0, (500_000.0, 6_200_000.0, -2000.0))


def bumpy(flip=0.0, seed=0):
    surface = random_model("normal", random_state=2, triangles=400).model.faults[3].surface
    triangles = surface.triangles.copy()
    turned = np.random.default_rng(seed).random(len(triangles)) < flip
    triangles[turned] = triangles[turned][:, ::-1]
    return Surface("bumpy", surface.vertices, triangles)


def slow_winding(triangles):
    """One winding by walking from neighbour to neighbour; the plain way."""
    sides = {}
    for number, (a, b, c) in enumerate(triangles):
        for side in ((a, b), (b, c), (c, a)):
            sides.setdefault(frozenset(side), []).append((number, side))
    turned, todo = {0: False}, [0]
    while todo:
        here = todo.pop()
        a, b, c = triangles[here]
        for side in ((a, b), (b, c), (c, a)):
            for there, other in sides[frozenset(side)]:
                if there not in turned:
                    turned[there] = turned[here] ^ (other == side)
                    todo.append(there)
    return np.array([turned[number] for number in range(len(triangles))])


def test_a_plane_measures_as_it_was_drawn():
    found = measure(PLANE)
    assert found.strike_deg == pytest.approx(35.0, abs=1e-6)
    assert found.dip_deg == pytest.approx(62.0, abs=1e-6)
    assert found.area_m2 == pytest.approx(4000.0 * 2500.0, rel=1e-9)
    assert np.allclose(found.normals, normals(35.0, 62.0), atol=1e-9)
    assert found.meaningful
    assert found.cone_deg < 0.01


@pytest.mark.parametrize("share", [0.0, 0.3, 1.0])
def test_winding_as_read_does_not_matter(share):
    plain, mixed = measure(bumpy()), measure(bumpy(share))
    assert np.allclose(mixed.normals, plain.normals, atol=1e-12)
    assert mixed.strike_deg == pytest.approx(plain.strike_deg)


def test_flipped_triangles_are_those_of_the_plain_walk():
    surface = bumpy(0.3)
    flipped = np.zeros(len(surface.triangles), bool)
    flipped[measure(surface).condition.flipped] = True
    slow = slow_winding(surface.triangles.tolist())
    assert np.array_equal(flipped, slow) or np.array_equal(flipped, ~slow)
    assert flipped.mean() <= 0.5  # the minority is called flipped


def test_a_surface_that_passes_through_vertical_keeps_one_hanging_wall():
    found = measure(overturning_surface("over", 20.0, 3000.0, 3000.0, (0.0, 0.0, -2000.0)))
    assert found.normals[:, 2].min() < 0 < found.normals[:, 2].max()  # some triangles are overturned
    assert angle_deg(found.normals, found.normal).max() < 90  # and none of them has changed sides


def test_mean_of_a_bump_depends_on_the_rim_alone():
    # Reference case GEO-05 (derived): vector area of any surface bounded by the rectangle 000/60, 1000 m by 1000 m.
    u, v = np.meshgrid(np.linspace(-500, 500, 41), np.linspace(-500, 500, 41), indexing="ij")
    plane = plane_surface("p", 0.0, 60.0, 1000.0, 1000.0, (0.0, 0, 0), cells=(2, 2))
    n, along, down = normals(0.0, 60.0), np.array([0, 1.0, 0]), np.array([0.5, 0, -np.sqrt(0.75)])
    bump = 120 * np.cos(np.pi * u / 1000) * np.cos(np.pi * v / 1000) ** 3
    points = u[..., None] * along + v[..., None] * down + bump[..., None] * n
    cells = np.arange(41 * 41).reshape(41, 41)
    corner = [cells[:-1, :-1], cells[1:, :-1], cells[1:, 1:], cells[:-1, 1:]]
    triangles = np.concatenate([np.stack([corner[k].ravel() for k in pick], 1) for pick in ((0, 1, 2), (0, 2, 3))])
    found = measure(Surface("bump", points.reshape(-1, 3), triangles))
    assert (found.strike_deg % 360, found.dip_deg) == (pytest.approx(0.0, abs=1e-6), pytest.approx(60.0, abs=1e-6))
    vector = found.areas_m2 @ found.normals
    assert vector == pytest.approx([866025.403784, 0.0, 500000.0], rel=1e-6, abs=1e-3)
    assert found.area_m2 > measure(plane).area_m2


@pytest.mark.parametrize("shift", [(0.0, 0.0, 0.0), (500_000.0, 6_500_000.0, -3000.0)])
def test_translation_changes_nothing(shift):
    here = bumpy()
    there = Surface("moved", here.vertices - here.vertices.mean(0) + shift, here.triangles)
    assert measure(there).strike_deg == pytest.approx(measure(here).strike_deg, abs=1e-6)
    assert measure(there).dip_deg == pytest.approx(measure(here).dip_deg, abs=1e-6)


def test_rotation_turns_normals_and_nothing_else():
    here = bumpy()
    turn = rotation([0, 0, 1.0], 40.0)
    middle = here.vertices.mean(0)
    there = Surface("turned", (here.vertices - middle) @ turn.T, here.triangles)
    assert np.allclose(measure(there).normals, measure(here).normals @ turn.T, atol=1e-9)


def test_reordering_and_refining_keep_the_mean():
    here = bumpy()
    order = np.random.default_rng(0).permutation(len(here.triangles))
    shuffled = measure(Surface("shuffled", here.vertices, here.triangles[order]))
    assert np.allclose(shuffled.normals, measure(here).normals[order], atol=1e-12)
    a, b, c = (here.vertices[here.triangles[:, k]] for k in range(3))
    middle = (a + b + c) / 3
    vertices = np.concatenate([here.vertices, middle])
    new = len(here.vertices) + np.arange(len(middle))
    t = here.triangles
    finer = np.concatenate([np.stack([t[:, i], t[:, j], new], 1) for i, j in ((0, 1), (1, 2), (2, 0))])
    assert axial_angle_deg(measure(Surface("fine", vertices, finer)).normal, measure(here).normal) < 1e-6


def test_triangles_that_share_no_vertex_numbers_are_joined_by_place():
    here = bumpy()
    soup = Surface("soup", here.vertices[here.triangles].reshape(-1, 3), np.arange(3 * len(here.triangles)).reshape(-1, 3))
    found = measure(soup)
    assert len(found.parts) == 1
    assert np.allclose(found.normals, measure(here).normals, atol=1e-12)
    assert found.condition.duplicate_vertices == 3 * len(here.triangles) - len(np.unique(here.vertices, axis=0))


def joined(one, two):
    return Surface("two", np.concatenate([one.vertices, two.vertices]), np.concatenate([one.triangles, two.triangles + len(one.vertices)]))


def two_planes(first, second):
    return joined(plane_surface("a", *first, 2000.0, 2000.0, (0.0, 0, 0)), plane_surface("b", *second, 2000.0, 2000.0, (9000.0, 0, 0)))


def test_parts_that_dip_opposite_ways_have_no_mean():
    found = measure(two_planes((0.0, 60.0), (180.0, 60.0)))
    assert len(found.parts) == 2
    assert not found.meaningful
    assert found.why_not == "its parts dip opposite ways (strike/dip 000/60 and 180/60)"


@pytest.mark.parametrize("share", [0.2, 0.5, 0.8])
def test_opposite_dips_have_no_mean_however_the_area_is_shared(share):
    # Planes only 40 degrees apart as axes, and a resultant of 0.7: neither angle nor length alone would tell.
    one = plane_surface("a", 0.0, 70.0, 4000.0 * share, 2000.0, (0.0, 0, 0))
    two = plane_surface("b", 180.0, 70.0, 4000.0 * (1 - share), 2000.0, (9000.0, 0, 0))
    found = measure(joined(one, two))
    assert not found.meaningful
    assert "dip opposite ways" in found.why_not


def test_parts_that_strike_apart_have_no_mean():
    one, two = (
        plane_surface("a", 0.0, 60.0, 2500.0, 2000.0, (0.0, 0, 0)),
        plane_surface("b", 70.0, 60.0, 2000.0, 2000.0, (9000.0, 0, 0)),
    )
    found = measure(joined(one, two))
    assert found.why_not == "its parts lie 60 deg apart (strike/dip 000/60 and 070/60)"


def test_a_stray_scrap_does_not_spoil_the_mean():
    scrap = plane_surface("scrap", 215.0, 60.0, 300.0, 200.0, (500_000.0, 6_210_000.0, -2000.0))
    found = measure(joined(PLANE, scrap))
    assert found.meaningful
    assert len(found.parts) == 2


def test_parts_are_listed_by_area_not_by_count():
    fine = plane_surface("fine", 10.0, 60.0, 1000.0, 1000.0, (0.0, 0, 0), cells=(20, 20))
    coarse = plane_surface("coarse", 10.0, 60.0, 8000.0, 8000.0, (20_000.0, 0, 0), cells=(2, 2))
    found = measure(joined(fine, coarse))
    assert [part.triangles for part in found.parts] == [8, 800]
    assert found.part_of.tolist() == [1] * 800 + [0] * 8


def test_debris_without_area_founds_no_part():
    apart = np.array([[0.0, 0, 0], [50, 50, 50], [100, 100, 100]])  # three places in a row, far from the plane
    vertices = np.concatenate([PLANE.vertices, apart])
    collinear = len(PLANE.vertices) + np.arange(3)
    found = measure(Surface("debris", vertices, np.concatenate([PLANE.triangles, [[0, 0, 1], collinear]])))
    assert len(found.parts) == 1
    assert not found.normals[-2:].any()
    assert found.condition.zero_area.tolist() == [len(PLANE.triangles), len(PLANE.triangles) + 1]
    assert np.array_equal(found.normals[:-2], measure(PLANE).normals)


def test_a_needle_that_closes_a_gap_keeps_the_sheet_in_one_piece():
    # Vertex 3 lies on the side 1-2 of the first triangle: the needle between them has no area but joins the windings.
    vertices = np.array([[0.0, 0, 0], [0, 1000, 500], [1000, 0, 500], [500, 500, 500], [1000, 1000, 1000]])
    found = measure(Surface("needle", vertices, np.array([[0, 1, 2], [2, 1, 3], [3, 1, 4], [2, 3, 4]])))
    assert len(found.parts) == 1
    assert found.condition.zero_area.tolist() == [1]
    assert found.condition.flipped.size == 0


@pytest.mark.parametrize("seed", range(6))
def test_a_sheet_wound_half_and_half_has_one_winding(seed):
    triangles = PLANE.triangles.copy()
    half = np.random.default_rng(seed).permutation(len(triangles))[: len(triangles) // 2]
    triangles[half] = triangles[half][:, ::-1]
    found = measure(Surface("half", PLANE.vertices, triangles))
    assert np.allclose(found.normals, measure(PLANE).normals, atol=1e-12)
    assert len(found.condition.flipped) == len(triangles) // 2


def test_a_mesh_written_twice_measures_as_once_with_twice_the_area():
    here = overturning_surface("over", 20.0, 3000.0, 3000.0, (0.0, 0.0, -2000.0))
    again = here.triangles[:, ::-1]
    once, twice = measure(here), measure(Surface("twice", here.vertices, np.concatenate([here.triangles, again])))
    assert np.allclose(twice.normals, np.tile(once.normals, (2, 1)))
    assert np.allclose(twice.normal, once.normal)
    assert twice.area_m2 == pytest.approx(2 * once.area_m2)
    assert twice.condition.repeated.tolist() == list(range(len(again), 2 * len(again)))
    assert not twice.condition.nonmanifold_edges.size


def test_sheets_that_branch_every_way_have_no_mean():
    angles = np.radians([0.0, 120.0, 240.0])
    hinge = np.array([[0.0, 0, 0], [0, 0, 1000]])
    out = np.stack([np.sin(angles), np.cos(angles), np.full(3, 0.5)], 1) * 1000
    found = measure(Surface("book", np.concatenate([hinge, out]), np.array([[0, 1, 2], [0, 1, 3], [0, 1, 4]])))
    assert len(found.parts) == 1
    assert found.condition.nonmanifold_edges.tolist() == [[0, 1]]
    assert "faces every way" in found.why_not


def test_debris_at_map_coordinates_has_no_area():
    # Three points in a row at UTM coordinates, off the line by their last digit only.
    row = np.array([[500_000.1, 6_500_000.3, -1000.7], [500_050.1, 6_500_040.3, -1020.7], [500_100.1, 6_500_080.3, -1040.7]])
    found = measure(Surface("row", np.concatenate([row, [[500_000.0, 6_500_100.0, -900.0]]]), np.array([[0, 2, 3], [0, 1, 2]])))
    assert found.condition.zero_area.tolist() == [1]


def test_the_cone_holds_the_plane_that_was_drawn_where_undulations_are_shorter_than_the_surface():
    plane = plane_surface("p", 200.0, 55.0, 4000.0, 2500.0, (0.0, 0, 0), cells=(40, 25))
    n = normals(200.0, 55.0)
    inside = []
    for seed in range(60):
        rng = np.random.default_rng(seed)
        wave = sum(rng.normal(0, 60) * np.cos(plane.vertices @ (rng.normal(size=3) / 250.0) + rng.uniform(0, 6.3)) for _ in range(6))
        found = measure(Surface("p", plane.vertices + wave[:, None] * n, plane.triangles))
        inside.append(axial_angle_deg(found.normal, n) <= found.cone_deg)
    assert np.mean(inside) >= 0.93


def test_steep_parts_of_one_fault_share_a_hanging_wall():
    found = measure(two_planes((0.0, 86.0), (180.0, 86.0)))
    assert found.meaningful
    assert angle_deg(np.array(found.parts[0].normal), np.array(found.parts[1].normal)) == pytest.approx(8.0, abs=1e-6)


def test_a_vertical_plane_keeps_one_side_under_noise():
    sides = set()
    for seed in range(20):
        n = normals(40.0, 90.0)
        flat = plane_surface("v", 40.0, 90.0, 3000.0, 2000.0, (0.0, 0, 0))
        noise = np.random.default_rng(seed).normal(0, 3.0, (len(flat.vertices), 1))
        found = measure(Surface("v", flat.vertices + noise * n, flat.triangles))
        sides.add(round(float(np.sign(found.normal @ n))))
    assert len(sides) == 1


def test_mean_strike_of_a_measured_surface_is_that_of_its_normal():
    found = measure(bumpy())
    assert (found.strike_deg, found.dip_deg) == tuple(float(v) for v in strike_dip_deg(found.normal))


@pytest.mark.parametrize(
    "vertices, triangles, wanted",
    [
        (np.zeros((3, 3)), [[0, 1, 2]], "only triangles without area"),
        (np.array([[0, 0, 0], [1, 0, 0], [0, np.nan, 0.0]]), [[0, 1, 2]], "1 vertices with NaN"),
        (np.eye(3), [[0, 1, 3]], "names vertex 3"),
        (np.eye(3) * 1e30, [[0, 1, 2]], "coordinates up to 1e\\+30 m"),
        (np.eye(3), [[0, 1, 1], [2, 2, 0]], "only triangles without area"),
        (np.eye(3), np.zeros((0, 3)), "at least one row of triangles"),
    ],
)
def test_surfaces_that_cannot_be_measured_say_why(vertices, triangles, wanted):
    with pytest.raises(SurfaceError, match=wanted):
        measure(Surface("bad", np.asarray(vertices, float), np.asarray(triangles, np.int64)))


def test_one_triangle_is_a_surface():
    found = measure(Surface("one", np.array([[0.0, 0, 0], [1000, 0, 0], [0, 1000, 500]]), np.array([[0, 1, 2]])))
    assert found.meaningful
    assert len(found.parts) == 1


def test_inputs_are_left_alone():
    surface = bumpy(0.3)
    before = surface.vertices.tobytes(), surface.triangles.tobytes()
    measure(surface)
    assert (surface.vertices.tobytes(), surface.triangles.tobytes()) == before
