"""Grain size, sorting, and the permeability that a texture suggests.

Sizes are in mm or in phi = -log2(d/1 mm), permeabilities in md, porosities as fractions. Percentiles run from
coarse to fine: P5 is the size that 5 % by mass is coarser than. A permeability from texture is an estimate
(about half a decade of scatter at the best) and is to be named as one.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.errors import Usage, did_you_mean
from corelab.science.formula import Array, Formula, Mask, Symbol, finite, not_negative, positive, refuse
from corelab.science.gas_flow import group_sums, grouped
from corelab.units import MILLIDARCY_M2

PERCENTILES = (5, 10, 16, 25, 50, 75, 84, 90, 95)
ONE_SIEVE_FRAC = 0.95
"""A sieve that holds more than this share leaves the statistics to the interpolation (common practice)."""
QUARTILE_SD = 0.6744897501960817
"""Quartile of the normal distribution with standard deviation 1."""
GRAVITY_M_S2 = 9.80665
WATER_20_DEGC = (1.0016, 0.99821)
"""Viscosity [mPa s] and density [g/cm3] of water at 20 degC: the meaning of a coefficient by Hazen."""
SMALLEST_PHI, LARGEST_PHI = -30.0, 30.0


def _phi(name: str, values: ArrayLike) -> Array:
    phi = finite(name, values)
    wanted = f"a size between {SMALLEST_PHI:g} and {LARGEST_PHI:g} phi"
    refuse((phi.real < SMALLEST_PHI) | (phi.real > LARGEST_PHI), name, phi, wanted)
    return phi


def _porosity(porosity_frac: ArrayLike) -> Array:
    porosity = positive("porosity_frac", porosity_frac)
    refuse(porosity.real >= 1.0, "porosity_frac", porosity, "a fraction below 1")
    return porosity


# ---- sizes


def grain_size_phi(grain_size_mm: ArrayLike) -> Array:
    """Grain size on the phi scale.

    Parameters
    ----------
    grain_size_mm : array_like
        Grain size [mm], above 0.

    Returns
    -------
    Array
        Grain size [phi], shape of the input; the finer, the greater.

    Raises
    ------
    Impossible
        If a size is not above 0.

    Notes
    -----
    phi = -log2(d/1 mm), d grain size.

    References
    ----------
    Krumbein, W. C. 1934, "Size frequency distributions of sediments", J. Sediment. Petrol. 4:65-77 (from
    memory).

    Examples
    --------
    >>> float(grain_size_phi(0.25))
    2.0
    """
    return -np.log2(positive("grain_size_mm", grain_size_mm))


def grain_size_mm(size_phi: ArrayLike) -> Array:
    """Grain size from the phi scale.

    Parameters
    ----------
    size_phi : array_like
        Grain size [phi], between -30 and 30.

    Returns
    -------
    Array
        Grain size [mm], shape of the input.

    Raises
    ------
    Impossible
        If a size is not between -30 and 30.

    Notes
    -----
    d = 2^-phi mm.

    References
    ----------
    Krumbein, W. C. 1934, "Size frequency distributions of sediments", J. Sediment. Petrol. 4:65-77 (from
    memory).

    Examples
    --------
    >>> float(grain_size_mm(-1.0))
    2.0
    """
    return 2.0 ** -_phi("size_phi", size_phi)


# ---- a size distribution


@dataclass(frozen=True, slots=True)
class FolkWard:
    """Graphic statistics after Folk & Ward; the mean, the sorting (a standard deviation) in phi."""

    mean_phi: Array
    sorting_phi: Array
    skewness: Array
    kurtosis: Array


def folk_ward(
    percentile_5_phi: ArrayLike,
    percentile_16_phi: ArrayLike,
    percentile_25_phi: ArrayLike,
    percentile_50_phi: ArrayLike,
    percentile_75_phi: ArrayLike,
    percentile_84_phi: ArrayLike,
    percentile_95_phi: ArrayLike,
) -> FolkWard:
    """Graphic statistics of a grain-size distribution.

    Parameters
    ----------
    percentile_5_phi, percentile_16_phi, percentile_25_phi, percentile_50_phi : array_like
        Percentiles from coarse to fine [phi], between -30 and 30, none below the one before.
    percentile_75_phi, percentile_84_phi, percentile_95_phi : array_like
        The finer ones [phi].

    Returns
    -------
    FolkWard
        Mean [phi], sorting [phi], skewness [1] and kurtosis [1], broadcast shape. Skewness and kurtosis are
        NaN where a spread is 0.

    Raises
    ------
    Impossible
        If a percentile is not between -30 and 30, or below a coarser one.

    Notes
    -----
    M_z = (P16 + P50 + P84)/3; sigma_I = (P84 - P16)/4 + (P95 - P5)/6.6; Sk_I = (P16 + P84 - 2 P50)/(2 (P84 -
    P16)) + (P5 + P95 - 2 P50)/(2 (P95 - P5)); K_G = (P95 - P5)/(2.44 (P75 - P25)). A normal distribution of
    standard deviation 0.5 gives sigma_I 0.4978.

    References
    ----------
    Folk, R. L. & Ward, W. C. 1957, "Brazos River bar: a study in the significance of grain size parameters",
    J. Sediment. Petrol. 27:3-26 (forms from memory).

    Examples
    --------
    >>> found = folk_ward(0.0, 1.0, 1.3, 2.0, 2.7, 3.0, 4.0)
    >>> float(found.mean_phi), round(float(found.sorting_phi), 4), float(found.skewness)
    (2.0, 1.1061, 0.0)
    """
    given = {
        "percentile_5_phi": percentile_5_phi,
        "percentile_16_phi": percentile_16_phi,
        "percentile_25_phi": percentile_25_phi,
        "percentile_50_phi": percentile_50_phi,
        "percentile_75_phi": percentile_75_phi,
        "percentile_84_phi": percentile_84_phi,
        "percentile_95_phi": percentile_95_phi,
    }
    checked = {name: _phi(name, values) for name, values in given.items()}
    names = list(checked)
    for coarser, finer in pairwise(names):
        falls = checked[finer].real < checked[coarser].real
        refuse(falls, finer, checked[finer], "a percentile not below the coarser one")
    p5, p16, p25, p50, p75, p84, p95 = np.broadcast_arrays(*checked.values())
    with np.errstate(invalid="ignore", divide="ignore"):
        return FolkWard(
            (p16 + p50 + p84) / 3.0,
            (p84 - p16) / 4.0 + (p95 - p5) / 6.6,
            (p16 + p84 - 2.0 * p50) / (2.0 * (p84 - p16)) + (p5 + p95 - 2.0 * p50) / (2.0 * (p95 - p5)),
            (p95 - p5) / (2.44 * (p75 - p25)),
        )


def trask_sorting(percentile_25_phi: ArrayLike, percentile_75_phi: ArrayLike) -> Array:
    """Trask's sorting coefficient.

    Parameters
    ----------
    percentile_25_phi, percentile_75_phi : array_like
        Coarse and fine quartile [phi], between -30 and 30, the fine one not below the coarse one.

    Returns
    -------
    Array
        Sorting coefficient [1], 1 or more, broadcast shape.

    Raises
    ------
    Impossible
        If a quartile is not between -30 and 30, or the fine one below the coarse one.

    Notes
    -----
    S_o = sqrt(Q_coarse/Q_fine) in mm = 2^((P75 - P25)/2) in phi. Its class names are not Folk's.

    References
    ----------
    Trask, P. D. 1932, "Origin and environment of source sediments of petroleum" (from memory).

    Examples
    --------
    >>> float(trask_sorting(1.0, 3.0))
    2.0
    """
    coarse = _phi("percentile_25_phi", percentile_25_phi)
    fine = _phi("percentile_75_phi", percentile_75_phi)
    refuse(fine.real < coarse.real, "percentile_75_phi", fine, "a percentile not below the coarser one")
    return 2.0 ** ((fine - coarse) / 2.0)


def sorting_from_trask_phi(trask_sorting: ArrayLike) -> Array:
    """Standard deviation in phi of a lognormal sand with a given Trask coefficient.

    Parameters
    ----------
    trask_sorting : array_like
        Sorting coefficient [1], 1 or more.

    Returns
    -------
    Array
        Standard deviation [phi], shape of the input.

    Raises
    ------
    Impossible
        If a coefficient is below 1.

    Notes
    -----
    sigma = log2(S_o)/0.67449, since S_o = 2^(0.67449 sigma) where the distribution is normal in phi.

    References
    ----------
    Definition; quartiles of the normal distribution.

    Examples
    --------
    >>> round(float(sorting_from_trask_phi(1.30)), 3)
    0.561
    """
    coefficient = finite("trask_sorting", trask_sorting)
    refuse(
        coefficient.real < 1.0, "trask_sorting", coefficient, "1 or more (the coarse quartile over the fine)"
    )
    return np.log2(coefficient) / QUARTILE_SD


def sieve_recovery_frac(sieved_mass_g: ArrayLike, dry_mass_g: ArrayLike) -> Array:
    """Share of the sample that the sieves gave back.

    Parameters
    ----------
    sieved_mass_g : array_like
        Sum of the masses on all sieves and in the pan [g], 0 or more.
    dry_mass_g : array_like
        Mass of the dry sample before sieving [g], above 0.

    Returns
    -------
    Array
        Recovery [v/v], broadcast shape; above 1 where a sieve was not clean.

    Raises
    ------
    Impossible
        If a sieved mass is negative, or a dry mass not above 0.

    Notes
    -----
    R = sum of m/M, m masses retained, M dry mass before. A loss beyond 1 % is doubtful (common practice).

    References
    ----------
    Mass balance.

    Examples
    --------
    >>> round(float(sieve_recovery_frac(33.42, 33.52)), 4)
    0.997
    """
    return not_negative("sieved_mass_g", sieved_mass_g) / positive("dry_mass_g", dry_mass_g)


@dataclass(frozen=True, slots=True)
class SieveCurves:
    """Statistics of sieve curves, one a group.

    `percentiles_phi` is (9, m): P5, P10, P16, P25, P50, P75, P84, P90, P95. `open_coarse` and `open_fine`
    mark curves of which some percentile lies above the coarsest sieve or in the pan and that class was not
    closed: it is NaN, and so is what needs it. `one_sieve` marks a curve with more than 95 % on one sieve.
    Moments are of masses at the classes' middles in phi, NaN while an open class holds mass; the kurtosis of
    a normal distribution is 3.
    """

    median_phi: Array
    mean_phi: Array
    sorting_phi: Array
    skewness: Array
    kurtosis: Array
    trask_sorting: Array
    moment_mean_phi: Array
    moment_sorting_phi: Array
    moment_skewness: Array
    moment_kurtosis: Array
    percentiles_phi: Array
    mass_g: Array
    open_coarse: Mask
    open_fine: Mask
    one_sieve: Mask


def sieve_statistics(
    aperture_mm: ArrayLike,
    mass_retained_g: ArrayLike,
    group: ArrayLike,
    coarse_limit_phi: float | None = None,
    fine_limit_phi: float | None = None,
) -> SieveCurves:
    """Graphic statistics and moments of grain size, from masses on sieves.

    Parameters
    ----------
    aperture_mm : array_like (n,)
        Apertures of the sieves [mm], in any order; 0 is the pan.
    mass_retained_g : array_like (n,)
        Masses that they retain [g], 0 or more; they need not add up to anything.
    group : array_like of int (n,)
        Which sample a sieve belongs to, 0 to m - 1.
    coarse_limit_phi : float, optional
        Where the class on the coarsest sieve ends [phi]; without it that class is open.
    fine_limit_phi : float, optional
        Where the class in the pan ends [phi]; without it that class is open.

    Returns
    -------
    SieveCurves
        Arrays (m,), `percentiles_phi` (9, m). NaN for a sample without mass or with a missing reading, and
        for what an open class leaves unknown.

    Raises
    ------
    Impossible
        If an aperture or a mass is negative, a sieve given twice in a sample, a limit not beyond its sieves,
        or a group not a whole number from 0.

    Notes
    -----
    The cumulative curve is straight in phi between sieves: at the aperture phi_i it is the share of mass on
    that sieve and all coarser ones. Statistics as in `folk_ward` and `trask_sorting`. Moments: mean = sum of
    w x, sd^2 = sum of w (x - mean)^2, skewness and kurtosis the third and fourth in units of sd, w share of
    mass, x middle of the class.

    References
    ----------
    Folk, R. L. & Ward, W. C. 1957, J. Sediment. Petrol. 27:3-26 (forms from memory); Krumbein, W. C. &
    Pettijohn, F. J. 1938, "Manual of sedimentary petrography" (moments, from memory).

    Examples
    --------
    >>> found = sieve_statistics(
    ...     [2.0, 1.0, 0.5, 0.25, 0.125, 0.0625], [2.0, 4.0, 4.0, 6.0, 2.0, 2.0], [0] * 6,
    ...     coarse_limit_phi=-2.0)
    >>> found.mean_phi.round(3).tolist(), found.sorting_phi.round(3).tolist()
    ([0.9], [1.533])
    """
    aperture = not_negative("aperture_mm", aperture_mm)
    mass = not_negative("mass_retained_g", mass_retained_g)
    labels, n, (aperture, mass) = grouped(group, aperture, mass)
    missing = np.bincount(labels, weights=np.isnan(aperture) | np.isnan(mass), minlength=n) > 0
    order = np.lexsort((-aperture.real, labels))
    labels, aperture, mass = labels[order], aperture[order], mass[order]
    twice = np.zeros(labels.size, dtype=np.bool_)
    twice[1:] = (labels[1:] == labels[:-1]) & (aperture.real[1:] == aperture.real[:-1])
    back = np.empty_like(order)
    back[order] = np.arange(order.size)
    refuse(twice[back], "aperture_mm", aperture[back], "each sieve once in a sample")
    whole = ~missing[labels]
    labels, aperture, mass = labels[whole], aperture[whole], mass[whole]
    pan = aperture.real == 0.0
    phi = -np.log2(np.where(pan, 1.0, aperture))
    first = np.ones(labels.size, dtype=np.bool_)
    first[1:] = labels[1:] != labels[:-1]
    coarse = np.nan if coarse_limit_phi is None else float(_phi("coarse_limit_phi", coarse_limit_phi))
    fine = np.nan if fine_limit_phi is None else float(_phi("fine_limit_phi", fine_limit_phi))
    wanted = "a size coarser than the coarsest sieve"
    refuse(first & ~pan & (phi.real <= coarse), "coarse_limit_phi", coarse, wanted)
    refuse(~pan & (phi.real >= fine), "fine_limit_phi", fine, "a size finer than the finest sieve")

    total = group_sums(mass, labels, n)
    total = np.where(missing | (total.real <= 0.0), np.nan, total)
    # the curve: `low` and `high` are the ends of each class, `above` and `upto` what is coarser than them
    high = np.where(pan, fine, phi)
    low = np.where(first, coarse, np.roll(phi, 1))
    running = np.cumsum(mass)
    before = running - mass
    start = np.zeros(n, dtype=mass.dtype)
    start[labels[first]] = before[first]
    share = mass / total[labels]
    upto = (running - start[labels]) / total[labels]
    above = upto - share

    percentiles = np.full((len(PERCENTILES), n), np.nan, dtype=np.result_type(phi, mass))
    open_coarse, open_fine = np.zeros((2, n), dtype=np.bool_)
    size = np.bincount(labels, minlength=n)
    begin = np.cumsum(size) - size
    filled = ~np.isnan(total.real)
    with np.errstate(invalid="ignore", divide="ignore"):
        for place, percent in enumerate(PERCENTILES):
            # rounding must not push a percentile out of the class that it ends
            passed = np.bincount(labels, weights=upto.real < percent / 100.0 - 1e-12, minlength=n)
            at = (begin + np.minimum(passed.astype(np.intp), size - 1))[filled]
            part = (percent / 100.0 - above[at]) / share[at]
            exact = np.abs(part.real - 1.0) < 1e-9
            inside = low[at] + part * (high[at] - low[at])
            # at the very end of an open class the size is known all the same
            percentiles[place, filled] = np.where(exact & np.isnan(low[at]), high[at], inside)
            unknown = np.isnan(percentiles[place, filled])
            open_coarse[filled] |= unknown & first[at] & ~pan[at]
            open_fine[filled] |= unknown & pan[at]
        p5, _, p16, p25, p50, p75, p84, _, p95 = percentiles
        graphic = folk_ward(p5, p16, p25, p50, p75, p84, p95)

        middle = np.where(share.real > 0.0, (low + high) / 2.0, 0.0)
        mean = group_sums(share * middle, labels, n)
        off = middle - mean[labels]
        variance, third, fourth = (group_sums(share * off**power, labels, n) for power in (2, 3, 4))
        there = np.where(filled, 1.0, np.nan)
        moment_skewness, moment_kurtosis = third / variance**1.5, fourth / variance**2
    largest = np.zeros(n)
    np.fmax.at(largest, labels, share.real)
    return SieveCurves(
        p50,
        graphic.mean_phi,
        graphic.sorting_phi,
        graphic.skewness,
        graphic.kurtosis,
        trask_sorting(p25, p75),
        mean * there,
        np.sqrt(variance) * there,
        moment_skewness,
        moment_kurtosis,
        percentiles,
        total,
        open_coarse,
        open_fine,
        largest > ONE_SIEVE_FRAC,
    )


# ---- words

WENTWORTH_MM = MappingProxyType(
    {
        "boulder": (256.0, np.inf),
        "cobble": (64.0, 256.0),
        "pebble": (4.0, 64.0),
        "granule": (2.0, 4.0),
        "very coarse sand": (1.0, 2.0),
        "coarse sand": (0.5, 1.0),
        "medium sand": (0.25, 0.5),
        "fine sand": (0.125, 0.25),
        "very fine sand": (0.0625, 0.125),
        "silt": (0.00390625, 0.0625),
        "clay": (0.0, 0.00390625),
    }
)
"""Classes of Wentworth 1922, J. Geol. 30:377-392: lower and upper size in mm, the lower one included."""

SORTING = MappingProxyType(
    {
        "folk": MappingProxyType(
            {
                "very well": (0.0, 0.35),
                "well": (0.35, 0.50),
                "moderately well": (0.50, 0.71),
                "moderately": (0.71, 1.00),
                "poorly": (1.0, 2.0),
                "very poorly": (2.0, 4.0),
                "extremely poorly": (4.0, np.inf),
            }
        ),
        "trask": MappingProxyType(
            {
                "extremely well": (1.0, 1.1),
                "very well": (1.1, 1.2),
                "well": (1.2, 1.4),
                "moderately": (1.4, 2.0),
                "poorly": (2.0, 2.7),
                "very poorly": (2.7, 5.7),
            }
        ),
    }
)
"""Words of sorting with their limits, the lower one included, and what they count: Folk's standard deviation
in phi (Folk & Ward 1957; USGS note on grain size), Trask's coefficient with the limits of Beard & Weyl 1973,
AAPG Bull. 57:349-369. The same word does not mean the same on both."""

_SKEWNESS = (
    (-0.30, -0.10, 0.10, 0.30),
    ("strongly coarse-skewed", "coarse-skewed", "near-symmetrical", "fine-skewed", "strongly fine-skewed"),
)
_KURTOSIS = (
    (0.67, 0.90, 1.11, 1.50, 3.00),
    (
        "very platykurtic",
        "platykurtic",
        "mesokurtic",
        "leptokurtic",
        "very leptokurtic",
        "extremely leptokurtic",
    ),
)


def _words(values: ArrayLike, limits: tuple[float, ...], words: tuple[str, ...]) -> NDArray[np.str_]:
    given = np.asarray(values, dtype=np.float64)
    named = np.array(words)[np.searchsorted(limits, given, side="right").clip(max=len(words) - 1)]
    return np.where(np.isnan(given), "", named)


def wentworth_class(grain_size_mm: ArrayLike, halves: bool = False) -> NDArray[np.str_]:
    """Wentworth's word for a grain size, by half classes of sand if wanted ('upper' is the coarser half).

    Sizes [mm] are above 0; a missing one has no word.

    >>> wentworth_class([0.3, 0.4, 0.01], halves=True).tolist()
    ['lower medium sand', 'upper medium sand', 'silt']
    """
    size = positive("grain_size_mm", grain_size_mm).real
    words = tuple(reversed(WENTWORTH_MM))
    found = _words(size, tuple(WENTWORTH_MM[word][0] for word in words[1:]), words)
    if halves:
        upper = np.log2(size) % 1.0 >= 0.5
        sand = np.char.endswith(found, "sand")
        found = np.where(sand, np.char.add(np.where(upper, "upper ", "lower "), found), found)
    return found


def sorting_word(sorting: ArrayLike, scale: str) -> NDArray[np.str_]:
    """The word for a sorting: `scale` 'folk' takes a standard deviation [phi], 'trask' a coefficient.

    A value that the scale does not reach, or a missing one, has no word.

    >>> sorting_word([0.6, 0.9], "folk").tolist(), sorting_word(1.3, "trask").tolist()
    (['moderately well', 'moderately'], 'well')
    """
    table = _scale(scale)
    given = not_negative("sorting", sorting).real
    words = tuple(table)
    found = _words(given, tuple(table[word][0] for word in words[1:]), words)
    low, high = table[words[0]][0], table[words[-1]][1]
    return np.where((given < low) | (given >= high), "", found)


def skewness_word(skewness: ArrayLike) -> NDArray[np.str_]:
    """Folk & Ward's word for a graphic skewness; a missing one has no word.

    >>> skewness_word([-0.067, 0.2]).tolist()
    ['near-symmetrical', 'fine-skewed']
    """
    return _words(skewness, *_SKEWNESS)


def kurtosis_word(kurtosis: ArrayLike) -> NDArray[np.str_]:
    """Folk & Ward's word for a graphic kurtosis; a missing one has no word.

    >>> kurtosis_word(1.164).tolist()
    'leptokurtic'
    """
    return _words(kurtosis, *_KURTOSIS)


def _scale(scale: str) -> MappingProxyType[str, tuple[float, float]]:
    if scale not in SORTING:
        raise Usage(f"'{scale}' is no scale of sorting; {did_you_mean(scale, list(SORTING))}")
    return SORTING[scale]


def described_size_mm(word: ArrayLike) -> Array:
    """Middle size [mm] (geometric) of a described class, such as 'fine sand' or 'upper fine sand'.

    NaN for a word that is not known, and for boulders and clay, whose class is open.

    >>> described_size_mm(["fine sand", "upper fine sand", "mud"]).round(4).tolist()
    [0.1768, 0.2102, nan]
    """
    texts = np.asarray(word, dtype=np.str_)
    unique, places = np.unique(texts, return_inverse=True)
    sizes = np.array([_described(text) for text in unique], dtype=np.float64)
    return np.asarray(sizes[places].reshape(texts.shape))


def _described(text: str) -> float:
    half, _, rest = text.strip().casefold().partition(" ")
    known = WENTWORTH_MM.get(rest if half in ("upper", "lower") else text.strip().casefold())
    if known is None or known[0] == 0.0 or np.isinf(known[1]):
        return float("nan")
    if half in ("upper", "lower") and not rest.endswith("sand"):
        return float("nan")
    shift = {"upper": 0.75, "lower": 0.25}.get(half, 0.5)
    return float(known[0] * 2.0 ** (shift * np.log2(known[1] / known[0])))


def described_sorting_phi(word: ArrayLike, scale: ArrayLike) -> Array:
    """Standard deviation [phi] at the middle of a described class of sorting.

    `scale` ('folk' or 'trask', one or one a word) says which the word comes from. An open class stands at
    its limit; Trask's coefficients are turned to phi for a lognormal sand. NaN for a word that the scale
    does not have.

    >>> described_sorting_phi(["well", "well"], ["folk", "trask"]).round(3).tolist()
    [0.425, 0.561]
    """
    words, scales = np.broadcast_arrays(np.asarray(word, dtype=np.str_), np.asarray(scale, dtype=np.str_))
    found = np.full(words.shape, np.nan)
    for name, table in SORTING.items():
        for known, (low, high) in table.items():
            middle = low if np.isinf(high) else (low + high) / 2.0
            if name == "trask":
                middle = float(sorting_from_trask_phi(middle))
            found[(np.char.lower(words) == known) & (np.char.lower(scales) == name)] = middle
    return found


# ---- packing


@dataclass(frozen=True, slots=True)
class PackedSand:
    """Wet-packed artificial sands: sortings by sizes, porosity and permeability, and how sure a cell is.

    Sorting classes are Trask's with their middle coefficient; sizes are half classes of sand. NaN is a cell
    not known.
    """

    sortings: tuple[str, ...]
    trask_sorting: tuple[float, ...]
    sizes: tuple[str, ...]
    porosity_frac: Array
    permeability_md: Array
    from_memory: Mask
    source: str


def _locked(rows: list[list[float]], factor: float) -> Array:
    table = np.array(rows) * factor
    table.flags.writeable = False
    return table


def _beard_weyl() -> PackedSand:
    nan = float("nan")
    sizes = tuple(
        f"{half} {size} sand"
        for size in ("coarse", "medium", "fine", "very fine")
        for half in ("upper", "lower")
    )
    porosity_percent = [
        [43.1, 42.8, 41.7, 41.3, 41.3, 43.5, 42.3, 43.0],
        [40.8, 41.5, 40.2, 40.2, 39.8, 40.8, 41.2, 41.8],
        [38.0, 38.4, 38.1, 38.8, 39.1, 39.7, 40.2, 39.8],
        [32.4, 33.3, 34.2, 34.9, 33.9, 34.3, 35.6, 33.1],
        [27.1, 29.8, 31.5, 31.3, 30.4, 31.0, 30.5, 34.2],
        [28.6, 25.2, 25.8, 23.4, 28.5, 29.0, 30.1, 32.6],
    ]
    permeability_darcy = [
        [475, 238, 119, 59, 30, 15, 7.4, 3.7],
        [458, 239, 115, 57, 29, 14, 7.2, 3.6],
        [302, 151, 76, 38, 19, 9.4, 4.7, 2.4],
        [110, 55, 28, 14, 7.0, 3.5, nan, nan],
        [45, 23, 12, 6, nan, nan, nan, nan],
        [14, 7, 3.5, nan, nan, nan, nan, nan],
    ]
    from_memory = np.zeros((6, 8), dtype=np.bool_)
    from_memory[:, 3] = True
    from_memory.flags.writeable = False
    return PackedSand(
        tuple(SORTING["trask"]),
        (1.05, 1.15, 1.30, 1.70, 2.35, 4.20),
        sizes,
        _locked(porosity_percent, 0.01),
        _locked(permeability_darcy, 1000.0),
        from_memory,
        "Beard, D. C. & Weyl, P. K. 1973, Influence of texture on porosity and permeability of "
        "unconsolidated sand, AAPG Bull. 57:349-369; porosity of the lower medium sands and all "
        "permeabilities from memory",
    )


BEARD_WEYL = _beard_weyl()
"""Beard & Weyl 1973; `from_memory` marks porosities. They are close to the least of a clean natural sand: a
fresh one may have about 0.05 more."""

SPHERE_PACKINGS = MappingProxyType(
    {
        "simple cubic": 1.0 - np.pi / 6.0,
        "orthorhombic": 1.0 - np.pi / (3.0 * np.sqrt(3.0)),
        "tetragonal-sphenoidal": 1.0 - 2.0 * np.pi / 9.0,
        "rhombohedral": 1.0 - np.pi / (3.0 * np.sqrt(2.0)),
        "random close": 0.365,
    }
)
"""Porosities of equal spheres: regular ones by geometry (Graton & Fraser 1935, J. Geol. 43:785-909), random
close packing as measured (solid share 0.635 +/- 0.002: J. Mater. Sci. 38, 2003, 2019-2025)."""


def packing_porosity_frac(sorting_phi: ArrayLike) -> Array:
    """Porosity of a packed clean sand by its sorting.

    Parameters
    ----------
    sorting_phi : array_like
        Standard deviation of grain size [phi], above 0.

    Returns
    -------
    Array
        Porosity [v/v], shape of the input: an estimate, near the least of an uncemented sand.

    Raises
    ------
    Impossible
        If a sorting is not above 0.

    Notes
    -----
    phi = 0.45 x/(1 + x), x = 3.7632 sigma^-0.7552, sigma sorting. Range: 0.1 to 3.1 phi, the packed sands.

    References
    ----------
    Weltje's fit to the packed sands of Beard, D. C. & Weyl, P. K. 1973, AAPG Bull. 57:349-369 (as quoted).

    Examples
    --------
    >>> round(float(packing_porosity_frac(0.5612)), 3)
    0.384
    """
    x = 3.7632 * positive("sorting_phi", sorting_phi) ** -0.7552
    return 0.45 * x / (1.0 + x)


def sandstone_porosity_frac(trask_sorting: ArrayLike, rigid_grain_frac: ArrayLike) -> Array:
    """Porosity of a buried sandstone by its sorting and its rigid grains.

    Parameters
    ----------
    trask_sorting : array_like
        Sorting coefficient [1], 1 or more.
    rigid_grain_frac : array_like
        Share of rigid grains [v/v], 0 to 1.

    Returns
    -------
    Array
        Porosity [v/v], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a coefficient is below 1, or a share not between 0 and 1.

    Notes
    -----
    phi % = -6.1 + 9.8/S_o + 0.17 R %, S_o sorting coefficient, R rigid grains.

    References
    ----------
    Bloch, S. 1991, "Empirical prediction of porosity and permeability in sandstones", AAPG Bull.
    75:1145-1160 (as quoted).

    Examples
    --------
    >>> round(float(sandstone_porosity_frac(1.3, 0.80)), 4)
    0.1504
    """
    coefficient = finite("trask_sorting", trask_sorting)
    refuse(
        coefficient.real < 1.0, "trask_sorting", coefficient, "1 or more (the coarse quartile over the fine)"
    )
    rigid = not_negative("rigid_grain_frac", rigid_grain_frac)
    refuse(rigid.real > 1.0, "rigid_grain_frac", rigid, "a fraction, at most 1")
    return (-6.1 + 9.8 / coefficient) / 100.0 + 0.17 * rigid


# ---- permeability


def permeability_krumbein_monk_md(grain_size_mm: ArrayLike, sorting_phi: ArrayLike) -> Array:
    """Permeability of loose sand, after Krumbein & Monk.

    Parameters
    ----------
    grain_size_mm : array_like
        Geometric mean grain size [mm], above 0.
    sorting_phi : array_like
        Standard deviation of grain size [phi], 0 or more.

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a size is not above 0, or a sorting negative.

    Notes
    -----
    k = 760 d^2 exp(-1.31 sigma) in darcy, d grain size [mm], sigma sorting [phi]. For packs at 40 %
    porosity: porosity does not enter.

    References
    ----------
    Krumbein, W. C. & Monk, G. D. 1943, "Permeability as a function of the size parameters of
    unconsolidated sand", Trans. AIME 151:153-163 (as quoted).

    Examples
    --------
    >>> round(float(permeability_krumbein_monk_md(0.25, 0.5)) / 1000.0, 2)
    24.67
    """
    size = positive("grain_size_mm", grain_size_mm)
    return 760e3 * size**2 * np.exp(-1.31 * not_negative("sorting_phi", sorting_phi))


def permeability_berg_md(
    porosity_frac: ArrayLike, median_size_mm: ArrayLike, percentile_spread_phi: ArrayLike
) -> Array:
    """Permeability of clean sand, after Berg.

    Parameters
    ----------
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    median_size_mm : array_like
        Median grain size [mm], above 0.
    percentile_spread_phi : array_like
        P90 - P10 [phi], 0 or more.

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a porosity or a size is not above 0, a porosity not below 1, or a spread negative.

    Notes
    -----
    k = 80.8 phi^5.1 d^2 exp(-1.385 p) in md with d in um: the same as 5.1e-6 (100 phi)^5.1 d^2 exp(-1.385 p)
    in darcy with d in mm. phi porosity, d median size, p spread. Range: clean quartz sand, best above 0.30.

    References
    ----------
    Berg, R. R. 1970, "Method for determining permeability from reservoir rock properties", Trans. Gulf Coast
    Assoc. Geol. Soc. 20:303-317 (from memory).

    Examples
    --------
    >>> round(float(permeability_berg_md(0.40, 0.250, 1.0)), 1)
    11811.3
    """
    size_um = 1000.0 * positive("median_size_mm", median_size_mm)
    spread = not_negative("percentile_spread_phi", percentile_spread_phi)
    return 80.8 * _porosity(porosity_frac) ** 5.1 * size_um**2 * np.exp(-1.385 * spread)


def permeability_van_baaren_md(
    dominant_size_mm: ArrayLike,
    porosity_frac: ArrayLike,
    cementation_exponent: ArrayLike,
    sorting_constant: ArrayLike,
) -> Array:
    """Permeability of sandstone, after van Baaren.

    Parameters
    ----------
    dominant_size_mm : array_like
        Dominant grain size [mm], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    cementation_exponent : array_like
        m [1], above 0; 1.4 to 2.0.
    sorting_constant : array_like
        C [1], above 0; 0.7 (extremely well sorted) to 1.0 (poorly sorted).

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a size, a porosity, an exponent or a constant is not above 0, or a porosity not below 1.

    Notes
    -----
    k = 10 d^2 phi^(3.64 + m) C^-3.64 in md with d in um, d dominant size, phi porosity.

    References
    ----------
    van Baaren, J. P. 1979, "Quick-look permeability estimates using sidewall samples and porosity logs", 6th
    SPWLA European Symposium (from memory).

    Examples
    --------
    >>> round(float(permeability_van_baaren_md(0.200, 0.25, 1.8, 0.8)), 1)
    478.2
    """
    size_um = 1000.0 * positive("dominant_size_mm", dominant_size_mm)
    exponent = 3.64 + positive("cementation_exponent", cementation_exponent)
    sorting = positive("sorting_constant", sorting_constant)
    return 10.0 * size_um**2 * _porosity(porosity_frac) ** exponent * sorting**-3.64


def conductivity_permeability_md(
    conductivity_cm_s: ArrayLike, viscosity_mpas: ArrayLike, density_g_cm3: ArrayLike
) -> Array:
    """Permeability from a hydraulic conductivity.

    Parameters
    ----------
    conductivity_cm_s : array_like
        Hydraulic conductivity [cm/s], above 0.
    viscosity_mpas, density_g_cm3 : array_like
        Viscosity [mPa s] and density [g/cm3] of the water that it refers to, above 0.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a conductivity, a viscosity or a density is not above 0.

    Notes
    -----
    k = K mu/(rho g), K conductivity, mu viscosity, rho density, g gravity 9.80665 m/s2.

    References
    ----------
    Definition of the hydraulic conductivity.

    Examples
    --------
    >>> round(float(conductivity_permeability_md(1.0, 1.0016, 0.99821)) / 1000.0)
    1037
    """
    conductivity_m_s = 0.01 * positive("conductivity_cm_s", conductivity_cm_s)
    viscosity_pas = 1e-3 * positive("viscosity_mpas", viscosity_mpas)
    density_kg_m3 = 1000.0 * positive("density_g_cm3", density_g_cm3)
    return conductivity_m_s * viscosity_pas / (density_kg_m3 * GRAVITY_M_S2 * MILLIDARCY_M2)


def permeability_hazen_md(effective_size_mm: ArrayLike, hazen_coefficient: ArrayLike = 100.0) -> Array:
    """Permeability of loose sand, after Hazen.

    Parameters
    ----------
    effective_size_mm : array_like
        d10, the size that 10 % by mass is finer than (P90 from coarse to fine) [mm], above 0.
    hazen_coefficient : array_like
        C [1], above 0; about 100, seen from 40 to 150, for K in cm/s and d10 in cm.

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a size or a coefficient is not above 0.

    Notes
    -----
    K = C d10^2 (K conductivity to water [cm/s], d10 [cm]); k = K mu/(rho g) with water at 20 degC. Range: d10
    0.1 to 3 mm, loose, D60/D10 below 5.

    References
    ----------
    Hazen, A. 1911, "Discussion: Dams on sand foundations", Trans. ASCE 73:199-203 (from memory).

    Examples
    --------
    >>> round(float(permeability_hazen_md(0.1)) / 1000.0, 2)
    10.37
    """
    size_cm = 0.1 * positive("effective_size_mm", effective_size_mm)
    conductivity = positive("hazen_coefficient", hazen_coefficient) * size_cm**2
    return conductivity_permeability_md(conductivity, *WATER_20_DEGC)


def permeability_kozeny_carman_md(
    grain_size_mm: ArrayLike, porosity_frac: ArrayLike, kozeny_carman_constant: ArrayLike = 180.0
) -> Array:
    """Permeability of a granular pack, after Kozeny & Carman.

    Parameters
    ----------
    grain_size_mm : array_like
        Effective grain size [mm], above 0.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    kozeny_carman_constant : array_like
        B [1], above 0; 180, or 150.

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate, wrong for cracks and clay.

    Raises
    ------
    Impossible
        If a size, a porosity or a constant is not above 0, or a porosity not below 1.

    Notes
    -----
    k = d^2 phi^3/(B (1 - phi)^2), d grain size, phi porosity; 180 is 72 times a tortuosity of 2.5.

    References
    ----------
    Carman, P. C. 1937, "Fluid flow through granular beds", Trans. Inst. Chem. Eng. 15:150-166 (constant from
    memory).

    Examples
    --------
    >>> round(float(permeability_kozeny_carman_md(0.25, 0.40)) / 1000.0, 2)
    62.55
    """
    size_m = 1e-3 * positive("grain_size_mm", grain_size_mm)
    phi = _porosity(porosity_frac)
    constant = positive("kozeny_carman_constant", kozeny_carman_constant)
    return size_m**2 * phi**3 / (constant * (1.0 - phi) ** 2) / MILLIDARCY_M2


def permeability_panda_lake_md(
    mean_size_mm: ArrayLike,
    size_variation: ArrayLike,
    size_skewness: ArrayLike,
    porosity_frac: ArrayLike,
    tortuosity: ArrayLike = 2.5,
) -> Array:
    """Permeability of uncemented sand with grains of many sizes, after Panda & Lake.

    Parameters
    ----------
    mean_size_mm : array_like
        Arithmetic mean of the grains' diameters, by number [mm], above 0.
    size_variation : array_like
        Their coefficient of variation [1], 0 or more.
    size_skewness : array_like
        Their skewness [1], 0 or more.
    porosity_frac : array_like
        Porosity [v/v], above 0, below 1.
    tortuosity : array_like
        Tortuosity [1], 1 or more; 2.5.

    Returns
    -------
    Array
        Permeability [md], broadcast shape: an estimate.

    Raises
    ------
    Impossible
        If a size or a porosity is not above 0, a porosity not below 1, a variation or a skewness negative,
        or a tortuosity below 1.

    Notes
    -----
    k = D^2 phi^3/(72 tau (1 - phi)^2) [(g C^3 + 3 C^2 + 1)/(1 + C^2)]^2, D mean size, C coefficient of
    variation, g skewness, tau tortuosity, phi porosity: Kozeny & Carman with the mean cube over the mean
    square of the diameters for the size. Statistics by number of grains, in mm, not by mass in phi.

    References
    ----------
    Panda, M. N. & Lake, L. W. 1994, "Estimation of single-phase permeability from parameters of
    particle-size distribution", AAPG Bull. 78:1028-1039 (form from memory, derived here again).

    Examples
    --------
    >>> round(float(permeability_panda_lake_md(0.25, 0.0, 0.0, 0.40)) / 1000.0, 2)
    62.55
    """
    c = not_negative("size_variation", size_variation)
    skewness = not_negative("size_skewness", size_skewness)
    tau = finite("tortuosity", tortuosity)
    refuse(tau.real < 1.0, "tortuosity", tau, "1 or more")
    size = positive("mean_size_mm", mean_size_mm) * (skewness * c**3 + 3.0 * c**2 + 1.0) / (1.0 + c**2)
    return permeability_kozeny_carman_md(size, porosity_frac, 72.0 * tau)


_SIZE = Symbol("d", "grain_size_mm", "mm", "grain size")
_SORTING = Symbol("sigma", "sorting_phi", "phi", "standard deviation of grain size")
_TRASK = Symbol("S_o", "trask_sorting", "1", "Trask's sorting coefficient")
_PHI = Symbol("phi", "porosity_frac", "v/v", "porosity")
_K = (Symbol("k", "permeability_md", "mD", "permeability, estimated"),)
_FOLK = "Folk & Ward 1957, J. Sediment. Petrol. 27:3-26 (forms from memory)"
_STATISTICS = (
    Symbol("M_z", "mean_phi", "phi", "graphic mean"),
    Symbol("sigma_I", "sorting_phi", "phi", "graphic standard deviation"),
    Symbol("Sk_I", "skewness", "1", "graphic skewness"),
    Symbol("K_G", "kurtosis", "1", "graphic kurtosis"),
)


def _percentile(percent: int) -> Symbol:
    return Symbol(f"P{percent}", f"percentile_{percent}_phi", "phi", f"size that {percent} % is coarser than")


FORMULAS: tuple[Formula, ...] = (
    Formula(
        "grain-size-phi",
        1,
        "Grain size in phi",
        "phi = -log2(d/1 mm)",
        (_SIZE,),
        (Symbol("phi", "size_phi", "phi", "grain size"),),
        "any",
        "Krumbein 1934, J. Sediment. Petrol. 4:65-77 (from memory)",
        "published limits of the classes",
        grain_size_phi,
    ),
    Formula(
        "grain-size-mm",
        1,
        "Grain size from phi",
        "d = 2^-phi mm",
        (Symbol("phi", "size_phi", "phi", "grain size"),),
        (_SIZE,),
        "any",
        "Krumbein 1934, J. Sediment. Petrol. 4:65-77 (from memory)",
        "published limits of the classes",
        grain_size_mm,
    ),
    Formula(
        "folk-ward",
        1,
        "Graphic statistics of grain size",
        "M_z = (P16 + P50 + P84)/3; sigma_I = (P84 - P16)/4 + (P95 - P5)/6.6; Sk_I = (P16 + P84 - 2 P50)/(2 "
        "(P84 - P16)) + (P5 + P95 - 2 P50)/(2 (P95 - P5)); K_G = (P95 - P5)/(2.44 (P75 - P25))",
        tuple(_percentile(p) for p in (5, 16, 25, 50, 75, 84, 95)),
        _STATISTICS,
        "percentiles from coarse to fine",
        _FOLK,
        "worked sieve samples; exact normal distribution",
        folk_ward,
    ),
    Formula(
        "trask-sorting",
        1,
        "Trask's sorting coefficient",
        "S_o = 2^((P75 - P25)/2)",
        (_percentile(25), _percentile(75)),
        (_TRASK,),
        "its class names are not Folk's",
        "Trask 1932, Origin and environment of source sediments of petroleum (from memory)",
        "worked sieve samples; exact normal distribution",
        trask_sorting,
    ),
    Formula(
        "sorting-from-trask",
        1,
        "Sorting in phi from Trask's coefficient",
        "sigma = log2(S_o)/0.67449",
        (_TRASK,),
        (_SORTING,),
        "lognormal sizes",
        "definition; quartiles of the normal distribution",
        "tabulated values",
        sorting_from_trask_phi,
    ),
    Formula(
        "sieve-recovery",
        1,
        "Recovery of sieving",
        "R = sum of m/M",
        (
            Symbol("m", "sieved_mass_g", "g", "sum of the masses retained"),
            Symbol("M", "dry_mass_g", "g", "dry mass before sieving"),
        ),
        (Symbol("R", "sieve_recovery_frac", "v/v", "recovery"),),
        "a loss beyond 1 % is doubtful (common practice)",
        "mass balance",
        "published sieve sheet",
        sieve_recovery_frac,
    ),
    Formula(
        "sieve-statistics",
        1,
        "Statistics of a sieve curve",
        "percentiles straight in phi; Folk & Ward; Trask; moments at the classes' middles",
        (
            Symbol("a", "aperture_mm", "mm", "aperture; 0 is the pan"),
            Symbol("m", "mass_retained_g", "g", "mass retained"),
            Symbol("", "group", "", "which sample a sieve belongs to"),
            Symbol("", "coarse_limit_phi", "phi", "end of the class on the coarsest sieve"),
            Symbol("", "fine_limit_phi", "phi", "end of the class in the pan"),
        ),
        (
            Symbol("P50", "median_phi", "phi", "median"),
            *_STATISTICS,
            _TRASK,
            Symbol("m1", "moment_mean_phi", "phi", "mean"),
            Symbol("m2", "moment_sorting_phi", "phi", "standard deviation"),
            Symbol("m3", "moment_skewness", "1", "skewness"),
            Symbol("m4", "moment_kurtosis", "1", "kurtosis"),
            Symbol("P", "percentiles_phi", "phi", "P5, P10, P16, P25, P50, P75, P84, P90, P95"),
            Symbol("M", "mass_g", "g", "sum of the masses"),
            Symbol("", "open_coarse", "", "a percentile lies above the coarsest sieve"),
            Symbol("", "open_fine", "", "a percentile lies in the pan"),
            Symbol("", "one_sieve", "", "more than 95 % on one sieve"),
        ),
        "nothing is carried into an open class",
        _FOLK + "; Krumbein & Pettijohn 1938 (moments, from memory)",
        "published sieve sheets; laws",
        sieve_statistics,
        elementwise=False,
    ),
    Formula(
        "packing-porosity",
        1,
        "Porosity of a packed sand",
        "phi = 0.45 x/(1 + x), x = 3.7632 sigma^-0.7552",
        (Symbol("sigma", "sorting_phi", "phi", "standard deviation of grain size", 0.1, 3.1),),
        (_PHI,),
        "clean packed sand, 0.1 to 3.1 phi",
        "Weltje's fit to Beard & Weyl 1973, AAPG Bull. 57:349-369 (as quoted)",
        "published table, within 2 porosity units",
        packing_porosity_frac,
    ),
    Formula(
        "sandstone-porosity-bloch",
        1,
        "Porosity of a buried sandstone",
        "phi % = -6.1 + 9.8/S_o + 0.17 R %",
        (_TRASK, Symbol("R", "rigid_grain_frac", "v/v", "share of rigid grains")),
        (_PHI,),
        "an estimate",
        "Bloch 1991, AAPG Bull. 75:1145-1160 (as quoted)",
        "worked value",
        sandstone_porosity_frac,
    ),
    Formula(
        "permeability-krumbein-monk",
        1,
        "Permeability of loose sand, Krumbein & Monk",
        "k = 760 d^2 exp(-1.31 sigma) darcy, d in mm",
        (_SIZE, _SORTING),
        _K,
        "loose sand packed at 40 % porosity",
        "Krumbein & Monk 1943, Trans. AIME 151:153-163 (as quoted)",
        "worked values; packed sands of Beard & Weyl within 45 %",
        permeability_krumbein_monk_md,
    ),
    Formula(
        "permeability-berg",
        1,
        "Permeability of clean sand, Berg",
        "k = 80.8 phi^5.1 d^2 exp(-1.385 p) md, d in um",
        (
            Symbol("phi", "porosity_frac", "v/v", "porosity", 0.30, 1.0),
            Symbol("d", "median_size_mm", "mm", "median grain size"),
            Symbol("p", "percentile_spread_phi", "phi", "P90 - P10"),
        ),
        _K,
        "clean quartz sand, best above 0.30",
        "Berg 1970, Trans. Gulf Coast Assoc. Geol. Soc. 20:303-317 (from memory)",
        "worked values; both printed forms",
        permeability_berg_md,
    ),
    Formula(
        "permeability-van-baaren",
        1,
        "Permeability of sandstone, van Baaren",
        "k = 10 d^2 phi^(3.64 + m) C^-3.64 md, d in um",
        (
            Symbol("d", "dominant_size_mm", "mm", "dominant grain size"),
            _PHI,
            Symbol("m", "cementation_exponent", "1", "cementation exponent", 1.4, 2.0),
            Symbol("C", "sorting_constant", "1", "sorting constant", 0.7, 1.0),
        ),
        _K,
        "m 1.4 to 2.0; C 0.7 (extremely well sorted) to 1.0 (poorly)",
        "van Baaren 1979, 6th SPWLA European Symposium (from memory)",
        "worked values",
        permeability_van_baaren_md,
    ),
    Formula(
        "conductivity-permeability",
        1,
        "Permeability from hydraulic conductivity",
        "k = K mu/(rho g)",
        (
            Symbol("K", "conductivity_cm_s", "cm/s", "hydraulic conductivity"),
            Symbol("mu", "viscosity_mpas", "mPa.s", "viscosity of the water"),
            Symbol("rho", "density_g_cm3", "g/cm3", "density of the water"),
        ),
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        "any",
        "definition",
        "published example; 1 cm/s with water at 20 degC",
        conductivity_permeability_md,
    ),
    Formula(
        "permeability-hazen",
        1,
        "Permeability of loose sand, Hazen",
        "K = C d10^2 cm/s, d10 in cm; k = K mu/(rho g), water at 20 degC",
        (
            Symbol("d10", "effective_size_mm", "mm", "size that 10 % is finer than", 0.1, 3.0),
            Symbol("C", "hazen_coefficient", "1", "coefficient", 40.0, 150.0),
        ),
        _K,
        "d10 0.1 to 3 mm, D60/D10 below 5, loose",
        "Hazen 1911, Trans. ASCE 73:199-203 (from memory)",
        "worked value",
        permeability_hazen_md,
    ),
    Formula(
        "permeability-kozeny-carman",
        1,
        "Permeability of a granular pack, Kozeny & Carman",
        "k = d^2 phi^3/(B (1 - phi)^2)",
        (_SIZE, _PHI, Symbol("B", "kozeny_carman_constant", "1", "constant")),
        _K,
        "grains of one effective size; wrong for cracks and clay",
        "Carman 1937, Trans. Inst. Chem. Eng. 15:150-166 (constant from memory)",
        "published example; worked values; ratios",
        permeability_kozeny_carman_md,
    ),
    Formula(
        "permeability-panda-lake",
        1,
        "Permeability of grains of many sizes, Panda & Lake",
        "k = D^2 phi^3/(72 tau (1 - phi)^2) [(g C^3 + 3 C^2 + 1)/(1 + C^2)]^2",
        (
            Symbol("D", "mean_size_mm", "mm", "mean diameter by number"),
            Symbol("C", "size_variation", "1", "coefficient of variation of the diameters"),
            Symbol("g", "size_skewness", "1", "skewness of the diameters"),
            _PHI,
            Symbol("tau", "tortuosity", "1", "tortuosity"),
        ),
        _K,
        "uncemented; statistics by number of grains",
        "Panda & Lake 1994, AAPG Bull. 78:1028-1039 (form from memory)",
        "the mean cube over the mean square of drawn grains; Kozeny & Carman for one size",
        permeability_panda_lake_md,
    ),
)
