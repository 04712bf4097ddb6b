"""Files that left the laboratory: each is kept byte for byte, with what it showed."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.records import schema, store


@dataclass(frozen=True, slots=True)
class Issuing:
    """A file about to be issued.

    Parameters
    ----------
    number, issue
        Its own number, and how many files of this kind and well went to this recipient with it.
    words
        The same for the file itself to show, with what it replaces.
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
    if len(same):
        last = same.iloc[-1]
        words += f"; replaces export {int(last['id'])} of {str(last['at'])[:10]}"
    return Issuing(connection, identities, well_id, kind, recipient, person, number, issue, words)


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
