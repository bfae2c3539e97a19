"""Units and datum: the mistakes that a reader of coordinates makes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.checks import samples
from structviz.checks.registry import Examined, run

KEYS = {"span-small", "span-large", "vertical-unit", "all-flat", "datum", "far-fault"}


def scaled(east: float = 1.0, north: float = 1.0, up: float = 1.0, shift: tuple[float, float, float] = (0, 0, 0)) -> Examined:
    """Return four ordinary faults with their coordinates multiplied, then moved."""
    planes = [samples.plane(90.0 * k, 60.0, (5000.0 * k, 3000.0 * k, -3000.0)) for k in range(4)]
    planes = [replace(plane, vertices=plane.vertices * [east, north, up] + np.array(shift)) for plane in planes]
    return samples.examined(*(samples.measured(plane) for plane in planes))


def seen(examined: Examined) -> set[str]:
    return {found.check for found in run(examined)} & KEYS


def test_an_ordinary_model_raises_nothing() -> None:
    assert seen(scaled()) == set()
    assert seen(scaled(shift=(512_000.0, 6_100_000.0, 0.0))) == set()


@pytest.mark.parametrize(
    ("mistake", "expected"),
    [
        (scaled(1e-5, 1e-5, 1.0), {"vertical-unit"}),  # degrees in plan, metres in depth
        (scaled(1e-3, 1e-3, 1.0), {"vertical-unit"}),  # kilometres in plan
        (scaled(1.0, 1.0, 1e-3), {"all-flat"}),  # kilometres in depth
        (scaled(1e-4, 1e-4, 1e-4), {"span-small"}),
        (scaled(1e3, 1e3, 1e3), {"span-large"}),  # metres multiplied once more
        (scaled(1.0, 1.0, -1.0), {"datum"}),  # depth read as elevation
    ],
    ids=["degrees", "km-plan", "km-depth", "too-small", "too-large", "depth"],
)
def test_each_mistake_is_told_apart(mistake: Examined, expected: set[str]) -> None:
    assert seen(mistake) == expected


def test_all_above_ground_is_a_note_and_above_any_mountain_a_warning() -> None:
    (note,) = [each for each in run(scaled(up=-1.0)) if each.check == "datum"]
    (warning,) = [each for each in run(scaled(up=-1.0, shift=(0, 0, 6000.0))) if each.check == "datum"]
    assert (note.severity, warning.severity) == ("note", "warning")
    assert "higher than any ground" in warning.message


def test_a_surface_in_another_frame_is_named() -> None:
    known = scaled()
    strange = samples.measured(samples.plane(centre=(4.2e6, 7e6, -3000.0)))
    (only,) = [each for each in run(samples.examined(*known.measured, strange)) if each.check == "far-fault"]
    assert only.message.endswith("from the rest: E")
