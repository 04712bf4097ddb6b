"""Fluids and salt of a plug: distillation, retort, and the corrections for salt left by dried brine.

Masses are in g, volumes in cm3, densities in g/cm3, salinities in g of salt per kg of solution.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.fluids import SALT_DENSITY_G_CM3, salt_mass_fraction
from corelab.science.formula import Array, Formula, Symbol, finite, not_negative, positive, refuse

SALT_CHOICES = ("none", "left", "leached")


def salt_mass_g(water_mass_g: ArrayLike, salinity_g_kg: ArrayLike) -> Array:
    """Mass of the salt that was dissolved in evaporated or distilled water.

    Parameters
    ----------
    water_mass_g : array_like
        Mass of the water, free of salt [g], 0 or more.
    salinity_g_kg : array_like
        Salinity of the brine it was [g/kg of solution], 0 to below 500.

    Returns
    -------
    Array
        Mass of salt [g], broadcast shape.

    Raises
    ------
    Impossible
        If a mass is negative, or a salinity negative or 500 g/kg and more.

    Notes
    -----
    W_s = W_w s/(1 - s), W_w water mass, s mass fraction of salt.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(float(salt_mass_g(3.988, 100.0)), 5)
    0.44311
    """
    s = salt_mass_fraction(salinity_g_kg)
    return not_negative("water_mass_g", water_mass_g) * s / (1.0 - s)


def pore_fluid_mass_g(wet_mass_g: ArrayLike, dry_mass_g: ArrayLike, salinity_g_kg: ArrayLike) -> Array:
    """Mass of the pore fluid of a plug that was dried with its salt.

    Parameters
    ----------
    wet_mass_g, dry_mass_g : array_like
        Masses of the plug full of brine, and dried with the salt left in it [g], above 0.
    salinity_g_kg : array_like
        Salinity of the brine [g/kg of solution], 0 to below 500.

    Returns
    -------
    Array
        Mass of the brine, water and salt [g], broadcast shape.

    Raises
    ------
    Impossible
        If a mass is not above 0, a dry mass above the wet one, or a salinity negative or 500 g/kg and more.

    Notes
    -----
    M_pw = (M_wet - M_dry)/(1 - s), s mass fraction of salt.

    References
    ----------
    Blum, P. 1997, "Physical properties handbook", ODP Tech. Note 26; equations printed in IODP
    Expedition 330 Scientists 2012, Proc. IODP 330, Methods, table T9.

    Examples
    --------
    >>> round(float(pore_fluid_mass_g(20.0, 14.0, 35.0)), 5)
    6.21762
    """
    wet = positive("wet_mass_g", wet_mass_g)
    dry = positive("dry_mass_g", dry_mass_g)
    refuse(dry.real > wet.real, "dry_mass_g", dry, "not more than the wet mass")
    return (wet - dry) / (1.0 - salt_mass_fraction(salinity_g_kg))


def salt_left_mass_g(wet_mass_g: ArrayLike, dry_mass_g: ArrayLike, salinity_g_kg: ArrayLike) -> Array:
    """Mass of the salt that a plug dried with its brine has kept.

    Parameters
    ----------
    wet_mass_g, dry_mass_g : array_like
        Masses of the plug full of brine, and dried with the salt left in it [g], above 0.
    salinity_g_kg : array_like
        Salinity of the brine [g/kg of solution], 0 to below 500.

    Returns
    -------
    Array
        Mass of salt [g], broadcast shape.

    Raises
    ------
    Impossible
        If a mass is not above 0, a dry mass above the wet one, or a salinity negative or 500 g/kg and more.

    Notes
    -----
    M_salt = M_pw - (M_wet - M_dry) = s (M_wet - M_dry)/(1 - s), s mass fraction of salt.

    References
    ----------
    Blum, P. 1997, "Physical properties handbook", ODP Tech. Note 26; equations printed in IODP
    Expedition 330 Scientists 2012, Proc. IODP 330, Methods, table T9.

    Examples
    --------
    >>> round(float(salt_left_mass_g(20.0, 14.0, 35.0)), 5)
    0.21762
    """
    return pore_fluid_mass_g(wet_mass_g, dry_mass_g, salinity_g_kg) * salt_mass_fraction(salinity_g_kg)


def liquid_volume_cm3(liquid_mass_g: ArrayLike, liquid_density_g_cm3: ArrayLike) -> Array:
    """Volume of a mass of liquid (pore fluid, oil).

    Parameters
    ----------
    liquid_mass_g : array_like
        Mass [g]; a mass found by difference may come out a little below 0.
    liquid_density_g_cm3 : array_like
        Density [g/cm3], above 0.

    Returns
    -------
    Array
        Volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass is infinite or a density not above 0.

    Notes
    -----
    V = M/rho.

    References
    ----------
    Definition.

    Examples
    --------
    >>> round(float(liquid_volume_cm3(8.0120, 0.850)), 4)
    9.4259
    """
    mass = finite("liquid_mass_g", liquid_mass_g)
    return mass / positive("liquid_density_g_cm3", liquid_density_g_cm3)


def grain_mass_g(dry_mass_g: ArrayLike, salt_mass_g: ArrayLike) -> Array:
    """Mass of the grains of a plug that was dried with salt in it.

    Parameters
    ----------
    dry_mass_g : array_like
        Mass of the dry plug with its salt [g], above 0.
    salt_mass_g : array_like
        Mass of the salt left in it [g], 0 or more.

    Returns
    -------
    Array
        Grain mass [g], broadcast shape.

    Raises
    ------
    Impossible
        If a dry mass is not above 0, a salt mass negative or not below the dry mass.

    Notes
    -----
    W_g = W_d - W_s, W_d dry mass, W_s mass of salt.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(float(grain_mass_g(14.0, 0.21762)), 5)
    13.78238
    """
    dry = positive("dry_mass_g", dry_mass_g)
    salt = not_negative("salt_mass_g", salt_mass_g)
    refuse(salt.real >= dry.real, "salt_mass_g", salt, "less than the dry mass")
    return dry - salt


def grain_volume_without_salt_cm3(
    grain_volume_cm3: ArrayLike, salt_mass_g: ArrayLike, salt_density_g_cm3: ArrayLike = SALT_DENSITY_G_CM3
) -> Array:
    """Grain volume of a plug that was measured with salt in it.

    Parameters
    ----------
    grain_volume_cm3 : array_like
        Grain volume as measured, grains and salt [cm3], above 0.
    salt_mass_g : array_like
        Mass of the salt left in it [g], 0 or more.
    salt_density_g_cm3 : array_like
        Density of the salt [g/cm3], above 0; sodium chloride 2.165, sea salt 2.22.

    Returns
    -------
    Array
        Grain volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a volume or a density is not above 0, a mass negative, or the salt not smaller than the grains
        and salt.

    Notes
    -----
    V_g = V_measured - W_s/rho_s, W_s mass and rho_s density of the salt.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory); Blum, P. 1997, ODP Tech. Note 26.

    Examples
    --------
    >>> round(float(grain_volume_without_salt_cm3(5.30, 0.21762, 2.22)), 5)
    5.20197
    """
    grain = positive("grain_volume_cm3", grain_volume_cm3)
    mass = not_negative("salt_mass_g", salt_mass_g)
    salt = mass / positive("salt_density_g_cm3", salt_density_g_cm3)
    refuse(salt.real >= grain.real, "salt_mass_g", mass, "a salt smaller than the volume measured")
    return grain - salt


def water_mass_g(water_volume_cm3: ArrayLike, water_density_g_cm3: ArrayLike) -> Array:
    """Mass of the water collected in the trap.

    Parameters
    ----------
    water_volume_cm3 : array_like
        Volume read in the trap [cm3], 0 or more.
    water_density_g_cm3 : array_like
        Density of water at the trap's temperature [g/cm3], above 0.

    Returns
    -------
    Array
        Mass [g], broadcast shape.

    Raises
    ------
    Impossible
        If a volume is negative or a density not above 0.

    Notes
    -----
    W_w = V_w rho_w.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(float(water_mass_g(4.00, 0.9970)), 4)
    3.988
    """
    volume = not_negative("water_volume_cm3", water_volume_cm3)
    return volume * positive("water_density_g_cm3", water_density_g_cm3)


def brine_volume_cm3(
    water_mass_g: ArrayLike, salinity_g_kg: ArrayLike, brine_density_g_cm3: ArrayLike
) -> Array:
    """Volume in the pores of the brine whose water was distilled.

    Parameters
    ----------
    water_mass_g : array_like
        Mass of the water collected [g], 0 or more.
    salinity_g_kg : array_like
        Salinity of the brine [g/kg of solution], 0 to below 500.
    brine_density_g_cm3 : array_like
        Density of the brine [g/cm3], above 0.

    Returns
    -------
    Array
        Volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass is negative, a salinity negative or 500 g/kg and more, or a density not above 0.

    Notes
    -----
    V_b = (W_w + W_s)/rho_b = W_w/((1 - s) rho_b), W_w water mass, W_s salt mass, s mass fraction of salt,
    rho_b density of the brine.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(float(brine_volume_cm3(3.988, 100.0, 1.0690)), 4)
    4.1451
    """
    water = not_negative("water_mass_g", water_mass_g)
    fresh = 1.0 - salt_mass_fraction(salinity_g_kg)
    return water / (fresh * positive("brine_density_g_cm3", brine_density_g_cm3))


def oil_mass_g(
    received_mass_g: ArrayLike,
    dry_mass_g: ArrayLike,
    water_mass_g: ArrayLike,
    salinity_g_kg: ArrayLike,
    salt: ArrayLike,
) -> Array:
    """Mass of the oil of a distilled plug, by difference.

    Parameters
    ----------
    received_mass_g, dry_mass_g : array_like
        Masses of the plug as received and after extraction and drying [g], above 0.
    water_mass_g : array_like
        Mass of the water collected [g], 0 or more.
    salinity_g_kg : array_like
        Salinity of the brine [g/kg of solution], 0 to below 500.
    salt : text or array of texts
        'left': the dry plug still holds its salt. 'leached': the salt was washed out before drying.
        'none': the dry plug holds none, which with salt in the brine is the same as 'leached'.

    Returns
    -------
    Array
        Mass of oil [g], broadcast shape; a little below 0 where the plug has none and the readings err.

    Raises
    ------
    Impossible
        If a mass of the plug is not above 0, a water mass negative, a salinity negative or 500 g/kg and
        more, a word for the salt unknown, or a dry mass above the mass as received.

    Notes
    -----
    W_o = W_i - W_d - W_w where the salt is left, and W_o = W_i - W_d - W_w - W_s otherwise; W_i mass as
    received, W_d dry mass, W_w water mass, W_s = W_w s/(1 - s) salt mass, s mass fraction of salt.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> oil_mass_g(152.0, 140.0, 3.988, 100.0, ["left", "leached"]).round(5).tolist()
    [8.012, 7.56889]
    """
    received = positive("received_mass_g", received_mass_g)
    dry = positive("dry_mass_g", dry_mass_g)
    refuse(dry.real > received.real, "dry_mass_g", dry, "not more than the mass as received")
    words = np.asarray(salt, dtype=np.str_)
    refuse(~np.isin(words, ["", *SALT_CHOICES]), "salt", words, "none, left or leached")
    dissolved = salt_mass_g(water_mass_g, salinity_g_kg)
    water = not_negative("water_mass_g", water_mass_g)
    # an empty word is a missing one
    subtracted = np.where(words == "left", 0.0 * dissolved, np.where(words == "", np.nan, dissolved))
    return received - dry - water - subtracted


@dataclass(frozen=True, slots=True)
class Saturations:
    """Fractions of the pore volume [v/v]; they add to 1."""

    water_saturation_frac: Array
    oil_saturation_frac: Array
    gas_saturation_frac: Array


def saturations(
    water_volume_cm3: ArrayLike, oil_volume_cm3: ArrayLike, pore_volume_cm3: ArrayLike
) -> Saturations:
    """Saturations from the volumes of water (as brine) and oil in the pores; the rest is gas.

    Parameters
    ----------
    water_volume_cm3 : array_like
        Volume of the brine [cm3], 0 or more.
    oil_volume_cm3 : array_like
        Volume of the oil [cm3]; by difference, it may come out a little below 0.
    pore_volume_cm3 : array_like
        Pore volume [cm3], above 0.

    Returns
    -------
    Saturations
        Water, oil and gas saturation [v/v], broadcast shape. Gas is a little below 0 where water and oil
        exceed the pore volume: shown, not hidden.

    Raises
    ------
    Impossible
        If a water volume is negative, an oil volume infinite, or a pore volume not above 0.

    Notes
    -----
    S_w = V_w/V_p, S_o = V_o/V_p, S_g = 1 - S_w - S_o.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.3 (from memory).

    Examples
    --------
    >>> found = saturations(4.1451, 9.4259, 14.0)
    >>> round(float(found.water_saturation_frac), 4), round(float(found.gas_saturation_frac), 4)
    (0.2961, 0.0306)
    """
    pore = positive("pore_volume_cm3", pore_volume_cm3)
    water = not_negative("water_volume_cm3", water_volume_cm3) / pore
    oil = finite("oil_volume_cm3", oil_volume_cm3) / pore
    gas = 1.0 - water - oil
    # a missing oil leaves the water saturation as it is
    return Saturations(np.broadcast_to(water, gas.shape), np.broadcast_to(oil, gas.shape), gas)


def retort_bulk_volume_cm3(
    sample_mass_g: ArrayLike, gas_sample_mass_g: ArrayLike, gas_sample_bulk_volume_cm3: ArrayLike
) -> Array:
    """Bulk volume of the retort sample, from the density of the adjacent sample.

    Parameters
    ----------
    sample_mass_g : array_like
        Mass of the retort sample [g], above 0.
    gas_sample_mass_g, gas_sample_bulk_volume_cm3 : array_like
        Mass [g] and bulk volume [cm3] of the adjacent sample, above 0.

    Returns
    -------
    Array
        Bulk volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a mass or a volume is not above 0.

    Notes
    -----
    V_b,B = W_B V_b,A/W_A: both samples have the natural density W_A/V_b,A.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.2 (from memory).

    Examples
    --------
    >>> round(float(retort_bulk_volume_cm3(100.0, 45.0, 19.20)), 4)
    42.6667
    """
    mass = positive("sample_mass_g", sample_mass_g)
    other = positive("gas_sample_bulk_volume_cm3", gas_sample_bulk_volume_cm3)
    return mass * other / positive("gas_sample_mass_g", gas_sample_mass_g)


@dataclass(frozen=True, slots=True)
class SummationOfFluids:
    """Porosity [v/v of bulk] and saturations [v/v of pore volume]."""

    porosity_frac: Array
    water_saturation_frac: Array
    oil_saturation_frac: Array
    gas_saturation_frac: Array


def summation_of_fluids(
    sample_bulk_volume_cm3: ArrayLike,
    water_volume_cm3: ArrayLike,
    oil_volume_cm3: ArrayLike,
    gas_sample_bulk_volume_cm3: ArrayLike,
    gas_volume_cm3: ArrayLike,
) -> SummationOfFluids:
    """Porosity and saturations by retort and injected mercury, from two adjacent samples or one.

    Parameters
    ----------
    sample_bulk_volume_cm3 : array_like
        Bulk volume of the retort sample [cm3], above 0.
    water_volume_cm3, oil_volume_cm3 : array_like
        Water and (corrected) oil from it [cm3], 0 or more.
    gas_sample_bulk_volume_cm3 : array_like
        Bulk volume of the sample into which mercury was injected [cm3], above 0; the same volume again
        where one sample served for both.
    gas_volume_cm3 : array_like
        Gas volume of that sample [cm3], 0 or more.

    Returns
    -------
    SummationOfFluids
        Porosity and saturations [v/v], broadcast shape; NaN saturations where no fluid was found.

    Raises
    ------
    Impossible
        If a bulk volume is not above 0, a fluid volume negative, or the fluids not less than the bulk
        volumes that held them.

    Notes
    -----
    f_w = V_w/V_b,B, f_o = V_o/V_b,B, f_g = V_g/V_b,A; phi = f_w + f_o + f_g, S_i = f_i/phi. A is the
    sample of the gas, B that of the retort.

    References
    ----------
    API RP 40, 2nd ed. 1998, sec. 4.2 (from memory).

    Examples
    --------
    >>> found = summation_of_fluids(42.6667, 4.10, 2.30, 19.20, 0.72)
    >>> round(float(found.porosity_frac), 4), round(float(found.water_saturation_frac), 4)
    (0.1875, 0.5125)
    """
    bulk = positive("sample_bulk_volume_cm3", sample_bulk_volume_cm3)
    gas_bulk = positive("gas_sample_bulk_volume_cm3", gas_sample_bulk_volume_cm3)
    water = not_negative("water_volume_cm3", water_volume_cm3) / bulk
    oil = not_negative("oil_volume_cm3", oil_volume_cm3) / bulk
    gas = not_negative("gas_volume_cm3", gas_volume_cm3) / gas_bulk
    porosity = water + oil + gas
    refuse(
        porosity.real >= 1.0, "sample_bulk_volume_cm3", sample_bulk_volume_cm3, "more than the fluids in it"
    )
    some = np.where(porosity.real > 0.0, porosity, np.nan)
    return SummationOfFluids(porosity, water / some, oil / some, gas / some)


@dataclass(frozen=True, slots=True)
class Mineral:
    """A mineral's grain density [g/cm3]: usual value and the range found."""

    name: str
    grain_density_g_cm3: float
    low_g_cm3: float
    high_g_cm3: float
    source: str


_HANDBOOK = "handbook value, from memory"
_XRAY = "handbook value, from memory; X-ray density from the unit cell agrees"
MINERALS: tuple[Mineral, ...] = (
    Mineral("quartz", 2.65, 2.648, 2.65, _XRAY),
    Mineral("potassium feldspar", 2.56, 2.55, 2.56, _HANDBOOK),
    Mineral("albite", 2.62, 2.62, 2.63, _HANDBOOK),
    Mineral("anorthite", 2.76, 2.76, 2.76, _HANDBOOK),
    Mineral("calcite", 2.71, 2.71, 2.711, _XRAY),
    Mineral("dolomite", 2.87, 2.868, 2.87, _XRAY),
    Mineral("ankerite", 3.0, 2.86, 3.1, _HANDBOOK),
    Mineral("siderite", 3.94, 3.89, 3.94, _XRAY),
    Mineral("anhydrite", 2.96, 2.96, 2.98, _XRAY),
    Mineral("gypsum", 2.32, 2.3, 2.4, _HANDBOOK),
    Mineral("halite", SALT_DENSITY_G_CM3, 2.16, 2.17, _XRAY),
    Mineral("pyrite", 5.01, 4.99, 5.02, _XRAY),
    Mineral("barite", 4.48, 4.4, 4.7, _XRAY),
    Mineral("kaolinite", 2.60, 2.599, 2.60, _XRAY),
    Mineral("illite", 2.75, 2.6, 2.9, _HANDBOOK),
    Mineral("smectite", 2.65, 2.1, 2.7, _HANDBOOK + "; the low end is hydrated"),
    Mineral("chlorite", 2.95, 2.6, 3.3, _HANDBOOK),
    Mineral("glauconite", 2.675, 2.4, 2.95, _HANDBOOK),
    Mineral("muscovite", 2.82, 2.82, 2.82, _HANDBOOK),
    Mineral("biotite", 3.0, 3.0, 3.01, _HANDBOOK),
)
"""Grain densities, not the apparent densities of density logs, which are lower (quartz 2.64, dolomite 2.85).

For a mineral known by its range only, the value is the middle of it.
"""


_SALINITY = Symbol("s", "salinity_g_kg", "g/kg", "salt per kg of solution")
_WATER_MASS = Symbol("W_w", "water_mass_g", "g", "mass of the water")
_WATER = Symbol("V_w", "water_volume_cm3", "cm3", "volume of the water")
_OIL = Symbol("V_o", "oil_volume_cm3", "cm3", "volume of the oil")
_SALT = Symbol("W_s", "salt_mass_g", "g", "mass of the salt")
_WET = Symbol("M_wet", "wet_mass_g", "g", "mass full of brine")
_DRY = Symbol("M_dry", "dry_mass_g", "g", "dry mass")
_RESULTS = (
    Symbol("S_w", "water_saturation_frac", "v/v", "water saturation"),
    Symbol("S_o", "oil_saturation_frac", "v/v", "oil saturation"),
    Symbol("S_g", "gas_saturation_frac", "v/v", "gas saturation"),
)
_RP40_DISTILLATION = "API RP 40, 2nd ed. 1998, sec. 4.3 (from memory)"
_RP40_RETORT = "API RP 40, 2nd ed. 1998, sec. 4.2 (from memory)"
_BLUM = "Blum 1997, ODP Tech. Note 26; IODP Expedition 330 Scientists 2012, Proc. IODP 330, Methods, table T9"

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "salt-mass",
        1,
        "Salt of the water that left",
        "W_s = W_w s/(1 - s)",
        (_WATER_MASS, _SALINITY),
        (_SALT,),
        "salinity below 500 g/kg",
        _RP40_DISTILLATION,
        "worked case",
        salt_mass_g,
    ),
    Formula(
        "pore-fluid-mass",
        1,
        "Mass of the pore fluid, salt left in the dry plug",
        "M_pw = (M_wet - M_dry)/(1 - s)",
        (_WET, _DRY, _SALINITY),
        (Symbol("M_pw", "pore_fluid_mass_g", "g", "mass of the pore fluid"),),
        "a plug dried with all its salt",
        _BLUM,
        "worked case; real raw data",
        pore_fluid_mass_g,
    ),
    Formula(
        "salt-left-mass",
        1,
        "Salt left in the dry plug",
        "M_salt = s (M_wet - M_dry)/(1 - s)",
        (_WET, _DRY, _SALINITY),
        (Symbol("M_salt", "salt_mass_g", "g", "mass of the salt"),),
        "a plug dried with all its salt",
        _BLUM,
        "worked case; real raw data",
        salt_left_mass_g,
    ),
    Formula(
        "liquid-volume",
        1,
        "Volume of a liquid",
        "V = M/rho",
        (
            Symbol("M", "liquid_mass_g", "g", "mass of the liquid"),
            Symbol("rho", "liquid_density_g_cm3", "g/cm3", "density of the liquid"),
        ),
        (Symbol("V", "liquid_volume_cm3", "cm3", "volume of the liquid"),),
        "any",
        "definition",
        "worked cases",
        liquid_volume_cm3,
    ),
    Formula(
        "grain-mass",
        1,
        "Grain mass without salt",
        "W_g = W_d - W_s",
        (Symbol("W_d", "dry_mass_g", "g", "dry mass with salt"), _SALT),
        (Symbol("W_g", "grain_mass_g", "g", "grain mass"),),
        "salt lighter than the plug",
        _RP40_DISTILLATION,
        "worked case; real raw data",
        grain_mass_g,
    ),
    Formula(
        "grain-volume-without-salt",
        1,
        "Grain volume without salt",
        "V_g = V_measured - W_s/rho_s",
        (
            Symbol("V_measured", "grain_volume_cm3", "cm3", "volume of grains and salt"),
            _SALT,
            Symbol("rho_s", "salt_density_g_cm3", "g/cm3", "density of the salt"),
        ),
        (Symbol("V_g", "grain_volume_cm3", "cm3", "grain volume"),),
        "salt smaller than the volume measured",
        _RP40_DISTILLATION + "; " + _BLUM,
        "worked case; real raw data",
        grain_volume_without_salt_cm3,
    ),
    Formula(
        "water-mass",
        1,
        "Mass of the water in the trap",
        "W_w = V_w rho_w",
        (_WATER, Symbol("rho_w", "water_density_g_cm3", "g/cm3", "density of water at the trap")),
        (_WATER_MASS,),
        "any",
        _RP40_DISTILLATION,
        "worked case",
        water_mass_g,
    ),
    Formula(
        "brine-volume",
        1,
        "Volume of the brine",
        "V_b = W_w/((1 - s) rho_b)",
        (_WATER_MASS, _SALINITY, Symbol("rho_b", "brine_density_g_cm3", "g/cm3", "density of the brine")),
        (Symbol("V_b", "brine_volume_cm3", "cm3", "volume of the brine"),),
        "salinity below 500 g/kg",
        _RP40_DISTILLATION,
        "worked case; mass balance by law",
        brine_volume_cm3,
    ),
    Formula(
        "oil-mass",
        1,
        "Mass of the oil by difference",
        "W_o = W_i - W_d - W_w (salt left), W_i - W_d - W_w - W_s (otherwise)",
        (
            Symbol("W_i", "received_mass_g", "g", "mass as received"),
            Symbol("W_d", "dry_mass_g", "g", "dry mass"),
            _WATER_MASS,
            _SALINITY,
            Symbol("", "salt", "", "none, left or leached"),
        ),
        (Symbol("W_o", "oil_mass_g", "g", "mass of the oil"),),
        "no grains lost in cleaning",
        _RP40_DISTILLATION,
        "worked cases with salt left and leached",
        oil_mass_g,
    ),
    Formula(
        "saturations",
        1,
        "Saturations",
        "S_w = V_w/V_p, S_o = V_o/V_p, S_g = 1 - S_w - S_o",
        (_WATER, _OIL, Symbol("V_p", "pore_volume_cm3", "cm3", "pore volume")),
        _RESULTS,
        "any",
        _RP40_DISTILLATION,
        "worked cases; published tutorial inputs",
        saturations,
    ),
    Formula(
        "retort-bulk-volume",
        1,
        "Bulk volume of the retort sample",
        "V_b,B = W_B V_b,A/W_A",
        (
            Symbol("W_B", "sample_mass_g", "g", "mass of the retort sample"),
            Symbol("W_A", "gas_sample_mass_g", "g", "mass of the adjacent sample"),
            Symbol("V_b,A", "gas_sample_bulk_volume_cm3", "cm3", "bulk volume of the adjacent sample"),
        ),
        (Symbol("V_b,B", "sample_bulk_volume_cm3", "cm3", "bulk volume of the retort sample"),),
        "adjacent samples of one density",
        _RP40_RETORT,
        "worked case",
        retort_bulk_volume_cm3,
    ),
    Formula(
        "summation-of-fluids",
        1,
        "Porosity and saturations by summation of fluids",
        "phi = V_w/V_b,B + V_o/V_b,B + V_g/V_b,A, S_i = f_i/phi",
        (
            Symbol("V_b,B", "sample_bulk_volume_cm3", "cm3", "bulk volume of the retort sample"),
            _WATER,
            _OIL,
            Symbol("V_b,A", "gas_sample_bulk_volume_cm3", "cm3", "bulk volume of the gas sample"),
            Symbol("V_g", "gas_volume_cm3", "cm3", "gas volume"),
        ),
        (Symbol("phi", "porosity_frac", "v/v", "porosity"), *_RESULTS),
        "adjacent samples of one rock",
        _RP40_RETORT,
        "worked case; published inputs; an example that does not close",
        summation_of_fluids,
    ),
)
