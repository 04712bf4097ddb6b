"""The bench sheets, word for word as people and scripts rely on them.

A `*` marks what must be filled in, `**` what belongs to the key; `(a, b; default b)` lists the words taken.
"""

from __future__ import annotations

import math
import re

import pytest

from corelab.quantities import ENTERED, RESULTS
from corelab.sheets import SHEETS, STANDARDS_WELL, Column, Sheet, kind_named
from corelab.sheets.declaration import MOST_REPEATED_COLUMNS
from corelab.units import UNITS, accepted, unit

STATED = {
    "jobs": "**job***, laboratory*, client, partners, report number, received on",
    "wells": "**well***, job, field, country, unique well identifier, depth unit*, depth datum, "
    "datum elevation [m], mud, mud filtrate salinity [g/L], bit diameter [mm], confidential until",
    "core runs": "**well***, **run***, top depth [m]*, base depth [m]*, recovered length [m]*, "
    "core diameter [mm], loss at, cut on",
    "core sections": "**well***, **run***, **section***, top depth [m]*, base depth [m]*, box, state",
    "sidewall shots": "**well***, **gun run***, **shot***, depth [m]*, depth basis, tool*, outcome*, "
    "recovered length [mm], bullet, charge",
    "plugs": "**well***, **plug***, from*, run, gun run, shot, depth [m]*, top depth [m], base depth [m], "
    "orientation, azimuth [deg], companion of, duplicate of, facies, jacket mass [g], jacket volume [cm3], "
    "screen thickness [mm], taken on, location, priority",
    "descriptions": "**well***, **plug***, lithology*, grain size [mm], grain size class, sorting [phi], "
    "sorting class, sorting scale, roundness, firmness, cement, accessories, colour, stain, fluorescence, "
    "cut, odour, condition, described by",
    "crush verdicts": "**well***, **plug***, **judged by***, crushed*, seen in, judged on",
    "instruments": "**instrument***, **measures***, repeatability*, scale uncertainty, uncertainty unit*, "
    "certificate, calibrated on, due on",
    "standards": "**standard***, kind*, maker, certificate, valid until",
    "certified values": "**standard***, **result***, certified value*, unit*, standard uncertainty*, gas, "
    "mean pressure [kPa], net confining stress [MPa]",
    "treatments": "**well***, **plug***, **step***, method, solvent, temperature [degC], humidity [%], "
    "started on, ended on, end point",
    "not measured": "**well***, **plug***, **test***, reason*",
    "dimensions": "**well***, **plug***, length …n [mm]*, diameter …n [mm]*, caliper",
    "immersion": "**well***, **plug***, liquid*, mass in air [g], mass immersed [g], mass displaced [g], "
    "liquid density [g/cm3], temperature [degC], coating mass [g], coating density [g/cm3], balance",
    "masses": "**well***, **plug***, **condition***, mass [g]*, container mass [g], "
    "saturant density [g/cm3], salinity [g/kg], salt, salt density [g/cm3], balance",
    "porosimeter calibration": "**instrument***, **setup**, calibration, known volume [cm3]*, "
    "reference pressure [kPa]*, expanded pressure [kPa]*, barometric pressure [kPa], temperature [degC], "
    "net confining stress [MPa]",
    "grain volume": "**well***, **plug***, instrument*, billet volume [cm3], reference pressure [kPa], "
    "expanded pressure [kPa], barometric pressure [kPa], temperature [degC], cup temperature [degC], "
    "grain volume [cm3], container volume [cm3]",
    "pore volume": "**well***, **plug***, **net confining stress [MPa]***, instrument*, "
    "reference pressure [kPa]*, expanded pressure [kPa]*, barometric pressure [kPa], temperature [degC]",
    "gas permeability": "**well***, **plug***, **direction**, **step***, **net confining stress [MPa]**, "
    "confining pressure [kPa], stress type, gas*, upstream pressure [kPa], pressure difference [kPa], "
    "downstream pressure [kPa], flow rate [cm3/s]*, flow basis, flow pressure [kPa], "
    "flow temperature [degC], standard pressure [kPa], standard temperature [degC], "
    "barometric pressure [kPa], temperature [degC], geometric factor, permeameter",
    "reported permeability": "**well***, **plug***, **direction**, **net confining stress [MPa]**, "
    "permeameter*, klinkenberg permeability [mD], gas permeability [mD], gas, mean pressure [kPa], "
    "slip factor [kPa], inertial coefficient [1/m]",
    "liquid permeability": "**well***, **plug***, **step***, **net confining stress [MPa]**, liquid*, "
    "upstream pressure [kPa]*, downstream pressure [kPa], flow rate [cm3/s]*, viscosity [mPa.s], "
    "temperature [degC]",
    "distillation": "**well***, **plug***, water volume [cm3]*, trap temperature [degC], "
    "brine salinity [g/kg], brine density [g/cm3], salt, oil density [g/cm3]*, thimble mass [g]",
    "retort": "**well***, **plug***, sample mass [g]*, sample bulk volume [cm3]*, water volume [cm3]*, "
    "oil volume [cm3]*, gas sample mass [g], gas sample bulk volume [cm3], gas volume [cm3], "
    "oil density [g/cm3]",
    "sieve": "**well***, **plug***, **aperture [mm]***, mass retained [g]*",
    "core gamma": "**well***, **run**, **depth [m]***, gamma [gAPI]*",
}
REGISTERS = list(STATED)[: list(STATED).index("dimensions")]

CHOICES = {
    ("wells", "depth unit"): "m, ft",
    ("wells", "mud"): "water-based, oil-based, synthetic, air",
    ("core runs", "loss at"): "top, base; default base",
    ("core sections", "state"): "good, rubble, preserved, lost, elsewhere",
    ("sidewall shots", "depth basis"): "log, driller; default log",
    ("sidewall shots", "tool"): "percussion, rotary",
    ("sidewall shots", "outcome"): "recovered, partial, misfired, lost, empty, not attempted",
    ("plugs", "from"): "core, sidewall, whole core",
    ("plugs", "orientation"): "horizontal, vertical, oblique",
    ("plugs", "priority"): "normal, rush; default normal",
    ("descriptions", "firmness"): "loose, friable, firm, hard",
    ("descriptions", "condition"): "intact, chipped, cracked, powdered, crumbled, disked, mudcake, short",
    ("crush verdicts", "crushed"): "yes, no, unsure",
    ("crush verdicts", "seen in"): "hand specimen, thin section, scan",
    ("instruments", "measures"): "mass, length, pressure, flow rate, volume, temperature",
    ("standards", "kind"): "check plug, billet, void",
    ("treatments", "step"): "cleaning, drying",
    ("treatments", "method"): "distillation, flow-through, centrifuge, oven, vacuum oven, humidity oven",
    ("not measured", "reason"): "fractured, too short, crumbled, preserved, unsuitable, lost",
    ("immersion", "liquid"): "mercury, water, brine, toluene, ethanol",
    ("masses", "condition"): "as received, dry, saturated",
    ("masses", "salt"): "none, left, leached; default none",
    ("porosimeter calibration", "setup"): "cup, holder; default cup",
    ("gas permeability", "direction"): "axial, max, 90, vertical; default axial",
    ("gas permeability", "stress type"): "hydrostatic, biaxial",
    ("gas permeability", "gas"): "nitrogen, helium, air",
    ("gas permeability", "flow basis"): "actual, standard; default actual",
    ("reported permeability", "direction"): "axial, max, 90, vertical; default axial",
    ("distillation", "salt"): "none, left, leached; default none",
}

EITHER = {
    "immersion": [[{"mass in air", "mass immersed"}, {"mass displaced"}]],
    "grain volume": [[{"reference pressure", "expanded pressure"}, {"grain volume"}]],
    "gas permeability": [[{"upstream pressure"}, {"pressure difference"}]],
    "reported permeability": [[{"klinkenberg permeability"}, {"gas permeability"}]],
}

COLUMNS = [pytest.param(s, c, id=f"{s.kind}: {c.name}") for s in SHEETS.values() for c in s.columns]
NUMBERS = [
    pytest.param(s, c, id=f"{s.kind}: {c.name}") for s in SHEETS.values() for c in s.columns if c.quantity
]


def stated(kind: str) -> list[tuple[str, bool, bool, bool]]:
    """Heading, whether required, whether of the key, whether repeated."""
    columns = []
    for words in STATED[kind].split(", "):
        key = words.startswith("**")
        required = words.endswith("*") and not words.endswith("]**") and not re.search(r"[^*]\*\*$", words)
        heading = words.strip("*")
        columns.append((heading.replace(" …n", ""), required, key, "…n" in heading))
    return columns


def test_the_kinds() -> None:
    assert list(SHEETS) == list(STATED)
    assert [kind for kind, sheet in SHEETS.items() if not sheet.reading] == REGISTERS
    assert STANDARDS_WELL == "standards"


@pytest.mark.parametrize("kind", STATED)
def test_columns_marks_and_keys(kind: str) -> None:
    sheet = SHEETS[kind]
    declared = [(c.heading, c.required, c.key, c.repeated) for c in sheet.own_columns]
    assert declared == stated(kind)
    common = [c.name for c in sheet.columns[len(sheet.own_columns) :]]
    readings = ["measured on", "measured by", "repeat"]
    assert common == [*(readings if sheet.reading else []), "remarks"]
    assert {c.name for c in sheet.columns[len(sheet.own_columns) :] if c.key} == (
        {"measured on", "repeat"} if sheet.reading else set()
    )


@pytest.mark.parametrize(("kind", "name"), CHOICES)
def test_words_and_defaults(kind: str, name: str) -> None:
    words, _, default = CHOICES[kind, name].partition("; default ")
    column = SHEETS[kind].column(name)
    assert ", ".join(column.choices) == words
    assert column.default == default


def test_every_list_of_words_is_stated() -> None:
    open_lists = {
        ("descriptions", "grain size class"),
        ("descriptions", "sorting class"),
        ("descriptions", "sorting scale"),
        ("descriptions", "roundness"),
        ("certified values", "result"),
        ("certified values", "gas"),
        ("reported permeability", "gas"),
        ("not measured", "test"),
    }
    assert {(s.kind, c.name) for s in SHEETS.values() for c in s.columns if c.choices} == set(
        CHOICES
    ) | open_lists
    assert SHEETS["reported permeability"].column("gas").choices == ("nitrogen", "helium", "air")
    assert SHEETS["certified values"].column("result").choices == (
        *tuple(RESULTS)[:13],
        "oil saturation",
        "water saturation",
        "gas saturation",
    )


def test_either_or() -> None:
    for kind, sheet in SHEETS.items():
        assert [[set(way) for way in group] for group in sheet.either] == EITHER.get(kind, [])


def test_where_limits_are_taken() -> None:
    taken = {(s.kind, c.name) for s in SHEETS.values() for c in s.columns if c.limits}
    assert taken == {
        ("reported permeability", "klinkenberg permeability"),
        ("reported permeability", "gas permeability"),
    }


@pytest.mark.parametrize(("sheet", "column"), COLUMNS)
def test_a_column_speaks_to_the_technician(sheet: Sheet, column: Column) -> None:
    assert column.note
    assert column.note[-1] in ".…"
    assert column.name == column.name.strip().casefold()
    assert all(word == word.casefold() for word in column.choices)
    assert len(set(column.choices)) == len(column.choices)
    assert not column.default or not column.choices or column.default in column.choices
    assert (column.entry == "number") == (column.quantity is not None)
    assert bool(column.choices) == (column.entry in {"choice", "choices"})


@pytest.mark.parametrize(("sheet", "column"), NUMBERS)
def test_units_and_ranges_are_sane(sheet: Sheet, column: Column) -> None:
    quantity = column.quantity
    assert quantity is not None
    if quantity.kind:
        assert unit(quantity.unit, quantity.kind).symbol == quantity.unit
        assert unit(quantity.heading_unit, quantity.kind).symbol == quantity.heading_unit
        assert quantity.heading_unit in accepted(quantity.kind)
        assert not unit(quantity.unit, quantity.kind).gauge
    low, high = quantity.possible
    usual_low, usual_high = quantity.plausible
    assert low < high
    assert usual_low < usual_high
    if math.isfinite(usual_low) or math.isfinite(usual_high):
        assert low <= usual_low
        assert usual_high <= high


def test_fields_of_a_sheet_are_its_own() -> None:
    for sheet in SHEETS.values():
        fields = [f for c in sheet.columns for f in (*c.fields, c.gauge_field, c.limit_field) if f]
        assert len(set(fields)) == len(fields), sheet.kind
    assert MOST_REPEATED_COLUMNS == 10


def test_absolute_and_gauge() -> None:
    read = {c.name for s in SHEETS.values() for c in s.columns if c.kind == "pressure"}
    assert read == {
        "reference pressure",
        "expanded pressure",
        "upstream pressure",
        "downstream pressure",
        "flow pressure",
        "confining pressure",
    }
    plain = {c.name for s in SHEETS.values() for c in s.columns if c.kind == "stress"}
    assert plain == {"net confining stress", "pressure difference"}
    assert ENTERED["barometric pressure"].kind == "absolute pressure"
    assert {s for s, u in UNITS["pressure"].items() if u.gauge} == {"psig", "barg", "kPag"}


@pytest.mark.parametrize(
    ("typed", "kind"),
    [
        ("Core Runs", "core runs"),
        ("core_runs", "core runs"),
        ("core-runs", "core runs"),
        (" core  runs ", "core runs"),
        ("03 masses", "masses"),
        ("3. masses", "masses"),
        ("03_gas-permeability", "gas permeability"),
        ("mass", None),
        ("masses 2", None),
        ("", None),
        ("03", None),
    ],
)
def test_names_of_kinds(typed: str, kind: str | None) -> None:
    assert kind_named(typed) == kind
