"""Declared movement: words or a rake become a sector of rakes on the plane."""

from __future__ import annotations

import difflib
from dataclasses import dataclass

from structviz.errors import ArgumentError

RAKE_OF_WORD = {"normal": -90.0, "reverse": 90.0, "sinistral": 0.0, "dextral": 180.0}  # [aki1980]
OPPOSITE = {"normal": "reverse", "reverse": "normal", "sinistral": "dextral", "dextral": "sinistral"}
DIP_SLIP = ("normal", "reverse")
COMPASS_DEG = {
    "N": 0.0, "NNE": 22.5, "NE": 45.0, "ENE": 67.5, "E": 90.0, "ESE": 112.5, "SE": 135.0, "SSE": 157.5,
    "S": 180.0, "SSW": 202.5, "SW": 225.0, "WSW": 247.5, "W": 270.0, "WNW": 292.5, "NW": 315.0, "NNW": 337.5,
}  # fmt: skip


@dataclass(frozen=True)
class Sector:
    """A declared movement: slip within half_width_deg of rake_deg on the plane is what was declared."""

    rake_deg: float  # centre, (-180, 180]
    half_width_deg: float  # 90 for one word, 45 for two, 45 for a rake
    words: tuple[str, ...] = ()

    @property
    def text(self) -> str:
        """The declaration as it would be written in a model file."""
        return "-".join(self.words) if self.words else f"rake {self.rake_deg:g}"

    def opposite(self) -> Sector:
        """Return the sector of the reversed movement (each word swapped for its opposite)."""
        rake = self.rake_deg - 180.0 if self.rake_deg > 0 else self.rake_deg + 180.0
        return Sector(rake, self.half_width_deg, tuple(OPPOSITE[word] for word in self.words))


def sector_of_words(text: str) -> Sector:
    """Return the sector of a sense word or of two joined, dominant first; ArgumentError offers the nearest word.

    >>> sector_of_words("normal-sinistral").rake_deg
    -45.0
    >>> sector_of_words("dextral").half_width_deg
    90.0
    """
    words = tuple(word.strip() for word in text.strip().lower().split("-"))
    for word in words:
        if word not in RAKE_OF_WORD:
            near = difflib.get_close_matches(word, RAKE_OF_WORD, n=1, cutoff=0.4)
            offer = f"did you mean {near[0]!r}? " if near else ""
            raise ArgumentError(
                f"sense: found {text!r}; wanted one of {', '.join(RAKE_OF_WORD)}, or two joined such as 'normal-sinistral'",
                hint=f"{offer}correct the word, or leave it empty where the sense is not known",
            )
    if len(words) == 1:
        return Sector(RAKE_OF_WORD[words[0]], 90.0, words)
    if len(words) != 2 or (words[0] in DIP_SLIP) == (words[1] in DIP_SLIP):
        raise ArgumentError(
            f"sense: found {text!r}; wanted one dip-slip and one strike-slip word, dominant first",
            hint="write for example 'normal-sinistral' or 'dextral-reverse'",
        )
    dip_slip, strike_slip = (words[0], words[1]) if words[0] in DIP_SLIP else (words[1], words[0])
    middle = {"sinistral": 45.0, "dextral": 135.0}[strike_slip]
    return Sector(middle if dip_slip == "reverse" else -middle, 45.0, words)


def sector_of_rake(rake_deg: float) -> Sector:
    """Return the sector about a declared rake, degrees within [-180, 180]."""
    if not -180.0 <= rake_deg <= 180.0:
        raise ArgumentError(
            f"rake_deg: found {rake_deg:g}; wanted -180 to 180 degrees", hint="0 sinistral, 90 reverse, 180 dextral, -90 normal"
        )
    return Sector(180.0 if rake_deg == -180.0 else float(rake_deg), 45.0)


def nearest_word(rake_deg: float) -> str:
    """Return the sense word nearest to a rake, degrees.

    >>> nearest_word(-100.0), nearest_word(170.0)
    ('normal', 'dextral')
    """
    return min(RAKE_OF_WORD, key=lambda word: abs((rake_deg - RAKE_OF_WORD[word] + 180.0) % 360.0 - 180.0))


def describe_rake(rake_deg: float) -> str:
    """Return a rake in words: one word within 22.5 degrees of it, else two, dominant first.

    >>> describe_rake(-85.0), describe_rake(-60.0), describe_rake(150.0)
    ('normal', 'normal-sinistral', 'dextral-reverse')
    """
    ranked = sorted(RAKE_OF_WORD, key=lambda word: abs((rake_deg - RAKE_OF_WORD[word] + 180.0) % 360.0 - 180.0))
    first, second = ranked[:2]
    off = abs((rake_deg - RAKE_OF_WORD[first] + 180.0) % 360.0 - 180.0)
    return first if off <= 22.5 else f"{first}-{second}"
