"""What a reading's uncertainty is: the register's statement in every unit, else a default known as one."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest

from corelab import units
from corelab.control.instruments import (
    BY_FIELD,
    CALIBRATION_READINGS,
    READINGS,
    Reading,
    Register,
    Stated,
    default,
)
from corelab.sheets import SHEETS

PRESSURE = BY_FIELD["grain volume", "reference_pressure_kpa"]
LENGTH = BY_FIELD["dimensions", "length_1_cm"]
FLOW = BY_FIELD["gas permeability", "flow_rate_cm3_per_s"]
MASS = BY_FIELD["masses", "mass_g"]
TEMPERATURE = BY_FIELD["gas permeability", "temperature_degc"]
NOTHING = Register({}, {})


def of(measure: str, repeatability: float, scale: float, unit: str) -> Register:
    return Register({(1, measure): Stated(repeatability, scale, unit, "", True)}, {1: "ours"})


def amounts(
    register: Register, reading: Reading, values: Sequence[float], instrument: int = 1
) -> tuple[np.ndarray, np.ndarray]:
    numbers = np.full(len(values), instrument, dtype=np.intp)
    return register.amounts(reading, np.asarray(values, dtype=np.float64), numbers)


@pytest.mark.parametrize(
    ("reading", "unit", "one"),
    [
        (PRESSURE, "kPa", 1.0),
        (PRESSURE, "MPa", 1000.0),
        (PRESSURE, "psi", 6.894757293168),
        (PRESSURE, "psig", 6.894757293168),  # scaled, without the offset of a gauge
        (PRESSURE, "barg", 100.0),
        (PRESSURE, "atm", 101.325),
        (LENGTH, "mm", 0.1),
        (LENGTH, "in", 2.54),
        (LENGTH, "cm", 1.0),
        (MASS, "g", 1.0),
        (MASS, "kg", 1000.0),
        (FLOW, "cm3/min", 1.0 / 60.0),
        (FLOW, "cm3/s", 1.0),
        (TEMPERATURE, "K", 1.0),
        (TEMPERATURE, "degC", 1.0),
        (TEMPERATURE, "degF", 5.0 / 9.0),
    ],
)
def test_a_statement_in_a_unit_is_scaled_to_the_stored_one(reading: Reading, unit: str, one: float) -> None:
    random, shared = amounts(of(reading.measure, 2.0, 3.0, unit), reading, [10.0, 700.0])
    np.testing.assert_allclose(random, 2.0 * one, rtol=1e-9)
    np.testing.assert_allclose(shared, 3.0 * one, rtol=1e-9)


@pytest.mark.parametrize(
    ("measure", "tables"),
    [
        ("mass", ("mass",)),
        ("length", ("length",)),
        ("flow rate", ("flow rate",)),
        ("volume", ("volume",)),
        ("pressure", ("pressure", "stress")),
    ],
)
def test_every_unit_that_the_register_takes_is_scaled(measure: str, tables: tuple[str, ...]) -> None:
    reading = next(r for r in READINGS if r.measure == measure)
    for table in (units.UNITS[name] for name in tables):
        for unit in table:
            random, _ = amounts(of(measure, 1.0, 0.0, unit), reading, [1.0])
            assert random[0] == pytest.approx(table[unit].factor / table[reading.unit].factor), unit


def test_a_share_is_of_what_the_instrument_showed() -> None:
    random, shared = amounts(of("pressure", 0.05, 0.1, "% of reading"), PRESSURE, [-20.0, 0.0, 700.0])
    np.testing.assert_allclose(random, [0.01, 0.0, 0.35], rtol=1e-12)
    np.testing.assert_allclose(shared, [0.02, 0.0, 0.7], rtol=1e-12)


@pytest.mark.parametrize("unit", ["kPa", "% of reading"])
def test_what_was_not_read_has_no_uncertainty(unit: str) -> None:
    random, shared = amounts(of("pressure", 1.0, 1.0, unit), PRESSURE, [math.nan, 1.0])
    assert np.isnan([random[0], shared[0]]).all()
    assert np.isfinite([random[1], shared[1]]).all()


def test_an_empty_cup_has_no_billet_to_be_wrong() -> None:
    billet = BY_FIELD["grain volume", "billet_volume_cm3"]
    _, shared = amounts(NOTHING, billet, [0.0, 20.0], 0)
    assert shared[0] == 0.0
    assert shared[1] > 0.0


def test_the_register_counts_before_defaults_and_only_for_what_it_states() -> None:
    register = of("pressure", 1.0, 2.0, "kPa")
    assert register.stated(1, "pressure").registered
    assert register.stated(1, "flow rate") == default("flow rate")
    assert not register.rests_on_default(1, "pressure")
    assert register.rests_on_default(1, "flow rate")
    assert not register.rests_on_default(1, "temperature")  # shown beside what it is registered for
    assert register.rests_on_default(2, "temperature")
    assert register.rests_on_default(2, "pressure")
    assert register.rests_on_default(0, "length")


def test_a_volume_reported_is_stated_under_volume() -> None:
    reading = BY_FIELD["grain volume", "grain_volume_cm3"]
    random, shared = amounts(of("volume", 0.01, 0.02, "cm3"), reading, [12.0])
    assert (random[0], shared[0]) == (0.01, 0.02)
    assert amounts(NOTHING, reading, [12.0])[1][0] == pytest.approx(12.0 * 0.12e-2)


def test_the_digest_names_all_that_one_instrument_states_and_nothing_of_others() -> None:
    one = of("mass", 0.01, 0.0, "g")
    both = Register(dict(one.rows) | {(2, "mass"): Stated(0.5, 0.0, "g", "", True)}, {})
    finer = of("mass", 0.005, 0.0, "g")
    assert one.digest_text(1) == both.digest_text(1)
    assert one.digest_text(1) != finer.digest_text(1)
    assert one.digest_text(3) == ""


def test_every_reading_is_a_field_of_its_sheet_with_a_default_that_says_whence() -> None:
    for reading in (*READINGS, *CALIBRATION_READINGS):
        stated = default(reading.measure)
        assert stated.source
        assert not stated.registered
        assert max(stated.repeatability, stated.scale) > 0.0
        fields = [f for column in SHEETS[reading.kind].columns for f in column.fields]
        assert reading.field in fields
        assert not reading.instrument or reading.instrument in fields
        assert reading.title != reading.field
    assert len(BY_FIELD) == len(READINGS)  # none twice
