"""Check standards, occasion by occasion: what each instrument gave for them on each day.

A stored result of a standard averages its readings; a chart needs each day by itself. So every occasion
(standard, instrument, day) stands in a tray of its own as if it were a plug, and one reduction gives them
all. The instrument checked is the one on whose sheet the day's readings stand: the porosimeter for volumes,
porosity and grain density, the permeameter for permeability, balance and caliper for mass and bulk volume.
Readings of the other sheets are those of the same day, else the newest before it, else the first after.
"""

from __future__ import annotations

from bisect import bisect_right
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab import units
from corelab.bench import gather, reduce, uncertainty
from corelab.bench.gather import Readings, Tray, Whole
from corelab.bench.outcome import Outcome
from corelab.control.instruments import Calibration
from corelab.quantities import RESULTS
from corelab.records import store

#: Sheet -> the field that names the instrument it checks, the results that it checks, and the sheets that
#: would give them in another way.
CHECKS: Mapping[str, tuple[str, tuple[str, ...], tuple[str, ...]]] = {
    "grain volume": (
        "instrument_id",
        ("grain volume", "pore volume", "porosity", "grain density"),
        ("pore volume", "distillation", "retort"),
    ),
    "pore volume": ("instrument_id", ("pore volume", "porosity"), ("grain volume", "masses", "retort")),
    "gas permeability": (
        "permeameter_id",
        ("gas permeability", "klinkenberg permeability", "slip factor"),
        ("reported permeability",),
    ),
    "reported permeability": (
        "permeameter_id",
        ("gas permeability", "klinkenberg permeability", "slip factor"),
        ("gas permeability",),
    ),
    "immersion": ("balance_id", ("bulk volume",), ()),
    "dimensions": ("caliper_id", ("bulk volume", "bulk density"), ("immersion",)),
    "masses": ("balance_id", ("dry mass",), ()),
}
_SAME_STRESS_MPA, _SAME_STRESS_SHARE = 0.005, 0.005
#: A gas permeability at another mean pressure than the certified one is another thing: assumed.
_SAME_PRESSURE_SHARE = 0.05
COLUMNS = [
    "standard_id", "instrument_id", "day", "result", "unit", "value", "u_value", "certified", "u_certified",
    "valid_until", "calibrated",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class _Mark:
    """One occasion."""

    standard_id: int
    instrument_id: int
    day: str
    kind: str


def occasions(
    connection: sa.Connection, stored: Mapping[str, str], calibrations: Sequence[Calibration]
) -> pd.DataFrame:
    """Each certified result of each standard on each occasion, with its certificate; in order of days.

    Returns
    -------
    DataFrame
        `COLUMNS`: standard and instrument by their numbers, `value` and `certified` with their standard
        uncertainties in `unit`; `calibrated` names the calibrations that served, so that a new one begins
        a new chart.
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
    rows: list[dict[str, Any]] = []
    for one in certified:
        for outcome in outcomes:
            if outcome.quantity == one["result"]:
                rows += _values(one, outcome, marks, outcomes, valid)
    frame = pd.DataFrame(rows, columns=COLUMNS)
    served = _calibrations(split, marks, calibrations)
    frame["calibrated"] = [served[int(p)] for p in frame["calibrated"]]
    return frame.sort_values(["day", "instrument_id", "standard_id", "result"], kind="stable").reset_index(
        drop=True
    )


def _calibrations(tray: Tray, marks: list[_Mark], calibrations: Sequence[Calibration]) -> list[str]:
    """For each occasion, the calibrations that served: of the register, and of the porosimeter itself."""
    served = [
        max((c.made_on for c in calibrations if c.instrument_id == m.instrument_id and c.made_on <= m.day),
            default="")
        for m in marks
    ]  # fmt: skip
    for kind in gather.EXPANSIONS:
        for place, choice in zip(tray.readings[kind].at.tolist(), tray.choices(kind), strict=True):
            if marks[place].kind == kind and isinstance(choice, int):
                own = tray.calibration(choice)
                served[place] = f"{served[place]} {own.date} {own.name}".strip()
    return served


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


def _split(tray: Tray) -> tuple[list[_Mark], Tray]:
    """The occasions, and a tray with one place for each."""
    by_day = {kind: _by_day(readings) for kind, readings in tray.readings.items()}
    marks: list[_Mark] = []
    chosen: dict[str, list[Whole]] = {kind: [] for kind in tray.readings}
    none = np.zeros(0, dtype=np.intp)
    for kind, (field, _, others) in CHECKS.items():
        instruments = np.nan_to_num(tray.readings[kind].numbers[field]).astype(np.intp)
        for place, days in by_day[kind].items():
            for day, rows in days.items():
                for instrument in np.unique(instruments[rows]).tolist() if day else ():
                    if not instrument:
                        continue
                    for other, of_place in by_day.items():
                        if other == kind:
                            found = rows[instruments[rows] == instrument]
                        elif other in others or place not in of_place:
                            found = none
                        else:
                            found = of_place[place][_nearest(list(of_place[place]), day)]
                        chosen[other].append(found)
                    marks.append(_Mark(int(tray.plug_ids[place]), int(instrument), day, kind))
    made = {}
    for kind, rows_of_kind in chosen.items():
        index = np.concatenate([none, *rows_of_kind])
        at = np.repeat(np.arange(len(marks)), [len(r) for r in rows_of_kind]).astype(np.intp)
        old = tray.readings[kind]
        made[kind] = Readings(
            at, {n: v[index] for n, v in old.numbers.items()}, {n: v[index] for n, v in old.texts.items()}
        )
    places = np.arange(len(marks), dtype=np.intp)
    split = replace(tray, plug_ids=places, readings=made, fingerprints=[], in_force={}, found={})
    return marks, split


def _by_day(readings: Readings) -> dict[int, dict[str, Whole]]:
    """The rows of each place by day, in order of days; what has no day of measuring under an empty one."""
    days = readings.texts.get("measured_on", np.full(len(readings), "", dtype=object))
    rows: dict[int, dict[str, list[int]]] = defaultdict(lambda: defaultdict(list))
    for row, (place, day) in enumerate(zip(readings.at.tolist(), days.tolist(), strict=True)):
        rows[place][day[:10]].append(row)
    return {
        place: {day: np.array(found[day], dtype=np.intp) for day in sorted(found)}
        for place, found in rows.items()
    }


def _nearest(days: list[str], day: str) -> str:
    """The same day, else the newest before it, else the first after."""
    return days[max(bisect_right(days, day) - 1, 0)]


def _values(
    one: Mapping[str, Any],
    outcome: Outcome,
    marks: list[_Mark],
    outcomes: list[Outcome],
    valid: Mapping[int, str],
) -> list[dict[str, Any]]:
    """The values of one certified result, one an occasion: of the gas, stress and pressure certified."""
    best: dict[int, tuple[float, int]] = {}
    pressures = _pressures(outcomes) if outcome.quantity == "gas permeability" else {}
    for i, place in enumerate(outcome.at.tolist()):
        mark = marks[place]
        if mark.standard_id != one["standard_id"] or outcome.quantity not in CHECKS[mark.kind][1]:
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
            if pressures and away > _SAME_PRESSURE_SHARE * float(pressure):
                continue
        if place not in best or away < best[place][0]:
            best[place] = (away, i)
    return [
        {
            "standard_id": one["standard_id"],
            "instrument_id": marks[place].instrument_id,
            "day": marks[place].day,
            "result": outcome.quantity,
            "unit": one["shown"],
            "value": float(outcome.value[i].real),
            "u_value": float("nan") if outcome.uncertainty is None else float(outcome.uncertainty[i].real),
            "certified": one["value"],
            "u_certified": one["u"],
            "valid_until": valid.get(one["standard_id"], ""),
            "calibrated": place,
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
