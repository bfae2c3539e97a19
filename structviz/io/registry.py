"""The table of formats. A module put into `structviz/io/formats/` with a tuple `FORMATS` is found by itself: nothing else is touched.

A file is known by its content first and by its suffix second: content that one format recognises is read by that format,
and a suffix that says otherwise is reported.
"""

from __future__ import annotations

from importlib import import_module
from pathlib import PurePath
from pkgutil import iter_modules

from structviz.errors import FormatError
from structviz.io import formats as _formats
from structviz.io.format import Format, start_of


def found_formats() -> tuple[Format, ...]:
    """Return every format of the modules in `structviz.io.formats`, in the order of their titles."""
    names = sorted(module.name for module in iter_modules(_formats.__path__))
    found = [entry for name in names for entry in import_module(f"{_formats.__name__}.{name}").FORMATS]
    return tuple(sorted(found, key=lambda entry: entry.title.lower()))


FORMATS: tuple[Format, ...] = found_formats()


def suffixes(*, writable: bool = False) -> tuple[str, ...]:
    """Return every suffix that can be read, or that can be written."""
    return tuple(suffix for entry in FORMATS for suffix in entry.suffixes if entry.write or not writable)


def names_others(suffix: str) -> bool:
    """Return True for the suffix of a format whose files may name other ones beside them."""
    return any(entry.read_beside and suffix.lower() in entry.suffixes for entry in FORMATS)


def table_text() -> str:
    """Return the table of formats as lines of text."""
    rows = [
        f"  {entry.title:<22} {' '.join(entry.suffixes):<12} {'read, write' if entry.write or entry.write_model else 'read'}"
        for entry in FORMATS
    ]
    return "\n".join(rows)


def format_of(content: bytes, file: str) -> tuple[Format, str]:
    """Return the format of a content and a note where the suffix says otherwise ("" where it agrees); FormatError where none knows it."""
    suffix = PurePath(file).suffix.lower()
    by_suffix = [entry for entry in FORMATS if suffix in entry.suffixes]
    for entry in by_suffix:
        if entry.sniff(content):
            return entry, ""
    for entry in FORMATS:
        if entry.sniff(content):
            return entry, f"named {suffix or 'without suffix'}, but its content is {entry.title}: read as that"
    raise unknown(content, file, by_suffix)


def unknown(content: bytes, file: str, by_suffix: list[Format]) -> FormatError:
    """Return the error for a content that no format knows; it shows the table of formats."""
    wanted = by_suffix[0].title if by_suffix else "one of the formats below"
    told = by_suffix[0].explain(content) if by_suffix else ""
    hint = f"export the surface in one of these formats:\n{table_text()}"
    return FormatError(file, told or described(content), wanted, hint=hint)


BEGINNINGS = (
    (b"<!doctype html", "a web page (HTML)"),
    (b"<html", "a web page (HTML)"),
    (b"<", "XML of another kind"),
    (b"pk\x03\x04", "a ZIP archive"),
    (b"\x1f\x8b", "a gzip archive"),
)


def described(content: bytes) -> str:
    """Return in words what an unknown content looks like."""
    start = start_of(content)
    if not start:
        return "only blanks" if content else "an empty file"
    for beginning, words in BEGINNINGS:
        if start.lower().startswith(beginning):
            return words
    printable = sum(32 <= byte < 127 or byte in (9, 10, 13) for byte in start)
    return "text that no reader knows" if printable > 0.95 * len(start) else "binary content that no reader knows"
