"""What the properties of traces are called: one stated table, in which nothing is guessed, and what is told of its use."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping, Sequence
from typing import Any

from structviz.errors import TableError
from structviz.io.ledger import Ledger
from structviz.io.lines import LineFeature

# What is needed of a trace, and the names under which it is taken, small letters or capitals, with the factor to our unit. The last ones
# of each are short forms for tables that cut names to ten letters (dBASE, beside Shapefiles). Nothing else is guessed.
PROPERTIES: Mapping[str, Mapping[str, float]] = {
    "name": {"name": 1, "fault_name": 1, "faultname": 1, "fault": 1},
    "dip_deg": {"dip_deg": 1, "dip": 1, "dipdeg": 1, "dip_int": 1},
    "dip_direction": {"dip_direction_deg": 1, "dip_direction": 1, "dip_dir": 1, "dipdir": 1, "dip_direct": 1},
    "rake_deg": {"rake_deg": 1, "rake": 1},
    "sense": {"sense": 1, "slip_type": 1},
    "upper_depth_m": {"upper_depth_m": 1, "upper_depth_km": 1000, "updepth": 1000, "upper_m": 1, "upper_km": 1000},
    "lower_depth_m": {"lower_depth_m": 1, "lower_depth_km": 1000, "lowdepth": 1000, "lower_m": 1, "lower_km": 1000},
    "down_side": {"down_side": 1},
    "phase": {"phase": 1},
}
CUT_SHORT = {"upper_dept": "upper_m or upper_km", "lower_dept": "lower_m or lower_km"}  # metres or kilometres can no longer be told
LOWER_DEPTH_M = 15_000.0  # where none is given: about the base of brittle faulting in continents (common practice)


def given(properties: Mapping[str, Any], wanted: str) -> list[tuple[str, Any, float]]:
    """Return what a feature says of one thing, in the order of the table: the property, its value and the factor to our unit."""
    known = PROPERTIES[wanted]
    found = [(key, value, known[key.lower()]) for key, value in properties.items() if key.lower() in known and value not in (None, "")]
    order = list(known)
    return sorted(found, key=lambda entry: order.index(entry[0].lower()))


def value_of(properties: Mapping[str, Any], wanted: str) -> tuple[Any, float]:
    """Return what a feature says of one thing, None where nothing, and the factor to our unit."""
    found = given(properties, wanted)
    return found[0][1:] if found else (None, 1.0)


def text_of(properties: Mapping[str, Any], wanted: str) -> str:
    value, _ = value_of(properties, wanted)
    return "" if value is None else str(value).strip()


def number_of(properties: Mapping[str, Any], wanted: str, where: str, low: float, high: float) -> float | None:
    value, factor = value_of(properties, wanted)
    if value is None:
        return None
    try:
        found = float(value if not isinstance(value, bool) else "") * factor
    except (TypeError, ValueError):
        raise TableError(where, f"{wanted} {value!r}", "a number", hint="write a number without unit") from None
    if not (math.isfinite(found) and low <= found <= high):
        raise TableError(where, f"{wanted} {found:g}", f"{low:g} to {high:g}", hint=f"correct {wanted} of that feature")
    return found


def tell_properties(features: Sequence[LineFeature], file: str, ledger: Ledger) -> None:
    """Note which properties were taken for what, and what was assumed where there was none."""
    if not features:
        return
    used: list[str] = []
    for wanted, names in PROPERTIES.items():
        found = [[key for key, _, _ in given(feature.properties, wanted)] for feature in features]
        taken = Counter(keys[0] for keys in found if keys)
        words = [f"{key}{' (km)' * (names[key.lower()] == 1000)}{f' ({count})' * (len(taken) > 1)}" for key, count in taken.items()]
        used += [f"{wanted} from {' and '.join(words)}"] if words else []
        passed_over = [keys for keys in found if len(keys) > 1]
        if passed_over:
            first, *others = passed_over[0]
            count = f"{len(passed_over)} of {len(found)} traces"
            ledger.note("model", f"{file}: {count} give {wanted} as {first} and {', '.join(others)}; {first} is used")
    ledger.note("model", f"{file}: {'; '.join(used) or 'no property that is known'}")
    lacking = sum(value_of(feature.properties, "lower_depth_m")[0] is None for feature in features)
    if lacking:
        told = f"{lacking} of {len(features)} traces give no lower depth and are drawn {LOWER_DEPTH_M / 1000:g} km down"
        ledger.note("model", f"{file}: {told}")


def tell_cut_names(features: Sequence[LineFeature], file: str, ledger: Ledger) -> None:
    """Warn of properties whose names were cut so short that their unit is lost."""
    there = {key.lower() for feature in features for key in feature.properties}
    for cut, instead in CUT_SHORT.items():
        if cut in there:
            ledger.note("model", f"{file}: {cut} is cut short, so that its unit is lost: not used", f"rename it {instead}", "warning")
