"""The partner's workbook read back: limits, round trips, pinned layout; no published numbers."""

from __future__ import annotations

import datetime as dt
import re
import time
import zipfile
from dataclasses import replace
from pathlib import Path

import numpy as np
import openpyxl
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from openpyxl.utils.escape import unescape

from corelab.errors import Unavailable, Usage
from corelab.reports.workbook import AT_A_LIMIT, LIKELY_CRUSHED, WellReport, write_workbook

SHEETS = [
    "cover",
    "core and recovery",
    "routine results",
    "sidewall results",
    "charts",
    "methods",
    "provenance",
    "cautions and remarks",
    "chart data",
    "all results",
]


def plug(name: str, depth: float, **more: object) -> dict[str, object]:
    row: dict[str, object] = {
        "well": "7121/8-1",
        "plug": name,
        "source": "core",
        "laboratory": "Lab",
        "run": "1",
        "depth [m]": depth,
        "depth basis": "driller",
        "log depth [m]": np.nan,
        "orientation": "horizontal",
        "facies": "sand",
        "lithology": "sandstone",
        "bulk volume [cm3]": 48.1234,
        "porosity [v/v]": 0.2134567,
        "porosity route": "bulk-grain",
        "grain density [g/cm3]": 2.6512,
        "gas permeability [mD]": 130.0,
        "klinkenberg permeability [mD]": 123.456,
        "permeability stress [MPa]": 2.76,
        "crush likelihood [v/v]": np.nan,
        "crush verdict": None,
        "status": "approved",
        "flags": "",
    }
    return row | more


PLUGS = [
    plug("2H", 2500.0, flags="barometer assumed; slip estimated"),
    plug("3V", 2500.5, facies="mud", **{"klinkenberg permeability [mD]": 0.001234, "porosity [v/v]": 0.05}),
    plug(
        "4H",
        2501.0,
        flags="slip estimated; klinkenberg permeability below limit",
        **{"klinkenberg permeability [mD]": 0.01},
    ),
    plug(
        "5H",
        2501.5,
        flags="permeability not measured: fractured",
        **{"klinkenberg permeability [mD]": np.nan, "gas permeability [mD]": np.nan},
    ),
    plug("6H", 2502.0, flags="zero given", **{"klinkenberg permeability [mD]": 0.0}),
    plug("WC1", 2503.0, source="whole core"),
    plug(
        "S1",
        2510.0,
        source="percussion sidewall",
        run=None,
        flags="barometer assumed; short plug",
        **{"crush likelihood [v/v]": 0.81, "crush verdict": "likely"},
    ),
    plug("S2", 2520.0, source="rotary sidewall", run=None),
]


def report(plugs: list[dict[str, object]] | None = None, **changes: object) -> WellReport:
    made = WellReport(
        well="7121/8-1",
        cover={
            "well": "7121/8-1",
            "job": "J-1",
            "laboratory": "Lab",
            "seal": "0123456789abcdef0123",
            "field": None,
        },
        core_runs=pd.DataFrame(
            [
                ["1", 2500.0, 2510.0, 10.0, 9.0, 90.0, 1.0, "base", ""],
                ["2", 2510.0, 2520.0, 10.0, 10.5, 105.0, 0.0, "base", "stub"],
            ],
            columns=[
                "run",
                "top depth [m]",
                "base depth [m]",
                "cut [m]",
                "recovered [m]",
                "recovery [%]",
                "lost [m]",
                "loss at",
                "notes",
            ],
        ),
        shots=pd.DataFrame(
            [["G1", "percussion", 10, 7, 1, 1, 1, 0, 0], ["R1", "rotary", 5, 4, 0, 0, 0, 1, 0]],
            columns=[
                "gun run",
                "tool",
                "shots",
                "recovered",
                "partial",
                "misfired",
                "lost",
                "empty",
                "not attempted",
            ],
        ),
        results=pd.DataFrame(PLUGS if plugs is None else plugs, columns=list(PLUGS[0])),
        methods=[
            {
                "key": "porosity",
                "version": "1",
                "title": "Porosity",
                "equation": "=V_p/V_b",
                "symbols": "V_p",
                "valid": "any",
                "source": "definition",
            }
        ],
        provenance=pd.DataFrame(
            [
                [
                    "2H",
                    "masses",
                    1,
                    dt.date(2026, 3, 2),
                    "A",
                    "B-1",
                    dt.datetime(2026, 3, 3, 9, 30),
                    "A",
                    "f.xlsx",
                    "masses",
                    5,
                    "mass 100 g",
                ]
            ],
            columns=[
                "plug",
                "kind",
                "reading number",
                "measured on",
                "measured by",
                "instrument",
                "entered on",
                "entered by",
                "file",
                "sheet",
                "row",
                "entry",
            ],
        ),
        cautions=["Mind the barometer."],
        remarks=["Cleaned."],
    )
    return replace(made, **changes)  # type: ignore[arg-type]


EMPTY = {
    "core_runs": pd.DataFrame(),
    "shots": pd.DataFrame(),
    "results": pd.DataFrame(),
    "provenance": pd.DataFrame(),
    "methods": [],
    "cautions": [],
    "remarks": [],
    "cover": {},
}


@pytest.fixture
def file(tmp_path: Path) -> Path:
    return tmp_path / "well.xlsx"


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> openpyxl.Workbook:
    """The plain report, read back."""
    return written(tmp_path_factory.mktemp("plain") / "well.xlsx", report())


def written(file: Path, made: WellReport) -> openpyxl.Workbook:
    write_workbook(file, made)
    return openpyxl.load_workbook(file)


def table(sheet: openpyxl.worksheet.worksheet.Worksheet, first: str = "plug") -> dict[str, dict[str, object]]:
    """The cells of the table whose heading row starts with `first`, by row name and heading."""
    rows = iter(sheet.iter_rows())
    headings = next([cell.value for cell in row] for row in rows if row[0].value == first)
    found = {}
    for row in rows:
        if row[0].value is None:
            break
        found[row[0].value] = dict(zip(headings, row, strict=True))
    return found


def texts(sheet: openpyxl.worksheet.worksheet.Worksheet) -> list[str]:
    return [cell.value for row in sheet.iter_rows() for cell in row if isinstance(cell.value, str)]


def charts(sheet: openpyxl.worksheet.worksheet.Worksheet) -> dict[str, object]:
    return {"".join(r.t for r in chart.title.tx.rich.paragraphs[0].r): chart for chart in sheet._charts}


def drawn(book: openpyxl.Workbook, chart: object) -> dict[str, list[tuple[object, object]]]:
    """The points of each series of a chart, by the name of the series."""

    def values(reference: str) -> list[object]:
        cells = book["chart data"][reference.rpartition("!")[2].replace("$", "")]
        return [row[0].value for row in cells] if isinstance(cells, tuple) else [cells.value]

    return {
        values(s.tx.strRef.f)[0]: list(zip(values(s.xVal.numRef.f), values(s.yVal.numRef.f), strict=True))
        for s in chart.series
    }


def test_sheets_and_contents(book: openpyxl.Workbook) -> None:
    assert book.sheetnames == SHEETS
    links = [cell.hyperlink.location for row in book["cover"].iter_rows() for cell in row if cell.hyperlink]
    assert links == [f"'{name}'!A1" for name in SHEETS[1:]]
    assert {"7121/8-1", "J-1", "0123456789abcdef0123", "not stated"} <= set(texts(book["cover"]))
    assert any("Mind the barometer." in text for text in texts(book["cautions and remarks"]))


def test_numbers_are_numbers_shown_with_sensible_decimals(book: openpyxl.Workbook) -> None:
    rows = table(book["routine results"])
    first = rows["2H"]
    assert first["porosity [v/v]"].value == 0.2134567
    assert first["porosity [v/v]"].number_format == "0.0000"
    assert first["depth [m]"].value == 2500.0
    assert first["depth [m]"].number_format == "0.00"
    assert first["grain density [g/cm3]"].number_format == "0.000"
    permeability = "klinkenberg permeability [mD]"
    assert first[permeability].number_format == "0"
    assert rows["3V"][permeability].number_format == "0.00000"
    assert rows["4H"][permeability].value == 0.01
    assert rows["4H"][permeability].number_format == '"< "0.0000'
    assert rows["5H"][permeability].value is None
    assert list(rows) == ["2H", "3V", "4H", "5H", "6H", "WC1"]


@pytest.mark.parametrize(
    ("value", "code"),
    [
        (3586.4, "0"),
        (123.456, "0"),
        (99.96, "0"),
        (12.34, "0.0"),
        (9.996, "0.0"),
        (1.234, "0.00"),
        (0.1234, "0.000"),
        (0.01234, "0.0000"),
        (0.00001234, "0.00E+00"),
        (0.0, "0"),
    ],
)
def test_permeability_has_three_significant_digits(file: Path, value: float, code: str) -> None:
    made = report([plug("1", 1.0, **{"klinkenberg permeability [mD]": value})])
    cell = table(written(file, made)["routine results"])["1"]["klinkenberg permeability [mD]"]
    assert (cell.value, cell.number_format) == (value, code)


def test_percent_and_feet_and_uncertainties_follow_the_headings(file: Path) -> None:
    frame = pd.DataFrame([plug("1", 8202.1)]).rename(
        columns={"depth [m]": "depth [ft]", "porosity [v/v]": "porosity [%]"}
    )
    frame["porosity [%]"] = 21.34567
    frame.insert(list(frame.columns).index("porosity [%]") + 1, "u porosity [%]", 0.1234)
    book = written(file, report(results=frame))
    row = table(book["routine results"])["1"]
    assert row["porosity [%]"].number_format == "0.00"
    assert row["u porosity [%]"].number_format == "0.00"
    assert row["depth [ft]"].value == 8202.1
    chart = charts(book["charts"])["Porosity against depth"]
    assert chart.x_axis.title.tx.rich.paragraphs[0].r[0].t == "porosity [%]"
    assert "[ft]" in chart.y_axis.title.tx.rich.paragraphs[0].r[0].t


def test_every_flag_becomes_a_note(book: openpyxl.Workbook) -> None:
    for name in ("routine results", "sidewall results"):
        sheet = book[name]
        rows = table(sheet)
        start = next(row[0].row for row in sheet.iter_rows() if row[0].value == "Notes")
        notes = {
            str(row[0].value): row[1].value
            for row in sheet.iter_rows(start + 1)
            if isinstance(row[0].value, int)
        }
        for given_plug in PLUGS:
            if given_plug["plug"] in rows:
                numbers = rows[given_plug["plug"]]["notes"].value
                found = [notes[n] for n in numbers.split(", ")] if numbers else []
                assert sorted(found) == sorted(filter(None, str(given_plug["flags"]).split("; ")))
        assert len(set(notes.values())) == len(notes) > 0


def test_tables_can_be_filtered_and_printed(book: openpyxl.Workbook) -> None:
    sheet = book["routine results"]
    assert sheet.freeze_panes == "B6"
    assert sheet.auto_filter.ref.startswith("A5:")
    assert sheet.auto_filter.ref.endswith("11")
    assert sheet.print_title_rows == "$5:$5"
    assert sheet.page_setup.orientation == "landscape"
    assert sheet.page_setup.fitToWidth == 1
    assert sheet.sheet_properties.pageSetUpPr.fitToPage


def test_what_is_the_same_everywhere_is_said_once(book: openpyxl.Workbook) -> None:
    sheet = book["routine results"]
    assert "porosity route" not in table(sheet)["2H"]
    assert "source" in table(sheet)["2H"]
    assert any("porosity route bulk-grain" in t and "permeability stress 2.76 MPa" in t for t in texts(sheet))


def test_sidewall_plugs_stand_apart_with_their_verdicts(file: Path) -> None:
    rows = table(written(file, report())["sidewall results"])
    assert list(rows) == ["S1", "S2"]
    assert (rows["S1"]["tool"].value, rows["S2"]["tool"].value) == ("percussion", "rotary")
    assert rows["S1"]["crush likelihood [v/v]"].value == 0.81
    assert rows["S1"]["crush verdict"].value == "likely"
    only_rotary = table(written(file, report([PLUGS[-1]]))["sidewall results"])
    assert "crush verdict" not in only_rotary["S2"]


def test_no_plug_is_lost_whatever_its_source(file: Path) -> None:
    book = written(
        file, report([plug("1", 1.0, source="tray of unknown origin"), plug("2", 2.0, source=None)])
    )
    assert list(table(book["routine results"])) == ["1", "2"]


def test_totals_of_runs_and_shots(book: openpyxl.Workbook) -> None:
    sheet = book["core and recovery"]
    total = table(sheet, "run")["all runs"]
    assert [total[h].value for h in ("cut [m]", "recovered [m]", "lost [m]")] == [20.0, 19.5, 1.0]
    assert total["recovery [%]"].value == pytest.approx(97.5)
    total = table(sheet, "gun run")["all gun runs"]
    assert [total[h].value for h in ("shots", "recovered", "empty", "tool")] == [15, 11, 1, None]


def test_charts(book: openpyxl.Workbook) -> None:
    found = charts(book["charts"])
    assert list(found) == [
        "Porosity against depth",
        "Permeability against depth",
        "Permeability against porosity",
    ]
    for name, chart in found.items():
        assert not chart.x_axis.delete
        assert not chart.y_axis.delete
        assert all(s.marker.symbol and s.graphicalProperties.line.noFill for s in chart.series)
        assert chart.x_axis.majorGridlines
        assert chart.y_axis.majorGridlines
        shown, other = name.lower().split(" against ")
        across, up = (shown, other) if other == "depth" else (other, shown)
        for axis, title in ((chart.x_axis, across), (chart.y_axis, up)):
            label = axis.title.tx.rich.paragraphs[0].r[0].t
            assert title in label
            assert "[" in label
            assert axis.scaling.logBase == (10 if title == "permeability" else None)
            assert axis.scaling.orientation == ("maxMin" if title == "depth" else "minMax")
        points = [point for series in drawn(book, chart).values() for point in series]
        for position, axis in enumerate((chart.x_axis, chart.y_axis)):
            assert all(axis.scaling.min <= point[position] <= axis.scaling.max for point in points)
            assert axis.scaling.logBase is None or axis.scaling.min > 0


def test_series_of_the_charts(book: openpyxl.Workbook) -> None:
    found = charts(book["charts"])
    porosity = drawn(book, found["Porosity against depth"])
    assert sorted(porosity) == sorted(["sand", "mud", "rotary sidewall", LIKELY_CRUSHED])
    assert porosity["mud"] == [(0.05, 2500.5)]
    assert len(porosity["sand"]) == 5
    permeability = drawn(book, found["Permeability against depth"])
    assert permeability[AT_A_LIMIT] == [(0.01, 2501.0)]
    assert sum(map(len, permeability.values())) == len(PLUGS) - 2  # one not measured, one of zero
    said = " ".join(texts(book["charts"]))
    assert "2 of 8 plugs have no permeability to draw. 1 of them" in said
    assert "limit" in said


def test_many_facies_are_told_apart_by_source_only(file: Path) -> None:
    book = written(file, report([plug(str(n), float(n), facies=f"facies {n}") for n in range(30)]))
    assert list(drawn(book, charts(book["charts"])["Porosity against depth"])) == ["core"]


def test_mixed_depth_bases_are_drawn_on_log_depth_or_said(file: Path) -> None:
    mixed = [plug("1", 100.0), plug("2", 101.0, **{"depth basis": "log", "log depth [m]": 101.0})]
    assert "do not compare closely" in " ".join(texts(written(file, report(mixed))["charts"]))
    mixed[0]["log depth [m]"] = 102.5
    book = written(file, report(mixed))
    assert "Depths are log depths" in " ".join(texts(book["charts"]))
    assert [y for _, y in drawn(book, charts(book["charts"])["Porosity against depth"])["sand"]] == [
        101.0,
        102.5,
    ]


def test_gas_permeability_is_drawn_where_there_is_no_klinkenberg(file: Path) -> None:
    book = written(file, report([plug("1", 1.0, **{"klinkenberg permeability [mD]": np.nan})]))
    chart = charts(book["charts"])["Permeability against depth"]
    assert chart.x_axis.title.tx.rich.paragraphs[0].r[0].t == "gas permeability [mD]"
    assert drawn(book, chart)["sand"] == [(130.0, 1.0)]


def test_a_single_point_still_has_axes(file: Path) -> None:
    for chart in charts(written(file, report([plug("1", 0.0)]))["charts"]).values():
        for axis in (chart.x_axis, chart.y_axis):
            assert axis.scaling.min < axis.scaling.max


@pytest.mark.parametrize("recipient", ["Example Oil", "R&D Oil & Gas", "8 Sisters", "=1+1"])
def test_recipient_well_seal_and_page_stand_on_every_sheet(file: Path, recipient: str) -> None:
    book = written(file, report(recipient=recipient))
    for sheet in book:
        assert sheet.oddHeader.left.text == "well 7121/8-1"
        assert sheet.oddHeader.right.text.replace("&&", "&") == f"for {recipient}"
        assert sheet.oddFooter.left.text == "seal 0123456789abcdef…"
        assert sheet.oddFooter.right.text == "page &P of &N"
    assert f"Prepared for {recipient}" in texts(book["cover"])


def test_without_recipient(book: openpyxl.Workbook) -> None:
    assert all(not sheet.oddHeader.right.text for sheet in book)


@pytest.mark.parametrize("emptied", [*EMPTY, "all"])
def test_what_is_empty_is_said(file: Path, emptied: str) -> None:
    book = written(file, report(**(EMPTY if emptied == "all" else {emptied: EMPTY[emptied]})))
    assert book.sheetnames == SHEETS
    if emptied in ("results", "all"):
        assert "No results of core plugs belong to this report." in texts(book["routine results"])
        assert not book["charts"]._charts


def test_frames_with_headings_but_no_rows(file: Path) -> None:
    made = report([])
    made = replace(made, core_runs=made.core_runs[:0], shots=made.shots[:0], provenance=made.provenance[:0])
    book = written(file, made)
    assert "No core was cut." in texts(book["core and recovery"])
    assert list(next(book["all results"].values)) == list(PLUGS[0])


def test_nothing_measured(file: Path) -> None:
    blank = {heading: np.nan for heading in PLUGS[0] if "[" in heading}
    book = written(file, report([plug("1", 1.0) | blank]))
    assert list(table(book["routine results"])) == ["1"]
    assert not book["charts"]._charts


def test_all_results_are_whole(book: openpyxl.Workbook) -> None:
    sheet = book["all results"]
    back = pd.DataFrame(sheet.iter_rows(min_row=2, values_only=True), columns=next(sheet.values))
    wanted = pd.DataFrame(PLUGS).astype(object)
    wanted = wanted.where(wanted.notna() & (wanted != ""), None)
    pd.testing.assert_frame_equal(back.astype(object).where(back.notna(), None), wanted, check_dtype=False)


def test_provenance_keeps_dates(book: openpyxl.Workbook) -> None:
    row = table(book["provenance"])["2H"]
    assert row["measured on"].value == dt.datetime(2026, 3, 2)
    assert row["entered on"].value == dt.datetime(2026, 3, 3, 9, 30)
    assert row["reading number"].value == 1


AWKWARD = st.builds(
    str.__add__,
    st.sampled_from(["", "=", "+", "-", "@", "\t", "=HYPERLINK(", "&", "'"]),
    st.text(
        st.characters(exclude_categories=["Cs"], min_codepoint=32, exclude_characters="\ufffe\uffff"),
        max_size=20,
    ),
)


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(AWKWARD, AWKWARD, AWKWARD, AWKWARD, st.text(max_size=10))
def test_no_text_becomes_a_formula_and_all_read_back(
    file: Path, name: str, facies: str, flag: str, remark: str, wild: str
) -> None:
    flag = flag.replace(";", ",").strip()
    made = report(
        [plug("1", 1.0, plug=name, facies=facies, lithology=wild, flags=flag)],
        well=name,
        recipient=facies,
        cautions=[remark],
        remarks=[remark, wild],
    )
    made = replace(made, cover={**made.cover, "client": name, "job": wild, "seal": wild})
    book = written(file, made)
    with zipfile.ZipFile(file) as parts:
        sheets = [parts.read(n).decode() for n in parts.namelist() if n.startswith("xl/worksheets/sheet")]
    assert len(sheets) == len(SHEETS)
    assert not any(re.search(r"<f[ >/]", sheet) or re.search(r' t="(e|str|b)"', sheet) for sheet in sheets)
    for sheet_name, sought in (
        ("cover", [name]),
        ("routine results", [name, facies, flag]),
        ("all results", [flag]),
        ("cautions and remarks", [remark]),
    ):
        found = {unescape(text) for text in texts(book[sheet_name])}
        assert {text for text in sought if text} <= found


def test_five_hundred_plugs_in_reasonable_time(file: Path) -> None:
    made = report([plug(str(n), 2500 + n / 4, flags=f"flag {n % 7}") for n in range(500)])
    made = replace(made, provenance=pd.concat([made.provenance] * 1000, ignore_index=True))
    start = time.perf_counter()
    write_workbook(file, made)
    assert time.perf_counter() - start < 20
    assert len(table(openpyxl.load_workbook(file, read_only=False)["routine results"])) == 500


def test_a_file_that_cannot_be_written_is_told_and_the_old_one_kept(
    file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with pytest.raises(Usage, match="xlsx"):
        write_workbook(tmp_path / "well.xls", report())
    with pytest.raises(Unavailable, match="folder"):
        write_workbook(tmp_path / "none" / "well.xlsx", report())
    file.write_bytes(b"the old one")

    def locked(*paths: object) -> None:
        raise PermissionError(13, "in use")

    monkeypatch.setattr("os.replace", locked)
    with pytest.raises(Unavailable, match="close the workbook"):
        write_workbook(file, report())
    assert file.read_bytes() == b"the old one"
    assert [path.name for path in tmp_path.iterdir()] == ["well.xlsx"]
