"""Averages of permeability and porosity over an interval, and what to do with values below detection.

Weights are thicknesses, spacings or plain counts: the caller says which. Values come in columns (n,).
"""

from __future__ import annotations

from collections.abc import Iterator
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


def weighted_sd(values: ArrayLike, weights: ArrayLike) -> float:
    """Standard deviation, with n - 1 where all weights are alike. NaN for fewer than two values.

    sqrt(sum w (x - m)^2 / (sum w - sum w^2/sum w)), m the weighted mean.

    References
    ----------
    The unbiased estimate for weights that say how much a value counts, not how well it is known: common
    practice.
    """
    x, w = np.asarray(values, dtype=np.float64), np.asarray(weights, dtype=np.float64)
    if x.size < 2:
        return float("nan")
    total = w.sum()
    spread = np.sum(w * (x - np.sum(w * x) / total) ** 2)
    return float(np.sqrt(spread / (total - np.sum(w * w) / total)))


def effective_count(weights: ArrayLike) -> float:
    """How many values alike in weight tell as much as these: (sum w)^2/sum w^2.

    References
    ----------
    Kish 1965, Survey Sampling (from memory).
    """
    w = np.asarray(weights, dtype=np.float64)
    return float(w.sum() ** 2 / np.sum(w * w)) if w.size else 0.0


def weighted_quantiles(values: ArrayLike, weights: ArrayLike, shares: ArrayLike) -> Array:
    """Quantiles: between the middles of the weights, from the lowest value to the highest.

    With weights alike they are the usual ones, of place (n - 1) q + 1; the half is the median.

    References
    ----------
    Hyndman & Fan 1996, Sample quantiles in statistical packages, The American Statistician 50:361-365,
    definition 7 (from memory), with the middle of a weight in the place of a rank.

    Examples
    --------
    >>> weighted_quantiles([1.0, 2.0, 10.0], [1.0, 1.0, 1.0], [0.25, 0.5]).tolist()
    [1.5, 2.0]
    >>> weighted_quantiles([1.0, 2.0, 10.0], [1.0, 1.0, 4.0], 0.5).tolist()
    4.4
    """
    x, w = np.asarray(values, dtype=np.float64), np.asarray(weights, dtype=np.float64)
    order = np.argsort(x, kind="stable")
    middle = np.cumsum(w[order]) - w[order] / 2.0
    if x.size > 1:  # from exactly 0 to exactly 1, so that the ends are the extremes to the last bit
        middle = (middle - middle[0]) / (middle[-1] - middle[0])
    return np.asarray(np.interp(np.asarray(shares, dtype=np.float64), middle, x[order]))


#: As many places are drawn at once as fit in the processor's memory.
_AT_ONCE = 500_000


def resamples(size: int, count: int, seed: int) -> Iterator[NDArray[np.intp]]:
    """`count` draws of `size` places out of as many, with replacement, in bunches (m, size), rows rising.

    The same seed gives the same draws.
    """
    random = np.random.default_rng(seed)
    step = max(1, _AT_ONCE // size)
    for first in range(0, count, step):
        rows = min(step, count - first)
        drawn = random.integers(0, size, size=(rows, size)) + size * np.arange(rows)[:, np.newaxis]
        times = np.bincount(drawn.ravel(), minlength=rows * size)
        yield np.repeat(np.tile(np.arange(size), rows), times).reshape(rows, size)


def bootstrap_intervals(
    values: ArrayLike, weights: ArrayLike, count: int, seed: int, confidence: float = 0.95
) -> dict[str, tuple[float, float]]:
    """Intervals of the means and the median by drawing the values anew.

    Geometric and harmonic mean only where all values lie above zero.

    References
    ----------
    Efron & Tibshirani 1993, An Introduction to the Bootstrap, ch. 13 (percentile interval; from memory).
    """
    x, w = np.asarray(values, dtype=np.float64), np.asarray(weights, dtype=np.float64)
    order = np.argsort(x, kind="stable")
    x, w = x[order], w[order]
    above = bool((x > 0.0).all())
    terms = {"arithmetic mean": w * x}
    if above:
        terms |= {"geometric mean": w * np.log(x), "harmonic mean": w / x}
    sums: dict[str, list[Array]] = {name: [] for name in (*terms, "median")}
    alike = bool((w == w[0]).all())
    half = (x.size - 1) // 2, x.size // 2
    for rows in resamples(x.size, count, seed):
        drawn = w[rows]
        total = drawn.sum(axis=1)
        for name, term in terms.items():
            sums[name].append(term[rows].sum(axis=1) / total)
        if alike:
            sums["median"].append((x[rows[:, half[0]]] + x[rows[:, half[1]]]) / 2.0)
            continue
        middle = np.cumsum(drawn, axis=1) - drawn / 2.0
        wanted = (middle[:, 0] + middle[:, -1]) / 2.0
        low = np.maximum((middle <= wanted[:, np.newaxis]).sum(axis=1) - 1, 0)
        at = np.arange(len(rows))
        high = np.minimum(low + 1, x.size - 1)
        step = middle[at, high] - middle[at, low]
        part = np.divide(wanted - middle[at, low], step, out=np.zeros_like(wanted), where=step > 0)
        sums["median"].append(x[rows[at, low]] * (1.0 - part) + x[rows[at, high]] * part)
    found = {name: np.concatenate(parts) for name, parts in sums.items()}
    if above:
        found["geometric mean"] = np.exp(found["geometric mean"])
        found["harmonic mean"] = 1.0 / found["harmonic mean"]
    tail = (1.0 - confidence) / 2.0
    return {
        name: (float(low), float(high))
        for name, (low, high) in ((n, np.quantile(v, [tail, 1.0 - tail])) for n, v in found.items())
    }


def log_normal_field_permeability_md(permeability_md: ArrayLike) -> Array:
    r"""Permeability of a random log-normal field to flow in three directions.

    Parameters
    ----------
    permeability_md
        Permeabilities (n,) [md], above zero.

    Returns
    -------
    array
        k_e () [md]. NaN where anything is missing.

    Raises
    ------
    Impossible
        If a permeability is not above zero or infinite.

    Notes
    -----
    k_e = (1 + s^2/6) exp(m), with m the arithmetic mean and s^2 the variance (divisor n) of ln k: a first
    order, for small s^2. The worked examples of the book put the geometric mean of the ln k in the place of
    m and so print 159.55 for 160.98 mD and 123 for about 211 mD; exp(m) is the geometric mean of k.

    References
    ----------
    Gutjahr, Gelhar, Bakr & MacMillan 1978, Stochastic analysis of spatial variability in subsurface flows 2,
    Water Resources Research 14:953-959 (from memory); Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 198,
    206 (examples).

    Examples
    --------
    >>> round(float(log_normal_field_permeability_md([100.0, 50.0, 200.0])), 2)
    105.34
    """
    logs = np.log(positive("permeability_md", permeability_md))
    m = np.mean(logs)
    return np.asarray((1.0 + np.mean((logs - m) ** 2) / 6.0) * np.exp(m))


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
    depth: ArrayLike,
    top: float = float("nan"),
    base: float = float("nan"),
    spacing: float = float("nan"),
    most: float = 3.0,
) -> Array:
    """The length that each plug of one run stands for.

    Parameters
    ----------
    depth
        Depths (n,) in one unit, in any order; plugs of one depth share its length. NaN stands for none.
    top, base
        Ends of the core that came out, where known.
    spacing
        The usual way from plug to plug; the median of this run where it is not given.
    most
        On either side no plug stands for more than this many times half the spacing: a gap is not anybody's.

    Returns
    -------
    array
        Half the way to each neighbour; at an end, to the end of the core, but no farther than half the
        spacing. A single plug without a spacing stands for 1 unit of the core.
    """
    given = np.asarray(depth, dtype=np.float64)
    there = np.isfinite(given)
    length = np.zeros(given.size)
    if not there.any():
        return length
    unique, index, count = np.unique(given[there], return_inverse=True, return_counts=True)
    steps = np.diff(unique)
    if not np.isfinite(spacing):
        spacing = float(np.median(steps)) if steps.size else 1.0
    half, cap = spacing / 2.0, most * spacing / 2.0
    above = np.concatenate([[min(half, unique[0] - top) if np.isfinite(top) else half], steps / 2.0])
    below = np.concatenate([steps / 2.0, [min(half, base - unique[-1]) if np.isfinite(base) else half]])
    stands = np.clip(above, 0.0, cap) + np.clip(below, 0.0, cap)
    length[there] = (stands / count)[index]
    return length


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
    Formula(
        "log-normal-field",
        1,
        "Permeability of a random log-normal field",
        "k_e = (1 + s^2/6) exp(m); m, s^2 mean and variance of ln k",
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        (Symbol("k_e", "field_permeability_md", "mD", "permeability of the field"),),
        "isotropic log-normal fields of small s^2",
        "Gutjahr et al. 1978, Water Resources Research 14:953-959 (from memory)",
        "published variance and mean; the printed answers do not follow from the formula",
        log_normal_field_permeability_md,
        elementwise=False,
    ),
)
