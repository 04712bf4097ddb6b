"""The readings in force of a tray of plugs, as arrays for the reduction."""

from __future__ import annotations

import hashlib
from collections import defaultdict
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab.bench import settings as lab_settings
from corelab.control.instruments import Register
from corelab.records import store

Numbers = NDArray[Any]  # float64; complex where a derivative is taken by a complex step
Whole = NDArray[np.intp]
Texts = NDArray[np.object_]

#: The kinds whose entries may enter the results of a plug.
KINDS = (
    "plugs",
    "not measured",
    "dimensions",
    "immersion",
    "masses",
    "grain volume",
    "pore volume",
    "gas permeability",
    "reported permeability",
    "liquid permeability",
    "distillation",
    "retort",
    "sieve",
    "descriptions",
)
#: Those of them that rest on the calibration of a porosimeter, with its setup.
EXPANSIONS = {"grain volume": "cup", "pore volume": "holder"}


@dataclass(slots=True)
class Readings:
    """Rows of one kind in force, an array a field: `at` is the place of each row's plug in the tray."""

    at: Whole
    numbers: dict[str, Numbers]  # NaN where nothing was read
    texts: dict[str, Texts]  # empty where nothing stands

    @classmethod
    def of(cls, frame: pd.DataFrame, at: Whole) -> Readings:
        numbers: dict[str, Numbers] = {}
        texts: dict[str, Texts] = {}
        for name, column in frame.items():
            if column.dtype == object:
                texts[str(name)] = np.array(["" if v is None else v for v in column], dtype=object)
            else:
                numbers[str(name)] = column.to_numpy(dtype=np.float64)
        return cls(at, numbers, texts)

    def __len__(self) -> int:
        return len(self.at)

    def number(self, name: str) -> Numbers:
        return self.numbers[name].copy()

    def text(self, name: str) -> Texts:
        return self.texts[name].copy()


@dataclass(frozen=True, slots=True)
class CalibrationRows:
    """The rows of one calibration of one instrument and setup."""

    instrument_id: int
    setup: str
    name: str
    date: str
    readings: Readings
    number: int = 0  # its own within the tray
    offset: tuple[complex, complex] = (0.0, 0.0)  # added to the volumes found, to take derivatives


@dataclass(slots=True)
class Tray:
    """All that the results of some plugs depend on.

    The steps are zero but where a derivative is taken: they are added to what is assumed rather than read.
    """

    plug_ids: Whole
    readings: dict[str, Readings]
    calibrations: dict[tuple[int, str], list[CalibrationRows]]
    barometer_kpa: float
    temperature_degc: float
    register: Register
    fingerprints: list[str] = field(default_factory=list)
    barometer_step: complex = 0.0
    temperature_step: complex = 0.0
    slip_step: complex = 0.0
    #: Corrections that are made only when the laboratory asks for them.
    helium_correction: bool = False
    cup_correction: bool = False
    #: The calibrations in force, found when first asked for.
    in_force: dict[str, list[int | str]] = field(default_factory=dict)
    #: What the reduction finds once and the passes that take derivatives share: groups, labels.
    found: dict[str, Any] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.plug_ids)

    def choices(self, kind: str) -> list[int | str]:
        """For each row of an expansion: the number of the calibration in force, or why none is."""
        if kind not in self.in_force:
            self.in_force[kind] = _choices(self, kind, EXPANSIONS[kind])
        return self.in_force[kind]

    def calibration(self, number: int) -> CalibrationRows:
        by_number = self.found.get("by number")
        if by_number is None or by_number[0] is not self.calibrations:
            numbered = {c.number: c for found in self.calibrations.values() for c in found}
            by_number = self.calibrations, numbered
            self.found["by number"] = by_number
        found: CalibrationRows = by_number[1][number]
        return found

    def calibration_users(self) -> dict[int, set[int]]:
        """The calibrations in force for any reading, with the places of the plugs that rest on them."""
        users: dict[int, set[int]] = {}
        for kind in EXPANSIONS:
            for place, choice in zip(self.readings[kind].at.tolist(), self.choices(kind), strict=True):
                if isinstance(choice, int):
                    users.setdefault(choice, set()).add(place)
        return users


def gather(connection: sa.Connection, plug_ids: Collection[int], stored: Mapping[str, str]) -> Tray:
    """Read what the results of `plug_ids` depend on."""
    ids = np.array(sorted(plug_ids), dtype=np.intp)
    readings: dict[str, Readings] = {}
    for kind in KINDS:
        frame = store.in_force(connection, kind, ids.tolist())
        readings[kind] = Readings.of(frame, np.searchsorted(ids, frame["plug_id"].to_numpy(dtype=np.intp)))
    instruments = {int(i) for kind in EXPANSIONS for i in readings[kind].number("instrument_id")}
    rows = store.in_force(connection, "porosimeter calibration", instruments, by="instrument_id")
    calibrations = _calibrations(rows)
    tray = Tray(
        ids,
        readings,
        calibrations,
        lab_settings.number(stored, "barometric pressure"),
        lab_settings.number(stored, "laboratory temperature"),
        Register.read(connection),
        helium_correction=lab_settings.value(stored, "helium compressibility correction") == "on",
        cup_correction=lab_settings.value(stored, "cup temperature correction") == "on",
    )
    tray.fingerprints = _fingerprints(tray, stored)
    return tray


def _calibrations(rows: pd.DataFrame) -> dict[tuple[int, str], list[CalibrationRows]]:
    """Rows of one instrument and setup with one label, or one date, are one calibration."""
    found: dict[tuple[int, str], list[CalibrationRows]] = defaultdict(list)
    if not len(rows):
        return found
    labels = [c or "" for c in rows["calibration"]]
    days = [(d or "")[:10] for d in rows["measured_on"]]
    together = [f"label {a.casefold()}" if a else f"day {d}" for a, d in zip(labels, days, strict=True)]
    together_by = rows.groupby(
        [rows["instrument_id"], rows["setup"], pd.Series(together, index=rows.index)], sort=True
    )
    for number, (_, group) in enumerate(together_by):
        dates = [d for d in group["measured_on"] if d]
        label = next((c for c in group["calibration"] if c), "")
        date = max(dates) if dates else ""
        key = (int(group["instrument_id"].iloc[0]), str(group["setup"].iloc[0]))
        name = label or date or "undated"
        readings = Readings.of(group, np.zeros(len(group), dtype=np.intp))
        found[key].append(CalibrationRows(*key, name, date, readings, number))
    return found


def _choices(tray: Tray, kind: str, setup: str) -> list[int | str]:
    """For each row: the number of the calibration in force, why none is, or nothing where none is needed."""
    readings = tray.readings[kind]
    instruments = readings.number("instrument_id").astype(np.intp).tolist()
    needed = ~np.isnan(readings.number("expanded_pressure_kpa"))
    found: dict[tuple[int, str], int | str] = {}
    choices: list[int | str] = []
    for instrument, date, wanted in zip(instruments, readings.texts["measured_on"], needed, strict=True):
        if wanted and (instrument, date) not in found:
            choice = in_force(tray.calibrations.get((instrument, setup), []), date)
            found[instrument, date] = choice if isinstance(choice, str) else choice.number
        choices.append(found[instrument, date] if wanted else "")
    return choices


def in_force(candidates: Sequence[CalibrationRows], date: str) -> CalibrationRows | str:
    """The calibration that serves a reading of `date`, or why none does.

    The newest dated on or before the reading; a single undated one serves all; two that could serve are
    refused as ambiguous. For an undated reading only a single calibration can be told to serve.
    """
    undated = [c for c in candidates if not c.date]
    if not candidates:
        return "no calibration of the instrument is recorded"
    if not date:
        able = list(candidates)
    else:
        before = [c for c in candidates if c.date and _on_or_before(c.date, date)]
        newest = max((c.date for c in before), default="")
        # A reading without a time of day may have been taken before or after each calibration of that day.
        same = 10 if len(date) == 10 and newest[:10] == date else None
        able = [c for c in before if c.date[:same] == newest[:same]] + undated
        if not able:
            first = min(c.date for c in candidates)
            return f"the reading of {date} is older than the first calibration ({first})"
    if len(able) == 1:
        return able[0]
    names = ", ".join(f"'{c.name}'" for c in able)
    when = "the reading has no date" if not date else "date or withdraw one of them"
    return f"ambiguous: {len(able)} calibrations could serve ({names}); {when}"


def _on_or_before(calibration: str, reading: str) -> bool:
    if len(calibration) == 10 or len(reading) == 10:
        return calibration[:10] <= reading[:10]
    return calibration <= reading


def _instruments(tray: Tray) -> list[set[int]]:
    """For each plug, the instruments that read it."""
    used: list[set[int]] = [set() for _ in range(len(tray))]
    for readings in tray.readings.values():
        for name in ("instrument_id", "balance_id", "caliper_id", "permeameter_id"):
            if name in readings.numbers:
                for place, number in zip(readings.at.tolist(), readings.numbers[name].tolist(), strict=True):
                    if number == number:
                        used[place].add(int(number))
    return used


def _fingerprints(tray: Tray, stored: Mapping[str, str]) -> list[str]:
    """For each plug, a digest of all entries and settings on which its results may depend."""
    digests: list[list[str]] = [[] for _ in range(len(tray))]
    for kind in KINDS:
        readings = tray.readings[kind]
        for place, digest in zip(readings.at, readings.text("digest"), strict=True):
            digests[place].append(digest)
    of_instrument: dict[int, list[str]] = defaultdict(list)
    for (instrument, _), calibrations in sorted(tray.calibrations.items()):
        for calibration in calibrations:
            of_instrument[instrument] += calibration.readings.text("digest").tolist()
    for kind in EXPANSIONS:
        readings = tray.readings[kind]
        used = set(zip(readings.at.tolist(), readings.number("instrument_id").tolist(), strict=True))
        for place, instrument in used:
            digests[place] += of_instrument[int(instrument)]
    for place, instruments in enumerate(_instruments(tray)):
        digests[place] += [tray.register.digest_text(number) for number in sorted(instruments)]
    moving = [s.name for s in lab_settings.SETTINGS.values() if s.moves_results]
    common = [f"{name}={lab_settings.value(stored, name)}" for name in moving]
    return [hashlib.sha256("\n".join([*sorted(own), *common]).encode()).hexdigest() for own in digests]
