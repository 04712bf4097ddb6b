"""Who may do what, held to door by door: every method that writes, every command, every role."""

from __future__ import annotations

import ast
import inspect
import io
import shutil
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa

from corelab import lab as lab_module
from corelab import open_lab
from corelab.cli import main
from corelab.errors import CorelabError, NotFound, Refused, Usage
from corelab.lab import Lab, role_table
from corelab.records import schema
from corelab.records.backup import write_backup
from corelab.review.roles import MAY

ROLE_OF = {
    "Mara Quist": "manager",
    "Runa Holt": "reviewer",
    "Tor Vale": "technician",
    "Gia Lund": "geologist",
}
#: What asks the same table and is not walked here: it needs thirty verdicts of persons to be done.
NOT_WALKED_ACT, NOT_WALKED = "recalibrate the crush likelihood", "impact_recalibrate"
LOG = Path(__file__).resolve().parents[2] / "demo_lab" / "logs" / "QB-2.las"


@dataclass(frozen=True)
class Door:
    """One thing to do: its act, the method and the command that do it; what must be so before."""

    act: str
    method: str
    run: Callable[[Lab, Path], object]
    words: Callable[[Lab, Path], list[object]]
    before: Callable[[Lab], object] = lambda lab: None
    writes: bool = True
    typed: str = ""


def _reading(lab: Lab) -> int:
    entries = lab.plug_show("QB-2", "1H")["entries"]
    return int(entries[entries["kind"] == "masses"]["number"].iloc[-1])


def _spoil(lab: Lab) -> None:
    with lab.engine.begin() as connection:
        connection.execute(sa.update(schema.result).values(value=schema.result.c.value * 2))


DOORS = {
    "load": Door(
        "load bench sheets", "load", lambda lab, p: lab.load([p / "in"], reason="again"),
        lambda lab, p: ["sheet", "load", p / "in", "--reason", "again"],
    ),
    "try a load": Door(
        "load bench sheets", "load", lambda lab, p: lab.load([p / "in"], reason="again", check=True),
        lambda lab, p: ["sheet", "load", "--check", p / "in", "--reason", "again"], writes=False,
    ),
    "describe": Door(
        "load descriptions and crush verdicts", "load", lambda lab, p: lab.load([p / "seen"]),
        lambda lab, p: ["sheet", "load", p / "seen"],
    ),
    "withdraw": Door(
        "withdraw readings", "withdraw", lambda lab, p: lab.withdraw(_reading(lab), "a slip"),
        lambda lab, p: ["withdraw", _reading(lab), "--reason", "a slip"],
    ),
    "approve": Door(
        "approve results", "approve", lambda lab, p: lab.approve("QB-2", ["2H"], "good"),
        lambda lab, p: ["approve", "QB-2", "2H", "--reason", "good"],
    ),
    "approve all": Door(
        "approve results", "approve", lambda lab, p: lab.approve("QB-2", [], "good", everything=True),
        lambda lab, p: ["approve", "QB-2", "--all", "--reason", "good"],
    ),
    "revoke": Door(
        "revoke approvals", "revoke", lambda lab, p: lab.revoke("QB-2", ["3H"], "doubt"),
        lambda lab, p: ["revoke", "QB-2", "3H", "--reason", "doubt"],
    ),
    "release": Door(
        "release what control blocks", "release", lambda lab, p: lab.release("QB-2", ["3H"], "checked"),
        lambda lab, p: ["release", "QB-2", "3H", "--reason", "checked"],
    ),
    "write csv": Door(
        "write files", "write_csv", lambda lab, p: lab.write_csv("QB-2", p / "out.csv"),
        lambda lab, p: ["write", "csv", "QB-2", "--out", p / "out.csv"],
    ),
    "write page": Door(
        "write files", "write_page", lambda lab, p: lab.write_page("QB-2", p / "out.html"),
        lambda lab, p: ["write", "page", "QB-2", "--out", p / "out.html"],
    ),
    "write las": Door(
        "write files", "write_las", lambda lab, p: lab.write_las("QB-2", p / "out.las"),
        lambda lab, p: ["write", "las", "QB-2", "--out", p / "out.las"],
    ),
    "write spwla": Door(
        "write files", "write_spwla", lambda lab, p: lab.write_spwla("QB-2", p / "out.spwla"),
        lambda lab, p: ["write", "spwla", "QB-2", "--out", p / "out.spwla"],
    ),
    "read las": Door(
        "read in logs and other laboratories' results", "read_las", lambda lab, p: lab.read_las(LOG, "QB-2"),
        lambda lab, p: ["read", "las", LOG, "--well", "QB-2"],
    ),
    "read spwla": Door(
        "read in logs and other laboratories' results", "read_spwla",
        lambda lab, p: lab.read_spwla(p / "theirs.spwla", "QB-2", laboratory="Elsewhere", unit="ft"),
        lambda lab, p: [
            "read", "spwla", p / "theirs.spwla", "--well", "QB-2",
            "--laboratory", "Elsewhere", "--unit", "ft",
        ],
    ),
    "read withdraw": Door(
        "withdraw readings", "read_withdraw", lambda lab, p: lab.read_withdraw(1, "a slip"),
        lambda lab, p: ["read", "withdraw", 1, "--reason", "a slip"],
    ),
    "match": Door(
        "match depths", "match", lambda lab, p: lab.match("QB-2", LOG),
        lambda lab, p: ["match", "QB-2", "--log", LOG],
    ),
    "shift": Door(
        "match depths", "shift", lambda lab, p: lab.shift("QB-2", "1", 0.5, "by eye"),
        lambda lab, p: ["match", "QB-2", "--run", "1", "--shift", "0.5", "--reason", "by eye"],
    ),
    "write workbook": Door(
        "write files", "write_workbook", lambda lab, p: lab.write_workbook("QB-2", p / "out.xlsx"),
        lambda lab, p: ["write", "workbook", "QB-2", "--out", p / "out.xlsx"],
    ),
    "write parquet": Door(
        "write files", "write_parquet", lambda lab, p: lab.write_parquet("QB-2", p / "out.parquet"),
        lambda lab, p: ["write", "parquet", "QB-2", "--out", p / "out.parquet"],
    ),
    "issue csv": Door(
        "issue files to a partner", "write_csv",
        lambda lab, p: lab.write_csv("QB-2", p / "out.csv", recipient="A partner"),
        lambda lab, p: ["write", "csv", "QB-2", "--out", p / "out.csv", "--for", "A partner"],
    ),
    "issue workbook": Door(
        "issue files to a partner", "write_workbook",
        lambda lab, p: lab.write_workbook("QB-2", p / "out.xlsx", recipient="A partner"),
        lambda lab, p: ["write", "workbook", "QB-2", "--out", p / "out.xlsx", "--for", "A partner"],
    ),
    "issue parquet": Door(
        "issue files to a partner", "write_parquet",
        lambda lab, p: lab.write_parquet("QB-2", p / "out.parquet", recipient="A partner"),
        lambda lab, p: ["write", "parquet", "QB-2", "--out", p / "out.parquet", "--for", "A partner"],
    ),
    "recompute": Door(
        "recompute results", "recompute", lambda lab, p: lab.recompute(), lambda lab, p: ["recompute"],
        before=_spoil,
    ),
    "entitle": Door(
        "say what partners are entitled to", "partner_set",
        lambda lab, p: lab.partner_set("A partner", columns=["porosity"]),
        lambda lab, p: ["partner", "set", "A partner", "--column", "porosity"],
    ),
    "set": Door(
        "change settings", "setting", lambda lab, p: lab.setting("depth unit", "ft"),
        lambda lab, p: ["setting", "depth unit", "ft"],
    ),
    "register": Door(
        "register people", "person_add", lambda lab, p: lab.person_add("New One", "technician"),
        lambda lab, p: ["person", "add", "New One", "--role", "technician"],
    ),
    "give another role": Door(
        "register people", "person_add", lambda lab, p: lab.person_add("Gia Lund", "manager"),
        lambda lab, p: ["person", "add", "Gia Lund", "--role", "manager"],
    ),
    "leave": Door(
        "register people", "person_leave", lambda lab, p: lab.person_leave("Old One"),
        lambda lab, p: ["person", "leave", "Old One"],
    ),
    "own password": Door(
        "set one's own password", "person_password",
        lambda lab, p: lab.person_password(lab.by, "ten letters or more"),
        lambda lab, p: ["person", "password", lab.by], typed="ten letters or more\n",
    ),
    "another's password": Door(
        "set another's password", "person_password",
        lambda lab, p: lab.person_password("Old One", "ten letters or more"),
        lambda lab, p: ["person", "password", "Old One"], typed="ten letters or more\n",
    ),
    "back up": Door(
        "back up", "backup", lambda lab, p: lab.backup(p / "out.db"), lambda lab, p: ["backup", p / "out.db"]
    ),
    "restore": Door(
        "restore", "restore", lambda lab, p: lab.restore(p / "kept.db"),
        lambda lab, p: ["restore", p / "kept.db"],
    ),
}  # fmt: skip


@pytest.fixture(scope="module")
def prepared_file(
    tmp_path_factory: pytest.TempPathFactory, staffed_file: Path, correct: Callable[..., Path]
) -> Path:
    """A folder with a lab in which each act can be done, a backup of it, and sheets to load."""
    folder = tmp_path_factory.mktemp("prepared")
    path = shutil.copyfile(staffed_file, folder / "work.db")
    with open_lab(str(path), by="Mara Quist") as lab:
        lab.person_add("Old One", "reviewer")
        lab.by = "Runa Holt"
        lab.approve("QB-2", ["3H"], "good")
        theirs = lab.write_spwla("QB-2", folder / "theirs.spwla")
        lab.read_spwla(theirs, "QB-1", laboratory="Elsewhere", unit="ft")
        write_backup(lab.engine, folder / "lab.db")
    path.unlink()
    shutil.copyfile(folder / "lab.db", folder / "kept.db")
    (folder / "in").mkdir()
    correct(folder / "in")
    (folder / "seen").mkdir()
    verdict = "well,plug,judged by,crushed\nQB-2,1H,Gia Lund,no\n"
    (folder / "seen" / "crush verdicts.csv").write_text(verdict, encoding="utf-8")
    return folder


@pytest.fixture
def place(prepared_file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A copy of it, in which control blocks the plug that was approved."""
    monkeypatch.setattr(Lab, "_blocked", _held)
    monkeypatch.chdir(tmp_path)
    return Path(shutil.copytree(prepared_file, tmp_path / "place"))


def _held(_lab: Lab, _connection: Any, identities: Any, ids: list[int]) -> dict[int, str]:
    return {i: "out of control" for i in ids if identities.name("plug", i) == "3H"}


@pytest.fixture
def quick_passwords(monkeypatch: pytest.MonkeyPatch) -> None:
    """Hashing made light, since it is done so often here; what is kept is of the same sort."""
    import argon2

    hasher = argon2.PasswordHasher
    monkeypatch.setattr(argon2, "PasswordHasher", lambda: hasher(time_cost=1, memory_cost=8, parallelism=1))


def state(lab: Lab, place: Path) -> tuple[object, ...]:
    """All that an act could change: the record, the results, the files."""
    with lab._reading() as connection:
        rows = tuple(
            connection.execute(sa.select(sa.func.count()).select_from(table)).scalar_one()
            for table in schema.metadata.tables.values()
        )
        results = connection.execute(sa.select(sa.func.sum(schema.result.c.value))).scalar_one()
    files = tuple(sorted(p.name for p in place.rglob("*") if not p.name.startswith("lab.db-")))
    return lab.seal(), rows, results, files


def allowed(door: Door, person: str) -> bool:
    return ROLE_OF[person] in MAY[door.act]


# -- the table covers everything ----------------------------------------------------------------------------


def methods_that_write() -> set[str]:
    """The public methods of the lab from which a writing transaction can be reached."""
    (tree,) = (
        node
        for node in ast.parse(inspect.getsource(lab_module)).body
        if isinstance(node, ast.ClassDef) and node.name == "Lab"
    )
    calls: dict[str, set[str]] = {}
    for function in tree.body:
        if isinstance(function, ast.FunctionDef):
            calls[function.name] = {n.attr for n in ast.walk(function) if isinstance(n, ast.Attribute)}
    reach = {name for name, used in calls.items() if used & {"writing", "_writing"}}
    while more := {name for name, used in calls.items() if used & reach} - reach:
        reach |= more
    return {name for name in reach if not name.startswith("_")}


def test_every_method_that_writes_stands_in_the_table() -> None:
    walked = {door.method for door in DOORS.values()} | {"setup"}
    assert methods_that_write() - {NOT_WALKED} == walked


def test_every_act_has_a_door() -> None:
    assert set(MAY) - {door.act for door in DOORS.values()} == {NOT_WALKED_ACT}
    source = inspect.getsource(lab_module)
    assert [act for act in MAY if f'"{act}"' not in source] == []


def test_every_act_is_for_a_manager_and_only_for_known_roles() -> None:
    for act, roles in MAY.items():
        assert {"manager"} <= roles <= set(schema.ROLES), act
    shown = role_table().set_index("act")
    assert {act: {r for r in schema.ROLES if shown.loc[act, r] == "may"} for act in MAY} == dict(MAY)


# -- every door, every role ---------------------------------------------------------------------------------


@pytest.mark.parametrize("person", ROLE_OF, ids=ROLE_OF.get)
@pytest.mark.parametrize("name", DOORS)
@pytest.mark.usefixtures("quick_passwords")
def test_the_method(place: Path, name: str, person: str) -> None:
    door = DOORS[name]
    with open_lab(str(place / "lab.db"), by=person) as lab:
        door.before(lab)
        before = state(lab, place)
        if allowed(door, person):
            door.run(lab, place)
            assert (state(lab, place) != before) == door.writes
            assert not door.writes or lab.history()["person"].iloc[-1] == person
            return
        with pytest.raises(Refused) as refusal:
            door.run(lab, place)
        assert state(lab, place) == before
    assert refusal.value.summary == f"Nothing was written: {person} may not {door.act}."
    (problem,) = refusal.value.problems
    assert problem.found == f"{person}, {ROLE_OF[person]}"
    for role in MAY[door.act]:
        assert role in problem.wanted


@pytest.fixture
def run(
    place: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., tuple[int, str]]:
    """The command as typed: exit status, and all that was said."""

    def ran(person: str, words: list[object], typed: str = "", password: str = "") -> tuple[int, str]:
        given = ["corelab", "--database", place / "lab.db", "--by", person, *words]
        monkeypatch.setattr(sys, "argv", [str(word) for word in given])
        monkeypatch.setattr(sys, "stdin", io.StringIO(typed))
        monkeypatch.setenv("CORELAB_PASSWORD", password)
        with pytest.raises(SystemExit) as left:
            main.run()
        said = capsys.readouterr()
        assert "Traceback" not in said.err
        return int(left.value.code or 0), said.out + said.err

    return ran


@pytest.mark.parametrize("name", DOORS)
@pytest.mark.usefixtures("quick_passwords")
def test_the_command(place: Path, run: Callable[..., tuple[int, str]], name: str) -> None:
    """Those who may not are refused; then one who may does it."""
    door = DOORS[name]
    with open_lab(str(place / "lab.db")) as lab:
        door.before(lab)
        before = state(lab, place)
        for person in (p for p in ROLE_OF if not allowed(door, p)):
            lab.by = person
            status, said = run(person, door.words(lab, place), door.typed)
            assert (status, state(lab, place)) == (1, before)
            assert f"Nothing was written: {person} may not {door.act}." in said
        person = next(p for p in reversed(ROLE_OF) if allowed(door, p))
        lab.by = person
        status, said = run(person, door.words(lab, place), door.typed)
        assert status == 0, said
        assert (state(lab, place) != before) == door.writes


@pytest.mark.parametrize("who", ["a stranger", "one who left", "a wrong password", "no password"])
@pytest.mark.parametrize("name", DOORS)
@pytest.mark.usefixtures("quick_passwords")
def test_nobody_else(place: Path, run: Callable[..., tuple[int, str]], name: str, who: str) -> None:
    door = DOORS[name]
    person = "Per Nobody" if who == "a stranger" else "Mara Quist"
    with open_lab(str(place / "lab.db"), by="Mara Quist") as lab:
        door.before(lab)
        if who == "one who left":
            lab.person_add("Tor Vale", "manager")
            lab.by = "Tor Vale"
            lab.person_leave("Mara Quist")
        elif who != "a stranger":
            lab.person_password("Mara Quist", "the right password")
        lab.by = person
    with open_lab(str(place / "lab.db"), by=person, password="wrong" if "wrong" in who else "") as lab:
        before = state(lab, place)
        with pytest.raises(NotFound if "password" not in who else Refused) as refusal:
            door.run(lab, place)
        words = {"a stranger": "is not registered in this lab", "one who left": "has left this lab"}
        assert words.get(who, f"{person} signs in with a password") in str(refusal.value)
        assert state(lab, place) == before
        status, said = run(person, door.words(lab, place), door.typed, "wrong" if "wrong" in who else "")
        assert (status, state(lab, place)) == (1, before)
        assert words.get(who, f"{person} signs in with a password") in said


def test_setup_is_for_anybody_and_gives_nobody_power(place: Path) -> None:
    with open_lab(str(place / "lab.db"), by="Per Nobody") as lab:
        before = state(lab, place)
        lab.setup()
        assert state(lab, place) == before
        with pytest.raises(Usage, match="People are registered already"):
            lab.setup("Per Nobody")
        assert state(lab, place) == before


# -- the first and the last manager -------------------------------------------------------------------------


def test_the_first_manager_is_made_at_setup_or_by_person_add(any_lab: Lab) -> None:
    assert any_lab.person_list().empty  # no default account
    with pytest.raises(Usage, match="must be a manager"):
        any_lab.person_add("Ada", "technician")
    any_lab.setup("Ada  Lovdal")
    assert any_lab.person_list().to_dict("records") == [
        {"person": "Ada Lovdal", "role": "manager", "password": "not set"}
    ]
    any_lab.by = "ada lovdal"
    with pytest.raises(Usage, match="only manager"):
        any_lab.person_leave("Ada Lovdal")
    with pytest.raises(Usage, match="only manager"):
        any_lab.person_add("Ada Lovdal", "reviewer")


def test_setup_with_a_manager_can_be_said_again(any_lab: Lab) -> None:
    any_lab.setup("Ada Lovdal")
    seal = any_lab.seal()
    any_lab.setup("ada lovdal")
    assert any_lab.seal() == seal
    with pytest.raises(Usage, match="People are registered already"):
        any_lab.setup("Bo")


def test_one_who_left_comes_back_only_by_a_manager(place: Path) -> None:
    with open_lab(str(place / "lab.db"), by="Mara Quist") as lab:
        lab.person_leave("Tor Vale")
        with pytest.raises(Usage, match="has left already"):
            lab.person_leave("Tor Vale")
        lab.by = "Tor Vale"
        with pytest.raises(NotFound, match="has left this lab"):
            lab.person_add("Tor Vale", "technician")
        assert len(lab.interval("QB-2"))  # whoever can open the lab may look at it
        lab.by = "Mara Quist"
        lab.person_add("Tor Vale", "technician")
        lab.by = "Tor Vale"
        lab.load([place / "in"], reason="again")
        assert lab.plug_show("QB-2", "1H")["entries"]["entered by"].iloc[-1] == "Tor Vale"


def test_trouble_is_in_words(place: Path) -> None:
    with open_lab(str(place / "lab.db"), by="Mara Quist") as lab:
        for wrong in (
            lambda: lab.person_add("", "manager"),
            lambda: lab.person_add("New", "emperor"),
            lambda: lab.person_leave("Nobody"),
            lambda: lab.person_password("Nobody", "long enough for all"),
            lambda: lab.person_password("Mara Quist", "short"),
        ):
            before = state(lab, place)
            with pytest.raises(CorelabError):
                wrong()
            assert state(lab, place) == before
