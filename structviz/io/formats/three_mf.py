"""3MF (the open 3D Manufacturing Format, core specification): objects of a zipped XML model, placed by its build items.

Read and written here; the archive is unpacked in memory behind the limits of `zip_parts`, and its XML parsed without entities.
"""

from __future__ import annotations

import io
import zipfile
from collections.abc import Sequence
from dataclasses import dataclass
from xml.etree.ElementTree import Element
from xml.sax.saxutils import quoteattr

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, SurfaceError
from structviz.io.cells import check_indices
from structviz.io.format import CELL_ARRAYS, CellData, Format, Piece
from structviz.io.xml_tree import tree_of
from structviz.io.zip_parts import Parts, part, parts_of
from structviz.surfaces.surface import Floats, Integers, Surface

MODEL_TYPE = "3dmanufacturing/2013/01/3dmodel"  # of the relationship that names the model
MARK = b"3D/"  # the folder every package keeps its model in by convention; the relationship decides
METRES = {"foot": 0.3048, "meter": 1.0}
PRINTED = ("micron", "millimeter", "centimeter", "inch")  # units of printed parts; millimetres are also what writers put who know none
MOST_MODEL = 2**30  # bytes of XML
DEEPEST, MOST_PLACED = 16, 100_000  # objects within objects, and objects placed in all
MOST_COPIED = 2_000_000  # vertices and triangles that placing objects again may add: a small file can ask for billions
HINT = "export the surface again"
SPACE = "http://schemas.microsoft.com/3dmanufacturing/core/2015/02"
RELATIONS = "http://schemas.openxmlformats.org/package/2006/relationships"
TYPES = "http://schemas.openxmlformats.org/package/2006/content-types"
FIRST_DAY = (1980, 1, 1, 0, 0, 0)  # of every entry, so that the same surface gives the same bytes


def sniff(content: bytes) -> bool:
    """Return True for a zip archive with a relationship to a 3D model."""
    if not content.startswith(b"PK") or b"_rels/.rels" not in content:
        return False
    try:
        return MODEL_TYPE.encode() in part(parts_of(content, ""), "_rels/.rels")
    except FormatError:
        return False


@dataclass(frozen=True, eq=False)
class Body:
    """One object: its own mesh, and other objects placed in it."""

    name: str
    vertices: Floats
    triangles: Integers
    components: tuple[tuple[str, Floats], ...]  # object and its 4 by 3 placing


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return one surface for each build item: in metres where the file says metres or feet, else as its numbers stand, which is told."""
    model = _model(parts_of(content, file), file)
    bodies = dict(_body(element, file) for element in model.iterfind("resources/object"))
    unit = model.get("unit", "millimeter")
    if unit not in METRES and unit not in PRINTED:
        raise FormatError(file, f"unit {unit!r}", f"one of {', '.join((*PRINTED, *METRES))}", hint=HINT)
    placed: list[tuple[str, Floats, Integers]] = []
    items = [(item.get("objectid", ""), _placing(item, file)) for item in model.iterfind("build/item")]
    left = [MOST_PLACED, MOST_COPIED + sum(_size(body) for body in bodies.values())]
    for key, placing in items or [(key, np.eye(4, 3)) for key in bodies]:
        whole = _whole(bodies, key, placing, file, 0, left)
        if len(whole[1]):
            placed.append((bodies[key].name, *whole))
    if not placed:
        raise SurfaceError(file, "no triangles", "an object with a mesh", hint="export the fault surface itself, then try again")
    told = () if unit == "meter" else (f"coordinates converted from {unit} to m",)
    if unit in PRINTED:
        told = (f"the file says {unit}, in which no fault is drawn: its numbers are taken as they stand",)
    scale = METRES.get(unit, 1.0)
    return tuple(
        Piece(name, vertices if scale == 1.0 else vertices * scale, triangles, told, framed=unit in METRES)
        for name, vertices, triangles in placed
    )


def _model(parts: Parts, file: str) -> Element:
    """Return the root of the model that the package's relationship names."""
    relations = tree_of(part(parts, "_rels/.rels"), file)
    target = next((r.get("Target", "") for r in relations.iter("Relationship") if MODEL_TYPE in r.get("Type", "")), "")
    root = tree_of(part(parts, target.lstrip("/"), MOST_MODEL), file)
    if root.tag != "model":
        raise FormatError(file, f"a part {root.tag!r} in the place of the model", "a 3MF model", hint=HINT)
    return root


def _body(element: Element, file: str) -> tuple[str, Body]:
    key = element.get("id", "")
    vertices = _numbers([v.get(axis, "") for v in element.iterfind("mesh/vertices/vertex") for axis in "xyz"], "vertices", file).reshape(
        -1, 3
    )
    corners = [t.get(corner, "") for t in element.iterfind("mesh/triangles/triangle") for corner in ("v1", "v2", "v3")]
    triangles = _whole_numbers(corners, file).reshape(-1, 3)
    check_indices(triangles, len(vertices), file)
    inside = tuple((c.get("objectid", ""), _placing(c, file)) for c in element.iterfind("components/component"))
    return key, Body(element.get("name", ""), vertices, triangles, inside)


def _placing(element: Element, file: str) -> Floats:
    """Return the 4 by 3 matrix of a placing: a row (x, y, z, 1) times it is the place."""
    text = element.get("transform")
    if text is None:
        return np.eye(4, 3)
    numbers = _numbers(text.split(), "a transform", file)
    if len(numbers) != 12:
        raise FormatError(file, f"a transform of {len(numbers)} numbers", "twelve numbers", hint=HINT)
    return numbers.reshape(4, 3)


def _size(body: Body) -> int:
    return len(body.vertices) + len(body.triangles)


def _whole(bodies: dict[str, Body], key: str, placing: Floats, file: str, depth: int, left: list[int]) -> tuple[Floats, Integers]:
    """Return all triangles of an object with the objects in it, placed; `left` counts down the objects and rows that may follow."""
    if key not in bodies:
        raise FormatError(file, f"object {key[:40]!r}, which is not in the file", "objects that are there", hint=HINT)
    body = bodies[key]
    left[0] -= 1
    left[1] -= _size(body)
    if depth > DEEPEST or left[0] < 0:
        raise FormatError(
            file, "objects that hold each other without end", f"at most {DEEPEST} levels and {MOST_PLACED:,} objects", hint=HINT
        )
    if left[1] < 0:
        wanted = f"at most {MOST_COPIED:,} vertices and triangles of copies"
        raise FormatError(file, "objects that are placed again and again", wanted, hint="export each surface once")
    mirrored = np.linalg.det(placing[:3]) < 0  # keeps the side of a triangle that faced outwards
    vertices, triangles = [_moved(body.vertices, placing)], [body.triangles[:, [0, 2, 1] if mirrored else [0, 1, 2]]]
    start = len(body.vertices)
    for inner, own in body.components:
        joined = np.concatenate([own[:3] @ placing[:3], (own[3] @ placing[:3] + placing[3])[None]])
        more, corners = _whole(bodies, inner, joined, file, depth + 1, left)
        vertices.append(more)
        triangles.append(corners + start)
        start += len(more)
    return np.concatenate(vertices), np.concatenate(triangles)


def _moved(vertices: Floats, placing: Floats) -> Floats:
    return vertices if np.array_equal(placing, np.eye(4, 3)) else vertices @ placing[:3] + placing[3]


def _numbers(words: list[str], what: str, file: str) -> NDArray[np.float64]:
    try:
        return np.array(words, dtype=np.float64) if words else np.zeros(0)
    except ValueError as error:
        raise FormatError(file, f"{what} that are no numbers ({error})", "numbers", hint=HINT) from None


def _whole_numbers(words: list[str], file: str) -> Integers:
    try:
        return np.array([int(word) for word in words], dtype=np.int64)
    except (ValueError, OverflowError):
        wrong = next(word for word in words if not word.strip().isdigit() or len(word) > 18)
        raise FormatError(file, f"{wrong[:40]!r} among the corners of triangles", "whole numbers", hint=HINT) from None


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return a 3MF package with one object, in metres, every coordinate at full float64 precision."""
    return write_all([(surface, cell_data)])


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return a 3MF package with one named object a surface."""
    objects = "".join(_object(number, surface) for number, (surface, _) in enumerate(surfaces, 1))
    items = "".join(f'<item objectid="{number}"/>' for number in range(1, len(surfaces) + 1))
    head = '<?xml version="1.0" encoding="UTF-8"?>\n'
    model = f'{head}<model unit="meter" xmlns="{SPACE}"><resources>{objects}</resources><build>{items}</build></model>\n'
    types = (
        f'{head}<Types xmlns="{TYPES}"><Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        '<Default Extension="model" ContentType="application/vnd.ms-package.3dmanufacturing-3dmodel+xml"/></Types>\n'
    )
    relation = f'<Relationship Target="/3D/3dmodel.model" Id="rel0" Type="http://schemas.microsoft.com/{MODEL_TYPE}"/>'
    relations = f'{head}<Relationships xmlns="{RELATIONS}">{relation}</Relationships>\n'
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED, compresslevel=5) as archive:
        for name, text in (("[Content_Types].xml", types), ("_rels/.rels", relations), ("3D/3dmodel.model", model)):
            entry = zipfile.ZipInfo(name, FIRST_DAY)
            entry.compress_type = zipfile.ZIP_DEFLATED
            archive.writestr(entry, text.encode(errors="replace"))
    return out.getvalue()


def _object(number: int, surface: Surface) -> str:
    name = quoteattr("".join(" " if ord(letter) < 32 or ord(letter) == 127 else letter for letter in surface.name))
    vertices = "".join(f'<vertex x="{e!r}" y="{n!r}" z="{u!r}"/>' for e, n, u in np.asarray(surface.vertices, float).tolist())
    triangles = "".join(f'<triangle v1="{a}" v2="{b}" v3="{c}"/>' for a, b, c in surface.triangles.tolist())
    mesh = f"<mesh><vertices>{vertices}</vertices><triangles>{triangles}</triangles></mesh>"
    return f'<object id="{number}" type="surface" name={name}>{mesh}</object>'


FORMATS = (Format("3mf", "3MF", (".3mf",), sniff, read, write, (CELL_ARRAYS,), write_all=write_all),)
