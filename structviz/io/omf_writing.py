"""OMF 1 files written: surfaces in metres with values on their faces, the same bytes for the same surfaces."""

from __future__ import annotations

import hashlib
import json
import uuid
import zlib
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from structviz.io.format import CellData, encoded
from structviz.surfaces.surface import Surface

MARK, VERSION, HEADER = b"\x84\x83\x82\x81", b"OMF-v0.9.0", 60
NAMESPACE = uuid.UUID("6f1c2b54-6a3b-5d0e-9f43-0d3f6b1c8a11")  # of identifiers made from contents
WHEN = "2000-01-01T00:00:00Z"  # the same for all, so that the same surfaces give the same bytes
ARRAYS = {"f": "<f8", "i": "<i8", "u": "<i8"}


def write(surface: Surface, cell_data: CellData) -> bytes:
    """Return an OMF 1 file of one surface in metres, with values on its faces."""
    return write_all([(surface, cell_data)])


def write_all(surfaces: Sequence[tuple[Surface, CellData]]) -> bytes:
    """Return an OMF 1 file of several surfaces; identifiers are made from the contents, so the same surfaces give the same bytes."""
    blob = bytearray()
    held: dict[str, dict] = {}
    elements = [put_surface(blob, held, place, surface, data) for place, (surface, data) in enumerate(surfaces)]
    about = {"name": "", "description": "", "author": "", "revision": "", "units": "m", "elements": elements, "origin": [0.0, 0.0, 0.0]}
    key = put(held, "Project", about, hashlib.sha256(blob).hexdigest())
    head = MARK + VERSION.ljust(32, b"\0") + uuid.UUID(key).bytes + (HEADER + len(blob)).to_bytes(8, "little")
    return head + bytes(blob) + json.dumps(held).encode("ascii")


def put(held: dict, kind: str, body: dict, salt: object = "") -> str:
    """Enter an object and return its identifier, made from what it holds."""
    key = str(uuid.uuid5(NAMESPACE, f"{kind}|{salt}|{json.dumps(body, sort_keys=True)}"))
    held[key] = {"date_created": WHEN, "date_modified": WHEN, **body, "__class__": kind}
    return key


def put_array(blob: bytearray, held: dict, values: NDArray) -> str:
    """Append a packed array and return the identifier of the object that says where it is."""
    kind = ARRAYS[values.dtype.kind]
    rows = {(3, "f"): "Vector3Array", (3, "i"): "Int3Array"}
    name = rows.get((values.shape[1], kind[1])) if values.ndim == 2 else "ScalarArray"
    found = zlib.compress(np.ascontiguousarray(values, kind).tobytes(), 6)
    place = {"start": HEADER + len(blob), "dtype": kind, "length": len(found)}
    blob += found
    return put(held, name or "ScalarArray", {"array": place})


def put_surface(blob: bytearray, held: dict, place: int, surface: Surface, cell_data: CellData) -> str:
    """Enter a surface with its values and return the identifier of its element."""
    vertices = put_array(blob, held, np.asarray(surface.vertices, np.float64))
    triangles = put_array(blob, held, np.asarray(surface.triangles, np.int64))
    body = {"origin": [0.0, 0.0, 0.0], "vertices": vertices, "triangles": triangles}
    geometry = put(held, "SurfaceGeometry", body, place)
    data = [key for name, values in cell_data.items() for key in put_values(blob, held, name, values)]
    name = surface.name.encode(errors="replace").decode()
    shown = {"name": name, "description": "", "data": data, "color": [120, 120, 120], "textures": [], "subtype": "surface"}
    return put(held, "SurfaceElement", {**shown, "geometry": geometry}, place)


def put_values(blob: bytearray, held: dict, name: str, values: NDArray) -> list[str]:
    """Enter the values of one name on faces: words as numbers with a legend, rows of three as vectors, other rows column by column."""
    numbers, legend = encoded(values)
    about = {"name": name, "description": "", "location": "faces"}
    if numbers.ndim == 2 and numbers.shape[1] != 3:
        return [key for column in range(numbers.shape[1]) for key in put_values(blob, held, f"{name} {column + 1}", numbers[:, column])]
    if legend:
        words = put(held, "StringArray", {"array": list(legend)})
        entries = put(held, "Legend", {"name": name, "description": "", "values": words})
        return [put(held, "MappedData", {**about, "array": put_array(blob, held, numbers), "legends": [entries]})]
    if numbers.ndim == 2:
        return [put(held, "Vector3Data", {**about, "array": put_array(blob, held, numbers.astype(np.float64))})]
    return [put(held, "ScalarData", {**about, "array": put_array(blob, held, numbers)})]
