"""The window on the screen: PyVista draws a scene and follows the state that `window.pressed` gives."""

from __future__ import annotations

import warnings
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import matplotlib
import numpy as np
import pyvista as pv
from numpy.typing import NDArray

from structviz.views.palette import INK, PAPER, VERDICTS
from structviz.views.render_actors import ROW, add_actors, aim, glyph_actors
from structviz.views.scene import ELEVATION_DEG
from structviz.views.window import VIEWPOINTS, WindowContent, WindowState, key_table, pressed, status

Floats = NDArray[np.float64]

PIXELS = (1440, 900)
FONT = str(Path(matplotlib.get_data_path(), "fonts", "ttf", "DejaVuSans.ttf"))
VALUES = "values"
SURFACES = tuple(VERDICTS)
COLOURS = "cividis"  # one lightness for each value, the same to colour-blind eyes; rakes go round in twilight
LOOKS = {"map": (180.0, 90.0), "north": (0.0, 30.0), "east": (90.0, 30.0), "south": (180.0, 30.0), "west": (270.0, 30.0)}


@dataclass
class Window:
    """A plotter with what is in it, and the state it shows."""

    content: WindowContent
    plotter: Any
    actors: dict[str, list[Any]]
    say: Callable[[str], None]
    save: Callable[[], Path]
    state: WindowState = field(default_factory=WindowState)
    words: dict[str, Any] = field(default_factory=dict)  # texts and outlines by what they are


def open_window(
    content: WindowContent, *, off_screen: bool = False, say: Callable[[str], None] = print, save: Callable[[], Path] | None = None
) -> Window:
    """Return a window that shows a scene and answers to keys and clicks; `Window.plotter.show()` gives it to the user.

    `say` is given the record of a fault that is chosen, `save` the path for a picture.
    """
    plotter = pv.Plotter(off_screen=off_screen, window_size=list(PIXELS), lighting="light kit", title=content.scene.title)
    window = Window(content, plotter, add_actors(plotter, content.scene), say, save or (lambda: Path("structviz.png")))
    for word in SURFACES:
        for actor in window.actors[word][:1]:
            rows = actor.mapper.dataset.cell_data[ROW]
            actor.mapper.dataset.cell_data[VALUES] = np.full(len(rows), np.nan, np.float32)
    with warnings.catch_warnings():  # where the graphics are software it takes the slower way and warns of it
        warnings.simplefilter("ignore")
        plotter.enable_anti_aliasing("fxaa")
    _title(window)
    _stretched(window)
    _apply(window, WindowState(), first=True)
    _listen(window)
    return window


def press(window: Window, key: str) -> None:
    """Do what a key asks for."""
    if key == "s":
        path = window.save()
        window.plotter.screenshot(str(path))
        window.say(f"picture saved as {path}")
        return
    show(window, pressed(window.state, key, window.content))


def show(window: Window, state: WindowState) -> None:
    """Bring the window into a state."""
    before = window.state
    if state != before:
        _apply(window, state)
        window.plotter.render()
        if state.chosen != before.chosen and state.chosen is not None:
            window.say(window.content.records[state.chosen])


def surface_at(window: Window, x: float, y: float) -> tuple[int, str] | None:
    """Return the surface under a place, in pixels from the lower left, and the value shown there in words; None where there is none."""
    from vtkmodules.vtkRenderingCore import vtkCellPicker

    picker = vtkCellPicker()
    picker.SetTolerance(0.001)
    picker.PickFromListOn()
    for word in SURFACES:
        for actor in window.actors[word][:1]:
            picker.AddPickList(actor)
    if not picker.Pick(x, y, 0, window.plotter.renderer) or picker.GetCellId() < 0:
        return None
    mesh = pv.wrap(picker.GetDataSet())
    row = int(mesh.cell_data[ROW][picker.GetCellId()])
    if window.state.field < 0:
        return row, ""
    shown, inside = window.content.fields[window.state.field], int((mesh.cell_data[ROW][: picker.GetCellId()] == row).sum())
    value = float(shown.values[row][inside])
    return row, f"{shown.title} here: {value:.3g} {shown.unit}" if np.isfinite(value) else f"{shown.title} here: not known"


def click(window: Window, x: float, y: float) -> None:
    """Choose the surface under a place of the window."""
    found = surface_at(window, x, y)
    show(window, replace(window.state, chosen=found[0] if found else None))
    if found and found[1]:
        window.say(found[1])


def _listen(window: Window) -> None:
    """Let the window hear keys and clicks; what the library's own keys would do is switched off."""
    if window.plotter.iren is None:
        return
    interactor = window.plotter.iren.interactor
    style = interactor.GetInteractorStyle()
    start = [0, 0]

    def down(*_: Any) -> None:
        start[:] = interactor.GetEventPosition()
        style.OnLeftButtonDown()

    def up(*_: Any) -> None:
        style.OnLeftButtonUp()
        x, y = interactor.GetEventPosition()
        if abs(x - start[0]) + abs(y - start[1]) < 4:  # a turn of the model is no click
            click(window, x, y)

    # The style holds the events of a button that is down, so it is the style that is listened to, in the place of its own answer.
    style.AddObserver("CharEvent", lambda *_: None)
    style.AddObserver("LeftButtonPressEvent", down)
    style.AddObserver("LeftButtonReleaseEvent", up)
    interactor.AddObserver("KeyPressEvent", lambda *_: _key(window, interactor.GetKeySym()))


def _key(window: Window, key: str) -> None:
    if key == "q":
        window.plotter.close()
        return
    press(window, key)


def _apply(window: Window, state: WindowState, *, first: bool = False) -> None:
    """Change what differs between the state shown and another one."""
    before, window.state = window.state, state

    def differs(*names: str) -> bool:
        return first or any(getattr(before, name) != getattr(state, name) for name in names)

    if differs("field"):
        _colour(window)
    if differs("exaggeration"):
        for key in (*SURFACES, "meetings", "frame"):
            for actor in window.actors[key]:
                actor.SetScale(1.0, 1.0, state.exaggeration)
        if not first:
            _stretched(window)
    if differs("glyphs", "lines", "names", "exaggeration"):
        for key, shown in (("glyphs", state.glyphs), ("meetings", state.lines)):
            for actor in window.actors[key]:
                actor.SetVisibility(shown)
        window.words["names"].SetVisibility(state.names)
    if differs("section", "section_at", "exaggeration"):
        _cut(window)
    if differs("chosen"):
        _outline(window)
    if differs("viewpoint", "views"):
        _look(window)
    _texts(window)


def _colour(window: Window) -> None:
    """Colour the faults by verdict, or by a field with its own bar."""
    plotter, state = window.plotter, window.state
    for title in list(plotter.scalar_bars.keys()):
        plotter.remove_scalar_bar(title, render=False)
    shown = window.content.fields[state.field] if state.field >= 0 else None
    for word in SURFACES:
        for actor in window.actors[word][:1]:
            mapper = actor.mapper
            if shown is None:
                mapper.scalar_visibility = False
                continue
            rows = np.unique(mapper.dataset.cell_data[ROW])
            mapper.dataset.cell_data[VALUES] = np.concatenate([shown.values[row] for row in rows]).astype(np.float32)
            mapper.dataset.set_active_scalars(VALUES, preference="cell")
            mapper.SetScalarModeToUseCellData()
            mapper.scalar_visibility = True
            colours = "twilight" if shown.low < 0 else COLOURS
            mapper.lookup_table = pv.LookupTable(colours, scalar_range=(shown.low, shown.high), nan_color=PAPER)
            mapper.scalar_range = (shown.low, shown.high)
    meshes = [window.actors[word][0].mapper for word in SURFACES if window.actors[word]]
    if shown is not None and meshes:
        title = f"{shown.title}, {shown.unit}"
        plotter.add_scalar_bar(title=title, mapper=meshes[0], vertical=True, position_x=0.9, position_y=0.25, height=0.5, width=0.06,
                               color=INK, title_font_size=15, label_font_size=13, fmt="%.3g", render=False)  # fmt: skip


def _cut(window: Window) -> None:
    """Cut everything but the glyphs by an upright plane, and let the half nearer to the usual eye go."""
    from vtkmodules.vtkCommonDataModel import vtkPlane

    state, scene = window.state, window.content.scene
    plane = None
    if state.section:
        axis = 1 if state.section == 1 else 0
        at, normal = (scene.low + scene.high) / 2, np.zeros(3)
        at[axis] = scene.low[axis] + state.section_at * (scene.high - scene.low)[axis]
        normal[axis] = 1.0
        plane = vtkPlane()
        plane.SetOrigin(*at)
        plane.SetNormal(*normal)
    for key in (*SURFACES, "meetings"):
        for actor in window.actors[key]:
            actor.mapper.RemoveAllClippingPlanes()
            if plane is not None:
                actor.mapper.AddClippingPlane(plane)


def _outline(window: Window) -> None:
    """Draw a heavy outline about the chosen surface."""
    if "outline" in window.words:
        window.plotter.remove_actor(window.words.pop("outline"), render=False)
    chosen = window.state.chosen
    if chosen is None:
        return
    surface = window.content.scene.surfaces[chosen]
    faces = np.insert(surface.triangles, 0, 3, axis=1).ravel()
    rim = pv.PolyData(surface.vertices.astype(np.float32), faces).extract_feature_edges(
        boundary_edges=True, feature_edges=False, manifold_edges=False, non_manifold_edges=False
    )
    if rim.n_cells:
        actor = window.plotter.add_mesh(rim, color=INK, line_width=6, render=False, pickable=False, reset_camera=False)
        actor.SetScale(1.0, 1.0, window.state.exaggeration)
        window.words["outline"] = actor


def _look(window: Window) -> None:
    scene, key = window.content.scene, window.state.viewpoint
    azimuth, elevation = LOOKS.get(key, (scene.view_from_deg, ELEVATION_DEG))
    assert key in VIEWPOINTS
    width, height = window.plotter.window_size
    aim(window.plotter, replace(scene, view_from_deg=azimuth, elevation_deg=elevation), width / height)


def _title(window: Window) -> None:
    scene = window.content.scene
    counts = ", ".join(f"{count} {word}" for word, count in scene.counts)
    _text(window, "title", f"{scene.title}\n{scene.subtitle}   {counts}", (24, PIXELS[1] - 70), 13)


def _stretched(window: Window) -> None:
    """Put glyphs and names where their places are under stretched heights; glyphs keep their shape."""
    plotter, scene, up = window.plotter, window.content.scene, np.array([1.0, 1.0, window.state.exaggeration])
    for actor in window.actors["glyphs"]:
        plotter.remove_actor(actor, render=False)
    window.actors["glyphs"] = glyph_actors(plotter, replace(scene, glyphs=tuple(replace(g, place=g.place * up) for g in scene.glyphs)))
    if "names" in window.words:
        plotter.remove_actor(window.words.pop("names"), render=False)
    places = np.array([label.place * up for label in scene.labels]).reshape(-1, 3)
    window.words["names"] = plotter.add_point_labels(
        places, [label.text or " " for label in scene.labels], font_size=13, text_color=INK, shape_color=PAPER, shape_opacity=0.8,
        margin=2, show_points=False, always_visible=True, reset_camera=False, render=False,
    )  # fmt: skip


def _texts(window: Window) -> None:
    state = window.state
    record = "" if state.chosen is None else window.content.records[state.chosen]
    _text(window, "record", record, (24, PIXELS[1] - 100 - 21 * (record.count("\n") + 1)), 11)
    _text(window, "keys", key_table() if state.help else "", (24, 60), 10)
    _text(window, "status", status(state, window.content), (24, 20), 10)


def _text(window: Window, key: str, text: str, position: tuple[int, int], size: int) -> None:
    if key in window.words:
        window.plotter.remove_actor(window.words.pop(key), render=False)
    if text:
        window.words[key] = window.plotter.add_text(
            text, position=position, font_size=size, color=INK, font_file=FONT, name=f"structviz {key}", render=False
        )
