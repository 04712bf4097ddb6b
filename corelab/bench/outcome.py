"""What a reduction gives, and the few operations on trays that all reductions share.

Arrays stay complex where they come in complex, so that the partial derivatives of every result with respect
to every reading can be had by a complex step.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.bench.gather import Readings, Texts, Tray, Whole
from corelab.science.formula import ImpossibleValue, whole_tray
from corelab.units import ATMOSPHERE_KPA

Array = NDArray[Any]
Mask = NDArray[np.bool_]

BAROMETER_ASSUMED = "barometer assumed"
TEMPERATURE_ASSUMED = "temperature assumed"
STRESS_NOT_STATED = "net confining stress not stated"


@dataclass(slots=True)
class Outcome:
    """Values of one quantity: `at` places each in the tray; where the value is NaN, `reason` says why."""

    quantity: str
    at: Whole
    value: Array
    reason: Texts
    basis: Texts
    flags: dict[str, Mask] = field(default_factory=dict)
    direction: Texts | None = None
    stress_mpa: Array | None = None
    step: Texts | None = None
    limit: Texts | None = None
    scatter: Array | None = None  # standard uncertainty by scatter that no reading accounts for
    uncertainty: Array | None = None
    methods: Texts | None = None  # keys of calculations, where quantity and basis do not tell them

    def flag(self, text: str, mask: ArrayLike) -> None:
        where = np.broadcast_to(np.asarray(mask, dtype=np.bool_), self.value.shape)
        where = where & ~np.isnan(self.value.real)
        if where.any():
            before = self.flags.get(text)
            self.flags[text] = where if before is None else before | where

    def inherit(self, other: Outcome, where: Mask | bool = True) -> None:
        """Take over the doubts about what this was computed from (one value a plug on both sides)."""
        for text, mask in list(other.flags.items()):
            self.flag(text, mask & where)


def blank_texts(n: int, text: str = "") -> Texts:
    return np.full(n, text, dtype=object)


def sum_by(values: Array, at: Whole, n: int) -> Array:
    total = np.bincount(at, weights=values.real, minlength=n).astype(np.float64)
    if values.dtype.kind == "c":
        return total + 1j * np.bincount(at, weights=values.imag, minlength=n)
    return total


def mean_by(values: Array, at: Whole, n: int) -> Array:
    """Mean of what is there in each place; NaN where nothing is."""
    there = ~np.isnan(values.real)
    count = np.bincount(at[there], minlength=n)
    return sum_by(values[there], at[there], n) / np.where(count > 0, count, np.nan)


def row_mean(columns: Array) -> Array:
    there = ~np.isnan(columns.real)
    count = np.where(there.any(axis=1), there.sum(axis=1), np.nan)
    mean: Array = np.where(there, columns, 0.0).sum(axis=1) / count
    return mean


def any_by(mask: ArrayLike, at: Whole, n: int) -> Mask:
    return np.bincount(at, weights=np.asarray(mask, dtype=np.float64), minlength=n) > 0


def first_text_by(texts: Texts, at: Whole, n: int) -> Texts:
    """The first text that is not empty in each place."""
    found = blank_texts(n)
    for place, text in zip(at, texts, strict=True):
        if text and not found[place]:
            found[place] = text
    return found


def tray(compute: Callable[..., Any], **columns: ArrayLike) -> tuple[Any, Texts]:
    """A formula over a tray; impossible rows become NaN and say what was wanted."""
    size = max((np.size(values) for values in columns.values()), default=1)
    try:
        return noted(compute, columns, compute(**columns)), blank_texts(size)
    except ImpossibleValue:
        pass
    midway: list[ImpossibleValue] = []
    while True:
        try:
            result, refused = whole_tray(compute, columns)
            break
        except ImpossibleValue as trouble:  # of a value made on the way from absurd ones: not an argument
            midway.append(trouble)
            columns = {
                name: values
                if np.asarray(values).dtype.kind in "OU"
                else np.where(trouble.where, np.nan, values)
                for name, values in columns.items()
            }
    for late in midway:
        for row in np.flatnonzero(np.broadcast_to(late.where, (len(refused),))):
            refused[row][late.argument] = late.wanted
    reasons = np.array(
        ["; ".join(f"{_words(name)}: {wanted} expected" for name, wanted in row.items()) for row in refused],
        dtype=object,
    )
    return noted(compute, columns, result), reasons


#: While a result is explained: each formula as it was called, with its arguments and what it gave.
_calls: ContextVar[list[Call] | None] = ContextVar("calls", default=None)


@dataclass(frozen=True, slots=True)
class Call:
    compute: Callable[..., Any]
    arguments: dict[str, Any]
    result: Any


def noted(compute: Callable[..., Any], arguments: dict[str, Any], result: Any) -> Any:
    calls = _calls.get()
    if calls is not None:
        calls.append(Call(compute, dict(arguments), result))
    return result


@contextmanager
def noting_calls() -> Iterator[list[Call]]:
    """Keep every formula that the reduction calls, in order."""
    calls: list[Call] = []
    token = _calls.set(calls)
    try:
        yield calls
    finally:
        _calls.reset(token)


def _words(argument: str) -> str:
    for suffix in (
        "_g_cm3",
        "_cm3_s",
        "_cm3",
        "_kpa",
        "_degc",
        "_mpas",
        "_frac",
        "_g_kg",
        "_md",
        "_cm2",
        "_cm",
        "_g",
    ):
        argument = argument.removesuffix(suffix)
    return argument.replace("_", " ")


def reasons_for(value: Array, *candidates: tuple[Mask, str] | Texts, otherwise: str) -> Texts:
    """The first reason that holds for each missing value."""
    reason = blank_texts(len(value))
    missing = np.isnan(value.real)
    for candidate in candidates:
        if isinstance(candidate, tuple):
            mask, text = candidate
            reason[missing & mask & (reason == "")] = text
        else:
            chosen = missing & (reason == "") & (candidate != "")
            reason[chosen] = candidate[chosen]
    reason[missing & (reason == "")] = otherwise
    return reason


@dataclass(slots=True)
class Bench:
    """A tray on its way through the reduction."""

    tray: Tray
    n: int
    jacket_mass_g: Array
    jacket_volume_cm3: Array
    screen_cm: Array

    @classmethod
    def of(cls, tray: Tray) -> Bench:
        n = len(tray)
        facts = tray.readings["plugs"]

        def fact(name: str) -> Array:
            return np.nan_to_num(mean_by(facts.number(name), facts.at, n))

        return cls(tray, n, fact("jacket_mass_g"), fact("jacket_volume_cm3"), fact("screen_thickness_cm"))

    def kind(self, name: str) -> Readings:
        return self.tray.readings[name]

    def once(self, name: str, compute: Callable[[], Any]) -> Any:
        """Something that no small step of a reading changes, computed at the first pass only."""
        if name not in self.tray.found:
            self.tray.found[name] = compute()
        return self.tray.found[name]

    def barometer(self, readings: Readings) -> tuple[Array, Mask]:
        return barometer_of(self.tray, readings)

    def temperature(self, readings: Readings, name: str = "temperature_degc") -> tuple[Array, Mask]:
        read = readings.number(name)
        missing = np.isnan(read)
        assumed = real_if_so(self.tray.temperature_degc + self.tray.temperature_step)
        return np.where(missing, assumed, read), missing

    def outcome(self, quantity: str, value: Array, reason: Texts, basis: Texts | str = "") -> Outcome:
        """One value a plug."""
        words = blank_texts(self.n, basis) if isinstance(basis, str) else basis
        return Outcome(quantity, np.arange(self.n), value, reason, words)


def barometer_of(tray: Tray, readings: Readings) -> tuple[Array, Mask]:
    """Barometer of each row [kPa], and where it is assumed."""
    nowhere = np.full(len(readings), np.nan)  # a sheet without the column
    read = readings.numbers.get("barometric_pressure_kpa", nowhere)
    unset = np.isnan(tray.barometer_kpa)
    fallback = (ATMOSPHERE_KPA if unset else tray.barometer_kpa) + tray.barometer_step
    there = ~np.isnan(read)
    return np.where(there, read, real_if_so(fallback)), ~there & unset


def real_if_so(number: complex) -> complex | float:
    return number if number.imag else number.real


def absolute_of(readings: Readings, name: str, barometer: Array) -> Array:
    return readings.number(f"{name}_kpa") + np.where(on_gauge(readings, name), barometer, 0.0)


def on_gauge(readings: Readings, name: str) -> Mask:
    """Where a pressure was read on a gauge."""
    gauge: Mask = np.nan_to_num(readings.number(f"{name}_gauge")) == 1.0
    return gauge


def groups_of(*columns: ArrayLike) -> tuple[list[Array], Whole]:
    """The different rows of `columns`, sorted, and for each row the number of its group."""
    import pandas as pd

    frame = pd.DataFrame({i: np.asarray(c) for i, c in enumerate(columns)})
    group = np.asarray(frame.groupby(list(frame.columns), sort=True, dropna=False).ngroup(), dtype=np.intp)
    first = frame.assign(group=group).drop_duplicates("group").sort_values("group")
    return [first[i].to_numpy() for i in range(len(columns))], group
