"""Standard uncertainties carried from readings to results, after the GUM (JCGM 100:2008).

Everything is generic over elementwise formulas: numbers or arrays in, named arguments, texts passed through.
Derivatives are exact to rounding, by a step along the imaginary axis (Squire & Trapp 1998, "Using complex
variables to estimate derivatives of real functions", SIAM Rev. 40:110-112).
"""

from __future__ import annotations

import warnings
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields, is_dataclass
from types import MappingProxyType
from typing import Any, TypeAlias, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.errors import Usage, did_you_mean
from corelab.science.formula import Array, finite, not_negative, refuse, whole_tray

Correlation: TypeAlias = Mapping[tuple[str, str], ArrayLike]
STEP = 1e-30
"""Share of a value that the imaginary step is; nothing is subtracted, so it may be this small."""
LEAST = 1e-100
"""Values nearer to 0 are stepped as if they were this large, so that the step does not vanish."""
SHARE = "% of reading"


@dataclass(frozen=True, slots=True)
class Propagated:
    """A result, its standard uncertainty, and what each input contributes.

    `contributions` holds c_i u_i with its sign: sensitivity times standard uncertainty, in the unit of the
    result. Two results with the same inputs are therefore correlated as `covariance` tells.
    """

    value: Array
    standard_uncertainty: Array
    contributions: dict[str, Array]


@dataclass(frozen=True, slots=True)
class Drawn:
    """What a Monte Carlo run found: mean, standard uncertainty, interval, and losses.

    `low` and `high` are the ends of the interval that leaves equal shares outside; `impossible` is the share
    of draws that no plug can have, left out of all the others.
    """

    mean: Array
    standard_uncertainty: Array
    low: Array
    high: Array
    impossible: Array


@dataclass(frozen=True, slots=True)
class DefaultUncertainty:
    """Standard uncertainties taken for an instrument that states none.

    `repeatability` acts on each reading anew, `scale` on all readings of the instrument alike. `unit` is the
    unit of both, or '% of reading'.
    """

    measures: str
    repeatability: float
    scale: float
    unit: str
    source: str

    def of(self, readings: ArrayLike) -> tuple[Array, Array]:
        """Repeatability and scale uncertainty of each reading, in the unit of the reading or `unit`.

        >>> DEFAULTS["pressure"].of([200.0])[1].tolist()
        [0.2]
        """
        given = np.real(finite("readings", readings))
        size = np.abs(given) / 100.0 if self.unit == SHARE else np.where(np.isnan(given), np.nan, 1.0)
        return self.repeatability * size, self.scale * size


def _defaults(*records: DefaultUncertainty) -> MappingProxyType[str, DefaultUncertainty]:
    return MappingProxyType({record.measures: record for record in records})


DEFAULTS = _defaults(
    DefaultUncertainty("mass", 0.01, 0.005, "g", "plugs weighed to 0.01 g: API RP 40, 1998 (from memory)"),
    DefaultUncertainty("length", 0.005, 0.002, "cm", "caliper and an uneven plug: common practice"),
    DefaultUncertainty("pressure", 0.05, 0.1, SHARE, "transducer within its calibration: common practice"),
    DefaultUncertainty("flow rate", 0.2, 0.5, SHARE, "mass or bubble flowmeter: common practice"),
    DefaultUncertainty("volume", 0.025, 0.01, "cm3", "trap or tube read to half a division: common practice"),
    DefaultUncertainty("temperature", 0.2, 0.5, "K", "laboratory thermometer: common practice"),
    DefaultUncertainty("barometer read", 0.05, 0.1, "kPa", "barometer in the room: common practice"),
    DefaultUncertainty(
        "barometer assumed", 0.0, 1.5, "kPa", "weather about a standard atmosphere: common practice"
    ),
    DefaultUncertainty("density", 0.0, 0.005, "g/cm3", "a liquid's stated density: common practice"),
    DefaultUncertainty(
        "reported grain volume",
        0.05,
        0.12,
        SHARE,
        "within 0.2 % of the true value when calibrated, as equal odds: API RP 40, 1998 (from memory)",
    ),
    DefaultUncertainty(
        "reported permeability",
        1.0,
        4.0,
        SHARE,
        "within 5 to 10 % in the middle range, as equal odds: API RP 40, 1998 (from memory)",
    ),
)
"""Defaults by what is measured; a value used from here deserves a flag."""


def _numeric(values: ArrayLike) -> bool:
    return np.asarray(values).dtype.kind in "iufc"


def _known(names: Iterable[str], values: Mapping[str, ArrayLike], what: str) -> None:
    numbers = [name for name, given in values.items() if _numeric(given)]
    for name in names:
        if name not in numbers:
            raise Usage(f"{what} names '{name}', which is no numeric input; {did_you_mean(name, numbers)}")


def _chosen(found: Any, output: str | None) -> Array:
    if not is_dataclass(found):
        if output is not None:
            raise Usage(f"output: found '{output}'; the formula returns one result only; leave it out")
        return cast("Array", np.asarray(found))
    names = [field.name for field in fields(found)]
    if output is None:
        raise Usage(f"the formula returns several results; say which output: {', '.join(names)}")
    if output not in names:
        raise Usage(f"the formula returns no '{output}'; {did_you_mean(output, names)}")
    return cast("Array", np.asarray(getattr(found, output)))


def partials(
    compute: Callable[..., Any],
    values: Mapping[str, ArrayLike],
    output: str | None = None,
    *,
    names: Iterable[str] | None = None,
) -> dict[str, Array]:
    """Partial derivatives of an elementwise formula.

    Parameters
    ----------
    compute
        An elementwise, complex-safe function, called with the names as keywords.
    values
        Argument name to a number, an array, or texts (which are passed on as they are).
    output
        The field wanted, where `compute` returns a dataclass of arrays.
    names
        The arguments wanted; by default all that are numeric.

    Returns
    -------
    dict of Array
        For each argument the derivative of the result by it, in the shape of the result. NaN where a value
        is missing.

    Raises
    ------
    Usage
        If a name is not among the numeric arguments, or the output not among the fields.
    Impossible
        As `compute` raises it.

    Notes
    -----
    df/dx = Im f(x + i h)/h, h = 1e-30 |x| (or 1e-130 near 0). A formula that casts to float would lose the
    derivative in silence: NumPy's warning of it is made an error.

    References
    ----------
    Squire, W. & Trapp, G. 1998, "Using complex variables to estimate derivatives of real functions", SIAM
    Rev. 40:110-112.

    Examples
    --------
    >>> partials(lambda a, b: a * b**2, {"a": 2.0, "b": 3.0})
    {'a': array(9.), 'b': array(12.)}
    """
    wanted = [n for n, given in values.items() if _numeric(given)] if names is None else list(names)
    _known(wanted, values, "names")
    found = {}
    for name in wanted:
        given = np.asarray(values[name], dtype=np.float64)
        step = STEP * np.maximum(np.abs(given), LEAST)
        with warnings.catch_warnings():
            warnings.simplefilter("error", np.exceptions.ComplexWarning)
            stepped = _chosen(compute(**{**values, name: given + 1j * step}), output)
        with np.errstate(invalid="ignore"):
            # a result that does not depend on the argument may well be real
            slope = np.imag(stepped) / step
        found[name] = np.where(np.isnan(np.real(stepped)), np.nan, slope)
    return found


def covariance(
    first: Mapping[str, ArrayLike], second: Mapping[str, ArrayLike], correlation: Correlation | None = None
) -> Array:
    """Covariance of two results from the contributions of the inputs that they share.

    Parameters
    ----------
    first, second
        Contributions of the two results: input name to c_i u_i, in each result's unit.
    correlation
        Pair of input names to their correlation coefficient; a pair not named is uncorrelated.

    Returns
    -------
    Array
        Covariance, broadcast shape.

    Raises
    ------
    Usage
        If a pair names one input twice, or is given in both orders.
    Impossible
        If a correlation is not between -1 and 1.

    Notes
    -----
    cov(y, z) = sum over i and j of (c_i u_i)(d_j u_j) r_ij: JCGM 100:2008, eq. H.9.

    Examples
    --------
    >>> float(covariance({"a": 3.0, "b": 1.0}, {"a": 2.0}))
    6.0
    """
    zero = np.zeros(())
    total = zero
    for name, share in first.items():
        if name in second:
            total = total + np.asarray(share) * np.asarray(second[name])
    for (one, other), given in (correlation or {}).items():
        if one == other or (other, one) in (correlation or {}):
            raise Usage(f"correlation of '{one}' and '{other}': each pair of two inputs is given once")
        r = finite("correlation", given)
        refuse(np.abs(r.real) > 1.0, "correlation", r, "a number between -1 and 1")
        for a, b in ((one, other), (other, one)):
            total = total + r * np.asarray(first.get(a, zero)) * np.asarray(second.get(b, zero))
    return np.asarray(total)


def combined(contributions: Mapping[str, ArrayLike], correlation: Correlation | None = None) -> Array:
    """Combined standard uncertainty.

    Parameters
    ----------
    contributions
        Input name to c_i u_i, with its sign.
    correlation
        Pair of input names to their correlation coefficient; a pair not named is uncorrelated.

    Returns
    -------
    Array
        Standard uncertainty, broadcast shape.

    Raises
    ------
    Impossible
        If a correlation is not between -1 and 1, or the correlations contradict each other.

    Notes
    -----
    u^2 = sum of (c_i u_i)^2 + 2 sum over pairs of r_ij (c_i u_i)(c_j u_j): JCGM 100:2008, eqs. 10 and 16.

    Examples
    --------
    >>> float(combined({"a": 3.0, "b": 4.0})), float(combined({"a": 3.0, "b": 4.0}, {("a", "b"): -1.0}))
    (5.0, 1.0)
    """
    variance = covariance(contributions, contributions, correlation)
    independent = covariance(contributions, contributions)
    refuse(
        variance < -1e-9 * independent,
        "correlation",
        variance,
        "correlations that can hold together (the variance they give is negative)",
    )
    return np.sqrt(np.maximum(variance, 0.0))


def propagate(
    compute: Callable[..., Any],
    values: Mapping[str, ArrayLike],
    standard_uncertainties: Mapping[str, ArrayLike],
    correlation: Correlation | None = None,
    *,
    output: str | None = None,
) -> Propagated:
    """A formula's result with its standard uncertainty and its budget.

    Parameters
    ----------
    compute
        An elementwise, complex-safe function, called with the names of `values` as keywords.
    values
        Argument name to a number, an array, or texts.
    standard_uncertainties
        Argument name to its standard uncertainty, in the argument's unit, 0 or more; arguments not named
        have none.
    correlation
        Pair of argument names to their correlation coefficient; a pair not named is uncorrelated.
    output
        The field wanted, where `compute` returns a dataclass of arrays.

    Returns
    -------
    Propagated
        Value, standard uncertainty and signed contributions, all in the result's unit and in the shape that
        values and uncertainties broadcast to. NaN where a value or an uncertainty is missing.

    Raises
    ------
    Usage
        If an uncertainty or a correlation names an unknown argument, or `output` does not fit.
    Impossible
        If an uncertainty is negative, a correlation not between -1 and 1, or `compute` refuses a value.

    Notes
    -----
    u^2(y) = sum over i and j of c_i c_j u_i u_j r_ij, c_i = dy/dx_i at the values: first order.

    References
    ----------
    JCGM 100:2008, "Evaluation of measurement data: Guide to the expression of uncertainty in measurement",
    sec. 5.

    Examples
    --------
    >>> from corelab.science.volumes import caliper_bulk_volume_cm3
    >>> found = propagate(caliper_bulk_volume_cm3, {"length_cm": 5.08, "diameter_cm": 3.81},
    ...                   {"length_cm": 0.003, "diameter_cm": 0.003})
    >>> round(float(found.standard_uncertainty), 4)
    0.0974
    """
    _known(standard_uncertainties, values, "standard_uncertainties")
    for pair in correlation or {}:
        _known(pair, {n: values.get(n, "") for n in standard_uncertainties}, "correlation")
    u = {name: not_negative(name, given) for name, given in standard_uncertainties.items()}
    value = _chosen(compute(**values), output)
    slopes = partials(compute, values, output, names=u)
    shares = {name: slopes[name] * u[name] for name in u}
    uncertainty = combined(shares, correlation)
    shape = np.broadcast_shapes(value.shape, uncertainty.shape)
    return Propagated(
        np.broadcast_to(value, shape),
        np.where(np.isnan(value), np.nan, uncertainty),
        {name: np.broadcast_to(share, shape) for name, share in shares.items()},
    )


def welch_satterthwaite(
    contributions: Mapping[str, ArrayLike], degrees_of_freedom: Mapping[str, ArrayLike]
) -> Array:
    """Effective degrees of freedom of a combined standard uncertainty.

    Parameters
    ----------
    contributions
        Input name to c_i u_i, uncorrelated.
    degrees_of_freedom
        Input name to its degrees of freedom, above 0; an input not named has infinitely many.

    Returns
    -------
    Array
        Effective degrees of freedom, broadcast shape; infinite where no input that contributes has few.

    Raises
    ------
    Impossible
        If degrees of freedom are not above 0.

    Notes
    -----
    nu_eff = u^4 / sum of (c_i u_i)^4/nu_i.

    References
    ----------
    JCGM 100:2008, eq. G.2b.

    Examples
    --------
    >>> round(float(welch_satterthwaite({"a": 1.0, "b": 1.0}, {"a": 5.0, "b": 5.0})), 9)
    10.0
    """
    total = np.zeros(())
    for name, given in degrees_of_freedom.items():
        nu = np.asarray(given, dtype=np.float64)
        refuse(nu <= 0.0, "degrees_of_freedom", nu, "a number above 0")
        total = total + np.asarray(contributions.get(name, 0.0)) ** 4 / nu
    with np.errstate(divide="ignore", invalid="ignore"):
        effective = combined(contributions) ** 4 / total
    return np.where(total == 0.0, np.inf, effective)


def coverage_factor(degrees_of_freedom: ArrayLike, probability: float = 0.95) -> Array:
    """Factor that makes a standard uncertainty an expanded one.

    Parameters
    ----------
    degrees_of_freedom : array_like
        Effective degrees of freedom, 1 or more; may be infinite. A broken number is cut to a whole one.
    probability : float
        Level of confidence, above 0, below 1.

    Returns
    -------
    Array
        Coverage factor, shape of the input.

    Raises
    ------
    Impossible
        If degrees of freedom are below 1, or a probability is not between 0 and 1.

    Notes
    -----
    k = t_p(nu), Student's two-sided quantile; nu cut as in JCGM 100:2008, G.4.2.

    References
    ----------
    JCGM 100:2008, annex G, table G.2.

    Examples
    --------
    >>> round(float(coverage_factor(16.7, 0.99)), 2), round(float(coverage_factor(float("inf"))), 2)
    (2.92, 1.96)
    """
    from scipy.stats import t

    refuse(not 0.0 < probability < 1.0, "probability", probability, "a number between 0 and 1")
    nu = np.asarray(degrees_of_freedom, dtype=np.float64)
    refuse(nu < 1.0, "degrees_of_freedom", nu, "1 or more")
    return np.asarray(t.ppf((1.0 + probability) / 2.0, np.floor(nu)), dtype=np.float64)


def repeat_uncertainty(values: ArrayLike, axis: int = -1) -> Array:
    """Standard uncertainty of the mean of repeated readings.

    Parameters
    ----------
    values : array_like
        Readings; NaN is a repeat that was not taken, and is not counted.
    axis : int
        The axis along which the repeats lie.

    Returns
    -------
    Array
        s/sqrt(n) in the readings' unit, without that axis; NaN for fewer than two readings.

    Raises
    ------
    Impossible
        If a reading is infinite.

    Notes
    -----
    s^2 = sum of (x - mean)^2/(n - 1): an evaluation of type A.

    References
    ----------
    JCGM 100:2008, eqs. 4 and 5.

    Examples
    --------
    >>> round(float(repeat_uncertainty([5.007, 4.994, 5.005, 4.990, 4.999])), 4)
    0.0032
    """
    given = finite("values", values)
    there = ~np.isnan(given)
    n = there.sum(axis=axis, keepdims=True)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(there, given, 0.0).sum(axis=axis, keepdims=True) / n
        squares = np.where(there, (given - mean) ** 2, 0.0).sum(axis=axis, keepdims=True)
        found = np.sqrt(squares / (n - 1) / n)
    return cast("Array", np.where(n < 2, np.nan, found).squeeze(axis=axis))


def _correlated(
    generator: np.random.Generator,
    names: list[str],
    correlation: Correlation,
    draws: int,
    shape: tuple[int, ...],
) -> NDArray[np.float64]:
    """Standard normal draws (inputs, draws, *shape) with the correlations wanted."""
    normal = generator.standard_normal((draws, *shape, len(names)))
    if correlation:
        matrix = np.broadcast_to(np.eye(len(names)), (*shape, len(names), len(names))).copy()
        for (one, other), r in correlation.items():
            i, j = names.index(one), names.index(other)
            matrix[..., i, j] = matrix[..., j, i] = r
        strength, direction = np.linalg.eigh(matrix)
        refuse(
            strength < -1e-9,
            "correlation",
            strength,
            "correlations that can hold together (no eigenvalue below 0)",
        )
        root = direction * np.sqrt(np.maximum(strength, 0.0))[..., np.newaxis, :]
        normal = (root @ normal[..., np.newaxis])[..., 0]
    return np.moveaxis(normal, -1, 0)


def monte_carlo(
    compute: Callable[..., Any],
    values: Mapping[str, ArrayLike],
    standard_uncertainties: Mapping[str, ArrayLike],
    correlation: Correlation | None = None,
    *,
    draws: int = 20_000,
    seed: int = 0,
    probability: float = 0.95,
    output: str | None = None,
) -> Drawn:
    """A formula's result as a distribution, by drawing its inputs: a check on `propagate`.

    Parameters
    ----------
    compute, values, standard_uncertainties, correlation, output
        As in `propagate`; `compute` need not be complex-safe.
    draws : int
        Draws of each input, at least 100.
    seed : int
        Seed of the generator: the same seed gives the same numbers.
    probability : float
        Level of the interval, above 0, below 1.

    Returns
    -------
    Drawn
        Arrays in the broadcast shape. NaN where a value or an uncertainty is missing.

    Raises
    ------
    Usage
        If there are too few draws, or a name is unknown.
    Impossible
        If an uncertainty is negative, or correlations are not possible.

    Notes
    -----
    Inputs are drawn from normal distributions. The standard deviation found is itself uncertain by
    1/sqrt(2 draws) of it. Unlike `propagate`, it holds all orders.

    References
    ----------
    JCGM 101:2008, "Propagation of distributions using a Monte Carlo method", sec. 7.

    Examples
    --------
    >>> found = monte_carlo(lambda a, b: a + b, {"a": 1.0, "b": 2.0}, {"a": 0.3, "b": 0.4}, seed=1)
    >>> round(float(found.standard_uncertainty), 1)
    0.5
    """
    if draws < 100:
        raise Usage(f"draws: found {draws}; wanted at least 100 (20000 find an uncertainty to 0.5 %)")
    refuse(not 0.0 < probability < 1.0, "probability", probability, "a number between 0 and 1")
    _known(standard_uncertainties, values, "standard_uncertainties")
    for pair in correlation or {}:
        _known(pair, {n: values.get(n, "") for n in standard_uncertainties}, "correlation")
    u = {name: not_negative(name, given) for name, given in standard_uncertainties.items()}
    shape = np.broadcast_shapes(*(np.shape(v) for v in values.values()), *(v.shape for v in u.values()))
    names = list(u)
    normal = _correlated(np.random.default_rng(seed), names, correlation or {}, draws, shape)
    columns: dict[str, ArrayLike] = {}
    for name, given in values.items():
        spread = np.broadcast_to(np.asarray(given), (draws, *shape))
        if name in u:
            spread = spread + u[name] * normal[names.index(name)]
        columns[name] = spread.reshape(-1)
    found, refused = whole_tray(compute, columns)
    results = np.real(_chosen(found, output)).reshape(draws, *shape)
    impossible = np.array([bool(row) for row in refused]).reshape(draws, *shape)
    kept = np.where(impossible, np.nan, results)
    gone = impossible.all(axis=0) | (np.isnan(results) & ~impossible).any(axis=0)
    kept = np.where(gone, 0.0, kept)  # spares NumPy's warnings about columns without a number
    low, high = np.nanquantile(kept, [(1.0 - probability) / 2.0, (1.0 + probability) / 2.0], axis=0)
    mean, spread_found = np.nanmean(kept, axis=0), np.nanstd(kept, axis=0, ddof=1)

    def there(numbers: ArrayLike) -> Array:
        return np.where(gone, np.nan, numbers)

    return Drawn(
        there(mean), there(spread_found), there(low), there(high), np.asarray(impossible.mean(axis=0))
    )
