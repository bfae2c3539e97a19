"""Repair: each planted defect is gone and told, the shape that is left is the shape that was there, and a sound surface is left alone."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.surfaces.measure import measure
from structviz.surfaces.repair import RepairChoices, hole_rims, least_area_patch, repaired
from structviz.surfaces.surface import Surface
from structviz.synthetic.damage import damaged_surface, sound_surface


def keys(changes) -> list[str]:
    return [change.key for change in changes]


def test_a_sound_surface_comes_back_as_it_was() -> None:
    surface = sound_surface()
    again, changes = repaired(surface, RepairChoices(largest_hole_m=1e6, least_part=0.2))
    assert again is surface
    assert changes == ()


@pytest.mark.parametrize(
    ("kind", "key", "left"),
    [
        ("duplicate_vertices", "welded", lambda c: c.duplicate_vertices),
        ("flipped_winding", "turned", lambda c: len(c.flipped)),
        ("repeated_triangles", "repeated", lambda c: len(c.repeated)),
    ],
)
def test_a_planted_defect_is_gone_and_nothing_else_is_done(kind, key, left) -> None:
    surface = damaged_surface(kind)
    before = surface.vertices.tobytes(), surface.triangles.tobytes()
    again, changes = repaired(surface)
    assert keys(changes) == [key]
    assert left(measure(surface).condition) > 0
    assert left(measure(again).condition) == 0
    assert (surface.vertices.tobytes(), surface.triangles.tobytes()) == before
    assert again.history[-1] == f"repaired: {changes[0].text}"
    assert repaired(again)[1] == ()  # once is enough


def test_rows_of_a_change_are_those_of_the_condition() -> None:
    surface = damaged_surface("repeated_triangles")
    (change,) = repaired(surface)[1]
    assert np.array_equal(change.rows, measure(surface).condition.repeated)
    assert np.allclose(change.place, surface.vertices[surface.triangles[change.rows[0]]].mean(0))
    surface = damaged_surface("flipped_winding")
    (change,) = repaired(surface)[1]
    assert np.array_equal(change.rows, measure(surface).condition.flipped)


def test_triangles_that_collapse_go_and_the_orientation_stays() -> None:
    sound = sound_surface()
    flat = np.array([[0, 0, 1], [2, 3, 2]])
    surface = Surface("flat", sound.vertices, np.concatenate([sound.triangles[:5], flat, sound.triangles[5:]]))
    again, changes = repaired(surface)
    assert keys(changes) == ["collapsed"]
    assert changes[0].rows.tolist() == [5, 6]
    assert np.array_equal(again.triangles, sound.triangles)


def test_vertices_nobody_uses_go_and_are_told() -> None:
    sound = sound_surface()
    surface = Surface("idle", np.concatenate([[[9e5, 9e6, 0.0]], sound.vertices]), sound.triangles + 1)
    again, changes = repaired(surface)
    assert keys(changes) == ["unused"]
    assert np.array_equal(again.vertices, sound.vertices)
    assert changes[0].place == (9e5, 9e6, 0.0)


def test_near_vertices_are_joined_only_when_asked_and_told_how_far() -> None:
    surface = damaged_surface("duplicate_vertices")
    doubled = np.flatnonzero(np.bincount(np.unique(surface.vertices, axis=0, return_inverse=True)[1].ravel()) > 1)
    assert doubled.size
    shaken = surface.vertices + np.random.default_rng(0).uniform(-0.01, 0.01, surface.vertices.shape)
    apart = Surface("apart", shaken, surface.triangles)
    assert "welded" not in keys(repaired(apart)[1])
    again, changes = repaired(apart, RepairChoices(weld_m=0.1))
    assert keys(changes) == ["welded"]
    assert "moved by up to 0.0" in changes[0].text
    assert len(measure(again).parts) == len(measure(sound_surface()).parts)
    assert len(again.vertices) == len(sound_surface().vertices)


def test_a_hole_is_filled_when_it_is_small_enough() -> None:
    surface = damaged_surface("hole")
    assert measure(surface).condition.holes == 1
    assert repaired(surface, RepairChoices(largest_hole_m=1.0))[1] == ()
    again, changes = repaired(surface, RepairChoices(largest_hole_m=1e5))
    assert keys(changes) == ["filled"]
    measured = measure(again)
    assert (measured.condition.holes, len(measured.condition.flipped)) == (0, 0)
    assert len(again.vertices) == len(surface.vertices)
    assert measured.area_m2 == pytest.approx(measure(sound_surface()).area_m2, rel=2e-3)


def test_scraps_go_when_asked_and_the_largest_part_never_does() -> None:
    surface = damaged_surface("stray_part")
    share = measure(surface).parts[-1].area_m2 / measure(surface).area_m2
    again, changes = repaired(surface, RepairChoices(least_part=min(0.5, share * 1.01)))
    assert keys(changes) == ["scraps"]
    assert len(measure(again).parts) == len(measure(surface).parts) - 1
    assert repaired(surface, RepairChoices(least_part=share * 0.99))[1] == ()
    even = Surface("many", np.concatenate([sound_surface().vertices + [0, 0, 9e4 * k] for k in range(9)]),
                   np.concatenate([sound_surface().triangles + k * len(sound_surface().vertices) for k in range(9)]))  # fmt: skip
    assert len(measure(repaired(even, RepairChoices(least_part=0.5))[0]).parts) == 1


@pytest.mark.parametrize("kind", ["nonmanifold", "pinched"])
def test_what_only_an_interpreter_can_decide_is_left(kind: str) -> None:
    surface = damaged_surface(kind)
    again, changes = repaired(surface, RepairChoices(weld_m=0.0, largest_hole_m=1.0))
    assert again is surface
    assert changes == ()


def plain_least_area(around: np.ndarray) -> float:
    """Return the least area over all triangulations of a closed line, tried one by one."""
    if len(around) < 3:
        return 0.0
    first, last, best = around[0], around[-1], np.inf
    for k in range(1, len(around) - 1):
        area = np.linalg.norm(np.cross(around[k] - first, last - first)) / 2
        best = min(best, plain_least_area(around[: k + 1]) + area + plain_least_area(around[k:]))
    return float(best)


@pytest.mark.parametrize("count", [3, 4, 5, 7])
def test_a_patch_has_the_least_area_of_all(count: int) -> None:
    around = np.random.default_rng(count).normal(size=(count, 3))
    patch = least_area_patch(around)
    assert patch.shape == (count - 2, 3)
    corners = around[patch]
    area = np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1).sum() / 2
    assert area == pytest.approx(plain_least_area(around))


def test_rims_of_holes_are_not_the_outline() -> None:
    surface = damaged_surface("hole")
    (rim,) = hole_rims(surface.vertices, surface.triangles)
    middle = surface.vertices[rim].mean(0)
    low, high = surface.vertices.min(0), surface.vertices.max(0)
    assert (low < middle).all()
    assert (middle < high).all()
    assert hole_rims(sound_surface().vertices, sound_surface().triangles) == []


@pytest.mark.parametrize(("name", "value"), list(itertools.product(["weld_m", "largest_hole_m", "least_part"], [-1.0, np.nan])))
def test_choices_out_of_range_are_refused(name: str, value: float) -> None:
    with pytest.raises(ArgumentError, match=name):
        RepairChoices(**{name: value})
