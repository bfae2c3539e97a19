"""List what is checked, why, and from which limit on. Change a limit with `structviz check PATH --limit KEY=VALUE`."""

from __future__ import annotations

import argparse
import difflib
import shutil
import textwrap

from structviz.checks import CHECKS, Check
from structviz.errors import ArgumentError
from structviz.references import REFERENCES


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the choice of one check."""
    parser.add_argument("key", nargs="?", metavar="KEY", help="show only this check, with its source")


def run(args: argparse.Namespace) -> int:
    """Print the checks by key and return 0."""
    if args.key is not None and args.key not in CHECKS:
        near = difflib.get_close_matches(args.key, CHECKS, n=1)
        offer = f"did you mean {near[0]!r}?" if near else "structviz checks lists the keys"
        raise ArgumentError(f"found the check {args.key!r}; wanted the key of a check", hint=offer)
    for key in [args.key] if args.key else sorted(CHECKS):
        _print(CHECKS[key], with_source=bool(args.key))
    return 0


def _print(row: Check, *, with_source: bool) -> None:
    width = min(shutil.get_terminal_size().columns, 100)
    limit = f"limit {row.limit:g} {row.unit}".rstrip()
    print(f"{row.key}  ({limit})")
    texts = [row.title, row.why]
    if with_source:
        texts += [f"next: {row.hint}", f"source: {REFERENCES[row.source]}" if row.source else "source: common practice"]
    for text in texts:
        print(textwrap.fill(text, width, initial_indent="    ", subsequent_indent="    "))
