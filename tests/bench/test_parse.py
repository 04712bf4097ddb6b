"""Cells into typed values: what is taken, what is refused, and in which words."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date, datetime
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab.bench.parse import Row, parse
from corelab.errors import Problem
from corelab.formats.table import Bad, Cell, Percent, Table
from corelab.lab import Lab
from corelab.sheets import SHEETS
from corelab.units import accepted, convert, unit

WriteSheet = Callable[..., Path]


def parsed(
    kind: str, columns: dict[str, list[Cell]], decimal_comma: bool = False
) -> tuple[list[Row], list[Problem], list[Problem]]:
    rows = len(next(iter(columns.values())))
    table = Table(
        "bench.xlsx",
        kind,
        list(columns),
        [str(n) for n in range(len(columns))],
        list(columns.values()),
        list(range(2, rows + 2)),
    )
    return parse(table, SHEETS[kind], decimal_comma=decimal_comma)


def one(kind: str, **cells: Any) -> Row:
    rows, problems, _ = parsed(kind, {k: [v] for k, v in cells.items()})
    assert problems == []
    return rows[0]


def fault(kind: str, cells: dict[str, Cell], **how: bool) -> Problem:
    _, problems, _ = parsed(kind, {k: [v] for k, v in cells.items()}, **how)
    assert len(problems) == 1, [str(p) for p in problems]
    problem = problems[0]
    assert problem.file
    assert problem.sheet == kind
    assert problem.found
    assert problem.wanted
    assert problem.action
    return problem


def masses(**more: Cell) -> dict[str, Cell]:
    return {"well": "W", "plug": "1H", "condition": "dry", "mass [g]": 50.0} | more


# --- headings ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("kind", "wrong", "instead_of", "found", "action"),
    [
        ("masses", "colour of the lid", "", "'colour of the lid'", "known: well, plug"),
        ("masses", "contaner mass [g]", "", "'contaner mass [g]'", "container mass [g]"),
        ("masses", "mas [g]", "mass [g]", "'mas [g]'", "'mass [g]'"),
        ("masses", "mass", "mass [g]", "no unit of mass is given", "mass [g]"),
        ("masses", "mass []", "mass [g]", "no unit of mass is given", "mass [g]"),
        ("masses", "mass [stone]", "mass [g]", "'stone' is not a unit of mass", "mass [g]"),
        ("masses", "mass [cm]", "mass [g]", "'cm' is a unit of length, not of mass", "mass [g]"),
        ("masses", "mass [g", "mass [g]", "'mass [g'", "mass [g]"),
        ("masses", "plug [g]", "plug", "a unit [g]", "take it out"),
        ("masses", "salinity [g/L]", "", "per volume of solution", "salinity [g/kg]"),
        ("wells", "mud filtrate salinity [g/kg]", "", "per mass of solution", "mud filtrate salinity [g/L]"),
        ("liquid permeability", "viscosity [MPa.s]", "", "'MPa.s' is not a unit of viscosity", "mPa.s"),
        ("grain volume", "expanded pressure [psi]", "expanded pressure [kPa]", "psia or psig", "kPa"),
        (
            "grain volume",
            "barometric pressure [psig]",
            "",
            "is a gauge pressure",
            "barometric pressure [kPa]",
        ),
        (
            "pore volume",
            "net confining stress [psig]",
            "net confining stress [MPa]",
            "neither absolute",
            "MPa",
        ),
        ("dimensions", "length 11 [mm]", "", "number 11", "number the columns from 1 on"),
        ("dimensions", "length 0 [mm]", "", "number 0", "number the columns from 1 on"),
        ("dimensions", "length 1 [cm]", "", "the column 'length' twice", "take one out"),
        ("masses", "Mass  [kg]", "", "the column 'mass' twice", "take one out"),
    ],
)
def test_wrong_heading(kind: str, wrong: str, instead_of: str, found: str, action: str) -> None:
    good: dict[str, dict[str, Cell]] = {
        "masses": masses(),
        "wells": {"well": "W", "depth unit": "m"},
        "dimensions": {"well": "W", "plug": "1", "length [mm]": 40.0, "diameter [mm]": 25.0},
        "grain volume": {
            "well": "W",
            "plug": "1",
            "instrument": "P",
            "reference pressure [kPa]": 700.0,
            "expanded pressure [kPa]": 300.0,
        },
        "pore volume": {
            "well": "W",
            "plug": "1",
            "net confining stress [MPa]": 5.0,
            "instrument": "P",
            "reference pressure [kPa]": 700.0,
            "expanded pressure [kPa]": 300.0,
        },
        "liquid permeability": {
            "well": "W",
            "plug": "1",
            "step": "1",
            "liquid": "brine",
            "upstream pressure [kPa]": 300.0,
            "flow rate [cm3/s]": 0.1,
        },
    }
    cells = good[kind]
    if instead_of:
        cells = {wrong if k == instead_of else k: v for k, v in cells.items()}
    else:
        cells[wrong] = 1.0
    problem = fault(kind, cells)
    assert found in problem.found
    assert action in problem.action
    assert problem.column == wrong


def test_a_missing_required_column_is_named_once_and_blames_no_row() -> None:
    _, problems, _ = parsed("masses", {"well": ["W", "W"], "plug": ["1", "2"], "condition": ["dry", "dry"]})
    assert [(p.column, p.row) for p in problems] == [("mass [g]", None)]
    assert "add a column headed 'mass [g]'" in problems[0].action


def test_heading_spaces_and_case_do_not_matter() -> None:
    row = one(
        "masses",
        **{" WELL ": "W", "Plug": "1", "CONDITION": "Dry", "Container   Mass  [ G ]": 1, "mass[g]": 9},
    )
    assert row.values["mass_g"] == 9.0
    assert row.values["container_mass_g"] == 1.0


@pytest.mark.parametrize(
    ("kind", "heading", "typed", "field", "stored"),
    [
        ("masses", "mass [KG]", 0.05, "mass_g", 50.0),
        ("masses", "salinity [%w]", 3.5, "salinity_g_per_kg", 35.0),
        ("masses", "salinity [ppm]", 35000, "salinity_g_per_kg", 35.0),
        ("gas permeability", "net confining stress [MPA]", 5, "net_confining_stress_mpa", 5.0),
        ("gas permeability", "temperature [K]", 293.15, "temperature_degc", 20.0),
        ("gas permeability", "temperature [degF]", 68, "temperature_degc", 20.0),
        ("reported permeability", "klinkenberg permeability [md]", 12, "klinkenberg_permeability_md", 12.0),
        ("reported permeability", "klinkenberg permeability [D]", 1.2, "klinkenberg_permeability_md", 1200.0),
        ("descriptions", "grain size [phi]", 2, "grain_size_mm", 0.25),
        ("treatments", "humidity [%]", 40, "humidity_frac", 0.40),
        ("core gamma", "depth [ft]", 1000, "depth_m", 304.8),
    ],
)
def test_units_are_converted(kind: str, heading: str, typed: float, field: str, stored: float) -> None:
    rows, problems, _ = parsed(kind, {heading: [typed]})
    assert not [p for p in problems if p.column == heading]
    assert rows[0].values[field] == pytest.approx(stored, rel=1e-12)


@pytest.mark.parametrize("symbol", accepted("pressure"))
def test_a_gauge_stays_as_read_and_is_marked(symbol: str) -> None:
    rows, _, _ = parsed("pore volume", {f"reference pressure [{symbol.upper()}]": [7.0]})
    typed = unit(symbol, "pressure")
    if symbol in {"MPa", "Pa"}:  # upper case PA and MPA remain themselves
        assert typed.symbol == symbol
    assert rows[0].values["reference_pressure_gauge"] == int(typed.gauge)
    assert rows[0].values["reference_pressure_kpa"] == convert(7.0, typed, unit("kPa", "pressure"))


# --- numbers -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("cell", "found", "action"),
    [
        ("heavy", "'heavy'", "type digits"),
        ("12,5", "'12,5'", "write 12.5, or load with --decimal-comma"),
        ("1,234.5", "'1,234.5'", "thousands"),
        ("1 234", "'1 234'", "thousands"),
        ("1,234,567", "'1,234,567'", "thousands"),
        ("50 g", "'50 g'", "take the unit out"),
        ("50g", "'50g'", "take the unit out"),
        ("50 %", "'50 %'", "take the % out"),
        ("#DIV/0!", "'#DIV/0!'", "holds an error"),
        ("2026-03-14", "'2026-03-14'", "this is a date"),
        ("1..2", "'1..2'", "type digits"),
        ("nan", "'nan'", "type digits"),
        ("inf", "'inf'", "type digits"),
        ("0x10", "'0x10'", "take the unit out"),
        ("1_000", "'1_000'", "type digits"),
        ("٣", "'٣'", "type digits"),
        ("\u221212", "'\u221212'", "type digits"),
        ("1e400", "'1e400'", "too large"),
        ("1e308", "'1e308'", "too large"),
        ("<0.01", "'<0.01'", "remarks"),
        (True, "the logical value TRUE", "type the number"),
        (datetime(2026, 3, 1), "the date 2026-03-01", "made it a date"),
        (Percent(0.5), "under a percentage format", "format the column as number"),
        (Bad("the error value #DIV/0!", "a value", "correct the formula"), "#DIV/0!", "correct the formula"),
        ("-5", "'-5'", "check the value"),
        (0, "'0'", "check the value"),
        (-5.0, "'-5.0'", "check the value"),
        ("9" * 32_000 + "x", "'999", "take the unit out"),
    ],
)
def test_no_number(cell: Cell, found: str, action: str) -> None:
    heading = "mass [kg]" if cell == "1e308" else "mass [g]"
    problem = fault("masses", {"well": "W", "plug": "1H", "condition": "dry", heading: cell})
    assert found in problem.found
    assert action in problem.action
    assert problem.row == 2
    assert problem.column == heading


@pytest.mark.parametrize("text", ["5", "+5", "5.", "5.0", "0.5e1", "50E-1", "  5 ", "005"])
def test_numbers_as_people_type_them(text: str) -> None:
    assert one("masses", **masses(**{"mass [g]": text.strip()})).values["mass_g"] == 5.0


@given(st.floats(1e-9, 1e9))
def test_a_typed_number_is_the_number(value: float) -> None:
    assert one("masses", **masses(**{"mass [g]": repr(value)})).values["mass_g"] == value


@given(st.text(max_size=12))
def test_any_text_is_a_number_or_refused(text: str) -> None:
    rows, problems, _ = parsed("masses", {k: [v] for k, v in masses(**{"container mass [g]": text}).items()})
    if "container_mass_g" in rows[0].values:
        assert rows[0].values["container_mass_g"] == float(text)
    else:
        assert problems or text.casefold() in {"", "-", "n/a"}


def test_the_possible_range_is_told_in_the_unit_of_the_heading() -> None:
    grain = {"well": "W", "plug": "1", "lithology": "sandstone"}
    assert "1e-05 to 4096 mm" in fault("descriptions", grain | {"grain size [phi]": -20}).wanted
    assert "can be kept" in fault("descriptions", grain | {"grain size [phi]": -5000}).wanted
    length = {"well": "W", "plug": "1", "length [mm]": 3000, "diameter [mm]": 25}
    assert "0.1 to 2000 mm" in fault("dimensions", length).wanted
    temperature = {"well": "W", "plug": "1", "step": "drying", "temperature [degF]": 9999}
    assert "-328 to 1832 degF" in fault("treatments", temperature).wanted


def test_an_unusual_value_is_taken_and_questioned_in_the_unit_of_the_heading() -> None:
    cells: dict[str, Cell] = {"well": "W", "plug": "1", "length [mm]": 500, "diameter [mm]": 25}
    rows, problems, notices = parsed("dimensions", {k: [v] for k, v in cells.items()})
    assert problems == []
    assert rows[0].values["length_1_cm"] == 50.0
    assert [n.wanted for n in notices] == ["usually 5 to 400 mm"]


def test_limits_where_a_column_says_so() -> None:
    cells: dict[str, Cell] = {"well": "W", "plug": "1", "permeameter": "P"}
    low = one("reported permeability", **cells, **{"klinkenberg permeability [mD]": "<0.01"})
    assert (low.values["klinkenberg_permeability_md"], low.values["klinkenberg_permeability_limit"]) == (
        0.01,
        "below",
    )
    high = one("reported permeability", **cells, **{"gas permeability [D]": "> 5"})
    assert (high.values["gas_permeability_md"], high.values["gas_permeability_limit"]) == (5000.0, "above")
    plain = one("reported permeability", **cells, **{"gas permeability [D]": 5})
    assert plain.values["gas_permeability_limit"] is None
    for wrong in ("<", "<<1", "<-1", "> high", "< 0"):
        fault("reported permeability", cells | {"klinkenberg permeability [mD]": wrong})


@pytest.mark.parametrize("empty", [None, "-", "n/a", "N/A"])
def test_nothing_entered(empty: Cell) -> None:
    row = one("masses", **masses(**{"container mass [g]": empty, "balance": empty, "measured on": empty}))
    assert "container_mass_g" not in row.values
    assert "balance" not in row.names
    assert list(row.entered) == ["well", "plug", "condition", "mass [g]"]


def test_nothing_entered_where_something_must_be() -> None:
    problem = fault("masses", masses(plug="-"))
    assert (problem.column, problem.found) == ("plug", "an empty cell")


def test_decimal_commas_when_asked_for() -> None:
    rows, problems, _ = parsed("masses", {k: [v] for k, v in masses(**{"mass [g]": "12,5"}).items()}, True)
    assert problems == []
    assert rows[0].values["mass_g"] == 12.5
    assert rows[0].entered["mass [g]"] == "12,5"
    for wrong in ("1.234,5", "1,234,5", "1.234"):  # 1.234 may be one thousand and more
        problem = fault("masses", masses(**{"mass [g]": wrong}), decimal_comma=True)
        assert wrong in problem.found


def test_a_percentage_format_is_right_under_a_percent_heading() -> None:
    cells: dict[str, Cell] = {"well": "W", "plug": "1", "step": "drying"}
    assert one("treatments", **cells, **{"humidity [%]": Percent(0.4)}).values["humidity_frac"] == 0.4
    assert "percentage" in fault("treatments", cells | {"humidity [v/v]": Percent(0.4)}).found


@pytest.mark.parametrize("cell", [0, "0", -1, 1.5, "1.5", "first", 1e20, "9999999", True, "٢"])
def test_repeat_counts_from_one(cell: Cell) -> None:
    problem = fault("masses", masses(repeat=cell))
    assert "a whole number from 1 on" in problem.wanted
    assert one("masses", **masses(repeat=3.0)).repeat == 3


# --- names, texts, words, dates ----------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["007", "1E5", "3-1", "NA", "7121/8-1", "TRUE", "nan", "None", "A  1", "ß"])
def test_names_are_kept_as_typed(name: str) -> None:
    assert one("masses", **masses(plug=name)).names["plug"] == name


def test_unseen_characters_do_not_make_another_name() -> None:
    assert one("masses", **masses(plug="\u200bA\u00a01\ufeff")).names["plug"] == "A 1"
    assert "invisible" in fault("masses", masses(plug="\u200b")).found


def test_a_numeric_cell_as_a_name() -> None:
    assert one("masses", **masses(plug=12)).names["plug"] == "12"
    assert one("masses", **masses(plug=12.0)).names["plug"] == "12"
    assert "the number 1.5" in fault("masses", masses(plug=1.5)).found
    assert "2026-03-01" in fault("masses", masses(plug=datetime(2026, 3, 1))).found
    assert "format the column as text" in fault("masses", masses(plug=Percent(0.1))).action
    assert one("masses", **masses(remarks=1.5)).values["remarks"] == "1.5"


def test_words_of_a_list() -> None:
    for typed in ("As Received", "as_received", "as-received"):
        assert one("masses", **masses(condition=typed)).values["condition"] == "as received"
    problem = fault("masses", masses(condition="dryed"))
    assert "did you mean 'dry'" in problem.action
    assert problem.wanted == "one of: as received, dry, saturated"
    method = {"well": "W", "plug": "1", "step": "cleaning", "method": "flow through"}
    assert one("treatments", **method).values["method"] == "flow-through"
    plug = {"well": "W", "plug": "1", "lithology": "sandstone"}
    assert one("descriptions", **plug, condition="Cracked, short").values["condition"] == "cracked, short"
    assert "'wet'" in fault("descriptions", plug | {"condition": "intact, wet"}).found
    assert fault("descriptions", plug | {"condition": ","}).column == "condition"
    flow: dict[str, Cell] = {"well": "W", "plug": "1", "permeameter": "P", "gas permeability [mD]": 1.0}
    assert one("reported permeability", **flow, direction=90.0).values["direction"] == "90"
    assert one("reported permeability", **flow).values["direction"] == "axial"


@pytest.mark.parametrize(
    ("cell", "kept"),
    [
        ("2026-03-14", "2026-03-14"),
        ("2026-03-14T09:30", "2026-03-14T09:30"),
        ("2026-03-14 09:30", "2026-03-14T09:30"),
        ("2026-03-14T09:30:00", "2026-03-14T09:30"),
        ("2026-03-14T09:30:15", "2026-03-14T09:30:15"),
        ("2026-03-14T00:00", "2026-03-14"),
        (datetime(2026, 3, 14), "2026-03-14"),
        (datetime(2026, 3, 14, 9, 30), "2026-03-14T09:30"),
        (date(2026, 3, 14), "2026-03-14"),
    ],
)
def test_one_moment_has_one_writing(cell: Cell, kept: str) -> None:
    assert one("masses", **masses(**{"measured on": cell})).values["measured_on"] == kept


@pytest.mark.parametrize(
    "cell",
    [
        "14.03.2026",
        "14/03/2026",
        "March 14",
        "20260314",
        "2026-13-01",
        "2026-02-30",
        "0000-01-01",
        "2026-3-14",
        "2026-03-14T25:00",
        "٢٠٢٦-03-14",
        46095,
        46095.5,
        True,
        Percent(0.1),
    ],
)
def test_a_date_in_another_form(cell: Cell) -> None:
    problem = fault("masses", masses(**{"measured on": cell}))
    assert "2026-03-14" in problem.wanted
    assert problem.column == "measured on"


# --- rows --------------------------------------------------------------------------------------------------


def test_every_fault_of_a_sheet_is_named_and_nothing_else() -> None:
    _, problems, _ = parsed(
        "masses",
        {
            "well": ["W"] * 5,
            "plug": ["1", "2", None, "4", "5"],
            "condition": ["dry", "moist", "dry", "dry", "dry"],
            "mass [g]": ["x", 2.0, 3.0, None, 5.0],
            "contaner mass [g]": [1.0] * 5,
        },
    )
    assert {(p.row, p.column) for p in problems} == {
        (None, "contaner mass [g]"),
        (2, "mass [g]"),
        (3, "condition"),
        (4, "plug"),
        (5, "mass [g]"),
    }
    assert len(problems) == 5


def test_one_way_of_several() -> None:
    cells: dict[str, Cell] = {"well": "W", "plug": "1", "liquid": "water", "mass in air [g]": 50.0}
    problem = fault("immersion", cells)
    assert problem.row == 2
    assert "'mass in air' with 'mass immersed', or 'mass displaced'" in problem.wanted
    assert fault("immersion", cells | {"mass immersed [g]": "x"}).column == "mass immersed [g]"
    assert one("immersion", **cells, **{"mass displaced [g]": 20.0}).values["mass_displaced_g"] == 20.0


def test_gaps_between_numbered_columns_are_closed() -> None:
    row = one(
        "dimensions",
        well="W",
        plug="1",
        **{"length 3 [cm]": 4.0, "length 1 [cm]": None, "diameter 2 [in]": 1},
    )
    assert row.values["length_1_cm"] == 4.0
    assert row.values["diameter_1_cm"] == pytest.approx(2.54)
    assert set(row.entered) == {"well", "plug", "length 3 [cm]", "diameter 2 [in]"}


def test_units_in_cells() -> None:
    balance: dict[str, Cell] = {"instrument": "B", "measures": "mass", "repeatability": 0.001}
    assert one("instruments", **balance, **{"uncertainty unit": "G"}).values["uncertainty_unit"] == "g"
    percent = one("instruments", **balance, **{"uncertainty unit": "% of Reading"})
    assert percent.values["uncertainty_unit"] == "% of reading"
    assert "'cm'" in fault("instruments", balance | {"uncertainty unit": "cm"}).found
    value: dict[str, Cell] = {
        "standard": "S",
        "result": "porosity",
        "certified value": 20.0,
        "standard uncertainty": 0.1,
    }
    assert one("certified values", **value, unit="%").values["unit"] == "%"
    assert "a unit for porosity" in fault("certified values", value | {"unit": "mD"}).wanted


def test_entered_cells_are_kept_verbatim(lab: Lab, write_sheet: WriteSheet) -> None:
    wells = write_sheet("wells", "well,depth unit", "W,m")
    runs = write_sheet("core runs", "well,run,top depth [m],base depth [m],recovered length [m]", "W,1,0,9,9")
    plugs = write_sheet("plugs", "well,plug,from,run,depth [ft]", "W,007,Core,1,1.50e1")
    lab.load([wells, runs, plugs])
    entry = lab.plug_show("W", "007")["entries"]["entry"][0]
    assert "1.50e1" in entry
    assert "depth [ft]" in entry
    assert "Core" in entry
    assert lab.interval("W")["depth [m]"][0] == pytest.approx(4.572)
