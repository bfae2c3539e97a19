"""Show the page of a model in the browser of this machine, and make it again whenever the inputs change.

PATH is what `structviz check` takes. The page is given to this machine alone (127.0.0.1); Ctrl-C stops.
"""

from __future__ import annotations

import argparse
import tempfile
from pathlib import Path

from structviz.analysis import Analysis
from structviz.analysis import run as analyse
from structviz.cli.choices import add_choices, ending_like_an_interrupt, limits_of, number, settings_of, where_of
from structviz.errors import ArgumentError
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.report.names import printable
from structviz.report.serve import serve
from structviz.views import render

PORT = 8710


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, the port, and what says how a model is judged."""
    parser.usage = "structviz serve PATH [--port N] [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, or folder")
    parser.add_argument("--port", metavar="N", default=str(PORT), help=f"port on this machine; 0 takes any that is free (default {PORT})")
    parser.add_argument("--pictures", action="store_true", help="draw the pictures too, for browsers without WebGL (slower)")
    add_choices(parser)


def run(args: argparse.Namespace) -> int:
    """Serve until interrupted; return 0."""
    settings, limits, port = settings_of(args), limits_of(args.limit), int(number(args.port, "--port", whole=True))
    if not 0 <= port <= 65535:
        raise ArgumentError(f"--port: found {port}; wanted 0 to 65535", hint="0 takes any that is free")

    def make() -> Analysis:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where))
        model = with_measurements(model, args.mechanisms, args.well_azimuths)
        return analyse(model, settings, limits=limits)

    with ending_like_an_interrupt():
        try:
            serve(Path(args.path), make, port=port, say=_say, draw=_pictures if args.pictures else _none)
        except KeyboardInterrupt:
            _say("stopped")
    return 0


def _say(text: str) -> None:
    print("\n".join(printable(line) for line in text.split("\n")), flush=True)


def _none(analysis: Analysis) -> dict[str, bytes]:
    return {}


def _pictures(analysis: Analysis) -> dict[str, bytes]:
    with tempfile.TemporaryDirectory() as folder:
        drawn, _ = render(analysis, Path(folder))
        return {name: (Path(folder) / name).read_bytes() for name in drawn}
