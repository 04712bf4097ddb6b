"""Readings made from plugs of known truth come back as that truth.

The physics here is this file's own and imports nothing of the program's formulas:

* gas expansion: ideal, isothermal mole balance of two vessels, solved for the pressure after opening;
* gas flow: Darcy's law in SI with slip, k_g = k (1 + b/p_mean); viscosity of the gas from CoolProp
  (Bell et al. 2014, Ind. Eng. Chem. Res. 53:2498) at the mean pressure;
* water of the trap from CoolProp, of the bath 997.7693 kg/m3 at 22 degC (air-saturated; Jones & Harris
  1992, J. Res. NIST 97:335); mercury 0.0738215 old ml/g at 20 degC (CRC Handbook, "Volume of 1 g of
  mercury"),
  1.000028 cm3 an old ml; sodium chloride brine at 20 degC from a handbook table (WNT 1974, as in CRC):
  10 % 1.0707, 16 % 1.1162, 24 % 1.1804, 26 % 1.1972 g/cm3.

Readings are not rounded, so that what is left is the difference between two ways to the same physics.
Tolerances: volumes and densities 2e-5, permeability 1 %, slip factor the larger of 1 % and 1 kPa, water
saturation 0.005 and oil saturation 0.01 of the pore volume.
"""

from __future__ import annotations

import csv
import json
import math
import subprocess
import sys
from collections import defaultdict
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from CoolProp.CoolProp import PropsSI
from openpyxl import Workbook

from corelab import open_lab

PSI, ATM, FOOT, INCH, LB, LB_FT3 = 6.894757293168, 101.325, 0.3048, 2.54, 453.59237, 0.016018463374
MILLIDARCY = 1e-15 / 1.01325  # m2
SETTING = 99.1  # kPa, the laboratory's barometer
CORE_PLUGS = 66

Row = dict[str, Any]
Sheets = dict[tuple[str, str], list[Row]]


def degf(degc: float) -> float:
    return degc * 1.8 + 32.0


def water(degc: float) -> float:
    return float(PropsSI("D", "T", degc + 273.15, "P", 101325.0, "Water")) / 1000.0


def brine(salinity: float) -> float:
    """Density at 20 degC [g/cm3] of a brine of so many g/kg."""
    known = [0, 100, 160, 240, 260]
    return float(np.interp(salinity, known, [0.99821, 1.0707, 1.1162, 1.1804, 1.1972]))


WATER_22 = 0.9977693
MERCURY_20 = 1.0 / (0.0738215 * 1.000028)


def expanded(reference: float, space: float, first: float, barometer: float) -> float:
    """Pressure after the reference chamber is opened to a space that held air at the barometer."""
    return (reference * first + space * barometer) / (reference + space)


def flow_cm3_s(
    gas: str, degc: float, k_md: float, slip: float, up: float, down: float, a_over_l: float
) -> float:
    """Flow at the downstream end [cm3/s]; pressures in kPa, the shape in cm."""
    mean = 0.5e3 * (up + down)
    viscosity = PropsSI("V", "T", degc + 273.15, "P", mean, gas)
    k = k_md * (1.0 + 1e3 * slip / mean) * MILLIDARCY
    m3_s = k * a_over_l * 0.01 * (up**2 - down**2) * 1e6 / (2.0 * viscosity * down * 1e3)
    return float(m3_s * 1e6)


def put(sheets: Sheets, file: str, kind: str, row: Row, plug: str = "") -> None:
    about = {"well": "W-1", "plug": plug} if plug else {}
    sheets[file, kind].append(about | {k: v for k, v in row.items() if v is not None})


def calibrate(sheets: Sheets) -> dict[str, tuple[float, float]]:
    """Calibrations of three cups and a holder; their true volumes."""
    true = {"cup A spring": (12.12, 98.5), "cup A summer": (12.61, 97.2), "cup B": (30.3, 120.7)}
    true |= {"cup B again": (30.9, 119.9), "cup C": (25.0, 110.0), "holder": (10.4, 2.9)}
    for n, billets in enumerate((0.0, 15.0, 30.0, 45.0)):
        for label, day in (("spring", "2026-03-01"), ("summer", "2026-06-01")):
            reference, cup = true[f"cup A {label}"]
            first = 690.0 + 10.0 * n
            after = expanded(reference, cup - billets, first, 100.3)
            row = {"instrument": "cup A", "calibration": label, "known volume [in3]": billets / INCH**3}
            row |= {"reference pressure [psig]": (first - 100.3) / PSI, "measured on": day}
            # the gauge cancels the barometer, which is not even read
            put(
                sheets,
                "cups.xlsx",
                "porosimeter calibration",
                row | {"expanded pressure [psig]": (after - 100.3) / PSI},
            )
        for name, day in (("cup B", "2026-03-02"), ("cup B again", "2026-06-02")):
            reference, cup = true[name]
            after = expanded(reference, cup - billets, 800.0, 84.2)
            put(
                sheets,
                "csv/b",
                "porosimeter calibration",
                {
                    "instrument": "cup B",
                    "setup": "cup",
                    "known volume [cm3]": billets,
                    "reference pressure [bara]": 8.0,
                    "expanded pressure [bara]": after / 100.0,
                    "barometric pressure [mmHg]": 84.2 / (13.5951 * 9.80665 / 1000.0),
                    "measured on": day,
                },
            )
        reference, cup = true["cup C"]
        after = expanded(reference, cup - billets, 700.0, SETTING)
        put(
            sheets,
            "csv/c",
            "porosimeter calibration",
            {
                "instrument": "cup C",
                "known volume [mL]": billets,
                "reference pressure [atm]": 700.0 / ATM,
                "expanded pressure [atm]": after / ATM,
            },
        )
    for void in (0.0, 5.0, 12.0):
        reference, dead = true["holder"]
        after = expanded(reference, void + dead, 1400.0, SETTING)
        put(
            sheets,
            "csv/h",
            "porosimeter calibration",
            {
                "instrument": "holder 1",
                "setup": "holder",
                "known volume [cm3]": void,
                "reference pressure [kPa]": 1400.0,
                "expanded pressure [kPa]": after,
                "measured on": "2026-03-01",
            },
        )
    return true


def bulk_volume(sheets: Sheets, plug: str, n: int, true: Row) -> None:
    """Caliper on every plug, over sleeve and screens where there are any; immersion on most."""
    length, diameter = true["length"] + true["screens"], true["diameter"] + 2 * true["foil"]
    if n % 2:
        put(
            sheets,
            "csv/mm",
            "dimensions",
            {
                "length 1 [mm]": 10 * length - 0.2,
                "length 2 [mm]": 10 * length + 0.2,
                "diameter 1 [mm]": 10 * diameter - 0.1,
                "diameter 2 [mm]": 10 * diameter,
                "diameter 3 [mm]": 10 * diameter + 0.1,
            },
            plug,
        )
    else:
        put(
            sheets,
            "dimensions.xlsx",
            "dimensions",
            {"length [in]": length / INCH, "diameter [in]": diameter / INCH},
            plug,
        )
    outside = true["bulk"] + true["jacket"]
    if true["method"] == "mercury":
        put(
            sheets,
            "csv/hg",
            "immersion",
            {
                "liquid": "mercury",
                "mass displaced [kg]": outside * MERCURY_20 / 1000.0,
                "temperature [degF]": 68.0,
            },
            plug,
        )
    elif true["method"] == "water":
        put(
            sheets,
            "csv/water",
            "immersion",
            {
                "liquid": "water",
                "mass in air [g]": 200.0,
                "mass immersed [g]": 200.0 - outside * WATER_22,
                "temperature [degC]": 22.0,
            },
            plug,
        )
    elif true["method"] == "toluene":
        put(
            sheets,
            "csv/toluene",
            "immersion",
            {
                "liquid": "toluene",
                "mass in air [lb]": 150.0 / LB,
                "mass immersed [lb]": (150.0 - outside * 0.8651) / LB,
                "liquid density [lb/ft3]": 0.8651 / LB_FT3,
            },
            plug,
        )
    elif true["method"] == "coated":
        wax = 0.61
        put(
            sheets,
            "immersion.xlsx",
            "immersion",
            {
                "liquid": "brine",
                "mass displaced [g]": (outside + wax) * 1.02,
                "liquid density [kg/m3]": 1020.0,
                "coating mass [g]": wax * 0.91,
                "coating density [g/cm3]": 0.91,
            },
            plug,
        )


def grain_volume(sheets: Sheets, plug: str, n: int, true: Row, cups: dict[str, tuple[float, float]]) -> None:
    solid = true["grain"] + true["jacket"] + true["salt volume"]
    if n % 4 == 0:  # by label, and the calibration of the day
        reference, cup = cups["cup A spring" if n % 8 == 0 else "cup A summer"]
        after = expanded(reference, cup - 10.0 - solid, 700.0, 101.0)
        put(
            sheets,
            "grain.xlsx",
            "grain volume",
            {
                "instrument": "cup A",
                "billet volume [cm3]": 10.0,
                "reference pressure [psig]": 599.0 / PSI,
                "expanded pressure [psig]": (after - 101.0) / PSI,
                "measured on": "2026-05-31" if n % 8 == 0 else "2026-06-01",
            },
            plug,
        )
    elif n % 4 == 1:  # by date, absolute, the barometer read
        reference, cup = cups["cup B" if n % 8 == 1 else "cup B again"]
        after = expanded(reference, cup - solid, 810.0, 84.9)
        put(
            sheets,
            "csv/b",
            "grain volume",
            {
                "instrument": "Cup b",
                "reference pressure [MPa]": 0.81,
                "expanded pressure [MPa]": after / 1000.0,
                "barometric pressure [kPa]": 84.9,
                "measured on": "2026-03-02" if n % 8 == 1 else "2026-07-01T10:30",
            },
            plug,
        )
    elif n % 4 == 2:  # a single undated calibration, the barometer from the setting
        reference, cup = cups["cup C"]
        after = expanded(reference, cup - 20.0 - solid, 705.0, SETTING)
        put(
            sheets,
            "csv/c",
            "grain volume",
            {
                "instrument": "cup C",
                "billet volume [cm3]": 20.0,
                "reference pressure [bar]": 7.05,
                "expanded pressure [bar]": after / 100.0,
            },
            plug,
        )
    else:
        put(
            sheets,
            "csv/d",
            "grain volume",
            {"instrument": "pycnometer", "grain volume [cm3]": solid + 3.7, "container volume [cm3]": 3.7},
            plug,
        )


def gas_flow(sheets: Sheets, plug: str, n: int, true: Row) -> None:
    gas = true["gas"]
    area_over_length = true["area"] / true["length"]
    degc = 20.0 + n % 5
    for step, mean in enumerate((150.0, 260.0, 480.0, 900.0)[: 3 + n % 2], 1):
        barometer = 100.9 + 0.2 * (n % 3)
        row: Row = {"step": step, "gas": gas, "temperature [degC]": degc, "measured on": "2026-04-01"}
        how = n % 4
        if how == 0:  # to the air, gauge, metered dry at the barometer and another temperature
            up = 2.0 * mean - barometer
            q = flow_cm3_s(gas, degc, true["k"], true["b"], up, barometer, area_over_length)
            meter = (273.15 + 30.0) / (273.15 + degc)
            row |= {
                "upstream pressure [psig]": (up - barometer) / PSI,
                "flow rate [cm3/min]": q * meter * 60.0,
                "flow temperature [degF]": degf(30.0),
                "barometric pressure [kPa]": barometer,
                "net confining stress [psi]": 400.0,
            }
        elif how == 1:  # back pressure, absolute, a mass meter that says L/min at 0 degC and 1 atm
            down = mean - 25.0
            q = flow_cm3_s(gas, degc, true["k"], true["b"], mean + 25.0, down, area_over_length)
            at_standard = q * down / ATM * 273.15 / (273.15 + degc)
            row |= {
                "upstream pressure [bar]": (mean + 25.0) / 100.0,
                "downstream pressure [bar]": down / 100.0,
                "flow rate [L/min]": at_standard * 0.06,
                "flow basis": "standard",
                "standard temperature [degC]": 0.0,
                "net confining stress [MPa]": 5.5,
            }
        elif how == 2:  # pressure difference, gauge back pressure, metered at a gauge pressure
            down = mean - 12.0
            q = flow_cm3_s(gas, degc, true["k"], true["b"], mean + 12.0, down, area_over_length)
            row |= {
                "pressure difference [atm]": 24.0 / ATM,
                "downstream pressure [kPag]": down - barometer,
                "flow rate [cm3/s]": q * down / (barometer + 40.0),
                "flow pressure [kPag]": 40.0,
                "barometric pressure [atm]": barometer / ATM,
                "confining pressure [barg]": 60.0,
            }
        else:  # barometer of the setting, standard at the defaults, confining raised with the pore pressure
            up = 2.0 * mean - SETTING
            q = flow_cm3_s(gas, degc, true["k"], true["b"], up, SETTING, area_over_length)
            row |= {
                "upstream pressure [barg]": (up - SETTING) / 100.0,
                "flow basis": "standard",
                "flow rate [mL/min]": q * 60.0 * SETTING / ATM * 293.15 / (273.15 + degc),
                "confining pressure [psia]": (5000.0 + mean) / PSI,
            }
        put(sheets, f"flow{how}.xlsx" if n % 2 else f"csv/flow{how}", "gas permeability", row, plug)
    true["stress"] = (400.0 * PSI / 1000.0, 5.5, np.nan, 5.0)[n % 4]


def fluids(sheets: Sheets, plug: str, n: int, true: Row) -> None:
    """Masses; distillation with salt none, left or leached, with a thimble or without."""
    received, dry, thimble = true["dry"], true["dry"], 0.0
    if true["salt"] is not None:
        salinity, density = true["salinity"], brine(true["salinity"])
        in_pores = true["water saturation"] * true["pore"] * density
        salt = in_pores * salinity / 1000.0
        oil = true["oil saturation"] * true["pore"]
        received += in_pores + oil * 0.84
        true["salt volume"] = salt / 2.165 if true["salt"] == "left" else 0.0
        dry += salt if true["salt"] == "left" else 0.0
        thimble = 8.25 if n % 3 == 0 else 0.0
        put(
            sheets,
            f"distillation{n % 2}.xlsx",
            "distillation",
            {
                "water volume [cm3]": (in_pores - salt) / water(20.0),
                "salt": true["salt"],
                "brine salinity [%w]" if n % 2 else "brine salinity [g/kg]": salinity
                / (10.0 if n % 2 else 1.0),
                "brine density [g/cm3]": density if n % 3 == 1 else None,
                "oil density [kg/m3]": 840.0,
                "thimble mass [g]": thimble or None,
            },
            plug,
        )
        put(
            sheets,
            "csv/received",
            "masses",
            {"condition": "as received", "mass [g]": received + thimble + true["jacket mass"]},
            plug,
        )
    dish = 12.3 if n % 5 == 2 and not thimble else 0.0
    for day, wet in (("2026-03-10", 0.4), ("2026-03-12", 0.0002), ("2026-03-13", 0.0)):
        put(
            sheets,
            "csv/dry",
            "masses",
            {
                "condition": "dry",
                "mass [kg]": (dry * (1.0 + wet * 0.01) + thimble + dish + true["jacket mass"]) / 1e3,
                "container mass [kg]": dish / 1e3 or None,
                "measured on": day,
            },
            plug,
        )


def core_plugs(sheets: Sheets, truth: dict[str, Row], rng: np.random.Generator) -> None:
    cups = calibrate(sheets)
    methods = ("caliper", "mercury", "caliper", "water", "toluene", "coated")
    salts = (None, "none", "left", "leached", "leached")
    for n in range(CORE_PLUGS):
        plug = f"{n + 1}H"
        t: Row = {"length": rng.uniform(3.0, 6.0), "diameter": rng.choice([2.54, 3.81])}
        t |= {"foil": 0.0, "screens": 0.0, "jacket mass": 0.0, "jacket": 0.0, "salt volume": 0.0}
        if n % 7 == 3:
            t |= {"foil": 0.004, "screens": 0.03, "jacket mass": 2.7}
        cylinder = math.pi / 4 * t["diameter"] ** 2 * t["length"]
        t["method"] = methods[n % 6]
        # the caliper cannot see the chip that the bath sees
        t["bulk"] = cylinder * (1.0 if t["method"] == "caliper" else 0.985)
        if t["foil"]:
            t["jacket"] = (
                math.pi / 4 * (t["diameter"] + 2 * t["foil"]) ** 2 * (t["length"] + t["screens"]) - cylinder
            )
        t["area"] = cylinder / t["length"]
        t["porosity"] = rng.uniform(0.18, 0.32)
        t["grain density"] = rng.uniform(2.63, 2.75)
        t["pore"], t["grain"] = t["porosity"] * t["bulk"], (1.0 - t["porosity"]) * t["bulk"]
        t["dry"] = t["grain density"] * t["grain"]
        t["gas"] = ("nitrogen", "helium", "air")[n % 3]
        t["k"] = float(10.0 ** rng.uniform(-2.0, 3.3))
        t["b"] = (2.9 if t["gas"] == "helium" else 1.0) * 40.0 * t["k"] ** -0.38
        t["salt"] = salts[n % 5]
        if t["salt"]:
            t["salinity"] = (0.0, 100.0, 160.0, 250.0)[n % 4]
            t["water saturation"], t["oil saturation"] = rng.uniform(0.2, 0.5), rng.uniform(0.0, 0.4)
        put(
            sheets,
            "csv/plugs",
            "plugs",
            {
                "from": "core",
                "run": "1",
                "depth [ft]": 3000.1 + 0.4 * n,
                "orientation": "horizontal",
                "jacket mass [g]": t["jacket mass"] or None,
                "jacket volume [in3]": t["jacket"] / INCH**3 or None,
                "screen thickness [mm]": 10 * t["screens"] or None,
            },
            plug,
        )
        bulk_volume(sheets, plug, n, t)
        fluids(sheets, plug, n, t)
        grain_volume(sheets, plug, n, t, cups)
        gas_flow(sheets, plug, n, t)
        if n % 10 == 4:
            for stress, closed in ((800.0, 0.97), (4000.0, 0.94)):
                reference, dead = cups["holder"]
                after = expanded(reference, t["pore"] * closed + dead, 1390.0, SETTING)
                put(
                    sheets,
                    "pore.xlsx",
                    "pore volume",
                    {
                        "net confining stress [psi]": stress,
                        "instrument": "holder 1",
                        "reference pressure [kPa]": 1390.0,
                        "expanded pressure [kPa]": after,
                        "measured on": "2026-03-05",
                    },
                    plug,
                )
            t["closed"] = t["pore"] * 0.94
        truth[plug] = t


def whole_core(sheets: Sheets, truth: dict[str, Row], rng: np.random.Generator) -> None:
    """Three directions; across the core k = 2 mu q p E/(L (p1² - p2²)) with a geometric factor."""
    for n in range(3):
        plug = f"{n + 1}W"
        length, diameter = rng.uniform(10.0, 20.0), 10.16
        put(
            sheets,
            "csv/plugs",
            "plugs",
            {
                "from": "whole core",
                "run": "1",
                "depth [ft]": 3027.0 + 0.5 * n,
                "top depth [ft]": 3026.8 + 0.5 * n,
                "base depth [ft]": 3027.2 + 0.5 * n,
            },
            plug,
        )
        put(
            sheets,
            "csv/mm",
            "dimensions",
            {"length 1 [mm]": 10 * length, "diameter 1 [mm]": 10 * diameter},
            plug,
        )
        t: Row = {"bulk": math.pi / 4 * diameter**2 * length}
        for direction, k, factor in (("vertical", 20.0, None), ("90", 80.0, 1.1), ("max", 120.0, 1.1)):
            shape = math.pi / 4 * diameter**2 / length if factor is None else length / factor
            for step, up in enumerate((160.0, 300.0, 600.0), 1):
                q = flow_cm3_s("nitrogen", 21.0, k, 8.0, up, 100.0, shape)
                put(
                    sheets,
                    "csv/whole",
                    "gas permeability",
                    {
                        "direction": direction,
                        "step": step,
                        "gas": "nitrogen",
                        "upstream pressure [kPa]": up,
                        "flow rate [cm3/s]": q,
                        "barometric pressure [kPa]": 100.0,
                        "temperature [degC]": 21.0,
                        "geometric factor": factor,
                    },
                    plug,
                )
            t[direction] = k
        truth[plug] = t


def filled_plugs(sheets: Sheets, truth: dict[str, Row], rng: np.random.Generator) -> None:
    """Plugs full of a liquid: clean, or brine that dried in them and left its salt; volumes reported."""
    for n in range(6):
        plug = f"{n + 1}L"
        pore, grain = rng.uniform(2.0, 9.0), rng.uniform(5.0, 20.0)
        salinity, density = (35.0, 1.024) if n % 2 else (0.0, 0.8)
        salt = pore * density * salinity / 1000.0
        put(sheets, "csv/plugs", "plugs", {"from": "core", "run": "1", "depth [ft]": 3028.5 + 0.05 * n}, plug)
        put(
            sheets,
            "csv/filled",
            "masses",
            {
                "condition": "saturated",
                "mass [g]": 2.7 * grain + pore * density + 8.0,
                "container mass [g]": 8.0,
                "saturant density [kg/m3]": density * 1000.0,
                "salinity [ppm]": salinity * 1000.0,
                "salt": "left" if salinity else "none",
                "salt density [g/cm3]": 2.22 if salinity else None,
            },
            plug,
        )
        put(
            sheets,
            "csv/emptied",
            "masses",
            {"condition": "dry", "mass [g]": 2.7 * grain + salt + 8.1, "container mass [g]": 8.1},
            plug,
        )
        if n < 4:
            put(
                sheets,
                "csv/d",
                "grain volume",
                {
                    "instrument": "pycnometer",
                    "grain volume [cm3]": grain + salt / 2.22 + 3.5,
                    "container volume [cm3]": 3.5,
                },
                plug,
            )
        else:
            put(
                sheets,
                "csv/mm",
                "dimensions",
                {"length 1 [mm]": 40.0, "diameter 1 [mm]": 20.0 * math.sqrt((pore + grain) / math.pi / 4.0)},
                plug,
            )
        truth[plug] = {
            "pore": pore,
            "grain": grain,
            "bulk": pore + grain,
            "porosity": pore / (pore + grain),
            "grain density": 2.7,
            "dry": 2.7 * grain,
            "route": "pore-grain" if n < 4 else "bulk-pore",
        }


def retorted(sheets: Sheets, truth: dict[str, Row], rng: np.random.Generator) -> None:
    for n in range(6):
        plug = f"{n + 1}R"
        water_f, oil_f, gas_f = rng.uniform(0.03, 0.12, 3)
        bulk = rng.uniform(20.0, 40.0)
        row = {
            "sample mass [g]": bulk * 2.3,
            "sample bulk volume [cm3]": bulk,
            "water volume [mL]": bulk * water_f,
            "oil volume [mL]": bulk * oil_f,
        }
        other = (bulk, 12.0, 12.0)[n % 3]
        row |= {"gas volume [cm3]": other * gas_f}
        row |= {"gas sample bulk volume [cm3]": 12.0} if n % 3 == 1 else {}
        row |= {"gas sample mass [g]": 12.0 * 2.3} if n % 3 == 2 else {}
        put(sheets, "csv/plugs", "plugs", {"from": "core", "run": "1", "depth [ft]": 3029.0 + 0.05 * n}, plug)
        put(sheets, f"retort{n % 3}.xlsx", "retort", row, plug)
        porosity = water_f + oil_f + gas_f
        truth[plug] = {
            "porosity": porosity,
            "water saturation": water_f / porosity,
            "oil saturation": oil_f / porosity,
            "route": "summation of fluids",
        }
    for n, (cell, k, flag) in enumerate(
        (
            ("<1e-5", 0.01, "klinkenberg permeability below limit"),
            (">5", 5000.0, "klinkenberg permeability above limit"),
            ("0.25", 250.0, ""),
        )
    ):
        put(
            sheets,
            "csv/reported",
            "reported permeability",
            {
                "permeameter": "decay",
                "klinkenberg permeability [D]": cell,
                "slip factor [psia]": 3.0,
                "net confining stress [psi]": 800.0,
            },
            f"{n + 1}R",
        )
        truth[f"{n + 1}R"] |= {"k": k, "flag": flag, "b": 3.0 * PSI, "basis": "reported"}


def write(sheets: Sheets, folder: Path) -> None:
    books: dict[Path, Workbook] = {}
    for (file, kind), rows in sheets.items():
        headings = list(dict.fromkeys(heading for row in rows for heading in row))
        path = folder / file
        table = [headings, *([row.get(h, "") for h in headings] for row in rows)]
        if path.suffix == ".xlsx":
            book = books.setdefault(path, Workbook())
            tab = book.create_sheet(kind)
            for line in table:
                tab.append(
                    [c.item() if isinstance(c, np.generic) else c or None if c == "" else c for c in line]
                )
        else:
            path.mkdir(parents=True, exist_ok=True)
            with (path / f"{kind}.csv").open("w", newline="", encoding="utf-8") as out:
                csv.writer(out).writerows(table)
    for path, book in books.items():
        del book["Sheet"]
        book.save(path)


@pytest.fixture(scope="module")
def made(
    tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path
) -> tuple[pd.DataFrame, pd.DataFrame, dict[str, Row], dict[str, pd.DataFrame]]:
    """The plugs as read in one process and by the command in another, the truth, and whole-core results."""
    rng = np.random.default_rng(7)
    sheets: Sheets = defaultdict(list)
    truth: dict[str, Row] = {}
    put(sheets, "csv/wells", "wells", {"well": "W-1", "depth unit": "ft"})
    put(
        sheets,
        "csv/runs",
        "core runs",
        {
            "well": "W-1",
            "run": "1",
            "top depth [ft]": 3000.0,
            "base depth [ft]": 3030.0,
            "recovered length [ft]": 29.9,
            "core diameter [in]": 4.0,
        },
    )
    for part in (core_plugs, whole_core, filled_plugs, retorted):
        part(sheets, truth, rng)
    folder = tmp_path_factory.mktemp("truth")
    write(sheets, folder / "bench")
    database = folder / "lab.db"
    database.write_bytes(sqlite_template.read_bytes())
    with open_lab(str(database), by="tester") as lab:
        lab.setting("barometric pressure", f"{SETTING} kPa")
        lab.load([folder / "bench"])
        frame = lab.interval("W-1").set_index("plug")
        stressed = lab.interval("W-1", stress=4000.0 * PSI / 1000.0).set_index("plug")
        of_plug = {plug: lab.plug_show("W-1", plug)["results"] for plug in truth if plug.endswith("W")}
        assert lab.recompute(check=True).empty
    command = [sys.executable, "-m", "corelab.cli.main", "--database", str(database)]
    shown = subprocess.run([*command, "interval", "W-1", "--format", "json"], capture_output=True, check=True)
    printed = pd.DataFrame(json.loads(shown.stdout)).set_index("plug")
    of_plug["under stress"] = stressed
    return frame, printed, truth, of_plug


@pytest.fixture(params=["in this process", "by the command"])
def found(request: pytest.FixtureRequest, made: Any) -> tuple[pd.DataFrame, dict[str, Row]]:
    return made[0 if request.param == "in this process" else 1], made[2]


def pair(found: tuple[pd.DataFrame, dict[str, Row]], heading: str, key: str) -> tuple[np.ndarray, np.ndarray]:
    frame, truth = found
    plugs = [p for p in truth if key in truth[p]]
    assert len(plugs) >= 3
    return frame.loc[plugs, heading].to_numpy(dtype=float), np.array(
        [truth[p][key] for p in plugs], dtype=float
    )


@pytest.mark.parametrize(
    ("heading", "key"),
    [
        ("bulk volume [cm3]", "bulk"),
        ("grain volume [cm3]", "grain"),
        ("pore volume [cm3]", "pore"),
        ("dry mass [g]", "dry"),
        ("porosity [v/v]", "porosity"),
        ("grain density [g/cm3]", "grain density"),
    ],
)
def test_volumes_and_densities(found: Any, heading: str, key: str) -> None:
    got, wanted = pair(found, heading, key)
    np.testing.assert_allclose(got, wanted, rtol=2e-5)


def test_klinkenberg_permeability_and_slip(found: Any) -> None:
    got, wanted = pair(found, "klinkenberg permeability [mD]", "k")
    np.testing.assert_allclose(got, wanted, rtol=0.01)
    got, wanted = pair(found, "slip factor [kPa]", "b")
    assert np.all(np.abs(got - wanted) <= np.maximum(0.01 * wanted, 1.0))
    frame, truth = found
    core = [p for p in truth if p.endswith("H")]
    assert set(frame.loc[core, "slip basis"]) == {"measured"}


def test_gas_permeability_is_of_the_step_nearest_the_reporting_pressure(found: Any) -> None:
    frame, truth = found
    core = [p for p in truth if p.endswith("H")]
    mean = frame.loc[core, "mean pressure [kPa]"].to_numpy(dtype=float)
    np.testing.assert_allclose(mean, 150.0, rtol=1e-9)  # of 150, 260, 480 and 900, the nearest to 200
    wanted = [truth[p]["k"] * (1.0 + truth[p]["b"] / 150.0) for p in core]
    np.testing.assert_allclose(
        frame.loc[core, "gas permeability [mD]"].to_numpy(dtype=float), wanted, rtol=0.01
    )
    assert list(frame.loc[core, "gas"]) == [truth[p]["gas"] for p in core]


def test_saturations(found: Any) -> None:
    for name, tolerance in (("water saturation", 0.005), ("oil saturation", 0.01)):
        got, wanted = pair(found, f"{name} [v/v]", name)
        np.testing.assert_allclose(got, wanted, atol=tolerance)
    frame, truth = found
    plugs = [p for p in truth if "oil saturation" in truth[p]]
    parts = frame.loc[plugs, [f"{name} saturation [v/v]" for name in ("oil", "water", "gas")]]
    np.testing.assert_allclose(parts.sum(axis=1).to_numpy(dtype=float), 1.0, rtol=1e-12)


def test_routes_bases_limits_and_stresses(found: Any) -> None:
    frame, truth = found
    for plug, t in truth.items():
        row = frame.loc[plug]
        if "porosity" in t:
            assert row["porosity route"] == t.get("route", "bulk-grain")
        if t.get("flag"):
            assert t["flag"] in row["flags"]
        if "basis" in t:
            assert row["permeability basis"] == row["slip basis"] == t["basis"]
            assert row["permeability stress [MPa]"] == pytest.approx(800.0 * PSI / 1000.0)
        if "stress" in t and not math.isnan(t["stress"]):
            assert row["permeability stress [MPa]"] == pytest.approx(t["stress"], rel=1e-6)
        assert "barometer assumed" not in row["flags"]
    # a sleeve held at 60 bar over the barometer: 6.1 MPa less the mean of the mean pressures
    held = [p for p, t in truth.items() if "stress" in t and math.isnan(t["stress"])]
    assert frame.loc[held, "permeability stress [MPa]"].between(5.4, 5.9).all()


def test_porosity_under_stress(made: Any) -> None:
    under, truth = made[3]["under stress"], made[2]
    plugs = [p for p, t in truth.items() if "closed" in t]
    closed = np.array([truth[p]["closed"] for p in plugs])
    grain = np.array([truth[p]["grain"] for p in plugs])
    np.testing.assert_allclose(under.loc[plugs, "pore volume [cm3]"], closed, rtol=2e-5)
    np.testing.assert_allclose(under.loc[plugs, "porosity [v/v]"], closed / (closed + grain), rtol=2e-5)


def test_directions_of_whole_core(made: Any) -> None:
    for plug in ("1W", "2W", "3W"):
        results, truth = made[3][plug], made[2][plug]
        k = results[results["quantity"] == "klinkenberg permeability"].set_index("direction")["value"]
        for direction in ("vertical", "max", "90"):
            assert k[direction] == pytest.approx(truth[direction], rel=0.01)
