"""Back-transformation factors.

Published: none; the definition of Duan 1983 (J. Am. Stat. Assoc. 78:605-610, from memory) worked by hand.
Pinned, with the oracle of NumPy's own straight line: the plugs of well 7121/8-1 (contains data under the
Norwegian licence for Open Government data (NLOD) distributed by the Norwegian Offshore Directorate).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from corelab.science.back_transform import duan_factor, lognormal_factor
from corelab.science.trends import semilog_trend, uneven_scatter_p


def test_duan_by_hand():
    by_hand = (10**-0.3 + 10**-0.1 + 1 + 10**0.1 + 10**0.3) / 5
    assert float(duan_factor([-0.3, -0.1, 0.0, 0.1, 0.3])) == pytest.approx(by_hand, rel=1e-15)
    assert by_hand == pytest.approx(1.109941, abs=5e-7)
    assert np.isnan(duan_factor([0.1, np.nan]))


def test_lognormal_factor_is_mean_over_median_of_the_distribution():
    """Oracle: scipy's log-normal."""
    for sd in (0.1, 0.5, 0.8):
        law = stats.lognorm(sd * np.log(10.0))
        assert float(lognormal_factor(sd)) == pytest.approx(law.mean() / law.median(), rel=1e-13)


@given(st.lists(st.floats(-2, 2), min_size=2, max_size=30))
def test_duan_is_at_least_one_for_residuals_that_sum_to_nothing(values):
    """Law (Jensen)."""
    residuals = np.array(values) - np.mean(values)
    assert duan_factor(residuals) >= 1.0 - 1e-12


def test_both_factors_overcorrect_the_real_plugs(open_data: Path):
    """The statistics stated for the real plugs, to the digits stated; oracle numpy.polyfit."""
    plugs = pd.read_csv(open_data / "norway_7121_8-1" / "nod_7121_8-1_core_plugs.csv")
    plugs = plugs[(plugs["kKl_h"] > 0) & plugs["por_h"].notna()]
    phi, k = plugs["por_h"].to_numpy() / 100, plugs["kKl_h"].to_numpy()
    fit = semilog_trend(phi, k)
    slope, intercept = np.polyfit(phi, np.log10(k), 1)
    assert fit.coefficients == pytest.approx([intercept, slope], rel=1e-11)
    assert len(plugs) == 249
    assert fit.coefficients == pytest.approx([-3.129864, 26.77301], abs=5e-6)
    assert float(fit.r_squared) == pytest.approx(0.67285, abs=5e-6)
    assert float(fit.residual_sd) ** 2 == pytest.approx(0.684254, abs=5e-7)
    duan, normal = float(duan_factor(fit.residuals)), float(lognormal_factor(fit.residual_sd))
    assert duan == pytest.approx(5.7616, abs=5e-5)
    assert normal == pytest.approx(6.1345, abs=5e-5)
    naive = np.mean(10 ** (intercept + slope * phi))
    assert k.mean() == pytest.approx(473.5, abs=0.05)
    assert naive == pytest.approx(129.7, abs=0.05)
    assert naive * duan == pytest.approx(747.3, abs=0.05)
    assert naive < k.mean() < naive * duan
    assert uneven_scatter_p(fit, phi) < 0.05
