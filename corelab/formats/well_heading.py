"""What a file for other programs says of the well before its plugs."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class WellHeading:
    """Facts of a well as texts, empty where not known; `runs_m` are core tops and bases."""

    well: str
    company: str = ""
    field: str = ""
    country: str = ""
    identifier: str = ""
    laboratory: str = ""
    date: str = ""
    datum: str = ""
    runs_m: tuple[tuple[float, float], ...] = ()


def one_line(text: object) -> str:
    """A text without line breaks, tabs and control characters, blanks single."""
    return " ".join("".join(c if c.isprintable() else " " for c in str(text)).split())
