"""Plugs into the SPWLA core-data exchange format: one sample a plug, in the columns that readers expect.

A value stands in twelve columns, with as many digits as these hold: at least seven. Codes are those of
`spwla_in`'s sources where we know one, else 0 with the words beside. Depths are in the unit that the second
line of record 10 names. The flags of a plug stand with its description.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import Any

import pandas as pd

from corelab import units
from corelab.errors import Unavailable
from corelab.formats.spwla_in import FACTS, FLAGS, MARGIN, WIDTH
from corelab.formats.tables_out import write_bytes
from corelab.formats.well_heading import WellHeading, one_line
from corelab.quantities import RESULTS

NULL = "-1002.00000"
_RECORD = 127
_LONGEST = 200  # characters of a line of words
_ORIENTED = {"horizontal": ", Hor.", "vertical": ", Vert.", "oblique": ", Obl."}
#: quantity, orientation, and gas or route -> code, as files show it.
_CODES = {
    ("gas permeability", "horizontal", "nitrogen"): 1507,
    ("klinkenberg permeability", "horizontal", ""): 1512,
    ("gas permeability", "vertical", "nitrogen"): 1510,
    ("klinkenberg permeability", "vertical", ""): 1515,
    ("porosity", "horizontal", ""): 1402,
    ("porosity", "vertical", ""): 1403,
    ("oil saturation", "", ""): 1302,
    ("water saturation", "", ""): 1301,
    ("grain density", "horizontal", ""): 2451,
}
_UNITS = {"porosity": ("%", 3084), "permeability": ("mD", 2031), "saturation": ("%", 3085)}
_FACTS = ("laboratory", "source", "depth basis", "orientation", "facies")
_STRESSES = {"porosity stress": "porosity", "permeability stress": "permeability"}
_NUMBERS = (*RESULTS, *_STRESSES)


@dataclass(frozen=True, slots=True)
class _Meaning:
    """One value of a sample: the column of the frame, for the plugs of one laboratory and orientation."""

    column: str
    name: str
    laboratory: str
    orientation: str
    variant: str

    @property
    def unit(self) -> tuple[str, int]:
        """The unit in which it is written, and that one's code."""
        if self.name == "grain density":
            return "g/cm3", 1086
        return _UNITS.get(self.name.split()[-1], (_stored_unit(self.name), 0))

    @property
    def words(self) -> str:
        symbol, code = self.unit
        name = f"net confining stress of {_STRESSES[self.name]}" if self.name in _STRESSES else self.name
        if self.name == "gas permeability" and self.variant:
            name = f"{self.variant} permeability"
        elif self.variant:
            name += f", {self.variant}"
        stated = "" if code else f" ({symbol})"
        return f"{name[0].upper()}{name[1:]}{_ORIENTED.get(self.orientation, '')}{stated}"


def _stored_unit(name: str) -> str:
    return "MPa" if name in _STRESSES else RESULTS[name].unit


def write_spwla(path: Path, frame: pd.DataFrame, heading: WellHeading) -> None:
    """Write an interval's plugs; those without a depth are left out.

    Raises
    ------
    Unavailable
        If there is no plug with a depth.
    """
    depth = next(c for c in frame.columns if c.startswith("depth ["))
    there = frame[frame[depth].notna()]
    if not len(there):
        raise Unavailable(f"{heading.well} has no plug with a depth to write.")
    unit = depth.partition(" [")[2].rstrip("]")
    meanings = _meanings(there)
    laboratory = heading.laboratory or "laboratory not stated"
    lines = [
        *_record(10, [
            f"{one_line(heading.well):<38}  {one_line(heading.country):<38}  {heading.date}",
            f"{one_line(laboratory):<38}  depths in {unit}",
        ]),
        *_record(15, [_meaning_line(m) for m in meanings], len(meanings), margin=0),
    ]  # fmt: skip
    if heading.runs_m:
        metre, target = units.unit("m", "length"), units.unit(unit, "length")
        lines += _record(
            20,
            [
                " ".join(["    0.00", "    0.00", *(f"{units.convert(z, metre, target):8.2f}" for z in run)])
                + f" {0:4.1f} {n:2d}"
                for n, run in enumerate(heading.runs_m, 1)
            ],
        )
    columns = {m.column: there[m.column].tolist() for m in meanings}
    facts = there.to_dict("records")
    for i, plug in enumerate(facts):
        place = _fitted(plug[depth])
        lines += _record(30, [f"{place:>12} {0:8.2f}   {one_line(plug['plug'])}"], margin=0)
        if words := list(_words(plug)):
            lines += _record(36, words, len(words))
        key = _key(plug)
        cells = [
            _cell(columns[m.column][i], m) if (m.laboratory, m.orientation) == key and _is(m, plug) else NULL
            for m in meanings
        ]
        lines += _record(40, ["".join(f"{cell:>{WIDTH}}" for cell in cells)], len(meanings))
    write_bytes(path, ("\n".join(lines) + "\n").encode("utf-8"))


def _record(kind: int, body: Sequence[str], values: int | None = None, margin: int = MARGIN) -> list[str]:
    opening = f"{kind:<2}{len(body):>6}" + ("" if values is None else f"{values:>5}")
    return [f"{opening:<{_RECORD}}", *(" " * margin + line for line in body)]


def _key(plug: Mapping[Any, Any]) -> tuple[str, str]:
    return str(plug.get("laboratory") or ""), str(plug.get("orientation") or "")


def _variant(name: str, plug: Mapping[Any, Any]) -> str:
    if name == "gas permeability":
        return str(plug.get("gas") or "")
    return str(plug.get("porosity route") or "") if name == "porosity" else ""


def _is(meaning: _Meaning, plug: Mapping[Any, Any]) -> bool:
    return meaning.variant == _variant(meaning.name, plug)


def _meanings(frame: pd.DataFrame) -> list[_Meaning]:
    """What is filled, by quantity as in an interval, horizontal before vertical, laboratory by laboratory."""
    found: dict[_Meaning, None] = {}
    for column in frame.columns:
        name = column.partition(" [")[0]
        if name not in _NUMBERS:
            continue
        for plug in frame[frame[column].notna()].to_dict("records"):
            found[_Meaning(column, name, *_key(plug), _variant(name, plug))] = None
    order = {c: i for i, c in enumerate(frame.columns)}
    return sorted(found, key=lambda m: (m.laboratory, m.orientation or "~", order[m.column], m.variant))


def _meaning_line(meaning: _Meaning) -> str:
    variant = meaning.variant if meaning.name == "gas permeability" else ""
    orientation = "" if meaning.name.endswith("saturation") else meaning.orientation
    code = _CODES.get((meaning.name, orientation, variant), 0)
    if meaning.variant == "summation of fluids":
        code = 1401
    laboratory = one_line(meaning.laboratory) or "not stated"
    gap = f"{laboratory:<20}" if len(laboratory) <= 20 else f"{laboratory}  "
    return f"{code:>14}{0:>10}{meaning.unit[1]:>6}{0:>4}{gap}{meaning.words}"


def _words(plug: Mapping[Any, Any]) -> Iterator[str]:
    if lithology := one_line(plug.get("lithology") or ""):
        yield lithology
    known = {k: one_line(plug.get(k) or "").replace(";", ",") for k in _FACTS}
    if told := "; ".join(f"{k} {text}" for k, text in known.items() if text):
        yield FACTS + told
    line = ""
    for flag in str(plug.get("flags") or "").split("; "):
        text = one_line(flag)
        if line and len(line) + len(text) > _LONGEST:
            yield FLAGS + line
            line = ""
        line = f"{line}; {text}" if line else text
    if line:
        yield FLAGS + line


def _cell(value: float, meaning: _Meaning) -> str:
    if math.isnan(value):
        return NULL
    own, target = meaning.column.partition(" [")[2].rstrip("]"), meaning.unit[0]
    if own == "v/v" and target == "%":
        return _fitted(float(Decimal(repr(float(value))).scaleb(2)))
    if own == target:
        return _fitted(value)
    kind = "stress" if meaning.name in _STRESSES else RESULTS[meaning.name].kind
    return _fitted(float(units.convert(value, units.unit(own, kind), units.unit(target, kind))))


def _fitted(value: float) -> str:
    """A number in eleven characters, as near as these allow."""
    value = float(value)
    room = WIDTH - 1
    exact = repr(value)
    if len(exact) <= room and "e" not in exact:
        return exact
    tried = [f"{value:.{digits}f}" for digits in range(room - 1)]
    tried += [f"{value:.{digits}e}" for digits in range(room - 5)]
    fitting = [text for text in tried if len(text) <= room]
    return min(fitting, key=lambda text: (abs(float(text) - value), len(text)))
