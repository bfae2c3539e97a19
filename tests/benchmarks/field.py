"""How far is the azimuth of a turning stress off where there is data, and how often is a uniform one said to turn?

    python tests/benchmarks/field.py [--models 12] [--seed 0] [--jobs 1]

Models of 60 to 100 faults (`structviz.synthetic.turning_model`), two thirds of them broken anew with a scatter of 6 deg, under a
stress whose azimuth turns by 60 deg from west to east, and as many under one that does not turn. The error is that of the azimuth
of the greatest horizontal compression at the places of the faults that are supported, and over all such places of all models.
"""

from __future__ import annotations

import argparse
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.kinematics.declared import usable_sector
from structviz.stress.classify import shmax_deg
from structviz.stress.evidence import EvidenceModel, FaultEvidence, gather
from structviz.stress.field import choose_bandwidth, local_data, stress_field
from structviz.stress.joint import Terms, infer
from structviz.stress.replicates import bootstrap_counts
from structviz.surfaces.measure import measure
from structviz.synthetic.turning import KnownTurning, turning_model

REGIMES = ("normal", "strike-slip", "reverse")


def evidence_of(known: KnownTurning) -> FaultEvidence:
    """Return what the mean planes and labels of a model say."""
    measured = [measure(fault.surface) for fault in known.model.faults]
    sectors = [usable_sector(f.declared, f.down_side, m.normal, m.dip_deg)[0] for f, m in zip(known.model.faults, measured, strict=True)]
    count = len(measured)
    return gather([m.normal[None] for m in measured], [np.ones(1)] * count, sectors, np.ones(count), np.ones(count, bool))


def outcome(case: tuple[int, float]) -> tuple[float, bool, list[float], float, float]:
    """Return the gain, whether a field was found, azimuth errors, the share of places supported and the seconds it took."""
    state, turn = case
    known = turning_model(turn, 60 + 20 * (state % 3), regime=REGIMES[state // 3 % 3], random_state=700_000 + state)
    evidence = evidence_of(known)
    single = infer(evidence, EvidenceModel(), Terms(), bootstrap_counts(len(evidence), 50, 0))
    start = time.perf_counter()
    data = local_data(evidence, known.places, single.frame, single.odds)
    chosen = choose_bandwidth(data)
    field = stress_field(data, known.places, chosen.radius_m)
    seconds = time.perf_counter() - start
    off = np.abs((field.shmax_deg - shmax_deg(known.axes_at(known.places), 0.5) + 90) % 180 - 90)[field.supported]
    return chosen.gain, bool(np.isfinite(chosen.radius_m)), off.tolist(), float(field.supported.mean()), seconds


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=12)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--jobs", type=int, default=1)
    chosen = parser.parse_args()
    print("turn  said to turn %   azimuth off 50%  95%  within 8 deg %   supported %  gain, nats: least  median  most   seconds")
    with ProcessPoolExecutor(chosen.jobs) as pool:
        for turn in (60.0, 0.0):
            rows = list(pool.map(outcome, [(state, turn) for state in range(chosen.seed, chosen.seed + chosen.models)]))
            off = np.concatenate([row[2] for row in rows])
            gains = np.array([row[0] for row in rows])
            high = np.quantile(off, 0.95)
            within = 100 * np.mean(off <= 8.0)
            print(
                f"{turn:4.0f}  {100 * np.mean([row[1] for row in rows]):14.1f}   {np.median(off):15.1f} {high:4.1f}  {within:14.1f}"
                f"   {100 * np.mean([row[3] for row in rows]):11.0f}  {gains.min():17.1f} {np.median(gains):7.1f} {gains.max():5.1f}"
                f"   {np.median([row[4] for row in rows]):7.2f}",
                flush=True,
            )


if __name__ == "__main__":
    main()
