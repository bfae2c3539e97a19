"""Bending and roughness told apart, and what else is said of a surface as a whole."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.checks import CHECKS, Found, samples
from structviz.checks.orientation import _bending_and_roughness_deg
from structviz.checks.registry import Examined
from structviz.orientation.vectors import angle_deg, rotation
from structviz.surfaces.surface import MeasuredSurface, Surface


def found(key: str, examined: Examined) -> list[Found]:
    row = CHECKS[key]
    return list(row.examine(examined, row.limit))


def refined(surface: Surface) -> Surface:
    """Return the surface with each triangle cut in four at the middles of its edges."""
    corners = surface.vertices[surface.triangles]
    a, b, c = corners[:, 0], corners[:, 1], corners[:, 2]
    ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
    vertices = np.stack([a, ab, ca, ab, b, bc, ca, bc, c, ab, bc, ca], 1).reshape(-1, 3)
    return replace(surface, vertices=vertices, triangles=np.arange(len(vertices)).reshape(-1, 3))


def both(surface: Surface) -> tuple[float, float]:
    return _bending_and_roughness_deg(samples.measured(surface))


def test_a_plane_is_neither_bent_nor_rough() -> None:
    assert both(samples.plane(37.0, 52.0)) == pytest.approx((0.0, 0.0), abs=1e-5)


@pytest.mark.parametrize("limb", [30.0, 60.0, 90.0])
def test_a_fold_is_bent_by_half_the_angle_between_its_limbs(limb: float) -> None:
    piece = samples.measured(samples.folded(limb))
    first, second = piece.normals[piece.centroids[:, 1].argmin()], piece.normals[piece.centroids[:, 1].argmax()]
    bending, roughness = _bending_and_roughness_deg(piece)
    assert bending == pytest.approx(float(angle_deg(first, second)) / 2, rel=0.1)
    assert roughness < 0.6 * bending  # cells that straddle the hinge hold both limbs


def test_noise_is_rough_and_hardly_bent() -> None:
    bending, roughness = both(samples.rough(250.0))
    assert roughness > 25
    assert bending < roughness / 4


@pytest.mark.parametrize("surface", [samples.folded(60.0), samples.rough(100.0)], ids=["folded", "rough"])
def test_refining_turning_and_moving_change_nothing(surface: Surface) -> None:
    expected = both(surface)
    assert both(refined(surface)) == pytest.approx(expected, abs=1.0)
    assert both(replace(surface, vertices=surface.vertices @ rotation([0, 0, 1], 50.0).T)) == pytest.approx(expected, abs=1e-6)
    assert both(replace(surface, vertices=surface.vertices + np.array([4e5, 6e6, 0]))) == pytest.approx(expected, abs=1e-4)
    assert both(replace(surface, vertices=surface.vertices * 0.01)) == pytest.approx(expected, abs=1e-6)


def test_bending_and_roughness_agree_with_a_plain_loop() -> None:
    piece = samples.measured(samples.folded(50.0))
    along, up_dip = samples.slip_vectors(piece.normal, 0.0), samples.slip_vectors(piece.normal, 90.0)
    middle = piece.centroids.mean(0)
    places = [(float((c - middle) @ along), float((c - middle) @ up_dip)) for c in piece.centroids]
    (u0, v0), (u1, v1) = (min(p[0] for p in places), min(p[1] for p in places)), (max(p[0] for p in places), max(p[1] for p in places))
    cells: dict[tuple[int, int], list[int]] = {}
    for row, (u, v) in enumerate(places):
        cells.setdefault((min(int(6 * (u - u0) / (u1 - u0)), 5), min(int(3 * (v - v0) / (v1 - v0)), 2)), []).append(row)
    between = within = area = 0.0
    for rows in cells.values():
        mean = sum(piece.areas_m2[r] * piece.normals[r] for r in rows)
        share = sum(piece.areas_m2[r] for r in rows)
        between += share * float(angle_deg(mean, piece.normal)) ** 2
        within += sum(piece.areas_m2[r] * float(angle_deg(piece.normals[r], mean)) ** 2 for r in rows)
        area += share
    assert _bending_and_roughness_deg(piece) == pytest.approx(((between / area) ** 0.5, (within / area) ** 0.5), abs=1e-5)


def test_a_mean_that_means_nothing_silences_what_rests_on_it() -> None:
    lost = samples.one(meaningful=False, why_not="its parts dip opposite ways", dip_deg=1.0, cone_deg=80.0)
    assert found("parts-opposed", lost)[0].message == "the mean strike and dip mean nothing: its parts dip opposite ways"
    assert not [key for key in ("wide-cone", "no-strike", "curved", "rough", "gentle-normal") if found(key, lost)]


@pytest.mark.parametrize(("share", "expected"), [(0.019, 1), (0.021, 0)])
def test_scraps_are_parts_of_less_than_the_limit(share: float, expected: int) -> None:
    parts = (samples.part(1e6 * (1 - share)), samples.part(1e6 * share))
    assert len(found("stray-pieces", samples.one(parts=parts))) == expected


def test_one_triangle_is_few_and_a_cone_that_is_not_known_is_not_wide() -> None:
    flat = samples.plane()
    single = samples.one(replace(flat, triangles=flat.triangles[:1]), cone_deg=float("nan"))
    assert found("few-triangles", single)[0].message == "the surface has only 1 triangle"
    assert not found("wide-cone", single)


def test_large_surfaces_are_judged_by_whole_arrays() -> None:
    piece: MeasuredSurface = samples.measured(refined(refined(refined(samples.folded(60.0)))))
    assert len(piece.areas_m2) == 128 * 64
    assert found("curved", samples.examined(piece))
