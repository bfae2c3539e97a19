"""The equal-area net against outside values."""

from __future__ import annotations

import numpy as np

from structviz.orientation.lines import trend_plunge_deg, vectors
from structviz.orientation.planes import normals
from structviz.orientation.projection import axes_of_points, equal_area, great_circles


def test_prj_01_points_on_the_net(case):
    lines = vectors(*np.array(case.input["trend_plunge"], float).T)
    case.near(equal_area(lines), case.expected["xy"], 1e-9)
    case.near(axes_of_points(equal_area(lines)), lines, 1e-12)


def test_prj_03_equal_areas(case):
    points = equal_area(vectors(123.0, np.array(case.input["plunge"], float)))
    case.near((points**2).sum(-1), case.expected["fraction"], 1e-12)


def test_prj_04_great_circle(case):
    n = normals(case.input["strike"], case.input["dip"])
    line = great_circles(n, len(case.input["pitch"]))
    case.near(line, case.expected["xy_equal_area"], 1e-8)
    trend, plunge = trend_plunge_deg(axes_of_points(line))
    case.near(plunge, case.expected["plunge"], 1e-6)
    case.near(trend, case.expected["trend"], 1e-6, 180)
