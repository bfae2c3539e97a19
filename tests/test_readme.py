"""The README says what the code does: commands, settings, formats, columns, exit codes, and its Python block runs."""

from __future__ import annotations

import os
import re
import subprocess
import sys
import tempfile
import tomllib
from dataclasses import fields
from pathlib import Path

import pytest

from structviz.analysis import CAUTIONS, Settings
from structviz.io.model_file import TOP_KEYS
from structviz.io.registry import FORMATS
from structviz.io.tables import FAULT_COLUMNS

PROJECT = Path(__file__).resolve().parents[1]
README = (PROJECT / "README.md").read_text(encoding="utf-8")


def table(heading: str) -> list[list[str]]:
    """Return the rows of the first table under a heading, without its head."""
    section = README.split(f"\n{heading}\n", 1)[1]
    lines = re.search(r"(?:^\|.*\n)+", section, re.M)
    assert lines, heading
    return [[cell.strip().strip("`") for cell in line.strip().strip("|").split("|")] for line in lines.group().splitlines()[2:]]


def block(marker: str) -> str:
    """Return the fenced block after a marker, as the project's own check reads it."""
    found = re.search(rf"{re.escape(marker)}\s*```(?:bash|sh|python|toml)\n(.*?)```", README, re.S)
    assert found, marker
    return found.group(1)


def test_settings_table_is_that_of_the_code() -> None:
    def row(item: object) -> list[str]:
        data = item.metadata  # type: ignore[attr-defined]
        return [item.name, f"{item.default:g}", data["unit"], f"{data['low']:,.10g} to {data['high']:,.10g}", data["help"]]  # type: ignore[attr-defined]

    assert table("## Settings") == [row(item) for item in fields(Settings)]


def test_every_format_stands_in_the_table_and_no_other() -> None:
    assert sorted((row[0], row[1]) for row in table("### Mesh formats")) == sorted((f.title, " ".join(f.suffixes)) for f in FORMATS)


def test_every_column_of_the_faults_table_is_explained() -> None:
    assert [row[0] for row in table("### The faults table (CSV)")] == list(FAULT_COLUMNS)


def test_the_model_file_shown_is_one() -> None:
    shown = tomllib.loads(block("### The model file\n"))
    assert set(shown) == set(TOP_KEYS)
    assert set(shown["fault"][0]) <= set(FAULT_COLUMNS)


def test_exit_codes_are_three() -> None:
    assert [row[0] for row in table("## Exit codes")] == ["0", "1", "2"]


@pytest.mark.parametrize("number", [1, 2])
def test_each_command_is_one_line_and_makes_its_own_environment(number: int) -> None:
    lines = block(f"<!-- command {number} -->").splitlines()
    assert len(lines) == 1
    assert lines[0].startswith("python3 -m venv .venv && .venv/bin/pip install ")


def test_the_job_stands_at_the_top_before_any_command() -> None:
    title, paragraph = README.split("\n\n")[:2]
    assert title == "# structviz"
    assert 60 < len(paragraph.split()) < 130


def test_every_caution_of_the_output_stands_in_the_readme() -> None:
    section = README.split("## Limits and cautions")[1]
    assert not [caution for caution in CAUTIONS if f"- {caution}\n" not in section]


def test_links_and_pictures_are_there() -> None:
    named = re.findall(r"\]\(([^)#:]+)\)", README) + re.findall(r"`((?:meshes|examples|structviz)/[\w./]*\w)`", README)
    assert named
    assert not [name for name in named if not (PROJECT / name).exists()]
    scripts = {row[0] for row in table("## From Python")}
    assert scripts == {path.name for path in (PROJECT / "examples").glob("[0-9]*.py")}


def test_pictures_are_small() -> None:
    pictures = [PROJECT / name for name in re.findall(r"!\[[^]]*\]\(([^)]+)\)", README)]
    assert pictures
    assert all(path.stat().st_size < 300_000 for path in pictures)


def test_the_python_block_runs(tmp_path: Path) -> None:
    code = block("## From Python\n").replace("meshes/model.toml", (PROJECT / "meshes/model.toml").as_posix())
    code = code.replace('write_outputs(analysis, "out")', 'write_outputs(analysis, "out", pictures=False)')
    paths = os.pathsep.join(filter(None, [str(PROJECT), os.environ.get("PYTHONPATH")]))
    command = [sys.executable, "-c", code]
    done = subprocess.run(
        command, check=False, cwd=tmp_path, env={**os.environ, "PYTHONPATH": paths}, capture_output=True, text=True, timeout=120
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith("normal ")
    assert (tmp_path / "out" / "results.json").is_file()


TOUR = re.compile(r"(```console\n\$ structviz check meshes/model.toml --out out\n)(.*?)(```)", re.S)


def said_of_the_demo(*options: str) -> str:
    """Return the summary of the demo model as the command prints it on 100 columns, without its last lines on what was written."""
    command = [sys.executable, "-m", "structviz", "check", "meshes/model.toml", *options]
    paths = os.pathsep.join(filter(None, [str(PROJECT), os.environ.get("PYTHONPATH")]))
    environment = {**os.environ, "COLUMNS": "100", "PYTHONIOENCODING": "utf-8", "PYTHONPATH": paths}
    done = subprocess.run(command, check=False, cwd=PROJECT, env=environment, capture_output=True, timeout=300)
    assert done.returncode == 1, done.stderr
    return re.split(r"\n(?:Nothing was written|Written to)", done.stdout.decode("utf-8"))[0]


def test_the_tour_shows_what_the_tool_says() -> None:
    """Numbers may move by a unit with the versions of the libraries; every word may not."""

    def words(text: str) -> list[str]:
        return re.sub(r"[\d\s]+", " ", text).split()

    shown = TOUR.search(README)
    assert shown
    assert words(shown.group(2)) == words(said_of_the_demo()), "run `python tests/test_readme.py` to tell the tour anew"


def retell() -> None:
    """Write the tour of the README and its two pictures anew from what the tool says and draws now."""
    from PIL import Image

    with tempfile.TemporaryDirectory() as folder:
        said = said_of_the_demo("--out", f"{folder}/out")
        for name in ("scene", "net"):
            picture = Image.open(f"{folder}/out/{name}.png").convert("RGB")
            picture = picture.resize((1200, round(picture.height * 1200 / picture.width)), Image.Resampling.LANCZOS)
            few = picture.quantize(128, method=Image.Quantize.MEDIANCUT, dither=Image.Dither.NONE)
            few.save(PROJECT / "examples" / f"demo_{name}.png", optimize=True)
    text = TOUR.sub(lambda found: f"{found.group(1)}{said.rstrip()}\n{found.group(3)}", README)
    (PROJECT / "README.md").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    retell()
