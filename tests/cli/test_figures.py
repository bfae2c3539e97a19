"""`structviz figures` as users meet it: what is written is listed, what cannot be is refused before any work."""

from __future__ import annotations

from pathlib import Path

import pytest

from .conftest import Run

QUICK = ("--replicates", "60", "--stations", "8")


def test_figures_are_written_and_listed(structviz: Run, wrong: Path, tmp_path: Path) -> None:
    out = tmp_path / "figures"
    done = structviz("figures", wrong, "--out", out, "--formats", "svg,pdf", "--only", "net,rose", "--width-mm", "85", *QUICK)
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    names = {"figures.json", "figures.txt", "net.pdf", "net.svg", "rose.pdf", "rose.svg"}
    assert {path.name for path in out.iterdir()} == names
    assert all(name in done.stdout for name in names)


@pytest.mark.parametrize(
    "options, said",
    [
        (("--only", "nets"), "only: found 'nets'; wanted some of scene, net, mohr, plunges, rose, misfits"),
        (("--formats", "tiff"), "formats: found 'tiff'; wanted some of png, svg, pdf"),
        (("--viewpoints", "above"), "viewpoints: found 'above'; wanted some of best, map"),
        (("--width-mm", "wide"), "--width-mm: found 'wide'; wanted a number"),
        (("--width-mm", "20"), "width_mm: found 20; wanted 60 to 420 mm"),
        (("--dpi", "10"), "dpi: found 10; wanted 72 to 1200"),
    ],
)
def test_choices_that_cannot_be_end_at_once(
    options: tuple[str, str], said: str, wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    from structviz.cli.main import entry

    assert entry(["figures", str(wrong), "--out", str(tmp_path / "f"), *options]) == 2
    assert said in capsys.readouterr().err
    assert not (tmp_path / "f").exists()


def test_the_folder_must_be_named(wrong: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from structviz.cli.main import entry

    assert entry(["figures", str(wrong)]) == 2
    assert "--out is missing" in capsys.readouterr().err
