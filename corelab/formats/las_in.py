"""Logs in: LAS 1.2, 2.0 and 3.0, hostile until parsed.

The standards are the Canadian Well Logging Society's: LAS 2.0 (update of January 2014) and LAS 3.0. The
sections are read by the library lasio; what it is given is text that was looked at first.
"""

from __future__ import annotations

import io
import re
import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from corelab.errors import Problem, Refused, Unavailable, quoted

Array = NDArray[np.float64]

LARGEST_BYTES = 200_000_000
MOST_VALUES = 60_000_000
_FEET = {"f", "ft", "feet", "foot"}
_METRES = {"m", "meter", "meters", "metre", "metres", "mts", "mt"}
#: Quantity -> mnemonics by which the trade knows it, the words of its description, its units.
_PER_CM3 = r"g/c.*|kg/m3|k/m3"
_SHARE = r"v/v|pu|%|dec.*|m3/m3|frac.*|cfcf|p\.u\."
_WIDE = r"in.*|mm|cm"
QUANTITIES: dict[str, tuple[str, str, str]] = {
    "gamma": (r"H?S?C?GR[A-Z0-9]*|GAM|GAMMA|GRD|ECGR.*|GR_.*", r"gamma", r"g?api.*|cps"),
    "density correction": (r"DRHO.*|HDRA|ZCOR.*|DCOR.*|CORR", r"(density|bulk).*correction", _PER_CM3),
    "density": (r"RHO[BZM].*|DEN|DENS|ZDEN|BDCF?|RHOZ.*|DENB", r"bulk density|density$", _PER_CM3),
    "neutron porosity": (r"NPHI.*|TNPH.*|NPOR.*|CN[CL]?|NEUT?|NPL|PHIN|NPRL.*", r"neutron", _SHARE),
    "density porosity": (r"DPHI.*|PHID|DPOR.*|DPSS|DPLS", r"density porosity", _SHARE),
    "porosity": (r"PHI[TE].*|POR|PHI|PORO.*", r"(total|effective)? ?porosity", _SHARE),
    "sonic": (r"DT|DTC?O?|AC|DT[0-9A-Z]*", r"sonic|slowness|transit", r"us/.*|usec/.*|µs/.*"),
    "caliper": (r"CAL[A-Z0-9]*|HCAL|DCAL|C1|C2|HDIA", r"cal[il]+per", _WIDE),
    "bit size": (r"BS|BIT", r"bit size", _WIDE),
    "resistivity": (r"R[A-Z]*[0-9]*|ILD|LLD|RT|AT[0-9]+", r"resist", r"ohm.*"),
}


@dataclass(frozen=True, slots=True)
class Curve:
    """A curve of a file: values (n,) in the unit that stands there, NaN for what is absent."""

    mnemonic: str
    unit: str
    description: str
    quantity: str
    values: Array


@dataclass(frozen=True, slots=True)
class Las:
    """A file that was read: depths in metres, curves, and what stood in its head."""

    version: str
    well: str
    depth_m: Array
    depth_unit: str
    curves: tuple[Curve, ...]
    notices: tuple[str, ...]


def read_las(path: Path) -> Las:
    """Read the log data of a LAS file.

    Raises
    ------
    Refused
        If it is no LAS file, or has no depth that can be told.
    Unavailable
        If it cannot be read, or is larger than a log is.
    """
    text = _text(path)
    shown = path.name
    version = re.search(r"^\s*VERS\s*\.\s*([0-9.]+)", text, re.MULTILINE | re.IGNORECASE)
    if version is None or not re.search(r"^\s*~\s*[VW]", text, re.MULTILINE | re.IGNORECASE):
        raise _refused(shown, "no section ~Version with VERS", "a LAS file, version 1.2, 2.0 or 3.0")
    notices: list[str] = []
    if version[1].startswith("3"):
        text, more = _log_data_only(text, shown)
        notices += more
    las = _parsed(text, shown)
    curves = las.curves
    if not curves or not len(curves[0].data):
        raise _refused(shown, "no log data", "a section ~ASCII or ~Log_Data with rows of numbers")
    depth, unit, note = _depth(las, shown)
    notices += note
    made: list[Curve] = []
    seen: dict[str, int] = {}
    for curve in curves[1:]:
        values = _numbers(curve.data)
        if values is None:
            notices.append(f"curve {curve.original_mnemonic} holds texts and was passed over")
            continue
        mnemonic = re.sub(r":\d+$", "", str(curve.original_mnemonic or curve.mnemonic)).strip() or "unnamed"
        seen[mnemonic.upper()] = seen.get(mnemonic.upper(), 0) + 1
        if seen[mnemonic.upper()] > 1:
            notices.append(f"there are several curves {mnemonic}: they are numbered in their order")
            mnemonic = f"{mnemonic}:{seen[mnemonic.upper()]}"
        description, curve_unit = str(curve.descr or "").strip(), str(curve.unit or "").strip()
        made.append(
            Curve(mnemonic, curve_unit, description, quantity(mnemonic, curve_unit, description), values)
        )
    if not made:
        raise _refused(shown, "no curve of numbers beside the depth", "one at least")
    order = np.argsort(depth, kind="stable")
    keep = order[np.isfinite(depth[order])]
    curves_kept = tuple(Curve(c.mnemonic, c.unit, c.description, c.quantity, c.values[keep]) for c in made)
    name = ""
    for key in ("WELL", "UWI"):
        item = next((i for i in las.well if i.original_mnemonic.upper() == key), None)
        name = name or (str(item.value).strip() if item is not None else "")
    return Las(version[1], name, depth[keep], unit, curves_kept, tuple(dict.fromkeys(notices)))


def quantity(mnemonic: str, unit: str, description: str) -> str:
    """What a curve measures, by its mnemonic if the unit agrees, else by its description; else empty."""
    name = re.sub(r":\d+$", "", mnemonic).strip()
    for what, (names, words, units) in QUANTITIES.items():
        fits = not unit or re.fullmatch(units, unit.strip(), re.IGNORECASE)
        if fits and re.fullmatch(names, name, re.IGNORECASE):
            return what
        if fits and unit and re.search(words, description, re.IGNORECASE):
            return what
    return ""


def _text(path: Path) -> str:
    try:
        size = path.stat().st_size
        if size > LARGEST_BYTES:
            raise Unavailable(f"{path.name} has {size / 1e6:.0f} MB, more than a log has: look at the file.")
        content = path.read_bytes()
    except OSError as trouble:
        raise Unavailable(f"{path} cannot be read ({trouble.strerror}).") from trouble
    if b"\x00" in content[:4000] and not content.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise _refused(path.name, "a binary file", "a LAS file, which is text")
    for coding in (
        "utf-8-sig",
        "utf-16" if content[:2] in (b"\xff\xfe", b"\xfe\xff") else "cp1252",
        "latin-1",
    ):
        try:
            return content.decode(coding).replace("\r\n", "\n").replace("\r", "\n").replace("\x1a", "")
        except UnicodeDecodeError:
            continue
    raise _refused(path.name, "an unknown coding", "a LAS file, which is text")


def _log_data_only(text: str, shown: str) -> tuple[str, list[str]]:
    """Of a LAS 3.0 file, what lasio understands: version, well, the first log's definition and data.

    Data of other kinds (core, tops, tests) have sections of their own and are passed over.
    """
    parts = re.split(r"^(?=\s*~)", text, flags=re.MULTILINE)
    head: list[str] = []
    definition = data = ""
    delimiter = "SPACE"
    passed: list[str] = []
    for part in parts:
        title = part.strip().split("\n", 1)[0].strip()[1:].split("|")[0].strip().lower()
        if title.startswith("v"):
            found = re.search(r"^\s*DLM\s*\.\s*(\w+)", part, re.MULTILINE | re.IGNORECASE)
            delimiter = found[1].upper() if found else "SPACE"
            head.append(part)
        elif title.startswith("w") and not head[1:]:
            head.append(part)
        elif re.match(r"(log_definition|curve|c\b)", title) and not definition:
            definition = part
        elif re.match(r"(log_data|ascii|a\b)", title) and not data:
            data = part
        elif re.search(r"_data", title):
            passed.append(title)
    if not definition or not data:
        raise _refused(shown, "no ~Log_Definition with ~Log_Data", "log data; core data are read otherwise")
    body = data.strip().split("\n")[1:]
    rows = [line for line in body if line.strip() and not line.lstrip().startswith("#")]
    if delimiter in ("COMMA", "TAB"):
        mark = "," if delimiter == "COMMA" else "\t"
        rows = [" ".join(cell.strip() or "NaN" for cell in _cells(line, mark)) for line in rows]
    lines = definition.strip().split("\n")[1:]
    lines = [re.sub(r"\{[^}]*\}.*$", "", line).rstrip() for line in lines]
    version = "~Version\nVERS. 2.0 :\nWRAP. NO :\n"
    made = (
        version + "".join(head[1:]) + "\n~Curve\n" + "\n".join(lines) + "\n~ASCII\n" + "\n".join(rows) + "\n"
    )
    notes = [f"sections {', '.join(passed)} hold other data and were passed over"] if passed else []
    return made, notes


def _cells(line: str, mark: str) -> list[str]:
    import csv

    return [
        cell if re.fullmatch(r"\s*[-+0-9.eE]*\s*", cell) else "NaN"
        for cell in next(csv.reader([line], delimiter=mark))
    ]


def _parsed(text: str, shown: str) -> Any:
    import logging

    import lasio

    logging.getLogger("lasio").setLevel(logging.CRITICAL)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            las = lasio.read(io.StringIO(text), ignore_header_errors=True, mnemonic_case="preserve")
    except Exception as trouble:  # whatever the library makes of a broken file
        said = " ".join(str(trouble).split())[:160]
        raise _refused(shown, f"a file that cannot be followed ({said})", "a whole LAS file") from trouble
    if sum(len(c.data) for c in las.curves) > MOST_VALUES:
        raise Unavailable(f"{shown} holds more values than a log has: cut it into parts.")
    return las


def _depth(las: Any, shown: str) -> tuple[Array, str, list[str]]:
    index = las.curves[0]
    values = _numbers(index.data)
    if values is None or not np.isfinite(values).any():
        raise _refused(shown, "no depths in the first column", "depth first, in metres or feet")
    start = next((i for i in las.well if i.original_mnemonic.upper() == "STRT"), None)
    typed = [str(index.unit or ""), str(start.unit if start is not None else "")]
    for unit in typed:
        plain = unit.strip().strip(".").lower()
        if plain in _METRES:
            return values, "m", []
        if plain in _FEET:
            return values * 0.3048, "ft", []
        if re.fullmatch(r"\.?0?\.?1 ?in", plain):
            return values * 0.1 * 0.0254, "0.1 in", []
    if any(t.strip() for t in typed):
        raise _refused(
            shown, f"depths in {quoted(' / '.join(t for t in typed if t.strip()))}", "depths in m or ft"
        )
    raise _refused(shown, "depths without a unit", "m or ft beside the first curve, as in 'DEPT.M'")


def _numbers(data: Any) -> Array | None:
    """The values as floats; None where they are texts."""
    values = np.asarray(data)
    if values.dtype.kind in "fiu":
        made = values.astype(np.float64)
    else:
        import pandas as pd

        made = pd.to_numeric(pd.Series(values.ravel()), errors="coerce").to_numpy(dtype=np.float64)
        if not np.isfinite(made).any():
            return None
    return np.where(np.isfinite(made) & (np.abs(made) < 1e30), made, np.nan)


def _refused(shown: str, found: str, wanted: str) -> Refused:
    return Refused([Problem(found, wanted, "check the file, or ask its sender for another", shown)])
