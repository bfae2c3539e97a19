"""All outputs of an analysis in one folder, written whole or not at all."""

from __future__ import annotations

import json
import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path, PurePosixPath

from structviz.analysis import Analysis, Progress
from structviz.io.formats.vtm import collection
from structviz.report import whole
from structviz.report.annotated import mesh_files, write_annotated
from structviz.report.field_files import field_outputs
from structviz.report.html import page_text
from structviz.report.resqml_results import package_with_results
from structviz.report.results_json import results_text
from structviz.report.scene_glb import scene_glb
from structviz.report.tables import csv_text, fault_table, pair_table, sensitivity_table
from structviz.report.whole import all_files, complete_or_nothing
from structviz.scenarios import Sensitivity
from structviz.views import render

RESULTS = "results.json"
PAGE = "report.html"
COLLECTION = "faults.vtm"
SLIDES = "scene.glb"


@dataclass(frozen=True)
class Written:
    """What was written and what was left out."""

    folder: Path
    files: tuple[str, ...]  # relative to the folder
    skipped: tuple[str, ...]  # why a picture is missing, in words


def write_outputs(
    analysis: Analysis,
    folder: str | os.PathLike[str],
    *,
    pictures: bool = True,
    page: bool = True,
    field: bool = False,
    slides: bool = False,
    depends: Sensitivity | None = None,
    inputs_in: Path | None = None,
    progress: Progress | None = None,
) -> Written:
    """Write results.json, the page, the tables, an annotated mesh a fault and the pictures into a folder; return what was written.

    The folder is made, with the folders above it. It may exist if it is empty or holds only an earlier result, which is
    replaced once the new one is complete. `field` adds field.vti and trajectories.vtp, `slides` scene.glb, `depends` sensitivity.csv and
    what it holds to results.json; `inputs_in`, the folder where the paths of the inputs begin, adds results.epc where one of them
    is a RESQML package. Raises OutputError, with nothing changed, where it cannot be written or holds other files.
    """
    target = checked_target(folder)
    with complete_or_nothing(target) as new:
        wanted = _Wanted(pictures, page, field, depends, inputs_in, slides)
        files, skipped = _fill(new, analysis, wanted, progress or (lambda text, done, total: None))
    return Written(target, files, skipped)


def checked_target(folder: str | os.PathLike[str]) -> Path:
    """Return the folder as a full path; OutputError where results may not be put there. Nothing is written."""
    return whole.checked_target(folder, _earlier_outputs, "an earlier result of structviz")


def _earlier_outputs(target: Path) -> set[str]:
    """Return the files that an earlier result says it is made of, or none where results.json is not ours."""
    try:
        held = json.loads((target / RESULTS).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return set()
    if not isinstance(held, dict) or "structviz" not in held or not isinstance(held.get("outputs"), list):
        return set()
    return {str(name) for name in held["outputs"]}


@dataclass(frozen=True, eq=False)
class _Wanted:
    pictures: bool
    page: bool
    field: bool
    depends: Sensitivity | None
    inputs_in: Path | None
    slides: bool


def _fill(new: Path, analysis: Analysis, wanted: _Wanted, tell: Progress) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Write every file into a new folder; return their names, relative to it, and why pictures are missing."""
    meshes = mesh_files(analysis)
    (new / "faults").mkdir()
    for number, result in enumerate(analysis.faults):
        tell("writing meshes", number, len(analysis.faults))
        write_annotated(result, analysis.regimes[result.phase] if analysis.regimes else None, new / meshes[result.fault.name])
    (new / COLLECTION).write_bytes(collection(meshes))
    _write_text(new / "faults.csv", csv_text(fault_table(analysis)))
    _write_text(new / "pairs.csv", csv_text(pair_table(analysis)))
    drawn, skipped = render(analysis, new, progress=tell) if wanted.pictures else ((), ())
    if wanted.depends:
        _write_text(new / "sensitivity.csv", csv_text(sensitivity_table(wanted.depends)))
    if wanted.field:
        skipped = (*skipped, *_write_field(analysis, new, tell))
    if wanted.slides:
        (new / SLIDES).write_bytes(scene_glb(analysis))
    if wanted.page:
        tell("writing the page", 0, 1)
        skipped = (*skipped, *_write_page(analysis, new, drawn, wanted.depends))
    if wanted.inputs_in is not None:
        skipped = (*skipped, *_write_package(analysis, new, wanted.inputs_in))
    files = (RESULTS, *sorted(all_files(new), key=lambda name: ("/" in name, name)))
    _write_text(new / RESULTS, results_text(analysis, meshes=meshes, outputs=files, depends=wanted.depends))
    return files, tuple(skipped)


def _write_page(analysis: Analysis, new: Path, drawn: Sequence[str], depends: Sensitivity | None) -> tuple[str, ...]:
    """Write report.html with the pictures drawn; return why not, where it failed: that is a fault of ours, and the numbers stay."""
    try:
        text = page_text(analysis, pictures={name: (new / name).read_bytes() for name in drawn}, depends=depends)
    except (ArithmeticError, AttributeError, LookupError, RuntimeError, TypeError, ValueError) as error:
        return (f"{PAGE} could not be made ({type(error).__name__}: {error}); please report it",)
    _write_text(new / PAGE, text)
    return ()


def _write_field(analysis: Analysis, new: Path, tell: Progress) -> tuple[str, ...]:
    """Write the stress as a field; return why not, where there is none."""
    if analysis.by_place is None:
        return ("no field was written: it needs one stress, well determined, and a dozen faults",)
    tell("writing the field", 0, 1)
    for name, content in field_outputs(analysis.by_place).items():
        (new / name).write_bytes(content)
    return ()


def _write_package(analysis: Analysis, new: Path, inputs_in: Path) -> tuple[str, ...]:
    """Write a copy of the package that was judged, with results on its triangles; return what is missing in it."""
    taken = {name.casefold() for name in (RESULTS, *all_files(new))}

    def free(name: str) -> bool:
        return not any(str(place).casefold() in taken for place in (PurePosixPath(name), *PurePosixPath(name).parents))

    files, missing = package_with_results(analysis, inputs_in, free)
    for name, content in files.items():
        (new / name).parent.mkdir(parents=True, exist_ok=True)
        (new / name).write_bytes(content)
    return missing


def _write_text(path: Path, text: str) -> None:
    # Half of a surrogate pair comes from file names that are not UTF-8; written as \udcff it is valid JSON again.
    path.write_text(text, encoding="utf-8", errors="backslashreplace", newline="\n")
