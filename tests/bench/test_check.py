"""Rows against each other and against the record: all that is wrong comes together, and only that."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from corelab.errors import Problem, Refused
from corelab.lab import Lab

WriteSheet = Callable[..., Path]

RUNS = "well,run,top depth [m],base depth [m],recovered length [m]"
SHOTS = "well,gun run,shot,depth [m],tool,outcome"
PLUGS = "well,plug,from,run,gun run,shot,depth [m]"
MASSES = "well,plug,condition,mass [g],container mass [g],measured on"
EXPANSION = "well,plug,instrument,reference pressure [{0}],expanded pressure [{0}],barometric pressure [kPa]"
FLOW = (
    "well,plug,step,gas,upstream pressure [{0}],downstream pressure [{0}],flow rate [cm3/s],"
    "barometric pressure [kPa]"
)


@pytest.fixture
def stocked(lab: Lab, write_sheet: WriteSheet) -> Lab:
    """A lab with two wells, two runs, three shots and four plugs."""
    lab.load(
        [
            write_sheet("jobs", "job,laboratory", "J-1,Own"),
            write_sheet("wells", "well,job,depth unit", "QB-1,J-1,m", "7121/8-1,J-1,ft"),
            write_sheet("core runs", RUNS, "QB-1,1,100,109,9", "QB-1,2,109,118,8"),
            write_sheet(
                "sidewall shots",
                SHOTS,
                "QB-1,G1,1,50,percussion,recovered",
                "QB-1,G1,2,60,percussion,misfired",
            ),
            write_sheet(
                "plugs", PLUGS, "QB-1,1H,core,1,,,101", "QB-1,2H,core,2,,,110", "QB-1,S1,sidewall,,G1,1,50"
            ),
            write_sheet("standards", "standard,kind", "CP-1,check plug"),
        ]
    )
    return lab


def refused(lab: Lab, *paths: Path, reason: str = "") -> list[Problem]:
    """The problems of a load, which writes nothing, as `--check` names them too."""
    before = (lab.seal(), len(lab.history()))
    with pytest.raises(Refused) as caught:
        lab.load(paths, reason=reason)
    with pytest.raises(Refused) as checked:
        lab.load(paths, reason=reason, check=True)
    assert checked.value.problems == caught.value.problems
    assert (lab.seal(), len(lab.history())) == before
    for problem in caught.value.problems:
        assert problem.file
        assert problem.found
        assert problem.wanted
        assert problem.action
    return list(caught.value.problems)


def places(problems: list[Problem]) -> list[tuple[str, int | None, str]]:
    return sorted((p.file, p.row or 0, p.column) for p in problems)


# --- names -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("kind", "heading", "row", "column", "found", "action"),
    [
        ("wells", "well,job,depth unit", "QB-9,J-2,m", "job", "unknown job 'J-2'", "'J-1'"),
        ("core runs", RUNS, "QB-11,3,118,120,2", "well", "unknown well 'QB-11'", "'QB-1'"),
        ("plugs", PLUGS, "QB-1,3H,core,22,,,112", "run", "unknown run '22'", "'2'"),
        ("plugs", PLUGS, "QB-1,3H,sidewall,,G11,1,50", "gun run", "unknown gun run 'G11'", "'G1'"),
        ("plugs", PLUGS, "QB-1,3H,sidewall,,G1,11,50", "shot", "unknown shot '11'", "'1'"),
        ("plugs", PLUGS + ",companion of", "QB-1,3H,core,2,,,112,1HH", "companion of", "'1HH'", "'1H'"),
        ("masses", MASSES, "QB-1,1HH,dry,50,,", "plug", "unknown plug '1HH'", "'1H'"),
        ("masses", MASSES, "standards,CP-2,dry,50,,", "plug", "unknown plug 'CP-2'", "'CP-1'"),
        (
            "masses",
            MASSES,
            "7121/8-1,1H,dry,50,,",
            "plug",
            "unknown plug '1H'",
            "load the sheet that registers it",
        ),
        (
            "certified values",
            "standard,result,certified value,unit,standard uncertainty",
            "CP-11,porosity,20,%,0.1",
            "standard",
            "unknown standard 'CP-11'",
            "'CP-1'",
        ),
        ("wells", "well,depth unit", "Standards,m", "well", "'Standards'", "kept for check plugs"),
        (
            "plugs",
            PLUGS,
            "standards,CP-7,core,,,,1",
            "well",
            "'standards'",
            "register them in the sheet 'standards'",
        ),
    ],
)
def test_unknown_names_get_the_nearest(
    stocked: Lab,
    write_sheet: WriteSheet,
    kind: str,
    heading: str,
    row: str,
    column: str,
    found: str,
    action: str,
) -> None:
    (problem,) = refused(stocked, write_sheet(kind, heading, row))
    assert (problem.file, problem.row, problem.column) == (f"{kind}.csv", 2, column)
    assert found in problem.found
    assert action in problem.action


def test_names_differ_by_more_than_case(stocked: Lab, write_sheet: WriteSheet) -> None:
    report = stocked.load([write_sheet("masses", MASSES, "qb-1, 1h ,dry,50,,")])
    assert report.new == {"masses": 1}
    (problem,) = refused(stocked, write_sheet("plugs", PLUGS, "QB-1,5H,core,2,,,112", "qb-1,5h,core,2,,,112"))
    assert problem.row == 3
    assert "row 2" in problem.found


def test_an_instrument_need_not_be_registered(stocked: Lab, write_sheet: WriteSheet) -> None:
    sheet = write_sheet("masses", "well,plug,condition,mass [g],balance", "QB-1,1H,dry,50,BAL-77")
    assert stocked.load([sheet]).new == {"masses": 1}


def test_many_unknown_names_are_told_soon(stocked: Lab, write_sheet: WriteSheet) -> None:
    rows = [f"QB-1,lost {n},dry,50,," for n in range(300)]
    problems = refused(stocked, write_sheet("masses", MASSES, *rows))
    assert len(problems) == 300


# --- within a row ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("kind", "heading", "row", "column", "found", "action"),
    [
        (
            "grain volume",
            EXPANSION.format("kPa"),
            "QB-1,1H,P,100,35,101",
            "expanded pressure",
            "35 kPa",
            "psig",
        ),
        (
            "grain volume",
            EXPANSION.format("psia"),
            "QB-1,1H,P,100,14.6,101",
            "expanded pressure",
            "100.7",
            "psig",
        ),
        (
            "grain volume",
            EXPANSION.format("kPag"),
            "QB-1,1H,P,100,-1,101",
            "expanded pressure",
            "100",
            "psig",
        ),
        (
            "grain volume",
            EXPANSION.format("psig"),
            "QB-1,1H,P,35,100,101",
            "expanded pressure",
            "above the",
            "exch",
        ),
        (
            "gas permeability",
            FLOW.format("kPa"),
            "QB-1,1H,1,air,300,50,1,101",
            "downstream pressure",
            "50",
            "psig",
        ),
        (
            "gas permeability",
            FLOW.format("kPa"),
            "QB-1,1H,1,air,100,,1,101",
            "upstream pressure",
            "100",
            "psig",
        ),
        (
            "gas permeability",
            FLOW.format("psig"),
            "QB-1,1H,1,air,10,20,1,",
            "upstream pressure",
            "not above",
            "exch",
        ),
        (
            "gas permeability",
            FLOW.format("barg"),
            "QB-1,1H,1,air,0,0,1,",
            "upstream pressure",
            "not above",
            "exch",
        ),
        ("masses", MASSES, "QB-1,1H,dry,50,51,", "container mass", "51 g", "exchanged"),
        ("masses", MASSES, "QB-1,1H,dry,50,50,", "container mass", "50 g", "exchanged"),
        (
            "immersion",
            "well,plug,liquid,mass in air [g],mass immersed [g]",
            "QB-1,1H,water,30,50",
            "mass immersed",
            "50 g",
            "exchanged",
        ),
        ("core runs", RUNS, "QB-1,3,130,120,9", "base depth", "120.000 m", "exchanged"),
        ("core runs", RUNS, "QB-1,3,130,130,0", "base depth", "130.000 m", "exchanged"),
        (
            "plugs",
            PLUGS + ",top depth [m],base depth [m]",
            "QB-1,W1,whole core,1,,,102,103,102",
            "base depth",
            "102",
            "exch",
        ),
    ],
)
def test_impossible_rows(
    stocked: Lab,
    write_sheet: WriteSheet,
    kind: str,
    heading: str,
    row: str,
    column: str,
    found: str,
    action: str,
) -> None:
    (problem,) = refused(stocked, write_sheet(kind, heading, row))
    assert (problem.row, problem.column) == (2, column)
    assert found in problem.found
    assert action in problem.action


def test_the_barometer_of_the_setting_judges_too(stocked: Lab, write_sheet: WriteSheet) -> None:
    sheet = write_sheet("grain volume", EXPANSION.format("kPa"), "QB-1,1H,P,300,90,")
    assert len(refused(stocked, sheet)) == 1
    stocked.setting("barometric pressure", "83")
    assert stocked.load([sheet]).new == {"grain volume": 1}


# --- runs, shots and plugs ---------------------------------------------------------------------------------


def test_runs_that_overlap_in_one_load(stocked: Lab, write_sheet: WriteSheet) -> None:
    rows = ["QB-1,7,200,220,20", "QB-1,8,202,204,2", "QB-1,9,206,208,2", "7121/8-1,1,200,220,20"]
    problems = refused(stocked, write_sheet("core runs", RUNS, *rows))
    assert places(problems) == [("core runs.csv", 3, "top depth"), ("core runs.csv", 4, "top depth")]
    assert all("overlaps run '7' by 2.000 m" in p.found for p in problems)


def test_runs_that_overlap_the_record(stocked: Lab, write_sheet: WriteSheet) -> None:
    (below,) = refused(stocked, write_sheet("core runs", RUNS, "QB-1,3,117,120,3"))
    assert (below.row, below.column) == (2, "top depth")
    assert "overlaps run '2' by 1.000 m" in below.found
    (above,) = refused(stocked, write_sheet("core runs", RUNS, "QB-1,0,90,101,9"))
    assert (above.row, above.column) == (2, "base depth")
    assert stocked.load([write_sheet("core runs", RUNS, "QB-1,3,118,120,3")]).new == {"core runs": 1}


def test_runs_that_overlap_through_a_correction(stocked: Lab, write_sheet: WriteSheet) -> None:
    sheet = write_sheet("core runs", RUNS, "QB-1,1,100,110,9")
    (asked,) = refused(stocked, sheet)
    assert "--reason" in asked.action
    (overlap,) = refused(stocked, sheet, reason="tally")
    assert "overlaps run '2' by 1.000 m" in overlap.found
    both = write_sheet("core runs", RUNS, "QB-1,1,100,109.5,9", "QB-1,2,109.5,118,8")
    assert stocked.load([both], reason="tally").corrected == {"core runs": 2}


def test_a_plug_outside_its_run(stocked: Lab, write_sheet: WriteSheet) -> None:
    (problem,) = refused(stocked, write_sheet("plugs", PLUGS, "QB-1,3H,core,1,,,112"))
    assert (problem.row, problem.column) == (2, "depth")
    assert "run '1', 100.000 to 109.000 m" in problem.wanted


def test_a_run_corrected_away_from_its_plug(stocked: Lab, write_sheet: WriteSheet) -> None:
    runs = write_sheet("core runs", RUNS, "QB-1,1,103,109,6")
    (problem,) = refused(stocked, runs, reason="tally")
    assert (problem.file, problem.row, problem.column) == ("core runs.csv", 2, "top depth")
    assert "'1H' at 101.000 m" in problem.found
    plugs = write_sheet("plugs", PLUGS, "QB-1,1H,core,1,,,104")
    assert stocked.load([runs, plugs], reason="tally").corrected == {"core runs": 1, "plugs": 1}


def test_a_section_outside_its_run(stocked: Lab, write_sheet: WriteSheet) -> None:
    heading = "well,run,section,top depth [m],base depth [m]"
    problems = refused(stocked, write_sheet("core sections", heading, "QB-1,1,1,99,101", "QB-1,1,2,108,111"))
    assert places(problems) == [("core sections.csv", 2, "top depth"), ("core sections.csv", 3, "base depth")]


def test_a_plug_from_a_shot_that_brought_nothing(stocked: Lab, write_sheet: WriteSheet) -> None:
    (problem,) = refused(stocked, write_sheet("plugs", PLUGS, "QB-1,S2,sidewall,,G1,2,60"))
    assert (problem.row, problem.column) == (2, "shot")
    assert "whose outcome is 'misfired'" in problem.found
    shots = write_sheet("sidewall shots", SHOTS, "QB-1,G1,1,50,percussion,empty")
    (corrected,) = refused(stocked, shots, reason="gun sheet")
    assert (corrected.file, corrected.row, corrected.column) == ("sidewall shots.csv", 2, "outcome")
    assert "plug 'S1'" in corrected.found


def test_the_depth_of_a_shot_is_questioned(stocked: Lab, write_sheet: WriteSheet) -> None:
    report = stocked.load([write_sheet("plugs", PLUGS, "QB-1,S9,sidewall,,G1,1,50.2")])
    assert [n.column for n in report.notices] == ["depth"]


def test_long_runs_and_high_recovery_are_questioned(stocked: Lab, write_sheet: WriteSheet) -> None:
    report = stocked.load([write_sheet("core runs", RUNS, "QB-1,3,118,130,12.5")])
    assert sorted(n.column for n in report.notices) == ["base depth", "recovered length"]


# --- many faults, no more of them than there are -----------------------------------------------------------


def test_faults_of_all_files_come_together(stocked: Lab, write_sheet: WriteSheet, tmp_path: Path) -> None:
    (tmp_path / "sheets").mkdir(exist_ok=True)
    (tmp_path / "sheets" / "registers.xlsx").write_bytes(b"no workbook")
    problems = refused(
        stocked,
        write_sheet("core runs", RUNS, "QB-1,3,118,x,2", "QB-1,4,130,120,2", "QB-1,5,117,117.5,0.5"),
        write_sheet("plugs", PLUGS, "QB-1,3H,core,3,,,119", "QB-1,4H,bore,2,,,110", "QB-1,5H,core,2,,,500"),
        write_sheet(
            "masses", MASSES, "QB-1,3H,dry,,,", "QB-1,4H,dry,50,60,", "QB-1,77,dry,50,,", "QB-1,5H,dry,1,,"
        ),
        write_sheet("sieve", "well,plug,apperture [mm],mass retained [g]", "QB-1,3H,1,2"),
        tmp_path / "sheets" / "registers.xlsx",
        tmp_path / "nowhere.csv",
    )
    assert places(problems) == [
        (str(tmp_path / "nowhere.csv"), 0, ""),
        ("core runs.csv", 2, "base depth [m]"),
        ("core runs.csv", 3, "base depth"),
        ("core runs.csv", 4, "top depth"),
        ("masses.csv", 2, "mass [g]"),
        ("masses.csv", 3, "container mass"),
        ("masses.csv", 4, "plug"),
        ("plugs.csv", 3, "from"),
        ("plugs.csv", 4, "depth"),
        ("registers.xlsx", 0, ""),
        ("sieve.csv", 0, "apperture [mm]"),
    ]


@pytest.mark.parametrize(
    "plugs",
    [
        ("plugs", "well,plug,from,run,depth", "QB-1,A,core,2,110"),
        ("plugs", PLUGS, 'QB-1,"A,core,2,,,110'),
        ("plugs", PLUGS, "QB-1,\u0001,core,2,,,110"),
        ("plugs", PLUGS, "QB-1,-,core,2,,,110"),
        ("plugs", PLUGS, "QB-1,A,core,2,,,deep"),
        ("plugs", PLUGS, "QB-7,A,core,,,,110"),
        ("plugs", PLUGS, ",A,core,,,,110"),
        ("plugs", PLUGS, "QB-1,A,core,9,,,110"),
        ("plugs", PLUGS, "QB-1,A,core,2,,,900"),
    ],
)
def test_a_faulty_register_does_not_blame_its_readings(
    stocked: Lab, write_sheet: WriteSheet, plugs: tuple[str, str, str]
) -> None:
    masses = write_sheet("masses", MASSES, "QB-1,A,dry,50,,", "QB-1,A,as received,50,,")
    (problem,) = refused(stocked, write_sheet(*plugs), masses)
    assert problem.file == "plugs.csv"


def test_an_unreadable_register_of_wells_blames_nothing_else(lab: Lab, write_sheet: WriteSheet) -> None:
    wells = write_sheet("wells", "well,depth unit", "QB-1,m")
    wells.write_bytes("well,depth unit\nBl\u00e5fjell,m\n".encode("cp1252"))
    runs = write_sheet("core runs", RUNS, "Bl\u00e5fjell,1,100,109,9")
    plugs = write_sheet("plugs", PLUGS, "Bl\u00e5fjell,1H,core,1,,,101")
    (problem,) = refused(lab, wells, runs, plugs)
    assert problem.file == "wells.csv"
    assert "not UTF-8" in problem.found
    wells.rename(wells.with_name("wels.csv"))
    (problem,) = refused(lab, wells.with_name("wels.csv"), runs, plugs)
    assert "'wells'" in problem.action


def test_one_unknown_name_in_many_rows_is_counted(stocked: Lab, write_sheet: WriteSheet) -> None:
    rows = [f"QB-1,lost,dry,{n},," for n in range(1, 41)]
    problems = refused(stocked, write_sheet("masses", MASSES, *rows, "QB-1,gone,dry,1,,"))
    assert [p.row for p in problems] == [2, 3, 4, 5, 6, 7, 42]
    assert problems[5].found == "the unknown plug 'lost', in 35 rows from here on"


def test_a_faulty_shot_does_not_blame_its_plug(stocked: Lab, write_sheet: WriteSheet) -> None:
    shots = write_sheet("sidewall shots", SHOTS, "QB-1,G1,3,deep,percussion,recovered")
    plugs = write_sheet("plugs", PLUGS, "QB-1,S3,sidewall,,G1,3,70")
    (problem,) = refused(stocked, shots, plugs)
    assert (problem.file, problem.column) == ("sidewall shots.csv", "depth [m]")
    shots = write_sheet("sidewall shots", SHOTS, "QB-1,G1,,70,percussion,recovered")
    (problem,) = refused(stocked, shots, plugs)
    assert (problem.file, problem.column) == ("sidewall shots.csv", "shot")


def test_a_faulty_repeat_does_not_blame_the_others(stocked: Lab, write_sheet: WriteSheet) -> None:
    good = [f"QB-1,1H,dry,{mass},,2026-03-01" for mass in (50.1, 50.2, 50.3)]
    stocked.load([write_sheet("masses", MASSES, *good)])
    (problem,) = refused(stocked, write_sheet("masses", MASSES, good[0].replace("50.1", "5o.1"), *good[1:]))
    assert problem.row == 2


def test_a_run_entered_twice_does_not_overlap_itself(stocked: Lab, write_sheet: WriteSheet) -> None:
    (problem,) = refused(stocked, write_sheet("core runs", RUNS, "QB-1,3,118,120,2", "qb-1,3,118,121,2"))
    assert (problem.row, problem.column) == (3, "")
    assert "row 2 of core runs.csv" in problem.found
