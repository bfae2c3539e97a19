"""Lines where surfaces meet: known lines, a plain second implementation, VTK as an outside one, and laws."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
import pyvista

from structviz.surfaces.intersections import meetings, rim_edges
from structviz.synthetic.damage import sound_surface


def sheet(count: int, along, across, origin=(0.0, 0.0, 0.0), wave: float = 0.0):
    """Return a sheet of 2 count^2 triangles spanned by two vectors, with a wave normal to it."""
    u, v = (grid.ravel() for grid in np.meshgrid(np.linspace(0, 1, count + 1), np.linspace(0, 1, count + 1), indexing="ij"))
    normal = np.cross(along, across) / np.linalg.norm(np.cross(along, across))
    vertices = origin + u[:, None] * np.array(along) + v[:, None] * np.array(across) + wave * (np.sin(7 * u + 3 * v))[:, None] * normal
    corner = np.arange((count + 1) ** 2).reshape(count + 1, count + 1)
    a, b, c, d = corner[:-1, :-1].ravel(), corner[1:, :-1].ravel(), corner[1:, 1:].ravel(), corner[:-1, 1:].ravel()
    return vertices, np.concatenate([np.stack([a, b, c], 1), np.stack([a, c, d], 1)])


FLAT = sheet(8, (1000.0, 0, 0), (0, 1000.0, 0))


@pytest.mark.parametrize("count", [1, 3, 20])
def test_two_planes_cross_along_a_known_line(count: int) -> None:
    upright = sheet(count, (0, 700.0, 0), (0, 0, 900.0), (431.0, 100.0, -400.0))
    (found,) = meetings([FLAT, upright])
    assert (found.surfaces, found.kind) == ((0, 1), "crosses")
    assert found.length_m == pytest.approx(700.0)
    assert np.allclose(found.segments[..., 0], 431.0)
    assert np.allclose(found.segments[..., 2], 0.0)
    assert (found.segments[..., 1].min(), found.segments[..., 1].max()) == (pytest.approx(100.0), pytest.approx(800.0))


@pytest.mark.parametrize("gap", [-8.0, 0.0, 8.0])
def test_a_rim_that_nearly_reaches_a_surface_ends_on_it(gap: float) -> None:
    above = sheet(10, (0, 700.0, 0), (0, 0, 900.0), (431.0, 100.0, gap))
    (found,) = meetings([FLAT, above])
    assert (found.surfaces, found.kind) == ((1, 0), "ends on")
    assert found.length_m == pytest.approx(700.0, rel=0.05)


def test_surfaces_that_stay_apart_or_in_one_plane_do_not_meet() -> None:
    far = sheet(10, (0, 700.0, 0), (0, 0, 900.0), (431.0, 100.0, 60.0))
    level = FLAT[0] + [0, 0, 5.0], FLAT[1]
    assert meetings([FLAT, far]) == ()
    assert meetings([FLAT, FLAT]) == ()
    assert meetings([FLAT, level]) == ()
    assert meetings([FLAT]) == ()
    assert meetings([]) == ()


def plain(one, other) -> list[np.ndarray]:
    """Return the common segments of two lists of triangles, one pair after the other: sides of each cut with the other."""
    found = []
    for a, b in itertools.product(one, other):
        ends = []
        for triangle, sides in ((a, b), (b, a)):
            normal = np.cross(triangle[1] - triangle[0], triangle[2] - triangle[0])
            for k in range(3):
                p, q = sides[k], sides[(k + 1) % 3]
                hp, hq = (p - triangle[0]) @ normal, (q - triangle[0]) @ normal
                if (hp >= 0) == (hq >= 0):
                    continue
                place = p + (q - p) * hp / (hp - hq)
                turns = [np.cross(triangle[(j + 1) % 3] - triangle[j], place - triangle[j]) @ normal for j in range(3)]
                if min(turns) >= 0:
                    ends.append(place)
        if len(ends) == 2:
            found.append(np.array(ends))
    return found


def in_order(segments) -> np.ndarray:
    rows = np.array([sorted(map(tuple, np.round(segment, 6))) for segment in segments]).reshape(-1, 6)
    return rows[np.lexsort(rows.T)]


def test_a_plain_loop_finds_the_same_segments() -> None:
    chance = np.random.default_rng(11)
    one, other = (chance.uniform(0, 10, (60, 1, 3)) + chance.normal(0, 1.5, (60, 3, 3)) for _ in range(2))
    soup = [(each.reshape(-1, 3), np.arange(180).reshape(-1, 3)) for each in (one, other)]
    wanted = plain(one, other)
    assert len(wanted) > 20
    found = meetings([(vertices, triangles) for vertices, triangles in soup])[0].segments
    # Rims reach on, so there is more than the triangles themselves have in common: each plain segment is among them.
    have = {tuple(row) for row in in_order(found).tolist()}
    assert all(tuple(row) in have for row in in_order(wanted).tolist())


def test_vtk_finds_the_same_length() -> None:
    one = sheet(40, (1000.0, 0, 0), (0, 1000.0, 200.0), wave=30.0)
    other = sheet(35, (900.0, 100.0, 0), (300.0, 200.0, 900.0), (-50.0, 150.0, -350.0), wave=20.0)
    (found,) = meetings([one, other])
    meshes = [pyvista.PolyData(vertices, np.insert(triangles, 0, 3, axis=1).ravel()) for vertices, triangles in (one, other)]
    line = meshes[0].intersection(meshes[1], split_first=False, split_second=False)[0]
    assert found.kind == "crosses"
    # Where the line leaves a surface the rim of the other reaches on by up to half an edge.
    assert found.length_m == pytest.approx(line.length if line.n_cells == 0 else float(line.compute_cell_sizes()["Length"].sum()), rel=0.02)


def test_neither_place_nor_order_nor_refinement_matters() -> None:
    bent = sheet(12, (0, 700.0, 100.0), (50.0, 0, 900.0), (431.0, 100.0, -400.0), wave=25.0)
    (plain_one,) = meetings([FLAT, bent])
    shift = np.array([512_345.5, 5_123_456.25, -2000.0])
    (moved,) = meetings([(FLAT[0] + shift, FLAT[1]), (bent[0] + shift, bent[1])])
    assert moved.length_m == pytest.approx(plain_one.length_m, rel=1e-6)
    (swapped,) = meetings([bent, FLAT])
    assert swapped.length_m == pytest.approx(plain_one.length_m, rel=1e-9)
    order = np.random.default_rng(0).permutation(len(bent[1]))
    (shuffled,) = meetings([FLAT, (bent[0], bent[1][order])])
    assert shuffled.length_m == pytest.approx(plain_one.length_m, rel=1e-9)
    finer = sheet(24, (1000.0, 0, 0), (0, 1000.0, 0))
    assert meetings([finer, bent])[0].length_m == pytest.approx(plain_one.length_m, rel=1e-6)


def test_one_huge_triangle_among_many_small_ones_is_found() -> None:
    huge = np.array([[-5e4, 400.0, -5e4], [5e4, 400.0, -5e4], [0.0, 400.0, 9e4]]), np.array([[0, 1, 2]])
    fine = sheet(120, (1000.0, 0, 0), (0, 1000.0, 0))
    (found,) = meetings([fine, huge])
    assert found.length_m == pytest.approx(1000.0, rel=0.01)


def test_the_search_leaves_its_input_alone() -> None:
    before = FLAT[0].tobytes(), FLAT[1].tobytes()
    meetings([FLAT, sheet(5, (0, 700.0, 0), (0, 0, 900.0), (431.0, 100.0, -400.0))])
    assert (FLAT[0].tobytes(), FLAT[1].tobytes()) == before


def test_rim_edges_are_those_of_one_triangle() -> None:
    surface = sound_surface()
    ends, across = rim_edges(surface.triangles, len(surface.vertices))
    sides = [tuple(sorted(side)) for t in surface.triangles.tolist() for side in ((t[0], t[1]), (t[1], t[2]), (t[2], t[0]))]
    assert {tuple(sorted(edge)) for edge in ends.tolist()} == {side for side in sides if sides.count(side) == 1}
    for (a, b), (c, row) in zip(ends.tolist(), across.tolist()):
        assert set(surface.triangles[row].tolist()) == {a, b, c}
