"""The table of checks: entering, running, limits, order."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.checks import CHECKS, Examined, Found, check, checked_limits, run, samples, table_text
from structviz.checks.registry import SEVERITIES
from structviz.errors import ArgumentError


def test_unknown_key_prints_the_table() -> None:
    with pytest.raises(ArgumentError, match=r"found the key 'hole'; wanted one of these checks(.|\n)*holes +0 holes"):
        run(samples.one(), {"hole": 1})


def test_limit_out_of_range_is_named_with_unit() -> None:
    with pytest.raises(ArgumentError, match=r"limit of steep-reverse: found 95 deg; wanted 0 to 90 deg"):
        checked_limits({"steep-reverse": 95.0})
    with pytest.raises(ArgumentError, match="NaN or infinite"):
        checked_limits({"steep-reverse": float("nan")})


def test_limits_given_replace_defaults_and_nothing_else() -> None:
    limits = checked_limits({"holes": 3})
    assert limits.pop("holes") == 3.0
    assert limits == {key: row.limit for key, row in CHECKS.items() if key != "holes"}


def test_limits_are_heard() -> None:
    holed = samples.with_condition(holes=2)
    assert "holes" in {found.check for found in run(holed)}
    assert "holes" not in {found.check for found in run(holed, {"holes": 2})}


def test_a_key_is_entered_once() -> None:
    row = CHECKS["holes"]
    again = check("holes", title="", why="", unit="", limit=0, source="", hint="", passes=row.passes, fails=row.fails, low=0, high=1)
    with pytest.raises(ArgumentError, match="'holes': found two of that key"):
        again(row.examine)
    assert CHECKS["holes"] is row


def test_table_names_every_check_once() -> None:
    lines = table_text().splitlines()
    assert sorted(line.split()[0] for line in lines) == sorted(CHECKS)


def test_worst_comes_first_then_key_then_subject() -> None:
    pieces = [samples.measured(samples.plane(40.0 * k, centre=(9000.0 * k, 0, -3000))) for k in range(4)]
    bad = samples.Condition(holes=1, repeated=np.array([1]), not_orientable=True)
    found = run(samples.examined(*(replace(piece, condition=bad) for piece in pieces), senses="- normal"))
    ranks = [(SEVERITIES.index(each.severity), each.check, each.subject) for each in found]
    assert ranks == sorted(ranks)
    assert {each.severity for each in found} == set(SEVERITIES)


def test_stress_checks_wait_for_the_stress() -> None:
    known = samples.judged("consistent", "conflicting")
    before = Examined(known.model, known.measured)
    stress = {row.key for row in CHECKS.values() if row.needs == "stress"}
    assert not stress & {found.check for found in run(before)}
    assert stress & {found.check for found in run(known)}


def test_numbers_leave_as_plain_python(monkeypatch: pytest.MonkeyPatch) -> None:
    row = replace(CHECKS["holes"], examine=lambda examined, limit: [Found("A", "note", "one two three", (("holes", np.int64(3)),))])
    monkeypatch.setitem(CHECKS, "holes", row)
    found = next(each for each in run(samples.one()) if each.check == "holes")
    assert type(found.evidence[0][1]) is int


def test_order_of_faults_changes_nothing() -> None:
    known = samples.judged("consistent", "conflicting", "undetermined", "conflicting")
    turned = replace(
        known,
        model=replace(known.model, faults=known.model.faults[::-1]),
        measured=known.measured[::-1],
        verdicts=known.verdicts[::-1],
    )
    assert run(turned) == run(known)


def test_moving_the_model_changes_nothing() -> None:
    known = samples.judged("consistent", "conflicting", "undetermined")
    away = np.array([512_345.0, 6_543_210.0, 0.0])
    moved = tuple(
        replace(piece, surface=replace(piece.surface, vertices=piece.surface.vertices + away), centroids=piece.centroids + away)
        for piece in known.measured
    )
    assert run(replace(known, measured=moved)) == run(known)


def test_a_sound_model_gets_no_finding_about_its_surfaces() -> None:
    pieces = [samples.measured(samples.plane(180.0 * (k % 2), centre=(9000.0 * k, 0, -3000))) for k in range(6)]
    assert run(samples.examined(*pieces)) == ()
