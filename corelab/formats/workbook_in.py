"""Reading bench sheets from workbooks (.xlsx, .xlsm): a hostile file in, raw cells out.

One streamed pass of expat over the parts of the package gives the values as well as what must be known
of them: formulas never calculated, error values, percentage and date formats, merged and hidden cells.
A second reader for the values would need the same limits and could disagree with the first; the pass alone
reads 100,000 rows of 11 columns in some seconds. Nothing is written to disk and nothing outside the
file is followed. No grid is built: a cell far away costs no more than one nearby.

The rules are those of ECMA-376, Office Open XML file formats, part 1 (SpreadsheetML) and part 2
(packages), in the transitional and the strict namespaces.
"""

from __future__ import annotations

import io
import math
import posixpath
import re
import struct
import zipfile
import zlib
from collections.abc import Callable, Iterator
from datetime import date, datetime, time, timedelta
from pathlib import Path
from typing import NamedTuple
from urllib.parse import unquote
from xml.parsers import expat

from corelab.errors import Problem, quoted
from corelab.formats.table import (
    MOST_CELLS,
    MOST_HEADINGS,
    MOST_NAMED,
    Bad,
    Cell,
    Percent,
    Table,
    Unreadable,
    clean,
    heading,
    opening_problem,
    stray_problems,
)

MOST_FILE_BYTES = 100_000_000
MOST_UNPACKED_BYTES = 200_000_000  # of all parts read, and of any one
MOST_RATIO = 200  # unpacked to packed, of parts above RATIO_FROM bytes; sheets pack 5 to 40 times
RATIO_FROM = 5_000_000
MOST_MEMBERS = 5_000
MOST_ELEMENTS = 8_000_000  # of one part
MOST_DEPTH = 64
MOST_TOKEN_BYTES = 500_000  # expat before 2.6 reads an unfinished token again with every chunk
LAST_ROW, LAST_COLUMN = 1_048_576, 16_384

_MAINS = (
    "http://schemas.openxmlformats.org/spreadsheetml/2006/main",
    "http://purl.oclc.org/ooxml/spreadsheetml/main",
)
_LINKS = (
    "http://schemas.openxmlformats.org/officeDocument/2006/relationships",
    "http://purl.oclc.org/ooxml/officeDocument/relationships",
)
_RELATIONSHIP = "http://schemas.openxmlformats.org/package/2006/relationships Relationship"
_SAVE = "open it in the spreadsheet program and save it again as .xlsx"
_COPY = "copy the file again from where it came"
_WANTED = "a workbook as a spreadsheet program saves it"

# What zipfile raises on damaged archives; only its own calls are guarded with these
_BROKEN = (
    zipfile.BadZipFile,
    zlib.error,
    struct.error,
    EOFError,
    OSError,
    NotImplementedError,
    RuntimeError,
    ValueError,
)

Attributes = dict[str, str]


def _unreadable(found: str, wanted: str = _WANTED, action: str = _SAVE, row: int | None = None) -> Unreadable:
    return Unreadable(found, wanted, action, row)


class _Enough(Exception):
    """Nothing more need be read of this part."""


def read_workbook(
    path: Path, shown_as: str, select: Callable[[str], bool]
) -> tuple[list[Table], list[Problem], list[str]]:
    """The tables of the selected tabs, all that is wrong with the file, and the other tabs in use.

    Parameters
    ----------
    path, shown_as
        Where the file is, and its name in messages.
    select
        Whether a tab of this name is to be read.

    Returns
    -------
    tables
        One a selected tab, in their order; without headings where the tab is empty. A tab that is
        damaged has none.
    problems
        Everything wrong with the file and the selected tabs.
    others
        Names of the tabs that were not selected and hold at least one cell.
    """
    try:
        with path.open("rb") as stream:
            data = stream.read(MOST_FILE_BYTES + 1)
    except OSError as fault:
        return [], [opening_problem(fault, path, shown_as)], []
    try:
        return _read(data, shown_as, select)
    except Unreadable as fault:
        return [], [fault.problem(shown_as)], []


def _read(
    data: bytes, shown_as: str, select: Callable[[str], bool]
) -> tuple[list[Table], list[Problem], list[str]]:
    package = _Package(data)
    book = _Book(package)
    tables: list[Table] = []
    problems: list[Problem] = []
    others: list[str] = []
    for tab in book.tabs:
        if not select(tab.name):
            if tab.part and _in_use(package, tab.part):
                others.append(tab.name)
            continue
        try:
            if not tab.part:
                raise _unreadable("a tab that is not a sheet of cells", "a sheet of cells", "rename the tab")
            sheet = _Sheet(book, Table(shown_as, tab.name, hidden=tab.hidden))
            package.parse(tab.part, sheet.start, sheet.end, sheet.chunks.append)
            table, found = sheet.finish()
            tables.append(table)
            problems += found
        except Unreadable as fault:
            problems.append(fault.problem(shown_as, tab.name))
    return tables, problems, others


# The package: a zip archive of XML parts


class _Package:
    def __init__(self, data: bytes) -> None:
        _check_kind(data)
        try:
            self._zip = zipfile.ZipFile(io.BytesIO(data))
        except _BROKEN as fault:
            raise _unreadable(f"a workbook cut short or damaged ({fault})", action=_COPY) from None
        members = self._zip.infolist()
        self._members: dict[str, zipfile.ZipInfo] = {}
        for member in members:
            name = member.filename.replace("\\", "/").lstrip("/").casefold()
            if name in self._members:
                raise _unreadable(f"the part {quoted(member.filename)} twice inside the file")
            self._members[name] = member
        self._left = MOST_UNPACKED_BYTES
        if "mimetype" in self._members and "content.xml" in self._members:
            raise _unreadable("an OpenDocument file (.ods)", "a workbook (.xlsx)", "save it as .xlsx")

    def __contains__(self, part: str) -> bool:
        return part.casefold() in self._members

    def parse(
        self,
        part: str,
        start: Callable[[str, Attributes], None],
        end: Callable[[str], None] | None = None,
        text: Callable[[str], object] | None = None,
    ) -> None:
        """Run the handlers over an XML part, within the limits; they see names as 'namespace name'."""
        member = self._members.get(part.casefold())
        if member is None:
            raise _unreadable(f"no part {quoted(part)} inside the file")
        size, packed = member.file_size, member.compress_size
        if size > MOST_UNPACKED_BYTES or (size > RATIO_FROM and size > MOST_RATIO * packed):
            raise _unreadable(
                f"a part that unpacks from {packed:,} to {size:,} bytes",
                f"at most {MOST_UNPACKED_BYTES:,} bytes, and {MOST_RATIO} times the packed size",
                "copy the filled rows into a new workbook, or split it",
            )
        if member.compress_type not in {zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED}:
            raise _unreadable("a part packed in an unusual way")
        if member.flag_bits & 1:
            raise _unreadable("a file locked with a password", "a file without one", "save it without one")
        parser = expat.ParserCreate(namespace_separator=" ")
        parser.buffer_text = True
        parser.buffer_size = 65_536
        parser.XmlDeclHandler = _check_declaration
        parser.StartDoctypeDeclHandler = _refuse_doctype
        parser.StartElementHandler = start
        parser.EndElementHandler = end
        parser.CharacterDataHandler = text
        fed = 0
        try:
            for chunk in self._chunks(member):
                fed += len(chunk)
                parser.Parse(chunk, False)
                if fed - parser.CurrentByteIndex > MOST_TOKEN_BYTES:
                    raise _unreadable(f"one XML tag or comment of over {MOST_TOKEN_BYTES:,} bytes")
            parser.Parse(b"", True)
        except expat.ExpatError as fault:
            raise _unreadable(f"broken XML in {quoted(part)} ({fault})") from None

    def _chunks(self, member: zipfile.ZipInfo) -> Iterator[bytes]:
        try:
            with self._zip.open(member) as stream:
                while chunk := stream.read(65_536):
                    self._left -= len(chunk)
                    if self._left < 0:
                        raise _unreadable(
                            f"more than {MOST_UNPACKED_BYTES:,} bytes to read",
                            "a smaller workbook",
                            "split it into several files",
                        )
                    yield chunk
        except _BROKEN as fault:
            raise _unreadable(f"the damaged part {quoted(member.filename)} ({fault})", action=_COPY) from None

    def links(self, part: str) -> dict[str, tuple[str, str]]:
        """Inside links of a part: their kind and the part they lead to, by identity."""
        folder, name = posixpath.split(part)
        found: dict[str, tuple[str, str]] = {}

        def start(tag: str, attributes: Attributes) -> None:
            if tag == _RELATIONSHIP and attributes.get("TargetMode") != "External":
                target = unquote(attributes.get("Target", "")).replace("\\", "/")
                target = posixpath.normpath(posixpath.join("/", folder, target)).lstrip("/")
                found[attributes.get("Id", "")] = attributes.get("Type", "").rpartition("/")[2], target

        own = posixpath.join(folder, "_rels", f"{name}.rels")
        if own in self:
            self.parse(own, start)
        return found


def _check_kind(data: bytes) -> None:
    """Refuse by name what is plainly not a workbook."""
    if not data:
        raise _unreadable("an empty file", action="fill in a sheet and save it as .xlsx")
    if len(data) > MOST_FILE_BYTES:
        raise _unreadable(
            "a file too large", f"at most {MOST_FILE_BYTES // 1_000_000} MB", "split it into several files"
        )
    if data.startswith(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"):
        if "EncryptedPackage".encode("utf-16-le") in data:
            raise _unreadable("a file locked with a password", "a file without one", "save it without one")
        raise _unreadable("a file of the old kind (.xls)", "a workbook (.xlsx)", "save it as .xlsx")
    if not data.startswith((b"PK\x03\x04", b"PK\x05\x06")):
        text = all(byte >= 32 or byte in b"\t\n\r" for byte in data[:4096])
        kind = "a text file" if text else "a file of another kind"
        raise _unreadable(
            f"{kind} named as a workbook", "a workbook (.xlsx)", "save it as .xlsx, or name a CSV file .csv"
        )
    if (many := data.count(b"PK\x01\x02")) > MOST_MEMBERS:  # before zipfile makes an object of each
        raise _unreadable(f"{many} parts inside the file", f"at most {MOST_MEMBERS}")


def _check_declaration(version: str, encoding: str | None, standalone: int) -> None:
    if encoding and encoding.casefold() not in {"utf-8", "utf-16", "us-ascii"}:
        raise _unreadable(f"XML in the encoding {quoted(encoding)}")


def _refuse_doctype(*_: object) -> None:
    raise _unreadable(
        "a document type declaration, which no spreadsheet program writes",
        action="ask who made the file for one saved by a spreadsheet program",
    )


# The book: tabs, number formats, shared texts


class _Tab(NamedTuple):
    name: str
    part: str  # empty where the tab is no sheet of cells
    hidden: bool


PLAIN, PERCENT, DATE, TIME, ELAPSED = range(5)

# ECMA-376 part 1, numFmt: numbers of formats that every program knows (from memory)
_BUILT_IN = (
    dict.fromkeys((9, 10), PERCENT)
    | dict.fromkeys((14, 15, 16, 17, 22, *range(27, 32), 36, *range(50, 55), 57, 58), DATE)
    | dict.fromkeys((18, 19, 20, 21, *range(32, 36), 45, 47, 55, 56), TIME)
    | {46: ELAPSED}
)
_LITERAL = re.compile(r'"[^"]*"?|\\.|_.|\*.')
_ELAPSED = re.compile(r"\[(h+|m+|s+)\]", re.IGNORECASE)
_BRACKET = re.compile(r"\[[^\]]*\]|general|standard", re.IGNORECASE)


def format_kind(code: str) -> int:
    """What a number format makes of a number: PLAIN, PERCENT, DATE, TIME or ELAPSED (hours beyond 24)."""
    bare = _LITERAL.sub("", code[:1000])
    elapsed = bool(_ELAPSED.search(bare))
    bare = _BRACKET.sub("", bare).casefold()
    if "%" in bare:
        return PERCENT
    if "y" in bare or "d" in bare or "mmm" in bare:
        return DATE
    if elapsed:
        return ELAPSED
    if "h" in bare or "s" in bare:
        return TIME
    return DATE if "m" in bare else PLAIN


def _tags(*names: str) -> dict[str, str]:
    return {f"{main} {name}": name for main in _MAINS for name in names}


class _Book:
    def __init__(self, package: _Package) -> None:
        self.package = package
        part = next((to for kind, to in package.links("").values() if kind == "officeDocument"), "")
        part = part or "xl/workbook.xml"
        if part not in package:
            raise _unreadable("a zip file without a workbook in it", "a workbook (.xlsx)", "save it as .xlsx")
        if part.casefold().endswith(".bin"):
            raise _unreadable("a binary workbook (.xlsb)", "a workbook (.xlsx)", "save it as .xlsx")
        links = package.links(part)
        self.tabs: list[_Tab] = []
        self.since_1904 = False
        self._read_tabs(part, links)
        parts = dict(links.values())
        self.formats: dict[str | None, int] = {None: PLAIN}
        if "styles" in parts:
            self._read_formats(parts["styles"])
        self._texts: list[Cell] | None = None
        self._texts_part = parts.get("sharedStrings", "")

    @property
    def texts(self) -> list[Cell]:
        """The shared texts, read when first wanted."""
        if self._texts is None:
            self._texts = _shared_texts(self.package, self._texts_part) if self._texts_part else []
        return self._texts

    def _read_tabs(self, part: str, links: dict[str, tuple[str, str]]) -> None:
        tags = _tags("workbook", "workbookPr", "sheet")

        def start(name: str, attributes: Attributes) -> None:
            tag = tags.get(name)
            if tag == "workbookPr":
                self.since_1904 = attributes.get("date1904") in {"1", "true"}
            elif tag == "sheet":
                link = next((attributes[key] for ns in _LINKS if (key := f"{ns} id") in attributes), "")
                kind, to = links.get(link, ("", ""))
                if not kind:
                    raise _unreadable(f"the tab {quoted(attributes.get('name', ''))} without its sheet")
                hidden = attributes.get("state", "visible") != "visible"
                self.tabs.append(_Tab(attributes.get("name", ""), to if kind == "worksheet" else "", hidden))

        self.package.parse(part, start)
        if not self.tabs:
            raise _unreadable("a workbook without tabs")

    def _read_formats(self, part: str) -> None:
        tags = _tags("numFmt", "cellXfs", "xf")
        kinds: dict[str, int] = {str(number): kind for number, kind in _BUILT_IN.items()}
        used: list[str] = []
        inside = False

        def start(name: str, attributes: Attributes) -> None:
            nonlocal inside
            tag = tags.get(name)
            if tag == "numFmt":
                kinds[attributes.get("numFmtId", "")] = format_kind(attributes.get("formatCode", ""))
            elif tag == "cellXfs":
                inside = True
            elif tag == "xf" and inside:
                used.append(attributes.get("numFmtId", "0"))

        def end(name: str) -> None:
            nonlocal inside
            if tags.get(name) == "cellXfs":
                inside = False

        self.package.parse(part, start, end)
        self.formats |= {str(at): kinds.get(number, PLAIN) for at, number in enumerate(used)}
        self.formats[None] = self.formats.get("0", PLAIN)


_ESCAPE = re.compile(r"_x([0-9A-Fa-f]{4})_")


def _text(chunks: list[str]) -> Cell:
    """Text of a cell; `_x000D_` and the like stand for a character (ECMA-376 part 1, ST_Xstring)."""
    text = "".join(chunks)
    if "_x" in text:
        text = _ESCAPE.sub(lambda match: chr(int(match[1], 16)), text)
    return clean(text)


def _shared_texts(package: _Package, part: str) -> list[Cell]:
    tags = _tags("si", "t", "rPh")
    texts: list[Cell] = []
    chunks: list[str] = []
    runs: list[str] = []
    phonetic = False
    depth = 0

    def start(name: str, attributes: Attributes) -> None:
        nonlocal phonetic, depth
        depth += 1
        if depth > MOST_DEPTH or len(texts) > MOST_CELLS:
            raise _unreadable("too many or too deeply nested texts")
        tag = tags.get(name)
        if tag == "t":
            chunks.clear()
        elif tag == "rPh":
            phonetic = True

    def end(name: str) -> None:
        nonlocal phonetic, depth
        depth -= 1
        tag = tags.get(name)
        if tag == "t" and not phonetic:
            runs.extend(chunks)
        elif tag == "rPh":
            phonetic = False
        elif tag == "si":
            texts.append(_text(runs))
            runs.clear()

    package.parse(part, start, end, chunks.append)
    return texts


def _in_use(package: _Package, part: str) -> bool:
    """Whether a sheet holds any cell that is not blank, read no further than to the first."""
    tags = _tags("v", "f", "t")
    elements = 0

    def start(name: str, attributes: Attributes) -> None:
        nonlocal elements
        elements += 1
        if name in tags or elements > MOST_ELEMENTS:
            raise _Enough

    try:
        package.parse(part, start)
    except (_Enough, Unreadable):
        return True
    return False


# One sheet

_REFERENCE = re.compile(r"([A-Z]{1,3})([1-9][0-9]{0,6})")
_SHEET_TAGS = _tags("v", "c", "row", "f", "t", "is", "rPh", "mergeCell", "col", "worksheet")
_DEPTHS: dict[str | None, int] = {"worksheet": 1, "row": 3, "c": 4, "v": 5, "is": 5}
_TRUE = {"1", "true"}


def _column_number(letters: str) -> int:
    number = 0
    for letter in letters:
        number = 26 * number + ord(letter) - 64
    return number


def _column_letters(number: int) -> str:
    letters = ""
    while number:
        number, digit = divmod(number - 1, 26)
        letters = chr(65 + digit) + letters
    return letters


class _Sheet:
    """Handlers that gather a sheet row by row. The first row with a cell is the heading row."""

    def __init__(self, book: _Book, table: Table) -> None:
        self._book, self._table = book, table
        self._texts: list[Cell] | None = None
        self._formats = book.formats
        self.chunks: list[str] = []  # text since the last opening of v, f or t
        self._runs: list[str] = []
        self._phonetic = False
        self._elements = self._depth = 0
        # the cell being read
        self._reference = ""
        self._type = "n"
        self._style: str | None = None
        self._formula = self._valued = False
        # the row being read
        self._row, self._digits, self._skip = 0, "0", 0
        self._hidden_row = False
        self._first: dict[str, Cell] = {}  # the heading row
        self._places: dict[str, int] = {}
        self._values: list[Cell] = []
        self._grid: list[list[Cell]] = []
        self._heading_row = 0
        self._strays: list[tuple[int, str, Cell]] = []
        self._many_strays = 0
        self._problems: list[Problem] = []
        self._merges: list[str] = []
        self._hidden_columns: list[tuple[int, int]] = []
        self._hidden_rows: list[int] = []

    def start(self, name: str, attributes: Attributes) -> None:
        self._elements += 1
        self._depth += 1
        tag = _SHEET_TAGS.get(name)
        if self._depth != _DEPTHS.get(tag, self._depth):
            raise _unreadable(f"the element <{tag}> where it does not belong", row=self._row or None)
        if tag == "v" or tag == "t":
            self.chunks.clear()
        elif tag == "c":
            self._reference = attributes.get("r") or self._next_reference()
            self._type = attributes.get("t", "n")
            self._style = attributes.get("s")
            self._formula = self._valued = False
        elif tag == "row":
            self._start_row(attributes)
        elif tag == "f":
            self._formula = True
        elif tag == "is":
            self._runs.clear()
        elif tag == "rPh":
            self._phonetic = True
        elif tag == "mergeCell":
            self._merges.append(attributes.get("ref", ""))
        elif tag == "col" and attributes.get("hidden") in _TRUE:
            low, high = attributes.get("min", ""), attributes.get("max", "")
            if low.isdecimal() and high.isdecimal() and len(low) < 6 and len(high) < 6:
                self._hidden_columns.append((int(low), int(high)))
        elif self._depth == 1 and tag != "worksheet":
            raise _unreadable("a part that is not a worksheet where a tab should be")
        if self._depth > MOST_DEPTH or self._elements > MOST_ELEMENTS:
            raise _unreadable("too many or too deeply nested elements", action=f"{_SAVE}, or split it")

    def end(self, name: str) -> None:
        self._depth -= 1
        tag = _SHEET_TAGS.get(name)
        if tag == "v":
            self._valued = True
            self._take(self._value(self.chunks[0] if len(self.chunks) == 1 else "".join(self.chunks)))
        elif tag == "c":
            if self._formula and not self._valued:
                self._take(_never_calculated())
        elif tag == "t":
            if not self._phonetic:
                self._runs += self.chunks
        elif tag == "is":
            self._valued = True
            self._take(_text(self._runs))
        elif tag == "rPh":
            self._phonetic = False
        elif tag == "row":
            self._end_row()

    def _start_row(self, attributes: Attributes) -> None:
        digits = attributes.get("r") or str(self._row + 1)
        row = int(digits) if digits.isdecimal() and digits.isascii() and len(digits) < 8 else 0
        if not self._row < row <= LAST_ROW:
            raise _unreadable(f"a row numbered {quoted(digits)} after row {self._row}")
        self._row, self._digits, self._skip = row, str(row), -len(str(row))
        self._reference = ""
        self._values = [None] * len(self._places)
        self._hidden_row = attributes.get("hidden") in _TRUE

    def _next_reference(self) -> str:
        """The place of a cell that leaves it out: right of the one before."""
        before = _REFERENCE.fullmatch(self._reference)
        return f"{_column_letters(_column_number(before[1]) + 1 if before else 1)}{self._row}"

    def _take(self, value: Cell) -> None:
        """Put the value of the cell being read where it belongs."""
        reference = self._reference
        letters = reference[: self._skip] if reference.endswith(self._digits) else ""
        place = self._places.get(letters)
        if place is not None:
            if self._values[place] is not None:
                raise self._damaged("two values")
            self._values[place] = value
            return
        match = _REFERENCE.fullmatch(reference)
        if not match or int(match[2]) != self._row or _column_number(match[1]) > LAST_COLUMN:
            raise self._damaged(f"a value out of row {self._row}")
        if value is None:
            return
        if not self._heading_row or self._heading_row == self._row:
            self._heading_row = self._row
            if self._first.setdefault(letters, value) is not value:
                raise self._damaged("two values")
            return
        self._many_strays += 1
        if len(self._strays) < MOST_NAMED:
            self._strays.append((self._row, letters, value))

    def _end_row(self) -> None:
        if self._heading_row == self._row:
            self._read_headings()
            return
        if self._values.count(None) == len(self._values):
            return
        self._grid.append(self._values)
        self._table.rows.append(self._row)
        if self._hidden_row:
            self._hidden_rows.append(self._row)
        if len(self._grid) * len(self._places) > MOST_CELLS:
            raise _unreadable("too many cells", f"at most {MOST_CELLS:,} in a tab", "split it", row=self._row)

    def _read_headings(self) -> None:
        if len(self._first) > MOST_HEADINGS:
            raise _unreadable(
                f"{len(self._first)} headings", f"at most {MOST_HEADINGS}", "split the sheet", row=self._row
            )
        for letters in sorted(self._first, key=_column_number):
            name = heading(self._first[letters])
            if isinstance(name, Bad):
                self._problem(name.found, name.wanted, name.action, self._row, letters)
                name = f"column {letters}"
            self._places[letters] = len(self._places)
            self._table.letters.append(letters)
            self._table.headings.append(name)
        if self._hidden_row:
            self._hidden_rows.append(self._row)

    def _problem(
        self, found: str, wanted: str, action: str, row: int | None = None, column: str = ""
    ) -> None:
        self._problems.append(
            Problem(found, wanted, action, self._table.file, self._table.sheet, row, column)
        )

    def _value(self, text: str) -> Cell:
        kind = self._type
        if kind == "str" or kind == "inlineStr":
            return _text([text])
        if not text or text.isspace():
            return _never_calculated() if self._formula else None
        if kind == "n":
            return self._number(text)
        if kind == "s":
            if self._texts is None:
                self._texts = self._book.texts
            if not (text.isascii() and text.isdecimal() and len(text) < 9 and int(text) < len(self._texts)):
                raise self._damaged(f"shared text number {quoted(text)} of {len(self._texts)}")
            return self._texts[int(text)]
        if kind == "b":
            if text.strip() not in {"0", "1", "true", "false"}:
                raise self._damaged(f"the truth value {quoted(text)}")
            return text.strip() in _TRUE
        if kind == "e":
            return Bad(
                f"the error value {text.strip()[:40]}", "a value", "correct the formula, or clear the cell"
            )
        if kind == "d":
            try:
                return _iso(text.strip())
            except ValueError:
                return Bad(f"the date {quoted(text)}", "a date such as 2026-03-14", "type it anew")
        raise self._damaged(f"the type {quoted(kind)}")

    def _number(self, text: str) -> Cell:
        try:
            value = float(text) if len(text) <= 100 else math.nan
        except ValueError:
            value = math.nan
        if not math.isfinite(value) or not text.isascii() or "_" in text:
            raise self._damaged(f"the number {quoted(text)}")
        kind = self._formats.get(self._style, -1)
        if kind == PLAIN:
            return int(value) if value.is_integer() and abs(value) < 2**53 else value
        if kind == PERCENT:
            return Percent(value)
        if kind < 0:
            return Bad(f"{text.strip()} under a format that the file does not hold", "a value", _SAVE)
        return _moment(value, kind, self._book.since_1904)

    def _damaged(self, what: str) -> Unreadable:
        return _unreadable(f"{what} in cell {self._reference[:12]}, as of a damaged file", row=self._row)

    def finish(self) -> tuple[Table, list[Problem]]:
        table = self._table
        columns = [list(column) for column in zip(*self._grid, strict=True)]
        table.columns = columns or [[] for _ in table.headings]
        self._problems += stray_problems(table, self._strays, self._many_strays)
        self._check_merges()
        self._note_hidden()
        return table, self._problems

    def _check_merges(self) -> None:
        table = self._table
        if not table.letters:
            return
        left, right = _column_number(table.letters[0]), _column_number(table.letters[-1])
        top, bottom = self._heading_row, table.rows[-1] if table.rows else self._heading_row
        touching: list[tuple[int, str]] = []
        for reference in self._merges:
            ends = re.fullmatch(f"{_REFERENCE.pattern}:{_REFERENCE.pattern}", reference)
            if not ends:
                self._problem(f"merged cells named {quoted(reference)}", _WANTED, _SAVE)
                return
            west, east = sorted((_column_number(ends[1]), _column_number(ends[3])))
            north, south = sorted((int(ends[2]), int(ends[4])))
            if west <= right and east >= left and north <= bottom and south >= top:
                touching.append((north, reference))
        wanted, action = "one cell for each heading and value", "unmerge them and fill in each cell"
        for row, reference in touching[:MOST_NAMED]:
            self._problem(f"merged cells {reference}", wanted, action, max(row, top))
        if len(touching) > MOST_NAMED:
            self._problem(f"{len(touching) - MOST_NAMED} more merged ranges", wanted, action)

    def _note_hidden(self) -> None:
        table = self._table
        if table.hidden:
            table.notes.append("the tab is hidden; it was read all the same")
        if rows := self._hidden_rows:
            listed = ", ".join(map(str, rows[:5])) + (" …" if len(rows) > 5 else "")
            table.notes.append(f"{len(rows)} hidden row(s) were read like the others: {listed}")
        columns = [
            letters
            for letters in table.letters
            if any(low <= _column_number(letters) <= high for low, high in self._hidden_columns)
        ]
        if columns:
            listed = ", ".join(columns[:5]) + (" …" if len(columns) > 5 else "")
            table.notes.append(f"{len(columns)} hidden column(s) were read like the others: {listed}")


def _never_calculated() -> Bad:
    return Bad(
        "a formula that was never calculated",
        "a value",
        "open the file in the spreadsheet program, let it calculate, and save it; or type the value",
    )


def _iso(text: str) -> Cell:
    """A cell of type 'd', in ISO 8601."""
    text = text.removesuffix("Z")
    if "T" not in text:
        return date.fromisoformat(text)
    if text.startswith("T"):
        return time.fromisoformat(text).replace(tzinfo=None)
    return datetime.fromisoformat(text).replace(tzinfo=None)


def _moment(value: float, kind: int, since_1904: bool) -> Cell:
    """A serial number of days as a date or time, to the millisecond.

    In the system of 1900 day 1 is 1 January 1900, and day 60 a 29 February that never was.
    In the system of 1904 day 0 is 1 January 1904.
    """
    if kind != DATE and 0 <= value < 1:
        return (datetime.min + timedelta(milliseconds=round(value * 86_400_000))).time()
    if kind == ELAPSED:
        return Bad(f"a duration of {24 * value:g} hours", "a time of day or a number", "type it anew")
    if since_1904:
        start, first = datetime(1904, 1, 1), 0.0
    else:
        start, first = datetime(1899, 12, 30 if value >= 60 else 31), 1.0
    if not first <= value < 2_958_466 or (not since_1904 and 60 <= value < 61):
        return Bad(f"{value:g} under a date format, which is no date", "a date or a number", "type it anew")
    try:
        return start + timedelta(milliseconds=round(value * 86_400_000))
    except OverflowError:
        return Bad(f"{value:g} under a date format, which is no date", "a date or a number", "type it anew")
