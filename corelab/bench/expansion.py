"""Volumes by gas expansion, with the calibration in force."""

from __future__ import annotations

from typing import Any

import numpy as np

from corelab.bench.gather import CalibrationRows, Readings, Texts, Tray
from corelab.bench.outcome import Array, Bench, Mask, absolute_of, barometer_of, noted, on_gauge, tray
from corelab.errors import Impossible
from corelab.science import volumes
from corelab.units import ZERO_CELSIUS_K

CUP, HOLDER = "cup", "holder"
#: A cup this much warmer moves a grain volume by some hundredths of a per cent.
WARMER_K = 0.2


def expanded(bench: Bench, kind: str, setup: str) -> tuple[Array, Texts, Mask]:
    """Row volumes by gas expansion with the calibration in force: value, reason, barometer assumed."""
    readings = bench.kind(kind)
    rows = len(readings)
    value = np.full(rows, np.nan + 0j)  # complex for the while: the calibration may be so, too
    barometer, assumed = bench.barometer(readings)
    warmer = np.ones(rows)
    if setup == CUP and bench.tray.cup_correction:
        # The gas of the reference chamber expands into a cup of another temperature, where both are read.
        chamber, cup = readings.number("temperature_degc"), readings.number("cup_temperature_degc")
        ratio = (cup + ZERO_CELSIUS_K) / (chamber + ZERO_CELSIUS_K)
        warmer = np.where(np.isnan(ratio), 1.0, ratio)
    first = absolute_of(readings, "reference_pressure", barometer)
    second = absolute_of(readings, "expanded_pressure", barometer)
    moved = assumed & ~(on_gauge(readings, "reference_pressure") & on_gauge(readings, "expanded_pressure"))
    ambient = barometer
    if bench.tray.helium_correction:
        moved = assumed
        first, second, ambient = _over_z(bench.tray, readings, first, second, barometer)
    choices = bench.tray.choices(kind)
    reason = np.array(
        [f"no calibration in force: {c}" if isinstance(c, str) and c else "" for c in choices], dtype=object
    )
    chosen = np.array([c if isinstance(c, int) else -1 for c in choices], dtype=np.intp)
    for number in np.unique(chosen[chosen >= 0]):
        here = chosen == number
        calibration = bench.tray.calibration(int(number))
        fitted = _fitted(bench, calibration)
        if isinstance(fitted, str):
            reason[here] = f"the calibration '{calibration.name}' cannot be used: {fitted}"
            continue
        reference, other, moved_by_calibration = fitted
        columns = {
            "reference_pressure_kpa": first[here],
            "expanded_pressure_kpa": second[here],
            "barometric_pressure_kpa": ambient[here],
            "reference_volume_cm3": reference * warmer[here],
        }
        if setup == HOLDER:
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


def _fitted(bench: Bench, calibration: CalibrationRows) -> tuple[Any, Any, bool] | str:
    """`calibrated`, found once for the passes in which nothing moves the calibration."""
    tray = bench.tray
    if tray.barometer_step or tray.temperature_step or any(calibration.offset):
        return calibrated(tray, calibration)
    kept = tray.found.setdefault("calibrations", {})
    fitted: tuple[Any, Any, bool] | str
    readings, fitted = kept.get(calibration.number, (None, ""))
    if readings is not calibration.readings:
        fitted = calibrated(tray, calibration)
        if readings is None:
            kept[calibration.number] = calibration.readings, fitted
    return fitted


def calibrated(tray: Tray, calibration: CalibrationRows) -> tuple[Any, Any, bool] | str:
    """Reference volume, cup or dead volume, and whether an assumed barometer moves them; or why not."""
    readings = calibration.readings
    barometer, assumed = barometer_of(tray, readings)
    compute = volumes.calibrate_holder if calibration.setup == HOLDER else volumes.calibrate_cup
    first = absolute_of(readings, "reference_pressure", barometer)
    second = absolute_of(readings, "expanded_pressure", barometer)
    ambient = barometer
    if tray.helium_correction:
        first, second, ambient = _over_z(tray, readings, first, second, barometer)
    columns = {
        "known_volume_cm3": readings.number("known_volume_cm3"),
        "reference_pressure_kpa": first,
        "expanded_pressure_kpa": second,
        "barometric_pressure_kpa": ambient,
    }
    try:
        fit = noted(compute, columns, compute(**columns))
    except Impossible as wrong:
        return str(wrong)
    gauge = on_gauge(readings, "reference_pressure") & on_gauge(readings, "expanded_pressure")
    reference, other = calibration.offset
    return fit.reference_volume_cm3 + reference, fit.volume_cm3 + other, bool((assumed & ~gauge).any())


def _over_z(tray: Tray, readings: Readings, *pressures: Array) -> list[Array]:
    """Pressures divided by helium's compressibility factor: what a mole balance of a real gas needs."""
    temperature = readings.number("temperature_degc")
    temperature = np.where(np.isnan(temperature), tray.temperature_degc, temperature)
    return [volumes.pressure_over_z_kpa(p, temperature) for p in pressures]


def expansion_method(bench: Bench) -> str:
    """The calculations of a grain volume, with the corrections that are asked for."""
    parts = ["grain-volume-gas-expansion"]
    parts += ["pressure-over-z"] if bench.tray.helium_correction else []
    parts += ["reference-volume-at-cup-temperature"] if bench.tray.cup_correction else []
    return " + ".join(parts)


def cup_warmer(bench: Bench) -> Mask:
    """Rows read with a cup of another temperature for which no correction is asked."""
    readings = bench.kind("grain volume")
    difference = readings.numbers["cup_temperature_degc"].real - readings.numbers["temperature_degc"].real
    warm: Mask = np.abs(np.nan_to_num(difference)) > WARMER_K
    return warm & (not bench.tray.cup_correction)
