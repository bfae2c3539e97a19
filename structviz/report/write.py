"""All outputs of an analysis in one folder, written whole or not at all.

Everything goes into a new folder beside the target, which takes the target's place when it is complete. Until then an
earlier result stays as it was, whatever stops the work.
"""

from __future__ import annotations

import errno
import json
import os
import secrets
import shutil
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from structviz.analysis import Analysis, Progress
from structviz.errors import OutputError
from structviz.report.annotated import mesh_files, write_annotated
from structviz.report.field_files import field_outputs
from structviz.report.html import page_text
from structviz.report.names import printable
from structviz.report.results_json import results_text
from structviz.report.tables import csv_text, fault_table, pair_table, sensitivity_table
from structviz.scenarios import Sensitivity
from structviz.views import render

RESULTS = "results.json"
PAGE = "report.html"
LITTER = {".DS_Store", "Thumbs.db", "desktop.ini"}  # left by file browsers, missed by nobody


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
    depends: Sensitivity | None = None,
    progress: Progress | None = None,
) -> Written:
    """Write results.json, the page, the tables, an annotated mesh a fault and the pictures into a folder; return what was written.

    The folder is made, with the folders above it. It may exist if it is empty or holds only an earlier result, which is
    replaced once the new one is complete. `field` adds field.vti and trajectories.vtp, `depends` adds sensitivity.csv and
    what it holds to results.json. Raises OutputError, with nothing changed, where it cannot be written or holds other files.
    """
    target = checked_target(folder)
    with _complete_or_nothing(target) as new:
        wanted = _Wanted(pictures, page, field, depends)
        files, skipped = _fill(new, analysis, wanted, progress or (lambda text, done, total: None))
    return Written(target, files, skipped)


def checked_target(folder: str | os.PathLike[str]) -> Path:
    """Return the folder as a full path; OutputError where results may not be put there. Nothing is written."""
    shown = printable(os.fspath(folder))
    try:
        target = Path(folder).resolve()
        is_folder, exists = target.is_dir(), os.path.lexists(target)
        held = {entry.name for entry in target.iterdir()} - LITTER if is_folder else set()
    except (OSError, ValueError, RuntimeError) as error:  # ValueError: a null in the name; RuntimeError: a loop of links
        raise _failed(shown, error) from None
    if exists and not is_folder:
        raise OutputError(f"{shown}: found a file; wanted a folder", hint="name a folder that does not exist yet")
    above = next(place for place in target.parents if os.path.lexists(place))
    if not above.is_dir():
        raise _failed(shown, NotADirectoryError(errno.ENOTDIR, "part of the path is a file"))
    if not os.access(above, os.W_OK):
        raise _failed(shown, PermissionError(errno.EACCES, os.strerror(errno.EACCES)))
    if target == Path.cwd():
        raise OutputError(f"{shown}: found the folder you are in; wanted one of its own", hint="name a folder in it, such as --out results")
    _refuse_strangers(shown, target, held)
    return target


def _refuse_strangers(shown: str, target: Path, held: set[str]) -> None:
    """Raise OutputError where a folder holds anything but an earlier result."""
    earlier = _earlier_outputs(target) if RESULTS in held else set()
    strangers = sorted(_all_files(target) - earlier) if held and earlier else sorted(held)
    if not strangers:
        return
    names = ", ".join(printable(name, 60) for name in strangers[:3]) + (f" and {len(strangers) - 3} more" if len(strangers) > 3 else "")
    wanted = "an empty folder, or one that holds only an earlier result of structviz"
    raise OutputError(f"{shown}: found other files ({names}); wanted {wanted}", hint="name another folder, or move those files away")


def _earlier_outputs(target: Path) -> set[str]:
    """Return the files that an earlier result says it is made of, or none where results.json is not ours."""
    try:
        held = json.loads((target / RESULTS).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return set()
    if not isinstance(held, dict) or "structviz" not in held or not isinstance(held.get("outputs"), list):
        return set()
    return {str(name) for name in held["outputs"]}


def _all_files(target: Path) -> set[str]:
    """Return every file below a folder, relative to it, with forward slashes; links count as files and are not followed."""
    found = set()
    for place, folders, files in os.walk(target):
        links = [name for name in folders if os.path.islink(os.path.join(place, name))]
        empty = [] if files or folders or Path(place) == target else ["."]
        found |= {Path(place, name).relative_to(target).as_posix() for name in [*files, *links, *empty] if name not in LITTER}
    return found


@contextmanager
def _complete_or_nothing(target: Path) -> Iterator[Path]:
    """Give a new folder beside the target, and put it in the target's place if all goes well; else leave everything as it was."""
    made: list[Path] = []
    new = target.with_name(f".{target.name[:30]}.{secrets.token_hex(4)}.partial")
    try:
        _make_parents(target.parent, made)
        new.mkdir()
        yield new
        _swap(new, target)
    except (OSError, OutputError) as error:
        _undo(new, made)
        said = error.__context__ if isinstance(error, OutputError) else error  # not the name of a folder that is gone
        raise _failed(printable(str(target)), said or error) from error
    except BaseException:  # an interrupt, too, must leave nothing half done
        _undo(new, made)
        raise


def _make_parents(parent: Path, made: list[Path]) -> None:
    missing = [place for place in (parent, *parent.parents) if not place.exists()]
    for place in reversed(missing):
        place.mkdir()
        made.append(place)


def _undo(new: Path, made: Sequence[Path]) -> None:
    shutil.rmtree(new, ignore_errors=True)
    for place in reversed(made):
        try:
            place.rmdir()
        except OSError:  # something else was put there meanwhile: leave it
            return


def _swap(new: Path, target: Path) -> None:
    """Put the new folder in the place of the old one, which goes only after that."""
    old = new.with_suffix(".old")
    had_one = target.exists()
    if had_one:
        target.rename(old)
    try:
        new.rename(target)
    except BaseException:
        if had_one:
            old.rename(target)
        raise
    if had_one:
        shutil.rmtree(old, ignore_errors=True)


@dataclass(frozen=True, eq=False)
class _Wanted:
    pictures: bool
    page: bool
    field: bool
    depends: Sensitivity | None


def _fill(new: Path, analysis: Analysis, wanted: _Wanted, tell: Progress) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Write every file into a new folder; return their names, relative to it, and why pictures are missing."""
    meshes = mesh_files(analysis)
    (new / "faults").mkdir()
    for number, result in enumerate(analysis.faults):
        tell("writing meshes", number, len(analysis.faults))
        write_annotated(result, analysis.regimes[result.phase] if analysis.regimes else None, new / meshes[result.fault.name])
    _write_text(new / "faults.csv", csv_text(fault_table(analysis)))
    _write_text(new / "pairs.csv", csv_text(pair_table(analysis)))
    drawn, skipped = render(analysis, new, progress=tell) if wanted.pictures else ((), ())
    if wanted.depends:
        _write_text(new / "sensitivity.csv", csv_text(sensitivity_table(wanted.depends)))
    if wanted.field:
        skipped = (*skipped, *_write_field(analysis, new, tell))
    if wanted.page:
        tell("writing the page", 0, 1)
        skipped = (*skipped, *_write_page(analysis, new, drawn, wanted.depends))
    files = (RESULTS, *sorted(_all_files(new), key=lambda name: ("/" in name, name)))
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


def _write_text(path: Path, text: str) -> None:
    # Half of a surrogate pair comes from file names that are not UTF-8; written as \udcff it is valid JSON again.
    path.write_text(text, encoding="utf-8", errors="backslashreplace", newline="\n")


def _failed(shown: str, error: BaseException) -> OutputError:
    """Return the OutputError that tells what the system said, with what to do about it."""
    number = getattr(error, "errno", None)
    hints = {
        errno.ENOSPC: "free some space on that disk, or name a folder on another",
        errno.EDQUOT: "your share of that disk is used up: free some space or name a folder on another",
        errno.EACCES: "name a folder you may write to",
        errno.EPERM: "name a folder you may write to",
        errno.EROFS: "that disk can only be read: name a folder on another",
        errno.ENOTDIR: "name a folder below an existing one",
        errno.ENAMETOOLONG: "choose a shorter name",
        errno.EBUSY: "the folder itself cannot be replaced (a mounted disk?): name a folder in it",
    }
    said = getattr(error, "strerror", None) or str(error)
    return OutputError(f"{shown}: cannot be written ({said}); nothing was changed", hint=hints.get(number or 0, "name another folder"))
