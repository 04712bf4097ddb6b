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


def test_length_weights_change_the_means_and_are_named(stocked: Lab):
    (record,) = stocked.summary("W-1", weights="length")
    assert record["weights"] == "length: the length that each plug stands for"
    (count,) = stocked.summary("W-1")
    assert count["weights"].startswith("count")


@pytest.mark.parametrize(
    ("options", "said"),
    [
        ({"by": "colour"}, "--by is one of"),
        ({"weights": "mass"}, "--weights is one of"),
        ({"leave_out": ["odd"]}, "--leave-out is one of"),
        ({"cuts": {"porosity": -1.0}}, "cut-off"),
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
