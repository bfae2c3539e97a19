"""From the coordinates of a file of lines to metres: longitude and latitude, or the system that the file names."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError

if TYPE_CHECKING:
    from pyproj import CRS, Transformer

Floats = NDArray[np.float64]

WIDE_DEG = 6.0  # of longitude: a wider model gets a projection of its own instead of a UTM zone
WIDEST_DEG = 40.0  # beyond this no plane keeps the azimuths of one model together
LONGITUDE_LATITUDE = ("OGC:CRS84", "EPSG:4326")


@dataclass(frozen=True)
class Projection:
    """How places (N, 2) of a file become easting and northing in metres, the system of these, and what a reader should know."""

    metres: Callable[[Floats], Floats]
    crs: str
    told: str


def projection(named: str, places: Floats, file: str) -> Projection:
    """Return the projection for places (N, 2) in the system `named`; FormatError where they cannot be placed.

    `named` is authority:code, or the text of a system (WKT); longitude and latitude where it is "".
    """
    if named in ("", *LONGITUDE_LATITUDE):
        words = "longitude and latitude" if named else "no reference system is named: coordinates taken as longitude and latitude,"
        return _about_the_middle(places, "EPSG:4326", words, file)
    system, shown = known_system(named, file)
    if system.is_geographic:
        return _about_the_middle(places, named, f"longitude and latitude of {shown}", file)
    directions = {axis.direction for axis in system.axis_info}
    if not system.is_projected or "west" in directions:
        found = f"the reference system {shown}, which " + ("counts to the west" if "west" in directions else "is no map projection")
        raise FormatError(file, found, "easting and northing", hint="export the traces as longitude and latitude")
    factor = float(system.axis_info[0].unit_conversion_factor)
    if factor == 1.0:
        return Projection(lambda line: line, shown, f"coordinates taken as metres in {shown}, as the file says")
    told = f"coordinates in {shown} turned from {system.axis_info[0].unit_name} into metres (times {factor:.10g})"
    return Projection(lambda line: line * factor, f"{shown}, in metres", told)


def known_system(named: str, file: str) -> tuple[CRS, str]:
    """Return a reference system and how it is shown: authority:code, or the name in its text; FormatError where it is not known."""
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    short = " ".join(named.split())[:60]
    try:
        system = CRS.from_user_input(named)
    except CRSError:
        hint = "correct the reference system of the file, or export the traces as longitude and latitude"
        raise FormatError(file, f"the reference system {short}, which is not known", "a known EPSG code", hint=hint) from None
    return system, named if len(named) < 30 else str(system.name)


def transformer_between(source: str, target: str, file: str) -> Transformer:
    """Return the way from one reference system to another, east before north in both; FormatError where there is none."""
    from pyproj import CRS, Transformer
    from pyproj.exceptions import ProjError

    try:
        return Transformer.from_crs(CRS(source), CRS(target), always_xy=True)
    except ProjError:  # of which CRSError is one
        found = f"the reference system {known_system(source, file)[1]}, from which no way leads to {target[:40]}"
        hint = "correct the reference system of the file, or export the traces as longitude and latitude"
        raise FormatError(file, found, "a reference system of the Earth", hint=hint) from None


def named_system(tree: dict[str, Any], file: str) -> str:
    """Return the reference system that a collection names, as authority:code; "" where it names none."""
    member = tree.get("crs")
    properties = member.get("properties") if isinstance(member, dict) else None
    name = member if isinstance(member, str) else properties.get("name") if isinstance(properties, dict) else None
    if member is None:
        return ""
    found = re.fullmatch(r"(?:urn:ogc:def:crs:)?(EPSG|OGC|ESRI):(?:[\d.]*:)?(\w+)", str(name).strip(), re.IGNORECASE)
    if not found:
        hint = "write the 'crs' member as EPSG:code, or leave it out for longitude and latitude"
        raise FormatError(file, f"a reference system named {name!r}"[:120], "EPSG:code", hint=hint)
    return f"{found[1].upper()}:{found[2].upper()}"


def _about_the_middle(places: Floats, source: str, words: str, file: str) -> Projection:
    """Return a UTM zone about the middle of the data, or a transverse Mercator of its own for wider ones."""
    (west, south), (east, north) = places.min(0), places.max(0)
    if west < -180.0 or east > 360.0 or south < -90.0 or north > 90.0:
        raise FormatError(
            file,
            f"coordinates up to {np.abs(places).max():g} without a reference system",
            "longitude and latitude in degrees",
            hint="name the projected system in the file (GeoJSON: a 'crs' member; Shapefile: .prj), or export longitude and latitude",
        )
    across = east - west > 180.0  # the short way round leads over the antimeridian
    if across:
        east_of_greenwich = places[:, 0] % 360.0
        west, east = east_of_greenwich.min(), east_of_greenwich.max()
        words += " (across the antimeridian)"
    if east - west > WIDEST_DEG:
        hint = "take one region, for example with --where"
        raise FormatError(file, f"traces over {east - west:.0f} deg of longitude", f"{WIDEST_DEG:g} deg at most", hint=hint)
    middle = (west + east) / 2, (south + north) / 2
    if east - west <= WIDE_DEG and south > -80.0 and north < 84.0:
        column = math.floor((middle[0] + 180.0) / 6.0)
        meridian, zone = column * 6.0 - 177.0, column % 60 + 1
        target = f"EPSG:{(32600 if middle[1] >= 0 else 32700) + zone}"
        told = f"{words} projected to UTM zone {zone} ({target})"
    else:
        meridian = (middle[0] + 180.0) % 360.0 - 180.0
        target = f"+proj=tmerc +lat_0={middle[1]:.4f} +lon_0={meridian:.4f} +k=0.9996 +datum=WGS84 +units=m"
        told, meridian = f"{words} projected to a transverse Mercator about the middle of the data ({target})", middle[0]
    turn = max(east - meridian, meridian - west) * math.sin(math.radians(max(abs(south), abs(north))))
    transformer = transformer_between(source, target, file)

    def metres(line: Floats) -> Floats:
        return np.stack(transformer.transform(line[:, 0], line[:, 1]), 1)

    return Projection(metres, target, f"{told}; azimuths are from grid north, up to {turn:.1f} deg from true north at its edges")
