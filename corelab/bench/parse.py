"""From the raw cells of a sheet to typed values, by the sheet's declaration; every fault is named."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime, time
from typing import Any

from corelab import units
from corelab.errors import Problem, did_you_mean, nearest, quoted
from corelab.formats.table import Bad, Cell, Percent, Table
from corelab.quantities import ENTERED, RESULTS, TINY
from corelab.sheets import Column, Sheet

_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_DATE = re.compile(r"\d{4}-\d{2}-\d{2}(?:[T ]\d{2}:\d{2}(?::\d{2}(?:\.\d{1,6})?)?)?", re.ASCII)
_HEADING = re.compile(r"^(?P<name>[^\[\]]*?)\s*(?:\[(?P<unit>[^\[\]]*)\])?$")
_LONGEST_HEADING = 100
_NOTHING = {"", "-", "n/a"}
_NO_BREAK = re.compile("[\u00a0\u2007\u202f]")
_UNSEEN = re.compile("[\u200b\u2060\ufeff]")  # of no width: two names that look alike would differ
LARGEST = 1e300  # beyond it sums and products overflow
HIGHEST_BAROMETER_KPA = ENTERED["barometric pressure"].possible[1]
_LARGEST_REPEAT = 999_999
PERCENT_OF_READING = "% of reading"

Convert = Callable[[Cell], Any]


@dataclass(slots=True)
class Row:
    """One row of a sheet, typed but not yet tied to the record.

    `names` holds the names that refer to identities, by column; `values` everything else, by field;
    `unusable` the columns whose cell has been complained of.
    """

    sheet: Sheet
    file: str
    tab: str
    number: int
    names: dict[str, str] = field(default_factory=dict)
    values: dict[str, Any] = field(default_factory=dict)
    entered: dict[str, object] = field(default_factory=dict)
    repeat: int | None = None
    unusable: set[str] = field(default_factory=set)

    def problem(self, column: str, found: str, wanted: str, action: str) -> Problem:
        return Problem(found, wanted, action, self.file, self.tab, self.number, column)


class _Fault(Exception):
    """A cell that cannot be used: what was found, what is wanted, what to do."""


@dataclass(frozen=True, slots=True)
class _Placed:
    """A column of the table tied to its declaration."""

    column: Column
    number: int  # 1, 2 … of a repeated column, else 0
    unit: units.Unit | None
    heading: str
    cells: list[Cell]


def parse(
    table: Table, sheet: Sheet, *, decimal_comma: bool
) -> tuple[list[Row], list[Problem], list[Problem]]:
    """The rows of a table, the problems, and the notices (taken, but worth a question)."""
    placed, problems, excused = _placed(table, sheet)
    whole = not problems
    rows = [Row(sheet, table.file, table.sheet, number) for number in table.rows]
    notices: list[Problem] = []
    for item in placed:
        _fill(item, rows, problems, notices, decimal_comma)
    for row in rows:
        _complete(row, excused, whole, problems)
    return rows, problems, notices


def _normal(text: str) -> str:
    return re.sub(r"\s+", " ", text).strip().casefold()


def _plain(text: str) -> str:
    return _normal(re.sub(r"[_-]", " ", text))


def _placed(table: Table, sheet: Sheet) -> tuple[list[_Placed], list[Problem], set[str]]:
    """The columns, what is wrong with the headings, and the columns that are known to be amiss."""
    by_name = {c.name: c for c in sheet.columns}
    placed: list[_Placed] = []
    problems: list[Problem] = []
    seen: dict[tuple[str, int], str] = {}
    amiss: set[str] = set()

    def trouble(heading: str, found: str, wanted: str, action: str) -> None:
        problems.append(Problem(found, wanted, action, table.file, table.sheet, None, heading))

    for heading, cells in zip(table.headings, table.columns, strict=True):
        if len(heading) > _LONGEST_HEADING:
            heading = " ".join(heading.split())[:_LONGEST_HEADING]
        match = _HEADING.match(heading.strip())
        name = _normal(match["name"]) if match else _normal(heading)
        number: int | None = None
        column = by_name.get(name)
        if column is None and (numbered := re.fullmatch(r"(.*\D)\s*(\d{1,2})", name)):
            column = by_name.get(numbered[1].strip())
            number = int(numbered[2])
            if column is not None and not column.repeated:
                column = None
        if column is None or not match:
            shown = [c.heading for c in sheet.columns]
            close = nearest(name, list(by_name))
            amiss.update(close[:1])
            hint = (
                did_you_mean(by_name[close[0]].heading, [by_name[c].heading for c in close]) if close else ""
            )
            trouble(
                heading,
                f"the heading {quoted(heading)}",
                f"a column of the sheet '{sheet.kind}'",
                hint or f"known: {', '.join(shown)}",
            )
            continue
        if column.repeated:
            number = 1 if number is None else number
            if not 1 <= number <= len(column.fields):
                trouble(
                    heading, f"number {number}", f"1 to {len(column.fields)}", "number the columns from 1 on"
                )
                continue
        number = number or 0
        if (column.name, number) in seen:
            trouble(
                heading,
                f"the column '{column.name}' twice ('{seen[column.name, number]}' too)",
                "each column once",
                "number repeated columns (length 1, length 2 …), or take one out",
            )
            continue
        seen[column.name, number] = heading
        unit: units.Unit | None = None
        typed_unit = (match["unit"] or "").strip()
        if column.kind:
            try:
                unit = units.unit(typed_unit, column.kind)
            except units.UnitTrouble as wrong:
                amiss.add(column.name)
                why = str(wrong)
                accepted = ", ".join(units.accepted(column.kind))
                trouble(
                    heading,
                    why.split("; accepted")[0],
                    f"a unit of {column.kind} in square brackets ({accepted})",
                    f"write for example '{column.heading}'",
                )
                continue
        elif match["unit"] is not None:
            amiss.add(column.name)
            trouble(heading, f"a unit [{typed_unit}]", f"none: '{column.name}' has no unit", "take it out")
            continue
        placed.append(_Placed(column, number, unit, heading, cells))
    found = {item.column.name for item in placed}
    for column in sheet.columns:
        if column.required and column.name not in found | amiss:
            amiss.add(column.name)
            trouble(
                column.heading,
                "no such column",
                f"the column '{column.name}', which must be filled in",
                f"add a column headed '{column.heading}'",
            )
    return placed, problems, amiss


def _fill(
    item: _Placed, rows: list[Row], problems: list[Problem], notices: list[Problem], decimal_comma: bool
) -> None:
    column = item.column
    convert = _converter(item, decimal_comma)
    stored = units.unit(column.unit, column.kind) if column.unit else None
    plausible = column.quantity.plausible if column.quantity else (-math.inf, math.inf)
    target = column.fields[max(item.number - 1, 0)] if column.repeated else column.field
    for row, cell in zip(rows, item.cells, strict=True):
        if cell is None or (isinstance(cell, str) and cell.casefold() in _NOTHING):
            continue
        row.entered[item.heading] = _as_entered(cell)
        try:
            value = convert(cell)
        except _Fault as fault:
            found, wanted, action = fault.args
            row.unusable.add(column.name)
            problems.append(row.problem(item.heading, found, wanted, action))
            continue
        limit = None
        if isinstance(value, tuple):
            limit, value = value
        if isinstance(value, float) and item.unit is not None and stored is not None:
            value = _stored(value, item.unit, stored)
        if isinstance(value, float):
            if outside := _outside(column, value, item.unit):
                row.unusable.add(column.name)
                problems.append(row.problem(item.heading, quoted(_shown(cell)), *outside))
                continue
            if not plausible[0] <= value <= plausible[1] and not (item.unit and item.unit.gauge):
                notices.append(
                    row.problem(
                        item.heading,
                        quoted(_shown(cell)),
                        f"usually {_range_text(column, plausible, item.unit)}",
                        "check it; it was taken as it stands",
                    )
                )
        if column.refers:
            row.names[column.name] = value
            continue
        if column.name == "repeat":
            row.repeat = value
            continue
        row.values[target] = value
        if column.gauge_field and item.unit is not None:
            row.values[column.gauge_field] = int(item.unit.gauge)
        if column.limit_field:
            row.values[column.limit_field] = limit


def _stored(value: float, typed: units.Unit, stored: units.Unit) -> float:
    """A value in the unit in which it is kept; beyond all numbers where it is too large to convert."""
    try:
        value = float(units.from_base(units.to_base(value, typed), stored))
    except OverflowError:
        return math.inf
    return 0.0 if value == 0.0 else value


def _range_text(column: Column, bounds: tuple[float, float], unit: units.Unit | None) -> str:
    """A range of the data dictionary, in the unit of the heading."""
    low, high = bounds
    symbol = unit.symbol if unit else ""
    if unit and unit.kind == "grain size" and unit.symbol == "phi":  # falls as the size grows
        symbol = column.unit
    elif unit:
        stored = units.unit(column.unit, column.kind)
        low, high = (v if math.isinf(v) else units.convert(v, stored, unit) for v in bounds)
    if 0 < bounds[0] <= TINY and high == math.inf:
        return "more than zero"
    if high == math.inf:
        return f"{low:.6g} {symbol} or more".replace("  ", " ")
    return f"{low:.6g} to {high:.6g} {symbol}".rstrip()


def _outside(column: Column, value: float, unit: units.Unit | None) -> tuple[str, str] | None:
    """What is wanted and what to do, where a value is impossible."""
    if not abs(value) <= LARGEST:
        return "a number that can be kept", "it is too large: check the value and the unit in the heading"
    low, high = bounds = column.quantity.possible if column.quantity else (-math.inf, math.inf)
    if unit is not None and unit.gauge:  # reads zero at the barometer, with which it is judged later
        low, high = bounds = -HIGHEST_BAROMETER_KPA, math.inf
    if low <= value <= high:
        return None
    wanted = _range_text(column, bounds, unit)
    return f"a possible value: {wanted}", "check the value and the unit in the heading"


def _as_entered(cell: Cell) -> object:
    """The cell as it is kept for ever: text and numbers as they were, the rest in words."""
    if isinstance(cell, datetime) and cell.time() == time():
        return cell.date().isoformat()
    if isinstance(cell, (datetime, date, time)):
        return cell.isoformat()
    if isinstance(cell, Percent):
        return f"{cell.value!r} shown as a percentage"
    if isinstance(cell, Bad):
        return cell.found
    return cell


def _shown(cell: Cell) -> str:
    return json.dumps(cell) if isinstance(cell, bool) else str(_as_entered(cell))


def _converter(item: _Placed, decimal_comma: bool) -> Convert:
    column = item.column

    def converted(cell: Cell) -> Any:
        if isinstance(cell, Bad):
            raise _Fault(cell.found, cell.wanted, cell.action)
        return inner(cell)

    if column.entry == "number":
        inner = _number(item, decimal_comma)
    elif column.entry == "whole":
        inner = _whole
    elif column.entry in {"choice", "choices"}:
        inner = _choice(column)
    elif column.entry == "date":
        inner = _moment
    else:
        inner = _text(column)
    return converted


def _number(item: _Placed, decimal_comma: bool) -> Convert:
    wanted = "a number" + (f" in {item.unit.symbol}" if item.unit else "")
    limits = item.column.limits
    percent = item.unit is not None and item.unit.symbol == "%"

    def convert(cell: Cell) -> Any:
        if isinstance(cell, bool):
            raise _Fault(f"the logical value {_shown(cell).upper()}", wanted, "type the number")
        if isinstance(cell, (int, float)):
            if not math.isfinite(cell):
                raise _Fault(f"{cell}", wanted, "type a number, or leave the cell empty")
            return float(cell)
        if isinstance(cell, (datetime, date, time)):
            raise _Fault(
                f"the date {_shown(cell)}",
                wanted,
                "format the column as number and type it anew: the spreadsheet program made it a date",
            )
        if isinstance(cell, Percent):
            if percent:
                return cell.value * 100.0
            raise _Fault(
                f"{cell.value:g} under a percentage format",
                f"{wanted}, under a plain number format",
                "format the column as number, and see whether the value is the one meant",
            )
        text = str(cell)
        limit = None
        if text[:1] in "<>" and limits:
            limit, text = ("below" if text[0] == "<" else "above"), text[1:].strip()
        elif text[:1] in "<>":
            raise _Fault(
                quoted(text), f"{wanted}; limits are not taken here", "leave it empty and say why in remarks"
            )
        if decimal_comma and "." in text and not _DATE.fullmatch(text):
            raise _Fault(
                quoted(text),
                f"{wanted} with a decimal comma, as asked for, and no other mark",
                "write a comma for the point and take thousands separators out, "
                "or load without --decimal-comma",
            )
        if decimal_comma and text.count(",") == 1:
            text = text.replace(",", ".")
        if not _NUMBER.fullmatch(text):
            raise _Fault(quoted(str(cell)), wanted, _number_hint(text))
        value = float(text)
        if not math.isfinite(value):
            raise _Fault(quoted(text), wanted, "it is too large for a number")
        return (limit, value) if limits else value

    return convert


def _number_hint(text: str) -> str:
    if text.startswith("#"):
        return "the cell holds an error: mend the formula, or type the number"
    if re.fullmatch(r"[+-]?\d+,\d+", text):
        return f"write {text.replace(',', '.')}, or load with --decimal-comma if commas are decimal"
    if re.fullmatch(r"[+-]?\d{1,3}([, '\u2009]\d{3})+(\.\d+)?", text):
        return "take the thousands separators out"
    if text.endswith("%"):
        return "take the % out; the unit stands in the heading"
    if re.match(r"[+-]?[\d.]+\s*[A-Za-z]", text):
        return "take the unit out of the cell; it stands in the heading"
    if _DATE.fullmatch(text):
        return "this is a date: see whether the column is the right one"
    return "type digits with a point, or leave the cell empty"


def _whole(cell: Cell) -> int:
    text = _shown(cell)
    if (
        not isinstance(cell, bool)
        and isinstance(cell, (int, float))
        and float(cell).is_integer()
        and 1 <= cell <= _LARGEST_REPEAT
    ):
        return int(cell)
    if isinstance(cell, str) and re.fullmatch(r"[1-9][0-9]{0,5}", cell):
        return int(cell)
    raise _Fault(quoted(text), "a whole number from 1 on", "type 1, 2, 3 …, or leave it empty")


#: Symbols that benches write for words.
_CODES = {"n2": "nitrogen", "he": "helium", "h": "horizontal", "v": "vertical", "hg": "mercury"}


def _choice(column: Column) -> Convert:
    known = {_plain(c): c for c in column.choices}
    listed = ", ".join(column.choices)

    def one(text: str) -> str:
        found = known.get(_plain(text))
        if found is None and (spelled := _CODES.get(_normal(text))) in column.choices:
            found = spelled
        if found is None:
            hint = did_you_mean(text, column.choices)
            raise _Fault(
                quoted(text), f"one of: {listed}" if len(listed) < 200 else "a word of the list", hint
            )
        return found

    def convert(cell: Cell) -> str:
        if isinstance(cell, (int, float)) and not isinstance(cell, bool) and float(cell).is_integer():
            cell = str(int(cell))
        if not isinstance(cell, str):
            raise _Fault(quoted(_shown(cell)), f"one of: {listed}", "type the word")
        if column.entry == "choice" or not cell.strip(" ,;+"):
            return one(cell)
        words = [one(part.strip()) for part in re.split(r"[,;+]", cell) if part.strip()]
        return ", ".join(c for c in column.choices if c in words)

    return convert


def _text(column: Column) -> Convert:
    is_name = column.entry != "text"
    wanted = "a name" if is_name else "text"

    def convert(cell: Cell) -> str:
        if isinstance(cell, str):
            name = _UNSEEN.sub("", _NO_BREAK.sub(" ", cell)).strip() if is_name else cell
            if not name:
                raise _Fault("a cell of invisible characters", wanted, "type it anew")
            return name
        if isinstance(cell, bool):
            return _shown(cell).upper()
        if isinstance(cell, (datetime, date, time, Percent)):
            raise _Fault(
                ("" if isinstance(cell, Percent) else "the date ") + _shown(cell),
                wanted,
                "the spreadsheet program changed what was typed: format the column as text and type it anew",
            )
        if isinstance(cell, (int, float)) and float(cell).is_integer() and abs(cell) < 1e15:
            return str(int(cell))
        if is_name:
            raise _Fault(
                f"the number {cell}",
                "a name, in a cell formatted as text",
                "format the column as text and type it anew: 1.10 as a number would become 1.1",
            )
        return str(cell)

    return convert


def _moment(cell: Cell) -> str:
    """A date, with its time where it is not midnight, in one writing however it was typed."""
    moment: date | None = cell if isinstance(cell, date) else None
    if isinstance(cell, str) and _DATE.fullmatch(cell):
        try:
            moment = datetime.fromisoformat(cell)
        except ValueError:
            moment = None
    if moment is None:
        raise _Fault(
            quoted(_shown(cell)), "a date such as 2026-03-14 or 2026-03-14T09:30", "write year, month, day"
        )
    if not isinstance(moment, datetime):
        return moment.isoformat()
    if moment.time() == time():
        return moment.date().isoformat()
    return moment.isoformat(timespec="auto" if moment.second or moment.microsecond else "minutes")


def _complete(row: Row, excused: set[str], whole: bool, problems: list[Problem]) -> None:
    """Required cells, either/or groups (where the headings are `whole`), defaults of words, units."""
    sheet = row.sheet

    def has(name: str) -> bool:
        column = sheet.column(name)
        return name in row.names or name in row.unusable or any(f in row.values for f in column.fields)

    for column in sheet.columns:
        if column.repeated:
            _close_ranks(row.values, column)
        if column.required and column.name not in excused and not has(column.name):
            row.unusable.add(column.name)
            problems.append(
                row.problem(
                    column.heading, "an empty cell", f"'{column.name}', which must be filled in", "fill it in"
                )
            )
        if column.default and column.choices and column.field not in row.values:
            row.values[column.field] = column.default
    for group in sheet.either if whole else ():
        if not any(all(has(n) for n in names) for names in group):
            wanted = ", or ".join(" with ".join(f"'{n}'" for n in names) for names in group)
            problems.append(row.problem("", "none of them complete", wanted, "fill in one of these"))
    _check_unit(row, problems)


def _close_ranks(values: dict[str, Any], column: Column) -> None:
    filled = [values.pop(f) for f in column.fields if f in values]
    values.update(zip(column.fields, filled, strict=False))


_MEASURES: Mapping[str, tuple[str, ...]] = {
    "mass": ("mass",),
    "length": ("length",),
    "pressure": ("stress", "pressure"),
    "flow rate": ("flow rate",),
    "volume": ("volume",),
    "temperature": ("temperature",),
}


def _check_unit(row: Row, problems: list[Problem]) -> None:
    """A unit in a cell must be one of what the row speaks of; it is kept in its own writing."""
    if row.sheet.kind == "instruments":
        field, about = "uncertainty_unit", row.values.get("measures", "")
        kinds = _MEASURES.get(about, ())
    elif row.sheet.kind == "certified values":
        field, about = "unit", row.values.get("result", "")
        kinds = (RESULTS[about].kind,) if about else ()
    else:
        return
    typed = row.values.get(field)
    if typed is None or not kinds:
        return
    takes_percent = row.sheet.kind == "instruments"
    if takes_percent and _normal(typed) in {PERCENT_OF_READING, "%"}:
        row.values[field] = PERCENT_OF_READING
        return
    for kind in kinds:
        try:
            row.values[field] = units.unit(typed, kind).symbol
        except units.UnitTrouble:
            continue
        return
    accepted = ", ".join(
        ([f"'{PERCENT_OF_READING}'"] if takes_percent else []) + list(units.accepted(kinds[0]))
    )
    problems.append(
        row.problem(
            field.replace("_", " "), quoted(typed), f"a unit for {about}: {accepted}", "write one of these"
        )
    )
