"""Loading: which rows are new, unchanged, repeats or corrections; files of every sort; nothing half done."""

from __future__ import annotations

import csv
import itertools
import shutil
import subprocess
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.utils.datetime import CALENDAR_MAC_1904

from corelab import open_lab
from corelab.errors import Problem, Refused
from corelab.lab import Lab
from corelab.records import history
from corelab.sheets import SHEETS, kind_named

WriteSheet = Callable[..., Path]

WELLS = ("wells", "well,depth unit", "QB-1,m")
RUNS = ("core runs", "well,run,top depth [m],base depth [m],recovered length [m]", "QB-1,1,100,109,9")
PLUGS = ("plugs", "well,plug,from,run,depth [m]", "QB-1,1H,core,1,101", "QB-1,2H,core,1,102")
MASS = "well,plug,condition,mass [g],measured on,repeat"
GRAIN = (
    "well,plug,instrument,reference pressure [{0}],expanded pressure [{0}],barometric pressure [kPa],"
    "measured on"
)
CALIBRATION = "instrument,setup,known volume [cm3],reference pressure [{0}],expanded pressure [{0}]"


@pytest.fixture
def stocked(lab: Lab, write_sheet: WriteSheet) -> Lab:
    lab.load([write_sheet(*WELLS), write_sheet(*RUNS), write_sheet(*PLUGS)])
    return lab


def refused(lab: Lab, *paths: Path, **how: Any) -> list[Problem]:
    before = lab.seal()
    with pytest.raises(Refused) as caught:
        lab.load(paths, **how)
    with pytest.raises(Refused) as checked:
        lab.load(paths, **how, check=True)
    assert checked.value.problems == caught.value.problems
    assert lab.seal() == before
    return list(caught.value.problems)


def whole(lab: Lab) -> None:
    """The record is as sound as the program can tell."""
    with lab._reading() as connection:
        assert history.chain_faults(connection) == []
    assert lab.recompute(check=True).empty


def entries(lab: Lab, plug: str = "1H") -> list[tuple[str, str]]:
    shown = lab.plug_show("QB-1", plug)["entries"]
    return list(zip(shown["kind"], shown["state"], strict=True))


# --- identity of rows --------------------------------------------------------------------------------------


def test_the_same_file_twice_changes_nothing(any_lab: Lab, write_sheet: WriteSheet) -> None:
    paths = [write_sheet(*WELLS), write_sheet(*RUNS), write_sheet(*PLUGS)]
    first = any_lab.load(paths)
    assert first.new == {"wells": 1, "core runs": 1, "plugs": 2}
    assert first.seal == any_lab.seal()
    events = len(any_lab.history())
    again = any_lab.load(paths)
    assert (again.new, again.changes) == ({}, 0)
    assert again.unchanged == first.new
    assert any_lab.seal() == first.seal
    assert len(any_lab.history()) == events
    whole(any_lab)


def test_the_same_entries_in_other_writing_are_the_same(stocked: Lab, write_sheet: WriteSheet) -> None:
    stocked.load([write_sheet("masses", MASS, "QB-1,1H,dry,50.25,2026-03-14T09:30,")])
    again = write_sheet(
        "masses", "WELL,Plug,condition,mass [kg],measured on", "qb-1,1h,Dry,5.025E-2,2026-03-14 09:30:00"
    )
    assert stocked.load([again]).unchanged == {"masses": 1}


def test_repeats_are_counted_in_their_order(stocked: Lab, write_sheet: WriteSheet) -> None:
    rows = [f"QB-1,1H,dry,{mass},2026-03-14," for mass in (50.1, 50.2, 50.2)]
    sheet = write_sheet("masses", MASS, *rows, "QB-1,1H,dry,50.9,2026-03-15,", "QB-1,2H,dry,60,2026-03-14,")
    assert stocked.load([sheet]).new == {"masses": 5}
    assert stocked.load([sheet]).unchanged == {"masses": 5}
    fourth = write_sheet("masses", MASS, *rows, "QB-1,1H,dry,50.3,2026-03-14,")
    report = stocked.load([fourth])
    assert (report.new, report.unchanged) == ({"masses": 1}, {"masses": 3})
    swapped = write_sheet("masses", MASS, rows[1], rows[0])
    assert [p.row for p in refused(stocked, swapped)] == [2, 3]


def test_explicit_repeats(stocked: Lab, write_sheet: WriteSheet) -> None:
    rows = ["QB-1,1H,dry,50.1,,2", "QB-1,1H,dry,50.2,,", "QB-1,1H,dry,50.3,,"]
    assert stocked.load([write_sheet("masses", MASS, *rows)]).new == {"masses": 3}
    counted = ["QB-1,1H,dry,50.2,,1", "QB-1,1H,dry,50.1,,2", "QB-1,1H,dry,50.3,,3"]
    assert stocked.load([write_sheet("masses", MASS, *counted)]).unchanged == {"masses": 3}
    (twice,) = refused(stocked, write_sheet("masses", MASS, "QB-1,1H,dry,50,,4", "QB-1,1H,dry,50,,4"))
    assert twice.row == 3
    assert "row 2 of masses.csv" in twice.found
    assert "another repeat" in twice.wanted


def test_other_entries_need_a_reason_and_supersede(stocked: Lab, write_sheet: WriteSheet) -> None:
    stocked.load([write_sheet("masses", MASS, "QB-1,1H,dry,50.1,2026-03-14,")])
    changed = write_sheet("masses", MASS, "QB-1,1H,dry,51.1,2026-03-14,")
    (problem,) = refused(stocked, changed)
    assert "mass 51.1 where the record has 50.1" in problem.found
    assert "--reason" in problem.action
    assert refused(stocked, changed, reason="  ")
    report = stocked.load([changed], reason="wrong tare")
    assert (report.new, report.corrected) == ({}, {"masses": 1})
    assert [kind for kind, state in entries(stocked) if state.startswith("corrected")] == ["masses"]
    assert stocked.history()["reason"].iloc[-1] == "wrong tare"
    assert stocked.interval("QB-1")["dry mass [g]"][0] == pytest.approx(51.1)
    assert stocked.load([changed]).unchanged == {"masses": 1}
    whole(stocked)


def test_a_register_takes_each_key_once(stocked: Lab, write_sheet: WriteSheet) -> None:
    (problem,) = refused(stocked, write_sheet("wells", "well,depth unit", "QB-2,m", "qb-2,ft"))
    assert (problem.row, problem.wanted) == (3, "one row each")
    (problem,) = refused(stocked, write_sheet("wells", "well,depth unit", "QB-1,ft"))
    assert "depth unit ft where the record has m" in problem.found


def test_files_in_any_order(tmp_path: Path, write_sheet: WriteSheet, sqlite_template: Path) -> None:
    sheets = [WELLS, RUNS, PLUGS, ("masses", MASS, "QB-1,1H,dry,50,,")]
    paths = [write_sheet(*sheet) for sheet in sheets]
    for number, order in enumerate(itertools.permutations(paths)):
        if number % 5:
            continue
        shutil.copyfile(sqlite_template, tmp_path / f"{number}.db")
        with open_lab(str(tmp_path / f"{number}.db"), by="tester") as lab:
            assert lab.load(order).changes == 5


def test_one_sheet_split_over_files(stocked: Lab, write_sheet: WriteSheet, tmp_path: Path) -> None:
    monday = write_sheet("masses", MASS, "QB-1,1H,dry,50.1,,", folder=tmp_path / "monday")
    tuesday = write_sheet("masses", MASS, "QB-1,1H,dry,50.2,,", folder=tmp_path / "tuesday")
    report = stocked.load([tuesday, monday, monday])
    assert report.new == {"masses": 2}
    assert report.files == [str(monday), str(tuesday)]
    faulty = write_sheet("masses", MASS, "QB-1,9H,dry,50.2,,", folder=tmp_path / "tuesday")
    assert [p.file for p in refused(stocked, monday, faulty)] == [str(faulty)]


def test_check_writes_nothing_and_says_what_would_be(stocked: Lab, write_sheet: WriteSheet) -> None:
    before = stocked.seal()
    report = stocked.load([write_sheet("masses", MASS, "QB-1,1H,dry,50,,")], check=True)
    assert (report.new, report.checked_only, report.seal) == ({"masses": 1}, True, "")
    assert stocked.seal() == before
    assert "masses" not in dict(entries(stocked))


def test_all_or_nothing(stocked: Lab, write_sheet: WriteSheet) -> None:
    good = write_sheet("wells", "well,depth unit", "QB-2,m")
    bad = write_sheet("masses", MASS, "QB-1,1H,dry,50,,", "QB-1,2H,dry,heavy,,")
    assert len(refused(stocked, good, bad)) == 1
    assert list(stocked.well_list()["well"]) == ["QB-1"]


# --- a result that cannot be had never stops a load --------------------------------------------------------


@pytest.mark.parametrize(
    ("sheets", "reason"),
    [
        ([("grain volume", GRAIN.format("kPa"), "QB-1,1H,P,700,300,101,")], "no calibration in force"),
        ([("masses", MASS, "QB-1,1H,as received,50,,")], "no dry"),
        (
            [
                ("dimensions", "well,plug,length [mm],diameter [mm]", "QB-1,1H,10,10"),
                ("masses", MASS, "QB-1,1H,dry,50,,"),
                ("grain volume", "well,plug,instrument,grain volume [cm3]", "QB-1,1H,P,19"),
            ],
            "grain volume",
        ),
        (
            [
                (
                    "gas permeability",
                    "well,plug,step,gas,upstream pressure [kPa],flow rate [cm3/s]",
                    "QB-1,1H,1,nitrogen,200,0.1",
                )
            ],
            "no length and diameter",
        ),
        (
            [
                ("dimensions", "well,plug,length [mm],diameter [mm]", "QB-1,1H,40,25"),
                (
                    "gas permeability",
                    "well,plug,step,gas,upstream pressure [kPa],flow rate [cm3/s]",
                    "QB-1,1H,1,nitrogen,200,0.1",
                    "QB-1,1H,2,nitrogen,300,1",
                    "QB-1,1H,3,nitrogen,400,3",
                ),
            ],
            "slip",
        ),
        (
            [
                (
                    "liquid permeability",
                    "well,plug,step,liquid,upstream pressure [kPa],flow rate [cm3/s]",
                    "QB-1,1H,1,brine,200,0.1",
                )
            ],
            "",
        ),
        (
            [("distillation", "well,plug,water volume [cm3],oil density [g/cm3]", "QB-1,1H,1,0.85")],
            "saturation",
        ),
        (
            [
                (
                    "retort",
                    "well,plug,sample mass [g],sample bulk volume [cm3],water volume [cm3],oil volume [cm3]",
                    "QB-1,1H,10,4,5,6",
                )
            ],
            "",
        ),
        ([("sieve", "well,plug,aperture [mm],mass retained [g]", "QB-1,1H,0,0")], ""),
        ([("immersion", "well,plug,liquid,mass displaced [g]", "QB-1,1H,brine,20")], ""),
        (
            [
                (
                    "pore volume",
                    "well,plug,net confining stress [MPa],instrument,reference pressure [kPa],"
                    "expanded pressure [kPa]",
                    "QB-1,1H,5,H,700,300",
                )
            ],
            "",
        ),
        (
            [
                ("porosimeter calibration", CALIBRATION.format("kPa"), "P,cup,0,700,300"),
                ("grain volume", GRAIN.format("kPa"), "QB-1,1H,P,700,350,101,"),
            ],
            "",
        ),
    ],
)
def test_a_load_is_never_refused_for_a_result(
    stocked: Lab, write_sheet: WriteSheet, sheets: list[tuple[str, ...]], reason: str
) -> None:
    report = stocked.load([write_sheet(*sheet) for sheet in sheets])
    assert report.changes
    flags = stocked.interval("QB-1")["flags"][0]
    assert reason in flags, flags
    if "no " in reason:
        assert any(reason in line for line in report.not_computed)
    whole(stocked)


# --- gauges and barometers ---------------------------------------------------------------------------------


def flow_flags(lab: Lab) -> tuple[float, str]:
    row = lab.interval("QB-1").iloc[0]
    return float(row["gas permeability [mD]"]), str(row["flags"])


def test_gauge_readings_take_the_barometer_of_row_setting_or_default(
    stocked: Lab, write_sheet: WriteSheet
) -> None:
    shape = write_sheet("dimensions", "well,plug,length [mm],diameter [mm]", "QB-1,1H,40,25")
    heading = "well,plug,step,gas,upstream pressure [{}],flow rate [cm3/s],barometric pressure [kPa]"
    stocked.load(
        [shape, write_sheet("gas permeability", heading.format("kPa"), "QB-1,1H,1,nitrogen,290,0.1,90")]
    )
    absolute, flags = flow_flags(stocked)
    assert "barometer assumed" not in flags
    gauge = write_sheet("gas permeability", heading.format("kPag"), "QB-1,1H,1,nitrogen,200,0.1,90")
    stocked.load([gauge], reason="units")
    assert flow_flags(stocked) == (pytest.approx(absolute, rel=1e-12), flags)
    without = write_sheet("gas permeability", heading.format("kPag"), "QB-1,1H,1,nitrogen,200,0.1,")
    stocked.load([without], reason="no barometer")
    assumed, flags = flow_flags(stocked)
    assert "barometer assumed" in flags
    assert assumed != pytest.approx(absolute, rel=1e-6)
    stocked.setting("barometric pressure", "90")
    set_by_lab, flags = flow_flags(stocked)
    assert "barometer assumed" not in flags
    assert set_by_lab == pytest.approx(absolute, rel=1e-12)
    whole(stocked)


@pytest.mark.parametrize(("symbol", "assumed"), [("kPag", False), ("kPa", True)])
def test_an_assumed_barometer_is_flagged_only_where_it_moves_a_result(
    stocked: Lab, write_sheet: WriteSheet, symbol: str, assumed: bool
) -> None:
    add = 0.0 if symbol == "kPag" else 101.325

    def shown(space: float) -> str:  # reference chamber of 20 cm3 at 600 kPa over the barometer
        return f"{600 + add!r},{20 * 600 / (20 + space) + add!r}"

    billets = [f"P,cup,{v},{shown(40 - v)}" for v in (0, 10, 20)]
    stocked.load(
        [
            write_sheet("porosimeter calibration", CALIBRATION.format(symbol), *billets),
            write_sheet("grain volume", GRAIN.format(symbol), f"QB-1,1H,P,{shown(25)},,"),
        ]
    )
    row = stocked.interval("QB-1").iloc[0]
    assert row["grain volume [cm3]"] == pytest.approx(15.0, rel=1e-9)
    assert ("barometer assumed" in row["flags"]) is assumed


# --- files -------------------------------------------------------------------------------------------------


def test_what_a_folder_may_hold(stocked: Lab, write_sheet: WriteSheet, tmp_path: Path) -> None:
    folder = tmp_path / "bench"
    write_sheet("03 masses", MASS, "QB-1,1H,dry,50,,", folder=folder / "monday")
    (folder / "~$volumes.xlsx").write_bytes(b"\0lock")
    (folder / ".hidden.csv").write_text("rubbish")
    (folder / "photo.jpg").write_bytes(b"\xff\xd8")
    report = stocked.load([folder])
    assert report.new == {"masses": 1}
    assert [Path(name).name for name in report.files] == ["03 masses.csv"]
    assert sorted(Path(name).name for name in report.ignored) == [
        ".hidden.csv",
        "photo.jpg",
        "~$volumes.xlsx",
    ]


def test_paths_that_lead_nowhere(stocked: Lab, tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    (tmp_path / "locked").mkdir()
    (tmp_path / "locked" / "~$masses.xlsx").write_bytes(b"x")
    (tmp_path / "masses.xls").write_bytes(b"x")
    (tmp_path / "masses.csv").write_text("well\n")
    found = {
        "empty": "a folder without sheets",
        "locked": "a folder without sheets",
        "masses.xls": "a file ending in '.xls'",
        "massess.csv": "no such file or folder",
        "x" * 5000: "no such file or folder",
    }
    for name, words in found.items():
        (problem,) = refused(stocked, tmp_path / name)
        assert words in problem.found
    (problem,) = refused(stocked, tmp_path / "massess.csv")
    assert "'masses.csv'" in problem.action


@pytest.mark.parametrize("coding", ["utf-8", "utf-8-sig", "utf-16"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_csv_in_every_honest_writing(stocked: Lab, tmp_path: Path, coding: str, end: str) -> None:
    path = tmp_path / "masses.csv"
    lines = ["well;plug;condition;mass [g];remarks", "QB-1;1H;dry;50;blå; ".replace("; ", ""), ""]
    path.write_bytes(end.join(lines).encode(coding))
    assert stocked.load([path]).new == {"masses": 1}
    assert stocked.interval("QB-1")["dry mass [g]"][0] == 50


@pytest.mark.parametrize(
    ("data", "found"),
    [
        (b"", "an empty file"),
        (b"\n\n", "an empty file"),
        (
            "well,plug,condition,mass [g],remarks\nQB-1,1H,dry,50,bl\u00e5\n".encode("cp1252"),
            "not UTF-8 (hex E5)",
        ),
        ("well,plug\n".encode("utf-16-le"), "NUL"),
        (b"PK\x03\x04", "named .csv"),
    ],
)
def test_csv_that_is_none(stocked: Lab, tmp_path: Path, data: bytes, found: str) -> None:
    path = tmp_path / "masses.csv"
    path.write_bytes(data)
    (problem,) = refused(stocked, path)
    assert found in problem.found


def test_a_sheet_of_headings_alone_is_no_fault(stocked: Lab, write_sheet: WriteSheet) -> None:
    report = stocked.load([write_sheet("masses", MASS)])
    assert (report.changes, report.unchanged) == (0, {})


def test_decimal_commas(stocked: Lab, tmp_path: Path) -> None:
    path = tmp_path / "masses.csv"
    path.write_text("well;plug;condition;mass [g];remarks\nQB-1;1H;dry;50,25;a, b\n")
    (problem,) = refused(stocked, path)
    assert "--decimal-comma" in problem.action
    stocked.load([path], decimal_comma=True)
    assert stocked.interval("QB-1")["dry mass [g]"][0] == 50.25


def workbook(path: Path, **tabs: list[list[Any]]) -> Workbook:
    book = Workbook()
    book.remove(book.worksheets[0])
    for kind, rows in tabs.items():
        tab = book.create_sheet(kind.replace("_", " "))
        for row in rows:
            tab.append(row)
    book.save(path)
    return book


MASS_ROWS = [
    ["well", "plug", "condition", "mass [g]", "measured on"],
    ["QB-1", "1H", "dry", 50.25, datetime(2026, 3, 14)],
]


def test_hidden_rows_tabs_and_columns_are_read_and_noted(stocked: Lab, tmp_path: Path) -> None:
    path = tmp_path / "bench.xlsx"
    book = workbook(path, masses=[*MASS_ROWS, ["QB-1", "2H", "dry", 60, None]])
    book["masses"].row_dimensions[3].hidden = True
    book["masses"].column_dimensions["E"].hidden = True
    book["masses"].sheet_state = "hidden"
    book.create_sheet("notes").append(["anything"])
    book.save(path)
    report = stocked.load([path])
    assert report.new == {"masses": 2}
    assert len([n for n in report.notices if "hidden" in n.found]) == 3


@pytest.mark.parametrize("epoch_1904", [False, True])
def test_dates_of_both_epochs_are_one_date(
    stocked: Lab, write_sheet: WriteSheet, tmp_path: Path, epoch_1904: bool
) -> None:
    book = Workbook()
    if epoch_1904:
        book.epoch = CALENDAR_MAC_1904
    tab = book.worksheets[0]
    tab.title = "masses"
    for row in [*MASS_ROWS, ["QB-1", "1H", "dry", 50, datetime(2026, 3, 14, 9, 30)]]:
        tab.append(row)
    path = tmp_path / "bench.xlsx"
    book.save(path)
    stocked.load([path])
    rows = ["QB-1,1H,dry,50.25,2026-03-14,", "QB-1,1H,dry,50,2026-03-14T09:30,"]
    assert stocked.load([write_sheet("masses", MASS, *rows)]).unchanged == {"masses": 2}


@pytest.mark.parametrize(
    ("place", "value", "form", "column", "found"),
    [
        ("D2", "#DIV/0!", "", "mass [g]", "#DIV/0!"),
        ("D2", "=A9+1", "", "mass [g]", "never calculated"),
        ("D2", 0.5, "0%", "mass [g]", "percentage"),
        ("D2", 40000, "yyyy-mm-dd", "mass [g]", "date"),
        ("B2", 40000, "yyyy-mm-dd", "plug", "date"),
        ("B2", 1.5, "", "plug", "1.5"),
        ("E2", 46000, "General", "measured on", "46000"),
        ("D2", True, "", "mass [g]", "TRUE"),
        ("Z99", "total", "", "Z", "Z99"),
        ("D1", "masss [g]", "", "masss [g]", "masss"),
    ],
)
def test_cells_of_workbooks_that_cannot_be_used(
    stocked: Lab, tmp_path: Path, place: str, value: Any, form: str, column: str, found: str
) -> None:
    path = tmp_path / "bench.xlsx"
    book = workbook(path, masses=MASS_ROWS)
    cell = book["masses"][place]
    cell.value = value
    if value == "#DIV/0!":
        cell.data_type = "e"
    if form:
        cell.number_format = form
    book.save(path)
    (problem,) = refused(stocked, path)
    assert (problem.file, problem.sheet, problem.column) == ("bench.xlsx", "masses", column)
    assert found in problem.found
    assert problem.row == (None if place == "D1" else cell.row)


def test_merged_cells_and_unknown_tabs(stocked: Lab, tmp_path: Path) -> None:
    path = tmp_path / "bench.xlsx"
    book = workbook(path, masses=MASS_ROWS, mases=MASS_ROWS)
    book["masses"].merge_cells("B2:C2")
    book.save(path)
    problems = refused(stocked, path)
    assert any("merged cells B2:C2" in p.found for p in problems)
    assert any("the tab name 'mases'" in p.found and "'masses'" in p.action for p in problems)


def test_numeric_cells_where_names_are_wanted(lab: Lab, tmp_path: Path) -> None:
    path = tmp_path / "registers.xlsx"
    plugs = [
        ["well", "plug", "from", "run", "depth [m]"],
        ["QB-1", 12, "core", 1, 101],
        ["QB-1", "007", "core", "1", 102],
    ]
    workbook(
        path,
        wells=[["well", "depth unit"], ["QB-1", "m"]],
        core_runs=[RUNS[1].split(","), ["QB-1", 1, 100, 109, 9]],
        plugs=plugs,
    )
    lab.load([path])
    assert list(lab.interval("QB-1")["plug"]) == ["12", "007"]


# --- blank sheets, filled in -------------------------------------------------------------------------------


def rows_of(folder: Path) -> dict[str, list[dict[str, Any]]]:
    """Rows of each kind in the bench sheets of a folder, by heading; of two writings of headings, one."""
    found: dict[str, list[dict[str, Any]]] = {}
    for path in sorted(folder.iterdir()):
        if path.suffix == ".csv":
            text = path.read_text(encoding="utf-8-sig")
            sep = ";" if ";" in text.splitlines()[0] else ","
            found.setdefault(
                str(kind_named(path.stem)), list(csv.DictReader(text.splitlines(), delimiter=sep))
            )
        else:
            for tab in load_workbook(path).worksheets:
                if kind := kind_named(tab.title):
                    head, *rows = list(tab.iter_rows(values_only=True))
                    found[kind] = [{str(h): v for h, v in zip(head, row, strict=True) if h} for row in rows]
    return found


def fill(path: Path, rows: dict[str, list[dict[str, Any]]]) -> None:
    """Write rows into a blank workbook under its own headings; a heading takes the unit of the rows."""
    book = load_workbook(path)
    for kind, filled in rows.items():
        tab = book[kind]
        at = {str(cell.value).split(" [")[0]: cell.column for cell in tab[1]}
        for heading in {h: None for row in filled for h in row}:
            name = heading.split(" [")[0]
            if name not in at and f"{name} 1" in at:
                name += " 1"
            if name not in at:  # a further numbered column
                at[name] = tab.max_column + 1
            tab.cell(1, at[name]).value = heading
            for number, row in enumerate(filled, start=2):
                value = row.get(heading)
                if isinstance(value, str):
                    try:
                        numeric = SHEETS[kind].column(name.rstrip(" 0123456789")).entry == "number"
                    except StopIteration:
                        numeric = False
                    value = float(value) if numeric and value and value[0] not in "<>" else value
                if value not in (None, ""):
                    tab.cell(number, at[name]).value = value
    book.save(path)


def results(lab: Lab) -> list[pd.DataFrame]:
    return [lab.interval(well, with_uncertainty=True) for well in lab.well_list()["well"]]


@pytest.fixture(scope="module")
def demo_rows(
    demo_folder: Path, tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, dict[str, list[dict[str, Any]]]]:
    """The demo lab's rows, and a workbook for them made from the blank one."""
    folder = tmp_path_factory.mktemp("blank")
    rows = rows_of(demo_folder / "bench")
    path = folder / "all.xlsx"
    with open_lab(str(folder / "lab.db"), by="tester") as lab:
        lab.setup()
        lab.sheet_blank(list(SHEETS), path)
    fill(path, rows)
    return path, rows


def test_the_demo_lab_holds_nearly_every_kind(
    demo_rows: tuple[Path, dict[str, list[dict[str, Any]]]],
) -> None:
    assert set(SHEETS) - set(demo_rows[1]) <= {"liquid permeability"}


@pytest.mark.parametrize("resaved", [False, True])
def test_blank_sheets_filled_in_give_the_same_record(
    lab: Lab,
    demo_folder: Path,
    demo_rows: tuple[Path, dict[str, list[dict[str, Any]]]],
    tmp_path: Path,
    resaved: bool,
) -> None:
    path, rows = demo_rows
    if resaved:
        office = shutil.which("soffice")
        if office is None:
            pytest.skip("soffice is not on the PATH")
        profile = f"-env:UserInstallation={(tmp_path / 'profile').as_uri()}"
        subprocess.run(
            [office, profile, "--headless", "--convert-to", "xlsx", "--outdir", str(tmp_path), str(path)],
            check=True,
            capture_output=True,
            timeout=120,
        )
        path = tmp_path / path.name
    lab.load([demo_folder / "bench"])
    before = results(lab)
    report = lab.load([path])
    assert (report.new, report.corrected) == ({}, {})
    assert report.unchanged == {kind: len(filled) for kind, filled in rows.items()}
    for old, new in zip(before, results(lab), strict=True):
        pd.testing.assert_frame_equal(old, new)


@pytest.mark.parametrize("kind", SHEETS)
def test_a_blank_sheet_loads_as_nothing(lab: Lab, tmp_path: Path, kind: str) -> None:
    lab.sheet_blank([kind], tmp_path / "blank.xlsx")
    report = lab.load([tmp_path / "blank.xlsx"])
    assert (report.changes, report.notices) == (0, [])
