"""Declarations against surfaces: on which side of each limit, and in which words."""

from __future__ import annotations

from dataclasses import replace

import pytest

from structviz.checks import CHECKS, Found, samples
from structviz.checks.registry import Examined
from structviz.kinematics.senses import sector_of_rake
from structviz.model import Stria
from structviz.orientation.planes import strike_dip_deg


def found(key: str, examined: Examined, limit: float | None = None) -> list[Found]:
    row = CHECKS[key]
    return list(row.examine(examined, row.limit if limit is None else limit))


def one(strike: float, dip: float, sense: str, side: str = "") -> Examined:
    model = samples.examined(samples.measured(samples.plane(strike, dip)), senses=sense)
    return samples.with_down_side(model, side)


@pytest.mark.parametrize(
    ("strike", "sense", "side", "wrong"),
    [
        (0, "normal", "E", False),  # dips east, east side down
        (0, "normal", "W", True),
        (0, "reverse", "W", False),
        (0, "reverse", "E", True),
        (180, "normal", "W", False),
        (180, "normal", "E", True),
        (0, "normal-sinistral", "NE", False),
        (0, "sinistral-reverse", "NE", True),
        (0, "dextral", "W", False),  # no dip-slip is declared, so the side says nothing
    ],
)
def test_the_side_it_dips_towards_goes_down_on_a_normal_fault(strike: float, sense: str, side: str, wrong: bool) -> None:
    assert bool(found("down-side", one(strike, 60, sense, side))) is wrong


def test_a_wrong_side_is_an_error_that_names_sense_side_and_dip() -> None:
    (only,) = found("down-side", one(0, 60, "normal", "W"))
    assert only.severity == "error"
    assert only.message == "declared normal with the W side down, but the surface dips 60 deg to the E"


def test_a_side_along_strike_says_nothing() -> None:
    (only,) = found("down-side", one(0, 60, "normal", "N"))
    assert only.severity == "warning"
    assert "lies along strike (000)" in only.message


def test_near_vertical_the_side_decides_and_cannot_contradict() -> None:
    assert not found("down-side", one(0, 88, "normal", "W"))
    assert not found("down-side-missing", one(0, 88, "normal", "W"))


@pytest.mark.parametrize(
    ("dip", "sense", "expected"), [(84, "normal", 0), (86, "normal", 1), (86, "dextral", 0), (86, "dextral-normal", 1)]
)
def test_only_steep_dip_slip_needs_the_fallen_side(dip: float, sense: str, expected: int) -> None:
    assert len(found("down-side-missing", one(0, dip, sense))) == expected


def test_a_rake_near_dip_slip_needs_the_fallen_side_too() -> None:
    steep = samples.one(samples.plane(dip_deg=88))
    fault = replace(steep.model.faults[0], declared=sector_of_rake(-80.0))
    assert found("down-side-missing", replace(steep, model=replace(steep.model, faults=(fault,))))
    fault = replace(fault, declared=sector_of_rake(170.0))
    assert not found("down-side-missing", replace(steep, model=replace(steep.model, faults=(fault,))))


@pytest.mark.parametrize(
    ("key", "dip", "sense", "expected"),
    [
        ("gentle-normal", 29, "normal", 1),
        ("gentle-normal", 31, "normal", 0),
        ("gentle-normal", 20, "reverse", 0),
        ("gentle-normal", 20, "normal-dextral", 1),
        ("gentle-normal", 20, "dextral-normal", 0),
        ("steep-reverse", 71, "reverse", 1),
        ("steep-reverse", 69, "reverse", 0),
        ("steep-reverse", 71, "normal", 0),
        ("steep-reverse", 88, "reverse", 0),
    ],
)
def test_dip_against_the_dominant_word(key: str, dip: float, sense: str, expected: int) -> None:
    assert len(found(key, one(0, dip, sense))) == expected


def test_nothing_declared_at_all_is_a_warning_and_some_missing_a_note() -> None:
    pieces = [samples.measured(samples.plane(90.0 * k)) for k in range(3)]
    (none,) = found("no-sense", samples.examined(*pieces, senses="-"))
    (some,) = found("no-sense", samples.examined(*pieces, senses="normal - -"))
    assert (none.severity, some.severity) == ("warning", "note")
    assert some.message == "2 of 3 faults declare no movement: B, C"


def test_crossing_faults_in_one_box_are_not_one_surface() -> None:
    crossing = samples.examined(samples.measured(samples.plane(0)), samples.measured(samples.plane(180)))
    assert not found("same-surface", crossing)


def test_a_copy_with_other_numbering_is_the_same_surface() -> None:
    flat = samples.plane()
    copy = replace(flat, triangles=flat.triangles[::-1, [1, 2, 0]].copy())
    (only,) = found("same-surface", samples.examined(samples.measured(flat), samples.measured(copy)))
    assert (only.subject, only.message) == ("B", "its surface is the same as that of A")


def test_striae_are_compared_with_the_surface_near_them() -> None:
    assert not found("striae-plane", samples.with_stria(10.0, 60.0))
    (only,) = found("striae-plane", samples.with_stria(30.0, 60.0))
    assert only.message.startswith("1 of 1 stria on planes that stand up to 26 deg off")


def test_on_a_fold_the_limb_counts_and_not_the_mean() -> None:
    folded = samples.measured(samples.folded(60.0))
    row = int(folded.centroids[:, 1].argmin())
    strike, dip = (float(v) for v in strike_dip_deg(folded.normals[row]))
    stria = Stria("A", tuple(folded.centroids[row]), strike, dip, -90.0)
    assert not found("striae-plane", samples.examined(folded, striae=(stria,)))
    lost = replace(stria, place=(float("nan"),) * 3)
    assert found("striae-plane", samples.examined(folded, striae=(lost,)))


def test_striae_far_away_are_told_in_metres() -> None:
    (only,) = found("striae-far", samples.with_stria(0.0, 60.0, 2500.0))
    assert 2000 < dict(only.evidence)["farthest_m"] < 2500
    assert not found("striae-far", samples.with_stria(0.0, 60.0, 300.0))


def test_striae_without_a_place_are_compared_with_the_mean_plane() -> None:
    known = samples.with_stria(90.0, 60.0)
    nowhere = replace(known.model.striae[0], place=(float("nan"),) * 3)
    lost = replace(known, model=replace(known.model, striae=(nowhere,)))
    assert found("striae-plane", lost)
    assert not found("striae-far", lost)
