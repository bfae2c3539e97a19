"""Earthquakes as evidence and as a comparison, from one end of the analysis to the other."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from structviz.analysis import Settings, run
from structviz.kinematics.slip import resolved_slip
from structviz.model import Mechanism, WellAzimuth
from structviz.orientation.planes import rakes_deg, strike_dip_deg
from structviz.orientation.vectors import axial_angle_deg
from structviz.stress.tensor import reduced_tensor
from structviz.synthetic import random_model

QUICK = Settings(replicates=200)
NOWHERE = (np.nan, np.nan, np.nan)


@pytest.fixture(scope="module")
def known():
    return random_model("strike-slip", faults=12, conjugate=8, planted=1, triangles=60, random_state=8)


def quakes(axes, count=40, seed=1):
    """Mechanisms of planes near those of new faults under a stress, slipping by it."""
    rng = np.random.default_rng(seed)
    side = np.where(rng.random(count) < 0.5, 1.0, -1.0)[:, None]
    normals = 0.5 * axes[0] + side * np.sqrt(0.75) * axes[2] + 0.15 * rng.normal(size=(count, 3))
    normals /= np.linalg.norm(normals, axis=1)[:, None] * np.where(normals[:, 2:] < 0, -1, 1)
    rakes = rakes_deg(normals, resolved_slip(reduced_tensor(axes, 0.5), normals))
    strikes, dips = strike_dip_deg(normals)
    return tuple(Mechanism(f"Q{k}", NOWHERE, (tuple(map(float, row)),)) for k, row in enumerate(zip(strikes, dips, rakes)))


def test_earthquakes_of_the_same_stress_agree_and_narrow_it_as_evidence(known):
    apart = run(replace(known.model, mechanisms=quakes(known.axes)), QUICK)
    assert [each.word for each in apart.comparisons] == ["agrees"]
    joined = run(replace(known.model, mechanisms=quakes(known.axes), mechanisms_are="evidence"), QUICK)
    assert joined.comparisons == (), "what was used is not compared with itself"
    assert sum(joined.regimes[0].cones_deg) < sum(apart.regimes[0].cones_deg)
    assert joined.regimes[0].faults == 12, "earthquakes are not counted as faults"
    assert {r.fault.name for r in joined.conflicting} == set(known.flipped)


def test_many_earthquakes_do_not_outvote_the_faults(known):
    other = known.axes[[0, 2, 1]] * np.array([[1.0], [1.0], [-1.0]])
    analysis = run(replace(known.model, mechanisms=quakes(other, 200), mechanisms_are="evidence"), QUICK)
    assert len(analysis.faults) == 12
    assert min(axial_angle_deg(regime.axes, known.axes).max() for regime in analysis.regimes) < 15.0


def test_too_few_earthquakes_are_refused_with_the_reason(known):
    analysis = run(replace(known.model, mechanisms=quakes(known.axes, 1), mechanisms_are="evidence"), QUICK)
    told = [finding.message for finding in analysis.findings if "mechanisms were not used as evidence" in finding.message]
    assert len(told) == 1


def test_wells_across_the_regime_are_a_finding(known):
    azimuth = run(known.model, QUICK).regimes[0].shmax_deg
    wells = tuple(WellAzimuth(f"W{k}", (azimuth + 90.0 + k) % 180.0, 5.0, NOWHERE) for k in range(6))
    analysis = run(replace(known.model, azimuths=wells), QUICK)
    assert [each.word for each in analysis.comparisons] == ["differs"]
    assert "wells-differ" in {finding.check for finding in analysis.findings}
