"""Loading bench sheets: files in, entries out, all or nothing."""

from __future__ import annotations

import hashlib
import math
from collections import Counter
from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import sqlalchemy as sa

from corelab.bench import check
from corelab.bench.parse import Row, parse
from corelab.errors import Problem, Refused, did_you_mean, nearest, quoted
from corelab.formats.csv_in import read_csv
from corelab.formats.table import Table
from corelab.formats.workbook_in import read_workbook
from corelab.records import store
from corelab.records.schema import IDENTITY, SHEET_TABLES, stored_columns
from corelab.sheets import SHEETS, Sheet, kind_named

_SAME = 1e-12
#: Tabs of a workbook that hold no readings: explanations and the words of drop-down lists.
SILENT_TABS = {"read me", "readme", "lists", "notes"}
_ENDINGS = {".xlsx", ".csv"}


@dataclass(slots=True)
class LoadReport:
    """What a load did, or with `--check` would do."""

    files: list[str] = field(default_factory=list)
    ignored: list[str] = field(default_factory=list)
    new: dict[str, int] = field(default_factory=dict)
    unchanged: dict[str, int] = field(default_factory=dict)
    corrected: dict[str, int] = field(default_factory=dict)
    notices: list[Problem] = field(default_factory=list)
    not_computed: list[str] = field(default_factory=list)
    doubtful: list[str] = field(default_factory=list)
    plugs: int = 0
    seal: str = ""
    checked_only: bool = False

    @property
    def changes(self) -> int:
        return sum(self.new.values()) + sum(self.corrected.values())


def find_files(paths: Sequence[Path]) -> tuple[list[tuple[Path, str]], list[str], list[Problem]]:
    """The sheets to load with the names under which they are shown, what is passed over, and problems."""
    files: dict[Path, Path] = {}  # where a file is -> how the user would name it
    inside_of: dict[Path, Path] = {}
    ignored: list[str] = []
    problems: list[Problem] = []
    for path in paths:
        try:
            is_folder, is_file = path.is_dir(), path.is_file()
        except (OSError, ValueError):  # a name that no file can have
            is_folder = is_file = False
        if is_folder:
            sheets = 0
            for item in sorted(p for p in path.rglob("*") if p.is_file()):
                hidden = any(part.startswith((".", "~$")) for part in item.relative_to(path).parts)
                if item.suffix.lower() in _ENDINGS and not hidden:
                    sheets += 1
                    files.setdefault(item.resolve(), item)
                    inside_of.setdefault(item, path)
                else:
                    ignored.append(str(path.name / item.relative_to(path)))
            if not sheets:
                problems.append(
                    Problem("a folder without sheets", ".xlsx or .csv files in it", "give another", str(path))
                )
        elif is_file:
            if path.suffix.lower() not in _ENDINGS:
                problems.append(
                    Problem(
                        f"a file ending in '{path.suffix}'",
                        "a bench sheet: .xlsx or .csv",
                        "save it as an Excel workbook (.xlsx) or as CSV UTF-8",
                        str(path),
                    )
                )
            else:
                files.setdefault(path.resolve(), path)
        else:
            beside = [p.name for p in path.parent.glob("*")] if path.parent.is_dir() else []
            hint = did_you_mean(path.name, beside) if nearest(path.name, beside) else "check the path"
            problems.append(Problem("no such file or folder", "an existing one", hint, str(path)))
    short = {
        item: str(inside_of[item].name / item.relative_to(inside_of[item]))
        if item in inside_of
        else item.name
        for item in files.values()
    }
    names = Counter(short.values())  # two files of one name are shown with their paths
    shown = [(at, short[p] if names[short[p]] == 1 else str(p)) for at, p in files.items()]
    return sorted(shown, key=lambda item: item[1]), ignored, problems


def read_rows(
    files: Iterable[tuple[Path, str]], *, decimal_comma: bool
) -> tuple[list[Row], list[Problem], list[Problem]]:
    """Every row of the files, typed; the problems and the notices."""
    rows: list[Row] = []
    problems: list[Problem] = []
    notices: list[Problem] = []
    for path, shown in files:
        for table in _tables(path, shown, decimal_comma, problems):
            kind = kind_named(table.sheet or path.stem)
            if kind is None:
                problems.append(_unknown_kind(table.sheet or path.stem, shown, bool(table.sheet)))
                continue
            found, wrong, odd = parse(table, SHEETS[kind], decimal_comma=decimal_comma)
            rows += found
            problems += wrong
            notices += odd
            notices += [
                Problem(note, "nothing hidden", "it was read like any other", shown, table.sheet)
                for note in table.notes
            ]
    return rows, problems, notices


def _tables(path: Path, shown: str, decimal_comma: bool, problems: list[Problem]) -> list[Table]:
    if path.suffix.lower() == ".csv":
        if kind_named(path.stem) is None:
            problems.append(_unknown_kind(path.stem, shown, False))
            return []
        tables, wrong = read_csv(path, shown, decimal_comma)
        problems += wrong
        return tables
    tables, wrong, others = read_workbook(path, shown, lambda name: kind_named(name) is not None)
    problems += wrong
    unknown = [name for name in others if name.strip().casefold() not in SILENT_TABS]
    problems += [_unknown_kind(name, shown, True) for name in unknown]
    if not tables and not wrong and not unknown:
        problems.append(
            Problem(
                "no bench sheet in this workbook",
                "a tab named as a kind of sheet",
                "see 'corelab sheet kinds'",
                shown,
            )
        )
    return tables


def _unknown_kind(name: str, shown: str, is_tab: bool) -> Problem:
    what = "tab" if is_tab else "file"
    action = did_you_mean(name, list(SHEETS)) if nearest(name, SHEETS) else "see 'corelab sheet kinds'"
    if is_tab:
        action += "; a tab that is no bench sheet may be called 'notes'"
    return Problem(
        f"the {what} name {quoted(name)}", "a kind of bench sheet", action, shown, name if is_tab else ""
    )


@dataclass(slots=True)
class Planned:
    """Rows tied to the record and sorted into what is to be written."""

    new: list[store.NewEntry]
    report: LoadReport
    touched: list[tuple[str, dict[str, Any]]]


def plan(
    connection: sa.Connection,
    rows: list[Row],
    problems: list[Problem],
    report: LoadReport,
    identities: store.Identities,
    *,
    barometer_kpa: float | None,
    reason: str,
) -> Planned:
    """Check the rows against the record and each other, and decide what each of them is.

    Raises
    ------
    Refused
        With every problem of the load.
    """
    sound = _sound(rows, problems)
    check.tie(rows, sound, identities, problems)
    for row in sound:
        problems += check.check_row(row, barometer_kpa)
    tied = [row for row in _sound(rows, problems) if not row.unusable]
    usable = {id(row) for row in tied}
    planned = Planned([], report, [])
    stood_in_for: set[int] = set()  # entries whose place a row of this load takes
    recorded: dict[str, Any] = {}
    for kind in dict.fromkeys(row.sheet.kind for row in tied):
        of_kind = [row for row in tied if row.sheet.kind == kind]
        frame = _recorded(connection, SHEETS[kind], of_kind)
        recorded[kind] = frame
        faulty = [row for row in rows if row.sheet.kind == kind and id(row) not in usable]
        gone = _recorded(connection, SHEETS[kind], of_kind, superseded=True)
        _sort_out(SHEETS[kind], of_kind, faulty, frame, gone, reason, planned, stood_in_for, problems)
    wells = {identities.owner("run", r.values["run_id"]) for r in tied if r.sheet.kind == "core runs"}
    wells |= {identities.owner("plug", r.values["plug_id"]) for r in tied if r.sheet.kind == "plugs"}
    wells |= {identities.owner("run", r.values["run_id"]) for r in tied if r.sheet.kind == "core sections"}
    wells |= {
        identities.owner("gun run", r.values["gun_run_id"]) for r in tied if r.sheet.kind == "sidewall shots"
    }
    together = check.check_together(
        _sound(tied, problems), rows, _of_wells(connection, wells, identities), identities, stood_in_for
    )
    problems += together.problems
    report.notices += together.notices
    if problems:
        raise Refused(problems)
    return planned


def _sound(rows: list[Row], problems: Sequence[Problem]) -> list[Row]:
    """The rows about which nothing is wrong yet, nor with their sheet as a whole."""
    sheets = {(p.file, p.sheet) for p in problems if p.row is None}
    bad = {(p.file, p.sheet, p.row) for p in problems}
    return [r for r in rows if (r.file, r.tab) not in sheets and (r.file, r.tab, r.number) not in bad]


def _of_wells(connection: sa.Connection, wells: set[int], identities: store.Identities) -> dict[str, Any]:
    def of(kind: str, identity: str, by: str) -> Any:
        table = IDENTITY[identity].name
        ids = [n for n, owner in identities.owners[table].items() if owner in wells]
        return store.in_force(connection, kind, ids, by=by)

    if not wells:
        return {}
    return {
        "core runs": of("core runs", "run", "run_id"),
        "core sections": of("core sections", "run", "run_id"),
        "sidewall shots": of("sidewall shots", "gun run", "gun_run_id"),
        "plugs": of("plugs", "plug", "plug_id"),
    }


def subject_field(sheet: Sheet) -> str:
    """The stored field that points at what the rows of a sheet are about."""
    return {
        "job": "job_id",
        "well": "well_id",
        "plug": "plug_id",
        "run": "run_id",
        "gun run": "gun_run_id",
        "instrument": "instrument_id",
        "standard": "standard_id",
    }[sheet.subject]


def _recorded(connection: sa.Connection, sheet: Sheet, rows: list[Row], *, superseded: bool = False) -> Any:
    by = subject_field(sheet)
    subjects = {row.values[by] for row in rows}
    return store.in_force(connection, sheet.kind, subjects, by=by, superseded=superseded)


def _key(values: Mapping[str, Any], fields: Sequence[str]) -> tuple[Any, ...]:
    return tuple(_rounded(values.get(f)) for f in fields)


def _rounded(value: Any) -> Any:
    if isinstance(value, float):
        return None if math.isnan(value) else float(f"{value:.10g}")
    return value.strip().casefold() if isinstance(value, str) else value


def _same(a: Any, b: Any) -> bool:
    a = None if isinstance(a, float) and math.isnan(a) else a
    b = None if isinstance(b, float) and math.isnan(b) else b
    if a is None or b is None or isinstance(a, str) or isinstance(b, str):
        return bool(a == b)
    return math.isclose(a, b, rel_tol=_SAME, abs_tol=0.0)


def _sort_out(
    sheet: Sheet,
    rows: list[Row],
    faulty: list[Row],
    frame: Any,
    gone: Any,
    reason: str,
    planned: Planned,
    stood_in_for: set[int],
    problems: list[Problem],
) -> None:
    stored = stored_columns(sheet)
    fields = [c.name for c in SHEET_TABLES[sheet.kind].c if c.name != "id"]
    key_fields = [f for c in stored if c.key and c.name != "repeat" for f in c.fields]
    known: dict[tuple[Any, ...], dict[str, Any]] = {}
    for record in frame.to_dict("records"):
        known[(*_key(record, key_fields), record.get("repeat"))] = record
    if sheet.reading:
        _number_repeats(rows, key_fields, problems)
    voided: dict[tuple[Any, ...], list[dict[str, Any]]] = {}
    for record in gone.to_dict("records"):
        voided.setdefault((*_key(record, key_fields), record.get("repeat")), []).append(record)
    seen: dict[tuple[Any, ...], Row] = {}
    uncounted = {_names(row) for row in faulty}  # beside a row left out, repeats are counted wrongly
    report = planned.report
    for row in rows:
        values = row.values
        key = (*_key(values, key_fields), values.get("repeat"))
        if key in seen:
            first = seen[key]
            problems.append(
                row.problem(
                    "",
                    f"the same {_key_words(sheet)} as row {first.number} of {first.file}",
                    "one row each" + (", or another repeat" if sheet.reading else ""),
                    "take one of them out"
                    + ("; leave 'repeat' empty to have repeats counted" if sheet.reading else ""),
                )
            )
            continue
        seen[key] = row
        old = known.get(key)
        supersedes = None
        if old is not None:
            differing = [f for f in fields if not _same(values.get(f), old.get(f))]
            if not differing:
                report.unchanged[sheet.kind] = report.unchanged.get(sheet.kind, 0) + 1
                stood_in_for.add(int(old["id"]))
                continue
            stood_in_for.add(int(old["id"]))
            if not reason:
                if sheet.reading and row.repeat is None and _names(row) in uncounted:
                    continue
                problems.append(_needs_reason(row, sheet, differing, values, old))
                continue
            supersedes = int(old["id"])
            planned.touched.append((sheet.kind, old))
        elif not reason:
            void = [r for r in voided.get(key, []) if all(_same(values.get(f), r.get(f)) for f in fields)]
            if void:
                report.unchanged[sheet.kind] = report.unchanged.get(sheet.kind, 0) + 1
                report.notices.append(
                    row.problem(
                        "",
                        f"the entries of {sheet.kind} {int(void[-1]['id'])}, withdrawn or corrected before",
                        "nothing that was taken out of force",
                        "it was left out; load it with --reason to bring it back",
                    )
                )
                continue
        counts = report.corrected if supersedes else report.new
        counts[sheet.kind] = counts.get(sheet.kind, 0) + 1
        planned.touched.append((sheet.kind, values))
        planned.new.append(
            store.NewEntry(sheet.kind, values, row.entered, row.file, row.tab, row.number, supersedes)
        )


def _names(row: Row) -> tuple[tuple[str, str], ...]:
    return tuple((column, store.name_key(name)) for column, name in row.names.items())


def _key_words(sheet: Sheet) -> str:
    return ", ".join(c.name for c in sheet.key)


def _needs_reason(
    row: Row, sheet: Sheet, differing: Sequence[str], values: Mapping[str, Any], old: Mapping[str, Any]
) -> Problem:
    def shown(value: Any) -> str:
        if value is None or (isinstance(value, float) and math.isnan(value)):
            return "nothing"
        return f"{value:.10g}" if isinstance(value, float) else str(value)

    names = {f: c.name for c in sheet.columns for f in c.fields}
    parts = [
        f"{names.get(f, f.replace('_', ' '))} {shown(values.get(f))} where the record has {shown(old.get(f))}"
        for f in differing[:3]
    ]
    more = f" and {len(differing) - 3} more" if len(differing) > 3 else ""
    other = " give another 'repeat' or date for a further reading, or" if sheet.reading else ""
    return row.problem(
        "",
        f"other entries than reading {old['id']} in force: {'; '.join(parts)}{more}",
        f"the same entries for the same {_key_words(sheet)}",
        f"if it is a correction, load with --reason;{other} leave the row out",
    )


def _number_repeats(rows: list[Row], key_fields: Sequence[str], problems: list[Problem]) -> None:
    taken: dict[tuple[Any, ...], set[int]] = {}
    for row in rows:
        if row.repeat is not None:
            taken.setdefault(_key(row.values, key_fields), set()).add(row.repeat)
    counters: dict[tuple[Any, ...], int] = {}
    for row in rows:
        key = _key(row.values, key_fields)
        number = row.repeat
        if number is None:
            number = counters.get(key, 0) + 1
            while number in taken.get(key, ()):
                number += 1
            counters[key] = number
        row.values["repeat"] = number


def affected_plugs(
    connection: sa.Connection, touched: Iterable[tuple[str, Mapping[str, Any]]], identities: store.Identities
) -> set[int]:
    """The plugs whose results may depend on these rows."""
    plugs: set[int] = set()
    instruments: set[int] = set()
    for kind, values in touched:
        if kind in {"porosimeter calibration", "instruments"}:
            instruments.add(int(values["instrument_id"]))
        elif values.get("plug_id") is not None and "plug_id" in SHEET_TABLES[kind].c:
            plugs.add(int(values["plug_id"]))
        elif kind == "standards":
            plugs.add(int(values["standard_id"]))
    for kind, table in SHEET_TABLES.items() if instruments else ():
        for by in ("instrument_id", "balance_id", "caliper_id", "permeameter_id"):
            if by in table.c and "plug_id" in table.c:
                plugs |= set(store.in_force(connection, kind, instruments, by=by)["plug_id"].tolist())
    return plugs


def file_digests(files: Collection[tuple[Path, str]]) -> dict[str, str]:
    return {shown: hashlib.sha256(path.read_bytes()).hexdigest() for path, shown in files}
