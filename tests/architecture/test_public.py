"""The public names, and what importing them costs."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

import structviz

HEAVY = ("pyvista", "vtk", "vtkmodules", "matplotlib", "trimesh", "meshio", "h5py", "pandas", "rich")


def loaded_by(statement: str, project: Path) -> set[str]:
    """Return which heavy libraries a fresh interpreter holds after a statement."""
    code = f"import sys\n{statement}\nprint(*[name for name in {HEAVY!r} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], check=False, capture_output=True, text=True, cwd=project, timeout=120)
    assert done.returncode == 0, done.stderr
    return set(done.stdout.split())


def test_import_loads_no_heavy_library(project: Path) -> None:
    assert not loaded_by("import structviz", project)


def test_checks_and_analysis_load_no_heavy_library(project: Path) -> None:
    assert not loaded_by("import structviz.checks, structviz.analysis", project)


def test_every_public_name_is_there_and_explained() -> None:
    assert len(set(structviz.__all__)) == len(structviz.__all__)
    for name in structviz.__all__:
        assert not name.startswith("_") or name == "__version__"
        assert hasattr(structviz, name), name
        if callable(value := getattr(structviz, name)):
            assert value.__doc__, name


def test_every_name_that_loads_late_is_public() -> None:
    assert set(structviz._HOME) <= set(structviz.__all__)
    assert set(structviz.__all__) <= set(dir(structviz))
    with pytest.raises(AttributeError, match="no attribute 'nonsense'"):
        _ = structviz.nonsense


def test_help_starts_without_numbers_or_pictures(project: Path) -> None:
    command = [sys.executable, "-X", "importtime", "-m", "structviz", "--help"]
    shown = subprocess.run(command, check=False, capture_output=True, text=True, cwd=project, timeout=120)
    loaded = {line.split("|")[-1].strip() for line in shown.stderr.splitlines()}
    assert "usage: structviz" in shown.stdout
    assert not loaded & {*HEAVY, "numpy", "scipy"}
