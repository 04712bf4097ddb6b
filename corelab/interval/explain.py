"""How a result came about: the formulas with their numbers, the readings as typed, the budget."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab.bench import gather, judge, reduce, uncertainty
from corelab.control.instruments import READINGS
from corelab.errors import NotFound, did_you_mean, quoted
from corelab.interval import life, select
from corelab.quantities import RESULTS
from corelab.records import store
from corelab.science.catalogue import formulas
from corelab.science.formula import Formula, Symbol

_DENSITIES = ("mercury-density", "water-density", "toluene-density", "ethanol-density")
_BULK = (
    *_DENSITIES, "bulk-volume-caliper", "bulk-volume-displacement", "bulk-volume-buoyancy", "volume-uncoated",
)  # fmt: skip
_SALT = ("water-mass", "salt-left-mass", "salt-mass")
_GRAIN = ("calibration-cup", "grain-volume-gas-expansion", *_SALT)
_PORE = ("pore-fluid-mass", "liquid-volume", "pore-volume-saturation")
_HOLDER = ("calibration-holder", "pore-volume-gas-expansion")
_POROSITY = ("porosity-bulk-grain", "porosity-bulk-pore", "porosity-pore-grain", "summation-of-fluids")
_STEP = ("bulk-volume-caliper", "gas-viscosity", "flow-rate-conversion", "gas-permeability")
_FITS = (
    "klinkenberg-regression", "slip-inertia-regression", "slip-corrected", "permeability-kozeny-carman",
    "permeability-krumbein-monk",
)  # fmt: skip
_LINE = (*_STEP, *_FITS)
_FLUIDS = (*_SALT, "brine-density", "brine-volume", "oil-mass", "saturations", "summation-of-fluids")
#: The calculations on the way to each result; of the routes to porosity only the one taken is shown.
_WAY: Mapping[str, tuple[str, ...]] = {
    "bulk volume": _BULK,
    "grain volume": (*_GRAIN, "porosity-bulk-pore"),
    "pore volume": (*_BULK, *_GRAIN, *_PORE, *_HOLDER, *_POROSITY),
    "dry mass": (*_SALT, "grain-mass"),
    "porosity": (*_BULK, *_GRAIN, *_PORE, *_HOLDER, *_POROSITY),
    "grain density": (*_GRAIN, "grain-mass", "grain-density"),
    "bulk density": (*_BULK, *_SALT, "grain-mass", "bulk-density"),
    "gas permeability": _STEP,
    "mean pressure": (),
    "klinkenberg permeability": _LINE,
    "slip factor": _LINE,
    "inertial coefficient": _LINE,
    "liquid permeability": ("bulk-volume-caliper", "liquid-permeability"),
    **dict.fromkeys(
        ("median grain size", "mean grain size", "sorting", "skewness", "kurtosis", "trask sorting"),
        ("sieve-statistics",),
    ),
    "pore volume compressibility": (*_HOLDER, "pore-compressibility"),
    "pore volume stress exponent": (*_HOLDER, "pore-volume-stress-regression"),
    "permeability stress exponent": (*_LINE, "permeability-stress-regression"),
    "oil saturation": (*_BULK, *_GRAIN, *_POROSITY, *_FLUIDS),
    "water saturation": (*_BULK, *_GRAIN, *_POROSITY, *_FLUIDS),
    "gas saturation": (*_BULK, *_GRAIN, *_POROSITY, *_FLUIDS),
}


def explain(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    plug: str,
    result: str,
    *,
    stress_mpa: float | None = None,
    direction: str = "",
) -> dict[str, Any]:
    """Everything behind one result of one plug, in plain values.

    Raises
    ------
    NotFound
        If the result is not a result, or this plug has none at the stress and direction asked for.
    """
    quantity = quantity_named(result)
    number = select.plug_id(identities, well, plug)
    stored = store.settings(connection)
    tray = gather.gather(connection, [number], stored)
    with reduce.noting_calls() as calls:
        outcomes = reduce.reduce(tray)
    found = list(uncertainty.contributions(tray))
    uncertainty.add_uncertainties(tray, outcomes)
    judge.judge(tray, outcomes)
    place = _place(outcomes, quantity, stress_mpa, direction)
    if place is None:
        raise NotFound(f"Plug {quoted(plug)} has no {quantity}" + _asked(stress_mpa, direction))
    outcome, i = place
    versions = {key: formula.version for key, formula in formulas().items()}
    row = reduce.rows(tray, [outcome], versions)
    keys = ("quantity", "direction", "stress_mpa", "step", "value", "uncertainty", "value_limit", "basis")
    mine = next(
        r
        for r in row
        if r["direction"] == (str(outcome.direction[i]) if outcome.direction is not None else "")
        and r["stress_mpa"] == (float(outcome.stress_mpa[i]) if outcome.stress_mpa is not None else 0.0)
        and r["step"] == (str(outcome.step[i]) if outcome.step is not None else "")
    )
    budget = _budget(found, outcomes, outcome, i)
    method = formulas().get(mine["method"])
    quantity_of = RESULTS[quantity]
    return {
        "well": identities.name("well", identities.owner("plug", number)),
        "plug": identities.name("plug", number),
        "result": quantity,
        "symbol": quantity_of.symbol,
        "unit": quantity_of.unit,
        **{k.replace("_mpa", " [MPa]").replace("value_limit", "limit"): mine[k] for k in keys[1:]},
        "flags": [f for f in mine["flags"].split("; ") if f],
        "reason": mine["reason"],
        "method": mine["method"],
        "version": mine["version"],
        "equation": method.equation if method else "",
        "valid": method.valid if method else "",
        "source": method.source if method else "reported by the instrument or the weighing itself",
        "calculations": _calculations(calls, quantity, mine["method"], mine["flags"].split("; ")),
        "readings": _readings(connection, identities, number, {b["sheet"] for b in budget} - {""}),
        "instruments": _instruments(tray, {b["sheet"] for b in budget}),
        "calibrations": _calibrations(tray, quantity),
        "budget": budget,
        "fingerprint": mine["fingerprint"],
    }


def quantity_named(result: str) -> str:
    wanted = " ".join(result.split()).casefold().split(" [")[0]
    if wanted in RESULTS:
        return wanted
    raise NotFound(f"There is no result {quoted(result)}; {did_you_mean(result, list(RESULTS), 20)}")


def _asked(stress_mpa: float | None, direction: str) -> str:
    parts = [f"at {stress_mpa:g} MPa"] if stress_mpa is not None else []
    parts += [f"in the direction '{direction}'"] if direction else []
    return (" " + " ".join(parts) if parts else "") + ": it was not measured."


def _place(
    outcomes: list[reduce.Outcome], quantity: str, stress_mpa: float | None, direction: str
) -> tuple[reduce.Outcome, int] | None:
    """The outcome and place that is asked for: with a value before without, at the lowest stress."""
    candidates: list[tuple[bool, float, int, reduce.Outcome, int]] = []
    for order, outcome in enumerate(o for o in outcomes if o.quantity == quantity):
        for i in range(len(outcome.at)):
            stress = 0.0 if outcome.stress_mpa is None else float(np.real(outcome.stress_mpa[i]))
            if stress_mpa is not None and abs(stress - stress_mpa) > max(0.005, 0.005 * stress_mpa):
                continue
            if direction and (outcome.direction is None or outcome.direction[i] != direction):
                continue
            candidates.append((bool(np.isnan(outcome.value[i].real)), stress, order, outcome, i))
    if not candidates:
        return None
    best = min(candidates, key=lambda c: c[:3])
    return best[3], best[4]


def _budget(
    found: list[tuple[uncertainty.Effect, list[Any]]],
    outcomes: list[reduce.Outcome],
    outcome: reduce.Outcome,
    i: int,
) -> list[dict[str, Any]]:
    """Contributions to the variance, the greatest first; alike causes of several readings together."""
    at = next(n for n, o in enumerate(outcomes) if o is outcome)
    variance: dict[tuple[str, str, str], float] = defaultdict(float)
    count: dict[tuple[str, str, str], int] = defaultdict(int)
    for effect, parts in found:
        part = float(parts[at][i])
        if part != 0.0:
            sheets = sorted(effect.readings) or (["porosimeter calibration"] if effect.fits else [""])
            key = (effect.title, effect.source, sheets[0])
            variance[key] += part * part
            count[key] += 1
    if outcome.scatter is not None and np.nan_to_num(outcome.scatter[i]) > 0.0:
        variance["scatter of the steps", "beyond what the instruments state", "gas permeability"] += float(
            outcome.scatter[i] ** 2
        )
        count["scatter of the steps", "beyond what the instruments state", "gas permeability"] = 1
    total = sum(variance.values())
    ordered = sorted(variance.items(), key=lambda item: -item[1])
    return [
        {
            "cause": title,
            "kind": source,
            "sheet": sheet,
            "readings": count[title, source, sheet],
            "contribution": float(np.sqrt(v)),
            "share": v / total,
        }
        for (title, source, sheet), v in ordered
    ]


def _calculations(
    calls: list[reduce.Call], quantity: str, method: str, flags: list[str]
) -> list[dict[str, Any]]:
    by_function = {formula.compute: formula for formula in formulas().values()}
    made = {by_function[c.compute].key for c in calls if c.compute in by_function and _gives(c.result)}
    way = [key for key in _WAY[quantity] if key in made]
    if method in _FITS:
        way = [key for key in way if key not in _FITS or key == method]
    if quantity in {"porosity", "pore volume"}:
        way = [key for key in way if key not in _POROSITY or key == method]
    if not quantity.endswith("saturation"):
        if not any("salt left" in flag for flag in flags):
            way = [key for key in way if key not in _SALT]
        if not {"bulk-volume-displacement", "bulk-volume-buoyancy"} & set(way):
            way = [key for key in way if key not in _DENSITIES]
    shown: list[dict[str, Any]] = []
    for call in calls:
        formula = by_function.get(call.compute)
        if formula is None or formula.key not in way:
            continue
        outputs = _outputs(formula, call.result)
        if not _gives(call.result):
            continue
        item = {
            "key": formula.key,
            "version": formula.version,
            "title": formula.title,
            "equation": formula.equation,
            "inputs": [_value(s, call.arguments[s.name]) for s in formula.inputs if s.name in call.arguments],
            "outputs": [{**o, "value": _plain(o["value"])} for o in outputs],
            "source": formula.source,
        }
        if item not in shown:
            shown.append(item)
    order = {key: n for n, key in enumerate(way)}
    return sorted(shown, key=lambda c: order[c["key"]])


def _gives(result: Any) -> bool:
    """Whether a call gave any number."""
    values = [getattr(result, f.name) for f in fields(result)] if is_dataclass(result) else [result]
    arrays = [np.asarray(v) for v in values]
    return any(not np.isnan(a.real).all() for a in arrays if a.dtype.kind in "fc" and a.size)


def _outputs(formula: Formula, result: Any) -> list[dict[str, Any]]:
    if is_dataclass(result):
        names = {f.name for f in fields(result)}
        return [_raw(s, getattr(result, s.name)) for s in formula.outputs if s.name in names]
    return [_raw(formula.outputs[0], result)]


def _raw(symbol: Symbol, value: Any) -> dict[str, Any]:
    return {
        "symbol": symbol.symbol or symbol.name,
        "meaning": symbol.meaning,
        "unit": symbol.unit,
        "value": value,
    }


def _value(symbol: Symbol, value: Any) -> dict[str, Any]:
    return {**_raw(symbol, value), "value": _plain(value)}


def _plain(value: Any) -> Any:
    """Numbers and texts of an array as plain values: one where it holds one, else a list."""
    if value is None:
        return None
    array = np.atleast_1d(np.asarray(value))
    if array.dtype.kind == "c":
        array = array.real
    if array.dtype.kind == "f":
        items: list[Any] = [None if np.isnan(v) else float(v) for v in array.ravel()]
    else:
        items = [v.item() if hasattr(v, "item") else v for v in array.ravel()]
    if items and all(v == items[0] for v in items):
        return items[0]
    return items


def _readings(
    connection: sa.Connection, identities: store.Identities, plug: int, kinds: set[str]
) -> list[dict[str, Any]]:
    entries = life.entries_of_plugs(connection, [plug], in_force_only=True)
    return [
        {
            "number": int(e["number"]),
            "kind": e["kind"],
            "measured on": e["measured_on"] or "",
            "measured by": e["measured_by"] or "",
            "instrument": ""
            if pd.isna(e["instrument_id"])
            else identities.name("instrument", int(e["instrument_id"])),
            "as typed": json.loads(e["entered"]),
            "file": e["file"],
            "row": None if pd.isna(e["row"]) else int(e["row"]),
        }
        for e in store.rows_of(entries)
        if e["kind"] in kinds
    ]


def _instruments(tray: gather.Tray, sheets: set[str]) -> list[dict[str, Any]]:
    """The instruments of this plug with what they state, or what is taken in its place."""
    used: dict[tuple[int, str], None] = {}
    for reading in READINGS:
        readings = tray.readings[reading.kind]
        if reading.kind in sheets and reading.instrument and len(readings):
            there = ~np.isnan(np.real(readings.numbers[reading.field]))
            for number in np.nan_to_num(readings.numbers[reading.instrument][there]):
                used[int(np.real(number)), reading.measure] = None
    shown = []
    for number, measure in used:
        stated = tray.register.stated(number, measure)
        shown.append(
            {
                "instrument": tray.register.name(number),
                "measures": measure,
                "repeatability": stated.repeatability,
                "scale uncertainty": stated.scale,
                "uncertainty unit": stated.unit,
                "from": stated.source if stated.registered else f"default: {stated.source}",
            }
        )
    return shown


def _calibrations(tray: gather.Tray, quantity: str) -> list[dict[str, Any]]:
    setups = {"calibration-cup": "cup", "calibration-holder": "holder"}
    wanted = {setup for key, setup in setups.items() if key in _WAY[quantity]}
    shown = []
    for number in tray.calibration_users():
        calibration = tray.calibration(number)
        if calibration.setup not in wanted:
            continue
        fitted = reduce.calibrated(tray, calibration)
        if isinstance(fitted, str):
            continue
        shown.append(
            {
                "instrument": tray.register.name(calibration.instrument_id),
                "setup": calibration.setup,
                "calibration": calibration.name,
                "date": calibration.date,
                "readings": [int(n) for n in np.real(calibration.readings.numbers["id"])],
                "reference volume [cm3]": float(np.real(fitted[0])),
                f"{'cup' if calibration.setup == 'cup' else 'dead'} volume [cm3]": float(np.real(fitted[1])),
            }
        )
    return shown
