"""What a partner is entitled to: which wells, which columns, in which units."""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab import units
from corelab.errors import Problem, Refused, Usage, did_you_mean, quoted
from corelab.interval import where
from corelab.interval.select import COLUMNS, TEXT_COLUMNS
from corelab.quantities import RESULTS
from corelab.records import schema, store

#: Columns without which no other can be read: everyone receives them.
ALWAYS = (
    "well", "plug", "source", "laboratory", "run", "depth", "depth basis", "log depth", "orientation",
    "status", "flags",
)  # fmt: skip
CHOOSABLE = tuple(where.bare(c) for c in COLUMNS if where.bare(c) not in ALWAYS)
#: The bench sheets from whose readings results come: a partner who is not entitled to a result receives
#: none of its readings either.
_SHEETS_OF = {
    **dict.fromkeys(
        (
            "bulk volume",
            "grain volume",
            "pore volume",
            "dry mass",
            "porosity",
            "grain density",
            "bulk density",
        ),
        ("dimensions", "immersion", "masses", "grain volume", "pore volume"),
    ),
    **dict.fromkeys(
        ("gas permeability", "klinkenberg permeability", "slip factor", "mean pressure"),
        ("gas permeability", "reported permeability", "liquid permeability"),
    ),
    **dict.fromkeys(
        ("oil saturation", "water saturation", "gas saturation"), ("distillation", "retort", "masses")
    ),
    "lithology": ("descriptions",),
}
_STRESSES = {"porosity stress", "permeability stress"}
_DEPTHS = {"depth", "log depth"}


@dataclass(frozen=True, slots=True)
class Partner:
    """A partner as registered; empty `wells` or `columns` mean all of them."""

    name: str
    wells: tuple[str, ...] = ()
    columns: tuple[str, ...] = ()
    units: tuple[str, ...] = ()

    @property
    def depth_unit(self) -> str:
        return next((u for u in self.units if u in {"m", "ft"}), "")

    def sheets(self) -> set[str] | None:
        """The bench sheets whose readings this partner may see; None for all."""
        if not self.columns:
            return None
        return {sheet for c in self.columns for sheet in _SHEETS_OF.get(c, ())}


def partners(connection: sa.Connection) -> dict[str, Partner]:
    """The registered partners by the key of their names, as they are now."""
    table = schema.partner
    rows = connection.execute(sa.select(table).order_by(table.c.id)).mappings()
    return {
        store.name_key(r["name"]): Partner(
            r["name"], *(tuple(json.loads(r[c])) for c in ("wells", "columns", "units"))
        )
        for r in rows
    }


def checked_columns(names: Sequence[str]) -> tuple[str, ...]:
    """Names of result columns as they are kept.

    Raises
    ------
    Usage
        For a name that is no column.
    """
    found = []
    for name in names:
        wanted = where.bare(" ".join(name.split())).casefold()
        if wanted in ALWAYS:
            continue
        if wanted not in CHOOSABLE:
            raise Usage(f"There is no result column {quoted(name)}; {did_you_mean(name, CHOOSABLE)}")
        found.append(wanted)
    return tuple(dict.fromkeys(found))


def checked_units(text: str) -> tuple[str, ...]:
    """Units as they are kept: `ft, psi, %`; one for each kind of quantity.

    Raises
    ------
    Usage
        For what is no unit of any result.
    """
    made: list[str] = []
    for typed in re.split(r"[,;\s]+", text.strip()):
        if not typed:
            continue
        symbols = {s for kind in _KINDS for s in units.UNITS[kind]}
        if typed not in symbols:
            raise Usage(f"{quoted(typed)} is not a unit of a result; take of: {', '.join(sorted(symbols))}.")
        made.append(typed)
    for kind in _KINDS:
        same = [s for s in made if s in units.UNITS[kind]]
        if len(same) > 1 and not set(same) <= {"psi", "psia", "psig"}:
            raise Usage(f"Only one unit of {kind} can be shown; found {', '.join(same)}.")
    return tuple(dict.fromkeys(made))


_KINDS = ("length", "volume", "mass", "density", "absolute pressure", "stress", "permeability", "fraction")


def _kind(name: str) -> str:
    if name in _DEPTHS:
        return "length"
    if name in _STRESSES:
        return "stress"
    return RESULTS[name].kind if name in RESULTS else ""


def _target(kind: str, symbols: Sequence[str]) -> str:
    chosen = next((s for s in symbols if s in units.UNITS[kind]), "")
    if not chosen and kind == "absolute pressure" and "psi" in symbols:
        return "psia"
    return chosen


def in_units(frame: pd.DataFrame, symbols: Sequence[str]) -> pd.DataFrame:
    """The same results in other units; depths must be in theirs already. Standard uncertainties scale."""
    made: dict[str, Any] = {}
    for heading in frame.columns:
        name, unit = where.bare(heading), heading.partition(" [")[2].rstrip("]")
        kind = _kind(name.removeprefix("u "))
        symbol = _target(kind, symbols) if unit and kind and kind != "length" else ""
        if not symbol or symbol == unit:
            made[heading] = frame[heading]
            continue
        source, target = units.unit(unit, kind), units.unit(symbol, kind)
        values = frame[heading].to_numpy(dtype=np.float64)
        made[heading.replace(f"[{unit}]", f"[{symbol}]")] = units.convert(values, source, target)
    return pd.DataFrame(made, index=frame.index)


def of_partner(frame: pd.DataFrame, partner: Partner) -> pd.DataFrame:
    """The columns of a frame that a partner is entitled to."""
    if not partner.columns:
        return frame
    wanted = {*ALWAYS, *partner.columns}
    if "porosity" in wanted:
        wanted |= {"porosity route", "porosity stress"}
    if "klinkenberg permeability" in wanted:
        wanted |= {"slip basis", "permeability basis", "permeability stress"}
    if "gas permeability" in wanted:
        wanted |= {"gas", "mean pressure"}
    kept = frame[[c for c in frame.columns if where.bare(c).removeprefix("u ") in wanted]]
    return kept.assign(flags=[_own_flags(text, wanted) for text in kept["flags"]])


def _own_flags(text: str, wanted: set[str]) -> str:
    """The flags without those that speak of results left out."""
    others = [c for c in CHOOSABLE if c not in wanted and c not in TEXT_COLUMNS]
    if not wanted & {"oil saturation", "water saturation", "gas saturation"}:
        others.append("saturations")
    return "; ".join(f for f in text.split("; ") if not any(o in f.split(":")[0] for o in others))


def entitlement(
    connection: sa.Connection, recipient: str, well: str, confidential_until: str, told: Sequence[str]
) -> Partner:
    """What a recipient may receive of a well.

    Parameters
    ----------
    confidential_until, told
        The day until which the well is confidential, if any, and the client and partners of its job.

    Raises
    ------
    Refused
        If the partner is registered without this well, or the well is confidential and the recipient
        neither registered nor of its job.
    """
    known = partners(connection)
    found = known.get(store.name_key(recipient))
    if found is not None:
        if found.wells and store.name_key(well) not in {store.name_key(w) for w in found.wells}:
            raise Refused(
                [
                    Problem(
                        f"{found.name}, entitled to {', '.join(found.wells)}",
                        f"a partner entitled to {well}",
                        "let a manager change that: corelab partner set",
                    )
                ],
                f"Nothing was written: {found.name} is not entitled to {well}.",
            )
        return found
    of_job = {store.name_key(t) for t in told}
    if recipient and _still(confidential_until) and store.name_key(recipient) not in of_job:
        raise Refused(
            [
                Problem(
                    f"{recipient}, neither client nor partner of the job nor registered",
                    f"somebody entitled to {well}, which is confidential until {confidential_until}",
                    "check the name, or let a manager register the partner: corelab partner set",
                )
            ],
            f"Nothing was written: {well} is confidential.",
        )
    return Partner(recipient)


def _still(day: str) -> bool:
    from datetime import UTC, datetime

    return bool(day) and day[:10] > datetime.now(UTC).date().isoformat()
