"""Sense words and rakes as sectors: every word and pair of words, the edges of the range, opposites, and words of a rake."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from structviz.errors import ArgumentError
from structviz.kinematics.senses import OPPOSITE, RAKE_OF_WORD, Sector, describe_rake, nearest_word, sector_of_rake, sector_of_words

# Aki and Richards: rake is the angle of hanging-wall slip from the strike, up the dip positive.
TWO_WORDS = {
    ("reverse", "sinistral"): 45.0,
    ("reverse", "dextral"): 135.0,
    ("normal", "sinistral"): -45.0,
    ("normal", "dextral"): -135.0,
}


@pytest.mark.parametrize(("words", "rake"), TWO_WORDS.items())
def test_two_words_are_a_quadrant_whichever_comes_first(words: tuple[str, str], rake: float) -> None:
    for first, second in itertools.permutations(words):
        assert sector_of_words(f"{first}-{second}") == Sector(rake, 45.0, (first, second))


@pytest.mark.parametrize("word", RAKE_OF_WORD)
def test_one_word_is_a_half_plane(word: str) -> None:
    assert sector_of_words(f" {word.upper()} ") == Sector(RAKE_OF_WORD[word], 90.0, (word,))


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("sinstral", "did you mean 'sinistral'\\? correct the word"),
        ("xyz", "next: correct the word, or leave it empty"),
        ("normal-reverse", "wanted one dip-slip and one strike-slip word, dominant first\n  next: write for example"),
        ("sinistral-dextral", "wanted one dip-slip and one strike-slip word"),
        ("normal-dextral-reverse", "wanted one dip-slip and one strike-slip word"),
    ],
)
def test_other_words_are_refused_with_the_nearest(text: str, said: str) -> None:
    with pytest.raises(ArgumentError, match=said) as caught:
        sector_of_words(text)
    assert str(caught.value).startswith(f"sense: found '{text}'; wanted one")


@pytest.mark.parametrize("rake", [-180.0, -179.5, 0.0, 90.0, 180.0])
def test_a_rake_is_a_sector_of_45_degrees_either_side(rake: float) -> None:
    assert sector_of_rake(rake) == Sector(180.0 if rake == -180.0 else rake, 45.0)


@pytest.mark.parametrize("rake", [-180.5, 180.5, np.nan])
def test_a_rake_beyond_the_circle_is_refused(rake: float) -> None:
    with pytest.raises(ArgumentError, match=f"rake_deg: found {rake:g}; wanted -180 to 180 degrees\n  next: 0 sinistral, 90 reverse"):
        sector_of_rake(rake)


@pytest.mark.parametrize("text", [*RAKE_OF_WORD, "normal-sinistral", "dextral-reverse"])
def test_the_opposite_turns_slip_round_and_back(text: str) -> None:
    sector = sector_of_words(text)
    other = sector.opposite()
    assert abs((other.rake_deg - sector.rake_deg) % 360.0 - 180.0) < 1e-9
    assert -180.0 < other.rake_deg <= 180.0
    assert other.half_width_deg == sector.half_width_deg
    assert other.words == tuple(OPPOSITE[word] for word in sector.words)
    assert other.opposite() == sector
    assert other.rake_deg == sector_of_words(other.text).rake_deg


def test_the_opposite_of_a_rake_stays_in_range() -> None:
    for rake in (-179.0, -0.5, 0.0, 0.5, 180.0):
        assert sector_of_rake(rake).opposite().rake_deg == (rake - 180.0 if rake > 0 else rake + 180.0)


def test_words_of_every_rake() -> None:
    for rake in np.arange(-180.0, 180.5, 2.5):
        off = {word: abs((rake - middle + 540.0) % 360.0 - 180.0) for word, middle in RAKE_OF_WORD.items()}
        nearest = sorted(off.values())
        text = describe_rake(float(rake))
        assert off[nearest_word(float(rake))] == nearest[0]
        assert off[text.split("-")[0]] == nearest[0]
        assert ("-" in text) == (nearest[0] > 22.5)
        if "-" in text and nearest[1] < nearest[2]:
            assert off[text.split("-")[1]] == nearest[1]


def test_the_text_of_a_sector_is_what_a_model_file_would_say() -> None:
    assert sector_of_words("dextral-normal").text == "dextral-normal"
    assert sector_of_rake(-82.5).text == "rake -82.5"
