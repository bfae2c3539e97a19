"""Who may import whom. The source is read, not run, so an import hidden in a function counts as well."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from graphlib import CycleError, TopologicalSorter
from pathlib import Path
from typing import NamedTuple

import pytest

# Reading order. A module imports only from layers before its own, and from its own; names in one set never see each other.
LAYERS: tuple[set[str], ...] = (
    {"errors", "conventions", "references", "_validate", "_version"},
    {"orientation"},
    {"surfaces"},
    {"kinematics"},
    {"stress"},
    {"model"},
    {"synthetic"},
    {"checks", "io"},
    {"settings"},
    {"examination"},
    {"analysis", "inspection"},
    {"scenarios"},
    {"views"},
    {"report"},
    {"cli"},
)
GROUND = LAYERS[0]  # the members of the first layer may see each other
FRONT = {"__init__", "__main__"}  # these gather what lies to their left, which is everything

# Heavy libraries and the only layers that may load them.
HEAVY = {"pyvista": {"views", "io"}, "vtk": {"views", "io"}, "vtkmodules": {"views", "io"}, "matplotlib": {"views"}}
HEAVY |= {"meshio": {"io"}, "trimesh": {"io"}, "h5py": {"io"}}

FORBIDDEN_NAMES = {"util", "utils", "helper", "helpers", "core", "misc", "common", "tools", "stuff"}


class Import(NamedTuple):
    """One import in the source: which file and line, what it names."""

    file: Path
    line: int
    target: str  # dotted name of the module
    star: bool


def sources(project: Path) -> list[Path]:
    return sorted((project / "structviz").rglob("*.py"))


def module_name(file: Path, project: Path) -> str:
    parts = file.relative_to(project).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imports(file: Path, project: Path) -> Iterator[Import]:
    """Return every import of a file with absolute targets; `from package import module` names the module."""
    here = module_name(file, project).split(".")
    package = here if file.name == "__init__.py" else here[:-1]
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"), str(file))):
        if isinstance(node, ast.Import):
            yield from (Import(file, node.lineno, alias.name, False) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = ".".join(package[: len(package) - node.level + 1]) if node.level else ""
            base = ".".join(part for part in (base, node.module or "") if part)
            for alias in node.names:
                deeper = f"{base}.{alias.name}"
                yield Import(file, node.lineno, deeper if exists(deeper, project) else base, alias.name == "*")


def exists(dotted: str, project: Path) -> bool:
    path = project.joinpath(*dotted.split("."))
    return path.with_suffix(".py").is_file() or path.is_dir()


def layer(name: str) -> int:
    return next((number for number, names in enumerate(LAYERS) if name in names), -1)


def allowed(name: str) -> set[str]:
    """Return the layers and modules a member of the package may import from."""
    before = set().union(*LAYERS[: layer(name)])
    return before | (GROUND if name in GROUND else {name})


def complaint(project: Path, each: Import) -> str:
    """Return what is wrong with an import, or an empty text."""
    owner = each.file.relative_to(project / "structviz").parts[0].removesuffix(".py")
    top, _, rest = each.target.partition(".")
    where = f"{each.file.relative_to(project)}:{each.line}"
    if each.star:
        return f"{where}: star import of {each.target}; wanted names one by one"
    if top in HEAVY and owner not in HEAVY[top]:
        return f"{where}: imports {top}; only {', '.join(sorted(HEAVY[top]))} may"
    if top != "structviz" or owner in FRONT:
        return ""
    target = rest.split(".")[0]
    if not target:
        return f"{where}: imports the package itself; wanted the module that holds the name"
    if layer(target) >= 0 and target not in allowed(owner):
        return f"{where}: {owner} imports {target}; allowed are {', '.join(sorted(allowed(owner)))}"
    return "" if layer(target) >= 0 else f"{where}: {target} stands in no layer"


def test_every_import_points_to_the_left(project: Path) -> None:
    wrong = [text for file in sources(project) for each in imports(file, project) if (text := complaint(project, each))]
    assert not wrong, "\n" + "\n".join(wrong)


def test_every_module_stands_in_a_layer(project: Path) -> None:
    names = {
        path.stem for path in (project / "structviz").iterdir() if path.suffix == ".py" or (path.is_dir() and list(path.rglob("*.py")))
    }
    assert names - FRONT <= set().union(*LAYERS), "enter the new module in LAYERS"


def test_no_cycles(project: Path) -> None:
    graph = {
        module_name(file, project): {each.target for each in imports(file, project) if each.target.startswith("structviz.")}
        for file in sources(project)
    }
    try:
        TopologicalSorter(graph).prepare()
    except CycleError as error:
        pytest.fail(" -> ".join(error.args[1]))


def test_no_catch_all_names(project: Path) -> None:
    names = {part.removesuffix(".py") for file in sources(project) for part in file.relative_to(project).parts}
    assert not names & FORBIDDEN_NAMES


@pytest.mark.parametrize(
    ("owner", "code", "said"),
    [
        ("orientation/planes.py", "from structviz.stress import tensor", "orientation imports stress; allowed are _validate, _version"),
        ("checks/frame.py", "def f():\n    from structviz.io import registry", "frame.py:2: checks imports io"),
        ("io/formats/ply.py", "import structviz.checks.registry", "io imports checks"),
        ("stress/tensor.py", "import matplotlib.pyplot as plt", "imports matplotlib; only views may"),
        ("views/scene.py", "import trimesh", "imports trimesh; only io may"),
        ("surfaces/measure.py", "from numpy import *", "star import of numpy"),
        ("model.py", "from structviz import FaultModel", "imports the package itself"),
        ("model.py", "from structviz.elsewhere import thing", "elsewhere stands in no layer"),
        ("model.py", "from .analysis import run", "model imports analysis"),
    ],
)
def test_the_reader_of_imports_sees_what_is_wrong(tmp_path: Path, owner: str, code: str, said: str) -> None:
    file = tmp_path / "structviz" / owner
    file.parent.mkdir(parents=True, exist_ok=True)
    file.write_text(code, encoding="utf-8")
    complaints = [complaint(tmp_path, each) for each in imports(file, tmp_path)]
    assert said in complaints[0]


def test_the_reader_of_imports_lets_through_what_is_right(tmp_path: Path) -> None:
    file = tmp_path / "structviz" / "views" / "scene.py"
    file.parent.mkdir(parents=True)
    file.write_text("import pyvista\nfrom structviz.analysis import Analysis\nfrom . import tables\n", encoding="utf-8")
    assert [complaint(tmp_path, each) for each in imports(file, tmp_path)] == ["", "", ""]
