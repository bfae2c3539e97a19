"""What the page says in words: the answer, how sure it is, and each fault as text that can be pasted into a mail."""

from __future__ import annotations

import re
from collections.abc import Sequence

from structviz.analysis import Analysis, FaultResult
from structviz.kinematics.senses import describe_rake
from structviz.orientation.lines import trend_plunge_deg
from structviz.report.names import printable
from structviz.stress.regime import Regime

POINTS = ("N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW")
WELL_DEG = 15.0  # widest cone of a regime that is called well determined
LOOSE_DEG = 30.0  # a regime with a wider cone is called poorly determined
NUMBERS = {2: "Two", 3: "Three", 4: "Four"}
WORDS = ("conflicting", "undetermined", "consistent")
AXES = ("σ1", "σ2", "σ3")
FIRST_WORD = re.compile(r"[a-z]+[ ,;:]")  # in lower case and nothing else: no name of a file
NO_BREAK = "\u00a0"
DEGREES = re.compile(r"(?<=\d) deg\b")
MINUS = re.compile(r"(?<![\w.])-(?=\d)")


def counted(number: int, one: str, many: str = "") -> str:
    """Return a number with its noun.

    >>> counted(1, "fault"), counted(1200, "fault")
    ('1 fault', '1,200 faults')
    """
    return f"{number:,} {one if number == 1 else many or one + 's'}"


def listed(names: Sequence[str], most: int = 6) -> str:
    """Return names in a row, the last after "and"; those beyond `most` as a count.

    >>> listed(["a", "b", "c"]), listed(["a", "b", "c"], 2)
    ('a, b and c', 'a, b and 1 more')
    """
    shown = list(names) if len(names) <= most else [*names[:most], f"{len(names) - most} more"]
    return f"{', '.join(shown[:-1])} and {shown[-1]}" if len(shown) > 1 else "".join(shown)


def signs(text: str) -> str:
    """Return words of ours with signs in place of what the terminal spells out.

    >>> signs("161 deg from the predicted slip (rake -157 +/- 35)")
    '161° from the predicted slip (rake −157 ± 35)'
    """
    return DEGREES.sub("°", MINUS.sub("−", text.replace("+/-", "±")))


def typeset(text: str) -> str:
    """Return words of ours as a sentence: with signs, a capital and a full stop. What may be the name of a file keeps its first letter.

    >>> typeset("dips 75.6 deg"), typeset("faults.csv: a column is not used")
    ('Dips 75.6°.', 'faults.csv: a column is not used.')
    """
    shown = signs(text)
    begun = f"{shown[:1].upper()}{shown[1:]}" if FIRST_WORD.match(shown) else shown
    return f"{begun}{'' if begun.endswith('.') else '.'}" if begun else ""


def azimuth(degrees: float, turn: int = 360) -> str:
    """Return an azimuth in three digits, whole degrees.

    >>> azimuth(6.6), azimuth(359.8)
    ('007', '000')
    """
    return f"{round(degrees) % turn:03d}"


def shmax(regime: Regime) -> str:
    """Return the azimuth of SHmax with its interval and the points of the compass, as 017 ± 3° (NNE-SSW)."""
    whole = round(regime.shmax_deg) % 180
    point = round(whole / 22.5) % 8
    ends = (POINTS[point], POINTS[point + 8]) if point <= 4 else (POINTS[point + 8], POINTS[point])  # NW-SE rather than SE-NW
    return f"{whole:03d} ± {regime.shmax_half_width_deg:.0f}° ({'-'.join(ends)})"


def axes(regime: Regime) -> tuple[tuple[str, str, str], ...]:
    """Return name, trend/plunge and 95 % cone of each principal axis."""
    trends, plunges = trend_plunge_deg(regime.axes)
    rows = zip(AXES, trends, plunges, regime.cones_deg)
    return tuple((name, f"{azimuth(float(trend))}/{float(plunge):02.0f}", f"± {cone:.0f}°") for name, trend, plunge, cone in rows)


def kind(regime: Regime) -> str:
    """Return the class of a regime in words.

    >>> from types import SimpleNamespace
    >>> kind(SimpleNamespace(kind="strike-slip"))
    'strike-slip faulting'
    """
    return "stress of no Andersonian class" if regime.kind == "undefined" else f"{regime.kind} faulting"


def ratio(regime: Regime) -> str:
    """Return the shape ratio with its interval, or that the data leave it open."""
    found = regime.shape_ratio
    if found is None:
        return "not resolved"
    return f"{found.value:.2f} ({found.low:.2f} to {found.high:.2f})"


def sureness(regime: Regime) -> str:
    """Return one word group for how tightly the axes of a regime are held."""
    widest = max(regime.cones_deg)
    return "well determined" if widest <= WELL_DEG else "determined" if widest <= LOOSE_DEG else "poorly determined"


def headline(analysis: Analysis) -> str:
    """Return which regime, in one line."""
    found = analysis.regimes
    if not found:
        return "No stress could be inferred"
    if len(found) == 1:
        return f"{kind(found[0]).capitalize()}, SHmax {azimuth(found[0].shmax_deg, 180)} ± {found[0].shmax_half_width_deg:.0f}°"
    each = "; ".join(f"{regime.kind}, SHmax {azimuth(regime.shmax_deg, 180)}°" for regime in found)
    return f"{NUMBERS.get(len(found), str(len(found)))} {group(analysis)}s, each under its own stress: {each}"


def group(analysis: Analysis) -> str:
    """Return what the regimes of an analysis are of: phases, or parts of the model where the stress turns with place."""
    return "part" if analysis.answer and analysis.answer.by == "place" else "phase"


def how_sure(analysis: Analysis) -> str:
    """Return how sure the regime is, in one or two sentences."""
    if not analysis.regimes:
        why = next((reading.why_not for reading in analysis.readings if reading.key == "joint" and reading.why_not), "")
        return f"{why[:1].upper()}{why[1:]}." if why else "The evidence does not carry one."
    if len(analysis.regimes) > 1:
        return " ".join(f"({k}) is {sureness(regime)}: cones of {cones(regime)}." for k, regime in enumerate(analysis.regimes, 1))
    first = analysis.regimes[0]
    held = f"The axes are {sureness(first)}: 95{NO_BREAK}% cones of {cones(first)} from {counted(first.faults, 'fault')}."
    open_ratio = "" if first.shape_ratio else " The shape ratio R is open, so every prediction covers all of it."
    return held + open_ratio


def cones(regime: Regime) -> str:
    """Return the range of the 95 % cones of a regime."""
    low, high = round(min(regime.cones_deg)), round(max(regime.cones_deg))
    return f"{low}°" if low == high else f"{low} to {high}°"


def verdict_line(analysis: Analysis) -> str:
    """Return how many faults conflict, in a sentence."""
    number = {word: sum(result.verdict.word == word for result in analysis.faults) for word in WORDS}
    total = len(analysis.faults)
    if not number["conflicting"]:
        conflict = f"No fault of {total:,} conflicts with the others"
    else:
        verb = "conflicts" if number["conflicting"] == 1 else "conflict"
        conflict = f"{number['conflicting']:,} of {counted(total, 'fault')} {verb} with the others"
    rest = [f"{number['consistent']:,} fit" if number["consistent"] != 1 else "1 fits"] if number["consistent"] else []
    rest += [f"{number['undetermined']:,} cannot be told"] if number["undetermined"] else []
    return f"{conflict}; {listed(rest)}." if rest else f"{conflict}."


def declared(result: FaultResult) -> str:
    """Return what was declared, or that nothing was."""
    return result.fault.declared.text if result.fault.declared else "nothing declared"


def predicted(result: FaultResult) -> str:
    """Return the predicted slip in words, or that none can be predicted."""
    rake = result.verdict.predicted_rake_deg
    return "no prediction" if rake is None else describe_rake(rake)


def predicted_rake(result: FaultResult) -> str:
    """Return the predicted rake with the half-width that holds 90 % of the predictions; "" where there is none."""
    rake, spread = result.verdict.predicted_rake_deg, result.verdict.predicted_rake_spread_deg
    return "" if rake is None or spread is None else f"{rake:.0f} ± {spread:.0f}°".replace("-", "−")


def percent(share: float | None) -> str:
    """Return a probability as a whole percentage that never claims certainty; a dash where there is none.

    >>> [percent(share).replace(NO_BREAK, " ") for share in (0.9999, 0.0, 0.42, None)]
    ['> 99 %', '< 1 %', '42 %', '–']
    """
    if share is None:
        return "–"
    shown = "> 99 %" if share > 0.99 else "< 1 %" if share < 0.01 else f"{100 * share:.0f} %"
    return shown.replace(" ", NO_BREAK)


def orientation(result: FaultResult) -> str:
    """Return strike/dip of the mean plane with its cone, or why there is none."""
    measured = result.measured
    if not measured.meaningful:
        return f"no mean plane: {measured.why_not}" if measured.why_not else "no mean plane"
    return f"{azimuth(measured.strike_deg)}/{measured.dip_deg:02.0f} ± {measured.cone_deg:.0f}°"


def area(result: FaultResult) -> str:
    """Return the area of a fault in square kilometres, or square metres where it is small."""
    m2 = result.measured.area_m2
    return f"{m2 / 1e6:,.1f} km²" if m2 >= 1e5 else f"{m2:,.0f} m²"


def severity(result: FaultResult) -> tuple[int, float, float, float, str]:
    """Return what faults are sorted by, worst first: verdict, probability, misfit, then the larger."""
    verdict = result.verdict
    probability = verdict.conflict_probability or 0.0
    return (WORDS.index(verdict.word), -round(probability, 2), -(verdict.misfit_deg or 0.0), -result.measured.area_m2, result.fault.name)


def regime_name(analysis: Analysis, number: int) -> str:
    """Return the name of a regime, as given or as phase 1, part 1."""
    return analysis.regimes[number].name or f"{group(analysis)} {number + 1}"


def _named(analysis: Analysis, number: int) -> str:
    return f"{regime_name(analysis, number)}, " if len(analysis.regimes) > 1 else ""


def card_text(result: FaultResult, analysis: Analysis) -> str:
    """Return one fault as plain text for a mail: what was declared, what the others predict, why, and what to do next."""
    verdict, name = result.verdict, printable(result.fault.name)
    lines = [f"{name}: {verdict.word}", f"Model: {printable(analysis.model.title or 'untitled')}"]
    lines.append(f"Plane (strike/dip, 95 % cone): {orientation(result)}, {area(result)}")
    lines.append(f"Declared: {declared(result)}")
    rake = f", rake {predicted_rake(result)}" if predicted_rake(result) else ""
    lines.append(f"Predicted by the other faults: {predicted(result)}{rake}")
    if verdict.conflict_probability is not None and verdict.misfit_deg is not None:
        lines.append(f"Probability of conflict: {percent(verdict.conflict_probability)}; misfit {verdict.misfit_deg:.0f}°")
    lines += [f"Reason: {reason}" for reason in verdict.reasons[:1]]
    for number, cause in enumerate(verdict.causes, 1):
        lines.append(f"Possible cause {number} ({percent(cause.score)}): {cause.text}")
        lines += [f"   Next: {cause.next_step}"] if cause.next_step else []
    if analysis.regimes:
        regime = analysis.regimes[result.phase]
        lines.append(f"Stress of the faults: {_named(analysis, result.phase)}{kind(regime)}, SHmax {shmax(regime)}; R {ratio(regime)}")
    lines.append(f"structviz {analysis.version}: a screening aid, it tests geometry against declared movement.")
    return "\n".join(printable(line) for line in lines)
