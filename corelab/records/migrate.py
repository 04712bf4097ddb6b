"""Making a database and bringing it to the newest schema."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

import sqlalchemy as sa

from corelab.errors import Unavailable
from corelab.records import engine as engines
from corelab.records import history, schema

#: Tables by which a lab of whatever version is known; Alembic's own may be anybody's.
_OF_A_LAB = {"alembic_version", "event", "entry"}
_NEWER = "this lab was made by a newer corelab: install that version or a later one"


def migrations_folder() -> Path:
    """Where the migrations lie: in the installed package, else beside it in a checkout."""
    package = Path(__file__).resolve().parent.parent
    for folder in (package / "_migrations", package.parent / "migrations"):
        if (folder / "env.py").exists():
            return folder
    raise Unavailable("the migrations are missing from this installation: install corelab again")


def own_tables() -> set[str]:
    """Every table that belongs to a lab of this version."""
    return {"alembic_version", *schema.metadata.tables}


def schema_version(connection: sa.Connection) -> str:
    """The migration at which a database stands; empty where it holds no lab.

    Raises
    ------
    Unavailable
        If the database belongs to something else.
    """
    tables = set(sa.inspect(connection).get_table_names())
    if not tables:
        return ""
    if not tables >= _OF_A_LAB:
        named = ", ".join(sorted(tables - _OF_A_LAB)[:5])
        raise Unavailable(
            f"the database holds other tables ({named} …) and no lab: give corelab a database of its own"
        )
    return connection.exec_driver_sql("SELECT version_num FROM alembic_version").scalar() or ""


def require_current(connection: sa.Connection) -> None:
    """Refuse a database that is missing, older or newer than this program."""
    version = schema_version(connection)
    if version == schema.SCHEMA:
        return
    if not version:
        raise Unavailable("there is no lab in this database yet: run 'corelab setup' first")
    if version < schema.SCHEMA:
        raise Unavailable("this lab was made by an older corelab: run 'corelab setup' to bring it up to date")
    raise Unavailable(_NEWER)


def upgrade(engine: sa.Engine, target: str = "head") -> tuple[str, str, Path | None]:
    """Bring a database to `target`; returns the schema before and after, and the backup made.

    One transaction: either all of it happens or none. An SQLite file that holds a lab is copied first;
    foreign keys are off while tables are rebuilt and checked afterwards.
    """
    from alembic import command
    from alembic.config import Config
    from alembic.script import ScriptDirectory

    config = Config()
    config.set_main_option("script_location", str(migrations_folder()).replace("%", "%%"))
    config.set_main_option("path_separator", "os")
    file = engines.sqlite_file(engine.url)
    backup: Path | None = None
    known = {script.revision for script in ScriptDirectory.from_config(config).walk_revisions()}
    with engines.trouble_named(engine), engine.connect() as connection:
        with (
            _foreign_keys_off(connection),
            connection.execution_options(corelab_mode="IMMEDIATE").begin(),
        ):
            if file is None:
                connection.exec_driver_sql(f"SELECT pg_advisory_xact_lock({engines.WRITER_LOCK})")
            before = schema_version(connection)
            if before and before not in known:
                raise Unavailable(_NEWER)
            if file is not None and before and before != schema.SCHEMA:
                backup = _copy(file, before)
            config.attributes["connection"] = connection
            command.upgrade(config, target)
            after = schema_version(connection)
            if after == schema.SCHEMA and after != before:
                history.guard(connection)
            if file is not None:
                broken = connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall()
                if broken:
                    raise Unavailable(
                        f"the upgrade was undone and the lab is as it was: {len(broken)} rows would point at "
                        "nothing"
                    )
        if file is not None:
            # kept in the file, so that it is set only once the file is known for a lab
            engines.outside_transaction(connection, "journal_mode=WAL")
    return before, after, backup


@contextmanager
def _foreign_keys_off(connection: sa.Connection) -> Iterator[None]:
    """Tables can be rebuilt on SQLite under the rows that point at them; begin the transaction inside."""
    if connection.dialect.name != "sqlite":
        yield
        return
    engines.outside_transaction(connection, "foreign_keys=OFF")
    try:
        yield
    finally:
        engines.outside_transaction(connection, "foreign_keys=ON")


def _copy(file: Path, version: str) -> Path:
    target = file.with_name(f"{file.stem}.before-upgrade-from-{version}{file.suffix}")
    with closing(sqlite3.connect(file)) as source, closing(sqlite3.connect(target)) as copy:
        source.backup(copy)
    return target
