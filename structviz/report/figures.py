"""Figures for print in a folder of their own, with their captions, written whole or not at all."""

from __future__ import annotations

import json
import os
from collections.abc import Sequence
from pathlib import Path

from structviz.analysis import Analysis, Progress
from structviz.errors import ArgumentError, RenderingUnavailable
from structviz.report import whole
from structviz.report.names import printable
from structviz.report.write import Written
from structviz.views.figures import DrawnFigure, PrintChoice, draw_figure, figures_of
from structviz.views.gl import require_gl
from structviz.views.scene import build_scene

LISTING, CAPTIONS = "figures.json", "figures.txt"
TURNTABLES = ("gif", "mp4")


def checked_figures_target(folder: str | os.PathLike[str]) -> Path:
    """Return the folder as a full path; OutputError where figures may not be put there. Nothing is written."""
    return whole.checked_target(folder, _earlier_figures, "earlier figures of structviz")


def _earlier_figures(target: Path) -> set[str]:
    """Return the files that an earlier listing says it is of, or none where figures.json is not ours."""
    try:
        held = json.loads((target / LISTING).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return set()
    if not isinstance(held, dict) or "structviz" not in held or not isinstance(held.get("outputs"), list):
        return set()
    return {str(name) for name in held["outputs"]}


def write_figures(
    analysis: Analysis,
    folder: str | os.PathLike[str],
    *,
    choice: PrintChoice | None = None,
    turntable: str = "",
    progress: Progress | None = None,
) -> Written:
    """Write figures for print, figures.txt with their captions and figures.json that lists them; return what was written.

    `turntable`, "gif" or "mp4", adds the scene turned once round.

    Raises OutputError as `write_outputs` does, and RenderingUnavailable where only scenes were asked for and there is no
    OpenGL; where other figures were asked for as well, the scenes are skipped and that is told.
    """
    target, chosen = checked_figures_target(folder), choice or PrintChoice()
    tell = progress or (lambda text, done, total: None)
    with whole.complete_or_nothing(target) as new:
        drawn, skipped = _draw(analysis, chosen, new, tell)
        turned = [_turned(analysis, new, turntable, tell)] if turntable else []
        files = (LISTING, *sorted([CAPTIONS, *turned, *(name for each in drawn for name in each.files)]))
        _write(new / CAPTIONS, _captions_text(analysis, drawn))
        _write(new / LISTING, _listing_text(analysis, chosen, drawn, files))
    return Written(target, files, skipped)


def _draw(analysis: Analysis, choice: PrintChoice, new: Path, tell: Progress) -> tuple[list[DrawnFigure], tuple[str, ...]]:
    drawn: list[DrawnFigure] = []
    skipped: list[str] = []
    total = len(choice.only) + (len(choice.viewpoints) - 1 if "scene" in choice.only else 0)
    unavailable = None
    for number, figure in enumerate(figures_of(analysis, choice)):
        tell("drawing figures", number, total)
        if isinstance(figure, tuple):
            skipped.append(f"{figure[0]} has nothing to show: {figure[1]}")
            continue
        try:
            drawn.append(draw_figure(figure, choice, new))
        except RenderingUnavailable as error:
            unavailable = error
            skipped.append(f"no working OpenGL, so scenes were skipped; install it with: {error.hint}")
    if unavailable and not drawn:
        raise RenderingUnavailable("no working OpenGL, so no figure could be drawn", hint=unavailable.hint)
    return drawn, tuple(dict.fromkeys(skipped))


def _turned(analysis: Analysis, new: Path, suffix: str, tell: Progress) -> str:
    """Write the scene turned once round; return the name of the file."""
    if suffix not in TURNTABLES:
        hint = "a gif is shown everywhere, an mp4 is smaller and smoother"
        raise ArgumentError(f"turntable: found {suffix!r}; wanted one of {', '.join(TURNTABLES)}", hint=hint)
    require_gl()
    from structviz.views.render_turntable import write_turntable

    write_turntable(build_scene(analysis), new / f"turntable.{suffix}", lambda done, total: tell("turning the model", done, total))
    return f"turntable.{suffix}"


def _captions_text(analysis: Analysis, drawn: Sequence[DrawnFigure]) -> str:
    """Return the captions to be pasted under the figures, one line each, as word processors want it."""
    head = f"{printable(analysis.model.title)}\nFigures of structviz {analysis.version}, with captions to paste under them.\n"
    parts = (f"\n{', '.join(each.files)}  ({each.width_mm:g} x {each.height_mm:g} mm)\n{printable(each.caption, 4000)}\n" for each in drawn)
    return head + "".join(parts)


def _listing_text(analysis: Analysis, choice: PrintChoice, drawn: Sequence[DrawnFigure], files: Sequence[str]) -> str:
    listing = {
        "structviz": analysis.version,
        "model": analysis.model.title,
        "dpi": choice.dpi,
        "outputs": list(files),
        "figures": [
            {"files": list(f.files), "title": f.title, "caption": f.caption, "width_mm": f.width_mm, "height_mm": f.height_mm}
            for f in drawn
        ],
    }
    return json.dumps(listing, indent=1, ensure_ascii=False) + "\n"


def _write(path: Path, text: str) -> None:
    path.write_text(text, encoding="utf-8", errors="backslashreplace", newline="\n")
