"""The tables of the record.

Identities (job, well, plug, run, gun run, instrument, person) are immutable rows. What is entered on a bench
sheet is an `entry` (what stood in the row, where it came from, what it supersedes) with its typed values in
the table of its kind, made from the sheet's declaration. An entry is in force while no other supersedes it;
a withdrawal is an entry of its own that supersedes with nothing. Every change is an `event`; events form a
chain of digests. Results are derived and may be computed anew at any time; nothing else is ever changed.
"""

from __future__ import annotations

import math

import sqlalchemy as sa

from corelab.quantities import Range
from corelab.sheets import SHEETS, Column, Sheet

#: The newest migration; `corelab setup` brings a database there.
SCHEMA = "0005"
WITHDRAWAL = "withdrawal"

metadata = sa.MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
        "fk": "fk_%(table_name)s_%(column_0_N_name)s",
        "pk": "pk_%(table_name)s",
    }
)

Real: sa.types.TypeEngine[float] = sa.Double().with_variant(sa.REAL(), "sqlite")


def _table(name: str, *items: sa.schema.SchemaItem) -> sa.Table:
    return sa.Table(name, metadata, *items, sqlite_strict=True)


def _check(name: str, rule: str) -> sa.CheckConstraint:
    return sa.CheckConstraint(rule, name=name)


def _text(name: str, nullable: bool = False) -> sa.Column[str]:
    return sa.Column(name, sa.Text, nullable=nullable)


def _id() -> sa.Column[int]:
    return sa.Column("id", sa.Integer, primary_key=True, autoincrement=False)


def _to(target: str, name: str, nullable: bool = False, index: bool = True) -> sa.Column[int]:
    return sa.Column(name, sa.Integer, sa.ForeignKey(target), nullable=nullable, index=index)


def _event() -> sa.Column[int]:
    """The event that closes a row is written after it, in the same transaction."""
    link = sa.ForeignKey("event.number", deferrable=True, initially="DEFERRED")
    return sa.Column("event", sa.Integer, link, nullable=False, index=True)


def _digest(name: str = "digest") -> tuple[sa.Column[str], sa.CheckConstraint]:
    return _text(name), _check(name, f"length({name}) = 64")


event = _table(
    "event",
    sa.Column("number", sa.Integer, primary_key=True, autoincrement=False),
    _text("at"),
    _text("person"),
    _text("command"),
    _text("program_version"),
    _text("reason"),
    _text("detail"),
    sa.Column("row_count", sa.Integer, nullable=False),
    *_digest("rows_digest"),
    *_digest("previous_digest"),
    *_digest(),
    _check("number", "number > 0"),
    _check("row_count", "row_count >= 0"),
)


def _identity(name: str, *owners: str) -> sa.Table:
    return _table(
        name,
        _id(),
        _event(),
        *(_to(f"{owner}.id", f"{owner}_id") for owner in owners),
        _text("name"),
        _text("name_key"),
        *_digest(),
        _check("name", "length(name) > 0"),
        _check("name_key", "length(name_key) > 0"),
        sa.UniqueConstraint(*(f"{owner}_id" for owner in owners), "name_key"),
    )


job = _identity("job")
well = _identity("well")
plug = _identity("plug", "well")
run = _identity("run", "well")
gun_run = _identity("gun_run", "well")
instrument = _identity("instrument")
person = _identity("person")

ROLES = ("technician", "reviewer", "geologist", "manager")
#: The role of one who has left the laboratory and may do nothing more.
LEFT = "left"
person_role = _table(
    "person_role",
    _id(),
    _event(),
    _to("person.id", "person_id"),
    _text("role"),
    *_digest(),
    _check("role", f"role IN {(*ROLES, LEFT)}"),
)

#: What a person's password is checked against; the newest of a person counts.
credential = _table(
    "credential",
    _id(),
    _event(),
    _to("person.id", "person_id"),
    _text("secret"),
    *_digest(),
    _check("secret", "secret LIKE '$argon2id$%'"),
)

setting = _table(
    "setting",
    _id(),
    _event(),
    _text("name"),
    _text("value"),
    *_digest(),
)

entry = _table(
    "entry",
    _id(),
    _event(),
    _text("kind"),
    sa.Column("supersedes", sa.Integer, sa.ForeignKey("entry.id"), nullable=True),
    _text("file"),
    _text("sheet"),
    sa.Column("row", sa.Integer, nullable=True),
    _text("entered"),
    *_digest(),
    sa.UniqueConstraint("supersedes"),
    _check("kind", f"kind IN {(*SHEETS, WITHDRAWAL)}"),
    _check("withdrawal", f"kind <> '{WITHDRAWAL}' OR supersedes IS NOT NULL"),
    _check("supersedes", "supersedes IS NULL OR supersedes < id"),
)

#: Table of the identity that a column refers to.
IDENTITY = {
    "job": job,
    "well": well,
    "plug": plug,
    "run": run,
    "gun run": gun_run,
    "instrument": instrument,
    "standard": plug,
}
#: Identities that belong to a well, so that a row naming one need not name the well again.
_OF_A_WELL = {"plug", "run", "gun run", "standard"}


def stored_columns(sheet: Sheet) -> tuple[Column, ...]:
    """The columns of a sheet that its table holds: the well is left out where a plug or run tells it."""
    tells_well = any(c.refers in _OF_A_WELL and c.key and c.required for c in sheet.own_columns)
    return tuple(c for c in sheet.columns if not (c.refers == "well" and tells_well))


_LARGEST = 1e300
#: Nothing reads lower on a gauge than a vacuum does.
_LOWEST_GAUGE_KPA = 120.0


def _bounds(field: str, possible: Range) -> str:
    """Both ends always: PostgreSQL sorts NaN above every number, so only an upper bound keeps it out."""
    low, high = (end if math.isfinite(end) else math.copysign(_LARGEST, end) for end in possible)
    return f"{field} >= {low!r} AND {field} <= {high!r}"


def _quoted(field: str) -> str:
    return f'"{field}"' if field == "from" else field


def _column_items(column: Column) -> list[sa.schema.SchemaItem]:
    required = column.required
    if column.refers:
        return [_to(f"{IDENTITY[column.refers].name}.id", column.field, nullable=not required)]
    quoted = _quoted(column.field)
    if column.entry == "whole":
        whole = sa.Column(column.field, sa.Integer, nullable=False)
        return [whole, _check(column.field, f"{quoted} >= 1")]
    if column.entry != "number":
        if column.choices and column.entry == "choice":
            words = ", ".join(f"'{word}'" for word in column.choices)
            rule = f"{quoted} IN ({words})"
        elif column.entry == "date":
            rule = f"{quoted} LIKE '____-__-__%'"
        else:
            rule = f"length({quoted}) > 0"
        optional = not (required or column.default)
        return [_text(column.field, nullable=optional), _check(column.field, rule)]
    items: list[sa.schema.SchemaItem] = []
    possible = column.quantity.possible if column.quantity else (-math.inf, math.inf)
    for index, field in enumerate(column.fields):
        rule = _bounds(field, possible)
        items.append(sa.Column(field, Real, nullable=not (required and index == 0)))
        if column.gauge_field:  # a gauge reads zero at the barometer; the sum is checked when read
            on_a_gauge = _bounds(field, (-_LOWEST_GAUGE_KPA, math.inf))
            rule = f"({column.gauge_field} = 1 AND {on_a_gauge}) OR ({rule})"
        items.append(_check(field, rule))
    if column.gauge_field:
        gauge = column.gauge_field
        items.append(sa.Column(gauge, sa.Integer, nullable=not required))
        items.append(_check(gauge, f"{gauge} IN (0, 1) AND ({gauge} IS NULL) = ({column.field} IS NULL)"))
    if column.limit_field:
        items.append(_text(column.limit_field, nullable=True))
        limit = column.limit_field
        rule = f"{limit} IS NULL OR ({limit} IN ('below', 'above') AND {column.field} IS NOT NULL)"
        items.append(_check(column.limit_field, rule))
    return items


def _sheet_table(sheet: Sheet) -> sa.Table:
    items: list[sa.schema.SchemaItem] = [
        sa.Column("id", sa.Integer, sa.ForeignKey("entry.id"), primary_key=True, autoincrement=False)
    ]
    for column in stored_columns(sheet):
        items += _column_items(column)
    for number, group in enumerate(sheet.either, start=1):
        alternatives = [
            "(" + " AND ".join(f"{sheet.column(name).fields[0]} IS NOT NULL" for name in names) + ")"
            for names in group
        ]
        items.append(_check(f"either_{number}", " OR ".join(alternatives)))
    return _table(sheet.table, *items)


#: kind -> table of its typed values
SHEET_TABLES: dict[str, sa.Table] = {kind: _sheet_table(sheet) for kind, sheet in SHEETS.items()}

result = _table(
    "result",
    _to("plug.id", "plug_id", index=False),
    _text("quantity"),
    _text("direction"),
    sa.Column("stress_mpa", Real, nullable=False),
    _text("step"),
    sa.Column("value", Real, nullable=True),
    sa.Column("uncertainty", Real, nullable=True),
    _text("value_limit", nullable=True),
    _text("basis"),
    _text("method"),
    sa.Column("version", sa.Integer, nullable=False),
    _text("flags"),
    _text("reason"),
    _text("fingerprint"),
    sa.PrimaryKeyConstraint("plug_id", "quantity", "direction", "stress_mpa", "step"),
    _check("value_limit", "value_limit IN ('below', 'above')"),
    _check("value", "value IS NOT NULL OR length(reason) > 0"),
)

#: One decision on one plug; the newest of a plug counts. `grounds` names the readings it rests on.
approval = _table(
    "approval",
    _id(),
    _event(),
    _to("plug.id", "plug_id"),
    _text("verdict"),
    _text("grounds"),
    *_digest(),
    _check("verdict", "verdict IN ('approved', 'revoked')"),
)

#: The results as they were approved: they stay as they were whatever is entered later.
approved_result = _table(
    "approved_result",
    _id(),
    _event(),
    _to("approval.id", "approval_id"),
    *(sa.Column(c.name, c.type, nullable=c.nullable) for c in result.columns if c.name != "plug_id"),
    *_digest(),
    _check("value_limit", "value_limit IN ('below', 'above')"),
    _check("value", "value IS NOT NULL OR length(reason) > 0"),
    sa.UniqueConstraint("approval_id", "quantity", "direction", "stress_mpa", "step"),
)

#: A manager lets results stand that control blocks; it covers the results as they were, no later ones.
control_release = _table(
    "control_release",
    _id(),
    _event(),
    _to("plug.id", "plug_id"),
    _text("blocked"),
    _text("results_digest"),
    *_digest(),
    _check("blocked", "length(blocked) > 0"),
    _check("results_digest", "length(results_digest) = 64"),
)

#: Each file that left the laboratory, byte for byte, and the results it showed.
export = _table(
    "export",
    _id(),
    _event(),
    _to("well.id", "well_id"),
    _text("kind"),
    _text("recipient"),
    sa.Column("issue", sa.Integer, nullable=False),
    _text("file"),
    _text("request"),
    _text("shown"),
    sa.Column("content", sa.LargeBinary, nullable=False),
    *_digest("content_digest"),
    *_digest(),
    _check("issue", "issue > 0"),
)

#: One curve of a log that was read in: depths [m] and values as JSON lists, null for what is absent.
log_curve = _table(
    "log_curve",
    _id(),
    _event(),
    _to("well.id", "well_id"),
    _text("log"),
    _text("file"),
    _text("content_digest"),
    _text("mnemonic"),
    _text("unit"),
    _text("quantity"),
    _text("description"),
    _text("depths"),
    _text("readings"),
    *_digest(),
    _check("mnemonic", "length(mnemonic) > 0"),
    _check("content_digest", "length(content_digest) = 64"),
)

#: Log depth less driller's depth of a core run, or the shift of a gun run; the newest of a run counts.
depth_shift = _table(
    "depth_shift",
    _id(),
    _event(),
    _to("run.id", "run_id", nullable=True),
    _to("gun_run.id", "gun_run_id", nullable=True),
    _to("log_curve.id", "log_curve_id", nullable=True),
    sa.Column("shift_m", Real, nullable=False),
    sa.Column("uncertainty_m", Real, nullable=True),
    sa.Column("correlation", Real, nullable=True),
    sa.Column("certain", sa.Integer, nullable=False),
    _text("basis"),
    _text("detail"),
    *_digest(),
    _check("one_run", "(run_id IS NULL) <> (gun_run_id IS NULL)"),
    _check("shift_m", "shift_m >= -500.0 AND shift_m <= 500.0"),
    _check("certain", "certain IN (0, 1)"),
    _check("basis", "basis IN ('matched', 'person')"),
)

#: What a partner is entitled to; the newest row of a name counts. Empty lists mean everything.
partner = _table(
    "partner",
    _id(),
    _event(),
    _text("name"),
    _text("wells"),
    _text("columns"),
    _text("units"),
    *_digest(),
    _check("name", "length(name) > 0"),
)

#: Each file of another laboratory's results, byte for byte. One that supersedes another takes its place, or
#: with `state` withdrawn takes it out of force. `heading` is what the file says of the well and its values.
other_file = _table(
    "other_file",
    _id(),
    _event(),
    _to("well.id", "well_id"),
    _text("state"),
    sa.Column("supersedes", sa.Integer, sa.ForeignKey("other_file.id"), nullable=True),
    _text("file"),
    _text("heading"),
    _text("notices"),
    sa.Column("content", sa.LargeBinary, nullable=False),
    *_digest("content_digest"),
    *_digest(),
    sa.UniqueConstraint("supersedes"),
    _check("state", "state IN ('read', 'withdrawn')"),
    _check("withdrawn", "state = 'read' OR supersedes IS NOT NULL"),
    _check("supersedes", "supersedes IS NULL OR supersedes < id"),
)

#: A plug that another laboratory reports on: kept apart from the lab's own, and never the same identity.
other_plug = _table(
    "other_plug",
    _id(),
    _event(),
    _to("other_file.id", "other_file_id", index=False),
    _text("laboratory"),
    _text("name"),
    _text("name_key"),
    _text("sample"),
    sa.Column("depth_m", Real, nullable=True),
    _text("depth_basis"),
    _text("source"),
    _text("orientation"),
    _text("facies"),
    _text("lithology"),
    _text("description"),
    _text("flags"),
    sa.Column("row", sa.Integer, nullable=False),
    _text("entered"),
    *_digest(),
    _check("name", "length(name) > 0"),
    _check("laboratory", "length(laboratory) > 0"),
    _check("depth_m", f"depth_m >= -{_LARGEST!r} AND depth_m <= {_LARGEST!r}"),
    _check("depth_basis", "depth_basis IN ('driller', 'log')"),
    _check("orientation", "orientation IN ('', 'horizontal', 'vertical', 'oblique')"),
    sa.UniqueConstraint("other_file_id", "laboratory", "name_key"),
)

#: One of its results, or why there is none.
other_result = _table(
    "other_result",
    _id(),
    _event(),
    _to("other_plug.id", "other_plug_id"),
    _text("quantity"),
    _text("direction"),
    _text("basis"),
    sa.Column("stress_mpa", Real, nullable=True),
    sa.Column("value", Real, nullable=True),
    _text("value_limit", nullable=True),
    _text("flags"),
    _text("reason"),
    *_digest(),
    _check("value", "(value IS NOT NULL) <> (length(reason) > 0)"),
    _check("size", f"value >= -{_LARGEST!r} AND value <= {_LARGEST!r}"),
    _check("stress_mpa", f"stress_mpa >= 0.0 AND stress_mpa <= {_LARGEST!r}"),
    _check("value_limit", "value_limit IN ('below', 'above')"),
)

#: Tables of which no row is ever changed or removed, in the order in which an event's rows are digested.
APPEND_ONLY: tuple[sa.Table, ...] = (
    event,
    job,
    well,
    plug,
    run,
    gun_run,
    instrument,
    person,
    person_role,
    setting,
    entry,
    credential,
    approval,
    approved_result,
    control_release,
    export,
    partner,
    log_curve,
    depth_shift,
    other_file,
    other_plug,
    other_result,
    *SHEET_TABLES.values(),
)
