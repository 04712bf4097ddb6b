"""A load that is killed, runs out of disk or finds the lab locked: wholly there or wholly absent.

With CORELAB_CAMPAIGN=full 200 loads are killed on SQLite and 60 on PostgreSQL.
"""

from __future__ import annotations

import os
import random
import shutil
import signal
import subprocess
import sys
import time
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from uuid import uuid4

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.errors import CorelabError, Unavailable
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import schema
from corelab.records.backup import write_backup

ROOT = Path(__file__).resolve().parents[2]
Campaign = Callable[[int, int], int]
FIRST = ("registers.xlsx", "01 core runs.csv", "03 plugs.csv", "06 masses.csv")
THEN = ("05 porosimeter calibration.csv", "09 dimensions.csv", "10 grain volume.csv", "07 distillation.csv")


def counts(lab: Lab) -> dict[str, int]:
    """How many rows every table has."""
    with lab._reading() as connection:
        return {
            name: connection.execute(sa.select(sa.func.count()).select_from(table)).scalar_one()
            for name, table in schema.metadata.tables.items()
        }


def digest(lab: Lab) -> tuple[str, list[tuple[object, ...]]]:
    """The seal, and every result."""
    with lab._reading() as connection:
        order = schema.result.primary_key.columns
        rows = connection.execute(sa.select(schema.result).order_by(*order)).all()
    return lab.seal(), [tuple(row) for row in rows]


@pytest.fixture(scope="module")
def begun(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, bench: Path) -> Path:
    """A lab with registers and masses, in one file."""
    folder = tmp_path_factory.mktemp("begun")
    path = shutil.copyfile(sqlite_template, folder / "work.db")
    with open_lab(str(path), by="tester") as lab:
        lab.load([bench / name for name in FIRST])
        write_backup(lab.engine, folder / "lab.db")
    return folder / "lab.db"


@pytest.fixture(scope="module")
def begun_on_server(postgresql_server: str, begun: Path) -> Iterator[str]:
    """The same on the server; the name of the database, to be copied."""
    import psycopg

    from corelab.records.backup import fill_server

    name = f"begun_{uuid4().hex[:12]}"
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name}".encode())
    with open_lab(address(postgresql_server, name)) as lab:
        fill_server(begun, lab.engine)
    yield name
    with psycopg.connect(postgresql_server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)".encode())


def address(server: str, database: str) -> str:
    url = sa.make_url(server).set(drivername="postgresql+psycopg", database=database)
    return url.render_as_string(hide_password=False)


@contextmanager
def copied(request: pytest.FixtureRequest, database: str) -> Iterator[str]:
    """The address of a fresh copy of the begun lab."""
    begun: Path = request.getfixturevalue("begun")
    if database == "sqlite":
        folder = begun.parent / uuid4().hex
        folder.mkdir()
        yield str(shutil.copyfile(begun, folder / "lab.db"))
        shutil.rmtree(folder)
        return
    import psycopg

    server, name = request.getfixturevalue("postgresql_server"), f"copy_{uuid4().hex[:12]}"
    template = request.getfixturevalue("begun_on_server")
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"CREATE DATABASE {name} TEMPLATE {template}".encode())
    yield address(server, name)
    with psycopg.connect(server, autocommit=True) as connection:
        connection.execute(f"DROP DATABASE {name} WITH (FORCE)".encode())


# -- killed --------------------------------------------------------------------------------------------------

#: Forks a warm child for every line, so that a load begins at once; tells its number, then how it ended.
NURSERY = """
import os, sys
from corelab import open_lab
def load(database, sheets):
    with open_lab(database, by="loader") as lab:
        lab.load(sheets, reason="again")
first = sys.stdin.readline().rstrip("\\n").split("\\t")
load(first[0], first[1:])
print("warm", flush=True)
for line in sys.stdin:
    database, *sheets = line.rstrip("\\n").split("\\t")
    child = os.fork()
    if not child:
        load(database, sheets)
        os._exit(0)
    print(child, flush=True)
    print(os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]), flush=True)
"""


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
@pytest.mark.parametrize("database", ["sqlite", "postgresql"])
def test_loads_killed_at_random_moments(
    request: pytest.FixtureRequest, database: str, bench: Path, campaign: Campaign
) -> None:
    many = campaign(8, 200) if database == "sqlite" else campaign(4, 60)
    luck = random.Random(many)
    sheets = [str(bench / name) for name in THEN]
    with copied(request, database) as lab_address, open_lab(lab_address, by="tester") as lab:
        absent = (counts(lab), digest(lab)[1])
        lab.load(sheets)
        there = (counts(lab), digest(lab)[1])
    nursery = subprocess.Popen(
        [sys.executable, "-c", NURSERY], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, cwd=ROOT
    )
    assert nursery.stdin is not None
    assert nursery.stdout is not None
    found = Counter[str]()

    def say(lab_address: str) -> str:
        print(lab_address, *sheets, sep="\t", file=nursery.stdin, flush=True)
        return nursery.stdout.readline().strip()  # type: ignore[union-attr]

    try:
        with copied(request, database) as lab_address:
            assert say(lab_address) == "warm"
        whole_load = 99.0
        for _ in range(3):
            with copied(request, database) as lab_address:
                began = time.perf_counter()
                say(lab_address)
                assert nursery.stdout.readline().strip() == "0"
                whole_load = min(whole_load, time.perf_counter() - began)
        for number in range(many):
            with copied(request, database) as lab_address:
                child = int(say(lab_address))
                time.sleep(luck.uniform(0.0 if number % 2 else 0.5, 1.1) * whole_load)
                with suppress(ProcessLookupError):
                    os.kill(child, signal.SIGKILL)
                ended = nursery.stdout.readline().strip()
                with open_lab(lab_address, by="tester") as lab:
                    assert lab.verify().faults == [], number
                    state = (counts(lab), digest(lab)[1])
                    assert state in (absent, there), number
                    found[f"{'there' if state == there else 'absent'}, ended {ended}"] += 1
                    if number % 5 == 0 and state == absent:
                        lab.load(sheets)
                        assert (counts(lab), digest(lab)[1]) == there
    finally:
        nursery.kill()
        nursery.wait()
    print(f"\n{database}: {dict(found)}; a load takes {whole_load:.2f} s")
    assert sum(n for words, n in found.items() if "absent" in words)


# -- the disk is full ----------------------------------------------------------------------------------------


@contextmanager
def small_disk(folder: Path, kilobytes: int) -> Iterator[Callable[[int], None]]:
    """A disk of its own at a folder, and a function that makes it larger."""
    folder.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", f"size={kilobytes}k", "tmpfs", str(folder)]
    if sys.platform != "linux" or os.geteuid() or subprocess.run(mount, capture_output=True).returncode:
        pytest.skip("only root can mount a small disk")
    try:
        yield (
            lambda size: (
                subprocess.run(["mount", "-o", f"remount,size={size}k", str(folder)], check=True) and None
            )
        )
    finally:
        subprocess.run(["umount", "--lazy", str(folder)], check=True)


@pytest.mark.parametrize("room", [0, 16, 48, 100, 160])
def test_a_load_that_fills_the_disk_leaves_the_lab_as_it_was(
    begun: Path, bench: Path, tmp_path: Path, room: int
) -> None:
    disk = tmp_path / "disk"
    size = begun.stat().st_size // 1024 + 8
    with small_disk(disk, size + room) as enlarge:
        path = shutil.copyfile(begun, disk / "lab.db")
        with open_lab(str(path), by="tester") as lab, pytest.raises(Unavailable) as refusal:
            lab.load([bench / name for name in THEN])
        assert "the disk is full" in str(refusal.value)
        enlarge(size + 20_000)
        with open_lab(str(begun)) as lab:
            before = (counts(lab), digest(lab))
        with open_lab(str(path), by="tester") as lab:
            assert lab.verify().faults == []
            assert (counts(lab), digest(lab)) == before
            lab.load([bench / name for name in THEN])
            assert lab.verify(before[1][0]).faults == []


@pytest.mark.parametrize("act", ["write", "backup", "setup", "restore", "again"])
def test_files_that_fill_the_disk_are_told(begun: Path, tmp_path: Path, act: str) -> None:
    """Nothing is issued that is not recorded, nothing half written is left under the name that was asked."""
    disk = tmp_path / "disk"
    path = shutil.copyfile(begun, tmp_path / "lab.db")
    with small_disk(disk, 16), open_lab(str(path), by="tester") as lab:
        lab.write_csv("QB-2", tmp_path / "a.csv")
        seal = lab.seal()
        (disk / "ballast").write_bytes(bytes(12 * 1024))
        acts: dict[str, Callable[[], object]] = {
            "write": lambda: lab.write_workbook("QB-2", disk / "a.xlsx"),
            "backup": lambda: lab.backup(disk / "b.db"),
            "again": lambda: lab.export_again(1, disk / "a.csv"),
            "setup": lambda: open_lab(str(disk / "new.db")).setup(),
            "restore": lambda: open_lab(str(disk / "new.db"), by="tester").restore(begun),
        }
        with pytest.raises(CorelabError) as refusal:
            acts[act]()
        assert "No space left" in str(refusal.value) or "full" in str(refusal.value)
        assert lab.seal() == seal
        assert {f.name for f in disk.iterdir() if f.stat().st_size and not f.name.startswith("new.db")} == {
            "ballast"
        }
        assert lab.verify(seal).faults == []


def test_a_file_is_not_issued_when_its_record_does_not_fit(begun: Path, tmp_path: Path) -> None:
    """The lab's disk is full, the one of the file is not."""
    disk = tmp_path / "disk"
    with small_disk(disk, begun.stat().st_size // 1024 + 8) as enlarge:
        path = shutil.copyfile(begun, disk / "lab.db")
        with open_lab(str(path), by="tester") as lab:
            seal = lab.seal()
            room = os.statvfs(disk).f_bavail * os.statvfs(disk).f_frsize
            (disk / "ballast").write_bytes(bytes(max(0, room - 8192)))
            with pytest.raises(Unavailable):
                lab.write_workbook("QB-2", tmp_path / "a.xlsx")
            assert not (tmp_path / "a.xlsx").exists()
            enlarge(20_000)
            assert lab.seal() == seal
            lab.write_workbook("QB-2", tmp_path / "a.xlsx")
            assert lab.verify(seal).faults == []


def test_a_file_is_not_issued_when_the_record_cannot_be_closed(lab: Lab, bench: Path, tmp_path: Path) -> None:
    """Trouble comes at the very end, when the transaction is to be kept."""
    lab.load([bench / name for name in FIRST])
    (tmp_path / "a.csv").write_text("older", encoding="utf-8")
    seal = lab.seal()

    def fail(connection: sa.Connection) -> None:
        if connection.get_execution_options().get("corelab_mode"):
            raise sa.exc.OperationalError("COMMIT", None, Exception("the disk is full"))

    sa.event.listen(lab.engine, "commit", fail)
    with pytest.raises(Unavailable, match="the disk is full"):
        lab.write_csv("QB-2", tmp_path / "a.csv")
    sa.event.remove(lab.engine, "commit", fail)
    assert lab.seal() == seal
    assert (tmp_path / "a.csv").read_text(encoding="utf-8") == "older"
    assert not list(tmp_path.glob(".a.csv*"))


# -- locked by another ---------------------------------------------------------------------------------------


@contextmanager
def locked(lab_address: str) -> Iterator[None]:
    """Another program that has begun to write and does not end."""
    other = engines.make_engine(lab_address)
    with engines.writing(other, keep=False):
        yield
    other.dispose()


@pytest.mark.parametrize("database", ["sqlite", "postgresql"])
def test_whoever_finds_the_lab_locked_is_told_and_changes_nothing(
    request: pytest.FixtureRequest,
    database: str,
    bench: Path,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(engines, "_WAIT_SECONDS", 0.3)
    with copied(request, database) as lab_address, open_lab(lab_address, by="tester") as lab:
        before = (counts(lab), digest(lab))
        acts: dict[str, Callable[[], object]] = {
            "load": lambda: lab.load([bench / "09 dimensions.csv"]),
            "withdraw": lambda: lab.withdraw(60, "a slip"),
            "setting": lambda: lab.setting("depth unit", "ft"),
            "person": lambda: lab.person_add("Ada", "manager"),
            "write": lambda: lab.write_csv("QB-2", tmp_path / "a.csv"),
            "backup": lambda: lab.backup(tmp_path / "b.db"),
            "recompute": lab.recompute,
        }
        with locked(lab_address):
            for act, run in acts.items():
                with pytest.raises(Unavailable, match="another program is writing to it; try again"):
                    run()
                assert (counts(lab), digest(lab)) == before, act  # and readers do not wait
        assert not (tmp_path / "a.csv").exists()
        assert not (tmp_path / "b.db").exists()
        assert lab.verify(before[1][0]).faults == []
        acts["write"]()
        assert (tmp_path / "a.csv").exists()
