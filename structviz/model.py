"""The fault model: surfaces, what is declared of them, striae and horizons, and what was measured apart from them, in one frame."""

from __future__ import annotations

from dataclasses import dataclass

from structviz.kinematics.senses import Sector
from structviz.surfaces.surface import Surface


@dataclass(frozen=True, eq=False)
class Fault:
    """One fault: its surface and its declared movement."""

    name: str
    surface: Surface
    declared: Sector | None = None
    phase: str = ""
    down_side: str = ""  # compass word for the side that went down


@dataclass(frozen=True, eq=False)
class Horizon:
    """One horizon surface."""

    name: str
    surface: Surface


@dataclass(frozen=True)
class Stria:
    """One measured slip line on a fault."""

    fault: str
    place: tuple[float, float, float]  # easting, northing, up, m
    strike_deg: float
    dip_deg: float
    rake_deg: float
    declared: Sector | None = None
    weight: float = 1.0


@dataclass(frozen=True)
class Mechanism:
    """One earthquake by its nodal planes; which of them slipped is not known."""

    name: str
    place: tuple[float, float, float]  # easting, northing, up, m; NaN where not given
    planes: tuple[tuple[float, float, float], ...]  # one or two, each strike, dip and rake in degrees
    weight: float = 1.0


@dataclass(frozen=True)
class WellAzimuth:
    """The greatest horizontal compression measured in one well."""

    name: str
    shmax_deg: float  # azimuth from the model's north, [0, 180)
    uncertainty_deg: float  # one standard deviation
    place: tuple[float, float, float]  # easting, northing, up, m; NaN where not given


@dataclass(frozen=True)
class InputFile:
    """One file that was read, by its path relative to the model, and its SHA-256."""

    path: str
    sha256: str


@dataclass(frozen=True)
class Finding:
    """Something a reader of the model should know."""

    check: str  # key of the check, or "import"
    severity: str  # "error" | "warning" | "note"
    subject: str  # fault name, or "model"
    message: str
    evidence: tuple[tuple[str, float | int | str], ...] = ()
    hint: str = ""


@dataclass(frozen=True, eq=False)
class FaultModel:
    """Everything that was read, in metres with up positive."""

    title: str
    faults: tuple[Fault, ...]
    horizons: tuple[Horizon, ...] = ()
    striae: tuple[Stria, ...] = ()
    crs: str = ""
    inputs: tuple[InputFile, ...] = ()
    findings: tuple[Finding, ...] = ()  # what reading noticed
    mechanisms: tuple[Mechanism, ...] = ()
    azimuths: tuple[WellAzimuth, ...] = ()
    mechanisms_are: str = "independent"  # of the faults, and compared with the answer | "evidence" for it
