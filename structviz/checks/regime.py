"""The regime as a whole: do the readings agree, what carries it, how tight is it."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, many
from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import Sector
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.lines import trend_plunge_deg
from structviz.orientation.planes import rakes_deg
from structviz.orientation.vectors import rotation
from structviz.stress.regime import Reading, Regime
from structviz.stress.tensor import frame_angle_deg, reduced_tensor
from structviz.surfaces.surface import Floats

AXES = ("sigma1", "sigma2", "sigma3")
SAMPLE = samples.regime()
MIDDLE_RATIO = 0.5  # R of a reading that leaves it open


@check(
    "no-regime",
    title="models from which no stress can be inferred",
    why="without a stress nothing can be predicted, and no declared movement can be judged",
    unit="readings",
    limit=0.0,
    source="",
    hint="add senses, rakes or striae on at least four faults of different strikes, or faults that make conjugate pairs",
    passes=lambda: samples.judged("consistent", "consistent"),
    fails=lambda: samples.judged("undetermined", regimes=(), readings=(_reading("joint", None),)),
    low=0.0,
    high=0.0,
    needs="stress",
)
def no_regime(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where there is no regime, with the reasons of the readings that failed."""
    if len(examined.regimes) <= limit:
        reasons = "; ".join(f"{reading.title}: {reading.why_not}" for reading in examined.readings if reading.why_not)
        text = "no stress could be inferred, so no movement was judged" + (f" ({reasons})" if reasons else "")
        yield Found("model", "warning", text, (("readings", len(examined.readings)),))


@check(
    "readings-disagree",
    title="readings of the evidence that contradict each other",
    why="where geometry and senses tell of different stresses, one of them misleads: labels, surfaces, or the conjugate rule itself",
    unit="deg",
    limit=30.0,
    source="kagan1991",
    hint="reactivated or rotated sets hold sigma1 in the obtuse angle; where unlikely, suspect the labels or the dip of many faults",
    passes=lambda: samples.judged("consistent", "consistent", readings=(_reading("geometry"), _reading("senses"))),
    fails=lambda: samples.judged(
        "consistent",
        "consistent",
        readings=(_reading("geometry", samples.regime(samples.NORMAL_AXES[::-1], "reverse", 90.0)), _reading("senses")),
    ),
    low=5.0,
    high=120.0,
    needs="stress",
)
def readings_disagree(examined: Examined, limit: float) -> Iterator[Found]:
    """Return one warning where two readings stand further apart than the limit and than their cones allow, all of them ranked."""
    told = [(reading, reading.regime) for reading in examined.readings if reading.regime and reading.key != "joint"]
    apart = [(*_apart_deg(a, b), first.key, second.key) for (first, a), (second, b) in combinations(told, 2)]
    clear = [row for row in apart if row[0] > max(limit, row[1])]
    if not clear:
        return
    worst = max(clear)
    lines = "; ".join(f"{reading.title}: {_regime(regime)}{fit}" for reading, regime, fit in _ranked(examined, told))
    followed = f"; the verdicts follow {_regime(examined.regimes[0])}" if examined.regimes else ""
    text = f"readings of the evidence stand up to {worst[0]:.0f} deg apart, best first: {lines}{followed}"
    yield Found("model", "warning", text, (("apart_deg", round(worst[0], 1)), ("first", worst[2]), ("second", worst[3])))


@check(
    "obtuse-pairs",
    title="pairs whose senses put sigma1 in the obtuse angle",
    why="the acute rule of new faults in isotropic rock does not hold here, so geometry alone would mislead",
    unit="% of weight",
    limit=50.0,
    source="anderson1951",
    hint="think of rotated blocks, low friction or reactivated fabric; if none is likely, suspect the sense labels",
    passes=lambda: samples.judged("consistent", "consistent", pairs=samples.pair_rows(False, False, True)),
    fails=lambda: samples.judged("consistent", "consistent", pairs=samples.pair_rows(False, True, True)),
    low=0.0,
    high=100.0,
    needs="stress",
)
def obtuse_pairs(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where obtuse pairs hold more of the weight of all pairs than the limit."""
    pairs = examined.pairs
    if pairs is None or not pairs.weight.sum():
        return
    share, count = 100 * float(pairs.weight[pairs.obtuse].sum() / pairs.weight.sum()), int(pairs.obtuse.sum())
    if share > limit:
        text = f"{count} of {many(len(pairs), 'pair')} ({share:.0f} % of the weight) put sigma1 in the obtuse angle of the faults"
        yield Found("model", "warning", text, (("obtuse_pairs", count), ("pairs", len(pairs)), ("weight_pct", round(share, 1))))


@check(
    "few-senses",
    title="a regime carried by very few declared movements",
    why="a single wrong label then turns the stress, and with it every verdict",
    unit="faults",
    limit=4.0,
    source="",
    hint="read the verdicts as leads, not as findings, until more senses are known",
    passes=lambda: samples.judged(*["consistent"] * 4),
    fails=lambda: samples.judged("consistent", "consistent"),
    low=0.0,
    high=1000.0,
    needs="stress",
)
def few_senses(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where a regime rests on fewer faults with a testable movement than the limit."""
    count = sum(sector is not None for sector in _sectors(examined))
    if examined.regimes and count < limit:
        text = f"the regime rests on {many(count, 'fault')} with a declared movement that can be tested"
        yield Found("model", "warning", text, (("with_sense", count), ("faults", len(examined.model.faults))))


@check(
    "loose-regime",
    title="a regime that is poorly determined",
    why="the wider the cones, the more verdicts stay open, and the more a conflict depends on which faults were mapped",
    unit="deg",
    limit=25.0,
    source="efron1992",
    hint="add faults of other strikes, striae, or oblique senses; check whether the model mixes phases",
    passes=lambda: samples.judged("consistent"),
    fails=lambda: samples.judged("consistent", regimes=(samples.regime(cones_deg=(12.0, 40.0, 39.0)),)),
    low=1.0,
    high=90.0,
    needs="stress",
)
def loose_regime(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where the cone of sigma1 or sigma3 of the heaviest regime is wider than the limit."""
    for regime in examined.regimes[:1]:
        s1, _, s3 = regime.cones_deg
        if max(s1, s3) > limit:
            cones = ", ".join(f"{name} to {cone:.0f}" for name, cone in zip(AXES, regime.cones_deg))
            text = f"the regime is loose, 95 % cones in degrees: {cones}"
            yield Found(
                "model", "warning", text, tuple((f"{name}_cone_deg", round(float(c), 2)) for name, c in zip(AXES, regime.cones_deg))
            )


@check(
    "tilted-axes",
    title="principal axes far from vertical and level",
    why="near the ground one axis stands vertical; a tilted frame means tilted beds, a curved stress, or false dips",
    unit="deg",
    limit=20.0,
    source="anderson1951",
    hint="ask whether the faults were tilted after they formed; unfold the beds, or check the vertical unit",
    passes=lambda: samples.judged("consistent"),
    fails=lambda: samples.judged("consistent", regimes=(samples.regime(_leaning(35.0)),)),
    low=0.0,
    high=54.0,
    needs="stress",
)
def tilted_axes(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note where no axis of the heaviest regime stands within the limit, widened by its cone, of the vertical."""
    for regime in examined.regimes[:1]:
        _, plunges = trend_plunge_deg(regime.axes)
        steepest = int(plunges.argmax())
        lean = 90.0 - float(plunges[steepest])
        if lean > max(limit, regime.cones_deg[steepest]):
            text = f"the steepest axis, {AXES[steepest]}, leans {lean:.0f} deg from the vertical"
            yield Found("model", "note", text, (("lean_deg", round(lean, 1)), ("axis", AXES[steepest])))


@check(
    "shape-ratio-open",
    title="a shape ratio that the data leave open",
    why="oblique faults slip differently for different R; where that changes a verdict it stays undetermined",
    unit="",
    limit=0.5,
    source="wallace1951",
    hint="striae or oblique senses (two words, or a rake) on faults that contain none of the axes resolve R",
    passes=lambda: samples.judged("consistent"),
    fails=lambda: samples.judged("consistent", regimes=(samples.regime(shape_ratio=None),)),
    low=0.0,
    high=1.0,
    needs="stress",
)
def shape_ratio_open(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note where R of the heaviest regime is unresolved or its interval wider than the limit."""
    for regime in examined.regimes[:1]:
        ratio = regime.shape_ratio
        if ratio is None:
            yield Found("model", "note", "the shape ratio R is not resolved; every prediction was made over its whole range")
        elif ratio.high - ratio.low > limit:
            text = f"the shape ratio R is known only between {ratio.low:.2f} and {ratio.high:.2f}"
            yield Found("model", "note", text, (("low", round(ratio.low, 3)), ("high", round(ratio.high, 3))))


@check(
    "several-regimes",
    title="models that hold more than one stress",
    why="faults of another phase answer to another stress; judged by the wrong one they look wrong",
    unit="share",
    limit=0.2,
    source="",
    hint="name the phases where they are known, so that faults of different age are not paired, and check each phase in a model of its own",
    passes=lambda: samples.judged("consistent"),
    fails=lambda: samples.judged(
        "consistent", regimes=(samples.regime(weight=0.6), samples.regime(_leaning(80.0), "normal", 80.0, weight=0.4))
    ),
    low=0.0,
    high=0.5,
    needs="stress",
)
def several_regimes(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note where a second regime holds more of the evidence than the limit."""
    heavy = [regime for regime in examined.regimes if regime.weight > limit]
    if len(heavy) > 1:
        text = "the evidence holds more than one stress: " + "; ".join(f"{_regime(r)} ({100 * r.weight:.0f} %)" for r in heavy)
        yield Found("model", "note", text, (("regimes", len(heavy)), ("second_weight", round(heavy[1].weight, 3))))


def _regime(regime: Regime) -> str:
    """Return a regime in words: class and azimuth of the greatest horizontal compression."""
    return f"{regime.kind}, SHmax {regime.shmax_deg:03.0f} +/- {regime.shmax_half_width_deg:.0f}"


def _apart_deg(first: Regime, second: Regime) -> tuple[float, float]:
    """Return the least turn between two regimes, and the turn that their widest cones together allow, degrees."""
    return float(frame_angle_deg(first.axes, second.axes)), float(np.hypot(max(first.cones_deg), max(second.cones_deg)))


def _sectors(examined: Examined) -> list[Sector | None]:
    """Return the declaration of each fault as it can be tested on its mean plane; None where it cannot."""
    return [
        usable_sector(fault.declared, fault.down_side, piece.normal, piece.dip_deg)[0] if piece.meaningful else None
        for fault, piece in examined.faults()
    ]


def _ranked(examined: Examined, readings: list[tuple[Reading, Regime]]) -> list[tuple[Reading, Regime, str]]:
    """Return the readings by how many declared movements each explains on the mean planes, most first, with that said in words."""
    told = [(piece.normal, sector) for (_, piece), sector in zip(examined.faults(), _sectors(examined)) if sector]
    counted = [(_explained(regime, told), reading, regime) for reading, regime in readings]
    counted.sort(key=lambda row: -row[0])
    return [(reading, regime, f" (explains {count} of {len(told)} declared movements)") for count, reading, regime in counted]


def _explained(regime: Regime, told: list[tuple[Floats, Sector]]) -> int:
    """Return how many declared sectors hold the slip that a regime predicts."""
    if not told:
        return 0
    normals = np.array([normal for normal, _ in told])
    ratio = regime.shape_ratio.value if regime.shape_ratio else MIDDLE_RATIO
    rakes = rakes_deg(normals, resolved_slip(reduced_tensor(regime.axes, ratio), normals))
    centres, widths = np.array([(sector.rake_deg, sector.half_width_deg) for _, sector in told]).T
    return int((np.abs((rakes - centres + 180.0) % 360.0 - 180.0) <= widths).sum())


def _reading(key: str, regime: Regime | None = SAMPLE) -> Reading:
    return Reading(key, key, regime, 4, "" if regime else "too few faults")


def _leaning(angle_deg: float) -> Floats:
    """Return the sample axes turned by an angle about an oblique line, so that none stays vertical."""
    return np.asarray(samples.NORMAL_AXES @ rotation([1.0, 1.0, 0.0], angle_deg).T)
