"""Control of instruments: charts of the check standards, and what they say of everything measured.

A chart is of one instrument, one standard and one result, and begins anew at each calibration of the
instrument, which may move it. Its limits come from the first checks that agree with the certificate and are
no outliers among themselves, up to `BASELINE`; with fewer than `FEWEST`, or fewer than `FEWEST_DIFFERENT`
different values (too coarsely read to tell how they scatter), from the certificate and the stated
uncertainty. They allow for the few checks they rest on, so that one sound check in 370 lies beyond them, and
one in about 170 is called bad by any of the tests that call for action (`ACT_ON` and `DRIFT`; with all of
Nelson's it would be one in thirty). The other tests ask for a look.

A check is bad where such a test fires or the value does not agree with its certificate; it is no check where
the standard's own certificate had run out; else it is good. After a bad check of a result, everything
measured on the instrument since the last good check of that result is in doubt, until the next good one. A
good check vouches for its own day.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from corelab.control.instruments import Calibration
from corelab.science import control_charts as charts

#: So many checks make the limits with which later ones are judged: common practice.
BASELINE = 20
#: Fewer checks than this tell too little of how checks scatter: common practice.
FEWEST = 8
FEWEST_DIFFERENT = 5
#: Level at which a check is an outlier among the first ones (assumed).
OUTLIER_CHANCE = 0.01
#: Nelson's tests that call for action; the others only ask for a look (assumed).
ACT_ON = (1, 2)
DRIFT, RANGE = "drift", "range"
OUT_OF_CONTROL, OVERDUE, RAN_OUT = "out of control", "calibration overdue", "certificate ran out"
#: A value farther from its certificate than three joint standard uncertainties is no good check: the action
#: limit of zeta scores in ISO 13528:2015 (from memory).
ACT_E_N = 1.5
KEY = ["instrument_id", "standard_id", "result"]
WORDS = {str(number): words for number, words in charts.RULES.items()} | {
    "1": "a value beyond the limits",
    "2": "nine values in a row on one side of the centre, farther than it is known",
    DRIFT: "the moving average has drifted from the centre",
    RANGE: "a step from the value before beyond the limit of moving ranges",
}
"""What each test says where it fires."""


@dataclass(frozen=True, slots=True)
class Doubt:
    """What was measured on an instrument after one day and before another is in doubt; empty: no end."""

    instrument_id: int
    after: str
    before: str
    words: str

    def covers(self, days: pd.Series[str]) -> pd.Series[bool]:
        """Which days fall within; of a reading without a day nobody can tell, so it does."""
        inside = pd.Series(True, index=days.index)
        if self.after:
            inside &= days > self.after
        if self.before:
            inside &= days < self.before
        return inside | (days == "")


def judged(occasions: pd.DataFrame) -> pd.DataFrame:
    """The occasions with the limits of their charts and what is said of each.

    Parameters
    ----------
    occasions
        In order of days: `instrument_id`, `standard_id`, `result`, `unit`, `day`, `value`, `u_value`,
        `certified`, `u_certified`, `valid_until`, and `calibrated`, which tells calibrations apart.

    Returns
    -------
    DataFrame
        The columns of `occasions` and: `centre`, `sigma`, `lower`, `upper`, `limits` (whence),
        `moving_range`, `range_upper`, `rules` (those that fired), `e_n`, `bad`, `good`, `why` (in words,
        where it is not good).
    """
    parts = [_chart(part) for _, part in occasions.groupby([*KEY, "calibrated"], sort=False)]
    columns = [
        *occasions.columns, "centre", "sigma", "lower", "upper", "limits", "moving_range", "range_upper",
        "rules", "e_n", "bad", "good", "why",
    ]  # fmt: skip
    if not parts:
        return pd.DataFrame(columns=columns)
    return pd.concat(parts).sort_index(kind="stable").reset_index(drop=True)


def _chart(part: pd.DataFrame) -> pd.DataFrame:
    values = part["value"].to_numpy(dtype=np.float64)
    u = np.nan_to_num(part["u_value"].to_numpy(dtype=np.float64))
    certified, u_certified = float(part["certified"].iloc[-1]), float(part["u_certified"].iloc[-1])
    e_n = charts.normalised_error(values, u, certified, u_certified)
    disagrees = np.abs(e_n) > ACT_E_N
    sound = values[np.flatnonzero(~disagrees)[:BASELINE]]
    first = sound[~charts.rosner_outliers(sound, len(sound) // 5, OUTLIER_CHANCE)]
    count = len(first)
    own = count >= FEWEST and len(np.unique(first)) >= FEWEST_DIFFERENT
    if own:
        found = charts.individuals_chart(first)
        centre, sigma, range_upper = float(found.centre), float(found.sigma), float(found.range_upper)
        factor, limits = charts.limit_factor(count), f"the first {count} good checks"
        fired = _fired(values, centre, sigma, count, disagrees)
        fired[RANGE] = np.concatenate([[False], np.abs(np.diff(values)) > range_upper])
    else:
        centre, factor, range_upper = certified, 3.0, np.nan
        sigma = float(np.hypot(np.median(u), u_certified))
        limits = "the certificate and the stated uncertainty"
        fired = {"1": np.abs(values - centre) > 3.0 * sigma} if sigma > 0 else {}
    acting = [t for t in (*map(str, ACT_ON), DRIFT) if t in fired]
    bad = disagrees.copy()
    for test in acting:
        bad |= fired[test]
    expired = np.array(
        [bool(v) and day > v[:10] for day, v in zip(part["day"], part["valid_until"], strict=True)]
    )
    whys: list[str] = []
    for i in range(len(values)):
        words = [WORDS[test] for test in acting if fired[test][i]]
        if disagrees[i]:
            words.append(
                f"{values[i]:.5g} where {certified:.5g} is certified: off by {2 * abs(e_n[i]):.1f} times "
                "the standard uncertainty of both"
            )
        if expired[i]:
            words.append("the standard's certificate had run out")
        whys.append("; ".join(words))
    rules = [", ".join(test for test, where in fired.items() if where[i]) for i in range(len(values))]
    return part.assign(
        centre=centre,
        sigma=sigma,
        lower=centre - factor * sigma,
        upper=centre + factor * sigma,
        limits=limits,
        moving_range=np.concatenate([[np.nan], np.abs(np.diff(values))]),
        range_upper=range_upper,
        rules=rules,
        e_n=e_n,
        bad=bad & ~expired,
        good=~bad & ~expired,
        why=whys,
    )


def _fired(
    values: NDArray[np.float64], centre: float, sigma: float, count: int, disagrees: NDArray[np.bool_]
) -> dict[str, NDArray[np.bool_]]:
    """Where which test fires, with limits that rest on so many checks.

    Values nearer to the centre than its own standard error are on neither side of it.
    """
    deviate = charts.later_deviate(values, centre, sigma, count)
    fired = {str(rule): where for rule, where in charts.run_rules(deviate, 0.0, 1.0).items()}
    aside = np.where(np.abs(values - centre) > sigma / np.sqrt(count), deviate, 0.0)
    fired["2"] = charts.run_rules(aside, 0.0, 1.0)[2]
    drifted = np.zeros(len(values), dtype=np.bool_)
    shocks = np.flatnonzero(disagrees | fired["1"])  # the average begins anew after each
    for start, stop in zip([0, *(shocks + 1)], [*shocks, len(values)], strict=True):
        if stop > start:
            average = charts.drift_deviate(values[start:stop], centre, sigma, count)
            drifted[start:stop] = np.abs(average) > charts.DRIFT_LIMIT
    return fired | {DRIFT: drifted}


def doubts(
    points: pd.DataFrame, calibrations: Sequence[Calibration], names: Mapping[int, str]
) -> list[Doubt]:
    """When readings of which instruments are in doubt.

    Parameters
    ----------
    points
        The judged occasions.
    calibrations
        Every calibration that the register of instruments held.
    names
        By instrument.
    """
    found: dict[Doubt, None] = {}
    for (instrument, _), part in points.groupby(["instrument_id", "result"], sort=True):
        number = int(str(instrument))
        words = f"{names.get(number, 'an instrument')} {OUT_OF_CONTROL}"
        last_good, start, open_ = "", "", False
        for day, bad in _days(part).items():
            if bad and not open_:
                start, open_ = last_good, True
            if not bad:
                if open_:
                    found[Doubt(number, start, str(day), words)] = None
                last_good, open_ = str(day), False
        if open_:
            found[Doubt(number, start, "", words)] = None
    for calibration in calibrations:
        if not calibration.due_on:
            continue
        later = [c.made_on for c in _later(calibration, calibrations)]
        renewed = min(later, default="")
        if not renewed or renewed > calibration.due_on:
            words = f"{names.get(calibration.instrument_id, 'an instrument')} {OVERDUE}"
            found[Doubt(calibration.instrument_id, calibration.due_on, renewed, words)] = None
    return list(found)


def _days(part: pd.DataFrame) -> pd.Series[bool]:
    """Whether the day's checks were bad, for each day with any that counts; in order."""
    counting = part[part["bad"].astype(bool) | part["good"].astype(bool)]
    return counting.groupby("day", sort=True)["bad"].any()


def _later(calibration: Calibration, calibrations: Iterable[Calibration]) -> list[Calibration]:
    return [
        c
        for c in calibrations
        if (c.instrument_id, c.measures) == (calibration.instrument_id, calibration.measures)
        and c.made_on > calibration.made_on
    ]


def doubted(readings: pd.DataFrame, found: Iterable[Doubt]) -> dict[int, list[str]]:
    """By plug, the words of the doubts about instruments that read it: `blocked`, as it stands in flags.

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
        mask = doubt.covers(rows["day"])
        if doubt.words.endswith(OVERDUE):  # most readings are made before a calibration runs out
            mask &= rows["day"] != ""
        for plug in rows.loc[mask, "plug_id"].unique():
            said = words.setdefault(int(plug), [])
            if doubt.words not in said:
                said.append(doubt.words)
    return words


def states(
    points: pd.DataFrame, calibrations: Sequence[Calibration], names: Mapping[int, str], on: str
) -> pd.DataFrame:
    """Each instrument on a day: its calibration, its checks, whether it is in control and since when not."""
    rows: list[dict[str, Any]] = []
    points = points[points["day"] <= on]
    calibrations = [c for c in calibrations if c.made_on <= on]
    numbers = {*(c.instrument_id for c in calibrations), *map(int, points["instrument_id"].unique())}
    for number in sorted(numbers, key=lambda n: names[n]):
        part = points[points["instrument_id"] == number]
        own = [c for c in calibrations if c.instrument_id == number]
        newest = [c for c in own if not _later(c, own)]
        runs_out = min((c.due_on for c in newest if c.due_on), default="")
        open_ = [d for d in doubts(part, (), names) if not d.before]
        checked = _days(part)
        state = "in control" if len(checked) else "not checked"
        why = ""
        if open_:
            state = OUT_OF_CONTROL
            bad = part[part["bad"].astype(bool)]
            wrong = {r for r, own in part.groupby("result") if _days(own).iloc[-1:].any()}
            last = bad[bad["result"].isin(wrong)].drop_duplicates(["standard_id", "result"], keep="last")
            why = "; ".join(f"{r['result']} on {r['day']}: {r['why']}" for r in last.to_dict("records"))
        if runs_out and on > runs_out:
            state = f"{state}, {OVERDUE}" if open_ else OVERDUE
        good = checked[~checked.astype(bool)]
        rows.append(
            {
                "instrument": names[number],
                "state": state,
                "checks": len(checked),
                "last check": str(checked.index[-1]) if len(checked) else "",
                "last good check": str(good.index[-1]) if len(good) else "",
                "in doubt": (min(f"after {d.after}" if d.after else "all" for d in open_) if open_ else ""),
                "calibrated on": max((c.made_on for c in newest), default=""),
                "due on": runs_out,
                "why": why,
            }
        )
    columns = [
        "instrument", "state", "checks", "last check", "last good check", "in doubt", "calibrated on",
        "due on", "why",
    ]  # fmt: skip
    return pd.DataFrame(rows, columns=columns)


def summaries(points: pd.DataFrame) -> pd.DataFrame:
    """Each chart in a row: bias against the certificate, repeatability, limits, how many checks were bad."""
    rows: list[dict[str, Any]] = []
    for (instrument, standard, result), part in points.groupby(KEY, sort=False):
        values = part["value"].to_numpy(dtype=np.float64)
        last = part.iloc[-1]
        u = float(np.nan_to_num(part["u_value"].median()))
        steps = part.groupby("calibrated", sort=False)["value"].diff().abs().dropna()
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
                "bad": int(part["bad"].sum()),
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


def between(points: pd.DataFrame) -> pd.DataFrame:
    """Repeatability on one instrument and reproducibility between instruments, of each standard and result.

    After ISO 5725-2, an instrument in the place of a laboratory; bad checks are left out.
    """
    rows: list[dict[str, Any]] = []
    good = points[points["good"].astype(bool)]
    for (standard, result), part in good.groupby(["standard_id", "result"], sort=False):
        group, instruments = pd.factorize(part["instrument_id"])
        if len(instruments) < 2 or len(part) <= len(instruments):
            continue
        found = charts.precision(part["value"].to_numpy(dtype=np.float64), group)
        rows.append(
            {
                "standard_id": standard,
                "result": result,
                "unit": part["unit"].iloc[-1],
                "instruments": len(instruments),
                "checks": len(part),
                "repeatability": float(found.repeatability_sd),
                "between instruments": float(found.between_sd),
                "reproducibility": float(found.reproducibility_sd),
                "repeatability limit": float(found.repeatability_limit),
                "reproducibility limit": float(found.reproducibility_limit),
            }
        )
    columns = [
        "standard_id", "result", "unit", "instruments", "checks", "repeatability", "between instruments",
        "reproducibility", "repeatability limit", "reproducibility limit",
    ]  # fmt: skip
    return pd.DataFrame(rows, columns=columns)
