"""What an interval is like in a few numbers: averages, spread, heterogeneity, net to gross."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
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
#: What may be left out as suspect when asked, and what it means.
SUSPECT = {
    "crushed": "crush likelihood likely, or judged crushed",
    "cracked": "described as cracked, powdered, crumbled or disked",
    "flagged": "a reading asks for a second look, or an instrument is in doubt",
}
WEIGHTS = {"count": "every plug alike", "length": "the length that each plug stands for"}
QUANTILES = (0.1, 0.25, 0.5, 0.75, 0.9)
RESAMPLES, SEED = 1000, 20261201
#: Two plugs closer than this are of one sample point: common practice.
_SAME_POINT_M = 0.15
#: A sidewall plug is a point: it stands for no more than a foot (assumed).
_SIDEWALL_M = 0.3048
_CUT_FACTORS = (0.5, 0.75, 1.0, 1.25, 1.5)
_K_CUT_FACTORS = (0.1, 0.3, 1.0, 3.0, 10.0)
_PHI, _K, _SW = "porosity [v/v]", "klinkenberg permeability [mD]", "water saturation [v/v]"
_BELOW = "klinkenberg permeability below limit"
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
    stored = store.settings(connection)
    chosen = _cuts(stored, cuts or {})
    whole = select.interval(connection, identities, well, filters)
    frame = _prepared(connection, identities, well, whole)
    frame, left_out, across = _usable(frame, filters, by)
    suspects = {word: _suspect(frame, word) for word in leave_out}
    doubtful = np.logical_or.reduce([*suspects.values(), np.zeros(len(frame), dtype=np.bool_)])
    for word, mask in suspects.items():
        if mask.any():
            left_out[f"{word}: {SUSPECT[word]}"] = int(mask.sum())
    kept = frame[~doubtful]
    if not len(kept):
        why = "; ".join(f"{count} {reason}" for reason, count in left_out.items())
        raise NotFound(f"No plug of {quoted(well)} is left to summarise" + (f" ({why})." if why else "."))
    columns = {"": None, **{g: g for g in GROUPINGS}}[by]
    made = []
    for name, part, all_of in _groups(kept, frame, columns):
        beside = across if columns in (None, "orientation") else across[_stated(across, columns) == name]
        record = _record(name, part, beside, weights, chosen)
        record["left out"] = {
            "plugs": int(sum(left_out.values())),
            "why": left_out,
            "difference": _difference(part, all_of) if len(all_of) > len(part) else None,
        }
        made.append(record)
    return made


def _groups(
    kept: pd.DataFrame, frame: pd.DataFrame, column: str | None
) -> list[tuple[str, pd.DataFrame, pd.DataFrame]]:
    if column is None:
        return [(ALL, kept, frame)]
    every = _stated(frame, column)
    return [(str(n), part, frame[every == n]) for n, part in kept.groupby(_stated(kept, column), sort=False)]


def _stated(frame: pd.DataFrame, column: str) -> pd.Series:
    return frame[column].where(frame[column] != "", UNSTATED)


def _cuts(stored: Mapping[str, str], given: Mapping[str, float | None]) -> Cuts:
    values = []
    for name in ("porosity", "permeability", "water saturation"):
        typed = given.get(name)
        if typed is not None and not typed >= 0:
            raise Usage(f"A cut-off is a number not below zero; found {typed} for {name}.")
        values.append(lab_settings.number(stored, f"{name} cut-off") if typed is None else float(typed))
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
    )


def _usable(
    frame: pd.DataFrame, filters: select.Filters, by: str
) -> tuple[pd.DataFrame, dict[str, int], pd.DataFrame]:
    """The plugs to summarise, how many were left out and why, and those across the layers for ratios."""
    asked = conditions.parse(filters.where, select.COLUMNS) if filters.where.strip() else None
    named = asked is not None and "orientation" in conditions.named(asked)
    across = frame["orientation"].isin(["vertical", "oblique"])
    by_texture = frame["permeability basis"] == "texture"
    vertical = frame[(frame["orientation"] == "vertical") & ~frame["duplicate"] & ~by_texture]
    reasons = {
        "duplicate of another plug": frame["duplicate"],
        "vertical or oblique (name the orientation in --where, or use --by orientation)": across
        & (not named and by != "orientation"),
    }
    keep = np.ones(len(frame), dtype=np.bool_)
    left_out: dict[str, int] = {}
    for reason, mask in reasons.items():
        out = keep & mask.to_numpy(dtype=np.bool_)
        if out.any():
            left_out[reason] = int(out.sum())
        keep &= ~out
    used = frame[keep].copy()
    texture = by_texture[keep]
    if texture.any():
        left_out["permeability estimated from texture (the plug's porosity stays)"] = int(texture.sum())
        used.loc[texture, _K] = np.nan
    return used, left_out, vertical


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


def _record(
    name: str, part: pd.DataFrame, vertical: pd.DataFrame, weights: str, cuts: Cuts
) -> dict[str, Any]:
    part = part.sort_values("depth_m", kind="stable")
    unit = "ft" if "depth [ft]" in part.columns else "m"
    depth = part[f"depth [{unit}]"]
    length = _lengths(part)
    w = length if weights == "length" else np.ones(len(part))
    phi = part[_PHI].to_numpy(dtype=np.float64)
    k = part[_K].to_numpy(dtype=np.float64)
    measured = np.isfinite(k)
    zero = measured & (k <= 0)
    positive = measured & ~zero
    below = part["below"].to_numpy(dtype=np.bool_) & positive
    filled = k.copy()
    method = ""
    if positive.any():
        censored = averages.filled_below_detection(k[positive], below[positive])
        filled[positive], method = censored.values, censored.method
    both = positive & (phi > 0)
    record: dict[str, Any] = {
        "group": name,
        "plugs": len(part),
        f"top depth [{unit}]": _finite(depth.min()),
        f"base depth [{unit}]": _finite(depth.max()),
        "porosity": _statistics(phi, w, np.isfinite(phi)),
        "klinkenberg permeability": _statistics(filled, w, positive)
        | {
            "zero": int(zero.sum()),
            "below detection": int(below.sum()),
            "not measured": int((~measured).sum()),
            "below detection taken as": method,
        },
        **_heterogeneity(filled, phi, w, both),
        **_vertical(part, vertical, filled, positive),
        "flow capacity [mD.m]": float(np.sum(filled[both] * length[both])) if both.any() else None,
        "storage capacity [m]": float(np.sum(phi[both] * length[both])) if both.any() else None,
        **_net(part, phi, filled, length, cuts),
        "weights": f"{weights}: {WEIGHTS[weights]}",
        "length represented [m]": float(length.sum()),
    }
    return record


def _lengths(part: pd.DataFrame) -> Array:
    """What each plug stands for, run by run and laboratory by laboratory [m]."""
    length = np.zeros(len(part))
    depth = part["depth_m"].to_numpy(dtype=np.float64)
    for _, places in part.reset_index(drop=True).groupby(["laboratory", "run"], sort=False).indices.items():
        known = places[np.isfinite(depth[places])]
        if len(known):
            length[known] = averages.lengths_represented(depth[known])
    shot = part["source"].str.contains("sidewall", regex=False).to_numpy(dtype=np.bool_)
    length = np.where(shot, np.minimum(length, _SIDEWALL_M), length)
    return np.where(length > 0, length, 1e-9)


def _statistics(values: Array, weights: Array, there: NDArray[np.bool_]) -> dict[str, Any]:
    x, w = values[there], weights[there]
    names = (
        "count", "minimum", "maximum", "arithmetic mean", "geometric mean", "harmonic mean", "median",
        "standard deviation", "coefficient of variation",
    )  # fmt: skip
    if not len(x):
        return {"count": 0, **dict.fromkeys(names[1:])}
    positive = bool((x > 0).all())
    three = averages.means(x, w) if positive else None
    mean = averages.weighted_mean(x, w)
    sd = float(x.std(ddof=1)) if len(x) > 1 else None
    cv = sd / mean if sd is not None and mean else None
    made: dict[str, Any] = dict(
        zip(
            names,
            (
                len(x),
                float(x.min()),
                float(x.max()),
                mean,
                float(three.geometric) if three else None,
                float(three.harmonic) if three else None,
                float(np.median(x)),
                sd,
                cv,
            ),
            strict=True,
        )
    )
    made["quantiles"] = {
        f"P{q * 100:g}": float(v) for q, v in zip(QUANTILES, np.quantile(x, QUANTILES), strict=True)
    }
    made["power mean 1/3"] = float(averages.power_mean(x, w, 1 / 3)) if positive else None
    made["confidence"] = _bootstrap(x, w, positive)
    if cv is not None:
        made["variation"] = heterogeneity.variation_class(cv)
        made["samples for 20 %"] = heterogeneity.samples_needed(cv)
        made["tolerance of the mean [%]"] = heterogeneity.tolerance_percent(cv, len(x))
    return made


def _bootstrap(x: Array, w: Array, positive: bool) -> dict[str, list[float]] | None:
    """95 % intervals of means and median by resampling plugs, always the same resamples."""
    if len(x) < 3:
        return None
    drawn = np.random.default_rng(SEED).integers(0, len(x), size=(RESAMPLES, len(x)))
    values, weights = x[drawn], w[drawn]
    total = weights.sum(axis=1)
    found = {"arithmetic mean": (values * weights).sum(axis=1) / total, "median": np.median(values, axis=1)}
    if positive:
        found["geometric mean"] = np.exp((np.log(x)[drawn] * weights).sum(axis=1) / total)
    return {name: np.quantile(v, [0.025, 0.975]).tolist() for name, v in found.items()}


def _heterogeneity(k: Array, phi: Array, w: Array, both: NDArray[np.bool_]) -> dict[str, Any]:
    made: dict[str, Any] = {
        "dykstra-parsons coefficient": None,
        "dykstra-parsons convention": heterogeneity.CONVENTIONS[CONVENTION],
        "dykstra-parsons by other conventions": None,
        "lorenz coefficient": None,
        "lorenz by permeability": None,
        "stratigraphic lorenz": None,
    }
    positive = k[np.isfinite(k) & (k > 0)]
    if len(positive) >= 3:
        made["dykstra-parsons coefficient"] = heterogeneity.dykstra_parsons(positive, CONVENTION)
        made["dykstra-parsons by other conventions"] = {
            words: _finite(heterogeneity.dykstra_parsons(positive, convention))
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


def _net(part: pd.DataFrame, phi: Array, k: Array, length: Array, cuts: Cuts) -> dict[str, Any]:
    known = np.isfinite(phi) & np.isfinite(k)
    gross = float(length[known].sum())
    sw = part[_SW].to_numpy(dtype=np.float64)

    def share(least_phi: float, least_k: float) -> float | None:
        net = known & (phi >= least_phi) & (k >= least_k)
        return float(length[net].sum() / gross) if gross > 0 else None

    net = known & (phi >= cuts.porosity_frac) & (k >= cuts.permeability_md)
    wet = known & np.isfinite(sw)
    pay = net & wet & (sw <= cuts.water_saturation_frac)
    return {
        "net to gross [v/v]": share(cuts.porosity_frac, cuts.permeability_md),
        "cut-offs": {
            "porosity [v/v]": cuts.porosity_frac,
            "klinkenberg permeability [mD]": cuts.permeability_md,
            "water saturation [v/v]": cuts.water_saturation_frac,
        },
        "net to gross sensitivity": [
            {
                "porosity [v/v]": cuts.porosity_frac * f,
                "klinkenberg permeability [mD]": cuts.permeability_md * g,
                "net to gross [v/v]": share(cuts.porosity_frac * f, cuts.permeability_md * g),
            }
            for f in _CUT_FACTORS
            for g in _K_CUT_FACTORS
            if f == 1.0 or g == 1.0
        ],
        "pay to gross [v/v]": float(length[pay].sum() / length[wet].sum()) if wet.any() else None,
        "pay rests on": int(wet.sum()),
    }


def _difference(part: pd.DataFrame, whole: pd.DataFrame) -> dict[str, Any]:
    """What leaving plugs out does to the main averages: with them, without them."""
    made: dict[str, Any] = {}
    for label, frame in (("without", part), ("with", whole)):
        phi = frame[_PHI].dropna()
        k = frame.loc[frame[_K] > 0, _K]
        made[label] = {
            "plugs": len(frame),
            "porosity arithmetic mean": _finite(phi.mean()) if len(phi) else None,
            "klinkenberg permeability geometric mean": _finite(np.exp(np.log(k).mean())) if len(k) else None,
        }
    return made


def _finite(value: Any) -> float | None:
    return float(value) if value is not None and np.isfinite(value) else None
