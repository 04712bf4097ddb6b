"""Readings: what an instrument showed."""

from __future__ import annotations

from corelab.sheets import safety
from corelab.sheets.declaration import Column, Sheet, choice, name, number

STANDARDS_WELL = "standards"
GASES = ("nitrogen", "helium", "air")
DIRECTIONS = ("axial", "max", "90", "vertical")
SALT = ("none", "left", "leached")

_WELL = name("well", "The well's name; 'standards' for a check plug.", refers="well", required=True, key=True)
_PLUG = name(
    "plug", "The plug's name; the standard's for a check plug.", refers="plug", required=True, key=True
)
_STRESS = number("net confining stress", "Confining less pore pressure; empty for unconfined.", key=True)
_STRESS_MUST = number("net confining stress", "Confining less pore pressure.", required=True, key=True)
_BAROMETER = number("barometric pressure", "Barometer at the time; else the laboratory's setting.")
_TEMPERATURE = number("temperature", "Temperature of the instrument and its gas.")
_STEP = Column("step", "name", "1, 2, 3 … along the flow steps.", required=True, key=True)
_DIRECTION = choice(
    "direction",
    "Direction of flow: along the plug, or for whole core the best, the one at right angles, or vertical.",
    *DIRECTIONS,
    key=True,
    default="axial",
)
_REFERENCE = number("reference pressure", "Pressure in the reference chamber before it is opened.")
_EXPANDED = number("expanded pressure", "Pressure after it is opened and steady.")


DIMENSIONS = Sheet(
    "dimensions",
    "Length and diameter by caliper",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        number("length", "Along the axis, end screens included.", required=True, repeated=True),
        number("diameter", "Across; at several places and turned.", required=True, repeated=True),
        name("caliper", "The caliper's name.", refers="instrument"),
    ),
)

IMMERSION = Sheet(
    "immersion",
    "Bulk volume by immersion",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        choice(
            "liquid",
            "Liquid in the bath.",
            "mercury",
            "water",
            "brine",
            "toluene",
            "ethanol",
            required=True,
        ),
        number("mass in air", "Mass in air of the plug as it is immersed, saturated or coated."),
        number("mass immersed", "Mass hanging in the liquid."),
        number("mass displaced", "Mass of liquid displaced, on a balance that weighs the bath."),
        number("liquid density", "Density of the liquid; else from its temperature."),
        number("temperature", "Temperature of the liquid."),
        number("coating mass", "Mass of a coating put on for the immersion."),
        number("coating density", "Its density."),
        name("balance", "The balance's name.", refers="instrument"),
    ),
    either=((("mass in air", "mass immersed"), ("mass displaced",)),),
    caution=f"{safety.MERCURY} Toluene and ethanol burn and poison: fume hood. {safety.DEFER}",
)

MASSES = Sheet(
    "masses",
    "Masses",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        choice("condition", "State of the plug.", "as received", "dry", "saturated", required=True, key=True),
        number("mass", "What the balance shows, container and mounting included.", required=True),
        number("container mass", "Mass of the container weighed with it."),
        number("saturant density", "Density of the liquid that fills the pores."),
        number("salinity", "Salt of the pore liquid, per mass of solution."),
        choice(
            "salt",
            "'left': dried with brine in it, the salt stayed; 'leached': the salt was washed out.",
            *SALT,
            default="none",
        ),
        number("salt density", "Density of the dried salt; 2.165 sodium chloride, 2.22 sea salt."),
        name("balance", "The balance's name.", refers="instrument"),
    ),
    caution=f"Let plugs cool before weighing; hot plugs burn and float on warm air. {safety.DEFER}",
)

POROSIMETER_CALIBRATION = Sheet(
    "porosimeter calibration",
    "Porosimeter calibration",
    True,
    "instrument",
    (
        name("instrument", "The porosimeter's name.", refers="instrument", required=True, key=True),
        choice("setup", "Matrix cup or core holder.", "cup", "holder", key=True, default="cup"),
        Column("calibration", "name", "A label that holds the rows of one calibration together."),
        number("known volume", "Billets in the cup; void in the holder.", required=True),
        number("reference pressure", _REFERENCE.note, required=True),
        number("expanded pressure", _EXPANDED.note, required=True),
        _BAROMETER,
        _TEMPERATURE,
        number("net confining stress", "Stress on the holder's sleeve."),
    ),
    caution=f"{safety.GAS} {safety.DEFER}",
)

GRAIN_VOLUME = Sheet(
    "grain volume",
    "Grain volume by gas expansion",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        name("instrument", "The porosimeter's name.", refers="instrument", required=True),
        number("billet volume", "Billets left in the cup beside the plug.", default="0"),
        _REFERENCE,
        _EXPANDED,
        _BAROMETER,
        _TEMPERATURE,
        number("cup temperature", "Temperature of the cup where it differs."),
        number(
            "grain volume",
            "Volume reported by the instrument itself, container included.",
            quantity="grain volume reading",
        ),
        number("container volume", "Solid volume of a container measured with it."),
    ),
    either=((("reference pressure", "expanded pressure"), ("grain volume",)),),
    caution=f"{safety.GAS} {safety.DEFER}",
)

PORE_VOLUME = Sheet(
    "pore volume",
    "Pore volume under stress by gas expansion",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        _STRESS_MUST,
        name("instrument", "The porosimeter's name.", refers="instrument", required=True),
        number("reference pressure", _REFERENCE.note, required=True),
        number("expanded pressure", _EXPANDED.note, required=True),
        _BAROMETER,
        _TEMPERATURE,
    ),
    caution=f"{safety.GAS} {safety.CELL} {safety.DEFER}",
)

GAS_PERMEABILITY = Sheet(
    "gas permeability",
    "Gas permeability, steady state",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        _DIRECTION,
        _STEP,
        _STRESS,
        number("confining pressure", "Pressure on the sleeve, where the net stress is not known."),
        choice("stress type", "How the sleeve loads the plug.", "hydrostatic", "biaxial"),
        choice("gas", "Gas that flows.", *GASES, required=True),
        number("upstream pressure", "Pressure where the gas enters."),
        number("pressure difference", "Difference between the ends."),
        number("downstream pressure", "Pressure where it leaves; else the barometer."),
        number("flow rate", "Flow of gas.", required=True),
        choice(
            "flow basis",
            "'actual': metered at flow pressure and temperature; 'standard': at the standard ones.",
            "actual",
            "standard",
            default="actual",
        ),
        number("flow pressure", "Pressure at the meter; else the barometer."),
        number("flow temperature", "Temperature at the meter; else the row's temperature."),
        number("standard pressure", "Pressure to which the meter refers.", default="101.325 kPa"),
        number("standard temperature", "Temperature to which the meter refers.", default="20 degC"),
        _BAROMETER,
        _TEMPERATURE,
        number("geometric factor", "For other than axial flow: k = 2 mu q p E / (L (p1² - p2²))."),
        name("permeameter", "The permeameter's name.", refers="instrument"),
    ),
    either=((("upstream pressure",), ("pressure difference",)),),
    caution=f"{safety.GAS} {safety.CELL} {safety.DEFER}",
)

REPORTED_PERMEABILITY = Sheet(
    "reported permeability",
    "Permeability reported by an instrument",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        _DIRECTION,
        _STRESS,
        name("permeameter", "The instrument's name.", refers="instrument", required=True),
        number("klinkenberg permeability", "Slip-corrected value; takes < and >.", limits=True),
        number("gas permeability", "Value at the mean pressure; takes < and >.", limits=True),
        choice("gas", "Gas.", *GASES),
        number("mean pressure", "Mean of the absolute end pressures."),
        number("slip factor", "Slip factor reported."),
        number("inertial coefficient", "Inertial resistance reported."),
    ),
    either=((("klinkenberg permeability",), ("gas permeability",)),),
    caution=f"{safety.GAS} {safety.DEFER}",
)

LIQUID_PERMEABILITY = Sheet(
    "liquid permeability",
    "Liquid permeability",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        _STEP,
        _STRESS,
        Column("liquid", "text", "Liquid that flows.", required=True),
        number("upstream pressure", "Pressure where it enters.", required=True),
        number("downstream pressure", "Pressure where it leaves; else the barometer."),
        number("flow rate", "Flow of liquid.", required=True),
        number("viscosity", "Its viscosity at the temperature of the flow."),
        _TEMPERATURE,
    ),
    caution=f"{safety.CELL} {safety.DEFER}",
)

DISTILLATION = Sheet(
    "distillation",
    "Distillation extraction",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        number("water volume", "Water in the trap.", required=True),
        number("trap temperature", "Temperature of the trap when read.", default="20 degC"),
        number("brine salinity", "Salt of the water in the pores, per mass of solution."),
        number("brine density", "Its density; else from salinity and temperature."),
        choice(
            "salt",
            "'left': the salt stayed in the plug; 'leached': washed out before the dry mass.",
            *SALT,
            default="none",
        ),
        number("oil density", "Density of the oil.", required=True),
        number("thimble mass", "Thimble weighed with the plug, as received and dry."),
    ),
    caution=f"{safety.HEAT} {safety.DEFER}",
)

RETORT = Sheet(
    "retort",
    "Retort and summation of fluids",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        number("sample mass", "Mass of the piece retorted.", required=True),
        number("sample bulk volume", "Its bulk volume.", required=True),
        number("water volume", "Water recovered, corrected for bound water.", required=True),
        number("oil volume", "Oil recovered, corrected for coking and losses.", required=True),
        number("gas sample mass", "Mass of a second piece, in which the gas volume is read."),
        number("gas sample bulk volume", "Its bulk volume."),
        number("gas volume", "Gas-filled volume of that piece."),
        number("oil density", "Density of the oil."),
    ),
    caution=f"{safety.RETORT} {safety.MERCURY} {safety.DEFER}",
)

SIEVE = Sheet(
    "sieve",
    "Sieve analysis",
    True,
    "plug",
    (
        _WELL,
        _PLUG,
        number("aperture", "Aperture of the sieve; 0 for the pan.", required=True, key=True),
        number("mass retained", "Mass left on it.", required=True),
    ),
    caution=f"{safety.DUST} {safety.DEFER}",
)

CORE_GAMMA = Sheet(
    "core gamma",
    "Core gamma",
    True,
    "well",
    (
        _WELL,
        name("run", "Core run.", refers="run", key=True),
        number("depth", "Driller's depth.", required=True, key=True),
        number("gamma", "Natural gamma activity.", required=True),
    ),
)

READINGS = (
    DIMENSIONS,
    IMMERSION,
    MASSES,
    POROSIMETER_CALIBRATION,
    GRAIN_VOLUME,
    PORE_VOLUME,
    GAS_PERMEABILITY,
    REPORTED_PERMEABILITY,
    LIQUID_PERMEABILITY,
    DISTILLATION,
    RETORT,
    SIEVE,
    CORE_GAMMA,
)
