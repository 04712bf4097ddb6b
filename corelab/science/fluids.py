"""Properties of the laboratory's gases and liquids.

Temperatures are in degC, pressures absolute in kPa, viscosities in mPa s, densities in g/cm3.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.formula import Array, Formula, Symbol, finite, kelvin, not_negative, positive, refuse

GAS_CONSTANT_J_MOL_K = 8.314462618
SALT_DENSITY_G_CM3 = 2.165
"""Halite, handbook value (from memory); its X-ray density is 2.164 g/cm3."""
HELIUM_SECOND_VIRIAL_CM3_MOL = 11.856
"""From z = 1.00335 at 100 psi absolute and 20 degC (reference equation of state, CoolProp 8.0.0)."""
OLD_MILLILITRE_CM3 = 1.000028
"""The millilitre of 1901 to 1964."""


@dataclass(frozen=True, slots=True)
class Gas:
    """A gas of the permeameter: molar mass and, for the residual viscosity, its critical constants."""

    name: str
    molar_mass_g_mol: float
    energy_k: float = np.nan
    diameter_nm: float = np.nan
    critical_temperature_k: float = np.nan
    critical_density_mol_l: float = np.nan
    residual: tuple[tuple[float, float, int, int], ...] = ()


# Lemmon & Jacobsen 2004, tables of the viscosity of nitrogen and air: (N, t, d, l) of each residual term.
GASES: Mapping[str, Gas] = MappingProxyType(
    {
        "nitrogen": Gas(
            "nitrogen",
            28.01348,
            98.94,
            0.3656,
            126.192,
            11.1839,
            (
                (10.72, 0.1, 2, 0),
                (0.03989, 0.25, 10, 1),
                (0.001208, 3.2, 12, 1),
                (-7.402, 0.9, 2, 2),
                (4.620, 0.3, 1, 3),
            ),
        ),
        "air": Gas(
            "air",
            28.9586,
            103.3,
            0.360,
            132.6312,
            10.4477,
            (
                (10.72, 0.2, 1, 0),
                (1.122, 0.05, 4, 0),
                (0.002019, 2.4, 9, 0),
                (-8.876, 0.6, 1, 1),
                (-0.02916, 3.6, 8, 1),
            ),
        ),
        "helium": Gas("helium", 4.002602),
    }
)
_COLLISION = (0.431, -0.4623, 0.08406, 0.005341, -0.00331)


def known_gas(name: str, gas: ArrayLike) -> np.ndarray[tuple[int, ...], np.dtype[np.str_]]:
    """The names of the gases as an array; one that is not known is refused, naming argument `name`."""
    names = np.asarray(gas, dtype=np.str_)
    refuse(~np.isin(names, ["", *GASES]), name, names, f"one of {', '.join(GASES)}")
    return names


def molar_mass_g_mol(gas: ArrayLike) -> Array:
    """Molar mass of a gas.

    Parameters
    ----------
    gas : text or array of texts
        'nitrogen', 'air' or 'helium'; an empty text is a missing one.

    Returns
    -------
    Array
        Molar mass [g/mol], shape of `gas`.

    Raises
    ------
    Impossible
        If a gas is not known.

    Notes
    -----
    M of nitrogen and air as in Lemmon & Jacobsen 2004; helium from the standard atomic weight, 4.002602.

    References
    ----------
    Lemmon, E. W. & Jacobsen, R. T. 2004, "Viscosity and thermal conductivity equations for nitrogen,
    oxygen, argon, and air", Int. J. Thermophys. 25:21-69.

    Examples
    --------
    >>> float(molar_mass_g_mol("helium"))
    4.002602
    """
    names = known_gas("gas", gas)
    return np.select([names == key for key in GASES], [g.molar_mass_g_mol for g in GASES.values()], np.nan)


def gas_viscosity_mpas(gas: ArrayLike, temperature_degc: ArrayLike, pressure_kpa: ArrayLike) -> Array:
    """Viscosity of nitrogen, air or helium at laboratory temperatures.

    Parameters
    ----------
    gas : text or array of texts
        'nitrogen', 'air' or 'helium'; an empty text is a missing one.
    temperature_degc : array_like
        Temperature [degC], above absolute zero.
    pressure_kpa : array_like
        Absolute pressure [kPa], 0 or more.

    Returns
    -------
    Array
        Viscosity [mPa s], broadcast shape.

    Raises
    ------
    Impossible
        If a gas is not known, a temperature not above absolute zero, or a pressure negative.

    Notes
    -----
    Nitrogen and air: eta = eta0 + eta_r with

    eta0 = 0.0266958 sqrt(M T) / (sigma^2 Omega), Omega = exp(sum b_i ln(T/eps)^i) [uPa s],
    eta_r = sum N_i tau^t_i delta^d_i exp(-gamma_i delta^l_i) [uPa s],

    T [K]; M molar mass [g/mol]; sigma diameter [nm] and eps energy [K] of the molecule; tau = T_c/T;
    delta = rho/rho_c; gamma 0 where l is 0, else 1. The density rho is that of the ideal gas, p/(R T).
    With the real density the equation is good to 2 % over its whole range; the ideal one changes it
    at 15 to 30 degC by less than 0.01 % to 1.5 MPa, 0.1 % to 5 MPa and 0.25 % to 10 MPa.

    Helium: eta = 18.70 (T/273.1)^0.685 [uPa s], without pressure; within 0.3 % at 15 to 30 degC to
    1.5 MPa, 0.9 % low at 5 MPa. The worked example of RP 40 prints 0.01967 mPa s at 72 degF where this
    form gives 0.01973 (and the reference equation 0.01972).

    Published range: nitrogen and air to 10 MPa here; helium to 1.5 MPa, 0 to 100 degC.

    References
    ----------
    Lemmon, E. W. & Jacobsen, R. T. 2004, "Viscosity and thermal conductivity equations for nitrogen,
    oxygen, argon, and air", Int. J. Thermophys. 25:21-69 (coefficients from memory, checked against
    CoolProp 8.0.0). API RP 40, 2nd ed. 1998, helium form as quoted in a public teaching notebook.

    Examples
    --------
    >>> gas_viscosity_mpas(["air", "nitrogen", "helium"], 25.0, 101.325).round(5).tolist()
    [0.01845, 0.0178, 0.01986]
    """
    names = known_gas("gas", gas)
    kelvins = kelvin("temperature_degc", temperature_degc)
    pressure = not_negative("pressure_kpa", pressure_kpa)
    # adding 0 x pressure broadcasts, and lets a missing pressure flow through for helium as well
    viscosity_upas = np.where(names == "helium", 18.70 * (kelvins / 273.1) ** 0.685, np.nan) + 0.0 * pressure
    for key in ("nitrogen", "air"):
        if np.any(names == key):
            gas_viscosity = _lemmon_jacobsen_upas(GASES[key], kelvins, pressure)
            viscosity_upas = np.where(names == key, gas_viscosity, viscosity_upas)
    return viscosity_upas / 1000.0


def _lemmon_jacobsen_upas(gas: Gas, kelvins: Array, pressure_kpa: Array) -> Array:
    log_reduced = np.log(kelvins / gas.energy_k)
    collision = np.exp(sum(b * log_reduced**i for i, b in enumerate(_COLLISION)))
    dilute = 0.0266958 * np.sqrt(gas.molar_mass_g_mol * kelvins) / (gas.diameter_nm**2 * collision)
    delta = pressure_kpa / (GAS_CONSTANT_J_MOL_K * kelvins) / gas.critical_density_mol_l
    tau = gas.critical_temperature_k / kelvins
    residual = sum(
        n * tau**t * delta**d * (np.exp(-(delta**power)) if power else 1.0) for n, t, d, power in gas.residual
    )
    return dilute + residual


def mean_free_path_m(gas: ArrayLike, temperature_degc: ArrayLike, pressure_kpa: ArrayLike) -> Array:
    """Mean free path of the molecules of a gas.

    Parameters
    ----------
    gas : text or array of texts
        'nitrogen', 'air' or 'helium'; an empty text is a missing one.
    temperature_degc : array_like
        Temperature [degC], above absolute zero.
    pressure_kpa : array_like
        Absolute pressure [kPa], above 0.

    Returns
    -------
    Array
        Mean free path [m], broadcast shape.

    Raises
    ------
    Impossible
        If a gas is not known, a temperature not above absolute zero, or a pressure not above 0.

    Notes
    -----
    lambda = (mu/p) sqrt(pi R T/(2 M)), mu viscosity, p absolute pressure, R gas constant, T absolute
    temperature, M molar mass. Range as for the viscosity.

    References
    ----------
    Loeb, L. B. 1934, "The kinetic theory of gases", 2nd ed. (from memory).

    Examples
    --------
    >>> round(1e9 * float(mean_free_path_m("nitrogen", 25.0, 101.325)), 1)
    65.5
    """
    pressure = positive("pressure_kpa", pressure_kpa)
    viscosity_pas = gas_viscosity_mpas(gas, temperature_degc, pressure) * 1e-3
    kelvins = kelvin("temperature_degc", temperature_degc)
    molar_mass_kg = molar_mass_g_mol(gas) * 1e-3
    speed = np.sqrt(np.pi * GAS_CONSTANT_J_MOL_K * kelvins / (2.0 * molar_mass_kg))
    return viscosity_pas / (pressure * 1000.0) * speed


def helium_compressibility_factor(temperature_degc: ArrayLike, pressure_kpa: ArrayLike) -> Array:
    """Compressibility factor z of helium, linear in pressure.

    Parameters
    ----------
    temperature_degc : array_like
        Temperature [degC], above absolute zero.
    pressure_kpa : array_like
        Absolute pressure [kPa], 0 or more.

    Returns
    -------
    Array
        z [1], broadcast shape.

    Raises
    ------
    Impossible
        If a temperature is not above absolute zero or a pressure negative.

    Notes
    -----
    z = 1 + B p/(R T), B = 11.856 cm3/mol the second virial coefficient, p absolute pressure, R gas
    constant, T absolute temperature. Within 1e-5 at 15 to 30 degC and to 1.5 MPa.

    References
    ----------
    B fitted to the reference equation of state in CoolProp: Bell, I. H. et al. 2014, "Pure and pseudo-pure
    fluid thermophysical property evaluation and the open-source thermophysical property library CoolProp",
    Ind. Eng. Chem. Res. 53:2498-2508.

    Examples
    --------
    >>> round(float(helium_compressibility_factor(20.0, 689.476)), 5)
    1.00335
    """
    kelvins = kelvin("temperature_degc", temperature_degc)
    pressure = not_negative("pressure_kpa", pressure_kpa)
    # kPa cm3 is 1e-3 J
    return 1.0 + HELIUM_SECOND_VIRIAL_CM3_MOL * 1e-3 * pressure / (GAS_CONSTANT_J_MOL_K * kelvins)


def mercury_density_g_cm3(temperature_degc: ArrayLike) -> Array:
    """Density of mercury at 1 atm.

    Parameters
    ----------
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Density [g/cm3], shape of the input.

    Raises
    ------
    Impossible
        If a temperature is not above absolute zero.

    Notes
    -----
    1/rho = 1.000028 (0.0735540 + 1.33775e-5 t) [cm3/g], t [degC]: the line through the table's volumes
    at 0 and 40 degC, which meets those at 10, 20 and 30 degC within 1.3e-7 ml/g; 1.000028 cm3 was the
    old millilitre. The quadratic often printed beside the table is 2.1e-6 ml/g low at 20 degC and is
    not used. Published range: 0 to 40 degC.

    References
    ----------
    CRC Handbook of Chemistry and Physics, table "Volume of 1 g of mercury" (in old ml).

    Examples
    --------
    >>> round(float(mercury_density_g_cm3(20.0)), 4)
    13.5458
    """
    kelvin("temperature_degc", temperature_degc)
    degc = finite("temperature_degc", temperature_degc)
    return 1.0 / (OLD_MILLILITRE_CM3 * (0.0735540 + 1.33775e-5 * degc))


def water_density_g_cm3(temperature_degc: ArrayLike) -> Array:
    """Density of air-saturated water at 1 atm.

    Parameters
    ----------
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Density [g/cm3], shape of the input.

    Raises
    ------
    Impossible
        If a temperature is not above absolute zero.

    Notes
    -----
    rho = 999.85308 + 6.32693e-2 t - 8.523829e-3 t^2 + 6.943248e-5 t^3 - 3.821216e-7 t^4 [kg/m3],
    t [degC]. Published range: 5 to 40 degC.

    References
    ----------
    Jones, F. E. & Harris, G. L. 1992, "ITS-90 density of water formulation for volumetric standards
    calibration", J. Res. Natl. Inst. Stand. Technol. 97:335-340.

    Examples
    --------
    >>> round(float(water_density_g_cm3(20.0)), 7)
    0.9982033
    """
    kelvin("temperature_degc", temperature_degc)
    t = finite("temperature_degc", temperature_degc)
    return (999.85308 + t * (6.32693e-2 + t * (-8.523829e-3 + t * (6.943248e-5 - t * 3.821216e-7)))) / 1000.0


def salt_mass_fraction(salinity_g_kg: ArrayLike) -> Array:
    """Mass fraction of salt from a salinity per mass of solution.

    Parameters
    ----------
    salinity_g_kg : array_like
        Salt per kg of solution, not of water and not per litre [g/kg], 0 to below 500.

    Returns
    -------
    Array
        Mass fraction [g/g], shape of the input.

    Raises
    ------
    Impossible
        If a salinity is negative or 500 g/kg and more, which no brine dissolves.

    Notes
    -----
    s = S/1000, S salinity [g/kg].

    References
    ----------
    Definition.

    Examples
    --------
    >>> float(salt_mass_fraction(35.0))
    0.035
    """
    salinity = not_negative("salinity_g_kg", salinity_g_kg)
    refuse(salinity.real >= 500.0, "salinity_g_kg", salinity, "grams of salt per kg of solution, below 500")
    return salinity / 1000.0


def brine_density_g_cm3(salinity_g_kg: ArrayLike, temperature_degc: ArrayLike) -> Array:
    """Density of sodium chloride brine at 1 atm.

    Parameters
    ----------
    salinity_g_kg : array_like
        Salt per kg of solution [g/kg], 0 to 290 (saturated brine holds about 264 at 20 degC).
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Density [g/cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a salinity is negative or above 290 g/kg, or a temperature not above absolute zero.

    Notes
    -----
    v = A - B P - C P^2 + x D + x^2 E - x F P - x^2 G P - x H P^2/2 [cm3/g], rho = 1/v, at P = 1.0332
    kgf/cm2; x mass fraction of salt, T absolute temperature:
    A = 5.916365 - 0.01035794 T + 0.9270048e-5 T^2 - 1127.522/T + 100674.1/T^2,
    B = 0.5204914e-2 - 0.10482101e-4 T + 0.8328532e-8 T^2 - 1.1702939/T + 102.2783/T^2,
    C = 0.118547e-7 - 0.6599143e-10 T, D = -2.5166 + 0.0111766 T - 0.170552e-4 T^2,
    E = 2.84851 - 0.0154305 T + 0.223982e-4 T^2, F = -0.0014814 + 0.82969e-5 T - 0.12469e-7 T^2,
    G = 0.0027141 - 0.15391e-4 T + 0.22655e-7 T^2, H = 0.62158e-6 - 0.40075e-8 T + 0.65972e-11 T^2.
    Within 0.0009 g/cm3 of the handbook tables. Some reprints have D and E wrong.
    Published range: 0 to 150 degC, to 250 g/kg (from memory).

    References
    ----------
    Rowe, A. M. & Chou, J. C. S. 1970, "Pressure-volume-temperature-concentration relation of aqueous NaCl
    solutions", J. Chem. Eng. Data 15:61-66.

    Examples
    --------
    >>> round(float(brine_density_g_cm3(100.0, 20.0)), 5)
    1.071
    """
    refuse(
        np.real(salinity_g_kg) > 290.0, "salinity_g_kg", salinity_g_kg, "sodium chloride, not above 290 g/kg"
    )
    x = salt_mass_fraction(salinity_g_kg)
    t = kelvin("temperature_degc", temperature_degc)
    p = 1.0332
    a = 5.916365 - 0.01035794 * t + 0.9270048e-5 * t**2 - 1127.522 / t + 100674.1 / t**2
    b = 0.5204914e-2 - 0.10482101e-4 * t + 0.8328532e-8 * t**2 - 1.1702939 / t + 102.2783 / t**2
    c = 0.118547e-7 - 0.6599143e-10 * t
    d = -2.5166 + 0.0111766 * t - 0.170552e-4 * t**2
    e = 2.84851 - 0.0154305 * t + 0.223982e-4 * t**2
    f = -0.0014814 + 0.82969e-5 * t - 0.12469e-7 * t**2
    g = 0.0027141 - 0.15391e-4 * t + 0.22655e-7 * t**2
    h = 0.62158e-6 - 0.40075e-8 * t + 0.65972e-11 * t**2
    water = a - b * p - c * p**2
    return 1.0 / (water + x * (d - f * p - h * p**2 / 2.0) + x**2 * (e - g * p))


def toluene_density_g_cm3(temperature_degc: ArrayLike) -> Array:
    """Density of toluene at 1 atm.

    Parameters
    ----------
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Density [g/cm3], shape of the input.

    Raises
    ------
    Impossible
        If a temperature is not above absolute zero.

    Notes
    -----
    rho = 0.866893 - 9.3003e-4 u - 2.221e-7 u^2 [g/cm3], u = t - 20, t [degC]: a parabola through the
    equation of state at 1 atm, 5 to 40 degC, within 5e-6 g/cm3.

    References
    ----------
    Lemmon, E. W. & Span, R. 2006, "Short fundamental equations of state for 20 industrial fluids",
    J. Chem. Eng. Data 51:785-850, as evaluated with CoolProp 8.0.0.

    Examples
    --------
    >>> round(float(toluene_density_g_cm3(20.0)), 5)
    0.86689
    """
    kelvin("temperature_degc", temperature_degc)
    u = finite("temperature_degc", temperature_degc) - 20.0
    return 0.866893 - 9.3003e-4 * u - 2.221e-7 * u**2


def ethanol_density_g_cm3(temperature_degc: ArrayLike) -> Array:
    """Density of pure ethanol at 1 atm.

    Parameters
    ----------
    temperature_degc : array_like
        Temperature [degC], above absolute zero.

    Returns
    -------
    Array
        Density [g/cm3], shape of the input.

    Raises
    ------
    Impossible
        If a temperature is not above absolute zero.

    Notes
    -----
    rho = 0.789425 - 8.566e-4 u - 4.699e-7 u^2 [g/cm3], u = t - 20, t [degC]: a parabola through the
    equation of state at 1 atm, 5 to 40 degC, within 2e-5 g/cm3. One per cent of water adds about
    0.003 g/cm3: for anything but absolute ethanol, enter the density.

    References
    ----------
    Schroeder, J. A., Penoncello, S. G. & Schroeder, J. S. 2014, "A fundamental equation of state for
    ethanol", J. Phys. Chem. Ref. Data 43:043102, as evaluated with CoolProp 8.0.0.

    Examples
    --------
    >>> round(float(ethanol_density_g_cm3(20.0)), 4)
    0.7894
    """
    kelvin("temperature_degc", temperature_degc)
    u = finite("temperature_degc", temperature_degc) - 20.0
    return 0.789425 - 8.566e-4 * u - 4.699e-7 * u**2


_GAS = Symbol("", "gas", "", "nitrogen, air or helium")


def _degc(low: float, high: float) -> Symbol:
    return Symbol("t", "temperature_degc", "degC", "temperature", low, high)


_PRESSURE = Symbol("p", "pressure_kpa", "kPa", "absolute pressure", 0.0, 10_000.0)


def _density(symbol: str = "rho") -> tuple[Symbol, ...]:
    return (Symbol(symbol, "density_g_cm3", "g/cm3", "density"),)


_JONES_HARRIS = "Jones & Harris 1992, J. Res. Natl. Inst. Stand. Technol. 97:335-340"
_LEMMON_JACOBSEN = (
    "Lemmon & Jacobsen 2004, Int. J. Thermophys. 25:21-69; helium: form quoted from API RP 40, 1998"
)

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "molar-mass",
        1,
        "Molar mass of a gas",
        "M",
        (_GAS,),
        (Symbol("M", "molar_mass_g_mol", "g/mol", "molar mass"),),
        "nitrogen, air, helium",
        "Lemmon & Jacobsen 2004, Int. J. Thermophys. 25:21-69; helium: standard atomic weight",
        "against CoolProp",
        molar_mass_g_mol,
    ),
    Formula(
        "gas-viscosity",
        1,
        "Viscosity of a gas",
        "eta = eta0(T) + eta_r(T, rho); helium: eta = 18.70 (T/273.1)^0.685 uPa s",
        (_GAS, _degc(0.0, 100.0), _PRESSURE),
        (Symbol("eta", "viscosity_mpas", "mPa.s", "viscosity"),),
        "nitrogen and air to 10 MPa, helium to 1.5 MPa; 0 to 100 degC",
        _LEMMON_JACOBSEN,
        "against CoolProp within 0.3 % at 15 to 30 degC, 101 to 1500 kPa",
        gas_viscosity_mpas,
    ),
    Formula(
        "mean-free-path",
        1,
        "Mean free path of a gas",
        "lambda = (mu/p) sqrt(pi R T/(2 M))",
        (_GAS, _degc(0.0, 100.0), _PRESSURE),
        (Symbol("lambda", "mean_free_path_m", "m", "mean free path"),),
        "as the viscosity",
        "Loeb 1934, The kinetic theory of gases, 2nd ed. (from memory)",
        "against values computed with CoolProp's viscosities at 25 degC and 1 atm",
        mean_free_path_m,
    ),
    Formula(
        "helium-compressibility",
        1,
        "Compressibility factor of helium",
        "z = 1 + B p/(R T), B = 11.856 cm3/mol",
        (_degc(0.0, 60.0), Symbol("p", "pressure_kpa", "kPa", "absolute pressure", 0.0, 1500.0)),
        (Symbol("z", "compressibility_factor", "1", "compressibility factor"),),
        "0 to 60 degC, to 1.5 MPa",
        "second virial coefficient fitted to the equation of state in CoolProp (Bell et al. 2014, "
        "Ind. Eng. Chem. Res. 53:2498)",
        "against CoolProp",
        helium_compressibility_factor,
    ),
    Formula(
        "mercury-density",
        1,
        "Density of mercury",
        "1/rho = 1.000028 (0.0735540 + 1.33775e-5 t)",
        (_degc(0.0, 40.0),),
        _density(),
        "0 to 40 degC, 1 atm",
        "CRC Handbook of Chemistry and Physics, volume of 1 g of mercury",
        "against the table at 0, 10, 20, 30 and 40 degC",
        mercury_density_g_cm3,
    ),
    Formula(
        "water-density",
        1,
        "Density of air-saturated water",
        "rho = 999.85308 + 6.32693e-2 t - 8.523829e-3 t^2 + 6.943248e-5 t^3 - 3.821216e-7 t^4 (kg/m3)",
        (_degc(5.0, 40.0),),
        _density(),
        "5 to 40 degC, 1 atm",
        _JONES_HARRIS,
        "published values; IAPWS-95 by iapws and CoolProp within the effect of the dissolved air",
        water_density_g_cm3,
    ),
    Formula(
        "salt-fraction",
        1,
        "Mass fraction of salt",
        "s = S/1000",
        (Symbol("S", "salinity_g_kg", "g/kg", "salt per kg of solution"),),
        (Symbol("s", "salt_mass_fraction", "g/g", "mass fraction of salt"),),
        "below 500 g/kg",
        "definition",
        "by hand",
        salt_mass_fraction,
    ),
    Formula(
        "brine-density",
        1,
        "Density of sodium chloride brine",
        "1/rho = A - B P - C P^2 + x D + x^2 E - x F P - x^2 G P - x H P^2/2 at P = 1.0332 kgf/cm2",
        (
            Symbol("x", "salinity_g_kg", "g/kg", "sodium chloride per kg of solution", 0.0, 250.0),
            _degc(0.0, 150.0),
        ),
        _density(),
        "0 to 150 degC, to 250 g/kg, 1 atm",
        "Rowe & Chou 1970, J. Chem. Eng. Data 15:61-66",
        "published value; handbook tables within 0.0009 g/cm3; pure water against IAPWS-95",
        brine_density_g_cm3,
    ),
    Formula(
        "toluene-density",
        1,
        "Density of toluene",
        "rho = 0.866893 - 9.3003e-4 (t - 20) - 2.221e-7 (t - 20)^2",
        (_degc(5.0, 40.0),),
        _density(),
        "5 to 40 degC, 1 atm",
        "Lemmon & Span 2006, J. Chem. Eng. Data 51:785-850, by CoolProp 8.0.0",
        "handbook values at 20 and 25 degC; against CoolProp",
        toluene_density_g_cm3,
    ),
    Formula(
        "ethanol-density",
        1,
        "Density of ethanol",
        "rho = 0.789425 - 8.566e-4 (t - 20) - 4.699e-7 (t - 20)^2",
        (_degc(5.0, 40.0),),
        _density(),
        "5 to 40 degC, 1 atm, free of water",
        "Schroeder et al. 2014, J. Phys. Chem. Ref. Data 43:043102, by CoolProp 8.0.0",
        "handbook value at 20 degC; against CoolProp",
        ethanol_density_g_cm3,
    ),
)
