"""Tables of an analysis: one NumPy array a column, as CSV text, and as DataFrames where pandas is installed.

In CSV, text that begins with = + - @ (or a tab or line end) is written with an apostrophe before it, because spreadsheets
take such cells for formulas. The arrays and DataFrames hold the text as it was given.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.errors import StructvizError
from structviz.kinematics.senses import describe_rake
from structviz.orientation.lines import trend_plunge_deg
from structviz.report.results_json import azimuth, rake, rounded
from structviz.scenarios import Sensitivity

if TYPE_CHECKING:
    import pandas

Table = dict[str, NDArray]
FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n")

Column = tuple[str, Callable[[FaultResult], object]]
FAULT_COLUMNS: tuple[Column, ...] = (
    ("name", lambda r: r.fault.name),
    ("verdict", lambda r: r.verdict.word),
    ("declared", lambda r: r.fault.declared.text if r.fault.declared else ""),
    ("predicted", lambda r: "" if r.verdict.predicted_rake_deg is None else describe_rake(r.verdict.predicted_rake_deg)),
    ("conflict_probability", lambda r: rounded(r.verdict.conflict_probability, 4)),
    ("misfit_deg", lambda r: rounded(r.verdict.misfit_deg, 2)),
    ("predicted_rake_deg", lambda r: rake(r.verdict.predicted_rake_deg)),
    ("predicted_rake_spread_deg", lambda r: rounded(r.verdict.predicted_rake_spread_deg, 2)),
    ("slip_tendency", lambda r: rounded(r.verdict.slip_tendency, 4)),
    ("strike_deg", lambda r: azimuth(r.measured.strike_deg) if r.measured.meaningful else None),
    ("dip_deg", lambda r: rounded(r.measured.dip_deg, 2) if r.measured.meaningful else None),
    ("cone_deg", lambda r: rounded(r.measured.cone_deg, 2) if r.measured.meaningful else None),
    ("area_m2", lambda r: rounded(r.measured.area_m2, 1)),
    ("parts", lambda r: len(r.measured.parts)),
    ("triangles", lambda r: len(r.measured.areas_m2)),
    ("phase", lambda r: r.fault.phase),
    ("reasons", lambda r: "; ".join(r.verdict.reasons)),
    ("causes", lambda r: "; ".join(cause.text for cause in r.verdict.causes)),
)
TEXT = {"name", "verdict", "declared", "predicted", "phase", "reasons", "causes"}
WHOLE = {"parts", "triangles"}


def fault_table(analysis: Analysis) -> Table:
    """Return one row a fault in the order of the model, column -> array; degrees and square metres, NaN where not known."""
    return {name: _array(name, [value(result) for result in analysis.faults]) for name, value in FAULT_COLUMNS}


def pair_table(analysis: Analysis) -> Table:
    """Return one row a pair, heaviest first, column -> array; degrees and metres."""
    pairs = analysis.pairs
    names = np.array([result.fault.name for result in analysis.faults], dtype=str)
    numbers = pairs.faults.reshape(-1, 2).astype(int)
    table: Table = {
        "first": names[numbers[:, 0]],
        "second": names[numbers[:, 1]],
        "acute_deg": np.round(pairs.acute_deg, 2),
        "kind": np.where(pairs.obtuse, "obtuse", "acute"),
        "weight": np.round(pairs.weight, 4),
        "distance_m": np.round(pairs.distance_m, 1),
    }
    if len(pairs):
        trends, plunges = trend_plunge_deg(pairs.axes)
    else:
        trends = plunges = np.zeros((0, 3))
    for k, axis in enumerate(("sigma1", "sigma2", "sigma3")):
        table[f"{axis}_trend_deg"] = np.round(trends[:, k], 2) % 360.0
        table[f"{axis}_plunge_deg"] = np.round(plunges[:, k], 2)
    for k, direction in enumerate(("easting_m", "northing_m", "up_m")):
        table[direction] = np.round(pairs.places.reshape(-1, 3)[:, k], 1)
    return table


def csv_text(table: Mapping[str, NDArray]) -> str:
    """Return a table as CSV: a header, commas, one line a row; an empty cell where a number is not known."""
    written = io.StringIO()
    rows = list(zip(*(_cells(column) for column in table.values())))
    # The writer leaves a bare carriage return unquoted, and readers would end the row there.
    returns = any("\r" in cell for row in rows for cell in row if isinstance(cell, str))
    writer = csv.writer(written, lineterminator="\n", quoting=csv.QUOTE_NONNUMERIC if returns else csv.QUOTE_MINIMAL)
    writer.writerow(table)
    writer.writerows(rows)
    return written.getvalue()


def data_frame(table: Mapping[str, NDArray]) -> pandas.DataFrame:
    """Return a table as a pandas DataFrame; StructvizError where pandas is not installed."""
    try:
        import pandas
    except ImportError:
        raise StructvizError("pandas is not installed", hint="pip install 'structviz[tables]', or use the arrays as they are") from None
    return pandas.DataFrame(dict(table))


def _array(name: str, values: list) -> NDArray:
    if name in TEXT:
        return np.array(values, dtype=str)
    if name in WHOLE:
        return np.array(values, dtype=np.int64)
    return np.array([np.nan if value is None else value for value in values], dtype=float)


def _cells(column: NDArray) -> list:
    """Return the values of a column as CSV shows them."""
    values = column.tolist()
    if column.dtype.kind == "U":
        return [f"'{text}" if text.startswith(FORMULA_STARTS) else text for text in values]
    return ["" if math.isnan(value) else value for value in values] if column.dtype.kind == "f" else values


def sensitivity_table(depends: Sensitivity) -> Table:
    """Return one row a fault: its verdict as chosen and under every other choice, and on which choices it depends."""
    names = list(depends.base.words)
    on = {each.fault: " ".join(each.on) for each in depends.dependences}
    columns: Table = {"name": np.array(names, object), "as chosen": np.array(list(depends.base.words.values()), object)}
    for each in depends.scenarios:
        columns[each.text] = np.array([each.words.get(name, "") for name in names], object)
    columns["depends on"] = np.array([on.get(name, "") for name in names], object)
    return columns
