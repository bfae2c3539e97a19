"""Outputs are written whole or not at all."""

from __future__ import annotations

import errno
import json
import os
from collections.abc import Callable
from pathlib import Path

import pytest

from structviz.analysis import Analysis
from structviz.errors import OutputError
from structviz.io import read_model
from structviz.report import whole, write
from structviz.report.write import checked_target, write_outputs


def tree(folder: Path) -> dict[str, bytes]:
    """Return every file below a folder with its content."""
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


def failing_at(call: int, error: BaseException) -> Callable[..., None]:
    """Return a stand-in for the writing of text that fails at its nth call."""
    done = [0]

    def stand_in(path: Path, text: str) -> None:
        done[0] += 1
        if done[0] == call:
            raise error
        path.write_text(text, encoding="utf-8")

    return stand_in


def test_everything_named_is_there_and_nothing_else(analysis: Analysis, tmp_path: Path) -> None:
    written = write_outputs(analysis, tmp_path / "above" / "out", pictures=False)
    held = tree(tmp_path / "above" / "out")
    assert set(written.files) == set(held)
    results = json.loads(held["results.json"])
    assert set(results["outputs"]) == set(held)
    assert {fault["mesh"] for fault in results["faults"]} == {name for name in held if name.startswith("faults/")}
    assert [path.name for path in (tmp_path / "above").iterdir()] == ["out"]


def test_the_same_analysis_gives_the_same_bytes(analysis: Analysis, tmp_path: Path) -> None:
    write_outputs(analysis, tmp_path / "a", pictures=False)
    write_outputs(analysis, tmp_path / "b", pictures=False)
    assert tree(tmp_path / "a") == tree(tmp_path / "b")


def test_an_earlier_result_is_replaced_whole(analysis: Analysis, no_stress: Analysis, tmp_path: Path) -> None:
    write_outputs(analysis, tmp_path / "out", pictures=False)
    write_outputs(no_stress, tmp_path / "out", pictures=False)
    write_outputs(no_stress, tmp_path / "fresh", pictures=False)
    assert tree(tmp_path / "out") == tree(tmp_path / "fresh")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["fresh", "out"]


def test_an_empty_folder_may_be_used(no_stress: Analysis, tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / ".DS_Store").touch()
    write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert (tmp_path / "out" / "results.json").is_file()


@pytest.mark.parametrize("call", [1, 2, 3])
@pytest.mark.parametrize("error", [OSError(errno.ENOSPC, "No space left on device"), KeyboardInterrupt(), RuntimeError("a fault")])
def test_a_failure_in_the_middle_changes_nothing(
    no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, error: BaseException, call: int
) -> None:
    write_outputs(no_stress, tmp_path / "out", pictures=False)
    before = tree(tmp_path)
    monkeypatch.setattr(write, "_write_text", failing_at(call, error))
    with pytest.raises(OutputError if isinstance(error, OSError) else type(error)):
        write_outputs(no_stress, tmp_path / "out", pictures=False)
    monkeypatch.setattr(write, "_write_text", failing_at(call, error))
    with pytest.raises(OutputError if isinstance(error, OSError) else type(error)):
        write_outputs(no_stress, tmp_path / "deep" / "er" / "out", pictures=False)
    assert tree(tmp_path) == before
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_a_full_disk_is_told_with_the_name_the_user_gave(no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(self: Path, content: bytes) -> int:
        raise OSError(errno.ENOSPC, "No space left on device", str(self))

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(
        OutputError, match=r"out: cannot be written \(No space left on device\); nothing was changed\n  next: free some space"
    ):
        write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert not list(tmp_path.iterdir())


def test_a_failure_while_swapping_puts_the_old_result_back(no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_outputs(no_stress, tmp_path / "out", pictures=False)
    before, rename = tree(tmp_path), Path.rename

    def stopped(self: Path, target: Path) -> Path:
        if self.suffix == ".partial":
            raise KeyboardInterrupt
        return rename(self, target)

    monkeypatch.setattr(whole, "_exchanged", lambda one, other: False)
    monkeypatch.setattr(Path, "rename", stopped)
    with pytest.raises(KeyboardInterrupt):
        write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert tree(tmp_path) == before


def test_folders_that_hold_other_things_are_refused(no_stress: Analysis, tmp_path: Path) -> None:
    notes = tmp_path / "notes"
    notes.mkdir()
    (notes / "thesis.txt").write_text("years of work")
    with pytest.raises(OutputError, match=r"found other files \(thesis.txt\); wanted an empty folder"):
        write_outputs(no_stress, notes, pictures=False)
    (notes / "results.json").write_text('{"other": "program"}')
    with pytest.raises(OutputError, match=r"results\.json, thesis\.txt"):
        write_outputs(no_stress, notes, pictures=False)
    assert (notes / "thesis.txt").read_text() == "years of work"


def test_a_file_put_into_an_earlier_result_is_not_lost(no_stress: Analysis, tmp_path: Path) -> None:
    write_outputs(no_stress, tmp_path / "out", pictures=False)
    (tmp_path / "out" / "faults" / "my view.txt").write_text("kept")
    with pytest.raises(OutputError, match=r"found other files \(faults/my view.txt\)"):
        write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert (tmp_path / "out" / "faults" / "my view.txt").read_text() == "kept"


@pytest.mark.parametrize("content", ["", "{", "[]", '{"structviz": "1"}', '{"structviz": "1", "outputs": 3}', "[" * 100_000, "\x00"])
def test_a_results_file_that_is_not_ours_is_a_stranger(tmp_path: Path, content: str) -> None:
    (tmp_path / "results.json").write_text(content)
    with pytest.raises(OutputError, match=r"found other files \(results.json\)"):
        checked_target(tmp_path)


def test_paths_that_cannot_be_a_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "file").touch()
    with pytest.raises(OutputError, match="found a file; wanted a folder"):
        checked_target(tmp_path / "file")
    with pytest.raises(OutputError, match=r"cannot be written \(part of the path is a file\)"):
        checked_target(tmp_path / "file" / "out")
    with pytest.raises(OutputError, match="null"):
        checked_target(str(tmp_path / "a\0b"))
    with pytest.raises(OutputError, match="too long"):
        checked_target(tmp_path / ("n" * 300))
    (tmp_path / "loop").symlink_to(tmp_path / "loop")
    with pytest.raises(OutputError):
        checked_target(tmp_path / "loop")
    (tmp_path / "empty").mkdir()
    monkeypatch.chdir(tmp_path / "empty")
    with pytest.raises(OutputError, match=r"found the folder you are in; .*\n  next: name a folder in it"):
        checked_target(".")


def test_a_folder_without_permission_is_told_before_the_work(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(os, "access", lambda path, mode: Path(path) != tmp_path)
    with pytest.raises(OutputError, match=r"out: cannot be written \(Permission denied\).*\n  next: name a folder you may write to"):
        checked_target(tmp_path / "out")


def test_a_folder_that_cannot_be_replaced_is_told_so(no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def busy(self: Path, target: Path) -> Path:
        raise OSError(errno.EBUSY, "Device or resource busy")

    (tmp_path / "out").mkdir()
    monkeypatch.setattr(whole, "_exchanged", lambda one, other: False)
    monkeypatch.setattr(Path, "rename", busy)
    with pytest.raises(OutputError, match=r"Device or resource busy\); nothing was changed\n  next: .*name a folder in it"):
        write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_pictures_are_listed_or_their_absence_explained(no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def drawing(analysis: Analysis, folder: Path, progress: Callable[[str, int, int], None]) -> tuple[tuple[str, ...], tuple[str, ...]]:
        (folder / "net.png").write_bytes(b"png")
        return ("net.png",), ("no scene: no OpenGL",)

    monkeypatch.setattr(write, "render", drawing)
    written = write_outputs(no_stress, tmp_path / "out")
    assert written.skipped == ("no scene: no OpenGL",)
    assert "net.png" in written.files
    assert "net.png" in json.loads((tmp_path / "out" / "results.json").read_text(encoding="utf-8"))["outputs"]
    without = write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert not (tmp_path / "out" / "net.png").exists()
    assert without.skipped == ()


def test_a_link_to_a_folder_stays_a_link(no_stress: Analysis, tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    (tmp_path / "link").symlink_to(tmp_path / "real")
    write_outputs(no_stress, tmp_path / "link", pictures=False)
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "real" / "results.json").is_file()


def test_progress_counts_the_meshes(no_stress: Analysis, tmp_path: Path) -> None:
    told: list[tuple[str, int, int]] = []
    write_outputs(no_stress, tmp_path / "out", pictures=False, progress=lambda *step: told.append(step))
    assert told == [("writing meshes", 0, 2), ("writing meshes", 1, 2), ("writing the page", 0, 1)]


def test_a_page_that_fails_loses_no_numbers(no_stress: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def failing(*args: object, **choices: object) -> str:
        raise ValueError("no room for it")

    monkeypatch.setattr(write, "page_text", failing)
    written = write_outputs(no_stress, tmp_path / "out", pictures=False)
    assert "report.html" not in written.files
    assert written.skipped == ("report.html could not be made (ValueError: no room for it); please report it",)
    assert json.loads((tmp_path / "out" / "results.json").read_text("utf-8"))["outputs"] == list(written.files)


def test_the_page_is_left_out_where_not_wanted(no_stress: Analysis, tmp_path: Path) -> None:
    assert "report.html" in write_outputs(no_stress, tmp_path / "with", pictures=False).files
    assert "report.html" not in write_outputs(no_stress, tmp_path / "without", pictures=False, page=False).files


def test_the_collection_names_every_mesh(analysis: Analysis, tmp_path: Path) -> None:
    write_outputs(analysis, tmp_path / "out", pictures=False, page=False)
    model = read_model(tmp_path / "out" / "faults.vtm")
    assert sorted(fault.name.strip() for fault in model.faults) == sorted(
        "".join(" " if ord(c) < 32 or ord(c) == 127 else c for c in result.fault.name).strip() for result in analysis.faults
    )
