"""Files that left the laboratory: each is kept byte for byte, with what it showed."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.records import schema, store
from corelab.review.entitled import Partner, entitlement


@dataclass(frozen=True, slots=True)
class Issuing:
    """A file about to be issued.

    Parameters
    ----------
    number, issue
        Its own number, and how many files of this kind and well went to this recipient with it.
    words
        The same for the file itself to show, with what it replaces.
    partner
        What the recipient is entitled to.
    """

    connection: sa.Connection
    identities: store.Identities
    well_id: int
    kind: str
    recipient: str
    person: str
    number: int
    issue: int
    words: str
    partner: Partner


def begin(
    connection: sa.Connection,
    identities: store.Identities,
    well_id: int,
    kind: str,
    recipient: str,
    person: str,
) -> Issuing:
    """The number and issue that a file will have."""
    before = store.exports(connection, well_id)
    key = store.name_key(recipient)
    same = before[(before["kind"] == kind) & (before["recipient"].map(store.name_key) == key)]
    number = store.next_id(connection, schema.export)
    issue = len(same) + 1
    words = f"export {number}, issue {issue}"
    confidential_until, told = _of_job(connection, well_id)
    well = identities.name("well", well_id)
    partner = entitlement(connection, recipient, well, confidential_until, told)
    if len(same):
        last = same.iloc[-1]
        words += f"; replaces export {int(last['id'])} of {str(last['at'])[:10]}"
    return Issuing(connection, identities, well_id, kind, recipient, person, number, issue, words, partner)


def _of_job(connection: sa.Connection, well_id: int) -> tuple[str, list[str]]:
    """The day until which a well is confidential, and the client and partners of its job."""
    facts = store.rows_of(store.in_force(connection, "wells", [well_id], by="well_id"))
    if not facts:
        return "", []
    told: list[str] = []
    if not pd.isna(facts[-1]["job_id"]):
        for job in store.rows_of(store.in_force(connection, "jobs", [int(facts[-1]["job_id"])], by="job_id")):
            told = [job["client"] or "", *(job["partners"] or "").split(",")]
    return facts[-1]["confidential_until"] or "", [t.strip() for t in told if t.strip()]


def revisions(at: Issuing, results: pd.DataFrame) -> tuple[pd.DataFrame, pd.DataFrame]:
    """The issues before this one to the same recipient, and what differs from the last of them.

    Returns
    -------
    issues, changes
        `changes` has one row a value that differs: plug, result, then, now.
    """
    before = listed(at.connection, at.identities, at.well_id)
    key = store.name_key(at.recipient)
    same = before[(before["kind"] == at.kind) & (before["for"].map(store.name_key) == key)]
    columns = ["plug", "result", "in the last issue", "now"]
    if not len(same):
        return same, pd.DataFrame(columns=columns)
    row = store.export_row(at.connection, int(same["export"].iloc[-1]))
    then = frame_of(row["shown"]) if row else pd.DataFrame(columns=results.columns)
    by = ["plug", "laboratory"]
    shared = [c for c in results.columns if c in then.columns and c not in {"well", *by}]
    both = then.merge(results, on=by, how="outer", suffixes=("", " now"), indicator=True)
    rows: list[dict[str, object]] = []
    for line in both.to_dict("records"):
        if line["_merge"] != "both":
            word = ("not there", "added") if line["_merge"] == "right_only" else ("there", "left out")
            rows.append(dict(zip(columns, (line["plug"], "the plug", *word), strict=True)))
            continue
        for column in shared:
            old, new = _plain(line[column]), _plain(line[f"{column} now"])
            alike = old == new or (old in (None, "") and new in (None, ""))
            if isinstance(old, (int, float)) and isinstance(new, (int, float)):
                alike = math.isclose(old, new, rel_tol=1e-12)
            if not alike:
                rows.append(dict(zip(columns, (line["plug"], column, old, new), strict=True)))
    return same, pd.DataFrame(rows, columns=columns)


def keep(
    change: store.Change,
    at: Issuing,
    file: str,
    content: bytes,
    shown: pd.DataFrame,
    request: Mapping[str, Any],
) -> None:
    """Add a file to the record."""
    change.rows(
        schema.export,
        [
            {
                "id": at.number,
                "well_id": at.well_id,
                "kind": at.kind,
                "recipient": at.recipient,
                "issue": at.issue,
                "file": file,
                "request": json.dumps(dict(request), ensure_ascii=False, sort_keys=True),
                "shown": as_text(shown),
                "content": content,
                "content_digest": hashlib.sha256(content).hexdigest(),
            }
        ],
    )


def as_text(frame: pd.DataFrame) -> str:
    """A frame as JSON with every digit: its columns, and its rows as lists."""
    columns = [[_plain(v) for v in frame[c].tolist()] for c in frame.columns]
    rows = [list(values) for values in zip(*columns, strict=True)]
    return json.dumps({"columns": list(frame.columns), "rows": rows}, ensure_ascii=False, allow_nan=False)


def frame_of(text: str) -> pd.DataFrame:
    """The frame that `as_text` wrote; None for what was not there."""
    kept = json.loads(text)
    return pd.DataFrame(kept["rows"], columns=kept["columns"])


def _plain(value: Any) -> Any:
    return None if isinstance(value, float) and value != value else value


def listed(
    connection: sa.Connection,
    identities: store.Identities,
    well_id: int | None,
    content: bytes | None = None,
) -> pd.DataFrame:
    """The files issued, oldest first; with `content`, those that were exactly this."""
    frame = store.exports(connection, well_id)
    if content is not None:
        frame = frame[frame["content_digest"] == hashlib.sha256(content).hexdigest()]
    return pd.DataFrame(
        {
            "export": frame["id"].astype(int),
            "at": frame["at"],
            "person": frame["person"],
            "well": [identities.name("well", int(w)) for w in frame["well_id"]],
            "kind": frame["kind"],
            "for": frame["recipient"],
            "issue": frame["issue"].astype(int),
            "file": frame["file"],
            "reason": frame["reason"],
            "sha256": frame["content_digest"],
        }
    ).reset_index(drop=True)
