"""What the control of instruments says of plugs: computed when asked, kept while the record stands still."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass

import pandas as pd
import sqlalchemy as sa

from corelab.bench.occasions import occasions
from corelab.control import charts
from corelab.records import history, store
from corelab.science.control_charts import pooled_of_pairs


@dataclass(frozen=True, slots=True)
class Control:
    """The judged checks of a lab, when calibrations run out, and what is in doubt for it."""

    points: pd.DataFrame
    due: dict[int, tuple[str, str]]
    names: Mapping[int, str]
    doubts: list[charts.Doubt]


#: The last of each lab by its seal: the state follows from the record alone.
_KEPT: dict[str, Control] = {}
_MOST_KEPT = 4


def control(connection: sa.Connection, identities: store.Identities, stored: Mapping[str, str]) -> Control:
    """The control of a lab as its record stands."""
    seal = history.last_seal(connection)
    if seal not in _KEPT:
        while len(_KEPT) >= _MOST_KEPT:
            _KEPT.pop(next(iter(_KEPT)))
        points = charts.judged(occasions(connection, stored))
        due: dict[int, tuple[str, str]] = {}
        for row in store.rows_of(store.in_force(connection, "instruments")):
            calibrated, runs_out = row["calibrated_on"] or "", row["due_on"] or ""
            known = due.get(int(row["instrument_id"]), ("", ""))
            earliest = min((d for d in (known[1], runs_out) if d), default="")
            due[int(row["instrument_id"])] = (max(known[0], calibrated), earliest)
        names = identities.names["instrument"]
        _KEPT[seal] = Control(points, due, names, charts.doubts(points, due, names))
    return _KEPT[seal]


def doubts_of(
    connection: sa.Connection,
    identities: store.Identities,
    stored: Mapping[str, str],
    plug_ids: Collection[int],
) -> dict[int, list[str]]:
    """By plug, what control says against readings of it that are in force."""
    found = control(connection, identities, stored).doubts
    if not found or not plug_ids:
        return {}
    readings = store.instruments_read(connection, plug_ids, {d.instrument_id for d in found})
    return charts.doubted(readings, found)


def shown(
    connection: sa.Connection,
    identities: store.Identities,
    stored: Mapping[str, str],
    instrument: int | None,
) -> dict[str, pd.DataFrame]:
    """What `control` shows, with names in the place of numbers; of one instrument, or of all."""
    from datetime import UTC, datetime

    found = control(connection, identities, stored)
    points, due = found.points, found.due
    if instrument is not None:
        points = points[points["instrument_id"] == instrument]
        due = {n: days for n, days in due.items() if n == instrument}
    today = datetime.now(UTC).date().isoformat()
    frames = {
        "instruments": charts.states(points, due, found.names, today),
        "charts": charts.summaries(points),
        "checks": points,
        "precision": charts.pooled(points),
    }
    for name, frame in frames.items():
        if "instrument_id" in frame:
            named = [found.names[int(n)] for n in frame["instrument_id"]]
            frame = frame.drop(columns="instrument_id")
            frame.insert(0, "instrument", named)
        if "standard_id" in frame:
            standards = [identities.name("standard", int(n)) for n in frame["standard_id"]]
            frame = frame.drop(columns="standard_id")
            frame.insert(1, "standard", standards)
        frames[name] = frame.reset_index(drop=True)
    if instrument is None:
        frames["duplicates"] = _duplicates(connection)
    return frames


def _duplicates(connection: sa.Connection) -> pd.DataFrame:
    """Repeatability of each result from plugs measured twice under two names."""
    facts = store.in_force(connection, "plugs")
    pairs = facts[facts["duplicate_of_id"].notna()]
    results = store.results(connection)
    results = results[results["value"].notna() & results["direction"].isin(["", "axial"])]
    rows = []
    for quantity in ("porosity", "grain density", "klinkenberg permeability"):
        values = results[results["quantity"] == quantity].sort_values("stress_mpa", kind="stable")
        value = values.drop_duplicates("plug_id").set_index("plug_id")["value"]
        first = value.reindex(pairs["duplicate_of_id"].astype(int)).to_numpy()
        second = value.reindex(pairs["plug_id"].astype(int)).to_numpy()
        share = 200 * (second - first) / (second + first)
        spread = pooled_of_pairs(share)
        if spread == spread:
            count = int((share == share).sum())
            rows.append({"result": quantity, "pairs": count, "repeatability [%]": spread})
    return pd.DataFrame(rows, columns=["result", "pairs", "repeatability [%]"])
