"""The few kinds of trouble, each with a message that a technician can act on."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass


class CorelabError(Exception):
    """Anything the program refuses or cannot find; its text is meant to be read by the user."""


class NotFound(CorelabError):
    """A name that the lab does not know."""


class Usage(CorelabError):
    """A request that is put wrongly, whatever the lab holds."""


class Unavailable(CorelabError):
    """The database or a file cannot be used now: locked, full, missing, or of another version."""


class Impossible(CorelabError, ValueError):
    """A formula was given a value that no plug can have."""


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing wrong with what was given.

    Parameters
    ----------
    found, wanted, action
        What stands there, what should, and what to do about it.
    file, sheet, row, column
        Where: as the user sees it (row number of the sheet, heading of the column).
    """

    found: str
    wanted: str
    action: str
    file: str = ""
    sheet: str = ""
    row: int | None = None
    column: str = ""

    @property
    def place(self) -> str:
        parts = [self.file]
        if self.sheet:
            parts.append(f"sheet '{self.sheet}'")
        if self.row is not None:
            parts.append(f"row {self.row}")
        if self.column:
            parts.append(f"column '{self.column}'")
        return ", ".join(part for part in parts if part)

    def __str__(self) -> str:
        place = f"{self.place}: " if self.place else ""
        return f"{place}found {self.found}; wanted {self.wanted}; {self.action}"

    def as_dict(self) -> dict[str, object]:
        return {
            "file": self.file,
            "sheet": self.sheet,
            "row": self.row,
            "column": self.column,
            "found": self.found,
            "wanted": self.wanted,
            "what to do": self.action,
        }


class Refused(CorelabError):
    """Nothing was written; `problems` names everything that was wrong."""

    def __init__(self, problems: Iterable[Problem], summary: str = "") -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        many = len(self.problems)
        self.summary = summary or f"Nothing was written: {many} problem{'' if many == 1 else 's'}."
        super().__init__("\n".join([self.summary, *(f"  {p}" for p in self.problems)]))


def nearest(name: str, known: Iterable[str], most: int = 3) -> list[str]:
    """The known names most like `name`, best first, without regard to case."""
    table: dict[str, str] = {}
    for candidate in known:
        table.setdefault(candidate.casefold(), candidate)
    matches = difflib.get_close_matches(name.casefold(), list(table), n=most, cutoff=0.5)
    return [table[match] for match in matches]


def did_you_mean(name: str, known: Sequence[str], most_listed: int = 12) -> str:
    """A sentence that leads from a wrong name to a right one."""
    close = nearest(name, known)
    if close:
        return "did you mean " + " or ".join(f"'{c}'" for c in close) + "?"
    if not known:
        return "there is none yet."
    listed = ", ".join(known[:most_listed])
    return f"known: {listed}" + (", …" if len(known) > most_listed else ".")


def quoted(value: object, most: int = 60) -> str:
    """`value` as it is shown in a message: in quotes, cut short, on one line."""
    text = " ".join(str(value).split())
    return f"'{text[: most - 1]}…'" if len(text) > most else f"'{text}'"
