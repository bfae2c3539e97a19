"""Three pictures of the page as it was found good, small and tolerant: the first screen, a phone, the first printed page.

The references are PNG of the size compared, made by `python -m tests.browser.test_screens` after a change of looks that was meant,
and looked at. Letters differ from machine to machine, so that pictures are compared a block at a time, and by a mean.
"""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from PIL import Image

from structviz.analysis import Analysis, Settings, run
from structviz.model import FaultModel
from structviz.report.html import page_text
from structviz.report.page_data import viewer_script
from structviz.synthetic import random_model
from tests.browser.chromium import Visit, visiting
from tests.browser.conftest import SOFTWARE_GL, started
from tests.conftest import skip_or_fail

PLACE = Path(__file__).with_name("screens")
BLOCK = 8  # pixels of a small picture that are compared as one
MOST_OFF, MEAN_OFF = 90.0, 6.0  # of 255: a block, and all of them


def model() -> FaultModel:
    return random_model("normal", faults=24, conjugate=18, planted=4, triangles=120, random_state=4).model


def analysed() -> Analysis:
    return run(model(), Settings(replicates=60, stations=8))


def drawn(visit: Visit) -> None:
    """Wait until the view has nothing left to do and its letters are there."""
    for _ in range(1200):
        if visit.page.evaluate("() => performance.getEntriesByName('structviz:settled').length"):
            break
        visit.page.wait_for_timeout(50)
    visit.page.evaluate(
        "() => document.fonts.ready.then(() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done))))"
    )


def screen(browser: Any, file: Path) -> bytes:
    with visiting(browser, file, viewport={"width": 1440, "height": 900}) as visit:
        drawn(visit)
        return bytes(visit.page.screenshot())


def phone(browser: Any, file: Path) -> bytes:
    with visiting(browser, file, viewport={"width": 390, "height": 844}, has_touch=True, is_mobile=True) as visit:
        drawn(visit)
        return bytes(visit.page.screenshot())


def printed(browser: Any, file: Path) -> bytes:
    """Return the first page as it is laid out on A4 within its margins, at 96 dots an inch."""
    with visiting(browser, file, viewport={"width": 673, "height": 990}) as visit:
        drawn(visit)
        visit.page.emulate_media(media="print")
        return bytes(visit.page.screenshot())


SCREENS: dict[str, tuple[Callable[[Any, Path], bytes], int]] = {"screen": (screen, 480), "phone": (phone, 195), "printed": (printed, 269)}


def small(png: bytes, width: int) -> Image.Image:
    image = Image.open(io.BytesIO(png)).convert("RGB")
    return image.resize((width, round(image.height * width / image.width)), Image.Resampling.BOX)


def blocks(image: Image.Image) -> NDArray[np.float64]:
    held = image.resize((image.width // BLOCK, image.height // BLOCK), Image.Resampling.BOX)
    return np.asarray(held, np.float64)


@pytest.fixture(scope="module")
def page_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    if viewer_script() is None:
        skip_or_fail("the 3D view was not bundled when structviz was installed (see the warning of pip install)")
    file = tmp_path_factory.mktemp("screens") / "report.html"
    file.write_text(page_text(analysed(), pictures={"scene.png": stand_in()}), encoding="utf-8")
    return file


def stand_in() -> bytes:
    held = io.BytesIO()
    Image.new("RGB", (1400, 980), "#7b98a8").save(held, "PNG")
    return held.getvalue()


@pytest.mark.parametrize("name", SCREENS)
def test_it_looks_as_it_was_found_good(browser: Any, page_file: Path, name: str, tmp_path: Path) -> None:
    take, width = SCREENS[name]
    seen, wanted = small(take(browser, page_file), width), Image.open(PLACE / f"{name}.png").convert("RGB")
    seen.save(tmp_path / f"{name}.png")
    assert abs(seen.height - wanted.height) <= 1
    off = np.abs(blocks(seen.resize(wanted.size)) - blocks(wanted))
    assert off.mean() < MEAN_OFF, f"compare {tmp_path / name}.png with {PLACE / name}.png"
    assert off.mean(2).max() < MOST_OFF, f"compare {tmp_path / name}.png with {PLACE / name}.png"


def test_references_are_small() -> None:
    assert all(file.stat().st_size < 40_000 for file in PLACE.glob("*.png"))
    assert {file.stem for file in PLACE.glob("*.png")} == set(SCREENS)


if __name__ == "__main__":
    import tempfile

    PLACE.mkdir(exist_ok=True)
    with tempfile.TemporaryDirectory() as held, started(*SOFTWARE_GL) as chosen:
        made = Path(held) / "report.html"
        made.write_text(page_text(analysed(), pictures={"scene.png": stand_in()}), encoding="utf-8")
        for key, (shot, wide) in SCREENS.items():
            small(shot(chosen, made), wide).quantize(96).save(PLACE / f"{key}.png", optimize=True)
