"""Crush likelihoods through the lab: columns, flags, filters, verdicts of persons, recalibration, command."""

from __future__ import annotations

import csv
import json
import math
import time
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from typer.testing import CliRunner

from corelab import open_lab
from corelab.cli.main import app
from corelab.errors import NotFound, Refused, Usage
from corelab.lab import Lab, methods


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Iterator[Lab]:
    with open_lab(str(tmp_path_factory.mktemp("demo") / "lab.db"), by="Ada") as lab:
        lab.setup()
        lab.load([demo_folder / "bench"])
        yield lab


@pytest.fixture(scope="module")
def truth(demo_folder: Path) -> dict[str, str]:
    with (demo_folder / "truth.csv").open(encoding="utf-8") as file:
        return {row["plug"]: row["impact"] for row in csv.DictReader(file) if row["impact"]}


def test_the_interval_carries_likelihood_verdict_and_flag(demo: Lab):
    frame = demo.interval("QB-1")
    shot = frame["source"] == "percussion sidewall"
    assert frame.loc[shot, "crush likelihood [v/v]"].between(0, 1).all()
    assert frame.loc[~shot, "crush likelihood [v/v]"].isna().all()
    assert set(frame.loc[~shot, "crush verdict"]) == {""}
    for row in frame[shot].to_dict("records"):
        p, verdict, flags = row["crush likelihood [v/v]"], row["crush verdict"], row["flags"].split("; ")
        assert verdict == ("unlikely" if p < 0.2 else "likely" if p >= 0.7 else "possible")
        assert ("crush likely" in flags) == (verdict == "likely")
        assert ("crush possible" in flags) == (verdict == "possible")


def test_the_command_and_the_interval_agree(demo: Lab):
    frame = demo.interval("QB-1", stress=30.0).set_index("plug")
    rows = demo.impact("QB-1")
    assert len(rows) == (frame["source"] == "percussion sidewall").sum()
    for row in rows:
        assert row["crush likelihood [v/v]"] == frame.loc[row["plug"], "crush likelihood [v/v]"]
        assert row["crush verdict"] == frame.loc[row["plug"], "crush verdict"]
        assert sum(item["effect"] for item in row["evidence"]) == pytest.approx(
            math.log(row["crush likelihood [v/v]"] / (1 - row["crush likelihood [v/v]"]))
            - math.log(row["prior"] / (1 - row["prior"]))
        )


def test_it_tells_the_demo_plugs_that_were_damaged(demo: Lab, truth: dict[str, str]):
    rows = {row["plug"]: row for row in demo.impact("QB-1")}
    hit = [row["crush likelihood [v/v]"] for p, row in rows.items() if truth[p] != "none"]
    sound = [row["crush likelihood [v/v]"] for p, row in rows.items() if truth[p] == "none"]
    assert np.mean([h > s for h in hit for s in sound]) > 0.9
    assert all(rows[p]["crush verdict"] != "likely" for p in rows if truth[p] == "none")
    for plug, row in rows.items():
        if row["crush verdict"] == "likely":
            assert row["direction"] == truth[plug]


def test_likely_crushed_plugs_can_be_left_out(demo: Lab):
    every = demo.interval("QB-1")
    kept = demo.interval("QB-1", where="crush verdict is empty or crush verdict != 'likely'")
    assert len(every) - len(kept) == (every["crush verdict"] == "likely").sum() > 0
    assert not demo.interval("QB-1", where="crush likelihood >= 0.7").empty


def test_verdicts_of_persons_stand_beside_and_are_not_overwritten(demo: Lab):
    rows = {row["plug"]: row for row in demo.impact("QB-1")}
    assert rows["P1"]["judged"] == ["judged crushed by Mirel Karsk (thin section)"]
    frame = demo.interval("QB-1").set_index("plug")
    assert "judged crushed by Mirel Karsk (thin section)" in frame.loc["P1", "flags"]
    assert rows["P10"]["judged"] and rows["P10"]["crush verdict"] != "likely"


def test_the_measurement_is_not_altered(demo: Lab):
    before = demo.interval("QB-1")[["porosity [v/v]", "klinkenberg permeability [mD]"]]
    demo.impact("QB-1", prior=0.9)
    pd.testing.assert_frame_equal(before, demo.interval("QB-1")[list(before)])


def test_the_prior_is_shown_and_moves_the_answer(demo: Lab):
    low, high = demo.impact("QB-1", prior=0.1), demo.impact("QB-1", prior=0.5)
    for a, b in zip(low, high, strict=True):
        assert a["prior"] == 0.1 and b["prior"] == 0.5
        assert a["crush likelihood [v/v]"] == pytest.approx(b["by prior"]["0.1"], abs=5e-5)
        assert a["crush likelihood [v/v]"] < b["crush likelihood [v/v]"]
    for wrong in (0.0, 1.0, float("nan")):
        with pytest.raises(Usage, match="--prior"):
            demo.impact("QB-1", prior=wrong)


def test_a_blind_run_counts_false_alarms(demo: Lab):
    rows = demo.impact("QB-1", blind=True)
    assert len(rows) > 50
    assert np.mean([row["crush verdict"] == "likely" for row in rows]) <= 0.05


def test_a_well_without_percussion_plugs_says_so(demo: Lab):
    assert demo.impact("QB-2") == []
    with pytest.raises(NotFound, match="QB-1"):
        demo.impact("QB-11")


def test_asking_to_explain_it_points_to_the_evidence(demo: Lab):
    with pytest.raises(Usage, match="corelab impact QB-1"):
        demo.explain("QB-1", "P1", "Crush likelihood")


def test_the_methods_say_what_was_tested():
    told = methods("impact")[0]
    assert "Brier skill" in told["tested"] and "blind" in told["tested"]
    assert "assumption" in told["valid"]


# ---- the command


def run(lab: Lab, *arguments: str) -> str:
    done = CliRunner().invoke(app, ["--database", lab.database, *arguments])
    assert done.exit_code == 0, done.output
    return done.stdout


def test_the_command_prints_json_with_the_keys_that_others_rely_on(demo: Lab):
    rows = json.loads(run(demo, "impact", "QB-1", "--format", "json"))
    keys = {
        "well", "plug", "depth [m]", "crush likelihood [v/v]", "crush verdict", "direction", "coverage",
        "evidence",
    }  # fmt: skip
    for row in rows:
        assert keys <= set(row)
        assert 0 <= row["coverage"] <= 1
        assert row["direction"] in {"compacted", "loosened", "shattered", "none"}
        for item in row["evidence"]:
            assert {"term", "finding", "weight", "effect"} <= set(item)
    assert [row["depth [m]"] for row in rows] == sorted(row["depth [m]"] for row in rows)


def test_the_command_prints_a_table_and_a_paragraph_a_plug(demo: Lab):
    text = run(demo, "impact", "QB-1")
    flat = " ".join(text.split())
    assert "P1 at 2402.00 m: crush likely" in flat
    assert "Prior 0.3: an assumption" in flat
    assert "Without:" in flat
    assert "false" not in run(demo, "impact", "QB-2").casefold()


# ---- recalibration


def judged_lab(path: Path, sqlite_template: Path, count: int) -> Lab:
    """A lab with `count` percussion plugs judged by a person: mostly crushed where described as powdered."""
    path.write_bytes(sqlite_template.read_bytes())
    folder = path.parent / "sheets"
    folder.mkdir()

    def write(name: str, rows: list[dict[str, object]]) -> None:
        pd.DataFrame(rows).to_csv(folder / f"{name}.csv", index=False)

    names = [f"P{i}" for i in range(count)]
    write("jobs", [{"job": "J", "laboratory": "Lab"}])
    write("wells", [{"well": "W", "job": "J", "depth unit": "m"}])
    write("sidewall shots", [
        {"well": "W", "gun run": "G", "shot": i, "depth [m]": 1000 + i, "tool": "percussion",
         "outcome": "recovered"}
        for i in range(count)
    ])  # fmt: skip
    write("plugs", [
        {"well": "W", "plug": p, "from": "sidewall", "gun run": "G", "shot": i, "depth [m]": 1000 + i,
         "facies": "sand"}
        for i, p in enumerate(names)
    ])  # fmt: skip
    marks = ["powdered" if i % 2 else "intact" for i in range(count)]
    write("descriptions", [
        {"well": "W", "plug": p, "lithology": "sandstone", "firmness": "friable", "condition": marks[i]}
        for i, p in enumerate(names)
    ])  # fmt: skip
    write("crush verdicts", [
        {"well": "W", "plug": p, "judged by": "Ola", "crushed": "yes" if (i % 2) != (i % 10 == 0) else "no",
         "seen in": "thin section"}
        for i, p in enumerate(names)
    ])  # fmt: skip
    lab = open_lab(str(path), by="Ada")
    lab.load([folder])
    return lab


def test_too_few_verdicts_teach_nothing(tmp_path: Path, sqlite_template: Path):
    with judged_lab(tmp_path / "lab.db", sqlite_template, 29) as lab, pytest.raises(Refused, match="29"):
        lab.impact_recalibrate()


def test_recalibration_is_shown_then_adopted_recorded_and_undone(tmp_path: Path, sqlite_template: Path):
    with judged_lab(tmp_path / "lab.db", sqlite_template, 60) as lab:
        before = {row["plug"]: row for row in lab.impact("W")}
        found = lab.impact_recalibrate()
        assert found["verdicts"] == 60 and found["crushed"] == 36
        assert found["recalibrated"]["brier"] < found["as it is"]["brier"]
        assert lab.impact("W")[0]["crush likelihood [v/v]"] == before["P0"]["crush likelihood [v/v]"]
        text = run(lab, "recalibrate")
        assert "skill" in text and "leaving out tenths" in text and "recalibrate --adopt" in text
        lab.impact_recalibrate(adopt=True)
        after = {row["plug"]: row for row in lab.impact("W")}
        assert after["P1"]["crush likelihood [v/v]"] > before["P1"]["crush likelihood [v/v]"]
        assert after["P1"]["evidence"][-1]["term"] == "recalibration"
        mean = np.mean([row["crush likelihood [v/v]"] for row in after.values()])
        assert mean == pytest.approx(36 / 60, abs=0.05)
        assert lab.history()["command"].iloc[-1] == "recalibrate"
        lab.setting("crush recalibration", "none")
        assert lab.impact("W")[0]["crush likelihood [v/v]"] == before["P0"]["crush likelihood [v/v]"]
        with pytest.raises(Usage, match="intercept"):
            lab.setting("crush recalibration", "a lot")


def test_five_hundred_plugs_are_judged_in_half_a_second(tmp_path: Path, sqlite_template: Path):
    with judged_lab(tmp_path / "lab.db", sqlite_template, 500) as lab:
        lab.impact("W")
        began = time.perf_counter()
        lab.interval("W")
        assert time.perf_counter() - began < 1.0
