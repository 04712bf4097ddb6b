"""Results between the stresses at which they were measured: within, never beyond."""

from __future__ import annotations

import numpy as np
import pandas as pd

from corelab.bench.outcome import STRESS_NOT_STATED
from corelab.science import stress as laws

SAME_STRESS_MPA = 0.005
SAME_STRESS_SHARE = 0.005


def near(stresses: pd.Series[float], wanted_mpa: float) -> pd.Series[bool]:
    """Which stresses are the one wanted, within the rounding of gauges."""
    return (stresses - wanted_mpa).abs() <= max(SAME_STRESS_MPA, SAME_STRESS_SHARE * wanted_mpa)


def equivalent_stress_mpa(uniaxial_mpa: float, poisson_ratio: float) -> float:
    """The hydrostatic stress of the laboratory that compacts like a uniaxial stress of the reservoir."""
    return uniaxial_mpa * float(laws.uniaxial_factor(poisson_ratio))


def with_interpolated(results: pd.DataFrame, wanted_mpa: float) -> pd.DataFrame:
    """The results, and for each pore volume and Klinkenberg permeability what it is at a stress between.

    The law of Jones (1988) is drawn through the two stresses next to the one wanted; porosity and bulk
    volume follow from pore and grain volume. A value measured at the stress wanted is left as it is.
    """
    there = results[
        results["value"].notna()
        & results["value_limit"].isna()
        & ~results["flags"].str.contains(STRESS_NOT_STATED, regex=False).astype(bool)
    ]
    made: list[pd.DataFrame] = []
    for quantity in ("pore volume", "klinkenberg permeability", "slip factor"):
        rows = there[there["quantity"] == quantity]
        by = ["place", "direction"] if quantity == "pore volume" else ["place", "direction", "step"]
        made.append(_between(rows, by, wanted_mpa, quantity))
    pore = made[0]
    grain = there[there["quantity"] == "grain volume"].set_index("place")
    pore = pore[pore["place"].isin(grain.index)]
    if len(pore):
        grains = grain.loc[pore["place"], "value"].to_numpy()
        u_grain = grain.loc[pore["place"], "uncertainty"].to_numpy()
        volume, u_pore = pore["value"].to_numpy(), pore["uncertainty"].to_numpy()
        bulk = volume + grains
        made.append(
            pore.assign(
                quantity="porosity",
                value=volume / bulk,
                uncertainty=np.hypot(grains * u_pore, volume * u_grain) / bulk**2,
                basis="pore-grain",
            )
        )
        made.append(
            pore.assign(
                quantity="bulk volume",
                value=bulk,
                uncertainty=np.hypot(u_pore, u_grain),
                basis="pore and grain",
            )
        )
    return pd.concat([results, *(frame for frame in made if len(frame))], ignore_index=True)


def _between(rows: pd.DataFrame, by: list[str], wanted_mpa: float, quantity: str) -> pd.DataFrame:
    exact = rows[near(rows["stress_mpa"], wanted_mpa)]
    rows = rows[~rows["place"].isin(exact["place"])].sort_values("stress_mpa", kind="stable")
    below = rows[rows["stress_mpa"] < wanted_mpa].drop_duplicates(by, keep="last")
    above = rows[rows["stress_mpa"] > wanted_mpa].drop_duplicates(by, keep="first")
    pair = below.merge(
        above[[*by, "stress_mpa", "value", "uncertainty", "flags"]], on=by, suffixes=("", "_2")
    )
    if not len(pair):
        return pair[rows.columns]
    low, high = pair["stress_mpa"].to_numpy(), pair["stress_mpa_2"].to_numpy()
    first, second = pair["value"].to_numpy(), pair["value_2"].to_numpy()
    if quantity == "pore volume":
        value = laws.pore_volume_between_cm3(first, low, second, high, wanted_mpa)
    elif quantity == "klinkenberg permeability":
        value = laws.permeability_between_md(first, low, second, high, wanted_mpa)
    else:
        share = (wanted_mpa - low) / (high - low)
        value = first + share * (second - first)
    share = (wanted_mpa - low) / (high - low)
    u = (1 - share) * pair["uncertainty"].to_numpy() + share * pair["uncertainty_2"].to_numpy()
    flags = [
        "; ".join(
            dict.fromkeys([*a.split("; "), *b.split("; "), f"interpolated between {s:g} and {t:g} MPa"])
        )
        for a, b, s, t in zip(pair["flags"], pair["flags_2"], low, high, strict=True)
    ]
    made = pair.assign(
        value=value, uncertainty=u, stress_mpa=wanted_mpa, flags=[f.removeprefix("; ") for f in flags]
    )
    return made[rows.columns]
