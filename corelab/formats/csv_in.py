"""Reading bench sheets from CSV: bytes in, text cells out."""

from __future__ import annotations

import codecs
import csv
import re
from collections.abc import Iterator
from pathlib import Path

from corelab.errors import Problem
from corelab.formats.table import (
    MOST_CELLS,
    MOST_HEADINGS,
    MOST_NAMED,
    Bad,
    Cell,
    Table,
    Unreadable,
    clean,
    heading,
    opening_problem,
    stray_problems,
)

MOST_BYTES = 100_000_000
MOST_SEPARATORS = 20_000  # of one line; spreadsheet programs have 16,384 columns
_SAVE = "save it as 'CSV UTF-8' from the spreadsheet program"
_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_NAMES = {",": "commas", ";": "semicolons", "\t": "tabs"}
_LINE = re.compile(r"\r\n|\r|\n")
_WHOLE_LINE = re.compile(r"[^\r\n]*(?:\r\n|[\r\n])|[^\r\n]+")
_WORD = re.compile(r'[^\s,;"]')


def read_csv(path: Path, shown_as: str, decimal_comma: bool) -> tuple[list[Table], list[Problem]]:
    """The one table of a CSV file, and all that is wrong with the file.

    Parameters
    ----------
    path, shown_as
        Where the file is, and its name in messages.
    decimal_comma
        Numbers are written with a comma: only semicolons or tabs separate. The cells stay text.

    Notes
    -----
    UTF-8, or UTF-16 with a mark. A row's number is that of a spreadsheet program that opens the file:
    blank lines count, a quoted line break does not.
    """
    try:
        with path.open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
    except OSError as fault:
        return [], [opening_problem(fault, path, shown_as)]
    try:
        text = _decoded(data)
        return _parsed(text, _separator(text, decimal_comma), shown_as)
    except Unreadable as fault:
        return [], [fault.problem(shown_as)]


def _decoded(data: bytes) -> str:
    if len(data) > MOST_BYTES:
        raise Unreadable(
            "a file too large", f"at most {MOST_BYTES // 1_000_000} MB", "split it into several files"
        )
    if data.startswith((b"PK\x03\x04", b"\xd0\xcf\x11\xe0")):
        raise Unreadable(
            "a workbook or archive named .csv", "a CSV file", f"name it .xlsx if it is one, or {_SAVE}"
        )
    mark, coding = next(((m, c) for m, c in _MARKS if data.startswith(m)), (b"", "utf-8"))
    body = data[len(mark) :]
    wanted = "UTF-8, or UTF-16 with a mark"
    try:
        text = body.decode(coding)
    except UnicodeDecodeError as fault:
        before = body[: fault.start].decode(coding, "replace")
        found = f"a byte that is not {coding[:6].rstrip('-').upper()} (hex {body[fault.start]:02X})"
        raise Unreadable(found, wanted, _SAVE, _line(before)) from None
    if (at := text.find("\0")) >= 0:
        raise Unreadable("a NUL character, as in UTF-16 without a mark", wanted, _SAVE, _line(text[:at]))
    return text


def _line(before: str) -> int:
    return 1 + sum(1 for _ in _LINE.finditer(before))


def _separator(text: str, decimal_comma: bool) -> str:
    """The separator most frequent in the heading line, outside quotes."""
    word = _WORD.search(text)
    if not word:
        raise Unreadable("an empty file", "a line of headings and rows below it", "fill it in")
    breaks = list(_LINE.finditer(text, 0, word.start()))
    line, quoted = breaks[-1].end() if breaks else 0, False
    counts = dict.fromkeys(_NAMES, 0)
    for character in text[line:]:
        if character == '"':
            quoted = not quoted
        elif not quoted:
            if character in "\r\n":
                break
            if character in counts:
                counts[character] += 1
    allowed = ";\t" if decimal_comma else ",;\t"
    best = max(allowed, key=lambda mark: counts[mark])
    row = 1 + len(breaks)
    if decimal_comma and not counts[best] and counts[","]:
        raise Unreadable(
            "commas between the headings, with decimal commas asked for",
            "semicolons between the cells",
            "save it with semicolons, or load it without --decimal-comma",
            row,
        )
    if counts[best] and sum(counts[mark] == counts[best] for mark in allowed) > 1:
        marks = " and ".join(_NAMES[mark] for mark in allowed if counts[mark] == counts[best])
        raise Unreadable(
            f"as many {marks} in the heading line",
            "one separator between the headings",
            "put a heading that holds the other one in quotes",
            row,
        )
    return best


def _lines(text: str, separator: str) -> Iterator[str]:
    for number, line in enumerate(_WHOLE_LINE.finditer(text), 1):
        if line[0].count(separator) > MOST_SEPARATORS:
            raise Unreadable(
                f"a line of more than {MOST_SEPARATORS} {_NAMES[separator]}",
                f"at most {MOST_HEADINGS} columns",
                _SAVE,
                number,
            )
        yield line[0]


def _parsed(text: str, separator: str, shown_as: str) -> tuple[list[Table], list[Problem]]:
    table = Table(shown_as, "")
    problems: list[Problem] = []
    grid: list[list[Cell]] = []
    strays: list[tuple[int, str, Cell]] = []
    kept: list[int] = []  # places of the columns with a heading
    number = many_strays = broken = 0
    reader = csv.reader(_lines(text, separator), delimiter=separator, strict=True)
    while True:
        number += 1
        try:
            texts = next(reader)
        except StopIteration:
            break
        except csv.Error as fault:
            broken += 1
            if broken <= MOST_NAMED:
                problems.append(_broken(str(fault), separator, number).problem(shown_as))
            continue
        cells: list[Cell] = [clean(t) if t else None for t in texts]
        if not any(cells):
            continue
        if not kept:
            kept = [at for at, cell in enumerate(cells) if cell is not None]
            problems += _take_headings(table, cells, kept, number)
            continue
        row = [cells[at] if at < len(cells) else None for at in kept]
        if len(cells) - cells.count(None) > len(kept) - row.count(None):
            for at in sorted(set(range(len(cells))) - set(kept)):
                if cells[at] is not None:
                    many_strays += 1
                    if len(strays) < MOST_NAMED:
                        strays.append((number, str(at + 1), cells[at]))
            if row.count(None) == len(kept):
                continue
        grid.append(row)
        table.rows.append(number)
        if len(grid) * len(kept) > MOST_CELLS:
            raise Unreadable(
                "too many cells", f"at most {MOST_CELLS:,}", "split it into several files", number
            )
    if broken > MOST_NAMED:
        more = Unreadable(f"{broken - MOST_NAMED} more broken rows", "quotes in pairs", _SAVE)
        problems.append(more.problem(shown_as))
    problems += stray_problems(table, strays, many_strays)
    table.columns = [list(column) for column in zip(*grid, strict=True)] or [[] for _ in kept]
    return [table], problems


def _take_headings(table: Table, cells: list[Cell], kept: list[int], number: int) -> Iterator[Problem]:
    if len(kept) > MOST_HEADINGS:
        raise Unreadable(f"{len(kept)} headings", f"at most {MOST_HEADINGS}", "split the sheet", number)
    for at in kept:
        letter, name = str(at + 1), heading(cells[at])
        if isinstance(name, Bad):
            yield Problem(name.found, name.wanted, name.action, table.file, row=number, column=letter)
            name = f"column {letter}"
        table.letters.append(letter)
        table.headings.append(name)


def _broken(fault: str, separator: str, row: int) -> Unreadable:
    if "limit" in fault:
        found, action = "a very long cell, perhaps a quote never closed", "check the quotes from here"
    elif "end of data" in fault:
        found, action = "a quote that is never closed", 'close it, or write a quote in a cell as ""'
    else:
        found, action = "text after a closing quote", 'close the quotes, or write a quote in a cell as ""'
    return Unreadable(found, f"quotes in pairs, {_NAMES[separator]} between cells", action, row)
