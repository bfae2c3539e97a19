"""glTF 2.0 as a container: buffers and accessors of a document read, and named meshes written into one binary file (GLB).

glTF is Y up: x is easting, y is up, z is minus northing. Positions are single precision, so each mesh is written about an origin
of its own, which its node carries as a number of full precision.
"""

from __future__ import annotations

import base64
import binascii
import json
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any
from urllib.parse import unquote

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.surfaces.surface import Floats, Integers

MAGIC = b"glTF"
JSON_CHUNK, BIN_CHUNK = 0x4E4F534A, 0x004E4942
COMPONENTS = {5120: "i1", 5121: "u1", 5122: "<i2", 5123: "<u2", 5125: "<u4", 5126: "<f4"}
WIDTHS = {"SCALAR": 1, "VEC2": 2, "VEC3": 3, "VEC4": 4}
HINT = "export the surface again"
TAKEN = -1
MOST_COPIED = 2_000_000  # rows that using the same data again may add: a small file can ask for billions
FLIP = np.array([[1.0, 0.0, 0.0], [0.0, 0.0, 1.0], [0.0, -1.0, 0.0]])  # rows x, y, z from columns easting, northing, up


@dataclass(frozen=True, eq=False)
class Document:
    """A parsed document with its buffers, which are read when they are asked for."""

    file: str
    tree: dict[str, Any]
    buffer: Callable[[Any], bytes]
    held: dict[int, int]  # bytes of each buffer read so far, the rows handed out so far under TAKEN

    def take(self, rows: int) -> None:
        """Count rows of vertices and triangles; FormatError where they are many more than the bytes they come from."""
        self.held[TAKEN] += rows
        taken = self.held[TAKEN]
        if taken > MOST_COPIED and taken - MOST_COPIED > sum(self.held.values()) - taken:
            wanted = f"at most {MOST_COPIED:,} vertices and triangles of copies"
            raise FormatError(self.file, "data that are used again and again", wanted, hint="export each surface once")

    def item(self, key: str, number: Any) -> dict[str, Any]:
        """Return an object of a list of the document; FormatError where it is not there."""
        held = self.tree.get(key)
        listed: list[Any] = held if isinstance(held, list) else []
        right = isinstance(number, int) and not isinstance(number, bool) and 0 <= number < len(listed)
        if not right or not isinstance(listed[number], dict):
            raise FormatError(self.file, f"{key} {number!r}, which is not in the file", "numbers of what is there", hint=HINT)
        return dict(listed[number])


def document_of(content: bytes, file: str, beside: Callable[[str], bytes]) -> Document:
    """Return the document of a .gltf or .glb content; files it names are read with `beside`."""
    text, binary = _chunks(content, file) if content.startswith(MAGIC) else (content, b"")
    try:
        tree = json.loads(text.decode("utf-8-sig"), parse_constant=_no_number)
    except (ValueError, RecursionError) as error:
        raise FormatError(file, f"JSON that cannot be read ({error})"[:200], "a glTF document", hint=HINT) from None
    if not isinstance(tree, dict) or not isinstance(tree.get("asset"), dict):
        raise FormatError(file, "JSON without an asset", "a glTF document", hint=HINT)
    if not str(tree["asset"].get("version", "")).startswith("2"):
        raise FormatError(file, f"glTF version {str(tree['asset'].get('version'))[:20]!r}", "version 2", hint="export it as glTF 2.0")
    contents: dict[int, bytes] = {}

    def buffer(number: Any) -> bytes:
        found.item("buffers", number)
        if number not in contents:
            contents[number] = _buffer(found, number, binary, beside)
            found.held[number] = len(contents[number])
        return contents[number]

    found = Document(file, tree, buffer, {TAKEN: 0})
    return found


def _no_number(word: str) -> float:
    raise ValueError(f"{word} is no number")


def _chunks(content: bytes, file: str) -> tuple[bytes, bytes]:
    """Return the JSON and the binary chunk of a GLB content."""
    version, length = (int.from_bytes(content[at : at + 4], "little") for at in (4, 8))
    if version != 2 or length != len(content):
        found = f"GLB version {version} of {length:,} bytes, in {len(content):,}"
        raise FormatError(file, found, "version 2, whole", hint="the file is damaged or cut short: export it again")
    chunks: dict[int, bytes] = {}
    at = 12
    while at + 8 <= length:
        size, kind = (int.from_bytes(content[at + k : at + k + 4], "little") for k in (0, 4))
        if at + 8 + size > length:
            raise FormatError(file, f"a chunk of {size:,} bytes, where {length - at - 8:,} are left", "whole chunks", hint=HINT)
        chunks.setdefault(kind, content[at + 8 : at + 8 + size])
        at += 8 + size
    if JSON_CHUNK not in chunks:
        raise FormatError(file, "GLB without a JSON chunk", "a glTF document", hint=HINT)
    return chunks[JSON_CHUNK], chunks.get(BIN_CHUNK, b"")


def _buffer(document: Document, number: int, binary: bytes, beside: Callable[[str], bytes]) -> bytes:
    entry = document.item("buffers", number)
    uri, length = entry.get("uri"), entry.get("byteLength")
    if uri is None:
        content = binary if number == 0 else b""
    elif isinstance(uri, str) and uri.startswith("data:"):
        try:
            content = base64.b64decode(uri.partition(",")[2], validate=True)
        except (binascii.Error, ValueError) as error:
            raise FormatError(document.file, f"a data URI that cannot be decoded ({error})", "base64", hint=HINT) from None
    elif isinstance(uri, str) and "://" not in uri:
        content = beside(unquote(uri))
    else:
        raise FormatError(document.file, f"a buffer at {str(uri)[:80]!r}", "buffers in the file or beside it", hint="export it as one GLB")
    if not isinstance(length, int) or not 0 <= length <= len(content):
        raise FormatError(document.file, f"a buffer of {len(content):,} bytes", f"{length} bytes, as promised", hint=HINT)
    return content


def accessor(document: Document, number: Any, what: str) -> NDArray:
    """Return the values of an accessor, (count,) or (count, width), in their own type; FormatError where they are not all there."""
    entry = document.item("accessors", number)
    kind, width, count = _known(COMPONENTS, entry.get("componentType")), _known(WIDTHS, entry.get("type")), entry.get("count")
    if kind is None or width is None or not isinstance(count, int) or count < 0:
        raise FormatError(
            document.file, f"{what} of type {entry.get('componentType')!r} {str(entry.get('type'))[:20]!r}", "numbers", hint=HINT
        )
    if "bufferView" in entry:
        values = _view(document, entry["bufferView"], entry.get("byteOffset", 0), np.dtype(kind), count, width, what)
    elif "sparse" in entry and count <= MOST_COPIED:
        values = np.zeros((count, width), kind)
    else:
        raise FormatError(document.file, f"{what} without data", "a buffer view", hint=HINT)
    if isinstance(entry.get("sparse"), dict):
        values = _sparse(document, entry["sparse"], values, np.dtype(kind), what)
    return values[:, 0] if width == 1 else values


def _known(table: dict[Any, Any], key: Any) -> Any:
    """Return what a table holds under a key, None where there is nothing or the key is a list or an object."""
    return table.get(key) if isinstance(key, (int, str)) else None


def _view(document: Document, view: Any, offset: Any, kind: np.dtype, count: int, width: int, what: str) -> NDArray:
    entry = document.item("bufferViews", view)
    buffer = document.buffer(entry.get("buffer", -1))
    numbers = [entry.get("byteOffset", 0), entry.get("byteLength"), entry.get("byteStride", 0), offset]
    if not all(isinstance(each, int) and 0 <= each < 2**62 for each in numbers):
        raise FormatError(document.file, f"{what} at no place", "whole numbers of bytes", hint=HINT)
    start, length, stride, offset = (int(each) for each in numbers if each is not None)
    size = kind.itemsize * width
    stride = stride or size
    needed = offset + stride * (count - 1) + size if count else 0
    if stride < size or needed > length or start + length > len(buffer):
        found = f"{what} of {needed:,} bytes in a view of {length:,}, in a buffer of {len(buffer):,}"
        raise FormatError(document.file, found, "data within its buffer", hint=HINT)
    flat = np.frombuffer(buffer, np.uint8, max(needed - offset, 0), start + offset)
    rows = np.lib.stride_tricks.as_strided(flat, (count, size), (stride, 1))
    return np.ascontiguousarray(rows).view(kind).reshape(count, width)


def _sparse(document: Document, entry: dict[str, Any], values: NDArray, kind: np.dtype, what: str) -> NDArray:
    count, places, own = entry.get("count"), entry.get("indices"), entry.get("values")
    if not isinstance(count, int) or count < 0 or not isinstance(places, dict) or not isinstance(own, dict):
        raise FormatError(document.file, f"{what} with broken sparse data", "indices and values", hint=HINT)
    index_kind = _known(COMPONENTS, places.get("componentType"))
    if index_kind not in ("u1", "<u2", "<u4"):
        raise FormatError(document.file, f"{what} with sparse indices of no whole type", "unsigned numbers", hint=HINT)
    rows = _view(document, places.get("bufferView"), places.get("byteOffset", 0), np.dtype(index_kind), count, 1, what)[:, 0]
    replaced = _view(document, own.get("bufferView"), own.get("byteOffset", 0), kind, count, values.shape[1], what)
    if len(rows) and int(rows.max()) >= len(values):
        raise FormatError(document.file, f"{what} with sparse values beyond their end", f"{len(values)} rows", hint=HINT)
    values = values.copy()
    values[rows.astype(np.int64)] = replaced
    return values


@dataclass(frozen=True, eq=False)
class Body:
    """One mesh to write: a node with a name, places in metres and a colour."""

    name: str
    vertices: Floats  # (V, 3) easting, northing, up, m
    triangles: Integers  # (T, 3)
    colour: tuple[float, float, float, float] = (0.6, 0.6, 0.6, 1.0)  # linear red, green, blue; opacity
    group: str = ""  # the node it hangs under


def glb(bodies: Sequence[Body], *, extras: dict[str, Any] | None = None) -> bytes:
    """Return a GLB file with one named node a body; the same bodies give the same bytes. `extras` go with the asset."""
    pieces: list[bytes] = []
    tree: dict[str, Any] = {"asset": {"version": "2.0", "generator": "structviz"}, "scene": 0, "scenes": [{"nodes": []}]}
    if extras:
        tree["asset"]["extras"] = extras
    tree |= {"nodes": [], "meshes": [], "materials": [], "accessors": [], "bufferViews": []}
    groups: dict[str, dict[str, Any]] = {}
    colours: dict[tuple[float, ...], int] = {}
    for body in bodies:
        parent = tree["scenes"][0]["nodes"]
        if body.group:
            if body.group not in groups:
                groups[body.group] = {"name": body.group, "children": []}
                parent.append(len(tree["nodes"]))
                tree["nodes"].append(groups[body.group])
            parent = groups[body.group]["children"]
        parent.append(len(tree["nodes"]))
        tree["nodes"].append(_node(tree, body, pieces, colours))
    binary = b"".join(pieces)
    tree["buffers"] = [{"byteLength": len(binary)}]
    text = json.dumps(tree, ensure_ascii=False, separators=(",", ":")).encode("utf-8", "replace")
    text += b" " * (-len(text) % 4)
    chunks = b"".join(
        len(chunk).to_bytes(4, "little") + kind.to_bytes(4, "little") + chunk for kind, chunk in ((JSON_CHUNK, text), (BIN_CHUNK, binary))
    )
    return MAGIC + (2).to_bytes(4, "little") + (12 + len(chunks)).to_bytes(4, "little") + chunks


def _node(tree: dict[str, Any], body: Body, pieces: list[bytes], colours: dict[tuple[float, ...], int]) -> dict[str, Any]:
    vertices = np.asarray(body.vertices, np.float64)
    finite = vertices[np.isfinite(vertices).all(1)]
    middle = np.round((finite.min(0) + finite.max(0)) / 2) if len(finite) else np.zeros(3)
    places = ((vertices - middle) @ FLIP.T).astype("<f4")
    corners = body.triangles.astype("<u4").ravel()
    if body.colour not in colours:
        colours[body.colour] = len(tree["materials"])
        tree["materials"].append(_material(body.colour))
    extremes = {"min": places.min(0).tolist(), "max": places.max(0).tolist()} if len(finite) == len(places) > 0 else {}
    attributes = {"POSITION": _stored(tree, places, "VEC3", 34962, pieces, extremes)}
    indices = _stored(tree, corners, "SCALAR", 34963, pieces, {})
    primitive = {"attributes": attributes, "indices": indices, "material": colours[body.colour], "mode": 4}
    tree["meshes"].append({"name": body.name, "primitives": [primitive]})
    return {"name": body.name, "mesh": len(tree["meshes"]) - 1, "translation": (FLIP @ middle + 0.0).tolist()}


def _material(colour: tuple[float, float, float, float]) -> dict[str, Any]:
    """Return a matte material seen from both sides: a fault has two."""
    held: dict[str, Any] = {"pbrMetallicRoughness": {"baseColorFactor": list(colour), "metallicFactor": 0.0, "roughnessFactor": 0.9}}
    return held | {"doubleSided": True} | ({"alphaMode": "BLEND"} if colour[3] < 1 else {})


def _stored(tree: dict[str, Any], values: NDArray, kind: str, target: int, pieces: list[bytes], extremes: dict[str, Any]) -> int:
    """Put values into the binary chunk; return the number of their accessor."""
    raw = values.tobytes()
    start = sum(map(len, pieces))
    tree["bufferViews"].append({"buffer": 0, "byteOffset": start, "byteLength": len(raw), "target": target})
    pieces.append(raw + bytes(-len(raw) % 4))
    component = 5126 if values.dtype.kind == "f" else 5125
    entry = {"bufferView": len(tree["bufferViews"]) - 1, "componentType": component, "count": len(values), "type": kind}
    tree["accessors"].append(entry | extremes)
    return len(tree["accessors"]) - 1
