"""Plots of an analysis as SVG text for the page: no scripts, no addresses; what stands for a fault carries its row as `data-fault`.

Colours are the page's variables with the values of the palette to fall back on, so that a plot follows light, dark and print.
"""

from __future__ import annotations

from structviz.report.svg.charts import misfits_svg, rose_svg
from structviz.report.svg.mohr import mohr_svg
from structviz.report.svg.net import net_svg
from structviz.report.svg.plunges import plunges_svg
from structviz.report.svg.reliability import reliability_svg

__all__ = ["misfits_svg", "mohr_svg", "net_svg", "plunges_svg", "reliability_svg", "rose_svg"]
