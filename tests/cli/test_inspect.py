"""`structviz inspect`: what files hold, and the table of faults it proposes."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest

from structviz.cli.main import entry
from structviz.io import read_model, write_surface
from structviz.io.formats.obj import write as obj_of
from structviz.surfaces.surface import Surface
from structviz.synthetic import random_model

from .conftest import Run


@pytest.fixture
def three_in_one(tmp_path: Path) -> Path:
    """Return an OBJ file with three named surfaces in a folder of its own; the third has a hole."""
    known = random_model("normal", faults=3, conjugate=3, planted=0, triangles=200, random_state=1)
    folder, text, first = tmp_path / "from partner", "", 0
    folder.mkdir()
    for number, fault in enumerate(known.model.faults):
        keep = np.arange(len(fault.surface.triangles)) != len(fault.surface.triangles) // 2 if number == 2 else slice(None)
        moved = Surface(fault.name, fault.surface.vertices, fault.surface.triangles[keep] + first)
        text += obj_of(moved, {}).decode()
        first += len(fault.surface.vertices)
    (folder / "all.obj").write_text(text, encoding="utf-8")
    return folder / "all.obj"


def test_every_surface_is_listed_with_plane_and_condition(structviz: Run, three_in_one: Path) -> None:
    done = structviz("inspect", three_in_one)
    assert done.returncode == 0, done.stderr
    assert "3 faults" in done.stdout
    for fault in read_model(three_in_one).faults:
        assert fault.name in done.stdout
    assert done.stdout.count("sound") == 2
    assert "1 hole" in done.stdout
    assert f"structviz inspect {three_in_one} --table faults.csv" in done.stdout  # in one line, to be copied
    assert done.stderr == ""


def test_the_proposed_table_is_read_by_check(structviz: Run, three_in_one: Path, tmp_path: Path) -> None:
    table = tmp_path / "faults.csv"
    done = structviz("inspect", three_in_one, "--table", table)
    assert done.returncode == 0, done.stderr
    rows = list(csv.DictReader(table.read_text(encoding="utf-8").splitlines()))
    assert [row["surface"] for row in rows] == [f"from partner/all.obj#{row['name']}" for row in rows]
    assert {row["sense"] for row in rows} == {""}
    table.write_text(table.read_text(encoding="utf-8").replace(",,,,", ",normal,,,", 1), encoding="utf-8")
    model = read_model(table)
    assert [fault.declared.text if fault.declared else "" for fault in model.faults] == ["normal", "", ""]
    original = read_model(three_in_one)
    assert all(np.array_equal(a.surface.vertices, b.surface.vertices) for a, b in zip(model.faults, original.faults))


def test_what_is_declared_already_is_kept_in_the_table(structviz: Run, wrong: Path, tmp_path: Path) -> None:
    done = structviz("inspect", wrong, "--table", wrong.parent / "again.csv")
    assert done.returncode == 0, done.stderr
    before, after = read_model(wrong), read_model(wrong.parent / "again.csv")
    assert [(f.name, f.declared, f.down_side) for f in before.faults] == [(f.name, f.declared, f.down_side) for f in after.faults]


def test_a_table_that_exists_is_never_overwritten(tmp_path: Path, three_in_one: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = tmp_path / "faults.csv"
    table.write_text("mine", encoding="utf-8")
    assert entry(["inspect", str(three_in_one), "--table", str(table)]) == 2
    assert "exists already; wanted a new file" in capsys.readouterr().err
    assert table.read_text(encoding="utf-8") == "mine"


@pytest.mark.parametrize(
    ("name", "said"), [("faults.txt", "wanted a name that ends in .csv"), ("from partner/below/f.csv", "would lie beside the surfaces")]
)
def test_a_table_in_the_wrong_place_is_refused(
    name: str, said: str, tmp_path: Path, three_in_one: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "from partner" / "below").mkdir()
    assert entry(["inspect", str(three_in_one), "--table", str(tmp_path / name)]) == 2
    assert said in capsys.readouterr().err
    assert not (tmp_path / name).exists()


def test_json_names_the_bad_triangles_and_is_the_same_every_time(three_in_one: Path, capsysbinary: pytest.CaptureFixture[bytes]) -> None:
    surface = read_model(three_in_one).faults[0].surface
    doubled = Surface("doubled", surface.vertices, np.concatenate([surface.triangles, surface.triangles[7:8]]))
    write_surface(three_in_one.parent / "doubled.vtp", doubled)
    printed = []
    for _ in range(2):
        assert entry(["inspect", str(three_in_one.parent / "doubled.vtp"), "--json"]) == 0
        printed.append(capsysbinary.readouterr().out)
    assert printed[0] == printed[1]
    (held,) = json.loads(printed[0])["surfaces"]
    assert held["condition"]["repeated"] == [len(surface.triangles)]
    assert held["condition"]["text"].startswith("1 repeated") or "1 repeated" in held["condition"]["text"]
    assert held["along_strike_m"] > held["down_dip_m"] > 0


def test_size_is_measured_along_strike_and_down_dip(tmp_path: Path, capsysbinary: pytest.CaptureFixture[bytes]) -> None:
    """A plane of 3000 by 1000 m, striking 030 and dipping 60 to the east-south-east, says so."""
    strike, dip = np.radians(30), np.radians(60)
    along = np.array([np.sin(strike), np.cos(strike), 0])
    down = np.array([np.cos(strike) * np.cos(dip), -np.sin(strike) * np.cos(dip), -np.sin(dip)])
    corners = np.array([0 * along, 3000 * along, 3000 * along + 1000 * down, 1000 * down]) + [5e5, 4e6, 0]
    write_surface(tmp_path / "plane.ply", Surface("plane", corners, np.array([[0, 1, 2], [0, 2, 3]])))
    assert entry(["inspect", str(tmp_path / "plane.ply"), "--json"]) == 0
    (held,) = json.loads(capsysbinary.readouterr().out)["surfaces"]
    assert (held["along_strike_m"], held["down_dip_m"]) == (3000.0, 1000.0)
    assert (held["strike_deg"], held["dip_deg"]) == (30.0, 60.0)
