"""Where something was measured, from the columns easting, northing, and up or depth of a table."""

from __future__ import annotations

import math

from structviz.io.tables import Row, number, required
from structviz.io.units import METRES, Frame

Place = tuple[float, float, float]

NO_PLACE: Place = (math.nan, math.nan, math.nan)


def place_of(row: Row, frame: Frame) -> Place:
    """Return easting, northing and up of a row in metres, all NaN without the first two, up NaN where only that is not given.

    `up` is up positive whatever the model file says of its surfaces; `depth` may stand in its place. TableError for half a place.
    """
    unit = METRES[frame.length_unit]
    if row.text("up") and row.text("depth"):
        raise row.error("both up and depth", "one of the two", "delete one")
    if not any(row.text(column) for column in ("easting", "northing")):  # a depth alone is no place
        return NO_PLACE
    up, depth = number(row, "up"), number(row, "depth")
    height = up if up is not None else math.nan if depth is None else -depth
    return required(row, "easting") * unit, required(row, "northing") * unit, height * unit
