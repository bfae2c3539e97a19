"""Analyses to draw, and whether this machine can draw in 3D."""

import os

import pytest

from structviz.analysis import Settings, run
from structviz.synthetic import random_model
from structviz.views.gl import working_window


@pytest.fixture(scope="session")
def gl():
    """Skip where no OpenGL works; under STRUCTVIZ_TESTS=all and all-but-data fail instead."""
    if working_window() is None:
        reason = "no working OpenGL (libegl1 and libgl1-mesa-dri)"
        (pytest.fail if os.environ.get("STRUCTVIZ_TESTS", "").startswith("all") else pytest.skip)(reason)


@pytest.fixture(scope="session")
def analysis():
    """A small model with two wrong labels."""
    return run(random_model("normal", faults=12, conjugate=9, planted=2, random_state=5).model, Settings(replicates=200))
