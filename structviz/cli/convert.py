"""Write the surfaces of a model in another format, in metres with up positive, and say what the format cannot keep.

PATH is what `structviz check` takes. A folder gets one file a surface with a model file and a table of faults, so that
declared movements stay; a file gets all surfaces, where its format can hold them. Nothing that exists is overwritten.
"""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

from structviz.cli.choices import ending_like_an_interrupt, where_of
from structviz.cli.progress import progress_bar
from structviz.errors import ArgumentError
from structviz.io import read_model
from structviz.report.converted import Converted, convert_to_file, convert_to_folder, format_to
from structviz.report.names import printable


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the path, the target and the format."""
    parser.usage = "structviz convert PATH --out FOLDER_OR_FILE [--to SUFFIX] [options]"
    parser.add_argument("path", metavar="PATH", help="model file, table of faults, traces, mesh file, or folder")
    parser.add_argument("--out", metavar="TARGET", required=True, help="new folder, or new file with the suffix of a format")
    parser.add_argument("--to", metavar="SUFFIX", help="format of the files in a folder (default vtp)")
    parser.add_argument("--allow-outside", action="store_true", help="let the model use files outside its own folder")
    parser.add_argument("--where", action="append", default=[], metavar="NAME=VALUE", help="of traces, keep those with this property")


def run(args: argparse.Namespace) -> int:
    """Read, write and tell what was lost; return 0."""
    suffix = Path(args.out).suffix
    one_file = args.to is None and bool(suffix) and not os.path.isdir(args.out)
    entry = format_to(suffix if one_file else args.to or "vtp")
    if one_file and os.path.lexists(args.out):
        raise ArgumentError(f"--out: {printable(args.out)} exists already; wanted a new file", hint="name another, or remove that one")
    with ending_like_an_interrupt(), progress_bar() as progress:
        model = read_model(args.path, allow_outside=args.allow_outside, where=where_of(args.where), progress=progress)
        done = convert_to_file(model, args.out, entry) if one_file else convert_to_folder(model, args.out, entry, progress)
    for finding in model.findings:
        if finding.severity != "note":
            print(f"structviz: {printable(finding.subject)}: {printable(finding.message)}", file=sys.stderr)
    _show(done, entry.title, len(model.faults), len(model.horizons), args.out)
    return 0


def _show(done: Converted, title: str, faults: int, horizons: int, shown: str) -> None:
    counts = f"{faults} fault{'' if faults == 1 else 's'}" + (f" and {horizons} horizon{'' if horizons == 1 else 's'}" if horizons else "")
    print(f"{counts} written to {printable(shown)} as {title}, in metres with up positive")
    if done.losses:
        print("\n".join(["not kept:", *(f"  - {text}" for text in done.losses)]))
    else:
        print("nothing was lost: coordinates are kept to the last bit, with names")
