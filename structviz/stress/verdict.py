"""The verdict on each fault by the regime inferred from the others."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Cause:
    """One possible explanation of a conflict, with how well it explains the evidence (0 to 1)."""

    key: str
    text: str
    score: float


@dataclass(frozen=True)
class Verdict:
    """What the stress of the other faults says of one fault."""

    word: str  # "consistent" | "conflicting" | "undetermined"
    conflict_probability: float | None  # None where nothing was declared or nothing could be predicted
    misfit_deg: float | None  # angle from declared to predicted slip, median
    predicted_rake_deg: float | None
    predicted_rake_spread_deg: float | None
    slip_tendency: float | None  # shear over normal stress, as a share of the greatest, 0 to 1
    reasons: tuple[str, ...] = ()
    causes: tuple[Cause, ...] = ()
