"""Causes of misfits: laws of their scores, planted cases on a known stress, and a plain second implementation."""

from __future__ import annotations

import math

import numpy as np
import pytest

from structviz.kinematics.senses import Sector, nearest_word, sector_of_words
from structviz.kinematics.slip import resolved_slip
from structviz.orientation.planes import normals, rakes_deg
from structviz.stress.causes import (
    CAUSES,
    by_chance,
    causes_of,
    graded_fit,
    mirrored,
    ranked,
    scatter_deg,
    standing,
)
from structviz.stress.evidence import EvidenceModel
from structviz.stress.replicates import Posterior
from structviz.stress.shared_causes import shared_stress, whole_model_causes, with_shared_stress
from structviz.stress.tensor import reduced_tensor
from structviz.stress.verdict import Cause, Verdict, VerdictLimits, judge

UPRIGHT = np.array([[0.0, 0, 1], [0, 1, 0], [1, 0, 0]])  # normal faulting, sigma3 east
NORTH = np.array([[0.0, 1, 0], [0, 0, 1], [1, 0, 0]])  # strike-slip, sigma1 north
GRID = (np.arange(7) + 0.5) / 7


def known_stress(axes=UPRIGHT, ratio=3):
    ratios = np.zeros((40, 7))
    ratios[:, ratio] = 1.0
    frames = np.repeat(axes[None], 40, axis=0)
    return Posterior(axes, frames, ratios, GRID, np.zeros((40, 1), np.int64), np.zeros(1), EvidenceModel())


def causes_on(plane, word, axes=UPRIGHT, others=()):
    posterior, sector = known_stress(axes), sector_of_words(word)
    n = normals(np.array([p[0] for p in plane]), np.array([p[1] for p in plane])) if isinstance(plane, list) else normals(*plane)[None]
    shares = np.full(len(n), 1 / len(n))
    verdict, prediction = judge(posterior, 0, n, shares, sector, "", VerdictLimits())
    return verdict, causes_of(verdict, posterior, 0, prediction, n, shares, sector, None, others)


def test_a_swapped_label_on_a_conjugate_plane_is_named_first():
    verdict, causes = causes_on((0.0, 60.0), "reverse")
    assert verdict.word == "conflicting"
    assert causes[0].key == "label_swapped"
    assert "as normal it would fit" in causes[0].text
    assert "which side went down" in causes[0].next_step


def test_a_plane_mirrored_in_plan_is_named_first_where_the_other_plane_stands_better():
    axes = np.array([[0.5, math.sqrt(0.75), 0], [0, 0, 1], [math.sqrt(0.75), -0.5, 0]])  # sigma1 030
    # The conjugate planes strike 000 and 060: one was drawn at 300 instead of 060.
    _, causes = causes_on(
        (300.0, 89.0), "dextral" if causes_on((60.0, 89.0), "dextral", axes)[0].word == "consistent" else "sinistral", axes
    )
    assert causes[0].key == "mirrored"


def test_nothing_shows_that_a_surface_dips_the_other_way_where_an_axis_is_vertical():
    for plane, word in (((20.0, 60.0), "normal"), ((335.0, 55.0), "reverse"), ((60.0, 40.0), "normal")):
        turned = ((plane[0] + 180.0) % 360.0, plane[1])
        here, there = causes_on(plane, word)[0], causes_on(turned, word)[0]
        assert here.word == there.word
        assert here.predicted_rake_deg == pytest.approx(there.predicted_rake_deg, abs=1e-6)


def test_a_plane_at_the_obtuse_angle_moving_against_the_stress_is_an_obtuse_pair():
    assert causes_on((0.0, 30.0), "reverse")[1][0].key == "obtuse_pair"


def test_a_known_other_phase_explains_what_fits_it():
    posterior = known_stress(NORTH)
    _, causes = causes_on((30.0, 89.0), "sinistral")
    _, informed = causes_on((30.0, 89.0), "sinistral", others=(posterior,))
    with_it = {c.key: c.score for c in informed}.get("older_phase", 0.0)
    _, opposite = causes_on((30.0, 89.0), "dextral", others=(posterior,))
    against = {c.key: c.score for c in opposite}.get("older_phase", 0.0)
    assert max(with_it, against) > {c.key: c.score for c in causes}.get("older_phase", 0.0)
    assert max(with_it, against) > min(with_it, against)


def test_a_plane_across_an_axis_has_too_little_shear():
    verdict, causes = causes_on((0.0, 3.0), "reverse")
    assert verdict.word == "undetermined"
    assert causes[0].key == "too_little_shear"


def test_a_slip_near_the_edge_of_the_sector_is_oblique():
    found = [causes_on((float(strike), 60.0), word) for strike in range(0, 180, 4) for word in ("sinistral", "dextral")]
    beyond = [(v.misfit_deg - 90, causes[0].key) for v, causes in found if v.word != "consistent"]
    near = [key for off, key in beyond if 0 < off < 15]
    assert near.count("oblique_boundary") > len(near) / 2
    assert "oblique_boundary" not in [key for off, key in beyond if off > 40]


def test_scatter_of_local_planes_makes_noise_likelier():
    rough = [(s, d) for s in (330.0, 0.0, 30.0) for d in (35.0, 60.0, 85.0)] + [(0.0, 20.0), (100.0, 80.0), (260.0, 80.0)]
    verdict, causes = causes_on(rough, "sinistral")
    assert verdict.word != "consistent"
    assert "orientation_noise" in [c.key for c in causes]
    assert scatter_deg(normals(0.0, 60.0)[None], np.ones(1)) == pytest.approx(0.0, abs=1e-5)


@pytest.mark.parametrize("strike", range(0, 360, 40))
@pytest.mark.parametrize("word", ["normal", "reverse", "sinistral", "dextral-reverse"])
def test_scores_are_a_probability_best_first(strike, word):
    verdict, causes = causes_on((float(strike), 50.0), word)
    values = [cause.score for cause in causes]
    assert values == sorted(values, reverse=True)
    assert sum(values) <= 1 + 1e-9
    assert all(cause.next_step and cause.text for cause in causes)
    assert not causes if verdict.word == "consistent" else True


def test_a_tie_is_told():
    found = dict.fromkeys((row.key for row in CAUSES), 0.0) | {"label_swapped": 0.5, "older_phase": 0.4, "mirrored": 0.11}
    first, second, third = ranked(found, sector_of_words("normal"))
    assert "hardly tells" in second.text
    assert "hardly tells" not in first.text + third.text


def test_mirrors_undo_themselves_and_keep_the_hanging_wall():
    n = normals(np.array([20.0, 25.0]), np.array([50.0, 60.0]))
    for signs in ((-1.0, -1.0, 1.0), (-1.0, 1.0, 1.0)):
        assert mirrored(mirrored(n, signs), signs) == pytest.approx(n)
        assert (mirrored(n, signs)[:, 2] > 0).all()


def test_the_fit_of_a_word_falls_from_its_middle_to_its_edge():
    sector = Sector(-90.0, 90.0, ("normal",))
    fits = graded_fit(np.array([-90.0, -45.0, -22.5, -0.01, 1.0, 90.0]), sector)
    assert fits == pytest.approx([1.0, 1.0, 0.55, 0.1, 0.0, 0.0], abs=1e-3)
    assert by_chance(sector) == 0.25


def test_standing_is_that_of_a_plain_sum():
    odds, rng = EvidenceModel(), np.random.default_rng(3)
    for _ in range(20):
        n = rng.normal(size=3)
        n /= np.linalg.norm(n)
        plain = 0.0
        for obtuse, share, factor in ((False, 0.9, 1.0), (True, 0.1, 1.5)):
            half = math.radians(30.0 if not obtuse else 60.0)
            best = max(
                abs(sum(a * (math.sin(half) * UPRIGHT[0][i] + sign * math.cos(half) * UPRIGHT[2][i]) for i, a in enumerate(n)))
                for sign in (1, -1)
            )
            kappa = 1 / math.radians(7.5 * factor) ** 2
            plain += share * kappa / 2 * math.exp(kappa * (min(best, 1.0) - 1))
        assert standing(n[None], np.ones(1), UPRIGHT[None], odds) == pytest.approx(
            0.3 + 0.7 * plain, rel=2e-3
        )  # a flat plane is a little rough


def test_a_consistent_fault_has_no_cause():
    posterior = known_stress()
    n = normals(0.0, 60.0)[None]
    _, prediction = judge(posterior, 0, n, np.ones(1), sector_of_words("normal"), "", VerdictLimits())
    assert (
        causes_of(Verdict("consistent", 0.0, 0.0, -90.0, 1.0, 1.0), posterior, 0, prediction, n, np.ones(1), sector_of_words("normal"))
        == ()
    )


def test_faults_of_one_older_stress_vouch_for_each_other():
    odds = EvidenceModel()
    half = math.radians(30.0)
    pair = np.array([math.sin(half) * NORTH[0] + side * math.cos(half) * NORTH[2] for side in (1.0, -1.0, 1.0)])
    pair = np.sign(pair[:, 2:] + 1e-12) * pair
    rakes = [rakes_deg(n, resolved_slip(reduced_tensor(NORTH, 0.5), n)) for n in pair]
    sectors = [sector_of_words(nearest_word(float(rake))) for rake in rakes]
    alone = shared_stress(pair[:1], sectors[:1], odds)
    together = shared_stress(pair, sectors, odds)
    assert alone[0] == pytest.approx(by_chance(sectors[0]), rel=0.1)
    assert (together > 2 * alone[0]).all()
    wrong = shared_stress(pair, [sectors[0].opposite(), *sectors[1:]], odds)
    assert wrong[0] < together[0]


def test_a_shared_stress_moves_the_older_phase_up_and_keeps_the_rest():
    first = Cause("label_swapped", "", 0.55), Cause("older_phase", "", 0.35)
    told = [Verdict("conflicting", 1.0, 170.0, 0.0, 5.0, 0.5, (), first)] * 3 + [Verdict("consistent", 0.0, 5.0, 0.0, 5.0, 0.5)]
    half = math.radians(30.0)
    planes = np.array([math.sin(half) * NORTH[0] + side * math.cos(half) * NORTH[2] for side in (1.0, -1.0, 1.0, 1.0)])
    sectors = [sector_of_words(nearest_word(float(rakes_deg(n, resolved_slip(reduced_tensor(NORTH, 0.5), n))))) for n in planes]
    after = with_shared_stress(told, planes, sectors, EvidenceModel())
    assert [v.causes[0].key for v in after[:3]] == ["older_phase"] * 3
    assert all(sum(c.score for c in v.causes) <= 1 + 1e-9 for v in after)
    assert after[3] == told[3]
    assert with_shared_stress(told[2:], planes[2:], sectors[2:], EvidenceModel()) == told[2:], "one conflict alone shares nothing"


def conjugate_model(axes=UPRIGHT, spread=4.0):
    """Planes of both sets with the word each moves by."""
    turns = np.random.default_rng(8).normal(0.0, math.radians(spread), (16, 3))
    sides = np.where(np.arange(16) % 2, 1.0, -1.0)[:, None]
    n = 0.5 * axes[0] + sides * math.sqrt(0.75) * axes[2] + turns
    n = n / np.sqrt((n**2).sum(1))[:, None]
    n = np.where(n[:, 2:] < 0, -n, n)
    rakes = rakes_deg(n, resolved_slip(reduced_tensor(axes, 0.5), n))
    return n, [sector_of_words(nearest_word(float(rake))) for rake in rakes]


def gains(n, sectors):
    return {cause.key: cause.gain_nats for cause in whole_model_causes(n, sectors, EvidenceModel())}


@pytest.mark.parametrize("axes", [UPRIGHT, NORTH])
def test_labels_swapped_throughout_show_against_the_angle_of_the_pairs(axes):
    n, sectors = conjugate_model(axes)
    assert not gains(n, sectors)
    assert gains(n, [s.opposite() for s in sectors])["labels_swapped"] > 6


def test_a_mirrored_plan_shows_in_strike_slip_and_not_in_dip_slip():
    n, sectors = conjugate_model(NORTH)
    assert gains(mirrored_each(n, (-1.0, 1.0, 1.0)), sectors)["plan_mirrored"] > 6
    n, sectors = conjugate_model(UPRIGHT)
    assert gains(mirrored_each(n, (-1.0, 1.0, 1.0)), sectors).get("plan_mirrored", 0.0) < 1


@pytest.mark.parametrize("axes", [UPRIGHT, NORTH])
def test_depth_read_as_elevation_of_all_faults_cannot_be_seen(axes):
    n, sectors = conjugate_model(axes)
    assert not gains(mirrored_each(n, (-1.0, -1.0, 1.0)), sectors)


def mirrored_each(n, signs):
    return np.concatenate([mirrored(row[None], signs) for row in n])


@pytest.mark.parametrize(("plane", "word"), [((10.0, 55.0), "reverse"), ((70.0, 40.0), "dextral"), ((130.0, 75.0), "normal-sinistral")])
def test_scores_are_those_of_plain_sums(plane, word):
    lean = np.array([[0.1, 0.2, 0.974679], [0.0, 0.979589, -0.201008], [0, 0, 0]])
    lean[1] -= (lean[1] @ lean[0]) * lean[0]
    lean[:2] /= np.sqrt((lean[:2] ** 2).sum(1))[:, None]
    lean[2] = np.cross(lean[0], lean[1])
    n, sector, odds = normals(*plane), sector_of_words(word), EvidenceModel()
    posterior = known_stress(lean)
    _, prediction = judge(posterior, 0, n[None], np.ones(1), sector, "", VerdictLimits(conflicting_from=0.0))
    verdict = Verdict("conflicting", 1.0, 100.0, 0.0, 5.0, 0.5)
    found = causes_of(verdict, posterior, 0, prediction, n[None], np.ones(1), sector)

    def fits(m, declared):
        rake = float(rakes_deg(m, resolved_slip(reduced_tensor(lean, GRID[3]), m)))
        off = abs((rake - declared.rake_deg + 180) % 360 - 180)
        half = declared.half_width_deg
        return 0.0 if off > half else 1.0 if off < half / 2 else 1 - 0.9 * (off - half / 2) / (half / 2)

    def stands(m):
        return standing(m[None], np.ones(1), lean[None], odds)

    belief = {row.key: row.belief for row in CAUSES}
    around = [np.array([-n[0], -n[1], n[2]])]
    plan = [np.array([-n[0], n[1], n[2]]), np.array([n[1], n[0], n[2]])]
    plain = {
        "label_swapped": belief["label_swapped"] * stands(n) * fits(n, sector.opposite()),
        "dips_other_way": belief["dips_other_way"] * sum(stands(m) * fits(m, sector) for m in around),
        "mirrored": belief["mirrored"] * sum(stands(m) * fits(m, sector) for m in plan) / 2,
    }
    scores = {cause.key: cause.score for cause in found}
    told = [key for key in plain if key in scores]
    unit = belief["older_phase"] * by_chance(sector)
    for key in told:
        if "older_phase" in scores:
            assert scores[key] / scores["older_phase"] == pytest.approx(plain[key] / unit, rel=1e-6)
        else:
            assert scores[key] == pytest.approx(plain[key] / unit * (scores[told[0]] * unit / plain[told[0]]), rel=1e-6)
    best = max(plain, key=lambda key: plain[key])
    assert plain[best] < 0.3 * unit or best in told or "older_phase" in scores
