"""What an interval is like in a few numbers: averages, spread, heterogeneity, net to gross."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab.bench import compute
from corelab.bench import settings as lab_settings
from corelab.control.charts import OUT_OF_CONTROL, OVERDUE
from corelab.errors import NotFound, Usage, quoted
from corelab.interval import other_labs, select
from corelab.interval import where as conditions
from corelab.records import store
from corelab.science import averages, heterogeneity

Array = NDArray[np.float64]

GROUPINGS = ("facies", "run", "lithology", "orientation")
ALL, UNSTATED = "all", "not stated"
CONVENTION = "regression"
_ACROSS = "vertical or oblique (name the orientation in --where, or use --by orientation)"
#: What may be left out as suspect when asked, and what it means.
SUSPECT = {
    "crushed": "crush likelihood likely, or judged crushed",
    "cracked": "described as cracked, powdered, crumbled or disked",
    "flagged": "a reading asks for a second look, or an instrument is in doubt",
}
WEIGHTS = {"count": "every plug alike", "length": "the length that each plug stands for"}
LENGTH_RULE = (
    "half the way to each neighbour in its run, to the end of the recovered core, on either side no more "
    "than three times half the usual spacing; a sidewall plug for no more than 0.3048 m"
)
QUANTILES = (0.1, 0.25, 0.5, 0.75, 0.9)
RESAMPLES, SEED = 1000, 20261201
#: Two plugs closer than this are of one sample point: common practice.
_SAME_POINT_M = 0.15
#: A sidewall plug is a point: it stands for no more than a foot (assumed).
_SIDEWALL_M = 0.3048
_CUT_FACTORS = (0.5, 0.75, 1.0, 1.25, 1.5)
_K_CUT_FACTORS = (0.1, 0.3, 1.0, 3.0, 10.0)
_CUT_NAMES = ("porosity", "permeability", "water saturation")
_CUT_HEADINGS = ("porosity [v/v]", "klinkenberg permeability [mD]", "water saturation [v/v]")
_PHI, _K, _SW = "porosity [v/v]", "klinkenberg permeability [mD]", "water saturation [v/v]"
_BELOW = "klinkenberg permeability below limit"
_ABOVE = "klinkenberg permeability above limit"
_BROKEN = ("cracked", "powdered", "crumbled", "disked")


@dataclass(frozen=True, slots=True)
class Cuts:
    """The least porosity and permeability of net rock, and the most water of pay."""

    porosity_frac: float
    permeability_md: float
    water_saturation_frac: float


def summary(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    filters: select.Filters,
    *,
    by: str = "",
    weights: str = "count",
    leave_out: Sequence[str] = (),
    cuts: Mapping[str, float | None] | None = None,
) -> list[dict[str, Any]]:
    """One record a group: the contract's keys first, then what explains them.

    Horizontal and unoriented plugs unless `--where` names the orientation or groups are by orientation;
    duplicates and permeability from texture never.

    Parameters
    ----------
    by
        'facies', 'run', 'lithology' or 'orientation'; all plugs together where empty.
    weights
        'count' or 'length', for means and the Lorenz coefficient.
    leave_out
        Of `SUSPECT`.
    cuts
        Cut-offs in the place of the laboratory's settings: porosity, permeability, water saturation.

    Raises
    ------
    Usage
        If a grouping, weighting or suspicion is not one of those.
    NotFound
        If nothing is left to summarise; says why.
    """
    if by and by not in GROUPINGS:
        raise Usage(f"--by is one of {', '.join(GROUPINGS)}; found {quoted(by)}.")
    if weights not in WEIGHTS:
        raise Usage(f"--weights is one of {', '.join(WEIGHTS)}; found {quoted(weights)}.")
    for word in leave_out:
        if word not in SUSPECT:
            raise Usage(f"--leave-out is one of {', '.join(SUSPECT)}; found {quoted(word)}.")
    chosen = _cuts(store.settings(connection), cuts or {})
    frame = _prepared(connection, identities, well, select.interval(connection, identities, well, filters))
    frame["why"] = _why(frame, filters, by, leave_out)
    frame["length_m"] = _lengths(connection, identities, well, filters, frame, leave_out)
    if not (frame["why"] == "").any():
        why = "; ".join(f"{count} {reason}" for reason, count in _counted(frame["why"]).items())
        raise NotFound(f"No plug of {quoted(well)} is left to summarise" + (f" ({why})." if why else "."))
    column = by or None
    vertical = _across(frame, leave_out)
    made = []
    for name, every in _groups(frame, column):
        part = every[every["why"] == ""]
        beside = vertical if column in (None, "orientation") else vertical[_stated(vertical, column) == name]
        record = _record(name, part, beside, weights, chosen)
        record["left out"] = _left_out(every, record, leave_out, weights)
        made.append(record)
    return made


def _groups(frame: pd.DataFrame, column: str | None) -> list[tuple[str, pd.DataFrame]]:
    if column is None:
        return [(ALL, frame)]
    return [(str(name), part) for name, part in frame.groupby(_stated(frame, column), sort=False)]


def _stated(frame: pd.DataFrame, column: str) -> pd.Series:
    return frame[column].where(frame[column] != "", UNSTATED)


def _cuts(stored: Mapping[str, str], given: Mapping[str, float | None]) -> Cuts:
    for name in given:
        if name not in _CUT_NAMES:
            raise Usage(f"There is a cut-off of {', '.join(_CUT_NAMES)}; found {quoted(name)}.")
    values = []
    for name in _CUT_NAMES:
        typed = given.get(name)
        if typed is None:
            values.append(lab_settings.number(stored, f"{name} cut-off"))
            continue
        if name == "permeability" and not (math.isfinite(typed) and typed >= 0):
            raise Usage(f"The permeability cut-off is a number of mD, not below zero; found {typed}.")
        if name != "permeability" and not 0 <= typed <= 1:
            raise Usage(f"The {name} cut-off is a fraction from 0 to 1, such as 0.15; found {typed}.")
        values.append(float(typed))
    return Cuts(*values)


def _prepared(
    connection: sa.Connection, identities: store.Identities, well: str, frame: pd.DataFrame
) -> pd.DataFrame:
    """The plugs with what their names do not tell: duplicate of, companion of, broken, depth in metres."""
    number = select.well_id(identities, well)
    facts = store.in_force(connection, "plugs", select.plugs_of_well(identities, number))
    own = facts.assign(key=[store.name_key(identities.name("plug", int(p))) for p in facts["plug_id"]])
    own = own.set_index("key")
    ours = frame["status"] != other_labs.STATUS
    keys = frame["plug"].map(store.name_key).where(ours, "")
    companion = {
        key: identities.name("plug", int(p)) for key, p in own["companion_of_id"].items() if not pd.isna(p)
    }
    repeats = {key for key, p in own["duplicate_of_id"].items() if not pd.isna(p)}
    broken = {
        store.name_key(identities.name("plug", int(p)))
        for p, words in zip(
            *(
                store.in_force(connection, "descriptions", facts["plug_id"])[c]
                for c in ("plug_id", "condition")
            ),
            strict=True,
        )
        if any(word in (words or "") for word in _BROKEN)
    }
    heading = next(c for c in frame.columns if c.startswith("depth ["))
    return frame.assign(
        depth_m=frame[heading] * (0.3048 if heading.endswith("[ft]") else 1.0),
        duplicate=keys.isin(repeats),
        companion=[companion.get(k, "") for k in keys],
        broken=keys.isin(broken),
        below=frame["flags"].str.contains(_BELOW, regex=False),
        above=frame["flags"].str.contains(_ABOVE, regex=False),
        texture=frame["permeability basis"] == "texture",
        **{_K: frame[_K].mask(frame["permeability basis"] == "texture")},
    )


def _why(frame: pd.DataFrame, filters: select.Filters, by: str, leave_out: Sequence[str]) -> pd.Series[str]:
    """Why each plug is left out: the first reason that holds, empty where none does."""
    asked = conditions.parse(filters.where, select.COLUMNS) if filters.where.strip() else None
    named = asked is not None and "orientation" in conditions.named(asked)
    across = frame["orientation"].isin(["vertical", "oblique"])
    reasons = {
        "duplicate of another plug": frame["duplicate"],
        _ACROSS: across & (not named and by != "orientation"),
        **{f"{word}: {SUSPECT[word]}": _suspect(frame, word) for word in leave_out},
    }
    why = pd.Series("", index=frame.index)
    for reason, holds in reasons.items():
        why = why.mask((why == "").to_numpy() & np.asarray(holds, dtype=np.bool_), reason)
    return why


def _across(frame: pd.DataFrame, leave_out: Sequence[str]) -> pd.DataFrame:
    """Vertical plugs to hold against horizontal ones: measured, neither repeats nor suspects left out."""
    keep = (frame["orientation"] == "vertical") & ~frame["duplicate"] & ~_doubtful(frame, leave_out)
    return frame.loc[keep]


def _doubtful(frame: pd.DataFrame, leave_out: Sequence[str]) -> NDArray[np.bool_]:
    doubtful = np.zeros(len(frame), dtype=np.bool_)
    for word in leave_out:
        doubtful |= _suspect(frame, word)
    return doubtful


def _counted(why: pd.Series[str]) -> dict[str, int]:
    return {str(reason): int((why == reason).sum()) for reason in why[why != ""].unique()}


def _left_out(
    every: pd.DataFrame, record: Mapping[str, Any], leave_out: Sequence[str], weights: str
) -> dict[str, Any]:
    """How many plugs of a group are left out and why, and what leaving the suspects out changes."""
    suspect = every["why"].isin([f"{word}: {SUSPECT[word]}" for word in leave_out])
    difference = None
    if suspect.any():
        whole = every[(every["why"] == "") | suspect].sort_values("depth_m", kind="stable")
        k = _Permeability.of(whole)
        w = _weights(whole, weights)
        phi = whole[_PHI].to_numpy(dtype=np.float64)
        with_them = _means(phi, w, np.isfinite(phi)), _means(k.filled, w, k.positive)
        difference = {
            label: {
                "plugs": plugs,
                "porosity arithmetic mean": of_phi["arithmetic mean"],
                "klinkenberg permeability arithmetic mean": of_k["arithmetic mean"],
                "klinkenberg permeability geometric mean": of_k["geometric mean"],
            }
            for label, plugs, (of_phi, of_k) in (
                ("without", record["plugs"], (record["porosity"], record["klinkenberg permeability"])),
                ("with", len(whole), with_them),
            )
        }
    return {
        "plugs": int((every["why"] != "").sum()),
        "why": _counted(every["why"]),
        "permeability from texture": int(((every["why"] == "") & every["texture"]).sum()),
        "difference": difference,
    }


def _suspect(frame: pd.DataFrame, word: str) -> NDArray[np.bool_]:
    flags = frame["flags"]
    if word == "crushed":
        mask = (frame["crush verdict"] == "likely") | flags.str.contains("judged crushed", regex=False)
    elif word == "cracked":
        mask = frame["broken"]
    else:
        control = flags.str.contains(f"{OUT_OF_CONTROL}|{OVERDUE}", regex=True)
        mask = control | flags.map(lambda text: any(compute.asks_for_a_look(f) for f in text.split("; ")))
    return mask.to_numpy(dtype=np.bool_)


# -- one group --------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Permeability:
    """Permeabilities (n,) [md], as stated and with those below detection filled in, and what is known."""

    stated: Array
    filled: Array
    positive: NDArray[np.bool_]
    below: NDArray[np.bool_]
    above: NDArray[np.bool_]
    method: str

    @classmethod
    def of(cls, part: pd.DataFrame) -> _Permeability:
        k = part[_K].to_numpy(dtype=np.float64)
        positive = np.isfinite(k) & (k > 0)
        below = part["below"].to_numpy(dtype=np.bool_) & positive
        above = part["above"].to_numpy(dtype=np.bool_) & positive
        censored = averages.filled_below_detection(k[positive], below[positive])
        filled = k.copy()
        filled[positive] = censored.values
        return cls(k, filled, positive, below, above, censored.method)


def _record(
    name: str, part: pd.DataFrame, vertical: pd.DataFrame, weights: str, cuts: Cuts
) -> dict[str, Any]:
    part = part.sort_values("depth_m", kind="stable")
    unit = "ft" if "depth [ft]" in part.columns else "m"
    depth = part[f"depth [{unit}]"]
    length = part["length_m"].to_numpy(dtype=np.float64)
    w = _weights(part, weights)
    phi = part[_PHI].to_numpy(dtype=np.float64)
    k = _Permeability.of(part)
    both = k.positive & (phi > 0) & (length > 0)
    measured = vertical[_K].notna()
    hidden = measured & (vertical["below"] | vertical["above"])
    return {
        "group": name,
        "plugs": len(part),
        f"top depth [{unit}]": _finite(depth.min()),
        f"base depth [{unit}]": _finite(depth.max()),
        "porosity": _statistics(phi, phi, w, np.isfinite(phi)),
        "klinkenberg permeability": _statistics(k.filled, k.stated, w, k.positive)
        | {
            "zero": int((k.stated <= 0).sum()),
            "below detection": int(k.below.sum()),
            "above limit": int(k.above.sum()),
            "not measured": int(np.isnan(k.stated).sum()),
            "below detection taken as": k.method,
        },
        **_heterogeneity(k.filled, phi, w, k.positive, both & (w > 0), depth.to_numpy(), unit),
        **_vertical(part, vertical[~hidden], k.stated, k.positive & ~k.below & ~k.above),
        "vertical plugs below or above a limit, in no ratio": int(hidden.sum()),
        "flow capacity [mD.m]": float(np.sum(k.filled[both] * length[both])) if both.any() else None,
        "storage capacity [m]": float(np.sum(phi[both] * length[both])) if both.any() else None,
        **_net(part, phi, k, length, cuts),
        "weights": f"{weights}: {WEIGHTS[weights]}",
        "length represented [m]": float(length.sum()),
        "length rule": LENGTH_RULE,
        "without depth": int(part["depth_m"].isna().sum()),
    }


def _weights(part: pd.DataFrame, weights: str) -> Array:
    if weights == "count":
        return np.ones(len(part))
    return part["length_m"].to_numpy(dtype=np.float64)


def _lengths(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    filters: select.Filters,
    frame: pd.DataFrame,
    leave_out: Sequence[str],
) -> Array:
    """What each plug stands for [m]: among all plugs of its run and direction, whichever are asked for.

    So a plug stands for the same whether its facies, its porosity or the whole well is asked for. Repeats and
    suspects left out stand for nothing: their neighbours do.
    """
    every = frame
    if filters.where.strip() or filters.top is not None or filters.base is not None:
        whole = replace(filters, where="", top=None, base=None)
        every = _prepared(connection, identities, well, select.interval(connection, identities, well, whole))
    every = every.loc[~every["duplicate"] & ~_doubtful(every, leave_out)]
    ends = _ends_of_core(connection, identities, select.well_id(identities, well))
    of_core = every["source"].isin(["core", "whole core"])
    turned = every["orientation"].where(every["orientation"].isin(["vertical", "oblique"]), "horizontal")
    places = list(zip(every["run"], of_core, every["depth basis"], turned, strict=True))
    depth = every["depth_m"].to_numpy(dtype=np.float64)
    of_place: dict[tuple[Any, ...], list[int]] = {}
    for i, place in enumerate(places):
        of_place.setdefault(place, []).append(i)
    steps = [d for at in of_place.values() for d in np.diff(np.unique(depth[at][np.isfinite(depth[at])]))]
    usual = float(np.median(steps)) if steps else float("nan")
    length = np.zeros(len(every))
    for (run, core, basis, _), at in of_place.items():
        top, base = ends.get(store.name_key(run), _NO_ENDS) if core and basis == "driller" else _NO_ENDS
        alone = np.unique(depth[at]).size < 2
        length[at] = averages.lengths_represented(depth[at], top, base, usual if alone else float("nan"))
        if not core:
            length[at] = np.minimum(length[at], _SIDEWALL_M)
    found = dict(zip(_names(every), length, strict=True))
    return np.array([found.get(name, 0.0) for name in _names(frame)])


_NO_ENDS = (float("nan"), float("nan"))


def _names(frame: pd.DataFrame) -> list[tuple[str, str, float]]:
    """What tells one row from another: other laboratories may have plugs of the same name."""
    return list(zip(frame["laboratory"], frame["plug"], frame["depth_m"].fillna(-1.0), strict=True))


def _ends_of_core(
    connection: sa.Connection, identities: store.Identities, well: int
) -> dict[str, tuple[float, float]]:
    """Top and base [m] of what came out of each run: the loss lies at its base unless the record says top."""
    numbers = [n for n, owner in identities.owners["run"].items() if owner == well]
    made = {}
    for row in store.in_force(connection, "core runs", numbers, by="run_id").to_dict("records"):
        top, base = float(row["top_depth_m"]), float(row["base_depth_m"])
        lost = max(base - top - float(row["recovered_length_m"]), 0.0)
        ends = (top + lost, base) if row["loss_at"] == "top" else (top, base - lost)
        made[store.name_key(identities.name("run", int(row["run_id"])))] = ends
    return made


_STATISTICS = (
    "count", "minimum", "maximum", "arithmetic mean", "geometric mean", "harmonic mean", "median",
    "standard deviation", "coefficient of variation",
)  # fmt: skip


def _means(values: Array, weights: Array, there: NDArray[np.bool_]) -> dict[str, Any]:
    there = there & (weights > 0)
    x, w = values[there], weights[there]
    if not len(x):
        return dict.fromkeys(("arithmetic mean", "geometric mean", "harmonic mean"))
    three = averages.means(x, w) if (x > 0).all() else None
    return {
        "arithmetic mean": averages.weighted_mean(x, w),
        "geometric mean": float(three.geometric) if three else None,
        "harmonic mean": float(three.harmonic) if three else None,
    }


def _statistics(values: Array, stated: Array, weights: Array, there: NDArray[np.bool_]) -> dict[str, Any]:
    """Means and spread by weight; the extremes are of what was stated, never of a value filled in."""
    there = there & (weights > 0)
    x, w = values[there], weights[there]
    if not len(x):
        return {"count": 0, **dict.fromkeys(_STATISTICS[1:])}
    positive = bool((x > 0).all())
    mean = averages.weighted_mean(x, w)
    sd = _finite(averages.weighted_sd(x, w))
    cv = sd / mean if sd is not None and mean else None
    made: dict[str, Any] = {
        "count": len(x),
        "minimum": float(stated[there].min()),
        "maximum": float(stated[there].max()),
        **_means(values, weights, there),
        "median": float(averages.weighted_quantiles(x, w, 0.5)),
        "standard deviation": sd,
        "coefficient of variation": cv,
        "quantiles": {
            f"P{q * 100:g}": float(v)
            for q, v in zip(QUANTILES, averages.weighted_quantiles(x, w, QUANTILES), strict=True)
        },
        "power mean 1/3": float(averages.power_mean(x, w, 1 / 3)) if positive else None,
        "confidence": None,
    }
    if len(x) >= 3:
        intervals = averages.bootstrap_intervals(x, w, RESAMPLES, SEED)
        made["confidence"] = {name: list(ends) for name, ends in intervals.items()}
    if cv is not None:
        made["variation"] = heterogeneity.variation_class(cv)
        made["samples for 20 %"] = heterogeneity.samples_needed(cv)
        made["tolerance of the mean [%]"] = heterogeneity.tolerance_percent(cv, averages.effective_count(w))
    return made


def _heterogeneity(
    k: Array,
    phi: Array,
    w: Array,
    positive: NDArray[np.bool_],
    both: NDArray[np.bool_],
    depth: Array,
    unit: str,
) -> dict[str, Any]:
    made: dict[str, Any] = {
        "dykstra-parsons coefficient": None,
        "dykstra-parsons convention": heterogeneity.CONVENTIONS[CONVENTION] + ", every plug alike",
        "dykstra-parsons confidence": None,
        "dykstra-parsons by other conventions": None,
        "lorenz coefficient": None,
        "lorenz by permeability": None,
        "stratigraphic lorenz": None,
    }
    known = k[positive]
    if len(known) >= 3:
        made["dykstra-parsons coefficient"] = heterogeneity.dykstra_parsons(known, CONVENTION)
        made["dykstra-parsons confidence"] = list(
            heterogeneity.dykstra_parsons_interval(known, RESAMPLES, SEED)
        )
        made["dykstra-parsons by other conventions"] = {
            words: _finite(heterogeneity.dykstra_parsons(known, convention))
            for convention, words in heterogeneity.CONVENTIONS.items()
            if convention != CONVENTION
        }
    if both.sum() >= 2:
        layers = k[both], phi[both], w[both]
        made["lorenz coefficient"] = float(heterogeneity.lorenz(*layers).coefficient)
        made["lorenz by permeability"] = float(heterogeneity.lorenz_by_permeability(*layers).coefficient)
        curve = heterogeneity.stratigraphic_lorenz(*layers)
        made["stratigraphic lorenz"] = {
            "coefficient": float(curve.coefficient),
            f"depth [{unit}]": [_finite(d) for d in depth[both]],
            "flow capacity share": curve.flow.tolist(),
            "storage capacity share": curve.storage.tolist(),
        }
    return made


def _vertical(
    part: pd.DataFrame, vertical: pd.DataFrame, k: Array, positive: NDArray[np.bool_]
) -> dict[str, Any]:
    """Vertical over horizontal permeability, of plugs of one sample point and of the layers."""
    horizontal = pd.DataFrame(
        {"plug": part["plug"], "laboratory": part["laboratory"], "depth": part["depth_m"], "k": k}
    )[positive & (part["orientation"] != "vertical").to_numpy()]
    across = vertical[vertical[_K] > 0]
    by_name = {
        (lab, store.name_key(p)): kh
        for p, lab, kh in zip(horizontal["plug"], horizontal["laboratory"], horizontal["k"], strict=True)
    }
    there = set(zip(part["laboratory"], part["plug"].map(store.name_key), strict=True))
    depths = horizontal["depth"].to_numpy(dtype=np.float64)
    pairs: list[tuple[float, float]] = []
    for row in across.to_dict("records"):
        lab = row["laboratory"]
        kh = by_name.get((lab, store.name_key(row["companion"]))) if row["companion"] else None
        sibling = (lab, _sibling(row["plug"]))
        kh = kh or by_name.get(sibling)
        if kh is None and sibling not in there and len(depths):
            near = np.where(horizontal["laboratory"] == lab, np.abs(depths - row["depth_m"]), np.inf)
            nearest = int(np.argmin(near))
            kh = float(horizontal["k"].iloc[nearest]) if near[nearest] <= _SAME_POINT_M else None
        if kh:
            pairs.append((row[_K], kh))
    made: dict[str, Any] = {
        "vertical to horizontal ratio": None,
        "vertical to horizontal convention": "geometric mean of the ratios of plugs of one sample point",
        "vertical to horizontal pairs": len(pairs),
        "vertical to horizontal of layers": None,
    }
    across_md: Array = across[_K].to_numpy(dtype=np.float64)
    along_md: Array = horizontal["k"].to_numpy(dtype=np.float64)
    if pairs:
        across_md, along_md = np.array(pairs).T
        r = across_md / along_md
        made["vertical to horizontal ratio"] = float(np.exp(np.log(r).mean()))
        made["vertical to horizontal median"] = float(np.median(r))
        made["vertical above horizontal"] = int((r > 1).sum())
    if len(along_md):
        arithmetic = float(averages.means(along_md, np.ones(len(along_md))).arithmetic)
        layers = across_md if len(across_md) else along_md
        made["vertical to horizontal of layers"] = (
            float(averages.means(layers, np.ones(len(layers))).harmonic) / arithmetic
        )
        made["vertical to horizontal of layers convention"] = (
            f"harmonic mean of {'vertical' if len(across_md) else 'the same'} plugs over arithmetic mean of "
            f"horizontal ones{' of the same pairs' if pairs else ''}"
        )
    return made


def _sibling(plug: str) -> str:
    """The key of the horizontal plug of the same sample point: 12V stands beside 12H."""
    key = store.name_key(plug)
    return f"{key[:-1]}h" if key.endswith("v") else ""


def _net(part: pd.DataFrame, phi: Array, k: _Permeability, length: Array, cuts: Cuts) -> dict[str, Any]:
    """Net and pay as shares of the length of the plugs of which the cut-offs can be judged.

    A plug below detection is no net rock where its limit lies at or below the cut-off; where the limit lies
    above, nobody knows.
    """
    sw = part[_SW].to_numpy(dtype=np.float64)

    def shares(cut: Cuts) -> dict[str, float | None]:
        hidden = (k.below & (k.stated > cut.permeability_md)) | (k.above & (k.stated < cut.permeability_md))
        known = np.isfinite(phi) & k.positive & ~hidden
        net = known & ~k.below & (phi >= cut.porosity_frac) & (k.stated >= cut.permeability_md)
        wet = known & np.isfinite(sw)
        gross, judged = float(length[known].sum()), float(length[wet].sum())
        pay = net & wet & (sw <= cut.water_saturation_frac)
        return {
            "net to gross [v/v]": float(length[net].sum()) / gross if gross > 0 else None,
            "pay to gross [v/v]": float(length[pay].sum()) / judged if judged > 0 else None,
            "net rests on": int((known & (length > 0)).sum()),
            "pay rests on": int((wet & (length > 0)).sum()),
        }

    def stated(cut: Cuts) -> dict[str, float]:
        values = (cut.porosity_frac, cut.permeability_md, cut.water_saturation_frac)
        return dict(zip(_CUT_HEADINGS, values, strict=True))

    moved = [
        *(replace(cuts, porosity_frac=min(cuts.porosity_frac * f, 1.0)) for f in _CUT_FACTORS),
        *(replace(cuts, permeability_md=cuts.permeability_md * f) for f in _K_CUT_FACTORS if f != 1.0),
        *(
            replace(cuts, water_saturation_frac=min(cuts.water_saturation_frac * f, 1.0))
            for f in _CUT_FACTORS
            if f != 1.0
        ),
    ]
    found = shares(cuts)
    outcomes = ("net to gross [v/v]", "pay to gross [v/v]")
    return {
        "net to gross [v/v]": found["net to gross [v/v]"],
        "cut-offs": stated(cuts),
        "net to gross sensitivity": [
            {
                **stated(cut),
                **{name: value for name, value in shares(cut).items() if name in outcomes},
            }
            for cut in moved
        ],
        "net rests on": found["net rests on"],
        "pay to gross [v/v]": found["pay to gross [v/v]"],
        "pay rests on": found["pay rests on"],
    }


def _finite(value: Any) -> float | None:
    return float(value) if value is not None and np.isfinite(value) else None
