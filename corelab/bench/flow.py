"""Permeability to gas and liquid: steps, lines, and what instruments report."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import chdtri

from corelab.bench.gather import Readings, Texts, Whole
from corelab.bench.outcome import (
    BAROMETER_ASSUMED,
    STRESS_NOT_STATED,
    TEMPERATURE_ASSUMED,
    Array,
    Bench,
    Mask,
    Outcome,
    absolute_of,
    any_by,
    blank_texts,
    first_text_by,
    groups_of,
    mean_by,
    noted,
    on_gauge,
    real_if_so,
    reasons_for,
    tray,
)
from corelab.bench.volumes import Shape
from corelab.control.instruments import BY_FIELD
from corelab.science import fluids, gas_flow
from corelab.science.uncertainty import propagate
from corelab.units import ATMOSPHERE_KPA

#: Stresses, and mean pressures of steps, that lie this near are one (share).
SAME_STRESS, SAME_PRESSURE = 0.005, 0.01


def _flow_ends(readings: Readings, barometer: Array) -> tuple[Array, Array, Mask, Mask]:
    """Upstream and downstream pressure [kPa absolute], and on which of them the barometer bears."""
    downstream = absolute_of(readings, "downstream_pressure", barometer)
    no_downstream = np.isnan(downstream)
    downstream = np.where(no_downstream, barometer, downstream)
    upstream = absolute_of(readings, "upstream_pressure", barometer)
    end_bears = no_downstream | on_gauge(readings, "downstream_pressure")
    start_bears = on_gauge(readings, "upstream_pressure")
    if "pressure_difference_kpa" in readings.numbers:
        by_difference = np.isnan(upstream)
        upstream = np.where(by_difference, downstream + readings.number("pressure_difference_kpa"), upstream)
        start_bears = np.where(by_difference, end_bears, start_bears)
    return upstream, downstream, start_bears, end_bears


def gas_permeability(bench: Bench, shape: Shape) -> list[Outcome]:
    """Gas permeability of each step, and Klinkenberg permeability with slip factor of each line."""
    readings = bench.kind("gas permeability")
    steps: list[Outcome] = []
    lines: list[Outcome] = []
    if len(readings):
        steps, lines = _steady_state(bench, shape, readings)
    return [*steps, *_with_reported(bench, lines)]


def _steady_state(bench: Bench, shape: Shape, readings: Readings) -> tuple[list[Outcome], list[Outcome]]:
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
    metered = absolute_of(readings, "flow_pressure", barometer)
    meter_bears = ~standard & (np.isnan(metered) | on_gauge(readings, "flow_pressure"))
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
    columns: dict[str, Array] = {
        "flow_rate_cm3_s": flow,
        "flow_pressure_kpa": downstream,
        "upstream_pressure_kpa": upstream,
        "downstream_pressure_kpa": downstream,
        "viscosity_mpas": viscosity,
        "length_cm": np.where(special, factor, length),
        "area_cm2": np.where(special, length, shape.area_cm2[row_at]),
    }
    row_k, why = tray(gas_flow.gas_permeability_md, **columns)
    across = np.isin(row_direction, ["max", "90"]) & ~special
    sound = (row_k.real > 1e-100) & (row_k.real < 1e100)  # absurd readings overflow
    row_k = np.where(across | ~sound, np.nan, row_k)
    no_shape = np.where(special, np.isnan(length.real), np.isnan(shape.area_cm2[row_at].real))
    row_reason = reasons_for(
        row_k,
        (across, "flow across the core needs a geometric factor"),
        (no_shape, "no length and diameter"),
        why,
        why_flow,
        otherwise="the readings of the step are incomplete",
    )

    net, sleeve, unstated = _net_stress(readings, barometer, row_mean)

    def lines() -> tuple[list[Array], Whole]:
        _, own = groups_of(row_at, row_direction, row_gas)
        one_stress = _joined(_alike(net, own, SAME_STRESS), _alike(sleeve, own, SAME_STRESS))
        return groups_of(row_at, row_direction, row_gas, one_stress)

    places, line_of = bench.once("flow lines", lines)
    line_at = places[0].astype(np.intp)
    m = len(line_at)
    line_direction, line_gas = places[1].astype(object), places[2].astype(object)
    line_stress = mean_by(net, line_of, m).round(9)

    # Equal-key repeats are one step, their mean; what could not be computed does not enter it.
    _, step_of = bench.once(
        "flow steps", lambda: groups_of(line_of, readings.text("step"), readings.text("measured_on"))
    )
    _, first = np.unique(step_of, return_index=True)
    steps = len(first)
    there = ~np.isnan(row_k.real)
    counted = there | ~any_by(there, step_of, steps)[step_of]

    def by_step(column: Array) -> Array:
        return mean_by(np.where(counted, column, np.nan), step_of, steps)

    k, mean, temperature = by_step(row_k), by_step(row_mean), by_step(row_temperature)
    group, at, gas, direction = line_of[first], row_at[first], row_gas[first], row_direction[first]
    labels = bench.once("step labels", lambda: _step_labels(readings, first, group))
    reason = reasons_for(k, first_text_by(row_reason, step_of, steps), otherwise="")

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
    mean_p = outcome(
        "mean pressure", mean, reasons_for(mean, otherwise="the readings of the step are incomplete")
    )
    moved = assumed & counted
    for flagged, bears in ((gas_k, start_bears | end_bears | meter_bears), (mean_p, start_bears | end_bears)):
        flagged.flag(BAROMETER_ASSUMED, any_by(moved & bears, step_of, steps))
    apart = np.abs(row_mean.real - mean.real[step_of]) > SAME_PRESSURE * np.abs(mean.real[step_of])
    gas_k.flag("repeats of one step differ in pressure", any_by(apart & counted, step_of, steps))
    gas_k.flag(TEMPERATURE_ASSUMED, any_by(temperature_assumed & counted, step_of, steps))
    gas_k.flag(
        "biaxial stress", any_by((readings.texts["stress_type"] == "biaxial") & counted, step_of, steps)
    )
    gas_k.flag(STRESS_NOT_STATED, any_by(unstated & counted, step_of, steps))
    gas_k.flag("confining pressure below the pore pressure", any_by((net < 0.0) & counted, step_of, steps))

    good = ~np.isnan(k.real)
    spread = bench.once(
        "step spread", lambda: _step_spread(bench, readings, columns, there, counted, step_of, steps)
    )
    flows = _Flows(
        k,
        mean,
        temperature,
        gas,
        by_step(flow),
        by_step(downstream),
        by_step(viscosity),
        by_step(columns["area_cm2"]),
        spread,
    )
    line = _fit_lines(bench, flows, group, good, m)
    for text, mask in gas_k.flags.items():
        line.doubts[text] = any_by(mask & good, group, m)
    line.doubts["some steps not used"] = any_by(~good, group, m)
    why_line = first_text_by(reason, group, m)
    made = []
    for quantity, value, scatter in (
        ("klinkenberg permeability", line.k_md, line.k_scatter_md),
        ("slip factor", line.slip_kpa, line.slip_scatter_kpa),
        ("inertial coefficient", line.inertia_1_m, None),
    ):
        if quantity == "inertial coefficient" and np.isnan(value.real).all():
            continue
        of_line = Outcome(
            quantity,
            line_at,
            value,
            reasons_for(value, line.reason, why_line, otherwise="no step could be used"),
            line.basis,
            direction=line_direction,
            stress_mpa=line_stress,
            step=line_gas,
            scatter=scatter,
            methods=line.methods,
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
    confining = absolute_of(readings, "confining_pressure", barometer).real
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
class _Flows:
    """The steps of a tray as they enter the lines."""

    k_md: Array
    mean_kpa: Array
    temperature_degc: Array
    gas: Texts
    flow_rate_cm3_s: Array
    flow_pressure_kpa: Array
    viscosity_mpas: Array
    area_cm2: Array
    spread_md: Array  # standard uncertainty of each step by what scatters from step to step


def _step_spread(
    bench: Bench,
    readings: Readings,
    columns: dict[str, Array],
    there: Mask,
    counted: Mask,
    step_of: Whole,
    steps: int,
) -> Array:
    """How far each step's permeability scatters by the repeatability of its own pressures and flow.

    What all steps share (length, area, barometer, scales) does not move them against each other.
    """
    register = bench.tray.register
    instruments = np.nan_to_num(readings.numbers["permeameter_id"].real).astype(np.intp)

    def repeatability(name: str) -> Array:
        reading = BY_FIELD["gas permeability", name]
        return np.nan_to_num(register.amounts(reading, readings.numbers[name].real, instruments)[0])

    upstream = repeatability("upstream_pressure_kpa")
    upstream = np.where(upstream > 0.0, upstream, repeatability("pressure_difference_kpa"))
    real = {name: np.broadcast_to(values.real, there.shape)[there] for name, values in columns.items()}
    share = repeatability("flow_rate_cm3_per_s") / readings.numbers["flow_rate_cm3_per_s"].real
    found = propagate(
        gas_flow.gas_permeability_md,
        real,
        {
            "flow_rate_cm3_s": real["flow_rate_cm3_s"] * share[there],
            "upstream_pressure_kpa": upstream[there],
            "downstream_pressure_kpa": repeatability("downstream_pressure_kpa")[there],
        },
    )
    spread = np.full(there.shape, np.nan)
    spread[there] = found.standard_uncertainty
    count = np.bincount(step_of[counted & there], minlength=steps)
    return np.sqrt(mean_by(np.where(counted, spread**2, np.nan), step_of, steps) / np.maximum(count, 1))


@dataclass(slots=True)
class _Lines:
    k_md: Array
    slip_kpa: Array
    inertia_1_m: Array
    k_scatter_md: Array
    slip_scatter_kpa: Array
    basis: Texts
    methods: Texts
    reason: Texts
    doubts: dict[str, Mask]


#: A slip factor this many times beyond the published laws' own spread is questioned (common practice).
SLIP_SPREAD = 3.0


def _fit_lines(bench: Bench, flows: _Flows, group: Whole, good: Mask, m: int) -> _Lines:
    """The permeability at infinite mean pressure of each line.

    Regression on 1/p, weighted by the steps' own uncertainties, where three mean pressures or more are
    there; with inertia where the steps demand it; else a published slip law.
    """
    k, mean, slip_step = flows.k_md, flows.mean_kpa, bench.tray.slip_step
    kind = np.result_type(k, mean, flows.temperature_degc, np.asarray(real_if_so(slip_step)))

    def empty() -> Array:
        return np.full(m, np.nan, dtype=kind)

    lines = _Lines(
        empty(),
        empty(),
        empty(),
        empty().real,
        empty().real,
        blank_texts(m),
        blank_texts(m),
        blank_texts(m),
        {},
    )
    if not good.any():
        return lines
    pressures = bench.once("step pressures", lambda: _alike(mean.real[good], group[good], SAME_PRESSURE))
    _, one_each = np.unique(pressures, return_index=True)
    enough = np.bincount(group[good][one_each], minlength=m) >= 3
    fitted = good & enough[group]
    weights = _weights(flows, group, fitted, m)
    columns: dict[str, Any] = {
        "gas_permeability_md": k[fitted],
        "mean_pressure_kpa": mean[fitted],
        "group": group[fitted],
        "weights": weights,
    }
    fit = noted(gas_flow.klinkenberg_regression, columns, gas_flow.klinkenberg_regression(**columns))
    size = len(fit.k_infinity_md)
    found = np.zeros(m, dtype=np.bool_)
    found[:size] = ~np.isnan(fit.k_infinity_md.real)
    refused = np.zeros(m, dtype=np.bool_)
    refused[:size] = fit.refused
    use = found & ~refused
    lines.k_md[use], lines.slip_kpa[use] = fit.k_infinity_md[use[:size]], fit.slip_factor_kpa[use[:size]]
    lines.basis[use], lines.methods[use] = "measured", "klinkenberg-regression"
    lines.reason[refused] = (
        "the regression on reciprocal mean pressure gives a permeability below zero: check the steps"
    )
    inertial = bench.once("inertial", lambda: _inertial(flows, group, fitted, weights, m))
    chi_square, free = np.full(m, np.nan), np.full(m, 1)
    k_se, slip_se = np.full(m, np.nan), np.full(m, np.nan)
    chi_square[:size], free[:size] = fit.chi_square.real, np.maximum(fit.points - 2, 1)
    k_se[:size], slip_se[:size] = fit.k_infinity_se_md.real, fit.slip_factor_se_kpa.real
    if inertial.any():
        rows = fitted & inertial[group]
        number = np.cumsum(inertial) - 1
        joint = _joint(flows, number[group], rows, weights[rows[fitted]])
        lines.k_md[inertial], lines.slip_kpa[inertial] = joint.k_infinity_md, joint.slip_factor_kpa
        lines.inertia_1_m[inertial] = joint.inertial_coefficient_1_m
        lines.basis[inertial], lines.methods[inertial] = "measured", "slip-inertia-regression"
        lines.reason[inertial] = ""
        chi_square[inertial], free[inertial] = joint.chi_square.real, np.maximum(joint.points - 3, 1)
        k_se[inertial] = joint.k_infinity_se_md.real
        slip_se[inertial] = joint.slip_factor_se_kpa.real
    few = ~found & ~inertial & any_by(good, group, m)
    rows = good & few[group]
    if rows.any():
        single, _ = tray(
            gas_flow.slip_corrected_md,
            gas_permeability_md=k[rows],
            # The law's slip stands over the mean pressure: a step of the one is a step of the other.
            mean_pressure_kpa=mean[rows] / real_if_so(1.0 + slip_step),
            gas=flows.gas[rows].astype(str),
            temperature_degc=flows.temperature_degc[rows],
        )
        b = (k[rows] / single - 1.0) * mean[rows]
        lines.k_md = np.where(few, mean_by(single, group[rows], m), lines.k_md)
        lines.slip_kpa = np.where(few, mean_by(b, group[rows], m), lines.slip_kpa)
        lines.basis[few], lines.methods[few] = "estimated", "slip-corrected"
        lines.doubts["slip estimated from a published law"] = few
    measured = lines.basis == "measured"
    more = measured & (chi_square > chdtri(free, 0.05))
    ratio = np.sqrt(np.where(more, np.maximum(chi_square / free - 1.0, 0.0), 0.0))
    lines.k_scatter_md, lines.slip_scatter_kpa = ratio * k_se, ratio * slip_se
    lines.doubts["steps scatter more than their instruments state"] = more
    lines.doubts["corrected for inertia"] = inertial
    lines.doubts["slip factor not positive"] = measured & (lines.slip_kpa.real <= 0.0)
    lines.doubts["slip factor far from published laws"] = measured & bench.once(
        "far slip", lambda: _far_from_laws(lines, flows, group, good, m)
    )
    return lines


def _weights(flows: _Flows, group: Whole, fitted: Mask, m: int) -> Array:
    """1/u² of the steps; where a step of a line states nothing usable, its steps count by 1 % each."""
    share = flows.spread_md / flows.k_md.real
    unusable = fitted & ~((share > 1e-9) & (share < 1e3))
    share = np.where(any_by(unusable, group, m)[group], 0.01, share)
    weights: Array = (1.0 / (share * flows.k_md.real) ** 2)[fitted]
    return weights


def _inertial(flows: _Flows, group: Whole, fitted: Mask, weights: Array, m: int) -> Mask:
    """The lines whose steps demand an inertial resistance."""
    demanded = np.zeros(m, dtype=np.bool_)
    if fitted.any():
        joint = _joint(flows, group, fitted, weights)
        sound = joint.demanded & (joint.k_infinity_md.real > 0.0)
        demanded[: len(sound)] = sound
    return demanded


def _joint(flows: _Flows, group: Whole, rows: Mask, weights: Array) -> gas_flow.SlipInertia:
    columns: dict[str, Any] = {
        "gas_permeability_md": flows.k_md[rows],
        "mean_pressure_kpa": flows.mean_kpa[rows],
        "flow_rate_cm3_s": flows.flow_rate_cm3_s[rows],
        "flow_pressure_kpa": flows.flow_pressure_kpa[rows],
        "viscosity_mpas": flows.viscosity_mpas[rows],
        "molar_mass_g_mol": fluids.molar_mass_g_mol(flows.gas[rows].astype(str)),
        "temperature_degc": flows.temperature_degc[rows],
        "area_cm2": flows.area_cm2[rows],
        "group": group[rows],
        "weights": weights,
    }
    found = gas_flow.slip_inertia_regression(**columns)
    noted(gas_flow.slip_inertia_regression, columns, found)
    return found


def _far_from_laws(lines: _Lines, flows: _Flows, group: Whole, good: Mask, m: int) -> Mask:
    """Where a slip factor lies outside the spread of the published laws for its permeability and gas."""
    gas = first_text_by(flows.gas[good], group[good], m)
    k = np.where(lines.k_md.real > 0.0, lines.k_md.real, np.nan)
    laws = np.stack(
        [
            law(k)
            for law in (gas_flow.slip_rp40_air_kpa, gas_flow.slip_heid_kpa, gas_flow.slip_jones_owens_kpa)
        ]
    )
    named = np.where(gas == "", "air", gas).astype(str)
    scale = gas_flow.slip_between_gases_kpa(1.0, "air", named, 20.0)
    b = lines.slip_kpa.real
    low, high = laws.min(axis=0) * scale / SLIP_SPREAD, laws.max(axis=0) * scale * SLIP_SPREAD
    far: Mask = (b > 0.0) & ((b < low) | (b > high))
    return far


def _with_reported(bench: Bench, lines: list[Outcome]) -> list[Outcome]:
    """Add what pressure-decay and probe instruments report, where no steps were measured."""
    readings = bench.kind("reported permeability")
    if not len(readings):
        return lines
    at, direction = readings.at, readings.text("direction")
    stress = readings.number("net_confining_stress_mpa").real
    places, group = bench.once("reported", lambda: groups_of(at, direction, np.nan_to_num(stress).round(9)))
    line_at = places[0].astype(np.intp)
    m = len(line_at)
    line_stress = places[2]
    k, k_limit = (
        readings.number("klinkenberg_permeability_md"),
        readings.text("klinkenberg_permeability_limit"),
    )
    gas_k, gas_limit = readings.number("gas_permeability_md"), readings.text("gas_permeability_limit")
    mean, gas = readings.number("mean_pressure_kpa"), readings.text("gas")
    temperature = np.full(
        len(readings), real_if_so(bench.tray.temperature_degc + bench.tray.temperature_step)
    )
    slip_step = bench.tray.slip_step
    from_gas = np.isnan(k) & ~np.isnan(gas_k) & ~np.isnan(mean) & (gas != "")
    kind = np.result_type(gas_k, mean, temperature, np.asarray(real_if_so(slip_step)))
    estimate = np.full(len(k), np.nan, dtype=kind)
    if from_gas.any():
        estimate[from_gas], _ = tray(
            gas_flow.slip_corrected_md,
            gas_permeability_md=gas_k[from_gas],
            mean_pressure_kpa=mean[from_gas] / real_if_so(1.0 + slip_step),
            gas=gas[from_gas].astype(str),
            temperature_degc=temperature[from_gas],
        )
    # A limit alone is a limit; beside proper values it says less than they do.
    value = np.where(np.isnan(k), estimate, k)
    limit = np.where(np.isnan(k), gas_limit, k_limit).astype(object)
    proper = any_by((limit == "") & ~np.isnan(value), group, m)
    counted = np.where(proper[group] & (limit != ""), np.nan, value)
    k_line = mean_by(counted, group, m)
    line_limit = np.where(proper, "", first_text_by(limit, group, m)).astype(object)
    line_estimated = any_by(from_gas & ~np.isnan(counted), group, m)
    common: dict[str, Any] = {
        "direction": places[1].astype(object),
        "stress_mpa": line_stress,
        "step": blank_texts(m, "reported"),
    }
    basis = blank_texts(m, "reported")
    reason = "a reported gas permeability needs gas and mean pressure to be corrected for slip"
    outcome = Outcome(
        "klinkenberg permeability",
        line_at,
        k_line,
        reasons_for(k_line, otherwise=reason),
        basis,
        limit=line_limit,
        **common,
    )
    outcome.flag("slip estimated from a published law", line_estimated)
    outcome.flag(STRESS_NOT_STATED, any_by(np.isnan(stress), group, m))
    for word in ("below", "above"):
        outcome.flag(f"klinkenberg permeability {word} limit", line_limit == word)
    slip = mean_by(readings.number("slip_factor_kpa"), group, m)
    implied = mean_by((gas_k / estimate - 1.0) * mean, group, m)
    estimated = np.isnan(slip) & ~np.isnan(implied)
    slip_out = Outcome(
        "slip factor",
        line_at,
        np.where(estimated, implied, slip),
        reasons_for(np.where(estimated, implied, slip), otherwise="not reported by the instrument"),
        np.where(estimated, "estimated", "reported").astype(object),
        **common,
    )
    made = [*lines, outcome, slip_out]
    if not np.isnan(gas_k).all():
        proper_gas = any_by((gas_limit == "") & ~np.isnan(gas_k), group, m)
        gas_value = mean_by(np.where(proper_gas[group] & (gas_limit != ""), np.nan, gas_k), group, m)
        gas_words = np.where(proper_gas, "", first_text_by(gas_limit, group, m)).astype(object)
        gas_line = Outcome(
            "gas permeability",
            line_at,
            gas_value,
            reasons_for(gas_value, otherwise="not reported by the instrument"),
            first_text_by(gas, group, m),
            limit=gas_words,
            **common,
        )
        for word in ("below", "above"):
            gas_line.flag(f"gas permeability {word} limit", gas_words == word)
        mean_value = mean_by(mean, group, m)
        made += [
            gas_line,
            Outcome(
                "mean pressure",
                line_at,
                mean_value,
                reasons_for(mean_value, otherwise="not reported by the instrument"),
                first_text_by(gas, group, m),
                **common,
            ),
        ]
    inertia = mean_by(readings.number("inertial_coefficient_per_m"), group, m)
    if not np.isnan(inertia).all():
        made.append(
            Outcome(
                "inertial coefficient",
                line_at,
                inertia,
                reasons_for(inertia, otherwise="not reported by the instrument"),
                blank_texts(m, "reported"),
                **common,
            )
        )
    return made


def liquid_permeability(bench: Bench, shape: Shape) -> list[Outcome]:
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
    places, group = bench.once("liquid", lambda: groups_of(at, np.nan_to_num(stress).round(9)))
    m = len(places[0])
    value = mean_by(k, group, m)
    reason = reasons_for(
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
        reasons_for(value, first_text_by(reason, group, m), otherwise="no step could be used"),
        first_text_by(readings.text("liquid"), group, m),
        stress_mpa=places[1],
    )
    outcome.flag(STRESS_NOT_STATED, any_by(np.isnan(stress), group, m))
    outcome.flag(BAROMETER_ASSUMED, any_by(moved, group, m))
    return [outcome]
