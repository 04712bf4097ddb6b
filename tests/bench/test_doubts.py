"""What the program questions: routes, lithology, shape, repeats, inertia, texture; trials; withdrawn rows.

Published: sieve set of a public worked example (phi -1 to 4 and pan; g 2.95, 4.95, 13.36, 9.55, 2.13, 0.46,
0.02), statistics by Folk & Ward 1957 computed outside the program, open class closed at -2 phi: Mz 0.619.
Boyle's law with helium's compressibility: 12.1200 and 36.5000 cm3, 100.00 to 44.60 psig, 14.696 psia, 20 degC
give 21.4954 cm3 (derived; agrees with a full equation of state).
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from corelab.errors import Refused
from corelab.lab import Lab

Write = Callable[..., Path]
DIMENSIONS = "well,plug,length 1 [cm],length 2 [cm],diameter 1 [cm],diameter 2 [cm],diameter 3 [cm]"
WATER, K = 0.997, "klinkenberg permeability [mD]"


@pytest.fixture
def plugs(lab: Lab, write_sheet: Write) -> Lab:
    lab.load(
        [
            write_sheet("wells", "well,depth unit", "W,m"),
            write_sheet("plugs", "well,plug,from,depth [m]", "W,A,core,100", "W,B,core,101"),
            write_sheet("dimensions", DIMENSIONS, "W,A,5,5,3.8,3.8,3.8", "W,B,5,5,3.8,3.8,3.95"),
        ]
    )
    return lab


def flags(lab: Lab, plug: str = "A") -> str:
    return str(lab.interval("W").set_index("plug").loc[plug, "flags"])


def test_an_uneven_plug_is_questioned(plugs: Lab) -> None:
    assert "uneven plug" in flags(plugs, "B")
    assert "uneven plug" not in flags(plugs, "A")


@pytest.mark.parametrize(("grain", "disagree"), [(45.364, False), (43.0, True)])
def test_routes_that_disagree_are_flagged(
    plugs: Lab, write_sheet: Write, grain: float, disagree: bool
) -> None:
    # bulk 56.705; 11.340 cm3 of water in the pores: porosity 0.2000; grain 45.364 gives 0.2000, 43 0.2417
    plugs.load(
        [
            write_sheet("grain volume", "well,plug,instrument,grain volume [cm3]", f"W,A,P,{grain}"),
            write_sheet(
                "masses",
                "well,plug,condition,mass [g],saturant density [g/cm3]",
                "W,A,dry,120,",
                f"W,A,saturated,{120 + 11.340 * WATER},{WATER}",
            ),
        ]
    )
    assert ("porosity routes disagree beyond their uncertainty" in flags(plugs)) is disagree


@pytest.mark.parametrize(("mass", "fits"), [(45.0 * 2.65, True), (45.0 * 2.95, False)])
def test_grain_density_is_held_against_the_rock(
    plugs: Lab, write_sheet: Write, mass: float, fits: bool
) -> None:
    plugs.load(
        [
            write_sheet("grain volume", "well,plug,instrument,grain volume [cm3]", "W,A,P,45"),
            write_sheet("masses", "well,plug,condition,mass [g]", f"W,A,dry,{mass}"),
            write_sheet("descriptions", "well,plug,lithology", "W,A,sandstone"),
        ]
    )
    assert ("grain density does not fit the described lithology" in flags(plugs)) is not fits


FLOW = (
    "well,plug,step,gas,upstream pressure [kPa],downstream pressure [kPa],flow rate [cm3/s],"
    "flow pressure [kPa],barometric pressure [kPa],temperature [degC],net confining stress [MPa]"
)


def steps(k: float, b: float, beta: float, ends: list[tuple[float, float]]) -> list[str]:
    """Steady flow of nitrogen at 22 degC through 5 cm, 11.341 cm2: slip and Forchheimer resistance."""
    from CoolProp.CoolProp import PropsSI

    area, length, md = np.pi * 1.9**2 * 1e-4, 0.05, 1e-15 / 1.01325
    rows = []
    for n, (up, down) in enumerate(ends, 1):
        mean = (up + down) / 2
        mu = PropsSI("V", "T", 295.15, "P", mean * 1e3, "Nitrogen")
        drive = (up**2 - down**2) * 1e6 / (2 * mu * length)  # times A k = q p
        mass = 0.0280134 / (8.314462618 * 295.15)
        k0 = k * (1 + b / mean) * md
        qp = area * k0 * drive
        for _ in range(200):
            qp = area * drive / (1 / k0 + beta * qp * mass / (mu * area))
        rows.append(f"W,A,{n},nitrogen,{up},{down},{qp / (101.325e3) * 1e6!r},101.325,101.325,22,5")
    return rows


RATES = [
    (104.0, 101.325),
    (140.0, 101.325),
    (220.0, 101.325),
    (320.0, 101.325),
    (450.0, 101.325),
    (600.0, 101.325),
]


def test_inertia_is_found_and_corrected(plugs: Lab, write_sheet: Write) -> None:
    plugs.load([write_sheet("gas permeability", FLOW, *steps(150.0, 12.0, 4e8, RATES))])
    row = plugs.interval("W").set_index("plug").loc["A"]
    assert "corrected for inertia" in row["flags"]
    assert row[K] == pytest.approx(150.0, rel=0.01)
    shown = plugs.plug_show("W", "A")["results"].set_index("quantity")
    assert shown.loc["inertial coefficient", "value"] == pytest.approx(4e8, rel=0.05)


def test_inertia_is_not_seen_where_there_is_none(plugs: Lab, write_sheet: Write) -> None:
    plugs.load([write_sheet("gas permeability", FLOW, *steps(150.0, 12.0, 0.0, RATES))])
    row = plugs.interval("W").set_index("plug").loc["A"]
    assert "inertia" not in row["flags"]
    assert row[K] == pytest.approx(150.0, rel=0.01)
    assert "inertial coefficient" not in set(plugs.plug_show("W", "A")["results"]["quantity"])


def test_repeats_of_a_step_at_other_pressures_are_questioned(plugs: Lab, write_sheet: Write) -> None:
    rows = steps(50.0, 30.0, 0.0, RATES[1:5])
    rows[3] = rows[3].replace("W,A,4,", "W,A,3,")
    report = plugs.load([write_sheet("gas permeability", FLOW, *rows)])
    assert any("repeats of one step differ in pressure" in line for line in report.doubtful)


SIEVE = list(
    zip((2, 1, 0.5, 0.25, 0.125, 0.0625, 0), (2.95, 4.95, 13.36, 9.55, 2.13, 0.46, 0.02), strict=True)
)


def test_an_open_curve_says_so_and_a_closed_one_is_estimated(plugs: Lab, write_sheet: Write) -> None:
    closed = [(4, 0.0), *SIEVE]  # a coarser sieve, empty, closes the curve at -2 phi
    plugs.load(
        [
            write_sheet(
                "sieve",
                "well,plug,aperture [mm],mass retained [g]",
                *(f"W,A,{a},{m}" for a, m in SIEVE),
                *(f"W,B,{a},{m}" for a, m in closed),
            )
        ]
    )
    shown = {p: plugs.plug_show("W", p)["results"].set_index("quantity") for p in "AB"}
    assert shown["B"].loc["mean grain size", "value"] == pytest.approx(0.619, abs=0.0005)
    assert shown["B"].loc["sorting", "value"] == pytest.approx(1.144, abs=0.0005)
    assert shown["A"].loc["sorting", "reason"].endswith("the curve is open")
    row = plugs.interval("W").set_index("plug").loc["B"]
    assert row["permeability basis"] == "texture"
    assert "permeability estimated from texture" in row["flags"]
    assert row[K] > 0
    assert np.isnan(plugs.interval("W", stress=5.0).set_index("plug").loc["B", K])


def test_texture_never_touches_a_measured_permeability(plugs: Lab, write_sheet: Write) -> None:
    plugs.load([write_sheet("gas permeability", FLOW, *steps(50.0, 30.0, 0.0, RATES[1:5]))])
    before = plugs.interval("W").set_index("plug").loc["A", K]
    plugs.load(
        [
            write_sheet(
                "sieve",
                "well,plug,aperture [mm],mass retained [g]",
                *(f"W,A,{a},{m}" for a, m in [(4, 0), *SIEVE]),
            )
        ]
    )
    after = plugs.interval("W").set_index("plug").loc["A"]
    assert after[K] == before
    assert after["permeability basis"] == "measured"


def test_helium_is_corrected_only_where_asked(plugs: Lab, write_sheet: Write) -> None:
    def z(p: float) -> float:
        return 1 + 3.3537e-5 * p

    def expanded(solid: float) -> float:  # mole balance of a real gas in psia, V_r 12.12, V_c 36.5, 20 degC
        low, high = 14.7, 114.696
        for _ in range(200):
            p = (low + high) / 2
            left = 12.12 * 114.696 / z(114.696) + (36.5 - solid) * 14.696 / z(14.696)
            low, high = (p, high) if (48.62 - solid) * p / z(p) < left else (low, p)
        return p

    pressures = (
        "reference pressure [psia],expanded pressure [psia],barometric pressure [psia],temperature [degC]"
    )
    plugs.load(
        [
            write_sheet(
                "porosimeter calibration",
                f"instrument,known volume [cm3],{pressures}",
                *(f"P,{v},114.696,{expanded(v)!r},14.696,20" for v in (0, 10, 20, 30)),
            ),
            write_sheet(
                "grain volume",
                f"well,plug,instrument,{pressures}",
                "W,A,P,114.696,59.296,14.696,20",
            ),
        ]
    )
    plugs.setting("helium compressibility correction", "on")
    shown = plugs.plug_show("W", "A")["results"].set_index("quantity")
    assert shown.loc["grain volume", "value"] == pytest.approx(21.4954, abs=0.0005)
    found = plugs.explain("W", "A", "grain volume")
    assert found["method"] == "grain-volume-gas-expansion + pressure-over-z"


def test_a_trial_computes_and_writes_nothing(plugs: Lab, write_sheet: Write) -> None:
    sheets = [
        write_sheet("grain volume", "well,plug,instrument,grain volume [cm3]", "W,A,P,45"),
        write_sheet("masses", "well,plug,condition,mass [g]", f"W,A,dry,{45 * 26.5}"),
    ]
    before = len(plugs.history()), plugs.seal(), plugs.plug_show("W", "A")["results"].to_json()
    report = plugs.load(sheets, check=True)
    assert any("grain density outside the usual range" in line for line in report.doubtful)
    assert before == (len(plugs.history()), plugs.seal(), plugs.plug_show("W", "A")["results"].to_json())
    assert report.seal == ""


def test_what_was_withdrawn_does_not_come_back_by_itself(plugs: Lab, write_sheet: Write) -> None:
    sheet = write_sheet("masses", "well,plug,condition,mass [g]", "W,A,dry,120")
    plugs.load([sheet])
    number = int(plugs.plug_show("W", "A")["entries"].query("kind == 'masses'")["number"].iloc[0])
    plugs.withdraw(number, "wrong plug")
    report = plugs.load([sheet])
    assert report.changes == 0
    assert any(f"masses {number}, withdrawn or corrected before" in n.found for n in report.notices)
    assert plugs.load([sheet], reason="it was right after all").changes == 1


def test_a_plug_with_readings_is_not_withdrawn_from_under_them(plugs: Lab) -> None:
    number = int(plugs.plug_show("W", "A")["entries"].query("kind == 'plugs'")["number"].iloc[0])
    with pytest.raises(Refused, match="withdraw those first"):
        plugs.withdraw(number, "a slip")
