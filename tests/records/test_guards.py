"""Triggers: whatever is written in an append-only table stays, whichever statement is tried on it."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
import sqlalchemy as sa

from corelab.lab import Lab
from corelab.records import schema

REFUSAL = "are never changed or removed: enter a correction"
TABLES = [pytest.param(table, id=table.name) for table in schema.APPEND_ONLY]
#: Every way to say that two rows are the same: the primary key, then the unique constraints.
KEYS = [
    pytest.param(table, [c.name for c in key.columns], id=f"{table.name}-{i}")
    for table in schema.APPEND_ONLY
    for i, key in enumerate(
        [table.primary_key, *(c for c in table.constraints if isinstance(c, sa.UniqueConstraint))]
    )
]


def refused(lab: Lab, statement: str) -> str:
    """The words with which the database refuses a statement; what it did otherwise is rolled back."""
    with lab.engine.connect() as connection:
        with pytest.raises(sa.exc.DatabaseError) as refusal:
            connection.exec_driver_sql(statement)
        connection.rollback()
    return str(refusal.value.orig)


def same_key_again(
    lab: Lab, table: sa.Table, key: Sequence[str], verb: str = "INSERT", tail: str = ""
) -> str:
    """A statement that inserts a row once more: the same in `key`, with another primary key if it can."""
    (primary,) = (c.name for c in table.primary_key.columns)
    quote = lab.engine.dialect.identifier_preparer.quote
    names = [c.name for c in table.c]
    taken = [f"{n} + 1000000" if n == primary and primary not in key else quote(n) for n in names]
    there = " AND ".join(f"{quote(n)} IS NOT NULL" for n in key)
    row = f"SELECT {', '.join(taken)} FROM {table.name} WHERE {there} LIMIT 1"
    return f"{verb} INTO {table.name} ({', '.join(map(quote, names))}) {row} {tail}"


@pytest.mark.parametrize("table", TABLES)
def test_every_append_only_table_has_rows_here(full_lab: Lab, table: sa.Table) -> None:
    with full_lab.engine.connect() as connection:
        assert connection.execute(sa.select(sa.func.count()).select_from(table)).scalar_one() > 0


@pytest.mark.parametrize("table", TABLES)
def test_no_row_is_updated(full_lab: Lab, table: sa.Table) -> None:
    column = full_lab.engine.dialect.identifier_preparer.quote(list(table.c)[-1].name)
    assert REFUSAL in refused(full_lab, f"UPDATE {table.name} SET {column} = {column}")


@pytest.mark.parametrize("table", TABLES)
def test_no_row_is_deleted(full_lab: Lab, table: sa.Table) -> None:
    assert REFUSAL in refused(full_lab, f"DELETE FROM {table.name}")


@pytest.mark.parametrize(("table", "key"), KEYS)
def test_no_row_is_replaced(full_lab: Lab, table: sa.Table, key: list[str]) -> None:
    if full_lab.engine.dialect.name == "sqlite":
        for verb in ("INSERT OR REPLACE", "REPLACE", "INSERT OR IGNORE"):
            assert REFUSAL in refused(full_lab, same_key_again(full_lab, table, key, verb))
    column = full_lab.engine.dialect.identifier_preparer.quote(list(table.c)[-1].name)
    tail = f"ON CONFLICT ({', '.join(key)}) DO UPDATE SET {column} = excluded.{column}"
    assert REFUSAL in refused(full_lab, same_key_again(full_lab, table, key, tail=tail))


@pytest.mark.parametrize(("table", "key"), KEYS)
def test_no_row_is_inserted_twice(full_lab: Lab, table: sa.Table, key: list[str]) -> None:
    assert refused(full_lab, same_key_again(full_lab, table, key))


@pytest.mark.parametrize("table", TABLES)
def test_no_table_is_emptied(full_lab: Lab, table: sa.Table) -> None:
    if full_lab.engine.dialect.name == "sqlite":  # it has no TRUNCATE; its row number is another way in
        names = ", ".join(f'"{c.name}"' for c in table.c if not c.primary_key)
        row = f"SELECT rowid, {names} FROM {table.name} LIMIT 1"
        statement = f"INSERT OR REPLACE INTO {table.name} (rowid, {names}) {row}"
    else:
        statement = f"TRUNCATE {table.name} CASCADE"
    assert REFUSAL in refused(full_lab, statement)
