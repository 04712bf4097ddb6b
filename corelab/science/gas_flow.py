"""Permeability from steady flow of gas or liquid, gas slip, and inertia.

Pressures are absolute in kPa, flow rates in cm3/s, viscosities in mPa s, lengths in cm, areas in cm2,
permeabilities in md (1 darcy = 1e-12/1.01325 m2), temperatures in degC.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.science.fluids import GAS_CONSTANT_J_MOL_K, known_gas, mean_free_path_m
from corelab.science.formula import Array, Formula, Mask, Symbol, kelvin, not_negative, positive, refuse
from corelab.units import ATMOSPHERE_KPA, MILLIDARCY_M2, UNITS

PSI_KPA = UNITS["pressure"]["psia"].factor
FOOT_M = UNITS["length"]["ft"].factor
LIQUID_CONSTANT = 1000.0 * ATMOSPHERE_KPA
"""md from cm3/s, mPa s, cm, cm2 and kPa: the darcy is defined with 1 atm."""


def _drop(upstream_pressure_kpa: ArrayLike, downstream_pressure_kpa: ArrayLike) -> tuple[Array, Array]:
    upstream = positive("upstream_pressure_kpa", upstream_pressure_kpa)
    downstream = not_negative("downstream_pressure_kpa", downstream_pressure_kpa)
    refuse(
        upstream.real <= downstream.real,
        "upstream_pressure_kpa",
        upstream,
        "more than the downstream pressure, both absolute",
    )
    return upstream, downstream


def mean_pressure_kpa(upstream_pressure_kpa: ArrayLike, downstream_pressure_kpa: ArrayLike) -> Array:
    """Mean pressure in the plug.

    Parameters
    ----------
    upstream_pressure_kpa, downstream_pressure_kpa : array_like
        Absolute pressures of the two ends [kPa], upstream above downstream.

    Returns
    -------
    Array
        Mean pressure [kPa absolute], broadcast shape.

    Raises
    ------
    Impossible
        If an upstream pressure is not above 0 or not above the downstream one, or a downstream pressure
        negative.

    Notes
    -----
    p_m = (p1 + p2)/2, both absolute: never one gauge and one absolute reading.

    References
    ----------
    Klinkenberg, L. J. 1941, "The permeability of porous media to liquids and gases", API Drilling and
    Production Practice, 200-213 (from memory).

    Examples
    --------
    >>> float(mean_pressure_kpa(300.0, 100.0))
    200.0
    """
    upstream, downstream = _drop(upstream_pressure_kpa, downstream_pressure_kpa)
    return (upstream + downstream) / 2.0


def flow_rate_at_cm3_s(
    flow_rate_cm3_s: ArrayLike,
    flow_pressure_kpa: ArrayLike,
    flow_temperature_degc: ArrayLike,
    pressure_kpa: ArrayLike,
    temperature_degc: ArrayLike,
) -> Array:
    """Flow rate of a gas at another pressure and temperature than it was metered at.

    Parameters
    ----------
    flow_rate_cm3_s : array_like
        Metered flow rate [cm3/s], above 0.
    flow_pressure_kpa, flow_temperature_degc : array_like
        Conditions that the metered rate refers to [kPa absolute, above 0; degC].
    pressure_kpa, temperature_degc : array_like
        Conditions wanted, such as the plug's [kPa absolute, above 0; degC].

    Returns
    -------
    Array
        Flow rate [cm3/s], broadcast shape.

    Raises
    ------
    Impossible
        If a rate or a pressure is not above 0, or a temperature not above absolute zero.

    Notes
    -----
    q p/T is conserved: q2 = q (p/p2) (T2/T), T absolute; ideal gas.

    References
    ----------
    Law of the ideal gas; API RP 40, 2nd ed. 1998, sec. 6 (from memory).

    Examples
    --------
    >>> round(float(flow_rate_at_cm3_s(5.25, 101.325, 15.556, 101.325, 21.111)), 3)
    5.351
    """
    rate = positive("flow_rate_cm3_s", flow_rate_cm3_s)
    pressures = positive("flow_pressure_kpa", flow_pressure_kpa) / positive("pressure_kpa", pressure_kpa)
    wanted = kelvin("temperature_degc", temperature_degc)
    return rate * pressures * wanted / kelvin("flow_temperature_degc", flow_temperature_degc)


def gas_permeability_geometric_md(
    flow_rate_cm3_s: ArrayLike,
    flow_pressure_kpa: ArrayLike,
    upstream_pressure_kpa: ArrayLike,
    downstream_pressure_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    geometric_factor_cm: ArrayLike,
) -> Array:
    """Gas permeability for any flow geometry, given its geometric factor.

    Parameters
    ----------
    flow_rate_cm3_s : array_like
        Flow rate at the plug's temperature and at `flow_pressure_kpa` [cm3/s], above 0.
    flow_pressure_kpa : array_like
        Absolute pressure that the rate refers to [kPa], above 0.
    upstream_pressure_kpa, downstream_pressure_kpa : array_like
        Absolute pressures of the two ends [kPa], upstream above downstream.
    viscosity_mpas : array_like
        Viscosity of the gas [mPa s], above 0.
    geometric_factor_cm : array_like
        G [cm], above 0; A/L for axial flow.

    Returns
    -------
    Array
        Permeability to the gas at the mean pressure [md], broadcast shape; slip is not taken off.

    Raises
    ------
    Impossible
        If a rate, a pressure (downstream: negative), a viscosity or a factor is not above 0, or an
        upstream pressure not above the downstream one.

    Notes
    -----
    k = 2 mu q_b p_b/(G (p1^2 - p2^2)), q_b rate at p_b, mu viscosity, G geometric factor; 2 becomes
    202 650 in these units. Isothermal, ideal gas, no inertia.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6 (from memory).

    Examples
    --------
    >>> psi = 6.894757293168
    >>> round(float(gas_permeability_geometric_md(
    ...     1.0, 14.696 * psi, 29.392 * psi, 14.696 * psi, 0.01767, 11.4009 / 5.08)), 4)
    5.2489
    """
    upstream, downstream = _drop(upstream_pressure_kpa, downstream_pressure_kpa)
    flow = positive("flow_rate_cm3_s", flow_rate_cm3_s) * positive("flow_pressure_kpa", flow_pressure_kpa)
    driving = (upstream - downstream) * (upstream + downstream)
    viscosity = positive("viscosity_mpas", viscosity_mpas)
    factor = positive("geometric_factor_cm", geometric_factor_cm)
    return 2.0 * LIQUID_CONSTANT * viscosity * flow / (factor * driving)


def gas_permeability_md(
    flow_rate_cm3_s: ArrayLike,
    flow_pressure_kpa: ArrayLike,
    upstream_pressure_kpa: ArrayLike,
    downstream_pressure_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    length_cm: ArrayLike,
    area_cm2: ArrayLike,
) -> Array:
    """Gas permeability of a plug from steady axial flow.

    Parameters
    ----------
    flow_rate_cm3_s : array_like
        Flow rate at the plug's temperature and at `flow_pressure_kpa` [cm3/s], above 0.
    flow_pressure_kpa : array_like
        Absolute pressure that the rate refers to [kPa], above 0.
    upstream_pressure_kpa, downstream_pressure_kpa : array_like
        Absolute pressures of the two ends [kPa], upstream above downstream.
    viscosity_mpas : array_like
        Viscosity of the gas [mPa s], above 0.
    length_cm, area_cm2 : array_like
        Length [cm] and cross-section [cm2] of the plug, above 0.

    Returns
    -------
    Array
        Permeability to the gas at the mean pressure [md], broadcast shape; slip is not taken off.

    Raises
    ------
    Impossible
        If a rate, a pressure (downstream: negative), a viscosity, a length or an area is not above 0, or
        an upstream pressure not above the downstream one.

    Notes
    -----
    k = 2 mu q_b p_b L/(A (p1^2 - p2^2)), q_b rate at p_b, mu viscosity, L length, A area; 2 becomes
    202 650 in these units. Isothermal, ideal gas, no inertia.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6 (from memory).

    Examples
    --------
    >>> psi = 6.894757293168
    >>> round(float(gas_permeability_md(
    ...     1.0, 14.696 * psi, 29.392 * psi, 14.696 * psi, 0.01767, 5.08, 11.4009)), 4)
    5.2489
    """
    factor = positive("area_cm2", area_cm2) / positive("length_cm", length_cm)
    return gas_permeability_geometric_md(
        flow_rate_cm3_s,
        flow_pressure_kpa,
        upstream_pressure_kpa,
        downstream_pressure_kpa,
        viscosity_mpas,
        factor,
    )


def liquid_permeability_md(
    flow_rate_cm3_s: ArrayLike,
    upstream_pressure_kpa: ArrayLike,
    downstream_pressure_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    length_cm: ArrayLike,
    area_cm2: ArrayLike,
) -> Array:
    """Liquid permeability of a plug from steady axial flow.

    Parameters
    ----------
    flow_rate_cm3_s : array_like
        Flow rate [cm3/s], above 0.
    upstream_pressure_kpa, downstream_pressure_kpa : array_like
        Absolute pressures of the two ends [kPa], upstream above downstream.
    viscosity_mpas : array_like
        Viscosity of the liquid [mPa s], above 0.
    length_cm, area_cm2 : array_like
        Length [cm] and cross-section [cm2] of the plug, above 0.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a rate, a viscosity, a length or an area is not above 0, or an upstream pressure not above the
        downstream one.

    Notes
    -----
    k = q mu L/(A (p1 - p2)), q rate, mu viscosity, L length, A area; the factor is 101 325 in these units.
    For liquids only: used for a gas with its outlet rate it is wrong.

    References
    ----------
    Darcy's law; API RP 40, 2nd ed. 1998, sec. 6 (from memory).

    Examples
    --------
    >>> round(float(liquid_permeability_md(1.0, 202.65, 101.325, 1.0, 1.0, 1.0)), 6)
    1000.0
    """
    upstream, downstream = _drop(upstream_pressure_kpa, downstream_pressure_kpa)
    flow = positive("flow_rate_cm3_s", flow_rate_cm3_s) * positive("viscosity_mpas", viscosity_mpas)
    factor = positive("area_cm2", area_cm2) / positive("length_cm", length_cm)
    return LIQUID_CONSTANT * flow / (factor * (upstream - downstream))


def grouped(group: ArrayLike, *columns: Array) -> tuple[NDArray[np.intp], int, list[Array]]:
    """Groups checked, how many there are, and the columns in the groups' shape."""
    labels = np.atleast_1d(np.asarray(group))
    refuse(labels.astype(np.float64) < 0, "group", labels, "whole numbers from 0")
    refuse(labels != np.trunc(labels.astype(np.float64)), "group", labels, "whole numbers from 0")
    labels, *spread = np.broadcast_arrays(labels.astype(np.intp), *columns)
    return labels, int(labels.max(initial=-1)) + 1, list(spread)


def group_sums(values: Array, labels: NDArray[np.intp], n: int) -> Array:
    """Sum of each group, complex or not."""
    sums: Array = np.bincount(labels, weights=values.real, minlength=n).astype(np.float64, copy=False)
    if values.dtype.kind == "c":  # bincount drops the imaginary part
        sums = sums + 1j * np.bincount(labels, weights=values.imag, minlength=n)
    return sums


def different_values(values: Array, labels: NDArray[np.intp], n: int) -> NDArray[np.intp]:
    """How many different values each group has."""
    order = np.lexsort((values.real, labels))
    sorted_labels, sorted_values = labels[order], values.real[order]
    new = np.ones(order.size, dtype=np.bool_)
    new[1:] = (sorted_labels[1:] != sorted_labels[:-1]) | (sorted_values[1:] != sorted_values[:-1])
    return np.bincount(sorted_labels[new], minlength=n)


@dataclass(frozen=True, slots=True)
class Lines:
    """Straight lines, one a group; `unexplained` is the (weighted) sum of squares about them."""

    slope: Array
    intercept: Array
    slope_variance: Array
    intercept_variance: Array
    covariance: Array
    r_squared: Array
    unexplained: Array
    points: NDArray[np.intp]


def group_lines(
    x: Array,
    y: Array,
    labels: NDArray[np.intp],
    n: int,
    different: NDArray[np.intp],
    weights: Array | None = None,
) -> Lines:
    """Least squares of y on x in each group; NaN below three different x.

    With weights 1/u^2 the variances follow from them alone; without, from the scatter about the line.
    """
    points = np.bincount(labels, minlength=n)
    with np.errstate(invalid="ignore", divide="ignore"):
        w = 1.0 if weights is None else weights
        total = points if weights is None else group_sums(weights, labels, n)
        x_mean, y_mean = group_sums(w * x, labels, n) / total, group_sums(w * y, labels, n) / total
        dx, dy = x - x_mean[labels], y - y_mean[labels]
        sxx = np.where(different >= 3, group_sums(w * dx * dx, labels, n), np.nan)
        slope = group_sums(w * dx * dy, labels, n) / sxx
        intercept = y_mean - slope * x_mean
        unexplained = group_sums(w * (dy - slope[labels] * dx) ** 2, labels, n)
        slope_variance = (unexplained / (points - 2) if weights is None else 1.0) / sxx
        return Lines(
            slope,
            intercept,
            slope_variance,
            slope_variance * (sxx / total + x_mean**2),
            -slope_variance * x_mean,
            1.0 - unexplained / group_sums(w * dy * dy, labels, n),
            unexplained,
            points,
        )


@dataclass(frozen=True, slots=True)
class Klinkenberg:
    """Klinkenberg lines, one a group.

    `covariance_md_kpa` is of k_infinity and slip factor, `slope_md_kpa` the slope (which is not the slip
    factor). `refused` marks an intercept that is not above 0: no rock has it, and the value is shown so
    that the fault can be found. `chi_square` is the sum of squares about the line: with weights to be
    compared with points - 2, without them in md2.
    """

    k_infinity_md: Array
    slip_factor_kpa: Array
    slope_md_kpa: Array
    k_infinity_se_md: Array
    slip_factor_se_kpa: Array
    slope_se_md_kpa: Array
    covariance_md_kpa: Array
    r_squared: Array
    points: NDArray[np.intp]
    refused: Mask
    chi_square: Array


def klinkenberg_regression(
    gas_permeability_md: ArrayLike,
    mean_pressure_kpa: ArrayLike,
    group: ArrayLike,
    weights: ArrayLike | None = None,
) -> Klinkenberg:
    """Permeability at infinite pressure and slip factor, from steps at several mean pressures.

    Parameters
    ----------
    gas_permeability_md : array_like (n,)
        Gas permeabilities of the steps [md], above 0.
    mean_pressure_kpa : array_like (n,)
        Their mean absolute pressures [kPa], above 0.
    group : array_like of int (n,)
        Which line a step belongs to, 0 to m - 1 (one plug, direction, gas and stress).
    weights : array_like (n,), optional
        1/u^2 of each step, u the standard uncertainty of its permeability [md], above 0; without them all
        steps count alike.

    Returns
    -------
    Klinkenberg
        Arrays (m,): k_infinity [md], slip factor [kPa], slope [md kPa], standard errors, covariance of
        k_infinity and slip factor [md kPa], r squared, points, `refused`, and chi square. NaN for a group
        with fewer than three different mean pressures or with a missing step.

    Raises
    ------
    Impossible
        If a permeability, a mean pressure or a weight is not above 0, or a group not a whole number from 0.

    Notes
    -----
    k_g = k_inf (1 + b/p_m): least squares of k_g on 1/p_m gives intercept k_inf and slope m; b = m/k_inf.
    Standard error of b to first order: var b = (var m - 2 b cov(m, k) + b^2 var k)/k^2. Straight only
    without inertia. At least three mean pressures: ASTM D4525. With weights the standard errors follow from
    them, not from the scatter; chi square tells whether the two agree.

    References
    ----------
    Klinkenberg, L. J. 1941, "The permeability of porous media to liquids and gases", API Drilling and
    Production Practice, 200-213 (from memory).

    Examples
    --------
    >>> line = klinkenberg_regression([2.0, 1.5, 1.25], [100.0, 200.0, 400.0], [0, 0, 0])
    >>> line.k_infinity_md.round(9).tolist(), line.slip_factor_kpa.round(9).tolist()
    ([1.0], [100.0])
    """
    permeability = positive("gas_permeability_md", gas_permeability_md)
    pressure = positive("mean_pressure_kpa", mean_pressure_kpa)
    if weights is None:
        labels, n, (permeability, pressure) = grouped(group, permeability, pressure)
        w = None
    else:
        given = positive("weights", weights)
        labels, n, (permeability, pressure, w) = grouped(group, permeability, pressure, given)
    line = group_lines(1.0 / pressure, permeability, labels, n, different_values(pressure, labels, n), w)
    with np.errstate(invalid="ignore", divide="ignore"):
        k, b = line.intercept, line.slope / line.intercept
        b_variance = (line.slope_variance - 2.0 * b * line.covariance + b**2 * line.intercept_variance) / k**2
        return Klinkenberg(
            k,
            b,
            line.slope,
            np.sqrt(line.intercept_variance),
            np.sqrt(b_variance),
            np.sqrt(line.slope_variance),
            (line.covariance - b * line.intercept_variance) / k,
            line.r_squared,
            line.points,
            k.real <= 0.0,
            line.unexplained,
        )


def _power_slip(coefficient_psi: float, exponent: float, k_md: Array) -> Array:
    return coefficient_psi * PSI_KPA * k_md**exponent


def slip_heid_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor of dry rock to air, after Heid and others.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 11.419 k^-0.39 [psi], k Klinkenberg permeability [md] (0.777 in atm, 0.11 in Pa with k in m2).
    Published range: 0.01 to 1000 md, air.

    References
    ----------
    Heid, J. G., McMahon, J. J., Nielsen, R. F. & Yuster, S. T. 1950, "Study of the permeability of rocks
    to homogeneous fluids", API Drilling and Production Practice, 230-246 (from memory).

    Examples
    --------
    >>> round(float(slip_heid_kpa(0.1)) / 6.894757, 2)
    28.03
    """
    return _power_slip(11.419, -0.39, positive("k_infinity_md", k_infinity_md))


def slip_jones_owens_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor of tight gas sand, after Jones & Owens.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 12.639 k^-0.33 [psi], k Klinkenberg permeability [md] (0.86 in atm, 0.98 in Pa with k in m2).
    Published range: 0.0001 to 1 md.

    References
    ----------
    Jones, F. O. & Owens, W. W. 1980, "A laboratory study of low-permeability gas sands", J. Pet. Technol.
    32:1631-1640 (coefficient in psi from memory).

    Examples
    --------
    >>> round(float(slip_jones_owens_kpa(0.1)) / 6.894757, 3)
    27.022
    """
    return _power_slip(12.639, -0.33, positive("k_infinity_md", k_infinity_md))


def slip_jones_1972_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor to air, after Jones 1972.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 6.9 k^-0.36 [psi], k Klinkenberg permeability [md]. The slope b k is therefore 6.9 k^0.64.
    Published range: not stated where quoted.

    References
    ----------
    Jones, S. C. 1972, "A rapid accurate unsteady-state Klinkenberg permeameter", SPE J. 12:383-397, as
    quoted by Ahmed, T., "Reservoir Engineering Handbook", ch. 4.

    Examples
    --------
    >>> round(float(slip_jones_1972_kpa(0.1)) / 6.894757, 3)
    15.807
    """
    return _power_slip(6.9, -0.36, positive("k_infinity_md", k_infinity_md))


def slip_rp40_air_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor to air, API RP 40 equation A-7.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 5.71 k^-0.382 [psi], k Klinkenberg permeability [md]. Published range: not stated where quoted;
    taken as 0.01 to 2000 md (common practice).

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7 (as quoted).

    Examples
    --------
    >>> round(float(slip_rp40_air_kpa(0.1)) / 6.894757, 3)
    13.761
    """
    return _power_slip(5.71, -0.382, positive("k_infinity_md", k_infinity_md))


def slip_rp40_helium_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor to helium, API RP 40 equation A-7.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 16.4 k^-0.382 [psi], k Klinkenberg permeability [md]. Published range: not stated where quoted;
    taken as 0.01 to 2000 md (common practice).

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7 (as quoted).

    Examples
    --------
    >>> round(float(slip_rp40_helium_kpa(0.1)) / 6.894757, 3)
    39.522
    """
    return _power_slip(16.4, -0.382, positive("k_infinity_md", k_infinity_md))


def _porosity(porosity_frac: ArrayLike) -> Array:
    porosity = positive("porosity_frac", porosity_frac)
    refuse(porosity.real >= 1.0, "porosity_frac", porosity, "a fraction below 1")
    return porosity


def slip_sampath_keighin_kpa(k_infinity_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Slip factor of water-bearing tight sand to nitrogen, after Sampath & Keighin.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Slip factor [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    b = 13.851 (k/phi)^-0.53 [psi], k Klinkenberg permeability [md], phi porosity. Often misprinted 13.581.
    Published range: tight sand, about 0.001 to 1 md (from memory).

    References
    ----------
    Sampath, K. & Keighin, C. W. 1982, "Factors affecting gas slippage in tight sandstones of Cretaceous
    age in the Uinta basin", J. Pet. Technol. 34:2715-2720 (from memory).

    Examples
    --------
    >>> round(float(slip_sampath_keighin_kpa(0.1, 0.1)) / 6.894757, 3)
    13.851
    """
    k_over_phi = positive("k_infinity_md", k_infinity_md) / _porosity(porosity_frac)
    return _power_slip(13.851, -0.53, k_over_phi)


def slip_florence_nitrogen_kpa(k_infinity_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Slip factor to nitrogen, after Florence and others.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Slip factor [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    b = 43.345 (k/phi)^-0.5 [psi], k Klinkenberg permeability [md], phi porosity; from 4 lambda p/r with the
    pore radius r of a bundle of tubes, which gives 43.52 at 25 degC. Published range: theory, tight rock.

    References
    ----------
    Florence, F. A., Rushing, J. A., Newsham, K. E. & Blasingame, T. A. 2007, "Improved permeability
    prediction relations for low permeability sands", SPE 107954 (from memory).

    Examples
    --------
    >>> round(float(slip_florence_nitrogen_kpa(0.1, 0.1)) / 6.894757, 3)
    43.345
    """
    k_over_phi = positive("k_infinity_md", k_infinity_md) / _porosity(porosity_frac)
    return _power_slip(43.345, -0.5, k_over_phi)


def slip_florence_air_kpa(k_infinity_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Slip factor to air, after Florence and others.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Slip factor [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    b = 44.106 (k/phi)^-0.5 [psi], k Klinkenberg permeability [md], phi porosity. Published range: theory,
    tight rock.

    References
    ----------
    Florence, F. A., Rushing, J. A., Newsham, K. E. & Blasingame, T. A. 2007, "Improved permeability
    prediction relations for low permeability sands", SPE 107954 (from memory).

    Examples
    --------
    >>> round(float(slip_florence_air_kpa(0.1, 0.1)) / 6.894757, 3)
    44.106
    """
    k_over_phi = positive("k_infinity_md", k_infinity_md) / _porosity(porosity_frac)
    return _power_slip(44.106, -0.5, k_over_phi)


def slip_tanikawa_shimamoto_kpa(k_infinity_md: ArrayLike) -> Array:
    """Slip factor of sedimentary rock to nitrogen, after Tanikawa & Shimamoto.

    Parameters
    ----------
    k_infinity_md : array_like
        Klinkenberg permeability [md], above 0.

    Returns
    -------
    Array
        Slip factor [kPa], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    b = 0.15 k^-0.37 [Pa], k Klinkenberg permeability [m2]. Published range: about 1e-20 to 1e-12 m2,
    sediments of Taiwan (range and coefficients from memory).

    References
    ----------
    Tanikawa, W. & Shimamoto, T. 2009, "Comparison of Klinkenberg-corrected gas permeability and water
    permeability in sedimentary rocks", Int. J. Rock Mech. Min. Sci. 46:229-238 (from memory).

    Examples
    --------
    >>> round(float(slip_tanikawa_shimamoto_kpa(0.1)) / 6.894757, 2)
    18.18
    """
    k_m2 = positive("k_infinity_md", k_infinity_md) * MILLIDARCY_M2
    return 0.15 * k_m2**-0.37 / 1000.0


def slip_scaled_kpa(
    slip_factor_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    molar_mass_g_mol: ArrayLike,
    temperature_degc: ArrayLike,
    other_viscosity_mpas: ArrayLike,
    other_molar_mass_g_mol: ArrayLike,
    other_temperature_degc: ArrayLike,
) -> Array:
    """Slip factor brought to another gas and temperature.

    Parameters
    ----------
    slip_factor_kpa : array_like
        Slip factor to the first gas [kPa], 0 or more.
    viscosity_mpas, molar_mass_g_mol, temperature_degc : array_like
        Viscosity [mPa s], molar mass [g/mol] and temperature [degC] of the first gas.
    other_viscosity_mpas, other_molar_mass_g_mol, other_temperature_degc : array_like
        The same of the other gas.

    Returns
    -------
    Array
        Slip factor to the other gas [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a slip factor is negative, a viscosity or a molar mass not above 0, or a temperature not above
        absolute zero.

    Notes
    -----
    b2 = b1 (mu2/mu1) sqrt(T2 M1/(T1 M2)): b is proportional to the mean free path; mu viscosity, M molar
    mass, T absolute temperature.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6, eq. 31 (worked example seen as an image).

    Examples
    --------
    >>> round(float(slip_scaled_kpa(6.57, 0.01967, 4.0026, 22.222, 0.01837, 29.0, 23.889)), 3)
    2.286
    """
    slip = not_negative("slip_factor_kpa", slip_factor_kpa)
    viscosities = positive("other_viscosity_mpas", other_viscosity_mpas) / positive(
        "viscosity_mpas", viscosity_mpas
    )
    masses = positive("molar_mass_g_mol", molar_mass_g_mol) / positive(
        "other_molar_mass_g_mol", other_molar_mass_g_mol
    )
    temperatures = kelvin("other_temperature_degc", other_temperature_degc) / kelvin(
        "temperature_degc", temperature_degc
    )
    return slip * viscosities * np.sqrt(temperatures * masses)


def slip_between_gases_kpa(
    slip_factor_kpa: ArrayLike, gas: ArrayLike, other_gas: ArrayLike, temperature_degc: ArrayLike
) -> Array:
    """Slip factor brought from one gas to another at the same temperature.

    Parameters
    ----------
    slip_factor_kpa : array_like
        Slip factor to the first gas [kPa], 0 or more.
    gas, other_gas : text or array of texts
        'nitrogen', 'air' or 'helium'; an empty text is a missing one.
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Slip factor to the other gas [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a slip factor is negative, a gas not known or a temperature not above absolute zero.

    Notes
    -----
    b2 = b1 lambda2/lambda1, lambda the mean free paths, mu sqrt(T/M) at 1 atm.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6, eq. 31.

    Examples
    --------
    >>> round(float(slip_between_gases_kpa(1.0, "air", "helium", 25.0)), 2)
    2.9
    """
    known_gas("other_gas", other_gas)
    path = mean_free_path_m(gas, temperature_degc, ATMOSPHERE_KPA)
    other = mean_free_path_m(other_gas, temperature_degc, ATMOSPHERE_KPA)
    return not_negative("slip_factor_kpa", slip_factor_kpa) * other / path


def slip_corrected_md(
    gas_permeability_md: ArrayLike,
    mean_pressure_kpa: ArrayLike,
    gas: ArrayLike,
    temperature_degc: ArrayLike,
) -> Array:
    """Klinkenberg permeability estimated from one gas permeability.

    Parameters
    ----------
    gas_permeability_md : array_like
        Gas permeability at one mean pressure [md], above 0.
    mean_pressure_kpa : array_like
        Mean absolute pressure [kPa], above 0.
    gas : text or array of texts
        'nitrogen', 'air' or 'helium'; an empty text is a missing one.
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Klinkenberg permeability [md], broadcast shape: an estimate, to be named as one.

    Raises
    ------
    Impossible
        If a permeability or a pressure is not above 0, a gas not known, or a temperature not above
        absolute zero.

    Notes
    -----
    k_g = k (1 + b(k)/p_m), b(k) = 5.71 k^-0.382 [psi] lambda_gas/lambda_air, solved for k by Newton's
    steps in ln k, where the function is convex and rising, so that they cannot fail. lambda mean free
    path, p_m mean pressure. The last step is taken with the arguments as given, complex or not: at the
    root it carries the implicit derivative. Published range: as `slip_rp40_air_kpa`.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7, and eq. 31 for the gas.

    Examples
    --------
    >>> round(float(slip_corrected_md(11.97, 18.0 * 6.894757293168, "air", 23.889)), 3)
    10.605
    """
    permeability = positive("gas_permeability_md", gas_permeability_md)
    pressure = positive("mean_pressure_kpa", mean_pressure_kpa)
    known_gas("gas", gas)
    ratio = slip_between_gases_kpa(1.0, "air", gas, temperature_degc)
    slip = 5.71 * PSI_KPA * ratio / pressure
    permeability, slip = np.broadcast_arrays(permeability, slip)

    def step(log_k: Array, target: Array, c: Array) -> Array:
        """One Newton step of ln k + ln(1 + b/p) = ln k_g."""
        share = c * np.exp(-0.382 * log_k)  # b/p at this k
        excess = log_k + np.log1p(share) - np.log(target)
        return log_k - excess / (1.0 - 0.382 * share / (1.0 + share))

    log_k = np.log(permeability.real)
    for _ in range(12):
        log_k = step(log_k, permeability.real, slip.real)
    return np.exp(step(log_k, permeability, slip))


@dataclass(frozen=True, slots=True)
class Forchheimer:
    """Cornell-Katz lines, one a group; `refused` marks a permeability or an inertial coefficient below 0."""

    permeability_md: Array
    inertial_coefficient_1_m: Array
    permeability_se_md: Array
    inertial_coefficient_se_1_m: Array
    r_squared: Array
    points: NDArray[np.intp]
    refused: Mask


def forchheimer_regression(
    flow_rate_cm3_s: ArrayLike,
    flow_pressure_kpa: ArrayLike,
    upstream_pressure_kpa: ArrayLike,
    downstream_pressure_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    molar_mass_g_mol: ArrayLike,
    temperature_degc: ArrayLike,
    length_cm: ArrayLike,
    area_cm2: ArrayLike,
    group: ArrayLike,
) -> Forchheimer:
    """Permeability and inertial coefficient from gas flow at several rates.

    Parameters
    ----------
    flow_rate_cm3_s, flow_pressure_kpa : array_like (n,)
        Flow rates at the plug's temperature [cm3/s] and the absolute pressures they refer to [kPa].
    upstream_pressure_kpa, downstream_pressure_kpa : array_like (n,)
        Absolute pressures of the two ends [kPa], upstream above downstream.
    viscosity_mpas, molar_mass_g_mol, temperature_degc : array_like (n,) or one value
        Of the gas [mPa s, g/mol, degC].
    length_cm, area_cm2 : array_like (n,) or one value
        Length [cm] and cross-section [cm2] of the plug, above 0.
    group : array_like of int (n,)
        Which line a step belongs to, 0 to m - 1.

    Returns
    -------
    Forchheimer
        Arrays (m,): permeability [md], inertial coefficient [1/m], their standard errors, r squared,
        points, and `refused`. NaN for a group with fewer than three different flows or a missing step.

    Raises
    ------
    Impossible
        If a rate, a pressure (downstream: negative), a viscosity, a molar mass, a length or an area is
        not above 0, a temperature not above absolute zero, an upstream pressure not above the downstream
        one, or a group not a whole number from 0.

    Notes
    -----
    M A (p1^2 - p2^2)/(2 R T mu L W) = 1/k + beta W/(mu A), W mass rate q p M/(R T): least squares gives
    1/k and beta; k permeability, beta inertial coefficient, M molar mass, A area, R gas constant, T
    absolute temperature, mu viscosity, L length. Ideal gas; slip is not separated.

    References
    ----------
    Cornell, D. & Katz, D. L. 1953, "Flow of gases through consolidated porous media", Ind. Eng. Chem.
    45:2145-2152 (from memory); Tiab, D. & Donaldson, E. C. 2004, "Petrophysics", 2nd ed., eq. 7.115a,
    p. 454.

    Examples
    --------
    >>> found = forchheimer_regression(
    ...     [20.0, 60.0, 120.0, 200.0], 101.325,
    ...     [207.2522, 332.4017, 466.0545, 607.9419], 101.325,
    ...     0.017665854, 28.0134, 22.0, 5.08, 11.400918, [0, 0, 0, 0])
    >>> found.permeability_md.round(1).tolist()
    [100.0]
    """
    upstream, downstream = _drop(upstream_pressure_kpa, downstream_pressure_kpa)
    viscosity_pas = positive("viscosity_mpas", viscosity_mpas) * 1e-3
    molar_mass_kg = positive("molar_mass_g_mol", molar_mass_g_mol) * 1e-3
    kelvins = kelvin("temperature_degc", temperature_degc)
    length_m = positive("length_cm", length_cm) * 1e-2
    area_m2 = positive("area_cm2", area_cm2) * 1e-4
    flow_w = positive("flow_rate_cm3_s", flow_rate_cm3_s) * positive("flow_pressure_kpa", flow_pressure_kpa)
    molar_rate = flow_w * 1e-3 / (GAS_CONSTANT_J_MOL_K * kelvins)
    mass_rate = molar_rate * molar_mass_kg
    driving_pa2 = (upstream - downstream) * (upstream + downstream) * 1e6
    # M/W is 1/molar rate
    y = area_m2 * driving_pa2 / (2.0 * GAS_CONSTANT_J_MOL_K * kelvins * viscosity_pas * length_m * molar_rate)
    x = mass_rate / (viscosity_pas * area_m2)
    labels, n, (x, y) = grouped(group, x, y)
    line = group_lines(x, y, labels, n, different_values(x, labels, n))
    with np.errstate(invalid="ignore", divide="ignore"):
        return Forchheimer(
            1.0 / line.intercept / MILLIDARCY_M2,
            line.slope,
            np.sqrt(line.intercept_variance) / line.intercept**2 / MILLIDARCY_M2,
            np.sqrt(line.slope_variance),
            line.r_squared,
            line.points,
            (line.intercept.real <= 0.0) | (line.slope.real < 0.0),
        )


@dataclass(frozen=True, slots=True)
class SlipInertia:
    """Slip and inertia fitted together, one result a group.

    `chi_square` and `chi_square_slip_only` are the sums of squares of permeability about the fit with
    inertia and about the Klinkenberg line without, weighted or in md2. `demanded` marks the groups whose
    steps show an inertia above 0 that the line without it cannot explain; elsewhere the line is to be used.
    """

    k_infinity_md: Array
    slip_factor_kpa: Array
    inertial_coefficient_1_m: Array
    k_infinity_se_md: Array
    slip_factor_se_kpa: Array
    inertial_coefficient_se_1_m: Array
    chi_square: Array
    chi_square_slip_only: Array
    points: NDArray[np.intp]
    demanded: Mask


def _joint_normal(
    theta: Array, x: Array, z: Array, k: Array, w: Array, labels: NDArray[np.intp]
) -> tuple[Array, Array, Array, Array]:
    """Of sum w (K - k)^2/2 with K = s/(1 + beta z s), s = a + m x: value, gradient, Hessian, J'wJ."""
    n = theta.shape[0]
    a, m, beta = theta[labels].T
    s = a + m * x
    d = 1.0 + beta * z * s
    fitted = s / d
    by_s, by_beta = 1.0 / d**2, -z * fitted**2
    slopes = np.stack([by_s, by_s * x, by_beta])
    by_ss, by_sb, by_bb = -2.0 * beta * z / d**3, -2.0 * z * s / d**3, 2.0 * z**2 * fitted**3
    bends = (
        (by_ss, by_ss * x, by_sb),
        (by_ss * x, by_ss * x * x, by_sb * x),
        (by_sb, by_sb * x, by_bb),
    )
    r = fitted - k
    value = group_sums(w * r * r, labels, n)
    gradient = np.stack([group_sums(w * r * slopes[i], labels, n) for i in range(3)], axis=-1)
    square = np.stack(
        [
            np.stack([group_sums(w * slopes[i] * slopes[j], labels, n) for j in range(3)], -1)
            for i in range(3)
        ],
        axis=-2,
    )
    bent = np.stack(
        [np.stack([group_sums(w * r * bends[i][j], labels, n) for j in range(3)], -1) for i in range(3)],
        axis=-2,
    )
    return value, gradient, square + bent, square


def _solved(matrix: Array, right: Array) -> Array:
    """Solutions of small systems, scaled to a diagonal of ones; NaN where a system is not finite."""
    diagonal = np.abs(np.diagonal(matrix, axis1=-2, axis2=-1).real)
    finite = np.isfinite(matrix).all(axis=(-2, -1)) & np.isfinite(right).all(axis=-1)
    usable: Mask = np.asarray(finite & (diagonal > 0.0).all(axis=-1))[:, np.newaxis]
    scale = 1.0 / np.sqrt(np.where(usable, diagonal, 1.0))
    scaled: Array = np.where(
        usable[..., np.newaxis],
        matrix * scale[:, :, np.newaxis] * scale[:, np.newaxis, :],
        np.eye(matrix.shape[-1]),
    )
    sides: Array = (np.where(usable, right, 0.0) * scale)[..., np.newaxis]
    found: Array = np.linalg.solve(scaled, sides)[..., 0] * scale
    return np.where(usable, found, np.nan)


def _joint_start(x: Array, z: Array, k: Array, w: Array, labels: NDArray[np.intp], n: int) -> Array:
    """The best of a few inertias, each with its straight line of k/(1 - beta z k) on x (real numbers)."""
    most = np.full(n, np.inf)
    np.minimum.at(most, labels, 1.0 / (z * k))
    best, least = np.full((n, 3), np.nan), np.full(n, np.inf)
    for share in 1.0 - 0.75 ** np.arange(24):
        beta = share * most
        open_share = 1.0 - beta[labels] * z * k
        # a step's k changes with its s as (1 - beta z k)^2
        line = group_lines(x, k / open_share, labels, n, np.full(n, 3), w * open_share**4)
        theta = np.stack([line.intercept, line.slope, beta], axis=-1)
        value = _joint_normal(theta, x, z, k, w, labels)[0]
        better = value < least
        best[better], least = theta[better], np.where(better, value, least)
    return best


def slip_inertia_regression(
    gas_permeability_md: ArrayLike,
    mean_pressure_kpa: ArrayLike,
    flow_rate_cm3_s: ArrayLike,
    flow_pressure_kpa: ArrayLike,
    viscosity_mpas: ArrayLike,
    molar_mass_g_mol: ArrayLike,
    temperature_degc: ArrayLike,
    area_cm2: ArrayLike,
    group: ArrayLike,
    weights: ArrayLike | None = None,
) -> SlipInertia:
    """Klinkenberg permeability, slip factor and inertial coefficient together, from steps at several rates.

    Parameters
    ----------
    gas_permeability_md : array_like (n,)
        Gas permeabilities of the steps without regard to inertia [md], above 0 (`gas_permeability_md`).
    mean_pressure_kpa : array_like (n,)
        Their mean absolute pressures [kPa], above 0.
    flow_rate_cm3_s, flow_pressure_kpa : array_like (n,)
        Flow rates at the plug's temperature [cm3/s] and the absolute pressures they refer to [kPa].
    viscosity_mpas, molar_mass_g_mol, temperature_degc : array_like (n,) or one value
        Of the gas [mPa s, g/mol, degC].
    area_cm2 : array_like (n,) or one value
        Cross-section of the plug [cm2], above 0.
    group : array_like of int (n,)
        Which line a step belongs to, 0 to m - 1 (one plug, direction, gas and stress).
    weights : array_like (n,), optional
        1/u^2 of each step, u the standard uncertainty of its permeability [md], above 0; without them all
        steps count alike.

    Returns
    -------
    SlipInertia
        Arrays (m,): k_infinity [md], slip factor [kPa], inertial coefficient [1/m], their standard errors,
        chi square with and without inertia, points, and `demanded`. NaN for a group with fewer than four
        different flows, fewer than three different mean pressures, a missing step, or no solution.

    Raises
    ------
    Impossible
        If a permeability, a pressure, a rate, a viscosity, a molar mass, an area or a weight is not above 0,
        a temperature not above absolute zero, or a group not a whole number from 0.

    Notes
    -----
    1/k_app = 1/(k (1 + b/p_m)) + beta W/(mu A), W mass rate q p M/(R T): least squares of k_app, by damped
    Gauss-Newton steps and then full Newton steps; k permeability, b slip factor, p_m mean pressure, beta
    inertial coefficient, mu viscosity, A area, M molar mass, R gas constant, T absolute temperature. The
    last step is taken with the arguments as given, complex or not, and so carries the implicit derivative.
    Demanded: beta above 0, and at 1 % the fall of the sum of squares is too great for chance: F with 1 and
    n - 3 degrees of freedom without weights, chi square with 1 degree with them. Steps without inertia are
    so marked in about 0.5 % of groups, since half of the chance findings lie below 0. With weights the
    standard errors follow from them, not from the scatter.

    References
    ----------
    Klinkenberg, L. J. 1941, API Drilling and Production Practice, 200-213 (from memory); Cornell, D. & Katz,
    D. L. 1953, "Flow of gases through consolidated porous media", Ind. Eng. Chem. 45:2145-2152 (from
    memory).

    Examples
    --------
    >>> pressure = np.array([120.0, 180.0, 300.0, 500.0, 700.0])
    >>> rate = np.array([2.0, 9.0, 30.0, 80.0, 160.0])
    >>> resistance = 5e8 * rate * 101.325e-3 * 28.0e-3 / (8.314462618 * 295.15) / (17.7e-6 * 11.4e-4)
    >>> k = 1.0 / (1.0 / (20.0 * (1.0 + 40.0 / pressure)) + resistance * 1e-15 / 1.01325)
    >>> found = slip_inertia_regression(k, pressure, rate, 101.325, 0.0177, 28.0, 22.0, 11.4, [0] * 5)
    >>> [round(float(v[0]), 3) for v in (found.k_infinity_md, found.slip_factor_kpa)]
    [20.0, 40.0]
    >>> print(f"{float(found.inertial_coefficient_1_m[0]):.4g}", found.demanded)
    5e+08 [ True]
    """
    from scipy.stats import chi2, f

    k_app = positive("gas_permeability_md", gas_permeability_md)
    pressure = positive("mean_pressure_kpa", mean_pressure_kpa)
    flow = positive("flow_rate_cm3_s", flow_rate_cm3_s) * positive("flow_pressure_kpa", flow_pressure_kpa)
    molar_mass_kg = positive("molar_mass_g_mol", molar_mass_g_mol) * 1e-3
    mass_rate = (
        flow * 1e-3 * molar_mass_kg / (GAS_CONSTANT_J_MOL_K * kelvin("temperature_degc", temperature_degc))
    )
    viscosity_pas = positive("viscosity_mpas", viscosity_mpas) * 1e-3
    z = MILLIDARCY_M2 * mass_rate / (viscosity_pas * positive("area_cm2", area_cm2) * 1e-4)
    given = np.ones(()) if weights is None else positive("weights", weights)
    labels, n, (k_app, x, z, w, flow) = grouped(group, k_app, 1.0 / pressure, z, given, flow)
    slip_only = group_lines(x, k_app, labels, n, different_values(x, labels, n), w)
    points = slip_only.points
    enough = (different_values(flow, labels, n) >= 4) & (different_values(x, labels, n) >= 3)
    missing = np.bincount(labels, weights=np.isnan(k_app * x * z * w * flow), minlength=n) > 0
    usable = enough & ~missing
    with np.errstate(all="ignore"):
        kept = usable[labels]
        x_real, z_real, k_real, w_real = (np.where(kept, c.real, 1.0) for c in (x, z, k_app, w))
        theta = _joint_start(x_real, z_real, k_real, w_real, labels, n)
        damping = np.full(n, 1e-3)
        value, gradient, _, square = _joint_normal(theta, x_real, z_real, k_real, w_real, labels)
        for _ in range(60):
            lifted = square * (1.0 + damping[:, np.newaxis, np.newaxis] * np.eye(3))
            tried = theta - _solved(lifted, gradient)
            better = _joint_normal(tried, x_real, z_real, k_real, w_real, labels)[0] <= value
            theta = np.where(better[:, np.newaxis], tried, theta)
            damping = np.where(better, damping / 10.0, damping * 10.0)
            value, gradient, _, square = _joint_normal(theta, x_real, z_real, k_real, w_real, labels)
        for _ in range(4):
            _, gradient, hessian, _ = _joint_normal(theta, x_real, z_real, k_real, w_real, labels)
            theta = theta - _solved(hessian, gradient)
        least = value
        _, gradient, hessian, _ = _joint_normal(theta, x, z, k_app, w, labels)
        theta = theta - _solved(hessian, gradient)
        value, _, _, square = _joint_normal(theta, x, z, k_app, w, labels)
        noise = value / (points - 3) if weights is None else np.ones(n)
        unit = np.broadcast_to(np.eye(3), (n, 3, 3))
        spread = np.stack([_solved(square, unit[:, i]) for i in range(3)], axis=-1)
        spread = spread * noise[:, np.newaxis, np.newaxis]
        k, b, beta = theta[:, 0], theta[:, 1] / theta[:, 0], theta[:, 2]
        b_variance = (spread[:, 1, 1] - 2.0 * b * spread[:, 0, 1] + b**2 * spread[:, 0, 0]) / k**2
        fall = slip_only.unexplained.real - value.real
        if weights is None:
            chance = f.sf(fall / noise.real, 1, points - 3)
        else:
            chance = chi2.sf(fall, 1)
        # what rounding alone leaves about a perfect fit is neither evidence nor a failure
        rounding = 1e-20 * group_sums(w.real * k_app.real**2, labels, n)
        found = usable & (value.real <= 1.000001 * least + rounding) & (k.real > 0.0)
        seen = slip_only.unexplained.real > rounding
    demanded = found & seen & (beta.real > 0.0) & (chance < 0.01)

    def there(numbers: Array) -> Array:
        return np.where(found, numbers, np.nan)

    return SlipInertia(
        there(k),
        there(b),
        there(beta),
        there(np.sqrt(spread[:, 0, 0])),
        there(np.sqrt(b_variance)),
        there(np.sqrt(spread[:, 2, 2])),
        there(value),
        np.where(missing, np.nan, slip_only.unexplained),
        points,
        demanded,
    )


def inertia_geertsma_1_m(permeability_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Inertial coefficient after Geertsma.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Inertial coefficient [1/m], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    beta = 4.85e4/(phi^5.5 k^0.5) [1/ft], k permeability [md], phi porosity. Correlations of beta scatter
    over about one order of magnitude.

    References
    ----------
    Geertsma, J. 1974, "Estimating the coefficient of inertial resistance in fluid flow through porous
    media", SPE J. 14:445-450; Tiab, D. & Donaldson, E. C. 2004, "Petrophysics", 2nd ed., eq. 7.116b, p. 455.

    Examples
    --------
    >>> print(f"{float(inertia_geertsma_1_m(100.0, 0.20)) * 0.3048:.3g}")
    3.39e+07
    """
    permeability = positive("permeability_md", permeability_md)
    return 4.85e4 / FOOT_M / (_porosity(porosity_frac) ** 5.5 * permeability**0.5)


def inertia_tiab_donaldson_1_m(permeability_md: ArrayLike) -> Array:
    """Inertial coefficient as given by Tiab & Donaldson.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.

    Returns
    -------
    Array
        Inertial coefficient [1/m], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    beta = 4.11e10/k^(4/3) [1/ft], k permeability [md].

    References
    ----------
    Tiab, D. & Donaldson, E. C. 2004, "Petrophysics", 2nd ed., eq. 7.116a.

    Examples
    --------
    >>> print(f"{float(inertia_tiab_donaldson_1_m(100.0)) * 0.3048:.4g}")
    8.855e+07
    """
    return 4.11e10 / FOOT_M * positive("permeability_md", permeability_md) ** (-4.0 / 3.0)


def inertia_firoozabadi_katz_1_m(permeability_md: ArrayLike) -> Array:
    """Inertial coefficient after Firoozabadi & Katz.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.

    Returns
    -------
    Array
        Inertial coefficient [1/m], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    beta = 2.33e10/k^1.2 [1/ft], k permeability [md].

    References
    ----------
    Firoozabadi, A. & Katz, D. L. 1979, "An analysis of high-velocity gas flow through porous media",
    J. Pet. Technol. 31:211-216 (as quoted in a formula sheet).

    Examples
    --------
    >>> print(f"{float(inertia_firoozabadi_katz_1_m(100.0)) * 0.3048:.4g}")
    9.276e+07
    """
    return 2.33e10 / FOOT_M * positive("permeability_md", permeability_md) ** -1.2


def inertia_jones_1_m(permeability_md: ArrayLike) -> Array:
    """Inertial coefficient after Jones.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.

    Returns
    -------
    Array
        Inertial coefficient [1/m], shape of the input.

    Raises
    ------
    Impossible
        If a permeability is not above 0.

    Notes
    -----
    beta = 6.15e10 k^-1.55 [1/ft], k permeability [md].

    References
    ----------
    Jones, S. C. 1987, "Using the inertial coefficient, beta, to characterize heterogeneity in reservoir
    rock", SPE 16949 (from memory).

    Examples
    --------
    >>> print(f"{float(inertia_jones_1_m(100.0)) * 0.3048:.4g}")
    4.885e+07
    """
    return 6.15e10 / FOOT_M * positive("permeability_md", permeability_md) ** -1.55


def inertia_liu_civan_1_m(
    permeability_md: ArrayLike, porosity_frac: ArrayLike, tortuosity: ArrayLike
) -> Array:
    """Inertial coefficient after Liu, Civan & Evans.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    tortuosity : array_like
        Tortuosity [1], 1 or more.

    Returns
    -------
    Array
        Inertial coefficient [1/m], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, a porosity not below 1, or a tortuosity below 1.

    Notes
    -----
    beta = 8.91e8 tau/(phi k) [1/ft], k permeability [md], phi porosity, tau tortuosity.

    References
    ----------
    Liu, X., Civan, F. & Evans, R. D. 1995, "Correlation of the non-Darcy flow coefficient", J. Can. Pet.
    Technol. 34:50-54, as given by Tiab & Donaldson 2004, "Petrophysics", 2nd ed., p. 455.

    Examples
    --------
    >>> print(f"{float(inertia_liu_civan_1_m(100.0, 0.20, 2.0)) * 0.3048:.3g}")
    8.91e+07
    """
    tau = positive("tortuosity", tortuosity)
    refuse(tau.real < 1.0, "tortuosity", tau, "1 or more")
    permeability = positive("permeability_md", permeability_md)
    return 8.91e8 / FOOT_M * tau / (_porosity(porosity_frac) * permeability)


_RATE = Symbol("q_b", "flow_rate_cm3_s", "cm3/s", "flow rate at the base pressure")
_BASE = Symbol("p_b", "flow_pressure_kpa", "kPa", "absolute pressure that the flow rate refers to")
_ENDS = (
    Symbol("p1", "upstream_pressure_kpa", "kPa", "absolute upstream pressure"),
    Symbol("p2", "downstream_pressure_kpa", "kPa", "absolute downstream pressure"),
)
_VISCOSITY = Symbol("mu", "viscosity_mpas", "mPa.s", "viscosity")
_LENGTH = Symbol("L", "length_cm", "cm", "length of the plug")
_AREA = Symbol("A", "area_cm2", "cm2", "cross-section of the plug")
_TEMPERATURE = Symbol("T", "temperature_degc", "degC", "temperature")
_GAS = Symbol("", "gas", "", "nitrogen, air or helium")
_MOLAR_MASS = Symbol("M", "molar_mass_g_mol", "g/mol", "molar mass")
_PHI = Symbol("phi", "porosity_frac", "v/v", "porosity")
_MEAN = Symbol("p_m", "mean_pressure_kpa", "kPa", "mean absolute pressure")
_K_GAS = Symbol("k_g", "gas_permeability_md", "mD", "gas permeability")
_K_INF_OUT = Symbol("k_inf", "k_infinity_md", "mD", "Klinkenberg permeability")
_PERMEABILITY = (Symbol("k", "permeability_md", "mD", "permeability"),)
_SLIP = Symbol("b", "slip_factor_kpa", "kPa", "slip factor")
_GROUP = Symbol("", "group", "", "which line a step belongs to")
_WEIGHTS = Symbol("w", "weights", "", "1/u^2 of the step's permeability in md")
_POINTS = (
    Symbol("r2", "r_squared", "1", "share of the variance explained"),
    Symbol("n", "points", "1", "steps"),
    Symbol("", "refused", "", "a result that no rock has"),
)
_RP40_FLOW = "API RP 40, 2nd ed. 1998, sec. 6 (from memory)"


def _k(low: float, high: float, name: str = "k_infinity_md") -> Symbol:
    meaning = "Klinkenberg permeability" if name == "k_infinity_md" else "permeability"
    return Symbol("k", name, "mD", meaning, low, high)


FORMULAS: tuple[Formula, ...] = (
    Formula(
        "mean-pressure",
        1,
        "Mean pressure",
        "p_m = (p1 + p2)/2",
        _ENDS,
        (_MEAN,),
        "absolute pressures",
        "Klinkenberg 1941, API Drilling and Production Practice, 200-213 (from memory)",
        "by hand",
        mean_pressure_kpa,
    ),
    Formula(
        "flow-rate-conversion",
        1,
        "Flow rate at other conditions",
        "q2 = q (p/p2) (T2/T)",
        (
            Symbol("q", "flow_rate_cm3_s", "cm3/s", "metered flow rate"),
            Symbol("p", "flow_pressure_kpa", "kPa", "absolute pressure that the rate refers to"),
            Symbol("T", "flow_temperature_degc", "degC", "temperature that the rate refers to"),
            Symbol("p2", "pressure_kpa", "kPa", "absolute pressure wanted"),
            Symbol("T2", "temperature_degc", "degC", "temperature wanted"),
        ),
        (Symbol("q2", "flow_rate_cm3_s", "cm3/s", "flow rate at the conditions wanted"),),
        "ideal gas",
        _RP40_FLOW,
        "worked example with metering at 60 degF and a plug at 70 degF; round trip by law",
        flow_rate_at_cm3_s,
    ),
    Formula(
        "gas-permeability",
        1,
        "Gas permeability, axial flow",
        "k = 2 mu q_b p_b L/(A (p1^2 - p2^2))",
        (_RATE, _BASE, *_ENDS, _VISCOSITY, _LENGTH, _AREA),
        _PERMEABILITY,
        "isothermal, ideal gas, no inertia; ASTM D4525 starts at 0.01 md",
        _RP40_FLOW,
        "unit constants; worked cases; SI form by law",
        gas_permeability_md,
    ),
    Formula(
        "gas-permeability-geometric",
        1,
        "Gas permeability, any geometry",
        "k = 2 mu q_b p_b/(G (p1^2 - p2^2))",
        (_RATE, _BASE, *_ENDS, _VISCOSITY, Symbol("G", "geometric_factor_cm", "cm", "geometric factor")),
        _PERMEABILITY,
        "isothermal, ideal gas, no inertia",
        _RP40_FLOW,
        "equals the axial form where G = A/L",
        gas_permeability_geometric_md,
    ),
    Formula(
        "liquid-permeability",
        1,
        "Liquid permeability",
        "k = q mu L/(A (p1 - p2))",
        (
            Symbol("q", "flow_rate_cm3_s", "cm3/s", "flow rate"),
            *_ENDS,
            _VISCOSITY,
            _LENGTH,
            _AREA,
        ),
        _PERMEABILITY,
        "liquids, no inertia",
        _RP40_FLOW,
        "definition of the darcy; unit constants",
        liquid_permeability_md,
    ),
    Formula(
        "klinkenberg-regression",
        1,
        "Klinkenberg permeability and slip factor",
        "k_g = k_inf (1 + b/p_m), least squares of k_g on 1/p_m",
        (_K_GAS, _MEAN, _GROUP, _WEIGHTS),
        (
            _K_INF_OUT,
            _SLIP,
            Symbol("m", "slope_md_kpa", "mD.kPa", "slope"),
            Symbol("s_k", "k_infinity_se_md", "mD", "standard error"),
            Symbol("s_b", "slip_factor_se_kpa", "kPa", "standard error"),
            Symbol("s_m", "slope_se_md_kpa", "mD.kPa", "standard error"),
            Symbol("cov", "covariance_md_kpa", "mD.kPa", "covariance of k_inf and b"),
            *_POINTS,
            Symbol("chi2", "chi_square", "", "sum of squares about the line, weighted"),
        ),
        "at least three different mean pressures (ASTM D4525); no inertia",
        "Klinkenberg 1941, API Drilling and Production Practice, 200-213 (from memory)",
        "published examples; ordinary least squares of statsmodels",
        klinkenberg_regression,
        elementwise=False,
    ),
    Formula(
        "slip-heid",
        1,
        "Slip factor, Heid and others",
        "b = 11.419 k^-0.39 psi",
        (_k(0.01, 1000.0),),
        (_SLIP,),
        "0.01 to 1000 md, air",
        "Heid, McMahon, Nielsen & Yuster 1950, API Drilling and Production Practice, 230-246 (from memory)",
        "tabulated values; forms in atm and SI",
        slip_heid_kpa,
    ),
    Formula(
        "slip-jones-owens",
        1,
        "Slip factor, Jones & Owens",
        "b = 12.639 k^-0.33 psi",
        (_k(0.0001, 1.0),),
        (_SLIP,),
        "0.0001 to 1 md, tight gas sand",
        "Jones & Owens 1980, J. Pet. Technol. 32:1631-1640 (psi form from memory)",
        "tabulated values; forms in atm and SI",
        slip_jones_owens_kpa,
    ),
    Formula(
        "slip-jones-1972",
        1,
        "Slip factor, Jones 1972",
        "b = 6.9 k^-0.36 psi",
        (_k(-np.inf, np.inf),),
        (_SLIP,),
        "air; range not stated where quoted",
        "Jones 1972, SPE J. 12:383-397, as quoted by Ahmed, Reservoir Engineering Handbook, ch. 4",
        "published example",
        slip_jones_1972_kpa,
    ),
    Formula(
        "slip-rp40-air",
        1,
        "Slip factor to air, RP 40",
        "b = 5.71 k^-0.382 psi",
        (_k(0.01, 2000.0),),
        (_SLIP,),
        "air; 0.01 to 2000 md (common practice)",
        "API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7 (as quoted)",
        "published example",
        slip_rp40_air_kpa,
    ),
    Formula(
        "slip-rp40-helium",
        1,
        "Slip factor to helium, RP 40",
        "b = 16.4 k^-0.382 psi",
        (_k(0.01, 2000.0),),
        (_SLIP,),
        "helium; 0.01 to 2000 md (common practice)",
        "API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7 (as quoted)",
        "tabulated values",
        slip_rp40_helium_kpa,
    ),
    Formula(
        "slip-sampath-keighin",
        1,
        "Slip factor, Sampath & Keighin",
        "b = 13.851 (k/phi)^-0.53 psi",
        (_k(0.001, 1.0), _PHI),
        (_SLIP,),
        "nitrogen, water-bearing tight sand, about 0.001 to 1 md (from memory)",
        "Sampath & Keighin 1982, J. Pet. Technol. 34:2715-2720 (from memory)",
        "tabulated values",
        slip_sampath_keighin_kpa,
    ),
    Formula(
        "slip-florence-nitrogen",
        1,
        "Slip factor to nitrogen, Florence and others",
        "b = 43.345 (k/phi)^-0.5 psi",
        (_k(-np.inf, np.inf), _PHI),
        (_SLIP,),
        "theory; tight rock",
        "Florence, Rushing, Newsham & Blasingame 2007, SPE 107954 (from memory)",
        "tabulated values; theory within 0.6 %",
        slip_florence_nitrogen_kpa,
    ),
    Formula(
        "slip-florence-air",
        1,
        "Slip factor to air, Florence and others",
        "b = 44.106 (k/phi)^-0.5 psi",
        (_k(-np.inf, np.inf), _PHI),
        (_SLIP,),
        "theory; tight rock",
        "Florence, Rushing, Newsham & Blasingame 2007, SPE 107954 (from memory)",
        "tabulated values; theory within 0.6 %",
        slip_florence_air_kpa,
    ),
    Formula(
        "slip-tanikawa-shimamoto",
        1,
        "Slip factor, Tanikawa & Shimamoto",
        "b = 0.15 k^-0.37 Pa, k in m2",
        (_k(1e-5, 1e3),),
        (_SLIP,),
        "nitrogen, sedimentary rock, about 1e-20 to 1e-12 m2 (from memory)",
        "Tanikawa & Shimamoto 2009, Int. J. Rock Mech. Min. Sci. 46:229-238 (from memory)",
        "tabulated values",
        slip_tanikawa_shimamoto_kpa,
    ),
    Formula(
        "slip-scaled",
        1,
        "Slip factor at other conditions",
        "b2 = b1 (mu2/mu1) sqrt(T2 M1/(T1 M2))",
        (
            Symbol("b1", "slip_factor_kpa", "kPa", "slip factor to the first gas"),
            Symbol("mu1", "viscosity_mpas", "mPa.s", "viscosity of the first gas"),
            Symbol("M1", "molar_mass_g_mol", "g/mol", "molar mass of the first gas"),
            Symbol("T1", "temperature_degc", "degC", "temperature of the first gas"),
            Symbol("mu2", "other_viscosity_mpas", "mPa.s", "viscosity of the other gas"),
            Symbol("M2", "other_molar_mass_g_mol", "g/mol", "molar mass of the other gas"),
            Symbol("T2", "other_temperature_degc", "degC", "temperature of the other gas"),
        ),
        (Symbol("b2", "slip_factor_kpa", "kPa", "slip factor to the other gas"),),
        "slip in proportion to the mean free path",
        "API RP 40, 2nd ed. 1998, sec. 6, eq. 31",
        "published example",
        slip_scaled_kpa,
    ),
    Formula(
        "slip-between-gases",
        1,
        "Slip factor to another gas",
        "b2 = b1 lambda2/lambda1",
        (
            Symbol("b1", "slip_factor_kpa", "kPa", "slip factor to the first gas"),
            _GAS,
            Symbol("", "other_gas", "", "nitrogen, air or helium"),
            _TEMPERATURE,
        ),
        (Symbol("b2", "slip_factor_kpa", "kPa", "slip factor to the other gas"),),
        "slip in proportion to the mean free path",
        "API RP 40, 2nd ed. 1998, sec. 6, eq. 31",
        "ratios with CoolProp's viscosities; ratios of published correlations within 1 %",
        slip_between_gases_kpa,
    ),
    Formula(
        "slip-corrected",
        1,
        "Klinkenberg permeability from one pressure",
        "k_g = k (1 + b/p_m), b = 5.71 k^-0.382 psi x lambda_gas/lambda_air",
        (
            Symbol("k_g", "gas_permeability_md", "mD", "gas permeability", 0.01, 2000.0),
            _MEAN,
            _GAS,
            _TEMPERATURE,
        ),
        (_K_INF_OUT,),
        "an estimate; 0.01 to 2000 md (common practice)",
        "API RP 40, 2nd ed. 1998, sec. 6, app. A, eq. A-7, and eq. 31 for the gas",
        "published example; residual of the equation; implicit derivative",
        slip_corrected_md,
    ),
    Formula(
        "forchheimer-regression",
        1,
        "Permeability and inertial coefficient",
        "M A (p1^2 - p2^2)/(2 R T mu L W) = 1/k + beta W/(mu A), W = q p M/(R T)",
        (_RATE, _BASE, *_ENDS, _VISCOSITY, _MOLAR_MASS, _TEMPERATURE, _LENGTH, _AREA, _GROUP),
        (
            *_PERMEABILITY,
            Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),
            Symbol("s_k", "permeability_se_md", "mD", "standard error"),
            Symbol("s_beta", "inertial_coefficient_se_1_m", "1/m", "standard error"),
            *_POINTS,
        ),
        "at least three different rates; ideal gas; slip not separated",
        "Cornell & Katz 1953, Ind. Eng. Chem. 45:2145-2152; Tiab & Donaldson 2004, Petrophysics, 2nd ed., "
        "eq. 7.115a, p. 454",
        "worked case made from a stated truth",
        forchheimer_regression,
        elementwise=False,
    ),
    Formula(
        "slip-inertia-regression",
        1,
        "Klinkenberg permeability, slip factor and inertial coefficient",
        "1/k_app = 1/(k_inf (1 + b/p_m)) + beta W/(mu A), W = q p M/(R T)",
        (_K_GAS, _MEAN, _RATE, _BASE, _VISCOSITY, _MOLAR_MASS, _TEMPERATURE, _AREA, _GROUP, _WEIGHTS),
        (
            _K_INF_OUT,
            _SLIP,
            Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),
            Symbol("s_k", "k_infinity_se_md", "mD", "standard error"),
            Symbol("s_b", "slip_factor_se_kpa", "kPa", "standard error"),
            Symbol("s_beta", "inertial_coefficient_se_1_m", "1/m", "standard error"),
            Symbol("chi2", "chi_square", "", "sum of squares about the fit"),
            Symbol("chi2_0", "chi_square_slip_only", "", "sum of squares about the line without inertia"),
            Symbol("n", "points", "1", "steps"),
            Symbol("", "demanded", "", "the steps show inertia"),
        ),
        "at least four different rates; ideal gas; inertia demanded at 1 %",
        "Klinkenberg 1941, API Drilling and Production Practice, 200-213; Cornell & Katz 1953, Ind. Eng. "
        "Chem. 45:2145-2152 (from memory)",
        "simulated steps with and without inertia; scipy's least squares; worked case without slip",
        slip_inertia_regression,
        elementwise=False,
    ),
    Formula(
        "inertia-geertsma",
        1,
        "Inertial coefficient, Geertsma",
        "beta = 4.85e4/(phi^5.5 k^0.5) 1/ft",
        (_k(-np.inf, np.inf, "permeability_md"), _PHI),
        (Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),),
        "one order of magnitude of scatter",
        "Geertsma 1974, SPE J. 14:445-450; Tiab & Donaldson 2004, Petrophysics, 2nd ed., eq. 7.116b, p. 455",
        "published values; conversion of the original coefficient",
        inertia_geertsma_1_m,
    ),
    Formula(
        "inertia-tiab-donaldson",
        1,
        "Inertial coefficient, Tiab & Donaldson",
        "beta = 4.11e10/k^(4/3) 1/ft",
        (_k(-np.inf, np.inf, "permeability_md"),),
        (Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),),
        "one order of magnitude of scatter",
        "Tiab & Donaldson 2004, Petrophysics, 2nd ed., eq. 7.116a",
        "recomputed value",
        inertia_tiab_donaldson_1_m,
    ),
    Formula(
        "inertia-firoozabadi-katz",
        1,
        "Inertial coefficient, Firoozabadi & Katz",
        "beta = 2.33e10/k^1.2 1/ft",
        (_k(-np.inf, np.inf, "permeability_md"),),
        (Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),),
        "one order of magnitude of scatter",
        "Firoozabadi & Katz 1979, J. Pet. Technol. 31:211-216 (as quoted)",
        "recomputed value",
        inertia_firoozabadi_katz_1_m,
    ),
    Formula(
        "inertia-jones",
        1,
        "Inertial coefficient, Jones",
        "beta = 6.15e10 k^-1.55 1/ft",
        (_k(-np.inf, np.inf, "permeability_md"),),
        (Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),),
        "one order of magnitude of scatter",
        "Jones 1987, SPE 16949 (from memory)",
        "recomputed value",
        inertia_jones_1_m,
    ),
    Formula(
        "inertia-liu-civan",
        1,
        "Inertial coefficient, Liu, Civan & Evans",
        "beta = 8.91e8 tau/(phi k) 1/ft",
        (
            _k(-np.inf, np.inf, "permeability_md"),
            _PHI,
            Symbol("tau", "tortuosity", "1", "tortuosity"),
        ),
        (Symbol("beta", "inertial_coefficient_1_m", "1/m", "inertial coefficient"),),
        "one order of magnitude of scatter",
        "Liu, Civan & Evans 1995, J. Can. Pet. Technol. 34:50-54, as given by Tiab & Donaldson 2004, p. 455",
        "by hand",
        inertia_liu_civan_1_m,
    ),
)
