"""Grain size, sorting and permeability from texture, against sieve sheets, tables and closed forms.

Sources: a teaching sieve sheet "Upper sand over shelly zone, GA 88, Eocene" (masses and cumulative per cent
as published); a 20 g teaching sample (masses as published); Folk & Ward 1957; Beard & Weyl 1973, AAPG Bull.
57:349-369; Graton & Fraser 1935; Krumbein & Monk 1943; Berg 1970; van Baaren 1979; a published
Kozeny-Carman example. Worked numbers marked "made" were computed outside the program.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import norm

from corelab.errors import Impossible, Usage
from corelab.science.texture import (
    BEARD_WEYL,
    PERCENTILES,
    SORTING,
    SPHERE_PACKINGS,
    WATER_20_DEGC,
    WENTWORTH_MM,
    conductivity_permeability_md,
    described_size_mm,
    described_sorting_phi,
    folk_ward,
    grain_size_mm,
    grain_size_phi,
    kurtosis_word,
    packing_porosity_frac,
    permeability_berg_md,
    permeability_hazen_md,
    permeability_kozeny_carman_md,
    permeability_krumbein_monk_md,
    permeability_panda_lake_md,
    permeability_van_baaren_md,
    sandstone_porosity_frac,
    sieve_recovery_frac,
    sieve_statistics,
    skewness_word,
    sorting_from_trask_phi,
    sorting_word,
    trask_sorting,
    wentworth_class,
)
from corelab.sheets.registers import GRAIN_SIZE_CLASSES, SORTING_CLASSES, SORTING_SCALES
from corelab.units import MILLIDARCY_M2

# GA 88: sieves -1 to 4 phi and the pan
APERTURES = np.array([2.0, 1.0, 0.5, 0.25, 0.125, 0.0625, 0.0])
MASSES = np.array([2.95, 4.95, 13.36, 9.55, 2.13, 0.46, 0.02])
ONE = np.zeros(7, dtype=int)


# ---- sizes and words


def test_phi_published():
    # Wentworth's limits
    phi = [-8, -6, -2, -1, 0, 1, 2, 3, 4, 8]
    mm = [256, 64, 4, 2, 1, 0.5, 0.25, 0.125, 0.0625, 0.00390625]
    np.testing.assert_allclose(grain_size_mm(phi), mm, rtol=1e-14)
    np.testing.assert_allclose(grain_size_phi(mm), phi, atol=1e-12)
    with pytest.raises(Impossible, match="grain_size_mm"):
        grain_size_phi([0.5, 0.0])
    with pytest.raises(Impossible, match="size_phi"):
        grain_size_mm(250.0)  # micrometres typed as phi


def test_wentworth_classes_published_limits():
    lower = [256, 64, 4, 2, 1, 0.5, 0.25, 0.125, 0.0625, 0.00390625]
    words = wentworth_class(lower).tolist()
    assert words == list(WENTWORTH_MM)[:-1]
    below = wentworth_class(np.array(lower) * 0.999).tolist()
    assert below == list(WENTWORTH_MM)[1:]
    # halves of 0.5 phi; the upper one is the coarser
    halves = wentworth_class([0.49, 0.36, 0.35, 0.25, 3.0, np.nan], halves=True).tolist()
    assert halves == [
        "upper medium sand",
        "upper medium sand",
        "lower medium sand",
        "lower medium sand",
        "granule",
        "",
    ]
    assert wentworth_class(0.3).shape == ()
    for word in GRAIN_SIZE_CLASSES:
        size = described_size_mm(word)
        if word in ("boulder", "clay"):
            assert np.isnan(size)
        else:
            assert wentworth_class(size, halves=word.startswith(("upper", "lower"))) == word
    assert np.isnan(described_size_mm(["mud", "upper silt", ""])).all()


def test_sorting_words_published():
    # Folk's limits in phi (USGS note): 0.35, 0.50, 0.71, 1, 2, 4
    phi = [0.2, 0.35, 0.40, 0.60, 0.80, 1.5, 3.0, 4.5]
    assert sorting_word(phi, "folk").tolist() == [
        "very well",
        "well",
        "well",
        "moderately well",
        "moderately",
        "poorly",
        "very poorly",
        "extremely poorly",
    ]
    # Trask's, with the limits of Beard & Weyl 1973: 1.0, 1.1, 1.2, 1.4, 2.0, 2.7, 5.7
    assert sorting_word(BEARD_WEYL.trask_sorting, "trask").tolist() == list(BEARD_WEYL.sortings)
    assert sorting_word([0.9, 5.7, np.nan], "trask").tolist() == ["", "", ""]
    with pytest.raises(Usage, match="did you mean 'folk'"):
        sorting_word(0.5, "folks")
    # the names do not line up: Trask's "moderately" is 0.72 to 1.48 phi
    ends = sorting_from_trask_phi(SORTING["trask"]["moderately"])
    np.testing.assert_allclose(ends, [0.72, 1.48], atol=0.0051)
    assert sorting_word(sorting_from_trask_phi(1.9), "folk") == "poorly"


def test_described_sorting():
    assert set(SORTING) == set(SORTING_SCALES)
    assert {word for table in SORTING.values() for word in table} == set(SORTING_CLASSES)
    found = described_sorting_phi(list(BEARD_WEYL.sortings), "trask")
    np.testing.assert_allclose(found, sorting_from_trask_phi(BEARD_WEYL.trask_sorting), rtol=1e-12)
    for word in SORTING["folk"]:
        assert sorting_word(described_sorting_phi(word, "folk"), "folk") == word
    mixed = described_sorting_phi(
        ["Well", "extremely well", "moderately well", "odd"], ["folk"] * 2 + ["trask"] * 2
    )
    np.testing.assert_allclose(mixed, [0.425, np.nan, np.nan, np.nan])


def test_skewness_and_kurtosis_words():
    # Folk & Ward 1957 (from memory): -0.3, -0.1, 0.1, 0.3 and 0.67, 0.90, 1.11, 1.50, 3.00
    assert skewness_word([-0.4, -0.2, 0.0, 0.2, 0.4, np.nan]).tolist() == [
        "strongly coarse-skewed",
        "coarse-skewed",
        "near-symmetrical",
        "fine-skewed",
        "strongly fine-skewed",
        "",
    ]
    assert kurtosis_word([0.5, 0.8, 1.0, 1.2, 2.0, 4.0]).tolist() == [
        "very platykurtic",
        "platykurtic",
        "mesokurtic",
        "leptokurtic",
        "very leptokurtic",
        "extremely leptokurtic",
    ]


# ---- sieve curves


def test_sieve_sheet_published():
    found = sieve_statistics(APERTURES, MASSES, ONE, coarse_limit_phi=-2.0, fine_limit_phi=5.0)
    # weight % 8.83, 14.81, 39.98, 28.58, 6.37, 1.38, 0.06; sum 33.42 g of 33.52 g: recovery 99.70 %
    np.testing.assert_allclose(
        100.0 * MASSES / found.mass_g[0], [8.83, 14.81, 39.98, 28.58, 6.37, 1.38, 0.06], atol=0.006
    )
    assert 100.0 * sieve_recovery_frac(found.mass_g[0], 33.52) == pytest.approx(99.70, abs=0.005)
    # cumulative % 8.83, 23.64, 63.61, 92.19, 98.56, 99.94, 100 at -1 to 5 phi
    cumulative = 100.0 * np.cumsum(MASSES) / found.mass_g[0]
    np.testing.assert_allclose(cumulative, [8.83, 23.64, 63.61, 92.19, 98.56, 99.94, 100.0], atol=0.006)
    assert not found.open_coarse.any()
    assert not found.open_fine.any()


def test_sieve_statistics_made():
    found = sieve_statistics(APERTURES, MASSES, ONE, coarse_limit_phi=-2.0, fine_limit_phi=5.0)
    # made: linear in phi, the open class closed at -2 phi
    percentiles = dict(zip(PERCENTILES, found.percentiles_phi[:, 0].tolist(), strict=True))
    made = {5: -1.4336, 16: -0.5157, 25: 0.0341, 50: 0.6594, 75: 1.3984, 84: 1.7134, 95: 2.4408}
    for percent, phi in made.items():
        assert percentiles[percent] == pytest.approx(phi, abs=0.5e-4)
    graphic = [
        found.mean_phi,
        found.sorting_phi,
        found.skewness,
        found.kurtosis,
        found.trask_sorting,
        found.median_phi,
    ]
    np.testing.assert_allclose(
        np.ravel(graphic), [0.619, 1.1443, -0.0674, 1.1638, 1.6046, 0.6594], atol=0.0005
    )
    moments = [
        found.moment_mean_phi,
        found.moment_sorting_phi,
        found.moment_skewness,
        found.moment_kurtosis,
    ]
    np.testing.assert_allclose(np.ravel(moments), [0.6323, 1.0760, -0.0886, 3.0364], atol=0.5e-4)
    words = [
        sorting_word(found.sorting_phi, "folk"),
        skewness_word(found.skewness),
        kurtosis_word(found.kurtosis),
    ]
    assert np.ravel(words).tolist() == ["poorly", "near-symmetrical", "leptokurtic"]


def test_second_teaching_sample_made():
    # 2, 4, 4, 6, 2, 2 g on 2, 1, 0.5, 0.25, 0.125, 0.062 mm: M_z 0.90, sigma_I 1.533, Sk_I -0.048, K_G 0.984
    found = sieve_statistics(
        [2.0, 1.0, 0.5, 0.25, 0.125, 0.062], [2, 4, 4, 6, 2, 2], np.zeros(6, int), coarse_limit_phi=-2.0
    )
    assert found.mean_phi[0] == pytest.approx(0.90, abs=0.005)
    # 0.062 mm is 4.01 phi
    assert found.sorting_phi[0] == pytest.approx(1.5326, abs=0.002)
    assert found.skewness[0] == pytest.approx(-0.0484, abs=0.002)
    assert found.kurtosis[0] == pytest.approx(0.9836, abs=0.002)
    assert found.trask_sorting[0] == pytest.approx(2.0586, abs=0.0005)
    assert found.median_phi[0] == pytest.approx(1.0, abs=1e-12)


def test_exact_normal_distribution():
    # mean 2, sd 0.5 phi (closed form): M_z 2, sigma_I 0.4978, Sk_I 0, K_G 0.9995, S_o 1.2633
    p5, p16, p25, p50, p75, p84, p95 = 2.0 + 0.5 * norm.ppf([0.05, 0.16, 0.25, 0.5, 0.75, 0.84, 0.95])
    found = folk_ward(p5, p16, p25, p50, p75, p84, p95)
    assert found.mean_phi == pytest.approx(2.0, abs=1e-12)
    assert found.sorting_phi == pytest.approx(0.4978, abs=0.5e-4)
    assert found.skewness == pytest.approx(0.0, abs=1e-12)
    assert found.kurtosis == pytest.approx(0.9995, abs=0.5e-4)
    assert trask_sorting(p25, p75) == pytest.approx(1.2633, abs=0.5e-4)
    assert sorting_from_trask_phi(1.2633) == pytest.approx(0.5, abs=1e-4)
    with pytest.raises(Impossible, match="percentile_16_phi"):
        folk_ward(p16, p5, p25, p50, p75, p84, p95)


def test_an_open_class_is_never_carried_on():
    found = sieve_statistics(APERTURES, MASSES, ONE)
    # 8.83 % lies above 2 mm: P5 is not known, and so not what needs it
    assert found.open_coarse.tolist() == [True]
    assert found.open_fine.tolist() == [False]
    assert np.isnan(found.percentiles_phi[:, 0]).tolist() == [True] + [False] * 8
    assert np.isnan([found.sorting_phi[0], found.skewness[0], found.kurtosis[0]]).all()
    assert found.mean_phi[0] == pytest.approx(0.619, abs=0.0005)
    assert np.isnan(found.moment_mean_phi[0])
    # a tenth in the pan: P95 is not known, P90 is the finest sieve
    fine = sieve_statistics([0.5, 0.25, 0.125, 0.0], [0.0, 5.0, 4.0, 1.0], [0] * 4)
    assert (fine.open_coarse.tolist(), fine.open_fine.tolist()) == ([False], [True])
    assert fine.percentiles_phi[-2:, 0].tolist() == pytest.approx([3.0, np.nan], nan_ok=True)
    closed = sieve_statistics([0.5, 0.25, 0.125, 0.0], [0.0, 5.0, 4.0, 1.0], [0] * 4, fine_limit_phi=5.0)
    assert closed.percentiles_phi[-1, 0] == pytest.approx(4.0)
    # exactly 5 % above the coarsest sieve: P5 is its aperture
    edge = sieve_statistics([1.0, 0.5, 0.25], [0.5, 4.5, 5.0], [0] * 3)
    assert edge.open_coarse.tolist() == [False]
    assert edge.percentiles_phi[0, 0] == pytest.approx(0.0)


def test_groups_order_missing_and_one_sieve():
    rng = np.random.default_rng(2)
    shuffled = rng.permutation(28)
    aperture, group = np.tile(APERTURES, 4)[shuffled], np.repeat([0, 1, 2, 4], 7)[shuffled]
    mass = np.concatenate([MASSES, 3.0 * MASSES, MASSES, [0, 0.1, 50.0, 0.2, 0.1, 0, 0]])[shuffled]
    mass[(group == 2) & (aperture == 0.5)] = np.nan
    found = sieve_statistics(aperture, mass, group, coarse_limit_phi=-2.0, fine_limit_phi=5.0)
    np.testing.assert_allclose(found.mean_phi[:2], 0.619, atol=0.0005)
    np.testing.assert_allclose(found.mass_g, [33.42, 100.26, np.nan, np.nan, 50.4], rtol=1e-12)
    assert np.isnan(found.percentiles_phi).all(axis=0).tolist() == [False, False, True, True, False]
    assert found.one_sieve.tolist() == [False, False, False, False, True]
    assert not found.open_coarse.any()


def test_sieves_that_cannot_be():
    with pytest.raises(Impossible, match=r"^aperture_mm: found 0.5 at place 2 .*each sieve once"):
        sieve_statistics([0.5, 0.25, 0.5], [1.0, 1.0, 1.0], [0, 0, 0])
    with pytest.raises(Impossible, match="coarse_limit_phi"):
        sieve_statistics(APERTURES, MASSES, ONE, coarse_limit_phi=0.0)
    with pytest.raises(Impossible, match="fine_limit_phi"):
        sieve_statistics(APERTURES, MASSES, ONE, fine_limit_phi=3.0)
    empty = sieve_statistics([0.5, 0.25], [0.0, 0.0], [0, 0])
    assert np.isnan(empty.mean_phi).all()


# ---- packing


def test_sphere_packings_published():
    # Graton & Fraser 1935: 0.4764, 0.3954, 0.3019, 0.2595; random close 0.365 (J. Mater. Sci. 38, 2003)
    regular = [SPHERE_PACKINGS[name] for name in list(SPHERE_PACKINGS)[:4]]
    np.testing.assert_allclose(regular, [0.4764, 0.3954, 0.3019, 0.2595], atol=0.5e-4)
    assert SPHERE_PACKINGS["random close"] == 0.365
    assert 0.36 <= SPHERE_PACKINGS["random close"] <= 0.42


def test_beard_weyl_published():
    porosity, permeability = 100.0 * BEARD_WEYL.porosity_frac, BEARD_WEYL.permeability_md / 1000.0
    # Beard & Weyl 1973, abstract: class means 42.4 % and 27.9 %, which the remembered column closes
    assert porosity[0].mean() == pytest.approx(42.4, abs=0.05)
    assert porosity[-1].mean() == pytest.approx(27.9, abs=0.05)
    assert [porosity.min(), porosity.max()] == pytest.approx([23.4, 43.5], abs=0.01)
    assert porosity.shape == permeability.shape == BEARD_WEYL.from_memory.shape == (6, 8)
    assert [BEARD_WEYL.sizes[i] for i in np.flatnonzero(BEARD_WEYL.from_memory[0])] == ["lower medium sand"]
    assert set(BEARD_WEYL.sizes) < set(GRAIN_SIZE_CLASSES)
    # permeabilities (from memory) lie within -10 % and +45 % of Krumbein & Monk at the classes' middles
    sigma = sorting_from_trask_phi(BEARD_WEYL.trask_sorting)
    ratio = permeability / (
        permeability_krumbein_monk_md(described_size_mm(BEARD_WEYL.sizes), sigma[:, np.newaxis]) / 1000.0
    )
    assert np.isfinite(ratio).sum(axis=1).tolist() == [8, 8, 8, 6, 4, 3]
    assert np.nanmin(ratio) > 0.90
    assert np.nanmax(ratio) < 1.46
    with pytest.raises(ValueError, match="read-only"):
        BEARD_WEYL.porosity_frac[0, 0] = 0.0


def test_trask_and_packing_published():
    # sigma 0.104, 0.299, 0.561, 1.135, 1.828, 3.070 phi at the classes' middles
    sigma = sorting_from_trask_phi([1.05, 1.15, 1.3, 1.7, 2.35, 4.2])
    np.testing.assert_allclose(sigma, [0.104, 0.299, 0.561, 1.135, 1.828, 3.070], atol=0.0006)
    # Weltje's closed form (as quoted): 42.9, 40.7, 38.4, 34.8, 31.7, 27.8 %
    porosity = packing_porosity_frac([0.1044, 0.2989, 0.5612, 1.1350, 1.8275, 3.0696])
    np.testing.assert_allclose(100.0 * porosity, [42.9, 40.7, 38.4, 34.8, 31.7, 27.8], atol=0.06)
    np.testing.assert_allclose(porosity, BEARD_WEYL.porosity_frac.mean(axis=1), atol=0.02)
    # Bloch 1991 (as quoted): S_o 1.3, 80 % rigid grains: 15.04 %
    assert 100.0 * sandstone_porosity_frac(1.3, 0.80) == pytest.approx(15.04, abs=0.005)
    with pytest.raises(Impossible, match="rigid_grain_frac"):
        sandstone_porosity_frac(1.3, 80.0)


# ---- permeability


def test_krumbein_monk_made():
    # darcy at d mm, sigma phi; 760 darcy/mm2 is 7.5006e-4 without units
    found = permeability_krumbein_monk_md([0.25, 0.177, 0.125], [0.5, 0.35, 1.0]) / 1000.0
    np.testing.assert_allclose(found, [24.67, 15.05, 3.204], atol=0.0051)
    assert permeability_krumbein_monk_md(1.0, 0.0) * MILLIDARCY_M2 / 1e-6 == pytest.approx(
        7.5006e-4, abs=1e-7
    )


def test_berg_made_and_its_units():
    # md at porosity, um, phi; a script that circulates has an exponent of 1.5 and no square
    found = permeability_berg_md([0.30, 0.40, 0.25], [0.250, 0.250, 0.200], [1.0, 1.0, 1.5])
    np.testing.assert_allclose(found, [2723.4, 11811.3, 344.13], atol=0.051)
    # the two printed forms agree only with um and md, mm and darcy
    other = 5.1e-6 * 30.0**5.1 * 0.250**2 * np.exp(-1.385) * 1000.0
    assert found[0] / other == pytest.approx(1.0, abs=0.001)


def test_van_baaren_made():
    found = permeability_van_baaren_md([0.200, 0.250], [0.25, 0.35], [1.8, 1.5], [0.8, 0.7])
    np.testing.assert_allclose(found, [478.2, 10380.8], atol=0.051)


def test_kozeny_carman_made_and_published():
    # darcy at 0.40, 0.25 mm: B 180 62.55, B 150 75.06; um2 at 200 um: 2.7778, 12.2449, 39.5062
    assert permeability_kozeny_carman_md(0.25, 0.40) / 1000.0 == pytest.approx(62.55, abs=0.005)
    assert permeability_kozeny_carman_md(0.25, 0.40, 150.0) / 1000.0 == pytest.approx(75.06, abs=0.005)
    um2 = permeability_kozeny_carman_md(0.2, [0.2, 0.3, 0.4]) * MILLIDARCY_M2 * 1e12
    np.testing.assert_allclose(um2, [2.7777777777777777, 12.244897959183673, 39.506172839506185], rtol=1e-9)
    # published example of a groundwater calculator: n 0.30, d10 0.1 mm, 10 degC: K 2.3e-5 m/s
    k = permeability_kozeny_carman_md(0.1, 0.30)
    one_cm_s = conductivity_permeability_md(1.0, 1.307, 0.9997)
    assert k / one_cm_s / 100.0 == pytest.approx(2.3e-5, abs=0.05e-5)
    # ratios: 0.35 to 0.30 0.543; with 20 % finer grains 0.3475; 0.12 to 0.15 2.093
    before = permeability_kozeny_carman_md(0.2, [0.35, 0.35, 0.12])
    after = permeability_kozeny_carman_md([0.2, 0.16, 0.2], [0.30, 0.30, 0.15])
    np.testing.assert_allclose(after / before, [0.543, 0.3475, 2.093], atol=0.0006)


def test_hazen_made():
    # C 100, d10 0.01 cm: K 0.01 cm/s, 10.37 darcy; 1 cm/s is 1037 darcy with water at 20 degC
    assert permeability_hazen_md(0.1) / 1000.0 == pytest.approx(10.37, abs=0.01)
    assert conductivity_permeability_md(1.0, *WATER_20_DEGC) / 1000.0 == pytest.approx(1037.2, abs=0.5)


def test_panda_lake_is_the_mean_cube_over_the_mean_square():
    sizes = np.random.default_rng(1).lognormal(np.log(0.2), 0.4, 2000)
    variation = sizes.std() / sizes.mean()
    skewness = ((sizes - sizes.mean()) ** 3).mean() / sizes.std() ** 3
    effective = (sizes**3).mean() / (sizes**2).mean()
    assert permeability_panda_lake_md(sizes.mean(), variation, skewness, 0.35) == pytest.approx(
        float(permeability_kozeny_carman_md(effective, 0.35)), rel=1e-12
    )


# ---- laws


@given(
    st.lists(st.floats(0.0, 50.0), min_size=7, max_size=7).filter(lambda m: sum(m) > 1.0),
    st.floats(0.1, 10.0),
)
@settings(max_examples=80, deadline=None)
def test_law_percentiles_rise_and_masses_only_matter_as_shares(masses, factor):
    mass = np.array(masses)
    found = sieve_statistics(APERTURES, mass, ONE, coarse_limit_phi=-2.0, fine_limit_phi=6.0)
    assert (np.diff(found.percentiles_phi[:, 0]) >= -1e-12).all()
    assert ((found.percentiles_phi >= -2.0 - 1e-9) & (found.percentiles_phi <= 6.0 + 1e-9)).all()
    assert -2.0 <= found.moment_mean_phi[0] <= 6.0
    scaled = sieve_statistics(APERTURES, factor * mass, ONE, coarse_limit_phi=-2.0, fine_limit_phi=6.0)
    np.testing.assert_allclose(scaled.percentiles_phi, found.percentiles_phi, atol=1e-6)


@given(st.floats(-10.0, 12.0))
@settings(max_examples=40, deadline=None)
def test_law_phi_round_trip(phi):
    assert grain_size_phi(grain_size_mm(phi)) == pytest.approx(phi, abs=1e-12)
