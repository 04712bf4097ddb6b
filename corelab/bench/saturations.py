"""Fluid saturations by distillation and by retort."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from corelab.bench.outcome import Array, Bench, Outcome, any_by, first_text_by, mean_by, reasons_for, tray
from corelab.science import fluids, saturation

if TYPE_CHECKING:
    from corelab.bench.volumes import Masses, Volumes

#: Saturations that sum to more than this are questioned: measured ones scatter by a few hundredths.
MOST_SATURATION = 1.05


@dataclass(slots=True)
class Summation:
    porosity: Array
    oil: Array
    water: Array
    gas: Array


def summation(bench: Bench) -> Summation:
    """Porosity and saturations by summation of fluids from a retort, rows of one plug averaged."""
    readings, n = bench.kind("retort"), bench.n
    nothing = np.full(n, np.nan)
    if not len(readings):
        return Summation(nothing, nothing, nothing, nothing)
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
    return Summation(
        mean_by(found.porosity_frac, readings.at, n),
        mean_by(found.oil_saturation_frac, readings.at, n),
        mean_by(found.water_saturation_frac, readings.at, n),
        mean_by(found.gas_saturation_frac, readings.at, n),
    )


def saturations_of(bench: Bench, masses: Masses, volume: Volumes) -> list[Outcome]:
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
    brine_v = mean_by(brine, at, n)
    oil_v = mean_by(oil_mass / oil_density, at, n)
    pore = np.where(volume.pore.value.real > 0, volume.pore.value, np.nan)
    by_distillation, _ = tray(
        saturation.saturations, water_volume_cm3=brine_v, oil_volume_cm3=oil_v, pore_volume_cm3=pore
    )
    water_s, oil_s = brine_v / pore, by_distillation.oil_saturation_frac
    retort = summation(bench)
    distilled = any_by(np.ones(len(readings), bool), at, n)
    by_retort = ~distilled & ~np.isnan(retort.water.real)
    water_s = np.where(by_retort, retort.water, water_s)
    oil_s = np.where(by_retort, retort.oil, oil_s)
    gas_s = np.where(by_retort, retort.gas, 1.0 - water_s - oil_s)
    basis = np.where(by_retort, "retort", "distillation").astype(object)
    retorted = any_by(np.ones(len(bench.kind("retort")), bool), bench.kind("retort").at, n)
    no_pore = np.isnan(pore.real)
    why = first_text_by(why_oil, at, n)
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
            reasons_for(value, *reasons, otherwise="the readings are incomplete"),
            basis,
        )
        outcome.inherit(volume.pore, ~by_retort)
        outcome.flag("brine taken as fresh water", any_by(fresh, at, n) & ~by_retort)
        outcome.flag("saturations sum beyond plausible limits", (water_s + oil_s).real > MOST_SATURATION)
        outcome.flag("saturation below zero", value.real < -0.02)
        made.append(outcome)
    return made
