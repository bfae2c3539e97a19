"""The regime against what was measured apart from the faults: wells and earthquakes."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Evidence, Examined, Found, check
from structviz.errors import ArgumentError
from structviz.kinematics.slip import resolved_slip
from structviz.model import FaultModel, Mechanism, WellAzimuth
from structviz.orientation.planes import normals, rakes_deg
from structviz.stress.compare import TOLERANCE_DEG, Comparison, compare_azimuths, compare_mechanisms
from structviz.stress.mechanism_inversion import MechanismInversion, invert_mechanisms
from structviz.stress.regime import Regime
from structviz.stress.tensor import reduced_tensor
from structviz.surfaces.surface import Floats

NORTH_WELLS = (350.0, 0.0, 4.0, 9.0, 12.0)  # the sample regime has its SHmax due north
EAST_WELLS = (80.0, 90.0, 94.0, 99.0, 102.0)
STRIKES = (0.0, 180.0, 35.0, 325.0, 215.0, 145.0, 20.0, 160.0)


def comparisons(model: FaultModel, regimes: Sequence[Regime], friction: float = 0.6, random_state: int = 0) -> tuple[Comparison, ...]:
    """Return each regime compared with the wells and the mechanisms of a model, wells first; empty where it has neither.

    Mechanisms that were used as evidence are not compared, since they would agree with themselves.
    """
    found = []
    if model.azimuths:
        azimuths, errors = np.array([(well.shmax_deg, well.uncertainty_deg) for well in model.azimuths], float).T
        found += [compare_azimuths(regime, azimuths, errors) for regime in regimes]
    if model.mechanisms and model.mechanisms_are == "independent":
        inverted = inversion_of(model.mechanisms, friction, random_state)
        found += [
            refused(inverted, regime, model) if isinstance(inverted, str) else compare_mechanisms(regime, inverted) for regime in regimes
        ]
    return tuple(found)


def inversion_of(mechanisms: Sequence[Mechanism], friction: float, random_state: int) -> MechanismInversion | str:
    """Return the stress of mechanisms, or the reason in words why there is none."""
    nothing = (np.nan, np.nan, np.nan)
    planes = [each.planes if len(each.planes) == 2 else (each.planes[0], nothing) for each in mechanisms]
    try:
        return invert_mechanisms(planes, [each.weight for each in mechanisms], friction=friction, random_state=random_state)
    except ArgumentError as error:
        return error.message


def refused(reason: str, regime: Regime, model: FaultModel) -> Comparison:
    """Return the comparison with mechanisms that tell of no stress."""
    text = f"The earthquakes are too few, or too much alike, to tell of a stress ({reason})."
    return Comparison("mechanisms", "earthquake mechanisms", len(model.mechanisms), np.nan, np.nan, "undecided", text, regime.name)


@check(
    "wells-differ",
    title="wells that give another direction of compression than the faults",
    why="wells measure the stress of today; where it is not that of the faults, they are older, or labels and strikes mislead",
    unit="deg",
    limit=TOLERANCE_DEG,
    source="mardia2000",
    hint="ask whether the faults move today, whether wells are shallow or near a fault, and from which north azimuths are counted",
    passes=lambda: _compared(NORTH_WELLS),
    fails=lambda: _compared(EAST_WELLS),
    low=5.0,
    high=90.0,
    needs="stress",
)
def wells_differ(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the mean azimuth of the wells is further from that of every regime than the limit and two deviations."""
    yield from _differing(examined, "wells", limit)


@check(
    "mechanisms-differ",
    title="earthquakes that tell of another stress than the faults",
    why="earthquakes measure the stress of today, at depth; where it is not that of the faults, they are older, or labels mislead",
    unit="deg",
    limit=TOLERANCE_DEG,
    source="vavrycuk2014",
    hint="ask whether the faults move today and whether the earthquakes come from the same volume and depth",
    passes=lambda: _compared(quakes=_quakes(samples.NORMAL_AXES, 60.0)),
    fails=lambda: _compared(quakes=_quakes(samples.NORMAL_AXES[::-1], 30.0)),
    low=5.0,
    high=120.0,
    needs="stress",
)
def mechanisms_differ(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the axes of the earthquakes are turned from those of every regime by more than the limit allows."""
    yield from _differing(examined, "mechanisms", limit)


def _differing(examined: Examined, key: str, limit: float) -> Iterator[Found]:
    """Return one warning, about the nearest regime, where none of them is near enough."""
    made = [each for each in examined.comparisons if each.key == key and each.word != "undecided"]
    nearest = min(made, key=lambda each: each.difference_deg, default=None)
    if nearest is None or nearest.difference_deg <= max(limit, 2 * nearest.uncertainty_deg):
        return
    which = f"Nearest is {nearest.regime}. " if len(made) > 1 else ""
    yield Found("model", "warning", f"{which}{nearest.text}".removesuffix("."), _numbers(nearest))


def _numbers(each: Comparison) -> Evidence:
    return (
        ("count", each.count),
        ("difference_deg", round(each.difference_deg, 1)),
        ("uncertainty_deg", round(each.uncertainty_deg, 1)),
        ("shmax_deg", round(each.shmax_deg, 1) % 180.0),
    )


def _quakes(axes: Floats, dip_deg: float) -> list[tuple[float, float, float]]:
    """Return one plane of earthquakes in a stress with R of one half, on faults of several strikes."""
    planes = normals(STRIKES, dip_deg)
    rakes = rakes_deg(planes, resolved_slip(reduced_tensor(axes, 0.5), planes))
    return [(strike, dip_deg, float(rake)) for strike, rake in zip(STRIKES, rakes)]


def _compared(azimuths: Sequence[float] = (), quakes: Sequence[tuple[float, float, float]] = ()) -> Examined:
    """Return a judged model with the sample regime compared with wells and earthquakes."""
    these = samples.judged("consistent", "consistent")
    wells = tuple(WellAzimuth(f"W{k}", azimuth % 180.0, 10.0, samples.CENTRE) for k, azimuth in enumerate(azimuths))
    events = tuple(Mechanism(f"E{k}", samples.CENTRE, (plane,)) for k, plane in enumerate(quakes))
    model = replace(these.model, azimuths=wells, mechanisms=events)
    return replace(these, model=model, comparisons=comparisons(model, these.regimes))
