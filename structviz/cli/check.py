"""Judge the declared movement of every fault of a model by the stress that all the others tell of.

PATH is a model file (TOML), a table of faults (CSV), a mesh file, or a folder of meshes. The exit code is 0 where nothing
conflicts, 1 where conflicts were found, 2 where the input or the call cannot be used.
"""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

from structviz.analysis import Analysis
from structviz.analysis import run as analyse
from structviz.cli.choices import add_choices, ending_like_an_interrupt, limits_of, settings_of, where_of
from structviz.cli.progress import progress_bar
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.report.results_json import results_text
from structviz.report.summary import show
from structviz.report.write import RESULTS, Written, checked_target, write_outputs
from structviz.scenarios import Sensitivity, sensitivity
from structviz.views import prepare


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, what to write, and one option for each setting."""
    parser.usage = "structviz check PATH [--out DIR] [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, or folder")
    parser.add_argument("--out", metavar="DIR", help="write results.json, tables, annotated meshes and pictures into this folder")
    parser.add_argument("--json", action="store_true", help="print results.json instead of the summary")
    parser.add_argument("--no-pictures", action="store_true", help="leave the pictures out")
    parser.add_argument("--no-page", action="store_true", help="leave report.html out")
    parser.add_argument("--glb", action="store_true", help="write the scene for slides too: scene.glb, faults by name and colour")
    parser.add_argument("--field", action="store_true", help="write the stress as a field too: field.vti and trajectories.vtp")
    parser.add_argument(
        "--sensitivity", action="store_true", help="try other choices: which verdicts depend on them, what carries the stress"
    )
    add_choices(parser)


def run(args: argparse.Namespace) -> int:
    """Read, analyse, write and show; return 0 where nothing conflicts, else 1."""
    settings, limits = settings_of(args), limits_of(args.limit)
    if args.out is not None:
        checked_target(args.out)  # better told now than after the work
    with ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        model = with_measurements(model, args.mechanisms, args.well_azimuths)
        if args.out is not None and not args.no_pictures:
            prepare()
        analysis = analyse(model, settings, limits=limits, progress=progress)
        depends = sensitivity(analysis, progress) if args.sensitivity else None
        written = None
        if args.out is not None:
            written = write_outputs(
                analysis,
                args.out,
                pictures=not args.no_pictures,
                page=not args.no_page,
                field=args.field,
                slides=args.glb,
                depends=depends,
                inputs_in=Path(args.path) if os.path.isdir(args.path) else Path(args.path).parent,
                progress=progress,
            )
    _show(analysis, written, depends, as_json=args.json)
    return 1 if analysis.conflicting else 0


def _show(analysis: Analysis, written: Written | None, depends: Sensitivity | None, *, as_json: bool) -> None:
    if as_json:
        text = (
            (written.folder / RESULTS).read_bytes()
            if written
            else results_text(analysis, depends=depends).encode("utf-8", "backslashreplace")
        )
        sys.stdout.flush()
        sys.stdout.buffer.write(text)  # UTF-8 whatever the terminal speaks: it is meant for programs
        return
    from rich.console import Console

    show(Console(highlight=False, markup=False, emoji=False, soft_wrap=False), analysis, written, depends)
