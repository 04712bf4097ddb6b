"""Backups: whole while the lab is written to, restored on either database, never over a newer lab untold."""

from __future__ import annotations

import shutil
import sqlite3
import threading
from collections.abc import Callable
from contextlib import closing
from pathlib import Path
from uuid import uuid4

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.errors import CorelabError, NotFound, Refused, Unavailable, Usage
from corelab.lab import Lab
from corelab.records import history, migrate, schema
from corelab.records.backup import write_backup
from corelab.review import roles

FIRST = ("registers.xlsx", "01 core runs.csv", "03 plugs.csv", "06 masses.csv")


def rows(lab: Lab) -> dict[str, list[tuple[object, ...]]]:
    """Every row of every table but the last event, by table."""
    with lab._reading() as connection:
        found = {}
        for name, table in schema.metadata.tables.items():
            query = sa.select(table).order_by(*table.primary_key.columns)
            found[name] = [tuple(row) for row in connection.execute(query)]
        return found


def grown(lab: Lab, bench: Path) -> Lab:
    lab.load([bench / name for name in FIRST])
    return lab


# -- both databases, both directions ------------------------------------------------------------------------


@pytest.mark.parametrize("to", ["sqlite", "postgresql"])
def test_a_lab_moves_between_databases_row_for_row(
    full_lab: Lab,
    to: str,
    tmp_path: Path,
    request: pytest.FixtureRequest,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """Something in every cell, from each database to each."""
    monkeypatch.setattr(roles, "check_password", lambda *_: None)  # the one kept there is nobody's
    write_backup(full_lab.engine, tmp_path / "kept.db")
    seal, before = full_lab.seal(), rows(full_lab)
    target = str(tmp_path / "new.db") if to == "sqlite" else request.getfixturevalue("empty_postgresql")
    with open_lab(target, by="Ada") as lab:
        done = lab.restore(tmp_path / "kept.db")
        assert (done.seal, done.lost, done.kept) == (seal, 0, None)
        after = rows(lab)
        restored = after["event"].pop()
        assert after == before
        assert restored[3] == "restore"
        with lab._reading() as connection:
            assert history.chain_faults(connection) == []
            assert history.guard_faults(connection) == []
        write_backup(lab.engine, tmp_path / "back.db")
    with open_lab(str(tmp_path / "back.db")) as lab:
        assert rows(lab)["entry"] == before["entry"]


@pytest.mark.parametrize("way", ["there", "back"])
def test_a_restored_lab_works_on(
    way: str, sqlite_database: str, postgresql_database: str, empty_postgresql: str,
    bench: Path, tmp_path: Path,
) -> None:  # fmt: skip
    source, target = (
        (sqlite_database, empty_postgresql)
        if way == "there"
        else (postgresql_database, str(tmp_path / "new.db"))
    )
    with open_lab(source, by="Ada") as lab:
        grown(lab, bench)
        seal = lab.backup(tmp_path / "kept.db")
        assert lab.history()["command"].iloc[-1] == "backup"
        shown = lab.interval("QB-2")
    with open_lab(target, by="Ada") as lab:
        lab.restore(tmp_path / "kept.db")
        assert lab.verify(seal).faults == []
        assert lab.interval("QB-2").equals(shown)
        assert lab.recompute(check=True).empty
        lab.load([bench / "09 dimensions.csv"])
        assert lab.verify(seal).faults == []


def test_a_backup_is_one_file_with_the_seal_it_says(any_lab: Lab, bench: Path, tmp_path: Path) -> None:
    lab = grown(any_lab, bench)
    before = lab.seal()
    assert lab.backup(tmp_path / "kept.db") == before
    assert [p.name for p in tmp_path.glob("*kept*")] == ["kept.db"]
    with open_lab(str(tmp_path / "kept.db")) as copy:
        assert copy.verify(before).faults == []
    assert lab.verify(before).faults == []
    with pytest.raises(Usage, match="is there already"):
        lab.backup(tmp_path / "kept.db")
    with pytest.raises(Unavailable, match="There is no folder"):
        lab.backup(tmp_path / "nowhere" / "kept.db")


def test_a_backup_taken_while_others_write_is_whole(any_lab: Lab, bench: Path, tmp_path: Path) -> None:
    lab = grown(any_lab, bench)
    address = lab.engine.url.render_as_string(hide_password=False)
    stop, written, trouble = threading.Event(), [0], list[BaseException]()

    def writes() -> None:
        try:
            with open_lab(address, by="writer") as other:
                while not stop.is_set():
                    other.setting("laboratory name", f"name {written[0]}")
                    written[0] += 1
        except BaseException as fault:
            trouble.append(fault)

    writer = threading.Thread(target=writes)
    writer.start()
    seals = []
    for number in range(4):
        while written[0] < 3 * (number + 1) and not trouble:
            stop.wait(0.01)
        seals.append(lab.backup(tmp_path / f"{number}.db"))
    stop.set()
    writer.join()
    assert trouble == []
    assert len(set(seals)) == 4
    for number, seal in enumerate(seals):
        with open_lab(str(tmp_path / f"{number}.db")) as copy:
            assert copy.seal() == seal
            assert copy.verify(seal).faults == []
        with lab._reading() as connection:  # each is a state that the lab was in
            digest = connection.execute(
                sa.select(schema.event.c.digest).where(schema.event.c.number == int(seal.split("-")[0]))
            ).scalar_one()
        assert seal.endswith(digest)
    assert lab.verify(seals[0]).faults == []


def test_a_lab_that_does_not_fit_together_is_not_backed_up(lab: Lab, bench: Path, tmp_path: Path) -> None:
    grown(lab, bench)
    with lab.engine.begin() as connection:
        connection.exec_driver_sql("DROP TRIGGER masses_no_update")
        connection.exec_driver_sql("UPDATE masses SET mass_g = mass_g + 1")
    with pytest.raises(Unavailable, match=r"does not fit together .* run 'corelab verify'"):
        lab.backup(tmp_path / "kept.db")
    assert not list(tmp_path.glob("*kept*"))


# -- never over a newer lab untold --------------------------------------------------------------------------


def test_a_newer_lab_is_not_restored_over_untold(lab: Lab, bench: Path, tmp_path: Path) -> None:
    grown(lab, bench)
    seal = lab.backup(tmp_path / "kept.db")
    lab.setting("depth unit", "ft")
    lab.setting("laboratory name", "Newer")
    newer, before = lab.seal(), rows(lab)
    with pytest.raises(Refused, match=r"2 events .* --over-newer") as refusal:
        lab.restore(tmp_path / "kept.db")
    assert refusal.value.summary == "Nothing was restored: the lab is newer than the backup."
    assert rows(lab) == before
    assert not list(tmp_path.glob("*before-restore*"))
    done = lab.restore(tmp_path / "kept.db", over_newer=True)
    assert (done.seal, done.lost) == (seal, 2)
    assert done.kept is not None
    assert lab.verify(seal).faults == []
    assert lab.verify(newer).faults  # what came after the backup is gone from here …
    with open_lab(str(done.kept)) as kept:
        assert kept.verify(newer).faults == []  # … and kept beside it
    event = lab.history().iloc[-1]
    assert event["command"] == "restore"
    assert '"events not in it": 2' in event["detail"]


def test_a_lab_that_gained_nothing_since_is_restored_without_a_word(
    lab: Lab, bench: Path, tmp_path: Path
) -> None:
    grown(lab, bench)
    lab.backup(tmp_path / "kept.db")
    lab.backup(tmp_path / "later.db")
    assert lab.restore(tmp_path / "kept.db").lost == 0
    assert lab.verify().faults == []


def test_another_lab_is_not_restored_over_untold(
    lab: Lab, bench: Path, tmp_path: Path, sqlite_template: Path
) -> None:
    other = shutil.copyfile(sqlite_template, tmp_path / "other.db")
    grown(lab, bench)
    with pytest.raises(Refused, match=r"events in .* that the backup does not hold"):
        lab.restore(other)


def test_a_server_that_holds_anything_is_left_alone(
    any_lab: Lab, postgresql_database: str, tmp_path: Path
) -> None:
    any_lab.backup(tmp_path / "kept.db")
    with open_lab(postgresql_database, by="Ada") as lab:
        before = rows(lab)
        for over_newer in (False, True):
            with pytest.raises(Unavailable, match="empty database only"):
                lab.restore(tmp_path / "kept.db", over_newer=over_newer)
        assert rows(lab) == before


def test_a_restore_is_seen_by_who_has_the_lab_open(lab: Lab, bench: Path, tmp_path: Path) -> None:
    seal = lab.backup(tmp_path / "kept.db")
    grown(lab, bench)
    address = lab.engine.url.render_as_string(hide_password=False)
    with open_lab(address, by="reader") as other:
        assert len(other.well_list()) == 2
        lab.restore(tmp_path / "kept.db", over_newer=True)
        assert other.well_list().empty
        grown(other, bench)
        assert other.verify(seal).faults == []


# -- what is no backup --------------------------------------------------------------------------------------


def _cut_short(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:-5000])


def _overwritten(path: Path) -> None:
    data = bytearray(path.read_bytes())
    data[len(data) // 2 :] = b"\xff" * (len(data) - len(data) // 2)
    path.write_bytes(data)


def _altered(path: Path) -> None:
    with closing(sqlite3.connect(path)) as connection, connection:
        connection.execute("DROP TRIGGER masses_no_update")
        connection.execute("UPDATE masses SET mass_g = mass_g + 1")


def _of_something_else(path: Path) -> None:
    path.unlink()
    with closing(sqlite3.connect(path)) as connection, connection:
        connection.execute("CREATE TABLE recipe (name TEXT)")


def _text(path: Path) -> None:
    path.write_text("not a lab at all\n" * 500, encoding="utf-8")


def _newer(path: Path) -> None:
    with closing(sqlite3.connect(path)) as connection, connection:
        connection.execute("UPDATE alembic_version SET version_num = '9999'")


@pytest.mark.parametrize("to", ["sqlite", "postgresql"])
@pytest.mark.parametrize(
    "spoil",
    [_cut_short, _overwritten, _altered, _of_something_else, _text, _newer, Path.unlink,
     lambda path: path.write_bytes(b"")],
    ids=["cut", "overwritten", "altered", "other", "text", "newer", "missing", "empty"],
)  # fmt: skip
def test_what_is_no_backup_is_refused_and_changes_nothing(
    lab: Lab, bench: Path, tmp_path: Path, request: pytest.FixtureRequest,
    spoil: Callable[[Path], object], to: str,
) -> None:  # fmt: skip
    grown(lab, bench)
    lab.backup(tmp_path / "kept.db")
    spoil(tmp_path / "kept.db")
    if to == "postgresql":
        with open_lab(request.getfixturevalue("empty_postgresql"), by="Ada") as target:
            with pytest.raises(CorelabError):
                target.restore(tmp_path / "kept.db")
            with target.engine.connect() as connection:
                assert sa.inspect(connection).get_table_names() == []
        return
    before = rows(lab)
    with pytest.raises((Unavailable, NotFound)):
        lab.restore(tmp_path / "kept.db", over_newer=True)
    assert rows(lab) == before
    assert not list(tmp_path.glob("*before-restore*"))


def test_a_lab_is_not_its_own_backup(lab: Lab) -> None:
    with pytest.raises(Usage, match="same file"):
        lab.restore(str(lab.engine.url.database))


def test_a_damaged_lab_is_replaced_only_when_told_and_kept(lab: Lab, bench: Path, tmp_path: Path) -> None:
    grown(lab, bench)
    seal = lab.backup(tmp_path / "kept.db")
    path = Path(str(lab.engine.url.database))
    lab.close()
    for ending in ("-wal", "-shm"):
        path.with_name(path.name + ending).unlink(missing_ok=True)
    path.write_bytes(b"\xff" * 50_000)
    with open_lab(str(path), by="tester") as broken:
        with pytest.raises(Unavailable):
            broken.restore(tmp_path / "kept.db")
        assert path.read_bytes() == b"\xff" * 50_000
        done = broken.restore(tmp_path / "kept.db", over_newer=True)
        assert done.kept is not None
        assert done.kept.read_bytes() == b"\xff" * 50_000
        assert broken.verify(seal).faults == []


@pytest.fixture
def older(tmp_path: Path) -> Path:
    """A lab at the first schema, as an earlier version of the program left it."""
    path = tmp_path / "older.db"
    with open_lab(str(path), by="Ada") as lab:
        migrate.upgrade(lab.engine, "0001")
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA journal_mode=DELETE")
    return path


@pytest.mark.parametrize("to", ["sqlite", "postgresql"])
def test_a_backup_of_an_older_lab_is_brought_up_to_date(
    older: Path, tmp_path: Path, to: str, request: pytest.FixtureRequest, bench: Path
) -> None:
    content = older.read_bytes()
    target = str(tmp_path / "new.db") if to == "sqlite" else request.getfixturevalue("empty_postgresql")
    with open_lab(target, by="Ada") as lab:
        lab.restore(older)
        lab.setup()
        grown(lab, bench)
        assert lab.verify().faults == []
    assert older.read_bytes() == content


# -- who may ------------------------------------------------------------------------------------------------


def test_without_a_lab_here_the_backups_own_people_decide(
    lab: Lab, tmp_path: Path, empty_postgresql: str
) -> None:
    lab.person_add("Ada", "manager")
    lab.by = "Ada"
    lab.person_add("Bo", "technician")
    lab.person_password("Ada", "long enough for all")
    with open_lab(str(lab.engine.url.database), by="Bo") as other:
        other.backup(tmp_path / "kept.db")
    for target in (str(tmp_path / "new.db"), empty_postgresql):
        for by, password in (("Bo", ""), ("Cy", ""), ("Ada", ""), ("Ada", "wrong")):
            with open_lab(target, by=by, password=password) as new, pytest.raises((Refused, NotFound)):
                new.restore(tmp_path / "kept.db")
        with open_lab(target, by="Ada", password="long enough for all") as new:
            new.restore(tmp_path / "kept.db")
            assert new.history()["person"].iloc[-1] == "Ada"
    assert not (tmp_path / "new.db.part").exists()


def test_a_lab_of_nobody_is_backed_up_and_restored_by_whoever_works_there(
    any_lab: Lab, bench: Path, tmp_path: Path
) -> None:
    grown(any_lab, bench).backup(tmp_path / "kept.db")
    with open_lab(str(tmp_path / f"{uuid4().hex}.db"), by="anybody") as new:
        new.restore(tmp_path / "kept.db")
        assert new.history()["person"].iloc[-1] == "anybody"
