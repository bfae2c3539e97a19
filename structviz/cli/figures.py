"""Draw the figures of a report in print quality: the model in 3D, the net, the Mohr diagram and other plots, with captions.

PATH is what `structviz check` takes. Sizes are true in millimetres. The exit code is 0 where the figures were written, whatever
they show.
"""

from __future__ import annotations

import argparse
import sys

from structviz.analysis import run as analyse
from structviz.cli.choices import add_choices, ending_like_an_interrupt, limits_of, number, settings_of, where_of
from structviz.cli.progress import progress_bar
from structviz.errors import ArgumentError
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.report.figures import CAPTIONS, TURNTABLES, checked_figures_target, write_figures
from structviz.report.names import printable
from structviz.report.write import Written
from structviz.views.figures import FIGURES, FORMATS, PrintChoice, chosen
from structviz.views.viewpoints import VIEWPOINTS


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, the folder, what is drawn and how, and what says how a model is judged."""
    usual = PrintChoice()
    parser.usage = "structviz figures PATH --out DIR [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, or folder")
    parser.add_argument("--out", metavar="DIR", required=True, help="write the figures and figures.txt, their captions, into this folder")
    parser.add_argument("--formats", metavar="LIST", help=f"some of {', '.join(FORMATS)} (default {','.join(usual.formats)})")
    parser.add_argument(
        "--width-mm", metavar="N", default=f"{usual.width_mm:g}", help="width of every figure, 60 to 420 (default %(default)s)"
    )
    parser.add_argument(
        "--dpi", metavar="N", default=str(usual.dpi), help="dots an inch of PNG and of the 3D picture (default %(default)s)"
    )
    parser.add_argument("--only", metavar="LIST", help=f"some of {', '.join(FIGURES)} (default all)")
    parser.add_argument("--viewpoints", metavar="LIST", help=f"of the scene: some of {', '.join(VIEWPOINTS)} (default all)")
    parser.add_argument("--turntable", metavar="KIND", help="the scene turned once round too: gif or mp4")
    add_choices(parser)


def run(args: argparse.Namespace) -> int:
    """Read, analyse, draw and say what was written; return 0."""
    settings, limits, choice = settings_of(args), limits_of(args.limit), _choice(args)
    if args.turntable is not None and args.turntable not in TURNTABLES:
        found = f"--turntable: found {args.turntable!r}; wanted one of {', '.join(TURNTABLES)}"
        raise ArgumentError(found, hint="a gif is shown everywhere")
    checked_figures_target(args.out)  # better told now than after the work
    with ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        model = with_measurements(model, args.mechanisms, args.well_azimuths)
        analysis = analyse(model, settings, limits=limits, progress=progress)
        written = write_figures(analysis, args.out, choice=choice, turntable=args.turntable or "", progress=progress)
    _say(written)
    return 0


def _choice(args: argparse.Namespace) -> PrintChoice:
    """Return what is printed; ArgumentError for a word or number that cannot be."""
    usual = PrintChoice()
    return PrintChoice(
        formats=chosen(args.formats, usual.formats),
        width_mm=float(number(args.width_mm, "--width-mm", whole=False)),
        dpi=int(number(args.dpi, "--dpi", whole=True)),
        only=chosen(args.only, usual.only),
        viewpoints=chosen(args.viewpoints, usual.viewpoints),
    )


def _say(written: Written) -> None:
    print(f"Written to {printable(str(written.folder), 200)}")
    for name in written.files:
        size = (written.folder / name).stat().st_size
        print(f"  {name:<22} {max(1, round(size / 1000)):>7,} kB")
    print(f"{CAPTIONS} holds what to paste under each.")
    for reason in written.skipped:
        print(f"  left out: {printable(reason, 300)}", file=sys.stderr)
