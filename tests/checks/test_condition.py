"""Surfaces with one defect each, measured as a user's would be: the finding names that defect and no other."""

from __future__ import annotations

import pytest

from structviz.checks import Examined, run
from structviz.kinematics.senses import sector_of_words
from structviz.model import Fault, FaultModel, Finding
from structviz.surfaces.measure import measure
from structviz.surfaces.surface import Surface
from structviz.synthetic.damage import DAMAGE, damaged_surface, sound_surface

# A fin leaves a second boundary about itself; a copy of a triangle lies on it wound against it and shares its three edges.
EXPECTED = {
    "duplicate_vertices": {"duplicate-vertices"},
    "zero_area": {"zero-area"},
    "flipped_winding": {"winding"},
    "nonmanifold": {"non-manifold-edges"},
    "hole": {"holes"},
    "pinched": {"pinched"},
    "stray_part": {"stray-pieces"},
    "opposite_parts": {"parts-opposed"},
    "repeated_triangles": {"repeated-triangles"},
}
BESIDE = {"nonmanifold": {"holes"}, "repeated_triangles": {"non-manifold-edges", "winding"}}


def findings(surface: Surface) -> tuple[Finding, ...]:
    fault = Fault(surface.name, surface, sector_of_words("normal"))
    return run(Examined(FaultModel("one", (fault,)), (measure(surface),)))


def test_a_sound_surface_raises_nothing() -> None:
    assert findings(sound_surface()) == ()


@pytest.mark.parametrize("kind", sorted(DAMAGE))
def test_each_defect_is_found_and_named(kind: str) -> None:
    found = {each.check for each in findings(damaged_surface(kind))}
    assert found - BESIDE.get(kind, set()) == EXPECTED[kind]


def test_counts_and_places_are_told() -> None:
    (double,) = findings(damaged_surface("duplicate_vertices"))
    assert double.message.startswith("6 vertices lie at the place of another")
    (turned,) = findings(damaged_surface("flipped_winding"))
    assert turned.message.startswith("5 triangles are wound against the rest of the part, of 80")
    assert dict(turned.evidence)["first_triangle"] == 10
    branch = next(each for each in findings(damaged_surface("nonmanifold")) if each.check == "non-manifold-edges")
    assert dict(branch.evidence)["first_up_m"] == pytest.approx(-2086.6)


def test_parts_that_dip_opposite_ways_are_told_with_both_planes() -> None:
    (only,) = findings(damaged_surface("opposite_parts"))
    assert only.severity == "warning"
    assert "030/60 and 210/60" in only.message
