"""The same model through every format gives the same verdicts and axes: 0.01 degrees, or 0.2 where the format is single precision."""

from __future__ import annotations

from pathlib import Path

import pytest

from structviz.analysis import Analysis, Settings, run
from structviz.io import FORMATS, read_model
from structviz.io.format import FLOAT64
from structviz.orientation.vectors import axial_angle_deg
from structviz.report.converted import LOSSES, convert_to_folder
from structviz.synthetic import random_model

SETTINGS = Settings(replicates=100)


@pytest.fixture(scope="module")
def known():
    return random_model("normal", faults=14, conjugate=11, planted=2, triangles=80, random_state=8).model


@pytest.fixture(scope="module")
def plain(known) -> Analysis:
    return run(known, SETTINGS)


@pytest.mark.parametrize("entry", [entry for entry in FORMATS if entry.write], ids=lambda entry: entry.key)
def test_the_same_verdicts_and_axes(entry, known, plain: Analysis, tmp_path: Path) -> None:
    done = convert_to_folder(known, str(tmp_path / "new"), entry)
    single = FLOAT64 in entry.cannot_store
    assert (LOSSES[FLOAT64] in done.losses) == single
    other = run(read_model(tmp_path / "new"), SETTINGS)
    assert [(r.fault.name, r.verdict.word) for r in other.faults] == [(r.fault.name, r.verdict.word) for r in plain.faults]
    assert axial_angle_deg(other.regimes[0].axes, plain.regimes[0].axes).max() <= (0.2 if single else 0.01)
