"""Units as people type them: one closed table, one conversion a column.

Every unit belongs to one kind; a value is converted only within its kind. Unknown text is refused with
the accepted symbols, since a general parser would read mD as millidebye. Factors are exact by definition
(international foot 0.3048 m and pound 0.45359237 kg; standard atmosphere 101 325 Pa; gravity 9.80665 m/s2;
1 darcy = 1e-12/1.01325 m2); conventional mercury 13 595.1 kg/m3 at 0 degC stands behind inHg and mmHg
(BIPM, The International System of Units, 9th ed. 2019; NIST Special Publication 811, 2008, appendix B).
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, TypeVar

from corelab.errors import Usage

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

ATMOSPHERE_KPA = 101.325
DARCY_M2 = 1e-12 / 1.01325
MILLIDARCY_M2 = 1e-15 / 1.01325
ZERO_CELSIUS_K = 273.15
_PSI_KPA = 0.45359237 * 9.80665 / 0.0254**2 / 1000.0
_MMHG_KPA = 13.5951 * 9.80665 / 1000.0
_LB_G = 453.59237


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit: value in the base unit of its kind = value x factor + offset."""

    symbol: str
    kind: str
    factor: float
    offset: float = 0.0
    gauge: bool = False


class UnitTrouble(Usage):
    """A unit that cannot be used here; says which ones can."""


# kind -> symbol -> factor to the first symbol of the kind (its base)
_FACTORS: dict[str, dict[str, float]] = {
    "length": {"m": 1.0, "cm": 1e-2, "mm": 1e-3, "um": 1e-6, "ft": 0.3048, "in": 0.0254},
    "volume": {
        "cm3": 1.0,
        "m3": 1e6,
        "mL": 1.0,
        "L": 1000.0,
        "in3": 2.54**3,
        "bbl": 42 * 231 * 2.54**3,
    },
    "mass": {"g": 1.0, "mg": 1e-3, "kg": 1000.0, "lb": _LB_G},
    "density": {"g/cm3": 1.0, "g/mL": 1.0, "kg/m3": 1e-3, "lb/ft3": _LB_G / 30.48**3},
    "pressure": {
        "kPa": 1.0,
        "MPa": 1000.0,
        "Pa": 1e-3,
        "bar": 100.0,
        "bara": 100.0,
        "barg": 100.0,
        "kPag": 1.0,
        "psia": _PSI_KPA,
        "psig": _PSI_KPA,
        "atm": ATMOSPHERE_KPA,
        "inHg": 25.4 * _MMHG_KPA,
        "mmHg": _MMHG_KPA,
    },
    "stress": {
        "kPa": 1.0,
        "MPa": 1000.0,
        "Pa": 1e-3,
        "bar": 100.0,
        "psi": _PSI_KPA,
        "atm": ATMOSPHERE_KPA,
        "inHg": 25.4 * _MMHG_KPA,
        "mmHg": _MMHG_KPA,
    },
    "permeability": {
        "mD": 1.0,
        "D": 1000.0,
        "uD": 1e-3,
        "nD": 1e-6,
        "um2": 1e-12 / MILLIDARCY_M2,
        "m2": 1.0 / MILLIDARCY_M2,
    },
    "flow rate": {
        "cm3/s": 1.0,
        "cm3/min": 1.0 / 60.0,
        "cm3/h": 1.0 / 3600.0,
        "mL/s": 1.0,
        "mL/min": 1.0 / 60.0,
        "mL/h": 1.0 / 3600.0,
        "L/min": 1000.0 / 60.0,
        "L/h": 1000.0 / 3600.0,
        "m3/s": 1e6,
    },
    "viscosity": {"mPa.s": 1.0, "cP": 1.0, "Pa.s": 1000.0, "uPa.s": 1e-3},
    "fraction": {"v/v": 1.0, "%": 1e-2, "p.u.": 1e-2},
    "gamma": {"gAPI": 1.0},
    "resistivity": {"ohm.m": 1.0},
    "grain size": {"mm": 1.0, "um": 1e-3},
    "grain size spread": {"phi": 1.0},
    "time": {"s": 1.0, "min": 60.0, "h": 3600.0},
    "angle": {"deg": 1.0},
    "salinity by mass": {"g/kg": 1.0, "%w": 10.0, "ppm": 1e-3},
    "salinity by volume": {"g/L": 1.0, "mg/L": 1e-3},
    "compressibility": {"1/MPa": 1.0, "1/kPa": 1e3, "1/bar": 10.0, "1/psi": 1e3 / _PSI_KPA},
    "inverse length": {"1/m": 1.0, "1/cm": 100.0, "1/ft": 1.0 / 0.3048},
}
_GAUGE = {"barg", "kPag", "psig"}
# For what is never read on a gauge: the barometer itself, a mean pressure, a slip factor.
_FACTORS["absolute pressure"] = {s: f for s, f in _FACTORS["pressure"].items() if s not in _GAUGE}
# Other ways in which the same symbols are commonly typed.
_ALIASES = {
    "cc": "cm3",
    "cm^3": "cm3",
    "cm³": "cm3",
    "m³": "m3",
    "m^3": "m3",
    "in^3": "in3",
    "g/cc": "g/cm3",
    "g/cm^3": "g/cm3",
    "g/cm³": "g/cm3",
    "kg/m^3": "kg/m3",
    "kg/m³": "kg/m3",
    "lb/ft^3": "lb/ft3",
    "cc/s": "cm3/s",
    "cc/min": "cm3/min",
    "cm^3/s": "cm3/s",
    "cm³/s": "cm3/s",
    "cm^3/min": "cm3/min",
    "cm³/min": "cm3/min",
    "µm": "um",
    "μm": "um",
    "um^2": "um2",
    "µm2": "um2",
    "μm2": "um2",
    "µm²": "um2",
    "m^2": "m2",
    "m²": "m2",
    "µD": "uD",
    "μD": "uD",
    "mPa·s": "mPa.s",
    "mPas": "mPa.s",
    "°C": "degC",
    "°F": "degF",
    "deg C": "degC",
    "deg F": "degF",
    "pu": "p.u.",
    "API": "gAPI",
    "ohmm": "ohm.m",
    "°": "deg",
    "wt%": "%w",
    "%wt": "%w",
    "ft.": "ft",
    "in.": "in",
}

UNITS: MappingProxyType[str, MappingProxyType[str, Unit]] = MappingProxyType(
    {
        kind: MappingProxyType(
            {s: Unit(s, kind, f, gauge=kind == "pressure" and s in _GAUGE) for s, f in table.items()}
        )
        for kind, table in _FACTORS.items()
    }
    | {
        "temperature": MappingProxyType(
            {
                "degC": Unit("degC", "temperature", 1.0),
                "degF": Unit("degF", "temperature", 5.0 / 9.0, -160.0 / 9.0),
                "K": Unit("K", "temperature", 1.0, -ZERO_CELSIUS_K),
            }
        ),
        "grain size": MappingProxyType(
            {s: Unit(s, "grain size", f) for s, f in _FACTORS["grain size"].items()}
            | {"phi": Unit("phi", "grain size", float("nan"))}
        ),
    }
)


def accepted(kind: str) -> tuple[str, ...]:
    """The symbols a column of this kind may carry."""
    return tuple(UNITS[kind])


def unit(text: str, kind: str) -> Unit:
    """The unit that `text` means in a column of `kind`.

    Raises
    ------
    UnitTrouble
        If there is none; the message lists the accepted symbols.
    """
    table = UNITS[kind]
    typed = re.sub(r"\s+", " ", text.strip())
    for candidate in (typed, _ALIASES.get(typed, "")):
        if candidate in table:
            return table[candidate]
    matches = {s for s in table if _same_but_case(typed, s)}
    matches |= {s for a, s in _ALIASES.items() if s in table and _same_but_case(typed, a)}
    if len(matches) == 1:
        return table[matches.pop()]
    raise UnitTrouble(_why_not(typed, kind) + f"accepted: {', '.join(table)}")


def _same_but_case(typed: str, symbol: str) -> bool:
    if typed.casefold() != symbol.casefold():
        return False
    # m and M are milli and mega: in mixed case the writer meant the one that is written.
    milli_or_mega = typed[:1] in "mM" and typed[:1] != symbol[:1]
    return not milli_or_mega or typed.isupper() or typed.islower()


def _why_not(typed: str, kind: str) -> str:
    folded = typed.casefold()
    if kind == "absolute pressure" and folded in {"psig", "barg", "kpag"}:
        return f"'{typed}' is a gauge pressure, and this one is absolute; "
    if kind in {"pressure", "absolute pressure"} and folded == "psi":
        return "psi does not say whether it is absolute or gauge: say psia or psig; "
    if kind == "stress" and folded in {"psig", "psia", "barg", "bara", "kpag"}:
        return f"a stress or a pressure difference is neither absolute nor gauge ('{typed}'); "
    if kind == "salinity by mass" and folded in {"g/l", "mg/l"}:
        return f"'{typed}' is per volume of solution, and this is per mass of solution; "
    if kind == "salinity by volume" and folded in {"g/kg", "%w", "ppm"}:
        return f"'{typed}' is per mass of solution, and this is per volume of solution; "
    for other, table in UNITS.items():
        if other != kind and any(folded == s.casefold() for s in table):
            return f"'{typed}' is a unit of {other}, not of {kind}; "
    return f"'{typed}' is not a unit of {kind}; " if typed else f"no unit of {kind} is given; "


Number = TypeVar("Number", "float", "NDArray[np.float64]")


def to_base(values: Number, source: Unit) -> Number:
    """`values` in the base unit of their kind (a gauge pressure stays gauge)."""
    if source.symbol == "phi" and source.kind == "grain size":
        size: Number = 2.0**-values
        return size
    return values * source.factor + source.offset


def from_base(values: Number, target: Unit) -> Number:
    """`values` of the base unit in `target`."""
    if target.symbol == "phi" and target.kind == "grain size":
        import numpy

        phi: Number = -numpy.log2(values)
        return phi
    return (values - target.offset) / target.factor


def convert(values: Number, source: Unit, target: Unit) -> Number:
    """`values` of `source` in `target`; both of one kind.

    A gauge pressure is not made absolute here: that needs a barometer (see `absolute_kpa`).
    """
    if source.kind != target.kind:
        raise UnitTrouble(f"{source.symbol} is {source.kind}, {target.symbol} is {target.kind}")
    if source == target:
        return values
    return from_base(to_base(values, source), target)


def absolute_kpa(
    values_kpa: float | NDArray[np.float64],
    gauge: bool | NDArray[np.bool_],
    barometer_kpa: float | NDArray[np.float64],
) -> NDArray[np.float64]:
    """Absolute pressures [kPa] from values of which those marked `gauge` read zero at the barometer."""
    import numpy

    return numpy.asarray(values_kpa + numpy.where(gauge, barometer_kpa, 0.0))
