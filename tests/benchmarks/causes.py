"""Are planted causes named? One to three faults of each cause in models of known stress, and the place of that cause in the answer.

    python tests/benchmarks/causes.py [--models 30] [--seed 0] [--jobs 1]

Models of 24 faults, two thirds conjugate, in the three regimes in turn. A row gives how many faults were planted, how many of them
were flagged (conflicting, or undetermined with a declared sense), and of the flagged ones how often the planted cause is named
first, among the first two, or tied with the first. Rows "conjugate" and "inherited" tell on what planes it was planted: some causes
cannot be told apart on inherited planes, as `structviz.stress.causes` explains.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from structviz.analysis import Settings, run
from structviz.kinematics.senses import nearest_word, sector_of_words
from structviz.kinematics.slip import resolved_slip, shear_and_normal
from structviz.model import Fault, FaultModel
from structviz.orientation.planes import rakes_deg
from structviz.stress.causes import ALIKE
from structviz.stress.evidence import EvidenceModel
from structviz.stress.shared_causes import with_shared_stress
from structviz.stress.tensor import reduced_tensor
from structviz.stress.verdict import Verdict
from structviz.synthetic.models import Known, declaration, random_model, random_surface
from structviz.synthetic.shapes import Relief, relief_surface

REGIMES = ("normal", "strike-slip", "reverse")
SPLIT = ("all", "conjugate", "inherited")
Floats = NDArray[np.float64]
Plant = Callable[[Known, int, np.random.Generator], Fault | None]


def shear_of(known: Known, normal: Floats) -> float:
    """Return the shear on a plane in shares of the greatest."""
    return float(2 * shear_and_normal(reduced_tensor(known.axes, known.shape_ratio), normal[None])[0][0])


def on_plane(known: Known, row: int, normal: Floats, rake_deg: float, rng: np.random.Generator) -> Fault:
    """Return a fault on a new plane with the word of its rake."""
    name = known.model.faults[row].name
    sector, down_side = declaration(normal, rake_deg)
    return Fault(name, random_surface(rng, name, normal, rake_deg, 300, 15_000.0), sector, "", down_side)


def drawn(rng: np.random.Generator, wanted: Callable[[Floats], bool]) -> Floats | None:
    """Return an upward normal at random of dip 15 to 78 degrees that is as wanted; None where none of 4000 is."""
    for normal in rng.normal(size=(4000, 3)):
        unit = normal / np.sqrt((normal**2).sum()) * np.sign(normal[2])
        if np.cos(np.radians(78)) < unit[2] < np.cos(np.radians(15)) and wanted(unit):
            return np.asarray(unit)
    return None


def label_swapped(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """The opposite word on a clearly sheared fault."""
    fault = known.model.faults[row]
    if shear_of(known, known.normals[row]) < 0.5 or fault.declared is None or fault.down_side:
        return None
    return replace(fault, declared=fault.declared.opposite())


def _reflected(fault: Fault, signs: tuple[float, float, float]) -> Fault:
    """Return a fault with its surface mirrored through its middle, the label as it was."""
    middle = fault.surface.vertices.mean(0)
    surface = replace(fault.surface, vertices=middle + (fault.surface.vertices - middle) * np.array(signs))
    return replace(fault, surface=surface)


def _shows(known: Known, row: int, signs: tuple[float, float, float]) -> bool:
    """Return whether the true stress would move the mirrored plane clearly (20 degrees) outside the declared sector."""
    fault, normal = known.model.faults[row], known.normals[row] * np.array(signs)
    normal = normal if normal[2] > 0 else -normal
    rake = float(rakes_deg(normal, resolved_slip(reduced_tensor(known.axes, known.shape_ratio), normal)))
    return fault.declared is not None and not fault.down_side and off(rake, fault.declared.text) > 110.0


def dips_other_way(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """The surface turned upside down, as depth read as elevation does; the label is true of the true surface."""
    fault = known.model.faults[row]
    return _reflected(fault, (1.0, 1.0, -1.0)) if _shows(known, row, (1.0, 1.0, -1.0)) else None


def mirrored(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """The surface mirrored from east to west."""
    fault = known.model.faults[row]
    return _reflected(fault, (-1.0, 1.0, 1.0)) if _shows(known, row, (-1.0, 1.0, 1.0)) else None


def older_phase(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """A fault conjugate in another stress: its sigma1 stands where sigma2 now is, its sigma2 where sigma3 is."""
    old = known.axes[[1, 2, 0]]  # sigma1 where sigma2 was, and so on
    tensor = reduced_tensor(old, 0.5)
    side = 1.0 if rng.random() < 0.5 else -1.0
    normal = 0.5 * old[0] + side * np.sqrt(0.75) * old[2] + rng.normal(0.0, 0.07, 3)
    normal = normal / np.sqrt((normal**2).sum()) * np.sign(normal[2])
    return on_plane(known, row, normal, float(rakes_deg(normal, resolved_slip(tensor, normal))), rng)


def obtuse_pair(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """A fault at the obtuse angle that moved as with sigma1 and sigma3 exchanged."""
    side = 1.0 if rng.random() < 0.5 else -1.0
    normal = np.sqrt(0.75) * known.axes[0] + side * 0.5 * known.axes[2] + rng.normal(0.0, 0.07, 3)
    normal = normal / np.sqrt((normal**2).sum()) * np.sign(normal[2])
    tensor = reduced_tensor(known.axes[[2, 1, 0]] * np.array([[1.0], [1.0], [-1.0]]), 1 - known.shape_ratio)
    return on_plane(known, row, normal, float(rakes_deg(normal, resolved_slip(tensor, normal))), rng)


def oblique_boundary(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """A fault whose slip is near the edge of the word written for it: its lesser component, or 15 degrees beyond."""
    tensor = reduced_tensor(known.axes, known.shape_ratio)

    def near(normal: Floats) -> bool:
        rake = float(rakes_deg(normal, resolved_slip(tensor, normal)))
        return 75.0 < off(rake, word) < 105.0 and shear_of(known, normal) > 0.5

    word = ("normal", "reverse", "sinistral", "dextral")[int(rng.integers(4))]
    normal = drawn(rng, near)
    if normal is None:
        return None
    fault = on_plane(known, row, normal, float(rakes_deg(normal, resolved_slip(tensor, normal))), rng)
    return replace(fault, declared=sector_of_words(word), down_side="")


def off(rake_deg: float, word: str) -> float:
    """Return how far a rake is from the middle of a word, degrees."""
    return abs((rake_deg - sector_of_words(word).rake_deg + 180.0) % 360.0 - 180.0)


def orientation_noise(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """A true label on a surface picked roughly: local planes 25 degrees and more about a mean that is off by up to 35."""
    name, true, rake = known.model.faults[row].name, known.normals[row], float(known.true_rakes_deg[row])
    if known.model.faults[row].down_side:
        return None
    word, tensor = nearest_word(rake), reduced_tensor(known.axes, known.shape_ratio)

    def turned_out(normal: Floats) -> bool:
        there = float(rakes_deg(normal, resolved_slip(tensor, normal)))
        return float(normal @ true) > np.cos(np.radians(35.0)) and off(there, word) > 90.0

    normal = drawn(rng, turned_out)
    if normal is None:
        return None
    relief = Relief(40.0, 30.0, 20.0, 25.0, rake + 50.0, 1500.0, 0.0, 22.0, 0.25, 0.45)
    surface = relief_surface(name, normal, (407_000.0, 6_507_000.0, -3000.0), 4000.0, 2200.0, relief, cells=(14, 10), rng=rng)
    return Fault(name, surface, sector_of_words(word))


def too_little_shear(known: Known, row: int, rng: np.random.Generator) -> Fault | None:
    """A plane nearly across an axis, with a word drawn at random."""
    normal = drawn(rng, lambda n: shear_of(known, n) < 0.13)
    if normal is None:
        return None
    word = ("normal", "reverse", "sinistral", "dextral")[int(rng.integers(4))]
    return replace(on_plane(known, row, normal, float(rng.uniform(-180, 180)), rng), declared=sector_of_words(word), down_side="")


PLANTS: dict[str, tuple[Plant, float]] = {  # and the lean of the axes
    "label_swapped": (label_swapped, 5.0),
    "mirrored": (mirrored, 5.0),
    "dips_other_way": (dips_other_way, 25.0),
    "older_phase": (older_phase, 5.0),
    "obtuse_pair": (obtuse_pair, 5.0),
    "oblique_boundary": (oblique_boundary, 5.0),
    "orientation_noise": (orientation_noise, 5.0),
    "too_little_shear": (too_little_shear, 5.0),
}

Outcome = tuple[str, str, bool, int, bool]  # cause, kind of plane, flagged, place (0 first, 9 absent), tied with the first


def outcomes(task: tuple[str, int]) -> list[Outcome]:
    """Return what became of each planted fault of one model."""
    key, state = task
    plant, tilt = PLANTS[key]
    rng = np.random.default_rng([state, list(PLANTS).index(key)])
    known = random_model(REGIMES[state % 3], planted=0, tilt_deg=tilt, random_state=20_000 + state)
    faults, planted = list(known.model.faults), []
    wanted = int(rng.integers(1, 4))
    for row in rng.permutation(len(faults)):
        fault = plant(known, int(row), rng) if len(planted) < wanted else None
        if fault is not None:
            faults[row] = fault
            planted.append(int(row))
    analysis = run(FaultModel("planted", tuple(faults)), Settings(replicates=200))
    verdicts = [result.verdict for result in analysis.faults]
    normals = np.array([result.measured.normal for result in analysis.faults])
    told = with_shared_stress(verdicts, normals, [result.sector for result in analysis.faults], EvidenceModel())
    return [_seen(key, _kind(key, known, row, len(planted)), told[row]) for row in planted]


def _kind(key: str, known: Known, row: int, together: int) -> str:
    return ("alone" if together == 1 else "together") if key == "older_phase" else known.kinds[row]


def _seen(key: str, kind: str, verdict: Verdict) -> Outcome:
    causes = verdict.causes
    place = next((k for k, cause in enumerate(causes) if cause.key == key), 9)
    flagged = verdict.word != "consistent"
    tied = place < 9 and causes[place].score >= ALIKE * causes[0].score
    return key, kind, flagged, place, tied


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--models", type=int, default=30)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--jobs", type=int, default=1)
    chosen = parser.parse_args()
    tasks = [(key, state) for key in PLANTS for state in range(chosen.seed, chosen.seed + chosen.models)]
    with ProcessPoolExecutor(chosen.jobs) as pool:
        rows = [row for part in pool.map(outcomes, tasks, chunksize=2) for row in part]
    print(f"{'cause':<20} {'planes':<10} planted flagged  first %  in two %  first or tied %")
    for key in PLANTS:
        kinds = {"label_swapped": SPLIT, "mirrored": SPLIT, "dips_other_way": SPLIT, "older_phase": ("all", "alone", "together")}.get(
            key, ("all",)
        )
        for kind in kinds:
            _print_row(key, kind, [row for row in rows if row[0] == key and kind in ("all", row[1])])


def _print_row(key: str, kind: str, rows: list[Outcome]) -> None:
    flagged = [row for row in rows if row[2]]
    shares = [100 * sum(test) / max(len(flagged), 1) for test in zip(*((r[3] == 0, r[3] <= 1, r[4]) for r in flagged))] or [0.0] * 3
    print(f"{key:<20} {kind:<10} {len(rows):7d} {len(flagged):7d}  {shares[0]:7.0f}  {shares[1]:8.0f}  {shares[2]:15.0f}")


if __name__ == "__main__":
    main()
