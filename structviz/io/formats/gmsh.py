"""Gmsh MSH 2 and 4.1, text and binary. Physical groups of triangles are the surfaces, each by its name or tag.

Where a mesh also holds tetrahedra, a group that lies on the outside of the volume is the model's boundary, not a fault:
it is read, but used only when it is named.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from structviz.io.cells import no_triangles, parted, used_only
from structviz.io.format import CELL_ARRAYS, CellData, Format, Piece, start_of
from structviz.io.gmsh import Mesh, parsed
from structviz.surfaces.surface import Integers, Surface

# Gmsh element type -> the VTK type of the same shape, for messages; only faces and tetrahedra are used.
FACES = {2: 3, 9: 3, 20: 3, 21: 3, 22: 3, 23: 3, 24: 3, 25: 3, 3: 4, 10: 4, 16: 4, 36: 4, 37: 4, 38: 4}  # type -> corners
TETRAHEDRA = (4, 11, 29, 30, 31)
VOLUMES = (*TETRAHEDRA, 5, 6, 7, 12, 13, 14, 17, 18, 19, 92, 93)


def sniff(content: bytes) -> bool:
    """Return True where the file begins with the format block of MSH."""
    return re.match(rb"(\$Comments.*?\$EndComments\s*)?\$MeshFormat", start_of(content, 4096), re.DOTALL) is not None


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return one surface for each physical group of triangles; where there is none, all triangles as one surface."""
    mesh = parsed(content, file)
    corners, groups, history = faces_of(mesh)
    if not len(corners):
        raise no_triangles([10 if kind in VOLUMES else 3 for kind, rows, _ in mesh.blocks for _ in range(min(len(rows), 1))], file)
    numbers = np.unique(groups[groups > 0])
    if not len(numbers):
        return (Piece("", *used_only(mesh.points, corners), history),)
    hull = on_hull(mesh, corners)
    grouped = groups > 0
    owner = np.searchsorted(numbers, groups[grouped])
    inside = np.bincount(owner, ~hull[grouped], minlength=len(numbers)) > 0
    parts = parted(mesh.points, corners[grouped], owner, len(numbers))
    return tuple(piece_of(mesh, int(number), part, bool(keep), history) for number, part, keep in zip(numbers, parts, inside))


def faces_of(mesh: Mesh) -> tuple[Integers, Integers, tuple[str, ...]]:
    """Return triangles (T, 3), their physical group (0 for none), and in words what was split."""
    corners, groups, history = [np.zeros((0, 3), np.int64)], [np.zeros(0, np.int64)], []
    for kind, rows, group in mesh.blocks:
        if kind not in FACES:
            continue
        corners.append(rows[:, :3])
        groups.append(group)
        if FACES[kind] == 4:
            corners.append(rows[:, [0, 2, 3]])
            groups.append(group)
            history.append("quadrilaterals split into triangles")
        if rows.shape[1] > FACES[kind]:
            history.append("curved faces read by the corners only")
    return np.concatenate(corners), np.concatenate(groups), tuple(dict.fromkeys(history))


def on_hull(mesh: Mesh, corners: Integers) -> NDArray[np.bool_]:
    """Return True for triangles that are a face of exactly one tetrahedron."""
    tetrahedra = [rows[:, :4] for kind, rows, _ in mesh.blocks if kind in TETRAHEDRA]
    if not tetrahedra or any(kind in VOLUMES and kind not in TETRAHEDRA for kind, _, _ in mesh.blocks):
        return np.zeros(len(corners), bool)
    faces = np.concatenate(tetrahedra)[:, [[0, 1, 2], [0, 1, 3], [0, 2, 3], [1, 2, 3]]].reshape(-1, 3)
    joined = np.sort(np.concatenate([corners, faces]), axis=1)
    count = len(mesh.points)
    key = (
        (joined[:, 0] * count + joined[:, 1]) * count + joined[:, 2]
        if count < 2_000_000
        else np.unique(joined, axis=0, return_inverse=True)[1]
    )
    _, inverse, times = np.unique(key, return_inverse=True, return_counts=True)
    own = np.bincount(inverse[: len(corners)], minlength=len(times))
    return (times - own)[inverse[: len(corners)]] == 1


def piece_of(mesh: Mesh, number: int, part: tuple[NDArray, Integers], inside: bool, history: tuple[str, ...]) -> Piece:
    """Return the surface of one physical group, set aside where it lies wholly on the outside of the volume."""
    name = mesh.names.get((2, number), f"group {number}")
    return Piece(name, *part, history, "" if inside else "it lies on the outside of the volume mesh, so it bounds the model")


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return MSH 2.2 text: one physical group of triangles under the surface's name, coordinates at full precision."""
    return write_all([(surface, cell_data)])


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return MSH 2.2 text with one physical group of triangles a surface."""
    names = [" ".join(surface.name.replace('"', "'").split()) for surface, _ in surfaces]
    named = "".join(f'2 {group} "{name}"\n' for group, name in enumerate(names, 1) if name)
    head = "$MeshFormat\n2.2 0 8\n$EndMeshFormat\n"
    head += f"$PhysicalNames\n{named.count(chr(10))}\n{named}$EndPhysicalNames\n" if named else ""
    nodes, cells, node, cell = [], [], 1, 1
    for group, ((surface, _), name) in enumerate(zip(surfaces, names, strict=True), 1):
        places, corners = np.asarray(surface.vertices, float).tolist(), (surface.triangles + node).tolist()
        nodes += [f"{row} {e!r} {n!r} {u!r}\n" for row, (e, n, u) in enumerate(places, node)]
        tags = f"2 2 {group if name else 0} {group}"
        cells += [f"{row} {tags} {a} {b} {c}\n" for row, (a, b, c) in enumerate(corners, cell)]
        node, cell = node + len(places), cell + len(corners)
    body = f"$Nodes\n{node - 1}\n{''.join(nodes)}$EndNodes\n$Elements\n{cell - 1}\n{''.join(cells)}$EndElements\n"
    return (head + body).encode(errors="replace")


FORMATS = (Format("msh", "Gmsh MSH", (".msh",), sniff, read, write, (CELL_ARRAYS,), write_all=write_all),)
