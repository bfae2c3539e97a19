"""A progress bar on standard error for work over a second, where somebody is there to see it."""

from __future__ import annotations

import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

from structviz.analysis import Progress

if TYPE_CHECKING:
    from rich.progress import Progress as Bars

PATIENCE_S = 1.0


@contextmanager
def progress_bar() -> Iterator[Progress]:
    """Give the function to call with what is being done, how many are done, of how many; it draws nothing before a second is over."""
    if not sys.stderr.isatty():
        yield lambda text, done, total: None
        return
    began, shown = time.monotonic(), _Shown()

    def tell(text: str, done: int, total: int) -> None:
        if shown.bars or time.monotonic() - began > PATIENCE_S:
            shown.update(text, done, total)

    try:
        yield tell
    finally:
        if shown.bars:
            shown.bars.stop()


class _Shown:
    """The bar on the screen, once there is one."""

    bars: Bars | None = None

    def update(self, text: str, done: int, total: int) -> None:
        """Show one step; rich is loaded when the first bar is drawn."""
        if self.bars is None:
            self.bars = _new_bars()
            self.bars.add_task(text, total=None)
            self.bars.start()
        self.bars.update(self.bars.task_ids[0], description=text, completed=done, total=total if total > 1 else None)


def _new_bars() -> Bars:
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn

    columns = (TextColumn("{task.description:<20}", markup=False), BarColumn(), MofNCompleteColumn())
    return Progress(*columns, console=Console(stderr=True), transient=True)
