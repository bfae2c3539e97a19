"""Colours and line styles. Chosen by lightness first, so that verdicts and axes stay apart in grey and for colour-blind eyes."""

from __future__ import annotations

from dataclasses import dataclass

PAPER = "#fbfaf7"
INK = "#22303c"
FAINT = "#9aa5ad"
HAIR = "#d9d7d0"


@dataclass(frozen=True)
class Look:
    """How a verdict is drawn; width and dash carry it where colour cannot."""

    colour: str
    width: float
    dash: tuple[float, ...]  # empty for a full line


# Lightness (CIE L*): 61, 40, 83.
VERDICTS = {
    "consistent": Look("#7b98a8", 0.8, ()),
    "conflicting": Look("#a33a1c", 2.2, ()),
    "undetermined": Look("#d9cba6", 1.0, (4.0, 2.5)),
}


@dataclass(frozen=True)
class PhaseLook:
    """How the axes of one phase are drawn on the net: filled with a full cone, or hollow with a dashed one."""

    filled: bool
    line: str


PHASE_LOOKS = (PhaseLook(True, "-"), PhaseLook(False, "--"), PhaseLook(False, ":"))
SIGMA = ("#22303c", "#7a6a8e", "#d9a12b")  # sigma1 dark, sigma2 middling, sigma3 light
GLYPH = {"lens": "#e2c37f", "thumb": SIGMA[0]}  # the lens stands off the paper in grey, and is no colour of a verdict
