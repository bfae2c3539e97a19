"""How time and memory of the inference grow with faults and replicates.

    python tests/benchmarks/growth.py [--most 3000]

First 10,000 bootstrap replicates on 50 faults, then one analysis each of 10, 30, 100, ... faults of few triangles. Times in one run
compare with each other; the last column is the time per fault against that of the row before.
"""

from __future__ import annotations

import argparse
import resource
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import Settings, run
from structviz.synthetic import random_model


def timed(faults: int, replicates: int) -> tuple[float, int]:
    """Return the seconds of one analysis and how many pairs it heard."""
    # The box grows with the model, so that each fault keeps as many neighbours as before: models get larger, not denser.
    model = random_model(
        "normal",
        faults=faults,
        conjugate=faults * 2 // 3,
        planted=faults // 10,
        triangles=100,
        box_m=15_000.0 * (faults / 24) ** 0.5,
        random_state=1,
    ).model
    start = time.perf_counter()
    analysis = run(model, Settings(replicates=replicates))
    return time.perf_counter() - start, len(analysis.pairs)


def main() -> None:
    """Print both tables."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--most", type=int, default=3000, help="faults of the largest model")
    chosen = parser.parse_args()
    seconds, _ = timed(50, 10_000)
    print(f"10,000 replicates on 50 faults: {seconds:.2f} s, at most {peak_mb():.0f} MB")
    before = None
    print("faults   pairs   seconds   ms a fault   against the row before")
    for faults in (n for n in (10, 30, 100, 300, 1000, 3000) if n <= chosen.most):
        seconds, pairs = timed(faults, 500)
        each = seconds / faults
        ratio = each / before if before else 1.0
        print(f"{faults:6d}  {pairs:6d}  {seconds:8.2f}  {1000 * each:11.2f}   {ratio:6.2f}   (peak so far {peak_mb():.0f} MB)")
        before = each


def peak_mb() -> float:
    """Return the largest memory of this process so far, MB."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1000


if __name__ == "__main__":
    main()
