"""One small model with planted labels and names nobody would wish for, analysed once."""

from __future__ import annotations

from dataclasses import replace

import pytest

from structviz.analysis import Analysis, Settings, run
from structviz.model import Fault, FaultModel, InputFile
from structviz.synthetic import random_model
from structviz.synthetic.models import Known

HOSTILE = (
    "<script>alert(1)</script>",
    "../../outside",
    "[red]marked[/red]",
    "bell\x07\x1b[31mred\x1b]0;title\x07",
    "n" * 500,
    "=cmd|' /C calc'!A0",
    "new\nline",
    "right-to-left \u202etluaf",
    "con",
    "Ærø 断层",
)
QUICK = Settings(replicates=60, stations=8)


@pytest.fixture(scope="session")
def known() -> Known:
    return random_model("normal", faults=16, conjugate=12, planted=3, triangles=80, random_state=4)


@pytest.fixture(scope="session")
def model(known: Known) -> FaultModel:
    """Return the model with hostile names on its first faults and no declaration on the last."""
    return with_hostile_names(known.model)


def with_hostile_names(model: FaultModel) -> FaultModel:
    """Return a model with hostile names on its first faults and no declaration on the last."""
    faults = list(model.faults)
    faults = [replace(fault, name=name) for name, fault in zip([*HOSTILE, *(f.name for f in faults[len(HOSTILE) :])], faults)]
    faults[-1] = Fault(faults[-1].name, faults[-1].surface)
    return FaultModel("[bold]hostile\x1b[0m", tuple(faults), crs="EPSG:25831", inputs=(InputFile("a.vtp", "0" * 64),))


@pytest.fixture(scope="session")
def analysis(model: FaultModel) -> Analysis:
    return run(model, QUICK)


@pytest.fixture(scope="session")
def no_stress(known: Known) -> Analysis:
    """Return the analysis of two faults that declare nothing and lie parallel: no stress follows from them."""
    fault = known.model.faults[0]
    moved = replace(fault.surface, vertices=fault.surface.vertices + [0.0, 9000.0, 0.0])
    return run(FaultModel("two", (Fault("a", fault.surface), Fault("b", moved))), QUICK)
