"""Fault and horizon surfaces of a RESQML package: representations, the interpretations they stand for, and what these declare."""

from __future__ import annotations

from dataclasses import dataclass
from xml.etree.ElementTree import Element

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.cells import check_indices, counted, used_only
from structviz.io.declared_names import declared_of
from structviz.io.epc import DAMAGED, Package, Reference, charge, objects, reference, title_of
from structviz.io.resqml_arrays import NotRead, grid_of, indices, points, whole
from structviz.io.resqml_frame import LocalFrame, frame_of, placed
from structviz.io.xml_tree import text_at

BYTES_OF_A_NODE = 48  # that the triangles of a grid take, two a node
TRIANGULATED, GRID = "TriangulatedSetRepresentation", "Grid2dRepresentation"
KINDS = {"FaultInterpretation": "fault", "HorizonInterpretation": "horizon"}
SENSES = {"normal": "normal", "reverse": "reverse", "thrust": "reverse"}  # kinds of throw that say a sense; all others are only told

TOLD = (
    ("MaximumThrow", "greatest throw"), ("MeanAzimuth", "mean azimuth"), ("MeanDip", "mean dip"), ("IsListric", "listric"),
    ("ThrowInterpretation/HasOccuredDuring", "time of movement"), ("ThrowInterpretation/HasOccurredDuring", "time of movement"),
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class Mesh:
    """One representation in metres, and how many triangles each of its patches gave."""

    vertices: NDArray[np.float64]
    triangles: NDArray[np.int64]
    crs: str
    history: tuple[str, ...]
    patches: tuple[int, ...]


def mesh_of(package: Package, root: Element) -> Mesh:
    """Return a representation as triangles; NotRead where its points or its reference system are of a kind that is not read."""
    return grid_mesh(package, root) if root.tag == GRID else triangulated_mesh(package, root)


def triangulated_mesh(package: Package, root: Element) -> Mesh:
    """Return the patches of a triangulated set joined; corner numbers count through all patches, as the standard says."""
    patches = sorted(root.findall("TrianglePatch"), key=lambda patch: place_of(patch, package.file))
    if not patches:
        raise FormatError(package.file, f"no patches in {title_of(root)[:80]!r}", "one or more", hint=DAMAGED)
    frames = [frame_of(package, patch.find("Geometry")) for patch in patches]
    nodes = [whole(patch, "NodeCount", package.file, 1) for patch in patches]
    counts = [triangles_in(package, patch) for patch in patches]
    found = [indices(package, patch.find("Triangles"), 3 * count, "triangles") for patch, count in zip(patches, counts)]
    local = [points(package, *geometry_points(patch, count)) for patch, count in zip(patches, nodes)]
    starts = np.cumsum([0, *nodes[:-1]])
    history: tuple[str, ...] = ()
    if counted_alone(found, nodes, starts):
        found = [corners + start for corners, start in zip(found, starts, strict=True)]
        history = (f"corner numbers of {len(patches)} patches each counted from zero",)
    triangles = np.concatenate(found).reshape(-1, 3)
    check_indices(triangles, sum(nodes), package.file)
    return in_metres(frames, local, triangles, history, tuple(counts))


def place_of(patch: Element, file: str) -> int:
    """Return the number of a patch; version 2.2 has none and goes by their order."""
    return whole(patch, "PatchIndex", file) if patch.find("PatchIndex") is not None else 0


def triangles_in(package: Package, patch: Element) -> int:
    """Return the number of triangles of a patch; version 2.2 states it only with its array."""
    if patch.find("Count") is not None:
        return whole(patch, "Count", package.file, 1)
    inner = patch.find("Triangles")
    stated = 0 if inner is None else sum(whole(one, "Count", package.file) for one in inner.iter("ExternalDataArrayPart"))
    stated = stated or len(text_at(inner, "Values").split())
    if not stated or stated % 3:
        raise FormatError(package.file, f"{stated:,} corner numbers of triangles", "three a triangle", hint=DAMAGED)
    return stated // 3


def geometry_points(patch: Element, count: int) -> tuple[Element, tuple[int], str]:
    """Return the points element of a patch, the shape of its points, and the UUID of their system; NotRead where there is none."""
    inner = patch.find("Geometry/Points")
    if inner is None:
        raise NotRead("no points")
    return inner, (count,), reference(patch.find("Geometry/LocalCrs")).uuid


def counted_alone(found: list[NDArray[np.int64]], nodes: list[int], starts: NDArray[np.int64]) -> bool:
    """Return True where each patch uses all of its own numbers from zero, which would leave the nodes of later patches unused."""
    if len(found) < 2:
        return False
    return all(not corners.min() and corners.max() == count - 1 for corners, count in zip(found, nodes, strict=True)) and bool(
        max(corners.max() for corners in found) < starts[-1] + nodes[-1] - 1
    )


def grid_mesh(package: Package, root: Element) -> Mesh:
    """Return a grid as two triangles a cell; cells with a node that has no height are left out."""
    geometry, rows, columns = grid_of(root, package.file)
    frame = frame_of(package, geometry)
    if geometry is None or geometry.find("Points") is None:
        raise NotRead("no points")
    if min(rows, columns) < 2:
        raise NotRead(f"a grid of {rows} x {columns} nodes")
    nodes = points(package, geometry.find("Points"), (rows, columns), reference(geometry.find("LocalCrs")).uuid)
    charge(package, "arrays", BYTES_OF_A_NODE * rows * columns)
    number = np.arange(rows * columns).reshape(rows, columns)
    a, b, c, d = (block.ravel() for block in (number[:-1, :-1], number[:-1, 1:], number[1:, 1:], number[1:, :-1]))
    triangles = np.stack([a, b, c, a, c, d], axis=1).reshape(-1, 3)
    known = np.asarray(np.isfinite(nodes).all(axis=1))
    kept = np.repeat(known[a] & known[b] & known[c] & known[d], 2)
    if not kept.any():
        raise NotRead("a grid without a whole cell")
    history: tuple[str, ...] = (f"grid of {rows} x {columns} nodes split into triangles",)
    if not kept.all():
        vertices, triangles = used_only(nodes, triangles[kept])
        history = (*history, f"{counted(int((~kept).sum()) // 2, 'cell')} without heights left out")
        return in_metres([frame], [vertices], triangles, history, (len(triangles),))
    return in_metres([frame], [nodes], triangles, history, (len(triangles),))


def in_metres(
    frames: list[LocalFrame], local: list[NDArray], triangles: NDArray[np.int64], history: tuple[str, ...], patches: tuple[int, ...]
) -> Mesh:
    """Return a mesh with every patch brought from its own local system into metres, up positive."""
    if len({(frame.crs, frame.mirrored) for frame in frames}) > 1:
        raise NotRead("patches in different reference systems")
    vertices = np.concatenate([placed(frame, nodes) for frame, nodes in zip(frames, local, strict=True)])
    if frames[0].mirrored:
        triangles = np.ascontiguousarray(triangles[:, [0, 2, 1]])
    told = tuple(dict.fromkeys(words for frame in frames for words in frame.history))
    return Mesh(vertices, triangles, frames[0].crs, (*told, *history), patches)


def interpretation_of(root: Element) -> Reference:
    """Return the interpretation that a representation stands for; all empty where it names none."""
    named = root.find("RepresentedInterpretation")
    return reference(named if named is not None else root.find("RepresentedObject"))


def declarations(interpretation: Element | None) -> tuple[dict[str, str], tuple[str, ...]]:
    """Return what a fault interpretation declares of its movement by our columns, and in words what it says besides and is not used.

    Taken are ExtraMetadata of the names in `io/declared_names.py`, with or without "structviz:" before them, and a single kind of throw
    that is in the table of senses.
    """
    if interpretation is None or interpretation.tag != "FaultInterpretation":
        return {}, ()
    extra = {text_at(pair, "Name").removeprefix("structviz:"): text_at(pair, "Value") for pair in interpretation.findall("ExtraMetadata")}
    taken = declared_of(extra)
    throws = list(dict.fromkeys((kind.text or "").strip().lower() for kind in interpretation.findall("ThrowInterpretation/Throw")))
    told = []
    if throws and not {"sense", "rake_deg"} & set(taken):
        if len(throws) == 1 and throws[0] in SENSES:
            taken["sense"] = SENSES[throws[0]]
        else:
            told.append(f"throw {', '.join(throws)[:80]}: no sense taken from it")
    for tag, words in TOLD:
        found = interpretation.find(tag)
        if found is not None:
            told.append(f"{words} {(found.text or '').strip()[:40]} {found.get('uom', '')}".strip())
    return taken, (f"the file also says, and it is not used: {'; '.join(told)}",) if told else ()


def interpretations(package: Package) -> dict[str, Element]:
    """Return every interpretation of a package by its UUID."""
    kinds = {kind for kind in package.classes.values() if kind.endswith("Interpretation")}
    return objects(package, *kinds) if kinds else {}
