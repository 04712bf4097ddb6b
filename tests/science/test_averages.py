"""Averages and heterogeneity against published numbers.

Sources: Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 197-199 and 206 (well HBK5: A 165, G 158.7, H 151.4;
table of the share strictly greater); a printed exercise of three layers of 1-ft plugs (137 mD); a printed
Lorenz table of 29 layers (sums 5635 and 869.9, shares to three digits). What was computed outside this
program is marked so. Two printed statements do not follow from their own formulas, and the right value is
held: the permeability of a log-normal field (159.55 for 160.98 mD) and uniform rock's Lorenz coefficient
(near 1 for 0). Values filled in below detection are held against statsmodels, quantiles and intervals against
NumPy and SciPy.
"""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import special, stats

from corelab.errors import Impossible
from corelab.science import averages, heterogeneity

HBK5 = [120, 213, 180, 200, 212, 165, 145, 198, 210, 143, 79, 118, 212, 117]
LAYERS = [
    [485, 50, 395, 110],
    [210, 205, 60, 203, 105, 195],
    [100, 95, 20, 96, 98, 30, 89, 86, 90, 10],
]
ONE = np.ones


def test_published_means_of_fourteen_intervals():
    found = averages.means(HBK5, ONE(14))
    assert found.arithmetic == pytest.approx(165, abs=0.5)
    assert found.geometric == pytest.approx(158.7, abs=0.05)
    assert found.harmonic == pytest.approx(151.4, abs=0.05)


def test_published_layers_of_plugs():
    layers = [float(averages.means(k, ONE(len(k))).arithmetic) for k in LAYERS]
    assert layers == pytest.approx([260, 163, 71.4], abs=0.05)
    whole = averages.means(layers, [4, 6, 10])
    assert whole.arithmetic == pytest.approx(137, abs=0.5)
    plugs = np.concatenate(LAYERS)
    assert averages.means(plugs, ONE(20)).harmonic == pytest.approx(59.16730465442497, rel=1e-12)  # computed


@pytest.mark.parametrize(
    ("exponent", "mean"),
    [
        (-1, 19.480519480519483),
        (-0.5, 26.3759600768371),
        (0, 47.581096479732714),
        (1 / 3, 85.63545246500456),
        (0.5, 116.4189862666629),
        (1, 243.33333333333334),
    ],
)
def test_power_means(exponent: float, mean: float):
    """Computed outside this program."""
    assert averages.power_mean([10, 50, 1000], [20, 15, 10], exponent) == pytest.approx(mean, rel=1e-12)


def test_a_log_normal_field_has_the_right_mean_in_its_exponent():
    """Tiab & Donaldson 2004, p. 198: m 5.067, s^2 0.0869 (divisor n), and k_e 159.55, which needs the
    geometric mean of the ln k (5.058) for m; the formula gives 160.98 (computed outside)."""
    logs = np.log(HBK5)
    assert logs.mean() == pytest.approx(5.067, abs=0.0005)
    assert logs.var() == pytest.approx(0.0869, abs=0.00005)
    as_printed = (1 + logs.var() / 6) * np.exp(np.exp(np.log(logs).mean()))
    assert as_printed == pytest.approx(159.55, abs=0.005)
    found = averages.log_normal_field_permeability_md(HBK5)
    assert found == pytest.approx(160.97886570778968, rel=1e-12)


WEIGHED = st.lists(st.tuples(st.floats(1e-3, 1e4), st.floats(0.05, 3)), min_size=2, max_size=20)


@given(WEIGHED, st.floats(0, 1))
def test_quantiles_and_spread_with_weights_alike_are_the_usual_ones(
    rows: list[tuple[float, float]], q: float
):
    """Oracle: NumPy."""
    x, w = np.array(rows).T[0], np.full(len(rows), 0.3)
    assert averages.weighted_quantiles(x, w, q) == pytest.approx(np.quantile(x, q), rel=1e-9)
    assert averages.weighted_sd(x, w) == pytest.approx(x.std(ddof=1), rel=1e-9, abs=1e-9)
    assert averages.effective_count(w) == pytest.approx(len(rows))


@given(WEIGHED)
def test_quantiles_rise_and_do_not_heed_the_scale_of_the_weights(rows: list[tuple[float, float]]):
    x, w = np.array(rows).T
    found = averages.weighted_quantiles(x, w, np.linspace(0, 1, 11))
    assert (np.diff(found) >= -1e-12 * x.max()).all()
    assert (found[0], found[-1]) == (x.min(), x.max())
    assert averages.weighted_quantiles(x, 7 * w, np.linspace(0, 1, 11)) == pytest.approx(found, rel=1e-9)
    by_weight = averages.weighted_sd(x, w)
    assert averages.weighted_sd(x, 7 * w) == pytest.approx(by_weight, rel=1e-9, abs=1e-12 * x.max())
    assert 1 - 1e-9 <= averages.effective_count(w) <= len(x) + 1e-9
    assert averages.weighted_quantiles(x[:1], w[:1], [0.1, 0.9]).tolist() == [x[0], x[0]]


@pytest.mark.parametrize("alike", [True, False])
def test_resampled_intervals_are_those_of_plain_resampling(alike: bool):
    """Oracle: each resample by the functions for one sample, drawn by NumPy; SciPy's percentile interval."""
    random = np.random.default_rng(3)
    x = random.lognormal(size=31)
    w = np.full(31, 0.4) if alike else random.uniform(0.1, 1, 31)
    found = averages.bootstrap_intervals(x, w, 4000, 1)
    assert found == averages.bootstrap_intervals(x, w, 4000, 1)
    drawn = random.integers(0, 31, size=(4000, 31))
    plain = {
        "geometric mean": [float(averages.means(x[r], w[r]).geometric) for r in drawn],
        "harmonic mean": [float(averages.means(x[r], w[r]).harmonic) for r in drawn],
        "median": [float(averages.weighted_quantiles(x[r], w[r], 0.5)) for r in drawn],
    }
    for name, values in plain.items():
        width = found[name][1] - found[name][0]
        assert found[name] == pytest.approx(tuple(np.quantile(values, [0.025, 0.975])), abs=0.08 * width)
    if alike:
        other = stats.bootstrap(
            (x,), np.mean, n_resamples=4000, method="percentile", rng=2
        ).confidence_interval
        width = other.high - other.low
        assert found["arithmetic mean"] == pytest.approx((other.low, other.high), abs=0.08 * width)


def test_resampled_means_hold_the_truth_as_often_as_they_say():
    """Simulated: 400 samples of 60 from a log-normal field of s 0.7; the interval of the geometric mean holds
    1 in 95 % of them (89 to 98 % allows for 60 values and 400 samples)."""
    random = np.random.default_rng(9)
    held = 0
    for seed in range(400):
        low, high = averages.bootstrap_intervals(random.lognormal(0, 0.7, 60), ONE(60), 400, seed)[
            "geometric mean"
        ]
        held += low <= 1.0 <= high
    assert 0.89 <= held / 400 <= 0.98


def test_many_plugs_are_resampled_fast():
    x = np.random.default_rng(0).lognormal(size=6000)
    start = time.process_time()
    averages.bootstrap_intervals(x, ONE(6000), 1000, 1)
    assert time.process_time() - start < 2.0


VALUES = st.lists(st.floats(1e-4, 1e5), min_size=1, max_size=20)


@given(VALUES, st.floats(-3, 3), st.floats(0.01, 3))
def test_the_power_mean_rises_with_its_exponent_and_lies_within(values: list[float], p: float, more: float):
    w = np.linspace(1, 2, len(values))
    low, high = averages.power_mean(values, w, p), averages.power_mean(values, w, p + more)
    assert low <= high * (1 + 1e-9)
    assert min(values) * (1 - 1e-9) <= low
    assert high <= max(values) * (1 + 1e-9)
    found = averages.means(values, w)
    assert found.harmonic <= found.geometric * (1 + 1e-9)
    assert found.geometric <= found.arithmetic * (1 + 1e-9)


@given(VALUES, st.floats(1e-3, 1e3))
def test_means_scale_with_the_unit(values: list[float], factor: float):
    a = averages.means(values, ONE(len(values)))
    b = averages.means(np.array(values) * factor, ONE(len(values)))
    assert b.geometric == pytest.approx(float(a.geometric) * factor, rel=1e-9)


# -- below detection ----------------------------------------------------------------------------------------


def test_nothing_below_detection_changes_nothing():
    found = averages.filled_below_detection([3.0, 1.0, 2.0], [False] * 3)
    assert found.values.tolist() == [3.0, 1.0, 2.0]


def test_a_log_normal_sample_is_recovered_from_its_detected_half():
    """Simulated: 4000 values of ln mean 0 and sd 1, a third below one of two limits: within 0.05."""
    rng = np.random.default_rng(5)
    truth = np.exp(rng.normal(size=4000))
    limit = np.where(rng.random(4000) < 0.5, 0.5, 0.8)
    below = truth < limit
    assert 0.3 < below.mean() < 0.4
    found = averages.filled_below_detection(np.where(below, limit, truth), below)
    logs = np.log(found.values)
    assert logs.mean() == pytest.approx(0.0, abs=0.05)
    assert logs.std() == pytest.approx(1.0, abs=0.05)
    assert (found.values[below] <= limit[below]).all()
    assert (found.values[~below] == truth[~below]).all()
    halved = np.log(np.where(below, limit / 2, truth))
    assert abs(logs.std() - 1) < abs(halved.std() - 1)  # half the limit, the common stopgap, does worse


def test_several_limits_are_filled_as_by_another_program():
    """Oracle: statsmodels, whose values for those below detection follow Helsel & Cohn 1988 too."""
    from statsmodels.imputation.ros import impute_ros

    x = np.array([1.0, 1.0, 2.0, 2.0, 3.1, 0.6, 0.9, 1.7, 4.4, 5.2, 2.6, 1.3, 7.9, 0.7, 3.7])
    below = np.array([True, True, True, True, *[False] * 11])
    given_back = impute_ros("x", "below", df=pd.DataFrame({"x": x, "below": below}))
    found = averages.filled_below_detection(x, below)
    assert np.sort(found.values[below]) == pytest.approx(
        np.sort(np.setdiff1d(given_back, x[~below])), rel=1e-9
    )


def test_too_few_above_detection_stay_at_their_limits():
    found = averages.filled_below_detection([0.01, 0.01, 0.01, 5.0], [True, True, True, False])
    assert found.values.tolist() == [0.01, 0.01, 0.01, 5.0]
    assert "too few" in found.method


# -- lengths ------------------------------------------------------------------------------------------------


def test_lengths_fill_the_core_between_its_ends():
    found = averages.lengths_represented([10.1, 10.4, 10.9], 10.0, 11.0)
    assert found == pytest.approx([0.1 + 0.15, 0.15 + 0.25, 0.25 + 0.1])
    assert averages.lengths_represented([10.4, 10.1, 10.9], 10.0, 10.95).sum() == pytest.approx(0.95)


def test_a_single_plug_does_not_stand_for_a_whole_run():
    assert averages.lengths_represented([10.5], 0.0, 30.0).tolist() == [1.0]
    assert averages.lengths_represented([10.5], 0.0, 30.0, 0.3) == pytest.approx([0.3])
    assert averages.lengths_represented([10.5], 10.4, 10.55, 0.3) == pytest.approx([0.15])


def test_a_plug_without_depth_stands_for_nothing():
    assert averages.lengths_represented([1.0, np.nan, 1.4]) == pytest.approx([0.4, 0.0, 0.4])
    assert averages.lengths_represented([np.nan]).tolist() == [0.0]


def test_plugs_of_one_depth_share_its_length_and_a_gap_is_nobodys():
    found = averages.lengths_represented([1.0, 1.0, 1.3, 1.6, 9.0])
    assert found[0] == found[1]
    assert found.sum() < 3.0


# -- heterogeneity ------------------------------------------------------------------------------------------

V = {  # one data set, five conventions: computed outside this program
    "regression": 0.28307966545773866,
    "regression, middle positions": 0.250794658196143,
    "regression, weighted middle": 0.28891632555377755,
    "log-normal": 0.2635940339771464,
    "interpolation": 0.28954390171245503,
}


@pytest.mark.parametrize("convention", heterogeneity.CONVENTIONS)
def test_dykstra_parsons_by_each_convention(convention: str):
    assert heterogeneity.dykstra_parsons(HBK5, convention) == pytest.approx(V[convention], abs=1e-6)


def test_an_unknown_convention_is_no_other_one():
    with pytest.raises(Impossible, match="convention: found 'eye'"):
        heterogeneity.dykstra_parsons(HBK5, "eye")


def test_the_interval_of_dykstra_parsons_is_that_of_plain_resampling():
    """Oracle: the coefficient of each resample drawn by NumPy."""
    random = np.random.default_rng(4)
    k = random.lognormal(3, 0.9, 40)
    found = heterogeneity.dykstra_parsons_interval(k, 3000, 1)
    plain = [heterogeneity.dykstra_parsons(random.choice(k, 40)) for _ in range(3000)]
    assert found == pytest.approx(tuple(np.quantile(plain, [0.025, 0.975])), abs=0.02)
    assert found[0] < heterogeneity.dykstra_parsons(k) < found[1]


def test_a_log_normal_field_has_the_coefficient_of_its_spread():
    """Limit: V = 1 - exp(-s), L = erf(s/2), Cv = sqrt(exp(s^2) - 1); 0.6321, 0.5205, 1.3108 for s = 1."""
    k = np.exp(special.ndtri((np.arange(200_000) + 0.5) / 200_000))
    assert heterogeneity.dykstra_parsons(k) == pytest.approx(0.6321, abs=0.0005)
    assert heterogeneity.dykstra_parsons(k, "log-normal") == pytest.approx(0.6321, abs=0.0005)
    found = heterogeneity.lorenz(k, ONE(k.size), ONE(k.size))
    assert found.coefficient == pytest.approx(0.5205, abs=0.0005)
    assert k.std() / k.mean() == pytest.approx(1.3108, rel=0.01)


K29 = [435, 254, 196, 172, 166, 158, 153, 147, 128, 105, 100, 91, 90, 83, 72, 62, 49, 49, 49, 44, 40, 35, 32,
       30, 28, 27, 27, 20, 9]  # fmt: skip
H29 = [2, 2, 2, 3, 2, 2, 2, 2, 1, 2, 1, 2.5, 1.5, 2, 1.5, 2, 2.5] + [2] * 12
PHI29 = [18, 19.2, 17.4, 17.2, 17.4, 16.8, 15.9, 16.7, 17.6, 16.8, 15.6, 16.1, 15.4, 15.2, 15.7, 15.6, 15.2,
         14.9, 14.8, 14.1, 13.7, 14.2, 13.6, 14.1, 14, 12.6, 12.3, 12.2, 10.6]  # fmt: skip


def test_published_lorenz_table():
    """29 layers: sum kh 5635, sum phi h 869.9, F 0.154 0.245 0.314 0.406, S 0.041 0.086 0.126 0.185."""
    assert np.dot(K29, H29) == 5635
    assert np.dot(PHI29, H29) == pytest.approx(869.9)
    by_k = heterogeneity.lorenz_by_permeability(K29, PHI29, H29)
    assert by_k.flow[1:5] == pytest.approx([0.154, 0.245, 0.314, 0.406], abs=0.0005)
    assert by_k.storage[1:5] == pytest.approx([0.041, 0.086, 0.126, 0.185], abs=0.0005)
    assert by_k.coefficient == pytest.approx(0.38738859518677193, rel=1e-9)  # computed
    assert heterogeneity.lorenz(K29, PHI29, H29).coefficient == pytest.approx(0.3878385444053023, rel=1e-9)


def test_lorenz_limits():
    """Uniform rock 0; one of ten layers that carries all flow 1 - 1/10."""
    assert heterogeneity.lorenz([100] * 10, [0.2] * 10, ONE(10)).coefficient == pytest.approx(0, abs=1e-12)
    one = heterogeneity.lorenz([100] + [0] * 9, [0.2] * 10, ONE(10))
    assert one.coefficient == pytest.approx(0.9, abs=1e-12)
    with pytest.raises(Impossible, match="one layer that flows"):
        heterogeneity.lorenz([0.0, 0.0], [0.2, 0.2], ONE(2))


@given(st.lists(st.tuples(st.floats(1e-3, 1e4), st.floats(0.02, 0.4)), min_size=2, max_size=30))
def test_lorenz_lies_between_0_and_1_and_the_sorted_curve_is_the_highest(rows: list[tuple[float, float]]):
    k, phi = np.array(rows).T
    h = ONE(len(rows))
    sorted_curve = heterogeneity.lorenz(k, phi, h)
    assert -1e-9 <= sorted_curve.coefficient <= 1
    assert heterogeneity.stratigraphic_lorenz(k, phi, h).coefficient <= sorted_curve.coefficient + 1e-9
    assert heterogeneity.lorenz(7 * k, phi, h).coefficient == pytest.approx(
        float(sorted_curve.coefficient), abs=1e-9
    )


def test_variation_and_how_many_samples():
    """Cv of HBK5 0.2713 with n-1: homogeneous, 7.4 samples; the rule's examples 25, 100 and 400."""
    cv = np.std(HBK5, ddof=1) / np.mean(HBK5)
    assert cv == pytest.approx(0.2713, abs=0.00005)
    assert heterogeneity.samples_needed(cv) == pytest.approx(7.4, abs=0.05)
    assert [heterogeneity.samples_needed(c) for c in (0.5, 1.0, 2.0)] == [25, 100, 400]
    words = [heterogeneity.variation_class(c) for c in (0.3, 0.51, 1.01)]
    assert words == ["homogeneous", "heterogeneous", "very heterogeneous"]
    assert heterogeneity.tolerance_percent(1.0, 100) == 20


def test_the_real_pairs_of_plugs(open_data: Path):
    """246 pairs with both above zero, computed outside: geometric mean of kv/kh 0.410126, median 0.524049, kv
    above kh in 55, harmonic kv over arithmetic kh 1.0e-4."""
    rows = pd.read_csv(open_data / "norway_7121_8-1" / "nod_7121_8-1_core_plugs.csv")
    rows = rows[(rows["kKl_h"] > 0) & (rows["kKl_v"] > 0)]
    kv, kh = rows["kKl_v"].to_numpy(), rows["kKl_h"].to_numpy()
    assert len(rows) == 246
    assert averages.means(kv / kh, ONE(246)).geometric == pytest.approx(0.410126, abs=0.0000005)
    assert averages.weighted_quantiles(kv / kh, ONE(246), 0.5) == pytest.approx(0.524049, abs=0.0000005)
    assert (kv > kh).sum() == 55
    layers = averages.means(kv, ONE(246)).harmonic / averages.means(kh, ONE(246)).arithmetic
    assert layers == pytest.approx(0.0001032300088337995, rel=1e-9)


def test_the_real_norwegian_plugs(open_data: Path):
    """249 plugs, computed outside: A 473.499, G 14.70235, H 0.234817 mD, Cv 3.94663, V 0.963967 and 0.964636,
    Lorenz 0.858919 and 0.859473, mean porosity 16.0507 %."""
    rows = pd.read_csv(open_data / "norway_7121_8-1" / "nod_7121_8-1_core_plugs.csv")
    rows = rows[(rows["kKl_h"] > 0) & rows["por_h"].notna()]
    k, phi = rows["kKl_h"].to_numpy(), rows["por_h"].to_numpy() / 100
    assert len(k) == 249
    found = averages.means(k, ONE(249))
    assert found.arithmetic == pytest.approx(473.499, abs=0.0005)
    assert found.geometric == pytest.approx(14.70235, abs=0.000005)
    assert found.harmonic == pytest.approx(0.234817, abs=0.0000005)
    assert k.std(ddof=1) / k.mean() == pytest.approx(3.94663, abs=0.000005)
    assert heterogeneity.dykstra_parsons(k, "log-normal") == pytest.approx(0.963967, abs=0.0000005)
    assert heterogeneity.dykstra_parsons(k) == pytest.approx(0.964636, abs=0.0000005)
    by_k = heterogeneity.lorenz_by_permeability(k, phi, ONE(249))
    assert by_k.coefficient == pytest.approx(0.858919, abs=0.0000005)
    assert heterogeneity.lorenz(k, phi, ONE(249)).coefficient == pytest.approx(0.859473, abs=0.0000005)
    assert phi.mean() * 100 == pytest.approx(16.0507, abs=0.00005)
