"""Descriptions of the plots: what theory says of their numbers, and that each fault stands where it should."""

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from structviz.views.misfits import BIN_DEG, build_misfits
from structviz.views.mohr import build_mohr
from structviz.views.plunges import build_plunges
from structviz.views.rose import PETAL_DEG, build_rose
from structviz.views.viewpoints import VIEWPOINTS, main_strike_deg, viewpoint


def test_stations_lie_between_the_circles_of_mohr(analysis):
    """Every plane's point lies inside the large circle and outside both small ones (Mohr 1900)."""
    (mohr,) = build_mohr(analysis)
    assert {fault.row for fault in mohr.faults} == set(range(len(analysis.faults)))
    for fault in mohr.faults:
        assert len(fault.points) == len(analysis.faults[fault.row].stations.normals)
        normal, shear = fault.points.T
        for low, high, inside in ((0.0, 1.0, True), (0.0, mohr.ratio, False), (mohr.ratio, 1.0, False)):
            beyond = np.hypot(normal - (low + high) / 2, shear) - (high - low) / 2
            assert (beyond <= 1e-9).all() if inside else (beyond >= -1e-9).all()


def test_mohr_says_whether_r_is_known_and_draws_conflicts_last(analysis):
    from structviz.stress.regime import ShapeRatio

    known = replace(analysis, regimes=(replace(analysis.regimes[0], shape_ratio=ShapeRatio(0.2, 0.1, 0.3)),))
    assert build_mohr(known)[0].note == "R = 0.20"
    loose = replace(analysis, regimes=(replace(analysis.regimes[0], shape_ratio=None),))
    assert build_mohr(loose)[0].note == "R is open: drawn for R = 0.50"
    words = [fault.verdict for fault in build_mohr(analysis)[0].faults]
    assert words == sorted(words, key=["consistent", "undetermined", "conflicting"].index)
    assert max(len(fault.points) for fault in build_mohr(analysis, stations=5)[0].faults) == 5


def test_shares_of_the_corners_add_up_to_one(analysis):
    (regime,) = build_plunges(analysis).regimes
    assert regime.shares.sum() == pytest.approx(1)
    assert np.allclose(regime.cloud.sum(-1), 1)
    assert regime.shares.argmax() == 0  # a normal stress: sigma1 stands upright
    assert build_plunges(replace(analysis, answer=None)).regimes == ()


def test_the_rose_shares_out_the_area_of_the_faults(analysis):
    rose = build_rose(analysis)
    total = sum(result.measured.area_m2 for result in analysis.faults if result.measured.meaningful)
    for part in rose.parts:
        measured = analysis.faults[part.row].measured
        assert part.start_deg <= measured.strike_deg % 180 < part.start_deg + PETAL_DEG
        assert (part.outer**2 - part.inner**2) * rose.longest_share == pytest.approx(measured.area_m2 / total)
    assert max(part.outer for part in rose.parts) == pytest.approx(1)


def test_every_compared_fault_is_one_block_over_its_angle(analysis):
    misfits = build_misfits(analysis)
    assert sorted(b.row for b in misfits.blocks) == [k for k, r in enumerate(analysis.faults) if r.verdict.misfit_deg is not None]
    for block in misfits.blocks:
        assert block.misfit_deg == analysis.faults[block.row].verdict.misfit_deg
        assert block.column * BIN_DEG <= block.misfit_deg < (block.column + 1) * BIN_DEG + 1e-9
    assert len({(block.column, block.level) for block in misfits.blocks}) == len(misfits.blocks)
    assert misfits.highest == 1 + max(block.level for block in misfits.blocks)


def with_strikes(strikes, areas):
    return [SimpleNamespace(measured=SimpleNamespace(strike_deg=s, area_m2=a, meaningful=True)) for s, a in zip(strikes, areas)]


@pytest.mark.parametrize(
    "strikes, areas, wanted",
    [((358, 4, 90), (1, 1, 1.5), 1), ((10, 20, 100), (1, 1, 5), 100), ((179, 181, 60), (2, 2, 1), 0), ((190, 14, 12), (1, 1, 1), 12)],
)
def test_the_main_strike_is_that_of_the_set_with_most_area(strikes, areas, wanted):
    found = main_strike_deg(with_strikes(strikes, areas))
    assert abs((found - wanted + 90) % 180 - 90) < 0.6


def test_viewpoints_stand_where_their_names_say(analysis):
    places = {key: viewpoint(key, analysis.faults) for key in VIEWPOINTS}
    assert [places[key].azimuth_deg for key in ("north", "east", "south", "west")] == [0, 90, 180, 270]
    assert places["map"].elevation_deg == 90
    along = places["strike"].azimuth_deg
    assert 90 <= along <= 270  # from the south
    assert abs((along - main_strike_deg(analysis.faults) + 90) % 180 - 90) < 1e-9
