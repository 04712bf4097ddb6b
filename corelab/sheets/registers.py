"""Registers: what there is (wells, runs, shots, plugs, instruments) and what is known or decided of it."""

from __future__ import annotations

from corelab.sheets import safety
from corelab.sheets.declaration import Column, Sheet, choice, date, name, number, text

#: Results for which a standard may carry a certified value.
CERTIFIABLE = (
    "bulk volume",
    "grain volume",
    "pore volume",
    "dry mass",
    "porosity",
    "grain density",
    "bulk density",
    "gas permeability",
    "mean pressure",
    "klinkenberg permeability",
    "slip factor",
    "liquid permeability",
    "inertial coefficient",
    "oil saturation",
    "water saturation",
    "gas saturation",
)
SORTING_SCALES = ("folk", "trask")
_WELL = name("well", "The well's name, as in the register of wells.", refers="well", required=True, key=True)
_PLUG = name("plug", "The plug's name, as marked on it.", refers="plug", required=True, key=True)
_RUN = name("run", "Number or name of the core run.", refers="run", required=True, key=True)

_CLASSES = tuple(
    f"{half} {size} sand"
    for size in ("very coarse", "coarse", "medium", "fine", "very fine")
    for half in ("upper", "lower")
)
GRAIN_SIZE_CLASSES = (
    "boulder",
    "cobble",
    "pebble",
    "granule",
    "very coarse sand",
    "coarse sand",
    "medium sand",
    "fine sand",
    "very fine sand",
    *_CLASSES,
    "silt",
    "clay",
)
SORTING_CLASSES = (
    "extremely well",
    "very well",
    "well",
    "moderately well",
    "moderately",
    "poorly",
    "very poorly",
    "extremely poorly",
)
ROUNDNESS = ("very angular", "angular", "subangular", "subrounded", "rounded", "well rounded")
CONDITIONS = ("intact", "chipped", "cracked", "powdered", "crumbled", "disked", "mudcake", "short")
TESTS = (
    "bulk volume",
    "grain volume",
    "pore volume",
    "porosity",
    "permeability",
    "gas permeability",
    "klinkenberg permeability",
    "liquid permeability",
    "saturations",
    "distillation",
    "retort",
    "sieve",
    "dimensions",
    "immersion",
    "masses",
)


JOBS = Sheet(
    "jobs",
    "Jobs",
    False,
    "job",
    (
        name("job", "Name or number of the job.", refers="job", defines=True, required=True, key=True),
        Column("laboratory", "text", "Laboratory that does the job.", required=True),
        text("client", "For whom the job is done."),
        text("partners", "Others entitled to results, separated by commas."),
        text("report number", "Number of the report that will be issued."),
        date("received on", "When the core came in."),
    ),
)

WELLS = Sheet(
    "wells",
    "Wells",
    False,
    "well",
    (
        name(
            "well",
            "The well's name, as the client writes it.",
            refers="well",
            defines=True,
            required=True,
            key=True,
        ),
        name("job", "The job it belongs to.", refers="job"),
        text("field", "Field or licence."),
        text("country", "Country."),
        text("unique well identifier", "The authority's identifier."),
        choice("depth unit", "Unit in which this well's depths are spoken of.", "m", "ft", required=True),
        text("depth datum", "What depths are counted from: rotary table, kelly bushing …"),
        number("datum elevation", "Height of the datum above mean sea level."),
        choice("mud", "Drilling fluid while coring.", "water-based", "oil-based", "synthetic", "air"),
        number("mud filtrate salinity", "Salt of the filtrate, per volume."),
        number("bit diameter", "Diameter of the hole drilled."),
        date("confidential until", "Day from which results may be shown freely."),
    ),
)

CORE_RUNS = Sheet(
    "core runs",
    "Core runs",
    False,
    "run",
    (
        _WELL,
        name("run", "Number or name of the core run.", refers="run", defines=True, required=True, key=True),
        number("top depth", "Driller's depth at which the run began.", required=True),
        number("base depth", "Driller's depth at which the run ended.", required=True),
        number("recovered length", "Length of core that came out.", required=True),
        number("core diameter", "Diameter of the core."),
        choice("loss at", "Where the missing core is taken to have been.", "top", "base", default="base"),
        date("cut on", "When the run was cut."),
    ),
    caution=f"{safety.CUTTING} {safety.PRESSURE} {safety.DEFER}",
)

CORE_SECTIONS = Sheet(
    "core sections",
    "Core sections and boxes",
    False,
    "run",
    (
        _WELL,
        _RUN,
        Column("section", "name", "Number or name of the section.", required=True, key=True),
        number("top depth", "Driller's depth of its top.", required=True),
        number("base depth", "Driller's depth of its base.", required=True),
        text("box", "Box in which it lies."),
        choice("state", "How it is.", "good", "rubble", "preserved", "lost", "elsewhere"),
    ),
    caution=f"{safety.CUTTING} {safety.DEFER}",
)

SIDEWALL_SHOTS = Sheet(
    "sidewall shots",
    "Sidewall shots",
    False,
    "gun run",
    (
        _WELL,
        name(
            "gun run",
            "Name of the descent of the sidewall tool.",
            refers="gun run",
            defines=True,
            required=True,
            key=True,
        ),
        Column("shot", "name", "Number of the shot or drilled station.", required=True, key=True),
        number("depth", "Depth of the shot.", required=True),
        choice("depth basis", "Which depth it is; guns are tied to a log.", "log", "driller", default="log"),
        choice("tool", "Shot with a bullet or drilled.", "percussion", "rotary", required=True),
        choice(
            "outcome",
            "What became of it.",
            "recovered",
            "partial",
            "misfired",
            "lost",
            "empty",
            "not attempted",
            required=True,
        ),
        number("recovered length", "Length of the sample that came out.", quantity="recovered plug length"),
        text("bullet", "Kind of bullet."),
        text("charge", "Powder charge."),
    ),
    caution=f"{safety.CHARGES} {safety.DEFER}",
)

PLUGS = Sheet(
    "plugs",
    "Plugs",
    False,
    "plug",
    (
        _WELL,
        name(
            "plug", "The plug's name, as marked on it.", refers="plug", defines=True, required=True, key=True
        ),
        choice("from", "What it was taken from.", "core", "sidewall", "whole core", required=True),
        name("run", "Core run it was cut from.", refers="run"),
        name("gun run", "Descent of the sidewall tool.", refers="gun run"),
        name("shot", "Number of the shot."),
        number(
            "depth",
            "Depth of the plug's centre: driller's for core, the shot's for a sidewall plug.",
            required=True,
        ),
        number("top depth", "Top of a whole-core sample."),
        number("base depth", "Base of a whole-core sample."),
        choice("orientation", "Axis of the plug against the bedding.", "horizontal", "vertical", "oblique"),
        number("azimuth", "Direction of the axis."),
        name("companion of", "Another plug of the same sample point.", refers="plug"),
        name("duplicate of", "The plug of which this repeats the measurement.", refers="plug"),
        text("facies", "Facies, in the geologist's words."),
        number("jacket mass", "Mass of sleeve and screens on a mounted plug."),
        number("jacket volume", "Solid volume of sleeve and screens on a mounted plug."),
        number("screen thickness", "Thickness of the end screens, both ends together."),
        date("taken on", "When it was cut."),
        text("location", "Where it is kept."),
        choice("priority", "How soon it is wanted.", "normal", "rush", default="normal"),
    ),
    caution=f"{safety.CUTTING} {safety.DEFER}",
)

DESCRIPTIONS = Sheet(
    "descriptions",
    "Descriptions",
    False,
    "plug",
    (
        _WELL,
        _PLUG,
        Column("lithology", "text", "Rock name: sandstone, claystone, limestone …", required=True),
        number("grain size", "Median grain size seen or measured."),
        choice("grain size class", "Wentworth class, halves where they can be told.", *GRAIN_SIZE_CLASSES),
        number("sorting", "Standard deviation of grain size."),
        choice("sorting class", "Sorting in words.", *SORTING_CLASSES),
        choice("sorting scale", "The scale the sorting word is taken from.", *SORTING_SCALES),
        choice("roundness", "Roundness of the grains.", *ROUNDNESS),
        choice("firmness", "How the rock holds together.", "loose", "friable", "firm", "hard"),
        text("cement", "Cement or matrix."),
        text("accessories", "Minor minerals."),
        text("colour", "Colour."),
        text("stain", "Oil stain."),
        text("fluorescence", "Fluorescence under ultraviolet light."),
        text("cut", "Cut in solvent."),
        text("odour", "Odour; never smell on purpose."),
        choice("condition", "How the plug is; several separated by commas.", *CONDITIONS, several=True),
        name("described by", "Who described it."),
    ),
    caution=f"Ultraviolet lamps hurt eyes and skin. Never smell core for hydrogen sulphide. {safety.DEFER}",
)

CRUSH_VERDICTS = Sheet(
    "crush verdicts",
    "Crush verdicts",
    False,
    "plug",
    (
        _WELL,
        _PLUG,
        Column("judged by", "name", "Who looked.", required=True, key=True),
        choice("crushed", "What was seen.", "yes", "no", "unsure", required=True),
        choice("seen in", "What was looked at.", "hand specimen", "thin section", "scan"),
        date("judged on", "When."),
    ),
)

INSTRUMENTS = Sheet(
    "instruments",
    "Instruments",
    False,
    "instrument",
    (
        name(
            "instrument", "The instrument's name.", refers="instrument", defines=True, required=True, key=True
        ),
        choice(
            "measures",
            "What it measures; one row each.",
            "mass",
            "length",
            "pressure",
            "flow rate",
            "volume",
            "temperature",
            required=True,
            key=True,
        ),
        number("repeatability", "Standard deviation of one reading.", required=True),
        number("scale uncertainty", "Standard uncertainty that all its readings share."),
        Column("uncertainty unit", "unit", "A unit, or '% of reading'.", required=True),
        text("certificate", "Number of the calibration certificate."),
        date("calibrated on", "Day of its last calibration."),
        date("due on", "Day its next calibration is due."),
    ),
)

STANDARDS = Sheet(
    "standards",
    "Standards",
    False,
    "standard",
    (
        name(
            "standard",
            "Name of the check plug, billet or void.",
            refers="standard",
            defines=True,
            required=True,
            key=True,
        ),
        choice("kind", "What it is.", "check plug", "billet", "void", required=True),
        text("maker", "Who made or certified it."),
        text("certificate", "Number of its certificate."),
        date("valid until", "Day until which the certificate holds."),
    ),
)

CERTIFIED_VALUES = Sheet(
    "certified values",
    "Certified values",
    False,
    "standard",
    (
        name("standard", "The standard's name.", refers="standard", required=True, key=True),
        choice("result", "Which result is certified.", *CERTIFIABLE, required=True, key=True),
        number("certified value", "Value of the certificate.", required=True),
        Column("unit", "unit", "Its unit.", required=True),
        number(
            "standard uncertainty",
            "Standard uncertainty of the certificate, in the same unit.",
            quantity="certified uncertainty",
            required=True,
        ),
        choice("gas", "Gas for which it holds.", "nitrogen", "helium", "air"),
        number("mean pressure", "Mean pressure for which it holds."),
        number("net confining stress", "Stress for which it holds."),
    ),
)

TREATMENTS = Sheet(
    "treatments",
    "Cleaning and drying",
    False,
    "plug",
    (
        _WELL,
        _PLUG,
        choice("step", "What was done.", "cleaning", "drying", required=True, key=True),
        choice(
            "method",
            "How.",
            "distillation",
            "flow-through",
            "centrifuge",
            "oven",
            "vacuum oven",
            "humidity oven",
        ),
        text("solvent", "Solvent or solvents, in order."),
        number("temperature", "Temperature held.", quantity="treatment temperature"),
        number("humidity", "Relative humidity held."),
        date("started on", "When it began."),
        date("ended on", "When it ended."),
        text("end point", "What showed that it was done."),
    ),
    caution=f"{safety.SOLVENTS} {safety.DEFER}",
)

NOT_MEASURED = Sheet(
    "not measured",
    "Not measured",
    False,
    "plug",
    (
        _WELL,
        _PLUG,
        choice("test", "What was not measured.", *TESTS, required=True, key=True),
        choice(
            "reason",
            "Why.",
            "fractured",
            "too short",
            "crumbled",
            "preserved",
            "unsuitable",
            "lost",
            required=True,
        ),
    ),
)

REGISTERS = (
    JOBS,
    WELLS,
    CORE_RUNS,
    CORE_SECTIONS,
    SIDEWALL_SHOTS,
    PLUGS,
    DESCRIPTIONS,
    CRUSH_VERDICTS,
    INSTRUMENTS,
    STANDARDS,
    CERTIFIED_VALUES,
    TREATMENTS,
    NOT_MEASURED,
)
