"""The whole job on real input against what is known independently of it. Sources beside each; the data lie beside the project."""

import numpy as np
import pytest

from structviz.analysis import run
from structviz.io import read_model
from structviz.orientation.lines import trend_plunge_deg


def within(azimuth_deg, low_deg, high_deg, slack_deg):
    """Whether an azimuth of an axis lies in a range, widened by a slack, modulo 180."""
    middle, half = (low_deg + high_deg) / 2, (high_deg - low_deg) / 2 + slack_deg
    return abs((azimuth_deg - middle + 90.0) % 180.0 - 90.0) <= half


@pytest.fixture(scope="module")
def mojave(shared_data):
    return run(read_model(shared_data / "california_fault_meshes" / "mojave" / "faults.csv"))


def test_mojave_is_strike_slip_with_shmax_north_north_east(mojave):
    # Yang and Hauksson (2013, GJI): strike-slip, SHmax 010-025 from focal mechanisms, independent of any fault surface.
    regime = mojave.regimes[0]
    assert regime.kind == "strike-slip"
    assert within(regime.shmax_deg, 10.0, 25.0, 20.0)


def test_the_acute_rule_alone_is_wrong_in_mojave_and_does_not_win(mojave):
    readings = {reading.key: reading for reading in mojave.readings}
    by_geometry = readings["geometry"].regime
    assert not within(by_geometry.shmax_deg, 10.0, 25.0, 45.0)
    assert mojave.pairs.weight[mojave.pairs.obtuse].sum() > 0.5 * mojave.pairs.weight.sum()
    checks = {finding.check for finding in mojave.findings}
    assert {"readings-disagree", "obtuse-pairs"} <= checks


def test_transverse_ranges_are_reverse_with_shmax_north_north_east(shared_data):
    # Yang and Hauksson (2013, GJI); wells near basement average 015 (Luttrell and Hardebeck 2021, JGR).
    regime = run(read_model(shared_data / "california_fault_meshes" / "transverse_ranges" / "faults.csv")).regimes[0]
    assert regime.kind == "reverse"
    assert within(regime.shmax_deg, 10.0, 25.0, 20.0)


def test_hard_cases_claim_no_regime_and_no_nonsense_plane(shared_data):
    analysis = run(read_model(shared_data / "california_fault_meshes" / "hard_cases" / "faults.csv"))
    assert analysis.regimes == ()
    assert not analysis.conflicting
    ruptures = next(result for result in analysis.faults if "Ridgecrest" in result.fault.name)
    assert len(ruptures.measured.parts) == 16
    assert not ruptures.measured.meaningful


def test_ridgecrest_faults_come_from_the_named_groups_of_a_volume_mesh(shared_data, tmp_path):
    # Mesh of the 2019 Ridgecrest ruptures (PyLith example, MIT). Senses as known: 140 dextral against 034 and 046 sinistral.
    mesh = shared_data / "ridgecrest_volume_mesh" / "mesh_tet.msh"
    names = [fault.name for fault in read_model(mesh).faults]
    assert sorted(names) == ["fault_east", "fault_main", "fault_west"]
    senses = {"fault_main": "dextral", "fault_east": "sinistral", "fault_west": "sinistral"}
    rows = "".join(f'[[fault]]\nname = "{name}"\nsurface = "{mesh}#{name}"\nsense = "{sense}"\n' for name, sense in senses.items())
    (tmp_path / "model.toml").write_text(f'title = "Ridgecrest"\n{rows}')
    analysis = run(read_model(tmp_path / "model.toml", allow_outside=True))
    strikes = {result.fault.name: result.measured.strike_deg % 180 for result in analysis.faults}
    assert [round(strikes[name]) for name in ("fault_main", "fault_east", "fault_west")] == pytest.approx([140, 34, 46], abs=2)
    axes = analysis.regimes[0].axes
    trend, plunge = trend_plunge_deg(axes[0])
    assert within(float(trend), 0.0, 25.0, 25.0)
    assert plunge < 25
    assert np.rad2deg(np.arcsin(abs(axes[1, 2]))) > 60
