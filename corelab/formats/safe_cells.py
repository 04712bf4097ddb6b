"""The one place that puts a value into a spreadsheet: a text stays a text, a number a number.

A workbook stores the kind of each cell, so no text needs to be altered to keep it from being computed: it
is stored as text. A carriage return, and a text such as `_x000D_` that spreadsheet programs would take
for one, are written in the escaped form of the file format (ECMA-376 Part 1, ST_Xstring, from memory);
a program that follows it reads back what was given, and `openpyxl.utils.escape.unescape` does the same.
"""

from __future__ import annotations

import math
import re
from collections.abc import Collection
from datetime import date, datetime, time
from decimal import Decimal
from numbers import Integral, Real
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from openpyxl.cell.cell import Cell

MOST_CHARACTERS = 32_767  # of one cell, counted in UTF-16
MOST_TITLE = 31
CUT = " … [cut here]"

_ILLEGAL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_LOOKS_ESCAPED = re.compile("_(?=x[0-9A-Fa-f]{4}_)")
_ESCAPE = re.compile("_x[0-9A-Fa-f]{4}_")
_FIRST_DATE = date(1900, 3, 1)  # the 1900 calendar of spreadsheets holds a 29 February 1900
_EXACT = 2**53  # whole numbers beyond are not all held by a double


def visible(text: str) -> str:
    """`text` with every character that XML cannot hold replaced by a sign that shows it stood there."""
    return _ILLEGAL.sub(lambda found: chr(0x2400 + ord(found[0])) if found[0] < " " else "\ufffd", text)


def _units(text: str) -> int:
    return len(text.encode("utf-16-le")) // 2


def _first_units(text: str, most: int) -> str:
    return text.encode("utf-16-le")[: 2 * most].decode("utf-16-le", errors="ignore")


def cell_text(text: str) -> str:
    """`text` as it stands in the file: visible, escaped where the format wants it, cut with a mark."""
    safe = _LOOKS_ESCAPED.sub("_x005F_", visible(text)).replace("\r", "_x000D_")
    if _units(safe) <= MOST_CHARACTERS:
        return safe
    end = len(_first_units(safe, MOST_CHARACTERS - len(CUT)))
    parted = (found.start() for found in _ESCAPE.finditer(safe) if found.start() < end < found.end())
    return safe[: next(parted, end)] + CUT


def plain(value: object) -> str | int | float | datetime | date | time | None:
    """`value` as a cell can hold it: text, finite number, date, or None for what is not there.

    True and False become yes and no; what a cell would distort (an infinite number, a whole number of more
    than 15 digits, a time with a zone, a date before the spreadsheets' calendar) becomes text.
    """
    match value:
        case None:
            return None
        case str():
            return value or None
        case bool():
            return "yes" if value else "no"
        case Integral():
            return int(value) if abs(int(value)) <= _EXACT else str(value)
        case Real() | Decimal():
            number = float(value)
            if math.isfinite(number):
                return number
            return None if math.isnan(number) else ("infinite" if number > 0 else "minus infinite")
        case time():
            return value if value.tzinfo is None else value.isoformat()
    import numpy as np
    import pandas as pd

    if value is pd.NA or value is pd.NaT:
        return None
    if isinstance(value, np.bool_):
        return "yes" if value else "no"
    if isinstance(value, np.datetime64):
        return plain(pd.Timestamp(value))
    if isinstance(value, pd.Timestamp):
        value = value.to_pydatetime(warn=False)
    if isinstance(value, datetime):
        return value if value.tzinfo is None and value.date() >= _FIRST_DATE else value.isoformat(" ")
    if isinstance(value, date):
        return value if value >= _FIRST_DATE else value.isoformat()
    return str(value) or None


def put(cell: Cell, value: object, number_format: str = "") -> None:
    """Put `value` into `cell`; whatever it is, the cell holds no formula and no error value.

    `number_format` is used for a number only.
    """
    content = plain(value)
    if not isinstance(content, str):
        cell.value = content
        if number_format and isinstance(content, (int, float)):
            cell.number_format = number_format
        return
    cell.value = cell_text(content)
    cell.data_type = "s"
    if content[0] in "=+-@\t\r'":
        cell.quotePrefix = True  # stays text also when a person edits the cell


def sheet_title(text: str, taken: Collection[str] = ()) -> str:
    """A title that a sheet may bear, like `text`: `7121/8-1` becomes `7121-8-1`; unlike all in `taken`."""
    safe = " ".join(re.sub(r"[\\/*?:\[\]]", "-", visible(text)).split()).strip("'") or "sheet"
    if safe.casefold() == "history":  # a title that spreadsheet programs keep for themselves
        safe += " sheet"
    used = {title.casefold() for title in taken}
    title, number = _first_units(safe, MOST_TITLE).strip("' "), 1
    while title.casefold() in used:
        number += 1
        mark = f" {number}"
        title = _first_units(safe, MOST_TITLE - len(mark)).strip("' ") + mark
    return title


def margin_text(text: str, most: int = 60) -> str:
    """`text` for a page's header or footer: one line, cut short, its ampersands no commands."""
    line = " ".join(visible(text).split())
    while len(line) + line.count("&") > most:
        line = line.removesuffix("…")[:-1].rstrip() + "…"
    return line.replace("&", "&&")
