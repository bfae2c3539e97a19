"""Mend the surfaces of a model and write them, with a log of every change, into a new folder. The input is left alone.

Always: vertices at one place are joined, triangles that collapse or repeat another are dropped, each part gets one winding, vertices
that nothing uses are dropped. The rest is chosen below. Branching edges, pinches and one-sided surfaces are left and told by `check`.
"""

from __future__ import annotations

import argparse

from structviz.cli.choices import ending_like_an_interrupt, number, where_of
from structviz.cli.progress import progress_bar
from structviz.io import read_model
from structviz.report.converted import format_to
from structviz.report.names import printable
from structviz.report.repaired import LOG, Repaired, repair_model, write_repaired
from structviz.surfaces.repair import RepairChoices

MOST_LINES = 30


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, the folder, and what may be mended."""
    parser.usage = "structviz repair PATH --out FOLDER [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, mesh file, or folder")
    parser.add_argument("--out", metavar="FOLDER", required=True, help="new folder for the repaired model and the log")
    parser.add_argument("--to", metavar="SUFFIX", default="vtp", help="format of the files (default vtp)")
    parser.add_argument("--weld-m", metavar="M", default="0", help="join vertices this near each other, metres (default 0: the same place)")
    parser.add_argument(
        "--fill-holes-m", metavar="M", default="0", help="fill holes with a rim no longer than this, metres (default 0: none)"
    )
    parser.add_argument(
        "--drop-parts", metavar="PERCENT", default="0", help="drop parts under this share of a surface's area (default 0: none)"
    )
    parser.add_argument("--allow-outside", action="store_true", help="let the model use files outside its own folder")
    parser.add_argument("--where", action="append", default=[], metavar="NAME=VALUE", help="of traces, keep those with this property")


def run(args: argparse.Namespace) -> int:
    """Read, mend, write and tell; return 0."""
    weld_m, largest_m, percent = (
        float(number(text, name, whole=False))
        for text, name in ((args.weld_m, "--weld-m"), (args.fill_holes_m, "--fill-holes-m"), (args.drop_parts, "--drop-parts"))
    )
    choices = RepairChoices(weld_m, largest_m, percent / 100)
    entry = format_to(args.to)
    with ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        done = repair_model(model, choices, progress)
        written = write_repaired(done, args.out, entry, progress)
    _show(done, args.out)
    for loss in written.losses:
        print(f"not kept: {loss}")
    return 0


def _show(done: Repaired, shown: str) -> None:
    total = len(done.model.faults) + len(done.model.horizons)
    touched = len({name for name, _ in done.changes})
    print(f"{touched} of {total} surfaces changed; written to {printable(shown)}, every change in {LOG}")
    for name, change in done.changes[:MOST_LINES]:
        print(f"  {printable(name, 60)}: {change.text}")
    if len(done.changes) > MOST_LINES:
        print(f"  and {len(done.changes) - MOST_LINES} more")
