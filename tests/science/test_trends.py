"""Regressions and trends.

Published
- NIST StRD: certified values of the linear sets Norris, Pontius, Longley, Wampler1-5, Filip, NoInt1-2 and of
  the nonlinear Misra1a, Misra1b, DanWood, BoxBOD (National Institute of Standards and Technology, US
  government work). Certified values of Pontius and the y of Wampler from memory.
- Pearson's points (1901, Phil. Mag. 2:559-572) with York's weights: intercept 5.47991, slope -0.48053,
  chi-square 11.866, in York 1966 and York et al. 2004, Am. J. Phys. 72:367-375. A public package's page
  prints standard errors 0.0794 and 0.0156, which do not close: 0.2950 and 0.0580 are right.
- Pearson 1901: major axis y = 5.784 - 0.5456 x (from memory).
- Huber, threshold 1.345, stack loss data: -41.0265, 0.8294, 0.9261, -0.1278 (from memory).
- Timur 1968: 0.136 and 8581 (from memory).
Oracles: scipy.odr, statsmodels, scipy.stats, brute force. Limits, laws (Hypothesis), simulations from a
stated truth.
"""

from __future__ import annotations

import warnings
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy import stats
from statsmodels.stats.diagnostic import het_breuschpagan
from statsmodels.stats.outliers_influence import OLSInfluence

from corelab.errors import Impossible
from corelab.science import trends as tr
from corelab.science.texture import permeability_kozeny_carman_md

PEARSON_X = np.array([0.0, 0.9, 1.8, 2.6, 3.3, 4.4, 5.2, 6.1, 6.5, 7.4])
PEARSON_Y = np.array([5.9, 5.4, 4.4, 4.6, 3.5, 3.7, 2.8, 2.8, 2.4, 1.5])
YORK_WX = np.array([1000.0, 1000.0, 500.0, 800.0, 200.0, 80.0, 60.0, 20.0, 1.8, 1.0])
YORK_WY = np.array([1.0, 1.8, 4.0, 8.0, 20.0, 20.0, 70.0, 70.0, 100.0, 500.0])

NORRIS = np.array(
    [
        0.2, 0.1, 337.4, 338.8, 118.2, 118.1, 884.6, 888.0, 10.1, 9.2, 226.5, 228.1, 666.3, 668.5, 996.3,
        998.5, 448.6, 449.1, 777.0, 778.9, 558.2, 559.2, 0.4, 0.3, 0.6, 0.1, 775.5, 778.1, 666.9, 668.8,
        338.0, 339.3, 447.5, 448.9, 11.6, 10.8, 556.0, 557.7, 228.1, 228.3, 995.8, 998.0, 887.6, 888.8,
        120.2, 119.6, 0.3, 0.3, 0.3, 0.6, 556.8, 557.6, 339.1, 339.3, 887.2, 888.0, 999.0, 998.5, 779.0,
        778.9, 11.1, 10.2, 118.3, 117.6, 229.2, 228.9, 669.1, 668.4, 448.9, 449.2, 0.5, 0.2,
    ]
).reshape(-1, 2)  # fmt: skip
LONGLEY = np.array(
    [
        [60323, 83.0, 234289, 2356, 1590, 107608, 1947], [61122, 88.5, 259426, 2325, 1456, 108632, 1948],
        [60171, 88.2, 258054, 3682, 1616, 109773, 1949], [61187, 89.5, 284599, 3351, 1650, 110929, 1950],
        [63221, 96.2, 328975, 2099, 3099, 112075, 1951], [63639, 98.1, 346999, 1932, 3594, 113270, 1952],
        [64989, 99.0, 365385, 1870, 3547, 115094, 1953], [63761, 100.0, 363112, 3578, 3350, 116219, 1954],
        [66019, 101.2, 397469, 2904, 3048, 117388, 1955], [67857, 104.6, 419180, 2822, 2857, 118734, 1956],
        [68169, 108.4, 442769, 2936, 2798, 120445, 1957], [66513, 110.8, 444546, 4681, 2637, 121950, 1958],
        [68655, 112.6, 482704, 3813, 2552, 123366, 1959], [69564, 114.2, 502601, 3931, 2514, 125368, 1960],
        [69331, 115.7, 518173, 4806, 2572, 127852, 1961], [70551, 116.9, 554894, 4007, 2827, 130081, 1962],
    ]
)  # fmt: skip
WAMPLER = {
    1: (
        [
            1, 6, 63, 364, 1365, 3906, 9331, 19608, 37449, 66430, 111111, 177156, 271453, 402234, 579195,
            813616, 1118481, 1508598, 2000719, 2613660, 3368421,
        ],
        0.0,
    ),
    3: (
        [
            760, -2042, 2111, -1684, 3888, 1858, 11379, 17560, 39287, 64382, 113159, 175108, 273291, 400186,
            581243, 811568, 1121004, 1506550, 2002767, 2611612, 3369180,
        ],
        2360.14502379268,
    ),
    4: (
        [
            75901, -204794, 204863, -204436, 253665, -200894, 214131, -185192, 221249, -138370, 315911,
            -27644, 455253, 197434, 783995, 608816, 1370781, 1303798, 2205519, 2408860, 3444321,
        ],
        236014.502379268,
    ),
    5: (
        [
            7590001, -20479994, 20480063, -20479636, 25231365, -20476094, 20489331, -20460392, 18417449,
            -20413570, 20591111, -20302844, 18651453, -20077766, 21059195, -19666384, 26348481, -18971402,
            22480719, -17866340, 10958421,
        ],
        23601450.2379268,
    ),
}  # fmt: skip
FILIP = [
    (0.8116, -6.860120914), (0.9072, -4.324130045), (0.9052, -4.358625055), (0.9039, -4.358426747),
    (0.8053, -6.955852379), (0.8377, -6.661145254), (0.8667, -6.355462942), (0.8809, -6.118102026),
    (0.7975, -7.115148017), (0.8162, -6.815308569), (0.8515, -6.519993057), (0.8766, -6.204119983),
    (0.8885, -5.853871964), (0.8859, -6.109523091), (0.8959, -5.79832982), (0.8913, -5.482672118),
    (0.8959, -5.171791386), (0.8971, -4.851705903), (0.9021, -4.517126416), (0.909, -4.143573228),
    (0.9139, -3.709075441), (0.9199, -3.499489089), (0.8692, -6.300769497), (0.8872, -5.953504836),
    (0.89, -5.642065153), (0.891, -5.031376979), (0.8977, -4.680685696), (0.9035, -4.329846955),
    (0.9078, -3.928486195), (0.7675, -8.56735134), (0.7705, -8.363211311), (0.7713, -8.107682739),
    (0.7736, -7.823908741), (0.7775, -7.522878745), (0.7841, -7.218819279), (0.7971, -6.920818754),
    (0.8329, -6.628932138), (0.8641, -6.323946875), (0.8804, -5.991399828), (0.7668, -8.781464495),
    (0.7633, -8.663140179), (0.7678, -8.473531488), (0.7697, -8.247337057), (0.77, -7.971428747),
    (0.7749, -7.676129393), (0.7796, -7.352812702), (0.7897, -7.072065318), (0.8131, -6.774174009),
    (0.8498, -6.478861916), (0.8741, -6.159517513), (0.8061, -6.835647144), (0.846, -6.53165267),
    (0.8751, -6.224098421), (0.8856, -5.910094889), (0.8919, -5.598599459), (0.8934, -5.290645224),
    (0.894, -4.974284616), (0.8957, -4.64454848), (0.9047, -4.290560426), (0.9129, -3.885055584),
    (0.9209, -3.408378962), (0.9219, -3.13200249), (0.7739, -8.726767166), (0.7681, -8.66695597),
    (0.7665, -8.511026475), (0.7703, -8.165388579), (0.7702, -7.886056648), (0.7761, -7.588043762),
    (0.7809, -7.283412422), (0.7961, -6.995678626), (0.8253, -6.691862621), (0.8602, -6.392544977),
    (0.8809, -6.067374056), (0.8301, -6.684029655), (0.8664, -6.378719832), (0.8834, -6.065855188),
    (0.8898, -5.752272167), (0.8964, -5.132414673), (0.8963, -4.811352704), (0.9074, -4.098269308),
    (0.9119, -3.66174277), (0.9228, -3.2644011),
]  # fmt: skip
STACK_LOSS = np.array(
    [
        [42, 80, 27, 89], [37, 80, 27, 88], [37, 75, 25, 90], [28, 62, 24, 87], [18, 62, 22, 87],
        [18, 62, 23, 87], [19, 62, 24, 93], [20, 62, 24, 93], [15, 58, 23, 87], [14, 58, 18, 80],
        [14, 58, 18, 89], [13, 58, 17, 88], [11, 58, 18, 82], [12, 58, 19, 93], [8, 50, 18, 89],
        [7, 50, 18, 86], [8, 50, 19, 72], [8, 50, 19, 79], [9, 50, 20, 80], [15, 56, 20, 82],
        [15, 70, 20, 91],
    ],
    dtype=float,
)  # fmt: skip


#: Where the machine has no extended precision, the hardest sets come back to fewer digits.
EXTENDED = np.finfo(np.longdouble).eps < 1e-18


def powers(x, degree):
    return np.vander(np.asarray(x, dtype=np.longdouble), degree + 1, increasing=True)


# -- NIST StRD --------------------------------------------------------------------------------------------


def test_norris():
    fit = tr.line(NORRIS[:, 0], NORRIS[:, 1])
    assert fit.coefficients == pytest.approx([-0.262323073774029, 1.00211681802045], rel=1e-13)
    assert fit.standard_errors == pytest.approx([0.232818234301152, 0.000429796848199937], rel=1e-13)
    assert float(fit.residual_sd) == pytest.approx(0.884796396144373, rel=1e-13)
    assert float(np.sum(fit.residuals**2)) == pytest.approx(26.6173985294224, rel=1e-13)
    assert float(fit.r_squared) == pytest.approx(0.999993745883712, rel=1e-14)


def test_pontius(open_data: Path):
    text = (open_data / "nist" / "PONTIUS.DAT").read_text().splitlines()
    rows = [line.split() for line in text if len(line.split()) == 2]
    values = np.array([[float(a), float(b)] for a, b in rows if a[-1].isdigit() or a[-1] == "."])[-40:]
    y, x = (values[:, 0], values[:, 1]) if values[0, 0] < 10 else (values[:, 1], values[:, 0])
    fit = tr.least_squares(powers(x, 2), y)
    assert fit.coefficients == pytest.approx(
        [0.673565789473684e-03, 0.732059160401003e-06, -0.316081871345029e-14], rel=1e-12
    )
    assert float(fit.residual_sd) == pytest.approx(0.205177424076185e-03, rel=1e-12)


def test_longley():
    fit = tr.least_squares(np.column_stack([np.ones(16), LONGLEY[:, 1:]]), LONGLEY[:, 0])
    certified = [
        -3482258.63459582, 15.0618722713733, -0.358191792925910e-01, -2.02022980381683, -1.03322686717359,
        -0.511041056535807e-01, 1829.15146461355,
    ]  # fmt: skip
    errors = [
        890420.383607373, 84.9149257747669, 0.334910077722432e-01, 0.488399681651699, 0.214274163161675,
        0.226073200069370, 455.478499142212,
    ]  # fmt: skip
    digits = 1e-12 if EXTENDED else 1e-10
    assert fit.coefficients == pytest.approx(certified, rel=digits)
    assert fit.standard_errors == pytest.approx(errors, rel=digits)
    assert float(fit.residual_sd) == pytest.approx(304.854073561965, rel=digits)


@pytest.mark.parametrize("number", WAMPLER)
def test_wampler(number):
    y, sd = WAMPLER[number]
    fit = tr.least_squares(powers(range(21), 5), y)
    assert fit.coefficients == pytest.approx(np.ones(6), rel=1e-9 if EXTENDED else 1e-6)
    assert float(fit.residual_sd) == pytest.approx(sd, rel=1e-12, abs=1e-8)


def test_filip():
    """Degree 10 on 82 points: beyond plain double precision with raw powers, so seven digits are wanted."""
    y, x = np.array(FILIP).T
    fit = tr.least_squares(powers(x, 10), y)
    certified = [
        -1467.48961422980, -2772.17959193342, -2316.37108160893, -1127.97394098372, -354.478233703349,
        -75.1242017393757, -10.8753180355343, -1.06221498588947, -0.670191154593408e-01,
        -0.246781078275479e-02, -0.402962525080404e-04,
    ]  # fmt: skip
    assert fit.coefficients == pytest.approx(certified, rel=1e-7)
    assert float(fit.residual_sd) == pytest.approx(0.334801051324544e-02, rel=1e-9)


def test_no_intercept():
    fit = tr.least_squares(np.arange(60.0, 71.0)[:, np.newaxis], np.arange(130.0, 141.0))
    assert fit.coefficients == pytest.approx([2.07438016528926], rel=1e-14)
    assert fit.standard_errors == pytest.approx([0.165289256198347e-01], rel=1e-13)
    assert float(fit.residual_sd) == pytest.approx(3.56753034006338, rel=1e-13)
    second = tr.least_squares([[4.0], [5.0], [6.0]], [3.0, 4.0, 4.0])
    assert second.coefficients == pytest.approx([0.727272727272727], rel=1e-14)


def nonlinear(path: Path):
    lines = path.read_text().splitlines()
    rows = [[float(v) for v in row.split()] for row in lines[60:] if row.strip()]
    certified = [
        [float(v) for v in row.split("=")[1].split()][-2:]
        for row in lines[40:60]
        if row.strip().startswith("b")
    ]
    y, x = np.array(rows).T
    return x, y, np.array(certified)


@pytest.mark.parametrize(
    ("name", "law", "candidates"),
    [
        ("Misra1a", lambda c, x: 1 - np.exp(-c * x), np.geomspace(1e-4, 5e-3, 40)),
        ("Misra1b", lambda c, x: 1 - (1 + c * x / 2) ** -2, np.geomspace(1e-4, 5e-3, 40)),
        ("DanWood", lambda c, x: x**c, np.linspace(1.0, 6.0, 40)),
        ("BoxBOD", lambda c, x: 1 - np.exp(-c * x), np.geomspace(0.05, 5.0, 40)),
    ],
)
def test_searched_parameter_has_the_certified_digits(open_data: Path, name, law, candidates):
    """The nonlinear sets with one linear and one bending parameter."""
    x, y, certified = nonlinear(open_data / "nist" / "nonlinear" / f"{name}.dat")
    found = tr.search(lambda c: (np.zeros_like(x), law(c, x)[:, np.newaxis]), y, candidates)
    assert found.fit.coefficients == pytest.approx(certified[:, 0], rel=1e-8)
    assert found.fit.standard_errors == pytest.approx(certified[:, 1], rel=1e-6)
    assert not found.at_bound
    assert found.low < certified[1, 0] < found.high


# -- errors in both variables -----------------------------------------------------------------------------


def test_york_on_pearsons_data():
    found = tr.york(PEARSON_X, PEARSON_Y, YORK_WX**-0.5, YORK_WY**-0.5)
    assert float(found.intercept) == pytest.approx(5.47991, abs=5e-6)
    assert float(found.slope) == pytest.approx(-0.48053, abs=5e-6)
    assert float(found.chi_square) == pytest.approx(11.866, abs=5e-4)
    assert found.degrees_of_freedom == 8
    assert found.mswd == pytest.approx(1.4833, abs=5e-5)
    assert found.standard_errors == pytest.approx([0.2950, 0.0580], abs=5e-5)
    assert found.standard_errors * found.mswd**0.5 == pytest.approx([0.3592, 0.0706], abs=5e-5)


def test_york_agrees_with_orthogonal_distance_regression():
    """Oracle: scipy.odr."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        odr = pytest.importorskip("scipy.odr")
        data = odr.RealData(PEARSON_X, PEARSON_Y, sx=YORK_WX**-0.5, sy=YORK_WY**-0.5)
        other = odr.ODR(data, odr.unilinear, beta0=[-0.5, 5.0]).run()
    found = tr.york(PEARSON_X, PEARSON_Y, YORK_WX**-0.5, YORK_WY**-0.5)
    assert [float(found.slope), float(found.intercept)] == pytest.approx(other.beta, rel=2e-6)


@pytest.mark.parametrize(
    ("ratio", "slope"),
    [
        (1e-9, -0.565888925),
        (0.25, -0.553904556),
        (1.0, -0.545561198),
        (4.0, -0.541367978),
        (1e9, -0.539577207),
    ],
)
def test_york_with_equal_errors_is_the_line_between_the_two_regressions(ratio, slope):
    """Closed form of equal errors, ratio = var(error of y)/var(error of x); 1 is the major axis."""
    u, v = PEARSON_X - PEARSON_X.mean(), PEARSON_Y - PEARSON_Y.mean()
    sxx, syy, sxy = u @ u, v @ v, u @ v
    closed = (syy - ratio * sxx + ((syy - ratio * sxx) ** 2 + 4 * ratio * sxy**2) ** 0.5) / (2 * sxy)
    found = tr.york(PEARSON_X, PEARSON_Y, 1.0, ratio**0.5)
    assert float(found.slope) == pytest.approx(closed, rel=1e-6)
    assert float(found.slope) == pytest.approx(slope, abs=1e-7)


def test_pearsons_own_major_axis():
    found = tr.york(PEARSON_X, PEARSON_Y, 1.0, 1.0)
    assert float(found.intercept) == pytest.approx(5.784, abs=5e-4)
    assert float(found.slope) == pytest.approx(-0.5456, abs=5e-5)


def test_york_coverage_by_simulation():
    """Simulated: the stated standard errors are those found, within the noise of 800 draws."""
    generator = np.random.default_rng(4)
    truth_x = np.linspace(0.05, 0.3, 25)
    u_x, u_y = generator.uniform(0.002, 0.02, 25), generator.uniform(0.05, 0.4, 25)
    drawn = []
    for _ in range(800):
        x, y = generator.normal(truth_x, u_x), generator.normal(-2 + 18 * truth_x, u_y)
        found = tr.york(x, y, u_x, u_y)
        drawn.append([float(found.slope), float(found.standard_errors[1]), found.mswd])
    slope, error, mswd = np.array(drawn).T
    assert slope.mean() == pytest.approx(18, abs=5 * slope.std() / 800**0.5)
    assert np.std(slope) == pytest.approx(error.mean(), rel=0.1)
    assert mswd.mean() == pytest.approx(1.0, abs=0.1)


def test_york_with_correlated_errors_turns_the_line():
    """Limit: exact points give their line whatever the correlation; else the correlation moves it."""
    exact = tr.york(PEARSON_X, 3 - 2 * PEARSON_X, 0.1, 0.2, 0.7)
    assert [float(exact.intercept), float(exact.slope)] == pytest.approx([3, -2])
    plain, turned = (tr.york(PEARSON_X, PEARSON_Y, 0.4, 0.4, r) for r in (0.0, 0.8))
    assert abs(float(plain.slope) - float(turned.slope)) > 1e-4


def test_what_york_refuses():
    with pytest.raises(Impossible, match="u_y"):
        tr.york([0, 1, 2], [0, 1, 2], [0.1, 0.0, 0.1], [0.1, 0.0, 0.1])
    with pytest.raises(Impossible, match="three or more"):
        tr.york([0, 1], [0, 1], 0.1, 0.1)
    with pytest.raises(Impossible, match="one value"):
        tr.york([1, 1, 1], [0, 1, 2], 0.1, 0.1)
    with pytest.raises(Impossible, match="correlation"):
        tr.york([0, 1, 2], [0, 1, 2], 0.1, 0.1, 1.5)


def test_york_trend_finds_the_scatter_of_the_rock():
    """Simulated: stated errors plus 0.35 decades of rock."""
    generator = np.random.default_rng(11)
    found = []
    for _ in range(60):
        true = generator.uniform(0.08, 0.28, 60)
        phi = generator.normal(true, 0.008)
        k = 10 ** (-2.5 + 20 * true + generator.normal(0, 0.35, 60) + generator.normal(0, 0.04, 60))
        fit = tr.york_trend(phi, k, np.full(60, 0.008), 0.04 * np.log(10) * k)
        ordinary = tr.semilog_trend(phi, k)
        found.append([fit.natural_scatter, fit.fit.coefficients[1], ordinary.coefficients[1], fit.mswd])
    scatter, slope, flattened, mswd = np.mean(found, axis=0)
    assert scatter == pytest.approx(0.35, rel=0.05)
    assert slope == pytest.approx(20, rel=0.015)
    assert flattened < 19.75
    assert mswd > 3
    assert slope - flattened > 0.2


def test_reduced_major_axis_on_pearsons_data():
    fit = tr.reduced_major_axis(PEARSON_X, PEARSON_Y)
    ordinary = tr.line(PEARSON_X, PEARSON_Y)
    inverse = 1 / tr.line(PEARSON_Y, PEARSON_X).coefficients[1]
    assert ordinary.coefficients == pytest.approx([5.761185, -0.539577], abs=5e-7)
    assert inverse == pytest.approx(-0.565889, abs=5e-7)
    assert fit.coefficients[1] == pytest.approx(-0.552577, abs=5e-7)
    assert fit.coefficients[1] == pytest.approx(-((ordinary.coefficients[1] * inverse) ** 0.5), rel=1e-14)
    assert float(ordinary.r_squared) == pytest.approx(0.976475**2, abs=2e-6)


@st.composite
def clouds(draw):
    n = draw(st.integers(5, 30))
    x = draw(st.lists(st.floats(0.02, 0.4), min_size=n, max_size=n, unique=True))
    y = draw(st.lists(st.floats(-3, 4), min_size=n, max_size=n, unique=True))
    x, y = np.array(x), np.array(y)
    assume(np.std(x) > 1e-3 and np.std(y) > 1e-2)
    assume(abs(np.corrcoef(x, y)[0, 1]) > 0.05)
    return x, y


@given(clouds())
def test_reduced_major_axis_lies_between_the_two_regressions(cloud):
    x, y = cloud
    ordinary, inverse = tr.line(x, y).coefficients[1], 1 / tr.line(y, x).coefficients[1]
    slope = tr.reduced_major_axis(x, y).coefficients[1]
    assert abs(ordinary) <= abs(slope) * (1 + 1e-9)
    assert abs(slope) <= abs(inverse) * (1 + 1e-9)


# -- robust -----------------------------------------------------------------------------------------------


def test_theil_sen_on_pearsons_data():
    """Slope by hand: the median of 45 slopes; interval after Sen 1968 as scipy gives it."""
    fit, low, high = tr.theil_sen(PEARSON_X, PEARSON_Y)
    i, j = np.triu_indices(10, 1)
    by_hand = np.median((PEARSON_Y[j] - PEARSON_Y[i]) / (PEARSON_X[j] - PEARSON_X[i]))
    assert fit.coefficients[1] == pytest.approx(by_hand, rel=1e-14)
    assert fit.coefficients == pytest.approx([5.6625, -0.535714], abs=5e-7)
    assert (low, high) == pytest.approx((-0.64583, -0.47059), abs=5e-6)


def test_huber_on_stack_loss():
    design = np.column_stack([np.ones(21), STACK_LOSS[:, 1:]])
    fit = tr.huber(design, STACK_LOSS[:, 0])
    assert fit.coefficients == pytest.approx([-41.0265, 0.8294, 0.9261, -0.1278], abs=1e-4)
    other = sm.RLM(STACK_LOSS[:, 0], design, M=sm.robust.norms.HuberT(1.345)).fit(tol=1e-12, maxiter=500)
    assert fit.coefficients == pytest.approx(other.params, rel=1e-6)
    assert fit.standard_errors == pytest.approx(other.bse, rel=1e-6)
    assert fit.weights == pytest.approx(other.weights, abs=1e-6)


def test_robust_lines_do_not_follow_a_wild_plug():
    """Limit: 20 plugs near a line and one with k a million times too low."""
    phi = np.linspace(0.05, 0.25, 21)
    lg = -2 + 20 * phi + 0.02 * np.sin(40 * np.arange(21))
    lg[-1] -= 6
    k = 10**lg
    assert abs(tr.semilog_trend(phi, k).coefficients[1] - 20) > 5
    assert tr.theil_sen_trend(phi, k).coefficients[1] == pytest.approx(20, abs=0.5)
    robust = tr.huber_trend(phi, k)
    assert robust.coefficients[1] == pytest.approx(20, abs=0.5)
    assert robust.weights[-1] < 0.01


# -- ordinary fit: leverages, prediction, tests -----------------------------------------------------------


@given(clouds())
def test_ordinary_fit_against_an_independent_library(cloud):
    """Oracle: statsmodels."""
    x, y = cloud
    fit = tr.line(x, y)
    other = sm.OLS(y, sm.add_constant(x)).fit()
    assert fit.coefficients == pytest.approx(other.params, rel=1e-6, abs=1e-8)
    assert fit.standard_errors == pytest.approx(other.bse, rel=1e-6)
    influence = OLSInfluence(other)
    assert fit.leverages == pytest.approx(influence.hat_matrix_diag, rel=1e-6)
    if fit.residual_sd > 1e-6 and np.all(fit.leverages < 1 - 1e-6):
        ours = tr.studentised_residuals(fit)
        assume(np.max(np.abs(ours)) < 1e3)  # beyond, the fit without the plug is exact but for rounding
        assert ours == pytest.approx(influence.resid_studentized_external, rel=1e-4, abs=1e-6)
    foreseen = tr.predicted(fit, [[1.0, 0.2]])
    frame = other.get_prediction([[1.0, 0.2]])
    assert foreseen.centre == pytest.approx(frame.predicted_mean, rel=1e-6, abs=1e-8)
    assert foreseen.standard_error == pytest.approx(frame.se_obs, rel=1e-6)


@given(clouds())
def test_leaving_one_out_is_what_fitting_without_it_gives(cloud):
    x, y = cloud
    assume(np.max(tr.line(x, y).leverages) < 0.999)
    left = tr.left_out_residuals(tr.line(x, y))
    for i in range(x.size):
        keep = np.arange(x.size) != i
        assume(np.std(x[keep]) > 1e-4)
        a, b = tr.line(x[keep], y[keep]).coefficients
        assert left[i] == pytest.approx(y[i] - a - b * x[i], rel=1e-5, abs=1e-7)


def test_a_plug_outside_the_trend_is_judged_as_if_it_had_been_left_out():
    """Identity: t of a new plug is the external studentised residual it would have inside the fit."""
    generator = np.random.default_rng(2)
    phi = generator.uniform(0.05, 0.3, 15)
    k = 10 ** (-2 + 18 * phi + generator.normal(0, 0.3, 15))
    within = tr.studentised_residuals(tr.semilog_trend(phi, k))
    for i in range(15):
        keep = np.arange(15) != i
        t, p = tr.external_t(tr.semilog_trend(phi[keep], k[keep]), phi[i], k[i])
        assert float(t) == pytest.approx(within[i], rel=1e-9)
        assert float(p) == pytest.approx(2 * stats.t.sf(abs(within[i]), 12), rel=1e-9)
    foreseen = tr.prediction(tr.semilog_trend(phi, k), [0.1, 0.5])
    assert foreseen.degrees_of_freedom == 13
    assert foreseen.standard_error[1] > foreseen.standard_error[0]


def test_prediction_bands_hold_what_they_say():
    """Simulated: 95 % of new plugs, within the noise of 3000."""
    generator = np.random.default_rng(6)
    held = []
    for _ in range(3000):
        phi = generator.uniform(0.05, 0.3, 9)
        new = generator.uniform(0.05, 0.3)
        lg = -2 + 18 * np.append(phi, new) + generator.normal(0, 0.4, 10)
        _, p = tr.external_t(tr.semilog_trend(phi, 10 ** lg[:-1]), new, 10 ** lg[-1])
        held.append(p > 0.05)
    assert np.mean(held) == pytest.approx(0.95, abs=0.015)


def test_analysis_of_covariance_against_an_independent_library():
    """Oracle: statsmodels."""
    from statsmodels.formula.api import ols
    from statsmodels.stats.anova import anova_lm

    generator = np.random.default_rng(1)
    frame = pd.DataFrame({"x": generator.uniform(0.05, 0.3, 45), "g": np.repeat(["a", "b", "c"], 15)})
    shift = frame["g"].map({"a": 0.0, "b": 0.4, "c": 0.6})
    frame["y"] = -2 + 18 * frame["x"] + shift + generator.normal(0, 0.5, 45)
    found = tr.compare_lines(frame["x"], frame["y"], frame["g"])
    one, parallel, own = (ols(f"y ~ {m}", frame).fit() for m in ("x", "x + g", "x * g"))
    for ours, (small, large) in zip(
        (found.any, found.slopes, found.levels), ((one, own), (parallel, own), (one, parallel)), strict=True
    ):
        table = anova_lm(small, large)
        assert ours[0] == pytest.approx(table["F"].iloc[1], rel=1e-8)
        assert ours[1:3] == (table["df_diff"].iloc[1], table["df_resid"].iloc[1])
        assert ours[3] == pytest.approx(table["Pr(>F)"].iloc[1], rel=1e-7)


def test_analysis_of_covariance_errs_as_often_as_it_says():
    """Simulated: facies of one line are told apart in 5 % of draws; groups too small are left out."""
    generator = np.random.default_rng(3)
    group = np.repeat([0, 1, 2], [8, 12, 6])
    p = []
    for _ in range(800):
        x = generator.uniform(0.05, 0.3, 26)
        p.append(tr.compare_lines(x, -2 + 18 * x + generator.normal(0, 0.5, 26), group).any[3])
    assert np.mean(np.array(p) < 0.05) == pytest.approx(0.05, abs=0.025)
    assert tr.compare_lines([0.1, 0.2, 0.3, 0.1], [1, 2, 4, 0], ["a", "a", "a", "b"]) is None
    assert tr.compare_lines([0.1, 0.2, 0.3] * 2, [1, 2, 3] * 2, ["a"] * 3 + ["b"] * 3) is None


def test_uneven_scatter_against_an_independent_library():
    """Oracle: statsmodels' Koenker form."""
    generator = np.random.default_rng(8)
    x = generator.uniform(0, 1, 60)
    y = x + generator.normal(0, 0.1 + x)
    fit = tr.line(x, y)
    other = het_breuschpagan(fit.residuals, sm.add_constant(x))[1]
    assert tr.uneven_scatter_p(fit, x) == pytest.approx(other, rel=1e-9)


def test_corrected_akaike_by_hand():
    fit = tr.line(PEARSON_X, PEARSON_Y)
    squares = np.sum(fit.residuals**2)
    assert tr.corrected_akaike(fit) == pytest.approx(10 * np.log(squares / 10) + 6 + 24 / 6)
    assert tr.corrected_akaike(tr.line([0, 1, 2], [0, 1, 3])) == np.inf


def test_what_least_squares_refuses():
    with pytest.raises(Impossible, match="column 1"):
        tr.line([0.2, 0.2, 0.2], [1, 2, 3])
    with pytest.raises(Impossible, match="more points than"):
        tr.line([0.1, 0.2], [1, 2])
    with pytest.raises(Impossible, match="finite"):
        tr.line([0.1, 0.2, np.inf], [1, 2, 3])
    assert np.isnan(tr.line([0.1, 0.2, np.nan], [1, 2, 3]).coefficients).all()


# -- trends -----------------------------------------------------------------------------------------------


def test_timur_in_percent_and_in_fractions():
    assert float(tr.timur_permeability_md(0.20, 0.30)) == pytest.approx(0.136 * 20**4.4 / 30**2, rel=1e-14)
    assert float(tr.timur_permeability_md(0.20, 0.30)) == pytest.approx(8581 * 0.2**4.4 / 0.3**2, rel=5e-5)
    assert float(tr.timur_permeability_md(0.20, 0.30)) == pytest.approx(80.136, abs=5e-4)


def test_timur_trend_finds_timurs_coefficients():
    generator = np.random.default_rng(5)
    phi, s = generator.uniform(0.08, 0.3, 40), generator.uniform(0.15, 0.9, 40)
    k = tr.timur_permeability_md(phi, s)
    assert tr.timur_trend(phi, k, s).coefficients == pytest.approx([np.log10(8581), 4.4, -2], abs=1e-4)
    noisy = tr.timur_trend(phi, k * 10 ** generator.normal(0, 0.2, 40), s)
    assert np.all(np.abs(noisy.coefficients - [3.9335, 4.4, -2]) < 4 * noisy.standard_errors)


def test_kozeny_carman_trend_without_threshold_is_the_pack():
    """Limit: a pack of 0.25 mm grains, constant 180, no threshold."""
    phi = np.linspace(0.1, 0.4, 12)
    found = tr.kozeny_carman_trend(phi, permeability_kozeny_carman_md(0.25, phi))
    assert found.at_bound
    assert found.fit.coefficients[1] == pytest.approx(0.0, abs=1e-7)
    assert 10 ** found.fit.coefficients[0] == pytest.approx((0.25e-3) ** 2 / 180 / 9.869233e-16, rel=1e-5)
    assert np.isnan(found.fit.standard_errors[1])


def test_kozeny_carman_threshold_is_found_and_covered():
    """Simulated: truth lg B 4, threshold 0.03."""
    inside, centres = [], []
    for seed in range(60):
        generator = np.random.default_rng(seed)
        phi = generator.uniform(0.05, 0.3, 60)
        k = 1e4 * (phi - 0.03) ** 3 / (1 - phi + 0.03) ** 2 * 10 ** generator.normal(0, 0.2, 60)
        found = tr.kozeny_carman_trend(phi, k)
        centres.append(found.fit.coefficients[1])
        inside.append(found.low <= 0.03 <= found.high)
    assert np.mean(centres) == pytest.approx(0.03, abs=0.003)
    assert np.mean(inside) == pytest.approx(0.95, abs=0.07)


def test_break_is_found_and_covered():
    """Simulated: slopes 30 and 8, break 0.16, scatter 0.2 decades."""
    inside, centres = [], []
    for seed in range(60):
        generator = np.random.default_rng(seed)
        phi = generator.uniform(0.04, 0.3, 80)
        lg = -3 + 30 * phi - 22 * np.maximum(phi - 0.16, 0) + generator.normal(0, 0.2, 80)
        found = tr.broken_trend(phi, 10**lg)
        centres.append(found.fit.coefficients)
        inside.append(found.low <= 0.16 <= found.high)
    assert np.mean(centres, axis=0) == pytest.approx([-3, 30, -22, 0.16], rel=0.06)
    assert np.mean(inside) >= 0.87


@pytest.mark.parametrize("law", ["kozeny_carman_trend", "broken_trend"])
def test_leaving_one_out_of_a_searched_fit(law):
    """Oracle: the fit made anew without each plug."""
    generator = np.random.default_rng(9)
    phi = np.sort(generator.uniform(0.05, 0.3, 30))
    k = 1e4 * (phi - 0.02) ** 3 * 10 ** generator.normal(0, 0.25, 30)
    fit = getattr(tr, law)
    whole = fit(phi, k)
    by_hand = []
    for i in range(30):
        keep = np.arange(30) != i
        c = fit(phi[keep], k[keep]).fit.coefficients
        if law == "broken_trend":
            centre = c[0] + c[1] * phi[i] + c[2] * max(phi[i] - c[3], 0)
        else:
            open_part = max(phi[i] - c[1], 1e-9)
            centre = c[0] + 3 * np.log10(open_part) - 2 * np.log10(1 - open_part)
        by_hand.append(np.log10(k[i]) - centre)
    ours, brute = np.sqrt(np.mean(whole.left_out**2)), np.sqrt(np.mean(np.square(by_hand)))
    assert ours == pytest.approx(brute, rel=0.15)


def test_what_a_break_needs():
    with pytest.raises(Impossible, match="8 or more"):
        tr.broken_line([0.1, 0.2, 0.3], [1, 2, 3])
    with pytest.raises(Impossible, match="share one value"):
        tr.broken_line([0.1] * 10 + [0.2], [1.0] * 11)


@given(clouds(), st.floats(-2, 2))
def test_another_unit_of_permeability_moves_the_intercept_alone(cloud, shift):
    x, y = cloud
    for fit in (tr.semilog_trend, tr.power_trend, tr.reduced_major_axis_trend, tr.theil_sen_trend):
        one, other = fit(x, 10**y), fit(x, 10 ** (y + shift))
        assert other.coefficients == pytest.approx(
            one.coefficients + np.array([shift, 0.0]), rel=1e-6, abs=1e-6
        )
        assert float(other.residual_sd) == pytest.approx(float(one.residual_sd), rel=1e-6, abs=1e-9)
