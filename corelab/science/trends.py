"""Trends of log10 permeability on porosity, and the regressions beneath them.

Permeability is in mD, porosity a fraction; lg is log10, so residuals and their standard deviation are in
decades. Least squares works in extended precision where the machine has it, by orthogonalising twice, so that
the certified digits of hard problems come back. Regressions of general columns (`least_squares`, `york`,
`theil_sen`, `huber` …) stand beside the trends (`semilog_trend` …), which take porosity and permeability.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, TypeAlias, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import optimize, stats

from corelab.errors import Impossible
from corelab.science.formula import Array, Formula, Symbol, finite, not_negative, positive, refuse

COVERAGE = 0.95
"""Share of new plugs that a prediction band is meant to hold."""
HUBER_THRESHOLD = 1.345
"""Residual over scale beyond which a plug weighs less: 95 % efficient for normal residuals (Huber 1981)."""
LEAST_BESIDE_BREAK = 4
"""Plugs that lie on each side of the break of a broken line, at least."""


@dataclass(frozen=True, slots=True)
class Fit:
    """A fitted trend.

    `residual_sd` is in the unit of what was fitted (decades for lg k), `coefficients` and `standard_errors`
    (p,) are in the order of the model's parameters; residuals, leverages and weights (n,) in the order of the
    points. `inverse_normal` (p, p) times the squared residual standard deviation is the covariance of the
    coefficients. `degrees_of_freedom` is n - p. What an estimator does not give is NaN.
    """

    residual_sd: Array
    r_squared: Array
    coefficients: Array
    standard_errors: Array
    residuals: Array
    leverages: Array
    weights: Array
    inverse_normal: Array
    degrees_of_freedom: int


@dataclass(frozen=True, slots=True)
class Prediction:
    """lg k foreseen for a new plug: centre, standard error of prediction [decades], degrees of freedom."""

    centre: Array
    standard_error: Array
    degrees_of_freedom: int


@dataclass(frozen=True, slots=True)
class Searched:
    """A fit with one parameter that was searched for: the last of its coefficients.

    `low` and `high` bound that parameter at 95 % by the profile of the residual sum of squares; `at_bound`
    says that the best value lies at an end of what was searched, where it has no standard error.
    `left_out` (n,) are the residuals of each point from the fit without it. `residual_sd` and the rest of
    `fit` take all coefficients as free.
    """

    low: float
    high: float
    at_bound: bool
    left_out: Array
    fit: Fit


@dataclass(frozen=True, slots=True)
class York:
    """A line with errors in both variables.

    `standard_errors` are those that follow from the stated uncertainties; times the root of `mswd` they are
    widened by the scatter found. `chi_square` has `degrees_of_freedom`.
    """

    intercept: Array
    slope: Array
    standard_errors: Array
    chi_square: Array
    degrees_of_freedom: int

    @property
    def mswd(self) -> float:
        return float(np.real(self.chi_square)) / self.degrees_of_freedom


@dataclass(frozen=True, slots=True)
class Compared:
    """Whether groups share one line: F, degrees of freedom and p of three questions.

    Each is (F, numerator, denominator, p): `any` one line for all against one each, `slopes` parallel lines
    against one each, `levels` one line against parallel ones.
    """

    any: tuple[float, int, int, float]
    slopes: tuple[float, int, int, float]
    levels: tuple[float, int, int, float]


# -- least squares ----------------------------------------------------------------------------------------


def _extended(values: ArrayLike) -> NDArray[Any]:
    given = np.asarray(values)
    return given.astype(np.result_type(given.dtype, np.longdouble), copy=False)


def _plain(values: NDArray[Any]) -> Array:
    given = np.asarray(values)
    return cast("Array", given.astype(np.complex128 if given.dtype.kind == "c" else np.float64))


def _orthogonal(design: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    """Q and R of a design, by orthogonalising twice; products without conjugation keep a complex step."""
    q = design.copy()
    p = q.shape[1]
    r = np.zeros((p, p), dtype=q.dtype)
    for j in range(p):
        size = np.sqrt(np.sum(q[:, j].real ** 2))
        for _ in range(2):
            along = q[:, :j].T @ q[:, j]
            q[:, j] -= q[:, :j] @ along
            r[:j, j] += along
        r[j, j] = np.sqrt(np.sum(q[:, j] ** 2))
        if not r[j, j].real > 1e3 * np.finfo(q.dtype).eps * size:
            raise Impossible(
                f"design: column {j} follows from those before it; wanted independent columns; "
                "leave it out, or use points that differ in it"
            )
        q[:, j] /= r[j, j]
    return q, r


def least_squares(design: ArrayLike, y: ArrayLike) -> Fit:
    """Ordinary least squares.

    Parameters
    ----------
    design : array_like
        Columns, shape (n, p), n above p; a column of ones where there is an intercept.
    y : array_like
        What is fitted, shape (n,).

    Returns
    -------
    Fit
        Standard errors and residual standard deviation on n - p degrees of freedom. NaN throughout where
        anything is missing.

    Raises
    ------
    Impossible
        If a value is infinite, there are not more points than columns, or a column follows from others.

    Notes
    -----
    y = X b + e; b = (X'X)^-1 X'y by X = QR, h_i the squared length of row i of Q.

    References
    ----------
    Björck, Å. 1996, "Numerical Methods for Least Squares Problems" (from memory).

    Examples
    --------
    >>> found = least_squares([[1.0, 0.0], [1.0, 1.0], [1.0, 2.0], [1.0, 3.0]], [1.0, 3.1, 4.9, 7.0])
    >>> found.coefficients.round(3).tolist(), round(float(found.residual_sd), 4)
    ([1.03, 1.98], 0.0949)
    """
    x, given = _extended(design), _extended(y)
    refuse(np.isinf(x), "design", x, "finite numbers")
    refuse(np.isinf(given), "y", given, "finite numbers")
    n, p = x.shape
    if n <= p:
        raise Impossible(f"y: found {n} points for {p} coefficients; wanted more points than coefficients")
    if np.isnan(x).any() or np.isnan(given).any():
        return _missing(n, p)
    q, r = _orthogonal(x)
    along = q.T @ given
    rest = given - q @ along
    again = q.T @ rest
    rest = rest - q @ again
    along = along + again
    inverse = np.zeros_like(r)
    for j in range(p):
        inverse[j, j] = 1 / r[j, j]
        for i in range(j - 1, -1, -1):
            inverse[i, j] = -(r[i, i + 1 : j + 1] @ inverse[i + 1 : j + 1, j]) / r[i, i]
    squares = np.sum(rest**2)
    sd = np.sqrt(squares / (n - p))
    normal = inverse @ inverse.T
    about = np.sum((given - np.mean(given)) ** 2)
    return Fit(
        _plain(sd),
        _plain(1 - squares / about) if about else np.asarray(np.nan),
        _plain(inverse @ along),
        _plain(sd * np.sqrt(np.diagonal(normal))),
        _plain(rest),
        _plain(np.sum(q**2, axis=1)),
        np.ones(n),
        _plain(normal),
        n - p,
    )


def _missing(n: int, p: int) -> Fit:
    nan = np.asarray(np.nan)
    points, columns = np.full(n, np.nan), np.full(p, np.nan)
    return Fit(nan, nan, columns, columns, points, points, points, np.full((p, p), np.nan), n - p)


def line(x: ArrayLike, y: ArrayLike) -> Fit:
    """Ordinary least squares of y on x: intercept and slope.

    >>> line([0.0, 1.0, 2.0, 3.0], [1.0, 3.1, 4.9, 7.0]).coefficients.round(3).tolist()
    [1.03, 1.98]
    """
    given = np.asarray(x)
    return least_squares(np.column_stack([np.ones_like(given), given]), y)


def left_out_residuals(fit: Fit) -> Array:
    """Residual of each point from the least-squares fit without it: e/(1 - h), exactly.

    A point that alone holds a coefficient has none: NaN.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(fit.leverages < 1.0 - 1e-9, fit.residuals / (1.0 - fit.leverages), np.nan)


def studentised_residuals(fit: Fit) -> Array:
    """Residual of each point over its standard error from the fit without it: t on n - p - 1.

    t_i = e_i/(s_(i) sqrt(1 - h_i)); Cook & Weisberg 1982, "Residuals and Influence in Regression" (from
    memory). NaN where too few points are left.

    >>> fit = line([0.0, 1.0, 2.0, 3.0, 4.0], [0.1, 0.9, 2.1, 2.9, 5.0])
    >>> round(float(studentised_residuals(fit)[-1]), 2)
    5.5
    """
    left = fit.degrees_of_freedom - 1
    if left < 1:
        return np.full(fit.residuals.size, np.nan)
    with np.errstate(divide="ignore", invalid="ignore"):
        own = fit.residuals**2 / (1.0 - fit.leverages)
        squares = np.maximum(fit.residual_sd**2 * fit.degrees_of_freedom - own, 0.0)
        return np.asarray(fit.residuals / np.sqrt(squares / left * (1.0 - fit.leverages)))


def predicted(fit: Fit, rows: ArrayLike) -> Prediction:
    """What a least-squares fit foresees at new rows of its design, shape (…, p).

    The standard error holds the scatter of one new point and the uncertainty of the fit there:
    s sqrt(1 + x'(X'X)^-1 x); Draper & Smith 1998, "Applied Regression Analysis" (from memory).
    """
    given = np.asarray(rows, dtype=np.float64)
    leverage = np.einsum("...i,ij,...j->...", given, np.real(fit.inverse_normal), given)
    return Prediction(
        given @ np.real(fit.coefficients),
        np.real(fit.residual_sd) * np.sqrt(1.0 + np.maximum(leverage, 0.0)),
        fit.degrees_of_freedom,
    )


def prediction(fit: Fit, porosity_frac: ArrayLike) -> Prediction:
    """What a semilog trend foresees for a plug that is not in it.

    Parameters
    ----------
    fit : Fit
        Of `semilog_trend`.
    porosity_frac : array_like
        Porosity of the new plug [v/v].

    Returns
    -------
    Prediction
        Centre of lg k, standard error of prediction [decades] with the plug's own leverage, degrees of
        freedom: (lg k - centre)/standard error is Student's t.
    """
    phi = finite("porosity_frac", porosity_frac).real
    return predicted(fit, np.stack([np.ones_like(phi), phi], axis=-1))


def external_t(fit: Fit, porosity_frac: ArrayLike, permeability_md: ArrayLike) -> tuple[Array, Array]:
    """How far a plug lies from a semilog trend that it is not in: Student's t, and its two-sided p.

    >>> fit = semilog_trend([0.10, 0.15, 0.20, 0.25, 0.30], [1.0, 12.0, 90.0, 1100.0, 9000.0])
    >>> t, p = external_t(fit, 0.20, 5000.0)
    >>> bool(t > 5), bool(p < 0.01)
    (True, True)
    """
    foreseen = prediction(fit, porosity_frac)
    lg = np.log10(positive("permeability_md", permeability_md))
    t = (lg - foreseen.centre) / foreseen.standard_error
    return t, np.asarray(2.0 * stats.t.sf(np.abs(t), foreseen.degrees_of_freedom))


def corrected_akaike(fit: Fit) -> float:
    """Akaike's information criterion with the correction for few points, of a least-squares fit.

    n ln(RSS/n) + 2 K + 2 K (K + 1)/(n - K - 1), K coefficients and one variance; Hurvich & Tsai 1989,
    Biometrika 76:297-307 (from memory). Infinite where n - K is 1 or less.
    """
    n = fit.residuals.size
    k = fit.coefficients.size + 1
    if n - k - 1 <= 0:
        return float("inf")
    squares = float(np.sum(np.real(fit.residuals) ** 2))
    with np.errstate(divide="ignore"):
        return float(n * np.log(squares / n) + 2 * k + 2 * k * (k + 1) / (n - k - 1))


def uneven_scatter_p(fit: Fit, x: ArrayLike) -> float:
    """p of the hypothesis that the residuals scatter alike at all x.

    n R^2 of the squared residuals on x is chi-square on 1; Koenker 1981, J. Econometrics 17:107-112 (from
    memory), after Breusch & Pagan 1979.
    """
    squares = np.real(fit.residuals) ** 2
    if np.ptp(squares) == 0.0:
        return 1.0
    return float(stats.chi2.sf(squares.size * line(x, squares).r_squared, 1))


def compare_lines(x: ArrayLike, y: ArrayLike, group: ArrayLike) -> Compared | None:
    """Whether groups have lines of their own: analysis of covariance.

    Groups of fewer than three points, or of one x, are left out; None where fewer than two remain, or the
    points lie exactly on the lines.

    F = ((RSS_small - RSS_large)/(difference of coefficients))/(RSS_large/degrees of freedom); Searle 1971,
    "Linear Models" (from memory).
    """
    phi, lg, of = np.asarray(x, np.float64), np.asarray(y, np.float64), np.asarray(group)
    names = [g for g in np.unique(of) if np.sum(of == g) >= 3 and np.ptp(phi[of == g]) > 0.0]
    if len(names) < 2:
        return None
    keep = np.isin(of, names)
    phi, lg, of = phi[keep], lg[keep], of[keep]
    member = (of[:, np.newaxis] == np.array(names)).astype(np.float64)
    many = len(names)
    one = _squares(np.column_stack([np.ones_like(phi), phi]), lg)
    parallel = _squares(np.column_stack([member, phi]), lg)
    own = _squares(np.column_stack([member, member * phi[:, np.newaxis]]), lg)
    left = lg.size - 2 * many
    if left < 1 or own <= 1e-24 * float(np.sum(lg**2)):
        return None

    def ratio(small: float, large: float, extra: int, free: int) -> tuple[float, int, int, float]:
        f = max(small - large, 0.0) / extra / (large / free)
        return f, extra, free, float(stats.f.sf(f, extra, free))

    return Compared(
        ratio(one, own, 2 * many - 2, left),
        ratio(parallel, own, many - 1, left),
        ratio(one, parallel, many - 1, left + many - 1),
    )


def _squares(design: Array, y: Array) -> float:
    return float(np.sum(least_squares(design, y).residuals ** 2))


# -- one parameter searched for ---------------------------------------------------------------------------

Law: TypeAlias = Callable[[Any], tuple[Any, Any]]
"""From the searched parameter to an offset (n,) and a design (n, p): y = offset + design b."""


def search(law: Law, y: ArrayLike, candidates: Sequence[float] | Array) -> Searched:
    """Least squares where one parameter bends the law and the others are linear in it.

    Parameters
    ----------
    law
        Parameter to offset and design; analytic in the parameter, or at least piecewise.
    y : array_like
        What is fitted, shape (n,).
    candidates
        Values to try first, rising; the parameter is not sought beyond them.

    Returns
    -------
    Searched
        The linear coefficients and, last, the parameter.

    Raises
    ------
    Impossible
        As `least_squares`.

    Notes
    -----
    The residual sum of squares is profiled over the candidates, the best refined by bounded search and by
    Gauss-Newton steps on all coefficients. Interval of the parameter c: RSS(c) <= RSS (1 + F(1, n - p)/(n -
    p)). Leaving a point out is exact over the candidates, since RSS falls by e^2/(1 - h).

    References
    ----------
    Golub, G. H. & Pereyra, V. 1973, SIAM J. Numer. Anal. 10:413-432; Bates, D. M. & Watts, D. G. 1988,
    "Nonlinear Regression Analysis and its Applications" (both from memory).
    """
    given = np.asarray(y, dtype=np.float64)
    tried = np.asarray(candidates, dtype=np.float64)

    def at(c: float) -> Fit:
        offset, design = law(c)
        return least_squares(design, given - offset)

    def squares(c: float) -> float:
        return float(np.sum(at(c).residuals ** 2))

    def steepness(c: float, linear: Array) -> Array:
        offset, design = law(complex(c, 1e-30))
        return np.asarray(np.imag(offset + design @ linear) / 1e-30)

    fits = [at(float(c)) for c in tried]
    profile = np.array([float(np.sum(f.residuals**2)) for f in fits])
    best = int(np.argmin(profile))
    low, high = tried[max(best - 1, 0)], tried[min(best + 1, tried.size - 1)]
    c = float(optimize.minimize_scalar(squares, bounds=(low, high), method="bounded").x)
    if squares(c) > profile[best]:
        c = float(tried[best])
    for _ in range(20):
        here = at(c)
        jacobian = np.column_stack([law(c)[1], steepness(c, here.coefficients)])
        try:
            step = float(least_squares(jacobian, here.residuals).coefficients[-1])
        except Impossible:
            break
        moved = min(max(c + step, float(tried[0])), float(tried[-1]))
        if moved == c or squares(moved) > squares(c) * (1.0 + 1e-12):
            break
        c = moved
    here = at(c)
    p = here.coefficients.size + 1
    free = given.size - p
    if free < 1:
        raise Impossible(f"y: found {given.size} points for {p} coefficients; wanted more")
    rss = float(np.sum(here.residuals**2))
    at_bound = bool(c <= tried[0] or c >= tried[-1])
    sd = np.asarray((rss / free) ** 0.5)
    about = float(np.sum((given - given.mean()) ** 2))
    normal = np.full((p, p), np.nan)
    leverages = here.leverages
    try:
        if at_bound:
            raise Impossible("a parameter at its bound has no standard error")
        jacobian = np.column_stack([law(c)[1], steepness(c, here.coefficients)])
        tangent = least_squares(jacobian, here.residuals)
        normal, leverages = tangent.inverse_normal, tangent.leverages
    except Impossible:
        normal[:-1, :-1] = here.inverse_normal
    fit = Fit(
        sd,
        np.asarray(1.0 - rss / about) if about else np.asarray(np.nan),
        np.append(here.coefficients, c),
        np.asarray(sd * np.sqrt(np.diagonal(normal))),
        here.residuals,
        leverages,
        np.ones(given.size),
        normal,
        free,
    )
    limit = rss * (1.0 + float(stats.f.ppf(COVERAGE, 1, free)) / free)
    ends = []
    for outward in (tried[tried < c][::-1], tried[tried > c]):
        inside = c
        end = float(outward[-1]) if outward.size else c
        for candidate in outward.tolist():
            if squares(candidate) > limit:
                end = float(optimize.brentq(lambda v: squares(v) - limit, inside, candidate))
                break
            inside = candidate
        ends.append(end)
    fits.append(here)
    residuals = np.stack([f.residuals for f in fits])
    kept = np.maximum(1.0 - np.stack([f.leverages for f in fits]), 1e-12)
    without = np.append(profile, rss)[:, np.newaxis] - residuals**2 / kept
    chosen = np.argmin(without, axis=0)
    places = np.arange(given.size)
    left_out = residuals[chosen, places] / kept[chosen, places]
    return Searched(ends[0], ends[1], at_bound, left_out, fit)


# -- errors in both variables, robust lines ---------------------------------------------------------------


def york(x: ArrayLike, y: ArrayLike, u_x: ArrayLike, u_y: ArrayLike, correlation: ArrayLike = 0.0) -> York:
    """The line of best fit where both variables have errors.

    Parameters
    ----------
    x, y : array_like
        Points, shape (n,), three or more.
    u_x, u_y : array_like
        Their standard uncertainties, above 0 (one of the two may be 0).
    correlation : array_like
        Correlation of the errors of each point, between -1 and 1.

    Returns
    -------
    York
        Intercept, slope, standard errors from the stated uncertainties, chi-square on n - 2.

    Raises
    ------
    Impossible
        If an uncertainty is negative, both of a point are 0, there are fewer than three points, all x are
        equal, or the steps do not settle.

    Notes
    -----
    b = sum of W beta V/sum of W beta U, W = wx wy/(wx + b^2 wy - 2 b r alpha), wx and wy the inverse squares
    of the uncertainties, alpha^2 = wx wy, U and V distances from the weighted mean, beta = W (U/wy + b V/wx -
    (b U + V) r/alpha); iterated.

    References
    ----------
    York, D., Evensen, N. M., López Martínez, M. & De Basabe Delgado, J. 2004, "Unified equations for the
    slope, intercept, and standard errors of the best straight line", Am. J. Phys. 72:367-375 (from memory).

    Examples
    --------
    >>> found = york([0.0, 1.0, 2.0, 3.0], [1.0, 3.1, 4.9, 7.0], 0.1, 0.1)
    >>> round(float(found.slope), 3)
    1.981
    """
    xs, ys = (finite(name, v) for name, v in (("x", x), ("y", y)))
    vx, vy = (not_negative(name, v) ** 2 for name, v in (("u_x", u_x), ("u_y", u_y)))
    r = finite("correlation", correlation)
    refuse(np.abs(r.real) > 1.0, "correlation", r, "a number between -1 and 1")
    xs, ys, vx, vy, r = np.broadcast_arrays(xs, ys, vx, vy, r)
    refuse((vx.real + vy.real) <= 0.0, "u_y", vy, "an uncertainty above 0 in one of the two")
    n = xs.size
    if n < 3:
        raise Impossible(f"x: found {n} points; wanted three or more")
    nan = np.asarray(np.nan)
    if np.isnan(xs + ys + vx + vy + r).any():
        return York(nan, nan, np.array([np.nan, np.nan]), nan, n - 2)
    if np.ptp(xs.real) == 0.0:
        raise Impossible(
            f"x: found one value, {xs.real[0]:g}, in all points; wanted points that differ in it"
        )
    cov = r * np.sqrt(vx * vy)
    b = np.sum((xs - xs.mean()) * (ys - ys.mean())) / np.sum((xs - xs.mean()) ** 2)
    for _ in range(500):
        w = 1.0 / (vy + b**2 * vx - 2.0 * b * cov)
        x_mean, y_mean = np.sum(w * xs) / np.sum(w), np.sum(w * ys) / np.sum(w)
        u, v = xs - x_mean, ys - y_mean
        beta = w * (u * vy + b * v * vx - (b * u + v) * cov)
        before, b = b, np.sum(w * beta * v) / np.sum(w * beta * u)
        if abs(b - before) <= 1e-14 * abs(b):
            break
    else:
        if not abs(b - before) <= 1e-9 * abs(b):
            raise Impossible(
                "x: the line of errors in both variables does not settle; the points hold no trend"
            )
    w = 1.0 / (vy + b**2 * vx - 2.0 * b * cov)
    x_mean, y_mean = np.sum(w * xs) / np.sum(w), np.sum(w * ys) / np.sum(w)
    a = y_mean - b * x_mean
    beta = w * ((xs - x_mean) * vy + b * (ys - y_mean) * vx - (b * (xs - x_mean) + ys - y_mean) * cov)
    fitted = x_mean + beta
    fitted_mean = np.sum(w * fitted) / np.sum(w)
    se_b = 1.0 / np.sqrt(np.sum(w * (fitted - fitted_mean) ** 2))
    se_a = np.sqrt(1.0 / np.sum(w) + fitted_mean**2 * se_b**2)
    chi = np.sum(w * (ys - a - b * xs) ** 2)
    return York(np.asarray(a), np.asarray(b), np.array([se_a, se_b]), np.asarray(chi), n - 2)


def reduced_major_axis(x: ArrayLike, y: ArrayLike) -> Fit:
    """The reduced major axis: intercept and slope that treat both variables alike.

    Parameters
    ----------
    x, y : array_like
        Points, shape (n,), three or more.

    Returns
    -------
    Fit
        Residuals are vertical.

    Raises
    ------
    Impossible
        If there are fewer than three points, or x or y does not vary.

    Notes
    -----
    b = sign(r) s_y/s_x; its standard error is |b| sqrt((1 - r^2)/(n - 2)).

    References
    ----------
    Kermack, K. A. & Haldane, J. B. S. 1950, "Organic correlation and allometry", Biometrika 37:30-41 (from
    memory).

    Examples
    --------
    >>> reduced_major_axis([0.0, 1.0, 2.0, 3.0], [1.0, 3.1, 4.9, 7.0]).coefficients.round(3).tolist()
    [1.029, 1.981]
    """
    xs, ys = finite("x", x), finite("y", y)
    ordinary = line(xs, ys)
    if np.isnan(ordinary.residual_sd):
        return ordinary
    n = xs.size
    u, v = xs - xs.mean(), ys - ys.mean()
    sxx, syy, sxy = np.sum(u * u), np.sum(v * v), np.sum(u * v)
    if syy.real == 0.0 or sxy.real == 0.0:
        raise Impossible("y: found no correlation with x; wanted points with a trend")
    slope = np.where(sxy.real < 0.0, -1.0, 1.0) * np.sqrt(syy / sxx)
    se = np.sqrt(syy / sxx * np.maximum((1.0 - sxy**2 / (sxx * syy)).real, 0.0) / (n - 2))
    if np.iscomplexobj(sxy):
        se = np.sqrt(syy / sxx * (1.0 - sxy**2 / (sxx * syy)) / (n - 2))
    coefficients = np.array([ys.mean() - slope * xs.mean(), slope])
    errors = np.array([se * np.sqrt(sxx / n + xs.mean() ** 2), se])
    return _with_line(ordinary, xs, ys, coefficients, errors)


def _with_line(
    ordinary: Fit, x: Array, y: Array, coefficients: Array, errors: Array, weights: Array | None = None
) -> Fit:
    rest = y - coefficients[0] - coefficients[1] * x
    squares = np.sum(rest**2)
    return replace(
        ordinary,
        residual_sd=np.asarray(np.sqrt(squares / ordinary.degrees_of_freedom)),
        r_squared=np.asarray(1.0 - squares / np.sum((y - y.mean()) ** 2)),
        coefficients=coefficients,
        standard_errors=errors,
        residuals=rest,
        weights=ordinary.weights if weights is None else weights,
    )


def theil_sen(x: ArrayLike, y: ArrayLike) -> tuple[Fit, float, float]:
    """The line whose slope is the median of the slopes of all pairs, and the 95 % interval of that slope.

    The intercept is median(y) - b median(x); a third of the points may be wild. The standard error of the
    slope is the interval's half width over 1.96; the intercept has none. Theil 1950, Proc. K. Ned. Akad. Wet.
    53:386-392; Sen 1968, J. Am. Stat. Assoc. 63:1379-1389 (both from memory).

    >>> fit, low, high = theil_sen([0.0, 1.0, 2.0, 3.0, 4.0], [1.0, 3.0, 5.0, 7.0, 90.0])
    >>> fit.coefficients.tolist()
    [1.0, 2.0]
    """
    xs, ys = finite("x", x), finite("y", y)
    ordinary = line(xs, ys)
    if np.isnan(ordinary.residual_sd):
        return ordinary, float("nan"), float("nan")
    slope, _, low, high = stats.theilslopes(ys, xs, COVERAGE, method="separate")
    half = float(high - low) / 2.0 / float(stats.norm.ppf(0.5 + COVERAGE / 2.0))
    coefficients = np.array([float(np.median(ys) - slope * np.median(xs)), float(slope)])
    fit = _with_line(ordinary, xs, ys, coefficients, np.array([np.nan, half]))
    return fit, float(low), float(high)


def huber(design: ArrayLike, y: ArrayLike, threshold: float = HUBER_THRESHOLD) -> Fit:
    """Regression in which distant points weigh less: M-estimate after Huber.

    Parameters
    ----------
    design : array_like
        Columns, shape (n, p), a column of ones for the intercept.
    y : array_like
        What is fitted, shape (n,).
    threshold : float
        Residual over scale beyond which a point weighs threshold over it; above 0.

    Returns
    -------
    Fit
        `weights` tell which points weigh less; standard errors are asymptotic.

    Raises
    ------
    Impossible
        As `least_squares`.

    Notes
    -----
    Weighted least squares, w = min(1, c s/|e|), s the median |e| over 0.6745, iterated.

    References
    ----------
    Huber, P. J. 1981, "Robust Statistics" (from memory).

    Examples
    --------
    >>> x = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]
    >>> fit = huber([[1.0, v] for v in x], [0.1, 0.9, 2.0, 3.1, 3.9, 50.0])
    >>> bool(fit.weights[-1] < 0.01)
    True
    """
    x, ys = np.asarray(design, dtype=np.float64), np.asarray(y, dtype=np.float64)
    start = least_squares(x, ys)
    if np.isnan(start.residual_sd):
        return start
    n, p = x.shape
    b, rest, weights, scale = start.coefficients, start.residuals, np.ones(n), 0.0
    for _ in range(200):
        scale = float(np.median(np.abs(rest))) / float(stats.norm.ppf(0.75))
        if scale <= 1e-14 * float(np.max(np.abs(ys), initial=1.0)):
            break
        weights = np.minimum(1.0, threshold * scale / np.maximum(np.abs(rest), 1e-300))
        root = np.sqrt(weights)
        before = b
        b = np.asarray(np.linalg.lstsq(x * root[:, np.newaxis], ys * root, rcond=None)[0], np.float64)
        rest = ys - x @ b
        if np.max(np.abs(b - before)) <= 1e-12 * np.max(np.abs(b)):
            break
    inside = np.abs(rest) <= threshold * scale
    share = float(np.mean(inside))
    psi = np.clip(rest, -threshold * scale, threshold * scale)
    k = 1.0 + p / n * (1.0 - share) / share if share else np.nan
    variance = k**2 * float(np.sum(psi**2)) / (n - p) / share**2 if share else np.nan
    errors = np.sqrt(variance * np.diagonal(start.inverse_normal))
    squares = float(np.sum(rest**2))
    return replace(
        start,
        residual_sd=np.asarray((squares / (n - p)) ** 0.5),
        r_squared=np.asarray(1.0 - squares / float(np.sum((ys - ys.mean()) ** 2))),
        coefficients=np.asarray(b),
        standard_errors=np.asarray(errors),
        residuals=rest,
        weights=weights,
    )


# -- trends of permeability on porosity -------------------------------------------------------------------


def _columns(**columns: ArrayLike) -> list[Array]:
    """Columns of one length, each within what it may be."""
    found = []
    for name, values in columns.items():
        if name.startswith("u_"):
            column = not_negative(name, values)
        else:
            column = positive(name, values)
            if name.endswith("_frac"):
                most = 1.0 if name == "water_saturation_frac" else 1.0 - 1e-12
                refuse(column.real > most, name, column, "a fraction above 0 and below 1")
        found.append(column)
    sizes = {column.size for column in found}
    if len(sizes) > 1 or any(column.ndim != 1 for column in found):
        raise Impossible(f"{', '.join(columns)}: wanted columns of one length; found {sorted(sizes)}")
    return found


def semilog_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Fit:
    """Straight line of log10 permeability on porosity, least squares.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], slope [decades per v/v].

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or all porosities are equal.

    Notes
    -----
    lg k = a + b phi, k permeability, phi porosity.

    References
    ----------
    Archie, G. E. 1950, "Introduction to petrophysics of reservoir rocks", AAPG Bull. 34:943-961 (from
    memory).

    Examples
    --------
    >>> semilog_trend([0.10, 0.15, 0.20, 0.25], [1.0, 10.0, 100.0, 1000.0]).coefficients.round(9).tolist()
    [-2.0, 20.0]
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    return line(phi, np.log10(k))


def power_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Fit:
    """Straight line of log10 permeability on log10 porosity, least squares.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], exponent [1].

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or all porosities are equal.

    Notes
    -----
    lg k = a + b lg phi, k permeability, phi porosity: k = 10^a phi^b.

    References
    ----------
    Definition; common practice.

    Examples
    --------
    >>> power_trend([0.1, 0.2, 0.4], [1.0, 16.0, 256.0]).coefficients.round(9).tolist()
    [4.0, 4.0]
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    return line(np.log10(phi), np.log10(k))


def timur_permeability_md(porosity_frac: ArrayLike, water_saturation_frac: ArrayLike) -> Array:
    """Permeability from porosity and residual water saturation, after Timur.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    water_saturation_frac : array_like
        Irreducible water saturation [v/v], above 0, up to 1.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a porosity or a saturation is out of range.

    Notes
    -----
    k = 0.136 (100 phi)^4.4/(100 S)^2, phi porosity, S saturation; with fractions the constant is 8581.

    References
    ----------
    Timur, A. 1968, "An investigation of permeability, porosity, and residual water saturation relationships
    for sandstone reservoirs", The Log Analyst 9(4) (from memory).

    Examples
    --------
    >>> round(float(timur_permeability_md(0.20, 0.30)), 3)
    80.136
    """
    phi, s = (
        positive("porosity_frac", porosity_frac),
        positive("water_saturation_frac", water_saturation_frac),
    )
    refuse(phi.real >= 1.0, "porosity_frac", phi, "a fraction above 0 and below 1")
    refuse(s.real > 1.0, "water_saturation_frac", s, "a fraction above 0, at most 1")
    return np.asarray(0.136 * (100.0 * phi) ** 4.4 / (100.0 * s) ** 2)


def timur_trend(
    porosity_frac: ArrayLike, permeability_md: ArrayLike, water_saturation_frac: ArrayLike
) -> Fit:
    """Timur's law with coefficients of the plugs' own, least squares of log10 permeability.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.
    water_saturation_frac : array_like
        Water saturation [v/v], shape (n,), above 0, up to 1; the law means the irreducible one.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], porosity exponent [1], saturation exponent [1].

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than four plugs, or porosity and saturation do not vary.

    Notes
    -----
    lg k = a + b lg phi + c lg S, k permeability, phi porosity, S water saturation; Timur found b 4.4, c -2,
    a 3.93 (lg 8581).

    References
    ----------
    Timur 1968, The Log Analyst 9(4) (from memory).

    Examples
    --------
    >>> phi, s = [0.1, 0.15, 0.2, 0.25], [0.5, 0.3, 0.35, 0.2]
    >>> timur_trend(phi, timur_permeability_md(phi, s), s).coefficients.round(4).tolist()
    [3.9335, 4.4, -2.0]
    """
    phi, k, s = _columns(
        porosity_frac=porosity_frac,
        permeability_md=permeability_md,
        water_saturation_frac=water_saturation_frac,
    )
    return least_squares(np.column_stack([np.ones_like(phi), np.log10(phi), np.log10(s)]), np.log10(k))


def _kozeny_carman(phi: Array) -> Law:
    def law(threshold: Any) -> tuple[Any, Any]:
        open_part = phi - threshold
        return 3.0 * np.log10(open_part) - 2.0 * np.log10(1.0 - open_part), np.ones((phi.size, 1))

    return law


def kozeny_carman_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Searched:
    """Kozeny & Carman's law with a porosity below which nothing flows, least squares of log10 permeability.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Searched
        Coefficients: intercept lg B [decades], threshold [v/v], from 0 to below the least
        porosity.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than four plugs, or all porosities are equal.

    Notes
    -----
    lg k = lg B + 3 lg(phi - c) - 2 lg(1 - phi + c), k permeability, phi porosity, c threshold, B a constant
    that holds grain size, shape and tortuosity.

    References
    ----------
    Mavko, G. & Nur, A. 1997, "The effect of a percolation threshold in the Kozeny-Carman relation",
    Geophysics 62:1480-1482 (from memory).

    Examples
    --------
    >>> import numpy as np
    >>> phi = np.array([0.08, 0.12, 0.16, 0.2, 0.25])
    >>> k = 1e4 * (phi - 0.03) ** 3 / (1 - phi + 0.03) ** 2
    >>> kozeny_carman_trend(phi, k).fit.coefficients.round(6).tolist()
    [4.0, 0.03]
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    if np.isnan(phi).any() or np.isnan(k).any():
        return _not_searched(phi.size, 2)
    if np.ptp(phi) == 0.0:
        raise Impossible("porosity_frac: found one value in all plugs; wanted plugs that differ in it")
    least = float(phi.min())
    steps = least * (1.0 - np.geomspace(1.0, 1e-3, 80))
    return search(_kozeny_carman(phi), np.log10(k), steps)


def _broken(x: Array) -> Law:
    def law(place: Any) -> tuple[Any, Any]:
        above = np.where(x > np.real(place), x - place, 0.0)
        return np.zeros_like(x), np.column_stack([np.ones_like(x), x, above])

    return law


def broken_line(x: ArrayLike, y: ArrayLike) -> Searched:
    """Two straight lines that meet at a break, which is searched for.

    Coefficients: intercept, slope below, change of slope above, break. At least four points lie on each side.
    Hudson 1966, J. Am. Stat. Assoc. 61:1097-1129 (from memory).
    """
    xs, ys = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
    if xs.size < 2 * LEAST_BESIDE_BREAK:
        raise Impossible(f"x: found {xs.size} points; wanted {2 * LEAST_BESIDE_BREAK} or more for a break")
    ranked = np.sort(xs)
    low, high = ranked[LEAST_BESIDE_BREAK - 1], ranked[-LEAST_BESIDE_BREAK]
    inner = np.unique(ranked)
    if not low < high or np.sum(inner < high) < 2 or np.sum(inner > low) < 2:
        raise Impossible(
            "x: too many points share one value; wanted points that differ on both sides of a break"
        )
    between = inner[(inner >= low) & (inner <= high)]
    tried = np.unique(np.concatenate([np.linspace(low, high, 61), between[:: max(1, between.size // 100)]]))
    law = _broken(xs)

    def bends(c: float) -> bool:
        below = np.unique(xs[xs <= c]).size
        return bool(below >= 2 and np.unique(xs[xs > c]).size >= 1)

    tried = np.array([c for c in tried if bends(float(c))])
    return search(law, ys, tried)


def broken_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Searched:
    """Two straight lines of log10 permeability on porosity that meet at a break, least squares.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Searched
        Coefficients: intercept [decades], slope below [decades per v/v], change of slope above the break,
        break [v/v]. At least four plugs lie on each side.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than eight plugs, or too many share a porosity.

    Notes
    -----
    lg k = a + b phi + d max(phi - c, 0), k permeability, phi porosity, c break.

    References
    ----------
    Hudson, D. J. 1966, "Fitting segmented curves whose join points have to be estimated", J. Am. Stat. Assoc.
    61:1097-1129 (from memory).

    Examples
    --------
    >>> import numpy as np
    >>> phi = np.linspace(0.05, 0.30, 26)
    >>> k = 10 ** (-3 + 30 * phi - 20 * np.maximum(phi - 0.18, 0))
    >>> broken_trend(phi, k).fit.coefficients.round(4).tolist()
    [-3.0, 30.0, -20.0, 0.18]
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    if np.isnan(phi).any() or np.isnan(k).any():
        return _not_searched(phi.size, 4)
    return broken_line(phi, np.log10(k))


def _not_searched(n: int, p: int) -> Searched:
    return Searched(float("nan"), float("nan"), False, np.full(n, np.nan), _missing(n, p))


@dataclass(frozen=True, slots=True)
class YorkTrend:
    """A trend with errors in both variables, and the natural scatter of lg k [decades] that it needed."""

    natural_scatter: float
    mswd: float
    fit: Fit


def york_trend(
    porosity_frac: ArrayLike,
    permeability_md: ArrayLike,
    u_porosity_frac: ArrayLike,
    u_permeability_md: ArrayLike,
) -> YorkTrend:
    """Straight line of log10 permeability on porosity where both have errors, and the rock scatters too.

    Parameters
    ----------
    porosity_frac, u_porosity_frac : array_like
        Porosity and its standard uncertainty [v/v], shape (n,).
    permeability_md, u_permeability_md : array_like
        Permeability and its standard uncertainty [md], shape (n,).

    Returns
    -------
    YorkTrend
        Coefficients: intercept [decades], slope [decades per v/v]; residuals are vertical. `mswd` is that
        without natural scatter.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or all porosities are equal.

    Notes
    -----
    York's line with u(lg k)^2 = (u(k)/(k ln 10))^2 + s^2. Where the stated uncertainties explain the scatter,
    s is 0; else s is such that chi-square equals its degrees of freedom. Without s a few precise plugs would
    draw the line alone.

    References
    ----------
    York et al. 2004, Am. J. Phys. 72:367-375 (from memory); the scatter of the rock as common practice in
    isochron work.

    Examples
    --------
    >>> found = york_trend([0.10, 0.15, 0.20, 0.25], [1.0, 12.0, 90.0, 1100.0], [0.002] * 4, [0.1, 1, 9, 110])
    >>> found.fit.coefficients.round(1).tolist()
    [-2.0, 20.0]
    """
    phi, k, u_phi, u_k = _columns(
        porosity_frac=porosity_frac,
        permeability_md=permeability_md,
        u_porosity_frac=u_porosity_frac,
        u_permeability_md=u_permeability_md,
    )
    lg, u_lg = np.log10(k), u_k / (k * np.log(10.0))
    ordinary = line(phi, lg)
    if np.isnan(u_phi + u_lg).any() or np.isnan(ordinary.residual_sd):
        return YorkTrend(float("nan"), float("nan"), _missing(phi.size, 2))
    first = york(phi, lg, u_phi, u_lg)
    scatter, found = 0.0, first
    if first.mswd > 1.0:

        def beyond(s: float) -> float:
            return york(phi, lg, u_phi, np.hypot(u_lg, s)).mswd - 1.0

        high = 2.0 * float(ordinary.residual_sd) + 1e-12
        while beyond(high) > 0.0:
            high *= 2.0
        scatter = float(optimize.brentq(beyond, 0.0, high, xtol=1e-10))
        found = york(phi, lg, u_phi, np.hypot(u_lg, scatter))
    coefficients = np.array([found.intercept, found.slope])
    return YorkTrend(scatter, first.mswd, _with_line(ordinary, phi, lg, coefficients, found.standard_errors))


def reduced_major_axis_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Fit:
    """Reduced major axis of log10 permeability and porosity.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], slope [decades per v/v]. It treats both variables alike; for
        foreseeing lg k from porosity it is steeper than it should be.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or one of the two does not vary.

    Notes
    -----
    lg k = a + b phi, b = sign(r) s(lg k)/s(phi), s standard deviation, r correlation.

    References
    ----------
    Kermack & Haldane 1950, Biometrika 37:30-41 (from memory).

    Examples
    --------
    >>> reduced_major_axis_trend([0.1, 0.2, 0.3], [1.0, 10.0, 100.0]).coefficients.round(9).tolist()
    [-1.0, 10.0]
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    return reduced_major_axis(phi, np.log10(k))


def theil_sen_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Fit:
    """Line of log10 permeability on porosity by the median of the slopes of all pairs.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], slope [decades per v/v]. The intercept has no standard error.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or all porosities are equal.

    Notes
    -----
    lg k = a + b phi, b the median of (lg k_j - lg k_i)/(phi_j - phi_i), a = median lg k - b median phi.

    References
    ----------
    Theil 1950, Proc. K. Ned. Akad. Wet. 53:386-392; Sen 1968, J. Am. Stat. Assoc. 63:1379-1389 (both from
    memory).

    Examples
    --------
    >>> theil_sen_trend([0.1, 0.2, 0.3, 0.4], [1.0, 10.0, 100.0, 9e9]).coefficients.round(1).tolist()[1] > 10
    True
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    return theil_sen(phi, np.log10(k))[0]


def huber_trend(porosity_frac: ArrayLike, permeability_md: ArrayLike) -> Fit:
    """Line of log10 permeability on porosity in which distant plugs weigh less.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], shape (n,), above 0, below 1.
    permeability_md : array_like
        Permeability [md], shape (n,), above 0.

    Returns
    -------
    Fit
        Coefficients: intercept [decades], slope [decades per v/v]; `weights` tell which plugs weigh less.

    Raises
    ------
    Impossible
        If a value is out of range, there are fewer than three plugs, or all porosities are equal.

    Notes
    -----
    lg k = a + b phi by weighted least squares, w = min(1, 1.345 s/|e|), e residual, s median |e|/0.6745.

    References
    ----------
    Huber 1981, "Robust Statistics" (from memory).

    Examples
    --------
    >>> phi = [0.10, 0.12, 0.15, 0.20, 0.25, 0.30]
    >>> bool(huber_trend(phi, [1.0, 2.6, 11.0, 95.0, 1050.0, 0.01]).weights[-1] < 0.1)
    True
    """
    phi, k = _columns(porosity_frac=porosity_frac, permeability_md=permeability_md)
    return huber(np.column_stack([np.ones_like(phi), phi]), np.log10(k))


_PHI = Symbol("phi", "porosity_frac", "v/v", "porosity")
_K = Symbol("k", "permeability_md", "mD", "permeability")
_FIT = (
    Symbol("s", "residual_sd", "decades", "residual standard deviation of log10 permeability"),
    Symbol("R^2", "r_squared", "1", "share of the variance of log10 permeability"),
    Symbol("b", "coefficients", "", "coefficients in the order of the equation"),
    Symbol("se", "standard_errors", "", "their standard errors"),
    Symbol("e", "residuals", "decades", "measured minus fitted log10 permeability"),
    Symbol("h", "leverages", "1", "leverage of each plug"),
    Symbol("w", "weights", "1", "weight of each plug"),
    Symbol("C", "inverse_normal", "", "inverse of X'X"),
    Symbol("nu", "degrees_of_freedom", "1", "degrees of freedom"),
)
_SEARCHED = (
    Symbol("c_low", "low", "v/v", "lower end of the 95 % interval of what was searched for"),
    Symbol("c_high", "high", "v/v", "upper end of it"),
    Symbol("at end", "at_bound", "", "whether the best value lies at an end of what was searched"),
    Symbol("e_(i)", "left_out", "decades", "residual of each plug from the fit without it"),
    Symbol("fit", "fit", "", "the fit, as of a straight line"),
)
_CERTIFIED = "certified digits of NIST StRD; the plugs of a Norwegian well"


def _trend(
    key: str, title: str, equation: str, source: str, tested: str, compute: Callable[..., Any], **more: Any
) -> Formula:
    return Formula(
        key,
        1,
        title,
        equation,
        more.get("inputs", (_PHI, _K)),
        more.get("outputs", _FIT),
        more.get("valid", "porosities between those of the plugs"),
        source,
        tested,
        compute,
        elementwise=False,
        smooth=more.get("smooth", True),
    )


FORMULAS: tuple[Formula, ...] = (
    _trend(
        "semilog-trend",
        "Log10 permeability on porosity",
        "lg k = a + b phi",
        "Archie 1950, AAPG Bull. 34:943-961 (from memory)",
        _CERTIFIED,
        semilog_trend,
    ),
    _trend(
        "power-trend",
        "Log10 permeability on log10 porosity",
        "lg k = a + b lg phi",
        "common practice",
        _CERTIFIED,
        power_trend,
    ),
    _trend(
        "kozeny-carman-trend",
        "Kozeny & Carman with a percolation threshold",
        "lg k = lg B + 3 lg(phi - c) - 2 lg(1 - phi + c)",
        "Mavko & Nur 1997, Geophysics 62:1480-1482 (from memory)",
        "certified nonlinear sets of NIST StRD; simulated plugs",
        kozeny_carman_trend,
        outputs=_SEARCHED,
        smooth=False,
    ),
    Formula(
        "timur-permeability",
        1,
        "Permeability from porosity and water saturation, Timur",
        "k = 0.136 (100 phi)^4.4/(100 S)^2",
        (_PHI, Symbol("S", "water_saturation_frac", "v/v", "irreducible water saturation")),
        (_K,),
        "sandstones at irreducible water saturation",
        "Timur 1968, The Log Analyst 9(4) (from memory)",
        "worked value; both forms of the constant",
        timur_permeability_md,
    ),
    _trend(
        "timur-trend",
        "Timur's law with coefficients of the plugs' own",
        "lg k = a + b lg phi + c lg S",
        "Timur 1968, The Log Analyst 9(4) (from memory)",
        _CERTIFIED,
        timur_trend,
        inputs=(_PHI, _K, Symbol("S", "water_saturation_frac", "v/v", "water saturation")),
        valid="plugs that hold irreducible water; elsewhere S says more of the fluids than of the rock",
    ),
    _trend(
        "york-trend",
        "Log10 permeability and porosity, errors in both, York",
        "lg k = a + b phi; weights 1/(u(lg k)^2 + s^2 + b^2 u(phi)^2)",
        "York et al. 2004, Am. J. Phys. 72:367-375 (from memory)",
        "Pearson's data with York's weights; orthogonal distance regression",
        york_trend,
        inputs=(
            _PHI,
            _K,
            Symbol("u(phi)", "u_porosity_frac", "v/v", "standard uncertainty of porosity"),
            Symbol("u(k)", "u_permeability_md", "mD", "standard uncertainty of permeability"),
        ),
        outputs=(
            Symbol("s", "natural_scatter", "decades", "scatter of the rock beyond the uncertainties"),
            Symbol("MSWD", "mswd", "1", "chi-square over its degrees of freedom, without that scatter"),
            Symbol("fit", "fit", "", "the fit, as of a straight line"),
        ),
        smooth=False,
    ),
    _trend(
        "reduced-major-axis-trend",
        "Reduced major axis of log10 permeability and porosity",
        "lg k = a + b phi, b = sign(r) s(lg k)/s(phi)",
        "Kermack & Haldane 1950, Biometrika 37:30-41 (from memory)",
        "Pearson's data; geometric mean of the two regressions",
        reduced_major_axis_trend,
    ),
    _trend(
        "theil-sen-trend",
        "Log10 permeability on porosity by the median of slopes",
        "lg k = a + b phi, b = median of (lg k_j - lg k_i)/(phi_j - phi_i)",
        "Theil 1950; Sen 1968, J. Am. Stat. Assoc. 63:1379-1389 (from memory)",
        "Pearson's data; untouched by a wild plug",
        theil_sen_trend,
        smooth=False,
    ),
    _trend(
        "huber-trend",
        "Log10 permeability on porosity, distant plugs weigh less",
        "lg k = a + b phi, w = min(1, 1.345 s/|e|)",
        "Huber 1981, Robust Statistics (from memory)",
        "stack loss data as published; an independent library",
        huber_trend,
        smooth=False,
    ),
    _trend(
        "broken-trend",
        "Log10 permeability on porosity, two lines that meet",
        "lg k = a + b phi + d max(phi - c, 0)",
        "Hudson 1966, J. Am. Stat. Assoc. 61:1097-1129 (from memory)",
        "simulated breaks; exact lines",
        broken_trend,
        outputs=_SEARCHED,
        smooth=False,
    ),
)
