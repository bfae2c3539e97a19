"""Is there a working OpenGL? Asked in a process of its own, because without one VTK ends the interpreter instead of raising."""

from __future__ import annotations

import os
import subprocess
import sys
from functools import cache
from threading import Lock

from structviz.errors import RenderingUnavailable

PACKAGES = "apt-get install -y --no-install-recommends libegl1 libgl1-mesa-dri"
SECONDS = 30.0
ASKING = Lock()  # one question at a time: two threads would both wait for an answer of their own
WINDOWS = ("vtkEGLRenderWindow", "")  # off-screen first; then whatever VTK takes by itself

# Renders 16 by 16 pixels of a known colour and reads one back.
PROBE = """
import vtkmodules.vtkRenderingOpenGL2
from vtkmodules.vtkRenderingCore import vtkRenderer, vtkRenderWindow
from vtkmodules.vtkCommonCore import vtkUnsignedCharArray
window = vtkRenderWindow()
window.SetOffScreenRendering(1)
window.SetSize(16, 16)
renderer = vtkRenderer()
renderer.SetBackground(1.0, 0.0, 0.0)
window.AddRenderer(renderer)
window.Render()
pixel = vtkUnsignedCharArray()
window.GetRGBACharPixelData(8, 8, 8, 8, 1, pixel)
print("works" if pixel.GetValue(0) > 200 and pixel.GetValue(1) < 50 else "blank")
"""


def working_window() -> str | None:
    """Return the VTK window class that renders here ("" for its default), or None; the answer is kept for the process."""
    with ASKING:
        return _asked_window()


@cache
def _asked_window() -> str | None:
    for window in WINDOWS:
        environment = {**os.environ, "VTK_DEFAULT_OPENGL_WINDOW": window} if window else dict(os.environ)
        if not window and not os.environ.get("DISPLAY") and sys.platform.startswith("linux"):
            continue  # without a display the default window would only say so at length
        if _renders(environment):
            return window
    return None


def _renders(environment: dict[str, str]) -> bool:
    """Return True where a process of its own, with this environment, draws what it should."""
    command = [sys.executable, "-c", PROBE]
    try:
        answer = subprocess.run(command, capture_output=True, text=True, timeout=SECONDS, env=environment, check=False)
    except (OSError, subprocess.TimeoutExpired):
        return False
    return answer.returncode == 0 and answer.stdout.strip().endswith("works")


def require_screen() -> None:
    """Set VTK up for a window on the screen; raise RenderingUnavailable, with the other ways to see a model, where it cannot draw there."""
    hint = "structviz serve PATH shows the same in a browser; structviz check PATH --out DIR writes report.html and pictures"
    if sys.platform.startswith("linux") and not (os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY")):
        raise RenderingUnavailable("no screen was found: DISPLAY is not set", hint=hint)
    os.environ.pop("VTK_DEFAULT_OPENGL_WINDOW", None)  # the one that draws off-screen shows nothing
    if not _renders(dict(os.environ)):
        raise RenderingUnavailable("no OpenGL works on this screen", hint=f"{PACKAGES}; or: {hint}")


def require_gl() -> None:
    """Set VTK up for the window that works; raise RenderingUnavailable with what to install where none does."""
    window = working_window()
    if window is None:
        raise RenderingUnavailable("no working OpenGL, so scene.png was skipped", hint=PACKAGES)
    if window:
        os.environ["VTK_DEFAULT_OPENGL_WINDOW"] = window
