"""Corrections and withdrawals: nothing is overwritten, one entry at most is in force, results follow."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pytest
import sqlalchemy as sa

from corelab.errors import NotFound, Refused, Usage
from corelab.lab import Lab
from corelab.records import history, schema, store

Write = Callable[..., Path]
MASSES = "well,plug,condition,mass [g],measured on"


def load(lab: Lab, sheet: Path, reason: str = "") -> None:
    lab.load([sheet], reason=reason)


@pytest.fixture
def plug_lab(any_lab: Lab, write_sheet: Write) -> Lab:
    """One plug with one dry mass of 50 g."""
    sheets = [
        write_sheet("wells", "well,depth unit", "W-1,m"),
        write_sheet(
            "core runs", "well,run,top depth [m],base depth [m],recovered length [m]", "W-1,1,100,105,5"
        ),
        write_sheet("plugs", "well,plug,from,run,depth [m]", "W-1,1H,core,1,101"),
        write_sheet("masses", MASSES, "W-1,1H,dry,50,2026-03-14"),
    ]
    any_lab.load(sheets)
    return any_lab


def masses(lab: Lab) -> pd.DataFrame:
    """The masses in force."""
    with lab._reading() as connection:
        return store.in_force(connection, "masses")


def dry_mass(lab: Lab) -> float:
    return float(lab.interval("W-1")["dry mass [g]"].iloc[0])


def whole(lab: Lab) -> bool:
    """Results follow from the readings in force, and the chain from the rows."""
    with lab._reading() as connection:
        return lab.recompute(check=True).empty and history.chain_faults(connection) == []


def test_a_reading_is_in_force_once_loaded(plug_lab: Lab) -> None:
    assert masses(plug_lab)["mass_g"].tolist() == [50.0]
    assert dry_mass(plug_lab) == 50.0
    assert whole(plug_lab)


def test_the_same_again_changes_nothing(plug_lab: Lab, write_sheet: Write) -> None:
    seal = plug_lab.seal()
    load(plug_lab, write_sheet("masses", MASSES, "w-1,1h,dry,50.0,2026-03-14"))
    assert plug_lab.seal() == seal


def test_other_entries_need_a_reason(plug_lab: Lab, write_sheet: Write) -> None:
    seal = plug_lab.seal()
    with pytest.raises(Refused, match="--reason"):
        load(plug_lab, write_sheet("masses", MASSES, "W-1,1H,dry,51,2026-03-14"))
    assert plug_lab.seal() == seal


def test_a_correction_takes_the_place_of_what_it_corrects(plug_lab: Lab, write_sheet: Write) -> None:
    (old,) = masses(plug_lab)["id"]
    load(plug_lab, write_sheet("masses", MASSES, "W-1,1H,dry,51,2026-03-14"), "misread")
    with plug_lab._reading() as connection:
        (new,) = store.in_force(connection, "masses")["id"]
        row = store.entry_row(connection, int(new))
        replaced = store.entry_row(connection, int(old))
    assert row is not None
    assert replaced is not None
    assert (row["supersedes"], row["in_force"], replaced["in_force"]) == (old, True, False)
    assert (row["values"]["mass_g"], replaced["values"]["mass_g"]) == (51.0, 50.0)
    assert dry_mass(plug_lab) == 51.0
    assert whole(plug_lab)


def test_nothing_is_superseded_twice(plug_lab: Lab, write_sheet: Write) -> None:
    (old,) = masses(plug_lab)["id"]
    load(plug_lab, write_sheet("masses", MASSES, "W-1,1H,dry,51,2026-03-14"), "misread")
    again = store.NewEntry(schema.WITHDRAWAL, {}, {}, supersedes=int(old))
    with (
        pytest.raises(sa.exc.DatabaseError, match=r"never changed|uq_entry_supersedes"),
        plug_lab._writing("load bench sheets") as (connection, _),
    ):
        store.Change.begin(connection).entries([again])


def test_a_withdrawn_reading_is_out_of_force_and_its_result_is_gone(plug_lab: Lab) -> None:
    (number,) = masses(plug_lab)["id"]
    plug_lab.withdraw(int(number), "another plug")
    assert masses(plug_lab).empty
    assert pd.isna(dry_mass(plug_lab))
    assert whole(plug_lab)


def test_a_withdrawal_says_who_and_why(plug_lab: Lab) -> None:
    (number,) = masses(plug_lab)["id"]
    plug_lab.withdraw(int(number), "another plug")
    with plug_lab._reading() as connection:
        row = store.withdrawals_of(connection, [int(number)]).iloc[0]
    assert (row["person"], row["reason"], row["command"]) == ("tester", "another plug", "withdraw")


def test_a_withdrawal_needs_a_reason(plug_lab: Lab) -> None:
    (number,) = masses(plug_lab)["id"]
    with pytest.raises(Usage, match="reason"):
        plug_lab.withdraw(int(number), "  ")
    assert len(masses(plug_lab)) == 1


def test_what_is_not_in_force_is_not_withdrawn(plug_lab: Lab) -> None:
    (number,) = masses(plug_lab)["id"]
    plug_lab.withdraw(int(number), "another plug")
    with pytest.raises(NotFound, match="not in force"):
        plug_lab.withdraw(int(number), "again")


def test_withdrawing_a_correction_leaves_nothing_in_force(plug_lab: Lab, write_sheet: Write) -> None:
    load(plug_lab, write_sheet("masses", MASSES, "W-1,1H,dry,51,2026-03-14"), "misread")
    (number,) = masses(plug_lab)["id"]
    plug_lab.withdraw(int(number), "another plug")
    assert masses(plug_lab).empty
    assert pd.isna(dry_mass(plug_lab))
    assert whole(plug_lab)


def test_the_key_of_a_withdrawn_reading_is_free_again(plug_lab: Lab, write_sheet: Write) -> None:
    (number,) = masses(plug_lab)["id"]
    plug_lab.withdraw(int(number), "another plug")
    load(plug_lab, write_sheet("masses", MASSES, "W-1,1H,dry,52,2026-03-14"))
    (new,) = masses(plug_lab)["id"]
    with plug_lab._reading() as connection:
        row = store.entry_row(connection, int(new))
    assert row is not None
    assert row["supersedes"] is None
    assert dry_mass(plug_lab) == 52.0
    assert whole(plug_lab)


def test_a_chain_of_corrections_keeps_every_link(plug_lab: Lab, write_sheet: Write) -> None:
    for mass in (51, 52, 50):  # back to the first value is a correction too
        load(plug_lab, write_sheet("masses", MASSES, f"W-1,1H,dry,{mass},2026-03-14"), "misread")
    entries = plug_lab.plug_show("W-1", "1H")["entries"]
    states = entries[entries["kind"] == "masses"]["state"].tolist()
    assert [state.split(" by ")[0] for state in states] == ["corrected", "corrected", "corrected", "in force"]
    assert dry_mass(plug_lab) == 50.0
    assert whole(plug_lab)


def test_in_force_reads_many_plugs_as_it_reads_few(full_lab: Lab) -> None:
    with full_lab._reading() as connection:
        few = store.in_force(connection, "masses", [1])
        many = store.in_force(connection, "masses", range(1, 1000))
        none = store.in_force(connection, "masses", range(2, 1000))
    pd.testing.assert_frame_equal(few, many)
    assert len(few) > 0
    assert none.empty
