"""Conjugate pairs against outside values."""

from __future__ import annotations

import numpy as np

from structviz.kinematics.senses import nearest_word
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.lines import vectors
from structviz.orientation.planes import normals, rakes_deg
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.classify import kinds
from structviz.stress.conjugate import pair_axes
from structviz.stress.tensor import reduced_tensor


def test_con_01_axes_of_pairs(case):
    """Includes pairs whose upward normals lie more than 90 degrees apart, where a naive bisector flips."""
    for given, wanted in zip(case.input, case.expected):
        pair = normals(*np.array([given["plane1_rhr"], given["plane2_rhr"]], float).T)
        axes, acute = pair_axes(*pair)
        case.near(acute, wanted["dihedral_acute"], 1e-5)
        case.near(90 - acute, wanted["friction_angle"], 1e-5)
        for row, key in enumerate(("s1", "s2", "s3")):
            assert axial_angle_deg(axes[row], vectors(*wanted[key])) <= 1e-5, f"{given['name']} {key}{case.about}"
        for ratio in (0.1, 0.9):
            rakes = rakes_deg(pair, resolved_slip(reduced_tensor(axes, ratio), pair))
            case.near(rakes, [wanted["rake_plane1"], wanted["rake_plane2"]], 1e-4, 360)


def test_con_02_andersonian_pairs(case):
    classes = {"NF": "normal", "TF": "reverse", "SS": "strike-slip"}
    for given, wanted in zip(case.input, case.expected):
        planes = np.array([plane.split("/") for plane in given["pair"].split(" + ")], float)
        pair = normals(*planes.T)
        axes, acute = pair_axes(*pair)
        case.near(90 - acute, wanted["phi"], 1e-9)
        for row, key in enumerate(("s1", "s3")):
            assert axial_angle_deg(axes[2 * row], vectors(*wanted[key])) <= 1e-9, case.about
        case.same(str(kinds(axes)), classes[wanted["regime"]])
        rakes = rakes_deg(pair, resolved_slip(reduced_tensor(axes, 0.5), pair))
        if "rakes" in wanted:
            case.near(rakes, wanted["rakes"], 1e-9)
        else:
            case.same([nearest_word(float(rake)) for rake in rakes], ["dextral", "sinistral"])


def test_con_03_pairs_that_are_none(case):
    right_angle = pair_axes(*normals([0.0, 180.0], 45.0))
    case.near(right_angle[1], 90.0, 1e-9)
    for second in (normals(30.0, 60.0), -normals(30.0, 60.0)):
        axes, acute = pair_axes(normals(30.0, 60.0), second)
        case.near(acute, 0.0, 1e-9)
        assert np.isnan(axes).all(), case.about
