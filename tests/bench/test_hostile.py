"""A loader under fire: damaged sheets are refused in words or taken, and the record stays whole.

Mutations are drawn from fixed seeds, so that a failure can be repeated. With CORELAB_CAMPAIGN=full there are
10,000 of them, and what they took is printed at the end.
"""

from __future__ import annotations

import io
import random
import shutil
import sys
import time
import zipfile
from collections import Counter
from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from openpyxl import load_workbook

from corelab import open_lab
from corelab.errors import Refused
from corelab.lab import Lab

SECONDS = 10.0  # promised for one load
MEGABYTES = 1000.0  # promised for the process

REGISTERS = ("registers.xlsx", "01 core runs.csv", "QB-1 core.xlsx", "QB-1 sidewall.xlsx", "03 plugs.csv")
NASTY: tuple[Any, ...] = (
    "", " ", "-", "n/a", "0", "-1", "1e308", "-1e308", "9e299", "1e-308", "1e400", "9" * 400, "0x1F", "1_0",
    "12,5", "1,234.5", "<0.01", ">5000", "<", "#DIV/0!", "#N/A", "=1+1", "=A1", "@SUM(A1)", "nan", "inf",
    "-inf", "TRUE", "None", "null", "007", "1E5", "3-1", "2026-03-14", "2026-02-30", "14.03.2026",
    "50 g", "50%", "NA",
    "'; DROP TABLE plug; --", "{{7*7}}", "<script>", "%s%n", "../../etc", "x" * 40_000, "\u00a0", "\u200b",
    "e\u0301", "\ufffd", "\u0661", "\u2212 5", "a,b", "a;b", "\t", "standards", "QB-1", "QB-2", "1H", "dry",
    "core", "1", "2", "0.5", "1000000",
)  # fmt: skip
NASTY_CELLS: tuple[Any, ...] = (
    *(text for text in NASTY if len(text) < 32_000), 0, -1, 1, 0.5, 1e308, -1e308, 1e-320, 10**15, True,
    False, None,
    datetime(2026, 3, 14), datetime(1899, 12, 31), datetime(9999, 12, 31, 23, 59, 59), "=1/0", "='no tab'!A1",
)  # fmt: skip


Campaign = Callable[[int, int], int]
TAKEN = Counter[str]()
WORST = {"seconds": 0.0}


def peak_megabytes() -> float:
    import resource

    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


@pytest.fixture(scope="module", autouse=True)
def measured() -> Iterator[None]:
    """No load makes the process larger than promised; what all of them took is told."""
    if sys.platform != "linux":
        yield
        return
    before = peak_megabytes()
    yield
    after = peak_megabytes()
    print(f"\n{dict(TAKEN)}; slowest load {WORST['seconds']:.2f} s; peak memory {after:.0f} MB")
    assert after < max(MEGABYTES, before + 1)


@pytest.fixture(scope="module")
def stocked(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, demo_folder: Path) -> Path:
    """A database that holds the demo lab's registers and nothing measured."""
    path = tmp_path_factory.mktemp("hostile") / "lab.db"
    shutil.copyfile(sqlite_template, path)
    with open_lab(str(path), by="tester") as lab:
        lab.load([demo_folder / "bench" / name for name in REGISTERS])
    return path


@pytest.fixture
def fresh(stocked: Path, tmp_path: Path) -> Iterator[Lab]:
    shutil.copyfile(stocked, tmp_path / "lab.db")
    with open_lab(str(tmp_path / "lab.db"), by="tester") as lab:
        yield lab


def under_fire(lab: Lab, path: Path, what: str, **how: Any) -> bool:
    """Load a sheet; whether it was taken. Nothing but a refusal in words may stop it."""
    seal, began = lab.seal(), time.perf_counter()
    refusal = None
    try:
        lab.load([path], **how)
    except Refused as fault:
        refusal = fault
    seconds = time.perf_counter() - began
    assert seconds < SECONDS, what
    WORST["seconds"] = max(WORST["seconds"], seconds)
    TAKEN["taken" if refusal is None else "refused"] += 1
    if refusal is None:
        return True
    assert lab.seal() == seal, what
    assert refusal.problems, what
    for problem in refusal.problems:
        assert all((problem.file, problem.found, problem.wanted, problem.action)), what
        assert len(str(problem)) < 5000, what
    return False


def whole(lab: Lab) -> None:
    assert lab.verify().faults == []
    for well in lab.well_list()["well"]:
        lab.interval(well, with_uncertainty=True)


def mutated_lines(text: str, luck: random.Random) -> tuple[str, str]:
    """CSV text with a few things changed, and what was changed."""
    mark = ";" if text.splitlines()[0].count(";") > 3 else ","
    grid = [line.split(mark) for line in text.splitlines()]
    done = []
    for _ in range(luck.choice((1, 1, 1, 2, 4))):
        row = luck.randrange(len(grid)) if luck.random() < 0.85 else 0
        at = luck.randrange(len(grid[row]))
        act = luck.randrange(7)
        if act <= 2:
            grid[row][at] = luck.choice(NASTY)
        elif act == 3:
            other = luck.randrange(len(grid))
            grid[row][at] = luck.choice(grid[other])
        elif act == 4:
            grid.insert(row, list(grid[row]))
        elif act == 5:
            del grid[row][at]
            grid[row] = grid[row] or [""]
        else:
            word = grid[row][at]
            place = luck.randrange(len(word) + 1)
            grid[row][at] = word[:place] + luck.choice('"\u0001\u00a0.,-0eE<#[]\n') + word[place + 1 :]
        done.append((act, row, at, grid[min(row, len(grid) - 1)][:12]))
    return "\n".join(mark.join(cells) for cells in grid) + "\n", repr(done)[:400]


@pytest.mark.parametrize("name", [
    "01 core runs", "02 core sections", "03 plugs", "04 descriptions", "05 porosimeter calibration",
    "06 masses", "07 distillation", "08 treatments", "09 dimensions", "10 grain volume",
    "11 immersion", "12 not measured",
    "13 gas permeability", "14 reported permeability", "15 core gamma",
])  # fmt: skip
def test_csv_sheets_with_changed_cells(
    fresh: Lab, demo_folder: Path, tmp_path: Path, campaign: Campaign, name: str
) -> None:
    luck = random.Random(name)
    text = (demo_folder / "bench" / f"{name}.csv").read_text(encoding="utf-8-sig")
    lines = text.splitlines()
    text = "\n".join(lines[:1] + luck.sample(lines[1:], min(12, len(lines) - 1))) + "\n"
    path = tmp_path / f"{name}.csv"
    path.write_text(text, encoding="utf-8")
    assert under_fire(fresh, path, "as it was")
    for number in range(campaign(24, 420)):
        changed, what = mutated_lines(text, luck)
        path.write_text(changed, encoding="utf-8", newline="")
        how = {"reason": "again"} if number % 2 else {}
        under_fire(fresh, path, f"{number} {what}", **how)
    whole(fresh)


@pytest.mark.parametrize("name", ["QB-1 volumes", "QB-1 flow", "QB-1 sidewall", "registers", "porosimeters"])
def test_workbooks_with_changed_cells(
    fresh: Lab, demo_folder: Path, tmp_path: Path, campaign: Campaign, name: str
) -> None:
    luck = random.Random(name)
    path = tmp_path / f"{name}.xlsx"
    book = load_workbook(demo_folder / "bench" / f"{name}.xlsx")
    for tab in book.worksheets:
        tab.delete_rows(12, tab.max_row)
    book.save(path)
    short = path.read_bytes()
    for number in range(campaign(8, 360)):
        book = load_workbook(io.BytesIO(short))
        done = []
        for _ in range(luck.choice((1, 2, 5))):
            tab = luck.choice(book.worksheets)
            row = luck.randrange(1, tab.max_row + 1) if luck.random() < 0.8 else 1
            cell = tab.cell(row, luck.randrange(1, tab.max_column + 1))
            value = luck.choice(NASTY_CELLS)
            if isinstance(value, str):
                value = "".join(c for c in value if c.isprintable() or c == "\t")
            cell.value = value
            cell.number_format = luck.choice(("General", "0%", "yyyy-mm-dd", "[h]:mm", "@", "0.00"))
            done.append((tab.title, cell.coordinate, value, cell.number_format))
        book.save(path)
        how = {"reason": "again"} if number % 2 else {}
        under_fire(fresh, path, f"{number} {done}"[:400], **how)
    whole(fresh)


def test_workbooks_with_changed_bytes(
    fresh: Lab, demo_folder: Path, tmp_path: Path, campaign: Campaign
) -> None:
    """In the packed file, and in its parts before they are packed again."""
    luck = random.Random(7)
    whole_file = (demo_folder / "bench" / "porosimeters.xlsx").read_bytes()
    with zipfile.ZipFile(io.BytesIO(whole_file)) as package:
        parts = {name: package.read(name) for name in package.namelist()}
    path = tmp_path / "bench.xlsx"
    for number in range(campaign(120, 1900)):
        if number % 3 == 0:
            data = bytearray(whole_file)
            for _ in range(luck.choice((1, 3, 30))):
                data[luck.randrange(len(data))] = luck.randrange(256)
            path.write_bytes(data if number % 2 else data[: luck.randrange(len(data))])
        else:
            name = luck.choice([n for n in parts if n.endswith((".xml", ".rels"))])
            part = bytearray(parts[name])
            for _ in range(luck.choice((1, 1, 3))):
                at = luck.randrange(len(part))
                piece = luck.choice(
                    (b"<", b">", b'"', b"9", b"-", b"\x00", b"&#0;", b"e", b"t", b"s", b"<!--", b"")
                )
                part[at : at + luck.randrange(3)] = piece
            with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
                for other, body in parts.items():
                    package.writestr(other, bytes(part) if other == name else body)
        under_fire(fresh, path, f"number {number}", reason="again")
    whole(fresh)


@pytest.mark.parametrize("name", ["masses.csv", "masses.xlsx"])
@given(data=st.binary(max_size=300))
@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_bytes(stocked: Path, tmp_path: Path, name: str, data: bytes) -> None:
    (tmp_path / name).write_bytes(data)
    with open_lab(str(stocked), by="tester") as lab:
        under_fire(lab, tmp_path / name, repr(data))


@given(cells=st.lists(st.sampled_from([t for t in NASTY if len(t) < 500]), min_size=12, max_size=12))
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_cells(fresh: Lab, tmp_path: Path, cells: list[str]) -> None:
    heading = (
        "well,plug,condition,mass [lb],container mass [kg],saturant density [kg/m3],salinity [ppm],salt,"
        "balance,measured on,repeat,remarks"
    )
    quoted = ['"' + cell.replace('"', '""') + '"' for cell in cells]
    quoted[:3] = ["QB-2", "1H", "dry"]
    path = tmp_path / "masses.csv"
    path.write_text(f"{heading}\n{','.join(quoted)}\n", encoding="utf-8")
    under_fire(fresh, path, repr(cells), reason="again")


def test_extreme_but_possible_readings_leave_the_record_whole(fresh: Lab, tmp_path: Path) -> None:
    """Numbers at the ends of what is possible: results are had, or their reason is."""
    sheets = {
        "masses": ("well,plug,condition,mass [g]", ["QB-2,{},dry,1e300", "QB-2,{},dry,1e-12"]),
        "dimensions": ("well,plug,length [cm],diameter [cm]", ["QB-2,{},200,0.01", "QB-2,{},0.01,50"]),
        "grain volume": (
            "well,plug,instrument,grain volume [cm3]",
            ["QB-2,{},POR-B,1e300", "QB-2,{},POR-B,1e-12"],
        ),
        "gas permeability": (
            "well,plug,step,gas,upstream pressure [kPa],flow rate [cm3/s]",
            ["QB-2,{},1,helium,1e150,1e150", "QB-2,{},1,helium,1e300,1e300", "QB-2,{},1,air,101.326,1e-12"],
        ),
        "distillation": (
            "well,plug,water volume [cm3],oil density [g/cm3]",
            ["QB-2,{},500,0.3", "QB-2,{},0,1.5"],
        ),
        "retort": (
            "well,plug,sample mass [g],sample bulk volume [cm3],water volume [cm3],oil volume [cm3]",
            ["QB-2,{},1e-12,1e-12,500,500", "QB-2,{},1e300,1e300,0,0"],
        ),
        "sieve": ("well,plug,aperture [mm],mass retained [g]", ["QB-2,{},0,0", "QB-2,{},4096,1e300"]),
        "immersion": (
            "well,plug,liquid,mass displaced [g]",
            ["QB-2,{},water,1e300", "QB-2,{},mercury,1e-12"],
        ),
    }
    for kind, (heading, rows) in sheets.items():
        path = tmp_path / f"{kind}.csv"
        for row in rows:
            path.write_text(f"{heading}\n{row.format('1H')}\n{row.format('7H')}\n")
            under_fire(fresh, path, row, reason="again")
    whole(fresh)


def test_heavy_headings_and_cells_are_read_soon(fresh: Lab, tmp_path: Path) -> None:
    path = tmp_path / "masses.csv"
    for heading in ("a" + " " * 32_000 + "]", "x" * 32_000, "[" * 32_000, "mass" + " " * 32_000 + "[g]"):
        path.write_text(f"well,plug,condition,{heading}\nQB-2,1H,dry,{'1' * 32_000}x\n")
        assert not under_fire(fresh, path, heading[:10])
    path.write_text(",".join(f"mass {n} [g]" for n in range(400)) + "\n")
    assert not under_fire(fresh, path, "400 headings")
    rows = "\n".join(f"QB-2,x{n},drie,heavy" for n in range(4000))
    path.write_text(f"well,plug,condition,mass [g]\n{rows}\n")
    assert not under_fire(fresh, path, "8000 faults")
    rows = "\n".join(f"QB-2,unknown {n},dry,50" for n in range(4000))
    path.write_text(f"well,plug,condition,mass [g]\n{rows}\n")
    assert not under_fire(fresh, path, "4000 unknown plugs")


def packed(path: Path, sheet: bytes, **more: bytes) -> Path:
    """A workbook with one tab called masses, whose XML is given."""
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    links = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
    package = "http://schemas.openxmlformats.org/package/2006/relationships"
    parts = {
        "_rels/.rels": f'<Relationships xmlns="{package}"><Relationship Id="a" Type="{links}/officeDocument" '
        'Target="xl/workbook.xml"/></Relationships>',
        "xl/workbook.xml": f'<workbook xmlns="{main}" xmlns:r="{links}"><sheets><sheet name="masses" '
        'sheetId="1" r:id="b"/></sheets></workbook>',
        "xl/_rels/workbook.xml.rels": f'<Relationships xmlns="{package}"><Relationship Id="b" '
        f'Type="{links}/worksheet" Target="sheet.xml"/></Relationships>',
    }
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as made:
        for name, text in parts.items():
            made.writestr(name, text)
        made.writestr("xl/sheet.xml", sheet)
    return path


SHEET = b'<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>'


@pytest.mark.parametrize(
    ("sheet", "found"),
    [
        (SHEET + b" " * 150_000_000, "unpacks from"),
        (
            b'<!DOCTYPE x [<!ENTITY e SYSTEM "file:///etc/passwd">]>' + SHEET + b"&e;",
            "document type declaration",
        ),
        (b"<!DOCTYPE lolz [<!ENTITY a 'ha'>]>" + SHEET, "document type declaration"),
        (SHEET + b"<a>" * 1_000, "deeply nested"),
        (SHEET, "broken XML"),
        (b"", "broken XML"),
    ],
)
def test_bombs_and_outside_entities(fresh: Lab, tmp_path: Path, sheet: bytes, found: str) -> None:
    path = packed(tmp_path / "bench.xlsx", sheet)
    assert not under_fire(fresh, path, found)
    with pytest.raises(Refused, match=found):
        fresh.load([path])


def test_a_cell_at_the_far_end_costs_nothing(fresh: Lab, tmp_path: Path) -> None:
    row = b'<row r="1048576"><c r="XFD1048576"><v>1</v></c></row></sheetData></worksheet>'
    head = b"".join(
        b'<c r="%s1" t="inlineStr"><is><t>%s</t></is></c>' % (letter, name)
        for letter, name in zip(
            (b"A", b"B", b"C", b"D"), (b"well", b"plug", b"condition", b"mass [g]"), strict=True
        )
    )
    path = packed(tmp_path / "bench.xlsx", SHEET + b'<row r="1">' + head + b"</row>" + row)
    with pytest.raises(Refused, match="XFD1048576"):
        fresh.load([path])
