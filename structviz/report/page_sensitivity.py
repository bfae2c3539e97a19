"""What the answer depends on, as HTML: verdicts that change with a choice, every run tried, and the faults that carry the stress."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Sequence

from structviz.analysis import Analysis
from structviz.report import page_words as words
from structviz.report.markup import Markup, element, given, joined, plain, table
from structviz.scenarios import Scenario, Sensitivity

MOST_CARRIERS = 6
LEAST_TURN_DEG = 0.5  # a fault that turns the axes by less carries no more than its share
MOST_NAMES = 5


def sensitivity_part(analysis: Analysis, depends: Sensitivity | None) -> Markup:
    """Return the section on what the answer depends on; nothing where that was not asked."""
    if depends is None:
        return Markup("")
    tried = words.counted(len(depends.scenarios), "other choice")
    changed = len({each.fault for each in depends.dependences})
    some = "1 verdict depends" if changed == 1 else f"{changed:,} verdicts depend" if changed else "no verdict depends"
    lead = f"{tried} tried: {some} on {'one' if changed else 'any'} of them."
    told = element("ul", [element("li", each) for each in _dependences(depends)]) if changed else ""
    runs = [_run(depends, each) for each in (depends.base, *depends.scenarios)]
    head = ("choice", "class", "SHmax", "verdicts that change")
    return joined(element("p", lead, class_="lead"), told, table(head, runs, numeric=(2,)), _carriers(analysis, depends))


def _dependences(depends: Sensitivity) -> Iterator[Markup]:
    """Return the faults of each way in which a verdict changes."""
    groups: dict[str, list[str]] = defaultdict(list)
    for each in depends.dependences:
        groups[each.text].append(each.fault)
    for text, names in groups.items():
        yield joined(_names(names), ": ", plain(words.signs(text)), ".")


def _names(names: Sequence[str]) -> Markup:
    shown = [joined(", " if place else "", given(name)) for place, name in enumerate(names[:MOST_NAMES])]
    return joined(shown, f" and {len(names) - MOST_NAMES:,} more" if len(names) > MOST_NAMES else "")


def _run(depends: Sensitivity, each: Scenario) -> tuple[Markup, ...]:
    changed = [name for name, word in each.words.items() if word != depends.base.words.get(name, word)]
    azimuth = "–" if math.isnan(each.shmax_deg) else f"{words.azimuth(each.shmax_deg, 180)}°"
    return plain(words.signs(each.text)), plain(each.kind or "none"), plain(azimuth), _names(changed) if changed else plain("–")


def _carriers(analysis: Analysis, depends: Sensitivity) -> Markup:
    """Return the faults without which the axes turn most."""
    rows = sorted(_turns(analysis, depends), key=lambda entry: (-entry[0], entry[1]))[:MOST_CARRIERS]
    shown = [
        (element("span", given(analysis.faults[k].fault.name), data_fault=k), f"{turn:.1f}°") for turn, k in rows if turn >= LEAST_TURN_DEG
    ]
    if not shown:
        return element("p", "No single fault turns the axes by more than half a degree.")
    return joined(element("h3", "Faults that carry the stress"), table(("fault", "the axes turn without it by"), shown, numeric=(1,)))


def _turns(analysis: Analysis, depends: Sensitivity) -> Iterator[tuple[float, int]]:
    for k, result in enumerate(analysis.faults):
        if result.phase < len(depends.influence):
            yield float(depends.influence[result.phase].turn_deg[k].max()), k
