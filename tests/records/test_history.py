"""The chain of events: digests anyone can make again, and no alteration that goes unseen."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.lab import Lab
from corelab.records import history, schema

Change = Callable[[sa.Connection], None]
GUARDED = schema.APPEND_ONLY


# -- the digests, made again in a few lines of the standard library -----------------------------------------


def sha(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


def digest_of(table: str, row: dict[str, Any]) -> str:
    cells = [item for name in sorted(row) if name != "digest" for item in (name, row[name])]
    cells = [hashlib.sha256(c).hexdigest() if isinstance(c, bytes) else c for c in cells]
    return sha(json.dumps([table, *cells], ensure_ascii=False, separators=(",", ":")))


def rows_of(connection: sa.Connection, table: str, order: str = "id") -> list[dict[str, Any]]:
    found = connection.exec_driver_sql(f"SELECT * FROM {table} ORDER BY {order}").mappings()
    return [dict(row) for row in found]


ORDER = [
    "job", "well", "plug", "run", "gun_run", "instrument", "person", "person_role", "setting", "entry",
    "credential", "approval", "approved_result", "control_release", "export", "partner",
    "log_curve", "depth_shift", "other_file", "other_plug", "other_result",
]  # fmt: skip


def assert_chain_is_made_again(lab: Lab) -> int:
    """Hash the whole record anew, by other code than the program's; returns the number of events."""
    with lab.engine.connect() as connection:
        of_event: dict[int, str] = {}
        counts: dict[int, int] = {}
        typed: dict[str, dict[int, dict[str, Any]]] = {}
        for kind, table in schema.SHEET_TABLES.items():
            typed[kind] = {row["id"]: row for row in rows_of(connection, table.name)}
        for table in ORDER:
            for row in rows_of(connection, table):
                digest = digest_of(table, row)
                if table == "entry":
                    digest = sha(
                        digest + digest_of(row["kind"], typed.get(row["kind"], {}).get(row["id"], {}))
                    )
                assert row["digest"] == digest
                of_event[row["event"]] = of_event.get(row["event"], "") + digest
                counts[row["event"]] = counts.get(row["event"], 0) + 1
        previous = "0" * 64
        events = rows_of(connection, "event", "number")
        for number, event in enumerate(events, start=1):
            assert event["number"] == number
            assert event["previous_digest"] == previous
            assert event["row_count"] == counts.get(number, 0)
            assert event["rows_digest"] == sha(of_event.get(number, ""))
            assert event["digest"] == digest_of("event", event)
            previous = event["digest"]
    assert lab.seal() == f"{len(events)}-{previous}"
    return len(events)


def faults(lab: Lab) -> list[str]:
    with lab.engine.connect() as connection:
        return history.chain_faults(connection)


def test_the_demo_lab_can_be_hashed_again_after_loading_correcting_and_withdrawing(
    any_lab: Lab, bench: Path, write_sheet: Callable[..., Path]
) -> None:
    any_lab.load([bench])
    assert assert_chain_is_made_again(any_lab) == 2
    assert faults(any_lab) == []
    heading = "well,plug,condition,mass [g],balance,measured on,measured by"
    sheet = write_sheet("masses", heading, "QB-2,1H,dry,45.734,BAL-2,2026-02-13,Odd Pell")
    any_lab.load([sheet], reason="misread")
    entries = any_lab.plug_show("QB-2", "1H")["entries"]
    length = entries[entries["kind"] == "dimensions"]["number"].iloc[0]
    any_lab.withdraw(int(length), "wrong plug")
    assert assert_chain_is_made_again(any_lab) == 4
    assert faults(any_lab) == []
    assert any_lab.recompute(check=True).empty


def test_a_lab_with_something_in_every_cell_can_be_hashed_again(full_lab: Lab) -> None:
    assert assert_chain_is_made_again(full_lab) == 6
    assert faults(full_lab) == []


# -- alterations behind the program's back ------------------------------------------------------------------


def seen(connection: sa.Connection, *statements: str) -> bool:
    """Whether the chain shows an alteration, which is then taken back."""
    for statement in statements:
        changed = connection.exec_driver_sql(statement)
        assert changed.rowcount != 0, statement
    found = history.chain_faults(connection)
    connection.rollback()
    return found != []


def other(column: sa.Column[Any], value: Any) -> str:
    """Another value for a cell, as SQL."""
    if value is None:
        return "1" if isinstance(column.type, (sa.Integer, sa.Double)) else "'2'"
    if isinstance(value, float):
        return repr(math.nextafter(value, math.inf))  # the least change there is
    if isinstance(value, bytes):
        return "x'00'"
    return str(value + 1) if isinstance(value, int) else f"'{value}.'"


@pytest.mark.parametrize("table", GUARDED, ids=lambda t: t.name)
def test_every_cell_of_every_table_is_watched(unguarded: sa.Connection, table: sa.Table) -> None:
    unguarded.exec_driver_sql("PRAGMA ignore_check_constraints=ON")
    (key,) = (c.name for c in table.primary_key.columns)
    row = unguarded.execute(sa.select(table).order_by(sa.desc(key)).limit(1)).mappings().one()
    for column in table.c:
        change = f'UPDATE {table.name} SET "{column.name}" = {other(column, row[column.name])}'
        assert seen(unguarded, f"{change} WHERE {key} = {row[key]}"), column.name


@pytest.mark.parametrize("table", GUARDED[1:], ids=lambda t: t.name)
def test_a_deleted_row_is_missed(unguarded: sa.Connection, table: sa.Table) -> None:
    assert seen(unguarded, f"DELETE FROM {table.name} WHERE id = (SELECT max(id) FROM {table.name})")


@pytest.mark.parametrize("table", GUARDED[1:], ids=lambda t: t.name)
def test_a_row_put_in_is_seen(unguarded: sa.Connection, table: sa.Table) -> None:
    names = ['"name"' if c.name == "name" else f'"{c.name}"' for c in table.c]
    marked = {
        '"id"': "id + 1000",
        '"supersedes"': "NULL",
        '"name_key"': "name_key || '2'",
    }
    if table is schema.approved_result:
        marked['"step"'] = "step || '2'"
    cells = ", ".join(marked.get(name, name) for name in names)
    source = f"SELECT {cells} FROM {table.name} WHERE id = (SELECT min(id) FROM {table.name})"
    assert seen(unguarded, f"INSERT INTO {table.name} ({', '.join(names)}) {source}")


@pytest.mark.parametrize("table", list(schema.SHEET_TABLES.values()), ids=lambda t: t.name)
def test_two_rows_that_change_places_are_seen(unguarded: sa.Connection, table: sa.Table) -> None:
    first, second = unguarded.execute(sa.select(table.c.id).order_by(table.c.id).limit(2)).scalars()
    unguarded.exec_driver_sql(f"UPDATE {table.name} SET remarks = 'other' WHERE id = {second}")
    steps = [(first, -1), (second, first), (-1, second)]
    assert seen(unguarded, *(f"UPDATE {table.name} SET id = {to} WHERE id = {at}" for at, to in steps))


def whole_again(connection: sa.Connection, number: int, **cells: Any) -> None:
    """Alter an event and give it a digest that fits: the work of someone who knows how."""
    row = next(e for e in rows_of(connection, "event", "number") if e["number"] == number) | cells
    row["digest"] = digest_of("event", row)
    connection.execute(sa.update(schema.event).where(schema.event.c.number == number), row)


def _middle_event_deleted(connection: sa.Connection) -> None:
    connection.exec_driver_sql("DELETE FROM event WHERE number = 3")


def _first_event_deleted(connection: sa.Connection) -> None:
    connection.exec_driver_sql("DELETE FROM event WHERE number = 1")


def _last_event_deleted_and_its_rows_left(connection: sa.Connection) -> None:
    connection.exec_driver_sql("DELETE FROM event WHERE number = 6")


def _middle_event_altered(connection: sa.Connection) -> None:
    connection.exec_driver_sql("UPDATE event SET person = 'Eve' WHERE number = 3")


def _middle_event_altered_with_a_digest_that_fits(connection: sa.Connection) -> None:
    whole_again(connection, 3, person="Eve")


def _event_removed_and_the_rest_closed_up(connection: sa.Connection) -> None:
    connection.exec_driver_sql("DELETE FROM setting")
    connection.exec_driver_sql("DELETE FROM event WHERE number = 3")
    (second,) = (e for e in rows_of(connection, "event", "number") if e["number"] == 2)
    whole_again(connection, 4, previous_digest=second["digest"])


def _row_altered_with_a_digest_that_fits(connection: sa.Connection) -> None:
    row = rows_of(connection, "well")[-1] | {"name": "Elsewhere"}
    row["digest"] = digest_of("well", row)
    connection.execute(sa.update(schema.well).where(schema.well.c.id == row["id"]), row)


def _two_entries_change_numbers(connection: sa.Connection) -> None:
    for at, to in ((3, -1), (4, 3), (-1, 4)):
        connection.exec_driver_sql(f"UPDATE entry SET id = {to} WHERE id = {at}")


def _values_moved_to_another_kind(connection: sa.Connection) -> None:
    (number,) = connection.exec_driver_sql("SELECT id FROM sieve LIMIT 1").one()
    connection.exec_driver_sql(f"UPDATE entry SET kind = 'jobs' WHERE id = {number}")


def _values_of_an_entry_twice(connection: sa.Connection) -> None:
    (number,) = connection.exec_driver_sql("SELECT max(id) FROM sieve").one()
    connection.exec_driver_sql(f"UPDATE jobs SET id = {number} WHERE id = (SELECT max(id) FROM jobs)")


def _number_made_infinite(connection: sa.Connection) -> None:
    connection.exec_driver_sql("PRAGMA ignore_check_constraints=ON")
    connection.exec_driver_sql("UPDATE masses SET mass_g = 9e999 WHERE id = (SELECT max(id) FROM masses)")


def _withdrawal_undone(connection: sa.Connection) -> None:
    connection.exec_driver_sql("DELETE FROM entry WHERE kind = 'withdrawal'")


@pytest.mark.parametrize(
    "change",
    [
        _middle_event_deleted,
        _first_event_deleted,
        _last_event_deleted_and_its_rows_left,
        _middle_event_altered,
        _middle_event_altered_with_a_digest_that_fits,
        _event_removed_and_the_rest_closed_up,
        _row_altered_with_a_digest_that_fits,
        _two_entries_change_numbers,
        _values_moved_to_another_kind,
        _values_of_an_entry_twice,
        _number_made_infinite,
        _withdrawal_undone,
    ],
    ids=lambda change: change.__name__.strip("_"),
)
def test_an_alteration_is_seen(unguarded: sa.Connection, change: Change) -> None:
    change(unguarded)
    assert history.chain_faults(unguarded)


def test_a_tail_cut_off_cleanly_leaves_a_whole_chain_but_another_seal(unguarded: sa.Connection) -> None:
    kept = history.last_seal(unguarded)
    decided = ("credential", "approved_result", "approval", "control_release", "export", "partner")
    for table in (*decided, "depth_shift", "log_curve", "other_result", "other_plug", "other_file"):
        unguarded.exec_driver_sql(f"DELETE FROM {table} WHERE event = 6")
    for table in ("masses", "jobs"):
        unguarded.exec_driver_sql(f"DELETE FROM {table} WHERE id IN (SELECT id FROM entry WHERE event = 5)")
    unguarded.exec_driver_sql("DELETE FROM entry WHERE event = 5")
    unguarded.exec_driver_sql("DELETE FROM event WHERE number >= 5")
    assert history.chain_faults(unguarded) == []
    assert history.last_seal(unguarded) != kept


def test_reading_the_chain_changes_nothing(unguarded: sa.Connection) -> None:
    before = history.last_seal(unguarded)
    assert history.chain_faults(unguarded) == []
    assert history.last_seal(unguarded) == before


# -- what is hashed -----------------------------------------------------------------------------------------

CELLS = (
    st.none() | st.integers(-(2**53), 2**53) | st.floats(allow_nan=False, allow_infinity=False) | st.text()
)


@settings(max_examples=60)
@given(st.dictionaries(st.text(min_size=1), CELLS, min_size=1))
def test_the_order_of_columns_does_not_matter(row: dict[str, Any]) -> None:
    assert history.row_digest("t", row) == history.row_digest("t", dict(reversed(row.items())))


@settings(max_examples=60)
@given(st.lists(CELLS, max_size=4), st.lists(CELLS, max_size=4))
def test_other_values_are_packed_otherwise(a: list[Any], b: list[Any]) -> None:
    same = [(type(v), v) for v in a] == [(type(v), v) for v in b]
    assert (history.packed(a) == history.packed(b)) == same


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_is_no_number_is_not_packed(value: float) -> None:
    with pytest.raises(ValueError, match="JSON"):
        history.packed([value])


def test_a_negative_zero_is_packed_as_zero() -> None:
    assert history.packed([-0.0]) == history.packed([0.0]) == b"[0.0]"


def test_an_event_out_of_turn_is_not_written(any_lab: Lab) -> None:
    def entries() -> Iterator[int]:
        with any_lab.engine.connect() as connection:
            yield from connection.execute(sa.select(schema.event.c.number)).scalars()

    before = list(entries())
    with any_lab.engine.connect() as connection, pytest.raises(RuntimeError, match="out of turn"):
        history.add_event(
            connection,
            number=7,
            person="p",
            command="c",
            program_version="0",
            reason="",
            detail={},
            digests=[],
        )
    assert list(entries()) == before
