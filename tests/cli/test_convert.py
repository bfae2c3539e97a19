"""`structviz convert`: the same model in another format, and what that format cannot keep."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from structviz.cli.main import entry
from structviz.io import FORMATS, read_model
from structviz.io.format import FLOAT64, NAMES, SHARED_VERTICES
from structviz.model import FaultModel

from .conftest import Run

DEMO = Path("meshes", "model.toml")
SEVERAL = [known for known in FORMATS if known.write_all]


def corners(model: FaultModel) -> list[bytes]:
    return [(fault.surface.vertices[fault.surface.triangles]).tobytes() for fault in model.faults]


def test_a_folder_keeps_movements_horizons_striae_and_every_bit(structviz: Run, project: Path, tmp_path: Path) -> None:
    done = structviz("convert", project / DEMO, "--out", tmp_path / "new", "--to", "ply")
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(f"24 faults and 3 horizons written to {tmp_path / 'new'} as PLY, in metres with up positive\n")
    before, after = read_model(project / DEMO), read_model(tmp_path / "new")
    assert corners(before) == corners(after)
    assert [(f.name, f.declared, f.phase, f.down_side) for f in before.faults] == [
        (f.name, f.declared, f.phase, f.down_side) for f in after.faults
    ]
    assert before.striae == after.striae
    assert [h.name for h in before.horizons] == [h.name for h in after.horizons]
    assert (before.title, before.crs) == (after.title, after.crs)


@pytest.mark.parametrize("known", SEVERAL, ids=lambda known: known.key)
def test_one_file_holds_every_surface_by_name(known, project: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / f"all{known.suffixes[0]}"
    assert entry(["convert", str(project / DEMO), "--out", str(target)]) == 0
    out = capsys.readouterr().out
    assert "declared movements and phases are not in the file" in out
    assert ("triangles no longer share their vertices" in out) == (SHARED_VERTICES in known.cannot_store)
    before, after = read_model(project / DEMO), read_model(target)
    bodies = {each.name: each.surface for each in (*after.faults, *after.horizons)}
    assert len(bodies) == 27
    for each in (*before.faults, *before.horizons):
        if NAMES not in known.cannot_store:
            surface = bodies[each.name]
            off = np.abs(surface.vertices[surface.triangles] - each.surface.vertices[each.surface.triangles]).max()
            assert off <= (0.01 if FLOAT64 in known.cannot_store else 0.0)


def test_names_that_need_quotes_come_back(tmp_path: Path, wrong: Path) -> None:
    (tmp_path / "model.toml").write_text(
        'title = "a \\"b\\" \\\\ c\\n\\u0007"\n[[fault]]\nname = "say \\"x\\", y"\nsurface = "F01.vtp"\n', encoding="utf-8"
    )
    (tmp_path / "F01.vtp").write_bytes((wrong / "F01.vtp").read_bytes())
    assert entry(["convert", str(tmp_path / "model.toml"), "--out", str(tmp_path / "new")]) == 0
    before, after = read_model(tmp_path / "model.toml"), read_model(tmp_path / "new")
    assert after.title == before.title
    assert [fault.name for fault in after.faults] == ['say "x", y']


@pytest.mark.parametrize(
    ("out", "more", "said", "next_step"),
    [
        ("a.ply", (), "PLY holds one surface, and there are 14", "name a folder for one file each"),
        ("a.docx", (), r"found '.docx'; wanted one of ", "structviz formats says what each can hold"),
        ("a", ("--to", "nothing"), "found 'nothing'; wanted one of ", "structviz formats says what each can hold"),
        ("full", (), "found other files (mine.txt); wanted an empty folder", "name another folder"),
        ("there.obj", (), "exists already; wanted a new file", "name another, or remove that one"),
        ("no/such/place.obj", (), "cannot be written (No such file or directory)", "check that the folder exists"),
    ],
)
def test_what_cannot_be_written_is_exit_2(
    out: str, more: tuple[str, ...], said: str, next_step: str, wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "mine.txt").write_text("mine", encoding="utf-8")
    (tmp_path / "there.obj").write_text("mine", encoding="utf-8")
    before = sorted(tmp_path.rglob("*"))
    assert entry(["convert", str(wrong), "--out", str(tmp_path / out), *more]) == 2
    told = capsys.readouterr()
    assert told.out == ""
    assert said in told.err
    assert next_step in told.err
    assert sorted(tmp_path.rglob("*")) == before
    assert (tmp_path / "there.obj").read_text(encoding="utf-8") == "mine"
