"""Alterations behind the program's back, drawn at random: `verify` finds and names each.

With CORELAB_CAMPAIGN=full there are 1,000 on SQLite. The hand that alters takes the guards away first and
puts them back, so that the data alone tell.
"""

from __future__ import annotations

import json
import math
import random
import shutil
import sqlite3
import sys
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.bench import compute
from corelab.cli import main
from corelab.errors import CorelabError, Unavailable, Usage
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import history, migrate, schema, store
from corelab.records.backup import fill_server
from corelab.review.verify import verify

Campaign = Callable[[int, int], int]
KIND_OF = {table.name: kind for kind, table in schema.SHEET_TABLES.items()}
VERSION = sa.Table("alembic_version", sa.MetaData(), sa.Column("version_num", sa.Text, primary_key=True))
TABLES = [*schema.metadata.tables.values(), VERSION]
Row = dict[str, Any]


@pytest.fixture(scope="session")
def lived_in_file(
    tmp_path_factory: pytest.TempPathFactory, staffed_file: Path, correct: Callable[..., Path]
) -> Path:
    """A lab in which everything has happened at least twice, in one file."""
    folder = tmp_path_factory.mktemp("lived-in")
    path = shutil.copyfile(staffed_file, folder / "lab.db")
    with open_lab(str(path), by="Mara Quist") as lab, pytest.MonkeyPatch.context() as patched:
        lab.person_password("Gia Lund", "a long password")
        lab.setting("laboratory name", "Test bench")
        lab.setting("barometric pressure", "100.9 kPa")
        lab.by = "Runa Holt"
        lab.approve("QB-2", ["1H", "2H", "3H", "4H"], "reviewed")
        lab.revoke("QB-2", ["4H"], "a second look")
        lab.by = "Tor Vale"
        lab.load([correct(folder)], reason="misread")
        for plug in ("9H", "8H"):
            lab.withdraw(int(lab.plug_show("QB-2", plug)["entries"]["number"].iloc[-1]), "a slip")
        patched.setattr(Lab, "_blocked", lambda *args: dict.fromkeys(args[-1], "out of control"))
        lab.by = "Mara Quist"
        lab.release("QB-2", ["6H", "7H"], "checked by hand")
        lab.person_password("Tor Vale", "another password")
        lab.partner_set("A partner", wells=["QB-2"], columns=["porosity"])
        lab.partner_set("A partner", units="ft")
        lab.write_csv("QB-2", folder / "a.csv", recipient="A partner", reason="asked for")
        lab.write_csv("QB-2", folder / "b.csv")
        logs = Path(__file__).resolve().parents[2] / "demo_lab" / "logs"
        lab.read_las(logs / "QB-2.las", "QB-2")
        lab.shift("QB-2", "1", -0.7, "by eye")
        lab.shift("QB-2", "1", -0.8, "a better look")
        theirs = lab.write_spwla("QB-2", folder / "theirs.spwla")
        lab.read_spwla(theirs, "QB-1", laboratory="Elsewhere", unit="ft")
        lab.read_withdraw(1, "belongs elsewhere")
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA journal_mode=DELETE")
    return path


@pytest.fixture(scope="module", params=["sqlite", "postgresql"])
def lived_in(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory, lived_in_file: Path
) -> Iterator[sa.Engine]:
    """It, on each database in turn: every test rolls back what it does."""
    if request.param == "sqlite":
        path = shutil.copyfile(lived_in_file, tmp_path_factory.mktemp("altered") / "lab.db")
        engine = engines.make_engine(str(path))
    else:
        engine = engines.make_engine(request.getfixturevalue("module_database"))
        fill_server(lived_in_file, engine)
    yield engine
    engine.dispose()


# -- the hand behind the program's back ---------------------------------------------------------------------


class NotPossible(Exception):
    """The database itself would not have it, or it would change nothing: another is drawn."""


@dataclass
class Hand:
    """Alters a record with the guards taken off, within a transaction that is rolled back."""

    connection: sa.Connection
    luck: random.Random

    def rows(self, table: sa.Table) -> list[Row]:
        order = table.primary_key.columns
        return [dict(r) for r in self.connection.execute(sa.select(table).order_by(*order)).mappings()]

    def some(self) -> tuple[sa.Table, list[Row]]:
        while True:
            table = self.luck.choice(TABLES)
            rows = self.rows(table)
            if rows:
                return table, rows

    def run(self, statement: sa.Executable) -> None:
        try:
            with self.connection.begin_nested():
                self.connection.execute(statement)
        except sa.exc.DatabaseError as refused:
            raise NotPossible from refused

    def put(self, table: sa.Table, old: Row, new: Row) -> None:
        keys = [c == old[c.name] for c in table.primary_key.columns]
        self.run(sa.update(table).where(*keys).values(new))


def other(luck: random.Random, column: sa.Column[Any], value: Any, least: bool) -> Any:
    """Another value for a cell, near or far."""
    made: list[Any] = [None] if column.nullable and value is not None else []
    if isinstance(column.type, sa.LargeBinary):
        made += [value + b"x", value[:-1], b""]
    elif isinstance(column.type, sa.Text):
        text = value or ""
        made += [text + " ", text[:-1], text.upper(), text.replace("0", "1"), "x", text + "\u0301"]
    elif isinstance(column.type, sa.Integer):
        made += [(value or 0) + 1, (value or 0) - 1, 1000]
    else:
        number = value or 0.0
        made += [-number, number * 10, number + 1, number * (1 + 1e-9)]
        made += [math.nextafter(number, math.inf)] if least else []
    made = [m for m in made if m != value]
    if not made:
        raise NotPossible
    return luck.choice(made)


def named(table: sa.Table, row: Row) -> str:
    """How `verify` names a row."""
    if table.name in KIND_OF or table is schema.entry:
        return f"entry {row['id']}"
    if table is schema.event:
        return f"event {row['number']}"
    if table is schema.result:
        return f"result {row['quantity']}"
    return f"row {row['id']} of {table.name}" if "id" in row else table.name


def fitting(table: sa.Table, row: Row) -> Row:
    """A row with the digest that fits it."""
    return row | {"digest": history.row_digest(table.name, row)} if "digest" in row else row


def edited(hand: Hand) -> list[str]:
    table, rows = hand.some()
    row, column = hand.luck.choice(rows), hand.luck.choice(list(table.c))
    new = other(hand.luck, column, row[column.name], table is not schema.result)
    hand.put(table, row, {column.name: new})
    return [] if column.primary_key or table is VERSION else [named(table, row)]


def edited_with_a_digest_that_fits(hand: Hand) -> list[str]:
    table, rows = hand.some()
    if table is schema.event or "digest" not in table.c or table is schema.entry:
        raise NotPossible
    row, column = hand.luck.choice(rows), hand.luck.choice(list(table.c))
    new = fitting(table, row | {column.name: other(hand.luck, column, row[column.name], True)})
    if column.name in {"digest", "id"}:
        raise NotPossible
    hand.put(table, row, new)
    return [f"event {row['event']}"]


def reading_edited_with_a_digest_that_fits(hand: Hand) -> list[str]:
    table = hand.luck.choice(list(schema.SHEET_TABLES.values()))
    rows = hand.rows(table)
    if not rows:
        raise NotPossible
    row, column = hand.luck.choice(rows), hand.luck.choice(list(table.c)[1:])
    new = row | {column.name: other(hand.luck, column, row[column.name], True)}
    entry = next(e for e in hand.rows(schema.entry) if e["id"] == row["id"])
    own = {k: v for k, v in entry.items() if k != "digest"}
    hand.put(table, row, new)
    hand.put(schema.entry, entry, {"digest": history.entry_digest(own, entry["kind"], new)})
    return [f"event {entry['event']}"]


def removed(hand: Hand) -> list[str]:
    table, rows = hand.some()
    row = hand.luck.choice(rows)
    hand.run(sa.delete(table).where(*(c == row[c.name] for c in table.primary_key.columns)))
    last = "event" in row and row["id"] == rows[-1]["id"]
    if table is VERSION or table is schema.event:
        return []
    return [f"event {row['event']}" if last else named(table, row).replace("row ", "").split(" of ")[0]]


def added(hand: Hand) -> list[str]:
    table, rows = hand.some()
    if table.name in KIND_OF:
        raise NotPossible
    row = dict(hand.luck.choice(rows))
    for key, value in (("name_key", "x"), ("step", "x"), ("version_num", "9")):
        if key in row:
            row[key] += value
    if "supersedes" in row:
        row["supersedes"] = None
    (*_, key) = (c.name for c in table.primary_key.columns)
    if isinstance(row[key], int):
        row[key] = rows[-1][key] + hand.luck.choice((1, 1, 5))
    if "event" in row:
        row["event"] = hand.luck.choice(hand.rows(schema.event))["number"]
    if table is schema.entry and row["kind"] != schema.WITHDRAWAL:
        kind = schema.SHEET_TABLES[row["kind"]]
        typed = hand.luck.choice(hand.rows(kind)) | {"id": row["id"]}
        own = {k: v for k, v in row.items() if k != "digest"}
        row["digest"] = history.entry_digest(own, row["kind"], typed)
        hand.run(sa.insert(table).values(row))
        hand.run(sa.insert(kind).values(typed))
    else:
        hand.run(sa.insert(table).values(fitting(table, row) if hand.luck.random() < 0.7 else row))
    return [named(table, row)]


def exchanged(hand: Hand) -> list[str]:
    """Two rows change places: everything but the key."""
    table, rows = hand.some()
    if len(rows) < 2:
        raise NotPossible
    a, b = hand.luck.sample(rows, 2)
    keys = {c.name for c in table.primary_key.columns}
    if table is schema.result:
        keys |= {"quantity", "direction", "stress_mpa", "step"}
    if {k: v for k, v in a.items() if k not in keys} == {k: v for k, v in b.items() if k not in keys}:
        raise NotPossible
    if len(keys) == 1:
        (key,) = keys
        for at, to in ((a[key], -1), (b[key], a[key]), (-1, b[key])):
            hand.run(sa.update(table).where(table.c[key] == at).values({key: to}))
    else:
        for at, values in ((a, b), (b, a)):
            hand.put(table, at, {k: v for k, v in values.items() if k not in keys})
    return [named(table, a), named(table, b)]


ALTERATIONS = (
    edited, edited, edited, edited_with_a_digest_that_fits, reading_edited_with_a_digest_that_fits, removed,
    added, exchanged,
)  # fmt: skip


def altering(engine: sa.Engine, luck: random.Random) -> Iterator[Hand]:
    """Hands, one after the other, each before the whole record."""
    with engine.connect() as connection:
        if engine.dialect.name == "sqlite":
            engines.outside_transaction(connection, "foreign_keys=OFF")
            engines.outside_transaction(connection, "ignore_check_constraints=ON")
        while True:
            with connection.begin() as transaction:
                if engine.dialect.name == "sqlite":
                    found = "SELECT name FROM sqlite_master WHERE type = 'trigger'"
                    for (trigger,) in connection.exec_driver_sql(found).fetchall():
                        connection.exec_driver_sql(f"DROP TRIGGER {trigger}")
                else:
                    connection.exec_driver_sql("SET LOCAL session_replication_role = replica")
                yield Hand(connection, luck)
                transaction.rollback()


def told(hand: Hand, seal: str = "") -> list[str]:
    """What `verify` says, the guards being whole again."""
    if hand.connection.dialect.name == "sqlite":
        history.guard(hand.connection)
    try:
        migrate.require_current(hand.connection)
        return verify(hand.connection, seal).faults
    except CorelabError as refused:
        return [str(refused)]


def test_the_record_as_it_is_has_no_fault(lived_in: sa.Engine) -> None:
    for hand in altering(lived_in, random.Random(0)):
        for table in TABLES:
            assert hand.rows(table) or table.name in KIND_OF, table.name
        assert told(hand) == []
        break


def test_every_alteration_is_found_and_named(lived_in: sa.Engine, campaign: Campaign) -> None:
    luck = random.Random(20261201)
    many = campaign(20, 1000) if lived_in.dialect.name == "sqlite" else campaign(8, 200)
    missed, unnamed, tried = [], [], Counter[str]()
    for hand in altering(lived_in, luck):
        if tried.total() == many:
            break
        alter = luck.choice(ALTERATIONS)
        try:
            names = alter(hand)
        except NotPossible:
            continue
        tried[alter.__name__] += 1
        faults = told(hand)
        words = f"{tried.total()} {alter.__name__} {names}"
        if not faults:
            missed.append(words)
        elif not all(any(name in fault for fault in faults) for name in names):
            unnamed.append(f"{words}: {faults[:3]}")
    print(f"\n{lived_in.dialect.name}: {dict(tried)}")
    assert missed == []
    assert unnamed == []


def guard_names(hand: Hand) -> list[str]:
    query = (
        "SELECT name FROM sqlite_master WHERE type = 'trigger'"
        if hand.connection.dialect.name == "sqlite"
        else "SELECT tgname || ' ON ' || tgrelid::regclass FROM pg_trigger WHERE NOT tgisinternal"
    )
    return sorted(hand.connection.exec_driver_sql(query).scalars())


def test_a_guard_dropped_or_altered_is_named(lived_in: sa.Engine) -> None:
    luck = random.Random(3)
    for tried, hand in enumerate(altering(lived_in, luck)):
        if tried == 12:
            break
        run = hand.connection.exec_driver_sql
        history.guard(hand.connection)
        name = luck.choice(guard_names(hand))
        way = tried % 4
        if way == 0:
            run(f"DROP TRIGGER {name}")
        elif lived_in.dialect.name == "sqlite":
            (text,) = run(f"SELECT sql FROM sqlite_master WHERE name = '{name}'").one()
            run(f"DROP TRIGGER {name}")
            table = text.split(" ON ")[1].split()[0]
            quiet = f"CREATE TRIGGER {name} BEFORE UPDATE ON {table} BEGIN SELECT 1; END"
            mild = text.replace("RAISE(ABORT", "RAISE(IGNORE) --", 1) if way == 2 else quiet
            run(quiet if way != 3 else mild.replace(name, f"{name}_2"))
        elif way == 1:
            trigger, table = name.split(" ON ")
            run(f"ALTER TABLE {table} DISABLE TRIGGER {trigger}")
        elif way == 2:
            run(
                "CREATE OR REPLACE FUNCTION corelab_append_only() RETURNS trigger LANGUAGE plpgsql AS "
                "$$ BEGIN RETURN NEW; END $$"
            )
            name = "the function that guards"
        else:
            run(f"ALTER TRIGGER {name} RENAME TO other")
        faults = history.guard_faults(hand.connection)
        assert any(name.split(" ON ")[0] in fault for fault in faults), (way, name, faults)


# -- what only the seal can tell -----------------------------------------------------------------------------


def cut(hand: Hand, most: int) -> None:
    """The last events and all that they closed, gone without a trace; the results made to fit."""
    last = hand.rows(schema.event)[-1]["number"]
    gone = list(range(last - hand.luck.randrange(most), last + 1))
    entries = [e["id"] for e in hand.rows(schema.entry) if e["event"] in gone]
    for table in schema.SHEET_TABLES.values():
        hand.run(sa.delete(table).where(table.c.id.in_(entries)))
    for table in reversed(schema.APPEND_ONLY[1:]):
        if "event" in table.c:
            hand.run(sa.delete(table).where(table.c.event.in_(gone)))
    hand.run(sa.delete(schema.event).where(schema.event.c.number.in_(gone)))
    fit_results(hand)


def fit_results(hand: Hand) -> None:
    plugs = list(store.Identities.read(hand.connection).names["plug"])
    compute.keep(hand.connection, plugs, store.settings(hand.connection))


def last_event_forged(hand: Hand) -> None:
    last = hand.rows(schema.event)[-1]
    column = hand.luck.choice(["person", "reason", "detail", "at", "command", "program_version"])
    hand.put(schema.event, last, fitting(schema.event, last | {column: last[column] + "x"}))


def made_anew(hand: Hand) -> None:
    """A setting changed, and every digest from there to the end made to fit."""
    row = hand.rows(schema.setting)[0]
    hand.put(schema.setting, row, fitting(schema.setting, row | {"value": "Another bench"}))
    digests: dict[int, list[str]] = {}
    for table in schema.APPEND_ONLY[1:]:
        for found in hand.rows(table) if "event" in table.c else []:
            digests.setdefault(found["event"], []).append(found["digest"])
    previous = history.NO_DIGEST
    for event in hand.rows(schema.event):
        closed = history.rows_digest(digests.get(event["number"], []))
        new = fitting(schema.event, event | {"rows_digest": closed, "previous_digest": previous})
        hand.put(schema.event, event, new)
        previous = new["digest"]


def test_a_forger_who_knows_how_is_caught_by_the_seal(lived_in: sa.Engine, campaign: Campaign) -> None:
    many = campaign(3, 60)
    for tried, hand in enumerate(altering(lived_in, random.Random(11))):
        if tried == many:
            break
        seal = history.last_seal(hand.connection)
        way = (lambda h: cut(h, 12), last_event_forged, made_anew)[tried % 3]
        way(hand)
        if tried < 3:
            assert told(hand) == []  # nothing but a seal kept elsewhere can tell
        (fault,) = told(hand, seal)
        assert fault.startswith(("the seal is of event", f"event {seal.split('-')[0]} is not the one"))


def test_a_second_version_of_the_schema_is_named(lived_in: sa.Engine) -> None:
    for hand in altering(lived_in, random.Random(0)):
        hand.run(sa.insert(VERSION).values(version_num="00029"))
        assert told(hand) == ["the schema 00029 in alembic_version is not the program's"]
        break


def test_a_seal_from_before_holds_as_the_record_grows(staffed: Lab) -> None:
    seal = staffed.seal()
    staffed.approve("QB-2", ["1H"], "reviewed")
    assert staffed.verify(seal).faults == []
    assert staffed.verify(f"  {seal}\n").faults == []
    other = seal.replace("a", "b") if "a" in seal else seal.replace("1", "2")
    assert staffed.verify(other).faults
    for nonsense in ("7", "x-" + "0" * 64, "7-" + "0" * 63, "7-" + "G" * 64):
        with pytest.raises(Usage, match="is not a seal"):
            staffed.verify(nonsense)


# -- through the door ----------------------------------------------------------------------------------------


def test_the_command_names_the_fault_and_leaves_with_1(
    lived_in_file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    path = shutil.copyfile(lived_in_file, tmp_path / "lab.db")

    def run(*words: str) -> tuple[int, str]:
        monkeypatch.setattr(sys, "argv", ["corelab", "--database", str(path), *words])
        try:
            main.run()
        except SystemExit as left:
            said = capsys.readouterr()
            return int(left.code or 0), said.out + said.err
        raise AssertionError("the program did not leave")

    status, said = run("verify")
    assert status == 0
    seal = next(line for line in said.splitlines() if line.startswith("Seal ")).removeprefix("Seal ")
    assert run("verify", "--seal", seal)[0] == 0
    assert run("verify", "--seal", "nonsense")[0] == 2
    with closing(sqlite3.connect(path)) as hand, hand:
        guards = hand.execute("SELECT name, sql FROM sqlite_master WHERE name LIKE 'masses_no_%'").fetchall()
        for name, _ in guards:
            hand.execute(f"DROP TRIGGER {name}")
        (number,) = hand.execute("SELECT id FROM masses ORDER BY id LIMIT 1").fetchone()
        hand.execute("UPDATE masses SET mass_g = mass_g + 0.001 WHERE id = ?", [number])
        for _, text in guards:
            hand.execute(text)
    status, said = run("verify", "--seal", seal)
    assert status == 1
    assert f"entry {number} (masses, row 2 of " in said
    assert "06 masses.csv) was altered" in said
    assert "restore a backup" in said
    status, said = run("verify", "--format", "json")
    assert status == 1
    assert f"entry {number} " in json.loads(said[: said.rindex("]") + 1])[0]["faults"][0]


@pytest.mark.parametrize("cell", ["file", "entered"])
def test_bytes_that_are_no_text_are_told_in_words(lived_in_file: Path, tmp_path: Path, cell: str) -> None:
    path = shutil.copyfile(lived_in_file, tmp_path / "lab.db")
    with closing(sqlite3.connect(path)) as hand, hand:
        hand.execute("DROP TRIGGER entry_no_update")
        hand.execute(f"UPDATE entry SET {cell} = CAST(x'ff' AS TEXT) WHERE id = 5")
    with open_lab(str(path)) as lab, pytest.raises(Unavailable, match=f"column '{cell}'.* is damaged"):
        lab.verify()
