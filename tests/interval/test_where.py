"""The language of `--where`: what it takes, what an empty value does, what it refuses.

No published values: own grammar.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import Usage
from corelab.interval.select import COLUMNS
from corelab.interval.where import apply, parse

NAN = float("nan")
FRAME = pd.DataFrame(
    {
        "plug": ["1H", "2H", "3-1", "1E5", "007", "O'Brien", 'say "so"'],
        "porosity [v/v]": [0.05, 0.12, 0.20, NAN, 0.25, 0.30, NAN],
        "klinkenberg permeability [mD]": [0.1, 10.0, NAN, 5.0, 100.0, 0.01, NAN],
        "facies": ["sand", "channel sand", "", "Shale", "sand", None, "caf\u00e9"],
        "log depth [m]": [NAN] * 7,
        "run": ["1", "2", "", "10", "1", "1", "2"],
    }
)


def kept(text: str) -> list[str]:
    return FRAME["plug"][apply(parse(text, list(FRAME.columns)), FRAME)].tolist()


@pytest.mark.parametrize(
    ("text", "names"),
    [
        # comparisons
        ("porosity > 0.12", ["3-1", "007", "O'Brien"]),
        ("porosity >= 0.12", ["2H", "3-1", "007", "O'Brien"]),
        ("porosity < 0.12", ["1H"]),
        ("porosity<=.12", ["1H", "2H"]),
        ("porosity = 0.2", ["3-1"]),
        ("porosity == 2e-1", ["3-1"]),
        ("porosity != 0.2", ["1H", "2H", "007", "O'Brien"]),
        ("porosity <> 0.2", ["1H", "2H", "007", "O'Brien"]),
        ("porosity > -1", ["1H", "2H", "3-1", "007", "O'Brien"]),
        ("porosity > '0.2'", ["007", "O'Brien"]),
        # names: of several words, in any case, with units, in quotes
        ("klinkenberg permeability >= 10", ["2H", "007"]),
        ("Klinkenberg  PERMEABILITY >= 10", ["2H", "007"]),
        ("klinkenberg permeability [mD] >= 10", ["2H", "007"]),
        ("porosity[v/v] > 0.2 AND run = 1", ["007", "O'Brien"]),
        ("'klinkenberg permeability' >= 10", ["2H", "007"]),
        ('"porosity" > 0.25', ["O'Brien"]),
        # and, or, not, brackets
        ("porosity < 0.1 or porosity > 0.2 and facies = sand", ["1H", "007"]),
        ("(porosity < 0.1 or porosity > 0.2) and facies = sand", ["1H", "007"]),
        ("(porosity < 0.1 or porosity > 0.1) and run = 2", ["2H"]),
        ("porosity < 0.1 or porosity > 0.1 and run = 2", ["1H", "2H"]),
        ("not porosity > 0.1 and run = 1", ["1H"]),
        ("not (porosity > 0.1 and run = 1)", ["1H", "2H", "1E5", 'say "so"']),
        ("not not porosity > 0.2", ["007", "O'Brien"]),
        ("NOT (NOT (porosity > 0.2))", ["007", "O'Brien"]),
        ("((((porosity>0.2))))", ["007", "O'Brien"]),
        # texts
        ("facies = 'channel sand'", ["2H"]),
        ('facies = "Channel SAND"', ["2H"]),
        ("facies = sand", ["1H", "007"]),
        ("facies != 'sand'", ["2H", "1E5", 'say "so"']),
        ("facies contains 'sand'", ["1H", "2H", "007"]),
        ("facies CONTAINS Sand", ["1H", "2H", "007"]),
        ("not facies contains sand", ["1E5", 'say "so"']),
        ("plug = 'O''Brien'", ["O'Brien"]),
        (r"plug = 'O\'Brien'", ["O'Brien"]),
        ('plug = "O\'Brien"', ["O'Brien"]),
        (r'plug = "say \"so\""', ['say "so"']),
        ('plug = "say ""so"""', ['say "so"']),
        ("plug = 'say \"so\"'", ['say "so"']),
        ("facies = 'cafe\u0301'", ['say "so"']),
        # names that look like numbers stay names
        ("plug = 2H", ["2H"]),
        ("plug = 3-1", ["3-1"]),
        ("plug = 1E5", ["1E5"]),
        ("plug = 100000", []),
        ("plug = 007", ["007"]),
        ("plug = 7", []),
        ("run = 1", ["1H", "007", "O'Brien"]),
        ("run = '1'", ["1H", "007", "O'Brien"]),
        # empty values
        ("porosity is empty", ["1E5", 'say "so"']),
        ("porosity is not empty", ["1H", "2H", "3-1", "007", "O'Brien"]),
        ("not porosity is empty", ["1H", "2H", "3-1", "007", "O'Brien"]),
        ("facies IS  Empty", ["3-1", "O'Brien"]),
        ("facies = ''", []),
        ("facies != ''", ["1H", "2H", "1E5", "007", 'say "so"']),
        ("log depth > 0", []),
        ("not log depth > 0", []),
        ("log depth is empty and porosity > 0.25", ["O'Brien"]),
    ],
)
def test_what_an_expression_keeps(text: str, names: list[str]):
    assert kept(text) == names


def test_an_empty_value_is_neither_true_nor_false():
    """Kleene's three values: unknown and false is false, unknown or true is true."""
    empty = "log depth > 0"
    all_names = FRAME["plug"].tolist()
    assert kept(f"{empty} or plug is not empty") == all_names
    assert kept(f"not ({empty} and plug is empty)") == all_names
    assert kept(f"{empty} and plug is not empty") == []
    assert kept(f"not ({empty} and plug is not empty)") == []
    assert kept(f"not ({empty} or plug is empty)") == []


CONDITIONS = st.sampled_from(
    ["porosity > 0.12", "facies = sand", "log depth < 5", "run is empty", "klinkenberg permeability <= 5"]
)


@given(CONDITIONS, CONDITIONS)
def test_de_morgan_holds_with_empty_values(one: str, other: str):
    assert kept(f"not ({one} and {other})") == kept(f"not {one} or not {other}")
    assert kept(f"not ({one} or {other})") == kept(f"not {one} and not {other}")
    assert not set(kept(one)) & set(kept(f"not ({one})"))


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("porosty > 0.1", "There is no column 'porosty'; did you mean 'porosity'?"),
        ("xyz > 0.1", "known: plug, porosity, klinkenberg permeability"),
        ("(porosity > 0.1", "it ends too soon; wanted a closing bracket"),
        ("porosity > 0.1)", "found ')'; wanted 'and' or 'or'"),
        ("porosity > 0.1 0.2", "found '0.2'; wanted 'and' or 'or'"),
        ("facies = channel sand", "found 'sand'; wanted 'and' or 'or'; a text of several words"),
        ("porosity > 'high'", "'porosity' holds numbers; it cannot be compared with 'high'"),
        ("porosity > high", "holds numbers"),
        ("porosity > nan", "holds numbers"),
        ("porosity > inf", "holds numbers"),
        ("porosity > 0,12", "holds numbers"),
        ("porosity > 1_0", "holds numbers"),
        ("porosity > ''", "holds numbers"),
        ("porosity contains 1", "'contains' is for texts"),
        ("facies > 'a'", "'facies' holds texts: use =, != or contains"),
        ("porosity", "wanted a comparison"),
        ("porosity 0.1", "wanted a comparison"),
        ("porosity >", "it ends too soon; wanted a number, or a text in quotes"),
        ("porosity > > 1", "wanted a number"),
        ("porosity = and", "wanted a number"),
        ("porosity is 0.1", "wanted 'empty'"),
        ("> 0.1", "wanted the name of a column"),
        ("", "wanted the name of a column"),
        ("()", "wanted the name of a column"),
        ("facies = 'sand", "straight quotes"),
        ("facies = ‘sand’", "straight quotes"),
        ("porosity > 0.1 and", "it ends too soon"),
        ("porosity > 0.1 or or run = 1", "There is no column 'or"),
        # nothing is ever evaluated or handed on
        ("__import__('os').system('true')", "There is no column '__import__'"),
        ("porosity > 0.1; DROP TABLE result", "found 'DROP TABLE result'; wanted 'and' or 'or'"),
        ("1=1", "wanted the name of a column"),
        ("facies = 'x' or 1=1 --", "wanted the name of a column"),
        ("facies = 'x'; DELETE FROM result", "wanted 'and' or 'or'"),
        ("lambda: 0", "There is no column 'lambda:'"),
        ("porosity.__class__ = 1", "There is no column"),
        ("@porosity > 1", "There is no column '@porosity'"),
        ("`porosity` > 1", "There is no column"),
        ("porosity > (0.1)", "wanted a number"),
        ("porosity > 0.1 ** 9", "wanted 'and' or 'or'"),
    ],
)
def test_what_is_refused_says_why(text: str, said: str):
    with pytest.raises(Usage) as trouble:
        kept(text)
    assert said in str(trouble.value)


def test_length_and_depth_are_limited():
    with pytest.raises(Usage, match="longer than 2000"):
        parse("porosity > 0.1 and " * 200 + "porosity > 0.1", COLUMNS)
    with pytest.raises(Usage, match="nested too deeply"):
        parse("(" * 60 + "porosity > 1" + ")" * 60, COLUMNS)
    with pytest.raises(Usage, match="nested too deeply"):
        parse("not " * 60 + "porosity > 1", COLUMNS)
    assert kept(" and ".join(["porosity > 0.2"] * 80)) == ["007", "O'Brien"]


PIECES = st.sampled_from(
    [
        *"()<>=!'\"\\ ",
        "and",
        "or",
        "not",
        "is",
        "empty",
        "contains",
        "porosity",
        "facies",
        "0.1",
        "1e999",
        "é",
    ]
)


@settings(max_examples=300)
@given(st.one_of(st.text(max_size=60), st.lists(PIECES, max_size=25).map(" ".join)))
def test_random_text_is_understood_or_refused(text: str):
    try:
        mask = apply(parse(text, list(FRAME.columns)), FRAME)
    except Usage:
        return
    assert mask.dtype == np.bool_
    assert mask.shape == (len(FRAME),)


@given(st.text(st.characters(exclude_categories=["Cs"]), min_size=1).filter(lambda t: t.strip()))
def test_any_text_can_be_asked_for_in_quotes(text: str):
    frame = pd.DataFrame({"facies": [text, "other than that"]})
    single = text.replace("\\", "\\\\").replace("'", "''")
    double = text.replace("\\", "\\\\").replace('"', '\\"')
    for expression in (f"facies = '{single}'", f'facies = "{double}"'):
        assert apply(parse(expression, ["facies"]), frame)[0]


def test_a_frame_without_rows_keeps_none():
    node = parse("porosity > 0.1 or facies contains x", list(FRAME.columns))
    assert apply(node, FRAME.iloc[:0]).tolist() == []
