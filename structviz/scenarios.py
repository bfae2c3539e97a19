"""What a verdict depends on: the analysis again under other choices, fault by fault compared with the first.

`sensitivity(analysis)` runs the model anew with other friction angles, other scales of local orientation and without the fault that
carries most, and judges every fault at fixed shape ratios. A verdict that changes says on which choice it depends.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from structviz.analysis import Analysis, FaultResult, Progress, run
from structviz.settings import Settings
from structviz.stress.answer import Answer, judge_in_phases
from structviz.stress.influence import Influence, influence, pair_influence_deg
from structviz.stress.replicates import Posterior
from structviz.stress.verdict import VerdictLimits
from structviz.surfaces.surface import Floats

REPLICATES = 200  # of every run, the first one again among them, so that words differ by the choice and not by the draw
FRICTION_ANGLES_DEG = (20.0, 25.0, 35.0, 40.0)
RADIUS_FACTORS = (0.5, 2.0)
SHAPE_RATIOS = (0.0, 0.25, 0.5, 0.75, 1.0)
FINE_RATIOS = tuple(k / 20 for k in range(21))  # where between those a word turns; holds all of them
OPEN = "undetermined"


@dataclass(frozen=True)
class Scenario:
    """One choice changed, and what came of it."""

    key: str  # "friction_angle" | "station_radius" | "without" | "shape_ratio"
    text: str
    words: Mapping[str, str]  # verdict of each fault by name
    kind: str  # class of the heaviest regime, empty where none could be inferred
    shmax_deg: float  # of the heaviest regime, NaN where none


@dataclass(frozen=True)
class Dependence:
    """A fault whose verdict changes with a choice."""

    fault: str
    on: tuple[str, ...]  # keys of scenarios
    text: str


@dataclass(frozen=True, eq=False)
class Sensitivity:
    """What the result owes to choices, to single faults and to single pairs."""

    base: Scenario
    scenarios: tuple[Scenario, ...]
    dependences: tuple[Dependence, ...]
    influence: tuple[Influence, ...]  # one a regime, rows in the order of analysis.faults
    pair_deg: Floats  # (P,) how far each pair draws the mean of the pairs, degrees


TITLES = {"friction_angle": "friction angle", "station_radius": "scale of local orientation", "without": "one fault", "shape_ratio": "R"}


def sensitivity(analysis: Analysis, progress: Progress | None = None) -> Sensitivity | None:
    """Return what the verdicts depend on; None where no stress could be inferred. About ten times the work of the analysis."""
    if analysis.answer is None or not analysis.regimes:
        return None
    tell = progress or (lambda text, done, total: None)
    settings = replace(analysis.settings, replicates=min(analysis.settings.replicates, REPLICATES))
    carried = tuple(_of_faults(influence(posterior), len(analysis.faults)) for posterior in analysis.answer.posteriors)
    first = run(analysis.model, settings)
    base = _scenario("base", "as chosen", first)
    found: list[Scenario] = []
    cases = list(_cases(analysis, settings, carried))
    for number, (key, text, left_out, changed) in enumerate(cases):
        tell("trying other choices", number, len(cases))
        faults = tuple(fault for fault in analysis.model.faults if fault.name != left_out)
        found.append(_scenario(key, text, run(replace(analysis.model, faults=faults), changed)))
    fine = _at_fixed_ratios(first, settings)
    found += [each for each, ratio in zip(fine, FINE_RATIOS) if ratio in SHAPE_RATIOS] if fine else []
    tell("trying other choices", len(cases), len(cases))
    dependences = tuple(_dependences(base, found, fine))
    return Sensitivity(base, tuple(found), dependences, carried, pair_influence_deg(analysis.pairs, analysis.regimes[0].axes))


def _of_faults(found: Influence, faults: int) -> Influence:
    """Return the influence of the faults alone: rows after them are earthquakes, which are heard but cannot be left out."""
    return Influence(found.turn_deg[:faults], found.shmax_turn_deg[:faults], found.support_nats[:faults])


def _cases(analysis: Analysis, settings: Settings, carried: Sequence[Influence]) -> Iterator[tuple[str, str, str, Settings]]:
    """Return key and text of each run, the fault it leaves out, and its settings."""
    for angle in FRICTION_ANGLES_DEG:
        if angle != settings.friction_angle_deg:
            yield "friction_angle", f"friction angle {angle:g} deg", "", replace(settings, friction_angle_deg=angle)
    for factor in RADIUS_FACTORS:
        radius = min(max(settings.station_radius * factor, 0.01), 2.0)
        yield "station_radius", f"station radius {radius:g} fault sizes", "", replace(settings, station_radius=radius)
    if len(analysis.faults) > 2:
        name = analysis.faults[carried[0].strongest].fault.name
        yield "without", f"without {name}", name, settings


def _scenario(key: str, text: str, analysis: Analysis) -> Scenario:
    words = {result.fault.name: result.verdict.word for result in analysis.faults}
    if not analysis.regimes:
        return Scenario(key, text, words, "", float("nan"))
    return Scenario(key, text, words, analysis.regimes[0].kind, analysis.regimes[0].shmax_deg)


def _at_fixed_ratios(analysis: Analysis, settings: Settings) -> list[Scenario]:
    """Return the verdicts with R held at each of FINE_RATIOS; the axes stay what they were."""
    if analysis.answer is None or not analysis.regimes:
        return []
    limits = VerdictLimits(conflicting_from=settings.conflict_probability, least_shear=settings.least_shear)
    regime, made = analysis.regimes[0], []
    for ratio in FINE_RATIOS:
        held = replace(analysis.answer, posteriors=tuple(_held(posterior, ratio) for posterior in analysis.answer.posteriors))
        words = {result.fault.name: _word(held, number, result, limits) for number, result in enumerate(analysis.faults)}
        made.append(Scenario("shape_ratio", f"R = {ratio:g}", words, regime.kind, regime.shmax_deg))
    return made


def _held(posterior: Posterior, ratio: float) -> Posterior:
    return replace(posterior, ratio_grid=np.array([ratio]), ratios=np.ones((len(posterior.frames), 1)))


def _word(held: Answer, number: int, result: FaultResult, limits: VerdictLimits) -> str:
    normals = result.stations.normals
    shares = np.full(len(normals), 1 / len(normals))
    return judge_in_phases(held, number, normals, shares, result.sector, "", limits)[0].word


def _dependences(base: Scenario, scenarios: Sequence[Scenario], fine: Sequence[Scenario]) -> Iterator[Dependence]:
    """Return each fault whose verdict turns from consistent to conflicting or back, or is left open, under some choice."""
    for fault, word in base.words.items():
        changed = [scenario for scenario in scenarios if scenario.words.get(fault, word) != word]
        if not changed:
            continue
        keys = tuple(dict.fromkeys(scenario.key for scenario in changed))
        told = [_told(scenario, fault) for scenario in changed if scenario.key != "shape_ratio"]
        if "shape_ratio" in keys:
            told.append(_by_ratio([scenario.words[fault] for scenario in fine]))
        yield Dependence(fault, keys, "; ".join([f"{word} as chosen", *told]))


def _told(scenario: Scenario, fault: str) -> str:
    return f"{scenario.words[fault]} {'' if scenario.key == 'without' else 'with '}{scenario.text}"


def _by_ratio(words: Sequence[str]) -> str:
    """Return the word over each stretch of R, such as "consistent at R 0 to 0.05, conflicting at R 0.1 to 1"."""
    starts = [0, *(k for k in range(1, len(words)) if words[k] != words[k - 1])]
    ends = [*(k - 1 for k in starts[1:]), len(words) - 1]
    return ", ".join(f"{words[a]} at R {_span(FINE_RATIOS[a], FINE_RATIOS[b])}" for a, b in zip(starts, ends))


def _span(low: float, high: float) -> str:
    return f"{low:g}" if low == high else f"{low:g} to {high:g}"
