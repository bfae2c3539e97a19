"""Causes that several faults share: a stress that the conflicting faults have in common, and mistakes made with a whole model.

A mistake of all faults at once is visible in part only. Depth read as elevation turns planes by 180 degrees about the vertical, and
the stress turned with them explains the same words. A mirrored plan leaves dip-slip as it was; it shows in strike-slip words. Words
that are all swapped exchange sigma1 and sigma3: acute pairs turn obtuse.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import RAKE_OF_WORD, Sector, nearest_word
from structviz.stress.causes import CAUSES, by_chance, ranked
from structviz.stress.evidence import EvidenceModel, gather
from structviz.stress.frames import all_frames
from structviz.stress.joint import COARSE_RATIOS, Terms, log_likelihood
from structviz.stress.verdict import Verdict

Floats = NDArray[np.float64]

SHARED_FRAMES = 3000  # about 10 degrees apart: enough to tell whether faults share a stress
MOST_SHARED = 150  # conflicts; of more, an older phase is found by `phases`
LEAST_DECLARED = 4  # movements, to speak of a whole model
UNTOLD_SCORE = 0.03  # of an older phase that was too unlikely to be told


def shared_stress(normals: Floats, sectors: Sequence[Sector], odds: EvidenceModel) -> Floats:
    """Return the likelihood of each of C misfits under the stress that the other misfits speak for, shape (C,).

    normals are mean planes (C, 3). A fault alone, or one with others that share nothing, has about the likelihood of any stress at
    all (`by_chance`); faults of one older phase vouch for each other. Each of the others counts as one of the phase or not, evenly.
    """
    count = len(normals)
    evidence = gather([n[None] for n in normals], [np.ones(1)] * count, sectors, np.ones(count), np.ones(count, bool))
    frames = all_frames(SHARED_FRAMES).astype(np.float32)
    each = log_likelihood(evidence, frames, COARSE_RATIOS, odds, Terms(lines=False)).astype(float).reshape(count, -1)
    chance = np.array([by_chance(sector) for sector in sectors])
    alone = 0.5 * np.exp(each)  # of two half-spaces apart by words, half is what one readily writes a word for
    mixed = np.log((alone + chance[:, None]) / 2)
    rest = mixed.sum(0) - mixed
    weight = np.exp(rest - rest.max(1, keepdims=True))
    return np.asarray((weight * alone).sum(1) / weight.sum(1))


def with_shared_stress(
    verdicts: Sequence[Verdict], normals: Floats, sectors: Sequence[Sector | None], odds: EvidenceModel
) -> list[Verdict]:
    """Return the verdicts, an older phase weighed anew for each conflict by how well the others share a stress with it.

    normals are mean planes (F, 3) in the order of the verdicts. With one conflict, or more than MOST_SHARED, nothing changes.
    """
    rows = [k for k, v in enumerate(verdicts) if v.word == "conflicting" and sectors[k] is not None]
    done = list(verdicts)
    if not 2 <= len(rows) <= MOST_SHARED:
        return done
    declared = [sector for sector in (sectors[k] for k in rows) if sector is not None]
    found = shared_stress(np.asarray(normals)[rows], declared, odds)
    for k, sector, likelihood in zip(rows, declared, found, strict=True):
        known = dict.fromkeys((row.key for row in CAUSES), 0.0) | {cause.key: cause.score for cause in verdicts[k].causes}
        known["older_phase"] = max(known["older_phase"], UNTOLD_SCORE) * max(1.0, float(likelihood) / by_chance(sector))
        total = max(1.0, sum(known.values()))
        done[k] = replace(verdicts[k], causes=ranked({key: score / total for key, score in known.items()}, sector))
    return done


@dataclass(frozen=True)
class ModelCause:
    """One mistake made with all faults at once, and the log-likelihood gained by undoing it."""

    key: str
    text: str
    gain_nats: float
    next_step: str


MODEL_CAUSES = (  # key, what is done to a declared rake to undo it, words, next step
    (
        "labels_swapped",
        lambda rake: rake + 180.0,
        "every declared movement reversed",
        "ask how sense and rake were defined (footwall or hanging wall, sign of the rake); if they are right, the blocks are rotated",
    ),
    (
        "plan_mirrored",
        lambda rake: 180.0 - rake,
        "the plan mirrored (easting reversed, or exchanged with northing), or sinistral and dextral exchanged",
        "compare the strike of any fault with the geological map; then how sinistral and dextral were written down",
    ),
)


def whole_model_causes(normals: Floats, sectors: Sequence[Sector | None], odds: EvidenceModel) -> tuple[ModelCause, ...]:
    """Return what undoing each mistake of a whole model gains in log-likelihood over all stresses, the greatest first; gains only.

    normals are mean planes (F, 3); F above MOST_SHARED is thinned. Mirroring the plan is the same as keeping it and exchanging sinistral
    and dextral. Depth read as elevation gains nothing whatever the model, and is not tried: the stress turns with the planes. Where
    words are all strike-slip both causes are one.
    """
    step = -(-len(normals) // MOST_SHARED) if len(normals) else 1
    planes, declared = normals[::step], list(sectors)[::step]
    if sum(sector is not None for sector in declared) < LEAST_DECLARED:
        return ()
    plain = _support(planes, declared, odds)
    found = []
    for key, undo, text, step_next in MODEL_CAUSES:
        gain = _support(planes, [_undone(sector, undo) for sector in declared], odds) - plain
        found.append(ModelCause(key, text, gain, step_next))
    return tuple(sorted((cause for cause in found if cause.gain_nats > 0), key=lambda cause: -cause.gain_nats))


def _undone(sector: Sector | None, undo: Callable[[float], float]) -> Sector | None:
    """Return a declared sector with its rake changed; words are kept in step by way of their own rakes."""
    if sector is None:
        return None
    words = tuple(nearest_word(undo(RAKE_OF_WORD[word])) for word in sector.words)
    return Sector((undo(sector.rake_deg) + 180.0) % 360.0 - 180.0, sector.half_width_deg, words)


def _support(normals: Floats, sectors: Sequence[Sector | None], odds: EvidenceModel) -> float:
    """Return the log of the likelihood of planes and words averaged over all stresses."""
    count = len(normals)
    evidence = gather([n[None] for n in normals], [np.ones(1)] * count, sectors, np.ones(count), np.ones(count, bool))
    frames = all_frames(SHARED_FRAMES).astype(np.float32)
    total = log_likelihood(evidence, frames, COARSE_RATIOS, odds, Terms(lines=False)).sum(0, dtype=float)
    return float(np.logaddexp.reduce(total, axis=None) - np.log(total.size))
