"""What the workbook and the page show beside the results: averages, fits, shifts, crush evidence, curves."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa

from corelab.errors import CorelabError
from corelab.interval import depths, impact, select
from corelab.interval.summary import summary
from corelab.interval.trend import trend
from corelab.records import logs, store
from corelab.reports.page import Fit, Line
from corelab.review import entitled
from corelab.review.entitled import Partner

_PHI, _K = "porosity", "klinkenberg permeability"
#: What a partner's averages and fits rest on; the plugs left out stay in every table and plot.
_SOUND = "crush verdict is empty or crush verdict != 'likely'"
#: Averages that rest on porosity and permeability together.
_OF_BOTH = {"Lorenz", "net to gross [v/v]"}
#: The curves drawn beside the plugs, at most so many of them.
_DRAWN = ("gamma", "density", "neutron porosity")


def allowed(partner: Partner, *names: str) -> bool:
    """Whether a partner is entitled to all of these results."""
    return not partner.columns or set(names) <= set(partner.columns)


def averages(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    partner: Partner,
    symbols: Sequence[str],
) -> pd.DataFrame:
    """Averages of the whole well and of its facies, in the units asked for; empty where there are none."""
    rows: list[dict[str, Any]] = []
    for by in ("", "facies"):
        try:
            records = summary(
                connection, identities, well, select.Filters(unit="m"), by=by, leave_out=["crushed"]
            )
        except CorelabError:
            continue
        for r in records:
            rows.append(_averages_row(r))
    frame = pd.DataFrame(rows)
    if not len(frame):
        return frame
    if list(frame["facies"]) == ["all", "not stated"]:
        frame = frame.iloc[:1]
    hidden: set[str] = set()
    if not allowed(partner, _PHI):
        hidden |= {c for c in map(str, frame) if c.startswith("porosity")} | _OF_BOTH
    if not allowed(partner, _K):
        hidden |= {c for c in map(str, frame) if c.startswith("k ")} | {"Dykstra-Parsons", *_OF_BOTH}
    frame = frame.drop(columns=[c for c in frame if c in hidden])
    return _in_units(frame, symbols)


def _averages_row(r: Mapping[str, Any]) -> dict[str, Any]:
    phi, k = r[_PHI], r[_K]
    return {
        "facies": r["group"],
        "plugs": r["plugs"],
        "porosity arithmetic mean [v/v]": phi["arithmetic mean"],
        "porosity minimum [v/v]": phi["minimum"],
        "porosity maximum [v/v]": phi["maximum"],
        "k arithmetic mean [mD]": k["arithmetic mean"],
        "k geometric mean [mD]": k["geometric mean"],
        "k harmonic mean [mD]": k["harmonic mean"],
        "Dykstra-Parsons": r["dykstra-parsons coefficient"],
        "Lorenz": r["lorenz coefficient"],
        "k vertical over horizontal": r["vertical to horizontal ratio"],
        "net to gross [v/v]": r["net to gross [v/v]"],
    }


def _in_units(frame: pd.DataFrame, symbols: Sequence[str]) -> pd.DataFrame:
    """Columns that start with porosity or k, in the units asked for."""
    made = {}
    for heading in frame.columns:
        name = _PHI if heading.startswith("porosity") else _K if heading.startswith("k ") else ""
        unit = heading.partition(" [")[2].rstrip("]")
        if not name or not unit:
            made[heading] = frame[heading]
            continue
        one = pd.DataFrame({f"{name} [{unit}]": pd.to_numeric(frame[heading])})
        turned = entitled.in_units(one, symbols)
        shown = turned.columns[0].partition(" [")[2].rstrip("]")
        made[heading.replace(f"[{unit}]", f"[{shown}]")] = turned.iloc[:, 0]
    return pd.DataFrame(made)


def fits(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    partner: Partner,
    symbols: Sequence[str],
) -> tuple[list[Fit], pd.DataFrame]:
    """The preferred fit of each facies as lines, and all fits in a table."""
    if not allowed(partner, _PHI, _K):
        return [], pd.DataFrame()
    try:
        filters = select.Filters(with_uncertainty=True, where=_SOUND)
        found = trend(connection, identities, well, filters, "facies")
    except CorelabError:
        return [], pd.DataFrame()
    lines, rows = [], []
    for record in found.records:
        rows.append(
            {
                "facies": record["group"],
                "model": record["model"],
                "plugs": record["plugs"],
                "equation (k in mD, porosity in v/v)": record["equation"],
                "r squared": record["r squared"],
                "residual standard deviation [decades]": record["residual standard deviation"],
                "leave-one-out error [decades]": record["leave-one-out error"],
                "rank": record["rank"],
                "why": record["reason"],
            }
        )
        if record["rank"] == 1 and record["prediction band"]:
            band = pd.DataFrame(record["prediction band"]).astype("float64")
            values = {
                "porosity [v/v]": band["porosity [v/v]"],
                "klinkenberg permeability [mD]": band["permeability [mD]"],
            }
            x = entitled.in_units(pd.DataFrame(values), symbols).to_numpy(dtype=np.float64)
            low, high = (
                entitled.in_units(pd.DataFrame({"klinkenberg permeability [mD]": band[c]}), symbols).to_numpy(
                    dtype=np.float64
                )[:, 0]
                for c in ("low [mD]", "high [mD]")
            )
            lines.append(Fit(record["group"], x[:, 0], low, x[:, 1], high))
    return lines, pd.DataFrame(rows)


def shifts(connection: sa.Connection, identities: store.Identities, well: int, unit: str) -> pd.DataFrame:
    """The depth shifts in force, in the page's unit of depth."""
    frame = pd.DataFrame(depths.in_force_table(connection, identities, well))
    if not len(frame) or unit == "m":
        return frame
    for column in ("shift [m]", "standard uncertainty [m]"):
        frame[column] = frame[column].astype("float64") / 0.3048
    return frame.rename(columns=lambda c: c.replace("[m]", f"[{unit}]"))


def crush_evidence(
    connection: sa.Connection, identities: store.Identities, well: str, stored: Mapping[str, str], unit: str
) -> pd.DataFrame:
    """One row a piece of evidence for or against crushing of each percussion plug."""
    number = select.well_id(identities, well)
    plain = select.of_well(connection, identities, number, stored)
    if not (plain["source"] == impact.PERCUSSION).any():
        return pd.DataFrame()
    records = impact.table(impact.of_well(connection, number, plain, stored), plain, unit)
    rows = [
        {
            "plug": r["plug"],
            f"depth [{unit}]": r["depth [m]"] / (0.3048 if unit == "ft" else 1.0),
            "crush likelihood [v/v]": r["crush likelihood [v/v]"],
            "crush verdict": r["crush verdict"],
            "direction": r["direction"],
            "term": e["term"],
            "effect on the log-odds": e["effect"],
            "finding": e["finding"],
        }
        for r in records
        for e in r["evidence"]
    ]
    return pd.DataFrame(rows)


def curves(connection: sa.Connection, well: int, unit: str) -> list[Line]:
    """The curves to draw: gamma, density, neutron porosity, the first of each."""
    known = logs.curves(connection, well)
    drawn = []
    for quantity in _DRAWN:
        found = next((c for c in known if c.quantity == quantity and np.isfinite(c.values).any()), None)
        if found is not None:
            depth = found.depth_m / (0.3048 if unit == "ft" else 1.0)
            drawn.append(Line(f"{found.mnemonic} log", found.unit, depth, found.values))
    return drawn
