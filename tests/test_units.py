"""Units against pint as a second opinion, round trips, and the traps of typed symbols.

No published values: the factors are definitions, checked here against another library's.
"""

from __future__ import annotations

import numpy as np
import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab import units
from corelab.errors import Usage
from corelab.units import UNITS, UnitTrouble, accepted, convert, unit

PRESSURES = "kPa MPa Pa bar bara barg kPag psia psig atm inHg mmHg"
WANTED = {
    "length": "m cm mm ft in um",
    "volume": "m3 cm3 mL L in3 bbl",
    "mass": "g kg lb",
    "density": "g/cm3 kg/m3 lb/ft3",
    "pressure": PRESSURES,
    "stress": "kPa MPa Pa bar psi atm inHg mmHg",
    "permeability": "mD D uD nD um2 m2",
    "flow rate": "cm3/s cm3/min mL/min L/min",
    "viscosity": "mPa.s cP Pa.s",
    "temperature": "degC degF K",
    "fraction": "v/v % p.u.",
    "gamma": "gAPI",
    "resistivity": "ohm.m",
    "grain size": "mm um phi",
    "grain size spread": "phi",
    "time": "s min h",
    "angle": "deg",
    "salinity by mass": "g/kg %w ppm",
    "salinity by volume": "g/L mg/L",
}
# Our symbol in the words of pint, which reads mD as millidebye and C as coulomb.
PINT = {
    "m": "meter", "cm": "centimeter", "mm": "millimeter", "um": "micrometer", "ft": "foot", "in": "inch",
    "cm3": "centimeter**3", "m3": "meter**3", "mL": "milliliter", "L": "liter", "in3": "inch**3",
    "bbl": "oil_barrel", "g": "gram", "mg": "milligram", "kg": "kilogram", "lb": "pound",
    "g/cm3": "gram/centimeter**3", "g/mL": "gram/milliliter", "kg/m3": "kilogram/meter**3",
    "lb/ft3": "pound/foot**3", "kPa": "kilopascal", "MPa": "megapascal", "Pa": "pascal", "bar": "bar",
    "bara": "bar", "barg": "bar", "kPag": "kilopascal", "psi": "pound_force_per_square_inch",
    "psia": "pound_force_per_square_inch", "psig": "pound_force_per_square_inch",
    "atm": "standard_atmosphere", "mD": "millidarcy", "D": "darcy", "uD": "microdarcy", "nD": "nanodarcy",
    "um2": "micrometer**2", "m2": "meter**2", "cm3/s": "centimeter**3/second",
    "cm3/min": "centimeter**3/minute", "cm3/h": "centimeter**3/hour", "mL/s": "milliliter/second",
    "mL/min": "milliliter/minute", "mL/h": "milliliter/hour", "L/min": "liter/minute", "L/h": "liter/hour",
    "m3/s": "meter**3/second", "mPa.s": "millipascal*second", "cP": "centipoise", "Pa.s": "pascal*second",
    "uPa.s": "micropascal*second", "v/v": "dimensionless", "%": "percent", "p.u.": "percent",
    "s": "second", "min": "minute", "h": "hour", "deg": "degree", "g/kg": "gram/kilogram",
    "%w": "percent", "ppm": "ppm", "g/L": "gram/liter", "mg/L": "milligram/liter", "1/m": "1/meter",
    "1/MPa": "1/megapascal",
    "1/kPa": "1/kilopascal", "1/bar": "1/bar", "1/psi": "1/pound_force_per_square_inch",
    "1/cm": "1/centimeter", "1/ft": "1/foot", "degC": "degC", "degF": "degF", "K": "kelvin",
}  # fmt: skip
#: Symbols that pint does not have, or not in our sense.
OURS_ALONE = {"gAPI", "ohm.m", "phi", "inHg", "mmHg"}
EVERY = [(kind, symbol) for kind, table in UNITS.items() for symbol in table]
SCALES = [(k, s) for k, s in EVERY if s not in OURS_ALONE]
ONE_VALUE = st.floats(1e-6, 1e6)


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    return pint.UnitRegistry(autoconvert_offset_to_baseunit=True)


@pytest.mark.parametrize(("kind", "symbols"), WANTED.items())
def test_every_unit_that_people_rely_on_is_there(kind: str, symbols: str):
    assert set(symbols.split()) <= set(accepted(kind))
    for symbol in symbols.split():
        assert unit(symbol, kind).symbol == symbol


@pytest.mark.parametrize(("kind", "symbol"), SCALES)
def test_conversion_agrees_with_pint(registry: pint.UnitRegistry, kind: str, symbol: str):
    """Oracle: pint under its unambiguous names; the darcy is by its definition 1e-12/1.01325 m2."""
    base = accepted(kind)[0]
    values = np.array([-2.5, 0.0, 1.0, 37.25])
    expected = registry.Quantity(values, PINT[symbol]).to(PINT[base]).magnitude
    # pint's own darcy is cP.cm2/(s.atm), exactly ours; its factors carry the rounding of doubles
    np.testing.assert_allclose(
        convert(values, unit(symbol, kind), unit(base, kind)), expected, rtol=1e-9, atol=1e-9
    )


@pytest.mark.parametrize(
    ("symbol", "kpa"),
    [
        # NIST SP 811, 2008 edition, appendix B.8: "inch of mercury, conventional (inHg)" 3.386 389 E+03 Pa,
        # "millimeter of mercury, conventional (mmHg)" 1.333 224 E+02 Pa
        ("inHg", pytest.approx(3.386389, abs=0.5e-6)),
        ("mmHg", pytest.approx(0.1333224, abs=0.5e-7)),
        # the same: "pound-force per square inch (psi)" 6.894 757 E+03 Pa
        ("psia", pytest.approx(6.894757, abs=0.5e-6)),
    ],
)
def test_conventional_pressures(symbol: str, kpa: object):
    assert convert(1.0, unit(symbol, "pressure"), unit("kPa", "pressure")) == kpa


def test_published_darcy_and_barrel():
    """NIST SP 811, 2008, appendix B.8: darcy 9.869 233 E-13 m2; barrel (42 gal) 1.589 873 E-01 m3."""
    assert convert(1.0, unit("D", "permeability"), unit("m2", "permeability")) == pytest.approx(
        9.869233e-13, abs=0.5e-19
    )
    assert convert(1.0, unit("bbl", "volume"), unit("m3", "volume")) == pytest.approx(0.1589873, abs=0.5e-7)


@given(st.sampled_from([(k, s, t) for k, table in UNITS.items() for s in table for t in table]), ONE_VALUE)
def test_there_and_back_again(units_of: tuple[str, str, str], value: float):
    kind, one, other = units_of
    # far beyond any grain, phi of a huge size overflows when it is raised again
    value = min(value, 500.0) if kind == "grain size" else value
    there = convert(value, unit(one, kind), unit(other, kind))
    back = convert(there, unit(other, kind), unit(one, kind))
    assert back == pytest.approx(value, rel=1e-9, abs=1e-9)


def test_arrays_and_missing_values_flow_through():
    found = convert(np.array([1.0, np.nan]), unit("ft", "length"), unit("m", "length"))
    assert found[0] == 0.3048
    assert np.isnan(found[1])


def test_phi_is_minus_the_binary_logarithm_of_the_size_in_millimetres():
    """Krumbein 1934: phi = -log2 d."""
    phi, mm = unit("phi", "grain size"), unit("mm", "grain size")
    assert convert(2.0, phi, mm) == 0.25
    assert convert(np.array([0.25, 2.0]), mm, phi).tolist() == [2.0, -1.0]
    assert convert(1.5, unit("phi", "grain size spread"), unit("phi", "grain size spread")) == 1.5


@pytest.mark.parametrize(
    ("typed", "kind", "symbol"),
    [
        ("mPa.s", "viscosity", "mPa.s"),
        ("MPA.S", "viscosity", "mPa.s"),
        ("mpa.s", "viscosity", "mPa.s"),
        ("cp", "viscosity", "cP"),
        ("mD", "permeability", "mD"),
        ("md", "permeability", "mD"),
        ("MD", "permeability", "mD"),
        ("d", "permeability", "D"),
        ("nd", "permeability", "nD"),
        ("KPA", "pressure", "kPa"),
        ("mpa", "pressure", "MPa"),
        ("MPa", "pressure", "MPa"),
        ("PSIG", "pressure", "psig"),
        ("psi", "stress", "psi"),
        ("ml", "volume", "mL"),
        ("l", "volume", "L"),
        ("Degc", "temperature", "degC"),
        ("°C", "temperature", "degC"),
        ("k", "temperature", "K"),
        ("cc", "volume", "cm3"),
        ("CC/min", "flow rate", "cm3/min"),
        ("cm³", "volume", "cm3"),
        ("µm", "length", "um"),
        ("μm", "length", "um"),
        ("  g/cm3 ", "density", "g/cm3"),
        ("FT", "length", "ft"),
        ("pu", "fraction", "p.u."),
        ("gapi", "gamma", "gAPI"),
        ("PHI", "grain size", "phi"),
        ("MM", "length", "mm"),
    ],
)
def test_a_symbol_is_matched_exactly_first_and_then_without_regard_to_case(
    typed: str, kind: str, symbol: str
):
    assert unit(typed, kind).symbol == symbol


@pytest.mark.parametrize(
    ("typed", "kind", "said"),
    [
        ("MPa.s", "viscosity", "accepted: mPa.s, cP"),
        ("mPa", "pressure", "accepted: kPa, MPa"),
        ("Md", "permeability", "accepted: mD, D"),
        ("psi", "pressure", "say psia or psig"),
        ("PSI", "absolute pressure", "say psia or psig"),
        ("psig", "absolute pressure", "is a gauge pressure, and this one is absolute"),
        ("psig", "stress", "neither absolute nor gauge"),
        ("barg", "stress", "neither absolute nor gauge"),
        ("bara", "stress", "neither absolute nor gauge"),
        ("g/L", "salinity by mass", "per volume of solution"),
        ("ppm", "salinity by volume", "per mass of solution"),
        ("phi", "length", "'phi' is a unit of grain size"),
        ("mm", "grain size spread", "is a unit of length"),
        ("ft", "volume", "is a unit of length, not of volume"),
        ("furlong", "length", "'furlong' is not a unit of length"),
        ("", "mass", "no unit of mass is given"),
        ("millidarcy", "permeability", "accepted: mD"),
        ("C", "temperature", "accepted: degC"),
    ],
)
def test_what_is_refused_says_why_and_what_would_do(typed: str, kind: str, said: str):
    with pytest.raises(UnitTrouble, match=r"accepted: ") as trouble:
        unit(typed, kind)
    assert said in str(trouble.value)
    assert isinstance(trouble.value, Usage)


def test_phi_only_for_grain_size_and_sorting():
    assert {kind for kind, table in UNITS.items() if "phi" in table} == {"grain size", "grain size spread"}


def test_gauge_units_are_marked_and_only_for_pressures():
    assert {(k, s) for k, s in EVERY if UNITS[k][s].gauge} == {
        ("pressure", "psig"),
        ("pressure", "barg"),
        ("pressure", "kPag"),
    }


@given(st.floats(0.0, 1e4), st.floats(60.0, 110.0))
def test_gauge_to_absolute_adds_the_barometer_where_gauge(value: float, barometer: float):
    made = units.absolute_kpa(np.array([value, value]), np.array([True, False]), barometer)
    assert made.tolist() == [value + barometer, value]
    assert float(units.absolute_kpa(value, False, float("nan"))) == value


def test_units_of_different_kinds_do_not_mix():
    with pytest.raises(UnitTrouble, match="is mass"):
        convert(1.0, unit("g", "mass"), unit("m", "length"))


@given(st.text(max_size=12), st.sampled_from(sorted(UNITS)))
def test_any_text_is_a_unit_or_refused(text: str, kind: str):
    try:
        symbol = unit(text, kind).symbol
    except UnitTrouble:
        return
    assert symbol in accepted(kind)
