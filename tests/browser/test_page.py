"""The page in a real browser: opened from disk with the network off, used with the mouse and the keys, printed."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from structviz.analysis import Analysis
from structviz.report.html import page_text
from structviz.report.names import printable
from tests.browser.chromium import Visit, visiting

WIDE, PHONE = {"width": 1440, "height": 900}, {"width": 390, "height": 844}


@pytest.fixture(scope="session")
def page_file(analysis: Analysis, pictures: dict[str, bytes], tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("page") / "report.html"
    file.write_text(page_text(analysis, pictures=pictures), encoding="utf-8", errors="backslashreplace", newline="\n")
    return file


@pytest.fixture
def visit(browser: Any, page_file: Path) -> Iterator[Visit]:
    with visiting(browser, page_file, viewport=WIDE) as visit:
        yield visit


def row(visit: Visit, fault: int) -> Any:
    return visit.page.locator(f'button.fault[data-fault="{fault}"]')


def worst(analysis: Analysis) -> int:
    return next(k for k, result in enumerate(analysis.faults) if result.verdict.word == "conflicting")


def still(visit: Visit, what: str) -> dict[str, float]:
    """Return the box of an element once it has stopped moving."""
    before = None
    for _ in range(200):
        box = visit.page.locator(what).bounding_box()
        if box and box == before:
            return dict(box)
        before = box
        visit.page.wait_for_timeout(60)
    raise AssertionError(f"{what} does not come to rest")


def test_it_opens_without_a_request_or_a_complaint(visit: Visit) -> None:
    visit.page.wait_for_load_state("networkidle")
    assert visit.requests == []
    assert visit.complaints == []


def test_the_first_screen_answers(visit: Visit, analysis: Analysis) -> None:
    for what in ("h1", ".said strong", ".axes", ".view"):
        box = visit.page.locator(what).first.bounding_box()
        assert box is not None
        assert box["y"] + box["height"] <= WIDE["height"]
        assert box["x"] + box["width"] <= WIDE["width"]
    box = row(visit, worst(analysis)).bounding_box()
    assert box is not None
    assert box["y"] + box["height"] <= WIDE["height"]


def test_a_click_in_the_list_fills_the_record(visit: Visit, analysis: Analysis) -> None:
    fault = worst(analysis)
    row(visit, fault).click()
    said = visit.page.locator("#record").inner_text()
    result = analysis.faults[fault]
    assert printable(result.fault.name) in said
    assert result.fault.declared is not None
    assert result.fault.declared.text in said
    assert "Next:" in said
    assert row(visit, fault).get_attribute("aria-current") == "true"
    row(visit, fault).click()
    assert "Choose a fault" in visit.page.locator("#record").inner_text()


def test_a_pick_elsewhere_marks_list_record_and_plots(visit: Visit, analysis: Analysis) -> None:
    fault = len(analysis.faults) - 1
    visit.page.evaluate("fault => document.dispatchEvent(new CustomEvent('structviz:pick', {detail: {fault, from: 'scene'}}))", fault)
    assert "picked" in (row(visit, fault).get_attribute("class") or "")
    marked = visit.page.evaluate("fault => document.querySelectorAll(`.plot [data-fault='${fault}'].picked`).length", fault)
    there = visit.page.evaluate("fault => document.querySelectorAll(`.plot [data-fault='${fault}']`).length", fault)
    assert marked == there
    assert printable(analysis.faults[fault].fault.name) in visit.page.locator("#record").inner_text()


def test_the_value_under_the_cursor_is_told(visit: Visit) -> None:
    hover = "detail => document.dispatchEvent(new CustomEvent('structviz:hover', {detail}))"
    visit.page.evaluate(hover, {"fault": 0, "triangle": 7, "values": {"dip": 61.234, "of": "<b>"}})
    assert visit.page.locator("#local").inner_text() == "Under the cursor: dip 61.23, of <b>"
    assert "hovered" in (row(visit, 0).get_attribute("class") or "")
    visit.page.evaluate(hover, {"fault": None, "triangle": None, "values": None})
    assert visit.page.locator("#local").inner_text() == ""
    assert visit.page.locator(".hovered").count() == 0


def test_the_list_is_walked_with_the_keys(visit: Visit) -> None:
    visit.page.locator("#search").focus()
    visit.page.keyboard.press("ArrowDown")
    for _ in range(2):
        visit.page.keyboard.press("ArrowDown")
    visit.page.keyboard.press("Enter")
    order = visit.page.evaluate("[...document.querySelectorAll('button.fault')].map(each => each.getAttribute('aria-current'))")
    assert order.index("true") == 2
    stops = visit.page.evaluate("[...document.querySelectorAll('button.fault')].filter(each => each.tabIndex === 0).length")
    assert stops == 1
    visit.page.keyboard.press("Escape")
    assert visit.page.locator("button.fault[aria-current]").count() == 0


def test_search_leaves_what_matches(visit: Visit, analysis: Analysis) -> None:
    shown = "[...document.querySelectorAll('button.fault')].filter(each => each.offsetParent).map(each => Number(each.dataset.fault))"
    visit.page.locator("#search").fill("CONFLICTING")
    wanted = {k for k, result in enumerate(analysis.faults) if result.verdict.word == "conflicting"}
    assert set(visit.page.evaluate(shown)) == wanted
    visit.page.locator("#search").fill("no such fault")
    assert visit.page.evaluate(shown) == []
    assert visit.page.locator("#none-found").is_visible()
    visit.page.locator("#search").fill("")
    assert len(visit.page.evaluate(shown)) == len(analysis.faults)


def test_hiding_is_told_to_the_model(visit: Visit, analysis: Analysis) -> None:
    visit.page.evaluate("document.documentElement.classList.add('with-scene')")
    visit.page.evaluate("document.addEventListener('structviz:show', event => (window.told = event.detail))")
    visit.page.locator(".group[data-word='conflicting'] .hide").click()
    told = visit.page.evaluate("window.told")
    assert told["shown"] is False
    assert {analysis.faults[k].verdict.word for k in told["faults"]} == {"conflicting"}
    assert visit.page.locator(".group[data-word='conflicting'] .hide").get_attribute("aria-pressed") == "true"
    fault = worst(analysis)
    eye = row(visit, fault).locator("xpath=following-sibling::button")
    eye.click()
    assert visit.page.evaluate("window.told") == {"faults": [fault], "shown": True}
    assert eye.get_attribute("aria-pressed") == "false"
    assert visit.page.locator(".group[data-word='conflicting'] .hide").inner_text() == "hide"


def test_hostile_names_stay_text(visit: Visit, analysis: Analysis) -> None:
    for fault, result in enumerate(analysis.faults):
        assert row(visit, fault).locator(".name").text_content() == printable(result.fault.name)
        row(visit, fault).click()
        assert printable(result.fault.name) in (visit.page.locator("#record h3").text_content() or "")
    assert visit.page.evaluate("document.querySelectorAll('#fault-list script, #record script, #argument script').length") == 0
    assert visit.page.evaluate("document.documentElement.scrollWidth") <= WIDE["width"]
    assert visit.complaints == []


def test_a_card_is_copied_as_text(visit: Visit, analysis: Analysis) -> None:
    visit.page.context.grant_permissions(["clipboard-read", "clipboard-write"])
    fault = worst(analysis)
    card = visit.page.locator(f"#argument #fault-{fault}")
    card.locator(".copy").click()
    card.get_by_text("Copied", exact=True).wait_for()
    held = visit.page.evaluate("navigator.clipboard.readText()")
    assert held.startswith(printable(analysis.faults[fault].fault.name))
    assert "Declared:" in held


def test_on_a_phone_nothing_is_wider_than_the_screen(browser: Any, page_file: Path, analysis: Analysis) -> None:
    with visiting(browser, page_file, viewport=PHONE, has_touch=True, is_mobile=True) as visit:
        assert visit.page.evaluate("document.documentElement.scrollWidth") <= PHONE["width"]
        row(visit, worst(analysis)).tap()
        box = still(visit, "#record")
        assert 0 <= box["y"] < PHONE["height"] / 2
        assert visit.complaints == []


def test_without_webgl_the_argument_is_whole(page_file: Path, browser_without_webgl: Any, analysis: Analysis) -> None:
    with visiting(browser_without_webgl, page_file, viewport=WIDE) as visit:
        visit.page.locator("#why-no-scene:not(:empty)").wait_for()
        assert visit.page.locator(".instead img").first.is_visible()
        assert visit.page.locator("#why-no-scene").inner_text().endswith("everything else is complete.")
        row(visit, worst(analysis)).click()
        assert "Next:" in visit.page.locator("#record").inner_text()
        assert visit.page.locator("#argument .card").count() >= len(analysis.conflicting)
        assert visit.complaints == []


def test_without_scripts_the_argument_is_whole(browser: Any, page_file: Path, analysis: Analysis) -> None:
    with visiting(browser, page_file, viewport=WIDE, java_script_enabled=False) as visit:
        assert visit.page.locator(".instead img").first.is_visible()
        assert visit.page.locator("#argument .card").count() >= len(analysis.conflicting)
        assert not visit.page.locator("#search").is_visible()


def test_it_prints_on_a4_with_whole_cards(visit: Visit, analysis: Analysis) -> None:
    pdf = visit.page.pdf(prefer_css_page_size=True, print_background=True)
    pages = len(re.findall(rb"/Type\s*/Page\b", pdf))
    assert 3 <= pages <= 14
    sizes = {tuple(round(float(v)) for v in box.split()[2:]) for box in re.findall(rb"/MediaBox\s*\[([^\]]*)\]", pdf)}
    assert sizes == {(595, 842)}
    visit.page.emulate_media(media="print")
    styles = visit.page.evaluate("[...document.querySelectorAll('#argument .card')].map(each => getComputedStyle(each).breakInside)")
    assert set(styles) == {"avoid"}
    for hidden in ("#scene", "#search", "#record", ".copy", ".hide"):
        assert not visit.page.locator(hidden).first.is_visible()
    assert visit.page.locator(".instead img").first.is_visible()


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_both_schemes_are_drawn(browser: Any, page_file: Path, scheme: str) -> None:
    with visiting(browser, page_file, viewport=WIDE, color_scheme=scheme) as visit:
        ground = visit.page.evaluate("getComputedStyle(document.documentElement).backgroundColor")
        assert (sum(map(int, re.findall(r"\d+", ground)[:3])) > 380) == (scheme == "light")
