"""Every registered view: it builds, is not empty, leaves the analysis alone, and is drawn as something."""

import numpy as np
import pytest
from matplotlib.image import imread

from structviz.analysis import Settings, run
from structviz.synthetic import random_model
from structviz.views import views
from structviz.views.registry import draw


def fingerprint(analysis):
    arrays = [
        a for r in analysis.faults for a in (r.fault.surface.vertices, r.fault.surface.triangles, r.measured.normals, r.stations.places)
    ]
    arrays += [analysis.pairs.axes, analysis.pairs.places, *(regime.axes for regime in analysis.regimes)]
    return [array.tobytes() for array in arrays]


@pytest.mark.parametrize("key", sorted(views()))
def test_view_builds_and_draws(key, analysis, tmp_path, gl):
    entry, before = views()[key], fingerprint(analysis)
    description = entry.build(analysis)
    assert description is not None
    draw(entry, description, tmp_path / entry.file_name)
    assert fingerprint(analysis) == before
    pixels = imread(tmp_path / entry.file_name)[..., :3]
    assert pixels.shape[0] > 1000
    assert np.abs(pixels - pixels[0, 0]).max(-1).astype(bool).mean() > 0.02  # more than two in a hundred are not paper


@pytest.mark.parametrize("key", sorted(views()))
def test_the_same_analysis_gives_the_same_bytes(key, analysis, tmp_path, gl):
    entry = views()[key]
    for name in ("a.png", "b.png"):
        draw(entry, entry.build(analysis), tmp_path / name)
    assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.png").read_bytes()


@pytest.mark.parametrize("key", sorted(views()))
def test_a_model_without_any_regime_is_drawn_too(key, tmp_path, gl):
    lone = run(random_model("normal", faults=1, conjugate=1, planted=0, random_state=1).model, Settings(replicates=50))
    assert lone.regimes == ()
    entry = views()[key]
    draw(entry, entry.build(lone), tmp_path / entry.file_name)
    assert (tmp_path / entry.file_name).stat().st_size > 10_000
