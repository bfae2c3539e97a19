"""DXF text: 3DFACE, polyface and polygon meshes and MESH entities, one surface a layer; blocks are placed where they are inserted.

Read through ezdxf (`pip install 'structviz[formats]'`), the well-kept library for this format.
"""

from __future__ import annotations

import io
import re
from collections import Counter
from collections.abc import Iterator
from typing import Any

import numpy as np

from structviz.errors import FormatError, StructvizError, SurfaceError
from structviz.io.cells import counted
from structviz.io.format import Format, Piece, start_of
from structviz.surfaces.surface import Floats, Integers

START = re.compile(rb"^\s*0\s*\r?\n\s*SECTION\s*\r?\n\s*2\s*\r?\n", re.M)
BINARY = b"AutoCAD Binary DXF"  # the signature that the format's reference prescribes
UNITS = {1: "inches", 2: "feet", 4: "millimetres", 5: "centimetres", 6: "metres", 7: "kilometres", 21: "US survey feet"}
DEEPEST, MOST_ENTITIES = 16, 5_000_000
MOST_COPIED = 20_000  # entities that inserting blocks again may add: a small file can ask for billions, at 0.1 ms each
HINT = "export the surfaces as 3D faces or polyface meshes in DXF text"

Faces = list[tuple[Floats, list[tuple[int, ...]]]]  # places and the corners of faces among them


def sniff(content: bytes) -> bool:
    """Return True for DXF text, after comments, and for binary DXF (which is told apart on reading)."""
    start = start_of(content, 4096)
    return start.startswith(BINARY) or START.match(start.split(b"999")[0] or start) is not None or bool(_after_comments(start))


def _after_comments(start: bytes) -> bool:
    """Return True where comments (group 999) stand before the first section."""
    return re.match(rb"(\s*999[^\n]*\n[^\n]*\n)+\s*0\s*\r?\n\s*SECTION", start) is not None


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return one surface for each layer that holds faces, in the file's own unit, which is told where its header names it."""
    document = _document(content, file)
    layers: dict[str, Faces] = {}
    others: Counter[str] = Counter()
    try:
        for entity in _entities(document.modelspace(), file, len(document.entitydb)):
            found = _faces_of(entity)
            if found is None:
                others[entity.dxftype()] += 1
            elif found[1]:
                layers.setdefault(str(entity.dxf.layer), []).append(found)
    except StructvizError:
        raise
    except MemoryError:
        raise
    except Exception as error:  # the library meets damage in many ways
        raise FormatError(
            file, f"an entity that cannot be read ({type(error).__name__}: {error})"[:300], "whole entities", hint=HINT
        ) from None
    if not layers:
        what = ", ".join(f"{count} {name}" for name, count in others.most_common(4)) or "no entities"
        raise SurfaceError(file, f"no faces ({what})", "3DFACE, polyface or MESH entities", hint=HINT)
    told = tuple(f"{counted(count, name)} not read" for name, count in sorted(others.items()))
    unit = UNITS.get(int(document.header.get("$INSUNITS", 0) or 0), "")
    if unit and unit != "metres":
        told += (f"its header says {unit}: coordinates are taken as they stand, so give length_unit in a model file",)
    return tuple(_piece(name, faces, file, told) for name, faces in layers.items())


def _document(content: bytes, file: str) -> Any:
    try:
        import ezdxf
    except ImportError:
        raise StructvizError(
            f"{file}: DXF is read through ezdxf, which is not installed", hint="pip install 'structviz[formats]'"
        ) from None
    if start_of(content).startswith(BINARY):
        raise FormatError(file, "binary DXF", "DXF text", hint=HINT)
    if b"EOF" not in content[-64:]:
        raise FormatError(file, "text that breaks off", "DXF that ends with EOF", hint="the file was cut short: export it again")
    try:
        document = ezdxf.read(io.StringIO(_text(content)))
        errors = document.audit().errors
    except MemoryError:
        raise
    except Exception as error:  # the library meets damage in many ways
        raise FormatError(file, f"DXF that cannot be read ({type(error).__name__}: {error})"[:300], "whole DXF text", hint=HINT) from None
    if errors:
        first = str(errors[0].message)[:160]
        raise FormatError(file, f"{counted(len(errors), 'error')} in its structure (the first: {first})", "sound DXF", hint=HINT)
    return document


def _text(content: bytes) -> str:
    """Return the text: UTF-8 since 2007, one byte a letter before that."""
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("cp1252", "replace")


def _entities(layout: Any, file: str, held: int) -> Iterator[Any]:
    """Yield every entity of a layout, those of inserted blocks placed; FormatError where blocks hold each other without end.

    `held` is how many entities the document has.
    """
    most = min(MOST_ENTITIES, held + MOST_COPIED)
    count, waiting = 0, [(iter(layout), 0)]
    while waiting:
        entities, depth = waiting[-1]
        entity = next(entities, None)
        if entity is None:
            waiting.pop()
            continue
        count += 1
        if count > most or depth > DEEPEST:
            raise FormatError(file, "blocks within blocks without end", f"{DEEPEST} levels and {most:,} entities", hint=HINT)
        if entity.dxftype() == "INSERT":
            in_rows = entity.mcount > 1  # one entity that stands for rows and columns of the block
            waiting.append((iter(entity.multi_insert() if in_rows else entity.virtual_entities()), depth + (not in_rows)))
        else:
            yield entity


def _faces_of(entity: Any) -> tuple[Floats, list[tuple[int, ...]]] | None:
    """Return places and faces of an entity, None where it is of a kind that has none."""
    kind = entity.dxftype()
    if kind == "3DFACE":
        corners = [entity.dxf.vtx0, entity.dxf.vtx1, entity.dxf.vtx2, entity.dxf.vtx3]
        return np.array([tuple(corner) for corner in corners]), [(0, 1, 2, 3)]
    if kind == "MESH" or (kind == "POLYLINE" and (entity.is_poly_face_mesh or entity.is_polygon_mesh)):
        from ezdxf.render import MeshBuilder

        built = MeshBuilder.from_mesh(entity) if kind == "MESH" else MeshBuilder.from_polyface(entity)
        return np.array([tuple(place) for place in built.vertices]).reshape(-1, 3), [tuple(face) for face in built.faces]
    return None


def _piece(name: str, found: Faces, file: str, told: tuple[str, ...]) -> Piece:
    """Return the triangles of a layer; corners at one place are joined, as faces repeat them."""
    places, corners, start = [], [], 0
    for vertices, faces in found:
        places.append(vertices)
        for face in faces:
            if any(not 0 <= corner < len(vertices) for corner in face):
                raise FormatError(file, f"a face of layer {name[:40]!r} with a corner that is not there", "corners that are", hint=HINT)
            corners += [(face[0] + start, face[k] + start, face[k + 1] + start) for k in range(1, len(face) - 1)]
        start += len(vertices)
    vertices = np.concatenate(places)
    unique, inverse = np.unique(vertices, axis=0, return_inverse=True)
    triangles: Integers = inverse.reshape(-1)[np.array(corners, np.int64).reshape(-1, 3)]
    a, b, c = triangles.T
    sound = (a != b) & (b != c) & (c != a)  # a 3DFACE with three corners names its last one twice
    return Piece(name, unique, triangles[sound], told=told)


FORMATS = (Format("dxf", "DXF", (".dxf",), sniff, read, None),)
