"""Saturations and salt corrections against worked cases, published inputs and mass balances.

Sources: API RP 40, 2nd ed. 1998, sec. 4.2 and 4.3 (equations from memory); IODP Expedition 330, Proc. IODP
330, Methods, table T9 (equations); sheets of teaching examples. Cases marked "made" were computed outside the
program.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import Impossible
from corelab.science.saturation import (
    MINERALS,
    brine_volume_cm3,
    grain_mass_g,
    grain_volume_without_salt_cm3,
    liquid_volume_cm3,
    oil_mass_g,
    pore_fluid_mass_g,
    retort_bulk_volume_cm3,
    salt_left_mass_g,
    salt_mass_g,
    saturations,
    summation_of_fluids,
    water_mass_g,
)
from corelab.science.volumes import (
    caliper_bulk_volume_cm3,
    grain_density_g_cm3,
    porosity_bulk_grain_frac,
    porosity_summation_frac,
)

# ---- distillation: made; water 4.00 cm3 of 0.9970 g/cm3, brine 100 g/kg of 1.0690 g/cm3, 152.000 g as
# received, 140.000 g dry, oil 0.850 g/cm3, pores 14.000 cm3


def distilled(salt):
    water = water_mass_g(4.00, 0.9970)
    oil = oil_mass_g(152.0, 140.0, water, 100.0, salt)
    brine = brine_volume_cm3(water, 100.0, 1.0690)
    return oil, brine, saturations(brine, liquid_volume_cm3(oil, 0.850), 14.0)


def test_distillation_made_with_salt_left():
    oil, brine, found = distilled("left")
    assert salt_mass_g(water_mass_g(4.00, 0.9970), 100.0) == pytest.approx(0.44311, abs=0.000005)
    assert brine == pytest.approx(4.14510, abs=0.00001)
    assert oil == pytest.approx(8.0120, abs=0.00005)
    assert found.water_saturation_frac == pytest.approx(0.29608, abs=0.000005)
    assert found.oil_saturation_frac == pytest.approx(0.67328, abs=0.000005)
    assert found.gas_saturation_frac == pytest.approx(0.03064, abs=0.000005)


@pytest.mark.parametrize("salt", ["leached", "none"])
def test_distillation_made_with_salt_gone(salt):
    oil, _, found = distilled(salt)
    assert oil == pytest.approx(7.56889, abs=0.000005)
    assert found.water_saturation_frac == pytest.approx(0.29608, abs=0.000005)
    assert found.oil_saturation_frac == pytest.approx(0.63604, abs=0.000005)
    assert found.gas_saturation_frac == pytest.approx(0.06788, abs=0.000005)
    # nothing is lost: dry plug, brine and oil weigh what was received
    assert 140.0 + water_mass_g(4.00, 0.9970) / 0.9 + oil == pytest.approx(152.0, rel=1e-14)


def test_distillation_made_without_the_salt_correction_is_low():
    # 3.988 cm3 of unit density as the brine: 0.28486, 0.01122 low
    plain = saturations(3.988, 0.0, 14.0).water_saturation_frac
    assert plain == pytest.approx(0.28486, abs=0.000005)
    assert distilled("left")[2].water_saturation_frac - plain == pytest.approx(0.01122, abs=0.00001)


def test_distillation_missing_oil_leaves_the_water():
    found = saturations(4.0, [np.nan, 2.0], 14.0)
    np.testing.assert_allclose(found.water_saturation_frac, [4.0 / 14.0] * 2)
    assert np.isnan(found.gas_saturation_frac).tolist() == [True, False]


def test_distillation_words_and_masses_are_checked():
    with pytest.raises(Impossible, match="salt: found 'washed'; wanted none, left or leached"):
        oil_mass_g(152.0, 140.0, 4.0, 100.0, "washed")
    with pytest.raises(Impossible, match="dry_mass_g"):
        oil_mass_g(140.0, 152.0, 4.0, 100.0, "left")
    assert np.isnan(oil_mass_g(152.0, 140.0, 4.0, 100.0, ""))


def test_saturation_published_tutorial_inputs():
    # a tutorial: core 2.5 x 2.5 cm, porosity 28 %, oil 1.5 cm3 (answer made): 3.436 cm3, 0.4366, 0.5634
    pore = 0.28 * caliper_bulk_volume_cm3(2.5, 2.5)
    assert pore == pytest.approx(3.436, abs=0.0005)
    found = saturations(pore - 1.5, 1.5, pore)
    assert found.oil_saturation_frac == pytest.approx(0.4366, abs=0.0001)
    assert found.water_saturation_frac == pytest.approx(0.5634, abs=0.0001)
    assert found.gas_saturation_frac == pytest.approx(0.0, abs=1e-15)


@given(st.floats(0.0, 5.0), st.floats(0.0, 5.0), st.floats(0.0, 250.0), st.floats(20.0, 200.0), st.booleans())
@settings(max_examples=60, deadline=None)
def test_law_masses_come_back_from_a_made_plug(brine_mass, oil, salinity, grains, left):
    salt = brine_mass * salinity / 1000.0
    water = brine_mass - salt
    dry = grains + (salt if left else 0.0)
    found = oil_mass_g(grains + brine_mass + oil, dry, water, salinity, "left" if left else "leached")
    assert found == pytest.approx(oil, abs=1e-9)
    assert salt_mass_g(water, salinity) == pytest.approx(salt, abs=1e-12)
    assert brine_volume_cm3(water, salinity, 1.1) == pytest.approx(brine_mass / 1.1, abs=1e-12)
    fluid = pore_fluid_mass_g(grains + brine_mass, grains + salt, salinity)
    assert fluid == pytest.approx(brine_mass, abs=1e-9)
    assert grain_mass_g(grains + salt, salt) == pytest.approx(grains)


# ---- salt left by a dried plug


def test_salt_left_made_with_published_equations():
    # IODP Expedition 330, table T9: 20.00 g wet, 14.00 g dry, 5.30 cm3 dry, 0.035, 1.024 and 2.22 g/cm3
    salt = salt_left_mass_g(20.0, 14.0, 35.0)
    assert salt == pytest.approx(0.21762, abs=0.000005)
    solids = grain_volume_without_salt_cm3(5.30, salt, 2.22)
    assert 5.30 - solids == pytest.approx(0.09803, abs=0.000005)
    fluid = liquid_volume_cm3(pore_fluid_mass_g(20.0, 14.0, 35.0), 1.024)
    assert porosity_bulk_grain_frac(solids + fluid, solids) == pytest.approx(0.53858, abs=0.000005)
    assert grain_density_g_cm3(grain_mass_g(14.0, salt), solids) == pytest.approx(2.64945, abs=0.000005)
    # uncorrected
    assert grain_density_g_cm3(14.0, 5.30) == pytest.approx(2.64151, abs=0.000005)


def test_salt_larger_than_the_plug_is_refused():
    with pytest.raises(Impossible, match="salt_mass_g"):
        grain_mass_g(10.0, 10.0)
    with pytest.raises(Impossible, match="salt_mass_g"):
        grain_volume_without_salt_cm3(1.0, 3.0, 2.165)
    with pytest.raises(Impossible, match="dry_mass_g"):
        pore_fluid_mass_g(14.0, 20.0, 35.0)
    # sodium chloride unless another density is given
    assert grain_volume_without_salt_cm3(10.0, 2.165) == pytest.approx(9.0)


# ---- retort


def test_retort_made_with_two_samples():
    # 45.00 g, 19.20 cm3, gas 0.72 cm3; 100.0 g, water 4.10, oil 2.30 cm3
    bulk = retort_bulk_volume_cm3(100.0, 45.00, 19.20)
    assert bulk == pytest.approx(42.6667, abs=0.00005)
    found = summation_of_fluids(bulk, 4.10, 2.30, 19.20, 0.72)
    assert found.porosity_frac == pytest.approx(0.18750, abs=0.000005)
    assert found.water_saturation_frac == pytest.approx(0.51250, abs=0.000005)
    assert found.oil_saturation_frac == pytest.approx(0.28750, abs=0.000005)
    assert found.gas_saturation_frac == pytest.approx(0.20000, abs=0.000005)


def test_retort_published_inputs_of_a_sidewall_sample():
    # problem B.2 of a teaching sheet: 12.023 g, 4.5 cm3, water 0.90, gas 0.33, oil 0.04 cm3 (answer made)
    found = summation_of_fluids(4.5, 0.90, 0.04, 4.5, 0.33)
    assert found.porosity_frac == pytest.approx(0.28222, abs=0.000005)
    assert found.oil_saturation_frac == pytest.approx(0.03150, abs=0.000005)
    assert found.water_saturation_frac == pytest.approx(0.70866, abs=0.000005)
    assert found.gas_saturation_frac == pytest.approx(0.25984, abs=0.000005)
    assert porosity_summation_frac(4.5, 0.90, 0.04, 0.33) == pytest.approx(found.porosity_frac, rel=1e-14)


def test_retort_published_example_that_does_not_close():
    # solution A.3 of the same sheet: 13 g, 3.5 cm3, water 0.85, gas 0.15, oil 0.079 cm3; it divides by the
    # mass and prints porosity 8.29 %, oil 7.36 %
    found = summation_of_fluids(3.5, 0.85, 0.079, 3.5, 0.15)
    porosity, oil = 100.0 * found.porosity_frac, 100.0 * found.oil_saturation_frac
    assert porosity == pytest.approx(30.83, abs=0.005)
    assert oil == pytest.approx(7.32, abs=0.005)
    assert porosity != pytest.approx(8.29, abs=0.05)
    assert oil != pytest.approx(7.36, abs=0.005)
    assert 100.0 * (0.85 + 0.15 + 0.079) / 13.0 == pytest.approx(8.30, abs=0.01)


def test_retort_of_a_sample_without_fluids_has_no_saturations():
    found = summation_of_fluids(10.0, 0.0, 0.0, 10.0, 0.0)
    assert found.porosity_frac == 0.0
    assert np.isnan(found.oil_saturation_frac)
    with pytest.raises(Impossible, match="sample_bulk_volume_cm3"):
        summation_of_fluids(4.0, 3.0, 1.0, 4.0, 1.0)


@given(st.floats(0.0, 4.0), st.floats(0.0, 4.0), st.floats(0.01, 1.0), st.floats(0.1, 10.0))
@settings(max_examples=60, deadline=None)
def test_law_saturations_add_to_one_and_do_not_depend_on_the_sample_s_size(water, oil, gas, size):
    found = summation_of_fluids(20.0, water, oil, 5.0, gas)
    total = found.water_saturation_frac + found.oil_saturation_frac + found.gas_saturation_frac
    assert total == pytest.approx(1.0, rel=1e-12)
    bigger = summation_of_fluids(20.0 * size, water * size, oil * size, 5.0, gas)
    assert bigger.porosity_frac == pytest.approx(found.porosity_frac, rel=1e-12)


# ---- minerals


def test_minerals_agree_with_their_unit_cells():
    # X-ray density Z M/(N_A V), cell volumes in cubic angstrom from memory
    table = {m.name: m.grain_density_g_cm3 for m in MINERALS}
    cells = {
        "quartz": (3, 60.084, 113.0),
        "calcite": (6, 100.087, 367.85),
        "dolomite": (3, 184.401, 320.24),
        "halite": (4, 58.443, 179.42),
        "pyrite": (4, 119.98, 159.04),
        "siderite": (6, 115.854, 293.2),
        "anhydrite": (4, 136.14, 305.1),
        "barite": (4, 233.39, 346.1),
        "kaolinite": (2, 258.16, 329.9),
    }
    for name, (formulas, mass, cell) in cells.items():
        assert table[name] == pytest.approx(formulas * mass / (0.602214076 * cell), abs=0.0055), name
    assert len(table) == len(MINERALS)
    assert all(m.low_g_cm3 <= m.grain_density_g_cm3 <= m.high_g_cm3 and m.source for m in MINERALS)
    # apparent densities of density logs are not grain densities: 2.64 and 2.85 for quartz and dolomite
    assert table["quartz"] > 2.645
    assert table["dolomite"] > 2.86
