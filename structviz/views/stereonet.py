"""The equal-area net as data: planes by verdict, poles, axes with their cones, predicted and declared slip."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.orientation.lines import trend_plunge_deg
from structviz.orientation.planes import slip_vectors
from structviz.orientation.projection import equal_area, equal_area_directed, great_circles, small_circle
from structviz.stress.regime import Regime
from structviz.views.captions import count_line, model_line, regime_line
from structviz.views.net_density import NetDensity, net_density
from structviz.views.registry import view

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class NetPlane:
    """One fault on the net."""

    name: str
    verdict: str
    circle: Floats  # (K, 2)
    pole: Floats  # (2,)


@dataclass(frozen=True, eq=False)
class NetSlip:
    """One slip line on the net, at its lower end."""

    name: str
    verdict: str
    declared: bool  # else predicted
    point: Floats  # (2,)
    upward: bool  # the hanging wall moves up


@dataclass(frozen=True, eq=False)
class NetAxis:
    """One principal axis with its cone."""

    label: str
    point: Floats  # (2,)
    cone: tuple[Floats, ...]  # polylines
    text: str
    number: int = 0  # 0, 1, 2 for sigma1, sigma2, sigma3
    phase: int = 0  # row of Analysis.regimes


@dataclass(frozen=True, eq=False)
class Net:
    """The whole net."""

    title: str
    subtitle: str
    planes: tuple[NetPlane, ...]
    slips: tuple[NetSlip, ...]
    axes: tuple[NetAxis, ...]
    counts: tuple[tuple[str, int], ...]
    density: NetDensity | None = None  # of the poles; None for few faults


@view("net", title="Equal-area net, lower hemisphere", file_name="net.png", needs_gl=False, renderer="render_net")
def build_net(analysis: Analysis) -> Net:
    """Return the net of an analysis; faults without a meaningful mean plane are left off it."""
    shown = [result for result in analysis.faults if result.measured.meaningful]
    planes = tuple(_plane(result) for result in shown)
    slips = tuple(slip for result in shown for slip in _slips(result))
    density = net_density(np.array([result.measured.normal for result in shown]).reshape(-1, 3))
    return Net(regime_line(analysis), model_line(analysis), planes, slips, _axes(analysis), count_line(analysis), density)


def _plane(result: FaultResult) -> NetPlane:
    normal = result.measured.normal
    return NetPlane(result.fault.name, result.verdict.word, great_circles(normal), equal_area(normal))


def _slips(result: FaultResult) -> list[NetSlip]:
    """Return the predicted slip, and beside it the declared one where the two conflict."""
    rakes = [(False, result.verdict.predicted_rake_deg)]
    if result.verdict.word == "conflicting" and result.sector:
        rakes.append((True, result.sector.rake_deg))
    found = []
    for declared, rake in rakes:
        if rake is not None and result.verdict.word != "undetermined":
            point, upward = equal_area_directed(slip_vectors(result.measured.normal, rake))
            found.append(NetSlip(result.fault.name, result.verdict.word, declared, point, bool(upward)))
    return found


def _axes(analysis: Analysis) -> tuple[NetAxis, ...]:
    return tuple(axis for phase, regime in enumerate(analysis.regimes) for axis in _axes_of(regime, phase, len(analysis.regimes) > 1))


def _axes_of(regime: Regime, phase: int, several: bool) -> Iterator[NetAxis]:
    trends, plunges = trend_plunge_deg(regime.axes)
    for number, (axis, cone, trend, plunge) in enumerate(zip(regime.axes, regime.cones_deg, trends, plunges, strict=True)):
        lines = tuple(small_circle(axis, min(max(cone, 0.5), 89.0)))
        label = f"\u03c3{number + 1}" + (f" ({phase + 1})" if several else "")
        text = f"{round(float(trend)) % 360:03d}/{plunge:02.0f} \u00b1 {cone:.0f}\u00b0"
        yield NetAxis(label, equal_area(axis), lines, text, number, phase)
