"""The folder of figures: whole or not at all, its listing and captions, strangers refused, scenes skipped without OpenGL."""

import json
import re

import pytest

from structviz.analysis import Settings, run
from structviz.errors import OutputError, RenderingUnavailable
from structviz.report.figures import CAPTIONS, LISTING, write_figures
from structviz.report.write import write_outputs
from structviz.synthetic import random_model
from structviz.views import gl
from structviz.views.figures import PrintChoice

FEW = PrintChoice(formats=("svg",), width_mm=85, only=("rose", "misfits"))


@pytest.fixture(scope="module")
def analysis():
    return run(random_model("normal", faults=12, conjugate=9, planted=2, triangles=60, random_state=5).model, Settings(replicates=100))


def test_the_folder_holds_what_its_listing_says(analysis, tmp_path):
    written = write_figures(analysis, tmp_path / "new" / "figures", choice=FEW)
    held = {path.name for path in written.folder.iterdir()}
    assert held == set(written.files) == {LISTING, CAPTIONS, "rose.svg", "misfits.svg"}
    listing = json.loads((written.folder / LISTING).read_text("utf-8"))
    assert set(listing["outputs"]) == held
    assert [f["files"] for f in listing["figures"]] == [["rose.svg"], ["misfits.svg"]]
    text = (written.folder / CAPTIONS).read_text("utf-8")
    for figure in listing["figures"]:
        assert figure["caption"] in text
        assert figure["width_mm"] == 85
        assert f"{figure['files'][0]}  (85 x {figure['height_mm']:g} mm)" in text


def test_earlier_figures_are_replaced_and_strangers_are_not(analysis, tmp_path):
    folder = tmp_path / "figures"
    write_figures(analysis, folder, choice=FEW)
    again = write_figures(analysis, folder, choice=PrintChoice(formats=("pdf",), width_mm=85, only=("rose",)))
    assert {path.name for path in folder.iterdir()} == set(again.files) == {LISTING, CAPTIONS, "rose.pdf"}
    (folder / "thesis.docx").write_text("mine")
    with pytest.raises(OutputError, match=r"found other files \(thesis.docx\).*only earlier figures of structviz"):
        write_figures(analysis, folder, choice=FEW)
    assert {path.name for path in folder.iterdir()} == {*again.files, "thesis.docx"}


def test_figures_and_results_do_not_take_each_others_folders(analysis, tmp_path):
    write_outputs(analysis, tmp_path / "out", pictures=False, page=False)
    with pytest.raises(OutputError, match="only earlier figures of structviz"):
        write_figures(analysis, tmp_path / "out", choice=FEW)
    write_figures(analysis, tmp_path / "figures", choice=FEW)
    with pytest.raises(OutputError, match="only an earlier result of structviz"):
        write_outputs(analysis, tmp_path / "figures", pictures=False, page=False)


def test_a_failure_half_way_leaves_the_earlier_figures(analysis, tmp_path, monkeypatch):
    from structviz.report import figures as module

    folder = tmp_path / "figures"
    before = write_figures(analysis, folder, choice=FEW)
    monkeypatch.setattr(module, "_captions_text", lambda *given: (_ for _ in ()).throw(OSError(28, "No space left on device")))
    with pytest.raises(OutputError, match="No space left on device"):
        write_figures(analysis, folder, choice=FEW)
    assert {path.name for path in folder.iterdir()} == set(before.files)
    assert {path.name for path in tmp_path.iterdir()} == {"figures"}


def test_without_opengl_scenes_are_skipped_and_told_or_refused(analysis, tmp_path, monkeypatch):
    monkeypatch.setattr(gl, "working_window", lambda: None)
    some = PrintChoice(formats=("svg",), width_mm=85, only=("scene", "rose"))
    written = write_figures(analysis, tmp_path / "some", choice=some)
    assert written.files == (LISTING, CAPTIONS, "rose.svg")
    assert len(written.skipped) == 1
    assert re.search("scenes were skipped; install it with: .*libegl1", written.skipped[0])
    with pytest.raises(RenderingUnavailable, match="no figure could be drawn"):
        write_figures(analysis, tmp_path / "none", choice=PrintChoice(formats=("svg",), only=("scene",)))
    assert not (tmp_path / "none").exists()


def test_what_has_nothing_to_show_is_told(tmp_path):
    lone = run(random_model("normal", faults=1, conjugate=1, planted=0, random_state=1).model, Settings(replicates=50))
    written = write_figures(lone, tmp_path / "f", choice=PrintChoice(formats=("svg",), width_mm=85, only=("net", "mohr")))
    assert written.skipped == ("mohr has nothing to show: no stress could be inferred",)
    assert "net.svg" in written.files
