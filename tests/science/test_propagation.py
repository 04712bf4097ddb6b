"""Propagation through every formula of the catalogue, against two independent ways.

Checks: oracle only. The `uncertainties` package differentiates numerically through its `wrap` (its own number
type does not pass the formulas' checks, which make plain arrays of what they are given); Monte Carlo after
JCGM 101:2008 agrees within its sampling error. The points are those of the catalogue's contract test.
"""

from __future__ import annotations

import dataclasses
import math
import runpy
from pathlib import Path

import numpy as np
import pytest
from uncertainties import correlated_values_norm, ufloat
from uncertainties import wrap as numerical

from corelab.science.uncertainty import monte_carlo, propagate

CONTRACT = runpy.run_path(str(Path(__file__).with_name("test_catalogue.py")))
TEXTS = CONTRACT["TEXTS"]
# a formula of texts only has nothing to propagate
FORMULAS = [f for f in CONTRACT["ELEMENTWISE"] if f.smooth and any(s.name not in TEXTS for s in f.inputs)]
DRAWS = 4000


def named(formula):
    return formula.key


def point(formula):
    """One realistic point, its standard uncertainties (0.1 % of each), and the names of the results."""
    given = {name: column[0].item() for name, column in CONTRACT["rows"](formula).items()}
    numbers = [name for name in given if name not in TEXTS]
    u = {name: 1e-3 * abs(given[name]) for name in numbers}
    found = formula.compute(**given)
    if not dataclasses.is_dataclass(found):
        return given, u, [None]
    fields = [field.name for field in dataclasses.fields(found)]
    return given, u, [name for name in fields if np.asarray(getattr(found, name)).dtype.kind == "f"]


def as_scalar(formula, given, numbers, output):
    """The formula as a function of its numbers in order, for the package."""

    def call(*values):
        found = formula.compute(**{**given, **dict(zip(numbers, values, strict=True))})
        return float(found if output is None else getattr(found, output))

    return call


@pytest.mark.parametrize("formula", FORMULAS, ids=named)
def test_propagation_agrees_with_the_uncertainties_package(formula):
    given, u, outputs = point(formula)
    numbers = list(u)
    for output in outputs:
        call = numerical(as_scalar(formula, given, numbers, output))
        # the package's central difference, step 1.5e-8 of a value, rounds to 1e-16 of the result
        rounding = 1.5e-11 * abs(as_scalar(formula, given, numbers, output)(*(given[n] for n in numbers)))
        theirs = call(*(ufloat(given[name], u[name]) for name in numbers))
        ours = propagate(formula.compute, given, u, output=output)
        assert ours.value == pytest.approx(theirs.nominal_value, rel=1e-12)
        assert ours.standard_uncertainty == pytest.approx(theirs.std_dev, rel=1e-6, abs=rounding)
        if len(numbers) > 1:
            r = np.eye(len(numbers))
            r[0, 1] = r[1, 0] = 0.4
            pairs = correlated_values_norm([(given[name], u[name]) for name in numbers], r)
            ours = propagate(formula.compute, given, u, {(numbers[1], numbers[0]): 0.4}, output=output)
            assert ours.standard_uncertainty == pytest.approx(call(*pairs).std_dev, rel=1e-6, abs=rounding)


@pytest.mark.parametrize("formula", FORMULAS, ids=named)
def test_propagation_agrees_with_monte_carlo(formula):
    given, u, outputs = point(formula)
    pair = dict.fromkeys([tuple(list(u)[:2])], -0.5) if len(u) > 1 else None
    for output in outputs:
        ours = propagate(formula.compute, given, u, pair, output=output)
        drawn = monte_carlo(formula.compute, given, u, pair, draws=DRAWS, seed=8, output=output)
        assert drawn.impossible == 0.0
        # sampling error 1/sqrt(2 n) of the standard deviation, 1/sqrt(n) of the mean: four of them
        assert drawn.standard_uncertainty == pytest.approx(
            float(ours.standard_uncertainty), rel=4.0 / math.sqrt(2.0 * DRAWS)
        )
        assert abs(drawn.mean - ours.value) < 4.0 * ours.standard_uncertainty / math.sqrt(DRAWS)
