"""Fault models whose stress, slip and wrong labels are known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from structviz.errors import ArgumentError
from structviz.kinematics.senses import COMPASS_DEG, Sector, describe_rake, nearest_word, sector_of_words
from structviz.kinematics.slip import resolved_slip, shear_and_normal
from structviz.model import Fault, FaultModel
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.orientation.vectors import rotation, rotation_vectors_to_matrices
from structviz.stress.tensor import reduced_tensor
from structviz.surfaces.surface import Surface
from structviz.synthetic.shapes import Relief, relief_surface

Floats = NDArray[np.float64]

REGIMES = ("normal", "strike-slip", "reverse")
CORNER = (400_000.0, 6_500_000.0)  # south-west corner of the box, easting and northing, m
FLOOR_M, ROOF_M = -6000.0, -200.0  # no surface is meant to leave this range of up
STEEP_DEG = 80.0  # from this dip on, a dip-slip word comes with the side that went down


@dataclass(frozen=True, eq=False)
class Known:
    """A model and the truth about it; rows follow model.faults."""

    model: FaultModel
    axes: Floats  # (3, 3) unit rows sigma1, sigma2, sigma3
    shape_ratio: float
    flipped: tuple[str, ...]  # faults that declare the opposite of what they did
    true_rakes_deg: Floats  # (F,) hanging-wall slip, (-180, 180]
    kinds: tuple[str, ...]  # "conjugate" | "inherited"
    normals: Floats  # (F, 3) unit normals of the mean planes, hanging-wall side


def random_model(
    regime: str,
    *,
    faults: int = 24,
    conjugate: int = 16,
    scatter_deg: float = 6.0,
    scatter_per_axis: bool = False,
    planted: int = 4,
    tilt_deg: float = 5.0,
    triangles: int = 300,
    shape_ratio: tuple[float, float] = (0.25, 0.75),
    friction_angle_deg: float = 30.0,
    least_shear: float = 0.3,
    least_dip_deg: float = 15.0,
    fabric_deg: float | None = None,
    two_words: bool = False,
    box_m: float = 15_000.0,
    random_state: int,
) -> Known:
    """Return a random fault model under one stress, with wrong labels planted, and the truth about it.

    Parameters
    ----------
    regime : "normal", "strike-slip" or "reverse"; the axis that would be vertical leans by tilt_deg in a random direction.
    conjugate : faults of the two conjugate sets, half in each; the rest are inherited planes of random orientation.
    scatter_deg : standard deviation of the tilt of each conjugate plane. With scatter_per_axis it belongs to each of the two
        axes of tilt, which is a Fisher distribution of kappa = 1/scatter^2 [fisher1953]; otherwise it is the root mean
        square of the angle between a normal and its ideal place.
    planted : faults, of any kind, that declare the opposite of their slip.
    shape_ratio : R is drawn evenly from this range.
    least_shear, least_dip_deg : an inherited plane with less shear (share of the greatest on any plane) had no reason to
        move, and one that dips less is left out.
    fabric_deg : inherited planes follow one fabric, this far from a common plane (root mean square angle); None for all directions.
    two_words : declare an oblique slip by two words, dominant first, instead of the dominant one.
    random_state : the same number gives the same model.

    Notes
    -----
    Every slip is the shear of the true stress on the mean plane [wallace1951] [bott1959]. A dip-slip word on a plane of 80
    degrees or steeper names the side that went down; where the label is planted, so is that side.
    """
    _check(regime, faults, conjugate, planted)
    # One stream for each matter, so that planting more labels or cutting finer triangles leaves everything else as it was.
    stress, planes, labels, shapes = np.random.default_rng(random_state).spawn(4)
    axes, ratio = _random_axes(stress, regime, tilt_deg), float(stress.uniform(*shape_ratio))
    tensor = reduced_tensor(axes, ratio)
    sigma = scatter_deg if scatter_per_axis else scatter_deg / np.sqrt(2.0)
    first = _conjugate_normals(planes, axes, conjugate, friction_angle_deg, sigma)
    second = _inherited_normals(planes, tensor, faults - conjugate, least_shear, least_dip_deg, fabric_deg)
    order = planes.permutation(faults)
    normals = np.concatenate([first, second])[order]
    kinds = np.repeat(["conjugate", "inherited"], [conjugate, faults - conjugate])[order]
    rakes = rakes_deg(normals, resolved_slip(tensor, normals))
    wrong = np.isin(np.arange(faults), labels.choice(faults, planted, replace=False))
    digits = len(str(faults))
    rows = []
    for i, rng in enumerate(shapes.spawn(faults)):
        sector, down_side = declaration(normals[i], float(rakes[i]), wrong=bool(wrong[i]), two_words=two_words)
        name = f"F{i + 1:0{digits}d}"
        rows.append(Fault(name, random_surface(rng, name, normals[i], float(rakes[i]), triangles, box_m), sector, "", down_side))
    model = FaultModel(f"random {regime} model {random_state}", tuple(rows))
    flipped = tuple(fault.name for fault, bad in zip(rows, wrong) if bad)
    return Known(model, axes, ratio, flipped, rakes, tuple(str(kind) for kind in kinds), normals)


def large_model(*, faults: int = 200, triangles_each: int = 5000, random_state: int) -> Known:
    """Return a large normal-faulting model for speed: two thirds conjugate, one label in twenty planted."""
    return random_model(
        "normal",
        faults=faults,
        conjugate=2 * faults // 3,
        planted=faults // 20,
        triangles=triangles_each,
        box_m=15_000.0 * np.sqrt(faults / 24.0),
        random_state=random_state,
    )


def declaration(normal: Floats, rake_deg: float, *, wrong: bool = False, two_words: bool = False) -> tuple[Sector, str]:
    """Return the declared sector of a slip, and the side that went down for dip-slip on a steep plane, else an empty word."""
    sector = sector_of_words(describe_rake(rake_deg) if two_words else nearest_word(rake_deg))
    sector = sector.opposite() if wrong else sector
    steep = float(strike_dip_deg(normal)[1]) >= STEEP_DEG
    return sector, _down_side(normal, sector.words[0]) if steep else ""


def _down_side(normal: Floats, word: str) -> str:
    """Return the compass word towards the block that went down, empty for a strike-slip word."""
    if word not in ("normal", "reverse"):
        return ""
    towards = normal[:2] if word == "normal" else -normal[:2]
    azimuth = np.degrees(np.arctan2(towards[0], towards[1]))
    return min(COMPASS_DEG, key=lambda name: abs((azimuth - COMPASS_DEG[name] + 180.0) % 360.0 - 180.0))


def _random_axes(rng: np.random.Generator, regime: str, tilt_deg: float) -> Floats:
    """Return right-handed axes (3, 3) of a regime with a random azimuth, leaning in a random direction."""
    azimuth, lean = rng.uniform(0.0, 2 * np.pi, 2)
    level = np.array([np.sin(azimuth), np.cos(azimuth), 0.0])
    up = np.array([0.0, 0.0, 1.0])
    across = np.cross(up, level)
    rows = {"normal": (up, level, across), "strike-slip": (level, up, -across), "reverse": (level, across, up)}[regime]
    turn = rotation([np.cos(lean), np.sin(lean), 0.0], tilt_deg)
    return np.stack(rows) @ turn.T


def _conjugate_normals(rng: np.random.Generator, axes: Floats, count: int, friction_angle_deg: float, sigma_deg: float) -> Floats:
    """Return upward normals (count, 3) of planes about 45 - friction/2 either side of sigma1, tilted at random."""
    half = np.radians(45.0 - friction_angle_deg / 2.0)
    side = np.where(np.arange(count) % 2 == 0, 1.0, -1.0)[:, None]
    ideal = np.sin(half) * axes[0] + side * np.cos(half) * axes[2]
    turns = rotation_vectors_to_matrices(np.radians(rng.normal(0.0, sigma_deg, (count, 3))))
    return _upward(np.einsum("fij,fj->fi", turns, ideal))


def _inherited_normals(
    rng: np.random.Generator, tensor: Floats, count: int, least_shear: float, least_dip_deg: float, fabric_deg: float | None
) -> Floats:
    """Return upward normals (count, 3) of planes that could be moved by the stress: of all directions, or about one of them."""
    kept = np.zeros((0, 3))
    while len(kept) < count:
        tries = rng.normal(size=(64, 3))
        if fabric_deg is not None and len(kept):
            tries = kept[0] + np.radians(fabric_deg / np.sqrt(2.0)) * tries
        tries = _upward(tries / np.linalg.norm(tries, axis=1)[:, None])
        share = shear_and_normal(tensor, tries)[0] / 0.5  # the greatest shear of a reduced tensor is a half
        keep = (share >= least_shear) & (tries[:, 2] <= np.cos(np.radians(least_dip_deg)))
        kept = np.concatenate([kept, tries[keep][:1] if fabric_deg is not None and not len(kept) else tries[keep]])
    return kept[:count]


def _upward(normals: Floats) -> Floats:
    return np.where(normals[:, 2:] < 0, -normals, normals)


def random_surface(
    rng: np.random.Generator, name: str, normal: Floats, rake_deg: float, triangles: int, box_m: float, corner: tuple[float, float] = CORNER
) -> Surface:
    """Return a bent, corrugated, noisy surface of 2 to 8 km about the plane given; its corrugations run along the slip."""
    horizontal = float(np.hypot(normal[0], normal[1]))  # sine of the dip
    length = rng.uniform(2000.0, 8000.0)
    width = min(rng.uniform(0.45, 0.75) * length, 0.9 * (ROOF_M - FLOOR_M) / max(horizontal, 0.1))
    relief = Relief(
        bend_deg=float(rng.normal(0.0, 8.0)),
        curve_deg=float(rng.normal(0.0, 6.0)),
        twist_deg=float(rng.normal(0.0, 3.0)),
        corrugation_deg=float(rng.uniform(2.0, 3.0)),
        corrugation_rake_deg=rake_deg,
        wavelength_m=float(rng.uniform(0.25, 0.4) * width),
        phase_rad=float(rng.uniform(0.0, 2 * np.pi)),
        noise_deg=1.5,
        jitter=0.25,
        taper=0.45,
    )
    half_height = width * horizontal / 2
    up = rng.uniform(FLOOR_M + half_height, ROOF_M - half_height)
    centre = (*(np.array(corner) + rng.uniform(0.0, box_m, 2)), up)
    along = max(2, round(np.sqrt(triangles / 2.0 * length / width)))
    cells = (along, max(1, round(triangles / 2.0 / along)))
    wound = bool(rng.random() < 0.5)
    return relief_surface(name, normal, centre, length, width, relief, cells=cells, rng=rng, wound_to_hanging_wall=wound)


def _check(regime: str, faults: int, conjugate: int, planted: int) -> None:
    if regime not in REGIMES:
        raise ArgumentError(f"regime: found {regime!r}; wanted one of {', '.join(REGIMES)}", hint="choose one of these words")
    if not (0 <= conjugate <= faults and 0 <= planted <= faults):
        raise ArgumentError(
            f"conjugate, planted: found {conjugate}, {planted}; wanted 0 to {faults}, the number of faults",
            hint="plant no more than that",
        )
