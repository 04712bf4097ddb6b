"""Computing results and keeping them: the stored results of a plug always follow from its readings."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Collection, Iterator, Mapping
from typing import Any

import sqlalchemy as sa

from corelab.bench import gather, judge, reduce, uncertainty
from corelab.records import store

#: Plugs reduced at a time, so that a large laboratory does not fill the memory.
TRAY = 20_000
#: Between processors and libraries last digits may differ; more than this is another result.
SAME = 1e-12


def compute(
    connection: sa.Connection, plug_ids: Collection[int], stored: Mapping[str, str]
) -> list[dict[str, Any]]:
    """The results of these plugs from the readings in force, as rows of the table of results."""
    versions = _versions()
    made: list[dict[str, Any]] = []
    for numbers in _trays(plug_ids, store.certified_plugs(connection)):
        tray = gather.gather(connection, numbers, stored)
        outcomes = reduce.reduce(tray)
        uncertainty.add_uncertainties(tray, outcomes)
        judge.judge(tray, outcomes)
        made += reduce.rows(tray, outcomes, versions)
    return made


def _trays(plug_ids: Collection[int], standards: Collection[int]) -> Iterator[list[int]]:
    """The plugs in trays: standards by themselves, since each of their many readings is a pass for all."""
    checks = set(plug_ids) & set(standards)
    for part in (sorted(checks), sorted(set(plug_ids) - checks)):
        for start in range(0, len(part), TRAY):
            yield part[start : start + TRAY]


def _versions() -> dict[str, int]:
    from corelab.science.catalogue import formulas

    return {key: formula.version for key, formula in formulas().items()}


def keep(
    connection: sa.Connection, plug_ids: Collection[int], stored: Mapping[str, str]
) -> list[dict[str, Any]]:
    """Compute the results of these plugs and store them in the place of those they had."""
    if not plug_ids:
        return []
    rows = compute(connection, plug_ids, stored)
    store.replace_results(connection, plug_ids, rows)
    return rows


def not_computed(rows: Collection[Mapping[str, Any]]) -> list[str]:
    """In words, for how many plugs which results are missing and why, readings not taken left out."""
    reasons = Counter(
        (row["reason"], row["quantity"]) for row in rows if row["reason"] and row["reason"] != "no readings"
    )
    of_reason: dict[str, list[tuple[str, int]]] = {}
    for (reason, quantity), count in reasons.items():
        of_reason.setdefault(reason, []).append((quantity, count))
    return [
        f"{', '.join(q for q, _ in found)}: {reason} ({max(c for _, c in found)})"
        for reason, found in sorted(of_reason.items())
    ]


#: Flags that ask a technician to look at the readings again.
_ASKING = (
    "outside the usual range",
    "does not fit the described lithology",
    "disagree beyond",
    "uneven plug",
    "differ in pressure",
    "scatter more than",
    "not less than the bulk volume",
)


def asks_for_a_look(flag: str) -> bool:
    """Whether a flag asks for a second look at the readings."""
    return any(words in flag for words in _ASKING)


def doubtful(rows: Collection[Mapping[str, Any]]) -> list[tuple[int, str]]:
    """The plugs, by number, of which a result asks for a second look at the readings, and why."""
    found: dict[tuple[int, str], None] = {}
    for row in rows:
        for flag in row["flags"].split("; ") if row["flags"] else ():
            if asks_for_a_look(flag):
                shown = f" ({row['quantity']} {row['value']:.4g})" if row["quantity"] in flag else ""
                found[row["plug_id"], flag + shown] = None
    return list(found)


_COMPARED = (
    "value",
    "uncertainty",
    "value_limit",
    "basis",
    "method",
    "version",
    "flags",
    "reason",
    "fingerprint",
)
_IDENTITY = ("plug_id", "quantity", "direction", "stress_mpa", "step")


def differences(
    computed: Collection[Mapping[str, Any]], recorded: Collection[Mapping[str, Any]]
) -> list[tuple[tuple[Any, ...], str]]:
    """Where two sets of results part: the identity of the result, and what differs in it."""
    now = {tuple(row[c] for c in _IDENTITY): row for row in computed}
    then = {tuple(row[c] for c in _IDENTITY): row for row in recorded}
    found: list[tuple[tuple[Any, ...], str]] = []
    for key in sorted(now.keys() | then.keys()):
        if key not in then:
            found.append((key, "is not stored"))
        elif key not in now:
            found.append((key, "is stored, but does not follow from the readings in force"))
        else:
            parts = [c for c in _COMPARED if not _alike(now[key][c], then[key][c])]
            if parts:
                shown = ", ".join(f"{c} {then[key][c]} stored, {now[key][c]} computed" for c in parts)
                found.append((key, shown))
    return found


def _alike(a: Any, b: Any) -> bool:
    a = None if isinstance(a, float) and math.isnan(a) else a
    b = None if isinstance(b, float) and math.isnan(b) else b
    if isinstance(a, float) and isinstance(b, float):
        return math.isclose(a, b, rel_tol=SAME, abs_tol=0.0)
    return bool(a == b)
