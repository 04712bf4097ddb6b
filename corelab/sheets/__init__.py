"""The bench sheets, each declared once. Light to import."""

from __future__ import annotations

import re
from types import MappingProxyType

from corelab.sheets.declaration import Column, Sheet
from corelab.sheets.readings import READINGS, STANDARDS_WELL
from corelab.sheets.registers import REGISTERS

SHEETS = MappingProxyType({sheet.kind: sheet for sheet in (*REGISTERS, *READINGS)})


def kind_named(typed: str) -> str | None:
    """The kind that a tab or a file stem means: spaces, `-` and `_` alike, a leading number allowed."""
    words = re.sub(r"[\s_\-]+", " ", typed.strip()).casefold()
    if words in SHEETS:
        return words
    without_number = re.sub(r"^\d+[\s.)]*", "", words).strip()
    return without_number if without_number in SHEETS else None


__all__ = ["SHEETS", "STANDARDS_WELL", "Column", "Sheet", "kind_named"]
