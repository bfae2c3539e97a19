"""Reading files once: what changes meanwhile, and what holds too much, is refused."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from structviz.errors import FormatError, InputError
from structviz.io import ledger, read_model, read_surfaces


def test_a_file_that_grows_while_it_is_read_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.off").write_text("OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 1\n3 0 1 2\n", encoding="utf-8")
    assert len(read_surfaces(tmp_path / "a.off")) == 1
    stat = os.fstat

    def growing(number: int) -> os.stat_result:
        seen = stat(number)
        with (tmp_path / "a.off").open("a", encoding="utf-8") as file:
            file.write("# more\n")
        return seen

    monkeypatch.setattr(ledger.os, "fstat", growing)
    with pytest.raises(InputError, match=r"a\.off: found a file that changed while it was read \(from 36 to 43 bytes\).*\n  next: wait"):
        read_surfaces(tmp_path / "a.off")


def test_cells_of_something_else_are_not_taken_for_faults(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(ledger, "MOST_SURFACES", 3)
    rows = [f"o part{k}\nv 0 0 {k}\nv 1 0 {k}\nv 0 1 {k}\nf -1 -2 -3\n" for k in range(4)]
    (tmp_path / "a.obj").write_text("".join(rows[:3]), encoding="utf-8")
    assert len(read_model(tmp_path / "a.obj").faults) == 3
    (tmp_path / "a.obj").write_text("".join(rows), encoding="utf-8")
    with pytest.raises(FormatError, match="found 4 surfaces; wanted 3 or fewer"):
        read_model(tmp_path / "a.obj")
