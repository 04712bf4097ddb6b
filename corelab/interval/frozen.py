"""Approved results stay as they were: what is shown of each plug, and whether something newer waits."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Collection

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab.bench.compute import SAME
from corelab.records import store

COMPUTED, APPROVED, WAITS = "computed", "approved", "newer waits"
KEY = ["plug_id", "quantity", "direction", "stress_mpa", "step"]
_NUMBERS = ("value", "uncertainty")
_TEXTS = ("value_limit", "basis", "method", "version", "flags")


def shown_results(
    connection: sa.Connection, now: pd.DataFrame, plug_ids: Collection[int]
) -> tuple[pd.DataFrame, pd.Series[str]]:
    """The results to show of these plugs, whose results now are `now`, and the status of each plug.

    A quantity that was approved is shown as it was approved and in no other way; a quantity that was not
    (it had no value then, or was never reviewed) is shown as computed now. A plug is `approved` where all
    its results are those approved, `newer waits` where any of them is not, `computed` where none was.
    """
    status = pd.Series(COMPUTED, index=sorted(plug_ids), dtype=object)
    frozen = store.approved_results(connection, plug_ids)
    if not len(frozen):
        return now, status
    status[frozen["plug_id"].unique()] = APPROVED
    parted = differing(frozen, now)
    status[parted["plug_id"].unique()] = WAITS
    held = pd.MultiIndex.from_frame(frozen[["plug_id", "quantity"]])
    free = now[~pd.MultiIndex.from_frame(now[["plug_id", "quantity"]]).isin(held)]
    both = pd.concat([frozen[now.columns], free], ignore_index=True)
    return both.sort_values(KEY, kind="stable").reset_index(drop=True), status


def differing(frozen: pd.DataFrame, now: pd.DataFrame) -> pd.DataFrame:
    """Where the approved results and those computed now part: the key, the two values.

    Columns `value` (computed now) and `approved`, each NaN where there is none.
    """
    current = now[now["value"].notna() & now["plug_id"].isin(frozen["plug_id"])]
    both = current.merge(frozen, on=KEY, how="outer", suffixes=("", "_then"), indicator=True)
    same = (both["_merge"] == "both").to_numpy(copy=True)
    for name in _NUMBERS:
        a, b = both[name].to_numpy(dtype=np.float64), both[f"{name}_then"].to_numpy(dtype=np.float64)
        same &= np.isclose(a, b, rtol=SAME, atol=0.0, equal_nan=True)
    for name in _TEXTS:
        now_says, then_said = (
            both[n].astype(object).where(both[n].notna(), "") for n in (name, f"{name}_then")
        )
        same &= (now_says == then_said).to_numpy()
    parted = both[~same].rename(columns={"value_then": "approved"})
    return parted[[*KEY, "value", "approved"]].reset_index(drop=True)


def released_words(
    connection: sa.Connection, results: pd.DataFrame, plug_ids: Collection[int]
) -> dict[int, str]:
    """By plug, the release that covers what is shown of it: who, and why."""
    approved = {
        int(row["plug_id"]): str(json.loads(row["grounds"]).get("released", ""))
        for row in store.rows_of(store.approvals(connection, plug_ids))
    }
    return covering_releases(connection, results, plug_ids) | {p: w for p, w in approved.items() if w}


def covering_releases(
    connection: sa.Connection, results: pd.DataFrame, plug_ids: Collection[int]
) -> dict[int, str]:
    """By plug, the release that covers its results as they are now."""
    found = store.releases(connection, plug_ids)
    if not len(found):
        return {}
    digests = results_digests(results[results["plug_id"].isin(found["plug_id"])])
    return {
        int(row["plug_id"]): f"released by {row['person']}: {row['reason']}"
        for row in store.rows_of(found)
        if digests.get(int(row["plug_id"])) == row["results_digest"]
    }


def results_digests(results: pd.DataFrame) -> dict[int, str]:
    """By plug, a digest of its results: a release covers these and no others."""
    columns = ["quantity", "direction", "stress_mpa", "step", "value", "fingerprint"]
    made: dict[int, str] = {}
    for plug, rows in results[results["value"].notna()].groupby("plug_id"):
        body = rows.sort_values(columns[:4])[columns].to_json(orient="values", double_precision=15)
        made[int(str(plug))] = hashlib.sha256(body.encode()).hexdigest()
    return made
