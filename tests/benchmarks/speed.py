"""How much faster is a whole check than a script on general libraries, and how does its time grow?

    python tests/benchmarks/speed.py [YARDSTICK] [--faults 200] [--triangles 5000] [--rounds 1] [--no-growth]

Writes a synthetic model to a temporary folder, then runs the yardstick script (by default the one in shared/yardstick beside the
project) and `structviz check` in turn on the same files, both writing annotated surfaces. The times are those of whole
processes, start-up included; the least of the rounds counts. Every figure but the timings is the same on each run.
"""

from __future__ import annotations

import argparse
import csv
import os
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.io.writing import write_surface
from structviz.synthetic import large_model

PROJECT = Path(__file__).resolve().parents[2]
YARDSTICK = PROJECT.parent / "shared" / "yardstick" / "yardstick.py"
WANTED_RATIO, WANTED_MB, WANTED_HELP_SECONDS = 3.0, 1500.0, 0.3
GROWTH_FAULTS = (25, 50, 100)


@dataclass(frozen=True)
class Ran:
    """One process: wall-clock seconds, greatest resident memory, exit code and what it said."""

    seconds: float
    memory_mb: float
    code: int
    text: str


def ran(command: list[str]) -> Ran:
    """Return what one process took; its memory is its own, but never less than what this script held when it was started."""
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, [str(PROJECT), os.environ.get("PYTHONPATH", "")]))}
    with tempfile.TemporaryFile() as said:
        start = time.perf_counter()
        process = subprocess.Popen(command, stdout=said, stderr=subprocess.STDOUT, env=environment)
        _, status, usage = os.wait4(process.pid, 0)
        seconds = time.perf_counter() - start
        process.returncode = os.waitstatus_to_exitcode(status)
        said.seek(0)
        text = said.read().decode(errors="replace")
    unit = 2**20 if sys.platform == "darwin" else 2**10  # ru_maxrss: bytes there, kilobytes elsewhere
    return Ran(seconds, usage.ru_maxrss / unit, process.returncode, text)


def write_model(folder: Path, faults: int, triangles: int) -> Path:
    """Return the faults CSV of a synthetic model written to a folder."""
    folder.mkdir(parents=True)
    rows = [("name", "surface", "sense", "down_side")]
    for fault in large_model(faults=faults, triangles_each=triangles, random_state=1).model.faults:
        write_surface(folder / f"{fault.name}.vtp", fault.surface)
        rows.append((fault.name, f"{fault.name}.vtp", fault.declared.text if fault.declared else "", fault.down_side))
    with (folder / "faults.csv").open("w", newline="") as stream:
        csv.writer(stream).writerows(rows)
    return folder / "faults.csv"


def check(table: Path, out: Path, *options: str) -> Ran:
    """Return what `structviz check` took on a model; stop where it could not be used."""
    result = ran([sys.executable, "-m", "structviz", "check", str(table), "--out", str(out), *options])
    if result.code not in (0, 1):
        raise SystemExit(f"structviz check ended with code {result.code}:\n{result.text}")
    return result


def least(results: list[Ran]) -> Ran:
    """Return the quickest run."""
    return min(results, key=lambda result: result.seconds)


def compare(table: Path, folder: Path, yardstick: Path, rounds: int) -> None:
    """Print seconds, memory, ratios of both, run in turn; the yardstick draws nothing, so a check without pictures counts too."""
    ours, plain, theirs = [], [], []
    for turn in range(rounds):
        if yardstick.is_file():
            theirs.append(ran([sys.executable, str(yardstick), str(table), "--out", str(folder / f"yardstick{turn}")]))
        ours.append(check(table, folder / f"whole{turn}"))
        plain.append(check(table, folder / f"plain{turn}", "--no-pictures"))
    reason = f"no script at {os.path.relpath(yardstick, PROJECT)}" if not theirs else ""
    if theirs and least(theirs).code:
        reason = f"ended with code {least(theirs).code}: {least(theirs).text.strip().splitlines()[-1]}"
    seconds = None if reason else least(theirs).seconds
    print(f"yardstick         skipped: {reason}" if reason else line("yardstick", least(theirs)))
    print(line("structviz check", least(ours), seconds))
    print(line("  --no-pictures", least(plain), seconds))
    print(f"{'  wanted':31s}<= {WANTED_MB:.0f} MB   >= {WANTED_RATIO:g} times as fast")


def line(title: str, result: Ran, against_seconds: float | None = None) -> str:
    """Return one line of the table."""
    ratio = f"   {against_seconds / result.seconds:4.2f} times as fast" if against_seconds else ""
    return f"{title:18s}{result.seconds:7.2f} s {result.memory_mb:7.0f} MB{ratio}"


def help_time() -> None:
    """Print the least of five times of `structviz --help`."""
    best = least([ran([sys.executable, "-m", "structviz", "--help"]) for _ in range(5)])
    print(f"structviz --help  {best.seconds:7.2f} s              wanted <= {WANTED_HELP_SECONDS:g} s")


def growth(folder: Path, triangles: int) -> None:
    """Print how the time of a check without pictures grows with faults, and with triangles at the middle number of faults."""
    sizes = [(faults, triangles) for faults in GROWTH_FAULTS] + [(GROWTH_FAULTS[1], triangles // 4), (GROWTH_FAULTS[1], triangles * 4)]
    for faults, each in sizes:
        part = folder / f"growth{faults}x{each}"
        seconds = check(write_model(part / "model", faults, each), part / "out", "--no-pictures").seconds
        print(f"growth            {seconds:7.2f} s   {faults} faults of {each} triangles")


def main() -> None:
    """Print the table of speed."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("yardstick", type=Path, nargs="?", default=YARDSTICK)
    parser.add_argument("--faults", type=int, default=200)
    parser.add_argument("--triangles", type=int, default=5000, help="triangles of each fault")
    parser.add_argument("--rounds", type=int, default=1, help="times each program is run, in turn")
    parser.add_argument("--no-growth", action="store_true", help="leave the growth lines out")
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        table = write_model(folder / "model", options.faults, options.triangles)
        print(f"{options.faults} faults of about {options.triangles} triangles, {os.cpu_count()} processors")
        compare(table, folder, options.yardstick, options.rounds)
        help_time()
        if not options.no_growth:
            growth(folder, options.triangles)


if __name__ == "__main__":
    main()
