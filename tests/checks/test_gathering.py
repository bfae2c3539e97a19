"""One fault twice, and strays: told where they are planted, with what would explain them, and not elsewhere."""

from __future__ import annotations

import numpy as np
import pytest

from structviz.checks import run, samples
from structviz.checks.registry import Examined
from structviz.io import read_model
from structviz.surfaces.measure import measure
from structviz.surfaces.surface import Surface
from structviz.synthetic import random_model


def told(examined: Examined, key: str) -> list[tuple[str, str]]:
    return [(f.subject, f.message) for f in run(examined) if f.check == key]


def model_of(surfaces: list[Surface]) -> Examined:
    return samples.examined(*(measure(surface) for surface in surfaces))


@pytest.fixture(scope="module")
def surfaces() -> list[Surface]:
    known = random_model("normal", faults=12, conjugate=9, planted=0, triangles=300, random_state=6)
    return [fault.surface for fault in known.model.faults]


def test_a_sound_model_is_left_alone(surfaces: list[Surface]) -> None:
    for key in ("fault-twice", "stray-fault"):
        assert told(model_of(surfaces), key) == []


def test_the_same_sheet_meshed_anew_is_told(surfaces: list[Surface]) -> None:
    sheet = surfaces[3]
    corners = sheet.vertices[sheet.triangles]
    middles = corners.mean(1, keepdims=True)
    cut = np.concatenate([np.concatenate([corners[:, [k, (k + 1) % 3]], middles], 1) for k in range(3)])
    finer = Surface("again", cut.reshape(-1, 3) + 0.5, np.arange(3 * len(cut)).reshape(-1, 3))
    ((subject, message),) = told(model_of([*surfaces, finer]), "fault-twice")
    assert subject == "D"
    assert message.startswith("lies on M over 100 % of its area: one fault under two names?") or "lies on M over 9" in message


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda v: v[:, [1, 0, 2]], "with easting and northing exchanged it would lie among them"),
        (lambda v: v / 0.3048, "if its coordinates are feet it would lie among them"),
        (lambda v: v / 1000.0, "if its coordinates are kilometres it would lie among them"),
    ],
)
def test_a_stray_is_told_with_what_explains_it(change, words: str, surfaces: list[Surface]) -> None:
    moved = [Surface(s.name, s.vertices + [500_000.0, 4_000_000.0, 0.0], s.triangles) for s in surfaces]
    moved[5] = Surface("stray", change(moved[5].vertices), moved[5].triangles)
    ((subject, message),) = told(model_of(moved), "stray-fault")
    assert subject == "F"
    assert message.endswith(words)


@pytest.mark.parametrize("folder", ["california_fault_meshes/mojave", "california_fault_meshes/transverse_ranges"])
def test_open_models_hold_no_fault_twice_and_no_strays(folder: str, shared_data) -> None:
    model = read_model(shared_data / folder)
    examined = Examined(model, tuple(measure(fault.surface) for fault in model.faults))
    assert told(examined, "stray-fault") == []
    assert told(examined, "fault-twice") == []
