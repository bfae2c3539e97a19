"""The parts of a zip archive held in memory, behind limits that a hostile one cannot pass."""

from __future__ import annotations

import io
import struct
import zipfile
import zlib
from collections.abc import Mapping
from dataclasses import dataclass

from structviz.errors import FormatError

ENTRY = b"PK\x01\x02"  # begins each entry of the list of parts
MOST_ENTRIES = 100_000
MOST_PART = 2**26  # bytes of one part, unpacked, unless the caller allows more
MOST_RATIO = 250  # unpacked to packed, above SMALL; text of many like lines reaches a hundred
SMALL = 2**20
HINT = "the archive is damaged, or made to do harm: export it again"
BROKEN = (
    zipfile.BadZipFile, zipfile.LargeZipFile, zlib.error, EOFError, struct.error, KeyError, ValueError, OverflowError,
    NotImplementedError, RuntimeError, OSError, IndexError,
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class Parts:
    """The list of parts of an archive; nothing is unpacked until it is asked for."""

    file: str
    archive: zipfile.ZipFile
    entries: Mapping[str, zipfile.ZipInfo]


def parts_of(content: bytes, file: str) -> Parts:
    """Return the parts of an archive by name; FormatError where it cannot be read, or a name in it points out of it."""
    if content.count(ENTRY) > MOST_ENTRIES:
        raise FormatError(file, f"more than {MOST_ENTRIES:,} parts in the archive", "fewer", hint=HINT)
    try:
        archive = zipfile.ZipFile(io.BytesIO(content))
        found = archive.infolist()
    except BROKEN as error:
        raise FormatError(file, f"a ZIP archive that cannot be read ({error})", "a whole archive", hint=HINT) from None
    entries: dict[str, zipfile.ZipInfo] = {}
    for entry in found:
        name = entry.filename
        if unsafe(entry.orig_filename):
            raise FormatError(file, f"a part named {entry.orig_filename[:80]!r}", "names that stay inside the archive", hint=HINT)
        if name in entries:
            raise FormatError(file, f"two parts named {name[:80]!r}", "each part once", hint=HINT)
        entries[name] = entry
    return Parts(file, archive, entries)


def unsafe(name: str) -> bool:
    """Return True for a name of a part, or of a file beside, that is absolute, leads upwards or is no plain relative path.

    >>> [unsafe(name) for name in ("a/b.xml", "../b", "/b", "C:/b", "a\\\\b", "http://b")]
    [False, True, True, True, True, True]
    """
    return not name or name.startswith("/") or "\\" in name or ":" in name or ".." in name.split("/") or not name.isprintable()


def part(parts: Parts, name: str, most: int = MOST_PART) -> bytes:
    """Return the bytes of one part; FormatError where it is missing, damaged, locked, or unpacks to more than it may."""
    entry = parts.entries.get(name)
    if entry is None:
        raise FormatError(parts.file, f"no part {name[:120]!r} in the archive", "every part that is named", hint=HINT)
    if entry.file_size > most or (entry.file_size > SMALL and entry.file_size > MOST_RATIO * max(entry.compress_size, 1)):
        found = f"part {name[:80]!r} of {entry.compress_size:,} bytes that unpacks to {entry.file_size:,}"
        raise FormatError(parts.file, found, f"at most {most:,}, and {MOST_RATIO} times its packed size", hint=HINT)
    try:
        with parts.archive.open(entry) as stream:
            found_bytes = stream.read(entry.file_size + 1)
    except BROKEN as error:
        raise FormatError(parts.file, f"part {name[:80]!r} that cannot be unpacked ({error})", "a whole archive", hint=HINT) from None
    if len(found_bytes) != entry.file_size:
        found = f"{len(found_bytes):,} bytes in part {name[:80]!r}"
        raise FormatError(parts.file, found, f"the {entry.file_size:,} that are promised", hint=HINT)
    return found_bytes
