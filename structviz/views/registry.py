"""The table of views: a plain description built from an Analysis, and what draws it.

Adding a view is adding a module with one function under `@view`; `render`, the report and the contract test follow.
"""

from __future__ import annotations

import pkgutil
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from importlib import import_module
from pathlib import Path
from typing import Any, TypeVar

from structviz.analysis import Analysis

Build = Callable[[Analysis], Any]
Builder = TypeVar("Builder", bound=Callable[..., Any])  # keeps the further arguments that a builder takes


@dataclass(frozen=True)
class View:
    """One picture: how its description is built, and the renderer that writes it."""

    key: str
    title: str
    file_name: str
    needs_gl: bool
    build: Build
    renderer: str  # module of this package with draw(description, path); loaded when drawn, since it loads a graphics library


_VIEWS: dict[str, View] = {}


def view(key: str, *, title: str, file_name: str, needs_gl: bool, renderer: str) -> Callable[[Builder], Builder]:
    """Return a decorator that enters a builder into the table of views."""

    def enter(build: Builder) -> Builder:
        if key in _VIEWS:
            raise ValueError(f"two views are called {key}")
        _VIEWS[key] = View(key, title, file_name, needs_gl, build, renderer)
        return build

    return enter


@cache
def views() -> dict[str, View]:
    """Return the views by key, in order of key; every module of this package is asked, renderers are left asleep."""
    package = __name__.rpartition(".")[0]
    for found in pkgutil.iter_modules(import_module(package).__path__):
        if not found.name.startswith("render_"):
            import_module(f"{package}.{found.name}")
    return dict(sorted(_VIEWS.items()))


def draw(entry: View, description: Any, path: Path) -> None:
    """Draw a description into a file."""
    import_module(f"{__name__.rpartition('.')[0]}.{entry.renderer}").draw(description, path)
