"""Summaries through a lab: the contract's keys, hand-made plugs with known averages, the demo's truth."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from corelab.errors import NotFound, Usage
from corelab.lab import Lab

HBK5 = [120, 213, 180, 200, 212, 165, 145, 198, 210, 143, 79, 118, 212, 117]
KEYS = (
    "group", "plugs", "top depth [m]", "base depth [m]", "porosity", "klinkenberg permeability",
    "dykstra-parsons coefficient", "dykstra-parsons convention", "lorenz coefficient",
    "vertical to horizontal ratio", "flow capacity [mD.m]", "storage capacity [m]", "net to gross [v/v]",
    "left out",
)  # fmt: skip
STATISTICS = (
    "count", "minimum", "maximum", "arithmetic mean", "geometric mean", "harmonic mean", "median",
    "standard deviation", "coefficient of variation",
)  # fmt: skip


@pytest.fixture
def stocked(lab: Lab, write_sheet: Callable[..., Path]) -> Lab:
    """Fourteen horizontal plugs 0.5 m apart with the permeabilities of well HBK5, and what must not count:
    a vertical companion, a duplicate, a plug below detection, one without permeability, one cracked."""
    plugs = [f"W-1,{i}H,core,{1000 + 0.5 * i},horizontal,,,sand" for i in range(14)]
    plugs += [
        "W-1,0V,core,1000,vertical,0H,,sand",
        "W-1,1HD,core,1000.5,horizontal,,1H,sand",
        "W-1,14H,core,1007,horizontal,,,silt",
        "W-1,15H,core,1007.5,horizontal,,,silt",
        "W-1,16H,core,1008,horizontal,,,silt",
    ]
    reported = [f"W-1,{i}H,P1,{k}" for i, k in enumerate(HBK5)]
    reported += ["W-1,0V,P1,60", "W-1,1HD,P1,9999", "W-1,14H,P1,<0.01", "W-1,16H,P1,900"]
    names = [row.split(",")[1] for row in plugs]
    lab.load(
        [
            write_sheet("wells", "well,depth unit", "W-1,m"),
            write_sheet(
                "plugs", "well,plug,from,depth [m],orientation,companion of,duplicate of,facies", *plugs
            ),
            write_sheet(
                "reported permeability", "well,plug,permeameter,klinkenberg permeability [mD]", *reported
            ),
            write_sheet(
                "dimensions", "well,plug,length 1 [mm],diameter 1 [mm]", *(f"W-1,{p},50,38" for p in names)
            ),
            write_sheet(
                "grain volume",
                "well,plug,instrument,grain volume [cm3]",
                *(f"W-1,{p},G,45.363" for p in names),
            ),
            write_sheet("descriptions", "well,plug,lithology,condition", "W-1,16H,sandstone,cracked"),
        ]
    )
    return lab


def test_published_means_come_out_of_the_lab(stocked: Lab):
    """Tiab & Donaldson 2004, Petrophysics, 2nd ed., p. 197: A 165, G 158.7, H 151.4."""
    (record,) = stocked.summary("W-1", where="facies = 'sand'")
    assert tuple(k for k in record if k in KEYS) == KEYS
    assert tuple(record["porosity"])[: len(STATISTICS)] == STATISTICS
    k = record["klinkenberg permeability"]
    assert (k["count"], record["plugs"]) == (14, 14)
    assert k["arithmetic mean"] == pytest.approx(165, abs=0.5)
    assert k["geometric mean"] == pytest.approx(158.7, abs=0.05)
    assert k["harmonic mean"] == pytest.approx(151.4, abs=0.05)
    assert record["dykstra-parsons coefficient"] == pytest.approx(0.28307966545773866, abs=1e-6)
    low, high = k["confidence"]["geometric mean"]
    assert low < 158.7 < high
    assert record["vertical to horizontal ratio"] == pytest.approx(60 / 120)
    assert record["vertical to horizontal pairs"] == 1
    porosity = 1 - 45.363 / (np.pi / 4 * 3.8**2 * 5)
    assert record["porosity"]["arithmetic mean"] == pytest.approx(porosity, abs=1e-6)
    assert record["storage capacity [m]"] == pytest.approx(porosity * 7.0, rel=1e-6)
    assert record["flow capacity [mD.m]"] == pytest.approx(sum(HBK5) * 0.5, rel=1e-9)


def test_zero_below_detection_and_not_measured_are_three_things(stocked: Lab):
    silt = {r["group"]: r for r in stocked.summary("W-1", by="facies")}["silt"]
    k = silt["klinkenberg permeability"]
    assert (k["below detection"], k["not measured"], k["zero"]) == (1, 1, 0)
    assert k["count"] == 2  # the limit and the 900 mD
    assert "too few" in k["below detection taken as"]


def test_what_is_left_out_is_counted_and_its_difference_shown(stocked: Lab):
    (whole,) = stocked.summary("W-1")
    assert whole["left out"]["why"]["duplicate of another plug"] == 1
    assert sum(whole["left out"]["why"].values()) == whole["left out"]["plugs"] == 2
    assert whole["left out"]["difference"] is None
    (less,) = stocked.summary("W-1", leave_out=["cracked"])
    assert less["plugs"] == whole["plugs"] - 1
    assert less["klinkenberg permeability"]["maximum"] == 213
    difference = less["left out"]["difference"]
    assert difference["with"]["plugs"] == whole["plugs"]
    assert (
        difference["with"]["klinkenberg permeability geometric mean"]
        > difference["without"]["klinkenberg permeability geometric mean"]
    )


def test_vertical_plugs_only_when_asked(stocked: Lab):
    (asked,) = stocked.summary("W-1", where="orientation = 'vertical'")
    assert asked["klinkenberg permeability"]["maximum"] == 60
    groups = {r["group"] for r in stocked.summary("W-1", by="orientation")}
    assert groups == {"horizontal", "vertical"}


def test_net_to_gross_moves_with_its_cut_offs(stocked: Lab):
    (record,) = stocked.summary("W-1", where="facies = 'sand'", cuts={"permeability": 150.0})
    above = sum(k >= 150 for k in HBK5) / 14
    assert record["net to gross [v/v]"] == pytest.approx(above)
    by_k = [s for s in record["net to gross sensitivity"] if s["porosity [v/v]"] == pytest.approx(0.1)]
    shares = [s["net to gross [v/v]"] for s in sorted(by_k, key=lambda s: s["klinkenberg permeability [mD]"])]
    assert shares == sorted(shares, reverse=True)
    assert len(set(shares)) > 1


@pytest.fixture
def uneven(lab: Lab, write_sheet: Callable[..., Path]) -> Lab:
    """A run of 10 m of which 6 m came out, plugs 0.2, 0.2, 1, 0.2 m apart, and their vertical companions; two
    cracked, one of them vertical; a fifth horizontal plug above the reach of the instrument."""
    depths = [1000.1, 1000.3, 1000.5, 1001.5, 1001.7]
    facies = ["sand", "silt", "sand", "silt", "sand"]
    along, across = ["10", "20", "<0.5", "40", ">5000"], ["5", "<0.01", "1", "4", "9"]
    plugs = [
        f"W-2,{i}H,core,A,{d},horizontal,,{f}" for i, (d, f) in enumerate(zip(depths, facies, strict=True))
    ]
    plugs += [f"W-2,{i}V,core,A,{d},vertical,{i}H,{facies[i]}" for i, d in enumerate(depths)]
    names = [row.split(",")[1] for row in plugs]
    k = [f"W-2,{i}H,P1,{v}" for i, v in enumerate(along)] + [f"W-2,{i}V,P1,{v}" for i, v in enumerate(across)]
    lab.load(
        [
            write_sheet("wells", "well,depth unit", "W-2,m"),
            write_sheet(
                "core runs", "well,run,top depth [m],base depth [m],recovered length [m]", "W-2,A,1000,1010,6"
            ),
            write_sheet("plugs", "well,plug,from,run,depth [m],orientation,companion of,facies", *plugs),
            write_sheet("reported permeability", "well,plug,permeameter,klinkenberg permeability [mD]", *k),
            write_sheet(
                "dimensions", "well,plug,length 1 [mm],diameter 1 [mm]", *(f"W-2,{p},50,38" for p in names)
            ),
            write_sheet(
                "grain volume",
                "well,plug,instrument,grain volume [cm3]",
                *(f"W-2,{p},G,45.363" for p in names),
            ),
            write_sheet(
                "descriptions",
                "well,plug,lithology,condition",
                "W-2,3H,sandstone,cracked",
                "W-2,0V,sandstone,cracked",
            ),
        ]
    )
    return lab


def test_length_weights_are_worked_out_by_hand(uneven: Lab):
    """Lengths 0.2 (to the top of the core), 0.2, 0.1 + 0.3, 0.3 + 0.1, 0.2 m: a gap of 1 m is cut on both
    sides at three times half the usual 0.2 m."""
    (record,) = uneven.summary("W-2", where="klinkenberg permeability < 50", weights="length")
    k = record["klinkenberg permeability"]
    assert record["weights"] == "length: the length that each plug stands for"
    assert record["length represented [m]"] == pytest.approx(0.2 + 0.2 + 0.4 + 0.4)
    x, w = np.array([10, 20, 40]), np.array([0.2, 0.2, 0.4])
    filled = k["arithmetic mean"] * 1.2 - np.sum(w * x)  # what the plug below 0.5 mD adds
    assert 0 < filled <= 0.5 * 0.4 + 1e-9
    assert k["coefficient of variation"] == pytest.approx(k["standard deviation"] / k["arithmetic mean"])
    (count,) = uneven.summary("W-2", where="klinkenberg permeability < 50")
    assert count["weights"] == "count: every plug alike"
    # the middles of the lengths lie at 0.2, 0.5, 0.7, 1.0 m of 1.2: P75 at 0.8, a third of the way to 40
    assert k["quantiles"]["P75"] == pytest.approx(20 + 20 / 3)
    assert count["klinkenberg permeability"]["quantiles"]["P75"] == pytest.approx(25)


def test_a_plug_stands_for_the_same_length_whatever_is_asked_for(uneven: Lab):
    (whole,) = uneven.summary("W-2")
    parts = uneven.summary("W-2", by="facies")
    assert whole["length represented [m]"] == pytest.approx(1.4)
    for name in ("length represented [m]", "storage capacity [m]"):
        assert sum(r[name] for r in parts) == pytest.approx(whole[name])
    (upper,), (lower,) = uneven.summary("W-2", base=1001), uneven.summary("W-2", 1001)
    assert upper["length represented [m]"] + lower["length represented [m]"] == pytest.approx(1.4)


def test_values_at_limits_stay_what_they_are(uneven: Lab):
    (record,) = uneven.summary("W-2")
    k = record["klinkenberg permeability"]
    assert (k["count"], k["below detection"], k["above limit"], k["not measured"]) == (5, 1, 1, 0)
    assert (k["minimum"], k["maximum"]) == (0.5, 5000)  # as stated, not as filled in
    assert k["below detection taken as"].startswith("estimated by regression on order statistics")


def test_cut_offs_that_a_limit_cannot_tell_are_not_guessed(uneven: Lab):
    (judged,) = uneven.summary("W-2", cuts={"permeability": 1.0})
    assert judged["net rests on"] == 5
    assert judged["net to gross [v/v]"] == pytest.approx((0.2 + 0.2 + 0.4 + 0.2) / 1.4)
    (open_below,) = uneven.summary("W-2", cuts={"permeability": 0.1})  # below 0.5: above 0.1 or not?
    assert open_below["net rests on"] == 4
    assert open_below["net to gross [v/v]"] == pytest.approx(1.0)
    (open_above,) = uneven.summary("W-2", cuts={"permeability": 6000.0})
    assert open_above["net rests on"] == 4
    assert open_above["net to gross [v/v]"] == 0.0


def test_ratios_rest_on_measured_pairs_without_the_suspects(uneven: Lab):
    (all_of,) = uneven.summary("W-2")  # 0: 5/10 and 3: 4/40; 1V below detection, 2H below, 4H above
    assert all_of["vertical to horizontal pairs"] == 2
    assert all_of["vertical to horizontal ratio"] == pytest.approx((0.5 * 0.1) ** 0.5)
    assert all_of["vertical plugs below or above a limit, in no ratio"] == 1
    (sound,) = uneven.summary("W-2", leave_out=["cracked"])
    assert sound["vertical to horizontal pairs"] == 0


def test_each_group_counts_its_own(uneven: Lab):
    sand, silt = uneven.summary("W-2", by="facies", leave_out=["cracked", "cracked"])
    assert (sand["group"], silt["group"]) == ("sand", "silt")
    assert sand["left out"]["plugs"] == 3  # its vertical plugs
    assert sand["left out"]["difference"] is None
    assert sorted(silt["left out"]["why"].values()) == [1, 2]
    assert silt["left out"]["plugs"] == 3
    (before,) = [r for r in uneven.summary("W-2", by="facies") if r["group"] == "silt"]
    found = silt["left out"]["difference"]
    for label, record in (("without", silt), ("with", before)):
        assert found[label]["plugs"] == record["plugs"]
        mean = record["klinkenberg permeability"]["geometric mean"]
        assert found[label]["klinkenberg permeability geometric mean"] == pytest.approx(mean)


def test_a_group_of_which_all_is_left_out_is_still_named(uneven: Lab):
    only = "plug = '3H' or plug = '4H'"
    groups = {r["group"]: r for r in uneven.summary("W-2", by="facies", where=only, leave_out=["cracked"])}
    assert groups["silt"]["plugs"] == 0
    assert groups["silt"]["porosity"]["count"] == 0
    assert groups["silt"]["left out"]["plugs"] == 1
    with pytest.raises(NotFound, match="1 cracked"):
        uneven.summary("W-2", where="plug = '3H'", leave_out=["cracked"])


def test_the_stratigraphic_curve_has_its_depths(stocked: Lab):
    (record,) = stocked.summary("W-1", where="facies = 'sand'")
    curve = record["stratigraphic lorenz"]
    assert curve["depth [m]"] == [1000 + 0.5 * i for i in range(14)]
    assert curve["flow capacity share"][1:] == pytest.approx(np.cumsum(HBK5) / sum(HBK5))
    assert curve["storage capacity share"] == pytest.approx(np.arange(15) / 14)


def test_pay_moves_with_its_cut_offs(lab: Lab, demo_folder: Path):
    lab.load([demo_folder / "bench"])
    (record,) = lab.summary("QB-1", where="facies = 'channel sand'")
    rows = record["net to gross sensitivity"]
    base = record["cut-offs"]["water saturation [v/v]"]
    wet = sorted(
        (r for r in rows if r["water saturation [v/v]"] != base), key=lambda r: r["water saturation [v/v]"]
    )
    shares = [r["pay to gross [v/v]"] for r in wet]
    assert len(wet) == 4
    assert shares == sorted(shares)
    assert shares[0] < shares[-1]
    assert record["pay to gross [v/v]"] <= record["net to gross [v/v]"]


@pytest.mark.parametrize(
    ("options", "said"),
    [
        ({"by": "colour"}, "--by is one of"),
        ({"weights": "mass"}, "--weights is one of"),
        ({"leave_out": ["odd"]}, "--leave-out is one of"),
        ({"cuts": {"porosity": -1.0}}, "porosity cut-off is a fraction from 0 to 1"),
        ({"cuts": {"porosity": 15.0}}, "porosity cut-off is a fraction from 0 to 1"),
        ({"cuts": {"water saturation": float("nan")}}, "water saturation cut-off is a fraction"),
        ({"cuts": {"permeability": float("inf")}}, "permeability cut-off is a number of mD"),
        ({"cuts": {"permeabilty": 1.0}}, "There is a cut-off of porosity, permeability, water saturation"),
    ],
)
def test_wrong_options_are_named(stocked: Lab, options: dict[str, Any], said: str):
    with pytest.raises(Usage, match=said):
        stocked.summary("W-1", **options)


def test_nothing_left_says_why(stocked: Lab):
    with pytest.raises(NotFound, match="No plug of 'W-1' is left"):
        stocked.summary("W-1", where="facies = 'chalk'")


def test_the_demos_facies_come_back(lab: Lab, demo_folder: Path):
    """Against the truth the demo was made from: mean porosity of each facies within 0.01 v/v."""
    lab.load([demo_folder / "bench"])
    truth = pd.read_csv(demo_folder / "truth.csv")
    truth = truth[(truth["well"] == "QB-1")]
    found = {r["group"]: r for r in lab.summary("QB-1", by="facies", where="source = 'core'")}
    frame = lab.interval("QB-1", where="source = 'core'").merge(truth, on="plug", suffixes=("", " truth"))
    frame = frame[frame["orientation"] == "horizontal"]
    column = next(c for c in truth.columns if c.startswith("porosity"))
    column = f"{column} truth" if f"{column} truth" in frame else column
    for facies, part in frame.groupby("facies"):
        assert found[facies]["porosity"]["arithmetic mean"] == pytest.approx(part[column].mean(), abs=0.01)


def test_the_command(stocked: Lab, tmp_path: Path):
    command = [sys.executable, "-m", "corelab.cli.main", "--database", stocked.database, "summary", "W-1"]
    done = subprocess.run([*command, "--format", "json"], capture_output=True, encoding="utf-8", check=True)
    (record,) = json.loads(done.stdout)
    assert set(KEYS) <= set(record)
    shown = subprocess.run([*command, "--by", "facies"], capture_output=True, encoding="utf-8", check=True)
    assert "Dykstra-Parsons: line through ln k" in shown.stdout
    assert "sand" in shown.stdout
