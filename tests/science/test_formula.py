"""How a formula refuses, and what a tray with one bad row gives. No published values: own behaviour."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from corelab.science.catalogue import formulas
from corelab.science.formula import ImpossibleValue, Symbol, finite, refuse, whole_tray


def test_outside_the_published_range_is_marked_and_missing_is_not():
    brine = formulas()["brine-density"]
    outside = brine.outside(salinity_g_kg=[100.0, 260.0, np.nan], temperature_degc=20.0)
    assert outside["salinity_g_kg"].tolist() == [False, True, False]
    assert not outside["temperature_degc"]
    assert formulas()["grain-density"].outside(dry_mass_g=[1.0], grain_volume_cm3=[1.0]) == {}


def test_a_refusal_shows_the_first_of_many():
    values = np.array([[1.0, -2.0], [-3.0, 4.0]])
    with pytest.raises(ImpossibleValue, match=r"found -2.0 at place 0, 1 \(2 of 4 values\)") as trouble:
        refuse(values < 0, "length_cm", values, "more")
    assert trouble.value.argument == "length_cm"
    assert trouble.value.where.tolist() == [[False, True], [True, False]]
    refuse(values > 9, "length_cm", values, "less")


def test_one_bad_row_does_not_spoil_the_tray():
    formula = formulas()["gas-viscosity"]
    columns = {
        "gas": ["air", "argon", "helium", "air"],
        "temperature_degc": [20.0, 20.0, -400.0, 25.0],
        "pressure_kpa": -1.0,
    }
    found, refused = whole_tray(formula.compute, {**columns, "pressure_kpa": 101.325})
    assert np.isnan(found).tolist() == [False, True, True, False]
    assert [sorted(r) for r in refused] == [[], ["gas"], ["temperature_degc"], []]
    found, refused = whole_tray(formula.compute, columns)
    assert np.isnan(found).all()
    assert all("pressure_kpa" in r for r in refused)


def test_a_symbol_is_frozen():
    with pytest.raises(dataclasses.FrozenInstanceError):
        Symbol("k", "permeability_md", "mD", "permeability").unit = "D"  # type: ignore[misc]


def test_whole_numbers_and_complex_numbers_pass():
    assert finite("length_cm", [1, 2]).dtype == np.float64
    assert finite("length_cm", [1 + 1e-30j]).dtype == np.complex128
