"""structviz: could the faults of this model have moved as it says, under one stress?

Names are loaded when first used, so that `import structviz` costs next to nothing.

>>> import structviz
>>> structviz.Settings().friction_angle_deg
30.0
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib import import_module
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

from structviz._version import __version__
from structviz.errors import (
    ArgumentError,
    FormatError,
    InputError,
    OutputError,
    RenderingUnavailable,
    StructvizError,
    SurfaceError,
    TableError,
)

if TYPE_CHECKING:
    from structviz.analysis import Analysis, FaultResult, Settings, run
    from structviz.io import read_model, write_surface
    from structviz.kinematics.senses import Sector, sector_of_rake, sector_of_words
    from structviz.model import Fault, FaultModel, Finding, Horizon, Mechanism, Stria, WellAzimuth
    from structviz.report.html import page_text
    from structviz.report.notebook import show
    from structviz.report.results_json import results_text
    from structviz.report.tables import data_frame, fault_table, pair_table
    from structviz.report.write import Written, write_outputs
    from structviz.scenarios import Sensitivity, sensitivity
    from structviz.stress.by_place import ByPlace
    from structviz.stress.compare import Comparison
    from structviz.stress.field import StressField, stress_field
    from structviz.stress.regime import Reading, Regime
    from structviz.stress.verdict import Cause, Verdict
    from structviz.surfaces.surface import Surface

__all__ = [
    "Analysis",
    "ArgumentError",
    "ByPlace",
    "Cause",
    "Comparison",
    "Fault",
    "FaultModel",
    "FaultResult",
    "Finding",
    "FormatError",
    "Horizon",
    "InputError",
    "Mechanism",
    "OutputError",
    "Reading",
    "Regime",
    "RenderingUnavailable",
    "Sector",
    "Sensitivity",
    "Settings",
    "StressField",
    "Stria",
    "StructvizError",
    "Surface",
    "SurfaceError",
    "TableError",
    "Verdict",
    "WellAzimuth",
    "Written",
    "__version__",
    "check",
    "data_frame",
    "fault_table",
    "page_text",
    "pair_table",
    "read_model",
    "results_text",
    "run",
    "sector_of_rake",
    "sector_of_words",
    "sensitivity",
    "show",
    "stress_field",
    "write_outputs",
    "write_surface",
]

_HOME = {
    "Analysis": "analysis",
    "FaultResult": "analysis",
    "Settings": "analysis",
    "run": "analysis",
    "read_model": "io",
    "write_surface": "io",
    "Sector": "kinematics.senses",
    "sector_of_rake": "kinematics.senses",
    "sector_of_words": "kinematics.senses",
    "Fault": "model",
    "FaultModel": "model",
    "Finding": "model",
    "Horizon": "model",
    "Mechanism": "model",
    "Stria": "model",
    "WellAzimuth": "model",
    "page_text": "report.html",
    "show": "report.notebook",
    "results_text": "report.results_json",
    "data_frame": "report.tables",
    "fault_table": "report.tables",
    "pair_table": "report.tables",
    "Written": "report.write",
    "write_outputs": "report.write",
    "Sensitivity": "scenarios",
    "sensitivity": "scenarios",
    "ByPlace": "stress.by_place",
    "Comparison": "stress.compare",
    "StressField": "stress.field",
    "stress_field": "stress.field",
    "Reading": "stress.regime",
    "Regime": "stress.regime",
    "Cause": "stress.verdict",
    "Verdict": "stress.verdict",
    "Surface": "surfaces.surface",
}


def check(
    model: str | PathLike[str] | FaultModel,
    settings: Settings | None = None,
    *,
    limits: Mapping[str, float] | None = None,
    progress: Callable[[str, int, int], None] | None = None,
) -> Analysis:
    """Return the analysis of a model, or of the model file, faults table, mesh file or folder at a path.

    Raises InputError where the path cannot be used and ArgumentError for settings or limits out of range.
    """
    from structviz.analysis import run
    from structviz.io import read_model
    from structviz.model import FaultModel

    whole = model if isinstance(model, FaultModel) else read_model(Path(model))
    return run(whole, settings, limits=limits, progress=progress)


def __getattr__(name: str) -> Any:
    """Return a public name from the module that holds it, loaded now."""
    if name not in _HOME:
        raise AttributeError(f"module 'structviz' has no attribute {name!r}")
    value = globals()[name] = getattr(import_module(f"structviz.{_HOME[name]}"), name)
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
