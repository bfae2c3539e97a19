"""A page that is served: it comes again when there is a newer one, keeps what was chosen, and says when the server has gone."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from structviz.analysis import Analysis
from structviz.report.html import live_script, notice_page, page_text
from structviz.report.serve import Shown, server_on


def shown_as(analysis: Analysis, version: str) -> Shown:
    return Shown(version, page_text(analysis, pictures={}, live=live_script(version)).encode("utf-8", "backslashreplace"))


def test_a_newer_page_takes_the_place_of_the_older(browser: Any, analysis: Analysis) -> None:
    renamed = replace(analysis, model=replace(analysis.model, title="second"))
    shown = shown_as(analysis, "v1")
    context = browser.new_context()
    page, asked, complaints = context.new_page(), set(), []
    page.on("request", lambda request: asked.add(request.url))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("console", lambda message: complaints.append(message.text))
    with server_on(0, lambda: shown) as port:
        page.goto(f"http://127.0.0.1:{port}/")
        page.locator("button.fault").nth(3).click()
        chosen = page.locator("#record h3").text_content()
        shown = shown_as(renamed, "v2")
        page.get_by_text("second", exact=True).wait_for(timeout=10_000)
        assert page.locator("#record h3").text_content() == chosen
        shown = Shown("v3", notice_page("This model cannot be used", "broken", live=live_script("v3")).encode())
        page.get_by_text("broken").wait_for(timeout=10_000)
        assert asked == {f"http://127.0.0.1:{port}/", f"http://127.0.0.1:{port}/version"}
        assert complaints == []
    page.get_by_text("The server has stopped").wait_for(timeout=10_000)
    context.close()
