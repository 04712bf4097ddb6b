"""The likelihood that the impact of a sidewall bullet changed a plug enough to matter.

*Event*: porosity changed by more than 0.02 (2 porosity units), or permeability by more than a factor of 2.
*Damage* is of three kinds. Soft sand is compacted (porosity down, permeability down) or loosened (porosity
up, permeability up or unchanged); hard rock is shattered (porosity and permeability up). Each kind is laid
out as equally likely *changes* within stated bounds (`damage`); evidence asks how well a measurement fits a
change, against none. A term counts by the logarithm of the ratio of the two, given the terms before it, so
that what two terms share counts once (`weigh`).

Porosities are fractions, permeabilities in decades of mD. Nothing here was fitted to a simulation: each
constant has its source beside it, or says 'assumed'.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from corelab.science.formula import Array, Formula, Mask, Symbol, finite, positive, refuse

EVENT_POROSITY_FRAC = 0.02
EVENT_DECADES = float(np.log10(2.0))
"""What matters: the definition of the event."""

CAP = float(np.log(10.0))
"""No term counts for more than a factor of 10 in the odds (assumed: evidence of one kind can be wrong)."""

KINDS = ("compacted", "loosened", "shattered")
COMPACTED_SHARE = 2.0 / 3.0
"""Share of damaged soft plugs that are compacted (assumed: falling porosity is the textbook direction)."""
MOST_CHANGE_FRAC = MappingProxyType({"compacted": 0.08, "loosened": 0.08, "shattered": 0.05})
"""Greatest change of porosity (assumed): sand at 0.35 down to the densest packing of equal spheres at 0.26,
or up to the loosest at 0.43; hard rock opened by cracks."""
CRUSHED_ZONE = 0.3
"""Least of permeability that crushed grains leave beside what porosity takes: the crushed zone about a
perforation keeps 30 to 70 % (PetroWiki, glossary, 'perforation crush zone')."""
CRACKED = 100.0
"""Greatest rise of permeability by cracks: about 100 times before failure, an upper bound from granite
(Mitchell & Faulkner 2008, abstract; J. Geophys. Res. 113, B11412, from memory)."""
SOUND_FRAC, SOUND_DECADES = 0.005, 0.25 * EVENT_DECADES
"""What impact does to a plug that counts as sound: a quarter of the event, as a standard deviation (assumed:
the stress of any bullet passes the onset of crushing at its nose, so nothing is quite untouched)."""
MOST_FREEDOM = 10.0
"""Errors have longer tails than a normal distribution, however many plugs a scale comes from (assumed)."""
PACKING_MARGIN_FRAC = 0.05
"""Field sands agree with packed ones within 0.05 (Beard & Weyl 1973, AAPG Bull. 57:349-369, abstract)."""
PACKING_SCALE_FRAC = 0.02
"""How sharply the limit of packing is held, as a standard deviation (assumed)."""
CUBIC_PACKING_FRAC = 0.4764
"""The loosest regular packing of equal spheres: 1 - pi/6."""
FINES_ADDED_FRAC = MappingProxyType({"compacted": 0.10, "loosened": 0.03, "shattered": 0.06})
"""Greatest share of fines that damage adds (assumed: shear bands with crushed grains are finer, those of mere
grain flow hardly)."""

CONDITION = MappingProxyType(
    {
        "powdered": (0.05, 0.28, 0.18, 0.17),
        "cracked": (0.08, 0.10, 0.08, 0.35),
        "crumbled": (0.06, 0.15, 0.25, 0.08),
        "disked": (0.03, 0.05, 0.05, 0.08),
        "chipped": (0.10, 0.07, 0.07, 0.10),
        "intact": (0.68, 0.35, 0.37, 0.22),
    }
)
"""How often a percussion plug is described so, by the mark that tells most: sound, compacted, loosened,
shattered. Assumed: powder and shards in soft sand, cracks in hard rock (textbook directions), a third of
damaged plugs looking well, one sound plug in seven looking damaged."""

UNLIKELY, LIKELY = 0.2, 0.7
"""Limits of the verdicts."""
RECALIBRATION_LABELS = 30
"""Least number of judged plugs for two parameters (common practice)."""


def kozeny_carman_change_decades(porosity_before_frac: ArrayLike, porosity_after_frac: ArrayLike) -> Array:
    """Change of permeability that follows a change of porosity alone, after Kozeny and Carman.

    Parameters
    ----------
    porosity_before_frac, porosity_after_frac : array_like
        Porosity before and after [v/v], between 0 and 1.

    Returns
    -------
    Array
        log10 of the ratio of permeabilities [decades], broadcast shape.

    Raises
    ------
    Impossible
        If a porosity is not between 0 and 1.

    Notes
    -----
    log10(k1/k0) = 3 log10(phi1/phi0) - 2 log10((1 - phi1)/(1 - phi0)), the grains unchanged. Cracks do more.

    References
    ----------
    Carman, P. C. 1937, Trans. Inst. Chem. Eng. 15:150-166 (from memory).

    Examples
    --------
    >>> round(10 ** float(kozeny_carman_change_decades(0.35, 0.30)), 3)
    0.543
    """
    before = positive("porosity_before_frac", porosity_before_frac)
    after = positive("porosity_after_frac", porosity_after_frac)
    refuse(before.real >= 1.0, "porosity_before_frac", before, "a fraction below 1")
    refuse(after.real >= 1.0, "porosity_after_frac", after, "a fraction below 1")
    return 3.0 * np.log10(after / before) - 2.0 * np.log10((1.0 - after) / (1.0 - before))


def density_porosity_frac(
    bulk_density_g_cm3: ArrayLike, matrix_density_g_cm3: ArrayLike, fluid_density_g_cm3: ArrayLike
) -> Array:
    """Porosity from the density log.

    Parameters
    ----------
    bulk_density_g_cm3, matrix_density_g_cm3, fluid_density_g_cm3 : array_like
        Log reading, density of the grains and of what fills the pores [g/cm3], above 0; the grains denser
        than the fluid.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape; below 0 or above 1 where the densities do not fit the rock.

    Raises
    ------
    Impossible
        If a density is not above 0, or the matrix not denser than the fluid.

    Notes
    -----
    phi = (rho_ma - rho_b)/(rho_ma - rho_f). An error of 0.02 g/cm3 in rho_b moves it by 0.012.

    References
    ----------
    Definition: balance of mass.

    Examples
    --------
    >>> round(float(density_porosity_frac(2.2, 2.65, 1.0)), 4)
    0.2727
    """
    bulk = positive("bulk_density_g_cm3", bulk_density_g_cm3)
    matrix = positive("matrix_density_g_cm3", matrix_density_g_cm3)
    fluid = positive("fluid_density_g_cm3", fluid_density_g_cm3)
    refuse(
        matrix.real <= fluid.real, "matrix_density_g_cm3", matrix + 0 * fluid, "a density above the fluid's"
    )
    return (matrix - bulk) / (matrix - fluid)


# ---- how the references predict


@dataclass(frozen=True, slots=True)
class Prediction:
    """What undamaged plugs let one expect: centre, scale and degrees of freedom of Student's t."""

    centre: Array
    scale: Array
    freedom: Array


@dataclass(frozen=True, slots=True)
class Line:
    """A straight line through undamaged plugs, and what it predicts."""

    slope: float
    predicted: Prediction
    own: Prediction
    """For each plug of the fit: the prediction of the others."""


def predict_line(x_fit: ArrayLike, y_fit: ArrayLike, x: ArrayLike) -> Line:
    """Prediction of y at `x` from a straight line, and of each plug of the fit from the others.

    (y - centre)/scale of `own` is the external studentised residual: t of n - 3 degrees of freedom.

    >>> fit = [0.18, 0.20, 0.22, 0.24, 0.26, 0.28, 0.30], [1.62, 1.90, 2.22, 2.41, 2.73, 2.98, 3.31]
    >>> line = predict_line(*fit, [0.25])
    >>> round(float((1.55 - line.predicted.centre[0]) / line.predicted.scale[0]), 2)
    -30.12
    """
    xf, yf, at = (np.asarray(v, dtype=np.float64) for v in (x_fit, y_fit, x))
    n = xf.size
    middle = xf.mean()
    spread = np.sum((xf - middle) ** 2)
    slope = float(np.sum((xf - middle) * yf) / spread) if spread > 0 else 0.0
    intercept = yf.mean()
    residual = yf - intercept - slope * (xf - middle)
    squares = float(np.sum(residual**2))
    freedom = n - 2.0

    def leverage(values: Array) -> Array:
        return 1.0 / n + ((values - middle) ** 2 / spread if spread > 0 else 0.0 * values)

    predicted = Prediction(
        intercept + slope * (at - middle),
        np.sqrt(squares / freedom * (1.0 + leverage(at))),
        np.full(at.shape, freedom),
    )
    kept = np.maximum(1.0 - leverage(xf), 1e-12)
    without = np.sqrt(np.maximum(squares - residual**2 / kept, 0.0) / (freedom - 1.0))
    own = Prediction(yf - residual / kept, without / np.sqrt(kept), np.full(n, freedom - 1.0))
    return Line(slope, predicted, own)


def predict_level(
    values: ArrayLike, weights: ArrayLike, centre: float, scale: float, prior_plugs: float, freedom: float
) -> tuple[Prediction, Prediction]:
    """Prediction of one more value from those of undamaged plugs and what is assumed before them.

    Parameters
    ----------
    values, weights : array_like (n,)
        What was found, and how much each counts (1 for a value of the usual scatter).
    centre, scale, prior_plugs, freedom
        Assumed before: centre worth so many plugs, scale worth so many degrees of freedom.

    Returns
    -------
    predicted, own
        Of one more value (shape ()), and of each from the others (n,).

    Notes
    -----
    Normal values with conjugate priors (Gelman et al. 2013, "Bayesian data analysis", sec. 3.3, from memory):
    k = k0 + W, m = (k0 m0 + sum w x)/k, nu = nu0 + n, nu s^2 = nu0 s0^2 + sum w (x - xbar)^2 + k0 W/k (xbar -
    m0)^2; predicted: t of nu degrees about m with scale s sqrt(1 + 1/k).

    >>> predicted, _ = predict_level([0.010, 0.014, 0.012], [1.0] * 3, 0.0, 0.02, 0.5, 4.0)
    >>> round(float(predicted.centre), 4), float(predicted.freedom)
    (0.0103, 7.0)
    """
    x, w = np.asarray(values, dtype=np.float64), np.asarray(weights, dtype=np.float64)

    def of(total: Array, first: Array, second: Array, count: Array) -> Prediction:
        """From the sums of w, w x and w x^2."""
        plugs = prior_plugs + total
        mean = np.divide(first, total, out=np.full_like(total, centre), where=total > 0)
        within = np.maximum(second - total * mean**2, 0.0)
        nu = freedom + count
        squares = freedom * scale**2 + within + prior_plugs * total / plugs * (mean - centre) ** 2
        return Prediction(
            (prior_plugs * centre + first) / plugs, np.sqrt(squares / nu * (1.0 + 1.0 / plugs)), nu
        )

    sums = [np.asarray(np.sum(v)) for v in (w, w * x, w * x**2)]
    count = np.asarray(float(x.size))
    predicted = of(sums[0], sums[1], sums[2], count)
    own = of(sums[0] - w, sums[1] - w * x, sums[2] - w * x**2, np.full(x.size, x.size - 1.0))
    return predicted, own


# ---- what damage does


@dataclass(frozen=True, slots=True)
class Damage:
    """Changes that impact may have made: (s,) kinds, and (n, s) for n plugs.

    `log_share` is the logarithm of how likely each is among damaged plugs, -inf where it would not matter;
    `width_decades` the standard deviation of the step of permeability that each stands for.
    """

    kind: NDArray[np.intp]
    porosity_change_frac: Array
    permeability_change_decades: Array
    width_decades: Array
    log_share: Array


POROSITY_STEPS, PERMEABILITY_STEPS = 8, 6


def damage(porosity_frac: ArrayLike, slope_decades: ArrayLike, soft_share: ArrayLike) -> Damage:
    """The changes to weigh for each plug.

    Parameters
    ----------
    porosity_frac : array_like (n,)
        Porosity as measured, after the impact [v/v].
    slope_decades : array_like (n,)
        Slope of the undamaged trend [decades per v/v]; NaN where there is none.
    soft_share : array_like (n,)
        Probability that the rock is soft.

    Notes
    -----
    Porosity changes evenly up to `MOST_CHANGE_FRAC`. Permeability evenly between bounds: compacted, from what
    porosity alone takes (Kozeny-Carman or along the trend, the lesser) to the greater of the two and 30 % of
    that; loosened, from unchanged to what porosity alone gives (the greater); shattered, from what porosity
    alone gives (Kozeny-Carman: cracks do more) to 100 times. Changes below the event are left out.
    """
    phi = np.clip(np.asarray(porosity_frac, dtype=np.float64), 0.005, 0.60)[:, np.newaxis]
    slope = np.asarray(slope_decades, dtype=np.float64)[:, np.newaxis]
    soft = np.asarray(soft_share, dtype=np.float64)
    parts = (np.arange(PERMEABILITY_STEPS) + 0.5) / PERMEABILITY_STEPS
    steps = (np.arange(POROSITY_STEPS) + 0.5) / POROSITY_STEPS
    shares = {
        "compacted": soft * COMPACTED_SHARE,
        "loosened": soft * (1.0 - COMPACTED_SHARE),
        "shattered": 1.0 - soft,
    }
    changes, decades, widths, log_shares = [], [], [], []
    for kind in KINDS:
        sign = -1.0 if kind == "compacted" else 1.0
        change = sign * MOST_CHANGE_FRAC[kind] * steps[np.newaxis, :]
        alone = kozeny_carman_change_decades(np.clip(phi - change, 0.005, 0.60), phi)
        along = np.where(np.isnan(slope), alone, slope * change)
        least, most = np.minimum(alone, along), np.maximum(alone, along)
        if kind == "compacted":
            low, high = least + np.log10(CRUSHED_ZONE), most
        elif kind == "loosened":
            low, high = np.zeros_like(most), most
        else:
            low, high = alone, np.maximum(alone, np.log10(CRACKED))
        moved = low[:, :, np.newaxis] + (high - low)[:, :, np.newaxis] * parts
        shifted = np.broadcast_to(change[:, :, np.newaxis], moved.shape)
        matters = (np.abs(shifted) > EVENT_POROSITY_FRAC) | (np.abs(moved) > EVENT_DECADES)
        flat = moved.shape[0], POROSITY_STEPS * PERMEABILITY_STEPS
        count = matters.reshape(flat).sum(axis=1)
        with np.errstate(divide="ignore"):
            share = np.log(shares[kind]) - np.log(count)
        log_shares.append(np.where(matters.reshape(flat), share[:, np.newaxis], -np.inf))
        changes.append(shifted.reshape(flat))
        decades.append(moved.reshape(flat))
        width = (high - low) / PERMEABILITY_STEPS / np.sqrt(12.0)
        widths.append(np.repeat(width, PERMEABILITY_STEPS, axis=1))
    each = POROSITY_STEPS * PERMEABILITY_STEPS
    return Damage(
        np.repeat(np.arange(len(KINDS)), each),
        np.concatenate(changes, axis=1),
        np.concatenate(decades, axis=1),
        np.concatenate(widths, axis=1),
        np.concatenate(log_shares, axis=1),
    )


# ---- the terms: how well evidence fits a change


def _student(residual: Array, scale_: Array, freedom: Array) -> Array:
    """Logarithm of the density of Student's t."""
    half = 0.5 * (freedom + 1.0)
    constant = special.loggamma(half) - special.loggamma(0.5 * freedom) - 0.5 * np.log(np.pi * freedom)
    return constant - np.log(scale_) - half * np.log1p((residual / scale_) ** 2 / freedom)


def permeability_fit(
    residual_decades: ArrayLike,
    scale_decades: ArrayLike,
    freedom: ArrayLike,
    slope_decades: ArrayLike,
    porosity_change_frac: ArrayLike,
    permeability_change_decades: ArrayLike,
) -> Array:
    """How well a measured permeability fits a change: log density of its residual from the undamaged trend.

    Parameters
    ----------
    residual_decades : array_like
        log10 of measured permeability less the trend of the other plugs at the plug's porosity [decades].
    scale_decades : array_like
        Scale of that prediction [decades], above 0.
    freedom : array_like
        Its degrees of freedom, above 0.
    slope_decades : array_like
        Slope of the trend [decades per v/v].
    porosity_change_frac : array_like
        Change of porosity [v/v].
    permeability_change_decades : array_like
        Change of permeability [decades].

    Returns
    -------
    Array
        Log density [1/decades], broadcast shape.

    Raises
    ------
    Impossible
        If a scale or the degrees of freedom are not above 0.

    Notes
    -----
    ln t_nu((r - (dK - b dphi))/s) - ln s: a plug that slides along the trend (dK = b dphi) leaves no
    residual.

    References
    ----------
    Student's t of an external studentised residual: Cook, R. D. & Weisberg, S. 1982, "Residuals and influence
    in regression", ch. 2 (from memory).

    Examples
    --------
    >>> sound = permeability_fit(-0.6, 0.2, 20.0, 15.0, 0.0, 0.0)
    >>> crushed = permeability_fit(-0.6, 0.2, 20.0, 15.0, -0.04, -1.2)
    >>> round(float(crushed - sound), 2)
    3.9
    """
    residual, s, nu, b, dphi, dk = (
        finite("residual_decades", residual_decades),
        positive("scale_decades", scale_decades),
        positive("freedom", freedom),
        finite("slope_decades", slope_decades),
        finite("porosity_change_frac", porosity_change_frac),
        finite("permeability_change_decades", permeability_change_decades),
    )
    return _student(residual - (dk - b * dphi), s, nu)


def density_fit(
    difference_frac: ArrayLike, scale_frac: ArrayLike, freedom: ArrayLike, porosity_change_frac: ArrayLike
) -> Array:
    """How well plug porosity against the density log fits a change.

    Parameters
    ----------
    difference_frac : array_like
        Plug porosity less log porosity, less the same of undamaged plugs of the rock class [v/v].
    scale_frac : array_like
        Scale of that prediction [v/v], above 0.
    freedom : array_like
        Its degrees of freedom, above 0.
    porosity_change_frac : array_like
        Change of porosity [v/v].

    Returns
    -------
    Array
        Log density [1/(v/v)], broadcast shape.

    Raises
    ------
    Impossible
        If a scale or the degrees of freedom are not above 0.

    Notes
    -----
    ln t_nu((d - dphi)/s) - ln s.

    References
    ----------
    Student's t: Gosset, W. S. ('Student') 1908, Biometrika 6:1-25 (from memory).

    Examples
    --------
    >>> round(float(density_fit(-0.05, 0.015, 30.0, -0.05) - density_fit(-0.05, 0.015, 30.0, 0.0)), 2)
    4.88
    """
    return _student(
        finite("difference_frac", difference_frac) - finite("porosity_change_frac", porosity_change_frac),
        positive("scale_frac", scale_frac),
        positive("freedom", freedom),
    )


def neighbours_fit(
    difference_frac: ArrayLike,
    scale_frac: ArrayLike,
    freedom: ArrayLike,
    shared: ArrayLike,
    porosity_change_frac: ArrayLike,
) -> Array:
    """How well plug porosity against its neighbours of the bed fits a change.

    Parameters
    ----------
    difference_frac : array_like
        Plug porosity less that of its neighbours, less what the density log told of it already [v/v].
    scale_frac : array_like
        Scale of that prediction [v/v], above 0.
    freedom : array_like
        Its degrees of freedom, above 0.
    shared : array_like
        Share of the difference from the log that comes again in the difference from neighbours [1], 0 to 1.
    porosity_change_frac : array_like
        Change of porosity [v/v].

    Returns
    -------
    Array
        Log density [1/(v/v)], broadcast shape.

    Raises
    ------
    Impossible
        If a scale or the degrees of freedom are not above 0, or the share below 0.

    Notes
    -----
    ln t_nu((e - beta d - (1 - beta) dphi)/s) - ln s, beta the slope of e on d among undamaged plugs.

    References
    ----------
    Regression of one difference on the other; Student's t: Gosset 1908, Biometrika 6:1-25 (from memory).

    Examples
    --------
    >>> round(float(neighbours_fit(-0.05, 0.015, 30.0, 0.0, -0.05)), 2)
    3.27
    """
    beta = finite("shared", shared)
    refuse(beta.real < 0.0, "shared", beta, "0 or more")
    change = finite("porosity_change_frac", porosity_change_frac)
    return _student(
        finite("difference_frac", difference_frac) - (1.0 - beta) * change,
        positive("scale_frac", scale_frac),
        positive("freedom", freedom),
    )


def packing_fit(porosity_frac: ArrayLike, packing_frac: ArrayLike, porosity_change_frac: ArrayLike) -> Array:
    """How well the porosity before impact fits what grains of this sorting can be packed to.

    Parameters
    ----------
    porosity_frac : array_like
        Plug porosity [v/v], 0 or more.
    packing_frac : array_like
        Porosity of a packed clean sand of this sorting [v/v], 0 or more.
    porosity_change_frac : array_like
        Change of porosity [v/v].

    Returns
    -------
    Array
        Log of the fit, 0 or less [1], broadcast shape.

    Raises
    ------
    Impossible
        If a porosity is negative.

    Notes
    -----
    -((phi - dphi - phi_p - 0.05)/0.02)^2/2 where the bracket is positive, else 0. A porosity below the
    packing says nothing: cement and burial lower it too.

    References
    ----------
    Beard, D. C. & Weyl, P. K. 1973, AAPG Bull. 57:349-369: field sands within 0.05 of the packed ones
    (abstract). The width 0.02 is assumed.

    Examples
    --------
    >>> round(float(packing_fit(0.47, 0.38, 0.0)), 6), float(packing_fit(0.47, 0.38, 0.04))
    (-2.0, 0.0)
    """
    phi, packed = finite("porosity_frac", porosity_frac), finite("packing_frac", packing_frac)
    refuse(phi.real < 0.0, "porosity_frac", phi, "0 or more")
    refuse(packed.real < 0.0, "packing_frac", packed, "0 or more")
    change = finite("porosity_change_frac", porosity_change_frac)
    excess = (phi - change - packed - PACKING_MARGIN_FRAC) / PACKING_SCALE_FRAC
    return np.where(np.isnan(excess) | (excess.real > 0.0), -0.5 * excess**2, 0.0)


def fines_fit(
    excess_frac: ArrayLike, scale_frac: ArrayLike, freedom: ArrayLike, fines_added_frac: ArrayLike
) -> Array:
    """How well the share of fines, where sieved, fits the fines that damage adds.

    Parameters
    ----------
    excess_frac : array_like
        Share by mass below the sand limit, less that of undamaged plugs of the facies [v/v].
    scale_frac : array_like
        Scale of that prediction [v/v], above 0.
    freedom : array_like
        Its degrees of freedom, above 0.
    fines_added_frac : array_like
        Share of fines added [v/v].

    Returns
    -------
    Array
        Log density [1/(v/v)], broadcast shape.

    Raises
    ------
    Impossible
        If a scale or the degrees of freedom are not above 0.

    Notes
    -----
    ln t_nu((f - df)/s) - ln s.

    References
    ----------
    Crushing makes fines: Hardin, B. O. 1985, J. Geotech. Eng. 111:1177-1192 (from memory); amounts assumed.

    Examples
    --------
    >>> round(float(fines_fit(0.06, 0.02, 8.0, 0.06) - fines_fit(0.06, 0.02, 8.0, 0.0)), 2)
    3.39
    """
    return _student(
        finite("excess_frac", excess_frac) - finite("fines_added_frac", fines_added_frac),
        positive("scale_frac", scale_frac),
        positive("freedom", freedom),
    )


def telling_mark(conditions: ArrayLike) -> NDArray[np.str_]:
    """The mark that tells most among those of a description; empty where none bears.

    >>> telling_mark(["intact, mudcake", "chipped, cracked", "short"]).tolist()
    ['intact', 'cracked', '']
    """
    texts = np.asarray(conditions, dtype=np.str_)
    unique, places = np.unique(texts, return_inverse=True)
    marks = []
    for text in unique:
        words = {word.strip() for word in str(text).casefold().split(",")}
        marks.append(next((mark for mark in CONDITION if mark in words), ""))
    return np.array(marks, dtype=np.str_)[places.reshape(texts.shape)]


def condition_fit(mark: ArrayLike, kind: ArrayLike) -> Array:
    """How often a plug of each kind is described so, as a logarithm.

    Parameters
    ----------
    mark : text or array of texts
        Powdered, cracked, crumbled, disked, chipped or intact; empty where nothing is said.
    kind : text or array of texts
        Sound, compacted, loosened or shattered; empty where not known.

    Returns
    -------
    Array
        Log of the share [1], broadcast shape; NaN where a text is empty.

    Raises
    ------
    Impossible
        If a mark or a kind is not among these.

    Notes
    -----
    ln P(mark | kind), from a table. Firmness is not asked: it is the rock's, not the impact's.

    References
    ----------
    Assumed; no published frequencies were found up to 2026. Directions are textbook ones: powder and shards
    in soft sand, cracks in hard rock.

    Examples
    --------
    >>> fit = condition_fit("cracked", ["shattered", "sound"])
    >>> round(float(fit[0] - fit[1]), 2)
    1.48
    """
    kinds = ("sound", *KINDS)
    marks, names = np.broadcast_arrays(np.asarray(mark, dtype=np.str_), np.asarray(kind, dtype=np.str_))
    refuse((marks != "") & ~np.isin(marks, list(CONDITION)), "mark", marks, f"one of {', '.join(CONDITION)}")
    refuse((names != "") & ~np.isin(names, kinds), "kind", names, f"one of {', '.join(kinds)}")
    found = np.full(marks.shape, np.nan)
    for word, shares in CONDITION.items():
        for name, share in zip(kinds, shares, strict=True):
            found[(marks == word) & (names == name)] = np.log(share)
    return found


# ---- weighing


@dataclass(frozen=True, slots=True)
class Term:
    """One kind of evidence: its fit without damage (n,), to each change (n, s), and its weight (n,).

    NaN without damage: no evidence.
    """

    name: str
    sound: Array
    damaged: Array
    weight: Array


@dataclass(frozen=True, slots=True)
class Weighed:
    """Log-odds: (n, t) each term's ratio given those before, capped; and what it adds, its weight counted.

    `kinds` (n, 3) is how likely each kind is, if there is damage.
    """

    ratio: Array
    effect: Array
    kinds: Array

    @property
    def total(self) -> Array:
        return np.asarray(self.effect.sum(axis=1))


def weigh(terms: Sequence[Term], changes: Damage) -> Weighed:
    """Count each term by its log-likelihood ratio given the terms before it.

    The ratio of all terms together is that of a mixture of changes against none; the share of a term is what
    it adds to that. What two terms share is so counted once, in the first. Each share is capped at a factor
    of 10, then weighted; a missing term adds 0.
    """
    shares = changes.log_share
    n = shares.shape[0]
    ratio, effect = np.zeros((n, len(terms))), np.zeros((n, len(terms)))
    damaged = shares
    for place, term in enumerate(terms):
        there = np.isfinite(term.sound) & (term.weight > 0.0)
        weight = np.where(there, term.weight, 0.0)
        own = np.where(there, term.sound, 0.0)
        fit = np.where(there[:, np.newaxis], term.damaged, 0.0)
        added = special.logsumexp(damaged + fit, axis=1) - special.logsumexp(damaged, axis=1) - own
        ratio[:, place] = np.clip(np.where(there, added, 0.0), -CAP, CAP)
        effect[:, place] = weight * ratio[:, place]
        damaged = damaged + weight[:, np.newaxis] * fit
    kinds = np.stack(
        [special.logsumexp(damaged[:, changes.kind == kind], axis=1) for kind in range(len(KINDS))], axis=1
    )
    return Weighed(ratio, effect, special.softmax(kinds, axis=1))


def likelihood_frac(prior_frac: ArrayLike, evidence_log_odds: ArrayLike) -> Array:
    """Probability of the event from what was believed before and what the evidence adds.

    Parameters
    ----------
    prior_frac : array_like
        Probability before any evidence [v/v], between 0 and 1.
    evidence_log_odds : array_like
        Sum of the effects of the terms on the log-odds [1].

    Returns
    -------
    Array
        Probability [v/v], broadcast shape.

    Raises
    ------
    Impossible
        If a prior is not between 0 and 1.

    Notes
    -----
    logit p = logit(prior) + sum of w_i ln LR_i, logit x = ln(x/(1 - x)).

    References
    ----------
    Good, I. J. 1950, "Probability and the weighing of evidence" (from memory).

    Examples
    --------
    >>> round(float(likelihood_frac(0.3, np.log(4 * 2.5 * 0.5 * 1.5))), 4)
    0.7627
    """
    prior = positive("prior_frac", prior_frac)
    refuse(prior.real >= 1.0, "prior_frac", prior, "a fraction below 1")
    return 1.0 / (1.0 + (1.0 - prior) / prior * np.exp(-finite("evidence_log_odds", evidence_log_odds)))


def verdicts(likelihood_frac: ArrayLike, assessed: ArrayLike) -> NDArray[np.str_]:
    """`unlikely` below 0.2, `likely` from 0.7, `possible` between; `not assessed` where no evidence bears.

    >>> verdicts([0.1, 0.3, 0.7, 0.3], [True, True, True, False]).tolist()
    ['unlikely', 'possible', 'likely', 'not assessed']
    """
    p = np.asarray(likelihood_frac, dtype=np.float64)
    words = np.where(p < UNLIKELY, "unlikely", np.where(p >= LIKELY, "likely", "possible"))
    return np.where(np.asarray(assessed, dtype=np.bool_), words, "not assessed")


# ---- how good, and made better by verdicts of persons


@dataclass(frozen=True, slots=True)
class Skill:
    """How good probabilities are: Brier score, that of the base rate, skill with its 95 % interval, AUC."""

    brier: float
    base_brier: float
    skill: float
    low: float
    high: float
    auc: float
    mean: float
    rate: float


def skill(probability_frac: ArrayLike, damaged: ArrayLike, resamples: int = 1000, seed: int = 0) -> Skill:
    """Skill of probabilities against what was found; the interval by resampling plugs (percentiles).

    Brier skill = 1 - mean (p - y)^2/(ybar (1 - ybar)); AUC is the share of pairs ranked right.

    >>> y = [1, 0, 1, 1, 0, 0, 1, 0, 0, 0]
    >>> p = [0.9, 0.2, 0.7, 0.4, 0.3, 0.1, 0.8, 0.6, 0.2, 0.1]
    >>> found = skill(p, y)
    >>> round(found.brier, 3), round(found.skill, 4), round(found.auc, 4)
    (0.105, 0.5625, 0.9583)
    """
    p, y = np.asarray(probability_frac, dtype=np.float64), np.asarray(damaged, dtype=np.float64)

    def of(at: NDArray[np.intp]) -> tuple[Array, Array]:
        rate = y[at].mean(axis=-1)
        return ((p[at] - y[at]) ** 2).mean(axis=-1), rate * (1.0 - rate)

    brier, base = (float(v) for v in of(np.arange(p.size)))
    drawn = np.random.default_rng(seed).integers(0, p.size, (resamples, p.size))
    scores, bases = of(drawn)
    kept = bases > 0.0
    low, high = np.percentile(1.0 - scores[kept] / bases[kept], [2.5, 97.5]) if kept.any() else (np.nan,) * 2
    ranks = np.empty(p.size)
    _, place, count = np.unique(p, return_inverse=True, return_counts=True)
    ranks = (np.cumsum(count) - 0.5 * (count - 1.0))[place]
    ones, zeros = y.sum(), (1.0 - y).sum()
    auc = (ranks[y == 1].sum() - ones * (ones + 1.0) / 2.0) / (ones * zeros) if ones and zeros else np.nan
    return Skill(
        brier,
        base,
        1.0 - brier / base if base > 0 else float("nan"),
        float(low),
        float(high),
        float(auc),
        float(p.mean()),
        float(y.mean()),
    )


@dataclass(frozen=True, slots=True)
class Recalibration:
    """logit p' = logit(prior) + intercept + slope x (sum of effects); 0 and 1 change nothing."""

    intercept: float = 0.0
    slope: float = 1.0


def recalibrate(evidence_log_odds: ArrayLike, damaged: ArrayLike, prior_frac: float) -> Recalibration:
    """Two parameters of a logistic, fitted to what persons judged.

    Notes
    -----
    Likelihood maximised by Newton's method with Platt's softened targets, (N1 + 1)/(N1 + 2) and 1/(N0 + 2),
    which keep it finite where the classes part (Platt, J. 1999, in "Advances in large margin classifiers",
    from memory). The slope is kept from 0 up: evidence may be worth less, never the reverse.

    >>> found = recalibrate([-3.0, -2.0, -1.0, 0.5, 1.0, 2.0, 3.0, -0.5], [0, 0, 0, 1, 0, 1, 1, 1], 0.3)
    >>> 0.0 < found.slope < 2.0
    True
    """
    x, y = np.asarray(evidence_log_odds, dtype=np.float64), np.asarray(damaged, dtype=np.float64)
    ones, zeros = y.sum(), (1.0 - y).sum()
    target = np.where(y == 1, (ones + 1.0) / (ones + 2.0), 1.0 / (zeros + 2.0))
    offset = float(np.log(prior_frac / (1.0 - prior_frac)))
    design = np.stack([np.ones_like(x), x], axis=1)
    found = np.array([0.0, 1.0])
    for _ in range(50):
        p = special.expit(offset + design @ found)
        gradient = design.T @ (target - p)
        curvature = (design * (p * (1.0 - p))[:, np.newaxis]).T @ design + 1e-9 * np.eye(2)
        step = np.linalg.solve(curvature, gradient)
        found = found + np.clip(step, -1.0, 1.0)
        if np.max(np.abs(step)) < 1e-10:
            break
    if found[1] < 0.0:
        p1 = float(target.mean())
        return Recalibration(float(np.log(p1 / (1.0 - p1))) - offset, 0.0)
    return Recalibration(float(found[0]), float(found[1]))


def cross_validated_frac(
    evidence_log_odds: ArrayLike, damaged: ArrayLike, prior_frac: float, fold: ArrayLike
) -> Array:
    """Each plug's probability from a recalibration that did not see its fold."""
    x, y, folds = np.asarray(evidence_log_odds), np.asarray(damaged), np.asarray(fold)
    found = np.empty(x.size)
    offset = np.log(prior_frac / (1.0 - prior_frac))
    for one in np.unique(folds):
        out = folds == one
        fitted = recalibrate(x[~out], y[~out], prior_frac)
        found[out] = special.expit(offset + fitted.intercept + fitted.slope * x[out])
    return found


def left_out_mask(own: Prediction, values: ArrayLike) -> Mask:
    """Which plugs of a fit stand out of it beyond chance: 1 % for the whole set (Bonferroni).

    >>> line = predict_line([0.1, 0.2, 0.3, 0.4, 0.5, 0.25], [1.0, 2.1, 2.9, 4.0, 5.1, 9.0], [0.2])
    >>> left_out_mask(line.own, [1.0, 2.1, 2.9, 4.0, 5.1, 9.0]).tolist()
    [False, False, False, False, False, True]
    """
    y = np.asarray(values, dtype=np.float64)
    t = np.abs(y - own.centre) / np.maximum(own.scale, 1e-12)
    return np.asarray(2.0 * special.stdtr(own.freedom, -t) * max(y.size, 1) < 0.01)


VALIDATION = (
    "Simulated, by a declared law (soft and hard sand in turn, 35 % damaged, noisy log and words; seeds "
    "never used in building), 1200 plugs of 20 wells: area under the curve 0.99, Brier skill 0.83 (95 % "
    "interval 0.79 to 0.86), mean 0.35 where 0.35 were damaged. Of plugs called unlikely (mean 0.04) 0.02"
    " were damaged, of those possible (0.43) 0.48, of those likely (0.94) 0.97. Run blind, 0.4 % of 2640 "
    "core and rotary plugs are called likely. In harder wells (twice the scatter, marks at random, half "
    "the core), area and skill: 0.89 and 0.43; in wells whose facies are without names 0.98 and 0.75. "
    "Skill without the log 0.79, without descriptions 0.76, without core and rotary 0.46, with "
    "descriptions alone 0.36; with nothing the prior comes back. Against rotary twins that lie within 0.1"
    " m, as noisy labels, area 0.89. Placebos: a log shifted by 4.7 m loses more than half of what it "
    "counts, shuffled facies cost skill; neither makes false certainty. One-signed rules (low "
    "permeability, low porosity) rank such wells like chance. On a real core (Norwegian well 7121/8-1, "
    "sound, trend scattered over decades), blind, 0.8 % of 249 plugs are called likely; shattered by the "
    "same law, without log or descriptions, area and skill are only 0.74 and 0.16: evidence that scatters"
    " tells little, and the likelihood stays near the prior. Not tested: plugs whose damage was seen in a"
    " scan, of which none are published; damage by another law; wrong priors move the mean, not the order"
)

_DPHI = Symbol("dphi", "porosity_change_frac", "v/v", "change of porosity by impact")
_NU = Symbol("nu", "freedom", "", "degrees of freedom, at most 10")
_FIT = "ln t_nu(({0})/s) - ln s, t_nu Student's density"

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "permeability-change-kozeny-carman",
        1,
        "Change of permeability with porosity alone",
        "log10(k1/k0) = 3 log10(phi1/phi0) - 2 log10((1 - phi1)/(1 - phi0))",
        (
            Symbol("phi0", "porosity_before_frac", "v/v", "porosity before"),
            Symbol("phi1", "porosity_after_frac", "v/v", "porosity after"),
        ),
        (Symbol("dK", "change_decades", "decades", "change of log10 permeability"),),
        "granular rock, the grains unchanged; cracks raise permeability more",
        "Carman 1937, Trans. Inst. Chem. Eng. 15:150-166 (from memory)",
        "worked values for soft compaction and opened hard rock; limits",
        kozeny_carman_change_decades,
    ),
    Formula(
        "density-porosity",
        1,
        "Porosity from the density log",
        "phi = (rho_ma - rho_b)/(rho_ma - rho_f)",
        (
            Symbol("rho_b", "bulk_density_g_cm3", "g/cm3", "log reading"),
            Symbol("rho_ma", "matrix_density_g_cm3", "g/cm3", "density of the grains"),
            Symbol("rho_f", "fluid_density_g_cm3", "g/cm3", "density of what fills the pores"),
        ),
        (Symbol("phi", "porosity_frac", "v/v", "porosity"),),
        "good hole; light hydrocarbon makes it too high unless rho_f says so",
        "balance of mass",
        "worked values; sensitivities",
        density_porosity_frac,
    ),
    Formula(
        "impact-permeability",
        1,
        "Evidence: measured permeability against the undamaged trend",
        _FIT.format("r - (dK - b dphi)"),
        (
            Symbol("r", "residual_decades", "decades", "residual from the trend of the other plugs"),
            Symbol("s", "scale_decades", "decades", "scale of that prediction"),
            _NU,
            Symbol("b", "slope_decades", "decades per v/v", "slope of the trend"),
            _DPHI,
            Symbol("dK", "permeability_change_decades", "decades", "change of log10 permeability"),
        ),
        (Symbol("L", "log_density", "1/decades", "how well the change fits"),),
        "measured permeability, 8 undamaged plugs or more; never one estimated from texture",
        "external studentised residual: Cook & Weisberg 1982, ch. 2 (from memory); at most 10 assumed",
        "residual of a worked example; sign by rock class; no residual along the trend",
        permeability_fit,
    ),
    Formula(
        "impact-density-log",
        1,
        "Evidence: plug porosity against the density log",
        _FIT.format("d - dphi"),
        (
            Symbol("d", "difference_frac", "v/v", "plug less log, less the same of undamaged plugs"),
            Symbol("s", "scale_frac", "v/v", "scale of that prediction"),
            _NU,
            _DPHI,
        ),
        (Symbol("L", "log_density", "1/(v/v)", "how well the change fits"),),
        "good hole; centred on core and rotary plugs of the rock class, since ambient porosity stands above "
        "in-situ; before any plug is compared, scatter 0.02 and 0.005 (hard) to 0.02 (soft) above (assumed)",
        "Student's t: Gosset 1908, Biometrika 6:1-25 (from memory); priors assumed",
        "placebo: a log shifted by metres loses its power",
        density_fit,
    ),
    Formula(
        "impact-neighbours",
        1,
        "Evidence: plug porosity against neighbours of its bed",
        _FIT.format("e - beta d - (1 - beta) dphi"),
        (
            Symbol("e - beta d", "difference_frac", "v/v", "plug less neighbours, less what the log told"),
            Symbol("s", "scale_frac", "v/v", "scale of that prediction"),
            _NU,
            Symbol("beta", "shared", "", "slope of e on d among undamaged plugs"),
            _DPHI,
        ),
        (Symbol("L", "log_density", "1/(v/v)", "how well the change fits"),),
        "core and rotary plugs within 3 m, weight falling over 1 m; further off weight 0.5 (assumed)",
        "regression of one difference on the other; distances and weight assumed",
        "placebo: shuffled facies lose their power; a plug is never its own neighbour",
        neighbours_fit,
    ),
    Formula(
        "impact-packing",
        1,
        "Evidence: porosity against the limit of packing",
        "-((phi - dphi - phi_p - 0.05)/0.02)^2/2 where positive, else 0",
        (
            Symbol("phi", "porosity_frac", "v/v", "plug porosity"),
            Symbol("phi_p", "packing_frac", "v/v", "porosity of packed sand of its sorting"),
            _DPHI,
        ),
        (Symbol("L", "log_fit", "", "how well the change fits"),),
        "soft sand; sorting from undamaged plugs of the facies where described",
        "Beard & Weyl 1973, AAPG Bull. 57:349-369 (abstract: field sands within 0.05); width 0.02 assumed",
        "limits",
        packing_fit,
    ),
    Formula(
        "impact-fines",
        1,
        "Evidence: fines beyond the facies",
        _FIT.format("f - df"),
        (
            Symbol("f", "excess_frac", "v/v", "share of fines less that of undamaged plugs"),
            Symbol("s", "scale_frac", "v/v", "scale of that prediction"),
            _NU,
            Symbol("df", "fines_added_frac", "v/v", "fines that damage adds"),
        ),
        (Symbol("L", "log_density", "1/(v/v)", "how well the change fits"),),
        "sieved plug and two sieved references; damage adds up to 0.10, half of it none (assumed)",
        "Hardin 1985, J. Geotech. Eng. 111:1177-1192 (from memory); amounts assumed",
        "limits",
        fines_fit,
    ),
    Formula(
        "impact-condition",
        1,
        "Evidence: described condition",
        "ln P(mark | kind), from a table",
        (
            Symbol("mark", "mark", "", "powdered, cracked, crumbled, disked, chipped or intact"),
            Symbol("kind", "kind", "", "sound, compacted, loosened or shattered"),
        ),
        (Symbol("L", "log_fit", "", "how often it is described so"),),
        "the mark that tells most; firmness is the rock's and no evidence",
        "assumed frequencies: " + "; ".join(f"{m} {'/'.join(map(str, v))}" for m, v in CONDITION.items()),
        "every column of the table sums to 1",
        condition_fit,
    ),
    Formula(
        "impact",
        1,
        "Likelihood that impact changed porosity by more than 0.02 or permeability by more than 2 times",
        "logit p = logit(prior) + sum of w_i ln LR_i, each |ln LR_i| at most ln 10",
        (
            Symbol("prior", "prior_frac", "v/v", "likelihood before any evidence: the setting 'crush prior'"),
            Symbol("sum", "evidence_log_odds", "", "sum of the effects of the evidence"),
        ),
        (Symbol("p", "likelihood_frac", "v/v", "crush likelihood"),),
        "percussion plugs only. LR_i: the changes that damage may make against none, given those before. "
        "Changes, evenly: compacted (2 of 3 in soft rock, assumed) porosity -0.08 to 0, permeability to "
        "0.3 of what porosity takes; loosened porosity 0 to 0.08, permeability unchanged to what "
        "porosity gives; shattered (hard rock) porosity 0 to 0.05, permeability by more, to 100 times. "
        "Sound plugs change by a quarter of the event (assumed). Grain density off its facies is no "
        "evidence; it halves the weight of what rests on the plug's volumes (assumed). Prior 0.3 is an "
        "assumption: no share of damaged plugs is published",
        "log-odds: Good 1950 (from memory); bounds: Beard & Weyl 1973, PetroWiki 'perforation crush zone', "
        "Mitchell & Faulkner 2008, Carman 1937; 'assumed' where said. Nothing was fitted to a simulation",
        VALIDATION,
        likelihood_frac,
    ),
)
