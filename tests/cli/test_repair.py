"""`structviz repair`: new files and a log, the input left alone, and the same verdicts afterwards."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from structviz.analysis import Settings
from structviz.analysis import run as analyse
from structviz.cli.main import entry
from structviz.io import read_model, write_surface
from structviz.surfaces.surface import Surface

from .conftest import Run


@pytest.fixture
def worn(wrong: Path, tmp_path: Path) -> Path:
    """Return a model whose first two surfaces have defects: triangles repeated, turned and collapsed, vertices doubled."""
    folder = tmp_path / "worn"
    folder.mkdir()
    for path in wrong.iterdir():
        (folder / path.name).write_bytes(path.read_bytes())
    for name in ("F01", "F02"):
        surface = read_model(folder / f"{name}.vtp").faults[0].surface
        triangles = surface.triangles.copy()
        triangles[3] = triangles[3, ::-1]
        triangles = np.concatenate([triangles, triangles[5:7], [[0, 0, 1]]])
        split = surface.vertices[triangles].reshape(-1, 3)
        write_surface(folder / f"{name}.vtp", Surface(name, split, np.arange(len(split)).reshape(-1, 3)))
    return folder


def test_defects_are_mended_into_new_files_and_logged(structviz: Run, worn: Path, tmp_path: Path) -> None:
    before = {path.name: path.read_bytes() for path in worn.iterdir()}
    done = structviz("repair", worn, "--out", tmp_path / "mended")
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(f"2 of 14 surfaces changed; written to {tmp_path / 'mended'}, every change in repair_log.csv\n")
    assert "F01: 2 triangles that repeat another dropped" in done.stdout
    assert {path.name: path.read_bytes() for path in worn.iterdir()} == before
    rows = list(csv.DictReader((tmp_path / "mended" / "repair_log.csv").read_text(encoding="utf-8").splitlines()))
    assert [row["change"] for row in rows if row["surface"] == "F01"] == ["welded", "collapsed", "repeated", "turned"]
    assert all(row["easting_m"] and row["rows"] for row in rows)


def test_the_mended_model_is_sound_and_judged_alike(worn: Path, wrong: Path, tmp_path: Path) -> None:
    assert entry(["repair", str(worn), "--out", str(tmp_path / "mended"), "--to", "ply"]) == 0
    settings = Settings(replicates=100)
    mended, plain = analyse(read_model(tmp_path / "mended"), settings), analyse(read_model(wrong), settings)
    assert [(r.fault.name, r.verdict.word) for r in mended.faults] == [(r.fault.name, r.verdict.word) for r in plain.faults]
    assert not {"duplicate-vertices", "repeated-triangles", "winding", "zero-area"} & {f.check for f in mended.findings}
    assert np.allclose(mended.regimes[0].axes, plain.regimes[0].axes, atol=1e-6)


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--weld-m", "near"), "--weld-m: found 'near'; wanted a number"),
        (("--weld-m", "-1"), "weld_m"),
        (("--drop-parts", "80"), "least_part"),
        (("--to", "docx"), "found 'docx'; wanted one of"),
    ],
)
def test_wrong_choices_are_exit_2(
    options: tuple[str, ...], said: str, wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert entry(["repair", str(wrong), "--out", str(tmp_path / "x"), *options]) == 2
    assert said in capsys.readouterr().err
    assert not (tmp_path / "x").exists()
