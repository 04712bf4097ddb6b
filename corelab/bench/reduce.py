"""From readings in force to results: whole trays at once, every missing value with its reason.

Nothing here knows a database. Arrays stay complex where they come in complex, so that the partial
derivatives of every result with respect to every reading can be had by a complex step.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.bench.gather import CalibrationRows, Readings, Texts, Tray, Whole, in_force
from corelab.errors import Impossible
from corelab.quantities import RESULTS
from corelab.science import fluids, gas_flow, saturation, volumes
from corelab.science.formula import ImpossibleValue, whole_tray
from corelab.units import ATMOSPHERE_KPA, ZERO_CELSIUS_K

Array = NDArray[Any]
Mask = NDArray[np.bool_]

#: Dry weighings agree when they differ by no more than this share (ISRM suggested methods: less than
#: 0.1 % over 4 h; from memory).
CONSTANT_MASS = 0.001
#: Saturations that sum to more than this are questioned: measured ones scatter by a few hundredths.
MOST_SATURATION = 1.05
#: Stresses, and mean pressures of steps, that lie this near are one (share).
SAME_STRESS, SAME_PRESSURE = 0.005, 0.01

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


def _texts(n: int, text: str = "") -> Texts:
    return np.full(n, text, dtype=object)


def _sum_by(values: Array, at: Whole, n: int) -> Array:
    total = np.bincount(at, weights=values.real, minlength=n).astype(np.float64)
    if values.dtype.kind == "c":
        return total + 1j * np.bincount(at, weights=values.imag, minlength=n)
    return total


def _mean_by(values: Array, at: Whole, n: int) -> Array:
    """Mean of what is there in each place; NaN where nothing is."""
    there = ~np.isnan(values.real)
    count = np.bincount(at[there], minlength=n)
    return _sum_by(values[there], at[there], n) / np.where(count > 0, count, np.nan)


def _row_mean(columns: Array) -> Array:
    there = ~np.isnan(columns.real)
    count = np.where(there.any(axis=1), there.sum(axis=1), np.nan)
    mean: Array = np.where(there, columns, 0.0).sum(axis=1) / count
    return mean


def _any_by(mask: ArrayLike, at: Whole, n: int) -> Mask:
    return np.bincount(at, weights=np.asarray(mask, dtype=np.float64), minlength=n) > 0


def _first_text_by(texts: Texts, at: Whole, n: int) -> Texts:
    """The first text that is not empty in each place."""
    found = _texts(n)
    for place, text in zip(at, texts, strict=True):
        if text and not found[place]:
            found[place] = text
    return found


def tray(compute: Callable[..., Any], **columns: ArrayLike) -> tuple[Any, Texts]:
    """A formula over a tray; impossible rows become NaN and say what was wanted."""
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
    return result, reasons


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


def _why(value: Array, *candidates: tuple[Mask, str] | Texts, otherwise: str) -> Texts:
    """The first reason that holds for each missing value."""
    reason = _texts(len(value))
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
class _Bench:
    """A tray on its way through the reduction."""

    tray: Tray
    n: int
    jacket_mass_g: Array
    jacket_volume_cm3: Array
    screen_cm: Array

    @classmethod
    def of(cls, tray: Tray) -> _Bench:
        n = len(tray)
        facts = tray.readings["plugs"]

        def fact(name: str) -> Array:
            return np.nan_to_num(_mean_by(facts.number(name), facts.at, n))

        return cls(tray, n, fact("jacket_mass_g"), fact("jacket_volume_cm3"), fact("screen_thickness_cm"))

    def kind(self, name: str) -> Readings:
        return self.tray.readings[name]

    def barometer(self, readings: Readings) -> tuple[Array, Mask]:
        """Barometer of each row [kPa], and where it is assumed."""
        nowhere = np.full(len(readings), np.nan)  # a sheet without the column
        read = readings.numbers.get("barometric_pressure_kpa", nowhere)
        setting = self.tray.barometer_kpa
        fallback = ATMOSPHERE_KPA if np.isnan(setting) else setting
        there = ~np.isnan(read)
        return np.where(there, read, fallback), ~there & np.isnan(setting)

    def temperature(self, readings: Readings, name: str = "temperature_degc") -> tuple[Array, Mask]:
        read = readings.number(name)
        missing = np.isnan(read)
        return np.where(missing, self.tray.temperature_degc, read), missing

    def outcome(self, quantity: str, value: Array, reason: Texts, basis: Texts | str = "") -> Outcome:
        """One value a plug."""
        words = _texts(self.n, basis) if isinstance(basis, str) else basis
        return Outcome(quantity, np.arange(self.n), value, reason, words)


def _absolute(readings: Readings, name: str, barometer: Array) -> Array:
    return readings.number(f"{name}_kpa") + np.where(_gauge(readings, name), barometer, 0.0)


def _gauge(readings: Readings, name: str) -> Mask:
    """Where a pressure was read on a gauge."""
    gauge: Mask = np.nan_to_num(readings.number(f"{name}_gauge")) == 1.0
    return gauge


@np.errstate(invalid="ignore", divide="ignore", over="ignore")  # what is missing is NaN and flows through
def reduce(tray_: Tray) -> list[Outcome]:
    """All results of a tray of plugs."""
    bench = _Bench.of(tray_)
    if not bench.n:
        return []
    shape = _shape(bench)
    masses = _masses(bench)
    salt = _salt(bench, masses)
    volume = _volumes(bench, shape, masses, salt)
    flow = _gas_permeability(bench, shape)
    fluid = _saturations(bench, masses, volume)
    outcomes = [
        *volume.outcomes,
        *_stressed(bench, volume),
        *flow,
        *_liquid_permeability(bench, shape),
        *fluid,
    ]
    for outcome in outcomes:
        endless = np.isinf(outcome.value)
        outcome.value = np.where(endless, np.nan, outcome.value)
        outcome.reason[endless] = "the readings are too far apart to give a number"
        outcome.flags = {text: mask & ~endless for text, mask in outcome.flags.items()}
    _mark_not_measured(bench, outcomes)
    _mark_implausible(outcomes)
    return outcomes


@dataclass(slots=True)
class _Shape:
    length_cm: Array
    net_length_cm: Array
    diameter_cm: Array
    bulk_volume_cm3: Array
    area_cm2: Array
    reason: Texts


def _shape(bench: _Bench) -> _Shape:
    """Length without end screens, mean cross-section, bulk volume by caliper.

    The jacket's volume holds sleeve and screens; where none is given, the screens' length is taken off.
    """
    readings, n = bench.kind("dimensions"), bench.n

    def mean(name: str) -> Array:
        columns = np.column_stack([readings.number(f"{name}_{i}_cm") for i in range(1, 11)])
        return _mean_by(_row_mean(columns), readings.at, n)

    length, diameter = mean("length"), mean("diameter")
    net_length = length - bench.screen_cm
    measured_length = np.where(bench.jacket_volume_cm3.real > 0, length, net_length)
    gross, refused = tray(volumes.caliper_bulk_volume_cm3, length_cm=measured_length, diameter_cm=diameter)
    bulk = gross - bench.jacket_volume_cm3
    sound = bulk.real > 0
    return _Shape(
        length,
        net_length,
        diameter,
        np.where(sound, bulk, np.nan),
        np.where(sound, bulk / net_length, np.nan),
        refused,
    )


@dataclass(slots=True)
class _Masses:
    received_g: Array
    dry_g: Array  # as weighed, salt included
    saturated_g: Array
    saturant_density_g_cm3: Array
    salinity_g_kg: Array
    salt: Texts
    salt_density_g_cm3: Array
    dry_not_constant: Mask
    saturated_taken_from_received: Mask


def _masses(bench: _Bench) -> _Masses:
    """Net masses by condition; of several dry weighings the last at constant mass."""
    readings, n = bench.kind("masses"), bench.n
    at = readings.at
    condition = readings.text("condition")
    distillation = bench.kind("distillation")
    thimble = np.nan_to_num(_mean_by(distillation.number("thimble_mass_g"), distillation.at, n))
    container = readings.number("container_mass_g")
    in_thimble = np.isnan(container) & (condition != "saturated")
    tare = np.where(np.isnan(container), np.where(in_thimble, thimble[at], 0.0), container)
    net = readings.number("mass_g") - tare - bench.jacket_mass_g[at]
    net = np.where(net.real > 0, net, np.nan)
    is_dry, is_wet, is_received = (condition == c for c in ("dry", "saturated", "as received"))
    dry, not_constant = _constant_mass(net[is_dry], at[is_dry], readings.text("measured_on")[is_dry], n)
    received = _mean_by(net[is_received], at[is_received], n)
    density = readings.number("saturant_density_g_cm3")
    saturated = _mean_by(net[is_wet], at[is_wet], n)
    # A mass as received that names the liquid filling its pores is one of a full plug.
    full = is_received & ~np.isnan(density)
    full_received = _mean_by(net[full], at[full], n)
    taken = np.isnan(saturated.real) & ~np.isnan(full_received.real)
    # What is said of the salt beside the newest dry weighing counts before what other rows say.
    newest = np.argsort(readings.text("measured_on").astype(str), kind="stable")[::-1]
    rank = np.where(is_dry, 0, np.where(is_wet, 1, 2))
    order = newest[np.argsort(rank[newest], kind="stable")]
    salt_words = readings.text("salt")
    salt_words = np.where(salt_words == "none", "", salt_words)
    return _Masses(
        received,
        dry,
        np.where(taken, full_received, saturated),
        _mean_by(density, at, n),
        _mean_by(readings.number("salinity_g_per_kg"), at, n),
        _first_text_by(salt_words[order], at[order], n),
        _mean_by(readings.number("salt_density_g_cm3"), at, n),
        not_constant,
        taken,
    )


def _constant_mass(mass: Array, at: Whole, date: Texts, n: int) -> tuple[Array, Mask]:
    """The last weighing that differs from the one before by no more than the criterion, else the last.

    Repeats at one time are one weighing, their mean.
    """
    chosen = np.full(n, np.nan, dtype=mass.dtype)
    not_constant = np.zeros(n, dtype=np.bool_)
    if not len(mass):
        return chosen, not_constant
    times = date.astype(str)
    order = np.lexsort((times, at))
    at_s, time_s, mass_s = at[order], times[order], mass[order]
    new = np.ones(len(order), dtype=np.bool_)
    new[1:] = (at_s[1:] != at_s[:-1]) | (time_s[1:] != time_s[:-1])
    weighing = np.cumsum(new) - 1
    place = at_s[new]
    mean = _mean_by(mass_s, weighing, len(place))
    first = np.ones(len(place), dtype=np.bool_)
    first[1:] = place[1:] != place[:-1]
    last = np.roll(first, -1)
    before = np.roll(mean, 1)
    change = np.abs((mean.real - before.real) / mean.real)
    constant = ~first & (change <= CONSTANT_MASS)
    chosen[place[last]] = mean[last]  # else the last
    chosen[place[constant]] = mean[constant]  # ascending in time: the last one written stays
    several = _any_by(~first, place, n)
    not_constant = several & ~_any_by(constant, place, n)
    return chosen, not_constant


@dataclass(slots=True)
class _Salt:
    mass_g: Array  # left in the dry plug; 0 where none is
    volume_cm3: Array
    unknown: Mask  # said to be left, but how much cannot be told


def _water(bench: _Bench) -> tuple[Array, Array]:
    """Water distilled [g] and its salinity [g/kg] of each plug."""
    readings, n = bench.kind("distillation"), bench.n
    temperature = readings.number("trap_temperature_degc")
    temperature = np.where(np.isnan(temperature), 20.0, temperature)
    density, _ = tray(fluids.water_density_g_cm3, temperature_degc=temperature)
    water, _ = tray(
        saturation.water_mass_g,
        water_volume_cm3=readings.number("water_volume_cm3"),
        water_density_g_cm3=density,
    )
    return _mean_by(water, readings.at, n), _mean_by(
        readings.number("brine_salinity_g_per_kg"), readings.at, n
    )


def _salt(bench: _Bench, masses: _Masses) -> _Salt:
    """Salt that a plug kept when it was dried with brine in it."""
    distillation, n = bench.kind("distillation"), bench.n
    distilled = _first_text_by(distillation.text("salt"), distillation.at, n) == "left"
    left = (masses.salt == "left") | (distilled & (masses.salt != "leached"))
    water, brine_salinity = _water(bench)
    salinity = np.where(np.isnan(masses.salinity_g_kg), brine_salinity, masses.salinity_g_kg)
    by_mass, _ = tray(
        saturation.salt_left_mass_g,
        wet_mass_g=masses.saturated_g,
        dry_mass_g=masses.dry_g,
        salinity_g_kg=salinity,
    )
    by_water, _ = tray(saturation.salt_mass_g, water_mass_g=water, salinity_g_kg=salinity)
    mass = np.where(np.isnan(by_mass.real), by_water, by_mass)
    # Distilled as received, the salt is that of the water distilled; dried full of brine, of the brine.
    mass = np.where(distilled & ~np.isnan(by_water.real), by_water, mass)
    unknown = left & np.isnan(mass.real)
    mass = np.where(left & ~unknown, mass, 0.0)
    density = np.where(
        np.isnan(masses.salt_density_g_cm3), fluids.SALT_DENSITY_G_CM3, masses.salt_density_g_cm3
    )
    return _Salt(mass, mass / density, unknown)


@dataclass(slots=True)
class _Volumes:
    bulk: Outcome
    grain: Outcome
    pore: Outcome
    dry_mass: Outcome
    porosity: Outcome
    outcomes: list[Outcome]


def _immersed(bench: _Bench) -> tuple[Array, Texts, Texts, Mask, Mask]:
    """Bulk volume by immersion: value, how, reason, where the temperature is assumed, where rows failed."""
    readings, n = bench.kind("immersion"), bench.n
    temperature, assumed = bench.temperature(readings)
    liquid = readings.text("liquid")
    density = readings.number("liquid_density_g_cm3")
    given = ~np.isnan(density)
    table = np.full(len(density), np.nan, dtype=np.result_type(density, temperature))
    for name, compute in (
        ("mercury", fluids.mercury_density_g_cm3),
        ("water", fluids.water_density_g_cm3),
        ("toluene", fluids.toluene_density_g_cm3),
        ("ethanol", fluids.ethanol_density_g_cm3),
    ):
        here = (liquid == name) & ~given
        if here.any():
            table[here], _ = tray(compute, temperature_degc=temperature[here])
    density = np.where(given, density, table)
    displaced, why_displaced = tray(
        volumes.displaced_bulk_volume_cm3,
        mass_displaced_g=readings.number("mass_displaced_g"),
        liquid_density_g_cm3=density,
    )
    hung, why_hung = tray(
        volumes.buoyancy_bulk_volume_cm3,
        mass_in_air_g=readings.number("mass_in_air_g"),
        mass_immersed_g=readings.number("mass_immersed_g"),
        liquid_density_g_cm3=density,
    )
    coating_mass = readings.number("coating_mass_g")
    coating = coating_mass / readings.number("coating_density_g_cm3")
    coating = np.where(np.isnan(coating_mass), 0.0, coating)
    bulk = (
        np.where(np.isnan(displaced.real), hung, displaced) - coating - bench.jacket_volume_cm3[readings.at]
    )
    bulk = np.where(bulk.real > 0, bulk, np.nan)
    reason = np.where(why_displaced != "", why_displaced, why_hung)
    reason = np.where(
        np.isnan(density.real), "the density of the liquid is not given and has no table here", reason
    )
    reason = np.where(np.isnan(coating), "a coating without its density", reason)
    value = _mean_by(bulk, readings.at, n)
    by = np.where(np.isnan(displaced.real), "buoyancy", "displacement")
    how = _first_text_by(np.where(np.isnan(bulk.real), "", by), readings.at, n)
    return (
        value,
        how,
        _first_text_by(reason, readings.at, n),
        _any_by(assumed & ~given, readings.at, n),
        _any_by(np.isnan(bulk.real), readings.at, n),
    )


_CUP, _HOLDER = "cup", "holder"


def _expanded(bench: _Bench, kind: str, setup: str) -> tuple[Array, Texts, Mask]:
    """Row volumes by gas expansion with the calibration in force: value, reason, barometer assumed."""
    readings = bench.kind(kind)
    rows = len(readings)
    value = np.full(rows, np.nan + 0j)  # complex for the while: the calibration may be so, too
    reason = _texts(rows)
    barometer, assumed = bench.barometer(readings)
    warmer = np.ones(rows)
    if setup == _CUP:
        # The gas of the reference chamber expands into a cup of another temperature, where both are read.
        chamber, cup = readings.number("temperature_degc"), readings.number("cup_temperature_degc")
        ratio = (cup + ZERO_CELSIUS_K) / (chamber + ZERO_CELSIUS_K)
        warmer = np.where(np.isnan(ratio), 1.0, ratio)
    first = _absolute(readings, "reference_pressure", barometer)
    second = _absolute(readings, "expanded_pressure", barometer)
    moved = assumed & ~(_gauge(readings, "reference_pressure") & _gauge(readings, "expanded_pressure"))
    dates = readings.text("measured_on")
    instruments = readings.number("instrument_id").astype(np.intp)
    used: dict[int, tuple[list[int], CalibrationRows]] = {}
    for row in range(rows):
        if np.isnan(second[row].real):
            continue
        choice = in_force(bench.tray.calibrations.get((int(instruments[row]), setup), []), dates[row])
        if isinstance(choice, str):
            reason[row] = f"no calibration in force: {choice}"
            continue
        used.setdefault(id(choice), ([], choice))[0].append(row)
    for places, calibration in used.values():
        here = np.zeros(rows, dtype=np.bool_)
        here[places] = True
        fitted = _calibrate(bench, calibration, setup)
        if isinstance(fitted, str):
            reason[here] = f"the calibration '{calibration.name}' cannot be used: {fitted}"
            continue
        reference, other, moved_by_calibration = fitted
        columns = {
            "reference_pressure_kpa": first[here],
            "expanded_pressure_kpa": second[here],
            "barometric_pressure_kpa": barometer[here],
            "reference_volume_cm3": reference * warmer[here],
        }
        if setup == _HOLDER:
            value[here], reason[here] = tray(
                volumes.pore_volume_gas_expansion_cm3, dead_volume_cm3=other, **columns
            )
        else:
            billet = np.nan_to_num(readings.number("billet_volume_cm3"))
            value[here], reason[here] = tray(
                volumes.grain_volume_gas_expansion_cm3,
                cup_volume_cm3=other,
                billet_volume_cm3=billet[here],
                **columns,
            )
        moved = moved | (here & moved_by_calibration)
    if kind == "grain volume":
        reported = ~np.isnan(readings.number("grain_volume_cm3"))
        own = readings.number("grain_volume_cm3") - np.nan_to_num(readings.number("container_volume_cm3"))
        own = np.where(own.real > 0, own, np.nan)
        moved = moved & ~reported
        reason = np.where(reported, "", reason)
        reason[reported & np.isnan(own)] = "the container is not smaller than the volume measured"
        value = np.where(np.isnan(own), value, own)
    value = value if value.imag.any() else value.real
    return value, reason, moved


def _calibrate(bench: _Bench, calibration: CalibrationRows, setup: str) -> tuple[Any, Any, bool] | str:
    """Reference volume, cup or dead volume, and whether an assumed barometer moves them; or why not."""
    readings = calibration.readings
    barometer, assumed = bench.barometer(readings)
    compute = volumes.calibrate_holder if setup == _HOLDER else volumes.calibrate_cup
    try:
        fit = compute(
            readings.number("known_volume_cm3"),
            _absolute(readings, "reference_pressure", barometer),
            _absolute(readings, "expanded_pressure", barometer),
            barometer,
        )
    except Impossible as wrong:
        return str(wrong)
    gauge = _gauge(readings, "reference_pressure") & _gauge(readings, "expanded_pressure")
    return fit.reference_volume_cm3, fit.volume_cm3, bool((assumed & ~gauge).any())


def _volumes(bench: _Bench, shape: _Shape, masses: _Masses, salt: _Salt) -> _Volumes:
    n = bench.n
    immersed, how_immersed, why_immersed, temperature_assumed, immersion_failed = _immersed(bench)
    by_immersion = ~np.isnan(immersed.real)
    bulk_value = np.where(by_immersion, immersed, shape.bulk_volume_cm3)
    bulk_basis = np.where(by_immersion, how_immersed, "caliper").astype(object)

    readings = bench.kind("grain volume")
    rows, why_rows, moved_rows = _expanded(bench, "grain volume", _CUP)
    gross = _mean_by(rows, readings.at, n)
    grain_value = gross - bench.jacket_volume_cm3 - salt.volume_cm3
    grain_value = np.where(grain_value.real > 0, grain_value, np.nan)
    reported = _any_by(~np.isnan(readings.number("grain_volume_cm3")), readings.at, n)
    grain_basis = np.where(reported, "reported", "gas expansion").astype(object)

    by_liquid, why_liquid = _liquid_filled(bench, masses)
    by_gas, why_gas, moved_by_gas = _unstressed(bench)
    gassed = ~np.isnan(by_gas.real)
    pore_read = np.where(gassed, by_gas, by_liquid)
    why_pore = np.where(why_liquid == "", why_gas, why_liquid)

    # The order of preference: bulk-grain, bulk-pore, pore-grain, then summation of fluids.
    has_bulk, has_grain, has_pore = (~np.isnan(v.real) for v in (bulk_value, grain_value, pore_read))
    routes: list[tuple[str, Mask, Callable[..., Any], dict[str, ArrayLike]]] = [
        (
            "bulk-grain",
            has_bulk & has_grain,
            volumes.porosity_bulk_grain_frac,
            {"bulk_volume_cm3": bulk_value, "grain_volume_cm3": grain_value},
        ),
        (
            "bulk-pore",
            has_bulk & has_pore,
            volumes.porosity_bulk_pore_frac,
            {"bulk_volume_cm3": bulk_value, "pore_volume_cm3": pore_read},
        ),
        (
            "pore-grain",
            has_pore & has_grain,
            volumes.porosity_pore_grain_frac,
            {"pore_volume_cm3": pore_read, "grain_volume_cm3": grain_value},
        ),
    ]
    summed = _summation(bench)
    porosity_value = np.full(
        n, np.nan, dtype=np.result_type(bulk_value, grain_value, pore_read, summed.porosity)
    )
    route = _texts(n)
    refused = _texts(n)
    for name, able, compute, columns in routes:
        found, why = tray(compute, **columns)
        use = able & (route == "") & ~np.isnan(found.real)
        porosity_value[use], route[use] = found[use], name
        refused = np.where((route == "") & able & (refused == "") & (why != ""), why, refused)
    use = (route == "") & ~np.isnan(summed.porosity.real)
    porosity_value[use], route[use] = summed.porosity[use], "summation of fluids"

    pore_value = np.where(route == "bulk-grain", bulk_value - grain_value, pore_read)
    pore_value = np.where(
        (route == "summation of fluids") & has_bulk, porosity_value * bulk_value, pore_value
    )
    pore_basis = np.where(gassed, "gas expansion", "saturation").astype(object)
    pore_basis = np.where(route == "bulk-grain", "bulk less grain", pore_basis)
    pore_basis = np.where(route == "summation of fluids", "summation of fluids", pore_basis)
    derived_bulk = ~has_bulk & has_pore & has_grain
    bulk_value = np.where(derived_bulk, pore_read + grain_value, bulk_value)
    bulk_basis = np.where(derived_bulk, "pore and grain", bulk_basis)
    derived_grain = ~has_grain & has_bulk & has_pore & (pore_read.real < bulk_value.real)
    grain_value = np.where(derived_grain, bulk_value - pore_read, grain_value)
    grain_basis = np.where(derived_grain, "bulk less pore", grain_basis)

    no_immersion = ~_any_by(np.ones(len(bench.kind("immersion")), bool), bench.kind("immersion").at, n)
    no_dimensions = ~_any_by(np.ones(len(bench.kind("dimensions")), bool), bench.kind("dimensions").at, n)
    no_grain = ~_any_by(np.ones(len(readings), bool), readings.at, n)
    bulk = bench.outcome(
        "bulk volume",
        bulk_value,
        _why(
            bulk_value,
            why_immersed,
            shape.reason,
            (no_immersion & no_dimensions, "no readings"),
            otherwise="dimensions or immersion incomplete",
        ),
        bulk_basis,
    )
    bulk.flag(TEMPERATURE_ASSUMED, by_immersion & temperature_assumed)
    bulk.flag("some immersion readings not used", immersion_failed)
    grain = bench.outcome(
        "grain volume",
        grain_value,
        _why(
            grain_value,
            _first_text_by(why_rows, readings.at, n),
            (no_grain, "no readings"),
            (gross.real > bench.jacket_volume_cm3.real, "the salt left is more than the volume measured"),
            otherwise="the jacket is not smaller than the volume measured",
        ),
        grain_basis,
    )
    moved = _any_by(moved_rows & ~np.isnan(rows.real), readings.at, n) & ~derived_grain
    grain.flag(BAROMETER_ASSUMED, moved)
    grain.flag("corrected for salt left", (salt.mass_g.real > 0) & ~derived_grain)
    grain.flag("salt left not corrected: amount unknown", salt.unknown & ~derived_grain)
    some = _any_by(why_rows != "", readings.at, n)
    grain.flag("some grain volume readings not used", some & ~derived_grain)
    pore = bench.outcome(
        "pore volume",
        pore_value,
        _why(
            pore_value,
            refused,
            why_pore,
            (~has_bulk & ~has_grain & ~has_pore, "no readings"),
            (~has_grain & has_bulk, "no grain volume"),
            (~has_bulk & has_grain, "no bulk volume"),
            otherwise="two of bulk, grain and pore volume are needed",
        ),
        pore_basis,
    )
    uses_pore = np.isin(route, ["bulk-pore", "pore-grain"])
    from_received = masses.saturated_taken_from_received & ~gassed
    pore.flag("mass as received taken as saturated", from_received & uses_pore)
    pore.flag(BAROMETER_ASSUMED, moved_by_gas & uses_pore)
    porosity = bench.outcome(
        "porosity",
        porosity_value,
        _why(
            porosity_value,
            refused,
            (~has_bulk & ~has_grain & ~has_pore, "no readings"),
            (has_bulk & ~has_grain & ~has_pore, "no grain or pore volume"),
            (has_grain & ~has_bulk & ~has_pore, "no bulk or pore volume"),
            otherwise="two of bulk, grain and pore volume are needed",
        ),
        route,
    )
    dry_value = masses.dry_g - salt.mass_g
    dry_value = np.where(dry_value.real > 0, dry_value, np.nan)
    no_masses = ~_any_by(np.ones(len(bench.kind("masses")), bool), bench.kind("masses").at, n)
    dry = bench.outcome(
        "dry mass",
        dry_value,
        _why(
            dry_value,
            (no_masses, "no readings"),
            (np.isnan(masses.dry_g.real), "no dry weighing, or a tare as heavy as the plug"),
            otherwise="the salt left is more than the mass",
        ),
    )
    dry.flag("not dried to constant mass", masses.dry_not_constant)
    dry.flag("corrected for salt left", salt.mass_g.real > 0)
    dry.flag("salt left not corrected: amount unknown", salt.unknown)
    bulk_grain, bulk_pore, pore_grain, summation = (
        route == name for name in ("bulk-grain", "bulk-pore", "pore-grain", "summation of fluids")
    )
    for heir, source, where in (
        (bulk, pore, derived_bulk),
        (bulk, grain, derived_bulk),
        (grain, pore, derived_grain),
        (grain, bulk, derived_grain),
        (pore, bulk, bulk_grain | summation),
        (pore, grain, bulk_grain),
        (porosity, bulk, bulk_grain | bulk_pore),
        (porosity, grain, bulk_grain | pore_grain),
        (porosity, pore, bulk_pore | pore_grain),
    ):
        heir.inherit(source, where)
    too_large = has_bulk & has_grain & ~bulk_grain
    for outcome in (pore, porosity):
        outcome.flag("grain volume not less than the bulk volume", too_large)
    grain_density = _density(bench, "grain density", volumes.grain_density_g_cm3, dry, grain)
    bulk_density = _density(bench, "bulk density", volumes.bulk_density_g_cm3, dry, bulk)
    return _Volumes(
        bulk,
        grain,
        pore,
        dry,
        porosity,
        [bulk, grain, pore, dry, porosity, grain_density, bulk_density],
    )


def _unstressed(bench: _Bench) -> tuple[Array, Texts, Mask]:
    """Pore volume by gas expansion in a holder without net stress: value, reason, barometer assumed."""
    readings, n = bench.kind("pore volume"), bench.n
    rows, why, moved = _expanded(bench, "pore volume", _HOLDER)
    free = readings.number("net_confining_stress_mpa").real == 0.0
    used = free & ~np.isnan(rows.real)
    return (
        _mean_by(np.where(free, rows, np.nan), readings.at, n),
        _first_text_by(np.where(free, why, ""), readings.at, n),
        _any_by(moved & used, readings.at, n),
    )


def _liquid_filled(bench: _Bench, masses: _Masses) -> tuple[Array, Texts]:
    """Pore volume from the liquid that fills the pores; with the salt it left behind, where it did."""
    fluid, why_fluid = tray(
        saturation.pore_fluid_mass_g,
        wet_mass_g=masses.saturated_g,
        dry_mass_g=masses.dry_g,
        salinity_g_kg=masses.salinity_g_kg,
    )
    with_salt, _ = tray(
        saturation.liquid_volume_cm3,
        liquid_mass_g=fluid,
        liquid_density_g_cm3=masses.saturant_density_g_cm3,
    )
    clean, why_clean = tray(
        volumes.pore_volume_saturation_cm3,
        saturated_mass_g=masses.saturated_g,
        dry_mass_g=masses.dry_g,
        saturant_density_g_cm3=masses.saturant_density_g_cm3,
    )
    left = (masses.salt == "left") & ~np.isnan(masses.salinity_g_kg)
    value = np.where(left, with_salt, clean)
    reason = np.where(left, why_fluid, why_clean)
    wet, dry = ~np.isnan(masses.saturated_g.real), ~np.isnan(masses.dry_g.real)
    reason = np.where(wet & ~dry, "a saturated mass without a dry one", reason)
    reason = np.where(
        wet & dry & np.isnan(masses.saturant_density_g_cm3), "no density of the saturant", reason
    )
    return value, reason.astype(object)


def _density(
    bench: _Bench, quantity: str, compute: Callable[..., Any], mass: Outcome, volume: Outcome
) -> Outcome:
    name = "grain_volume_cm3" if quantity == "grain density" else "bulk_volume_cm3"
    value, why = tray(compute, dry_mass_g=mass.value, **{name: volume.value})
    no_mass, no_volume = np.isnan(mass.value.real), np.isnan(volume.value.real)
    outcome = bench.outcome(
        quantity,
        value,
        _why(
            value,
            why,
            (no_mass & (mass.reason == "no readings"), "no readings"),
            (no_mass, "no dry mass"),
            (no_volume & (volume.reason == "no readings"), "no readings"),
            (no_volume, f"no {volume.quantity}"),
            otherwise="",
        ),
    )
    outcome.inherit(mass)
    outcome.inherit(volume)
    return outcome


def _stressed(bench: _Bench, volume: _Volumes) -> list[Outcome]:
    """Pore volume under stress in the holder, and the porosity and bulk volume that go with it."""
    readings = bench.kind("pore volume")
    stress = readings.number("net_confining_stress_mpa").real
    under = stress > 0.0
    if not under.any():
        return []
    rows, why_rows, moved = _expanded(bench, "pore volume", _HOLDER)
    rows, why_rows, moved = rows[under], why_rows[under], moved[under]
    places, group = _groups(readings.at[under], stress[under].round(9))
    at, at_stress = places[0].astype(np.intp), places[1]
    m = len(at)
    pore = _mean_by(rows, group, m)
    why = _first_text_by(why_rows, group, m)
    grain = volume.grain.value[at]
    porosity, why_porosity = tray(
        volumes.porosity_pore_grain_frac, pore_volume_cm3=pore, grain_volume_cm3=grain
    )
    no_grain = (np.isnan(grain.real), "no grain volume")
    # Without grains, the bulk volume at rest stands in for that under stress, which is a little smaller.
    at_rest, _ = tray(
        volumes.porosity_bulk_pore_frac, bulk_volume_cm3=volume.bulk.value[at], pore_volume_cm3=pore
    )
    by_bulk = no_grain[0] & ~np.isnan(at_rest.real)
    porosity = np.where(by_bulk, at_rest, porosity)
    route = np.where(by_bulk, "bulk-pore", "pore-grain").astype(object)

    def outcome(quantity: str, value: Array, basis: str | Texts, *reasons: Any) -> Outcome:
        made = Outcome(
            quantity,
            at,
            value,
            _why(value, *reasons, otherwise="no pore volume under stress"),
            _texts(m, basis) if isinstance(basis, str) else basis,
            stress_mpa=at_stress,
        )
        made.flag(BAROMETER_ASSUMED, _any_by(moved, group, m))
        return made

    made = [
        outcome("pore volume", pore, "gas expansion", why),
        outcome("porosity", porosity, route, why, (no_grain[0], "no grain or bulk volume"), why_porosity),
        outcome("bulk volume", pore + grain, "pore and grain", why, no_grain),
    ]
    for item in made[1:]:
        for text, mask in volume.grain.flags.items():
            item.flag(text, mask[at])
    for text, mask in volume.bulk.flags.items():
        made[1].flag(text, mask[at] & by_bulk)
    made[1].flag("bulk volume not under stress", by_bulk)
    for item in made:
        item.flag("some pore volume readings not used", _any_by(why_rows != "", group, m))
    return made


def _groups(*columns: ArrayLike) -> tuple[list[Array], Whole]:
    """The different rows of `columns`, sorted, and for each row the number of its group."""
    import pandas as pd

    frame = pd.DataFrame({i: np.asarray(c) for i, c in enumerate(columns)})
    group = np.asarray(frame.groupby(list(frame.columns), sort=True, dropna=False).ngroup(), dtype=np.intp)
    first = frame.assign(group=group).drop_duplicates("group").sort_values("group")
    return [first[i].to_numpy() for i in range(len(columns))], group


def _flow_ends(readings: Readings, barometer: Array) -> tuple[Array, Array, Mask, Mask]:
    """Upstream and downstream pressure [kPa absolute], and on which of them the barometer bears."""
    downstream = _absolute(readings, "downstream_pressure", barometer)
    no_downstream = np.isnan(downstream)
    downstream = np.where(no_downstream, barometer, downstream)
    upstream = _absolute(readings, "upstream_pressure", barometer)
    end_bears = no_downstream | _gauge(readings, "downstream_pressure")
    start_bears = _gauge(readings, "upstream_pressure")
    if "pressure_difference_kpa" in readings.numbers:
        by_difference = np.isnan(upstream)
        upstream = np.where(by_difference, downstream + readings.number("pressure_difference_kpa"), upstream)
        start_bears = np.where(by_difference, end_bears, start_bears)
    return upstream, downstream, start_bears, end_bears


def _gas_permeability(bench: _Bench, shape: _Shape) -> list[Outcome]:
    """Gas permeability of each step, and Klinkenberg permeability with slip factor of each line."""
    readings = bench.kind("gas permeability")
    steps: list[Outcome] = []
    lines: list[Outcome] = []
    if len(readings):
        steps, lines = _steady_state(bench, shape, readings)
    return [*steps, *_with_reported(bench, lines)]


def _steady_state(bench: _Bench, shape: _Shape, readings: Readings) -> tuple[list[Outcome], list[Outcome]]:
    row_at, row_gas, row_direction = readings.at, readings.text("gas"), readings.text("direction")
    barometer, assumed = bench.barometer(readings)
    upstream, downstream, start_bears, end_bears = _flow_ends(readings, barometer)
    row_temperature, temperature_assumed = bench.temperature(readings)
    row_mean = (upstream + downstream) / 2.0
    viscosity, _ = tray(
        fluids.gas_viscosity_mpas,
        gas=row_gas.astype(str),
        temperature_degc=row_temperature,
        pressure_kpa=row_mean,
    )

    standard = readings.text("flow_basis") == "standard"
    metered = _absolute(readings, "flow_pressure", barometer)
    meter_bears = ~standard & (np.isnan(metered) | _gauge(readings, "flow_pressure"))
    metered = np.where(np.isnan(metered), barometer, metered)
    metered_t = readings.number("flow_temperature_degc")
    metered_t = np.where(np.isnan(metered_t), row_temperature, metered_t)
    standard_p, standard_t = (
        readings.number("standard_pressure_kpa"),
        readings.number("standard_temperature_degc"),
    )
    metered = np.where(standard, np.where(np.isnan(standard_p), ATMOSPHERE_KPA, standard_p), metered)
    metered_t = np.where(standard, np.where(np.isnan(standard_t), 20.0, standard_t), metered_t)

    flow, why_flow = tray(
        gas_flow.flow_rate_at_cm3_s,
        flow_rate_cm3_s=readings.number("flow_rate_cm3_per_s"),
        flow_pressure_kpa=metered,
        flow_temperature_degc=metered_t,
        pressure_kpa=downstream,
        temperature_degc=row_temperature,
    )
    factor = readings.number("geometric_factor")
    length = shape.net_length_cm[row_at]
    # k = 2 mu q p E/(L (p1² - p2²)): the factor stands for the length over which, the length for the area.
    special = ~np.isnan(factor)
    row_k, why = tray(
        gas_flow.gas_permeability_md,
        flow_rate_cm3_s=flow,
        flow_pressure_kpa=downstream,
        upstream_pressure_kpa=upstream,
        downstream_pressure_kpa=downstream,
        viscosity_mpas=viscosity,
        length_cm=np.where(special, factor, length),
        area_cm2=np.where(special, length, shape.area_cm2[row_at]),
    )
    across = np.isin(row_direction, ["max", "90"]) & ~special
    sound = (row_k.real > 0) & np.isfinite(row_k.real)  # absurd readings overflow
    row_k = np.where(across | ~sound, np.nan, row_k)
    no_shape = np.where(special, np.isnan(length.real), np.isnan(shape.area_cm2[row_at].real))
    row_reason = _why(
        row_k,
        (across, "flow across the core needs a geometric factor"),
        (no_shape, "no length and diameter"),
        why,
        why_flow,
        otherwise="the readings of the step are incomplete",
    )

    net, sleeve, unstated = _net_stress(readings, barometer, row_mean)
    _, own = _groups(row_at, row_direction, row_gas)
    one_stress = _joined(_alike(net, own, SAME_STRESS), _alike(sleeve, own, SAME_STRESS))
    places, line_of = _groups(row_at, row_direction, row_gas, one_stress)
    line_at = places[0].astype(np.intp)
    m = len(line_at)
    line_direction, line_gas = places[1].astype(object), places[2].astype(object)
    line_stress = _mean_by(net, line_of, m).round(9)

    # Equal-key repeats are one step, their mean; what could not be computed does not enter it.
    _, step_of = _groups(line_of, readings.text("step"), readings.text("measured_on"))
    _, first = np.unique(step_of, return_index=True)
    steps = len(first)
    there = ~np.isnan(row_k.real)
    counted = there | ~_any_by(there, step_of, steps)[step_of]

    def by_step(column: Array) -> Array:
        return _mean_by(np.where(counted, column, np.nan), step_of, steps)

    k, mean, temperature = by_step(row_k), by_step(row_mean), by_step(row_temperature)
    group, at, gas, direction = line_of[first], row_at[first], row_gas[first], row_direction[first]
    labels = _step_labels(readings, first, group)
    reason = _why(k, _first_text_by(row_reason, step_of, steps), otherwise="")

    def outcome(quantity: str, value: Array, why_missing: Texts) -> Outcome:
        return Outcome(
            quantity,
            at,
            value,
            why_missing,
            gas,
            direction=direction,
            stress_mpa=line_stress[group],
            step=labels,
        )

    gas_k = outcome("gas permeability", k, reason)
    mean_p = outcome("mean pressure", mean, _why(mean, otherwise="the readings of the step are incomplete"))
    moved = assumed & counted
    for flagged, bears in ((gas_k, start_bears | end_bears | meter_bears), (mean_p, start_bears | end_bears)):
        flagged.flag(BAROMETER_ASSUMED, _any_by(moved & bears, step_of, steps))
    gas_k.flag(TEMPERATURE_ASSUMED, _any_by(temperature_assumed & counted, step_of, steps))
    gas_k.flag(STRESS_NOT_STATED, _any_by(unstated & counted, step_of, steps))
    gas_k.flag("confining pressure below the pore pressure", _any_by((net < 0.0) & counted, step_of, steps))

    good = ~np.isnan(k.real)
    line = _fit_lines(k, mean, temperature, gas, group, good, m)
    for text, mask in gas_k.flags.items():
        line.doubts[text] = _any_by(mask & good, group, m)
    line.doubts["some steps not used"] = _any_by(~good, group, m)
    why_line = _first_text_by(reason, group, m)
    made = []
    for quantity, value in (
        ("klinkenberg permeability", line.k_md),
        ("slip factor", line.slip_kpa),
    ):
        of_line = Outcome(
            quantity,
            line_at,
            value,
            _why(value, line.reason, why_line, otherwise="no step could be used"),
            line.basis,
            direction=line_direction,
            stress_mpa=line_stress,
            step=line_gas,
        )
        for text, mask in line.doubts.items():
            of_line.flag(text, mask)
        made.append(of_line)
    return [gas_k, mean_p], made


def _net_stress(readings: Readings, barometer: Array, mean: Array) -> tuple[Array, Array, Mask]:
    """Net stress of each row [MPa], 0 where not stated; the sleeve's pressure as read; where not stated.

    Where the confining pressure was read, the net stress is that less the mean pore pressure.
    """
    stated = readings.number("net_confining_stress_mpa").real
    confining = _absolute(readings, "confining_pressure", barometer).real
    net = np.where(np.isnan(stated), (confining - mean.real) / 1000.0, stated)
    sleeve = np.where(np.isnan(stated), readings.number("confining_pressure_kpa").real, np.nan)
    return np.nan_to_num(net), sleeve, np.isnan(net)


def _alike(values: Array, own: Whole, share: float) -> Whole:
    """Numbers the values of each `own` that follow one another within `share`; NaN is like nothing."""
    order = np.lexsort((values, own))
    v, o = values[order], own[order]
    new = np.ones(len(order), dtype=np.bool_)
    new[1:] = (o[1:] != o[:-1]) | ~(np.diff(v) <= share * np.abs(v[1:]))
    group = np.empty(len(order), dtype=np.intp)
    group[order] = np.cumsum(new) - 1
    return group


def _joined(a: Whole, b: Whole) -> Whole:
    """Groups that keep together what either of two groupings keeps together.

    On a sleeve held at one pressure the net stress falls from step to step; with the net stress held, the
    pressure rises. Both are one stress.
    """
    joined = a
    while True:
        before = joined
        for group in (b, a):
            least = np.full(len(group), len(group), dtype=np.intp)
            np.minimum.at(least, group, joined)
            joined = least[group]
        if np.array_equal(joined, before):
            return joined


def _step_labels(readings: Readings, first: Whole, line: Whole) -> Texts:
    """A label of its own for each step of a line: gas and step, and the date where it was made again."""
    gas, names, dates = (readings.text(name)[first] for name in ("gas", "step", "measured_on"))
    key = list(zip(line.tolist(), names, strict=True))
    count = Counter(key)
    return np.array(
        [
            f"{g} {name} {date}".strip() if count[k] > 1 else f"{g} {name}"
            for g, name, date, k in zip(gas, names, dates, key, strict=True)
        ],
        dtype=object,
    )


@dataclass(slots=True)
class _Lines:
    k_md: Array
    slip_kpa: Array
    basis: Texts
    reason: Texts
    doubts: dict[str, Mask]


def _fit_lines(
    k: Array, mean: Array, temperature: Array, gas: Texts, group: Whole, good: Mask, m: int
) -> _Lines:
    """Regression on 1/p where three mean pressures or more are there, else a published slip law."""
    k_line = np.full(m, np.nan, dtype=k.dtype)
    slip = np.full(m, np.nan, dtype=k.dtype)
    basis = _texts(m)
    reason = _texts(m)
    doubts: dict[str, Mask] = {}
    if not good.any():
        return _Lines(k_line, slip, basis, reason, doubts)
    pressures = _alike(mean.real[good], group[good], SAME_PRESSURE)
    _, one_each = np.unique(pressures, return_index=True)
    enough = np.bincount(group[good][one_each], minlength=m) >= 3
    fitted = good & enough[group]
    fit = gas_flow.klinkenberg_regression(k[fitted], mean[fitted], group[fitted])
    size = len(fit.k_infinity_md)
    found = np.zeros(m, dtype=np.bool_)
    found[:size] = ~np.isnan(fit.k_infinity_md.real)
    refused = np.zeros(m, dtype=np.bool_)
    refused[:size] = fit.refused
    use = found & ~refused
    k_line[use], slip[use] = fit.k_infinity_md[use[:size]], fit.slip_factor_kpa[use[:size]]
    basis[use] = "measured"
    reason[refused] = (
        "the regression on reciprocal mean pressure gives a permeability below zero: check the steps"
    )
    few = ~found & _any_by(good, group, m)
    rows = good & few[group]
    if rows.any():
        single, _ = tray(
            gas_flow.slip_corrected_md,
            gas_permeability_md=k[rows],
            mean_pressure_kpa=mean[rows],
            gas=gas[rows].astype(str),
            temperature_degc=temperature[rows],
        )
        b = (k[rows] / single - 1.0) * mean[rows]
        k_line = np.where(few, _mean_by(single, group[rows], m), k_line)
        slip = np.where(few, _mean_by(b, group[rows], m), slip)
        basis[few] = "estimated"
        doubts["slip estimated from a published law"] = few
    doubts["slip factor not positive"] = use & (slip.real <= 0.0)
    return _Lines(k_line, slip, basis, reason, doubts)


def _with_reported(bench: _Bench, lines: list[Outcome]) -> list[Outcome]:
    """Add what pressure-decay and probe instruments report, where no steps were measured."""
    readings = bench.kind("reported permeability")
    if not len(readings):
        return lines
    at, direction = readings.at, readings.text("direction")
    stress = readings.number("net_confining_stress_mpa").real
    places, group = _groups(at, direction, np.nan_to_num(stress).round(9))
    line_at = places[0].astype(np.intp)
    m = len(line_at)
    line_stress = places[2]
    k, k_limit = (
        readings.number("klinkenberg_permeability_md"),
        readings.text("klinkenberg_permeability_limit"),
    )
    gas_k, gas_limit = readings.number("gas_permeability_md"), readings.text("gas_permeability_limit")
    mean, gas = readings.number("mean_pressure_kpa"), readings.text("gas")
    temperature = np.full(len(readings), bench.tray.temperature_degc)
    from_gas = np.isnan(k) & ~np.isnan(gas_k) & ~np.isnan(mean) & (gas != "")
    estimate = np.full(len(k), np.nan, dtype=np.result_type(gas_k, mean, temperature))
    if from_gas.any():
        estimate[from_gas], _ = tray(
            gas_flow.slip_corrected_md,
            gas_permeability_md=gas_k[from_gas],
            mean_pressure_kpa=mean[from_gas],
            gas=gas[from_gas].astype(str),
            temperature_degc=temperature[from_gas],
        )
    # A limit alone is a limit; beside proper values it says less than they do.
    value = np.where(np.isnan(k), estimate, k)
    limit = np.where(np.isnan(k), gas_limit, k_limit).astype(object)
    proper = _any_by((limit == "") & ~np.isnan(value), group, m)
    counted = np.where(proper[group] & (limit != ""), np.nan, value)
    k_line = _mean_by(counted, group, m)
    line_limit = np.where(proper, "", _first_text_by(limit, group, m)).astype(object)
    line_estimated = _any_by(from_gas & ~np.isnan(counted), group, m)
    common: dict[str, Any] = {
        "direction": places[1].astype(object),
        "stress_mpa": line_stress,
        "step": _texts(m, "reported"),
    }
    basis = _texts(m, "reported")
    reason = "a reported gas permeability needs gas and mean pressure to be corrected for slip"
    outcome = Outcome(
        "klinkenberg permeability",
        line_at,
        k_line,
        _why(k_line, otherwise=reason),
        basis,
        limit=line_limit,
        **common,
    )
    outcome.flag("slip estimated from a published law", line_estimated)
    outcome.flag(STRESS_NOT_STATED, _any_by(np.isnan(stress), group, m))
    for word in ("below", "above"):
        outcome.flag(f"klinkenberg permeability {word} limit", line_limit == word)
    slip = _mean_by(readings.number("slip_factor_kpa"), group, m)
    implied = _mean_by((gas_k / estimate - 1.0) * mean, group, m)
    estimated = np.isnan(slip) & ~np.isnan(implied)
    slip_out = Outcome(
        "slip factor",
        line_at,
        np.where(estimated, implied, slip),
        _why(np.where(estimated, implied, slip), otherwise="not reported by the instrument"),
        np.where(estimated, "estimated", "reported").astype(object),
        **common,
    )
    made = [*lines, outcome, slip_out]
    if not np.isnan(gas_k).all():
        proper_gas = _any_by((gas_limit == "") & ~np.isnan(gas_k), group, m)
        gas_value = _mean_by(np.where(proper_gas[group] & (gas_limit != ""), np.nan, gas_k), group, m)
        gas_words = np.where(proper_gas, "", _first_text_by(gas_limit, group, m)).astype(object)
        gas_line = Outcome(
            "gas permeability",
            line_at,
            gas_value,
            _why(gas_value, otherwise="not reported by the instrument"),
            _first_text_by(gas, group, m),
            limit=gas_words,
            **common,
        )
        for word in ("below", "above"):
            gas_line.flag(f"gas permeability {word} limit", gas_words == word)
        mean_value = _mean_by(mean, group, m)
        made += [
            gas_line,
            Outcome(
                "mean pressure",
                line_at,
                mean_value,
                _why(mean_value, otherwise="not reported by the instrument"),
                _first_text_by(gas, group, m),
                **common,
            ),
        ]
    inertia = _mean_by(readings.number("inertial_coefficient_per_m"), group, m)
    if not np.isnan(inertia).all():
        made.append(
            Outcome(
                "inertial coefficient",
                line_at,
                inertia,
                _why(inertia, otherwise="not reported by the instrument"),
                _texts(m, "reported"),
                **common,
            )
        )
    return made


def _liquid_permeability(bench: _Bench, shape: _Shape) -> list[Outcome]:
    """Liquid permeability: the mean of the steps of each plug and stress."""
    readings = bench.kind("liquid permeability")
    if not len(readings):
        return []
    at = readings.at
    barometer, assumed = bench.barometer(readings)
    upstream, downstream, start_bears, end_bears = _flow_ends(readings, barometer)
    moved = assumed & (start_bears != end_bears)  # only the difference of the ends counts
    viscosity = readings.number("viscosity_mpas")
    k, why = tray(
        gas_flow.liquid_permeability_md,
        flow_rate_cm3_s=readings.number("flow_rate_cm3_per_s"),
        upstream_pressure_kpa=upstream,
        downstream_pressure_kpa=downstream,
        viscosity_mpas=viscosity,
        length_cm=shape.net_length_cm[at],
        area_cm2=shape.area_cm2[at],
    )
    stress = readings.number("net_confining_stress_mpa").real
    places, group = _groups(at, np.nan_to_num(stress).round(9))
    m = len(places[0])
    value = _mean_by(k, group, m)
    reason = _why(
        k,
        (np.isnan(shape.area_cm2[at].real), "no length and diameter"),
        (np.isnan(viscosity), "no viscosity of the liquid"),
        why,
        otherwise="the readings of the step are incomplete",
    )
    outcome = Outcome(
        "liquid permeability",
        places[0].astype(np.intp),
        value,
        _why(value, _first_text_by(reason, group, m), otherwise="no step could be used"),
        _first_text_by(readings.text("liquid"), group, m),
        stress_mpa=places[1],
    )
    outcome.flag(STRESS_NOT_STATED, _any_by(np.isnan(stress), group, m))
    outcome.flag(BAROMETER_ASSUMED, _any_by(moved, group, m))
    return [outcome]


@dataclass(slots=True)
class _Summation:
    porosity: Array
    oil: Array
    water: Array
    gas: Array


def _summation(bench: _Bench) -> _Summation:
    """Porosity and saturations by summation of fluids from a retort, rows of one plug averaged."""
    readings, n = bench.kind("retort"), bench.n
    nothing = np.full(n, np.nan)
    if not len(readings):
        return _Summation(nothing, nothing, nothing, nothing)
    mass, bulk = readings.number("sample_mass_g"), readings.number("sample_bulk_volume_cm3")
    gas_mass = readings.number("gas_sample_mass_g")
    gas_bulk = readings.number("gas_sample_bulk_volume_cm3")
    own = np.isnan(gas_mass) & np.isnan(gas_bulk)  # gas read on the piece that is retorted
    gas_bulk = np.where(own, bulk, np.where(np.isnan(gas_bulk), gas_mass * bulk / mass, gas_bulk))
    found, _ = tray(
        saturation.summation_of_fluids,
        sample_bulk_volume_cm3=bulk,
        water_volume_cm3=readings.number("water_volume_cm3"),
        oil_volume_cm3=readings.number("oil_volume_cm3"),
        gas_sample_bulk_volume_cm3=gas_bulk,
        gas_volume_cm3=readings.number("gas_volume_cm3"),
    )
    return _Summation(
        _mean_by(found.porosity_frac, readings.at, n),
        _mean_by(found.oil_saturation_frac, readings.at, n),
        _mean_by(found.water_saturation_frac, readings.at, n),
        _mean_by(found.gas_saturation_frac, readings.at, n),
    )


def _saturations(bench: _Bench, masses: _Masses, volume: _Volumes) -> list[Outcome]:
    """Oil, water and gas as fractions of the ambient pore volume: distillation before retort."""
    readings, n = bench.kind("distillation"), bench.n
    at = readings.at
    temperature = readings.number("trap_temperature_degc")
    temperature = np.where(np.isnan(temperature), 20.0, temperature)
    water_density, _ = tray(fluids.water_density_g_cm3, temperature_degc=temperature)
    salinity = readings.number("brine_salinity_g_per_kg")
    fresh = np.isnan(salinity)
    salinity = np.where(fresh, 0.0, salinity)
    brine_density = readings.number("brine_density_g_cm3")
    computed, _ = tray(fluids.brine_density_g_cm3, salinity_g_kg=salinity, temperature_degc=temperature)
    computed = np.where(salinity.real == 0.0, water_density, computed)
    brine_density = np.where(np.isnan(brine_density), computed, brine_density)
    water, _ = tray(
        saturation.water_mass_g,
        water_volume_cm3=readings.number("water_volume_cm3"),
        water_density_g_cm3=water_density,
    )
    brine, _ = tray(
        saturation.brine_volume_cm3,
        water_mass_g=water,
        salinity_g_kg=salinity,
        brine_density_g_cm3=brine_density,
    )
    salt = readings.text("salt").astype(str)
    received, dry = masses.received_g[at], masses.dry_g[at]
    oil_mass, why_oil = tray(
        saturation.oil_mass_g,
        received_mass_g=received,
        dry_mass_g=dry,
        water_mass_g=water,
        salinity_g_kg=salinity,
        salt=salt,
    )
    oil_density = readings.number("oil_density_g_cm3")
    brine_v = _mean_by(brine, at, n)
    oil_v = _mean_by(oil_mass / oil_density, at, n)
    pore = np.where(volume.pore.value.real > 0, volume.pore.value, np.nan)
    water_s, oil_s = brine_v / pore, oil_v / pore
    retort = _summation(bench)
    distilled = _any_by(np.ones(len(readings), bool), at, n)
    by_retort = ~distilled & ~np.isnan(retort.water.real)
    water_s = np.where(by_retort, retort.water, water_s)
    oil_s = np.where(by_retort, retort.oil, oil_s)
    gas_s = np.where(by_retort, retort.gas, 1.0 - water_s - oil_s)
    basis = np.where(by_retort, "retort", "distillation").astype(object)
    retorted = _any_by(np.ones(len(bench.kind("retort")), bool), bench.kind("retort").at, n)
    no_pore = np.isnan(pore.real)
    why = _first_text_by(why_oil, at, n)
    made = []
    for quantity, value in (
        ("oil saturation", oil_s),
        ("water saturation", water_s),
        ("gas saturation", gas_s),
    ):
        no_masses = (
            np.isnan(masses.received_g.real) | np.isnan(masses.dry_g.real),
            "no mass as received and dry",
        )
        reasons: list[Any] = [
            (~distilled & ~retorted, "no readings"),
            (distilled & no_pore, "no pore volume"),
        ]
        if quantity != "water saturation":
            reasons += [no_masses, why]
        reasons.append((retorted, "the retort has no gas volume, or impossible readings"))
        outcome = bench.outcome(
            quantity,
            value,
            _why(value, *reasons, otherwise="the readings are incomplete"),
            basis,
        )
        outcome.inherit(volume.pore, ~by_retort)
        outcome.flag("brine taken as fresh water", _any_by(fresh, at, n) & ~by_retort)
        outcome.flag("saturations sum beyond plausible limits", (water_s + oil_s).real > MOST_SATURATION)
        outcome.flag("saturation below zero", value.real < -0.02)
        made.append(outcome)
    return made


_TESTS = {
    "permeability": ("gas permeability", "klinkenberg permeability", "slip factor", "liquid permeability"),
    "gas permeability": ("gas permeability", "klinkenberg permeability", "slip factor"),
    "klinkenberg permeability": ("klinkenberg permeability", "slip factor"),
    "saturations": ("oil saturation", "water saturation", "gas saturation"),
    "distillation": ("oil saturation", "water saturation", "gas saturation"),
    "retort": ("oil saturation", "water saturation", "gas saturation"),
    "dimensions": ("bulk volume",),
    "immersion": ("bulk volume",),
    "masses": ("dry mass",),
}


def _mark_not_measured(bench: _Bench, outcomes: list[Outcome]) -> None:
    """Put the stated reason where a test was not made; a plug without any line of a test gets a row."""
    readings = bench.kind("not measured")
    stated: dict[tuple[int, str], str] = {}
    for place, test, reason in zip(readings.at, readings.text("test"), readings.text("reason"), strict=True):
        for quantity in _TESTS.get(test, (test,)):
            stated[int(place), quantity] = f"not measured: {reason}"
    have: dict[str, set[int]] = {}
    for outcome in outcomes:
        have.setdefault(outcome.quantity, set()).update(outcome.at.tolist())
        for i in np.flatnonzero(np.isnan(outcome.value.real)):
            reason = stated.get((int(outcome.at[i]), outcome.quantity))
            if reason and outcome.reason[i] in {"", "no readings"}:
                outcome.reason[i] = reason
    for quantity in ("klinkenberg permeability",):
        absent = [p for p in range(bench.n) if p not in have.get(quantity, set())]
        if absent:
            outcomes.append(
                Outcome(
                    quantity,
                    np.array(absent, dtype=np.intp),
                    np.full(len(absent), np.nan),
                    np.array([stated.get((p, quantity), "no readings") for p in absent], dtype=object),
                    _texts(len(absent)),
                )
            )


def _mark_implausible(outcomes: list[Outcome]) -> None:
    for outcome in outcomes:
        low, high = RESULTS[outcome.quantity].plausible
        odd = (outcome.value.real < low) | (outcome.value.real > high)
        outcome.flag(f"{outcome.quantity} outside the usual range", odd)


#: What an instrument gives as a result of its own has no formula here.
REPORTED = "reported"
_METHODS: dict[tuple[str, str], str] = {
    ("bulk volume", "caliper"): "bulk-volume-caliper",
    ("bulk volume", "displacement"): "bulk-volume-displacement",
    ("bulk volume", "buoyancy"): "bulk-volume-buoyancy",
    ("bulk volume", "pore and grain"): "porosity-pore-grain",
    ("grain volume", "gas expansion"): "grain-volume-gas-expansion",
    ("grain volume", "bulk less pore"): "porosity-bulk-pore",
    ("pore volume", "bulk less grain"): "porosity-bulk-grain",
    ("pore volume", "saturation"): "pore-volume-saturation",
    ("pore volume", "gas expansion"): "pore-volume-gas-expansion",
    ("pore volume", "summation of fluids"): "summation-of-fluids",
    ("porosity", "bulk-grain"): "porosity-bulk-grain",
    ("porosity", "bulk-pore"): "porosity-bulk-pore",
    ("porosity", "pore-grain"): "porosity-pore-grain",
    ("porosity", "summation of fluids"): "summation-of-fluids",
    ("klinkenberg permeability", "measured"): "klinkenberg-regression",
    ("klinkenberg permeability", "estimated"): "slip-corrected",
    ("slip factor", "measured"): "klinkenberg-regression",
    ("slip factor", "estimated"): "slip-corrected",
}
_METHOD_OF = {
    "dry mass": "grain-mass",
    "grain density": "grain-density",
    "bulk density": "bulk-density",
    "gas permeability": "gas-permeability",
    "mean pressure": "mean-pressure",
    "liquid permeability": "liquid-permeability",
}
_SATURATION_METHODS = {"distillation": "saturations", "retort": "summation-of-fluids"}


def _method(quantity: str, basis: str, step: str) -> str:
    """The key of the calculation that gave a value."""
    if REPORTED in (basis, step) and basis != "estimated":
        return REPORTED
    if quantity.endswith("saturation"):
        return _SATURATION_METHODS[basis]
    return _METHODS.get((quantity, basis)) or _METHOD_OF[quantity]


def rows(tray_: Tray, outcomes: Iterable[Outcome], versions: dict[str, int]) -> list[dict[str, Any]]:
    """The outcomes as rows of the table of results, in a fixed order."""
    made: list[dict[str, Any]] = []
    for o in outcomes:
        size = len(o.at)
        stress = np.zeros(size) if o.stress_mpa is None else o.stress_mpa
        flags: list[list[str]] = [[] for _ in range(size)]
        for text, mask in o.flags.items():
            for flagged in np.flatnonzero(mask):
                flags[flagged].append(text)
        values = o.value.real
        for i in range(size):
            missing = bool(np.isnan(values[i]))
            place = int(o.at[i])
            step = "" if o.step is None else str(o.step[i])
            basis = "" if missing else str(o.basis[i])
            method = "" if missing else _method(o.quantity, basis, step)
            made.append(
                {
                    "plug_id": int(tray_.plug_ids[place]),
                    "quantity": o.quantity,
                    "direction": "" if o.direction is None else str(o.direction[i]),
                    "stress_mpa": float(stress[i]) + 0.0,
                    "step": step,
                    "value": None if missing else float(values[i]),
                    "uncertainty": None,
                    "value_limit": None if o.limit is None or missing else (o.limit[i] or None),
                    "basis": basis,
                    "method": method,
                    "version": versions.get(method, 1),
                    "flags": "; ".join(flags[i]),
                    "reason": str(o.reason[i]) if missing else "",
                    "fingerprint": tray_.fingerprints[place],
                }
            )
    made.sort(key=lambda r: (r["plug_id"], r["quantity"], r["direction"], r["stress_mpa"], r["step"]))
    return made
