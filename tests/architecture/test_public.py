"""The public names, and what importing them costs."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

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
