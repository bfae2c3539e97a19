"""Declared movement against the stress of the other faults: the verdicts as findings."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Evidence, Examined, Found, check, listed, many
from structviz.kinematics.senses import Sector
from structviz.model import Fault
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.verdict import Verdict

ROUNDED = 3


@check(
    "conflict",
    title="declared movements that the other faults contradict",
    why="under one stress, moving as the other faults say, this fault would have slipped the other way",
    unit="probability",
    limit=0.0,
    source="wallace1951",
    hint="go through the likely causes in their order: the label, the dip of the surface, the age of the fault",
    passes=lambda: samples.judged("consistent", "undetermined"),
    fails=lambda: samples.judged("consistent", "conflicting"),
    low=0.0,
    high=1.0,
    needs="stress",
)
def conflict(examined: Examined, limit: float) -> Iterator[Found]:
    """Return an error for each conflicting fault whose probability of conflict is at least the limit."""
    for fault, verdict in _judged(examined):
        probability = verdict.conflict_probability
        if verdict.word == "conflicting" and (probability is None or probability >= limit):
            cause = verdict.causes[0].text if verdict.causes else ""
            yield Found(fault.name, "error", _reasons(verdict), _numbers(verdict), f"first likely cause: {cause}" if cause else "")


@check(
    "undetermined",
    title="declared movements that could not be judged",
    why="no verdict is not a clean bill: the evidence neither supports nor contradicts what is declared",
    unit="probability",
    limit=0.0,
    source="",
    hint="a rake, striae, or more faults of other strikes nearby would decide it",
    passes=lambda: samples.judged("consistent", "conflicting"),
    fails=lambda: samples.judged("consistent", "undetermined"),
    low=0.0,
    high=1.0,
    needs="stress",
)
def undetermined(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note for each fault that declares a movement and got no verdict, where its probability of conflict is at least the limit."""
    for fault, verdict in _judged(examined):
        probability = verdict.conflict_probability or 0.0
        if fault.declared is not None and verdict.word == "undetermined" and probability >= limit and examined.regimes:
            yield Found(fault.name, "note", f"declared {fault.declared.text}, not judged: {_reasons(verdict)}", _numbers(verdict))


@check(
    "many-conflicts",
    title="models most of whose faults seem wrong",
    why="that many independent slips of the pen are unlikely: a sign, a unit or a convention is wrong for all of them at once",
    unit="% of judged",
    limit=25.0,
    source="",
    hint="suspect one common cause: depth read as elevation, easting and northing exchanged, a mirrored export, or strike by the left hand",
    passes=lambda: samples.judged(*["consistent"] * 6, "conflicting"),
    fails=lambda: samples.judged(*["consistent"] * 4, "conflicting", "conflicting", "conflicting"),
    low=0.0,
    high=100.0,
    needs="stress",
)
def many_conflicts(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning where more of the judged faults conflict than the limit, with the cause most of them share; three at least."""
    judged = [(fault, verdict) for fault, verdict in _judged(examined) if verdict.word in ("consistent", "conflicting")]
    wrong = [verdict for _, verdict in judged if verdict.word == "conflicting"]
    share = 100 * len(wrong) / max(len(judged), 1)
    if len(wrong) >= 3 and share > limit:
        text = f"{len(wrong)} of {len(judged)} judged faults conflict, too many for single slips: look for a cause they share"
        yield Found(
            "model",
            "warning",
            text + _common_cause(wrong),
            (("conflicting", len(wrong)), ("judged", len(judged)), ("share_pct", round(share, 1))),
        )


@check(
    "conflicting-set",
    title="conflicting faults that form a set of their own",
    why="faults that strike alike and all contradict the others alike are more likely older than mislabelled one by one",
    unit="deg",
    limit=25.0,
    source="",
    hint="look for cross-cutting that dates them; older faults are best checked in a model of their own, and left without sense here",
    passes=lambda: samples.judged(*["conflicting"] * 3, *["consistent"] * 7, strike_step_deg=1.0),
    fails=lambda: samples.judged(*["consistent"] * 5, *["conflicting"] * 3, strike_step_deg=12.0),
    low=1.0,
    high=60.0,
    needs="stress",
)
def conflicting_set(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a warning on the largest group of three or more conflicting faults within the limit of one of them and declared alike.

    It is told only where no more than twice as many faults of that orientation agree with the rest; else single labels are suspect.
    Faults that each name an older phase as their likeliest cause are told by `cause-shared`.
    """
    wrong = [k for k, v in enumerate(examined.verdicts) if v.word == "conflicting" and not (v.causes and v.causes[0].key == "older_phase")]
    right = [k for k, verdict in enumerate(examined.verdicts) if verdict.word == "consistent"]
    groups = []
    for leader in wrong:
        declared = examined.model.faults[leader].declared
        near = [k for k in _near(examined, leader, wrong, limit) if _alike(declared, examined.model.faults[k].declared)]
        agreeing = len(_near(examined, leader, right, limit))
        if len(near) >= 3 and 2 * len(near) >= agreeing:
            groups.append((len(near), -agreeing, sorted(examined.model.faults[k].name for k in near)))
    if groups:
        count, lack, names = max(groups)
        text = f"{listed(names)} conflict, lie within {limit:.0f} deg of one plane and are declared alike: an older phase could explain all"
        but = f", though {many(-lack, 'fault')} of that orientation moved with the rest" if lack else ""
        yield Found("model", "warning", text + but, (("conflicting", count), ("agreeing", -lack)))


def _near(examined: Examined, leader: int, those: list[int], limit_deg: float) -> list[int]:
    """Return which of the faults have a mean plane within an angle of the leader's."""
    if not those:
        return []
    normals = np.array([examined.measured[k].normal for k in those])
    near = axial_angle_deg(normals, examined.measured[leader].normal) <= limit_deg
    return [k for k, is_near in zip(those, near) if is_near]


def _alike(first: Sector | None, second: Sector | None) -> bool:
    """Return True where two declared movements lie within 45 degrees of each other."""
    if first is None or second is None:
        return False
    return abs((first.rake_deg - second.rake_deg + 180.0) % 360.0 - 180.0) <= 45.0


def _judged(examined: Examined) -> Iterator[tuple[Fault, Verdict]]:
    return zip(examined.model.faults, examined.verdicts)


def _reasons(verdict: Verdict) -> str:
    return "; ".join(verdict.reasons) or "no reason was recorded"


def _numbers(verdict: Verdict) -> Evidence:
    """Return the numbers of a verdict that are known."""
    names = ("conflict_probability", "misfit_deg", "predicted_rake_deg", "slip_tendency")
    values = ((name, getattr(verdict, name)) for name in names)
    return tuple((name, round(float(value), ROUNDED)) for name, value in values if value is not None)


def _common_cause(wrong: list[Verdict]) -> str:
    """Return the first cause most conflicts share, in words, where more than half of them share one."""
    first = Counter(verdict.causes[0].key for verdict in wrong if verdict.causes)
    if not first:
        return ""
    key, count = first.most_common(1)[0]
    return f"; first likely cause of {count} of them: {key.replace('_', ' ')}" if 2 * count > len(wrong) else ""
