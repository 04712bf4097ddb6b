"""What is kept: numbers that are numbers, names as typed, cells verbatim with their place."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa

from corelab.errors import Refused
from corelab.lab import Lab
from corelab.records import history, schema, store

Write = Callable[..., Path]
ODD_NAMES = ["007", "1E5", "NA", "3-1", "1.10", "TRUE", "7121/8-1", "Ærø nº 2", "O'Brien\"s", "nan", "-"]


def typed(lab: Lab, kind: str) -> list[dict[str, Any]]:
    with lab._reading() as connection:
        return [dict(r) for r in connection.execute(sa.select(schema.SHEET_TABLES[kind])).mappings()]


def entries(lab: Lab, kind: str) -> list[dict[str, Any]]:
    query = sa.select(schema.entry).where(schema.entry.c.kind == kind).order_by(schema.entry.c.id)
    with lab._reading() as connection:
        return [dict(row) for row in connection.execute(query).mappings()]


def names(lab: Lab, kind: str) -> list[str]:
    with lab._reading() as connection:
        return list(store.Identities.read(connection).names[kind].values())


# -- numbers ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
@pytest.mark.parametrize("kind", ["certified values", "masses"])
def test_what_is_no_number_never_enters(
    any_lab: Lab, sound: Callable[[str], dict[str, Any]], kind: str, value: float
) -> None:
    field = next(n for n, v in sound(kind).items() if isinstance(v, float))
    entry = store.NewEntry(kind, sound(kind) | {field: value}, {})
    with pytest.raises(ValueError, match="JSON"), any_lab._writing("load bench sheets") as (connection, _):
        store.Change.begin(connection).entries([entry])
    assert typed(any_lab, kind) == []


@pytest.mark.parametrize("text", ["nan", "NaN", "inf", "-Infinity", "1e999"])
def test_a_cell_that_is_no_number_is_refused(any_lab: Lab, write_sheet: Write, text: str) -> None:
    sheet = write_sheet("wells", "well,depth unit,datum elevation [m]", f"W-1,m,{text}")
    with pytest.raises(Refused):
        any_lab.load([sheet])
    assert entries(any_lab, "wells") == []


@pytest.mark.parametrize("text", ["-0.0", "-0", "-0e5"])
def test_a_negative_zero_becomes_zero(any_lab: Lab, write_sheet: Write, text: str) -> None:
    any_lab.load([write_sheet("wells", "well,depth unit,datum elevation [m]", f"W-1,m,{text}")])
    (row,) = typed(any_lab, "wells")
    assert math.copysign(1.0, row["datum_elevation_m"]) == 1.0
    with any_lab._reading() as connection:
        assert history.chain_faults(connection) == []


@pytest.mark.parametrize("value", [0.1, 1 / 3, 5e-324, 9.87654321e299, 123456789.123456789])
def test_a_number_comes_back_to_the_last_bit(
    any_lab: Lab, sound: Callable[[str], dict[str, Any]], value: float
) -> None:
    with any_lab._writing("load bench sheets") as (connection, person):
        identities = store.Identities.read(connection)
        identities.add("plug", "1", 1)
        change = store.Change.begin(connection)
        change.identities(identities)
        row = sound("certified values") | {"standard_id": 1, "certified_value": value}
        change.entries([store.NewEntry("certified values", row, {})])
        change.close(person=person, command="c", program_version="0", detail={})
    assert [r["certified_value"] for r in typed(any_lab, "certified values")] == [value]
    with any_lab._reading() as connection:
        assert history.chain_faults(connection) == []


# -- names --------------------------------------------------------------------------------------------------


def test_odd_names_stay_what_they_are(any_lab: Lab, write_sheet: Write) -> None:
    quoted = ['"{}"'.format(name.replace('"', '""')) for name in ODD_NAMES if name != "-"]
    any_lab.load([write_sheet("wells", "well,depth unit", *(f"{name},m" for name in quoted))])
    assert names(any_lab, "well")[1:] == ODD_NAMES[:-1]


@pytest.mark.parametrize("again", ["west-1", " WEST-1 ", "West-1\u00a0"])
def test_a_name_is_known_again_without_case_or_spaces(any_lab: Lab, write_sheet: Write, again: str) -> None:
    any_lab.load([write_sheet("wells", "well,depth unit", "West-1,m")])
    seal = any_lab.seal()
    any_lab.load([write_sheet("wells", "well,depth unit", f"{again},m")])
    assert names(any_lab, "well") == ["standards", "West-1"]
    assert any_lab.seal() == seal


def test_letters_composed_or_not_are_one_name() -> None:
    assert store.name_key("Br\u00fcnn") == store.name_key("bru\u0308nn ") == store.name_key("BR\u00dcNN")
    assert store.name_key("Stra\u00dfe") == store.name_key("STRASSE")


@pytest.mark.parametrize(("a", "b"), [("007", "7"), ("1E5", "100000"), ("3-1", "3-01"), ("1.10", "1.1")])
def test_other_spellings_are_other_names(a: str, b: str) -> None:
    assert store.name_key(a) != store.name_key(b)


def test_the_same_plug_name_in_two_wells_is_two_plugs(any_lab: Lab) -> None:
    with any_lab._reading() as connection:
        identities = store.Identities.read(connection)
    one, two = identities.add("well", "A"), identities.add("well", "B")
    first, second = identities.add("plug", "1H", one), identities.add("plug", "1H", two)
    assert first != second
    assert identities.add("plug", " 1h", one) == first
    assert (identities.owner("plug", second), identities.name("plug", first)) == (two, "1H")
    assert identities.known("plug", two) == ["1H"]


def test_a_standard_is_a_plug_of_the_well_standards(any_lab: Lab, write_sheet: Write) -> None:
    any_lab.load([write_sheet("standards", "standard,kind", "CP-1,check plug")])
    with any_lab._reading() as connection:
        identities = store.Identities.read(connection)
    owner = identities.find("well", "Standards")
    assert owner is not None
    assert identities.find("plug", "cp-1", owner) == identities.find("standard", "CP-1", owner) is not None


# -- what was entered ---------------------------------------------------------------------------------------


def test_cells_are_kept_as_they_stood_with_their_place(any_lab: Lab, write_sheet: Write) -> None:
    heading = "well,depth unit,datum elevation [ft],bit diameter [in],remarks"
    sheet = write_sheet("wells", heading, "W-1,m,82.50,8.500,", 'W-2,FT,1e2,-,"as told, ""maybe"" µ\u2212"')
    any_lab.load([sheet])
    first, second = entries(any_lab, "wells")
    assert json.loads(first["entered"]) == {
        "well": "W-1",
        "depth unit": "m",
        "datum elevation [ft]": "82.50",
        "bit diameter [in]": "8.500",
    }
    assert json.loads(second["entered"])["datum elevation [ft]"] == "1e2"
    assert json.loads(second["entered"])["remarks"] == 'as told, "maybe" µ\u2212'
    assert [(e["file"], e["sheet"], e["row"]) for e in (first, second)] == [
        ("wells.csv", "", n) for n in (2, 3)
    ]
    one, two = typed(any_lab, "wells")
    assert one["datum_elevation_m"] == pytest.approx(82.5 * 0.3048, rel=1e-15)
    assert one["bit_diameter_mm"] == pytest.approx(8.5 * 25.4, rel=1e-15)
    assert (two["depth_unit"], two["bit_diameter_mm"]) == ("ft", None)


def test_a_workbook_leaves_its_tab_and_row(any_lab: Lab, tmp_path: Path) -> None:
    import openpyxl

    book = openpyxl.Workbook()
    tab = book.active
    assert tab is not None
    tab.title = "Wells"
    tab.append(["well", "depth unit", "datum elevation [m]"])
    tab.append(["W-1", "m", 25.5])
    book.save(tmp_path / "office.xlsx")
    any_lab.load([tmp_path / "office.xlsx"])
    (entry,) = entries(any_lab, "wells")
    assert (entry["file"], entry["sheet"], entry["row"]) == ("office.xlsx", "Wells", 2)
    assert json.loads(entry["entered"])["datum elevation [m]"] == 25.5


def test_an_entry_is_found_with_its_values(full_lab: Lab) -> None:
    with full_lab._reading() as connection:
        row = store.entry_row(connection, 1)
        withdrawal = store.entry_row(connection, store.next_id(connection, schema.entry) - 1)
        assert store.entry_row(connection, 10_000) is None
    assert row is not None
    assert withdrawal is not None
    assert (row["kind"], row["values"]["laboratory"], row["in_force"]) == ("jobs", "some words", False)
    assert (withdrawal["kind"], withdrawal["supersedes"], withdrawal["in_force"]) == ("withdrawal", 2, True)
    assert "values" not in withdrawal


def test_what_is_not_there_is_nan_in_a_frame_and_none_among_words(any_lab: Lab, write_sheet: Write) -> None:
    any_lab.load([write_sheet("wells", "well,depth unit", "W-1,m")])
    with any_lab._reading() as connection:
        frame = store.in_force(connection, "wells")
    assert math.isnan(frame["datum_elevation_m"].iloc[0])
    assert frame["field"].iloc[0] is None
    assert str(frame["well_id"].dtype) == "int64"
