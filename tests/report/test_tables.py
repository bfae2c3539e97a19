"""The tables: arrays, CSV that no spreadsheet runs, DataFrames."""

from __future__ import annotations

import csv
import io
import sys

import numpy as np
import pytest

from structviz.analysis import Analysis
from structviz.errors import StructvizError
from structviz.orientation.lines import vectors
from structviz.report.tables import csv_text, data_frame, fault_table, pair_table


def read_back(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline="")))


def test_one_row_a_fault_with_numbers_as_numbers(analysis: Analysis) -> None:
    table = fault_table(analysis)
    assert {len(column) for column in table.values()} == {len(analysis.faults)}
    assert table["name"].tolist() == [result.fault.name for result in analysis.faults]
    assert table["dip_deg"].dtype == float
    assert table["triangles"].dtype.kind == "i"
    assert np.isnan(table["misfit_deg"][-1]), "nothing was declared on the last fault"


def test_pairs_name_their_faults_and_keep_their_axes(analysis: Analysis) -> None:
    table = pair_table(analysis)
    assert len(table["first"]) == len(analysis.pairs) > 0
    assert table["first"][0] == analysis.faults[analysis.pairs.faults[0, 0]].fault.name
    axes = vectors(table["sigma3_trend_deg"], table["sigma3_plunge_deg"])
    assert np.abs((axes * analysis.pairs.axes[:, 2]).sum(1)) == pytest.approx(1, abs=1e-6)


def test_no_pairs_give_a_header_alone(no_stress: Analysis) -> None:
    text = csv_text(pair_table(no_stress))
    assert text.startswith("first,second,acute_deg")
    assert text.count("\n") == 1


def test_csv_holds_every_value_and_no_formula(analysis: Analysis) -> None:
    rows = read_back(csv_text(fault_table(analysis)))
    names = [row["name"] for row in rows]
    assert "'=cmd|' /C calc'!A0" in names
    assert "new\nline" in names
    assert not [cell for row in rows for cell in (row["name"], row["reasons"], row["causes"]) if cell[:1] in "=+-@\t\r" and cell]
    assert rows[-1]["misfit_deg"] == ""
    assert [float(row["area_m2"]) for row in rows] == fault_table(analysis)["area_m2"].tolist()


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r", "\n"])
def test_each_start_of_a_formula_is_guarded(start: str) -> None:
    assert read_back(csv_text({"name": np.array([f"{start}1+1"])}))[0]["name"] == f"'{start}1+1"


def test_numbers_are_left_alone_and_unknown_ones_empty() -> None:
    table = {"name": np.array(["a", "b"]), "rake_deg": np.array([-90.0, np.nan]), "parts": np.array([-1, 2])}
    assert csv_text(table) == "name,rake_deg,parts\na,-90.0,-1\nb,,2\n"


def test_data_frame_holds_the_same(analysis: Analysis) -> None:
    table = fault_table(analysis)
    frame = data_frame(table)
    assert list(frame.columns) == list(table)
    assert (frame["name"].to_numpy() == table["name"]).all()


def test_without_pandas_it_says_what_to_install(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "pandas", None)
    with pytest.raises(StructvizError, match=r"pandas is not installed\n  next: pip install"):
        data_frame(fault_table(analysis))
