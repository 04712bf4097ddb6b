"""The command `control` as a user types it. No published values."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from corelab import open_lab
from corelab.cli import main

DAYS = [f"2026-02-{day:02d}" for day in range(1, 16)]
Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(
    sqlite_database: str,
    write_sheet: Callable[..., Path],
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> Run:
    """A lab whose porosimeter leaves control on the 15th check."""
    values = [
        45.0,
        45.01,
        44.99,
        45.02,
        44.98,
        45.01,
        44.985,
        45.005,
        45.0,
        45.015,
        44.99,
        45.0,
        45.01,
        44.995,
        46.0,
    ]
    sheets = [
        write_sheet(
            "instruments",
            "instrument,measures,repeatability,scale uncertainty,uncertainty unit,calibrated on,due on",
            "POR-1,volume,0.01,0.01,cm3,2026-01-01,2999-01-01",
            "BAL-1,mass,0.01,0.01,g,2026-01-01,2026-06-01",
        ),
        write_sheet("standards", "standard,kind,valid until", "S-1,check plug,2026-03-01"),
        write_sheet(
            "certified values",
            "standard,result,certified value,unit,standard uncertainty",
            "S-1,grain volume,45,cm3,0.01",
        ),
        write_sheet(
            "grain volume",
            "well,plug,instrument,grain volume [cm3],measured on",
            *(f"standards,S-1,POR-1,{v},{d}" for v, d in zip(values, DAYS, strict=True)),
        ),
    ]  # fmt: skip
    with open_lab(sqlite_database, by="tester") as lab:
        lab.load(sheets)

    def called(*words: str) -> tuple[int, str, str]:
        monkeypatch.setenv("CORELAB_DATABASE", sqlite_database)
        monkeypatch.setattr("sys.argv", ["corelab", "control", *words])
        with pytest.raises(SystemExit) as ended:
            main.run()
        shown = capsys.readouterr()
        assert "Traceback" not in shown.out + shown.err
        return int(ended.value.code or 0), shown.out, shown.err

    return called


def parts(out: str, part: str) -> list[dict[str, object]]:
    return [row for row in json.loads(out) if row["part"] == part]


def test_it_finds_nothing_while_all_is_well(run: Run):
    status, out, _ = run("--on", "2026-02-14", "--format", "json")
    assert status == 0
    states = {r["instrument"]: r["state"] for r in parts(out, "instruments")}
    assert states == {"POR-1": "in control", "BAL-1": "not checked"}
    assert len(parts(out, "checks")) == 14
    (chart,) = parts(out, "charts")
    assert (chart["bad"], chart["limits"]) == (0, "the first 14 good checks")


def test_an_instrument_out_of_control_is_told_in_plain_words(run: Run):
    status, out, _ = run("--on", "2026-02-15")
    assert status == 1
    assert "2026-02-15  POR-1  grain volume of S-1: a value beyond the limits" in out
    status, out, _ = run("por-1", "--on", "2026-02-15")
    assert status == 1
    lines = out.splitlines()
    (header,) = [line for line in lines if line.startswith("POR-1: grain volume of S-1 [cm3]")]
    assert "from the first 14 good checks" in header
    (last,) = [line for line in lines if line.startswith("  2026-02-15")]
    assert "x" in last.split("46")[1].split("a value")[0]
    assert "46 where 45 is certified" in last


def test_an_overdue_calibration_and_a_certificate_that_ran_out_are_found(run: Run):
    status, out, _ = run("--on", "2026-07-01", "--format", "json")
    assert status == 1
    states = {r["instrument"]: r["state"] for r in parts(out, "instruments")}
    assert states["BAL-1"] == "calibration overdue"
    assert [r["state"] for r in parts(out, "standards")] == ["certificate ran out"]
    assert run("BAL-1", "--on", "2026-05-31")[0] == 0
    assert run("BAL-1", "--on", "2026-06-02")[0] == 1


def test_a_day_that_is_none_and_an_unknown_instrument(run: Run):
    status, _, err = run("--on", "14.2.2026")
    assert status == 2
    assert "2026-03-14" in err
    status, _, err = run("POR1")
    assert status == 1
    assert "did you mean 'POR-1'" in err


def test_charts_are_written_beside_the_state(run: Run, tmp_path: Path):
    for ending in ("html", "svg"):
        path = tmp_path / f"c.{ending}"
        status, _, err = run("POR-1", "--charts", str(path), "--on", "2026-02-14")
        assert status == 0
        assert "Wrote" in err
        assert "grain volume of S-1" in path.read_text(encoding="utf-8")
    status, _, err = run("--charts", str(tmp_path / "c.pdf"))
    assert status == 2
    assert ".html, .svg or .png" in err
