"""The grain densities that a described rock may have: for a flag, never for a calculation.

Densities are in g/cm3. A range spans the minerals that usually make up the rock; words that name another
mineral (dolomitic, pyritic) widen it. A text without a known word has no range.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.formula import Array, not_negative

MARGIN_G_CM3 = 0.03
"""What impurities and measurement may add on both sides (common practice)."""


@dataclass(frozen=True, slots=True)
class Mineral:
    """The density of a mineral, or the range of it where its composition varies."""

    low_g_cm3: float
    high_g_cm3: float
    source: str


_HANDBOOK = "handbook value, from memory"
_CELL = "handbook value, from memory; agrees with the density of the unit cell to 0.005"

MINERALS = MappingProxyType(
    {
        "quartz": Mineral(2.65, 2.65, _CELL),
        "potassium feldspar": Mineral(2.56, 2.56, _HANDBOOK),
        "plagioclase": Mineral(2.62, 2.76, "albite and anorthite: " + _HANDBOOK),
        "calcite": Mineral(2.71, 2.71, _CELL),
        "dolomite": Mineral(2.87, 2.87, _CELL),
        "ankerite": Mineral(2.9, 3.1, _HANDBOOK),
        "siderite": Mineral(3.94, 3.94, _CELL),
        "anhydrite": Mineral(2.96, 2.96, _CELL),
        "gypsum": Mineral(2.32, 2.32, _HANDBOOK),
        "halite": Mineral(2.165, 2.165, _CELL),
        "pyrite": Mineral(5.01, 5.01, _CELL),
        "barite": Mineral(4.48, 4.48, _CELL),
        "kaolinite": Mineral(2.60, 2.60, _CELL),
        "illite": Mineral(2.6, 2.9, _HANDBOOK),
        "smectite": Mineral(2.6, 2.7, "dry; down to 2.1 with its water: " + _HANDBOOK),
        "chlorite": Mineral(2.6, 3.3, _HANDBOOK),
        "glauconite": Mineral(2.4, 2.95, _HANDBOOK),
        "mica": Mineral(2.82, 3.0, "muscovite and biotite: " + _HANDBOOK),
    }
)

_SAND = ("quartz", "potassium feldspar", "plagioclase")
_CLAY = ("quartz", "kaolinite", "illite", "smectite")
# What a rock may be made of in bulk (common practice).
_ROCKS: dict[str, tuple[str, ...]] = {
    "sand": _SAND,
    "sandstone": _SAND,
    "arkose": _SAND,
    "quartzite": ("quartz",),
    "chert": ("quartz",),
    "greywacke": (*_SAND, "illite"),
    "graywacke": (*_SAND, "illite"),
    "conglomerate": (*_SAND, "calcite", "dolomite"),
    "breccia": (*_SAND, "calcite", "dolomite"),
    "silt": (*_SAND, "illite"),
    "siltstone": (*_SAND, "illite"),
    "clay": _CLAY,
    "claystone": _CLAY,
    "mudstone": _CLAY,
    "shale": _CLAY,
    "marl": ("calcite", *_CLAY),
    "limestone": ("calcite",),
    "chalk": ("calcite",),
    "grainstone": ("calcite", "dolomite"),
    "packstone": ("calcite", "dolomite"),
    "wackestone": ("calcite", "dolomite"),
    "boundstone": ("calcite", "dolomite"),
    "carbonate": ("calcite", "dolomite"),
    "dolomite": ("dolomite",),
    "dolostone": ("dolomite",),
    "anhydrite": ("anhydrite",),
    "gypsum": ("gypsum",),
    "salt": ("halite",),
    "halite": ("halite",),
    "greensand": (*_SAND, "glauconite"),
    # abbreviations of the trade
    "sst": _SAND,
    "ss": _SAND,
    "cgl": (*_SAND, "calcite", "dolomite"),
    "slst": (*_SAND, "illite"),
    "clst": _CLAY,
    "sh": _CLAY,
    "ls": ("calcite",),
    "lst": ("calcite",),
    "dol": ("dolomite",),
    "anhy": ("anhydrite",),
}
# What a word says of the rock that it describes; alone it names no rock. Less than half of the grains, or the
# rock would bear the other name.
_ADDITIONS: dict[str, tuple[str, ...]] = {
    "sandy": _SAND,
    "silty": _SAND,
    "quartzose": ("quartz",),
    "siliceous": ("quartz",),
    "cherty": ("quartz",),
    "arkosic": _SAND,
    "feldspathic": _SAND,
    "argillaceous": _CLAY,
    "clayey": _CLAY,
    "shaly": _CLAY,
    "muddy": _CLAY,
    "marly": ("calcite", *_CLAY),
    "calcareous": ("calcite",),
    "limy": ("calcite",),
    "calcitic": ("calcite",),
    "chalky": ("calcite",),
    "shelly": ("calcite",),
    "fossiliferous": ("calcite",),
    "dolomitic": ("dolomite",),
    "dolomitised": ("dolomite",),
    "dolomitized": ("dolomite",),
    "anhydritic": ("anhydrite",),
    "gypsiferous": ("gypsum",),
    "salty": ("halite",),
    "halitic": ("halite",),
}
# Accessories: rarely more than a tenth of the grains (common practice).
_ACCESSORIES: dict[str, tuple[str, ...]] = {
    "kaolinitic": ("kaolinite",),
    "illitic": ("illite",),
    "chloritic": ("chlorite",),
    "glauconitic": ("glauconite",),
    "micaceous": ("mica",),
    "ankeritic": ("ankerite",),
    "sideritic": ("siderite",),
    "ferruginous": ("siderite",),
    "pyritic": ("pyrite",),
    "pyrite": ("pyrite",),
    "siderite": ("siderite",),
    "glauconite": ("glauconite",),
    "mica": ("mica",),
    "baritic": ("barite",),
}
_MOST = ((_ADDITIONS, 0.5), (_ACCESSORIES, 0.1))


@dataclass(frozen=True, slots=True)
class DensityRange:
    """The least and the greatest grain density a described rock may have; NaN where no word is known."""

    low_g_cm3: Array
    high_g_cm3: Array


def _range(text: str) -> tuple[float, float]:
    """Range of one description, without the margin."""
    known = {*_ROCKS, *_ADDITIONS, *_ACCESSORIES}
    words = [word for word in re.split(r"[^a-z]+", text.casefold()) if word]
    words = [word if word in known else word.removesuffix("s") for word in words]
    hosts = [MINERALS[mineral] for word in words for mineral in _ROCKS.get(word, ())]
    if not hosts:
        return float("nan"), float("nan")
    low = min(mineral.low_g_cm3 for mineral in hosts)
    high = max(mineral.high_g_cm3 for mineral in hosts)
    lower = higher = 0.0
    for table, most in _MOST:
        for mineral in (MINERALS[m] for word in words for m in table.get(word, ())):
            lower = min(lower, most * (mineral.low_g_cm3 - low))
            higher = max(higher, most * (mineral.high_g_cm3 - high))
    return low + lower, high + higher


def grain_density_range_g_cm3(lithology: ArrayLike, margin_g_cm3: float = MARGIN_G_CM3) -> DensityRange:
    """Range of grain density that a described rock may have.

    Parameters
    ----------
    lithology : text or array of texts
        Descriptions in free words: 'sandstone', 'limestone, dolomitic', 'claystone'.
    margin_g_cm3 : float
        What is added on both sides for impurities and measurement [g/cm3], 0 or more.

    Returns
    -------
    DensityRange
        Low and high [g/cm3], shape of the input. NaN for a text without a known rock: no range, no flag.

    Raises
    ------
    Impossible
        If the margin is negative or infinite.

    Notes
    -----
    From the lightest to the densest of the minerals that usually make up the rocks named. Each mineral named
    beside them widens the range as far as half of the grains would (dolomitic, argillaceous), or a tenth of
    an accessory (pyritic, glauconitic).

    References
    ----------
    Densities of minerals from handbooks (from memory), those marked checked against their unit cells; the
    composition of rocks is common practice.

    Examples
    --------
    >>> found = grain_density_range_g_cm3(["sandstone", "limestone, dolomitic", "grey"])
    >>> found.low_g_cm3.round(2).tolist(), found.high_g_cm3.round(2).tolist()
    ([2.53, 2.68, nan], [2.79, 2.82, nan])
    """
    margin = float(not_negative("margin_g_cm3", margin_g_cm3))
    texts = np.asarray(lithology, dtype=np.str_)
    unique, places = np.unique(texts, return_inverse=True)
    ranges = np.array([_range(text) for text in unique], dtype=np.float64).reshape(-1, 2)
    spread = ranges[places.reshape(texts.shape)]
    return DensityRange(np.asarray(spread[..., 0] - margin), np.asarray(spread[..., 1] + margin))
