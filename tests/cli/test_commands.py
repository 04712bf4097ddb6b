"""Every command as a user types it: output, messages, exit status, files. No published values.

Most run in this process through the program's entry; what hangs on the process (pipes, start-up, encoding)
runs in one of its own.
"""

from __future__ import annotations

import json
import os
import re
import shutil
import sqlite3
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path
from typing import IO

import openpyxl
import pandas as pd
import pytest

from corelab import __version__, open_lab
from corelab.cli import main
from corelab.errors import Unavailable
from corelab.formats.tables_out import write_parquet
from corelab.sheets import SHEETS


@dataclass(frozen=True)
class Ran:
    status: int
    out: str
    err: str

    @property
    def rows(self) -> list[dict[str, object]]:
        return json.loads(self.out)


Corelab = Callable[..., Ran]


@pytest.fixture(scope="module")
def demo_file(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, demo_folder: Path) -> Path:
    """The demo lab in a file, loaded once."""
    path = shutil.copyfile(sqlite_template, tmp_path_factory.mktemp("demo") / "lab.db")
    with open_lab(str(path), by="Tomas Reyl") as lab:
        lab.load([demo_folder / "bench"])
    return path


@pytest.fixture
def demo(demo_file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A copy of it, named by the environment, in the current folder."""
    monkeypatch.chdir(tmp_path)
    path = shutil.copyfile(demo_file, tmp_path / "lab.db")
    monkeypatch.setenv("CORELAB_DATABASE", str(path))
    monkeypatch.setenv("CORELAB_BY", "Tomas Reyl")
    return path


@pytest.fixture
def corelab(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> Iterator[Corelab]:
    """Runs a command line; no traceback may show, and no fault of the program's own."""

    def run(*words: object) -> Ran:
        monkeypatch.setattr(sys, "argv", ["corelab", *map(str, words)])
        with pytest.raises(SystemExit) as left:
            main.run()
        said = capsys.readouterr()
        assert "Traceback" not in said.err + said.out
        assert "should not have happened" not in said.err
        code = left.value.code
        return Ran(code if isinstance(code, int) else int(bool(code)), said.out, said.err)

    monkeypatch.chdir(tmp_path)
    yield run
    main._State.database, main._State.by = "corelab.db", ""


ROOT = str(Path(__file__).resolve().parents[2])


def process(
    *words: str, stdout: int | IO[str] = subprocess.PIPE, **environment: str
) -> subprocess.CompletedProcess[bytes]:
    """The command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "corelab.cli.main", *words],
        env={**os.environ, **environment, "PYTHONPATH": ROOT},
        stdout=stdout,
        stderr=subprocess.PIPE,
        timeout=60,
    )


# -- the program -------------------------------------------------------------------------------------------


def test_help_imports_nothing_heavy():
    code = (
        "import sys; from corelab.cli import main; sys.argv = ['corelab', '--help']\n"
        "try: main.run()\n"
        "except SystemExit: pass\n"
        "print(sorted({m.split('.')[0] for m in sys.modules}), file=sys.stderr)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, encoding="utf-8", timeout=60, cwd=ROOT
    )
    assert "Usage: corelab" in done.stdout
    heavy = {"sqlalchemy", "pandas", "numpy", "scipy", "openpyxl", "alembic", "pyarrow", "psycopg"}
    assert not heavy & set(re.findall(r"'(\w+)'", done.stderr))


@pytest.mark.parametrize("words", [[], ["sheet"], ["write"], ["interval", "--help"], ["setup", "--help"]])
def test_help_is_everywhere(corelab: Corelab, words: list[str]):
    ran = corelab(*words)
    assert "Usage: corelab" in ran.out + ran.err
    assert ran.status == (0 if "--help" in words else 2)


def test_version(corelab: Corelab):
    assert corelab("--version") == Ran(0, f"corelab {__version__}\n", "")


@pytest.mark.parametrize(
    "words",
    [
        ["intervall", "QB-1"],
        ["interval"],
        ["interval", "QB-1", "--top", "deep"],
        ["interval", "QB-1", "--top"],
        ["interval", "QB-1", "--format", "xml"],
        ["interval", "QB-1", "--format", "parquet"],
        ["interval", "QB-1", "--unit", "km"],
        ["interval", "QB-1", "--depth", "pipe"],
        ["interval", "QB-1", "--where", "porosty > 1"],
        ["interval", "QB-1", "--top", "2450", "--base", "2440"],
        ["interval", "QB-1", "--top", "nan"],
        ["board", "--format", "csv"],
        ["withdraw", "seven", "--reason", "x"],
        ["withdraw", "7"],
        ["setting", "barometrc pressure"],
        ["setting", "barometric pressure", "high"],
        ["setting", "barometric pressure", "1 furlong"],
        ["setting", "barometric pressure", "5"],
        ["setting", "laboratory name", ""],
        ["setting", "depth unit", "km"],
        ["sheet", "kinds", "massses"],
        ["sheet", "blank", "massses", "--out", "x.xlsx"],
        ["sheet", "blank", "masses", "--out", "x.csv"],
        ["sheet", "blank", "masses"],
        ["person", "add", "Ann", "--role", "boss"],
        ["person", "add", "Ann"],
        ["person", "add", " ", "--role", "manager"],
        ["write", "workbook", "QB-1"],
    ],
)
def test_wrong_usage_leaves_with_2(demo: Path, corelab: Corelab, words: list[str]):
    ran = corelab(*words)
    assert ran.status == 2
    assert ran.out == ""
    assert ran.err.strip()


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["interval", "QB-11"], "There is no well 'QB-11'; did you mean 'QB-1'"),
        (["plug", "list", "qb 1"], "did you mean 'QB-1'"),
        (["plug", "show", "QB-1", "5HH"], "did you mean '5H'"),
        (["recovery", "XX"], "There is no well 'XX'; known: QB-1, QB-2."),
        (["board", "QB-3"], "did you mean"),
        (["history", "QB-1", "nn"], "There is no plug 'nn' in well 'QB-1'"),
        (["methods", "slip-facto"], "There is no method"),
        (["withdraw", "999999", "--reason", "x"], "There is no reading 999999"),
        (["write", "workbook", "QB-3", "--out", "x.xlsx"], "There is no well"),
        (["write", "csv", "QB-1", "--out", "no folder/x.csv"], "There is no folder"),
        (["interval", "QB-1", "--format", "json", "--out", "no folder/x.json"], "There is no folder"),
        (["sheet", "load", "nowhere.csv"], "nowhere.csv"),
        (["sheet", "blank", "masses", "--out", "x.xlsx", "--well", "QB-3"], "There is no well"),
    ],
)
def test_what_is_not_there_leaves_with_1(demo: Path, corelab: Corelab, words: list[str], said: str):
    ran = corelab(*words)
    assert (ran.status, ran.out) == (1, "")
    assert said in ran.err


# -- setting up, settings, people --------------------------------------------------------------------------


def test_setup_makes_a_lab_and_then_finds_it(corelab: Corelab, tmp_path: Path):
    assert "Made a new lab in corelab.db" in corelab("setup").err
    assert (tmp_path / "corelab.db").exists()
    assert "is up to date" in corelab("setup").err
    assert corelab("well", "list") == Ran(0, "none\n", "")
    assert corelab("well", "list", "--format", "json").rows == []
    assert corelab("board", "--format", "json").rows == []


def test_settings(demo: Path, corelab: Corelab):
    listed = corelab("setting", "--format", "json").rows
    assert {"barometric pressure", "time zone", "crush prior"} <= {row["setting"] for row in listed}
    assert corelab("setting", "Barometric  Pressure", "1.01 bar").status == 0
    (row,) = corelab("setting", "barometric pressure", "--format", "json").rows
    assert (float(str(row["value"])), row["unit"], row["set"]) == (pytest.approx(101.0), "kPa", "set")
    assert corelab("setting", "laboratory name", "Skarvhølm Laboratorium").status == 0
    assert "Skarvhølm" in corelab("setting").out
    told = corelab("history").out
    assert "setting: name laboratory name; value Skarvhølm Laboratorium" in told
    assert corelab("recompute", "--check").status == 0


@pytest.mark.parametrize("zone", ["Mars/Base", "here", "../etc/passwd", "UTC "])
def test_time_zones(demo: Path, corelab: Corelab, zone: str):
    ran = corelab("setting", "time zone", zone)
    assert ran.status == (0 if zone.strip() == "UTC" else 2)
    assert ran.status == 0 or "is not a time zone; write one such as Europe/Oslo or UTC" in ran.err


def test_people(demo: Path, corelab: Corelab, monkeypatch: pytest.MonkeyPatch):
    refused = corelab("person", "add", "Åse", "--role", "technician")
    assert refused.status == 2
    assert "must be a manager" in refused.err
    assert "Registered Åse Næss as manager" in corelab("person", "add", " Åse  Næss", "--role", "manager").err
    stranger = corelab("setting", "depth unit", "ft")
    assert stranger.status == 1
    assert "'Tomas Reyl' is not registered in this lab" in stranger.err
    assert corelab("--by", "åse næss", "person", "add", "Ola", "--role", "technician").status == 0
    assert "did you mean 'Ola'" in corelab("--by", "Olla", "setting", "depth unit", "ft").err
    for act in (("setting", "depth unit", "ft"), ("person", "add", "Kim", "--role", "manager")):
        denied = corelab("--by", "Ola", *act)
        assert denied.status == 1
        assert "Ola may not" in denied.err
        assert "wanted a manager" in denied.err
    monkeypatch.setenv("CORELAB_BY", "Åse Næss")
    assert corelab("setting", "depth unit", "m").status == 0
    assert "Åse Næss  setting: name depth unit; value m." in corelab("history").out
    # reading needs no registration
    assert corelab("--by", "nobody", "well", "list").status == 0


# -- sheets ------------------------------------------------------------------------------------------------


def test_kinds_of_sheets(corelab: Corelab):
    listed = corelab("sheet", "kinds")
    assert [line.split("  ")[0] for line in listed.out.splitlines()] == list(SHEETS)
    shown = corelab("sheet", "kinds", "Gas-Permeability").out
    assert "upstream pressure [kPa]" in shown
    assert "must be filled in" in shown
    assert "did you mean 'masses'" in corelab("sheet", "kinds", "massses").err


def test_a_blank_sheet_is_never_written_over_another(demo: Path, corelab: Corelab, tmp_path: Path):
    out = tmp_path / "blank 7121.xlsx"
    assert corelab("sheet", "blank", "masses", "dimensions", "--out", out, "--well", "QB-1").status == 0
    book = openpyxl.load_workbook(out)
    assert {"masses", "dimensions"} <= set(book.sheetnames)
    plugs = [row["plug"] for row in corelab("plug", "list", "QB-1", "--format", "json").rows]
    column = next(c for c in book["masses"].columns if c[0].value == "plug")
    assert {cell.value for cell in column[1:]} >= set(plugs)
    before = out.read_bytes()
    again = corelab("sheet", "blank", "masses", "--out", out)
    assert again.status == 2
    assert "is there already" in again.err
    assert out.read_bytes() == before
    assert corelab("sheet", "blank", "all", "--out", tmp_path / "all.xlsx").status == 0
    # nothing filled in: nothing to load, and it is no mistake
    loaded = corelab("sheet", "load", tmp_path / "all.xlsx")
    assert loaded.status == 0
    assert "Nothing changed" in loaded.err


def test_loading_checking_and_correcting(
    demo: Path, corelab: Corelab, demo_folder: Path, write_sheet: Callable[..., Path]
):
    again = corelab("sheet", "load", demo_folder / "bench")
    assert (again.status, again.out) == (0, "")
    assert "Nothing changed: the record has all of this already." in again.err
    head = "well,plug,condition,mass [g],measured on"
    wrong = write_sheet("masses", head, "QB-1,1H,dry,heavy,2026-05-01", "QB-1,nn,dry,100,2026-05-01")
    for extra in ([], ["--check"]):
        refused = corelab("sheet", "load", wrong, *extra)
        assert (refused.status, refused.out) == (1, "")
        assert "Nothing was written: 2 problems." in refused.err
        assert "row 2, column 'mass [g]'" in refused.err
        assert "row 3" in refused.err
    good = write_sheet("masses", head, "QB-1,1H,dry,150.25,2026-05-01")
    events = corelab("history").out
    checked = corelab("sheet", "load", good, "--check")
    assert checked.status == 0
    assert "Would be new 1: 1 of masses" in checked.err
    assert corelab("history").out == events
    assert "Computed the results of 1 plugs." in corelab("sheet", "load", good).err
    other = write_sheet("masses", head, "QB-1,1H,dry,151.25,2026-05-01")
    assert corelab("sheet", "load", other).status == 1
    corrected = corelab("sheet", "load", other, "--reason", "balance not at zero")
    assert "Corrected 1: 1 of masses" in corrected.err
    assert "Why: balance not at zero" in corelab("history", "QB-1", "1H").out
    comma = write_sheet(
        "masses", head.replace(",", ";"), "QB-1;1H;dry;151,5;2026-05-02", folder=good.parent / "c"
    )
    assert corelab("sheet", "load", comma, "--decimal-comma").status == 0


def test_withdrawing_what_plug_show_numbers(demo: Path, corelab: Corelab):
    shown = corelab("plug", "show", "QB-1", "1H")
    assert re.search(r"^number  kind", shown.out, re.MULTILINE)
    entries = [r for r in corelab("plug", "show", "QB-1", "1H", "--format", "json").rows if "number" in r]
    number = next(r["number"] for r in entries if r["kind"] == "masses")
    assert re.search(rf"^ *{number}  masses ", shown.out, re.MULTILINE)
    gone = corelab("withdraw", number, "--reason", "wrong plug")
    assert gone.status == 0
    assert f"Withdrew masses {number}" in gone.err
    assert re.search(rf"^ *{number}  masses .*withdrawn", corelab("plug", "show", "QB-1", "1H").out, re.M)
    twice = corelab("withdraw", number, "--reason", "wrong plug")
    assert twice.status == 1
    assert "not in force" in twice.err
    told = corelab("history", "QB-1", "1H").out
    assert f"withdrew masses #{number}. Why: wrong plug" in told
    assert "withdrew 1 reading. Why: wrong plug" in corelab("history", "QB-1").out


# -- what the lab holds ------------------------------------------------------------------------------------


def test_lists(demo: Path, corelab: Corelab):
    wells = corelab("well", "list", "--format", "json").rows
    assert [row["well"] for row in wells] == ["QB-1", "QB-2"]
    for well in wells:
        plugs = corelab("plug", "list", well["well"], "--format", "json").rows
        assert len(plugs) == well["plugs"]
        assert f"depth [{well['depth unit']}]" in plugs[0]
    assert "check plug" in corelab("plug", "list", "standards").out
    assert corelab("well", "list").out.splitlines()[0].split()[0] == "well"


def test_results_of_a_plug_carry_units(demo: Path, corelab: Corelab):
    rows = corelab("plug", "show", "QB-1", "1H", "--format", "json").rows
    assert {row["part"] for row in rows} == {"entries", "results"}
    units = {row["quantity"]: row["unit"] for row in rows if row["part"] == "results"}
    assert (units["bulk volume"], units["klinkenberg permeability"]) == ("cm3", "mD")


@pytest.mark.parametrize("well", ["QB-1", "QB-2"])
def test_recovery(demo: Path, corelab: Corelab, well: str):
    rows = corelab("recovery", well, "--unit", "m", "--format", "json").rows
    runs = [row for row in rows if row["part"] == "core runs"]
    assert runs[-1]["run"] == "all"
    assert runs[-1]["cut [m]"] == pytest.approx(sum(r["cut [m]"] for r in runs[:-1]))
    assert runs[-1]["recovered [m]"] == pytest.approx(sum(r["recovered [m]"] for r in runs[:-1]))
    assert runs[-1]["recovery [%]"] == pytest.approx(100 * runs[-1]["recovered [m]"] / runs[-1]["cut [m]"])
    assert "core runs:" in corelab("recovery", well).out


def test_board(demo: Path, corelab: Corelab):
    rows = corelab("board", "--format", "json").rows
    assert {row["well"] for row in rows} == {"QB-1", "QB-2"}
    assert [row["priority"] for row in rows] == sorted((row["priority"] for row in rows), reverse=True)
    assert {row["well"] for row in corelab("board", "QB-2", "--format", "json").rows} == {"QB-2"}
    assert "waits for" in corelab("board").out


def test_recompute(demo: Path, corelab: Corelab):
    assert "All results follow" in corelab("recompute", "--check").err
    with closing(sqlite3.connect(demo)) as connection:
        for (trigger,) in connection.execute(
            "SELECT name FROM sqlite_master WHERE type = 'trigger' AND tbl_name = 'result'"
        ).fetchall():
            connection.execute(f"DROP TRIGGER {trigger}")
        connection.execute("UPDATE result SET value = value * 1.001 WHERE quantity = 'bulk volume'")
        connection.commit()
    found = corelab("recompute", "--check")
    assert found.status == 1
    assert "bulk volume" in found.out
    assert "results differed." in found.err
    assert corelab("recompute", "--check").status == 1
    mended = corelab("recompute")
    assert mended.status == 0
    assert "were replaced" in mended.err
    assert corelab("recompute", "--check").status == 0


def test_methods(corelab: Corelab):
    rows = corelab("methods", "--format", "json").rows
    assert all(row["key"] and row["title"] and row["source"] for row in rows)
    listed = corelab("methods").out.splitlines()
    assert [line.split()[0] for line in listed] == [*(row["key"] for row in rows), "safety"]
    safety = corelab("methods", "safety").out
    for hazard in ("solvents", "mercury", "compressed gas", "heat", "charges", "sour core"):
        assert f"{hazard}" in safety
    assert "licensed practice govern" in corelab("methods", "saturations").out
    shown = corelab("methods", rows[0]["key"]).out
    assert "equation: " in shown
    assert "source: " in shown


# -- the interval ------------------------------------------------------------------------------------------


def test_interval_as_json_is_the_interval(demo: Path, corelab: Corelab):
    ran = corelab("interval", "QB-1", "--format", "json")
    assert ran.err == ""
    with open_lab(str(demo)) as lab:
        frame = lab.interval("QB-1")
    assert list(ran.rows[0]) == list(frame)
    for heading in frame:
        got = [row[heading] for row in ran.rows]
        empty = "" if heading == "flags" else None
        wanted = [empty if v == "" or v != v else v for v in frame[heading].tolist()]
        assert got == wanted, heading
    assert "NaN" not in ran.out
    uncertain = corelab("interval", "QB-1", "--format", "json", "--with-uncertainty").rows[0]
    keys = list(uncertain)
    assert keys[keys.index("porosity [v/v]") + 1] == "u porosity [v/v]"


@pytest.mark.parametrize("to_file", [False, True])
def test_interval_as_csv_reads_back_the_same(demo: Path, corelab: Corelab, tmp_path: Path, to_file: bool):
    out = tmp_path / "ørret.csv"
    ran = corelab("interval", "QB-2", "--format", "csv", *(["--out", out] if to_file else []))
    assert ran.status == 0
    if to_file:
        assert ran.out == ""
        assert out.read_bytes().startswith(b"\xef\xbb\xbf")
        assert not list(tmp_path.glob(".*part"))
    else:
        assert ran.err == ""
        out.write_text(ran.out, encoding="utf-8")
    with open_lab(str(demo)) as lab:
        frame = lab.interval("QB-2")
    texts = {c: str for c in frame if frame[c].dtype.kind not in "fi"}
    back = pd.read_csv(
        out, dtype=texts, keep_default_na=False, na_values={c: [""] for c in frame if c not in texts}
    )
    pd.testing.assert_frame_equal(back, frame, check_exact=True, check_dtype=False)


def test_the_name_of_the_file_tells_the_format(demo: Path, corelab: Corelab, tmp_path: Path):
    for name in ("a.csv", "a.JSON", "a.txt"):
        assert corelab("interval", "QB-2", "--out", name).status == 0
    assert corelab("interval", "QB-2", "--out", "b.csv", "--format", "json").status == 0
    assert list(pd.read_csv("a.csv", encoding="utf-8-sig"))[:2] == ["well", "plug"]
    assert (tmp_path / "b.csv").read_bytes() == (tmp_path / "a.JSON").read_bytes()
    assert json.loads((tmp_path / "a.JSON").read_text(encoding="utf-8"))
    assert (tmp_path / "a.txt").read_text(encoding="utf-8") == corelab("interval", "QB-2").out


@pytest.mark.parametrize("form", ["json", "table"])
def test_interval_into_a_file(demo: Path, corelab: Corelab, tmp_path: Path, form: str):
    shown = corelab("interval", "QB-2", "--format", form).out
    out = tmp_path / f"interval.{form}"
    written = corelab("interval", "QB-2", "--format", form, "--out", out)
    assert written.out == ""
    assert f"plugs to {out}" in written.err
    assert out.read_text(encoding="utf-8") == shown


def test_parquet(demo: Path, corelab: Corelab, tmp_path: Path):
    by_interval, by_write = tmp_path / "a.parquet", tmp_path / "b.parquet"
    assert corelab("interval", "QB-1", "--format", "parquet", "--out", by_interval).status == 0
    assert corelab("write", "parquet", "QB-1", "--out", by_write).status == 0
    with open_lab(str(demo)) as lab:
        frame = lab.interval("QB-1")
    for path in (by_interval, by_write):
        pd.testing.assert_frame_equal(pd.read_parquet(path), frame, check_exact=True, check_dtype=False)


def test_parquet_without_its_package(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    with pytest.raises(Unavailable, match=r"install corelab\[parquet\]"):
        write_parquet(tmp_path / "a.parquet", pd.DataFrame({"plug": ["1H"]}))


def test_filters_of_the_interval(demo: Path, corelab: Corelab):
    rows = corelab("interval", "QB-1", "--format", "json").rows
    depths = [row["depth [m]"] for row in rows]
    assert depths == sorted(depths)
    top, base = depths[4], depths[9]
    some = corelab("interval", "QB-1", "--top", top, "--base", base, "--format", "json").rows
    assert [r["plug"] for r in some] == [r["plug"] for r in rows if top <= r["depth [m]"] <= base]
    feet = corelab("interval", "QB-1", "--unit", "ft", "--format", "json").rows
    assert feet[0]["depth [ft]"] == pytest.approx(depths[0] / 0.3048, abs=1e-9)
    where = "porosity > 0.15 and not facies contains 'hetero' and klinkenberg permeability is not empty"
    good = corelab("interval", "QB-1", "--where", where, "--format", "json").rows
    assert [r["plug"] for r in good] == [
        r["plug"]
        for r in rows
        if (r["porosity [v/v]"] or 0) > 0.15
        and r["facies"]
        and "hetero" not in r["facies"]
        and r["klinkenberg permeability [mD]"] is not None
    ]
    assert good
    none = corelab("interval", "QB-1", "--top", 1, "--base", 2)
    assert none.out == "none\n\n0 plugs\n"
    assert corelab("interval", "QB-1", "--top", 1, "--base", 2, "--format", "json").out == "[]\n"
    assert len(corelab("interval", "QB-1", "--top", 1, "--base", 2, "--format", "csv").out.splitlines()) == 1


def test_stresses_of_the_interval(demo: Path, corelab: Corelab):
    """Pore volumes under stress shrink; what was not measured at one is empty and says so."""
    with closing(sqlite3.connect(demo)) as connection:
        stresses = [
            s
            for (s,) in connection.execute(
                "SELECT DISTINCT stress_mpa FROM result WHERE quantity = 'porosity' ORDER BY 1"
            )
        ]
    low, high = (
        {
            r["plug"]: r["porosity [v/v]"]
            for r in corelab("interval", "QB-1", "--stress", s, "--format", "json").rows
            if r["porosity [v/v]"] is not None
        }
        for s in (stresses[1], stresses[-1])
    )
    assert high
    assert all(high[plug] < low[plug] for plug in high.keys() & low.keys())
    for row in corelab("interval", "QB-1", "--stress", 99, "--format", "json").rows:
        assert row["porosity [v/v]"] is row["klinkenberg permeability [mD]"] is row["gas"] is None
        assert "not measured at 99 MPa" in row["flags"]


def test_the_table_for_a_terminal(demo: Path, corelab: Corelab, monkeypatch: pytest.MonkeyPatch):
    for width in (80, 120):
        monkeypatch.setattr("corelab.cli.show.room", lambda width=width: width)
        lines = corelab("interval", "QB-1").out.splitlines()
        rows = lines[: lines.index("")]
        assert max(map(len, rows)) <= width
        head = " ".join(rows[:3])
        assert "porosity" in head
        assert "[mD]" in head
        assert "No room for: " in lines[-2]
        assert "--format csv, json or parquet" in lines[-1]
    monkeypatch.undo()


def test_the_table_that_is_passed_on_has_all_columns(demo: Path, corelab: Corelab):
    rows = corelab("interval", "QB-1", "--format", "json").rows
    lines = corelab("interval", "QB-1").out.splitlines()
    filled = [k for k in rows[0] if any(row[k] not in (None, "") for row in rows)]
    assert re.split(r"  +", lines[0].strip()) == filled
    assert f"{len(rows)} plugs" in lines
    assert "No room" not in lines[-1]
    flags = {part for row in rows for part in row["flags"].split("; ") if part}
    assert {re.sub(r"^ *\d+  ", "", line) for line in lines[lines.index("flags:") + 1 : -2]} == flags


# -- exports -----------------------------------------------------------------------------------------------


def test_exports(demo: Path, corelab: Corelab, tmp_path: Path):
    book = tmp_path / "QB-1 for the partner.xlsx"
    assert corelab("write", "workbook", "QB-1", "--out", book, "--for", "Ålesund Energi").status == 0
    assert openpyxl.load_workbook(book).sheetnames
    sheet = tmp_path / "QB-1.csv"
    assert (
        corelab("write", "csv", "QB-1", "--out", sheet, "--unit", "ft", "--where", "source = core").status
        == 0
    )
    frame = pd.read_csv(sheet, encoding="utf-8-sig")
    assert set(frame["source"]) == {"core"}
    assert "depth [ft]" in frame


# -- names, databases, pipes -------------------------------------------------------------------------------


def test_names_beyond_ascii_and_with_slashes(corelab: Corelab, write_sheet: Callable[..., Path]):
    assert corelab("--database", "Kjernelagrét ø.db", "setup").status == 0
    folder = write_sheet("wells", "well,depth unit,field", "7121/8-1,m,Blåmann").parent
    write_sheet("plugs", "well,plug,from,depth [m]", "7121/8-1,1/2 Ø,core,2001.5", "7121/8-1,007,core,2001.5")
    at = ("--database", "Kjernelagrét ø.db")
    assert corelab(*at, "sheet", "load", folder).status == 0
    assert [r["plug"] for r in corelab(*at, "interval", "7121/8-1", "--format", "json").rows] == [
        "1/2 Ø", "007",
    ]  # fmt: skip
    assert "1/2 Ø" in corelab(*at, "plug", "list", "7121/8-1").out
    assert corelab(*at, "plug", "show", "7121/8-1", "1/2 ø").status == 0
    assert "Blåmann" in corelab(*at, "well", "list").out
    assert corelab(*at, "plug", "show", "7121/8-1", "7").status == 1


@pytest.mark.parametrize(
    ("database", "said"),
    [
        ("none.db", "There is no lab at none.db; make one with 'corelab setup'"),
        ("junk.db", "not a database of corelab, or it is damaged"),
        ("cut.db", "damaged"),
        ("folder", "cannot be used"),
        ("no folder/x.db", "There is no lab at"),
        ("mysql://somewhere/lab", "'mysql' is not supported"),
        ("postgresql+psycopg://127.0.0.1:9/lab", "cannot be used"),
    ],
)
def test_a_database_that_cannot_be_used(
    demo: Path, corelab: Corelab, tmp_path: Path, database: str, said: str
):
    (tmp_path / "junk.db").write_text("not a database, only words\n" * 100)
    (tmp_path / "cut.db").write_bytes(demo.read_bytes()[: demo.stat().st_size // 3])
    (tmp_path / "folder").mkdir()
    for words in (["interval", "QB-1"], ["board"], ["setting", "depth unit", "ft"]):
        ran = corelab("--database", database, *words)
        assert (ran.status, ran.out) == (1, "")
        assert said in ran.err
    assert corelab("--database", "no folder/x.db", "setup").status == 1


def test_a_locked_database(demo: Path, corelab: Corelab, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr("corelab.records.engine._WAIT_SECONDS", 0.1)
    with closing(sqlite3.connect(demo, isolation_level=None)) as other:
        other.execute("BEGIN IMMEDIATE")
        ran = corelab("setting", "depth unit", "ft")
        assert ran.status == 1
        assert "another program is writing to it" in ran.err
        # reading goes on
        assert corelab("well", "list").status == 0
        other.execute("ROLLBACK")
    assert corelab("setting", "depth unit", "ft").status == 0


def test_a_fault_of_the_program_is_told_without_a_traceback(
    demo: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
):
    def fail(*_: object) -> None:
        raise ZeroDivisionError("a slip")

    monkeypatch.setattr("corelab.lab.Lab.well_list", fail)
    monkeypatch.setattr(sys, "argv", ["corelab", "well", "list"])
    with pytest.raises(SystemExit) as left:
        main.run()
    said = capsys.readouterr()
    assert left.value.code == 1
    assert said.out == ""
    assert "This should not have happened (ZeroDivisionError)" in said.err
    assert "Traceback" not in said.err
    assert "a slip" in (demo.parent / "corelab.log").read_text(encoding="utf-8")


def test_a_closed_pipe_is_no_fault(demo: Path):
    reader, writer = os.pipe()
    os.close(reader)
    with open(writer, "w") as pipe:
        done = process("plug", "show", "QB-1", "1H", stdout=pipe)
    assert done.stderr == b""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_a_full_disk_is_told(demo: Path):
    with open("/dev/full", "w") as full:
        done = process("well", "list", stdout=full)
    assert done.returncode == 1
    assert done.stderr == b"The output cannot be written: No space left on device. Make room and try again.\n"


def test_output_is_utf_8_whatever_the_terminal(demo: Path, corelab: Corelab):
    assert corelab("setting", "laboratory name", "Skarvhølm 井").status == 0
    done = process("setting", "laboratory name", PYTHONIOENCODING="ascii", LC_ALL="C", PYTHONUTF8="0")
    assert done.returncode == 0
    assert "Skarvhølm 井" in done.stdout.decode("utf-8")


# -- exchange with others ----------------------------------------------------------------------------------

ELSEWHERE = """\
10     2
    W-9                                     Nowhere                                 18Feb09
    Elsewhere Ltd
15     2    2
             1         1  2031   0Elsewhere Ltd       Klinkenberg permeability, Hor.
             2         2  9999   0Elsewhere Ltd       Something else
30     1
     1000.25     0.00   1
40     1    2
        10.50000     3.00000
"""


def test_other_laboratories_results_come_in_and_go_out(demo: Path, corelab: Corelab):
    Path("theirs.spwla").write_text(ELSEWHERE)
    ran = corelab("read", "spwla", "theirs.spwla", "--well", "X/1", "--check")
    assert ran.status == 0 and "nothing was written" in ran.err and ran.out == ""
    assert corelab("plug", "list", "X/1").status == 1
    ran = corelab("read", "spwla", "theirs.spwla", "--well", "X/1")
    assert ran.status == 0
    assert "'Something else' (codes 2 2 9999 0): not understood" in ran.err
    assert "the file names the well 'W-9'" in ran.err
    assert "1 samples, 1 plugs, 1 results of Elsewhere Ltd." in ran.err
    assert "Nothing changed" in corelab("read", "spwla", "theirs.spwla", "--well", "x/1").err
    (row,) = corelab("interval", "X/1", "--where", "laboratory = 'elsewhere ltd'", "--format", "json").rows
    assert (row["plug"], row["klinkenberg permeability [mD]"], row["status"]) == ("1", 10.5, "reported")
    assert "X/1" in [r["well"] for r in corelab("well", "list", "--format", "json").rows]
    assert "Elsewhere Ltd" in corelab("plug", "show", "X/1", "1").out
    assert (
        "reported by Elsewhere Ltd" in corelab("plug", "explain", "X/1", "1", "klinkenberg permeability").out
    )
    for words in (["las"], ["las", "--version", "3.0"], ["spwla"], ["csv"], ["parquet"]):
        out = f"out.{words[0]}"
        ran = corelab("write", *words, "X/1", "--out", out)
        assert ran.status == 0 and f"Wrote {out}. Seal " in ran.err
        assert Path(out).stat().st_size > 100
    Path("theirs.spwla").write_text(ELSEWHERE.replace("10.5", "11.5"))
    ran = corelab("read", "spwla", "theirs.spwla", "--well", "X/1")
    assert ran.status == 1 and "--reason" in ran.err
    assert corelab("read", "spwla", "theirs.spwla", "--well", "X/1", "--reason", "better").status == 0
    states = [r["state"] for r in corelab("read", "list", "X/1", "--format", "json").rows]
    assert states == ["superseded by 2", "in force"]
    assert corelab("read", "withdraw", "2").status == 2
    assert corelab("read", "withdraw", "2", "--reason", "wrong well").status == 0
    assert corelab("interval", "X/1", "--format", "json").rows == []
    assert corelab("verify").status == 0


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (["read", "spwla", "none.spwla", "--well", "W"], 1),
        (["read", "spwla", "lab.db", "--well", "W"], 1),
        (["read", "spwla", "none.spwla"], 2),
        (["write", "las", "QB-1", "--version", "1.2", "--out", "a.las"], 2),
        (["write", "las", "QB-9", "--out", "a.las"], 1),
        (["write", "spwla", "QB-1", "--where", "porosity > 2", "--out", "a.spwla"], 1),
        (["read", "withdraw", "9", "--reason", "none"], 1),
    ],
)
def test_what_cannot_be_exchanged(demo: Path, corelab: Corelab, words: list[str], status: int):
    assert corelab(*words).status == status
    assert not list(Path().glob("a.*"))
