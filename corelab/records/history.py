"""History: digests of rows, the chain of events, and the triggers that guard what was written.

A row's digest is SHA-256 over its canonical packing; an event hashes the digests of its rows in a fixed
order and the digest of the event before it. The last event's digest is the lab's *seal*: whoever keeps it
can prove later that the record still holds what it held then.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from datetime import UTC, datetime
from typing import Any

import sqlalchemy as sa

from corelab.records import schema

NO_DIGEST = "0" * 64


def packed(values: Iterable[object]) -> bytes:
    """The one way in which values are written before they are hashed: JSON without spaces, -0.0 as 0.0.

    Bytes (a file that left the laboratory) are written as their SHA-256.

    Raises
    ------
    ValueError
        If a value is not a number (NaN) or infinite: neither has a place in the record.
    """
    plain = [_plain(value) for value in values]
    return json.dumps(plain, ensure_ascii=False, separators=(",", ":"), allow_nan=False).encode()


def _plain(value: object) -> object:
    if isinstance(value, float) and value == 0.0:
        return 0.0
    return hashlib.sha256(value).hexdigest() if isinstance(value, bytes) else value


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


def guard_faults(connection: sa.Connection) -> list[str]:
    """Which triggers that guard the record are missing, changed or switched off, and which are strangers."""
    faults: list[str] = []
    if connection.dialect.name == "postgresql":
        rows = connection.exec_driver_sql(
            "SELECT t.tgname, c.relname, t.tgenabled FROM pg_trigger t JOIN pg_class c ON c.oid = t.tgrelid "
            "JOIN pg_namespace n ON n.oid = c.relnamespace "
            "WHERE NOT t.tgisinternal AND n.nspname = current_schema()"
        )
        there = {name: (table, "enabled" if state in ("O", "A") else "off") for name, table, state in rows}
        wanted = {
            statement.split()[2]: (table.name, "enabled")
            for table in schema.APPEND_ONLY
            for statement in _postgresql_guards(table)
        }
        body = connection.exec_driver_sql(
            "SELECT prosrc FROM pg_proc WHERE proname = 'corelab_append_only'"
        ).scalar()
        if (body or "").strip() not in _POSTGRESQL_FUNCTION:
            faults.append("the function that guards the tables was altered")
    else:
        rows = connection.exec_driver_sql("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'")
        there = {name: (sql, "") for name, sql in rows}
        wanted = {
            statement.split()[2]: (statement, "")
            for table in schema.APPEND_ONLY
            for statement in _sqlite_guards(table)
        }
    faults += [f"the guard {name} is missing" for name in sorted(wanted.keys() - there.keys())]
    faults += [f"the trigger {name} is not the program's" for name in sorted(there.keys() - wanted.keys())]
    faults += [
        f"the guard {name} was altered or switched off"
        for name in sorted(wanted.keys() & there.keys())
        if wanted[name] != there[name]
    ]
    return faults


@dataclass(slots=True)
class _Rows:
    """The rows of one event, in the order in which it closed them: what each is, and its digest."""

    names: list[str] = field(default_factory=list)
    digests: list[str] = field(default_factory=list)


#: More rows than this of one event are not tried one by one for the one that was added.
_TRIED = 3000


def chain_faults(connection: sa.Connection) -> list[str]:
    """What does not fit in the chain of events and in the rows they closed; empty where all is whole.

    Each row altered, removed, added or exchanged is named.
    """
    faults: list[str] = []
    of_event = _rows_by_event(connection, faults)
    previous, expected = NO_DIGEST, 1
    for row in connection.execute(sa.select(schema.event).order_by(schema.event.c.number)).mappings():
        values = dict(row)
        number = values["number"]
        if number != expected:
            gone = (
                f"event {expected} is" if number == expected + 1 else f"events {expected} to {number - 1} are"
            )
            faults.append(f"{gone} missing before event {number}")
        if values["digest"] != _safe_digest("event", {k: v for k, v in values.items() if k != "digest"}):
            faults.append(f"event {number} was altered")
        if values["previous_digest"] != previous:
            faults.append(f"event {number} does not follow the event before it")
        rows = of_event.pop(number, _Rows())
        if values["row_count"] != len(rows.digests) or values["rows_digest"] != rows_digest(rows.digests):
            faults.append(_not_closed(number, values["row_count"], values["rows_digest"], rows))
        previous, expected = values["digest"], number + 1
    for number, rows in of_event.items():
        named = ", ".join(rows.names[:5]) + (" …" if len(rows.names) > 5 else "")
        faults.append(f"{len(rows.names)} rows belong to event {number}, which is not there: {named}")
    return faults


def _not_closed(number: int, count: int, closed: str, rows: _Rows) -> str:
    there = len(rows.digests)
    said = f"event {number} closed {count} rows, and {there} are there that are not all those"
    if there == count + 1 and there <= _TRIED:
        for place, name in enumerate(rows.names):
            if rows_digest(rows.digests[:place] + rows.digests[place + 1 :]) == closed:
                return f"{name} was added to event {number}, which closed {count} rows without it"
    return said


def _safe_digest(table: str, values: Mapping[str, object]) -> str:
    try:
        return row_digest(table, values)
    except ValueError:  # an infinite number, or NaN, which the program never writes
        return ""


def _rows_by_event(connection: sa.Connection, faults: list[str]) -> dict[int, _Rows]:
    of_event: dict[int, _Rows] = {}
    typed: dict[int, tuple[str, dict[str, Any]]] = {}
    for kind, table in schema.SHEET_TABLES.items():
        for row in connection.execute(sa.select(table)).mappings():
            if row["id"] in typed:
                faults.append(f"entry {row['id']} has values of two kinds, {typed[row['id']][0]} and {kind}")
            typed[row["id"]] = (kind, dict(row))
    for table in schema.APPEND_ONLY[1:]:
        if "event" not in table.c:
            continue
        expected = 1
        for row in connection.execute(sa.select(table).order_by(table.c.id)).mappings():
            values = dict(row)
            name = _row_name(table, values)
            if values["id"] != expected:
                faults.append(_gap(table, expected, values["id"]))
            expected = values["id"] + 1
            own = {k: v for k, v in values.items() if k != "digest"}
            if table is schema.entry:
                kind, fields = typed.pop(values["id"], ("", {}))
                if not kind and values["kind"] in schema.SHEET_TABLES:
                    faults.append(f"the values of {name} are missing")
                elif kind and kind != values["kind"]:
                    faults.append(f"{name} has values of {kind}")
                digest = ""
                with suppress(ValueError):
                    digest = entry_digest(own, values["kind"], fields)
            else:
                digest = _safe_digest(table.name, own)
            if digest != values["digest"]:
                faults.append(f"{name} was altered")
            rows = of_event.setdefault(values["event"], _Rows())
            rows.names.append(name)
            rows.digests.append(values["digest"])
    faults += [
        f"values of {kind} stand under entry {n}, which is not there" for n, (kind, _) in typed.items()
    ]
    return of_event


def _row_name(table: sa.Table, values: Mapping[str, Any]) -> str:
    if table is schema.entry:
        where = f", row {values['row']} of {values['file']}" if values["file"] else ""
        return f"entry {values['id']} ({values['kind']}{where})"
    named = f" ('{values['name']}')" if values.get("name") else ""
    return f"row {values['id']} of {table.name}{named}"


def _gap(table: sa.Table, expected: int, found: int) -> str:
    what = "entry" if table is schema.entry else f"row of {table.name}"
    if found < expected:
        return f"{what} {found} is there twice"
    return f"{what} {expected}" + (" is missing" if found == expected + 1 else f" to {found - 1} are missing")
