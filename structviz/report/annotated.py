"""Each fault as a mesh that carries, triangle by triangle, what was measured and predicted on it."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from structviz.analysis import Analysis, FaultResult
from structviz.io import write_surface
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.report.names import file_stems
from structviz.stress.regime import Regime
from structviz.stress.tensor import reduced_tensor, slip_tendency

OPEN_RATIO = 0.5  # R used for the map of a fault where the data leave it open
VERDICT_CODES = {"consistent": 0, "conflicting": 1, "undetermined": 2}  # the same in every file, so that files compare


def mesh_files(analysis: Analysis) -> dict[str, str]:
    """Return the annotated mesh of each fault by name, relative to the folder of results: safe names, all different."""
    names = [result.fault.name for result in analysis.faults]
    return {name: f"faults/{stem}.vtp" for name, stem in zip(names, file_stems(names))}


def write_annotated(result: FaultResult, regime: Regime | None, path: Path) -> None:
    """Write the surface of a fault with the values of `triangle_values`; OutputError where it cannot be written."""
    write_surface(path, result.fault.surface, triangle_values(result, regime))


def triangle_values(result: FaultResult, regime: Regime | None) -> dict[str, NDArray]:
    """Return one float32 value a triangle for each name, degrees, NaN where nothing is known; `normal` is (T, 3), to the hanging wall.

    Predictions are those of the one regime given, with R = 0.5 where R is open. The verdict is that of the whole fault, which
    rests on the regime of the other faults and on all of R: 0 consistent, 1 conflicting, 2 undetermined.
    """
    normals = result.measured.normals
    strike, dip = strike_dip_deg(normals)
    flat = result.measured.areas_m2 <= 0  # a triangle without area has no orientation
    rake, tendency = _predicted(normals, regime)
    misfit = _misfit_deg(rake, result)
    values = {"dip_deg": dip, "strike_deg": strike, "predicted_rake_deg": rake, "slip_tendency": tendency, "misfit_deg": misfit}
    known: dict[str, NDArray] = {name: np.where(flat, np.nan, array).astype(np.float32) for name, array in values.items()}
    known["verdict"] = np.full(len(normals), VERDICT_CODES[result.verdict.word], np.uint8)
    known["normal"] = normals.astype(np.float32)
    return known


def _predicted(normals: NDArray, regime: Regime | None) -> tuple[NDArray, NDArray]:
    """Return predicted rake, degrees, and slip tendency on each triangle."""
    if regime is None:
        nothing = np.full(len(normals), np.nan)
        return nothing, nothing
    tensor = reduced_tensor(regime.axes, regime.shape_ratio.value if regime.shape_ratio else OPEN_RATIO)
    return rakes_deg(normals, resolved_slip(tensor, normals)), slip_tendency(tensor, normals)


def _misfit_deg(rake: NDArray, result: FaultResult) -> NDArray:
    """Return the angle from the declared slip to the predicted one, degrees [0, 180]; NaN where nothing was declared."""
    if result.sector is None:
        return np.full(len(rake), np.nan)
    return np.abs((rake - result.sector.rake_deg + 180.0) % 360.0 - 180.0)
