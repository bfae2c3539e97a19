"""The scene in a notebook: without trame the next step is told; with it, what the plotter gives comes back."""

from __future__ import annotations

from typing import Any

import pytest

from structviz.analysis import Analysis
from structviz.errors import RenderingUnavailable, StructvizError
from structviz.report import notebook
from structviz.views.gl import require_gl


def test_without_trame_the_next_step_is_told(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(notebook, "find_spec", lambda name: None)
    with pytest.raises(StructvizError, match=r"trame-pyvista is not installed.*\n  next: pip install .structviz\[notebook\]"):
        notebook.show(analysis)


def test_the_plotter_is_asked_for_trame(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    try:
        require_gl()
    except RenderingUnavailable as error:
        pytest.skip(str(error))
    import pyvista

    asked: dict[str, Any] = {}
    monkeypatch.setattr(notebook, "find_spec", lambda name: object())
    monkeypatch.setattr(pyvista.Plotter, "show", lambda self, **options: asked.update(options) or "widget")
    assert notebook.show(analysis, field=0) == "widget"
    assert asked == {"jupyter_backend": "trame", "return_viewer": True}
