"""The blank workbook against the declarations it is made from.

Sources: Sheet and Column declarations (corelab.sheets); unit conversions by pint as an oracle; LibreOffice as
a second program that opens the file. Limits of spreadsheet programs, from memory: 255 characters in a header,
an inline list, a message; 32 in its title; 31 in a tab's name.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
import zipfile
from collections.abc import Mapping, Sequence
from datetime import datetime
from math import isfinite
from pathlib import Path

import openpyxl
import pint
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from corelab import units
from corelab.errors import Unavailable, Usage
from corelab.formats.blank_sheets import NOT_BENCH_SHEETS, write_blank
from corelab.quantities import TINY
from corelab.sheets import SHEETS, Column, Sheet, kind_named

KINDS = list(SHEETS.values())
_REGISTRY = pint.UnitRegistry()
_PINT = {"v/v": "", "%": "percent"}
_BOUND = re.compile(r'^IF\(EXACT\(\$([A-Z]+)\$1,"(.+)"\),([^,]+),(-?1E\+300)\)$')


def _written(
    path: Path, *sheets: Sheet, **more: Mapping[str, Sequence[Mapping[str, str]]]
) -> openpyxl.Workbook:
    write_blank(path, sheets, **more)
    return openpyxl.load_workbook(path)


@pytest.fixture(scope="module")
def everything(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, openpyxl.Workbook]:
    path = tmp_path_factory.mktemp("blank") / "bench.xlsx"
    return path, _written(path, *KINDS)


@pytest.fixture(scope="module")
def book(everything: tuple[Path, openpyxl.Workbook]) -> openpyxl.Workbook:
    return everything[1]


def _columns(tab: Worksheet) -> list[tuple[str, str, Column, int]]:
    """Letter, heading, declared column and number (0: not repeated) of each column, as the headings say."""
    found = []
    for cell in tab[1]:
        match = re.fullmatch(r"(.+?)(?: \[(.+)\])?", str(cell.value))
        assert match
        name, number = match[1], 0
        names = {c.name for c in SHEETS[tab.title].columns}
        if name not in names:
            name, digits = name.rsplit(" ", 1)
            number = int(digits)
        column = SHEETS[tab.title].column(name)
        assert (match[2] or "") == column.heading_unit
        found.append((get_column_letter(cell.column), str(cell.value), column, number))
    return found


def _validations(tab: Worksheet) -> dict[str, DataValidation]:
    table = {}
    for validation in tab.data_validations.dataValidation:
        match = re.fullmatch(r"([A-Z]+)2:([A-Z]+)2001", str(validation.sqref))
        assert match and match[1] == match[2] and match[1] not in table
        table[match[1]] = validation
    return table


def test_one_tab_a_kind_between_read_me_and_lists(book: openpyxl.Workbook) -> None:
    assert book.sheetnames == ["read me", *SHEETS, "lists"]
    assert all(len(name) <= 31 for name in book.sheetnames)
    assert [kind_named(name) for name in NOT_BENCH_SHEETS] == [None, None]
    assert all(tab.sheet_state == "visible" for tab in book)


def test_order_as_given_and_no_lists_where_none_is_needed(tmp_path: Path) -> None:
    made = _written(tmp_path / "b.xlsx", SHEETS["masses"], SHEETS["jobs"], SHEETS["masses"])
    assert made.sheetnames == ["read me", "masses", "jobs"]


@pytest.mark.parametrize("kind", SHEETS)
def test_headings_are_the_declared_columns(book: openpyxl.Workbook, kind: str) -> None:
    wanted: list[tuple[str, int]] = []
    for column in SHEETS[kind].columns:
        wanted += [(column.name, n) for n in (1, 2, 3)] if column.repeated else [(column.name, 0)]
    found = _columns(book[kind])
    assert [(column.name, number) for _, _, column, number in found] == wanted
    for _, heading, column, number in found:
        if not number:
            assert heading == column.heading
        if column.heading_unit:
            assert units.unit(column.heading_unit, column.kind).symbol == column.heading_unit
    assert book[kind].max_row == 1


def test_headings_of_a_repeated_column(book: openpyxl.Workbook) -> None:
    headings = [cell.value for cell in book["dimensions"][1]]
    assert headings[2:8] == [f"{name} {n} [mm]" for name in ("length", "diameter") for n in (1, 2, 3)]


@pytest.mark.parametrize("kind", SHEETS)
def test_each_heading_is_explained_and_marked(book: openpyxl.Workbook, kind: str) -> None:
    tab, sheet = book[kind], SHEETS[kind]
    for letter, _, column, number in _columns(tab):
        cell = tab[f"{letter}1"]
        assert cell.comment and cell.comment.author == "corelab"
        text = cell.comment.text
        assert column.note in text
        assert ("Part of the row's identity" in text) == column.key
        assert ("Must be filled in" in text or "At least one must" in text) == column.required
        assert all(word in text for word in column.choices)
        assert not column.default or f"Empty means: {column.default}" in text
        assert ("Takes < and >" in text) == column.limits
        if column.kind:
            assert all(symbol in text for symbol in units.accepted(column.kind))
        assert "inf" not in re.findall(r"[a-z]+", text)
        assert cell.font.bold
        assert (cell.border.bottom.style == "thick") == (column.required and number < 2)
        either = any(column.name in way for group in sheet.either for way in group)
        assert (cell.border.bottom.style == "mediumDashed") == either
        assert ("One of these ways" in text) == either
        assert (cell.fill.fgColor.rgb == tab["A1"].fill.fgColor.rgb) == column.key


def test_notes_are_as_large_as_their_text(everything: tuple[Path, openpyxl.Workbook]) -> None:
    with zipfile.ZipFile(everything[0]) as packed:
        xml = packed.read("xl/drawings/commentsDrawing1.vml").decode()  # the first bench tab
    heights = [int(height) for height in re.findall(r"width:330px;height:(\d+)px", xml)]
    texts = [cell.comment.text for cell in everything[1][KINDS[0].kind][1]]
    assert len(heights) == len(texts)
    for height, text in zip(heights, texts, strict=True):
        lines = sum(1 + len(line) // 55 for line in text.split("\n"))  # about 6 pixels a character
        assert 18 * lines <= height <= 22 * lines + 60


def test_openpyxl_is_imported_only_to_write() -> None:
    code = "import sys, corelab.formats.blank_sheets; sys.exit('openpyxl' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_ranges_in_the_note_are_in_the_unit_of_the_heading(book: openpyxl.Workbook) -> None:
    note = book["dimensions"]["C1"].comment.text  # stored 0.01 to 200 cm, usual 0.5 to 40 cm
    assert "Possible: 0.1 to 2000 mm." in note and "Usual: 5 to 400 mm." in note
    note = next(c for c in book["treatments"][1] if c.value == "humidity [%]").comment.text
    assert "Possible: 0 to 100 %." in note
    note = next(c for c in book["descriptions"][1] if c.value == "grain size [mm]").comment.text
    assert "Possible: 0.00001 to 4096 mm." in note


def _by_pint(value: float, column: Column) -> float:
    """The stored value in the unit of the heading, by another hand."""
    if column.unit == column.heading_unit:
        return value
    stored, offered = (_PINT.get(symbol, symbol) for symbol in (column.unit, column.heading_unit))
    return float(_REGISTRY.Quantity(value, stored).to(offered).magnitude)


def _plain(formula: str, letter: str, heading: str, column: Column, sign: str) -> float:
    """A bound, taken out of the condition that the heading keeps its unit."""
    if not column.kind or len(units.accepted(column.kind)) == 1:
        return float(formula)
    match = _BOUND.match(formula)
    assert match and match[1] == letter and match[2] == heading and match[4] == f"{sign}1E+300"
    return float(match[3])


@pytest.mark.parametrize("kind", SHEETS)
def test_numbers_are_checked_against_the_possible_range(book: openpyxl.Workbook, kind: str) -> None:
    tab = book[kind]
    validations = _validations(tab)
    for letter, heading, column, number in _columns(tab):
        if column.entry != "number":
            continue
        assert column.quantity
        low, high = column.quantity.possible
        if not (isfinite(low) or isfinite(high)):
            assert letter not in validations
            continue
        check = validations[letter]
        assert (
            check.type == "decimal"
            and check.allow_blank
            and check.showErrorMessage
            and check.showInputMessage
        )
        blocks = column.required and number < 2 and not column.limits
        assert check.errorStyle == ("stop" if blocks else "warning")
        assert len(check.prompt) <= 255 and len(check.promptTitle) <= 32
        found = _plain(check.formula1, letter, heading, column, "-")
        if low == TINY:
            assert check.operator == "greaterThan" and found == 0.0 and not isfinite(high)
            assert check.formula2 is None
        elif isfinite(high):
            assert check.operator == "between"
            assert found == pytest.approx(_by_pint(low, column), rel=1e-11)
            top = _plain(check.formula2, letter, heading, column, "")
            assert top == pytest.approx(_by_pint(high, column), rel=1e-11)
        else:
            assert check.operator == "greaterThanOrEqual" and found == pytest.approx(
                _by_pint(low, column), rel=1e-11
            )
            assert check.formula2 is None


@pytest.mark.parametrize("kind", SHEETS)
def test_choices_are_offered(book: openpyxl.Workbook, kind: str) -> None:
    tab = book[kind]
    validations = _validations(tab)
    for letter, _, column, _ in _columns(tab):
        if column.entry == "choice":
            check = validations[letter]
            assert check.type == "list" and not check.showDropDown  # True would hide the arrow
            assert check.errorStyle == ("stop" if column.required else "warning")
            if check.formula1.startswith('"'):
                assert len(check.formula1) <= 257
                offered = check.formula1.strip('"').split(",")
            else:
                name, cells = check.formula1.split("!")
                offered = [cell.value for (cell,) in book[name][cells.replace("$", "")]]
            assert tuple(offered) == column.choices
        elif column.name == "repeat":
            check = validations[letter]
            assert (check.type, check.operator, check.formula1) == ("whole", "greaterThanOrEqual", "1")
        elif column.entry != "number":
            assert letter not in validations
    assert all(len(v.error) <= 255 and len(v.errorTitle) <= 32 for v in validations.values())


@pytest.mark.parametrize("kind", SHEETS)
def test_formats_stand_on_whole_columns(book: openpyxl.Workbook, kind: str) -> None:
    tab = book[kind]
    wanted = {"number": "General", "whole": "General", "date": "yyyy-mm-dd"}
    for letter, _, column, _ in _columns(tab):
        dimension = tab.column_dimensions[letter]
        assert dimension.min == dimension.max
        assert dimension.number_format == wanted.get(column.entry, "@")
        assert dimension.width >= max(map(len, column.heading.split()))


@pytest.mark.parametrize(
    ("kind", "corner"),
    [
        ("plugs", "C2"),
        ("gas permeability", "C2"),
        ("sidewall shots", "D2"),
        ("standards", "B2"),
        ("masses", "C2"),
    ],
)
def test_headings_and_names_stay_in_view(book: openpyxl.Workbook, kind: str, corner: str) -> None:
    assert book[kind].freeze_panes == corner


@pytest.mark.parametrize("kind", SHEETS)
def test_caution_and_print_setup(everything: tuple[Path, openpyxl.Workbook], kind: str) -> None:
    tab = everything[1][kind]
    assert tab.page_setup.orientation == "landscape" and tab.sheet_properties.pageSetUpPr.fitToPage
    assert tab.page_setup.fitToWidth in (1, 2) and tab.page_setup.fitToHeight == 0
    assert tab.print_title_rows == "$1:$1"
    assert (tab.page_setup.fitToWidth == 2) == bool(tab.print_title_cols)
    caution = SHEETS[kind].caution
    assert (caution in tab["A1"].comment.text) and ("CAUTION" in tab["A1"].comment.text) == bool(caution)
    printed = " ".join(item.center.text or "" for item in (tab.oddHeader, tab.oddFooter))
    assert caution in " ".join(printed.split())
    with zipfile.ZipFile(everything[0]) as packed:
        xml = packed.read(f"xl/worksheets/sheet{2 + list(SHEETS).index(kind)}.xml").decode()
    assert "_x000a_" not in xml
    for text in re.findall(r"<odd(?:Header|Footer)>(.*?)</odd", xml, re.DOTALL):
        assert len(text.replace("&amp;", "&")) <= 255


def test_read_me_tells_all_and_holds_no_formula(book: openpyxl.Workbook) -> None:
    cells = [cell for row in book["read me"].iter_rows() for cell in row if cell.value is not None]
    assert {cell.data_type for cell in cells} == {"s"}
    text = "\n".join(cell.value for cell in cells)
    for sheet in KINDS:
        assert sheet.title in text and sheet.caution in text
        assert "identified by: " + ", ".join(column.name for column in sheet.key) in text
    assert "The unit in brackets may be changed to another of the same kind" in text
    links = {cell.value: cell.hyperlink.location for cell in cells if cell.hyperlink}
    assert links == {kind: f"'{kind}'!A1" for kind in SHEETS}


AWKWARD = (
    "=1+1",
    "+3",
    "-2",
    "@SUM(A1)",
    "007",
    "1E5",
    "3-1",
    "NA",
    "TRUE",
    "#N/A",
    "2026-03-14",
    "7121/8-1",
    "æ µ",
)


def test_prefilled_text_stays_text(tmp_path: Path) -> None:
    rows = [{"well": "7121/8-1", "plug": name, "length 2": "31.2"} for name in AWKWARD]
    tab = _written(tmp_path / "b.xlsx", SHEETS["dimensions"], prefilled={"dimensions": rows})["dimensions"]
    assert tuple(tab.cell(row, 2).value for row in range(2, len(rows) + 2)) == AWKWARD
    for row in range(2, len(rows) + 2):
        cell = tab.cell(row, 2)
        assert (cell.data_type, cell.number_format, cell.quotePrefix) == ("s", "@", True)
    assert (tab["C2"].value, tab["D2"].value) == (None, "31.2")


@settings(max_examples=25, deadline=None)
@given(st.text(st.characters(codec="utf-8", categories=("L", "N", "P", "S")), min_size=1, max_size=12))
def test_any_name_comes_back_as_it_was(tmp_path_factory: pytest.TempPathFactory, name: str) -> None:
    path = tmp_path_factory.mktemp("name") / "b.xlsx"
    cell = _written(path, SHEETS["standards"], prefilled={"standards": [{"standard": name}]})["standards"][
        "A2"
    ]
    assert (cell.value, cell.data_type) == (name, "s")


def test_prefilled_for_what_is_not_there_is_refused(tmp_path: Path) -> None:
    with pytest.raises(Usage, match=r"'mases'.*did you mean 'masses'"):
        write_blank(tmp_path / "b.xlsx", [SHEETS["masses"]], prefilled={"mases": []})
    with pytest.raises(Usage, match=r"'plugg' on sheet 'masses'.*did you mean 'plug'"):
        write_blank(tmp_path / "b.xlsx", [SHEETS["masses"]], prefilled={"masses": [{"plugg": "1H"}]})
    assert not list(tmp_path.iterdir())


def test_a_path_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(Unavailable, match="cannot be written"):
        write_blank(tmp_path / "missing" / "b.xlsx", [SHEETS["masses"]])


def _covers(validation: DataValidation, cells: str) -> bool:
    """Whether the cells stand under it, of which LibreOffice keeps 1,000 rows beyond those in use."""
    letter = cells[: cells.index("2:")]
    return all(f"{letter}{row}" in validation.sqref for row in (2, 500, 1000))


@pytest.mark.skipif(not shutil.which("soffice"), reason="LibreOffice is not installed")
def test_libreoffice_keeps_headings_values_and_checks(tmp_path: Path) -> None:
    path = tmp_path / "bench.xlsx"
    kinds = [SHEETS[kind] for kind in ("dimensions", "descriptions", "gas permeability")]
    rows = [{"well": "7121/8-1", "plug": name} for name in AWKWARD]
    made = _written(path, *kinds, prefilled={"dimensions": rows})
    tab = made["dimensions"]
    tab["C2"], tab["J2"] = 31.25, datetime(2026, 3, 14)
    made.save(path)
    subprocess.run(
        [
            "soffice",
            f"-env:UserInstallation=file://{tmp_path}/profile",
            *("--headless", "--convert-to", "xlsx", "--outdir", str(tmp_path / "again"), str(path)),
        ],
        check=True,
        capture_output=True,
        timeout=120,
    )
    again = openpyxl.load_workbook(tmp_path / "again" / "bench.xlsx")
    assert again.sheetnames == made.sheetnames
    for sheet in kinds:
        before, after = made[sheet.kind], again[sheet.kind]
        assert [c.value for c in after[1]][: before.max_column] == [c.value for c in before[1]]
        assert all(after.cell(1, n).comment for n in range(1, before.max_column + 1))
        for validation in before.data_validations.dataValidation:
            (twin,) = (v for v in after.data_validations.dataValidation if _covers(v, str(validation.sqref)))
            assert (twin.type, twin.errorStyle or "stop") == (validation.type, validation.errorStyle)
            if validation.formula1.startswith("IF("):
                assert twin.formula1.replace(" ", "") == validation.formula1.replace(" ", "")
    after = again["dimensions"]
    assert tuple(after.cell(row, 2).value for row in range(2, len(rows) + 2)) == AWKWARD
    assert {after.cell(row, 2).data_type for row in range(2, len(rows) + 2)} == {"s"}
    assert (after["C2"].value, after["J2"].value) == (31.25, datetime(2026, 3, 14))
    assert after.column_dimensions["A"].number_format == "@"
