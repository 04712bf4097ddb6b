"""The empty bench workbook, made from the declarations of its sheets."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from decimal import Decimal
from itertools import takewhile
from math import ceil, isfinite
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal, NamedTuple

from corelab.errors import Unavailable, Usage, did_you_mean, quoted
from corelab.quantities import TINY, Range
from corelab.sheets.declaration import MOST_REPEATED_COLUMNS, Column, Sheet
from corelab.units import accepted, convert, unit

if TYPE_CHECKING:
    from openpyxl.workbook import Workbook
    from openpyxl.worksheet.datavalidation import DataValidation
    from openpyxl.worksheet.worksheet import Worksheet

READ_ME = "read me"
LISTS = "lists"
#: Tabs of a bench workbook that hold no readings.
NOT_BENCH_SHEETS = (READ_ME, LISTS)
AUTHOR = "corelab"
OFFERED_REPEATS = 3
LAST_ROW = 2001
_LONGEST_INLINE_LIST = 255
_LONGEST_MESSAGE, _LONGEST_TITLE = 255, 32  # what spreadsheet programs take
_BEYOND = "1E+300"
_WIDEST_PAGE = 230  # characters across that can still be read on one A4 page

_FONT = "Calibri"
_ROW_HEIGHT = 18.0
_SLATE, _INK, _RULE, _FAINT, _MIST = "24424D", "1F2A2E", "B8C4C8", "D9E0E2", "EEF2F3"
_SAND, _OCHRE, _RED = "F5EBD7", "C58B2A", "9C2F22"
_WIDTHS = {
    "name": 13,
    "text": 16,
    "number": 11,
    "whole": 9,
    "choice": 13,
    "choices": 24,
    "date": 18,
    "unit": 13,
}
_TEXT_ENTRIES = ("name", "text", "choice", "choices", "unit")


class _Place(NamedTuple):
    """One column of the tab: its declaration, and its number where it is repeated."""

    column: Column
    number: int

    @property
    def name(self) -> str:
        return f"{self.column.name} {self.number}" if self.number else self.column.name

    @property
    def heading(self) -> str:
        unit_typed = self.column.heading_unit
        return f"{self.name} [{unit_typed}]" if unit_typed else self.name

    @property
    def must(self) -> bool:
        return self.column.required and self.number < 2


def write_blank(
    path: Path,
    sheets: Sequence[Sheet],
    *,
    prefilled: Mapping[str, Sequence[Mapping[str, str]]] | None = None,
) -> None:
    """Write an empty bench workbook, one tab a kind, ready to be filled in.

    Parameters
    ----------
    path
        The workbook to write; one that stands there is replaced.
    sheets
        The kinds, in the order of their tabs.
    prefilled
        Rows to start with, by kind: texts by column name (`length 2` in a repeated column). They are
        written as text, whatever they begin with.

    Raises
    ------
    Usage
        If `prefilled` names a kind or a column that the workbook does not have.
    Unavailable
        If the file cannot be written.
    """
    from openpyxl import Workbook

    book = Workbook()
    book.properties.creator = AUTHOR
    book.properties.title = "Bench sheets"
    kinds = list(dict.fromkeys(sheets))
    rows = prefilled or {}
    for kind in rows:
        if kind not in (names := [sheet.kind for sheet in kinds]):
            raise Usage(f"no tab {quoted(kind)} to fill in beforehand: {did_you_mean(kind, names)}")
    front = book.worksheets[0]
    front.title = READ_ME
    _read_me(front, kinds)
    for sheet in kinds:
        _tab(book, sheet, rows.get(sheet.kind, ()))
    if LISTS in book.sheetnames:
        book.move_sheet(LISTS, len(kinds))
    try:
        book.save(path)
    except PermissionError as fault:
        raise Unavailable(f"{path} cannot be written: close it in the spreadsheet program") from fault
    except OSError as fault:
        raise Unavailable(f"{path} cannot be written ({fault.strerror}): check the path") from fault


def _places(sheet: Sheet) -> list[_Place]:
    return [
        _Place(column, number)
        for column in sheet.columns
        for number in (range(1, OFFERED_REPEATS + 1) if column.repeated else (0,))
    ]


# --- one tab -----------------------------------------------------------------------------------------------


def _tab(book: Workbook, sheet: Sheet, rows: Sequence[Mapping[str, str]]) -> None:
    from openpyxl.comments import Comment
    from openpyxl.styles import Alignment
    from openpyxl.utils import get_column_letter

    tab = book.create_sheet(sheet.kind)
    places = _places(sheet)
    most_lines = 1
    for at, place in enumerate(places, start=1):
        letter = get_column_letter(at)
        cell = tab.cell(1, at, place.heading)
        _mark(cell, key=place.column.key, must=place.must, either=_is_either(sheet, place.column))
        cell.alignment = Alignment(wrap_text=True, vertical="center", horizontal="left")
        width = _width(place)
        most_lines = max(most_lines, len(textwrap.wrap(place.heading, width - 2, break_on_hyphens=False)))
        comment = "\n".join(_comment(sheet, place, first=at == 1))
        cell.comment = Comment(comment, AUTHOR, height=_comment_height(comment), width=330)
        dimension = tab.column_dimensions[letter]
        dimension.width = width
        # A style of the whole column: typed cells take it, and no empty cell need be stored.
        dimension.number_format = _number_format(place.column)
        _plain(dimension)
        if validation := _validation(book, sheet, place, letter):
            validation.add(f"{letter}2:{letter}{LAST_ROW}")
            tab.add_data_validation(validation)
    tab.row_dimensions[1].height = 15.0 * most_lines + 9
    _prefill(tab, sheet, places, rows)
    identity = list(takewhile(lambda p: p.column.key and p.column.entry == "name", places))
    tab.freeze_panes = tab.cell(2, len(identity) + 1)
    tab.sheet_format.defaultRowHeight, tab.sheet_format.customHeight = _ROW_HEIGHT, True
    tab.sheet_properties.tabColor = _OCHRE if sheet.reading else _SLATE
    _print_setup(tab, sheet, max(1, len(identity)))


def _prefill(tab: Worksheet, sheet: Sheet, places: list[_Place], rows: Sequence[Mapping[str, str]]) -> None:
    at = {place.name: number for number, place in enumerate(places, start=1)}
    for row_number, row in enumerate(rows, start=2):
        for name, text in row.items():
            if name not in at:
                raise Usage(
                    f"no column {quoted(name)} on sheet '{sheet.kind}': {did_you_mean(name, list(at))}"
                )
            if text:
                cell: Any = tab.cell(row_number, at[name])
                cell.value = text
                cell.data_type = "s"  # never a formula
                cell.number_format = "@"
                cell.quotePrefix = True
                _plain(cell)


def _number_format(column: Column) -> str:
    if column.entry in _TEXT_ENTRIES:
        return "@"
    return "yyyy-mm-dd" if column.entry == "date" else "General"


def _width(place: _Place) -> int:
    column = place.column
    least = 30 if column.name == "remarks" else _WIDTHS[column.entry]
    if column.entry == "choice":
        least = max(least, min(32, max(map(len, column.choices)) + 5))
    longest_word = max(map(len, place.heading.split()))
    return max(least, longest_word + 3, len(place.heading) // 2 + 6)


def _print_setup(tab: Worksheet, sheet: Sheet, identity: int) -> None:
    from openpyxl.utils import get_column_letter

    total = sum(dimension.width for dimension in tab.column_dimensions.values())
    across = ceil(total / _WIDEST_PAGE)
    _page(tab, "landscape", across)
    tab.print_title_rows = "1:1"
    if across > 1:
        tab.print_title_cols = f"A:{get_column_letter(identity)}"
    margins = tab.page_margins
    margins.left = margins.right = 0.4
    margins.top = margins.bottom = 0.9
    margins.header = margins.footer = 0.3
    # A header holds 255 characters in all, so a long caution runs on in the footer.
    lines = textwrap.wrap(f"CAUTION. {sheet.caution}".replace("&", "&&"), 112) if sheet.caution else []
    tab.HeaderFooter.oddHeader = _margin_text(lines[:2])
    tab.HeaderFooter.oddFooter = _margin_text(lines[2:], left="&A", right="&P / &N")


def _page(tab: Worksheet, orientation: Literal["landscape", "portrait"], across: int) -> None:
    from openpyxl.worksheet.properties import PageSetupProperties

    tab.page_setup.orientation = orientation
    tab.page_setup.paperSize = 9  # A4
    tab.page_setup.fitToWidth, tab.page_setup.fitToHeight = across, 0
    tab.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)


def _margin_text(lines: Sequence[str], left: str = "", right: str = "") -> Any:
    from openpyxl.worksheet.header_footer import HeaderFooterItem

    class Lines(HeaderFooterItem):
        # openpyxl writes a line break as _x000a_, which LibreOffice prints as it stands.
        def to_tree(self, tagname: str) -> Any:
            element = super().to_tree(tagname)
            element.text = (element.text or "").replace("_x000a_", "\n")
            return element

    item = Lines()
    for part, words in ((item.left, left), (item.center, "\n".join(lines)), (item.right, right)):
        part.text, part.size = words or None, 8
    item.center.color = _RED
    return item


# --- words -------------------------------------------------------------------------------------------------


def _is_either(sheet: Sheet, column: Column) -> bool:
    return any(column.name in way for group in sheet.either for way in group)


def _ways(group: Sequence[Sequence[str]]) -> str:
    return "; or ".join(" and ".join(way) for way in group)


def _comment(sheet: Sheet, place: _Place, *, first: bool) -> Iterator[str]:
    column = place.column
    if first and sheet.caution:
        yield f"CAUTION. {sheet.caution}\n"
    yield column.note
    if column.repeated:
        must = "At least one must be filled in. " if column.required else ""
        yield f"{must}More columns may be added, up to {column.name} {MOST_REPEATED_COLUMNS}."
    elif column.required:
        yield "Must be filled in."
    for group in sheet.either:
        if any(column.name in way for way in group):
            yield f"One of these ways must be filled in: {_ways(group)}."
    if column.key:
        yield "Part of the row's identity."
    yield from _entry_words(column)
    if column.default:
        yield f"Empty means: {column.default}."


def _entry_words(column: Column) -> Iterator[str]:
    match column.entry:
        case "choice" | "choices":
            lead = "One or more of" if column.entry == "choices" else "One of"
            yield f"{lead}: {', '.join(column.choices)}."
        case "date":
            yield "A date, 2026-03-14; or with time, typed 2026-03-14T09:30."
        case "unit":
            yield "Written as in the brackets of a heading, without them."
        case "name":
            yield "Kept as typed: 007 stays 007."
        case "whole":
            yield "A whole number from 1."
        case "number":
            yield _units_words(column)
            for label, bounds in (("Possible", _possible(column)), ("Usual", _plausible(column))):
                if span := _span(bounds, column.heading_unit):
                    yield f"{label}: {span}."
            if column.limits:
                yield "Takes < and >: <0.01 below a limit, >5000 above one."
        case _:
            pass


def _units_words(column: Column) -> str:
    if not column.heading_unit:
        return "A plain number, no unit in the heading."
    others = [symbol for symbol in accepted(column.kind) if symbol != column.heading_unit]
    words = f"Number in {column.heading_unit}"
    if others:
        words += f"; or, named in the heading, another of: {', '.join(others)}"
    if column.kind == "pressure":
        words += ". Gauge readings: psig, barg, kPag; all others are absolute"
    return words + "."


def _shown(value: float, digits: int = 6) -> str:
    return format(Decimal(f"{value:.{digits}g}"), "f")


def _span(bounds: Range, unit_symbol: str) -> str:
    """A range in words; empty where it says nothing."""
    low, high = bounds
    after = f" {unit_symbol}" if unit_symbol else ""
    if isfinite(low) and isfinite(high):
        return f"{'above 0 to' if low == TINY else f'{_shown(low)} to'} {_shown(high)}{after}"
    if isfinite(low):
        return f"above 0{after}" if low == TINY else f"{_shown(low)}{after} or more"
    return f"{_shown(high)}{after} or less" if isfinite(high) else ""


def _in_heading_unit(column: Column, bounds: Range) -> Range:
    if not column.kind:
        return bounds
    stored, offered = unit(column.unit, column.kind), unit(column.heading_unit, column.kind)
    low, high = (b if b == TINY or not isfinite(b) else convert(b, stored, offered) for b in bounds)
    return low, high


def _possible(column: Column) -> Range:
    assert column.quantity
    return _in_heading_unit(column, column.quantity.possible)


def _plausible(column: Column) -> Range:
    assert column.quantity
    return _in_heading_unit(column, column.quantity.plausible)


# --- checks while typing -----------------------------------------------------------------------------------


def _validation(book: Workbook, sheet: Sheet, place: _Place, letter: str) -> DataValidation | None:
    column = place.column
    if column.entry == "choice":
        formula = _list_formula(book, sheet, column)
        check = _check(place, f"one of {', '.join(column.choices)}", type="list", formula1=formula)
    elif column.entry == "whole":
        check = _check(
            place, "a whole number from 1", type="whole", operator="greaterThanOrEqual", formula1="1"
        )
    elif column.entry == "number" and (span := _span(_possible(column), column.heading_unit)):
        check = _check(place, f"a number, {span}", type="decimal", **_bounds(place, letter))
        usual = _span(_plausible(column), column.heading_unit)
        check.promptTitle = place.heading[:_LONGEST_TITLE]
        check.prompt = f"Possible: {span}" + (f"\nUsual: {usual}" if usual else "")
        check.showInputMessage = True
    else:
        return None
    return check


def _check(place: _Place, wanted: str, **rule: Any) -> DataValidation:
    from openpyxl.worksheet.datavalidation import DataValidation

    column = place.column
    blocks = place.must and not column.limits
    also = ""
    if not blocks:
        also = " Keep it only if it is - or n/a, for nothing entered"
        also += ", or a limit as <0.01 or >5000." if column.limits else "."
    said = textwrap.shorten(f"Wanted: {wanted}", _LONGEST_MESSAGE - len(also) - 1, placeholder=" …")
    return DataValidation(
        allow_blank=True,
        showErrorMessage=True,
        errorStyle="stop" if blocks else "warning",
        errorTitle=place.heading[:_LONGEST_TITLE],
        error=f"{said}.{also}",
        **rule,
    )


def _bounds(place: _Place, letter: str) -> dict[str, str]:
    """The possible range as a rule; it lets go when the unit in the heading is changed."""
    column = place.column
    low, high = _possible(column)

    def bound(value: float, beyond: str) -> str:
        plain = "0" if value == TINY else _shown(value, 12)
        if not column.kind or len(accepted(column.kind)) == 1:
            return plain
        return f'IF(EXACT(${letter}$1,"{place.heading}"),{plain},{beyond})'

    above, below = f"-{_BEYOND}", _BEYOND
    if isfinite(low) and isfinite(high):
        return {"operator": "between", "formula1": bound(low, above), "formula2": bound(high, below)}
    if isfinite(low):
        operator = "greaterThan" if low == TINY else "greaterThanOrEqual"
        return {"operator": operator, "formula1": bound(low, above)}
    return {"operator": "lessThanOrEqual", "formula1": bound(high, below)}


def _list_formula(book: Workbook, sheet: Sheet, column: Column) -> str:
    inline = ",".join(column.choices)
    if len(inline) <= _LONGEST_INLINE_LIST and not any(re.search('[,"]', c) for c in column.choices):
        return f'"{inline}"'
    from openpyxl.utils import get_column_letter

    if LISTS not in book.sheetnames:
        book.create_sheet(LISTS).sheet_properties.tabColor = _RULE
    tab = book[LISTS]
    at = 1 if tab.cell(1, 1).value is None else tab.max_column + 1
    letter = get_column_letter(at)
    _mark(tab.cell(1, at, f"{sheet.kind}: {column.name}"), key=False, must=False, either=False)
    tab.column_dimensions[letter].width = 34
    tab.column_dimensions[letter].number_format = "@"
    for row, word in enumerate(column.choices, start=2):
        cell = tab.cell(row, at, word)
        cell.number_format = "@"
        cell.font = _font()
    tab.freeze_panes = "A2"
    return f"{LISTS}!${letter}$2:${letter}${len(column.choices) + 1}"


# --- look --------------------------------------------------------------------------------------------------


def _font(**more: Any) -> Any:
    from openpyxl.styles import Font

    look: dict[str, Any] = {"name": _FONT, "size": 11, "color": _INK} | more
    return Font(**look)


def _plain(cell: Any) -> None:
    from openpyxl.styles import Alignment, Border, Side

    cell.font = _font()
    cell.border = Border(right=Side("thin", _FAINT), bottom=Side("thin", _FAINT))
    cell.alignment = Alignment(vertical="center")


def _fill(colour: str) -> Any:
    from openpyxl.styles import PatternFill

    return PatternFill("solid", fgColor=colour)


def _mark(cell: Any, *, key: bool, must: bool, either: bool) -> None:
    """A heading's look: dark for identity, an ochre rule for must, a dashed one for one way of several."""
    from openpyxl.styles import Border, Side

    cell.font = _font(bold=True, color="FFFFFF" if key else _INK)
    cell.fill = _fill(_SLATE if key else _SAND if must or either else _MIST)
    rule = Side("thick", _OCHRE) if must else Side("mediumDashed", _OCHRE) if either else Side("thin", _RULE)
    cell.border = Border(bottom=rule, right=Side("thin", "FFFFFF"))


def _lines(text: str, width: int) -> int:
    return sum(len(textwrap.wrap(line, width)) or 1 for line in text.split("\n"))


def _comment_height(text: str) -> int:
    return 20 * _lines(text, 48) + 12


# --- the first tab -----------------------------------------------------------------------------------------

_HOW = (
    (
        "Rows",
        "One row a reading or a thing, from row 2 down. Leave no total, no title and no drawing among them.",
    ),
    (
        "Headings",
        "Point at one to read what goes in. Keep its words. The unit in brackets may be changed to "
        "another of the same kind; it then holds for the whole column. Columns may be moved, and those "
        "not needed removed.",
    ),
    (
        "Numbers",
        "Digits and one decimal sign, without unit or thousands mark. A value outside the possible "
        "range is refused; one outside the usual range is taken and questioned. While typing, ranges "
        "are checked as long as the heading keeps its unit; the load checks in every unit.",
    ),
    ("Limits", "Where the note of the heading says so, <0.01 and >5000 stand for below and above a limit."),
    (
        "Nothing entered",
        "Leave the cell empty, or write - or n/a. Never write 0 for a value that was not read.",
    ),
    ("Dates", "2026-03-14, or with the time 2026-03-14T09:30."),
    ("Names", "Text, kept as typed: 007, 1E5 and 3-1 stay what they are."),
    (
        "Repeats",
        "Reading one thing again: write it in a further row with the same identity, and number the rows "
        "1, 2, 3 … under repeat, or leave repeat empty and they are numbered in their order. Length 1, "
        "length 2 … are places on one plug in one reading.",
    ),
    (
        "Pressures",
        "psig, barg and kPag are read on a gauge; give the barometric pressure of the row. All other "
        "pressure units are absolute.",
    ),
    (
        "Handing in",
        "Save and close the workbook, then load it. All of it is taken, or nothing, with a list of what "
        "to mend. This tab and the tab lists are not loaded.",
    ),
)
_LEGEND = (
    (True, True, False, "identity", "Tells rows apart; must be filled in."),
    (True, False, False, "identity, may be empty", "Tells rows apart where it is filled in."),
    (False, True, False, "must be filled in", "A row without it is refused."),
    (False, False, True, "one way of several", "One of the ways named in its note must be filled in."),
    (False, False, False, "may be empty", "Fill in what is known."),
)


def _read_me(tab: Worksheet, sheets: Sequence[Sheet]) -> None:
    from openpyxl.styles import Alignment, Border, Side
    from openpyxl.worksheet.hyperlink import Hyperlink

    tab.sheet_view.showGridLines = False
    tab.sheet_properties.tabColor = _RULE
    for letter, width in (("A", 3), ("B", 25), ("C", 96)):
        tab.column_dimensions[letter].width = width
    row = 2

    def put(label: str, text: str = "", *, label_font: Any = None, text_font: Any = None) -> Any:
        nonlocal row
        for at, words, font in ((2, label, label_font), (3, text, text_font)):
            cell: Any = tab.cell(row, at)
            cell.font = font or _font()
            cell.alignment = Alignment(wrap_text=True, vertical="top", horizontal="left", indent=at - 2)
            if words:
                cell.value = words
                cell.data_type = "s"  # never a formula
        tab.row_dimensions[row].height = 15.5 * max(_lines(text, 104), _lines(label, 26)) + 3
        row += 1
        return tab.cell(row - 1, 2)

    def section(title: str) -> None:
        nonlocal row
        row += 1
        cell = put(title, label_font=_font(bold=True, size=13, color=_SLATE))
        for at in (2, 3):
            tab.cell(cell.row, at).border = Border(bottom=Side("medium", _OCHRE))
            tab.cell(cell.row, at).alignment = Alignment(vertical="center")
        tab.row_dimensions[cell.row].height = 22
        tab.row_dimensions[row].height = 6
        row += 1

    title = put("Bench sheets", label_font=_font(bold=True, size=20, color=_SLATE))
    title.alignment = Alignment(vertical="center")
    tab.row_dimensions[title.row].height = 32
    intro = put(
        "Readings and registers of a core and sidewall-plug laboratory, to be filled in at the bench.",
        label_font=_font(italic=True),
    )
    intro.alignment = Alignment(vertical="top")
    tab.row_dimensions[intro.row].height = 18

    section("How to fill in")
    bold = _font(bold=True)
    for label, text in _HOW:
        put(label, text, label_font=bold)
    section("Headings at a glance")
    for key, must, either, label, text in _LEGEND:
        cell = put(label, text)
        _mark(cell, key=key, must=must, either=either)
        tab.row_dimensions[cell.row].height = 20
        for at in (2, 3):
            tab.cell(cell.row, at).alignment = Alignment(vertical="center", horizontal="left", indent=1)
    if any(sheet.caution for sheet in sheets):
        section("Cautions")
        for sheet in sheets:
            if sheet.caution:
                put(sheet.kind, sheet.caution, label_font=bold, text_font=_font(color=_RED))
    section("Tabs")
    for sheet in sheets:
        link = put(sheet.kind, sheet.title, label_font=_font(bold=True, color=_SLATE, underline="single"))
        tab.cell(link.row, 3).font = bold
        link.hyperlink = Hyperlink(ref=link.coordinate, location=f"'{sheet.kind}'!A1")
        for label, text in _about(sheet):
            put("", f"{label}: {text}")
        row += 1
    _page(tab, "portrait", 1)
    tab.HeaderFooter.oddFooter = _margin_text((), right="&P / &N")


def _about(sheet: Sheet) -> Iterator[tuple[str, str]]:
    key = ", ".join(column.name for column in sheet.key)
    if sheet.reading:
        yield "A row is identified by", f"{key}; rows equal in all of these are repeats"
    else:
        yield "A row is identified by", f"{key}; each may stand once only"
    must = [f"{c.name} 1" if c.repeated else c.name for c in sheet.columns if c.required]
    yield "Must be filled in", ", ".join(must)
    for group in sheet.either:
        yield "And one of these ways", _ways(group)
    for column in sheet.columns:
        if column.repeated:
            yield "May stand several times", f"{column.name} 1 … {column.name} {MOST_REPEATED_COLUMNS}"
