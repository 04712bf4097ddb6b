"""Check standards, occasion by occasion: what each instrument gave for them on each day.

A stored result of a standard averages its readings; a chart needs each day by itself. So every occasion
(standard, instrument, day) stands in a tray of its own as if it were a plug, and one reduction gives them
all. The instrument checked is the one on whose sheet the day's readings stand: the porosimeter for volumes,
porosity and grain density, the permeameter for permeability, balance and caliper for mass and bulk volume.
Readings of the other sheets are those of the same day, else the newest before it, else the first after.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab import units
from corelab.bench import gather, judge, reduce, uncertainty
from corelab.bench.gather import Readings, Tray
from corelab.bench.outcome import Outcome
from corelab.quantities import RESULTS
from corelab.records import store

#: Sheet -> the field that names the instrument it checks, and the results that it checks.
CHECKS: Mapping[str, tuple[str, tuple[str, ...]]] = {
    "grain volume": ("instrument_id", ("grain volume", "porosity", "grain density")),
    "pore volume": ("instrument_id", ("pore volume",)),
    "gas permeability": (
        "permeameter_id",
        ("gas permeability", "klinkenberg permeability", "slip factor"),
    ),
    "reported permeability": (
        "permeameter_id",
        ("gas permeability", "klinkenberg permeability", "slip factor"),
    ),
    "immersion": ("balance_id", ("bulk volume",)),
    "dimensions": ("caliper_id", ("bulk volume",)),
    "masses": ("balance_id", ("dry mass", "bulk density")),
}
_SAME_STRESS_MPA, _SAME_STRESS_SHARE = 0.005, 0.005
COLUMNS = [
    "standard_id", "instrument_id", "day", "result", "unit", "value", "u_value", "certified", "u_certified",
    "valid_until",
]  # fmt: skip


def occasions(connection: sa.Connection, stored: Mapping[str, str]) -> pd.DataFrame:
    """Each certified result of each standard on each occasion, with its certificate; in order of days.

    Returns
    -------
    DataFrame
        `COLUMNS`: standard and instrument by their numbers, `value` and `certified` with their standard
        uncertainties in `unit`.
    """
    certified = _certified(connection)
    if not certified:
        return pd.DataFrame(columns=COLUMNS)
    valid = {
        int(r["standard_id"]): r["valid_until"] or ""
        for r in store.rows_of(store.in_force(connection, "standards"))
    }
    tray = gather.gather(connection, sorted({c["standard_id"] for c in certified}), stored)
    marks, split = _split(tray)
    if not marks:
        return pd.DataFrame(columns=COLUMNS)
    outcomes = reduce.reduce(split)
    uncertainty.add_uncertainties(split, outcomes)
    judge.judge(split, outcomes)
    rows: list[dict[str, Any]] = []
    for one in certified:
        for outcome in outcomes:
            if outcome.quantity == one["result"]:
                rows += _values(one, outcome, marks, outcomes, valid)
    frame = pd.DataFrame(rows, columns=COLUMNS)
    return frame.sort_values(["day", "instrument_id", "standard_id", "result"], kind="stable").reset_index(
        drop=True
    )


def _certified(connection: sa.Connection) -> list[dict[str, Any]]:
    """The certificates in force, in the unit in which the result is kept."""
    made = []
    for row in store.rows_of(store.in_force(connection, "certified values")):
        quantity = RESULTS.get(row["result"])
        if quantity is None:
            continue
        kind, target = quantity.kind, quantity.unit
        source = units.unit(row["unit"], kind) if kind else None
        wanted = units.unit(target, kind) if kind else None
        value, u = float(row["certified_value"]), float(row["standard_uncertainty"])
        if source is not None and wanted is not None:
            value = float(units.convert(value, source, wanted))
            u *= source.factor / wanted.factor
        made.append({**row, "standard_id": int(row["standard_id"]), "value": value, "u": u, "shown": target})
    return made


def _split(tray: Tray) -> tuple[list[tuple[int, int, str, str]], Tray]:
    """A tray with one place an occasion: (standard, instrument, day, sheet) of each, and the tray."""
    marks: list[tuple[int, int, str, str]] = []
    places: list[int] = []
    chosen: dict[str, list[np.ndarray[Any, Any]]] = {kind: [] for kind in tray.readings}
    of_place = {
        kind: [np.flatnonzero(r.at == place) for place in range(len(tray))]
        for kind, r in tray.readings.items()
    }
    days = {
        kind: np.array([str(d)[:10] for d in r.texts["measured_on"]], dtype=object)
        for kind, r in tray.readings.items()
        if "measured_on" in r.texts
    }
    for kind, (field, _) in CHECKS.items():
        readings = tray.readings[kind]
        instruments = np.nan_to_num(readings.numbers[field]).astype(np.intp)
        for place in range(len(tray)):
            own = of_place[kind][place]
            for instrument, day in sorted({(int(instruments[i]), str(days[kind][i])) for i in own}):
                if not instrument or not day:
                    continue
                for other, rows in of_place.items():
                    found = rows[place]
                    if other == kind:
                        found = own[(instruments[own] == instrument) & (days[kind][own] == day)]
                    elif other in days and len(found):
                        found = _nearest(found, days[other], day)
                    chosen[other].append(found)
                marks.append((int(tray.plug_ids[place]), instrument, day, kind))
                places.append(place)
    made = {}
    for kind, rows_of_kind in chosen.items():
        index = np.concatenate(rows_of_kind).astype(np.intp) if rows_of_kind else np.zeros(0, dtype=np.intp)
        at = np.repeat(np.arange(len(marks)), [len(r) for r in rows_of_kind]).astype(np.intp)
        old = tray.readings[kind]
        made[kind] = Readings(
            at, {n: v[index] for n, v in old.numbers.items()}, {n: v[index] for n, v in old.texts.items()}
        )
    split = replace(
        tray,
        plug_ids=np.arange(len(marks), dtype=np.intp),
        readings=made,
        fingerprints=[""] * len(marks),
        in_force={},
        found={},
    )
    return marks, split


def _nearest(rows: np.ndarray[Any, Any], days: np.ndarray[Any, Any], day: str) -> np.ndarray[Any, Any]:
    """The rows of the same day, else of the newest day before it, else of the first after; undated all."""
    own = days[rows]
    before = [d for d in own if d and d <= day]
    after = [d for d in own if d]
    wanted = max(before) if before else min(after, default="")
    chosen: np.ndarray[Any, Any] = rows[own == wanted]
    return chosen


def _values(
    one: Mapping[str, Any],
    outcome: Outcome,
    marks: list[tuple[int, int, str, str]],
    outcomes: list[Outcome],
    valid: Mapping[int, str],
) -> list[dict[str, Any]]:
    """The values of one certified result, one an occasion: of the gas, stress and pressure certified."""
    best: dict[int, tuple[float, int]] = {}
    pressures = _pressures(outcomes) if outcome.quantity == "gas permeability" else {}
    for i, place in enumerate(outcome.at.tolist()):
        standard, _, _, kind = marks[place]
        if standard != one["standard_id"] or outcome.quantity not in CHECKS[kind][1]:
            continue
        if np.isnan(outcome.value[i].real):
            continue
        step = "" if outcome.step is None else str(outcome.step[i])
        gas = one["gas"]
        if gas and gas not in (step, str(outcome.basis[i])) and step != "reported":
            continue
        stress = 0.0 if outcome.stress_mpa is None else float(outcome.stress_mpa[i])
        wanted = one["net_confining_stress_mpa"]
        away = 0.0
        if wanted is not None and wanted == wanted:
            if abs(stress - wanted) > max(_SAME_STRESS_MPA, _SAME_STRESS_SHARE * wanted):
                continue
        else:
            away = stress
        pressure = one["mean_pressure_kpa"]
        if pressure is not None and pressure == pressure:
            away = abs(pressures.get((place, stress, step), np.inf) - float(pressure))
        if place not in best or away < best[place][0]:
            best[place] = (away, i)
    return [
        {
            "standard_id": one["standard_id"],
            "instrument_id": marks[place][1],
            "day": marks[place][2],
            "result": outcome.quantity,
            "unit": one["shown"],
            "value": float(outcome.value[i].real),
            "u_value": float("nan") if outcome.uncertainty is None else float(outcome.uncertainty[i].real),
            "certified": one["value"],
            "u_certified": one["u"],
            "valid_until": valid.get(one["standard_id"], ""),
        }
        for place, (_, i) in best.items()
    ]


def _pressures(outcomes: list[Outcome]) -> dict[tuple[int, float, str], float]:
    """The mean pressure of each gas permeability."""
    return {
        (
            int(p),
            0.0 if o.stress_mpa is None else float(o.stress_mpa[i]),
            "" if o.step is None else str(o.step[i]),
        ): float(o.value[i].real)
        for o in outcomes
        if o.quantity == "mean pressure"
        for i, p in enumerate(o.at)
    }
