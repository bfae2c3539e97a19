"""From a path to a fault model: a model file, a table of faults, a mesh file, or a folder of meshes."""

from __future__ import annotations

import os
from collections import Counter
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np

from structviz.errors import InputError
from structviz.io.declared_fields import fault_in_file, note_unused
from structviz.io.format import Piece
from structviz.io.independent import with_file
from structviz.io.ledger import Ledger, Progress, content_of, inside, mesh_files, missing, pieces_of
from structviz.io.line_files import SHOWN as LINE_FORMATS
from structviz.io.line_files import SUFFIXES as LINE_SUFFIXES
from structviz.io.line_files import faults_of_files, files_of_lines, with_layer
from structviz.io.model_file import ModelFile, parsed_model
from structviz.io.registry import names_others, suffixes
from structviz.io.sticks import faults_of_stick_table, is_stick_table
from structviz.io.striae import read_striae
from structviz.io.tables import FAULT_COLUMNS, Row, declared, down_side, read_table
from structviz.io.units import Frame, surface_m
from structviz.model import Fault, FaultModel, Horizon, Stria
from structviz.surfaces.surface import Surface

SINGLE = 3  # the same remark about more faults than this is told once, for the model


def read_model(
    path: str | Path, *, allow_outside: bool = False, where: Mapping[str, str] | None = None, progress: Progress | None = None
) -> FaultModel:
    """Return the fault model at a path, in metres with up positive.

    `path` is a model file (TOML), a table of faults or of sticks (CSV), lines (GeoJSON, GeoPackage, also file.gpkg#layer, Shapefile), a
    mesh file, or a folder; a folder with model.toml or faults.csv uses that, any other gives every mesh in it, without senses, or all
    its lines where it has no mesh. `where` keeps the lines whose properties have the values given. Files outside the folder of the
    model are refused unless `allow_outside`. `progress` is called with what is being done, how many are done, of how many.
    Raises InputError (FormatError, TableError, SurfaceError).
    """
    path, layer = with_layer(Path(path))
    if os.path.isdir(path):  # unlike Path.is_dir, False for a path no system could hold
        found = next((path / name for name in ("model.toml", "faults.csv") if (path / name).is_file()), None)
        if found is None:
            return model_of_folder(path, allow_outside, where or {}, progress)
        path = found
    elif not os.path.exists(path):
        raise missing(path, str(path))
    ledger, suffix = Ledger(path.parent, allow_outside), path.suffix.lower()
    if suffix in LINE_SUFFIXES:
        traces = faults_of_files([path], ledger, where or {}, layer)
        return finished(ledger, layer or path.stem, traces.crs, traces.faults, (), ())
    no_lines(where, path.name)
    if suffix == ".toml":
        return model_of_file(ledger, path, parsed_model(content_of(ledger, path), path.name), progress)
    if suffix == ".csv" and path.name != "faults.csv" and is_stick_table(content := content_of(ledger, path)):
        return finished(ledger, path.stem, "", faults_of_stick_table(content, path.name, ledger), (), ())
    if suffix == ".csv":
        striae = "striae.csv" if path.name == "faults.csv" and (path.parent / "striae.csv").is_file() else ""
        return model_of_file(ledger, path, ModelFile(path.resolve().parent.name, faults=path.name, striae=striae), progress)
    return model_of_meshes(ledger, [path], path.stem, progress)


def model_of_folder(folder: Path, allow_outside: bool, where: Mapping[str, str], progress: Progress | None) -> FaultModel:
    """Return a model of every mesh in a folder, or of all its lines where it has no mesh."""
    ledger, title, lines = Ledger(folder, allow_outside), folder.resolve().name, files_of_lines(folder)
    known = suffixes()
    meshes = any(entry.suffix.lower() in known and entry.is_file() and not entry.name.startswith(".") for entry in folder.iterdir())
    if lines and (where or not meshes):
        traces = faults_of_files(lines, ledger, where)
        return finished(ledger, title, traces.crs, traces.faults, (), ())
    no_lines(where, folder.name)
    if lines:
        names = ", ".join(path.name for path in lines[:5]) + (f" and {len(lines) - 5} more" if len(lines) > 5 else "")
        ledger.note("model", f"traces beside the meshes are not read: {names}", "name such a file, or move it to a folder of its own")
    return model_of_meshes(ledger, mesh_files(folder), title, progress)


def no_lines(where: Mapping[str, str] | None, name: str) -> None:
    """Raise InputError where lines are to be chosen by their properties and the input has none."""
    if where:
        raise InputError(name, "properties to choose by, for an input without any", f"traces: {LINE_FORMATS}", hint="leave --where out")


def read_surfaces(path: str | Path) -> tuple[Surface, ...]:
    """Return every surface of one mesh file as it stands, in the file's own units; unnamed ones take the name of the file."""
    path = Path(path)
    pieces = pieces_of(Ledger(path.parent), path)
    return tuple(surface_m(Frame(), piece, piece.name or path.stem, source_of(path.name, piece, len(pieces))) for piece in pieces)


def source_of(file: str, piece: Piece, count: int) -> str:
    """Return the file, with the part where the file holds several."""
    return f"{file}#{piece.name}" if count > 1 and piece.name else file


def model_of_meshes(ledger: Ledger, paths: list[Path], title: str, progress: Progress | None) -> FaultModel:
    """Return a model of every surface of each file: a horizon where the file says so, else a fault, with a sense where the file has one."""
    found: list[tuple[str, str, Piece, str]] = []
    # What names other files is read first: a surface that belongs to a collection in the same folder is not read twice.
    for done, path in enumerate(sorted(paths, key=lambda path: not names_others(path.suffix))):
        tell(progress, "reading surfaces", done, len(paths))
        if path.resolve() in ledger.parts:
            continue
        pieces = pieces_of(ledger, path)
        chosen = without_bounds(ledger, path, pieces)
        found += [(piece.name or path.stem, path.name, piece, source_of(path.name, piece, len(pieces))) for piece in chosen]
    tell(progress, "reading surfaces", len(paths), len(paths))
    names = distinct([(name, file) for name, file, _, _ in found])
    faults, horizons = [], []
    for name, (_, file, piece, source) in zip(names, found):
        surface = surface_m(Frame(), piece, name, source)
        if piece.kind == "horizon":
            horizons.append(Horizon(name, surface))
        else:
            faults.append(fault_in_file(ledger, name, file, piece, surface))
    if not faults:
        hint = "list them in a faults.csv if they are faults after all"
        raise InputError(title, f"{len(horizons)} horizons and no fault", "a fault surface", hint=hint)
    if not any(fault.declared for fault in faults):
        ledger.note("model", "no senses are declared: there is no table of faults", "list the faults in a faults.csv with their senses")
    return finished(ledger, title, system_of(ledger), tuple(faults), tuple(horizons), ())


def system_of(ledger: Ledger, stated: str = "") -> str:
    """Return the reference system a model states, else the one its files name; "" where they differ, which is noted."""
    named = sorted({piece.crs for pieces in ledger.pieces.values() for piece in pieces if piece.crs})
    hint = "bring all surfaces into one system: places in different systems do not compare"
    if len(named) > 1:
        ledger.note("model", f"the files name different reference systems: {', '.join(named)}", hint, "warning")
    elif stated and named and named[0].lower() != stated.strip().lower():
        ledger.note("model", f"the model says {stated}, its files say {named[0]}", hint, "warning")
    return stated or (named[0] if len(named) == 1 else "")


def distinct(named: list[tuple[str, str]]) -> list[str]:
    """Return one distinct name for each (name, file): names that come twice get the file, then a number."""
    times = Counter(name for name, _ in named)
    names = [f"{file}:{name}" if times[name] > 1 else name for name, file in named]
    seen: Counter[str] = Counter()
    for place, name in enumerate(names):
        seen[name] += 1
        names[place] = f"{name} ({seen[name]})" if seen[name] > 1 else name
    return names


def model_of_file(ledger: Ledger, path: Path, model: ModelFile, progress: Progress | None) -> FaultModel:
    """Return the model that a model file describes."""
    rows = list(model.fault_rows)
    if model.faults:
        rows += fault_rows(ledger, inside(ledger, model.faults, path.name))
    names = checked_names(rows)
    faults, total = [], len(rows) + len(model.horizon_rows)
    for done, (name, row) in enumerate(zip(names, rows)):
        tell(progress, "reading surfaces", done, total)
        sector, side, phase = declared(row), down_side(row), row.text("phase")
        faults.append(Fault(name, named_surface(ledger, row, name, model.frame), sector, phase, side))
    horizons = []
    for done, (name, row) in enumerate(zip(checked_names(model.horizon_rows), model.horizon_rows), len(rows)):
        tell(progress, "reading surfaces", done, total)
        horizons.append(Horizon(name, named_surface(ledger, row, name, model.frame)))
    tell(progress, "reading surfaces", total, total)
    striae: tuple[Stria, ...] = ()
    told: tuple[str, ...] = ()
    if model.striae:
        place = inside(ledger, model.striae, path.name)
        striae, told = read_striae(content_of(ledger, place), ledger.shown(place), tuple(names), model.frame)
    for message in told:
        ledger.note("model", message)
    note_shared_surfaces(ledger, faults)
    apart = FaultModel("", ())  # carries what was measured apart from the faults until the ledger is closed
    if model.mechanisms:
        apart = with_file(apart, ledger, inside(ledger, model.mechanisms, path.name), model.frame, model.mechanisms_are)
    if model.well_azimuths:
        apart = with_file(apart, ledger, inside(ledger, model.well_azimuths, path.name), model.frame)
    found = finished(ledger, model.title or path.stem, system_of(ledger, model.crs), tuple(faults), tuple(horizons), striae)
    return replace(found, mechanisms=apart.mechanisms, mechanisms_are=apart.mechanisms_are, azimuths=apart.azimuths)


def note_shared_surfaces(ledger: Ledger, faults: list[Fault]) -> None:
    """Note faults that use the same surface, which is more often a slip of the pen than meant."""
    first: dict[str, str] = {}
    for fault in faults:
        other = first.setdefault(fault.surface.source, fault.name)
        if other != fault.name:
            ledger.note(
                fault.name, f"uses the same surface as {other}: {fault.surface.source}", "correct the path of one of them", "warning"
            )


def fault_rows(ledger: Ledger, path: Path) -> list[Row]:
    """Return the rows of a table of faults; columns that are not known are noted."""
    table = read_table(content_of(ledger, path), ledger.shown(path), ("name", "surface"), FAULT_COLUMNS)
    if table.unknown:
        ledger.note("model", f"{ledger.shown(path)}: columns {', '.join(table.unknown)} are not used")
    return list(table.rows)


def checked_names(rows: list[Row] | tuple[Row, ...]) -> list[str]:
    """Return the names of rows; TableError where one is empty or comes twice."""
    seen: dict[str, Row] = {}
    for row in rows:
        name = row.text("name")
        if not name:
            raise row.error("no name", "a name", "fill in the name")
        if name in seen:
            first = seen[name]
            raise row.error(f"name {name!r}, as in {first.file}, {first.where}", "every name once", "rename one of them")
        seen[name] = row
    return list(seen)


def located(ledger: Ledger, row: Row) -> tuple[Path, str]:
    """Return the file of a row's surface and the part after #, "" for the whole file."""
    text = row.text("surface")
    if not text:
        raise row.error("no surface", "the path of a mesh file", "fill in the surface")
    where, base = f"{row.file}, {row.where}", (ledger.folder / row.file).parent  # a table in a subfolder names files beside itself
    path = inside(ledger, text, where, base)
    marks = [place for place, letter in enumerate(text) if letter == "#"]
    if os.path.isfile(path) or not marks:
        return path, ""
    for mark in marks:
        if os.path.isfile(found := inside(ledger, text[:mark], where, base)):
            return found, text[mark + 1 :]
    return inside(ledger, text[: marks[0]], where, base), text[marks[0] + 1 :]


def named_surface(ledger: Ledger, row: Row, name: str, frame: Frame) -> Surface:
    """Return the surface of a row: the part it names, else all of the file as one surface."""
    path, part = located(ledger, row)
    shown = ledger.shown(path)
    if not os.path.exists(path):
        raise missing(path, f"{shown} (named in {row.file}, {row.where})")
    pieces = pieces_of(ledger, path)
    if any(piece.framed for piece in pieces) and frame.history:
        hint = "leave length_unit and vertical out of the model file, or export in a format without them"
        ledger.note(name, f"{shown} states its own units and datum, which are used; those of the model file are not", hint, "warning")
    if part:
        chosen = next((piece for piece in pieces if piece.name == part), None)
        if chosen is None:
            parts = [piece.name for piece in pieces if piece.name]
            listed = ", ".join(repr(known) for known in parts[:10]) + (f" and {len(parts) - 10} more" if len(parts) > 10 else "")
            raise row.error(f"part {part!r} of {shown}", listed or "a file with named parts", "name one of the parts, or the file alone")
        note_unused(ledger, row, name, [chosen])
        return surface_m(frame, chosen, name, source_of(shown, chosen, len(pieces)))
    used = without_bounds(ledger, path, pieces, name)
    if len(used) > 1:
        ledger.note(name, f"{shown} holds {len(used)} named surfaces; together they are used as one", f"name one of them as {shown}#part")
    note_unused(ledger, row, name, used)
    return surface_m(frame, merged(used), name, shown)


def without_bounds(ledger: Ledger, path: Path, pieces: tuple[Piece, ...], subject: str = "model") -> tuple[Piece, ...]:
    """Return the pieces that are not set aside, and note those that are; all of them where nothing else is left."""
    used = tuple(piece for piece in pieces if not piece.aside)
    if not used:
        return pieces
    for aside in dict.fromkeys(piece.aside for piece in pieces if piece.aside):
        names = ", ".join(piece.name for piece in pieces if piece.aside == aside)
        shown = ledger.shown(path)
        ledger.note(
            subject, f"{shown}: {names} left out: {aside}", f"name a part as {shown}#part in a table of faults to use it all the same"
        )
    return used


def merged(pieces: tuple[Piece, ...]) -> Piece:
    """Return several pieces as one."""
    if len(pieces) == 1:
        return pieces[0]
    starts = np.cumsum([0] + [len(piece.vertices) for piece in pieces[:-1]])
    triangles = np.concatenate([piece.triangles + start for piece, start in zip(pieces, starts)])
    history = tuple(dict.fromkeys(words for piece in pieces for words in piece.history))
    vertices = np.concatenate([piece.vertices for piece in pieces])
    return Piece("", vertices, triangles, history, framed=pieces[0].framed, crs=pieces[0].crs)


def tell(progress: Progress | None, text: str, done: int, total: int) -> None:
    """Report progress where someone listens."""
    if progress is not None:
        progress(text, done, total)


def finished(
    ledger: Ledger, title: str, crs: str, faults: tuple[Fault, ...], horizons: tuple[Horizon, ...], striae: tuple[Stria, ...]
) -> FaultModel:
    """Return the model with its inputs and with what happened to the surfaces as findings."""
    for message, names in remarks(faults, horizons).items():
        if len(names) > SINGLE:
            ledger.note("model", f"{len(names)} surfaces: {message}")
        else:
            for name in names:
                ledger.note(name, message)
    return FaultModel(title, faults, horizons, striae, crs, ledger.input_files(), tuple(ledger.findings))


def remarks(faults: tuple[Fault, ...], horizons: tuple[Horizon, ...]) -> dict[str, list[str]]:
    """Return the names of the faults and horizons under each remark of their history."""
    found: dict[str, list[str]] = {}
    surfaces = [(fault.name, fault.surface) for fault in faults] + [(horizon.name, horizon.surface) for horizon in horizons]
    for name, surface in surfaces:
        for message in surface.history:
            found.setdefault(message, []).append(name)
    return found
