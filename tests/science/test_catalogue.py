"""What every formula of the catalogue promises, walked one by one.

Checks: laws and limits only; the numbers of each formula are checked beside its module. Derivatives by the
complex step (Squire & Trapp 1998, SIAM Rev. 40:110-112) are compared with central differences.
"""

from __future__ import annotations

import dataclasses
import doctest
import importlib
import inspect
import re
import subprocess
import sys
import warnings

import numpy as np
import pytest

from corelab.errors import Impossible
from corelab.science.catalogue import MODULES, formulas
from corelab.science.formula import Formula

POSSIBLE = {
    "temperature_degc": 22.0,
    "flow_temperature_degc": 20.0,
    "other_temperature_degc": 25.0,
    "reference_temperature_degc": 22.0,
    "cup_temperature_degc": 23.0,
    "pressure_kpa": 300.0,
    "salinity_g_kg": 80.0,
    "length_cm": 5.0,
    "diameter_cm": 3.8,
    "area_cm2": 11.0,
    "mass_displaced_g": 700.0,
    "liquid_density_g_cm3": 1.1,
    "mass_in_air_g": 130.0,
    "mass_immersed_g": 70.0,
    "coated_volume_cm3": 60.0,
    "coating_mass_g": 4.0,
    "coating_density_g_cm3": 0.9,
    "reference_volume_cm3": 12.0,
    "cup_volume_cm3": 36.0,
    "billet_volume_cm3": 3.0,
    "dead_volume_cm3": 2.0,
    "reference_pressure_kpa": 800.0,
    "expanded_pressure_kpa": 400.0,
    "barometric_pressure_kpa": 101.0,
    "saturated_mass_g": 140.0,
    "dry_mass_g": 130.0,
    "wet_mass_g": 140.0,
    "received_mass_g": 145.0,
    "saturant_density_g_cm3": 1.02,
    "bulk_volume_cm3": 60.0,
    "grain_volume_cm3": 48.0,
    "pore_volume_cm3": 12.0,
    "water_volume_cm3": 4.0,
    "oil_volume_cm3": 3.0,
    "gas_volume_cm3": 1.0,
    "flow_rate_cm3_s": 1.5,
    "flow_pressure_kpa": 101.0,
    "upstream_pressure_kpa": 300.0,
    "downstream_pressure_kpa": 101.0,
    "viscosity_mpas": 0.018,
    "other_viscosity_mpas": 0.0196,
    "geometric_factor_cm": 2.2,
    "molar_mass_g_mol": 28.0,
    "other_molar_mass_g_mol": 4.0,
    "gas_permeability_md": 12.0,
    "mean_pressure_kpa": 200.0,
    "k_infinity_md": 0.5,
    "permeability_md": 50.0,
    "porosity_frac": 0.2,
    "tortuosity": 2.0,
    "slip_factor_kpa": 40.0,
    "water_mass_g": 4.0,
    "salt_mass_g": 0.4,
    "liquid_mass_g": 8.0,
    "salt_density_g_cm3": 2.165,
    "brine_density_g_cm3": 1.05,
    "water_density_g_cm3": 0.998,
    "sample_bulk_volume_cm3": 42.0,
    "gas_sample_bulk_volume_cm3": 19.0,
    "sample_mass_g": 100.0,
    "gas_sample_mass_g": 45.0,
    "confining_pressure_kpa": 6000.0,
    "poisson_ratio": 0.25,
    "overburden_stress_mpa": 50.0,
    "pore_pressure_mpa": 20.0,
    "permeability_1000_psi_md": 0.1,
    "stress_slope": 0.4,
    "net_stress_mpa": 10.0,
    "other_net_stress_mpa": 35.0,
    "wanted_net_stress_mpa": 20.0,
    "permeability_zero_md": 60.0,
    "other_permeability_md": 40.0,
    "pore_volume_zero_cm3": 12.5,
    "other_pore_volume_cm3": 11.5,
    "stress_exponent": 0.4,
    "characteristic_stress_mpa": 20.7,
    "decline_1_mpa": 4.4e-4,
    "grain_size_mm": 0.25,
    "median_size_mm": 0.25,
    "dominant_size_mm": 0.2,
    "effective_size_mm": 0.15,
    "mean_size_mm": 0.25,
    "size_phi": 2.0,
    "size_variation": 0.4,
    "size_skewness": 1.2,
    "sorting_phi": 0.6,
    "trask_sorting": 1.4,
    "rigid_grain_frac": 0.7,
    "percentile_spread_phi": 1.2,
    "cementation_exponent": 1.8,
    "sorting_constant": 0.8,
    "hazen_coefficient": 100.0,
    "kozeny_carman_constant": 180.0,
    "flow_zone_indicator_um": 2.5,
    "rock_fabric_number": 2.0,
    "water_saturation_frac": 0.3,
    "residual_sd_decades": 0.5,
    "conductivity_cm_s": 0.01,
    "density_g_cm3": 0.998,
    "sieved_mass_g": 33.4,
    "value": 50.2,
    "u_value": 0.04,
    "certified": 50.0,
    "u_certified": 0.03,
    "centre": 50.0,
    "sigma": 0.1,
    "count": 12.0,
    "porosity_before_frac": 0.35,
    "porosity_after_frac": 0.30,
    "bulk_density_g_cm3": 2.2,
    "matrix_density_g_cm3": 2.65,
    "fluid_density_g_cm3": 1.0,
    "residual_decades": -0.4,
    "scale_decades": 0.2,
    "freedom": 8.0,
    "slope_decades": 14.0,
    "porosity_change_frac": -0.04,
    "permeability_change_decades": -0.8,
    "difference_frac": -0.03,
    "scale_frac": 0.015,
    "shared": 0.3,
    "packing_frac": 0.1,
    "excess_frac": 0.04,
    "fines_added_frac": 0.03,
    "prior_frac": 0.3,
    "evidence_log_odds": 0.8,
    **{
        f"percentile_{p}_phi": phi
        for p, phi in zip((5, 16, 25, 50, 75, 84, 95), (0.9, 1.4, 1.6, 2.1, 2.7, 3.0, 3.9), strict=True)
    },
}
TEXTS = {
    "gas": ["nitrogen", "air", "helium"],
    "other_gas": ["helium", "nitrogen", "air"],
    "salt": ["none", "left", "leached"],
    "mark": ["powdered", "cracked", "intact"],
    "kind": ["sound", "compacted", "shattered"],
}
TREND = {
    "porosity_frac": np.linspace(0.06, 0.28, 12),
    "permeability_md": np.array(
        [0.02, 0.09, 0.15, 0.8, 1.7, 12.0, 19.0, 88.0, 160.0, 350.0, 1100.0, 1300.0],
    ),
}
COLUMNS = {
    "calibration-cup": {
        "known_volume_cm3": np.array([0.0, 10.0, 20.0, 30.0]),
        "reference_pressure_kpa": np.array([800.0, 801.0, 799.0, 800.0]),
        "expanded_pressure_kpa": np.array([275.5, 332.0, 449.0, 733.0]),
        "barometric_pressure_kpa": np.array([101.0, 101.0, 101.1, 101.2]),
    },
    "calibration-holder": {
        "known_volume_cm3": np.array([0.0, 5.0, 10.0, 15.0]),
        "reference_pressure_kpa": np.array([800.0, 801.0, 799.0, 800.0]),
        "expanded_pressure_kpa": np.array([680.0, 510.0, 420.0, 360.0]),
        "barometric_pressure_kpa": np.array([101.0, 101.0, 101.1, 101.2]),
    },
    "klinkenberg-regression": {
        "gas_permeability_md": np.array([2.0, 1.52, 1.24, 0.9, 0.8, 0.77]),
        "mean_pressure_kpa": np.array([100.0, 200.0, 400.0, 110.0, 210.0, 410.0]),
        "group": np.array([0, 0, 0, 1, 1, 1]),
    },
    "forchheimer-regression": {
        "flow_rate_cm3_s": np.array([20.0, 60.0, 120.0, 200.0]),
        "flow_pressure_kpa": np.full(4, 101.325),
        "upstream_pressure_kpa": np.array([207.0, 333.0, 466.0, 607.0]),
        "downstream_pressure_kpa": np.full(4, 101.325),
        "viscosity_mpas": np.full(4, 0.01767),
        "molar_mass_g_mol": np.full(4, 28.0),
        "temperature_degc": np.full(4, 22.0),
        "length_cm": np.full(4, 5.08),
        "area_cm2": np.full(4, 11.4),
        "group": np.zeros(4, dtype=int),
    },
    "slip-inertia-regression": {
        "gas_permeability_md": np.array([24.0, 22.4, 20.9, 19.4, 17.8]),
        "mean_pressure_kpa": np.array([160.0, 220.0, 310.0, 480.0, 760.0]),
        "flow_rate_cm3_s": np.array([20.0, 43.0, 100.0, 240.0, 620.0]),
        "flow_pressure_kpa": np.full(5, 101.325),
        "viscosity_mpas": np.full(5, 0.01767),
        "molar_mass_g_mol": np.full(5, 28.0),
        "temperature_degc": np.full(5, 22.0),
        "area_cm2": np.full(5, 11.4),
        "group": np.zeros(5, dtype=int),
        "weights": np.array([9.0, 10.0, 11.0, 12.0, 13.0]),
    },
    "permeability-stress-regression": {
        "permeability_md": np.array([11.0, 10.1, 8.6, 5.1, 4.0, 3.1]),
        "net_stress_mpa": np.array([5.0, 12.0, 35.0, 5.0, 12.0, 35.0]),
        "group": np.array([0, 0, 0, 1, 1, 1]),
    },
    "pore-volume-stress-regression": {
        "pore_volume_cm3": np.array([12.0, 11.8, 11.5, 6.0, 5.9, 5.7]),
        "net_stress_mpa": np.array([5.0, 12.0, 35.0, 5.0, 12.0, 35.0]),
        "group": np.array([0, 0, 0, 1, 1, 1]),
    },
    "individuals-chart": {"values": np.array([49.6, 47.6, 49.9, 51.3, 47.8])},
    "grubbs-outlier": {"values": np.array([49.6, 47.6, 49.9, 51.3, 58.8])},
    "precision": {
        "values": np.array([10.1, 10.3, 11.0, 11.2, 10.4, 10.45]),
        "group": np.array([0, 0, 1, 1, 2, 2]),
    },
    "semilog-trend": TREND,
    "power-trend": TREND,
    "kozeny-carman-trend": TREND,
    "broken-trend": TREND,
    "reduced-major-axis-trend": TREND,
    "theil-sen-trend": TREND,
    "huber-trend": TREND,
    "timur-trend": {
        **TREND,
        "water_saturation_frac": np.array([0.7, 0.5, 0.6, 0.4, 0.3, 0.35, 0.27, 0.2, 0.31, 0.2, 0.15, 0.2]),
    },
    "york-trend": {
        **TREND,
        "u_porosity_frac": np.full(12, 0.003),
        "u_permeability_md": 0.05 * TREND["permeability_md"],
    },
    "flow-units": {"flow_zone_indicator_um": np.array([0.5, 0.6, 0.55, 0.48, 5.0, 4.6, 5.3, 4.8, 5.1])},
    "duan-factor": {"residuals_decades": np.array([-0.3, -0.1, 0.0, 0.1, 0.3])},
    "means": {"values": np.array([10.0, 50.0, 1000.0]), "weights": np.array([20.0, 15.0, 10.0])},
    "log-normal-field": {"permeability_md": np.array([100.0, 50.0, 200.0])},
    "dykstra-parsons": {"permeability_md": np.array([100.0, 50.0, 20.0, 10.0, 5.0])},
    "lorenz": {
        "permeability_md": np.array([100.0, 50.0, 20.0]),
        "porosity_frac": np.array([0.2, 0.18, 0.15]),
        "length_m": np.array([0.3, 0.4, 0.3]),
    },
    "sieve-statistics": {
        "aperture_mm": np.array([2.0, 1.0, 0.5, 0.25, 0.125, 0.0625]),
        "mass_retained_g": np.array([0.0, 4.0, 8.0, 12.0, 5.0, 2.0]),
        "group": np.zeros(6, dtype=int),
    },
}
ANY_SIGN = {
    ("liquid-volume", "liquid_mass_g"),
    ("saturations", "oil_volume_cm3"),
    ("individuals-chart", "values"),
    ("grubbs-outlier", "values"),
    ("precision", "values"),
    ("duan-factor", "residuals_decades"),
    ("later-deviate", "value"),
    ("later-deviate", "centre"),
    ("normalised-error", "value"),
    ("normalised-error", "certified"),
    ("impact-permeability", "residual_decades"),
    ("impact-permeability", "slope_decades"),
    ("impact-permeability", "permeability_change_decades"),
    ("impact-density-log", "difference_frac"),
    ("impact-neighbours", "difference_frac"),
    ("impact-fines", "excess_frac"),
    ("impact-fines", "fines_added_frac"),
    ("impact", "evidence_log_odds"),
    *(
        (f"impact-{t}", "porosity_change_frac")
        for t in ("permeability", "density-log", "neighbours", "packing")
    ),
}
LEAVES_MISSING_OUT = {"flow-units", "dykstra-parsons"}
ALL = list(formulas().values())
ELEMENTWISE = [f for f in ALL if f.elementwise]
GROUPWISE = [f for f in ALL if not f.elementwise]


def named(formula: Formula) -> str:
    return formula.key


def rows(formula: Formula) -> dict[str, np.ndarray]:
    """Three rows of possible values, each different."""
    if not formula.elementwise:
        return {name: column.copy() for name, column in COLUMNS[formula.key].items()}
    return {
        s.name: np.array(TEXTS[s.name])
        if s.name in TEXTS
        else POSSIBLE[s.name] * np.array([1.0, 1.01, 1.02]) + 0.001 * place
        for place, s in enumerate(formula.inputs)
    }


def results(formula: Formula, given: dict[str, np.ndarray]) -> dict[str, np.ndarray]:
    found = formula.compute(**given)
    if dataclasses.is_dataclass(found):
        return {s.name: np.asarray(getattr(found, s.name)) for s in formula.outputs}
    return {formula.outputs[0].name: np.asarray(found)}


def test_the_catalogue_holds_every_module_and_no_key_twice():
    declared = [f for m in MODULES for f in importlib.import_module(f"corelab.science.{m}").FORMULAS]
    assert [f.key for f in declared] == list(formulas())
    assert len({f.compute for f in declared}) == len(declared)
    assert all(re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", f.key) and f.version >= 1 for f in declared)


def test_the_catalogue_is_imported_lazily():
    code = "import corelab.science.catalogue, sys; sys.exit('numpy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


@pytest.mark.parametrize("module", [*MODULES, "formula", "catalogue"])
def test_the_examples_run(module):
    outcome = doctest.testmod(importlib.import_module(f"corelab.science.{module}"))
    assert outcome.attempted > 0
    assert outcome.failed == 0


@pytest.mark.parametrize("formula", ALL, ids=named)
def test_symbols_name_the_parameters_and_the_results(formula):
    assert tuple(s.name for s in formula.inputs) == tuple(inspect.signature(formula.compute).parameters)
    found = formula.compute(**rows(formula))
    if dataclasses.is_dataclass(found):
        assert tuple(s.name for s in formula.outputs) == tuple(f.name for f in dataclasses.fields(found))
    else:
        assert len(formula.outputs) == 1


@pytest.mark.parametrize("formula", ALL, ids=named)
def test_the_docstring_can_be_checked_against_the_paper(formula):
    text = inspect.getdoc(formula.compute)
    for section in ("Parameters", "Returns", "Raises", "Notes", "References", "Examples"):
        assert f"\n{section}\n{'-' * len(section)}\n" in text, section
    for symbol in (*formula.inputs, *formula.outputs):
        unit = {"mD": "md", "mPa.s": "mPa s", "v/v": "v/v"}.get(symbol.unit, symbol.unit)
        if unit and (formula.elementwise or symbol in formula.inputs):
            assert re.search(rf"\[[^]]*{re.escape(unit)}", text), f"no unit [{unit}] of {symbol.name}"
    references = text.split("References\n----------\n")[1].split("Examples\n")[0]
    assert re.search(r"\b(18|19|20)\d\d\b|Definition|Geometry|balance|Handbook of Chemistry", references)
    assert formula.title
    assert formula.equation
    assert formula.valid
    assert formula.tested
    assert formula.source


@pytest.mark.parametrize("formula", ELEMENTWISE, ids=named)
def test_a_scalar_gives_what_its_array_element_gives(formula):
    given = rows(formula)
    whole = results(formula, given)
    for i in range(3):
        one = results(formula, {name: column[i] for name, column in given.items()})
        for name, value in one.items():
            assert value.shape == ()
            assert value == pytest.approx(whole[name][i], rel=1e-14)


@pytest.mark.parametrize("formula", ELEMENTWISE, ids=named)
def test_shapes_broadcast(formula):
    given = rows(formula)
    for turned in given:
        shaped = {n: c[:, np.newaxis] if n == turned else c[:2] for n, c in given.items()}
        shape = np.broadcast_shapes(*(c.shape for c in shaped.values()))
        for name, value in results(formula, shaped).items():
            assert value.shape == shape, name
            one = results(formula, {n: c[2, 0] if n == turned else c[-1] for n, c in shaped.items()})
            assert value[2, -1] == pytest.approx(one[name], rel=1e-14)


@pytest.mark.parametrize("formula", ELEMENTWISE, ids=named)
def test_missing_flows_through_its_own_row_only(formula):
    given = rows(formula)
    whole = results(formula, given)
    for name, column in given.items():
        gap = column.copy()
        gap[1] = "" if name in TEXTS else np.nan
        found = results(formula, {**given, name: gap})
        assert any(np.isnan(value[1]) for value in found.values()), name
        for result, value in found.items():
            np.testing.assert_allclose(value[[0, 2]], whole[result][[0, 2]], rtol=1e-14)


@pytest.mark.parametrize("formula", [f for f in GROUPWISE if f.key not in LEAVES_MISSING_OUT], ids=named)
def test_a_missing_reading_makes_its_group_missing(formula):
    given = rows(formula)
    for name, column in given.items():
        if name != "group":
            gap = column.copy()
            gap[1] = np.nan
            found = results(formula, {**given, name: gap})
            first = found[formula.outputs[0].name]
            assert np.isnan(np.atleast_1d(first)[0]), name
            assert np.isfinite(np.atleast_1d(first)[1:]).all()


@pytest.mark.parametrize("formula", ALL, ids=named)
def test_inputs_are_not_touched(formula):
    given = rows(formula)
    before = {name: column.copy() for name, column in given.items()}
    for column in given.values():
        column.flags.writeable = False
    formula.compute(**given)
    for name, column in given.items():
        np.testing.assert_array_equal(column, before[name])


@pytest.mark.parametrize("formula", ALL, ids=named)
def test_the_impossible_is_refused_by_name_place_and_count(formula):
    given = rows(formula)
    for name, column in given.items():
        if name in TEXTS:
            bad = np.array(["argon" if i == 1 else text for i, text in enumerate(column)])
            with pytest.raises(Impossible, match=rf"^{name}: found 'argon' at place 1 \(1 of 3 values\)"):
                formula.compute(**{**given, name: bad})
            continue
        for wrong in (np.inf, -np.inf, -1e9):
            if wrong == -1e9 and (formula.key, name) in ANY_SIGN:
                continue
            if name == "group":
                wrong = -1
            bad = column.astype(float)
            bad[1] = wrong
            with pytest.raises(Impossible, match=rf"^{name}: found .* at place 1 \(1 of {bad.size} values\)"):
                formula.compute(**{**given, name: bad})


@pytest.mark.parametrize("formula", [f for f in ALL if f.smooth], ids=named)
def test_complex_step_equals_central_difference(formula):
    given = dict(rows(formula))
    plain = results(formula, given)
    for name, column in given.items():
        if name in TEXTS or name == "group":
            continue
        # a calibration point may stand at a known volume of 0
        h = 1e-5 * max(abs(column[1]), 1.0 if name != "viscosity_mpas" else 0.01)
        up, down, aside = column.copy(), column.copy(), column.astype(complex)
        up[1] += h
        down[1] -= h
        aside[1] += 1e-30j
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            stepped = results(formula, {**given, name: aside})
        high, low = results(formula, {**given, name: up}), results(formula, {**given, name: down})
        for result, value in stepped.items():
            if plain[result].dtype.kind != "f":
                continue
            np.testing.assert_allclose(value.real, plain[result], rtol=1e-12)
            central = (high[result] - low[result]) / (2.0 * h)
            scale = np.max(np.abs(plain[result])) / max(abs(column[1]), 1e-3)
            np.testing.assert_allclose(
                np.imag(value) / 1e-30, central, rtol=2e-5, atol=1e-7 * scale, err_msg=f"{result} by {name}"
            )
