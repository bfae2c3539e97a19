"""Small models on disk, and the command line as users meet it: another process."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from structviz.io import write_surface
from structviz.synthetic import random_model

Run = Callable[..., subprocess.CompletedProcess]


@pytest.fixture(scope="session")
def structviz(project: Path) -> Run:
    """Return a function that runs `structviz ARGUMENTS` and gives back what it printed and its exit code."""

    def run(*arguments: object, cwd: Path | None = None, **more: str) -> subprocess.CompletedProcess:
        unwanted = ("COLUMNS", "FORCE_COLOR", "NO_COLOR")
        env = {key: value for key, value in os.environ.items() if key not in unwanted} | {"PYTHONPATH": str(project), **more}
        command = [sys.executable, "-m", "structviz", *map(str, arguments)]
        return subprocess.run(command, capture_output=True, text=True, encoding="utf-8", cwd=cwd, env=env, timeout=120, check=False)

    return run


def written_model(folder: Path, planted: int) -> Path:
    """Write a normal-faulting model with so many wrong labels as faults.csv and one mesh a fault; return its folder."""
    known = random_model("normal", faults=14, conjugate=12, planted=planted, triangles=60, random_state=4)
    folder.mkdir()
    rows = ["name,surface,sense,down_side"]
    for fault in known.model.faults:
        write_surface(folder / f"{fault.name}.vtp", fault.surface)
        rows.append(f"{fault.name},{fault.name}.vtp,{fault.declared.text if fault.declared else ''},{fault.down_side}")
    (folder / "faults.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    return folder


@pytest.fixture(scope="session")
def sound(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return written_model(tmp_path_factory.mktemp("models") / "sound", 0)


@pytest.fixture(scope="session")
def wrong(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return written_model(tmp_path_factory.mktemp("models") / "wrong", 2)
