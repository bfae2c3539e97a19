"""Earthquake mechanisms from a CSV table or from QuakeML: one or both nodal planes of each."""

from __future__ import annotations

import io
import math
import warnings
from pathlib import PurePath
from typing import Any

import numpy as np

from structviz.errors import FormatError
from structviz.io.places import NO_PLACE, place_of
from structviz.io.tables import Row, number, read_table, required
from structviz.io.units import Frame
from structviz.model import Mechanism
from structviz.stress.mechanisms import nodal_planes_deg, pbt_axes, pbt_of_moment, tensor_of_up_south_east
from structviz.stress.tensor import frame_angle_deg

Plane = tuple[float, float, float]  # strike, dip, rake, degrees

FIRST = ("strike_deg", "dip_deg", "rake_deg")
SECOND = ("strike2_deg", "dip2_deg", "rake2_deg")
COLUMNS = (*FIRST, *SECOND, "name", "easting", "northing", "up", "depth", "weight")
# Columns of catalogues that are taken for ours: left what they are called there. Nothing else is guessed.
ALIASES = {
    "S1": "strike_deg", "D1": "dip_deg", "R1": "rake_deg", "S2": "strike2_deg", "D2": "dip2_deg", "R2": "rake2_deg", "ID": "name",
}  # fmt: skip
APART_DEG = 5.0  # planes that make mechanisms further apart than this are told: one of them is misprinted
QUAKEML = (".xml", ".quakeml", ".qml")


def read_mechanisms(content: bytes, file: str, frame: Frame) -> tuple[tuple[Mechanism, ...], tuple[str, ...]]:
    """Return the mechanisms of a file, places in metres with up positive, and what should be told about them.

    A name that ends in .xml, .quakeml or .qml is QuakeML, any other a CSV table. Raises TableError or FormatError,
    also for QuakeML where ObsPy is not installed.
    """
    if PurePath(file).suffix.lower() in QUAKEML:
        return from_quakeml(content, file)
    return from_table(content, file, frame)


def from_table(content: bytes, file: str, frame: Frame) -> tuple[tuple[Mechanism, ...], tuple[str, ...]]:
    """Return the mechanisms of a CSV table and what should be told; TableError where a number is missing or out of range."""
    table = read_table(content, file, FIRST, COLUMNS, ALIASES)
    found = tuple(mechanism_of(row, frame) for row in table.rows)
    told = [f"{file}: columns {', '.join(table.unknown)} are not used"] if table.unknown else []
    return found, (*told, *misfits(found, [f"{file}, {row.where}" for row in table.rows]))


def mechanism_of(row: Row, frame: Frame) -> Mechanism:
    """Return the mechanism of one row; TableError for a missing number, half a second plane, or one out of range."""
    planes = [plane_of(row, FIRST)]
    if any(row.text(column) for column in SECOND):
        planes.append(plane_of(row, SECOND))
    weight = number(row, "weight", 0.0)
    return Mechanism(row.text("name") or row.where, place_of(row, frame), tuple(planes), 1.0 if weight is None else weight)


def plane_of(row: Row, columns: tuple[str, str, str]) -> Plane:
    """Return strike [0, 360), dip and rake (-180, 180] of one nodal plane of a row, degrees; catalogues write rakes to 360 as well."""
    strike, dip, rake = columns
    return wrapped(required(row, strike, -360.0, 360.0), required(row, dip, 0.0, 90.0), required(row, rake, -180.0, 360.0))


def wrapped(strike_deg: float, dip_deg: float, rake_deg: float) -> Plane:
    """Return a plane with its strike in [0, 360) and its rake in (-180, 180]."""
    return strike_deg % 360.0, dip_deg, 180.0 - (180.0 - rake_deg) % 360.0


def misfits(found: tuple[Mechanism, ...], where: list[str]) -> tuple[str, ...]:
    """Return words about each mechanism whose two planes do not belong together."""
    both = [row for row, each in enumerate(found) if len(each.planes) == 2]
    if not both:
        return ()
    angles = np.array([found[row].planes for row in both])
    axes = pbt_axes(*np.moveaxis(angles, -1, 0))
    apart = frame_angle_deg(axes[:, 0], axes[:, 1])
    return tuple(
        f"{where[row]}: its planes make mechanisms {off:.0f} degrees apart, so they are not one earthquake's"
        for row, off in zip(both, apart)
        if off > APART_DEG
    )


def from_quakeml(content: bytes, file: str) -> tuple[tuple[Mechanism, ...], tuple[str, ...]]:
    """Return the preferred mechanism of each event that has one, without a place, and how many events have none.

    QuakeML gives latitude and longitude, which are not the coordinates of a model; structviz does not project them.
    """
    events = events_of(content, file)
    found = []
    for event in events:
        chosen = event.preferred_focal_mechanism() or next(iter(event.focal_mechanisms), None)
        planes = None if chosen is None else planes_of(chosen, f"{file}, event {name_of(event)}")
        if planes:
            found.append(Mechanism(name_of(event), NO_PLACE, planes))
    if not found:
        hint = "ask the catalogue for mechanisms or moment tensors, not for origins alone"
        raise FormatError(file, f"{len(events)} events without a mechanism", "nodal planes or moment tensors", hint=hint)
    told = [f"{file}: {len(events) - len(found)} of {len(events)} events have no mechanism"] if len(found) < len(events) else []
    return tuple(found), (*told, *misfits(tuple(found), [f"{file}, event {each.name}" for each in found]))


def events_of(content: bytes, file: str) -> list[Any]:
    """Return ObsPy's events; FormatError where it cannot read them, or is not installed."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of ObsPy about its own libraries
            from obspy import read_events
    except ImportError:
        hint = "install structviz with the extra 'quakes', or give the mechanisms as a CSV table"
        raise FormatError(file, "QuakeML, which needs ObsPy", "ObsPy to be installed", hint=hint) from None
    if b"<!DOCTYPE" in content:  # entities could name other files, or grow without end
        raise FormatError(file, "a document type declaration", "QuakeML, which has none", hint="download the catalogue again")
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return list(read_events(io.BytesIO(content), format="QUAKEML"))
    except Exception as error:  # ObsPy and lxml raise many kinds for damaged input
        raise FormatError(file, f"a file that is not QuakeML ({error})", "QuakeML 1.2", hint="download the catalogue again") from None


def name_of(event: Any) -> str:
    """Return the last part of the identifier of an event."""
    return str(event.resource_id).replace("=", "/").rstrip("/").rsplit("/", 1)[-1]


def planes_of(chosen: Any, where: str) -> tuple[Plane, ...]:
    """Return the nodal planes of an ObsPy mechanism, from its moment tensor where no planes are given; () where neither is."""
    nodal = chosen.nodal_planes
    given = [] if nodal is None else [plane for plane in (nodal.nodal_plane_1, nodal.nodal_plane_2) if plane is not None]
    planes = [(plane.strike, plane.dip, plane.rake) for plane in given]
    complete = [checked(plane, where) for plane in planes if None not in plane]
    return tuple(complete) if complete else planes_of_tensor(chosen.moment_tensor)


def checked(plane: Plane, where: str) -> Plane:
    """Return a nodal plane with its angles wrapped; FormatError where one is out of range."""
    strike, dip, rake = (float(angle) for angle in plane)
    if not all(map(math.isfinite, plane)) or abs(strike) > 360.0 or not 0.0 <= dip <= 90.0 or not -180.0 <= rake <= 360.0:
        found = f"a nodal plane with strike {strike:g}, dip {dip:g}, rake {rake:g}"
        wanted = "strike -360 to 360, dip 0 to 90, rake -180 to 360"
        raise FormatError(where, found, wanted, hint="correct that plane, or delete the event")
    return wrapped(strike, dip, rake)


def planes_of_tensor(moment: Any) -> tuple[Plane, ...]:
    """Return both nodal planes of the double couple nearest to an ObsPy moment tensor; () where there is no complete tensor."""
    tensor = None if moment is None else moment.tensor
    parts = [] if tensor is None else [tensor.m_rr, tensor.m_tt, tensor.m_pp, tensor.m_rt, tensor.m_rp, tensor.m_tp]
    if not parts or None in parts or not any(parts):
        return ()
    axes, _ = pbt_of_moment(tensor_of_up_south_east(np.array(parts) / np.abs(parts).max()))
    strike, dip, rake = nodal_planes_deg(axes)
    return tuple((float(s), float(d), float(r)) for s, d, r in zip(strike, dip, rake))
