"""Judge the declared movement of every fault of a model by the stress that all the others tell of.

PATH is a model file (TOML), a table of faults (CSV), a mesh file, or a folder of meshes. The exit code is 0 where nothing
conflicts, 1 where conflicts were found, 2 where the input or the call cannot be used.
"""

from __future__ import annotations

import argparse
import signal
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import Field, fields
from types import FrameType
from typing import Any

from structviz.analysis import Analysis
from structviz.analysis import run as analyse
from structviz.checks import checked_limits
from structviz.cli.progress import progress_bar
from structviz.errors import ArgumentError
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.report.results_json import results_text
from structviz.report.summary import show
from structviz.report.write import RESULTS, Written, checked_target, write_outputs
from structviz.settings import Settings, bounds


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, what to write, and one option for each setting."""
    parser.usage = "structviz check PATH [--out DIR] [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, or folder")
    parser.add_argument("--out", metavar="DIR", help="write results.json, tables, annotated meshes and pictures into this folder")
    parser.add_argument("--json", action="store_true", help="print results.json instead of the summary")
    parser.add_argument("--no-pictures", action="store_true", help="leave the pictures out")
    parser.add_argument("--no-page", action="store_true", help="leave report.html out")
    parser.add_argument("--allow-outside", action="store_true", help="let the model use files outside its own folder")
    parser.add_argument("--mechanisms", metavar="FILE", default="", help="compare with earthquake mechanisms (CSV, or QuakeML by ObsPy)")
    parser.add_argument("--well-azimuths", metavar="FILE", default="", help="compare with SHmax azimuths measured in wells (CSV)")
    parser.add_argument(
        "--limit",
        action="append",
        default=[],
        metavar="KEY=VALUE",
        help="change the limit of a check (repeatable); structviz checks lists them",
    )
    group = parser.add_argument_group("settings")
    for item in fields(Settings):
        group.add_argument(option(item.name), metavar="N", help=_help(item))


def run(args: argparse.Namespace) -> int:
    """Read, analyse, write and show; return 0 where nothing conflicts, else 1."""
    settings, limits = _settings(args), _limits(args.limit)
    if args.out is not None:
        checked_target(args.out)  # better told now than after the work
    with _ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, progress=progress)
        model = with_measurements(model, args.mechanisms, args.well_azimuths)
        analysis = analyse(model, settings, limits=limits, progress=progress)
        written = None
        if args.out is not None:
            written = write_outputs(analysis, args.out, pictures=not args.no_pictures, page=not args.no_page, progress=progress)
    _show(analysis, written, as_json=args.json)
    return 1 if analysis.conflicting else 0


def option(name: str) -> str:
    """Return the option of a setting.

    >>> option("friction_angle_deg")
    '--friction-angle-deg'
    """
    return "--" + name.replace("_", "-")


def _help(item: Field) -> str:
    known = item.metadata
    return f"{known['help']} ({bounds(item)}; default {item.default:g})".replace("%", "%%")


def _settings(args: argparse.Namespace) -> Settings:
    """Return the settings with those given replaced; ArgumentError where a value is no number or out of range."""
    chosen: dict[str, Any] = {}
    for item in fields(Settings):
        text = getattr(args, item.name)
        if text is not None:
            chosen[item.name] = _number(text, option(item.name), whole=isinstance(item.default, int))
    return Settings(**chosen)


def _limits(given: list[str]) -> dict[str, float]:
    """Return the limits by key; ArgumentError for a text without =, a value that is no number, an unknown key."""
    limits: dict[str, float] = {}
    for text in given:
        key, found, value = text.partition("=")
        if not found:
            raise ArgumentError(f"--limit: found {text!r}; wanted KEY=VALUE", hint="structviz checks lists the keys")
        limits[key.strip()] = float(_number(value, f"--limit {key.strip()}", whole=False))
    checked_limits(limits)
    return limits


def _number(text: str, where: str, *, whole: bool) -> float | int:
    try:
        return int(text) if whole else float(text)
    except ValueError:
        wanted = "a whole number" if whole else "a number"
        raise ArgumentError(f"{where}: found {text!r}; wanted {wanted}", hint="structviz check --help lists the settings") from None


def _show(analysis: Analysis, written: Written | None, *, as_json: bool) -> None:
    if as_json:
        text = (written.folder / RESULTS).read_bytes() if written else results_text(analysis).encode("utf-8", "backslashreplace")
        sys.stdout.flush()
        sys.stdout.buffer.write(text)  # UTF-8 whatever the terminal speaks: it is meant for programs
        return
    from rich.console import Console

    show(Console(highlight=False, markup=False, emoji=False, soft_wrap=False), analysis, written)


@contextmanager
def _ending_like_an_interrupt() -> Iterator[None]:
    """Let a request to end (SIGTERM) clean up as an interrupt does, where the system allows it."""

    def stop(number: int, frame: FrameType | None) -> None:
        raise KeyboardInterrupt

    try:
        before = signal.signal(signal.SIGTERM, stop)
    except ValueError:  # not in the main thread
        yield
        return
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)
