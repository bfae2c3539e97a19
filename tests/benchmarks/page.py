"""How large is the page of a large model, how soon is its first picture there, and how long does a pick take?

    python tests/benchmarks/page.py [--faults 200] [--triangles 500 5000] [--drawn N] [--rounds 3] [--picks 60]

Analyses synthetic models of `--faults` faults with about so many triangles each, writes their pages, and opens each in headless
Chromium with the network off, 1440 by 900, drawn by the processor. Told are: seconds to make the page, its size, milliseconds from
the start of loading to the first picture (least of the rounds) with the steps before it, and milliseconds of a click from the mouse
to the record (median and worst, the first of them while nothing is prepared). The load of the machine stands first: a busy one
makes every time longer.
"""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
import time
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import Settings, run
from structviz.report import page_data
from structviz.report.html import page_text
from structviz.synthetic import large_model
from tests.browser.chromium import visiting
from tests.browser.conftest import SOFTWARE_GL, started

MARKS = ("parsed", "inflated", "unpacked", "first-picture", "settled")
CLICK = """([x, y]) => {
  const canvas = document.querySelector("#scene canvas");
  const box = canvas.getBoundingClientRect();
  const at = { clientX: box.left + x * box.width, clientY: box.top + y * box.height, bubbles: true };
  canvas.dispatchEvent(new PointerEvent("pointerdown", at));
  const start = performance.now();
  canvas.dispatchEvent(new MouseEvent("click", at));
  const took = performance.now() - start;
  const picked = document.querySelector("button.fault[aria-current]")?.dataset.fault ?? null;
  document.dispatchEvent(new CustomEvent("structviz:pick", { detail: { fault: null } }));
  return [took, picked];
}"""


def marks(page: Any) -> dict[str, float]:
    """Return when each step was reached, ms from the start of loading; waits until the last is."""
    for _ in range(2400):
        found: dict[str, float] = page.evaluate(
            "() => Object.fromEntries(performance.getEntriesByType('mark').map((m) => [m.name.split(':')[1], m.startTime]))"
        )
        if MARKS[-1] in found:
            return found
        page.wait_for_timeout(50)
    raise SystemExit("the 3D view did not start")


def picks(page: Any, count: int) -> list[float]:
    """Return how long each of some clicks took that met a fault, ms."""
    places = np.random.default_rng(1).uniform(0.25, 0.75, (count, 2)).tolist()
    told = [page.evaluate(CLICK, place) for place in places]
    return [took for took, picked in told if picked is not None]


def measured(browser: Any, file: Path, rounds: int, count: int) -> None:
    """Print the times of one page."""
    seen = []
    for _ in range(rounds):
        with visiting(browser, file, viewport={"width": 1440, "height": 900}) as visit:
            seen.append(marks(visit.page))
    best = min(seen, key=lambda found: found["first-picture"])
    print("   " + ", ".join(f"{name} {best[name]:.0f} ms" for name in MARKS if name in best))
    with visiting(browser, file, viewport={"width": 1440, "height": 900}) as visit:
        while not visit.page.evaluate("() => performance.getEntriesByName('structviz:first-picture').length"):
            visit.page.wait_for_timeout(1)
        cold = picks(visit.page, 5)[:1]
        marks(visit.page)
        warm = picks(visit.page, count)
    told = f"median {np.median(warm):.1f} ms, worst {max(warm):.1f} ms of {len(warm)}" if warm else "met nothing"
    print(f"   pick: {told}; first {cold[0]:.1f} ms" if cold else f"   pick: {told}")


def main() -> None:
    """Print sizes and times."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--faults", type=int, default=200)
    parser.add_argument("--triangles", type=int, nargs="+", default=[500, 5000], help="of each fault")
    parser.add_argument("--drawn", type=int, default=page_data.MOST_TRIANGLES, help="triangles that the page draws at most")
    parser.add_argument("--rounds", type=int, default=3)
    parser.add_argument("--picks", type=int, default=60)
    chosen = parser.parse_args()
    page_data.MOST_TRIANGLES = chosen.drawn
    print(f"load {os.getloadavg()[0]:.1f} on {os.cpu_count()} cores")
    with tempfile.TemporaryDirectory() as held, started(*SOFTWARE_GL) as browser:
        for triangles in chosen.triangles:
            analysis = run(large_model(faults=chosen.faults, triangles_each=triangles, random_state=1).model, Settings(replicates=100))
            start = time.perf_counter()
            text = page_text(analysis, pictures={})
            seconds, file = time.perf_counter() - start, Path(held) / f"{triangles}.html"
            file.write_text(text, encoding="utf-8", errors="backslashreplace")
            total = sum(len(result.measured.areas_m2) for result in analysis.faults)
            print(f"{total:,} triangles: page made in {seconds:.1f} s, {file.stat().st_size / 1e6:.2f} MB")
            measured(browser, file, chosen.rounds, chosen.picks)


if __name__ == "__main__":
    main()
