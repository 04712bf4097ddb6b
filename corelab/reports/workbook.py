"""The workbook that a partner receives for one well: results, their charts, methods and readings.

Everything is written as values: no cell holds a formula. Result columns are told by their names, so depth
may stand in metres or feet and porosity as a fraction or in percent.
"""

from __future__ import annotations

import math
import os
import textwrap
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from corelab.errors import Unavailable, Usage
from corelab.formats.safe_cells import margin_text, plain, put, visible
from corelab.quantities import RESULTS

if TYPE_CHECKING:
    import pandas as pd
    from openpyxl import Workbook
    from openpyxl.worksheet.worksheet import Worksheet


@dataclass(frozen=True, slots=True)
class TableSheet:
    """A sheet of tables: of each its title, what is said of it, and its rows."""

    title: str
    about: str
    parts: Sequence[tuple[str, str, pd.DataFrame]]


@dataclass(frozen=True, slots=True)
class WellReport:
    """What the workbook tells of one well, gathered by the caller.

    Parameters
    ----------
    well
        Its name.
    cover
        Label to value in the order of the cover sheet, shown as given.
    core_runs, shots
        One row a core run (run, top depth, base depth, cut, recovered, recovery, lost, loss at, notes), one
        row a gun run (gun run, tool, and counts of shots by outcome).
    results
        The result columns, one row a plug; `flags` is one text with "; " between flags.
    methods
        Of each calculation: key, version, title, equation, symbols, valid, source.
    provenance
        One row a reading that results rest on.
    cautions, remarks
        Sentences; cautions are also counted on the cover.
    recipient
        For whom; stands on every sheet where given.
    tables
        Further sheets, after the charts.
    """

    well: str
    cover: Mapping[str, str | float | None]
    core_runs: pd.DataFrame
    shots: pd.DataFrame
    results: pd.DataFrame
    methods: Sequence[Mapping[str, str]]
    provenance: pd.DataFrame
    cautions: Sequence[str]
    remarks: Sequence[str]
    recipient: str = ""
    tables: Sequence[TableSheet] = ()


INK, QUIET, ACCENT, PALE, FAINT, RULE = "26313A", "6B7075", "9C4A1F", "EFEBE0", "E3DDCE", "B9AF98"
#: Colours told apart by most eyes, also in grey print; each goes with a marker of its own.
SERIES = (
    ("2F6690", "circle"),
    ("C07F1F", "square"),
    ("4C7A34", "diamond"),
    ("8C3B5E", "triangle"),
    ("3E8E8A", "circle"),
    ("6A5340", "square"),
    ("7768AE", "diamond"),
)
#: Rows of the provenance that go on paper; hundreds of pages serve nobody.
PRINTED_ROWS = 25
LIKELY_CRUSHED = "percussion sidewall, crush likely"
AT_A_LIMIT = "permeability at a limit"
SET_SERIES = {
    "percussion sidewall": ("5A5A5A", "B3AEA2", "diamond"),
    "rotary sidewall": ("1F1F1F", "FFFFFF", "circle"),
    LIKELY_CRUSHED: ("A8321E", "E2765C", "diamond"),
    AT_A_LIMIT: ("5A5A5A", "E6CB4F", "triangle"),
}

PERMEABILITIES = ("gas permeability", "klinkenberg permeability", "liquid permeability")
CORE_COLUMNS = (
    "plug", "source", "laboratory", "run", "depth", "depth basis", "log depth", "orientation",
    "facies", "lithology", "porosity", "porosity route", "porosity stress", "grain density",
    "gas permeability", "gas", "mean pressure", "klinkenberg permeability", "slip basis",
    "permeability basis", "permeability stress", "oil saturation", "water saturation",
    "gas saturation", "status",
)  # fmt: skip
SIDEWALL_COLUMNS = (
    "plug", "tool", "laboratory", "depth", "depth basis", "log depth", "lithology", "facies",
    "porosity", "porosity route", "porosity stress", "grain density", "gas permeability", "gas",
    "klinkenberg permeability", "slip basis", "permeability basis", "permeability stress",
    "oil saturation", "water saturation", "gas saturation", "crush likelihood", "crush verdict",
    "status",
)  # fmt: skip
#: Said once above the table where every plug has the same.
SAID_ONCE = (
    "source", "laboratory", "depth basis", "porosity route", "porosity stress", "gas", "slip basis",
    "permeability basis", "permeability stress", "status",
)  # fmt: skip
CONTENTS = {
    "core and recovery": "core runs and sidewall shots: cut, recovered, lost",
    "routine results": "plugs cut from core",
    "sidewall results": "percussion and rotary sidewall plugs",
    "charts": "porosity and permeability against depth and against each other",
    "methods": "what was calculated, by which equation, from which source",
    "provenance": "the readings behind the results",
    "cautions and remarks": "what to bear in mind when the results are used",
    "chart data": "the points of the charts",
    "all results": "every result column in full precision, for loading elsewhere",
}


def write_workbook(path: Path, report: WellReport) -> None:
    """Write the workbook of `report` to `path`, which ends in .xlsx.

    Raises
    ------
    Usage
        The name does not end in .xlsx.
    Unavailable
        The file cannot be written there; one that stood there is unharmed.
    """
    path = Path(path)
    if path.suffix.lower() != ".xlsx":
        raise Usage(f"a workbook cannot be named '{path.name}': give a name that ends in .xlsx")
    book = _workbook(report)
    beside = path.with_name(f".{path.stem}.{os.getpid()}.part.xlsx")
    try:
        book.save(beside)
        os.replace(beside, path)
    except OSError as trouble:
        raise Unavailable(
            f"cannot write '{path}' ({trouble.strerror or trouble}): see that the folder exists and may be "
            "written to, and close the workbook if it is open in a spreadsheet program"
        ) from trouble
    finally:
        beside.unlink(missing_ok=True)


def _workbook(report: WellReport) -> Workbook:
    from openpyxl import Workbook

    book = Workbook()
    del book[book.sheetnames[0]]
    _add_styles(book)
    for title in ("cover", *_contents(report)):
        book.create_sheet(title)
    sidewall = _texts(report.results, "source").str.contains("sidewall", case=False)
    _cover(book["cover"], report)
    _recovery(book["core and recovery"], report)
    _results(book["routine results"], report, report.results[~sidewall], CORE_COLUMNS, "core plugs")
    _results(book["sidewall results"], report, report.results[sidewall], SIDEWALL_COLUMNS, "sidewall plugs")
    _charts(book["charts"], book["chart data"], report)
    for tables in report.tables:
        _table_sheet(book[tables.title], report, tables)
    _methods(book["methods"], report)
    _provenance(book["provenance"], report)
    _cautions(book["cautions and remarks"], report)
    _all_results(book["all results"], report)
    for sheet in book:
        _margins(sheet, report)
    book.properties.title = visible(f"Core analysis of well {report.well}")[:250]
    book.properties.creator = visible(str(report.cover.get("laboratory") or ""))[:250]
    return book


def _contents(report: WellReport) -> dict[str, str]:
    """The sheets after the cover, in order, and what each is about."""
    made: dict[str, str] = {}
    for title, about in CONTENTS.items():
        if title == "methods":
            made |= {tables.title: tables.about for tables in report.tables}
        made[title] = about
    return made


# --- columns by name -------------------------------------------------------------------------------------


def _name(heading: str) -> str:
    return str(heading).split(" [")[0].strip().lower()


def _unit(heading: str) -> str:
    return str(heading).partition(" [")[2].partition("]")[0]


def _column(frame: pd.DataFrame, name: str) -> str | None:
    """The heading in `frame` of the column called `name`, whatever its unit."""
    return next((heading for heading in frame.columns if _name(heading) == name), None)


def _texts(frame: pd.DataFrame, name: str) -> pd.Series:
    import pandas as pd

    heading = _column(frame, name)
    if heading is None:
        return pd.Series("", index=frame.index, dtype=object)
    return frame[heading].map(lambda value: "" if plain(value) is None else str(plain(value))).astype(object)


def _numbers(frame: pd.DataFrame, name: str) -> pd.Series:
    import numpy as np
    import pandas as pd

    heading = _column(frame, name)
    if heading is None:
        return pd.Series(np.nan, index=frame.index)
    numbers = pd.to_numeric(frame[heading], errors="coerce").astype(float)
    return numbers.where(np.isfinite(numbers))


def _flags(text: object) -> list[str]:
    """The flags in a text of flags, each once, in their order."""
    parts = (part.strip() for part in str(plain(text) or "").split(";"))
    # An empty cell says by itself that nothing was read.
    return list(dict.fromkeys(part for part in parts if part and not part.endswith(": no readings")))


def _of_significance(value: float, digits: int) -> str:
    """The number format that shows `value` to `digits` significant digits."""
    if value == 0 or not math.isfinite(value):
        return "0"
    exponent = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))
    decimals = max(digits - 1 - exponent, 0)
    if decimals > 6:
        return "0." + "0" * (digits - 1) + "E+00"
    return "0" + ("." + "0" * decimals if decimals else "")


def _number_format(heading: str, value: float) -> str:
    """How `value` under `heading` is shown: the quantity's decimals, permeability to three digits."""
    name, unit = _name(heading), _unit(heading)
    if name.startswith("u "):
        return _of_significance(value, 2)
    if name in PERMEABILITIES:
        return _of_significance(value, 3)
    if name in ("crush likelihood",):
        return "0.00"
    if name.endswith("stress"):
        return "0.0##"
    if "depth" in name or (name in ("cut", "recovered", "lost") and unit):
        return "0.00"
    if unit == "%":
        quantity = RESULTS.get(name)
        return "0." + "0" * max(quantity.decimals - 2, 1) if quantity else "0.0"
    if name in RESULTS and RESULTS[name].unit == unit:
        decimals = RESULTS[name].decimals
        return "0." + "0" * decimals if decimals else "0"
    return "General" if float(value).is_integer() else _of_significance(value, 4)


def _shown_in(headings: Sequence[str], row: int, column: int, value: float) -> str:
    return _number_format(headings[column], value)


# --- looks -----------------------------------------------------------------------------------------------


def _add_styles(book: Any) -> None:
    from openpyxl.styles import Alignment, Border, Font, NamedStyle, PatternFill, Side

    thin, hair = Side("thin", color=RULE), Side("thin", color=FAINT)
    fill = PatternFill("solid", fgColor=PALE)

    def style(
        name: str,
        size: float = 10,
        bold: bool = False,
        colour: str = INK,
        horizontal: str | None = None,
        wrap: bool = True,
        border: Border | None = None,
        filled: bool = False,
        vertical: str = "top",
        indent: int = 0,
    ) -> None:
        made = NamedStyle(f"report {name}")
        made.font = Font(name="Arial", size=size, bold=bold, color=colour)
        made.alignment = Alignment(horizontal=horizontal, vertical=vertical, wrap_text=wrap, indent=indent)
        if border:
            made.border = border
        if filled:
            made.fill = fill
        book.add_named_style(made)

    book._named_styles["Normal"].font = Font(name="Arial", size=10, color=INK)  # sets the unit of widths
    style("title", 18, True, wrap=False, vertical="center")
    style("subtitle", 10, colour=QUIET, wrap=False, vertical="center")
    style("section", 12, True, ACCENT, wrap=False, vertical="center")
    style("paragraph")
    style("quiet", colour=QUIET)
    style("numeral", colour=QUIET, horizontal="right", indent=1)
    style("link", colour=ACCENT, wrap=False)
    style(
        "heading",
        10,
        True,
        horizontal="center",
        vertical="center",
        filled=True,
        border=Border(top=thin, bottom=thin),
    )
    style("cell", horizontal="left", indent=1, border=Border(bottom=hair))
    style("unwrapped", horizontal="left", indent=1, wrap=False, border=Border(bottom=hair))
    style("number", horizontal="right", wrap=False, border=Border(bottom=hair))
    style("centred", horizontal="center", border=Border(bottom=hair))
    style("warning", bold=True, colour=ACCENT, horizontal="left", indent=1, border=Border(bottom=hair))
    style("total", bold=True, horizontal="left", indent=1, filled=True, border=Border(top=thin, bottom=thin))
    style(
        "total number",
        bold=True,
        horizontal="right",
        wrap=False,
        filled=True,
        border=Border(top=thin, bottom=thin),
    )
    style("label", colour=QUIET, border=Border(bottom=hair))
    style("value", horizontal="left", border=Border(bottom=hair))
    style("well", 26, True, wrap=True, vertical="center")


def _write(
    sheet: Worksheet, row: int, column: int, value: object, style: str, number_format: str = ""
) -> None:
    cell: Any = sheet.cell(row, column)
    cell.style = f"report {style}"
    put(cell, value, number_format)


def _lines(text: str, width: float) -> int:
    """How many lines `text` takes in `width` characters, rather too many than too few."""
    room = max(int(1.05 * width), 1)
    return sum(1 if len(line) <= room else len(textwrap.wrap(line, room)) for line in text.split("\n"))


def _width(sheet: Worksheet, first: int, last: int) -> float:
    from openpyxl.utils import get_column_letter as letter

    return sum(sheet.column_dimensions[letter(c)].width for c in range(first, last + 1))


def _paragraph(
    sheet: Worksheet, row: int, text: str, last: int, style: str = "paragraph", first: int = 1
) -> int:
    """Write `text` across the columns, as high as it needs; returns the next row."""
    _write(sheet, row, first, text, style)
    if last > first:
        sheet.merge_cells(start_row=row, end_row=row, start_column=first, end_column=last)
    height = 14.0 * _lines(text, _width(sheet, first, last)) + 2
    sheet.row_dimensions[row].height = min(400.0, max(height, sheet.row_dimensions[row].height or 0))
    return row + 1


def _opening(sheet: Worksheet, report: WellReport, title: str) -> None:
    _write(sheet, 1, 1, title, "title")
    sheet.row_dimensions[1].height = 27
    job = plain(report.cover.get("job"))
    told = [f"Well {report.well}", f"job {job}" if job is not None else "", _for(report)]
    _write(sheet, 2, 1, " · ".join(part for part in told if part), "subtitle")


def _for(report: WellReport) -> str:
    return f"for {report.recipient}" if report.recipient.strip() else ""


def _set_widths(sheet: Worksheet, widths: Iterable[float]) -> None:
    from openpyxl.utils import get_column_letter as letter

    for column, width in enumerate(widths, 1):
        known = (
            sheet.column_dimensions[letter(column)].width if letter(column) in sheet.column_dimensions else 0
        )
        sheet.column_dimensions[letter(column)].width = max(width, known)


def _fitting_width(heading: str, texts: Iterable[str], most: float = 26) -> float:
    """A width in characters that holds the longest word of the heading and most of the texts."""
    words = max((len(word) for word in str(heading).split()), default=1)
    longest = max((len(text) for text in texts), default=1)
    return min(max(1.15 * words + 2, 1.05 * longest + 2, 7), most)


def _table(
    sheet: Worksheet,
    row: int,
    headings: Sequence[str],
    rows: Sequence[Sequence[object]],
    number_format: Callable[[int, int, float], str] = lambda row, column, value: "General",
    style: Callable[[int, int], str | None] = lambda row, column: None,
    most: float = 26,
    wrap: bool = True,
) -> int:
    """Write headings and rows from `row` on, widen the columns to fit; returns the row after the last."""
    shown = [[plain(value) for value in line] for line in rows]
    columns = list(zip(*shown, strict=True)) if shown else [()] * len(headings)
    _set_widths(
        sheet,
        (
            _fitting_width(heading, (_as_wide(v) for v in column if v is not None), most)
            for heading, column in zip(headings, columns, strict=True)
        ),
    )
    widths = [_width(sheet, column, column) for column in range(1, len(headings) + 1)]
    for column, heading in enumerate(headings, 1):
        _write(sheet, row, column, heading, "heading")
    most_lines = max((_lines(str(h), w - 1) for h, w in zip(headings, widths, strict=True)), default=1)
    sheet.row_dimensions[row].height = 14.0 * max(most_lines, 2) + 4
    for number, line in enumerate(shown):
        row += 1
        for column, value in enumerate(line):
            number_shown = value if isinstance(value, (int, float)) else None
            look = (
                "number"
                if number_shown is not None
                else style(number, column) or ("cell" if wrap else "unwrapped")
            )
            code = "" if number_shown is None else number_format(number, column, number_shown)
            _write(sheet, row, column + 1, value, look, code)
        texts = ((v, w) for v, w in zip(line, widths, strict=True) if isinstance(v, str) and wrap)
        if (lines := max((_lines(text, width - 1) for text, width in texts), default=1)) > 1:
            sheet.row_dimensions[row].height = min(400.0, 14.0 * lines + 2)
    return row + 1


def _as_wide(value: object) -> str:
    """A text about as wide as `value` is shown."""
    return "9" * 7 if isinstance(value, float) else str(value)


def _freeze(sheet: Worksheet, row: int, columns: int, last: int, frozen: int = 1) -> None:
    """Keep the heading in `row` in sight and on each printed page, and offer filters down to row `last`."""
    from openpyxl.utils import get_column_letter as letter

    sheet.freeze_panes = f"{letter(frozen + 1)}{row + 1}"
    sheet.print_title_rows = f"{row}:{row}"
    sheet.auto_filter.ref = f"A{row}:{letter(columns)}{last}"


def _margins(sheet: Any, report: WellReport) -> None:
    from openpyxl.worksheet.properties import PageSetupProperties

    wide = sheet.title not in ("cover", "cautions and remarks")
    sheet.sheet_view.showGridLines = False
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    sheet.page_setup.orientation = "landscape" if wide else "portrait"
    sheet.page_setup.paperSize = sheet.PAPERSIZE_A4
    sheet.page_setup.fitToWidth = 2 if sheet.title == "all results" else 1
    sheet.page_setup.fitToHeight = 1 if sheet.title == "cover" else 0
    sheet.print_options.horizontalCentered = sheet.title == "charts"
    margins = sheet.page_margins
    margins.left = margins.right = 0.5
    margins.top = margins.bottom = 0.75
    margins.header = margins.footer = 0.35
    seal = "".join(str(plain(report.cover.get("seal")) or "").split())
    sheet.oddHeader.left.text = "well " + margin_text(report.well)
    sheet.oddHeader.right.text = margin_text(_for(report)) or None
    sheet.oddFooter.left.text = (
        "seal " + margin_text(seal[:16] + ("…" if seal[16:] else "")) if seal else None
    )
    sheet.oddFooter.center.text = sheet.title
    sheet.oddFooter.right.text = "page &P of &N"
    for part in (sheet.oddHeader, sheet.oddFooter):
        for place in (part.left, part.center, part.right):
            place.size, place.color = 8, QUIET


# --- sheets ----------------------------------------------------------------------------------------------


def _cover(sheet: Worksheet, report: WellReport) -> None:
    from openpyxl.styles import PatternFill
    from openpyxl.worksheet.hyperlink import Hyperlink

    _set_widths(sheet, (28, 66))
    for row, height in ((1, 8.0), (5, 8.0)):
        sheet.row_dimensions[row].height = height
    _paragraph(sheet, 2, "Results of core analysis", 2, "section")
    _paragraph(sheet, 3, report.well, 2, "well")
    sheet.row_dimensions[3].height = 36.0 * _lines(report.well, 36)
    subtitle = f"Prepared {_for(report)}" if _for(report) else "Prepared for the partners of the well"
    _paragraph(sheet, 4, subtitle, 2, "quiet")
    band = PatternFill("solid", fgColor=PALE)
    for row in range(1, 6):
        for column in (1, 2):
            sheet.cell(row, column).fill = band
    row = 7
    for label, value in report.cover.items():
        known = plain(value) is not None
        _write(sheet, row, 1, label, "label")
        _write(sheet, row, 2, value if known else "not stated", "value" if known else "label")
        sheet.row_dimensions[row].height = min(
            400.0, 14.0 * max(_lines(str(label), 28), _lines(str(value), 66)) + 2
        )
        row += 1

    row = _paragraph(sheet, row + 1, "Cautions", 2, "section")
    many = len(report.cautions)
    if many:
        told = f"{many} caution{'s' if many > 1 else ''}; in full on the sheet 'cautions and remarks'."
        row = _paragraph(sheet, row, told, 2)
    else:
        row = _paragraph(sheet, row, "None was raised.", 2)

    row = _paragraph(sheet, row + 1, "Contents", 2, "section")
    for title, about in _contents(report).items():
        _write(sheet, row, 1, title, "link")
        cell = sheet.cell(row, 1)
        cell.hyperlink = Hyperlink(ref=cell.coordinate, location=f"'{title}'!A1", tooltip=f"go to {title}")
        _write(sheet, row, 2, about, "paragraph")
        row += 1
    sheet.print_area = f"A1:B{row - 1}"


def _recovery(sheet: Worksheet, report: WellReport) -> None:
    _opening(sheet, report, "Core and recovery")
    tables: list[tuple[str, str, pd.DataFrame, list[object] | None]] = []
    runs, shots = report.core_runs, report.shots
    cut, recovered, lost = (_numbers(runs, name) for name in ("cut", "recovered", "lost"))
    both = cut.notna() & recovered.notna()
    percent = 100 * recovered[both].sum() / cut[both].sum() if cut[both].sum() > 0 else None
    sums = {
        "run": "all runs",
        "cut": _sum(cut),
        "recovered": _sum(recovered),
        "lost": _sum(lost),
        "recovery": percent,
    }
    tables.append(("Core runs", "No core was cut.", runs, [sums.get(_name(h)) for h in runs.columns]))
    totals: list[object] = [
        "all gun runs" if h == "gun run" else None if h == "tool" or "[" in h else _sum(_numbers(shots, h))
        for h in shots.columns
    ]
    tables.append(("Sidewall shots", "No sidewall sample was tried.", shots, totals))
    widest = max(len(runs.columns), len(shots.columns), 8)
    for _, _, frame, _ in tables:
        _set_widths(sheet, (_fitting_width(h, map(_as_wide, frame[h].tolist())) for h in frame.columns))
    _set_widths(sheet, (15,))
    row = 4
    for title, none, frame, total in tables:
        row = _paragraph(sheet, row, title, widest, "section")
        if frame.empty:
            row = _paragraph(sheet, row, none, widest) + 1
            continue
        headings = [str(heading) for heading in frame.columns]
        row = _table(sheet, row, headings, _rows(frame), partial(_shown_in, headings))
        for column, value in enumerate(total or (), 1):
            number = float(value) if isinstance(value, (int, float)) else 0.0
            style = "total" if isinstance(value, str) else "total number"
            _write(sheet, row, column, value, style, _number_format(headings[column - 1], number))
        row += 2
    note = (
        "Recovery is recovered length over cut length; in the total, over the runs that have both. "
        "A recovery above 100 % is reported as measured."
    )
    if not runs.empty:
        _paragraph(sheet, row, note, widest, "quiet")


def _sum(numbers: pd.Series) -> float | None:
    return float(numbers.sum()) if numbers.notna().any() else None


def _rows(frame: pd.DataFrame) -> list[list[object]]:
    """The rows of a frame as plain Python values, without loss of kinds between columns."""
    return [list(row) for row in zip(*(frame[heading].tolist() for heading in frame.columns), strict=True)]


def _results(
    sheet: Worksheet, report: WellReport, plugs: pd.DataFrame, order: Sequence[str], what: str
) -> None:
    """One table of plugs, its flags as numbered notes beneath it."""
    _opening(sheet, report, sheet.title.capitalize())
    if plugs.empty:
        _set_widths(sheet, (90,))
        _paragraph(sheet, 4, f"No results of {what} belong to this report.", 1)
        return
    if "tool" in order:
        plugs = plugs.assign(
            tool=_texts(plugs, "source").str.replace(r"\s*sidewall.*", "", regex=True, case=False)
        )
    chosen: list[str] = []
    once: list[str] = []
    for name in order:
        heading = _column(plugs, name)
        if heading is None:
            continue
        every = {plain(value) for value in plugs[heading]}
        held = every - {None}
        if name in SAID_ONCE and len(held) == 1 and every == held:
            (value,) = held
            unit = _unit(heading)
            once.append(
                f"{name} {f'{value:g}' if isinstance(value, float) else value}{f' {unit}' if unit else ''}"
            )
        elif held or name in ("plug", "depth", "porosity", "klinkenberg permeability"):
            chosen += [heading, *(h for h in plugs.columns if str(h) == f"u {heading}")]
    flags = [_flags(text) for text in _texts(plugs, "flags")]
    numbers = {flag: n for n, flag in enumerate(dict.fromkeys(f for row in flags for f in row), 1)}
    notes = [", ".join(str(n) for n in sorted(numbers[f] for f in row)) or None for row in flags]
    headings = [*map(str, chosen), "notes"]
    rows = [[*row, note] for row, note in zip(_rows(plugs[chosen]), notes, strict=True)]

    def number_format(row: int, column: int, value: float) -> str:
        code = _number_format(headings[column], value)
        for sign, limit in (("<", "below"), (">", "above")):
            if f"{_name(headings[column])} {limit} limit" in flags[row]:
                return f'"{sign} "{code}'
        return code

    def style(row: int, column: int) -> str | None:
        if headings[column] == "crush verdict" and rows[row][column] == "likely":
            return "warning"
        return "centred" if headings[column] in ("notes", "orientation") else None

    top = 5
    after = _table(sheet, top, headings, rows, number_format, style)
    last = len(headings)
    _freeze(sheet, top, last, after - 1)
    told = f"{len(rows)} {what if len(rows) > 1 else what[:-1]}."
    if once:
        told += f" The same for every value here: {'; '.join(once)}."
    _paragraph(sheet, 3, told, last)
    row = _paragraph(sheet, after + 1, "Notes", last, "section")
    if not numbers:
        row = _paragraph(sheet, row, "No value of this table is flagged.", last)
    for flag, number in numbers.items():
        _write(sheet, row, 1, number, "numeral")
        row = _paragraph(sheet, row, flag, last, first=2)
    row += 1
    _paragraph(
        sheet,
        row,
        "An empty cell means that there is no result; the plug's notes say why. < or > before a number: the "
        "value lies below or above this limit. The sheet 'all results' has every column, volumes too, "
        "in full precision.",
        last,
        "quiet",
    )


def _table_sheet(sheet: Worksheet, report: WellReport, tables: TableSheet) -> None:
    _opening(sheet, report, tables.title.capitalize())
    widest = max((len(frame.columns) for _, _, frame in tables.parts), default=1)
    _set_widths(sheet, [11.0] * max(widest, 8))
    row = 4
    for title, told, frame in tables.parts:
        row = _paragraph(sheet, row, title, max(widest, 8), "section")
        if told:
            row = _paragraph(sheet, row, told, max(widest, 8))
        if len(frame):
            headings = [str(heading) for heading in frame.columns]
            row = _table(sheet, row, headings, _rows(frame), partial(_shown_in, headings), most=40)
        row += 1


def _methods(sheet: Worksheet, report: WellReport) -> None:
    _opening(sheet, report, "Methods")
    columns = {"key": 17, "version": 9, "title": 22, "equation": 30, "symbols": 32, "valid": 22, "source": 30}
    _set_widths(sheet, columns.values())
    last = len(columns)
    if not report.methods:
        _paragraph(sheet, 4, "No calculation stands behind this report.", last)
        return
    _paragraph(
        sheet,
        3,
        "The calculations behind the results. A key never changes its meaning; changed numbers mean a higher "
        "version.",
        last,
    )
    rows = [[method.get(name) for name in columns] for method in report.methods]
    after = _table(sheet, 5, list(columns), rows, most=9)
    _freeze(sheet, 5, last, after - 1)


def _provenance(sheet: Worksheet, report: WellReport) -> None:
    from openpyxl.utils import get_column_letter as letter

    _opening(sheet, report, "Provenance")
    frame = report.provenance
    if frame.empty:
        _set_widths(sheet, (90,))
        _paragraph(sheet, 4, "No reading stands behind this report.", 1)
        return
    headings = [str(heading) for heading in frame.columns]
    after = _table(sheet, 5, headings, _rows(frame), most=44)
    _freeze(sheet, 5, len(headings), after - 1)
    _paragraph(
        sheet,
        3,
        "The readings in force when this was written, each as it was entered, with the file, sheet and row "
        f"it came from. The sheet holds them all; of {len(frame)} rows the first {PRINTED_ROWS} print.",
        len(headings),
    )
    last = min(after - 1, 5 + PRINTED_ROWS)
    sheet.print_area = f"A1:{letter(len(headings))}{last}"


def _cautions(sheet: Worksheet, report: WellReport) -> None:
    _opening(sheet, report, "Cautions and remarks")
    _set_widths(sheet, (5, 90))
    row = 4
    for title, none, sentences in (
        ("Cautions", "None was raised.", report.cautions),
        ("Remarks", "None.", report.remarks),
    ):
        row = _paragraph(sheet, row, title, 2, "section")
        if not sentences:
            row = _paragraph(sheet, row, none, 2)
        for number, sentence in enumerate(sentences, 1):
            _write(sheet, row, 1, number, "numeral")
            row = _paragraph(sheet, row, sentence, 2, first=2)
        row += 1


def _all_results(sheet: Worksheet, report: WellReport) -> None:
    """A plain table, headings in the first row, so that a program can load it."""
    from openpyxl.utils import get_column_letter as letter

    headings = [str(heading) for heading in report.results.columns]
    if not headings:
        _set_widths(sheet, (90,))
        _paragraph(sheet, 1, "There are no results.", 1)
        return
    after = _table(
        sheet,
        1,
        headings,
        _rows(report.results),
        partial(_shown_in, headings),
        most=40,
        wrap=False,
    )
    frozen = headings.index("plug") + 1 if "plug" in headings[:3] else 1
    _freeze(sheet, 1, len(headings), max(after - 1, 1), frozen)
    sheet.print_title_cols = f"A:{letter(frozen)}"


# --- charts ----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Axis:
    """One quantity of the charts: its values per plug, and how its axis is drawn."""

    name: str
    label: str
    logarithmic: bool = False
    downwards: bool = False


def _points(report: WellReport) -> tuple[pd.DataFrame, dict[str, _Axis], list[str]]:
    """The plugs as points with the name of their series, their axes, and what has to be said of them."""
    import pandas as pd

    plugs = report.results
    permeability = next(
        (name for name in PERMEABILITIES[1::-1] if _numbers(plugs, name).notna().any()), PERMEABILITIES[1]
    )
    depth, basis = "depth", _texts(plugs, "depth basis")
    bases = sorted(set(basis[_numbers(plugs, "depth").notna()]) - {""})
    said: list[str] = []
    if len(bases) > 1:
        on_log = _numbers(plugs, "log depth").notna() | _numbers(plugs, "depth").isna()
        if on_log.all():
            depth = "log depth"
            said.append("Depths are log depths, since the plugs' own depths are on more than one basis.")
        else:
            said.append(
                f"Depths are on more than one basis ({' and '.join(bases)}): they do not compare closely."
            )
            bases = ["mixed bases"]
    source, facies = _texts(plugs, "source"), _texts(plugs, "facies").str.strip()
    sidewall = source.str.contains("sidewall", case=False)
    kinds = sorted(set(facies[~sidewall]) - {""})
    if 1 <= len(kinds) <= len(SERIES) - 1:
        series = facies.where(facies != "", "core, no facies given").where(~sidewall, source)
        said.append(
            "Plugs from core are told apart by facies"
            + ("; sidewall plugs by tool." if sidewall.any() else ".")
        )
    else:
        series = source.where(source != "", "plugs")
        said.append("Plugs are told apart by source.")
    likely = (_texts(plugs, "crush verdict") == "likely") & source.str.contains("percussion", case=False)
    limited = _texts(plugs, "flags").map(
        lambda text: any(f"{permeability} {side} limit" in _flags(text) for side in ("below", "above"))
    )
    table = pd.DataFrame(
        {
            "series": series.where(~likely, LIKELY_CRUSHED),
            "plug": _texts(plugs, "plug"),
            "depth": _numbers(plugs, depth),
            "porosity": _numbers(plugs, "porosity"),
            "permeability": _numbers(plugs, permeability),
            "limited": limited.astype(bool),
        }
    )
    not_positive = int((table["permeability"] <= 0).sum())
    table["permeability"] = table["permeability"].where(table["permeability"] > 0)
    for name in ("porosity", "permeability", "depth"):
        if missing := int(table[name].isna().sum()):
            said.append(f"{missing} of {len(table)} plugs have no {name} to draw.")
    if not_positive:
        said.append(
            f"{not_positive} of them have a permeability of zero or less, which a log axis cannot hold."
        )
    if limited.any():
        said.append("Permeabilities known only as a limit are drawn at the limit, as yellow triangles.")
    units = {name: _unit(_column(plugs, name) or "") for name in (depth, "porosity", permeability)}
    axes = {
        "depth": _Axis(
            "depth",
            f"{depth} [{units[depth]}]" + (f" ({bases[0]})" if bases and depth == "depth" else ""),
            downwards=True,
        ),
        "porosity": _Axis("porosity", f"porosity [{units['porosity']}]"),
        "permeability": _Axis("permeability", f"{permeability} [{units[permeability]}]", logarithmic=True),
    }
    return table, axes, said


def _charts(sheet: Worksheet, data: Worksheet, report: WellReport) -> None:
    from openpyxl.worksheet.pagebreak import Break

    table, axes, said = _points(report)
    _opening(sheet, report, "Charts")
    _opening(data, report, "Chart data")
    _set_widths(sheet, [9.5] * 16)
    sheet.sheet_format.defaultRowHeight, sheet.sheet_format.customHeight = 15, True
    plans = (
        ("Porosity against depth", "porosity", "depth", "A5", (14.2, 14.2)),
        ("Permeability against depth", "permeability", "depth", "I5", (14.2, 14.2)),
        ("Permeability against porosity", "porosity", "permeability", "A33", (29.0, 16.0)),
    )
    drawn, next_column = 0, 1
    for title, across, up, place, size in plans:
        points = table.dropna(subset=[across, up])
        if "permeability" in (across, up):
            points = points.assign(series=points["series"].where(~points["limited"], AT_A_LIMIT))
        if points.empty:
            continue
        chart = _chart(data, next_column, title, axes[across], axes[up], points)
        chart.width, chart.height = size
        sheet.add_chart(chart, place)
        drawn, next_column = drawn + 1, next_column + 5
    data.freeze_panes = "A6"
    data.print_title_rows = "4:5"
    text = " ".join(said) if drawn else "There is no plug with two values to draw against each other."
    _paragraph(sheet, 3, text, 16)
    if not drawn:
        _set_widths(data, (90,))
        _paragraph(data, 4, "No chart was drawn.", 1)
        return
    sheet.row_breaks.append(Break(id=32))
    sheet.print_area = "A1:P64"


def _chart(data: Worksheet, column: int, title: str, across: _Axis, up: _Axis, points: pd.DataFrame) -> Any:
    """Write the points to four columns of `data` from `column` on and draw them: a block of rows a series."""
    from openpyxl.chart import Reference, ScatterChart, Series
    from openpyxl.chart.data_source import StrRef
    from openpyxl.chart.series import SeriesLabel
    from openpyxl.chart.shapes import GraphicalProperties
    from openpyxl.utils import get_column_letter as letter

    chart: Any = ScatterChart(scatterStyle="lineMarker")
    chart.title = title
    chart.title.overlay = False
    _letters(chart.title, 1300, True)
    chart.legend.position = "b"
    chart.legend.overlay = False
    chart.roundedCorners = False
    chart.graphical_properties = GraphicalProperties(solidFill="FFFFFF")
    chart.graphical_properties.line.solidFill = RULE
    _write(data, 4, column, title, "section")
    for offset, heading in enumerate(("series", "plug", across.label, up.label)):
        _write(data, 5, column + offset, heading, "heading")
        width = (32, 10, 14, 14)[offset]
        data.column_dimensions[letter(column + offset)].width = width
    data.column_dimensions[letter(column + 4)].width = 3
    data.row_dimensions[5].height = 46
    names = list(dict.fromkeys(sorted(points["series"])))
    names.sort(key=lambda name: list(SET_SERIES).index(name) if name in SET_SERIES else -1)
    row, plain_series = 6, 0
    for name in names:
        block = points[points["series"] == name].sort_values("depth", kind="stable")
        first = row
        for plug, x, y in zip(block["plug"], block[across.name], block[up.name], strict=True):
            for offset, value in enumerate((name, plug, x, y)):
                axis = (None, None, across, up)[offset]
                code = _number_format(axis.label, float(value)) if axis else ""
                _write(data, row, column + offset, value, "number" if axis else "cell", code)
            row += 1
        series = Series(
            Reference(data, min_col=column + 3, min_row=first, max_row=row - 1),
            Reference(data, min_col=column + 2, min_row=first, max_row=row - 1),
        )
        series.tx = SeriesLabel(strRef=StrRef(f"'{data.title}'!${letter(column)}${first}"))
        colour, symbol = SERIES[plain_series % len(SERIES)]
        filling = colour
        if name in SET_SERIES:
            colour, filling, symbol = SET_SERIES[name]
        else:
            plain_series += 1
        series.marker.symbol, series.marker.size = symbol, 7
        series.marker.graphicalProperties = GraphicalProperties(solidFill=filling)
        series.marker.graphicalProperties.line.solidFill = colour
        series.graphicalProperties = GraphicalProperties()
        series.graphicalProperties.line.noFill = True
        series.smooth = False
        chart.series.append(series)
    chart.x_axis.axPos = "t" if up.downwards else "b"
    for drawn, axis in ((chart.x_axis, across), (chart.y_axis, up)):
        _draw_axis(drawn, axis, points[axis.name])
    return chart


def _draw_axis(drawn: Any, axis: _Axis, values: pd.Series) -> None:
    from openpyxl.chart.axis import ChartLines
    from openpyxl.chart.shapes import GraphicalProperties

    low, high = float(values.min()), float(values.max())
    drawn.delete = False
    drawn.title = axis.label
    drawn.title.overlay = False
    _letters(drawn.title, 1000, True)
    drawn.tickLblPos = "nextTo"
    drawn.majorTickMark = "out"
    drawn.crosses = "min"
    drawn.majorGridlines = ChartLines(spPr=_line("D9D3C5"))
    drawn.graphicalProperties = GraphicalProperties()
    drawn.graphicalProperties.line.solidFill = QUIET
    drawn.number_format = "General"
    if axis.logarithmic:
        bottom, top = math.floor(math.log10(low)), math.ceil(math.log10(high))
        drawn.scaling.logBase = 10
        drawn.scaling.min, drawn.scaling.max = 10.0**bottom, 10.0 ** max(top, bottom + 1)
        drawn.minorGridlines = ChartLines(spPr=_line("EFEBE0"))
        return
    step = _step(high - low or abs(high) or 1.0)
    bottom, top = math.floor(low / step), math.ceil(high / step)
    if axis.name == "porosity":
        bottom = min(bottom, 0)
    top += top == bottom
    drawn.scaling.min, drawn.scaling.max = round(bottom * step, 9), round(top * step, 9)
    drawn.majorUnit = step
    if axis.downwards:
        drawn.scaling.orientation = "maxMin"
    else:
        drawn.number_format = "0.00" if step < 0.1 else "0.0" if step < 1 else "0"


def _step(span: float) -> float:
    """A round step that divides `span` into about six parts."""
    power = 10.0 ** math.floor(math.log10(span / 6))
    return float(next(power * part for part in (1, 2, 5, 10) if power * part >= span / 6 * 0.999))


def _line(colour: str) -> Any:
    from openpyxl.chart.shapes import GraphicalProperties

    properties = GraphicalProperties()
    properties.line.solidFill = colour
    properties.line.width = 6350
    return properties


def _letters(title: Any, size: int, bold: bool) -> None:
    """Letters of a chart's title in hundredths of a point, and nothing in it that XML cannot hold."""
    from openpyxl.drawing.text import CharacterProperties

    for paragraph in title.tx.rich.paragraphs:
        for run in paragraph.r:
            run.t = visible(run.t)
            run.rPr = CharacterProperties(sz=size, b=bold, solidFill=INK)
