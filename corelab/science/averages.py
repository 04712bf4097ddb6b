"""Averages of permeability and porosity over an interval, and what to do with values below detection.

Weights are thicknesses, spacings or plain counts: the caller says which. Values come in columns (n,).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.science.formula import Array, Formula, Symbol, finite, positive


def power_mean(values: ArrayLike, weights: ArrayLike, exponent: float) -> Array:
    r"""The mean of a power, from harmonic (-1) over geometric (0) to arithmetic (1).

    Parameters
    ----------
    values
        Values (n,) above zero [any unit].
    weights
        Weights (n,) above zero: thickness, spacing or count.
    exponent
        p, one number: -1 for layers crossed in series, 0 for a random field, 1 for layers in parallel.

    Returns
    -------
    array
        The mean (), in the unit of the values. NaN where a value or weight is missing.

    Raises
    ------
    Impossible
        If a value or weight is not above zero, or anything is infinite.

    Notes
    -----
    (sum w x^p / sum w)^(1/p); exp(sum w ln x / sum w) for p = 0, its limit. Rising in p.

    References
    ----------
    Journel, Deutsch & Desbarats 1986, Power averaging for block effective permeability, SPE 15128 (from
    memory). Ahmed, Reservoir Engineering Handbook, pp. 237-240 (the three special cases; from memory).

    Examples
    --------
    >>> [round(float(power_mean([10.0, 50.0, 1000.0], [20.0, 15.0, 10.0], p)), 3) for p in (1, -1, 0)]
    [243.333, 19.481, 47.581]
    """
    x, w = positive("values", values), positive("weights", weights)
    p = float(finite("exponent", exponent))
    total = w.sum()
    logs = np.log(x)
    middle = np.sum(w * logs) / total  # powers of what is near one neither overflow nor vanish
    if p == 0.0:
        return np.asarray(np.exp(middle))
    return np.asarray(np.exp(middle + np.log(np.sum(w * np.exp(p * (logs - middle))) / total) / p))


@dataclass(frozen=True, slots=True)
class Means:
    """The three means, each () in the unit of the values."""

    arithmetic: Array
    geometric: Array
    harmonic: Array


def means(values: ArrayLike, weights: ArrayLike) -> Means:
    r"""Arithmetic, geometric and harmonic mean.

    Parameters
    ----------
    values
        Values (n,) above zero [any unit].
    weights
        Weights (n,) above zero: thickness, spacing or count.

    Returns
    -------
    Means
        NaN where a value or weight is missing. Never arithmetic below geometric below harmonic.

    Raises
    ------
    Impossible
        If a value or weight is not above zero, or anything is infinite.

    Notes
    -----
    sum w x/sum w, exp(sum w ln x/sum w), sum w/sum (w/x): of permeability those of layers along the flow, of
    a random field, and of layers across the flow.

    References
    ----------
    Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 196-197; Ahmed, Reservoir Engineering Handbook, pp.
    237-240 (from memory).

    Examples
    --------
    >>> found = means([10.0, 50.0, 1000.0], [20.0, 15.0, 10.0])
    >>> round(float(found.arithmetic), 3), round(float(found.geometric), 3), round(float(found.harmonic), 3)
    (243.333, 47.581, 19.481)
    """
    return Means(*(power_mean(values, weights, p) for p in (1.0, 0.0, -1.0)))


def weighted_mean(values: ArrayLike, weights: ArrayLike) -> float:
    """Arithmetic mean; values of any sign. NaN for no values."""
    x, w = np.asarray(values, dtype=np.float64), np.asarray(weights, dtype=np.float64)
    total = w.sum()
    return float(np.sum(w * x) / total) if total > 0 else float("nan")


@dataclass(frozen=True, slots=True)
class Censored:
    """Values with those below detection filled in.

    `values` (n,) in the order given; `below` marks those filled in; `method` says how.
    """

    values: Array
    below: NDArray[np.bool_]
    method: str


def filled_below_detection(values: ArrayLike, below: ArrayLike) -> Censored:
    """Fill in values known only to lie below a limit, so that means and spread can be had.

    Parameters
    ----------
    values
        Values (n,) above zero; of those below detection, the limit.
    below
        Which are below (n,).

    Returns
    -------
    Censored
        The logarithms of the values above detection are fitted against normal scores of their plotting
        positions, and those below take the line's values: regression on order statistics. Fewer than three
        values above detection, or more than 80 % below: they stay at their limits, and `method` says so.

    Notes
    -----
    Plotting positions for several limits: p_j = p_(j+1) + (A_j/(A_j + B_j)) (1 - p_(j+1)) is the share
    above limit j, with A_j values from limit j up to the next and B_j values, detected or not, below it. What
    comes out serves means and spread of the whole only; no value filled in is a measurement of its plug.

    References
    ----------
    Helsel & Cohn 1988, Estimation of descriptive statistics for multiply censored water quality data, Water
    Resources Research 24:1997-2004 (from memory).
    """
    from scipy import stats

    x = np.array(positive("values", values), dtype=np.float64)
    low = np.asarray(below, dtype=np.bool_)
    if not low.any():
        return Censored(x, low, "")
    detected = int(np.count_nonzero(~low))
    if detected < 3 or low.mean() > 0.8:
        return Censored(x, low, "taken at their limits: too few values above detection")
    limits = np.unique(x[low])
    edges = np.concatenate([[0.0], limits, [np.inf]])
    exceed = np.zeros(len(edges))  # share of values above each edge
    exceed[0] = 1.0
    for j in range(len(limits), 0, -1):
        above = np.count_nonzero(~low & (x >= edges[j]) & (x < edges[j + 1]))
        under = np.count_nonzero(~low & (x < edges[j])) + np.count_nonzero(low & (x <= edges[j]))
        share = above / (above + under) if above + under else 0.0
        exceed[j] = exceed[j + 1] + share * (1.0 - exceed[j + 1])
    position = np.empty(x.size)
    for j in range(len(limits) + 1):
        there = np.flatnonzero(~low & (x >= edges[j]) & (x < edges[j + 1]))
        rank = stats.rankdata(x[there])
        position[there] = (1.0 - exceed[j]) + (exceed[j] - exceed[j + 1]) * rank / (there.size + 1)
        if j:
            hidden = np.flatnonzero(low & (x == edges[j]))
            position[hidden] = (1.0 - exceed[j]) * np.arange(1, hidden.size + 1) / (hidden.size + 1)
    scores = stats.norm.ppf(position)
    line = stats.linregress(scores[~low], np.log(x[~low]))
    filled = x.copy()
    filled[low] = np.minimum(np.exp(line.intercept + line.slope * scores[low]), x[low])
    return Censored(filled, low, "estimated by regression on order statistics (Helsel & Cohn 1988)")


def lengths_represented(
    depth: ArrayLike, top: float = float("nan"), base: float = float("nan"), most: float = 3.0
) -> Array:
    """The length that each plug of one run stands for.

    Parameters
    ----------
    depth
        Depths (n,) in one unit, in any order; plugs of one depth share its length.
    top, base
        Ends of what was cored, where known.
    most
        No plug stands for more than this many times the median spacing: a gap is not anybody's.

    Returns
    -------
    array
        Half the way to each neighbour; at an end, to the end of the core, but no farther than half the
        median spacing. A single plug of a run without known ends stands for 1 unit.
    """
    given = np.asarray(depth, dtype=np.float64)
    unique, index, count = np.unique(given, return_inverse=True, return_counts=True)
    if unique.size == 1:
        known = np.isfinite(top) and np.isfinite(base) and base > top
        return np.full(given.size, (base - top if known else 1.0) / given.size)
    steps = np.diff(unique)
    half = float(np.median(steps)) / 2.0
    above = np.concatenate([[min(half, unique[0] - top) if np.isfinite(top) else half], steps / 2.0])
    below = np.concatenate([steps / 2.0, [min(half, base - unique[-1]) if np.isfinite(base) else half]])
    cap = most * half
    stands = np.clip(above, 0.0, cap) + np.clip(below, 0.0, cap)
    return np.asarray((stands / count)[index])


_VALUES = Symbol("x", "values", "", "values, above zero")
FORMULAS: tuple[Formula, ...] = (
    Formula(
        "means",
        1,
        "Arithmetic, geometric and harmonic mean",
        "sum w x/sum w; exp(sum w ln x/sum w); sum w/sum (w/x)",
        (_VALUES, Symbol("w", "weights", "", "weights")),
        (
            Symbol("A", "arithmetic", "", "arithmetic mean"),
            Symbol("G", "geometric", "", "geometric mean"),
            Symbol("H", "harmonic", "", "harmonic mean"),
        ),
        "values above zero",
        "Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 196-197",
        "published worked examples; laws",
        means,
        elementwise=False,
    ),
)
