"""Is the number of phases right, are the stresses of each, and is every fault put into its own?

    python tests/benchmarks/phases.py [--models 60] [--seed 0] [--jobs 1]

Synthetic models of one, two and three phases (`structviz.synthetic.random_model`, `phased_model`), two thirds of the faults of each phase
broken anew in it unless the row says otherwise. Two phases are in turn normal with strike-slip, the other way round, and reverse
with strike-slip, 30 to 90 deg apart in greatest horizontal stress, and twice the same regime 50 to 90 deg apart. Every fault is
thought to have a partner; its plane is the measured mean. Prints for each kind of model how often the number is right and how the
others are spread; where it is right, how far the worst axis of each stress is off and how many faults are in their own phase, all of
them and those whose log-likelihoods under their two best phases differ by one or more. The same options print the same table, times apart.
"""

from __future__ import annotations

import argparse
import itertools
import sys
import time
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.kinematics.declared import usable_sector
from structviz.model import FaultModel
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.evidence import EvidenceModel, FaultEvidence, gather
from structviz.stress.phases import find_phases
from structviz.surfaces.measure import measure
from structviz.synthetic import KnownPhases, phased_model, random_model

REGIMES = ("normal", "strike-slip", "reverse")
MIXTURES = (
    (("normal", "strike-slip"), 30.0),
    (("normal", "normal"), 50.0),
    (("strike-slip", "normal"), 30.0),
    (("strike-slip", "strike-slip"), 50.0),
    (("reverse", "strike-slip"), 30.0),
    (("reverse", "reverse"), 50.0),
)


def one(
    state: int, faults: int = 24, planted: int = 4, conjugate: int | None = None, scatter_deg: float = 6.0, fabric_deg: float | None = None
) -> KnownPhases:
    """Return a model of one phase."""
    regime = REGIMES[state % 3]
    fresh = faults * 2 // 3 if conjugate is None else conjugate
    known = random_model(
        regime,
        faults=faults,
        conjugate=fresh,
        planted=planted,
        scatter_deg=scatter_deg,
        fabric_deg=fabric_deg,
        triangles=60,
        random_state=300_000 + state,
    )
    phase_of = np.zeros(faults, np.int64)
    ratio = np.array([known.shape_ratio])
    return KnownPhases(known.model, known.axes[None], ratio, phase_of, known.flipped, known.true_rakes_deg, known.kinds, known.normals)


def two(state: int, faults: tuple[int, int] = (18, 12), planted: tuple[int, int] = (0, 0), conjugate_share: float = 2 / 3) -> KnownPhases:
    """Return a model of two phases."""
    regimes, least = MIXTURES[state % len(MIXTURES)]
    turn = float(np.random.default_rng([state, 23]).uniform(least, 90.0))
    return phased_model(
        regimes,
        (0.0, turn),
        faults=faults,
        planted=planted,
        conjugate_share=conjugate_share,
        triangles=60,
        random_state=400_000 + state,
    )


def inversion(state: int) -> KnownPhases:
    """Return a model in which sigma1 and sigma3 changed places."""
    return phased_model(("normal", "reverse"), (0.0, 90.0), triangles=60, random_state=500_000 + state)


def three(state: int) -> KnownPhases:
    """Return a model of three phases."""
    return phased_model(REGIMES, (0.0, 60.0, -40.0), faults=(18, 14, 12), planted=(0, 0, 0), triangles=60, random_state=600_000 + state)


KINDS: dict[str, Callable[[int], KnownPhases]] = {
    "one, 24 faults, 4 labels wrong": one,
    "one, 24 faults, 8 labels wrong": lambda state: one(state, planted=8),
    "one, 11 faults, 2 labels wrong": lambda state: one(state, 11, 2),
    "one, 30 faults, 20 of them inherited": lambda state: one(state, 30, 4, conjugate=10),
    "one, 30 faults, scatter 12 deg": lambda state: one(state, 30, 4, scatter_deg=12.0),
    "one, 24 faults, 8 of one fabric": lambda state: one(state, fabric_deg=10.0),
    "one, 30 faults, 14 of one fabric": lambda state: one(state, 30, 4, conjugate=16, fabric_deg=10.0),
    "two, 18 + 12 faults": two,
    "two, 18 + 12 faults, 3 labels wrong": lambda state: two(state, planted=(2, 1)),
    "two, 18 + 12, normal then reverse": inversion,
    "two, 22 + 8 faults": lambda state: two(state, (22, 8)),
    "two, 12 + 8 faults": lambda state: two(state, (12, 8)),
    "two, 18 + 12, over half inherited": lambda state: two(state, conjugate_share=0.45),
    "three, 18 + 14 + 12 faults": three,
}


def evidence_of(model: FaultModel) -> FaultEvidence:
    """Return what the mean planes and labels of a model say."""
    measured = [measure(fault.surface) for fault in model.faults]
    sectors = [usable_sector(f.declared, f.down_side, m.normal, m.dip_deg)[0] for f, m in zip(model.faults, measured, strict=True)]
    count = len(measured)
    known = np.array([m.meaningful for m in measured])
    return gather([m.normal[None] for m in measured], [np.ones(1)] * count, sectors, np.ones(count), known)


def outcome(case: tuple[str, int]) -> tuple[int, int, float, list[float], list[tuple[bool, bool]]]:
    """Return true and found number, seconds, worst axis of each phase, and whether each fault is right and clear."""
    kind, state = case
    known = KINDS[kind](state)
    evidence = evidence_of(known.model)
    start = time.perf_counter()
    found = find_phases(evidence, EvidenceModel(), declared_phases=[""] * len(evidence))
    seconds = time.perf_counter() - start
    count = len(known.axes)
    if found.count != count:
        return count, found.count, seconds, [], []
    order = min(itertools.permutations(range(count)), key=lambda o: axial_angle_deg(found.frames[list(o)], known.axes).max(1).sum())
    off = axial_angle_deg(found.frames[list(order)], known.axes).max(1)
    right = found.membership[:, list(order)].argmax(1) == known.phase_of
    return count, count, seconds, off.tolist(), list(zip(right.tolist(), (~found.ambiguous()).tolist(), strict=True))


def line(kind: str, rows: list[tuple[int, int, float, list[float], list[tuple[bool, bool]]]]) -> str:
    """Return one line of the table."""
    true, found = rows[0][0], np.array([row[1] for row in rows])
    spread = " ".join(f"{np.count_nonzero(found == number):3d}" for number in (1, 2, 3))
    text = f"{kind:38s} {100 * np.mean(found == true):5.1f}  {spread}  {np.median([row[2] for row in rows]):5.2f}"
    off = np.array([angle for row in rows for angle in row[3]])
    if off.size:
        text += f"  {np.median(off):5.1f} {np.quantile(off, 0.95):5.1f}"
    faults = np.array([fault for row in rows for fault in row[4]]).reshape(-1, 2)
    if true > 1 and faults.size:
        clear = faults[faults[:, 1], 0]
        text += f"    {100 * clear.mean():5.1f}  {100 * len(clear) / len(faults):5.1f}  {100 * faults[:, 0].mean():5.1f}"
    return text


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=60)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--jobs", type=int, default=1)
    chosen = parser.parse_args()
    print("                                       right  found as  median  worst axis    clear   clear    all")
    print("phases                                     %   1   2   3      s   50%   95%   right %     %  right %")
    with ProcessPoolExecutor(chosen.jobs) as pool:
        for kind in KINDS:
            states = range(chosen.seed, chosen.seed + chosen.models)
            print(line(kind, list(pool.map(outcome, [(kind, state) for state in states], chunksize=4))), flush=True)


if __name__ == "__main__":
    main()
