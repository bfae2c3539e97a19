"""CSV tables: read whole, with errors that name the file and the row, and cells turned into numbers and words."""

from __future__ import annotations

import csv
import difflib
import io
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from structviz.errors import ArgumentError, TableError
from structviz.kinematics.senses import COMPASS_DEG, Sector, sector_of_rake, sector_of_words

FAULT_COLUMNS = ("name", "surface", "sense", "rake_deg", "phase", "down_side")


@dataclass(frozen=True)
class Row:
    """One row of a table, or one entry of a model file: where it stands and its cells by column, trimmed."""

    file: str
    where: str  # "row 3", as a spreadsheet counts; or "fault 2"
    cells: dict[str, str]

    def text(self, column: str) -> str:
        """Return the cell of a column, "" where there is none."""
        return self.cells.get(column, "")

    def error(self, found: str, wanted: str, hint: str) -> TableError:
        """Return an error about this row."""
        return TableError(f"{self.file}, {self.where}", found, wanted, hint=hint)


@dataclass(frozen=True)
class Table:
    """The rows of a CSV file and the columns that structviz does not know."""

    rows: tuple[Row, ...]
    unknown: tuple[str, ...]


def nearest(word: str, known: Iterable[str]) -> str:
    """Return an offer of the nearest known word, "" where none is near.

    >>> nearest("sence", ["sense", "name"])
    "did you mean 'sense'? "
    """
    near = difflib.get_close_matches(word, list(known), n=1, cutoff=0.5)
    return f"did you mean {near[0]!r}? " if near else ""


def read_table(content: bytes, file: str, needed: Sequence[str], known: Sequence[str], aliases: Mapping[str, str] | None = None) -> Table:
    """Return the rows of a CSV file that is parted by commas, semicolons or tabs; blank rows are passed over.

    `aliases` gives our name of columns that others call differently.
    Raises TableError where the text cannot be read, a needed column is missing, a column comes twice, or there is no row.
    """
    text = decoded(content, file)
    lines = list(parsed_lines(text, file))
    if not lines:
        raise TableError(
            file, "an empty table", f"a header with {', '.join(needed)}", hint="write a header, and a row below it for each entry"
        )
    (_, header), body = lines[0], lines[1:]
    header = [(aliases or {}).get(cell.strip(), cell.strip()) for cell in header]
    check_header(header, file, needed, known)
    if not body:
        raise TableError(file, "a header and no rows", "one row or more", hint="write one row below the header for each entry")
    rows = tuple(row_of(file, number, cells, header) for number, cells in body)
    return Table(rows, tuple(column for column in header if column and column not in known))


def decoded(content: bytes, file: str) -> str:
    """Return the text of a table; TableError where it is not UTF-8."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        hint = "save the table as CSV UTF-8"
        raise TableError(file, f"a byte that is not UTF-8 (at {error.start})", "a CSV table in UTF-8", hint=hint) from None
    if "\0" in text:
        raise TableError(file, "binary content", "a CSV table in UTF-8", hint="save the table as CSV UTF-8")
    return text


def parsed_lines(text: str, file: str) -> Iterable[tuple[int, list[str]]]:
    """Yield the line number and the cells of each line that is not blank."""
    head = text.split("\n", 1)[0]
    delimiter = max(",;\t", key=head.count)
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, skipinitialspace=True, strict=True)
    try:
        for cells in reader:
            if any(cell.strip() for cell in cells):
                yield reader.line_num, cells
    except csv.Error as error:
        raise TableError(
            f"{file}, row {reader.line_num}", f"a row that cannot be parted ({error})", "CSV", hint="check its quotes"
        ) from None


def check_header(header: list[str], file: str, needed: Sequence[str], known: Sequence[str]) -> None:
    """Raise TableError where a needed column is missing or a column comes twice."""
    for column in needed:
        if column not in header:
            near = difflib.get_close_matches(column, [c for c in header if c not in known], n=1, cutoff=0.6)
            hint = f"rename the column {near[0]!r} to {column!r}" if near else f"add a column {column!r}"
            raise TableError(file, f"columns {', '.join(filter(None, header))}", f"a column {column!r}", hint=hint)
    twice = next((column for column in header if column and header.count(column) > 1), None)
    if twice is not None:
        raise TableError(file, f"two columns {twice!r}", "each column once", hint="rename or delete one of them")


def row_of(file: str, number: int, cells: list[str], header: list[str]) -> Row:
    """Return one row; TableError where it has more cells than the header."""
    if any(cell.strip() for cell in cells[len(header) :]):
        hint = "put quotes round a cell that holds the separator"
        raise TableError(f"{file}, row {number}", f"{len(cells)} cells", f"{len(header)}, as in the header", hint=hint)
    return Row(file, f"row {number}", {column: cell.strip() for column, cell in zip(header, cells) if column})


def number(row: Row, column: str, low: float = -math.inf, high: float = math.inf) -> float | None:
    """Return the number in a cell, None where it is empty; TableError where it is no finite number within [low, high]."""
    text = row.text(column)
    if not text:
        return None
    try:
        value = float(text.replace("_", "?"))  # float() would take 1_000 for a thousand
    except ValueError:
        hint = "write a number with a decimal point, without unit"
        raise row.error(f"{column} {text!r}", "a number", hint) from None
    if not math.isfinite(value) or not low <= value <= high:
        raise row.error(f"{column} {text}", span(low, high), f"correct {column} in that row")
    return value


def span(low: float, high: float) -> str:
    """Return a range in words."""
    if math.isinf(low):
        return "a finite number"
    return f"{low:g} or more" if math.isinf(high) else f"{low:g} to {high:g}"


def required(row: Row, column: str, low: float = -math.inf, high: float = math.inf) -> float:
    """Return the number in a cell that may not be empty."""
    value = number(row, column, low, high)
    if value is None:
        raise row.error(f"no {column}", "a number", f"fill in {column}, or delete the row")
    return value


def declared(row: Row) -> Sector | None:
    """Return the declared movement of a row: its sense or its rake; None where neither is given."""
    sense, rake_deg = row.text("sense"), number(row, "rake_deg", -180.0, 180.0)
    if sense and rake_deg is not None:
        raise row.error(f"both sense {sense!r} and rake_deg {rake_deg:g}", "one of the two", "delete one: a rake is the more exact")
    if rake_deg is not None:
        return sector_of_rake(rake_deg)
    return sense_of(row) if sense else None


def sense_of(row: Row) -> Sector:
    """Return the sector of the sense words of a row; TableError offers the nearest word."""
    try:
        return sector_of_words(row.text("sense"))
    except ArgumentError as error:
        found, _, wanted = error.message.removeprefix("sense: found ").partition("; wanted ")
        raise row.error(f"sense {found}", wanted, error.hint) from None


def down_side(row: Row) -> str:
    """Return the compass word of the side that went down, in capitals, "" where none is given."""
    word = row.text("down_side").upper()
    if word and word not in COMPASS_DEG:
        hint = f"{nearest(word, COMPASS_DEG)}give the side that went down as a compass word"
        raise row.error(f"down_side {row.text('down_side')!r}", f"one of {', '.join(COMPASS_DEG)}", hint)
    return word
