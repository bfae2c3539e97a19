"""The field of stress axes as VTK XML files: VTI for a regular grid, VTU for points, VTP for trajectories."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.io.formats.vtk_xml import appended
from structviz.stress.by_place import ByPlace
from structviz.stress.field import StressField, stress_field
from structviz.stress.trajectories import azimuths_on_grid, shmax_trajectories

Floats = NDArray[np.float64]

VERTEX = 1  # VTK's number for a cell of one point
HIDDEN = 2  # VTK's mark of a point that is not to be drawn


@dataclass(frozen=True)
class Grid:
    """A regular grid of points, easting running fastest."""

    origin: tuple[float, float, float]  # m
    spacing: tuple[float, float, float]  # m
    size: tuple[int, int, int]  # points along easting, northing, up

    def points(self) -> Floats:
        """Return the points, m, shape (P, 3)."""
        east, north, up = (o + s * np.arange(n) for o, s, n in zip(self.origin, self.spacing, self.size, strict=True))
        z, y, x = np.meshgrid(up, north, east, indexing="ij")
        return np.stack([x, y, z], -1).reshape(-1, 3)


def grid_about(places: Floats, cells: int = 24) -> Grid:
    """Return a grid of cubes over the box about places (F, 3), m, `cells` of them along its longest side."""
    low, high = places.min(0), places.max(0)
    step = max(float((high - low).max()), 1.0) / cells
    size = np.ceil((high - low) / step - 1e-9).astype(int) + 1
    origin = (low + high) / 2 - step * (size - 1) / 2
    return Grid(tuple(map(float, origin)), (step, step, step), tuple(map(int, size)))  # type: ignore[arg-type]


def grid_file(field: StressField, grid: Grid) -> bytes:
    """Return a VTI file of the field at the points of a grid. ArgumentError where the points are not those of the grid."""
    if field.points.shape != (int(np.prod(grid.size)), 3) or not np.allclose(field.points, grid.points(), rtol=0, atol=1e-3):
        raise ArgumentError("field: found other points than those of the grid", hint="make the field at grid.points()")
    blocks: list[bytes] = []
    extent = " ".join(f"0 {n - 1}" for n in grid.size)
    origin, spacing = (" ".join(repr(float(v)) for v in values) for values in (grid.origin, grid.spacing))
    head = f'WholeExtent="{extent}" Origin="{origin}" Spacing="{spacing}"'
    return _file("ImageData", head, f'<Piece Extent="{extent}">\n{_point_data(field, blocks)}</Piece>\n', blocks)


def points_file(field: StressField) -> bytes:
    """Return a VTU file of the field at its points, each a vertex."""
    blocks: list[bytes] = []
    count = len(field.points)
    cells: dict[str, NDArray] = {
        "connectivity": np.arange(count, dtype=np.int64),
        "offsets": np.arange(1, count + 1, dtype=np.int64),
        "types": np.full(count, VERTEX, np.uint8),
    }
    data = _point_data(field, blocks)
    places = appended("Points", field.points, blocks)
    corners = "".join(appended(name, array, blocks) for name, array in cells.items())
    piece = f'<Piece NumberOfPoints="{count}" NumberOfCells="{count}">\n{data}'
    return _file("UnstructuredGrid", "", f"{piece}<Points>\n{places}</Points>\n<Cells>\n{corners}</Cells>\n</Piece>\n", blocks)


def trajectories_file(lines: Sequence[Floats]) -> bytes:
    """Return a VTP file of polylines (M, 3), m."""
    blocks: list[bytes] = []
    points = np.concatenate([np.zeros((0, 3)), *lines])
    ends = np.cumsum([len(line) for line in lines], dtype=np.int64)
    places = appended("Points", points, blocks)
    corners = appended("connectivity", np.arange(len(points), dtype=np.int64), blocks) + appended("offsets", ends, blocks)
    piece = f'<Piece NumberOfPoints="{len(points)}" NumberOfLines="{len(lines)}">\n'
    return _file("PolyData", "", f"{piece}<Points>\n{places}</Points>\n<Lines>\n{corners}</Lines>\n</Piece>\n", blocks)


def _point_data(field: StressField, blocks: list[bytes]) -> str:
    """Return the PointData element: reduced tensors of values 1, 0.5, 0, axes, spreads, numbers of faults, azimuth, what is blank."""
    axes = field.axes
    tensors = np.einsum("pi,pj->pij", axes[:, 0], axes[:, 0]) + 0.5 * np.einsum("pi,pj->pij", axes[:, 1], axes[:, 1])
    arrays: dict[str, NDArray] = {"reduced_stress": tensors.reshape(-1, 9)}
    for k in range(3):
        arrays[f"sigma{k + 1}"] = axes[:, k]
        arrays[f"sigma{k + 1}_spread_deg"] = field.spread_deg[:, k]
    arrays |= {"shmax_deg": field.shmax_deg, "faults": field.count, "supported": field.supported.astype(np.uint8)}
    arrays["vtkGhostType"] = np.where(field.supported, 0, HIDDEN).astype(np.uint8)
    return f"<PointData>\n{''.join(appended(name, array, blocks) for name, array in arrays.items())}</PointData>\n"


def _file(kind: str, head: str, body: str, blocks: list[bytes]) -> bytes:
    opening = f'<?xml version="1.0"?>\n<VTKFile type="{kind}" version="1.0" byte_order="LittleEndian" header_type="UInt64">\n'
    text = f'{opening}<{kind}{" " if head else ""}{head}>\n{body}</{kind}>\n<AppendedData encoding="raw">\n_'
    return b"".join([text.encode(), *blocks, b"\n</AppendedData>\n</VTKFile>\n"])


def field_outputs(place: ByPlace) -> dict[str, bytes]:
    """Return field.vti, the stress on a grid about the faults, and trajectories.vtp, lines of SHmax at their middle depth, by name.

    Where one stress serves the whole model the field is made with the longest bandwidth that was tried, so that it still ends
    where the faults do.
    """
    chosen = place.bandwidth
    radius = chosen.radius_m if np.isfinite(chosen.radius_m) else float(chosen.candidates_m[-2])
    grid = grid_about(place.data.places)
    east, north, _ = grid.origin
    level = Grid((east, north, float(place.data.places[:, 2].mean())), grid.spacing, (*grid.size[:2], 1))
    flat = stress_field(place.data, level.points(), radius)
    azimuths = azimuths_on_grid((east, north), grid.spacing[0], flat.shmax_deg.reshape(grid.size[1], grid.size[0]))
    lines = shmax_trajectories(azimuths, level.points()[flat.supported], grid.spacing[0] / 4, 1.5 * grid.spacing[0])
    return {"field.vti": grid_file(stress_field(place.data, grid.points(), radius), grid), "trajectories.vtp": trajectories_file(lines)}
