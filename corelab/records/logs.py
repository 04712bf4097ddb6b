"""Logs in the record, and the shifts that tie core and sidewall descents to them."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray

from corelab.records import schema, store

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class LogCurve:
    """One curve of a log: depths [m] (n,) and values (n,) in `unit`, NaN for what is absent."""

    number: int
    log: str
    mnemonic: str
    unit: str
    quantity: str
    depth_m: Array
    values: Array


@dataclass(frozen=True, slots=True)
class NewCurve:
    """A curve to be kept; `unit` as it stood in the file, `quantity` what it was taken for."""

    mnemonic: str
    unit: str
    quantity: str
    description: str
    depth_m: Array
    values: Array


def curves(connection: sa.Connection, well_id: int) -> list[LogCurve]:
    """The curves of a well's logs; of a log read in anew, only the newest reading."""
    table = schema.log_curve
    rows = connection.execute(sa.select(table).where(table.c.well_id == well_id).order_by(table.c.id))
    newest: dict[str, int] = {}
    found = []
    for row in rows.mappings():
        newest[store.name_key(row["log"])] = row["event"]
        found.append(row)
    return [
        LogCurve(
            row["id"],
            row["log"],
            row["mnemonic"],
            row["unit"],
            row["quantity"],
            _array(row["depths"]),
            _array(row["readings"]),
        )
        for row in found
        if newest[store.name_key(row["log"])] == row["event"]
    ]


def known_log(connection: sa.Connection, well_id: int, log: str) -> str:
    """The digest of the file that a log of this name was last read from; empty where it never was."""
    table = schema.log_curve
    rows = connection.execute(
        sa.select(table.c.log, table.c.content_digest).where(table.c.well_id == well_id).order_by(table.c.id)
    ).all()
    same = [r.content_digest for r in rows if store.name_key(r.log) == store.name_key(log)]
    return same[-1] if same else ""


def add_curves(
    change: store.Change, well_id: int, log: str, file: str, content_digest: str, new: Sequence[NewCurve]
) -> None:
    """Keep the curves of a log."""
    first = store.next_id(change.connection, schema.log_curve)
    change.rows(
        schema.log_curve,
        [
            {
                "id": first + i,
                "well_id": well_id,
                "log": log,
                "file": file,
                "content_digest": content_digest,
                "mnemonic": curve.mnemonic,
                "unit": curve.unit,
                "quantity": curve.quantity,
                "description": curve.description,
                "depths": _text(curve.depth_m),
                "readings": _text(curve.values),
            }
            for i, curve in enumerate(new)
        ],
    )


def _text(values: Array) -> str:
    return json.dumps([None if v != v else v for v in values.tolist()], separators=(",", ":"))


def _array(text: str) -> Array:
    return np.array([np.nan if v is None else v for v in json.loads(text)], dtype=np.float64)


def shifts(connection: sa.Connection, well_id: int) -> pd.DataFrame:
    """The newest shift of each core run and gun run of a well.

    Returns
    -------
    DataFrame
        The columns of `depth_shift` with its event's `at`, `person` and `reason`.
    """
    table, event = schema.depth_shift, schema.event
    of_well = sa.union_all(
        sa.select(table.c.id)
        .join(schema.run, schema.run.c.id == table.c.run_id)
        .where(schema.run.c.well_id == well_id),
        sa.select(table.c.id)
        .join(schema.gun_run, schema.gun_run.c.id == table.c.gun_run_id)
        .where(schema.gun_run.c.well_id == well_id),
    ).subquery()
    query = (
        sa.select(*(c for c in table.c if c.name != "digest"), event.c.at, event.c.person, event.c.reason)
        .join(event, event.c.number == table.c.event)
        .where(table.c.id.in_(sa.select(of_well.c.id)))
        .order_by(table.c.id)
    )
    frame = store.frame_of(connection, query)
    return frame.drop_duplicates(["run_id", "gun_run_id"], keep="last").reset_index(drop=True)
