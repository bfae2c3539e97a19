"""List what files hold: every surface with its size, orientation and condition, before anything is judged.

PATH is what `structviz check` takes. `--table` writes a table of faults to fill in, which `structviz check` then reads.
"""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

from structviz.cli.choices import ending_like_an_interrupt, where_of
from structviz.cli.progress import progress_bar
from structviz.errors import ArgumentError, OutputError
from structviz.inspection import Inspection, inspect
from structviz.io import read_model
from structviz.report.inspected import inspection_json, proposed_table, relative_sources, show_inspection


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path and what to print or write."""
    parser.usage = "structviz inspect PATH [--table FILE.csv] [--json] [options]"
    parser.add_argument("path", metavar="PATH", help="mesh file, folder of meshes, table of faults, traces, or model file")
    parser.add_argument("--table", metavar="FILE.csv", help="write a table of faults to fill in; it must not exist yet")
    parser.add_argument("--json", action="store_true", help="print everything as JSON, with the numbers of bad triangles")
    parser.add_argument("--allow-outside", action="store_true", help="let the model use files outside its own folder")
    parser.add_argument("--where", action="append", default=[], metavar="NAME=VALUE", help="of traces, keep those with this property")


def run(args: argparse.Namespace) -> int:
    """Read, measure and show; return 0."""
    target = _new_file(args.table) if args.table is not None else None
    with ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        inspection = inspect(model, progress)
    told = f"To declare what moved how: structviz inspect {args.path} --table faults.csv, then fill in the senses."
    if target is not None:
        _write(target, inspection, Path(args.path))
        told = f"Written to {args.table}: fill in the senses (normal, reverse, sinistral, dextral, or two joined), then structviz check it."
    if args.json:
        sys.stdout.flush()
        sys.stdout.buffer.write(inspection_json(inspection).encode("utf-8", "backslashreplace"))
        return 0
    from rich.console import Console

    show_inspection(Console(highlight=False, markup=False, emoji=False), inspection, told)
    return 0


def _new_file(name: str) -> Path:
    """Return the path of the table to write; ArgumentError where it exists, so that filled-in senses are never lost."""
    path = Path(name)
    if path.suffix.lower() != ".csv":
        raise ArgumentError(f"--table: found {name!r}; wanted a name that ends in .csv", hint="name it faults.csv")
    if os.path.lexists(path):
        raise ArgumentError(f"--table: {name} exists already; wanted a new file", hint="name another, so that what was filled in stays")
    return path


def _write(target: Path, inspection: Inspection, path: Path) -> None:
    folder = path if path.is_dir() else path.parent
    try:
        prefix = Path(os.path.relpath(folder.resolve(), target.resolve().parent)).as_posix()
    except (OSError, ValueError):  # ValueError: another drive
        prefix = folder.resolve().as_posix()
    if prefix.startswith("..") or os.path.isabs(prefix):
        hint = "a table names files beside or below it: write it into the folder of the surfaces, or above it"
        raise ArgumentError(f"--table: {target} would lie beside the surfaces, not above them", hint=hint)
    text = proposed_table(inspection, relative_sources(inspection, "" if prefix == "." else prefix))
    try:
        with target.open("x", encoding="utf-8", newline="") as file:
            file.write(text)
    except OSError as error:
        raise OutputError(f"{target}: cannot be written ({error.strerror})", hint="name a file in a folder you may write to") from None
