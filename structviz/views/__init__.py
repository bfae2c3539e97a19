"""Pictures as data, then drawn. `render` writes those of an analysis; the table of views is in `registry`."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import suppress
from importlib import import_module
from pathlib import Path
from threading import Thread

from structviz.analysis import Analysis
from structviz.errors import RenderingUnavailable
from structviz.views.gl import require_gl, working_window
from structviz.views.registry import draw, views

__all__ = ["prepare", "render", "views"]


def prepare() -> Thread:
    """Return a thread that loads what draws and asks for OpenGL, a second's work, while the caller computes.

    Whatever fails in it fails again, and is told, when pictures are drawn.
    """
    thread = Thread(target=_prepare, daemon=True)
    thread.start()
    return thread


def _prepare() -> None:
    with suppress(Exception):
        working_window()
        for entry in views().values():
            import_module(f"{__name__}.{entry.renderer}")


def render(
    analysis: Analysis, folder: Path, *, progress: Callable[[str, int, int], None] | None = None
) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return the names of the pictures written into a folder, and one reason for those that were skipped."""
    written, skipped = [], []
    for number, entry in enumerate(views().values()):
        if progress:
            progress("drawing pictures", number, len(views()))
        try:
            if entry.needs_gl:
                require_gl()
            draw(entry, entry.build(analysis), folder / entry.file_name)
            written.append(entry.file_name)
        except RenderingUnavailable as error:
            skipped.append(f"{error.message}; install it with: {error.hint}")
        except (ArithmeticError, AttributeError, ImportError, LookupError, RuntimeError, TypeError, ValueError) as error:
            # A picture that fails is a fault of ours; the numbers, which do not, must not be lost with it.
            (folder / entry.file_name).unlink(missing_ok=True)
            skipped.append(f"{entry.file_name} could not be drawn ({type(error).__name__}: {error}); please report it")
    return tuple(written), tuple(dict.fromkeys(skipped))
