"""EPC packages written: objects with their citations, references and relationships, and arrays in HDF5.

Identifiers are made from contents and every date is the same: the same input gives the same bytes.
"""

from __future__ import annotations

import io
import uuid
import zipfile
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from xml.sax.saxutils import escape, quoteattr

import numpy as np
from numpy.typing import NDArray

from structviz._version import __version__
from structviz.io.hdf5 import library

NAMESPACE = uuid.UUID("0b7c7d0e-34a5-5b8c-8a43-5f2f9f6f7a10")
WHEN, DATE = "2000-01-01T00:00:00Z", (2000, 1, 1, 0, 0, 0)
RESQML, EML = "http://www.energistics.org/energyml/data/resqmlv2", "http://www.energistics.org/energyml/data/commonv2"
XSI = "http://www.w3.org/2001/XMLSchema-instance"
RELATIONS = "http://schemas.energistics.org/package/2012/relationships"
OPC = "http://schemas.openxmlformats.org/package/2006"
HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'
TITLE = 256  # letters the standard allows in a title
EML_VERSION = {"2.0": "2.0", "2.2": "2.3"}  # that goes with a version of RESQML


@dataclass(frozen=True)
class Made:
    """One object of a package: `space` is r for RESQML and e for the common classes; `body` follows the citation."""

    kind: str
    uuid: str
    title: str
    body: str
    links: tuple[tuple[str, str, str], ...] = ()  # (kind, uuid, part) of each object it refers to
    external: str = ""  # the HDF5 file that belongs to it
    space: str = "r"
    version: str = "2.0"  # of RESQML

    @property
    def schema(self) -> str:
        """The version of its own schema."""
        return self.version if self.space == "r" else EML_VERSION[self.version]

    @property
    def prefixed(self) -> str:
        """The class as content types and part names give it."""
        return f"obj_{self.kind}" if self.version == "2.0" else self.kind

    @property
    def part(self) -> str:
        """The name of its part."""
        return f"{self.prefixed}_{self.uuid}.xml"

    @property
    def content_type(self) -> str:
        """Its content type."""
        return f"application/x-{'resqml' if self.space == 'r' else 'eml'}+xml;version={self.schema};type={self.prefixed}"

    @property
    def link(self) -> tuple[str, str, str]:
        """What another object needs to refer to it."""
        return self.kind, self.uuid, self.part


def identifier(*words: object) -> str:
    """Return a UUID made from words."""
    return str(uuid.uuid5(NAMESPACE, "|".join(map(str, words)).encode("utf-8", "backslashreplace").decode()))


def plain(text: str, most: int = TITLE) -> str:
    """Return a text escaped for XML, on one line, not too long; letters XML cannot hold become blanks."""
    allowed = "".join(
        " " if ord(letter) < 32 or 0xD800 <= ord(letter) < 0xE000 or ord(letter) in (0xFFFE, 0xFFFF) else letter for letter in text
    )
    return escape(allowed[:most])


def reference(tag: str, kind: str, key: str, title: str, version: str, space: str = "r") -> str:
    """Return an element that refers to an object."""
    if version == "2.0":
        family = "resqml" if space == "r" else "eml"
        kind = f"application/x-{family}+xml;version=2.0;type=obj_{kind}"
        return f"<{tag}><e:ContentType>{kind}</e:ContentType><e:Title>{plain(title)}</e:Title><e:UUID>{key}</e:UUID></{tag}>"
    kind = f"resqml22.{kind}" if space == "r" else f"eml23.{kind}"
    return f"<{tag}><e:Uuid>{key}</e:Uuid><e:QualifiedType>{kind}</e:QualifiedType><e:Title>{plain(title)}</e:Title></{tag}>"


def stored(tag: str, kind: str, path: str, count: int, version: str, place: tuple[str, str]) -> str:
    """Return an element for an array kept in HDF5; `kind` is Integer, Double or Point3d, `place` the proxy's UUID and the file.

    Version 2.2 states types: Integer is int32 there, Double float32, and Point3d is not written.
    """
    proxy, file = place
    null = "<{0}:NullValue>-1</{0}:NullValue>".format("r" if version == "2.0" else "e") if kind == "Integer" else ""
    if version == "2.0":
        inner = "r:Coordinates" if kind == "Point3d" else "r:Values"
        held = reference("e:HdfProxy", "EpcExternalPartReference", proxy, "Hdf Proxy", version, "e")
        return (
            f'<{tag} xsi:type="r:{kind}Hdf5Array">{null}<{inner} xsi:type="e:Hdf5Dataset">'
            f"<e:PathInHdfFile>{path}</e:PathInHdfFile>{held}</{inner}></{tag}>"
        )
    array, numbers = {"Integer": ("Integer", "Integer"), "Double": ("FloatingPoint", "FloatingPoint")}[kind]
    stated = {"Integer": "arrayOfInt32LE", "Double": "arrayOfFloat32LE"}[kind]
    part = f"<e:Count>{count}</e:Count><e:PathInExternalFile>{path}</e:PathInExternalFile><e:StartIndex>0</e:StartIndex>"
    part += f"<e:URI>{plain(file)}</e:URI><e:MimeType>application/x-hdf5</e:MimeType>"
    head = f"<e:Array{numbers}Type>{stated}</e:Array{numbers}Type>{null}<e:CountPerValue>1</e:CountPerValue>"
    part = f"<e:Values><e:ExternalDataArrayPart>{part}</e:ExternalDataArrayPart></e:Values>"
    return f'<{tag} xsi:type="e:{array}ExternalArray">{head}{part}</{tag}>'


def proxy_of(key: str, file: str) -> Made:
    """Return the object that stands for an HDF5 file in version 2.0."""
    return Made("EpcExternalPartReference", key, "Hdf Proxy", "<e:MimeType>application/x-hdf5</e:MimeType>", (), file, "e")


def object_text(made: Made) -> str:
    """Return the XML of an object."""
    spaces = f'xmlns:r="{RESQML}" xmlns:e="{EML}" xmlns:xsi="{XSI}"'
    kind = f' xsi:type="{made.space}:{made.prefixed}"' if made.version == "2.0" else ""
    cited = f"<e:Title>{plain(made.title).strip() or 'unknown'}</e:Title><e:Originator>structviz</e:Originator>"
    cited += f"<e:Creation>{WHEN}</e:Creation><e:Format>structviz {__version__}</e:Format>"
    opened = f'<{made.space}:{made.kind} {spaces} uuid="{made.uuid}" schemaVersion="{made.schema}"{kind}>'
    return f"{HEAD}{opened}<e:Citation>{cited}</e:Citation>{made.body}</{made.space}:{made.kind}>"


def relationships(objects: Sequence[Made]) -> dict[str, str]:
    """Return the relationships part of each object that has any: to what it refers to, from what refers to it, to its file."""
    lines: dict[str, list[str]] = {made.part: [] for made in objects}
    for made in objects:
        if made.external:
            target = made.external.replace("%", "%25")  # a target is a URI; readers differ on all other letters, so these stay
            lines[made.part].append(_relation("Hdf5File", target, "externalResource", ' TargetMode="External"'))
        for kind, key, part in made.links:
            proxy = kind == "EpcExternalPartReference"
            lines[made.part].append(_relation(f"_{key}", part, "mlToExternalPartProxy" if proxy else "destinationObject"))
            if part in lines:
                lines[part].append(_relation(f"_{made.uuid}", made.part, "externalPartProxyToMl" if proxy else "sourceObject"))
    return {f"_rels/{part}.rels": _relation_file(found) for part, found in lines.items() if found}


def _relation(key: str, target: str, kind: str, mode: str = "") -> str:
    return f'<Relationship Id="{key}" Type="{RELATIONS}/{kind}" Target={quoteattr(target)}{mode}/>'


def _relation_file(lines: Iterable[str]) -> str:
    return f'{HEAD}<Relationships xmlns="{OPC}/relationships">{"".join(lines)}</Relationships>'


def overrides(objects: Iterable[Made]) -> str:
    """Return the entries of objects in the list of content types."""
    return "".join(f'<Override PartName="/{made.part}" ContentType="{made.content_type}"/>' for made in objects)


def package_bytes(objects: Sequence[Made], title: str) -> bytes:
    """Return a new package of objects."""
    core = f'<coreProperties xmlns="{OPC}/metadata/core-properties" xmlns:dc="http://purl.org/dc/elements/1.1/" '
    core += (
        f'xmlns:dcterms="http://purl.org/dc/terms/" xmlns:xsi="{XSI}"><dcterms:created xsi:type="dcterms:W3CDTF">{WHEN}</dcterms:created>'
    )
    core += f"<dc:creator>structviz</dc:creator><dc:title>{plain(title)}</dc:title></coreProperties>"
    kinds = '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
    kinds += '<Override PartName="/docProps/core.xml" ContentType="application/vnd.openxmlformats-package.core-properties+xml"/>'
    root = f'<Relationship Id="CoreProperties" Type="{OPC}/relationships/metadata/core-properties" Target="docProps/core.xml"/>'
    parts = {
        "[Content_Types].xml": f'{HEAD}<Types xmlns="{OPC}/content-types">{kinds}{overrides(objects)}</Types>',
        "_rels/.rels": _relation_file([root]),
        "docProps/core.xml": HEAD + core,
    }
    parts |= {made.part: object_text(made) for made in objects} | relationships(objects)
    return zipped({name: text.encode() for name, text in parts.items()})


def zipped(parts: Mapping[str, bytes]) -> bytes:
    """Return a zip archive of parts in their order, all of the same date."""
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED, compresslevel=6) as archive:
        for name, content in parts.items():
            entry = zipfile.ZipInfo(name, DATE)
            entry.compress_type, entry.create_system, entry.external_attr = zipfile.ZIP_DEFLATED, 3, 0o644 << 16
            archive.writestr(entry, content)
    return out.getvalue()


def hdf5_bytes(arrays: Mapping[str, NDArray], key: str) -> bytes:
    """Return an HDF5 file of arrays by their paths, marked with the UUID of what stands for it in the package."""
    out = io.BytesIO()
    with library().File(out, "w") as store:
        store.attrs["uuid"] = np.bytes_(key.encode())
        for path, values in arrays.items():
            store.create_dataset(path, data=np.ascontiguousarray(values), track_times=False)
    return out.getvalue()
