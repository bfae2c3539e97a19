"""The model file: TOML with title, frame, faults, horizons and striae; every key is checked."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, field
from typing import Any

from structviz.errors import TableError
from structviz.io.tables import FAULT_COLUMNS, Row, nearest
from structviz.io.units import METRES, VERTICAL, Frame

TOP_KEYS = (
    "title",
    "crs",
    "length_unit",
    "vertical",
    "faults",
    "striae",
    "mechanisms",
    "mechanisms_are",
    "well_azimuths",
    "fault",
    "horizon",
)
MECHANISMS_ARE = ("independent", "evidence")
HORIZON_KEYS = ("name", "surface")


@dataclass(frozen=True)
class ModelFile:
    """The content of a model file, its words checked and its paths not yet followed."""

    title: str = ""
    crs: str = ""
    frame: Frame = field(default_factory=Frame)
    faults: str = ""  # path of a faults table
    striae: str = ""  # path of a table of striae
    mechanisms: str = ""  # path of a table of mechanisms, or of QuakeML
    mechanisms_are: str = "independent"
    well_azimuths: str = ""  # path of a table of azimuths from wells
    fault_rows: tuple[Row, ...] = ()
    horizon_rows: tuple[Row, ...] = ()


def parsed_model(content: bytes, file: str) -> ModelFile:
    """Return the content of a model file; TableError for text that is not TOML, unknown keys and values of the wrong kind."""
    try:
        tree = tomllib.loads(content.decode("utf-8-sig"))
    except (UnicodeDecodeError, tomllib.TOMLDecodeError, RecursionError) as error:
        raise TableError(file, f"text that is not TOML ({error})", "a model file in TOML", hint="correct that line") from None
    check_keys(tree, TOP_KEYS, file)
    frame = Frame(choice(tree, "length_unit", tuple(METRES), file), choice(tree, "vertical", VERTICAL, file))
    texts = {key: text(tree, key, file) for key in ("title", "crs", "faults", "striae", "mechanisms", "well_azimuths")}
    texts["mechanisms_are"] = choice(tree, "mechanisms_are", MECHANISMS_ARE, file)
    if "mechanisms_are" in tree and not texts["mechanisms"]:
        raise TableError(
            file, "mechanisms_are without mechanisms", 'mechanisms = "..."', hint="name the file of mechanisms, or delete the key"
        )
    rows = entries(tree, "fault", FAULT_COLUMNS, file)
    if not rows and not texts["faults"]:
        raise TableError(
            file, "no faults", 'faults = "faults.csv" or [[fault]] entries', hint="name the table of faults, or list the faults"
        )
    return ModelFile(**texts, frame=frame, fault_rows=rows, horizon_rows=entries(tree, "horizon", HORIZON_KEYS, file))


def check_keys(tree: dict[str, Any], known: tuple[str, ...], file: str) -> None:
    """Raise TableError for a key that is not known, with the nearest one."""
    for key in tree:
        if key not in known:
            raise TableError(file, f"key {key!r}", f"one of {', '.join(known)}", hint=f"{nearest(key, known)}correct or delete the key")


def text(tree: dict[str, Any], key: str, file: str) -> str:
    """Return the text of a key, "" where it is absent; TableError where it is no text."""
    value = tree.get(key, "")
    if not isinstance(value, str):
        raise TableError(file, f"{key} = {value!r}", "text in quotes", hint=f'write {key} = "..."')
    return value.strip()


def choice(tree: dict[str, Any], key: str, known: tuple[str, ...], file: str) -> str:
    """Return the word of a key, the first of the known ones where it is absent."""
    word = text(tree, key, file) or known[0]
    if word not in known:
        raise TableError(file, f"{key} {word!r}", f"one of {', '.join(known)}", hint=f"{nearest(word, known)}correct the word")
    return word


def entries(tree: dict[str, Any], key: str, known: tuple[str, ...], file: str) -> tuple[Row, ...]:
    """Return the [[fault]] or [[horizon]] entries as rows of texts."""
    found = tree.get(key, [])
    if not isinstance(found, list) or not all(isinstance(entry, dict) for entry in found):
        raise TableError(file, f"{key} = {found!r}", f"[[{key}]] entries", hint=f"begin each entry with a line [[{key}]]")
    return tuple(entry_row(entry, key, place, known, file) for place, entry in enumerate(found, 1))


def entry_row(entry: dict[str, Any], key: str, place: int, known: tuple[str, ...], file: str) -> Row:
    """Return one entry as a row; TableError for unknown keys and values of the wrong kind."""
    where = f"{key} {place}"
    check_keys(entry, known, f"{file}, {where}")
    for name, value in entry.items():
        right = isinstance(value, int | float) and not isinstance(value, bool) if name.endswith("_deg") else isinstance(value, str)
        if not right:
            wanted = "a number" if name.endswith("_deg") else "text in quotes"
            raise TableError(f"{file}, {where}", f"{name} = {value!r}", wanted, hint=f"correct {name}")
    return Row(file, where, {name: repr(value) if name.endswith("_deg") else value.strip() for name, value in entry.items()})
