"""The summary for the terminal: which regime, how sure, which faults conflict and why; the rest after that.

Names and messages come from users' files: they are laid out as plain text, never as markup, without control characters.
"""

from __future__ import annotations

import re
from collections import Counter, defaultdict
from collections.abc import Iterable, Iterator, Sequence
from typing import TYPE_CHECKING, NamedTuple

from structviz.analysis import Analysis, FaultResult
from structviz.checks import CHECKS
from structviz.kinematics.senses import describe_rake
from structviz.model import Finding
from structviz.orientation.lines import trend_plunge_deg
from structviz.report.names import printable
from structviz.report.terminal import counted, grid, heading, line, middle_cut, row
from structviz.report.write import Written
from structviz.scenarios import TITLES, Sensitivity
from structviz.stress.regime import Regime
from structviz.stress.tensor import frame_angle_deg

if TYPE_CHECKING:
    from rich.console import Console, RenderableType
    from rich.table import Table

MOST_CONFLICTS = 12
MOST_ROWS = 5  # of reasons, findings of the model, kinds of findings
MOST_STEPS = 3  # causes whose next step is told under the conflicts
LEAST_NAME = 16  # columns kept for names on a narrow terminal
POINTS = ("N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW")
LOOSE_DEG = 30.0  # a regime with a wider cone is called poorly determined
FAR_DEG = 30.0  # a reading further than this from the stress that is followed is marked
TOLD_ALREADY = {
    "conflict",
    "undetermined",
    "no-regime",
    "shape-ratio-open",
    "wells-differ",
    "mechanisms-differ",
}  # checks whose findings the lines above them tell
MARKS = {"error": ("!", "bold red"), "warning": ("!", "yellow"), "note": ("-", "dim")}
NUMBER = re.compile(r"\d+(?:\.\d+)?")
COLOUR = {"conflicting": "bold red", "consistent": "green", "undetermined": "yellow"}
SHORT_CAUTION = "A screening aid: it tests geometry against declared movement, not stress magnitude, stability or hazard."


def show(console: Console, analysis: Analysis, written: Written | None = None, depends: Sensitivity | None = None) -> None:
    """Print the summary of an analysis to a rich console, in about 40 lines or fewer."""
    with console.capture() as captured:
        for block in blocks(analysis, written, console.width, depends):
            console.print(block)
    lines = captured.get().splitlines()
    console.file.write("\n".join(line.rstrip() for line in lines) + "\n")


def blocks(analysis: Analysis, written: Written | None, width: int, depends: Sensitivity | None = None) -> Iterator[RenderableType]:
    """Return the pieces of the summary in order."""
    yield from _head(analysis)
    yield from _readings(analysis)
    yield from _compared(analysis)
    yield from _conflicts(analysis, width)
    yield from _others(analysis)
    yield from _depends(analysis, depends)
    yield from _findings(analysis, width)
    yield line(("", ""))
    yield line((SHORT_CAUTION, "dim italic"))
    yield from _where(written)


def _head(analysis: Analysis) -> Iterator[RenderableType]:
    triangles = sum(len(result.measured.areas_m2) for result in analysis.faults)
    title = printable(analysis.model.title or "untitled", 60)
    yield line((title, "bold"), (f"  {counted(len(analysis.faults), 'fault')}, {counted(triangles, 'triangle')}", "dim"))
    yield line(("", ""))
    if not analysis.regimes:
        why = next((f": {printable(reading.why_not)}" for reading in analysis.readings if reading.key == "joint" and reading.why_not), "")
        yield line(("No stress could be inferred", "bold yellow"), (f"{why}.", ""), indent=2)
        return
    for regime in analysis.regimes:
        share = f"   {printable(regime.name, 30)}, {counted(regime.faults, 'fault')}" if len(analysis.regimes) > 1 else ""
        loose = "   poorly determined" if max(regime.cones_deg) > LOOSE_DEG else ""
        kind, azimuth = (f"{regime.kind.upper()} stress", "bold cyan"), (f"   SHmax {_shmax(regime)}", "bold")
        yield line(kind, azimuth, (loose, "bold yellow"), (share, "dim"), indent=2)
        yield _axes(regime)
        yield line((_ratio(regime), "dim"), indent=2)


def _shmax(regime: Regime) -> str:
    azimuth = round(regime.shmax_deg) % 180
    point = round(azimuth / 22.5) % 8
    ends = (POINTS[point], POINTS[point + 8]) if point <= 4 else (POINTS[point + 8], POINTS[point])  # NW-SE rather than SE-NW
    return f"{azimuth:03d} ± {regime.shmax_half_width_deg:.0f}° ({'-'.join(ends)})"


def _axes(regime: Regime) -> RenderableType:
    trends, plunges = trend_plunge_deg(regime.axes)
    shown = [f"sigma{k + 1} {round(float(trends[k])) % 360:03d}/{float(plunges[k]):02.0f} ± {regime.cones_deg[k]:.0f}°" for k in range(3)]
    return line(("   ".join(shown), ""), indent=2)


def _ratio(regime: Regime) -> str:
    ratio = regime.shape_ratio
    if ratio is None:
        return "Trend/plunge ± 95 % cone. R is not resolved: predictions cover all of it."
    return f"Trend/plunge ± 95 % cone. R = {ratio.value:.2f} ({ratio.low:.2f} to {ratio.high:.2f}), resolved by the data."


def _readings(analysis: Analysis) -> Iterator[RenderableType]:
    """Return the readings of the evidence beside each other, and how far the axes of each stand from the stress that is followed."""
    told = [reading for reading in analysis.readings if reading.key != "joint"]
    if not told:
        return
    yield from heading("Three readings of the evidence" if len(told) == 3 else "Readings of the evidence")
    table = grid("left", "left", "left", "right", "right")
    for reading in told:
        if reading.regime is None:
            continue
        followed = analysis.regimes[0] if analysis.regimes else None
        apart = float(frame_angle_deg(reading.regime.axes, followed.axes)) if followed else None
        far = "bold yellow" if apart is not None and apart > FAR_DEG else ""
        carried = counted(reading.count, "fault" if reading.key == "senses" else "pair")
        off = "" if apart is None else f"{apart:.0f}° away"
        row(table, reading.title, reading.regime.kind, _shmax(reading.regime), carried, (off, far))
    yield table
    for reading in told:
        if reading.regime is None:
            yield line((f"{reading.title}: none; {printable(reading.why_not)}", "dim"), indent=2)


def _compared(analysis: Analysis) -> Iterator[RenderableType]:
    """Return what wells and earthquakes say of the stress."""
    if not analysis.comparisons:
        return
    yield from heading("Measured apart from the faults")
    for each in analysis.comparisons:
        yield line((printable(each.text, 400), "bold yellow" if each.word == "differs" else ""), indent=2)


def _conflicts(analysis: Analysis, width: int) -> Iterator[RenderableType]:
    found = sorted(
        analysis.conflicting, key=lambda r: (-round(r.verdict.conflict_probability or 0, 2), -(r.verdict.misfit_deg or 0), r.fault.name)
    )
    total = len(analysis.faults)
    judged = sum(result.verdict.word != "undetermined" for result in analysis.faults)
    if not judged:
        yield from heading("No fault could be judged", COLOUR["undetermined"])
    elif not found:
        yield from heading(f"None of the {counted(judged, 'judged fault')} conflicts with the others", COLOUR["consistent"])
    else:
        verb = "conflicts" if len(found) == 1 else "conflict"
        yield from heading(f"{len(found)} of {counted(total, 'fault')} {verb} with the others", COLOUR["conflicting"])
        yield _conflict_table(found[:MOST_CONFLICTS], width)
        yield from _next_steps(found[:MOST_CONFLICTS])
    if len(found) > MOST_CONFLICTS:
        yield line((f"and {len(found) - MOST_CONFLICTS} more, in faults.csv and results.json", "dim"), indent=2)


def _conflict_table(found: Sequence[FaultResult], width: int) -> Table:
    """Return one line a conflicting fault: declared, predicted, how sure, how far off, and the likeliest cause."""
    senses = [(_declared(result), _predicted(result)) for result in found]
    wide = sum(max(len(pair[k]) for pair in [*senses, ("declared", "predicted")]) for k in (0, 1))
    name = max(LEAST_NAME, width - wide - 36)
    table = grid("left", "left", "left", "right", "right", "left")
    row(table, *((text, "dim") for text in ("fault", "declared", "predicted", "prob.", "off", "likely cause")))
    for result, (declared, predicted) in zip(found, senses):
        verdict = result.verdict
        cause = verdict.causes[0].key.replace("_", " ") if verdict.causes else "none found"
        shown, sure = (middle_cut(result.fault.name, name), "bold"), f"{100 * (verdict.conflict_probability or 0):.0f} %"
        row(table, shown, declared, (predicted, "red"), sure, f"{verdict.misfit_deg or 0:.0f}°", cause)
    return table


def _next_steps(found: Sequence[FaultResult]) -> Iterator[RenderableType]:
    """Return what to do next for the commonest likely causes of the faults shown, each told once."""
    first = [result.verdict.causes[0] for result in found if result.verdict.causes]
    steps = {cause.key: cause.next_step for cause in first if cause.next_step}
    for key, _ in Counter(cause.key for cause in first if cause.next_step).most_common(MOST_STEPS):
        yield line((f"{key.replace('_', ' ')}: ", "bold"), (steps[key], "dim"), indent=2)


def _declared(result: FaultResult) -> str:
    return result.fault.declared.text if result.fault.declared else "-"


def _predicted(result: FaultResult) -> str:
    rake = result.verdict.predicted_rake_deg
    return "-" if rake is None else describe_rake(rake)


def _others(analysis: Analysis) -> Iterator[RenderableType]:
    """Return how many are consistent, and why the undetermined ones are."""
    words = Counter(result.verdict.word for result in analysis.faults)
    if words["consistent"]:
        yield line((f"{words['consistent']} consistent", COLOUR["consistent"]), (" with the others.", ""))
    unknown = [result for result in analysis.faults if result.verdict.word == "undetermined"]
    if not unknown:
        return
    yield line((f"{words['undetermined']} undetermined", COLOUR["undetermined"]), (":", ""))
    ranked = _by_reason(unknown)
    table = grid("right", "left")
    for reason, names in ranked[:MOST_ROWS]:
        row(table, str(len(names)), f"{reason}: {_listed(names)}" if len(names) < len(analysis.faults) else reason)
    rest = sum(len(names) for _, names in ranked[MOST_ROWS:])
    if rest:
        row(table, str(rest), "for other reasons")
    yield table


def _depends(analysis: Analysis, depends: Sensitivity | None) -> Iterator[RenderableType]:
    """Return what carries the stress, and which verdicts hang on a choice."""
    if depends is None:
        return
    yield from heading("What carries the stress")
    for regime, carried in zip(analysis.regimes, depends.influence):
        turns = carried.turn_deg.max(1)
        heavy = [int(k) for k in (-turns).argsort(kind="stable")[:3] if turns[k] > 0]
        told = ", ".join(f"{middle_cut(analysis.faults[k].fault.name, 28)} ({turns[k]:.1f}°)" for k in heavy)
        of = f"{printable(regime.name, 28)}: " if len(analysis.regimes) > 1 else ""
        yield line((f"{of}the axes turn most without {told}" if told else f"{of}no single fault turns it", ""), indent=2)
    yield from heading("What the verdicts depend on")
    if not depends.dependences:
        yield line(("no verdict changes with friction angle, R, scale or the fault that carries most", ""), indent=2)
    for key, title in TITLES.items():
        names = [each.fault for each in depends.dependences if key in each.on]
        if names:
            tried = [each for each in depends.scenarios if each.key == key]
            at = ", ".join(each.text for each in tried if any(each.words.get(n) != depends.base.words[n] for n in names))
            yield line((f"on {title} ({printable(at, 80)}): ", "yellow"), (_listed(names, 5), ""), indent=2)


def _by_reason(results: Iterable[FaultResult]) -> list[tuple[str, list[str]]]:
    """Return reasons with the faults they hold for, commonest first; reasons that differ only in their numbers are one."""
    groups: dict[str, list[tuple[str, str]]] = defaultdict(list)
    for result in results:
        reason = printable(result.verdict.reasons[0]) if result.verdict.reasons else "no reason given"
        short = re.sub(r" \([^()]*\)", "", reason)
        groups[NUMBER.sub("#", short)].append((short, result.fault.name))
    rows = [(_ranged([short for short, _ in found]), [name for _, name in found]) for found in groups.values()]
    return sorted(rows, key=lambda row: (-len(row[1]), row[0]))


def _ranged(texts: Sequence[str]) -> str:
    """Return texts that differ only in their numbers as one, each number as the range it goes over.

    >>> _ranged(["dips 86 deg", "dips 90 deg", "dips 88 deg"])
    'dips 86-90 deg'
    """
    columns = zip(*(NUMBER.findall(text) for text in texts))
    ends = [(min(column, key=float), max(column, key=float)) for column in columns]
    ranges = iter([low if low == high else f"{low}-{high}" for low, high in ends])
    return NUMBER.sub(lambda found: next(ranges), texts[0])


def _listed(names: Sequence[str], most: int = 3) -> str:
    longest = 28 if len(names) > 2 else 44
    shown = ", ".join(middle_cut(name, longest) for name in names[:most])
    return shown if len(names) <= most else f"{shown} and {len(names) - most} more"


def _findings(analysis: Analysis, width: int) -> Iterator[RenderableType]:
    """Return the findings on the whole model one by one, and those on single faults as counts by check."""
    told = [finding for finding in analysis.findings if finding.check not in TOLD_ALREADY]
    whole = [finding for finding in told if finding.subject == "model" and finding.severity != "note"]
    notes = [finding for finding in told if finding.subject == "model" and finding.severity == "note"]
    rest = list(_by_check(finding for finding in told if finding.subject != "model"))
    if not told:
        return
    yield from heading("Findings")
    table = grid("left", "left")
    lines = 3 if len(whole) <= 2 else 2
    for finding in whole[:MOST_ROWS]:
        row(table, MARKS[finding.severity], _cut(printable(finding.message), lines * (width - 9)))
    for severity, text in rest[:MOST_ROWS]:
        row(table, MARKS[severity], text)
    left = max(0, len(whole) - MOST_ROWS) + max(0, len(rest) - MOST_ROWS)
    more = [
        text
        for text in (counted(left, "more kind") if left else "", counted(len(notes), "note") + " on the model" if notes else "")
        if text
    ]
    if more:
        row(table, MARKS["note"], (f"{' and '.join(more)}, in results.json", "dim"))
    yield table


def _cut(text: str, most: int) -> str:
    """Return a text cut at the end of a word where it is longer than `most`; results.json holds all of it."""
    return text if len(text) <= most else text[: most - 1].rsplit(" ", 1)[0] + "…"


class _Group(NamedTuple):
    severity: str
    text: str


def _by_check(findings: Iterable[Finding]) -> Iterator[_Group]:
    """Return one text a check, worst and most frequent first."""
    groups: dict[tuple[str, str], list[str]] = defaultdict(list)
    for finding in findings:
        groups[(finding.severity, finding.check)].append(finding.subject)
    order = list(MARKS)
    for (severity, key), names in sorted(groups.items(), key=lambda item: (order.index(item[0][0]), -len(item[1]), item[0][1])):
        title = CHECKS[key].title if key in CHECKS else "while reading"
        yield _Group(severity, f"{title}: {_listed(names, 2) if len(names) < 3 else counted(len(names), 'fault')}")


def _where(written: Written | None) -> Iterator[RenderableType]:
    if written is None:
        yield line(("Nothing was written: add --out DIR for tables, annotated meshes and pictures.", "dim"))
        return
    meshes = sum(name.startswith("faults/") for name in written.files)
    plain = [name for name in written.files if not name.startswith("faults/")]
    inside = f"{', '.join(plain)}, and {meshes:,} mesh{'' if meshes == 1 else 'es'} in faults/"
    yield line(("Written to ", ""), (printable(str(written.folder)), "bold"), (f": {inside}", ""))
    for reason in written.skipped:
        yield line((printable(reason), "yellow"))
