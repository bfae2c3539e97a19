"""Packages of Energistics data objects (EPC): XML parts in a zip archive by the open packaging conventions, arrays in HDF5 files beside.

Objects are known by their UUID, and their class by the list of content types; names of parts carry no meaning.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import PurePosixPath
from typing import Any
from urllib.parse import unquote
from xml.etree.ElementTree import Element

from structviz.errors import FormatError, InputError
from structviz.io.format import Beside
from structviz.io.hdf5 import mark_of, opened
from structviz.io.xml_tree import text_at, tree_of
from structviz.io.zip_parts import Parts, part, parts_of, unsafe

CONTENT_TYPES = "[Content_Types].xml"
CLASS = re.compile(r"application/x-(resqml|eml)\+xml;\s*version=([\d.]+);\s*type=(?:obj_)?(\w+)")
TIMES, SPARE = 10, 2**28  # bytes of memory that XML, and arrays, may take: so many times the files, and so many more
BYTES_OF_AN_ELEMENT = 200  # that a parsed element takes, measured
EXTERNAL = "externalResource"  # last word of the relationship to a file beside
DAMAGED = "the package is damaged or incomplete: export it again"


@dataclass(frozen=True)
class Reference:
    """What one object says of another."""

    uuid: str
    kind: str  # its class
    title: str


@dataclass(frozen=True, eq=False)
class Package:
    """An open package: its parts, the class of each, and what has been read of it so far."""

    file: str
    parts: Parts
    classes: Mapping[str, str]  # name of part -> class
    versions: Mapping[str, str]  # name of part -> version of its schema
    beside: Beside
    trees: dict[str, Element] = field(default_factory=dict)  # name of part -> root
    found: dict[tuple[str, ...], dict[str, Element]] = field(default_factory=dict)  # classes -> objects by UUID
    files: dict[str, str] = field(default_factory=dict)  # UUID of what stands for a file beside -> its name
    stores: dict[str, Any] = field(default_factory=dict)  # name of file beside -> open HDF5
    told: list[str] = field(default_factory=list)  # what reading noticed of the package as a whole
    left: dict[str, int] = field(default_factory=dict)  # bytes of memory that XML and arrays may still take


def package_of(content: bytes, file: str, beside: Beside) -> Package:
    """Return an open package; FormatError where it is none."""
    parts = parts_of(content, file)
    classes, versions = {}, {}
    for entry in tree_of(part(parts, CONTENT_TYPES), f"{file}, {CONTENT_TYPES}").iter("Override"):
        known = CLASS.fullmatch(entry.get("ContentType", "").strip())
        if known:
            name = entry.get("PartName", "").removeprefix("/")
            classes[name], versions[name] = known[3], known[2]
    return Package(file, parts, classes, versions, beside, left=dict.fromkeys(("XML", "arrays"), TIMES * len(content) + SPARE))


def charge(package: Package, what: str, size: int) -> None:
    """Count bytes against what may be taken of a package; FormatError beyond it: few words may stand for very much."""
    package.left[what] -= size
    if package.left[what] < 0:
        raise FormatError(package.file, f"{what} that unpack to far more than the files", "less", hint=DAMAGED)


def xml_part(package: Package, name: str) -> Element:
    """Return the root of a part, parsed anew."""
    content = part(package.parts, name)
    charge(package, "XML", len(content) + BYTES_OF_AN_ELEMENT * (content.count(b"<") - content.count(b"</")))
    return tree_of(content, f"{package.file}, {name}")


def tree(package: Package, name: str) -> Element:
    """Return the root of a part, parsed once."""
    if name not in package.trees:
        package.trees[name] = xml_part(package, name)
        package.trees[name].tag = package.trees[name].tag.removeprefix("obj_")  # some writers of 2.0.1 put it there, too
    return package.trees[name]


def objects(package: Package, *kinds: str) -> dict[str, Element]:
    """Return the objects of some classes by their UUID, in the order of their UUIDs; FormatError where one comes twice."""
    if kinds in package.found:
        return package.found[kinds]
    found: dict[str, Element] = {}
    for name in sorted(name for name, kind in package.classes.items() if kind in kinds):
        root = tree(package, name)
        uuid = root.get("uuid", "").lower()
        if not uuid or uuid in found:
            what = "an object without a UUID" if not uuid else f"two objects with the UUID {uuid[:40]}"
            raise FormatError(f"{package.file}, {name}", what, "one UUID an object", hint=DAMAGED)
        found[uuid] = root
    package.found[kinds] = dict(sorted(found.items()))
    return package.found[kinds]


def reference(element: Element | None) -> Reference:
    """Return what a reference names; all empty where there is none. Version 2.0 has UUID and ContentType, 2.2 Uuid and QualifiedType."""
    uuid = (text_at(element, "UUID") or text_at(element, "Uuid")).lower()
    kind = text_at(element, "ContentType").rpartition("type=")[2] or text_at(element, "QualifiedType").rpartition(".")[2]
    return Reference(uuid, kind.removeprefix("obj_"), text_at(element, "Title"))


def title_of(root: Element | None) -> str:
    """Return the title in the citation of an object, on one line."""
    return " ".join(text_at(root, "Citation/Title").split())


def external_name(package: Package, uuid: str) -> str:
    """Return the file that an EpcExternalPartReference stands for, by the relationships of its part."""
    if uuid not in package.files:
        package.files[uuid] = _external_name(package, uuid)
    return package.files[uuid]


def _external_name(package: Package, uuid: str) -> str:
    for name in sorted(name for name, kind in package.classes.items() if kind == "EpcExternalPartReference"):
        if tree(package, name).get("uuid", "").lower() != uuid:
            continue
        place = PurePosixPath(name)
        rels = f"{place.parent / '_rels' / place.name}.rels".removeprefix("./")
        for link in xml_part(package, rels).iter("Relationship"):
            if link.get("TargetMode") == "External" and link.get("Type", "").endswith(EXTERNAL):
                return link.get("Target", "")
    raise FormatError(package.file, f"no file for the arrays of {uuid[:40] or 'an object'}", "an external HDF5 part", hint=DAMAGED)


def external_names(package: Package) -> set[str]:
    """Return every file beside that the relationships of a package name."""
    found: set[str] = set()
    for name in package.parts.entries:
        if name.endswith(".rels"):
            links = xml_part(package, name).iter("Relationship")
            found |= {unquote(link.get("Target", "")) for link in links if link.get("TargetMode") == "External"}
    return found


def store(package: Package, target: str, uuid: str = "") -> Any:
    """Return the HDF5 file that a package names, read once; `uuid` is that of what stands for it in version 2.0.

    Where the name leads out of the folder, or there is no such file, the one named like the package is taken if it carries that UUID, and
    told: packages are renamed together with their arrays, and some writers name whole paths.
    """
    if target not in package.stores:
        name = unquote(target)
        try:
            if unsafe(name):
                hint = "keep the HDF5 file in the folder of the package"
                raise InputError(package.file, f"arrays in {name[:120]!r}", "the name of a file beside the package", hint=hint)
            content, found = package.beside(name), name
        except InputError as refused:
            content, found = _renamed(package, name, uuid, refused)
        package.stores[target] = opened(content, found)
        package.left["arrays"] += TIMES * len(content)
        stored = mark_of(package.stores[target])
        if uuid and stored and stored != uuid:
            package.told.append(f"{found} carries the identifier {stored[:40]}, where the package says {uuid}")
    return package.stores[target]


def _renamed(package: Package, name: str, uuid: str, refused: InputError) -> tuple[bytes, str]:
    """Return the content and name of the HDF5 file named like the package; the refusal of the other where it is not the right one."""
    other = f"{PurePosixPath(package.file).stem}.h5"
    if other == name:
        raise refused
    try:
        content = package.beside(other)
    except InputError:
        raise refused from None
    stored = mark_of(opened(content, other))
    if stored != (uuid or PurePosixPath(name).name.lower()):  # version 2.2 has no UUID here; its writers may put the name of the file
        hint = f"put {PurePosixPath(name).name[:80]} beside the package"
        raise FormatError(other, f"the identifier {stored[:40]!r}", f"{uuid or name[:80]}, which the package names", hint=hint)
    package.told.append(f"{name[:120]} is not there: arrays are taken from {other}, which carries its identifier")
    return content, other
