"""Standard uncertainties of results: checked against other programs, and by what must hold for any of them.

* oracle: the same plug computed in a few lines with the package `uncertainties` (Lebigot, E. O.), which
  carries correlations by itself; the physics is written anew here, but for the viscosity of the gas;
* oracle: Monte Carlo (JCGM 101:2008) through the whole reduction, one copy of the plug a draw;
* laws: pore volume is bulk less grain, with its correlation; all statements doubled double every result's.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import uncertainties as un

from corelab import open_lab
from corelab.bench import gather, reduce, uncertainty
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import store
from corelab.science.fluids import gas_viscosity_mpas

Sheet = tuple[str, ...]  # kind, heading line, rows
LENGTHS, DIAMETERS = (41.02, 40.96, 41.05), (25.31, 25.36, 25.28, 25.33, 25.37)  # mm
BILLETS, BAROMETER = (0.0, 25.0, 50.0, 75.0), 99.2
#: kPa, cm3/s: 20 mD with a slip factor of 30 kPa, within the scatter of the instruments.
STEPS = ((150.0, 1.092), (250.0, 4.27), (400.0, 11.68), (600.0, 26.29), (900.0, 58.7))
REGISTER: Sheet = (
    "instruments",
    "instrument,measures,repeatability,scale uncertainty,uncertainty unit",
    "caliper,length,0.05,0.02,mm",
    "balance,mass,0.01,0.02,g",
    "porosimeter,pressure,0.02,0.05,% of reading",
    "permeameter,pressure,0.2,0.3,kPa",
    "permeameter,flow rate,0.4,0.6,% of reading",
    "permeameter,temperature,0.1,0.2,K",
)


def expanded(space: float, first: float = 700.0, reference: float = 50.0) -> float:
    return (reference * first + space * BAROMETER) / (reference + space)


CALIBRATION = [
    (b, 700.0 + n, expanded(100.0 - b, 700.0 + n) + 0.03 * (-1) ** n) for n, b in enumerate(BILLETS)
]
GRAIN = (700.3, expanded(100.0 - 16.5, 700.3))
PLUG: tuple[Sheet, ...] = (
    (
        "dimensions",
        "well,plug,caliper,"
        + ",".join([f"length {i} [mm]" for i in (1, 2, 3)] + [f"diameter {i} [mm]" for i in range(1, 6)]),
        "W,A,caliper," + ",".join(map(str, LENGTHS + DIAMETERS)),
    ),
    ("masses", "well,plug,condition,mass [g],balance", "W,A,dry,43.62,balance"),
    (
        "porosimeter calibration",
        "instrument,known volume [cm3],reference pressure [kPa],expanded pressure [kPa],"
        "barometric pressure [kPa]",
        *(f"porosimeter,{b},{p},{q},{BAROMETER}" for b, p, q in CALIBRATION),
    ),
    (
        "grain volume",
        "well,plug,instrument,reference pressure [kPa],expanded pressure [kPa],barometric pressure [kPa]",
        f"W,A,porosimeter,{GRAIN[0]},{GRAIN[1]},{BAROMETER}",
    ),
    (
        "gas permeability",
        "well,plug,step,gas,permeameter,upstream pressure [kPag],flow rate [cm3/s],barometric pressure [kPa],"
        "temperature [degC],net confining stress [MPa]",
        *(
            f"W,A,{n},nitrogen,permeameter,{up - BAROMETER},{q},{BAROMETER},21,3"
            for n, (up, q) in enumerate(STEPS)
        ),
    ),
)


class Small:
    """A lab with one well and plugs A and B."""

    def __init__(self, lab: Lab, folder: Path) -> None:
        self.lab, self.folder, self.loads = lab, folder, 0

    def __call__(self, *sheets: Sheet, reason: str = "") -> None:
        self.loads += 1
        folder = self.folder / f"load {self.loads}"
        folder.mkdir()
        for kind, *lines in sheets:
            (folder / f"{kind}.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
        self.lab.load([folder], reason=reason)

    def row(self, plug: str = "A") -> pd.Series[Any]:
        return self.lab.interval("W", with_uncertainty=True).set_index("plug").loc[plug]

    def u(self, heading: str, plug: str = "A") -> float:
        return float(self.row(plug)[f"u {heading}"])

    def tray(self) -> gather.Tray:
        with engines.reading(self.lab.engine) as connection:
            plugs = store.in_force(connection, "plugs")["plug_id"].tolist()
            return gather.gather(connection, plugs, store.settings(connection))


def started(database: Path, folder: Path) -> Small:
    small = Small(open_lab(str(database), by="tester").__enter__(), folder)
    small(
        ("wells", "well,depth unit", "W,m"),
        (
            "core runs",
            "well,run,top depth [m],base depth [m],recovered length [m],core diameter [mm]",
            "W,1,0,9,9,100",
        ),
        ("plugs", "well,plug,from,run,depth [m]", "W,A,core,1,1", "W,B,core,1,2"),
    )
    return small


@pytest.fixture
def small(sqlite_database: str, tmp_path: Path) -> Iterator[Small]:
    made = started(Path(sqlite_database), tmp_path)
    yield made
    made.lab.__exit__(None, None, None)


@pytest.fixture(scope="module")
def whole(sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Small]:
    """Plug A with all its readings by registered instruments; only looked at."""
    folder = tmp_path_factory.mktemp("whole")
    (folder / "lab.db").write_bytes(sqlite_template.read_bytes())
    made = started(folder / "lab.db", folder)
    made(REGISTER, *PLUG)
    yield made
    made.lab.__exit__(None, None, None)


# -- oracles -------------------------------------------------------------------------------------------------


def by_uncertainties() -> dict[str, Any]:
    """The plug of these sheets, each independent error a variable of its own."""

    def off(u: float) -> Any:
        return un.ufloat(0.0, u)

    caliper, balance, gauge, barometer = off(0.02), off(0.02), off(0.05e-2), off(0.05)
    flow_pressure, flow_scale, thermometer, billet = off(0.3), off(0.6e-2), off(0.2), off(0.002)
    length = sum(mm + off(0.05) + caliper for mm in LENGTHS) / len(LENGTHS) / 10.0
    diameter = sum(mm + off(0.05) + caliper for mm in DIAMETERS) / len(DIAMETERS) / 10.0
    area = math.pi / 4.0 * diameter**2
    mass = 43.62 + off(0.01) + balance

    def shown(kpa: float) -> Any:
        return kpa * (1.0 + off(0.02e-2) + gauge)

    room = BAROMETER + off(0.02) + barometer  # one barometer for all rows of the calibration
    y, known = [], []
    for volume, first, after in CALIBRATION:
        p1, p2 = shown(first), shown(after)
        y.append((p1 - p2) / (p2 - room))
        known.append(volume + (billet if volume else 0.0))
    y_mean, known_mean = sum(y) / len(y), sum(known) / len(y)
    reference = -sum((a - y_mean) * (b - known_mean) for a, b in zip(y, known, strict=True)) / sum(
        (a - y_mean) ** 2 for a in y
    )
    cup = known_mean + reference * y_mean
    p1, p2, room = shown(GRAIN[0]), shown(GRAIN[1]), BAROMETER + off(0.02) + barometer
    grain = cup - reference * (p1 - p2) / (p2 - room)
    bulk = area * length

    viscosity = un.wrap(lambda degc, kpa: float(gas_viscosity_mpas(np.array(["nitrogen"]), degc, kpa)[0]))
    k, x, w = [], [], []
    for up, rate in STEPS:
        end = BAROMETER + off(0.02) + barometer
        start = up - BAROMETER + off(0.2) + flow_pressure + end
        mean = (start + end) / 2.0
        mu = viscosity(21.0 + off(0.1) + thermometer, mean)
        flow = rate * (1.0 + off(0.4e-2) + flow_scale)
        square_metres = 2.0 * 1e-8 * mu * flow * end * length / (area * (start**2 - end**2)) * 1e-2
        k.append(square_metres / (1e-15 / 1.01325))
        x.append(1.0 / mean)
        w.append(1.0 / (k[-1].n ** 2 * (0.4e-2**2 + (2.0 * up * 0.2 / (up**2 - BAROMETER**2)) ** 2)))
    return {"k": k, "x": x, "w": w, "bulk": bulk, "grain": grain, "mass": mass, "length": length}


def line(parts: dict[str, Any]) -> tuple[Any, Any]:
    k, x, w = parts["k"], parts["x"], parts["w"]
    total = sum(w)
    x_mean = sum(a * b for a, b in zip(w, x, strict=True)) / total
    k_mean = sum(a * b for a, b in zip(w, k, strict=True)) / total
    slope = sum(c * (a - x_mean) * (b - k_mean) for a, b, c in zip(x, k, w, strict=True)) / sum(
        c * (a - x_mean) ** 2 for a, c in zip(x, w, strict=True)
    )
    level = k_mean - slope * x_mean
    return level, slope / level


def test_every_uncertainty_is_that_of_another_program(whole: Small) -> None:
    parts, row = by_uncertainties(), whole.row()
    bulk, grain, mass = parts["bulk"], parts["grain"], parts["mass"]
    level, slip = line(parts)
    for heading, wanted in {
        "bulk volume [cm3]": bulk,
        "grain volume [cm3]": grain,
        "pore volume [cm3]": bulk - grain,
        "dry mass [g]": mass,
        "porosity [v/v]": (bulk - grain) / bulk,
        "grain density [g/cm3]": mass / grain,
        "bulk density [g/cm3]": mass / bulk,
        "gas permeability [mD]": parts["k"][1],
        "klinkenberg permeability [mD]": level,
        "slip factor [kPa]": slip,
    }.items():
        value, u = float(row[heading]), float(row[f"u {heading}"])
        assert u / value == pytest.approx(wanted.s / wanted.n, rel=1e-6), heading
        assert value == pytest.approx(wanted.n, rel=1e-6), heading


def test_uncertainties_are_those_of_a_monte_carlo_run(whole: Small) -> None:
    """Many copies of the plug, each reading of each drawn by its instrument's statement, reduced at once."""
    draws, rng = 2000, np.random.default_rng(3)
    tray = whole.tray()
    one = int(tray.readings["dimensions"].at[0])

    def copies(readings: gather.Readings, rows: np.ndarray) -> gather.Readings:
        rows = np.tile(np.flatnonzero(rows), draws)
        at = np.repeat(np.arange(draws), len(rows) // draws)
        numbers = {name: column[rows].copy() for name, column in readings.numbers.items()}
        return gather.Readings(at, numbers, {name: column[rows] for name, column in readings.texts.items()})

    def drawn(readings: gather.Readings, prefix: str, random: float, shared: np.ndarray, share: bool) -> None:
        for name, column in readings.numbers.items():
            if name.startswith(prefix) and name[-1] != "e":  # no marks of a gauge
                size = column / 100.0 if share else 1.0
                error = random * rng.standard_normal(len(column)) + shared[readings.at]
                readings.numbers[name] = column + size * error

    readings = {kind: copies(found, found.at == one) for kind, found in tray.readings.items()}
    ((key, (calibration,)),) = tray.calibrations.items()
    of_cup = copies(calibration.readings, np.ones(len(CALIBRATION), dtype=bool))
    normal = lambda u: u * rng.standard_normal(draws)  # noqa: E731
    caliper, gauge, room = normal(0.002), normal(0.05), normal(0.05)
    drawn(readings["dimensions"], "length_", 0.005, caliper, False)
    drawn(readings["dimensions"], "diameter_", 0.005, caliper, False)
    drawn(readings["masses"], "mass_g", 0.01, normal(0.02), False)
    for found in (readings["grain volume"], of_cup):
        drawn(found, "reference_pressure_kpa", 0.02, gauge, True)
        drawn(found, "expanded_pressure_kpa", 0.02, gauge, True)
    drawn(readings["grain volume"], "barometric_pressure_kpa", 0.02, room, False)
    drawn(of_cup, "barometric_pressure_kpa", 0.0, room + normal(0.02), False)
    drawn(readings["gas permeability"], "upstream_pressure_kpa", 0.2, normal(0.3), False)
    drawn(readings["gas permeability"], "flow_rate_cm3_per_s", 0.4, normal(0.6), True)
    drawn(readings["gas permeability"], "barometric_pressure_kpa", 0.02, room, False)
    drawn(readings["gas permeability"], "temperature_degc", 0.1, normal(0.2), False)
    billet = normal(0.002)
    known = of_cup.numbers["known_volume_cm3"]
    of_cup.numbers["known_volume_cm3"] = np.where(known > 0.0, known + billet[of_cup.at], 0.0)
    calibrations = []
    for number in range(draws):
        mine = of_cup.at == number
        own = gather.Readings(
            np.zeros(int(mine.sum()), dtype=np.intp),
            {name: column[mine] for name, column in of_cup.numbers.items()},
            {name: column[mine] for name, column in of_cup.texts.items()},
        )
        calibrations.append(replace(calibration, readings=own, number=number))
    many = replace(
        tray,
        plug_ids=np.arange(draws),
        readings=readings,
        calibrations={key: calibrations},
        in_force={"grain volume": list(range(draws)), "pore volume": []},
        fingerprints=[""] * draws,
        found={},
    )
    outcomes = {o.quantity: o for o in reduce.reduce(many)}
    row = whole.row()
    seen = 0
    for name, outcome in outcomes.items():
        heading = next((h for h in row.index if h.startswith(f"{name} [")), None)
        if heading is None or name in {"gas permeability", "mean pressure"} or np.isnan(row[f"u {heading}"]):
            continue
        assert outcome.at.size == draws
        # the standard deviation of so many draws is good to 1.6 %
        assert outcome.value.std(ddof=1) == pytest.approx(row[f"u {heading}"], rel=0.07), name
        seen += 1
    assert seen >= 9


# -- correlation ---------------------------------------------------------------------------------------------


def test_law_what_results_share_stays_shared(whole: Small) -> None:
    tray = whole.tray()
    outcomes = reduce.reduce(tray)
    where = {o.quantity: i for i, o in enumerate(outcomes)}
    for _, parts in uncertainty.contributions(tray):
        bulk, grain, pore = (parts[where[f"{name} volume"]][0] for name in ("bulk", "grain", "pore"))
        assert pore == pytest.approx(bulk - grain, rel=1e-9, abs=1e-12)
        mass, density = parts[where["dry mass"]][0], parts[where["bulk density"]][0]
        value = {name: outcomes[where[name]].value[0] for name in ("dry mass", "bulk volume", "bulk density")}
        shares = mass / value["dry mass"] - bulk / value["bulk volume"]
        assert density / value["bulk density"] == pytest.approx(shares, rel=1e-9, abs=1e-12)


def test_porosity_is_not_the_sum_of_independent_volumes(whole: Small) -> None:
    """phi = 1 - Vg/Vb and Vp = Vb - Vg share Vb: phi = Vp/Vb taken for independent is too unsure."""
    row = whole.row()
    bulk, pore, phi = (row[h] for h in ("bulk volume [cm3]", "pore volume [cm3]", "porosity [v/v]"))
    u_bulk, u_grain, u_pore = (row[f"u {n} volume [cm3]"] for n in ("bulk", "grain", "pore"))
    shared = math.hypot((1.0 - phi) * u_bulk, u_grain) / bulk
    assert row["u porosity [v/v]"] == pytest.approx(shared, rel=1e-9)
    assert row["u porosity [v/v]"] < 0.95 * phi * math.hypot(u_pore / pore, u_bulk / bulk)


def test_a_shared_caliper_error_is_not_taken_for_several(small: Small) -> None:
    """Scale alone: length and diameter err together, u(V)/V = u/L + 2 u/D, and not the root of squares."""
    small(
        (
            "instruments",
            "instrument,measures,repeatability,scale uncertainty,uncertainty unit",
            "C,length,0,0.1,mm",
        ),
        ("dimensions", "well,plug,length 1 [mm],length 2 [mm],diameter [mm],caliper", "W,A,50,50,20,C"),
    )
    bulk = 5.0 * math.pi
    assert small.u("bulk volume [cm3]") == pytest.approx(bulk * (0.1 / 50.0 + 2 * 0.1 / 20.0), rel=1e-9)


def test_a_balance_error_shared_by_two_weighings_leaves_their_difference(small: Small) -> None:
    small(
        (
            "instruments",
            "instrument,measures,repeatability,scale uncertainty,uncertainty unit",
            "B,mass,0,0.1,g",
        ),
        (
            "masses",
            "well,plug,condition,mass [g],saturant density [g/cm3],balance",
            "W,A,dry,30,,B",
            "W,A,saturated,33,1,B",
        ),
        ("dimensions", "well,plug,length [mm],diameter [mm]", "W,A,50,20"),
    )
    # what stays is the density of the liquid, 0.005 g/cm3 by default
    assert small.u("pore volume [cm3]") == pytest.approx(3.0 * 0.005, rel=1e-9)
    assert small.u("dry mass [g]") == pytest.approx(0.1, rel=1e-9)


def test_a_plug_is_known_as_well_in_company_as_alone(whole: Small, small: Small) -> None:
    """Passes shared by the plugs of a tray mix nothing."""
    other = tuple(
        (kind, *(line.replace("W,A,", "W,B,").replace("43.62", "41.9") for line in lines))
        for kind, *lines in PLUG
        if kind != "porosimeter calibration"
    )
    small(REGISTER, *PLUG)
    small(*other)
    together, alone = small.row("A"), whole.row("A")
    for heading in (h for h in alone.index if h.startswith("u ") and alone[h] == alone[h]):
        assert together[heading] == pytest.approx(alone[heading], rel=1e-9), heading


def test_law_all_statements_doubled_double_every_uncertainty(whole: Small) -> None:
    tray = whole.tray()
    plain, doubled = ([float(np.nansum(o.uncertainty)) for o in _with_u(t)] for t in (tray, _doubled(tray)))
    free = [u for u in plain if u > 0.0]
    assert len(free) >= 9
    np.testing.assert_allclose(doubled, 2.0 * np.array(plain), rtol=1e-9)


def _with_u(tray: gather.Tray) -> list[reduce.Outcome]:
    outcomes = reduce.reduce(tray)
    uncertainty.add_uncertainties(tray, outcomes)
    return outcomes


def _doubled(tray: gather.Tray) -> gather.Tray:
    class Doubled(type(tray.register)):  # type: ignore[misc]
        def amounts(self, *given: Any) -> Any:
            return tuple(2.0 * part for part in super().amounts(*given))

    register = Doubled(tray.register.rows, tray.register.names)
    return replace(tray, register=register, found={})


# -- scatter, limits, defaults -------------------------------------------------------------------------------

CALIPER: Sheet = (
    "instruments",
    "instrument,measures,repeatability,scale uncertainty,uncertainty unit",
    "C,length,0.01,,mm",
)
ROUND = "well,plug,length [mm],diameter 1 [mm],diameter 2 [mm],diameter 3 [mm],caliper"


def test_an_oval_plug_is_as_uncertain_as_its_diameters_scatter(small: Small) -> None:
    small(CALIPER, ("dimensions", ROUND, "W,A,50,20.01,20,19.99,C", "W,B,50,20.4,20,19.6,C"))

    def wanted(diameter_u: float) -> float:
        return 5.0 * math.pi * math.hypot(0.01 / 50.0, 2.0 * diameter_u / math.sqrt(3.0) / 20.0)

    assert small.u("bulk volume [cm3]", "A") == pytest.approx(wanted(0.01), rel=1e-6)
    assert small.u("bulk volume [cm3]", "B") == pytest.approx(wanted(0.4), rel=1e-6)


def test_repeats_are_surer_by_the_root_of_their_number_and_their_scale_is_not(small: Small) -> None:
    heading = "instrument,measures,repeatability,scale uncertainty,uncertainty unit"
    weighing = "well,plug,condition,mass [g],balance"
    small(
        ("instruments", heading, "R,mass,0.1,,g", "S,mass,0,0.1,g"),
        ("masses", weighing, *["W,A,dry,30,R"] * 4, *["W,B,dry,30,S"] * 4),
    )
    assert small.u("dry mass [g]", "A") == pytest.approx(0.05, rel=1e-9)
    assert small.u("dry mass [g]", "B") == pytest.approx(0.1, rel=1e-9)


def flow(*rates: float) -> Sheet:
    return (
        "gas permeability",
        "well,plug,step,gas,permeameter,upstream pressure [kPa],flow rate [cm3/s],barometric pressure [kPa],"
        "temperature [degC]",
        *(
            f"W,A,{n},nitrogen,permeameter,{up},{q},99.2,21"
            for n, ((up, _), q) in enumerate(zip(STEPS, rates, strict=True))
        ),
    )


def test_steps_that_scatter_beyond_their_instruments_say_so(small: Small, whole: Small) -> None:
    rates = [q * factor for (_, q), factor in zip(STEPS, (1.0, 1.04, 0.96, 1.04, 0.97), strict=True)]
    small(REGISTER, PLUG[0], flow(*rates))
    row, steady = small.row(), whole.row()
    assert "steps scatter more than their instruments state" in row["flags"]
    assert "steps scatter" not in steady["flags"]
    for heading in ("klinkenberg permeability [mD]", "slip factor [kPa]"):
        assert row[f"u {heading}"] / row[heading] > 1.5 * steady[f"u {heading}"] / steady[heading]


def test_limits_and_missing_values_have_no_uncertainty(small: Small) -> None:
    heading = "well,plug,permeameter,net confining stress [MPa],klinkenberg permeability [mD]"
    small(("reported permeability", heading, "W,A,decay,3,<0.01", "W,B,decay,3,5"))
    a, b = small.row("A"), small.row("B")
    assert a["klinkenberg permeability [mD]"] == 0.01
    assert np.isnan(a["u klinkenberg permeability [mD]"])
    assert b["u klinkenberg permeability [mD]"] == pytest.approx(5.0 * math.hypot(0.01, 0.04), rel=1e-9)
    assert np.isnan(b["u porosity [v/v]"])


def test_defaults_are_flagged_where_an_instrument_states_nothing_and_only_there(
    small: Small, whole: Small
) -> None:
    assert "default uncertainty" not in whole.row()["flags"]
    small(*PLUG)
    flags = small.row()["flags"]
    for what in ("caliper, length", "balance, mass", "porosimeter, pressure", "permeameter, flow rate"):
        assert f"default uncertainty ({what})" in flags
    small(("dimensions", "well,plug,length [mm],diameter [mm]", "W,B,50,20"))
    assert "default uncertainty (length)" in small.row("B")["flags"]
    assert small.u("bulk volume [cm3]", "B") > 0.0


@pytest.mark.parametrize(
    ("what", "heading"),
    [
        ("caliper,length,0.5,0.2,mm", "bulk volume [cm3]"),
        ("balance,mass,0.1,0.2,g", "dry mass [g]"),
        ("porosimeter,pressure,0.2,0.5,% of reading", "grain volume [cm3]"),
        ("permeameter,flow rate,4,6,% of reading", "klinkenberg permeability [mD]"),
    ],
)
def test_an_instrument_registered_or_corrected_later_recomputes_what_it_read(
    small: Small, what: str, heading: str
) -> None:
    small(*PLUG)
    value, before = small.row()[heading], small.u(heading)
    small(REGISTER)
    registered = small.u(heading)
    assert registered != before
    small(("instruments", REGISTER[1], what), reason="certificate renewed")
    assert small.u(heading) > 3.0 * registered
    # the weights of a line are those of its steps, so its value may move by rounding of the last digits
    assert small.row()[heading] == pytest.approx(value, rel=0.01)
    assert small.lab.recompute(check=True).empty


# -- what is assumed -----------------------------------------------------------------------------------------


def test_a_barometer_nobody_read_counts_more_than_one_that_is_set_or_read(small: Small) -> None:
    rates = [q for _, q in STEPS]
    kind, heading, *rows = flow(*rates)
    small(REGISTER, PLUG[0], (kind, heading, *(r.replace(",99.2,", ",,") for r in rows)))
    k = "klinkenberg permeability [mD]"
    nobody = small.u(k)
    small.lab.setting("barometric pressure", "99.2 kPa")
    as_set = small.u(k)
    small((kind, heading, *rows), reason="read after all")
    assert nobody > as_set > small.u(k)
