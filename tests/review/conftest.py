"""A working lab of ten plugs with people in every role: loaded, corrected, approved, issued."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path
from uuid import uuid4

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.lab import Lab
from corelab.records.backup import fill_server

WELL = "QB-2"
PLUGS = ("1H", "2H", "2V", "3H", "4H", "5H", "6H", "7H", "8H", "9H")
SHEETS = (
    "03 plugs", "04 descriptions", "06 masses", "07 distillation", "08 treatments", "09 dimensions",
    "10 grain volume", "11 immersion", "12 not measured", "13 gas permeability", "14 reported permeability",
)  # fmt: skip
PEOPLE = {
    "Mara Quist": "manager",
    "Runa Holt": "reviewer",
    "Tor Vale": "technician",
    "Gia Lund": "geologist",
}


@pytest.fixture(scope="session")
def ten_plugs(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Path:
    """A folder of the bench sheets of ten plugs of the demo lab."""
    folder = tmp_path_factory.mktemp("ten")
    bench = demo_folder / "bench"
    for name in ("registers.xlsx", "01 core runs.csv", "05 porosimeter calibration.csv"):
        shutil.copyfile(bench / name, folder / name)
    for name in SHEETS:
        heading, *rows = (bench / f"{name}.csv").read_text(encoding="utf-8-sig").splitlines()
        mark = ";" if heading.startswith("well;") else ","
        kept = [row for row in rows if row.split(mark)[1] in PLUGS]
        if kept:
            (folder / f"{name}.csv").write_text("\n".join([heading, *kept]) + "\n", encoding="utf-8")
    shots = "well,gun run,shot,depth [ft],tool,outcome\nQB-2,A,1,7912,percussion,misfired\n"
    (folder / "sidewall shots.csv").write_text(shots, encoding="utf-8")
    return folder


@pytest.fixture(scope="session")
def staffed_file(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, ten_plugs: Path) -> Path:
    """A lab with somebody in every role, loaded by the technician; to be copied, not written to."""
    path = tmp_path_factory.mktemp("staffed") / "lab.db"
    shutil.copyfile(sqlite_template, path)
    with open_lab(str(path), by="Mara Quist") as lab:
        for person, role in PEOPLE.items():
            lab.person_add(person, role)
        lab.by = "Tor Vale"
        lab.load([ten_plugs])
        with closing(lab.engine.raw_connection()) as connection:
            connection.cursor().execute("PRAGMA wal_checkpoint(TRUNCATE)")
    return path


@pytest.fixture
def staffed(staffed_file: Path, tmp_path: Path) -> Iterator[Lab]:
    """A copy of it, opened by the reviewer."""
    path = shutil.copyfile(staffed_file, tmp_path / "lab.db")
    with open_lab(str(path), by="Runa Holt") as lab:
        yield lab


@pytest.fixture(scope="session")
def staffed_on_server(staffed_file: Path, postgresql_server: str) -> str:
    """The same rows in a database on the server; its name, to be copied from."""
    import psycopg

    name = f"staffed_{uuid4().hex[:12]}"
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name}".encode())
    with open_lab(_address(postgresql_server, name)) as lab:
        fill_server(staffed_file, lab.engine)
    return name


def _address(server: str, database: str) -> str:
    url = sa.make_url(server).set(drivername="postgresql+psycopg", database=database)
    return url.render_as_string(hide_password=False)


@pytest.fixture(params=["sqlite", "postgresql"])
def any_staffed(request: pytest.FixtureRequest) -> Iterator[Lab]:
    """A copy of it, on each database in turn, opened by the reviewer."""
    if request.param == "sqlite":
        yield request.getfixturevalue("staffed")
        return
    import psycopg

    server = request.getfixturevalue("postgresql_server")
    template = request.getfixturevalue("staffed_on_server")
    name = f"copy_{uuid4().hex[:12]}"
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name} TEMPLATE {template}".encode())
    with open_lab(_address(server, name), by="Runa Holt") as lab:
        yield lab
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)".encode())


@pytest.fixture(scope="module")
def module_database(postgresql_server: str) -> Iterator[str]:
    """Address of a database with nothing in it, once a file of tests."""
    import psycopg

    name = f"module_{uuid4().hex[:12]}"
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name}".encode())
    yield _address(postgresql_server, name)
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)".encode())


@pytest.fixture(scope="session")
def correct() -> Callable[..., Path]:
    """Writes a sheet with another dry mass of a plug into a folder."""

    def written(folder: Path, plug: str = "1H", mass_g: float = 56.4, by: str = "Odd Pell") -> Path:
        path = folder / "masses.csv"
        heading = "well,plug,condition,mass [g],balance,measured on,measured by"
        path.write_text(f"{heading}\n{WELL},{plug},dry,{mass_g},BAL-2,2026-02-13,{by}\n", encoding="utf-8")
        return path

    return written
