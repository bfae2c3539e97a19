"""Check that one stress serves the whole model."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check
from structviz.stress.field import FieldSummary


def _turning(by_deg: float) -> Examined:
    summary = FieldSummary(by_deg, (0.0, 0.0, 0.0), (20_000.0, 0.0, 0.0), 30.0, (30.0 + by_deg) % 180.0, 4000.0, 12.0)
    return replace(samples.judged("consistent", "consistent"), field=summary)


@check(
    "regime-not-uniform",
    title="a stress that turns from one part of the model to another",
    why="one stress for the whole model would nowhere be the right one; where it can be, the model is judged part by part",
    unit="deg",
    limit=20.0,
    source="",
    hint="look at the field (structviz check --field), and ask what turns it: a bend of the belt, a large fault, or two ages",
    passes=lambda: _turning(10.0),
    fails=lambda: _turning(45.0),
    low=5.0,
    high=90.0,
    needs="stress",
)
def regime_not_uniform(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the field foretells the faults better than one stress, and turns by more than the limit."""
    field = examined.field
    if field is None or field.turn_deg <= limit:
        return
    (e1, n1, _), (e2, n2, _) = field.first, field.second
    one, two = (round(azimuth) % 180 for azimuth in (field.first_shmax_deg, field.second_shmax_deg))
    text = (
        f"the azimuth of the greatest horizontal compression turns by {field.turn_deg:.0f} deg: {one:03d} near "
        f"{e1:.0f} E, {n1:.0f} N and {two:03d} near {e2:.0f} E, {n2:.0f} N"
    )
    numbers = (("turn_deg", round(field.turn_deg, 1)), ("bandwidth_m", round(field.radius_m)), ("gain_nats", round(field.gain_nats, 1)))
    yield Found("model", "warning", text, numbers)
