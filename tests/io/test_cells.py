"""Polygons, strips and mixed cells against plain loops."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from structviz.errors import FormatError, SurfaceError
from structviz.io.cells import check_runs, fan, parted, strips, triangles_of_cells, used_only

cells = st.lists(st.lists(st.integers(0, 50), max_size=7), max_size=12)


def flat(rows):
    return np.array([value for row in rows for value in row], np.int64), np.cumsum([len(row) for row in rows]).astype(np.int64)


def slow_fan(row):
    return [[row[0], row[k], row[k + 1]] for k in range(1, len(row) - 1)]


def slow_strip(row):
    return [[row[k], row[k + 2], row[k + 1]] if k % 2 else [row[k], row[k + 1], row[k + 2]] for k in range(len(row) - 2)]


@given(cells)
def test_fans_are_those_of_a_plain_loop(rows):
    assert fan(*flat(rows)).tolist() == [triangle for row in rows for triangle in slow_fan(row)]


@given(cells)
def test_strips_are_those_of_a_plain_loop(rows):
    assert strips(*flat(rows)).tolist() == [triangle for row in rows for triangle in slow_strip(row)]


@given(st.lists(st.tuples(st.sampled_from([5, 6, 7, 9]), st.lists(st.integers(0, 50), min_size=3, max_size=7)), min_size=1, max_size=12))
def test_mixed_cells_keep_their_order(mixed):
    rows = [row[:3] if kind == 5 else row[:4] if kind == 9 else row for kind, row in mixed]
    made, _ = triangles_of_cells(*flat(rows), np.array([kind for kind, _ in mixed]), "a.vtu")
    assert made.tolist() == [t for (kind, _), row in zip(mixed, rows) for t in (slow_strip(row) if kind == 6 else slow_fan(row))]


def test_pixels_turn_no_corner():
    made, history = triangles_of_cells(*flat([[0, 1, 2, 3]]), np.array([8]), "a.vtu")
    assert made.tolist() == [[0, 1, 2], [1, 3, 2]]
    assert history == ("1 quadrilateral split into triangles",)


def test_curved_faces_are_read_by_their_corners_and_told():
    made, history = triangles_of_cells(*flat([[0, 1, 2, 3, 4, 5], [6, 7, 8]]), np.array([22, 5]), "a.vtu")
    assert made.tolist() == [[0, 1, 2], [6, 7, 8]]
    assert history == ("1 curved face read by the corners only",)


def test_lines_and_volumes_are_left_out_and_told():
    made, history = triangles_of_cells(*flat([[0, 1], [0, 1, 2], [0, 1, 2, 3]]), np.array([3, 5, 10]), "a.vtu")
    assert made.tolist() == [[0, 1, 2]]
    assert history == ("1 line or point cell left out", "1 volume cell left out")


def test_volumes_alone_say_what_to_export():
    with pytest.raises(
        SurfaceError, match=r"a\.vtu: found 1 volume cell and no triangles; wanted a surface of triangles\n  next: export the fault surf"
    ):
        triangles_of_cells(*flat([[0, 1, 2, 3]]), np.array([10]), "a.vtu")


@pytest.mark.parametrize("ends", [[-1, 3], [3, 2], [3, 7], [2**63 - 1, -5]])
def test_cell_ends_that_do_not_fit_are_refused(ends):
    with pytest.raises(FormatError, match="cell ends that do not fit 6 corner numbers"):
        check_runs(np.arange(6), np.array(ends), "a.vtu")


def test_used_only_keeps_places_and_order():
    vertices = np.arange(18.0).reshape(6, 3)
    kept, triangles = used_only(vertices, np.array([[5, 1, 3]]))
    assert kept[triangles].tolist() == vertices[[[5, 1, 3]]].tolist()
    assert len(kept) == 3


def test_parts_cut_out_in_one_go_are_those_cut_out_one_by_one():
    chance = np.random.default_rng(5)
    vertices, triangles = chance.normal(size=(60, 3)), chance.integers(0, 60, (200, 3))
    owner = chance.integers(0, 7, 200)
    owner[owner == 4] = 5  # a part without triangles
    for part, (places, corners) in enumerate(parted(vertices, triangles, owner, 7)):
        wanted_places, wanted_corners = used_only(vertices, triangles[owner == part])
        assert np.array_equal(places, wanted_places)
        assert np.array_equal(corners, wanted_corners)
