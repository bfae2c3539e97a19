"""`structviz check` from end to end: exit codes, what goes to which stream, settings, hostile input."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
from dataclasses import fields
from pathlib import Path

import jsonschema
import pytest

from structviz.analysis import Settings
from structviz.cli.choices import option
from structviz.cli.main import entry
from structviz.report.results_json import schema

from .conftest import Run

QUICK = ("--replicates", "60")


def test_nothing_conflicts_is_exit_0(structviz: Run, sound: Path) -> None:
    done = structviz("check", sound, *QUICK)
    assert done.returncode == 0, done.stderr
    assert "NORMAL stress" in done.stdout
    assert "judged faults conflicts with the others" in done.stdout
    assert done.stderr == ""
    assert "\x1b" not in done.stdout


def test_conflicts_are_exit_1_and_named(structviz: Run, wrong: Path) -> None:
    done = structviz("check", wrong, *QUICK)
    assert done.returncode == 1, done.stderr
    assert "2 of 14 faults conflict with the others" in done.stdout
    assert max(map(len, done.stdout.splitlines())) <= 80


def test_outputs_are_written_where_asked(structviz: Run, wrong: Path, tmp_path: Path) -> None:
    done = structviz("check", wrong, "--out", tmp_path / "new" / "out", "--no-pictures", *QUICK)
    assert done.returncode == 1, done.stderr
    held = json.loads((tmp_path / "new" / "out" / "results.json").read_text(encoding="utf-8"))
    jsonschema.validate(held, schema())
    assert held["summary"]["conflicting"] == 2
    assert {entry["path"] for entry in held["model"]["inputs"]} >= {"faults.csv", "F01.vtp"}
    assert held["settings"]["replicates"] == 60
    assert all((tmp_path / "new" / "out" / name).is_file() for name in held["outputs"])


def test_json_goes_to_standard_output_alone(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert entry(["check", str(wrong), "--json", *QUICK]) == 1
    out, err = capsys.readouterr()
    jsonschema.validate(json.loads(out), schema())
    assert err == ""


def test_json_is_that_of_the_folder_and_utf8_everywhere(structviz: Run, wrong: Path, tmp_path: Path) -> None:
    shutil.copytree(wrong, tmp_path / "m")
    table = tmp_path / "m" / "faults.csv"
    table.write_text(table.read_text(encoding="utf-8").replace("F01,", "Føre 断层,", 1), encoding="utf-8")
    done = structviz("check", tmp_path / "m", "--json", "--out", tmp_path / "out", "--no-pictures", *QUICK, PYTHONIOENCODING="ascii")
    assert done.stdout == (tmp_path / "out" / "results.json").read_text(encoding="utf-8")
    assert json.loads(done.stdout)["faults"][0]["name"] == "Føre 断层"


def test_the_same_call_prints_the_same_bytes(structviz: Run, wrong: Path) -> None:
    first, second = (structviz("check", wrong, "--json", *QUICK, PYTHONHASHSEED=seed) for seed in ("1", "2"))
    assert first.stdout == second.stdout != ""


def test_every_setting_is_an_option_and_reaches_the_results(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given = {"friction_angle_deg": 25.0, "pair_reach": 1.5, "stations": 9, "station_radius": 0.2, "replicates": 70,
             "random_state": 3, "conflict_probability": 0.95, "least_shear": 0.1}  # fmt: skip
    extra = {item.name: item.default for item in fields(Settings) if item.name not in given}
    words = [word for name, value in {**given, **extra}.items() for word in (option(name), str(value))]
    entry(["check", str(wrong), "--json", *words])
    assert json.loads(capsys.readouterr().out)["settings"] == {**given, **extra}


def test_a_limit_changes_what_is_found(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    def found(*limits: str) -> set[str]:
        entry(["check", str(wrong), "--json", *QUICK, *limits])
        return {finding["check"] for finding in json.loads(capsys.readouterr().out)["findings"]}

    assert "gentle-normal" not in found("--limit", "gentle-normal=0")
    assert "gentle-normal" in found("--limit", "gentle-normal=90", "--limit", "curved=80")


def test_a_wrong_target_is_told_before_the_work(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "mine.txt").touch()
    assert entry(["check", str(tmp_path / "not there"), "--out", str(tmp_path)]) == 2
    assert "found other files (mine.txt)" in capsys.readouterr().err


def test_an_unknown_sense_is_exit_2_with_file_and_offer(wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    shutil.copytree(wrong, tmp_path / "m")
    table = tmp_path / "m" / "faults.csv"
    table.write_text(table.read_text(encoding="utf-8").replace("normal", "normall", 1), encoding="utf-8")
    assert entry(["check", str(table)]) == 2
    err = capsys.readouterr().err
    assert "faults.csv" in err
    assert "did you mean 'normal'?" in err


def test_files_outside_the_model_need_leave(wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    lines = (wrong / "faults.csv").read_text(encoding="utf-8").splitlines()
    moved = [lines[0], *(line.replace(",", f",{wrong.as_posix()}/", 1) for line in lines[1:])]
    (tmp_path / "faults.csv").write_text("\n".join(moved), encoding="utf-8")
    assert entry(["check", str(tmp_path / "faults.csv"), *QUICK]) == 2
    assert "outside" in capsys.readouterr().err
    assert entry(["check", str(tmp_path / "faults.csv"), "--allow-outside", *QUICK]) == 1


def test_hostile_names_do_no_harm(structviz: Run, wrong: Path, tmp_path: Path) -> None:
    names = ["<script>", "../../x", "[red]y[/red]", "e\x1b[31m", "=cmd", "n" * 500]
    lines = (wrong / "faults.csv").read_text(encoding="utf-8").splitlines()
    renamed = [f"{name},{line.split(',', 1)[1]}" for name, line in zip(names, lines[1:])]
    shutil.copytree(wrong, tmp_path / "m")
    (tmp_path / "m" / "faults.csv").write_text("\n".join([lines[0], *renamed, *lines[1 + len(names) :]]), encoding="utf-8")
    done = structviz("check", tmp_path / "m", "--out", tmp_path / "out", "--no-pictures", *QUICK, FORCE_COLOR="")
    assert done.returncode in (0, 1), done.stderr
    assert "\x1b" not in done.stdout
    assert {path.name for path in tmp_path.iterdir()} == {"m", "out"}
    assert "\n'=cmd," in (tmp_path / "out" / "faults.csv").read_text(encoding="utf-8")


def test_a_plain_old_terminal_shows_marks_for_missing_letters(structviz: Run, wrong: Path) -> None:
    env = {**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONPATH": str(Path(__file__).parents[2])}
    done = subprocess.run(
        [sys.executable, "-m", "structviz", "check", str(wrong), *QUICK], capture_output=True, env=env, timeout=60, check=False
    )
    assert done.returncode == 1
    assert b"SHmax" in done.stdout
    assert done.stderr == b""


SLOW = """
import sys, time
from structviz.cli.main import entry
from structviz.report import write
def stand_in(path, text):
    print("writing", flush=True)
    time.sleep(60)
write._write_text = stand_in
sys.exit(entry(sys.argv[1:]))
"""


@pytest.mark.skipif(os.name == "nt", reason="signals of this kind do not exist there")
@pytest.mark.parametrize("kind", ["SIGINT", "SIGTERM", "SIGKILL"])
def test_a_run_ended_while_writing_leaves_the_earlier_result(wrong: Path, tmp_path: Path, project: Path, kind: str) -> None:
    arguments = ["check", str(wrong), "--out", str(tmp_path / "out"), "--no-pictures", *QUICK]
    entry(arguments)
    before = {path: path.read_bytes() for path in (tmp_path / "out").rglob("*") if path.is_file()}
    command = [sys.executable, "-c", SLOW, *arguments]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=project) as process:
        assert process.stdout is not None
        assert process.stdout.readline() == "writing\n"
        process.send_signal(getattr(signal, kind))
        said = process.communicate(timeout=60)[1]
    assert {path: path.read_bytes() for path in (tmp_path / "out").rglob("*") if path.is_file()} == before
    if kind != "SIGKILL":  # nobody can tidy up after that one
        assert process.returncode == 130
        assert said == "structviz: interrupted; nothing was left half written\n"
        assert [path.name for path in tmp_path.iterdir()] == ["out"]
    entry(arguments)
    assert {path: path.read_bytes() for path in (tmp_path / "out").rglob("*") if path.is_file()} == before


def test_a_folder_of_meshes_is_compared_with_wells_and_earthquakes(wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "wells.csv").write_text("shmax_deg,uncertainty_deg\n20,10\n30,10\n", encoding="utf-8")
    (tmp_path / "quakes.csv").write_text("strike_deg,dip_deg,rake_deg\n0,95,0\n", encoding="utf-8")
    assert entry(["check", str(wrong), "--json", *QUICK, "--well-azimuths", str(tmp_path / "wells.csv")]) == 1
    assert "wells.csv" in [each["path"] for each in json.loads(capsys.readouterr().out)["model"]["inputs"]]
    assert entry(["check", str(wrong), "--mechanisms", str(tmp_path / "quakes.csv")]) == 2
    assert "quakes.csv, row 2: found dip_deg 95; wanted 0 to 90" in capsys.readouterr().err
