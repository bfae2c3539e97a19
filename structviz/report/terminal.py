"""Pieces of text for the terminal: lines, headings, tables without lines, names cut to fit."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from structviz.report.names import printable

if TYPE_CHECKING:
    from rich.console import RenderableType
    from rich.table import Table


def middle_cut(name: str, most: int) -> str:
    """Return a name with its middle left out where it is longer than `most`: names of one model differ towards the end.

    >>> middle_cut("MJVA-CREC-EMRS-Emerson_fault-CFM5", 20)
    'MJVA-…son_fault-CFM5'
    """
    clean = printable(name)
    if len(clean) <= most:
        return clean
    head = (most - 1) // 4 + 1
    return f"{clean[:head]}…{clean[len(clean) - (most - 1 - head) :]}"


def line(*pieces: tuple[str, str], indent: int = 0) -> RenderableType:
    """Return a line of (text, style) pieces that wraps with a hanging indent."""
    from rich.padding import Padding
    from rich.text import Text

    text = Text.assemble(*pieces, overflow="fold")
    return Padding(text, (0, 0, 0, indent), expand=False) if indent else text


def heading(text: str, style: str = "bold") -> Iterator[RenderableType]:
    yield line(("", ""))
    yield line((text, style))


def grid(*sides: str) -> Table:
    """Return a table without lines, indented by two, its columns aligned "left" or "right"; only the last one wraps."""
    from rich.table import Table

    table = Table.grid(padding=(0, 2, 0, 0))
    table.add_column(width=0)
    for number, side in enumerate(sides):
        table.add_column(justify="right" if side == "right" else "left", overflow="fold", no_wrap=number < len(sides) - 1)
    return table


def row(table: Table, *cells: str | tuple[str, str]) -> None:
    from rich.text import Text

    pairs = [(cell, "") if isinstance(cell, str) else cell for cell in cells]
    table.add_row("", *(Text(text, style=style, overflow="ellipsis") for text, style in pairs))


def counted(number: int, one: str) -> str:
    return f"{number:,} {one}{'' if number == 1 else 's'}"
