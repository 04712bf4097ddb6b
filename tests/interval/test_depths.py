"""Core on log depth, through a lab: the demo's true shifts, doubt told, a person's own shift."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab.errors import NotFound, Usage
from corelab.lab import Lab

KEYS = {"run", "shift [m]", "standard uncertainty [m]", "correlation", "certain"}


@pytest.fixture
def loaded(any_lab: Lab, demo_folder: Path) -> Lab:
    any_lab.load([demo_folder / "bench"])
    return any_lab


def test_the_demos_shifts_come_back(loaded: Lab, demo_folder: Path) -> None:
    truth = pd.read_csv(demo_folder / "truth_depth.csv", dtype={"run": str}).set_index(["well", "run"])
    for well in ("QB-1", "QB-2"):
        before = loaded.interval(well, depth="log")
        assert before.loc[before["source"] == "core", "depth basis"].eq("driller").all()
        found = loaded.match(well, demo_folder / "logs" / f"{well}.las")
        assert set(found.columns) >= KEYS
        core = found[found["kind"] == "core"].set_index("run")
        for run, row in core.iterrows():
            wanted = truth.loc[(well, str(run)), "shift [m]"]
            assert row["certain"]
            assert row["shift [m]"] == pytest.approx(wanted, abs=0.1)
            assert abs(row["shift [m]"] - wanted) < 3 * row["standard uncertainty [m]"]
        frame = loaded.interval(well, depth="log", unit="m").set_index("plug")
        own = loaded.interval(well, unit="m").set_index("plug")
        of_core = own[own["source"] == "core"].index
        moved = frame.loc[of_core, "depth [m]"] - own.loc[of_core, "depth [m]"]
        shifts = own.loc[of_core, "run"].map(core["shift [m]"])
        np.testing.assert_allclose(moved, shifts, atol=1e-6)
        assert (frame.loc[of_core, "depth basis"] == "log").all()
    assert loaded.verify().faults == []


def test_matching_again_changes_nothing_and_a_trial_keeps_nothing(loaded: Lab, demo_folder: Path) -> None:
    log = demo_folder / "logs" / "QB-2.las"
    seal = loaded.seal()
    tried = loaded.match("QB-2", log, check=True)
    assert loaded.seal() == seal
    kept = loaded.match("QB-2", log)
    pd.testing.assert_frame_equal(tried, kept)
    seal = loaded.seal()
    loaded.match("QB-2", log)
    loaded.read_las(log, "QB-2")
    assert loaded.seal() == seal


def test_a_persons_own_shift_stays_until_they_change_it(loaded: Lab, demo_folder: Path) -> None:
    loaded.match("QB-1", demo_folder / "logs" / "QB-1.las")
    with pytest.raises(Usage, match="needs a reason"):
        loaded.shift("QB-1", "1", 1.5, "")
    assert loaded.shift("QB-1", "1", 1.5, "sharp bed at the top") == "core run"
    again = loaded.match("QB-1").set_index("run")
    assert "own shift stays" in again.loc["1", "remark"]
    own, log = loaded.interval("QB-1"), loaded.interval("QB-1", depth="log")
    first = own[(own["run"] == "1") & (own["source"] == "core")]["plug"]
    moved = log.set_index("plug").loc[first, "depth [m]"] - own.set_index("plug").loc[first, "depth [m]"]
    np.testing.assert_allclose(moved, 1.5)
    with pytest.raises(Usage, match="over run"):
        loaded.shift("QB-1", "2", -9.0, "a slip")
    with pytest.raises(NotFound, match="no run '7'"):
        loaded.shift("QB-1", "7", 1.0, "x")
    assert loaded.shift("QB-1", "G1", 0.4, "tied anew") == "gun run"
    shot = loaded.interval("QB-1").set_index("plug")
    assert shot.loc["P1", "log depth [m]"] == pytest.approx(2402.4)


def test_plug_porosity_serves_where_no_core_gamma_was_run(
    lab: Lab, demo_folder: Path, tmp_path: Path
) -> None:
    """The demo without its core gamma: what is called certain lies within 0.1 m of the truth."""
    import shutil

    folder = tmp_path / "bench"
    shutil.copytree(demo_folder / "bench", folder)
    (folder / "15 core gamma.csv").unlink()
    import openpyxl

    for path in folder.glob("*.xlsx"):
        book = openpyxl.load_workbook(path)
        if "core gamma" in book.sheetnames:
            del book["core gamma"]
            book.save(path)
    lab.load([folder])
    found = lab.match("QB-1", demo_folder / "logs" / "QB-1.las")
    core = found[found["kind"] == "core"]
    assert (core["matched by"] == "plug porosity").all()
    truth = pd.read_csv(demo_folder / "truth_depth.csv", dtype={"run": str})
    wanted = truth[truth["well"] == "QB-1"].set_index("run")["shift [m]"]
    certain = core[core["certain"]]
    for row in certain.to_dict("records"):
        assert row["shift [m]"] == pytest.approx(wanted[row["run"]], abs=0.1)
    unsure = core[~core["certain"]]
    assert (unsure["remark"] != "").all()
    flags = lab.interval("QB-1").set_index("plug")["flags"]
    runs = lab.interval("QB-1").set_index("plug")["run"]
    for row in unsure.to_dict("records"):
        assert flags[runs == row["run"]].str.contains("log depth uncertain").all()


def test_what_cannot_be_matched_says_why(
    lab: Lab, write_sheet: Callable[..., Path], demo_folder: Path
) -> None:
    lab.load(
        [
            write_sheet("wells", "well,depth unit", "W-1,m"),
            write_sheet(
                "core runs",
                "well,run,top depth [m],base depth [m],recovered length [m],core diameter [mm]",
                "W-1,1,2440,2449,9,100",
            ),
        ]
    )
    with pytest.raises(NotFound, match="no log of W-1"):
        lab.match("W-1")
    (row,) = lab.match("W-1", demo_folder / "logs" / "QB-1.las").to_dict("records")
    assert not row["certain"]
    assert row["remark"] == "nothing was measured to match"
    with pytest.raises(NotFound, match="no curve 'GAMA'"):
        lab.match("W-1", curve="GAMA")


def test_the_commands(lab: Lab, demo_folder: Path) -> None:
    lab.load([demo_folder / "bench"])
    log = demo_folder / "logs" / "QB-2.las"

    def run(*words: object) -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-m", "corelab.cli.main", "--database", lab.database, "--by", "tester"]
        return subprocess.run(
            [*command, *map(str, words)], capture_output=True, encoding="utf-8", check=False
        )

    told = run("read", "las", log, "--well", "QB-2")
    assert told.returncode == 0
    assert "GR [GAPI] gamma" in told.stderr
    rows = json.loads(run("match", "QB-2", "--log", log, "--format", "json").stdout)
    assert all(set(row) >= KEYS for row in rows)
    assert run("match", "QB-2", "--run", "1").returncode == 2
    by_hand = run("match", "QB-2", "--run", "1", "--shift", "-2.5", "--unit", "ft", "--reason", "by eye")
    assert by_hand.returncode == 0, by_hand.stderr
    frame = lab.interval("QB-2", unit="ft").set_index("plug")
    assert frame.loc["1H", "log depth [ft]"] == pytest.approx(frame.loc["1H", "depth [ft]"] - 2.5, abs=1e-6)
