"""Reading CSV. Rules of quoting: RFC 4180 (2005), section 2."""

import csv
import io
import unicodedata
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from corelab.errors import Problem
from corelab.formats import csv_in
from corelab.formats.csv_in import read_csv
from corelab.formats.table import Bad, Table

SOON = settings(max_examples=100, deadline=2000, suppress_health_check=[HealthCheck.function_scoped_fixture])


def read(tmp_path: Path, data: bytes | str, decimal_comma: bool = False) -> tuple[list[Table], list[Problem]]:
    path = tmp_path / "masses.csv"
    path.write_bytes(data.encode() if isinstance(data, str) else data)
    return read_csv(path, "bench/masses.csv", decimal_comma)


def one(tmp_path: Path, data: bytes | str, decimal_comma: bool = False) -> Table:
    tables, problems = read(tmp_path, data, decimal_comma)
    assert problems == []
    return tables[0]


def refusal(tmp_path: Path, data: bytes | str, decimal_comma: bool = False) -> Problem:
    _, problems = read(tmp_path, data, decimal_comma)
    assert len(problems) == 1, problems
    assert problems[0].file == "bench/masses.csv"
    assert problems[0].action
    assert problems[0].wanted
    return problems[0]


def test_cells_stay_text_and_rows_keep_their_numbers(tmp_path):
    table = one(tmp_path, "\n ,\nwell, mass\u00a0[g] \n007,1E5\n,\n\u00a0NA\u202f,n/a\n2026-03-14\n")
    assert (table.file, table.sheet, table.hidden) == ("bench/masses.csv", "", False)
    assert table.headings == ["well", "mass [g]"]
    assert table.letters == ["1", "2"]
    assert table.columns == [["007", "NA", "2026-03-14"], ["1E5", "n/a", None]]
    assert table.rows == [4, 6, 7]


@pytest.mark.parametrize("coding", ["utf-8", "utf-8-sig", "utf-16"])
@pytest.mark.parametrize("separator", [",", ";", "\t"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_codings_separators_and_line_ends(tmp_path, coding, separator, end):
    text = end.join(separator.join(row) for row in (["well", "plug", "remarks"], ["Ærø-1", "1H", "5 µm"], []))
    table = one(tmp_path, text.encode(coding))
    assert table.headings == ["well", "plug", "remarks"]
    assert table.columns == [["Ærø-1"], ["1H"], ["5 µm"]]


def test_both_byte_orders(tmp_path):
    for mark, coding in ((b"\xff\xfe", "utf-16-le"), (b"\xfe\xff", "utf-16-be")):
        assert one(tmp_path, mark + "a;b\n1;2".encode(coding)).columns == [["1"], ["2"]]


def test_quotes(tmp_path):
    table = one(tmp_path, 'well,"remarks, other; more;;"\r\nA,"said ""no"",\r\nthen left"\r\nB,1/2" plug\r\n')
    assert table.headings == ["well", "remarks, other; more;;"]
    assert table.columns[1] == ['said "no", then left', '1/2" plug']
    assert table.rows == [2, 3]


def test_text_is_normalised_and_control_characters_are_bad(tmp_path):
    table = one(tmp_path, "well,remarks\nA\u030a,a\tb\nB,a\x07b\n")
    assert table.columns[0] == ["Å", "B"]
    good, bad = table.columns[1]
    assert good == "a b"
    assert isinstance(bad, Bad)
    assert "U+0007" in bad.found


def test_decimal_comma_separates_by_semicolons_only(tmp_path):
    table = one(tmp_path, "well;plug, old name, alias, other;mass [g]\nA;x;1,5\n", decimal_comma=True)
    assert table.headings == ["well", "plug, old name, alias, other", "mass [g]"]
    assert table.columns[2] == ["1,5"]
    problem = refusal(tmp_path, "well,mass [g]\nA,5\n", decimal_comma=True)
    assert "commas" in problem.found
    assert problem.row == 1


def test_separator_in_doubt_is_asked_for(tmp_path):
    problem = refusal(tmp_path, "\nwell,plug;mass\n")
    assert "as many commas and semicolons" in problem.found
    assert problem.row == 2


def test_cells_under_no_heading(tmp_path):
    tables, problems = read(tmp_path, "a,,b,\n1,,2,\n3,x,4\n5,,6,,y\n,,,,\n7\n")
    assert tables[0].headings == ["a", "b"]
    assert tables[0].letters == ["1", "3"]
    assert tables[0].columns == [["1", "3", "5", "7"], ["2", "4", "6", None]]
    assert [(p.row, p.column) for p in problems] == [(3, "2"), (4, "5")]
    assert "'x'" in problems[0].found


def test_many_strays_are_counted(tmp_path):
    _, problems = read(tmp_path, "a,b\n" + "1,2,3\n" * 100)
    assert len(problems) == 21
    assert "80 more" in problems[-1].found


@pytest.mark.parametrize(
    ("data", "found", "row"),
    [
        (b"", "empty", None),
        (b"\xef\xbb\xbf\n\n , \n", "empty", None),
        ("well,remarks\nA,5 \u00b5m\n".encode("cp1252"), "hex B5", 2),
        (b"\xff\xfew\x00e\x00\x00\xd8e", "UTF-16", 1),
        ("well,plug\nA,1\n".encode("utf-16-le"), "NUL", 1),
        (b"well,plug\nA,1\nB\0,2\n", "NUL", 3),
        (b"PK\x03\x04whatever", "workbook", None),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "workbook", None),
        (b'well,plug\nA,"1\nB,2\n', "never closed", 2),
        (b'well,plug\nA,"1" x\nB,2\n', "after a closing quote", 2),
        (b'well,plug\nA,"' + b"x" * 200_000 + b'"\n', "very long", 2),
        (b"well,plug\nA" + b"," * 50_000 + b"\n", "20000 commas", 2),
        (b",".join([b"a"] * 401) + b"\n", "401 headings", 1),
        (b"w\x01ell,plug\nA,1\n", "U+0001", 1),
    ],
)
def test_refused(tmp_path, data, found, row):
    problem = refusal(tmp_path, data)
    assert found in problem.found
    assert problem.row == row


def test_rows_after_a_broken_one_are_judged_too(tmp_path):
    tables, problems = read(tmp_path, 'well,plug\nA,"1" x\nB,2,3\nC,"4\n')
    assert sorted((p.row, p.found.split()[0]) for p in problems) == [(2, "text"), (3, "'3'"), (4, "a")]
    assert tables[0].rows == [3]


def test_limits_of_size(tmp_path, monkeypatch):
    monkeypatch.setattr(csv_in, "MOST_BYTES", 10)
    assert "too large" in refusal(tmp_path, "well,plug,mass\n").found
    monkeypatch.setattr(csv_in, "MOST_BYTES", 1000)
    monkeypatch.setattr(csv_in, "MOST_CELLS", 5)
    problem = refusal(tmp_path, "a,b\n1,2\n3,4\n5,6\n7,8\n")
    assert "too many cells" in problem.found
    assert problem.row == 4


def test_a_file_held_or_missing(tmp_path, monkeypatch):
    [problem] = read_csv(tmp_path / "none.csv", "none.csv", False)[1]
    assert "cannot be read" in problem.found
    [problem] = read_csv(tmp_path, "folder", False)[1]
    assert problem.file == "folder"

    def held(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", held)
    [problem] = read_csv(tmp_path / "masses.csv", "masses.csv", False)[1]
    assert "close it in the spreadsheet program" in problem.action


GOOD = 'well,plug,"mass, dry [g]",remarks\n7121/8-1,1H,"12.5","a ""b"", c"\n7121/8-1,2H,13.5,µ\n'.encode()


@SOON
@given(st.lists(st.tuples(st.integers(0, len(GOOD) - 1), st.binary(max_size=3)), min_size=1, max_size=6))
def test_damaged_bytes_never_raise(tmp_path, changes):
    data = bytearray(GOOD)
    for at, new in changes:
        data[at : at + 1] = new
    for decimal_comma in (False, True):
        tables, problems = read(tmp_path, bytes(data), decimal_comma)
        assert tables or problems
        for table in tables:
            assert len(table.headings) == len(table.letters) == len(table.columns)
            assert all(len(column) == len(table.rows) for column in table.columns)


words = st.text(st.characters(exclude_categories=["Cc", "Cs"]), max_size=20)


@SOON
@given(st.lists(st.tuples(words, words), max_size=5), st.sampled_from(["utf-8", "utf-8-sig", "utf-16"]))
def test_round_trip_of_text(tmp_path, rows, coding):
    stream = io.StringIO()
    csv.writer(stream).writerows([("well", "plug"), *rows])
    table = one(tmp_path, stream.getvalue().encode(coding))
    wanted = [tuple(unicodedata.normalize("NFC", cell).strip() or None for cell in row) for row in rows]
    found = [*zip(*table.columns, strict=True)]
    assert found == [row for row in wanted if any(row)]
    assert table.rows == [number for number, row in enumerate(wanted, 2) if any(row)]
