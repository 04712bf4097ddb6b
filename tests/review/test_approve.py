"""Approval: what is frozen stays, a correction waits beside it, and nobody approves what they measured.

Every value is checked against what the lab itself computed before and after; no published values.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pandas as pd
import pytest
import sqlalchemy as sa

from corelab.errors import CorelabError, NotFound, Refused, Usage
from corelab.lab import Lab
from corelab.records import schema

Correct = Callable[..., Path]
MOVED = ("porosity [v/v]", "grain density [g/cm3]", "dry mass [g]")


def of(lab: Lab, plug: str) -> dict[str, Any]:
    frame = lab.interval("QB-2", with_uncertainty=True)
    return frame[frame["plug"] == plug].iloc[0].to_dict()


def corrected(lab: Lab, tmp_path: Path, correct: Correct, plug: str = "1H", **how: Any) -> None:
    """The technician corrects the dry mass of a plug."""
    who, lab.by = lab.by, "Tor Vale"
    lab.load([correct(tmp_path, plug, **how)], reason="misread")
    lab.by = who


def same(a: dict[str, Any], b: dict[str, Any]) -> bool:
    return repr(a) == repr(b)


def test_approved_values_stay_and_say_that_a_newer_waits(
    any_staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    lab = any_staffed
    computed = of(lab, "1H")
    assert computed["status"] == "computed"
    assert lab.approve("QB-2", ["1H"], "looks right") > 5
    approved = of(lab, "1H")
    assert same(approved, computed | {"status": "approved"})
    corrected(lab, tmp_path, correct)
    waits = of(lab, "1H")
    assert waits["status"] == "newer waits"
    for column, value in approved.items():
        if column not in {"status", "flags"}:
            assert waits[column] == value or value != value, column
    results = lab.plug_show("QB-2", "1H")["results"].set_index("quantity")
    assert results.loc["grain density", "value"] != approved["grain density [g/cm3]"]

    lab.write_csv("QB-2", tmp_path / "a.csv")
    read = pd.read_csv(tmp_path / "a.csv", encoding="utf-8-sig").set_index("plug")
    lab.write_workbook("QB-2", tmp_path / "a.xlsx")
    cells = [
        [cell.value for cell in row]
        for tab in openpyxl.load_workbook(tmp_path / "a.xlsx").worksheets
        for row in tab.iter_rows()
        if any(cell.value == "1H" for cell in row)
    ]
    assert any("newer waits" in [str(v) for v in row] for row in cells)
    for column in MOVED:
        assert read.loc["1H", column] == approved[column]
        assert any(approved[column] in row for row in cells), column
    assert read.loc["1H", "status"] == "newer waits"
    assert lab.verify().faults == []

    lab.approve("QB-2", ["1H"], "the correction is right")
    after = of(lab, "1H")
    assert after["status"] == "approved"
    assert after["grain density [g/cm3]"] == results.loc["grain density", "value"]
    assert lab.verify().faults == []


def test_a_frozen_value_is_left_alone_by_settings_and_recomputing(staffed: Lab) -> None:
    staffed.approve("QB-2", ["1H"], "good")
    frozen, free = of(staffed, "1H"), of(staffed, "6H")
    staffed.by = "Mara Quist"
    staffed.setting("helium compressibility correction", "on")
    staffed.recompute()
    after = of(staffed, "1H")
    assert after["status"] in {"approved", "newer waits"}
    assert same({k: v for k, v in after.items() if k not in {"status", "flags"}},
                {k: v for k, v in frozen.items() if k not in {"status", "flags"}})  # fmt: skip
    assert after["status"] == "newer waits"
    assert not same(of(staffed, "6H"), free)
    with staffed.engine.begin() as connection:
        connection.execute(sa.delete(schema.result))
    assert of(staffed, "1H")["porosity [v/v]"] == frozen["porosity [v/v]"]
    assert len(staffed.recompute())
    assert of(staffed, "1H")["porosity [v/v]"] == frozen["porosity [v/v]"]
    assert staffed.verify().faults == []


def test_a_withdrawn_reading_leaves_the_approved_value(staffed: Lab) -> None:
    lab = staffed
    lab.approve("QB-2", ["2H"], "good")
    frozen = of(lab, "2H")
    entries = lab.plug_show("QB-2", "2H")["entries"]
    number = int(entries[entries["kind"] == "grain volume"]["number"].iloc[0])
    lab.by = "Tor Vale"
    lab.withdraw(number, "wrong plug")
    after = of(lab, "2H")
    assert after["status"] == "newer waits"
    assert after["porosity [v/v]"] == frozen["porosity [v/v]"]
    lab.by = "Runa Holt"
    waiting = lab.review("QB-2").set_index("plug")
    assert "grain density approved as" in waiting.loc["2H", "odd"]
    assert "now no value" in waiting.loc["2H", "odd"]
    lab.approve("QB-2", ["2H"], "as it is now")
    assert of(lab, "2H")["grain density [g/cm3]"] != of(lab, "2H")["grain density [g/cm3]"]


def test_what_was_approved_is_derived_again_from_the_readings_then(
    any_staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    lab = any_staffed
    quantities = ("porosity", "grain density", "klinkenberg permeability")
    before = [lab.explain("QB-2", "1H", q) for q in quantities]
    lab.approve("QB-2", ["1H"], "good")
    corrected(lab, tmp_path, correct)
    entries = lab.plug_show("QB-2", "1H")["entries"]
    lab.by = "Tor Vale"
    steps = entries[entries["kind"] == "gas permeability"]["number"]
    lab.withdraw(int(steps.iloc[0]), "a leak")
    lab.by = "Mara Quist"
    lab.setting("helium compressibility correction", "on")
    with lab._reading() as connection:
        kept = connection.execute(
            sa.select(schema.approved_result.c.quantity, schema.approved_result.c.value)
        ).all()
    for quantity, then in zip(quantities, before, strict=True):
        approved = lab.explain("QB-2", "1H", quantity, approved=True)
        assert approved == then
        assert lab.explain("QB-2", "1H", quantity) != then
        assert (quantity, approved["value"]) in [tuple(row) for row in kept]


def test_only_what_is_approved_is_explained_as_approved(staffed: Lab) -> None:
    with pytest.raises(NotFound, match="not approved"):
        staffed.explain("QB-2", "1H", "porosity", approved=True)
    staffed.approve("QB-2", ["1H"], "good")
    staffed.revoke("QB-2", ["1H"], "doubt")
    with pytest.raises(NotFound, match="not approved"):
        staffed.explain("QB-2", "1H", "porosity", approved=True)


def test_revoking_shows_what_is_computed_now(staffed: Lab, tmp_path: Path, correct: Correct) -> None:
    lab = staffed
    lab.approve("QB-2", ["1H", "2H"], "good")
    corrected(lab, tmp_path, correct)
    now = lab.plug_show("QB-2", "1H")["results"].set_index("quantity")["value"]
    lab.revoke("QB-2", ["1H"], "the scale was moved")
    after = of(lab, "1H")
    assert after["status"] == "computed"
    assert after["grain density [g/cm3]"] == now["grain density"]
    assert of(lab, "2H")["status"] == "approved"
    with pytest.raises(Refused, match="plug 1H, not approved"):
        lab.revoke("QB-2", ["1H", "2H"], "again")
    assert of(lab, "2H")["status"] == "approved"
    told = lab.history("QB-2", "1H")
    assert [w for w in told["what"] if "approv" in w] == ["approved the results", "took the approval back"]
    assert told["why"].iloc[-1] == "the scale was moved"
    assert lab.verify().faults == []


# -- nobody approves what they measured ----------------------------------------------------------------------


def refusal(lab: Lab, plugs: list[str]) -> str:
    seal = lab.seal()
    with pytest.raises(Refused) as refused:
        lab.approve("QB-2", plugs, "good")
    assert lab.seal() == seal
    return str(refused.value)


def test_who_entered_it_does_not_approve_it(staffed: Lab, tmp_path: Path, correct: Correct) -> None:
    staffed.by = "Runa Holt"
    staffed.load([correct(tmp_path, "1H")], reason="misread")
    words = refusal(staffed, ["1H", "2H"])
    assert "plug 1H, measured, entered or changed by Runa Holt" in words
    assert "2H" not in words
    staffed.by = "Mara Quist"
    staffed.approve("QB-2", ["1H"], "good")


def test_who_measured_it_does_not_approve_it(staffed: Lab, tmp_path: Path, correct: Correct) -> None:
    corrected(staffed, tmp_path, correct, "1H", by=" runa HOLT ")
    assert "nobody approves what they measured" in refusal(staffed, ["1H"])
    corrected(staffed, tmp_path, correct, "1H", by="Odd Pell", mass_g=56.5)
    staffed.approve("QB-2", ["1H"], "another measured it since")


def test_who_withdrew_from_it_does_not_approve_it(staffed: Lab) -> None:
    entries = staffed.plug_show("QB-2", "1H")["entries"]
    number = int(entries[entries["kind"] == "distillation"]["number"].iloc[0])
    staffed.withdraw(number, "wrong trap")
    assert "measured, entered or changed by Runa Holt" in refusal(staffed, ["1H"])
    staffed.by = "Mara Quist"
    staffed.approve("QB-2", ["1H"], "good")


def test_all_problems_are_named_and_nothing_is_approved(
    staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    staffed.load([correct(tmp_path, "1H")], reason="misread")
    staffed.approve("QB-2", ["3H"], "good")
    words = refusal(staffed, ["1H", "2H", "3H", "5H"])
    for plug, said in (
        ("1H", "measured, entered or changed by Runa Holt"),
        ("3H", "approved as it stands"),
        ("5H", "no result of plug"),
    ):
        assert any(plug in line and said in line for line in words.splitlines()), words
    assert set(staffed.interval("QB-2")["status"]) == {"computed", "approved"}


@pytest.mark.parametrize(
    ("act", "trouble"),
    [
        (lambda lab: lab.approve("QB-2", ["1H"], "  "), Usage),
        (lambda lab: lab.revoke("QB-2", ["1H"], ""), Usage),
        (lambda lab: lab.approve("QB-2", [], "good"), Usage),
        (lambda lab: lab.approve("QB-2", ["99H"], "good"), NotFound),
        (lambda lab: lab.approve("QB-9", ["1H"], "good"), NotFound),
        (lambda lab: lab.approve("standards", ["1H"], "good"), Usage),
    ],
)
def test_trouble_is_in_words(staffed: Lab, act: Callable[[Lab], object], trouble: type[CorelabError]) -> None:
    seal = staffed.seal()
    with pytest.raises(trouble):
        act(staffed)
    assert staffed.seal() == seal


def test_an_approval_is_a_persons(lab: Lab, ten_plugs: Path) -> None:
    lab.load([ten_plugs])
    with pytest.raises(Usage, match="Nobody is registered"):
        lab.approve("QB-2", ["1H"], "good")


def test_all_that_waits_is_approved_once(staffed: Lab) -> None:
    lab = staffed
    lab.approve("QB-2", [], "all looked at", everything=True)
    shown = lab.interval("QB-2").set_index("plug")["status"]
    assert (shown.drop("5H") == "approved").all()  # 5H crumbled
    assert lab.review("QB-2").empty
    with pytest.raises(NotFound, match="Nothing waits"):
        lab.approve("QB-2", [], "again", everything=True)


# -- what control blocks -------------------------------------------------------------------------------------


@pytest.fixture
def blocked(monkeypatch: pytest.MonkeyPatch) -> None:
    """Control holds up the plugs 1H and 2H."""

    def words(_lab: Lab, _connection: Any, identities: Any, ids: list[int]) -> dict[int, str]:
        return {i: "POR-B out of control" for i in ids if identities.name("plug", i) in {"1H", "2H"}}

    monkeypatch.setattr(Lab, "_blocked", words)


@pytest.mark.usefixtures("blocked")
def test_a_release_lets_what_is_blocked_be_approved_and_its_reason_travels(
    any_staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    lab = any_staffed
    assert "plug 1H: POR-B out of control" in refusal(lab, ["1H"])
    assert lab.review("QB-2").set_index("plug")["blocked"].to_dict()["1H"] == "POR-B out of control"
    lab.by = "Mara Quist"
    with pytest.raises(Refused, match="plug 3H, which control does not block"):
        lab.release("QB-2", ["1H", "3H"], "checked by hand")
    with pytest.raises(Usage, match="needs a reason"):
        lab.release("QB-2", ["1H"], " ")
    lab.release("QB-2", ["1H"], "checked by hand")
    words = "released by Mara Quist: checked by hand"
    assert words in of(lab, "1H")["flags"]
    assert words not in of(lab, "2H")["flags"]
    lab.by = "Runa Holt"
    assert "plug 2H" in refusal(lab, ["1H", "2H"])
    lab.approve("QB-2", ["1H"], "good")
    corrected(lab, tmp_path, correct)
    shown = of(lab, "1H")
    assert shown["status"] == "newer waits"
    assert words in shown["flags"]  # it stands with the approved value for good
    assert "plug 1H: POR-B out of control" in refusal(lab, ["1H"])  # and does not cover a later one
    lab.write_csv("QB-2", tmp_path / "a.csv")
    read = pd.read_csv(tmp_path / "a.csv", encoding="utf-8-sig").set_index("plug")
    assert words in read.loc["1H", "flags"]
    assert any("released although POR-B out of control" in w for w in lab.history("QB-2", "1H")["what"])
    assert lab.verify().faults == []


@pytest.mark.usefixtures("blocked")
def test_a_release_covers_the_results_as_they_were(staffed: Lab, tmp_path: Path, correct: Correct) -> None:
    staffed.by = "Mara Quist"
    staffed.release("QB-2", ["1H", "2H"], "checked by hand")
    corrected(staffed, tmp_path, correct)
    assert "released" not in of(staffed, "1H")["flags"]
    assert "released" in of(staffed, "2H")["flags"]
    staffed.by = "Runa Holt"
    assert "plug 1H: POR-B out of control" in refusal(staffed, ["1H", "2H"])
    staffed.approve("QB-2", ["2H"], "good")


# -- the life of a plug --------------------------------------------------------------------------------------


def test_history_tells_a_plugs_life_in_plain_words(
    any_staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    lab = any_staffed
    corrected(lab, tmp_path, correct)
    lab.approve("QB-2", ["1H"], "good")
    told = lab.history("QB-2", "1H")
    assert told["event"].is_monotonic_increasing
    assert told["at"].str.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{6}Z").all()
    first, fix, last = told.iloc[0], told.iloc[-2], told.iloc[-1]
    assert (first["person"], first["command"]) == ("Tor Vale", "sheet load")
    assert (fix["person"], fix["why"], fix["command"]) == ("Tor Vale", "misread", "sheet load")
    assert fix["what"].startswith("corrected masses #")
    assert "mass [g] 56.4" in fix["what"]
    assert (last["person"], last["what"], last["why"]) == ("Runa Holt", "approved the results", "good")
    well = lab.history("QB-2")
    assert well["what"].tolist()[-1] == "approved the results of 1H"
    with lab._reading() as connection:
        versions = connection.execute(sa.select(schema.event.c.program_version)).scalars().all()
    assert all(versions)
