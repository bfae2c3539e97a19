"""Striae from a CSV table: measured slip lines, each on a named fault."""

from __future__ import annotations

import numpy as np

from structviz.io.tables import Row, nearest, number, read_table, required, sense_of
from structviz.io.units import METRES, Frame
from structviz.kinematics.senses import Sector
from structviz.model import Stria
from structviz.orientation import lines, planes

COLUMNS = (
    "fault", "easting", "northing", "up", "depth", "strike_deg", "dip_deg", "rake_deg", "trend_deg", "plunge_deg", "sense", "weight",
)  # fmt: skip
OFF_PLANE_DEG = 15.0  # a measured line this far off its plane is told, not refused


def read_striae(content: bytes, file: str, faults: tuple[str, ...], frame: Frame) -> tuple[tuple[Stria, ...], tuple[str, ...]]:
    """Return the striae of a table, places in metres with up positive, and what should be told about them.

    `up` is up positive whatever the model file says of its surfaces; a column `depth` may stand in its place. Raises TableError.
    """
    table = read_table(content, file, ("fault", "easting", "northing", "strike_deg", "dip_deg"), COLUMNS)
    found = tuple(stria_of(row, faults, frame) for row in table.rows)
    told = [f"{file}: columns {', '.join(table.unknown)} are not used"] if table.unknown else []
    told += [f"{file}, {row.where}: {off}" for row in table.rows if (off := off_plane(row))]
    return found, tuple(told)


def stria_of(row: Row, faults: tuple[str, ...], frame: Frame) -> Stria:
    """Return one stria; TableError for an unknown fault, a missing number or a line given twice."""
    fault = row.text("fault")
    if fault not in faults:
        raise row.error(f"fault {fault!r}", "the name of a fault of the model", f"{nearest(fault, faults)}correct the name")
    up = required(row, "up") if row.text("up") or not row.text("depth") else -required(row, "depth")
    if row.text("up") and row.text("depth"):
        raise row.error("both up and depth", "one of the two", "delete one")
    unit = METRES[frame.length_unit]
    place = (required(row, "easting") * unit, required(row, "northing") * unit, up * unit)
    sector = sense_of(row) if row.text("sense") else None
    weight = number(row, "weight", 0.0)
    strike, dip = required(row, "strike_deg", -360.0, 360.0) % 360.0, required(row, "dip_deg", 0.0, 90.0)
    return Stria(fault, place, strike, dip, rake_of(row, sector), sector, 1.0 if weight is None else weight)


def rake_of(row: Row, sector: Sector | None) -> float:
    """Return the rake of a row, from rake_deg or from trend and plunge; a line is turned to agree with the sense declared."""
    rake, trend = number(row, "rake_deg", -180.0, 180.0), number(row, "trend_deg", -360.0, 360.0)
    if rake is not None and trend is not None:
        raise row.error("both rake_deg and trend_deg", "one of the two", "delete one: trend and plunge say the same as the rake")
    if rake is not None:
        return 180.0 if rake == -180.0 else rake
    if trend is None:
        raise row.error(
            "neither rake_deg nor trend_deg", "the slip line as rake_deg, or as trend_deg and plunge_deg", "fill in one of them"
        )
    line = lines.vectors(trend, required(row, "plunge_deg", -90.0, 90.0))
    found = float(planes.rakes_deg(normal_of(row), line))
    if not np.isfinite(found):
        raise row.error("a line at right angles to its plane", "a line on the plane", "check strike, dip, trend and plunge")
    if sector is not None and abs((found - sector.rake_deg + 180.0) % 360.0 - 180.0) > 90.0:
        found = found - 180.0 if found > 0 else found + 180.0
    return found


def normal_of(row: Row) -> np.ndarray:
    """Return the normal of the plane of a row."""
    return planes.normals(required(row, "strike_deg", -360.0, 360.0), required(row, "dip_deg", 0.0, 90.0))


def off_plane(row: Row) -> str:
    """Return words where the line of a row lies well off its plane, "" otherwise."""
    if not row.text("trend_deg"):
        return ""
    line = lines.vectors(required(row, "trend_deg"), required(row, "plunge_deg"))
    off = float(np.degrees(np.arcsin(np.clip(abs(line @ normal_of(row)), 0.0, 1.0))))
    return f"the line lies {off:.0f} degrees off its plane and is projected onto it" if off > OFF_PLANE_DEG else ""
