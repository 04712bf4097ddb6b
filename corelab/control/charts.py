"""Control of instruments: charts of the check standards, and what they say of everything measured.

A chart is of one instrument, one standard and one result. Its limits come from the first checks that agree
with the certificate and are no outliers among themselves, up to `BASELINE`; with fewer than `FEWEST` from
the certificate and the stated uncertainty. A check is good where none of the rules that call for action
fires (`ACT_ON`: with all eight, one check in ninety of a sound instrument would be bad) and the value agrees
with its certificate. After a check that is not good, everything measured on the instrument since the last
good check is in doubt, until the next good one.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from corelab.science import control_charts as charts

#: So many checks make the limits with which later ones are judged: common practice.
BASELINE = 20
#: Fewer checks than this tell too little of how checks scatter: common practice.
FEWEST = 8
#: Nelson's tests that call for action; the others only ask for a look (assumed).
ACT_ON = (1, 2, 3)
OUT_OF_CONTROL, OVERDUE = "out of control", "calibration overdue"
#: A value farther from its certificate than three joint standard uncertainties is no good check.
ACT_E_N = 1.5
KEY = ["instrument_id", "standard_id", "result"]


@dataclass(frozen=True, slots=True)
class Doubt:
    """What was measured on an instrument after one day and before another is in doubt; empty: no end."""

    instrument_id: int
    after: str
    before: str
    words: str

    def covers(self, days: pd.Series[str]) -> pd.Series[bool]:
        """Which days fall within; a reading without a day does, since nobody can tell."""
        inside = pd.Series(True, index=days.index)
        if self.after:
            inside &= days > self.after
        if self.before:
            inside &= days < self.before
        return inside | (days == "")


def judged(occasions: pd.DataFrame) -> pd.DataFrame:
    """The occasions with the limits of their charts and what is said of each.

    Returns
    -------
    DataFrame
        The columns of `occasions` and: `centre`, `sigma`, `lower`, `upper`, `limits` (whence),
        `moving_range`, `range_upper`, `rules` (those that fired), `e_n`, `good`, `why` (in words, where it
        is not good).
    """
    parts = [_chart(part) for _, part in occasions.groupby(KEY, sort=False)]
    columns = [
        *occasions.columns, "centre", "sigma", "lower", "upper", "limits", "moving_range", "range_upper",
        "rules", "e_n", "good", "why",
    ]  # fmt: skip
    return pd.concat(parts, ignore_index=True) if parts else pd.DataFrame(columns=columns)


def _chart(part: pd.DataFrame) -> pd.DataFrame:
    values = part["value"].to_numpy(dtype=np.float64)
    u = part["u_value"].to_numpy(dtype=np.float64)
    certified, u_certified = float(part["certified"].iloc[-1]), float(part["u_certified"].iloc[-1])
    e_n = charts.normalised_error(values, np.nan_to_num(u), certified, u_certified)
    kept = ~(np.abs(e_n) > ACT_E_N)
    kept[np.flatnonzero(kept)[BASELINE:]] = False
    sound = values[kept]
    first = sound[~charts.rosner_outliers(sound, len(sound) // 5)]
    found = charts.individuals_chart(first) if len(first) >= FEWEST else None
    if found is not None and float(found.sigma) > 0:
        centre, sigma = float(found.centre), float(found.sigma)
        limits = f"the first {len(first)} good checks"
        acting: tuple[int, ...] = ACT_ON
        range_upper = float(found.range_upper)
    else:
        centre = certified
        sigma = float(np.hypot(np.nanmedian(u) if np.isfinite(u).any() else 0.0, u_certified))
        limits, acting = "the certificate and the stated uncertainty", ACT_ON[:1]
        range_upper = np.nan
    fired = charts.run_rules(values, centre, sigma) if sigma > 0 else {}
    expired = np.array(
        [bool(v) and day > v[:10] for day, v in zip(part["day"], part["valid_until"], strict=True)]
    )
    act = np.zeros(len(values), dtype=np.bool_)
    for rule in acting:
        act |= fired.get(rule, np.zeros(len(values), dtype=np.bool_))
    whys: list[str] = []
    for i in range(len(values)):
        words = [charts.RULES[r] for r in acting if r in fired and fired[r][i]]
        if abs(e_n[i]) > ACT_E_N:
            words.append(
                f"{values[i]:.5g} where {certified:.5g} is certified: off by {2 * abs(e_n[i]):.1f} times "
                "the standard uncertainty of both"
            )
        if expired[i]:
            words.append("the standard's certificate had run out")
        whys.append("; ".join(words))
    rules = [", ".join(str(r) for r, where in fired.items() if where[i]) for i in range(len(values))]
    return part.assign(
        centre=centre,
        sigma=sigma,
        lower=centre - 3 * sigma,
        upper=centre + 3 * sigma,
        limits=limits,
        moving_range=np.concatenate([[np.nan], np.abs(np.diff(values))]),
        range_upper=range_upper,
        rules=rules,
        e_n=e_n,
        good=~act & ~(np.abs(e_n) > ACT_E_N) & ~expired,
        why=whys,
    )


def doubts(points: pd.DataFrame, due: Mapping[int, tuple[str, str]], names: Mapping[int, str]) -> list[Doubt]:
    """When readings of which instruments are in doubt.

    Parameters
    ----------
    points
        The judged occasions.
    due
        By instrument, the days on which its calibration was made and runs out; empty where not stated.
    names
        By instrument.
    """
    found: list[Doubt] = []
    for instrument, part in points.groupby("instrument_id", sort=True):
        days = part.groupby("day", sort=True)["good"].all()
        name = names.get(int(str(instrument)), "an instrument")
        last_good, start, bad = "", "", False
        for day, good in days.items():
            if good and bad:
                found.append(Doubt(int(str(instrument)), start, str(day), f"{name} {OUT_OF_CONTROL}"))
            if good:
                last_good, bad = str(day), False
            elif not bad:
                start, bad = last_good, True
        if bad:
            found.append(Doubt(int(str(instrument)), start, "", f"{name} {OUT_OF_CONTROL}"))
    for instrument, (_, runs_out) in sorted(due.items()):
        if runs_out:
            words = f"{names.get(instrument, 'an instrument')} {OVERDUE}"
            found.append(Doubt(instrument, runs_out[:10], "", words))
    return found


def doubted(readings: pd.DataFrame, found: Iterable[Doubt]) -> dict[int, list[str]]:
    """By plug, the words of the doubts about instruments that read it.

    Parameters
    ----------
    readings
        `plug_id`, `instrument_id` and `day` (empty where not stated) of readings in force.
    """
    words: dict[int, list[str]] = {}
    by_instrument = dict(iter(readings.groupby("instrument_id"))) if len(readings) else {}
    for doubt in found:
        rows = by_instrument.get(doubt.instrument_id)
        if rows is None:
            continue
        undated_only_overdue = doubt.words.endswith(OVERDUE)
        mask = doubt.covers(rows["day"])
        if undated_only_overdue:
            mask &= rows["day"] != ""
        for plug in rows.loc[mask, "plug_id"].unique():
            said = words.setdefault(int(plug), [])
            if doubt.words not in said:
                said.append(doubt.words)
    return words


def states(
    points: pd.DataFrame,
    due: Mapping[int, tuple[str, str]],
    names: Mapping[int, str],
    today: str,
) -> pd.DataFrame:
    """Each instrument on a day: its calibration, its checks, whether it is in control and since when not."""
    rows: list[dict[str, Any]] = []
    for number in sorted({*due, *(int(i) for i in points["instrument_id"].unique())}, key=lambda n: names[n]):
        part = points[(points["instrument_id"] == number) & (points["day"] <= today)]
        days = part.groupby("day", sort=True)["good"].all()
        good = [str(d) for d in days[days].index]
        calibrated, runs_out = due.get(number, ("", ""))
        state, why = "in control", ""
        if not len(days):
            state = "not checked"
        elif not days.iloc[-1]:
            state = OUT_OF_CONTROL
            last = part[part["day"] == days.index[-1]]
            why = "; ".join(f"{r['result']}: {r['why']}" for r in last[~last["good"]].to_dict("records"))
        if runs_out and today > runs_out[:10]:
            state = OVERDUE if state != OUT_OF_CONTROL else f"{OUT_OF_CONTROL}, {OVERDUE}"
        rows.append(
            {
                "instrument": names[number],
                "state": state,
                "checks": len(days),
                "last check": str(days.index[-1]) if len(days) else "",
                "last good check": good[-1] if good else "",
                "calibrated on": calibrated,
                "due on": runs_out,
                "why": why,
            }
        )
    columns = [
        "instrument", "state", "checks", "last check", "last good check", "calibrated on", "due on", "why",
    ]  # fmt: skip
    return pd.DataFrame(rows, columns=columns)


def summaries(points: pd.DataFrame) -> pd.DataFrame:
    """Each chart in a row: bias against the certificate, repeatability, limits, how many checks were bad."""
    rows: list[dict[str, Any]] = []
    for (instrument, standard, result), part in points.groupby(KEY, sort=False):
        values = part["value"].to_numpy(dtype=np.float64)
        last = part.iloc[-1]
        u = float(np.nanmedian(part["u_value"])) if part["u_value"].notna().any() else 0.0
        steps = np.abs(np.diff(values))
        rows.append(
            {
                "instrument_id": instrument,
                "standard_id": standard,
                "result": result,
                "unit": last["unit"],
                "checks": len(part),
                "mean": float(values.mean()),
                "certified": last["certified"],
                "bias": float(values.mean() - last["certified"]),
                "e_n": float(
                    charts.normalised_error(values.mean(), u, last["certified"], last["u_certified"])
                ),
                "repeatability": float(steps.mean() / charts.D2_OF_TWO) if len(steps) else float("nan"),
                "lower": last["lower"],
                "upper": last["upper"],
                "limits": last["limits"],
                "bad": int((~part["good"].astype(bool)).sum()),
            }
        )
    columns = [
        "instrument_id", "standard_id", "result", "unit", "checks", "mean", "certified", "bias", "e_n",
        "repeatability", "lower", "upper", "limits", "bad",
    ]  # fmt: skip
    return pd.DataFrame(rows, columns=columns)


def pooled(points: pd.DataFrame) -> pd.DataFrame:
    """Repeatability of each instrument and result over its standards, relative to the certified values."""
    rows: list[dict[str, Any]] = []
    for (instrument, result), part in points.groupby(["instrument_id", "result"], sort=False):
        share = (part["value"] / part["certified"]).to_numpy(dtype=np.float64)
        group = part["standard_id"].to_numpy()
        counts = pd.Series(group).value_counts()
        freedom = int(len(share) - len(counts))
        if freedom < 1:
            continue
        means = pd.Series(share).groupby(group).transform("mean").to_numpy()
        rows.append(
            {
                "instrument_id": instrument,
                "result": result,
                "standards": len(counts),
                "degrees of freedom": freedom,
                "pooled repeatability [%]": 100 * float(np.sqrt(np.sum((share - means) ** 2) / freedom)),
                "mean bias [%]": 100 * float(share.mean() - 1),
            }
        )
    columns = [
        "instrument_id", "result", "standards", "degrees of freedom", "pooled repeatability [%]",
        "mean bias [%]",
    ]  # fmt: skip
    return pd.DataFrame(rows, columns=columns)
