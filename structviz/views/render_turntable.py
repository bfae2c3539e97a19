"""The scene turned once round, as a GIF or an MP4: one size throughout, so that the model does not breathe."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from numpy.typing import NDArray
from PIL import Image

from structviz.errors import StructvizError
from structviz.views.palette import FAINT, INK
from structviz.views.render_actors import add_actors, aim
from structviz.views.render_pixels import picture, smooth
from structviz.views.scene import Scene

Pixels = NDArray[np.uint8]

FONT = "DejaVu Sans"
SIZE = (960, 640)  # pixels; even, as films want it
FRAMES, SECONDS = 72, 6.0
COLOURS = 128  # of a GIF


def write_turntable(scene: Scene, path: Path, tell: Callable[[int, int], None] = lambda done, total: None) -> None:
    """Write a scene turned once round into a .gif or .mp4 file; the same scene gives the same bytes of a GIF.

    Raises StructvizError where a film is asked for and imageio with ffmpeg is not installed.
    """
    if path.suffix == ".mp4":
        _film(path, _frames(scene, tell))
        return
    frames = [Image.fromarray(frame) for frame in _frames(scene, tell)]
    palette = frames[0].quantize(COLOURS, dither=Image.Dither.NONE)  # one for all frames: colours that change would flicker
    first, *others = [frame.quantize(palette=palette, dither=Image.Dither.NONE) for frame in frames]
    first.save(path, save_all=True, append_images=others, duration=round(1000 * SECONDS / FRAMES), loop=0, optimize=False)


def _film(path: Path, frames: Iterator[Pixels]) -> None:
    try:
        import imageio.v2 as imageio
        import imageio_ffmpeg  # noqa: F401  what imageio writes films with
    except ImportError:
        hint = "pip install 'structviz[movie]', or ask for a gif"
        raise StructvizError("imageio with ffmpeg is not installed, which films are written with", hint=hint) from None
    writer: Any = imageio.get_writer
    with writer(path, fps=FRAMES / SECONDS, codec="libx264", quality=8, macro_block_size=2) as film:
        for frame in frames:
            film.append_data(frame)


def _frames(scene: Scene, tell: Callable[[int, int], None]) -> Iterator[Pixels]:
    """Yield the pixels (H, W, 3) of each frame."""
    words = _words(scene)
    plotter = pv.Plotter(off_screen=True, window_size=list(SIZE), lighting="light kit")
    try:
        add_actors(plotter, scene)
        smooth(plotter)
        widest = 0.0
        azimuths = [(scene.view_from_deg + 360.0 * number / FRAMES) % 360.0 for number in range(FRAMES)]
        for azimuth in azimuths:
            aim(plotter, replace(scene, view_from_deg=azimuth), SIZE[0] / SIZE[1])
            widest = max(widest, plotter.camera.parallel_scale)
        for number, azimuth in enumerate(azimuths):
            tell(number, FRAMES)
            yield _over(_frame(plotter, scene, azimuth, widest), words)
    finally:
        plotter.close()


def _frame(plotter: Any, scene: Scene, azimuth_deg: float, scale: float) -> Pixels:
    aim(plotter, replace(scene, view_from_deg=azimuth_deg), SIZE[0] / SIZE[1])
    centre, offset = (scene.low + scene.high) / 2, np.array(plotter.camera.position) - np.array(plotter.camera.focal_point)
    plotter.camera.focal_point, plotter.camera.position = centre, centre + offset
    plotter.camera.parallel_scale = scale
    plotter.reset_camera_clipping_range()
    return picture(plotter)


def _words(scene: Scene) -> Pixels:
    """Return title and caution as pixels (H, W, 4) to lay over every frame."""
    figure = Figure(figsize=(SIZE[0] / 100, SIZE[1] / 100), dpi=100, facecolor="none")
    canvas = FigureCanvasAgg(figure)
    above = 1 - 26 / SIZE[1]
    figure.text(20 / SIZE[0], above, scene.title, fontsize=13, weight="bold", color=INK, va="center", family=FONT, parse_math=False)
    counts = ", ".join(f"{count} {word}" for word, count in scene.counts)
    under = f"{scene.subtitle}   {counts}"
    figure.text(20 / SIZE[0], 1 - 52 / SIZE[1], under, fontsize=8, color=INK, va="center", family=FONT, parse_math=False)
    caution = "Screening aid: directions, not magnitudes. Parallel projection, no vertical exaggeration."
    figure.text(20 / SIZE[0], 14 / SIZE[1], caution, fontsize=7, color=FAINT, va="center", family=FONT)
    canvas.draw()
    return np.asarray(canvas.buffer_rgba()).copy()


def _over(frame: Pixels, words: Pixels) -> Pixels:
    ink = words[..., 3:].astype(np.uint16)
    return ((frame * (255 - ink) + words[..., :3] * ink + 127) // 255).astype(np.uint8)
