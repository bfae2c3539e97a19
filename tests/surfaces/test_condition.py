"""Condition: each defect is found, located and counted, by a plain second count where one is easy."""

from collections import Counter

import numpy as np
import pytest

from structviz.surfaces.measure import measure
from structviz.surfaces.surface import Surface
from structviz.synthetic import plane_surface

PLANE = plane_surface("plane", 30.0, 50.0, 3000.0, 2000.0, (0.0, 0.0, 0.0), cells=(6, 4))


def condition(vertices, triangles):
    return measure(Surface("s", np.asarray(vertices, float), np.asarray(triangles, np.int64))).condition


def test_a_sound_surface_has_no_defect():
    found = condition(PLANE.vertices, PLANE.triangles)
    assert (found.duplicate_vertices, found.unused_vertices, found.holes, found.pinched_vertices, found.rims) == (0, 0, 0, 0, 1)
    assert not found.zero_area.size
    assert not found.flipped.size
    assert not found.repeated.size
    assert not found.nonmanifold_edges.size
    assert not found.not_orientable


def test_a_hole_is_told_from_the_rim():
    inner = np.setdiff1d(np.arange(35), PLANE.triangles[np.bincount(PLANE.triangles.ravel(), minlength=35)[PLANE.triangles].min(1) < 6])
    vertex = int(inner[0]) if inner.size else 17
    keep = ~(PLANE.triangles == vertex).any(1)
    found = condition(PLANE.vertices, PLANE.triangles[keep])
    assert (found.rims, found.holes) == (2, 1)
    assert found.unused_vertices == 1


def test_zero_area_and_repeated_triangles_are_located():
    triangles = np.concatenate([PLANE.triangles, [[0, 0, 1], PLANE.triangles[5][[1, 2, 0]]]])
    found = condition(PLANE.vertices, triangles)
    assert found.zero_area.tolist() == [len(PLANE.triangles)]
    assert found.repeated.tolist() == [len(PLANE.triangles) + 1]


def test_an_edge_of_three_triangles_is_named_by_its_vertices():
    used = Counter(frozenset(side) for t in PLANE.triangles.tolist() for side in ((t[0], t[1]), (t[1], t[2]), (t[2], t[0])))
    inner = sorted(next(side for side, count in used.items() if count == 2))
    vertices = np.concatenate([PLANE.vertices, PLANE.vertices[inner].mean(0, keepdims=True) + [0, 0, 900.0]])
    found = condition(vertices, np.concatenate([PLANE.triangles, [[inner[0], inner[1], len(PLANE.vertices)]]]))
    assert found.nonmanifold_edges.tolist() == [inner]


def test_a_fin_on_a_sheet_does_not_turn_the_sheet():
    inner = [8, 15]
    fin = np.concatenate([PLANE.vertices, [[0.0, 0, 2500.0]]])
    found = measure(Surface("fin", fin, np.concatenate([PLANE.triangles, [[*inner, len(PLANE.vertices)]]])))
    assert np.allclose(found.normals[:-1], measure(PLANE).normals)


def test_two_sheets_that_touch_in_a_point_are_pinched_there():
    other = plane_surface("b", 30.0, 50.0, 3000.0, 2000.0, (0.0, 0.0, 0.0), cells=(6, 4))
    away = other.vertices + (PLANE.vertices[-1] - other.vertices[0])
    found = condition(np.concatenate([PLANE.vertices, away]), np.concatenate([PLANE.triangles, other.triangles + len(away)]))
    assert found.pinched_vertices == 1
    assert found.duplicate_vertices == 1


def moebius(steps=24):
    angle = np.linspace(0, 2 * np.pi, steps, endpoint=False)
    rims = [
        np.stack([(3 + w * np.cos(angle / 2)) * np.cos(angle), (3 + w * np.cos(angle / 2)) * np.sin(angle), w * np.sin(angle / 2)], 1)
        for w in (-1, 1)
    ]
    vertices = np.concatenate(rims) * 100
    rows = []
    for k in range(steps):
        a, b = k, k + steps
        c, d = (k + 1, k + 1 + steps) if k + 1 < steps else (steps, 0)  # the twist
        rows += [[a, b, c], [b, d, c]]
    return vertices, rows


def test_a_moebius_strip_is_not_orientable():
    found = condition(*moebius())
    assert found.not_orientable
    assert found.rims == 1


@pytest.mark.parametrize("seed", range(5))
def test_flipping_is_counted_from_the_minority(seed):
    triangles = PLANE.triangles.copy()
    pick = np.random.default_rng(seed).choice(len(triangles), 7, replace=False)
    triangles[pick] = triangles[pick][:, ::-1]
    assert condition(PLANE.vertices, triangles).flipped.tolist() == sorted(pick.tolist())


def test_a_closed_surface_has_no_rim():
    vertices = np.array([[0.0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]]) * 1000
    found = condition(vertices, [[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]])
    assert (found.rims, found.holes) == (0, 0)
