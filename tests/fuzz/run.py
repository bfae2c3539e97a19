"""Fuzzes every reader: `python tests/fuzz/run.py --count 20000 --seed 1 --keep FOLDER`.

Prints counts; the exit code is 1 where a case was a fault.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from driving import drive


def main() -> int:
    """Fuzz and print what came of it."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--count", type=int, default=20_000)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--only", default="", help="kinds of input that hold this word")
    parser.add_argument("--keep", type=Path, help="folder for the cases that were faults")
    args = parser.parse_args()
    report = drive(args.count, args.seed, keep=args.keep, only=args.only, tell=_tell)
    for kind, counts in sorted(report.outcomes.items()):
        print(f"{kind:<24} " + "  ".join(f"{outcome} {count}" for outcome, count in sorted(counts.items())))
    print(f"{report.cases:,} cases, {len(report.faults)} faults; slowest {report.slowest[0]:.2f} s ({report.slowest[1]})")
    for kind, number, what in report.faults[:50]:
        print(f"  {kind} {number}: {what}")
    return 1 if report.faults else 0


def _tell(done: int, total: int) -> None:
    print(f"{done:,} of {total:,}", file=sys.stderr)


if __name__ == "__main__":
    sys.exit(main())
