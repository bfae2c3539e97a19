"""Class by plunges, SHmax and A_phi."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from structviz.errors import ArgumentError
from structviz.stress.classify import KINDS, a_phi, kinds, kinds_of_plunges, shmax_deg
from structviz.stress.tensor import reduced_tensor

DOWN, NORTH, EAST = np.array([0.0, 0.0, -1.0]), np.array([0.0, 1.0, 0.0]), np.array([1.0, 0.0, 0.0])
ANDERSON = {"normal": (DOWN, NORTH, EAST), "strike-slip": (NORTH, DOWN, EAST), "reverse": (NORTH, EAST, DOWN)}


@pytest.mark.parametrize("word", ANDERSON)
def test_upright_stresses(word):
    frame = np.stack(ANDERSON[word])
    assert str(kinds(frame)) == word
    assert float(shmax_deg(frame, 0.5)) == pytest.approx(0.0)
    low = {"normal": 0, "strike-slip": 1, "reverse": 2}[word]
    assert low <= float(a_phi(frame, 0.3)) <= low + 1


def test_tilting_passes_through_the_oblique_class():
    """Turn normal faulting about north until sigma1 is level: reverse would need sigma3 steep, and passes undefined."""
    angles = np.arange(0.0, 91.0)
    frames = np.stack(ANDERSON["normal"]) @ Rotation.from_rotvec(np.radians(angles)[:, None] * NORTH).as_matrix()
    words = kinds(frames)
    assert words[0] == "normal"
    assert words[45] == "undefined"
    assert words[-1] == "reverse"
    about_sigma3 = np.stack(ANDERSON["normal"]) @ Rotation.from_rotvec(np.radians(angles)[:, None] * EAST).as_matrix()
    seen = [word for i, word in enumerate(kinds(about_sigma3)) if i == 0 or word != kinds(about_sigma3[i - 1])]
    assert seen == ["normal", "normal-oblique", "strike-slip"]


def test_every_direction_gets_one_known_word():
    words = kinds(Rotation.random(5000, random_state=0).as_matrix())
    assert set(words.tolist()) == set(KINDS)


def test_shmax_is_where_horizontal_stress_is_greatest():
    frames, ratios = Rotation.random(40, random_state=1).as_matrix(), np.random.default_rng(2).uniform(0, 1, 40)
    azimuth = np.arange(0, 180, 0.05)
    across = np.stack([np.sin(np.radians(azimuth)), np.cos(np.radians(azimuth)), np.zeros(len(azimuth))], -1)
    for frame, ratio in zip(frames, ratios):
        pressure = np.einsum("ni,ij,nj->n", across, reduced_tensor(frame, ratio), across)
        off = (azimuth[pressure.argmax()] - shmax_deg(frame, ratio) + 90) % 180 - 90
        assert abs(off) <= 0.05


def test_shmax_ranges_broadcasts_and_says_when_there_is_none():
    frames = Rotation.random(500, random_state=3).as_matrix()
    table = shmax_deg(frames[:, None], np.linspace(0, 1, 5))
    assert table.shape == (500, 5)
    assert ((table >= 0) & (table < 180)).all()
    assert np.isnan(shmax_deg(np.stack(ANDERSON["normal"]), 0.0))
    assert np.isnan(shmax_deg(np.stack(ANDERSON["reverse"]), 1.0))
    assert not np.isnan(shmax_deg(np.stack(ANDERSON["reverse"]), 0.0))


def test_shmax_does_not_depend_on_signs_of_axes():
    frames = Rotation.random(50, random_state=4).as_matrix()
    turned = frames * np.array([[-1.0], [1.0], [-1.0]])
    np.testing.assert_allclose(shmax_deg(turned, 0.4), shmax_deg(frames, 0.4), atol=1e-9)


def test_a_phi_is_continuous_where_two_stresses_are_equal():
    normal, slip, reverse = (np.stack(ANDERSON[word]) for word in ("normal", "strike-slip", "reverse"))
    assert a_phi(normal, 1.0) == a_phi(slip, 1.0) == 1.0
    assert a_phi(slip, 0.0) == a_phi(reverse, 0.0) == 2.0
    assert (a_phi(normal, 0.0), a_phi(reverse, 1.0)) == (0.0, 3.0)


def test_bad_arguments_are_refused():
    with pytest.raises(ArgumentError, match="s1_plunge_deg: found 95 deg; wanted 0 to 90 deg"):
        kinds_of_plunges(95.0, 0.0, 0.0)
    with pytest.raises(ArgumentError, match=r"axes: found shape \(3,\)"):
        kinds([1.0, 0.0, 0.0])
    with pytest.raises(ArgumentError, match="shape_ratio: found -1"):
        shmax_deg(np.eye(3), -1.0)
