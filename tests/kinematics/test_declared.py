"""What a declaration says on the surface it stands on: steep faults need the side that went down."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import sector_of_rake, sector_of_words

EAST, SOUTH_WEST = np.array([1.0, 0.0, 0.02]), np.array([-0.7, -0.7, 0.02])


def test_nothing_declared_stays_nothing() -> None:
    assert usable_sector(None, "E", EAST, 89.0) == (None, "")


@pytest.mark.parametrize("text", ["normal", "normal-dextral", "sinistral-reverse"])
def test_below_85_degrees_a_word_stands_as_it_is(text: str) -> None:
    assert usable_sector(sector_of_words(text), "", EAST, 84.9) == (sector_of_words(text), "")
    assert usable_sector(sector_of_words(text), "W", EAST, 84.9) == (sector_of_words(text), "")


def test_strike_slip_and_rakes_need_no_side() -> None:
    for declared in (sector_of_words("dextral"), sector_of_rake(-85.0)):
        assert usable_sector(declared, "", EAST, 90.0) == (declared, "")


def test_a_steep_dip_slip_word_without_a_side_is_dropped_and_the_strike_slip_one_kept() -> None:
    why = "dips 85 deg: a dip-slip word needs the side that went down"
    assert usable_sector(sector_of_words("normal"), "", EAST, 85.0) == (None, why)
    assert usable_sector(sector_of_words("normal-dextral"), "", EAST, 85.0) == (sector_of_words("dextral"), why)


@pytest.mark.parametrize(
    ("normal", "side", "word"),
    [(EAST, "E", "normal"), (EAST, "W", "reverse"), (EAST, "NE", "normal"), (SOUTH_WEST, "S", "normal"), (SOUTH_WEST, "N", "reverse")],
)
def test_the_side_that_went_down_decides(normal: np.ndarray, side: str, word: str) -> None:
    for said in ("normal", "reverse"):
        assert usable_sector(sector_of_words(said), side, normal, 88.0) == (sector_of_words(word), f"{side} side down")
        both = usable_sector(sector_of_words(f"sinistral-{said}"), side, normal, 88.0)
        assert both == (sector_of_words(f"sinistral-{word}"), f"{side} side down")
