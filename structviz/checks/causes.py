"""One cause for several faults: what explains many conflicts at once is told once, before they are told one by one.

Errors of a whole model are visible only in part. Depth read as elevation turns every plane by 180 degrees about the vertical, and a
stress turned with them explains the same words: planes and words of any number of faults cannot show it, where it is true of all.
A mirrored plan (easting reversed, or exchanged with northing) leaves dip-slip as it was and shows in strike-slip words alone. Where
all words are swapped, acute pairs turn obtuse. A part of the faults that went wrong shows against the rest, where it shows at all.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from structviz.checks import samples
from structviz.checks.registry import Examined, Found, check, listed
from structviz.kinematics.declared import usable_sector
from structviz.kinematics.senses import Sector
from structviz.stress.causes import CAUSES
from structviz.stress.evidence import EvidenceModel
from structviz.stress.shared_causes import ModelCause, whole_model_causes
from structviz.stress.verdict import Cause

WORTH = 0.2  # score from which a cause explains a fault
SAME_NATS = 5.0  # gains this near each other do not tell their causes apart
SLIPS_OF_THE_PEN = 0.25  # share of the judged faults up to which swapped labels are single mistakes
SYSTEMATIC = {
    "dips_other_way": "depth read as elevation, or one export that mirrored them, would explain them all",
    "mirrored": "easting reversed, or easting and northing exchanged, in one export would explain them all",
    "label_swapped": "one convention of sense or rake, read the other way, would explain them all",
    "older_phase": "one older phase would explain them all",
    "obtuse_pair": "one event that turned the blocks, or reused these planes with the stress reversed, would explain them all",
}


def _three(cause: str) -> Examined:
    known = samples.judged(*["conflicting"] * 3, *["consistent"] * 4)
    verdicts = tuple(replace(v, causes=(Cause(cause, "", 0.7),)) for v in known.verdicts[:3])
    return replace(known, verdicts=verdicts + known.verdicts[3:])


@check(
    "cause-shared",
    title="conflicts that one common cause explains",
    why="three mistakes of one kind are one mistake made once: it is found once, and put right once",
    unit="faults",
    limit=3.0,
    source="",
    hint="look at what these faults have in common: one file, one export, one interpreter, one age",
    passes=lambda: _three("oblique_boundary"),
    fails=lambda: _three("dips_other_way"),
    low=2.0,
    high=1000.0,
    needs="stress",
)
def cause_shared(examined: Examined, limit: float) -> Iterator[Found]:
    """Return an error on the model for the cause that explains the most conflicts, from so many faults on as the limit says.

    The faults it names are those that name it first, with those that give it a good share though another comes first. It must explain
    most conflicts of the model; else they are told one by one. A few swapped labels are no convention, whatever they share.
    """
    wrong = [k for k, v in enumerate(examined.verdicts) if v.word == "conflicting"]
    judged = sum(v.word != "undetermined" for v in examined.verdicts)
    counted = []
    for place, key in enumerate(SYSTEMATIC):
        first = [k for k in wrong if examined.verdicts[k].causes and examined.verdicts[k].causes[0].key == key]
        fits = [k for k in wrong if any(c.key == key and c.score >= WORTH for c in examined.verdicts[k].causes)]
        if key == "label_swapped" and len(fits) <= SLIPS_OF_THE_PEN * judged:
            continue
        if len(fits) >= limit and 2 * len(fits) > len(wrong) and 2 * len(first) >= len(fits):
            counted.append((len(fits), -place, key, fits))
    if counted:
        count, _, key, fits = max(counted)
        names = listed(examined.model.faults[k].name for k in fits)
        text = f"{count} of {len(wrong)} conflicts share a likely cause, {key.replace('_', ' ')}: {SYSTEMATIC[key]} ({names})"
        step = next(row.next_step for row in CAUSES if row.key == key)
        yield Found("model", "error", text, (("faults", count), ("conflicting", len(wrong))), f"once for all of them: {step}")


def _turned_words(swapped: bool) -> Examined:
    """Return conjugate normal faults in two sets, all declared reverse where swapped."""
    pieces = [
        samples.measured(samples.plane(strike, 60.0, (5000.0 * k, 0.0, -3000.0)))
        for k, strike in enumerate((0.0, 180.0, 5.0, 175.0, 355.0, 185.0, 2.0, 178.0))
    ]
    known = samples.examined(*pieces, senses="reverse" if swapped else "normal")
    return replace(known, regimes=(samples.regime(),), verdicts=tuple(samples.verdict("consistent") for _ in pieces))


@check(
    "cause-of-whole-model",
    title="models that fit far better with all their surfaces or words turned one way",
    why="a sign or a convention wrong for all faults leaves no single one in conflict: only the model as a whole looks strange",
    unit="nats",
    limit=6.0,
    source="",
    hint="try it: a mirrored or reversed copy of the model should fit what is known of the region; striae and horizons decide",
    passes=lambda: _turned_words(False),
    fails=lambda: _turned_words(True),
    low=1.0,
    high=1000.0,
    needs="stress",
)
def cause_of_whole_model(examined: Examined, limit: float) -> Iterator[Found]:
    """Return a note where a change of all faults gains more likelihood than the limit, naming those that gain about as much.

    Rotated blocks and planes reused under another stress give obtuse pairs too, in models without any mistake: the words say so.
    """
    found = _whole(examined)
    if found and found[0].gain_nats > limit:
        best = found[0].gain_nats
        close = [cause for cause in found if cause.gain_nats > best - SAME_NATS]
        text = " or with ".join(cause.text for cause in close)
        but = "rotated blocks, or older planes used again, look the same"
        steps = "; ".join(cause.next_step for cause in close)
        numbers = (("gain_nats", round(best, 1)), ("explanations", len(close)))
        yield Found("model", "note", f"planes and movements fit each other better by {best:.0f} nats with {text}; {but}", numbers, steps)


def _whole(examined: Examined) -> tuple[ModelCause, ...]:
    normals: list[np.ndarray] = []
    sectors: list[Sector | None] = []
    for fault, piece in examined.faults():
        if piece.meaningful:
            normals.append(piece.normal)
            sectors.append(usable_sector(fault.declared, fault.down_side, piece.normal, piece.dip_deg)[0])
    return whole_model_causes(np.array(normals).reshape(-1, 3), sectors, EvidenceModel())
