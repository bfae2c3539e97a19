"""The window's scene in a Jupyter notebook, drawn by this machine and served to it alone by trame."""

from __future__ import annotations

from importlib.util import find_spec
from typing import Any

from structviz.analysis import Analysis
from structviz.errors import StructvizError
from structviz.report.window_content import content_of_analysis


def show(analysis: Analysis, *, field: int = -1) -> Any:
    """Return a widget that shows an analysis in a notebook cell, to be turned with the mouse; `field` colours it, -1 by verdict.

    Raises StructvizError where trame is not installed, RenderingUnavailable where there is no OpenGL.
    """
    if find_spec("trame_pyvista") is None:
        hint = "pip install 'structviz[notebook]'; or write_outputs(analysis, 'out') and open out/report.html"
        raise StructvizError("trame-pyvista is not installed, which shows the scene in a notebook", hint=hint)
    from structviz.views.gl import require_gl

    require_gl()
    from structviz.views.render_window import open_window
    from structviz.views.render_window import show as bring
    from structviz.views.window import WindowState

    window = open_window(content_of_analysis(analysis), off_screen=True, say=lambda text: None)
    bring(window, WindowState(field=field))
    return window.plotter.show(jupyter_backend="trame", return_viewer=True)
