"""Showing frames on a terminal, as JSON and in words."""

from __future__ import annotations

import json
import math
import shutil
import sys
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import typer

if TYPE_CHECKING:
    import pandas as pd

_GAP = 2


def tell(text: str = "") -> None:
    """Something about the work, on standard error."""
    typer.echo(text, err=True)


def json_records(frame: pd.DataFrame, texts: Iterable[str] = ("flags",)) -> list[dict[str, Any]]:
    """Rows as plain objects: None for what is not there; the columns of `texts` stay empty texts."""
    keep = set(texts)
    columns = list(frame.columns)
    lists = [[_plain(v, "" if c in keep else None) for v in frame[c].tolist()] for c in columns]
    return [dict(zip(columns, values, strict=True)) for values in zip(*lists, strict=True)]


def _plain(value: Any, empty: str | None) -> Any:
    if value is None or value == "":
        return empty
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if hasattr(value, "item"):
        return _plain(value.item(), empty)
    return value


def as_json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False)


def print_json(value: object) -> None:
    typer.echo(as_json(value))


def room() -> int | None:
    """Characters in a line of the terminal; None where the output goes elsewhere, and nothing need fit."""
    return shutil.get_terminal_size((120, 40)).columns if sys.stdout.isatty() else None


def print_table(frame: pd.DataFrame, decimals: Mapping[str, int] | None = None, *, wrap: str = "") -> None:
    typer.echo("\n".join(table(frame, decimals, wrap=wrap, room=room())[0]))


def table(
    frame: pd.DataFrame,
    decimals: Mapping[str, int] | None = None,
    *,
    wrap: str = "",
    important: Sequence[str] = (),
    room: int | None = None,
) -> tuple[list[str], list[str]]:
    """A frame in aligned lines, and the names of columns for which there was no room.

    Columns without any value are left out. Within `room`, headings stand over several lines and long texts
    fold, `wrap` first; nothing is cut. Columns named in `important` are taken in that order as long as there
    is room, and shown in the order of the frame.
    """
    if not len(frame):
        return ["none"], []
    cells: dict[str, list[str]] = {}
    for column in frame.columns:
        digits = (decimals or {}).get(column)
        shown = [_shown(v, digits) for v in frame[column].tolist()]
        if any(shown):
            cells[str(column)] = shown
    if not cells:
        return ["none"], []
    numeric = {c for c in cells if all(_is_number(v) for v in frame[c].tolist())}
    widths = {c: max(_heading_width(c, room), *map(_width, values)) for c, values in cells.items()}
    left_out: list[str] = []
    if room is not None:
        left_out = _without_room(widths, important, room)
        cells = {c: values for c, values in cells.items() if c not in left_out}
        widths = {c: widths[c] for c in cells}
        _narrow(widths, {c: v for c, v in cells.items() if c not in numeric}, wrap, room)
    columns = list(cells)
    lines = _row([_folded(c, widths[c]) for c in columns], columns, widths, numeric, low=True)
    for values in zip(*cells.values(), strict=True):
        folded = [_folded(text, widths[c]) for c, text in zip(columns, values, strict=True)]
        lines += _row(folded, columns, widths, numeric)
    return lines, left_out


def _without_room(widths: Mapping[str, int], important: Sequence[str], room: int) -> list[str]:
    left = room + _GAP - sum(w + _GAP for c, w in widths.items() if c not in important)
    taken = set()
    for column in important:
        if column in widths and widths[column] + _GAP <= left:
            left -= widths[column] + _GAP
            taken.add(column)
    return [c for c in widths if c in important and c not in taken]


def _narrow(widths: dict[str, int], texts: Mapping[str, list[str]], wrap: str, room: int) -> None:
    """Take from the widths of columns of text what does not fit in the line: from `wrap` first."""
    total = sum(w + _GAP for w in widths.values()) - _GAP
    for column in sorted(texts, key=lambda c: (c != wrap, -widths[c])):
        words = [word for text in (*texts[column], column) for word in text.split()]
        least = min(widths[column], max(24 if column == wrap else 0, *map(_width, words)))
        narrower = max(least, widths[column] - max(total - room, 0))
        total -= widths[column] - narrower
        widths[column] = narrower


def _row(
    cells: Sequence[Sequence[str]],
    columns: Sequence[str],
    widths: Mapping[str, int],
    numeric: set[str],
    *,
    low: bool = False,
) -> list[str]:
    """The lines of one row; headings stand `low`, on the line above the values."""
    high = max(len(lines) for lines in cells)
    padded = [[""] * (high - len(c)) + [*c] if low else [*c] + [""] * (high - len(c)) for c in cells]
    return [
        (" " * _GAP)
        .join(_pad(text, widths[c], c in numeric) for c, text in zip(columns, line, strict=True))
        .rstrip()
        for line in zip(*padded, strict=True)
    ]


def _heading_width(heading: str, room: int | None) -> int:
    return _width(heading) if room is None else max(map(_width, heading.split()))


def _folded(text: str, width: int) -> list[str]:
    """A text in lines of at most `width`, broken between words where it can be."""
    if _width(text) <= width:
        return [text]
    lines = [""]
    for word in text.split():
        if lines[-1] and _width(lines[-1]) + 1 + _width(word) > width:
            lines.append("")
        lines[-1] += f" {word}" if lines[-1] else word
    return lines


def _is_number(value: object) -> bool:
    return value is None or (isinstance(value, (int, float)) and not isinstance(value, bool))


def _shown(value: Any, digits: int | None) -> str:
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    if isinstance(value, float):
        return f"{value:.{digits}f}" if digits is not None else significant(value)
    return " ".join(str(value).split())


def significant(value: float, digits: int = 4) -> str:
    """A number with so many significant digits, without an exponent where that is readable."""
    if value == 0:
        return "0"
    if not 1e-5 <= abs(value) < 1e7:
        return f"{value:.{digits - 1}e}"
    places = max(digits - 1 - math.floor(math.log10(abs(value))), 0)
    return f"{value:.{places}f}"


def _width(text: str) -> int:
    return sum(
        0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text
    )


def _pad(text: str, width: int, right: bool) -> str:
    space = " " * max(width - _width(text), 0)
    return space + text if right else text + space


def numbered(texts: Sequence[str]) -> tuple[list[str], list[str]]:
    """Texts of parts joined by "; ", as numbers of notes; and the notes."""
    notes: dict[str, int] = {}
    marks = []
    for text in texts:
        numbers = [notes.setdefault(part, len(notes) + 1) for part in text.split("; ") if part]
        marks.append(", ".join(map(str, sorted(numbers))))
    return marks, [f"{number:>3}  {note}" for note, number in notes.items()]


def event_words(detail: str) -> str:
    """The details of an event, kept as JSON, in words."""
    parts = []
    for name, value in json.loads(detail).items():
        if name == "files":
            parts.append(f"{len(value)} file{'' if len(value) == 1 else 's'}")
        elif isinstance(value, list):
            listed = ", ".join(map(str, value[:8])) + (
                f" and {len(value) - 8} more" if len(value) > 8 else ""
            )
            parts.append(f"{name} {listed}")
        elif isinstance(value, dict):
            counts = ", ".join(f"{count} of {kind}" for kind, count in value.items())
            parts += [f"{name} {counts}"] if counts else []
        else:
            parts.append(f"{name} {value}")
    return "; ".join(parts)


def print_lines(lines: Sequence[str], most: int = 100) -> None:
    for line in lines[:most]:
        tell(line)
    if len(lines) > most:
        tell(f"… and {len(lines) - most} more")
