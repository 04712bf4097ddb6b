"""Transactions: all or nothing, one writer at a time, and trouble in words that lead on."""

from __future__ import annotations

import random
import shutil
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.bench import compute
from corelab.errors import Unavailable
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import history, schema, store

ROOT = Path(__file__).resolve().parents[2]
Write = Callable[..., Path]
MASSES = "well,plug,condition,mass [g],measured on"


def counts(lab: Lab) -> dict[str, int]:
    """How many rows every table has."""
    with lab._reading() as connection:
        query = {
            name: sa.select(sa.func.count()).select_from(t) for name, t in schema.metadata.tables.items()
        }
        return {name: connection.execute(q).scalar_one() for name, q in query.items()}


def whole(lab: Lab) -> bool:
    with lab._reading() as connection:
        faults = history.chain_faults(connection)
    return faults == [] and lab.recompute(check=True).empty


def well(write: Write, plugs: int) -> list[Path]:
    names = [f"P{n}" for n in range(plugs)]
    return [
        write("wells", "well,depth unit", "W-1,m"),
        write("core runs", "well,run,top depth [m],base depth [m],recovered length [m]", "W-1,1,100,109,9"),
        write("plugs", "well,plug,from,run,depth [m]", *(f"W-1,{p},core,1,101" for p in names)),
    ]


# -- all or nothing -----------------------------------------------------------------------------------------


def test_a_load_that_fails_half_way_leaves_nothing(
    any_lab: Lab, write_sheet: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    before = counts(any_lab)

    def broken(connection: sa.Connection, *_: object) -> None:
        assert connection.execute(sa.select(sa.func.count()).select_from(schema.plug)).scalar_one() == 3
        raise RuntimeError("half way")

    with monkeypatch.context() as patched:
        patched.setattr(compute, "keep", broken)
        with pytest.raises(RuntimeError, match="half way"):
            any_lab.load(well(write_sheet, 3))
    assert counts(any_lab) == before
    any_lab.load(well(write_sheet, 3))
    assert counts(any_lab)["plug"] == 3
    assert whole(any_lab)


LOADING = """
import sys
from corelab import open_lab
with open_lab(sys.argv[1], by="loader") as lab:
    lab.load(sys.argv[2:], told=lambda text: print(text, flush=True))
print("done", flush=True)
"""


def loading(database: str, *sheets: Path) -> subprocess.Popen[str]:
    command = [sys.executable, "-c", LOADING, database, *map(str, sheets)]
    return subprocess.Popen(command, stdout=subprocess.PIPE, text=True, cwd=ROOT)


def test_a_killed_load_is_wholly_there_or_wholly_absent(
    tmp_path: Path, sqlite_template: Path, bench: Path
) -> None:
    chance = random.Random(20260314)
    files = [tmp_path / f"lab{n}.db" for n in range(5)]
    for file in files:
        shutil.copyfile(sqlite_template, file)
        process = loading(str(file), bench)
        assert process.stdout is not None
        for line in process.stdout:
            if line.startswith("checking"):
                break
        time.sleep(chance.uniform(0.0, 0.9))
        process.kill()
        process.wait()
        process.stdout.close()
    for file in files:
        with open_lab(str(file), by="tester") as lab:
            with lab._reading() as connection:
                assert history.chain_faults(connection) == []
            held = counts(lab)
            assert (held["event"], held["entry"] > 2000, held["result"] > 500) in {
                (1, False, False),
                (2, True, True),
            }
            assert lab.recompute(check=True).empty


KILLED_INSIDE = """
import os, signal, sys
from corelab import open_lab
from corelab.bench import compute
from corelab.records import history
add, keep = history.add_event, compute.keep
def after(step):
    def run(*args, **more):
        step(*args, **more)
        os.kill(os.getpid(), signal.SIGKILL)
    return run
history.add_event, compute.keep = (after(add), keep) if sys.argv[2] == "event" else (add, after(keep))
with open_lab(sys.argv[1], by="loader") as lab:
    lab.load(sys.argv[3:])
"""


@pytest.mark.parametrize("moment", ["results", "event"])
def test_a_load_killed_before_its_end_is_absent(any_lab: Lab, write_sheet: Write, moment: str) -> None:
    before = counts(any_lab)
    address = any_lab.engine.url.render_as_string(hide_password=False)
    sheets = map(str, well(write_sheet, 3))
    command = [sys.executable, "-c", KILLED_INSIDE, address, moment, *sheets]
    assert subprocess.run(command, cwd=ROOT, timeout=60).returncode == -9
    assert counts(any_lab) == before
    assert whole(any_lab)


# -- one writer at a time -----------------------------------------------------------------------------------


def test_several_processes_loading_at_once_lose_nothing(
    any_lab: Lab, write_sheet: Write, tmp_path: Path
) -> None:
    many = 4 if any_lab.engine.dialect.name == "sqlite" else 6
    any_lab.load(well(write_sheet, many))
    address = any_lab.engine.url.render_as_string(hide_password=False)
    loads = []
    for n in range(many):
        rows = [f"W-1,P{n},dry,{50 + n}.{day:02},2026-03-{day:02}" for day in range(1, 26)]
        loads.append(loading(address, write_sheet("masses", MASSES, *rows, folder=tmp_path / str(n))))
    said = [process.communicate(timeout=90)[0] for process in loads]
    assert all(text.endswith("done\n") for text in said)
    assert counts(any_lab)["masses"] == 25 * many
    assert counts(any_lab)["event"] == 2 + many
    assert list(any_lab.history()["number"]) == list(range(1, 3 + many))
    assert whole(any_lab)


@contextmanager
def held(lab: Lab) -> Iterator[None]:
    """Another connection that has begun to write."""
    other = engines.make_engine(lab.engine.url.render_as_string(hide_password=False))
    with engines.writing(other):
        yield
    other.dispose()


def test_a_lab_held_by_another_writer_is_unavailable_not_broken(
    any_lab: Lab, write_sheet: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    sheets = well(write_sheet, 1)
    monkeypatch.setattr(engines, "_WAIT_SECONDS", 1)
    address = any_lab.engine.url.render_as_string(hide_password=False)
    with open_lab(address, by="tester") as waiting, held(any_lab):
        with pytest.raises(Unavailable, match="another program is writing to it; try again") as refusal:
            waiting.load(sheets)
        assert "INSERT" not in str(refusal.value)
        assert waiting.seal()  # readers do not wait
    any_lab.load(sheets)
    assert whole(any_lab)


def test_a_reader_sees_one_state_while_another_writes(any_lab: Lab, write_sheet: Write) -> None:
    with any_lab._reading() as connection:
        before = history.last_seal(connection)
        any_lab.load(well(write_sheet, 1))
        assert history.last_seal(connection) == before
    assert any_lab.seal() != before


def test_a_reader_cannot_write_on_a_server(empty_postgresql: str) -> None:
    engine = engines.make_engine(empty_postgresql)
    with (
        pytest.raises(sa.exc.DatabaseError, match="read-only"),
        engines.reading(engine) as connection,
    ):
        connection.exec_driver_sql("CREATE TABLE a (b INTEGER)")
    engine.dispose()


# -- the settings of a connection, and words for trouble ----------------------------------------------------


def test_an_sqlite_lab_is_kept_safe(lab: Lab) -> None:
    wanted = {"journal_mode": "wal", "synchronous": 2, "foreign_keys": 1, "recursive_triggers": 1}
    with lab.engine.connect() as connection:
        found = {name: connection.exec_driver_sql(f"PRAGMA {name}").scalar() for name in wanted}
    assert found == wanted


@pytest.mark.parametrize(
    ("database", "words"),
    [
        ("mysql://server/lab", "not supported"),
        (":memory:", "give the name of a file"),
        ("sqlite://", "give the name of a file"),
    ],
)
def test_a_database_of_another_sort_is_refused(database: str, words: str) -> None:
    with pytest.raises(Unavailable, match=words):
        engines.make_engine(database)


def test_a_damaged_file_is_named(sqlite_database: str) -> None:
    with open(sqlite_database, "r+b") as file:
        file.seek(4096)
        file.write(b"\xff" * 200_000)
    with open_lab(sqlite_database) as lab, pytest.raises(Unavailable, match="restore a backup"):
        lab.history()


def test_trouble_in_a_bulk_copy_is_named_like_any_other(any_lab: Lab) -> None:
    row = {c.name: 1 for c in schema.well.c} | {"name": None}
    with pytest.raises(sa.exc.IntegrityError), any_lab._writing("load bench sheets") as (connection, _):
        store.insert(connection, schema.well, [row])


def test_the_password_of_a_server_stays_out_of_messages(postgresql_database: str) -> None:
    url = sa.make_url(postgresql_database).set(database="not_there", password="secret")
    engine = engines.make_engine(url.render_as_string(hide_password=False))
    with pytest.raises(Unavailable) as refusal, engines.reading(engine):
        pass
    assert "not_there" in str(refusal.value)
    assert "secret" not in str(refusal.value)
