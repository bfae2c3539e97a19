"""Arrays of RESQML objects: written out, constant, on a lattice, or kept in HDF5 (by version 2.0.1 and 2.2)."""

from __future__ import annotations

from xml.etree.ElementTree import Element

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.epc import DAMAGED, Package, charge, external_name, objects, reference, store
from structviz.io.hdf5 import array_at
from structviz.io.xml_tree import kind_of, text_at

MOST = 2**31  # numbers in one array
MOST_MADE = 2_000_000  # points or numbers that a few words of XML may stand for


class NotRead(Exception):
    """A representation is of a shape that is not read; the words say which."""


def whole(element: Element | None, path: str, file: str, least: int = 0) -> int:
    """Return a whole number below an element; FormatError where there is none that may be."""
    text = text_at(element, path)
    if not (text.isascii() and text.isdigit() and len(text) < 12 and least <= int(text) < MOST):
        raise FormatError(file, f"{path} {text[:40]!r}", f"a whole number from {least} to {MOST:,}", hint=DAMAGED)
    return int(text)


def real(element: Element | None, path: str, file: str) -> float:
    """Return a finite number below an element; FormatError where there is none."""
    text = text_at(element, path)
    try:
        number = float(text)
    except ValueError:
        number = np.nan
    if not np.isfinite(number):
        raise FormatError(file, f"{path} {text[:40]!r}", "a number", hint=DAMAGED)
    return number


def numbers(package: Package, element: Element | None, count: int, what: str) -> NDArray:
    """Return the flat numbers of an array element, exactly `count`; NotRead for kinds of arrays that are not known."""
    if element is None:
        raise FormatError(package.file, f"no {what}", f"an array of {what}", hint=DAMAGED)
    kind = kind_of(element)
    if kind.endswith(("Hdf5Array", "ExternalArray")):
        inner = element.find("Coordinates" if kind.startswith("Point") else "Values")
        found = stored(package, inner, count, what)
        charge(package, "arrays", 8 * count)  # after the file beside has been opened, which allows for as much as it holds
        return found
    charge(package, "arrays", 8 * count)
    if kind.endswith("ConstantArray"):
        checked(whole(element, "Count", package.file), count, what, package.file)
        check_made(count, what, package.file)
        return np.full(count, real(element, "Value", package.file))
    if kind.endswith("XmlArray"):
        return written(text_at(element, "Values"), count, what, package.file)
    if kind == "IntegerRangeArray":
        checked(whole(element, "Count", package.file), count, what, package.file)
        check_made(count, what, package.file)
        return real(element, "Value", package.file) + np.arange(count)
    raise NotRead(f"{what} as {kind[:60]}")


def stored(package: Package, element: Element | None, count: int, what: str) -> NDArray:
    """Return numbers kept in HDF5: one dataset of version 2.0.1, or the parts of version 2.2 one after the other."""
    pieces = [] if element is None else element.findall("ExternalDataArrayPart")
    if not pieces:
        path, proxy = text_at(element, "PathInHdfFile"), reference(None if element is None else element.find("HdfProxy")).uuid
        if not path:
            raise FormatError(package.file, f"no place for {what}", "the path of a dataset", hint=DAMAGED)
        target = external_name(package, proxy)
        return array_at(store(package, target, proxy), path, count, target)
    counts = [whole(piece, "Count", package.file) for piece in pieces]
    checked(sum(counts), count, what, package.file)
    found = []
    for piece, size in zip(pieces, counts, strict=True):
        if any(start.text and start.text.strip() not in ("", "0") for start in piece.findall("StartIndex")):
            raise NotRead(f"{what} from the middle of a dataset")
        target, path = text_at(piece, "URI"), text_at(piece, "PathInExternalFile")
        found.append(array_at(store(package, target), path, size, target))
    return found[0] if len(found) == 1 else np.concatenate(found)


def written(text: str, count: int, what: str, file: str) -> NDArray[np.float64]:
    """Return numbers written out in the XML."""
    words = text.split()
    checked(len(words), count, what, file)
    try:
        return np.array(words, dtype=np.float64)
    except ValueError:
        raise FormatError(file, f"{what} that are not numbers", f"{count:,} numbers", hint=DAMAGED) from None


def checked(found: int, count: int, what: str, file: str) -> None:
    """Raise FormatError unless as many were found as there must be."""
    if found != count:
        raise FormatError(file, f"{found:,} numbers of {what}", f"{count:,}", hint=DAMAGED)


def check_made(count: int, what: str, file: str) -> None:
    """Raise FormatError where more values would be made up than is sensible without stored ones."""
    if count > MOST_MADE:
        raise FormatError(file, f"{count:,} {what} that are not stored", f"at most {MOST_MADE:,}", hint=DAMAGED)


def indices(package: Package, element: Element | None, count: int, what: str) -> NDArray[np.int64]:
    """Return the flat whole numbers of an array element; FormatError where one has a fraction or is out of range."""
    found = numbers(package, element, count, what)
    if found.dtype.kind == "f" and not (np.abs(found) < 2**53).all():
        raise FormatError(package.file, f"{what} out of range", "whole numbers", hint=DAMAGED)
    turned = found.astype(np.int64)
    if (turned != found).any():
        raise FormatError(package.file, f"{what} with fractions or out of range", "whole numbers", hint=DAMAGED)
    return turned


def points(package: Package, element: Element | None, shape: tuple[int, ...], crs: str) -> NDArray[np.float64]:
    """Return points (N, 3) of a points element, `shape` being their number along each axis, slowest first; NotRead for other kinds.

    `crs` is the UUID of the local reference system they are in.
    """
    count = int(np.prod(shape, dtype=np.int64))
    if count > MOST // 3:
        raise FormatError(package.file, f"{count:,} points", f"at most {MOST // 3:,}", hint=DAMAGED)
    kind = "" if element is None else kind_of(element)
    if element is None or kind in ("Point3dHdf5Array", "Point3dExternalArray"):
        found = numbers(package, element, 3 * count, "points")
        note_single(package, found)
        return found.astype(np.float64).reshape(-1, 3)
    if kind == "Point3dLatticeArray":
        check_made(count, "points", package.file)
        return lattice(package, element, shape)
    if kind == "Point3dZValueArray":
        heights = numbers(package, element.find("ZValues"), count, "heights")  # first: a lattice may be as large as what is stored
        below = element.find("SupportingGeometry")
        stated = below is not None and kind_of(below) == "Point3dLatticeArray"
        found = lattice(package, below, shape) if below is not None and stated else points(package, below, shape, crs)
        found[:, 2] = heights
        return found
    if kind == "Point3dFromRepresentationLatticeArray":
        return borrowed(package, element, shape, crs)
    raise NotRead(f"points as {kind[:60]}")


def note_single(package: Package, found: NDArray) -> None:
    """Tell where single precision steps coordinates by more than a hundredth of a unit, far from the local origin."""
    if found.dtype != np.float32 or not len(found) or not np.isfinite(found).any():
        return
    step = float(np.spacing(np.float32(np.nanmax(np.abs(found)))))
    words = f"points in single precision: coordinates are stepped by up to {step:g}"
    if step > 0.01 and words not in package.told:
        package.told.append(words)


def borrowed(package: Package, element: Element, shape: tuple[int, ...], crs: str) -> NDArray[np.float64]:
    """Return the points (N, 3) that a lattice of indices picks out of another grid; NotRead where that grid borrows its own."""
    named = reference(element.find("SupportingRepresentation"))
    grid = objects(package, "Grid2dRepresentation").get(named.uuid)
    if grid is None:
        raise FormatError(package.file, f"no grid {named.title[:80]!r} to take points from", "the grid in the package", hint=DAMAGED)
    lent, rows, columns = grid_of(grid, package.file)
    inner = lent.find("Points") if lent is not None else None
    if inner is None or kind_of(inner) != "Point3dLatticeArray":
        raise NotRead("points taken from a grid that is no plain lattice")
    if reference(None if lent is None else lent.find("LocalCrs")).uuid != crs:
        raise NotRead("points taken from a grid in another reference system")
    picked = picks(element.find("NodeIndicesOnSupportingRepresentation"), shape, package.file)
    if picked.min() < 0 or picked.max() >= rows * columns:
        raise FormatError(package.file, "points taken from outside a grid", f"0 to {rows * columns - 1}", hint=DAMAGED)
    return points(package, inner, (rows, columns), crs)[picked]


def picks(element: Element | None, shape: tuple[int, ...], file: str) -> NDArray[np.int64]:
    """Return the flat indices of a lattice of whole numbers: a start, and one constant step along each axis."""
    if element is None:
        raise FormatError(file, "no indices of points", "a lattice of indices", hint=DAMAGED)
    offsets = element.findall("Offset")
    if len(offsets) != len(shape) or any(whole(step, "Count", file) + 1 != count for step, count in zip(offsets, shape)):
        raise FormatError(file, f"a lattice of indices of {len(offsets)} axes", f"one of {shape} points", hint=DAMAGED)
    check_made(int(np.prod(shape, dtype=np.int64)), "points", file)
    found = np.array([whole(element, "StartValue", file)], dtype=np.int64)
    for step, count in zip(offsets, shape, strict=True):
        found = (found[:, None] + whole(step, "Value", file) * np.arange(count)).reshape(-1)
    return found


def grid_of(grid: Element, file: str) -> tuple[Element | None, int, int]:
    """Return the geometry of a Grid2dRepresentation and its numbers of nodes along the slow and the fast axis."""
    patch = grid.find("Grid2dPatch")
    inner = grid if patch is None else patch
    return inner.find("Geometry"), whole(inner, "SlowestAxisCount", file, 1), whole(inner, "FastestAxisCount", file, 1)


def lattice(package: Package, element: Element, shape: tuple[int, ...]) -> NDArray[np.float64]:
    """Return the points (N, 3) of a lattice: from the origin, steps of spacing x offset along each axis, the slowest first."""
    axes = element.findall("Offset") or element.findall("Dimension")
    if len(axes) != len(shape):
        raise FormatError(package.file, f"{len(axes)} axes of a lattice", f"{len(shape)}", hint=DAMAGED)
    charge(package, "arrays", 24 * int(np.prod(shape, dtype=np.int64)))
    found = np.array(coordinates(element.find("Origin"), package.file)).reshape(1, 3)
    for axis, count in zip(axes, shape, strict=True):
        inner = axis.find("Offset") if axis.find("Offset") is not None else axis.find("Direction")
        steps = numbers(package, axis.find("Spacing"), count - 1, "spacings") if count > 1 else np.zeros(0)
        along = np.concatenate([[0.0], np.cumsum(steps, dtype=np.float64)])[:, None] * coordinates(inner, package.file)
        found = (found[:, None] + along).reshape(-1, 3)
    return found


def coordinates(element: Element | None, file: str) -> tuple[float, float, float]:
    """Return the three numbers of a point or vector."""
    return real(element, "Coordinate1", file), real(element, "Coordinate2", file), real(element, "Coordinate3", file)
