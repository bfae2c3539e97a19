"""List what is checked, why, and from which limit on. Change a limit with `structviz check PATH --limit KEY=VALUE`."""

from __future__ import annotations

import argparse
import shutil
import textwrap

from structviz.checks import CHECKS
from structviz.references import REFERENCES


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the choice of one check."""
    parser.add_argument("key", nargs="?", metavar="KEY", choices=[*CHECKS, None], help="show only this check")


def run(args: argparse.Namespace) -> int:
    """Print the checks by key and return 0."""
    width = min(shutil.get_terminal_size().columns, 100)
    for key in [args.key] if args.key else sorted(CHECKS):
        row = CHECKS[key]
        limit = f"limit {row.limit:g} {row.unit}".rstrip()
        source = f" [{REFERENCES[row.source]}]" if row.source else ""
        print(f"{key}  ({limit})")
        for text in (row.title, row.why + source):
            print(textwrap.fill(text, width, initial_indent="    ", subsequent_indent="    "))
    return 0
