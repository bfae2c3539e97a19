"""Numbers out of text files, as arrays, with errors that name the line."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError

EXPORT_AGAIN = "the file is damaged or cut short: export it again"


def text_of(content: bytes, file: str) -> str:
    """Return the content as text with plain line ends; bytes that are not UTF-8 can only be in names and are kept as Latin-1."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = content.decode("latin-1")
    return text.replace("\r\n", "\n").replace("\r", "\n") if "\r" in text else text


def floats(words: list[str] | list[bytes], what: str, file: str) -> NDArray[np.float64]:
    """Return words as float64; FormatError shows the first that is no number."""
    try:
        return np.array(words, dtype=np.float64)
    except ValueError:
        bad = next(word for word in words if not _is(float, word))
        shown = bad.decode("latin-1") if isinstance(bad, bytes) else bad
        raise FormatError(file, f"{shown!r} among {what}", "numbers", hint=EXPORT_AGAIN) from None


def integers(words: list[str], what: str, file: str) -> NDArray[np.int64]:
    """Return words as int64; FormatError shows the first that is no whole number."""
    try:
        return np.array(words, dtype=np.int64)
    except (ValueError, OverflowError):
        bad = next((word for word in words if not _is(int, word)), max(words, key=len))
        raise FormatError(file, f"{bad!r} among {what}", "whole numbers", hint=EXPORT_AGAIN) from None


def _is(kind: type, word: str | bytes) -> bool:
    try:
        kind(word)
    except ValueError:
        return False
    return True


def points(rows: list[list[str]], what: str, file: str) -> NDArray[np.float64]:
    """Return the first three numbers of each row of words, (V, 3); FormatError where a row is shorter."""
    short = next((row for row in rows if len(row) < 3), None)
    if short is not None:
        raise FormatError(file, f"a row of {what} with {len(short)} numbers ({' '.join(short)!r})", "three numbers", hint=EXPORT_AGAIN)
    return floats([word for row in rows for word in row[:3]], what, file).reshape(-1, 3)
