"""The table of checks: one function each, with its limit, its wording and a sample that passes and one that fails."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from structviz._validate import check_range
from structviz.errors import ArgumentError
from structviz.model import Fault, FaultModel, Finding
from structviz.stress.compare import Comparison
from structviz.stress.conjugate import Pairs
from structviz.stress.field import FieldSummary
from structviz.stress.phases import Contradiction
from structviz.stress.regime import Reading, Regime
from structviz.stress.verdict import Verdict
from structviz.surfaces.surface import MeasuredSurface

SEVERITIES = ("error", "warning", "note")  # worst first
NEEDS = ("surfaces", "stress")

Evidence = tuple[tuple[str, float | int | str], ...]


@dataclass(frozen=True, eq=False)
class Examined:
    """What checks look at; measured and verdicts keep the order of model.faults. Before the stress is inferred the rest is empty."""

    model: FaultModel
    measured: tuple[MeasuredSurface, ...] = ()
    pairs: Pairs | None = None
    readings: tuple[Reading, ...] = ()
    regimes: tuple[Regime, ...] = ()
    verdicts: tuple[Verdict, ...] = ()
    contradictions: tuple[Contradiction, ...] = ()  # of declared phases; faults by their place in the model
    comparisons: tuple[Comparison, ...] = ()  # with what was measured apart from the faults
    field: FieldSummary | None = None  # where the stress turns from one part of the model to another

    def faults(self) -> Iterator[tuple[Fault, MeasuredSurface]]:
        """Return each fault with its measured surface."""
        return zip(self.model.faults, self.measured)

    @cached_property
    def boxes(self) -> NDArray[np.float64]:
        """The corners of the box about each fault, m, shape (F, 2, 3): lowest and highest easting, northing, up."""
        columns = [np.ascontiguousarray(piece.surface.vertices.T) for piece in self.measured]  # along rows the extremes come fast
        return np.array([(each.min(1), each.max(1)) for each in columns]).reshape(-1, 2, 3)

    def has(self, need: str) -> bool:
        """Return True where what a check needs has been worked out."""
        return bool(self.measured) if need == "surfaces" else bool(self.readings or self.regimes or self.verdicts)


@dataclass(frozen=True)
class Found:
    """What a check saw of a fault, or of the whole "model": how bad, in words and numbers; a hint where it knows better than its row."""

    subject: str
    severity: str
    message: str
    evidence: Evidence = ()
    hint: str = ""


Examine = Callable[[Examined, float], Iterable[Found]]
Sample = Callable[[], Examined]


@dataclass(frozen=True)
class Check:
    """One row of the table."""

    key: str
    title: str  # what is looked for
    why: str  # what goes wrong if nobody looks
    unit: str  # of the limit
    limit: float  # default
    source: str  # key in references.REFERENCES, or "" for common practice
    hint: str  # what to do next
    passes: Sample
    fails: Sample
    low: float
    high: float
    needs: str  # "surfaces" or "stress": what must be known before it can run
    examine: Examine


CHECKS: dict[str, Check] = {}


def check(
    key: str,
    *,
    title: str,
    why: str,
    unit: str,
    limit: float,
    source: str,
    hint: str,
    passes: Sample,
    fails: Sample,
    low: float,
    high: float,
    needs: str = "surfaces",
) -> Callable[[Examine], Examine]:
    """Return the decorator that enters a function (examined, limit) -> found into CHECKS; ArgumentError for a key taken twice."""

    def enter(examine: Examine) -> Examine:
        if key in CHECKS:
            raise ArgumentError(f"check {key!r}: found two of that key; wanted one", hint="give the new check a key of its own")
        CHECKS[key] = Check(key, title, why, unit, limit, source, hint, passes, fails, low, high, needs, examine)
        return examine

    return enter


def run(examined: Examined, limits: Mapping[str, float] | None = None) -> tuple[Finding, ...]:
    """Return what every check that can run has found, worst first, then by key and subject.

    `limits` replaces default limits by key. A check whose need is not yet known (the stress) is left out.
    ArgumentError names an unknown key or a limit out of range. What reading noticed (`model.findings`) is not repeated here.
    """
    chosen = checked_limits(limits or {})
    found = [
        Finding(row.key, each.severity, each.subject, each.message, _plain(each.evidence), each.hint or row.hint)
        for row in CHECKS.values()
        if examined.has(row.needs)
        for each in row.examine(examined, chosen[row.key])
    ]
    return tuple(sorted(found, key=lambda f: (SEVERITIES.index(f.severity), f.check, f.subject, f.message)))


def _plain(evidence: Evidence) -> Evidence:
    """Return the evidence with NumPy numbers as Python's own, which every writer can store."""
    return tuple((name, value.item() if isinstance(value, np.generic) else value) for name, value in evidence)


def checked_limits(limits: Mapping[str, float]) -> dict[str, float]:
    """Return the limit of every check, the defaults replaced by those given; ArgumentError for an unknown key or a value out of range."""
    for key in limits:
        if key not in CHECKS:
            raise ArgumentError(f"limits: found the key {key!r}; wanted one of these checks\n{table_text()}", hint="correct the key")
    return {
        key: float(check_range(f"limit of {key}", limits.get(key, row.limit), row.low, row.high, row.unit)) for key, row in CHECKS.items()
    }


def table_text() -> str:
    """Return the table of checks as text: key, default limit with unit, and what is looked for, one a line."""
    limits = {key: f"{row.limit:g} {row.unit}".strip() for key, row in CHECKS.items()}
    wide, wider = max(map(len, CHECKS), default=0), max(map(len, limits.values()), default=0)
    return "\n".join(f"  {key:<{wide}}  {limits[key]:<{wider}}  {CHECKS[key].title}" for key in sorted(CHECKS))


def many(count: int, one: str, more: str = "") -> str:
    """Return a count with its noun.

    >>> many(1, "hole"), many(2, "hole"), many(1200, "vertex", "vertices")
    ('1 hole', '2 holes', '1,200 vertices')
    """
    return f"{count:,} {one if count == 1 else more or one + 's'}"


def listed(names: Iterable[str], most: int = 8) -> str:
    """Return names joined by commas, shortened after `most`.

    >>> listed(["a", "b", "c"], 2)
    'a, b and 1 more'
    """
    every = list(names)
    return ", ".join(every) if len(every) <= most else f"{', '.join(every[:most])} and {len(every) - most} more"
