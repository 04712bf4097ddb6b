"""The laboratory's settings: what each means, how it is typed, what is taken where none is set."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from corelab import units
from corelab.errors import Usage, did_you_mean, quoted


@dataclass(frozen=True, slots=True)
class Setting:
    """One setting.

    `kind` and `unit` for numbers (the value may be typed with another unit of its kind); `choices` for
    words; `moves_results` where stored results depend on it.
    """

    name: str
    note: str
    default: str = ""
    kind: str = ""
    unit: str = ""
    low: float = float("-inf")
    high: float = float("inf")
    choices: tuple[str, ...] = ()
    moves_results: bool = False


SETTINGS: Mapping[str, Setting] = MappingProxyType(
    {
        s.name: s
        for s in (
            Setting("laboratory name", "Name shown on what leaves the laboratory."),
            Setting("time zone", "Zone of the dates entered, such as Europe/Oslo.", "UTC"),
            Setting(
                "barometric pressure",
                "Taken where a row has no barometer; unset, 101.325 kPa is assumed and flagged.",
                kind="absolute pressure",
                unit="kPa",
                low=40.0,
                high=120.0,
                moves_results=True,
            ),
            Setting(
                "laboratory temperature",
                "Taken where a row has no temperature, and then flagged.",
                "20",
                kind="temperature",
                unit="degC",
                low=0.0,
                high=50.0,
                moves_results=True,
            ),
            Setting(
                "helium compressibility correction",
                "Whether pressures of gas expansions are corrected for helium's compressibility.",
                "off",
                choices=("off", "on"),
                moves_results=True,
            ),
            Setting(
                "cup temperature correction",
                "Whether grain volumes are corrected for a cup warmer than the reference chamber.",
                "off",
                choices=("off", "on"),
                moves_results=True,
            ),
            Setting(
                "reporting mean pressure",
                "The gas permeability step nearest to it is the one reported.",
                "200",
                kind="absolute pressure",
                unit="kPa",
                low=1.0,
                high=100000.0,
            ),
            Setting(
                "report units",
                "Units of the workbook and page, such as 'ft, psi, %'; else those of the result columns.",
            ),
            Setting("depth unit", "Unit of depths where a well does not say.", "m", choices=("m", "ft")),
            Setting(
                "porosity cut-off",
                "Least porosity of net rock.",
                "0.10",
                kind="fraction",
                unit="v/v",
                low=0.0,
                high=1.0,
            ),
            Setting(
                "permeability cut-off",
                "Least Klinkenberg permeability of net rock.",
                "1",
                kind="permeability",
                unit="mD",
                low=0.0,
                high=1e6,
            ),
            Setting(
                "water saturation cut-off",
                "Most water saturation of pay.",
                "0.5",
                kind="fraction",
                unit="v/v",
                low=0.0,
                high=1.0,
            ),
            Setting(
                "crush prior",
                "Share of percussion plugs taken to be crushed before any evidence; an assumption.",
                "0.3",
                kind="fraction",
                unit="v/v",
                low=0.01,
                high=0.99,
            ),
            Setting(
                "crush recalibration",
                "Correction of crush likelihoods learnt from verdicts of persons; see 'corelab recalibrate'.",
                "none",
            ),
        )
    }
)


#: How a recalibration is written: what is added to the log-odds, and by what the evidence is multiplied.
RECALIBRATION = r"intercept ([+-]?\d+\.?\d*), slope (\d+\.?\d*)"


def setting_named(name: str) -> Setting:
    wanted = " ".join(name.split()).casefold()
    if wanted not in SETTINGS:
        raise Usage(f"There is no setting {quoted(name)}; {did_you_mean(name, list(SETTINGS))}")
    return SETTINGS[wanted]


def checked(name: str, typed: str) -> str:
    """The value of a setting as it is stored: in its own unit, without it.

    Raises
    ------
    Usage
        If the value cannot be used, with what is wanted.
    """
    setting = setting_named(name)
    text = typed.strip()
    if not text:
        raise Usage(f"The setting '{setting.name}' needs a value.")
    if setting.choices:
        if text.casefold() not in setting.choices:
            raise Usage(f"'{setting.name}' takes one of: {', '.join(setting.choices)}; found {quoted(text)}.")
        return text.casefold()
    if setting.name == "crush recalibration":
        text = " ".join(text.casefold().split())
        if text != "none" and not re.fullmatch(RECALIBRATION, text):
            raise Usage(
                f"'{setting.name}' is 'none' or such as 'intercept -0.2, slope 0.8'; found {quoted(typed)}."
            )
        return text
    if setting.name == "time zone":
        from zoneinfo import ZoneInfo

        try:
            ZoneInfo(text)
        except (ValueError, OSError, KeyError) as wrong:
            raise Usage(
                f"{quoted(text)} is not a time zone; write one such as Europe/Oslo or UTC."
            ) from wrong
        return text
    if not setting.kind:
        return text
    match = re.fullmatch(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*)", text)
    if match is None:
        raise Usage(f"'{setting.name}' takes a number in {setting.unit}; found {quoted(text)}.")
    value, symbol = float(match[1]), match[2]
    stored = units.unit(setting.unit, setting.kind)
    if symbol:
        value = float(units.convert(value, units.unit(symbol, setting.kind), stored))
    if not setting.low <= value <= setting.high:
        raise Usage(
            f"'{setting.name}' must lie within {setting.low:g} to {setting.high:g} {setting.unit}; "
            f"found {value:g}."
        )
    return repr(value)


def value(stored: Mapping[str, str], name: str) -> str:
    """A setting in force, as text: what was set, else its default."""
    return stored.get(name, SETTINGS[name].default)


def shown(stored: Mapping[str, str], name: str) -> str:
    """A setting in force as it is shown: without the last bits of a conversion."""
    text = value(stored, name)
    return f"{float(text):.8g}" if SETTINGS[name].kind and text else text


def number(stored: Mapping[str, str], name: str) -> float:
    """A numeric setting in force; NaN where it is neither set nor has a default."""
    text = value(stored, name)
    return float(text) if text else float("nan")
