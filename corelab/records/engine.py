"""Engines and transactions: SQLite in a file, PostgreSQL for many benches."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import sqlalchemy as sa

from corelab.errors import Unavailable

OLDEST_SQLITE = (3, 37)
_WAIT_SECONDS = 120
#: Key of the advisory lock that writers on PostgreSQL take before they read the state they change.
WRITER_LOCK = 0x636F7265
_NETWORK_FILE_SYSTEMS = {"nfs", "nfs4", "cifs", "smb3", "smbfs", "9p", "fuse.sshfs", "afs", "ncpfs"}


def database_url(database: str) -> sa.URL:
    """The address of a database given as a URL or as the path of an SQLite file."""
    if "://" in database:
        url = sa.make_url(database)
        if url.get_backend_name() not in {"sqlite", "postgresql"}:
            raise Unavailable(
                f"'{url.drivername}' is not supported: give a file, or postgresql+psycopg://user@server/name"
            )
        if url.drivername == "postgresql":
            url = url.set(drivername="postgresql+psycopg")
        return url
    if not database.strip():
        raise Unavailable(f"'{database}' cannot be used as a lab: name a file, such as corelab.db")
    return sa.URL.create("sqlite", database=str(Path(database)))


def sqlite_file(url: sa.URL) -> Path | None:
    if url.get_backend_name() != "sqlite":
        return None
    if not url.database or url.database == ":memory:":
        raise Unavailable("a lab in memory would be lost at the end: give the name of a file")
    return Path(url.database)


def make_engine(database: str) -> sa.Engine:
    """An engine whose transactions begin explicitly; nothing is opened yet."""
    import sqlite3

    url = database_url(database)
    file = sqlite_file(url)
    if file is None:
        try:
            engine = sa.create_engine(url, hide_parameters=True, pool_pre_ping=True)
        except ModuleNotFoundError as missing:
            raise Unavailable(
                "PostgreSQL needs the package psycopg: install corelab[postgresql]"
            ) from missing
        sa.event.listen(engine, "connect", _postgresql_session)
        return engine
    if sqlite3.sqlite_version_info < OLDEST_SQLITE:
        raise Unavailable(
            f"SQLite {sqlite3.sqlite_version} is too old: corelab needs 3.37 or newer, which Python 3.11 and "
            "later usually bring along"
        )
    _refuse_network_share(file)
    engine = sa.create_engine(url, hide_parameters=True, connect_args={"timeout": _WAIT_SECONDS})
    sa.event.listen(engine, "connect", _sqlite_session)
    sa.event.listen(engine, "begin", _sqlite_begin)
    return engine


def _postgresql_session(connection: Any, _record: object) -> None:
    with connection.cursor() as cursor:
        cursor.execute("SET TIME ZONE 'UTC'")
        cursor.execute(f"SET lock_timeout = '{_WAIT_SECONDS}s'")
    connection.commit()


def _sqlite_session(connection: Any, _record: object) -> None:
    connection.isolation_level = None  # we begin ourselves, see _sqlite_begin
    for pragma in ("synchronous=FULL", "foreign_keys=ON", "recursive_triggers=ON"):
        connection.execute(f"PRAGMA {pragma}")


def outside_transaction(connection: sa.Connection, pragma: str) -> None:
    """Set what SQLite heeds only while no transaction is open: `connection` must not have begun."""
    driver: Any = connection.connection.driver_connection
    driver.execute(f"PRAGMA {pragma}")


def _sqlite_begin(connection: sa.Connection) -> None:
    mode = connection.get_execution_options().get("corelab_mode", "")
    connection.exec_driver_sql(f"BEGIN {mode}".strip())


def _refuse_network_share(file: Path) -> None:
    """Write-ahead logging corrupts on network shares: refuse them where they can be told."""
    where = str(file.absolute())
    kind = "a Windows share" if where.startswith(("\\\\", "//")) else ""
    mounts = Path("/proc/mounts")
    if not kind and mounts.exists():
        best = ""
        for line in mounts.read_text(encoding="utf-8", errors="replace").splitlines():
            _, point, system, *_ = line.split(" ")
            inside = where == point or where.startswith(point.rstrip("/") + "/")
            if inside and len(point) >= len(best):
                best, kind = point, system if system in _NETWORK_FILE_SYSTEMS else ""
    if kind and not os.environ.get("CORELAB_ALLOW_SHARE"):
        raise Unavailable(
            f"'{file}' lies on a network share ({kind}), where an SQLite file can be corrupted: keep it on a "
            "disk of this machine, or use PostgreSQL for several benches"
        )


@contextmanager
def reading(engine: sa.Engine) -> Iterator[sa.Connection]:
    """One consistent state, nothing written."""
    with trouble_named(engine), engine.connect() as connection:
        mode = {"postgresql_readonly": True, "isolation_level": "REPEATABLE READ"}
        options: dict[str, Any] = mode if engine.dialect.name == "postgresql" else {}
        with connection.execution_options(**options).begin():
            yield connection


@contextmanager
def writing(engine: sa.Engine, *, keep: bool = True) -> Iterator[sa.Connection]:
    """All or nothing, one writer at a time: the state read here cannot change before it is written.

    Without `keep` everything is undone at the end: a trial.
    """
    with (
        trouble_named(engine),
        engine.connect().execution_options(corelab_mode="IMMEDIATE") as connection,
        connection.begin(),
    ):
        if engine.dialect.name == "postgresql":
            connection.exec_driver_sql(f"SELECT pg_advisory_xact_lock({WRITER_LOCK})")
        yield connection
        if not keep:
            connection.rollback()


@contextmanager
def trouble_named(engine: sa.Engine) -> Iterator[None]:
    """Database trouble in words that lead on."""
    try:
        yield
    except sa.exc.OperationalError as trouble:
        said = re.sub(r"\s+", " ", str(trouble.orig))
        where = engine.url.render_as_string(hide_password=True)
        if "locked" in said or "lock timeout" in said:
            hint = "another program is writing to it; try again in a moment"
        elif "full" in said or "No space" in said:
            hint = "the disk is full; make room and try again: nothing was written"
        elif "readonly" in said or "read-only" in said:
            hint = "it is write-protected for you"
        elif "not a database" in said or "malformed" in said or "decode to UTF-8" in said:
            hint = "it is not a corelab database, or it is damaged: restore a backup"
        else:
            hint = "check that the file or the server can be reached"
        raise Unavailable(f"The database {where} cannot be used ({said.strip()}): {hint}.") from trouble
    except sa.exc.DatabaseError as trouble:
        said = re.sub(r"\s+", " ", str(trouble.orig))
        if "permission denied" in said or "must be owner" in said:
            raise Unavailable(
                f"The server does not let you do this ({said.strip()}): ask who keeps the database for a "
                "role that may; nothing was written."
            ) from trouble
        if "not a database" not in str(trouble.orig) and "malformed" not in str(trouble.orig):
            raise
        raise Unavailable(
            f"{engine.url.database} is not a database of corelab, or it is damaged: give another file, or "
            "restore a backup."
        ) from trouble


@contextmanager
def file_trouble_named(file: Path) -> Iterator[None]:
    """Trouble with an SQLite file that is copied as a whole, in words that lead on."""
    import sqlite3

    try:
        yield
    except sqlite3.Error as trouble:
        raise Unavailable(
            f"{file} cannot be used ({trouble}): it is no lab, it is damaged or in use, or its disk is full."
        ) from trouble
    except OSError as trouble:
        raise Unavailable(f"{file} cannot be used ({trouble.strerror}).") from trouble
