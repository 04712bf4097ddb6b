"""What rows must satisfy together and against the record, beyond what one cell can show."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

from corelab.bench.parse import Row
from corelab.errors import Problem, did_you_mean, quoted
from corelab.records.store import Identities, name_key
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
    be read at all, or the name in a row of it cannot, the names it may define are not called unknown.
    """
    unread, perhaps = _unread(every, problems)
    homeless: set[tuple[str, str]] = set()  # names whose row in the register does not tell their well
    unknown: dict[tuple[str, int, str, str, str], list[tuple[Row, str]]] = defaultdict(list)
    for defining in (("job", "well", "instrument"), ("run", "gun run", "plug", "standard")):
        for row in every:
            for column in row.sheet.own_columns:
                if column.defines and column.refers in defining and column.name in row.names:
                    well_id = _owner(row, column.refers, identities)
                    if well_id is not None:
                        identities.add(column.refers, row.names[column.name], well_id)
                    else:
                        homeless.add((column.refers, name_key(row.names[column.name])))
    for row in sound:
        _reserved(row, problems)
        for column in row.sheet.own_columns:
            if column.name not in row.names:
                continue
            name = row.names[column.name]
            well_id = _owner(row, column.refers, identities)
            if well_id is None:
                row.unusable.add(column.name)  # the unknown well is named already
                continue
            if column.refers == "instrument":
                row.values[column.field] = identities.add("instrument", name)
                continue
            found = identities.find(column.refers, name, well_id)
            if found is None:
                row.unusable.add(column.name)
                known_at_all = any(n != STANDARDS_WELL for n in identities.known(column.refers, well_id))
                covered = column.refers in unread or (column.refers, name_key(name)) in homeless
                if not covered and (known_at_all or not perhaps):
                    unknown[column.refers, well_id, name, row.file, row.tab].append((row, column.name))
                continue
            row.values[column.field] = found
    _name_unknown(unknown, identities, problems)


def _name_unknown(
    unknown: Mapping[tuple[str, int, str, str, str], Sequence[tuple[Row, str]]],
    identities: Identities,
    problems: list[Problem],
) -> None:
    """A name that a sheet repeats in many rows is complained of a few times, and then counted."""
    hints: dict[tuple[str, int, str], str] = {}
    for (refers, well_id, name, _, _), rows in unknown.items():
        asked = (refers, well_id, name)
        if asked not in hints:
            known = [n for n in identities.known(refers, well_id) if n != STANDARDS_WELL]
            hints[asked] = _hint(name, refers, known, len(hints))
        for number, (row, column) in enumerate(rows[: _MOST_NAMED + 1]):
            more = len(rows) - _MOST_NAMED
            counted = f", in {more} rows from here on" if number == _MOST_NAMED and more > 1 else ""
            where = f" of well {quoted(row.names['well'])}" if well_id and "well" in row.names else ""
            problems.append(
                row.problem(
                    column,
                    f"the unknown {refers} {quoted(name)}{counted}",
                    f"a {refers}{where} that the record or this load has",
                    hints[asked],
                )
            )


def _unread(every: Sequence[Row], problems: Sequence[Problem]) -> tuple[set[str], bool]:
    """The identities whose register could not be read wholly, and whether a file may have been any."""
    unread: set[str] = set()
    perhaps = False
    for problem in problems:
        if problem.row is None or problem.column == "":
            kind = kind_named(problem.sheet or Path(problem.file).stem)
            perhaps |= kind is None
            if kind is not None:
                unread |= {c.refers for c in SHEETS[kind].own_columns if c.defines}
    for row in every:
        unread |= {c.refers for c in row.sheet.own_columns if c.defines and c.name in row.unusable}
    return unread | ({"run", "gun run", "plug"} if "well" in unread else set()), perhaps


def _hint(name: str, refers: str, known: Sequence[str], before: int) -> str:
    if not known:
        return f"load the sheet that registers it first, or together: {_REGISTER[refers]}"
    if before >= _MOST_LOOKED_UP:  # likeness is slow to judge among many names
        return f"see the sheet that registers it: {_REGISTER[refers]}"
    return did_you_mean(name, known)


_MOST_LOOKED_UP = 50
_MOST_NAMED = 5
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
    rows: Sequence[Row],
    every: Sequence[Row],
    recorded: Mapping[str, pd.DataFrame],
    identities: Identities,
    stood_in_for: set[int],
) -> Findings:
    """Runs against runs, plugs against runs and shots: this load with what the record has in force.

    `every` row of the load, the faulty ones too, tells which shots are at least spoken of.
    """
    found = Findings([], [])
    runs = _merged(rows, recorded.get("core runs"), "core runs", stood_in_for)
    shots = _merged(rows, recorded.get("sidewall shots"), "sidewall shots", stood_in_for)
    _check_runs(runs, identities, found)
    by_run = {values["run_id"]: (values, row) for values, row in runs}
    by_shot = {(values["gun_run_id"], name_key(values["shot"])): (values, row) for values, row in shots}
    spoken_of = {
        (name_key(row.names.get("gun run", "")), name_key(row.values.get("shot", "")))
        for row in every
        if row.sheet.kind == "sidewall shots"
    }
    for values, row in _merged(rows, recorded.get("core sections"), "core sections", stood_in_for):
        run = by_run.get(values["run_id"])
        if run is not None:
            _check_within(row, values["top_depth_m"], run, identities, found, "top depth", "section", values)
            _check_within(
                row, values["base_depth_m"], run, identities, found, "base depth", "section", values
            )
    for values, row in _merged(rows, recorded.get("plugs"), "plugs", stood_in_for):
        run = by_run.get(values.get("run_id"))
        if run is not None:
            _check_within(row, values["depth_m"], run, identities, found, "depth", "plug", values)
        _check_shot(row, values, by_shot, spoken_of, identities, found)
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
                plain = {str(k): None if isinstance(v, float) and v != v else v for k, v in record.items()}
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
        deepest = group[0]
        for item in group[1:]:
            (above, row_above), (below, row_below) = deepest, item
            overlap = min(above["base_depth_m"], below["base_depth_m"]) - below["top_depth_m"]
            if below["base_depth_m"] > above["base_depth_m"]:
                deepest = item
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
    run: tuple[Mapping[str, Any], Row | None],
    identities: Identities,
    found: Findings,
    column: str,
    what: str,
    values: Mapping[str, Any],
) -> None:
    limits, row_of_run = run
    top = limits["top_depth_m"]
    base = max(limits["base_depth_m"], top + limits["recovered_length_m"])
    if top - DEPTH_ROUNDING_M <= depth_m <= base + DEPTH_ROUNDING_M:
        return
    name = identities.name("run", limits["run_id"])
    if row is not None:
        found.problems.append(
            row.problem(
                column,
                f"a {what} at {depth_m:.3f} m",
                f"a depth within run {quoted(name)}, {top:.3f} to {base:.3f} m",
                "check the depth, its unit and the run",
            )
        )
    elif row_of_run is not None:
        inside = identities.name("plug", values["plug_id"]) if what == "plug" else values["section"]
        found.problems.append(
            row_of_run.problem(
                "top depth" if depth_m < top else "base depth",
                f"run {quoted(name)} from {top:.3f} to {base:.3f} m, which leaves the {what} "
                f"{quoted(inside)} at {depth_m:.3f} m outside",
                f"a run that holds its {what}s",
                f"correct the run, or the {what} in the same load",
            )
        )


def _check_shot(
    row: Row | None,
    values: Mapping[str, Any],
    shots: Mapping[tuple[int, str], tuple[Mapping[str, Any], Row | None]],
    spoken_of: set[tuple[str, str]],
    identities: Identities,
    found: Findings,
) -> None:
    shot_name = values.get("shot")
    if values["from"] != "sidewall" or not shot_name or values.get("gun_run_id") is None:
        return
    gun = identities.name("gun run", int(values["gun_run_id"]))
    shot, row_of_shot = shots.get((values["gun_run_id"], name_key(shot_name)), (None, None))
    if shot is None:
        if row is not None and not spoken_of & {(name_key(gun), name_key(shot_name)), (name_key(gun), "")}:
            known = [one["shot"] for (run, _), (one, _) in shots.items() if run == values["gun_run_id"]]
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
        plug = identities.name("plug", int(values["plug_id"]))
        if row is not None:
            found.problems.append(
                row.problem(
                    "shot",
                    f"a plug from shot {quoted(shot_name)}, whose outcome is '{shot['outcome']}'",
                    "a shot that brought a sample",
                    "check the shot's number, or correct its outcome",
                )
            )
        elif row_of_shot is not None:
            found.problems.append(
                row_of_shot.problem(
                    "outcome",
                    f"'{shot['outcome']}' for a shot from which plug {quoted(plug)} was taken",
                    "a shot that brought a sample",
                    "check the outcome, or correct the plug in the same load",
                )
            )
    asked = row or row_of_shot
    if asked is not None and abs(shot["depth_m"] - values["depth_m"]) > 0.05:
        found.notices.append(
            asked.problem(
                "depth",
                f"a plug at {values['depth_m']:.2f} m",
                f"the depth of its shot {quoted(shot_name)}, {shot['depth_m']:.2f} m",
                "check it; it was taken as it stands",
            )
        )
