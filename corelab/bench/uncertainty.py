"""Standard uncertainties of all results of a tray, propagated from the readings themselves.

The GUM's law of propagation (JCGM 100:2008, 5.1.2 and 5.2.2) in base readings: each reading moves the whole
reduction by a complex step, so what several results share (a length, a dry mass, a barometer, a calibration)
stays correlated between them, and no derivative is written by hand. An *effect* is one independent cause:
the scatter of one reading, the scale of one instrument in everything it read, the fit of a calibration.
One pass of the reduction serves all plugs of a tray at once: effects that cannot meet in a plug share a pass.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtri

from corelab.bench import reduce as reduction
from corelab.bench.gather import CalibrationRows, Readings, Tray
from corelab.bench.outcome import Outcome
from corelab.control.instruments import CALIBRATION_READINGS, READINGS, Node, Reading
from corelab.science.uncertainty import DEFAULTS

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: The imaginary step: so small that its square vanishes beside any reading.
STEP = 1e-30
#: What is not read but taken: standard uncertainties of the temperature [K] (within 2 K of what the room
#: is kept at, all equally likely: common practice) and of a published slip law (share of the slip factor;
#: published laws differ by about a factor of two, common practice).
ASSUMED_TEMPERATURE_K = 1.15
#: A barometer that the laboratory sets follows the weather from day to day (common practice) [kPa].
SET_BAROMETER_KPA = 0.5
SLIP_LAW_SHARE = 0.4

#: The texts that tell one reading of a kind from another that is not its repeat.
_ROLE: Mapping[str, tuple[str, ...]] = {
    "masses": ("condition", "measured_on"),
    "pore volume": ("net_confining_stress_mpa",),
    "gas permeability": (
        "direction", "step", "gas", "net_confining_stress_mpa", "confining_pressure_kpa", "measured_on",
    ),
    "sieve": ("aperture_mm",),
    "reported permeability": ("direction", "net_confining_stress_mpa"),
    "liquid permeability": ("step", "net_confining_stress_mpa"),
}  # fmt: skip
#: Those of which each row enters by itself.
_SINGLE = {"liquid permeability"}


@dataclass(slots=True)
class Shift:
    """By how much the values of one field move, row by row."""

    field: str
    amount: Floats


@dataclass(slots=True)
class Effect:
    """One pass: causes that move different plugs, or one cause that moves many alike."""

    title: str
    source: str
    readings: dict[str, list[Shift]] = field(default_factory=lambda: defaultdict(list))
    calibrations: dict[int, list[Shift]] = field(default_factory=lambda: defaultdict(list))
    fits: dict[int, tuple[float, float]] = field(default_factory=dict)
    barometer_kpa: float = 0.0
    temperature_k: float = 0.0
    slip_law: float = 0.0
    #: Plugs of which readings rest on a default, by the flag that says so.
    by_default: dict[str, set[int]] = field(default_factory=dict)


def effects(tray: Tray) -> Iterator[Effect]:
    """Every cause of uncertainty in a tray."""
    yield from _scatter(tray)
    yield from _scales(tray)
    yield from _fits(tray)
    assumed = DEFAULTS["barometer assumed"]
    if np.isnan(tray.barometer_kpa):
        yield Effect("barometer not read", assumed.source, barometer_kpa=assumed.scale)
    else:
        yield Effect("barometer not read", "as the laboratory set it", barometer_kpa=SET_BAROMETER_KPA)
    yield Effect("temperature not read", "assumed", temperature_k=ASSUMED_TEMPERATURE_K)
    yield Effect("published slip law", "published laws differ: common practice", slip_law=SLIP_LAW_SHARE)


def _instruments(reading: Reading, readings: Readings) -> NDArray[np.intp]:
    if not reading.instrument:
        return np.zeros(len(readings), dtype=np.intp)
    numbers: NDArray[np.intp] = np.nan_to_num(np.real(readings.numbers[reading.instrument])).astype(np.intp)
    return numbers


def _ranks(kind: str, readings: Readings) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """For each row: which reading of its plug it is or repeats (0, 1 …), and its group's number."""
    role = [
        readings.texts[n] if n in readings.texts else readings.numbers[n].real for n in _ROLE.get(kind, ())
    ]
    if kind in _SINGLE:
        role.append(np.arange(len(readings)))
    keys = list(
        zip(readings.at.tolist(), *(["" if v != v else v for v in r.tolist()] for r in role), strict=True)
    )
    groups: dict[Any, int] = {}
    of_plug: dict[int, int] = defaultdict(int)
    rank_of: list[int] = []
    group = np.empty(len(keys), dtype=np.intp)
    for row, key in enumerate(keys):
        if key not in groups:
            groups[key] = len(groups)
            rank_of.append(of_plug[key[0]])
            of_plug[key[0]] += 1
        group[row] = groups[key]
    return np.array(rank_of, dtype=np.intp)[group] if len(keys) else group, group


def _columns(kind: str) -> list[list[Reading]]:
    """The readings of a kind, those of one repeated column together."""
    together: dict[str, list[Reading]] = defaultdict(list)
    for reading in READINGS:
        if reading.kind == kind:
            together[reading.title].append(reading)
    return list(together.values())


def _scatter(tray: Tray) -> Iterator[Effect]:
    """The scatter of each reading; repeats that are averaged move together by their mean's uncertainty."""
    for kind, readings in tray.readings.items():
        if not len(readings):
            continue
        rank, group = _ranks(kind, readings)
        for column in _columns(kind):
            values = np.column_stack([np.real(readings.numbers[r.field]) for r in column])
            there = ~np.isnan(values)
            if not there.any():
                continue
            numbers = [_instruments(r, readings) for r in column]
            random = np.column_stack(
                [tray.register.amounts(r, values[:, i], numbers[i])[0] for i, r in enumerate(column)]
            )
            random = np.where(there, np.nan_to_num(random), 0.0)
            random = _with_seen_scatter(values, random)
            count = there.sum(axis=1)
            rows = np.bincount(group[count > 0], minlength=group.max() + 1)[group]
            with np.errstate(invalid="ignore", divide="ignore"):
                amount = np.where(there, random / np.sqrt((count * rows)[:, None]), 0.0)
            if not amount.any():
                continue
            for number in range(int(rank.max()) + 1):
                here = (rank == number)[:, None]
                if not amount[here[:, 0]].any():
                    continue
                effect = Effect(f"{column[0].title} ({kind})", "repeatability")
                if column[0].instrument:
                    effect.by_default = _by_default(tray, column[0], readings.at, numbers[0], here[:, 0])
                effect.readings[kind] = [
                    Shift(r.field, np.where(here[:, 0], amount[:, i], 0.0)) for i, r in enumerate(column)
                ]
                yield effect


def _by_default(
    tray: Tray, reading: Reading, at: NDArray[np.intp], numbers: NDArray[np.intp], here: Mask
) -> dict[str, set[int]]:
    """The plugs of these rows whose instrument states nothing of what it measures."""
    found: dict[str, set[int]] = {}
    for number in np.unique(numbers[here]):
        if tray.register.rests_on_default(int(number), reading.measure):
            whose = f"{tray.register.name(int(number))}, {reading.measure}" if number else reading.measure
            found[f"default uncertainty ({whose})"] = set(at[here & (numbers == number)].tolist())
    return found


def _with_seen_scatter(values: Floats, random: Floats) -> Floats:
    """Where the readings of one row scatter beyond what their instrument states, their own scatter.

    Judged by chi-square at 1 %: an uneven plug shows in its lengths and diameters.
    """
    there = ~np.isnan(values)
    count = there.sum(axis=1)
    if values.shape[1] < 3 or not (count >= 3).any():
        return random
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(there, values, 0.0).sum(axis=1) / count
        squares = np.where(there, (values - mean[:, None]) ** 2, 0.0).sum(axis=1)
        stated = np.where(there, random**2, 0.0).sum(axis=1) / count
        more = (count >= 3) & (squares > stated * chdtri(np.maximum(count - 1, 1), 0.01))
        seen = np.sqrt(squares / np.maximum(count - 1, 1))
    return np.where(more[:, None] & there, seen[:, None], random)


def _scales(tray: Tray) -> Iterator[Effect]:
    """The scale of each instrument, in all that it read and in its calibrations at once."""
    amounts: dict[Node, list[tuple[str, Shift]]] = defaultdict(list)
    plugs: dict[Node, set[int]] = defaultdict(set)
    for reading in READINGS:
        readings = tray.readings.get(reading.kind)
        if readings is None or not len(readings):
            continue
        there = ~np.isnan(np.real(readings.numbers[reading.field]))
        if not there.any():
            continue
        numbers = _instruments(reading, readings)
        _, shared = tray.register.amounts(reading, np.real(readings.numbers[reading.field]), numbers)
        shared = np.where(there, np.nan_to_num(shared), 0.0)
        for number in np.unique(numbers):
            node, here = (int(number), reading.measure), numbers == number
            if (shared[here] > 0).any():
                amounts[node].append((reading.kind, Shift(reading.field, np.where(here, shared, 0.0))))
                plugs[node] |= set(readings.at[here & there].tolist())
    of_calibration = _calibration_scales(tray)
    for node, (shifts, users) in of_calibration.items():
        if shifts:
            amounts.setdefault(node, [])
            plugs[node] |= users
    for together in _coloured(plugs):
        measure = together[0][1]
        names = {tray.register.name(n) for n, _ in together}
        title = (
            f"scale of {names.pop()}" if len(names) == 1 and together[0][0] else f"scale of each {measure}"
        )
        if not together[0][0]:
            title = f"{measure} (shared)"
        effect = Effect(title, "scale uncertainty")
        for node in together:
            for kind, shift in amounts[node]:
                effect.readings[kind].append(shift)
            for index, shift in of_calibration.get(node, ([], set()))[0]:
                effect.calibrations[index].append(shift)
        yield effect


def _calibration_scales(tray: Tray) -> dict[Node, tuple[list[tuple[int, Shift]], set[int]]]:
    found: dict[Node, tuple[list[tuple[int, Shift]], set[int]]] = {}
    for number, plugs in tray.calibration_users().items():
        readings = tray.calibration(number).readings
        for reading in CALIBRATION_READINGS:
            values = np.real(readings.numbers[reading.field])
            there = ~np.isnan(values)
            numbers = _instruments(reading, readings)
            _, shared = tray.register.amounts(reading, values, numbers)
            shared = np.where(there, np.nan_to_num(shared), 0.0)
            if shared.any():
                shifts, using = found.setdefault((int(numbers[0]), reading.measure), ([], set()))
                shifts.append((number, Shift(reading.field, shared)))
                using |= plugs
    return found


def _coloured(plugs: Mapping[Node, set[int]]) -> list[list[Node]]:
    """Nodes put together so that no plug has two of one group (greedy; one measure to a group)."""
    groups: list[tuple[str, set[int], list[Node]]] = []
    for node in sorted(plugs):
        for measure, used, nodes in groups:
            if measure == node[1] and node[0] and nodes[0][0] and not used & plugs[node]:
                used |= plugs[node]
                nodes.append(node)
                break
        else:
            groups.append((node[1], set(plugs[node]), [node]))
    return [nodes for _, _, nodes in groups]


def _fits(tray: Tray) -> Iterator[Effect]:
    """What the scatter of its readings leaves open in each calibration: two directions of its covariance."""
    users = tray.calibration_users()
    roots = {number: _fit_root(tray, tray.calibration(number)) for number in users}
    for together in _apart(users):
        for direction in range(2):
            effect = Effect("calibration of the porosimeter", "scatter of its readings, propagated")
            for number in together:
                root = roots[number]
                if root is not None:
                    effect.fits[number] = (float(root[0, direction]), float(root[1, direction]))
            if effect.fits:
                yield effect


def _apart(users: Mapping[int, set[int]]) -> list[list[int]]:
    """Calibrations put together so that no plug rests on two of one group (greedy)."""
    groups: list[tuple[set[int], list[int]]] = []
    for number, plugs in users.items():
        for used, numbers in groups:
            if not used & plugs:
                used |= plugs
                numbers.append(number)
                break
        else:
            groups.append((set(plugs), [number]))
    return [numbers for _, numbers in groups]


def _fit_root(tray: Tray, calibration: CalibrationRows) -> Floats | None:
    """A square root of the covariance of reference and cup (or dead) volume from independent readings."""
    readings = calibration.readings
    rows = len(readings)
    total = np.zeros((2, 2))
    for reading in CALIBRATION_READINGS:
        values = readings.numbers[reading.field]
        random, _ = tray.register.amounts(reading, np.real(values), _instruments(reading, readings))
        random = np.nan_to_num(random)
        alike = reading.measure == "barometer read"  # one barometer, read for all rows of the calibration
        for row in range(1 if alike else rows):
            amount = random if alike else np.where(np.arange(rows) == row, random, 0.0)
            amount = np.where(np.isnan(np.real(values)), 0.0, amount)
            if not amount.any():
                continue
            moved = replace(readings, numbers=readings.numbers | {reading.field: values + 1j * STEP * amount})
            fitted = reduction.calibrated(tray, replace(calibration, readings=moved))
            if isinstance(fitted, str):
                return None
            slope = np.array([np.imag(fitted[0]), np.imag(fitted[1])], dtype=np.float64).ravel() / STEP
            total += np.outer(slope, slope)
    if not total.any():
        return None
    values_, vectors = np.linalg.eigh(total)
    root: Floats = vectors * np.sqrt(np.clip(values_, 0.0, None))
    return root


def shifted(tray: Tray, effect: Effect) -> Tray:
    """The tray with an effect put into the imaginary part of what it moves."""
    readings = dict(tray.readings)
    for kind, shifts in effect.readings.items():
        readings[kind] = _moved(readings[kind], shifts)
    calibrations = tray.calibrations
    if effect.calibrations or effect.fits:
        calibrations = {
            key: [
                replace(
                    c,
                    readings=_moved(c.readings, effect.calibrations.get(c.number, [])),
                    offset=_step(effect.fits.get(c.number, (0.0, 0.0))),
                )
                for c in found
            ]
            for key, found in tray.calibrations.items()
        }
    return replace(
        tray,
        readings=readings,
        calibrations=calibrations,
        barometer_step=1j * STEP * effect.barometer_kpa,
        temperature_step=1j * STEP * effect.temperature_k,
        slip_step=1j * STEP * effect.slip_law,
    )


def _moved(readings: Readings, shifts: Sequence[Shift]) -> Readings:
    if not shifts:
        return readings
    numbers = dict(readings.numbers)
    for shift in shifts:
        numbers[shift.field] = numbers[shift.field] + 1j * STEP * shift.amount
    return replace(readings, numbers=numbers)


def _step(amounts: tuple[float, float]) -> tuple[complex, complex]:
    return 1j * STEP * amounts[0], 1j * STEP * amounts[1]


def contributions(tray: Tray) -> Iterator[tuple[Effect, list[Floats]]]:
    """Each effect with what it contributes to every outcome of the reduction: signed, in its unit."""
    for effect in effects(tray):
        outcomes = reduction.reduce(shifted(tray, effect))
        yield effect, [np.nan_to_num(np.imag(outcome.value)) / STEP for outcome in outcomes]


def add_uncertainties(tray: Tray, outcomes: Sequence[Outcome]) -> None:
    """Give every value of every outcome its standard uncertainty, and say where it rests on defaults."""
    variance = [np.zeros(len(outcome.at)) for outcome in outcomes]
    for effect, found in contributions(tray):
        for outcome, total, part in zip(outcomes, variance, found, strict=True):
            total += part**2
            for flag, places in effect.by_default.items():
                touched = (part != 0.0) & np.isin(outcome.at, list(places))
                outcome.flag(flag, touched)
    for outcome, total in zip(outcomes, variance, strict=True):
        if outcome.scatter is not None:
            total += np.nan_to_num(outcome.scatter) ** 2
        known = ~np.isnan(outcome.value.real)
        if outcome.limit is not None:
            known &= outcome.limit == ""
        outcome.uncertainty = np.where(known, np.sqrt(total), np.nan)
