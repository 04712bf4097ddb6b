"""What a formula is, and how it refuses a value that no plug can have.

Every formula takes numbers or arrays that broadcast against each other. NaN means missing and flows
through. An infinite or impossible value is refused. Complex values pass unharmed, since derivatives are
taken by a step along the imaginary axis (Squire & Trapp 1998, "Using complex variables to estimate
derivatives of real functions", SIAM Rev. 40:110-112); range checks therefore look at the real part.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, TypeAlias, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.errors import Impossible
from corelab.units import ZERO_CELSIUS_K

Array: TypeAlias = NDArray[np.float64]
Mask: TypeAlias = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Symbol:
    """One quantity of an equation.

    `symbol` is the paper's, `name` the argument's (or the result's field); `low` and `high` bound the
    published range: outside it a formula computes, and the value deserves a flag.
    """

    symbol: str
    name: str
    unit: str
    meaning: str
    low: float = -np.inf
    high: float = np.inf


@dataclass(frozen=True, slots=True)
class Formula:
    """What a formula is, as the command line, the methods text and the pages show it.

    A stored key never changes its meaning; changed numbers mean a higher version. `elementwise` is
    False for an estimator, which takes columns and returns one answer for all of them or for each group.
    `smooth` is False for one whose answer rests on ranks, choices or a search: no derivative is taken.
    """

    key: str
    version: int
    title: str
    equation: str
    inputs: tuple[Symbol, ...]
    outputs: tuple[Symbol, ...]
    valid: str
    source: str
    tested: str
    compute: Callable[..., Any]
    elementwise: bool = True
    smooth: bool = True

    def outside(self, **inputs: ArrayLike) -> dict[str, Mask]:
        """For each given input that has a published range: where it lies outside (NaN never does)."""
        bounded = {s.name: s for s in self.inputs if np.isfinite(s.low) or np.isfinite(s.high)}
        return {
            name: (np.real(values) < bounded[name].low) | (np.real(values) > bounded[name].high)
            for name, values in inputs.items()
            if name in bounded
        }


class ImpossibleValue(Impossible):
    """`Impossible`, with the argument's name, what was wanted, and a mask of the places."""

    def __init__(self, message: str, argument: str, wanted: str, where: Mask) -> None:
        super().__init__(message)
        self.argument = argument
        self.wanted = wanted
        self.where = where


def refuse(mask: ArrayLike, name: str, values: ArrayLike, wanted: str) -> None:
    """Raise `ImpossibleValue` for argument `name` if `mask` holds anywhere.

    The message names the argument, the first such value, its place (counted from 0) and how many.

    >>> refuse([False, True], "length_cm", [5.0, -1.0], "a length above 0")
    Traceback (most recent call last):
        ...
    corelab.science.formula.ImpossibleValue: length_cm: found -1.0 at place 1 (1 of 2 values); wanted a \
length above 0; check the reading and its unit
    """
    where = np.asarray(mask, dtype=np.bool_)
    count = int(np.count_nonzero(where))
    if not count:
        return
    shape = np.broadcast_shapes(where.shape, np.shape(values))
    where = np.broadcast_to(where, shape)
    first = np.unravel_index(int(np.argmax(where)), shape)
    found = np.broadcast_to(np.asarray(values), shape)[first]
    place = ""
    if shape:
        at = ", ".join(str(i) for i in first)
        place = f" at place {at} ({np.count_nonzero(where)} of {where.size} values)"
    shown = repr(found.item()) if isinstance(found, np.generic) else repr(found)
    message = f"{name}: found {shown}{place}; wanted {wanted}; check the reading and its unit"
    raise ImpossibleValue(message, name, wanted, where)


def finite(name: str, values: ArrayLike) -> Array:
    """`values` as float64 (or complex, as they are); infinity is refused."""
    given = np.asarray(values)
    if given.dtype.kind != "c":
        given = given.astype(np.float64, copy=False)
    refuse(np.isinf(given), name, given, "a finite number")
    return cast("Array", given)


def positive(name: str, values: ArrayLike) -> Array:
    """`values` as an array; anything not above zero is refused."""
    given = finite(name, values)
    refuse(given.real <= 0.0, name, given, "a number above 0")
    return given


def not_negative(name: str, values: ArrayLike) -> Array:
    """`values` as an array; anything below zero is refused."""
    given = finite(name, values)
    refuse(given.real < 0.0, name, given, "0 or more")
    return given


def kelvin(name: str, values_degc: ArrayLike) -> Array:
    """Absolute temperatures [K] of `values_degc`; anything at or below absolute zero is refused."""
    given = finite(name, values_degc)
    refuse(given.real <= -ZERO_CELSIUS_K, name, given, f"a temperature above -{ZERO_CELSIUS_K} degC")
    return given + ZERO_CELSIUS_K


def whole_tray(
    compute: Callable[..., Any], columns: Mapping[str, ArrayLike]
) -> tuple[Any, list[dict[str, str]]]:
    """`compute` over a tray of rows, with the impossible rows marked and not spoiling the others.

    Parameters
    ----------
    compute
        An elementwise formula.
    columns
        Argument name to a column (n,) or one value for all rows; texts are passed on as they are.

    Returns
    -------
    results
        What `compute` returns, NaN in the rows refused.
    refused
        For each row: argument name to what was wanted of it; empty where nothing was refused.

    Examples
    --------
    >>> from corelab.science.volumes import caliper_bulk_volume_cm3
    >>> lengths = [5.08, -5.08]
    >>> volumes, refused = whole_tray(caliper_bulk_volume_cm3, {"length_cm": lengths, "diameter_cm": 3.81})
    >>> [round(float(v), 3) for v in volumes], refused
    ([57.917, nan], [{}, {'length_cm': 'a number above 0'}])
    """
    rows = max((np.size(values) for values in columns.values()), default=1)
    given = {name: np.broadcast_to(np.asarray(values), (rows,)) for name, values in columns.items()}
    refused: list[dict[str, str]] = [{} for _ in range(rows)]
    while True:
        try:
            return compute(**given), refused
        except ImpossibleValue as trouble:
            column = given.get(trouble.argument)
            if column is None:
                raise
            where = np.broadcast_to(trouble.where, (rows,))
            for row in np.flatnonzero(where):
                refused[row][trouble.argument] = trouble.wanted
            if column.dtype.kind in "biufc":
                given[trouble.argument] = np.where(where, np.nan, column)
            else:
                given[trouble.argument] = np.where(where, "", column)
