"""Showing frames on a terminal, as JSON and in words."""

from __future__ import annotations

import json
import math
import shutil
import sys
import unicodedata
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import typer

if TYPE_CHECKING:
    import pandas as pd

_WIDEST = 44


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


def print_json(value: object) -> None:
    typer.echo(json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False))


def print_table(frame: pd.DataFrame, decimals: dict[str, int] | None = None, *, wrap: str = "") -> None:
    """A frame in aligned columns; columns without any value are left out, `wrap` takes the room left."""
    if not len(frame):
        typer.echo("none")
        return
    cells: dict[str, list[str]] = {}
    for column in frame.columns:
        digits = (decimals or {}).get(column)
        shown = [_shown(v, digits) for v in frame[column].tolist()]
        if any(shown) or column == wrap:
            cells[str(column)] = shown
    numeric = {c for c in cells if all(_is_number(v) for v in frame[c].tolist())}
    widths = {c: max(_width(c), *(_width(v) for v in values)) for c, values in cells.items()}
    room = shutil.get_terminal_size((120, 40)).columns if sys.stdout.isatty() else 10_000
    for c in cells:
        if c not in numeric:
            widths[c] = min(widths[c], _WIDEST if sys.stdout.isatty() else 400)
    if wrap in cells and sys.stdout.isatty():
        others = sum(w + 2 for c, w in widths.items() if c != wrap)
        widths[wrap] = max(min(widths[wrap], room - others), 12)
    typer.echo("  ".join(_pad(c, widths[c], c in numeric) for c in cells).rstrip())
    for row in range(len(frame)):
        line = (_pad(_cut(cells[c][row], widths[c]), widths[c], c in numeric) for c in cells)
        typer.echo("  ".join(line).rstrip())


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
    return sum(2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text)


def _pad(text: str, width: int, right: bool) -> str:
    space = " " * max(width - _width(text), 0)
    return space + text if right else text + space


def _cut(text: str, width: int) -> str:
    return text if _width(text) <= width else text[: max(width - 1, 1)] + "…"


def print_lines(lines: Sequence[str], most: int = 100) -> None:
    for line in lines[:most]:
        tell(line)
    if len(lines) > most:
        tell(f"… and {len(lines) - most} more")
