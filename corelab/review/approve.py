"""Approving results: who may, what is frozen, what control blocks and a manager releases."""

from __future__ import annotations

import json
from collections.abc import Collection, Mapping, Sequence
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.bench import settings as lab_settings
from corelab.errors import Problem, Refused
from corelab.interval import frozen, life
from corelab.records import history, schema, store
from corelab.review.waiting import measured_by


def approve(
    change: store.Change,
    identities: store.Identities,
    plug_ids: Sequence[int],
    person: str,
    blocked: Mapping[int, str],
) -> int:
    """Freeze the results of these plugs as they are now; returns how many results.

    Raises
    ------
    Refused
        For every plug that has nothing to approve, that this person measured, or that control blocks and
        nobody released.
    """
    connection = change.connection
    results = store.results(connection, plug_ids)
    valued = results[results["value"].notna()]
    entries = life.entries_of_plugs(connection, list(plug_ids), in_force_only=True)
    by = measured_by(entries)
    withdrew = store.withdrawers_of(connection, plug_ids)
    released = frozen.covering_releases(connection, results, blocked)
    done = _approved_already(connection, plug_ids, results)
    there, key = set(valued["plug_id"]), store.name_key(person)
    problems: list[Problem] = []
    for plug in plug_ids:
        name = identities.name("plug", plug)
        if plug not in there:
            problems.append(
                Problem(
                    f"no result of plug {name}", "results to approve", "leave it out until it is measured"
                )
            )
        elif plug in done:
            problems.append(
                Problem(f"plug {name}, approved as it stands", "results that wait", "leave it out")
            )
        elif key in by.get(plug, {}) or key in withdrew.get(plug, set()):
            problems.append(
                Problem(
                    f"plug {name}, measured, entered or changed by {person}",
                    "another person's measurement: nobody approves what they measured",
                    "let another reviewer approve it",
                )
            )
        elif plug in blocked and plug not in released:
            problems.append(
                Problem(
                    f"plug {name}: {blocked[plug]}",
                    "instruments in control and in calibration",
                    "measure it again, mend the check or the register, or let a manager release it",
                )
            )
    if problems:
        raise Refused(problems)
    stored = store.settings(connection)
    moving = {
        s.name: lab_settings.value(stored, s.name) for s in lab_settings.SETTINGS.values() if s.moves_results
    }
    readings: Mapping[int, list[int]] = (
        entries.groupby("plug_id")["number"].agg(list).to_dict() if len(entries) else {}  # type: ignore[assignment]
    )
    first = store.next_id(connection, schema.approval)
    number = {plug: first + i for i, plug in enumerate(plug_ids)}
    change.rows(
        schema.approval,
        [
            {
                "id": number[plug],
                "plug_id": plug,
                "verdict": "approved",
                "grounds": json.dumps(
                    {
                        "readings": [int(n) for n in readings.get(plug, [])],
                        "settings": moving,
                        "released": released.get(plug, ""),
                    },
                    sort_keys=True,
                ),
            }
            for plug in plug_ids
        ],
    )
    kept = schema.approved_result
    columns = [c.name for c in kept.c if c.name not in {"id", "event", "approval_id", "digest"}]
    start = store.next_id(connection, kept)
    rows = [
        {"id": start + i, "approval_id": number[row["plug_id"]], **{c: _plain(row[c]) for c in columns}}
        for i, row in enumerate(store.rows_of(valued))
    ]
    change.rows(kept, rows)
    return len(rows)


def revoke(change: store.Change, identities: store.Identities, plug_ids: Sequence[int]) -> None:
    """Take back the approval of these plugs: their results are shown as computed again.

    Raises
    ------
    Refused
        For every plug that is not approved.
    """
    newest = store.approvals(change.connection, plug_ids)
    approved = set(newest.loc[newest["verdict"] == "approved", "plug_id"])
    problems = [
        Problem(f"plug {identities.name('plug', p)}, not approved", "an approved plug", "leave it out")
        for p in plug_ids
        if p not in approved
    ]
    if problems:
        raise Refused(problems)
    first = store.next_id(change.connection, schema.approval)
    change.rows(
        schema.approval,
        [
            {"id": first + i, "plug_id": plug, "verdict": "revoked", "grounds": "{}"}
            for i, plug in enumerate(plug_ids)
        ],
    )


def release(
    change: store.Change,
    identities: store.Identities,
    plug_ids: Sequence[int],
    blocked: Mapping[int, str],
) -> None:
    """Let the results of these plugs stand although control blocks them.

    Raises
    ------
    Refused
        For every plug that control does not block.
    """
    problems = [
        Problem(
            f"plug {identities.name('plug', p)}, which control does not block",
            "a blocked plug",
            "leave it out",
        )
        for p in plug_ids
        if p not in blocked
    ]
    if problems:
        raise Refused(problems)
    digests = frozen.results_digests(store.results(change.connection, plug_ids))
    first = store.next_id(change.connection, schema.control_release)
    change.rows(
        schema.control_release,
        [
            {
                "id": first + i,
                "plug_id": plug,
                "blocked": blocked[plug],
                "results_digest": digests.get(plug, history.NO_DIGEST),
            }
            for i, plug in enumerate(plug_ids)
        ],
    )


def _approved_already(
    connection: sa.Connection, plug_ids: Collection[int], results: pd.DataFrame
) -> set[int]:
    approved = store.approved_results(connection, plug_ids)
    parted = set(frozen.differing(approved, results)["plug_id"]) if len(approved) else set()
    return set(approved["plug_id"]) - parted


def _plain(value: Any) -> Any:
    return None if isinstance(value, float) and value != value else value
