"""Makes damaged inputs, has them read in a process with limits, and counts what came of them."""

from __future__ import annotations

import json
import os
import random
import shutil
import subprocess
import sys
import tempfile
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

HERE = Path(__file__).resolve().parent
PROJECT = HERE.parents[1]
BATCH = 200  # cases made at a time
HANGS_S = 60  # a process that says nothing for so long hangs where no alarm reaches it


@dataclass
class Report:
    """Outcomes by kind of input, and every case that was neither read nor refused."""

    outcomes: dict[str, Counter[str]] = field(default_factory=dict)
    faults: list[tuple[str, int, str]] = field(default_factory=list)  # kind, number, what happened
    slowest: tuple[float, str] = (0.0, "")

    @property
    def cases(self) -> int:
        return sum(sum(each.values()) for each in self.outcomes.values())


def cases(kinds: dict[str, dict[str, bytes]], count: int, seed: int, mutated) -> Iterator[tuple[int, str, dict[str, bytes]]]:
    """Yield number, kind and files of damaged inputs, the kinds in turn; number and seed alone decide the damage."""
    names = sorted(kinds)
    for number in range(count):
        kind = names[number % len(names)]
        chance = random.Random(f"{seed} {number}")
        files = dict(kinds[kind])
        victim = next(iter(files)) if len(files) == 1 or chance.random() < 0.7 or "model.toml" in files else chance.choice(list(files)[1:])
        files[victim] = mutated(files[victim], chance)
        yield number, kind, files


def drive(count: int, seed: int, *, keep: Path | None = None, only: str = "", tell=lambda done, total: None) -> Report:
    """Return what came of `count` damaged inputs; those that were faults are kept in a folder where one is given."""
    sys.path.insert(0, str(PROJECT))
    mutated, samples = _module("mutations").mutated, _module("samples").samples
    kinds = {kind: files for kind, files in samples().items() if only in kind}
    report = Report()
    made = cases(kinds, count, seed, mutated)
    done = 0
    while done < count:
        batch = [case for _, case in zip(range(BATCH), made)]
        _run_batch(batch, report, keep)
        done += len(batch)
        tell(done, count)
    return report


def _module(name: str):
    """Return a module of this folder, which is no package."""
    from importlib.util import module_from_spec, spec_from_file_location

    spec = spec_from_file_location(f"tests_fuzz_{name}", HERE / f"{name}.py")
    assert spec is not None
    assert spec.loader is not None
    module = module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def _run_batch(batch: list[tuple[int, str, dict[str, bytes]]], report: Report, keep: Path | None) -> None:
    with tempfile.TemporaryDirectory(prefix="structviz-fuzz-") as folder:
        waiting = [(number, kind, _written(Path(folder, str(number)), files)) for number, kind, files in batch]
        while waiting:
            seen = _one_process(waiting, Path(folder))
            for number, kind, path in waiting[: len(seen)]:
                outcome, seconds = seen[number]
                report.outcomes.setdefault(kind, Counter())[outcome.partition(":")[0]] += 1
                report.slowest = max(report.slowest, (seconds, f"{kind} {number}"))
                if outcome.startswith("FAULT"):
                    report.faults.append((kind, number, outcome))
                    if keep:
                        shutil.copytree(path.parent, keep / f"{kind.replace(' ', '_')}-{number}", dirs_exist_ok=True)
            waiting = waiting[len(seen) :]


def _written(folder: Path, files: dict[str, bytes]) -> Path:
    """Write the files of a case; return the one to read."""
    folder.mkdir()
    for name, content in files.items():
        (folder / name).write_bytes(content)
    return folder / ("model.toml" if "model.toml" in files else next(iter(files)))


def _one_process(waiting: list[tuple[int, str, Path]], folder: Path) -> dict[int, tuple[str, float]]:
    """Return outcome and seconds of the cases one process came to; the last of them may have ended it."""
    paths = os.pathsep.join([str(PROJECT), str(folder / "modules")])
    (folder / "modules").mkdir(exist_ok=True)
    shutil.copy(HERE / "samples.py", folder / "modules" / "tests_fuzz_samples.py")
    lines = "".join(
        json.dumps({"number": number, "path": str(path), "bytes": sum(f.stat().st_size for f in path.parent.iterdir())}) + "\n"
        for number, _, path in waiting
    )
    env = {**os.environ, "PYTHONPATH": paths, "OPENBLAS_NUM_THREADS": "1"}
    try:
        command, most = [sys.executable, str(HERE / "worker.py")], HANGS_S + 2 * len(waiting)
        done = subprocess.run(command, input=lines, capture_output=True, text=True, env=env, timeout=most, check=False)
        out, how = done.stdout, f"FAULT: the process ended with {done.returncode}: {done.stderr[-200:]}"
    except subprocess.TimeoutExpired as error:
        said = error.stdout or ""
        out, how = said.decode() if isinstance(said, bytes) else said, "FAULT: hangs beyond any alarm"
    seen: dict[int, tuple[str, float]] = {}
    begun = None
    for line in out.splitlines():
        if line.startswith("begin "):
            begun = int(line.removeprefix("begin "))
        elif line.startswith("{"):
            told = json.loads(line)
            seen[told["number"]] = (told["outcome"], told["seconds"])
            begun = None
    if begun is not None:
        seen[begun] = (how, 0.0)
    if not seen:
        raise RuntimeError(f"the process came to no case: {how}")
    return seen
