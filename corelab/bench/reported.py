"""What another laboratory's file says: its plugs, and its results in our words and units.

Rules, for files do not state them. A number below -90, or a negative one that comes back, stands for nothing
entered. A permeability or density of exactly zero was not measured: no rock has one, and writers put zero
where a plug broke. A porosity of zero stands, except in a row without any other measurement of that plug; a
saturation of zero stands, except where all saturations of a row are zero. What has no known unit is taken in
the one that fits its size, and flagged. Nothing is guessed beyond that: what is not understood stays in the
record as entered and is named.
"""

from __future__ import annotations

import math
import re
from collections import Counter
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal

import numpy as np

from corelab import units
from corelab.errors import quoted
from corelab.formats.spwla_in import FACTS, FLAGS, Meaning, Sample, SpwlaFile
from corelab.quantities import RESULTS
from corelab.records.store import name_key
from corelab.science.lithology import grain_density_range_g_cm3

NOT_STATED = "not stated"
ZERO = "zero in the file, taken as not measured"
SUMMATION = "summation of fluids"
REPORTED = "reported"
HORIZONTAL, VERTICAL, OBLIQUE = "horizontal", "vertical", "oblique"
#: The stress of the results beside it, of those whose name ends with its basis.
STRESS = "net confining stress"
DEPTH_BASES = ("driller", "log")
_ROUTES = ("bulk-grain", "bulk-pore", "pore-grain")
_NULLS = frozenset({-99.0, -99.9, -99.99, -999.0, -999.25, -999.99, -1001.0, -1002.0, -9999.0, -9999.25})
#: What no negative number of these quantities can be; nor can one that comes back as often by chance.
_LOWEST, _OFTEN = -90.0, 3
_NOTHING = frozenset({"", "-", "--", "n/a", "na", "nan", "null"})
_TOKEN = re.compile(r"([<>]?)\s*([-+]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][-+]?\d{1,3})?)")
#: Codes of units seen in files, with what the same files show them to be.
UNIT_CODES: Mapping[int, str] = {2031: "mD", 3084: "%", 3085: "%", 1086: "g/cm3"}
_TOLD_BY_SIZE = frozenset({"fraction", "density", "permeability", "volume", "mass"})
_NEVER_ZERO = frozenset({"permeability", "density", "volume", "mass"})
_UNIT_WORDS = (
    (r"\bmd\b|millidarc", "mD"),
    (r"\bdarc(y|ies)\b", "D"),
    (r"\bkg/m3\b|\bkg/m\^3|\bkg/m³", "kg/m3"),
    (r"\bgm?/(cc|cm3|cm\^3|cm³|ml)", "g/cm3"),
    (r"%|\bp\.?u\.?(?=\W|$)|per ?cent|\bpct\b", "%"),
    (r"\bfrac|v/v|\bdec\.|\bdecimal", "v/v"),
    (r"\bcm3\b|\bcc\b|\bml\b|\bcm³", "cm3"),
    (r"\(g\)|\bgrams?\b", "g"),
    (r"\bkpa", "kPa"),
    (r"\bmpa", "MPa"),
    (r"\bpsia?\b", "psia"),
    (r"\bpsi\w?\b", "psi"),
    (r"\bbar", "bar"),
)
_STRESS = re.compile(
    r"(?:@|\bat\b|\bncs\b|\bnob\b|overburden\D{0,12})\s*=?\s*(\d+(?:\.\d+)?)\s*(psi|bar|mpa|kpa)\w?", re.I
)
_ABBREVIATED: Mapping[str, str] = {
    "sst": "sandstone", "ss": "sandstone", "sd": "sand", "slst": "siltstone", "sltst": "siltstone",
    "mdst": "mudstone", "clst": "claystone", "sh": "shale", "ls": "limestone", "lst": "limestone",
    "dol": "dolomite", "cgl": "conglomerate", "congl": "conglomerate", "chk": "chalk", "anhy": "anhydrite",
    "mrl": "marl",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a file, understood; `symbol` is the unit, `assumed` where the file does not tell it."""

    place: int
    laboratory: str
    quantity: str
    orientation: str = ""
    direction: str = ""
    basis: str = ""
    stress_mpa: float | None = None
    symbol: str = ""
    assumed: bool = False

    @property
    def kind(self) -> str:
        return "stress" if self.quantity == STRESS else RESULTS[self.quantity].kind


@dataclass(slots=True)
class Value:
    """One result as another laboratory reports it, or the reason why it gives none."""

    quantity: str
    direction: str
    basis: str
    stress_mpa: float | None
    value: float | None
    value_limit: str | None = None
    flags: list[str] = field(default_factory=list)
    reason: str = ""


@dataclass(slots=True)
class Plug:
    """One plug of a file. `sample` is the sample point, which two plugs may share; `entered` as written."""

    name: str
    sample: str
    laboratory: str
    depth_m: float | None
    depth_basis: str
    source: str
    orientation: str
    facies: str
    lithology: str
    description: str
    row: int
    entered: dict[str, str]
    flags: list[str] = field(default_factory=list)
    values: list[Value] = field(default_factory=list)


def plugs_of(file: SpwlaFile, *, laboratory: str, depth_unit: str, told: Callable[[str], None]) -> list[Plug]:
    """The plugs of a file with their results, in the order of the file.

    Parameters
    ----------
    laboratory
        Whose results they are; as the file says where empty.
    depth_unit
        The unit of the file's depths, which it does not state.
    told
        Takes what was assumed or not understood, a line each.
    """
    columns = [_understood(place, meaning) for place, meaning in enumerate(file.meanings)]
    tokens = [[s.values[p] if p < len(s.values) else "" for s in file.samples] for p in range(len(columns))]
    nulls = _nulls(tokens, told)
    known: list[Column] = []
    taken: set[tuple[object, ...]] = set()
    for column, meaning, cells in zip(columns, file.meanings, tokens, strict=True):
        filled = sum(not _nothing(cell, nulls) for cell in cells)
        if column is None:
            if filled:
                told(f"{_shown(meaning)}: not understood; its {filled} values are kept as entered")
            continue
        key = (
            column.laboratory,
            column.quantity,
            column.orientation,
            column.direction,
            column.basis,
            column.stress_mpa,
        )
        if key in taken:
            told(f"{_shown(meaning)}: a second column of the same; its {filled} values are kept as entered")
            continue
        taken.add(key)
        measured = _with_unit(column, meaning, cells, nulls, told)
        if measured is not None:
            known.append(measured)
    lengths = units.unit(depth_unit, "length")
    made: list[Plug] = []
    for sample in file.samples:
        depth = None if sample.depth is None else float(units.to_base(sample.depth, lengths))
        made += _of_sample(file, sample, known, nulls, laboratory, depth)
    _name_apart(made, told)
    _judge(made)
    if any(_number(s.more) for s in file.samples):
        told("what the second number of a sample means is not understood; it is kept as entered")
    zeros = sum(v.reason == ZERO for p in made for v in p.values)
    if zeros:
        told(f"{zeros} values of zero are taken as not measured")
    odd = Counter(v.reason for p in made for v in p.values if v.reason and v.reason != ZERO)
    for reason, times in odd.items():
        told(f"{times} values are not taken: {reason}")
    return made


def _shown(meaning: Meaning) -> str:
    codes = " ".join(str(c) for c in meaning.codes)
    return f"{quoted(meaning.text or 'no words')} (codes {codes})" if codes else quoted(meaning.text)


# -- what a column is -------------------------------------------------------------------------------------


def _understood(place: int, meaning: Meaning) -> Column | None:
    """A column by its words, in the trade's usual shortenings."""
    text = re.sub(r"v/v", " ", meaning.text.casefold())
    found = _quantity(text)
    if found is None:
        return None
    quantity, basis = found
    orientation, direction = "", ""
    if re.search(r"\bvert|\bver\b|\bv\b|\bk[a-z]*v\b", text):
        orientation = VERTICAL
    elif re.search(r"\bhor|\bh\b|\bk[a-z]*h\b", text):
        orientation = HORIZONTAL
    elif re.search(r"\bobl", text):
        orientation = OBLIQUE
    elif "permeability" in quantity and (whole := re.search(r"\bk?(max|90)\b", text)):
        orientation, direction = HORIZONTAL, whole[1]
    stress = _STRESS.search(text)
    stress_mpa = None
    if stress:
        unit = units.unit({"mpa": "MPa", "kpa": "kPa"}.get(stress[2].lower(), stress[2].lower()), "stress")
        stress_mpa = float(units.convert(float(stress[1]), unit, units.unit("MPa", "stress")))
    return Column(place, meaning.laboratory, quantity, orientation, direction, basis, stress_mpa)


def _quantity(text: str) -> tuple[str, str] | None:
    def has(pattern: str) -> bool:
        return re.search(pattern, text) is not None

    if has(r"^(net )?(confining|overburden|effective) (stress|press)|^ncs\b|^nob\b"):
        return STRESS, "porosity" if has("poros") else "permeability" if has("perm") else ""
    for name, pattern in (
        ("mean pressure", r"\bmean press"),
        ("slip factor", r"\bslip factor|klinkenberg factor"),
        ("dry mass", r"\bdry (mass|weight)"),
    ):
        if has(pattern):
            return name, REPORTED
    if has(r"\bperm|\bk(air|gas|liq|l|inf|h|v|ah|av|lh|lv|max|90)?\b") and not has(r"\brel|ratio|log"):
        if has(r"klink|\bkl[a-z]?\b|\bkinf\b|equiv|\bkliq|slip|\bliq"):
            return "klinkenberg permeability", REPORTED
        if has(r"brine|water|\boil\b|\bliquid\b"):
            return "liquid permeability", REPORTED
        gases = (("nitrogen", r"nitrogen|\bn2\b"), ("helium", r"\bhe(lium)?\b"), ("air", r"air|\bka[hv]\b"))
        return "gas permeability", next((gas for gas, pattern in gases if has(pattern)), "")
    if has(r"\bpor(e|\b|\.|os)|\bphi\b") and not has(r"vol|press|throat|size|compress"):
        if has(r"\bsum"):
            return "porosity", SUMMATION
        return "porosity", next((route for route in _ROUTES if route in text), REPORTED)
    if has(r"\bdens|\bden\b|\bg\.?d\b|\brho"):
        if has(r"grain|matrix|\bg\.?d\b|\bma\b"):
            return "grain density", REPORTED
        return ("bulk density", REPORTED) if has(r"bulk") and not has(r"satur|wet") else None
    if has(r"\bsat|\bs[owg]\b"):
        for word, pattern in (("oil", r"\boil|\bso\b"), ("water", r"water|\bsw\b"), ("gas", r"gas|\bsg\b")):
            if has(pattern):
                return f"{word} saturation", REPORTED
        return None
    if has(r"\bvol") and not has(r"compress"):
        for word in ("bulk", "grain", "pore"):
            if has(rf"\b{word}"):
                return f"{word} volume", REPORTED
    return None


def _with_unit(
    column: Column,
    meaning: Meaning,
    cells: Sequence[str],
    nulls: frozenset[float],
    told: Callable[[str], None],
) -> Column | None:
    """The unit by its code, else by the words, else by the size of the values where that can tell."""
    table = units.UNITS[column.kind]
    symbol = next((UNIT_CODES[c] for c in meaning.codes[1:] if UNIT_CODES.get(c) in table), "")
    if not symbol:
        text = meaning.text.casefold()
        symbol = next((s for pattern, s in _UNIT_WORDS if s in table and re.search(pattern, text)), "")
    values = [v for c in cells if not _nothing(c, nulls) and (v := _number(c)) is not None and v > 0]
    if symbol:
        small = symbol == "%" and len(values) >= _OFTEN and max(values) <= 1.0
        if small:
            told(f"{_shown(meaning)}: all values are below 1 %; ask whether they are fractions")
        return replace(column, symbol=symbol)
    if column.kind not in _TOLD_BY_SIZE:
        if values:
            told(
                f"{_shown(meaning)}: its unit is not known here; its {len(values)} values are kept as entered"
            )
        return None
    middle = float(np.median(values)) if values else math.nan
    if column.kind == "fraction":
        symbol = "%" if values and max(values) > 1.0 else "v/v"
    elif column.kind == "density":
        symbol = "kg/m3" if middle > 100.0 else "g/cm3"
    else:
        symbol = {"permeability": "mD", "volume": "cm3", "mass": "g"}[column.kind]
    if values:
        told(f"{_shown(meaning)}: its unit is not known here; by their size the values are taken as {symbol}")
    return replace(column, symbol=symbol, assumed=True)


# -- values -----------------------------------------------------------------------------------------------


def _number(text: str) -> float | None:
    found = _TOKEN.fullmatch(text)
    return None if found is None else float(re.sub("[dD]", "e", found[2]))


def _nulls(tokens: Iterable[Sequence[str]], told: Callable[[str], None]) -> frozenset[float]:
    times: Counter[float] = Counter()
    for cells in tokens:
        times.update(v for c in cells if c[:1] == "-" and (v := _number(c)) is not None and v < 0)
    found = {v: n for v, n in times.items() if v in _NULLS or v < _LOWEST or n >= _OFTEN}
    for value, n in sorted(found.items()):
        told(f"{value:g} stands {n} times for nothing entered")
    return frozenset(found)


def _nothing(text: str, nulls: frozenset[float]) -> bool:
    return text.casefold() in _NOTHING or (text[:1] == "-" and _number(text) in nulls)


def _value(column: Column, text: str) -> Value:
    """A cell that is filled."""
    made = Value(column.quantity, column.direction, column.basis, column.stress_mpa, None)
    found = _TOKEN.fullmatch(text)
    if found is None:
        made.reason = f"{quoted(text, 20)} in the file is no number"
        return made
    number = re.sub("[dD]", "e", found[2])
    value = float(number)
    if value == 0.0 and column.kind in _NEVER_ZERO:
        made.reason = ZERO
        return made
    shift = column.symbol == "%"
    value = float(Decimal(number).scaleb(-2)) if shift else _stored(column, value)
    low, high = RESULTS[column.quantity].possible
    if not low <= value <= high or not math.isfinite(value) or abs(value) > 1e300:
        made.reason = f"{text} in the file is not possible"
        return made
    made.value = value + 0.0
    name = column.quantity
    if found[1]:
        made.value_limit = "below" if found[1] == "<" else "above"
        made.flags.append(f"{name} {made.value_limit} limit")
    low, high = RESULTS[name].plausible
    if not low <= value <= high:
        made.flags.append(f"{name} outside the usual range")
    if column.assumed:
        made.flags.append(f"{name}: unit assumed")
    return made


def _stored(column: Column, value: float) -> float:
    source = units.unit(column.symbol, column.kind)
    if column.quantity == STRESS:
        return float(units.convert(value, source, units.unit("MPa", "stress")))
    return float(units.convert(value, source, units.unit(RESULTS[column.quantity].unit, column.kind)))


# -- plugs ------------------------------------------------------------------------------------------------


def _of_sample(
    file: SpwlaFile,
    sample: Sample,
    columns: Sequence[Column],
    nulls: frozenset[float],
    laboratory: str,
    depth_m: float | None,
) -> list[Plug]:
    """The plugs of one sample: two where values of both orientations are entered, those of each laboratory.

    What has no orientation belongs to the horizontal one, on which it is usually measured.
    """
    filled = [(c, sample.values[c.place]) for c in columns if c.place < len(sample.values)]
    filled = [(c, text) for c, text in filled if not _nothing(text, nulls)]
    oriented: dict[str, set[str]] = {}
    for column, _ in filled:
        oriented.setdefault(column.laboratory, set()).add(column.orientation)
    own = [text for text in sample.words if not text.startswith((FLAGS, FACTS))]
    facts = _facts([text for text in sample.words if text.startswith(FACTS)])
    flags = [
        f for text in sample.words if text.startswith(FLAGS) for f in text.removeprefix(FLAGS).split("; ")
    ]
    description = " ".join(own)
    name = sample.name or ("" if sample.depth is None else f"{sample.depth:g}")
    made: list[Plug] = []
    told = facts["laboratory"] or next((m.laboratory for m in file.meanings if m.laboratory), "")
    named = [(lab, sorted(there - {""})) for lab, there in (oriented or {told: {""}}).items()]
    for origin, orientation, first in [(lab, o, all_of) for lab, all_of in named for o in all_of or [""]]:
        both = len(first) > 1
        mine = [(c, t) for c, t in filled if c.laboratory == origin]
        mine = [(c, t) for c, t in mine if not both or (c.orientation or first[0]) == orientation]
        elsewhere = {c.place for c, _ in filled} - {c.place for c, _ in mine}
        if made:  # what belongs to neither stands with the first
            elsewhere |= {p for p in range(len(sample.values)) if p not in {c.place for c, _ in mine}}
        entered = {"sample": sample.line.strip()} | {
            file.meanings[place].text or f"value {place + 1}": text
            for place, text in enumerate(sample.values)
            if text and place not in elsewhere
        }
        made.append(
            Plug(
                name=name + orientation[0].upper() if both else name,
                sample=sample.name,
                laboratory=laboratory or origin or file.laboratory or NOT_STATED,
                depth_m=depth_m,
                depth_basis=facts["depth basis"],
                source=facts["source"],
                orientation=orientation or facts["orientation"],
                facies=facts["facies"],
                lithology=_lithology(description),
                description=description,
                row=sample.row,
                entered=entered,
                flags=list(flags),
                values=_values(mine),
            )
        )
    return made


def _facts(lines: Sequence[str]) -> dict[str, str]:
    """What a line of facts says of a plug; else what conventional core analysis implies."""
    made = {"source": "core", "depth basis": DEPTH_BASES[0], "orientation": "", "facies": ""}
    made["laboratory"] = ""
    for part in "; ".join(line.removeprefix(FACTS) for line in lines).split("; "):
        name = next((n for n in made if part.startswith(f"{n} ")), "")
        text = part.removeprefix(name).strip()
        allowed = {"depth basis": DEPTH_BASES, "orientation": (HORIZONTAL, VERTICAL, OBLIQUE)}.get(name)
        if name and text and (allowed is None or text in allowed):
            made[name] = text
    return made


def _values(cells: Sequence[tuple[Column, str]]) -> list[Value]:
    """The results in cells that are filled, each at the stress that stands beside it, if one does."""
    made = [_value(c, text) for c, text in cells if c.quantity != STRESS]
    for column, text in cells:
        stress = _number(text) if column.quantity == STRESS else None
        if stress is None or stress < 0:
            continue
        for value in made:
            if value.stress_mpa is None and value.quantity.endswith(column.basis):
                value.stress_mpa = _stored(column, stress)
    return made


def _lithology(description: str) -> str:
    """The rock's name, which descriptions begin with, in full where its shortening is a usual one."""
    word = re.split(r"[.,;:\s]", description, maxsplit=1)[0]
    return _ABBREVIATED.get(word.casefold(), word)


def _name_apart(plugs: Sequence[Plug], told: Callable[[str], None]) -> None:
    """A name used for several plugs of one laboratory is told apart by a number behind it."""
    used: set[tuple[str, str]] = set()
    again = 0
    for plug in plugs:
        if not plug.name:
            plug.name = "without a name"
        wanted, number = plug.name, 1
        while (name_key(plug.laboratory), name_key(plug.name)) in used:
            number += 1
            plug.name = f"{wanted} ({number})"
        again += number > 1
        used.add((name_key(plug.laboratory), name_key(plug.name)))
    if again:
        told(f"{again} names stand more than once in the file; a number in brackets tells them apart")


def _judge(plugs: Sequence[Plug]) -> None:
    """What is doubtful in the values of one plug together."""
    rocks = grain_density_range_g_cm3(np.array([p.lithology for p in plugs], dtype=str))
    for plug, low, high in zip(plugs, rocks.low_g_cm3, rocks.high_g_cm3, strict=True):
        there = {(v.quantity, v.direction, v.stress_mpa): v for v in plug.values if v.value is not None}
        _leave_out_zeros(plug)
        for (quantity, direction, stress), value in there.items():
            if value.value is None:
                continue
            if quantity == "klinkenberg permeability":
                gas = there.get(("gas permeability", direction, stress))
                if gas is not None and gas.value is not None and value.value > gas.value:
                    value.flags.append("klinkenberg permeability above gas permeability")
            if quantity == "grain density" and (value.value < low or value.value > high):
                value.flags.append("grain density does not fit the described lithology")
        for value in plug.values:
            for side in ("below", "above"):
                words = f"{value.quantity} {side} limit"
                if words in plug.flags and value.value is not None:
                    value.value_limit = side
                    if words not in value.flags:
                        value.flags.append(words)


def _leave_out_zeros(plug: Plug) -> None:
    saturations = [v for v in plug.values if v.quantity.endswith("saturation") and v.value is not None]
    if saturations and not any(v.value for v in saturations) and len(saturations) > 1:
        for value in saturations:
            value.value, value.reason, value.flags = None, ZERO, []
    others = any(v.value is not None and v.quantity != "porosity" for v in plug.values)
    for value in plug.values:
        if value.quantity == "porosity" and value.value == 0.0 and not others:
            value.value, value.reason, value.flags = None, ZERO, []
