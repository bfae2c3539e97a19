"""A model in another format: its surfaces in one file or one file each, with a model file and a table of faults beside them."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from structviz.errors import ArgumentError
from structviz.io import FORMATS, write_surface
from structviz.io.format import FLOAT64, NAMES, SHARED_VERTICES, Format
from structviz.io.writing import write_new_files, write_surfaces
from structviz.kinematics.senses import Sector
from structviz.model import FaultModel
from structviz.report import whole
from structviz.report.names import file_stems, printable
from structviz.surfaces.surface import Surface

Progress = Callable[[str, int, int], None]

LOSSES = {
    FLOAT64: "coordinates are rounded to single precision",
    NAMES: "names of surfaces are kept only in the names of the files",
    SHARED_VERTICES: "triangles no longer share their vertices",
}


@dataclass(frozen=True)
class Converted:
    """What was written, and what the format could not keep."""

    target: Path
    files: tuple[str, ...]
    losses: tuple[str, ...]  # in words


def format_to(suffix: str) -> Format:
    """Return the format that writes a suffix; ArgumentError shows those there are."""
    wanted = f".{suffix.lower().removeprefix('.')}"
    for entry in FORMATS:
        if wanted in entry.suffixes and (entry.write or entry.write_model):
            return entry
    writable = [entry for entry in FORMATS if entry.write or entry.write_model]
    known = " ".join(sorted(suffix.removeprefix(".") for entry in writable for suffix in entry.suffixes))
    raise ArgumentError(f"--to: found {suffix!r}; wanted one of {known}", hint="structviz formats says what each can hold")


def convert_to_folder(
    model: FaultModel, folder: str, entry: Format, progress: Progress | None = None, *, more: Mapping[str, str] | None = None
) -> Converted:
    """Write every surface of a model into a new folder, with model.toml and faults.csv; return what was written and lost.

    `more` are further text files by name.
    """
    tell = progress or (lambda text, done, total: None)
    if entry.write is None:
        raise ArgumentError(f"--to: {entry.title} holds a whole model; wanted a file", hint=f"--out model{entry.suffixes[0]}")
    target = whole.checked_target(folder, lambda place: set(), "nothing yet")
    suffix = entry.suffixes[0]
    bodies = [fault.surface for fault in model.faults] + [horizon.surface for horizon in model.horizons]
    names = [fault.name for fault in model.faults] + [horizon.name for horizon in model.horizons]
    paths = [f"{'faults' if k < len(model.faults) else 'horizons'}/{stem}{suffix}" for k, stem in enumerate(file_stems(names))]
    with whole.complete_or_nothing(target) as new:
        for part in sorted({path.partition("/")[0] for path in paths}):
            (new / part).mkdir()
        for number, (path, name, body) in enumerate(zip(paths, names, bodies, strict=True)):
            tell("writing surfaces", number, len(paths))
            write_surface(new / path, Surface(name, body.vertices, body.triangles))
        (new / "faults.csv").write_text(_table(model, paths), encoding="utf-8", newline="\n")
        (new / "model.toml").write_text(_model_file(model, paths[len(model.faults) :]), encoding="utf-8", newline="\n")
        if model.striae:
            (new / "striae.csv").write_text(_striae(model), encoding="utf-8", newline="\n")
        for name, text in (more or {}).items():
            (new / name).write_text(text, encoding="utf-8", newline="\n")
        files = tuple(sorted(whole.all_files(new), key=lambda name: ("/" in name, name)))
    return Converted(target, files, (*_losses(entry), *_not_carried(model, striae=False)))


def convert_to_file(model: FaultModel, file: str, entry: Format) -> Converted:
    """Write every surface of a model into one new file; return what was lost. ArgumentError where the format holds only one.

    A format that holds whole models writes the files that belong to it beside, and keeps declared movements.
    """
    target = Path(file)
    if target.is_dir():
        raise ArgumentError(f"--out: {printable(file)} is a folder; wanted a file", hint="name a file that does not exist yet")
    if entry.write_model is not None:
        files = entry.write_model(model, target.stem)
        write_new_files(target.parent, files)
        return Converted(target, tuple(files), (*_losses(entry), *_not_carried(model)))
    taken = {fault.name for fault in model.faults}
    named = [(fault.name, fault.surface) for fault in model.faults]
    named += [(f"{h.name} (horizon)" if h.name in taken else h.name, h.surface) for h in model.horizons]
    surfaces = [Surface(name, body.vertices, body.triangles) for name, body in named]
    write_surfaces(target, surfaces)
    losses = list(_losses(entry))
    if any(fault.declared or fault.phase for fault in model.faults):
        losses.append("declared movements and phases are not in the file: convert into a folder to keep them")
    if model.horizons and model.faults:
        losses.append("which surfaces are horizons is not in the file")
    return Converted(target, (target.name,), (*losses, *_not_carried(model)))


def _losses(entry: Format) -> tuple[str, ...]:
    return tuple(text for key, text in LOSSES.items() if key in entry.cannot_store)


def _not_carried(model: FaultModel, *, striae: bool = True) -> tuple[str, ...]:
    held = (("striae", model.striae if striae else ()), ("earthquakes", model.mechanisms), ("wells", model.azimuths))
    return tuple(f"{word} of the model are not carried over: name their file in a model file" for word, there in held if there)


def _striae(model: FaultModel) -> str:
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow(("fault", "easting", "northing", "up", "strike_deg", "dip_deg", "rake_deg", "sense", "weight"))
    for stria in model.striae:
        numbers = (*stria.place, stria.strike_deg, stria.dip_deg, stria.rake_deg)
        writer.writerow((stria.fault, *map(repr, map(float, numbers)), _words(stria.declared)[0], repr(float(stria.weight))))
    return written.getvalue()


def _table(model: FaultModel, paths: Sequence[str]) -> str:
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow(("name", "surface", "sense", "rake_deg", "phase", "down_side"))
    for fault, path in zip(model.faults, paths):
        writer.writerow((fault.name, path, *_words(fault.declared), fault.phase, fault.down_side))
    return written.getvalue()


def _words(declared: Sector | None) -> tuple[str, str]:
    """Return a declaration as the cells sense and rake_deg."""
    if declared is None:
        return "", ""
    return (declared.text, "") if declared.words else ("", repr(declared.rake_deg))


def _model_file(model: FaultModel, horizons: Sequence[str]) -> str:
    lines = [f"title = {_quoted(model.title)}"]
    lines += [f"crs = {_quoted(model.crs)}"] if model.crs else []
    lines += ['length_unit = "m"', 'vertical = "elevation"', 'faults = "faults.csv"']
    lines += ['striae = "striae.csv"'] if model.striae else []
    for horizon, path in zip(model.horizons, horizons, strict=True):
        lines += ["", "[[horizon]]", f"name = {_quoted(horizon.name)}", f"surface = {_quoted(path)}"]
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    """Return a text as a TOML string; letters TOML cannot hold plainly are written as their numbers."""
    out = "".join(f"\\{letter}" if letter in '"\\' else (letter if letter.isprintable() else f"\\U{ord(letter):08x}") for letter in text)
    return f'"{out}"'
