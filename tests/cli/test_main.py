"""Help, usage and outcomes: exit codes and words, from another process where that matters."""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path

import pytest

from structviz import __version__
from structviz.checks import CHECKS
from structviz.cli import check, main
from structviz.cli.main import entry
from structviz.errors import InputError
from structviz.io import FORMATS

from .conftest import Run


def test_help_names_every_command_and_loads_nothing_heavy(structviz: Run, project: Path) -> None:
    began = time.perf_counter()
    done = structviz("--help")
    assert done.returncode == 0
    assert all(name in done.stdout for name in main.COMMANDS)
    assert time.perf_counter() - began < 3.0, "the promise is 0.3 s; this only catches a heavy import on a slow machine"
    code = (
        "import sys\nfrom structviz.cli.main import entry\ntry: entry(['--help'])\nexcept SystemExit: pass\n"
        "print(*[m for m in ('numpy', 'scipy', 'rich', 'pyvista', 'matplotlib') if m in sys.modules], file=sys.stderr)"
    )
    loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=project, timeout=60, check=True)
    assert loaded.stderr.strip() == ""


def test_no_command_shows_the_help(structviz: Run) -> None:
    assert structviz().stdout == structviz("--help").stdout


def test_version(structviz: Run) -> None:
    assert structviz("--version").stdout == f"structviz {__version__}\n"


@pytest.mark.parametrize("name", list(main.COMMANDS))
def test_each_command_explains_itself(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        entry([name, "--help"])
    assert left.value.code == 0
    assert f"usage: structviz {name}" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("arguments", "said", "next_step"),
    [
        (["chekc"], "found the command 'chekc'; wanted one of check, checks, ", "did you mean 'structviz check'?"),
        (["pyproject"], "found the command 'pyproject'", "structviz --help lists the commands"),
        (["check"], "structviz check: PATH is missing", "structviz check --help lists what it takes"),
        (["check", "a", "--ouut", "b"], "found --ouut b, which structviz check does not know", "did you mean --out?"),
        (["--colour"], "found --colour, which structviz does not know", "structviz --help lists"),
        (["check", "a", "--out"], "argument --out: expected one argument", "structviz check --help lists"),
        (["checks", "hole"], "found the check 'hole'; wanted the key of a check", "did you mean 'holes'?"),
        (["check", "no such place"], "no such place: found no such file", "check the spelling"),
        (["check", "a", "--stations", "many"], "--stations: found 'many'; wanted a whole number", "structviz check --help lists"),
        (["check", "a", "--stations", "2"], "stations: found 2; wanted 4 to 1000", "stations for local orientation"),
        (["check", "a", "--least-shear", "nan"], "least_shear: found nan; wanted 0 to 0.9", "shear below which"),
        (["check", "a", "--limit", "holes"], "--limit: found 'holes'; wanted KEY=VALUE", "structviz checks lists the keys"),
        (["check", "a", "--limit", "holes=few"], "--limit holes: found 'few'; wanted a number", "structviz check --help"),
        (["check", "a", "--limit", "hools=3"], "found the key 'hools'; wanted one of these checks", "correct the key"),
        (
            ["check", "a", "--limit", "holes=-3"],
            "limit of holes: found -3 holes; wanted 0",
            "give limit of holes in holes within that range",
        ),
    ],
)
def test_wrong_usage_is_exit_2_with_the_next_step(
    arguments: list[str], said: str, next_step: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert entry(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("structviz: ") or err.startswith("structviz check: ")
    assert said in err
    assert f"\n  next: {next_step}" in err


def test_a_path_in_the_place_of_a_command_is_understood(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert entry([str(wrong)]) == 2
    assert f"next: to check a model: structviz check {wrong}" in capsys.readouterr().err


def test_a_fault_of_ours_is_called_that(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def broken(*_: object, **__: object) -> None:
        raise ZeroDivisionError("division by zero")

    monkeypatch.setattr(check, "read_model", broken)
    assert entry(["check", "a"]) == 3
    err = capsys.readouterr().err
    assert "this is a fault of structviz, not of your input: ZeroDivisionError: division by zero" in err
    assert "Traceback" not in err
    with pytest.raises(ZeroDivisionError):
        entry(["check", "a", "--debug"])


def test_an_interrupt_is_one_line(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(check, "read_model", interrupted)
    assert entry(["check", "a"]) == 130
    assert capsys.readouterr().err == "structviz: interrupted; nothing was left half written\n"


def test_messages_send_no_escapes_to_the_terminal(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def hostile(*_: object, **__: object) -> None:
        raise InputError("a\x1b[31m.vtp", "x\x07", "y", hint="z\u202e")

    monkeypatch.setattr(check, "read_model", hostile)
    assert entry(["check", "a"]) == 2
    err = capsys.readouterr().err
    assert not [letter for letter in err if not letter.isprintable() and letter != "\n"]
    assert "a\ufffd[31m.vtp" in err


def test_a_reader_that_leaves_early_is_no_error(wrong: Path, project: Path) -> None:
    code = f"import sys; sys.argv[1:] = ['check', {str(wrong)!r}]; from structviz.cli.main import entry; sys.exit(entry())"
    process = subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, cwd=project)
    assert process.stdout is not None
    assert process.stderr is not None
    process.stdout.close()
    said = process.stderr.read()
    process.stderr.close()
    assert process.wait(60) in (0, 1)
    assert said == b""


def test_formats_lists_every_format(capsys: pytest.CaptureFixture[str]) -> None:
    assert entry(["formats"]) == 0
    out = capsys.readouterr().out
    assert all(entry.title in out and entry.suffixes[0] in out for entry in FORMATS)


def test_checks_lists_every_check_or_one_with_its_source(capsys: pytest.CaptureFixture[str]) -> None:
    assert entry(["checks"]) == 0
    heads = [line.split("  ")[0] for line in capsys.readouterr().out.splitlines() if not line.startswith(" ")]
    assert heads == sorted(CHECKS)
    assert entry(["checks", "gentle-normal"]) == 0
    out = capsys.readouterr().out
    assert out.startswith("gentle-normal  (limit 30 deg)\n")
    assert "source: Anderson" in out
