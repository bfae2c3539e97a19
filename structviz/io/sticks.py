"""Sticks picked on faults: which lines are sticks of which fault, tables of sticks, and what is told of their loft."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.io.ledger import Ledger
from structviz.io.lines import LineFeature
from structviz.io.tables import Row, Table, declared, down_side, read_table, required
from structviz.model import Fault
from structviz.surfaces.from_sticks import Loft, surface_from_sticks

Floats = NDArray[np.float64]

NEEDED = ("fault", "stick", "easting", "northing")
COLUMNS = (*NEEDED, "up", "depth", "sense", "rake_deg", "phase", "down_side")
HINT = "look at these sticks, and correct or delete those that are wrong"


@dataclass(frozen=True, eq=False)
class Stick:
    """One stick: where it stands, for messages, and its points (N, 3) easting, northing, up, m."""

    label: str
    points: Floats


def sticks_by_fault(
    features: Sequence[LineFeature], fault_of: Callable[[LineFeature], str], has_dip: Callable[[LineFeature], bool]
) -> dict[str, list[LineFeature]]:
    """Return the features that are sticks, by fault: two lines or more of one fault, with heights that differ, none of them with a dip."""
    groups: dict[str, list[LineFeature]] = {}
    for feature in features:
        if name := fault_of(feature):
            groups.setdefault(name, []).append(feature)
    return {name: group for name, group in groups.items() if _are_sticks(group) and not any(has_dip(feature) for feature in group)}


def _are_sticks(group: Sequence[LineFeature]) -> bool:
    heights = [line[:, 2] for feature in group for line in feature.lines]
    return len(heights) > 1 and bool(np.ptp(np.concatenate(heights)) > 0)


def is_stick_table(content: bytes) -> bool:
    """Return whether a CSV content has the columns of a table of sticks."""
    head = content[:2000].removeprefix(b"\xef\xbb\xbf").split(b"\n", 1)[0].decode("utf-8", "replace")
    cells = {cell.strip().strip('"') for delimiter in ",;\t" for cell in head.split(delimiter)}
    return {"fault", "stick"} <= cells


def faults_of_stick_table(content: bytes, file: str, ledger: Ledger) -> tuple[Fault, ...]:
    """Return the faults of a table of sticks, metres with up positive; points of a stick follow one another as in the table.

    Raises TableError for rows that cannot be used, SurfaceError for a fault of fewer than two sticks.
    """
    table = read_table(content, file, NEEDED, COLUMNS)
    if table.unknown:
        ledger.note("model", f"{file}: columns {', '.join(table.unknown)} are not used")
    faults: list[Fault] = []
    lofts: list[tuple[Loft, list[Stick]]] = []
    for name, sticks in _rows_by_fault(table).items():
        said = _said([row for rows in sticks.values() for row in rows])
        points = [Stick(f"stick {stick}", np.array([_place(row) for row in rows])) for stick, rows in sticks.items()]
        loft = surface_from_sticks([stick.points for stick in points], name=name, source=f"{file}#{name}")
        lofts.append((loft, points))
        faults.append(Fault(name, loft.surface, declared(said), said.text("phase"), down_side(said)))
    tell_lofts(lofts, file, ledger)
    return tuple(faults)


def _rows_by_fault(table: Table) -> dict[str, dict[str, list[Row]]]:
    """Return the rows of each stick of each fault, in the order of the table."""
    found: dict[str, dict[str, list[Row]]] = {}
    for row in table.rows:
        for column in ("fault", "stick"):
            if not row.text(column):
                raise row.error(f"no {column}", f"a {column}", f"fill in {column}, or delete the row")
        found.setdefault(row.text("fault"), {}).setdefault(row.text("stick"), []).append(row)
    return found


def _place(row: Row) -> tuple[float, float, float]:
    """Return easting, northing, up of a row, the last from `up` or from `depth`."""
    if row.text("up") and row.text("depth"):
        raise row.error("both up and depth", "one of the two", "delete one")
    up = -required(row, "depth") if row.text("depth") else required(row, "up")
    return required(row, "easting"), required(row, "northing"), up


def _said(rows: Sequence[Row]) -> Row:
    """Return what the rows of a fault say of its movement, as one row; TableError where two rows differ."""
    said: dict[str, str] = {}
    for row in rows:
        for column in ("sense", "rake_deg", "phase", "down_side"):
            word = row.text(column)
            if word and said.setdefault(column, word) != word:
                wanted = f"{said[column]!r}, as in the rows above of {row.text('fault')}"
                raise row.error(f"{column} {word!r}", wanted, f"give {column} once for each fault")
    return Row(rows[0].file, rows[0].where, said)


def tell_lofts(lofts: Sequence[tuple[Loft, Sequence[Stick]]], file: str, ledger: Ledger) -> None:
    """Note how many sticks were lofted and how far apart they lie, and warn of sticks that are doubtful, by fault."""
    if not lofts:
        return
    counts = [len(loft.order) for loft, _ in lofts]
    apart = np.array([np.median(loft.spacing_m) for loft, _ in lofts])
    faults, sticks = f"{len(lofts)} fault{'s' * (len(lofts) > 1)}", _span(np.array(counts))
    ledger.note("model", f"{file}: {faults} lofted between sticks: {sticks} for each, {_span(apart)} m apart in the middle of each fault")
    heights = np.concatenate([stick.points[:, 2] for _, own in lofts for stick in own])
    if heights.min() >= 0.0:
        ledger.note("model", f"{file}: no stick lies below zero", "if these are depths, turn their sign", "warning")
    for loft, own in lofts:
        name = loft.surface.name
        for message, numbers, severity in doubts(loft):
            labels = ", ".join(own[k].label for k in numbers[:8]) + (f" and {len(numbers) - 8} more" if len(numbers) > 8 else "")
            ledger.note(name, f"{message}: {labels}", HINT if severity == "warning" else "", severity)


def doubts(loft: Loft) -> list[tuple[str, tuple[int, ...], str]]:
    """Return what is odd about the sticks of a fault, the sticks concerned, and how severe it is."""
    crossing = tuple(dict.fromkeys(k for pair in loft.crossing for k in pair))
    gaps = tuple(k for pair in loft.gaps for k in pair)
    found = [
        (f"{len(loft.too_short)} of its sticks have one point and are left out", loft.too_short, "warning"),
        (f"{len(loft.repeated)} of its sticks repeat another and are left out", loft.repeated, "warning"),
        (f"{len(loft.reversed)} of its sticks run against the others and were turned", loft.reversed, "note"),
        (f"{len(loft.out_of_order)} of its sticks are given out of their order along the fault", loft.out_of_order, "note"),
        ("neighbouring sticks cross, so that the surface folds back between them", crossing, "warning"),
        ("a gap between sticks is over three times the usual", gaps, "warning"),
    ]
    if not loft.side_by_side:
        message = "its sticks do not follow one another in one row; they are joined in their order along the trend"
        found.append((message, loft.order, "warning"))
    return [entry for entry in found if entry[1]]


def _span(values: NDArray) -> str:
    low, high = float(values.min()), float(values.max())
    return f"{low:,.0f}" if round(low) == round(high) else f"{low:,.0f} to {high:,.0f}"
