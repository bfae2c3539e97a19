"""Triangles of polygons, strips and grid cells; each cell type is known by its number in the VTK file formats."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from structviz.errors import FormatError, SurfaceError
from structviz.surfaces.surface import Integers

# VTK cell type -> how its corners become triangles. Numbers: the VTK file formats, an open standard.
TRIANGLE, STRIP, POLYGON, PIXEL, QUAD = 5, 6, 7, 8, 9
CORNERS_OF_CURVED = {22: 3, 34: 3, 69: 3, 23: 4, 28: 4, 30: 4, 70: 4}  # quadratic and higher faces, read by their corners
VOLUMES = frozenset({10, 11, 12, 13, 14, 15, 16, 24, 25, 26, 27, 29, 32, 33, 37, 41, 42, 71, 72, 73, 74, 78, 79, 80, 81})


def fan(ids: Integers, ends: Integers) -> Integers:
    """Return triangles (T, 3) fanned from the first corner of each polygon; `ends` (P,) closes each run of `ids`."""
    sizes = np.diff(ends, prepend=0)
    if len(sizes) and (sizes == 3).all():
        return ids[: ends[-1]].reshape(-1, 3)
    count = np.maximum(sizes - 2, 0)
    start = np.repeat(ends - sizes, count)
    step = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    return np.stack([ids[start], ids[start + step + 1], ids[start + step + 2]], axis=1) if len(start) else np.zeros((0, 3), np.int64)


def strips(ids: Integers, ends: Integers) -> Integers:
    """Return triangles (T, 3) of triangle strips; every second one is turned so that the winding runs on."""
    sizes = np.diff(ends, prepend=0)
    count = np.maximum(sizes - 2, 0)
    start = np.repeat(ends - sizes, count)
    step = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    first, odd = start + step, step % 2
    if not len(first):
        return np.zeros((0, 3), np.int64)
    return np.stack([ids[first], ids[first + 1 + odd], ids[first + 2 - odd]], axis=1)


def check_runs(ids: Integers, ends: Integers, file: str) -> None:
    """Raise FormatError unless the ends rise from zero to no more than the number of ids."""
    if len(ends) and (ends.min() < 0 or ends.max() > len(ids) or (np.diff(ends) < 0).any()):
        raise FormatError(
            file, f"cell ends that do not fit {len(ids)} corner numbers", "ends that rise to that number", hint="write the file again"
        )


def triangles_of_cells(ids: Integers, ends: Integers, types: NDArray, file: str) -> tuple[Integers, tuple[str, ...]]:
    """Return triangles (T, 3) of mixed cells in the order of the cells, and in words what was split or left out."""
    check_runs(ids, ends, file)
    if (types == TRIANGLE).all() and (np.diff(ends, prepend=0) == 3).all():
        return ids[: ends[-1] if len(ends) else 0].reshape(-1, 3), ()
    found, owners, history = [], [], []
    for kind in np.unique(types):
        rows = np.flatnonzero(types == kind)
        made, owner, words = _of_one_type(int(kind), ids, ends, rows)
        found.append(made)
        owners.append(owner)
        history += words
    triangles = np.concatenate(found) if found else np.zeros((0, 3), np.int64)
    if not len(triangles):
        raise no_triangles(types, file)
    return triangles[np.argsort(np.concatenate(owners), kind="stable")], tuple(history)


def _of_one_type(kind: int, ids: Integers, ends: Integers, rows: Integers) -> tuple[Integers, Integers, list[str]]:
    """Return triangles, the cell each came from, and the words for it, of the cells of one type."""
    sizes = np.diff(ends, prepend=0)[rows]
    if kind in CORNERS_OF_CURVED:
        sizes_used = np.minimum(sizes, CORNERS_OF_CURVED[kind])
        words = [f"{counted(len(rows), 'curved face')} read by the corners only"]
    elif kind in (TRIANGLE, STRIP, POLYGON, PIXEL, QUAD):
        sizes_used, words = sizes, split_words(kind, sizes)
    else:
        what = "volume cell" if kind in VOLUMES else "line or point cell" if kind <= 4 or kind in (21, 35) else f"type {kind} cell"
        return np.zeros((0, 3), np.int64), np.zeros(0, np.int64), [f"{counted(len(rows), what)} left out"]
    begin = np.repeat(ends[rows] - sizes, sizes_used)
    used_ends = np.cumsum(sizes_used)
    own = ids[begin + np.arange(len(begin)) - np.repeat(used_ends - sizes_used, sizes_used)]
    made = strips(own, used_ends) if kind in (STRIP, PIXEL) else fan(own, used_ends)
    return made, np.repeat(rows, np.maximum(sizes_used - 2, 0)), words


def split_words(kind: int, sizes: Integers) -> list[str]:
    """Return what the history says of the cells of one type: how many were split, how many were too small."""
    name = {STRIP: "triangle strip", PIXEL: "quadrilateral", QUAD: "quadrilateral"}.get(kind, "polygon")
    split, small = int((sizes > 3).sum()), int((sizes < 3).sum())
    words = [f"{counted(split, name)} split into triangles"] if split else []
    return words + ([f"{counted(small, 'cell')} of fewer than three corners left out"] if small else [])


def counted(number: int, noun: str) -> str:
    """Return a number with its noun.

    >>> counted(1, "cell"), counted(1200, "face")
    ('1 cell', '1,200 faces')
    """
    return f"{number:,} {noun}{'' if number == 1 else 's'}"


def no_triangles(types: ArrayLike, file: str) -> SurfaceError:
    """Return the error for a mesh in which no cell is a face."""
    kinds = np.asarray(types)
    if not len(kinds):
        return SurfaceError(file, "no cells", "a surface of triangles", hint="export the fault surface itself, then try again")
    if np.isin(kinds, list(VOLUMES)).any():
        hint = "export the fault surfaces (triangles), not the volume around them; in Gmsh name a physical group of triangles"
        return SurfaceError(
            file,
            f"{counted(int(np.isin(kinds, list(VOLUMES)).sum()), 'volume cell')} and no triangles",
            "a surface of triangles",
            hint=hint,
        )
    return SurfaceError(file, "only lines and points", "a surface of triangles", hint="export the triangulated surface, not its outline")


def used_only(vertices: NDArray, triangles: Integers) -> tuple[NDArray, Integers]:
    """Return the vertices that the triangles use, in their order, and the triangles renumbered to them."""
    used = np.zeros(len(vertices), bool)
    used[triangles.ravel()] = True
    return vertices[used], (np.cumsum(used) - 1)[triangles]


def parted(vertices: NDArray, triangles: Integers, owner: Integers, parts: int) -> list[tuple[NDArray, Integers]]:
    """Return for each part 0, 1, ... the vertices (V, 3) its triangles use, in their order, and its triangles (T, 3) renumbered to them.

    `owner` (T,) is the part of each triangle. All parts are cut out in one go: a million triangles may belong to many parts.
    """
    order = np.argsort(owner, kind="stable")
    corners, own = triangles[order], owner[order].astype(np.int64)
    used, renumbered = np.unique(own[:, None] * len(vertices) + corners, return_inverse=True)
    renumbered = renumbered.reshape(corners.shape)
    first = np.searchsorted(used, np.arange(parts + 1, dtype=np.int64) * len(vertices))
    rows = np.searchsorted(own, np.arange(parts + 1))
    places = vertices[used % max(len(vertices), 1)]
    return [(places[first[k] : first[k + 1]], np.ascontiguousarray(renumbered[rows[k] : rows[k + 1]] - first[k])) for k in range(parts)]


def check_indices(triangles: Integers, count: int, file: str, *, base: int = 0) -> None:
    """Raise FormatError where a corner number is outside the vertices; numbers are told as the file counts them."""
    if not len(triangles):
        return
    low, high = int(triangles.min()), int(triangles.max())
    if low < 0 or high >= count:
        worst = low if low < 0 else high
        found = f"corner number {worst + base} in a triangle"
        raise FormatError(
            file, found, f"{base} to {count - 1 + base} ({count} vertices)", hint="the file is damaged or cut short: export it again"
        )
