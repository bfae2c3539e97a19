"""The regime and the verdicts as findings: on which side of each limit, and in which words."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.checks import CHECKS, Found, run, samples
from structviz.checks.registry import Examined
from structviz.kinematics.senses import sector_of_words
from structviz.orientation.vectors import rotation
from structviz.stress.regime import Reading, Regime
from structviz.stress.verdict import Cause

AXES = samples.NORMAL_AXES


def found(key: str, examined: Examined) -> list[Found]:
    row = CHECKS[key]
    return list(row.examine(examined, row.limit))


def reading(key: str, regime: Regime) -> Reading:
    return Reading(key, f"by {key}", regime, 7)


def turned(angle_deg: float, **changes: object) -> Regime:
    """Return the sample regime turned about the vertical."""
    return samples.regime(AXES @ rotation([0, 0, 1], angle_deg).T, shmax_deg=(-angle_deg) % 180, **changes)


@pytest.mark.parametrize(("angle", "expected"), [(25.0, 0), (35.0, 1)])
def test_readings_may_differ_by_the_limit(angle: float, expected: int) -> None:
    known = samples.judged("consistent", readings=(reading("geometry", turned(0)), reading("senses", turned(angle))))
    assert len(found("readings-disagree", known)) == expected


def test_wide_cones_excuse_a_difference() -> None:
    loose = turned(50, cones_deg=(50.0, 50.0, 50.0))
    known = samples.judged("consistent", readings=(reading("geometry", turned(0)), reading("senses", loose)))
    assert not found("readings-disagree", known)


def test_sigma_axes_are_lines_so_a_half_turn_is_no_difference() -> None:
    known = samples.judged("consistent", readings=(reading("geometry", turned(0)), reading("senses", turned(180))))
    assert not found("readings-disagree", known)


def test_the_joint_reading_is_no_party_to_the_dispute() -> None:
    known = samples.judged("consistent", readings=(reading("geometry", turned(0)), reading("joint", turned(80))))
    assert not found("readings-disagree", known)


def test_alternatives_are_ranked_by_the_declared_movements_they_explain() -> None:
    reverse = samples.regime(AXES[::-1], "reverse", 90.0)
    known = samples.judged(*["consistent"] * 6, readings=(reading("geometry", reverse), reading("senses", turned(0))))
    (only,) = found("readings-disagree", known)
    best, rest = only.message.split("best first: ")[1].split("; ")[:2]
    assert best == "by senses: normal, SHmax 000 +/- 5 (explains 6 of 6 declared movements)"
    assert rest == "by geometry: reverse, SHmax 090 +/- 5 (explains 0 of 6 declared movements)"
    assert only.message.endswith("the verdicts follow normal, SHmax 000 +/- 5")
    assert dict(only.evidence)["apart_deg"] == 90.0


@pytest.mark.parametrize(("lean", "expected"), [(15.0, 0), (25.0, 1)])
def test_leaning_axes(lean: float, expected: int) -> None:
    leaning = samples.regime(AXES @ rotation([1, 1, 0], lean).T)
    assert len(found("tilted-axes", samples.judged("consistent", regimes=(leaning,)))) == expected


def test_a_lean_within_the_cone_says_nothing() -> None:
    leaning = samples.regime(AXES @ rotation([1, 1, 0], 25.0).T, cones_deg=(30.0, 30.0, 30.0))
    assert not found("tilted-axes", samples.judged("consistent", regimes=(leaning,)))


def test_sigma2_alone_may_be_loose_but_not_sigma1() -> None:
    s2 = samples.regime(cones_deg=(10.0, 60.0, 20.0))
    s1 = samples.regime(cones_deg=(60.0, 60.0, 20.0))
    assert not found("loose-regime", samples.judged("consistent", regimes=(s2,)))
    assert found("loose-regime", samples.judged("consistent", regimes=(s1,)))


def test_obtuse_pairs_count_by_weight() -> None:
    pairs = samples.pair_rows(True, True, False)
    light = replace(pairs, weight=np.array([0.1, 0.1, 1.0]))
    assert found("obtuse-pairs", samples.judged("consistent", "consistent", pairs=pairs))
    assert not found("obtuse-pairs", samples.judged("consistent", "consistent", pairs=light))


def test_a_steep_fault_whose_word_cannot_be_tested_carries_nothing() -> None:
    pieces = [samples.measured(samples.plane(40.0 * k, 88.0)) for k in range(6)]
    known = samples.examined(*pieces, regimes=(samples.regime(),))
    (only,) = found("few-senses", known)
    assert "0 faults" in only.message
    assert not found("few-senses", samples.with_down_side(known, "NNE"))


def test_no_regime_gives_the_reasons() -> None:
    lost = (Reading("geometry", "geometry only", None, 0, "all faults are parallel"),)
    (only,) = found("no-regime", samples.judged("undetermined", regimes=(), readings=lost))
    assert "geometry only: all faults are parallel" in only.message
    assert not found("undetermined", samples.judged("undetermined", regimes=(), readings=lost)), (
        "told once for the model, not fault by fault"
    )


def test_a_conflict_is_an_error_with_reasons_numbers_and_first_cause() -> None:
    known = samples.judged("consistent", "conflicting")
    (only,) = [each for each in run(known) if each.check == "conflict"]
    assert (only.severity, only.subject) == ("error", "B")
    assert only.message == "predicted from the other faults"
    assert dict(only.evidence)["misfit_deg"] == 170.0
    assert only.hint == "first likely cause: the label is swapped"


def test_no_verdict_without_a_declaration_is_not_reported_twice() -> None:
    known = samples.judged("undetermined", "undetermined")
    bare = replace(known, model=replace(known.model, faults=tuple(replace(f, declared=None) for f in known.model.faults)))
    assert len(found("undetermined", known)) == 2
    assert not found("undetermined", bare)


@pytest.mark.parametrize(("wrong", "right", "expected"), [(2, 1, 0), (3, 12, 0), (3, 8, 1), (3, 0, 1)])
def test_many_conflicts_are_three_at_least_and_a_share_of_the_judged(wrong: int, right: int, expected: int) -> None:
    words = ["conflicting"] * wrong + ["consistent"] * right + ["undetermined"] * 20
    assert len(found("many-conflicts", samples.judged(*words))) == expected


def test_the_common_cause_is_told_once() -> None:
    known = samples.judged(*["conflicting"] * 4, "consistent")
    causes = [Cause("dips_other_way", "it dips the other way", 0.9)] * 3 + [Cause("label_swapped", "swapped", 0.8)]
    verdicts = tuple(replace(v, causes=(c,)) for v, c in zip(known.verdicts, causes)) + known.verdicts[4:]
    (only,) = found("many-conflicts", replace(known, verdicts=verdicts))
    assert only.message.endswith("first likely cause of 3 of them: dips other way")


def test_a_set_that_conflicts_as_one_is_told_apart_from_single_labels() -> None:
    as_one = samples.judged("conflicting", "conflicting", "conflicting", "consistent", "consistent", strike_step_deg=12.0)
    (only,) = found("conflicting-set", as_one)
    assert only.message.startswith("A, B, C conflict, lie within 25 deg of one plane")
    among_others = samples.judged(*["conflicting"] * 3, *["consistent"] * 4, strike_step_deg=1.0)
    assert found("conflicting-set", among_others)[0].message.endswith("though 4 faults of that orientation moved with the rest")
    few = samples.judged(*["conflicting"] * 3, *["consistent"] * 7, strike_step_deg=1.0)
    assert not found("conflicting-set", few), "most of that set agrees with the rest: labels, not age"
    spread = samples.judged(*["conflicting"] * 3, strike_step_deg=60.0)
    assert not found("conflicting-set", spread)


def test_a_set_declared_in_opposite_ways_is_no_set() -> None:
    known = samples.judged(*["conflicting"] * 3, strike_step_deg=5.0)
    faults = list(known.model.faults)
    faults[1] = replace(faults[1], declared=sector_of_words("reverse"))
    assert not found("conflicting-set", replace(known, model=replace(known.model, faults=tuple(faults))))
