"""Core runs and sidewall shots: what was cut, what came out, what is missing and why."""

from __future__ import annotations

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab import units
from corelab.interval.select import natural_key
from corelab.records import store

#: Recovery beyond this is more than a rounding of lengths.
_WHOLE = 1.0005
OUTCOMES = ("recovered", "partial", "misfired", "lost", "empty", "not attempted")


def core_runs(connection: sa.Connection, identities: store.Identities, well: int, unit: str) -> pd.DataFrame:
    """One row a run from the top down, and a row of totals: lengths and depths in `unit`."""
    ids = [n for n, owner in identities.owners["run"].items() if owner == well]
    runs = store.in_force(connection, "core runs", ids, by="run_id").sort_values("top_depth_m", kind="stable")
    metre, target = units.unit("m", "length"), units.unit(unit, "length")

    def shown(metres: object) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
        lengths = np.asarray(units.convert(np.asarray(metres, dtype=np.float64), metre, target))
        return lengths.round(9)  # a depth typed in feet comes back as typed

    cut = (runs["base_depth_m"] - runs["top_depth_m"]).to_numpy()
    recovered = runs["recovered_length_m"].to_numpy()
    share = recovered / cut if len(cut) else np.zeros(0)
    notes = [
        "more recovered than cut: a stub of the run before, or swelling" if s > _WHOLE else "" for s in share
    ]
    frame = pd.DataFrame(
        {
            "run": [identities.name("run", int(i)) for i in runs["run_id"]],
            f"top depth [{unit}]": shown(runs["top_depth_m"]),
            f"base depth [{unit}]": shown(runs["base_depth_m"]),
            f"cut [{unit}]": shown(cut),
            f"recovered [{unit}]": shown(recovered),
            f"lost [{unit}]": shown(np.maximum(cut - recovered, 0.0)),
            "recovery [%]": 100.0 * share,
            "loss at": [at if s < 1.0 else "" for at, s in zip(runs["loss_at"], share, strict=True)],
            "core diameter [mm]": runs["core_diameter_mm"].to_numpy(dtype=np.float64),
            "notes": notes,
        }
    )
    if not len(frame):
        return frame
    total = cut.sum()
    frame.loc[len(frame)] = {
        "run": "all",
        f"top depth [{unit}]": float(shown(runs["top_depth_m"].min())),
        f"base depth [{unit}]": float(shown(runs["base_depth_m"].max())),
        f"cut [{unit}]": float(shown(total)),
        f"recovered [{unit}]": float(shown(recovered.sum())),
        f"lost [{unit}]": float(shown(np.maximum(cut - recovered, 0.0).sum())),
        "recovery [%]": 100.0 * float(recovered.sum() / total),
        "loss at": "",
        "core diameter [mm]": np.nan,
        "notes": "",
    }
    return frame


def shots(connection: sa.Connection, identities: store.Identities, well: int) -> pd.DataFrame:
    """One row a descent of a sidewall tool: shots by outcome, and the share that brought a sample."""
    ids = [n for n, owner in identities.owners["gun_run"].items() if owner == well]
    rows = store.in_force(connection, "sidewall shots", ids, by="gun_run_id")
    made: list[dict[str, object]] = []
    for (_, tool), group in rows.groupby(["gun_run_id", "tool"], sort=True):
        count = group["outcome"].value_counts()
        outcomes = {outcome: int(count.get(outcome, 0)) for outcome in OUTCOMES}
        attempted = len(group) - outcomes["not attempted"]
        came = outcomes["recovered"] + outcomes["partial"]
        made.append(
            {
                "gun run": identities.name("gun run", int(group["gun_run_id"].iloc[0])),
                "tool": tool,
                "shots": len(group),
                **outcomes,
                "recovery [%]": 100.0 * came / attempted if attempted else np.nan,
                "mean recovered length [mm]": group["recovered_length_mm"].mean(),
            }
        )
    made.sort(key=lambda row: natural_key(str(row["gun run"])))
    columns = ["gun run", "tool", "shots", *OUTCOMES, "recovery [%]", "mean recovered length [mm]"]
    return pd.DataFrame(made, columns=columns)
