"""The argument as HTML: what was read, the stress and how sure, what it is compared with, methods, cautions, settings, inputs."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import fields

from structviz.analysis import Analysis
from structviz.checks import CHECKS
from structviz.model import Finding
from structviz.references import REFERENCES
from structviz.report import page_words as words
from structviz.report.markup import Markup, element, given, joined, plain, table
from structviz.report.methods import methods_of, pieces, short_source, sources_of
from structviz.report.page_parts import fault_table, measures, shown_cards, why_whole
from structviz.report.page_sensitivity import sensitivity_part
from structviz.scenarios import Sensitivity
from structviz.stress.tensor import frame_angle_deg

SEVERITIES = ("error", "warning", "note")
TOLD_ALREADY = {"conflict", "undetermined", "cause-shared", "cause-of-whole-model", "conflicting-set", "many-conflicts"}  # told above
MOST_NAMES = 8


Part = tuple[str, str, str, Markup]  # key, title, name in the row of links, content


def argument(parts: Sequence[Part]) -> Markup:
    """Return the sections of the argument, numbered."""
    return joined([_section(number, key, title, body) for number, (key, title, _, body) in enumerate(parts, 1)])


def contents(parts: Sequence[Part]) -> Markup:
    """Return a row of links to the sections."""
    return element("nav", [element("a", name, href=f"#{key}") for key, _, name, _ in parts], aria_label="Sections", class_="contents")


def parts_of(analysis: Analysis, depends: Sensitivity | None = None) -> list[Part]:
    """Return the sections of the argument in order; those with nothing to say are left out."""
    cautions = element("ul", [element("li", plain(each)) for each in analysis.cautions])
    parts = [
        ("stress", "The stress, and how sure it is", "Stress", _stress(analysis)),
        ("conflicts", "The faults in conflict", "Conflicts", _conflicts(analysis)),
        ("open", "The faults that cannot be told", "Open", _open(analysis)),
        ("sensitivity", "What the answer depends on", "Sensitivity", sensitivity_part(analysis, depends)),
        ("read", "What was read, and what was noticed", "Input", _read(analysis)),
        ("every-fault", "Every fault", "Every fault", fault_table(analysis)),
        ("methods", "Methods and sources", "Methods", _methods(analysis)),
        ("cautions", "Cautions", "Cautions", cautions),
        ("settings", "Settings, limits and inputs", "Settings", _settings(analysis)),
    ]
    return [part for part in parts if part[3]]


def _section(number: int, key: str, title: str, body: Markup) -> Markup:
    heading = element("h2", element("span", str(number), class_="number"), title)
    return element("section", heading, body, id=key, class_=f"part {key}")


def _stress(analysis: Analysis) -> Markup:
    intro = element("p", f"{words.headline(analysis)}. {words.how_sure(analysis)}", class_="lead")
    found = analysis.regimes
    told = [element("p", joined(_regime_line(analysis, k))) for k in range(len(found))] if len(found) > 1 else []
    note = element("p", "Trend/plunge in degrees, each with its 95 % cone. R = (σ2 − σ3)/(σ1 − σ3).", class_="note") if found else ""
    return joined(intro, told, measures(analysis), note, _one_or_several(analysis), _readings(analysis), _comparisons(analysis))


def _one_or_several(analysis: Analysis) -> Markup:
    """Return what decided on the number of stresses, and whether the stress turns with place."""
    if analysis.answer is None:
        return Markup("")
    said = [words.typeset(analysis.answer.phases.why)] if analysis.answer.by == "phase" else []
    if analysis.by_place and analysis.by_place.turn:
        turn = analysis.by_place.turn
        ends = f"{words.azimuth(turn.first_shmax_deg, 180)}° to {words.azimuth(turn.second_shmax_deg, 180)}°"
        said.append(
            f"SHmax turns by {turn.turn_deg:.0f}° across the model, from {ends} (better than one stress by {turn.gain_nats:.0f} nats)."
        )
    elif analysis.by_place:
        said.append("No field that turns with place foretells the faults better than one stress.")
    return joined(element("h3", "One stress or several"), element("p", " ".join(said)))


def _regime_line(analysis: Analysis, number: int) -> Iterator[Markup]:
    regime = analysis.regimes[number]
    yield plain(f"({number + 1}) ")
    yield given(words.regime_name(analysis, number))
    yield plain(f": {words.kind(regime)}, SHmax {words.shmax(regime)}, {words.sureness(regime)}, {words.counted(regime.faults, 'fault')}.")


def _readings(analysis: Analysis) -> Markup:
    told = [reading for reading in analysis.readings if reading.key != "joint"]
    if not told:
        return Markup("")
    first = analysis.regimes[0] if analysis.regimes else None
    rows: list[tuple[str, ...]] = []
    for reading in told:
        carried = words.counted(reading.count, "fault" if reading.key == "senses" else "pair")
        if reading.regime is None:
            rows.append((plain(reading.title), "none", plain(reading.why_not), carried, ""))
            continue
        apart = f"{float(frame_angle_deg(reading.regime.axes, first.axes)):.0f}°" if first else "–"
        rows.append((plain(reading.title), reading.regime.kind, words.shmax(reading.regime), carried, apart))
    title = "Three readings of the same evidence" if len(told) == 3 else "Readings of the same evidence"
    intro = "Each is made without the others; the last column is how far its axes stand from the stress above."
    head = ("reading", "class", "SHmax", "carried by", "away")
    return joined(element("h3", title), element("p", intro), table(head, rows, numeric=(3, 4)))


def _comparisons(analysis: Analysis) -> Markup:
    if not analysis.comparisons:
        text = "Nothing was given to compare with: neither azimuths from wells nor earthquakes. The answer rests on the faults alone."
        return joined(element("h3", "Measured apart from the faults"), element("p", text))
    rows = [
        element("li", element("b", plain(each.title)), f" ({each.word}): ", plain(words.typeset(each.text)), class_=f"compared {each.word}")
        for each in analysis.comparisons
    ]
    return joined(element("h3", "Measured apart from the faults"), element("ul", rows))


def _conflicts(analysis: Analysis) -> Markup:
    if not analysis.conflicting:
        return joined(element("p", words.verdict_line(analysis)), why_whole(analysis))
    intro = "One card a fault, worst first. Percentages before causes are their probabilities among all causes considered."
    return joined(
        element("p", words.verdict_line(analysis), " ", intro), why_whole(analysis), element("div", shown_cards(analysis, "conflicting"))
    )


def _open(analysis: Analysis) -> Markup:
    number = sum(result.verdict.word == "undetermined" for result in analysis.faults)
    if not number:
        return Markup("")
    told = shown_cards(analysis, "undetermined")
    more = element("p", f"{number - len(told):,} more are in the table of every fault.") if number > len(told) else ""
    return joined(element("div", told), more)


def _read(analysis: Analysis) -> Markup:
    """Return what was read in numbers, what reading changed, and the findings that are not told elsewhere."""
    model = analysis.model
    parts = [
        words.counted(len(model.faults), "fault"),
        words.counted(len(model.horizons), "horizon"),
        words.counted(len(model.striae), "slip line"),
    ]
    parts += [words.counted(len(model.mechanisms), "earthquake"), words.counted(len(model.azimuths), "well")]
    some = [part for part in parts if not part.startswith("0 ")]
    frame = f" Coordinates are those of {model.crs}." if model.crs else " No coordinate system is named."
    lead = element("p", plain(f"{words.listed(some)} from {words.counted(len(model.inputs), 'file')}.{frame}"), class_="lead")
    reading = [finding for finding in analysis.findings if finding.check == "import"]
    rest = [finding for finding in analysis.findings if finding.check not in TOLD_ALREADY | {"import"}]
    repaired = _found("Noticed or repaired while reading", reading) or element("p", "Nothing had to be repaired while reading.")
    return joined(lead, repaired, _found("Noticed by the checks", rest))


def _found(title: str, findings: Sequence[Finding]) -> Markup:
    """Return findings under a heading: those on the model one by one, those on faults gathered by check, worst first."""
    if not findings:
        return Markup("")
    groups: dict[tuple[str, str, str], list[Finding]] = defaultdict(list)
    for finding in findings:
        single = finding.message if finding.subject == "model" or finding.check == "import" else ""
        groups[(finding.severity, finding.check, single)].append(finding)
    order = sorted(groups.items(), key=lambda entry: (SEVERITIES.index(entry[0][0]), entry[1][0].subject != "model", entry[0][1]))
    return joined(element("h3", title), element("ul", [_finding(severity, group) for (severity, _, _), group in order], class_="findings"))


def _finding(severity: str, group: Sequence[Finding]) -> Markup:
    first = group[0]
    word = element("span", severity, class_=f"severity {severity}")
    hint = element("em", plain(words.typeset(first.hint))) if first.hint else ""
    if first.subject == "model":
        return element("li", word, plain(words.typeset(first.message)), " ", hint)
    names = joined([joined(", " if place else "", given(finding.subject)) for place, finding in enumerate(group[:MOST_NAMES])])
    more = f" and {len(group) - MOST_NAMES:,} more" if len(group) > MOST_NAMES else ""
    title = CHECKS[first.check].title if first.check in CHECKS and len(group) > 1 else first.message
    return element("li", word, names, more, ": ", plain(words.typeset(title)), " ", hint)


def _methods(analysis: Analysis) -> Markup:
    steps = [element("li", element("b", f"{method.title}. "), _cited(method.text)) for method in methods_of(analysis)]
    sources = [element("li", plain(REFERENCES[key]), id=f"source-{key}") for key in sources_of(analysis)]
    return joined(element("ul", steps, class_="methods"), element("h3", "Sources"), element("ul", sources, class_="sources"))


def _cited(text: str) -> Markup:
    shown = [plain(said) if said else element("a", f"({short_source(key)})", href=f"#source-{key}") for said, key in pieces(text)]
    return joined(shown)


def _settings(analysis: Analysis) -> Markup:
    chosen = [
        (item.metadata["help"], f"{getattr(analysis.settings, item.name):g}", item.metadata["unit"]) for item in fields(analysis.settings)
    ]
    limits = [(plain(CHECKS[key].title), f"{value:g}", plain(CHECKS[key].unit)) for key, value in analysis.limits.items() if key in CHECKS]
    inputs = [(given(each.path), element("code", each.sha256)) for each in analysis.model.inputs]
    made = element(
        "p", f"Made by structviz {analysis.version}. The same files and settings give the same page, byte for byte.", class_="note"
    )
    return joined(
        table(("setting", "value", "unit"), chosen, numeric=(1,), class_="settings"),
        element(
            "details", element("summary", f"Limits of the {len(limits)} checks"), table(("check", "limit", "unit"), limits, numeric=(1,))
        ),
        element("h3", "Inputs"),
        table(("file", "SHA-256"), inputs, class_="inputs") if inputs else element("p", "The model was made in memory; no file was read."),
        made,
    )
