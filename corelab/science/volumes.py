"""Bulk, grain and pore volumes of a plug, its porosity and densities, and the calibrations behind them.

Lengths are in cm, volumes in cm3, masses in g, pressures absolute in kPa, temperatures in degC.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.fluids import helium_compressibility_factor
from corelab.science.formula import Array, Formula, Symbol, finite, kelvin, not_negative, positive, refuse

NOISE_FRAC = 0.02
"""A volume may exceed the one that holds it by this share of it, as measurement error (common practice)."""


def _within(name: str, inner: Array, outer: Array, what: str) -> None:
    refuse(inner.real > (1.0 + NOISE_FRAC) * outer.real, name, inner, f"not more than the {what}")


def cross_section_cm2(diameter_cm: ArrayLike) -> Array:
    """Area of the end face of a cylindrical plug.

    Parameters
    ----------
    diameter_cm : array_like
        Diameter [cm], above 0.

    Returns
    -------
    Array
        Area [cm2], shape of the input.

    Raises
    ------
    Impossible
        If a diameter is not above 0.

    Notes
    -----
    A = pi D^2/4, D diameter.

    References
    ----------
    Geometry.

    Examples
    --------
    >>> round(float(cross_section_cm2(3.81)), 4)
    11.4009
    """
    return np.pi / 4.0 * positive("diameter_cm", diameter_cm) ** 2


def caliper_bulk_volume_cm3(length_cm: ArrayLike, diameter_cm: ArrayLike) -> Array:
    """Bulk volume of a right cylinder from its length and diameter.

    Parameters
    ----------
    length_cm, diameter_cm : array_like
        Means of the caliper readings [cm], above 0.

    Returns
    -------
    Array
        Bulk volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a length or a diameter is not above 0.

    Notes
    -----
    V_b = pi D^2 L/4, D diameter, L length. A chipped or skew plug has less than this.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> round(float(caliper_bulk_volume_cm3(5.08, 3.81)), 3)
    57.917
    """
    return cross_section_cm2(diameter_cm) * positive("length_cm", length_cm)


def displaced_bulk_volume_cm3(mass_displaced_g: ArrayLike, liquid_density_g_cm3: ArrayLike) -> Array:
    """Bulk volume from the mass of liquid that the immersed plug displaces.

    Parameters
    ----------
    mass_displaced_g : array_like
        Gain of the balance under the bath when the plug is held below the surface [g], above 0.
    liquid_density_g_cm3 : array_like
        Density of the liquid [g/cm3], above 0.

    Returns
    -------
    Array
        Bulk volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass or a density is not above 0.

    Notes
    -----
    V_b = M_displaced/rho. The buoyancy of air (0.0012 g/cm3) is left out.

    References
    ----------
    Archimedes' principle; Amyx, J. W., Bass, D. M. & Whiting, R. L. 1960, "Petroleum Reservoir
    Engineering", ch. 2 (from memory).

    Examples
    --------
    >>> round(float(displaced_bulk_volume_cm3(784.55, 13.5458)), 3)
    57.918
    """
    mass = positive("mass_displaced_g", mass_displaced_g)
    return mass / positive("liquid_density_g_cm3", liquid_density_g_cm3)


def buoyancy_bulk_volume_cm3(
    mass_in_air_g: ArrayLike, mass_immersed_g: ArrayLike, liquid_density_g_cm3: ArrayLike
) -> Array:
    """Bulk volume from weighing the plug, as it is immersed, in air and below the liquid.

    Parameters
    ----------
    mass_in_air_g : array_like
        Mass in air of the plug as immersed (saturated with the liquid, or coated) [g], above 0.
    mass_immersed_g : array_like
        Apparent mass hanging in the liquid [g], below the mass in air.
    liquid_density_g_cm3 : array_like
        Density of the liquid [g/cm3], above 0.

    Returns
    -------
    Array
        Bulk volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass in air or a density is not above 0, a mass immersed negative or not below that in air.

    Notes
    -----
    V_b = (M_air - M_immersed)/rho. The buoyancy of air (0.0012 g/cm3) is left out.

    References
    ----------
    Archimedes' principle; Amyx, J. W., Bass, D. M. & Whiting, R. L. 1960, "Petroleum Reservoir
    Engineering", ch. 2, example 2-2 (from memory).

    Examples
    --------
    >>> round(float(buoyancy_bulk_volume_cm3(22.5, 12.6, 1.0)), 1)
    9.9
    """
    in_air = positive("mass_in_air_g", mass_in_air_g)
    immersed = not_negative("mass_immersed_g", mass_immersed_g)
    refuse(immersed.real >= in_air.real, "mass_immersed_g", immersed, "less than the mass in air")
    return (in_air - immersed) / positive("liquid_density_g_cm3", liquid_density_g_cm3)


def uncoated_volume_cm3(
    coated_volume_cm3: ArrayLike, coating_mass_g: ArrayLike, coating_density_g_cm3: ArrayLike
) -> Array:
    """Volume of a plug without its coating or jacket.

    Parameters
    ----------
    coated_volume_cm3 : array_like
        Volume of plug and coating [cm3], above 0.
    coating_mass_g : array_like
        Mass of the coating [g], 0 or more.
    coating_density_g_cm3 : array_like
        Density of the coating [g/cm3], above 0.

    Returns
    -------
    Array
        Volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a volume or a density is not above 0, a coating mass negative, or the coating not smaller than
        the coated plug.

    Notes
    -----
    V = V_coated - M_coating/rho_coating.

    References
    ----------
    Amyx, J. W., Bass, D. M. & Whiting, R. L. 1960, "Petroleum Reservoir Engineering", ch. 2, example 2-1.

    Examples
    --------
    >>> round(float(uncoated_volume_cm3(10.9, 0.9, 0.9)), 1)
    9.9
    """
    coated = positive("coated_volume_cm3", coated_volume_cm3)
    mass = not_negative("coating_mass_g", coating_mass_g)
    coating = mass / positive("coating_density_g_cm3", coating_density_g_cm3)
    refuse(coating.real >= coated.real, "coating_mass_g", mass, "a coating smaller than the coated plug")
    return coated - coating


def _expansion(
    reference_pressure_kpa: ArrayLike, expanded_pressure_kpa: ArrayLike, barometric_pressure_kpa: ArrayLike
) -> Array:
    """Gas space reached by the expansion, in reference volumes: y = (p1 - p2)/(p2 - pa)."""
    p1 = positive("reference_pressure_kpa", reference_pressure_kpa)
    p2 = positive("expanded_pressure_kpa", expanded_pressure_kpa)
    pa = not_negative("barometric_pressure_kpa", barometric_pressure_kpa)
    refuse(
        (p2.real >= p1.real) | (p2.real <= pa.real),
        "expanded_pressure_kpa",
        p2,
        "a pressure between the barometer and the reference pressure, all absolute",
    )
    return (p1 - p2) / (p2 - pa)


def grain_volume_gas_expansion_cm3(
    reference_volume_cm3: ArrayLike,
    cup_volume_cm3: ArrayLike,
    billet_volume_cm3: ArrayLike,
    reference_pressure_kpa: ArrayLike,
    expanded_pressure_kpa: ArrayLike,
    barometric_pressure_kpa: ArrayLike,
) -> Array:
    """Grain volume by expanding gas from a reference chamber into the cup that holds the plug.

    Parameters
    ----------
    reference_volume_cm3, cup_volume_cm3 : array_like
        Volumes of the reference chamber and of the empty cup, from calibration [cm3], above 0.
    billet_volume_cm3 : array_like
        Billets left in the cup beside the plug [cm3], 0 or more.
    reference_pressure_kpa : array_like
        Absolute pressure of the charged reference chamber [kPa].
    expanded_pressure_kpa : array_like
        Absolute pressure after the expansion [kPa], between barometer and reference pressure.
    barometric_pressure_kpa : array_like
        Absolute pressure of the cup at the start [kPa]; 0 if it was evacuated.

    Returns
    -------
    Array
        Grain volume [cm3], broadcast shape. Pores that the gas does not reach count as grain.

    Raises
    ------
    Impossible
        If a volume or a pressure is not above 0 (billet and barometer: negative), an expanded pressure
        not between the other two, or the billets with the gas space fill more than the cup.

    Notes
    -----
    V_r p1 + (V_c - V_billet - V_g) pa = (V_r + V_c - V_billet - V_g) p2, hence
    V_g = V_c - V_billet - V_r (p1 - p2)/(p2 - pa). Isothermal, ideal gas, no valve volume: for a real
    gas give p/z (`pressure_over_z_kpa`), for a cup of another temperature the reference volume of
    `reference_volume_at_cup_temperature_cm3`. Range: any; the error grows as the cup empties.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5, two-cell method (from memory).

    Examples
    --------
    >>> psi = 6.894757293168
    >>> round(float(grain_volume_gas_expansion_cm3(
    ...     12.12, 36.5, 0.0, 114.696 * psi, 59.296 * psi, 14.696 * psi)), 4)
    21.4451
    """
    reference = positive("reference_volume_cm3", reference_volume_cm3)
    cup = positive("cup_volume_cm3", cup_volume_cm3)
    billet = not_negative("billet_volume_cm3", billet_volume_cm3)
    refuse(billet.real >= cup.real, "billet_volume_cm3", billet, "less than the volume of the cup")
    space = reference * _expansion(reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa)
    grain = cup - billet - space
    refuse(
        grain.real <= -NOISE_FRAC * cup.real,
        "expanded_pressure_kpa",
        expanded_pressure_kpa,
        "a higher pressure: with this one the gas would fill more than the cup",
    )
    return grain


def pore_volume_gas_expansion_cm3(
    reference_volume_cm3: ArrayLike,
    dead_volume_cm3: ArrayLike,
    reference_pressure_kpa: ArrayLike,
    expanded_pressure_kpa: ArrayLike,
    barometric_pressure_kpa: ArrayLike,
) -> Array:
    """Pore volume by expanding gas from a reference chamber into the plug in its holder.

    Parameters
    ----------
    reference_volume_cm3 : array_like
        Volume of the reference chamber, from calibration [cm3], above 0.
    dead_volume_cm3 : array_like
        Lines and end pieces between valve and plug, from calibration [cm3], 0 or more.
    reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa : array_like
        Absolute pressures before, after, and of the holder at the start [kPa].

    Returns
    -------
    Array
        Pore volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a reference volume or a pressure is not above 0, a dead volume or a barometric pressure
        negative, an expanded pressure not between the other two, or the gas space clearly smaller
        than the dead volume.

    Notes
    -----
    V_r p1 + (V_p + V_d) pa = (V_r + V_p + V_d) p2, hence V_p = V_r (p1 - p2)/(p2 - pa) - V_d.
    Isothermal, ideal gas. Range: any.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5, one-cell method (from memory).

    Examples
    --------
    >>> round(float(pore_volume_gas_expansion_cm3(10.0, 2.0, 800.0, 450.0, 100.0)), 6)
    8.0
    """
    reference = positive("reference_volume_cm3", reference_volume_cm3)
    dead = not_negative("dead_volume_cm3", dead_volume_cm3)
    space = reference * _expansion(reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa)
    refuse(
        space.real < dead.real - NOISE_FRAC * reference.real,
        "expanded_pressure_kpa",
        expanded_pressure_kpa,
        "a lower pressure: with this one the gas would not even fill the dead volume",
    )
    return space - dead


def pressure_over_z_kpa(pressure_kpa: ArrayLike, temperature_degc: ArrayLike) -> Array:
    """Pressure of helium divided by its compressibility factor.

    Given in place of the pressures, it makes the gas expansion exact for real helium.

    Parameters
    ----------
    pressure_kpa : array_like
        Absolute pressure [kPa], 0 or more.
    temperature_degc : array_like
        Temperature of the gas [degC], above absolute zero.

    Returns
    -------
    Array
        p/z [kPa], broadcast shape.

    Raises
    ------
    Impossible
        If a pressure is negative or a temperature not above absolute zero.

    Notes
    -----
    p/z, z = 1 + B p/(R T). Amounts of gas are V p/(z R T). Published range: 15 to 30 degC, to 1.5 MPa.

    References
    ----------
    z from `helium_compressibility_factor` (Bell et al. 2014, Ind. Eng. Chem. Res. 53:2498).

    Examples
    --------
    >>> round(float(pressure_over_z_kpa(689.476, 20.0)), 2)
    687.17
    """
    pressure = not_negative("pressure_kpa", pressure_kpa)
    return pressure / helium_compressibility_factor(temperature_degc, pressure)


def reference_volume_at_cup_temperature_cm3(
    reference_volume_cm3: ArrayLike, reference_temperature_degc: ArrayLike, cup_temperature_degc: ArrayLike
) -> Array:
    """The reference volume that holds the same gas at the temperature of the cup.

    Given in place of the reference volume, it corrects the gas expansion for a cup warmer or colder.

    Parameters
    ----------
    reference_volume_cm3 : array_like
        Volume of the reference chamber [cm3], above 0.
    reference_temperature_degc, cup_temperature_degc : array_like
        Temperatures of reference chamber and cup [degC], above absolute zero.

    Returns
    -------
    Array
        Volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a volume is not above 0 or a temperature not above absolute zero.

    Notes
    -----
    V_r T_c/T_r, T absolute: from p1 V_r/T_r + pa V/T_c = p2 V_r/T_r + p2 V/T_c, V the gas space of the cup.

    References
    ----------
    Mole balance of an ideal gas.

    Examples
    --------
    >>> round(float(reference_volume_at_cup_temperature_cm3(12.12, 22.0, 23.0)), 4)
    12.1611
    """
    ratio = kelvin("cup_temperature_degc", cup_temperature_degc) / kelvin(
        "reference_temperature_degc", reference_temperature_degc
    )
    return positive("reference_volume_cm3", reference_volume_cm3) * ratio


@dataclass(frozen=True, slots=True)
class Calibration:
    """Volumes of a porosimeter as found by least squares.

    `volume_cm3` is the cup's (`calibrate_cup`) or the dead volume (`calibrate_holder`); `covariance`
    (2, 2) is of reference volume and volume, in this order [cm6], NaN with two points; `points` counts
    the readings.
    """

    reference_volume_cm3: Array
    volume_cm3: Array
    covariance: Array
    residual_sd_cm3: Array
    points: int


def _calibrate(
    known_volume_cm3: ArrayLike,
    reference_pressure_kpa: ArrayLike,
    expanded_pressure_kpa: ArrayLike,
    barometric_pressure_kpa: ArrayLike,
    sign: float,
) -> Calibration:
    """Least squares of V_known = sign (V_r y - V)."""
    known = np.atleast_1d(not_negative("known_volume_cm3", known_volume_cm3))
    refuse(
        np.unique(known.real).size < 2,
        "known_volume_cm3",
        known[:1],
        "at least two different known volumes in a calibration",
    )
    y = sign * _expansion(reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa)
    y, known = np.broadcast_arrays(y, known)
    n = known.size
    y_mean, known_mean = y.sum() / n, known.sum() / n
    y_off = y - y_mean
    spread = (y_off**2).sum()
    refuse(
        spread.real == 0.0,
        "expanded_pressure_kpa",
        np.atleast_1d(np.asarray(expanded_pressure_kpa))[:1],
        "pressures that differ between the known volumes",
    )
    reference = (y_off * (known - known_mean)).sum() / spread
    refuse(
        reference.real <= 0.0,
        "known_volume_cm3",
        known[:1],
        "volumes that follow the pressures (a billet raises the expanded pressure, a void lowers it)",
    )
    intercept = known_mean - reference * y_mean
    volume = -sign * intercept
    nan = np.full((), np.nan)
    variance = ((known - intercept - reference * y) ** 2).sum() / (n - 2) if n > 2 else nan
    cross = sign * y_mean * variance / spread
    covariance = np.array([[variance / spread, cross], [cross, variance * (1.0 / n + y_mean**2 / spread)]])
    return Calibration(np.asarray(reference), np.asarray(volume), covariance, np.sqrt(variance), n)


def calibrate_cup(
    known_volume_cm3: ArrayLike,
    reference_pressure_kpa: ArrayLike,
    expanded_pressure_kpa: ArrayLike,
    barometric_pressure_kpa: ArrayLike,
) -> Calibration:
    """Volumes of reference chamber and cup from billets of known volume in the cup.

    Parameters
    ----------
    known_volume_cm3 : array_like (n,)
        Billets in the cup [cm3], 0 for the empty cup; at least two different ones.
    reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa : array_like (n,) or one value
        Absolute pressures before, after, and of the cup at the start [kPa].

    Returns
    -------
    Calibration
        Reference and cup volume [cm3] with covariance [cm6] and residual standard deviation [cm3].

    Raises
    ------
    Impossible
        If known volumes are negative or fewer than two are different, an expanded pressure is not between
        the other two, or volumes and pressures run against each other.

    Notes
    -----
    V_billet = V_c - V_r y, y = (p1 - p2)/(p2 - pa): least squares of V_billet on y; V_c cup, V_r reference
    volume. Covariance from the residual variance with n - 2 degrees of freedom. A missing reading makes
    the calibration missing.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5, calibration with billets (from memory).

    Examples
    --------
    >>> found = calibrate_cup([0.0, 20.0], 800.0, [275.0, 450.0], 100.0)
    >>> round(float(found.reference_volume_cm3), 6), round(float(found.volume_cm3), 6)
    (10.0, 30.0)
    """
    return _calibrate(
        known_volume_cm3, reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa, -1.0
    )


def calibrate_holder(
    known_volume_cm3: ArrayLike,
    reference_pressure_kpa: ArrayLike,
    expanded_pressure_kpa: ArrayLike,
    barometric_pressure_kpa: ArrayLike,
) -> Calibration:
    """Volume of the reference chamber and dead volume from known voids in the holder.

    Parameters
    ----------
    known_volume_cm3 : array_like (n,)
        Voids in the holder [cm3], 0 for a solid plug; at least two different ones.
    reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa : array_like (n,) or one value
        Absolute pressures before, after, and of the holder at the start [kPa].

    Returns
    -------
    Calibration
        Reference and dead volume [cm3] with covariance [cm6] and residual standard deviation [cm3].

    Raises
    ------
    Impossible
        If known volumes are negative or fewer than two are different, an expanded pressure is not between
        the other two, or volumes and pressures run against each other.

    Notes
    -----
    V_void = V_r y - V_d, y = (p1 - p2)/(p2 - pa): least squares of V_void on y; V_r reference, V_d dead
    volume. Covariance from the residual variance with n - 2 degrees of freedom. A missing reading makes
    the calibration missing.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5, one-cell method (from memory).

    Examples
    --------
    >>> found = calibrate_holder([0.0, 8.0], 800.0, [2050 / 3, 450.0], 100.0)
    >>> round(float(found.reference_volume_cm3), 6), round(float(found.volume_cm3), 6)
    (10.0, 2.0)
    """
    return _calibrate(
        known_volume_cm3, reference_pressure_kpa, expanded_pressure_kpa, barometric_pressure_kpa, 1.0
    )


def pore_volume_saturation_cm3(
    saturated_mass_g: ArrayLike, dry_mass_g: ArrayLike, saturant_density_g_cm3: ArrayLike
) -> Array:
    """Pore volume from the liquid that a dry plug takes up.

    Parameters
    ----------
    saturated_mass_g, dry_mass_g : array_like
        Masses of the plug full of liquid and dry [g], above 0.
    saturant_density_g_cm3 : array_like
        Density of the liquid [g/cm3], above 0.

    Returns
    -------
    Array
        Pore volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass or a density is not above 0, or a dry mass above the saturated one.

    Notes
    -----
    V_p = (M_sat - M_dry)/rho. Pores that the liquid does not reach are not counted.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> round(float(pore_volume_saturation_cm3(20.7, 19.5, 0.716)), 3)
    1.676
    """
    saturated = positive("saturated_mass_g", saturated_mass_g)
    dry = positive("dry_mass_g", dry_mass_g)
    refuse(dry.real > saturated.real, "dry_mass_g", dry, "not more than the saturated mass")
    return (saturated - dry) / positive("saturant_density_g_cm3", saturant_density_g_cm3)


def porosity_bulk_grain_frac(bulk_volume_cm3: ArrayLike, grain_volume_cm3: ArrayLike) -> Array:
    """Porosity from bulk and grain volume.

    Parameters
    ----------
    bulk_volume_cm3, grain_volume_cm3 : array_like
        Volumes [cm3], above 0.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape; a little below 0 where a tight plug's grain volume comes out just
        above its bulk volume.

    Raises
    ------
    Impossible
        If a volume is not above 0, or a grain volume exceeds the bulk volume by more than 2 %.

    Notes
    -----
    phi = (V_b - V_g)/V_b.

    References
    ----------
    Definition; API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> float(porosity_bulk_grain_frac(20.0, 15.0))
    0.25
    """
    bulk = positive("bulk_volume_cm3", bulk_volume_cm3)
    grain = positive("grain_volume_cm3", grain_volume_cm3)
    _within("grain_volume_cm3", grain, bulk, "bulk volume")
    return (bulk - grain) / bulk


def porosity_bulk_pore_frac(bulk_volume_cm3: ArrayLike, pore_volume_cm3: ArrayLike) -> Array:
    """Porosity from bulk and pore volume.

    Parameters
    ----------
    bulk_volume_cm3 : array_like
        Bulk volume [cm3], above 0.
    pore_volume_cm3 : array_like
        Pore volume [cm3], below the bulk volume.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape.

    Raises
    ------
    Impossible
        If a bulk volume is not above 0, a pore volume clearly negative (beyond 2 % of the bulk volume) or
        not below the bulk volume.

    Notes
    -----
    phi = V_p/V_b.

    References
    ----------
    Definition; API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> float(porosity_bulk_pore_frac(20.0, 5.0))
    0.25
    """
    bulk = positive("bulk_volume_cm3", bulk_volume_cm3)
    pore = finite("pore_volume_cm3", pore_volume_cm3)
    refuse(pore.real < -NOISE_FRAC * bulk.real, "pore_volume_cm3", pore, "0 or more")
    refuse(pore.real >= bulk.real, "pore_volume_cm3", pore, "less than the bulk volume")
    return pore / bulk


def porosity_pore_grain_frac(pore_volume_cm3: ArrayLike, grain_volume_cm3: ArrayLike) -> Array:
    """Porosity from pore and grain volume.

    Parameters
    ----------
    pore_volume_cm3 : array_like
        Pore volume [cm3], 0 or more.
    grain_volume_cm3 : array_like
        Grain volume [cm3], above 0.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape.

    Raises
    ------
    Impossible
        If a grain volume is not above 0, or a pore volume clearly negative (beyond 2 % of the grain
        volume).

    Notes
    -----
    phi = V_p/(V_p + V_g). With V_p under stress and V_g taken as constant, the porosity under stress.

    References
    ----------
    Definition; API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> float(porosity_pore_grain_frac(5.0, 15.0))
    0.25
    """
    grain = positive("grain_volume_cm3", grain_volume_cm3)
    pore = finite("pore_volume_cm3", pore_volume_cm3)
    refuse(pore.real < -NOISE_FRAC * grain.real, "pore_volume_cm3", pore, "0 or more")
    return pore / (pore + grain)


def porosity_summation_frac(
    bulk_volume_cm3: ArrayLike,
    water_volume_cm3: ArrayLike,
    oil_volume_cm3: ArrayLike,
    gas_volume_cm3: ArrayLike,
) -> Array:
    """Porosity as the sum of the fluids found in a sample.

    Parameters
    ----------
    bulk_volume_cm3 : array_like
        Bulk volume of the sample [cm3], above 0.
    water_volume_cm3, oil_volume_cm3, gas_volume_cm3 : array_like
        Volumes of water, oil and gas in it [cm3], 0 or more.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape.

    Raises
    ------
    Impossible
        If a bulk volume is not above 0, a fluid negative, or the fluids not less than the bulk volume.

    Notes
    -----
    phi = (V_w + V_o + V_g)/V_b. The fluids are divided by the volume of the sample, never by its mass.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.2 (from memory).

    Examples
    --------
    >>> round(float(porosity_summation_frac(4.5, 0.90, 0.04, 0.33)), 5)
    0.28222
    """
    bulk = positive("bulk_volume_cm3", bulk_volume_cm3)
    water = not_negative("water_volume_cm3", water_volume_cm3)
    oil = not_negative("oil_volume_cm3", oil_volume_cm3)
    gas = not_negative("gas_volume_cm3", gas_volume_cm3)
    fluids = water + oil + gas
    refuse(fluids.real >= bulk.real, "bulk_volume_cm3", bulk, "more than the fluids in it")
    return fluids / bulk


def grain_density_g_cm3(dry_mass_g: ArrayLike, grain_volume_cm3: ArrayLike) -> Array:
    """Density of the grains.

    Parameters
    ----------
    dry_mass_g : array_like
        Mass of the dry plug (without salt, see `grain_mass_g`) [g], above 0.
    grain_volume_cm3 : array_like
        Grain volume [cm3], above 0.

    Returns
    -------
    Array
        Grain density [g/cm3], broadcast shape. Whether a mineral has it is asked elsewhere.

    Raises
    ------
    Impossible
        If a mass or a volume is not above 0.

    Notes
    -----
    rho_g = M_dry/V_g.

    References
    ----------
    Definition; API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> float(grain_density_g_cm3(53.0, 20.0))
    2.65
    """
    return positive("dry_mass_g", dry_mass_g) / positive("grain_volume_cm3", grain_volume_cm3)


def bulk_density_g_cm3(dry_mass_g: ArrayLike, bulk_volume_cm3: ArrayLike) -> Array:
    """Bulk density of a plug (dry, if its mass is the dry mass).

    Parameters
    ----------
    dry_mass_g : array_like
        Mass of the plug [g], above 0.
    bulk_volume_cm3 : array_like
        Bulk volume [cm3], above 0.

    Returns
    -------
    Array
        Bulk density [g/cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass or a volume is not above 0.

    Notes
    -----
    rho_b = M_dry/V_b.

    References
    ----------
    Definition; API RP 40, 2nd ed. 1998, sec. 5 (from memory).

    Examples
    --------
    >>> float(bulk_density_g_cm3(53.0, 25.0))
    2.12
    """
    return positive("dry_mass_g", dry_mass_g) / positive("bulk_volume_cm3", bulk_volume_cm3)


_LENGTH = Symbol("L", "length_cm", "cm", "length of the plug")
_DIAMETER = Symbol("D", "diameter_cm", "cm", "diameter of the plug")
_BULK = Symbol("V_b", "bulk_volume_cm3", "cm3", "bulk volume")
_GRAIN = Symbol("V_g", "grain_volume_cm3", "cm3", "grain volume")
_PORE = Symbol("V_p", "pore_volume_cm3", "cm3", "pore volume")
_DRY = Symbol("M_dry", "dry_mass_g", "g", "mass of the dry plug")
_LIQUID = Symbol("rho", "liquid_density_g_cm3", "g/cm3", "density of the liquid")
_REFERENCE = Symbol("V_r", "reference_volume_cm3", "cm3", "volume of the reference chamber")
_CUP = Symbol("V_c", "cup_volume_cm3", "cm3", "volume of the empty cup")
_DEAD = Symbol("V_d", "dead_volume_cm3", "cm3", "dead volume of the holder")
_PRESSURES = (
    Symbol("p1", "reference_pressure_kpa", "kPa", "absolute pressure of the charged reference chamber"),
    Symbol("p2", "expanded_pressure_kpa", "kPa", "absolute pressure after the expansion"),
    Symbol("pa", "barometric_pressure_kpa", "kPa", "absolute pressure before the expansion"),
)
_KNOWN = Symbol("V_k", "known_volume_cm3", "cm3", "known volumes")
_POROSITY = (Symbol("phi", "porosity_frac", "v/v", "porosity"),)
_COVARIANCE = (
    Symbol("cov", "covariance", "cm6", "covariance of the two volumes"),
    Symbol("s", "residual_sd_cm3", "cm3", "residual standard deviation"),
    Symbol("n", "points", "1", "readings"),
)
_RP40_VOLUMES = "API RP 40, 2nd ed. 1998, sec. 5 (from memory)"

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "cross-section",
        1,
        "Area of a plug's end face",
        "A = pi D^2/4",
        (_DIAMETER,),
        (Symbol("A", "area_cm2", "cm2", "area of the end face"),),
        "a circular face",
        "geometry",
        "by hand",
        cross_section_cm2,
    ),
    Formula(
        "bulk-volume-caliper",
        1,
        "Bulk volume by caliper",
        "V_b = pi D^2 L/4",
        (_LENGTH, _DIAMETER),
        (_BULK,),
        "a right cylinder",
        _RP40_VOLUMES,
        "by hand",
        caliper_bulk_volume_cm3,
    ),
    Formula(
        "bulk-volume-displacement",
        1,
        "Bulk volume by displaced liquid",
        "V_b = M_displaced/rho",
        (Symbol("M_displaced", "mass_displaced_g", "g", "mass of liquid displaced"), _LIQUID),
        (_BULK,),
        "any liquid that does not enter the plug",
        "Amyx, Bass & Whiting 1960, Petroleum Reservoir Engineering, ch. 2 (from memory)",
        "published example 2-3",
        displaced_bulk_volume_cm3,
    ),
    Formula(
        "bulk-volume-buoyancy",
        1,
        "Bulk volume by buoyancy",
        "V_b = (M_air - M_immersed)/rho",
        (
            Symbol("M_air", "mass_in_air_g", "g", "mass in air of the plug as immersed"),
            Symbol("M_immersed", "mass_immersed_g", "g", "apparent mass below the liquid"),
            _LIQUID,
        ),
        (_BULK,),
        "a plug saturated with the liquid, or coated",
        "Amyx, Bass & Whiting 1960, Petroleum Reservoir Engineering, ch. 2, example 2-2 (from memory)",
        "published examples",
        buoyancy_bulk_volume_cm3,
    ),
    Formula(
        "volume-uncoated",
        1,
        "Volume without the coating",
        "V = V_coated - M_coating/rho_coating",
        (
            Symbol("V_coated", "coated_volume_cm3", "cm3", "volume with coating"),
            Symbol("M_coating", "coating_mass_g", "g", "mass of the coating"),
            Symbol("rho_coating", "coating_density_g_cm3", "g/cm3", "density of the coating"),
        ),
        (Symbol("V", "volume_cm3", "cm3", "volume without coating"),),
        "a coating that does not enter the plug",
        "Amyx, Bass & Whiting 1960, Petroleum Reservoir Engineering, ch. 2, example 2-1",
        "published example",
        uncoated_volume_cm3,
    ),
    Formula(
        "grain-volume-gas-expansion",
        1,
        "Grain volume by gas expansion",
        "V_r p1 + (V_c - V_billet - V_g) pa = (V_r + V_c - V_billet - V_g) p2",
        (
            _REFERENCE,
            _CUP,
            Symbol("V_billet", "billet_volume_cm3", "cm3", "billets left in the cup"),
            *_PRESSURES,
        ),
        (_GRAIN,),
        "isothermal, ideal gas, absolute pressures",
        _RP40_VOLUMES,
        "worked case; inverted by law; real gas and warm cup against worked cases",
        grain_volume_gas_expansion_cm3,
    ),
    Formula(
        "pore-volume-gas-expansion",
        1,
        "Pore volume by gas expansion",
        "V_r p1 + (V_p + V_d) pa = (V_r + V_p + V_d) p2",
        (_REFERENCE, _DEAD, *_PRESSURES),
        (_PORE,),
        "isothermal, ideal gas, absolute pressures",
        _RP40_VOLUMES,
        "inverted by law",
        pore_volume_gas_expansion_cm3,
    ),
    Formula(
        "pressure-over-z",
        1,
        "Helium pressure over compressibility factor",
        "p/z, z = 1 + B p/(R T)",
        (
            Symbol("p", "pressure_kpa", "kPa", "absolute pressure", 0.0, 1500.0),
            Symbol("t", "temperature_degc", "degC", "temperature", 15.0, 30.0),
        ),
        (Symbol("p/z", "pressure_over_z_kpa", "kPa", "pressure over compressibility factor"),),
        "15 to 30 degC, to 1.5 MPa",
        "second virial coefficient fitted to the equation of state in CoolProp (Bell et al. 2014)",
        "worked case of a grain volume with real helium",
        pressure_over_z_kpa,
    ),
    Formula(
        "reference-volume-at-cup-temperature",
        1,
        "Reference volume at the cup's temperature",
        "V_r T_c/T_r",
        (
            _REFERENCE,
            Symbol("T_r", "reference_temperature_degc", "degC", "temperature of the reference chamber"),
            Symbol("T_c", "cup_temperature_degc", "degC", "temperature of the cup"),
        ),
        (Symbol("V_r'", "equivalent_volume_cm3", "cm3", "equivalent reference volume"),),
        "ideal gas",
        "mole balance of an ideal gas",
        "worked case of a cup 1 K warmer",
        reference_volume_at_cup_temperature_cm3,
    ),
    Formula(
        "calibration-cup",
        1,
        "Calibration of the cup",
        "V_k = V_c - V_r (p1 - p2)/(p2 - pa), least squares",
        (_KNOWN, *_PRESSURES),
        (_REFERENCE, Symbol("V_c", "volume_cm3", "cm3", "volume of the cup"), *_COVARIANCE),
        "at least two different billets; covariance from three readings on",
        _RP40_VOLUMES,
        "worked case; against ordinary least squares of statsmodels",
        calibrate_cup,
        elementwise=False,
    ),
    Formula(
        "calibration-holder",
        1,
        "Calibration of the holder",
        "V_k = V_r (p1 - p2)/(p2 - pa) - V_d, least squares",
        (_KNOWN, *_PRESSURES),
        (_REFERENCE, Symbol("V_d", "volume_cm3", "cm3", "dead volume"), *_COVARIANCE),
        "at least two different voids; covariance from three readings on",
        _RP40_VOLUMES,
        "against ordinary least squares of statsmodels",
        calibrate_holder,
        elementwise=False,
    ),
    Formula(
        "pore-volume-saturation",
        1,
        "Pore volume by liquid saturation",
        "V_p = (M_sat - M_dry)/rho",
        (
            Symbol("M_sat", "saturated_mass_g", "g", "mass of the saturated plug"),
            _DRY,
            Symbol("rho", "saturant_density_g_cm3", "g/cm3", "density of the saturant"),
        ),
        (_PORE,),
        "a plug fully saturated",
        _RP40_VOLUMES,
        "published examples",
        pore_volume_saturation_cm3,
    ),
    Formula(
        "porosity-bulk-grain",
        1,
        "Porosity from bulk and grain volume",
        "phi = (V_b - V_g)/V_b",
        (_BULK, _GRAIN),
        _POROSITY,
        "grain volume at most 2 % above the bulk volume",
        _RP40_VOLUMES,
        "laws; real raw data",
        porosity_bulk_grain_frac,
    ),
    Formula(
        "porosity-bulk-pore",
        1,
        "Porosity from bulk and pore volume",
        "phi = V_p/V_b",
        (_BULK, _PORE),
        _POROSITY,
        "pore volume below the bulk volume",
        _RP40_VOLUMES,
        "published examples; laws",
        porosity_bulk_pore_frac,
    ),
    Formula(
        "porosity-pore-grain",
        1,
        "Porosity from pore and grain volume",
        "phi = V_p/(V_p + V_g)",
        (_PORE, _GRAIN),
        _POROSITY,
        "any",
        _RP40_VOLUMES,
        "laws",
        porosity_pore_grain_frac,
    ),
    Formula(
        "porosity-summation",
        1,
        "Porosity by summation of fluids",
        "phi = (V_w + V_o + V_g)/V_b",
        (
            _BULK,
            Symbol("V_w", "water_volume_cm3", "cm3", "water in the sample"),
            Symbol("V_o", "oil_volume_cm3", "cm3", "oil in the sample"),
            Symbol("V_g", "gas_volume_cm3", "cm3", "gas in the sample"),
        ),
        _POROSITY,
        "fluids of one sample less than its bulk volume",
        "API RP 40, 2nd ed. 1998, sec. 4.2 (from memory)",
        "published inputs",
        porosity_summation_frac,
    ),
    Formula(
        "grain-density",
        1,
        "Grain density",
        "rho_g = M_dry/V_g",
        (_DRY, _GRAIN),
        (Symbol("rho_g", "grain_density_g_cm3", "g/cm3", "grain density"),),
        "any",
        _RP40_VOLUMES,
        "published examples; real raw data",
        grain_density_g_cm3,
    ),
    Formula(
        "bulk-density",
        1,
        "Dry bulk density",
        "rho_b = M_dry/V_b",
        (_DRY, _BULK),
        (Symbol("rho_b", "bulk_density_g_cm3", "g/cm3", "dry bulk density"),),
        "any",
        _RP40_VOLUMES,
        "real raw data",
        bulk_density_g_cm3,
    ),
)
