"""The working part of the page as HTML: the answer, the list of faults, and the record of each."""

from __future__ import annotations

from collections.abc import Iterable

from structviz.analysis import Analysis, FaultResult
from structviz.report import page_words as words
from structviz.report.markup import Markup, element, given, joined, plain, table

GROUPS = {"conflicting": "In conflict with the others", "undetermined": "Cannot be told", "consistent": "Fit the others"}
MOST_CARDS = 40  # undetermined faults beyond these are told in the table alone
LEAST_MEMBERSHIP = 0.005  # a phase less likely than this is not told
ABOUT_WHOLE = ("cause-shared", "cause-of-whole-model", "conflicting-set", "many-conflicts")  # checks that say why faults conflict


def mark(word: str) -> Markup:
    """Return the line that stands for a verdict, drawn as on the net: by width and dash as well as colour."""
    return element("span", class_=f"mark {word}", aria_hidden="true")


def answer(analysis: Analysis) -> Markup:
    """Return which regime, how sure, how many faults are wrong, and what they may share."""
    triangles = sum(len(result.measured.areas_m2) for result in analysis.faults)
    about = [words.counted(len(analysis.faults), "fault"), words.counted(triangles, "triangle")]
    title = element("p", given(analysis.model.title or "Untitled model"), element("span", " · ".join(about)), class_="kicker")
    said = element("p", element("strong", words.verdict_line(analysis)), " ", words.how_sure(analysis), class_="said")
    return joined(element("div", title, element("h1", words.headline(analysis)), said, class_="told"), measures(analysis))


def measures(analysis: Analysis) -> Markup:
    """Return the axes of each regime in numbers, with their shape ratio."""
    return element("div", [_measures(analysis, number) for number in range(len(analysis.regimes))], class_="measures")


def _measures(analysis: Analysis, number: int) -> Markup:
    regime = analysis.regimes[number]
    rows = [(element("i", name), where, cone) for name, where, cone in words.axes(regime)]
    several = len(analysis.regimes) > 1
    name = joined(f"({number + 1}) ", given(words.regime_name(analysis, number)), f", {words.counted(regime.faults, 'fault')}")
    caption = element("caption", name) if several else ""
    body = [element("tr", [element("td", cell) for cell in row]) for row in rows]
    last = element("tr", element("td", element("i", "R")), element("td", words.ratio(regime), colspan=2))
    return element("table", caption, element("tbody", body, last), class_="axes", aria_label="Principal axes")


def why_whole(analysis: Analysis) -> Markup:
    """Return what the conflicts have in common, as found; what to do where nothing is found wrong."""
    told = [finding for finding in analysis.findings if finding.check in ABOUT_WHOLE and finding.subject == "model"]
    if not told:
        return Markup("")
    rows = [
        element("li", plain(words.typeset(finding.message)), " ", element("em", plain(words.typeset(finding.hint)))) for finding in told
    ]
    return element("ul", rows, class_="shared")


def ordered(analysis: Analysis) -> list[tuple[int, FaultResult]]:
    """Return the faults with their rows, worst first."""
    return sorted(enumerate(analysis.faults), key=lambda entry: words.severity(entry[1]))


def fault_list(analysis: Analysis) -> Markup:
    """Return the list of faults: one group a verdict, worst first."""
    rows = ordered(analysis)
    groups = []
    for word, heading in GROUPS.items():
        members = [(row, result) for row, result in rows if result.verdict.word == word]
        if members:
            groups.append(_group(word, heading, members))
    return joined(groups)


def _group(word: str, heading: str, members: Iterable[tuple[int, FaultResult]]) -> Markup:
    rows = [_list_row(row, result) for row, result in members]
    count = element("span", f"{len(rows):,}", class_="count")
    hide = element(
        "button", "hide", type="button", class_="hide", data_group=word, aria_pressed="false", aria_label=f"Hide in 3D: {heading}"
    )
    return element("section", element("h3", mark(word), heading, " ", count, hide), element("ul", rows), class_="group", data_word=word)


def _list_row(row: int, result: FaultResult) -> Markup:
    verdict, name = result.verdict, result.fault.name
    pieces = [element("span", given(name), class_="name")]
    if verdict.conflict_probability is not None and verdict.word != "consistent":
        pieces.append(element("span", words.percent(verdict.conflict_probability), class_="chance"))
    pieces.append(element("span", _in_short(result), class_="short"))
    if verdict.word != "consistent" and verdict.causes:
        pieces.append(element("span", verdict.causes[0].key.replace("_", " "), class_="cause"))
    return element("li", element("button", pieces, type="button", class_="fault", data_fault=row, tabindex=-1))


def _in_short(result: FaultResult) -> str:
    verdict = result.verdict
    said = words.declared(result)
    if verdict.word == "consistent":
        return said
    return f"{said}, predicted {words.predicted(result)}" if verdict.predicted_rake_deg is not None else said


def cards(analysis: Analysis, word: str) -> list[Markup]:
    """Return a card for each fault of a verdict, worst first."""
    return [card(analysis, row, result) for row, result in ordered(analysis) if result.verdict.word == word]


def shown_cards(analysis: Analysis, word: str) -> list[Markup]:
    """Return the cards of a verdict that stand in the argument: all that conflict, the first of those that cannot be told."""
    return cards(analysis, word)[: {"conflicting": None, "undetermined": MOST_CARDS, "consistent": 0}[word]]


def other_cards(analysis: Analysis) -> list[Markup]:
    """Return the cards that stand nowhere in the argument and wait for a fault to be chosen."""
    return [*cards(analysis, "undetermined")[MOST_CARDS:], *cards(analysis, "consistent")]


def card(analysis: Analysis, row: int, result: FaultResult) -> Markup:
    """Return everything that is known of one fault on one card, with the same as plain text for a mail."""
    verdict = result.verdict
    head = element("h3", mark(verdict.word), given(result.fault.name), " ", element("span", verdict.word, class_=f"word {verdict.word}"))
    copy = element("button", "Copy as text", type="button", class_="copy", data_copy=row)
    text = element("pre", plain_lines(words.card_text(result, analysis)), hidden=True, class_="as-text")
    parts = (head, _facts(analysis, result), _reasons(result), _causes(result), copy, text)
    return element("article", parts, class_="card", data_fault=row, id=f"fault-{row}")


def plain_lines(text: str) -> Markup:
    """Return text of several lines as HTML: each line made safe, the breaks kept."""
    return Markup("\n".join(plain(line) for line in text.split("\n")))


def _facts(analysis: Analysis, result: FaultResult) -> Markup:
    verdict = result.verdict
    rows: list[tuple[str, str]] = [("declared", words.declared(result)), ("predicted", words.predicted(result))]
    if words.predicted_rake(result):
        rows.append(("predicted rake", words.predicted_rake(result)))
    if verdict.conflict_probability is not None:
        rows.append(("conflict", words.percent(verdict.conflict_probability)))
    if verdict.misfit_deg is not None:
        rows.append(("misfit", f"{verdict.misfit_deg:.0f}°"))
    rows += [("plane", words.orientation(result)), ("area", words.area(result))]
    if verdict.slip_tendency is not None:
        rows.append(("slip tendency", f"{verdict.slip_tendency:.2f}"))
    rows += [(words.group(analysis), _membership(analysis, result))] if len(analysis.regimes) > 1 else []
    shown = [joined(element("dt", name), element("dd", value)) for name, value in rows]
    return element("dl", [element("div", each) for each in shown], class_="facts")


def _membership(analysis: Analysis, result: FaultResult) -> Markup:
    """Return the phases of a fault with their probabilities, the one it is judged by first."""
    shares = result.membership or tuple(float(k == result.phase) for k in range(len(analysis.regimes)))
    order = sorted(range(len(shares)), key=lambda k: (k != result.phase, -shares[k]))
    told = [k for k in order if k == result.phase or shares[k] >= LEAST_MEMBERSHIP]
    named = [
        joined(given(analysis.regimes[k].name or f"phase {k + 1}"), f" ({words.percent(shares[k])})")
        for k in told
        if k < len(analysis.regimes)
    ]
    return joined([joined(", " if place else "", each) for place, each in enumerate(named)])


def _reasons(result: FaultResult) -> Markup:
    if not result.verdict.reasons:
        return Markup("")
    return element("p", plain(words.typeset("; ".join(result.verdict.reasons))), class_="reasons")


def _causes(result: FaultResult) -> Markup:
    """Return the possible causes with their probability and what to do next."""
    if not result.verdict.causes:
        return Markup("")
    rows = []
    for cause in result.verdict.causes:
        share = element("span", words.percent(cause.score), class_="chance")
        step = element("p", element("b", "Next: "), plain(words.typeset(cause.next_step)), class_="next") if cause.next_step else ""
        rows.append(element("li", element("p", share, plain(words.typeset(cause.text))), step))
    return element("ol", rows, class_="causes", aria_label="Possible causes")


def fault_table(analysis: Analysis) -> Markup:
    """Return every fault in one row, worst first."""
    rows = [
        (
            mark(result.verdict.word),
            element("span", given(result.fault.name), data_fault=row),
            words.orientation(result),
            words.declared(result),
            words.predicted(result),
            words.percent(result.verdict.conflict_probability),
            "–" if result.verdict.misfit_deg is None else f"{result.verdict.misfit_deg:.0f}°",
        )
        for row, result in ordered(analysis)
    ]
    head = ("", "fault", "strike/dip", "declared", "predicted", "conflict", "misfit")
    return table(head, rows, numeric=(5, 6), class_="faults")
