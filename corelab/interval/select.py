"""The plugs of an interval and their results: one row a plug, the columns that everyone relies on."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab import units
from corelab.bench import settings as lab_settings
from corelab.bench.outcome import STRESS_NOT_STATED
from corelab.bench.reduce import REPORTED
from corelab.bench.texture import TEXTURE
from corelab.errors import NotFound, Usage, did_you_mean, quoted
from corelab.interval import impact, other_labs
from corelab.interval import where as conditions
from corelab.interval.controlled import doubts_of
from corelab.interval.frozen import released_words, shown_results
from corelab.interval.stress import equivalent_stress_mpa, near, with_interpolated
from corelab.quantities import RESULTS
from corelab.records import logs, store
from corelab.sheets.readings import DIRECTIONS, GASES

#: Headings of an interval, in order; depths in metres until a unit is asked for.
COLUMNS = (
    "well",
    "plug",
    "source",
    "laboratory",
    "run",
    "depth [m]",
    "depth basis",
    "log depth [m]",
    "orientation",
    "facies",
    "lithology",
    "bulk volume [cm3]",
    "grain volume [cm3]",
    "pore volume [cm3]",
    "dry mass [g]",
    "porosity [v/v]",
    "porosity route",
    "porosity stress [MPa]",
    "grain density [g/cm3]",
    "bulk density [g/cm3]",
    "gas permeability [mD]",
    "gas",
    "mean pressure [kPa]",
    "klinkenberg permeability [mD]",
    "slip factor [kPa]",
    "slip basis",
    "permeability basis",
    "permeability stress [MPa]",
    "oil saturation [v/v]",
    "water saturation [v/v]",
    "gas saturation [v/v]",
    "crush likelihood [v/v]",
    "crush verdict",
    "status",
    "flags",
)
REGISTERED = COLUMNS[: COLUMNS.index("lithology") + 1]
DEPTH_COLUMNS = ("depth [m]", "log depth [m]")
COMPUTED = tuple(c for c in COLUMNS if conditions.bare(c) in RESULTS)
TEXT_COLUMNS = frozenset(c for c in COLUMNS if "[" not in c)
_VOLUMES = (
    "bulk volume",
    "grain volume",
    "pore volume",
    "dry mass",
    "porosity",
    "grain density",
    "bulk density",
)
_SATURATIONS = ("oil saturation", "water saturation", "gas saturation")
#: What changes with the net confining stress; masses, grains and the ambient saturations do not.
_UNDER_STRESS = frozenset({"bulk volume", "pore volume", "porosity", "bulk density"})
#: A depth typed in feet comes back as typed, without the last bits of two conversions.
_DEPTH_DECIMALS = 9


@dataclass(frozen=True, slots=True)
class Filters:
    """What of a well is asked for; depths in `unit`, inclusive."""

    top: float | None = None
    base: float | None = None
    depth: str = ""  # driller, log, or empty: each plug's own
    unit: str = ""  # m, ft, or empty: the well's own
    where: str = ""
    stress_mpa: float | None = None
    with_uncertainty: bool = False
    poisson_ratio: float | None = None  # the stress asked for is uniaxial; else hydrostatic
    own_only: bool = False  # without other laboratories' plugs


def natural_key(name: str) -> tuple[Any, ...]:
    """Sort key under which 2H stands before 10H."""
    parts = re.split(r"(\d+)", name.casefold())
    return tuple((0, int(p), "") if p.isdecimal() else (1, 0, p) for p in parts if p)


def well_id(identities: store.Identities, name: str) -> int:
    """The number of a well.

    Raises
    ------
    NotFound
        If there is none of this name; tells the nearest.
    """
    found = identities.find("well", name)
    if found is None:
        known = sorted((w for w in identities.known("well") if w != "standards"), key=natural_key)
        raise NotFound(f"There is no well {quoted(name)}; {did_you_mean(name, known)}")
    return found


def plug_id(identities: store.Identities, well: str, plug: str) -> int:
    owner = well_id(identities, well)
    found = identities.find("plug", plug, owner)
    if found is None:
        known = sorted(identities.known("plug", owner), key=natural_key)
        raise NotFound(f"There is no plug {quoted(plug)} in well {quoted(well)}; {did_you_mean(plug, known)}")
    return found


def plugs_of_well(identities: store.Identities, well: int) -> list[int]:
    return [number for number, owner in identities.owners["plug"].items() if owner == well]


def depth_unit(facts: pd.DataFrame, stored: Mapping[str, str], asked: str = "") -> str:
    """The unit in which a well's depths are answered."""
    if asked and asked not in {"m", "ft"}:
        raise Usage(f"--unit is m or ft, not {quoted(asked)}.")
    if asked:
        return asked
    return str(facts["depth_unit"].iloc[-1]) if len(facts) else lab_settings.value(stored, "depth unit")


def interval(
    connection: sa.Connection, identities: store.Identities, well: str, filters: Filters
) -> pd.DataFrame:
    """One row a plug that passes the filters, by depth and then by name.

    Returns
    -------
    DataFrame
        The columns `COLUMNS`, depths in the unit asked for; NaN or empty text for what is not there.
    """
    if filters.depth and filters.depth not in {"driller", "log"}:
        raise Usage(f"--depth is driller or log, not {quoted(filters.depth)}.")
    for option, given in (("top", filters.top), ("base", filters.base), ("stress", filters.stress_mpa)):
        if given is not None and not math.isfinite(given):
            raise Usage(f"--{option} is a number; found {given}.")
    if filters.stress_mpa is not None and filters.stress_mpa < 0:
        raise Usage(f"--stress is a net confining stress, not below zero; found {filters.stress_mpa:g} MPa.")
    if filters.top is not None and filters.base is not None and filters.top > filters.base:
        raise Usage(f"The top, {filters.top:g}, lies below the base, {filters.base:g}: exchange them.")
    condition = conditions.parse(filters.where, COLUMNS) if filters.where.strip() else None
    number = well_id(identities, well)
    stored = store.settings(connection)
    well_facts = store.in_force(connection, "wells", [number], by="well_id")
    unit = depth_unit(well_facts, stored, filters.unit)
    stress_mpa = filters.stress_mpa
    if filters.poisson_ratio is not None:
        if stress_mpa is None:
            raise Usage("A uniaxial stress needs its value: --stress MPA with --uniaxial POISSON.")
        if not 0.0 <= filters.poisson_ratio < 0.5:
            raise Usage(f"Poisson's ratio lies from 0 to below 0.5; found {filters.poisson_ratio:g}.")
        stress_mpa = equivalent_stress_mpa(stress_mpa, filters.poisson_ratio)
    frame = of_well(connection, identities, number, stored, filters.depth, stress_mpa)
    if (frame["source"] == impact.PERCUSSION).any():
        plain = frame if stress_mpa is None else of_well(connection, identities, number, stored)
        impact.add_columns(frame, impact.of_well(connection, number, plain, stored))
    if not filters.own_only:
        frame = _with_others(frame, connection, identities, number, filters.depth, stress_mpa)
    if unit != "m":
        metre, target = units.unit("m", "length"), units.unit(unit, "length")
        for column in DEPTH_COLUMNS:
            converted = units.convert(frame[column].to_numpy(dtype=np.float64), metre, target)
            frame[column] = np.round(converted, _DEPTH_DECIMALS)
    keep = np.ones(len(frame), dtype=np.bool_)
    depth = frame["depth [m]"].to_numpy(dtype=np.float64)
    slack = 1e-9 * np.maximum(1.0, np.abs(depth))
    if filters.top is not None:
        keep &= depth >= filters.top - slack
    if filters.base is not None:
        keep &= depth <= filters.base + slack
    if condition is not None:
        keep &= conditions.apply(condition, frame)
    names = frame["plug"].tolist()
    kept: list[int] = np.flatnonzero(keep).tolist()
    order = sorted(kept, key=lambda i: (np.nan_to_num(depth[i], nan=np.inf), natural_key(names[i])))
    headings = list(COLUMNS)
    if filters.with_uncertainty:
        headings = [h for c in COLUMNS for h in ((c, f"u {c}") if c in COMPUTED else (c,))]
    shown = frame.iloc[order][headings].reset_index(drop=True)
    return shown.rename(columns={c: c.replace("[m]", f"[{unit}]") for c in DEPTH_COLUMNS})


def laboratory_of(connection: sa.Connection, well_facts: pd.DataFrame, stored: Mapping[str, str]) -> str:
    """The laboratory whose own results of a well these are: of its job, else of the settings."""
    laboratory = lab_settings.value(stored, "laboratory name")
    if len(well_facts) and not pd.isna(well_facts["job_id"].iloc[-1]):
        jobs = store.in_force(connection, "jobs", [int(well_facts["job_id"].iloc[-1])], "job_id")
        laboratory = str(jobs["laboratory"].iloc[-1]) if len(jobs) else laboratory
    return laboratory


def of_well(
    connection: sa.Connection,
    identities: store.Identities,
    well: int,
    stored: Mapping[str, str],
    depth: str = "",
    stress_mpa: float | None = None,
) -> pd.DataFrame:
    """Every plug of a well with `plug_id` and its results, in metres; the crush columns still empty."""
    facts = store.in_force(connection, "wells", [well], by="well_id")
    frame = _facts(connection, identities, well, facts, stored)
    _place(frame, depth, logs.shifts(connection, well))
    _add_results(frame, connection, identities, stored, stress_mpa)
    return frame


def _latest_text(frame: pd.DataFrame, by: str, column: str) -> dict[int, str]:
    return {int(i): v or "" for i, v in zip(frame[by], frame[column], strict=True)}


def _facts(
    connection: sa.Connection,
    identities: store.Identities,
    well: int,
    well_facts: pd.DataFrame,
    stored: Mapping[str, str],
) -> pd.DataFrame:
    """What is registered of each plug of a well: depth in metres on its own basis."""
    ids = plugs_of_well(identities, well)
    plugs = store.in_force(connection, "plugs", ids)
    descriptions = store.in_force(connection, "descriptions", ids)
    runs = _runs(connection, identities, well)
    guns = [n for n, o in identities.owners["gun_run"].items() if o == well]
    shots = store.in_force(connection, "sidewall shots", guns, "gun_run_id")
    lithology = _latest_text(descriptions, "plug_id", "lithology")
    of_shot = {
        (int(g), s.casefold()): (t, b)
        for g, s, t, b in zip(
            shots["gun_run_id"], shots["shot"], shots["tool"], shots["depth_basis"], strict=True
        )
    }
    laboratory = laboratory_of(connection, well_facts, stored)
    spans = _spans(runs)
    rows: list[dict[str, Any]] = []
    for plug in plugs.to_dict("records"):
        source, basis, run = plug["from"], "driller", ""
        gun, run_id = None, None
        if source == "sidewall":
            gun = None if pd.isna(plug["gun_run_id"]) else int(plug["gun_run_id"])
            tool, basis = of_shot.get((gun or 0, (plug["shot"] or "").casefold()), ("", "log"))
            source = f"{tool} sidewall" if tool else "sidewall, tool not recorded"
            run = identities.name("gun run", gun) if gun is not None else ""
        elif not pd.isna(plug["run_id"]):
            run_id = int(plug["run_id"])
        else:
            run_id = _run_at(spans, plug["depth_m"])
        if run_id is not None:
            run = identities.name("run", run_id)
        rows.append(
            {
                "plug_id": int(plug["plug_id"]),
                "run_id": run_id,
                "gun_run_id": gun,
                "well": identities.name("well", well),
                "plug": identities.name("plug", int(plug["plug_id"])),
                "source": source,
                "laboratory": laboratory,
                "run": run,
                "depth [m]": plug["depth_m"],
                "depth basis": basis,
                "orientation": plug["orientation"] or "",
                "facies": plug["facies"] or "",
                "lithology": lithology.get(int(plug["plug_id"]), ""),
            }
        )
    columns = ["plug_id", "run_id", "gun_run_id", *REGISTERED]
    numbers = dict.fromkeys(("run_id", "gun_run_id", "depth [m]", "log depth [m]"), "float64")
    return pd.DataFrame(rows, columns=columns).astype(numbers)


def _runs(connection: sa.Connection, identities: store.Identities, well: int) -> pd.DataFrame:
    numbers = [n for n, o in identities.owners["run"].items() if o == well]
    return store.in_force(connection, "core runs", numbers, "run_id")


def _spans(runs: pd.DataFrame) -> list[tuple[float, float, int]]:
    return [
        (float(top), float(base), int(run))
        for top, base, run in zip(runs["top_depth_m"], runs["base_depth_m"], runs["run_id"], strict=True)
    ]


def _with_others(
    frame: pd.DataFrame,
    connection: sa.Connection,
    identities: store.Identities,
    well: int,
    depth: str,
    stress_mpa: float | None,
) -> pd.DataFrame:
    """The frame with other laboratories' plugs below, on the same headings."""
    spans = _spans(_runs(connection, identities, well))

    def run_at(depth_m: float) -> str:
        run = _run_at(spans, depth_m)
        return "" if run is None else identities.name("run", run)

    theirs = other_labs.rows(
        connection,
        well,
        identities.name("well", well),
        stress_mpa,
        _UNDER_STRESS,
        [conditions.bare(c) for c in COMPUTED],
        run_at,
    )
    if not len(theirs):
        return frame
    runs = [identities.find("run", run, well) if run else None for run in theirs["run"]]
    theirs = theirs.assign(run_id=pd.Series(runs, dtype="float64").to_numpy(), gun_run_id=np.nan)
    _place(theirs, depth, logs.shifts(connection, well))
    theirs = theirs.reindex(columns=frame.columns)
    for column in TEXT_COLUMNS & set(frame.columns):
        theirs[column] = pd.Series(["" if pd.isna(text) else text for text in theirs[column]])
    if not len(frame):
        return theirs
    return pd.concat([frame, theirs], ignore_index=True)


def _run_at(spans: Sequence[tuple[float, float, int]], depth_m: float) -> int | None:
    """The run that holds a depth, where only one does."""
    inside = [run for top, base, run in spans if top <= depth_m <= base]
    return inside[0] if len(inside) == 1 else None


def _place(frame: pd.DataFrame, asked: str, shifts: pd.DataFrame) -> None:
    """Depths on the basis asked for where they are known on it, else on the plug's own.

    A core plug's log depth is its driller's depth and the shift of its run; a shot carries log depth, and
    the shift of its descent where one is known.
    """
    own_log = (frame["depth basis"] == "log").to_numpy()
    core = shifts.set_index("run_id")["shift_m"]
    gun = shifts.set_index("gun_run_id")["shift_m"]
    depth = frame["depth [m]"].to_numpy(dtype=np.float64)
    by_core = frame["run_id"].map(core[core.index.notna()]).to_numpy(dtype=np.float64)
    by_gun = frame["gun_run_id"].map(gun[gun.index.notna()]).to_numpy(dtype=np.float64)
    frame["log depth [m]"] = np.where(own_log, depth + np.nan_to_num(by_gun), depth + by_core)
    unsure = shifts[shifts["certain"] == 0]
    frame["unsure"] = frame["run_id"].isin(unsure["run_id"].dropna()) | frame["gun_run_id"].isin(
        unsure["gun_run_id"].dropna()
    )
    if asked == "log":
        known = frame["log depth [m]"].notna().to_numpy()
        frame["depth [m]"] = np.where(known, frame["log depth [m]"], frame["depth [m]"])
        frame["depth basis"] = np.where(known, "log", frame["depth basis"])


def _add_results(
    frame: pd.DataFrame,
    connection: sa.Connection,
    identities: store.Identities,
    stored: Mapping[str, str],
    stress_mpa: float | None,
) -> None:
    ids = frame["plug_id"].to_numpy(dtype=np.int64)
    now = store.results(connection, set(ids.tolist()))
    results, status = shown_results(connection, now, set(ids.tolist()))
    place = pd.Series(np.arange(len(ids)), index=ids)
    results = results.assign(place=place.reindex(results["plug_id"]).to_numpy())
    if stress_mpa is not None:
        results = with_interpolated(results, stress_mpa)
    for column in COLUMNS[len(REGISTERED) :]:
        frame[column] = "" if column in TEXT_COLUMNS else np.nan
    for column in COMPUTED:
        frame[f"u {column}"] = np.nan
    frame["crush verdict"] = np.where(frame["source"] == "percussion sidewall", "not assessed", "")
    frame["status"] = status.reindex(ids).to_numpy()
    doubts: list[dict[str, None]] = [{} for _ in range(len(frame))]
    reasons: list[dict[str, list[str]]] = [{} for _ in range(len(frame))]
    for place_of in np.flatnonzero(frame["unsure"].to_numpy(dtype=np.bool_)):
        doubts[int(place_of)]["log depth uncertain"] = None
    for quantity in (*_VOLUMES, *_SATURATIONS):
        candidates = results[results["quantity"] == quantity]
        chosen = _one_stress(candidates, stress_mpa if quantity in _UNDER_STRESS else None)
        _put(frame, chosen, quantity, doubts, reasons)
        if quantity == "porosity":
            there = chosen[chosen["value"].notna()]
            at = there["place"].to_numpy(dtype=np.intp)
            _set(frame, "porosity route", at, there["basis"].to_numpy())
            _set(frame, "porosity stress [MPa]", at, there["stress_mpa"].to_numpy())
    _add_permeability(frame, results, stored, stress_mpa, doubts, reasons)
    for number, said in doubts_of(connection, identities, stored, ids.tolist()).items():
        doubts[int(place[number])] |= dict.fromkeys(said)
    for number, words in released_words(connection, now, set(ids.tolist())).items():
        doubts[int(place[number])][words] = None
    for number, words in store.crush_verdicts(connection, set(ids.tolist())):
        doubts[int(place[number])][words] = None
    frame["flags"] = [_joined(d, r) for d, r in zip(doubts, reasons, strict=True)]


def _set(frame: pd.DataFrame, column: str, at: NDArray[np.intp], values: Any) -> None:
    array = frame[column].to_numpy(copy=True)
    array[at] = values
    frame[column] = array


def _one_stress(candidates: pd.DataFrame, stress_mpa: float | None, *then: str) -> pd.DataFrame:
    """One row a plug: at the stress asked for, else the lowest at which there is a value.

    A plug without a value at the stress asked for keeps a row without one, which says why. `then` are
    columns that order rows of one stress.
    """
    rows = candidates.assign(missing=candidates["value"].isna())
    if stress_mpa is not None:
        there = _stressed(rows, stress_mpa) & ~rows["missing"]
        reason = rows["reason"].where(rows["missing"], f"not measured at {stress_mpa:g} MPa")
        rows = rows.assign(
            missing=~there,
            stress_mpa=rows["stress_mpa"].where(there),
            away=(rows["stress_mpa"] - stress_mpa).abs().where(there),
            value=rows["value"].where(there),
            uncertainty=rows["uncertainty"].where(there),
            flags=rows["flags"].where(there, ""),
            reason=reason.where(~there, ""),
        )
    else:
        rows = rows.assign(away=rows["stress_mpa"])
    return rows.sort_values(["place", "missing", "away", *then], kind="stable").drop_duplicates("place")


def _stressed(rows: pd.DataFrame, stress_mpa: float) -> pd.Series[bool]:
    """Which results were measured at a stress; one whose stress is not stated was measured at none."""
    return near(rows["stress_mpa"], stress_mpa) & ~rows["flags"].str.contains(
        STRESS_NOT_STATED, regex=False
    ).astype(bool)


def _put(
    frame: pd.DataFrame,
    chosen: pd.DataFrame,
    quantity: str,
    doubts: list[dict[str, None]],
    reasons: list[dict[str, list[str]]],
) -> None:
    column = RESULTS[quantity].stored_heading
    at = chosen["place"].to_numpy(dtype=np.intp)
    _set(frame, column, at, chosen["value"].to_numpy())
    _set(frame, f"u {column}", at, chosen["uncertainty"].to_numpy())
    for place, flags, reason in zip(at, chosen["flags"], chosen["reason"], strict=True):
        for flag in flags.split("; ") if flags else ():
            doubts[place][flag] = None
        if reason:
            reasons[place].setdefault(reason, []).append(quantity)


def _joined(doubts: Mapping[str, None], reasons: Mapping[str, Sequence[str]]) -> str:
    parts = list(doubts)
    for reason, quantities in reasons.items():
        names = list(quantities)
        if set(_SATURATIONS) <= set(names):
            names = [n for n in names if n not in _SATURATIONS] + ["saturations"]
        parts.append(f"{', '.join(names)}: {reason}")
    return "; ".join(parts)


def _add_permeability(
    frame: pd.DataFrame,
    results: pd.DataFrame,
    stored: Mapping[str, str],
    stress_mpa: float | None,
    doubts: list[dict[str, None]],
    reasons: list[dict[str, list[str]]],
) -> None:
    """Klinkenberg permeability of the line chosen for each plug, with the gas step that goes with it.

    Chosen first by stress, then along the plug before across it, regressed before reported before
    estimated, nitrogen before air before helium.
    """
    rank_direction = {d: i for i, d in enumerate(("", *DIRECTIONS))}
    rank_basis = {"measured": 0, "reported": 1, "estimated": 2}
    rank_gas = {g: i for i, g in enumerate(("nitrogen", "air", "helium", "reported"))}
    k = results[results["quantity"] == "klinkenberg permeability"]
    # An estimate from texture stands only where nothing was measured or reported.
    by_texture = k["step"] == TEXTURE
    known = k.loc[~by_texture & k["value"].notna(), "place"]
    k = k[~by_texture | (~k["place"].isin(known) & (stress_mpa is None))]
    slips = results[results["quantity"] == "slip factor"]
    key = ["place", "direction", "stress_mpa", "step"]
    slips = slips.set_index(key)[["value", "uncertainty", "basis"]].add_prefix("slip_")
    k = k.join(slips, on=key)
    k = k.assign(
        by_direction=k["direction"].map(rank_direction).fillna(9),
        by_basis=k["slip_basis"].map(rank_basis).fillna(1),
        by_gas=k["step"].map(rank_gas).fillna(9),
    )
    k = _one_stress(k, stress_mpa, "by_direction", "by_basis", "by_gas")
    _put(frame, k, "klinkenberg permeability", doubts, reasons)
    there = k[k["value"].notna()]
    at = there["place"].to_numpy(dtype=np.intp)
    _set(frame, "slip factor [kPa]", at, there["slip_value"].to_numpy())
    _set(frame, "u slip factor [kPa]", at, there["slip_uncertainty"].to_numpy())
    slip_there = there["slip_value"].notna().to_numpy()
    from_gas = there["flags"].str.contains("slip estimated").to_numpy(dtype=np.bool_)
    basis = np.where(
        slip_there, there["slip_basis"].fillna(""), np.where(from_gas, "estimated", there["basis"])
    )
    _set(frame, "slip basis", at, basis)
    reported = (there["step"] == REPORTED).to_numpy()
    texture = (there["step"] == TEXTURE).to_numpy()
    basis = np.where(texture, "texture", np.where(reported, "reported", "measured"))
    _set(frame, "permeability basis", at, basis)
    stated = ~there["flags"].str.contains(STRESS_NOT_STATED, regex=False).to_numpy(dtype=np.bool_)
    _set(frame, "permeability stress [MPa]", at, np.where(stated & ~texture, there["stress_mpa"], np.nan))
    _add_step(frame, results, k, lab_settings.number(stored, "reporting mean pressure"), stress_mpa, doubts)
    known = frame["klinkenberg permeability [mD]"].notna()
    gas = frame["gas permeability [mD]"].notna()
    for column, wanted in (
        ("gas permeability [mD]", known),
        ("mean pressure [kPa]", gas),
        ("slip factor [kPa]", known),
    ):
        for place in np.flatnonzero(wanted & frame[column].isna()):
            by_instrument = frame["permeability basis"].iat[int(place)] == "reported"
            reason = "not reported by the instrument" if by_instrument else "not measured"
            reasons[place].setdefault(reason, []).append(conditions.bare(column))


def _add_step(
    frame: pd.DataFrame,
    results: pd.DataFrame,
    lines: pd.DataFrame,
    reporting_kpa: float,
    stress_mpa: float | None,
    doubts: list[dict[str, None]],
) -> None:
    """The gas permeability whose mean pressure is nearest the reporting one, of the line that was chosen."""
    key = ["place", "direction", "stress_mpa", "step"]
    steps = results[(results["quantity"] == "gas permeability") & results["value"].notna()]
    pressure = results[results["quantity"] == "mean pressure"].set_index(key)["value"].rename("pressure")
    steps = steps.join(pressure, on=key)
    line = lines[lines["value"].notna()].set_index("place")[["direction", "stress_mpa", "step"]]
    steps = steps.join(line.add_prefix("line_"), on="place")
    own_line = steps["line_stress_mpa"].isna() | (
        (steps["direction"] == steps["line_direction"]) & (steps["stress_mpa"] == steps["line_stress_mpa"])
    )
    same_gas = (
        steps["line_step"].isna() | (steps["basis"] == steps["line_step"]) | ~steps["line_step"].isin(GASES)
    )
    if stress_mpa is not None:
        own_line &= _stressed(steps, stress_mpa)
    steps = steps[own_line & same_gas]
    steps = steps.assign(away=(steps["pressure"] - reporting_kpa).abs().fillna(np.inf))
    steps = steps.sort_values(["place", "stress_mpa", "away", "step"], kind="stable").drop_duplicates("place")
    at = steps["place"].to_numpy(dtype=np.intp)
    _set(frame, "gas permeability [mD]", at, steps["value"].to_numpy())
    _set(frame, "u gas permeability [mD]", at, steps["uncertainty"].to_numpy())
    _set(frame, "mean pressure [kPa]", at, steps["pressure"].to_numpy())
    _set(frame, "gas", at, steps["basis"].to_numpy())
    for place, flags in zip(at, steps["flags"], strict=True):
        for flag in flags.split("; ") if flags else ():
            doubts[place][flag] = None
