"""What waits for review, with what is odd about it first."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab.bench import compute
from corelab.control.instruments import BY_FIELD, Register
from corelab.interval import frozen, life, select
from corelab.records import store
from corelab.sheets import SHEETS

#: Modified z score beyond which a value stands apart: Iglewicz and Hoaglin (1993), How to Detect and Handle
#: Outliers (from memory).
STANDS_APART = 3.5
_TO_SIGMA = 1.4826
#: Fewer plugs than this tell nothing of how plugs differ.
_FEWEST = 8
_NEIGHBOURS = 4
#: Neighbours further away than this belong to other rock: assumed.
_NEAR_M = 2.0
#: Readings of which a repeat shows the same again; pressures and flow rates are set anew each time.
_COMPARABLE = {"mass", "length", "reported grain volume", "reported permeability"}
COLUMNS = (
    "plug", "depth [m]", "facies", "porosity [v/v]", "klinkenberg permeability [mD]",
    "grain density [g/cm3]", "status", "oddities", "odd", "blocked", "measured by",
)  # fmt: skip


@dataclass(slots=True)
class _Odd:
    """What is odd about a plug, and how much it asks for a look."""

    weight: int = 0
    words: list[str] = field(default_factory=list)

    def add(self, weight: int, words: str) -> None:
        self.weight += weight
        self.words.append(words)


def waiting(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    blocked: Mapping[int, str],
    unit: str = "",
) -> pd.DataFrame:
    """The plugs of a well whose results wait for review, the oddest first.

    Parameters
    ----------
    blocked
        By plug, what control says against its results.
    """
    number = select.well_id(identities, well)
    shown = select.interval(connection, identities, well, select.Filters(unit=unit, own_only=True))
    ids = [identities.ids["plug"][number, store.name_key(name)] for name in shown["plug"]]
    shown.insert(0, "plug_id", ids)
    results = store.results(connection, ids)
    there = set(results.loc[results["value"].notna(), "plug_id"])
    depth = next(c for c in shown.columns if c.startswith("depth ["))
    odd = {plug: _Odd() for plug in ids}
    now = current(shown, results)
    _flags(odd, results)
    _newer(odd, store.approved_results(connection, ids), results)
    _neighbours(odd, now)
    _trend(odd, now)
    entries = life.entries_of_plugs(connection, ids, in_force_only=True)
    _repeats(odd, connection, ids)
    _duplicates(odd, connection, identities, results, ids)
    for plug, words in blocked.items():
        if plug in odd:
            odd[plug].add(5, words)
    by = measured_by(entries)
    waits = shown[(shown["status"] != frozen.APPROVED) & shown["plug_id"].isin(there | set(blocked))].copy()
    waits["weight"] = [odd[p].weight for p in waits["plug_id"]]
    waits["oddities"] = [len(odd[p].words) for p in waits["plug_id"]]
    waits["odd"] = ["; ".join(odd[p].words) for p in waits["plug_id"]]
    waits["blocked"] = [blocked.get(p, "") for p in waits["plug_id"]]
    waits["measured by"] = [", ".join(sorted(by.get(p, {}).values())) for p in waits["plug_id"]]
    values = now.set_index("plug_id")
    for column in ("porosity [v/v]", "klinkenberg permeability [mD]", "grain density [g/cm3]"):
        waits[column] = values[column].reindex(waits["plug_id"]).to_numpy()
    waits = waits.sort_values("weight", ascending=False, kind="stable")
    return waits[[depth if c == "depth [m]" else c for c in COLUMNS]].reset_index(drop=True)


def current(shown: pd.DataFrame, results: pd.DataFrame) -> pd.DataFrame:
    """The plugs with their values as computed now, whatever was approved."""
    made = shown[["plug_id", "plug", "facies", "source"]].copy()
    made["depth"] = shown[next(c for c in shown.columns if c.startswith("depth ["))]
    made["metre"] = 1.0 if "depth [m]" in shown.columns else 0.3048
    for quantity, column in (
        ("porosity", "porosity [v/v]"),
        ("klinkenberg permeability", "klinkenberg permeability [mD]"),
        ("grain density", "grain density [g/cm3]"),
    ):
        rows = results[(results["quantity"] == quantity) & results["value"].notna()]
        rows = rows.sort_values(["plug_id", "stress_mpa"], kind="stable").drop_duplicates("plug_id")
        made[column] = rows.set_index("plug_id")["value"].reindex(made["plug_id"]).to_numpy(dtype=np.float64)
    return made


def measured_by(entries: pd.DataFrame) -> dict[int, dict[str, str]]:
    """By plug, who measured or entered any of its readings in force: key of the name, and the name."""
    found: dict[int, dict[str, str]] = {}
    for plug, kind, by, person in (
        zip(*(entries[c] for c in ("plug_id", "kind", "measured_by", "person")), strict=True)
        if len(entries)
        else ()
    ):
        if kind in SHEETS and SHEETS[kind].reading:
            for name in (by, person):
                if isinstance(name, str) and name:
                    found.setdefault(int(plug), {})[store.name_key(name)] = name
    return found


def _flags(odd: Mapping[int, _Odd], results: pd.DataFrame) -> None:
    flagged = results[results["flags"] != ""]
    seen: set[tuple[int, str]] = set()
    for plug, flags in zip(flagged["plug_id"], flagged["flags"], strict=True):
        for flag in flags.split("; "):
            if (plug, flag) not in seen:
                seen.add((plug, flag))
                odd[plug].add(2 if compute.asks_for_a_look(flag) else 1, flag)


def _newer(odd: Mapping[int, _Odd], approved: pd.DataFrame, results: pd.DataFrame) -> None:
    if not len(approved):
        return
    for row in frozen.differing(approved, results).to_dict("records"):
        now = "no value" if pd.isna(row["value"]) else f"{row['value']:.5g}"
        then = "no value" if pd.isna(row["approved"]) else f"{row['approved']:.5g}"
        words = f"{row['quantity']} approved as {then}, now {now}"
        if words not in odd[row["plug_id"]].words:
            odd[row["plug_id"]].add(3, words)


def modified_z(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """How far each value stands from the median, in robust standard deviations; NaN stays."""
    centre = np.nanmedian(values)
    spread = _TO_SIGMA * np.nanmedian(np.abs(values - centre))
    if not spread > 0:
        return np.where(np.isnan(values), np.nan, 0.0)
    return np.asarray((values - centre) / spread, dtype=np.float64)


def _neighbours(odd: Mapping[int, _Odd], plugs: pd.DataFrame) -> None:
    """A porosity that stands apart from the plugs next to it of the same facies."""
    for _, group in plugs.groupby("facies", sort=False):
        rows = group[group["porosity [v/v]"].notna() & group["depth"].notna()].sort_values("depth")
        if len(rows) < _FEWEST:
            continue
        value = rows["porosity [v/v]"].to_numpy(dtype=np.float64)
        depth_m = (rows["depth"] * rows["metre"]).to_numpy(dtype=np.float64)
        places = np.arange(len(value))
        offsets = [o for o in range(-_NEIGHBOURS // 2, _NEIGHBOURS // 2 + 1) if o]
        beside = np.full((len(offsets), len(value)), np.nan)
        for row, offset in enumerate(offsets):
            other = places + offset
            inside = (other >= 0) & (other < len(value))
            other = np.clip(other, 0, len(value) - 1)
            inside &= np.abs(depth_m[other] - depth_m) <= _NEAR_M
            beside[row, inside] = value[other[inside]]
        enough = np.isfinite(beside).sum(axis=0) >= 2
        local = np.full(len(value), np.nan)
        if enough.any():
            local[enough] = np.nanmedian(beside[:, enough], axis=0)
        if np.isfinite(local).sum() < _FEWEST:
            continue
        score = modified_z(value - local)
        for i in np.flatnonzero(np.abs(np.nan_to_num(score)) > STANDS_APART):
            odd[int(rows["plug_id"].iloc[i])].add(
                2, f"porosity {value[i]:.3f} stands apart from its neighbours' {local[i]:.3f}"
            )


def _trend(odd: Mapping[int, _Odd], plugs: pd.DataFrame) -> None:
    """A permeability that stands apart from what the porosity of its facies leads to expect."""
    from scipy.stats import theilslopes

    for facies, group in plugs.groupby("facies", sort=False):
        k = group["klinkenberg permeability [mD]"].to_numpy(dtype=np.float64)
        phi = group["porosity [v/v]"].to_numpy(dtype=np.float64)
        good = (k > 0) & np.isfinite(phi)
        if good.sum() < _FEWEST or np.ptp(phi[good]) == 0:
            continue
        log_k = np.log10(k[good])
        slope, intercept, *_ = theilslopes(log_k, phi[good])
        residual = log_k - intercept - slope * phi[good]
        score = modified_z(residual)
        numbers = group["plug_id"].to_numpy()[good]
        of = f" of {facies!s}" if facies else ""
        for i in np.flatnonzero(np.abs(score) > STANDS_APART):
            times = 10 ** abs(residual[i])
            side = "above" if residual[i] > 0 else "below"
            odd[int(numbers[i])].add(2, f"permeability {times:.1f} times {side} the trend{of}")


def _repeats(odd: Mapping[int, _Odd], connection: sa.Connection, ids: Sequence[int]) -> None:
    """Repeated readings that differ by more than the instrument's repeatability lets two or more differ.

    The critical range of ISO 5725-6:1994, 5 %: the studentised range of n values times the repeatability
    standard deviation (2.8 for two).
    """
    from scipy.stats import studentized_range

    register = Register.read(connection)
    for kind in dict.fromkeys(kind for kind, _ in BY_FIELD):
        sheet = SHEETS[kind]
        if not sheet.reading:
            continue
        rows = store.in_force(connection, kind, ids)
        if not len(rows) or rows["repeat"].nunique() < 2:
            continue
        keys = [f for c in sheet.key if c.name not in {"repeat", "well"} for f in c.fields if f in rows]
        keys = list(dict.fromkeys(["plug_id", *keys, "measured_on"]))
        for (named, fieldname), reading in BY_FIELD.items():
            if named != kind or fieldname not in rows or reading.measure not in _COMPARABLE:
                continue
            groups = rows[rows[fieldname].notna()].groupby(keys, dropna=False, sort=False)
            spans = groups[fieldname].agg(["min", "max", "mean", "count"])
            instruments = (
                groups[reading.instrument].first().fillna(0).astype(int).to_numpy()
                if reading.instrument and reading.instrument in rows
                else np.zeros(len(spans), dtype=int)
            )
            many = (spans["count"] > 1).to_numpy()
            if not many.any():
                continue
            means = spans["mean"].to_numpy(dtype=np.float64)
            random, _ = register.amounts(reading, means, instruments.astype(np.intp))
            span = (spans["max"] - spans["min"]).to_numpy(dtype=np.float64)
            counts = spans["count"].to_numpy()
            factor = np.ones(len(counts))
            for n in np.unique(counts[many]):
                factor[counts == n] = studentized_range.ppf(0.95, int(n), np.inf)
            for i in np.flatnonzero(many & (span > factor * random) & (random > 0)):
                plug = int(spans.index.get_level_values(0)[int(i)])
                odd[plug].add(
                    2,
                    f"{int(counts[i])} repeats of {kind}, {reading.title}, differ by {span[i]:.3g} "
                    f"{reading.unit}, more than the {factor[i] * random[i]:.2g} that repeatability allows",
                )


def _duplicates(
    odd: Mapping[int, _Odd],
    connection: sa.Connection,
    identities: store.Identities,
    results: pd.DataFrame,
    ids: Sequence[int],
) -> None:
    """A plug measured twice under two names whose results part by more than their joint uncertainty."""
    facts = store.in_force(connection, "plugs", ids)
    pairs = facts[facts["duplicate_of_id"].notna()] if "duplicate_of_id" in facts else facts[:0]
    if not len(pairs):
        return
    there = results[results["value"].notna() & results["quantity"].isin(["porosity", "grain density"])]
    there = there.sort_values("stress_mpa", kind="stable").drop_duplicates(["plug_id", "quantity"])
    by = {
        (int(r["plug_id"]), r["quantity"]): (r["value"], r["uncertainty"]) for r in there.to_dict("records")
    }
    for plug, first in zip(pairs["plug_id"].astype(int), pairs["duplicate_of_id"].astype(int), strict=True):
        for quantity in ("porosity", "grain density"):
            own, other = by.get((plug, quantity)), by.get((first, quantity))
            if own is None or other is None:
                continue
            joint = float(np.hypot(_or_zero(own[1]), _or_zero(other[1])))
            apart = abs(own[0] - other[0])
            if joint > 0 and apart > 2.0 * joint:
                name = identities.name("plug", first)
                odd[plug].add(2, f"{quantity} {own[0]:.4g} where its duplicate {name} has {other[0]:.4g}")


def _or_zero(value: Any) -> float:
    return 0.0 if value is None or value != value else float(value)
