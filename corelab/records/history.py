"""History: digests of rows, the chain of events, and the triggers that guard what was written.

A row's digest is SHA-256 over its canonical packing; an event hashes the digests of its rows in a fixed
order and the digest of the event before it. The last event's digest is the lab's *seal*: whoever keeps it
can prove later that the record still holds what it held then.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from typing import Any

import sqlalchemy as sa

from corelab.records import schema

NO_DIGEST = "0" * 64


def packed(values: Iterable[object]) -> bytes:
    """The one way in which values are written before they are hashed: JSON without spaces, -0.0 as 0.0.

    Raises
    ------
    ValueError
        If a value is not a number (NaN) or infinite: neither has a place in the record.
    """
    plain = [0.0 if isinstance(v, float) and v == 0.0 else v for v in values]
    return json.dumps(plain, ensure_ascii=False, separators=(",", ":"), allow_nan=False).encode()


def row_digest(table: str, values: Mapping[str, object]) -> str:
    """Digest of one row: the table, and every column but the digest itself in the order of its name."""
    body: list[object] = [table]
    for name in sorted(values):
        if name != "digest":
            body += (name, values[name])
    return hashlib.sha256(packed(body)).hexdigest()


def entry_digest(entry: Mapping[str, object], kind: str, values: Mapping[str, object]) -> str:
    """Digest of an entry together with its typed values."""
    own = row_digest("entry", entry)
    return hashlib.sha256((own + row_digest(kind, values)).encode()).hexdigest()


def rows_digest(digests: Iterable[str]) -> str:
    total = hashlib.sha256()
    for digest in digests:
        total.update(digest.encode())
    return total.hexdigest()


def event_digest(values: Mapping[str, object]) -> str:
    return row_digest("event", values)


def seal(number: int, digest: str) -> str:
    """The seal as it is shown: the event's number and its digest."""
    return f"{number}-{digest}"


def now_utc() -> str:
    return datetime.now(UTC).isoformat(timespec="microseconds").replace("+00:00", "Z")


def add_event(
    connection: sa.Connection,
    *,
    number: int,
    person: str,
    command: str,
    program_version: str,
    reason: str,
    detail: Mapping[str, object],
    digests: Sequence[str],
) -> str:
    """Close a transaction's changes into the chain; returns the new seal."""
    previous = connection.execute(
        sa.select(schema.event.c.number, schema.event.c.digest).order_by(schema.event.c.number.desc())
    ).first()
    if (previous.number if previous else 0) + 1 != number:
        raise RuntimeError("an event was numbered out of turn")
    values: dict[str, Any] = {
        "number": number,
        "at": now_utc(),
        "person": person,
        "command": command,
        "program_version": program_version,
        "reason": reason,
        "detail": json.dumps(detail, ensure_ascii=False, sort_keys=True),
        "row_count": len(digests),
        "rows_digest": rows_digest(digests),
        "previous_digest": previous.digest if previous else NO_DIGEST,
    }
    values["digest"] = event_digest(values)
    connection.execute(sa.insert(schema.event), values)
    return seal(number, values["digest"])


def last_seal(connection: sa.Connection) -> str:
    row = connection.execute(
        sa.select(schema.event.c.number, schema.event.c.digest).order_by(schema.event.c.number.desc())
    ).first()
    return seal(row.number, row.digest) if row else ""


def _unique_keys(table: sa.Table) -> list[list[str]]:
    keys = [[c.name for c in table.primary_key.columns]]
    for constraint in table.constraints:
        if isinstance(constraint, sa.UniqueConstraint):
            keys.append([c.name for c in constraint.columns])
    return sorted(keys)


def _sqlite_guards(table: sa.Table) -> list[str]:
    name = table.name
    message = f"rows of {name} are never changed or removed: enter a correction"
    exists = " OR ".join(
        f"EXISTS (SELECT 1 FROM {name} WHERE " + " AND ".join(f"{c} = NEW.{c}" for c in key) + ")"
        for key in _unique_keys(table)
    )
    guards = [
        f"CREATE TRIGGER {name}_no_{action.lower()} BEFORE {action} ON {name} "
        f"BEGIN SELECT RAISE(ABORT, '{message}'); END"
        for action in ("UPDATE", "DELETE")
    ]
    guards.append(
        f"CREATE TRIGGER {name}_no_replace BEFORE INSERT ON {name} WHEN {exists} "
        f"BEGIN SELECT RAISE(ABORT, '{message}'); END"
    )
    return guards


def _postgresql_guards(table: sa.Table) -> list[str]:
    name = table.name
    return [
        f"CREATE TRIGGER {name}_no_change BEFORE UPDATE OR DELETE ON {name} "
        "FOR EACH ROW EXECUTE FUNCTION corelab_append_only()",
        f"CREATE TRIGGER {name}_no_truncate BEFORE TRUNCATE ON {name} "
        "FOR EACH STATEMENT EXECUTE FUNCTION corelab_append_only()",
    ]


_POSTGRESQL_FUNCTION = """
CREATE OR REPLACE FUNCTION corelab_append_only() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
  RAISE EXCEPTION USING
    MESSAGE = 'rows of ' || TG_TABLE_NAME || ' are never changed or removed: enter a correction';
END $$
"""


def guard(connection: sa.Connection) -> None:
    """Make the triggers anew (a table rebuilt by a migration loses its own in silence)."""
    postgresql = connection.dialect.name == "postgresql"
    if postgresql:
        connection.exec_driver_sql(_POSTGRESQL_FUNCTION)
    for table in schema.APPEND_ONLY:
        for statement in _postgresql_guards(table) if postgresql else _sqlite_guards(table):
            trigger = statement.split()[2]
            on_table = f" ON {table.name}" if postgresql else ""
            connection.exec_driver_sql(f"DROP TRIGGER IF EXISTS {trigger}{on_table}")
            connection.exec_driver_sql(statement)


def chain_faults(connection: sa.Connection) -> list[str]:
    """What does not fit in the chain of events and in the rows they closed; empty where all is whole."""
    faults: list[str] = []
    of_event = _digests_by_event(connection, faults)
    previous, expected = NO_DIGEST, 1
    for row in connection.execute(sa.select(schema.event).order_by(schema.event.c.number)).mappings():
        values = dict(row)
        number = values["number"]
        if number != expected:
            faults.append(f"event {expected} is missing before event {number}")
        if values["digest"] != event_digest({k: v for k, v in values.items() if k != "digest"}):
            faults.append(f"event {number} was altered")
        if values["previous_digest"] != previous:
            faults.append(f"event {number} does not follow the event before it")
        digests = of_event.pop(number, [])
        if values["row_count"] != len(digests) or values["rows_digest"] != rows_digest(digests):
            faults.append(f"the rows of event {number} are not those it closed ({len(digests)} rows)")
        previous, expected = values["digest"], number + 1
    faults += [f"{len(rows)} rows belong to event {n}, which is not there" for n, rows in of_event.items()]
    return faults


def _digests_by_event(connection: sa.Connection, faults: list[str]) -> dict[int, list[str]]:
    of_event: dict[int, list[str]] = {}
    typed: dict[int, tuple[str, dict[str, Any]]] = {}
    for kind, table in schema.SHEET_TABLES.items():
        for row in connection.execute(sa.select(table)).mappings():
            if row["id"] in typed:
                faults.append(f"entry {row['id']} has values of two kinds")
            typed[row["id"]] = (kind, dict(row))
    for table in schema.APPEND_ONLY[1:]:
        if "event" not in table.c:
            continue
        for row in connection.execute(sa.select(table).order_by(table.c.id)).mappings():
            values = dict(row)
            own = {k: v for k, v in values.items() if k != "digest"}
            try:
                if table is schema.entry:
                    kind, fields = typed.pop(values["id"], (values["kind"], {}))
                    if kind != values["kind"]:
                        faults.append(
                            f"entry {values['id']} is of kind {values['kind']}, its values of {kind}"
                        )
                    digest = entry_digest(own, values["kind"], fields)
                else:
                    digest = row_digest(table.name, own)
            except ValueError:  # an infinite number, or NaN, which the program never writes
                digest = ""
            if digest != values["digest"]:
                faults.append(f"row {values['id']} of {table.name} was altered")
            of_event.setdefault(values["event"], []).append(values["digest"])
    faults += [f"values of entry {number}, which is not there" for number in typed]
    return of_event
