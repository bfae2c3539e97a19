"""Are the cones as wide as they say, and the conflict probabilities as sure?

    python tests/benchmarks/calibration.py [--models 300] [--seed 0] [--jobs 1]

Synthetic models of known stress (`structviz.synthetic.random_model`), 12 to 36 faults, a third of them inherited, 0 to 30 % of the labels
wrong, in the three regimes in turn. Prints how often the 95 % cone of each axis covers the truth, and two reliability tables of the
conflict probability, the probability that a fault slipped outside the declared sector by what the other faults say:

- by sectors drawn at random for every fault: half the planted truth lies near their edges, so every band is filled, and the
  share of faults whose true slip is outside should be the probability given. This tests the probabilities.
- by the labels of the model: true ones hold the slip 45 degrees from their edges or more, so most probabilities are near 0 or 1.

The tables are the same for the same options on every run.
"""

from __future__ import annotations

import argparse
import itertools
import sys
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import FaultResult, Settings, run
from structviz.kinematics.senses import Sector
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.answer import Answer, judge_in_phases
from structviz.stress.verdict import VerdictLimits
from structviz.synthetic import Known, random_model

REGIMES = ("normal", "strike-slip", "reverse")
BANDS = (0.0, 0.01, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.99, 1.0)


Told = list[tuple[float, bool]]  # probability that the slip is outside a sector, and whether it was


def outcome(state: int) -> tuple[list[bool], list[float], Told, Told]:
    """Return whether each cone covers, how far each axis is off, and probability and truth of every label and of random sectors."""
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
    if not analysis.regimes or analysis.answer is None:
        return [], [], pairs, []
    drawn = [random_sector(analysis.answer, number, result, known, rng) for number, result in enumerate(analysis.faults)]
    regime = analysis.regimes[0]
    off = axial_angle_deg(regime.axes, known.axes)
    return (off <= np.array(regime.cones_deg)).tolist(), off.tolist(), pairs, drawn


def random_sector(found: Answer, number: int, result: FaultResult, known: Known, rng: np.random.Generator) -> tuple[float, bool]:
    """Return the probability that one fault slips outside a half-space drawn at random, and whether it did."""
    sector = Sector(float(rng.uniform(-180.0, 180.0)), 90.0)
    normals = result.stations.normals
    shares = np.full(len(normals), 1 / len(normals))
    verdict, _ = judge_in_phases(found, number, normals, shares, sector, "", VerdictLimits(least_shear=0.0))
    outside = abs((known.true_rakes_deg[number] - sector.rake_deg + 180.0) % 360.0 - 180.0) > 90.0
    return verdict.conflict_probability or 0.0, bool(outside)


def main() -> None:
    """Print both tables."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=300)
    parser.add_argument("--seed", type=int, default=5000)
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
    print_reliability("random sectors", [pair for row in rows for pair in row[3]])
    print_reliability("labels", [pair for row in rows for pair in row[2]])


def print_reliability(title: str, told: Told) -> None:
    """Print the share of slips outside in each band of the probability that they are."""
    pairs = np.array(told, float)
    print(f"{title}: probability   faults   outside %   mean probability %")
    for low, high in itertools.pairwise(BANDS):
        inside = (pairs[:, 0] >= low) & ((pairs[:, 0] < high) | (high == 1.0))
        if inside.any():
            mean, outside = 100 * pairs[inside].mean(0)
            print(f"  {low:4.2f} to {high:4.2f}           {inside.sum():9d}   {outside:9.1f}   {mean:18.1f}")


if __name__ == "__main__":
    main()
