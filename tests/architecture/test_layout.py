"""What lies at the top of the project, and how large its files grow."""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import pytest

TOP = {"pyproject.toml", "README.md", "DEVELOPERS.md", "LICENSE", "structviz", "tests", "meshes", "examples"}
LONGEST = 420  # lines; beyond, a file has two subjects


def tracked(project: Path) -> list[str]:
    """Return the files git knows, or skip where there is no git or no repository (an unpacked archive)."""
    if not shutil.which("git") or not (project / ".git").exists():
        pytest.skip("not a git working copy: what belongs to the project cannot be told from what lies about")
    listed = subprocess.run(["git", "-C", str(project), "ls-files", "-z"], capture_output=True, check=True)
    return [name for name in listed.stdout.decode().split("\0") if name]


def test_top_level_holds_only_what_was_agreed(project: Path) -> None:
    names = {name.split("/")[0] for name in tracked(project)}
    assert {name for name in names if not name.startswith(".")} <= TOP


def test_nothing_generated_is_kept(project: Path) -> None:
    wrong = [name for name in tracked(project) if name.endswith((".pyc", ".orig", ".rej", ".log", ".tmp")) or "__pycache__" in name]
    assert not wrong


def test_no_large_file_is_kept(project: Path) -> None:
    sizes = {name: (project / name).stat().st_size for name in tracked(project) if (project / name).is_file()}
    assert not {name: size for name, size in sizes.items() if size > 3_000_000}


def test_no_file_has_outgrown_its_subject(project: Path) -> None:
    lengths = {file: len(file.read_text(encoding="utf-8").splitlines()) for file in (project / "structviz").rglob("*.py")}
    assert not {str(file.relative_to(project)): length for file, length in lengths.items() if length > LONGEST}


def test_text_is_free_of_machine_paths(project: Path) -> None:
    marks = [f"/{place}/" for place in ("work", "root", "home", "Users")]
    files = [project / name for name in tracked(project) if name.endswith((".py", ".md", ".toml", ".json", ".csv"))]
    wrong = [
        f"{file.relative_to(project)}: {mark}" for file in files for mark in marks if file.is_file() and mark in file.read_text("utf-8")
    ]
    assert not wrong
