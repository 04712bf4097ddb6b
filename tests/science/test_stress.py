"""Net stress and what falls with it, against worked values, statsmodels and laws.

Sources: Teeuw 1971, SPE J. 11:263-271; Jones & Owens 1980, J. Pet. Technol. 32:1631-1640; Jones 1988, SPE
Form. Eval. 3:235-241. The forms and the presets are from memory; the numbers are made with them outside the
program.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import Impossible
from corelab.science.stress import (
    JONES_DECLINE_1_MPA,
    JONES_STRESS_MPA,
    PSI_MPA,
    bracket,
    equivalent_hydrostatic_stress_mpa,
    net_confining_stress_mpa,
    permeability_between_log_md,
    permeability_between_md,
    permeability_jones_md,
    permeability_jones_owens_md,
    permeability_stress_regression,
    permeability_two_point,
    pore_compressibility_1_mpa,
    pore_compressibility_jones_1_mpa,
    pore_volume_between_cm3,
    pore_volume_jones_cm3,
    pore_volume_stress_regression,
    pore_volume_two_point,
    uniaxial_factor,
)
from corelab.science.uncertainty import partials
from corelab.units import UNITS, convert


def test_presets_are_those_in_psi():
    # Jones 1988: s* 3000 psi, C 3e-6 1/psi (from memory)
    psi, mpa = UNITS["stress"]["psi"], UNITS["stress"]["MPa"]
    assert convert(3000.0, psi, mpa) == pytest.approx(JONES_STRESS_MPA, rel=1e-15)
    assert JONES_DECLINE_1_MPA * convert(1.0, psi, mpa) == pytest.approx(3e-6, rel=1e-15)


def test_net_stress_by_hand_and_a_sleeve_that_cannot_seal():
    assert net_confining_stress_mpa(5701.3, 301.3) == pytest.approx(5.4, rel=1e-12)
    with pytest.raises(
        Impossible, match=r"^confining_pressure_kpa: found 200.0 at place 1 \(1 of 2 values\)"
    ):
        net_confining_stress_mpa([6000.0, 200.0], 300.0)


@pytest.mark.parametrize(
    ("nu", "factor"),
    # Teeuw 1971 (form from memory): closed form, five digits
    [(0.20, 0.50000), (0.25, 0.55556), (0.30, 0.61905), (0.333333, 0.66667), (0.35, 0.69231)],
)
def test_uniaxial_factor_tabulated(nu, factor):
    assert uniaxial_factor(nu) == pytest.approx(factor, abs=0.5e-5)


def test_uniaxial_limits_and_equivalent_stress():
    assert uniaxial_factor(0.5) == 1.0
    for wrong in (-1.0, 0.51):
        with pytest.raises(Impossible, match="poisson_ratio"):
            uniaxial_factor(wrong)
    # 5000 psi of overburden less pore pressure, nu 0.30: 3095 psi (made)
    found = equivalent_hydrostatic_stress_mpa(9000.0 * PSI_MPA, 4000.0 * PSI_MPA, 0.30)
    assert found / PSI_MPA == pytest.approx(3095.0, abs=0.5)
    with pytest.raises(Impossible, match="overburden_stress_mpa"):
        equivalent_hydrostatic_stress_mpa(10.0, 20.0, 0.3)


def test_jones_owens_worked():
    # Jones & Owens 1980: k_1000 0.100 md, S 0.40, 4000 psi: 0.043755 md
    assert permeability_jones_owens_md(0.100, 0.40, 4000.0 * PSI_MPA) == pytest.approx(0.043755, abs=0.5e-6)
    assert permeability_jones_owens_md(0.100, 0.40, 1000.0 * PSI_MPA) == pytest.approx(0.1, rel=1e-14)
    # the law reaches 0 at 1000 psi x 10^(1/S)
    with pytest.raises(Impossible, match="net_stress_mpa"):
        permeability_jones_owens_md(0.1, 0.5, 100_000.0 * PSI_MPA)


def test_jones_two_point_worked():
    # Jones 1988: 10.0 md at 1500 psi, 8.5 md at 5000 psi: a_k 0.36422, k0 11.593 md, k(3000) 9.1266 md
    law = permeability_two_point(10.0, 1500.0 * PSI_MPA, 8.5, 5000.0 * PSI_MPA)
    assert law.stress_exponent == pytest.approx(0.36422, abs=0.5e-5)
    assert law.permeability_zero_md == pytest.approx(11.593, abs=0.5e-3)
    assert not law.rising
    k = permeability_jones_md(law.permeability_zero_md, law.stress_exponent, 3000.0 * PSI_MPA)
    assert k == pytest.approx(9.1266, abs=0.5e-4)
    between = permeability_between_md(10.0, 1500.0 * PSI_MPA, 8.5, 5000.0 * PSI_MPA, 3000.0 * PSI_MPA)
    assert between == pytest.approx(k, rel=1e-13)


def test_a_value_that_grows_with_stress_is_marked():
    assert permeability_two_point([10.0, 8.0], 5.0, 9.0, 20.0).rising.tolist() == [False, True]
    assert pore_volume_two_point([10.0, 8.0], 5.0, 9.0, 20.0).rising.tolist() == [False, True]
    found = permeability_stress_regression([5.0, 6.0, 7.0], [5.0, 10.0, 20.0], [0, 0, 0])
    assert found.rising.tolist() == [True]
    assert found.stress_exponent[0] < 0.0
    with pytest.raises(Impossible, match="other_net_stress_mpa"):
        permeability_two_point(10.0, 20.0, 9.0, 20.0)


def test_regression_oracle_statsmodels_for_every_group():
    rng = np.random.default_rng(5)
    sizes = [3, 6, 4]
    group = rng.permutation(np.repeat(np.arange(3), sizes))
    stress = rng.uniform(2.0, 60.0, group.size)
    truth = np.array([0.05, 12.0, 900.0])[group], np.array([1.5, 0.4, 0.2])[group]
    k = permeability_jones_md(*truth, stress) * rng.normal(1.0, 0.01, group.size)
    found = permeability_stress_regression(k, stress, group)
    for g in range(3):
        here = group == g
        x = np.exp(-stress[here] / JONES_STRESS_MPA) - 1.0
        y = np.log(k[here] * (1.0 + JONES_DECLINE_1_MPA * stress[here]))
        fit = sm.OLS(y, sm.add_constant(x)).fit()
        k0 = np.exp(fit.params[0])
        assert found.permeability_zero_md[g] == pytest.approx(k0, rel=1e-10)
        assert found.stress_exponent[g] == pytest.approx(fit.params[1], rel=1e-9)
        assert found.permeability_zero_se_md[g] == pytest.approx(k0 * fit.bse[0], rel=1e-8)
        assert found.stress_exponent_se[g] == pytest.approx(fit.bse[1], rel=1e-8)
        assert found.covariance_md[g] == pytest.approx(k0 * fit.cov_params()[0, 1], rel=1e-8)
        assert found.r_squared[g] == pytest.approx(fit.rsquared, rel=1e-9)
        np.testing.assert_allclose(found.residuals[here], fit.resid, atol=1e-12)
    assert found.points.tolist() == sizes


def test_regression_needs_three_different_stresses():
    found = pore_volume_stress_regression(
        [12.0, 11.0, 11.1, 9.0, 8.8, 8.5], [5.0, 20.0, 20.0, 5.0, 20.0, 40.0], [0, 0, 0, 2, 2, 2]
    )
    assert np.isnan(found.pore_volume_zero_cm3).tolist() == [True, True, False]
    assert found.points.tolist() == [3, 0, 3]


def test_between_stresses_never_beyond():
    arguments = ([10.0, 10.0], 5.0, 8.0, 30.0, [4.99, 30.0])
    for between in (permeability_between_md, permeability_between_log_md, pore_volume_between_cm3):
        with pytest.raises(
            Impossible, match=r"^wanted_net_stress_mpa: found 4.99 at place 0 \(1 of 2 values\)"
        ):
            between(*arguments)
        ends = between(10.0, 5.0, 8.0, 30.0, [5.0, 30.0])
        np.testing.assert_allclose(ends, [10.0, 8.0], rtol=1e-13)
    # half way in the logarithm of stress is half way in the logarithm of permeability
    assert permeability_between_log_md(10.0, 4.0, 2.5, 16.0, 8.0) == pytest.approx(5.0, rel=1e-14)


def test_bracket_by_hand():
    stress = [30.0, 10.0, 20.0, 10.0, np.nan, 20.0, 5.0, 15.0, 15.0]
    group = [0, 0, 0, 1, 1, 2, 2, 3, 3]
    found = bracket(stress, group, [12.0, 10.0, 25.0, 15.0])
    assert found.outside.tolist() == [False, True, True, True]
    assert (found.below[0], found.above[0]) == (1, 2)
    # a reading at the stress wanted is taken with a neighbour, whichever side it has one
    for wanted, pair in ((10.0, (1, 2)), (20.0, (2, 0)), (30.0, (2, 0))):
        found = bracket(stress[:3], group[:3], wanted)
        assert (found.below.item(), found.above.item(), found.outside.item()) == (*pair, False)
    for wanted in (9.9, 30.1, np.nan):
        assert bracket(stress[:3], group[:3], wanted).outside.tolist() == [True]
    assert bracket([], [], 10.0).outside.shape == (0,)
    assert bracket([np.nan], [0], 10.0).outside.tolist() == [True]


def test_compressibility_is_the_derivative_of_the_law():
    stress = np.array([0.0, 8.0, 25.0, 60.0])
    volume = pore_volume_jones_cm3(12.0, 0.03, stress)
    slope = partials(
        pore_volume_jones_cm3,
        {"pore_volume_zero_cm3": 12.0, "stress_exponent": 0.03, "net_stress_mpa": stress},
        names=["net_stress_mpa"],
    )["net_stress_mpa"]
    np.testing.assert_allclose(pore_compressibility_jones_1_mpa(0.03, stress), -slope / volume, rtol=1e-13)
    # by hand: 1 % over 10 MPa; ln(1/0.99)/10
    assert pore_compressibility_1_mpa(12.0, 10.0, 11.88, 20.0) == pytest.approx(1.0050e-3, abs=0.5e-7)
    near = pore_volume_jones_cm3(12.0, 0.03, [19.9, 20.1])
    pair = pore_compressibility_1_mpa(near[0], 19.9, near[1], 20.1)
    assert pair == pytest.approx(float(pore_compressibility_jones_1_mpa(0.03, 20.0)), rel=1e-4)


# ---- laws

STRESSES = st.lists(st.integers(1, 80), min_size=3, max_size=5, unique=True)


@given(st.floats(1e-4, 5000.0), st.floats(0.0, 3.0), STRESSES)
@settings(max_examples=60, deadline=None)
def test_law_jones_falls_and_round_trips(k0, a, stresses):
    stress = np.sort(stresses)
    k = permeability_jones_md(k0, a, stress)
    assert (np.diff(k) < 0.0).all()
    assert (k < k0).all()
    law = permeability_two_point(k[0], stress[0], k[-1], stress[-1])
    assert law.permeability_zero_md == pytest.approx(k0, rel=1e-7)
    assert law.stress_exponent == pytest.approx(a, abs=1e-7)
    fit = permeability_stress_regression(k, stress, np.zeros(k.size, int))
    assert fit.permeability_zero_md[0] == pytest.approx(k0, rel=1e-7)
    np.testing.assert_allclose(fit.residuals, 0.0, atol=1e-9)
    inside = permeability_between_md(k[0], stress[0], k[-1], stress[-1], stress[1])
    assert inside == pytest.approx(k[1], rel=1e-9)
    straight = permeability_between_log_md(k[0], stress[0], k[-1], stress[-1], stress[1])
    assert k[-1] <= straight <= k[0]


@given(st.floats(-0.9, 0.5), st.floats(-0.9, 0.5))
@settings(max_examples=40, deadline=None)
def test_law_uniaxial_factor_rises_with_poisson_ratio(one, other):
    low, high = sorted((one, other))
    assert 0.0 < uniaxial_factor(low) <= uniaxial_factor(high) <= 1.0
