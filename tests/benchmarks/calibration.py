"""Are the cones as wide as they say, and the conflict probabilities as sure?

    python tests/benchmarks/calibration.py [--models 300] [--seed 0] [--jobs 1]

Synthetic models of known stress (`structviz.synthetic.random_model`), 12 to 36 faults, a third of them inherited, 0 to 30 % of the labels
wrong, in the three regimes in turn. Prints how often the 95 % cone of each axis covers the truth, and of the faults given a conflict
probability in each band the share whose label is wrong. The tables are the same for the same options on every run.
"""

from __future__ import annotations

import argparse
import itertools
import sys
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import Settings, run
from structviz.orientation.vectors import axial_angle_deg
from structviz.synthetic import random_model

REGIMES = ("normal", "strike-slip", "reverse")
BANDS = (0.0, 0.01, 0.05, 0.2, 0.5, 0.8, 0.9, 0.99, 1.0)


def outcome(state: int) -> tuple[list[bool], list[float], list[tuple[float, bool]]]:
    """Return whether each cone covers, how far each axis is off, and probability and truth of every fault."""
    rng = np.random.default_rng([state, 17])
    faults = int(rng.integers(12, 37))
    wrong = int(rng.integers(0, faults * 3 // 10 + 1))
    known = random_model(REGIMES[state % 3], faults=faults, conjugate=faults * 2 // 3, planted=wrong, random_state=10_000 + state)
    analysis = run(known.model, Settings(replicates=300))
    pairs = [
        (result.verdict.conflict_probability, result.fault.name in known.flipped)
        for result in analysis.faults
        if result.verdict.conflict_probability is not None
    ]
    if not analysis.regimes:
        return [], [], pairs
    regime = analysis.regimes[0]
    off = axial_angle_deg(regime.axes, known.axes)
    return (off <= np.array(regime.cones_deg)).tolist(), off.tolist(), pairs


def main() -> None:
    """Print both tables."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=300)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--jobs", type=int, default=1)
    chosen = parser.parse_args()
    states = range(chosen.seed, chosen.seed + chosen.models)
    with ProcessPoolExecutor(chosen.jobs) as pool:
        rows = list(pool.map(outcome, states, chunksize=4))
    covered = np.array([row[0] for row in rows if row[0]])
    off = np.array([row[1] for row in rows if row[1]])
    print(f"{len(rows)} models, {len(rows) - len(covered)} without a regime")
    for axis in range(3):
        median, high = np.median(off[:, axis]), np.quantile(off[:, axis], 0.95)
        share = 100 * covered[:, axis].mean()
        print(f"  sigma{axis + 1}: the 95 % cone covers the truth in {share:.1f} %; off by {median:.1f} deg median, {high:.1f} deg 95th")
    pairs = np.array([pair for row in rows for pair in row[2]], float)
    print("conflict probability     faults   label wrong %   mean probability %")
    for low, high in itertools.pairwise(BANDS):
        inside = (pairs[:, 0] >= low) & ((pairs[:, 0] < high) | (high == 1.0))
        if inside.any():
            mean, wrong = 100 * pairs[inside].mean(0)
            print(f"  {low:4.2f} to {high:4.2f}      {inside.sum():9d}   {wrong:13.1f}   {mean:18.1f}")


if __name__ == "__main__":
    main()
