"""Lines of text that several pictures share."""

from __future__ import annotations

from structviz.analysis import Analysis

COUNTS = {2: "Two", 3: "Three"}
WORDS = ("conflicting", "undetermined", "consistent")
DEPTH = {word: depth for depth, word in enumerate(reversed(WORDS))}  # what matters most is drawn last, or stands outermost


def regime_line(analysis: Analysis) -> str:
    """Return the regime in one line: class, SHmax and its interval; or that none could be inferred."""
    if not analysis.regimes:
        return "No stress regime could be inferred"
    if len(analysis.regimes) > 1:
        many = COUNTS.get(len(analysis.regimes), "Several")
        return f"{many} parts, each under its stress" if analysis.answer and analysis.answer.by == "place" else f"{many} phases of faulting"
    regime = analysis.regimes[0]
    kind = "Undefined class of stress" if regime.kind == "undefined" else f"{regime.kind.capitalize()} faulting"
    return f"{kind}, SHmax {round(regime.shmax_deg) % 180:03d} \u00b1 {regime.shmax_half_width_deg:.0f}\u00b0"


def model_line(analysis: Analysis) -> str:
    """Return the title of the model; where there are several phases, what each is stands before it."""
    if len(analysis.regimes) < 2:
        return analysis.model.title
    phases = (f"({k}) {r.kind}, SHmax {round(r.shmax_deg) % 180:03d}\u00b0" for k, r in enumerate(analysis.regimes, 1))
    return f"{'; '.join(phases)}   {analysis.model.title}"


def count_line(analysis: Analysis) -> tuple[tuple[str, int], ...]:
    """Return how many faults have each verdict, worst first."""
    words = [result.verdict.word for result in analysis.faults]
    return tuple((word, words.count(word)) for word in WORDS)


def shortened(name: str, most: int = 26) -> str:
    """Return a name shortened before its end, where names of one family differ, without control characters.

    >>> shortened("SURVEY-SOUTH-Long_name_of_a_fault", 20)
    'SURV\u2026name of a fault'
    """
    clean = "".join(c if c.isprintable() else "\ufffd" for c in name).replace("_", " ")
    if len(clean) <= most:
        return clean
    head = most // 5
    return clean[:head] + "\u2026" + clean[head + 1 - most :]
