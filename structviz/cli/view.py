"""Show a model, or a folder of results, in a window: turn it, click a fault, colour it by what was measured. `?` shows the keys.

PATH is what `structviz check` takes, or a folder that it wrote. Without a screen use `structviz serve`, or open report.html.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from structviz.analysis import run as analyse
from structviz.cli.choices import add_choices, ending_like_an_interrupt, limits_of, settings_of, where_of
from structviz.cli.progress import progress_bar
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.report.names import printable
from structviz.report.window_content import content_of_analysis, content_of_results
from structviz.report.write import RESULTS
from structviz.views.gl import require_screen
from structviz.views.window import WindowContent


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path and what says how a model is judged."""
    parser.usage = "structviz view PATH [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, folder, or folder of results")
    add_choices(parser)


def run(args: argparse.Namespace) -> int:
    """Read, analyse where there are no results yet, and show the window until it is closed; return 0."""
    require_screen()  # better told now than after the work
    with ending_like_an_interrupt():
        content = _content(args)
        from structviz.views.render_window import open_window

        window = open_window(content, say=_say, save=_free_name)
        _say("? shows the keys, q closes the window")
        window.plotter.show()
    return 0


def _content(args: argparse.Namespace) -> WindowContent:
    path = Path(args.path)
    if (path / RESULTS).is_file():
        return content_of_results(path)
    settings, limits = settings_of(args), limits_of(args.limit)
    with progress_bar() as progress:
        model = read_model(path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        model = with_measurements(model, args.mechanisms, args.well_azimuths)
        return content_of_analysis(analyse(model, settings, limits=limits, progress=progress))


def _say(text: str) -> None:
    print("\n".join(printable(line) for line in text.split("\n")), file=sys.stderr, flush=True)


def _free_name() -> Path:
    """Return a name for a picture in the folder one is in, that no file has yet."""
    number = 1
    while Path(f"structviz_{number}.png").exists():
        number += 1
    return Path(f"structviz_{number}.png")
