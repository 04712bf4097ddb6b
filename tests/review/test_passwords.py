"""Passwords: kept as argon2id hashes, asked before the record is locked, and nowhere else to be found."""

from __future__ import annotations

import re
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.cli import main
from corelab.errors import Refused, Unavailable, Usage
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import schema

SECRET = "correct horse 7!"


def test_what_is_kept_is_an_argon2id_hash_with_a_salt_of_its_own(staffed: Lab) -> None:
    from argon2 import PasswordHasher, extract_parameters
    from argon2.profiles import RFC_9106_LOW_MEMORY

    staffed.by = "Mara Quist"
    staffed.person_password("Tor Vale", SECRET)
    staffed.person_password("Gia Lund", SECRET)
    with staffed._reading() as connection:
        first, second = connection.execute(sa.select(schema.credential.c.secret)).scalars()
    assert first != second
    for kept in (first, second):
        assert kept.startswith("$argon2id$")
        assert PasswordHasher().verify(kept, SECRET)
        parameters = extract_parameters(kept)
        # RFC 9106 (2021), section 4, the second recommended option: 3 passes, 64 MiB, salt of 128 bits
        assert parameters.time_cost >= RFC_9106_LOW_MEMORY.time_cost
        assert parameters.memory_cost >= RFC_9106_LOW_MEMORY.memory_cost
        assert parameters.salt_len >= 16


def test_the_password_is_nowhere_in_the_record(staffed: Lab, tmp_path: Path) -> None:
    staffed.by = "Mara Quist"
    staffed.person_password("Runa Holt", SECRET)
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt", password=SECRET) as lab:
        lab.approve("QB-2", ["1H"], "good")
        lab.write_csv("QB-2", tmp_path / "a.csv")
        lab.backup(tmp_path / "b.db")
        assert "PASSWORD" not in " ".join(lab.history()["detail"])
        assert lab.person_list().set_index("person").loc["Runa Holt", "password"] == "set"
    found = [p for p in tmp_path.rglob("*") if p.is_file()]
    assert len(found) >= 3
    for path in found:
        assert SECRET.encode() not in path.read_bytes(), path


def test_a_password_is_asked_before_the_record_is_locked(staffed: Lab, tmp_path: Path) -> None:
    """Somebody slow at the keyboard holds up nobody."""
    staffed.by = "Mara Quist"
    staffed.person_password("Runa Holt", SECRET)
    asked: list[str] = []

    def slow(person: str) -> str:
        asked.append(person)
        with open_lab(str(tmp_path / "lab.db"), by="Mara Quist") as other:
            other.setting("depth unit", "ft")
        return SECRET

    with open_lab(str(tmp_path / "lab.db"), by="runa holt", password=slow) as lab:
        lab.approve("QB-2", ["1H"], "good")
        lab.approve("QB-2", ["2H"], "good")
    assert asked == ["Runa Holt"]  # once is enough while the lab is open
    assert staffed.history()["command"].tolist()[-3:] == ["setting", "approve", "approve"]


def test_reading_needs_no_password(staffed: Lab, tmp_path: Path) -> None:
    staffed.by = "Mara Quist"
    staffed.person_password("Runa Holt", SECRET)
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt") as lab:
        assert len(lab.interval("QB-2"))
        assert lab.verify().faults == []


def test_a_changed_password_ends_what_the_old_one_opened(staffed: Lab, tmp_path: Path) -> None:
    staffed.by = "Mara Quist"
    staffed.person_password("Runa Holt", SECRET)
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt", password=SECRET) as lab:
        lab.approve("QB-2", ["1H"], "good")
        staffed.person_password("Runa Holt", "another one, longer")
        with pytest.raises(Refused, match="Runa Holt signs in with a password"):
            lab.approve("QB-2", ["2H"], "good")
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt", password="another one, longer") as lab:
        lab.approve("QB-2", ["2H"], "good")
        lab.person_password("Runa Holt", "a third one, by herself")
        lab.approve("QB-2", ["3H"], "good")  # whoever set it is signed in with it
    assert staffed.verify().faults == []


def test_a_password_set_between_the_asking_and_the_writing_counts(
    staffed: Lab, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt") as lab:
        signed_in = lab._sign_in

        def then_set() -> None:
            signed_in()
            staffed.by = "Mara Quist"
            staffed.person_password("Runa Holt", SECRET)

        monkeypatch.setattr(lab, "_sign_in", then_set)
        before = len(staffed.history())
        with pytest.raises(Unavailable, match="was set a moment ago"):
            lab.approve("QB-2", ["1H"], "good")
    assert len(staffed.history()) == before + 1


@pytest.mark.parametrize("password", ["", " ", "nine char", "\udcff not text \udcff"])
def test_what_cannot_be_a_password(staffed: Lab, password: str) -> None:
    seal = staffed.seal()
    with pytest.raises(Usage, match="A password"):
        staffed.person_password("Runa Holt", password)
    assert staffed.seal() == seal


def test_bytes_that_are_no_text_do_not_sign_in(staffed: Lab, tmp_path: Path) -> None:
    staffed.person_password("Runa Holt", SECRET)
    with open_lab(str(tmp_path / "lab.db"), by="Runa Holt", password="\udcff") as lab, pytest.raises(Refused):
        lab.approve("QB-2", ["1H"], "good")


Said = Callable[..., str]


@pytest.fixture
def said(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path) -> Said:
    """All that a command line says."""
    monkeypatch.chdir(tmp_path)

    def run(*words: str) -> str:
        monkeypatch.setattr(sys, "argv", ["corelab", *words])
        with pytest.raises(SystemExit):
            main.run()
        shown = capsys.readouterr()
        return shown.out + shown.err

    return run


def test_a_servers_password_stays_out_of_what_is_said_and_logged(
    postgresql_database: str, said: Said, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    url = sa.make_url(postgresql_database).set(password="hush-hush")
    address = url.render_as_string(hide_password=False)
    assert "hush-hush" in address
    words = said("--database", address, "setup")
    assert "is up to date" in words
    assert "hush" not in words

    def broken(*_: object) -> None:
        raise ZeroDivisionError(address)

    monkeypatch.setattr(engines, "reading", broken)
    words = said("--database", address, "well", "list")
    assert "should not have happened" in words
    log = (tmp_path / "corelab.log").read_text(encoding="utf-8")
    assert re.search(r"postgresql\+psycopg://postgres:\*\*\*@.* well list", log)
    assert "hush" not in log + words
