"""Layers of stress glyphs: what each shows is what the analysis holds, where it holds it."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.analysis import Analysis, Settings, run
from structviz.orientation.vectors import axial_angle_deg
from structviz.synthetic import random_model
from structviz.synthetic.turning import KnownTurning, turning_model
from structviz.views.glyph_layers import FIELD_CELLS, GlyphLayer, glyph_layers
from structviz.views.scene import build_scene


@pytest.fixture(scope="module")
def known() -> KnownTurning:
    return turning_model(60.0, 60, random_state=5)


@pytest.fixture(scope="module")
def turning(known: KnownTurning) -> Analysis:
    return run(known.model, Settings(replicates=60, stations=8))


@pytest.fixture(scope="module")
def layers(turning: Analysis) -> dict[str, GlyphLayer]:
    return {layer.key: layer for layer in glyph_layers(turning, build_scene(turning))}


def test_a_stress_that_turns_is_shown_in_every_layer(layers: dict[str, GlyphLayer]) -> None:
    assert list(layers) == ["whole", "pairs", "stations", "domains", "field"]
    assert [key for key, layer in layers.items() if layer.shown] == ["whole", "domains", "field"]


def test_axes_are_frames(layers: dict[str, GlyphLayer]) -> None:
    axes = np.stack([glyph.axes for layer in layers.values() for glyph in layer.glyphs])
    np.testing.assert_allclose(axes @ np.swapaxes(axes, 1, 2), np.broadcast_to(np.eye(3), axes.shape), atol=1e-6)


@pytest.mark.parametrize("key", ["stations", "field"])
def test_glyphs_turn_as_the_stress_does(layers: dict[str, GlyphLayer], known: KnownTurning, turning: Analysis, key: str) -> None:
    origin = build_scene(turning).origin
    places = np.stack([glyph.place for glyph in layers[key].glyphs]) + origin
    off = axial_angle_deg(np.stack([glyph.axes[2] for glyph in layers[key].glyphs]), known.axes_at(places)[:, 2])
    one = axial_angle_deg(turning.regimes[0].axes[2], known.axes_at(places)[:, 2])
    assert np.median(off) < 8 < np.median(one)


def test_the_field_is_level_and_ends_where_the_faults_do(layers: dict[str, GlyphLayer], turning: Analysis) -> None:
    assert turning.by_place is not None
    places = np.stack([glyph.place for glyph in layers["field"].glyphs]) + build_scene(turning).origin
    assert np.ptp(places[:, 2]) == 0
    held = turning.by_place.data.places
    beyond = np.maximum(held.min(0) - places, places - held.max(0))[:, :2].max()
    assert beyond < np.ptp(held[:, :2], axis=0).max() / FIELD_CELLS


def test_parts_stand_at_the_middles_of_their_faults(layers: dict[str, GlyphLayer], turning: Analysis) -> None:
    assert turning.by_place is not None
    domains = turning.by_place.domains
    assert domains is not None
    places = np.stack([glyph.place for glyph in layers["domains"].glyphs]) + build_scene(turning).origin
    np.testing.assert_allclose(places, domains.middles)


def test_one_stress_is_shown_at_pairs_first() -> None:
    analysis = run(random_model("normal", faults=14, conjugate=10, planted=1, triangles=60, random_state=3).model, Settings(replicates=50))
    layers = {layer.key: layer for layer in glyph_layers(analysis, build_scene(analysis))}
    assert "domains" not in layers
    assert [key for key, layer in layers.items() if layer.shown] == ["whole", "pairs"]
    stations = np.stack([glyph.axes for glyph in layers["stations"].glyphs])
    np.testing.assert_array_equal(stations, np.broadcast_to(analysis.regimes[0].axes, stations.shape))
