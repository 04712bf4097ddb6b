"""Crush likelihood: formulas against worked values, limits, and laws.

Sources of the published or independently worked values: external studentised residual against the t of a
prediction (identity; worked set of eight plugs); Good 1950 (log-odds, from memory); Brier score and AUC by
their definitions, on ten worked plugs; Kozeny-Carman ratios; Beard & Weyl 1973, AAPG Bull. 57:349-369.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from corelab.science import impact
from corelab.science.texture import packing_porosity_frac

POROSITY = [0.18, 0.20, 0.22, 0.24, 0.26, 0.28, 0.30]
DECADES = [1.62, 1.90, 2.22, 2.41, 2.73, 2.98, 3.31]


# ---- limit: the event, the caps, the tables


def test_the_event_is_two_porosity_units_or_a_factor_of_two():
    assert impact.EVENT_POROSITY_FRAC == 0.02
    assert 10**impact.EVENT_DECADES == pytest.approx(2.0)
    assert np.exp(impact.CAP) == pytest.approx(10.0)


def test_frequencies_of_marks_sum_to_one():
    table = np.array(list(impact.CONDITION.values()))
    np.testing.assert_allclose(table.sum(axis=0), 1.0, atol=1e-12)


# ---- worked values, as printed


@pytest.mark.parametrize(
    ("before", "after", "ratio", "half"), [(0.35, 0.30, 0.543, 5e-4), (0.12, 0.15, 2.093, 5e-4)]
)
def test_permeability_that_porosity_alone_takes(before, after, ratio, half):
    assert 10 ** float(impact.kozeny_carman_change_decades(before, after)) == pytest.approx(ratio, abs=half)


@pytest.mark.parametrize(
    ("bulk", "matrix", "fluid", "porosity"),
    [(2.2, 2.65, 1.0, 0.2727), (2.2, 2.65, 0.8, 0.2432)],
)
def test_density_porosity(bulk, matrix, fluid, porosity):
    assert float(impact.density_porosity_frac(bulk, matrix, fluid)) == pytest.approx(porosity, abs=5e-5)


def test_density_porosity_moves_as_worked():
    one = impact.density_porosity_frac
    assert 100 * float(one(2.18, 2.65, 1.0) - one(2.20, 2.65, 1.0)) == pytest.approx(1.212, abs=5e-4)
    assert 100 * float(one(2.2, 2.66, 1.0) - one(2.2, 2.65, 1.0)) == pytest.approx(0.438, abs=5e-4)


def test_external_residual_is_the_t_of_a_prediction_from_the_others():
    """Worked: -30.12 by both routes; the internal residual of the same plug would be capped at -2.44."""
    line = impact.predict_line(POROSITY, DECADES, [0.25])
    t = (1.55 - line.predicted.centre[0]) / line.predicted.scale[0]
    assert t == pytest.approx(-30.12, abs=5e-3)
    assert line.predicted.freedom[0] == 5.0
    with_it = impact.predict_line([*POROSITY, 0.25], [*DECADES, 1.55], [])
    own = (1.55 - with_it.own.centre[-1]) / with_it.own.scale[-1]
    assert own == pytest.approx(-30.12, abs=5e-3)
    assert with_it.own.freedom[-1] == 5.0


def test_external_residuals_as_an_independent_library_has_them():
    """Oracle: statsmodels' externally studentised residuals."""
    rng = np.random.default_rng(3)
    x = rng.uniform(0.1, 0.3, 40)
    y = -1 + 14 * x + rng.normal(0, 0.3, 40)
    line = impact.predict_line(x, y, x)
    influence = sm.OLS(y, sm.add_constant(x)).fit().get_influence()
    np.testing.assert_allclose((y - line.own.centre) / line.own.scale, influence.resid_studentized_external)


def test_log_odds_as_worked():
    p = impact.likelihood_frac(0.3, np.log([4, 2.5, 0.5, 1.5]).sum())
    assert float(p) == pytest.approx(0.7627, abs=5e-5)
    assert float(impact.likelihood_frac(0.3, 0.6 * 2.0149)) == pytest.approx(0.5894, abs=5e-5)


def test_fit_of_many_degrees_is_the_normal_ratio():
    """Worked: x -0.5, damaged -0.6 (0.5) against sound 0 (0.25): ln LR 1.287."""
    many = 1e7
    damaged = impact.density_fit(-0.5, 0.5, many, -0.6)
    sound = impact.density_fit(-0.5, 0.25, many, 0.0)
    assert float(damaged - sound) == pytest.approx(1.287, abs=5e-4)


def test_fit_is_students_density():
    """Oracle: scipy."""
    assert float(impact.density_fit(0.03, 0.02, 7.0, 0.01)) == pytest.approx(
        stats.t.logpdf(0.02, 7, scale=0.02)
    )


def test_scores_of_ten_plugs_as_worked():
    y = [1, 0, 1, 1, 0, 0, 1, 0, 0, 0]
    p = [0.9, 0.2, 0.7, 0.4, 0.3, 0.1, 0.8, 0.6, 0.2, 0.1]
    found = impact.skill(p, y)
    assert found.brier == pytest.approx(0.105, abs=5e-4)
    assert found.base_brier == pytest.approx(0.24, abs=5e-3)
    assert found.skill == pytest.approx(0.5625, abs=5e-5)
    assert found.auc == pytest.approx(0.9583, abs=5e-5)
    assert found.low < found.skill < found.high


def test_skill_ranks_ties_as_half():
    found = impact.skill([0.5, 0.5, 0.5, 0.5], [1, 0, 1, 0])
    assert found.auc == pytest.approx(0.5)


def test_packing_limit_is_that_of_beard_and_weyl():
    """Published: Beard & Weyl 1973, class mean of well sorted sand 39.0 % (So 1.3); field sands within 5."""
    packed = float(packing_porosity_frac(0.561))
    assert packed == pytest.approx(0.390, abs=0.01)
    assert float(impact.packing_fit(packed + 0.05, packed, 0.0)) == pytest.approx(0.0)
    assert float(impact.packing_fit(packed + 0.09, packed, 0.0)) == pytest.approx(-2.0)


def test_prediction_from_nothing_is_what_was_assumed():
    predicted, own = impact.predict_level([], [], 0.02, 0.01, 0.25, 4.0)
    assert float(predicted.centre) == pytest.approx(0.02)
    assert float(predicted.scale) == pytest.approx(0.01 * np.sqrt(5.0))
    assert own.centre.size == 0


def test_prediction_from_many_is_theirs():
    rng = np.random.default_rng(1)
    x = rng.normal(0.03, 0.012, 4000)
    predicted, own = impact.predict_level(x, np.ones(4000), 0.0, 0.02, 0.25, 4.0)
    assert float(predicted.centre) == pytest.approx(x.mean(), abs=1e-5)
    assert float(predicted.scale) == pytest.approx(x.std(), rel=1e-2)
    assert np.all(own.freedom < predicted.freedom)


def test_each_from_the_others_is_the_prediction_without_it():
    x = np.array([0.01, 0.03, 0.02, 0.05])
    _, own = impact.predict_level(x, np.ones(4), 0.0, 0.02, 0.25, 4.0)
    for i in range(4):
        rest, _ = impact.predict_level(np.delete(x, i), np.ones(3), 0.0, 0.02, 0.25, 4.0)
        assert own.centre[i] == pytest.approx(float(rest.centre))
        assert own.scale[i] == pytest.approx(float(rest.scale))


# ---- what damage may do


def changes(porosity=0.28, slope=14.0, soft=0.6):
    return impact.damage([porosity], [slope], [soft])


def test_every_change_matters_and_shares_sum_to_one():
    made = changes()
    there = np.isfinite(made.log_share[0])
    dphi, dk = made.porosity_change_frac[0][there], made.permeability_change_decades[0][there]
    assert np.all((np.abs(dphi) > 0.02) | (np.abs(dk) > np.log10(2.0)))
    assert np.exp(made.log_share[0][there]).sum() == pytest.approx(1.0)
    by_kind = [np.exp(made.log_share[0][there & (made.kind == k)]).sum() for k in range(3)]
    assert by_kind == pytest.approx([0.4, 0.2, 0.4])


def test_the_directions_are_those_of_the_kinds():
    made = changes()
    compacted, loosened, shattered = (made.kind == k for k in range(3))
    assert np.all(made.porosity_change_frac[0][compacted] < 0)
    assert np.all(made.permeability_change_decades[0][compacted] < 0)
    assert np.all(made.porosity_change_frac[0][loosened] > 0)
    assert np.all(made.permeability_change_decades[0][loosened] >= 0)
    assert np.all(made.permeability_change_decades[0][shattered] > 0)


def residual_ratio(residual: float, soft: float) -> float:
    made = changes(soft=soft)
    fit = impact.permeability_fit(
        residual,
        np.hypot(0.2, made.width_decades),
        10.0,
        14.0,
        made.porosity_change_frac,
        made.permeability_change_decades,
    )
    sound = impact.permeability_fit(np.array([residual]), 0.2, 10.0, 14.0, 0.0, 0.0)
    return float(impact.weigh([impact.Term("k", sound, fit, np.ones(1))], made).effect[0, 0])


def test_low_is_suspicious_in_soft_sand_and_high_in_hard_rock():
    assert residual_ratio(-0.7, 0.95) > 0.5
    assert residual_ratio(-0.5, 0.05) < residual_ratio(-0.5, 0.95) - 0.5
    assert residual_ratio(-0.4, 0.0) < 0.0
    assert residual_ratio(0.7, 0.05) > 0.5
    assert residual_ratio(0.7, 0.95) < residual_ratio(0.7, 0.05) - 0.5
    assert residual_ratio(0.4, 1.0) < 0.3  # compaction less steep than the trend leaves a plug above it


def test_on_the_trend_speaks_against_damage_but_never_loudly():
    """A compacted plug slides along the trend, so that lying on it cannot acquit."""
    assert -1.0 < residual_ratio(0.0, 0.95) < 0.0


# ---- laws of weighing


def some_terms(differences, scales, weights=(1.0, 1.0)):
    made = changes()
    terms = [
        impact.Term(
            str(i),
            impact.density_fit(np.array([d]), s, 10.0, 0.0),
            impact.density_fit(d, s, 10.0, made.porosity_change_frac),
            np.array([w]),
        )
        for i, (d, s, w) in enumerate(zip(differences, scales, weights, strict=True))
    ]
    return made, terms


@given(st.floats(-0.02, 0.02), st.floats(-0.02, 0.02), st.floats(0.015, 0.05), st.floats(0.015, 0.05))
def test_what_two_terms_share_counts_once(d1, d2, s1, s2):
    """The effects sum to the ratio of both together, in whichever order."""
    made, terms = some_terms((d1, d2), (s1, s2))
    both = impact.weigh(terms, made)
    from scipy.special import logsumexp

    joint = (
        logsumexp(made.log_share + terms[0].damaged + terms[1].damaged, axis=1)
        - terms[0].sound
        - terms[1].sound
    )
    if np.all(np.abs(both.ratio) < impact.CAP):
        assert both.total == pytest.approx(joint)
        assert impact.weigh(terms[::-1], made).total == pytest.approx(joint)


@given(st.floats(-0.5, 0.5), st.floats(0.005, 0.05), st.floats(0.0, 1.0))
def test_no_term_passes_its_cap(d, s, w):
    made, terms = some_terms((d, d), (s, s), (w, w))
    found = impact.weigh(terms, made)
    assert np.all(np.abs(found.effect) <= w * impact.CAP + 1e-12)
    assert found.kinds.sum() == pytest.approx(1.0)


@given(st.floats(-0.1, 0.1), st.floats(0.01, 0.05))
def test_missing_evidence_adds_nothing(d, s):
    made, terms = some_terms((d, d), (s, s))
    gone = impact.Term("gone", np.array([np.nan]), np.full_like(made.log_share, np.nan), np.ones(1))
    assert impact.weigh([terms[0], gone], made).total == pytest.approx(impact.weigh([terms[0]], made).total)
    assert impact.weigh([gone], made).total == pytest.approx(0.0)


@given(st.floats(0.02, 0.98), st.floats(0.0, 0.01), st.floats(-5, 5))
def test_likelihood_rises_with_the_prior_and_the_evidence(prior, more, odds):
    p = float(impact.likelihood_frac(prior, odds))
    assert 0.0 < p < 1.0
    assert float(impact.likelihood_frac(prior + more, odds)) >= p
    assert float(impact.likelihood_frac(prior, odds + more)) >= p
    assert float(impact.likelihood_frac(prior, 0.0)) == pytest.approx(prior)


def test_verdicts_at_their_limits():
    words = impact.verdicts([0.1999, 0.2, 0.6999, 0.7], [True] * 4)
    assert words.tolist() == ["unlikely", "possible", "possible", "likely"]


# ---- recalibration


def judged(seed: int, n: int, slope: float, intercept: float, prior: float = 0.3):
    rng = np.random.default_rng(seed)
    odds = rng.normal(0, 2, n)
    p = 1 / (1 + np.exp(-(np.log(prior / (1 - prior)) + intercept + slope * odds)))
    return odds, (rng.random(n) < p).astype(float)


def test_recalibration_finds_what_made_the_verdicts():
    odds, y = judged(5, 20000, 0.6, 0.4)
    found = impact.recalibrate(odds, y, 0.3)
    assert found.slope == pytest.approx(0.6, abs=0.05)
    assert found.intercept == pytest.approx(0.4, abs=0.06)


def test_recalibration_as_an_independent_library_has_it():
    """Oracle: statsmodels' binomial fit with an offset; softened targets move it by less than its error."""
    odds, y = judged(6, 300, 1.0, 0.0)
    found = impact.recalibrate(odds, y, 0.3)
    fit = sm.GLM(
        y, sm.add_constant(odds), family=sm.families.Binomial(), offset=np.full(300, np.log(0.3 / 0.7))
    ).fit()
    assert abs(found.intercept - fit.params[0]) < fit.bse[0]
    assert abs(found.slope - fit.params[1]) < fit.bse[1]


def test_recalibration_stays_finite_where_the_classes_part():
    found = impact.recalibrate(np.linspace(-4, 4, 40), np.linspace(-4, 4, 40) > 0, 0.3)
    assert np.isfinite([found.intercept, found.slope]).all() and found.slope > 0.5


def test_evidence_that_misleads_is_worth_nothing_never_the_reverse():
    odds, y = judged(7, 400, -1.0, 0.0)
    assert impact.recalibrate(odds, y, 0.3).slope == 0.0


def test_cross_validation_does_not_see_its_fold():
    odds, y = judged(8, 60, 1.0, 0.0)
    fold = np.arange(60) % 10
    p = impact.cross_validated_frac(odds, y, 0.3, fold)
    turned = y.copy()
    turned[fold == 0] = 1 - turned[fold == 0]
    again = impact.cross_validated_frac(odds, turned, 0.3, fold)
    np.testing.assert_array_equal(p[fold == 0], again[fold == 0])
    assert not np.allclose(p[fold != 0], again[fold != 0])
