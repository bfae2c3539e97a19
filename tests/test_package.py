"""The package from Python: one call from a path or a model to an analysis."""

from __future__ import annotations

from pathlib import Path

import pytest

import structviz
from structviz.synthetic import random_model

QUICK = structviz.Settings(replicates=60, stations=8)


def test_check_takes_a_model_or_a_path(tmp_path: Path) -> None:
    model = random_model("reverse", faults=8, conjugate=6, planted=1, triangles=60, random_state=2).model
    rows = ["name,surface,sense,down_side"]
    for fault in model.faults:
        structviz.write_surface(tmp_path / f"{fault.name}.vtp", fault.surface)
        rows.append(f"{fault.name},{fault.name}.vtp,{fault.declared.text if fault.declared else ''},{fault.down_side}")
    (tmp_path / "faults.csv").write_text("\n".join(rows), encoding="utf-8")
    given, read = structviz.check(model, QUICK), structviz.check(str(tmp_path), QUICK)
    assert structviz.fault_table(given)["misfit_deg"] == pytest.approx(structviz.fault_table(read)["misfit_deg"], nan_ok=True)
    assert structviz.fault_table(given)["verdict"].tolist() == structviz.fault_table(read)["verdict"].tolist()


def test_limits_and_progress_are_handed_on() -> None:
    model = random_model("normal", faults=6, conjugate=6, planted=0, triangles=60, random_state=2).model
    told: list[str] = []
    analysis = structviz.check(model, QUICK, limits={"gentle-normal": 90.0}, progress=lambda text, done, total: told.append(text))
    assert "gentle-normal" in {finding.check for finding in analysis.findings}
    assert "measuring surfaces" in told


def test_unknown_names_are_refused_as_usual() -> None:
    with pytest.raises(AttributeError, match="module 'structviz' has no attribute 'plot'"):
        _ = structviz.plot  # type: ignore[attr-defined]
    assert set(structviz.__all__) <= set(dir(structviz))
