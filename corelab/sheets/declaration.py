"""What a bench sheet is: one frozen record from which blank sheet, checks, tables and help are made."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from corelab.quantities import ENTERED, RESULTS, Quantity, field_name

Entry = Literal["name", "text", "number", "whole", "choice", "choices", "date", "unit"]
#: How many columns of one kind (`length 1`, `length 2` …) a row may have.
MOST_REPEATED_COLUMNS = 10
LIMITS = ("below", "above")


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a bench sheet.

    Parameters
    ----------
    name
        Its heading without the unit.
    entry
        What a cell holds: a name, a text, a number, a whole number, one choice, several choices separated by
        commas, an ISO date with or without a time, or a unit.
    quantity
        For numbers: the entry of the data dictionary that gives units and ranges.
    required, key
        Whether it must be filled in; whether it belongs to the identity of a row.
    repeated
        Whether it may stand several times, numbered.
    choices, default
        The words accepted, and what an empty cell means.
    limits
        Whether `<0.01` and `>5000` are accepted.
    refers
        The identity that the cell names: job, well, plug, run, gun run, instrument or standard.
    defines
        Whether a new name makes a new identity (elsewhere an unknown name is refused).
    note
        What goes in, said to the technician.
    """

    name: str
    entry: Entry
    note: str
    quantity: Quantity | None = None
    required: bool = False
    key: bool = False
    repeated: bool = False
    choices: tuple[str, ...] = ()
    default: str = ""
    limits: bool = False
    refers: str = ""
    defines: bool = False

    @property
    def kind(self) -> str:
        return self.quantity.kind if self.quantity else ""

    @property
    def unit(self) -> str:
        return self.quantity.unit if self.quantity else ""

    @property
    def heading_unit(self) -> str:
        return self.quantity.heading_unit if self.quantity else ""

    @property
    def field(self) -> str:
        """Name of the stored column (`length_cm`, `well_id`)."""
        return field_name(self.name) + "_id" if self.refers else field_name(self.name, self.unit)

    def numbered(self, number: int) -> str:
        return field_name(f"{self.name} {number}", self.unit)

    @property
    def fields(self) -> tuple[str, ...]:
        """Every stored field of the value itself."""
        if self.repeated:
            return tuple(self.numbered(n) for n in range(1, MOST_REPEATED_COLUMNS + 1))
        return (self.field,)

    @property
    def gauge_field(self) -> str:
        """Name of the stored mark that a pressure was read on a gauge; empty where there is none."""
        return field_name(self.name) + "_gauge" if self.kind == "pressure" else ""

    @property
    def limit_field(self) -> str:
        return field_name(self.name) + "_limit" if self.limits else ""

    @property
    def heading(self) -> str:
        return f"{self.name} [{self.heading_unit}]" if self.heading_unit else self.name


Alternative = tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Sheet:
    """One kind of bench sheet.

    Parameters
    ----------
    kind
        Its name: the tab of a workbook, the stem of a CSV file, the table with `_` for spaces.
    reading
        Readings take `measured on`, `measured by` and `repeat`, of which the first and last belong to the
        key; registers hold one row a key.
    subject
        What its rows are about: the identity to which they point.
    either
        Groups of alternatives, of which at least one must be filled in wholly.
    caution
        The hazards of the work that the sheet records.
    """

    kind: str
    title: str
    reading: bool
    subject: str
    own_columns: tuple[Column, ...]
    either: tuple[tuple[Alternative, ...], ...] = ()
    caution: str = ""
    columns: tuple[Column, ...] = field(init=False)

    def __post_init__(self) -> None:
        common = _READING_COLUMNS if self.reading else ()
        object.__setattr__(self, "columns", (*self.own_columns, *common, _REMARKS))

    @property
    def table(self) -> str:
        return self.kind.replace(" ", "_")

    @property
    def key(self) -> tuple[Column, ...]:
        """The columns that identify a row, `repeat` left out."""
        return tuple(c for c in self.columns if c.key and c.name != "repeat")

    def column(self, name: str) -> Column:
        return next(c for c in self.columns if c.name == name)


def name(
    title: str,
    note: str,
    *,
    refers: str = "",
    required: bool = False,
    key: bool = False,
    defines: bool = False,
) -> Column:
    return Column(title, "name", note, required=required, key=key, refers=refers, defines=defines)


def text(title: str, note: str) -> Column:
    return Column(title, "text", note)


def number(
    title: str,
    note: str,
    *,
    quantity: str = "",
    required: bool = False,
    key: bool = False,
    repeated: bool = False,
    limits: bool = False,
    default: str = "",
) -> Column:
    wanted = quantity or title
    return Column(
        title,
        "number",
        note,
        quantity=ENTERED.get(wanted) or RESULTS[wanted],
        required=required,
        key=key,
        repeated=repeated,
        limits=limits,
        default=default,
    )


def choice(
    title: str,
    note: str,
    *choices: str,
    required: bool = False,
    key: bool = False,
    default: str = "",
    several: bool = False,
) -> Column:
    return Column(
        title,
        "choices" if several else "choice",
        note,
        required=required,
        key=key,
        choices=choices,
        default=default,
    )


def date(title: str, note: str, *, key: bool = False) -> Column:
    return Column(title, "date", note, key=key)


_READING_COLUMNS = (
    date("measured on", "Day of the reading, 2026-03-14, or with time 2026-03-14T09:30.", key=True),
    name("measured by", "Who took the reading."),
    Column("repeat", "whole", "1, 2, 3 … where one thing is read again; empty rows are counted.", key=True),
)
_REMARKS = text("remarks", "Anything worth knowing; kept as written.")
