"""Surfaces from fault traces: a line on the ground, a dip, a side to dip to, and a range of depth."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import SurfaceError
from structviz.surfaces.surface import Surface

Floats = NDArray[np.float64]

CELLS = 150  # about, on one surface: traces have few bends, so finer cells say nothing more
MOST_CELLS = 2_000_000
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
    trace : (N, 2) easting and northing, m, at zero depth, or (N, 3) with up, from which the depths then count; repeated points are
        passed over.
    dip_deg : 1 to 90. dip_direction_deg : azimuth of the dip, the same for the whole trace, so that bends do not make it cross itself.
        On a vertical surface it names the side of the hanging wall, by the winding alone.
    upper_depth_m, lower_depth_m : where the surface begins and ends, m below the trace.
    spacing_m : longest side of its cells; by default about 150 cells a surface.

    Raises
    ------
    SurfaceError : fewer than two distinct points, a number that is not finite, a dip out of range, a depth range that is empty, a
        spacing that is not positive or makes too many cells, or a dip direction along the trace.
    """
    points = _distinct(trace, name)
    _check(name, dip_deg, dip_direction_deg, upper_depth_m, lower_depth_m)
    azimuth, dip = np.radians(dip_direction_deg), np.radians(dip_deg)
    towards = np.array([np.sin(azimuth), np.cos(azimuth)])
    chord = _chord(points)
    if dip_deg < 90.0 and abs(np.cross([*chord, 0.0], [*towards, 0.0])[2]) < 0.17 * np.linalg.norm(chord):
        raise SurfaceError(
            name, f"a dip direction of {dip_direction_deg:.0f} deg along the trace", "one across it", hint="correct the dip direction"
        )
    width = (lower_depth_m - upper_depth_m) / np.sin(dip)
    length = float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())
    spacing = max(np.sqrt(length * width / CELLS), 1e-3) if spacing_m is None else spacing_m
    _check_spacing(name, spacing, length, width)
    along = _divided(points, spacing)
    rows = max(FEWEST_ROWS, int(np.ceil(width / spacing)) + 1)
    depths = np.linspace(upper_depth_m, lower_depth_m, rows)
    shift = 0.0 if dip_deg == 90.0 else 1 / np.tan(dip)
    down = np.column_stack([(depths * shift)[:, None] * towards, -depths])
    vertices = (along[None] + down[:, None]).reshape(-1, 3) + 0.0
    return Surface(name, vertices, grid_cells(rows, len(along), _hanging_wall_left(chord, towards)), source)


def mean_dip_direction_deg(trace: ArrayLike, side_deg: float) -> float:
    """Return the azimuth across a trace (N, 2), from end to end, that lies nearer to the side named, degrees [0, 360)."""
    east, north = _chord(np.asarray(trace, float))
    right = (np.degrees(np.arctan2(east, north)) + 90.0) % 360.0
    return float(right if abs((right - side_deg + 180.0) % 360.0 - 180.0) <= 90.0 else (right + 180.0) % 360.0)


def _chord(points: Floats) -> Floats:
    """Return the way from the first to the last point on the map, that of the first leg where they are the same."""
    chord = points[-1, :2] - points[0, :2]
    legs = np.diff(points[:, :2], axis=0)
    return chord if chord.any() else legs[legs.any(1).argmax()]


def _distinct(trace: ArrayLike, name: str) -> Floats:
    """Return the points (N, 3) of a trace that differ on the map from the one before."""
    try:
        points = np.asarray(trace, float)
    except (TypeError, ValueError):
        raise SurfaceError(
            name, "a trace that is no table of numbers", "points of easting and northing", hint="correct the trace"
        ) from None
    if points.ndim != 2 or points.shape[1] not in (2, 3) or not np.isfinite(points).all():
        found = f"a trace of shape {points.shape}" + ("" if np.isfinite(points).all() else " with numbers that are not finite")
        raise SurfaceError(name, found, "finite points of easting and northing, and up or not", hint="correct the trace")
    points = points if points.shape[1] == 3 else np.column_stack([points, np.zeros(len(points))])
    kept = np.concatenate([[True], (np.diff(points[:, :2], axis=0) != 0).any(1)])[: len(points)]
    if kept.sum() < 2:
        raise SurfaceError(name, "a trace of one point", "two distinct points or more", hint="correct the trace or delete it")
    return points[kept]


def _check(name: str, dip_deg: float, dip_direction_deg: float, upper_depth_m: float, lower_depth_m: float) -> None:
    if not (np.isfinite([dip_deg, dip_direction_deg]).all() and SHALLOWEST_DEG <= dip_deg <= 90.0):
        raise SurfaceError(name, f"dip {dip_deg:g} deg towards {dip_direction_deg:g}", "a dip of 1 to 90 deg", hint="correct the dip")
    if not (np.isfinite([upper_depth_m, lower_depth_m]).all() and lower_depth_m > upper_depth_m):
        found = f"depths {upper_depth_m:g} to {lower_depth_m:g} m"
        raise SurfaceError(name, found, "a lower depth below the upper one", hint="correct the depths; they count down from the trace")


def _check_spacing(name: str, spacing: float, length: float, width: float) -> None:
    if not (np.isfinite(spacing) and spacing > 0):
        raise SurfaceError(name, f"a spacing of {spacing:g} m", "more than 0 m", hint="leave the spacing out for a sensible one")
    if length / spacing * (width / spacing) > MOST_CELLS:
        found = f"a spacing of {spacing:g} m on {length:.0f} by {width:.0f} m"
        raise SurfaceError(name, found, f"{MOST_CELLS:,} cells at most", hint="choose a wider spacing, or leave it out")


def _divided(points: Floats, spacing: float) -> Floats:
    """Return the points with others between them, none further apart than the spacing."""
    steps = np.ceil(np.linalg.norm(np.diff(points, axis=0), axis=1) / spacing - 1e-9).astype(int).clip(1)
    pieces = [a + (b - a) * np.arange(n)[:, None] / n for a, b, n in zip(points[:-1], points[1:], steps, strict=True)]
    return np.concatenate([*pieces, points[-1:]])


def _hanging_wall_left(chord: Floats, towards: Floats) -> bool:
    """Return whether the surface dips to the left of the trace as it runs."""
    return bool(chord[0] * towards[1] - chord[1] * towards[0] > 0)


def grid_cells(rows: int, columns: int, left: bool) -> NDArray[np.int64]:
    """Return the triangles (T, 3) between the points of a grid; row after row lies deeper, wound for a dip to the left or the right."""
    corner = (np.arange(rows - 1)[:, None] * columns + np.arange(columns - 1)).reshape(-1, 1)
    # Seen from the right of the trace, down is across: along, then down, turns towards the left side.
    first, second = corner + [0, 1, columns + 1], corner + [0, columns + 1, columns]
    triangles = np.concatenate([first, second])
    return np.ascontiguousarray(triangles if left else triangles[:, ::-1]).astype(np.int64)
