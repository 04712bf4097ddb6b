"""The rules of the reduction, each by itself with numbers worked out by hand, and its derivatives.

The plug of most tests: a cylinder of 50 mm by 20 mm, 5 pi = 15.70796 cm3 by caliper; 15 cm3 by immersion
in a liquid of 1 g/cm3; 12 cm3 of grains as reported; 30 g dry; 32.4 g full of a liquid of 0.8 g/cm3, hence
3 cm3 of pores. The porosimeter: 10 cm3 of reference chamber and a cup of 30 cm3, for which 800 kPa against
100 kPa give 275 kPa in the empty cup and 450 kPa over 20 cm3 (10 x 800 + 10 x 100 = 20 x 450).
"""

from __future__ import annotations

import copy
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import sqlalchemy as sa
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab import open_lab
from corelab.bench import gather
from corelab.bench.reduce import Outcome, reduce
from corelab.bench.reduce import rows as rows_of
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import schema, store

CALIPER = 5.0 * math.pi
K, SLIP = "klinkenberg permeability [mD]", "slip factor [kPa]"
POROSITY, GRAIN, BULK = "porosity [v/v]", "grain volume [cm3]", "bulk volume [cm3]"

Sheet = tuple[str, ...]  # kind, heading line, rows
DIMENSIONS: Sheet = ("dimensions", "well,plug,length [mm],diameter [mm]", "W,A,50,20")
IMMERSION: Sheet = (
    "immersion",
    "well,plug,liquid,mass displaced [g],liquid density [g/cm3]",
    "W,A,brine,15,1",
)
REPORTED_GRAIN: Sheet = ("grain volume", "well,plug,instrument,grain volume [cm3]", "W,A,P,12")
DRY: Sheet = ("masses", "well,plug,condition,mass [g],saturant density [g/cm3]", "W,A,dry,30,")
FILLED: Sheet = (*DRY, "W,A,saturated,32.4,0.8")
RETORT: Sheet = (
    "retort",
    "well,plug,sample mass [g],sample bulk volume [cm3],water volume [cm3],oil volume [cm3],gas volume [cm3]",
    "W,A,45,20,1,2,2",
)
CALIBRATION_HEADING = (
    "instrument,calibration,known volume [cm3],reference pressure [kPa],expanded pressure [kPa],"
    "barometric pressure [kPa],measured on"
)
EXPANSION_HEADING = (
    "well,plug,instrument,reference pressure [kPa],expanded pressure [kPa],"
    "barometric pressure [kPa],measured on"
)


def calibration(label: str, day: str, expanded_empty: float = 275.0) -> Sheet:
    """A cup of 30 cm3, or with another pressure of the empty cup another one."""
    return (
        "porosimeter calibration",
        CALIBRATION_HEADING,
        f"POR,{label},0,800,{expanded_empty},100,{day}",
        f"POR,{label},20,800,450,100,{day}",
    )


def expansion(day: str, expanded: float = 380.0) -> Sheet:
    """10 x 800 + S x 100 = (10 + S) x 380 over a space S of 15 cm3: a grain volume of 15 in the cup of 30."""
    return ("grain volume", EXPANSION_HEADING, f"W,A,POR,800,{expanded},100,{day}")


def flow(*steps: tuple[float, float], plug: str = "A", gas: str = "nitrogen") -> Sheet:
    """Steps of upstream pressure [kPa] to 100 kPa, and flow rate [cm3/s]; 20 degC."""
    return (
        "gas permeability",
        "well,plug,step,gas,upstream pressure [kPa],flow rate [cm3/s],"
        "barometric pressure [kPa],temperature [degC],"
        "net confining stress [MPa]",
        *(f"W,{plug},{n},{gas},{up},{q},100,20,3" for n, (up, q) in enumerate(steps, 1)),
    )


class Lad:
    """A lab with one well, and plugs A and B in it; loads sheets given as tuples."""

    def __init__(self, lab: Lab, folder: Path) -> None:
        self.lab, self.folder, self.loads = lab, folder, 0

    def __call__(self, *sheets: Sheet, reason: str = "") -> None:
        self.loads += 1
        paths = []
        for number, (kind, *lines) in enumerate(sheets):
            path = self.folder / f"load {self.loads}" / f"{number}" / f"{kind}.csv"
            path.parent.mkdir(parents=True)
            path.write_text("\n".join(lines) + "\n", encoding="utf-8")
            paths.append(path)
        self.lab.load(paths, reason=reason)

    def row(self, plug: str = "A", **filters: Any) -> pd.Series[Any]:
        return self.lab.interval("W", **filters).set_index("plug").loc[plug]

    def results(self, plug: str = "A") -> pd.DataFrame:
        return self.lab.plug_show("W", plug)["results"]

    def number_of(self, kind: str, last: bool = True) -> int:
        entries = self.lab.plug_show("W", "A")["entries"]
        numbers = entries.loc[(entries["kind"] == kind) & (entries["state"] == "in force"), "number"]
        return int(numbers.iloc[-1 if last else 0])


@pytest.fixture(scope="module")
def started(sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """The file of a lab with the well and its two plugs."""
    folder = tmp_path_factory.mktemp("started")
    (folder / "lab.db").write_bytes(sqlite_template.read_bytes())
    with open_lab(str(folder / "lab.db"), by="tester") as lab:
        Lad(lab, folder)(
            ("wells", "well,depth unit", "W,m"),
            (
                "core runs",
                "well,run,top depth [m],base depth [m],recovered length [m],core diameter [mm]",
                "W,1,0,9,9,100",
            ),
            ("plugs", "well,plug,from,run,depth [m]", "W,A,core,1,1", "W,B,core,1,2"),
        )
    return (folder / "lab.db").read_bytes()


@pytest.fixture
def bench(started: bytes, tmp_path: Path) -> Iterator[Lad]:
    (tmp_path / "lab.db").write_bytes(started)
    with open_lab(str(tmp_path / "lab.db"), by="tester") as lab:
        yield Lad(lab, tmp_path)


# -- the order of preference ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("sheets", "route", "porosity"),
    [
        ((DIMENSIONS, IMMERSION, REPORTED_GRAIN, FILLED, RETORT), "bulk-grain", (15 - 12) / 15),
        ((DIMENSIONS, REPORTED_GRAIN, FILLED, RETORT), "bulk-grain", 1 - 12 / CALIPER),
        ((DIMENSIONS, FILLED, RETORT), "bulk-pore", 3 / CALIPER),
        ((REPORTED_GRAIN, FILLED, RETORT), "pore-grain", 3 / 15),
        ((RETORT, DIMENSIONS), "summation of fluids", 5 / 20),
    ],
)
def test_porosity_goes_by_the_first_route_that_is_there(
    bench: Lad, sheets: tuple[Sheet, ...], route: str, porosity: float
) -> None:
    bench(*sheets)
    row = bench.row()
    assert row["porosity route"] == route
    assert row[POROSITY] == pytest.approx(porosity, rel=1e-12)


def test_a_grain_volume_above_the_bulk_volume_passes_to_the_next_route_and_is_flagged(bench: Lad) -> None:
    bench(IMMERSION, ("grain volume", REPORTED_GRAIN[1], "W,A,P,16"), FILLED)
    row = bench.row()
    assert row["porosity route"] == "bulk-pore"
    assert row[POROSITY] == pytest.approx(3 / 15)
    assert "grain volume not less than the bulk volume" in row["flags"]


def test_without_another_route_it_is_refused_with_its_reason(bench: Lad) -> None:
    bench(IMMERSION, ("grain volume", REPORTED_GRAIN[1], "W,A,P,16"))
    row = bench.row()
    assert np.isnan(row[POROSITY])
    assert "porosity: grain volume:" in row["flags"] or "porosity" in row["flags"].split(": ")[0]


def test_densities_and_what_two_of_three_volumes_give(bench: Lad) -> None:
    bench(REPORTED_GRAIN, FILLED)
    row = bench.row()
    assert row[BULK] == pytest.approx(15.0)
    assert row["grain density [g/cm3]"] == pytest.approx(30 / 12)
    assert row["bulk density [g/cm3]"] == pytest.approx(30 / 15)


# -- masses --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("weighings", "mass", "flagged"),
    [
        (
            (("2026-03-01", 30.5), ("2026-03-02", 30.02), ("2026-03-03", 30.01), ("2026-03-04", 29.5)),
            30.01,
            False,
        ),
        ((("2026-03-03", 30.01), ("2026-03-02", 30.02), ("2026-03-01", 30.5)), 30.01, False),
        ((("2026-03-01", 30.5), ("2026-03-02", 29.5)), 29.5, True),
        (
            (("2026-03-01T08:00", 30.5), ("2026-03-01T12:00", 30.02), ("2026-03-01T16:00", 30.01)),
            30.01,
            False,
        ),
        ((("2026-03-01", 30.0), ("2026-03-01", 31.0)), 30.5, False),  # repeats, not a series
        ((("", 30.0),), 30.0, False),
    ],
)
def test_dry_mass_is_the_last_at_constant_mass(
    bench: Lad, weighings: tuple[tuple[str, float], ...], mass: float, flagged: bool
) -> None:
    rows = [f"W,A,dry,{m},{day}" for day, m in weighings]
    bench(("masses", "well,plug,condition,mass [g],measured on", *rows))
    row = bench.row()
    assert row["dry mass [g]"] == pytest.approx(mass)
    assert ("not dried to constant mass" in row["flags"]) is flagged


def test_salt_left_by_brine_is_taken_off(bench: Lad) -> None:
    # 2 g of water evaporated from brine of 200 g/kg: 2.5 g of brine, 0.5 g of salt, 0.25 cm3 at 2 g/cm3
    bench(
        REPORTED_GRAIN,
        (
            "masses",
            "well,plug,condition,mass [g],saturant density [g/cm3],salinity [g/kg],salt,salt density [g/cm3]",
            "W,A,saturated,32.4,1.25,200,left,2",
            "W,A,dry,30.4,,,left,2",
        ),
    )
    row = bench.row()
    assert row["dry mass [g]"] == pytest.approx(29.9)
    assert row[GRAIN] == pytest.approx(11.75)
    assert row["pore volume [cm3]"] == pytest.approx(2.0)
    assert "corrected for salt left" in row["flags"]


def test_salt_leached_after_a_first_drying_is_not_taken_off(bench: Lad) -> None:
    bench(
        (
            "masses",
            "well,plug,condition,mass [g],saturant density [g/cm3],salinity [g/kg],salt,measured on",
            "W,A,saturated,32.4,1.25,200,none,2026-03-01",
            "W,A,dry,30.4,,,left,2026-03-02",
            "W,A,dry,29.9,,,leached,2026-03-09",
        )
    )
    row = bench.row()
    assert row["dry mass [g]"] == pytest.approx(29.9)
    assert row["pore volume [cm3]"] == pytest.approx(2.0)
    assert "corrected for salt left" not in row["flags"]


def test_repeats_of_a_volume_are_averaged(bench: Lad) -> None:
    bench(("grain volume", REPORTED_GRAIN[1], "W,A,P,12", "W,A,P,12.2"))
    assert bench.row()[GRAIN] == pytest.approx(12.1)


# -- calibrations --------------------------------------------------------------------------------------------


def test_the_newest_calibration_on_or_before_the_day_is_in_force(bench: Lad) -> None:
    # The second: y = (800 - 240)/(240 - 100) = 4 in the empty cup, 1 over 20 cm3: V_r (4 - 1) = 20
    bench(calibration("", "2026-01-01"), calibration("", "2026-02-01", 240.0), expansion("2026-01-31"))
    assert bench.row()[GRAIN] == pytest.approx(15.0)
    bench(("grain volume", EXPANSION_HEADING, "W,B,POR,800,380,100,2026-02-01"))
    reference = 20 / (560 / 140 - 350 / 350)
    cup = reference * 560 / 140
    assert bench.row("B")[GRAIN] == pytest.approx(cup - reference * 1.5)


@pytest.mark.parametrize(
    ("calibrations", "day", "reason"),
    [
        ((("a", "2026-01-01"), ("b", "2026-01-01")), "2026-01-02", "ambiguous: 2 calibrations could serve"),
        ((("a", "2026-01-01"), ("b", "")), "2026-01-02", "ambiguous: 2 calibrations could serve"),
        ((("a", "2026-01-01"), ("b", "2026-01-02")), "", "ambiguous: 2 calibrations could serve"),
        (
            (("a", "2026-01-01T08:00"), ("b", "2026-01-01T14:00")),
            "2026-01-01",
            "ambiguous: 2 calibrations could serve",
        ),
        ((("a", "2026-01-02"),), "2026-01-01", "older than the first calibration"),
        ((), "2026-01-01", "no calibration of the instrument is recorded"),
    ],
)
def test_a_calibration_that_cannot_be_told_is_refused(
    bench: Lad, calibrations: tuple[tuple[str, str], ...], day: str, reason: str
) -> None:
    bench(*(calibration(label, on) for label, on in calibrations), expansion(day), IMMERSION)
    row = bench.row()
    assert np.isnan(row[GRAIN])
    assert reason in row["flags"]


@pytest.mark.parametrize(
    ("calibrations", "day"),
    [
        ((("", ""),), "2026-01-01"),
        ((("", "2026-01-01"),), ""),
        ((("a", "2026-01-02"), ("b", "")), "2026-01-01"),
        ((("a", "2026-01-01T08:00"), ("b", "2026-01-01T14:00")), "2026-01-01T12:00"),
    ],
)
def test_a_single_calibration_that_can_serve_serves(
    bench: Lad, calibrations: tuple[tuple[str, str], ...], day: str
) -> None:
    bench(*(calibration(label, on) for label, on in calibrations), expansion(day))
    assert bench.row()[GRAIN] == pytest.approx(15.0)


def test_a_calibration_entered_or_corrected_or_withdrawn_later_recomputes(bench: Lad) -> None:
    bench(expansion("2026-01-05"))
    assert "no calibration in force" in bench.row()["flags"]
    bench(calibration("", "2026-01-01"))
    assert bench.row()[GRAIN] == pytest.approx(15.0)
    bench(calibration("", "2026-01-01", 240.0), reason="read again")
    assert bench.row()[GRAIN] != pytest.approx(15.0, rel=0.01)
    assert bench.lab.recompute(check=True).empty
    frame = store_frame(bench.lab, "porosimeter calibration")
    bench.lab.withdraw(int(frame["id"].iloc[0]), "a leak")
    assert "at least two different known volumes" in bench.row()["flags"]


def store_frame(lab: Lab, kind: str) -> pd.DataFrame:
    with engines.reading(lab.engine) as connection:
        return store.in_force(connection, kind)


def test_a_warmer_cup_is_allowed_for_only_where_that_is_asked(bench: Lad) -> None:
    bench(calibration("", ""))
    heading = EXPANSION_HEADING + ",temperature [degC],cup temperature [degC]"
    bench(("grain volume", heading, "W,A,POR,800,380,100,,20,23", "W,B,POR,800,380,100,,,23"))
    assert bench.row()[GRAIN] == pytest.approx(15.0)
    assert "cup warmer than the reference chamber, not corrected" in bench.row()["flags"]
    assert "cup" not in bench.row("B")["flags"]
    bench.lab.setting("cup temperature correction", "on")
    assert "cup" not in bench.row()["flags"]
    # V_r p1/T_r + S pa/T_c = V_r p2/T_r + S p2/T_c
    assert bench.row()[GRAIN] == pytest.approx(30 - 10 * 420 / 280 * 296.15 / 293.15)
    assert bench.row("B")[GRAIN] == pytest.approx(15.0)


def test_pore_volume_in_a_holder_without_stress_is_the_ambient_one(bench: Lad) -> None:
    holder = calibration("", "")[1].replace("calibration", "setup")
    # V_r 10, V_d 2: 8000 + 2 x 100 = 12 p2; 8000 + 10 x 100 = 20 x 450; over 5 cm3: 8700 = 17 p2
    bench(
        (
            "porosimeter calibration",
            holder,
            f"HOL,holder,0,800,{8200 / 12},100,",
            "HOL,holder,8,800,450,100,",
        ),
        (
            "pore volume",
            "well,plug,net confining stress [MPa],instrument,reference pressure [kPa],"
            "expanded pressure [kPa],"
            "barometric pressure [kPa]",
            f"W,A,0,HOL,800,{8500 / 15},100",
            f"W,A,10,HOL,800,{8400 / 14},100",
        ),
        REPORTED_GRAIN,
    )
    row, under = bench.row(), bench.row(stress=10.0)
    assert row["pore volume [cm3]"] == pytest.approx(3.0)
    assert row["porosity route"] == "pore-grain"
    assert row[POROSITY] == pytest.approx(3 / 15)
    assert under[POROSITY] == pytest.approx(2 / 14)
    assert under["porosity stress [MPa]"] == 10.0


def test_porosity_under_stress_without_grains_takes_the_bulk_volume_at_rest(bench: Lad) -> None:
    heading = calibration("", "")[1].replace("calibration", "setup")
    bench(
        (
            "porosimeter calibration",
            heading,
            f"HOL,holder,0,800,{8200 / 12},100,",
            "HOL,holder,8,800,450,100,",
        ),
        (
            "pore volume",
            "well,plug,net confining stress [MPa],instrument,reference pressure [kPa],"
            "expanded pressure [kPa],barometric pressure [kPa]",
            f"W,A,10,HOL,800,{8500 / 15},100",
            f"W,B,10,HOL,800,{8500 / 15},100",
        ),
        IMMERSION,
    )
    row = bench.row(stress=10.0)
    assert row[POROSITY] == pytest.approx(3 / 15)
    assert row["porosity route"] == "bulk-pore"
    assert "bulk volume not under stress" in row["flags"]
    assert "no grain or bulk volume" in set(bench.results("B")["reason"])


# -- flow ----------------------------------------------------------------------------------------------------

STRAIGHT = ((160.0, 1.0), (300.0, 4.9), (600.0, 20.6))


def test_one_and_two_steps_are_estimated_and_three_are_regressed(bench: Lad) -> None:
    bench(
        DIMENSIONS, ("dimensions", DIMENSIONS[1], "W,B,50,20"), flow(*STRAIGHT[:2]), flow(*STRAIGHT, plug="B")
    )
    estimated, measured = bench.row(), bench.row("B")
    assert estimated["slip basis"] == "estimated"
    assert "slip estimated from a published law" in estimated["flags"]
    assert measured["slip basis"] == "measured"
    assert "slip estimated" not in measured["flags"]


def test_repeats_of_two_steps_do_not_make_a_line(bench: Lad) -> None:
    bench(DIMENSIONS)
    kind, heading, first, second = flow(*STRAIGHT[:2])
    again = [row.replace("160.0", "160.02").replace("300.0", "300.03") for row in (first, second)]
    bench((kind, heading, first, second, *again))
    assert bench.row()["slip basis"] == "estimated"
    steps = bench.results().query("quantity == 'gas permeability'")
    assert list(steps["step"]) == ["nitrogen 1", "nitrogen 2"]


def test_steps_and_immersions_that_cannot_be_used_are_said(bench: Lad) -> None:
    kind, heading, *rows = flow(*STRAIGHT, (700.0, 27.0))
    across = [row + ",max," + ("1.1" if n < 3 else "") for n, row in enumerate(rows)]
    bench(DIMENSIONS, (kind, heading + ",direction,geometric factor", *across))
    row = bench.row()
    assert row["slip basis"] == "measured"
    assert "some steps not used" in row["flags"]
    bench((IMMERSION[0], "well,plug,liquid,mass displaced [g]", "W,A,brine,15"))
    row = bench.row()
    assert row[BULK] == pytest.approx(CALIPER)
    assert "some immersion readings not used" in row["flags"]


def test_a_sleeve_below_the_pore_pressure_is_flagged(bench: Lad) -> None:
    kind, heading, *rows = flow(*STRAIGHT)
    heading = heading.replace("net confining stress [MPa]", "confining pressure [kPa]")
    bench(DIMENSIONS, (kind, heading, *(row.rsplit(",", 1)[0] + ",120" for row in rows)))
    assert "confining pressure below the pore pressure" in bench.row()["flags"]


def test_a_negative_intercept_is_refused(bench: Lad) -> None:
    # k_g falls faster than 1/p: from 40 at 130 kPa to 4 at 350 kPa
    bench(DIMENSIONS, flow((160.0, 5.0), (300.0, 3.0), (600.0, 3.0)))
    row = bench.row()
    assert np.isnan(row[K])
    assert "permeability below zero" in row["flags"]
    assert row["gas permeability [mD]"] > 0  # the steps themselves are shown


def test_gas_permeability_by_hand(bench: Lad) -> None:
    """k = 2 mu q p L/(A (p1² - p2²)); mu of nitrogen at 20 degC and 200 kPa 0.017590 mPa s (CoolProp)."""
    bench(DIMENSIONS, flow((300.0, 2.0)))
    k = 2 * 0.017590e-3 * 2e-6 * 100e3 * 0.05 / (math.pi * 1e-4 * (9e10 - 1e10)) / (1e-15 / 1.01325)
    assert bench.row()["gas permeability [mD]"] == pytest.approx(k, rel=1e-3)
    assert bench.row()["mean pressure [kPa]"] == 200.0


def test_the_reporting_pressure_picks_the_step(bench: Lad) -> None:
    bench(DIMENSIONS, flow(*STRAIGHT))
    assert bench.row()["mean pressure [kPa]"] == 200.0
    bench.lab.setting("reporting mean pressure", "3.4 bar")
    assert bench.row()["mean pressure [kPa]"] == 350.0


def test_stress_picks_the_line(bench: Lad) -> None:
    kind, heading, *rows = flow(*STRAIGHT)
    closed = [row.rsplit(",", 1)[0] + ",20" for row in flow(*((up, q / 2) for up, q in STRAIGHT))[2:]]
    bench(DIMENSIONS, (kind, heading, *rows, *closed))
    assert bench.row()["permeability stress [MPa]"] == 3.0
    under = bench.row(stress=20.0)
    assert under["permeability stress [MPa]"] == 20.0
    assert under[K] == pytest.approx(bench.row()[K] / 2)


@pytest.mark.parametrize("held", ["the sleeve", "the net stress"])
def test_steps_at_one_confining_pressure_or_one_net_stress_are_one_line(bench: Lad, held: str) -> None:
    heading = (
        "well,plug,step,gas,upstream pressure [kPa],flow rate [cm3/s],"
        "barometric pressure [kPa],temperature [degC],"
        "confining pressure [kPag]"
    )
    rows = []
    for n, (up, q) in enumerate(STRAIGHT, 1):
        sleeve = 4000.0 if held == "the sleeve" else 4000.0 + up / 2
        rows.append(f"W,A,{n},nitrogen,{up},{q},{100 + n / 10},20,{sleeve}")
    bench(DIMENSIONS, ("gas permeability", heading, *rows))
    lines = bench.results().query("quantity == 'klinkenberg permeability'")
    assert len(lines) == 1
    assert bench.row()["slip basis"] == "measured"
    net = bench.row()["permeability stress [MPa]"]
    # gauge: the barometer is on both sides; mean pressures 130.05, 200.1, 350.15 at barometers 100.1 to 100.3
    wanted = 4.1002 - np.mean([0.13005, 0.2001, 0.35015]) if held == "the sleeve" else 4.1002 - 0.0501
    assert net == pytest.approx(wanted, abs=2e-4)


def test_flow_across_a_core_needs_a_geometric_factor(bench: Lad) -> None:
    kind, heading, *rows = flow(*STRAIGHT)
    bench(DIMENSIONS, (kind, heading + ",direction", *(row + ",max" for row in rows)))
    assert np.isnan(bench.row()[K])
    assert "flow across the core needs a geometric factor" in bench.row()["flags"]


REPORTED_HEADING = (
    "well,plug,permeameter,klinkenberg permeability [mD],gas permeability [mD],gas,mean pressure [kPa]"
)


@pytest.mark.parametrize(
    ("cells", "value", "flag"),
    [
        ("<0.01,,,", 0.01, "klinkenberg permeability below limit"),
        (">5000,,,", 5000.0, "klinkenberg permeability above limit"),
        (",<0.02,nitrogen,200", None, "klinkenberg permeability below limit"),
    ],
)
def test_limits_come_through_as_limits(bench: Lad, cells: str, value: float | None, flag: str) -> None:
    bench(("reported permeability", REPORTED_HEADING, f"W,A,PDP,{cells}"))
    row = bench.row()
    assert flag in row["flags"].split("; ")
    assert row["permeability basis"] == "reported"
    assert row[K] == value if value else 0 < row[K] < 0.02


def test_a_value_beside_a_limit_is_the_value(bench: Lad) -> None:
    bench(("reported permeability", REPORTED_HEADING, "W,A,PDP,<0.01,,,", "W,A,PDP,0.008,,,"))
    row = bench.row()
    assert row[K] == 0.008
    assert "limit" not in row["flags"]


def test_stress_not_stated_and_a_stress_of_zero_are_one_line(bench: Lad) -> None:
    heading = REPORTED_HEADING + ",net confining stress [MPa]"
    bench(("reported permeability", heading, "W,A,PDP,2,,,,", "W,A,PDP,4,,,,0"))
    assert bench.row()[K] == pytest.approx(3.0)
    liquid = (
        "well,plug,step,liquid,upstream pressure [kPa],flow rate [cm3/s],viscosity [mPa.s],"
        "net confining stress [MPa]"
    )
    bench(DIMENSIONS, ("liquid permeability", liquid, "W,A,1,water,300,0.01,1,", "W,A,2,water,300,0.01,1,0"))
    assert len(bench.results().query("quantity == 'liquid permeability'")) == 1


# -- fluids --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("salt", "oil"), [("left", 1.0), ("leached", 0.5), ("none", 0.5)])
def test_distillation_by_hand(bench: Lad, salt: str, oil: float) -> None:
    # 0.9982033 g/cm3 x 2.0036/... : 2 g of water and 0.5 g of salt make 2 cm3 of brine of 1.25 g/cm3
    bench(
        IMMERSION,
        ("grain volume", REPORTED_GRAIN[1], f"W,A,P,{10 + (0.5 / 2.165 if salt == 'left' else 0.0)}"),
        ("masses", "well,plug,condition,mass [g]", "W,A,as received,33,", "W,A,dry,30,"),
        (
            "distillation",
            "well,plug,water volume [cm3],brine salinity [g/kg],brine density [g/cm3],salt,"
            "oil density [g/cm3]",
            f"W,A,{2 / 0.9982033},200,1.25,{salt},0.8",
        ),
    )
    row = bench.row()
    assert row["pore volume [cm3]"] == pytest.approx(5.0)
    assert row["water saturation [v/v]"] == pytest.approx(2 / 5, rel=1e-6)
    assert row["oil saturation [v/v]"] == pytest.approx(oil / 0.8 / 5, rel=1e-6)
    assert row["dry mass [g]"] == pytest.approx(29.5 if salt == "left" else 30.0)


def test_retort_by_hand(bench: Lad) -> None:
    bench(RETORT)
    row = bench.row()
    assert [row[f"{fluid} saturation [v/v]"] for fluid in ("water", "oil", "gas")] == pytest.approx(
        [0.2, 0.4, 0.4]
    )


# -- what was assumed, what is missing -----------------------------------------------------------------------

GAUGE = "well,plug,instrument,reference pressure [kPag],expanded pressure [kPag]"
FLOW = "well,plug,step,gas,temperature [degC],flow rate [cm3/s]"


@pytest.mark.parametrize(
    ("sheet", "quantity", "assumed"),
    [
        (("grain volume", GAUGE, "W,A,POR,700,280"), "grain volume", False),
        (("grain volume", GAUGE.replace("kPag", "kPa"), "W,A,POR,800,380"), "grain volume", True),
        (("grain volume", EXPANSION_HEADING, "W,A,POR,800,380,100,"), "grain volume", False),
        (
            ("gas permeability", FLOW + ",upstream pressure [kPag]", "W,A,1,nitrogen,20,1,200"),
            "gas permeability",
            True,
        ),
        (
            (
                "gas permeability",
                FLOW + ",upstream pressure [kPa],downstream pressure [kPa],flow pressure [kPa]",
                "W,A,1,nitrogen,20,1,300,150,120",
            ),
            "gas permeability",
            False,
        ),
        (
            (
                "gas permeability",
                FLOW + ",upstream pressure [kPa],downstream pressure [kPa],flow pressure [kPag]",
                "W,A,1,nitrogen,20,1,300,150,20",
            ),
            "gas permeability",
            True,
        ),
        (
            (
                "gas permeability",
                FLOW + ",pressure difference [kPa],downstream pressure [kPa],flow basis",
                "W,A,1,nitrogen,20,1,150,150,standard",
            ),
            "gas permeability",
            False,
        ),
        (
            (
                "gas permeability",
                FLOW + ",upstream pressure [kPa],downstream pressure [kPa]",
                "W,A,1,nitrogen,20,1,300,150",
            ),
            "gas permeability",
            True,
        ),
        (
            (
                "liquid permeability",
                "well,plug,step,liquid,viscosity [mPa.s],flow rate [cm3/s],upstream pressure [kPag]",
                "W,A,1,water,1,0.01,200",
            ),
            "liquid permeability",
            False,
        ),
        (
            (
                "liquid permeability",
                "well,plug,step,liquid,viscosity [mPa.s],flow rate [cm3/s],upstream pressure [kPa]",
                "W,A,1,water,1,0.01,300",
            ),
            "liquid permeability",
            True,
        ),
    ],
)
def test_an_assumed_barometer_is_flagged_exactly_where_it_moves_the_result(
    bench: Lad, sheet: Sheet, quantity: str, assumed: bool
) -> None:
    bench(calibration("", ""), DIMENSIONS, sheet)

    def now() -> tuple[float, bool]:
        rows = bench.results().query(f"quantity == '{quantity}'")
        assert len(rows) == 1
        return float(rows["value"].iloc[0]), "barometer assumed" in rows["flags"].iloc[0]

    before, flagged = now()
    assert flagged is assumed
    bench.lab.setting("barometric pressure", "98 kPa")
    after, flagged = now()
    assert not flagged
    assert (abs(after / before - 1) > 1e-9) is assumed


def test_doubts_come_only_from_what_was_used(bench: Lad) -> None:
    absolute = ("grain volume", GAUGE.replace("kPag", "kPa"), "W,A,POR,800,380")
    bench(calibration("", ""), absolute, IMMERSION, RETORT, DRY)
    flags = bench.results().set_index("quantity")["flags"]
    for quantity in ("grain volume", "grain density"):
        assert "barometer assumed" in flags[quantity]
    for quantity in ("bulk volume", "bulk density", "dry mass", "oil saturation", "water saturation"):
        assert "barometer assumed" not in flags[quantity]


def test_not_measured_gives_its_reason(bench: Lad) -> None:
    bench(("not measured", "well,plug,test,reason", "W,A,permeability,fractured", "W,A,porosity,too short"))
    flags = bench.row()["flags"]
    assert "klinkenberg permeability: not measured: fractured" in flags
    assert "porosity: not measured: too short" in flags


def test_every_result_that_is_missing_has_a_reason(rich: Lab) -> None:
    with engines.reading(rich.engine) as connection:
        results = store.results(connection)
    missing = results["value"].isna()
    assert missing.any()
    assert (results.loc[missing, "reason"].str.len() > 0).all()
    assert (results.loc[~missing, "reason"] == "").all()
    assert (results.loc[~missing, "method"].str.len() > 0).all()


# -- corrections and withdrawals -----------------------------------------------------------------------------

CHANGES: list[tuple[str, tuple[Sheet, ...], Sheet, str, str]] = [
    ("dimensions", (DIMENSIONS,), ("dimensions", DIMENSIONS[1], "W,A,60,20"), BULK, ""),
    ("immersion", (IMMERSION,), ("immersion", IMMERSION[1], "W,A,brine,16,1"), BULK, ""),
    ("grain volume", (REPORTED_GRAIN,), ("grain volume", REPORTED_GRAIN[1], "W,A,P,13"), GRAIN, ""),
    ("masses", (DRY,), ("masses", DRY[1], "W,A,dry,31,"), "dry mass [g]", ""),
    ("retort", (RETORT,), ("retort", RETORT[1], "W,A,45,20,2,2,2"), POROSITY, ""),
    ("gas permeability", (DIMENSIONS, flow((300.0, 2.0))), flow((300.0, 3.0)), K, ""),
    (
        "reported permeability",
        (("reported permeability", REPORTED_HEADING, "W,A,PDP,2,,,"),),
        ("reported permeability", REPORTED_HEADING, "W,A,PDP,3,,,"),
        K,
        "",
    ),
    (
        "distillation",
        (
            REPORTED_GRAIN,
            IMMERSION,
            ("masses", "well,plug,condition,mass [g]", "W,A,as received,33,", "W,A,dry,30,"),
            ("distillation", "well,plug,water volume [cm3],oil density [g/cm3]", "W,A,1,0.8"),
        ),
        ("distillation", "well,plug,water volume [cm3],oil density [g/cm3]", "W,A,1.5,0.8"),
        "water saturation [v/v]",
        "",
    ),
    (
        "plugs",
        (DIMENSIONS,),
        ("plugs", "well,plug,from,run,depth [m],jacket volume [cm3]", "W,A,core,1,1,1"),
        BULK,
        "same",
    ),
]


@pytest.mark.parametrize(
    ("kind", "before", "corrected", "heading", "after"), CHANGES, ids=[c[0] for c in CHANGES]
)
def test_corrections_and_withdrawals_are_computed_anew(
    bench: Lad, kind: str, before: tuple[Sheet, ...], corrected: Sheet, heading: str, after: str
) -> None:
    bench(*before)
    first = bench.row()[heading]
    assert not np.isnan(first)
    bench(corrected, reason="misread")
    assert abs(bench.row()[heading] / first - 1) > 0.01
    assert bench.lab.recompute(check=True).empty
    if after:
        return  # a plug stays registered while it has readings
    bench.lab.withdraw(bench.number_of(kind), "wrong plug")
    row = bench.row()
    assert np.isnan(row[heading])
    assert heading.split(" [")[0] in row["flags"] or "saturations: no readings" in row["flags"]
    assert bench.lab.recompute(check=True).empty


# -- a tray with a bit of everything -------------------------------------------------------------------------


@pytest.fixture(scope="module")
def rich(started: bytes, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Lab]:
    folder = tmp_path_factory.mktemp("rich")
    (folder / "lab.db").write_bytes(started)
    with open_lab(str(folder / "lab.db"), by="tester") as lab:
        made = Lad(lab, folder)
        made(
            (
                "plugs",
                "well,plug,from,run,depth [m],jacket mass [g],jacket volume [cm3],screen thickness [mm]",
                "W,C,core,1,3,1.5,0.4,0.3",
                "W,D,core,1,4,,,0.3",
                "W,E,core,1,5,,,",
                "W,F,core,1,6,,,",
                "W,G,core,1,7,,,",
            ),
            ("dimensions", DIMENSIONS[1], *(f"W,{p},50,20" for p in "ACDEG")),
            (
                "immersion",
                "well,plug,liquid,mass in air [g],mass immersed [g],mass displaced [g],"
                "liquid density [g/cm3],"
                "temperature [degC],coating mass [g],coating density [g/cm3]",
                "W,A,mercury,,,208,,21,,",
                "W,B,water,50,34.5,,,22,0.3,0.9",
                "W,E,toluene,50,36.6,,,,,",
                "W,F,ethanol,50,38,,,19,,",
            ),
            calibration("", "2026-01-01"),
            (
                "porosimeter calibration",
                CALIBRATION_HEADING.replace("calibration", "setup"),
                f"HOL,holder,0,800,{8200 / 12},100,",
                "HOL,holder,8,800,450,100,",
            ),
            (
                "grain volume",
                EXPANSION_HEADING + ",billet volume [cm3],temperature [degC],cup temperature [degC]",
                "W,A,POR,800,380,100,2026-01-02,3,20,20.5",
                "W,B,POR,800,370,,2026-01-02,2,,",
                "W,C,POR,800,375,100,2026-01-02,3,,",
            ),
            (
                "grain volume",
                "well,plug,instrument,grain volume [cm3],container volume [cm3]",
                "W,D,P,13,0.5",
            ),
            (
                "pore volume",
                "well,plug,net confining stress [MPa],instrument,reference pressure [kPa],"
                "expanded pressure [kPa],"
                "barometric pressure [kPa]",
                f"W,A,10,HOL,800,{8400 / 14},100",
                f"W,E,0,HOL,800,{8500 / 15},100",
            ),
            (
                "masses",
                "well,plug,condition,mass [g],container mass [g],saturant density [g/cm3],"
                "salinity [g/kg],salt",
                "W,A,as received,36,,,,",
                "W,A,dry,33,,,,",
                "W,B,as received,38,2,,,",
                "W,B,dry,34,2,,,",
                "W,D,saturated,40,3,1.02,35,left",
                "W,D,dry,37.5,3,,,left",
            ),
            (
                "distillation",
                "well,plug,water volume [cm3],trap temperature [degC],brine salinity [g/kg],salt,"
                "oil density [g/cm3],"
                "brine density [g/cm3],thimble mass [g]",
                "W,A,1.5,21,100,left,0.84,,1.2",
                "W,B,2,,150,leached,0.84,1.11,",
            ),
            ("retort", RETORT[1] + ",gas sample mass [g]", "W,F,45,20,1,2,2,40"),
            flow(*STRAIGHT),
            flow(STRAIGHT[1], plug="C", gas="helium"),
            flow(*STRAIGHT, plug="D", gas="air"),
            (
                "gas permeability",
                "well,plug,direction,step,gas,pressure difference [kPa],"
                "downstream pressure [kPag],flow rate [cm3/s],"
                "flow basis,geometric factor,flow temperature [degC]",
                *(
                    f"W,E,max,{n},nitrogen,60,{down},{q},{basis},1.1,25"
                    for n, (down, q, basis) in enumerate(
                        ((20, 3.0, "actual"), (150, 6.0, "standard"), (500, 14.0, "standard")), 1
                    )
                ),
            ),
            (
                "reported permeability",
                REPORTED_HEADING + ",slip factor [kPa]",
                "W,G,PDP,,0.2,helium,300,",
            ),
            (
                "liquid permeability",
                "well,plug,step,liquid,upstream pressure [kPag],flow rate [cm3/s],viscosity [mPa.s]",
                "W,G,1,water,200,0.01,1.01",
            ),
        )
        yield lab


def test_results_are_the_same_when_all_are_deleted_and_made_again(rich: Lab) -> None:
    with engines.writing(rich.engine) as connection:
        before = store.results(connection)
        connection.execute(sa.delete(schema.result))
        assert store.results(connection).empty
    assert len(rich.recompute()) == len(before)
    with engines.reading(rich.engine) as connection:
        pd.testing.assert_frame_equal(store.results(connection), before, check_exact=True)
    assert rich.recompute().empty


@pytest.fixture(scope="module")
def tray(rich: Lab) -> gather.Tray:
    with engines.reading(rich.engine) as connection:
        plugs = store.in_force(connection, "plugs")["plug_id"].tolist()
        return gather.gather(connection, plugs, {"barometric pressure": "99.5"})


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), kept=st.floats(0.2, 0.95), blank=st.floats(0.0, 0.3))
def test_law_whatever_is_missing_each_result_is_a_value_or_a_reason(
    tray: gather.Tray, seed: int, kept: float, blank: float
) -> None:
    rng = np.random.default_rng(seed)
    readings = {}
    for kind, full in tray.readings.items():
        rows = rng.random(len(full)) < kept
        numbers = {name: column[rows] for name, column in full.numbers.items()}
        for name, column in numbers.items():
            if name not in NOT_READ:
                column[rng.random(len(column)) < blank] = np.nan
        texts = {name: column[rows] for name, column in full.texts.items()}
        readings[kind] = gather.Readings(full.at[rows], numbers, texts)
    some = gather.Tray(
        tray.plug_ids, readings, tray.calibrations, np.nan, 20.0, tray.register, [""] * len(tray)
    )
    made = rows_of(some, reduce(some), {})
    keys = [(r["plug_id"], r["quantity"], r["direction"], r["stress_mpa"], r["step"]) for r in made]
    assert len(set(keys)) == len(keys)
    for row in made:
        assert (row["value"] is None) == bool(row["reason"])
        assert row["value"] is None or np.isfinite(row["value"])
        assert bool(row["method"]) == (row["value"] is not None)


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), decades=st.floats(1.0, 300.0))
def test_law_absurd_readings_give_finite_values_or_reasons(
    tray: gather.Tray, seed: int, decades: float
) -> None:
    rng = np.random.default_rng(seed)
    absurd = copy.deepcopy(tray)
    calibrations = [c.readings for found in absurd.calibrations.values() for c in found]
    for readings in (*absurd.readings.values(), *calibrations):
        for name, column in readings.numbers.items():
            if name not in NOT_READ and not name.endswith("_gauge"):
                wild = rng.random(len(column)) < 0.2
                column[wild] *= 10.0 ** rng.uniform(-decades, decades, int(wild.sum()))
                np.nan_to_num(column, copy=False, nan=np.nan, posinf=1e300)
    made = rows_of(absurd, reduce(absurd), {})
    assert {r["plug_id"] for r in made} == set(tray.plug_ids.tolist())
    for row in made:
        assert (row["value"] is None) == bool(row["reason"])
        assert row["value"] is None or np.isfinite(row["value"])


NOT_READ = {
    "id",
    "event",
    "repeat",
    "plug_id",
    "instrument_id",
    "net_confining_stress_mpa",
    "confining_pressure_kpa",
}
NOT_READ |= {"depth_m", "top_depth_m", "base_depth_m", "azimuth_deg"}


def _shifted(tray: gather.Tray, field: str, by: complex) -> gather.Tray:
    """The tray with every value of a field multiplied by 1 + `by`."""
    shifted = copy.deepcopy(tray)
    factor = 1.0 + by if by.imag else 1.0 + by.real
    if hasattr(shifted, field):
        setattr(shifted, field, getattr(shifted, field) * factor)
        return shifted
    kinds = [
        *shifted.readings.values(),
        *(c.readings for found in shifted.calibrations.values() for c in found),
    ]
    for readings in kinds:
        if field in readings.numbers:
            readings.numbers[field] = readings.numbers[field] * factor
    return shifted


def _values(outcomes: list[Outcome]) -> np.ndarray[Any, Any]:
    return np.concatenate([o.value for o in outcomes])


def test_partial_derivatives_by_complex_steps_are_those_of_finite_differences(tray: gather.Tray) -> None:
    kinds = [*tray.readings.values(), *(c.readings for found in tray.calibrations.values() for c in found)]
    fields = {
        name
        for readings in kinds
        for name, column in readings.numbers.items()
        if name not in NOT_READ and not name.endswith("_gauge") and np.any(np.nan_to_num(column) != 0)
    }
    assert len(fields) > 35
    plain = _values(reduce(tray))
    moved = 0
    for field in sorted(fields | {"barometer_kpa", "temperature_degc"}):
        step = _values(reduce(_shifted(tray, field, 1e-30j)))
        # to rounding: a complex quotient may end in another last bit than a real one
        np.testing.assert_allclose(step.real, plain, rtol=1e-13, err_msg=field)
        up, down = (_values(reduce(_shifted(tray, field, complex(h)))) for h in (1e-6, -1e-6))
        slope = (up - down) / 2e-6
        there = ~np.isnan(plain)
        np.testing.assert_allclose(
            step.imag[there] / 1e-30,
            slope[there],
            rtol=2e-5,
            atol=1e-7 * np.abs(plain[there]).max(),
            err_msg=field,
        )
        moved += bool(np.any(np.abs(slope[there]) > 1e-6))
    assert moved > 35
