"""Which value counts for which instrument on which day. Readings are made up; no published values."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab.bench import occasions as checked
from corelab.control.instruments import calibrations
from corelab.lab import Lab
from corelab.records import store

CERTIFIED = "standard,result,certified value,unit,standard uncertainty,gas,mean pressure [kPa]"

FLOW = (
    "step,upstream pressure [kPa],downstream pressure [kPa],flow rate [cm3/s],measured on,gas,permeameter,"
    "barometric pressure [kPa],temperature [degC]"
)


@pytest.fixture
def found(any_lab: Lab, write_sheet: Callable[..., Path]) -> Callable[..., pd.DataFrame]:
    """Loads sheets about the standard S-1 (kind, heading, rows); returns its occasions."""

    def load(certified: list[str], **sheets: list[str]) -> pd.DataFrame:
        made = [
            write_sheet("standards", "standard,kind", "S-1,check plug"),
            write_sheet("certified values", CERTIFIED, *(f"S-1,{row}" for row in certified)),
        ]
        for kind, (heading, *rows) in sheets.items():
            about = "" if kind in ("instruments", "porosimeter_calibration") else "well,plug,"
            own = "standards,S-1," if about else ""
            made.append(write_sheet(kind.replace("_", " "), about + heading, *(own + r for r in rows)))
        any_lab.load(made)
        with any_lab._reading() as connection:
            frame = checked.occasions(connection, store.settings(connection), calibrations(connection))
            names = store.Identities.read(connection).names["instrument"]
        return frame.assign(instrument=[names[int(i)] for i in frame["instrument_id"]])

    return load


def test_one_value_a_day_and_instrument_though_stored_results_average(found):
    frame = found(
        ["grain volume,45,cm3,0.01,,"],
        grain_volume=[
            "instrument,grain volume [cm3],measured on",
            "P-1,45.01,2026-02-01", "P-1,45.03,2026-02-01T15:00", "P-1,45.05,2026-02-02",
            "P-2,44.9,2026-02-01", "P-1,46.0,",
        ],
    )  # fmt: skip
    values = {(r["instrument"], r["day"]): r["value"] for r in frame.to_dict("records")}
    assert values == {
        ("P-1", "2026-02-01"): pytest.approx(45.02),
        ("P-1", "2026-02-02"): pytest.approx(45.05),
        ("P-2", "2026-02-01"): pytest.approx(44.9),
    }


def test_certificates_in_other_units(found):
    frame = found(
        ["grain volume,45,mL,0.01,,", "porosity,20.5,%,0.1,,"],
        grain_volume=["instrument,grain volume [cm3],measured on", "P-1,45.01,2026-02-01"],
        dimensions=["length 1 [mm],diameter 1 [mm],measured on", "50,38,2026-01-01"],
    ).set_index("result")
    assert frame.loc["grain volume", "certified"] == pytest.approx(45.0)
    assert frame.loc["porosity", ["certified", "u_certified"]].tolist() == pytest.approx([0.205, 0.001])
    bulk = np.pi / 4 * 3.8**2 * 5.0
    assert frame.loc["porosity", "value"] == pytest.approx(1 - 45.01 / bulk)


def test_readings_of_the_other_sheets_are_those_of_the_day_or_the_newest_before(found):
    frame = found(
        ["porosity,0.2,v/v,0.001,,"],
        grain_volume=[
            "instrument,grain volume [cm3],measured on",
            *(f"P-1,45,{day}" for day in ("2026-02-01", "2026-02-10", "2026-02-20")),
        ],
        dimensions=[
            "length 1 [mm],diameter 1 [mm],measured on",
            "50,38,2026-02-05", "51,38,2026-02-10", "52,38,2026-03-01",
        ],
    )  # fmt: skip
    bulk = np.pi / 4 * 3.8**2 * np.array([5.0, 5.1, 5.1])
    assert frame["value"].to_numpy() == pytest.approx(1 - 45 / bulk)
    assert (frame["instrument"] == "P-1").all()


def test_a_bulk_volume_counts_for_the_instrument_that_measured_it(found):
    """Caliper and immersion differ on purpose: neither may stand for the other."""
    frame = found(
        ["bulk volume,56.7,cm3,0.05,,"],
        dimensions=["length 1 [mm],diameter 1 [mm],caliper,measured on", "50,38,CAL,2026-02-01"],
        immersion=[
            "liquid,mass in air [g],mass immersed [g],liquid density [g/cm3],balance,measured on",
            "water,120,62,1.0,BAL,2026-02-01",
        ],
    ).set_index("instrument")["value"]
    assert frame["CAL"] == pytest.approx(np.pi / 4 * 3.8**2 * 5.0)
    assert frame["BAL"] == pytest.approx(58.0, abs=0.1)


def test_a_reported_permeability_does_not_stand_for_a_measured_one(found):
    flows = ((160, 130, 0.9), (320, 300, 1.3), (610, 600, 1.25))
    steps = [
        f"{n},{up},{down},{q},{day}"
        for n, (up, down, q) in enumerate(flows, 1)
        for day in ("2026-02-01", "2026-02-02")
    ]
    frame = found(
        ["klinkenberg permeability,10,mD,0.1,,"],
        dimensions=["length 1 [mm],diameter 1 [mm],measured on", "50,38,2026-01-01"],
        gas_permeability=[
            FLOW,
            *(f"{row},nitrogen,GP,101.3,22" for row in steps),
        ],
        reported_permeability=["permeameter,klinkenberg permeability [mD],measured on", "PD,77,2026-02-02"],
    )  # fmt: skip
    values = {(r["instrument"], r["day"]): r["value"] for r in frame.to_dict("records")}
    assert set(values) == {("GP", "2026-02-01"), ("GP", "2026-02-02"), ("PD", "2026-02-02")}
    assert values["PD", "2026-02-02"] == pytest.approx(77)
    assert values["GP", "2026-02-01"] == pytest.approx(values["GP", "2026-02-02"])
    assert values["GP", "2026-02-01"] != pytest.approx(77, rel=0.2)


def test_a_gas_permeability_is_that_of_the_gas_and_pressure_certified(found):
    rows = [f"1,160,140,0.9,2026-02-01,{gas},GP,101.3,22" for gas in ("nitrogen", "helium")]
    rows += ["2,320,300,1.3,2026-02-01,nitrogen,GP,101.3,22"]
    dimensions = ["length 1 [mm],diameter 1 [mm],measured on", "50,38,2026-01-01"]
    shown = found(
        ["gas permeability,10,mD,0.1,nitrogen,312"], dimensions=dimensions, gas_permeability=[FLOW, *rows]
    )
    k = 2 * 1.77e-5 * 1.3e-6 * 101300 * 0.05 / (np.pi / 4 * 0.038**2 * (320e3**2 - 300e3**2)) / 9.869233e-16
    assert shown["value"].tolist() == pytest.approx([k], rel=0.02)  # viscosity of nitrogen to 2 %


def test_no_step_near_the_pressure_certified_makes_no_check(found):
    shown = found(
        ["gas permeability,10,mD,0.1,nitrogen,1000"],
        dimensions=["length 1 [mm],diameter 1 [mm],measured on", "50,38,2026-01-01"],
        gas_permeability=[
            FLOW,
            "1,160,140,0.9,2026-02-01,nitrogen,GP,101.3,22",
        ],
    )  # fmt: skip
    assert not len(shown)


def test_calibrations_of_the_register_and_of_the_porosimeter_tell_charts_apart(found):
    billets = [(0, 800, 275.5), (10, 801, 332.0), (20, 799, 449.0), (30, 800, 733.0)]
    frame = found(
        ["grain volume,20,cm3,0.01,,"],
        instruments=[
            "instrument,measures,repeatability,uncertainty unit,calibrated on",
            "P-1,pressure,0.02,kPa,2026-01-01",
        ],
        porosimeter_calibration=[
            "instrument,calibration,known volume [cm3],reference pressure [kPa],expanded pressure [kPa],"
            "barometric pressure [kPa],measured on",
            *(f"P-1,{label},{v},{a},{b},101,{day}" for label, day in (("A","2026-01-10"),("B","2026-02-10"))
              for v, a, b in billets),
        ],
        grain_volume=[
            "instrument,reference pressure [kPa],expanded pressure [kPa],barometric pressure [kPa],"
            "measured on",
            *(f"P-1,799,449,101,{day}" for day in ("2026-02-01", "2026-02-09", "2026-02-11")),
        ],
    )  # fmt: skip
    assert frame["calibrated"].tolist() == ["2026-01-01 2026-01-10 A"] * 2 + ["2026-01-01 2026-02-10 B"]
    assert frame["value"].to_numpy() == pytest.approx(frame["value"].iloc[0])


def test_every_day_of_calibration_is_kept_though_the_register_was_corrected(
    any_lab: Lab, write_sheet: Callable[..., Path]
):
    heading = "instrument,measures,repeatability,uncertainty unit,calibrated on,due on"
    for made_on, due_on in (("2025-01-01", "2205-01-01"), ("2025-01-01", "2026-01-01"), ("2026-02-01", "")):
        sheet = write_sheet("instruments", heading, f"P-1,pressure,0.02,kPa,{made_on},{due_on}")
        any_lab.load([sheet], reason="as on the certificate")
    with any_lab._reading() as connection:
        found = [(c.made_on, c.due_on) for c in calibrations(connection)]
    assert found == [("2025-01-01", "2026-01-01"), ("2026-02-01", "")]
