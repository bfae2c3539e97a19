"""Checks on the phases: faults that the data put into another phase than the one declared."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check
from structviz.stress.phases import Contradiction


def _mixed(probability: float) -> Examined:
    plain = samples.judged("consistent", "consistent", regimes=(samples.regime(weight=0.6), samples.regime(weight=0.4)))
    return replace(plain, contradictions=(Contradiction(0, "old", 1, probability),))


@check(
    "phase-contradicted",
    title="faults that seem to have moved in another phase than declared",
    why="a fault of the wrong phase is judged by the wrong stress, and turns the stress of its phase",
    unit="probability",
    limit=0.9,
    source="dempster1977",
    hint="ask what dates the fault: which horizons it cuts, and which faults cut it or stop at it",
    passes=lambda: _mixed(0.8),
    fails=lambda: _mixed(0.95),
    low=0.5,
    high=1.0,
    needs="stress",
)
def phase_contradicted(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning for each fault that answers to the stress of another phase with at least the probability of the limit."""
    for each in examined.contradictions:
        if each.probability >= limit:
            regime = examined.regimes[each.phase]
            text = f"declared of phase {each.declared!r}, but plane and movement answer to {regime.name or f'phase {each.phase + 1}'}"
            numbers = (("probability", round(each.probability, 3)), ("phase", each.phase + 1))
            yield Found(examined.model.faults[each.fault].name, "warning", f"{text} ({regime.kind})", numbers)
