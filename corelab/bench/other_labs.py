"""Taking another laboratory's file into the record: what is new, unchanged, or in the place of another."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.bench.reported import Plug
from corelab.errors import NotFound, Problem, Refused, Usage
from corelab.formats.spwla_in import SpwlaFile
from corelab.records import schema, store


@dataclass(slots=True)
class OtherLabReport:
    """What reading another laboratory's file did, or would do."""

    file: str
    well: str
    laboratories: list[str] = field(default_factory=list)
    samples: int = 0
    plugs: int = 0
    results: int = 0
    notices: list[str] = field(default_factory=list)
    unchanged: bool = False
    supersedes: str = ""
    checked_only: bool = False
    seal: str = ""


def superseded(
    connection: sa.Connection,
    well_id: int,
    file: SpwlaFile,
    plugs: Sequence[Plug],
    own_laboratory: str,
    reason: str,
) -> tuple[bool, int | None]:
    """Whether the record holds this content already, and which file it would take the place of.

    A file takes the place of the one in force that has its name or its content, or plugs of the same
    laboratory under the same names: then a reason is asked for.

    Raises
    ------
    Refused
        If it would without a reason, or would take the place of several, or gives this laboratory as origin.
    """
    named = {store.name_key(p.laboratory) for p in plugs}
    if own_laboratory and store.name_key(own_laboratory) in named:
        raise Refused(
            [
                Problem(
                    f"results of {own_laboratory}, which is this laboratory",
                    "results of another laboratory, which are kept apart from the lab's own",
                    "load readings with 'corelab sheet load'; or name the other: --laboratory NAME",
                    file.file,
                )
            ]
        )
    files = store.other_files(connection, well_id)
    files = files[files["superseded_by"].isna() & (files["state"] == "read")]
    digest = hashlib.sha256(file.content).hexdigest()
    there = store.other_plugs(connection, well_id)
    keys = {(store.name_key(p.laboratory), store.name_key(p.name)) for p in plugs}
    same = [
        (store.name_key(lab), key) in keys
        for lab, key in zip(there["laboratory"], there["name_key"], strict=True)
    ]
    overlapping = set(there.loc[same, "other_file_id"]) if len(there) else set()
    wanted = {(store.name_key(p.laboratory), store.name_key(p.name), p.depth_m) for p in plugs}
    placed: dict[int, set[tuple[str, str, float | None]]] = {}
    for row in store.rows_of(there):
        depth = None if pd.isna(row["depth_m"]) else float(row["depth_m"])
        placed.setdefault(row["other_file_id"], set()).add(
            (store.name_key(row["laboratory"]), row["name_key"], depth)
        )
    met = []
    for row in store.rows_of(files):
        if row["content_digest"] == digest and placed.get(row["id"]) == wanted:
            return True, None
        alike = row["content_digest"] == digest or store.name_key(row["file"]) == store.name_key(file.file)
        if alike or row["id"] in overlapping:
            met.append(row)
    if not met:
        return False, None
    names = ", ".join(f"{row['file']} (number {row['id']})" for row in met)
    if len(met) > 1:
        raise Refused(
            [
                Problem(
                    f"the same plugs in {len(met)} files in force: {names}",
                    "one file that this one takes the place of",
                    "withdraw the others first: corelab read withdraw NUMBER --reason TEXT",
                    file.file,
                )
            ]
        )
    if not reason:
        raise Refused(
            [
                Problem(
                    f"other content than in {names}, of the same name or with the same plugs",
                    "the same content, or a reason why it takes that one's place",
                    "say why: --reason TEXT; the file read before stays in the history",
                    file.file,
                )
            ]
        )
    return False, int(met[0]["id"])


def keep(
    change: store.Change, well_id: int, file: SpwlaFile, plugs: Sequence[Plug], supersedes: int | None,
    notices: Sequence[str],
) -> int:  # fmt: skip
    """Add a file with its plugs and results to the record; returns its number."""
    connection = change.connection
    number = store.next_id(connection, schema.other_file)
    heading = {
        "heading": [line.strip() for line in file.heading],
        "intervals": file.intervals,
        "values": [[*m.codes, m.laboratory, m.text] for m in file.meanings],
    }
    row = _file_row(number, well_id, "read", supersedes, file.file, file.content)
    row |= {"heading": _json(heading), "notices": _json(list(notices))}
    change.rows(schema.other_file, [row])
    first = store.next_id(connection, schema.other_plug)
    change.rows(
        schema.other_plug,
        [
            {
                "id": n,
                "other_file_id": number,
                "laboratory": p.laboratory,
                "name": p.name,
                "name_key": store.name_key(p.name),
                "sample": p.sample,
                "depth_m": p.depth_m,
                "depth_basis": p.depth_basis,
                "source": p.source,
                "facies": p.facies,
                "orientation": p.orientation,
                "lithology": p.lithology,
                "description": p.description,
                "flags": "; ".join(p.flags),
                "row": p.row,
                "entered": _json(p.entered),
            }
            for n, p in enumerate(plugs, first)
        ],
    )
    values = [(n, v) for n, p in enumerate(plugs, first) for v in p.values]
    change.rows(
        schema.other_result,
        [
            {
                "id": i,
                "other_plug_id": n,
                "quantity": v.quantity,
                "direction": v.direction,
                "basis": v.basis,
                "stress_mpa": v.stress_mpa,
                "value": v.value,
                "value_limit": v.value_limit,
                "flags": "; ".join(v.flags),
                "reason": v.reason,
            }
            for i, (n, v) in enumerate(values, store.next_id(connection, schema.other_result))
        ],
    )
    return number


def withdraw(change: store.Change, number: int) -> dict[str, Any]:
    """Take a file out of force; returns its row."""
    files = store.other_files(change.connection)
    found = files[(files["id"] == number) & (files["state"] == "read")]
    if not len(found):
        raise NotFound(f"There is no file {number} of another laboratory; 'corelab read list' shows them.")
    row = store.rows_of(found)[0]
    if not pd.isna(row["superseded_by"]):
        raise Usage(f"File {number} is not in force: it was superseded or withdrawn before.")
    next_id = store.next_id(change.connection, schema.other_file)
    gone = _file_row(next_id, int(row["well_id"]), "withdrawn", number, row["file"], b"")
    change.rows(schema.other_file, [gone | {"heading": "{}", "notices": "[]"}])
    return row


def _file_row(
    number: int, well_id: int, state: str, supersedes: int | None, file: str, content: bytes
) -> dict[str, Any]:
    return {
        "id": number,
        "well_id": well_id,
        "state": state,
        "supersedes": supersedes,
        "file": file,
        "content": content,
        "content_digest": hashlib.sha256(content).hexdigest(),
    }


def _json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False)
