"""Propagation of uncertainty against the examples of the GUM, closed forms and laws.

Sources: JCGM 100:2008 (the GUM), examples H.1 (end gauge), H.2 (resistance and reactance) and H.3
(thermometer), eq. G.2b, table G.2; JCGM 101:2008. The five readings of H.2 and the answers of H.3 are from
memory; the readings reproduce the published summary. "Made" numbers were computed outside the program.
"""

from __future__ import annotations

import doctest

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import CorelabError, Impossible, Usage
from corelab.science import uncertainty
from corelab.science.gas_flow import klinkenberg_regression
from corelab.science.saturation import saturations
from corelab.science.uncertainty import (
    DEFAULTS,
    SHARE,
    combined,
    covariance,
    coverage_factor,
    monte_carlo,
    partials,
    propagate,
    repeat_uncertainty,
    welch_satterthwaite,
)
from corelab.science.volumes import (
    caliper_bulk_volume_cm3,
    grain_density_g_cm3,
    porosity_bulk_grain_frac,
)


def test_the_examples_run():
    outcome = doctest.testmod(uncertainty)
    assert outcome.attempted > 0
    assert outcome.failed == 0


# ---- GUM H.1, end gauge (lengths in nm)

END_GAUGE = {
    "standard": 50_000_623.0,
    "difference": 215.0,
    "expansion": 11.5e-6,
    "temperature": -0.1,
    "expansion_difference": 0.0,
    "temperature_difference": 0.0,
}
END_GAUGE_U = {
    "standard": 25.0,
    "difference": 9.7,
    "expansion": 1.2e-6,
    "temperature": 0.41,
    "expansion_difference": 0.58e-6,
    "temperature_difference": 0.029,
}


def end_gauge(standard, difference, expansion, temperature, expansion_difference, temperature_difference):
    return (
        standard
        + difference
        - standard * (expansion_difference * temperature + expansion * temperature_difference)
    )


def test_gum_h1_published():
    found = propagate(end_gauge, END_GAUGE, END_GAUGE_U)
    # H.1.4: l = 50.000 838 mm, u_c = 32 nm
    assert found.value / 1e6 == pytest.approx(50.000838, abs=0.5e-6)
    assert found.standard_uncertainty == pytest.approx(32.0, abs=0.5)
    assert found.standard_uncertainty == pytest.approx(31.71060964, abs=1e-7)  # made
    # table H.1: contributions 25, 9.7, 0, 0, 2.9, 16.6 nm
    shares = {name: float(np.abs(share)) for name, share in found.contributions.items()}
    assert shares["standard"] == pytest.approx(25.0, abs=0.5)
    assert shares["difference"] == pytest.approx(9.7, abs=0.05)
    assert shares["expansion"] == 0.0
    assert shares["temperature"] == 0.0
    assert shares["expansion_difference"] == pytest.approx(2.9, abs=0.05)
    assert shares["temperature_difference"] == pytest.approx(16.6, abs=0.1)  # 16.7 unrounded
    # H.1.6: nu_eff = 16.7, cut to 16; k_99 = 2.92; U_99 = 93 nm
    degrees = welch_satterthwaite(
        found.contributions,
        {"standard": 18, "difference": 25.6, "expansion_difference": 50, "temperature_difference": 2},
    )
    assert degrees == pytest.approx(16.7, abs=0.05)
    factor = coverage_factor(degrees, 0.99)
    assert factor == pytest.approx(2.92, abs=0.005)
    assert factor * found.standard_uncertainty == pytest.approx(93.0, abs=0.5)


def test_gum_h1_second_order_published_by_monte_carlo():
    # H.1.7: 34 nm with the terms of second order (33.911, made)
    found = monte_carlo(end_gauge, END_GAUGE, END_GAUGE_U, draws=40_000, seed=5)
    assert found.standard_uncertainty == pytest.approx(33.911, rel=4.0 / np.sqrt(2 * 40_000))
    assert found.standard_uncertainty == pytest.approx(34.0, abs=0.6)


# ---- GUM H.2, resistance, reactance and impedance

VOLTAGE = np.array([5.007, 4.994, 5.005, 4.990, 4.999])
CURRENT = np.array([19.663, 19.639, 19.640, 19.685, 19.678]) * 1e-3
PHASE = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])


def test_gum_h2_published():
    readings = {"v": VOLTAGE, "i": CURRENT, "phase": PHASE}
    means = {name: values.mean() for name, values in readings.items()}
    u = {name: repeat_uncertainty(values) for name, values in readings.items()}
    # table H.2: means 4.9990, 19.6610e-3, 1.04446; u 0.0032, 0.0095e-3, 0.00075; r -0.36, 0.86, -0.65
    assert [means["v"], means["i"] * 1e3] == pytest.approx([4.9990, 19.6610], abs=0.5e-4)
    assert means["phase"] == pytest.approx(1.04446, abs=0.5e-5)
    assert u["v"] == pytest.approx(0.0032, abs=0.5e-4)
    assert u["i"] * 1e3 == pytest.approx(0.0095, abs=0.5e-4)
    assert u["phase"] == pytest.approx(0.00075, abs=0.5e-5)
    r = np.corrcoef([VOLTAGE, CURRENT, PHASE])
    assert [r[0, 1], r[0, 2], r[1, 2]] == pytest.approx([-0.36, 0.86, -0.65], abs=0.005)
    correlation = {("v", "i"): r[0, 1], ("v", "phase"): r[0, 2], ("phase", "i"): r[1, 2]}
    laws = {
        "R": lambda v, i, phase: v / i * np.cos(phase),
        "X": lambda v, i, phase: v / i * np.sin(phase),
        "Z": lambda v, i, phase: v / i + 0.0 * phase,
    }
    found = {name: propagate(law, means, u, correlation) for name, law in laws.items()}
    # table H.3: R 127.732, X 219.847, Z 254.260; u 0.071, 0.295, 0.236 (0.2956 unrounded)
    for name, value, published in (("R", 127.732, 0.071), ("X", 219.847, 0.295), ("Z", 254.260, 0.236)):
        assert found[name].value == pytest.approx(value, abs=0.5e-3)
        assert found[name].standard_uncertainty == pytest.approx(published, abs=0.7e-3)
    # r(R, X) -0.588, r(R, Z) -0.485, r(X, Z) 0.993
    for pair, published in (("RX", -0.588), ("RZ", -0.485), ("XZ", 0.993)):
        one, other = found[pair[0]], found[pair[1]]
        shared = covariance(one.contributions, other.contributions, correlation)
        coefficient = shared / (one.standard_uncertainty * other.standard_uncertainty)
        assert coefficient == pytest.approx(published, abs=0.5e-3)


def test_gum_h2_rounded_summary_gives_another_digit():
    # from the rounded summary u(R) is 0.070, not the published 0.071
    found = propagate(
        lambda v, i, phase: v / i * np.cos(phase),
        {"v": 4.9990, "i": 19.6610e-3, "phase": 1.04446},
        {"v": 0.0032, "i": 0.0095e-3, "phase": 0.00075},
        {("v", "i"): -0.36, ("v", "phase"): 0.86, ("i", "phase"): -0.65},
    )
    assert found.standard_uncertainty == pytest.approx(0.070, abs=0.0005)


# ---- GUM H.3, thermometer calibration line


def test_gum_h3_published():
    offset = np.array([1.521, 2.012, 2.512, 3.003, 3.507, 3.999, 4.513, 5.002, 5.503, 6.010, 6.511])
    correction = np.array(
        [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160]
    )
    (y2, y1), cov = np.polyfit(offset, correction, 1, cov=True)
    u1, u2 = np.sqrt(cov[1, 1]), np.sqrt(cov[0, 0])
    r = cov[0, 1] / (u1 * u2)
    # H.3.3: y1 -0.1712, s 0.0029; y2 0.002 18, s 0.000 67; r -0.930
    assert [y1, u1] == pytest.approx([-0.1712, 0.0029], abs=0.5e-4)
    assert [y2, u2] == pytest.approx([0.00218, 0.00067], abs=0.5e-5)
    assert r == pytest.approx(-0.930, abs=0.5e-3)
    # H.3.4: b(30 degC) = -0.1494, u_c 0.0041
    found = propagate(
        lambda y1, y2, t: y1 + y2 * (t - 20.0),
        {"y1": y1, "y2": y2, "t": 30.0},
        {"y1": u1, "y2": u2},
        {("y2", "y1"): r},
    )
    assert found.value == pytest.approx(-0.1494, abs=0.5e-4)
    assert found.standard_uncertainty == pytest.approx(0.0041, abs=0.5e-4)


# ---- a plug's budget


def plug_porosity(length_cm, diameter_cm, grain_volume_cm3):
    return porosity_bulk_grain_frac(caliper_bulk_volume_cm3(length_cm, diameter_cm), grain_volume_cm3)


PLUG = {"length_cm": 5.08, "diameter_cm": 3.81}
PLUG_U = {"length_cm": 0.003, "diameter_cm": 0.003}


def test_plug_budget_made():
    # L 5.08 +/- 0.003 cm, D 3.81 +/- 0.003 cm, V_g 45.60 +/- 0.05 cm3, M 120 +/- 0.005 g (made by hand with
    # the partial derivatives): V_b 57.91666486 +/- 0.09740949, phi 0.21266185 +/- 0.00158078, rho 2.63157895
    # +/- 0.00288759
    bulk = propagate(caliper_bulk_volume_cm3, PLUG, PLUG_U)
    assert bulk.value == pytest.approx(57.91666486084399, rel=1e-9)
    assert bulk.standard_uncertainty == pytest.approx(0.09740948848176206, rel=1e-9)
    porosity = propagate(
        plug_porosity, {**PLUG, "grain_volume_cm3": 45.6}, {**PLUG_U, "grain_volume_cm3": 0.05}
    )
    assert porosity.value == pytest.approx(0.21266184595465154, rel=1e-9)
    assert porosity.standard_uncertainty == pytest.approx(0.0015807759451476964, rel=1e-9)
    # the diameter and the grain volume lead
    shares = {name: float(np.abs(share)) for name, share in porosity.contributions.items()}
    assert sorted(shares, key=shares.__getitem__) == ["length_cm", "grain_volume_cm3", "diameter_cm"]
    assert porosity.contributions["grain_volume_cm3"] < 0.0 < porosity.contributions["diameter_cm"]
    density = propagate(
        grain_density_g_cm3,
        {"dry_mass_g": 120.0, "grain_volume_cm3": 45.6},
        {"dry_mass_g": 0.005, "grain_volume_cm3": 0.05},
    )
    assert density.value == pytest.approx(2.631578947368421, rel=1e-9)
    assert density.standard_uncertainty == pytest.approx(0.0028875858135561337, rel=1e-9)
    # a shared grain volume correlates the two: both fall as it grows
    assert covariance(porosity.contributions, density.contributions) > 0.0


# ---- shapes, missing values, several results, texts


def test_arrays_broadcast_and_missing_flows():
    found = propagate(
        caliper_bulk_volume_cm3,
        {"length_cm": np.array([[5.0], [np.nan]]), "diameter_cm": np.array([3.8, 2.5, 2.5])},
        {"length_cm": 0.003, "diameter_cm": np.array([0.003, 0.003, np.nan])},
    )
    assert found.value.shape == found.standard_uncertainty.shape == (2, 3)
    assert np.isnan(found.standard_uncertainty).tolist() == [[False, False, True], [True] * 3]
    assert np.isnan(found.value).tolist() == [[False] * 3, [True] * 3]
    one = propagate(caliper_bulk_volume_cm3, {"length_cm": 5.0, "diameter_cm": 2.5}, PLUG_U)
    assert found.standard_uncertainty[0, 1] == one.standard_uncertainty
    assert all(share.shape == (2, 3) for share in found.contributions.values())
    # an uncertainty wider than the value widens the result
    wide = propagate(caliper_bulk_volume_cm3, PLUG, {"length_cm": [0.003, 0.006]})
    assert wide.value.shape == (2,)


def test_a_result_of_several_is_chosen_by_name():
    readings = {"water_volume_cm3": 4.0, "oil_volume_cm3": 3.0, "pore_volume_cm3": 12.0}
    u = {"water_volume_cm3": 0.03, "pore_volume_cm3": 0.05}
    found = propagate(saturations, readings, u, output="water_saturation_frac")
    expected = 4.0 / 12.0 * np.hypot(0.03 / 4.0, 0.05 / 12.0)
    assert found.standard_uncertainty == pytest.approx(expected, rel=1e-12)
    with pytest.raises(Usage, match="say which output: water_saturation_frac"):
        propagate(saturations, readings, u)
    with pytest.raises(Usage, match="did you mean 'water_saturation_frac'"):
        propagate(saturations, readings, u, output="water_saturation")
    with pytest.raises(Usage, match="one result only"):
        propagate(caliper_bulk_volume_cm3, PLUG, PLUG_U, output="volume")


def test_wrong_requests_are_refused_with_a_way_out():
    with pytest.raises(Usage, match=r"'lenght_cm'.*did you mean 'length_cm'"):
        propagate(caliper_bulk_volume_cm3, PLUG, {"lenght_cm": 0.003})
    with pytest.raises(Usage, match="correlation names 'mass_g'"):
        propagate(caliper_bulk_volume_cm3, PLUG, PLUG_U, {("length_cm", "mass_g"): 0.5})
    with pytest.raises(Usage, match="each pair"):
        combined({"a": 1.0, "b": 1.0}, {("a", "b"): 0.5, ("b", "a"): 0.5})
    with pytest.raises(Impossible, match="length_cm"):
        propagate(caliper_bulk_volume_cm3, PLUG, {"length_cm": -0.003})
    with pytest.raises(Impossible, match=r"correlation: found 1\.5"):
        combined({"a": 1.0, "b": 1.0}, {("a", "b"): 1.5})
    together = {("a", "b"): -0.9, ("b", "c"): -0.9, ("a", "c"): -0.9}
    with pytest.raises(Impossible, match="hold together"):
        combined({"a": 1.0, "b": 1.0, "c": 1.0}, together)
    with pytest.raises(Impossible, match="hold together"):
        monte_carlo(lambda a, b, c: a + b + c, dict.fromkeys("abc", 1.0), dict.fromkeys("abc", 0.1), together)
    with pytest.raises(Usage, match="at least 100"):
        monte_carlo(caliper_bulk_volume_cm3, PLUG, PLUG_U, draws=10)
    with pytest.raises(Impossible, match="probability"):
        coverage_factor(10.0, 95.0)
    with pytest.raises(Impossible, match="degrees_of_freedom"):
        coverage_factor(0.5)
    assert issubclass(Usage, CorelabError)


def test_a_formula_that_drops_the_derivative_is_caught():
    with pytest.raises(np.exceptions.ComplexWarning):
        partials(lambda a: np.asarray(a).astype(float) * 2.0, {"a": 1.0})
    assert partials(lambda a, b: np.asarray(a) * 2.0, {"a": 1.0, "b": 2.0})["b"] == 0.0


def test_partials_at_zero_and_beside_texts():
    found = partials(lambda x, gas: np.sin(x) * (np.asarray(gas) == "air"), {"x": [0.0, 1.0], "gas": "air"})
    np.testing.assert_allclose(found["x"], np.cos([0.0, 1.0]), rtol=1e-15)
    assert list(found) == ["x"]


def test_estimators_of_columns_may_be_propagated_reading_by_reading():
    # one step's permeability at a time: the standard error of a weighted line, by hand
    pressure, u = np.array([100.0, 200.0, 400.0, 800.0]), np.array([0.02, 0.015, 0.01, 0.01])
    k = 1.0 + 100.0 / pressure

    def k_infinity(k0, k1, k2, k3):
        return klinkenberg_regression(np.array([k0, k1, k2, k3]), pressure, [0] * 4, 1.0 / u**2).k_infinity_md

    readings = {f"k{i}": value for i, value in enumerate(k)}
    found = propagate(k_infinity, readings, {f"k{i}": value for i, value in enumerate(u)})
    line = klinkenberg_regression(k, pressure, [0] * 4, 1.0 / u**2)
    np.testing.assert_allclose(found.standard_uncertainty, line.k_infinity_se_md, rtol=1e-10)


# ---- coverage, degrees of freedom, repeats


def test_coverage_factors_published():
    # JCGM 100:2008, table G.2: t_95.45 left out; t_95 for 1, 5, 10, 50, infinity; t_99 for 5, 16
    found = coverage_factor([1.0, 5.0, 10.0, 50.0, np.inf], 0.95)
    np.testing.assert_allclose(found, [12.71, 2.57, 2.23, 2.01, 1.960], atol=0.0051)
    np.testing.assert_allclose(coverage_factor([5.0, 16.0], 0.99), [4.03, 2.92], atol=0.0051)
    assert np.isnan(coverage_factor(np.nan))


def test_effective_degrees_limits():
    assert welch_satterthwaite({"a": 1.0, "b": 0.0}, {"a": 7.0, "b": 1.0}) == pytest.approx(7.0)
    assert welch_satterthwaite({"a": 1.0}, {}) == np.inf
    with pytest.raises(Impossible, match="degrees_of_freedom"):
        welch_satterthwaite({"a": 1.0}, {"a": 0.0})


def test_repeats_not_taken_are_not_counted():
    found = repeat_uncertainty([[1.0, 2.0, 3.0], [1.0, 3.0, np.nan], [1.0, np.nan, np.nan]], axis=1)
    np.testing.assert_allclose(found, [1.0 / np.sqrt(3.0), 1.0, np.nan])
    assert repeat_uncertainty(np.array([[1.0, 2.0], [3.0, 2.0]]), axis=0).tolist() == [1.0, 0.0]


# ---- Monte Carlo


def test_monte_carlo_is_the_same_with_the_same_seed_and_leaves_out_the_impossible():
    u = {"length_cm": 3.0}
    one, other = (monte_carlo(caliper_bulk_volume_cm3, PLUG, u, draws=2000, seed=7) for _ in range(2))
    assert one == other
    # P(length <= 0) = P(z < -5.08/3) = 0.0452
    assert one.impossible == pytest.approx(0.0452, abs=4.0 * np.sqrt(0.0452 / 2000))
    assert one.low > 0.0
    missing = monte_carlo(
        caliper_bulk_volume_cm3, {"length_cm": [5.0, np.nan], "diameter_cm": 3.8}, u, draws=200
    )
    assert np.isnan(missing.standard_uncertainty).tolist() == [False, True]


def test_monte_carlo_interval_of_a_normal_result():
    found = monte_carlo(lambda a, b: a + b, {"a": 1.0, "b": 2.0}, {"a": 0.3, "b": 0.4}, seed=3, draws=40_000)
    assert found.mean == pytest.approx(3.0, abs=4.0 * 0.5 / 200.0)
    assert [found.low, found.high] == pytest.approx([3.0 - 0.98, 3.0 + 0.98], abs=0.03)


# ---- laws


@given(
    st.floats(0.1, 100.0),
    st.floats(0.1, 100.0),
    st.floats(-1.0, 1.0),
    st.floats(0.1, 10.0),
)
@settings(max_examples=50, deadline=None)
def test_law_combined_lies_between_the_extremes_and_scales(a, b, r, factor):
    shares = {"a": a, "b": -b}
    found = combined(shares, {("a", "b"): r})
    assert abs(a - b) * (1 - 1e-9) - 1e-9 <= found <= (a + b) * (1 + 1e-9)
    # fully correlated inputs of opposite sign cancel
    assert combined(shares, {("a", "b"): 1.0}) == pytest.approx(abs(a - b), abs=1e-6 * (a + b))
    scaled = combined({n: factor * s for n, s in shares.items()}, {("a", "b"): r})
    assert scaled == pytest.approx(factor * found, rel=1e-6, abs=1e-6)


@given(st.floats(-3.0, 3.0), st.floats(0.01, 5.0))
@settings(max_examples=50, deadline=None)
def test_law_partials_of_a_known_function(x, y):
    found = partials(lambda x, y: np.exp(x) * np.log(y) + x**3, {"x": x, "y": y})
    assert found["x"] == pytest.approx(np.exp(x) * np.log(y) + 3.0 * x**2, rel=1e-12, abs=1e-12)
    assert found["y"] == pytest.approx(np.exp(x) / y, rel=1e-13)


# ---- defaults


def test_defaults_are_documented_and_usable():
    for name, record in DEFAULTS.items():
        assert record.measures == name
        assert record.source.endswith(("common practice", "(from memory)"))
        assert record.repeatability >= 0.0
        assert record.scale > 0.0
    # common practice: balance 0.01 g, caliper 0.005 cm, trap 0.025 cm3, barometer 0.1 or assumed 1.5 kPa
    assert DEFAULTS["mass"].repeatability == 0.01
    assert DEFAULTS["length"].repeatability == 0.005
    assert DEFAULTS["volume"].repeatability == 0.025
    assert [DEFAULTS[f"barometer {how}"].scale for how in ("read", "assumed")] == [0.1, 1.5]
    for name in ("mass", "length", "pressure", "flow rate", "volume", "temperature"):
        assert name in DEFAULTS
    assert DEFAULTS["flow rate"].unit == SHARE
    repeatability, scale = DEFAULTS["flow rate"].of([10.0, np.nan])
    np.testing.assert_allclose(repeatability, [0.02, np.nan])
    np.testing.assert_allclose(scale, [0.05, np.nan])
    repeatability, scale = DEFAULTS["mass"].of([120.0, np.nan])
    np.testing.assert_allclose(repeatability, [0.01, np.nan])
