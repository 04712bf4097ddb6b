"""A small lab with a row in every table and something in every cell, for the tests of the record."""

from __future__ import annotations

import math
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path
from typing import Any
from uuid import uuid4

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.lab import Lab
from corelab.records import schema, store
from corelab.sheets import SHEETS


def _number(low: float, high: float) -> float:
    if math.isfinite(low) and math.isfinite(high):
        return (low + high) / 2
    return low + 1.5 if math.isfinite(low) else 1.5


def sound_values(kind: str) -> dict[str, Any]:
    """A row that the table of a kind accepts, with every column filled."""
    values: dict[str, Any] = {}
    for column in schema.stored_columns(SHEETS[kind]):
        if column.entry == "number":
            possible = column.quantity.possible if column.quantity else (-math.inf, math.inf)
            values |= dict.fromkeys(column.fields, _number(*possible))
            values |= {column.gauge_field: 0} if column.gauge_field else {}
            values |= {column.limit_field: "below"} if column.limit_field else {}
        elif column.refers or column.entry == "whole":
            values[column.field] = 1
        elif column.entry == "date":
            values[column.field] = "2026-03-14"
        else:
            values[column.field] = column.choices[0] if column.choices else "some words"
    return values


def fill(lab: Lab) -> None:
    """Two entries of each kind, of which the first is corrected once, and a row in every other table.

    The last entry is a withdrawal.
    """
    lab.person_add("Ada", "manager")
    lab.by = "Ada"
    lab.setting("laboratory name", "Test bench")
    with lab._writing("load bench sheets") as (connection, person):
        identities = store.Identities.read(connection)
        well = identities.add("well", "W-1")
        identities.add("job", "J-1")
        identities.add("instrument", "I-1")
        for kind in ("plug", "run", "gun run"):
            identities.add(kind, "1", well)
        change = store.Change.begin(connection)
        change.identities(identities)
        first = [store.NewEntry(k, sound_values(k), {"a": "1"}, f"{k}.csv", "", 2) for k in SHEETS]
        second = [store.NewEntry(k, sound_values(k), {"a": "2"}, f"{k}.csv", "", 3) for k in SHEETS]
        change.entries([*first, *second])
        change.close(person=person, command="fill", program_version="0", detail={})
        change = store.Change.begin(connection)
        corrected = store.NewEntry("masses", sound_values("masses"), {"a": "3"}, supersedes=1)
        change.entries([corrected, store.NewEntry(schema.WITHDRAWAL, {}, {}, supersedes=2)])
        change.close(person=person, command="mend", program_version="0", reason="a slip", detail={})
        change = store.Change.begin(connection)
        change.rows(schema.credential, [{"id": 1, "person_id": 1, "secret": "$argon2id$v=19$some$words"}])
        change.rows(
            schema.approval, [{"id": 1, "plug_id": 1, "verdict": "approved", "grounds": '{"released": ""}'}]
        )
        kept: dict[str, Any] = {
            "id": 1,
            "approval_id": 1,
            "quantity": "porosity",
            "direction": "",
            "step": "",
        }
        kept |= {"stress_mpa": 0.0, "value": 0.2, "uncertainty": 0.001, "value_limit": "below", "version": 1}
        kept |= {"basis": "bulk-grain", "method": "m", "flags": "", "reason": "", "fingerprint": "f"}
        change.rows(schema.approved_result, [kept])
        release = {"id": 1, "plug_id": 1, "blocked": "out of control", "results_digest": "0" * 64}
        change.rows(schema.control_release, [release])
        sent = {
            "id": 1,
            "well_id": well,
            "kind": "csv",
            "recipient": "A partner",
            "issue": 1,
            "file": "a.csv",
        }
        sent |= {"request": "{}", "shown": "{}", "content": b"a,b\r\n", "content_digest": "1" * 64}
        change.rows(schema.export, [sent])
        entitled = {"id": 1, "name": "A partner", "wells": '["W-1"]', "columns": "[]", "units": "[]"}
        change.rows(schema.partner, [entitled])
        theirs = {"id": 1, "well_id": well, "state": "read", "supersedes": None, "file": "a.spwla"}
        theirs |= {"heading": "{}", "notices": "[]", "content": b"10     1\n", "content_digest": "2" * 64}
        gone = theirs | {"id": 2, "state": "withdrawn", "supersedes": 1}
        change.rows(schema.other_file, [theirs, gone])
        reported = {"id": 1, "other_file_id": 1, "laboratory": "Elsewhere", "name": "1H", "name_key": "1h"}
        reported |= {"sample": "1", "depth_m": 1000.0, "depth_basis": "driller", "source": "core"}
        reported |= {
            "orientation": "horizontal",
            "facies": "",
            "lithology": "sandstone",
            "description": "Sst.",
        }
        change.rows(schema.other_plug, [reported | {"flags": "", "row": 5, "entered": "{}"}])
        value = {"id": 1, "other_plug_id": 1, "quantity": "porosity", "direction": "", "basis": "reported"}
        value |= {"stress_mpa": 20.0, "value": 0.2, "value_limit": "below", "flags": "", "reason": ""}
        change.rows(schema.other_result, [value])
        curve = {"id": 1, "well_id": well, "log": "GR", "file": "a.las", "content_digest": "3" * 64}
        curve |= {"mnemonic": "GR", "unit": "gAPI", "quantity": "gamma", "description": "gamma"}
        change.rows(schema.log_curve, [curve | {"depths": "[1.0]", "readings": "[60.0]"}])
        moved = {"id": 1, "run_id": 1, "gun_run_id": None, "log_curve_id": 1, "shift_m": 1.5}
        moved |= {"uncertainty_m": 0.03, "correlation": 0.9, "certain": 1, "basis": "matched"}
        change.rows(schema.depth_shift, [moved | {"detail": "{}"}])
        change.close(person=person, command="decide", program_version="0", detail={})


@pytest.fixture(scope="module", params=["sqlite", "postgresql"])
def full_lab(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Lab]:
    """The small lab, once a file of tests and database: a test must roll back what it does to it."""
    if request.param == "sqlite":
        path = tmp_path_factory.mktemp("full") / "lab.db"
        shutil.copyfile(request.getfixturevalue("sqlite_template"), path)
        with open_lab(str(path), by="Ada") as lab:
            fill(lab)
            yield lab
        return
    import psycopg

    server = request.getfixturevalue("postgresql_server")
    template = request.getfixturevalue("postgresql_template")
    name = f"full_{uuid4().hex[:12]}"
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name} TEMPLATE {template}")
    url = sa.make_url(server).set(drivername="postgresql+psycopg", database=name)
    with open_lab(url.render_as_string(hide_password=False), by="Ada") as lab:
        fill(lab)
        yield lab
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)")


@pytest.fixture(scope="session")
def unguarded_file(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path) -> Path:
    """The small lab in an SQLite file, triggers dropped, for a hand behind the program's back."""
    path = tmp_path_factory.mktemp("unguarded") / "lab.db"
    shutil.copyfile(sqlite_template, path)
    with open_lab(str(path), by="Ada") as lab:
        fill(lab)
    with closing(sqlite3.connect(path)) as connection:
        for (name,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'trigger'").fetchall():
            connection.execute(f"DROP TRIGGER {name}")
        connection.execute("PRAGMA journal_mode=DELETE")
    return path


@pytest.fixture
def unguarded(unguarded_file: Path, tmp_path: Path) -> Iterator[sa.Connection]:
    """A connection to a copy of that file, foreign keys off."""
    shutil.copyfile(unguarded_file, tmp_path / "unguarded.db")
    engine = sa.create_engine(f"sqlite:///{tmp_path / 'unguarded.db'}")
    with engine.connect() as connection:
        yield connection
    engine.dispose()


@pytest.fixture(scope="session")
def bench() -> Path:
    """The demo lab's bench sheets."""
    return Path(__file__).resolve().parents[2] / "demo_lab" / "bench"


@pytest.fixture(scope="session")
def sound() -> Any:
    """The function that makes a row which the table of a kind accepts."""
    return sound_values
