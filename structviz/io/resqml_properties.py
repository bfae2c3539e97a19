"""Values on the triangles of RESQML representations, added to a copy of their package.

Every part of the package stays as it was, byte for byte, but the list of content types, which names the new parts as well. Arrays go
into an HDF5 file of their own.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.epc import CONTENT_TYPES, DAMAGED
from structviz.io.epc_writing import (
    Made,
    hdf5_bytes,
    identifier,
    object_text,
    overrides,
    plain,
    proxy_of,
    reference,
    relationships,
    stored,
    zipped,
)
from structviz.io.xml_tree import tree_of
from structviz.io.zip_parts import part, parts_of

ROOT_KIND = "a48c9c25-1e3a-43c8-be6a-044224cc69cb"  # the property kind "property" of the Energistics dictionary, parent of all others
QUANTITIES = {"dega": "plane angle", "Euc": "dimensionless", "": "not a measure"}


@dataclass(frozen=True)
class Host:
    """The representation that values belong to."""

    kind: str
    uuid: str
    part: str
    title: str
    version: str  # of RESQML
    patches: tuple[int, ...]  # triangles of each


@dataclass(frozen=True, eq=False)
class Values:
    """One value a triangle: numbers with a unit, or codes with the words they stand for."""

    title: str
    numbers: NDArray  # (T,)
    unit: str = ""  # "dega" | "Euc" (a plain ratio) | ""
    kind: str = ""  # standard property kind of version 2.0.1
    words: tuple[str, ...] = ()


def with_properties(content: bytes, file: str, values: Sequence[tuple[Host, Sequence[Values]]], h5_name: str) -> tuple[bytes, bytes]:
    """Return a copy of a package with values on its triangles, and the HDF5 file of these."""
    salt = hashlib.sha256(content).hexdigest()
    versions = sorted({host.version for host, _ in values})
    proxy = proxy_of(identifier("results", salt), h5_name)
    named = {version: [one for host, many in values if host.version == version for one in many] for version in versions}
    shared = {version: _shared(version, salt, ones) for version, ones in named.items()}
    made = [proxy] if "2.0" in versions else []
    made += [one for found in shared.values() for one in found.values()]
    arrays: dict[str, NDArray] = {}
    for host, many in values:
        for one in many:
            made.append(_property(host, one, (proxy, h5_name, salt), shared[host.version], arrays))
    return _extended(content, file, made), hdf5_bytes(arrays, proxy.uuid)


def _shared(version: str, salt: str, values: Sequence[Values]) -> dict[str, Made]:
    """Return what values refer to: tables of words, and in version 2.2 the kinds of properties; by title."""
    found: dict[str, Made] = {}
    for one in values:
        if one.title in found:
            continue
        if version == "2.2":
            parent = reference("e:Parent", "PropertyKind", ROOT_KIND, "property", version, "e")
            body = f"<e:IsAbstract>false</e:IsAbstract><e:QuantityClass>{QUANTITIES[one.unit]}</e:QuantityClass>{parent}"
            title = one.title + "".join(f", {code} {word}" for code, word in enumerate(one.words))
            found[one.title] = Made("PropertyKind", identifier("kind", salt, one.title), title, body, (), "", "e", version)
        elif one.words:
            rows = "".join(
                f"<r:Value><r:Key>{code}</r:Key><r:Value>{plain(word)}</r:Value></r:Value>" for code, word in enumerate(one.words)
            )
            found[one.title] = Made("StringTableLookup", identifier("words", salt, one.title), one.title, rows)
    return found


def _property(host: Host, one: Values, place: tuple[Made, str, str], shared: Mapping[str, Made], arrays: dict[str, NDArray]) -> Made:
    """Return the object of one property, its arrays entered by their paths."""
    proxy, h5_name, salt = place
    key = identifier("property", salt, host.uuid, one.title)
    ends = np.cumsum(host.patches)[:-1]
    numbers = one.numbers.astype("<i4") if one.words else one.numbers.astype("<f4")
    paths = [f"/RESQML/{key}/values_patch{k}" for k in range(len(host.patches))]
    arrays.update(zip(paths, np.split(numbers, ends), strict=True))
    tag, sort = "r:Values" if host.version == "2.0" else "r:ValuesForPatch", "Integer" if one.words else "Double"
    counts = zip(paths, host.patches, strict=True)
    held = [stored(tag, sort, path, count, host.version, (proxy.uuid, h5_name)) for path, count in counts]
    of = reference("r:SupportingRepresentation", host.kind, host.uuid, host.title, host.version)
    link = (host.kind, host.uuid, host.part)
    if host.version == "2.2":
        return _property_2_2(one, key, of, held, shared[one.title], (link, h5_name))
    kind = f'<r:PropertyKind xsi:type="r:StandardPropertyKind"><r:Kind>{one.kind}</r:Kind></r:PropertyKind>'
    patches = "".join(
        f"<r:PatchOfValues><r:RepresentationPatchIndex>{k}</r:RepresentationPatchIndex>{array}</r:PatchOfValues>"
        for k, array in enumerate(held)
    )
    body = f"<r:Count>1</r:Count><r:IndexableElement>faces</r:IndexableElement>{of}{kind}{patches}"
    if one.words:
        lookup = shared[one.title]
        body += reference("r:Lookup", lookup.kind, lookup.uuid, lookup.title, "2.0")
        return Made("CategoricalProperty", key, one.title, body, (link, lookup.link, proxy.link))
    return Made("ContinuousProperty", key, one.title, f"{body}{_range('r', numbers)}<r:UOM>{one.unit}</r:UOM>", (link, proxy.link))


def _property_2_2(one: Values, key: str, of: str, held: Sequence[str], kind: Made, place: tuple[tuple[str, str, str], str]) -> Made:
    """Return the object of one property in version 2.2."""
    link, h5_name = place
    body = "<r:IndexableElement>faces</r:IndexableElement><r:ValueCountPerIndexableElement>1</r:ValueCountPerIndexableElement>"
    body += reference("r:PropertyKind", "PropertyKind", kind.uuid, kind.title, "2.2", "e") + of + "".join(held)
    body += "" if one.words else f"<r:Uom>{one.unit}</r:Uom>"
    return Made("DiscreteProperty" if one.words else "ContinuousProperty", key, one.title, body, (link, kind.link), h5_name, "r", "2.2")


def _range(space: str, numbers: NDArray) -> str:
    """Return the elements of the smallest and the greatest value, none where nothing is known."""
    known = numbers[np.isfinite(numbers)]
    if not len(known):
        return ""
    low, high = float(known.min()), float(known.max())
    return f"<{space}:MinimumValue>{low!r}</{space}:MinimumValue><{space}:MaximumValue>{high!r}</{space}:MaximumValue>"


def _extended(content: bytes, file: str, made: Sequence[Made]) -> bytes:
    """Return a package with objects added: new parts, and their entries in the list of content types."""
    parts = parts_of(content, file)
    held = {name: part(parts, name) for name in parts.entries if not name.endswith("/")}
    listed = held[CONTENT_TYPES]
    end = listed.rfind(b"</")
    new = {one.part: object_text(one).encode() for one in made} | {name: text.encode() for name, text in relationships(made).items()}
    if end < 0 or set(new) & set(held):
        raise FormatError(file, "a list of content types that cannot be added to", "a whole package", hint=DAMAGED)
    prefix = _prefix(listed)
    added = overrides(made).replace("<Override", f"<{prefix}Override").encode()
    longer = listed[:end] + added + listed[end:]
    tree_of(longer, f"{file}, {CONTENT_TYPES}")  # still XML after the change
    return zipped(held | {CONTENT_TYPES: longer} | new)


def _prefix(listed: bytes) -> str:
    """Return the prefix of the elements in a list of content types, with its colon, "" where it has none."""
    closing = listed[listed.rfind(b"</") + 2 :].split(b">")[0].strip().decode("utf-8", "replace")
    return closing.rpartition(":")[0] + ":" if ":" in closing else ""
