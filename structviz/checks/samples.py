"""Small models with known answers, on which each check is shown to pass and to fail.

They are measured here by the plainest means (one flat part each), so that a check is tested apart from the measuring.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from structviz.checks.registry import Examined
from structviz.kinematics.senses import sector_of_rake, sector_of_words
from structviz.model import Fault, FaultModel, Stria
from structviz.orientation.planes import normals, slip_vectors, strike_dip_deg
from structviz.orientation.vectors import rotation
from structviz.stress.conjugate import Pairs
from structviz.stress.regime import Reading, Regime, ShapeRatio
from structviz.stress.verdict import Cause, Verdict
from structviz.surfaces.surface import Condition, Floats, MeasuredSurface, Part, Surface

CENTRE = (0.0, 0.0, -3000.0)
SIDE_M = 4000.0
# sigma1 vertical, sigma2 north, sigma3 east: normal faults strike north.
NORMAL_AXES = np.array([[0.0, 0.0, 1.0], [0.0, 1.0, 0.0], [1.0, 0.0, 0.0]])


def plane(strike_deg: float = 0.0, dip_deg: float = 60.0, centre: tuple[float, float, float] = CENTRE, side_m: float = SIDE_M) -> Surface:
    """Return a square flat surface of 128 triangles, wound so that its normals point to the hanging wall, metres."""
    normal = normals(strike_deg, dip_deg)
    along, up_dip = slip_vectors(normal, 0.0), slip_vectors(normal, 90.0)
    steps = np.linspace(-side_m / 2, side_m / 2, 9)
    rows, columns = np.meshgrid(steps, steps, indexing="ij")
    vertices = np.array(centre) + rows.reshape(-1, 1) * along + columns.reshape(-1, 1) * up_dip
    corner = (np.arange(8)[:, None] * 9 + np.arange(8)).reshape(-1, 1)
    triangles = np.concatenate([corner + np.array([0, 9, 10]), corner + np.array([0, 10, 1])])
    return Surface("", vertices, triangles.astype(np.int64))


def folded(limb_deg: float) -> Surface:
    """Return the plane with its southern half folded by an angle about the dip line through its middle."""
    flat, normal = plane(), normals(0.0, 60.0)
    away = flat.vertices - CENTRE
    swung = away @ rotation(slip_vectors(normal, 90.0), limb_deg).T
    southern = (away @ slip_vectors(normal, 0.0) < 0)[:, None]
    return replace(flat, vertices=np.where(southern, swung, away) + CENTRE)


def rough(height_m: float) -> Surface:
    """Return the plane with every other vertex pushed out along its normal."""
    flat = plane()
    push = np.where(np.arange(len(flat.vertices)) % 2, height_m, -height_m)
    return replace(flat, vertices=flat.vertices + push[:, None] * normals(0.0, 60.0))


def measured(surface: Surface, **changes: object) -> MeasuredSurface:
    """Return the surface measured as one part, with the fields named in `changes` set to what is wanted."""
    corners = surface.vertices[surface.triangles]
    doubled = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    length = np.sqrt((doubled**2).sum(-1))
    each: Floats = doubled / np.maximum(length, 1e-300)[:, None]
    mean = doubled.sum(0) / np.sqrt((doubled.sum(0) ** 2).sum())
    spread = np.sqrt(np.average(np.degrees(np.arccos(np.clip(each @ mean, -1, 1))) ** 2, weights=length))
    strike, dip = (float(v) for v in strike_dip_deg(mean))
    part = Part(len(length), float(length.sum() / 2), tuple(mean), strike, dip, float(spread))
    whole = MeasuredSurface(
        surface=surface,
        areas_m2=length / 2,
        centroids=corners.mean(1),
        normals=each,
        part_of=np.zeros(len(length), np.int64),
        parts=(part,),
        normal=mean,
        strike_deg=strike,
        dip_deg=dip,
        cone_deg=2.0,
        meaningful=True,
        why_not="",
        condition=Condition(),
    )
    return replace(whole, **changes)  # type: ignore[arg-type]


def part(area_m2: float, normal: tuple[float, float, float] = (0.866, 0.0, 0.5), dip_deg: float = 60.0) -> Part:
    """Return one part of a surface, by its area."""
    return Part(64, area_m2, normal, 0.0, dip_deg, 1.0)


def examined(*pieces: MeasuredSurface, senses: str = "normal", striae: tuple[Stria, ...] = (), **known: object) -> Examined:
    """Return measured surfaces as faults A, B, C ... with the declared senses (words, "-" for none; the last one repeats)."""
    words = senses.split()
    words += words[-1:] * (len(pieces) - len(words))
    faults = tuple(
        Fault(chr(65 + k), piece.surface, None if word == "-" else sector_of_words(word))
        for k, (piece, word) in enumerate(zip(pieces, words))
    )
    return Examined(FaultModel("sample", faults, striae=striae), pieces, **known)  # type: ignore[arg-type]


def one(surface: Surface | None = None, **changes: object) -> Examined:
    """Return a model of one normal fault."""
    return examined(measured(surface or plane(), **changes))


def with_condition(**defects: object) -> Examined:
    """Return a model of one normal fault with the defects named."""
    return one(condition=Condition(**defects))  # type: ignore[arg-type]


def renamed(these: Examined, *names: str) -> Examined:
    """Return the model with its faults renamed in order."""
    faults = tuple(replace(fault, name=name) for fault, name in zip(these.model.faults, names))
    return replace(these, model=replace(these.model, faults=faults))


def with_down_side(these: Examined, down_side: str) -> Examined:
    """Return the model with the side that went down declared for every fault."""
    faults = tuple(replace(fault, down_side=down_side) for fault in these.model.faults)
    return replace(these, model=replace(these.model, faults=faults))


def with_stria(strike_deg: float, dip_deg: float, off_m: float = 0.0) -> Examined:
    """Return the plane that strikes north and dips 60 east, with one stria off it by a distance along its normal."""
    place = np.array(CENTRE) + off_m * normals(0.0, 60.0)
    stria = Stria("A", tuple(place), strike_deg, dip_deg, -90.0, sector_of_rake(-90.0))
    return examined(measured(plane()), striae=(stria,))


def regime(axes: Floats = NORMAL_AXES, kind: str = "normal", shmax_deg: float = 0.0, **changes: object) -> Regime:
    """Return a well-determined regime, sigma1 vertical and sigma3 east where nothing else is asked for."""
    return replace(Regime(axes, (4.0, 5.0, 5.0), kind, shmax_deg, 5.0, ShapeRatio(0.5, 0.3, 0.7)), **changes)  # type: ignore[arg-type]


def verdict(word: str = "consistent", cause: str = "") -> Verdict:
    """Return a verdict as a confident judgement would give it."""
    causes = (Cause("label-swapped", cause, 0.9),) if cause else ()
    misfit = 170.0 if word == "conflicting" else 10.0
    return Verdict(word, misfit / 175.0, misfit, -85.0, 8.0, 0.9, ("predicted from the other faults",), causes)


def judged(
    *words: str,
    regimes: tuple[Regime, ...] | None = None,
    readings: tuple[Reading, ...] = (),
    pairs: Pairs | None = None,
    strike_step_deg: float = 180.0,
) -> Examined:
    """Return as many normal faults as there are verdict words, each striking a step on from the last, under the regimes given."""
    strikes = [strike_step_deg * k % 360.0 for k in range(len(words))]
    pieces = [measured(plane(strike, 60.0, (9000.0 * k, 0.0, -3000.0))) for k, strike in enumerate(strikes)]
    verdicts = tuple(verdict(word, "the label is swapped" if word == "conflicting" else "") for word in words)
    found = (regime(),) if regimes is None else regimes
    return examined(*pieces, readings=readings, regimes=found, verdicts=verdicts, pairs=pairs)


def pair_rows(*obtuse: bool) -> Pairs:
    """Return equally weighted pairs of faults A and B, obtuse or acute as told."""
    count = len(obtuse)
    ones = np.ones(count)
    axes = np.broadcast_to(NORMAL_AXES, (count, 3, 3))
    return Pairs(np.tile([0, 1], (count, 1)), 60.0 * ones, np.array(obtuse, bool), ones, axes, 0.0 * ones, np.zeros((count, 3)))
