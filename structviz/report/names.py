"""Names given by users, made safe to print and to use as file names."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable

LONGEST_FILE_NAME = 80  # characters before the suffix; the common limit is 255 bytes for the whole name
RESERVED = {"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(1, 10))}


def printable(text: str, most: int | None = None) -> str:
    """Return text with control, format and unassigned characters shown as the replacement mark, cut to `most` characters.

    Escape sequences can move the cursor, change colours or set the window title of the terminal that shows them; marks
    of writing direction can make one name look like another.

    >>> printable("a\\x1b[31mb"), printable("North Boundary Fault", 10)
    ('a\ufffd[31mb', 'North Bou…')
    """
    clean = "".join("\ufffd" if unicodedata.category(c)[0] == "C" or c in "\u2028\u2029" else c for c in text)
    return clean if most is None or len(clean) <= most else clean[: most - 1].rstrip() + "…"


def file_stems(names: Iterable[str]) -> list[str]:
    """Return one file name without suffix for each name, in order: letters, digits, dot, dash and underscore only, all different.

    They differ also where a file system does not tell capitals from small letters.

    >>> file_stems(["West Fault", "west/fault", "../../etc", ""])
    ['West_Fault', 'west_fault_2', 'etc', 'fault']
    """
    taken: set[str] = set()
    stems = []
    for name in names:
        stem = _stem(name)
        chosen, number = stem, 1
        while chosen.casefold() in taken:
            number += 1
            chosen = f"{stem}_{number}"
        taken.add(chosen.casefold())
        stems.append(chosen)
    return stems


def _stem(name: str) -> str:
    plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    stem = re.sub(r"[^A-Za-z0-9._-]+", "_", plain)[:LONGEST_FILE_NAME].strip("._-")
    return f"fault_{stem}" if stem.split(".")[0].casefold() in RESERVED else stem or "fault"
