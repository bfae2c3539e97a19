"""Do the pictures of the demo model still look like those the README shows? Small and tolerant: what moved is what matters."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from structviz.analysis import run
from structviz.io import read_model
from structviz.views.gl import require_gl, working_window
from structviz.views.registry import draw, views
from tests.conftest import skip_or_fail

PROJECT = Path(__file__).resolve().parents[2]
SMALL = (250, 175)
MOST_APART = 3.0  # of 255, mean over the small picture; another shade of one fault is 0.3, a moved glyph 1


def small(path: Path) -> np.ndarray:
    with Image.open(path) as picture:
        return np.asarray(picture.convert("RGB").resize(SMALL, Image.Resampling.BOX), float)


@pytest.fixture(scope="module")
def demo():
    return run(read_model(PROJECT / "meshes" / "model.toml"))


@pytest.mark.parametrize("key", ["scene", "net"])
def test_pictures_of_the_demo_are_those_of_the_readme(demo, key, tmp_path):
    entry = views()[key]
    if entry.needs_gl:
        if working_window() is None:
            skip_or_fail("no working OpenGL (libegl1 and libgl1-mesa-dri)")
        require_gl()
    draw(entry, entry.build(demo), tmp_path / entry.file_name)
    shown, drawn = small(PROJECT / "examples" / f"demo_{entry.file_name}"), small(tmp_path / entry.file_name)
    assert np.abs(shown - drawn).mean() < MOST_APART
    assert np.abs(shown[..., 0] - drawn[:, ::-1, 0]).mean() > MOST_APART, "the measure must tell a mirrored picture from this one"
