"""Lines of text that several pictures share."""

from __future__ import annotations

from structviz.analysis import Analysis

WORDS = ("conflicting", "undetermined", "consistent")


def regime_line(analysis: Analysis) -> str:
    """Return the regime in one line: class, SHmax and its interval; or that none could be inferred."""
    if not analysis.regimes:
        return "No stress regime could be inferred"
    regime = analysis.regimes[0]
    kind = "Undefined class of stress" if regime.kind == "undefined" else f"{regime.kind.capitalize()} faulting"
    return f"{kind}, SHmax {round(regime.shmax_deg) % 180:03d} \u00b1 {regime.shmax_half_width_deg:.0f}\u00b0"


def count_line(analysis: Analysis) -> tuple[tuple[str, int], ...]:
    """Return how many faults have each verdict, worst first."""
    words = [result.verdict.word for result in analysis.faults]
    return tuple((word, words.count(word)) for word in WORDS)


def shortened(name: str, most: int = 26) -> str:
    """Return a name shortened in its middle, without control characters.

    >>> shortened("a-very-long-name-of-a-fault-surface-file", 20)
    'a-very-lo\u2026rface-file'
    """
    clean = "".join(c if c.isprintable() else "\ufffd" for c in name)
    if len(clean) <= most:
        return clean
    tail = most // 2
    return clean[: most - tail - 1] + "\u2026" + clean[-tail:]
