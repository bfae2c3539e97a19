"""The 3D view in a real browser: what is clicked is picked, places are right, and every control changes the picture."""

from __future__ import annotations

import base64
import io
import json
import re
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

WIDE = {"width": 1120, "height": 700}  # as wide as the page of a desk needs; every pixel is drawn by the processor


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
    """Wait until the view has nothing left to do. The page allows no evaluation of strings, so the mark is asked for again and again."""
    for _ in range(600):
        if visit.page.evaluate("() => performance.getEntriesByName('structviz:settled').length"):
            return settle(visit)
        visit.page.wait_for_timeout(50)
    pytest.fail(f"the 3D view did not start: {visit.complaints} {visit.page.locator('#why-no-scene').inner_text()}")


def settle(visit: Visit) -> None:
    visit.page.evaluate(
        "() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(() => requestAnimationFrame(done))))"
    )


PICTURE = """() => {
  const view = document.querySelector("#scene canvas");
  const copy = Object.assign(document.createElement("canvas"), { width: view.width, height: view.height });
  const pen = copy.getContext("2d");
  pen.fillStyle = getComputedStyle(document.querySelector(".view")).backgroundColor;
  pen.fillRect(0, 0, copy.width, copy.height);
  pen.drawImage(view, 0, 0);
  return copy.toDataURL().split(",")[1];
}"""


def picture(visit: Visit) -> NDArray[np.int64]:
    """Return what is drawn, (H, W, 3), read from the canvas itself: a screen may lag behind on a busy machine."""
    settle(visit)
    return np.asarray(Image.open(io.BytesIO(base64.b64decode(visit.page.evaluate(PICTURE)))).convert("RGB")).astype(np.int64)


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
    visit.page.locator("#scene canvas").click(position={"x": x + 0.5, "y": y + 0.5})


def test_it_starts_without_a_request_or_a_complaint(visit: Visit) -> None:
    assert (visit.requests, visit.complaints) == ([], [])
    assert (picture(visit).std(axis=(0, 1)) > 5).all()


def marked_in_plots(visit: Visit) -> set[str]:
    """Return the rows of the faults that stand out in the net and in the other plots."""
    told = "() => [...document.querySelectorAll('.plot .fault.picked')].map((each) => each.dataset.fault)"
    others = "document.querySelectorAll('.plot svg:has(.picked) .fault:not(.picked)')"
    dimmed = f"() => [...{others}].every((each) => getComputedStyle(each).opacity < 0.5)"
    assert visit.page.evaluate(dimmed)
    return set(visit.page.evaluate(told))


def test_a_click_in_the_net_is_followed_by_the_model(visit: Visit) -> None:
    before = picture(visit)
    line = visit.page.locator(".plot.net .fault .wide").first
    fault = line.evaluate("(path) => path.closest('[data-fault]').dataset.fault")
    middle = line.evaluate(
        "(path) => { const p = path.getPointAtLength(0.3 * path.getTotalLength()).matrixTransform(path.getScreenCTM());"
        " return [p.x, p.y]; }"
    )
    top = "([x, y]) => document.elementFromPoint(x, y).closest('[data-fault]')?.dataset.fault"
    fault = visit.page.evaluate(top, middle) or fault  # where planes cross, the one on top is meant
    visit.page.mouse.click(*middle)
    assert visit.page.locator("button.fault[aria-current]").get_attribute("data-fault") == fault
    assert marked_in_plots(visit) == {fault}
    assert changed(before, picture(visit)).mean() > 0.1


def test_a_click_picks_the_fault_that_is_drawn_there(visit: Visit, analysis: Analysis) -> None:
    bare(visit, analysis)
    picks(visit)
    for fault in (0, 7, 19):
        x, y = inside(alone(visit, fault))
        show(visit, [fault], True)
        click(visit, x, y)
        assert visit.page.evaluate("() => window.told.at(-1)") == {"fault": fault, "from": "scene"}
        assert visit.page.locator("button.fault[aria-current]").get_attribute("data-fault") == str(fault)
        assert marked_in_plots(visit) == {str(fault)}
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


def test_a_chosen_fault_shows_its_declared_and_predicted_slip(visit: Visit, analysis: Analysis) -> None:
    fault = next(k for k, result in enumerate(analysis.faults) if result.verdict.word == "conflicting")
    bare(visit, analysis)
    empty = picture(visit)
    show(visit, [fault], True)
    before = changed(empty, picture(visit))
    visit.page.evaluate("() => { document.querySelector('.sv-names').style.visibility = ''; }")
    visit.page.locator(f"button.fault[data-fault='{fault}']").click()
    settle(visit)
    said = visit.page.locator(".sv-names .slip:not([hidden])").all_inner_texts()
    declared = analysis.faults[fault].fault.declared
    assert declared is not None
    assert f"declared {declared.text}" in said
    assert any(text.startswith("predicted ") for text in said)
    assert before.sum() > 100
    visit.page.keyboard.press("Escape")
    settle(visit)
    assert visit.page.locator(".sv-names .slip:not([hidden])").count() == 0


def test_a_fault_behind_others_shines_through_once_it_is_chosen(visit: Visit, analysis: Analysis) -> None:
    """Every fault, chosen, changes the picture where it lies, whatever stands before it."""
    visit.page.evaluate("() => { document.querySelector('.sv-names').style.visibility = 'hidden'; }")
    for fault in (1, 6, 12):
        visit.page.evaluate(f"() => document.dispatchEvent(new CustomEvent('structviz:pick', {{detail: {{fault: {fault}}}}}))")
        chosen = picture(visit)
        visit.page.evaluate("() => document.dispatchEvent(new CustomEvent('structviz:pick', {detail: {fault: null}}))")
        assert changed(chosen, picture(visit)).sum() > 150


def test_named_views_differ(visit: Visit) -> None:
    seen = [picture(visit)]
    for view in ("map", "south", "west", "strike"):
        visit.page.locator("#scene select").nth(1).select_option(view)
        seen.append(picture(visit))
        assert all(changed(seen[-1], other).mean() > 0.02 for other in seen[:-1])


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
    assert len(fields) == 7
    for option in fields[1:]:
        visit.page.locator("#scene select").first.select_option(option.get_attribute("value"))
        assert visit.page.locator(".sv-legend .sv-ends span").count() == 3
        assert re.search(r"°|m$|of the greatest|open", visit.page.locator(".sv-legend").inner_text(), re.M)
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


def saved(visit: Visit, place: Path) -> NDArray[np.int64]:
    with visit.page.expect_download() as download:
        visit.page.get_by_role("button", name="Save picture").click()
    download.value.save_as(place)
    return np.asarray(Image.open(place).convert("RGB")).astype(np.int64)


def inked(part: NDArray[np.int64]) -> float:
    return float((np.abs(part - part[0, 0]).sum(2) > 60).mean())


def test_the_saved_picture_says_what_it_shows(visit: Visit, tmp_path: Path) -> None:
    visit.page.locator("#scene select").first.select_option("dip_deg")
    image = saved(visit, tmp_path / "saved.png")
    box = visit.page.locator("#scene canvas").bounding_box()
    assert box is not None
    sharp = image.shape[1] / box["width"]
    head, tail = image[: int(48 * sharp)], image[-int(26 * sharp) :]
    legend, foot = (
        image[int(56 * sharp) : int(112 * sharp), : int(200 * sharp)],
        image[-int(82 * sharp) : -int(36 * sharp), : int(200 * sharp)],
    )
    assert sharp >= 2
    assert image.shape[0] > sharp * box["height"] + 60
    for part, least in ((head, 0.01), (tail, 0.01), (legend, 0.1), (foot, 0.005)):
        assert inked(part) > least


def test_the_saved_picture_has_the_names(visit: Visit, tmp_path: Path) -> None:
    shown = saved(visit, tmp_path / "with.png")
    visit.page.evaluate("() => document.querySelectorAll('.group[data-word=conflicting] .hide').forEach((button) => button.click())")
    visit.page.evaluate("() => document.querySelectorAll('.sv-check input:checked').forEach((box) => box.click())")
    hidden = saved(visit, tmp_path / "without.png")
    assert shown.shape == hidden.shape
    assert (np.abs(shown - hidden).sum(2) > 60).sum() > 2000


def test_the_theme_recolours_the_view_at_once(visit: Visit) -> None:
    lightness = [picture(visit).mean()]
    labels = "() => getComputedStyle(document.querySelector('.sv-names bdi:not([hidden])')).color"
    ink = [visit.page.evaluate(labels)]
    for name in ("Dark", "Light"):
        visit.page.get_by_role("button", name=name, exact=True).click()
        lightness.append(picture(visit).mean())
        ink.append(visit.page.evaluate(labels))
    assert lightness[1] < 0.6 * lightness[0]
    assert abs(lightness[2] - lightness[0]) < 0.5
    assert ink[0] == ink[2] != ink[1]


def test_the_view_follows_the_theme_of_the_system(visit: Visit, analysis: Analysis) -> None:
    bare(visit, analysis)
    visit.page.evaluate("() => [...document.querySelectorAll('.sv-check input')].at(-1).click()")  # the frame: lines alone
    light = picture(visit)
    visit.page.emulate_media(color_scheme="dark")
    dark = picture(visit)
    line = changed(light, np.broadcast_to(light[2, 2], light.shape))
    assert dark[2, 2].sum() < 200 < light[2, 2].sum()
    assert dark[line].sum(1).mean() > dark[2, 2].sum() + 60  # lines are lighter than the dark behind them


def test_every_layer_of_glyphs_is_switched_by_itself(visit: Visit) -> None:
    visit.page.evaluate("() => document.querySelectorAll('.sv-check input:checked').forEach((box) => box.click())")
    empty = picture(visit)
    seen = []
    for key in ("whole", "pairs", "stations", "field"):
        toggle = f"() => document.querySelector('.sv-check [data-layer={key}]').click()"
        visit.page.evaluate(toggle)
        assert "σ1" in visit.page.locator(".sv-legend").inner_text()
        seen.append(picture(visit))
        visit.page.evaluate(toggle)
        assert changed(seen[-1], empty).sum() > 200
    assert all(changed(one, other).sum() > 200 for k, one in enumerate(seen) for other in seen[:k])
    assert "σ1" not in visit.page.locator(".sv-legend").inner_text()


def test_the_frame_tells_real_coordinates(visit: Visit, analysis: Analysis) -> None:
    everything = np.concatenate([result.fault.surface.vertices for result in analysis.faults])
    words = " ".join(visit.page.locator(".sv-names .coordinate:not([hidden])").all_inner_texts()).replace("\u2009", "")
    for letter, column in (("E", 0), ("N", 1)):
        told = [int(value) for value in re.findall(rf"{letter} (\d+)", words)]
        assert told
        ends = (everything[:, column].min(), everything[:, column].max())
        assert all(min(abs(value - end) for end in ends) <= 1 for value in told)


def test_without_webgl_the_view_says_so(browser_without_webgl: Any, page_file: Path) -> None:
    with visiting(browser_without_webgl, page_file, viewport=WIDE) as visit:
        visit.page.locator("#scene.no-webgl").wait_for(state="attached")
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
