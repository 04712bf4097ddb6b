"""Reading the SPWLA core-data format: the real file to its last row, other writers' ways, hostile files.

Published: the file of well 7121/8-1 as its laboratory issued it (Norwegian Offshore Directorate, NLOD 2.0),
held against the table that others parsed from it. The rest is written here, line by line.
"""

from __future__ import annotations

import contextlib
import csv
import re
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import Refused
from corelab.formats.spwla_in import MOST_CHARACTERS, SpwlaFile, parsed, read_spwla
from corelab.formats.table import Unreadable

REAL = "norway_7121_8-1/7121_8-1_CORE_CONV_RAW_1.SPWLA"
TABLE = "norway_7121_8-1/nod_7121_8-1_core_plugs.csv"
VALUES = ["kN2_h", "kKl_h", "kN2_v", "kKl_v", "por_h", "por_v", "por_sum", "So", "Sw", "gd"]

HEADING = """\
10     2
    W-1                                     Nowhere                                 18Feb09
    Bench Ltd
15     3    3
          1512      1602  2031   0Bench Ltd           Klinkenberg corrected gas perm, Hor.
          1402      1211  3084   0Bench Ltd           Porosity, Horizontal PLUG
          2451      1201  1086   0Bench Ltd           Grain Density, Hor.
"""
SAMPLE = """\
30     1
     1918.95     0.00   1.11
36     1    1
    Sst.Lt-gry.VF-gr.
40     1    3
        10.50000    18.44722     2.65100
"""


def of(text: str) -> SpwlaFile:
    return parsed("a.spwla", text.encode())


def refusal(text: str | bytes) -> str:
    with pytest.raises(Unreadable) as caught:
        parsed("a.spwla", text if isinstance(text, bytes) else text.encode())
    return str(caught.value.problem("a.spwla"))


# -- the real file ----------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def real(open_data: Path) -> SpwlaFile:
    return read_spwla(open_data / REAL)


def test_the_real_file_is_read_to_its_last_row(real: SpwlaFile) -> None:
    """328 depth rows: 264 plugs with a description, 64 rows of a second kind at 1 m spacing."""
    assert real.well == "7121/8-1"
    assert len(real.samples) == 328
    assert sum(bool(s.words) for s in real.samples) == 264
    second = [s for s in real.samples if "." in s.name]
    assert len(second) == 64
    assert len(real.meanings) == 10
    assert {m.laboratory for m in real.meanings} == {real.laboratory}
    assert [m.codes[0] for m in real.meanings][:2] == [1507, 1512]
    assert real.meanings[8].text == "CORE Water Saturation"


def test_every_value_of_the_real_file_is_that_of_the_table_parsed_by_others(
    real: SpwlaFile, open_data: Path
) -> None:
    with (open_data / TABLE).open(encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == len(real.samples)
    compared = 0
    for row, sample in zip(rows, real.samples, strict=True):
        assert (sample.depth, sample.name) == (float(row["depth_m"]), row["sample"])
        words = " ".join(sample.words)
        assert words == row["desc"] or ("Å" in words and words.startswith(row["desc"].rstrip("Ã")))
        values = [float(v or -1002.0) for v in sample.values]
        for name, value in zip(VALUES, values, strict=True):
            assert (value == -1002.0) if row[name] == "" else value == float(row[name])
            compared += row[name] != ""
    assert compared > 1600
    # The one letter that is not ASCII cut the description short in the table.
    assert sum("Å" in " ".join(s.words) for s in real.samples) == 1


def test_the_real_file_is_cut_short_and_that_is_said(real: SpwlaFile) -> None:
    (notice,) = real.notices
    assert "row 1856" in notice
    assert "'-1002.00', may be cut short" in notice
    assert real.samples[-1].values[7:] == ["-1002.00000", "", ""]


# -- other writers' ways ----------------------------------------------------------------------------------


def test_the_parts_of_a_sample() -> None:
    file = of(HEADING + SAMPLE)
    assert (file.well, file.laboratory, file.notices) == ("W-1", "Bench Ltd", [])
    (sample,) = file.samples
    assert (sample.depth, sample.more, sample.name, sample.row) == (1918.95, "0.00", "1.11", 9)
    assert sample.words == ["Sst.Lt-gry.VF-gr."]
    assert sample.values == ["10.50000", "18.44722", "2.65100"]


@pytest.mark.parametrize(
    ("line", "values"),
    [
        ("        10.50000                 2.65100", ["10.50000", "", "2.65100"]),
        ("                                 2.65100", ["", "", "2.65100"]),
        ("        10.50000    18.44722", ["10.50000", "18.44722", ""]),
        ("    123456.78900-12345.67890    2.65100", []),
        ("    123456.78900-12345.67890     2.65100", ["123456.78900", "-12345.67890", "2.65100"]),
        (" 10.5 18.4 2.65", ["10.5", "18.4", "2.65"]),
        ("\t10.5\t18.4\t2.65", ["10.5", "18.4", "2.65"]),
        (" 10.5 18.4", []),
    ],
)
def test_columns_of_twelve_or_blanks_between(line: str, values: list[str]) -> None:
    text = HEADING + SAMPLE.replace("        10.50000    18.44722     2.65100", line)
    file = of(text)
    assert file.samples[0].values == values
    assert bool(file.notices) == (values == [])


@pytest.mark.parametrize(
    ("line", "found"),
    [
        ("     1918.95     0.00   12", (1918.95, "0.00", "12")),
        ("1918.95 12", (1918.95, "", "12")),
        ("1918.95  12 A", (1918.95, "12", "A")),
        ("1918.95  0.00  12 A", (1918.95, "0.00", "12 A")),
        ("     1918.95     0.00", (1918.95, "0.00", "")),
        ("1918.95", (1918.95, "", "")),
        ("1918.95 P1", (1918.95, "", "P1")),
        ("somewhere", (None, "", "somewhere")),
    ],
)
def test_a_sample_line(line: str, found: tuple[float | None, str, str]) -> None:
    file = of(HEADING + SAMPLE.replace("     1918.95     0.00   1.11", line))
    sample = file.samples[0]
    assert (sample.depth, sample.more, sample.name) == found
    assert bool(file.notices) == (found[0] is None)


def test_values_over_several_lines_and_several_samples_in_a_record() -> None:
    two_lines = SAMPLE.replace("40     1    3", "40     2    3").replace("    18.44722", "\n    18.44722")
    assert of(HEADING + two_lines).samples[0].values == ["10.50000", "18.44722", "2.65100"]
    both = "30     2\n     1.0     0.00   A\n     2.0     0.00   B\n40     2    3\n 1 2 3\n 4 5 6\n"
    assert [s.values for s in of(HEADING + both).samples] == [["1", "2", "3"], ["4", "5", "6"]]


def test_a_list_of_meanings_may_be_given_anew_for_each_core() -> None:
    other = """\
15     2    2
          2451      1201  1086   0Bench Ltd           Grain Density, Hor.
          1302      1103  3085   0Bench Ltd           CORE Oil Saturation
"""
    values = SAMPLE.replace("40     1    3", "40     1    2").replace("    18.44722", "")
    file = of(HEADING + SAMPLE + HEADING[HEADING.index("15") :] + SAMPLE + other + values)
    assert [m.text.split()[0] for m in file.meanings] == ["Klinkenberg", "Porosity,", "Grain", "CORE"]
    assert [s.values for s in file.samples] == [
        ["10.50000", "18.44722", "2.65100"], ["10.50000", "18.44722", "2.65100"],
        ["", "", "10.50000", "2.65100"],
    ]  # fmt: skip
    assert file.notices == []


def test_what_is_not_understood_is_named() -> None:
    odd = "50     1\n    something\nno record at all\n"
    notices = of(HEADING + odd + SAMPLE).notices
    assert any("kind 50" in n for n in notices)
    assert any("row 10: a line outside any record" in n for n in notices)
    assert "belongs to no sample" in of(HEADING + "36     1    1\n    words\n" + SAMPLE).notices[0]
    short = HEADING + SAMPLE.replace("36     1    1", "36     3    3")
    assert "announces 3 lines and has 1" in of(short).notices[0]
    assert of(short).samples[0].values == ["10.50000", "18.44722", "2.65100"]


def test_a_value_that_the_end_of_the_file_may_have_cut_is_left_out() -> None:
    cut = HEADING + SAMPLE.rstrip("\n")[:-13]
    file = of(cut)
    assert file.samples[0].values == ["10.50000", "", ""]
    assert "the file ends within the values" in file.notices[0]


@pytest.mark.parametrize("coding", ["utf-8", "utf-8-sig", "cp1252", "utf-16"])
@pytest.mark.parametrize("line_end", ["\n", "\r\n", "\r"])
def test_encodings_and_line_ends(coding: str, line_end: str) -> None:
    text = (HEADING + SAMPLE).replace("Nowhere", "Ålesund").replace("Lt-gry", "grå").replace("\n", line_end)
    file = parsed("a.spwla", text.encode(coding))
    assert "Ålesund" in file.heading[0]
    assert file.samples[0].words == ["Sst.grå.VF-gr."]
    assert file.notices == []


def test_an_old_end_of_file_mark_is_no_line() -> None:
    assert of(HEADING + SAMPLE + "\x1a").notices == []


# -- hostile files ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "in the first line"),
        ("well,plug\nW-1,1H\n", "a record of the SPWLA core-data format"),
        (b"PK\x03\x04" + bytes(200), "NUL|control character|first line"),
        ("~Version\nVERS. 2.0 : LAS\n", "first line"),
        ("10     1\n    W-1\n" + SAMPLE, "no record 15"),
        (HEADING, "no sample"),
        (HEADING + SAMPLE + HEADING.replace("W-1", "W-2") + SAMPLE, "two wells"),
        (HEADING + "30     1\n" + "9" * (MOST_CHARACTERS + 1), "characters"),
        (HEADING + SAMPLE.replace("Sst", "S\x07st"), "control character"),
    ],
)
def test_what_is_no_such_file_is_refused(text: str | bytes, words: str) -> None:
    assert re.search(words, refusal(text))


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(Refused, match="cannot be read"):
        read_spwla(tmp_path / "none.spwla")
    with pytest.raises(Refused, match="cannot be read"):
        read_spwla(tmp_path)


@given(st.binary(max_size=400))
def test_any_bytes_are_read_or_refused(content: bytes) -> None:
    with contextlib.suppress(Unreadable):
        assert parsed("a.spwla", content).samples


@settings(max_examples=300, deadline=None)
@given(st.data())
def test_a_damaged_file_is_read_or_refused(data: st.DataObject) -> None:
    lines = (HEADING + SAMPLE * 3).splitlines()
    for _ in range(data.draw(st.integers(1, 4))):
        at = data.draw(st.integers(0, len(lines) - 1))
        how = data.draw(st.sampled_from(["drop", "twice", "cut", "other", "digits"]))
        if how == "drop" and len(lines) > 1:
            del lines[at]
        elif how == "twice":
            lines.insert(at, lines[at])
        elif how == "cut":
            lines[at] = lines[at][: data.draw(st.integers(0, len(lines[at])))]
        elif how == "digits":
            lines[at] = data.draw(st.text("0123456789 .-", max_size=40))
        else:
            lines[at] = data.draw(st.text(max_size=40))
    try:
        file = of("\n".join(lines))
    except (Unreadable, UnicodeEncodeError):
        return
    for sample in file.samples:
        assert len(sample.values) <= len(file.meanings)
        assert sample.depth is None or abs(sample.depth) < 1e300
