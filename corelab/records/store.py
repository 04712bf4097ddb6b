"""Reading and writing the record: identities, entries in force, results, settings, persons."""

from __future__ import annotations

import json
import unicodedata
from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.records import history, schema

#: More plugs than this are read as whole tables rather than by their numbers.
_WHOLE_TABLE_FROM = 400


def name_key(name: str) -> str:
    """What two names share that are the same name: no case, no surrounding spaces."""
    return unicodedata.normalize("NFC", name).strip().casefold()


@dataclass(frozen=True, slots=True)
class NewEntry:
    """A row to be written: its typed values by field, and what stood in the sheet."""

    kind: str
    values: dict[str, Any]
    entered: Mapping[str, object]
    file: str = ""
    sheet: str = ""
    row: int | None = None
    supersedes: int | None = None


@dataclass(slots=True)
class Identities:
    """The identities of the lab, by table, owner and name; new ones are added as they are named.

    Standards are plugs of the well `standards`.
    """

    ids: dict[str, dict[tuple[int, str], int]]
    names: dict[str, dict[int, str]]
    owners: dict[str, dict[int, int]]
    added: list[tuple[str, dict[str, Any]]] = field(default_factory=list)

    @classmethod
    def read(cls, connection: sa.Connection) -> Identities:
        ids: dict[str, dict[tuple[int, str], int]] = {}
        names: dict[str, dict[int, str]] = {}
        owners: dict[str, dict[int, int]] = {}
        for table in set(schema.IDENTITY.values()):
            owner = table.c.get("well_id")
            query = sa.select(
                table.c.id, table.c.name, table.c.name_key, owner if owner is not None else sa.literal(0)
            )
            ids[table.name], names[table.name], owners[table.name] = {}, {}, {}
            for number, name, key, well in connection.execute(query):
                ids[table.name][(well, key)] = number
                names[table.name][number] = name
                owners[table.name][number] = well
        return cls(ids, names, owners)

    def find(self, kind: str, name: str, well_id: int = 0) -> int | None:
        return self.ids[schema.IDENTITY[kind].name].get((well_id, name_key(name)))

    def name(self, kind: str, number: int) -> str:
        return self.names[schema.IDENTITY[kind].name][number]

    def owner(self, kind: str, number: int) -> int:
        return self.owners[schema.IDENTITY[kind].name][number]

    def known(self, kind: str, well_id: int = 0) -> list[str]:
        table = schema.IDENTITY[kind].name
        return [self.names[table][n] for (owner, _), n in self.ids[table].items() if owner == well_id]

    def add(self, kind: str, name: str, well_id: int = 0) -> int:
        """The number of a name, made where it is new."""
        found = self.find(kind, name, well_id)
        if found is not None:
            return found
        table = schema.IDENTITY[kind].name
        number = max(self.names[table], default=0) + 1
        shown = unicodedata.normalize("NFC", name).strip()
        row: dict[str, Any] = {"id": number, "name": shown, "name_key": name_key(name)}
        if "well_id" in schema.IDENTITY[kind].c:
            row["well_id"] = well_id
        self.added.append((table, row))
        self.ids[table][(well_id, row["name_key"])] = number
        self.names[table][number] = shown
        self.owners[table][number] = well_id
        return number


@dataclass(slots=True)
class Change:
    """What one transaction adds to the record; written in one go and closed by an event."""

    connection: sa.Connection
    number: int
    digests: dict[str, list[str]] = field(default_factory=dict)

    @classmethod
    def begin(cls, connection: sa.Connection) -> Change:
        last = connection.execute(sa.select(sa.func.max(schema.event.c.number))).scalar()
        return cls(connection, (last or 0) + 1)

    def rows(self, table: sa.Table, rows: Sequence[dict[str, Any]]) -> None:
        """Add rows of an append-only table other than entries; `event` and `digest` are filled in."""
        if not rows:
            return
        for row in rows:
            row["event"] = self.number
            row["digest"] = history.row_digest(table.name, row)
        insert(self.connection, table, rows)
        self.digests.setdefault(table.name, []).extend(row["digest"] for row in rows)

    def identities(self, identities: Identities) -> None:
        for table in (t for t in schema.APPEND_ONLY if t in set(schema.IDENTITY.values())):
            self.rows(table, [row for name, row in identities.added if name == table.name])
        identities.added.clear()

    def entries(self, new: Sequence[NewEntry]) -> list[int]:
        """Add entries with their typed values; returns their numbers."""
        last = self.connection.execute(sa.select(sa.func.max(schema.entry.c.id))).scalar() or 0
        entries: list[dict[str, Any]] = []
        typed: dict[str, list[dict[str, Any]]] = {}
        for number, item in enumerate(new, start=last + 1):
            entry: dict[str, Any] = {
                "id": number,
                "event": self.number,
                "kind": item.kind,
                "supersedes": item.supersedes,
                "file": item.file,
                "sheet": item.sheet,
                "row": item.row,
                "entered": json.dumps(item.entered, ensure_ascii=False),
            }
            if item.kind in schema.SHEET_TABLES:
                table = schema.SHEET_TABLES[item.kind]
                values = {
                    "id": number,
                    **{c.name: item.values.get(c.name) for c in table.c if c.name != "id"},
                }
                typed.setdefault(item.kind, []).append(values)
            else:
                values = {}
            entry["digest"] = history.entry_digest(entry, item.kind, values)
            entries.append(entry)
        insert(self.connection, schema.entry, entries)
        for kind, rows in typed.items():
            insert(self.connection, schema.SHEET_TABLES[kind], rows)
        self.digests.setdefault("entry", []).extend(entry["digest"] for entry in entries)
        return [entry["id"] for entry in entries]

    def close(
        self,
        *,
        person: str,
        command: str,
        program_version: str,
        reason: str = "",
        detail: Mapping[str, object],
    ) -> str:
        """Write the event; returns the new seal."""
        ordered = [d for table in schema.APPEND_ONLY for d in self.digests.get(table.name, [])]
        return history.add_event(
            self.connection,
            number=self.number,
            person=person,
            command=command,
            program_version=program_version,
            reason=reason,
            detail=detail,
            digests=ordered,
        )


def insert(connection: sa.Connection, table: sa.Table, rows: Sequence[Mapping[Any, Any]]) -> None:
    """Bulk insert by the driver's own executemany: several times faster than the expression language."""
    if not rows:
        return
    names = [c.name for c in table.c]
    columns = ", ".join(connection.dialect.identifier_preparer.quote(n) for n in names)
    if connection.dialect.name == "postgresql":
        statement, dbapi = f"COPY {table.name} ({columns}) FROM STDIN", connection.dialect.loaded_dbapi
        try:
            with connection.connection.cursor().copy(statement) as copy:
                for row in rows:
                    copy.write_row([row[n] for n in names])
        except dbapi.Error as trouble:  # COPY goes past the library, which would have named it
            raise sa.exc.DBAPIError.instance(statement, None, trouble, dbapi.Error, True) from trouble
        return
    marks = ", ".join("?" * len(names))
    connection.exec_driver_sql(
        f"INSERT INTO {table.name} ({columns}) VALUES ({marks})",
        [tuple(row[n] for n in names) for row in rows],
    )


@contextmanager
def as_of(connection: sa.Connection, event: int) -> Iterator[None]:
    """Within this, what is in force and which settings hold is answered as it was after an event."""
    connection.execution_options(corelab_as_of=event)
    try:
        yield
    finally:
        connection.execution_options(corelab_as_of=None)


def _then(connection: sa.Connection) -> int | None:
    event: int | None = connection.get_execution_options().get("corelab_as_of")
    return event


def _until(entries: sa.FromClause, then: int | None) -> list[sa.ColumnElement[bool]]:
    return [] if then is None else [entries.c.event <= then]


def _superseded(entry_id: sa.ColumnElement[int], then: int | None = None) -> sa.ColumnElement[bool]:
    newer = schema.entry.alias("newer")
    return sa.exists(sa.select(sa.literal(1)).where(newer.c.supersedes == entry_id, *_until(newer, then)))


def in_force(
    connection: sa.Connection,
    kind: str,
    ids: Collection[int] | None = None,
    by: str = "plug_id",
    *,
    superseded: bool = False,
) -> pd.DataFrame:
    """The rows of a kind that are in force, oldest first: typed values, and `event` and `digest`.

    With `superseded`, those that are not: corrected or withdrawn.

    Parameters
    ----------
    ids, by
        Only rows whose column `by` is one of `ids`.
    """
    table = schema.SHEET_TABLES[kind]
    then = _then(connection)
    gone = _superseded(table.c.id, then)
    query = (
        sa.select(table, schema.entry.c.event, schema.entry.c.digest)
        .join(schema.entry, schema.entry.c.id == table.c.id)
        .where(gone if superseded else ~gone, *_until(schema.entry, then))
        .order_by(table.c.id)
    )
    wanted = None
    if ids is not None:
        wanted = set(ids)
        if len(wanted) <= _WHOLE_TABLE_FROM:
            query = query.where(table.c[by].in_(sorted(wanted)))
            wanted = None
    frame = frame_of(connection, query)
    return frame if wanted is None else frame[frame[by].isin(wanted)].reset_index(drop=True)


def frame_of(connection: sa.Connection, query: sa.Select[Any]) -> pd.DataFrame:
    """A query's rows as a frame: numbers as float64 with NaN for what is not there, texts as objects."""
    result = connection.execute(query)
    columns = list(query.selected_columns)
    rows = result.fetchall()
    data = zip(*rows, strict=True) if rows else ([] for _ in columns)
    frame: dict[str, Any] = {}
    for column, values in zip(columns, data, strict=True):
        number = isinstance(column.type, (sa.Double, sa.REAL, sa.Float))
        whole = isinstance(column.type, sa.Integer)
        series = list(values)
        if number or (whole and any(v is None for v in series)):
            frame[column.name] = pd.Series(series, dtype="float64")
        elif whole:
            frame[column.name] = pd.Series(series, dtype="int64")
        else:
            frame[column.name] = pd.Series(series, dtype=object)
    return pd.DataFrame(frame)


def rows_of(frame: pd.DataFrame) -> list[dict[str, Any]]:
    """The rows of a frame as mappings."""
    return [{str(k): v for k, v in row.items()} for row in frame.to_dict("records")]


def replace_results(
    connection: sa.Connection, plug_ids: Collection[int], rows: Sequence[Mapping[str, Any]]
) -> None:
    """Put new results in the place of all results of these plugs."""
    result = schema.result
    numbers = sorted(plug_ids)
    for start in range(0, len(numbers), 500):
        connection.execute(sa.delete(result).where(result.c.plug_id.in_(numbers[start : start + 500])))
    insert(connection, result, rows)


def results(connection: sa.Connection, plug_ids: Collection[int] | None = None) -> pd.DataFrame:
    query = sa.select(schema.result)
    if plug_ids is not None and len(plug_ids) <= _WHOLE_TABLE_FROM:
        query = query.where(schema.result.c.plug_id.in_(sorted(plug_ids)))
        plug_ids = None
    frame = frame_of(connection, query.order_by(*schema.result.primary_key.columns))
    return frame if plug_ids is None else frame[frame["plug_id"].isin(set(plug_ids))].reset_index(drop=True)


def settings(connection: sa.Connection) -> dict[str, str]:
    """The settings in force, as text."""
    query = sa.select(schema.setting.c.name, schema.setting.c.value).order_by(schema.setting.c.id)
    rows = connection.execute(query.where(*_until(schema.setting, _then(connection))))
    return {row.name: row.value for row in rows}


def next_id(connection: sa.Connection, table: sa.Table) -> int:
    return (connection.execute(sa.select(sa.func.max(table.c.id))).scalar() or 0) + 1


def persons(connection: sa.Connection) -> dict[str, tuple[int, str, str]]:
    """Registered persons by the key of their name: number, name, role in force."""
    found: dict[str, tuple[int, str, str]] = {}
    query = (
        sa.select(
            schema.person.c.id, schema.person.c.name, schema.person.c.name_key, schema.person_role.c.role
        )
        .join(schema.person_role, schema.person_role.c.person_id == schema.person.c.id)
        .order_by(schema.person_role.c.id)
    )
    for number, name, key, role in connection.execute(query):
        found[key] = (number, name, role)
    return found


def secrets(connection: sa.Connection) -> dict[int, str]:
    """By person, what the password now in force is checked against."""
    query = sa.select(schema.credential.c.person_id, schema.credential.c.secret)
    return {row.person_id: row.secret for row in connection.execute(query.order_by(schema.credential.c.id))}


def approvals(connection: sa.Connection, plug_ids: Collection[int] | None = None) -> pd.DataFrame:
    """The newest decision on each plug: `id`, `plug_id`, `verdict`, `grounds`, and its event."""
    return _newest(connection, schema.approval, plug_ids)


def releases(connection: sa.Connection, plug_ids: Collection[int] | None = None) -> pd.DataFrame:
    """The newest release of each plug, and its event."""
    return _newest(connection, schema.control_release, plug_ids)


def _newest(connection: sa.Connection, table: sa.Table, plug_ids: Collection[int] | None) -> pd.DataFrame:
    event = schema.event
    query = (
        sa.select(*(c for c in table.c if c.name != "digest"), event.c.at, event.c.person, event.c.reason)
        .join(event, event.c.number == table.c.event)
        .where(table.c.id.in_(sa.select(sa.func.max(table.c.id)).group_by(table.c.plug_id)))
        .order_by(table.c.plug_id)
    )
    frame = frame_of(connection, query)
    return frame if plug_ids is None else frame[frame["plug_id"].isin(set(plug_ids))].reset_index(drop=True)


def approved_results(connection: sa.Connection, plug_ids: Collection[int] | None = None) -> pd.DataFrame:
    """The frozen results of the plugs whose newest decision is an approval, as rows like `results`."""
    found = approvals(connection, plug_ids)
    of_plug = found[found["verdict"] == "approved"].set_index("id")["plug_id"]
    table = schema.approved_result
    columns = [c for c in table.c if c.name not in {"id", "event", "digest"}]
    query = sa.select(*columns).order_by(table.c.id)
    if len(of_plug) <= _WHOLE_TABLE_FROM:
        query = query.where(table.c.approval_id.in_([int(n) for n in of_plug.index]))
    frame = frame_of(connection, query)
    frame = frame[frame["approval_id"].isin(of_plug.index)].reset_index(drop=True)
    frame.insert(0, "plug_id", frame["approval_id"].map(of_plug).astype("int64"))
    return frame.drop(columns="approval_id")


def exports(connection: sa.Connection, well_id: int | None = None) -> pd.DataFrame:
    """What was issued, without the files' contents."""
    table, event = schema.export, schema.event
    query = (
        sa.select(
            *(c for c in table.c if c.name not in {"content", "digest", "shown"}),
            event.c.at,
            event.c.person,
            event.c.reason,
        )
        .join(event, event.c.number == table.c.event)
        .order_by(table.c.id)
    )
    return frame_of(connection, query if well_id is None else query.where(table.c.well_id == well_id))


def export_row(connection: sa.Connection, number: int) -> dict[str, Any] | None:
    """One file that was issued, with its bytes."""
    row = connection.execute(sa.select(schema.export).where(schema.export.c.id == number)).mappings().first()
    return None if row is None else dict(row)


def other_files(connection: sa.Connection, well_id: int | None = None) -> pd.DataFrame:
    """The files of other laboratories' results, oldest first, with their events, without their contents.

    `superseded_by` is NaN for one in force; a withdrawal is a row of its own.
    """
    table, event, newer = schema.other_file, schema.event, schema.other_file.alias("newer")
    query = (
        sa.select(
            *(c for c in table.c if c.name not in {"content", "digest"}),
            newer.c.id.label("superseded_by"),
            newer.c.state.label("superseded_state"),
            event.c.at,
            event.c.person,
            event.c.command,
            event.c.reason,
        )
        .join(event, event.c.number == table.c.event)
        .outerjoin(newer, newer.c.supersedes == table.c.id)
        .order_by(table.c.id)
    )
    return frame_of(connection, query if well_id is None else query.where(table.c.well_id == well_id))


def other_plugs(connection: sa.Connection, well_id: int | None = None) -> pd.DataFrame:
    """The plugs of other laboratories' files that are in force, with `file` and `well_id`, in their order."""
    table, file, newer = schema.other_plug, schema.other_file, schema.other_file.alias("newer")
    query = (
        sa.select(*(c for c in table.c if c.name != "digest"), file.c.file, file.c.well_id)
        .join(file, file.c.id == table.c.other_file_id)
        .where(~sa.exists(sa.select(newer.c.id).where(newer.c.supersedes == file.c.id)))
        .order_by(table.c.id)
    )
    return frame_of(connection, query if well_id is None else query.where(file.c.well_id == well_id))


def other_results(connection: sa.Connection, well_id: int) -> pd.DataFrame:
    """The results in the files of a well, superseded ones too, in their order."""
    result, plug, file = schema.other_result, schema.other_plug, schema.other_file
    query = (
        sa.select(*(c for c in result.c if c.name not in {"id", "event", "digest"}))
        .join(plug, plug.c.id == result.c.other_plug_id)
        .join(file, file.c.id == plug.c.other_file_id)
        .where(file.c.well_id == well_id)
        .order_by(result.c.id)
    )
    return frame_of(connection, query)


def entry_row(connection: sa.Connection, number: int) -> dict[str, Any] | None:
    """One entry with its typed values, and whether it is in force."""
    row = (
        connection.execute(
            sa.select(schema.entry, (~_superseded(schema.entry.c.id)).label("in_force")).where(
                schema.entry.c.id == number
            )
        )
        .mappings()
        .first()
    )
    if row is None:
        return None
    values = dict(row)
    table = schema.SHEET_TABLES.get(values["kind"])
    if table is not None:
        typed = connection.execute(sa.select(table).where(table.c.id == number)).mappings().one()
        values["values"] = dict(typed)
    return values


def entries_of(
    connection: sa.Connection, plug_ids: Collection[int], kinds: Iterable[str], in_force_only: bool = False
) -> pd.DataFrame:
    """All entries about these plugs with their events, in order of their numbers."""
    frames, then = [], _then(connection)
    for kind in kinds:
        table = schema.SHEET_TABLES[kind]
        if "plug_id" not in table.c:
            continue
        instruments = [
            c for c in table.c if c.name in {"instrument_id", "balance_id", "caliper_id", "permeameter_id"}
        ]
        has = {c.name for c in table.c}
        newer = schema.entry.alias("by")
        query = (
            sa.select(
                table.c.plug_id,
                schema.entry.c.id.label("number"),
                schema.entry.c.kind,
                (table.c.measured_on if "measured_on" in has else sa.null()).label("measured_on"),
                (table.c.measured_by if "measured_by" in has else sa.null()).label("measured_by"),
                (instruments[0] if instruments else sa.null()).label("instrument_id"),
                schema.entry.c.file,
                schema.entry.c.sheet,
                schema.entry.c.row,
                schema.entry.c.entered,
                schema.entry.c.supersedes,
                newer.c.id.label("superseded_by"),
                newer.c.kind.label("superseded_kind"),
                schema.event.c.number.label("event"),
                schema.event.c.at,
                schema.event.c.person,
                schema.event.c.command,
                schema.event.c.reason,
            )
            .join(schema.entry, schema.entry.c.id == table.c.id)
            .join(schema.event, schema.event.c.number == schema.entry.c.event)
            .outerjoin(newer, sa.and_(newer.c.supersedes == schema.entry.c.id, *_until(newer, then)))
            .where(table.c.plug_id.in_(sorted(plug_ids)), *_until(schema.entry, then))
        )
        if in_force_only:
            query = query.where(newer.c.id.is_(None))
        frames.append(frame_of(connection, query))
    filled = [frame for frame in frames if len(frame)]
    if not filled:
        return frames[0] if frames else pd.DataFrame()
    return pd.concat(filled, ignore_index=True).sort_values("number", kind="stable").reset_index(drop=True)


def withdrawals_of(connection: sa.Connection, numbers: Collection[int]) -> pd.DataFrame:
    """Withdrawals of these entries, with the events that made them."""
    entry, old = schema.entry, schema.entry.alias("old")
    query = (
        sa.select(
            entry.c.supersedes,
            old.c.kind.label("withdrawn_kind"),
            schema.event.c.number.label("event"),
            schema.event.c.at,
            schema.event.c.person,
            schema.event.c.command,
            schema.event.c.reason,
        )
        .join(old, old.c.id == entry.c.supersedes)
        .join(schema.event, schema.event.c.number == entry.c.event)
        .where(entry.c.kind == schema.WITHDRAWAL, entry.c.supersedes.in_(sorted(numbers)))
    )
    return frame_of(connection, query)


def withdrawers_of(connection: sa.Connection, plug_ids: Collection[int]) -> dict[int, set[str]]:
    """By plug, the keys of the persons who withdrew a reading of it."""
    entry, old = schema.entry, schema.entry.alias("old")
    gone = connection.execute(
        sa.select(old.c.id, old.c.kind, schema.event.c.person)
        .join(old, old.c.id == entry.c.supersedes)
        .join(schema.event, schema.event.c.number == entry.c.event)
        .where(entry.c.kind == schema.WITHDRAWAL)
    ).all()
    found: dict[int, set[str]] = {}
    for kind in {row.kind for row in gone}:
        table = schema.SHEET_TABLES.get(kind)
        if table is None or "plug_id" not in table.c:
            continue
        by = {row.id: row.person for row in gone if row.kind == kind}
        about = sa.select(table.c.id, table.c.plug_id).where(
            table.c.id.in_(sorted(by)), table.c.plug_id.in_(sorted(plug_ids))
        )
        for row in connection.execute(about):
            found.setdefault(row.plug_id, set()).add(name_key(by[row.id]))
    return found


def entries_by_event(connection: sa.Connection, well_id: int, plug_ids: Collection[int]) -> pd.DataFrame:
    """How many entries of each kind each event brought to a well, its runs and its plugs."""
    entry, event = schema.entry, schema.event
    subjects: list[sa.Select[Any]] = []
    for table in schema.SHEET_TABLES.values():
        if "plug_id" in table.c:
            subjects.append(sa.select(table.c.id).where(table.c.plug_id.in_(sorted(plug_ids))))
        elif "well_id" in table.c:
            subjects.append(sa.select(table.c.id).where(table.c.well_id == well_id))
        elif "gun_run_id" in table.c:
            owned = sa.select(schema.gun_run.c.id).where(schema.gun_run.c.well_id == well_id)
            subjects.append(sa.select(table.c.id).where(table.c.gun_run_id.in_(owned)))
        elif "run_id" in table.c:
            owned = sa.select(schema.run.c.id).where(schema.run.c.well_id == well_id)
            subjects.append(sa.select(table.c.id).where(table.c.run_id.in_(owned)))
    about = sa.union_all(*subjects).subquery()
    touched = sa.or_(
        entry.c.id.in_(sa.select(about.c.id)),
        sa.and_(entry.c.kind == schema.WITHDRAWAL, entry.c.supersedes.in_(sa.select(about.c.id))),
    )
    query = (
        sa.select(
            event.c.number.label("event"),
            event.c.at,
            event.c.person,
            event.c.command,
            event.c.reason,
            entry.c.kind,
            sa.func.count().label("count"),
            sa.func.count(entry.c.supersedes).label("corrections"),
        )
        .join(event, event.c.number == entry.c.event)
        .where(touched)
        .group_by(event.c.number, event.c.at, event.c.person, event.c.command, event.c.reason, entry.c.kind)
        .order_by(event.c.number, entry.c.kind)
    )
    return frame_of(connection, query)


def decisions_on(connection: sa.Connection, plug_ids: Collection[int]) -> pd.DataFrame:
    """Every approval, revocation and release of these plugs with its event: `plug_id`, `what`, …"""
    event, approval, released = schema.event, schema.approval, schema.control_release
    told = (event.c.number.label("event"), event.c.at, event.c.person, event.c.command, event.c.reason)
    wanted = sorted(plug_ids)
    both = [
        sa.select(table.c.plug_id, what.label("what"), *told)
        .join(event, event.c.number == table.c.event)
        .where(table.c.plug_id.in_(wanted))
        .order_by(table.c.id)
        for table, what in (
            (approval, approval.c.verdict),
            (released, sa.literal("released although ", sa.Text).concat(released.c.blocked)),
        )
    ]
    frames = [frame_of(connection, query) for query in both]
    return pd.concat([f for f in frames if len(f)] or frames[:1], ignore_index=True)


def events(connection: sa.Connection) -> pd.DataFrame:
    """Every event, first to last."""
    return frame_of(connection, sa.select(schema.event).order_by(schema.event.c.number))


def certified_plugs(connection: sa.Connection) -> list[int]:
    """The standards that carry a certified value, by their numbers as plugs."""
    return sorted({int(n) for n in in_force(connection, "certified values")["standard_id"]})


def instruments_read(
    connection: sa.Connection, plug_ids: Collection[int], instruments: Collection[int]
) -> pd.DataFrame:
    """On which days which of these instruments read which of these plugs: readings in force."""
    queries = []
    for table in schema.SHEET_TABLES.values():
        if "plug_id" not in table.c or "measured_on" not in table.c:
            continue
        for name in ("instrument_id", "balance_id", "caliper_id", "permeameter_id"):
            if name in table.c:
                queries.append(
                    sa.select(table.c.plug_id, table.c[name].label("instrument_id"), table.c.measured_on)
                    .where(table.c[name].in_(sorted(instruments)), ~_superseded(table.c.id))
                    .distinct()
                )
    frame = frame_of(connection, sa.union_all(*queries).subquery().select())
    frame["day"] = [str(d)[:10] if d else "" for d in frame["measured_on"]]
    return frame[frame["plug_id"].isin(set(plug_ids))].reset_index(drop=True)


def crush_verdicts(connection: sa.Connection, plug_ids: Collection[int]) -> list[tuple[int, str]]:
    """What persons judged of plugs: the plug, and the verdict in words."""
    words = {
        "yes": "judged crushed",
        "no": "judged not crushed",
        "unsure": "judged uncertain whether crushed",
    }
    return [
        (
            int(row["plug_id"]),
            f"{words[row['crushed']]} by {row['judged_by']}"
            + (f" ({row['seen_in']})" if row["seen_in"] else ""),
        )
        for row in rows_of(in_force(connection, "crush verdicts", plug_ids))
    ]
