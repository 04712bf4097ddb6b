"""Tables as a reader sees them. No published values: own behaviour."""

from __future__ import annotations

import json
import math

import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab.cli import show

FRAME = pd.DataFrame(
    {
        "plug": ["1H", "10H", "井戸"],
        "depth [m]": [2410.5, 2411.0, float("nan")],
        "klinkenberg permeability [mD]": [1234.5678, 0.0012345, float("nan")],
        "flags": [
            "slip estimated from a published law",
            "",
            "slip estimated from a published law; short plug",
        ],
        "empty": ["", "", ""],
    }
)


def test_columns_are_aligned_and_nothing_is_cut_when_passed_on():
    lines, left_out = show.table(FRAME, {"depth [m]": 2})
    assert lines == [
        "plug  depth [m]  klinkenberg permeability [mD]  flags",
        "1H      2410.50                           1235  slip estimated from a published law",
        "10H     2411.00                       0.001234",
        "井戸                                            slip estimated from a published law; short plug",
    ]
    assert left_out == []


def test_a_narrow_terminal_stacks_headings_and_folds_texts():
    lines, left_out = show.table(FRAME, {"depth [m]": 2}, wrap="flags", room=56)
    assert lines == [
        "                klinkenberg",
        "        depth  permeability",
        "plug      [m]          [mD]  flags",
        "1H    2410.50          1235  slip estimated from a",
        "                             published law",
        "10H   2411.00      0.001234",
        "井戸                         slip estimated from a",
        "                             published law; short plug",
    ]
    assert left_out == []


ORDER = ["plug", "depth [m]", "flags"]


def test_the_most_important_columns_come_first_and_the_others_are_named():
    lines, left_out = show.table(FRAME[["plug", "depth [m]", "flags"]], important=ORDER, room=30)
    assert left_out == ["flags"]
    assert [line.split() for line in lines[:3]] == [["depth"], ["plug", "[m]"], ["1H", "2410"]]
    unlisted, left_out = show.table(FRAME, important=["plug", "depth [m]"], room=70)
    assert left_out == ["depth [m]"]
    assert "flags" in unlisted[2]
    everything, none = show.table(FRAME, important=list(FRAME), room=200)
    assert none == []
    assert "slip estimated from a published law" in everything[-3]


def test_a_frame_without_rows_says_so():
    assert show.table(FRAME.iloc[:0]) == (["none"], [])


@given(
    st.lists(st.tuples(st.text(max_size=12), st.floats(), st.text(max_size=70)), min_size=1, max_size=4),
    st.one_of(st.none(), st.integers(20, 120)),
)
def test_any_cells_keep_all_their_words(rows: list[tuple[str, float, str]], room: int | None):
    frame = pd.DataFrame(rows, columns=["name", "value [m]", "note"])
    lines, _ = show.table(frame, wrap="note", room=room)
    shown = "\n".join(lines)
    for name, _, note in rows:
        for word in (*name.split(), *note.split()):
            assert word in shown


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (1234.5678, "1235"),
        (0.0012345, "0.001234"),
        (-12.3456, "-12.35"),
        (1e-7, "1.000e-07"),
        (2.5e9, "2.500e+09"),
        (float("inf"), "inf"),
    ],
)
def test_significant_digits(value: float, text: str):
    assert show.significant(value) == text


@given(st.floats(1e-12, 1e12))
def test_significant_digits_are_close(value: float):
    assert math.isclose(float(show.significant(value)), value, rel_tol=5.1e-4)


def test_json_knows_no_nan():
    frame = pd.DataFrame(
        {"a [m]": [1.5, float("nan")], "n": [1, 2], "t": ["x", ""], "flags": ["", "y"], "b": [True, False]}
    )
    rows = show.json_records(frame)
    assert rows == [
        {"a [m]": 1.5, "n": 1, "t": "x", "flags": "", "b": True},
        {"a [m]": None, "n": 2, "t": None, "flags": "y", "b": False},
    ]
    assert json.loads(show.as_json(rows)) == rows
    assert "NaN" not in show.as_json(rows)


def test_flags_become_numbers_of_notes():
    marks, notes = show.numbered(["b; a", "", "a; c", "b"])
    assert marks == ["1, 2", "", "2, 3", "1"]
    assert notes == ["  1  b", "  2  a", "  3  c"]


def test_an_event_in_words():
    detail = {"files": {"a.csv": "0" * 64}, "new": {"plugs": 2, "masses": 3}, "corrected": {}}
    assert show.event_words(json.dumps(detail)) == "1 file; new 2 of plugs, 3 of masses"
    assert show.event_words('{"name": "depth unit", "value": "ft"}') == "name depth unit; value ft"
    assert show.event_words("{}") == ""
