"""From a fit of log10 permeability back to permeability: what the antilogarithm loses, and two remedies.

The antilogarithm of a fitted log10 k is the median permeability at that porosity, not the mean. Both factors
below turn it into a mean where the scatter is alike at all porosities; where it is not they may well
overcorrect. They are shown beside a fit and never applied to it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.formula import Array, Formula, Symbol, finite, not_negative

CAVEAT = (
    "the curve is the median permeability at a porosity, not the mean; the factors hold where the scatter is "
    "alike at all porosities and are not applied"
)


def duan_factor(residuals_decades: ArrayLike) -> Array:
    """Factor that turns the antilogarithm of a fit into a mean, whatever the residuals' distribution.

    Parameters
    ----------
    residuals_decades : array_like
        Measured minus fitted log10 permeability, shape (n,) [decades].

    Returns
    -------
    Array
        Factor [1], a scalar. NaN where a residual is missing.

    Raises
    ------
    Impossible
        If a residual is infinite.

    Notes
    -----
    f = mean of 10^e, e residual.

    References
    ----------
    Duan, N. 1983, "Smearing estimate: a nonparametric retransformation method", J. Am. Stat. Assoc.
    78:605-610 (from memory).

    Examples
    --------
    >>> round(float(duan_factor([-0.3, -0.1, 0.0, 0.1, 0.3])), 6)
    1.109941
    """
    return np.asarray(np.mean(10.0 ** finite("residuals_decades", residuals_decades)))


def lognormal_factor(residual_sd_decades: ArrayLike) -> Array:
    """Factor that turns the antilogarithm of a fit into a mean, for normal residuals of log10 permeability.

    Parameters
    ----------
    residual_sd_decades : array_like
        Residual standard deviation of log10 permeability [decades], 0 or more.

    Returns
    -------
    Array
        Factor [1], shape of the input.

    Raises
    ------
    Impossible
        If a standard deviation is negative or infinite.

    Notes
    -----
    f = 10^(s^2 ln(10)/2), s residual standard deviation.

    References
    ----------
    Aitchison, J. & Brown, J. A. C. 1957, "The Lognormal Distribution" (from memory).

    Examples
    --------
    >>> round(float(lognormal_factor(0.684253668830714**0.5)), 4)
    6.1345
    """
    return np.asarray(
        10.0 ** (np.log(10.0) / 2.0 * not_negative("residual_sd_decades", residual_sd_decades) ** 2)
    )


FORMULAS: tuple[Formula, ...] = (
    Formula(
        "duan-factor",
        1,
        "Back-transformation of a logarithmic fit, any distribution",
        "f = mean of 10^e",
        (Symbol("e", "residuals_decades", "decades", "measured minus fitted log10 permeability"),),
        (Symbol("f", "factor", "1", "mean over median permeability"),),
        "residuals that scatter alike at all porosities; overcorrects where they do not",
        "Duan 1983, J. Am. Stat. Assoc. 78:605-610 (from memory)",
        "a set worked by hand; the plugs of a Norwegian well",
        duan_factor,
        elementwise=False,
    ),
    Formula(
        "lognormal-factor",
        1,
        "Back-transformation of a logarithmic fit, normal residuals",
        "f = 10^(s^2 ln(10)/2)",
        (Symbol("s", "residual_sd_decades", "decades", "residual standard deviation of log10 permeability"),),
        (Symbol("f", "factor", "1", "mean over median permeability"),),
        "normal residuals that scatter alike at all porosities",
        "Aitchison & Brown 1957, The Lognormal Distribution (from memory)",
        "mean of the log-normal distribution; the plugs of a Norwegian well",
        lognormal_factor,
    ),
)
