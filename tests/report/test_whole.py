"""A folder is written whole or not at all, also where the process is killed, and what a killed run left is swept."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from structviz.errors import OutputError
from structviz.report import whole
from structviz.report.whole import complete_or_nothing

KILLS = int(os.environ.get("STRUCTVIZ_KILLS", "12"))
FILES = 30
# Writes result after result, each of many files that all say the same number, until it is killed.
WRITER = f"""
import sys
from pathlib import Path
from structviz.report.whole import complete_or_nothing
target, number = Path(sys.argv[1]), int(sys.argv[2])
while True:
    number += 1
    with complete_or_nothing(target) as new:
        (new / "faults").mkdir()
        for k in range({FILES}):
            (new / "faults" / f"{{k}}.txt").write_text(str(number))
    print(number, flush=True)
"""


def content(target: Path) -> set[str]:
    """Return the different contents of the files of a result; every file must be there."""
    files = sorted((target / "faults").iterdir())
    assert len(files) == FILES
    return {file.read_text() for file in files}


@pytest.mark.skipif(sys.platform == "win32", reason="needs SIGKILL")
def test_a_run_killed_at_any_moment_leaves_a_whole_result(tmp_path: Path, project: Path) -> None:
    target, number, chance = tmp_path / "out", 0, random.Random(3)
    for _ in range(KILLS):
        command = [sys.executable, "-c", WRITER, str(target), str(number)]
        run = subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env={**os.environ, "PYTHONPATH": str(project)})
        assert run.stdout is not None
        first = int(run.stdout.readline())
        time.sleep(chance.uniform(0, 0.05))
        run.send_signal(signal.SIGKILL)
        told = [first, *map(int, run.stdout.read().split())]
        run.wait()
        run.stdout.close()
        (held,) = content(target)
        assert int(held) in (told[-1], told[-1] + 1)  # the last one told, or the one that was put in place just before the end
        number = int(held)
    with complete_or_nothing(target) as new:
        (new / "last").write_text("x")
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]  # nothing is left of those that were killed


@pytest.mark.skipif(sys.platform == "win32", reason="needs locks")
def test_a_folder_another_run_works_on_is_not_swept(tmp_path: Path) -> None:
    with complete_or_nothing(tmp_path / "out") as one:
        (one / "a").write_text("one")
        with complete_or_nothing(tmp_path / "out") as other:
            assert one.is_dir()
            (other / "a").write_text("other")
    assert (tmp_path / "out" / "a").read_text() == "one"  # the last to finish stays, and it is whole


def test_only_folders_of_this_target_are_swept(tmp_path: Path) -> None:
    left = [f".out.0123abcd{end}" for end in (".partial", ".old")]
    kept = [".out.0123abcd.txt", ".other.0123abcd.partial", ".out.notes.partial", "out.0123abcd.partial", ".o[a-z]t.0123abcd.partial"]
    for name in [*left, *kept]:
        (tmp_path / name).mkdir()
    (tmp_path / ".out.76543210.partial").symlink_to(tmp_path / ".out.0123abcd.txt")
    with complete_or_nothing(tmp_path / "out"):
        pass
    assert sorted(entry.name for entry in tmp_path.iterdir()) == sorted(["out", ".out.76543210.partial", *kept])


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="the one step is asked for here as Linux has it")
def test_two_folders_trade_places_in_one_step(tmp_path: Path) -> None:
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        (tmp_path / name / name).write_text(name)
    assert whole._exchanged(tmp_path / "a", tmp_path / "b")
    assert (tmp_path / "a" / "b").read_text() == "b"
    assert (tmp_path / "b" / "a").read_text() == "a"
    assert not whole._exchanged(tmp_path / "a", tmp_path / "not there")


def test_without_the_one_step_the_result_is_replaced_all_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(whole, "_exchanged", lambda one, other: False)
    for text in ("first", "second"):
        with complete_or_nothing(tmp_path / "out") as new:
            (new / "a").write_text(text)
        assert (tmp_path / "out" / "a").read_text() == text
        assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_an_error_in_the_middle_leaves_no_folder(tmp_path: Path) -> None:
    def write() -> None:
        with complete_or_nothing(tmp_path / "deep" / "out") as new:
            (new / "a").write_text("half")
            raise OSError(28, "No space left on device")

    with pytest.raises(OutputError, match="nothing was changed"):
        write()
    assert list(tmp_path.iterdir()) == []
