"""What was done, in words, with the sources of what ran on this model and of nothing else."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from structviz.analysis import Analysis
from structviz.references import REFERENCES


@dataclass(frozen=True)
class Method:
    """One step: what was done, when it applies; sources are cited in its text as [key]."""

    title: str
    text: str
    applies: Callable[[Analysis], bool]


def _stress(analysis: Analysis) -> bool:
    return bool(analysis.regimes)


def _by_place(analysis: Analysis) -> bool:
    return analysis.answer is not None and analysis.answer.by == "place"


METHODS: tuple[Method, ...] = (
    Method(
        "Orientation",
        "Each surface is welded by place and given one winding. Its mean plane is weighted by area; local planes are fitted at stations "
        "spread over it. Cones about mean directions follow [fisher1953]. Rakes are those of the hanging wall [aki1980].",
        lambda analysis: True,
    ),
    Method(
        "Declared movement",
        "A declared word is a sector of rakes on the plane: 90 degrees to either side for one word, 45 for two words or a rake. Slip is "
        "expected along the greatest shear on the plane [wallace1951] [bott1959].",
        lambda analysis: any(result.fault.declared for result in analysis.faults),
    ),
    Method(
        "Pairs",
        "Faults near one another that stand as conjugates do [anderson1951] are read as pairs; each gives axes of its own, from the "
        "geometry alone and with the declared senses. Pairs are a reading of the evidence and are not added up.",
        lambda analysis: len(analysis.pairs) > 0,
    ),
    Method(
        "Stress",
        "Each fault has one bounded likelihood over orientations of the axes and the shape ratio R: its plane stands at the acute (or "
        "obtuse) angle to σ1 or is inherited, and its slip points into the declared sector or the label is wrong. The likelihoods are "
        "added up over a level set of orientations [alexa2022] and refined. Intervals come from a bootstrap over faults.",
        _stress,
    ),
    Method(
        "Class and SHmax",
        "The class of a regime is read from the plunges of its axes [zoback1992], the azimuth of the greatest horizontal compression "
        "from the whole tensor [lund2007].",
        _stress,
    ),
    Method(
        "Phases",
        "Whether more than one stress is called for is a mixture fitted by expectation and maximisation [dempster1977] and chosen by the "
        "Bayesian criterion [schwarz1978]. Each phase is then inferred anew from its own faults.",
        lambda analysis: len(analysis.regimes) > 1 and not _by_place(analysis),
    ),
    Method(
        "Stress by place",
        "Whether the stress turns from one part of the model to another is asked with a local likelihood, its weights falling off with "
        "distance [tukey1977]; the bandwidth is chosen by how well each fault is told by those near it. The model is cut into parts "
        "where two stresses explain it better than one by the Bayesian criterion [schwarz1978].",
        _by_place,
    ),
    Method(
        "Verdicts",
        "A fault is judged by the replicates in which it was not drawn, so by the other faults alone [efron1992]. The probability of "
        "conflict is calibrated on synthetic models with known labels [platt1999]. Slip tendency follows [morris1996].",
        lambda analysis: any(result.verdict.predicted_rake_deg is not None for result in analysis.faults),
    ),
    Method(
        "Causes",
        "A possible cause is scored by prior belief, by how well the slip it implies fits the declared word, and by how the plane it "
        "implies stands in the stress; scores are normalised together with that of none of these.",
        lambda analysis: any(result.verdict.causes for result in analysis.faults),
    ),
    Method(
        "Slip lines",
        "Measured slip lines join the likelihood of their fault; a third of wrong lines is allowed for.",
        lambda analysis: bool(analysis.model.striae),
    ),
    Method(
        "Earthquakes",
        "Focal mechanisms are inverted by choosing the nodal plane nearer to failure [vavrycuk2014] and solving the linear system for the "
        "reduced tensor [michael1984] in turn. Two sets of axes are compared by the angle of the rotation between them [kagan1991].",
        lambda analysis: bool(analysis.model.mechanisms),
    ),
    Method(
        "Wells",
        "Azimuths from wells are averaged on the doubled angle [mardia2000]; wells far from the rest are left out and counted.",
        lambda analysis: bool(analysis.model.azimuths),
    ),
)
CITED = re.compile(r"\[([a-z]+\d{4})\]")


def methods_of(analysis: Analysis) -> tuple[Method, ...]:
    """Return the steps that ran on a model, in order."""
    return tuple(method for method in METHODS if method.applies(analysis))


def sources_of(analysis: Analysis) -> tuple[str, ...]:
    """Return the keys cited by the steps that ran, in order of the list of sources."""
    cited = {key for method in methods_of(analysis) for key in CITED.findall(method.text)}
    return tuple(sorted(cited, key=lambda key: REFERENCES[key]))


def short_source(key: str) -> str:
    """Return a source as it is named in running text.

    >>> short_source("bott1959"), short_source("lund2007"), short_source("ferrill1999")
    ('Bott 1959', 'Lund and Townend 2007', 'Ferrill et al. 1999')
    """
    authors, year = REFERENCES[key].split(" (", 1)
    surnames = re.findall(r"([^\W\d_][\w'-]+(?: [a-z]+)?), (?:[A-Z]\.[ -]?)+", authors)
    if "et al." in authors or len(surnames) > 2:
        return f"{surnames[0]} et al. {year[:4]}"
    return f"{' and '.join(surnames)} {year[:4]}"


def pieces(text: str) -> Iterator[tuple[str, str]]:
    """Return a text as (words, "") and ("", key of a source) in order."""
    for number, piece in enumerate(CITED.split(text)):
        if piece:
            yield ("", piece) if number % 2 else (piece, "")
