"""The window: what each key does to the state, and that the picture, the choice and the record follow."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from structviz.analysis import Analysis, Settings, run
from structviz.cli.main import entry
from structviz.errors import InputError, RenderingUnavailable
from structviz.report.window_content import content_of_analysis, content_of_results
from structviz.report.write import write_outputs
from structviz.synthetic import random_model
from structviz.views.gl import require_gl
from structviz.views.window import KEYS, WindowState, key_table, pressed, status


@pytest.fixture(scope="module")
def judged() -> Analysis:
    return run(random_model("normal", faults=14, conjugate=12, planted=2, triangles=60, random_state=4).model, Settings(replicates=60))


@pytest.fixture(scope="module")
def content(judged: Analysis):
    return content_of_analysis(judged)


@pytest.fixture
def window(content):
    try:
        require_gl()
    except RenderingUnavailable as error:
        pytest.skip(str(error))
    from structviz.views.render_window import open_window

    said: list[str] = []
    opened = open_window(content, off_screen=True, say=said.append)
    opened.said = said
    yield opened
    opened.plotter.close()


def test_keys_go_round_and_come_back(content) -> None:
    for key, times in (("c", len(content.fields) + 1), ("x", 3), ("z", 3), ("g", 2), ("l", 2), ("n", 2), ("question", 2)):
        state = WindowState()
        for k in range(times):
            state = pressed(state, key, content)
            assert (state == WindowState()) == (k == times - 1)


def test_arrows_walk_through_the_faults_worst_first(content) -> None:
    state = pressed(WindowState(), "Right", content)
    assert state.chosen == 0
    assert "conflicting" in content.records[0]
    assert pressed(state, "Left", content).chosen == len(content.records) - 1
    assert pressed(state, "Escape", content).chosen is None
    assert pressed(WindowState(), "Left", content).chosen == len(content.records) - 1


def test_other_keys_do_nothing_and_every_key_stands_in_the_table(content) -> None:
    assert pressed(WindowState(), "F12", content) == WindowState()
    assert len(key_table().splitlines()) == len(KEYS) + 3
    assert status(WindowState(), content) == "? shows the keys"
    assert status(replace(WindowState(), section=1, exaggeration=5.0), content).startswith("cut west to east, heights stretched 5 times")


def test_a_folder_of_results_shows_the_same_as_its_analysis(judged: Analysis, content, tmp_path: Path) -> None:
    write_outputs(judged, tmp_path / "out", pictures=False, page=False)
    again = content_of_results(tmp_path / "out")
    assert again.records == content.records
    assert again.scene.title == content.scene.title
    assert [(s.name, s.kind) for s in again.scene.surfaces] == [(s.name, s.kind) for s in content.scene.surfaces]
    for one, other in zip(again.scene.surfaces, content.scene.surfaces):
        assert np.allclose(one.vertices, other.vertices)
        assert np.array_equal(one.triangles, other.triangles)
    for one, other in zip(again.scene.glyphs, content.scene.glyphs, strict=True):
        assert np.allclose(one.place, other.place, atol=0.2)
        assert np.allclose(one.axes, other.axes)
    for field, same in zip(again.fields, content.fields, strict=True):
        assert all(np.allclose(a, b, equal_nan=True, atol=1e-5) for a, b in zip(field.values, same.values))
    assert np.allclose(again.scene.meetings, content.scene.meetings)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (None, "no results"),
        ("{", "JSON that cannot be read"),
        ("[]", "JSON of another kind"),
        ('{"schema": 1, "faults": [{}]}', "results without"),
    ],
)
def test_a_folder_that_is_no_result_is_refused(text: str | None, said: str, tmp_path: Path) -> None:
    if text is not None:
        (tmp_path / "results.json").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match=said):
        content_of_results(tmp_path)


def test_the_picture_follows_the_keys(window) -> None:
    from structviz.views.render_window import press

    def picture() -> np.ndarray:
        return np.asarray(window.plotter.screenshot(return_img=True), float)

    before = picture()
    for key in ("c", "x", "z", "g", "n", "Right", "question", "2"):
        press(window, key)
        after = picture()
        assert np.abs(after - before).mean() > 0.02, key
        before = after
    assert window.said[0] == window.content.records[0]


def test_a_click_on_a_fault_chooses_it_and_beside_it_none(window) -> None:
    from structviz.views.render_window import click, surface_at

    renderer, scene = window.plotter.renderer, window.content.scene
    hits = 0
    for surface in scene.surfaces:
        middle = surface.vertices[surface.triangles].mean(1)
        place = middle[((middle - middle.mean(0)) ** 2).sum(1).argmin()]
        renderer.SetWorldPoint(*place, 1.0)
        renderer.WorldToDisplay()
        x, y, _ = renderer.GetDisplayPoint()
        found = surface_at(window, x, y)
        assert found is not None
        hits += scene.surfaces[found[0]].name == surface.name  # else another one stands before it
    assert hits >= len(scene.surfaces) / 2
    click(window, x, y)
    assert window.state.chosen == found[0]
    click(window, 5.0, 5.0)
    assert window.state.chosen is None


def test_without_a_screen_the_other_ways_are_told(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.setattr("sys.platform", "linux")
    for name in ("DISPLAY", "WAYLAND_DISPLAY"):
        monkeypatch.delenv(name, raising=False)
    assert entry(["view", "meshes/model.toml"]) == 2
    told = capsys.readouterr().err
    assert "no screen was found: DISPLAY is not set" in told
    assert "structviz serve PATH shows the same in a browser" in told
