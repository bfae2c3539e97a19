"""The 3D view in a real browser: what is clicked is picked, places are right, and every control changes the picture."""

from __future__ import annotations

import io
import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from PIL import Image

from structviz.analysis import Analysis
from structviz.report.html import page_text
from structviz.report.names import printable
from structviz.report.page_data import viewer_script
from tests.browser.chromium import Visit, visiting
from tests.conftest import skip_or_fail

WIDE = {"width": 1440, "height": 900}


@pytest.fixture(scope="module")
def page_file(analysis: Analysis, tmp_path_factory: pytest.TempPathFactory) -> Path:
    if viewer_script() is None:
        skip_or_fail("the 3D view was not bundled when structviz was installed (see the warning of pip install)")
    file = tmp_path_factory.mktemp("view") / "report.html"
    file.write_text(page_text(analysis, pictures={}), encoding="utf-8", errors="backslashreplace")
    return file


@pytest.fixture
def visit(browser: Any, page_file: Path) -> Iterator[Visit]:
    with visiting(browser, page_file, viewport=WIDE) as visit:
        ready(visit)
        yield visit


def ready(visit: Visit) -> None:
    """Wait until faults can be picked. The page allows no evaluation of strings, so the mark is asked for again and again."""
    for _ in range(200):
        if visit.page.evaluate("() => performance.getEntriesByName('structviz:pickable').length"):
            return settle(visit)
        visit.page.wait_for_timeout(50)
    pytest.fail(f"the 3D view did not start: {visit.complaints} {visit.page.locator('#why-no-scene').inner_text()}")


def settle(visit: Visit) -> None:
    visit.page.evaluate(
        "() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(() => requestAnimationFrame(done))))"
    )


def picture(visit: Visit) -> NDArray[np.int64]:
    settle(visit)
    return np.asarray(Image.open(io.BytesIO(visit.page.locator("#scene canvas").screenshot())).convert("RGB")).astype(np.int64)


def changed(before: NDArray, after: NDArray) -> NDArray[np.bool_]:
    return np.abs(before - after).sum(2) > 24


def show(visit: Visit, faults: list[int], shown: bool) -> None:
    detail = json.dumps({"faults": faults, "shown": shown})
    visit.page.evaluate(f"() => document.dispatchEvent(new CustomEvent('structviz:show', {{detail: {detail}}}))")


def bare(visit: Visit, analysis: Analysis) -> None:
    """Hide every fault, every layer and the names."""
    visit.page.evaluate("() => { document.querySelector('.sv-names').style.visibility = 'hidden'; }")
    visit.page.evaluate("() => document.querySelectorAll('.sv-check input:checked').forEach((box) => box.click())")
    show(visit, list(range(len(analysis.faults))), False)


def alone(visit: Visit, fault: int) -> NDArray[np.bool_]:
    """Return the pixels of one fault where all else is hidden, and leave it hidden."""
    empty = picture(visit)
    show(visit, [fault], True)
    pixels = changed(empty, picture(visit))
    show(visit, [fault], False)
    return pixels


def inside(pixels: NDArray[np.bool_]) -> tuple[int, int]:
    """Return a pixel (x, y) well inside those marked."""
    from scipy.ndimage import distance_transform_edt

    y, x = np.unravel_index(distance_transform_edt(pixels).argmax(), pixels.shape)
    return int(x), int(y)


def picks(visit: Visit) -> None:
    visit.page.evaluate("() => { window.told = []; document.addEventListener('structviz:pick', (e) => window.told.push(e.detail)); }")


def click(visit: Visit, x: int, y: int) -> None:
    visit.page.locator("#scene canvas").click(position={"x": x, "y": y})


def test_it_starts_without_a_request_or_a_complaint(visit: Visit) -> None:
    assert (visit.requests, visit.complaints) == ([], [])
    assert (picture(visit).std(axis=(0, 1)) > 5).all()


def test_a_click_picks_the_fault_that_is_drawn_there(visit: Visit, analysis: Analysis) -> None:
    bare(visit, analysis)
    picks(visit)
    for fault in (0, 7, 19):
        x, y = inside(alone(visit, fault))
        show(visit, [fault], True)
        click(visit, x, y)
        assert visit.page.evaluate("() => window.told.at(-1)") == {"fault": fault, "from": "scene"}
        assert visit.page.locator("button.fault[aria-current]").get_attribute("data-fault") == str(fault)
        visit.page.locator("#scene canvas").press("Escape")
        assert visit.page.evaluate("() => window.told.at(-1).fault") is None
        show(visit, [fault], False)
        visit.page.locator("#scene select").nth(1).dispatch_event("change")  # the whole model again


def test_faults_lie_where_their_coordinates_say(visit: Visit, analysis: Analysis) -> None:
    visit.page.locator("#scene select").nth(1).select_option("map")
    bare(visit, analysis)
    empty = picture(visit)
    visit.page.evaluate("() => [...document.querySelectorAll('.sv-check input')].at(-1).click()")  # the frame
    frame = changed(empty, picture(visit))
    visit.page.evaluate("() => [...document.querySelectorAll('.sv-check input')].at(-1).click()")
    everything = np.concatenate([result.fault.surface.vertices for result in analysis.faults])
    low, high = everything.min(0), everything.max(0)
    box = extent(frame)
    for fault in (0, 5, 11):
        vertices = analysis.faults[fault].fault.surface.vertices
        west, east = np.interp([vertices[:, 0].min(), vertices[:, 0].max()], [low[0], high[0]], box[:2])
        north, south = np.interp([-vertices[:, 1].max(), -vertices[:, 1].min()], [-high[1], -low[1]], box[2:])
        assert np.abs(np.array(extent(alone(visit, fault))) - [west, east, north, south]).max() < 4


def extent(pixels: NDArray[np.bool_]) -> tuple[int, int, int, int]:
    y, x = np.nonzero(pixels)
    return int(x.min()), int(x.max()), int(y.min()), int(y.max())


def test_a_hidden_fault_cannot_be_picked(visit: Visit, analysis: Analysis) -> None:
    bare(visit, analysis)
    x, y = inside(alone(visit, 3))
    picks(visit)
    click(visit, x, y)
    assert visit.page.evaluate("() => window.told.at(-1).fault") is None


def test_a_pick_in_the_list_brings_the_camera_and_an_outline(visit: Visit) -> None:
    before = picture(visit)
    visit.page.locator("button.fault").first.click()
    after = picture(visit)
    assert changed(before, after).mean() > 0.1
    visit.page.locator("button.fault").first.click()  # lets go: the camera stays, the outline goes
    gone = changed(after, picture(visit)).sum()
    assert 20 < gone < 0.1 * after[..., 0].size


@pytest.mark.parametrize("view", ["map", "south", "west", "strike"])
def test_named_views_differ(visit: Visit, view: str) -> None:
    before = picture(visit)
    visit.page.locator("#scene select").nth(1).select_option(view)
    assert changed(before, picture(visit)).mean() > 0.03


def test_section_and_exaggeration_change_the_picture(visit: Visit) -> None:
    whole = picture(visit)
    visit.page.evaluate("() => document.querySelector('.sv-more').setAttribute('open', '')")
    visit.page.locator("#scene select").nth(2).select_option("0")
    told = visit.page.locator(".sv-inside output").first.inner_text()
    visit.page.evaluate("() => document.querySelector('.sv-more').removeAttribute('open')")
    cut = picture(visit)
    assert told.endswith(" m")
    assert changed(whole, cut).mean() > 0.01
    assert (np.abs(cut - cut[2, 2]).sum(2) > 24).sum() < (np.abs(whole - whole[2, 2]).sum(2) > 24).sum()
    slider = visit.page.locator("#scene input[type=range]").nth(1)
    slider.evaluate("(input) => { input.value = 3; input.dispatchEvent(new Event('input')); }")
    assert changed(cut, picture(visit)).mean() > 0.01


def test_every_field_has_its_colours_and_its_bar(visit: Visit) -> None:
    seen = [picture(visit)]
    fields = visit.page.locator("#scene select").first.locator("option").all()
    assert len(fields) >= 5
    for option in fields[1:]:
        visit.page.locator("#scene select").first.select_option(option.get_attribute("value"))
        assert visit.page.locator(".sv-legend .sv-ends span").count() == 3
        seen.append(picture(visit))
        assert all(changed(seen[-1], other).sum() > 300 for other in seen[:-1])


def test_the_value_under_the_cursor_is_told(visit: Visit, analysis: Analysis) -> None:
    bare(visit, analysis)
    x, y = inside(alone(visit, 5))
    show(visit, [5], True)
    visit.page.locator("#scene canvas").hover(position={"x": x, "y": y})
    settle(visit)
    words = visit.page.locator(".sv-where").inner_text()
    numbers = [
        float(text.replace("\u2009", ""))
        for text in words.replace("−", "-").replace("E ", "|").replace("N ", "|").replace("up ", "|").replace(" m", "").split("|")[-3:]
    ]
    vertices = analysis.faults[5].fault.surface.vertices
    assert (np.array(numbers) >= vertices.min(0) - 1).all()
    assert (np.array(numbers) <= vertices.max(0) + 1).all()
    assert "Dip" in visit.page.locator("#local").inner_text()


def test_keys_turn_and_zoom(visit: Visit) -> None:
    visit.page.locator("#scene canvas").focus()
    for key in ("ArrowLeft", "ArrowUp", "+"):
        before = picture(visit)
        visit.page.keyboard.press(key)
        assert changed(before, picture(visit)).mean() > 0.01


def test_names_of_users_stay_text(visit: Visit, analysis: Analysis) -> None:
    hostile = next(k for k, result in enumerate(analysis.faults) if "<script" in result.fault.name)
    visit.page.evaluate(f"() => document.dispatchEvent(new CustomEvent('structviz:pick', {{detail: {{fault: {hostile}, from: 'list'}}}}))")
    settle(visit)
    label = visit.page.locator(".sv-names .picked")
    assert label.evaluate("(element) => element.children.length") == 0
    assert "<" in label.inner_text()
    assert printable(analysis.faults[hostile].fault.name)[:6] == label.inner_text()[:6]
    assert visit.complaints == []


def test_the_picture_is_saved(visit: Visit, tmp_path: Path) -> None:
    with visit.page.expect_download() as download:
        visit.page.get_by_role("button", name="Save picture").click()
    download.value.save_as(tmp_path / "saved.png")
    image = np.asarray(Image.open(tmp_path / "saved.png").convert("RGB"))
    assert image.shape[0] > 300
    assert (image.std(axis=(0, 1)) > 5).all()


def test_without_webgl_the_view_says_so(browser_without_webgl: Any, page_file: Path) -> None:
    with visiting(browser_without_webgl, page_file, viewport=WIDE) as visit:
        visit.page.wait_for_timeout(600)
        assert "WebGL" in visit.page.locator("#why-no-scene").inner_text()
        assert "no-webgl" in (visit.page.locator("#scene").get_attribute("class") or "")
        assert visit.page.locator("#scene canvas").count() == 0


def test_touch_picks(browser: Any, page_file: Path, analysis: Analysis) -> None:
    with visiting(browser, page_file, viewport={"width": 390, "height": 844}, has_touch=True) as visit:
        ready(visit)
        bare(visit, analysis)
        x, y = inside(alone(visit, 2))
        show(visit, [2], True)
        visit.page.locator("#scene canvas").tap(position={"x": x, "y": y})
        assert visit.page.locator("button.fault[aria-current]").get_attribute("data-fault") == "2"
