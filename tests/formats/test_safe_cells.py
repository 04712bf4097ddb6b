"""Cells hold what was given, and never a formula.

Limits: 32 767 characters a cell and 31 a sheet title are those of spreadsheet programs (common practice).
"""

from __future__ import annotations

import datetime as dt
import io
from decimal import Decimal

import numpy as np
import openpyxl
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl.utils.escape import unescape

from corelab.formats.safe_cells import CUT, MOST_CHARACTERS, cell_text, margin_text, plain, put, sheet_title

AWKWARD = [
    "=1+1",
    "=",
    "+1",
    "-5",
    "@SUM(A1)",
    "\t=1",
    "\r=1",
    "\n=1",
    "'x",
    "#N/A",
    "#REF!",
    "1E5",
    "007",
    "TRUE",
    "2026-01-02",
    " =1 ",
    "_x000D_",
    "_x005F_x000D_",
    "a\r\nb",
    '=HYPERLINK("x")',
    "😀" * 5,
    "   ",
    "_",
    "\x7f",
]


def through_a_file(values: list[object]) -> list[openpyxl.cell.cell.Cell]:
    book = openpyxl.Workbook()
    for row, value in enumerate(values, 1):
        put(book.active.cell(row, 1), value)
    file = io.BytesIO()
    book.save(file)
    file.seek(0)
    sheet = openpyxl.load_workbook(file).active
    return [sheet.cell(row, 1) for row in range(1, len(values) + 1)]


def check_texts(texts: list[str]) -> None:
    for text, cell in zip(texts, through_a_file(list(texts)), strict=True):
        assert cell.data_type == "s"
        assert unescape(cell.value) == text
        if "\r" not in text and "_x" not in text:
            assert cell.value == text


def test_awkward_texts_read_back() -> None:
    check_texts(AWKWARD)


_LEGAL = st.characters(
    exclude_categories=["Cs"],
    exclude_characters=[*map(chr, [*range(9), 11, 12, *range(14, 32)]), "\ufffe", "\uffff"],
)


@settings(max_examples=30, deadline=None)
@given(
    st.lists(
        st.builds(
            str.__add__, st.sampled_from(["", "=", "+", "-", "@", "\t", "\r", "_x0041_"]), st.text(_LEGAL)
        ).filter(bool),
        min_size=1,
    )
)
def test_any_legal_text_reads_back(texts: list[str]) -> None:
    check_texts(texts)


@settings(max_examples=30, deadline=None)
@given(st.lists(st.text(st.characters(exclude_categories=[])), min_size=1))
def test_no_text_spoils_the_file(texts: list[str]) -> None:
    cells = through_a_file(list(texts))
    assert all(cell.data_type == ("s" if text else "n") for cell, text in zip(cells, texts, strict=True))


def test_what_xml_cannot_hold_is_seen() -> None:
    assert cell_text("a\x00b\x1fc\ud800d\ufffee") == "a\u2400b\u241fc\ufffdd\ufffde"


@pytest.mark.parametrize("unit", ["a", "😀", "\r", "_x0041_", "_"])
def test_too_long_a_text_is_cut_with_a_mark(unit: str) -> None:
    text = cell_text(unit * MOST_CHARACTERS + "end")
    assert len(text.encode("utf-16-le")) // 2 <= MOST_CHARACTERS
    assert text.endswith(CUT)
    kept = unescape(text.removesuffix(CUT))
    assert (unit * MOST_CHARACTERS).startswith(kept)
    assert cell_text("a" * MOST_CHARACTERS) == "a" * MOST_CHARACTERS


@pytest.mark.parametrize(
    "nothing", [None, "", float("nan"), np.nan, pd.NA, pd.NaT, np.datetime64("NaT"), Decimal("NaN")]
)
def test_what_is_not_there_is_empty(nothing: object) -> None:
    assert plain(nothing) is None


def test_numbers_are_numbers() -> None:
    given_values = [1, 0.1, -2.5e-7, np.float64(3.25), np.float32(0.5), np.int64(7), Decimal("1.5")]
    for value, cell in zip(given_values, through_a_file(list(given_values)), strict=True):
        assert cell.data_type == "n"
        assert cell.value == float(value)


def test_what_a_cell_would_distort_is_text() -> None:
    assert plain(float("inf")) == "infinite"
    assert plain(float("-inf")) == "minus infinite"
    assert plain(2**53 + 1) == "9007199254740993"
    assert plain(dt.date(1899, 5, 1)) == "1899-05-01"
    assert plain(dt.datetime(2026, 3, 14, 9, 30, tzinfo=dt.UTC)) == "2026-03-14 09:30:00+00:00"
    assert [plain(v) for v in (True, False, np.True_, np.False_)] == ["yes", "no", "yes", "no"]


def test_dates_are_dates() -> None:
    moment = dt.datetime(2026, 3, 14, 9, 30)
    cells = through_a_file(
        [dt.date(2026, 3, 14), moment, pd.Timestamp(moment), np.datetime64("2026-03-14T09:30")]
    )
    assert all(cell.is_date for cell in cells)
    assert cells[0].value == dt.datetime(2026, 3, 14)
    assert [cell.value for cell in cells[1:]] == [moment] * 3


def test_number_format_only_for_numbers() -> None:
    sheet = openpyxl.Workbook().active
    put(sheet["A1"], 0.25, "0.000")
    put(sheet["A2"], dt.date(2026, 3, 14), "0.000")
    put(sheet["A3"], "x", "0.000")
    assert sheet["A1"].number_format == "0.000"
    assert sheet["A2"].is_date
    assert sheet["A3"].number_format == "General"


def test_sheet_titles() -> None:
    assert sheet_title("7121/8-1") == "7121-8-1"
    assert sheet_title("'[a]*?:x'") == "-a----x"
    assert sheet_title("History") != "History"
    assert sheet_title("Charts", ["charts", "charts 2"]) == "Charts 3"


@settings(max_examples=60, deadline=None)
@given(st.lists(st.text(max_size=40), min_size=1, max_size=4))
def test_any_name_makes_a_title_of_its_own(names: list[str]) -> None:
    book = openpyxl.Workbook()
    for name in names:
        title = sheet_title(name, book.sheetnames)
        assert 0 < len(title.encode("utf-16-le")) // 2 <= 31
        assert title[0] != "'" != title[-1]
        assert book.create_sheet(title).title == title


def test_margins_hold_no_commands() -> None:
    assert margin_text("R&D\nOil") == "R&&D Oil"
    assert margin_text("x" * 100) == "x" * 59 + "…"
    assert len(margin_text("&" * 100)) <= 60
