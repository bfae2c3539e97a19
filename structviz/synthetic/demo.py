"""The demo model: the Ostravell Terrace, an invented rift shoulder screened for storing carbon dioxide.

The place, the names, the story and every coordinate are made up. Fifteen conjugate normal faults and six steep transfer
faults moved under one stress; three faults of an older movement were left in the model without a phase. Planted besides:
one swapped label and one surface mirrored from east to west.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from structviz.kinematics.senses import Sector, describe_rake, nearest_word, sector_of_words
from structviz.kinematics.slip import resolved_slip
from structviz.model import Fault, FaultModel, Horizon, Stria
from structviz.orientation.lines import vectors
from structviz.orientation.planes import normals, rakes_deg, slip_vectors, strike_dip_deg
from structviz.orientation.vectors import rotation_vectors_to_matrices
from structviz.stress.tensor import reduced_tensor
from structviz.surfaces.surface import Surface
from structviz.synthetic.horizons import Slipped, displaced_horizon
from structviz.synthetic.models import Known
from structviz.synthetic.shapes import Relief, relief_surface

Floats = NDArray[np.float64]

RANDOM_STATE = 20
CRS = "EPSG:25831"
MIDDLE = np.array([512_000.0, 6_203_000.0, -2600.0])
SHAPE_RATIO = 0.6
FRICTION_ANGLE_DEG = 30.0
SIGMA1 = (285.0, 84.0)  # trend and plunge, deg: 6 degrees off vertical
SIGMA3_TREND_DEG = 105.0
OLDER_SIGMA1_TREND_DEG = 95.0  # level, as sigma3 was: an older strike-slip stress
COLUMNS_M = (-7200.0, -3700.0, -200.0, 3300.0, 6800.0)  # across the strike of the normal faults
ROWS_M = (-6000.0, 0.0, 6000.0)  # along it
GAPS_M = (-5450.0, 1550.0, 5050.0, -5450.0, -1950.0, 5050.0)  # places of the transfer faults across, between the columns
NORMAL_NAMES = (
    "Aldbrakk", "Brennath", "Corvick", "Dunmarra", "Eskeld", "Fenrath", "Galdern", "Heskvik",
    "Isvarra", "Jorrick", "Keldrath", "Lunvick", "Morvane", "Nessgar", "Orrinsk",
)  # fmt: skip
TRANSFERS = (("Pellvane", 52.0, 77.0), ("Quernath", 63.0, 74.0), ("Ruskeld", 47.0, 79.0), ("Sundrave", 68.0, 72.0),
             ("Tarvick", 150.0, 75.0), ("Ulvarn", 57.0, 80.0))  # fmt: skip
OLDER = (("Vargarn", 50.0, 82.0), ("Westrakk", 38.0, 80.0), ("Yrsel", 59.0, 83.0))
SWAPPED = "Heskvik"
MIRRORED = "Ulvarn"
STRIAE_ON = ("Brennath", "Fenrath", "Quernath", "Sundrave", "Orrinsk")


@dataclass(frozen=True, eq=False)
class Demo:
    """The demo model with its truth."""

    known: Known  # flipped names the swapped label; kinds are "conjugate", "inherited" and "older"
    mirrored: tuple[str, ...]
    older: tuple[str, ...]
    older_axes: Floats  # (3, 3) the stress that moved them
    slips: tuple[Slipped, ...]  # true surfaces and slip, in the order of the faults


@dataclass(frozen=True, eq=False)
class _Row:
    """One fault to be built."""

    name: str
    kind: str
    normal: Floats
    centre: Floats
    length_m: float
    height_m: float
    slip_share: float  # greatest slip over length


def demo_model() -> Demo:
    """Return the demo model and what is true of it; every call gives the same numbers."""
    plans, shapes, marks = np.random.default_rng(RANDOM_STATE).spawn(3)
    axes, older_axes = true_axes()
    rows = [*_normal_rows(plans, axes), *_transfer_rows(plans), *_older_rows(plans)]
    plane_normals = np.stack([row.normal for row in rows])
    old = np.array([row.kind == "older" for row in rows])
    slips = np.where(
        old[:, None],
        resolved_slip(reduced_tensor(older_axes, 0.5), plane_normals),
        resolved_slip(reduced_tensor(axes, SHAPE_RATIO), plane_normals),
    )
    rakes = rakes_deg(plane_normals, slips)
    surfaces = [_surface(shapes, row, float(rake)) for row, rake in zip(rows, rakes)]
    moving = tuple(Slipped(s, row.normal, slip * row.slip_share * row.length_m) for s, row, slip in zip(surfaces, rows, slips))
    faults = tuple(_fault(row, s, float(rake)) for row, s, rake in zip(rows, surfaces, rakes))
    model = FaultModel(
        "Ostravell Terrace (invented)",
        faults,
        _horizons(moving, old),
        _striae(marks, faults, plane_normals, rakes),
        CRS,
    )
    known = Known(model, axes, SHAPE_RATIO, (SWAPPED,), rakes, tuple(row.kind for row in rows), plane_normals)
    return Demo(known, (MIRRORED,), tuple(name for name, *_ in OLDER), older_axes, moving)


def true_axes() -> tuple[Floats, Floats]:
    """Return the axes (3, 3) of the stress to be found, and of the older one."""
    s1 = vectors(*SIGMA1)
    s2 = np.cross(vectors(SIGMA3_TREND_DEG, 0.0), s1)
    s2 /= np.linalg.norm(s2)
    older = np.stack([vectors(OLDER_SIGMA1_TREND_DEG, 0.0), [0.0, 0.0, -1.0], vectors(OLDER_SIGMA1_TREND_DEG + 90.0, 0.0)])
    return np.stack([s1, s2, np.cross(s1, s2)]), older


def _normal_rows(rng: np.random.Generator, axes: Floats) -> list[_Row]:
    """Return fifteen faults of the two conjugate sets, in three rows of five, dipping towards and away from each other in turn."""
    half = np.radians(45.0 - FRICTION_ANGLE_DEG / 2)
    across, along = vectors(SIGMA3_TREND_DEG, 0.0), vectors(SIGMA3_TREND_DEG - 90.0, 0.0)
    rows = []
    for i, name in enumerate(NORMAL_NAMES):
        column, row = i % len(COLUMNS_M), i // len(COLUMNS_M)
        side = 1.0 if (column + row) % 2 == 0 else -1.0
        ideal = np.sin(half) * axes[0] + side * np.cos(half) * axes[2]
        ideal = ideal if ideal[2] > 0 else -ideal
        turn = rotation_vectors_to_matrices(np.radians(rng.normal(0.0, 5.0, 3)))
        place = MIDDLE + COLUMNS_M[column] * across + ROWS_M[row] * along + rng.normal(0.0, [200.0, 200.0, 120.0])
        rows.append(_Row(name, "conjugate", turn @ ideal, place, float(rng.uniform(3600, 4900)), float(rng.uniform(1700, 2300)), 0.03))
    return rows


def _transfer_rows(rng: np.random.Generator) -> list[_Row]:
    """Return six steep inherited faults between the rows of normal faults, which the same stress moved obliquely."""
    across, along = vectors(SIGMA3_TREND_DEG, 0.0), vectors(SIGMA3_TREND_DEG - 90.0, 0.0)
    rows = []
    for i, (name, strike, dip) in enumerate(TRANSFERS):
        offset = GAPS_M[i] * across + (-3000.0 if i < 3 else 3000.0) * along
        place = MIDDLE + offset + rng.normal(0.0, [150.0, 150.0, 120.0])
        size = (float(rng.uniform(2200, 2800)), float(rng.uniform(1500, 1900)))
        rows.append(_Row(name, "inherited", normals(strike, dip), place, *size, 0.025))
    return rows


def _older_rows(rng: np.random.Generator) -> list[_Row]:
    """Return three deep faults that an older stress moved and the present one did not."""
    places = MIDDLE + np.array([[-8600.0, 3000.0, -750.0], [-400.0, -8700.0, -800.0], [8800.0, -2500.0, -700.0]])
    return [
        _Row(name, "older", normals(strike, dip), place, float(rng.uniform(2600, 3400)), float(rng.uniform(1000, 1200)), 0.02)
        for (name, strike, dip), place in zip(OLDER, places)
    ]


def _surface(rng: np.random.Generator, row: _Row, rake_deg: float) -> Surface:
    """Return the rough surface of a fault; coordinates are kept to the centimetre."""
    width = row.height_m / float(np.hypot(row.normal[0], row.normal[1]))
    relief = Relief(
        bend_deg=float(rng.normal(0.0, 9.0)),
        curve_deg=float(rng.normal(6.0, 4.0)) if row.kind == "conjugate" else float(rng.normal(0.0, 3.0)),
        twist_deg=float(rng.normal(0.0, 3.0)),
        corrugation_deg=float(rng.uniform(2.0, 3.0)),
        corrugation_rake_deg=rake_deg,
        wavelength_m=float(rng.uniform(0.25, 0.4) * width),
        phase_rad=float(rng.uniform(0.0, 2 * np.pi)),
        noise_deg=1.5,
        jitter=0.25,
        taper=0.45,
    )
    cells = (round(row.length_m / 160.0), round(width / 150.0))
    wound = bool(rng.random() < 0.5)
    made = relief_surface(row.name, row.normal, row.centre, row.length_m, width, relief, cells=cells, rng=rng, wound_to_hanging_wall=wound)
    return replace(made, vertices=made.vertices.round(2))


def _fault(row: _Row, surface: Surface, rake_deg: float) -> Fault:
    """Return the fault as the model tells it, with what was planted on it."""
    sector = _declared(row, rake_deg)
    if row.name == SWAPPED:
        sector = sector.opposite()
    return Fault(row.name, mirrored_east_west(surface) if row.name == MIRRORED else surface, sector)


def _declared(row: _Row, rake_deg: float) -> Sector:
    """Return what an interpreter would write: the set's word for normal faults, one or two words for the others."""
    if row.kind == "conjugate":
        return sector_of_words("normal")
    return sector_of_words(nearest_word(rake_deg) if row.name == MIRRORED else describe_rake(rake_deg))


def mirrored_east_west(surface: Surface) -> Surface:
    """Return the surface mirrored from east to west through the middle of its extent, as a sign lost in an exchange would do."""
    vertices = surface.vertices.copy()
    vertices[:, 0] = (vertices[:, 0].min() + vertices[:, 0].max() - vertices[:, 0]).round(2)
    return replace(surface, vertices=vertices)


def _horizons(moving: tuple[Slipped, ...], old: NDArray[np.bool_]) -> tuple[Horizon, ...]:
    """Return three horizons; the older faults displaced only the deepest, before the others were laid down."""
    young = tuple(fault for fault, is_old in zip(moving, old) if not is_old)
    box = ((MIDDLE[0] - 10_500.0, MIDDLE[0] + 10_500.0), (MIDDLE[1] - 10_000.0, MIDDLE[1] + 10_000.0))
    shapes = (
        ("Top Ostravell seal", (-2150.0, 1.2, 40.0), young),
        ("Top Ostravell sand", (-2550.0, 1.6, 55.0), young),
        ("Top basement", (-3250.0, 2.2, 80.0), moving),
    )
    return tuple(Horizon(name, displaced_horizon(name, shape, box, 250.0, faults)) for name, shape, faults in shapes)


def _striae(rng: np.random.Generator, faults: tuple[Fault, ...], plane_normals: Floats, rakes: Floats) -> tuple[Stria, ...]:
    """Return slip lines as an image log or core would give them: local planes 4 degrees about the mean, rakes 7 degrees about the slip."""
    found = []
    for fault, normal, rake in zip(faults, plane_normals, rakes):
        if fault.name not in STRIAE_ON:
            continue
        slip = slip_vectors(normal, rake)
        for vertex in rng.choice(fault.surface.vertices, 4, replace=False):
            local = rotation_vectors_to_matrices(np.radians(rng.normal(0.0, 4.0, 3))) @ normal
            strike, dip = strike_dip_deg(local)
            seen = float(rakes_deg(local, slip)) + float(rng.normal(0.0, 7.0))
            place = (float(vertex[0]), float(vertex[1]), float(vertex[2]))
            found.append(_stria(fault.name, place, float(strike), float(dip), (seen + 180.0) % 360.0 - 180.0))
    return tuple(found)


def _stria(fault: str, place: tuple[float, float, float], strike_deg: float, dip_deg: float, rake_deg: float) -> Stria:
    """Return one slip line, to the degree as a geologist notes it, with its sense in words."""
    rake = float(round(rake_deg))
    return Stria(fault, place, float(round(strike_deg)) % 360.0, float(round(dip_deg)), rake, sector_of_words(describe_rake(rake)))
