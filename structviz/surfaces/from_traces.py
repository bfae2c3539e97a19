"""Surfaces from fault traces: a line on the ground, a dip, a side to dip to, and a range of depth."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import SurfaceError
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]

CELLS = 150  # about, on one surface: traces have few bends, so finer cells say nothing more
FEWEST_ROWS = 2
SHALLOWEST_DEG = 1.0


def surface_from_trace(
    trace: ArrayLike,
    dip_deg: float,
    dip_direction_deg: float,
    upper_depth_m: float,
    lower_depth_m: float,
    *,
    name: str = "",
    spacing_m: float | None = None,
    source: str = "",
) -> Surface:
    """Return the ruled surface that hangs from a trace, all of it dipping one way, wound so that its normals point to the hanging wall.

    Parameters
    ----------
    trace : (N, 2) easting and northing, m, at zero depth; repeated points are passed over.
    dip_deg : 1 to 90. dip_direction_deg : azimuth of the dip, the same for the whole trace, so that bends do not make it cross itself.
        On a vertical surface it names the side of the hanging wall.
    upper_depth_m, lower_depth_m : where the surface begins and ends, m below the trace.
    spacing_m : longest side of its cells; by default about 150 cells a surface.

    Raises
    ------
    SurfaceError : fewer than two distinct points, a number that is not finite, a dip out of range, a depth range that is empty, or a dip
        direction along the trace.
    """
    points = _distinct(np.asarray(trace, float), name)
    _check(name, dip_deg, dip_direction_deg, upper_depth_m, lower_depth_m)
    azimuth, dip = np.radians(dip_direction_deg), np.radians(dip_deg)
    towards = np.array([np.sin(azimuth), np.cos(azimuth)])
    chord = points[-1] - points[0] if np.linalg.norm(points[-1] - points[0]) > 0 else points[1] - points[0]
    if dip_deg < 90.0 and abs(np.cross([*chord, 0.0], [*towards, 0.0])[2]) < 0.17 * np.linalg.norm(chord):
        raise SurfaceError(
            name, f"a dip direction of {dip_direction_deg:.0f} deg along the trace", "one across it", hint="correct the dip direction"
        )
    width = (lower_depth_m - upper_depth_m) / np.sin(dip)
    length = float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())
    spacing = spacing_m or max(np.sqrt(length * width / CELLS), 1e-3)
    along = _divided(points, spacing)
    rows = max(FEWEST_ROWS, int(np.ceil(width / spacing)) + 1)
    depths = np.linspace(upper_depth_m, lower_depth_m, rows)
    shift = 0.0 if dip_deg == 90.0 else 1 / np.tan(dip)
    level = along[None] + (depths * shift)[:, None, None] * towards
    vertices = np.concatenate([level, np.broadcast_to(-depths[:, None, None], (rows, len(along), 1))], 2).reshape(-1, 3) + 0.0
    return Surface(name, vertices, _cells(rows, len(along), _hanging_wall_left(chord, towards)), source)


def mean_dip_direction_deg(trace: ArrayLike, side_deg: float) -> float:
    """Return the azimuth across a trace (N, 2), from end to end, that lies nearer to the side named, degrees [0, 360)."""
    points = np.asarray(trace, float)
    east, north = points[-1] - points[0] if np.linalg.norm(points[-1] - points[0]) > 0 else points[1] - points[0]
    right = (np.degrees(np.arctan2(east, north)) + 90.0) % 360.0
    return float(right if abs((right - side_deg + 180.0) % 360.0 - 180.0) <= 90.0 else (right + 180.0) % 360.0)


def _distinct(points: Floats, name: str) -> Floats:
    if points.ndim != 2 or points.shape[1] < 2 or not np.isfinite(points[:, :2]).all():
        raise SurfaceError(name, f"a trace of shape {points.shape}", "finite points of easting and northing", hint="correct the trace")
    points = points[:, :2]
    kept = np.concatenate([[True], (np.diff(points, axis=0) != 0).any(1)])
    if kept.sum() < 2:
        raise SurfaceError(name, "a trace of one point", "two distinct points or more", hint="correct the trace or delete it")
    return points[kept]


def _check(name: str, dip_deg: float, dip_direction_deg: float, upper_depth_m: float, lower_depth_m: float) -> None:
    if not (np.isfinite([dip_deg, dip_direction_deg]).all() and SHALLOWEST_DEG <= dip_deg <= 90.0):
        raise SurfaceError(name, f"dip {dip_deg:g} deg towards {dip_direction_deg:g}", "a dip of 1 to 90 deg", hint="correct the dip")
    if not (np.isfinite([upper_depth_m, lower_depth_m]).all() and lower_depth_m > upper_depth_m):
        found = f"depths {upper_depth_m:g} to {lower_depth_m:g} m"
        raise SurfaceError(name, found, "a lower depth below the upper one", hint="correct the depths; they count down from the trace")


def _divided(points: Floats, spacing: float) -> Floats:
    """Return the points with others between them, none further apart than the spacing."""
    steps = np.ceil(np.linalg.norm(np.diff(points, axis=0), axis=1) / spacing - 1e-9).astype(int).clip(1)
    pieces = [a + (b - a) * np.arange(n)[:, None] / n for a, b, n in zip(points[:-1], points[1:], steps, strict=True)]
    return np.concatenate([*pieces, points[-1:]])


def _hanging_wall_left(chord: Floats, towards: Floats) -> bool:
    """Return whether the surface dips to the left of the trace as it runs."""
    return bool(chord[0] * towards[1] - chord[1] * towards[0] > 0)


def _cells(rows: int, columns: int, left: bool) -> NDArray[np.int64]:
    corner = (np.arange(rows - 1)[:, None] * columns + np.arange(columns - 1)).reshape(-1, 1)
    # Seen from the right of the trace, down is across: along, then down, turns towards the left side.
    first, second = corner + [0, 1, columns + 1], corner + [0, columns + 1, columns]
    triangles = np.concatenate([first, second])
    return np.ascontiguousarray(triangles if left else triangles[:, ::-1]).astype(np.int64)
