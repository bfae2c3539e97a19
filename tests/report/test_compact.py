"""Plots made short look the same."""

from __future__ import annotations

import re

import pytest

from structviz.analysis import Analysis
from structviz.report import svg
from structviz.report.svg.compact import compact


@pytest.mark.parametrize("plot", svg.__all__)
def test_nothing_is_lost_but_hundredths(analysis: Analysis, plot: str) -> None:
    whole = getattr(svg, plot)(analysis)
    short = compact(whole)
    assert len(short) < len(whole)
    assert re.findall(r"data-fault=\"\d+\"|<title>.*?</title>|<text.*?</text>", short) == re.findall(
        r"data-fault=\"\d+\"|<title>.*?</title>|<text.*?</text>", re.sub(r"var\(--([\w-]+), #\w+\)", r"var(--\1)", whole)
    )


def test_every_dot_of_the_mohr_diagram_is_still_there(analysis: Analysis) -> None:
    whole = svg.mohr_svg(analysis)
    dots = [(float(x), float(y)) for x, y in re.findall(r'<circle cx="([\d.]+)" cy="([\d.]+)"', whole)]
    short = [(float(x), float(y)) for x, y in re.findall(r"M([\d.]+),([\d.]+)h0", compact(whole))]
    assert len(short) == len(dots) > 100
    assert max(max(abs(a - c), abs(b - d)) for (a, b), (c, d) in zip(short, dots, strict=True)) < 0.051


def test_what_is_no_dot_is_left_alone() -> None:
    assert compact('<circle cx="1" cy="2" r="3" fill="none" stroke="red"/>') == '<circle cx="1" cy="2" r="3" fill="none" stroke="red"/>'
    assert compact('<text x="1.234">12.345</text>') == '<text x="1.234">12.345</text>'
