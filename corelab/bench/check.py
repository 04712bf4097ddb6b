"""What rows must satisfy together and against the record, beyond what one cell can show."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import pandas as pd

from corelab.bench.parse import Row
from corelab.errors import Problem, did_you_mean, quoted
from corelab.records.store import Identities
from corelab.sheets import SHEETS, STANDARDS_WELL, kind_named
from corelab.units import ATMOSPHERE_KPA, absolute_kpa

#: A core barrel holds about 30 ft (9 m); common practice.
BARREL_M = 9.2
#: Depths typed to a centimetre or a tenth of a foot may stand this far outside a run.
DEPTH_ROUNDING_M = 0.02
#: A barometer not read may differ this much from the standard atmosphere at moderate heights.
_ASSUMED_BAROMETER_SLACK = 0.05
_READ_BAROMETER_SLACK = 0.005
_EMPTY_OUTCOMES = {"misfired", "lost", "empty", "not attempted"}


@dataclass(slots=True)
class Findings:
    problems: list[Problem]
    notices: list[Problem]


def tie(every: Sequence[Row], sound: Sequence[Row], identities: Identities, problems: list[Problem]) -> None:
    """Replace the names of `sound` rows by the identities they mean.

    New identities are made where a register defines them, by any row of the load: a fault elsewhere in a
    register's row is named once, and does not make its name unknown to the rest. Where a register cannot
    be read at all, the names it may define are not called unknown.
    """
    unread = {
        column.refers
        for problem in problems
        if problem.row is None and (kind := kind_named(problem.sheet or Path(problem.file).stem))
        for column in SHEETS[kind].own_columns
        if column.defines
    }
    unread |= {"run", "gun run", "plug"} if "well" in unread else set()
    for defining in (("job", "well", "instrument"), ("run", "gun run", "plug", "standard")):
        for row in every:
            for column in row.sheet.own_columns:
                if column.defines and column.refers in defining and column.name in row.names:
                    well_id = _owner(row, column.refers, identities)
                    if well_id is not None:
                        identities.add(column.refers, row.names[column.name], well_id)
    for row in sound:
        _reserved(row, problems)
        for column in row.sheet.own_columns:
            if column.name not in row.names:
                continue
            name = row.names[column.name]
            well_id = _owner(row, column.refers, identities)
            if well_id is None:
                continue  # the unknown well is named already
            if column.refers == "instrument":
                row.values[column.field] = identities.add("instrument", name)
                continue
            found = identities.find(column.refers, name, well_id)
            if found is None:
                if column.refers in unread:
                    continue
                known = identities.known(column.refers, well_id)
                where = f" of well '{row.names['well']}'" if well_id and "well" in row.names else ""
                hint = did_you_mean(name, known)
                if not known and column.refers != "well":
                    hint = f"load the sheet that registers it first, or together: {_REGISTER[column.refers]}"
                problems.append(
                    row.problem(
                        column.name,
                        f"the unknown {column.refers} {quoted(name)}",
                        f"a {column.refers}{where} that the record or this load has",
                        hint,
                    )
                )
                continue
            row.values[column.field] = found


_REGISTER = {
    "job": "jobs",
    "well": "wells",
    "plug": "plugs (check plugs: standards)",
    "run": "core runs",
    "gun run": "sidewall shots",
    "standard": "standards",
}


def _owner(row: Row, refers: str, identities: Identities) -> int | None:
    """The well to which an identity named in this row belongs; 0 for those of no well."""
    if refers in {"job", "well", "instrument"}:
        return 0
    name = STANDARDS_WELL if refers == "standard" else row.names.get("well", "")
    return identities.find("well", name)


def _reserved(row: Row, problems: list[Problem]) -> None:
    name = row.names.get("well", "").strip().casefold()
    if name == STANDARDS_WELL and not row.sheet.reading:
        problems.append(
            row.problem(
                "well",
                quoted(row.names["well"]),
                "the name of a well",
                f"'{STANDARDS_WELL}' is kept for check plugs: register them in the sheet 'standards'",
            )
        )


def check_row(row: Row, barometer_setting_kpa: float | None) -> list[Problem]:
    """What is impossible within one row."""
    rule = _ROW_RULES.get(row.sheet.kind)
    return rule(row, barometer_setting_kpa) if rule else []


def _barometer(row: Row, setting_kpa: float | None) -> tuple[float, float, str]:
    """Barometer [kPa], the slack allowed below it, and what it rests on."""
    read = row.values.get("barometric_pressure_kpa")
    if read is not None:
        return read, _READ_BAROMETER_SLACK, "as read"
    if setting_kpa is not None:
        return setting_kpa, _ASSUMED_BAROMETER_SLACK, "the laboratory's setting"
    return ATMOSPHERE_KPA, _ASSUMED_BAROMETER_SLACK, "assumed"


def _absolute(row: Row, name: str, barometer_kpa: float) -> float | None:
    value = row.values.get(f"{name}_kpa")
    if value is None:
        return None
    return float(absolute_kpa(value, bool(row.values.get(f"{name}_gauge")), barometer_kpa))


def _below(row: Row, name: str, value: float, barometer_kpa: float, how: str) -> Problem:
    return row.problem(
        name.replace("_", " "),
        f"{value:.4g} kPa absolute",
        f"a pressure above the barometer ({barometer_kpa:.4g} kPa, {how})",
        "gauge readings are written psig, barg or kPag in the heading; or enter the barometric pressure",
    )


def _expansion(row: Row, setting_kpa: float | None) -> list[Problem]:
    barometer, _, how = _barometer(row, setting_kpa)
    first = _absolute(row, "reference_pressure", barometer)
    second = _absolute(row, "expanded_pressure", barometer)
    problems = []
    if second is not None and second <= barometer:
        problems.append(_below(row, "expanded_pressure", second, barometer, how))
    elif first is not None and second is not None and second > first:
        problems.append(
            row.problem(
                "expanded pressure",
                f"{second:.6g} kPa, above the reference pressure of {first:.6g} kPa",
                "an expanded pressure below the reference pressure",
                "see whether the two columns or their units are exchanged",
            )
        )
    return problems


def _flow(row: Row, setting_kpa: float | None) -> list[Problem]:
    barometer, slack, how = _barometer(row, setting_kpa)
    problems = []
    downstream = _absolute(row, "downstream_pressure", barometer)
    if downstream is not None and downstream < barometer * (1.0 - slack):
        problems.append(_below(row, "downstream_pressure", downstream, barometer, how))
    upstream = _absolute(row, "upstream_pressure", barometer)
    if upstream is not None and upstream <= (barometer if downstream is None else downstream):
        end = barometer if downstream is None else downstream
        problems.append(
            row.problem(
                "upstream pressure",
                f"{upstream:.6g} kPa absolute, not above the downstream pressure of {end:.6g} kPa",
                "an upstream pressure above the downstream one",
                "gauge readings are written psig, barg or kPag; see whether the columns are exchanged",
            )
        )
    flow_pressure = _absolute(row, "flow_pressure", barometer)
    if flow_pressure is not None and flow_pressure <= 0:
        problems.append(_below(row, "flow_pressure", flow_pressure, barometer, how))
    return problems


def _weighing(row: Row, _setting_kpa: float | None) -> list[Problem]:
    mass, container = row.values["mass_g"], row.values.get("container_mass_g")
    if container is not None and container >= mass:
        return [
            row.problem(
                "container mass",
                f"{container:g} g, not less than the mass of {mass:g} g",
                "the mass of the container alone, weighed with the plug",
                "see whether the columns are exchanged",
            )
        ]
    return []


def _immersion(row: Row, _setting_kpa: float | None) -> list[Problem]:
    air, immersed = row.values.get("mass_in_air_g"), row.values.get("mass_immersed_g")
    if air is not None and immersed is not None and immersed >= air:
        return [
            row.problem(
                "mass immersed",
                f"{immersed:g} g, not less than the mass in air of {air:g} g",
                "the mass hanging in the liquid",
                "see whether the columns are exchanged; a balance under the bath goes into 'mass displaced'",
            )
        ]
    return []


def _span(row: Row, _setting_kpa: float | None) -> list[Problem]:
    top, base = row.values.get("top_depth_m"), row.values.get("base_depth_m")
    if top is not None and base is not None and base <= top:
        return [
            row.problem(
                "base depth",
                f"{base:.3f} m, not below the top at {top:.3f} m",
                "a base deeper than the top",
                "see whether the columns are exchanged",
            )
        ]
    return []


_ROW_RULES = {
    "porosimeter calibration": _expansion,
    "grain volume": _expansion,
    "pore volume": _expansion,
    "gas permeability": _flow,
    "liquid permeability": _flow,
    "masses": _weighing,
    "immersion": _immersion,
    "core runs": _span,
    "core sections": _span,
    "plugs": _span,
}


def check_together(
    rows: Sequence[Row], recorded: Mapping[str, pd.DataFrame], identities: Identities, stood_in_for: set[int]
) -> Findings:
    """Runs against runs, plugs against runs and shots: this load with what the record has in force."""
    found = Findings([], [])
    runs = _merged(rows, recorded.get("core runs"), "core runs", stood_in_for)
    shots = _merged(rows, recorded.get("sidewall shots"), "sidewall shots", stood_in_for)
    _check_runs(runs, identities, found)
    by_run = {values["run_id"]: values for values, _ in runs}
    by_shot = {(values["gun_run_id"], values["shot"].casefold()): values for values, _ in shots}
    for values, row in _merged(rows, recorded.get("core sections"), "core sections", stood_in_for):
        run = by_run.get(values["run_id"])
        if row is not None and run is not None:
            _check_within(row, values["top_depth_m"], run, identities, found, "top depth", "section")
    for values, row in _merged(rows, recorded.get("plugs"), "plugs", stood_in_for):
        if row is None and not runs and not shots:
            continue
        run = by_run.get(values.get("run_id"))
        if run is not None:
            _check_within(row, values["depth_m"], run, identities, found, "depth", "plug", values)
        if row is not None:
            _check_shot(row, values, by_shot, found)
    return found


def _merged(
    rows: Sequence[Row], recorded: pd.DataFrame | None, kind: str, stood_in_for: set[int]
) -> list[tuple[dict[str, Any], Row | None]]:
    merged: list[tuple[dict[str, Any], Row | None]] = [
        (row.values, row) for row in rows if row.sheet.kind == kind
    ]
    if recorded is not None:
        for record in recorded.to_dict("records"):
            if record["id"] not in stood_in_for:
                plain = {k: None if isinstance(v, float) and v != v else v for k, v in record.items()}
                merged.append((plain, None))
    return merged


def _check_runs(
    runs: Sequence[tuple[dict[str, Any], Row | None]], identities: Identities, found: Findings
) -> None:
    of_well: dict[int, list[tuple[dict[str, Any], Row | None]]] = defaultdict(list)
    for values, row in runs:
        of_well[identities.owner("run", values["run_id"])].append((values, row))
        if row is None:
            continue
        cut = values["base_depth_m"] - values["top_depth_m"]
        if cut > BARREL_M:
            found.notices.append(
                row.problem(
                    "base depth",
                    f"a run of {cut:.2f} m",
                    "at most about 9 m (30 ft), what one barrel holds (common practice)",
                    "see whether it was one run; it was taken as it stands",
                )
            )
        if values["recovered_length_m"] > cut * 1.0001:
            found.notices.append(
                row.problem(
                    "recovered length",
                    f"a recovery of {100 * values['recovered_length_m'] / cut:.0f} %",
                    "not more than was cut, unless a stub of the run before came along or the core swelled",
                    "it was taken as it stands and is marked in the recovery",
                )
            )
    for group in of_well.values():
        group.sort(key=lambda item: item[0]["top_depth_m"])
        for (above, row_above), (below, row_below) in pairwise(group):
            overlap = above["base_depth_m"] - below["top_depth_m"]
            row = row_below or row_above
            if overlap > 1e-6 and row is not None:
                other = identities.name("run", (above if row is row_below else below)["run_id"])
                found.problems.append(
                    row.problem(
                        "top depth" if row is row_below else "base depth",
                        f"a run that overlaps run {quoted(other)} by {overlap:.3f} m",
                        "runs that do not overlap: a run begins where the one before ended",
                        "correct the depths; excess core goes into the recovered length",
                    )
                )


def _check_within(
    row: Row | None,
    depth_m: float,
    run: dict[str, Any],
    identities: Identities,
    found: Findings,
    column: str,
    what: str,
    values: Mapping[str, Any] | None = None,
) -> None:
    top = run["top_depth_m"]
    base = max(run["base_depth_m"], top + run["recovered_length_m"])
    if top - DEPTH_ROUNDING_M <= depth_m <= base + DEPTH_ROUNDING_M:
        return
    name = identities.name("run", run["run_id"])
    shown = f"{depth_m:.3f} m"
    if row is None:
        name_of_plug = identities.name("plug", values["plug_id"]) if values else ""
        found.problems.append(
            Problem(
                f"run {quoted(name)} from {top:.3f} to {base:.3f} m, which leaves the plug "
                f"{quoted(name_of_plug)} at {shown} outside",
                "a run that holds its plugs",
                "correct the run, or the plug in the same load",
                column="top depth",
            )
        )
        return
    found.problems.append(
        row.problem(
            column,
            f"a {what} at {shown}",
            f"a depth within run {quoted(name)}, {top:.3f} to {base:.3f} m",
            "check the depth, its unit and the run",
        )
    )


def _check_shot(
    row: Row, values: Mapping[str, Any], shots: Mapping[tuple[int, str], dict[str, Any]], found: Findings
) -> None:
    shot_name = values.get("shot")
    if values["from"] != "sidewall" or not shot_name or values.get("gun_run_id") is None:
        return
    shot = shots.get((values["gun_run_id"], shot_name.casefold()))
    gun = row.names.get("gun run", "")
    if shot is None:
        known = [name for run, name in shots if run == values["gun_run_id"]]
        found.problems.append(
            row.problem(
                "shot",
                f"the unknown shot {quoted(shot_name)} of gun run {quoted(gun)}",
                "a shot of the sheet 'sidewall shots'",
                did_you_mean(shot_name, known),
            )
        )
        return
    if shot["outcome"] in _EMPTY_OUTCOMES:
        found.problems.append(
            row.problem(
                "shot",
                f"a plug from shot {quoted(shot_name)}, whose outcome is '{shot['outcome']}'",
                "a shot that brought a sample",
                "check the shot's number, or correct its outcome",
            )
        )
    if abs(shot["depth_m"] - values["depth_m"]) > 0.05:
        found.notices.append(
            row.problem(
                "depth",
                f"{values['depth_m']:.2f} m",
                f"the depth of shot {quoted(shot_name)}, {shot['depth_m']:.2f} m",
                "check it; it was taken as it stands",
            )
        )
