"""The progress bar: only for work over a second, only where somebody looks, only on standard error."""

from __future__ import annotations

import io
import sys

import pytest

from structviz.cli import progress


class Screen(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def steps(monkeypatch: pytest.MonkeyPatch, stream: io.StringIO, patience_s: float) -> str:
    """Return what is drawn on a stream for a piece of work with steps."""
    monkeypatch.setattr(sys, "stderr", stream)
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setattr(progress, "PATIENCE_S", patience_s)
    with progress.progress_bar() as tell:
        for number in range(5):
            tell("measuring [red]surfaces", number, 5)
        tell("checking", 0, 1)
    return stream.getvalue()


def test_long_work_on_a_terminal_is_shown(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    drawn = steps(monkeypatch, Screen(), -1.0)
    assert "checking" in drawn
    assert "\x1b[?25h" in drawn, "the cursor is shown again at the end"
    assert capsys.readouterr().out == ""


def test_short_work_is_silent(monkeypatch: pytest.MonkeyPatch) -> None:
    assert steps(monkeypatch, Screen(), 60.0) == ""


def test_nobody_looks_at_a_file(monkeypatch: pytest.MonkeyPatch) -> None:
    assert steps(monkeypatch, io.StringIO(), -1.0) == ""


def test_a_failure_leaves_no_bar_behind(monkeypatch: pytest.MonkeyPatch) -> None:
    screen = Screen()
    monkeypatch.setattr(sys, "stderr", screen)
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setattr(progress, "PATIENCE_S", -1.0)

    def work() -> None:
        with progress.progress_bar() as tell:
            tell("measuring", 1, 5)
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        work()
    assert screen.getvalue().rstrip().endswith(("\x1b[?25h", "\x1b[2K"))
