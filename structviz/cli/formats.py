"""List the file formats that can be read and written, and what each cannot hold."""

from __future__ import annotations

import argparse

from structviz.io import FORMATS
from structviz.io.line_files import SHOWN as LINE_FORMATS


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add nothing: the list is all there is."""


def run(args: argparse.Namespace) -> int:
    """Print the table of formats and return 0."""
    rows = [("format", "suffixes", "", "cannot hold")]
    for entry in FORMATS:
        ways = "read, write" if entry.write or entry.write_model else "read"
        rows.append((entry.title, " ".join(entry.suffixes), ways, ", ".join(entry.cannot_store) or "-"))
    widths = [max(len(row[k]) for row in rows) for k in range(3)]
    for row in rows:
        print("  ".join(cell.ljust(width) for cell, width in zip(row, [*widths, 0])).rstrip())
    print("\nA model is a model file (.toml), a table of faults (.csv), one mesh file, or a folder of these.")
    print(f"Fault traces and sticks: lines in {LINE_FORMATS};\nsticks also in a table (.csv) of fault, stick, easting, northing, up.")
    return 0
