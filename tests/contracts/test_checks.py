"""What every registered check keeps: it passes its good sample, fails its bad one, and speaks in whole sentences."""

from __future__ import annotations

import math

import numpy as np
import pytest

from structviz.checks import CHECKS, Check, run
from structviz.checks.registry import NEEDS, SEVERITIES, Examined
from structviz.references import REFERENCES

EVERY = pytest.mark.parametrize("row", CHECKS.values(), ids=CHECKS.keys())


@EVERY
def test_passes_its_good_sample(row: Check) -> None:
    good = row.passes()
    assert good.has(row.needs)
    assert not list(row.examine(good, row.limit))


@EVERY
def test_fails_its_bad_sample_with_words_and_numbers(row: Check) -> None:
    bad = row.fails()
    found = list(row.examine(bad, row.limit))
    assert found
    assert len({each.subject for each in found}) == len(found), "one finding per check and subject, counts inside"
    subjects = {"model"} | {fault.name for fault in bad.model.faults}
    for each in found:
        assert each.severity in SEVERITIES
        assert each.subject in subjects
        assert len(each.message.split()) >= 3
        assert not each.message.endswith(".")
        assert "nan" not in each.message.lower().split()
        for name, value in each.evidence:
            assert name == name.lower()
            assert " " not in name
            assert isinstance(value, str) or math.isfinite(value)
            assert type(value) in (str, int, float), "plain numbers, so that every writer can store them"


@EVERY
def test_run_gives_the_finding_its_key_and_hint(row: Check) -> None:
    found = [each for each in run(row.fails()) if each.check == row.key]
    assert found
    assert all(each.hint for each in found)


@EVERY
def test_row_is_complete(row: Check) -> None:
    assert row.key == row.key.lower()
    assert row.key.replace("-", "").isalnum()
    assert row.needs in NEEDS
    assert row.title
    assert row.why
    assert row.hint
    assert row.low <= row.limit <= row.high
    assert not row.source or row.source in REFERENCES
    assert row.examine.__doc__


@EVERY
def test_leaves_its_input_alone(row: Check) -> None:
    bad = row.fails()
    before = fingerprint(bad)
    list(row.examine(bad, row.limit))
    assert fingerprint(bad) == before


@EVERY
def test_same_input_same_findings(row: Check) -> None:
    assert run(row.fails()) == run(row.fails())


@EVERY
def test_survives_what_is_empty(row: Check) -> None:
    bare = Examined(row.passes().model)
    assert run(bare) == ()
    assert isinstance(list(row.examine(bare, row.limit)), list)


def fingerprint(examined: Examined) -> bytes:
    arrays = [(piece.surface.vertices, piece.surface.triangles, piece.normals, piece.areas_m2) for piece in examined.measured]
    return b"".join(np.ascontiguousarray(array).tobytes() for piece in arrays for array in piece)
