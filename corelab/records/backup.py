"""Copies of a lab in one file, and a lab made from such a copy.

A backup is an SQLite lab whatever the lab itself lives in: the rows, their digests and so the seal are the
same on both databases.
"""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager, suppress
from pathlib import Path

import sqlalchemy as sa

from corelab.errors import NotFound, Unavailable
from corelab.records import engine as engines
from corelab.records import history, migrate, schema, store

#: Events that add nothing which a restored lab would lack.
_HOUSEKEEPING = {"setup", "backup"}
_AT_A_TIME = 10_000


def write_backup(engine: sa.Engine, target: Path) -> str:
    """Copy a lab into a file of its own; returns the seal of what was copied.

    The copy is checked before it is given its name: a file that is there is a whole backup.

    Raises
    ------
    Unavailable
        If the copy cannot be written, or what is in it does not fit together.
    """
    part = target.with_name(f".{target.name}.part")
    with suppress(FileNotFoundError):
        part.unlink()
    try:
        source = engines.sqlite_file(engine.url)
        with engines.file_trouble_named(part):
            if source is not None:
                _copy_file(source, part)
            else:
                _copy_rows(engine, part)
        seal = _checked(part)
        os.replace(part, target)
    finally:
        for name in (part.name, f"{part.name}-wal", f"{part.name}-shm", f"{part.name}-journal"):
            with suppress(FileNotFoundError):
                part.with_name(name).unlink()
    return seal


def _copy_file(source: Path, target: Path) -> None:
    with closing(sqlite3.connect(source)) as lab, closing(sqlite3.connect(target)) as copy:
        lab.backup(copy)
        copy.execute("PRAGMA journal_mode=DELETE")  # one file, whatever happens to it


def _copy_rows(source: sa.Engine, target: Path) -> None:
    made = engines.make_engine(str(target))
    try:
        migrate.upgrade(made)
        with engines.reading(source) as lab, engines.writing(made) as copy:
            _every_row(lab, copy)
    finally:
        made.dispose()
    with closing(sqlite3.connect(target)) as copy_file:
        copy_file.execute("PRAGMA journal_mode=DELETE")


def _every_row(source: sa.Connection, target: sa.Connection) -> None:
    for table in (*schema.APPEND_ONLY, schema.result):
        order = table.primary_key.columns
        found = source.execution_options(yield_per=_AT_A_TIME).execute(sa.select(table).order_by(*order))
        for rows in found.mappings().partitions():
            store.insert(target, table, rows)


def _checked(file: Path) -> str:
    with _opened(file) as connection:
        faults = history.chain_faults(connection)
        if faults:
            raise Unavailable(
                f"the copy does not fit together ({faults[0]}; faults in all: {len(faults)}): "
                "run 'corelab verify'"
            )
        return history.last_seal(connection)


@contextmanager
def _opened(file: Path) -> Iterator[sa.Connection]:
    engine = engines.make_engine(str(file))
    try:
        with engines.reading(engine) as connection:
            yield connection
    finally:
        engine.dispose()


def lost_by_restoring(target: sa.Connection, file: Path) -> int:
    """How many events of a lab, other than set-ups and backups, are not in a backup."""
    with _opened(file) as connection:
        query = sa.select(schema.event.c.number, schema.event.c.digest)
        kept = {row.number: row.digest for row in connection.execute(query)}
    event = schema.event
    rows = target.execute(sa.select(event.c.number, event.c.digest, event.c.command))
    return sum(
        kept.get(number) != digest and command not in _HOUSEKEEPING for number, digest, command in rows
    )


@contextmanager
def readable_copy(file: Path) -> Iterator[Path]:
    """A backup's content brought to the newest schema, in a file that is gone afterwards.

    Raises
    ------
    NotFound
        If there is no such file.
    Unavailable
        If it is not a lab, is newer than the program, or does not fit together.
    """
    import tempfile

    if not file.is_file():
        raise NotFound(f"There is no backup {file}: check the path.")
    with tempfile.TemporaryDirectory(prefix="corelab-") as folder:
        copy = Path(folder) / "backup.db"
        with engines.file_trouble_named(file):
            _copy_file(file, copy)
        engine = engines.make_engine(str(copy))
        try:
            with engines.reading(engine) as connection:
                if not migrate.schema_version(connection):
                    raise Unavailable(f"{file} holds no lab: give a file made by 'corelab backup'.")
            migrate.upgrade(engine)
        finally:
            engine.dispose()
        _checked(copy)
        yield copy


def replace_file(copy: Path, target: Path) -> Path | None:
    """Put a lab's content into a file, in one transaction even where it is open elsewhere.

    Returns where what stood in the file before is kept, if anything did.
    """
    kept: Path | None = None
    if target.exists() and target.stat().st_size:
        kept = _free_name(target)
        try:
            with engines.file_trouble_named(target):
                _copy_file(target, kept)
        except Unavailable:  # too damaged to be copied page by page
            os.replace(target, kept)
            for ending in ("-wal", "-shm"):
                with suppress(FileNotFoundError):
                    target.with_name(target.name + ending).unlink()
    with (
        engines.file_trouble_named(target),
        closing(sqlite3.connect(copy)) as source,
        closing(sqlite3.connect(target)) as lab,
    ):
        source.backup(lab)
        lab.execute("PRAGMA journal_mode=WAL")
    return kept


def _free_name(target: Path) -> Path:
    number = 1
    while (name := target.with_name(f"{target.stem}.before-restore-{number}{target.suffix}")).exists():
        number += 1
    return name


def fill_server(copy: Path, engine: sa.Engine) -> None:
    """Put a lab's rows into an empty database on a server.

    Raises
    ------
    Unavailable
        If the database holds anything.
    """
    with engines.trouble_named(engine), engine.connect() as connection:
        tables = sa.inspect(connection).get_table_names()
    if tables:
        raise Unavailable(
            "On a server a backup is restored into an empty database only, and this one holds tables: make "
            "another (CREATE DATABASE) and name it with --database; nothing here was touched."
        )
    migrate.upgrade(engine)
    with _opened(copy) as source, engines.writing(engine) as target:
        _every_row(source, target)
