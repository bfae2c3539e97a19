"""Every example asks a question in its first line, answers it within seconds, and writes nothing."""

from __future__ import annotations

import ast
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

PROJECT = Path(__file__).resolve().parents[1]
EXAMPLES = sorted((PROJECT / "examples").glob("[0-9][0-9]_*.py"))
EVERY = pytest.mark.parametrize("example", EXAMPLES, ids=[path.stem for path in EXAMPLES])


def output_of(example: Path, folder: Path) -> str:
    """Return what an example prints when it is run from a folder of its own, warnings as errors."""
    paths = os.pathsep.join(filter(None, [str(PROJECT), os.environ.get("PYTHONPATH")]))
    environment = {**os.environ, "PYTHONPATH": paths, "PYTHONDONTWRITEBYTECODE": "1"}
    command = [sys.executable, "-W", "error", str(example)]
    done = subprocess.run(command, check=False, cwd=folder, env=environment, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr
    assert not done.stderr
    return done.stdout


def printed(name: str, folder: Path) -> str:
    (example,) = [path for path in EXAMPLES if path.name.startswith(name)]
    return output_of(example, folder)


def test_examples_are_numbered_without_gaps() -> None:
    assert [int(path.name[:2]) for path in EXAMPLES] == list(range(1, len(EXAMPLES) + 1))
    assert len(EXAMPLES) >= 3


@EVERY
def test_first_line_asks_the_question(example: Path) -> None:
    text = example.read_text(encoding="utf-8")
    question = ast.get_docstring(ast.parse(text))
    assert question
    assert question.endswith("?")
    assert text.splitlines()[0] == f'"""{question}"""'


def test_the_demo_example_finds_what_was_planted(tmp_path: Path) -> None:
    text = printed("01", tmp_path)
    assert set(re.findall(r"^(\w+) .* conflicting$", text, re.M)) == {"Heskvik", "Ulvarn", "Vargarn", "Westrakk", "Yrsel"}
    assert re.search(r"^all evidence together +normal, SHmax 01\d", text, re.M)
    assert "older phase" in text
    assert not list(tmp_path.iterdir())


def test_the_curved_fault_example_slips_as_the_shear_points(tmp_path: Path) -> None:
    rows = [line.split() for line in printed("02", tmp_path).splitlines()[1:7]]
    assert [row[0] for row in rows] == list("123456")
    assert all("dextral" in row[3] for row in rows), "sigma1 towards 020 drives a fault that strikes 140 dextrally"
    tendencies = [float(row[-1]) for row in rows]
    assert tendencies == sorted(tendencies)
    assert not list(tmp_path.iterdir())


def test_the_example_from_arrays_names_the_wrong_label(tmp_path: Path) -> None:
    lines = printed("03", tmp_path).splitlines()
    answers = {line.split("  ")[1]: line for line in lines if "conflicts:" in line}
    assert all(" normal " in line for line in answers.values())
    assert {name for name, line in answers.items() if "conflicts: East 3" not in line} == {"East 3"}
    assert answers["East 3"].endswith("conflicts: none")
    assert not list(tmp_path.iterdir())


def test_the_turning_example_follows_the_turn_and_ends_with_the_data(tmp_path: Path) -> None:
    rows = [line.split() for line in printed("04", tmp_path).splitlines()[-6:]]
    azimuths = [float(row[1]) for row in rows[:5]]
    assert azimuths == sorted(azimuths)
    assert 40.0 < azimuths[-1] - azimuths[0] < 75.0
    assert "blank" in rows[5]
