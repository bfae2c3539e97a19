"""The places that the 3D view and the plots take in the page, with stand-ins of a few lines for both."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from structviz.analysis import Analysis
from structviz.report import html
from structviz.report.html import page_text
from tests.browser.chromium import Visit, visiting

VIEWER = """
const scene = document.querySelector("#scene");
const canvas = scene.querySelector("canvas");
canvas.width = scene.clientWidth; canvas.height = scene.clientHeight;
const gl = canvas.getContext("webgl2");
gl.clearColor(1, 0, 0, 1); gl.clear(gl.COLOR_BUFFER_BIT);
window.title = JSON.parse(document.querySelector("#structviz-data").textContent).title;
window.bytes = atob(document.querySelector("#structviz-arrays").textContent).length;
"""
STAND_INS = {
    "page_data": lambda analysis: ({"title": "</script>"}, bytes(12)),
    "viewer_script": lambda: VIEWER,
    "net_svg": lambda analysis: '<svg viewBox="0 0 10 10"><rect width="10" height="10" data-fault="1"></rect></svg>',
}


@pytest.fixture
def visit(browser: Any, analysis: Analysis, pictures: dict[str, bytes], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Visit]:
    monkeypatch.setattr(html, "_optional", lambda module, name: STAND_INS.get(name))
    (tmp_path / "report.html").write_text(page_text(analysis, pictures=pictures), encoding="utf-8", errors="backslashreplace")
    with visiting(browser, tmp_path / "report.html", viewport={"width": 1440, "height": 900}) as visit:
        yield visit


def test_the_3d_view_has_its_place_and_its_data(visit: Visit) -> None:
    assert visit.page.evaluate("[window.title, window.bytes]") == ["</script>", 12]
    box = visit.page.locator("#scene canvas").bounding_box()
    assert box is not None
    assert box["width"] > 500
    assert box["height"] > 500
    assert not visit.page.locator(".instead").is_visible()
    assert (visit.requests, visit.complaints) == ([], [])


def test_a_view_that_fails_gives_way_to_the_picture(visit: Visit) -> None:
    visit.page.evaluate("document.dispatchEvent(new CustomEvent('structviz:scene-failed', {detail: {why: 'context lost'}}))")
    assert visit.page.locator(".instead img").is_visible()
    assert "context lost" in visit.page.locator("#why-no-scene").inner_text()


def test_a_click_in_a_plot_picks_the_fault(visit: Visit) -> None:
    visit.page.locator(".plot rect").click()
    assert visit.page.locator("button.fault[aria-current]").get_attribute("data-fault") == "1"
    assert "picked" in (visit.page.locator(".plot rect").get_attribute("class") or "")


def test_paper_has_the_picture_and_not_the_view(visit: Visit) -> None:
    visit.page.emulate_media(media="print")
    assert visit.page.locator(".instead img").is_visible()
    assert not visit.page.locator("#scene").is_visible()
