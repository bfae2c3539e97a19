"""The turning scene: as many frames as told, of one size, the same bytes again, and a film where one is asked for."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from structviz.cli.main import entry
from structviz.errors import RenderingUnavailable, StructvizError
from structviz.views.gl import require_gl
from structviz.views.scene import build_scene


@pytest.fixture(scope="module", autouse=True)
def graphics() -> None:
    try:
        require_gl()
    except RenderingUnavailable as error:
        pytest.skip(str(error))


def test_a_gif_turns_once_round(analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from structviz.views import render_turntable

    monkeypatch.setattr(render_turntable, "FRAMES", 6)
    for name in ("a.gif", "b.gif"):
        render_turntable.write_turntable(build_scene(analysis), tmp_path / name)
    assert (tmp_path / "a.gif").read_bytes() == (tmp_path / "b.gif").read_bytes()
    with Image.open(tmp_path / "a.gif") as film:
        assert (film.n_frames, film.size) == (6, render_turntable.SIZE)
        frames = []
        for number in range(6):
            film.seek(number)
            frames.append(np.asarray(film.convert("L"), float))
    assert all(np.abs(frames[k] - frames[0]).mean() > 0.2 for k in range(1, 6))


def test_a_film_is_written(analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from structviz.views import render_turntable

    monkeypatch.setattr(render_turntable, "FRAMES", 4)
    render_turntable.write_turntable(build_scene(analysis), tmp_path / "a.mp4")
    assert (tmp_path / "a.mp4").read_bytes()[4:8] == b"ftyp"


def test_without_its_library_a_film_says_what_to_install(analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from structviz.views.render_turntable import write_turntable

    monkeypatch.setitem(sys.modules, "imageio_ffmpeg", None)
    with pytest.raises(StructvizError, match=r"imageio with ffmpeg is not installed.*\n  next: pip install"):
        write_turntable(build_scene(analysis), tmp_path / "a.mp4")


def test_other_kinds_are_refused_before_the_work(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert entry(["figures", "meshes/model.toml", "--out", str(tmp_path / "x"), "--turntable", "avi"]) == 2
    assert "--turntable: found 'avi'; wanted one of gif, mp4" in capsys.readouterr().err
    assert not (tmp_path / "x").exists()
