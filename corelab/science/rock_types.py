"""Rock types from porosity and permeability: flow zones, pore-throat radii, rock fabric.

Permeability is in mD, porosity a fraction, throat radii and the flow-zone quantities in um. The published
throat radii take *percent* porosity and gas permeability without slip correction; the conversion is made
here.
"""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.errors import Usage
from corelab.science.formula import Array, Formula, Symbol, positive, refuse

RQI_CONSTANT = 0.0314
"""sqrt(1 mD) in um as published; unrounded it is 0.0314153 (0.05 % more)."""


def _porosity(porosity_frac: ArrayLike) -> Array:
    phi = positive("porosity_frac", porosity_frac)
    refuse(phi.real >= 1.0, "porosity_frac", phi, "a fraction above 0 and below 1")
    return phi


def reservoir_quality_index_um(permeability_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Reservoir quality index: a mean hydraulic radius from permeability and porosity.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Index [um], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    RQI = 0.0314 sqrt(k/phi), k permeability, phi porosity.

    References
    ----------
    Amaefule, J. O., Altunbay, M., Tiab, D., Kersey, D. G. & Keelan, D. K. 1993, SPE 26436 (from memory).

    Examples
    --------
    >>> round(float(reservoir_quality_index_um(100.0, 0.20)), 6)
    0.702125
    """
    k = positive("permeability_md", permeability_md)
    return RQI_CONSTANT * np.sqrt(k / _porosity(porosity_frac))


def pore_to_grain_ratio(porosity_frac: ArrayLike) -> Array:
    """Pore volume over grain volume, the normalised porosity index of flow-zone work.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Ratio [1], shape of the input.

    Raises
    ------
    Impossible
        If a porosity is not above 0 or not below 1.

    Notes
    -----
    phi_z = phi/(1 - phi), phi porosity.

    References
    ----------
    Amaefule et al. 1993, SPE 26436 (from memory).

    Examples
    --------
    >>> float(pore_to_grain_ratio(0.20))
    0.25
    """
    phi = _porosity(porosity_frac)
    return phi / (1.0 - phi)


def flow_zone_indicator_um(permeability_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Flow zone indicator: plugs of one pore geometry share it whatever their porosity.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Indicator [um], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    FZI = RQI/phi_z, RQI reservoir quality index, phi_z pore volume over grain volume.

    References
    ----------
    Amaefule et al. 1993, SPE 26436 (from memory).

    Examples
    --------
    >>> round(float(flow_zone_indicator_um(100.0, 0.20)), 6)
    2.808501
    """
    return reservoir_quality_index_um(permeability_md, porosity_frac) / pore_to_grain_ratio(porosity_frac)


def permeability_of_flow_zone_md(flow_zone_indicator_um: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Permeability of a flow zone at a porosity.

    Parameters
    ----------
    flow_zone_indicator_um : array_like
        Flow zone indicator [um], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If an indicator or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    k = FZI^2 phi^3/(0.0314^2 (1 - phi)^2), FZI flow zone indicator, phi porosity; 1/0.0314^2 is printed as
    1014.24.

    References
    ----------
    Amaefule et al. 1993, SPE 26436 (from memory).

    Examples
    --------
    >>> round(float(permeability_of_flow_zone_md(2.808501, 0.20)), 3)
    100.0
    """
    indicator = positive("flow_zone_indicator_um", flow_zone_indicator_um)
    phi = _porosity(porosity_frac)
    return (indicator / RQI_CONSTANT) ** 2 * phi**3 / (1.0 - phi) ** 2


def winland_r35_um(gas_permeability_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Pore-throat radius at 35 % mercury saturation, after Winland.

    Parameters
    ----------
    gas_permeability_md : array_like
        Permeability to air without slip correction [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Radius [um], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    lg r35 = 0.732 + 0.588 lg k - 0.864 lg(100 phi), k permeability, phi porosity (the equation takes
    percent).

    References
    ----------
    Kolodzie, S. 1980, SPE 9382, who prints Winland's equation (coefficients at second hand, several alike).

    Examples
    --------
    >>> round(float(winland_r35_um(100.0, 0.20)), 5)
    6.08009
    """
    k = positive("gas_permeability_md", gas_permeability_md)
    return np.asarray(10.0**0.732 * k**0.588 / (100.0 * _porosity(porosity_frac)) ** 0.864)


PITTMAN = MappingProxyType(
    {
        10: (0.459, 0.500, 0.385),
        15: (0.333, 0.509, 0.344),
        20: (0.218, 0.519, 0.303),
        25: (0.204, 0.531, 0.350),
        30: (0.215, 0.547, 0.420),
        35: (0.255, 0.565, 0.523),
        40: (0.360, 0.582, 0.680),
        45: (0.609, 0.608, 0.974),
        50: (0.778, 0.626, 1.205),
        55: (0.948, 0.632, 1.426),
        60: (1.096, 0.648, 1.666),
        65: (1.372, 0.643, 1.979),
        70: (1.664, 0.627, 2.314),
        75: (1.880, 0.609, 2.626),
    }
)
"""Percentile of mercury saturation to a, b, c of lg r = a + b lg k - c lg phi(%), Pittman 1992."""


@dataclass(frozen=True, slots=True)
class PittmanRadii:
    """Throat radii [um] at the percentiles of mercury saturation that Pittman gives."""

    r10_um: Array
    r15_um: Array
    r20_um: Array
    r25_um: Array
    r30_um: Array
    r35_um: Array
    r40_um: Array
    r45_um: Array
    r50_um: Array
    r55_um: Array
    r60_um: Array
    r65_um: Array
    r70_um: Array
    r75_um: Array

    def at(self, percentile: int) -> Array:
        """The radii of one percentile.

        >>> round(float(pittman_radii_um(100.0, 0.20).at(25)), 3)
        6.466
        """
        if percentile not in PITTMAN:
            raise Usage(f"Pittman gives radii at {', '.join(map(str, PITTMAN))} %; found {percentile}.")
        found: Array = getattr(self, f"r{percentile}_um")
        return found

    @property
    def rising(self) -> NDArray[np.bool_]:
        """Where a radius exceeds that of the percentile before by more than 1 %: they do not hold there."""
        radii = np.stack(np.broadcast_arrays(*(np.real(self.at(p)) for p in PITTMAN)))
        return np.asarray(np.any(radii[1:] > 1.01 * radii[:-1], axis=0))


def pittman_radii_um(gas_permeability_md: ArrayLike, porosity_frac: ArrayLike) -> PittmanRadii:
    """Pore-throat radii at 10 to 75 % mercury saturation, after Pittman.

    Parameters
    ----------
    gas_permeability_md : array_like
        Permeability to air without slip correction [md], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.

    Returns
    -------
    PittmanRadii
        Radii [um], broadcast shape. They should fall as the percentile rises; in tight rock of low porosity
        the equations let them rise, and `rising` says where.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    lg r = a + b lg k - c lg(100 phi), k permeability, phi porosity (the equations take percent); a, b, c are
    regressions for each percentile.

    References
    ----------
    Pittman, E. D. 1992, AAPG Bull. 76:191-198 (coefficients from memory, equal to one at second hand).

    Examples
    --------
    >>> round(float(pittman_radii_um(100.0, 0.20).r50_um), 3)
    2.899
    """
    k = positive("gas_permeability_md", gas_permeability_md)
    percent = 100.0 * _porosity(porosity_frac)
    return PittmanRadii(*(10.0**a * k**b / percent**c for a, b, c in PITTMAN.values()))


THROAT_CLASSES = MappingProxyType({"nano": 0.0, "micro": 0.1, "meso": 0.5, "macro": 2.0, "mega": 10.0})
"""Port classes by the least radius [um], which belongs to the class. Other limits are in use (micro from 0.2,
macro from 2.5); these are common practice."""


def throat_class(radius_um: ArrayLike) -> NDArray[np.str_]:
    """The word for a throat radius; a missing one has no word.

    >>> throat_class([6.08, 0.74, np.nan]).tolist()
    ['macro', 'meso', '']
    """
    return _classed(positive("radius_um", radius_um), tuple(THROAT_CLASSES.values()), tuple(THROAT_CLASSES))


def _classed(values: Array, lower: tuple[float, ...], words: tuple[str, ...]) -> NDArray[np.str_]:
    place = np.searchsorted(lower, values, side="right") - 1
    return np.array([*words, ""])[np.where(np.isnan(values), len(words), place)]


LUCIA = (9.7982, 12.0838, 8.6711, 8.2965)
"""Coefficients of the global transform, Jennings & Lucia 2003. A handbook's natural-log form prints a
constant of 27.56 that should read 22.56 (9.7982 ln 10)."""
_LUCIA_POLE_FRAC = 10.0 ** (-LUCIA[1] / LUCIA[3])


def lucia_permeability_md(rock_fabric_number: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Permeability of a carbonate from its rock fabric and interparticle porosity.

    Parameters
    ----------
    rock_fabric_number : array_like
        Rock fabric number [1], above 0; 0.5 to 4 published.
    porosity_frac : array_like
        Interparticle porosity [v/v], above 0, below 1: without separate vugs.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a number or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    lg k = 9.7982 - 12.0838 lg n + (8.6711 - 8.2965 lg n) lg phi, n rock fabric number, phi porosity.

    References
    ----------
    Jennings, J. W. & Lucia, F. J. 2003, SPE Reserv. Eval. Eng. 6:215-223 (coefficients at second
    hand).

    Examples
    --------
    >>> round(float(lucia_permeability_md(2.0, 0.20)), 3)
    70.057
    """
    a, b, c, d = LUCIA
    number = np.log10(positive("rock_fabric_number", rock_fabric_number))
    phi = np.log10(_porosity(porosity_frac))
    return np.asarray(10.0 ** (a - b * number + (c - d * number) * phi))


def rock_fabric_number(permeability_md: ArrayLike, porosity_frac: ArrayLike) -> Array:
    """Rock fabric number of a carbonate from permeability and interparticle porosity.

    Parameters
    ----------
    permeability_md : array_like
        Permeability [md], above 0.
    porosity_frac : array_like
        Interparticle porosity [v/v], above 0, below 1.

    Returns
    -------
    Array
        Number [1], broadcast shape. NaN at 0.035 v/v and below, where the transform's lines have crossed and
        it has no inverse.

    Raises
    ------
    Impossible
        If a permeability or a porosity is not above 0, or a porosity not below 1.

    Notes
    -----
    lg n = (9.7982 + 8.6711 lg phi - lg k)/(12.0838 + 8.2965 lg phi), k permeability, phi porosity.

    References
    ----------
    Jennings, J. W. & Lucia, F. J. 2003, SPE Reserv. Eval. Eng. 6:215-223 (coefficients at second
    hand).

    Examples
    --------
    >>> round(float(rock_fabric_number(70.05664, 0.20)), 4)
    2.0
    """
    a, b, c, d = LUCIA
    k = np.log10(positive("permeability_md", permeability_md))
    phi = _porosity(porosity_frac)
    has_one = phi.real > _LUCIA_POLE_FRAC
    lg = np.log10(np.where(has_one, phi, np.nan))
    with np.errstate(over="ignore"):
        return np.asarray(10.0 ** ((a + c * lg - k) / (b + d * lg)))


def lucia_class(rock_fabric: ArrayLike) -> NDArray[np.str_]:
    """Petrophysical class of a rock fabric number: '1' from 0.5, '2' from 1.5, '3' from 2.5 to 4.

    A number outside, or a missing one, has no class. Limits: Lucia 1995, AAPG Bull. 79:1275-1300 (from
    memory).

    >>> lucia_class([1.0, 1.5, 3.25, 5.0]).tolist()
    ['1', '2', '3', '']
    """
    given = positive("rock_fabric", rock_fabric)
    found = _classed(given, (-np.inf, 0.5, 1.5, 2.5), ("", "1", "2", "3"))
    return np.where(given > 4.0, "", found)


# -- flow units -------------------------------------------------------------------------------------------

MOST_UNITS = 8
LEAST_SPREAD_DECADES = 0.02
"""Spread below which units are not told apart: about what measurement adds to lg FZI (common practice)."""
CRITERION = (
    "the number of normal parts of equal spread in lg FZI that has the least Bayesian information criterion "
    "(Schwarz 1978)"
)


@dataclass(frozen=True, slots=True)
class FlowUnits:
    """Units of plugs by flow zone indicator, 1 the poorest.

    `unit` (n,) is 0 where the indicator is missing; `indicator_um` (m,) is each unit's geometric mean;
    `criterion` holds the information criterion of 1, 2, … units.
    """

    unit: NDArray[np.int64]
    indicator_um: Array
    spread_decades: float
    criterion: Array


def flow_units(flow_zone_indicator_um: ArrayLike) -> FlowUnits:
    """Plugs in as many flow units as their indicators tell apart.

    Parameters
    ----------
    flow_zone_indicator_um : array_like
        Flow zone indicators [um], shape (n,), above 0. Missing ones belong to no unit.

    Returns
    -------
    FlowUnits
        Unit of each plug, mean indicators, common spread, and the criterion.

    Raises
    ------
    Impossible
        If an indicator is not above 0.

    Notes
    -----
    lg FZI is taken as a mixture of m normal parts of one spread, fitted by expectation and maximisation from
    two starts; m, at most 8, is that of the least BIC = -2 ln L + 2 m ln n. A plug belongs to the likeliest
    part. One normal population stays one unit, which splitting by least squares would not give.

    References
    ----------
    Schwarz, G. 1978, "Estimating the dimension of a model", Ann. Stat. 6:461-464 (from memory).

    Examples
    --------
    >>> flow_units([0.50, 0.51, 0.49, 0.5, 0.52, 5.0, 5.1, 4.9, 5.2, 5.0]).unit.tolist()
    [1, 1, 1, 1, 1, 2, 2, 2, 2, 2]
    """
    given = positive("flow_zone_indicator_um", flow_zone_indicator_um).real.ravel()
    known = ~np.isnan(given)
    lg = np.log10(given[known])
    unit = np.zeros(given.size, dtype=np.int64)
    if not lg.size:
        return FlowUnits(unit, np.empty(0), float("nan"), np.empty(0))
    tried = [_mixture(lg, m) for m in range(1, min(MOST_UNITS, np.unique(lg).size) + 1)]
    criterion = np.array([bic for bic, *_ in tried])
    _, centres, spread, likeliest = tried[int(np.argmin(criterion))]
    order = np.argsort(centres)
    rank = np.empty_like(order)
    rank[order] = np.arange(order.size)
    placed = rank[likeliest]
    used, placed = np.unique(placed, return_inverse=True)
    unit[known] = placed + 1
    means = np.array([10.0 ** lg[placed == i].mean() for i in range(used.size)])
    return FlowUnits(unit, means, spread, criterion)


def _mixture(lg: Array, parts: int) -> tuple[float, Array, float, NDArray[np.intp]]:
    """Information criterion, centres, spread and the likeliest part of each value, of the better start."""
    share = (np.arange(parts) + 0.5) / parts
    starts = (np.quantile(lg, share), lg.min() + share * np.ptp(lg))
    return min((_maximised(lg, start) for start in starts), key=lambda found: found[0])


def _maximised(lg: Array, centres: Array) -> tuple[float, Array, float, NDArray[np.intp]]:
    n, parts = lg.size, centres.size
    spread = max(float(np.std(lg)) / parts, LEAST_SPREAD_DECADES)
    weights = np.full(parts, 1.0 / parts)
    before = -np.inf
    for _ in range(1000):
        with np.errstate(divide="ignore"):
            log_density = (
                np.log(weights)
                - 0.5 * ((lg[:, np.newaxis] - centres) / spread) ** 2
                - np.log(spread * np.sqrt(2.0 * np.pi))
            )
        top = log_density.max(axis=1, keepdims=True)
        density = np.exp(log_density - top)
        total = density.sum(axis=1, keepdims=True)
        likelihood = float(np.sum(np.log(total) + top))
        responsible = density / total
        counts = np.maximum(responsible.sum(axis=0), 1e-12)
        if likelihood - before < 1e-9 * n:
            break
        before = likelihood
        weights = counts / n
        centres = responsible.T @ lg / counts
        variance = float(np.sum(responsible * (lg[:, np.newaxis] - centres) ** 2) / n)
        spread = max(variance**0.5, LEAST_SPREAD_DECADES)
    bic = -2.0 * likelihood + 2.0 * parts * float(np.log(n))
    return bic, centres, spread, np.argmax(responsible, axis=1)


_K = Symbol("k", "permeability_md", "mD", "permeability")
_AIR = Symbol("k", "gas_permeability_md", "mD", "permeability to air, not corrected for slip")
_PHI = Symbol("phi", "porosity_frac", "v/v", "porosity")
_FZI = Symbol("FZI", "flow_zone_indicator_um", "um", "flow zone indicator")
_AMAEFULE = "Amaefule et al. 1993, SPE 26436 (from memory; constants found in two texts)"

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "reservoir-quality-index",
        1,
        "Reservoir quality index",
        "RQI = 0.0314 sqrt(k/phi)",
        (_K, _PHI),
        (Symbol("RQI", "reservoir_quality_index_um", "um", "reservoir quality index"),),
        "any; the constant as published, 0.05 % below sqrt(1 mD) in um",
        _AMAEFULE,
        "worked value at 100 mD, 0.20",
        reservoir_quality_index_um,
    ),
    Formula(
        "pore-to-grain-ratio",
        1,
        "Pore volume over grain volume",
        "phi_z = phi/(1 - phi)",
        (_PHI,),
        (Symbol("phi_z", "pore_to_grain_ratio", "1", "pore volume over grain volume"),),
        "any",
        _AMAEFULE,
        "worked value at 0.20",
        pore_to_grain_ratio,
    ),
    Formula(
        "flow-zone-indicator",
        1,
        "Flow zone indicator",
        "FZI = 0.0314 sqrt(k/phi) (1 - phi)/phi",
        (_K, _PHI),
        (_FZI,),
        "any",
        _AMAEFULE,
        "worked value at 100 mD, 0.20; median of the plugs of a Norwegian well",
        flow_zone_indicator_um,
    ),
    Formula(
        "flow-zone-permeability",
        1,
        "Permeability of a flow zone",
        "k = FZI^2 phi^3/(0.0314^2 (1 - phi)^2)",
        (_FZI, _PHI),
        (_K,),
        "any",
        _AMAEFULE,
        "inverse of the indicator; printed constant 1014.24",
        permeability_of_flow_zone_md,
    ),
    Formula(
        "flow-units",
        1,
        "Flow units by flow zone indicator",
        "lg FZI = mixture of m normal parts of one spread; m of the least -2 ln L + 2 m ln n",
        (_FZI,),
        (
            Symbol("u", "unit", "1", "unit of each plug, 1 the poorest, 0 where missing"),
            Symbol("FZI_u", "indicator_um", "um", "geometric mean of each unit"),
            Symbol("s", "spread_decades", "decades", "common spread of lg FZI"),
            Symbol("BIC", "criterion", "1", "information criterion of 1, 2, … units"),
        ),
        "ten plugs or more; units nearer than two spreads are not told apart",
        "Schwarz 1978, Ann. Stat. 6:461-464 (from memory)",
        "simulated units; one normal population stays one",
        flow_units,
        elementwise=False,
        smooth=False,
    ),
    Formula(
        "winland-r35",
        1,
        "Throat radius at 35 % mercury, Winland",
        "lg r35 = 0.732 + 0.588 lg k - 0.864 lg(100 phi)",
        (_AIR, _PHI),
        (Symbol("r35", "r35_um", "um", "throat radius at 35 % mercury saturation"),),
        "sandstones and carbonates; permeability to air",
        "Kolodzie 1980, SPE 9382 (coefficients at second hand, several agreeing)",
        "four worked values; median of the plugs of a Norwegian well",
        winland_r35_um,
    ),
    Formula(
        "pittman-radii",
        1,
        "Throat radii at 10 to 75 % mercury, Pittman",
        "lg r = a + b lg k - c lg(100 phi), a, b, c by percentile",
        (_AIR, _PHI),
        tuple(Symbol(f"r{p}", f"r{p}_um", "um", f"throat radius at {p} % mercury") for p in PITTMAN),
        "sandstones; radii that rise with the percentile lie outside the regressions",
        "Pittman 1992, AAPG Bull. 76:191-198 (coefficients from memory, equal to one at second hand)",
        "all percentiles at 100 mD, 0.20",
        pittman_radii_um,
    ),
    Formula(
        "lucia-permeability",
        1,
        "Permeability of a carbonate from its rock fabric, Jennings & Lucia",
        "lg k = 9.7982 - 12.0838 lg n + (8.6711 - 8.2965 lg n) lg phi",
        (Symbol("n", "rock_fabric_number", "1", "rock fabric number", 0.5, 4.0), _PHI),
        (_K,),
        "non-vuggy carbonates, interparticle porosity",
        "Jennings & Lucia 2003, SPE Reserv. Eval. Eng. 6:215-223 (coefficients at second hand)",
        "five worked values",
        lucia_permeability_md,
    ),
    Formula(
        "rock-fabric-number",
        1,
        "Rock fabric number of a carbonate, Jennings & Lucia",
        "lg n = (9.7982 + 8.6711 lg phi - lg k)/(12.0838 + 8.2965 lg phi)",
        (_K, _PHI),
        (Symbol("n", "rock_fabric_number", "1", "rock fabric number"),),
        "non-vuggy carbonates, interparticle porosity above 0.035",
        "Jennings & Lucia 2003, SPE Reserv. Eval. Eng. 6:215-223 (coefficients at second hand)",
        "inverse of five worked values",
        rock_fabric_number,
    ),
)
