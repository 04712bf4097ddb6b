"""How unevenly permeability is spread: coefficient of variation, Dykstra-Parsons, Lorenz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from corelab.errors import Impossible
from corelab.science.averages import resamples
from corelab.science.formula import Array, Formula, Symbol, not_negative, positive, refuse

CONVENTIONS = {
    "regression": "line through ln k against the normal score of i/(n+1), read at 50 and 84.13 %",
    "regression, middle positions": "the same with (i-0.5)/n",
    "regression, weighted middle": "the same line, points weighted by the certainty of their quantile",
    "log-normal": "1 - exp(-s), s the standard deviation of ln k with n-1",
    "interpolation": "between the points of the share strictly greater, ties on one row, at 50 and 84.1 %",
}
"""The published ways to read the Dykstra-Parsons coefficient off the same values."""


def dykstra_parsons(permeability_md: ArrayLike, convention: str = "regression") -> float:
    """(k50 - k84.1)/k50 by one of the conventions.

    Parameters
    ----------
    permeability_md
        Permeabilities (n,) [md], above zero; three or more, NaN left out.
    convention
        One of `CONVENTIONS`.

    Raises
    ------
    Impossible
        If a permeability is not above zero, fewer than three are there, or the convention is not known.

    References
    ----------
    Dykstra & Parsons 1950, The prediction of oil recovery by waterflood; Tiab & Donaldson 2004, Petrophysics,
    2nd ed., p. 191 (definition), p. 199 (table of the share strictly greater).
    """
    if convention not in CONVENTIONS:
        raise Impossible(f"convention: found {convention!r}; wanted one of {', '.join(CONVENTIONS)}")
    from scipy import stats

    k = np.asarray(permeability_md, dtype=np.float64)
    k = np.sort(positive("permeability_md", k[~np.isnan(k)]))[::-1]
    n = k.size
    refuse(n < 3, "permeability_md", float(n), "three permeabilities or more")
    logs = np.log(k)
    if convention == "log-normal":
        return float(1.0 - np.exp(-logs.std(ddof=1)))
    if convention == "interpolation":
        value, first = np.unique(-k, return_index=True)
        share, log_value = first / n, np.log(-value)
        if share[-1] < 0.841:
            return float("nan")
        low = np.interp([0.5, 0.841], share, log_value)
        return float(1.0 - np.exp(low[1] - low[0]))
    order = np.arange(1, n + 1)
    share = (order - 0.5) / n if convention == "regression, middle positions" else order / (n + 1)
    z = stats.norm.ppf(share)
    weight = np.ones(n)
    if convention == "regression, weighted middle":
        weight = stats.norm.pdf(z) ** 2 / (share * (1 - share))
    centre = np.average(z, weights=weight)
    slope = np.sum(weight * (z - centre) * logs) / np.sum(weight * (z - centre) ** 2)
    return float(1.0 - np.exp(slope))


def dykstra_parsons_interval(
    permeability_md: ArrayLike, count: int, seed: int, confidence: float = 0.95
) -> tuple[float, float]:
    """Interval of the coefficient by regression, from drawing the permeabilities anew.

    References
    ----------
    Efron & Tibshirani 1993, An Introduction to the Bootstrap, ch. 13 (percentile interval; from memory).
    """
    from scipy import stats

    logs = np.log(np.sort(positive("permeability_md", permeability_md)))
    n = logs.size
    refuse(n < 3, "permeability_md", float(n), "three permeabilities or more")
    z = stats.norm.ppf(np.arange(1, n + 1) / (n + 1))
    spread = np.concatenate([logs[rows] @ z for rows in resamples(n, count, seed)]) / np.sum(z * z)
    tail = (1.0 - confidence) / 2.0
    low, high = np.quantile(1.0 - np.exp(-spread), [tail, 1.0 - tail])
    return float(low), float(high)


@dataclass(frozen=True, slots=True)
class LorenzCurve:
    """Cumulative shares of flow capacity and storage capacity (n+1,), from 0 to 1, and the coefficient."""

    coefficient: Array
    flow: Array
    storage: Array


def lorenz(permeability_md: ArrayLike, porosity_frac: ArrayLike, length_m: ArrayLike) -> LorenzCurve:
    r"""Lorenz coefficient and curve of layers sorted by permeability over porosity.

    Parameters
    ----------
    permeability_md
        Permeabilities (n,) [md], not below zero, one of them above.
    porosity_frac
        Porosities (n,) [v/v], above zero.
    length_m
        Lengths (n,) [m] that the values stand for, above zero; equal numbers weigh by count.

    Returns
    -------
    LorenzCurve
        NaN where anything is missing.

    Raises
    ------
    Impossible
        If a value is infinite or impossible, or no layer flows.

    Notes
    -----
    F_j = sum_1^j k h / sum k h, S_j = sum_1^j phi h / sum phi h, L = 2 (area under F over S - 1/2) by
    trapezoids. Uniform rock has 0 (a printed statement that it has 1 is wrong by the definition beside it);
    one of n equal layers carrying all flow gives 1 - 1/n.

    References
    ----------
    Schmalz & Rahme 1950, The variation of waterflood performance with variation in permeability profile,
    Producers Monthly 15 (from memory). Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 191.

    Examples
    --------
    >>> round(float(lorenz([100.0, 10.0, 1.0], [0.2, 0.2, 0.2], [1.0, 1.0, 1.0]).coefficient), 4)
    0.5946
    """
    return _lorenz(permeability_md, porosity_frac, length_m, "k over phi")


def lorenz_by_permeability(
    permeability_md: ArrayLike, porosity_frac: ArrayLike, length_m: ArrayLike
) -> LorenzCurve:
    """The same, the layers sorted by permeability alone."""
    return _lorenz(permeability_md, porosity_frac, length_m, "k")


def stratigraphic_lorenz(
    permeability_md: ArrayLike, porosity_frac: ArrayLike, length_m: ArrayLike
) -> LorenzCurve:
    """The same sums in the order given, that of depth: steep where flow is fast, flat where it is baffled.

    References
    ----------
    Gunter et al. 1997, Early determination of reservoir flow units, SPE 38679 (from memory).
    """
    return _lorenz(permeability_md, porosity_frac, length_m, "")


def _lorenz(
    permeability_md: ArrayLike, porosity_frac: ArrayLike, length_m: ArrayLike, by: str
) -> LorenzCurve:
    k = not_negative("permeability_md", permeability_md)
    phi = positive("porosity_frac", porosity_frac)
    h = positive("length_m", length_m)
    k, phi, h = np.broadcast_arrays(k, phi, h)
    kh, ph = k * h, phi * h
    refuse(np.asarray(kh.sum().real <= 0.0), "permeability_md", 0.0, "one layer that flows")
    if by:
        key = k.real / phi.real if by == "k over phi" else k.real
        order = np.argsort(-key, kind="stable")
        kh, ph = kh[order], ph[order]
    flow = np.concatenate([[0.0], np.cumsum(kh)]) / kh.sum()
    storage = np.concatenate([[0.0], np.cumsum(ph)]) / ph.sum()
    area = np.sum((flow[1:] + flow[:-1]) / 2.0 * (storage[1:] - storage[:-1]))
    return LorenzCurve(np.asarray(2.0 * area - 1.0), flow, storage)


def variation_class(coefficient_of_variation: float) -> str:
    """Words for a coefficient of variation; its bounds 0.5 and 1 belong to the class below (our choice).

    References
    ----------
    Corbett & Jensen 1992, Estimating the mean permeability: how many measurements do you need?, First Break
    10:89-94 (from memory).
    """
    if coefficient_of_variation != coefficient_of_variation:
        return ""
    if coefficient_of_variation <= 0.5:
        return "homogeneous"
    return "heterogeneous" if coefficient_of_variation <= 1.0 else "very heterogeneous"


def samples_needed(coefficient_of_variation: float) -> float:
    """How many samples give the arithmetic mean to 20 % at 95 %: (10 Cv)^2.

    References
    ----------
    Corbett & Jensen 1992, First Break 10:89-94 (from memory); exactly (9.8 Cv)^2.
    """
    return (10.0 * coefficient_of_variation) ** 2


def tolerance_percent(coefficient_of_variation: float, samples: float) -> float:
    """By how much the arithmetic mean of so many samples may be off at 95 % [%]: 200 Cv/sqrt(n).

    References
    ----------
    Corbett & Jensen 1992, First Break 10:89-94 (from memory).
    """
    return 200.0 * coefficient_of_variation / float(np.sqrt(samples))


def dykstra_parsons_regression(permeability_md: ArrayLike) -> Array:
    r"""Dykstra-Parsons coefficient by a line through all permeabilities.

    Parameters
    ----------
    permeability_md
        Permeabilities (n,) [md], above zero; three or more, NaN left out.

    Returns
    -------
    array
        V (), from 0 (uniform) towards 1.

    Raises
    ------
    Impossible
        If a permeability is not above zero or infinite, or fewer than three are there.

    Notes
    -----
    V = (k50 - k84.13)/k50 on the line of ln k against the normal score of i/(n+1), falling; 84.13 % lies one
    standard deviation from the middle, where 84.1 % would change the fourth digit. `CONVENTIONS` has the
    other published readings, which differ in the second digit: a V without its convention says little.

    References
    ----------
    Dykstra & Parsons 1950, The prediction of oil recovery by waterflood; Tiab & Donaldson 2004, Petrophysics,
    2nd ed., p. 191.

    Examples
    --------
    >>> round(float(dykstra_parsons_regression([100.0, 50.0, 20.0, 10.0, 5.0])), 4)
    0.7984
    """
    return np.asarray(dykstra_parsons(permeability_md, "regression"))


FORMULAS: tuple[Formula, ...] = (
    Formula(
        "dykstra-parsons",
        1,
        "Dykstra-Parsons coefficient",
        "V = (k50 - k84.13)/k50 on a line of ln k against the normal score of i/(n+1)",
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        (Symbol("V", "coefficient", "", "Dykstra-Parsons coefficient"),),
        "permeabilities above zero, nearly log-normal",
        "Dykstra & Parsons 1950; Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 191",
        "one data set by five conventions; log-normal law",
        dykstra_parsons_regression,
        elementwise=False,
        smooth=False,
    ),
    Formula(
        "lorenz",
        1,
        "Lorenz coefficient",
        "L = 2 (area under F over S - 1/2); F, S cumulative shares of k h and phi h, sorted by k/phi",
        (
            Symbol("k", "permeability_md", "mD", "permeability"),
            Symbol("phi", "porosity_frac", "v/v", "porosity"),
            Symbol("h", "length_m", "m", "length that a value stands for"),
        ),
        (
            Symbol("L", "coefficient", "", "Lorenz coefficient"),
            Symbol("F", "flow", "", "cumulative share of flow capacity"),
            Symbol("S", "storage", "", "cumulative share of storage capacity"),
        ),
        "values of one interval",
        "Schmalz & Rahme 1950, Producers Monthly 15 (from memory); Tiab & Donaldson 2004, p. 191",
        "published table; limits",
        lorenz,
        elementwise=False,
        smooth=False,
    ),
)
