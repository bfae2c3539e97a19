"""How many planted labels are found, how many faults are flagged wrongly, how far the axes are off?

    python tests/benchmarks/accuracy.py [--models 20] [--planted 4 8] [--seed 0] [--jobs 1]

Synthetic models of known stress (`structviz.synthetic.random_model`), 24 faults each, in each of three regimes. The table is
the same for the same options on every run.
"""

from __future__ import annotations

import argparse
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import Settings, run
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.regime import Regime
from structviz.synthetic import Known, random_model

REGIMES = ("normal", "strike-slip", "reverse")
LIMITS = {4: (99.0, 0.2, 3.0, 6.0), 8: (97.0, 2.0, 4.0, 8.0)}  # found %, false %, median and 95th percentile of the worst axis
LOST_DEG = 90.0  # counted for a model that got no regime


@dataclass(frozen=True)
class Outcome:
    """What one model gave."""

    regime: str
    state: int
    found: int
    planted: int
    false: int
    sound: int
    undetermined: int
    errors_deg: dict[str, tuple[float, float, float]]  # of each axis, by reading; "verdict" is the one the verdicts follow
    covered: tuple[bool, bool, bool] | None
    missed: tuple[str, ...]
    flagged: tuple[str, ...]
    seconds: float


def axis_errors_deg(known: Known, regime: Regime | None) -> tuple[float, float, float]:
    """Return the angle of each axis of a regime from the truth, degrees."""
    if regime is None:
        return (LOST_DEG,) * 3
    return tuple(float(v) for v in axial_angle_deg(regime.axes, known.axes))


def outcome(regime: str, planted: int, state: int) -> Outcome:
    """Return what the analysis makes of one model."""
    known = random_model(regime, planted=planted, random_state=state)
    start = time.perf_counter()
    analysis = run(known.model, Settings())
    seconds = time.perf_counter() - start
    word = {result.fault.name: result.verdict.word for result in analysis.faults}
    flagged = {name for name, verdict in word.items() if verdict == "conflicting"}
    wrong = set(known.flipped)
    first = analysis.regimes[0] if analysis.regimes else None
    errors = {reading.key: axis_errors_deg(known, reading.regime) for reading in analysis.readings}
    errors["verdict"] = axis_errors_deg(known, first)
    return Outcome(
        regime,
        state,
        len(flagged & wrong),
        len(wrong),
        len(flagged - wrong),
        len(word) - len(wrong),
        sum(verdict == "undetermined" for verdict in word.values()),
        errors,
        None if first is None else tuple(error <= cone for error, cone in zip(errors["verdict"], first.cones_deg)),
        tuple(sorted(wrong - flagged)),
        tuple(sorted(flagged - wrong)),
        seconds,
    )


def line(title: str, rows: list[Outcome]) -> str:
    """Return one line of the table."""
    found = 100 * sum(row.found for row in rows) / max(1, sum(row.planted for row in rows))
    false = 100 * sum(row.false for row in rows) / max(1, sum(row.sound for row in rows))
    open_share = 100 * sum(row.undetermined for row in rows) / sum(row.planted + row.sound for row in rows)
    worst = [max(row.errors_deg["verdict"]) for row in rows]
    covered = [hit for row in rows if row.covered for hit in row.covered]
    coverage = f"{100 * np.mean(covered):6.1f}" if covered else "     -"
    axes = f"{np.median(worst):7.1f} {np.percentile(worst, 95):6.1f}"
    return f"{title:24s}{found:8.1f} {false:8.2f} {open_share:8.1f} {axes} {coverage}"


def readings_line(key: str, rows: list[Outcome]) -> str:
    """Return the errors of the axes by one reading: worst axis of each model, then each axis by itself."""
    errors = np.array([row.errors_deg[key] for row in rows if key in row.errors_deg])
    lost = int((errors[:, 0] == LOST_DEG).sum())
    worst, middle = errors.max(1), np.median(errors, 0)
    each = " ".join(f"{v:6.1f}" for v in middle)
    return f"  {key:12s}{np.median(worst):7.1f} {np.percentile(worst, 95):6.1f}   {each}" + (f"   {lost} without a regime" if lost else "")


def report(planted: int, rows: list[Outcome]) -> None:
    """Print the table for one number of planted labels."""
    print(f"\n{planted} of 24 labels planted        found %  false %   open %  median   95th  cones %")
    for regime in REGIMES:
        print(line(f"  {regime}", [row for row in rows if row.regime == regime]))
    print(line("  all", rows))
    if planted in LIMITS:
        found, false, median, high = LIMITS[planted]
        wanted = f"{f'>= {found:g}':>8s} {f'<= {false:g}':>8s} {'':8s} {f'<= {median:g}':>7s} {f'<= {high:g}':>6s} {'93-97':>6s}"
        print(f"{'  wanted':24s}{wanted}")
    print("  axes by reading: worst axis median, 95th; median of sigma1, sigma2, sigma3 (deg)")
    for key in rows[0].errors_deg:
        print(readings_line(key, rows))
    for row in rows:
        if row.missed or row.flagged:
            print(f"  {row.regime} {row.state}: missed {', '.join(row.missed) or '-'}; wrongly flagged {', '.join(row.flagged) or '-'}")


def main() -> None:
    """Print the table of accuracy."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=20, help="models in each regime")
    parser.add_argument("--planted", type=int, nargs="+", default=[4, 8], help="wrong labels of 24")
    parser.add_argument("--seed", type=int, default=0, help="random state of the first model")
    parser.add_argument("--jobs", type=int, default=1, help="models at a time")
    options = parser.parse_args()
    for planted in options.planted:
        jobs = [(regime, planted, options.seed + 1000 * row + i) for row, regime in enumerate(REGIMES) for i in range(options.models)]
        if options.jobs > 1:
            with ProcessPoolExecutor(options.jobs) as pool:
                rows = list(pool.map(outcome, *zip(*jobs)))
        else:
            rows = [outcome(*job) for job in jobs]
        report(planted, rows)
        print(f"{np.mean([row.seconds for row in rows]):.2f} s a model", file=sys.stderr)


if __name__ == "__main__":
    main()
