"""Chromium from the system, driven by Playwright, and a model to show."""

from __future__ import annotations

import io
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import pytest
from PIL import Image

from structviz.analysis import Analysis, Settings, run
from structviz.synthetic import random_model
from tests.conftest import skip_or_fail
from tests.report.conftest import with_hostile_names

SOFTWARE_GL = ("--use-gl=angle", "--use-angle=swiftshader", "--enable-unsafe-swiftshader")
NO_GL = ("--disable-gpu", "--disable-webgl", "--disable-3d-apis", "--disable-software-rasterizer")


@contextmanager
def started(*choices: str) -> Iterator[Any]:
    program = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
    try:
        from playwright.sync_api import sync_playwright
    except ImportError:
        skip_or_fail("Playwright is not installed (pip install playwright)")
    if program is None:
        skip_or_fail("Chromium is not installed (apt-get install chromium)")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=program, args=["--no-sandbox", *choices])
        try:
            yield browser
        finally:
            browser.close()


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    with started(*SOFTWARE_GL) as browser:
        yield browser


@pytest.fixture(scope="session")
def browser_without_webgl(browser: Any) -> Iterator[Any]:
    other = browser.browser_type.launch(executable_path=shutil.which("chromium"), args=["--no-sandbox", *NO_GL])
    yield other
    other.close()


@pytest.fixture(scope="session")
def analysis() -> Analysis:
    known = random_model("normal", faults=24, conjugate=18, planted=4, triangles=80, random_state=4)
    return run(with_hostile_names(known.model), Settings(replicates=60, stations=8))


@pytest.fixture(scope="session")
def pictures() -> dict[str, bytes]:
    held = io.BytesIO()
    Image.new("RGB", (1400, 980), "#7b98a8").save(held, "PNG")
    return {"scene.png": held.getvalue(), "net.png": held.getvalue()}
