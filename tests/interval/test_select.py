"""The interval: its columns, order, limits, depth bases, stresses and reasons. No published values.

A small well in feet, made here: caliper volumes, reported grain volumes and reported permeabilities, so that
each number can be followed by hand.
"""

from __future__ import annotations

import itertools
import math
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab import open_lab
from corelab.errors import NotFound, Usage
from corelab.interval.select import COMPUTED, natural_key
from corelab.lab import Lab

HEADINGS = [
    "well",
    "plug",
    "source",
    "laboratory",
    "run",
    "depth [ft]",
    "depth basis",
    "log depth [ft]",
    "orientation",
    "facies",
    "lithology",
    "bulk volume [cm3]",
    "grain volume [cm3]",
    "pore volume [cm3]",
    "dry mass [g]",
    "porosity [v/v]",
    "porosity route",
    "porosity stress [MPa]",
    "grain density [g/cm3]",
    "bulk density [g/cm3]",
    "gas permeability [mD]",
    "gas",
    "mean pressure [kPa]",
    "klinkenberg permeability [mD]",
    "slip factor [kPa]",
    "slip basis",
    "permeability basis",
    "permeability stress [MPa]",
    "oil saturation [v/v]",
    "water saturation [v/v]",
    "gas saturation [v/v]",
    "crush likelihood [v/v]",
    "crush verdict",
    "status",
    "flags",
]
WELL = "7121/8-1"


SHEETS = {
    "wells": ["well,depth unit", f"{WELL},ft", "Empty,m"],
    "core runs": [
        "well,run,top depth [ft],base depth [ft],recovered length [ft]",
        f"{WELL},1,8000,8030,30",
    ],
    "sidewall shots": [
        "well,gun run,shot,depth [ft],depth basis,tool,outcome",
        f"{WELL},G1,1,8010.5,log,percussion,recovered",
        f"{WELL},G1,2,8020.5,driller,rotary,recovered",
    ],
    "plugs": [
        "well,plug,from,run,gun run,shot,depth [ft],orientation,facies",
        f"{WELL},10H,core,1,,,8010.1,horizontal,channel sand",
        f"{WELL},2H,core,1,,,8010.1,horizontal,channel sand",
        f"{WELL},1V,core,,,,8001,vertical,",
        f"{WELL},Ø3,core,1,,,8029.9,horizontal,shale",
        f"{WELL},P1,sidewall,,G1,1,8010.5,,",
        f"{WELL},R1,sidewall,,G1,2,8020.5,,",
    ],
    "descriptions": ["well,plug,lithology", f"{WELL},2H,sandstone"],
    "dimensions": [
        "well,plug,length 1 [mm],diameter 1 [mm]",
        f"{WELL},2H,50,38",
        f"{WELL},10H,40,38",
        f"{WELL},P1,20,25",
    ],
    "masses": [
        "well,plug,condition,mass [g]",
        f"{WELL},2H,dry,120.25",
        f"{WELL},10H,dry,100.5",
    ],
    "grain volume": ["well,plug,instrument,grain volume [cm3]", f"{WELL},2H,POR,45.5"],
    "reported permeability": [
        "well,plug,net confining stress [MPa],permeameter,klinkenberg permeability [mD]",
        f"{WELL},2H,20,PDK,8.25",
        f"{WELL},2H,5,PDK,12.5",
        f"{WELL},10H,5,PDK,<0.01",
        f"{WELL},R1,5,PDK,>5000",
    ],
    "not measured": ["well,plug,test,reason", f"{WELL},Ø3,permeability,fractured"],
}


@pytest.fixture(scope="module")
def loaded(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path) -> Path:
    """A file with the small well, to be copied by each test."""
    folder = tmp_path_factory.mktemp("small")
    path = shutil.copyfile(sqlite_template, folder / "lab.db")
    for kind, lines in SHEETS.items():
        (folder / f"{kind}.csv").write_text("\n".join(lines), encoding="utf-8")
    with open_lab(str(path), by="tester") as lab:
        lab.load([folder])
    return path


@pytest.fixture
def small(loaded: Path, tmp_path: Path) -> Iterator[Lab]:
    with open_lab(str(shutil.copyfile(loaded, tmp_path / "lab.db")), by="tester") as lab:
        yield lab


def row(frame: pd.DataFrame, plug: str) -> pd.Series:
    return frame.set_index("plug").loc[plug]


def test_columns_exactly_and_in_order(small: Lab):
    assert list(small.interval(WELL)) == HEADINGS
    metres = [h.replace("[ft]", "[m]") for h in HEADINGS]
    assert list(small.interval(WELL, unit="m")) == metres
    assert list(small.interval("Empty")) == metres
    assert not len(small.interval("Empty", where="porosity > 0.1 and facies contains sand"))


def test_an_uncertainty_follows_each_computed_column(small: Lab):
    headings = list(small.interval(WELL, with_uncertainty=True))
    assert [h for h in headings if not h.startswith("u ")] == HEADINGS
    followed = [h for h, after in itertools.pairwise(headings) if after == f"u {h}"]
    assert tuple(followed) == COMPUTED
    assert set(COMPUTED) == {
        h
        for h in HEADINGS
        if "[" in h and "depth" not in h and "stress" not in h and not h.startswith("crush")
    }


def test_values_can_be_followed_by_hand(small: Lab):
    plug = row(small.interval(WELL), "2H")
    bulk = math.pi / 4 * 3.8**2 * 5.0
    assert plug["bulk volume [cm3]"] == pytest.approx(bulk, rel=1e-12)
    assert plug["grain volume [cm3]"] == 45.5
    assert plug["dry mass [g]"] == 120.25
    assert plug["pore volume [cm3]"] == pytest.approx(bulk - 45.5, rel=1e-12)
    assert plug["porosity [v/v]"] == pytest.approx(1 - 45.5 / bulk, rel=1e-12)
    assert plug["porosity route"] == "bulk-grain"
    assert plug["porosity stress [MPa]"] == 0
    assert plug["grain density [g/cm3]"] == pytest.approx(120.25 / 45.5, rel=1e-12)
    assert plug["bulk density [g/cm3]"] == pytest.approx(120.25 / bulk, rel=1e-12)
    assert (plug["klinkenberg permeability [mD]"], plug["permeability stress [MPa]"]) == (12.5, 5)
    assert (plug["permeability basis"], plug["lithology"]) == ("reported", "sandstone")


def test_rows_come_by_depth_and_then_by_natural_order_of_names(small: Lab):
    assert small.interval(WELL)["plug"].tolist() == ["1V", "2H", "10H", "P1", "R1", "Ø3"]


@pytest.mark.parametrize(
    ("top", "base", "unit", "plugs"),
    [
        (8010.1, 8010.1, "", ["2H", "10H"]),
        (8010.1, None, "", ["2H", "10H", "P1", "R1", "Ø3"]),
        (None, 8010.1, "ft", ["1V", "2H", "10H"]),
        (8010.11, 8020.49, "ft", ["P1"]),
        (8010.1 * 0.3048, 8010.5 * 0.3048, "m", ["2H", "10H", "P1"]),
        (2441.5, 2441.61, "m", ["P1"]),
        (0, 100, "", []),
    ],
)
def test_limits_are_inclusive_in_the_unit_of_the_answer(
    small: Lab, top: float | None, base: float | None, unit: str, plugs: list[str]
):
    assert small.interval(WELL, top, base, unit=unit)["plug"].tolist() == plugs


def test_source_and_depth_basis(small: Lab):
    own = small.interval(WELL).set_index("plug")
    assert own.loc["P1", ["source", "depth basis", "log depth [ft]", "run"]].tolist() == [
        "percussion sidewall", "log", 8010.5, "G1",
    ]  # fmt: skip
    assert own.loc["R1", ["source", "depth basis"]].tolist() == ["rotary sidewall", "driller"]
    assert np.isnan(own.loc["R1", "log depth [ft]"])
    assert own.loc["2H", ["source", "depth basis", "run"]].tolist() == ["core", "driller", "1"]
    # the run in which it lies, where the sheet does not say
    assert own.loc["1V", "run"] == "1"
    # log depth where it is known, else the plug's own
    on_log = small.interval(WELL, depth="log").set_index("plug")
    assert on_log["depth basis"].to_dict() == own["depth basis"].to_dict()
    assert on_log["depth [ft]"].to_dict() == own["depth [ft]"].to_dict()
    assert small.interval(WELL, depth="driller")["plug"].tolist() == list(own.index)


def test_a_value_beyond_a_limit_is_the_limit_with_a_flag(small: Lab):
    frame = small.interval(WELL)
    below, above = row(frame, "10H"), row(frame, "R1")
    assert below["klinkenberg permeability [mD]"] == 0.01
    assert "klinkenberg permeability below limit" in below["flags"].split("; ")
    assert above["klinkenberg permeability [mD]"] == 5000
    assert "klinkenberg permeability above limit" in above["flags"].split("; ")


def test_a_missing_result_is_empty_with_its_reason(small: Lab):
    frame = small.interval(WELL)
    parts = row(frame, "Ø3")["flags"].split("; ")
    assert "klinkenberg permeability: not measured: fractured" in parts
    assert any(part.endswith("saturations: no readings") for part in parts)
    reported = row(frame, "2H")
    assert np.isnan(reported["gas permeability [mD]"])
    assert reported["gas"] == ""
    assert "gas permeability, slip factor: not reported by the instrument" in reported["flags"].split("; ")
    no_grain = row(frame, "10H")["flags"]
    for name in ("grain volume", "pore volume", "porosity", "grain density"):
        assert np.isnan(row(frame, "10H")[next(c for c in frame if c.startswith(f"{name} ["))])
        assert any(name in part and ": " in part for part in no_grain.split("; ")), name
    for _, plug in frame.iterrows():
        for heading in ("bulk volume [cm3]", "porosity [v/v]", "klinkenberg permeability [mD]"):
            assert not np.isnan(plug[heading]) or heading.split(" [")[0] in plug["flags"]


@pytest.mark.parametrize("stress", [20.0, 20.04, 19.95])
def test_the_stress_asked_for(small: Lab, stress: float):
    frame = small.interval(WELL, stress=stress)
    plug, other = row(frame, "2H"), row(frame, "10H")
    assert (plug["klinkenberg permeability [mD]"], plug["permeability stress [MPa]"]) == (8.25, 20)
    # volumes were read without stress: not at this one; grains, masses and their density do not change
    for heading in ("bulk volume [cm3]", "pore volume [cm3]", "porosity [v/v]", "bulk density [g/cm3]"):
        assert np.isnan(plug[heading])
    assert (plug["porosity route"], plug["grain volume [cm3]"], plug["dry mass [g]"]) == ("", 45.5, 120.25)
    assert (
        f"bulk volume, pore volume, porosity, bulk density: not measured at {stress:g} MPa" in plug["flags"]
    )
    assert np.isnan(other["klinkenberg permeability [mD]"])
    assert np.isnan(other["permeability stress [MPa]"])
    assert f"klinkenberg permeability: not measured at {stress:g} MPa" in other["flags"]
    assert "below limit" not in other["flags"]
    # a reason of its own stays
    assert "klinkenberg permeability: not measured: fractured" in row(frame, "Ø3")["flags"]


def test_the_nearest_of_two_stresses_is_taken(small: Lab, write_sheet: Callable[..., Path]):
    head = "well,plug,net confining stress [MPa],permeameter,klinkenberg permeability [mD]"
    rows = (f"{WELL},1V,20.05,PDK,3", f"{WELL},1V,19.95,PDK,4")
    small.load([write_sheet("reported permeability", head, *rows)])
    assert row(small.interval(WELL, stress=20.04), "1V")["klinkenberg permeability [mD]"] == 3
    assert row(small.interval(WELL, stress=19.96), "1V")["klinkenberg permeability [mD]"] == 4
    assert row(small.interval(WELL), "1V")["klinkenberg permeability [mD]"] == 4


def test_a_permeability_of_unstated_stress_belongs_to_none(small: Lab, write_sheet: Callable[..., Path]):
    head = "well,plug,permeameter,klinkenberg permeability [mD]"
    small.load([write_sheet("reported permeability", head, f"{WELL},1V,PDK,3")])
    plug = row(small.interval(WELL), "1V")
    assert plug["klinkenberg permeability [mD]"] == 3
    assert np.isnan(plug["permeability stress [MPa]"])
    assert "net confining stress not stated" in plug["flags"]
    assert np.isnan(row(small.interval(WELL, stress=0), "1V")["klinkenberg permeability [mD]"])


def test_where_takes_depths_in_the_unit_of_the_answer(small: Lab):
    assert small.interval(WELL, where="depth > 8020 and source = core")["plug"].tolist() == ["Ø3"]
    assert small.interval(WELL, where="depth > 2444.5", unit="m")["plug"].tolist() == ["R1", "Ø3"]
    assert small.interval(WELL, where="plug = 'ø3'")["plug"].tolist() == ["Ø3"]
    assert small.interval(WELL, where="flags contains 'below limit'")["plug"].tolist() == ["10H"]
    assert small.interval(WELL, where="porosity is not empty")["plug"].tolist() == ["2H"]
    assert len(small.interval(WELL, where="  ")) == 6


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        ({"unit": "km"}, "--unit is m or ft, not 'km'"),
        ({"depth": "seismic"}, "--depth is driller or log"),
        ({"top": math.nan}, "--top is a number"),
        ({"base": math.inf}, "--base is a number"),
        ({"stress": math.nan}, "--stress is a number"),
        ({"stress": -5.0}, "not below zero; found -5 MPa"),
        ({"top": 8020.0, "base": 8010.0}, "8020, lies below the base, 8010"),
        ({"where": "porosty > 1"}, "did you mean 'porosity'"),
    ],
)
def test_wrong_requests(small: Lab, asked: dict[str, object], said: str):
    with pytest.raises(Usage) as trouble:
        small.interval(WELL, **asked)  # type: ignore[arg-type]
    assert said in str(trouble.value)


def test_names_are_found_without_regard_to_case_and_spaces(small: Lab):
    assert len(small.interval("  7121/8-1 ")) == 6
    assert len(small.plug_show(WELL, " ø3 ")["entries"]) == 2
    with pytest.raises(NotFound, match=r"did you mean '7121/8-1'\?"):
        small.interval("7121/8-2")
    with pytest.raises(NotFound, match=r"There is no plug '2X' in well '7121/8-1'; did you mean '2H'"):
        small.plug_show(WELL, "2X")


def test_a_correction_shows_at_once(small: Lab, write_sheet: Callable[..., Path]):
    before = row(small.interval(WELL), "2H")
    path = write_sheet("masses", "well,plug,condition,mass [g]", f"{WELL},2H,dry,121.25")
    small.load([path], reason="read wrongly")
    after = row(small.interval(WELL), "2H")
    assert after["dry mass [g]"] == before["dry mass [g]"] + 1
    assert after["grain density [g/cm3]"] == pytest.approx(121.25 / 45.5, rel=1e-12)
    corrected = small.plug_show(WELL, "2H")["entries"].set_index("entry")["state"]
    number = int(small.plug_show(WELL, "2H")["entries"]["number"].max())
    assert corrected["condition dry, mass [g] 120.25"] == f"corrected by {number}"
    told = small.history(WELL, "2H")
    assert f"by #{number}: condition dry, mass [g] 121.25" in told["what"].iloc[-1]
    assert told["why"].iloc[-1] == "read wrongly"
    assert "(1 of them corrections)" in small.history(WELL)["what"].iloc[-1]
    small.withdraw(number, "wrong plug")
    assert np.isnan(row(small.interval(WELL), "2H")["dry mass [g]"])
    assert small.history(WELL)["what"].iloc[-1] == "withdrew 1 reading"
    assert small.plug_show(WELL, "2H")["entries"].set_index("number")["state"][number] == "withdrawn"


def test_standards_are_in_no_well(small: Lab, write_sheet: Callable[..., Path]):
    small.load(
        [
            write_sheet("standards", "standard,kind", "CP-1,check plug"),
            write_sheet("dimensions", "well,plug,length 1 [mm],diameter 1 [mm]", "standards,CP-1,40,38"),
        ]
    )
    assert "CP-1" not in set(small.interval(WELL)["plug"])
    assert "standards" not in set(small.well_list()["well"])
    assert not len(small.interval("standards"))
    assert small.plug_list("standards")["standard"].tolist() == ["CP-1"]
    assert "CP-1" not in set(small.board()["plug"])


@given(st.lists(st.text(max_size=6), max_size=8))
def test_natural_order_takes_any_names(names: list[str]):
    ordered = sorted(names, key=natural_key)
    assert sorted(ordered, key=natural_key) == ordered


def test_natural_order_of_names():
    names = ["10H", "2H", "2h1", "P10", "P2", "3-10", "3-2", "²", "1²", "٣", "7121/8-1"]
    assert sorted(["10H", "2H", "1H"], key=natural_key) == ["1H", "2H", "10H"]
    assert sorted(["P10", "P2", "3-10", "3-2"], key=natural_key) == ["3-2", "3-10", "P2", "P10"]
    assert len(sorted(names, key=natural_key)) == len(names)
