"""Masses, volumes, porosity and densities of plugs."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from corelab.bench.expansion import CUP, HOLDER, cup_warmer, expanded, expansion_method
from corelab.bench.gather import Texts, Whole
from corelab.bench.outcome import (
    BAROMETER_ASSUMED,
    TEMPERATURE_ASSUMED,
    Array,
    Bench,
    Mask,
    Outcome,
    any_by,
    blank_texts,
    first_text_by,
    groups_of,
    mean_by,
    reasons_for,
    row_mean,
    tray,
)
from corelab.bench.saturations import summation
from corelab.science import fluids, saturation, volumes

#: Dry weighings agree when they differ by no more than this share (ISRM suggested methods: less than
#: 0.1 % over 4 h; from memory).
CONSTANT_MASS = 0.001


#: How far the porosity by the next route able lies from the one shown; judged, never reported.
ROUTE_DIFFERENCE = "difference between routes"
#: Lengths or diameters of one plug that differ by more than this share show an oval, tapered or skew plug.
UNEVEN = 0.01


def _spread(columns: Array) -> Array:
    """Greatest less least of each row's readings, as a share of their mean."""
    there = ~np.isnan(columns)
    high = np.where(there, columns, -np.inf).max(axis=1)
    low = np.where(there, columns, np.inf).min(axis=1)
    spread: Array = np.where(there.sum(axis=1) > 1, (high - low) / row_mean(columns), 0.0)
    return spread


@dataclass(slots=True)
class Shape:
    length_cm: Array
    net_length_cm: Array
    diameter_cm: Array
    bulk_volume_cm3: Array
    area_cm2: Array
    reason: Texts
    uneven: Mask


def shape_of(bench: Bench) -> Shape:
    """Length without end screens, mean cross-section, bulk volume by caliper.

    The jacket's volume holds sleeve and screens; where none is given, the screens' length is taken off.
    """
    readings, n = bench.kind("dimensions"), bench.n

    uneven = np.zeros(len(readings), dtype=np.bool_)

    def mean(name: str) -> Array:
        columns = np.column_stack([readings.number(f"{name}_{i}_cm") for i in range(1, 11)])
        uneven[:] |= _spread(columns.real) > UNEVEN
        return mean_by(row_mean(columns), readings.at, n)

    length, diameter = mean("length"), mean("diameter")
    net_length = length - bench.screen_cm
    measured_length = np.where(bench.jacket_volume_cm3.real > 0, length, net_length)
    gross, refused = tray(volumes.caliper_bulk_volume_cm3, length_cm=measured_length, diameter_cm=diameter)
    bulk = gross - bench.jacket_volume_cm3
    sound = bulk.real > 0
    return Shape(
        length,
        net_length,
        diameter,
        np.where(sound, bulk, np.nan),
        np.where(sound, bulk / net_length, np.nan),
        refused,
        any_by(uneven, readings.at, n),
    )


@dataclass(slots=True)
class Masses:
    received_g: Array
    dry_g: Array  # as weighed, salt included
    saturated_g: Array
    saturant_density_g_cm3: Array
    salinity_g_kg: Array
    salt: Texts
    salt_density_g_cm3: Array
    dry_not_constant: Mask
    saturated_taken_from_received: Mask


def masses_of(bench: Bench) -> Masses:
    """Net masses by condition; of several dry weighings the last at constant mass."""
    readings, n = bench.kind("masses"), bench.n
    at = readings.at
    condition = readings.text("condition")
    distillation = bench.kind("distillation")
    thimble = np.nan_to_num(mean_by(distillation.number("thimble_mass_g"), distillation.at, n))
    container = readings.number("container_mass_g")
    in_thimble = np.isnan(container) & (condition != "saturated")
    tare = np.where(np.isnan(container), np.where(in_thimble, thimble[at], 0.0), container)
    net = readings.number("mass_g") - tare - bench.jacket_mass_g[at]
    net = np.where(net.real > 0, net, np.nan)
    is_dry, is_wet, is_received = (condition == c for c in ("dry", "saturated", "as received"))
    dry, not_constant = _constant_mass(net[is_dry], at[is_dry], readings.text("measured_on")[is_dry], n)
    received = mean_by(net[is_received], at[is_received], n)
    density = readings.number("saturant_density_g_cm3")
    saturated = mean_by(net[is_wet], at[is_wet], n)
    # A mass as received that names the liquid filling its pores is one of a full plug.
    full = is_received & ~np.isnan(density)
    full_received = mean_by(net[full], at[full], n)
    taken = np.isnan(saturated.real) & ~np.isnan(full_received.real)
    # What is said of the salt beside the newest dry weighing counts before what other rows say.
    newest = np.argsort(readings.text("measured_on").astype(str), kind="stable")[::-1]
    rank = np.where(is_dry, 0, np.where(is_wet, 1, 2))
    order = newest[np.argsort(rank[newest], kind="stable")]
    salt_words = readings.text("salt")
    salt_words = np.where(salt_words == "none", "", salt_words)
    return Masses(
        received,
        dry,
        np.where(taken, full_received, saturated),
        mean_by(density, at, n),
        mean_by(readings.number("salinity_g_per_kg"), at, n),
        first_text_by(salt_words[order], at[order], n),
        mean_by(readings.number("salt_density_g_cm3"), at, n),
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
    mean = mean_by(mass_s, weighing, len(place))
    first = np.ones(len(place), dtype=np.bool_)
    first[1:] = place[1:] != place[:-1]
    last = np.roll(first, -1)
    before = np.roll(mean, 1)
    change = np.abs((mean.real - before.real) / mean.real)
    constant = ~first & (change <= CONSTANT_MASS)
    chosen[place[last]] = mean[last]  # else the last
    chosen[place[constant]] = mean[constant]  # ascending in time: the last one written stays
    several = any_by(~first, place, n)
    not_constant = several & ~any_by(constant, place, n)
    return chosen, not_constant


@dataclass(slots=True)
class Salt:
    mass_g: Array  # left in the dry plug; 0 where none is
    volume_cm3: Array
    unknown: Mask  # said to be left, but how much cannot be told


def _water(bench: Bench) -> tuple[Array, Array]:
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
    return mean_by(water, readings.at, n), mean_by(readings.number("brine_salinity_g_per_kg"), readings.at, n)


def salt_of(bench: Bench, masses: Masses) -> Salt:
    """Salt that a plug kept when it was dried with brine in it."""
    distillation, n = bench.kind("distillation"), bench.n
    distilled = first_text_by(distillation.text("salt"), distillation.at, n) == "left"
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
    return Salt(mass, mass / density, unknown)


@dataclass(slots=True)
class Volumes:
    bulk: Outcome
    grain: Outcome
    pore: Outcome
    dry_mass: Outcome
    porosity: Outcome
    outcomes: list[Outcome]


def _immersed(bench: Bench) -> tuple[Array, Texts, Texts, Mask, Mask]:
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
    value = mean_by(bulk, readings.at, n)
    by = np.where(np.isnan(displaced.real), "buoyancy", "displacement")
    how = first_text_by(np.where(np.isnan(bulk.real), "", by), readings.at, n)
    return (
        value,
        how,
        first_text_by(reason, readings.at, n),
        any_by(assumed & ~given, readings.at, n),
        any_by(np.isnan(bulk.real), readings.at, n),
    )


def volumes_of(bench: Bench, shape: Shape, masses: Masses, salt: Salt) -> Volumes:
    n = bench.n
    immersed, how_immersed, why_immersed, temperature_assumed, immersion_failed = _immersed(bench)
    by_immersion = ~np.isnan(immersed.real)
    bulk_value = np.where(by_immersion, immersed, shape.bulk_volume_cm3)
    bulk_basis = np.where(by_immersion, how_immersed, "caliper").astype(object)

    readings = bench.kind("grain volume")
    rows, why_rows, moved_rows = expanded(bench, "grain volume", CUP)
    gross = mean_by(rows, readings.at, n)
    grain_value = gross - bench.jacket_volume_cm3 - salt.volume_cm3
    grain_value = np.where(grain_value.real > 0, grain_value, np.nan)
    reported = any_by(~np.isnan(readings.number("grain_volume_cm3")), readings.at, n)
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
    summed = summation(bench)
    porosity_value = np.full(
        n, np.nan, dtype=np.result_type(bulk_value, grain_value, pore_read, summed.porosity)
    )
    route = blank_texts(n)
    refused = blank_texts(n)
    by_route: list[tuple[str, Array]] = []
    for name, able, compute, columns in routes:
        found, why = tray(compute, **columns)
        by_route.append((name, found))
        use = able & (route == "") & ~np.isnan(found.real)
        porosity_value[use], route[use] = found[use], name
        refused = np.where((route == "") & able & (refused == "") & (why != ""), why, refused)
    use = (route == "") & ~np.isnan(summed.porosity.real)
    porosity_value[use], route[use] = summed.porosity[use], "summation of fluids"
    by_route.append(("summation of fluids", summed.porosity))
    difference = np.full(n, np.nan, dtype=porosity_value.dtype)
    for name, found in by_route:
        other = np.isnan(difference.real) & (route != name) & (route != "")
        difference = np.where(other, porosity_value - found, difference)

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

    no_immersion = ~any_by(np.ones(len(bench.kind("immersion")), bool), bench.kind("immersion").at, n)
    no_dimensions = ~any_by(np.ones(len(bench.kind("dimensions")), bool), bench.kind("dimensions").at, n)
    no_grain = ~any_by(np.ones(len(readings), bool), readings.at, n)
    bulk = bench.outcome(
        "bulk volume",
        bulk_value,
        reasons_for(
            bulk_value,
            why_immersed,
            shape.reason,
            (no_immersion & no_dimensions, "no readings"),
            otherwise="dimensions or immersion incomplete",
        ),
        bulk_basis,
    )
    bulk.flag("uneven plug: lengths or diameters differ by more than 1 %", shape.uneven & ~by_immersion)
    bulk.flag(TEMPERATURE_ASSUMED, by_immersion & temperature_assumed)
    bulk.flag("some immersion readings not used", immersion_failed)
    grain = bench.outcome(
        "grain volume",
        grain_value,
        reasons_for(
            grain_value,
            first_text_by(why_rows, readings.at, n),
            (no_grain, "no readings"),
            (gross.real > bench.jacket_volume_cm3.real, "the salt left is more than the volume measured"),
            otherwise="the jacket is not smaller than the volume measured",
        ),
        grain_basis,
    )
    moved = any_by(moved_rows & ~np.isnan(rows.real), readings.at, n) & ~derived_grain
    grain.flag(BAROMETER_ASSUMED, moved)
    warm = any_by(cup_warmer(bench) & ~np.isnan(rows.real), readings.at, n) & ~reported & ~derived_grain
    grain.flag("cup warmer than the reference chamber, not corrected", warm)
    expanding = ~reported & ~derived_grain
    grain.methods = np.where(
        expanding, expansion_method(bench), np.where(reported, "reported", "porosity-bulk-pore")
    ).astype(object)
    grain.flag("corrected for salt left", (salt.mass_g.real > 0) & ~derived_grain)
    grain.flag("salt left not corrected: amount unknown", salt.unknown & ~derived_grain)
    some = any_by(why_rows != "", readings.at, n)
    grain.flag("some grain volume readings not used", some & ~derived_grain)
    pore = bench.outcome(
        "pore volume",
        pore_value,
        reasons_for(
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
        reasons_for(
            porosity_value,
            refused,
            (~has_bulk & ~has_grain & ~has_pore, "no readings"),
            (has_bulk & ~has_grain & ~has_pore, "no grain or pore volume"),
            (has_grain & ~has_bulk & ~has_pore, "no bulk or pore volume"),
            otherwise="two of bulk, grain and pore volume are needed",
        ),
        route,
    )
    dry_value, _ = tray(saturation.grain_mass_g, dry_mass_g=masses.dry_g, salt_mass_g=salt.mass_g)
    no_masses = ~any_by(np.ones(len(bench.kind("masses")), bool), bench.kind("masses").at, n)
    dry = bench.outcome(
        "dry mass",
        dry_value,
        reasons_for(
            dry_value,
            (no_masses, "no readings"),
            (np.isnan(masses.dry_g.real), "no dry weighing, or a tare as heavy as the plug"),
            otherwise="the salt left is more than the mass",
        ),
    )
    dry.flag("not dried to constant mass", masses.dry_not_constant)
    dry.flag("corrected for salt left", salt.mass_g.real > 0)
    dry.flag("salt left not corrected: amount unknown", salt.unknown)
    bulk_grain, bulk_pore, pore_grain, by_retort = (
        route == name for name in ("bulk-grain", "bulk-pore", "pore-grain", "summation of fluids")
    )
    for heir, source, where in (
        (bulk, pore, derived_bulk),
        (bulk, grain, derived_bulk),
        (grain, pore, derived_grain),
        (grain, bulk, derived_grain),
        (pore, bulk, bulk_grain | by_retort),
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
    between_routes = bench.outcome(ROUTE_DIFFERENCE, difference, blank_texts(n))
    return Volumes(
        bulk,
        grain,
        pore,
        dry,
        porosity,
        [bulk, grain, pore, dry, porosity, grain_density, bulk_density, between_routes],
    )


def _unstressed(bench: Bench) -> tuple[Array, Texts, Mask]:
    """Pore volume by gas expansion in a holder without net stress: value, reason, barometer assumed."""
    readings, n = bench.kind("pore volume"), bench.n
    rows, why, moved = expanded(bench, "pore volume", HOLDER)
    free = readings.number("net_confining_stress_mpa").real == 0.0
    used = free & ~np.isnan(rows.real)
    return (
        mean_by(np.where(free, rows, np.nan), readings.at, n),
        first_text_by(np.where(free, why, ""), readings.at, n),
        any_by(moved & used, readings.at, n),
    )


def _liquid_filled(bench: Bench, masses: Masses) -> tuple[Array, Texts]:
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
    bench: Bench, quantity: str, compute: Callable[..., Any], mass: Outcome, volume: Outcome
) -> Outcome:
    name = "grain_volume_cm3" if quantity == "grain density" else "bulk_volume_cm3"
    value, why = tray(compute, dry_mass_g=mass.value, **{name: volume.value})
    no_mass, no_volume = np.isnan(mass.value.real), np.isnan(volume.value.real)
    outcome = bench.outcome(
        quantity,
        value,
        reasons_for(
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


def stressed(bench: Bench, volume: Volumes) -> list[Outcome]:
    """Pore volume under stress in the holder, and the porosity and bulk volume that go with it."""
    readings = bench.kind("pore volume")
    stress = readings.number("net_confining_stress_mpa").real
    under = stress > 0.0
    if not under.any():
        return []
    rows, why_rows, moved = expanded(bench, "pore volume", HOLDER)
    rows, why_rows, moved = rows[under], why_rows[under], moved[under]
    places, group = bench.once("stressed", lambda: groups_of(readings.at[under], stress[under].round(9)))
    at, at_stress = places[0].astype(np.intp), places[1]
    m = len(at)
    pore = mean_by(rows, group, m)
    why = first_text_by(why_rows, group, m)
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
            reasons_for(value, *reasons, otherwise="no pore volume under stress"),
            blank_texts(m, basis) if isinstance(basis, str) else basis,
            stress_mpa=at_stress,
        )
        made.flag(BAROMETER_ASSUMED, any_by(moved, group, m))
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
        item.flag("some pore volume readings not used", any_by(why_rows != "", group, m))
    return made
