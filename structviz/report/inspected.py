"""An inspection for the terminal, for programs (JSON), and as a table of faults to fill in."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterator, Mapping, Sequence
from pathlib import PurePosixPath
from typing import TYPE_CHECKING, Any

from structviz.checks.registry import SEVERITIES
from structviz.inspection import Inspected, Inspection
from structviz.model import Finding
from structviz.report.names import printable
from structviz.report.results_json import azimuth, rounded
from structviz.report.terminal import counted, grid, heading, line, middle_cut, row

if TYPE_CHECKING:
    from rich.console import Console, RenderableType

COLUMNS = ("name", "surface", "sense", "rake_deg", "phase", "down_side")
LONGEST_NAME = 28
MOST_ROWS, MOST_FINDINGS = 60, 20
MARKS = {"error": "x", "warning": "!", "note": "-"}


def show_inspection(console: Console, inspection: Inspection, table: str) -> None:
    """Print what was found; `table` says where the proposed table of faults went, or how to have it."""
    for piece in _pieces(inspection):
        console.print(piece)
    console.print()
    console.print(table, soft_wrap=True)  # a command to copy is not broken into lines


def _pieces(inspection: Inspection) -> Iterator[RenderableType]:
    surfaces = inspection.surfaces
    faults = [each for each in surfaces if each.kind == "fault"]
    triangles = sum(len(each.measured.areas_m2) for each in surfaces)
    counts = [counted(len(faults), "fault")] + ([counted(len(surfaces) - len(faults), "horizon")] if len(surfaces) > len(faults) else [])
    yield line((printable(inspection.model.title, 60), "bold"), (f"  {', '.join(counts)}, {triangles:,} triangles", ""))
    low, high = inspection.low, inspection.high
    places = [f"{word} {_metres(low[k])} to {_metres(high[k])}" for k, word in enumerate(("easting", "northing", "up"))]
    yield line((", ".join(places) + " m" + (f"   {printable(inspection.model.crs, 40)}" if inspection.model.crs else ""), ""), indent=2)
    yield from heading("Surfaces")
    yield _table(surfaces[:MOST_ROWS])
    if len(surfaces) > MOST_ROWS:
        yield line((f"and {len(surfaces) - MOST_ROWS:,} more; --json lists all", ""), indent=2)
    yield from _findings(inspection.findings)


def _table(surfaces: Sequence[Inspected]) -> RenderableType:
    kilometres = max(each.along_m for each in surfaces) >= 1000
    unit, metres = ("km", 1000.0) if kilometres else ("m", 1.0)
    table = grid("left", "right", "right", "right", "left")
    row(table, *((head, "dim") for head in ("surface", "triangles", f"size, {unit}", "plane", "condition")))
    for each in surfaces:
        size = f"{each.along_m / metres:.3g} x {each.down_dip_m / metres:.3g}"
        row(table, middle_cut(each.name, LONGEST_NAME), f"{len(each.measured.areas_m2):,}", size, _plane(each), condition_words(each))
    return table


def _plane(each: Inspected) -> str:
    if each.kind == "horizon":
        return "horizon"
    return f"{each.measured.strike_deg % 360:03.0f}/{each.measured.dip_deg:02.0f}" if each.measured.meaningful else "no mean"


def _metres(value: float) -> str:
    return f"{value:,.0f}".replace(",", "\u2009")


def condition_words(each: Inspected) -> str:
    """Return in a few words what is wrong with a surface, "sound" where nothing is."""
    held = each.measured.condition
    counts = (
        (len(each.measured.parts) - 1, f"{len(each.measured.parts)} parts"),
        (held.holes, counted(held.holes, "hole")),
        (len(held.nonmanifold_edges), counted(len(held.nonmanifold_edges), "branching edge")),
        (len(held.repeated), f"{len(held.repeated):,} repeated"),
        (len(held.zero_area), f"{len(held.zero_area):,} without area"),
        (len(held.flipped), f"{len(held.flipped):,} wound backwards"),
        (held.pinched_vertices, f"pinched in {counted(held.pinched_vertices, 'point')}"),
        (int(held.not_orientable), "one-sided"),
        (held.duplicate_vertices, f"{held.duplicate_vertices:,} vertices double"),
    )
    return ", ".join(words for count, words in counts if count) or "sound"


def _findings(findings: Sequence[Finding]) -> Iterator[RenderableType]:
    if not findings:
        return
    yield from heading("Findings")
    for each in sorted(findings, key=lambda finding: SEVERITIES.index(finding.severity))[:MOST_FINDINGS]:
        subject = "" if each.subject == "model" else f"{printable(each.subject, 60)}: "
        yield line((f"{MARKS.get(each.severity, '-')}  {subject}{printable(each.message)}", ""), indent=2)
    if len(findings) > MOST_FINDINGS:
        yield line((f"and {len(findings) - MOST_FINDINGS:,} more; --json lists all", ""), indent=2)


def inspection_json(inspection: Inspection) -> str:
    """Return an inspection as JSON text, lengths in metres and angles in degrees; the same inspection gives the same bytes."""
    model = inspection.model
    held = {
        "title": model.title,
        "crs": model.crs,
        "inputs": [{"path": each.path, "sha256": each.sha256} for each in model.inputs],
        "surfaces": [_surface(each) for each in inspection.surfaces],
        "findings": [{**vars(finding), "evidence": dict(finding.evidence)} for finding in inspection.findings],
    }
    return json.dumps(held, indent=2, ensure_ascii=False) + "\n"


def _surface(each: Inspected) -> dict[str, Any]:
    measured, condition = each.measured, each.measured.condition
    plane = measured.meaningful
    return {
        "name": each.name,
        "kind": each.kind,
        "source": each.source,
        "triangles": len(measured.areas_m2),
        "vertices": len(measured.surface.vertices),
        "parts": len(measured.parts),
        "area_m2": rounded(float(measured.areas_m2.sum()), 1),
        "along_strike_m": rounded(each.along_m, 1),
        "down_dip_m": rounded(each.down_dip_m, 1),
        "low": [rounded(float(value), 2) for value in each.low],
        "high": [rounded(float(value), 2) for value in each.high],
        "strike_deg": azimuth(measured.strike_deg) if plane else None,
        "dip_deg": rounded(measured.dip_deg, 2) if plane else None,
        "no_mean_plane": measured.why_not,
        "declared": {column: value for column, value in each.declared.items() if value},
        "condition": {
            "text": condition_words(each),
            "holes": condition.holes,
            "rims": condition.rims,
            "duplicate_vertices": condition.duplicate_vertices,
            "unused_vertices": condition.unused_vertices,
            "zero_area": condition.zero_area.tolist(),
            "flipped": condition.flipped.tolist(),
            "repeated": condition.repeated.tolist(),
            "nonmanifold_edges": condition.nonmanifold_edges.tolist(),
            "pinched_vertices": condition.pinched.tolist(),
            "not_orientable": condition.not_orientable,
        },
        "history": list(measured.surface.history),
    }


def proposed_table(inspection: Inspection, paths: Mapping[str, str]) -> str:
    """Return a table of faults as CSV text, senses left to be filled in where the files declare none.

    `paths` gives for each source of the inspection the path to write, relative to the table.
    """
    written = io.StringIO()
    writer = csv.writer(written, lineterminator="\n")
    writer.writerow(COLUMNS)
    for each in inspection.surfaces:
        if each.kind == "fault":
            writer.writerow([each.name, paths[each.source], *(each.declared[column] for column in COLUMNS[2:])])
    return written.getvalue()


def relative_sources(inspection: Inspection, prefix: str) -> dict[str, str]:
    """Return the path of each source below a folder `prefix`, "" where the table stands beside the files."""
    return {each.source: str(PurePosixPath(prefix) / each.source) if prefix else each.source for each in inspection.surfaces}
