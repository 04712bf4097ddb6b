"""What the control of instruments says of plugs: computed when asked, kept while the record stands still."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass
from datetime import date

import pandas as pd
import sqlalchemy as sa

from corelab.bench.occasions import occasions
from corelab.control import charts
from corelab.control.instruments import Calibration, calibrations
from corelab.records import history, store
from corelab.science.control_charts import pooled_of_pairs


@dataclass(frozen=True, slots=True)
class Control:
    """The judged checks of a lab, the calibrations of its instruments, and what is in doubt for both."""

    points: pd.DataFrame
    calibrations: list[Calibration]
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
        made = calibrations(connection)
        points = charts.judged(occasions(connection, stored, made))
        names = identities.names["instrument"]
        _KEPT[seal] = Control(points, made, names, charts.doubts(points, made, names))
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
    on: str,
) -> dict[str, pd.DataFrame]:
    """What `control` shows on a day, with names in the place of numbers; of one instrument, or of all.

    Without a day: today, or the day of the newest check if that is later.
    """
    found = control(connection, identities, stored)
    points, made = found.points, found.calibrations
    on = on or max([date.today().isoformat(), *points["day"]])
    if instrument is not None:
        points = points[points["instrument_id"] == instrument]
        made = [c for c in made if c.instrument_id == instrument]
    points = points[points["day"] <= on]
    frames = {
        "instruments": charts.states(points, made, found.names, on),
        "charts": charts.summaries(points),
        "checks": points,
        "precision": charts.pooled(points),
        "between instruments": charts.between(points),
    }
    for name, frame in frames.items():
        if "instrument_id" in frame:
            named = [found.names[int(n)] for n in frame["instrument_id"]]
            frame = frame.drop(columns="instrument_id")
            frame.insert(0, "instrument", named)
        if "standard_id" in frame:
            standards = [identities.name("standard", int(n)) for n in frame["standard_id"]]
            frame = frame.drop(columns="standard_id")
            frame.insert(1 if "instrument" in frame else 0, "standard", standards)
        frames[name] = frame.reset_index(drop=True)
    if instrument is None:
        frames["standards"] = _standards(connection, identities, on)
        frames["duplicates"] = _duplicates(connection)
    return frames


def _standards(connection: sa.Connection, identities: store.Identities, on: str) -> pd.DataFrame:
    """The standards and whether their certificates hold on a day."""
    rows = [
        {
            "standard": identities.name("standard", int(row["standard_id"])),
            "kind": row["kind"],
            "certificate": row["certificate"] or "",
            "valid until": row["valid_until"] or "",
            "state": charts.RAN_OUT if row["valid_until"] and on > row["valid_until"][:10] else "valid",
        }
        for row in store.rows_of(store.in_force(connection, "standards"))
    ]
    return pd.DataFrame(rows, columns=["standard", "kind", "certificate", "valid until", "state"])


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
