"""One cause for several faults is told once, with their names; a few slips of the pen are not."""

from __future__ import annotations

from dataclasses import replace

import pytest

from structviz.checks import CHECKS, registry, samples
from structviz.checks.registry import Examined, Finding
from structviz.stress.verdict import Cause
from structviz.surfaces.measure import measure
from structviz.synthetic.models import Known, random_model


def found(key: str, examined: Examined) -> list[Finding]:
    """Return what one check finds."""
    return [finding for finding in registry.run(examined) if finding.check == key]


def conflicts(keys: list[str], consistent: int) -> Examined:
    """Return a model with one conflict for each key of a first cause."""
    known = samples.judged(*["conflicting"] * len(keys), *["consistent"] * consistent)
    verdicts = tuple(replace(v, causes=(Cause(key, "", 0.7),)) for v, key in zip(known.verdicts, keys))
    return replace(known, verdicts=verdicts + known.verdicts[len(keys) :])


def test_surfaces_that_dip_the_other_way_are_one_mistake() -> None:
    (only,) = found("cause-shared", conflicts(["dips_other_way"] * 4 + ["label_swapped"], 10))
    assert only.message.startswith("4 of 5 conflicts share a likely cause, dips other way: depth read as elevation")
    assert only.message.endswith("(A, B, C, D)")
    assert only.hint.startswith("once for all of them: check the dip")


def test_it_stands_before_the_conflicts_it_explains() -> None:
    checks = [finding.check for finding in registry.run(conflicts(["mirrored"] * 3, 8)) if finding.severity == "error"]
    assert checks[0] == "cause-shared"
    assert checks.count("conflict") == 3


@pytest.mark.parametrize(("consistent", "told"), [(3, 1), (20, 0)])
def test_swapped_labels_are_a_convention_only_where_they_are_many(consistent: int, told: int) -> None:
    assert len(found("cause-shared", conflicts(["label_swapped"] * 4, consistent))) == told


def test_causes_of_several_kinds_are_told_one_by_one() -> None:
    assert not found("cause-shared", conflicts(["mirrored", "mirrored", "older_phase", "older_phase", "label_swapped"], 8))
    assert not found("cause-shared", conflicts(["too_little_shear"] * 4, 8)), "no mistake, and none to be put right"


def test_a_model_of_swapped_words_says_what_else_would_look_the_same() -> None:
    (only,) = found("cause-of-whole-model", CHECKS["cause-of-whole-model"].fails())
    assert "with every declared movement reversed" in only.message
    assert "mirrored" not in only.message, "dip-slip words do not tell a mirrored plan"
    assert only.message.endswith("rotated blocks, or older planes used again, look the same")


@pytest.mark.parametrize("state", range(3))
def test_in_strike_slip_a_mirrored_plan_and_swapped_words_are_told_as_one(state: int) -> None:
    right = random_model("strike-slip", planted=4, random_state=state)
    wrong = random_model("strike-slip", planted=24, random_state=state)
    said = [[f.message for f in found("cause-of-whole-model", _measured(known))] for known in (right, wrong)]
    assert not said[0]
    assert "reversed" in said[1][0]
    assert "mirrored" in said[1][0]


def _measured(known: Known) -> Examined:
    pieces = tuple(measure(fault.surface) for fault in known.model.faults)
    return Examined(known.model, pieces, regimes=(samples.regime(),), verdicts=(samples.verdict(),) * len(pieces))
