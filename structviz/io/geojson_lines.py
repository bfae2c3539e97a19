"""Lines from GeoJSON (RFC 7946; a `crs` member of the edition of 2008 is honoured)."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError
from structviz.io.geographic import named_system
from structviz.io.lines import LineFeature, LineSet

Floats = NDArray[np.float64]


def read_geojson(content: bytes, file: str) -> LineSet:
    """Return the lines of a GeoJSON collection; FormatError where it is none."""
    tree = _parsed(content, file)
    found, other = [], 0
    for number, feature in enumerate(tree["features"], 1):
        properties = feature.get("properties") if isinstance(feature, dict) else None
        geometry = feature.get("geometry") if isinstance(feature, dict) else None
        kind, places = (geometry.get("type"), geometry.get("coordinates")) if isinstance(geometry, dict) else (None, None)
        if not isinstance(properties, dict) or kind not in ("LineString", "MultiLineString") or not isinstance(places, list):
            other += 1
            continue
        where = f"{file}, feature {number}"
        lines = tuple(_line(line, where) for line in (places if kind == "MultiLineString" else [places]))
        found.append(LineFeature(where, f"{file}#{number}", properties, lines))
    return LineSet(file, tuple(found), named_system(tree, file) or "OGC:CRS84", other)


def _parsed(content: bytes, file: str) -> dict[str, Any]:
    def refuse(word: str) -> float:
        raise ValueError(f"{word}, which is no JSON")

    try:
        tree = json.loads(content.decode("utf-8-sig"), parse_constant=refuse)
    except (ValueError, RecursionError) as error:
        raise FormatError(file, f"text that is not JSON ({error})"[:200], "a GeoJSON FeatureCollection", hint="export it again") from None
    if not isinstance(tree, dict) or tree.get("type") != "FeatureCollection" or not isinstance(tree.get("features"), list):
        raise FormatError(file, "JSON of another kind", "a GeoJSON FeatureCollection", hint="export the traces as a FeatureCollection")
    return tree


def _line(places: Any, where: str) -> Floats:
    """Return longitude, latitude (or easting, northing) and height, 0 where there is none, of each point of a line."""
    try:
        line = np.array([[float(p[0]), float(p[1]), float(p[2]) if len(p) > 2 else 0.0] for p in places], float)
    except (TypeError, ValueError, IndexError, KeyError, OverflowError):
        raise FormatError(where, "coordinates that are not pairs of numbers", "pairs of numbers", hint="export the trace again") from None
    if line.ndim != 2 or not np.isfinite(line).all():
        raise FormatError(where, "a line without points, or with numbers that are not finite", "finite points", hint="export it again")
    return line
