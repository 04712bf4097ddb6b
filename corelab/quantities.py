"""The data dictionary: every quantity read or reported, its symbol, unit, decimals and ranges.

`possible` bounds what physics or arithmetic allows: a reading outside is refused. `plausible` bounds what a
core laboratory meets (common practice): a reading outside is taken and questioned. Both are inclusive and
in the stored unit, which is the unit that the code carries in its names.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from types import MappingProxyType

INFINITY = float("inf")
TINY = 1e-12
Range = tuple[float, float]
ANY: Range = (-INFINITY, INFINITY)
POSITIVE: Range = (TINY, INFINITY)
NOT_NEGATIVE: Range = (0.0, INFINITY)


@dataclass(frozen=True, slots=True)
class Quantity:
    """One quantity.

    Parameters
    ----------
    name, symbol
        The trade's word, as headings carry it, and the letter used in equations.
    kind
        Its kind of unit (`corelab.units`); empty where it has none.
    unit, heading_unit
        The stored unit, and the one that a blank sheet offers.
    decimals
        Decimals sensible in the unit in which it is reported.
    """

    name: str
    symbol: str
    kind: str
    unit: str
    heading_unit: str
    decimals: int
    possible: Range = ANY
    plausible: Range = ANY

    @property
    def heading(self) -> str:
        return f"{self.name} [{self.heading_unit}]" if self.heading_unit else self.name

    @property
    def stored_heading(self) -> str:
        return f"{self.name} [{self.unit}]" if self.unit else self.name


_SUFFIX = {
    "g/cm3": "g_cm3",
    "cm3/s": "cm3_per_s",
    "v/v": "frac",
    "mPa.s": "mpas",
    "g/kg": "g_per_kg",
    "g/L": "g_per_l",
    "1/m": "per_m",
    "1/MPa": "per_mpa",
    "gAPI": "gapi",
}


def field_name(name: str, unit: str = "") -> str:
    """The name that code and tables give to a quantity: words joined, unit last."""
    stem = name.replace(" ", "_").replace("-", "_").lower()
    return f"{stem}_{_SUFFIX.get(unit, unit.lower())}" if unit else stem


def _q(
    name: str,
    symbol: str,
    kind: str,
    unit: str,
    decimals: int,
    possible: Range = ANY,
    plausible: Range = ANY,
    heading_unit: str = "",
) -> Quantity:
    return Quantity(name, symbol, kind, unit, heading_unit or unit, decimals, possible, plausible)


def _index(quantities: Iterable[Quantity]) -> MappingProxyType[str, Quantity]:
    return MappingProxyType({quantity.name: quantity for quantity in quantities})


_DEPTH: Range = (-500.0, 15000.0)
_LAB_TEMPERATURE: Range = (10.0, 40.0)

#: Quantities that are entered.
ENTERED = _index(
    [
        _q("depth", "z", "length", "m", 2, _DEPTH),
        _q("top depth", "z_t", "length", "m", 2, _DEPTH),
        _q("base depth", "z_b", "length", "m", 2, _DEPTH),
        _q("recovered length", "L_r", "length", "m", 2, (0.0, 1000.0)),
        _q("recovered plug length", "L_r", "length", "mm", 0, (0.0, 500.0), (5.0, 90.0)),
        _q("core diameter", "D_c", "length", "mm", 0, (5.0, 500.0), (20.0, 200.0)),
        _q("bit diameter", "D_b", "length", "mm", 0, (20.0, 2000.0), (50.0, 1000.0)),
        _q("datum elevation", "E", "length", "m", 1, (-500.0, 9000.0)),
        _q("mud filtrate salinity", "c_mf", "salinity by volume", "g/L", 0, (0.0, 500.0), (0.0, 330.0)),
        _q("azimuth", "alpha", "angle", "deg", 0, (-360.0, 360.0)),
        _q("jacket mass", "m_j", "mass", "g", 3, NOT_NEGATIVE, (0.0, 200.0)),
        _q("jacket volume", "V_j", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 50.0)),
        _q("screen thickness", "t_s", "length", "cm", 3, (0.0, 5.0), (0.0, 0.5), "mm"),
        _q("grain size", "d", "grain size", "mm", 3, (1e-5, 4096.0), (0.001, 64.0)),
        _q("sorting", "sigma", "grain size spread", "phi", 2, (0.0, 20.0), (0.0, 5.0)),
        _q("temperature", "T", "temperature", "degC", 1, (-50.0, 1000.0), _LAB_TEMPERATURE),
        _q("treatment temperature", "T", "temperature", "degC", 1, (-200.0, 1000.0), (0.0, 120.0)),
        _q("cup temperature", "T_c", "temperature", "degC", 2, (-50.0, 200.0), _LAB_TEMPERATURE),
        _q("flow temperature", "T_b", "temperature", "degC", 1, (-50.0, 200.0), _LAB_TEMPERATURE),
        _q("standard temperature", "T_s", "temperature", "degC", 1, (-50.0, 200.0), (0.0, 30.0)),
        _q("trap temperature", "T_t", "temperature", "degC", 1, (0.0, 100.0), _LAB_TEMPERATURE),
        _q("humidity", "RH", "fraction", "v/v", 2, (0.0, 1.0), heading_unit="%"),
        _q("length", "L", "length", "cm", 3, (0.01, 200.0), (0.5, 40.0), "mm"),
        _q("diameter", "D", "length", "cm", 3, (0.01, 50.0), (0.8, 16.0), "mm"),
        _q("mass in air", "m_a", "mass", "g", 3, POSITIVE, (0.1, 20000.0)),
        _q("mass immersed", "m_i", "mass", "g", 3, NOT_NEGATIVE, (0.0, 20000.0)),
        _q("mass displaced", "m_l", "mass", "g", 3, POSITIVE, (0.1, 50000.0)),
        _q("liquid density", "rho_l", "density", "g/cm3", 4, (0.2, 20.0), (0.6, 14.0)),
        _q("coating mass", "m_c", "mass", "g", 3, NOT_NEGATIVE, (0.0, 100.0)),
        _q("coating density", "rho_c", "density", "g/cm3", 3, (0.05, 20.0), (0.7, 2.5)),
        _q("mass", "m", "mass", "g", 3, POSITIVE, (0.5, 20000.0)),
        _q("container mass", "m_k", "mass", "g", 3, NOT_NEGATIVE, (0.0, 5000.0)),
        _q("saturant density", "rho_f", "density", "g/cm3", 4, (0.2, 3.0), (0.6, 1.3)),
        _q("salinity", "s", "salinity by mass", "g/kg", 1, (0.0, 400.0), (0.0, 300.0)),
        _q("salt density", "rho_salt", "density", "g/cm3", 3, (1.0, 6.0), (1.9, 2.5)),
        _q("known volume", "V_k", "volume", "cm3", 4, NOT_NEGATIVE, (0.0, 2000.0)),
        _q("reference pressure", "p_1", "pressure", "kPa", 3, POSITIVE, (150.0, 3000.0)),
        _q("expanded pressure", "p_2", "pressure", "kPa", 3, POSITIVE, (101.0, 2500.0)),
        _q("barometric pressure", "p_a", "absolute pressure", "kPa", 3, (40.0, 120.0), (60.0, 108.0)),
        _q("net confining stress", "sigma", "stress", "MPa", 2, (0.0, 500.0), (0.0, 150.0)),
        _q("confining pressure", "p_c", "pressure", "kPa", 0, POSITIVE, (500.0, 150000.0)),
        _q("billet volume", "V_b", "volume", "cm3", 4, NOT_NEGATIVE, (0.0, 1000.0)),
        _q("grain volume reading", "V_g", "volume", "cm3", 3, POSITIVE, (0.2, 5000.0)),
        _q("container volume", "V_k", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 500.0)),
        _q("upstream pressure", "p_u", "pressure", "kPa", 3, POSITIVE, (101.0, 7000.0)),
        _q("pressure difference", "dp", "stress", "kPa", 4, POSITIVE, (0.01, 7000.0)),
        _q("downstream pressure", "p_d", "pressure", "kPa", 3, POSITIVE, (80.0, 7000.0)),
        _q("flow rate", "q", "flow rate", "cm3/s", 5, POSITIVE, (1e-6, 500.0)),
        _q("flow pressure", "p_b", "pressure", "kPa", 3, POSITIVE, (80.0, 7000.0)),
        _q("standard pressure", "p_s", "absolute pressure", "kPa", 3, (50.0, 200.0), (95.0, 105.0)),
        _q("geometric factor", "E", "", "", 3, POSITIVE, (0.1, 20.0)),
        _q("mean pressure", "p_m", "absolute pressure", "kPa", 1, POSITIVE, (101.0, 20000.0)),
        _q("viscosity", "mu", "viscosity", "mPa.s", 4, POSITIVE, (0.1, 2000.0)),
        _q("water volume", "V_w", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 500.0)),
        _q("brine salinity", "s", "salinity by mass", "g/kg", 1, (0.0, 400.0), (0.0, 300.0)),
        _q("brine density", "rho_b", "density", "g/cm3", 4, (0.9, 1.6), (0.98, 1.25)),
        _q("oil density", "rho_o", "density", "g/cm3", 4, (0.3, 1.5), (0.6, 1.05)),
        _q("thimble mass", "m_t", "mass", "g", 3, NOT_NEGATIVE, (0.0, 500.0)),
        _q("sample mass", "m_s", "mass", "g", 3, POSITIVE, (1.0, 5000.0)),
        _q("sample bulk volume", "V_s", "volume", "cm3", 3, POSITIVE, (0.5, 2000.0)),
        _q("oil volume", "V_o", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 500.0)),
        _q("gas sample mass", "m_sg", "mass", "g", 3, POSITIVE, (1.0, 5000.0)),
        _q("gas sample bulk volume", "V_sg", "volume", "cm3", 3, POSITIVE, (0.5, 2000.0)),
        _q("gas volume", "V_gas", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 500.0)),
        _q("aperture", "d_s", "grain size", "mm", 4, (0.0, 4096.0), (0.0, 64.0)),
        _q("mass retained", "m_r", "mass", "g", 3, NOT_NEGATIVE, (0.0, 2000.0)),
        _q("gamma", "GR", "gamma", "gAPI", 1, NOT_NEGATIVE, (0.0, 500.0)),
        _q("repeatability", "s_r", "", "", 6, NOT_NEGATIVE),
        _q("scale uncertainty", "u_s", "", "", 6, NOT_NEGATIVE),
        _q("certified value", "c", "", "", 6),
        _q("certified uncertainty", "u_c", "", "", 6, NOT_NEGATIVE),
        _q("inertial coefficient", "beta", "inverse length", "1/m", 0, NOT_NEGATIVE),
    ]
)

#: Quantities that are computed, with the names and units under which they are reported.
RESULTS = _index(
    [
        _q("bulk volume", "V_b", "volume", "cm3", 3, POSITIVE, (0.5, 5000.0)),
        _q("grain volume", "V_g", "volume", "cm3", 3, POSITIVE, (0.3, 5000.0)),
        _q("pore volume", "V_p", "volume", "cm3", 3, NOT_NEGATIVE, (0.0, 2000.0)),
        _q("dry mass", "m_d", "mass", "g", 3, POSITIVE, (0.5, 20000.0)),
        _q("porosity", "phi", "fraction", "v/v", 4, (0.0, 1.0), (0.001, 0.476)),
        _q("grain density", "rho_g", "density", "g/cm3", 3, POSITIVE, (2.3, 3.3)),
        _q("bulk density", "rho_b", "density", "g/cm3", 3, POSITIVE, (1.0, 3.3)),
        _q("gas permeability", "k_g", "permeability", "mD", 4, POSITIVE, (1e-6, 50000.0)),
        _q("mean pressure", "p_m", "absolute pressure", "kPa", 1, POSITIVE),
        _q("klinkenberg permeability", "k_inf", "permeability", "mD", 4, POSITIVE, (1e-6, 50000.0)),
        _q("slip factor", "b", "absolute pressure", "kPa", 2, NOT_NEGATIVE, (0.1, 5000.0)),
        _q("liquid permeability", "k_l", "permeability", "mD", 4, POSITIVE, (1e-6, 50000.0)),
        _q("inertial coefficient", "beta", "inverse length", "1/m", 0, NOT_NEGATIVE),
        _q("pore volume compressibility", "c_p", "compressibility", "1/MPa", 6, POSITIVE, (1e-5, 0.1)),
        _q("permeability stress exponent", "a_k", "", "", 3),
        _q("pore volume stress exponent", "a_v", "", "", 3),
        _q("median grain size", "d_50", "grain size", "mm", 3, POSITIVE, (0.001, 64.0)),
        _q("mean grain size", "M_z", "grain size spread", "phi", 2, (-15.0, 15.0)),
        _q("sorting", "sigma_I", "grain size spread", "phi", 2, NOT_NEGATIVE, (0.1, 5.0)),
        _q("skewness", "Sk_I", "", "", 2, (-1.0, 1.0)),
        _q("kurtosis", "K_G", "", "", 2, NOT_NEGATIVE),
        _q("trask sorting", "S_o", "", "", 2, (1.0, INFINITY)),
        _q("oil saturation", "S_o", "fraction", "v/v", 3, (0.0, 1.0), (0.0, 1.0)),
        _q("water saturation", "S_w", "fraction", "v/v", 3, (0.0, 1.0), (0.0, 1.0)),
        _q("gas saturation", "S_g", "fraction", "v/v", 3, (0.0, 1.0), (0.0, 1.0)),
    ]
)
