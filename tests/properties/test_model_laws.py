"""Laws of the whole analysis: what may not change an answer does not, and what must turn with the model does."""

from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.kinematics.senses import sector_of_words
from structviz.model import Fault
from structviz.orientation.vectors import axial_angle_deg, rotation
from structviz.surfaces.surface import Surface
from structviz.synthetic import random_model

SETTINGS = Settings(replicates=200)


@pytest.fixture(scope="module", params=["normal", "strike-slip"])
def known(request):
    return random_model(request.param, faults=16, conjugate=12, planted=2, random_state=21)


@pytest.fixture(scope="module")
def plain(known):
    return run(known.model, SETTINGS)


def words(analysis):
    return {result.fault.name: result.verdict.word for result in analysis.faults}


def moved(model, change, triangles=lambda t: t, label=lambda sector: sector, name=lambda n: n):
    """The model with its vertices, triangles, labels and names changed."""
    rows = []
    for fault in model.faults:
        surface = Surface(name(fault.name), change(fault.surface.vertices), triangles(fault.surface.triangles))
        rows.append(Fault(name(fault.name), surface, label(fault.declared), fault.phase, fault.down_side))
    return replace(model, faults=tuple(rows))


def worst_deg(analysis, axes):
    return axial_angle_deg(analysis.regimes[0].axes, axes).max()


def test_inputs_are_left_alone(known):
    before = [(f.surface.vertices.tobytes(), f.surface.triangles.tobytes()) for f in known.model.faults]
    run(known.model, SETTINGS)
    assert [(f.surface.vertices.tobytes(), f.surface.triangles.tobytes()) for f in known.model.faults] == before


def test_the_same_model_gives_the_same_answer(known, plain):
    again = run(known.model, SETTINGS)
    assert np.array_equal(again.regimes[0].axes, plain.regimes[0].axes)
    assert [r.verdict for r in again.faults] == [r.verdict for r in plain.faults]


def test_renaming_and_reordering_change_nothing(known, plain):
    order = np.random.default_rng(0).permutation(len(known.model.faults))
    shuffled = replace(known.model, faults=tuple(known.model.faults[i] for i in order))
    other = run(moved(shuffled, lambda v: v, name=lambda n: f"zz{n[::-1]}"), SETTINGS)
    assert np.array_equal(other.regimes[0].axes, plain.regimes[0].axes)
    assert [other.faults[int(np.flatnonzero(order == i)[0])].verdict for i in range(len(order))] == [r.verdict for r in plain.faults]


def test_a_move_across_the_map_changes_nothing(known, plain):
    other = run(moved(known.model, lambda v: v - known.model.faults[0].surface.vertices[0] + [431_000.25, 5_120_000.5, -700.0]), SETTINGS)
    assert worst_deg(other, plain.regimes[0].axes) < 1e-3
    assert words(other) == words(plain)


def test_the_axes_turn_with_the_model(known, plain):
    turn, middle = rotation([0, 0, 1.0], 25.0), known.model.faults[0].surface.vertices.mean(0)
    # Compass words for the side that went down do not turn with the coordinates: only models without them can be turned.
    if any(fault.down_side for fault in known.model.faults):
        pytest.skip("this model names sides by compass")
    other = run(moved(known.model, lambda v: (v - middle) @ turn.T + middle), SETTINGS)
    assert worst_deg(other, plain.regimes[0].axes @ turn.T) < 0.3
    assert words(other) == words(plain)


def test_a_mirrored_model_with_mirrored_labels_is_the_mirrored_answer(known, plain):
    swap = {"sinistral": "dextral", "dextral": "sinistral"}

    def mirrored(sector):
        return sector_of_words("-".join(swap.get(word, word) for word in sector.words))

    if any(fault.down_side for fault in known.model.faults):
        pytest.skip("this model names sides by compass")
    mirror = np.array([-1.0, 1, 1])
    other = run(moved(known.model, lambda v: v * mirror, label=mirrored), SETTINGS)
    assert worst_deg(other, plain.regimes[0].axes * mirror) < 0.3
    assert words(other) == words(plain)


def test_winding_and_order_of_triangles_change_nothing(known, plain):
    other = run(moved(known.model, lambda v: v, triangles=lambda t: t[::-1, ::-1].copy()), SETTINGS)
    assert worst_deg(other, plain.regimes[0].axes) < 1e-3
    assert words(other) == words(plain)


def test_refined_surfaces_give_the_same_answer(known, plain):
    rows = []
    for fault in known.model.faults:
        v, t = fault.surface.vertices, fault.surface.triangles
        middle = v[t].mean(1)
        new = len(v) + np.arange(len(t))
        finer = np.concatenate([np.stack([t[:, i], t[:, j], new], 1) for i, j in ((0, 1), (1, 2), (2, 0))])
        rows.append(replace(fault, surface=Surface(fault.name, np.concatenate([v, middle]), finer)))
    other = run(replace(known.model, faults=tuple(rows)), SETTINGS)
    assert worst_deg(other, plain.regimes[0].axes) < 1.0
    assert words(other) == words(plain)
