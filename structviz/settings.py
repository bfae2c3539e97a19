"""The choices a user may change."""

from __future__ import annotations

from dataclasses import Field, dataclass, field, fields
from typing import Any

from structviz.errors import ArgumentError


def setting(default: object, unit: str, low: float, high: float, text: str) -> Any:
    """Return a dataclass field of Settings with its unit, range and help."""
    return field(default=default, metadata={"unit": unit, "low": low, "high": high, "help": text})


def bounds(item: Field[Any]) -> str:
    """Return the range of a setting in words, with its unit."""
    low, high = (f"{item.metadata[end]:{'d' if isinstance(item.default, int) else 'g'}}" for end in ("low", "high"))
    return f"{low} to {high} {item.metadata['unit']}".rstrip()


@dataclass(frozen=True)
class Settings:
    """Every choice a user may change; each field is a command-line option, a key of results.json and a row of the README."""

    friction_angle_deg: float = setting(30.0, "deg", 5.0, 60.0, "friction angle; conjugate faults are expected 90 minus this apart")
    pair_reach: float = setting(
        1.0, "fault sizes", 0.01, 100.0, "how far apart two surfaces may lie and still pair, in units of their summed sizes"
    )
    stations: int = setting(24, "", 4, 1000, "stations for local orientation on each fault")
    station_radius: float = setting(0.15, "fault sizes", 0.01, 2.0, "radius of the plane fitted at a station, in units of the fault's size")
    replicates: int = setting(500, "", 50, 100000, "bootstrap replicates over faults")
    random_state: int = setting(0, "", 0, 2**31 - 1, "seed; the same seed gives the same result")
    conflict_probability: float = setting(
        0.9, "", 0.5, 1.0, "probability of slip outside the declared sector from which a fault is conflicting"
    )
    least_shear: float = setting(0.15, "of greatest", 0.0, 0.9, "shear below which no direction of slip is predicted")

    def __post_init__(self) -> None:
        """Raise ArgumentError where a value is outside its range."""
        for item in fields(self):
            value, low, high = getattr(self, item.name), item.metadata["low"], item.metadata["high"]
            if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
                wanted = bounds(item)
                raise ArgumentError(f"{item.name}: found {value!r}; wanted {wanted}", hint=f"{item.metadata['help']}")
