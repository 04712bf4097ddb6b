"""A sheet as it was found: headings, and under each its raw cells."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass, field
from datetime import date, datetime, time
from pathlib import Path

from corelab.errors import Problem, quoted

MOST_HEADINGS = 400
MOST_CELLS = 3_000_000
MOST_CHARACTERS = 32_767  # of one cell; what spreadsheet programs hold at most
MOST_NAMED = 20  # faults of one sort named one by one; the rest are counted

_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff]")
_BREAK = re.compile(r"\r\n|[\r\n\t]")
_NO_BREAK = re.compile("[\u00a0\u2007\u202f]")


@dataclass(frozen=True, slots=True)
class Percent:
    """A number under a percentage format; `value` is as stored: 0.25 where 25 % is shown."""

    value: float


@dataclass(frozen=True, slots=True)
class Bad:
    """A cell without a usable value; it matters only to who needs the cell."""

    found: str
    wanted: str
    action: str


Cell = None | str | int | float | bool | datetime | date | time | Percent | Bad


@dataclass(slots=True)
class Table:
    """The cells of one sheet by column.

    `letters` name the columns (spreadsheet letters; '1', '2' … in CSV), `rows` number the rows, both as
    the user sees them. All lists of `columns` are as long as `rows`. Rows wholly empty are left out.
    """

    file: str
    sheet: str
    headings: list[str] = field(default_factory=list)
    letters: list[str] = field(default_factory=list)
    columns: list[list[Cell]] = field(default_factory=list)
    rows: list[int] = field(default_factory=list)
    hidden: bool = False
    notes: list[str] = field(default_factory=list)


class Unreadable(Exception):
    """A file or sheet that cannot be read on."""

    def __init__(self, found: str, wanted: str, action: str, row: int | None = None) -> None:
        super().__init__(found)
        self.found, self.wanted, self.action, self.row = found, wanted, action, row

    def problem(self, file: str, sheet: str = "") -> Problem:
        return Problem(self.found, self.wanted, self.action, file, sheet, self.row)


def clean(text: str) -> str | Bad | None:
    """Text without outer spaces, in NFC; None where nothing is left; Bad with control characters in it."""
    if len(text) > MOST_CHARACTERS:
        return Bad(f"a text of {len(text)} characters", f"at most {MOST_CHARACTERS}", "shorten it")
    if not (text.isascii() and text.isprintable()):
        if control := _CONTROL.search(text):
            name = f"U+{ord(control[0]):04X}"
            shown = quoted(_CONTROL.sub("\ufffd", text[:80]))
            return Bad(f"a control character ({name}) in {shown}", "plain text", "type the cell anew")
        text = unicodedata.normalize("NFC", _BREAK.sub(" ", text))
    return text.strip() or None


def heading(cell: Cell) -> str | Bad:
    """A cell of the heading row as a heading."""
    match cell:
        case None:
            return ""
        case str():
            return _NO_BREAK.sub(" ", cell).strip()
        case Bad():
            return cell
        case int() | float() if not isinstance(cell, bool):
            return str(cell)
        case _:
            return Bad(show(cell), "a heading in words", "write the heading as text")


def show(cell: Cell) -> str:
    """A cell as it stands in a message."""
    match cell:
        case Bad():
            return cell.found
        case Percent():
            return f"{100 * cell.value:g} %"
        case datetime() | date() | time():
            return cell.isoformat()
        case _:
            return quoted(cell)


def stray_problems(table: Table, strays: list[tuple[int, str, Cell]], many: int) -> Iterator[Problem]:
    """Problems for cells under no heading; `strays` are the first of them, `many` is their count."""
    for row, letter, cell in strays:
        name = f"cell {letter}{row}" if table.sheet else f"column {letter}"
        yield Problem(
            f"{show(cell)} in {name}, under no heading",
            "cells only under headings",
            "write a heading above it, or clear the cell",
            table.file,
            table.sheet,
            row,
            letter,
        )
    if many > len(strays):
        yield Problem(
            f"{many - len(strays)} more cells under no heading",
            "cells only under headings",
            "write headings above them, or clear the cells",
            table.file,
            table.sheet,
        )


def opening_problem(fault: OSError, path: Path, shown_as: str) -> Problem:
    """Why a file cannot be opened."""
    if isinstance(fault, PermissionError) and not path.is_dir():
        return Problem(
            "a file that may not be read now",
            "a file that no other program holds",
            "close it in the spreadsheet program; if it is closed, ask for the right to read it",
            shown_as,
        )
    reason = fault.strerror or type(fault).__name__
    return Problem(f"a file that cannot be read ({reason})", "a readable file", "check the path", shown_as)
