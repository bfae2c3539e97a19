"""Names from users' files, printed and turned into file names."""

from __future__ import annotations

import unicodedata

from hypothesis import given
from hypothesis import strategies as st

from structviz.report.names import RESERVED, file_stems, printable


@given(st.lists(st.text(max_size=200), max_size=12))
def test_file_names_are_safe_and_all_different(names: list[str]) -> None:
    stems = file_stems(names)
    assert len({stem.casefold() for stem in stems}) == len(names)
    for stem in stems:
        assert set(stem) <= set("ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789._-")
        assert stem[0] not in ".-_"
        assert len(stem) <= 100
        assert stem.split(".")[0].casefold() not in RESERVED


@given(st.text(), st.integers(1, 40))
def test_printed_text_moves_no_cursor(text: str, most: int) -> None:
    shown = printable(text, most)
    assert len(shown) <= most
    assert not [letter for letter in shown if unicodedata.category(letter)[0] == "C"]


def test_ordinary_names_stay_as_they_are() -> None:
    assert printable("Åre–Söder 断层 (West)") == "Åre–Söder 断层 (West)"
    assert file_stems(["North-Boundary_2.b", "Søre vest"]) == ["North-Boundary_2.b", "Sre_vest"]


def test_a_name_made_unique_does_not_take_that_of_another() -> None:
    assert file_stems(["a", "A", "a_2"]) == ["a", "A_2", "a_2_2"]
