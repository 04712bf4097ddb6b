"""Plugs into LAS, the open standard for logs: 2.0 on irregular depths, and 3.0 with its sections for core.

LAS 2.0 (Canadian Well Logging Society, 1992, updated 2014) holds numbers alone: each plug has a number, and
section ~O tells under it the plug's name and what else is text. LAS 3.0 (2000) has sections of its own for
core; there the texts stand in columns, parted by tabs. Since many programs know only its log sections, the
numbers stand there again. Every number reads back as it was.
"""

from __future__ import annotations

import csv
import io
import math
import textwrap
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pandas as pd

from corelab.errors import Unavailable, Usage
from corelab.formats.tables_out import write_bytes
from corelab.formats.well_heading import WellHeading, one_line

VERSIONS = ("2.0", "3.0")
NULL = -999.25
_LONGEST, _WRAPPED = 256, 80  # characters of a line, by the standard
#: Mnemonics; the standard's own where it has one (CORT, CORB, PERM, CPOR, OIL, SWTR, CDES).
_MNEMONICS = {
    "depth": "DEPT", "log depth": "LDEP", "plug": "PLUG", "source": "SRCE", "laboratory": "LAB", "run": "RUN",
    "depth basis": "DBAS", "orientation": "ORIE", "facies": "FACI", "lithology": "CDES",
    "bulk volume": "BVOL", "grain volume": "GVOL", "pore volume": "PVOL", "dry mass": "DMAS",
    "porosity": "CPOR", "porosity route": "PROU", "porosity stress": "PSTR", "grain density": "GDEN",
    "bulk density": "BDEN", "gas permeability": "KGAS", "gas": "GAS", "mean pressure": "PMEA",
    "klinkenberg permeability": "PERM", "slip factor": "SLIP", "slip basis": "SBAS",
    "permeability basis": "KBAS", "permeability stress": "KSTR", "oil saturation": "OIL",
    "water saturation": "SWTR", "gas saturation": "SGAS", "crush likelihood": "CRSH",
    "crush verdict": "CRVE", "status": "STAT", "flags": "FLAG",
}  # fmt: skip


def write_las(path: Path, frame: pd.DataFrame, heading: WellHeading, version: str) -> None:
    """Write an interval's plugs; those without a depth are left out, and said so in the file.

    Raises
    ------
    Usage
        For a version that is not written here.
    Unavailable
        If there is no plug with a depth.
    """
    if version not in VERSIONS:
        raise Usage(f"LAS is written in version {' or '.join(VERSIONS)}, not '{version}'.")
    depth = next(c for c in frame.columns if c.startswith("depth ["))
    there = frame[frame[depth].notna()]
    if not len(there):
        raise Unavailable(f"{heading.well} has no plug with a depth to write.")
    text = _las2(there, depth, heading) if version == "2.0" else _las3(there, depth, heading)
    write_bytes(path, text.encode("utf-8"))


def _line(mnemonic: str, unit: str, value: object, description: str) -> str:
    """A line of a heading; the last colon opens the description, so that no other may stand in it."""
    said, words = (one_line(text).replace(":", ";") for text in (value, description))
    return f"{mnemonic}.{unit} {said} : {words}"


def _curves(frame: pd.DataFrame, numeric: bool) -> list[tuple[str, str, str, str]]:
    """Column, mnemonic, unit and description of the columns that hold anything; the well is told above."""
    made: list[tuple[str, str, str, str]] = []
    used: set[str] = set()
    for column in frame.columns:
        number = pd.api.types.is_numeric_dtype(frame[column])
        filled = frame[column].notna().any() if number else (frame[column] != "").any()
        if column == "well" or not filled or (numeric and not number):
            continue
        name, _, unit = column.partition(" [")
        bare = name.removeprefix("u ")
        mnemonic = _MNEMONICS.get(bare) or "".join(c for c in bare.upper() if c.isalnum())[:8]
        mnemonic = f"U{mnemonic}" if bare != name else mnemonic
        while mnemonic in used:
            mnemonic += "X"
        used.add(mnemonic)
        words = f"standard uncertainty of {bare}" if bare != name else name
        made.append((column, mnemonic, unit.rstrip("]"), words))
    return made


def _number(value: float) -> str:
    return repr(NULL if math.isnan(value) else value)


def _well(heading: WellHeading, depths: Sequence[float], unit: str, labels: str) -> list[str]:
    said = [
        ("COMP", heading.company, "COMPANY"),
        ("WELL", heading.well, "WELL"),
        ("FLD", heading.field, "FIELD"),
    ]
    said += [("LOC", "", "LOCATION")]
    if labels == "2.0":
        said += [("PROV", "", "PROVINCE"), ("CTRY", heading.country, "COUNTRY")]
    said += [("SRVC", heading.laboratory, "SERVICE COMPANY")]
    if labels == "3.0":
        said += [("CTRY", heading.country, "COUNTRY")]
    said += [("DATE", heading.date, "DATE {YYYY-MM-DD}" if labels == "3.0" else "DATE")]
    said += [("UWI", heading.identifier, "UNIQUE WELL IDENTIFIER")]
    if labels == "3.0":
        said += [("LATI", "", "LATITUDE"), ("LONG", "", "LONGITUDE"), ("GDAT", "", "GEODETIC DATUM")]
    return [
        _line("STRT", unit, _number(min(depths)), "START DEPTH"),
        _line("STOP", unit, _number(max(depths)), "STOP DEPTH"),
        _line("STEP", unit, "0", "STEP, 0 FOR IRREGULAR DEPTHS"),
        _line("NULL", "", NULL, "NULL VALUE"),
        *(_line(mnemonic, "", value, words) for mnemonic, value, words in said),
    ]


def _las2(frame: pd.DataFrame, depth: str, heading: WellHeading) -> str:
    depths = frame[depth].tolist()
    curves = [c for c in _curves(frame, numeric=True) if c[0] != depth]
    unit = depth.partition(" [")[2].rstrip("]")
    columns = [frame[c].to_numpy(dtype=np.float64).tolist() for c, *_ in curves]
    numbers = range(1, len(frame) + 1)
    rows = [
        [_number(z), str(n), *(_number(v) for v in values)]
        for z, n, *values in zip(depths, numbers, *columns, strict=True)
    ]
    wrapped = max(len(" ".join(row)) + 1 for row in rows) > _LONGEST
    lines = [
        "~Version",
        _line("VERS", "", "2.0", "CWLS LOG ASCII STANDARD - VERSION 2.0"),
        _line(
            "WRAP", "", "YES" if wrapped else "NO", "SEVERAL LINES A DEPTH" if wrapped else "ONE LINE A DEPTH"
        ),
        "~Well",
        *_well(heading, depths, unit, "2.0"),
        "~Parameter",
        _line("PDAT", "", heading.datum, "depth datum"),
        "~Curve",
        _line("DEPT", unit, "", "depth of the plug's centre"),
        _line("SAMP", "", "", "number of the plug in section ~Other"),
        *(_line(mnemonic, u, "", words) for _, mnemonic, u, words in curves),
        "~Other",
        "Each plug by its number SAMP:",
    ]
    texts = [c for c in frame.columns if c != "well" and not pd.api.types.is_numeric_dtype(frame[c])]
    for n, values in zip(numbers, frame[texts].itertuples(index=False), strict=True):
        told = "; ".join(f"{c} {one_line(v)}" for c, v in zip(texts, values, strict=True) if v)
        lines += textwrap.wrap(f"{n} {told}", _LONGEST - 6, subsequent_indent="    ")
    lines.append("~ASCII")
    for row in rows:
        if wrapped:
            lines.append(row[0])
            lines += textwrap.wrap(
                " ".join(row[1:]), _WRAPPED, break_long_words=False, break_on_hyphens=False
            )
        else:
            lines.append(" ".join(row))
    return "\n".join(lines) + "\n"


def _las3(frame: pd.DataFrame, depth: str, heading: WellHeading) -> str:
    depths = frame[depth].tolist()
    unit = depth.partition(" [")[2].rstrip("]")
    curves = [c for c in _curves(frame, numeric=False) if c[0] != depth]
    numeric = [c for c in curves if pd.api.types.is_numeric_dtype(frame[c[0]])]
    names = {c for c, *_ in numeric}
    cells = {
        c: [_number(v) for v in frame[c].to_numpy(dtype=np.float64).tolist()]
        if c in names
        else [one_line(v) for v in frame[c]]
        for c, *_ in curves
    }
    where = [_number(z) for z in depths]
    laboratories = sorted({v for v in frame["laboratory"] if v}) if "laboratory" in frame else []
    lines = [
        "~Version",
        _line("VERS", "", "3.0", "CWLS LOG ASCII STANDARD - VERSION 3.0"),
        _line("WRAP", "", "NO", "ONE LINE A DEPTH"),
        _line("DLM", "", "TAB", "DELIMITER"),
        "~Well",
        *_well(heading, depths, unit, "3.0"),
        "~Core_Parameter",
        _line("C_SRS", "", "core and sidewall plugs", "core source {S}"),
        _line("C_TY", "", "plugs", "core type {S}"),
        _line("C_TP", unit, _number(min(depths)), "core top depth {F}"),
        _line("C_BS", unit, _number(max(depths)), "core base depth {F}"),
        _line("C_AC", "", ", ".join(laboratories) or heading.laboratory, "analysing company {S}"),
        _line("PDAT", "", heading.datum, "depth datum {S}"),
        "~Core_Definition",
        _line("CORT", unit, "", "top, the centre of the plug {F}"),
        _line("CORB", unit, "", "base, the centre of the plug {F}"),
        *(_line(m, u, "", f"{words} {{{'F' if c in names else 'S'}}}") for c, m, u, words in curves),
        "~Core_Data | Core_Definition",
        *_rows([where, where, *(cells[c] for c, *_ in curves)]),
        "~Log_Definition",
        _line("DEPT", unit, "", "depth of the plug's centre {F}"),
        _line("SAMP", "", "", "number of the plug, its row in the core data {I}"),
        *(_line(m, u, "", f"{words} {{F}}") for _, m, u, words in numeric),
        "~Log_Data | Log_Definition",
        *_rows([where, [str(n) for n in range(1, len(where) + 1)], *(cells[c] for c, *_ in numeric)]),
    ]
    return "\n".join(lines) + "\n"


def _rows(columns: Sequence[Sequence[str]]) -> list[str]:
    text = io.StringIO()
    csv.writer(text, delimiter="\t", lineterminator="\n").writerows(zip(*columns, strict=True))
    return text.getvalue().splitlines()
