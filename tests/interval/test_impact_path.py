"""From bench sheets and a log to the likelihood, through the commands alone: wells of the declared law."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from damaged_wells import Law, Simulated, simulate, write_sheets
from typer.testing import CliRunner

from corelab.cli.main import app
from corelab.science.impact import skill

#: Held out, as in the validation.
SEEDS = range(2000, 2005)


def run(database: Path, *arguments: str) -> str:
    done = CliRunner().invoke(app, ["--database", str(database), "--by", "Ada", *arguments])
    assert done.exit_code == 0, (arguments, done.output, done.exception)
    return done.stdout


@pytest.fixture(scope="module")
def wells(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Path, Simulated]]:
    made = []
    for seed in SEEDS:
        folder = tmp_path_factory.mktemp(f"well{seed}")
        well = simulate(seed, Law())
        log = write_sheets(well, "S-1", folder)
        database = folder / "lab.db"
        run(database, "setup")
        run(database, "sheet", "load", str(folder / "bench"))
        made.append((database, well))
        run(database, "read", "las", str(log), "--well", "S-1")
        run(database, "match", "S-1", "--log", str(log))
    return made


def likelihoods(database: Path, count: int) -> tuple[np.ndarray, list[dict[str, object]]]:
    rows = {
        r["plug"]: r
        for r in json.loads(run(database, "impact", "S-1", "--prior", "0.35", "--format", "json"))
    }
    kept = [rows[f"S{i}"] for i in range(count)]
    return np.array([row["crush likelihood [v/v]"] for row in kept]), kept


def test_the_core_is_matched_and_the_log_is_evidence(wells):
    for database, well in wells:
        plugs = json.loads(run(database, "interval", "S-1", "--format", "json"))
        shift = [p["log depth [m]"] - p["depth [m]"] for p in plugs if p["source"] == "core"]
        assert np.median(shift) == pytest.approx(well.shift_m, abs=0.3)
        rows = likelihoods(database, 60)[1]
        assert all("density log" in [item["term"] for item in row["evidence"]] for row in rows)
        assert np.mean(["neighbours" in [i["term"] for i in row["evidence"]] for row in rows]) > 0.9


def test_the_likelihood_is_as_good_through_the_commands(wells):
    p = np.concatenate([likelihoods(database, 60)[0] for database, _ in wells])
    y = np.concatenate([well.damaged for _, well in wells])
    assert p.size >= 300
    found = skill(p, y)
    assert found.auc >= 0.93
    assert found.skill >= 0.5
    assert abs(found.mean - found.rate) <= 0.1
    assert np.mean(p[~y] >= 0.7) <= 0.05


def test_blind_through_the_command(wells):
    verdicts = [
        row["crush verdict"]
        for database, _ in wells
        for row in json.loads(run(database, "impact", "S-1", "--blind", "--format", "json"))
    ]
    assert len(verdicts) > 500
    assert np.mean([v == "likely" for v in verdicts]) <= 0.05
