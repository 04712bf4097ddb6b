"""How well each reading is known: from the register of instruments, else from documented defaults."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab import units
from corelab.quantities import field_name
from corelab.records import store
from corelab.science.uncertainty import DEFAULTS, SHARE
from corelab.sheets import SHEETS

Floats = NDArray[np.float64]
#: An instrument and what it measures; number 0 stands for an instrument without a name.
Node = tuple[int, str]

_UNIT_KIND = {
    "mass": "mass",
    "length": "length",
    "pressure": "stress",
    "flow rate": "flow rate",
    "volume": "volume",
}


@dataclass(frozen=True, slots=True)
class Stated:
    """What is taken for one instrument and measure: standard uncertainties in `unit` or as a share."""

    repeatability: float
    scale: float
    unit: str
    source: str
    registered: bool

    def of(self, readings: Floats, measure: str, stored_unit: str) -> tuple[Floats, Floats]:
        """Repeatability and scale uncertainty of readings, in their stored unit."""
        if self.unit == SHARE:
            size = np.abs(readings) / 100.0
        else:
            size = np.where(np.isnan(readings), np.nan, _factor(self.unit, measure, stored_unit))
        if measure == "billet":  # no billet, no error
            size = np.where(readings == 0.0, 0.0, size)
        return self.repeatability * size, self.scale * size


def _factor(unit: str, measure: str, stored_unit: str) -> float:
    """What one `unit` is in the stored unit: uncertainties are scaled, never offset."""
    if measure == "temperature":
        return 5.0 / 9.0 if unit == "degF" else 1.0
    kind = _UNIT_KIND.get(measure)
    if kind is None or unit == stored_unit:
        return 1.0
    table = units.UNITS[kind] if unit in units.UNITS[kind] else units.UNITS["pressure"]
    return table[unit].factor / table[stored_unit].factor


@dataclass(frozen=True, slots=True)
class Reading:
    """A numeric field of a bench sheet that an instrument reads.

    `instrument` is the field that names it (empty: none does), `measure` what it measures, or the key of a
    default that stands for it.
    """

    kind: str
    field: str
    instrument: str
    measure: str
    unit: str

    @property
    def title(self) -> str:
        sheet = SHEETS[self.kind]
        found = (
            c.name
            for c in sheet.columns
            if self.field in c.fields or self.field == field_name(c.name, c.unit)
        )
        return next(found, self.field)


@dataclass(frozen=True, slots=True)
class Calibration:
    """A calibration of what an instrument measures: the day it was made and the day it runs out, if known."""

    instrument_id: int
    measures: str
    made_on: str
    due_on: str


def calibrations(connection: sa.Connection) -> list[Calibration]:
    """Every calibration that the register of instruments holds or held.

    An earlier row with the same day of calibration was a mistake that was corrected; one with another day
    was a calibration of its own. Instruments whose rows were withdrawn altogether are left out.
    """
    now = store.in_force(connection, "instruments")
    kept = {(int(i), m) for i, m in zip(now["instrument_id"], now["measures"], strict=True)}
    found: dict[tuple[int, str, str], Calibration] = {}
    for frame in (store.in_force(connection, "instruments", superseded=True), now):
        for row in store.rows_of(frame):
            number, measures = int(row["instrument_id"]), str(row["measures"])
            made_on, due_on = ((row[c] or "")[:10] for c in ("calibrated_on", "due_on"))
            if (number, measures) in kept and (made_on or frame is now):
                found[number, measures, made_on] = Calibration(number, measures, made_on, due_on)
    return list(found.values())


def _read(kind: str, instrument: str, measure: str, *names: str) -> list[Reading]:
    sheet = SHEETS[kind]
    made = []
    for name in names:
        column = sheet.column(name)
        made += [Reading(kind, field, instrument, measure, column.unit) for field in column.fields]
    return made


#: Every reading with an uncertainty of its own, in the order in which budgets name them.
READINGS: tuple[Reading, ...] = (
    *_read("plugs", "", "mass", "jacket mass"),
    *_read("plugs", "", "volume", "jacket volume"),
    *_read("plugs", "", "length", "screen thickness"),
    *_read("dimensions", "caliper_id", "length", "length", "diameter"),
    *_read(
        "immersion", "balance_id", "mass", "mass in air", "mass immersed", "mass displaced", "coating mass"
    ),
    *_read("immersion", "", "density", "liquid density", "coating density"),
    *_read("immersion", "", "temperature", "temperature"),
    *_read("masses", "balance_id", "mass", "mass", "container mass"),
    *_read("masses", "", "density", "saturant density"),
    *_read("masses", "", "salinity", "salinity"),
    *_read("grain volume", "instrument_id", "pressure", "reference pressure", "expanded pressure"),
    *_read("grain volume", "", "barometer read", "barometric pressure"),
    *_read("grain volume", "", "billet", "billet volume"),
    *_read("grain volume", "instrument_id", "reported grain volume", "grain volume"),
    *_read("grain volume", "", "volume", "container volume"),
    *_read("pore volume", "instrument_id", "pressure", "reference pressure", "expanded pressure"),
    *_read("pore volume", "", "barometer read", "barometric pressure"),
    *_read(
        "gas permeability",
        "permeameter_id",
        "pressure",
        "upstream pressure",
        "pressure difference",
        "downstream pressure",
        "flow pressure",
    ),
    *_read("gas permeability", "permeameter_id", "flow rate", "flow rate"),
    *_read("gas permeability", "", "barometer read", "barometric pressure"),
    *_read("gas permeability", "permeameter_id", "temperature", "temperature", "flow temperature"),
    *_read(
        "reported permeability",
        "permeameter_id",
        "reported permeability",
        "klinkenberg permeability",
        "gas permeability",
        "slip factor",
    ),
    *_read("liquid permeability", "", "pressure", "upstream pressure", "downstream pressure"),
    *_read("liquid permeability", "", "flow rate", "flow rate"),
    *_read("liquid permeability", "", "viscosity", "viscosity"),
    *_read("distillation", "", "volume", "water volume"),
    *_read("distillation", "", "temperature", "trap temperature"),
    *_read("distillation", "", "salinity", "brine salinity"),
    *_read("distillation", "", "density", "brine density", "oil density"),
    *_read("distillation", "", "mass", "thimble mass"),
    *_read("retort", "", "mass", "sample mass", "gas sample mass"),
    *_read("retort", "", "bulk volume", "sample bulk volume", "gas sample bulk volume"),
    *_read("retort", "", "retort water", "water volume"),
    *_read("retort", "", "retort oil", "oil volume"),
    *_read("retort", "", "volume", "gas volume"),
    *_read("sieve", "", "mass", "mass retained"),
)
CALIBRATION_READINGS: tuple[Reading, ...] = (
    *_read("porosimeter calibration", "", "billet", "known volume"),
    *_read("porosimeter calibration", "instrument_id", "pressure", "reference pressure", "expanded pressure"),
    *_read("porosimeter calibration", "", "barometer read", "barometric pressure"),
)

_OWN_DEFAULTS: Mapping[str, Stated] = MappingProxyType(
    {
        "temperature": Stated(0.1, 0.2, "K", "calibrated laboratory thermometer: common practice", False),
        "barometer read": Stated(0.02, 0.05, "kPa", "calibrated barometer: common practice", False),
        "billet": Stated(0.0, 0.002, "cm3", "billets certified to a few mm3: common practice", False),
        "salinity": Stated(0.0, 1.0, SHARE, "brine made up or analysed to 1 %: common practice", False),
        "viscosity": Stated(0.0, 1.0, SHARE, "tabulated or measured to 1 %: common practice", False),
        "bulk volume": Stated(0.5, 0.2, SHARE, "a piece measured by displacement: common practice", False),
        "retort water": Stated(
            2.5, 0.0, SHARE, "2.5 % of the volume measured: API RP 40, 2nd ed. 1998 (from memory)", False
        ),
        "retort oil": Stated(
            5.0, 0.0, SHARE, "5 % of the volume measured: API RP 40, 2nd ed. 1998 (from memory)", False
        ),
    }
)


def default(measure: str) -> Stated:
    """What is taken where no instrument states anything."""
    if measure in _OWN_DEFAULTS:
        return _OWN_DEFAULTS[measure]
    record = DEFAULTS[measure]
    return Stated(record.repeatability, record.scale, record.unit, record.source, False)


BY_FIELD: Mapping[tuple[str, str], Reading] = MappingProxyType({(r.kind, r.field): r for r in READINGS})

#: A value that an instrument reports as a result rests on its own register row of this measure, if any.
_REGISTERED_AS = {"reported grain volume": "volume"}


class Register:
    """The instruments of the lab with what they state; asked once for each tray."""

    def __init__(self, rows: Mapping[Node, Stated], names: Mapping[int, str]) -> None:
        self.rows = rows
        self.names = names

    @classmethod
    def read(cls, connection: sa.Connection, identities: store.Identities | None = None) -> Register:
        rows: dict[Node, Stated] = {}
        for row in store.rows_of(store.in_force(connection, "instruments")):
            scale: Any = row["scale_uncertainty"]
            rows[int(row["instrument_id"]), row["measures"]] = Stated(
                float(row["repeatability"]),
                0.0 if scale is None or scale != scale else float(scale),
                row["uncertainty_unit"],
                "register of instruments",
                True,
            )
        known = identities or store.Identities.read(connection)
        return cls(rows, known.names["instrument"])

    def stated(self, instrument: int, measure: str) -> Stated:
        registered = self.rows.get((instrument, _REGISTERED_AS.get(measure, measure)))
        return registered if registered is not None else default(measure)

    def rests_on_default(self, instrument: int, measure: str) -> bool:
        """Whether an instrument states nothing of what it measures.

        What a registered instrument shows beside it (the temperature of its gas) needs no row of its own.
        """
        if measure == "temperature" and any(number == instrument for number, _ in self.rows):
            return False
        return not self.stated(instrument, measure).registered

    def amounts(
        self, reading: Reading, values: Floats, instruments: NDArray[np.intp]
    ) -> tuple[Floats, Floats]:
        """Repeatability and scale uncertainty of readings by these instruments, in the stored unit."""
        random, shared = np.full(values.shape, np.nan), np.full(values.shape, np.nan)
        for number in np.unique(instruments):
            here = instruments == number
            stated = self.stated(int(number), reading.measure)
            random[here], shared[here] = stated.of(values[here], reading.measure, reading.unit)
        return random, shared

    def name(self, instrument: int) -> str:
        return self.names.get(instrument, "an instrument without a name")

    def digest_text(self, instrument: int) -> str:
        """What this instrument states, for the fingerprint of results that rest on it."""
        return "; ".join(
            f"{measure} {s.repeatability!r} {s.scale!r} {s.unit}"
            for (number, measure), s in sorted(self.rows.items())
            if number == instrument
        )
