"""Checks on real surfaces: what is known to be wrong with them is found, and sound ones are left in peace."""

from __future__ import annotations

from pathlib import Path

import structviz
from structviz.checks import Examined, run
from structviz.model import FaultModel, Finding
from structviz.surfaces.measure import measure

MESHES = "california_fault_meshes"


def of_surfaces(model: FaultModel) -> tuple[Finding, ...]:
    """Return what the checks find before any stress is inferred."""
    return run(Examined(model, tuple(measure(fault.surface) for fault in model.faults)))


def subjects(found: tuple[Finding, ...], key: str) -> set[str]:
    """Return the subjects of a check by the words after the code of their region."""
    return {each.subject.split("-")[3] for each in found if each.check == key}


def test_hard_cases_are_named_for_what_is_hard_in_them(shared_data: Path) -> None:
    found = of_surfaces(structviz.read_model(shared_data / MESHES / "hard_cases"))
    assert {"Palos_Verdes_fault", "Ridgecrest_ruptures"} <= subjects(found, "parts-opposed")
    assert "Contra_Costa" in subjects(found, "non-manifold-edges")
    assert "Lockwood_Valley_fault" in subjects(found, "curved")


def test_ordinary_faults_are_left_in_peace(shared_data: Path) -> None:
    for region in ("mojave", "transverse_ranges"):
        model = structviz.read_model(shared_data / MESHES / region / "faults.csv")
        found = of_surfaces(model)
        assert not [each for each in found if each.severity == "error"]
        assert not [each for each in found if each.subject == "model"], "frame, units and datum are in order"
        assert len({each.subject for each in found}) < 0.35 * len(model.faults)


def test_mojave_is_told_that_the_acute_rule_misleads(shared_data: Path) -> None:
    analysis = structviz.check(shared_data / MESHES / "mojave" / "faults.csv")
    told = {each.check: each for each in analysis.findings if each.subject == "model"}
    assert dict(told["obtuse-pairs"].evidence)["weight_pct"] > 90
    ranked = told["readings-disagree"].message.split("best first: ")[1].split("; ")
    assert ranked[2].startswith("geometry only")
    assert "explains 0 of 44" in ranked[2]
    assert "explains 44 of 44" in ranked[0]
