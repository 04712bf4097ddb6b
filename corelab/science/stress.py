"""Net confining stress, and how permeability and pore volume fall with it.

Stresses are in MPa, pressures absolute in kPa, permeabilities in md, volumes in cm3. Net confining stress is
confining pressure less mean pore pressure: the coefficient of effective stress is taken as 1.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from corelab.science.formula import Array, Formula, Mask, Symbol, finite, not_negative, positive, refuse
from corelab.science.gas_flow import PSI_KPA, different_values, group_lines, grouped

PSI_MPA = PSI_KPA / 1000.0
JONES_STRESS_MPA = 3000.0 * PSI_MPA
"""Jones 1988, preset s* = 3000 psi (from memory)."""
JONES_DECLINE_1_MPA = 3e-6 / PSI_MPA
"""Jones 1988, preset C = 3e-6 1/psi (from memory)."""


def net_confining_stress_mpa(confining_pressure_kpa: ArrayLike, mean_pressure_kpa: ArrayLike) -> Array:
    """Net confining stress of a plug in a holder.

    Parameters
    ----------
    confining_pressure_kpa : array_like
        Absolute pressure around the sleeve [kPa], above 0, not below the mean pore pressure.
    mean_pressure_kpa : array_like
        Mean absolute pressure in the pores [kPa], 0 or more.

    Returns
    -------
    Array
        Net confining stress [MPa], broadcast shape.

    Raises
    ------
    Impossible
        If a confining pressure is not above 0, a mean pressure negative, or a confining pressure below the
        mean pressure: the sleeve would not seal.

    Notes
    -----
    sigma = p_c - alpha p_m, p_c confining pressure, p_m mean pore pressure, alpha coefficient of effective
    stress, taken as 1. Gauge readings of both give the same, since the barometer drops out.

    References
    ----------
    Terzaghi, K. 1943, "Theoretical soil mechanics" (from memory); alpha 1 is common practice.

    Examples
    --------
    >>> float(net_confining_stress_mpa(5700.0, 200.0))
    5.5
    """
    confining = positive("confining_pressure_kpa", confining_pressure_kpa)
    pore = not_negative("mean_pressure_kpa", mean_pressure_kpa)
    refuse(
        confining.real < pore.real,
        "confining_pressure_kpa",
        confining,
        "at least the mean pore pressure, both absolute",
    )
    return (confining - pore) / 1000.0


def _poisson(poisson_ratio: ArrayLike) -> Array:
    nu = finite("poisson_ratio", poisson_ratio)
    refuse((nu.real <= -1.0) | (nu.real > 0.5), "poisson_ratio", nu, "a number above -1, at most 0.5")
    return nu


def uniaxial_factor(poisson_ratio: ArrayLike) -> Array:
    """Mean stress under uniaxial strain as a share of the vertical one, after Teeuw.

    Parameters
    ----------
    poisson_ratio : array_like
        Poisson's ratio of the drained rock [1], above -1, at most 0.5.

    Returns
    -------
    Array
        Factor [1], shape of the input.

    Raises
    ------
    Impossible
        If a ratio is not above -1, or above 0.5.

    Notes
    -----
    f = (1 + nu)/(3 (1 - nu)), nu Poisson's ratio; linear elastic, no strain sideways. Range: 0 to 0.5.

    References
    ----------
    Teeuw, D. 1971, "Prediction of formation compaction from laboratory compressibility data", SPE J.
    11:263-271 (form from memory).

    Examples
    --------
    >>> round(float(uniaxial_factor(0.30)), 5)
    0.61905
    """
    nu = _poisson(poisson_ratio)
    return (1.0 + nu) / (3.0 * (1.0 - nu))


def equivalent_hydrostatic_stress_mpa(
    overburden_stress_mpa: ArrayLike, pore_pressure_mpa: ArrayLike, poisson_ratio: ArrayLike
) -> Array:
    """Hydrostatic laboratory stress that stands for the stress in the reservoir.

    Parameters
    ----------
    overburden_stress_mpa : array_like
        Total vertical stress [MPa], above 0, not below the pore pressure.
    pore_pressure_mpa : array_like
        Pore pressure of the reservoir [MPa], 0 or more.
    poisson_ratio : array_like
        Poisson's ratio of the drained rock [1], above -1, at most 0.5.

    Returns
    -------
    Array
        Hydrostatic net stress [MPa], broadcast shape.

    Raises
    ------
    Impossible
        If an overburden is not above 0 or below the pore pressure, a pore pressure negative, or a ratio not
        above -1 or above 0.5.

    Notes
    -----
    sigma = (1 + nu)/(3 (1 - nu)) (S_v - p), S_v overburden stress, p pore pressure, nu Poisson's ratio.

    References
    ----------
    Teeuw, D. 1971, "Prediction of formation compaction from laboratory compressibility data", SPE J.
    11:263-271 (form from memory).

    Examples
    --------
    >>> round(float(equivalent_hydrostatic_stress_mpa(50.0, 15.0, 0.25)), 3)
    19.444
    """
    overburden = positive("overburden_stress_mpa", overburden_stress_mpa)
    pore = not_negative("pore_pressure_mpa", pore_pressure_mpa)
    refuse(overburden.real < pore.real, "overburden_stress_mpa", overburden, "at least the pore pressure")
    return uniaxial_factor(poisson_ratio) * (overburden - pore)


def permeability_jones_owens_md(
    permeability_1000_psi_md: ArrayLike, stress_slope: ArrayLike, net_stress_mpa: ArrayLike
) -> Array:
    """Permeability of tight gas sand under stress, after Jones & Owens.

    Parameters
    ----------
    permeability_1000_psi_md : array_like
        Permeability at a net stress of 1000 psi [md], above 0.
    stress_slope : array_like
        S [1], 0 or more.
    net_stress_mpa : array_like
        Net confining stress [MPa], above 0, and below the one at which the law reaches 0.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a stress is not above 0, a slope negative, or a stress so great that the law
        gives no permeability.

    Notes
    -----
    (k/k_1000)^(1/3) = 1 - S log10(sigma/1000 psi), k permeability, sigma net stress.

    References
    ----------
    Jones, F. O. & Owens, W. W. 1980, "A laboratory study of low-permeability gas sands", J. Pet. Technol.
    32:1631-1640 (form from memory).

    Examples
    --------
    >>> round(float(permeability_jones_owens_md(0.1, 0.40, 4000 * 0.006894757293168)), 6)
    0.043755
    """
    permeability = positive("permeability_1000_psi_md", permeability_1000_psi_md)
    slope = not_negative("stress_slope", stress_slope)
    stress = positive("net_stress_mpa", net_stress_mpa)
    root = 1.0 - slope * np.log10(stress / (1000.0 * PSI_MPA))
    refuse(root.real <= 0.0, "net_stress_mpa", stress, "a stress at which the law is still above 0")
    return permeability * root**3


def _softening(stress: Array, star: Array) -> Array:
    """x of Jones's law: ln(value) falls by -a x."""
    return np.exp(-stress / star) - 1.0


def _presets(star_mpa: ArrayLike, decline_1_mpa: ArrayLike) -> tuple[Array, Array]:
    return positive("characteristic_stress_mpa", star_mpa), not_negative("decline_1_mpa", decline_1_mpa)


def _jones(
    value: Array, exponent: ArrayLike, stress_mpa: ArrayLike, star_mpa: ArrayLike, decline_1_mpa: ArrayLike
) -> Array:
    stress = not_negative("net_stress_mpa", stress_mpa)
    star, decline = _presets(star_mpa, decline_1_mpa)
    a = not_negative("stress_exponent", exponent)
    return value * np.exp(a * _softening(stress, star)) / (1.0 + decline * stress)


def permeability_jones_md(
    permeability_zero_md: ArrayLike,
    stress_exponent: ArrayLike,
    net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> Array:
    """Permeability under stress, after Jones 1988.

    Parameters
    ----------
    permeability_zero_md : array_like
        k0, permeability without stress [md], above 0.
    stress_exponent : array_like
        a_k [1], 0 or more.
    net_stress_mpa : array_like
        Net confining stress [MPa], 0 or more.
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or an s* is not above 0, or an exponent, a stress or a C negative.

    Notes
    -----
    k = k0 exp{a_k [exp(-sigma/s*) - 1]}/(1 + C sigma), sigma net stress.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> round(float(permeability_jones_md(11.592823, 0.36422454, 20.684271879504)), 4)
    9.1266
    """
    k0 = positive("permeability_zero_md", permeability_zero_md)
    return _jones(k0, stress_exponent, net_stress_mpa, characteristic_stress_mpa, decline_1_mpa)


def pore_volume_jones_cm3(
    pore_volume_zero_cm3: ArrayLike,
    stress_exponent: ArrayLike,
    net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> Array:
    """Pore volume under stress, after Jones 1988.

    Parameters
    ----------
    pore_volume_zero_cm3 : array_like
        Pore volume without stress [cm3], above 0.
    stress_exponent : array_like
        a_v [1], 0 or more.
    net_stress_mpa : array_like
        Net confining stress [MPa], 0 or more.
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    Array
        Pore volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a volume or an s* is not above 0, or an exponent, a stress or a C negative.

    Notes
    -----
    V = V0 exp{a_v [exp(-sigma/s*) - 1]}/(1 + C sigma), sigma net stress.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> float(pore_volume_jones_cm3(12.0, 0.02, 0.0))
    12.0
    """
    volume = positive("pore_volume_zero_cm3", pore_volume_zero_cm3)
    return _jones(volume, stress_exponent, net_stress_mpa, characteristic_stress_mpa, decline_1_mpa)


def _apart(
    stress_mpa: ArrayLike,
    other_stress_mpa: ArrayLike,
    check: Callable[[str, ArrayLike], Array] = not_negative,
) -> tuple[Array, Array]:
    stress, other = check("net_stress_mpa", stress_mpa), check("other_net_stress_mpa", other_stress_mpa)
    refuse(stress.real >= other.real, "other_net_stress_mpa", other, "more than the first net stress")
    return stress, other


@dataclass(frozen=True, slots=True)
class PermeabilityLaw:
    """Jones's law through two permeabilities; `rising` marks a permeability that grows with stress."""

    permeability_zero_md: Array
    stress_exponent: Array
    rising: Mask


def permeability_two_point(
    permeability_md: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_permeability_md: ArrayLike,
    other_net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> PermeabilityLaw:
    """Jones's law from permeabilities at two net stresses.

    Parameters
    ----------
    permeability_md, net_stress_mpa : array_like
        Permeability [md], above 0, at the lower net stress [MPa], 0 or more.
    other_permeability_md, other_net_stress_mpa : array_like
        Permeability [md], above 0, at the higher net stress [MPa].
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    PermeabilityLaw
        k0 [md], a_k [1] and `rising`, broadcast shape. Where it rises, a_k is below 0 and no rock's.

    Raises
    ------
    Impossible
        If a permeability or an s* is not above 0, a stress or a C negative, or the other stress not the
        higher one.

    Notes
    -----
    ln(k (1 + C sigma)) = ln k0 + a_k [exp(-sigma/s*) - 1]: a line through two points.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> law = permeability_two_point(10.0, 1500 * 0.006894757293168, 8.5, 5000 * 0.006894757293168)
    >>> round(float(law.stress_exponent), 5), round(float(law.permeability_zero_md), 3)
    (0.36422, 11.593)
    """
    first = positive("permeability_md", permeability_md)
    second = positive("other_permeability_md", other_permeability_md)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa)
    zero, a = _two_point(first, stress, second, other, characteristic_stress_mpa, decline_1_mpa)
    return PermeabilityLaw(zero, a, a.real < 0.0)


def _two_point(
    first: Array, stress: Array, second: Array, other: Array, star_mpa: ArrayLike, decline_1_mpa: ArrayLike
) -> tuple[Array, Array]:
    star, decline = _presets(star_mpa, decline_1_mpa)
    y, y_other = np.log(first * (1.0 + decline * stress)), np.log(second * (1.0 + decline * other))
    x, x_other = _softening(stress, star), _softening(other, star)
    a = (y - y_other) / (x - x_other)
    return np.exp(y - a * x), a


@dataclass(frozen=True, slots=True)
class PoreVolumeLaw:
    """Jones's law through two pore volumes; `rising` marks a pore volume that grows with stress."""

    pore_volume_zero_cm3: Array
    stress_exponent: Array
    rising: Mask


def pore_volume_two_point(
    pore_volume_cm3: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_pore_volume_cm3: ArrayLike,
    other_net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> PoreVolumeLaw:
    """Jones's law from pore volumes at two net stresses.

    Parameters
    ----------
    pore_volume_cm3, net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the lower net stress [MPa], 0 or more.
    other_pore_volume_cm3, other_net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the higher net stress [MPa].
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    PoreVolumeLaw
        V0 [cm3], a_v [1] and `rising`, broadcast shape. Where it rises, a_v is below 0 and no rock's.

    Raises
    ------
    Impossible
        If a volume or an s* is not above 0, a stress or a C negative, or the other stress not the higher
        one.

    Notes
    -----
    ln(V (1 + C sigma)) = ln V0 + a_v [exp(-sigma/s*) - 1]: a line through two points.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> law = pore_volume_two_point(12.0, 5.0, 11.7, 30.0)
    >>> round(float(pore_volume_jones_cm3(law.pore_volume_zero_cm3, law.stress_exponent, 30.0)), 9)
    11.7
    """
    first = positive("pore_volume_cm3", pore_volume_cm3)
    second = positive("other_pore_volume_cm3", other_pore_volume_cm3)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa)
    zero, a = _two_point(first, stress, second, other, characteristic_stress_mpa, decline_1_mpa)
    return PoreVolumeLaw(zero, a, a.real < 0.0)


@dataclass(frozen=True, slots=True)
class PermeabilityLaws:
    """Jones's laws fitted to permeabilities, one a group; `residuals` of ln k, one a reading.

    `rising` marks a permeability that grows with stress: no rock's law, shown so that the fault can be
    found.
    """

    permeability_zero_md: Array
    stress_exponent: Array
    permeability_zero_se_md: Array
    stress_exponent_se: Array
    covariance_md: Array
    r_squared: Array
    points: NDArray[np.intp]
    rising: Mask
    residuals: Array


def permeability_stress_regression(
    permeability_md: ArrayLike,
    net_stress_mpa: ArrayLike,
    group: ArrayLike,
    characteristic_stress_mpa: float = JONES_STRESS_MPA,
    decline_1_mpa: float = JONES_DECLINE_1_MPA,
) -> PermeabilityLaws:
    """Jones's law from permeabilities at three or more net stresses, by least squares.

    Parameters
    ----------
    permeability_md : array_like (n,)
        Permeabilities [md], above 0.
    net_stress_mpa : array_like (n,)
        Their net confining stresses [MPa], 0 or more.
    group : array_like of int (n,)
        Which law a reading belongs to, 0 to m - 1.
    characteristic_stress_mpa, decline_1_mpa : float
        s* [MPa], above 0, and C [1/MPa], 0 or more: presets 3000 psi and 3e-6 1/psi.

    Returns
    -------
    PermeabilityLaws
        Arrays (m,): k0 [md], a_k [1], their standard errors and covariance, r squared of ln(k (1 + C
        sigma)), points, `rising`; and the residuals of ln k (n,). NaN for a group with fewer than three
        different stresses or with a missing reading.

    Raises
    ------
    Impossible
        If a permeability is not above 0, a stress negative, or a group not a whole number from 0.

    Notes
    -----
    ln(k (1 + C sigma)) = ln k0 + a_k [exp(-sigma/s*) - 1]: least squares, so that equal ratios count
    alike; var k0 = k0^2 var(ln k0).

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> stress = np.array([5.0, 15.0, 40.0])
    >>> laws = permeability_stress_regression(permeability_jones_md(12.0, 0.4, stress), stress, [0, 0, 0])
    >>> laws.permeability_zero_md.round(9).tolist(), laws.stress_exponent.round(9).tolist()
    ([12.0], [0.4])
    """
    given = positive("permeability_md", permeability_md)
    return PermeabilityLaws(*_fitted(given, net_stress_mpa, group, characteristic_stress_mpa, decline_1_mpa))


def _fitted(
    values: Array, stress_mpa: ArrayLike, group: ArrayLike, star_mpa: float, decline_1_mpa: float
) -> tuple[Array, Array, Array, Array, Array, Array, NDArray[np.intp], Mask, Array]:
    stress = not_negative("net_stress_mpa", stress_mpa)
    star, decline = _presets(star_mpa, decline_1_mpa)
    labels, n, (values, stress) = grouped(group, values, stress)
    x, y = _softening(stress, star), np.log(values * (1.0 + decline * stress))
    line = group_lines(x, y, labels, n, different_values(stress, labels, n))
    zero = np.exp(line.intercept)
    return (
        zero,
        line.slope,
        zero * np.sqrt(line.intercept_variance),
        np.sqrt(line.slope_variance),
        zero * line.covariance,
        line.r_squared,
        line.points,
        line.slope.real < 0.0,
        y - line.intercept[labels] - line.slope[labels] * x,
    )


@dataclass(frozen=True, slots=True)
class PoreVolumeLaws:
    """Jones's laws fitted to pore volumes, one a group; `residuals` of ln V, one a reading.

    `rising` marks a pore volume that grows with stress: no rock's law, shown so that the fault can be found.
    """

    pore_volume_zero_cm3: Array
    stress_exponent: Array
    pore_volume_zero_se_cm3: Array
    stress_exponent_se: Array
    covariance_cm3: Array
    r_squared: Array
    points: NDArray[np.intp]
    rising: Mask
    residuals: Array


def pore_volume_stress_regression(
    pore_volume_cm3: ArrayLike,
    net_stress_mpa: ArrayLike,
    group: ArrayLike,
    characteristic_stress_mpa: float = JONES_STRESS_MPA,
    decline_1_mpa: float = JONES_DECLINE_1_MPA,
) -> PoreVolumeLaws:
    """Jones's law from pore volumes at three or more net stresses, by least squares.

    Parameters
    ----------
    pore_volume_cm3 : array_like (n,)
        Pore volumes [cm3], above 0.
    net_stress_mpa : array_like (n,)
        Their net confining stresses [MPa], 0 or more.
    group : array_like of int (n,)
        Which law a reading belongs to, 0 to m - 1.
    characteristic_stress_mpa, decline_1_mpa : float
        s* [MPa], above 0, and C [1/MPa], 0 or more: presets 3000 psi and 3e-6 1/psi.

    Returns
    -------
    PoreVolumeLaws
        Arrays (m,): V0 [cm3], a_v [1], their standard errors and covariance, r squared of ln(V (1 + C
        sigma)), points, `rising`; and the residuals of ln V (n,). NaN for a group with fewer than three
        different stresses or with a missing reading.

    Raises
    ------
    Impossible
        If a volume is not above 0, a stress negative, or a group not a whole number from 0.

    Notes
    -----
    ln(V (1 + C sigma)) = ln V0 + a_v [exp(-sigma/s*) - 1]: least squares.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> stress = np.array([5.0, 15.0, 40.0])
    >>> laws = pore_volume_stress_regression(pore_volume_jones_cm3(9.0, 0.03, stress), stress, [0, 0, 0])
    >>> laws.pore_volume_zero_cm3.round(9).tolist(), laws.stress_exponent.round(9).tolist()
    ([9.0], [0.03])
    """
    given = positive("pore_volume_cm3", pore_volume_cm3)
    return PoreVolumeLaws(*_fitted(given, net_stress_mpa, group, characteristic_stress_mpa, decline_1_mpa))


def _wanted(wanted_mpa: ArrayLike, stress: Array, other: Array) -> Array:
    wanted = not_negative("wanted_net_stress_mpa", wanted_mpa)
    refuse(
        (wanted.real < stress.real) | (wanted.real > other.real),
        "wanted_net_stress_mpa",
        wanted,
        "a net stress between the two measured ones",
    )
    return wanted


def _between(
    first: Array,
    stress: Array,
    second: Array,
    other: Array,
    wanted: Array,
    star: ArrayLike,
    decline: ArrayLike,
) -> Array:
    star, decline = _presets(star, decline)
    zero, a = _two_point(first, stress, second, other, star, decline)
    return zero * np.exp(a * _softening(wanted, star)) / (1.0 + decline * wanted)


def permeability_between_md(
    permeability_md: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_permeability_md: ArrayLike,
    other_net_stress_mpa: ArrayLike,
    wanted_net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> Array:
    """Permeability at a stress between two measured ones, along Jones's law.

    Parameters
    ----------
    permeability_md, net_stress_mpa : array_like
        Permeability [md], above 0, at the lower net stress [MPa], 0 or more.
    other_permeability_md, other_net_stress_mpa : array_like
        Permeability [md], above 0, at the higher net stress [MPa].
    wanted_net_stress_mpa : array_like
        Net stress wanted [MPa], from the lower to the higher one.
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or an s* is not above 0, a stress or a C negative, the other stress not the higher
        one, or the wanted stress beyond the measured ones.

    Notes
    -----
    k = k0 exp{a_k [exp(-sigma/s*) - 1]}/(1 + C sigma), k0 and a_k through the two measurements, sigma net
    stress. Never beyond them.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> psi = 0.006894757293168
    >>> round(float(permeability_between_md(10.0, 1500 * psi, 8.5, 5000 * psi, 3000 * psi)), 4)
    9.1266
    """
    first = positive("permeability_md", permeability_md)
    second = positive("other_permeability_md", other_permeability_md)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa)
    wanted = _wanted(wanted_net_stress_mpa, stress, other)
    return _between(first, stress, second, other, wanted, characteristic_stress_mpa, decline_1_mpa)


def pore_volume_between_cm3(
    pore_volume_cm3: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_pore_volume_cm3: ArrayLike,
    other_net_stress_mpa: ArrayLike,
    wanted_net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> Array:
    """Pore volume at a stress between two measured ones, along Jones's law.

    Parameters
    ----------
    pore_volume_cm3, net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the lower net stress [MPa], 0 or more.
    other_pore_volume_cm3, other_net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the higher net stress [MPa].
    wanted_net_stress_mpa : array_like
        Net stress wanted [MPa], from the lower to the higher one.
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    Array
        Pore volume [cm3], broadcast shape.

    Raises
    ------
    Impossible
        If a volume or an s* is not above 0, a stress or a C negative, the other stress not the higher one,
        or the wanted stress beyond the measured ones.

    Notes
    -----
    V = V0 exp{a_v [exp(-sigma/s*) - 1]}/(1 + C sigma), V0 and a_v through the two measurements, sigma net
    stress. Never beyond them.

    References
    ----------
    Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net confining stress", SPE Form.
    Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> round(float(pore_volume_between_cm3(12.0, 5.0, 11.7, 30.0, 5.0)), 9)
    12.0
    """
    first = positive("pore_volume_cm3", pore_volume_cm3)
    second = positive("other_pore_volume_cm3", other_pore_volume_cm3)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa)
    wanted = _wanted(wanted_net_stress_mpa, stress, other)
    return _between(first, stress, second, other, wanted, characteristic_stress_mpa, decline_1_mpa)


def permeability_between_log_md(
    permeability_md: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_permeability_md: ArrayLike,
    other_net_stress_mpa: ArrayLike,
    wanted_net_stress_mpa: ArrayLike,
) -> Array:
    """Permeability at a stress between two measured ones, straight on logarithmic paper.

    Parameters
    ----------
    permeability_md, net_stress_mpa : array_like
        Permeability [md] at the lower net stress [MPa], both above 0.
    other_permeability_md, other_net_stress_mpa : array_like
        Permeability [md], above 0, at the higher net stress [MPa].
    wanted_net_stress_mpa : array_like
        Net stress wanted [MPa], from the lower to the higher one.

    Returns
    -------
    Array
        Permeability [md], broadcast shape.

    Raises
    ------
    Impossible
        If a permeability or a stress is not above 0, the other stress not the higher one, or the wanted
        stress beyond the measured ones.

    Notes
    -----
    ln k = ln k1 + (ln k2 - ln k1) ln(sigma/sigma1)/ln(sigma2/sigma1), k permeability, sigma net stress.
    Never beyond the measurements.

    References
    ----------
    Definition; log k against log stress is common practice.

    Examples
    --------
    >>> round(float(permeability_between_log_md(10.0, 5.0, 2.5, 20.0, 10.0)), 9)
    5.0
    """
    first = positive("permeability_md", permeability_md)
    second = positive("other_permeability_md", other_permeability_md)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa, positive)
    wanted = _wanted(wanted_net_stress_mpa, stress, other)
    share = np.log(wanted / stress) / np.log(other / stress)
    return first * np.exp(share * np.log(second / first))


@dataclass(frozen=True, slots=True)
class Bracket:
    """The readings on either side of the stress wanted, one a group.

    `below` and `above` are their places in the columns given; `outside` marks a group that has no readings
    on both sides (the places are then 0 and mean nothing). A reading at the stress wanted is taken with a
    neighbour.
    """

    below: NDArray[np.intp]
    above: NDArray[np.intp]
    outside: Mask


def bracket(net_stress_mpa: ArrayLike, group: ArrayLike, wanted_net_stress_mpa: ArrayLike) -> Bracket:
    """For each group the two readings whose stresses enclose the one wanted.

    Parameters
    ----------
    net_stress_mpa : array_like (n,)
        Net confining stresses of the readings [MPa], 0 or more; NaN is left out.
    group : array_like of int (n,)
        Which group a reading belongs to, 0 to m - 1.
    wanted_net_stress_mpa : array_like (m,) or one value
        Net stress wanted [MPa], 0 or more.

    Returns
    -------
    Bracket
        Arrays (m,). Of readings with equal stress the first given is taken.

    Raises
    ------
    Impossible
        If a stress is negative, or a group not a whole number from 0.

    Examples
    --------
    >>> found = bracket([40.0, 5.0, 15.0, 5.0, 15.0], [0, 0, 0, 1, 1], [20.0, 20.0])
    >>> found.below.tolist(), found.above.tolist(), found.outside.tolist()
    ([2, 0], [0, 0], [False, True])
    """
    stress = not_negative("net_stress_mpa", net_stress_mpa)
    labels, n, (stress,) = grouped(group, stress)
    wanted = np.broadcast_to(not_negative("wanted_net_stress_mpa", wanted_net_stress_mpa).real, (n,))
    order = np.lexsort((np.arange(labels.size), stress.real, labels))
    order = order[~np.isnan(stress.real[order])]
    first = np.ones(order.size, dtype=np.bool_)
    first[1:] = np.diff(labels[order]).astype(bool) | (np.diff(stress.real[order]) > 0.0)
    order = order[first]
    size = np.bincount(labels[order], minlength=n)
    start = np.cumsum(size) - size
    not_above = stress.real[order] <= wanted[labels[order]]
    reached = np.bincount(labels[order], weights=not_above, minlength=n).astype(np.intp)
    at_top = (reached == size) & (size > 1)
    if order.size:
        top = stress.real[order[np.minimum(start + size, order.size) - 1]]
        reached = reached - (at_top & (top == wanted))
    outside = (reached < 1) | (reached >= size) | np.isnan(wanted)
    if not order.size:
        return Bracket(np.zeros(n, np.intp), np.zeros(n, np.intp), outside)
    below = order[np.where(outside, 0, start + reached - 1)]
    above = order[np.where(outside, 0, start + reached)]
    return Bracket(np.where(outside, 0, below), np.where(outside, 0, above), outside)


def pore_compressibility_1_mpa(
    pore_volume_cm3: ArrayLike,
    net_stress_mpa: ArrayLike,
    other_pore_volume_cm3: ArrayLike,
    other_net_stress_mpa: ArrayLike,
) -> Array:
    """Mean pore-volume compressibility between two net stresses.

    Parameters
    ----------
    pore_volume_cm3, net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the lower net stress [MPa], 0 or more.
    other_pore_volume_cm3, other_net_stress_mpa : array_like
        Pore volume [cm3], above 0, at the higher net stress [MPa].

    Returns
    -------
    Array
        Compressibility [1/MPa], broadcast shape; hydrostatic where the stress is. Below 0 where the volume
        grows.

    Raises
    ------
    Impossible
        If a volume is not above 0, a stress negative, or the other stress not the higher one.

    Notes
    -----
    c = -(1/V) dV/dsigma, as a mean: ln(V1/V2)/(sigma2 - sigma1), V pore volume, sigma net stress. The value
    under hydrostatic stress is greater than the one in a reservoir that cannot yield sideways.

    References
    ----------
    Definition.

    Examples
    --------
    >>> round(float(pore_compressibility_1_mpa(12.0, 10.0, 11.88, 20.0)), 6)
    0.001005
    """
    first = positive("pore_volume_cm3", pore_volume_cm3)
    second = positive("other_pore_volume_cm3", other_pore_volume_cm3)
    stress, other = _apart(net_stress_mpa, other_net_stress_mpa)
    return np.log(first / second) / (other - stress)


def pore_compressibility_jones_1_mpa(
    stress_exponent: ArrayLike,
    net_stress_mpa: ArrayLike,
    characteristic_stress_mpa: ArrayLike = JONES_STRESS_MPA,
    decline_1_mpa: ArrayLike = JONES_DECLINE_1_MPA,
) -> Array:
    """Pore-volume compressibility at a net stress, from Jones's law of the pore volume.

    Parameters
    ----------
    stress_exponent : array_like
        a_v of the pore volume [1], 0 or more.
    net_stress_mpa : array_like
        Net confining stress [MPa], 0 or more.
    characteristic_stress_mpa : array_like
        s* [MPa], above 0; preset 3000 psi.
    decline_1_mpa : array_like
        C [1/MPa], 0 or more; preset 3e-6 1/psi.

    Returns
    -------
    Array
        Compressibility [1/MPa], broadcast shape.

    Raises
    ------
    Impossible
        If an exponent, a stress or a C is negative, or an s* not above 0.

    Notes
    -----
    c = -(1/V) dV/dsigma = (a_v/s*) exp(-sigma/s*) + C/(1 + C sigma), sigma net stress.

    References
    ----------
    The derivative of the law in Jones, S. C. 1988, "Two-point determinations of permeability and PV vs. net
    confining stress", SPE Form. Eval. 3:235-241 (form and presets from memory).

    Examples
    --------
    >>> round(float(pore_compressibility_jones_1_mpa(0.03, 0.0)), 6)
    0.001885
    """
    a = not_negative("stress_exponent", stress_exponent)
    stress = not_negative("net_stress_mpa", net_stress_mpa)
    star, decline = _presets(characteristic_stress_mpa, decline_1_mpa)
    return a / star * np.exp(-stress / star) + decline / (1.0 + decline * stress)


_NET = Symbol("sigma", "net_stress_mpa", "MPa", "net confining stress")
_OTHER_NET = Symbol("sigma2", "other_net_stress_mpa", "MPa", "higher net confining stress")
_WANTED = Symbol("sigma", "wanted_net_stress_mpa", "MPa", "net confining stress wanted")
_NU = Symbol("nu", "poisson_ratio", "1", "Poisson's ratio of the drained rock", 0.0, 0.5)
_PRESETS = (
    Symbol("s*", "characteristic_stress_mpa", "MPa", "characteristic stress"),
    Symbol("C", "decline_1_mpa", "1/MPa", "slow decline"),
)
_EXPONENT = Symbol("a", "stress_exponent", "1", "exponent of the law")
_K0 = Symbol("k0", "permeability_zero_md", "mD", "permeability without stress")
_V0 = Symbol("V0", "pore_volume_zero_cm3", "cm3", "pore volume without stress")
_K = Symbol("k", "permeability_md", "mD", "permeability at the lower stress")
_OTHER_K = Symbol("k2", "other_permeability_md", "mD", "permeability at the higher stress")
_V = Symbol("V", "pore_volume_cm3", "cm3", "pore volume at the lower stress")
_OTHER_V = Symbol("V2", "other_pore_volume_cm3", "cm3", "pore volume at the higher stress")
_RISING = Symbol("", "rising", "", "the value grows with stress")
_GROUP = Symbol("", "group", "", "which law a reading belongs to")
_FIT = (
    Symbol("r2", "r_squared", "1", "share of the variance explained"),
    Symbol("n", "points", "1", "readings"),
    _RISING,
    Symbol("", "residuals", "1", "of the logarithm, one a reading"),
)
_JONES = "Jones 1988, SPE Form. Eval. 3:235-241 (form and presets from memory)"
_TEEUW = "Teeuw 1971, SPE J. 11:263-271 (form from memory)"
_MEASURED = "between the measured stresses only; presets s* 3000 psi and C 3e-6 1/psi"
_LAW_RANGE = "presets s* 3000 psi and C 3e-6 1/psi; measured at about 1500 and 5000 psi"

FORMULAS: tuple[Formula, ...] = (
    Formula(
        "net-confining-stress",
        1,
        "Net confining stress",
        "sigma = p_c - p_m",
        (
            Symbol("p_c", "confining_pressure_kpa", "kPa", "absolute confining pressure"),
            Symbol("p_m", "mean_pressure_kpa", "kPa", "mean absolute pore pressure"),
        ),
        (Symbol("sigma", "net_confining_stress_mpa", "MPa", "net confining stress"),),
        "coefficient of effective stress taken as 1",
        "Terzaghi 1943, Theoretical soil mechanics (from memory); common practice",
        "by hand; laws",
        net_confining_stress_mpa,
    ),
    Formula(
        "uniaxial-factor",
        1,
        "Mean stress under uniaxial strain",
        "f = (1 + nu)/(3 (1 - nu))",
        (_NU,),
        (Symbol("f", "uniaxial_factor", "1", "mean stress over vertical stress"),),
        "linear elastic, no strain sideways; 0 to 0.5",
        _TEEUW,
        "tabulated values",
        uniaxial_factor,
    ),
    Formula(
        "equivalent-hydrostatic-stress",
        1,
        "Equivalent hydrostatic stress",
        "sigma = (1 + nu)/(3 (1 - nu)) (S_v - p)",
        (
            Symbol("S_v", "overburden_stress_mpa", "MPa", "total vertical stress"),
            Symbol("p", "pore_pressure_mpa", "MPa", "pore pressure of the reservoir"),
            _NU,
        ),
        (Symbol("sigma", "net_stress_mpa", "MPa", "hydrostatic net stress"),),
        "linear elastic, no strain sideways",
        _TEEUW,
        "worked value",
        equivalent_hydrostatic_stress_mpa,
    ),
    Formula(
        "permeability-stress-jones-owens",
        1,
        "Permeability under stress, Jones & Owens",
        "(k/k_1000)^(1/3) = 1 - S log10(sigma/1000 psi)",
        (
            Symbol("k_1000", "permeability_1000_psi_md", "mD", "permeability at 1000 psi", 0.0001, 1.0),
            Symbol("S", "stress_slope", "1", "slope"),
            _NET,
        ),
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        "tight gas sand, 0.0001 to 1 md",
        "Jones & Owens 1980, J. Pet. Technol. 32:1631-1640 (form from memory)",
        "worked value; laws",
        permeability_jones_owens_md,
    ),
    Formula(
        "permeability-stress-jones",
        1,
        "Permeability under stress, Jones",
        "k = k0 exp{a [exp(-sigma/s*) - 1]}/(1 + C sigma)",
        (_K0, _EXPONENT, _NET, *_PRESETS),
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        _LAW_RANGE,
        _JONES,
        "worked value; laws",
        permeability_jones_md,
    ),
    Formula(
        "pore-volume-stress-jones",
        1,
        "Pore volume under stress, Jones",
        "V = V0 exp{a [exp(-sigma/s*) - 1]}/(1 + C sigma)",
        (_V0, _EXPONENT, _NET, *_PRESETS),
        (Symbol("V", "pore_volume_cm3", "cm3", "pore volume"),),
        _LAW_RANGE,
        _JONES,
        "laws",
        pore_volume_jones_cm3,
    ),
    Formula(
        "permeability-stress-two-point",
        1,
        "Jones's law from two permeabilities",
        "ln(k (1 + C sigma)) = ln k0 + a [exp(-sigma/s*) - 1]",
        (_K, _NET, _OTHER_K, _OTHER_NET, *_PRESETS),
        (_K0, _EXPONENT, _RISING),
        _LAW_RANGE,
        _JONES,
        "worked values; round trip by law",
        permeability_two_point,
    ),
    Formula(
        "pore-volume-stress-two-point",
        1,
        "Jones's law from two pore volumes",
        "ln(V (1 + C sigma)) = ln V0 + a [exp(-sigma/s*) - 1]",
        (_V, _NET, _OTHER_V, _OTHER_NET, *_PRESETS),
        (_V0, _EXPONENT, _RISING),
        _LAW_RANGE,
        _JONES,
        "round trip by law",
        pore_volume_two_point,
    ),
    Formula(
        "permeability-stress-regression",
        1,
        "Jones's law from several permeabilities",
        "ln(k (1 + C sigma)) = ln k0 + a [exp(-sigma/s*) - 1], least squares",
        (_K, _NET, _GROUP, *_PRESETS),
        (
            _K0,
            _EXPONENT,
            Symbol("s_k", "permeability_zero_se_md", "mD", "standard error"),
            Symbol("s_a", "stress_exponent_se", "1", "standard error"),
            Symbol("cov", "covariance_md", "mD", "covariance of k0 and a"),
            *_FIT,
        ),
        "at least three different stresses; presets s* 3000 psi and C 3e-6 1/psi",
        _JONES,
        "ordinary least squares of statsmodels; round trip by law",
        permeability_stress_regression,
        elementwise=False,
    ),
    Formula(
        "pore-volume-stress-regression",
        1,
        "Jones's law from several pore volumes",
        "ln(V (1 + C sigma)) = ln V0 + a [exp(-sigma/s*) - 1], least squares",
        (_V, _NET, _GROUP, *_PRESETS),
        (
            _V0,
            _EXPONENT,
            Symbol("s_V", "pore_volume_zero_se_cm3", "cm3", "standard error"),
            Symbol("s_a", "stress_exponent_se", "1", "standard error"),
            Symbol("cov", "covariance_cm3", "cm3", "covariance of V0 and a"),
            *_FIT,
        ),
        "at least three different stresses; presets s* 3000 psi and C 3e-6 1/psi",
        _JONES,
        "round trip by law",
        pore_volume_stress_regression,
        elementwise=False,
    ),
    Formula(
        "permeability-between-stresses",
        1,
        "Permeability between measured stresses",
        "k = k0 exp{a [exp(-sigma/s*) - 1]}/(1 + C sigma) through both measurements",
        (_K, _NET, _OTHER_K, _OTHER_NET, _WANTED, *_PRESETS),
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        _MEASURED,
        _JONES,
        "worked value; laws",
        permeability_between_md,
    ),
    Formula(
        "pore-volume-between-stresses",
        1,
        "Pore volume between measured stresses",
        "V = V0 exp{a [exp(-sigma/s*) - 1]}/(1 + C sigma) through both measurements",
        (_V, _NET, _OTHER_V, _OTHER_NET, _WANTED, *_PRESETS),
        (Symbol("V", "pore_volume_cm3", "cm3", "pore volume"),),
        _MEASURED,
        _JONES,
        "laws",
        pore_volume_between_cm3,
    ),
    Formula(
        "permeability-between-stresses-log",
        1,
        "Permeability between measured stresses, logarithmic",
        "ln k = ln k1 + ln(k2/k1) ln(sigma/sigma1)/ln(sigma2/sigma1)",
        (_K, _NET, _OTHER_K, _OTHER_NET, _WANTED),
        (Symbol("k", "permeability_md", "mD", "permeability"),),
        "between the measured stresses only",
        "common practice",
        "by hand; laws",
        permeability_between_log_md,
    ),
    Formula(
        "pore-compressibility",
        1,
        "Pore-volume compressibility between two stresses",
        "c = ln(V1/V2)/(sigma2 - sigma1)",
        (_V, _NET, _OTHER_V, _OTHER_NET),
        (Symbol("c", "pore_compressibility_1_mpa", "1/MPa", "compressibility"),),
        "of the kind of stress applied: hydrostatic exceeds uniaxial",
        "definition",
        "by hand; mean of the law's",
        pore_compressibility_1_mpa,
    ),
    Formula(
        "pore-compressibility-jones",
        1,
        "Pore-volume compressibility from Jones's law",
        "c = (a/s*) exp(-sigma/s*) + C/(1 + C sigma)",
        (_EXPONENT, _NET, *_PRESETS),
        (Symbol("c", "pore_compressibility_1_mpa", "1/MPa", "compressibility"),),
        _LAW_RANGE,
        _JONES,
        "derivative of the law",
        pore_compressibility_jones_1_mpa,
    ),
)
