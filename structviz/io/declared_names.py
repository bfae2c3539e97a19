"""The fields of a mesh file that say how its fault moved: taken by the names in FIELDS and no others."""

from __future__ import annotations

from collections.abc import Mapping

# Our columns of a table of faults, and the names of fields that are taken for them. Values are ours: words are not translated.
FIELDS: Mapping[str, tuple[str, ...]] = {
    "sense": ("sense", "slip_sense", "slip_type"),
    "rake_deg": ("rake_deg", "rake"),
    "phase": ("phase",),
    "down_side": ("down_side",),
}


def declared_of(fields: Mapping[str, str]) -> dict[str, str]:
    """Return what fields of a file declare, by our columns; fields of other names are passed over.

    >>> declared_of({"Slip_Type": "normal", "colour": "7", "rake": ""})
    {'sense': 'normal'}
    """
    lower = {name.lower(): value.strip() for name, value in fields.items()}
    found = {column: next((lower[name] for name in names if lower.get(name)), "") for column, names in FIELDS.items()}
    return {column: value for column, value in found.items() if value}
