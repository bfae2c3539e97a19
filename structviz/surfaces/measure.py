"""A surface measured: one winding a part, normals to the hanging wall, mean orientation, condition."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.errors import SurfaceError
from structviz.orientation.planes import strike_dip_deg
from structviz.orientation.statistics import fisher_mean
from structviz.orientation.vectors import angle_deg, unit
from structviz.surfaces.condition import examine
from structviz.surfaces.geometry import areas_and_normals, middles, panels
from structviz.surfaces.surface import MeasuredSurface, Part, Surface
from structviz.surfaces.topology import Topology, topology

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

UPRIGHT = np.sin(np.radians(0.5))  # a mean normal that rises less than this is level: "up" would be decided by noise
STEEP_DEG = 80.0  # parts this steep share the hanging wall of the largest part
STRAY_SHARE = 0.05  # parts under this share of the area say nothing about the mean
APART_DEG = 45.0  # parts whose planes differ by more have no meaningful mean
LEAST_AGREEMENT = 0.6  # |sum of area times normal| over area, or the tensor's share; below, the surface faces every way
FARTHEST_M = 1e10  # no map frame of the earth reaches so far; beyond, squares of lengths overflow
CONE_PANELS = 16  # neighbouring triangles repeat each other: the cone counts panels of the surface, not triangles


def measure(surface: Surface) -> MeasuredSurface:
    """Return the surface measured; its triangles keep their order and its vertices their places.

    Normals point from foot wall to hanging wall, chosen once for each part: winding made alike by adjacency, then the sign
    for which the area-weighted mean points up. A steep part whose dip passes through vertical therefore keeps one moving
    block. Within half a degree of vertical "up" would be decided by noise: there the side is taken for which the strike lies
    in [0, 180), and parts that dip 80 degrees or more take the side of the largest of them.

    The mean normal is the vector mean, which depends on the rim alone (the vector area): published mean planes follow it.
    Sheets that branch or have no winding take the axis of the orientation tensor instead. `meaningful` is False, with the
    reason, where parts of 5 % of the area or more dip opposite ways or lie over 45 degrees apart, or where the mean
    resultant is below 0.6. Raises SurfaceError where there is no area to measure.
    """
    _check(surface)
    origin = surface.vertices.mean(0)
    corners = np.take(surface.vertices - origin, surface.triangles, axis=0)
    areas, normals = areas_and_normals(corners, rounding=4 * np.finfo(float).eps * float(np.abs(surface.vertices).max()))
    if not areas.sum() > 0:
        raise SurfaceError(
            surface.source or surface.name, "only triangles without area", "at least one triangle with area", hint="export again"
        )
    joined = topology(surface.vertices, surface.triangles, areas)
    centroids = middles(corners)
    normals[joined.turned] *= -1
    normals *= _signs(normals, areas, joined)[joined.sheet_of, None]
    parts = _part_list(normals, areas, joined.part_of, joined.parts)
    mean, agreement = _mean_normal(normals, areas, branched=joined.sheets > joined.parts or bool(joined.unorientable.size))
    strike, dip = strike_dip_deg(mean)
    why_not = _why_no_mean(agreement, parts)
    return MeasuredSurface(
        surface, areas, centroids + origin, normals, joined.part_of, parts, mean, float(strike), float(dip),
        _cone_deg(centroids, normals, areas), not why_not, why_not, examine(surface.vertices, surface.triangles, areas, joined),
    )  # fmt: skip


def _check(surface: Surface) -> None:
    name = surface.source or surface.name
    vertices, triangles = surface.vertices, surface.triangles
    if vertices.ndim != 2 or vertices.shape[1] != 3 or triangles.ndim != 2 or triangles.shape[1:] != (3,) or not len(triangles):
        found = f"vertices {vertices.shape} and triangles {triangles.shape}"
        raise SurfaceError(name, found, "vertices (V, 3) and at least one row of triangles (T, 3)", hint="export the surface as triangles")
    if not np.isfinite(vertices).all():
        found = f"{int((~np.isfinite(vertices)).any(1).sum())} vertices with NaN or infinite coordinates"
        raise SurfaceError(
            name, found, "finite coordinates", hint="remove the undefined nodes where the surface was gridded, and export again"
        )
    if np.abs(vertices).max() > FARTHEST_M:
        raise SurfaceError(
            name, f"coordinates up to {np.abs(vertices).max():.3g} m", f"coordinates within {FARTHEST_M:.0e} m",
            hint="undefined nodes of a grid are often written as 1e30: remove them, and export again",
        )  # fmt: skip
    if triangles.min() < 0 or triangles.max() >= len(vertices):
        raise SurfaceError(
            name, f"a triangle that names vertex {triangles.max()}", f"vertices 0 to {len(vertices) - 1}", hint="export again"
        )


def _signs(normals: Floats, areas: Floats, joined: Topology) -> Floats:
    """Return for each sheet +1 or -1: the sign that makes its winding point to the hanging wall, shape (sheets,)."""
    sums = np.stack([np.bincount(joined.sheet_of, areas * normals[:, k], minlength=joined.sheets) for k in range(3)], 1)
    mean = unit(sums)
    # A level mean normal belongs to a vertical plane: take the side for which strike lies in [0, 180).
    southward = np.where(np.abs(mean[:, 1]) > UPRIGHT, -mean[:, 1], mean[:, 0])
    deciding = np.where(np.abs(mean[:, 2]) >= UPRIGHT, mean[:, 2], southward)
    sign = np.where(deciding < 0, -1.0, 1.0)
    main = int(np.bincount(joined.sheet_of, areas, minlength=joined.sheets).argmax())
    steep = np.abs(mean[:, 2]) < np.cos(np.radians(STEEP_DEG))
    if steep[main]:
        agrees = (mean * sign[:, None]) @ (mean[main] * sign[main])
        sign = np.where(steep & (agrees < 0), -sign, sign)
    return sign


def _mean_normal(normals: Floats, areas: Floats, *, branched: bool) -> tuple[Floats, float]:
    """Return the unit mean normal (3,) and how well the triangles agree with it, 0 to 1.

    It is the vector mean, with its resultant length; of branched sheets the axis of the orientation tensor, whose signs do
    not matter, with its share of the tensor.
    """
    vector = np.einsum("t,tk->k", areas, normals)
    total = areas.sum()
    if not branched:
        return unit(vector), float(np.sqrt(vector @ vector) / total)
    shares, axes = np.linalg.eigh(np.einsum("t,tk,tl->kl", areas, normals, normals, optimize=True) / total)
    axis = axes[:, -1]
    return (axis if axis @ vector >= 0 else -axis), float(shares[-1])


def _part_list(normals: Floats, areas: Floats, part_of: Integers, parts: int) -> tuple[Part, ...]:
    size = np.bincount(part_of, areas, minlength=parts)
    sums = np.stack([np.bincount(part_of, areas * normals[:, k], minlength=parts) for k in range(3)], 1)
    means = unit(sums)
    strikes, dips = strike_dip_deg(means)
    agree = np.abs(np.einsum("tk,tk->t", normals, means[part_of]))
    off = np.degrees(np.arccos(np.minimum(agree, 1.0)))
    spread = np.sqrt(np.bincount(part_of, areas * off**2, minlength=parts) / size)
    columns = np.bincount(part_of, minlength=parts), size, means, strikes, dips, spread
    rows = zip(*(column.tolist() for column in columns), strict=True)
    return tuple(Part(n, area, tuple(mean), strike, dip, off) for n, area, mean, strike, dip, off in rows)


def _why_no_mean(agreement: float, parts: tuple[Part, ...]) -> str:
    """Return in words why the mean plane says nothing; empty where it does."""
    total = sum(part.area_m2 for part in parts)
    notable = [part for part in parts if part.area_m2 >= STRAY_SHARE * total]
    if len(notable) > 1:
        apart = angle_deg(np.array([part.normal for part in notable[1:]]), np.array(notable[0].normal))
        planes = np.minimum(apart, 180.0 - apart)
        # Parts that dip opposite ways first: their mean dips as neither of them, even where the planes are steep and not far apart.
        worst = int(np.argmax(np.where(apart > 90.0, 180.0, 0.0) + planes))
        pair = f"(strike/dip {_plane(notable[0])} and {_plane(notable[1 + worst])})"
        if apart[worst] > 90.0:
            return f"its parts dip opposite ways {pair}"
        if planes[worst] > APART_DEG:
            return f"its parts lie {planes[worst]:.0f} deg apart {pair}"
    return f"it faces every way (mean resultant {agreement:.2f})" if agreement < LEAST_AGREEMENT else ""


def _plane(part: Part) -> str:
    return f"{part.strike_deg:03.0f}/{part.dip_deg:02.0f}"


def _cone_deg(centroids: Floats, normals: Floats, areas: Floats) -> float:
    """Return the 95 % cone about the mean normal by Fisher's statistics over panels of equal extent, degrees; 0 for one or two.

    On planes with undulations it covers the plane in 95 to 99 % of trials, as long as these are shorter than the surface
    (a bend as long as the surface cannot be told from a tilt). For white noise of the vertices it is about twice too wide.
    """
    block = panels(centroids, areas, CONE_PANELS)
    sums = np.stack([np.bincount(block, areas * normals[:, k]) for k in range(3)], 1)
    filled = np.bincount(block, areas) > 0
    means = unit(sums[filled])
    cone = fisher_mean(means).alpha95_deg if filled.sum() > 2 else 0.0
    return 180.0 if cone is None else min(float(cone), 180.0)
