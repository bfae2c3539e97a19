"""The values of triangles that the page can show, as whole steps: one code a drawn triangle and field."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from structviz.analysis import Analysis, FaultResult
from structviz.report.annotated import OPEN_RATIO, triangle_values
from structviz.report.page_geometry import Drawn
from structviz.stress.regime import Regime
from structviz.stress.tensor import dilation_tendency, reduced_tensor

NOTHING = 65_535  # code that stands for no value
DISTANCE_STEPS = 100
ROUND = (1.0, 2.0, 2.5, 5.0, 10.0)


@dataclass(frozen=True)
class Shown:
    """One field of the triangles as the page shows it: code k stands for low + k * step."""

    key: str
    title: str
    unit: str
    low: float
    high: float
    step: float
    cyclic: bool = False


FIELDS = (
    Shown("dip_deg", "Dip", "°", 0.0, 90.0, 1.0),
    Shown("predicted_rake_deg", "Predicted rake", "°", -180.0, 180.0, 2.0, cyclic=True),
    Shown("misfit_deg", "Misfit of declared slip", "°", 0.0, 180.0, 2.0),
    Shown("slip_tendency", "Slip tendency", "of the greatest", 0.0, 1.0, 0.02),
    Shown("dilation_tendency", "Dilation tendency", "0 shut to 1 open", 0.0, 1.0, 0.02),
    Shown("pair_distance_m", "Distance to nearest pair", "m", 0.0, 1.0, 1.0),  # as far as the model goes
)


def coded_fields(analysis: Analysis, drawn: Sequence[Drawn]) -> list[tuple[Shown, NDArray[np.uint16]]]:
    """Return those fields that have any value, each with a code for every drawn triangle, fault by fault."""
    pairs = cKDTree(analysis.pairs.places) if len(analysis.pairs) else None
    values = [_values(analysis, result, each, pairs) for result, each in zip(analysis.faults, drawn, strict=True)]
    found = []
    for shown in FIELDS:
        whole = np.concatenate([piece[shown.key] for piece in values])
        if np.isfinite(whole).any():
            fitted = _fitted(shown, whole)
            found.append((fitted, _coded(whole, fitted)))
    return found


def _values(analysis: Analysis, result: FaultResult, drawn: Drawn, pairs: cKDTree | None) -> dict[str, NDArray]:
    """Return the values (T,) of the drawn triangles of one fault, NaN where nothing is known."""
    regime = analysis.regimes[result.phase] if analysis.regimes else None
    values = {**triangle_values(result, regime), "dilation_tendency": _dilation(result, regime)}
    picked = {key: array[drawn.source] for key, array in values.items()}
    return picked | {"pair_distance_m": _pair_distance_m(pairs, drawn)}


def _dilation(result: FaultResult, regime: Regime | None) -> NDArray:
    normals = result.measured.normals
    if regime is None:
        return np.full(len(normals), np.nan)
    values = dilation_tendency(reduced_tensor(regime.axes, regime.shape_ratio.value if regime.shape_ratio else OPEN_RATIO), normals)
    return np.where(result.measured.areas_m2 > 0, values, np.nan)


def _pair_distance_m(pairs: cKDTree | None, drawn: Drawn) -> NDArray:
    """Return the distance from the middle of each drawn triangle to the nearest place where two faults were paired, m."""
    if pairs is None:
        return np.full(len(drawn.triangles), np.nan)
    return np.asarray(pairs.query(drawn.vertices[drawn.triangles].mean(1), workers=-1)[0])


def _fitted(shown: Shown, values: NDArray) -> Shown:
    """Return a field that ends at a round number beyond its greatest value, where its end is not given by what it is."""
    if shown.unit != "m":
        return shown
    high = round_above(float(np.nanmax(values)))
    return replace(shown, high=high, step=high / DISTANCE_STEPS)


def round_above(value: float) -> float:
    """Return the least round number that is not below a positive one.

    >>> round_above(1730.0), round_above(2000.0), round_above(0.0)
    (2000.0, 2000.0, 1.0)
    """
    if value <= 0:
        return 1.0
    power = 10.0 ** np.floor(np.log10(value))
    return float(next(k * power for k in ROUND if k * power >= value * (1 - 1e-12)))


def _coded(values: NDArray, shown: Shown) -> NDArray[np.uint16]:
    known = np.isfinite(values)
    codes = np.rint((np.where(known, values, shown.low) - shown.low) / shown.step)
    return np.where(known, codes, NOTHING).astype(np.uint16)
