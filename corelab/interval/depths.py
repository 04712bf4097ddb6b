"""Matching the depths of core and sidewall descents to logs, and what follows for every plug."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab.errors import NotFound, Usage, did_you_mean, quoted
from corelab.interval import select
from corelab.records import logs, schema, store
from corelab.records.logs import LogCurve
from corelab.science import depth as science

Array = NDArray[np.float64]

#: What a log must show for plug porosity to be matched with it, and whether both rise together.
_LIKE_POROSITY = {"density": -1, "density porosity": 1, "porosity": 1, "neutron porosity": 1}
SEARCH_M = 5.0


@dataclass(frozen=True, slots=True)
class Shift:
    """The shift found for one core run or gun run.

    `detail` has what a reader needs to doubt it: the second peak, by what it was matched, how many samples.
    """

    kind: str  # core or sidewall
    number: int
    run: str
    match: science.Match | None
    curve: LogCurve | None
    by: str
    samples: int
    reason: str
    held: bool = False  # a person's own shift stays

    def record(self) -> dict[str, Any]:
        m = self.match
        second = None if m is None or np.isnan(m.second_shift_m) else m.second_shift_m
        return {
            "run": self.run,
            "kind": self.kind,
            "shift [m]": None if m is None else m.shift_m,
            "standard uncertainty [m]": None if m is None or np.isnan(m.uncertainty_m) else m.uncertainty_m,
            "correlation": None if m is None or np.isnan(m.correlation) else m.correlation,
            "certain": bool(m is not None and m.certain),
            "second shift [m]": second,
            "second correlation": None if second is None or m is None else m.second_correlation,
            "probability": None if m is None or np.isnan(m.probability) else m.probability,
            "matched by": self.by,
            "curve": "" if self.curve is None else self.curve.mnemonic,
            "samples": self.samples,
            "remark": self.reason,
        }


def matched(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    curves: Sequence[LogCurve],
    *,
    curve: str = "",
    search_m: float = SEARCH_M,
) -> list[Shift]:
    """Match every core run and gun run of a well to its logs.

    Raises
    ------
    NotFound
        If there is no core run or no log that could serve, or no curve of the name given.
    """
    number = select.well_id(identities, well)
    if not curves:
        raise NotFound(f"There is no log of {well} yet: corelab read las FILE --well {well}, or --log FILE.")
    if curve:
        names = [c.mnemonic for c in curves]
        curves = [c for c in curves if store.name_key(c.mnemonic) == store.name_key(curve)]
        if not curves:
            raise NotFound(f"The log has no curve {quoted(curve)}; {did_you_mean(curve, names)}")
    gamma = next((c for c in curves if c.quantity == "gamma" and np.isfinite(c.values).any()), None)
    like = [c for c in curves if c.quantity in _LIKE_POROSITY and np.isfinite(c.values).any()]
    if curve and gamma is None and not like:
        gamma = curves[0]  # a person said so
    if gamma is None and not like:
        known = ", ".join(c.mnemonic for c in curves)
        raise NotFound(
            f"None of the curves ({known}) is known for gamma, density or porosity: name one with --curve."
        )
    runs = _runs(connection, identities, number)
    frame = select.interval(connection, identities, well, select.Filters(depth="driller", unit="m"))
    readings = store.in_force(connection, "core gamma", [r for r, *_ in runs], by="run_id") if runs else None
    held = _held(connection, number)
    prepared: list[tuple[float, float, list[tuple[science.Signal, Array, Array]]]] = []
    about: list[tuple[int, str, str, LogCurve | None, int]] = []
    for run, name, top, base, _ in runs:
        own = readings[readings["run_id"] == run] if readings is not None else pd.DataFrame()
        signals, by, used, samples = _signals(own, frame, name, "core", gamma, like)
        prepared.append((top, base, signals))
        about.append((run, name, by, used, samples))
    found = science.match_runs(prepared, search_m) if prepared else []
    shifts = [
        _shift("core", run, name, m, used, by, samples, extra, ("core", run) in held)
        for (run, name, by, used, samples), m, (*_, extra) in zip(about, found, runs, strict=True)
    ]
    for gun, owner in identities.owners["gun_run"].items():
        if owner != number:
            continue
        name = identities.name("gun run", gun)
        signals, by, used, samples = _signals(pd.DataFrame(), frame, name, "sidewall", None, like)
        if signals:
            m, _ = science.match_run(signals, -search_m, search_m)
            shifts.append(_shift("sidewall", gun, name, m, used, by, samples, "", ("sidewall", gun) in held))
    if not shifts:
        raise NotFound(f"{well} has no core run and no sidewall plugs to match.")
    return shifts


def _shift(
    kind: str,
    number: int,
    name: str,
    match: science.Match | None,
    curve: LogCurve | None,
    by: str,
    samples: int,
    extra: str,
    held: bool,
) -> Shift:
    reasons = [extra] if extra else []
    if match is None:
        reasons.append("too few samples on the log to match" if samples else "nothing was measured to match")
    elif match.reason:
        reasons.append(match.reason)
    if held:
        reasons.append("a person's own shift stays")
    return Shift(kind, number, name, match, curve, by, samples, "; ".join(reasons), held)


def _runs(
    connection: sa.Connection, identities: store.Identities, well: int
) -> list[tuple[int, str, float, float, str]]:
    """The core runs from the top down: number, name, top and base of what was recovered, a remark."""
    ids = [n for n, owner in identities.owners["run"].items() if owner == well]
    rows = store.in_force(connection, "core runs", ids, by="run_id").sort_values("top_depth_m", kind="stable")
    made = []
    for row in rows.to_dict("records"):
        top, base, length = row["top_depth_m"], row["base_depth_m"], row["recovered_length_m"]
        remark = ""
        if length > (base - top) * 1.0005:
            remark = "more was recovered than cut: depths of its lower part may lie in the run above"
            length = base - top
        if row["loss_at"] == "top":
            top = base - length
        made.append(
            (int(row["run_id"]), identities.name("run", int(row["run_id"])), top, top + length, remark)
        )
    return made


def _signals(
    gamma_rows: pd.DataFrame,
    frame: pd.DataFrame,
    name: str,
    kind: str,
    gamma: LogCurve | None,
    like: Sequence[LogCurve],
) -> tuple[list[tuple[science.Signal, Array, Array]], str, LogCurve | None, int]:
    """What there is to match a run by: its gamma, else the porosity of its plugs."""
    if gamma is not None and len(gamma_rows) >= science.FEWEST:
        signal = science.Signal(
            gamma_rows["depth_m"].to_numpy(dtype=np.float64),
            gamma_rows["gamma_gapi"].to_numpy(dtype=np.float64),
        )
        return [(signal, gamma.depth_m, gamma.values)], "core gamma", gamma, len(gamma_rows)
    of_run = frame[(frame["run"].map(store.name_key) == store.name_key(name))]
    shot = of_run["source"].str.contains("sidewall", regex=False)
    of_run = of_run[shot if kind == "sidewall" else ~shot]
    phi = of_run["porosity [v/v]"].to_numpy(dtype=np.float64)
    column = "depth [m]" if kind == "core" else "log depth [m]"
    z = of_run[column].to_numpy(dtype=np.float64)
    there = np.isfinite(phi) & np.isfinite(z)
    if there.sum() < science.FEWEST or not like:
        return [], "", None, int(there.sum())
    used = min(like, key=lambda c: list(_LIKE_POROSITY).index(c.quantity))
    signal = science.Signal(z[there], phi[there], _LIKE_POROSITY[used.quantity], smooth=False)
    return [(signal, used.depth_m, used.values)], "plug porosity", used, int(there.sum())


def _held(connection: sa.Connection, well: int) -> set[tuple[str, int]]:
    """The runs that a person gave a shift of its own."""
    frame = logs.shifts(connection, well)
    frame = frame[frame["basis"] == "person"]
    core = {("core", int(r)) for r in frame["run_id"].dropna()}
    return core | {("sidewall", int(r)) for r in frame["gun_run_id"].dropna()}


def keep(change: store.Change, well: int, found: Sequence[Shift]) -> int:
    """Keep the shifts that differ from those there; returns how many.

    A person's own shift stays; a gun run's is kept only where it is certain, since its shots carry log depth
    already.
    """
    there = logs.shifts(change.connection, well)
    rows = []
    for shift in found:
        m = shift.match
        if m is None or shift.held or (shift.kind == "sidewall" and not m.certain):
            continue
        column = "run_id" if shift.kind == "core" else "gun_run_id"
        old = there[there[column] == shift.number]
        if len(old) and abs(float(old["shift_m"].iloc[-1]) - m.shift_m) < 1e-9:
            continue
        rows.append(
            {
                "run_id": shift.number if shift.kind == "core" else None,
                "gun_run_id": shift.number if shift.kind == "sidewall" else None,
                "log_curve_id": shift.curve.number if shift.curve is not None else None,
                "shift_m": m.shift_m,
                "uncertainty_m": m.uncertainty_m,
                "correlation": m.correlation,
                "certain": int(m.certain),
                "basis": "matched",
                "detail": json.dumps(shift.record(), ensure_ascii=False, sort_keys=True),
            }
        )
    first = store.next_id(change.connection, schema.depth_shift)
    change.rows(schema.depth_shift, [{"id": first + i, **row} for i, row in enumerate(rows)])
    return len(rows)


def own_shift(
    change: store.Change,
    identities: store.Identities,
    well: str,
    run: str,
    shift_m: float,
    uncertainty_m: float | None,
) -> str:
    """Keep a person's own shift of a core run or gun run; returns which it is.

    Raises
    ------
    NotFound
        If the well has no run of this name.
    Usage
        If it would put the run over its neighbour or out of order.
    """
    number = select.well_id(identities, well)
    core = identities.find("run", run, number)
    gun = identities.find("gun run", run, number)
    if core is None and gun is None:
        names = [*identities.known("run", number), *identities.known("gun run", number)]
        raise NotFound(f"{well} has no run {quoted(run)}; {did_you_mean(run, names)}")
    if core is not None:
        _refuse_overlap(change.connection, identities, number, core, shift_m)
    row = {
        "id": store.next_id(change.connection, schema.depth_shift),
        "run_id": core,
        "gun_run_id": gun if core is None else None,
        "log_curve_id": None,
        "shift_m": float(shift_m),
        "uncertainty_m": uncertainty_m,
        "correlation": None,
        "certain": 1,
        "basis": "person",
        "detail": "{}",
    }
    change.rows(schema.depth_shift, [row])
    return "core run" if core is not None else "gun run"


def _refuse_overlap(
    connection: sa.Connection, identities: store.Identities, well: int, run: int, shift_m: float
) -> None:
    runs = _runs(connection, identities, well)
    shifts = by_run(connection, well)
    place = next((i for i, (number, *_) in enumerate(runs) if number == run), None)
    if place is None:
        return
    _, name, top, base, _ = runs[place]
    for other, before in ((place - 1, True), (place + 1, False)):
        if 0 <= other < len(runs) and ("core", runs[other][0]) in shifts:
            _, other_name, other_top, other_base, _ = runs[other]
            moved = shifts["core", runs[other][0]].shift_m
            overlap = other_base + moved - top - shift_m if before else base + shift_m - other_top - moved
            if overlap > 0.5:
                raise Usage(
                    f"With {shift_m:+.2f} m run {name} would lie {overlap:.2f} m over run {other_name}, "
                    f"which is shifted by {moved:+.2f} m: shift that one first, or look at their recovery."
                )


@dataclass(frozen=True, slots=True)
class InForce:
    """The shift in force of a run."""

    shift_m: float
    uncertainty_m: float
    certain: bool


def by_run(connection: sa.Connection, well: int) -> dict[tuple[str, int], InForce]:
    """The shifts in force: ('core', run) and ('sidewall', gun run)."""
    made = {}
    for row in store.rows_of(logs.shifts(connection, well)):
        core = not pd.isna(row["run_id"])
        key = ("core", int(row["run_id"])) if core else ("sidewall", int(row["gun_run_id"]))
        u = row["uncertainty_m"]
        made[key] = InForce(row["shift_m"], float("nan") if u is None else float(u), bool(row["certain"]))
    return made


def shown(found: Sequence[Shift]) -> pd.DataFrame:
    """Shifts as a table."""
    return pd.DataFrame([s.record() for s in found])


def in_force_table(
    connection: sa.Connection, identities: store.Identities, well: int
) -> list[Mapping[str, Any]]:
    """The shifts in force with who set them, for reports."""
    rows: list[Mapping[str, Any]] = []
    for row in store.rows_of(logs.shifts(connection, well)):
        core = not pd.isna(row["run_id"])
        name = identities.name(
            "run" if core else "gun run", int(row["run_id"] if core else row["gun_run_id"])
        )
        detail = json.loads(row["detail"])
        rows.append(
            {
                "run": name,
                "kind": "core" if core else "sidewall",
                "shift [m]": row["shift_m"],
                "standard uncertainty [m]": row["uncertainty_m"],
                "correlation": row["correlation"],
                "certain": "yes" if row["certain"] else "no",
                "set by": row["person"],
                "basis": row["basis"] if row["basis"] == "matched" else f"by hand: {row['reason']}",
                "matched by": detail.get("matched by", ""),
                "curve": detail.get("curve", ""),
                "remark": detail.get("remark", ""),
            }
        )
    return rows
