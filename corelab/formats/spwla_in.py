"""Reading the SPWLA core-data exchange format: a laboratory's results, as numbered records of lines.

A record opens with a line of whole numbers from the first column: its kind, how many lines follow, and for
some how many values these hold. Kind 10 names the well and the laboratory, 15 says what each value of a
sample is, 20 an interval cored, 30 opens a sample (depth and name), 36 describes it in words, 40 holds its
values in columns of twelve. Learnt from files of the Norwegian Offshore Directorate; what other writers do
otherwise is taken where it can be understood, and named where it cannot.
"""

from __future__ import annotations

import codecs
import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

from corelab.errors import Refused, quoted
from corelab.formats.table import Bad, Unreadable, clean, opening_problem

MOST_BYTES = 30_000_000
MOST_CHARACTERS = 10_000  # of one line
MOST_LINES = 1_000_000
WIDTH, MARGIN = 12, 4  # of the columns of values, and of the blanks before them
WELL, MEANINGS, INTERVAL, SAMPLE, WORDS, VALUES = 10, 15, 20, 30, 36, 40
#: How lines of words begin that carry the doubts about a plug, and what else is known of it.
FLAGS, FACTS = "flags: ", "plug: "
_KNOWN = {WELL, MEANINGS, INTERVAL, SAMPLE, WORDS, VALUES}
_SAVE = "ask the laboratory for the file as issued"
_OPENING = re.compile(r" ?([1-9]\d?)((?: +\d{1,6}){0,4})\s*")
_MEANING = re.compile(r"\s*(\d+)(?:\s+(\d+))?(?:\s+(\d+))?(?:\s+(\d+))?")
_NUMBER = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][-+]?\d+)?")
_STRAY = re.compile(r"[^\S\n]")
#: Columns of a line of meanings in which the laboratory and then the words stand.
_LABORATORY, _TEXT = 34, 54
#: Columns of a line of a sample in which the second number stands; what it means is not told.
_SECOND = slice(12, 21)


@dataclass(frozen=True, slots=True)
class Meaning:
    """What one value of a sample is: codes as written, whose result, in which words."""

    row: int
    codes: tuple[int, ...]
    laboratory: str
    text: str


@dataclass(slots=True)
class Sample:
    """One sample as written. `values` are texts, one a meaning, empty where nothing stands."""

    row: int
    line: str
    depth: float | None
    name: str
    more: str = ""
    words: list[str] = field(default_factory=list)
    values: list[str] = field(default_factory=list)


@dataclass(slots=True)
class SpwlaFile:
    """What a file holds. `notices` name what was odd or not understood, with its row."""

    file: str
    content: bytes
    heading: list[str] = field(default_factory=list)
    well: str = ""
    laboratory: str = ""
    depth_unit: str = ""
    meanings: list[Meaning] = field(default_factory=list)
    intervals: list[str] = field(default_factory=list)
    samples: list[Sample] = field(default_factory=list)
    notices: list[str] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class _Record:
    row: int
    kind: int
    counts: tuple[int, ...]
    lines: list[str]
    whole: bool


def read_spwla(path: Path) -> SpwlaFile:
    """A file of core data.

    Raises
    ------
    Refused
        If it cannot be read, is no such file, or holds no sample.
    """
    try:
        with path.open("rb") as stream:
            content = stream.read(MOST_BYTES + 1)
    except OSError as fault:
        raise Refused([opening_problem(fault, path, path.name)]) from fault
    try:
        return parsed(path.name, content)
    except Unreadable as fault:
        raise Refused([fault.problem(path.name)]) from None


def parsed(name: str, content: bytes) -> SpwlaFile:
    """The content of a file, understood line by line; `Unreadable` where that cannot be."""
    lines, ended = _lines(content)
    made = SpwlaFile(name, content)
    strays: list[int] = []
    skipped: Counter[int] = Counter()
    open_samples: list[Sample] = []
    places: list[int] = []  # of the meanings now in use among all of the file
    for record in _records(lines, strays):
        if not record.whole:
            made.notices.append(
                f"row {record.row}: record {record.kind} announces {record.counts[0]} lines and has "
                f"{len(record.lines)}"
            )
        if record.kind == WELL:
            _take_heading(made, record)
        elif record.kind == MEANINGS:
            places = _take_meanings(made, record)
        elif record.kind == INTERVAL:
            made.intervals += [line.strip() for line in record.lines]
        elif record.kind == SAMPLE:
            open_samples = [_sample(made, record.row + 1 + i, line) for i, line in enumerate(record.lines)]
            made.samples += open_samples
        elif record.kind in {WORDS, VALUES} and not open_samples:
            made.notices.append(f"row {record.row}: record {record.kind} belongs to no sample; left out")
        elif record.kind == WORDS:
            open_samples[-1].words += [line.strip() for line in record.lines if line.strip()]
        elif record.kind == VALUES:
            cut = not ended and record.row + len(record.lines) >= len(lines)
            _take_values(made, record, open_samples, places, cut)
        else:
            skipped[record.kind] += 1
    for kind, times in sorted(skipped.items()):
        made.notices.append(
            f"{times} records of kind {kind} are not understood; they stay in the file as kept"
        )
    if strays:
        more = f" and {len(strays) - 1} more" if len(strays) > 1 else ""
        made.notices.append(f"row {strays[0]}{more}: a line outside any record; left out")
    if not made.meanings:
        raise Unreadable("no record 15", "a record 15 that says what the values are", _SAVE)
    if not made.samples:
        raise Unreadable("no sample", "records 30 and 40 with samples and their values", _SAVE)
    return made


def _lines(content: bytes) -> tuple[list[str], bool]:
    """The lines of a file, and whether the last one is ended."""
    if len(content) > MOST_BYTES:
        raise Unreadable("a file too large", f"at most {MOST_BYTES // 1_000_000} MB", "split it")
    if content.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        text = content.decode("utf-16", "replace")
    else:
        try:
            text = content.removeprefix(codecs.BOM_UTF8).decode("utf-8")
        except UnicodeDecodeError:
            text = content.decode("cp1252", "replace")
    text = text.rstrip("\x1a").replace("\r\n", "\n").replace("\r", "\n").replace("\f", "\n")
    lines = text.split("\n")
    if len(lines) > MOST_LINES:
        raise Unreadable(f"{len(lines)} lines", f"at most {MOST_LINES}", "split the file")
    for row, line in enumerate(lines, 1):
        if len(line) > MOST_CHARACTERS:
            raise Unreadable(f"a line of {len(line)} characters", f"at most {MOST_CHARACTERS}", _SAVE, row)
        if not (line.isascii() and line.isprintable()):
            line = line.expandtabs(8)
            found = clean(line)
            if isinstance(found, Bad):
                raise Unreadable(found.found, "plain text", _SAVE, row)
            lines[row - 1] = _STRAY.sub(" ", line)
    first = next((line for line in lines if line.strip()), "")
    opening = _OPENING.fullmatch(first)
    if opening is None or int(opening[1]) not in _KNOWN:
        raise Unreadable(
            f"{quoted(first)} in the first line",
            "a record of the SPWLA core-data format, such as '10     2'",
            "name a file in this format; bench sheets are loaded with 'corelab sheet load'",
        )
    ended = not lines[-1].strip()
    while lines and not lines[-1].strip():
        lines.pop()
    return lines, ended


def _records(lines: Sequence[str], strays: list[int]) -> Iterator[_Record]:
    at = 0
    while at < len(lines):
        opening = _OPENING.fullmatch(lines[at])
        if opening is None:
            if lines[at].strip():
                strays.append(at + 1)
            at += 1
            continue
        kind, counts = int(opening[1]), tuple(int(n) for n in opening[2].split())
        start, end = at + 1, at + 1
        wanted = counts[0] if counts else len(lines)
        while end < len(lines) and end - start < wanted and not _opens(lines[end]):
            end += 1
        body = list(lines[start:end])
        yield _Record(at + 1, kind, counts, body, not counts or len(body) == wanted)
        at = end


def _opens(line: str) -> bool:
    opening = _OPENING.fullmatch(line)
    return opening is not None and int(opening[1]) in _KNOWN and bool(opening[2])


def _take_heading(made: SpwlaFile, record: _Record) -> None:
    made.heading += [line.rstrip() for line in record.lines]
    well = re.split(r"\s{2,}", record.lines[0].strip())[0] if record.lines else ""
    if made.well and well and made.well.casefold() != well.casefold():
        raise Unreadable(
            f"two wells, {quoted(made.well)} and {quoted(well)}",
            "one well in a file",
            "split the file into one for each well",
            record.row,
        )
    if well and not made.well:
        made.well = well
        second = record.lines[1].strip() if len(record.lines) > 1 else ""
        made.laboratory = re.split(r"\s{2,}", second)[0]
        unit = re.search(r"\bdepths? in (m|ft|met|feet)", " ".join(record.lines), re.IGNORECASE)
        made.depth_unit = {"m": "m", "f": "ft"}[unit[1][0].lower()] if unit else ""


def _take_meanings(made: SpwlaFile, record: _Record) -> list[int]:
    """Where each value of the samples that follow stands among the meanings of the file.

    A file may say anew, core by core, what its values are; the same words mean the same again.
    """
    places: list[int] = []
    for meaning in _meanings(made, record):
        again = (
            i
            for i, known in enumerate(made.meanings)
            if i not in places and replace(known, row=meaning.row) == meaning
        )
        place = next(again, len(made.meanings))
        if place == len(made.meanings):
            made.meanings.append(meaning)
        places.append(place)
    announced = record.counts[-1] if len(record.counts) > 1 else len(places)
    if announced != len(places):
        made.notices.append(
            f"row {record.row}: record 15 announces {announced} values and means {len(places)}"
        )
    return places


def _meanings(made: SpwlaFile, record: _Record) -> Iterator[Meaning]:
    for row, line in enumerate(record.lines, record.row + 1):
        codes = _MEANING.match(line)
        if codes is None:
            made.notices.append(f"row {row}: {quoted(line)} is no meaning of a value; taken as words alone")
            yield Meaning(row, (), "", " ".join(line.split()))
            continue
        rest = line[codes.end() :].strip()
        parts = [p.strip() for p in re.split(r"\s{2,}", rest, maxsplit=1)]
        told_by_columns = codes.end() == _LABORATORY and line[_TEXT:].strip()
        if told_by_columns and (len(parts) == 1 or not line[_LABORATORY:_TEXT].strip()):
            parts = [line[_LABORATORY:_TEXT].strip(), line[_TEXT:].strip()]
        laboratory, text = parts if len(parts) == 2 else ("", parts[0])
        numbers = tuple(int(n) for n in codes.groups() if n is not None)
        yield Meaning(row, numbers, " ".join(laboratory.split()), " ".join(text.split()))


def _sample(made: SpwlaFile, row: int, line: str) -> Sample:
    """Depth, a second number where there is one, and the name, which may hold blanks."""
    words = line.split()
    depth = _float(words[0]) if words else None
    if depth is None:
        made.notices.append(f"row {row}: {quoted(line)} gives no depth; the sample is kept without one")
        return Sample(row, line.rstrip(), None, " ".join(words))
    rest, more = words[1:], ""
    if rest and _float(rest[0]) is not None and (len(rest) > 1 or line[_SECOND].strip() == rest[0]):
        more, rest = rest[0], rest[1:]
    return Sample(row, line.rstrip(), depth, " ".join(rest), more)


def _take_values(
    made: SpwlaFile, record: _Record, samples: list[Sample], places: list[int], cut: bool
) -> None:
    wanted = record.counts[1] if len(record.counts) > 1 else len(places)
    each = [record.lines] if len(samples) == 1 else [[line] for line in record.lines]
    if len(each) != len(samples):
        made.notices.append(
            f"row {record.row}: {len(samples)} samples and {len(record.lines)} lines of values; left out"
        )
        return
    for sample, lines in zip(samples, each, strict=True):
        values = _values(lines, wanted, cut)
        if cut and len(values) < wanted:
            last = values.pop() if values and not lines[-1].endswith(" ") else ""
            said = f"; its last value, {quoted(last)}, may be cut short and is left out" if last else ""
            made.notices.append(
                f"row {record.row + len(lines)}: the file ends within the values of sample "
                f"{quoted(sample.name)}{said}"
            )
        elif len(values) != wanted:
            made.notices.append(
                f"row {record.row + 1}: sample {quoted(sample.name)} has {len(values)} values where {wanted} "
                "are announced; which is which cannot be told, and none is taken"
            )
            values = []
        if sample.values and values:
            made.notices.append(
                f"row {record.row}: a second record of values of sample {quoted(sample.name)}; left out"
            )
            continue
        if len(values) > len(places):
            made.notices.append(
                f"row {record.row}: {len(values) - len(places)} values without a meaning; left out"
            )
        if values:
            sample.values = [""] * len(made.meanings)
            for place, value in zip(places, values, strict=False):
                sample.values[place] = value


def _values(lines: Sequence[str], wanted: int, cut: bool) -> list[str]:
    """The values as texts: parted by blanks where their number fits, else by columns of twelve."""
    words = " ".join(lines).split()
    ends = [found.end() for line in lines for found in re.finditer(r"\S+", line)]
    if len(words) == wanted or any((end - MARGIN) % WIDTH or end == MARGIN for end in ends):
        return words
    cells: list[str] = []
    for line in lines:
        body = line.rstrip()[MARGIN:]
        cells += [body[at : at + WIDTH].strip() for at in range(0, len(body), WIDTH)]
    return cells if cut else cells + [""] * (wanted - len(cells))


def _float(text: str) -> float | None:
    if not _NUMBER.fullmatch(text):
        return None
    value = float(re.sub("[dD]", "e", text))
    return value if abs(value) < 1e300 else None
