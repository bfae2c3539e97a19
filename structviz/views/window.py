"""The window as data: what it shows, its state, and what each key does to the state. No graphics library is loaded here."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.views.scene import Scene

EXAGGERATIONS = (1.0, 2.0, 5.0)
VIEWPOINTS = ("best", "map", "north", "east", "south", "west")
LOOKING = {"best": "look at most of the faults", "map": "look from above"} | {key: f"look from the {key}" for key in VIEWPOINTS[2:]}
SECTIONS = ("", "west to east", "south to north")  # the upright plane that the model is cut along; its near half goes
SECTION_STEP = 0.05  # of the model


@dataclass(frozen=True, eq=False)
class WindowField:
    """Values of triangles that colour the faults."""

    title: str
    unit: str
    low: float
    high: float
    values: tuple[NDArray[np.float64], ...]  # one array a surface of the scene, NaN where nothing is known


@dataclass(frozen=True, eq=False)
class WindowContent:
    """Everything a window can show."""

    scene: Scene
    fields: tuple[WindowField, ...]
    records: tuple[str, ...]  # what is known of each surface of the scene, in lines


@dataclass(frozen=True)
class WindowState:
    """What a window shows now."""

    field: int = -1  # -1: the verdict
    glyphs: bool = True
    lines: bool = True
    names: bool = True
    section: int = 0
    section_at: float = 0.5  # of the way across the model
    exaggeration: float = 1.0
    viewpoint: str = "best"
    views: int = 0  # counts up when the camera is to be put back
    chosen: int | None = None  # a surface of the scene
    help: bool = False


Act = Callable[[WindowState, WindowContent], WindowState]


def _next_field(state: WindowState, content: WindowContent) -> WindowState:
    return replace(state, field=(state.field + 2) % (len(content.fields) + 1) - 1)


def _next_section(state: WindowState, content: WindowContent) -> WindowState:
    return replace(state, section=(state.section + 1) % len(SECTIONS), section_at=0.5)


def _moved(by: float) -> Act:
    return lambda state, content: replace(state, section_at=float(np.clip(round(state.section_at + by, 6), 0.0, 1.0)))


def _exaggerated(state: WindowState, content: WindowContent) -> WindowState:
    at = (EXAGGERATIONS.index(state.exaggeration) + 1) % len(EXAGGERATIONS)
    return replace(state, exaggeration=EXAGGERATIONS[at])


def _looking(viewpoint: str) -> Act:
    return lambda state, content: replace(state, viewpoint=viewpoint, views=state.views + 1)


def _stepped(by: int) -> Act:
    """Return the choice of the next or the last surface; conflicting ones stand first in a scene made for the window."""

    def step(state: WindowState, content: WindowContent) -> WindowState:
        count = len(content.scene.surfaces)
        at = (0 if by > 0 else count - 1) if state.chosen is None else (state.chosen + by) % count
        return replace(state, chosen=at if count else None)

    return step


KEYS: dict[str, tuple[str, Act]] = {
    "c": ("colour by the next field", _next_field),
    "g": ("stress glyphs", lambda state, content: replace(state, glyphs=not state.glyphs)),
    "l": ("lines where faults meet", lambda state, content: replace(state, lines=not state.lines)),
    "n": ("names", lambda state, content: replace(state, names=not state.names)),
    "x": ("section", _next_section),
    "comma": ("section back", _moved(-SECTION_STEP)),
    "period": ("section on", _moved(SECTION_STEP)),
    "z": ("stretch heights", _exaggerated),
    **{str(number): (LOOKING[key], _looking(key)) for number, key in enumerate(VIEWPOINTS, 1)},
    "Right": ("next fault", _stepped(1)),
    "Left": ("fault before", _stepped(-1)),
    "Escape": ("choose none", lambda state, content: replace(state, chosen=None)),
    "question": ("these keys", lambda state, content: replace(state, help=not state.help)),
}
SHOWN = {"comma": ",", "period": ".", "question": "?", "Escape": "Esc", "Right": "\u2192", "Left": "\u2190"}
OTHERS = (("click", "choose a fault"), ("s", "save a picture"), ("q", "close"))  # these do something outside the state


def pressed(state: WindowState, key: str, content: WindowContent) -> WindowState:
    """Return the state after a key, the same one where the key means nothing."""
    return KEYS[key][1](state, content) if key in KEYS else state


def key_table() -> str:
    """Return what each key does, one a line."""
    rows = [(SHOWN.get(key, key), words) for key, (words, _) in KEYS.items()] + list(OTHERS)
    return "\n".join(f"{key:<6} {words}" for key, words in rows)


def status(state: WindowState, content: WindowContent) -> str:
    """Return in a line what is shown beyond the usual."""
    words = [f"coloured by {content.fields[state.field].title.lower()}"] if state.field >= 0 else []
    if state.section:
        words.append(f"cut {SECTIONS[state.section]}")
    if state.exaggeration != 1:
        words.append(f"heights stretched {state.exaggeration:g} times")
    return ", ".join([*words, "? shows the keys"])
