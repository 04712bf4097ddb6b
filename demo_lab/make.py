"""Makes the demo lab: draws a stated truth, simulates readings on it, writes bench sheets and logs.

Everything is invented: field, wells, rock, people. The physics here is this script's own (it imports nothing
of corelab), so that the program's results can be held against `truth.csv`:

* helium expansion: ideal and isothermal, two vessels, solved for the pressure after opening;
* gas flow: Darcy's law with slip, k_g = k_inf (1 + b / p_mean), no inertia, viscosity from CoolProp;
* liquids: densities of water, sodium chloride brine and mercury near room temperature, from tables.

Slip factors scatter about b = 0.777 atm (k / mD)^-0.39 (Heid et al. 1950, from memory).
Run it with `python demo_lab/make.py`; the same files come out each time.
"""

from __future__ import annotations

import csv
import io
import itertools
import re
import sys
import zipfile
from collections import defaultdict
from datetime import date, datetime
from pathlib import Path
from typing import Any

import numpy as np
from CoolProp.CoolProp import PropsSI
from openpyxl import Workbook

# The rows of a sheet read best as rows.
# fmt: off
HERE = Path(__file__).resolve().parent
LAB, GEOLOGIST, TECHNICIANS = "Demo Core Laboratory", "Mirel Karsk", ("Iva Tern", "Odd Pell")
FOOT, PSI, ATM = 0.3048, 6.894757293168, 101.325  # m, kPa, kPa
MILLIDARCY = 1e-15 / 1.01325  # m2
OIL = {"QB-1": 0.845, "QB-2": 0.838}  # g/cm3
SALINITY, SALT = 62.0, 2.165  # g/kg of brine, g/cm3
DISH = 12.304  # g
PERCENT = "% of reading"

rng = np.random.default_rng(20260301)
Row = dict[str, Any]
sheets: dict[str, dict[str, list[Row]]] = defaultdict(lambda: defaultdict(list))


def put(file: str, kind: str, row: Row, of: Row | None = None, on: str = "", by: int = 0) -> None:
    """Adds a row to a sheet: about plug `of`, read `on` a day by a technician, where that is said."""
    about = {"well": of["well"], "plug": of["plug"]} if of else {}
    reading = {"measured on": on, "measured by": TECHNICIANS[by]} if on else {}
    sheets[file][kind].append(about | row | reading)


def day(start: str, after: int = 0) -> str:
    """ISO date of the working day `after` working days past `start`."""
    return str(np.busday_offset(date.fromisoformat(start), after, roll="forward"))


# --------------------------------------------------------------------------------------------------- fluids

# Density in g/cm3 against degC.
WATER = [15, 20, 22, 25, 30], [0.999103, 0.998207, 0.997774, 0.997048, 0.995650]
MERCURY = [10, 20, 25, 30], [13.5704, 13.5458, 13.5336, 13.5213]
#: Sodium chloride brine at 20 degC, between 6 % (1.0413) and 8 % (1.0559).
BRINE = round(float(np.interp(SALINITY, [60, 80], [1.0413, 1.0559])), 4)


def viscosity(gas: str, degc: float, mean_kpa: np.ndarray) -> np.ndarray:
    """Pa s"""
    return np.asarray(PropsSI("V", "T", degc + 273.15, "P", mean_kpa * 1e3, gas))


# Slip in a gas over that in nitrogen: it goes with viscosity and the root of the molar mass.
slips = {gas: float(viscosity(gas, 22, np.array(ATM))) * PropsSI("M", gas) ** -0.5
         for gas in ("nitrogen", "helium")}
SLIP = {gas: slip / slips["nitrogen"] for gas, slip in slips.items()}

# ---------------------------------------------------------------------------------------------- instruments

POROSIMETERS, PERMEAMETERS = ("POR-A", "POR-B", "POR-H"), ("GP-1", "GP-2", "GP-3")
# (instrument, measures): repeatability, scale uncertainty, unit
INSTRUMENTS: dict[tuple[str, str], tuple[float, float, str]] = {
    ("BAL-1", "mass"): (0.002, 0.002, "g"),
    ("BAL-2", "mass"): (0.002, 0.001, "g"),
    ("BAL-HG", "mass"): (0.02, 0.02, "g"),
    ("CAL-1", "length"): (0.02, 0.005, "mm"),
    ("CAL-2", "length"): (0.0008, 0.0002, "in"),
    ("TRAP-1", "volume"): (0.02, 0.005, "cm3"),
    ("BARO-1", "pressure"): (0.02, 0.01, "kPa"),
    ("PD-1", "pressure"): (0.03, 0.02, PERCENT),
    **{(rig, "pressure"): (0.02, 0.02, PERCENT) for rig in POROSIMETERS},
    **{(rig, "pressure"): (0.03, 0.02, PERCENT) for rig in PERMEAMETERS},
    **{(rig, "flow rate"): (0.3, 0.2, PERCENT) for rig in PERMEAMETERS},
    **{(rig, "temperature"): (0.1, 0.1, "degC") for rig in POROSIMETERS + PERMEAMETERS},
}
shared = {key: rng.normal() * scale for key, (_, scale, _) in INSTRUMENTS.items()}


def read(instrument: str, measures: str, true: float, decimals: int) -> float:
    """What the instrument shows: its shared error, a new error, its resolution."""
    repeatability, _, unit = INSTRUMENTS[instrument, measures]
    error = shared[instrument, measures] + rng.normal() * repeatability
    return round(float(true * (1 + error / 100) if unit == PERCENT else true + error), decimals)


class Day:
    """The laboratory on one day."""

    def __init__(self) -> None:
        self.barometer = 100.6 + 0.6 * rng.normal()  # kPa
        self.degc = 21.8 + 0.4 * rng.normal()
        self.barometer_read = read("BARO-1", "pressure", self.barometer, 2)


days: dict[str, Day] = defaultdict(Day)

# ----------------------------------------------------------------------------------------------------- rock

# Porosity wanders by `sd` about `phi`, gamma by `gr_sd` about `gr`; log10 k/mD = a + b porosity, with
# `scatter` decades; `water` saturates the rock above the contact; `ratio` is vertical over horizontal k.
NUMBERS = ("phi", "sd", "rho", "a", "b", "scatter", "gr", "gr_sd", "water", "ratio", "mm", "sigma")
WORDS = ("lithology", "size", "sorting", "roundness", "firmness", "cement", "colour", "accessories")
TABLE: tuple[tuple[str, tuple[Any, ...], tuple[Any, ...]], ...] = (
    ("channel sand", (0.275, 0.021, 2.650, -1.00, 14.6, 0.14, 28, 5, 0.16, 0.6, 0.32, 0.55),
     ("sandstone", "lower medium sand", "moderately well", "subrounded", "friable", "kaolinite, little",
      "light brown", "mica")),
    ("shoreface sand", (0.175, 0.020, 2.658, -1.90, 18.0, 0.17, 47, 8, 0.27, 0.4, 0.16, 0.80),
     ("sandstone", "lower fine sand", "moderately", "subangular", "hard", "quartz", "grey", "glauconite")),
    ("heterolithic", (0.100, 0.022, 2.682, -3.15, 22.0, 0.24, 96, 17, 0.62, 0.1, 0.04, 1.60),
     ("siltstone", "silt", "poorly", "angular", "firm", "clay", "dark grey", "pyrite, plant debris")),
    ("cemented bed", (0.042, 0.011, 2.702, -3.75, 21.0, 0.22, 21, 3, 0.80, 0.8, 0.16, 0.80),
     ("calcareous sandstone", "lower fine sand", "moderately", "subangular", "hard", "calcite, poikilotopic",
      "pale grey", "shell debris")),
)
FACIES: dict[str, Row] = {name: dict(zip(NUMBERS + WORDS, n + w, strict=True)) for name, n, w in TABLE}
CHANNEL, SHORE, MIXED, TIGHT = FACIES
# Logged interval, contact of oil and water, bases of the layers: log depth in the unit of the well.
# The cores lie at log depths 2441.4-2468.8 m and 7902.5-7931.5 ft.
WELLS: dict[str, Row] = {
    "QB-1": {
        "unit": "m", "scale": 1.0, "start": 2390.0, "stop": 2515.0, "step": 0.1524, "contact": 2464.5,
        "layers": [(2396, MIXED), (2399, SHORE), (2400.2, TIGHT), (2403.5, SHORE), (2413, MIXED),
                   (2419.5, SHORE), (2427, MIXED), (2430, SHORE), (2435, MIXED), (2436.2, TIGHT),
                   (2443.5, MIXED), (2450, SHORE), (2451.4, TIGHT), (2454.7, SHORE), (2456.5, MIXED),
                   (2462, CHANNEL), (2462.9, TIGHT), (2467.1, CHANNEL), (2470.8, MIXED), (2477, CHANNEL),
                   (2478.6, MIXED), (2480, TIGHT), (2485, SHORE), (2492, MIXED), (2497.5, SHORE),
                   (2505, MIXED), (2508, SHORE), (9999, MIXED)]},
    "QB-2": {
        "unit": "ft", "scale": FOOT, "start": 7800.0, "stop": 8050.0, "step": 0.5, "contact": 7926.5,
        "layers": [(7826, MIXED), (7841, SHORE), (7858, MIXED), (7862, TIGHT), (7875, MIXED), (7889, SHORE),
                   (7905.4, MIXED), (7915.4, SHORE), (7917.5, TIGHT), (7920, MIXED), (7930, CHANNEL),
                   (7944, MIXED), (7968, CHANNEL), (7985, MIXED), (8001, SHORE), (8004, TIGHT),
                   (8019, MIXED), (8031, CHANNEL), (9999, MIXED)]},
}
# A core barrel holds about 9 m or 30 ft (common practice).
# well, run, top, base, recovered (in the unit of the well), shift to log depth [m], cut on
RUNS = [
    ("QB-1", "1", 2440.0, 2449.0, 9.0, 1.42, "2025-11-03"),
    ("QB-1", "2", 2449.0, 2458.0, 8.1, 1.78, "2025-11-04"),
    ("QB-1", "3", 2458.0, 2466.7, 8.9, 2.05, "2025-11-05"),
    ("QB-2", "1", 7905.0, 7934.0, 28.6, -0.76, "2025-12-09"),
]
# Sections no plug was cut from, by the depth of their top.
UNCUT = {2445.0: "preserved", 2463.0: "rubble"}
GRID = 0.02  # m


def smooth(values: np.ndarray, over_m: float) -> np.ndarray:
    half = int(4 * over_m / GRID)
    kernel = np.exp(-0.5 * (np.arange(-half, half + 1) * GRID / over_m) ** 2)
    return np.convolve(np.pad(values, half, mode="edge"), kernel / kernel.sum(), mode="valid")


def wander(n: int, over_m: float) -> np.ndarray:
    """Noise of unit variance that is alike over about `over_m`."""
    values = smooth(rng.normal(size=n), over_m)
    return np.asarray(values / values.std())


for well in WELLS.values():
    z = np.arange(well["start"] * well["scale"] - 5, well["stop"] * well["scale"] + 5, GRID)
    layer = np.searchsorted([base * well["scale"] for base, _ in well["layers"]], z)
    f = {key: np.array([FACIES[name][key] for _, name in well["layers"]], dtype=float)[layer]
         for key in ("phi", "sd", "gr", "gr_sd", "rho")}
    phi = f["phi"] + f["sd"] * np.clip(wander(z.size, 0.45), -2.2, 2.2)
    gamma = f["gr"] + f["gr_sd"] * (0.8 * wander(z.size, 0.35) + 0.6 * wander(z.size, 1.2))
    well |= {"z": z, "porosity": phi, "gamma": np.maximum(gamma, 8), "rho": f["rho"], "shale": f["gr"] > 80,
             "facies": np.array([name for _, name in well["layers"]])[layer]}


def rock_at(well: str, log_m: float) -> tuple[str, float]:
    """Facies and porosity."""
    w = WELLS[well]
    at = round((log_m - w["z"][0]) / GRID)
    return str(w["facies"][at]), float(w["porosity"][at])


def slip_nitrogen(k_md: float) -> float:
    """kPa"""
    return float(0.777 * ATM * k_md**-0.39 * 10 ** rng.normal(0, 0.05))


plugs: list[Row] = []


def draw(well: str, name: str, source: str, log_m: float, diameter: float, length: float) -> Row:
    """The truth of one plug, lengths in cm; how it was measured (`…_by`) is added as it is measured."""
    (kind, porosity), w = rock_at(well, log_m), WELLS[well]
    f, above = FACIES[kind], log_m < w["contact"] * w["scale"]
    porosity = max(0.015, porosity + rng.normal(0, 0.004))
    k = 10 ** (f["a"] + f["b"] * porosity + rng.normal(0, f["scatter"]))
    water = min(0.9, f["water"] * rng.uniform(0.85, 1.15)) if above else rng.uniform(0.84, 0.92)
    oil = (1 - water) * rng.uniform(0.68, 0.82) if above else rng.uniform(0.025, 0.045)
    p = {
        "well": well, "plug": name, "source": source, "log_m": log_m, "facies": kind, "f": f,
        "diameter": diameter, "length": length, "rho": f["rho"] + rng.normal(0, 0.006), "porosity": porosity,
        "k": k, "b": slip_nitrogen(k), "gas": "nitrogen", "so": oil, "sw": water, "above": above,
        "impact": "", "undisturbed": (porosity, k), "companion": None, "duplicate": None, "orientation": None,
        "screens": 0.0, "foil": 0.0, "salt_g": 0.0, "fractured": False, "filled": False, "short": False,
        "porosity_by": "", "k_by": "", "s_by": ""}
    plugs.append(p)
    return p


def settle(p: Row) -> None:
    """Volumes and dry mass, once shape and porosity are final."""
    p["bulk"] = float(np.pi / 4 * p["diameter"] ** 2 * p["length"])
    p["pore"] = p["bulk"] * p["porosity"]
    p["grain"] = p["bulk"] - p["pore"]
    p["dry"] = p["grain"] * p["rho"]
    outside = np.pi / 4 * (p["diameter"] + 2 * p["foil"]) ** 2 * (p["length"] + p["screens"])
    p["jacket_cm3"] = round(float(outside) - p["bulk"], 3)
    p["jacket_g"] = round(6.1 * p["jacket_cm3"], 3)


def core_plug(run: tuple[Any, ...], name: str, depth: float, like: Row | None = None) -> Row:
    """A plug of the run, or a second one of the same sample point as `like`."""
    well = run[0]
    depth = round(depth, 2 if well == "QB-1" else 1)
    shape = ((3.795, 0.012), (4.6, 5.8)) if well == "QB-1" else ((2.525, 0.006), (3.6, 4.8))
    log_m = depth * WELLS[well]["scale"] + run[5]
    p = draw(well, name, "core", log_m, rng.normal(*shape[0]), rng.uniform(*shape[1]))
    p |= {"run": run[1], "depth": depth, "orientation": "vertical" if name.endswith("V") else "horizontal"}
    if like:
        vertical = name.endswith("V")
        ratio, scatter = (like["f"]["ratio"], 0.12) if vertical else (1.0, 0.04)
        p |= {key: like[key] for key in ("facies", "f", "above", "so", "sw")}
        p |= {"porosity": like["porosity"] + rng.normal(0, 0.002), "rho": like["rho"] + rng.normal(0, 0.002),
              "k": like["k"] * ratio * 10 ** rng.normal(0, scatter)}
        p |= {"b": slip_nitrogen(p["k"]), "companion" if vertical else "duplicate": like["plug"]}
    return p


for name, spacing, vertical, duplicates in (("QB-1", 0.42, 6, (11, 29, 45)), ("QB-2", 1.0, 7, (17,))):
    n = 0
    for cored in [r for r in RUNS if r[0] == name]:
        end, beside = min(cored[3], cored[2] + cored[4]), 0.06 / WELLS[name]["scale"]
        for at in np.arange(cored[2] + 0.4 * spacing, end - 0.5 * spacing, spacing):
            depth = at + rng.uniform(-0.2, 0.2) * spacing
            if any(-0.1 < depth - top < 1.03 for top in UNCUT):
                continue
            n += 1
            first = core_plug(cored, f"{n}H", depth)
            if n % vertical == 2:
                core_plug(cored, f"{n}V", first["depth"] + beside, first)
            if n in duplicates:
                core_plug(cored, f"{n}HD", first["depth"] + beside, first)
core_1, core_2 = ([p for p in plugs if p["well"] == well] for well in WELLS)
jacketed = next(p for p in core_1 if p["facies"] == CHANNEL)
jacketed |= {"screens": 0.030, "foil": 0.003}  # cm: both screens together, the sleeve
for p in [p for p in core_1 if p["facies"] == MIXED and not p["companion"]][1:12:5]:
    p["fractured"] = True
for p in [p for p in core_1 if p["facies"] == SHORE and not p["companion"]][5:18:4]:
    p["filled"] = True  # with brine, and dried with it

# -------------------------------------------------------------------------------------------- sidewall runs

GUN, DRILLED = "G1", "R1"
OUTCOMES = {4: "misfired", 19: "misfired", 11: "lost", 8: "empty", 21: "empty", 7: "partial", 15: "partial"}
IMPACTS = {
    CHANNEL: ("compacted", "compacted", "none", "loosened", "compacted", "none", "compacted", "loosened"),
    SHORE: ("shattered", "none"), TIGHT: ("shattered",), MIXED: ("none",)}
# What impact adds to porosity, and its factor on permeability: ranges.
CHANGES = {"compacted": ((-0.055, -0.025), (0.08, 0.35)), "loosened": ((0.025, 0.05), (1.0, 1.6)),
           "shattered": ((0.02, 0.04), (8, 30)), "none": ((0, 0), (1, 1))}
# Above, in and below the core, some side by side, some where core was lost.
SHOTS = [2402.0, 2418.0, 2428.5, 2438.2, 2442.6, 2444.2, 2445.5, 2446.8, 2448.0, 2450.6, 2452.1, 2453.0,
         2455.6, 2456.9, 2457.7, 2458.4, 2459.6, 2461.0, 2462.4, 2463.6, 2464.9, 2466.2, 2474.5, 2476.3]
STATIONS = [2402.2, 2418.1, 2442.7, 2444.3, 2451.0, 2453.1, 2458.5, 2459.7, 2463.7, 2474.6]
CORE, SIDE, VOLUMES, FLOW = "QB-1 core.xlsx", "QB-1 sidewall.xlsx", "QB-1 volumes.xlsx", "QB-1 flow.xlsx"


def shot(gun: str, number: int, z: float, tool: str, outcome: str, shape: tuple[float, float]) -> Row | None:
    """Puts the shot on its sheet and, if rock came up, draws the plug."""
    got, hard = outcome in ("recovered", "partial"), rock_at("QB-1", z)[0] in (SHORE, TIGHT)
    put(SIDE, "sidewall shots", {
        "well": "QB-1", "gun run": gun, "shot": str(number), "depth [m]": z, "depth basis": "log",
        "tool": tool, "outcome": outcome, "recovered length [mm]": round(shape[1] * 10 + 8) if got else None,
        "bullet": None if gun == DRILLED else "hard rock" if hard else "soft rock",
        "charge": "3 g" if gun == GUN else None})
    if not got:
        return None
    p = draw("QB-1", f"{tool[0].upper()}{number}", f"{tool} sidewall", z, *shape)
    p |= {"run": gun, "depth": z, "shot": str(number), "short": outcome == "partial"}
    return p


in_turn = {facies: itertools.cycle(impacts) for facies, impacts in IMPACTS.items()}
for n, at in enumerate(SHOTS, 1):
    outcome = OUTCOMES.get(n, "recovered")
    size = (rng.normal(2.40, 0.03), 1.2 if outcome == "partial" else rng.uniform(2.3, 3.1))
    if hit := shot(GUN, n, at, "percussion", outcome, size):
        p = hit
        p["impact"] = next(in_turn[p["facies"]])
        added, factor = CHANGES[p["impact"]]
        p["porosity"] += rng.uniform(*added)
        p["k"] *= rng.uniform(*factor)
        p["b"] = slip_nitrogen(p["k"])
        p["sw"] = rng.uniform(0.58, 0.72) if p["above"] else rng.uniform(0.85, 0.92)  # flushed by filtrate
        p["so"] = (1 - p["sw"]) * rng.uniform(0.3, 0.5) if p["above"] else 0.03
for n, at in enumerate(STATIONS, 1):
    size = (rng.normal(2.34, 0.006), rng.uniform(3.7, 4.5))
    shot(DRILLED, n, at, "rotary", "lost" if n == 5 else "recovered", size)
side = [p for p in plugs if p["source"] != "core"]
for p in plugs:
    settle(p)

# ------------------------------------------------------------------------------------------------ registers

REGISTER = "registers.xlsx"
put(REGISTER, "jobs", {
    "job": "J-26-01", "laboratory": LAB, "client": "Demo Operator",
    "partners": "Demo Partner North, Demo Partner South", "report number": "R-26-01",
    "received on": "2026-01-12"})
for name, well in WELLS.items():
    put(REGISTER, "wells", {
        "well": name, "job": "J-26-01", "field": "Qubrel (invented)", "country": "nowhere",
        "unique well identifier": f"DEMO-{name}", "depth unit": well["unit"], "depth datum": "rotary table",
        "datum elevation [m]": 28.5, "mud": "water-based", "mud filtrate salinity [g/L]": 2,
        "bit diameter [mm]": 215.9})
for (name, measures), (repeatability, scale, unit) in INSTRUMENTS.items():
    put(REGISTER, "instruments", {
        "instrument": name, "measures": measures, "repeatability": repeatability, "scale uncertainty": scale,
        "uncertainty unit": unit, "certificate": f"C-{name}-26", "calibrated on": "2026-01-15",
        "due on": "2027-01-15"})

BILLETS = {"B-5": 5.0, "B-10": 10.0, "B-20": 20.0, "B-30": 30.0, "B-40": 40.0}  # certified, cm3
VOIDS = {"V-3": 3.0, "V-8": 8.0, "V-16": 16.0}
true_of = {name: volume + rng.normal(0, 0.003) for name, volume in (BILLETS | VOIDS).items()}


def standard(name: str, kind: str, certified: list[tuple[str, float, str, float]]) -> None:
    put(REGISTER, "standards", {"standard": name, "kind": kind, "maker": LAB, "certificate": f"C-{name}",
                                "valid until": "2028-01-31"})
    for result, value, unit, u in certified:
        put(REGISTER, "certified values", {
            "standard": name, "result": result, "certified value": value, "unit": unit,
            "standard uncertainty": u, "gas": "nitrogen" if "permeability" in result else None})


for name, volume in BILLETS.items():
    standard(name, "billet", [("grain volume", volume, "cm3", 0.003)])
for name, volume in VOIDS.items():
    standard(name, "void", [("pore volume", volume, "cm3", 0.003)])
check_plugs: list[Row] = [
    {"well": "standards", "plug": name, "diameter": 3.81, "length": 5.0, "porosity": porosity, "k": k,
     "rho": rho, "gas": "nitrogen", "b": slip_nitrogen(k), "screens": 0.0, "foil": 0.0, "salt_g": 0.0}
    for name, porosity, k, rho in (("CP-1", 0.205, 118.0, 2.651), ("CP-2", 0.132, 1.13, 2.655))
]
for p in check_plugs:
    settle(p)
    true = (("klinkenberg permeability", p["k"], "mD", round(0.005 * p["k"], 4)),
            ("grain volume", p["grain"], "cm3", 0.015), ("porosity", p["porosity"], "v/v", 0.001))
    certified = [(r, round(v + u * rng.normal() / 2, 4), unit, u) for r, v, unit, u in true]
    standard(p["plug"], "check plug", certified)

for name, run, top, base, recovered, _, cut in RUNS:
    file, u = (CORE, "m") if name == "QB-1" else ("csv", "ft")
    put(file, "core runs", {
        "well": name, "run": run, f"top depth [{u}]": top, f"base depth [{u}]": base,
        f"recovered length [{u}]": recovered, "core diameter [mm]": 101.6, "loss at": "base", "cut on": cut,
        "remarks": "the stub left by run 2 came up with this run" if recovered > base - top else None})
    end = min(base, top + recovered)
    edges = [*np.arange(top, end - 0.3, 1.0 if u == "m" else 3.0), end] + [base] * (end < base - 1e-6)
    for n, (a, b) in enumerate(itertools.pairwise(edges), 1):
        put(file, "core sections", {
            "well": name, "run": run, "section": str(n), f"top depth [{u}]": round(float(a), 2),
            f"base depth [{u}]": round(float(b), 2), "box": None if a >= end else f"{run}-{n:02d}",
            "state": "lost" if a >= end else UNCUT.get(a, "good")})

LOOKS = {"compacted": "powdered, mudcake", "loosened": "crumbled", "shattered": "cracked, chipped"}
for p in plugs:
    f, core, u = p["f"], p["source"] == "core", WELLS[p["well"]]["unit"]
    file = "csv" if p["well"] == "QB-2" else CORE if core else SIDE
    row = {"from": "core", "run": p["run"], f"depth [{u}]": p["depth"], "orientation": p["orientation"],
           "companion of": p["companion"], "duplicate of": p["duplicate"], "facies": p["facies"],
           "jacket mass [g]": p["jacket_g"] or None, "jacket volume [cm3]": p["jacket_cm3"] or None,
           "screen thickness [mm]": round(p["screens"] * 10, 2) or None, "taken on": "2026-01-14",
           "location": "store 2", "priority": "rush" if p["plug"] in ("7H", "8H") else "normal"}
    put(file, "plugs", row if core else {
        "from": "sidewall", "gun run": p["run"], "shot": p["shot"], "depth [m]": p["depth"],
        "facies": p["facies"], "taken on": "2025-11-12"}, p)
    condition = LOOKS.get(p["impact"], "cracked" if p["fractured"] else "short" if p["short"] else "intact")
    if p["well"] == "QB-2":
        grains = {"grain size [mm]": round(f["mm"] * 2 ** rng.normal(0, 0.15), 3),
                  "sorting [phi]": round(f["sigma"] * rng.uniform(0.9, 1.1), 2)}
    else:
        grains = {"grain size class": f["size"], "sorting class": f["sorting"], "sorting scale": "folk"}
    stained = p["above"] and p["facies"] in (CHANNEL, SHORE)
    put(file, "descriptions", {
        "lithology": f["lithology"], **grains,
        **{key: f[key] for key in ("roundness", "firmness", "cement", "accessories", "colour")},
        "stain": "even, brown" if stained else None, "fluorescence": "bright yellow" if stained else None,
        "condition": condition + (", short" if p["short"] and condition != "short" else ""),
        "described by": GEOLOGIST,
        "remarks": "in a foil sleeve with end screens" if p["screens"] else None}, p)
for n, p in enumerate([p for p in side if p["impact"] and not p["short"]][::2]):
    verdict = "yes" if p["impact"] in ("compacted", "shattered") else "no"
    put(SIDE, "crush verdicts", {
        "judged by": GEOLOGIST, "seen in": ("thin section", "hand specimen", "scan")[n % 3],
        "judged on": "2026-03-20", "crushed": "unsure" if n == 4 else verdict}, p)

# --------------------------------------------------------------------------------------- volumes and masses

CUPS = {"POR-A": (95.3, 46.2), "POR-B": (46.8, 21.4)}  # cup and reference volume, cm3
HOLDER = (5.23, 14.6)  # dead and reference volume, cm3
BENCHES = {"QB-1": (VOLUMES, "CAL-1", "BAL-1", "POR-A"), "QB-2": ("csv", "CAL-2", "BAL-2", "POR-B"),
           "side": (SIDE, "CAL-1", "BAL-2", "POR-B"),
           "standards": ("check plugs.xlsx", "CAL-1", "BAL-1", "POR-A")}


def expand(instrument: str, reference: float, free: float, on: str) -> Row:
    """Readings before and after the reference volume is opened to `free` cm3."""
    at, before = days[on], 100 * PSI * rng.uniform(0.985, 1.015)  # kPa gauge
    row: Row = {}
    for name, kpa in (("reference", before), ("expanded", before * reference / (reference + free))):
        if instrument == "POR-B":
            row[f"{name} pressure [kPa]"] = read(instrument, "pressure", kpa + at.barometer, 2)
        else:
            row[f"{name} pressure [psig]"] = read(instrument, "pressure", kpa / PSI, 3)
    return row | {"barometric pressure [kPa]": at.barometer_read,
                  "temperature [degC]": read(instrument, "temperature", at.degc, 1)}


def calibrate(file: str, instrument: str, on: str, label: str | None, fillings: list[list[str]]) -> None:
    """Cup with billets in it, or holder with voids; twice through."""
    for filling in fillings * 2:
        true = sum(true_of[name] for name in filling)
        holder = instrument == "POR-H"
        volume, reference = HOLDER if holder else CUPS[instrument]
        free = volume + true if holder else volume - true
        put(file, "porosimeter calibration", {
            "instrument": instrument, "setup": "holder" if holder else "cup", "calibration": label,
            "known volume [cm3]": sum((BILLETS | VOIDS)[name] for name in filling),
            **expand(instrument, reference, free, on), "remarks": " + ".join(filling) or "empty"}, on=on)


LARGE = [[], ["B-20"], ["B-40"], ["B-20", "B-30"], ["B-20", "B-40"], ["B-30", "B-40"]]
calibrate("porosimeters.xlsx", "POR-A", "2026-02-16", "A-1", LARGE)
calibrate("porosimeters.xlsx", "POR-A", "2026-03-02", "A-2", LARGE)
calibrate("porosimeters.xlsx", "POR-H", "2026-03-10", "H-1", [[], *([name] for name in VOIDS)])
calibrate("csv", "POR-B", "2026-02-13", None, [[], ["B-5"], ["B-10"], ["B-5", "B-10"], ["B-20"], ["B-30"]])


def dimensions(p: Row, bench: str, on: str) -> None:
    file, caliper, *_ = BENCHES[bench]
    unit, per, decimals = ("in", 2.54, 4) if caliper == "CAL-2" else ("mm", 0.1, 2)
    length, diameter = (p["length"] + p["screens"]) / per, (p["diameter"] + 2 * p["foil"]) / per
    put(file, "dimensions", {
        **{f"length {i} [{unit}]": read(caliper, "length", length, decimals) for i in (1, 2, 3)},
        **{f"diameter {i} [{unit}]": read(caliper, "length", diameter, decimals) for i in (1, 2, 3, 4)},
        "caliper": caliper,
        "remarks": "over the sleeve and the screens" if p["screens"] else None}, p, on)


def weigh(p: Row, bench: str, condition: str, true: float, on: str, **more: Any) -> None:
    file, _, balance, _ = BENCHES[bench]
    dish = DISH if bench == "side" else 0.0
    row = {"condition": condition, "mass [g]": read(balance, "mass", true + p["jacket_g"] + dish, 3),
           "container mass [g]": read(balance, "mass", dish, 3) if dish else None,
           "saturant density [g/cm3]": more.get("density"), "salinity [g/kg]": more.get("salinity"),
           "salt": more.get("salt"), "balance": balance}
    put(file, "masses", row, p, on, 1)


def grain_volume(p: Row, bench: str, on: str, times: int = 1, billet: str = "") -> None:
    file, _, _, instrument = BENCHES[bench]
    solid = p["grain"] + p["jacket_cm3"] + p["salt_g"] / SALT + true_of.get(billet, 0.0)
    cup, reference = CUPS[instrument]
    for _ in range(times):
        put(file, "grain volume", {
            "instrument": instrument, "billet volume [cm3]": BILLETS.get(billet),
            **expand(instrument, reference, cup - solid, on)}, p, on)


def mercury(p: Row, bench: str, on: str) -> None:
    degc = round(days[on].degc, 1)
    displaced = (p["bulk"] + p["jacket_cm3"]) * float(np.interp(degc, *MERCURY))
    put(BENCHES[bench][0], "immersion", {
        "liquid": "mercury", "mass displaced [g]": read("BAL-HG", "mass", displaced, 2),
        "temperature [degC]": degc, "balance": "BAL-HG"}, p, on, 1)


def brine(p: Row, bench: str, on: str) -> None:
    """Filled with brine, weighed in air and hung in it; it will be dried with its salt."""
    p["salt_g"] = p["pore"] * BRINE * SALINITY / 1000
    wet = p["dry"] + p["pore"] * BRINE
    weigh(p, bench, "saturated", wet, on, density=BRINE, salinity=SALINITY)
    put(BENCHES[bench][0], "immersion", {
        "liquid": "brine", "mass in air [g]": read("BAL-1", "mass", wet, 3),
        "mass immersed [g]": read("BAL-1", "mass", wet - p["bulk"] * BRINE, 3),
        "liquid density [g/cm3]": BRINE, "balance": "BAL-1"}, p, on, 1)


def distil(p: Row, bench: str, on: str, salt: str) -> None:
    """Mass as received, water in the trap; the salt may stay in the plug."""
    brine_g = p["sw"] * p["pore"] * BRINE
    salt_g, trap, oil = brine_g * SALINITY / 1000, round(rng.uniform(21, 25), 1), OIL[p["well"]]
    weigh(p, bench, "as received", p["dry"] + brine_g + p["so"] * p["pore"] * oil, on)
    p |= {"s_by": "distillation", "salt_g": salt_g if salt == "left" else 0.0}
    row = {"water volume [cm3]": read("TRAP-1", "volume", (brine_g - salt_g) / np.interp(trap, *WATER), 2)}
    if bench == "QB-2":
        row |= {"trap temperature [degF]": round(trap * 1.8 + 32, 1), "brine salinity [ppm]": SALINITY * 1000}
    else:
        row |= {"trap temperature [degC]": trap, "brine salinity [g/kg]": SALINITY,
                "brine density [g/cm3]": BRINE}
    put(BENCHES[bench][0], "distillation", {**row, "salt": salt, "oil density [g/cm3]": oil}, p, on, 1)


def retort(p: Row, on: str) -> None:
    """On a piece beside the one that is measured; the gas volume on a third."""
    natural = (1 - p["porosity"]) * p["rho"] + p["porosity"] * (p["sw"] * 1.0 + p["so"] * OIL["QB-1"])
    piece, other = rng.uniform(5.0, 6.5), rng.uniform(3.0, 4.0)
    water, oil = (p[key] * piece * p["porosity"] for key in ("sw", "so"))
    gas = (1 - p["sw"] - p["so"]) * other * p["porosity"]
    p["s_by"] = "retort"
    put(SIDE, "retort", {
        "sample mass [g]": read("BAL-2", "mass", piece * natural, 3),
        "sample bulk volume [cm3]": round(piece + rng.normal(0, 0.01), 2),
        "water volume [cm3]": read("TRAP-1", "volume", water, 2),
        "oil volume [cm3]": max(0.0, read("TRAP-1", "volume", oil, 2)),
        "gas sample mass [g]": read("BAL-2", "mass", other * natural, 3),
        "gas sample bulk volume [cm3]": round(other + rng.normal(0, 0.01), 2),
        "gas volume [cm3]": max(0.0, round(gas + rng.normal(0, 0.01), 2)),
        "oil density [g/cm3]": OIL["QB-1"]}, p, on, 1)


def treat(p: Row, file: str, on: str) -> None:
    clay, salty = p["facies"] == MIXED, p["salt_g"] > 0
    put(file, "treatments", {
        "step": "cleaning", "method": "distillation", "solvent": "toluene" if salty else "toluene, methanol",
        "temperature [degC]": 110, "humidity [%]": None, "started on": on, "ended on": day(on, 5),
        "end point": "solvent clear under ultraviolet light"}, p)
    put(file, "treatments", {
        "step": "drying", "method": "humidity oven" if clay else "oven",
        "temperature [degC]": 60 if clay else 105, "humidity [%]": 40 if clay else None,
        "started on": day(on, 6), "ended on": day(on, 8), "end point": "constant mass"}, p)


def not_measured(p: Row, file: str, reason: str, *tests: str) -> None:
    for test in tests:
        put(file, "not measured", {"test": test, "reason": reason}, p)


for bench, some in (("QB-1", core_1), ("QB-2", core_2)):
    file = CORE if bench == "QB-1" else "csv"
    for i, p in enumerate(some):
        tray = i // 12  # the trays go through the laboratory one a day
        if bench == "QB-2" and i == 5:
            not_measured(p, file, "crumbled", "porosity", "permeability")
            continue
        if i % 2 == 0 and p["orientation"] == "horizontal" and not p["screens"] and not p["filled"]:
            salt_stays = bench == "QB-1" and i % 10 == 0
            distil(p, bench, day("2026-01-26", tray), "left" if salt_stays else "leached")
        if p["filled"]:
            brine(p, bench, "2026-02-02")
        treat(p, file, day("2026-02-03", tray))
        dried, true = day("2026-02-13", tray), p["dry"] + p["salt_g"]
        salt: Row = {"salt": "left", "salinity": SALINITY} if p["salt_g"] else {}
        dimensions(p, bench, dried)
        if i % 5 == 2:  # weighed again two days on; the 13th was still wet at first
            weigh(p, bench, "dry", true + (0.45 if i == 12 else 0.004), dried, **salt)
            dried = day(dried, 2)
        weigh(p, bench, "dry", true, dried, **salt)
        grain_volume(p, bench, day("2026-02-24", tray), 2 if i % 9 == 4 else 1)
        if i % 6 == 3 or p["screens"]:
            mercury(p, bench, "2026-03-16")
        p["porosity_by"] = "bulk-grain"
for i, p in enumerate(side):
    if p["impact"]:
        retort(p, "2026-01-22")
    elif i % 2 == 0:
        distil(p, "side", "2026-01-23", "leached")
    if p["short"]:
        not_measured(p, SIDE, "too short", "bulk volume", "grain volume", "permeability")
        p["porosity_by"] = "summation"
        continue
    treat(p, SIDE, "2026-01-28")
    dimensions(p, "side", "2026-02-11")
    weigh(p, "side", "dry", p["dry"], "2026-02-11")
    grain_volume(p, "side", "2026-02-13", 2, "B-20" if p["impact"] else "")
    if p["impact"]:
        mercury(p, "side", "2026-03-17")
    p["porosity_by"] = "bulk-grain"

truth_stress: list[Row] = []
sands = [p for p in core_1 if p["facies"] in (CHANNEL, SHORE) and not p["salt_g"] and not p["screens"]]
for p in sands[3::7][:5]:
    for psi in (400, 2000, 4000):
        pore = p["pore"] * (1 - 0.012 * np.log(1 + psi / 400))
        on, free = "2026-03-11", HOLDER[0] + pore
        put(FLOW, "pore volume", {"net confining stress [psi]": psi, "instrument": "POR-H",
                                  **expand("POR-H", HOLDER[1], free, on)}, p, on)
        truth_stress.append({
            "well": p["well"], "plug": p["plug"], "net confining stress [MPa]": round(psi * PSI / 1000, 6),
            "pore volume [cm3]": round(pore, 5), "porosity [v/v]": round(pore / (pore + p["grain"]), 6)})

APERTURES = np.array([1.0, 0.71, 0.5, 0.355, 0.25, 0.18, 0.125, 0.09, 0.063, 0.0])  # mm
for p in [p for p in core_1 if p["facies"] == CHANNEL and not p["salt_g"]][2:12:4] + [
        p for p in side if p["impact"] == "compacted"][:2]:
    sigma = p["f"]["sigma"] * (1.4 if p["impact"] else 1.0)  # crushing adds fines
    u = np.log2(np.maximum(APERTURES, 1e-6) / p["f"]["mm"]) / sigma
    coarser = 1 / (1 + np.exp(1.702 * u))  # near to the normal law
    for size, g in zip(APERTURES, rng.uniform(24, 30) * np.diff(coarser, prepend=0.0), strict=True):
        retained = max(0.0, read("BAL-2", "mass", g, 2))
        row = {"aperture [mm]": float(size), "mass retained [g]": retained}
        put(VOLUMES, "sieve", row, p, "2026-03-18", 1)

# --------------------------------------------------------------------------------------------- permeability

BACK = np.array([30.0, 60.0, 120.0, 260.0, 550.0])  # kPa above the barometer downstream, permeable plugs
DRIVE = np.array([150.0, 260.0, 420.0, 650.0, 1000.0])  # kPa above the barometer upstream, the others


def gas_flow(p: Row, file: str, rig: str, on: str, steps: list[int], psi: float | None) -> None:
    at, slip, through = days[on], p["b"] * SLIP[p["gas"]], p["k"] > 5
    section, length = np.pi / 4 * p["diameter"] ** 2 * 1e-4, p["length"] * 1e-2  # m2, m
    wanted = 8e-6 * 1.77e-5 * length / (p["k"] * MILLIDARCY * section) / 1e3  # kPa, for 8 cm3/s
    down = at.barometer + (BACK[steps] if through else 0 * DRIVE[steps])
    up = down + (min(max(wanted, 2.0), 60.0) if through else DRIVE[steps])
    mean = (up + down) / 2
    k_gas = p["k"] * MILLIDARCY * (1 + slip / mean)
    mu = viscosity(p["gas"], at.degc, mean)
    flow = 1e6 * k_gas * section * (up**2 - down**2) * 1e3 / (2 * mu * length * at.barometer)  # cm3/s
    for n, (u, d, q) in enumerate(zip(up, down, flow, strict=True), 1):
        degc = read(rig, "temperature", at.degc, 1)
        unit, per = {"GP-1": ("psi", PSI), "GP-2": ("atm", ATM), "GP-3": ("kPa", 1.0)}[rig]
        end, zero = ("psig", at.barometer) if rig == "GP-1" else (unit, 0.0)
        ends = ({f"pressure difference [{unit}]": u - d, f"downstream pressure [{end}]": d - zero} if through
                else {f"upstream pressure [{end}]": u - zero})
        standard_per_actual = at.barometer / ATM * 293.15 / (at.degc + 273.15)
        # A bubble meter at the barometer, a mass flow meter that shows standard millilitres.
        meter, shows, decimals = {"GP-1": ("cm3/min", q * 60, 4), "GP-3": ("cm3/s", q, 5),
                                  "GP-2": ("mL/min", q * standard_per_actual * 60, 4)}[rig]
        warmth = ("degF", round(degc * 1.8 + 32, 1)) if rig == "GP-2" else ("degC", degc)
        put(file, "gas permeability", {
            "direction": "axial", "step": str(n), "net confining stress [psi]": psi,
            "stress type": "hydrostatic" if psi else None, "gas": p["gas"],
            **{name: read(rig, "pressure", kpa / per, 5) for name, kpa in ends.items()},
            f"flow rate [{meter}]": read(rig, "flow rate", shows, decimals),
            "flow basis": "standard" if rig == "GP-2" else None, f"temperature [{warmth[0]}]": warmth[1],
            "barometric pressure [kPa]": at.barometer_read, "permeameter": rig}, p, on, 1)


def reported(p: Row, file: str, on: str) -> None:
    shown = p["k"] * (1 + 0.04 * rng.normal())
    below = shown < 0.001
    p |= {"gas": "helium", "k_by": "below limit" if below else "reported"}
    put(file, "reported permeability", {
        "net confining stress [psi]": None if p["impact"] else 400, "permeameter": "PD-1",
        "klinkenberg permeability [mD]": "<0.001" if below else float(f"{shown:.3g}"),
        "gas": "helium", "mean pressure [kPa]": 1400,
        "slip factor [kPa]": None if below else round(p["b"] * SLIP["helium"])}, p, on)


for some, rig, file, start in ((core_1, "GP-1", FLOW, "2026-03-03"), (core_2, "GP-2", "csv", "2026-03-05"),
                                (side, "GP-3", SIDE, "2026-02-16")):
    for i, p in enumerate(some):
        on = day(start, i // 10)
        if p["porosity_by"] != "bulk-grain":
            continue
        if p["fractured"] or p["filled"]:
            not_measured(p, CORE, "fractured" if p["fractured"] else "unsuitable", "permeability")
        elif p["k"] < 0.02:
            reported(p, file, on)
        else:
            p["gas"] = "helium" if rig == "GP-2" and i % 4 else "nitrogen"
            steps = [[0, 1, 2, 3, 4], [0, 2, 4], [0, 1, 2, 4]][i % 3]
            if p["impact"] or i % 13 == 7:
                steps = [2] if i % 3 else [0, 4]
            gas_flow(p, file, rig, on, steps, None if p["impact"] else 400)
            p["k_by"] = {1: "one step", 2: "two steps"}.get(len(steps), "steps")
for p in check_plugs:
    dimensions(p, "standards", "2026-02-24")
    for i in range(12):
        on = day("2026-02-24", i)
        weigh(p, "standards", "dry", p["dry"], on)
        grain_volume(p, "standards", on)
        gas_flow(p, "check plugs.xlsx", "GP-1", on, [0, 2, 4], None)

# ------------------------------------------------------------------------------------------- gamma and logs

for name, run, top, base, recovered, shift, _ in RUNS:
    well = WELLS[name]
    u, every = well["unit"], 0.10 / well["scale"]
    z = np.arange(top + every / 2, min(base, top + recovered), every)
    true = np.interp(z * well["scale"] + shift, well["z"], smooth(well["gamma"], 0.10))
    for at, gamma in zip(z, 0.92 * true + 2.0 + rng.normal(0, 2.5, z.size), strict=True):
        put(CORE if u == "m" else "csv", "core gamma", {
            "well": name, "run": run, f"depth [{u}]": round(float(at), 2),
            "gamma [gAPI]": round(float(gamma), 1)}, on="2026-01-15")


def las(name: str) -> str:
    w, u = WELLS[name], WELLS[name]["unit"].upper()
    depth = np.arange(w["start"], w["stop"], w["step"])

    def logged(values: np.ndarray, over_m: float, noise: float) -> np.ndarray:
        true = np.interp(depth * w["scale"], w["z"], smooth(values, over_m))
        return np.asarray(true + rng.normal(0, noise, depth.size))

    density = w["rho"] * (1 - w["porosity"]) + 1.0 * w["porosity"]
    curves = (
        ("GR", "GAPI", "gamma ray", logged(w["gamma"], 0.22, 1.5), 2),
        ("RHOB", "G/C3", "bulk density", logged(density, 0.18, 0.006), 4),
        ("NPHI", "V/V", "neutron porosity", logged(w["porosity"] + 0.12 * w["shale"], 0.22, 0.006), 4),
        ("CALI", "IN", "caliper", logged(8.5 + 0.5 * w["shale"], 0.20, 0.02), 3),
    )
    lines = [
        "~Version", "VERS. 2.0 : LAS standard, version 2.0", "WRAP. NO : one line per depth", "~Well",
        f"STRT.{u} {depth[0]:.4f} : first depth", f"STOP.{u} {depth[-1]:.4f} : last depth",
        f"STEP.{u} {w['step']:.4f} : step", "NULL. -999.25 : absent value", "COMP. Demo Operator : company",
        f"WELL. {name} : well", "FLD. Qubrel : field (invented)", "LOC. nowhere : location",
        "SRVC. Demo Logging : service company", "DATE. 2025-12-20 : date logged",
        f"UWI. DEMO-{name} : identifier",
        "~Curve", f"DEPT.{u} : log depth",
        *(f"{curve}.{unit} : {words}" for curve, unit, words, *_ in curves),
        "~ASCII"]
    rows = [f"{z:10.4f} " + " ".join(f"{c[3][i]:9.{c[4]}f}" for c in curves) for i, z in enumerate(depth)]
    return "\n".join(lines + rows) + "\n"


# ------------------------------------------------------------------------------------------------- writing


def headings(rows: list[Row]) -> list[str]:
    """The columns filled in somewhere, the common ones last."""
    last = ("measured on", "measured by", "remarks")
    found = dict.fromkeys(key for row in rows for key, value in row.items() if value is not None)
    return [key for key in found if key not in last] + [key for key in last if key in found]


def write_csv(path: Path, rows: list[Row], separator: str = ",") -> None:
    with path.open("w", encoding="utf-8", newline="") as stream:
        columns = headings(rows)
        writer = csv.DictWriter(stream, columns, "", "ignore", delimiter=separator, lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def write_workbook(path: Path, tabs: dict[str, list[Row]]) -> None:
    book = Workbook()
    book.remove(book.worksheets[0])
    for kind, rows in tabs.items():
        tab, columns = book.create_sheet(kind), headings(rows)
        tab.append(columns)
        for row in rows:
            tab.append([row.get(column) for column in columns])
        tab.freeze_panes = "A2"
    book.properties.creator, book.properties.created = LAB, datetime(2026, 3, 31)
    stream = io.BytesIO()
    book.save(stream)
    with zipfile.ZipFile(stream) as made, zipfile.ZipFile(path, "w") as fixed:
        for name in made.namelist():  # saving stamps the hour: put a fixed one in its place
            data = re.sub(rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>2026-03-31T00:00:00Z", made.read(name))
            fixed.writestr(zipfile.ZipInfo(name, (2026, 3, 31, 0, 0, 0)), data, zipfile.ZIP_DEFLATED)


def truth(p: Row) -> Row:
    def told(by: Any, value: float) -> float | None:
        return float(f"{value:.7g}") if by else None

    whole = p["porosity_by"] == "bulk-grain"
    return {
        "well": p["well"], "plug": p["plug"], "source": p["source"], "run": p["run"],
        "log depth [m]": round(p["log_m"], 3), "facies": p["facies"], "lithology": p["f"]["lithology"],
        "orientation": p["orientation"], "bulk volume [cm3]": told(whole, p["bulk"]),
        "grain volume [cm3]": told(whole, p["grain"]), "pore volume [cm3]": told(whole, p["pore"]),
        "dry mass [g]": told(whole, p["dry"]), "porosity [v/v]": told(p["porosity_by"], p["porosity"]),
        "porosity route": p["porosity_by"] or None, "grain density [g/cm3]": told(whole, p["rho"]),
        "klinkenberg permeability [mD]": told(p["k_by"], p["k"]), "permeability basis": p["k_by"] or None,
        "gas": p["gas"] if p["k_by"] else None,
        "slip factor [kPa]": told(p["k_by"] not in ("", "below limit"), p["b"] * SLIP[p["gas"]]),
        "oil saturation [v/v]": told(p["s_by"], p["so"]), "water saturation [v/v]": told(p["s_by"], p["sw"]),
        "gas saturation [v/v]": told(p["s_by"], 1 - p["so"] - p["sw"]), "saturation basis": p["s_by"] or None,
        "impact": p["impact"] or None, "undisturbed porosity [v/v]": told(p["impact"], p["undisturbed"][0]),
        "undisturbed permeability [mD]": told(p["impact"], p["undisturbed"][1])}


def main(folder: Path) -> None:
    for part in ("bench", "logs"):
        (folder / part).mkdir(parents=True, exist_ok=True)
    for file, tabs in sheets.items():
        if file != "csv":
            write_workbook(folder / "bench" / file, tabs)
    for number, (kind, rows) in enumerate(sheets["csv"].items(), 1):
        separator = ";" if kind == "gas permeability" else ","
        write_csv(folder / "bench" / f"{number:02d} {kind}.csv", rows, separator)
    for name in WELLS:
        (folder / "logs" / f"{name}.las").write_text(las(name), encoding="ascii", newline="\n")
    write_csv(folder / "truth.csv", [truth(p) for p in plugs])
    write_csv(folder / "truth_stress.csv", truth_stress)
    write_csv(folder / "truth_depth.csv", [{"well": r[0], "run": r[1], "shift [m]": r[5]} for r in RUNS])
    write_csv(folder / "truth_standards.csv", [{
        "standard": c["plug"], "grain volume [cm3]": round(c["grain"], 4), "porosity [v/v]": c["porosity"],
        "klinkenberg permeability [mD]": c["k"], "slip factor [kPa]": round(c["b"], 3)} for c in check_plugs])


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
