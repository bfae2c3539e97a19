"""Plots of the page as SVG: well-formed, each fault findable by its row, hostile names harmless, the same bytes each time."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.model import FaultModel
from structviz.report import svg
from structviz.report.svg.drawing import attributes, mark, number, text
from structviz.synthetic import random_model

SVG = "{http://www.w3.org/2000/svg}"
PLOTS = pytest.mark.parametrize("plot", svg.__all__)
HOSTILE = ('<script>alert("x")</script>', "a\"b'c&d", "\u202eright to left", "x" * 500, "\x1b[31mred\x00")


@pytest.fixture(scope="module")
def analysis():
    model = random_model("normal", faults=12, conjugate=9, planted=2, triangles=60, random_state=5).model
    faults = tuple(replace(fault, name=name) for fault, name in zip(model.faults, [*HOSTILE, *(f"F{k}" for k in range(7))]))
    return run(replace(model, faults=faults), Settings(replicates=100))


@PLOTS
def test_plots_are_well_formed_and_ask_for_nothing(analysis, plot):
    drawn = getattr(svg, plot)(analysis)
    root = ET.fromstring(drawn)
    assert root.tag == f"{SVG}svg"
    assert root.get("viewBox")
    assert root.get("aria-label")
    assert not root.findall(f".//{SVG}script")
    assert not re.findall(r"(?:href|src|url\((?!#))", drawn)
    assert "NaN" not in drawn
    assert "nan" not in re.sub(r"<title>.*?</title>", "", drawn)


@PLOTS
def test_the_same_analysis_gives_the_same_plot(analysis, plot):
    assert getattr(svg, plot)(analysis) == getattr(svg, plot)(analysis)


@pytest.mark.parametrize("plot", ["net_svg", "mohr_svg", "rose_svg", "misfits_svg", "reliability_svg"])
def test_every_fault_stands_once_under_its_row(analysis, plot):
    groups = ET.fromstring(getattr(svg, plot)(analysis)).findall(f".//{SVG}g[@data-fault]")
    assert sorted(int(group.get("data-fault")) for group in groups) == list(range(12))
    for group in groups:
        result = analysis.faults[int(group.get("data-fault"))]
        assert result.verdict.word in group.get("class").split()
        title = group.find(f"{SVG}title").text
        assert result.verdict.word in title
        assert len(title) < 200


def test_the_net_shows_planes_where_they_are(analysis):
    """A plane's group holds its great circle: its middle is the dip line, equal area, from the middle of the net."""
    root = ET.fromstring(svg.net_svg(analysis))
    for row in (5, 9):
        line = root.find(f".//{SVG}g[@data-fault='{row}']").find(f"{SVG}path[@class='line']").get("d")
        points = np.array([[float(v) for v in pair.split(",")] for pair in re.split("[ML]", line.strip("Z")) if pair])
        middle = points[len(points) // 2] - 180.0
        dip = np.radians(analysis.faults[row].measured.dip_deg)
        assert np.hypot(*middle) / 158.0 == pytest.approx(np.sqrt(2) * np.sin((np.pi / 2 - dip) / 2), abs=0.01)


def test_areas_of_the_rose_are_areas_of_faults(analysis):
    largest = max(range(12), key=lambda row: analysis.faults[row].measured.area_m2)
    root = ET.fromstring(svg.rose_svg(analysis))
    areas = {}
    for group in root.findall(f".//{SVG}g[@data-fault]"):
        pairs = re.split("[MLZ]", group.find(f"{SVG}path").get("d"))
        points = np.array([[float(v) for v in pair.split(",")] for pair in pairs if pair])
        x, y = points.T
        areas[int(group.get("data-fault"))] = abs(x @ np.roll(y, 1) - y @ np.roll(x, 1)) / 2
    for row, area in areas.items():
        wanted = analysis.faults[row].measured.area_m2 / analysis.faults[largest].measured.area_m2
        assert area / areas[largest] == pytest.approx(wanted, rel=0.05)


def test_without_a_stress_there_is_no_diagram(analysis):
    empty = run(FaultModel("one", analysis.model.faults[:1]), Settings(replicates=50))
    assert svg.mohr_svg(empty) == svg.plunges_svg(empty) == svg.misfits_svg(empty) == ""
    assert svg.net_svg(empty).startswith("<svg")


def test_words_and_numbers_are_made_safe():
    assert attributes(data_fault=3, class_="a", fill=None) == ' data-fault="3" class="a"'
    assert "&lt;b&gt;" in text(0, 0, "<b>")
    assert (number(-0.001), number(1.23456)) == ("0", "1.23")
    assert mark(1, 2, "round", 3).startswith("<circle")
