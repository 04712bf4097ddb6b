"""The board: where every plug is, and what it waits for."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd
import sqlalchemy as sa

from corelab.interval.select import natural_key, plugs_of_well
from corelab.records import store

#: What a routine analysis wants of a plug, and the sheets that give it.
_WANTED: tuple[tuple[str, tuple[str, ...], tuple[str, ...]], ...] = (
    ("description", ("descriptions",), ()),
    ("dry mass", ("masses",), ("masses",)),
    ("bulk volume", ("dimensions", "immersion"), ("bulk volume", "dimensions", "immersion", "porosity")),
    (
        "grain or pore volume",
        ("grain volume", "pore volume", "retort"),
        ("grain volume", "pore volume", "porosity"),
    ),
    (
        "permeability",
        ("gas permeability", "reported permeability", "liquid permeability"),
        ("permeability", "gas permeability", "klinkenberg permeability"),
    ),
)
COLUMNS = ("well", "plug", "priority", "location", "last step", "waits for", "not measured")


def board(connection: sa.Connection, identities: store.Identities, wells: Sequence[int]) -> pd.DataFrame:
    """One row a plug, urgent ones first: its place, its last treatment, what is still to be measured."""
    ids = [plug for well in wells for plug in plugs_of_well(identities, well)]
    plugs = store.in_force(connection, "plugs", ids)
    kinds = {kind for _, kinds, _ in _WANTED for kind in kinds}
    have = {kind: set(store.in_force(connection, kind, ids)["plug_id"]) for kind in kinds}
    masses = store.in_force(connection, "masses", ids)
    have["masses"] = set(masses.loc[masses["condition"] == "dry", "plug_id"])
    skipped: dict[int, dict[str, str]] = {}
    stated = store.in_force(connection, "not measured", ids)
    for plug, test, reason in zip(stated["plug_id"], stated["test"], stated["reason"], strict=True):
        skipped.setdefault(int(plug), {})[test] = reason
    steps = _last_steps(store.in_force(connection, "treatments", ids))
    rows = []
    for plug in plugs.to_dict("records"):
        number = int(plug["plug_id"])
        stops = skipped.get(number, {})
        waits = [
            what
            for what, sources, tests in _WANTED
            if not any(number in have[s] for s in sources) and not any(t in stops for t in tests)
        ]
        rows.append(
            {
                "well": identities.name("well", identities.owner("plug", number)),
                "plug": identities.name("plug", number),
                "priority": plug["priority"],
                "location": plug["location"] or "",
                "last step": steps.get(number, ""),
                "waits for": ", ".join(waits),
                "not measured": ", ".join(f"{test} ({reason})" for test, reason in stops.items()),
            }
        )
    rows.sort(
        key=lambda r: (
            r["priority"] != "rush",
            not r["waits for"],
            natural_key(r["well"]),
            natural_key(r["plug"]),
        )
    )
    return pd.DataFrame(rows, columns=list(COLUMNS))


def _last_steps(treatments: pd.DataFrame) -> dict[int, str]:
    """The last treatment of each plug in words: what, how, and whether it has ended."""
    last: dict[int, tuple[str, str]] = {}
    for row in treatments.to_dict("records"):
        when = row["ended_on"] or row["started_on"] or ""
        going = "" if row["ended_on"] else " since"
        words = f"{row['step']}{going} {when}".strip()
        if (when, words) >= last.get(int(row["plug_id"]), ("", "")):
            last[int(row["plug_id"])] = (when, words)
    return {plug: words for plug, (_, words) in last.items()}
