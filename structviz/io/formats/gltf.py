"""glTF 2.0, as text with buffers or as one binary file (GLB): every node with a mesh is one surface, placed by its transforms.

Easting is x, up is y and northing is minus z, as the standard's axes have it; it also says metres. Written as GLB.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io.cells import check_indices, counted, strips, used_only
from structviz.io.format import CELL_ARRAYS, FLOAT64, Beside, CellData, Format, Piece, start_of
from structviz.io.gltf import FLIP, HINT, MAGIC, Body, Document, accessor, document_of, glb
from structviz.surfaces.surface import Floats, Integers, Surface

DEEPEST, MOST_NODES = 64, 100_000
PACKED = ("KHR_draco_mesh_compression", "EXT_meshopt_compression", "KHR_mesh_quantization")
ORIGIN = "origin_m"  # of asset.extras: easting, northing, up that all places are relative to


def sniff(content: bytes) -> bool:
    """Return True for GLB, and for JSON with an asset that is no other known kind."""
    if content.startswith(MAGIC):
        return True
    start = start_of(content, 1_000_000)
    return start.startswith(b"{") and b'"asset"' in start and (b'"meshes"' in content or b'"nodes"' in content or b'"scenes"' in content)


def alone(name: str) -> bytes:
    """Raise InputError: a content without a place has no files beside it."""
    raise InputError(name, "a file that belongs to a glTF document", "the two in one folder", hint="read it from its folder")


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of a document that needs no file beside it."""
    return read_beside(content, file, alone)


def read_beside(content: bytes, file: str, beside: Beside) -> tuple[Piece, ...]:
    """Return one surface for each node that has a mesh with triangles, in the order of the scene."""
    document = document_of(content, file, beside)
    packed = [name for name in _strings(document.tree.get("extensionsRequired")) if name in PACKED]
    if packed:
        raise FormatError(file, f"meshes packed with {', '.join(packed)}", "plain positions", hint="export it without compression")
    origin = _origin(document)
    pieces, lines = [], 0
    for name, mesh, placing in _placed(document):
        vertices, triangles, others = _mesh(document, mesh)
        lines += others
        if len(triangles):
            east_north_up = (vertices @ placing[:3, :3].T + placing[:3, 3]) @ FLIP + origin
            if np.linalg.det(placing[:3, :3]) < 0:
                triangles = np.ascontiguousarray(triangles[:, [0, 2, 1]])
            label = name if isinstance(name, str) and name else document.item("meshes", mesh).get("name", "")
            pieces.append(Piece(label if isinstance(label, str) else "", east_north_up, triangles))
    if not pieces:
        raise SurfaceError(file, "no triangles", "a mesh of triangles", hint="export the fault surface itself, then try again")
    if lines:
        told = (f"{counted(lines, 'set')} of points or lines not read",)
        pieces = [Piece(piece.name, piece.vertices, piece.triangles, told=told) for piece in pieces]
    return tuple(pieces)


def _origin(document: Document) -> Floats:
    extras = document.tree["asset"].get("extras")
    held = extras.get(ORIGIN) if isinstance(extras, dict) else None
    return _numbers(document, held, 3, "an origin") if held is not None else np.zeros(3)


def _strings(listed: Any) -> list[str]:
    return [each for each in listed if isinstance(each, str)] if isinstance(listed, list) else []


def _placed(document: Document) -> Iterator[tuple[Any, Any, Floats]]:
    """Yield name, mesh and placing (4, 4) of every node with a mesh, depth first from the scene, or from all roots without one."""
    waiting = [(number, np.eye(4), 0) for number in reversed(_roots(document))]
    count = 0
    while waiting:
        number, above, depth = waiting.pop()
        count += 1
        if depth > DEEPEST or count > MOST_NODES:
            raise FormatError(document.file, "nodes that hold each other without end", f"{DEEPEST} levels, {MOST_NODES:,} nodes", hint=HINT)
        node = document.item("nodes", number)
        placing = above @ _transform(document, node)
        if "mesh" in node:
            yield node.get("name", ""), node["mesh"], placing
        children = node.get("children", [])
        waiting += [(child, placing, depth + 1) for child in reversed(children if isinstance(children, list) else [])]


def _roots(document: Document) -> list[Any]:
    if document.tree.get("scenes"):
        nodes = document.item("scenes", document.tree.get("scene", 0)).get("nodes", [])
        return list(nodes) if isinstance(nodes, list) else []
    nodes = document.tree.get("nodes")
    listed = nodes if isinstance(nodes, list) else []
    held = {child for node in listed if isinstance(node, dict) for child in _whole(node.get("children"))}
    return [number for number in range(len(listed)) if number not in held]


def _whole(listed: Any) -> list[int]:
    return [each for each in listed if isinstance(each, int)] if isinstance(listed, list) else []


def _transform(document: Document, node: dict[str, Any]) -> Floats:
    """Return the placing of a node in its parent, (4, 4) acting on columns."""
    if "matrix" in node:
        return _numbers(document, node["matrix"], 16, "a matrix").reshape(4, 4).T
    placing = np.eye(4)
    x, y, z, w = _numbers(document, node.get("rotation", [0, 0, 0, 1]), 4, "a rotation")
    placing[:3, :3] = [
        [1 - 2 * (y * y + z * z), 2 * (x * y - z * w), 2 * (x * z + y * w)],
        [2 * (x * y + z * w), 1 - 2 * (x * x + z * z), 2 * (y * z - x * w)],
        [2 * (x * z - y * w), 2 * (y * z + x * w), 1 - 2 * (x * x + y * y)],
    ]
    placing[:3, :3] *= _numbers(document, node.get("scale", [1, 1, 1]), 3, "a scale")
    placing[:3, 3] = _numbers(document, node.get("translation", [0, 0, 0]), 3, "a translation")
    return placing


def _numbers(document: Document, values: Any, count: int, what: str) -> Floats:
    right = (
        isinstance(values, list) and len(values) == count and all(isinstance(v, (int, float)) and not isinstance(v, bool) for v in values)
    )
    numbers = np.array([float(value) for value in values]) if right and all(abs(value) < 1e300 for value in values) else None
    if numbers is None or not np.isfinite(numbers).all():
        raise FormatError(document.file, f"{what} {str(values)[:60]}", f"{count} numbers", hint=HINT)
    return numbers


def _mesh(document: Document, number: Any) -> tuple[Floats, Integers, int]:
    """Return vertices and triangles of all primitives of a mesh, and how many of them are points or lines."""
    primitives = document.item("meshes", number).get("primitives", [])
    vertices, triangles, start, others = [np.zeros((0, 3))], [np.zeros((0, 3), np.int64)], 0, 0
    for primitive in primitives if isinstance(primitives, list) else []:
        attributes = primitive.get("attributes") if isinstance(primitive, dict) else None
        mode = primitive.get("mode", 4) if isinstance(primitive, dict) else 4
        if mode in (0, 1, 2, 3) or not isinstance(attributes, dict) or "POSITION" not in attributes:
            others += 1
            continue
        places = accessor(document, attributes["POSITION"], "positions")
        if places.dtype.kind != "f" or places.ndim != 2 or places.shape[1] != 3:
            raise FormatError(document.file, "positions that are not three decimal numbers", "positions as VEC3 of floats", hint=HINT)
        corners = _corners(document, primitive, mode, len(places))
        if len(corners) and len(places) > 3 * len(corners):  # one array that serves many meshes: the rest is theirs
            places, corners = used_only(places, corners)
        document.take(len(places) + len(corners))
        vertices.append(places.astype(np.float64))
        triangles.append(corners + start)
        start += len(places)
    return np.concatenate(vertices), np.concatenate(triangles), others


def _corners(document: Document, primitive: dict[str, Any], mode: Any, count: int) -> Integers:
    """Return the triangles (T, 3) of a list, a strip or a fan of corners."""
    ids = accessor(document, primitive["indices"], "corners") if "indices" in primitive else np.arange(count)
    if ids.dtype.kind not in "ui" or ids.ndim != 1 or mode not in (4, 5, 6):
        raise FormatError(document.file, f"corners of mode {mode!r}", "triangles, a strip or a fan, by whole numbers", hint=HINT)
    ids = ids.astype(np.int64)
    if mode == 4:
        if len(ids) % 3:
            raise FormatError(document.file, f"{len(ids):,} corners of triangles", "three a triangle", hint=HINT)
        triangles: Integers = ids.reshape(-1, 3)
    elif mode == 5:
        triangles = strips(ids, np.array([len(ids)])) if len(ids) > 2 else np.zeros((0, 3), np.int64)
    else:
        inner = np.arange(1, max(len(ids) - 1, 1))
        triangles = (
            np.stack([ids[np.zeros(len(inner), np.int64)], ids[inner], ids[inner + 1]], 1) if len(ids) > 2 else ids[:0].reshape(0, 3)
        )
    check_indices(triangles, count, document.file)
    return triangles


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return a GLB file with one node: positions in single precision about an origin near the surface."""
    return write_all([(surface, cell_data)])


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return a GLB file with one named node a surface."""
    return glb([Body(surface.name, surface.vertices, surface.triangles) for surface, _ in surfaces])


FORMATS = (
    Format("gltf", "glTF 2.0", (".glb", ".gltf"), sniff, read, write, (CELL_ARRAYS, FLOAT64), read_beside=read_beside, write_all=write_all),
)
