"""Reading workbooks, most of them broken on purpose.

Source: ECMA-376, Office Open XML file formats, part 1: the elements c and numFmt, the type ST_Xstring (from
memory). The two epochs, and the limits of rows and columns: common practice.
"""

import io
import random
import shutil
import subprocess
import time as clock
import unicodedata
import warnings
import zipfile
from datetime import date, datetime, time
from pathlib import Path
from xml.sax.saxutils import quoteattr

import openpyxl
import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from corelab.errors import Problem
from corelab.formats import workbook_in
from corelab.formats.table import Bad, Percent, Table
from corelab.formats.workbook_in import DATE, ELAPSED, PERCENT, PLAIN, TIME, format_kind, read_workbook

SOON = settings(max_examples=60, deadline=3000, suppress_health_check=[HealthCheck.function_scoped_fixture])

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
LINK = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
STRICT = "http://purl.oclc.org/ooxml/spreadsheetml/main"
STRICT_LINK = "http://purl.oclc.org/ooxml/officeDocument/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
HEADINGS = '<row r="1"><c r="A1" t="str"><v>plug</v></c><c r="B1" t="str"><v>mass [g]</v></c></row>'


def links(*targets: tuple[str, str], link: str = LINK) -> str:
    inner = "".join(
        f'<Relationship Id="r{number}" Type="{link}/{kind}" Target={quoteattr(target)}/>'
        for number, (kind, target) in enumerate(targets, 1)
    )
    return f'<Relationships xmlns="{PACKAGE}">{inner}</Relationships>'


def parts(
    rows: str = "",
    *,
    after: str = "",
    before: str = "",
    formats: tuple[int | str, ...] = (),
    texts: str | None = None,
    book: str = "",
    tab: str = 'name="masses"',
    main: str = MAIN,
    link: str = LINK,
) -> dict[str, str | bytes]:
    """The parts of a workbook of one tab; `formats` are those of the styles 1, 2 …."""
    codes = [f for f in formats if isinstance(f, str)]
    ids = [f if isinstance(f, int) else 164 + codes.index(f) for f in formats]
    styles = (
        f'<styleSheet xmlns="{main}"><numFmts>'
        + "".join(f'<numFmt numFmtId="{164 + n}" formatCode={quoteattr(c)}/>' for n, c in enumerate(codes))
        + '</numFmts><cellStyleXfs><xf numFmtId="9"/></cellStyleXfs><cellXfs><xf numFmtId="0"/>'
        + "".join(f'<xf numFmtId="{i}"/>' for i in ids)
        + "</cellXfs></styleSheet>"
    )
    targets = [("worksheet", "worksheets/sheet1.xml"), ("styles", "/xl/styles.xml")]
    made: dict[str, str | bytes] = {
        "_rels/.rels": links(("officeDocument", "xl/workbook.xml"), link=link),
        "xl/workbook.xml": f'<workbook xmlns="{main}" xmlns:q="{link}">{book}<sheets><sheet {tab} sheetId="1"'
        ' q:id="r1"/></sheets></workbook>',
        "xl/styles.xml": styles,
        "xl/worksheets/sheet1.xml": f'<x:worksheet xmlns:x="{main}" xmlns="{main}">{before}'
        f"<sheetData>{rows}</sheetData>{after}</x:worksheet>",
    }
    if texts is not None:
        targets.append(("sharedStrings", "sharedStrings.xml"))
        made["xl/sharedStrings.xml"] = f'<sst xmlns="{main}">{texts}</sst>'
    made["xl/_rels/workbook.xml.rels"] = links(*targets, link=link)
    return made


def packed(members: dict[str, str | bytes]) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in members.items():
            archive.writestr(name, data)
    return stream.getvalue()


def read(tmp_path: Path, data: bytes | dict[str, str | bytes], select=lambda name: True):
    path = tmp_path / "bench.xlsx"
    path.write_bytes(packed(data) if isinstance(data, dict) else data)
    return read_workbook(path, "in/bench.xlsx", select)


def one(tmp_path: Path, data: bytes | dict[str, str | bytes]) -> Table:
    tables, problems, others = read(tmp_path, data)
    assert problems == []
    assert others == []
    assert len(tables) == 1
    return tables[0]


def refusal(tmp_path: Path, data: bytes | dict[str, str | bytes]) -> Problem:
    _, problems, _ = read(tmp_path, data)
    assert len(problems) == 1, problems
    problem = problems[0]
    assert problem.file == "in/bench.xlsx"
    assert problem.wanted
    assert problem.action
    return problem


def cell(tmp_path: Path, xml: str, **rest):
    """The value of a cell written as `xml` under the heading in A1."""
    rows = f'<row r="1"><c r="A1" t="str"><v>x</v></c></row><row r="2">{xml}</row>'
    table = one(tmp_path, parts(rows, **rest))
    return table.columns[0][0] if table.rows else None


# What is read


@pytest.mark.parametrize(("main", "link"), [(MAIN, LINK), (STRICT, STRICT_LINK)])
def test_a_plain_sheet(tmp_path, main, link):
    rows = (
        '<row r="3"><c r="B3" t="s"><v>0</v></c><c r="D3" t="s"><v>1</v></c></row>'
        '<row r="4"><c r="B4" s="0"/><c r="D4" t="str"><v> </v></c></row>'
        '<row r="6"><c r="B6" t="s"><v>2</v></c><c r="D6"><v>12.5</v></c></row>'
        '<row r="9"><c r="D9"><v>1E2</v></c></row>'
    )
    texts = "<si><t>plug</t></si><si><t> dry\u00a0mass [g] </t></si><si><t>007</t></si>"
    table = one(tmp_path, parts(rows, texts=texts, main=main, link=link))
    assert (table.file, table.sheet, table.hidden, table.notes) == ("in/bench.xlsx", "masses", False, [])
    assert table.headings == ["plug", "dry mass [g]"]
    assert table.letters == ["B", "D"]
    assert table.rows == [6, 9]
    assert table.columns == [["007", None], [12.5, 100]]


def test_places_may_be_left_out(tmp_path):
    rows = (
        '<row><c t="str"><v>a</v></c><c r="C1" t="str"><v>b</v></c><c t="str"><v>c</v></c></row>'
        '<row/><row r="5"/><row><c><v>1</v></c><c r="C6"><v>2</v></c><c><v>3</v></c></row>'
    )
    table = one(tmp_path, parts(rows))
    assert table.letters == ["A", "C", "D"]
    assert table.rows == [6]
    assert table.columns == [[1], [2], [3]]


@pytest.mark.parametrize(
    ("xml", "value"),
    [
        ('<c r="A2"><v>5</v></c>', 5),
        ('<c r="A2" t="n"><v>-0.10</v></c>', -0.1),
        ('<c r="A2"><v>1e300</v></c>', 1e300),
        ('<c r="A2" t="b"><v>1</v></c>', True),
        ('<c r="A2" t="b"><v>0</v></c>', False),
        ('<c r="A2" t="str"><f>B1</f><v>NA</v></c>', "NA"),
        ('<c r="A2" t="str"><f>B1</f><v></v></c>', None),
        ('<c r="A2"><f>1+1</f><v>2</v></c>', 2),
        ('<c r="A2" t="d"><v>2026-03-14</v></c>', date(2026, 3, 14)),
        ('<c r="A2" t="d"><v>2026-03-14T09:30:00Z</v></c>', datetime(2026, 3, 14, 9, 30)),
        ('<c r="A2" t="d"><v>T09:30:00</v></c>', time(9, 30)),
        ('<c r="A2" t="inlineStr"><is><t>1E5</t></is></c>', "1E5"),
        ('<c r="A2" t="inlineStr"><is><r><t>n</t></r> <r><t>/a</t></r><rPh><t>no</t></rPh></is></c>', "n/a"),
        ('<c r="A2" t="inlineStr"><is><t>a_x000D_\nb</t></is></c>', "a b"),
        ('<c r="A2" t="inlineStr"><is><t>_x005F_x0041_</t></is></c>', "_x0041_"),
        ('<c r="A2" t="inlineStr"><is><t>A\u030a\u00a0</t></is></c>', "Å"),
        ('<c r="A2" t="inlineStr"><is><t/></is></c>', None),
        ('<c r="A2" s="1"/>', None),
        ('<c r="A2"><v/></c>', None),
    ],
)
def test_values(tmp_path, xml, value):
    found = cell(tmp_path, xml)
    assert found == value
    assert type(found) is type(value)


@pytest.mark.parametrize(
    ("xml", "found"),
    [
        ('<c r="A2"><f>1+1</f></c>', "never calculated"),
        ('<c r="A2"><f>1+1</f><v></v></c>', "never calculated"),
        ('<c r="A2" t="str"><f>B1</f></c>', "never calculated"),
        ('<c r="A2"><f t="shared" si="0"/></c>', "never calculated"),
        ('<c r="A2" t="e"><f>1/0</f><v>#DIV/0!</v></c>', "#DIV/0!"),
        ('<c r="A2" t="e"><v>#N/A</v></c>', "#N/A"),
        ('<c r="A2" t="d"><v>14.3.2026</v></c>', "14.3.2026"),
        ('<c r="A2" t="str"><v>a_x0007_b</v></c>', "U+0007"),
        ('<c r="A2" t="str"><v>a_xD800_b</v></c>', "U+D800"),
        ('<c r="A2" t="str"><v>' + "x" * 32_768 + "</v></c>", "32768 characters"),
        ('<c r="A2" s="7"><v>5</v></c>', "format that the file does not hold"),
    ],
)
def test_bad_cells(tmp_path, xml, found):
    bad = cell(tmp_path, xml)
    assert isinstance(bad, Bad)
    assert found in bad.found
    assert bad.wanted
    assert bad.action


def test_shared_texts_join_runs_and_leave_out_phonetic_ones(tmp_path):
    rows = HEADINGS + '<row r="2"><c r="A2" t="s"><v>1</v></c><c r="B2" t="s"><v>0</v></c></row>'
    texts = (
        '<si><r><rPr><b/></rPr><t xml:space="preserve">12 </t></r><r><t>H</t></r>'
        '<rPh sb="0" eb="1"><t>twelve</t></rPh></si> <si/>'
    )
    assert one(tmp_path, parts(rows, texts=texts)).columns == [[None], ["12 H"]]


@pytest.mark.parametrize(
    ("code", "kind"),
    [
        ("General", PLAIN),
        ("0.00", PLAIN),
        ("0.00E+00", PLAIN),
        ('0.0" %"', PLAIN),
        (r"0.0\%", PLAIN),
        ('0.0 "mD"', PLAIN),
        ("[Red]0.0;[$-409]0.0", PLAIN),
        ("# ?/?", PLAIN),
        ("@", PLAIN),
        ("0%", PERCENT),
        ('0.0%;[Red]-0.0%;"dry"', PERCENT),
        (r"0.0\ %", PERCENT),
        ("yyyy-mm-dd", DATE),
        ("[$-F800]dddd, mmmm dd, yyyy", DATE),
        ("mmm", DATE),
        ("DD/MM/YYYY HH:MM", DATE),
        ("h:mm AM/PM", TIME),
        ("mm:ss.0", TIME),
        ("[h]:mm:ss", ELAPSED),
    ],
)
def test_number_formats(code, kind):
    assert format_kind(code) == kind


@pytest.mark.parametrize("code", [9, 10, "0.0%"])
def test_percent(tmp_path, code):
    assert cell(tmp_path, '<c r="A2" s="1"><v>0.235</v></c>', formats=(code,)) == Percent(0.235)


# Limit and oracle: days counted from the calendar; day 60 of 1900 is left out (common practice)
@pytest.mark.parametrize(
    ("serial", "code", "moment"),
    [
        ("1", 14, datetime(1900, 1, 1)),
        ("59", 14, datetime(1900, 2, 28)),
        ("61", 14, datetime(1900, 3, 1)),
        ("46095", 14, datetime(2026, 3, 14)),
        ("46095.395833333336", 22, datetime(2026, 3, 14, 9, 30)),
        ("46095.5", "h:mm", datetime(2026, 3, 14, 12)),
        ("0.39583333333333331", 20, time(9, 30)),
        ("0", "hh:mm", time(0)),
        ("0.25", "[h]:mm", time(6)),
        ("2958465", 14, datetime(9999, 12, 31)),
    ],
)
def test_dates_of_1900(tmp_path, serial, code, moment):
    assert cell(tmp_path, f'<c r="A2" s="1"><v>{serial}</v></c>', formats=(code,)) == moment


@pytest.mark.parametrize("book", ['<workbookPr date1904="1"/>', '<workbookPr date1904="true"/>'])
@pytest.mark.parametrize(
    ("serial", "moment"), [("0", datetime(1904, 1, 1)), ("44633", datetime(2026, 3, 14))]
)
def test_dates_of_1904(tmp_path, book, serial, moment):
    assert cell(tmp_path, f'<c r="A2" s="1"><v>{serial}</v></c>', formats=(14,), book=book) == moment


@pytest.mark.parametrize(
    ("serial", "code"), [("60", 14), ("0", 14), ("-1", 14), ("1e9", 14), ("-0.5", 20), ("1.5", "[h]:mm")]
)
def test_numbers_that_are_no_date(tmp_path, serial, code):
    assert isinstance(cell(tmp_path, f'<c r="A2" s="1"><v>{serial}</v></c>', formats=(code,)), Bad)


def test_hidden_things_are_read_and_noted(tmp_path):
    rows = HEADINGS + (
        '<row r="2" hidden="1"><c r="A2"><v>1</v></c></row><row r="3"><c r="B3"><v>2</v></c></row>'
        '<row r="4" hidden="true"/>'
    )
    columns = '<cols><col min="2" max="9" hidden="1"/><col min="1" max="1" width="3"/></cols>'
    table = one(tmp_path, parts(rows, before=columns, tab='name="masses" state="veryHidden"'))
    assert table.hidden
    assert table.columns == [[1, None], [None, 2]]
    assert [note.split(":")[0].split()[0:3] for note in table.notes] == [
        ["the", "tab", "is"],
        ["1", "hidden", "row(s)"],
        ["1", "hidden", "column(s)"],
    ]
    assert table.notes[1].endswith(": 2")
    assert table.notes[2].endswith(": B")


def test_the_other_tabs_are_named_if_in_use(tmp_path):
    book = openpyxl.Workbook()
    book.active.title = "masses"
    book.active.append(["plug"])
    book.create_sheet("notes")["Z99"] = "look"
    book.create_sheet("empty")["B2"].font = openpyxl.styles.Font(bold=True)
    book.create_sheet("wells")
    book.create_chartsheet("chart")
    book.save(tmp_path / "made.xlsx")
    tables, problems, others = read(
        tmp_path, (tmp_path / "made.xlsx").read_bytes(), lambda name: name in {"masses", "wells"}
    )
    assert problems == []
    assert others == ["notes"]
    assert [(t.sheet, t.headings, t.columns, t.rows) for t in tables] == [
        ("masses", ["plug"], [[]], []),
        ("wells", [], [], []),
    ]


# What is refused in a readable sheet


def test_a_far_cell_is_named_and_no_grid_is_built(tmp_path):
    rows = (
        HEADINGS
        + '<row r="2"><c r="A2"><v>1</v></c></row><row r="1048576"><c r="XFD1048576"><v>9</v></c></row>'
    )
    tables, [problem], _ = read(tmp_path, parts(rows))
    assert "XFD1048576" in problem.found
    assert (problem.row, problem.column) == (1_048_576, "XFD")
    assert problem.sheet == "masses"
    assert tables[0].rows == [2]


def test_strays_beyond_the_first_are_counted(tmp_path):
    rows = HEADINGS + "".join(f'<row r="{r}"><c r="C{r}"><v>1</v></c></row>' for r in range(2, 52))
    _, problems, _ = read(tmp_path, parts(rows))
    assert len(problems) == 21
    assert "30 more" in problems[-1].found


@pytest.mark.parametrize(
    ("reference", "row"),
    [("A1:B1", 1), ("B2:B3", 2), ("A1:A11", 1), ("B3:A2", 2), ("D2:E3", None), ("A9:B9", None), ("A3:C9", 3)],
)
def test_merged_cells(tmp_path, reference, row):
    rows = HEADINGS + "".join(f'<row r="{r}"><c r="A{r}"><v>{r}</v></c></row>' for r in (2, 3, 4))
    _, problems, _ = read(
        tmp_path, parts(rows, after=f'<mergeCells><mergeCell ref="{reference}"/></mergeCells>')
    )
    assert [(p.row, reference in p.found) for p in problems] == ([(row, True)] if row else [])


@pytest.mark.parametrize(
    ("xml", "found"),
    [
        ('<c r="B1" t="e"><v>#REF!</v></c>', "#REF!"),
        ('<c r="B1"><f>A1</f></c>', "never calculated"),
        ('<c r="B1" t="b"><v>1</v></c>', "True"),
        ('<c r="B1" s="1"><v>0.5</v></c>', "50 %"),
    ],
)
def test_headings_must_be_words(tmp_path, xml, found):
    problem = refusal(tmp_path, parts(f'<row r="1"><c r="A1"><v>1</v></c>{xml}</row>', formats=(9,)))
    assert found in problem.found
    assert (problem.row, problem.column) == (1, "B")


def test_all_problems_of_a_file_come_together(tmp_path):
    members = parts(HEADINGS + '<row r="2"><c r="D2"><v>1</v></c></row>', after='<mergeCell ref="A1:B1"/>')
    members["xl/workbook.xml"] = str(members["xl/workbook.xml"]).replace(
        "</sheets>", '<sheet name="wells" sheetId="2" q:id="r3"/></sheets>'
    )
    members["xl/_rels/workbook.xml.rels"] = str(members["xl/_rels/workbook.xml.rels"]).replace(
        "</Relationships>",
        f'<Relationship Id="r3" Type="{LINK}/worksheet" Target="gone.xml"/></Relationships>',
    )
    _, problems, _ = read(tmp_path, members)
    assert [(p.sheet, p.found.split()[0]) for p in problems] == [
        ("masses", "'1'"),
        ("masses", "merged"),
        ("wells", "no"),
    ]


@pytest.mark.parametrize(
    ("rows", "found"),
    [
        ('<row r="2"/><row r="2"/>', "a row numbered"),
        ('<row r="1048577"/>', "a row numbered"),
        ('<row r="1_0"/>', "a row numbered"),
        ('<row r="1"><c r="A2"><v>1</v></c></row>', "out of row 1"),
        ('<row r="1"><c r="XFE1"><v>1</v></c></row>', "out of row 1"),
        ('<row r="1"><c r="a1"><v>1</v></c></row>', "out of row 1"),
        (HEADINGS + '<row r="2"><c r="A2"><v>1</v></c><c r="A2"><v>2</v></c></row>', "two values"),
        ('<row r="1"><c r="A1" t="s"><v>0</v></c></row>', "shared text number"),
        ('<row r="1"><c r="A1" t="s"><v>-1</v></c></row>', "shared text number"),
        ('<row r="1"><c r="A1"><v>nan</v></c></row>', "the number 'nan'"),
        ('<row r="1"><c r="A1"><v>1_0</v></c></row>', "the number '1_0'"),
        ('<row r="1"><c r="A1"><v>\u0661</v></c></row>', "the number"),
        ('<row r="1"><c r="A1"><v>' + "1" * 4_000_000 + "</v></c></row>", "the number"),
        ('<row r="1"><c r="A1" t="b"><v>2</v></c></row>', "truth value"),
        ('<row r="1"><c r="A1" t="q"><v>2</v></c></row>', "the type"),
        ('<row r="1"><row r="2"/></row>', "<row>"),
        ("<row><c>" + "<z>" * 100 + "</z>" * 100 + "</c></row>", "deeply nested"),
        ('<row r="1">', "broken XML"),
        ("<row>&unknown;</row>", "broken XML"),
        ("<row><c " + 'y="' + "y" * 3_000_000 + '"/></row>', "one XML tag"),
        (
            "<row>" + "".join(f'<c t="inlineStr"><is><t>h{n}</t></is></c>' for n in range(401)) + "</row>",
            "401 headings",
        ),
    ],
)
def test_damaged_sheets(tmp_path, rows, found):
    problem = refusal(tmp_path, parts(rows))
    assert found in problem.found
    assert problem.sheet == "masses"
    assert len(str(problem)) < 400


# What is refused as a file


def changed(name: str, data: str | bytes | None, **rest: str) -> dict[str, str | bytes]:
    members = parts(HEADINGS, texts="<si><t>a</t></si>", **rest)
    if data is None:
        del members[name]
    else:
        members[name] = data
    return members


BOMB = (
    f'<!DOCTYPE z [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;&a;">]><worksheet xmlns="{MAIN}">&b;</worksheet>'
)
OUTSIDE = f'<!DOCTYPE z [<!ENTITY a SYSTEM "file:///etc/passwd">]><workbook xmlns="{MAIN}">&a;</workbook>'
SHEET = "xl/worksheets/sheet1.xml"
LEGACY = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(500)


@pytest.mark.parametrize(
    ("data", "found"),
    [
        (b"", "an empty file"),
        (b"well;plug\nA;1\n", "a text file named as a workbook"),
        (b"\x89PNG\r\n\x1a\n\0\0\0\r", "a file of another kind"),
        (LEGACY, "old kind (.xls)"),
        (LEGACY + "EncryptedPackage".encode("utf-16-le"), "locked with a password"),
        (
            packed({"mimetype": "application/vnd.oasis.opendocument.spreadsheet", "content.xml": "<a/>"}),
            ".ods",
        ),
        (packed({"word/document.xml": "<a/>"}), "a zip file without a workbook"),
        (packed({}), "a zip file without a workbook"),
        (packed(parts(HEADINGS))[:-60], "cut short or damaged"),
        (packed(parts(HEADINGS))[:300], "cut short or damaged"),
        (packed({f"m{n}": "" for n in range(5001)}), "5001 parts"),
        (
            changed("_rels/.rels", links(("officeDocument", "xl/workbook.bin"))) | {"xl/workbook.bin": "a"},
            ".xlsb",
        ),
        (changed("xl/workbook.xml", None), "without a workbook"),
        (changed("xl/workbook.xml", OUTSIDE), "document type declaration"),
        (changed("xl/workbook.xml", f'<workbook xmlns="{MAIN}"/>'), "without tabs"),
        (changed("xl/workbook.xml", '<?xml version="1.0" encoding="utf-7"?><a/>'), "the encoding 'utf-7'"),
        (changed("xl/workbook.xml", b"\xff\xfe<\0"), "broken XML"),
        (changed("xl/_rels/workbook.xml.rels", None), "without its sheet"),
        (
            changed("xl/_rels/workbook.xml.rels", links(("worksheet", "../../../etc/passwd"))),
            "no part 'etc/passwd'",
        ),
        (changed("xl/styles.xml", None), "no part 'xl/styles.xml'"),
        (changed(SHEET, None), "no part"),
        (changed(SHEET, BOMB), "document type declaration"),
        (changed(SHEET, "<html/>"), "not a worksheet"),
        (changed(SHEET, "plain words"), "broken XML"),
        (changed(SHEET, b" " * 300_000_000), "unpacks from"),
        (changed(SHEET, b"<a>" + b"<c/>" * 5_000_000), "unpacks from"),
    ],
)
def test_refused_files(tmp_path, data, found):
    started = clock.perf_counter()
    problem = refusal(tmp_path, data)
    assert found in problem.found
    assert clock.perf_counter() - started < 5


def test_missing_shared_texts(tmp_path):
    members = parts('<row r="1"><c r="A1" t="s"><v>0</v></c></row>', texts="<si><t>a</t></si>")
    assert one(tmp_path, members).headings == ["a"]
    del members["xl/sharedStrings.xml"]
    assert "no part 'xl/sharedStrings.xml'" in refusal(tmp_path, members).found


def test_a_member_twice_and_one_locked(tmp_path):
    stream = io.BytesIO(packed(parts(HEADINGS)))
    with warnings.catch_warnings(), zipfile.ZipFile(stream, "a") as archive:
        warnings.simplefilter("ignore")
        archive.writestr("XL/worksheets\\Sheet1.xml", "<a/>")
    assert "twice" in refusal(tmp_path, stream.getvalue()).found
    data = bytearray(packed(parts(HEADINGS)))
    at = 0
    while (at := data.find(b"PK\x01\x02", at)) >= 0:
        data[at + 8] |= 1
        at += 4
    assert "locked with a password" in refusal(tmp_path, bytes(data)).found


def test_limits(tmp_path, monkeypatch):
    rows = HEADINGS + "".join(f'<row r="{r}"><c r="A{r}"><v>1</v></c></row>' for r in range(2, 9))
    for name, most, found in (
        ("MOST_FILE_BYTES", 100, "too large"),
        ("MOST_UNPACKED_BYTES", 1500, "more than 1,500 bytes"),
        ("MOST_ELEMENTS", 20, "too many"),
        ("MOST_CELLS", 5, "too many cells"),
    ):
        with monkeypatch.context() as patch:
            patch.setattr(workbook_in, name, most)
            assert found in refusal(tmp_path, parts(rows)).found
    assert len(one(tmp_path, parts(rows)).rows) == 7


def test_a_file_held_or_missing(tmp_path, monkeypatch):
    assert "cannot be read" in read_workbook(tmp_path / "none.xlsx", "none.xlsx", bool)[1][0].found

    def held(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", held)
    [problem] = read_workbook(tmp_path / "a.xlsx", "a.xlsx", bool)[1]
    assert "close it in the spreadsheet program" in problem.action
    assert problem.file == "a.xlsx"


# Laws


def written(rows: list[list[object]], formats: dict[str, str] | None = None) -> bytes:
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "masses"
    for row, values in enumerate(rows, 1):
        for column, value in enumerate(values, 1):
            if value is not None:
                made = sheet.cell(row, column)
                made.value = value
                if isinstance(value, str):
                    made.data_type = "s"
    for name, code in (formats or {}).items():
        sheet[name].number_format = code
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


GOOD = written(
    [["plug", "mass [g]", "on", "share"], ["1H", 12.5, datetime(2026, 3, 14), 0.5], ["2H", 3, None, 0.25]],
    {"D2": "0.0%", "D3": "0%"},
)
GOOD_COLUMNS = [["1H", "2H"], [12.5, 3], [datetime(2026, 3, 14), None], [Percent(0.5), Percent(0.25)]]


def check_shape(tables: list[Table]) -> None:
    for table in tables:
        assert len(table.headings) == len(table.letters) == len(table.columns)
        assert all(len(column) == len(table.rows) for column in table.columns)
        assert table.rows == sorted(set(table.rows))


@SOON
@given(
    st.lists(st.tuples(st.integers(0, len(GOOD) - 1), st.binary(max_size=3)), min_size=1, max_size=6),
    st.booleans(),
)
def test_damaged_bytes_never_raise(tmp_path, changes, keep_length):
    data = bytearray(GOOD)
    for at, new in changes:
        data[at : at + (len(new) if keep_length else 1)] = new
    tables, problems, _ = read(tmp_path, bytes(data))
    assert tables or problems
    check_shape(tables)


with zipfile.ZipFile(io.BytesIO(GOOD)) as _archive:
    GOOD_PARTS = {name: _archive.read(name) for name in _archive.namelist()}


@SOON
@given(st.sampled_from(sorted(GOOD_PARTS)), st.randoms(use_true_random=False))
def test_damaged_parts_never_raise(tmp_path, name, chance: random.Random):
    data = bytearray(GOOD_PARTS[name])
    pieces = [
        b"",
        b"<",
        b">",
        b'"',
        b"<v>",
        b"</c>",
        b"0",
        b"A",
        b"&",
        b"\0",
        b'<c r="B9">',
        b"</row>",
        b"-",
        b"%",
    ]
    for _ in range(chance.randint(1, 4)):
        at = chance.randrange(len(data))
        data[at : at + chance.randint(0, 3)] = chance.choice(pieces)
    tables, problems, _ = read(tmp_path, {**GOOD_PARTS, name: bytes(data)})
    assert tables or problems
    check_shape(tables)


words = st.text(
    st.characters(exclude_categories=["Cc", "Cs"], exclude_characters="\ufffe\uffff"), max_size=20
)


@SOON
@given(st.lists(st.tuples(words, st.none() | st.booleans() | st.floats(-1e300, 1e300))))
@example([("=1+1", 1.0), ("#N/A", None), ("_x", True), ("\u2028 x", -0.0), ("<&>\"'", 1e-320)])
def test_round_trip(tmp_path, rows):
    rows = [row for row in rows if not workbook_in._ESCAPE.search(row[0])]
    table = one(tmp_path, written([["plug", "value"], *map(list, rows)]))
    texts = [unicodedata.normalize("NFC", text).strip() or None for text, _ in rows]
    kept = [
        n for n, (text, row) in enumerate(zip(texts, rows, strict=True)) if (text, row[1]) != (None, None)
    ]
    assert table.rows == [n + 2 for n in kept]
    assert table.columns[0] == [texts[n] for n in kept]
    # openpyxl writes 16 digits of a number
    assert table.columns[1] == [float(f"{v:.16g}") if isinstance(v := rows[n][1], float) else v for n in kept]
    assert all(
        isinstance(c, bool) is isinstance(rows[n][1], bool)
        for c, n in zip(table.columns[1], kept, strict=True)
    )


def test_the_file_before_damage(tmp_path):
    assert one(tmp_path, GOOD).columns == GOOD_COLUMNS


@pytest.mark.skipif(not shutil.which("soffice"), reason="needs LibreOffice")
def test_saved_again_by_libreoffice(tmp_path):
    rows = [
        ["plug", "mass [g]", "on", "share", "sum", "wrong", "at", "said"],
        ["007", 12.5, datetime(2026, 3, 14, 9, 30), 0.5, "=B2*2", "=1/0", time(9, 30), True],
        [" 1E5 ", 3, None, None, '=""', None, None, None],
    ]
    book = openpyxl.load_workbook(io.BytesIO(written(rows, {"D2": "0.0%"})))
    for name in ("E2", "F2", "E3"):
        book["masses"][name].data_type = "f"
    book["masses"].row_dimensions[3].hidden = True
    (tmp_path / "out").mkdir()
    book.save(tmp_path / "bench.xlsx")
    before = one(tmp_path, (tmp_path / "bench.xlsx").read_bytes())
    assert all(isinstance(before.columns[n][0], Bad) for n in (4, 5))
    subprocess.run(
        [
            "soffice",
            f"-env:UserInstallation={(tmp_path / 'profile').as_uri()}",
            "--headless",
            "--convert-to",
            "xlsx",
            "--outdir",
            str(tmp_path / "out"),
            str(tmp_path / "bench.xlsx"),
        ],
        check=True,
        capture_output=True,
        timeout=120,
    )
    table = one(tmp_path, (tmp_path / "out" / "bench.xlsx").read_bytes())
    assert table.headings == rows[0]
    assert table.rows == [2, 3]
    assert [column[0] for column in table.columns[:5]] == [
        "007",
        12.5,
        datetime(2026, 3, 14, 9, 30),
        Percent(0.5),
        25,
    ]
    wrong = table.columns[5][0]
    assert isinstance(wrong, Bad)
    assert "#DIV/0!" in wrong.found
    assert [column[0] for column in table.columns[6:]] == [time(9, 30), True]
    assert [column[1] for column in table.columns] == ["1E5", 3, *[None] * 6]
    assert "hidden row" in table.notes[0]
