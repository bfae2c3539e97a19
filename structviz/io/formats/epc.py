"""RESQML 2.0.1 and 2.2 read, 2.0.1 written: interpretations with triangulated sets and grids, in an EPC package with HDF5 beside it.

The file states its units, datum and local axes, so its surfaces are framed: easting, northing, up in metres. An interpretation gives
its name and says what a surface is; where it has several representations, one is used and the others are set aside.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from xml.etree.ElementTree import Element

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io.cells import counted
from structviz.io.epc import CONTENT_TYPES, Package, objects, package_of, title_of
from structviz.io.format import Beside, Format, Piece
from structviz.io.resqml_arrays import NotRead
from structviz.io.resqml_surfaces import GRID, KINDS, TRIANGULATED, Mesh, declarations, interpretation_of, interpretations, mesh_of
from structviz.io.resqml_writing import package_of_model
from structviz.io.zip_parts import part, parts_of

OTHERS = ("PointSetRepresentation", "PolylineRepresentation", "PolylineSetRepresentation")
EXPORT = "export the fault surfaces as triangulated sets in depth, with their interpretations"


def sniff(content: bytes) -> bool:
    """Return True for a zip archive whose list of content types names Energistics objects."""
    if not content.startswith(b"PK") or CONTENT_TYPES.encode() not in content:
        return False
    try:
        listed = part(parts_of(content, ""), CONTENT_TYPES)
    except FormatError:
        return False
    return b"x-resqml+xml" in listed or b"x-eml+xml" in listed


def explain(content: bytes) -> str:
    """Return in words what is wrong with a content named .epc that is no package."""
    if not content.startswith(b"PK"):
        return ""
    try:
        parts = parts_of(content, "")
    except FormatError as error:
        return error.found
    if CONTENT_TYPES not in parts.entries:
        return f"a ZIP archive without {CONTENT_TYPES}"
    return "a package without RESQML objects"


def read(content: bytes, file: str) -> tuple[Piece, ...]:
    """Return the surfaces of a package that needs no file beside it."""
    return read_beside(content, file, alone)


def alone(name: str) -> bytes:
    """Raise InputError: a content without a place has no files beside it."""
    raise InputError(name, "a file that belongs to a package", "the two in one folder", hint="read the package from its folder")


def read_beside(content: bytes, file: str, beside: Beside) -> tuple[Piece, ...]:
    """Return the surfaces of a package: faults, horizons, and what stands for neither, set aside."""
    return tuple(piece for piece, _, _ in surfaces_of(package_of(content, file, beside)))


def surfaces_of(package: Package) -> list[tuple[Piece, Element, Mesh]]:
    """Return every surface that is read, with the object it comes from; SurfaceError where there is none."""
    meaning = interpretations(package)
    found: list[tuple[Piece, Element, Mesh]] = []
    skipped: list[tuple[Element, str]] = []
    for root in objects(package, TRIANGULATED, GRID).values():
        try:
            mesh = mesh_of(package, root)
        except NotRead as error:
            skipped.append((root, f"{title_of(root)[:80]!r} is not read: {error}"))
            continue
        found.append((piece_of(root, mesh, meaning), root, mesh))
    if not found:
        what = "; ".join(words for _, words in skipped[:3]) or "no triangulated sets or grids"
        raise SurfaceError(package.file, what, "a surface with heights in length", hint=EXPORT)
    others = Counter(kind for kind in package.classes.values() if kind in OTHERS)
    roots = [root for _, root, _ in found]
    missed = missed_faults(skipped, roots, meaning)
    noted = [words for _, words in skipped if words not in missed]
    told = (*package.told, *noted, *(f"{counted(count, kind)} not read" for kind, count in sorted(others.items())))
    used = chosen([piece for piece, _, _ in found], [interpretation_of(root).uuid for root in roots], [title_of(root) for root in roots])
    return [(replace(piece, told=told, missed=missed), root, mesh) for piece, (_, root, mesh) in zip(used, found, strict=True)]


def missed_faults(skipped: list[tuple[Element, str]], read: list[Element], meaning: dict[str, Element]) -> tuple[str, ...]:
    """Return the words for what was not read of faults that no other representation shows, or that may be faults."""
    shown = {interpretation_of(root).uuid for root in read}
    kinds = [KINDS.get(inner.tag, "other") for inner in meaning.values()]
    missed = []
    for root, words in skipped:
        named = interpretation_of(root)
        kind = KINDS.get(meaning[named.uuid].tag if named.uuid in meaning else named.kind, "" if not named.uuid else "other")
        if (kind == "fault" and named.uuid not in shown) or (not kind and "fault" not in kinds):
            missed.append(words)
    return tuple(missed)


def piece_of(root: Element, mesh: Mesh, meaning: dict[str, Element]) -> Piece:
    """Return the surface of one representation, named by its interpretation."""
    named = interpretation_of(root)
    interpretation = meaning.get(named.uuid)
    declared, told = declarations(interpretation)
    kind = KINDS.get(interpretation.tag if interpretation is not None else named.kind, "")
    name = title_of(interpretation) or named.title or title_of(root)
    aside = "" if kind or not named.uuid else f"the file says it is neither fault nor horizon ({named.kind})"
    return Piece(name, mesh.vertices, mesh.triangles, (*mesh.history, *told), aside, kind, declared, True, mesh.crs)


def chosen(pieces: list[Piece], meanings: list[str], titles: list[str]) -> list[Piece]:
    """Return the pieces with those set aside that say nothing new, and names told apart by the titles of the representations.

    Of several representations of one interpretation the one of most triangles is used. Where the file has fault interpretations, what
    has no interpretation at all is set aside.
    """
    best: dict[str, int] = {}
    for place, (piece, uuid) in enumerate(zip(pieces, meanings, strict=True)):
        if uuid and (uuid not in best or len(piece.triangles) > len(pieces[best[uuid]].triangles)):
            best[uuid] = place
    faults = any(piece.kind == "fault" for piece in pieces)
    taken: set[str] = set()
    found = dict.fromkeys(range(len(pieces)), pieces[0])
    for place in sorted(found, key=lambda place: (best.get(meanings[place]) != place, place)):  # those that are used name themselves first
        piece, aside, name = pieces[place], pieces[place].aside, pieces[place].name
        if meanings[place] and best[meanings[place]] != place:
            aside, name = aside or "another representation of the same interpretation", titles[place] or name
        elif not meanings[place] and faults:
            aside = "no interpretation says that it is a fault"
        found[place] = replace(piece, aside=aside, name=free_name(name, taken))
    return list(found.values())


def free_name(name: str, taken: set[str]) -> str:
    """Return a name with a number behind it where it is taken already, and enter it."""
    number, free = 1, name
    while free in taken:
        number += 1
        free = f"{name} ({number})"
    taken.add(free)
    return free


FORMATS = (Format("resqml", "RESQML 2.0.1, 2.2", (".epc",), sniff, read, None, (), explain, read_beside, None, package_of_model),)
