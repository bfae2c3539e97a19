"""The same model gives the same bytes: again, on one thread and on two, and with its faults in another order."""

from __future__ import annotations

import json
import os
from pathlib import Path
from typing import Any

import pytest

from structviz import examination
from structviz.cli.main import entry

from .conftest import Run

QUICK = ("--replicates", "100", "--no-pictures")


def tree(folder: Path) -> dict[str, bytes]:
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


@pytest.fixture(scope="module")
def once(wrong: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    out = tmp_path_factory.mktemp("once") / "out"
    assert entry(["check", str(wrong), "--out", str(out), *QUICK]) == 1
    return tree(out)


def test_again_in_another_process_and_with_two_threads_in_products(
    structviz: Run, wrong: Path, once: dict[str, bytes], tmp_path: Path
) -> None:
    for threads in ("1", "2"):
        done = structviz("check", wrong, "--out", tmp_path / threads, *QUICK, OPENBLAS_NUM_THREADS=threads, PYTHONHASHSEED=threads)
        assert done.returncode == 1, done.stderr
        assert tree(tmp_path / threads) == once


@pytest.mark.parametrize("cores", [1, 2, 7])
def test_on_any_number_of_cores(cores: int, wrong: Path, once: dict[str, bytes], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(examination.os, "cpu_count", lambda: cores)
    assert examination.os is os
    assert entry(["check", str(wrong), "--out", str(tmp_path / "out"), *QUICK]) == 1
    assert tree(tmp_path / "out") == once


def test_with_the_faults_in_another_order(wrong: Path, once: dict[str, bytes], tmp_path: Path) -> None:
    head, *rows = (wrong / "faults.csv").read_text(encoding="utf-8").splitlines()
    (tmp_path / "model").mkdir()
    for path in wrong.glob("*.vtp"):
        (tmp_path / "model" / path.name).write_bytes(path.read_bytes())
    (tmp_path / "model" / "faults.csv").write_text("\n".join([head, *rows[5:], *rows[:5][::-1]]) + "\n", encoding="utf-8")
    assert entry(["check", str(tmp_path / "model"), "--out", str(tmp_path / "out"), *QUICK]) == 1
    before, after = json.loads(once["results.json"]), json.loads((tmp_path / "out" / "results.json").read_bytes())
    assert by_name(after["faults"]) == by_name(before["faults"])
    assert [fault["name"] for fault in after["faults"]] != [fault["name"] for fault in before["faults"]]
    assert after["regimes"] == before["regimes"]
    assert {name: data for name, data in tree(tmp_path / "out").items() if name.startswith("faults/")} == {
        name: data for name, data in once.items() if name.startswith("faults/")
    }


def by_name(faults: list[dict[str, Any]]) -> dict[str, dict[str, Any]]:
    return {fault["name"]: fault for fault in faults}
