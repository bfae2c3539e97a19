"""Checks on whole random models: silent where nothing is wrong, and naming exactly what was planted where something is."""

from __future__ import annotations

import pytest

from structviz.analysis import Settings, run
from structviz.synthetic import random_model

REGIMES = pytest.mark.parametrize("regime", ["normal", "strike-slip", "reverse"])
QUICK = Settings(replicates=200)


@REGIMES
def test_a_sound_model_gets_notes_at_most(regime: str) -> None:
    found = run(random_model(regime, planted=0, random_state=3).model, QUICK).findings
    assert {each.severity for each in found} <= {"note"}
    assert {each.check for each in found} <= {"shape-ratio-open", "gentle-normal", "steep-reverse", "undetermined"}


@REGIMES
def test_planted_labels_are_errors_and_no_other_fault_is(regime: str) -> None:
    known = random_model(regime, planted=3, random_state=5)
    found = run(known.model, QUICK).findings
    assert {each.subject for each in found if each.check == "conflict"} == set(known.flipped)
    assert all(each.hint.startswith("first likely cause: ") for each in found if each.check == "conflict")
    assert not [each for each in found if each.check == "many-conflicts"]


def test_a_model_without_senses_is_told_so_once() -> None:
    known = random_model("normal", planted=0, random_state=1)
    bare = tuple(type(fault)(fault.name, fault.surface) for fault in known.model.faults)
    found = run(type(known.model)("bare", bare), QUICK).findings
    assert [each.subject for each in found if each.check == "no-sense"] == ["model"]
    assert not [each for each in found if each.check in ("conflict", "undetermined")]
    assert [each for each in found if each.check in ("few-senses", "no-regime")]
