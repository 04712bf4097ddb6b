"""The usual cautions of the bench: reminders, never instructions."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

DEFER = "Local law, the safety data sheet and the laboratory's licensed practice govern."
GAS = (
    "Compressed gas: chain the cylinder, use its own regulator, never look into a line; helium and nitrogen "
    "drive out air, so ventilate or carry an oxygen alarm."
)
CELL = "Confining cells: liquid not gas, shield in place, bleed both sides before opening."
MERCURY = (
    "Mercury: tray, ventilation and vapour monitor, no heating, no gold or bare skin; take spills up at once."
)
HEAT = "Hot glass and flammable vapour: cooling water on before heat, fume hood, no flame, never unattended."
RETORT = (
    "A retort burns at some hundreds of degrees and drives off vapour that can explode: fume hood, shield, "
    "cooled condenser, gloves for heat."
)
DUST = "Silica dust: wet or under extraction, with breathing protection."
CUTTING = (
    "Cutting throws chips and silica dust and is loud: guards on, wet cutting, eye, ear and breathing "
    "protection. Core may vent hydrogen sulphide, soon past smelling: monitor, ventilate, never alone."
)
CHARGES = (
    "Never accept or take apart a gun, a bullet or a charge in the laboratory: unfired charges are for "
    "licensed staff only."
)
SOLVENTS = (
    "Solvents burn and poison through skin and lungs: fume hood, gloves, no flame, cooling water on before "
    "heat and never left without it. Ovens: let the solvent drain and vent first."
)
PRESSURE = "Sleeves and barrels can hold pressure: vent before opening."
COLD = "Frozen core and its coolants burn skin and drive out air: gloves, visor, ventilation."
SCALE = "Scale in core can be radioactive: survey it, keep its dust wet."

#: Each hazard of the bench with its reminder.
HAZARDS: Mapping[str, str] = MappingProxyType(
    {
        "solvents": SOLVENTS,
        "heat": f"{HEAT} {RETORT}",
        "mercury": MERCURY,
        "compressed gas": f"{GAS} {CELL} {PRESSURE}",
        "charges": CHARGES,
        "sour core and dust": f"{CUTTING} {SCALE}",
        "cold": COLD,
    }
)

#: Exposure limits of the United States, to show the size of the danger; read before 2026-12.
LIMITS: tuple[tuple[str, str, str], ...] = (
    (
        "toluene",
        "200 ppm, ceiling 300, peak 500 for 10 min (OSHA); 100 ppm, 150 short-term (NIOSH)",
        "OSHA, Toluene: occupational exposure limits",
    ),
    ("xylene", "100 ppm (OSHA); 100 ppm, 150 short-term (NIOSH)", "OSHA; NIOSH from memory"),
    ("methanol", "200 ppm (OSHA)", "CDC/NIOSH, 1988 OSHA PEL project: Methyl alcohol"),
    ("chloroform", "ceiling 50 ppm (OSHA); 2 ppm for 60 min, carcinogen (NIOSH)", "from memory"),
    (
        "hydrogen sulphide",
        "ceiling 20 ppm, peak 50 for 10 min (OSHA); ceiling 10 ppm (NIOSH)",
        "table 3 of PMC5777517",
    ),
    ("mercury vapour", "0.1 mg/m3 (OSHA); 0.05 mg/m3, skin (NIOSH)", "from memory"),
    ("crystalline silica", "50 µg/m3, action at 25 (OSHA); 50 µg/m3 (NIOSH)", "OSHA, from memory"),
)
