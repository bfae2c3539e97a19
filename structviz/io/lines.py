"""Lines with properties as a file of traces or sticks holds them, whichever format it has."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.geographic import LONGITUDE_LATITUDE, known_system, transformer_between
from structviz.io.ledger import Ledger

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class LineFeature:
    """One feature: where it stands for messages, its source, its properties and its lines."""

    where: str  # "file, feature 3"
    source: str  # "file#3"
    properties: Mapping[str, Any]
    lines: tuple[Floats, ...]  # (N, 3) each: coordinates of the file, and height, 0 where there is none

    @property
    def has_heights(self) -> bool:
        """Return whether any height differs from zero."""
        return any(line[:, 2].any() for line in self.lines)


@dataclass(frozen=True, eq=False)
class LineSet:
    """The features of one file, or of one layer of it, and the reference system it names ("" where it names none)."""

    file: str
    features: tuple[LineFeature, ...]
    crs: str = ""
    other: int = 0  # features without a line or without properties, passed over


def chosen(sets: Sequence[LineSet], where: Mapping[str, str], ledger: Ledger) -> tuple[LineSet, ...]:
    """Return the sets with the features that `where` keeps; what is passed over and what heights mean is noted.

    Raises FormatError where no line is left.
    """
    kept = tuple(replace(each, features=tuple(f for f in each.features if is_chosen(f.properties, where))) for each in sets)
    for each in kept:
        if each.other:
            ledger.note("model", f"{each.file}: {each.other} features left out, no lines with properties")
        high = sum(feature.has_heights for feature in each.features)
        if high:
            ledger.note("model", f"{each.file}: heights, which {high} features have, are taken as metres; depths count from there")
    if not any(feature.lines for each in kept for feature in each.features):
        asked = " with " + ", ".join(f"{k}={v}" for k, v in where.items()) if where else ""
        files = ", ".join(dict.fromkeys(each.file for each in sets))
        raise FormatError(files, f"no lines{asked}", "LineString or MultiLineString features", hint="check the file and --where")
    return tuple(each for each in kept if each.features)


def is_chosen(properties: Mapping[str, Any], where: Mapping[str, str]) -> bool:
    """Return whether every property asked for has the value given, or one of several parted by commas.

    >>> is_chosen({"zone": 5.0}, {"zone": "4,5"})
    True
    """
    for key, wanted in where.items():
        found = properties.get(key)
        words = {"" if found is None else str(found)}
        if isinstance(found, float) and found.is_integer():  # tables of the dBASE kind store whole numbers as 5.0
            words.add(str(int(found)))
        if words.isdisjoint((wanted, *(value.strip() for value in wanted.split(",")))):
            return False
    return True


def in_one_system(sets: Sequence[LineSet], ledger: Ledger) -> tuple[tuple[LineSet, ...], str]:
    """Return the sets in one reference system, and that system: longitude and latitude where they name different ones, which is noted."""
    systems = list(dict.fromkeys("" if each.crs in LONGITUDE_LATITUDE else each.crs for each in sets))
    if len(systems) == 1:
        return tuple(sets), "" if any(not each.crs for each in sets) else sets[0].crs
    names = ", ".join(known_system(name, "")[1] if name else "longitude and latitude" for name in systems)
    ledger.note("model", f"the traces are in different reference systems ({names}): all are taken to longitude and latitude first")
    return tuple(replace(each, features=tuple(geographic(each))) for each in sets), ""


def geographic(each: LineSet) -> Iterator[LineFeature]:
    """Yield the features of a set in longitude and latitude."""
    if each.crs in ("", *LONGITUDE_LATITUDE):
        yield from each.features
        return
    turned = transformer_between(each.crs, "EPSG:4326", each.file)
    for feature in each.features:
        lines = tuple(np.column_stack([*turned.transform(line[:, 0], line[:, 1]), line[:, 2]]) for line in feature.lines)
        if not all(np.isfinite(line).all() for line in lines):
            hint = "correct the reference system or the coordinates"
            raise FormatError(feature.where, "places outside its reference system", "places inside it", hint=hint)
        yield replace(feature, lines=lines)
