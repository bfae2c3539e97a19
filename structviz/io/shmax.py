"""Azimuths of the greatest horizontal compression measured in wells, from a CSV table."""

from __future__ import annotations

from structviz.io.places import place_of
from structviz.io.tables import Row, read_table, required
from structviz.io.units import Frame
from structviz.model import WellAzimuth

COLUMNS = ("shmax_deg", "uncertainty_deg", "name", "easting", "northing", "up", "depth")
# Columns of published tables that are taken for ours: left what they are called there. Nothing else is guessed.
ALIASES = {"BH#": "name", "SHmax azimuth (degEofN)": "shmax_deg", "functional uncertainty (deg)": "uncertainty_deg"}


def read_azimuths(content: bytes, file: str, frame: Frame) -> tuple[tuple[WellAzimuth, ...], tuple[str, ...]]:
    """Return the azimuths of a table with their standard deviations, and what should be told. Raises TableError."""
    table = read_table(content, file, ("shmax_deg", "uncertainty_deg"), COLUMNS, ALIASES)
    told = (f"{file}: columns {', '.join(table.unknown)} are not used",) if table.unknown else ()
    return tuple(azimuth_of(row, frame) for row in table.rows), told


def azimuth_of(row: Row, frame: Frame) -> WellAzimuth:
    """Return the azimuth of one row; an azimuth is a line without direction, so 200 is 020. TableError for a bad number."""
    azimuth = required(row, "shmax_deg", -360.0, 360.0) % 180.0
    uncertainty = required(row, "uncertainty_deg", 0.0, 90.0)
    return WellAzimuth(row.text("name") or row.where, azimuth, uncertainty, place_of(row, frame))
