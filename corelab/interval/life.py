"""What happened to a plug, or in a well, told in plain words from the events."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.interval.select import plugs_of_well
from corelab.records import store
from corelab.records.schema import SHEET_TABLES, WITHDRAWAL

_DECIDED = {"approved": "approved the results", "revoked": "took the approval back"}
COLUMNS = ("event", "at", "person", "what", "why", "command")


def entries_of_plugs(
    connection: sa.Connection, plug_ids: list[int], *, in_force_only: bool = False
) -> pd.DataFrame:
    """Every entry about these plugs, with its event."""
    return store.entries_of(connection, plug_ids, SHEET_TABLES, in_force_only)


def of_plug(connection: sa.Connection, plug: int) -> pd.DataFrame:
    """The life of one plug: each entry, correction and withdrawal on a line of its own."""
    entries = entries_of_plugs(connection, [plug])
    lines: list[dict[str, Any]] = []
    for entry in entries.to_dict("records"):
        what = f"entered {entry['kind']} #{entry['number']}"
        if not pd.isna(entry["supersedes"]):
            what = f"corrected {entry['kind']} #{int(entry['supersedes'])} by #{entry['number']}"
        what += f": {entered_words(entry['entered'])}{_place(entry)}"
        lines.append(_line(entry, what))
    numbers = [int(n) for n in entries["number"]] if len(entries) else []
    for withdrawal in store.withdrawals_of(connection, numbers).to_dict("records"):
        what = f"withdrew {withdrawal['withdrawn_kind']} #{int(withdrawal['supersedes'])}"
        lines.append(_line(withdrawal, what))
    for decision in store.decisions_on(connection, [plug]).to_dict("records"):
        lines.append(_line(decision, _DECIDED.get(decision["what"], decision["what"])))
    lines.sort(key=lambda line: line["event"])
    return pd.DataFrame(lines, columns=list(COLUMNS))


def of_well(connection: sa.Connection, identities: store.Identities, well: int) -> pd.DataFrame:
    """The life of a well: what each event brought to it and its plugs."""
    counts = store.entries_by_event(connection, well, plugs_of_well(identities, well))
    lines = []
    for _, group in counts.groupby("event", sort=True):
        first = group.iloc[0]
        withdrawn = group["kind"] == WITHDRAWAL
        parts = [f"{row['count']} of {row['kind']}" for _, row in group[~withdrawn].iterrows()]
        corrected = int(group.loc[~withdrawn, "corrections"].sum())
        what = f"entered {', '.join(parts)}" if parts else ""
        what += f" ({corrected} of them corrections)" if corrected else ""
        if withdrawn.any():
            gone = int(group.loc[withdrawn, "count"].sum())
            what += f"{'; ' if what else ''}withdrew {gone} reading{'' if gone == 1 else 's'}"
        lines.append(_line(first.to_dict(), what))
    decisions = store.decisions_on(connection, plugs_of_well(identities, well))
    for _, group in decisions.groupby(["event", "what"], sort=True):
        what = str(group["what"].iloc[0])
        names = [identities.name("plug", int(p)) for p in group["plug_id"]]
        shown = ", ".join(names[:8]) + (f" and {len(names) - 8} more" if len(names) > 8 else "")
        verb = {"approved": "approved the results of", "revoked": "took back the approval of"}
        words = f"{verb[what]} {shown}" if what in verb else f"{what}: {shown}"
        lines.append(_line(group.iloc[0].to_dict(), words))
    for export in store.rows_of(store.exports(connection, well)):
        words = f"issued {export['file']} (export {export['id']}, issue {export['issue']})"
        words += f" to {export['recipient']}" if export["recipient"] else ""
        lines.append(_line(export | {"command": f"write {export['kind']}"}, words))
    for file in store.rows_of(store.other_files(connection, well)):
        words = f"read {file['file']} of another laboratory (file {file['id']})"
        if file["state"] == "withdrawn":
            words = f"withdrew file {int(file['supersedes'])} of another laboratory, {file['file']}"
        elif file["supersedes"] == file["supersedes"]:
            words += f" in the place of file {int(file['supersedes'])}"
        lines.append(_line(file, words))
    lines.sort(key=lambda line: line["event"])
    return pd.DataFrame(lines, columns=list(COLUMNS))


def _line(entry: Mapping[Any, Any], what: str) -> dict[str, Any]:
    return {
        "event": int(entry["event"]),
        "at": entry["at"],
        "person": entry["person"],
        "what": what,
        "why": entry["reason"],
        "command": entry["command"],
    }


def entered_words(text: str) -> str:
    return ", ".join(
        f"{heading} {value}" for heading, value in json.loads(text).items() if heading not in {"well", "plug"}
    )


def _place(entry: Mapping[Any, Any]) -> str:
    if not entry["file"]:
        return ""
    sheet = f", sheet '{entry['sheet']}'" if entry["sheet"] else ""
    row = f", row {int(entry['row'])}" if not pd.isna(entry["row"]) else ""
    return f" (from {entry['file']}{sheet}{row})"
