"""The tables as they stand in the database: STRICT, named, and refusing by themselves what cannot be."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Any

import pytest
import sqlalchemy as sa

from corelab.lab import Lab
from corelab.records import schema
from corelab.sheets import SHEETS

Sound = Callable[[str], dict[str, Any]]


def _name(table: sa.Table, name: str) -> str:
    return f"ck_{table.name}_{name}"


def impossible(kind: str) -> Iterator[tuple[str, dict[str, Any]]]:
    """For each CHECK of a sheet's table: its name, and the cells that break it and no other."""
    sheet, table = SHEETS[kind], schema.SHEET_TABLES[kind]
    for column in schema.stored_columns(sheet):
        if column.refers:
            continue
        field = _name(table, column.field)
        if column.entry == "whole":
            yield field, {column.field: 0}
        elif column.entry == "choice":
            yield field, {column.field: "no such word"}
        elif column.entry == "date":
            yield field, {column.field: "14.03.2026"}
        elif column.entry != "number":
            yield field, {column.field: ""}
        else:
            low, high = column.quantity.possible if column.quantity else (-math.inf, math.inf)
            outside = [math.nextafter(low, -math.inf), math.nextafter(high, math.inf)]
            for one in column.fields:
                yield from ((_name(table, one), {one: v}) for v in outside)
        if column.gauge_field:
            yield _name(table, column.gauge_field), {column.gauge_field: 2}
            if not column.required:
                yield _name(table, column.gauge_field), {column.gauge_field: None}
                yield _name(table, column.gauge_field), {column.field: None}
        if column.limit_field:
            yield _name(table, column.limit_field), {column.limit_field: "about"}
            yield _name(table, column.limit_field), {column.limit_field: "below", column.field: None}
    for number, group in enumerate(sheet.either, start=1):
        firsts = [sheet.column(names[0]) for names in group]
        gone = [f for c in firsts for f in (c.fields[0], c.gauge_field, c.limit_field) if f]
        yield _name(table, f"either_{number}"), dict.fromkeys(gone)


def _insert(lab: Lab, table: sa.Table, values: dict[str, Any]) -> None:
    with lab.engine.connect() as connection:
        connection.execute(sa.insert(table), values)
        connection.rollback()


@pytest.mark.parametrize("kind", SHEETS)
def test_a_sheet_refuses_what_cannot_be(full_lab: Lab, kind: str, sound: Sound) -> None:
    table = schema.SHEET_TABLES[kind]
    with full_lab.engine.connect() as connection:
        free = connection.execute(sa.select(sa.func.max(schema.entry.c.id))).scalar_one()  # the withdrawal
    row = {"id": free, **sound(kind)}
    _insert(full_lab, table, row)
    broken = set()
    for name, cells in impossible(kind):
        with pytest.raises(sa.exc.IntegrityError) as refusal:
            _insert(full_lab, table, row | cells)
        assert name in str(refusal.value.orig), (cells, refusal.value.orig)
        broken.add(name)
    assert broken == {c.name for c in table.constraints if isinstance(c, sa.CheckConstraint)}


DIGEST = "0" * 64
ENTRY = {"id": 900, "event": 1, "kind": "masses", "supersedes": None, "file": "", "sheet": "", "row": 1}
ENTRY |= {"entered": "{}", "digest": DIGEST}
EVENT = dict.fromkeys(("at", "person", "command", "program_version", "reason", "detail"), "")
EVENT |= {"number": 900, "row_count": 0, "rows_digest": DIGEST, "previous_digest": DIGEST, "digest": DIGEST}
PLUG = {"id": 900, "event": 1, "well_id": 1, "name": "x", "name_key": "x", "digest": DIGEST}
ROLE = {"id": 900, "event": 1, "person_id": 1, "role": "manager", "digest": DIGEST}
RESULT = {"plug_id": 1, "quantity": "porosity", "direction": "", "stress_mpa": 0.0, "step": "", "value": 0.1}
RESULT |= {"uncertainty": None, "value_limit": None, "basis": "", "method": "", "version": 1, "flags": ""}
RESULT |= {"reason": "", "fingerprint": ""}


@pytest.mark.parametrize(
    ("table", "row", "cells", "constraint"),
    [
        (schema.entry, ENTRY, {"kind": "shopping list"}, "ck_entry_kind"),
        (schema.entry, ENTRY, {"kind": "withdrawal"}, "ck_entry_withdrawal"),
        (schema.entry, ENTRY, {"supersedes": 900}, "ck_entry_supersedes"),
        (schema.entry, ENTRY, {"digest": "short"}, "ck_entry_digest"),
        (schema.event, EVENT, {"number": 0}, "ck_event_number"),
        (schema.event, EVENT, {"row_count": -1}, "ck_event_row_count"),
        (schema.event, EVENT, {"rows_digest": ""}, "ck_event_rows_digest"),
        (schema.event, EVENT, {"previous_digest": ""}, "ck_event_previous_digest"),
        (schema.plug, PLUG, {"name": ""}, "ck_plug_name"),
        (schema.plug, PLUG, {"name_key": ""}, "ck_plug_name_key"),
        (schema.person_role, ROLE, {"role": "king"}, "ck_person_role_role"),
        (schema.result, RESULT, {"value": None}, "ck_result_value"),
        (schema.result, RESULT, {"value_limit": "about"}, "ck_result_value_limit"),
    ],
)
def test_the_frame_of_the_record_refuses_what_cannot_be(
    full_lab: Lab, table: sa.Table, row: dict[str, Any], cells: dict[str, Any], constraint: str
) -> None:
    _insert(full_lab, table, row)
    with pytest.raises(sa.exc.IntegrityError) as refusal:
        _insert(full_lab, table, row | cells)
    assert constraint in str(refusal.value.orig)


@pytest.mark.parametrize(
    ("table", "row"), [(schema.plug, PLUG | {"well_id": 77}), (schema.person_role, ROLE | {"person_id": 77})]
)
def test_no_row_points_at_nothing(full_lab: Lab, table: sa.Table, row: dict[str, Any]) -> None:
    with pytest.raises(sa.exc.IntegrityError, match=r"(?i)foreign key"):
        _insert(full_lab, table, row)


def test_a_row_without_its_event_is_not_committed(any_lab: Lab) -> None:
    row = PLUG | {"event": 77}
    with any_lab.engine.connect() as connection:
        connection.execute(sa.insert(schema.plug), row)
        with pytest.raises(sa.exc.IntegrityError, match=r"(?i)foreign key"):
            connection.commit()


def test_every_table_is_strict_on_sqlite(lab: Lab) -> None:
    with lab.engine.connect() as connection:
        rows = connection.exec_driver_sql("PRAGMA table_list").mappings().all()
    own = {r["name"]: r["strict"] for r in rows if r["name"] in schema.metadata.tables}
    assert own == dict.fromkeys(schema.metadata.tables, 1)


def test_text_in_a_number_column_is_refused(full_lab: Lab, sound: Sound) -> None:
    row = sound("masses") | {"mass_g": "heavy", "id": 1}
    names = ", ".join(row)
    values = ", ".join("NULL" if v is None else f"'{v}'" for v in row.values())
    statement = f"INSERT INTO masses ({names}) VALUES ({values})"
    with (
        full_lab.engine.connect() as connection,
        pytest.raises(sa.exc.DatabaseError, match=r"(?i)double|real"),
    ):
        connection.exec_driver_sql(statement)


def test_every_constraint_in_the_database_has_its_conventional_name(any_lab: Lab) -> None:
    inspector = sa.inspect(any_lab.engine)
    for table in schema.metadata.tables:
        found = [("pk", inspector.get_pk_constraint(table)["name"])]
        found += [("fk", key["name"]) for key in inspector.get_foreign_keys(table)]
        found += [("uq", key["name"]) for key in inspector.get_unique_constraints(table)]
        found += [("ck", key["name"]) for key in inspector.get_check_constraints(table)]
        wrong = [name for prefix, name in found if not (name or "").startswith(f"{prefix}_{table}")]
        assert not wrong, table
        assert len({name for _, name in found}) == len(found)


def test_no_row_is_removed_by_cascade(any_lab: Lab) -> None:
    inspector = sa.inspect(any_lab.engine)
    keys = [key for table in schema.metadata.tables for key in inspector.get_foreign_keys(table)]
    assert len(keys) > 50
    assert not [key for key in keys if {"ondelete", "onupdate"} & set(key["options"])]
