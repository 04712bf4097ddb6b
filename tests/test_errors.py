"""Messages that lead on. No published values: own behaviour."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab.errors import Problem, Refused, did_you_mean, nearest, quoted


def test_a_problem_says_where_what_and_what_to_do():
    problem = Problem("'abc'", "a number", "type it anew", "masses.csv", "masses", 7, "mass [g]")
    assert str(problem) == (
        "masses.csv, sheet 'masses', row 7, column 'mass [g]': found 'abc'; wanted a number; type it anew"
    )
    assert str(Problem("a", "b", "c")) == "found a; wanted b; c"
    assert problem.as_dict()["what to do"] == "type it anew"
    assert Problem("a", "b", "c", row=0).place == "row 0"


@pytest.mark.parametrize(
    ("count", "said"), [(1, "Nothing was written: 1 problem."), (2, "Nothing was written: 2 problems.")]
)
def test_a_refusal_names_every_problem(count: int, said: str):
    refused = Refused(Problem(f"thing {n}", "b", "c") for n in range(count))
    assert refused.summary == said
    assert all(f"thing {n}" in str(refused) for n in range(count))
    assert len(refused.problems) == count
    assert Refused([], "None at all.").summary == "None at all."


def test_nearest_names_without_regard_to_case():
    assert nearest("qb1", ["QB-1", "QB-2", "Zeta"])[0] == "QB-1"
    assert nearest("7121/81", ["7121/8-1", "7/11-5"])[0] == "7121/8-1"
    assert nearest("x", ["QB-1"]) == []


@pytest.mark.parametrize(
    ("name", "known", "said"),
    [
        ("QB1", ["QB-1", "Zeta"], "did you mean 'QB-1'?"),
        ("q", [], "there is none yet."),
        ("q", ["alpha", "beta"], "known: alpha, beta."),
        ("q", [f"w{n}" for n in range(30)], "known: w0, w1, w2, w3, w4, w5, w6, w7, w8, w9, w10, w11, …"),
    ],
)
def test_a_wrong_name_leads_to_a_right_one(name: str, known: list[str], said: str):
    assert did_you_mean(name, known) == said


@given(st.text())
def test_a_quoted_value_is_one_short_line(text: str):
    shown = quoted(text)
    assert len(shown) <= 62
    assert len(shown.splitlines()) == 1
    assert shown.startswith("'")
    assert shown.endswith("'")
