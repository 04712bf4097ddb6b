"""The data dictionary holds together. No published values: own declarations."""

from __future__ import annotations

import math

import pytest

from corelab import units
from corelab.interval.select import COLUMNS
from corelab.quantities import ENTERED, RESULTS, Quantity, field_name
from corelab.sheets import SHEETS

ALL = [*ENTERED.values(), *RESULTS.values()]


@pytest.mark.parametrize("quantity", ALL, ids=lambda q: q.name)
def test_units_are_of_the_kind_and_ranges_are_nested(quantity: Quantity):
    if quantity.kind:
        for symbol in (quantity.unit, quantity.heading_unit):
            assert symbol in units.accepted(quantity.kind)
    else:
        assert quantity.unit == quantity.heading_unit == ""
    low, high = quantity.possible
    assert low < high
    assert quantity.decimals >= 0
    least, most = quantity.plausible
    assert least < most
    if math.isfinite(least) and math.isfinite(most):
        assert low <= least
        assert most <= high


def test_headings_carry_the_unit():
    assert ENTERED["length"].heading == "length [mm]"
    assert ENTERED["length"].stored_heading == "length [cm]"
    assert ENTERED["geometric factor"].heading == "geometric factor"
    assert RESULTS["porosity"].stored_heading == "porosity [v/v]"


@pytest.mark.parametrize(
    ("name", "unit", "field"),
    [
        ("depth", "m", "depth_m"),
        ("net confining stress", "MPa", "net_confining_stress_mpa"),
        ("flow rate", "cm3/s", "flow_rate_cm3_per_s"),
        ("porosity", "v/v", "porosity_frac"),
        ("companion of", "", "companion_of"),
        ("cut-off", "", "cut_off"),
    ],
)
def test_names_in_code_and_tables(name: str, unit: str, field: str):
    assert field_name(name, unit) == field


def test_every_result_of_an_interval_is_a_quantity_in_its_stored_unit():
    headings = {q.stored_heading for q in RESULTS.values()}
    numbers = {c for c in COLUMNS if "[" in c}
    told_otherwise = {"depth [m]", "log depth [m]", "porosity stress [MPa]", "permeability stress [MPa]"}
    assert numbers - headings - told_otherwise == {"crush likelihood [v/v]"}


def test_every_number_that_is_entered_is_in_the_dictionary():
    entered = {c.quantity for s in SHEETS.values() for c in s.columns if getattr(c, "quantity", None)}
    assert entered
    assert {q if isinstance(q, str) else q.name for q in entered} <= set(ENTERED) | set(RESULTS)
