"""Proving that nothing was altered behind the program's back."""

from __future__ import annotations

import re
from dataclasses import dataclass

import sqlalchemy as sa

from corelab.bench import compute
from corelab.errors import Usage, quoted
from corelab.records import history, migrate, schema, store


@dataclass(frozen=True, slots=True)
class Verified:
    """What a verification found.

    Parameters
    ----------
    seal
        The head of the chain now.
    events, rows
        How many events there are, and how many rows they closed.
    results
        How many results were computed anew.
    faults
        What does not fit, in words; empty where all is whole.
    """

    seal: str
    events: int
    rows: int
    results: int
    faults: list[str]


def verify(connection: sa.Connection, seal: str = "") -> Verified:
    """Check the file, the guards, every digest, the chain, and every stored result against its readings.

    Parameters
    ----------
    seal
        A seal kept from before: the record must still hold what was sealed then, at that place.

    Raises
    ------
    Usage
        If what is given cannot be a seal.
    """
    sealed = re.fullmatch(r"\s*(\d{1,18})-([0-9a-f]{64})\s*", seal) if seal else None
    if seal and sealed is None:
        raise Usage(
            f"{quoted(seal)} is not a seal: a number, '-' and 64 hexadecimal digits, as 'verify' prints it."
        )
    faults = _file_faults(connection)
    faults += history.guard_faults(connection)
    faults += history.chain_faults(connection)
    if sealed is not None:
        faults += _seal_faults(connection, int(sealed[1]), sealed[2])
    results, wrong = _results(connection)
    event = schema.event
    count = connection.execute(sa.select(sa.func.count(), sa.func.sum(event.c.row_count)).select_from(event))
    events, rows = count.one()
    return Verified(history.last_seal(connection), events, rows or 0, results, faults + wrong)


def _file_faults(connection: sa.Connection) -> list[str]:
    strangers = sorted(set(sa.inspect(connection).get_table_names()) - migrate.own_tables())
    faults = [f"the table {name} is not the program's" for name in strangers]
    versions = connection.exec_driver_sql("SELECT version_num FROM alembic_version").scalars().all()
    faults += [
        f"the schema {v} in alembic_version is not the program's" for v in versions if v != schema.SCHEMA
    ]
    if connection.dialect.name != "sqlite":
        return faults
    for (said,) in connection.exec_driver_sql("PRAGMA integrity_check(20)"):
        if said != "ok":
            faults.append(f"the file is damaged: {said}")
    for table, row, target, _ in connection.exec_driver_sql("PRAGMA foreign_key_check"):
        faults.append(f"row {row} of {table} points at a row of {target} that is not there")
    return faults


def _seal_faults(connection: sa.Connection, number: int, digest: str) -> list[str]:
    event = schema.event
    found = connection.execute(sa.select(event.c.digest).where(event.c.number == number)).scalar()
    last = connection.execute(sa.select(sa.func.max(event.c.number))).scalar() or 0
    if found is None:
        return [
            f"the seal is of event {number}, and the record ends at event {last}: "
            "what came after was cut off, or this is another lab"
        ]
    if found != digest:
        return [
            f"event {number} is not the one that was sealed: the record was made anew since, or is another"
        ]
    return []


def _results(connection: sa.Connection) -> tuple[int, list[str]]:
    identities = store.Identities.read(connection)
    stored = store.settings(connection)
    try:
        rows = compute.compute(connection, list(identities.names["plug"]), stored)
    except Exception as trouble:  # an alteration can leave readings that nothing can be computed from
        return 0, [f"the results cannot be computed from what is stored ({trouble})"]
    found = compute.differences(rows, store.rows_of(store.results(connection)))
    faults = []
    for (plug, quantity, direction, stress_mpa, step), text in found:
        name = identities.names["plug"].get(plug, f"number {plug}")
        well = identities.names["well"].get(identities.owners["plug"].get(plug, 0), "an unknown well")
        at = "".join(
            f", {part}" for part in (direction, f"{stress_mpa:g} MPa" if stress_mpa else "", step) if part
        )
        faults.append(f"result {quantity} of {name} in {well}{at}: {text}")
    return len(rows), faults
