"""The use cases: run(model, settings) -> Analysis."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from structviz.model import Fault, FaultModel, Finding
from structviz.stress.conjugate import Pairs
from structviz.stress.regime import Reading, Regime
from structviz.stress.verdict import Verdict
from structviz.surfaces.surface import MeasuredSurface, Stations

Progress = Callable[[str, int, int], None]  # what is being done, how many are done, of how many


def setting(default: object, unit: str, low: float, high: float, text: str) -> object:
    """Return a dataclass field of Settings with its unit, range and help."""
    return field(default=default, metadata={"unit": unit, "low": low, "high": high, "help": text})  # type: ignore[call-overload]


@dataclass(frozen=True)
class Settings:
    """Every choice a user may change; each field is a command-line option, a key of results.json and a row of the README."""

    friction_angle_deg: float = setting(30.0, "deg", 0.0, 60.0, "friction angle; conjugate faults are expected 90 minus this apart")  # type: ignore[assignment]
    replicates: int = setting(500, "", 50, 100000, "bootstrap replicates over faults")  # type: ignore[assignment]
    stations: int = setting(24, "", 4, 1000, "stations for local orientation on each fault")  # type: ignore[assignment]
    random_state: int = setting(0, "", 0, 2**31 - 1, "seed; the same seed gives the same result")  # type: ignore[assignment]


@dataclass(frozen=True, eq=False)
class FaultResult:
    """One fault: as declared, as measured, as judged."""

    fault: Fault
    measured: MeasuredSurface
    stations: Stations
    verdict: Verdict


@dataclass(frozen=True, eq=False)
class Analysis:
    """The whole result, with what is needed to make it again."""

    model: FaultModel
    settings: Settings
    faults: tuple[FaultResult, ...]
    pairs: Pairs
    readings: tuple[Reading, ...]  # geometry, pairs, senses, joint
    regimes: tuple[Regime, ...]  # those the verdicts follow, heaviest first; empty where none could be inferred
    findings: tuple[Finding, ...]
    cautions: tuple[str, ...]
    version: str
