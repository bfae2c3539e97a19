"""From the local reference systems of RESQML (2.0.1 and 2.2) to easting, northing, up in metres.

A local system lies in a projected one: its origin is given there, its axes are those of the projected system turned clockwise
as seen on the map, and its third axis counts depth or elevation. The order of axes says which of the first two is the easting.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from xml.etree.ElementTree import Element

import numpy as np
from numpy.typing import NDArray

from structviz.io.epc import Package, objects, reference, title_of
from structviz.io.resqml_arrays import NotRead, real
from structviz.io.xml_tree import kind_of, text_at

# Units by their symbols in the Energistics unit of measure standard, in metres and radians.
METRES = {
    "m": 1.0, "km": 1000.0, "dm": 0.1, "cm": 0.01, "mm": 0.001, "in": 0.0254, "ft": 0.3048, "yd": 0.9144, "mi": 1609.344,
    "ft[US]": 1200.0 / 3937.0, "ftUS": 1200.0 / 3937.0,
}  # fmt: skip
RADIANS = {"rad": 1.0, "mrad": 0.001, "dega": np.pi / 180, "deg": np.pi / 180, "gon": np.pi / 200, "rev": 2 * np.pi}
TOWARDS = {"east": (1.0, 0.0), "north": (0.0, 1.0), "west": (-1.0, 0.0), "south": (0.0, -1.0)}
WORDS = {"easting": "east", "northing": "north", "westing": "west", "southing": "south"}
NAME_IN_WKT = re.compile(r'^\s*[A-Z_]+\s*\[\s*"([^"]{1,120})"')


@dataclass(frozen=True)
class LocalFrame:
    """A local system: a place is its origin plus its local coordinates along its axes."""

    origin_m: tuple[float, float, float]  # easting, northing, up of its origin
    axes_m: tuple[tuple[float, float, float], ...]  # (east, north, up) of one unit along each local axis, in metres
    crs: str
    history: tuple[str, ...]

    @property
    def mirrored(self) -> bool:
        """True where the three local axes are left-handed, so that triangles must be wound the other way round."""
        return bool(np.linalg.det(np.array(self.axes_m)) < 0)


def placed(frame: LocalFrame, points: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return local points (N, 3) as easting, northing, up in metres."""
    # written out in columns: a matrix product would add zeros times NaN, and sum in an order that differs between machines
    east, north, up = (sum(points[:, k] * frame.axes_m[k][axis] for k in range(3) if frame.axes_m[k][axis]) for axis in range(3))
    return np.stack([east, north, up], axis=1) + np.array(frame.origin_m) + 0.0


def frame_of(package: Package, geometry: Element | None) -> LocalFrame:
    """Return the local system of a geometry; NotRead where it counts time or cannot be turned into metres."""
    named = reference(None if geometry is None else geometry.find("LocalCrs"))
    if named.kind == "LocalTime3dCrs":
        raise NotRead("heights in time, not in length: dips cannot be judged")
    root = objects(package, "LocalDepth3dCrs", "LocalEngineeringCompoundCrs", "LocalTime3dCrs").get(named.uuid)
    if root is None:
        raise NotRead(f"a local reference system {named.title[:80]!r} that is not in the package")
    if root.tag == "LocalTime3dCrs":
        raise NotRead("heights in time, not in length: dips cannot be judged")
    return depth_frame(package, root) if root.tag == "LocalDepth3dCrs" else compound_frame(package, root)


def depth_frame(package: Package, root: Element) -> LocalFrame:
    """Return the frame of a LocalDepth3dCrs of version 2.0.1."""
    axes = towards_of(text_at(root, "ProjectedAxisOrder", "easting northing"))
    flat, height = metres(text_at(root, "ProjectedUom"), "ProjectedUom"), metres(text_at(root, "VerticalUom"), "VerticalUom")
    down = text_at(root, "ZIncreasingDownward").lower()
    if down not in ("true", "false", "1", "0"):
        raise NotRead(f"ZIncreasingDownward {down[:40]!r}")
    sign = -1.0 if down in ("true", "1") else 1.0
    first, second, third = (real(root, f"{axis}Offset", package.file) for axis in "XYZ")
    origin = (*along(axes, first * flat, second * flat), sign * third * height)
    angle = angle_rad(root.find("ArealRotation"), text_at(root, "ArealRotation", "0"))
    units = (text_at(root, "ProjectedUom"), text_at(root, "VerticalUom"))
    return made(root, axes, angle, (flat, sign * height), origin, units, crs_of(root.find("ProjectedCrs")))


def compound_frame(package: Package, root: Element) -> LocalFrame:
    """Return the frame of a LocalEngineeringCompoundCrs of version 2.2: a plane system and an upright axis."""
    upright = root.find("VerticalAxis")
    if text_at(upright, "IsTime").lower() in ("true", "1"):
        raise NotRead("heights in time, not in length: dips cannot be judged")
    flat_root = objects(package, "LocalEngineering2dCrs").get(reference(root.find("LocalEngineering2dCrs")).uuid)
    level = objects(package, "VerticalCrs").get(reference(root.find("VerticalCrs")).uuid)
    if flat_root is None or upright is None:
        raise NotRead("a local reference system without its plane or its upright axis")
    azimuth = angle_rad(flat_root.find("Azimuth"), text_at(flat_root, "Azimuth", "0"))
    if text_at(flat_root, "AzimuthReference", "grid north") != "grid north":
        raise NotRead(f"axes counted from {text_at(flat_root, 'AzimuthReference')[:40]}")
    local = flat_root.find("HorizontalAxes")
    axes = axes_towards([text_at(local, f"Direction{k}").lower() for k in (1, 2)])
    projected = flat_root.find("OriginProjectedCrs")
    order = towards_of(text_at(projected, "AxisOrder", "easting northing"))
    far = metres("" if projected is None else projected.get("uom", ""), "OriginProjectedCrs")
    first, second = (real(flat_root, f"OriginProjectedCoordinate{k}", package.file) * far for k in (1, 2))
    units = (text_at(local, "Uom"), text_at(upright, "Uom"))
    sign = upwards(text_at(upright, "Direction"))
    level_sign = upwards(text_at(level, "Direction", text_at(upright, "Direction")))
    level_unit = metres(units[1] if level is None else level.get("uom", units[1]), "VerticalCrs")
    up = level_sign * real(root, "OriginVerticalCoordinate", package.file) * level_unit
    scales = (metres(units[0], "HorizontalAxes"), sign * metres(units[1], "VerticalAxis"))
    named = None if projected is None else projected.find("AbstractProjectedCrs")
    return made(root, axes, azimuth, scales, (*along(order, first, second), up), units, crs_of(named))


def made(
    root: Element,
    axes: tuple[tuple[float, float], ...],
    angle: float,
    scales: tuple[float, float],
    origin: tuple[float, float, float],
    units: tuple[str, str],
    crs: str,
) -> LocalFrame:
    """Return a frame of horizontal axes turned clockwise by an angle, with what turning and converting does in words."""
    cosine, sine = (1.0, 0.0) if angle == 0 else (float(np.cos(angle)), float(np.sin(angle)))
    flat, height = scales
    turned = [(flat * (east * cosine + north * sine), flat * (north * cosine - east * sine), 0.0) for east, north in axes]
    words = []
    if axes != (TOWARDS["east"], TOWARDS["north"]):
        towards = [word for axis in axes for word, found in TOWARDS.items() if found == axis]
        words.append(f"axes towards {towards[0]} and {towards[1]}")
    if angle:
        words.append(f"turned clockwise by {np.degrees(angle):.6g} degrees")
    if any(origin):
        words.append("moved to " + ", ".join(f"{value + 0.0:.12g}" for value in origin))
    if units != ("m", "m"):
        words.append(f"from {units[0]} to m" if units[0] == units[1] else f"from {units[0]} (heights {units[1]}) to m")
    if height < 0:
        words.append("depth to elevation")
    told = (f"local reference system {title_of(root) or 'without title'!r}: {'; '.join(words)}",) if words else ()
    return LocalFrame(origin, (*turned, (0.0, 0.0, height)), crs, told)


def along(axes: tuple[tuple[float, float], ...], first: float, second: float) -> tuple[float, float]:
    """Return easting and northing of two coordinates along two axes."""
    (east1, north1), (east2, north2) = axes
    return first * east1 + second * east2, first * north1 + second * north2


def towards_of(order: str) -> tuple[tuple[float, float], ...]:
    """Return where the two axes point of an order such as "easting northing"; NotRead for others."""
    return axes_towards([WORDS.get(word, word) for word in order.lower().split()])


def axes_towards(words: list[str]) -> tuple[tuple[float, float], ...]:
    """Return two unit vectors (east, north) of two directions; NotRead where they are not known or not square to each other."""
    axes = tuple(TOWARDS[word] for word in words if word in TOWARDS)
    if len(words) != 2 or len(axes) != 2 or axes[0][0] * axes[1][0] + axes[0][1] * axes[1][1]:
        raise NotRead(f"axes towards {' and '.join(words)[:60]!r}")
    return axes


def upwards(direction: str) -> float:
    """Return 1 for an axis that points up and -1 for one that points down; NotRead for others."""
    if direction.lower() not in ("up", "down"):
        raise NotRead(f"an upright axis towards {direction[:40]!r}")
    return 1.0 if direction.lower() == "up" else -1.0


def metres(unit: str, what: str) -> float:
    """Return the metres of a unit of length; NotRead for one that is not in the table."""
    if unit not in METRES:
        raise NotRead(f"{what} in {unit[:40]!r}")
    return METRES[unit]


def angle_rad(element: Element | None, text: str) -> float:
    """Return an angle in radians; NotRead for a unit that is not in the table."""
    unit = "rad" if element is None else element.get("uom", "rad")
    try:
        value = float(text)
    except ValueError:
        value = np.nan
    if unit not in RADIANS or not np.isfinite(value):
        raise NotRead(f"a rotation of {text[:40]!r} {unit[:40]!r}")
    return float(value * RADIANS[unit])


def crs_of(element: Element | None) -> str:
    """Return the projected system as "EPSG:code", by the name in its definition, or "" where it is not known."""
    code = text_at(element, "EpsgCode")
    if code.isascii() and code.isdigit() and len(code) < 8:
        return f"EPSG:{int(code)}"
    named = NAME_IN_WKT.match(text_at(element, "WellKnownText"))
    return named[1] if named and element is not None and kind_of(element) else ""
