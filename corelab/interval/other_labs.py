"""Other laboratories' plugs beside the lab's own: as reported, with their origin, and no more than that."""

from __future__ import annotations

import json
from collections.abc import Callable, Collection
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab.bench.outcome import STRESS_NOT_STATED
from corelab.bench.reported import REPORTED, SUMMATION
from corelab.errors import NotFound, did_you_mean, quoted
from corelab.interval.stress import near
from corelab.quantities import RESULTS
from corelab.records import store
from corelab.sheets.readings import DIRECTIONS

#: The state of what another laboratory reports: it is neither computed nor approved here.
STATUS = REPORTED
FLAG = "from another laboratory"
NOT_IN_FILE = "not in the file"
#: Of several of one quantity the first is shown.
_BASES = {SUMMATION: 1, "air": 1, "helium": 2, "": 3}
_DIRECTIONS = {d: i for i, d in enumerate(("", *DIRECTIONS))}
_PERMEABILITIES = ("gas permeability", "klinkenberg permeability")
_SATURATIONS = {"oil saturation", "water saturation", "gas saturation"}
#: Files seldom tell these, and nothing is missed without them.
_UNTOLD = {"mean pressure", "slip factor"}


def rows(
    connection: sa.Connection,
    well_id: int,
    well: str,
    stress_mpa: float | None,
    under_stress: Collection[str],
    computed: Collection[str],
    run_at: Callable[[float], str],
) -> pd.DataFrame:
    """One row a plug, with those headings of an interval of which anything is known; depths in metres.

    Parameters
    ----------
    under_stress
        The quantities of which only a value at `stress_mpa` is shown, where one is asked for.
    computed
        Names of the quantities that an interval shows.
    run_at
        Gives the name of the core run at a depth [m].
    """
    plugs = store.other_plugs(connection, well_id)
    if not len(plugs):
        return pd.DataFrame()
    depths = plugs["depth_m"].to_numpy(dtype=np.float64)
    made: dict[str, Any] = {
        "well": well,
        "plug": plugs["name"],
        "source": plugs["source"],
        "laboratory": plugs["laboratory"],
        "run": [
            run_at(z) if basis == "driller" else ""
            for z, basis in zip(depths.tolist(), plugs["depth_basis"], strict=True)
        ],
        "depth [m]": depths,
        "depth basis": plugs["depth_basis"],
        "facies": plugs["facies"],
        "orientation": plugs["orientation"],
        "lithology": plugs["lithology"],
        "status": STATUS,
    }
    place = pd.Series(np.arange(len(plugs)), index=plugs["id"])
    results = store.other_results(connection, well_id)
    results = results[results["other_plug_id"].isin(plugs["id"])]
    results = results.assign(
        place=place.reindex(results["other_plug_id"]).to_numpy(),
        stressed=results["quantity"].isin({*under_stress, *_PERMEABILITIES}),
    )
    doubts = [[FLAG, *(text.split("; ") if text else ())] for text in plugs["flags"]]
    reasons: list[dict[str, list[str]]] = [{} for _ in doubts]
    for quantity in computed:
        chosen = _chosen(results[results["quantity"] == quantity], stress_mpa)
        values = np.full(len(plugs), np.nan)
        at = chosen["place"].to_numpy(dtype=np.intp)
        values[at] = chosen["value"].to_numpy(dtype=np.float64)
        made[RESULTS[quantity].stored_heading] = values
        there = chosen[chosen["value"].notna()]
        if quantity == "porosity":
            made["porosity route"] = _texts(len(plugs), there, "basis")
            made["porosity stress [MPa]"] = _numbers(len(plugs), there, "stress_mpa")
        elif quantity == "gas permeability":
            made["gas"] = _texts(len(plugs), there, "basis")
        elif quantity == "klinkenberg permeability":
            made["slip basis"] = _texts(len(plugs), there, "basis")
        for i, flags, stress in zip(there["place"], there["flags"], there["stress_mpa"], strict=True):
            doubts[i] += flags.split("; ") if flags else ()
            if quantity in _PERMEABILITIES and stress != stress:
                doubts[i].append(STRESS_NOT_STATED)
        reported = np.zeros(len(plugs), dtype=np.bool_)
        for i, reason in zip(chosen["place"], chosen["reason"], strict=True):
            reported[i] = True
            if reason:
                reasons[i].setdefault(reason, []).append(quantity)
        for i in np.flatnonzero(~reported & (quantity not in _UNTOLD)).tolist():
            reasons[i].setdefault(NOT_IN_FILE, []).append(quantity)
    lines = [made[RESULTS[q].stored_heading] for q in _PERMEABILITIES]
    known = ~np.isnan(lines[0]) | ~np.isnan(lines[1])
    made["permeability basis"] = np.where(known, REPORTED, "")
    k = results[results["quantity"].isin(_PERMEABILITIES) & results["value"].notna()]
    made["permeability stress [MPa]"] = _numbers(len(plugs), _chosen(k, stress_mpa), "stress_mpa")
    made["flags"] = [_joined(d, r) for d, r in zip(doubts, reasons, strict=True)]
    return pd.DataFrame(made)


def _chosen(candidates: pd.DataFrame, stress_mpa: float | None) -> pd.DataFrame:
    """One row a plug: at the stress asked for, else at the lowest, one that is not stated before others."""
    found = candidates.assign(
        missing=candidates["value"].isna(),
        away=candidates["stress_mpa"].fillna(-1.0),
        by_direction=candidates["direction"].map(_DIRECTIONS).fillna(9),
        by_basis=candidates["basis"].map(_BASES).fillna(0),
    )
    if stress_mpa is not None:
        elsewhere = found["stressed"] & ~found["missing"] & ~near(found["stress_mpa"], stress_mpa)
        found["value"] = found["value"].where(~elsewhere)
        found["reason"] = found["reason"].where(~elsewhere, f"not measured at {stress_mpa:g} MPa")
        found["missing"] |= elsewhere
    order = ["place", "missing", "away", "by_direction", "by_basis"]
    return found.sort_values(order, kind="stable").drop_duplicates("place")


def _texts(count: int, there: pd.DataFrame, column: str) -> list[str]:
    made = [""] * count
    for i, text in zip(there["place"], there[column], strict=True):
        made[i] = text
    return made


def _numbers(count: int, there: pd.DataFrame, column: str) -> np.ndarray[Any, np.dtype[np.float64]]:
    made = np.full(count, np.nan)
    made[there["place"].to_numpy(dtype=np.intp)] = there[column].to_numpy(dtype=np.float64)
    return made


def _joined(doubts: list[str], reasons: dict[str, list[str]]) -> str:
    parts = list(dict.fromkeys(doubts))
    for reason, quantities in reasons.items():
        names = quantities
        if _SATURATIONS <= set(names):
            names = [n for n in names if n not in _SATURATIONS] + ["saturations"]
        parts.append(f"{', '.join(names)}: {reason}")
    return "; ".join(parts)


# -- one plug ---------------------------------------------------------------------------------------------


def found_plugs(connection: sa.Connection, well_id: int, plug: str) -> pd.DataFrame:
    """The plugs of other laboratories under a name, and those of the sample of that name."""
    plugs = store.other_plugs(connection, well_id)
    key = store.name_key(plug)
    named = plugs[plugs["name_key"] == key]
    return named if len(named) else plugs[plugs["sample"].map(store.name_key) == key]


def shown(connection: sa.Connection, well_id: int, plug: str) -> pd.DataFrame:
    """What other laboratories report of the plugs of a name: one row a result, with what the file says."""
    plugs = found_plugs(connection, well_id, plug).set_index("id")
    results = store.other_results(connection, well_id)
    lines = []
    for number, fact in plugs.iterrows():
        of_plug = results[results["other_plug_id"] == number]
        told = {
            "plug": fact["name"],
            "laboratory": fact["laboratory"],
            "file": f"{fact['file']}, row {fact['row']}",
            "description": fact["description"],
            "as entered": ", ".join(f"{h} {v}" for h, v in json.loads(fact["entered"]).items()),
        }
        for i, row in enumerate(store.rows_of(of_plug) or [dict.fromkeys(results.columns, "")]):
            lines.append(
                {
                    **{k: told[k] for k in ("plug", "laboratory")},
                    "quantity": row["quantity"],
                    "unit": RESULTS[row["quantity"]].unit if row["quantity"] else "",
                    "value": row["value"] if row["quantity"] else np.nan,
                    "limit": row["value_limit"] or "",
                    "basis": row["basis"],
                    "flags": row["flags"],
                    "reason": row["reason"],
                    **{k: told[k] if i == 0 else "" for k in ("file", "description", "as entered")},
                }
            )
    columns = [
        "plug", "laboratory", "quantity", "unit", "value", "limit", "basis", "flags", "reason", "file",
        "description", "as entered",
    ]  # fmt: skip
    return pd.DataFrame(lines, columns=columns)


def explained(connection: sa.Connection, well_id: int, well: str, plug: str, quantity: str) -> dict[str, Any]:
    """Whence a result of another laboratory comes, in the form in which the lab's own are explained.

    Raises
    ------
    NotFound
        If the plug has no such result.
    """
    plugs = found_plugs(connection, well_id, plug)
    results = store.other_results(connection, well_id)
    results = results[results["other_plug_id"].isin(plugs["id"])]
    mine = results[results["quantity"] == quantity]
    fact = plugs.iloc[0]
    if not len(mine):
        known = sorted(set(results["quantity"]))
        raise NotFound(
            f"Plug {quoted(fact['name'])} of {fact['laboratory']} has no {quantity}; "
            f"{did_you_mean(quantity, known)}"
        )
    row = mine.assign(missing=mine["value"].isna()).sort_values("missing", kind="stable").iloc[0]
    fact = plugs[plugs["id"] == row["other_plug_id"]].iloc[0]
    entered = json.loads(fact["entered"])
    return {
        "well": well,
        "plug": fact["name"],
        "result": quantity,
        "symbol": RESULTS[quantity].symbol,
        "unit": RESULTS[quantity].unit,
        "direction": row["direction"],
        "stress [MPa]": None if pd.isna(row["stress_mpa"]) else float(row["stress_mpa"]),
        "step": "",
        "value": None if pd.isna(row["value"]) else float(row["value"]),
        "uncertainty": None,
        "limit": row["value_limit"],
        "basis": "",
        "flags": [FLAG, *(f for f in f"{fact['flags']}; {row['flags']}".split("; ") if f)],
        "reason": row["reason"],
        "method": "",
        "version": None,
        "equation": "",
        "valid": "",
        "source": f"reported by {fact['laboratory']}; the readings behind it are not in this record",
        "calculations": [],
        "readings": [
            {
                "number": int(fact["id"]),
                "kind": f"of {fact['file']}, row {fact['row']}",
                "measured on": "",
                "measured by": fact["laboratory"],
                "as typed": entered | ({"description": fact["description"]} if fact["description"] else {}),
            }
        ],
        "instruments": [],
        "calibrations": [],
        "budget": [],
        "fingerprint": "",
    }
