"""Control of a measurement process: charts of individuals, run rules, outlier tests, precision.

Values are of one check standard and one instrument in the order of time, in any unit; what comes out is in
the same unit. Nothing here knows what was measured.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.science.formula import Array, Formula, Symbol, finite, not_negative, positive, refuse

D2_OF_TWO = 1.128
"""Mean range of two normal values over their standard deviation, 2/sqrt(pi), as tables print it."""
D4_OF_TWO = 3.267
"""Upper limit of a moving range of two over its mean, as tables print it."""
RULES = {
    1: "a value beyond three standard deviations",
    2: "nine values in a row on one side of the centre",
    3: "six values in a row rising or falling",
    4: "fourteen values in a row up and down in turn",
    5: "two of three values beyond two standard deviations on one side",
    6: "four of five values beyond one standard deviation on one side",
    7: "fifteen values in a row within one standard deviation",
    8: "eight values in a row beyond one standard deviation on either side",
}
"""Nelson's tests by their numbers."""
DRIFT_WEIGHT = 0.2
"""Weight of the newest value in the moving average that looks for drift."""
DRIFT_LIMIT = 2.962
"""Its limit in standard deviations of the average. With a weight of 0.2 a sound process passes it once in
500 values, and a shift of one standard deviation is found after about ten: Lucas and Saccucci 1990,
Technometrics 32:1 (from memory)."""
_LEAST_CHANCE = 1e-300


@dataclass(frozen=True, slots=True)
class Chart:
    """Limits of a chart of individuals and moving ranges, all in the unit of the values."""

    centre: Array
    sigma: Array
    lower: Array
    upper: Array
    mean_range: Array
    range_upper: Array


def individuals_chart(values: ArrayLike) -> Chart:
    r"""Limits of individual values and of the ranges between neighbours.

    Parameters
    ----------
    values
        Values (n,) in the order of time, at least two, in one unit [any].

    Returns
    -------
    Chart
        Centre, standard deviation, lower and upper limit of the values, mean moving range and its upper
        limit, each (), in the unit of the values. NaN where a value is missing.

    Raises
    ------
    Impossible
        If a value is infinite, or there are fewer than two.

    Notes
    -----
    MR_i = abs(x_i - x_(i-1)); sigma = mean(MR)/d_2 with d_2 = 1.128 for ranges of two; limits at the mean of
    x plus and minus 3 sigma; the upper limit of a range is D_4 mean(MR) with D_4 = 3.267. The ranges keep a
    slow drift of the mean out of sigma.

    References
    ----------
    NIST/SEMATECH 2012, e-Handbook of Statistical Methods, section 6.3.2.2 (from memory). Montgomery 2009,
    Introduction to Statistical Quality Control, 6th ed. (constants, from memory).

    Examples
    --------
    >>> chart = individuals_chart([49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1])
    >>> [round(float(v), 4) for v in (chart.centre, chart.mean_range, chart.upper, chart.lower)]
    [50.81, 1.8778, 55.8041, 45.8159]
    """
    given = finite("values", values)
    refuse(np.size(given) < 2, "values", float(np.size(given)), "two values or more")
    steps = given[1:] - given[:-1]
    ranges = np.where(steps.real < 0.0, -steps, steps)
    centre = given.sum() / given.size
    mean_range = ranges.sum() / ranges.size
    sigma = mean_range / D2_OF_TWO
    return Chart(
        np.asarray(centre),
        np.asarray(sigma),
        np.asarray(centre - 3.0 * sigma),
        np.asarray(centre + 3.0 * sigma),
        np.asarray(mean_range),
        np.asarray(D4_OF_TWO * mean_range),
    )


def run_rules(values: ArrayLike, centre: float, sigma: float) -> dict[int, NDArray[np.bool_]]:
    """Where each of Nelson's eight tests fires: at the value that completes the pattern.

    Parameters
    ----------
    values
        Values (n,) in the order of time; NaN breaks every pattern.
    centre, sigma
        The chart's, in the unit of the values.

    Returns
    -------
    dict
        Number of the test to a mask (n,). A value on a limit is not beyond it.

    References
    ----------
    Nelson 1984, The Shewhart control chart: tests for special causes, J. Quality Technology 16:237 (from
    memory). ISO 7870-2:2013 allows tests 1 to 4 (from memory).

    Examples
    --------
    >>> fired = run_rules([0.0, 2.1, 2.2], 0.0, 1.0)
    >>> [rule for rule, where in fired.items() if where.any()]
    [5]
    """
    z = (np.asarray(values, dtype=np.float64) - centre) / sigma
    above, below = z > 0, z < 0
    step = np.concatenate([[np.nan], np.diff(z)])
    turns = np.concatenate([[False, False], np.sign(step[2:]) * np.sign(step[1:-1]) < 0])[: len(z)]
    return {
        1: np.abs(z) > 3,
        2: _in_a_row(above, 9) | _in_a_row(below, 9),
        3: _in_a_row(step > 0, 5) | _in_a_row(step < 0, 5),
        4: _in_a_row(turns, 12),
        5: _of(z > 2, 2, 3) | _of(z < -2, 2, 3),
        6: _of(z > 1, 4, 5) | _of(z < -1, 4, 5),
        7: _in_a_row(np.abs(z) < 1, 15),
        8: _in_a_row(np.abs(z) > 1, 8),
    }


def range_freedom(count: ArrayLike) -> Array:
    """Degrees of freedom of a standard deviation from the mean moving range of `count` values.

    Neighbouring ranges share a value: with E and V the mean and variance of one range of two normal values
    and C the covariance of neighbours, var(mean MR)/E^2 = (V/m + 2 C (m - 1)/m^2)/E^2 for m = count - 1
    ranges, which is that of a standard deviation of half its inverse degrees of freedom. In units of sigma^2:
    E^2 = 4/pi, V = 2 - 4/pi, C = (2 sqrt(3) + pi/3)/pi - 4/pi.

    Examples
    --------
    >>> range_freedom([8, 20]).round(1).tolist()
    [4.4, 11.7]
    """
    ranges = np.asarray(count, dtype=np.float64) - 1.0
    square = 4.0 / np.pi
    neighbours = (2.0 * np.sqrt(3.0) + np.pi / 3.0) / np.pi - square
    relative = ((2.0 - square) / ranges + 2.0 * neighbours * (ranges - 1.0) / ranges**2) / square
    return np.asarray(0.5 / relative)


def limit_factor(count: int) -> float:
    """How many standard deviations from the centre the limits for later values lie.

    As far as lets one value in 370 of a sound process beyond them, whatever the number of values that gave
    centre and standard deviation: 3 for very many.

    Examples
    --------
    >>> round(limit_factor(20), 2), round(limit_factor(100_000), 2)
    (3.88, 3.0)
    """
    from scipy import special

    t = -special.stdtrit(float(range_freedom(count)), float(special.ndtr(-3.0)))
    return float(t * np.sqrt(1.0 + 1.0 / count))


def later_deviate(value: ArrayLike, centre: ArrayLike, sigma: ArrayLike, count: ArrayLike) -> Array:
    r"""How far a value lies from a centre that few earlier values gave, as a standard normal deviate.

    Parameters
    ----------
    value
        A later value, in one unit [any].
    centre, sigma
        Mean of the earlier values and their standard deviation from moving ranges, above 0.
    count
        How many earlier values, above 1.

    Returns
    -------
    ndarray
        The normal deviate as probable as the value; missing where anything is missing.

    Raises
    ------
    Impossible
        If sigma is not above 0, count not above 1, or a value infinite.

    Notes
    -----
    t = (x - m)/(sigma sqrt(1 + 1/n)) follows Student's law nearly, with the degrees of freedom of a mean
    moving range; z = Phi^-1(T(t)). Without it three standard deviations of a baseline of 20 let one sound
    value in 65 through, not one in 370 (simulated).

    References
    ----------
    Quesenberry 1991, SPC Q charts for start-up processes and short or long runs, J. Quality Technology
    23:213 (the transformation, from memory). Degrees of freedom: `range_freedom`.

    Examples
    --------
    >>> later_deviate([10.3, 10.3], 10.0, 0.1, [20, 100_000]).round(2).tolist()
    [2.48, 3.0]
    """
    from scipy import special

    x, m = finite("value", value), finite("centre", centre)
    s, n = positive("sigma", sigma), finite("count", count)
    refuse(n.real <= 1.0, "count", n, "a number above 1")
    t = (x - m) / (s * np.sqrt(1.0 + 1.0 / n))
    chance = special.stdtr(range_freedom(n), -np.abs(t))
    size = -special.ndtri(np.maximum(chance, _LEAST_CHANCE))
    return np.asarray(np.sign(t) * size, dtype=np.float64)


def drift_deviate(values: ArrayLike, centre: float, sigma: float, count: int) -> Array:
    """The moving average that finds a slow drift, as a standard normal deviate after each value.

    Parameters
    ----------
    values
        Values (n,) in the order of time, none missing.
    centre, sigma, count
        Mean, standard deviation and number of the values that gave both.

    Notes
    -----
    z_i = w x_i + (1 - w) z_(i-1), z_0 the centre; var z_i = sigma^2 w/(2 - w) (1 - (1 - w)^(2i)), to which
    the variance of the centre, sigma^2/count, is added; judged by Student's law as in `later_deviate`.

    References
    ----------
    Roberts 1959, Control chart tests based on geometric moving averages, Technometrics 1:239; NIST/SEMATECH
    2012, e-Handbook of Statistical Methods, section 6.3.2.4 (both from memory).
    """
    from scipy import special

    average = moving_average(values, centre)
    steps = np.arange(1, average.size + 1)
    spread = drift_spread(steps, sigma) ** 2 + sigma**2 / count
    t = (average - centre) / np.sqrt(spread)
    chance = special.stdtr(float(range_freedom(count)), -np.abs(t))
    return np.asarray(np.sign(t) * -special.ndtri(np.maximum(chance, _LEAST_CHANCE)), dtype=np.float64)


def moving_average(values: ArrayLike, start: float, weight: float = DRIFT_WEIGHT) -> Array:
    """z_i = w x_i + (1 - w) z_(i-1) with z_0 = `start`; values (n,) in the order of time."""
    from scipy.signal import lfilter

    given = np.asarray(values, dtype=np.float64) - start
    return np.asarray(start + lfilter([weight], [1.0, weight - 1.0], given), dtype=np.float64)


def drift_spread(steps: ArrayLike, sigma: float, weight: float = DRIFT_WEIGHT) -> Array:
    """Standard deviation of the moving average after so many values."""
    i = np.asarray(steps, dtype=np.float64)
    return np.asarray(sigma * np.sqrt(weight / (2.0 - weight) * (1.0 - (1.0 - weight) ** (2.0 * i))))


def _in_a_row(mask: NDArray[np.bool_], many: int) -> NDArray[np.bool_]:
    return _of(mask, many, many)


def _of(mask: NDArray[np.bool_], many: int, window: int) -> NDArray[np.bool_]:
    """Where at least `many` of the `window` values up to this one are marked, this one among them."""
    total = np.concatenate([[0], np.cumsum(mask)])
    at = np.arange(1, len(mask) + 1)
    count = total[at] - total[np.maximum(at - window, 0)]
    return np.asarray((count >= many) & mask)


@dataclass(frozen=True, slots=True)
class Outlier:
    """An outlier test: its statistic, the critical value, and where the value tested stands (n,)."""

    statistic: Array
    critical: Array
    where: NDArray[np.bool_]


def grubbs_critical(count: int, alpha: float = 0.05, *, two_sided: bool = True) -> float:
    """The critical value of Grubbs' test for one outlier among `count` values.

    References
    ----------
    Grubbs 1950, Sample criteria for testing outlying observations, Ann. Math. Statist. 21:27; ISO
    5725-2:1994, table 5, holds the two-sided values (both from memory).

    Examples
    --------
    >>> round(grubbs_critical(8, two_sided=False), 3)
    2.032
    """
    from scipy import special

    t2 = special.stdtrit(count - 2, alpha / (count * (2 if two_sided else 1))) ** 2
    return float((count - 1) / np.sqrt(count) * np.sqrt(t2 / (count - 2 + t2)))


def grubbs_test(values: ArrayLike) -> Outlier:
    """Whether the value farthest from the mean is an outlier.

    Parameters
    ----------
    values
        Values (n,), three or more, of one normal population, in one unit [any].

    Returns
    -------
    Outlier
        G, its two-sided 5 % critical value, and where the value tested stands. NaN where one is missing.

    Raises
    ------
    Impossible
        If a value is infinite or there are fewer than three.

    Notes
    -----
    G = max abs(x - mean)/s. Critical (n-1)/sqrt(n) sqrt(t^2/(n-2+t^2)), t of n-2 degrees of freedom at
    0.05/(2n).

    References
    ----------
    Grubbs 1950, Ann. Math. Statist. 21:27; NIST/SEMATECH 2012, e-Handbook of Statistical Methods, section
    1.3.5.17.1 (from memory).

    Examples
    --------
    >>> found = grubbs_test([199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57])
    >>> round(float(found.statistic), 4)
    2.4688
    """
    given = finite("values", values)
    refuse(np.size(given) < 3, "values", float(np.size(given)), "three values or more")
    away, spread = _away(given.real)
    statistic = np.divide(away.max(), spread) if spread > 0 else np.where(np.isnan(spread), np.nan, 0.0)
    return Outlier(
        np.asarray(statistic),
        np.asarray(grubbs_critical(given.size)),
        np.asarray(away == away.max()) if not np.isnan(spread) else np.zeros(given.size, dtype=np.bool_),
    )


def _away(values: Array) -> tuple[Array, Array]:
    away = np.abs(values - values.mean())
    return away, np.sqrt(np.sum(away**2) / (values.size - 1))


def rosner_outliers(values: ArrayLike, most: int, alpha: float = 0.05) -> NDArray[np.bool_]:
    """Which values are outliers by the generalised extreme Studentised deviate test.

    Parameters
    ----------
    values
        Values (n,); NaN is left out.
    most
        The greatest number of outliers looked for; the test is good for 25 values or more, fair from 15.

    References
    ----------
    Rosner 1983, Percentage points for a generalized ESD many-outlier procedure, Technometrics 25:165.
    """
    marked, _, _ = rosner_steps(values, most, alpha)
    return marked


def rosner_steps(values: ArrayLike, most: int, alpha: float = 0.05) -> tuple[NDArray[np.bool_], Array, Array]:
    """The same, with the statistics R (most,) and their critical values."""
    from scipy import special

    given = np.asarray(values, dtype=np.float64)
    left = np.flatnonzero(~np.isnan(given))
    total, taken, statistics, critical = left.size, [], [], []
    for i in range(1, min(most, total - 2) + 1):
        away, spread = _away(given[left])
        worst = int(np.argmax(away))
        statistics.append(float(away[worst] / spread) if spread > 0 else 0.0)
        t = -special.stdtrit(total - i - 1, alpha / (2 * (total - i + 1)))
        critical.append(float((total - i) * t / np.sqrt((total - i - 1 + t**2) * (total - i + 1))))
        taken.append(left[worst])
        left = np.delete(left, worst)
    many = max((i + 1 for i, (r, c) in enumerate(zip(statistics, critical, strict=True)) if r > c), default=0)
    marked = np.zeros(given.size, dtype=np.bool_)
    marked[taken[:many]] = True
    return marked, np.array(statistics), np.array(critical)


def tietjen_moore(values: ArrayLike, many: int) -> float:
    """E of `many` values farthest from the mean: the sum of squares without them over that with them.

    References
    ----------
    Tietjen and Moore 1972, Some Grubbs-type statistics for the detection of several outliers, Technometrics
    14:583.
    """
    given = np.asarray(values, dtype=np.float64)
    ordered = given[np.argsort(np.abs(given - given.mean()), kind="stable")]
    kept = ordered[: given.size - many]
    return float(np.sum((kept - kept.mean()) ** 2) / np.sum((given - given.mean()) ** 2))


def tietjen_moore_critical(count: int, many: int, alpha: float = 0.05, *, draws: int = 100_000) -> float:
    """The value of E below which `many` of `count` values are outliers: simulated, the same each time.

    No formula is known; Tietjen and Moore simulated theirs too. With 100,000 draws its standard error is
    about 0.001.
    """
    drawn = np.random.default_rng(1972).standard_normal((draws, count))
    away = np.abs(drawn - drawn.mean(axis=1, keepdims=True))
    kept = np.take_along_axis(drawn, np.argsort(away, axis=1)[:, : count - many], axis=1)
    inner = np.sum((kept - kept.mean(axis=1, keepdims=True)) ** 2, axis=1)
    return float(np.quantile(inner / np.sum(away**2, axis=1), alpha))


def dixon_q(values: ArrayLike, alpha: float = 0.05) -> tuple[float, float]:
    """Dixon's r10 of the more extreme end of 3 to 30 values, and its two-sided critical value.

    References
    ----------
    Dixon 1951, Ratios involving extreme values, Ann. Math. Statist. 22:68 (from memory).
    """
    ordered = np.sort(np.asarray(values, dtype=np.float64))
    refuse(not 3 <= ordered.size <= 30, "values", float(ordered.size), "3 to 30 values")
    span = ordered[-1] - ordered[0]
    gap = max(ordered[1] - ordered[0], ordered[-1] - ordered[-2])
    return float(gap / span) if span > 0 else 0.0, dixon_critical(ordered.size, alpha)


def dixon_critical(count: int, alpha: float = 0.05) -> float:
    """The two-sided critical value of Dixon's r10 for `count` normal values.

    As tables of two-sided tests have it, each end is tested at half of `alpha`. The chance that one end
    passes q: n (n - 1) times the integral over the lowest value a and the range w of
    f(a) f(a + w) (F(a + (1 - q) w) - F(a))^(n - 2), f and F the normal density and distribution: the other
    values lie between the lowest one and the gap.

    Examples
    --------
    >>> [round(dixon_critical(n), 3) for n in (3, 10)]
    [0.97, 0.466]
    """
    from scipy import special
    from scipy.optimize import brentq

    nodes, weights = np.polynomial.legendre.leggauss(96)
    low, low_weight = 8.5 * nodes[:, np.newaxis], 8.5 * weights[:, np.newaxis]
    span, span_weight = 7.0 * (nodes + 1.0), 7.0 * weights
    density = np.exp(-0.5 * (low**2 + (low + span) ** 2)) / (2.0 * np.pi) * low_weight * span_weight
    below = special.ndtr(low)

    def beyond(q: float) -> float:
        between = (special.ndtr(low + (1.0 - q) * span) - below) ** (count - 2)
        return float(count * (count - 1) * np.sum(density * between) - alpha / 2.0)

    return float(brentq(beyond, 0.0, 1.0, xtol=1e-9))


@dataclass(frozen=True, slots=True)
class Precision:
    """Repeatability and reproducibility, each () in the unit of the values.

    `repeatability_limit` and `reproducibility_limit` are what two values may differ by, at 95 %.
    """

    mean: Array
    repeatability_sd: Array
    between_sd: Array
    reproducibility_sd: Array
    repeatability_limit: Array
    reproducibility_limit: Array


def precision(values: ArrayLike, group: ArrayLike) -> Precision:
    r"""Repeatability within groups (days, plugs, laboratories) and reproducibility between them.

    Parameters
    ----------
    values
        Values (n,) in one unit [any].
    group
        Which group each belongs to (n,), whole numbers from 0; two groups or more, one of them of two values.

    Returns
    -------
    Precision
        In the unit of the values. NaN where a value is missing.

    Raises
    ------
    Impossible
        If a value is infinite, a group number is below 0, or there is nothing to pool.

    Notes
    -----
    s_r^2 = sum (n_i - 1) s_i^2 / sum (n_i - 1); s_L^2 = (s_d^2 - s_r^2)/nbar, not below 0, with
    s_d^2 = sum n_i (m_i - m)^2 / (p - 1) and nbar = (N - sum n_i^2 / N)/(p - 1); s_R^2 = s_r^2 + s_L^2;
    limits 2.8 s. Of pairs alone s_r is sqrt(sum d^2 / 2p).

    References
    ----------
    ISO 5725-2:1994, Accuracy (trueness and precision) of measurement methods and results, part 2, section 7
    (from memory).

    Examples
    --------
    >>> found = precision([10.1, 10.3, 11.0, 11.2], [0, 0, 1, 1])
    >>> round(float(found.repeatability_sd), 4), round(float(found.repeatability_limit), 4)
    (0.1414, 0.396)
    """
    given = finite("values", values)
    places = np.asarray(group)
    refuse(np.isinf(places.astype(np.float64)) | (places < 0), "group", places, "a whole number from 0")
    _, index = np.unique(places, return_inverse=True)
    count = np.bincount(index).astype(np.float64)
    groups, total = count.size, given.size
    refuse(groups < 2 or total <= groups, "values", float(total), "two groups or more, one with repeats")

    def summed(what: Array) -> Array:
        real: Array = np.bincount(index, what.real).astype(np.float64)
        return real + 1j * np.bincount(index, what.imag) if what.dtype.kind == "c" else real

    means = summed(given) / count
    within = np.sum((given - means[index]) ** 2) / (total - groups)
    overall = given.sum() / total
    between = np.sum(count * (means - overall) ** 2) / (groups - 1)
    size = (total - np.sum(count**2) / total) / (groups - 1)
    laboratory = (between - within) / size
    laboratory = np.where(laboratory.real < 0.0, 0.0 * laboratory, laboratory)
    repeat, both = np.sqrt(within), np.sqrt(within + laboratory)
    return Precision(
        *(np.asarray(v) for v in (overall, repeat, np.sqrt(laboratory), both, 2.8 * repeat, 2.8 * both))
    )


def pooled_of_pairs(differences: ArrayLike) -> float:
    """Repeatability standard deviation from differences of pairs: sqrt(sum d^2 / 2p).

    References
    ----------
    ISO 5725-2:1994 (from memory), for groups of two.
    """
    given = np.asarray(differences, dtype=np.float64)
    given = given[~np.isnan(given)]
    return float(np.sqrt(np.sum(given**2) / (2 * given.size))) if given.size else float("nan")


def normalised_error(
    value: ArrayLike, u_value: ArrayLike, certified: ArrayLike, u_certified: ArrayLike
) -> Array:
    """E_n: a difference from the certified value over the expanded uncertainty (k = 2) of both.

    Parameters
    ----------
    value, certified
        What was measured and what is certified, in one unit [any].
    u_value, u_certified
        Their standard uncertainties in the same unit, 0 or more.

    Returns
    -------
    ndarray
        At most 1 in size where value and certificate agree; missing where anything is missing or both are
        stated without uncertainty and are equal.

    Raises
    ------
    Impossible
        If an uncertainty is below 0 or anything is infinite.

    Notes
    -----
    E_n = (x - X)/(2 sqrt(u_x^2 + u_X^2)). Twice E_n is the zeta score.

    References
    ----------
    ISO 13528:2015, Statistical methods for use in proficiency testing, section 9 (from memory).

    Examples
    --------
    >>> round(float(normalised_error(20.02, 0.008, 20.0, 0.003)), 2)
    1.17
    """
    difference = finite("value", value) - finite("certified", certified)
    u, u_other = not_negative("u_value", u_value), not_negative("u_certified", u_certified)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.asarray(difference / (2.0 * np.sqrt(u**2 + u_other**2)))


_VALUES = Symbol("x", "values", "", "values in the order of time")
FORMULAS: tuple[Formula, ...] = (
    Formula(
        "individuals-chart",
        1,
        "Control chart of individuals and moving ranges",
        "sigma = mean(MR)/1.128; limits mean(x) +- 3 sigma; range limit 3.267 mean(MR)",
        (_VALUES,),
        (
            Symbol("m", "centre", "", "centre"),
            Symbol("sigma", "sigma", "", "standard deviation from the moving ranges"),
            Symbol("LCL", "lower", "", "lower limit"),
            Symbol("UCL", "upper", "", "upper limit"),
            Symbol("MR", "mean_range", "", "mean moving range"),
            Symbol("MR_u", "range_upper", "", "upper limit of a moving range"),
        ),
        "independent, nearly normal values; eight or more for the limits to mean much (common practice)",
        "NIST/SEMATECH e-Handbook 6.3.2.2 (from memory)",
        "published worked example; false alarms simulated",
        individuals_chart,
        elementwise=False,
    ),
    Formula(
        "grubbs-outlier",
        1,
        "One outlier",
        "G = max abs(x - mean)/s",
        (_VALUES,),
        (
            Symbol("G", "statistic", "", "statistic"),
            Symbol("G_c", "critical", "", "two-sided 5 % critical value"),
            Symbol("", "where", "", "where the value tested stands"),
        ),
        "three values or more of a normal population, one outlier at most",
        "Grubbs 1950, Ann. Math. Statist. 21:27 (from memory)",
        "published worked examples and table",
        grubbs_test,
        elementwise=False,
        smooth=False,
    ),
    Formula(
        "precision",
        1,
        "Repeatability and reproducibility",
        "s_r^2 = sum (n_i-1) s_i^2/sum (n_i-1); s_L^2 = (s_d^2 - s_r^2)/nbar; s_R^2 = s_r^2 + s_L^2",
        (_VALUES, Symbol("", "group", "", "which day, plug or laboratory")),
        (
            Symbol("m", "mean", "", "mean of all values"),
            Symbol("s_r", "repeatability_sd", "", "repeatability standard deviation"),
            Symbol("s_L", "between_sd", "", "standard deviation between groups"),
            Symbol("s_R", "reproducibility_sd", "", "reproducibility standard deviation"),
            Symbol("r", "repeatability_limit", "", "what two values of one group may differ by, 95 %"),
            Symbol("R", "reproducibility_limit", "", "what two values of two groups may differ by, 95 %"),
        ),
        "two groups or more, one of them with repeats",
        "ISO 5725-2:1994, section 7 (from memory)",
        "computed example; analysis of variance as oracle",
        precision,
        elementwise=False,
    ),
    Formula(
        "later-deviate",
        1,
        "Deviate of a value from a short baseline",
        "z = Phi^-1(T((x - m)/(sigma sqrt(1 + 1/n))))",
        (
            Symbol("x", "value", "", "a later value"),
            Symbol("m", "centre", "", "mean of the earlier values"),
            Symbol("sigma", "sigma", "", "their standard deviation, from moving ranges"),
            Symbol("n", "count", "", "number of earlier values", low=8.0),
        ),
        (Symbol("z", "deviate", "", "standard normal deviate"),),
        "independent, nearly normal values",
        "Quesenberry 1991, J. Quality Technology 23:213 (from memory)",
        "false alarms simulated for baselines of 8, 12 and 20",
        later_deviate,
        smooth=False,
    ),
    Formula(
        "normalised-error",
        1,
        "Agreement with a certificate",
        "E_n = (x - X)/(2 sqrt(u_x^2 + u_X^2))",
        (
            Symbol("x", "value", "", "value measured"),
            Symbol("u_x", "u_value", "", "its standard uncertainty"),
            Symbol("X", "certified", "", "value certified"),
            Symbol("u_X", "u_certified", "", "standard uncertainty of the certificate"),
        ),
        (Symbol("E_n", "normalised_error", "", "normalised error"),),
        "independent uncertainties",
        "ISO 13528:2015, section 9 (from memory)",
        "by hand; laws",
        normalised_error,
    ),
)
